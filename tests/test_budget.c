/* Tests of the budget (model/budget): what reactions weigh, books that close, a case by hand,
 * shares and atoms, lifetimes, slopes, and the published order of the families. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include <float.h>

#include "../model/budget.h"
#include "../model/projection.h"

static Settings coarse(double spacing_km)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = spacing_km;
    settings.first_year = settings.last_year = 2000;
    settings.spinup_years = 0.0;
    return settings;
}

static int solved(const Model *model, const char *name)
{
    int s = mechanism_solved(model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

static int reaction(const Mechanism *mechanism, const char *id)
{
    for (int r = 0; r < mechanism->reactions; r++)
        if (!strcmp(mechanism->reaction[r].id, id))
            return r;
    fail_msg("no reaction %s", id);
    return -1;
}

static OxBook *book_of(const Mechanism *mechanism)
{
    OxBook *book;
    Fault fault = {0};
    ok(ox_book_make(&book, mechanism, &fault), &fault);
    return book;
}

static double *zeros(size_t rows, int padded)
{
    double *made = calloc(rows * (size_t)padded, sizeof *made);
    assert_non_null(made);
    return made;
}

/* ---- weights ---- */

/* The rate-limiting steps of the usual accounts count two (Johnston and Podolske 1978; Brasseur and Solomon
 * 2005, chapter 5), steps of HOx one each, null cycles nothing. */
static void test_weights(void **state)
{
    (void)state;
    static const struct {
        const char *id;
        double weight;
        int term;
    } rows[] = {{"J-O2", 2, BUDGET_OXYGEN},
                {"O+O3", -2, BUDGET_OX},
                {"NO2+O", -2, BUDGET_NOX},
                {"J-NO3-NO", -2, BUDGET_NOX},
                {"ClO+O", -2, BUDGET_CLOX},
                {"J-Cl2O2-Cl", -2, BUDGET_CLOX},
                {"J-HOCl", -1, BUDGET_CLOX},
                {"BrO+O", -2, BUDGET_BROX},
                {"BrO+ClO-ClOO", -2, BUDGET_BROX},
                {"BrO+ClO-BrCl", -2, BUDGET_BROX},
                {"J-HOBr", -1, BUDGET_BROX},
                {"BrO+BrO-Br", -2, BUDGET_BROX},
                {"O+OH", -1, BUDGET_HOX},
                {"O+HO2", -1, BUDGET_HOX},
                {"H+O3", -1, BUDGET_HOX},
                {"HO2+O3", -1, BUDGET_HOX},
                {"OH+O3", -1, BUDGET_HOX},
                {"O1D+H2O", -1, BUDGET_HOX},
                {"NO+HO2", 1, BUDGET_OXIDATION},
                {"CH3O2+NO", 1, BUDGET_OXIDATION},
                {"washout-HNO3", -1, BUDGET_WASHOUT},
                {"J-CO2", 1, BUDGET_OTHER},
                {"O+O2+M", 0, -1},
                {"J-O3", 0, -1},
                {"NO+O3", 0, -1},
                {"J-NO2", 0, -1},
                {"ClO+NO", 0, -1},
                {"Cl+O3", 0, -1},
                {"ClO+ClO", 0, -1},
                {"BrO+ClO-OClO", 0, -1},
                {"NO2+NO3", 0, -1},
                {"J-ClONO2-Cl", 0, -1},
                {"het-BrONO2-H2O", 0, -1}};
    Settings settings = coarse(4.0);
    Run run = start(&settings, 1);
    const Mechanism *mechanism = run.model->mechanism;
    OxBook *book = book_of(mechanism);
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        int r = reaction(mechanism, rows[i].id);
        if (book->weight[r] != rows[i].weight || book->term[r] != rows[i].term)
            fail_msg("%s: %g in term %d, want %g in %d", rows[i].id, book->weight[r], book->term[r],
                     rows[i].weight, rows[i].term);
    }
    assert_int_equal(book->shared, reaction(mechanism, "OH+O3"));
    /* exchange with HO2NO2 is no fate of HO2 */
    assert_int_equal(book->fate[reaction(mechanism, "NO2+HO2")], 0);
    assert_int_equal(book->fate[reaction(mechanism, "HO2NO2+M")], 0);
    assert_int_equal(book->fate[reaction(mechanism, "HO2+HO2")], -2);
    ox_book_free(book);
    end(&run);
}

/* ---- by hand ---- */

static const char small[] =
    "title = \"small\"; version = \"1\"; elements = [ \"H\", \"N\", \"O\", \"Cl\" ];\n"
    "sources = ( { key = \"X\"; text = \"invented\"; } );\n"
    "species = ( { name = \"O\"; formula = \"O\"; }, { name = \"O3\"; formula = \"O3\"; },\n"
    "  { name = \"OH\"; formula = \"OH\"; }, { name = \"HO2\"; formula = \"HO2\"; },\n"
    "  { name = \"NO\"; formula = \"NO\"; }, { name = \"NO2\"; formula = \"NO2\"; },\n"
    "  { name = \"HNO3\"; formula = \"HNO3\"; }, { name = \"Cl\"; formula = \"Cl\"; },\n"
    "  { name = \"ClO\"; formula = \"ClO\"; }, { name = \"HOCl\"; formula = \"HOCl\"; },\n"
    "  { name = \"O2\"; formula = \"O2\"; role = \"fixed\"; share = 0.2; },\n"
    "  { name = \"M\"; formula = \"\"; role = \"fixed\"; share = 1.0; } );\n"
    "thermal = (\n"
    "  { id = \"a\"; eq = \"OH + O3 -> HO2 + O2\"; law = \"arrhenius\"; A = 1.0; ER = 0.0; source = \"X\"; "
    "},\n"
    "  { id = \"b\"; eq = \"HO2 + O3 -> OH + 2 O2\"; law = \"arrhenius\"; A = 1.0; ER = 0.0; source = \"X\"; "
    "},\n"
    "  { id = \"c\"; eq = \"HO2 + NO -> OH + NO2\"; law = \"arrhenius\"; A = 1.0; ER = 0.0; source = \"X\"; "
    "},\n"
    "  { id = \"d\"; eq = \"HO2 + ClO -> HOCl + O2\"; law = \"arrhenius\"; A = 1.0; ER = 0.0; source = "
    "\"X\"; "
    "},\n"
    "  { id = \"e\"; eq = \"NO2 + O -> NO + O2\"; law = \"arrhenius\"; A = 1.0; ER = 0.0; source = \"X\"; "
    "},\n"
    "  { id = \"f\"; eq = \"NO2 + OH + M -> HNO3 + M\"; law = \"termolecular\"; A = 1.0; ER = 0.0; source = "
    "\"X\"; } );\n"
    "photolysis = (\n"
    "  { id = \"g\"; eq = \"O2 + hv -> 2 O\"; special = \"O2\"; source = \"X\"; },\n"
    "  { id = \"h\"; eq = \"HOCl + hv -> OH + Cl\"; xs = \"HOCl\"; phi = 1.0; source = \"X\"; } );\n";

/* Ten OH + O3 make ten HO2: 4 of them meet NO, 5 O3, 1 ClO. So 4 of the ten undo the 4 that HO2 + NO gives,
 * 5 count for HOx and 1 for ClOx. */
static void test_by_hand(void **state)
{
    static const double rates[] = {10, 5, 4, 1, 100, 5, 80, 1}; /* of a to h */
    static const double want[BUDGET_TERMS] = {160, 0, 0, 0, 10, 200, 2, 0, 0};
    char path[300];
    Mechanism *mechanism;
    Grid grid = {.layers = 1, .padded = 8};
    Fault fault = {0};
    write_file(state, "small.cfg", small, path);
    ok(mechanism_read(&mechanism, path, &fault), &fault);
    assert_int_equal(mechanism->reactions, 8);
    OxBook *book = book_of(mechanism);
    double *rate = zeros(8, 8), *term = zeros(BUDGET_TERMS, 8), *net = zeros(1, 8),
           *chain = zeros(BUDGET_TERMS, 8);
    for (int r = 0; r < 8; r++) {
        rate[FIELD(8, r, 0)] = rates[r];
        rate[FIELD(8, r, 1)] = rates[r] * (r == 2 ? 0.0 : 1.0); /* no HO2 + NO: its four go nowhere */
    }
    budget_odd_oxygen(book, &grid, rate, term, net);
    for (int t = 0; t < BUDGET_TERMS; t++)
        if (fabs(term[FIELD(8, t, 0)] - want[t]) > 1e-12)
            fail_msg("%s: %.15g, want %g", budget_term_name(t), term[FIELD(8, t, 0)], want[t]);
    check_near(net[0], 160.0 - 10.0 - 200.0 - 2.0, 1e-14);
    /* all ten of a charged, 5 : 1 */
    check_near(term[FIELD(8, BUDGET_HOX, 1)], 5.0 + 10.0 * 5.0 / 6.0, 1e-14);
    check_near(term[FIELD(8, BUDGET_CLOX, 1)], 1.0 + 10.0 / 6.0, 1e-14);
    assert_true(term[FIELD(8, BUDGET_OXIDATION, 1)] == 0.0);
    /* chains: NOx 100 pairs to 5 NO2 lost; ClOx 1 pair to 1 ClO; HOx 5 pairs to 5 OH and 1 HO2 */
    budget_chain_lengths(book, &grid, rate, term, chain);
    check_near(chain[FIELD(8, BUDGET_NOX, 0)], 20.0, 1e-14);
    check_near(chain[FIELD(8, BUDGET_CLOX, 0)], 1.0, 1e-14);
    check_near(chain[FIELD(8, BUDGET_HOX, 0)], 5.0 / 6.0, 1e-14);
    assert_true(isnan(chain[FIELD(8, BUDGET_BROX, 0)]) && isnan(chain[FIELD(8, BUDGET_OX, 0)]));
    free(rate);
    free(term);
    free(net);
    free(chain);
    ox_book_free(book);
    mechanism_free(mechanism);
}

/* Without O3 or the photolysis of O2 there is nothing to account for, and the message says where. */
static void test_refused(void **state)
{
    static const struct {
        const char *cut, *with, *said;
    } cases[] = {{"special = \"O2\"", "xs = \"O2\"; phi = 1.0", "no photolysis of O2"}};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        char path[300], text[sizeof small + 100];
        const char *at = strstr(small, cases[i].cut);
        assert_non_null(at);
        snprintf(text, sizeof text, "%.*s%s%s", (int)(at - small), small, cases[i].with,
                 at + strlen(cases[i].cut));
        write_file(state, "cut.cfg", text, path);
        Mechanism *mechanism;
        OxBook *book;
        Fault fault = {0};
        ok(mechanism_read(&mechanism, path, &fault), &fault);
        assert_int_equal(ox_book_make(&book, mechanism, &fault), FAULT_INPUT);
        assert_null(book);
        check_fault(&fault, "cut.cfg", cases[i].said, NULL);
        mechanism_free(mechanism);
    }
}

/* ---- books ---- */

/* Net source of Ox in a layer, per cm3 of the base atmosphere, by the kernel's own lists of what feeds what.
 */
static double kernel_source(const Run *run, const OxBook *book, const double *coefficient,
                            const double *factor, int layer)
{
    const Kernel *kernel = run->model->kernel;
    int padded = run->model->grid.padded;
    double net = 0.0;
    for (int s = 0; s < run->model->mechanism->solved; s++)
        for (int e = kernel->source_first[s]; e < kernel->source_first[s + 1]; e++) {
            int r = kernel->source_reaction[e];
            double w = coefficient[FIELD(padded, r, layer)] * factor[FIELD(padded, r, layer)];
            for (int i = 0; i < 3; i++)
                if (kernel->reactant[3 * r + i] < kernel->species)
                    w *= run->column->x[FIELD(padded, kernel->reactant[3 * r + i], layer)] *
                         stepper_conditions(run->stepper)->air[layer];
            net += book->content[s] * kernel->source_weight[e] * w;
        }
    return net * run->model->air.number_density[layer] / stepper_conditions(run->stepper)->air[layer];
}

/* On a state far from balance, so that nothing cancels by itself. Terms and net are sums over the same
 * reactions: 1e-12 of the terms. In the kernel's sum also O + O2 + M and the photolysis of ozone stand, which
 * cancel: 100 units in the last place of all rates. */
static void test_books_close(void **state)
{
    (void)state;
    Settings settings = coarse(4.0);
    Run run = start(&settings, 1);
    advance(&run, 10.0, 3, 1);
    const Model *model = run.model;
    int padded = model->grid.padded;
    OxBook *book = book_of(model->mechanism);
    double *rate = zeros((size_t)model->mechanism->reactions, padded), *term = zeros(BUDGET_TERMS, padded),
           *net = zeros(1, padded);
    budget_step_rates(model, run.stepper, run.column->x, rate);
    budget_odd_oxygen(book, &model->grid, rate, term, net);
    for (int l = 0; l < model->grid.layers; l++) {
        double terms = 0.0, sum = 0.0, rates = 0.0;
        for (int t = 0; t < BUDGET_TERMS; t++) {
            terms += fabs(term[FIELD(padded, t, l)]);
            sum += t < BUDGET_LOSS_FIRST ? term[FIELD(padded, t, l)] : -term[FIELD(padded, t, l)];
        }
        for (int r = 0; r < model->mechanism->reactions; r++)
            rates += fabs(rate[FIELD(padded, r, l)]);
        double kernel =
            kernel_source(&run, book, stepper_coefficients(run.stepper), stepper_day(run.stepper)->factor, l);
        assert_true(terms > 0.0);
        if (!(fabs(sum - net[l]) <= 1e-12 * terms) || !(fabs(kernel - net[l]) <= 100.0 * DBL_EPSILON * rates))
            fail_msg("layer %d: terms %.15g, net %.15g, kernel %.15g", l, sum, net[l], kernel);
        /* and the bound on the kernel's sum is a bound: below a thousandth of the terms */
        if (1e-5 * model->grid.middle[l] > settings.tropopause_km)
            assert_true(100.0 * DBL_EPSILON * rates < 1e-3 * terms);
    }
    free(rate);
    free(term);
    free(net);
    ox_book_free(book);
    end(&run);
}

/* In explicit days the rates are those the solver integrated: the same books, and photolysis of O2 as the
 * mean light gives it (O2 does not vary through the day: 1e-3 for the solver's own error). */
static void test_explicit_days(void **state)
{
    (void)state;
    Settings settings = coarse(4.0);
    settings.day = DAY_EXPLICIT;
    Run run = start(&settings, 1);
    advance(&run, 1.0, 3, 1);
    const Model *model = run.model;
    int padded = model->grid.padded, oxygen = reaction(model->mechanism, "J-O2");
    double *rate = zeros((size_t)model->mechanism->reactions, padded);
    budget_step_rates(model, run.stepper, stepper_mean(run.stepper), rate);
    for (int l = 0; l < model->grid.layers; l++)
        if (stepper_coefficients(run.stepper)[FIELD(padded, oxygen, l)] > 1.0)
            check_near(rate[FIELD(padded, oxygen, l)],
                       stepper_coefficients(run.stepper)[FIELD(padded, oxygen, l)] *
                           model->air.number_density[l] / stepper_conditions(run.stepper)->air[l],
                       1e-3);
    free(rate);
    end(&run);
}

/* ---- shares, atoms ---- */

static void test_members(void **state)
{
    (void)state;
    static const struct {
        int total;
        const char *names;
    } rows[] = {{TOTAL_HOX, " H 1 OH 1 HO2 1"},
                {TOTAL_NOY, " N 1 NO 1 NO2 1 NO3 1 N2O5 2 HNO3 1 HO2NO2 1 ClONO2 1 BrONO2 1"},
                {TOTAL_CLY, " Cl 1 Cl2 2 ClO 1 OClO 1 ClOO 1 Cl2O2 2 HCl 1 HOCl 1 ClONO2 1 BrCl 1"},
                {TOTAL_BRY, " Br 1 Br2 2 BrO 1 HBr 1 HOBr 1 BrONO2 1 BrCl 1"}};
    Settings settings = coarse(4.0);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    const Mechanism *mechanism = model->mechanism;
    double sum[SETTINGS_MAX_EDGES];
    advance(&run, 10.0, 2, 1);
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        char text[300] = "";
        size_t used = 0;
        budget_total(model, run.column->x, rows[i].total, sum);
        for (int s = 0; s < mechanism->solved; s++) {
            int atoms = budget_member(mechanism, rows[i].total, s);
            if (atoms)
                used += (size_t)snprintf(text + used, sizeof text - used, " %s %d",
                                         mechanism_name(mechanism, s), atoms);
        }
        assert_string_equal(text, rows[i].names);
        for (int l = 0; l < model->grid.layers; l++) { /* shares sum to one */
            double shares = 0.0;
            for (int s = 0; s < mechanism->solved; s++)
                shares += budget_member(mechanism, rows[i].total, s) *
                          run.column->x[FIELD(model->grid.padded, s, l)] / sum[l];
            check_near(shares, 1.0, 1e-14);
        }
    }
    /* what is not in source gases is in the family */
    static const struct {
        const char *element;
        int total;
    } pairs[] = {{"N", TOTAL_NOY}, {"Cl", TOTAL_CLY}, {"Br", TOTAL_BRY}};
    for (size_t i = 0; i < 3; i++) {
        int element = mechanism_element(mechanism, pairs[i].element);
        double all, sources, family = 0.0;
        budget_atoms(model, run.column->x, element, &all, &sources);
        check_near(all, column_atoms(model, run.column->x, element), 1e-14);
        budget_total(model, run.column->x, pairs[i].total, sum);
        for (int l = 0; l < model->grid.layers; l++)
            family += sum[l] * model->air.number_density[l] * model->grid.depth[l];
        assert_true(family > 0.0);
        /* NOy is 2e-3 of all N: twelve digits of all, nine of it */
        check_near(all - sources, family, 1e-9);
    }
    end(&run);
}

/* ---- lifetimes ---- */

/* A gas photolysed at 1e-9 s-1 everywhere lives 1e9 s; as much again by O(1D) halves it; loss that stands
 * below the tropopause only is none of the stratosphere's. */
static void test_lifetime(void **state)
{
    (void)state;
    Settings settings = coarse(4.0);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    const Mechanism *mechanism = model->mechanism;
    const double *x = run.column->x;
    int padded = model->grid.padded, gas = solved(model, "CFC-11"), ozone = solved(model, "O3");
    int light = reaction(mechanism, "J-CFC-11"), excited = reaction(mechanism, "O1D+CFC-11");
    double *rate = zeros((size_t)mechanism->reactions, padded), aloft = 0.0;
    GasBudget budget;
    for (int l = 0; l < model->grid.layers; l++) {
        double n = x[FIELD(padded, gas, l)] * model->air.number_density[l];
        rate[FIELD(padded, light, l)] = 1e-9 * n;
        if (1e-5 * model->grid.middle[l] < settings.tropopause_km)
            rate[FIELD(padded, excited, l)] = 1e-9 * n;
        else
            aloft += n * model->grid.depth[l];
    }
    budget_gas(model, x, rate, gas, 1, &budget);
    check_near(budget_lifetime(&budget, &budget.loss[LOSS_PHOTOLYSIS], 1), 1e9 / YEAR_SECONDS, 1e-13);
    assert_true(budget.aloft[LOSS_O1D] == 0.0 && budget.loss[LOSS_OH] == 0.0);
    check_near(budget.aloft[LOSS_PHOTOLYSIS], 1e-9 * aloft, 1e-13);
    double below = budget.burden - aloft;
    check_near(budget_lifetime(&budget, budget.loss, GAS_LOSSES),
               1e9 / YEAR_SECONDS * budget.burden / (budget.burden + below), 1e-13);
    check_near(budget_lifetime(&budget, budget.aloft, GAS_LOSSES), 1e9 / YEAR_SECONDS * budget.burden / aloft,
               1e-13);
    assert_true(isinf(budget_lifetime(&budget, &budget.loss[LOSS_CL], 1)));
    assert_true(budget_is_source(model, gas) && !budget_is_source(model, ozone));
    /* deposition: velocity times number density at the ground */
    assert_int_equal(model->surface_kind[ozone], SURFACE_DEPOSITION);
    budget_gas(model, x, rate, ozone, 0, &budget);
    check_near(budget.loss[LOSS_GROUND],
               model->surface_value[ozone] * x[FIELD(padded, ozone, 0)] * model->air.number_density[0],
               1e-14);
    free(rate);
    end(&run);
}

/* ---- slopes ---- */

static void test_slope(void **state)
{
    (void)state;
    Settings settings = coarse(2.0);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    double x[SETTINGS_MAX_EDGES], y[SETTINGS_MAX_EDGES], slope;
    for (int l = 0; l < model->grid.layers; l++) {
        x[l] = 320e-9 * exp(-0.1 * l);
        /* a line above the tropopause, something else below that must not be looked at */
        y[l] = 1e-5 * model->grid.middle[l] >= settings.tropopause_km ? 21e-9 - 0.07 * x[l] : 1.0;
    }
    int layers = budget_slope(model, x, y, 100e-9, 300e-9, &slope);
    assert_in_range(layers, 3, 10);
    check_near(slope, -0.07, 1e-11);
    assert_int_equal(budget_slope(model, x, y, 170e-9, 171e-9, &slope) < 3, 1);
    assert_true(isnan(slope));
    check_near(budget_at_km(model, x, 21.0), x[10], 1e-14); /* middles lie at 1, 3, ... km */
    check_near(budget_at_km(model, x, 22.0), 0.5 * (x[10] + x[11]), 1e-14);
    end(&run);
}

/* ---- the published order ---- */

static double share(const Model *model, const double *term, int family, double km)
{
    double all = 0.0;
    for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++)
        all += budget_at_km(model, term + FIELD(model->grid.padded, t, 0), km);
    return budget_at_km(model, term + FIELD(model->grid.padded, family, 0), km) / all;
}

/* Who leads in the loss of odd oxygen: HOx below some 21 km (Wennberg et al. 1994, Science 266, 398), NOx
 * from 24 to 38 km, HOx above 45 km (Osterman et al. 1997, Geophys. Res. Lett. 24, 1107), chlorine at its
 * most near 40 km, a fifth to a third of all (the same; WMO 1999), more than nine tenths HOx at 60 to 70 km
 * (Brasseur and Solomon 2005, chapter 5). All from memory, so only the order and wide ranges are asked, of
 * the coarse column at rest. */
static void test_order(void **state)
{
    (void)state;
    Settings settings = coarse(2.0);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    Fault fault = {0};
    run.column->time = 2000.5;
    ok(projection_settle(model, run.stepper, run.column, &fault), &fault);
    int padded = model->grid.padded;
    OxBook *book = book_of(model->mechanism);
    double *rate = zeros((size_t)model->mechanism->reactions, padded), *term = zeros(BUDGET_TERMS, padded),
           *net = zeros(1, padded);
    budget_step_rates(model, run.stepper, run.column->x, rate);
    budget_odd_oxygen(book, &model->grid, rate, term, net);
    static const struct {
        double km;
        int leader;
    } leads[] = {{15, BUDGET_HOX}, {20, BUDGET_HOX}, {30, BUDGET_NOX}, {36, BUDGET_NOX},
                 {48, BUDGET_HOX}, {50, BUDGET_HOX}, {60, BUDGET_HOX}};
    for (size_t i = 0; i < sizeof leads / sizeof leads[0]; i++)
        for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++)
            if (t != leads[i].leader &&
                share(model, term, t, leads[i].km) >= share(model, term, leads[i].leader, leads[i].km))
                fail_msg("%g km: %s before %s", leads[i].km, budget_term_name(t),
                         budget_term_name(leads[i].leader));
    assert_true(share(model, term, BUDGET_NOX, 32.0) > 0.5);
    assert_true(share(model, term, BUDGET_HOX, 65.0) > 0.9);
    double clox = share(model, term, BUDGET_CLOX, 41.0);
    assert_true(clox > 0.15 && clox < 0.35);
    assert_true(clox > share(model, term, BUDGET_CLOX, 30.0) && clox > share(model, term, BUDGET_CLOX, 50.0));
    /* all other production is a correction (most of it OH + HNO3; 2.5 % at 20 km when this was written);
     * ozone is in balance with its light at 45 km, where it lives a day, but for what diffusion carries */
    for (double km = 20.0; km <= 60.0; km += 2.0) {
        double at[3];
        for (int t = 0; t < 3; t++)
            at[t] = budget_at_km(model, term + FIELD(padded, t, 0), km);
        if (!(at[BUDGET_OTHER] < 0.04 * (at[0] + at[1] + at[2])) || !(at[BUDGET_OTHER] > 0.0))
            fail_msg("%g km: other production %g of %g", km, at[BUDGET_OTHER], at[0] + at[1] + at[2]);
    }
    double gives = budget_at_km(model, net, 45.0) / budget_at_km(model, term, 45.0);
    print_message("   net source at 45 km: %.2f %% of the production\n", 100.0 * gives);
    assert_true(fabs(gives) < 0.03);
    free(rate);
    free(term);
    free(net);
    ox_book_free(book);
    end(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_weights),
        WITH_FOLDER(test_by_hand),
        WITH_FOLDER(test_refused),
        cmocka_unit_test(test_books_close),
        cmocka_unit_test(test_explicit_days),
        cmocka_unit_test(test_members),
        cmocka_unit_test(test_lifetime),
        cmocka_unit_test(test_slope),
        cmocka_unit_test(test_order),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
