/* Tests of the explicit day and the diurnal factors (model/pack, model/day): what a pack carries in and out,
 * what a day integrates, and that a run with the factors is the mean of explicit days. The built-in case on
 * layers of 2 km. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include <omp.h>

static Settings coarse(void)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = 2.0;
    settings.first_year = 2000; /* chlorine near its peak */
    settings.last_year = 2001;
    return settings;
}

static void copy_state(Run *to, const Run *from)
{
    assert_int_equal(field_size(to->model), field_size(from->model));
    memcpy(to->column->x, from->column->x, field_size(from->model) * sizeof(double));
}

static int solved(const Run *run, const char *name)
{
    int s = mechanism_solved(run->model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

static int reaction(const Run *run, const char *equation)
{
    const Mechanism *mechanism = run->model->mechanism;
    for (int r = 0; r < mechanism->reactions; r++)
        if (!strncmp(mechanism->reaction[r].equation, equation, strlen(equation)))
            return r;
    fail_msg("no reaction %s", equation);
    return -1;
}

/* ---- one state for the tests that only look ---- */

static Run spun;

static int spin(void **state)
{
    (void)state;
    Settings settings = coarse();
    spun = start(&settings, 1);
    advance(&spun, settings.outer_step_days, (int)lround(3.0 * 365.25 / settings.outer_step_days), 1);
    return 0;
}

static int drop(void **state)
{
    (void)state;
    end(&spun);
    return 0;
}

static double *carried_day(PackWork *work, int first, double relative, double absolute)
{
    const Model *model = spun.model;
    const Kernel *kernel = model->kernel;
    pack_load(work, model, first, spun.column->x);
    pack_rates(work, model, first, stepper_coefficients(spun.stepper), stepper_light(spun.stepper)->mean,
               NULL);
    size_t size = (size_t)kernel->species * PACK * sizeof(double);
    double *before = malloc(size), step = 0.0;
    assert_non_null(before);
    memcpy(before, work->y, size);
    memset(work->sum_y, 0, size);
    memset(work->sum_w, 0, (size_t)kernel->reactions * PACK * sizeof(double));
    Tolerance tolerance = {relative, absolute, 20000};
    SolverCounts counts = {0};
    int where;
    for (int part = 0; part < PACK_DAY_PARTS; part++)
        assert_int_equal(
            pack_part(work, stepper_light(spun.stepper), first, part, &tolerance, &step, &counts, &where), 0);
    assert_true(counts.steps > 60 && step > 0.0);
    return before;
}

/* ---- packs ---- */

static void test_load_and_store(void **state)
{
    (void)state;
    const Model *model = spun.model;
    int padded = model->grid.padded, n = model->mechanism->solved;
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, model, &fault), &fault);
    size_t bytes = field_size(spun.model) * sizeof(double);
    double *x = malloc(bytes),
           *lists = calloc((size_t)(MODEL_HELD_MOST + n + model->kernel->tallies), sizeof(double));
    assert_non_null(x);
    assert_non_null(lists);
    memcpy(x, spun.column->x, bytes);
    PackLedger ledger = {
        .exchanged = lists, .received = lists + MODEL_HELD_MOST, .washed = lists + MODEL_HELD_MOST + n};
    for (int first = 0; first < padded; first += PACK) {
        pack_load(work, model, first, x);
        for (int s = 0; s < n; s++)
            for (int l = 0; l < PACK; l++)
                assert_true(work->y[s * PACK + l] ==
                            x[FIELD(padded, s, first + l)] * model->air.number_density[first + l]);
        for (int s = n; s < model->kernel->species; s++)
            assert_true(work->y[s * PACK] == 0.0);
        for (int h = 0; h < work->held; h++)
            for (int l = 0; l < PACK; l++) {
                double is_free = work->held_free[h * PACK + l];
                assert_true(is_free == 0.0 || (is_free == 1.0 && work->held_value[h * PACK + l] == 0.0));
            }
        pack_store(work, model, first, x, &ledger);
        /* nothing happened, so nothing crossed a border and nothing changed but round-off */
        for (int h = 0; h < model->held; h++) {
            double cell = model->air.number_density[first] * model->grid.depth[first];
            assert_true(fabs(ledger.exchanged[h]) < 1e-14 * cell);
        }
        for (int s = 0; first == 0 && s < n; s++)
            assert_true(fabs(ledger.received[s]) <= 1e-15 * work->y[s * PACK] * model->grid.depth[0]);
        for (int t = 0; t < model->kernel->tallies; t++)
            assert_true(ledger.washed[t] == 0.0);
        for (int c = 0; c < model->kernel->counters; c++)
            assert_true(ledger.escaped[c] == 0.0);
    }
    for (size_t i = 0; i < field_size(spun.model); i++)
        assert_true(fabs(x[i] - spun.column->x[i]) <= 1e-15 * fabs(x[i]));

    /* held and ground values come back whatever the chemistry made of them, and the difference is counted */
    int h = model->held - 1, held = model->held_species[h], n2o = solved(&spun, "N2O"),
        o3 = solved(&spun, "O3");
    assert_true(h >= 0);
    pack_load(work, model, 0, x);
    work->y[held * PACK + 2] -= 1e6;
    work->y[n2o * PACK] -= 1e9;
    work->y[o3 * PACK + 3] = -5.0; /* below zero stays below zero */
    double kept_held = x[FIELD(padded, held, 2)], kept_n2o = x[FIELD(padded, n2o, 0)];
    pack_store(work, model, 0, x, &ledger);
    assert_true(x[FIELD(padded, held, 2)] == kept_held && x[FIELD(padded, n2o, 0)] == kept_n2o);
    check_near(ledger.exchanged[h], 1e6 * model->grid.depth[2], 1e-6);
    check_near(ledger.received[n2o], 1e9 * model->grid.depth[0], 1e-6);
    check_near(x[FIELD(padded, o3, 3)], -5.0 / model->air.number_density[3], 1e-12);
    free(lists);
    free(x);
    pack_free(work);
}

static double lane_atoms(const Model *model, const double *x, const char *symbol, int layer)
{
    int element = mechanism_element(model->mechanism, symbol);
    double sum = 0.0;
    for (int s = 0; s < model->mechanism->solved; s++)
        sum += mechanism_atoms(model->mechanism, s, element) * x[FIELD(model->grid.padded, s, layer)];
    return sum;
}

/* Round-off of the solver is put right; a defect that is no round-off stays for the ledger to show. */
static void test_round_off_is_put_back(void **state)
{
    (void)state;
    const Model *model = spun.model;
    int n = model->mechanism->solved, first = 2 * PACK, layer = first + 3;
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, model, &fault), &fault);
    double *x = malloc(field_size(spun.model) * sizeof(double));
    double *lists = calloc((size_t)(MODEL_HELD_MOST + n + model->kernel->tallies), sizeof(double));
    assert_non_null(x);
    assert_non_null(lists);
    PackLedger ledger = {
        .exchanged = lists, .received = lists + MODEL_HELD_MOST, .washed = lists + MODEL_HELD_MOST + n};
    int clo = solved(&spun, "ClO");
    static const double defect[] = {1e-12, -3e-11, 1e-8, -1e-6};
    for (size_t i = 0; i < sizeof defect / sizeof defect[0]; i++) {
        memcpy(x, spun.column->x, field_size(spun.model) * sizeof(double));
        double before = lane_atoms(model, x, "Cl", layer), hydrogen = lane_atoms(model, x, "H", layer);
        pack_load(work, model, first, x);
        work->y[clo * PACK + 3] += defect[i] * before * model->air.number_density[layer];
        pack_store(work, model, first, x, &ledger);
        double left = lane_atoms(model, x, "Cl", layer) / before - 1.0;
        if (fabs(defect[i]) <= PACK_ROUND_OFF)
            assert_true(fabs(left) < 1e-14);
        else
            check_near(left, defect[i], 1e-6);
        check_near(lane_atoms(model, x, "H", layer), hydrogen, 1e-14); /* nothing else is touched */
        check_near(x[FIELD(model->grid.padded, clo, layer)],
                   spun.column->x[FIELD(model->grid.padded, clo, layer)] + defect[i] * before, 1e-12);
    }
    free(lists);
    free(x);
    pack_free(work);
}

static void test_pack_rates(void **state)
{
    (void)state;
    const Model *model = spun.model;
    const Mechanism *mechanism = model->mechanism;
    const Light *light = stepper_light(spun.stepper);
    const double *k = stepper_coefficients(spun.stepper), *factor = stepper_day(spun.stepper)->factor;
    int padded = model->grid.padded, first = 2 * PACK;
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, model, &fault), &fault);
    for (int with = 0; with <= 1; with++) {
        pack_rates(work, model, first, k, light->mean, with ? factor : NULL);
        for (int r = 0; r < mechanism->reactions; r++)
            for (int l = 0; l < PACK; l++) {
                int lit = r >= mechanism->photolysis_first && r < mechanism->surface_first;
                double want = lit ? light->mean[FIELD(padded, r - mechanism->photolysis_first, first + l)]
                                  : k[FIELD(padded, r, first + l)];
                if (with)
                    want *= factor[FIELD(padded, r, first + l)];
                assert_true(work->k[r * PACK + l] == want);
            }
    }
    pack_free(work);
}

/* ---- the day ---- */

static void test_parts_of_the_day(void **state)
{
    (void)state;
    for (int place = 0; place < 4; place++) { /* globe, mid-latitude, polar day, polar night */
        Settings settings = coarse();
        settings.sun = place ? SUN_LATITUDE : SUN_GLOBAL;
        settings.latitude_deg = place == 1 ? 40.0 : 85.0;
        settings.day_of_year = place == 3 ? 355.0 : 172.0;
        Light *light;
        Fault fault = {0};
        Model changed = *spun.model; /* borrows everything but the settings */
        changed.settings = settings;
        ok(light_make(&light, &changed, 1, &fault), &fault);
        double sum = 0.0, lit = 0.0;
        for (int part = 0; part < PACK_DAY_PARTS; part++) {
            double length = pack_part_length(light, part);
            assert_true(length >= 0.0 && length == pack_part_length(light, PACK_DAY_PARTS - 1 - part));
            sum += length;
            if (pack_part_lit(part))
                lit += length;
        }
        check_near(sum, DAY_SECONDS, 1e-12);
        assert_true(fabs(lit - pack_lit_time(light)) < 1e-6);
        static const double low[] = {0.5, 0.6, 1.0, 0.0}, high[] = {0.5, 0.8, 1.0, 0.0};
        assert_true(lit >= (low[place] - 1e-9) * DAY_SECONDS && lit <= (high[place] + 1e-9) * DAY_SECONDS);
        light_free(light);
    }
}

/* What changed is the sum of what happened: the integrals of the rates give the change of every species, free
 * or held. */
static void test_sums_explain_the_change(void **state)
{
    (void)state;
    const Kernel *kernel = spun.model->kernel;
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, spun.model, &fault), &fault);
    for (int first = 0; first < spun.model->grid.padded; first += PACK) {
        double *before = carried_day(work, first, 1e-3, 1e2);
        for (int s = 0; s < spun.model->mechanism->solved; s++)
            for (int l = 0; l < PACK; l++) {
                double net = 0.0, gross = 0.0;
                for (int e = kernel->source_first[s]; e < kernel->source_first[s + 1]; e++) {
                    double part =
                        kernel->source_weight[e] * work->sum_w[kernel->source_reaction[e] * PACK + l];
                    net += part;
                    gross += fabs(part);
                }
                double change = work->y[s * PACK + l] - before[s * PACK + l];
                double scale = gross + fabs(before[s * PACK + l]);
                if (fabs(change - net) > 1e-10 * scale)
                    fail_msg("%s in layer %d: changed by %g, the rates by %g of %g",
                             mechanism_name(spun.model->mechanism, s), first + l, change, net, gross);
            }
        free(before);
    }
    pack_free(work);
}

/* The day's means at the tolerance in use against those at a thousandth of it, for gases with the steepest
 * course. */
static void test_means_at_tight_tolerance(void **state)
{
    (void)state;
    static const char *const gases[] = {"O3",  "O",    "OH", "HO2", "NO",     "NO2",
                                        "NO3", "N2O5", "Cl", "ClO", "ClONO2", "BrO"};
    PackWork *loose, *tight;
    Fault fault = {0};
    ok(pack_make(&loose, spun.model, &fault), &fault);
    ok(pack_make(&tight, spun.model, &fault), &fault);
    double worst = 0.0;
    for (int first = PACK; first < spun.model->grid.padded; first += PACK) {
        free(carried_day(loose, first, 1e-3, 1e2));
        free(carried_day(tight, first, 1e-6, 1e-1));
        for (size_t g = 0; g < sizeof gases / sizeof gases[0]; g++)
            for (int l = 0; l < PACK; l++) {
                size_t at = (size_t)solved(&spun, gases[g]) * PACK + (size_t)l;
                double mean = tight->sum_y[at] / DAY_SECONDS;
                if (mean < 1e5)
                    continue; /* a thousand times the absolute tolerance */
                worst = fmax(worst, fabs(loose->sum_y[at] / tight->sum_y[at] - 1.0));
            }
    }
    print_message("means of the day, tolerance 1e-3 against 1e-6: %.1e apart\n", worst);
    assert_true(worst < 5e-3);
    pack_free(loose);
    pack_free(tight);
}

/* A gas that hardly changes over the day sees the mean of the light: events = mean rate x density x day. */
static void test_day_sees_the_mean_light(void **state)
{
    (void)state;
    static const char *const photolyses[] = {"CFC-11 + hv", "CFC-12 + hv", "N2O + hv", "CH3CCl3 + hv"};
    const Light *light = stepper_light(spun.stepper);
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, spun.model, &fault), &fault);
    int first = PACK, padded = spun.model->grid.padded; /* 16 to 32 km */
    free(carried_day(work, first, 1e-3, 1e2));
    for (size_t i = 0; i < sizeof photolyses / sizeof photolyses[0]; i++) {
        int r = reaction(&spun, photolyses[i]), s = spun.model->mechanism->reaction[r].reactant[0];
        for (int l = 0; l < PACK; l++) {
            double rate = light->mean[FIELD(padded, r - spun.model->mechanism->photolysis_first, first + l)];
            check_near(work->sum_w[r * PACK + l], rate * work->sum_y[s * PACK + l], 1e-3);
        }
    }
    pack_free(work);
}

static void test_night_only(void **state)
{
    (void)state;
    Settings settings = coarse();
    settings.day = DAY_EXPLICIT;
    settings.sun = SUN_LATITUDE;
    settings.latitude_deg = 88.0;
    settings.day_of_year = 355.0;
    Run run = start(&settings, 1);
    copy_state(&run, &spun);
    advance(&run, 1.0, 5, 1);
    int padded = run.model->grid.padded, o = solved(&run, "O"), no3 = solved(&run, "NO3"),
        o3 = solved(&run, "O3");
    const double *mean = stepper_mean(run.stepper);
    for (int l = 8; l < 20; l++) { /* 16 to 40 km: no light, no atomic oxygen; ozone stays; NO3 is there */
        assert_true(fabs(mean[FIELD(padded, o, l)]) * run.model->air.number_density[l] < 1.0);
        check_near(mean[FIELD(padded, o3, l)], spun.column->x[FIELD(padded, o3, l)], 0.05);
    }
    assert_true(mean[FIELD(padded, no3, 17)] > spun.column->x[FIELD(padded, no3, 17)]);
    for (int j = 0; j < stepper_light(run.stepper)->reactions; j++)
        for (int l = 0; l < padded; l++)
            assert_true(stepper_light(run.stepper)->mean[FIELD(padded, j, l)] == 0.0);
    end(&run);
}

/* ---- the factors ---- */

static double factor_at(const char *equation, double km)
{
    int layer = (int)(km / 2.0);
    return stepper_day(spun.stepper)
        ->factor[FIELD(spun.model->grid.padded, reaction(&spun, equation), layer)];
}

static void test_factors_make_sense(void **state)
{
    (void)state;
    const Day *day = stepper_day(spun.stepper);
    const Mechanism *mechanism = spun.model->mechanism;
    int padded = spun.model->grid.padded;
    for (size_t i = 0; i < (size_t)mechanism->reactions * (size_t)padded; i++)
        assert_true(isfinite(day->factor[i]) && day->factor[i] > 0.0);
    /* one reactant without a diurnal course: mean of the product = product of the means */
    for (double km = 21.0; km < 40.0; km += 4.0) {
        assert_true(fabs(factor_at("OH + CH4", km) - 1.0) < 2e-3);
        assert_true(fabs(factor_at("N2O + hv", km) - 1.0) < 2e-3);
        assert_true(fabs(factor_at("O(1D) + N2O", km) - 1.0) < 2e-3);
    }
    /* Both only by day, of which the global sun has 12 h: at least the 24 h over 12 h that a constant day
     * would give. */
    assert_true(factor_at("OH + HO2", 31.0) > 2.0 && factor_at("OH + HO2", 31.0) < 6.0);
    /* ClO lasts the night up there, O does not */
    assert_true(factor_at("ClO + O ", 39.0) > 1.05 && factor_at("ClO + O ", 39.0) < 2.0);
    /* NO3 by night, light by day (Turco and Whitten 1978): photolysis far below the product of the means */
    assert_true(factor_at("NO3 + hv", 31.0) < 0.2);
    assert_true(factor_at("NO2 + hv", 31.0) < 0.9);
    /* NO only by day, NO3 only by night */
    assert_true(factor_at("NO + NO3", 31.0) < 0.2);
}

/* A settled state is the mean of its own day: explicit days from its midnight have the run's means. */
static void test_factors_are_consistent(void **state)
{
    (void)state;
    static const char *const gases[] = {"O3", "NO2", "ClO", "HNO3", "OH", "ClONO2"};
    Settings settings = coarse();
    settings.day = DAY_EXPLICIT;
    settings.refresh_column = 1e-4; /* the first light knows the ozone of midnight only */
    Run run = start(&settings, 1);
    day_midnight(stepper_day(spun.stepper), spun.column->x, run.column->x);
    advance(&run, 1.0, 3, 1);
    int padded = run.model->grid.padded;
    /* higher up, HNO3 lives for about a day on what diffusion brings: there the step of the run, not its
     * factors, decides */
    for (size_t g = 0; g < sizeof gases / sizeof gases[0]; g++) {
        double worst = 0.0, where = 0.0;
        int s = solved(&run, gases[g]);
        for (int l = 8; l < (g ? 18 : 30); l++) { /* 16 to 36 km, ozone to 60 km */
            double apart =
                stepper_mean(run.stepper)[FIELD(padded, s, l)] / spun.column->x[FIELD(padded, s, l)] - 1.0;
            if (fabs(apart) <= worst)
                continue;
            worst = fabs(apart);
            where = 1e-5 * run.model->grid.middle[l];
        }
        print_message("   %s: the day's mean %.1f %% from the run's at worst, at %.0f km\n", gases[g],
                      100.0 * worst, where);
        assert_true(worst < (g ? 0.05 : 0.02));
    }
    end(&run);
}

/* What day_take makes of a made-up day: one reaction's rate twice the product of the means, one species gone
 * at midnight. */
static void test_take_by_hand(void **state)
{
    (void)state;
    const Model *model = spun.model;
    Day *day;
    Fault fault = {0};
    ok(day_make(&day, model, &fault), &fault);
    int padded = model->grid.padded, r = reaction(&spun, "ClO + O "), layer = 15;
    int clo = solved(&spun, "ClO"), o = solved(&spun, "O");
    const double *k = stepper_coefficients(spun.stepper);
    double *end_x = calloc(field_size(spun.model), sizeof(double));
    assert_non_null(end_x);
    day_clear(day);
    day->sum_y[FIELD(padded, clo, layer)] = 1e7 * DAY_SECONDS;
    day->sum_y[FIELD(padded, o, layer)] = 1e6 * DAY_SECONDS;
    day->sum_lit[FIELD(padded, o, layer)] = 1e6 * DAY_SECONDS; /* all of it by day */
    day->sum_w[FIELD(padded, r, layer)] = 2.0 * k[FIELD(padded, r, layer)] * 1e13 * DAY_SECONDS;
    end_x[FIELD(padded, clo, layer)] = 3e6 / model->air.number_density[layer];
    double change = day_take(day, stepper_light(spun.stepper), end_x, 0.5 * DAY_SECONDS, k);
    check_near(day->factor[FIELD(padded, r, layer)], 2.0, 1e-12);
    check_near(change, 0.5, 1e-12); /* from 1 to 2, of the larger */
    check_near(day->ratio[FIELD(padded, clo, layer)], 0.3, 1e-12);
    assert_true(day->ratio[FIELD(padded, o, layer)] == 0.0);
    check_near(day->lit[FIELD(padded, o, layer)], 2.0, 1e-12);
    assert_true(day->factor[FIELD(padded, r, layer + 1)] == 1.0); /* nothing there: 1 */
    assert_true(day->ratio[FIELD(padded, clo, layer + 1)] == 1.0);
    change = day_take(day, stepper_light(spun.stepper), end_x, 0.5 * DAY_SECONDS, k);
    assert_true(change == 0.0);
    assert_true(day_stale(day, spun.column->x));
    day_settle(day, spun.column->x);
    assert_false(day_stale(day, spun.column->x));
    free(end_x);
    day_free(day);
}

static void test_first_time_and_stale(void **state)
{
    (void)state;
    Settings settings = coarse();
    Run run = start(&settings, 1);
    const Day *day = stepper_day(run.stepper);
    int padded = run.model->grid.padded;
    assert_true(day_stale(day, run.column->x)); /* not made yet */
    for (size_t i = 0; i < (size_t)run.model->mechanism->reactions * (size_t)padded; i++)
        assert_true(day->factor[i] == 1.0);
    advance(&run, 1.0, 1, 1);
    assert_int_equal(run.column->factor_refreshes, 1);
    assert_int_equal(run.column->days, DAY_COLD); /* the first time runs freely */
    end(&run);

    /* moves of what has a diurnal course count, from refresh_state on; others do not */
    day = stepper_day(spun.stepper);
    double *x = malloc(field_size(spun.model) * sizeof(double));
    assert_non_null(x);
    memcpy(x, day->reference, field_size(spun.model) * sizeof(double));
    assert_false(day_stale(day, x));
    size_t no2 = FIELD(spun.model->grid.padded, solved(&spun, "NO2"), 15),
           hcl = FIELD(spun.model->grid.padded, solved(&spun, "HCl"), 15);
    double threshold = spun.model->settings.refresh_state, kept = x[no2];
    assert_true(fabs(day->ratio[no2] - 1.0) > 0.05 && fabs(day->ratio[hcl] - 1.0) < 0.05);
    x[no2] = kept * (1.0 + 0.98 * threshold);
    assert_false(day_stale(day, x));
    x[no2] = kept * (1.0 + 1.02 * threshold);
    assert_true(day_stale(day, x));
    x[no2] = kept * (1.0 - 1.02 * threshold);
    assert_true(day_stale(day, x));
    x[no2] = kept;
    x[hcl] *= 2.0;
    assert_false(day_stale(day, x));
    free(x);
}

static void test_fault_names_place(void **state)
{
    (void)state;
    Fault fault = {0};
    int where = 3 * spun.model->kernel->species + solved(&spun, "ClO");
    assert_int_equal(pack_fault(spun.model, PACK, SOLVER_TOO_MANY_STEPS, where, 1987.25, &fault),
                     FAULT_NUMERICS);
    assert_non_null(strstr(fault.text, "1987.25"));
    assert_non_null(strstr(fault.text, "23.00 km")); /* layer 8 + 3 of 2 km */
    assert_non_null(strstr(fault.text, "ClO"));
    assert_non_null(strstr(fault.text, "relative_tolerance"));

    PackWork *work;
    fault = (Fault){0};
    ok(pack_make(&work, spun.model, &fault), &fault);
    pack_load(work, spun.model, PACK, spun.column->x);
    pack_rates(work, spun.model, PACK, stepper_coefficients(spun.stepper), stepper_light(spun.stepper)->mean,
               NULL);
    Tolerance hopeless = {1e-6, 1e-2, 2};
    SolverCounts counts = {0};
    double step = 0.0;
    int at_noon = PACK_DAY_PARTS / 2 - 1;
    assert_int_equal(
        pack_part(work, stepper_light(spun.stepper), PACK, at_noon, &hopeless, &step, &counts, &where),
        SOLVER_TOO_MANY_STEPS);
    assert_in_range(where, 0, PACK * spun.model->kernel->species - 1);
    assert_int_equal(pack_fault(spun.model, PACK, SOLVER_TOO_MANY_STEPS, where, 2003.5, &fault),
                     FAULT_NUMERICS);
    assert_non_null(strstr(fault.text, "too many steps"));
    pack_free(work);
}

/* ---- explicit days against factors ---- */

static double worst_ozone(const Run *means, const Run *days, double from_km, double to_km)
{
    double worst = 0.0;
    int padded = means->model->grid.padded, o3 = solved(means, "O3");
    for (int l = 0; l < means->model->grid.layers; l++) {
        double km = 1e-5 * means->model->grid.middle[l];
        double apart =
            stepper_mean(days->stepper)[FIELD(padded, o3, l)] / means->column->x[FIELD(padded, o3, l)] - 1.0;
        if (fabs(apart) > 0.02)
            print_message("   %4.1f km: explicit day %+.1f %% from factors\n", km, 100.0 * apart);
        if (km >= from_km && km <= to_km)
            worst = fmax(worst, fabs(apart));
    }
    return worst;
}

/* With next to no mixing the two differ by nothing but the factors themselves. The lowest layer gives ozone
 * to the ground, and at the top a day is too short for balance. */
static void test_explicit_agrees_without_mixing(void **state)
{
    char path[300];
    write_file(state, "still.csv", "# source: test\naltitude_km,eddy_cm2_s-1\n0,1\n90,1\n", path);
    Settings settings = coarse();
    snprintf(settings.eddy_file, sizeof settings.eddy_file, "%s", path);
    settings.outer_step_days = 1.0;
    Run means = start(&settings, 1);
    settings.day = DAY_EXPLICIT;
    Run days = start(&settings, 1);
    copy_state(&means, &spun);
    copy_state(&days, &spun);
    advance(&means, 1.0, 60, 1);
    advance(&days, 1.0, 60, 1);
    double worst = worst_ozone(&means, &days, 2.0, 74.0);
    print_message("explicit day and factors without mixing: ozone %.2f %% apart\n", 100.0 * worst);
    assert_true(worst < 0.005);
    end(&means);
    end(&days);
}

/* A year at steady boundary values from one settled state: 1 % in ozone at every layer, 0.3 DU in the column.
 */
static void test_explicit_year_agrees(void **state)
{
    (void)state;
    Settings settings = coarse();
    Run means = start(&settings, 1);
    copy_state(&means, &spun);
    advance(&means, settings.outer_step_days, (int)lround(7.0 * 365.25 / settings.outer_step_days), 1);
    settings.day = DAY_EXPLICIT;
    Run days = start(&settings, 1);
    copy_state(&days, &means);
    long steps = lround(365.0 / settings.outer_step_days);
    advance(&means, 365.0 / (double)steps, (int)steps, 1);
    advance(&days, 1.0, 365, 1);
    double worst = worst_ozone(&means, &days, 0.0, 90.0);
    double du = column_ozone_du(means.model, means.column->x);
    double du_days = column_ozone_du(days.model, stepper_mean(days.stepper));
    print_message("a year of explicit days and of factors: %.2f and %.2f DU, worst layer %.1f %%\n", du_days,
                  du, 100.0 * worst);
    assert_true(fabs(du_days - du) < 0.3);
    assert_true(worst < 0.01);
    end(&means);
    end(&days);
}

int main(void)
{
    omp_set_num_threads(1); /* one core serves as well, and waiting threads would take the others */
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_load_and_store),
        cmocka_unit_test(test_round_off_is_put_back),
        cmocka_unit_test(test_pack_rates),
        cmocka_unit_test(test_sums_explain_the_change),
        cmocka_unit_test(test_means_at_tight_tolerance),
        cmocka_unit_test(test_day_sees_the_mean_light),
        cmocka_unit_test(test_night_only),
        cmocka_unit_test(test_factors_make_sense),
        cmocka_unit_test(test_factors_are_consistent),
        cmocka_unit_test(test_take_by_hand),
        cmocka_unit_test(test_parts_of_the_day),
        cmocka_unit_test(test_first_time_and_stale),
        cmocka_unit_test(test_fault_names_place),
        WITH_FOLDER(test_explicit_agrees_without_mixing),
        cmocka_unit_test(test_explicit_year_agrees),
    };
    return cmocka_run_group_tests_name("day", tests, spin, drop);
}
