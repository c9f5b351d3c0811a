/* projection: how a run starts, and the years. */
#include "projection.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "budget.h"
#include "steady.h"

static int stopped(const Watcher *watcher)
{
    return watcher->stop && *watcher->stop;
}

static void tell(const Model *model, const Column *column, const Watcher *watcher, int spinning_up,
                 double share)
{
    if (!watcher->progress)
        return;
    Progress progress = {spinning_up, column->time, share, column_ozone_du(model, column->x)};
    watcher->progress(watcher->context, &progress);
}

/* Outer steps that fill length years, and their length in s. Explicit days are whole: their number is that of
 * the days that end within the interval. */
static long plan_steps(const Model *model, double start, double length, double *step)
{
    double days = length * (YEAR_SECONDS / DAY_SECONDS);
    if (model->settings.day == DAY_EXPLICIT) {
        *step = DAY_SECONDS;
        double first = start * (YEAR_SECONDS / DAY_SECONDS);
        return lround(floor(first + days + 1e-6) - floor(first + 1e-6));
    }
    long steps = lround(ceil(days / model->settings.outer_step_days - 1e-9));
    if (steps < 1)
        steps = 1;
    *step = length * YEAR_SECONDS / (double)steps;
    return steps;
}

int projection_spin_up(const Model *model, Stepper *stepper, Column *column, double years,
                       double share_of_all, const Watcher *watcher, Fault *fault)
{
    double step;
    if (years <= 0.0)
        return 0;
    long steps = plan_steps(model, 0.0, years, &step);
    for (long i = 0; i < steps; i++) {
        int code = stepper_advance(stepper, column, step, 1, fault);
        if (code)
            return code;
        tell(model, column, watcher, 1, share_of_all * (double)(i + 1) / (double)steps);
        if (stopped(watcher))
            return fault_set(fault, FAULT_INTERRUPTED,
                             "interrupted during the spin-up; nothing is written yet");
    }
    return 0;
}

/* Sums over the steps of an interval, then its means. */
typedef struct {
    size_t field, rates, moments; /* numbers in x, in rate, in course */
    double *x;                    /* [solved][padded] mole fractions */
    double *rate;                 /* [reactions][padded] rates of reaction, cm-3 s-1 */
    double *course; /* [MOMENTS][solved][padded] by time of day; NULL when the case does not ask for them */
    double *step_rate, *step_course; /* those of one step */
    double *emission;                /* [solved] given off, molecules cm-2 s-1 */
    double *emitted, *received;      /* [solved] the ledger at the start of the interval */
    double *change;                  /* [padded] temperature less that of the base atmosphere, K */
    double *block;
} Means;

static int means_make(Means *means, const Model *model, Fault *fault)
{
    size_t padded = (size_t)model->grid.padded;
    means->field = (size_t)model->mechanism->solved * padded;
    means->rates = (size_t)model->mechanism->reactions * padded;
    means->moments = model->settings.moments == MOMENTS_NONE ? 0 : MOMENTS * means->field;
    means->block = malloc((means->field + 2 * means->rates + 2 * means->moments + padded +
                           3 * (size_t)model->mechanism->solved) *
                          sizeof(double));
    if (!means->block)
        return fault_memory(fault, "means of an interval");
    means->x = means->block;
    means->rate = means->x + means->field;
    means->step_rate = means->rate + means->rates;
    means->change = means->step_rate + means->rates;
    means->emission = means->change + padded;
    means->emitted = means->emission + model->mechanism->solved;
    means->received = means->emitted + model->mechanism->solved;
    means->course = means->moments ? means->received + model->mechanism->solved : NULL;
    means->step_course = means->moments ? means->course + means->moments : NULL;
    return 0;
}

static void add(double *sum, const double *part, size_t count)
{
    for (size_t i = 0; i < count; i++)
        sum[i] += part[i];
}

/* What is given off from here on is counted from here. */
static void mark_given_off(const Means *means, const Model *model, const Column *column)
{
    size_t bytes = (size_t)model->mechanism->solved * sizeof(double);
    memcpy(means->emitted, column->emitted, bytes);
    memcpy(means->received, column->received, bytes);
}

/* Mean over length years since. A gas goes from one kind to the other only between intervals. */
static void take_given_off(const Means *means, const Model *model, const Stepper *stepper,
                           const Column *column, double length)
{
    const unsigned char *kept = stepper_conditions(stepper)->kept;
    for (int s = 0; s < model->mechanism->solved; s++) {
        double given = column->emitted[s] - means->emitted[s];
        if (kept[s])
            given += column->received[s] - means->received[s];
        means->emission[s] = given / (length * YEAR_SECONDS);
    }
}

static void divide(double *sum, size_t count, double by)
{
    for (size_t i = 0; i < count; i++)
        sum[i] /= by;
}

/* One output interval: advance and average. */
static int run_interval(const Model *model, Stepper *stepper, Column *column, double start, double end,
                        double share_before, double share_after, const Means *means, const Watcher *watcher,
                        Fault *fault)
{
    double step;
    long steps = plan_steps(model, start, end - start, &step);
    memset(means->x, 0, means->field * sizeof(double));
    memset(means->rate, 0, means->rates * sizeof(double));
    if (means->course)
        memset(means->course, 0, means->moments * sizeof(double));
    memset(means->change, 0, (size_t)model->grid.layers * sizeof(double));
    mark_given_off(means, model, column);
    for (long i = 0; i < steps; i++) {
        int code = stepper_advance(stepper, column, step, 0, fault);
        if (code)
            return code;
        const double *mean = stepper_mean(stepper);
        add(means->x, mean, means->field);
        budget_step_rates(model, stepper, mean, means->step_rate);
        add(means->rate, means->step_rate, means->rates);
        if (means->course)
            stepper_moments(stepper, mean, means->step_course);
        add(means->course, means->step_course, means->moments);
        const double *kelvin = stepper_conditions(stepper)->temperature;
        for (int l = 0; l < model->grid.layers; l++)
            means->change[l] += kelvin[l] - model->air.temperature[l];
        tell(model, column, watcher, 0,
             share_before + (share_after - share_before) * (double)(i + 1) / (double)steps);
        if (stopped(watcher))
            return fault_set(fault, FAULT_INTERRUPTED,
                             "interrupted in %.0f; every interval before it is complete",
                             floor(column->time));
    }
    divide(means->x, means->field, (double)steps);
    divide(means->rate, means->rates, (double)steps);
    divide(means->course, means->moments, (double)steps);
    divide(means->change, (size_t)model->grid.layers, (double)steps);
    take_given_off(means, model, stepper, column, (double)steps * step / YEAR_SECONDS);
    column->time = end; /* no drift from adding steps */
    if (!watcher->record)
        return 0;
    Record record = {.time = 0.5 * (start + end),
                     .time_start = start,
                     .time_end = end,
                     .x = means->x,
                     .ozone_column = column_ozone_du(model, means->x),
                     .moments = means->course,
                     .rate = means->rate,
                     .emission = means->emission,
                     .temperature_change = means->change};
    return watcher->record(watcher->context, &record, fault);
}

int projection_settle(const Model *model, Stepper *stepper, Column *column, Fault *fault)
{
    Unsplit *unsplit;
    SteadyReport report;
    int code = unsplit_make(&unsplit, model, fault);
    if (code)
        return code;
    code = steady_find(unsplit, stepper, column, column->time, &report, fault);
    if (!code)
        stepper_balance(stepper, column);
    if (!code && model->settings.day == DAY_EXPLICIT) { /* whose state is that of midnight */
        day_midnight(stepper_day(stepper), column->x, column->x);
        unsplit_keep(unsplit, column->x);
    }
    unsplit_free(unsplit);
    return code;
}

/* Where the first year starts from. */
static int begin(const Model *model, Stepper *stepper, Column *column, double spin_share,
                 const Watcher *watcher, Fault *fault)
{
    if (model->settings.start == START_SPINUP)
        return projection_spin_up(model, stepper, column, model->settings.spinup_years, spin_share, watcher,
                                  fault);
    int code = projection_settle(model, stepper, column, fault);
    if (!code && stopped(watcher))
        code =
            fault_set(fault, FAULT_INTERRUPTED, "interrupted before the first year; nothing is written yet");
    return code;
}

/* Part of the progress that is the start. */
static double start_share(const Settings *settings)
{
    double spinup = settings->start == START_SPINUP ? settings->spinup_years : 0.0;
    return spinup / (spinup + settings->last_year - settings->first_year + 1);
}

int projection_begin(const Model *model, Stepper *stepper, Column *column, const Watcher *watcher,
                     Fault *fault)
{
    int code = model_check_start(model, fault);
    if (!code) {
        column->time = nextafter(column->time, 0.0); /* emissions of the first year have not begun */
        code = begin(model, stepper, column, start_share(&model->settings), watcher, fault);
        column->time = model->settings.first_year;
    }
    column_open_ledger(model, column);
    return code;
}

/* Decimal year at which output interval i begins. */
static double border(const Settings *settings, long i)
{
    return settings->first_year + (double)i / settings->outputs_per_year;
}

/* share_from: of the progress that is done before. */
static int run_intervals(const Model *model, Stepper *stepper, Column *column, long first, long end,
                         double share_from, const Watcher *watcher, Fault *fault)
{
    Means means = {0};
    if (means_make(&means, model, fault))
        return fault->code;
    int code = 0;
    double each = (1.0 - share_from) / (double)(end - first);
    for (long i = first; !code && i < end; i++) {
        double before = share_from + each * (double)(i - first), after = before + each;
        code = run_interval(model, stepper, column, border(&model->settings, i),
                            border(&model->settings, i + 1), before, after, &means, watcher, fault);
    }
    free(means.block);
    return code;
}

int projection_continue(const Model *model, Stepper *stepper, Column *column, long first, long end,
                        const Watcher *watcher, Fault *fault)
{
    return run_intervals(model, stepper, column, first, end, 0.0, watcher, fault);
}

long projection_steps(const Model *model, long first, long end)
{
    long steps = 0;
    double length;
    for (long i = first; i < end; i++) {
        double start = border(&model->settings, i);
        steps += plan_steps(model, start, border(&model->settings, i + 1) - start, &length);
    }
    return steps;
}

int projection_run(const Model *model, Stepper *stepper, Column *column, const Watcher *watcher, Fault *fault)
{
    const Settings *settings = &model->settings;
    long intervals = (long)(settings->last_year - settings->first_year + 1) * settings->outputs_per_year;
    int code = projection_begin(model, stepper, column, watcher, fault);
    return code ? code
                : run_intervals(model, stepper, column, 0, intervals, start_share(settings), watcher, fault);
}
