/* Tests of the mechanism file and its rate coefficients.
 * Published values are typed from memory unless they are worked out here. Run from the project's folder;
 * SKYMEND_DATA overrides the place of the data. */
#define _XOPEN_SOURCE 700 /* mkdtemp, popen */
#include "scratch.h"

#include "../chem/equation.h"
#include "../chem/mechanism.h"
#include "../chem/rates.h"
#include "../input/constants.h"
#include "../input/table.h"

static void mechanism_path(char *path)
{
    snprintf(path, 300, "%s/mechanism.cfg", data_dir());
}

static Mechanism *read_path(const char *path)
{
    Mechanism *mechanism = NULL;
    Fault fault = {0};
    if (mechanism_read(&mechanism, path, &fault))
        fail_msg("%s", fault.text);
    assert_non_null(mechanism);
    return mechanism;
}

static Mechanism *read_default(void)
{
    char path[300];
    mechanism_path(path);
    return read_path(path);
}

static const Reaction *named(const Mechanism *mechanism, const char *id)
{
    for (int r = 0; r < mechanism->reactions; r++)
        if (strcmp(mechanism->reaction[r].id, id) == 0)
            return &mechanism->reaction[r];
    fail_msg("no reaction %s", id);
    return NULL;
}

static int index_of(const Mechanism *mechanism, const char *id)
{
    return (int)(named(mechanism, id) - mechanism->reaction);
}

static double change_of(const Mechanism *mechanism, const char *id, const char *name)
{
    const Reaction *reaction = named(mechanism, id);
    int solved = mechanism_solved(mechanism, name);
    assert_true(solved >= 0);
    for (int c = 0; c < reaction->changes; c++)
        if (reaction->changed[c] == solved)
            return reaction->change[c];
    return 0.0;
}

/* The default file with the first old replaced by new; *line is the line where the change starts. */
static void write_variant(void **state, const char *old, const char *new, char *path, int *line)
{
    char original[300], *text;
    Fault fault = {0};
    mechanism_path(original);
    if (table_text(original, &text, NULL, &fault))
        fail_msg("%s", fault.text);
    char *at = strstr(text, old);
    if (!at)
        fail_msg("\"%s\" no longer stands in the mechanism: renew the test", old);
    *line = 1;
    for (const char *p = text; p < at; p++)
        *line += *p == '\n';
    snprintf(path, 300, "%s/variant.cfg", (char *)*state);
    FILE *out = fopen(path, "w");
    assert_non_null(out);
    fprintf(out, "%.*s%s%s", (int)(at - text), text, new, at + strlen(old));
    assert_int_equal(fclose(out), 0);
    free(text);
}

/* ---- the default file ---- */

static void structure_is_as_written(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    assert_string_equal(m->title, "Skymend stratospheric mechanism");
    assert_non_null(strstr(m->citations, "JPL Publication 19-5"));
    assert_int_equal(m->elements, 7);
    assert_int_equal(m->thermal_first, 0);
    for (int r = 0; r < m->reactions; r++) {
        int kind = r < m->photolysis_first ? REACTION_THERMAL
                   : r < m->surface_first  ? REACTION_PHOTOLYSIS
                   : r < m->washout_first  ? REACTION_SURFACE
                                           : REACTION_WASHOUT;
        assert_int_equal(m->reaction[r].kind, kind);
        assert_int_equal(m->reaction[r].law == LAW_NONE, kind != REACTION_THERMAL);
    }
    int washed = 0;
    for (int s = 0; s < m->species; s++) {
        const Species *species = &m->item[s];
        washed += species->washout > 0;
        assert_int_equal(species->solved >= 0, species->role == ROLE_ACTIVE);
        if (species->solved >= 0) {
            assert_int_equal(m->solved_item[species->solved], s);
            assert_string_equal(mechanism_name(m, species->solved), species->name);
            assert_int_equal(mechanism_solved(m, species->name), species->solved);
        }
    }
    assert_int_equal(m->reactions - m->washout_first, washed);
    assert_int_equal(mechanism_solved(m, "N2"), -1);
    assert_int_equal(mechanism_solved(m, "no such gas"), -1);
    assert_int_equal(mechanism_element(m, "Xe"), -1);
    assert_int_equal(mechanism_atoms(m, mechanism_solved(m, "CFC-113"), mechanism_element(m, "Cl")), 3);
    assert_int_equal(mechanism_atoms(m, mechanism_solved(m, "ClONO2"), mechanism_element(m, "O")), 3);
    assert_int_equal(m->item[equation_species(m, "ClOO")].transport, 0);
    assert_int_equal(m->item[equation_species(m, "O3")].transport, 1);
    /* from the atomic weights H 1.008, C 12.011, O 15.999, F 18.998, Cl 35.45, Br 79.904 (IUPAC) */
    check_near(m->item[equation_species(m, "CFC-12")].molar_mass, 12.011 + 2 * 35.45 + 2 * 18.998, 1e-12);
    check_near(m->item[equation_species(m, "CH3Br")].molar_mass, 12.011 + 3 * 1.008 + 79.904, 1e-12);
    mechanism_free(m);
}

static void reactants_and_changes_follow_the_notation(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    const Reaction *r = named(m, "O+O2+M"); /* M and O2 fold into the coefficient */
    assert_int_equal(r->reactants, 1);
    assert_int_equal(r->fixed_order, 2);
    check_near(r->fixed_share, 0.20948, 1e-12);
    assert_int_equal(r->changes, 2);

    r = named(m, "ClO+ClO"); /* a repeated reactant is listed twice; (+M) is no reactant */
    assert_int_equal(r->reactants, 2);
    assert_int_equal(r->reactant[0], r->reactant[1]);
    assert_int_equal(r->fixed_order, 0);
    assert_true(change_of(m, "ClO+ClO", "ClO") == -2.0 && change_of(m, "ClO+ClO", "Cl2O2") == 1.0);
    assert_int_equal(named(m, "Cl2O2+M")->forward, r - m->reaction);

    r = named(m, "OH+CO-HOCO"); /* {+ O2} sets no rate */
    assert_int_equal(r->reactants, 2);
    assert_int_equal(r->fixed_order, 0);
    assert_int_equal(named(m, "H+O2")->fixed_order, 1);
    assert_int_equal(named(m, "O1D+CFC-11-quench")->changes, 2); /* the quencher itself does not change */
    assert_true(change_of(m, "NO2+NO3-NO", "NO2") == 0.0);

    r = named(m, "J-O2"); /* a fixed gas is photolysed: no solved reactant */
    assert_int_equal(r->reactants, 0);
    assert_int_equal(r->fixed_order, 1);
    assert_int_equal(r->special, SPECIAL_O2);
    r = named(m, "J-O3");
    assert_string_equal(r->spectrum, "O3");
    assert_string_equal(r->yield, "O3-O1D");
    assert_int_equal(r->yield_complement, 1);
    assert_int_equal(named(m, "J-O3-O1D")->yield_complement, 0);
    assert_true(named(m, "J-BrONO2-BrO")->phi == 0.15);
    assert_true(change_of(m, "J-CFC-113", "Cl") == 3.0);

    r = named(m, "het-N2O5-H2O"); /* water is consumed but sets no rate */
    assert_int_equal(r->reactants, 1);
    assert_true(change_of(m, "het-N2O5-H2O", "H2O") == -1.0 && r->gamma == 0.0);
    r = named(m, "nat-ClONO2-HCl"); /* the probability stands in the file, and HCl sets the rate */
    assert_true(r->reactants == 2 && r->gamma == 0.2 && r->surface_model == SURFACE_NAT_HCL);
    r = named(m, "het-ClONO2-HCl");
    assert_int_equal(r->reactants, 2);
    assert_int_equal(r->reactant[0], mechanism_solved(m, "ClONO2"));
    assert_int_equal(r->reactant[1], mechanism_solved(m, "HCl"));

    r = named(m, "washout-HNO3");
    assert_int_equal(r->reactants, 1);
    assert_int_equal(r->changes, 1);
    assert_true(r->changed[0] == r->reactant[0] && r->change[0] == -1.0);
    mechanism_free(m);
}

/* Atoms of a formula, counted letter by letter and not by formula_read. */
static void tally(const char *formula, double weight, double *atoms)
{
    static const char *const symbols[] = {"Cl", "Br", "H", "C", "N", "O", "F"};
    while (*formula) {
        int e = 0;
        while (strncmp(formula, symbols[e], strlen(symbols[e])) != 0)
            assert_true(++e < 7);
        formula += strlen(symbols[e]);
        int count = 0;
        for (; *formula >= '0' && *formula <= '9'; formula++)
            count = 10 * count + *formula - '0';
        atoms[e] += weight * (count ? count : 1);
    }
}

static void every_reaction_balances_by_another_count(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    for (int r = 0; r < m->washout_first; r++) {
        double atoms[7] = {0}, sign = 1.0, count = 1.0;
        char text[EQUATION_LENGTH + 1];
        strcpy(text, m->reaction[r].equation);
        for (char *p = text; *p; p++)
            if (*p == '{' || *p == '}')
                *p = ' ';
        for (char *word = strtok(text, " "); word; word = strtok(NULL, " ")) {
            if (strcmp(word, "->") == 0) {
                sign = -1.0;
            } else if (strspn(word, "0123456789.") == strlen(word)) {
                count = atof(word);
            } else if (strcmp(word, "+") != 0 && strcmp(word, "(+M)") != 0 && strcmp(word, "hv") != 0) {
                int s = 0;
                while (strcmp(m->item[s].name, word) != 0)
                    assert_true(++s < m->species);
                tally(m->item[s].formula, sign * count, atoms);
                count = 1.0;
            }
        }
        for (int e = 0; e < 7; e++)
            if (fabs(atoms[e]) > 1e-12)
                fail_msg("%s: %g atoms of kind %d appear", m->reaction[r].id, -atoms[e], e);
        /* N, Cl and Br enter no inert species, and N2 is the only fixed one with any: what is solved keeps
         * them */
        const char *kept[] = {"Cl", "Br"};
        for (int k = 0; k < 2; k++) {
            double sum = 0;
            for (int c = 0; c < m->reaction[r].changes; c++)
                sum += m->reaction[r].change[c] *
                       mechanism_atoms(m, m->reaction[r].changed[c], mechanism_element(m, kept[k]));
            assert_true(fabs(sum) < 1e-12);
        }
    }
    mechanism_free(m);
}

/* ---- rate coefficients ---- */

/* At 298 K: the column k(298 K) of JPL Publication 19-5, tables 1A to 1G and 2-1 (from memory, two digits).
 * At 220 K: worked out by hand from that edition's A and E/R. */
static void coefficients_match_the_evaluation(void **state)
{
    (void)state;
    static const struct {
        const char *id;
        double at_298, at_220;
    } published[] = {
        {"O+O2+M", 6.1e-34, 1.26e-33},   {"O+O3", 8.0e-15, 6.86e-16},
        {"O1D+N2", 3.1e-11, 3.54e-11},   {"O1D+O2", 3.95e-11, 4.24e-11},
        {"O1D+H2O", 2.0e-10, 2.14e-10},  {"H+O3", 2.9e-11, 1.65e-11},
        {"O+OH", 3.3e-11, 4.08e-11},     {"O+HO2", 5.9e-11, 7.45e-11},
        {"OH+O3", 7.3e-14, 2.37e-14},    {"OH+HO2", 1.1e-10, 1.50e-10},
        {"HO2+O3", 1.9e-15, 1.08e-15},   {"OH+CH4", 6.3e-15, 7.68e-16},
        {"CH3O2+NO", 7.7e-12, 1.09e-11}, {"NO+O3", 1.95e-14, 3.28e-15},
        {"NO+HO2", 8.1e-12, 1.12e-11},   {"NO2+O", 1.03e-11, 1.32e-11},
        {"NO2+O3", 3.2e-17, 1.75e-18},   {"Cl+O3", 1.2e-11, 9.27e-12},
        {"Cl+CH4", 1.0e-13, 2.21e-14},   {"ClO+O", 3.7e-11, 4.12e-11},
        {"ClO+NO", 1.7e-11, 2.39e-11},   {"ClO+HO2", 6.9e-12, 9.72e-12},
        {"HCl+OH", 7.8e-13, 5.78e-13},   {"Br+O3", 1.2e-12, 4.62e-13},
        {"BrO+HO2", 2.1e-11, 3.64e-11},  {"BrO+ClO-OClO", 6.0e-12, 1.16e-11},
        {"CH3Cl+OH", 3.5e-14, 8.38e-15}, {"CH2Cl2+OH", 1.0e-13, 3.52e-14},
        {"CHCl3+OH", 1.0e-13, 3.36e-14}, {"CH2Cl2+Cl", 3.5e-13, 1.18e-13},
        {"CHCl3+Cl", 1.2e-13, 3.67e-14},
    };
    Mechanism *m = read_default();
    for (size_t i = 0; i < sizeof published / sizeof *published; i++) {
        int r = index_of(m, published[i].id);
        check_near(rates_law(m, r, 298.0, 2.46e19, 0.0), published[i].at_298, 0.035);
        check_near(rates_law(m, r, 220.0, 1e17, 0.0), published[i].at_220, 0.005);
    }
    /* both channels of O(1D) + N2O 1.27e-10, CO + OH at 1 atm 2.4e-13 and without air 1.5e-13 (same source)
     */
    check_near(rates_law(m, index_of(m, "O1D+N2O-NO"), 298.0, 1e17, 0.0), 1.27e-10, 0.01);
    check_near(named(m, "O1D+N2O-NO")->branch + named(m, "O1D+N2O-N2")->branch, 1.0, 1e-12);
    int association = index_of(m, "OH+CO-HOCO"), direct = index_of(m, "OH+CO-H");
    check_near(rates_law(m, association, 298.0, 2.46e19, 0.0) + rates_law(m, direct, 298.0, 2.46e19, 0.0),
               2.4e-13, 0.1);
    check_near(rates_law(m, direct, 298.0, 0.0, 0.0), 1.5e-13, 0.02);
    /* HO2 + HO2 at 1 atm, dry: 1.4e-12 + 4.6e-32 [M]; wet air of 1e17 cm-3 adds 1.4e-21 exp(2200/T) [H2O] */
    int ho2 = index_of(m, "HO2+HO2");
    double dry = rates_law(m, ho2, 298.0, 2.46e19, 0.0);
    check_near(dry, 1.4e-12 + 4.6e-32 * 2.46e19, 0.01);
    check_near(rates_law(m, ho2, 298.0, 2.46e19, 1e17) / dry - 1.0, 1.4e-21 * exp(2200.0 / 298.0) * 1e17,
               1e-6);
    mechanism_free(m);
}

/* k0 [M] without and ki with much air; where the limits meet, a half times 0.6; growth in between. */
static void falloff_has_its_limits(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    for (int r = 0; r < m->photolysis_first; r++) {
        if (m->reaction[r].law != LAW_FALLOFF)
            continue;
        const double *p = m->reaction[r].parameter, t = 220.0;
        double k0 = p[0] * pow(t / 298.0, -p[1]), ki = p[2] * pow(t / 298.0, -p[3]);
        /* log10 of the ratio is -30 or 30 there, so 0.6^(1/901) is left of the broadening */
        check_near(rates_law(m, r, t, 1e-30 * ki / k0, 0.0), 1e-30 * ki, 1e-3);
        check_near(rates_law(m, r, t, 1e30 * ki / k0, 0.0), ki, 1e-3);
        check_near(rates_law(m, r, t, ki / k0, 0.0), 0.3 * ki, 1e-12);
        assert_true(rates_law(m, r, t, 0.0, 0.0) == 0.0);
        double before = 0.0;
        for (double air = 1e12; air < 1e21; air *= 3.0) {
            double k = rates_law(m, r, t, air, 0.0);
            assert_true(k > before);
            before = k;
        }
    }
    int direct = index_of(m, "HNO3+OH-direct");
    check_near(rates_law(m, direct, 220.0, 0.0, 0.0), 3.7e-14 * exp(240.0 / 220.0), 1e-12);
    assert_true(rates_law(m, direct, 220.0, 1e30, 0.0) < 0.01 * 3.7e-14);
    mechanism_free(m);
}

static void decomposition_follows_from_equilibrium(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    for (double t = 190.0; t < 310.0; t += 30.0) {
        double forward = rates_law(m, index_of(m, "NO2+NO3"), t, 1e18, 0.0);
        double reverse = rates_law(m, index_of(m, "N2O5+M"), t, 1e18, 0.0);
        check_near(forward / reverse, 5.8e-27 * exp(10840.0 / t), 1e-12);
    }
    /* first-order decomposition at 298 K and 1 atm: N2O5 0.05 s-1, HO2NO2 0.08 s-1 (IUPAC evaluation, from
     * memory; a factor of 2 covers the difference between evaluations) */
    double n2o5 = rates_law(m, index_of(m, "N2O5+M"), 298.0, 2.46e19, 0.0);
    double ho2no2 = rates_law(m, index_of(m, "HO2NO2+M"), 298.0, 2.46e19, 0.0);
    assert_in_range(1000 * n2o5, 25, 100);
    assert_in_range(1000 * ho2no2, 40, 160);
    mechanism_free(m);
}

/* A channel that takes half of an association is also half of what falls apart. */
static void decomposition_keeps_the_branch(void **state)
{
    char path[300];
    int line;
    write_variant(state, "k0 = 1.9e-31;", "k0 = 1.9e-31; branch = 0.5;", path, &line);
    Mechanism *m = read_default(), *half = read_path(path);
    int r = index_of(m, "HO2NO2+M");
    check_near(rates_law(half, r, 250.0, 1e18, 0.0), 0.5 * rates_law(m, r, 250.0, 1e18, 0.0), 1e-14);
    mechanism_free(half);
    mechanism_free(m);
}

/* The whole file, read and evaluated by a program that shares no line with this one. */
static void another_reader_agrees(void **state)
{
    (void)state;
    static const double points[3][3] = {{298.0, 2.46e19, 4e17}, {220.0, 1e17, 5e11}, {250.0, 3e18, 0.0}};
    Mechanism *m = read_default();
    for (int point = 0; point < 3; point++) {
        const double *p = points[point];
        char command[600], line[400];
        snprintf(
            command, sizeof command,
            "python3 scripts/check_mechanism.py %s/mechanism.cfg --temperature %g --density %g --water %g",
            data_dir(), p[0], p[1], p[2]);
        FILE *in = popen(command, "r");
        assert_non_null(in);
        int compared = 0, seen[7] = {0};
        while (fgets(line, sizeof line, in)) {
            char id[48];
            double k;
            sscanf(line, "%d species (%d active, %d fixed, %d inert); %d thermal, %d photolysis, %d surface",
                   &seen[0], &seen[1], &seen[2], &seen[3], &seen[4], &seen[5], &seen[6]);
            if (!strstr(line, "->") || sscanf(line, "%47s %lf", id, &k) != 2)
                continue;
            int r = index_of(m, id);
            check_near(rates_law(m, r, p[0], p[1], p[2]) * m->reaction[r].branch, k,
                       5.1e-4); /* four digits printed */
            compared++;
        }
        assert_int_equal(pclose(in), 0);
        assert_int_equal(compared, m->photolysis_first);
        assert_int_equal(seen[0], m->species);
        assert_int_equal(seen[1], m->solved);
        assert_int_equal(seen[4], m->photolysis_first);
        assert_int_equal(seen[5], m->surface_first - m->photolysis_first);
        assert_int_equal(seen[6], m->washout_first - m->surface_first);
    }
    mechanism_free(m);
}

static void layers_fold_in_fixed_gases(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    double temperature[2 * PACK], air[2 * PACK], water[2 * PACK], washout[2 * PACK];
    int padded = 2 * PACK;
    for (int i = 0; i < padded; i++) {
        temperature[i] = 190.0 + 7.0 * i;
        air[i] = 2.4e19 * exp(-0.7 * i);
        water[i] = 1e-4 * air[i];
        washout[i] = 1e-6 * (padded - i);
    }
    size_t room = (size_t)m->reactions * (size_t)padded;
    double *k = malloc(room * sizeof *k);
    assert_non_null(k);
    for (size_t i = 0; i < room; i++)
        k[i] = -1.0;
    rates_thermal(m, padded, temperature, air, water, 0, k);
    for (int r = 0; r < m->reactions; r++)
        for (int i = 0; i < padded; i++) {
            const Reaction *reaction = &m->reaction[r];
            double want = -1.0; /* other kinds are not touched */
            if (reaction->kind == REACTION_THERMAL)
                want = rates_law(m, r, temperature[i], air[i], water[i]) * reaction->branch *
                       reaction->fixed_share * pow(air[i], reaction->fixed_order);
            check_near(k[r * padded + i], want, 1e-13);
        }
    /* written out for one: 6.1e-34 (T/298)^-2.4 0.20948 M^2 */
    check_near(k[index_of(m, "O+O2+M") * padded + 3],
               6.1e-34 * pow(211.0 / 298.0, -2.4) * 0.20948 * air[3] * air[3], 1e-12);

    for (int i = 0; i < padded; i++)
        water[i] *= 2.0;
    for (size_t i = 0; i < room; i++)
        k[i] = -1.0;
    rates_thermal(m, padded, temperature, air, water, 1, k);
    rates_washout(m, padded, washout, k);
    for (int r = 0; r < m->reactions; r++)
        for (int i = 0; i < padded; i++) {
            double want = -1.0;
            if (m->reaction[r].law == LAW_HO2_HO2)
                want = rates_law(m, r, temperature[i], air[i], water[i]);
            if (m->reaction[r].kind == REACTION_WASHOUT)
                want = m->item[m->solved_item[m->reaction[r].reactant[0]]].washout * washout[i];
            check_near(k[r * padded + i], want, 1e-13);
        }
    free(k);
    mechanism_free(m);
}

/* ---- changing the file ---- */

static void a_gas_is_added_without_recompiling(void **state)
{
    char path[300], *text, original[300];
    Fault fault = {0};
    mechanism_path(original);
    if (table_text(original, &text, NULL, &fault))
        fail_msg("%s", fault.text);
    /* carbonyl sulfide: a new element, two species, every law the default file does not use, decimal products
     */
    static const struct {
        const char *at, *added;
    } additions[] = {
        {"elements = [ ", "\"S\", "},
        {"species = (",
         "{ name = \"OCS\"; formula = \"OCS\"; }, { name = \"SO2\"; formula = \"SO2\"; washout = 1; },"},
        {"thermal = (",
         "{ id = \"OCS+O\"; eq = \"O + OCS {+ 0.5 O2} -> CO + 1.0 SO2\"; law = \"sum2\"; A1 = 2.1e-11;"
         "  ER1 = 2200; A2 = 1e-16; ER2 = 0.0; },\n"
         "{ id = \"old HNO3\"; eq = \"OH + HNO3 -> NO3 + H2O\"; law = \"OH+HNO3\"; AA = 2.4e-14;"
         "  ERA = -460.0; AB = 6.5e-34; ERB = -1335.0; AC = 2.7e-17; ERC = -2199.0; },\n"
         "{ id = \"300 K\"; eq = \"OCS + OH + M {+ 0.5 O2} -> CO + SO2 + H + M\"; law = \"termolecular\";"
         "  A = 1e-30; ER = 0.0; n = 2.0; Tref = 300.0; },"},
        {"photolysis = (",
         "{ id = \"J-OCS\"; eq = \"OCS + hv {+ O2} -> CO + SO2\"; xs = \"OCS\"; phi = 1; },"},
    };
    snprintf(path, sizeof path, "%s/more.cfg", (char *)*state);
    FILE *out = fopen(path, "w");
    assert_non_null(out);
    const char *from = text;
    for (size_t a = 0; a < sizeof additions / sizeof *additions; a++) {
        const char *to = strstr(from, additions[a].at);
        assert_non_null(to);
        to += strlen(additions[a].at);
        fprintf(out, "%.*s%s", (int)(to - from), from, additions[a].added);
        from = to;
    }
    fputs(from, out);
    assert_int_equal(fclose(out), 0);
    free(text);

    Mechanism *m = read_path(path);
    Mechanism *plain = read_default();
    assert_int_equal(m->species, plain->species + 2);
    assert_int_equal(m->solved, plain->solved + 2);
    assert_int_equal(m->reactions, plain->reactions + 5); /* three thermal, one photolysis, one washout */
    check_near(m->item[equation_species(m, "OCS")].molar_mass, 15.999 + 12.011 + 32.06, 1e-12);
    check_near(rates_law(m, index_of(m, "OCS+O"), 298.0, 1e19, 0.0), 2.1e-11 * exp(-2200.0 / 298.0) + 1e-16,
               1e-12);
    /* 1.5e-13 at 298 K and 1 atm: JPL 15-10, table 1C (from memory) */
    check_near(rates_law(m, index_of(m, "old HNO3"), 298.0, 2.46e19, 0.0), 1.5e-13, 0.05);
    check_near(rates_law(m, index_of(m, "300 K"), 200.0, 1e19, 0.0), 1e-30 * 2.25, 1e-12);
    assert_int_equal(mechanism_element(m, "S"), 0);
    assert_true(change_of(m, "OCS+O", "SO2") == 1.0);
    mechanism_free(plain);
    mechanism_free(m);
}

/* ---- faults ---- */

typedef struct {
    const char *old, *new;
    int lines; /* the fault stands this many lines after the start of old */
    const char *piece[3];
} Slip;

#define OZONE "{ id = \"O+O3\"; eq = \"O + O3 -> 2 O2\"; law = \"arrhenius\"; A = 8.0e-12; ER = 2060.0;"
#define OZONE_EQ "eq = \"O + O3 -> 2 O2\""
#define LONG_TEXT                                                                                            \
    "O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + O + "

static const Slip slips[] = {
    /* unknown keys, in every group */
    {"title =", "titel =", 0, {"unknown key titel", "did you mean title?"}},
    {"{ key = \"JPL19\";", "{ key = \"JPL19\"; pages = 3;", 0, {"source", "unknown key pages", "key, text"}},
    {"formula = \"H2O2\";",
     "formula = \"H2O2\"; washot = 0.9;",
     0,
     {"H2O2", "washot", "did you mean washout?"}},
    {OZONE, OZONE " brnch = 1.0;", 0, {"O+O3", "brnch", "did you mean branch?"}},
    {"phi = 1.0; f = 2.0;", "phi = 1.0; phy = 2.0;", 0, {"J-HO2", "phy", "phi"}},
    {"gamma = 0.1;", "gamma = 0.1; radius = 1.0;", 0, {"nat-HOCl-HCl", "unknown key radius", "gamma"}},
    /* wrong types */
    {"A = 8.0e-12;", "A = \"8.0e-12\";", 0, {"O+O3: A is text", "number"}},
    {"formula = \"H2O2\";", "formula = 34.0;", 0, {"H2O2: formula", "text in double quotes"}},
    {"formula = \"O\"; transport = false;",
     "formula = \"O\"; transport = 0;",
     0,
     {"transport", "true or false"}},
    {"law = \"arrhenius\"; A = 8.0e-12;", "law = 1; A = 8.0e-12;", 0, {"O+O3: law", "text"}},
    {"elements = [", "elements = 7; title2 = [", 0, {"title2"}},
    {"[ \"H\", \"C\", \"N\", \"O\", \"F\", \"Cl\", \"Br\" ]", "[ 1, 12 ]", 0, {"elements", "text"}},
    {"[ \"H\", \"C\",", "[ \"H\", \"Xx\",", 0, {"elements", "Xx"}},
    {"{ name = \"H2O\"; formula = \"H2O\"; }", "\"H2O\"", 0, {"species", "write a group"}},
    {"{ id = \"O+O3\";", "{ id = 3;", 0, {"id is a whole number", "text"}},
    /* given twice */
    {"{ name = \"H2\"; formula", "{ name = \"H\"; formula", 0, {"species H is given twice"}},
    {"{ id = \"O+O3\";", "{ id = \"O+O2+M\";", 0, {"O+O2+M", "given twice"}},
    {"{ id = \"J-O2\";", "{ id = \"O+O2+M\";", 0, {"O+O2+M", "given twice"}},
    {"{ key = \"IUPAC06\";", "{ key = \"JPL19\";", 0, {"JPL19", "given twice"}},
    {"[ \"H\", \"C\",", "[ \"H\", \"H\",", 0, {"H is given twice"}},
    {OZONE, OZONE " A = 1.0;", 0, {"duplicate"}},
    {"{ id = \"O+O3\";", "{ id = \"washout-HCl\";", 0, {"washout-HCl", "HCl", "rename"}},
    /* parameters that are missing or not used */
    {"ER = 2060.0;", "", 0, {"O+O3: ER is missing", "arrhenius"}},
    {"law = \"arrhenius\"; A = 8.0e-12;", "A = 8.0e-12;", 0, {"O+O3: law is missing"}},
    {OZONE, OZONE " k0 = 1e-30;", 0, {"law arrhenius does not use k0"}},
    {OZONE, OZONE " forward = \"O+O2+M\";", 0, {"law arrhenius does not use forward"}},
    {OZONE_EQ "; ", "", 0, {"O+O3: eq is missing"}},
    {"{ name = \"H2\"; formula = \"H2\"; }", "{ name = \"H2\"; }", 0, {"H2: formula is missing"}},
    {"role = \"fixed\"; share = 0.78084;", "role = \"fixed\";", 0, {"N2: share is missing"}},
    {"formula = \"H2O2\";", "formula = \"H2O2\"; share = 0.1;", 0, {"H2O2: share belongs to", "fixed"}},
    {"share = 0.78084;", "share = 0.78084; washout = 0.5;", 0, {"N2: washout belongs to", "active"}},
    {"model = \"NAT+HCl\"; gamma = 0.2;", "model = \"constant\";", 0, {"gamma is missing", "constant"}},
    {"model = \"NAT+HCl\"; gamma = 0.2;", "model = \"NAT+HCl\";", 0, {"gamma is missing", "NAT+HCl"}},
    {"model = \"NAT+HCl\"; gamma = 0.2;", "model = \"NAT+H2O\"; gamma = 0.2;", 0, {"is for a gas + H2O"}},
    {"model = \"ClONO2+HCl\";", "model = \"ClONO2+HCl\"; gamma = 0.1;", 0, {"does not use gamma"}},
    {"xs = \"HO2\"; phi = 1.0;", "xs = \"HO2\";", 0, {"J-HO2", "none of yield, yield_minus and phi"}},
    {"xs = \"HO2\"; phi = 1.0;", "xs = \"HO2\"; phi = 1.0; yield = \"NO2\";", 0, {"J-HO2", "more than one"}},
    {"xs = \"HO2\"; phi = 1.0;", "phi = 1.0;", 0, {"J-HO2: xs is missing"}},
    {"special = \"O2\";", "special = \"O2\"; xs = \"O2\";", 0, {"J-O2: xs is not used", "special"}},
    {"special = \"O2\";", "special = \"NO\";", 0, {"J-O2", "NO", "not O2"}},
    {"special = \"O2\";", "special = \"O-2\";", 0, {"special is \"O-2\"", "\"O2-O1D\""}},
    /* values out of range */
    {"formula = \"H2O2\"; washout = 0.9;",
     "formula = \"H2O2\"; washout = 1.9;",
     0,
     {"washout is 1.9", "0 and 1"}},
    {"A = 8.0e-12;", "A = -8.0e-12;", 0, {"A is -8e-12"}},
    {"branch = 0.61;", "branch = 6.1;", 0, {"branch is 6.1"}},
    {"k0 = 5.3e-32;", "k0 = 0.0;", 0, {"H+O2: k0 is 0"}},
    {"n = 2.4; f = 1.1;", "n = 2.4; f = 0.9;", 0, {"f is 0.9"}},
    {"n = 2.4; f = 1.1;", "n = 2.4; f = 99999999999;", 0, {"99999999999"}},
    /* atoms */
    {OZONE_EQ, "eq = \"O + O3 -> 1.9 O2\"", 0, {"O+O3 is not balanced", "O 4 left, 3.8 right"}},
    {OZONE_EQ, "eq = \"O + O3 -> 3 O2\"", 0, {"O+O3 is not balanced", "O 4 left, 6 right"}},
    {"\"HCl + OH -> Cl + H2O\"",
     "\"HCl + OH -> Cl2 + HO2\"",
     0,
     {"Cl 1 left, 2 right", "H 2 left, 1 right", "O 1 left, 2"}},
    {"\"O(1D) + CFC-11 {+ O2}", "\"O(1D) + CFC-11 {+ 2 O2}", 0, {"O 5 left, 3 right"}},
    {"formula = \"CCl3F\";", "formula = \"CCl2F\";", -1, {"CFC-11", "Cl 2 left, 3 right"}},
    {"formula = \"CCl3F\";", "formula = \"CCl3I\";", 0, {"CFC-11", "element I"}},
    {"formula = \"CCl3F\";", "formula = \"ccl3f\";", 0, {"CFC-11", "cannot read the formula"}},
    {"formula = \"CCl3F\";", "formula = \"\";", 0, {"CFC-11", "empty"}},
    /* equations */
    {"\"halon-1211 + hv", "\"haln-1211 + hv", 0, {"haln-1211", "did you mean halon-1211?"}},
    {OZONE_EQ, "eq = \"O + xenon -> 2 O2\"", 0, {"unknown species \"xenon\"", "add it"}},
    {OZONE_EQ, "eq = \"2 O + 2 O3 -> 4 O2\"", 0, {"more than 3 reactants"}},
    {OZONE_EQ, "eq = \"" LONG_TEXT LONG_TEXT LONG_TEXT "O3 -> 2 O2\"", 0, {"characters", "at most 240"}},
    {OZONE_EQ,
     "eq = \"CFC-11 + CHBr3 + HNO3 {+ 3 O2} -> Cl + HCl + ClO + Br + HBr + BrO + CO + CO2 + NO + O3 + Fx\"",
     0,
     {"more than 12 changing species"}},
    {OZONE_EQ, "eq = \"O + O3 = 2 O2\"", 0, {"no arrow"}},
    {OZONE_EQ, "eq = \"O + O3 -> 2 O2 -> O\"", 0, {"second arrow"}},
    {OZONE_EQ, "eq = \"O O3 -> 2 O2\"", 0, {"no + before"}},
    {OZONE_EQ, "eq = \"O + + O3 -> 2 O2\"", 0, {"nothing stands before"}},
    {OZONE_EQ, "eq = \"O + O3 + -> 2 O2\"", 0, {"complete"}},
    {OZONE_EQ, "eq = \" -> 2 O2\"", 0, {"no reactant"}},
    {OZONE_EQ, "eq = \"O + O3 ->\"", 0, {"no product"}},
    {OZONE_EQ, "eq = \"O + 0 O3 -> 2 O2\"", 0, {"bad coefficient"}},
    {OZONE_EQ, "eq = \"O + 0.5 O3 -> 1.25 O2\"", 0, {"decimal coefficient"}},
    {OZONE_EQ, "eq = \"O + O3 + hv -> 2 O2\"", 0, {"hv stands in photolysis"}},
    {OZONE_EQ, "eq = \"O + O3 (+M) -> 2 O2\"", 0, {"(+M)", "both sides"}},
    {OZONE_EQ, "eq = \"O + O3 (+M) -> 2 O2 (+M)\"", 0, {"(+M) and the laws falloff"}},
    {OZONE_EQ, "eq = \"O + O3 + M -> 2 O2 + M\"", 0, {"M as a reactant and law termolecular"}},
    {OZONE_EQ, "eq = \"O + O3 + M -> 2 O2\"", 0, {"M", "both sides"}},
    {OZONE_EQ, "eq = \"O + O3 {+ OH} -> 2 O2 + OH\"", 0, {"fixed share", "OH"}},
    {OZONE_EQ, "eq = \"O + O3 {+ O2 -> 3 O2\"", 0, {"closing brace"}},
    {OZONE_EQ, "eq = \"O + O3 -> {3} 2 O2\"", 0, {"misplaced brace"}},
    {OZONE_EQ, "eq = \"O + O3 + Fx -> 2 O2 + Fx\"", 0, {"inert species reacts", "Fx"}},
    {"\"HO2 + hv ->", "\"HO2 ->", 0, {"J-HO2", "hv on the left"}},
    {"\"HO2 + hv -> OH + O\"", "\"HO2 + O + hv -> OH + 2 O\"", 0, {"J-HO2", "one reactant beside hv"}},
    {"{ name = \"H2\";", "{ name = \"H 2\";", 0, {"H 2", "no blanks"}},
    {"{ name = \"H2\";", "{ name = \"2H\";", 0, {"2H", "start it with a letter"}},
    {"{ name = \"H2\";", "{ name = \"hv\";", 0, {"hv"}},
    {"{ name = \"H2\";", "{ name = \"molecular-hydrogen-of-the-whole-air\";", 0, {"35 characters", "31"}},
    /* words and references */
    {"law = \"arrhenius\"; A = 8.0e-12;",
     "law = \"arhenius\"; A = 8.0e-12;",
     0,
     {"arhenius", "did you mean arrhenius?"}},
    {"role = \"inert\";", "role = \"inret\";", 0, {"inret", "did you mean inert?"}},
    {"forward = \"NO2+HO2\";", "forward = \"NO2+H02\";", 0, {"NO2+H02", "did you mean NO2+HO2?"}},
    {"forward = \"NO2+HO2\";", "forward = \"O+O3\";", 0, {"law is not falloff"}},
    {"forward = \"NO2+HO2\";", "forward = \"NO2+NO3\";", 0, {"HO2NO2+M is not the reverse of NO2+NO3"}},
    {"\"HO2NO2 (+M) -> HO2 + NO2 (+M)\"",
     "\"HO2NO2 (+M) -> OH + NO3 (+M)\"",
     1,
     {"HO2NO2+M is not the reverse of NO2+HO2"}},
    {"source = \"JPL19 table 2-1\";", "source = \"JLP19 table 2-1\";", 0, {"JLP19", "did you mean JPL19?"}},
    {"model = \"ClONO2+HCl\";", "model = \"ClONO2+HCL\";", 0, {"did you mean ClONO2+HCl?"}},
    {"eq = \"ClONO2 + HCl -> Cl2", "eq = \"HCl + ClONO2 -> Cl2", 0, {"is for ClONO2 + HCl"}},
    {"A = 8.0e-12;", "A 8.0e-12;", 0, {"syntax error"}},
};

/* The notation has more than one way to say the same. */
static void equations_may_be_written_otherwise(void **state)
{
    static const char *const same[] = {"eq = \"O + O3 -> O2 + O2\"", "eq = \"1 O + 1.0 O3->2 O2\"",
                                       "eq = \"  O3 +\tO -> 1.5 O2 + 0.5 O2 \"",
                                       "eq = \"O3 + O \"\n \"-> 2 O2\""};
    for (int i = 0; i < 4; i++) {
        char path[300];
        int line;
        write_variant(state, OZONE_EQ, same[i], path, &line);
        Mechanism *m = read_path(path);
        const Reaction *r = named(m, "O+O3");
        assert_int_equal(r->reactants, 2);
        assert_int_equal(r->changes, 2);
        assert_true(change_of(m, "O+O3", "O") == -1.0 && change_of(m, "O+O3", "O3") == -1.0);
        mechanism_free(m);
    }
}

static void every_slip_is_named_with_its_line(void **state)
{
    for (size_t i = 0; i < sizeof slips / sizeof *slips; i++) {
        char path[300], place[320];
        int line;
        Mechanism *mechanism = (Mechanism *)state; /* a fault must leave NULL */
        Fault fault = {0};
        write_variant(state, slips[i].old, slips[i].new, path, &line);
        if (mechanism_read(&mechanism, path, &fault) == 0)
            fail_msg("accepted: %s", slips[i].new);
        assert_null(mechanism);
        /* lines = -1: the fault stands elsewhere than the slip, where its consequence shows */
        if (slips[i].lines >= 0)
            snprintf(place, sizeof place, "variant.cfg:%d: ", line + slips[i].lines);
        else
            strcpy(place, "variant.cfg:");
        check_fault(&fault, place, slips[i].piece[0], slips[i].piece[1], slips[i].piece[2], NULL);
    }
}

static void a_file_may_be_missing_or_empty(void **state)
{
    char path[300];
    Mechanism *mechanism;
    Fault fault = {0};
    assert_int_equal(mechanism_read(&mechanism, "no/such/mechanism.cfg", &fault), FAULT_INPUT);
    check_fault(&fault, "no/such/mechanism.cfg", NULL);
    static const struct {
        const char *text, *piece;
    } files[] = {
        {"", "elements is missing"},
        {"elements = [ \"H\" ];", "species is missing or empty"},
        {"elements = [ \"H\" ]; species = ();", "species is missing or empty"},
        {"elements = [ \"H\" ]; species = ( { name = \"F\"; formula = \"H\"; role = \"inert\"; } );",
         "no species is active"},
        {"elements = [ \"H\" ]; species = 5;", "species is a whole number"},
        {"elements = [\"H\",\"C\",\"N\",\"O\",\"F\",\"Cl\",\"Br\",\"I\",\"S\"];", "at most 8"},
    };
    for (size_t i = 0; i < sizeof files / sizeof *files; i++) {
        memset(&fault, 0, sizeof fault);
        write_file(state, "small.cfg", files[i].text, path);
        assert_int_equal(mechanism_read(&mechanism, path, &fault), FAULT_INPUT);
        check_fault(&fault, path, files[i].piece, NULL);
    }
    /* and the smallest that serves: no reactions at all */
    write_file(state, "small.cfg",
               "elements = [ \"H\" ]; species = ( { name = \"H2\"; formula = \"H2\"; } );", path);
    mechanism = read_path(path);
    assert_int_equal(mechanism->solved, 1);
    assert_int_equal(mechanism->reactions, 0);
    mechanism_free(mechanism);
}

/* Against sums of atomic weights by hand. */
static void formulas_stand_alone(void **state)
{
    static const char *const none[] = {"freon", "C2h", "(CH3)2O", "C0", "C1000"};
    (void)state;
    assert_int_equal(formula_atoms("C2HCl2F3", "Cl"), 2);
    assert_int_equal(formula_atoms("C2HCl2F3", "C"), 2);
    assert_int_equal(formula_atoms("CH3CCl3", "C"), 2);
    assert_int_equal(formula_atoms("CH3Br", "B"), 0);
    assert_int_equal(formula_atoms("C12H26", "H"), 26);
    assert_true(fabs(formula_mass("CCl3F") - (12.011 + 3 * 35.45 + 18.998)) < 1e-9);
    assert_true(formula_mass("CXx4") == 0.0); /* no such element */
    for (size_t n = 0; n < sizeof none / sizeof *none; n++) {
        assert_int_equal(formula_atoms(none[n], "C"), -1);
        assert_true(formula_mass(none[n]) == 0.0);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(formulas_stand_alone),
        cmocka_unit_test(structure_is_as_written),
        cmocka_unit_test(reactants_and_changes_follow_the_notation),
        cmocka_unit_test(every_reaction_balances_by_another_count),
        cmocka_unit_test(coefficients_match_the_evaluation),
        cmocka_unit_test(falloff_has_its_limits),
        cmocka_unit_test(decomposition_follows_from_equilibrium),
        WITH_FOLDER(decomposition_keeps_the_branch),
        cmocka_unit_test(another_reader_agrees),
        cmocka_unit_test(layers_fold_in_fixed_gases),
        WITH_FOLDER(a_gas_is_added_without_recompiling),
        WITH_FOLDER(equations_may_be_written_otherwise),
        WITH_FOLDER(every_slip_is_named_with_its_line),
        WITH_FOLDER(a_file_may_be_missing_or_empty),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
