/* projection: spin-up and the years. */
#include "projection.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

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

/* One output interval: advance and average. sum: [solved][padded] and, behind it, [layers]. */
static int run_interval(const Model *model, Stepper *stepper, Column *column, double start, double end,
                        double share_before, double share_after, double *sum, const Watcher *watcher,
                        Fault *fault)
{
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    size_t layers = (size_t)model->grid.layers;
    double step, *change = sum + field;
    long steps = plan_steps(model, start, end - start, &step);
    memset(sum, 0, (field + layers) * sizeof(double));
    for (long i = 0; i < steps; i++) {
        int code = stepper_advance(stepper, column, step, 0, fault);
        if (code)
            return code;
        const double *mean = stepper_mean(stepper);
        for (size_t j = 0; j < field; j++)
            sum[j] += mean[j];
        const double *kelvin = stepper_conditions(stepper)->temperature;
        for (size_t l = 0; l < layers; l++)
            change[l] += kelvin[l] - model->air.temperature[l];
        tell(model, column, watcher, 0,
             share_before + (share_after - share_before) * (double)(i + 1) / (double)steps);
        if (stopped(watcher))
            return fault_set(fault, FAULT_INTERRUPTED,
                             "interrupted in %.0f; every interval before it is complete",
                             floor(column->time));
    }
    for (size_t j = 0; j < field; j++)
        sum[j] /= (double)steps;
    for (size_t l = 0; l < layers; l++)
        change[l] /= (double)steps;
    column->time = end; /* no drift from adding steps */
    if (!watcher->record)
        return 0;
    Record record = {0.5 * (start + end), start, end, sum, column_ozone_du(model, sum), change};
    return watcher->record(watcher->context, &record, fault);
}

int projection_run(const Model *model, Stepper *stepper, Column *column, const Watcher *watcher, Fault *fault)
{
    const Settings *settings = &model->settings;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    double *sum = malloc((field + (size_t)model->grid.layers) * sizeof(double));
    if (!sum)
        return fault_memory(fault, "means of an interval");
    int years = settings->last_year - settings->first_year + 1, per_year = settings->outputs_per_year;
    double whole = settings->spinup_years + years, spin_share = settings->spinup_years / whole;
    int code = projection_spin_up(model, stepper, column, settings->spinup_years, spin_share, watcher, fault);
    column_open_ledger(model, column);
    long intervals = (long)years * per_year;
    for (long i = 0; !code && i < intervals; i++) {
        double start = settings->first_year + (double)i / per_year,
               end = settings->first_year + (double)(i + 1) / per_year;
        double before = spin_share + (1.0 - spin_share) * (double)i / (double)intervals;
        double after = spin_share + (1.0 - spin_share) * (double)(i + 1) / (double)intervals;
        code = run_interval(model, stepper, column, start, end, before, after, sum, watcher, fault);
    }
    free(sum);
    return code;
}
