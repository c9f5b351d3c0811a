/* validate_numerics: the numerical errors of the baseline, each found by tightening one knob or by leaving
 * one approximation out. */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* ---- limits of the defaults ---- */

/* Factors against explicit days, ozone: percent in any layer, DU in the column. */
static const double DAY_LAYER_PERCENT = 1.0, DAY_COLUMN_DU = 0.3;
/* Refreshing less often may move the change from 1980 to 2000 by this share. */
static const double REFRESH_SHARE = 0.01;
/* Each other error: a thirtieth of the smallest change an analyst reads off, 1 % of the column. */
static const double SMALL_DU = 0.1;

static NumericRow *add(NumericRow *rows, int *count, const char *id, const char *what, const char *unit,
                       double limit)
{
    NumericRow *row = &rows[(*count)++];
    *row = (NumericRow){.id = id, .what = what, .unit = unit, .value = NAN, .limit = limit};
    return row;
}

/* ---- the day ---- */

typedef struct {
    double layer, layer_km; /* largest relative difference of ozone, percent, and where */
    double column;          /* DU, explicit less factors */
    double at[6];           /* percent, explicit less factors, at 15, 20, 25, 30, 40, 50 km */
} DayError;

static void compare_days(const Model *model, const double *factors, const double *explicit_days,
                         DayError *error)
{
    static const double km[6] = {15, 20, 25, 30, 40, 50};
    int o3 = mechanism_solved(model->mechanism, "O3");
    *error = (DayError){0};
    error->column = column_ozone_du(model, explicit_days) - column_ozone_du(model, factors);
    for (int l = 0; l < model->grid.layers; l++) {
        size_t at = FIELD(model->grid.padded, o3, l);
        double here = 1e-5 * model->grid.middle[l];
        double percent = 100.0 * (explicit_days[at] / factors[at] - 1.0);
        for (int i = 0; i < 6; i++)
            if (km[i] * 1e5 >= model->grid.edge[l] && km[i] * 1e5 < model->grid.edge[l + 1])
                error->at[i] = percent;
        if (fabs(percent) > error->layer) {
            error->layer = fabs(percent);
            error->layer_km = here;
        }
    }
}

/* Five years with factors under the values of mid-year, in which the balance of the step is found again, then
 * both ways from there for another. Ozone below some 25 km lives longer than that: there the difference is a
 * year's worth of error, above it is the whole. */
static int measure_day(const Run *baseline, int year, DayError *error, Fault *fault)
{
    Settings settings = baseline->model->settings;
    Model *model = NULL;
    Carried factors = {0}, days = {0};
    const Watcher nobody = {0};
    fprintf(stderr, "explicit days of %d\n", year);
    int code = carried_make(&factors, baseline->model, run_fields(baseline, year), year + 0.5, fault);
    if (!code)
        code = projection_spin_up(baseline->model, factors.stepper, factors.column, 5.0, 1.0, &nobody, fault);
    settings.day = DAY_EXPLICIT;
    if (!code)
        code = model_make(&model, &settings, fault);
    if (!code)
        code = carried_make(&days, model, factors.column->x, year + 0.5, fault);
    if (!code)
        code = projection_spin_up(model, days.stepper, days.column, 1.0, 1.0, &nobody, fault);
    if (!code)
        code = projection_spin_up(baseline->model, factors.stepper, factors.column, 1.0, 1.0, &nobody, fault);
    if (!code)
        compare_days(model, stepper_mean(factors.stepper), stepper_mean(days.stepper), error);
    carried_free(&factors);
    carried_free(&days);
    model_free(model);
    return code;
}

static int day_rows(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    static const struct {
        int year;
        const char *layer, *column;
    } when[] = {{1960, "day-1960-layer", "day-1960-column"},
                {1980, "day-1980-layer", "day-1980-column"},
                {2000, "day-2000-layer", "day-2000-column"},
                {2060, "day-2060-layer", "day-2060-column"}};
    double column[4] = {0};
    for (int i = 0; i < 4; i++) {
        DayError error;
        if (measure_day(baseline, when[i].year, &error, fault))
            return fault->code;
        NumericRow *row =
            add(rows, count, when[i].layer, "explicit days against factors, a year: O3, largest of a layer",
                "%", DAY_LAYER_PERCENT);
        row->value = error.layer;
        snprintf(row->note, ROW_NOTE, "at %g km; 15 20 25 30 40 50 km: %+.2f %+.2f %+.2f %+.2f %+.2f %+.2f",
                 error.layer_km, error.at[0], error.at[1], error.at[2], error.at[3], error.at[4],
                 error.at[5]);
        row = add(rows, count, when[i].column, "the same for the column", "DU", DAY_COLUMN_DU);
        row->value = fabs(error.column);
        snprintf(row->note, ROW_NOTE, "%+.4f DU", error.column);
        column[i] = error.column;
    }
    NumericRow *row =
        add(rows, count, "day-1980-2000", "its share in the change from 1980 to 2000", "DU", SMALL_DU);
    row->value = fabs(column[2] - column[1]);
    return 0;
}

/* ---- one knob at a time ---- */

/* Largest difference of a year's column between a run and the same years of the baseline. */
static double largest(const Run *run, const Run *reference, double *when)
{
    double most = 0.0;
    for (int i = 0; i < run->years; i++) {
        double difference =
            fabs(run->column[i] - reference->column[run->first_year + i - reference->first_year]);
        if (!(difference > most))
            continue;
        most = difference;
        *when = run->time[i];
    }
    return most;
}

static int splitting_row(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    Settings settings = baseline->model->settings;
    Run half;
    double when = 0.0;
    settings.outer_step_days *= 0.5;
    if (run_years(&half, &settings, NULL, "outer step halved", fault))
        return fault->code;
    NumericRow *row = add(rows, count, "split-half", "outer step halved, all years: column", "DU", SMALL_DU);
    row->value = largest(&half, baseline, &when);
    snprintf(row->note, ROW_NOTE, "in %.0f; %g against %g days", floor(when),
             baseline->model->settings.outer_step_days, settings.outer_step_days);
    run_free(&half);
    return 0;
}

/* The splitting alone: refreshes so dense that the moments at which they fall make no difference to speak of.
 */
static int splitting_alone_row(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    Settings settings = baseline->model->settings;
    Run whole, half;
    double when = 0.0;
    settings.last_year = settings.first_year + 15;
    settings.refresh_state *= 0.1;
    settings.refresh_column *= 0.25;
    if (run_years(&whole, &settings, NULL, "dense refreshes", fault))
        return fault->code;
    settings.outer_step_days *= 0.5;
    if (run_years(&half, &settings, NULL, "dense refreshes, outer step halved", fault)) {
        run_free(&whole);
        return fault->code;
    }
    NumericRow *row = add(rows, count, "split-half-alone", "the same with dense refreshes, 16 years: column",
                          "DU", SMALL_DU);
    row->value = largest(&half, &whole, &when);
    snprintf(row->note, ROW_NOTE, "in %.0f", floor(when));
    run_free(&whole);
    run_free(&half);
    return 0;
}

/* The splitting against the same equations unsplit. */
static int unsplit_rows(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    double column, layer, altitude = 0.0;
    if (splitting_error(&baseline->model->settings, 1985, 3, &column, &layer, &altitude, fault))
        return fault->code;
    NumericRow *row =
        add(rows, count, "split-unsplit-column", "split against unsplit, 1985-1987: column", "DU", SMALL_DU);
    row->value = fabs(column);
    snprintf(row->note, ROW_NOTE, "%+.3f DU", column);
    row = add(rows, count, "split-unsplit-layer", "the same, O3 in any layer", "%", 0.5);
    row->value = 100.0 * layer;
    snprintf(row->note, ROW_NOTE, "at %.1f km", altitude);
    return 0;
}

static int tolerance_row(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    Settings settings = baseline->model->settings;
    Run loose, tight;
    double when = 0.0, now = settings.relative_tolerance;
    settings.first_year = 1980;
    settings.last_year = 1989;
    settings.start = START_SPINUP;
    settings.spinup_years = 0;
    if (run_years(&loose, &settings, run_fields(baseline, 1979), "decade at the default tolerance", fault))
        return fault->code;
    settings.relative_tolerance = 1e-5;
    if (run_years(&tight, &settings, run_fields(baseline, 1979), "decade at 1e-5", fault)) {
        run_free(&loose);
        return fault->code;
    }
    NumericRow *row =
        add(rows, count, "tolerance", "relative tolerance 1e-5, 1980-1989: column", "DU", SMALL_DU);
    row->value = largest(&tight, &loose, &when);
    snprintf(row->note, ROW_NOTE, "in %.0f; %g: %ld solver steps, 1e-5: %ld", floor(when), now,
             loose.solver_steps, tight.solver_steps);
    run_free(&loose);
    run_free(&tight);
    return 0;
}

static int refresh_row(const Run *baseline, int of_state, NumericRow *rows, int *count, Fault *fault)
{
    Settings settings = baseline->model->settings;
    Run fine;
    settings.last_year = 2000;
    *(of_state ? &settings.refresh_state : &settings.refresh_column) *= of_state ? 0.2 : 0.25;
    if (run_years(&fine, &settings, NULL, of_state ? "refresh_state / 5" : "refresh_column / 4", fault))
        return fault->code;
    double change = run_column(baseline, 2000, 2000) - run_column(baseline, 1980, 1980);
    double fine_change = run_column(&fine, 2000, 2000) - run_column(&fine, 1980, 1980);
    NumericRow *row = of_state
                          ? add(rows, count, "refresh-state", "refresh_state a fifth: change 1980-2000", "DU",
                                REFRESH_SHARE * fabs(change))
                          : add(rows, count, "refresh-column", "refresh_column a quarter: change 1980-2000",
                                "DU", REFRESH_SHARE * fabs(change));
    row->value = fabs(fine_change - change);
    snprintf(row->note, ROW_NOTE, "%+.3f against %+.3f DU; %ld refreshes", fine_change, change,
             of_state ? fine.factor_refreshes : fine.photolysis_refreshes);
    run_free(&fine);
    return 0;
}

int numerics_measure(const Run *baseline, NumericRow *rows, int *count, Fault *fault)
{
    *count = 0;
    if (day_rows(baseline, rows, count, fault) || splitting_row(baseline, rows, count, fault) ||
        splitting_alone_row(baseline, rows, count, fault) || unsplit_rows(baseline, rows, count, fault) ||
        tolerance_row(baseline, rows, count, fault) || refresh_row(baseline, 1, rows, count, fault) ||
        refresh_row(baseline, 0, rows, count, fault) ||
        settled_rows(&baseline->model->settings, rows, count, fault))
        return fault->code;
    return 0;
}
