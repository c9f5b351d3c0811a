/* apportion_quick: lines of a schedule by derivatives of the column at rest. */
#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "apportion_runs.h"
#include "emission.h"
#include "potency.h"
#include "pulse.h"

/* Of one gas of the schedule in one of the years. */
typedef struct {
    double per_molecule; /* DU-years for all time per molecule cm-2; NAN: none */
    double noise;        /* relative */
} Derivative;

typedef struct {
    Apportionment *to;
    const Model *model;
    const Watcher *watcher;
    int threads;
    double *ground;         /* [years][solved] mole fraction of the lowest layer, mean of the year */
    Derivative *derivative; /* [APPORTION_YEARS][gases of the schedule] */
    double *fallen;         /* [gases of the schedule][2 * years + 1] of a pulse, every half year */
    unsigned char *wanted;  /* [solved] 1: given off, and has a derivative */
    const char *reference;  /* one of them, or NULL: there is none */
    double done;            /* share of the work before the part at hand */
    double part;            /* and that part's */
} Quick;

/* DU by which a column beside is shifted: less than POTENCY_CHANGE, which is too much of a gas there is
 * hardly any of any more (HCFC-22 at the end of a phase-out: the chords do not converge). */
static const double SHIFT = 0.05;

/* Share of the work that the run of the whole is taken to be, for the progress. */
static const double RUN_SHARE = 0.4;

/* ---- the whole ---- */

typedef struct {
    Quick *quick;
    long records;
} Collector;

static int collect(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Collector *collector = context;
    const Quick *quick = collector->quick;
    const Model *model = quick->model;
    int per_year = model->settings.outputs_per_year, solved = model->mechanism->solved;
    size_t year = (size_t)(collector->records / per_year);
    quick->to->column[year] += record->ozone_column / per_year;
    for (int s = 0; s < solved; s++)
        quick->ground[year * (size_t)solved + (size_t)s] +=
            record->x[FIELD(model->grid.padded, s, 0)] / per_year;
    collector->records++;
    return 0;
}

static void tell(const Quick *quick, const Progress *progress)
{
    Progress all = *progress;
    all.share = quick->done + quick->part * progress->share;
    if (quick->watcher->progress)
        quick->watcher->progress(quick->watcher->context, &all);
}

static void pass_run(void *context, const Progress *progress)
{
    tell(((Collector *)context)->quick, progress);
}

static void pass_potency(void *context, const Progress *progress)
{
    tell(context, progress);
}

static int carry_whole(Quick *quick, Fault *fault)
{
    Column *column = NULL;
    Stepper *stepper = NULL;
    Collector collector = {quick, 0};
    const Watcher watcher = {collect, pass_run, &collector, quick->watcher->stop};
    int code = column_make(&column, quick->model, fault);
    if (!code)
        code = stepper_make(&stepper, quick->model, quick->threads, fault);
    if (!code)
        code = projection_run(quick->model, stepper, column, &watcher, fault);
    stepper_free(stepper);
    column_free(column);
    return code;
}

/* ---- derivatives ---- */

/* The derivative is by what comes through the ground, so of a gas that the ground takes up as well there is
 * none. */
static void take_derivatives(const Quick *quick, const Potencies *potencies, Derivative *derivative)
{
    const Model *model = quick->model;
    const Schedule *schedule = &model->schedule;
    for (int g = 0; g < schedule->gases; g++) {
        int s = mechanism_solved(model->mechanism, schedule->gas[g]);
        derivative[g].per_molecule = NAN;
        for (int i = 0; i < potencies->count; i++)
            if (potencies->gas[i].species == s && !(model_deposition(model, s) > 0.0))
                derivative[g] = (Derivative){-potencies->gas[i].anew / YEAR_SECONDS, /* lost: above 0 */
                                             potencies->gas[i].noise};
    }
}

static int take_pulses(Quick *quick, Unsplit *unsplit, const double *x, const Derivative *derivative,
                       Fault *fault)
{
    const Apportionment *to = quick->to;
    const Schedule *schedule = &quick->model->schedule;
    int steps = 2 * to->years;
    for (int l = 0; l < schedule->lines; l++) {
        int g = schedule->line[l].gas;
        double *fallen = quick->fallen + (size_t)g * (size_t)(steps + 1);
        if (fallen[1] != 0.0 || !isfinite(derivative[g].per_molecule))
            continue; /* done for a line before; nothing to do */
        int s = mechanism_solved(quick->model->mechanism, schedule->gas[g]);
        if (pulse_response(unsplit, x, s, steps, 0.5, fallen, fault))
            return fault->code;
        if (quick->watcher->stop && *quick->watcher->stop)
            return fault_set(fault, FAULT_INTERRUPTED, "interrupted; nothing was written");
    }
    return 0;
}

/* Settle the column of the model, whose grounds keep everything, and look beside it. */
static int differentiate(Quick *quick, const Model *settled, int k, Derivative *derivative, Fault *fault)
{
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
    Potencies *potencies = NULL;
    SteadyReport steady;
    const PotencyAsk ask = {.reference = quick->reference, .wanted = quick->wanted, .change = SHIFT};
    const Watcher watcher = {.progress = pass_potency, .context = quick, .stop = quick->watcher->stop};
    int code = column_make(&column, settled, fault);
    if (!code)
        code = stepper_make(&stepper, settled, quick->threads, fault);
    if (!code)
        code = unsplit_make(&unsplit, settled, fault);
    if (!code)
        code = steady_find(unsplit, stepper, column, quick->to->background[k] + 0.5, &steady, fault);
    if (!code)
        code = potency_make(&potencies, unsplit, stepper, column, &ask, &watcher, fault);
    if (!code)
        take_derivatives(quick, potencies, derivative);
    if (!code && k == APPORTION_YEARS / 2)
        code = take_pulses(quick, unsplit, column->x, derivative, fault);
    potency_free(potencies);
    unsplit_free(unsplit);
    stepper_free(stepper);
    column_free(column);
    return code;
}

/* In year k of the background, from the model with the gases that emissions drive kept at what the whole has
 * then. */
static int differentiate_at(Quick *quick, int k, Fault *fault)
{
    const Model *model = quick->model;
    Derivative *derivative = quick->derivative + (size_t)k * (size_t)model->schedule.gases;
    int year = quick->to->background[k];
    size_t solved = (size_t)model->mechanism->solved;
    const double *ground = quick->ground + (size_t)(year - quick->to->first_year) * solved;
    Model settled = *model;
    settled.emissions = NULL;
    settled.surface_kind = malloc(solved * sizeof(int));
    settled.surface_value = malloc(solved * sizeof(double));
    int code = settled.surface_kind && settled.surface_value ? 0 : fault_memory(fault, "derivatives");
    if (!code)
        code = emissions_copy(&settled.emissions, model->emissions, model, fault);
    if (!code) {
        settled.emissions->given = 0; /* nothing is given off beside what keeps the values */
        settled.emissions->lines = 0;
        memcpy(settled.surface_kind, model->surface_kind, solved * sizeof(int));
        memcpy(settled.surface_value, model->surface_value, solved * sizeof(double));
        for (size_t s = 0; s < solved; s++)
            if (model->surface_kind[s] == SURFACE_SCHEDULE &&
                model->schedule.emission_from[model->surface_gas[s]]) {
                settled.surface_kind[s] = SURFACE_FIXED;
                settled.surface_value[s] = ground[s];
            }
        code = differentiate(quick, &settled, k, derivative, fault);
    }
    emissions_free(settled.emissions);
    free(settled.surface_kind);
    free(settled.surface_value);
    return code;
}

/* Gases that have derivatives and of which something is given off in the run. */
static int list_wanted(Quick *quick, Fault *fault)
{
    const Model *model = quick->model;
    int *gas = calloc((size_t)model->mechanism->solved, sizeof(int));
    quick->wanted = calloc((size_t)model->mechanism->solved, 1);
    if (!gas || !quick->wanted) {
        free(gas);
        return fault_memory(fault, "derivatives");
    }
    int count = potency_gases(model, gas);
    for (int i = 0; i < quick->to->items; i++)
        for (int l = 0; l < quick->to->item[i].lines; l++) {
            int s = model->emissions->species[quick->to->item[i].line[l]], k = 0;
            while (k < count && gas[k] != s)
                k++;
            if (k == count || !(quick->to->item[i].kg[l] > 0.0))
                continue;
            quick->wanted[s] = 1;
            quick->reference = mechanism_name(model->mechanism, s);
        }
    free(gas);
    return 0;
}

/* ---- lines ---- */

/* Derivative of gas g at decimal year time. Only the first and the last year when ends is 1. */
static double at_time(const Quick *quick, int g, double time, int ends)
{
    const int *year = quick->to->background;
    int gases = quick->model->schedule.gases, k = 0, next;
    while (!ends && k < APPORTION_YEARS - 2 && time > year[k + 1] + 0.5)
        k++;
    next = ends ? APPORTION_YEARS - 1 : k + 1;
    double low = quick->derivative[k * gases + g].per_molecule,
           high = quick->derivative[next * gases + g].per_molecule;
    double share = year[next] > year[k] ? (time - year[k] - 0.5) / (year[next] - year[k]) : 0.0;
    return low + fmin(fmax(share, 0.0), 1.0) * (high - low);
}

/* DU-years per molecule cm-2 given off in the middle of a year: within the run, and after it. */
static void of_pulse(const Quick *quick, int g, int year, int ends, double *within, double *after)
{
    int steps = 2 * (quick->to->first_year + quick->to->years - year) - 1; /* half years to the end */
    const double *fallen = quick->fallen + (size_t)g * (size_t)(2 * quick->to->years + 1);
    *within = 0.0;
    for (int i = 0; i < steps; i++)
        *within += (fallen[i + 1] - fallen[i]) * at_time(quick, g, year + 0.5 + 0.5 * (i + 0.5), ends);
    *after = (1.0 - fallen[steps]) * at_time(quick, g, year + 0.5 + 0.5 * steps, ends);
}

static void add_line(const Quick *quick, ApportionItem *item, int l)
{
    const ScheduleLine *line = &quick->model->schedule.line[l];
    const Apportionment *to = quick->to;
    const int gases = quick->model->schedule.gases;
    double noise = 0.0;
    for (int k = 0; k < APPORTION_YEARS; k++)
        noise = fmax(noise, quick->derivative[k * gases + line->gas].noise);
    for (int y = 0; y < line->years; y++) {
        int year = line->first_year + y;
        if (year < to->first_year || year >= to->first_year + to->years || !(line->amount[y] > 0.0))
            continue;
        double molecules = line->amount[y] * quick->model->emissions->molecules[l];
        double within, after, within_ends, after_ends;
        of_pulse(quick, line->gas, year, 0, &within, &after);
        of_pulse(quick, line->gas, year, 1, &within_ends, &after_ends);
        if (line->to_km > 0.0)
            within = after = NAN; /* potency.h knows gas that comes through the ground */
        item->within += molecules * within;
        item->all_time += molecules * (within + after);
        item->all_time_error +=
            molecules * (fabs(within + after) * noise + fabs(within + after - within_ends - after_ends));
    }
}

static void sum_items(Quick *quick)
{
    Apportionment *to = quick->to;
    for (int i = 0; i < to->items; i++) {
        ApportionItem *item = &to->item[i];
        item->all_time = item->within = item->all_time_error = 0.0;
        for (int l = 0; l < item->lines; l++)
            add_line(quick, item, item->line[l]);
        if (!isfinite(item->all_time)) {
            item->within = item->all_time_error = NAN;
            continue;
        }
        to->sum_all_time += item->all_time;
        to->sum_within += item->within;
        to->sum_all_time_error += item->all_time_error;
    }
}

/* ---- all together ---- */

static void choose_years(Apportionment *to)
{
    int first = to->first_year + to->years - 1, last = first;
    for (int i = 0; i < to->items; i++)
        if (to->item[i].first_year && to->item[i].first_year < first)
            first = to->item[i].first_year;
    for (int k = 0; k < APPORTION_YEARS; k++)
        to->background[k] = first + (last - first) * k / (APPORTION_YEARS - 1);
}

static int work(Quick *quick, Fault *fault)
{
    const Model *model = quick->model;
    Apportionment *to = quick->to;
    quick->ground = calloc((size_t)to->years * (size_t)model->mechanism->solved, sizeof(double));
    quick->derivative = calloc((size_t)APPORTION_YEARS * (size_t)model->schedule.gases, sizeof(Derivative));
    quick->fallen = calloc((size_t)(2 * to->years + 1) * (size_t)model->schedule.gases, sizeof(double));
    if (!quick->ground || !quick->derivative || !quick->fallen)
        return fault_memory(fault, "derivatives");
    quick->part = RUN_SHARE;
    int code = carry_whole(quick, fault);
    if (!code)
        code = apportion_return(to, fault);
    choose_years(to);
    for (size_t g = 0; g < (size_t)APPORTION_YEARS * (size_t)model->schedule.gases; g++)
        quick->derivative[g].per_molecule = NAN;
    if (!code)
        code = list_wanted(quick, fault);
    for (int k = 0; !code && quick->reference && k < APPORTION_YEARS; k++) {
        quick->part = (1.0 - RUN_SHARE) / APPORTION_YEARS;
        quick->done = RUN_SHARE + k * quick->part;
        code = differentiate_at(quick, k, fault);
    }
    if (!code)
        sum_items(quick);
    return code;
}

int apportion_quick(Apportionment **made, const Model *model, const ApportionAsk *ask, const Watcher *watcher,
                    Fault *fault)
{
    double since = omp_get_wtime();
    int code = apportion_list(made, model, ask, fault);
    if (code)
        return code;
    (*made)->quick = 1;
    Quick quick = {.to = *made, .model = model, .watcher = watcher, .threads = ask->threads};
    code = work(&quick, fault);
    free(quick.ground);
    free(quick.derivative);
    free(quick.fallen);
    free(quick.wanted);
    if (code) {
        apportion_free(*made);
        *made = NULL;
        return code;
    }
    (*made)->seconds = omp_get_wtime() - since;
    return 0;
}
