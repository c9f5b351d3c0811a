/* Tests of the column in steps (model/column, model/step): what goes in and out is counted, the splitting
 * converges, threads change nothing. Built-in case on coarse layers. The years of a run are in test_years.c.
 */
#define _XOPEN_SOURCE 700
#include "projection_room.h"

#include <omp.h>

/* ---- what goes in and out ---- */

static void test_closure(void **state)
{
    (void)state;
    static const struct {
        const char *name;
        int day;
        double days;
        long steps;
    } modes[] = {{"factors", DAY_FACTORS, 365.25 / 24, 48},
                 {"means", DAY_MEAN, 365.25 / 24, 96},
                 {"explicit days", DAY_EXPLICIT, 1.0, 60}};
    for (size_t i = 0; i < sizeof modes / sizeof modes[0]; i++) {
        Settings settings = coarse(2.0, 1985);
        settings.last_year = 1989;
        settings.day = modes[i].day;
        Run run =
            start(&settings, 1); /* from the initial profiles: radicals from nothing, everything moves */
        advance(&run, modes[i].days, modes[i].steps, 0);
        check_closure(&run, modes[i].name);
        end(&run);
    }
}

/* The ledger is not the difference of the contents in other words: it does not see a molecule put in by hand,
 * and a ledger entry that nothing stands behind shows. */
static void test_closure_can_fail(void **state)
{
    (void)state;
    Settings settings = coarse(4.0, 1985);
    Run run = start(&settings, 1);
    advance(&run, 15.0, 4, 0);
    int element = mechanism_element(run.model->mechanism, "Cl"), clo = solved(run.model, "ClO"),
        padded = run.model->grid.padded;
    double atoms = column_atoms(run.model, run.column->x, element),
           cell = run.model->air.number_density[5] * run.model->grid.depth[5];
    assert_true(fabs(column_closure(run.model, run.column, element)) < 1e-10);
    run.column->x[FIELD(padded, clo, 5)] += 1e-8 * atoms / cell;
    check_near(column_closure(run.model, run.column, element), 1e-8, 1e-2);
    run.column->x[FIELD(padded, clo, 5)] -= 1e-8 * atoms / cell;
    int f11 = solved(run.model, "CFC-11");
    run.column->received[f11] += 1e-6 * atoms; /* three atoms each */
    check_near(column_closure(run.model, run.column, element), -3e-6, 1e-2);
    run.column->received[f11] -= 1e-6 * atoms;
    run.column->washed[solved(run.model, "HCl")] += 1e-6 * atoms;
    check_near(column_closure(run.model, run.column, element), 1e-6, 1e-2);
    column_open_ledger(run.model, run.column);
    assert_true(column_closure(run.model, run.column, element) == 0.0);
    assert_true(column_ledger_atoms(run.model, run.column, element) == 0.0);
    assert_int_equal(run.column->outer_steps, 0);
    end(&run);
}

/* ---- ground and held species ---- */

static void test_ground_and_held(void **state)
{
    (void)state;
    Settings settings = coarse(2.0, 1985);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    const Schedule *schedule = &model->schedule;
    advance(&run, 20.0, 5, 0);
    double years = 100.0 / 365.25;
    check_near(run.column->time, 1985.0 + years, 1e-12);
    for (int g = 0; g < schedule->gases; g++) {
        assert_true(at(&run, schedule->gas[g], 0) == schedule_abundance(schedule, g, run.column->time));
        int s = solved(model, schedule->gas[g]);
        assert_int_equal(model->surface_kind[s], SURFACE_SCHEDULE);
        assert_true(run.column->received[s] != 0.0 && run.column->exchanged[s] == 0.0);
    }
    assert_true(at(&run, "CO", 0) == 90e-9 && at(&run, "H2", 0) == 530e-9); /* built-in bounds */
    /* the ground takes ozone, HCl and HNO3 up, and lets the CFCs in */
    assert_true(run.column->received[solved(model, "O3")] < 0.0);
    assert_true(run.column->received[solved(model, "HCl")] < 0.0 &&
                run.column->received[solved(model, "HNO3")] < 0.0);
    assert_true(run.column->received[solved(model, "CFC-12")] > 0.0);
    assert_true(run.column->washed[solved(model, "HCl")] > 0.0);
    assert_true(run.column->washed[solved(model, "CFC-12")] == 0.0);

    assert_int_equal(model->held, 3);
    for (int h = 0; h < model->held; h++) {
        int s = model->held_species[h], any = 0;
        for (int l = 0; l < model->grid.layers; l++) {
            size_t i = FIELD(model->grid.padded, h, l);
            assert_true((model->held_free[i] == 0.0) ==
                        (1e-5 * model->grid.middle[l] < settings.tropopause_km));
            if (model->held_free[i] != 0.0)
                continue;
            any++;
            assert_true(model->held_fraction[i] > 0.0);
            assert_true(run.column->x[FIELD(model->grid.padded, s, l)] == model->held_fraction[i]);
        }
        assert_int_equal(any, 6);
        assert_true(run.column->exchanged[s] != 0.0);
    }
    /* frozen: the clock and the schedule stand still, the values stay */
    double time = run.column->time, f11 = at(&run, "CFC-11", 0);
    advance(&run, 20.0, 2, 1);
    assert_true(run.column->time == time && at(&run, "CFC-11", 0) == f11);
    end(&run);
}

/* Deposition alone: a gas that nothing else touches leaves through the ground, and the ledger says how much.
 */
static void test_deposition_is_counted(void **state)
{
    (void)state;
    Settings settings = coarse(2.0, 1985);
    Run run = start(&settings, 1);
    Settings closed = settings;
    closed.bounds = 0;
    for (int b = 0; b < settings.bounds; b++)
        if (strcmp(settings.bound[b].species, "O3"))
            closed.bound[closed.bounds++] = settings.bound[b];
    assert_int_equal(closed.bounds, settings.bounds - 1);
    Run shut = start(&closed, 1);
    assert_int_equal(shut.model->surface_kind[solved(shut.model, "O3")], SURFACE_CLOSED);
    assert_int_equal(run.model->surface_kind[solved(run.model, "O3")], SURFACE_DEPOSITION);
    advance(&run, 10.0, 6, 1);
    advance(&shut, 10.0, 6, 1);
    assert_true(shut.column->received[solved(shut.model, "O3")] == 0.0);
    assert_true(at(&shut, "O3", 0) > at(&run, "O3", 0));
    /* v = 0.1 cm/s of ozone in the lowest layer: a flux of v x N, its mean between that of the two ends */
    double flux = -run.column->received[solved(run.model, "O3")] / (60.0 * DAY_SECONDS);
    double now = 0.1 * at(&run, "O3", 0) * run.model->air.number_density[0];
    assert_true(flux > 0.5 * now && flux < 3.0 * now);
    end(&run);
    end(&shut);
}

/* ---- faults of the case ---- */

static void expect_fault(const Settings *settings, const char *piece, const char *other)
{
    Model *model = (Model *)1;
    Fault fault = {0};
    if (!model_make(&model, settings, &fault)) {
        Column *column = NULL;
        int code = column_make(&column, model, &fault);
        if (!code)
            fail_msg("no fault about %s", piece);
        assert_null(column);
        model_free(model);
    } else {
        assert_null(model);
    }
    check_fault(&fault, piece, other, NULL);
}

static void test_faults_of_the_case(void **state)
{
    char path[300];
    Settings settings = coarse(4.0, 1985), bad = settings;
    write_file(state, "schedule.csv",
               "# source: test\nyear,gas,kind,amount,unit,line\n1985,CFC-99,abundance,1,ppt,x\n", path);
    snprintf(bad.schedule_file, sizeof bad.schedule_file, "%s", path);
    expect_fault(&bad, path, "CFC-99");

    bad = settings;
    write_file(state, "wet.csv",
               "# source: test\nyear,gas,kind,amount,unit,line\n1985,H2O,abundance,1000,ppm,x\n", path);
    snprintf(bad.schedule_file, sizeof bad.schedule_file, "%s", path);
    expect_fault(&bad, path, "held up to the tropopause");

    bad = settings; /* nothing to hold below the tropopause */
    bad.edges = 5;
    for (int e = 0; e < bad.edges; e++)
        bad.edge_km[e] = e ? 20.0 + 10.0 * e : 0.0;
    expect_fault(&bad, "lowest layer", "surface.tropopause_km");

    bad = settings;
    write_file(state, "short.csv",
               "# source: test\nyear,gas,kind,amount,unit,line\n1980,N2O,abundance,300,ppb,x\n", path);
    snprintf(bad.schedule_file, sizeof bad.schedule_file, "%s", path);
    expect_fault(&bad, path, "N2O");

    bad = settings;
    snprintf(bad.schedule_file, sizeof bad.schedule_file, "no-such-schedule.csv");
    expect_fault(&bad, "no-such-schedule.csv", "schedule");

    bad = settings;
    snprintf(bad.case_path, sizeof bad.case_path, "mine.cfg");
    bad.bounds_given = 1;
    snprintf(bad.bound[0].species, sizeof bad.bound[0].species, "CFC-11");
    expect_fault(&bad, "mine.cfg", "CFC-11");
    snprintf(bad.bound[0].species, sizeof bad.bound[0].species, "XeF6");
    expect_fault(&bad, "mine.cfg", "XeF6");

    bad = settings;
    write_file(state, "aerosol.csv",
               "# source: test\naltitude_km,surface_um2_cm-3,effective_radius_um\n0,1,0.1\n40,1,0.1\n", path);
    snprintf(bad.aerosol_file, sizeof bad.aerosol_file, "%s", path);
    expect_fault(&bad, path, "0 to 40 km");

    bad = settings;
    write_file(state, "water.csv", "# source: test\naltitude_km,H2O_mol_mol-1\n0,0.01\n8,1e-5\n", path);
    snprintf(bad.tropospheric_water_file, sizeof bad.tropospheric_water_file, "%s", path);
    expect_fault(&bad, path, "tropospheric water");

    bad = settings;
    write_file(state, "initial.csv", "# source: test\naltitude_km,O3,Unobtainium\n0,1e-8,0\n90,1e-7,0\n",
               path);
    snprintf(bad.initial_file, sizeof bad.initial_file, "%s", path);
    expect_fault(&bad, path, "Unobtainium");

    bad = settings;
    write_file(state, "eddy.csv", "# source: test\naltitude_km,eddy_cm2_s-1\n0,1e5\n50,1e5\n", path);
    snprintf(bad.eddy_file, sizeof bad.eddy_file, "%s", path);
    expect_fault(&bad, path, "eddy");
}

/* ---- splitting ---- */

/* Slow gases after 60 days at steps h, h/2, h/4, h/8, from one settled state, with everything that is made
 * afresh now and then held: mean light, no aerosol, photolysis never refreshed. Then the splitting is all
 * that differs. */
static void test_splitting_is_second_order(void **state)
{
    static const char *const gases[] = {"N2O", "CFC-12", "CFC-11", "CH4", "O3"};
    enum { GASES = 5, LEVELS = 4 };
    char path[300];
    write_file(
        state, "clear.csv",
        "# source: test\naltitude_km,surface_um2_cm-3,effective_radius_um\n0,1e-12,0.1\n90,1e-12,0.1\n",
        path);
    Settings settings = coarse(2.0, 1990);
    snprintf(settings.aerosol_file, sizeof settings.aerosol_file, "%s", path);
    settings.day = DAY_MEAN;
    settings.relative_tolerance = 1e-6;
    settings.absolute_tolerance_cm3 = 1.0;
    Run from = start(&settings, 1);
    advance(&from, 15.0, 48, 1);
    settings.refresh_column = 1.0;
    double step[LEVELS] = {30.0, 15.0, 7.5, 3.75}, *x[LEVELS];
    size_t size = field_size(from.model);
    for (int i = 0; i < LEVELS; i++) {
        Run run = copy_of(&from, &settings, 1);
        advance(&run, step[i], lround(60.0 / step[i]), 1);
        assert_int_equal(run.column->photolysis_refreshes, 1);
        x[i] = malloc(size * sizeof(double));
        assert_non_null(x[i]);
        memcpy(x[i], run.column->x, size * sizeof(double));
        end(&run);
    }
    for (int g = 0; g < GASES; g++) {
        double apart[LEVELS - 1] = {0};
        int s = solved(from.model, gases[g]);
        for (int l = 10; l < 23; l++) /* 20 to 46 km */
            for (int i = 0; i + 1 < LEVELS; i++) {
                double coarse_x = x[i][FIELD(from.model->grid.padded, s, l)],
                       fine_x = x[i + 1][FIELD(from.model->grid.padded, s, l)];
                apart[i] += fabs(coarse_x - fine_x);
            }
        double first = log2(apart[0] / apart[1]), second = log2(apart[1] / apart[2]);
        print_message("   %s: order %.2f, then %.2f\n", gases[g], first, second);
        if (strcmp(gases[g], "O3"))
            assert_true(second > 1.5 && second < 2.5);
        assert_true(apart[1] < apart[0] && apart[2] < apart[1]);
    }
    for (int i = 0; i < LEVELS; i++)
        free(x[i]);
    end(&from);
}

/* Halving the default step on the default layers moves the column by less than 0.1 DU. What is made afresh
 * now and then is made afresh often, so that its thresholds do not hide what the step does. */
static void test_default_step(void **state)
{
    (void)state;
    Settings settings = coarse(1.0, 1990);
    settings.refresh_column = 5e-4;
    Run whole = start(&settings, 1), half;
    Settings finer = settings;
    finer.outer_step_days *= 0.5;
    half = start(&finer, 1);
    advance(&whole, settings.outer_step_days, lround(3.0 * 365.25 / settings.outer_step_days), 0);
    advance(&half, finer.outer_step_days, lround(3.0 * 365.25 / finer.outer_step_days), 0);
    double moved = du(&half) - du(&whole);
    print_message("   three years: %.3f DU, half the step %.3f DU, moved by %.3f\n", du(&whole), du(&half),
                  moved);
    assert_true(fabs(moved) < 0.1);
    end(&whole);
    end(&half);
}

/* ---- threads ---- */

static void test_threads_change_nothing(void **state)
{
    (void)state;
    for (int day = DAY_MEAN; day <= DAY_EXPLICIT; day++) {
        Settings settings = coarse(2.0, 1985);
        settings.day = day;
        Run one = start(&settings, 1), two = start(&settings, 2);
        double days = day == DAY_EXPLICIT ? 1.0 : 15.0;
        advance(&one, days, 6, 0);
        advance(&two, days, 6, 0);
        size_t bytes = field_size(one.model) * sizeof(double),
               list = (size_t)one.model->mechanism->solved * sizeof(double);
        assert_memory_equal(one.column->x, two.column->x, bytes);
        assert_memory_equal(stepper_mean(one.stepper), stepper_mean(two.stepper), bytes);
        assert_memory_equal(one.column->received, two.column->received, list);
        assert_memory_equal(one.column->exchanged, two.column->exchanged, list);
        assert_memory_equal(one.column->washed, two.column->washed, list);
        assert_int_equal(one.column->counts.steps, two.column->counts.steps);
        end(&one);
        end(&two);
    }
}

/* ---- when light is made afresh ---- */

static void test_light_stale(void **state)
{
    (void)state;
    Settings settings = coarse(2.0, 1985);
    Run run = start(&settings, 1);
    advance(&run, 15.0, 1, 1);
    assert_int_equal(run.column->photolysis_refreshes, 1);
    end(&run);
    settings.refresh_column = 1e-5; /* a column that still moves refreshes at every step */
    run = start(&settings, 1);
    advance(&run, 15.0, 5, 1);
    assert_int_equal(run.column->photolysis_refreshes, 5);
    end(&run);
    settings.refresh_column = 1.0;
    run = start(&settings, 1);
    advance(&run, 15.0, 5, 1);
    assert_int_equal(run.column->photolysis_refreshes, 1);
    end(&run);
}

/* ---- layers that fill no pack ---- */

static void test_layers_that_fill_no_pack(void **state)
{
    (void)state;
    Settings settings = coarse(2.0, 1985), uneven = settings;
    /* 35 layers: 2 km as in the even grid up to 60 km, 4 km above: 3 lanes of padding */
    uneven.edges = 0;
    for (int i = 0; i <= 30; i++)
        uneven.edge_km[uneven.edges++] = 2.0 * i;
    for (int i = 1; i <= 5; i++)
        uneven.edge_km[uneven.edges++] = 60.0 + 4.0 * i;
    uneven.top_km = 80.0;
    Run even = start(&settings, 1), other = start(&uneven, 1);
    assert_int_equal(other.model->grid.layers, 35);
    assert_int_equal(other.model->grid.padded, 40);
    advance(&even, 365.25 / 24, 24, 0);
    advance(&other, 365.25 / 24, 24, 0);
    print_message("   even layers %.3f DU, uneven %.3f DU\n", du(&even), du(&other));
    assert_true(fabs(du(&even) - du(&other)) < 0.3);
    for (int l = 8; l < 25; l++)
        check_near(at(&other, "O3", l), at(&even, "O3", l), 0.02);
    for (int s = 0; s < other.model->mechanism->solved;
         s++) /* padding follows the top layer within its own step */
        for (int l = 35; l < 40; l++)
            assert_true(isfinite(other.column->x[FIELD(40, s, l)]));
    check_closure(&other, "uneven layers");
    end(&even);
    end(&other);

    /* 27 layers of their own, nothing like the even ones: runs and gives nearly the same column */
    settings.day = uneven.day = DAY_MEAN;
    uneven.edges = 0;
    for (int i = 0; i <= 20; i++)
        uneven.edge_km[uneven.edges++] = 2.0 * i; /* to 40 km */
    static const double above[] = {43, 47, 52, 58, 65, 72, 80};
    for (int i = 0; i < 7; i++)
        uneven.edge_km[uneven.edges++] = above[i];
    even = start(&settings, 1);
    other = start(&uneven, 1);
    assert_int_equal(other.model->grid.layers, 27);
    assert_int_equal(other.model->grid.padded, 32);
    advance(&even, 365.25 / 24, 24, 0);
    advance(&other, 365.25 / 24, 24, 0);
    print_message("   even layers %.3f DU, 27 layers %.3f DU\n", du(&even), du(&other));
    assert_true(fabs(du(&even) - du(&other)) < 0.01 * du(&even));
    check_closure(&other, "27 layers");
    end(&even);
    end(&other);
}

int main(void)
{
    omp_set_num_threads(1); /* one core serves as well, and waiting threads would take the others */
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_closure),         cmocka_unit_test(test_closure_can_fail),
        cmocka_unit_test(test_ground_and_held), cmocka_unit_test(test_deposition_is_counted),
        WITH_FOLDER(test_faults_of_the_case),   WITH_FOLDER(test_splitting_is_second_order),
        cmocka_unit_test(test_default_step),    cmocka_unit_test(test_threads_change_nothing),
        cmocka_unit_test(test_light_stale),     cmocka_unit_test(test_layers_that_fill_no_pack),
    };
    return cmocka_run_group_tests_name("projection", tests, NULL, NULL);
}
