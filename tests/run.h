/* run: a column on its way, for the tests of the model floor. */
#ifndef SKYMEND_TEST_RUN_H
#define SKYMEND_TEST_RUN_H

#include "scratch.h"

#include "../input/constants.h"
#include "../model/step.h"

typedef struct {
    Model *model;
    Column *column;
    Stepper *stepper;
} Run;

static inline void ok(int code, const Fault *fault)
{
    if (code)
        fail_msg("fault %d: %s", code, fault->text);
}

static inline Run start(const Settings *settings, int threads)
{
    Run run;
    Fault fault = {0};
    ok(model_make(&run.model, settings, &fault), &fault);
    ok(column_make(&run.column, run.model, &fault), &fault);
    ok(stepper_make(&run.stepper, run.model, threads, &fault), &fault);
    return run;
}

static inline void end(Run *run)
{
    stepper_free(run->stepper);
    column_free(run->column);
    model_free(run->model);
}

/* frozen: as stepper_advance. */
static inline void advance(Run *run, double days, long steps, int frozen)
{
    Fault fault = {0};
    for (long i = 0; i < steps; i++)
        ok(stepper_advance(run->stepper, run->column, days * DAY_SECONDS, frozen, &fault), &fault);
}

static inline size_t field_size(const Model *model)
{
    return (size_t)model->mechanism->solved * (size_t)model->grid.padded;
}

#endif
