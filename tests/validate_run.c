/* validate_run: a projection kept in memory. */
#include "validate.h"

#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct {
    Run *run;
    const char *what;
    int next; /* record to come */
    double began;
} Keeper;

static int keep(void *context, const Record *record, Fault *fault)
{
    Keeper *keeper = context;
    Run *run = keeper->run;
    if (keeper->next >= run->years)
        return fault_set(fault, FAULT_NUMERICS, "%s: more records than years", keeper->what);
    run->time[keeper->next] = record->time;
    run->column[keeper->next] = record->ozone_column;
    memcpy(run->x + (size_t)keeper->next * run->field, record->x, run->field * sizeof(double));
    keeper->next++;
    if (keeper->next % 20 == 0 || keeper->next == run->years)
        fprintf(stderr, "%s: %.0f, %.2f DU, %.0f s\n", keeper->what, floor(record->time),
                record->ozone_column, omp_get_wtime() - keeper->began);
    return 0;
}

static int allocate(Run *run, const Settings *settings, Fault *fault)
{
    run->first_year = settings->first_year;
    run->years = settings->last_year - settings->first_year + 1;
    run->field = (size_t)run->model->mechanism->solved * (size_t)run->model->grid.padded;
    run->time = calloc((size_t)run->years, sizeof(double));
    run->column = calloc((size_t)run->years, sizeof(double));
    run->x = calloc((size_t)run->years * run->field, sizeof(double));
    return run->time && run->column && run->x ? 0 : fault_memory(fault, "records of a run");
}

int run_years(Run *run, const Settings *settings, const double *start, const char *what, Fault *fault)
{
    *run = (Run){0};
    Settings yearly = *settings;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Keeper keeper = {run, what, 0, omp_get_wtime()};
    Watcher watcher = {keep, NULL, &keeper, NULL};
    yearly.outputs_per_year = 1;
    int code = model_make(&run->model, &yearly, fault);
    if (!code)
        code = allocate(run, &yearly, fault);
    if (!code)
        code = column_make(&column, run->model, fault);
    if (!code)
        code = stepper_make(&stepper, run->model, 0, fault);
    if (!code && start)
        memcpy(column->x, start, run->field * sizeof(double));
    if (!code)
        code = projection_run(run->model, stepper, column, &watcher, fault);
    if (!code) {
        run->solver_steps = column->counts.steps;
        run->photolysis_refreshes = column->photolysis_refreshes;
        run->factor_refreshes = column->factor_refreshes;
    }
    run->seconds = omp_get_wtime() - keeper.began;
    stepper_free(stepper);
    column_free(column);
    if (code)
        run_free(run);
    return code;
}

void run_free(Run *run)
{
    model_free(run->model);
    free(run->time);
    free(run->column);
    free(run->x);
    *run = (Run){0};
}

const double *run_fields(const Run *run, int year)
{
    return run->x + (size_t)(year - run->first_year) * run->field;
}

double run_column(const Run *run, int first, int last)
{
    double sum = 0.0;
    for (int year = first; year <= last; year++)
        sum += run->column[year - run->first_year];
    return sum / (last - first + 1);
}

int carried_make(Carried *carried, const Model *model, const double *x, double time, Fault *fault)
{
    *carried = (Carried){0};
    int code = column_make(&carried->column, model, fault);
    if (!code)
        code = stepper_make(&carried->stepper, model, 0, fault);
    if (code) {
        carried_free(carried);
        return code;
    }
    if (x)
        memcpy(carried->column->x, x,
               (size_t)model->mechanism->solved * (size_t)model->grid.padded * sizeof(double));
    carried->column->time = time;
    column_open_ledger(model, carried->column);
    return 0;
}

void carried_free(Carried *carried)
{
    stepper_free(carried->stepper);
    column_free(carried->column);
    *carried = (Carried){0};
}
