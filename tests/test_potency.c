/* Tests of the depletion potentials (model/potency): against columns under another emission, settled from the
 * start of the case and by Newton's method; whether they depend on the size of the shift; which gases; what
 * the state is afterwards. Built-in case on coarse layers.
 *
 * Tolerances. Two columns settled on their own, each to ENOUGH of any layer's ozone, are apart by the noise
 * of their explicit days: measured, 4e-5 DU at most on these layers (test_steady's case, a dozen further
 * turns), of a difference of 0.3 DU and more: 3e-4. The parabola's own error is the bend squared. So 0.3 %
 * with factors; 0.1 % with daily means, where no day is gone through. */
#define _XOPEN_SOURCE 700
#include "settled.h"

#include "../model/potency.h"

static const double ENOUGH = 2e-5, WITH_FACTORS = 3e-3, OF_MEANS = 1e-3;

typedef struct {
    Rest rest;
    Potencies *potencies;
} Bench;

static const Watcher nobody = {0};

static Bench make_bench(const Settings *settings, const PotencyAsk *ask)
{
    Bench bench = {.rest = make_rest(settings)};
    Fault fault = {0};
    find_rest(&bench.rest);
    ok(potency_make(&bench.potencies, bench.rest.unsplit, bench.rest.run.stepper, bench.rest.run.column, ask,
                    &nobody, &fault),
       &fault);
    return bench;
}

static void end_bench(Bench *bench)
{
    potency_free(bench->potencies);
    end_rest(&bench->rest);
}

static const Potency *gas_of(const Bench *bench, const char *name)
{
    int s = solved_of(bench->rest.run.model, name);
    for (int i = 0; i < bench->potencies->count; i++)
        if (bench->potencies->gas[i].species == s)
            return &bench->potencies->gas[i];
    fail_msg("no potential of %s", name);
    return NULL;
}

/* Ozone column of the case with a flux of s in place of a value at the ground, from the case's own start. */
static double emitted(const Settings *settings, const char *name, double flux)
{
    Rest rest = make_rest(settings);
    Fault fault = {0};
    find_rest(&rest);
    unsplit_emit(rest.unsplit, solved_of(rest.run.model, name), flux);
    ok(steady_tighten(rest.unsplit, rest.run.stepper, rest.run.column, ENOUGH, &rest.report, &fault), &fault);
    ok(steady_tighten(rest.unsplit, rest.run.stepper, rest.run.column, ENOUGH, &rest.report, &fault), &fault);
    double column = column_ozone_du(rest.run.model, rest.run.column->x);
    end_rest(&rest);
    return column;
}

/* share: of the flux, added and taken away. */
static double brute_force(const Settings *settings, const Potency *gas, const char *name, double share)
{
    double shift = share * gas->flux;
    return (emitted(settings, name, gas->flux + shift) - emitted(settings, name, gas->flux - shift)) /
           (2.0 * shift);
}

/* Chlorine, bromine, nitrogen, and methane, which feeds back on itself. Shares that move the column by 0.2 to
 * 0.6 DU, none of them that of potency_make. */
static const struct {
    const char *name;
    double share;
} emissions[] = {{"CFC-11", 0.10}, {"CFC-12", 0.12}, {"CCl4", 0.2}, {"halon-1301", 0.3},
                 {"N2O", 0.02},    {"CH3Br", 0.2},   {"CH4", 0.03}};
enum { EMISSIONS = sizeof emissions / sizeof emissions[0] };

static void compare_emissions(int day, double tolerance)
{
    Settings settings = coarse_case(day, 2000);
    /* with constant light chlorine hardly matters (DEVELOPERS.md: even its sign comes out wrong), and a
     * quarter of a DU would take far more of it than a derivative bears */
    const PotencyAsk ask = {.change = day == DAY_MEAN ? 0.01 : 0.0};
    Bench bench = make_bench(&settings, &ask);
    double got[EMISSIONS], want[EMISSIONS], mass[EMISSIONS];
    for (int i = 0; i < EMISSIONS; i++) {
        double share = day == DAY_MEAN ? 0.1 * emissions[i].share : emissions[i].share;
        const Potency *gas = gas_of(&bench, emissions[i].name);
        got[i] = gas->anew;
        mass[i] = gas->molar_mass;
        want[i] = brute_force(&settings, gas, emissions[i].name, share);
        print_message("   %s: %.5e DU per (molecule cm-2 s-1), noise %.0e; emissions %.5e, apart %.1e; "
                      "frozen %.5e\n",
                      emissions[i].name, got[i], gas->noise, want[i], fabs(got[i] / want[i] - 1.0),
                      gas->frozen);
        check_near(got[i], want[i], tolerance);
        check_near(gas->odp, want[i] / mass[i] / (want[0] / mass[0]), 2.0 * tolerance);
        /* without factors the adjoint is the whole answer; with them it is not */
        if (day == DAY_MEAN)
            check_near(gas->frozen, want[i], tolerance);
    }
    if (day == DAY_FACTORS) {
        assert_true(gas_of(&bench, "CFC-12")->anew / gas_of(&bench, "CFC-12")->frozen > 1.1);
        assert_true(gas_of(&bench, "CH4")->anew / gas_of(&bench, "CH4")->frozen > 1.3);
    }
    end_bench(&bench);
}

static void test_factors(void **state)
{
    (void)state;
    compare_emissions(DAY_FACTORS, WITH_FACTORS);
}

static void test_means(void **state)
{
    (void)state;
    compare_emissions(DAY_MEAN, OF_MEANS);
}

/* Half and twice the shift: the same but for the noise that is told and the bend squared; and the noise is
 * small. */
static void test_size(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_FACTORS, 2000);
    settings.spacing_km = 4.0;
    const PotencyAsk small = {.change = 0.125}, large = {.change = 0.5};
    Bench a = make_bench(&settings, &small), b = make_bench(&settings, &large);
    double worst = 0.0, noisiest = 0.0;
    assert_true(a.potencies->count == b.potencies->count && a.potencies->count > 20);
    for (int i = 0; i < a.potencies->count; i++) {
        const Potency *one = &a.potencies->gas[i], *other = &b.potencies->gas[i];
        double apart = fabs(one->anew / other->anew - 1.0);
        double allowed = 2.0 * (one->noise + other->noise) + other->bend * other->bend + 2e-4;
        if (!(apart <= allowed && other->noise < WITH_FACTORS))
            fail_msg("%s: %.6e with half the shift, %.6e with twice; noise %.1e and %.1e",
                     mechanism_name(a.rest.run.model->mechanism, one->species), one->anew, other->anew,
                     one->noise, other->noise);
        worst = fmax(worst, apart);
        noisiest = fmax(noisiest, other->noise);
    }
    print_message("   shifts of 0.125 and 0.5 DU: apart by %.1e at most, noise %.1e\n", worst, noisiest);
    end_bench(&a);
    end_bench(&b);
}

/* By the rule in the header; lifetimes are those of the budget; the reference has 1 and another reference
 * gives the same ratios. */
static void test_list(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    const PotencyAsk ask = {.frozen = 1}, other = {.frozen = 1, .reference = "CFC-12"};
    Bench bench = make_bench(&settings, &ask), second = make_bench(&settings, &other);
    const Model *model = bench.rest.run.model;
    static const char *const in[] = {"CH4", "N2O", "CFC-115", "halon-2402", "CHBr3", "HCFC-22", "H2"};
    static const char *const out[] = {"CO", "CO2", "O3", "H2O", "HCl", "ClO", "CH3O2", "NO2"};
    for (size_t i = 0; i < sizeof in / sizeof in[0]; i++)
        assert_true(gas_of(&bench, in[i])->frozen != 0.0);
    for (size_t i = 0; i < sizeof out / sizeof out[0]; i++)
        for (int g = 0; g < bench.potencies->count; g++)
            assert_true(bench.potencies->gas[g].species != solved_of(model, out[i]));
    check_near(gas_of(&bench, "CFC-11")->odp_frozen, 1.0, 1e-15);
    check_near(gas_of(&second, "CFC-12")->odp_frozen, 1.0, 1e-15);
    check_near(gas_of(&second, "N2O")->odp_frozen * gas_of(&bench, "CFC-12")->odp_frozen,
               gas_of(&bench, "N2O")->odp_frozen, 1e-5);
    /* at rest burden over what comes through the ground is the lifetime, where nothing makes the gas */
    static const char *const lost[] = {"CFC-11", "CFC-115", "halon-1301", "CCl4"};
    for (size_t i = 0; i < sizeof lost / sizeof lost[0]; i++) {
        const Potency *gas = gas_of(&bench, lost[i]);
        check_near(gas->lifetime, gas->budget.burden / gas->flux / YEAR_SECONDS, 1e-6);
    }
    /* one Gg of CFC-11 a year, spread over 5.1007e18 cm2, is 2.7233e4 molecules cm-2 s-1 */
    check_near(potency_per_gg_year(1.0, 137.367), 2.7236e4, 1e-3);
    end_bench(&bench);
    end_bench(&second);
}

/* Of a gas of which there is none yet, by its flux alone. */
static void test_absent(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_FACTORS, 1955);
    settings.spacing_km = 4.0;
    const PotencyAsk ask = {0};
    Bench bench = make_bench(&settings, &ask);
    const Potency *gas = gas_of(&bench, "HCFC-141b");
    assert_true(gas->abundance == 0.0 && isnan(gas->lifetime) && gas->flux == 0.0);
    double flux = 3e6; /* four times that of 2000 */
    double want = (4.0 * emitted(&settings, "HCFC-141b", flux) - emitted(&settings, "HCFC-141b", 2.0 * flux) -
                   3.0 * emitted(&settings, "HCFC-141b", 0.0)) /
                  (2.0 * flux);
    print_message("   HCFC-141b in 1955: %.5e, by emissions %.5e\n", gas->anew, want);
    check_near(gas->anew, want, WITH_FACTORS);
    assert_true(gas->odp > 0.0 && gas->odp_noise < 0.01 * gas->odp);
    end_bench(&bench);
}

/* Afterwards column, unsplit and stepper are those of the settled state. */
static void test_afterwards(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_FACTORS, 2000);
    settings.spacing_km = 4.0;
    const PotencyAsk ask = {0};
    Bench bench = make_bench(&settings, &ask);
    Unsplit *unsplit = bench.rest.unsplit;
    const Model *model = bench.rest.run.model;
    Column *column = bench.rest.run.column;
    Fault fault = {0};
    double before = column_ozone_du(model, column->x);
    check_near(before, bench.potencies->ozone, 1e-12);
    ok(steady_tighten(unsplit, bench.rest.run.stepper, column, ENOUGH, &bench.rest.report, &fault), &fault);
    assert_true(fabs(column_ozone_du(model, column->x) - before) < 1e-3);
    end_bench(&bench);
}

static void test_refusals(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    Rest rest = make_rest(&settings);
    find_rest(&rest);
    static const char *const bad[][2] = {
        {"CFC-1l", "did you mean CFC-11?"}, {"CO2", "no gas"}, {"O3", "no gas"}};
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        const PotencyAsk ask = {.reference = bad[i][0]};
        Potencies *potencies;
        Fault fault = {0};
        assert_int_equal(
            potency_make(&potencies, rest.unsplit, rest.run.stepper, rest.run.column, &ask, &nobody, &fault),
            FAULT_INPUT);
        check_fault(&fault, bad[i][1], NULL);
        assert_null(potencies);
    }
    volatile sig_atomic_t stop = 1;
    const Watcher hasty = {.stop = &stop};
    const PotencyAsk ask = {0};
    Potencies *potencies;
    Fault fault = {0};
    assert_int_equal(
        potency_make(&potencies, rest.unsplit, rest.run.stepper, rest.run.column, &ask, &hasty, &fault),
        FAULT_INTERRUPTED);
    end_rest(&rest);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_factors), cmocka_unit_test(test_means),
                                       cmocka_unit_test(test_size),    cmocka_unit_test(test_list),
                                       cmocka_unit_test(test_absent),  cmocka_unit_test(test_afterwards),
                                       cmocka_unit_test(test_refusals)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
