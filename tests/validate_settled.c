/* validate_settled: columns at rest with something changed, and what grid and mixing do to them. */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* ---- a settled column with something changed ---- */

static int element(const Mechanism *mechanism, const char *name)
{
    for (int e = 0; e < mechanism->elements; e++)
        if (!strcmp(mechanism->element[e], name))
            return e;
    return -1;
}

/* Gases with chlorine and without bromine, whose lines would move as well. */
static int brings_chlorine(const Mechanism *mechanism, int solved)
{
    int chlorine = element(mechanism, "Cl"), bromine = element(mechanism, "Br");
    return chlorine >= 0 && mechanism_atoms(mechanism, solved, chlorine) > 0 &&
           (bromine < 0 || mechanism_atoms(mechanism, solved, bromine) == 0);
}

static void scale(double *value, int count, double by)
{
    for (int i = 0; i < count; i++)
        value[i] *= by;
}

/* What the ground keeps of one species. */
static void scale_ground(Model *model, int solved, double by)
{
    int gas = model->surface_gas[solved];
    if (model->surface_kind[solved] == SURFACE_SCHEDULE)
        scale(model->schedule.abundance[gas], model->schedule.years[gas], by);
    else if (model->surface_kind[solved] == SURFACE_FIXED)
        scale(&model->surface_value[solved], 1, by);
}

static int change_model(Model *model, const Change *change, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    int n2o = mechanism_solved(mechanism, "N2O"), ch4 = mechanism_solved(mechanism, "CH4");
    if (n2o < 0 || ch4 < 0)
        return fault_set(fault, FAULT_INPUT, "%s: the mechanism has no %s", mechanism->path,
                         n2o < 0 ? "N2O" : "CH4");
    for (int s = 0; s < mechanism->solved; s++)
        if (brings_chlorine(mechanism, s))
            scale_ground(model, s, change->chlorine);
    scale_ground(model, n2o, change->n2o);
    scale_ground(model, ch4, change->ch4);
    scale(model->aerosol_area, model->grid.padded, change->aerosol);
    scale(model->base->aerosol_area, model->grid.padded, change->aerosol);
    if (change->eddy == 1.0)
        return 0;
    scale(model->eddy, model->grid.layers + 1, change->eddy);
    diffusion_free(model->diffusion);
    model->diffusion = NULL;
    return diffusion_make(&model->diffusion, &model->grid, &model->air, model->eddy, fault);
}

static double total_at(const Model *model, const double *x, int total, double km)
{
    double sum[SETTINGS_MAX_EDGES];
    budget_total(model, x, total, sum);
    return budget_at_km(model, sum, km);
}

static double life(const Model *model, const double *x, const double *rate, const char *gas)
{
    GasBudget budget;
    budget_gas(model, x, rate, mechanism_solved(model->mechanism, gas), 1, &budget);
    return budget_lifetime(&budget, budget.loss, GAS_LOSSES);
}

static int describe(Settled *settled, const Stepper *stepper, const double *x, Fault *fault)
{
    const Model *model = settled->model;
    const Mechanism *mechanism = model->mechanism;
    size_t padded = (size_t)model->grid.padded, field = (size_t)mechanism->solved * padded;
    double *rate = calloc((size_t)mechanism->reactions * padded, sizeof(double));
    settled->x = malloc(field * sizeof(double));
    if (!rate || !settled->x) {
        free(rate);
        return fault_memory(fault, "a settled column");
    }
    memcpy(settled->x, x, field * sizeof(double));
    budget_step_rates(model, stepper, x, rate);
    settled->column = column_ozone_du(model, x);
    settled->ozone_40 = budget_at_km(model, x + FIELD(padded, mechanism_solved(mechanism, "O3"), 0), 40.0);
    settled->cly_50 = total_at(model, x, TOTAL_CLY, 50.0);
    settled->life_n2o = life(model, x, rate, "N2O");
    settled->life_cfc11 = life(model, x, rate, "CFC-11");
    free(rate);
    return 0;
}

int settled_make(Settled *settled, const Settings *from, const Change *change, int year, const double *start,
                 Fault *fault)
{
    *settled = (Settled){0};
    Settings settings = *from;
    Carried rest = {0};
    settings.first_year = settings.last_year = year;
    if (settings.day == DAY_EXPLICIT) /* whose state is that of midnight */
        settings.day = DAY_FACTORS;
    int code = model_make(&settled->model, &settings, fault);
    if (!code)
        code = change_model(settled->model, change, fault);
    if (!code)
        code = carried_make(&rest, settled->model, start, year + 0.5, fault);
    if (!code)
        code = projection_settle(settled->model, rest.stepper, rest.column, fault);
    if (!code && mechanism_solved(settled->model->mechanism, "CFC-11") < 0)
        code =
            fault_set(fault, FAULT_INPUT, "%s: the mechanism has no CFC-11", settled->model->mechanism->path);
    if (!code)
        code = describe(settled, rest.stepper, rest.column->x, fault);
    carried_free(&rest);
    if (code)
        settled_free(settled);
    return code;
}

void settled_free(Settled *settled)
{
    model_free(settled->model);
    free(settled->x);
    *settled = (Settled){0};
}

/* ---- two years of one setting ---- */

enum { EARLY, LATE, BOTH };
static const int when[BOTH] = {1980, 2000};

static int both_years(Settled pair[BOTH], const Settings *settings, const Change *change, const double *start,
                      Fault *fault)
{
    pair[EARLY] = pair[LATE] = (Settled){0};
    for (int i = 0; i < BOTH; i++)
        if (settled_make(&pair[i], settings, change, when[i], i ? pair[EARLY].x : start, fault)) {
            settled_free(&pair[EARLY]);
            return fault->code;
        }
    return 0;
}

static void free_both(Settled pair[BOTH])
{
    settled_free(&pair[EARLY]);
    settled_free(&pair[LATE]);
}

/* ---- the grid ---- */

/* Mean over the layers of model that lie in an interval of altitude, by mass. */
static double mean_within(const Model *model, const double *profile, double low, double high)
{
    double sum = 0.0, mass = 0.0;
    for (int l = 0; l < model->grid.layers; l++) {
        if (model->grid.middle[l] < low || model->grid.middle[l] > high)
            continue;
        double here = model->air.number_density[l] * model->grid.depth[l];
        sum += here * profile[l];
        mass += here;
    }
    return sum / mass;
}

/* Largest relative difference of ozone, percent, in the coarse layers of 15 to 60 km. */
static double largest_layer(const Settled *coarse, const Settled *fine, double *km)
{
    const Grid *grid = &coarse->model->grid;
    const double *a = coarse->x + FIELD(grid->padded, mechanism_solved(coarse->model->mechanism, "O3"), 0);
    const double *b =
        fine->x + FIELD(fine->model->grid.padded, mechanism_solved(fine->model->mechanism, "O3"), 0);
    double most = 0.0;
    for (int l = 0; l < grid->layers; l++) {
        if (grid->edge[l] < 15e5 - 1.0 || grid->edge[l + 1] > 60e5 + 1.0)
            continue;
        double percent =
            100.0 * fabs(a[l] / mean_within(fine->model, b, grid->edge[l], grid->edge[l + 1]) - 1.0);
        if (percent <= most)
            continue;
        most = percent;
        *km = 1e-5 * grid->middle[l];
    }
    return most;
}

static double change_of(const Settled pair[BOTH])
{
    return pair[LATE].column - pair[EARLY].column;
}

static NumericRow *reported(NumericRow *rows, int *count, const char *id, const char *what, const char *unit,
                            double value)
{
    NumericRow *row = &rows[(*count)++];
    *row = (NumericRow){.id = id, .what = what, .unit = unit, .value = value, .limit = INFINITY};
    return row;
}

static int grid_rows(const Settings *settings, const Settled base[BOTH], NumericRow *rows, int *count,
                     Fault *fault)
{
    static const Change nothing = CHANGE_NOTHING;
    Settings finer = *settings;
    Settled fine[BOTH];
    double km = 0.0;
    if (settings->edges) /* a grid of the case's own has no spacing to halve */
        return 0;
    finer.spacing_km *= 0.5;
    fprintf(stderr, "settled: layers of %g km\n", finer.spacing_km);
    if (both_years(fine, &finer, &nothing, NULL, fault))
        return fault->code;
    NumericRow *row = reported(rows, count, "grid-column", "layers halved, settled 2000: column", "DU",
                               fabs(base[LATE].column - fine[LATE].column));
    snprintf(row->note, ROW_NOTE, "%.3f at %g km, %.3f at %g km", base[LATE].column, settings->spacing_km,
             fine[LATE].column, finer.spacing_km);
    row = reported(rows, count, "grid-change", "the same, change 1980-2000", "DU",
                   fabs(change_of(base) - change_of(fine)));
    snprintf(row->note, ROW_NOTE, "%+.3f and %+.3f DU", change_of(base), change_of(fine));
    row = reported(rows, count, "grid-layer", "the same, O3 in any layer of 15 to 60 km", "%",
                   largest_layer(&base[LATE], &fine[LATE], &km));
    snprintf(row->note, ROW_NOTE, "at %g km, mean of the finer layers by mass", km);
    reported(rows, count, "grid-N2O", "the same, lifetime of N2O", "%",
             100.0 * fabs(base[LATE].life_n2o / fine[LATE].life_n2o - 1.0));
    reported(rows, count, "grid-CFC-11", "the same, lifetime of CFC-11", "%",
             100.0 * fabs(base[LATE].life_cfc11 / fine[LATE].life_cfc11 - 1.0));
    free_both(fine);
    return 0;
}

/* ---- the mixing ---- */

static void profile_rows(const Settled pair[BOTH], const char *const id[4], const char *what,
                         NumericRow *rows, int *count)
{
    static const char *const quantity[4] = {"column 2000", "change 1980-2000", "lifetime of N2O",
                                            "lifetime of CFC-11"};
    const double value[4] = {pair[LATE].column, change_of(pair), pair[LATE].life_n2o, pair[LATE].life_cfc11};
    for (int i = 0; i < 4; i++)
        snprintf(reported(rows, count, id[i], what, i < 2 ? "DU" : "year", value[i])->note, ROW_NOTE, "%s",
                 quantity[i]);
}

static int mixing_rows(const Settings *settings, const Settled base[BOTH], NumericRow *rows, int *count,
                       Fault *fault)
{
    static const struct {
        const char *id[4], *what, *file; /* NULL: the case's */
        double by;
    } profiles[] = {{{"K-column", "K-change", "K-N2O", "K-CFC-11"}, "settled, mixing of the case", NULL, 1.0},
                    {{"K-unadj-column", "K-unadj-change", "K-unadj-N2O", "K-unadj-CFC-11"},
                     "eddy-diffusion-unadjusted.csv",
                     "eddy-diffusion-unadjusted.csv",
                     1.0},
                    {{"K-0.7-column", "K-0.7-change", "K-0.7-N2O", "K-0.7-CFC-11"},
                     "eddy coefficient times 0.7",
                     NULL,
                     0.7},
                    {{"K-1.4-column", "K-1.4-change", "K-1.4-N2O", "K-1.4-CFC-11"},
                     "eddy coefficient times 1.4",
                     NULL,
                     1.4}};
    profile_rows(base, profiles[0].id, profiles[0].what, rows, count);
    for (size_t i = 1; i < sizeof profiles / sizeof profiles[0]; i++) {
        Change change = CHANGE_NOTHING;
        Settings mixed = *settings;
        Settled pair[BOTH];
        change.eddy = profiles[i].by;
        if (profiles[i].file)
            snprintf(mixed.eddy_file, sizeof mixed.eddy_file, "%s", profiles[i].file);
        fprintf(stderr, "settled: %s\n", profiles[i].what);
        if (both_years(pair, &mixed, &change, base[EARLY].x, fault))
            return fault->code;
        profile_rows(pair, profiles[i].id, profiles[i].what, rows, count);
        free_both(pair);
    }
    return 0;
}

int settled_rows(const Settings *settings, NumericRow *rows, int *count, Fault *fault)
{
    static const Change nothing = CHANGE_NOTHING;
    Settled base[BOTH];
    if (both_years(base, settings, &nothing, NULL, fault))
        return fault->code;
    int code = grid_rows(settings, base, rows, count, fault);
    if (!code)
        code = mixing_rows(settings, base, rows, count, fault);
    free_both(base);
    return code;
}
