/* column: building the model from a case, the first state, and sums over the column. */
#include "column_parts.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"
#include "conditions.h"
#include "emission.h"
#include "moments.h"
#include "variation.h"

/* ---- tables of the case ---- */

int model_locate(const Settings *settings, const char *what, const char *file, char *found, Fault *fault)
{
    return table_locate(what, file, settings->case_dir, settings->data_dir, found, SETTINGS_PATH, fault);
}

/* Append "what: text" to the list of sources. */
int model_add_source(Model *model, Fault *fault, const char *what, const char *text)
{
    size_t old = model->sources ? strlen(model->sources) : 0, more = strlen(what) + strlen(text) + 4;
    char *longer = realloc(model->sources, old + more);
    if (!longer)
        return fault_memory(fault, "list of sources");
    snprintf(longer + old, more, "%s: %s\n", what, text);
    model->sources = longer;
    return 0;
}

static int add_table_source(Model *model, const char *what, const Table *table, Fault *fault)
{
    char text[600];
    if (!table_header(table, "source", text, sizeof text))
        snprintf(text, sizeof text, "%s", table->path);
    return model_add_source(model, fault, what, text);
}

/* A profile table: opened, altitude ascending, covering the grid up to `to` cm. */
static int read_profile(const Model *model, Table *table, const char *what, const char *file, double to,
                        const double **altitude, Fault *fault)
{
    char path[SETTINGS_PATH];
    size_t column = 0;
    int code = model_locate(&model->settings, what, file, path, fault);
    if (!code)
        code = table_read(table, path, fault);
    if (!code)
        code = table_column(table, "altitude_km", &column, fault);
    if (!code)
        code = table_require_increasing(table, column, fault);
    if (code)
        return code;
    *altitude = table_values(table, column);
    double last = (*altitude)[table->rows - 1];
    if ((*altitude)[0] > 0.5 * 1e-5 * model->grid.depth[0] || last * 1e5 < to * (1.0 - 1e-9))
        return fault_at(fault, path, table->line[table->rows - 1],
                        "%s covers %g to %g km, but 0 to %g km is needed; add rows", what, (*altitude)[0],
                        last, to * 1e-5);
    return 0;
}

static int read_column(const Table *table, const char *name, double low, double high, const double **values,
                       Fault *fault)
{
    size_t column;
    int code = table_column(table, name, &column, fault);
    if (!code)
        code = table_require_range(table, column, low, high, fault);
    if (!code)
        *values = table_values(table, column);
    return code;
}

static double middle_km(const Model *model, int layer)
{
    return 1e-5 * model->grid.middle[layer];
}

static int read_aerosol(Model *model, Fault *fault)
{
    Table table = {0};
    const double *altitude, *area, *radius;
    double top = model->grid.middle[model->grid.layers - 1];
    int code =
        read_profile(model, &table, "aerosol surface", model->settings.aerosol_file, top, &altitude, fault);
    if (!code)
        code = read_column(&table, "surface_um2_cm-3", 1e-12, 1e4, &area, fault);
    if (!code)
        code = read_column(&table, "effective_radius_um", 1e-3, 100.0, &radius, fault);
    for (int l = 0; !code && l < model->grid.padded; l++) {
        model->aerosol_area[l] = 1e-8 * table_loglinear(altitude, area, table.rows, middle_km(model, l));
        model->aerosol_radius[l] = 1e-4 * table_loglinear(altitude, radius, table.rows, middle_km(model, l));
    }
    if (!code)
        code = add_table_source(model, "aerosol surface", &table, fault);
    table_free(&table);
    return code;
}

static int tropospheric(const Model *model, int layer)
{
    return middle_km(model, layer) < model->settings.tropopause_km;
}

/* Hold a species below the tropopause. column is in number density (cm-3) if it ends so, else in mole
 * fraction. */
static int read_held(Model *model, const char *species, const char *what, const char *file,
                     const char *column, Fault *fault)
{
    int solved = mechanism_solved(model->mechanism, species), density = strstr(column, "_cm-3") != NULL;
    if (!file[0] || solved < 0)
        return 0;
    Table table = {0};
    const double *altitude, *value;
    int code = read_profile(model, &table, what, file, 1e5 * model->settings.tropopause_km, &altitude, fault);
    if (!code)
        code = read_column(&table, column, density ? 0.0 : 1e-15, density ? 1e9 : 0.1, &value, fault);
    if (!code) {
        int padded = model->grid.padded, h = model->held++;
        model->held_species[h] = solved;
        for (int l = 0; l < padded; l++) {
            int free_here = !tropospheric(model, l);
            double x = density ? table_linear(altitude, value, table.rows, middle_km(model, l)) /
                                     model->air.number_density[l]
                               : table_loglinear(altitude, value, table.rows, middle_km(model, l));
            model->held_free[FIELD(padded, h, l)] = free_here;
            model->held_fraction[FIELD(padded, h, l)] = free_here ? 0.0 : x;
        }
        code = add_table_source(model, what, &table, fault);
    }
    table_free(&table);
    return code;
}

static int read_troposphere(Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    if (!tropospheric(model, 0))
        return fault_set(
            fault, FAULT_INPUT,
            "grid.edges_km: the middle of the lowest layer, %g km, lies above surface.tropopause_km, %g km; "
            "add edges below",
            middle_km(model, 0), settings->tropopause_km);
    int code = read_held(model, "H2O", "tropospheric water", settings->tropospheric_water_file,
                         "H2O_mol_mol-1", fault);
    if (!code)
        code = read_held(model, "OH", "tropospheric OH", settings->tropospheric_oh_file, "OH_cm-3", fault);
    if (!code)
        code = read_held(model, "NO2", "tropospheric NO2", settings->tropospheric_no2_file, "NO2_mol_mol-1",
                         fault);
    return code;
}

/* ---- the model ---- */

static int make_grid_and_air(Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    char path[SETTINGS_PATH], source[600];
    int code = grid_make(&model->grid, settings->top_km, settings->spacing_km, settings->edge_km,
                         settings->edges, fault);
    if (code)
        return code;
    if (settings->air_file[0]) {
        code = model_locate(settings, "air profile", settings->air_file, path, fault);
        if (!code)
            code = air_from_file(&model->air, &model->grid, path, fault);
    } else {
        code = air_standard(&model->air, &model->grid, fault);
    }
    if (!code)
        code = model_add_source(model, fault, "air", model->air.source);
    if (!code)
        code = model_locate(settings, "eddy profile", settings->eddy_file, path, fault);
    if (code)
        return code;
    model->eddy = calloc((size_t)model->grid.layers + 1, sizeof(double));
    if (!model->eddy)
        return fault_memory(fault, "eddy profile");
    code = diffusion_read_eddy(model->eddy, &model->grid, path, source, sizeof source, fault);
    if (!code)
        code = model_add_source(model, fault, "eddy diffusion coefficient", source);
    if (!code)
        code = diffusion_make(&model->diffusion, &model->grid, &model->air, model->eddy, fault);
    return code;
}

static int make_chemistry(Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    char path[SETTINGS_PATH], bins[SETTINGS_PATH], solar[SETTINGS_PATH];
    int code = model_locate(settings, "mechanism", settings->mechanism_file, path, fault);
    if (!code)
        code = mechanism_read(&model->mechanism, path, fault);
    if (!code && mechanism_solved(model->mechanism, "O3") < 0)
        code = fault_at(fault, path, 0,
                        "the mechanism has no active species O3; add it, it is what the column is for");
    if (!code)
        code = kernel_make(&model->kernel, model->mechanism, fault);
    if (!code)
        code = model_add_source(model, fault, "mechanism", model->mechanism->citations);
    if (!code)
        code = model_locate(settings, "wavelength bins", settings->bins_file, bins, fault);
    if (!code)
        code = model_locate(settings, "solar spectrum", settings->solar_file, solar, fault);
    if (!code)
        code = spectra_read(&model->spectra, model->mechanism, settings->data_dir, bins, solar, fault);
    if (!code)
        code = model_add_source(model, fault, "spectra", model->spectra->sources);
    return code;
}

static int make_fields(Model *model, Fault *fault)
{
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    model->aerosol_area = calloc(padded, sizeof(double));
    model->aerosol_radius = calloc(padded, sizeof(double));
    model->washout_rate = calloc(padded, sizeof(double));
    model->surface_kind = calloc(solved, sizeof(int));
    model->surface_gas = calloc(solved, sizeof(int));
    model->surface_value = calloc(solved, sizeof(double));
    model->held_species = calloc(MODEL_HELD_MOST, sizeof(int));
    model->held_free = calloc(MODEL_HELD_MOST * padded, sizeof(double));
    model->held_fraction = calloc(MODEL_HELD_MOST * padded, sizeof(double));
    if (!model->aerosol_area || !model->aerosol_radius || !model->washout_rate || !model->surface_kind ||
        !model->surface_gas || !model->surface_value || !model->held_species || !model->held_free ||
        !model->held_fraction)
        return fault_memory(fault, "model");
    const Settings *settings = &model->settings;
    for (size_t l = 0; l < padded; l++) {
        double share = 1.0 - middle_km(model, (int)l) / settings->tropopause_km;
        model->washout_rate[l] = share > 0.0 ? settings->washout_per_day / DAY_SECONDS * share : 0.0;
    }
    return 0;
}

int model_make(Model **made, const Settings *settings, Fault *fault)
{
    *made = NULL;
    Model *model = calloc(1, sizeof *model);
    if (!model)
        return fault_memory(fault, "model");
    model->settings = *settings;
    double hours[MOMENTS];
    int code = settings->moments == MOMENTS_NONE ? 0 : moments_hours(settings, hours, fault);
    if (!code)
        code = make_grid_and_air(model, fault);
    if (!code)
        code = make_chemistry(model, fault);
    if (!code)
        code = make_fields(model, fault);
    if (!code)
        code = model_read_schedule(model, fault);
    if (!code)
        code = read_troposphere(model, fault);
    if (!code)
        code = model_set_ground(model, fault);
    if (!code)
        code = read_aerosol(model, fault);
    if (!code)
        code = variation_read(&model->variation, model, &model->sources, fault);
    if (!code)
        code = conditions_make(&model->base, model, fault);
    if (code) {
        model_free(model);
        return code;
    }
    *made = model;
    return 0;
}

void model_free(Model *model)
{
    if (!model)
        return;
    variation_free(model->variation);
    conditions_free(model->base);
    diffusion_free(model->diffusion);
    spectra_free(model->spectra);
    kernel_free(model->kernel);
    mechanism_free(model->mechanism);
    schedule_free(&model->schedule);
    air_free(&model->air);
    grid_free(&model->grid);
    free(model->eddy);
    free(model->aerosol_area);
    free(model->aerosol_radius);
    free(model->washout_rate);
    free(model->surface_kind);
    free(model->surface_gas);
    free(model->surface_value);
    emissions_free(model->emissions);
    free(model->held_species);
    free(model->held_free);
    free(model->held_fraction);
    free(model->sources);
    free(model);
}

/* ---- the first state ---- */

static int initial_state(const Model *model, Column *column, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded;
    for (int s = 0; s < mechanism->solved; s++) {
        int gas = model->surface_gas[s];
        double x = gas >= 0 ? schedule_abundance(&model->schedule, gas, column->time) : 0.0;
        if (model->surface_kind[s] == SURFACE_FIXED)
            x = model->surface_value[s];
        for (int l = 0; l < padded; l++)
            column->x[FIELD(padded, s, l)] = x;
    }
    Table table = {0};
    const double *altitude, *value;
    double top = model->grid.middle[model->grid.layers - 1];
    int code =
        read_profile(model, &table, "initial profiles", model->settings.initial_file, top, &altitude, fault);
    for (size_t c = 0; !code && c < table.columns; c++) {
        if (!strcmp(table.name[c], "altitude_km"))
            continue;
        int s = mechanism_solved(mechanism, table.name[c]);
        if (s < 0)
            code =
                fault_at(fault, table.path, 0, "column %s is no active species of %s; correct or remove it",
                         table.name[c], mechanism->path);
        if (!code)
            code = read_column(&table, table.name[c], 0.0, 1.0, &value, fault);
        for (int l = 0; !code && l < padded; l++)
            column->x[FIELD(padded, s, l)] = table_linear(altitude, value, table.rows, middle_km(model, l));
    }
    table_free(&table);
    for (int h = 0; !code && h < model->held; h++)
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, h, l);
            if (model->held_free[at] == 0.0)
                column->x[FIELD(padded, model->held_species[h], l)] = model->held_fraction[at];
        }
    return code;
}

int column_make(Column **made, const Model *model, Fault *fault)
{
    *made = NULL;
    size_t solved = (size_t)model->mechanism->solved, padded = (size_t)model->grid.padded;
    Column *column = calloc(1, sizeof *column);
    if (!column)
        return fault_memory(fault, "column");
    column->x = aligned_alloc(64, solved * padded * sizeof(double));
    column->balance = calloc(solved * padded, sizeof(double));
    column->received = calloc(solved, sizeof(double));
    column->emitted = calloc(solved, sizeof(double));
    column->exchanged = calloc(solved, sizeof(double));
    column->washed = calloc(solved, sizeof(double));
    column->escaped = calloc(MECHANISM_ELEMENTS, sizeof(double));
    int code = 0;
    if (!column->x || !column->balance || !column->received || !column->emitted || !column->exchanged ||
        !column->washed || !column->escaped)
        code = fault_memory(fault, "column");
    column->time = model->settings.first_year;
    if (!code)
        code = initial_state(model, column, fault);
    if (code) {
        column_free(column);
        return code;
    }
    column_open_ledger(model, column);
    *made = column;
    return 0;
}

void column_free(Column *column)
{
    if (!column)
        return;
    free(column->x);
    free(column->balance);
    free(column->received);
    free(column->emitted);
    free(column->exchanged);
    free(column->washed);
    free(column->escaped);
    free(column);
}

void column_copy(Column *to, const Column *from, const Model *model)
{
    size_t solved = (size_t)model->mechanism->solved * sizeof(double);
    size_t field = solved * (size_t)model->grid.padded;
    Column kept = *to;
    *to = *from;
    to->x = memcpy(kept.x, from->x, field);
    to->balance = memcpy(kept.balance, from->balance, field);
    to->received = memcpy(kept.received, from->received, solved);
    to->emitted = memcpy(kept.emitted, from->emitted, solved);
    to->exchanged = memcpy(kept.exchanged, from->exchanged, solved);
    to->washed = memcpy(kept.washed, from->washed, solved);
    to->escaped = memcpy(kept.escaped, from->escaped, MECHANISM_ELEMENTS * sizeof(double));
}

/* ---- sums ---- */

void column_open_ledger(const Model *model, Column *column)
{
    size_t bytes = (size_t)model->mechanism->solved * sizeof(double);
    memset(column->received, 0, bytes);
    memset(column->emitted, 0, bytes);
    memset(column->exchanged, 0, bytes);
    memset(column->washed, 0, bytes);
    memset(column->escaped, 0, MECHANISM_ELEMENTS * sizeof(double));
    for (int e = 0; e < model->mechanism->elements; e++)
        column->start_atoms[e] = column_atoms(model, column->x, e);
    column->counts = (SolverCounts){0};
    column->photolysis_refreshes = column->factor_refreshes = column->outer_steps = 0;
    column->days = column->unsettled = 0;
}

double column_burden(const Model *model, const double *x, int solved)
{
    const double *row = x + FIELD(model->grid.padded, solved, 0);
    double sum = 0.0;
    for (int l = 0; l < model->grid.layers; l++)
        sum += row[l] * model->air.number_density[l] * model->grid.depth[l];
    return sum;
}

double column_ozone_du(const Model *model, const double *x)
{
    int solved = mechanism_solved(model->mechanism, "O3"), top = model->grid.layers - 1;
    double above = x[FIELD(model->grid.padded, solved, top)] * model->air.column_above_top;
    return (column_burden(model, x, solved) + above) / DOBSON_CM2;
}

double column_atoms(const Model *model, const double *x, int element)
{
    double sum = 0.0;
    for (int s = 0; s < model->mechanism->solved; s++) {
        int atoms = mechanism_atoms(model->mechanism, s, element);
        if (atoms)
            sum += atoms * column_burden(model, x, s);
    }
    return sum;
}

double column_ledger_atoms(const Model *model, const Column *column, int element)
{
    double sum = 0.0;
    for (int s = 0; s < model->mechanism->solved; s++)
        sum += mechanism_atoms(model->mechanism, s, element) *
               (column->received[s] + column->emitted[s] + column->exchanged[s] - column->washed[s]);
    for (int c = 0; c < model->kernel->counters; c++)
        if (model->kernel->counter_element[c] == element)
            sum -= column->escaped[c];
    return sum;
}

double column_closure(const Model *model, const Column *column, int element)
{
    double now = column_atoms(model, column->x, element);
    double defect = now - column->start_atoms[element] - column_ledger_atoms(model, column, element);
    return defect != 0.0 ? defect / now : 0.0; /* 0 also where there are no atoms at all */
}
