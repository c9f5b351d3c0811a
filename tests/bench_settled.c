/* bench_settled: what the settled column, its derivatives and the diurnal factors cost.
 *
 *     build/tests/bench_settled [--repeat N]       (make bench)
 *
 * On one thread, since it compares costs: the built-in baseline settled under the values of 2000, by daily
 * means and with diurnal factors; the derivatives of one answer by every parameter, over the time of
 * settling; and the years 1980 to 2009 with factors over the same by daily means, both from their settled
 * start, which is not counted. Seconds are processor time in the program (ru_utime): other programs on the
 * machine move them little. Each is the least of --repeat runs (default 3). Runs from the repository root;
 * SKYMEND_DATA names the data folder (default input/data).
 */
#define _DEFAULT_SOURCE /* getrusage */
#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>

#include "../model/projection.h"
#include "../model/sensitivity.h"
#include "../model/steady.h"

enum { YEAR = 2000, FIRST = 1980, LAST = 2009 };

static double user_seconds(void)
{
    struct rusage usage;
    if (getrusage(RUSAGE_SELF, &usage))
        return NAN;
    return (double)usage.ru_utime.tv_sec + 1e-6 * (double)usage.ru_utime.tv_usec;
}

typedef struct {
    Model *model;
    Column *column;
    Stepper *stepper;
    Unsplit *unsplit;
} Everything;

static int make(Everything *all, const Settings *settings, Fault *fault)
{
    *all = (Everything){0};
    int code = model_make(&all->model, settings, fault);
    if (!code)
        code = column_make(&all->column, all->model, fault);
    if (!code)
        code = stepper_make(&all->stepper, all->model, 1, fault);
    if (!code)
        code = unsplit_make(&all->unsplit, all->model, fault);
    return code;
}

static void release(Everything *all)
{
    unsplit_free(all->unsplit);
    stepper_free(all->stepper);
    column_free(all->column);
    model_free(all->model);
    *all = (Everything){0};
}

typedef struct {
    double settle, derivatives; /* s */
    double column;              /* DU: that it was settled */
    SteadyReport report;
} Settling;

static int time_settling(const Settings *from, int day, int with_derivatives, Settling *least, Fault *fault)
{
    Settings settings = *from;
    Everything all;
    settings.day = day;
    settings.first_year = settings.last_year = YEAR;
    int code = make(&all, &settings, fault);
    Settling now = {.derivatives = NAN};
    double since = user_seconds();
    if (!code)
        code = steady_find(all.unsplit, all.stepper, all.column, YEAR + 0.5, &now.report, fault);
    now.settle = user_seconds() - since;
    since = user_seconds();
    if (!code && with_derivatives) {
        const Answer answer = {.kind = ANSWER_COLUMN};
        Sensitivity *sensitivity = NULL;
        code = sensitivity_prepare(all.unsplit, all.column->x, fault);
        if (!code)
            code = sensitivity_make(&sensitivity, all.unsplit, all.column->x, &answer, fault);
        sensitivity_free(sensitivity);
        now.derivatives = user_seconds() - since;
    }
    if (!code) {
        now.column = column_ozone_du(all.model, all.column->x);
        now.settle = fmin(now.settle, least->settle);
        now.derivatives = fmin(now.derivatives, least->derivatives);
        *least = now;
    }
    release(&all);
    return code;
}

typedef struct {
    double seconds, column;            /* s, DU of the last year */
    long days, factors, lights, steps; /* explicit days, refreshes of factors and photolysis, solver steps */
    StepClock part;                    /* wall */
} Carrying;

static int time_years(const Settings *from, int day, Carrying *least, Fault *fault)
{
    static const Watcher nobody = {0};
    Settings settings = *from;
    Everything all;
    settings.day = day;
    settings.first_year = FIRST;
    settings.last_year = LAST;
    int code = make(&all, &settings, fault);
    if (!code)
        code = projection_settle(all.model, all.stepper, all.column, fault);
    if (!code) { /* settled: the years alone */
        all.model->settings.start = START_SPINUP;
        all.model->settings.spinup_years = 0.0;
        column_open_ledger(all.model, all.column);
        StepClock before = stepper_clock(all.stepper);
        double since = user_seconds();
        code = projection_run(all.model, all.stepper, all.column, &nobody, fault);
        double seconds = user_seconds() - since;
        StepClock after = stepper_clock(all.stepper);
        if (!code && seconds < least->seconds)
            *least =
                (Carrying){.seconds = seconds,
                           .column = column_ozone_du(all.model, all.column->x),
                           .days = all.column->days,
                           .factors = all.column->factor_refreshes,
                           .lights = all.column->photolysis_refreshes,
                           .steps = all.column->counts.steps,
                           .part = {after.transport - before.transport, after.chemistry - before.chemistry,
                                    after.light - before.light, after.factors - before.factors}};
    }
    release(&all);
    return code;
}

static void print_years(const char *name, const Carrying *years)
{
    printf("%d to %d %-14s %7.2f s; chemistry %.2f, factors %.2f, sunlight %.2f, transport %.2f s on the "
           "wall;\n    %ld solver steps, %ld explicit days for %ld refreshes of factors, %ld of photolysis; "
           "%.2f DU at the end\n",
           FIRST, LAST, name, years->seconds, years->part.chemistry, years->part.factors, years->part.light,
           years->part.transport, years->steps, years->days, years->factors, years->lights, years->column);
}

int main(int argc, char **argv)
{
    const char *data = getenv("SKYMEND_DATA");
    long repeats = argc == 3 && !strcmp(argv[1], "--repeat") ? strtol(argv[2], NULL, 10) : argc == 1 ? 3 : 0;
    if (repeats < 1 || repeats > 32) {
        fprintf(stderr, "bench_settled: usage: bench_settled [--repeat N], N from 1 to 32\n");
        return FAULT_INPUT;
    }
    Fault fault = {0};
    Settings *settings = malloc(sizeof *settings);
    if (!settings)
        return 1;
    settings_default(settings, data && data[0] ? data : "input/data");
    omp_set_num_threads(1);
    Settling means = {.settle = HUGE_VAL, .derivatives = HUGE_VAL}, factors = means;
    Carrying by_means = {.seconds = HUGE_VAL}, by_factors = by_means;
    for (long i = 0; !fault.code && i < repeats; i++)
        if (time_settling(settings, DAY_MEAN, 1, &means, &fault) ||
            time_settling(settings, DAY_FACTORS, 1, &factors, &fault) ||
            time_years(settings, DAY_MEAN, &by_means, &fault) ||
            time_years(settings, DAY_FACTORS, &by_factors, &fault))
            break;
    free(settings);
    if (fault.code) {
        fprintf(stderr, "bench_settled: %s\n", fault.text);
        return fault.code;
    }
    printf("processor time on one thread, least of %ld\n", repeats);
    printf("settled, daily means      %7.2f s; %d steps, %.2f DU\n", means.settle, means.report.iterations,
           means.column);
    printf("settled, diurnal factors  %7.2f s; %d steps, %d turns, %.2f DU\n", factors.settle,
           factors.report.iterations, factors.report.turns, factors.column);
    printf("derivatives, daily means  %7.2f s; settled with them: %.2f times settled\n", means.derivatives,
           1.0 + means.derivatives / means.settle);
    printf("derivatives, factors      %7.2f s; settled with them: %.2f times settled\n", factors.derivatives,
           1.0 + factors.derivatives / factors.settle);
    print_years("daily means", &by_means);
    print_years("factors", &by_factors);
    printf("factors over daily means  %7.2f\n", by_factors.seconds / by_means.seconds);
    return 0;
}
