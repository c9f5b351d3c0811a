/* Tests of emissions (model/emission, stepper_mix): what a schedule says is what the column gets, by mass,
 * year, height and element; nothing of it is lost; a gas goes from its abundance to its emissions without a
 * jump; and what cannot be is refused. 2 km layers. */
#define _XOPEN_SOURCE 700
#include "emitting.h"

#include "../model/budget.h"
#include "../model/emission.h"
#include "../model/moments.h"
#include "../model/projection.h"
#include "../model/stepper.h"

/* ---- a mass is a mass ---- */

/* By hand: 1 kt of CFC-11, 1e9 g, is 1e9 / 137.368 mol = 4.38402e30 molecules over the 5.10064e18 cm2 of the
 * Earth (atomic weights C 12.011, Cl 35.45, F 18.998). */
static void test_by_hand(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    Run run = start(&settings, 1);
    int s = solved_of(run.model, "CFC-11");
    check_near(emission_area(), 5.100645e18, 1e-6);
    double flux = 1e9 / (12.011 + 3 * 35.45 + 18.998) * 6.02214076e23 / 5.100645e18 / 31557600.0;
    check_near(emission_kg_year(run.model, s, flux), 1e6, 1e-4);
    end(&run);
}

/* Every gas of the mechanism that is carried: 1 kt at the ground and 0.1 kt/km from 10 to 20 km, in 1980. The
 * layers are as tall as each other, so five of them get a fifth each. Then transport alone: what has been
 * given off is in the column, through the year and two more. 48 additions round by 1e-15 each, and a step of
 * diffusion by some 1e-15 of the content. */
static Settings a_kilotonne_each(void **state)
{
    Settings settings = coarse_case(DAY_MEAN, 1980);
    Run any = start(&settings, 1);
    Rows rows = rows_begin();
    for (int s = 0; s < any.model->mechanism->solved; s++) {
        const char *gas = mechanism_name(any.model->mechanism, s);
        if (!carried(any.model, s))
            continue;
        ground(&rows, "1980", gas, 1.0);
        ground(&rows, "1981-1982", gas, 0.0);
        row(&rows, "1980", gas, "emission", 0.1, "kt/km", "10,20", "aloft");
    }
    end(&any);
    return alone(state, &rows, 1980, 1982);
}

static void test_where_it_goes(void **state)
{
    Settings settings = a_kilotonne_each(state);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    int solved = model->mechanism->solved, padded = model->grid.padded, gases = 0;
    double *flux = calloc((size_t)solved, sizeof *flux), *low = calloc((size_t)solved, sizeof *low);
    double *layer = calloc(field_size(model), sizeof *layer);
    emissions_at(model, 1980.3, flux, low, layer);
    for (int s = 0; s < solved; s++) {
        if (!carried(model, s)) {
            assert_true(flux[s] == 0.0 && low[s] == 0.0);
            continue;
        }
        check_near(kt_of(model, s, low[s] * YEAR_SECONDS), 1.0, 1e-12);
        check_near(kt_of(model, s, flux[s] * YEAR_SECONDS), 2.0, 1e-12);
        for (int l = 0; l < model->grid.layers; l++) {
            double km = 1e-5 * model->grid.middle[l];
            double share = l == 0 ? 1.0 : km > 10.0 && km < 20.0 ? 0.2 : 0.0;
            check_near(layer[FIELD(padded, s, l)], share * low[s], 1e-12);
        }
        gases++;
    }
    print_message("   %d gases\n", gases);
    assert_true(gases > 40);
    for (int before = 0; before <= 1; before++) { /* nothing before and after the year */
        emissions_at(model, before ? nextafter(1980.0, 0.0) : 1981.0, flux, NULL, NULL);
        for (int s = 0; s < solved; s++)
            assert_true(flux[s] == 0.0);
    }
    free(flux);
    free(low);
    free(layer);
    end(&run);
}

static void test_column_holds_it(void **state)
{
    Settings settings = a_kilotonne_each(state);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    Column *column = run.column;
    Fault fault = {0};
    const int steps = 48;
    double length = YEAR_SECONDS / steps, worst_mass = 0.0, worst_burden = 0.0;
    memset(column->x, 0, field_size(model) * sizeof(double));
    column_open_ledger(model, column);
    ok(mixing_prepare(run.stepper->mixing, 0, length, &fault), &fault);
    for (int i = 0; i < 3 * steps; i++) {
        double middle = 1980.0 + (i + 0.5) / steps;
        stepper_move(run.stepper, middle, middle);
        stepper_mix(run.stepper, column, 0, length, NULL);
        for (int s = 0; s < model->mechanism->solved; s++) {
            if (!carried(model, s))
                continue;
            double burden = column_burden(model, column->x, s), due = fmin(1.0, (i + 1.0) / steps);
            worst_mass = fmax(worst_mass, fabs(kt_of(model, s, column->emitted[s]) / (2.0 * due) - 1.0));
            worst_burden = fmax(worst_burden, fabs(burden / column->emitted[s] - 1.0));
            assert_true(column->received[s] == 0.0 && column->exchanged[s] == 0.0);
        }
    }
    print_message("   ledger off by %.1e of the mass, the column by %.1e of the ledger\n", worst_mass,
                  worst_burden);
    assert_true(worst_mass <= 1e-12);
    assert_true(worst_burden <= 1e-10);
    end(&run);
}

/* A mass of nitrogen in NO and N2O, of chlorine in CFC-11: molar masses of the periodic table. */
static void test_mass_of_an_element(void **state)
{
    static const struct {
        const char *gas, *unit;
        double per_kt; /* kt of the gas */
    } of[] = {{"NO", "kt N", 30.006 / 14.007},
              {"N2O", "t N", 44.013 / 28.014 * 1e-3},
              {"CFC-11", "Mt Cl", 137.368 / (3 * 35.45) * 1e3}};
    Rows rows = rows_begin();
    for (size_t i = 0; i < 3; i++)
        row(&rows, "1980", of[i].gas, "emission", 7.0, of[i].unit, ",", "test");
    Settings settings = alone(state, &rows, 1980, 1980);
    Run run = start(&settings, 1);
    double *flux = calloc((size_t)run.model->mechanism->solved, sizeof *flux);
    assert_non_null(flux);
    emissions_at(run.model, 1980.5, flux, NULL, NULL);
    for (size_t i = 0; i < 3; i++) {
        int s = solved_of(run.model, of[i].gas);
        check_near(kt_of(run.model, s, flux[s] * YEAR_SECONDS), 7.0 * of[i].per_kt, 1e-4);
    }
    free(flux);
    end(&run);
}

/* ---- whole runs ---- */

/* CFC-11 by emissions, CFC-12 and N2O from their abundances over to emissions in 1981, NO aloft (mostly where
 * a table holds NO2, but not NO), water aloft (held in the troposphere: half of it is the reservoir's), HCl
 * into a ground that takes it up. */
static Settings eventful(void **state)
{
    Settings settings = coarse_case(DAY_FACTORS, 1980);
    settings.last_year = 1981;
    settings.outputs_per_year = 4;
    Rows rows = rows_begin();
    ground(&rows, "1980", "CFC-11", 260.0);
    ground(&rows, "1981", "CFC-11", 130.0);
    ground(&rows, "1981", "CFC-12", 400.0);
    ground(&rows, "1981", "N2O", 2e4);
    ground(&rows, "1980-1981", "HCl", 50.0);
    row(&rows, "1980-1981", "NO", "emission", 300.0, "kt N", "9,13", "aircraft");
    row(&rows, "1980-1981", "H2O", "emission", 1e4, "kt", "8,16", "aircraft");
    lay(&settings, state, "layer.csv", &rows);
    return settings;
}

typedef struct {
    const Model *model;
    double kt[2][4]; /* by year: CFC-11, CFC-12, HCl, NO */
    int records;
} Kept;

static const char *const followed[] = {"CFC-11", "CFC-12", "HCl", "NO"};

static int keep(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Kept *kept = context;
    for (int i = 0; i < 4; i++) {
        int s = solved_of(kept->model, followed[i]);
        kept->kt[kept->records / 4][i] += kt_of(
            kept->model, s, record->emission[s] * (record->time_end - record->time_start) * YEAR_SECONDS);
    }
    kept->records++;
    return 0;
}

static void check_closed(const Run *run)
{
    static const char *const accounted[] = {"Cl", "Br", "N", "H"};
    for (size_t i = 0; i < 4; i++) {
        double closure =
            column_closure(run->model, run->column, mechanism_element(run->model->mechanism, accounted[i]));
        print_message("   %s: closed to %.1e\n", accounted[i], closure);
        assert_true(fabs(closure) <= 1e-11);
    }
}

static void test_years_and_atoms(void **state)
{
    Settings settings = eventful(state);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    Fault fault = {0};
    Kept kept = {.model = model};
    Watcher watcher = {keep, NULL, &kept, NULL};
    ok(projection_run(model, run.stepper, run.column, &watcher, &fault), &fault);
    assert_int_equal(kept.records, 8);
    check_near(kept.kt[0][0], 260.0, 1e-12);
    check_near(kept.kt[1][0], 130.0, 1e-12);
    check_near(kept.kt[1][1], 400.0, 1e-12);
    print_message("   CFC-12 in 1980, from its abundance: %.1f kt\n", kept.kt[0][1]);
    for (int year = 0; year < 2; year++) {
        check_near(kept.kt[year][2], 50.0, 1e-12);
        check_near(kept.kt[year][3], 300.0 * 30.006 / 14.007, 1e-4);
    }
    check_closed(&run);
    int hcl = solved_of(model, "HCl"), water = solved_of(model, "H2O"), no = solved_of(model, "NO");
    assert_true(run.column->received[hcl] < -0.1 * run.column->emitted[hcl]); /* taken up */
    assert_true(run.column->received[no] == 0.0 && run.column->emitted[no] > 0.0);
    check_near(kt_of(model, water, run.column->emitted[water]), 2e4, 1e-12);
    end(&run);
}

/* Explicit days over the change of the year: four days of each. */
static void test_explicit_days(void **state)
{
    Settings settings = eventful(state);
    settings.day = DAY_EXPLICIT;
    Run run = start(&settings, 1);
    run.column->time = 1981.0 - 4.0 / 365.25;
    advance(&run, 1.0, 8, 0);
    check_closed(&run);
    int s = solved_of(run.model, "CFC-11");
    check_near(kt_of(run.model, s, run.column->emitted[s]), (260.0 + 130.0) * 4.0 / 365.25, 1e-12);
    assert_true(run.column->received[s] == 0.0);
    end(&run);
}

/* The chemistry is the same, the ledger too, whoever computes it. */
static void test_threads(void **state)
{
    Settings settings = eventful(state);
    Run one = start(&settings, 1), two = start(&settings, 2);
    two.column->time = one.column->time = 1980.9;
    advance(&one, 7.3050, 8, 0);
    advance(&two, 7.3050, 8, 0);
    assert_true(one.column->time > 1981.0);
    size_t solved = (size_t)one.model->mechanism->solved;
    assert_memory_equal(one.column->x, two.column->x, field_size(one.model) * sizeof(double));
    assert_memory_equal(one.column->emitted, two.column->emitted, solved * sizeof(double));
    assert_memory_equal(one.column->received, two.column->received, solved * sizeof(double));
    assert_memory_equal(one.column->exchanged, two.column->exchanged, solved * sizeof(double));
    end(&one);
    end(&two);
}

/* A gas of which there is none until it is given off; by emissions aloft alone the ground is no source. */
static void test_from_nothing(void **state)
{
    Settings settings = coarse_case(DAY_MEAN, 1980);
    settings.last_year = 1982;
    char path[400];
    snprintf(path, sizeof path, "%s/baseline-schedule.csv", data_dir());
    Schedule schedule;
    Fault fault = {0};
    ok(schedule_read(&schedule, (const char *const[]){path}, 1, &fault), &fault);
    Rows rows = rows_begin();
    for (int g = 0; g < schedule.gases; g++) /* all but one */
        if (strcmp(schedule.gas[g], "halon-2402") != 0)
            row(&rows, "1980-1982", schedule.gas[g], "abundance",
                1e12 * schedule_abundance(&schedule, g, 1980.5), "ppt", ",", "held");
    schedule_free(&schedule);
    ground(&rows, "1981-1982", "halon-2402", 10.0);
    write_file(state, "but-one.csv", rows.text, settings.schedule_file);
    free(rows.text);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    int s = solved_of(model, "halon-2402");
    advance(&run, 365.25 / 12, 12, 0);
    for (int l = 0; l < model->grid.layers; l++)
        assert_true(run.column->x[FIELD(model->grid.padded, s, l)] == 0.0);
    run.column->time = 1981.0;
    advance(&run, 365.25 / 12, 12, 0);
    check_near(kt_of(model, s, run.column->emitted[s]), 10.0, 1e-12);
    double left = column_burden(model, run.column->x, s) / run.column->emitted[s];
    print_message("   %.4f of what was given off in a year is there at its end\n", left);
    assert_true(left > 0.9 && left < 1.0); /* it lives for decades, half a year on average */
    end(&run);
}

/* A gas that reactions make is in the air without the schedule: lines that give off nothing of it, from the
 * second year on, change nothing, neither the column at rest nor the years before and after, to the last bit.
 * NO has a closed ground, HCl and O3 are taken up. */
static void test_nothing_of_what_is_made(void **state)
{
    Settings without = coarse_case(DAY_MEAN, 1980);
    without.last_year = 1981;
    Settings with = without;
    Rows rows = rows_begin();
    static const char *const gases[] = {"NO", "HCl", "O3"};
    for (int i = 0; i < 3; i++)
        ground(&rows, "1981", gases[i], 0.0);
    lay(&with, state, "nothing.csv", &rows);
    Run runs[2] = {start(&without, 1), start(&with, 1)};
    const Watcher watcher = {0};
    for (int r = 0; r < 2; r++) {
        Fault fault = {0};
        ok(projection_run(runs[r].model, runs[r].stepper, runs[r].column, &watcher, &fault), &fault);
    }
    assert_memory_equal(runs[0].column->x, runs[1].column->x, field_size(runs[0].model) * sizeof(double));
    for (int i = 0; i < 3; i++) { /* nor does it make source gases of them */
        int s = solved_of(runs[1].model, gases[i]);
        assert_true(model_made_anyway(runs[1].model, s) && !model_made_anyway(runs[0].model, s));
        assert_true(!budget_is_source(runs[1].model, s) && moments_has(runs[1].model, s));
    }
    assert_memory_equal(runs[0].column->received, runs[1].column->received,
                        (size_t)runs[0].model->mechanism->solved * sizeof(double));
    for (int r = 0; r < 2; r++)
        end(&runs[r]);
}

/* ---- what is refused ---- */

static void refuse(void **state, const char *rows_text, const char *place, const char *words)
{
    Settings settings = coarse_case(DAY_MEAN, 1980);
    Rows rows = rows_begin();
    rows.used += (size_t)snprintf(rows.text + rows.used, ROWS_MOST - rows.used, "%s", rows_text);
    lay(&settings, state, "bad.csv", &rows);
    Model *model = NULL;
    Fault fault = {0};
    if (!model_make(&model, &settings, &fault))
        model_check_start(model, &fault);
    model_free(model);
    check_fault(&fault, place, words, NULL);
}

static void test_refused(void **state)
{
    refuse(state, "1980,CFC-99,emission,1,kt,,,test\n", "bad.csv:2", "CFC-99");
    refuse(state, "1980,CFC-11,emission,1,kt,,,test\n1980,ClOO,emission,1,kt,10,12,test\n", "bad.csv:3",
           "too short-lived to be carried");
    refuse(state, "1980,CFC-11,emission,1,kt N,,,test\n", "bad.csv:2", "which CFC-11 does not hold");
    refuse(state, "1980,NO,emission,1,kt N,50,70,test\n", "bad.csv:2", "above the top of the column, 60 km");
    refuse(state, "1980,H2O,emission,1,kt,2,8,test\n", "bad.csv:2", "raise to_km");
    refuse(state, "1978-1980,CFC-11,emission,1,kt,,,test\n", "bad.csv:2", "begin in 1978 or earlier");
    refuse(state, "1979,CFC-11,emission,1,kt,,,test\n", "bad.csv:2",
           "CFC-11 is driven by emissions from 1979");
    refuse(state, "1980,CO,emission,1,kt,,,test\n", "surface.bounds", "CO");
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_by_hand),
                                       WITH_FOLDER(test_where_it_goes),
                                       WITH_FOLDER(test_column_holds_it),
                                       WITH_FOLDER(test_mass_of_an_element),
                                       WITH_FOLDER(test_years_and_atoms),
                                       WITH_FOLDER(test_explicit_days),
                                       WITH_FOLDER(test_threads),
                                       WITH_FOLDER(test_from_nothing),
                                       WITH_FOLDER(test_nothing_of_what_is_made),
                                       WITH_FOLDER(test_refused)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
