/* settled: a coarse column and its unsplit equations, for the tests of unsplit, steady and sensitivity. */
#ifndef SKYMEND_TEST_SETTLED_H
#define SKYMEND_TEST_SETTLED_H

#include "run.h"

#include "../model/steady.h"

typedef struct {
    Run run;
    Unsplit *unsplit;
    SteadyReport report;
} Rest;

/* 2 km layers to 60 km: everything of the whole column but the mesosphere, in a tenth of its time. */
static inline Settings coarse_case(int day, int year)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = 2.0;
    settings.top_km = 60.0;
    settings.first_year = settings.last_year = year;
    settings.day = day;
    return settings;
}

/* Built, not yet settled. */
static inline Rest make_rest(const Settings *settings)
{
    Rest rest = {.run = start(settings, 1)};
    Fault fault = {0};
    ok(unsplit_make(&rest.unsplit, rest.run.model, &fault), &fault);
    unsplit_set_time(rest.unsplit, rest.run.column->time);
    unsplit_keep(rest.unsplit, rest.run.column->x);
    return rest;
}

static inline void find_rest(Rest *rest)
{
    Fault fault = {0};
    ok(steady_find(rest->unsplit, rest->run.stepper, rest->run.column, rest->run.column->time, &rest->report,
                   &fault),
       &fault);
}

static inline void end_rest(Rest *rest)
{
    unsplit_free(rest->unsplit);
    end(&rest->run);
}

static inline double *unknowns(const Unsplit *unsplit)
{
    double *made = calloc((size_t)unsplit->unknowns, sizeof(double));
    assert_non_null(made);
    return made;
}

static inline double *field_copy(const Model *model, const double *x)
{
    double *made = malloc(field_size(model) * sizeof(double));
    assert_non_null(made);
    memcpy(made, x, field_size(model) * sizeof(double));
    return made;
}

static inline size_t place(const Unsplit *unsplit, int i)
{
    return FIELD(unsplit->model->grid.padded, i % unsplit->solved, i / unsplit->solved);
}

static inline int solved_of(const Model *model, const char *name)
{
    int s = mechanism_solved(model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

#endif
