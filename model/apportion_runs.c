/* apportion_runs: see apportion_runs.h.
 *
 * The trunk is the run of the whole. Where items first give something off, at the start of a year, it is
 * copied (a fork); the runs without those items begin there, each by the log of the trunk's refreshes.
 */
#include "apportion_runs.h"

#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "emission.h"

typedef struct {
    int year;
    Column *column;
    Stepper *stepper;
} Fork;

/* One run that leaves the trunk. */
typedef struct {
    int item; /* -1: without any */
    int fork;
    double *column; /* [years] out */
    long steps;
} Branch;

/* What a thread carries runs with. */
typedef struct {
    Model model; /* the same, but for its emissions */
    Column *column;
    Stepper *stepper;
} Worker;

typedef struct {
    Apportionment *to;
    const Model *model;
    ApportionPace *pace;
    RefreshLog log;
    int forks, branches, workers;
    Fork *fork;                 /* [forks] in order of year */
    Branch *branch;             /* [branches] */
    Worker *worker;             /* [workers] */
    volatile sig_atomic_t stop; /* a run has failed: the others need not end */
} Runs;

/* ---- watching ---- */

typedef struct {
    Runs *runs;
    double *column; /* [years] */
    long records;
} Collector;

static int collect(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Collector *collector = context;
    int per_year = collector->runs->model->settings.outputs_per_year;
    collector->column[collector->records / per_year] += record->ozone_column / per_year;
    collector->records++;
    return 0;
}

static void pass_progress(void *context, const Progress *progress)
{
    Runs *runs = ((Collector *)context)->runs;
    ApportionPace *pace = runs->pace;
#pragma omp critical(apportion_progress)
    {
        if (pace->outer->stop && *pace->outer->stop)
            runs->stop = 1;
        pace->done += !progress->spinning_up;
        Progress all = *progress;
        all.share = pace->from + pace->share * (double)pace->done / (double)pace->total;
        if (pace->outer->progress)
            pace->outer->progress(pace->outer->context, &all);
    }
}

static long interval_of(const Runs *runs, int year)
{
    return (long)(year - runs->to->first_year) * runs->model->settings.outputs_per_year;
}

static long end_of(const Runs *runs)
{
    return (long)runs->to->years * runs->model->settings.outputs_per_year;
}

/* Carry a column from the start of year `from` to that of year `to`, its yearly means into column. */
static int carry(Runs *runs, const Model *model, Stepper *stepper, Column *state, int from, int to,
                 double *column, Fault *fault)
{
    Collector collector = {runs, column, interval_of(runs, from)};
    const Watcher watcher = {collect, pass_progress, &collector, &runs->stop};
    return projection_continue(model, stepper, state, interval_of(runs, from), interval_of(runs, to),
                               &watcher, fault);
}

/* ---- planning ---- */

static int find_fork(Runs *runs, int year)
{
    int f = 0;
    while (f < runs->forks && runs->fork[f].year < year)
        f++;
    if (f < runs->forks && runs->fork[f].year == year)
        return f;
    memmove(&runs->fork[f + 1], &runs->fork[f], (size_t)(runs->forks - f) * sizeof *runs->fork);
    runs->fork[f] = (Fork){.year = year};
    runs->forks++;
    return f;
}

static void add_branch(Runs *runs, int item, int year, double *column)
{
    Branch *branch = &runs->branch[runs->branches++];
    *branch = (Branch){.item = item, .column = column};
    for (int f = 0; f < runs->forks; f++)
        if (runs->fork[f].year == year)
            branch->fork = f;
    branch->steps = projection_steps(runs->model, interval_of(runs, year), end_of(runs));
}

/* A run whose items are off all along is the whole itself; two items of which only one gives something off
 * are still two runs. */
static int plan(Runs *runs, int threads, Fault *fault)
{
    Apportionment *to = runs->to;
    size_t items = (size_t)to->items;
    runs->fork = calloc(items + 1, sizeof *runs->fork);
    runs->branch = calloc(items + 1, sizeof *runs->branch);
    if (!runs->fork || !runs->branch)
        return fault_memory(fault, "runs of an apportionment");
    for (int i = 0; i < to->items; i++)
        if (to->item[i].first_year)
            find_fork(runs, to->item[i].first_year);
    add_branch(runs, -1, runs->fork[0].year, to->all.column);
    for (int f = 0; f < runs->forks; f++) /* the longest first, so that threads end together */
        for (int i = 0; i < to->items; i++)
            if (to->item[i].first_year == runs->fork[f].year)
                add_branch(runs, i, runs->fork[f].year, to->item[i].effect.column);
    long whole = projection_steps(runs->model, 0, end_of(runs));
    to->runs = 1 + runs->branches;
    to->steps_shared = whole;
    to->steps_alone = whole * to->runs;
    for (int b = 0; b < runs->branches; b++)
        to->steps_shared += runs->branch[b].steps;
    runs->pace->done = 0;
    runs->pace->total = to->steps_shared;
    runs->workers = threads < 1 ? omp_get_max_threads() : threads;
    if (runs->workers > runs->branches)
        runs->workers = runs->branches;
    runs->worker = calloc((size_t)runs->workers, sizeof *runs->worker);
    if (!runs->worker)
        return fault_memory(fault, "runs of an apportionment");
    return refresh_log_make(&runs->log, whole, fault);
}

/* ---- the trunk ---- */

static int keep_fork(const Runs *runs, Fork *fork, const Stepper *stepper, const Column *column, Fault *fault)
{
    int code = column_make(&fork->column, runs->model, fault);
    if (!code)
        code = stepper_make(&fork->stepper, runs->model, 1, fault);
    if (code)
        return code;
    column_copy(fork->column, column, runs->model);
    stepper_copy(fork->stepper, stepper);
    return 0;
}

static int carry_trunk(Runs *runs, int threads, Fault *fault)
{
    const Model *model = runs->model;
    Apportionment *to = runs->to;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Collector nothing = {runs, NULL, 0};
    const Watcher watcher = {NULL, pass_progress, &nothing, runs->pace->outer->stop};
    int year = to->first_year, end = to->first_year + to->years;
    int code = column_make(&column, model, fault);
    if (!code)
        code = stepper_make(&stepper, model, threads, fault);
    if (!code)
        code = projection_begin(model, stepper, column, &watcher, fault);
    if (!code)
        stepper_keep_log(stepper, &runs->log);
    for (int f = 0; !code && f <= runs->forks; f++) {
        int next = f < runs->forks ? runs->fork[f].year : end;
        if (next > year)
            code = carry(runs, model, stepper, column, year, next, to->column, fault);
        if (!code && f < runs->forks)
            code = keep_fork(runs, &runs->fork[f], stepper, column, fault);
        year = next;
    }
    stepper_free(stepper);
    column_free(column);
    return code;
}

/* ---- the branches ---- */

static int make_worker(Worker *worker, const Runs *runs, Fault *fault)
{
    worker->model = *runs->model;
    worker->model.emissions = NULL;
    int code = emissions_copy(&worker->model.emissions, runs->model->emissions, runs->model, fault);
    if (!code)
        code = column_make(&worker->column, &worker->model, fault);
    if (!code)
        code = stepper_make(&worker->stepper, &worker->model, 1, fault);
    if (!code)
        stepper_follow_log(worker->stepper, &runs->log);
    return code;
}

static void free_worker(Worker *worker)
{
    stepper_free(worker->stepper);
    column_free(worker->column);
    emissions_free(worker->model.emissions);
}

/* Emissions of the whole, less the share of those of the item; of every item when item < 0. */
static void leave_out(const Runs *runs, Worker *worker, int item)
{
    const Apportionment *to = runs->to;
    const Emissions *whole = runs->model->emissions;
    double *molecules = worker->model.emissions->molecules;
    for (int l = 0; l < whole->lines; l++)
        molecules[l] = whole->molecules[l];
    for (int i = 0; i < to->items; i++)
        for (int l = 0; (item < 0 || i == item) && l < to->item[i].lines; l++) {
            int line = to->item[i].line[l];
            molecules[line] = (1.0 - to->share) * whole->molecules[line];
        }
}

static int carry_branch(Runs *runs, Worker *worker, const Branch *branch, Fault *fault)
{
    const Fork *fork = &runs->fork[branch->fork];
    const Apportionment *to = runs->to;
    leave_out(runs, worker, branch->item);
    column_copy(worker->column, fork->column, runs->model);
    stepper_copy(worker->stepper, fork->stepper);
    memcpy(branch->column, to->column, (size_t)(fork->year - to->first_year) * sizeof(double));
    return carry(runs, &worker->model, worker->stepper, worker->column, fork->year,
                 to->first_year + to->years, branch->column, fault);
}

static int carry_branches(Runs *runs, Fault *fault)
{
    double spent = 0.0;
    Fault *faults = calloc((size_t)runs->branches, sizeof *faults);
    int code = faults ? 0 : fault_memory(fault, "runs of an apportionment");
    for (int w = 0; !code && w < runs->workers; w++)
        code = make_worker(&runs->worker[w], runs, fault);
    if (code) {
        free(faults);
        return code;
    }
#pragma omp parallel for schedule(dynamic, 1) num_threads(runs->workers) reduction(+ : spent)
    for (int b = 0; b < runs->branches; b++) {
        double since = omp_get_wtime();
        if (runs->stop ||
            carry_branch(runs, &runs->worker[omp_get_thread_num()], &runs->branch[b], &faults[b]))
            runs->stop = 1;
        spent += omp_get_wtime() - since;
    }
    for (int b = 0; !code && b < runs->branches; b++)
        if (faults[b].code && faults[b].code != FAULT_INTERRUPTED) {
            *fault = faults[b];
            code = fault->code;
        }
    if (!code && runs->stop)
        code = fault_set(fault, FAULT_INTERRUPTED, "interrupted; nothing is written");
    runs->to->seconds_run = spent / runs->branches;
    free(faults);
    return code;
}

/* Items that give nothing off. */
static void fill_idle(Apportionment *to)
{
    for (int i = 0; i < to->items; i++)
        if (!to->item[i].first_year)
            memcpy(to->item[i].effect.column, to->column, (size_t)to->years * sizeof(double));
}

int apportion_runs(Apportionment *to, const Model *model, int threads, ApportionPace *pace, Fault *fault)
{
    Runs runs = {.to = to, .model = model, .pace = pace};
    int code = plan(&runs, threads, fault);
    if (!code)
        code = carry_trunk(&runs, threads, fault);
    if (!code)
        code = carry_branches(&runs, fault);
    if (!code)
        fill_idle(to);
    for (int f = 0; runs.fork && f < runs.forks; f++) {
        stepper_free(runs.fork[f].stepper);
        column_free(runs.fork[f].column);
    }
    for (int w = 0; runs.worker && w < runs.workers; w++)
        free_worker(&runs.worker[w]);
    free(runs.fork);
    free(runs.branch);
    free(runs.worker);
    refresh_log_free(&runs.log);
    return code;
}
