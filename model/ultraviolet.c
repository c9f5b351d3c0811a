/* ultraviolet: see ultraviolet.h. */
#include "ultraviolet.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/erythema.h"
#include "../chem/photolysis.h"
#include "../input/constants.h"
#include "../input/table.h"
#include "sun.h"

#define EDGE_TOLERANCE_NM 1e-3
#define AMPLIFICATION_STEP 0.01 /* second order: the factor changes by less than 1e-4 with 0.001 */

const char *const ultraviolet_caution =
    "Clear sky, no aerosol, level ground at sea level: planning figures, no guide to personal exposure. "
    "Health "
    "and "
    "regulatory decisions defer to the competent authority and its own methods.";

struct Ultraviolet {
    const Model *model;
    Mechanism mechanism; /* the model's without its photolysis reactions: borrowed, but for the two indices */
    Spectra *spectra;
    Photolysis *day, *noon; /* all nodes of the sun; the last alone. NULL without light */
    Sun sun;
    int still;               /* the sun does not move */
    int limit[UV_BANDS + 1]; /* first bin of each band and the end */
    double *weight;          /* [bins] of erythema, times W m-2 above the atmosphere: per transmission */
    double *ozone, *dioxide; /* [padded] cm-3 */
    double *temperature;     /* [padded] K */
    double table[SUN_NODES]; /* erythemal irradiance at the nodes, 1 au */
    double *ground;          /* [bins] transmission to the ground at noon, of the last day */
    double no_rate[1];       /* photolysis_rates has none to give */
};

/* ---- making ---- */

static int find_edge(const Ultraviolet *u, double nm)
{
    for (int b = 0; b < u->spectra->bins; b++)
        if (fabs(u->spectra->lower[b] - nm) < EDGE_TOLERANCE_NM)
            return b;
    int last = u->spectra->bins - 1;
    return fabs(u->spectra->upper[last] - nm) < EDGE_TOLERANCE_NM ? last + 1 : -1;
}

static int find_bands(Ultraviolet *u, const char *bins, Fault *fault)
{
    const double edge[UV_BANDS] = {280, u->model->settings.uvb_limit_nm, 400};
    u->limit[0] = 0;
    for (int b = 0; b < UV_BANDS; b++)
        if ((u->limit[b + 1] = find_edge(u, edge[b])) < 0)
            return fault_at(fault, bins, 0,
                            "no bin begins or ends at %g nm, a limit of UV-A, UV-B or UV-C; add "
                            "that edge",
                            edge[b]);
    return 0;
}

static int read_light(Ultraviolet *u, Fault *fault)
{
    const Settings *settings = &u->model->settings;
    char bins[SETTINGS_PATH], solar[SETTINGS_PATH];
    if (table_locate("ultraviolet bins", settings->ultraviolet_bins_file, settings->case_dir,
                     settings->data_dir, bins, sizeof bins, fault) ||
        table_locate("solar spectrum", settings->solar_file, settings->case_dir, settings->data_dir, solar,
                     sizeof solar, fault) ||
        spectra_read(&u->spectra, &u->mechanism, settings->data_dir, bins, solar, fault))
        return fault->code;
    return find_bands(u, bins, fault);
}

static int make_photolysis(Ultraviolet *u, Photolysis **made, const double *cosine, int suns, Fault *fault)
{
    const Model *model = u->model;
    double edge_km[SETTINGS_MAX_EDGES + 1];
    for (int i = 0; i <= model->grid.layers; i++)
        edge_km[i] = 1e-5 * model->grid.edge[i];
    return photolysis_make(made, &u->mechanism, u->spectra, model->grid.layers, model->grid.padded, edge_km,
                           model->air.temperature, model->air.number_density, model->grid.depth,
                           model->air.column_above_top, cosine, suns, model->settings.ultraviolet_albedo,
                           fault);
}

static void place_sun(Ultraviolet *u, const double *cosine)
{
    if (cosine) {
        u->still = 1;
        u->sun = (Sun){.nodes = 1, .rises = 1, .cosine = {*cosine}, .earth_sun = 1.0};
        return;
    }
    Settings settings = u->model->settings;
    settings.sun = SUN_LATITUDE;
    settings.latitude_deg = settings.ultraviolet_latitude_deg;
    settings.day_of_year = settings.ultraviolet_day_of_year;
    sun_make(&u->sun, &settings, 1);
}

static int make_all(Ultraviolet *u, const double *cosine, Fault *fault)
{
    size_t padded = (size_t)u->model->grid.padded;
    place_sun(u, cosine);
    if (read_light(u, fault))
        return fault->code;
    const Spectra *spectra = u->spectra;
    size_t bins = (size_t)spectra->bins;
    u->weight = malloc(bins * sizeof(double));
    u->ground = calloc(bins, sizeof(double));
    u->ozone = malloc(padded * sizeof(double));
    u->dioxide = malloc(padded * sizeof(double));
    u->temperature = malloc(padded * sizeof(double));
    if (!u->weight || !u->ground || !u->ozone || !u->dioxide || !u->temperature)
        return fault_memory(fault, "ultraviolet");
    for (size_t b = 0; b < bins; b++)
        u->weight[b] = spectra->irradiance[b] * erythema_mean(spectra->lower[b], spectra->upper[b]);
    if (!u->sun.rises)
        return 0;
    int last = u->sun.nodes - 1;
    return make_photolysis(u, &u->noon, &u->sun.cosine[last], 1, fault) || u->still
               ? fault->code
               : make_photolysis(u, &u->day, u->sun.cosine, u->sun.nodes, fault);
}

int ultraviolet_make(Ultraviolet **made, const Model *model, const double *cosine, Fault *fault)
{
    *made = NULL;
    Ultraviolet *u = calloc(1, sizeof *u);
    if (!u)
        return fault_memory(fault, "ultraviolet");
    u->model = model;
    u->mechanism = *model->mechanism;
    u->mechanism.photolysis_first = u->mechanism.surface_first;
    if (make_all(u, cosine, fault)) {
        ultraviolet_free(u);
        return fault->code;
    }
    *made = u;
    return 0;
}

void ultraviolet_free(Ultraviolet *ultraviolet)
{
    if (!ultraviolet)
        return;
    photolysis_free(ultraviolet->day);
    photolysis_free(ultraviolet->noon);
    spectra_free(ultraviolet->spectra);
    free(ultraviolet->weight);
    free(ultraviolet->ground);
    free(ultraviolet->ozone);
    free(ultraviolet->dioxide);
    free(ultraviolet->temperature);
    free(ultraviolet);
}

/* ---- light at the ground ---- */

static void number_density(const Ultraviolet *u, const double *x, const char *name, double scale, double *out)
{
    const Model *model = u->model;
    int solved = mechanism_solved(model->mechanism, name), padded = model->grid.padded;
    for (int l = 0; l < padded; l++)
        out[l] =
            solved < 0 ? 0.0 : scale * fmax(0.0, x[FIELD(padded, solved, l)]) * model->air.number_density[l];
}

/* Transmission to the ground, [suns][photolysis_stride], at the base mass of the layers and the temperature
 * of now, with ozone times scale. */
static const double *shine(Ultraviolet *u, Photolysis *photolysis, const double *x, const double *change,
                           double scale)
{
    const Model *model = u->model;
    for (int l = 0; l < model->grid.padded; l++) {
        int at = l < model->grid.layers ? l : model->grid.layers - 1;
        u->temperature[l] = model->air.temperature[at] + (change ? change[at] : 0.0);
    }
    number_density(u, x, "O3", scale, u->ozone);
    number_density(u, x, "NO2", 1.0, u->dioxide);
    photolysis_set_air(photolysis, u->temperature, model->air.number_density, model->grid.depth,
                       model->air.column_above_top);
    photolysis_rates(photolysis, u->ozone, u->dioxide, NULL, 1.0, u->no_rate);
    return photolysis_ground(photolysis);
}

static double erythemal(const Ultraviolet *u, const double *transmission)
{
    double sum = 0.0;
    for (int b = 0; b < u->spectra->bins; b++)
        sum += u->weight[b] * transmission[b];
    return sum;
}

/* ---- a day ---- */

void ultraviolet_day(Ultraviolet *u, const double *x, const double *change, UltravioletDay *day)
{
    const Spectra *spectra = u->spectra;
    int last = u->sun.nodes - 1;
    *day = (UltravioletDay){.cosine = -1.0, .earth_sun = u->sun.earth_sun};
    memset(u->ground, 0, (size_t)spectra->bins * sizeof(double));
    if (!u->sun.rises)
        return;
    Photolysis *photolysis = u->still ? u->noon : u->day;
    const double *ground = shine(u, photolysis, x, change, 1.0);
    size_t stride = (size_t)photolysis_stride(photolysis);
    for (int n = 0; n <= last; n++)
        u->table[n] = erythemal(u, ground + (size_t)n * stride);
    memcpy(u->ground, ground + (size_t)last * stride, (size_t)spectra->bins * sizeof(double));
    day->cosine = u->sun.cosine[last];
    for (int band = 0; band < UV_BANDS; band++)
        for (int b = u->limit[band]; b < u->limit[band + 1]; b++)
            day->band[band] += spectra->irradiance[b] * u->ground[b] * u->sun.earth_sun;
    day->erythemal = u->table[last] * u->sun.earth_sun;
    day->uv_index = UV_INDEX_M2_W * day->erythemal;
    double knot[SUN_KNOTS];
    day->dose = u->still ? NAN : DAY_SECONDS * u->sun.earth_sun * sun_spread(&u->sun, u->table, 1, knot, 1);
}

double ultraviolet_amplification(Ultraviolet *u, const double *x, const double *change)
{
    if (!u->sun.rises)
        return NAN;
    const double up = 1.0 + AMPLIFICATION_STEP, down = 1.0 - AMPLIFICATION_STEP;
    double more = erythemal(u, shine(u, u->noon, x, change, up));
    double less = erythemal(u, shine(u, u->noon, x, change, down));
    return log(less / more) / log(up / down);
}

/* ---- the spectrum ---- */

void ultraviolet_above(const Ultraviolet *u, double *band)
{
    for (int i = 0; i < UV_BANDS; i++) {
        band[i] = 0.0;
        for (int b = u->limit[i]; b < u->limit[i + 1]; b++)
            band[i] += u->spectra->irradiance[b];
    }
}

int ultraviolet_bins(const Ultraviolet *ultraviolet)
{
    return ultraviolet->spectra->bins;
}

UltravioletBin ultraviolet_bin(const Ultraviolet *u, int bin)
{
    const Spectra *spectra = u->spectra;
    double lower = spectra->lower[bin], upper = spectra->upper[bin],
           above = spectra->irradiance[bin] / (upper - lower);
    return (UltravioletBin){.lower = lower,
                            .upper = upper,
                            .above = above,
                            .ground = above * u->ground[bin] * u->sun.earth_sun,
                            .weight = erythema_mean(lower, upper)};
}
