/* Tests of the mole fractions by time of day (model/moments): the built-in case on layers of 2 km, three
 * years at the values of 2000, and explicit days that start from its midnight. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include "../model/archive.h"
#include "../model/pack.h"
#include "../model/projection.h"

enum { DAYS = 8 };

static Settings coarse(void)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = 2.0;
    settings.first_year = 2000; /* chlorine near its peak */
    settings.last_year = 2000;
    return settings;
}

/* A run of daily means with factors, and DAYS explicit days from its midnight; what both say of the moments.
 */
static Run means, days;
static double *of_means, *of_days; /* [MOMENTS][solved][padded] */

static int spin(void **state)
{
    (void)state;
    Settings settings = coarse();
    means = start(&settings, 1);
    advance(&means, settings.outer_step_days, (int)lround(3.0 * 365.25 / settings.outer_step_days), 1);
    size_t size = field_size(means.model);
    of_means = malloc(MOMENTS * size * sizeof(double));
    of_days = malloc(MOMENTS * size * sizeof(double));
    if (!of_means || !of_days)
        return -1;
    stepper_moments(means.stepper, stepper_mean(means.stepper), of_means);
    settings.day = DAY_EXPLICIT;
    settings.refresh_column = 1e-4; /* the first light knows the ozone of midnight only */
    settings.relative_tolerance = 1e-3;
    days = start(&settings, 1);
    memcpy(days.column->x, of_means + MOMENT_MIDNIGHT * size, size * sizeof(double));
    advance(&days, 1.0, DAYS, 1);
    stepper_moments(days.stepper, stepper_mean(days.stepper), of_days);
    return 0;
}

static int drop(void **state)
{
    (void)state;
    free(of_means);
    free(of_days);
    end(&means);
    end(&days);
    return 0;
}

static int solved(const Run *run, const char *name)
{
    int s = mechanism_solved(run->model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

static double at(const double *moments, int moment, const char *name, int layer)
{
    return moments[(size_t)moment * field_size(days.model) +
                   FIELD(days.model->grid.padded, solved(&days, name), layer)];
}

static double mean_of_day(const char *name, int layer)
{
    return stepper_mean(days.stepper)[FIELD(days.model->grid.padded, solved(&days, name), layer)];
}

static int layer_at(double km)
{
    return (int)(km / 2.0);
}

/* ---- which moments, which gases ---- */

static void test_hours(void **state)
{
    (void)state;
    Settings settings = coarse();
    Fault fault = {0};
    double hours[MOMENTS];
    ok(moments_hours(&settings, hours, &fault), &fault);
    for (int m = 0; m < MOMENTS; m++)
        assert_true(hours[m] == 6.0 * m);
    assert_string_equal(moment_name(&settings, MOMENT_SUNRISE), "sunrise");
    /* A sun of the equator on the equinox crosses 11.5 degrees (cosine -0.2) 11.537 degrees of hour angle
     * below the horizon: 6 h - 11.537 / 15 h, but for a declination below 0.5 degrees. */
    settings.sun = SUN_LATITUDE;
    settings.latitude_deg = 0.0;
    settings.day_of_year = 80.0;
    ok(moments_hours(&settings, hours, &fault), &fault);
    assert_true(fabs(hours[MOMENT_SUNRISE] - (6.0 - 11.537 / 15.0)) < 0.001);
    assert_true(fabs(hours[MOMENT_SUNRISE] + hours[MOMENT_SUNSET] - 24.0) < 1e-9);
    assert_string_equal(moment_name(&settings, MOMENT_SUNSET), "dusk");
    settings.latitude_deg = 80.0;
    settings.day_of_year = 172.0;
    assert_int_equal(moments_hours(&settings, hours, &fault), FAULT_INPUT);
    check_fault(&fault, "output.moments", "light for 24 h", "latitude 80", NULL);
    fault = (Fault){0};
    settings.latitude_deg = -80.0;
    assert_int_equal(moments_hours(&settings, hours, &fault), FAULT_INPUT);
    check_fault(&fault, "dark for 24 h", NULL);
    /* the model refuses the case, not only the file */
    Model *model;
    fault = (Fault){0};
    settings.moments = MOMENTS_ALL;
    assert_int_equal(model_make(&model, &settings, &fault), FAULT_INPUT);
    assert_null(model);
}

static void test_which_gases(void **state)
{
    (void)state;
    static const char *const yes[] = {"NO", "ClO", "O3", "HNO3", "OH", "O(1D)", "HCl"};
    static const char *const no[] = {"N2O", "CH4", "CFC-11", "CO", "H2"};
    for (size_t i = 0; i < sizeof yes / sizeof yes[0]; i++)
        assert_true(moments_has(days.model, solved(&days, yes[i])));
    for (size_t i = 0; i < sizeof no / sizeof no[0]; i++)
        assert_false(moments_has(days.model, solved(&days, no[i])));
    /* Those left out have no course to speak of: up to 60 km a day moves them by less than a hundredth of
     * their value at the ground. (CO above 50 km and CHBr3 near the ground come to half of that.) */
    for (int s = 0; s < days.model->mechanism->solved; s++) {
        if (moments_has(days.model, s))
            continue;
        const char *name = mechanism_name(days.model->mechanism, s);
        double ground = mean_of_day(name, 0);
        for (int m = 0; m < MOMENTS; m++)
            for (int l = 0; l < layer_at(60.0); l++)
                assert_true(fabs(at(of_days, m, name, l) - mean_of_day(name, l)) < 1e-2 * ground);
    }
}

/* Only the borders of parts that are moments are kept. */
static void test_see(void **state)
{
    (void)state;
    Moments *moments;
    Fault fault = {0};
    size_t size = field_size(days.model);
    double *x = malloc(size * sizeof(double));
    assert_non_null(x);
    ok(moments_make(&moments, days.model, &fault), &fault);
    for (int part = 0; part <= PACK_DAY_PARTS; part++) {
        for (size_t i = 0; i < size; i++)
            x[i] = part + 1e-3 * (double)i;
        moments_see(moments, part, x);
    }
    static const int border[MOMENTS] = {16, 4, 8, 12};
    for (int m = 0; m < MOMENTS; m++)
        for (size_t i = 0; i < size; i++)
            assert_true(moments->state[(size_t)m * size + i] == border[m] + 1e-3 * (double)i);
    moments_free(moments);
    moments_free(NULL);
    free(x);
}

/* ---- the course ---- */

static void check_course(const double *moments, const Run *run)
{
    int padded = run->model->grid.padded;
    for (int l = layer_at(16.0); l < layer_at(60.0); l++) {
        double o1d = stepper_mean(run->stepper)[FIELD(padded, solved(run, "O(1D)"), l)];
        /* half the day is dark and light is strongest at noon: more than twice the mean */
        assert_true(at(moments, MOMENT_NOON, "O(1D)", l) > 2.0 * o1d);
        assert_true(fabs(at(moments, MOMENT_MIDNIGHT, "O(1D)", l)) < 1e-6 * o1d);
    }
    /* At night NO goes by NO + O3 within 36 min at 50 km (JPL 19-5: 1.2e-14 cm3 s-1 at 271 K; 4e10 cm-3 of
     * O3) and faster below: 6 h leave exp(-10), less than a thousandth. */
    for (int l = layer_at(26.0); l < layer_at(46.0); l++) {
        double no = stepper_mean(run->stepper)[FIELD(padded, solved(run, "NO"), l)];
        assert_true(fabs(at(moments, MOMENT_MIDNIGHT, "NO", l)) < 1e-3 * no);
        assert_true(fabs(at(moments, MOMENT_SUNRISE, "NO", l)) < 1e-3 * no);
        assert_true(at(moments, MOMENT_NOON, "NO", l) > 1.5 * no);
    }
    /* N2O5 builds up through the night and goes by day */
    for (int l = layer_at(20.0); l < layer_at(40.0); l++) {
        assert_true(at(moments, MOMENT_SUNRISE, "N2O5", l) > at(moments, MOMENT_MIDNIGHT, "N2O5", l));
        assert_true(at(moments, MOMENT_MIDNIGHT, "N2O5", l) > at(moments, MOMENT_SUNSET, "N2O5", l));
    }
}

static void test_course(void **state)
{
    (void)state;
    check_course(of_days, &days);
    check_course(of_means, &means);
}

/* Reactions keep atoms, and transport needs months: N and Cl outside the source gases are the same at every
 * moment of a day to a thousandth. NOy has its sources and sinks in years. */
static void test_atoms_kept(void **state)
{
    (void)state;
    static const char *const symbol[] = {"N", "Cl"};
    const Mechanism *mechanism = days.model->mechanism;
    for (int e = 0; e < 2; e++) {
        int element = mechanism_element(mechanism, symbol[e]);
        double worst = 0.0;
        for (int l = layer_at(20.0); l < layer_at(50.0); l++) {
            double sum[MOMENTS] = {0}, mean = 0.0;
            for (int s = 0; s < mechanism->solved; s++) {
                if (!moments_has(days.model, s))
                    continue;
                const char *name = mechanism_name(mechanism, s);
                int atoms = mechanism_atoms(mechanism, s, element);
                mean += atoms * mean_of_day(name, l);
                for (int m = 0; m < MOMENTS; m++)
                    sum[m] += atoms * at(of_days, m, name, l);
            }
            for (int m = 0; m < MOMENTS; m++)
                worst = fmax(worst, fabs(sum[m] / mean - 1.0));
        }
        print_message("           %s by time of day within %.1e of its daily mean\n", symbol[e], worst);
        assert_true(worst < 1e-3);
    }
}

/* Daily mean times ratio against the values of the explicit days. 3 %: factors are kept until a species has
 * moved that much (refresh_state). Compared where a value is more than a hundredth of the largest of the day;
 * below that, the tolerance of the chemistry speaks. From 18 to 36 km, as the means are compared in
 * test_day.c: higher up, reservoirs live hours on what diffusion brings, and there the step of the run
 * decides their daily means. */
static void test_ratios_against_explicit(void **state)
{
    (void)state;
    static const char *const gases[] = {"O3",  "NO",     "NO2", "NO3", "N2O5", "ClO",
                                        "HCl", "ClONO2", "BrO", "OH",  "HO2"};
    for (size_t g = 0; g < sizeof gases / sizeof gases[0]; g++) {
        double worst = 0.0, km = 0.0;
        int when = 0;
        for (int l = layer_at(18.0); l < layer_at(36.0); l++) {
            double most = 0.0;
            for (int m = 0; m < MOMENTS; m++)
                most = fmax(most, at(of_days, m, gases[g], l));
            for (int m = 0; m < MOMENTS; m++) {
                double want = at(of_days, m, gases[g], l),
                       apart = fabs(at(of_means, m, gases[g], l) / want - 1.0);
                if (want < 0.01 * most || apart <= worst)
                    continue;
                worst = apart;
                km = 1e-5 * days.model->grid.middle[l];
                when = m;
            }
        }
        print_message("           %s: %.1f %% apart at worst, %s at %.0f km\n", gases[g], 100.0 * worst,
                      moment_name(&days.model->settings, when), km);
        assert_true(worst < 0.03);
    }
}

/* ---- against the photostationary state ---- */

static double noon_rate(const char *id, int layer)
{
    const Mechanism *mechanism = days.model->mechanism;
    const Light *light = stepper_light(days.stepper);
    for (int r = mechanism->photolysis_first; r < mechanism->surface_first; r++)
        if (!strcmp(mechanism->reaction[r].id, id)) {
            int row = (SUN_KNOTS - 1) * light->reactions + r - mechanism->photolysis_first;
            return light->knot[FIELD(days.model->grid.padded, row, layer)];
        }
    fail_msg("no reaction %s", id);
    return 0.0;
}

/* NO and NO2 turn into each other within two minutes at noon, far faster than either is made or lost, so that
 *     [NO] / [NO2] = (J + k1 [O]) / (k2 [O3] + k3 [ClO] + k4 [HO2] + k5 [BrO] + k6 [M] [O])
 * (Leighton 1961, with the other radicals). Coefficients: JPL 19-5, typed here from memory, apart from the
 * mechanism; the last at its limit of low pressure, since it matters above 35 km only. 1 %: the slower
 * reactions of N2O5 and NO3 (0.2 %), the tolerance of the days (1e-3 per step), and the diffusion of O and
 * NO2 above 35 km. */
static void test_photostationary(void **state)
{
    (void)state;
    double worst = 0.0;
    for (int l = layer_at(20.0); l < layer_at(44.0); l++) {
        const Conditions *now = stepper_conditions(days.stepper);
        double t = now->temperature[l], air = now->air[l];
        const double *x = of_days;
        double gain = noon_rate("J-NO2", l) + 5.1e-12 * exp(210.0 / t) * air * at(x, MOMENT_NOON, "O", l);
        double loss = air * (3.0e-12 * exp(-1500.0 / t) * at(x, MOMENT_NOON, "O3", l) +
                             6.4e-12 * exp(290.0 / t) * at(x, MOMENT_NOON, "ClO", l) +
                             3.44e-12 * exp(260.0 / t) * at(x, MOMENT_NOON, "HO2", l) +
                             8.8e-12 * exp(260.0 / t) * at(x, MOMENT_NOON, "BrO", l) +
                             9.1e-32 * pow(t / 298.0, -1.5) * air * at(x, MOMENT_NOON, "O", l));
        double ratio = at(x, MOMENT_NOON, "NO", l) / at(x, MOMENT_NOON, "NO2", l);
        worst = fmax(worst, fabs(ratio / (gain / loss) - 1.0));
    }
    print_message("           NO/NO2 at noon within %.2f %% of the photostationary state\n", 100.0 * worst);
    assert_true(worst < 0.01);
}

/* ---- in a projection ---- */

typedef struct {
    const Model *model;
    double *moments; /* of the last record; owned */
    double *x;
    int records;
} Kept;

static int keep(void *context, const Record *record, Fault *fault)
{
    Kept *kept = context;
    (void)fault;
    assert_non_null(record->moments);
    memcpy(kept->moments, record->moments, MOMENTS * field_size(kept->model) * sizeof(double));
    memcpy(kept->x, record->x, field_size(kept->model) * sizeof(double));
    kept->records++;
    return 0;
}

static Kept project(const Settings *settings, int threads)
{
    Run run = start(settings, threads);
    Kept kept = {.model = run.model};
    kept.moments = malloc(MOMENTS * field_size(run.model) * sizeof(double));
    kept.x = malloc(field_size(run.model) * sizeof(double));
    assert_non_null(kept.moments);
    assert_non_null(kept.x);
    Watcher watcher = {.record = keep, .context = &kept};
    Fault fault = {0};
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    kept.model = NULL;
    end(&run);
    return kept;
}

/* A record's moments are means over its interval, and the same to the last bit for any number of threads. */
static void test_projection(void **state)
{
    (void)state;
    Settings settings = coarse();
    settings.spacing_km = 4.0;
    settings.spinup_years = 0.5;
    settings.outputs_per_year = 2;
    settings.moments = MOMENTS_ALL;
    Run shape = start(&settings, 1);
    size_t size = field_size(shape.model);
    int n2o = solved(&shape, "N2O"), no = solved(&shape, "NO"), padded = shape.model->grid.padded;
    end(&shape);
    Kept one = project(&settings, 1), two = project(&settings, 2);
    assert_int_equal(one.records, 2);
    assert_memory_equal(one.moments, two.moments, MOMENTS * size * sizeof(double));
    assert_memory_equal(one.x, two.x, size * sizeof(double));
    for (int m = 0; m < MOMENTS; m++)
        check_near(one.moments[(size_t)m * size + FIELD(padded, n2o, 5)], one.x[FIELD(padded, n2o, 5)], 1e-3);
    assert_true(one.moments[MOMENT_NOON * size + FIELD(padded, no, 8)] > 1.5 * one.x[FIELD(padded, no, 8)]);
    free(one.moments);
    free(one.x);
    free(two.moments);
    free(two.x);
}

/* A case that asks for moments gets no record without them, and a value that is no number is named. */
static void test_archive_refuses(void **state)
{
    Settings settings = coarse();
    settings.moments = MOMENTS_ALL;
    Run run = start(&settings, 1);
    Archive *archive;
    Fault fault = {0};
    char path[300];
    snprintf(path, sizeof path, "%s/moments.nc", (char *)*state);
    ok(archive_create(&archive, run.model, path, 0, "test", &fault), &fault);
    Record record = {.time = 2000.5,
                     .time_start = 2000.0,
                     .time_end = 2001.0,
                     .x = means.column->x,
                     .ozone_column = 300.0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    assert_non_null(strstr(fault.text, "time of day"));
    size_t bad = MOMENT_NOON * field_size(run.model) + FIELD(run.model->grid.padded, solved(&run, "ClO"), 10);
    double *moments = malloc(MOMENTS * field_size(run.model) * sizeof(double));
    assert_non_null(moments);
    memcpy(moments, of_means, MOMENTS * field_size(run.model) * sizeof(double));
    moments[bad] = NAN;
    record.moments = moments;
    fault = (Fault){0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    assert_non_null(strstr(fault.text, "ClO at noon"));
    fault = (Fault){0};
    moments[bad] = 1e-10;
    ok(archive_append(archive, &record, &fault), &fault);
    ok(archive_close(archive, run.column, &fault), &fault);
    free(moments);
    end(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_hours),
        cmocka_unit_test(test_which_gases),
        cmocka_unit_test(test_see),
        cmocka_unit_test(test_course),
        cmocka_unit_test(test_atoms_kept),
        cmocka_unit_test(test_ratios_against_explicit),
        cmocka_unit_test(test_photostationary),
        cmocka_unit_test(test_projection),
        WITH_FOLDER(test_archive_refuses),
    };
    return cmocka_run_group_tests(tests, spin, drop);
}
