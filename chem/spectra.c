/* spectra: see spectra.h.
 *
 * A table column is a curve in wavelength: points joined by straight or logarithmic lines, steps, or centred
 * steps (the solar table). Bin values are integrals over the pieces between neighbouring break points of the
 * curves involved, each by three-point Gauss-Legendre: exact for the solar steps, and to about 1e-6 for the
 * logarithmic lines. flux  F = integral of E(w) w / (h c) dw,      mean of g = integral of g E w dw /
 * integral of E w dw
 */
#include "spectra.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"
#include "oxygen.h"

#define SIGMA_MOST_CM2 1e-14 /* ten times the strongest band of any gas here: a wrong exponent is caught */
#define SHORTEST_NM 10.0
#define LONGEST_NM 4000.0
#define PATH_SIZE 1200

/* ---- curves ---- */

enum CurveKind { CURVE_LINEAR, CURVE_LOG, CURVE_STEP, CURVE_CENTRED };
enum CurveBeyond { BEYOND_ZERO, BEYOND_HELD };

typedef struct {
    int kind, beyond; /* enum CurveKind, enum CurveBeyond */
    size_t count;
    const double *x, *y;
} Curve;

/* Break point k of a curve: where one formula ends and the next begins. */
static size_t breaks(const Curve *curve)
{
    return curve->kind == CURVE_CENTRED ? curve->count + 1 : curve->count;
}

static double break_at(const Curve *curve, size_t k)
{
    const double *x = curve->x;
    size_t n = curve->count;
    if (curve->kind != CURVE_CENTRED)
        return x[k];
    if (k == 0)
        return x[0] - 0.5 * (x[1] - x[0]);
    if (k == n)
        return x[n - 1] + 0.5 * (x[n - 1] - x[n - 2]);
    return 0.5 * (x[k - 1] + x[k]);
}

/* How many break points lie at or below w. */
static size_t breaks_below(const Curve *curve, double w)
{
    size_t low = 0, high = breaks(curve);
    while (low < high) {
        size_t middle = low + (high - low) / 2;
        if (break_at(curve, middle) <= w)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

static double curve_at(const Curve *curve, double w)
{
    size_t below = breaks_below(curve, w), last = breaks(curve);
    if (below == 0 || below == last) {
        if (curve->beyond == BEYOND_ZERO)
            return 0;
        return curve->y[below == 0 ? 0 : curve->count - 1];
    }
    const double *x = curve->x + below - 1, *y = curve->y + below - 1;
    if (curve->kind == CURVE_STEP || curve->kind == CURVE_CENTRED)
        return y[0];
    double t = (w - x[0]) / (x[1] - x[0]);
    if (curve->kind == CURVE_LOG && y[0] > 0 && y[1] > 0)
        return y[0] * exp(t * log(y[1] / y[0]));
    return y[0] +
           t * (y[1] - y[0]); /* also where a logarithmic curve touches zero, which no shipped one does */
}

static double next_break(const Curve *curve, double w)
{
    size_t below = breaks_below(curve, w);
    return below < breaks(curve) ? break_at(curve, below) : HUGE_VAL;
}

/* Integral of solar * w (* other) from a to b; other may be NULL. */
static double integrate(const Curve *solar, const Curve *other, double a, double b)
{
    static const double node[3] = {-0.77459666924148337704, 0, 0.77459666924148337704};
    static const double weight[3] = {5.0 / 9.0, 8.0 / 9.0, 5.0 / 9.0};
    double sum = 0;
    for (double w = a; w < b;) {
        double next = fmin(b, next_break(solar, w));
        if (other)
            next = fmin(next, next_break(other, w));
        double half = 0.5 * (next - w);
        for (int i = 0; i < 3; i++) {
            double at = w + half * (1 + node[i]);
            sum += half * weight[i] * at * curve_at(solar, at) * (other ? curve_at(other, at) : 1);
        }
        w = next;
    }
    return sum;
}

/* ---- tables ---- */

static int note_source(Spectra *spectra, const Table *table, const char *file, Fault *fault)
{
    char source[1000];
    if (!table_header(table, "source", source, sizeof source))
        snprintf(source, sizeof source, "no source given");
    size_t have = spectra->sources ? strlen(spectra->sources) : 0;
    size_t more = strlen(file) + strlen(source) + 4;
    char *text = realloc(spectra->sources, have + more);
    if (!text)
        return fault_memory(fault, "citations");
    snprintf(text + have, more, "%s: %s\n", file, source);
    spectra->sources = text;
    return 0;
}

int spectra_table(Table *table, Spectra *spectra, const char *data_dir, const char *file, Fault *fault)
{
    char path[PATH_SIZE];
    memset(table, 0, sizeof *table);
    if (snprintf(path, sizeof path, "%s/%s", data_dir, file) >= (int)sizeof path)
        return fault_set(fault, FAULT_INPUT, "the path of %s is too long; use a shorter data folder", file);
    if (table_read(table, path, fault))
        return fault->code;
    if (note_source(spectra, table, file, fault))
        table_free(table);
    return fault->code;
}

/* The header's interpolation as a curve kind; allowed lists the kinds this table may have. */
static int curve_kind(const Table *table, const char *const allowed[4], int *kind, Fault *fault)
{
    char word[40];
    if (!table_header(table, "interpolation", word, sizeof word))
        return fault_at(fault, table->path, 0, "the header lacks \"# interpolation:\"; add it");
    char list[100] = "";
    for (int k = 0; k < 4; k++) {
        if (!allowed[k])
            continue;
        if (strcmp(word, allowed[k]) == 0) {
            *kind = k;
            return 0;
        }
        size_t used = strlen(list);
        snprintf(list + used, sizeof list - used, "%s%s", used ? ", " : "", allowed[k]);
    }
    return fault_at(fault, table->path, 0, "unknown interpolation \"%s\"; use one of: %s", word, list);
}

static int wavelengths(const Table *table, const double **wavelength, Fault *fault)
{
    size_t column;
    if (table_column(table, "wavelength_nm", &column, fault) ||
        table_require_increasing(table, column, fault) ||
        table_require_range(table, column, SHORTEST_NM, LONGEST_NM, fault))
        return fault->code;
    *wavelength = table_values(table, column);
    return 0;
}

/* ---- bins and sunlight ---- */

static int take_bins(Spectra *spectra, const Table *table, Fault *fault)
{
    size_t low, high;
    if (table_column(table, "lower_nm", &low, fault) || table_column(table, "upper_nm", &high, fault) ||
        table_require_range(table, low, SHORTEST_NM, LONGEST_NM, fault) ||
        table_require_range(table, high, SHORTEST_NM, LONGEST_NM, fault))
        return fault->code;
    size_t n = table->rows;
    spectra->bins = (int)n;
    double **array[] = {&spectra->lower, &spectra->upper, &spectra->flux, &spectra->irradiance};
    for (size_t a = 0; a < 4; a++)
        if (!(*array[a] = calloc(n, sizeof(double))))
            return fault_memory(fault, "wavelength bins");
    for (size_t k = 0; k < n; k++) {
        spectra->lower[k] = table_values(table, low)[k];
        spectra->upper[k] = table_values(table, high)[k];
        if (!(spectra->lower[k] < spectra->upper[k]))
            return fault_at(fault, table->path, table->line[k], "upper_nm must exceed lower_nm");
        if (k > 0 && spectra->lower[k] != spectra->upper[k - 1])
            return fault_at(
                fault, table->path, table->line[k],
                "the bin begins at %g nm, but the one before ends at %g nm; bins must be contiguous",
                spectra->lower[k], spectra->upper[k - 1]);
    }
    return 0;
}

/* Make solar the curve of the table and fill flux (bins and NO intervals) and irradiance. */
static int take_sunlight(Spectra *spectra, const Table *table, Curve *solar, Fault *fault)
{
    static const char *const allowed[4] = {"linear", NULL, "step", "centred"};
    size_t column;
    if (wavelengths(table, &solar->x, fault) ||
        table_column(table, "irradiance_W_m-2_nm-1", &column, fault) ||
        table_require_range(table, column, 0, 100, fault) || curve_kind(table, allowed, &solar->kind, fault))
        return fault->code;
    solar->y = table_values(table, column);
    solar->count = table->rows;
    solar->beyond = BEYOND_ZERO;
    if (solar->count < 2)
        return fault_at(fault, table->path, 0, "one row is no spectrum; complete it");
    double from = break_at(solar, 0), to = break_at(solar, breaks(solar) - 1);
    if (from > spectra->lower[0] || to < spectra->upper[spectra->bins - 1])
        return fault_at(
            fault, table->path, 0,
            "the solar table covers %g to %g nm, the wavelength bins %g to %g nm; shorten the bins or "
            "extend the table",
            from, to, spectra->lower[0], spectra->upper[spectra->bins - 1]);
    /* photons of 1 nm wavelength per joule, and from m-2 to cm-2 */
    const double photons = 1e-9 / (PLANCK * LIGHT_SPEED) * 1e-4;
    for (int k = 0; k < spectra->bins; k++) {
        double a = spectra->lower[k], b = spectra->upper[k];
        spectra->flux[k] = photons * integrate(solar, NULL, a, b);
        if (!(spectra->flux[k] > 0))
            return fault_at(fault, table->path, 0, "no sunlight from %g to %g nm; correct the table", a, b);
        for (double w = a; w < b;) { /* midpoint rule by pieces: exact for steps and for lines */
            double next = fmin(b, next_break(solar, w));
            spectra->irradiance[k] += (next - w) * curve_at(solar, 0.5 * (w + next));
            w = next;
        }
    }
    for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++) {
        NitricOxideInterval *interval = &spectra->nitric_oxide->interval[i];
        interval->flux = photons * integrate(solar, NULL, interval->lower, interval->upper);
    }
    return 0;
}

/* ---- one spectrum ---- */

/* "sigma_298K" -> 298; 0 when the name is of another form. */
static double column_temperature(const char *name, const char *prefix)
{
    size_t length = strlen(prefix);
    if (strncmp(name, prefix, length) != 0)
        return 0;
    char *end;
    double kelvin = strtod(name + length, &end);
    return strcmp(end, "K") == 0 && end > name + length && kelvin > 0 && kelvin < 1000 ? kelvin : 0;
}

static void bin_means(const Spectra *spectra, const Curve *solar, const Curve *curve, double *mean)
{
    for (int k = 0; k < spectra->bins; k++)
        mean[k] = integrate(solar, curve, spectra->lower[k], spectra->upper[k]) /
                  integrate(solar, NULL, spectra->lower[k], spectra->upper[k]);
}

/* A cross section is zero outside its table. One that meets no bin is a slip, and that of ozone, which sets
 * the light all others get, must leave no bin out. */
static int covers_bins(const Spectrum *to, const Spectra *spectra, const Table *table,
                       const double *wavelength, Fault *fault)
{
    double low = spectra->lower[0], high = spectra->upper[spectra->bins - 1];
    double first = wavelength[0], last = wavelength[table->rows - 1];
    if (first >= high || last <= low)
        return fault_at(
            fault, table->path, table->line[0],
            "the table covers %g to %g nm, none of the bins' %g to %g nm; correct its wavelengths", first,
            last, low, high);
    if (to->logarithmic && strcmp(to->name, "O3") == 0 && (first > low || last < high))
        return fault_at(
            fault, table->path, table->line[first > low ? 0 : table->rows - 1],
            "the ozone cross section covers %g to %g nm, but the bins reach from %g to %g nm; add rows",
            first, last, low, high);
    return 0;
}

static int take_spectrum(Spectrum *to, const Spectra *spectra, const Table *table, const Curve *solar,
                         Fault *fault)
{
    static const char *const allowed[4] = {"linear", "log", "step", NULL};
    const char *prefix = to->logarithmic ? "sigma_" : "phi_";
    Curve curve = {.beyond = to->logarithmic ? BEYOND_ZERO : BEYOND_HELD, .count = table->rows};
    size_t bins = (size_t)spectra->bins;
    if (wavelengths(table, &curve.x, fault) || curve_kind(table, allowed, &curve.kind, fault) ||
        covers_bins(to, spectra, table, curve.x, fault))
        return fault->code;
    to->sigma = calloc(SPECTRUM_TEMPERATURES * bins, sizeof *to->sigma);
    if (!to->sigma)
        return fault_memory(fault, table->path);
    for (size_t c = 0; c < table->columns; c++) {
        const char *name = table->name[c];
        if (strcmp(name, "wavelength_nm") == 0)
            continue;
        curve.y = table_values(table, c);
        if (!to->logarithmic && strcmp(name, "stern_volmer_cm3") == 0) {
            if (table_require_range(table, c, 0, SIGMA_MOST_CM2, fault))
                return fault->code;
            if (!(to->stern_volmer = calloc(bins, sizeof *to->stern_volmer)))
                return fault_memory(fault, table->path);
            bin_means(spectra, solar, &curve, to->stern_volmer);
            continue;
        }
        double kelvin = column_temperature(name, prefix);
        if (kelvin == 0)
            return fault_at(fault, table->path, 0, "column %s: expected wavelength_nm or %s<temperature>K",
                            name, prefix);
        if (to->temperatures == SPECTRUM_TEMPERATURES)
            return fault_at(fault, table->path, 0, "more than %d temperatures; leave some out",
                            SPECTRUM_TEMPERATURES);
        if (to->temperatures > 0 && kelvin <= to->temperature[to->temperatures - 1])
            return fault_at(fault, table->path, 0, "column %s: temperatures must increase", name);
        if (table_require_range(table, c, 0, to->logarithmic ? SIGMA_MOST_CM2 : 1, fault))
            return fault->code;
        to->temperature[to->temperatures] = kelvin;
        bin_means(spectra, solar, &curve, to->sigma + (size_t)to->temperatures * bins);
        to->temperatures++;
    }
    if (to->temperatures == 0)
        return fault_at(fault, table->path, 0, "no column %s<temperature>K; add one", prefix);
    return 0;
}

/* File name of a spectrum: its name with parentheses dropped. */
static void file_of(const char *name, int logarithmic, char *file, size_t size)
{
    size_t used = (size_t)snprintf(file, size, "%s/", logarithmic ? "xs" : "yield");
    for (; *name && used + 5 < size; name++)
        if (*name != '(' && *name != ')')
            file[used++] = *name;
    memcpy(file + used, ".csv", 5);
}

/* Index of a spectrum, read now if it is new; -1 on a fault. Room for it was made by the caller. */
static int want_spectrum(Spectra *spectra, const char *data_dir, const char *name, int logarithmic,
                         const Curve *solar, Fault *fault)
{
    for (int i = 0; i < spectra->spectra; i++)
        if (spectra->spectrum[i].logarithmic == logarithmic && strcmp(spectra->spectrum[i].name, name) == 0)
            return i;
    char file[MECHANISM_NAME + 16];
    file_of(name, logarithmic, file, sizeof file);
    Table table;
    if (spectra_table(&table, spectra, data_dir, file, fault))
        return -1;
    Spectrum *to = &spectra->spectrum[spectra->spectra++];
    snprintf(to->name, sizeof to->name, "%s", name);
    to->logarithmic = logarithmic;
    take_spectrum(to, spectra, &table, solar, fault);
    table_free(&table);
    return fault->code ? -1 : spectra->spectra - 1;
}

/* ---- O2 ---- */

/* Yield of O + O(1D) (atom = 1) or O + O (0) per absorbed photon and bin. The two thresholds fall
 * inside bins: there the yield is the share of the bin's absorption on the right side of them. */
static int make_oxygen_yield(Spectra *spectra, const Table *table, const Curve *solar, int atom, Fault *fault)
{
    Spectrum *to = &spectra->spectrum[spectra->spectra++];
    snprintf(to->name, sizeof to->name, "%s", atom ? "O2-O1D" : "O2-2O");
    to->temperatures = 1;
    to->temperature[0] = 298;
    to->sigma = calloc((size_t)spectra->bins, sizeof *to->sigma);
    if (!to->sigma)
        return fault_memory(fault, to->name);
    size_t column;
    Curve sigma = {.kind = CURVE_LOG, .count = table->rows, .beyond = BEYOND_ZERO};
    if (wavelengths(table, &sigma.x, fault) || table_column(table, "sigma_298K", &column, fault))
        return fault->code;
    sigma.y = table_values(table, column);
    for (int k = 0; k < spectra->bins; k++) {
        double a = spectra->lower[k], b = spectra->upper[k], all = integrate(solar, &sigma, a, b);
        double excited = 0, ground = 0;
        if (oxygen_parametrised(spectra, k)) {
            excited = k == spectra->lyman_alpha ? OXYGEN_O1D_LYMAN_ALPHA : 0;
            ground = 1 - excited;
        } else if (all > 0) {
            excited = integrate(solar, &sigma, a, fmin(b, OXYGEN_O1D_EDGE_NM)) / all;
            ground =
                integrate(solar, &sigma, fmax(a, OXYGEN_O1D_EDGE_NM), fmin(b, OXYGEN_DISSOCIATION_EDGE_NM)) /
                all;
        }
        to->sigma[k] = atom ? excited : ground;
    }
    return 0;
}

static int make_oxygen_yields(Spectra *spectra, const char *data_dir, const Curve *solar, int *index,
                              Fault *fault)
{
    char path[PATH_SIZE];
    Table table;
    snprintf(path, sizeof path, "%s/xs/O2.csv", data_dir);
    if (table_read(&table, path, fault))
        return fault->code;
    for (int atom = 0; atom < 2 && !fault->code; atom++) {
        index[atom] = spectra->spectra;
        make_oxygen_yield(spectra, &table, solar, atom, fault);
    }
    table_free(&table);
    return fault->code;
}

/* ---- the whole ---- */

static int read_spectra(Spectra *spectra, const Mechanism *mechanism, const char *data_dir,
                        const Curve *solar, Fault *fault)
{
    int first = mechanism->photolysis_first, count = mechanism->surface_first - first;
    size_t room = 2 * (size_t)count + 5; /* sigma and yield of each, three absorbers, two yields of O2 */
    spectra->spectrum = calloc(room, sizeof *spectra->spectrum);
    spectra->reaction_sigma = malloc((size_t)(count + 1) * sizeof *spectra->reaction_sigma);
    spectra->reaction_yield = malloc((size_t)(count + 1) * sizeof *spectra->reaction_yield);
    if (!spectra->spectrum || !spectra->reaction_sigma || !spectra->reaction_yield)
        return fault_memory(fault, "spectra");
    int oxygen_yield[2];
    if ((spectra->oxygen = want_spectrum(spectra, data_dir, "O2", 1, solar, fault)) < 0 ||
        (spectra->ozone = want_spectrum(spectra, data_dir, "O3", 1, solar, fault)) < 0 ||
        (spectra->nitrogen_dioxide = want_spectrum(spectra, data_dir, "NO2", 1, solar, fault)) < 0 ||
        make_oxygen_yields(spectra, data_dir, solar, oxygen_yield, fault))
        return fault->code;
    for (int r = 0; r < count; r++) {
        const Reaction *reaction = &mechanism->reaction[first + r];
        spectra->reaction_sigma[r] = spectra->reaction_yield[r] = -1;
        if (reaction->special == SPECIAL_O2 || reaction->special == SPECIAL_O2_O1D)
            spectra->reaction_yield[r] = oxygen_yield[reaction->special == SPECIAL_O2_O1D];
        if (reaction->special != SPECIAL_NONE)
            continue;
        spectra->reaction_sigma[r] = want_spectrum(spectra, data_dir, reaction->spectrum, 1, solar, fault);
        if (!fault->code && reaction->yield[0])
            spectra->reaction_yield[r] = want_spectrum(spectra, data_dir, reaction->yield, 0, solar, fault);
        if (fault->code)
            return fault->code;
    }
    return 0;
}

static int read_all(Spectra *spectra, const Mechanism *mechanism, const char *data_dir, const char *bins_path,
                    const char *solar_path, Fault *fault)
{
    Table bins, sun;
    if (table_read(&bins, bins_path, fault))
        return fault->code;
    take_bins(spectra, &bins, fault);
    table_free(&bins);
    if (fault->code || oxygen_read(spectra, data_dir, fault) || table_read(&sun, solar_path, fault))
        return fault->code;
    Curve solar;
    const char *slash = strrchr(solar_path, '/');
    if (!note_source(spectra, &sun, slash ? slash + 1 : solar_path, fault) && !take_sunlight(spectra, &sun, &solar, fault))
        read_spectra(spectra, mechanism, data_dir, &solar, fault);
    table_free(&sun);
    return fault->code;
}

int spectra_read(Spectra **read, const Mechanism *mechanism, const char *data_dir, const char *bins_path,
                 const char *solar_path, Fault *fault)
{
    *read = NULL;
    Spectra *spectra = calloc(1, sizeof *spectra);
    if (!spectra)
        return fault_memory(fault, "spectra");
    spectra->lyman_alpha = spectra->bands_first = -1;
    if (read_all(spectra, mechanism, data_dir, bins_path, solar_path, fault)) {
        spectra_free(spectra);
        return fault->code;
    }
    *read = spectra;
    return 0;
}

void spectra_free(Spectra *spectra)
{
    if (!spectra)
        return;
    for (int i = 0; i < spectra->spectra; i++) {
        free(spectra->spectrum[i].sigma);
        free(spectra->spectrum[i].stern_volmer);
    }
    free(spectra->spectrum);
    free(spectra->reaction_sigma);
    free(spectra->reaction_yield);
    free(spectra->lower);
    free(spectra->upper);
    free(spectra->flux);
    free(spectra->irradiance);
    free(spectra->band_coefficient);
    free(spectra->nitric_oxide);
    free(spectra->sources);
    free(spectra);
}
