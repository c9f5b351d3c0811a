/* Tests of the mechanism file and its rate coefficients.
 * Published values are typed from memory unless they are worked out here. Run from the project's folder;
 * SKYMEND_DATA overrides the place of the data. Slips are in test_mechanism_mistakes.c. */
#define _XOPEN_SOURCE 700 /* mkdtemp, popen */
#include "mechanism_room.h"

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
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
