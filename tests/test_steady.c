/* Tests of the steady state (model/steady): at rest and of one sign, the same wherever it starts from and as
 * what a long run of the unsplit column comes to; factors in turn with it; what happens when there is none;
 * and how a projection starts from it. Built-in case on coarse layers. */
#define _XOPEN_SOURCE 700
#include "settled.h"

#include "../model/projection.h"

/* Largest relative difference of two states, of species above 1000 cm-3. */
static double apart(const Model *model, const double *a, const double *b, int *species)
{
    double most = 0.0;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < model->grid.layers; l++) {
            size_t at = FIELD(model->grid.padded, s, l);
            double value = fabs(a[at] - b[at]) / fmax(fabs(a[at]), 1e3 / model->air.number_density[l]);
            if (value > most) {
                most = value;
                *species = s;
            }
        }
    return most;
}

static void test_at_rest(void **state)
{
    (void)state;
    for (int day = DAY_MEAN; day <= DAY_FACTORS; day++) {
        Settings settings = coarse_case(day, 2000);
        Rest rest = make_rest(&settings);
        find_rest(&rest);
        Unsplit *unsplit = rest.unsplit;
        const Model *model = rest.run.model;
        const double *x = rest.run.column->x;
        double *tendency = unknowns(unsplit), *gross = unknowns(unsplit), worst = 0.0, lowest = 0.0;
        unsplit_evaluate(unsplit, x, tendency, 0);
        unsplit_turnover(unsplit, x, gross);
        for (int i = 0; i < unsplit->unknowns; i++) {
            double y = x[place(unsplit, i)] * model->air.number_density[i / unsplit->solved];
            lowest = fmin(lowest, y);
            if (y > 1.0)
                worst = fmax(worst, fabs(tendency[i]) / gross[i]);
        }
        print_message("   %s: %d steps, %d turns, residual %.1e (told %.1e), lowest density %.1e cm-3\n",
                      day == DAY_MEAN ? "means" : "factors", rest.report.iterations, rest.report.turns, worst,
                      rest.report.residual, lowest);
        assert_true(worst < 1e-7 && rest.report.residual < 1e-7);
        assert_true(lowest >= -STEADY_BELOW);
        assert_true(rest.report.change <= STEADY_CHANGE);
        for (int g = 0; g < model->schedule.gases; g++) {
            int s = solved_of(model, model->schedule.gas[g]);
            check_near(x[FIELD(model->grid.padded, s, 0)], schedule_abundance(&model->schedule, g, 2000.0),
                       1e-15);
        }
        /* CFC-115 lives for centuries: its budget is closed all the same. What enters is what is lost. */
        int s = solved_of(model, "CFC-115");
        double in = unsplit->conductance[1] *
                    (x[FIELD(model->grid.padded, s, 0)] - x[FIELD(model->grid.padded, s, 1)]);
        double lost = 0.0;
        for (int r = 0; r < model->mechanism->reactions; r++)
            for (int c = 0; c < model->mechanism->reaction[r].changes; c++)
                for (int l = 1; model->mechanism->reaction[r].changed[c] == s && l < unsplit->layers; l++)
                    lost -= model->mechanism->reaction[r].change[c] *
                            unsplit->rate[FIELD(model->grid.padded, r, l)] * unsplit->conditions->depth[l];
        print_message("   CFC-115: %.6g molecules cm-2 s-1 enter, %.6g are lost\n", in, lost);
        check_near(in, lost, 1e-5);
        free(tendency);
        free(gross);
        end_rest(&rest);
    }
}

/* From the initial profiles, from the settled state of another year, and by the unsplit column through 20 000
 * years under the same values: one state. Of the last, a step's tolerance of 1e-3 leaves nothing in the end.
 */
static void test_one_state(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    settings.first_year = 1960;
    Rest rest = make_rest(&settings);
    const Model *model = rest.run.model;
    Unsplit *unsplit = rest.unsplit;
    double *x = rest.run.column->x;
    Fault fault = {0};
    find_rest(&rest);
    double *from_past = field_copy(model, x), *through_time = field_copy(model, x);
    unsplit_set_time(unsplit, 2000.0);
    ok(steady_settle(unsplit, from_past, &rest.report, &fault), &fault);
    Column *column;
    ok(column_make(&column, model, &fault), &fault);
    ok(steady_settle(unsplit, column->x, &rest.report, &fault), &fault);
    int species = 0;
    double other = apart(model, column->x, from_past, &species);
    print_message("   from another year: apart by %.1e at most (%s)\n", other,
                  mechanism_name(model->mechanism, species));
    assert_true(other < 1e-6);
    double time = 2000.0;
    UnsplitStepping stepping = {.relative = 1e-3, .absolute = 1.0};
    ok(unsplit_advance(unsplit, through_time, &time, 20000.0, 1, &stepping, &fault), &fault);
    assert_true(time == 2000.0);
    double late = apart(model, column->x, through_time, &species);
    print_message("   after 20 000 years, %ld steps, %ld not taken: apart by %.1e at most (%s)\n",
                  stepping.steps, stepping.rejections, late, mechanism_name(model->mechanism, species));
    assert_true(late < 1e-4);
    column_free(column);
    free(from_past);
    free(through_time);
    end_rest(&rest);
}

/* A gas that nothing takes is everywhere what it is at the ground. */
static void test_uniform_without_loss(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    Rest rest = make_rest(&settings);
    const Model *model = rest.run.model;
    int s = solved_of(model, "CFC-115"), padded = model->grid.padded;
    for (int r = 0; r < model->mechanism->reactions; r++)
        for (int c = 0; c < model->mechanism->reaction[r].changes; c++)
            for (int l = 0; model->mechanism->reaction[r].changed[c] == s && l < padded; l++)
                rest.unsplit->factor[FIELD(padded, r, l)] = 0.0;
    double *x = rest.run.column->x;
    for (int l = 1; l < padded; l++)
        x[FIELD(padded, s, l)] *= 0.3 + 0.01 * l;
    Fault fault = {0};
    ok(steady_settle(rest.unsplit, x, &rest.report, &fault), &fault);
    double worst = 0.0;
    for (int l = 0; l < model->grid.layers; l++)
        worst = fmax(worst, fabs(x[FIELD(padded, s, l)] / x[FIELD(padded, s, 0)] - 1.0));
    print_message("   uniform to %.1e\n", worst);
    assert_true(worst < 1e-12);
    end_rest(&rest);
}

/* The factors belong to the state: made once more and settled once more, ozone stays. */
static void test_factors_belong(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_FACTORS, 1990);
    Rest rest = make_rest(&settings);
    find_rest(&rest);
    const Model *model = rest.run.model;
    double *x = rest.run.column->x, *before = field_copy(model, x);
    assert_true(rest.report.turns >= 2 && rest.report.ozone_change <= STEADY_OZONE);
    Fault fault = {0};
    ok(stepper_refresh(rest.run.stepper, rest.run.column, 1, &fault), &fault);
    unsplit_take_factors(rest.unsplit, stepper_day(rest.run.stepper));
    ok(steady_settle(rest.unsplit, x, &rest.report, &fault), &fault);
    double most = 0.0, column = column_ozone_du(model, x) - column_ozone_du(model, before);
    for (int l = 0; l < model->grid.layers; l++) {
        size_t at = FIELD(model->grid.padded, solved_of(model, "O3"), l);
        most = fmax(most, fabs(x[at] / before[at] - 1.0));
    }
    print_message("   one more turn moves a layer's ozone by %.1e, the column by %+.4f DU\n", most, column);
    assert_true(most < 2.0 * STEADY_OZONE && fabs(column) < 0.05);
    /* and they matter: with daily means the column is another */
    unsplit_take_factors(rest.unsplit, NULL);
    ok(steady_settle(rest.unsplit, x, &rest.report, &fault), &fault);
    assert_true(fabs(column_ozone_du(model, x) - column_ozone_du(model, before)) > 1.0);
    free(before);
    end_rest(&rest);
}

/* No steady state: a gas that is emitted and that nothing takes grows for ever. And no state at all: a rate
 * that is no number. The faults name species and altitude and say what to do. */
static void test_none(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    Rest rest = make_rest(&settings);
    const Model *model = rest.run.model;
    int padded = model->grid.padded, s = solved_of(model, "CFC-115");
    for (int r = 0; r < model->mechanism->reactions; r++)
        for (int c = 0; c < model->mechanism->reaction[r].changes; c++)
            for (int l = 0; model->mechanism->reaction[r].changed[c] == s && l < padded; l++)
                rest.unsplit->factor[FIELD(padded, r, l)] = 0.0;
    unsplit_emit(rest.unsplit, s, 1e5);
    Fault fault = {0};
    assert_int_equal(steady_settle(rest.unsplit, rest.run.column->x, &rest.report, &fault), FAULT_NUMERICS);
    print_message("   %s\n", fault.text);
    assert_non_null(strstr(fault.text, "no steady state: the state still moves"));
    assert_non_null(strstr(fault.text, "CFC-115"));
    assert_non_null(strstr(fault.text, "altitude"));
    assert_non_null(strstr(fault.text, "spinup"));
    end_rest(&rest);

    rest = make_rest(&settings);
    for (int l = 0; l < padded; l++)
        rest.unsplit->factor[FIELD(padded, 3, l)] = NAN;
    fault = (Fault){0};
    assert_int_equal(steady_settle(rest.unsplit, rest.run.column->x, &rest.report, &fault), FAULT_NUMERICS);
    print_message("   %s\n", fault.text);
    assert_non_null(strstr(fault.text, "shrank to nothing"));
    end_rest(&rest);
}

/* ---- the start of a projection ---- */

static int keep_first(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    double *column = context;
    if (column[0] == 0.0)
        column[0] = record->ozone_column;
    return 0;
}

/* A settled start stays where it is but for the error of the splitting; explicit days start from midnight. */
static void test_projection_starts_settled(void **state)
{
    (void)state;
    for (int day = DAY_MEAN; day <= DAY_EXPLICIT; day++) {
        Settings settings = coarse_case(day, 1985);
        settings.spacing_km = day == DAY_EXPLICIT ? 4.0 : 2.0;
        settings.outputs_per_year = day == DAY_EXPLICIT ? 12 : 1;
        assert_int_equal(settings.start, START_SETTLED);
        Run run = start(&settings, 1);
        Fault fault = {0};
        ok(projection_settle(run.model, run.stepper, run.column, &fault), &fault);
        double settled = column_ozone_du(run.model, run.column->x), first = 0.0;
        end(&run);
        run = start(&settings, 1);
        Watcher watcher = {.record = keep_first, .context = &first};
        ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
        print_message("   day mode %d: settled %.3f DU, mean of the first interval %.3f DU\n", day, settled,
                      first);
        assert_true(fabs(first - settled) < (day == DAY_EXPLICIT ? 1.0 : 0.3));
        for (int e = 0; e < run.model->mechanism->elements; e++)
            if (strcmp(run.model->mechanism->element[e], "O") &&
                strcmp(run.model->mechanism->element[e], "F") &&
                strcmp(run.model->mechanism->element[e], "C"))
                assert_true(fabs(column_closure(run.model, run.column, e)) < 1e-10);
        end(&run);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_at_rest),
                                       cmocka_unit_test(test_one_state),
                                       cmocka_unit_test(test_uniform_without_loss),
                                       cmocka_unit_test(test_factors_belong),
                                       cmocka_unit_test(test_none),
                                       cmocka_unit_test(test_projection_starts_settled)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
