/* The potentials of the treaty: the table, sums, bad tables. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include "../model/treaty.h"

static void treaty_of_data(Treaty *treaty)
{
    Fault fault = {0};
    if (treaty_find_and_read(treaty, data_dir(), &fault))
        fail_msg("%s", fault.text);
}

/* Montreal Protocol, annexes A, B, C, E; from memory, typed apart from the table. */
static void potentials_are_those_of_the_annexes(void **state)
{
    (void)state;
    static const struct {
        const char *gas, *annex, *group;
        double potential;
    } rows[] = {
        {"CH3Br", "E", "I", 0.6},       {"HCFC-142b", "C", "I", 0.065},  {"HCFC-141b", "C", "I", 0.11},
        {"HCFC-22", "C", "I", 0.055},   {"CH3CCl3", "B", "III", 0.1},    {"CCl4", "B", "II", 1.1},
        {"halon-2402", "A", "II", 6.0}, {"halon-1301", "A", "II", 10.0}, {"halon-1211", "A", "II", 3.0},
        {"CFC-115", "A", "I", 0.6},     {"CFC-114", "A", "I", 1.0},      {"CFC-113", "A", "I", 0.8},
        {"CFC-12", "A", "I", 1.0},      {"CFC-11", "A", "I", 1.0}};
    Treaty treaty;
    treaty_of_data(&treaty);
    for (size_t r = 0; r < sizeof rows / sizeof *rows; r++) {
        const TreatyGas *row;
        assert_int_equal(treaty_standing(&treaty, rows[r].gas, &row), TREATY_CONTROLLED);
        assert_string_equal(row->annex, rows[r].annex);
        assert_string_equal(row->group, rows[r].group);
        assert_true(row->potential == rows[r].potential);
    }
    assert_non_null(strstr(treaty.source, "Montreal Protocol"));
    treaty_free(&treaty);
}

/* The table says of every gas of the mechanism with carbon and chlorine or bromine how it stands. */
static void every_halocarbon_is_listed(void **state)
{
    (void)state;
    static const char *const free_gases[] = {"halon-1202", "CH3Cl", "CH2Cl2", "CHCl3", "CH2Br2", "CHBr3"};
    char path[400];
    Fault fault = {0};
    Mechanism *mechanism;
    Treaty treaty;
    int seen = 0, uncontrolled = 0;
    snprintf(path, sizeof path, "%s/mechanism.cfg", data_dir());
    assert_int_equal(mechanism_read(&mechanism, path, &fault), 0);
    treaty_of_data(&treaty);
    int carbon = mechanism_element(mechanism, "C");
    for (int s = 0; s < mechanism->solved; s++) {
        if (!mechanism_atoms(mechanism, s, carbon) ||
            (!mechanism_atoms(mechanism, s, mechanism_element(mechanism, "Cl")) &&
             !mechanism_atoms(mechanism, s, mechanism_element(mechanism, "Br"))))
            continue;
        enum TreatyStanding standing = treaty_standing(&treaty, mechanism_name(mechanism, s), NULL);
        if (standing == TREATY_UNLISTED)
            fail_msg("%s is not listed", mechanism_name(mechanism, s));
        seen++;
        uncontrolled += standing == TREATY_FREE;
    }
    assert_int_equal(seen, 20);
    assert_int_equal(uncontrolled, 6);
    for (int g = 0; g < 6; g++)
        assert_int_equal(treaty_standing(&treaty, free_gases[g], NULL), TREATY_FREE);
    assert_int_equal(treaty_standing(&treaty, "N2O", NULL), TREATY_FREE);
    mechanism_free(mechanism);
    treaty_free(&treaty);
}

/* 2 kt of CFC-113 and 10 kt of HCFC-22: 2000 x 0.8 + 10000 x 0.055 ODP-tonnes; the rest adds nothing. */
static void kilotonnes_become_odp_tonnes(void **state)
{
    (void)state;
    static const char *const gases[] = {"CFC-113", "CH3Cl", "mine", "HCFC-22"};
    static const double kilotonnes[] = {2.0, 5000.0, 7.0, 10.0};
    enum TreatyStanding standing[4];
    Treaty treaty;
    treaty_of_data(&treaty);
    check_near(treaty_tonnes(&treaty, gases, kilotonnes, 4, standing), 2150.0, 1e-14);
    assert_true(standing[0] == TREATY_CONTROLLED && standing[1] == TREATY_FREE &&
                standing[2] == TREATY_UNLISTED && standing[3] == TREATY_CONTROLLED);
    assert_true(treaty_tonnes(&treaty, gases, kilotonnes, 0, NULL) == 0.0);
    treaty_free(&treaty);
}

static void bad_tables_are_refused(void **state)
{
    static const struct {
        const char *text, *line, *words;
    } bad[] = {
        {"gas,annex,potential\n", ":1: ", "unexpected columns"},
        {"gas,annex,group,potential\n", ":1: ", "no rows"},
        {"gas,annex,group,potential\n,A,I,1\n", ":2: ", "no name of a gas"},
        {"gas,annex,group,potential\nCFC-11,D,I,1\n", ":2: ", "write A, B, C, E or none"},
        {"gas,annex,group,potential\nCFC-11,A,1,1\n", ":2: ", "write I, II, III or none"},
        {"gas,annex,group,potential\nCFC-11,A,I,one\n", ":2: ", "no number"},
        {"gas,annex,group,potential\nCFC-11,A,I,0\n", ":2: ", "above 0"},
        {"gas,annex,group,potential\nCFC-11,A,I,1000\n", ":2: ", "not above 100"},
        {"gas,annex,group,potential\nCFC-11,A,I,none\n", ":2: ", "all be none"},
        {"gas,annex,group,potential\nCFC-11,A,I,1\n# again\nCFC-11,A,I,1\n", ":4: ", "listed twice"},
    };
    for (size_t b = 0; b < sizeof bad / sizeof *bad; b++) {
        char path[300];
        Treaty treaty;
        Fault fault = {0};
        write_file(state, "treaty.csv", bad[b].text, path);
        assert_int_equal(treaty_read(&treaty, path, &fault), FAULT_INPUT);
        check_fault(&fault, path, bad[b].line, bad[b].words, NULL);
        assert_null(treaty.row);
    }
    Treaty treaty;
    Fault fault = {0};
    assert_int_equal(treaty_find_and_read(&treaty, *state, &fault), FAULT_INPUT);
    check_fault(&fault, TREATY_FILE, NULL);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(potentials_are_those_of_the_annexes),
        cmocka_unit_test(every_halocarbon_is_listed),
        cmocka_unit_test(kilotonnes_become_odp_tonnes),
        WITH_FOLDER(bad_tables_are_refused),
    };
    return cmocka_run_group_tests_name("treaty", tests, NULL, NULL);
}
