/* Tests of the mechanism file: what may be written otherwise, and what a slip gets: its line and its words.
 * Run from the project's folder; SKYMEND_DATA overrides the place of the data. */
#define _XOPEN_SOURCE 700 /* mkdtemp, popen */
#include "mechanism_room.h"

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

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(equations_may_be_written_otherwise),
        WITH_FOLDER(every_slip_is_named_with_its_line),
        WITH_FOLDER(a_file_may_be_missing_or_empty),
    };
    return cmocka_run_group_tests_name("mechanism mistakes", tests, NULL, NULL);
}
