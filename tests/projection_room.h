/* projection_room.h: what the tests of the column in steps and through the years share. Include after
 * defining _XOPEN_SOURCE 700. */
#ifndef SKYMEND_TEST_PROJECTION_ROOM_H
#define SKYMEND_TEST_PROJECTION_ROOM_H

#include "run.h"

#include "../model/projection.h"

static inline Settings coarse(double spacing_km, int first_year)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = spacing_km;
    settings.first_year = settings.last_year = first_year;
    settings.start = START_SPINUP;
    settings.spinup_years = 0.0;
    return settings;
}

static inline int solved(const Model *model, const char *name)
{
    int s = mechanism_solved(model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

static inline double at(const Run *run, const char *name, int layer)
{
    return run->column->x[FIELD(run->model->grid.padded, solved(run->model, name), layer)];
}

static inline double du(const Run *run)
{
    return column_ozone_du(run->model, run->column->x);
}

static inline Run copy_of(const Run *from, const Settings *settings, int threads)
{
    Run run = start(settings, threads);
    assert_int_equal(field_size(run.model), field_size(from->model));
    memcpy(run.column->x, from->column->x, field_size(from->model) * sizeof(double));
    column_open_ledger(run.model, run.column);
    return run;
}

static const char *const accounted[] = {"Cl", "Br", "N", "H"};

static inline void check_closure(const Run *run, const char *what)
{
    for (size_t i = 0; i < 4; i++) {
        int element = mechanism_element(run->model->mechanism, accounted[i]);
        double closure = column_closure(run->model, run->column, element);
        double moved = column_ledger_atoms(run->model, run->column, element) /
                       column_atoms(run->model, run->column->x, element);
        print_message("   %s, %s: closed to %.1e, %+.1e of it moved\n", what, accounted[i], closure, moved);
        if (!(fabs(closure) < 1e-10))
            fail_msg("%s: %s is closed to %.2e only", what, accounted[i], closure);
        if (!(fabs(moved) > 1e-7))
            fail_msg("%s: hardly any %s came or went, the test shows nothing", what, accounted[i]);
    }
    const SolverCounts *counts = &run->column->counts;
    if (!(counts->most_negative >= -run->model->settings.absolute_tolerance_cm3))
        fail_msg("%s: a density of %g cm-3", what, counts->most_negative);
    assert_true((counts->negatives == 0) == (counts->most_negative == 0.0));
}

#endif
