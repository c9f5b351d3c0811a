/* Tests of the adjoint (model/sensitivity): against central differences of columns settled anew, at frozen
 * diurnal factors, for parameters of every kind. Built-in case on coarse layers.
 *
 * Tolerance: 0.5 %, of an effect that is not tiny. Two columns settled to 1e-8 (STEADY_CHANGE), apart by 0.02
 * in ln(parameter), give the derivative to 5e-7 of the answer: a hundredth of TINY. */
#define _XOPEN_SOURCE 700
#include "settled.h"

#include "../model/sensitivity.h"

enum { ANSWERS = 4 };
static const char *const wanted[ANSWERS] = {"column", "O3@40", "lifetime:N2O", "flux:CFC-11"};
static const double STEP = 1e-2, TOLERANCE = 0.005, TINY = 5e-5;

typedef struct {
    Rest rest;
    double *x; /* the settled state */
    Answer answer[ANSWERS];
    Sensitivity *sensitivity[ANSWERS];
    int compared, parameters;
    double worst;
} Bench;

static Bench make_bench(int day)
{
    Settings settings = coarse_case(day, 2000);
    Bench bench = {.rest = make_rest(&settings)};
    Fault fault = {0};
    find_rest(&bench.rest);
    const Model *model = bench.rest.run.model;
    ok(steady_settle(bench.rest.unsplit, bench.rest.run.column->x, &bench.rest.report, &fault), &fault);
    bench.x = field_copy(model, bench.rest.run.column->x);
    ok(sensitivity_prepare(bench.rest.unsplit, bench.x, &fault), &fault);
    for (int a = 0; a < ANSWERS; a++) {
        ok(answer_read(&bench.answer[a], wanted[a], model, &fault), &fault);
        ok(sensitivity_make(&bench.sensitivity[a], bench.rest.unsplit, bench.x, &bench.answer[a], &fault),
           &fault);
    }
    return bench;
}

static void end_bench(Bench *bench)
{
    for (int a = 0; a < ANSWERS; a++)
        sensitivity_free(bench->sensitivity[a]);
    free(bench->x);
    end_rest(&bench->rest);
}

/* Multiply count numbers, stride apart. */
static void scale(double *at, size_t count, size_t stride, double by)
{
    for (size_t i = 0; i < count; i++)
        at[i * stride] *= by;
}

static void settle_anew(Bench *bench, double value[ANSWERS])
{
    Fault fault = {0};
    double *x = bench->rest.run.column->x;
    memcpy(x, bench->x, field_size(bench->rest.run.model) * sizeof(double));
    ok(steady_settle(bench->rest.unsplit, x, &bench->rest.report, &fault), &fault);
    for (int a = 0; a < ANSWERS; a++)
        value[a] = answer_value(bench->rest.unsplit, x, &bench->answer[a]);
}

/* The parameter is what stands at the place(s); got [ANSWERS] its derivatives by ln(parameter). */
static void compare(Bench *bench, const char *name, double *at, size_t count, size_t stride,
                    const double *got)
{
    double up[ANSWERS], down[ANSWERS], ratio = exp(STEP);
    scale(at, count, stride, ratio);
    settle_anew(bench, up);
    scale(at, count, stride, 1.0 / (ratio * ratio));
    settle_anew(bench, down);
    scale(at, count, stride, ratio);
    bench->parameters++;
    for (int a = 0; a < ANSWERS; a++) {
        double want = (up[a] - down[a]) / (2.0 * STEP), value = bench->sensitivity[a]->value;
        double off = fabs(got[a] - want) / fmax(fabs(want), TINY * fabs(value));
        bench->worst = fmax(bench->worst, off);
        bench->compared += fabs(want) > TINY * fabs(value);
        if (!(off < TOLERANCE))
            fail_msg("d ln %s / d ln %s: adjoint %.6e, settled anew %.6e", wanted[a], name, got[a] / value,
                     want / value);
    }
}

static void compare_reaction(Bench *bench, const char *id)
{
    const Model *model = bench->rest.run.model;
    const Mechanism *mechanism = model->mechanism;
    int r = 0, padded = model->grid.padded;
    while (r < mechanism->reactions && strcmp(mechanism->reaction[r].id, id))
        r++;
    if (r == mechanism->reactions)
        fail_msg("no reaction %s", id);
    double got[ANSWERS] = {0};
    for (int a = 0; a < ANSWERS; a++)
        for (int l = 0; l < model->grid.layers; l++)
            got[a] += bench->sensitivity[a]->reaction[FIELD(padded, r, l)];
    compare(bench, id, bench->rest.unsplit->factor + FIELD(padded, r, 0), (size_t)padded, 1, got);
}

static void test_reactions(void **state)
{
    (void)state;
    static const char *const ids[] = {
        "O+O2+M",     "O+O3",         "O1D+N2",         "O1D+H2O",        "OH+O3",        "HO2+O3",
        "NO+O3",      "NO2+O",        "NO+HO2",         "NO2+OH",         "Cl+O3",        "ClO+O",
        "Cl+CH4",     "ClO+NO2",      "O1D+N2O-NO",     "HO2+HO2",        "J-O2",         "J-O3",
        "J-O3-O1D",   "J-NO2",        "J-N2O",          "J-CFC-11",       "J-HNO3",       "J-ClONO2-Cl",
        "J-Cl2O2-Cl", "het-N2O5-H2O", "het-ClONO2-H2O", "het-ClONO2-HCl", "het-HOCl-HCl", "het-BrONO2-H2O"};
    for (int day = DAY_MEAN; day <= DAY_FACTORS; day++) {
        Bench bench = make_bench(day);
        for (size_t i = 0; i < sizeof ids / sizeof ids[0]; i += day == DAY_MEAN ? 1 : 7)
            compare_reaction(&bench, ids[i]);
        const Mechanism *mechanism = bench.rest.run.model->mechanism;
        for (int r = mechanism->washout_first; day == DAY_MEAN && r < mechanism->reactions; r++)
            compare_reaction(&bench, mechanism->reaction[r].id);
        print_message("   %d reactions, %d derivatives above the least; largest difference %.1e\n",
                      bench.parameters, bench.compared, bench.worst);
        assert_true(bench.compared > bench.parameters);
        end_bench(&bench);
    }
}

static void test_borders(void **state)
{
    (void)state;
    static const char *const kept[] = {"N2O", "CH4", "CFC-11", "CFC-12", "CH3Br", "CO", "H2", "halon-1211"};
    static const char *const deposited[] = {"O3", "HNO3", "HCl"};
    Bench bench = make_bench(DAY_MEAN);
    Unsplit *unsplit = bench.rest.unsplit;
    const Model *model = bench.rest.run.model;
    double got[ANSWERS];
    for (size_t i = 0; i < sizeof kept / sizeof kept[0]; i++) {
        int s = solved_of(model, kept[i]);
        for (int a = 0; a < ANSWERS; a++)
            got[a] = bench.sensitivity[a]->surface[s] * unsplit->value[s];
        compare(&bench, kept[i], &unsplit->value[s], 1, 1, got);
    }
    for (size_t i = 0; i < sizeof deposited / sizeof deposited[0]; i++) {
        int s = solved_of(model, deposited[i]);
        for (int a = 0; a < ANSWERS; a++)
            got[a] = bench.sensitivity[a]->deposition[s];
        compare(&bench, deposited[i], &unsplit->deposit[s], 1, 1, got);
    }
    for (int h = 0; h < model->held; h++) {
        int s = model->held_species[h];
        size_t layers = 0;
        while (unsplit->kept[layers * (size_t)unsplit->solved + (size_t)s])
            layers++;
        for (int a = 0; a < ANSWERS; a++)
            got[a] = bench.sensitivity[a]->held[s];
        compare(&bench, mechanism_name(model->mechanism, s), &unsplit->value[s], layers,
                (size_t)unsplit->solved, got);
    }
    static const int edges[] = {1, 6, 8, 11, 15, 20, 26};
    for (size_t i = 0; i < sizeof edges / sizeof edges[0]; i++) {
        char name[40];
        snprintf(name, sizeof name, "K at %g km", 1e-5 * model->grid.edge[edges[i]]);
        for (int a = 0; a < ANSWERS; a++)
            got[a] = bench.sensitivity[a]->eddy[edges[i]];
        compare(&bench, name, &unsplit->conductance[edges[i]], 1, 1, got);
    }
    print_message("   %d borders, %d derivatives above the least; largest difference %.1e\n",
                  bench.parameters, bench.compared, bench.worst);
    assert_true(bench.parameters == 21 && bench.compared > 40);
    end_bench(&bench);
}

/* By the flux of a gas: against columns settled under a flux in place of a value. For gases that the ground
 * keeps, those that feed back on themselves (CH4, N2O) among them, and for one that it takes up. */
static void test_per_flux(void **state)
{
    (void)state;
    static const char *const gases[] = {"N2O", "CH4", "CFC-11", "CFC-115", "CH3Br", "HCl"};
    for (size_t i = 0; i < sizeof gases / sizeof gases[0]; i++) {
        Bench bench = make_bench(DAY_MEAN);
        Unsplit *unsplit = bench.rest.unsplit;
        const Model *model = bench.rest.run.model;
        int s = solved_of(model, gases[i]), kept = unsplit->kept[s];
        Fault fault = {0};
        double got, up[ANSWERS], down[ANSWERS], flux = 1e8;
        Answer answer = {.kind = ANSWER_FLUX, .species = s};
        ok(sensitivity_per_flux(unsplit, bench.x, bench.sensitivity[0], s, &got, &fault), &fault);
        if (kept)
            flux = answer_value(unsplit, bench.x, &answer);
        assert_true(flux > 0.0);
        double middle = kept ? flux : 0.0, shift = 5e-3 * flux;
        unsplit_emit(unsplit, s, middle + shift);
        settle_anew(&bench, up);
        unsplit_emit(unsplit, s, middle - shift);
        settle_anew(&bench, down);
        double want = (up[0] - down[0]) / (2.0 * shift);
        print_message("   %s: %.5e DU per (molecule cm-2 s-1), settled anew %.5e\n", gases[i], got, want);
        check_near(got, want, 0.01);
        end_bench(&bench);
    }
}

/* The uncertainty is ln f(T) layer by layer, at the temperature of 2000 and not that of the base atmosphere;
 * a fall-off reaction moves its reverse along. */
static void test_uncertainty(void **state)
{
    (void)state;
    Bench bench = make_bench(DAY_MEAN);
    const Model *model = bench.rest.run.model;
    const Mechanism *mechanism = model->mechanism;
    const Sensitivity *sensitivity = bench.sensitivity[0];
    const double *kelvin = bench.rest.unsplit->conditions->temperature;
    int bent = 0, tied = 0;
    assert_true(fabs(kelvin[20] - model->air.temperature[20]) > 0.5); /* CO2 cools by 1 K at 41 km */
    for (int r = 0; r < mechanism->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        double alone = 0.0, by_hand = 0.0;
        int reverse = -1;
        for (int other = 0; other < mechanism->photolysis_first; other++)
            if (mechanism->reaction[other].law == LAW_EQUILIBRIUM && mechanism->reaction[other].forward == r)
                reverse = other;
        for (int l = 0; l < model->grid.layers; l++) {
            double here = sensitivity->reaction[FIELD(model->grid.padded, r, l)];
            if (reverse >= 0)
                here += sensitivity->reaction[FIELD(model->grid.padded, reverse, l)];
            double factor = reaction->f * exp(fabs(reaction->g * (1.0 / kelvin[l] - 1.0 / 298.0)));
            alone += here;
            by_hand += reaction->f > 0.0 ? here * log(factor) : 0.0;
        }
        check_near(sensitivity_reaction(sensitivity, model, r, 0), alone, 1e-9);
        if (fabs(by_hand) > 1e-12)
            check_near(sensitivity_reaction(sensitivity, model, r, 1), by_hand, 1e-9);
        bent += reaction->g != 0.0;
        tied += reverse >= 0;
    }
    print_message("   %d reactions whose factor depends on temperature, %d with a reverse\n", bent, tied);
    assert_true(bent > 20 && tied > 1);
    end_bench(&bench);
}

static void test_words(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 2000);
    Rest rest = make_rest(&settings);
    const Model *model = rest.run.model;
    static const char *const bad[][2] = {{"colum", "no answer"},
                                         {"O3@", "altitude"},
                                         {"O3@400", "reach"},
                                         {"O3@4x", "altitude"},
                                         {"lifetime:N20", "N2O"},
                                         {"flux:O3", "keeps no value"},
                                         {"lifetime:", "no active species"}};
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        Answer answer;
        Fault fault = {0};
        assert_int_equal(answer_read(&answer, bad[i][0], model, &fault), FAULT_INPUT);
        check_fault(&fault, bad[i][1], NULL);
    }
    for (int a = 0; a < ANSWERS; a++) {
        Answer answer;
        Fault fault = {0};
        char name[60];
        ok(answer_read(&answer, wanted[a], model, &fault), &fault);
        answer_name(&answer, model, name, sizeof name);
        assert_string_equal(name, wanted[a]);
    }
    end_rest(&rest);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_reactions), cmocka_unit_test(test_borders),
                                       cmocka_unit_test(test_per_flux), cmocka_unit_test(test_uncertainty),
                                       cmocka_unit_test(test_words)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
