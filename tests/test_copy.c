/* Tests of what apportioning rests on: a copied column and stepper go on as the original to the last bit; a
 * run that follows the refreshes of its like is its like; when the effect of a pulse falls. Coarse layers,
 * INVENTED emissions. */
#define _XOPEN_SOURCE 700
#include "lines.h"

#include "../model/projection.h"
#include "../model/pulse.h"
#include "../model/steady.h"

/* ---- copies ---- */

static void check_same(const char *what, const Run *a, const Run *b)
{
    size_t solved = (size_t)a->model->mechanism->solved;
    assert_true(a->column->time == b->column->time);
    same(what, a->column->x, b->column->x, field_size(a->model));
    same(what, a->column->balance, b->column->balance, field_size(a->model));
    same(what, a->column->received, b->column->received, solved);
    same(what, a->column->emitted, b->column->emitted, solved);
    same(what, a->column->exchanged, b->column->exchanged, solved);
    same(what, a->column->washed, b->column->washed, solved);
    assert_int_equal(a->column->counts.factorisations, b->column->counts.factorisations);
    assert_int_equal(a->column->outer_steps, b->column->outer_steps);
    assert_int_equal(a->column->photolysis_refreshes, b->column->photolysis_refreshes);
    assert_int_equal(a->column->factor_refreshes, b->column->factor_refreshes);
    assert_int_equal(a->column->days, b->column->days);
    same(what, stepper_mean(a->stepper), stepper_mean(b->stepper), field_size(a->model));
}

/* The original goes on; the copy is put into a stepper and a column of another thread number that have been
 * used for something else; both must end the same. In between light, factors, temperature, the sun of the
 * season and the ground (emissions take over in 1990) move, all of which a copy could forget. */
static void test_copy(void **state)
{
    static const struct {
        const char *name;
        int day, sun;
        double step;
        long before, after;
    } modes[] = {{"factors", DAY_FACTORS, SUN_GLOBAL, 365.25 / 24, 12, 48},
                 {"means", DAY_MEAN, SUN_GLOBAL, 365.25 / 24, 12, 48},
                 {"explicit days", DAY_EXPLICIT, SUN_GLOBAL, 1.0, 10, 25},
                 {"season", DAY_FACTORS, SUN_SEASON, 365.25 / 24, 12, 30}};
    for (size_t m = 0; m < sizeof modes / sizeof modes[0]; m++) {
        Settings settings = coarse(state, 1989, 1991);
        settings.day = modes[m].day;
        settings.sun = modes[m].sun;
        settings.latitude_deg = 45.0;
        settings.start = START_SPINUP;
        settings.spinup_years = 0.0;
        Run run = start(&settings, 2), copy = start(&settings, 1);
        advance(&copy, modes[m].step, 7, 1);
        advance(&run, modes[m].step, modes[m].before, 0);
        column_copy(copy.column, run.column, run.model);
        stepper_copy(copy.stepper, run.stepper);
        advance(&run, modes[m].step, modes[m].after, 0);
        advance(&copy, modes[m].step, modes[m].after, 0);
        check_same(modes[m].name, &run, &copy);
        end(&run);
        end(&copy);
    }
}

/* In parts or in one: the same run. */
static void test_projection_in_parts(void **state)
{
    Settings settings = coarse(state, 1989, 1991);
    settings.outputs_per_year = 4;
    const Watcher nothing = {0};
    Fault fault = {0};
    Run run = start(&settings, 1), parts = start(&settings, 1);
    ok(projection_run(run.model, run.stepper, run.column, &nothing, &fault), &fault);
    ok(projection_begin(parts.model, parts.stepper, parts.column, &nothing, &fault), &fault);
    ok(projection_continue(parts.model, parts.stepper, parts.column, 0, 5, &nothing, &fault), &fault);
    ok(projection_continue(parts.model, parts.stepper, parts.column, 5, 12, &nothing, &fault), &fault);
    check_same("in parts", &run, &parts);
    assert_int_equal(projection_steps(run.model, 0, 12), run.column->outer_steps);
    end(&run);
    end(&parts);
}

/* A run that follows the log of its like is its like; and the log is followed, not just agreed with: another
 * log makes another run. */
static void test_log(void **state)
{
    Settings settings = coarse(state, 1989, 1991);
    settings.start = START_SPINUP;
    settings.spinup_years = 0.0;
    RefreshLog log, empty;
    Fault fault = {0};
    const double days = 365.25 / 24;
    Run first = start(&settings, 1), second = start(&settings, 1), third = start(&settings, 1);
    ok(refresh_log_make(&log, 60, &fault), &fault);
    ok(refresh_log_make(&empty, 60, &fault), &fault);
    stepper_keep_log(first.stepper, &log);
    stepper_follow_log(second.stepper, &log);
    stepper_follow_log(third.stepper, &empty);
    advance(&first, days, 60, 0);
    advance(&second, days, 60, 0);
    advance(&third, days, 60, 0);
    check_same("following", &first, &second);
    int lights = 0, factors = 0;
    for (int i = 0; i < 60; i++) {
        lights += log.light[i];
        factors += log.days[i] > 0;
    }
    assert_int_equal(lights, first.column->photolysis_refreshes);
    assert_int_equal(factors, first.column->factor_refreshes);
    assert_true(third.column->factor_refreshes < factors);
    refresh_log_free(&log);
    refresh_log_free(&empty);
    end(&first);
    end(&second);
    end(&third);
}

/* When a pulse's effect falls: two step lengths agree, and a gas that lives a year is over within decades,
 * one that lives a century is not. */
static void test_pulse(void **state)
{
    enum { YEARS = 60 };
    Settings settings = coarse(state, 1985, 1985);
    settings.day = DAY_MEAN;
    Run run = start(&settings, 1);
    Unsplit *unsplit;
    SteadyReport steady;
    Fault fault = {0};
    double whole[YEARS + 1], half[2 * YEARS + 1];
    ok(unsplit_make(&unsplit, run.model, &fault), &fault);
    ok(steady_find(unsplit, run.stepper, run.column, 1985.5, &steady, &fault), &fault);
    static const char *const gases[] = {"CH3Br", "CFC-12"};
    for (int g = 0; g < 2; g++) {
        int s = mechanism_solved(run.model->mechanism, gases[g]);
        ok(pulse_response(unsplit, run.column->x, s, YEARS, 1.0, whole, &fault), &fault);
        ok(pulse_response(unsplit, run.column->x, s, 2 * YEARS, 0.5, half, &fault), &fault);
        assert_true(unsplit->kept[s] == 1 && unsplit->emission[s] == 0.0);
        assert_true(half[0] == 0.0);
        for (int y = 1; y <= YEARS; y++) {
            /* second order: the half step's own error is a third of what is seen here */
            if (!(fabs(whole[y] - half[2 * y]) < 0.005))
                fail_msg("%s after %d years: %g and %g", gases[g], y, whole[y], half[2 * y]);
            assert_true(half[2 * y] >= half[2 * y - 2]);
        }
        print_message("   %-7s %.4f after 5, %.4f after 20, %.4f after %d years\n", gases[g], half[10],
                      half[40], half[2 * YEARS], YEARS);
        if (g == 0)
            assert_true(fabs(half[2 * YEARS] - 1.0) < 1e-3);
        else
            assert_true(half[2 * YEARS] > 0.2 && half[2 * YEARS] < 0.7);
    }
    unsplit_free(unsplit);
    end(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(test_copy),
        WITH_FOLDER(test_projection_in_parts),
        WITH_FOLDER(test_log),
        WITH_FOLDER(test_pulse),
    };
    return cmocka_run_group_tests_name("copy", tests, NULL, NULL);
}
