/* Tests of input/: faults, tables and the shipped data. Settings are in test_settings.c, schedules in
 * test_schedule.c.
 * Run from the project's folder; SKYMEND_DATA overrides the place of the data. */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "scratch.h"

#include "../input/table.h"

/* ---- fault ---- */

static void fault_keeps_the_first(void **state)
{
    (void)state;
    Fault fault = {0};
    assert_int_equal(fault_at(&fault, "a.csv", 7, "cell\t%d\nbad", 3), FAULT_INPUT);
    assert_string_equal(fault.text, "a.csv:7: cell 3 bad");
    assert_int_equal(fault_set(&fault, FAULT_OUTPUT, "later"), FAULT_INPUT);
    assert_string_equal(fault.text, "a.csv:7: cell 3 bad");
    Fault other = {0};
    assert_int_equal(fault_at(&other, "b.csv", 0, "x"), FAULT_INPUT);
    assert_string_equal(other.text, "b.csv: x");
    Fault memory = {0};
    assert_int_equal(fault_memory(&memory, "the grid"), FAULT_NUMERICS);
    assert_non_null(strstr(memory.text, "the grid"));
}

static void fault_survives_long_text(void **state)
{
    (void)state;
    static char path[5000];
    memset(path, 'p', sizeof path - 1);
    Fault fault = {0};
    fault_at(&fault, path, 3, "%s", path);
    assert_int_equal(strlen(fault.text), sizeof fault.text - 1);
}

static void fault_finds_the_nearest_word(void **state)
{
    (void)state;
    static const char *const words[] = {"CFC-11", "CFC-12", "HCFC-22", "spacing_km", "top_km", "O3"};
    size_t n = sizeof words / sizeof words[0];
    assert_string_equal(fault_nearest("cfc-11", words, n), "CFC-11");
    assert_string_equal(fault_nearest("CFC_12", words, n), "CFC-12");
    assert_string_equal(fault_nearest("spacign_km", words, n), "spacing_km");
    assert_string_equal(fault_nearest("spacing", words, n), "spacing_km");
    assert_string_equal(fault_nearest("top_kn", words, n), "top_km");
    assert_string_equal(fault_nearest("top", words, n), "top_km");
    assert_null(fault_nearest("albedo", words, n));
    assert_null(fault_nearest("X", words, n));
    assert_null(fault_nearest("", words, n));
    assert_null(fault_nearest("top", words, 0));
    char endless[200];
    memset(endless, 'a', sizeof endless - 1);
    endless[sizeof endless - 1] = '\0';
    assert_null(fault_nearest(endless, words, n));
}

/* ---- tables ---- */

static void table_reads_plain_text(void **state)
{
    char path[300], text[40];
    write_file(state, "good.csv",
               "\xef\xbb\xbf# title: a table\r\n# unit: km\r\n\r\nz , \"a \"\"b\"\"\"\r\n"
               "0, 1.5e-3\r\n\r\n# in between\n2,\"-7\"\n 3 ,+.5",
               path);
    Table table;
    Fault fault = {0};
    assert_int_equal(table_read(&table, path, &fault), 0);
    assert_int_equal(table.rows, 3);
    assert_int_equal(table.columns, 2);
    assert_string_equal(table.name[1], "a \"b\"");
    size_t column = 9;
    assert_int_equal(table_column(&table, "a \"b\"", &column, &fault), 0);
    assert_int_equal(column, 1);
    const double *value = table_values(&table, column);
    assert_true(value[0] == 1.5e-3 && value[1] == -7 && value[2] == 0.5);
    assert_int_equal(table.line[1], 8);
    assert_string_equal(table.header, "title: a table\nunit: km\nin between");
    assert_int_equal(table_header(&table, "unit", text, sizeof text), 1);
    assert_string_equal(text, "km");
    assert_int_equal(table_header(&table, "title", text, 4), 1);
    assert_string_equal(text, "a t");
    assert_int_equal(table_header(&table, "tit", text, sizeof text), 0);
    assert_string_equal(text, "");
    table_free(&table);
    table_free(&table); /* accepts a freed table */
}

static void table_undoes_a_spreadsheet(void **state)
{
    char path[300], text[40];
    write_file(state, "sheet.csv", "\"# unit: km, K\",,\n# basis: mine,,\rz,t,p\r1,2,3\r", path);
    Table table;
    Fault fault = {0};
    assert_int_equal(table_read(&table, path, &fault), 0);
    assert_int_equal(table.rows, 1);
    assert_int_equal(table.line[0], 4);
    table_header(&table, "unit", text, sizeof text);
    assert_string_equal(text, "km, K");
    table_header(&table, "basis", text, sizeof text);
    assert_string_equal(text, "mine");
    table_free(&table);
}

static void table_refuses_bad_text(void **state)
{
    static const struct {
        const char *text, *place, *what;
    } cases[] = {
        {"z,x\n1,2\n2,abc\n", ":3: ", "\"abc\" under x is no number"},
        {"z,x\n1,2\n2,\n", ":3: ", "under x is empty"},
        {"z,x\n1,nan\n", ":2: ", "no number"},
        {"z,x\n1,inf\n", ":2: ", "no number"},
        {"z,x\n1,0x10\n", ":2: ", "no number"},
        {"z,x\n1,1e999\n", ":2: ", "no finite number"},
        {"z,x\n1,2 3\n", ":2: ", "no number"},
        {"z,x\n1,1.2.3\n", ":2: ", "no number"},
        {"z,x\n1,\"2,5\"\n", ":2: ", "decimal point"},
        {"z,x\n1;5,2\n", ":2: ", "decimal point"},
        {"z,x\n1,2,3\n", ":2: ", "3 cells where the line of column names has 2"},
        {"z,x\n1,2,5\n", ":2: ", "decimal points"},
        {"z,x\n\n1\n", ":3: ", "1 cells"},
        {"z;x\n1;2\n", ":1: ", "semicolons"},
        {"z\tx\n1\t2\n", ":1: ", "tabs"},
        {"z,x\n1,\"2\n", ":2: ", "quote"},
        {"z,x\n1,\"2\"3\n", ":2: ", "quote"},
        {"z,z\n1,2\n", ":1: ", "two columns are called z"},
        {"z,\n1,2\n", ":1: ", "column 2 has no name"},
        {"z,x\n", ":1: ", "no rows"},
        {"", ": ", "no line of column names"},
        {"# only: words\n", ": ", "no line of column names"},
    };
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        char path[300];
        write_file(state, "bad.csv", cases[c].text, path);
        Table table;
        Fault fault = {0};
        assert_int_equal(table_read(&table, path, &fault), FAULT_INPUT);
        check_fault(&fault, path, cases[c].place, cases[c].what, (char *)NULL);
        assert_null(table.value);
        table_free(&table);
    }
}

static void table_refuses_what_is_no_text(void **state)
{
    char path[300];
    Table table;
    Fault missing = {0}, folder = {0}, nul = {0}, wide = {0};
    snprintf(path, sizeof path, "%s/none.csv", (char *)*state);
    table_read(&table, path, &missing);
    check_fault(&missing, path, "cannot be opened", (char *)NULL);
    table_read(&table, *state, &folder);
    check_fault(&folder, "is a folder", (char *)NULL);
    write_bytes(state, "nul.csv", "z\n1\n\0\n", 6, path);
    table_read(&table, path, &nul);
    check_fault(&nul, ":3: ", "NUL", (char *)NULL);
    write_bytes(state, "wide.csv", "\xff\xfez\0,\0", 6, path);
    table_read(&table, path, &wide);
    check_fault(&wide, "UTF-8", (char *)NULL);
}

static void table_names_what_is_wrong(void **state)
{
    char path[300];
    write_file(state, "order.csv", "altitude_km,x\n0,1\n2,3\n2,-4\n", path);
    Table table;
    Fault fault = {0}, column = {0}, absent = {0}, order = {0}, range = {0};
    size_t index;
    assert_int_equal(table_read(&table, path, &fault), 0);
    table_column(&table, "altitude", &index, &column);
    check_fault(&column, ":1: ", "no column altitude; is it altitude_km?", "altitude_km, x", (char *)NULL);
    table_column(&table, "eddy_cm2_s-1", &index, &absent);
    check_fault(&absent, "no column eddy_cm2_s-1", "altitude_km, x", (char *)NULL);
    table_require_increasing(&table, 0, &order);
    check_fault(&order, ":4: ", "altitude_km is 2 after 2", (char *)NULL);
    table_require_range(&table, 1, 0, 10, &range);
    check_fault(&range, ":4: ", "x is -4", "between 0 and 10", (char *)NULL);
    assert_int_equal(table_require_range(&table, 1, -4, 3, &fault), 0);
    table_free(&table);
}

static void interpolation_has_closed_forms(void **state)
{
    (void)state;
    double x[40], line[40], power[40];
    for (int i = 0; i < 40; i++) {
        x[i] = 0.1 * i * i + i - 3; /* uneven */
        line[i] = 2.5 - 0.75 * x[i];
        power[i] = 3e-12 * exp(0.21 * x[i]);
    }
    for (double at = x[0]; at <= x[39]; at += 0.0373) {
        assert_true(fabs(table_linear(x, line, 40, at) - (2.5 - 0.75 * at)) < 1e-12);
        check_near(table_loglinear(x, power, 40, at), 3e-12 * exp(0.21 * at), 1e-13);
    }
    for (int i = 0; i < 40; i++) {
        assert_true(table_linear(x, line, 40, x[i]) == line[i]);
        assert_true(table_loglinear(x, power, 40, x[i]) == power[i]);
    }
    assert_true(table_linear(x, line, 40, -1e9) == line[0]);
    assert_true(table_linear(x, line, 40, 1e9) == line[39]);
    assert_true(table_loglinear(x, power, 40, -1e9) == power[0]);
    assert_true(table_loglinear(x, power, 40, 1e9) == power[39]);
    assert_true(table_linear(x, line, 1, 5) == line[0]);
}

static void files_are_located(void **state)
{
    char here[300], found[400], data[300];
    write_file(state, "here.csv", "z\n1\n", here);
    snprintf(data, sizeof data, "%s/data", (char *)*state);
    assert_int_equal(mkdir(data, 0700), 0);
    char deep[300];
    write_file(state, "data/deep.csv", "z\n1\n", deep);
    Fault fault = {0};
    assert_int_equal(table_locate("test", "here.csv", *state, data, found, sizeof found, &fault), 0);
    assert_string_equal(found, here);
    assert_int_equal(table_locate("test", "deep.csv", *state, data, found, sizeof found, &fault), 0);
    assert_string_equal(found, deep);
    assert_int_equal(table_locate("test", here, "", "", found, sizeof found, &fault), 0);
    assert_string_equal(found, here);
    static const char *const wrong[] = {"none.csv", "data", "", "/none.csv"};
    for (int w = 0; w < 4; w++) {
        Fault bad = {0};
        table_locate("eddy profile", wrong[w], *state, data, found, sizeof found, &bad);
        check_fault(&bad, "eddy profile", wrong[w], (char *)NULL);
    }
    /* the built-in case has no folder: a file in the current one must not shadow the data */
    Fault shadow = {0};
    table_locate("makefile", "Makefile", "", data, found, sizeof found, &shadow);
    check_fault(&shadow, "not found", (char *)NULL);
    Fault small = {0};
    assert_int_equal(table_locate("test", "here.csv", *state, data, found, 8, &small), FAULT_INPUT);
}

/* ---- shipped profiles ---- */

static void shipped_profiles_are_sound(void **state)
{
    (void)state;
    static const struct {
        const char *file, *column;
        double low, high;
    } profiles[] = {
        {"eddy-diffusion.csv", "eddy_cm2_s-1", 3e3, 2e6},
        {"tropospheric-water.csv", "H2O_mol_mol-1", 3e-6, 0.02},
        {"tropospheric-oh.csv", "OH_cm-3", 1e5, 2e6},
        {"aerosol-surface.csv", "surface_um2_cm-3", 1e-6, 100},
        {"aerosol-surface.csv", "effective_radius_um", 0.01, 1},
        {"initial-profiles.csv", "O3", 1e-9, 1e-5},
        {"initial-profiles.csv", "CO2", 3e-4, 3.2e-4},
    };
    for (size_t p = 0; p < sizeof profiles / sizeof profiles[0]; p++) {
        char path[500], text[1000];
        Table table;
        Fault fault = {0};
        size_t z = 0, column = 0;
        snprintf(path, sizeof path, "%s/%s", data_dir(), profiles[p].file);
        if (table_read(&table, path, &fault) || table_column(&table, "altitude_km", &z, &fault) ||
            table_column(&table, profiles[p].column, &column, &fault) ||
            table_require_increasing(&table, z, &fault) ||
            table_require_range(&table, column, profiles[p].low, profiles[p].high, &fault))
            fail_msg("%s", fault.text);
        assert_true(table_values(&table, z)[0] == 0);
        static const char *const wanted[] = {"quantity", "unit", "source", "basis"};
        for (int w = 0; w < 4; w++)
            if (!table_header(&table, wanted[w], text, sizeof text))
                fail_msg("%s has no # %s: line", path, wanted[w]);
        table_free(&table);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(fault_keeps_the_first),          cmocka_unit_test(fault_survives_long_text),
        cmocka_unit_test(fault_finds_the_nearest_word),   WITH_FOLDER(table_reads_plain_text),
        WITH_FOLDER(table_undoes_a_spreadsheet),          WITH_FOLDER(table_refuses_bad_text),
        WITH_FOLDER(table_refuses_what_is_no_text),       WITH_FOLDER(table_names_what_is_wrong),
        cmocka_unit_test(interpolation_has_closed_forms), WITH_FOLDER(files_are_located),
        cmocka_unit_test(shipped_profiles_are_sound),
    };
    return cmocka_run_group_tests_name("input", tests, NULL, NULL);
}
