/* archive_layout: see archive_layout.h. Convention: CF-1.10, https://cfconventions.org. */
#define _XOPEN_SOURCE 700 /* gmtime_r */
#include "archive_layout.h"

#include <ctype.h>
#include <errno.h>
#include <limits.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <netcdf.h>

#include "archive.h"
#include "calendar.h"
#include "variation.h"

#ifndef SKYMEND_VERSION
#define SKYMEND_VERSION "unknown"
#endif

#define CM_PER_KM 1e5

enum { TIME_CHUNK = 512 }; /* records per chunk of the small series */

/* ---- names ---- */

/* Names of the CF standard name table, as mole_fraction_of_<...>_in_air; typed from memory. Those of O3, OH,
 * HO2, H2O, CH4, CH2O, CO, CO2, NO, NO2, HNO3, N2O, HCl, CFC-11, CFC-12, CFC-113 and HCFC-22 were checked
 * against the CMIP5 and CMIP6 tables of the Climate Model Output Rewriter 3.3. A species that is not listed
 * gets its long_name alone. */
static const struct {
    const char *species, *standard;
} cf_names[] = {
    {"O3", "ozone"},
    {"OH", "hydroxyl_radical"},
    {"HO2", "hydroperoxyl_radical"},
    {"H2O2", "hydrogen_peroxide"},
    {"H2O", "water_vapor"},
    {"H2", "molecular_hydrogen"},
    {"CH4", "methane"},
    {"CH3O2", "methyl_peroxy_radical"},
    {"CH3OOH", "methyl_hydroperoxide"},
    {"CH2O", "formaldehyde"},
    {"CO", "carbon_monoxide"},
    {"CO2", "carbon_dioxide"},
    {"NO", "nitrogen_monoxide"},
    {"NO2", "nitrogen_dioxide"},
    {"NO3", "nitrate_radical"},
    {"N2O5", "dinitrogen_pentoxide"},
    {"HNO3", "nitric_acid"},
    {"HO2NO2", "peroxynitric_acid"},
    {"N2O", "nitrous_oxide"},
    {"Cl", "atomic_chlorine"},
    {"ClO", "chlorine_monoxide"},
    {"OClO", "chlorine_dioxide"},
    {"Cl2O2", "dichlorine_peroxide"},
    {"HCl", "hydrogen_chloride"},
    {"HOCl", "hypochlorous_acid"},
    {"ClONO2", "chlorine_nitrate"},
    {"Br", "atomic_bromine"},
    {"BrO", "bromine_monoxide"},
    {"HBr", "hydrogen_bromide"},
    {"HOBr", "hypobromous_acid"},
    {"BrONO2", "bromine_nitrate"},
    {"BrCl", "bromine_chloride"},
    {"CFC-11", "cfc11"},
    {"CFC-12", "cfc12"},
    {"CFC-113", "cfc113"},
    {"CFC-114", "cfc114"},
    {"CFC-115", "cfc115"},
    {"CCl4", "carbon_tetrachloride"},
    {"CH3CCl3", "hcc140a"},
    {"HCFC-22", "hcfc22"},
    {"HCFC-141b", "hcfc141b"},
    {"HCFC-142b", "hcfc142b"},
    {"halon-1211", "halon1211"},
    {"halon-1202", "halon1202"},
    {"halon-1301", "halon1301"},
    {"halon-2402", "halon2402"},
    {"CH3Br", "methyl_bromide"},
    {"CH3Cl", "methyl_chloride"},
};

/* Runs of anything but letters and digits become one underscore, none at the end; a digit may not lead. */
void archive_name(const char *species, char *name, size_t size)
{
    size_t used = 0;
    if (size == 0)
        return;
    for (const char *c = species; *c && used + 1 < size; c++) {
        unsigned char letter = (unsigned char)*c;
        if (letter < 128 && isalnum(letter)) {
            if (used == 0 && isdigit(letter) && used + 2 < size)
                name[used++] = 'X';
            name[used++] = (char)letter;
        } else if (used > 0 && name[used - 1] != '_') {
            name[used++] = '_';
        }
    }
    while (used > 0 && name[used - 1] == '_')
        used--;
    name[used] = '\0';
}

/* ---- attributes ---- */

int layout_fault(const char *path, int status, const char *what, Fault *fault)
{
    if (status == NC_NOERR)
        return 0;
    return fault_set(fault, FAULT_OUTPUT, "%s: cannot write %s: %s", path, what, nc_strerror(status));
}

static int put_text(const Layout *out, int variable, const char *name, const char *text, Fault *fault)
{
    return layout_fault(out->path, nc_put_att_text(out->file, variable, name, strlen(text), text), name,
                        fault);
}

static int put_number(const Layout *out, const char *name, double value, Fault *fault)
{
    return layout_fault(out->path, nc_put_att_double(out->file, NC_GLOBAL, name, NC_DOUBLE, 1, &value), name,
                        fault);
}

/* An int where it fits (every reader knows it), else a double. */
static int put_count(const Layout *out, const char *name, long value, Fault *fault)
{
    if (value < INT_MIN || value > INT_MAX)
        return put_number(out, name, (double)value, fault);
    int whole = (int)value;
    return layout_fault(out->path, nc_put_att_int(out->file, NC_GLOBAL, name, NC_INT, 1, &whole), name,
                        fault);
}

/* "2026-02-03T04:05:06Z: command line". SOURCE_DATE_EPOCH stands in for the clock, so that a run can be
 * repeated to the byte (https://reproducible-builds.org/specs/source-date-epoch/). */
static int put_history(const Layout *out, const char *command_line, Fault *fault)
{
    time_t now = time(NULL);
    const char *given = getenv("SOURCE_DATE_EPOCH");
    if (given) {
        char *end;
        errno = 0;
        long long seconds = strtoll(given, &end, 10);
        if (errno || end == given || *end || seconds < 0)
            return fault_set(fault, FAULT_INPUT, "SOURCE_DATE_EPOCH is \"%s\": seconds since 1970 are wanted",
                             given);
        now = (time_t)seconds;
    }
    struct tm date;
    char stamp[40];
    if (!gmtime_r(&now, &date) || strftime(stamp, sizeof stamp, "%Y-%m-%dT%H:%M:%SZ", &date) == 0)
        return fault_set(fault, FAULT_INPUT, "SOURCE_DATE_EPOCH is \"%s\": no date", given ? given : "");
    size_t size = strlen(stamp) + strlen(command_line) + 3;
    char *line = malloc(size);
    if (!line)
        return fault_memory(fault, "the history line");
    snprintf(line, size, "%s: %s", stamp, command_line);
    int code = put_text(out, NC_GLOBAL, "history", line, fault);
    free(line);
    return code;
}

static int put_global(const Layout *out, const char *command_line, Fault *fault)
{
    const Model *model = out->model;
    const Mechanism *mechanism = model->mechanism;
    const char *title = model->settings.title;
    char *resolved = settings_text(&model->settings);
    if (!resolved)
        return fault_memory(fault, "the text of the case");
    const struct {
        const char *name, *text;
    } attributes[] = {
        {"Conventions", "CF-1.10"},
        {"title", title[0] ? title : "Projection of stratospheric ozone in a one-dimensional column"},
        {"source", "Skymend " SKYMEND_VERSION ", one-dimensional photochemical column model"},
        {"references", model->sources ? model->sources : ""},
        {"comment",
         "Each record is the mean over its interval, given by time_bnds. The model's years are 365.25 days "
         "long; a decimal year is written as the same fraction of that calendar year. Mole fractions are "
         "layer means; ozone_column includes the part above the top of the grid."},
        {"caution",
         "A single near-global column: no polar winter, no ozone hole, no change of circulation; "
         "temperature changes as the case has it (by default with CO2), not with ozone. A planning "
         "figure. Health and regulatory decisions defer to the competent authority and its own methods."},
        {"mechanism", mechanism->title ? mechanism->title : ""},
        {"mechanism_version", mechanism->version ? mechanism->version : ""},
        {"air_source", model->air.source},
        {"resolved_case", resolved},
    };
    int code = 0;
    for (size_t a = 0; a < sizeof attributes / sizeof *attributes && !code; a++)
        if (attributes[a].text[0])
            code = put_text(out, NC_GLOBAL, attributes[a].name, attributes[a].text, fault);
    free(resolved);
    return code ? code : put_history(out, command_line, fault);
}

/* ---- definitions ---- */

typedef struct {
    int time, altitude, edge, bound; /* dimension ids */
} Dimensions;

int layout_variable(const Layout *out, const Description *d, int dimensions, const int *dimension,
                    const size_t *chunk, int *variable, Fault *fault)
{
    int status = nc_def_var(out->file, d->name, NC_DOUBLE, dimensions, dimension, variable);
    if (status == NC_NOERR && chunk)
        status = nc_def_var_chunking(out->file, *variable, NC_CHUNKED, chunk);
    if (status != NC_NOERR)
        return layout_fault(out->path, status, d->name, fault);
    const struct {
        const char *name, *text;
    } attributes[] = {{"standard_name", d->standard},
                      {"long_name", d->longer},
                      {"units", d->units},
                      {"cell_methods", d->methods}};
    for (size_t a = 0; a < sizeof attributes / sizeof *attributes; a++)
        if (attributes[a].text && put_text(out, *variable, attributes[a].name, attributes[a].text, fault))
            return fault->code;
    return 0;
}

static int define_series(Layout *out, const Dimensions *dim, Fault *fault)
{
    static const Description time = {"time", CALENDAR_UNITS, "time", "middle of the interval", NULL};
    /* bounds have the attributes of what they bound (CF 7.1) */
    static const Description bounds = {"time_bnds", NULL, NULL, NULL, NULL};
    static const Description column = {"ozone_column", "DU", "atmosphere_mole_content_of_ozone",
                                       "ozone column above the ground", "time: mean"};
    const size_t chunk[2] = {TIME_CHUNK, 2};
    const int pair[2] = {dim->time, dim->bound};
    if (layout_variable(out, &time, 1, &dim->time, chunk, &out->time, fault) ||
        put_text(out, out->time, "calendar", "standard", fault) ||
        put_text(out, out->time, "axis", "T", fault) ||
        put_text(out, out->time, "bounds", "time_bnds", fault) ||
        layout_variable(out, &bounds, 2, pair, chunk, &out->time_bounds, fault) ||
        layout_variable(out, &column, 1, &dim->time, chunk, &out->column, fault))
        return fault->code;
    return 0;
}

static int define_species(const Layout *out, const Dimensions *dim, Fault *fault)
{
    const Mechanism *mechanism = out->model->mechanism;
    const int field[2] = {dim->time, dim->altitude};
    const size_t chunk[2] = {1, (size_t)out->model->grid.layers};
    for (int s = 0; s < mechanism->solved; s++) {
        const Species *species = &mechanism->item[mechanism->solved_item[s]];
        char name[MECHANISM_NAME + 2], standard[100], longer[2 * MECHANISM_NAME + 40];
        Description d = {name, "mol mol-1", NULL, longer, "time: mean altitude: mean"};
        int taken;
        archive_name(species->name, name, sizeof name);
        if (!name[0] || nc_inq_varid(out->file, name, &taken) == NC_NOERR)
            return fault_set(
                fault, FAULT_INPUT,
                "species %s: \"%s\" cannot be its variable in the file (empty or taken); rename the species",
                species->name, name);
        for (size_t c = 0; c < sizeof cf_names / sizeof *cf_names; c++)
            if (strcmp(cf_names[c].species, species->name) == 0) {
                snprintf(standard, sizeof standard, "mole_fraction_of_%s_in_air", cf_names[c].standard);
                d.standard = standard;
            }
        if (species->formula[0] && strcmp(species->formula, species->name) != 0)
            snprintf(longer, sizeof longer, "mole fraction of %s (%s) in air", species->name,
                     species->formula);
        else
            snprintf(longer, sizeof longer, "mole fraction of %s in air", species->name);
        if (layout_variable(out, &d, 2, field, chunk, &out->fraction[s], fault) ||
            put_text(out, out->fraction[s], "species", species->name, fault) ||
            put_text(out, out->fraction[s], "formula", species->formula, fault))
            return fault->code;
    }
    return 0;
}

/* Define and write one variable that does not change with time: value[count] times scale. */
static int put_fixed(const Layout *out, const Description *d, int dimension, const double *value, int count,
                     double scale, int *variable, Fault *fault)
{
    double *scaled = malloc((size_t)count * sizeof *scaled);
    if (!scaled)
        return fault_memory(fault, d->name);
    for (int i = 0; i < count; i++)
        scaled[i] = value[i] * scale;
    if (!layout_variable(out, d, 1, &dimension, NULL, variable, fault))
        layout_fault(out->path, nc_put_var_double(out->file, *variable, scaled), d->name, fault);
    free(scaled);
    return fault->code;
}

static int put_altitude(const Layout *out, const Dimensions *dim, Fault *fault)
{
    static const Description middle = {"altitude", "km", "altitude",
                                       "geometric altitude of the layer's middle", NULL};
    static const Description edge = {"altitude_edge", "km", "altitude",
                                     "geometric altitude of the layer edges", NULL};
    static const Description bounds = {"altitude_bnds", NULL, NULL, NULL, NULL};
    const Grid *grid = &out->model->grid;
    const int pair[2] = {dim->altitude, dim->bound};
    int variable;
    if (put_fixed(out, &edge, dim->edge, grid->edge, grid->layers + 1, 1.0 / CM_PER_KM, &variable, fault) ||
        put_text(out, variable, "positive", "up", fault) || put_text(out, variable, "axis", "Z", fault) ||
        put_fixed(out, &middle, dim->altitude, grid->middle, grid->layers, 1.0 / CM_PER_KM, &variable,
                  fault) ||
        put_text(out, variable, "positive", "up", fault) || put_text(out, variable, "axis", "Z", fault) ||
        put_text(out, variable, "bounds", "altitude_bnds", fault) ||
        layout_variable(out, &bounds, 2, pair, NULL, &variable, fault))
        return fault->code;
    for (size_t i = 0; i < (size_t)grid->layers; i++) {
        const size_t start[2] = {i, 0}, count[2] = {1, 2};
        const double two[2] = {grid->edge[i] / CM_PER_KM, grid->edge[i + 1] / CM_PER_KM};
        if (layout_fault(out->path, nc_put_vara_double(out->file, variable, start, count, two),
                         "altitude_bnds", fault))
            return fault->code;
    }
    return 0;
}

/* Define and write one number, a variable without dimensions. */
static int put_scalar(const Layout *out, const Description *d, double value, Fault *fault)
{
    int variable;
    return layout_variable(out, d, 0, NULL, NULL, &variable, fault)
               ? fault->code
               : layout_fault(out->path, nc_put_var_double(out->file, variable, &value), d->name, fault);
}

static int put_profiles(const Layout *out, const Dimensions *dim, Fault *fault)
{
    static const Description temperature = {
        "air_temperature", "K", "air_temperature",
        "air temperature of the base atmosphere, before any change by temperature.mode or month", NULL};
    static const Description pressure = {"air_pressure", "Pa", "air_pressure", "air pressure", NULL};
    static const Description density = {"air_number_density", "cm-3", NULL,
                                        "number density of air molecules of the base atmosphere; times layer "
                                        "depth the mass of the layer, which never changes",
                                        NULL};
    static const Description eddy = {"eddy_diffusion", "cm2 s-1", NULL, "vertical eddy diffusion coefficient",
                                     NULL};
    static const Description above = {"air_column_above_top", "cm-2", NULL,
                                      "air molecules above the top of the grid, where ozone has the mole "
                                      "fraction of the top layer",
                                      NULL};
    static const Description tropopause = {"tropopause_altitude", "km", "tropopause_altitude",
                                           "tropopause of the case, surface.tropopause_km", NULL};
    const Model *model = out->model;
    int layers = model->grid.layers, variable;
    if (put_scalar(out, &above, model->air.column_above_top, fault) ||
        put_scalar(out, &tropopause, model->settings.tropopause_km, fault) ||
        put_fixed(out, &temperature, dim->altitude, model->air.temperature, layers, 1.0, &variable, fault) ||
        put_fixed(out, &pressure, dim->altitude, model->air.pressure, layers, 1.0, &variable, fault) ||
        put_fixed(out, &density, dim->altitude, model->air.number_density, layers, 1.0, &variable, fault) ||
        put_fixed(out, &eddy, dim->edge, model->eddy, layers + 1, 1.0, &variable, fault))
        return fault->code;
    return 0;
}

static int define_change(Layout *out, const Dimensions *dim, Fault *fault)
{
    static const Description change = {
        "temperature_change", "K", NULL,
        "temperature less air_temperature, which is that of the base atmosphere",
        "time: mean altitude: mean"};
    const int field[2] = {dim->time, dim->altitude};
    const size_t chunk[2] = {1, (size_t)out->model->grid.layers};
    out->change = -1;
    return variation_of_temperature(out->model->variation)
               ? layout_variable(out, &change, 2, field, chunk, &out->change, fault)
               : 0;
}

int layout_define(Layout *out, const char *command_line, Fault *fault)
{
    size_t layers = (size_t)out->model->grid.layers;
    Dimensions dim;
    int status = nc_def_dim(out->file, "time", NC_UNLIMITED, &dim.time);
    if (status == NC_NOERR)
        status = nc_def_dim(out->file, "altitude", layers, &dim.altitude);
    if (status == NC_NOERR)
        status = nc_def_dim(out->file, "altitude_edge", layers + 1, &dim.edge);
    if (status == NC_NOERR)
        status = nc_def_dim(out->file, "nv", 2, &dim.bound);
    if (layout_fault(out->path, status, "the dimensions", fault) || put_global(out, command_line, fault) ||
        define_series(out, &dim, fault) || put_altitude(out, &dim, fault) || put_profiles(out, &dim, fault) ||
        define_species(out, &dim, fault) || layout_moments(out, dim.time, dim.altitude, fault) ||
        layout_budget_define(out, dim.time, dim.altitude, TIME_CHUNK, fault) ||
        layout_emission_define(out, dim.time, TIME_CHUNK, fault) ||
        layout_ultraviolet_define(out, dim.time, TIME_CHUNK, fault) || define_change(out, &dim, fault))
        return fault->code;
    status = nc_enddef(out->file);
    if (status == NC_NOERR)
        status = nc_sync(out->file);
    return layout_fault(out->path, status, "the definitions", fault);
}

/* ---- summary ---- */

int layout_summary(const Layout *out, const Column *column, Fault *fault)
{
    static const char *const kept[] = {"Cl", "Br", "N", "H"};
    const SolverCounts *counts = &column->counts;
    const struct {
        const char *name;
        long value;
    } whole[] = {{"run_outer_steps", column->outer_steps},
                 {"run_days", column->days},
                 {"run_photolysis_refreshes", column->photolysis_refreshes},
                 {"run_factor_refreshes", column->factor_refreshes},
                 {"run_chemistry_calls", counts->calls},
                 {"run_chemistry_steps", counts->steps},
                 {"run_chemistry_rejections", counts->rejections},
                 {"run_chemistry_factorisations", counts->factorisations},
                 {"run_negative_values", counts->negatives}};
    for (size_t w = 0; w < sizeof whole / sizeof *whole; w++)
        if (put_count(out, whole[w].name, whole[w].value, fault))
            return fault->code;
    if (put_number(out, "run_most_negative_per_cm3", counts->most_negative, fault))
        return fault->code;
    for (size_t k = 0; k < sizeof kept / sizeof *kept; k++) {
        int element = mechanism_element(out->model->mechanism, kept[k]);
        if (element < 0)
            continue;
        double now = column_atoms(out->model, column->x, element);
        const struct {
            const char *format;
            double value;
        } ledger[] = {{"run_atoms_start_%s_per_cm2", column->start_atoms[element]},
                      {"run_atoms_end_%s_per_cm2", now},
                      {"run_atoms_received_%s_per_cm2", column_ledger_atoms(out->model, column, element)},
                      /* of no atoms at all there is no relative difference */
                      {"run_closure_%s", now != 0.0 ? column_closure(out->model, column, element) : 0.0}};
        for (size_t l = 0; l < sizeof ledger / sizeof *ledger; l++) {
            char name[48];
            snprintf(name, sizeof name, ledger[l].format, kept[k]);
            if (put_number(out, name, ledger[l].value, fault))
                return fault->code;
        }
    }
    return 0;
}
