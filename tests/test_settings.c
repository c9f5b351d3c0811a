/* Tests of the case file: what it takes, prints and refuses.
 * Run from the project's folder; SKYMEND_DATA overrides the place of the data. */
#define _XOPEN_SOURCE 700 /* mkdtemp, symlink */
#include "scratch.h"

#include "../input/schedule.h"
#include "../input/settings.h"
#include "../input/settings_keys.h"
#include "../input/table.h"

static void settings_prints_what_it_reads(void **state)
{
    Settings first, second;
    Fault fault = {0};
    settings_default(&first, data_dir());
    assert_int_equal(first.first_year, 1955);
    assert_int_equal(first.last_year, 2100);
    assert_true(first.top_km == 80 && first.spacing_km == 1 && first.edges == 0);
    assert_int_equal(first.day, DAY_FACTORS);
    assert_string_equal(first.air_file, "");
    strcpy(first.title, "a \"title\" with \\ and \n and \xc3\xbc");
    first.relative_tolerance = 1.0 / 3e5;
    first.sun = SUN_LATITUDE;
    first.latitude_deg = -33.3;
    first.edges = 6;
    for (int e = 0; e < 6; e++)
        first.edge_km[e] = 5.1 * e + 0.3 * e * e;
    first.top_km = first.edge_km[5];
    first.bound[1].value = 1.1e-7 / 3;
    first.schedule_layers = 2;
    strcpy(first.schedule_layer[0], "demo-schedule.csv");
    strcpy(first.schedule_layer[1], "baseline-schedule.csv");
    for (int help = 0; help < 2; help++) {
        char path[300];
        snprintf(path, sizeof path, "%s/printed.cfg", (char *)*state);
        FILE *out = fopen(path, "w");
        assert_non_null(out);
        settings_print(&first, help, out);
        fclose(out);
        if (settings_read(&second, path, data_dir(), &fault))
            fail_msg("%s", fault.text);
        assert_string_equal(second.case_path, path);
        assert_string_equal(second.case_dir, *state);
        memset(second.case_path, 0, sizeof second.case_path);
        memset(second.case_dir, 0, sizeof second.case_dir);
        char *a = settings_text(&first), *b = settings_text(&second);
        assert_non_null(a);
        assert_string_equal(a, b);
        free(a);
        free(b);
        assert_string_equal(second.title, first.title);
        assert_true(second.relative_tolerance == first.relative_tolerance);
        assert_memory_equal(second.edge_km, first.edge_km, sizeof first.edge_km);
        assert_int_equal(second.schedule_layers, 2);
        assert_string_equal(second.schedule_layer[0], "demo-schedule.csv");
        assert_string_equal(second.schedule_layer[1], "baseline-schedule.csv");
        assert_int_equal(second.bounds, first.bounds);
        for (int k = 0; k < first.bounds; k++) {
            assert_string_equal(second.bound[k].species, first.bound[k].species);
            assert_int_equal(second.bound[k].kind, first.bound[k].kind);
            assert_true(second.bound[k].value == first.bound[k].value);
        }
    }
}

static void settings_takes_a_case(void **state)
{
    char path[300], unused[300];
    write_file(state, "part.cfg", "# a shared part\nday = { mode = \"explicit\"; };\n", unused);
    write_file(state, "good.cfg",
               "// a note: 99999999999 is fine here, so is @include \"../x\"\n"
               "years : { first = 1960; last = 1961; };\n"
               "grid : { top_km = 60; spacing_km = 2; edges_km = []; };\n"
               "@include \"part.cfg\"\n"
               "surface = { bounds = ( { species = \"O3\"; kind = \"fixed\"; mole_fraction = 3e-8; "
               "} ); };\n"
               "sun = { surface_albedo = .2999999999999; latitude_deg = -.9999999999e1; };\n"
               "title = \"99999999999 /* \"\n \" two\";\n",
               path);
    Settings settings;
    Fault fault = {0};
    if (settings_read(&settings, path, data_dir(), &fault))
        fail_msg("%s", fault.text);
    assert_true(settings.top_km == 60 && settings.spacing_km == 2);
    assert_int_equal(settings.day, DAY_EXPLICIT);
    assert_int_equal(settings.bounds, 1);
    assert_int_equal(settings.bound[0].kind, BOUND_FIXED);
    assert_true(settings.bound[0].value == 3e-8);
    assert_int_equal(settings.bound[0].line, 5);
    assert_true(settings.surface_albedo == .2999999999999 && settings.latitude_deg == -.9999999999e1);
    assert_string_equal(settings.title, "99999999999 /*  two");
    assert_string_equal(settings.eddy_file, "eddy-diffusion.csv"); /* untouched default */
    write_file(state, "edges.cfg", "grid = { edges_km = (0, 5, 10.5, 20, 30, 50); };", path);
    assert_int_equal(settings_read(&settings, path, data_dir(), &fault), 0);
    assert_int_equal(settings.edges, 6);
    assert_true(settings.top_km == 50 && settings.edge_km[2] == 10.5);
    write_file(state, "empty.cfg", "", path);
    assert_int_equal(settings_read(&settings, path, data_dir(), &fault), 0);
}

#define BOUND(text) "surface = { bounds = ( { " text " } ); };"

#define TEN_NAMES "\"x\",\"x\",\"x\",\"x\",\"x\",\"x\",\"x\",\"x\",\"x\",\"x\""

static void settings_refuses_a_bad_case(void **state)
{
    static const struct {
        const char *text, *place, *what;
    } cases[] = {
        {"\ngrid = { spacign_km = 1; };", ":2: ", "did you mean grid.spacing_km?"},
        {"grdi = { top_km = 80; };", ":1: ", "did you mean grid?"},
        {"tilte = \"x\";", ":1: ", "did you mean title?"},
        {"grid = { latitude_deg = 3; };", ":1: ", "belongs in the group sun"},
        {"top_km = 3;", ":1: ", "belongs in the group grid"},
        {"weather = 3;", ":1: ", "unknown key weather; remove it"},
        {"grid = 3;", ":1: ", "grid is a whole number; write a group"},
        {"grid = {\n top_km = \"80\"; };", ":2: ", "grid.top_km is text; write a number"},
        {"years = { first = 1955.0; };", ":1: ", "write a whole number"},
        {"years = { first = true; };", ":1: ", "true or false"},
        {"title = 3;", ":1: ", "write text"},
        {"day = { mode = \"factor\"; };", ":1: ", "did you mean factors?"},
        {"day = { mode = 1; };", ":1: ", "double quotes"},
        {"files = {\n eddy = \"nowhere.csv\"; };", ":2: ", "nowhere.csv: not found (files.eddy)"},
        {"files = { schedule = \"/nowhere/s.csv\"; };", ":1: ", "cannot be read (files.schedule)"},
        {"files = { schedule_layers = \"s.csv\"; };", ":1: ", "files.schedule_layers is text; write a list"},
        {"files = { schedule_layers = [ 1 ]; };", ":1: ", "text in double quotes"},
        {"files = { schedule_layers = [ \"\" ]; };", ":1: ", "files.schedule_layers is empty"},
        {"files = { schedule_layers = [\n\"demo-schedule.csv\",\n\"no.csv\" ]; };",
         ":3: ", "no.csv: not found (files.schedule_layers)"},
        {"files = { schedule_layers = [ \"a.csv\", \"a.csv\" ]; };", ":1: ", "names a.csv twice"},
        {"files = { schedule_layers = [" TEN_NAMES "," TEN_NAMES "," TEN_NAMES ", \"y\", \"y\", \"y\" ]; };",
         ":1: ", "lists 33 files; at most 32 fit"},
        {"\n\nfiles = { mechanism = \"\"; };", ":3: ", "files.mechanism is empty"},
        {"\ntemperature = { mode = \"file\"; };", ":2: ", "files.temperature_change"},
        {"files = { temperature_change = \"co2-cooling.csv\"; };", ":1: ", "temperature.mode"},
        {"temperature = { mode = \"co3\"; };", ":1: ", "did you mean co2"},
        {"temperature = { reference_co2_ppm = 3.4e-4; };", ":1: ", "between 100 and 10000 ppm"},
        {"files = { co2_cooling = \"\"; };", ":1: ", "is empty"},
        {"files = { volcanic = \"nowhere.csv\"; };", ":1: ", "nowhere.csv: not found (files.volcanic)"},
        {"files = { solar_cycle = \"nowhere.csv\"; };", ":1: ", "nowhere.csv: not found (files.solar_cycle)"},
        {"files = { solar_amplitude = \"\"; };", ":1: ", "is empty"},
        {"\nfiles = { air_by_month = \"x.csv\"; };", ":2: ", "files.air_by_month goes with sun.kind"},
        {"sun = { kind = \"season\"; };\nfiles = { tropospheric_oh = \"\"; tropospheric_oh_by_month = \"x\"; "
         "};",
         ":2: ", "give both"},
        {"sun = { kind = \"season\"; };\nnumerics = { spinup_years = 1.5; };", ":2: ", "must be whole"},
        {"sun = { kind = \"season\"; };\nfiles = { air_by_month = \"x.csv\"; };",
         ":2: ", "files.air_by_month"},
        {"sun = { kind = \"moon\"; };", ":1: ", "\"global\", \"latitude\", \"season\""},
        {"sun = { kind = \"season\"; };\nnumerics = { start = \"settled\"; };", ":2: ", "never at rest"},
        {"numerics = { start = \"setled\"; };", ":1: ", "did you mean settled?"},
        {"grid = { top_km = 200; };", ":1: ", "between 20 and 86 km"},
        {"sun = { surface_albedo = -0.1; };", ":1: ", "between 0 and 1"},
        {"\nultraviolet = { uvb_limit_nm = 317; };", ":2: ", "give 315"},
        {"ultraviolet = { uvb_limit_nm = 300; };", ":1: ", "between 315 and 320 nm"},
        {"ultraviolet = { uvb_limit_nm = 315.0; };", ":1: ", "write a whole number"},
        {"ultraviolet = { surface_albedo = 1.1; };", ":1: ", "between 0 and 1"},
        {"ultraviolet = { latitude_deg = -91; };", ":1: ", "between -90 and 90"},
        {"ultraviolet = { day_of_year = 0; };", ":1: ", "between 1 and 366"},
        {"files = { ultraviolet_bins = \"\"; };", ":1: ", "files.ultraviolet_bins is empty"},
        {"numerics = { relative_tolerance = 1e999; };", ":1: ", "between"},
        {"years = { first = 4294969251; };", ":1: ", "too large"},
        {"years = { first = 99999999999999999999999; };", ":1: ", "too large"},
        {"years = { first = 1955L; last = 9223372036854775807L; };", ":1: ", "between 1750 and 2500"},
        {"years = { first = 0xfffffffff; };", ":1: ", "too large"},
        {"years = { first = 2000;\n last = 1990; };", ":2: ", "comes before"},
        {"\nyears = { last = 1940; };", ":2: ", "comes before"},
        {"grid = { spacing_km = 3; };", ":1: ", "whole number"},
        {"grid = { spacing_km = 0.1; };", ":1: ", "511"},
        {"grid = { edges_km = [0, 1, 2]; };", ":1: ", "give 5 to 512"},
        {"grid = { edges_km = [0, 1, 2, 2, 30]; };", ":1: ", "must increase"},
        {"grid = { edges_km = [1, 2, 3, 4, 30]; };", ":1: ", "the ground"},
        {"grid = { edges_km = [0, 1, 2, 3, 4]; };", ":1: ", "carry it higher"},
        {"grid = { edges_km = [0, 1, 2, 3, 99]; };", ":1: ", "between 0 and 86"},
        {"grid = { edges_km = [0, 0.5]; };", ":1: ", "round brackets"},
        {"grid = { edges_km = 3; };", ":1: ", "a list of numbers"},
        {"grid = { edges_km = (0, 1, \"2\", 3, 30); };", ":1: ", "is text"},
        {"grid = { top_km = 80; top_km = 70; };", ":1: ", "only once"},
        {"grid = { top_km = 80; };\ngrid = { spacing_km = 1; };", ":2: ", "only once"},
        {"grid = { top_km = 80; ", ":1: ", "bracket"},
        {"title = \"x\n", ": ", "syntax error"},
        {"years = { first = ; };", ":1: ", "syntax error"},
        {BOUND("species = \"O3\"; kind = \"fixd\"; mole_fraction = 1e-8;"), ":1: ", "did you mean fixed"},
        {BOUND("species = \"O3\"; kind = \"fixed\";"), ":1: ", "has no mole_fraction"},
        {BOUND("species = \"O3\"; kind = \"fixed\"; velocity_cm_s = 0.1;"), ":1: ", "does not go with"},
        {BOUND("species = \"O3\"; kind = \"fixed\"; mole_fraction = 2;"), ":1: ", "between 0 and 1"},
        {BOUND("species = \"O3\"; kind = \"deposition\"; velocity_cm_s = -1;"), ":1: ", "between 0 and 10"},
        {BOUND("species = \"\"; kind = \"deposition\"; velocity_cm_s = 1;"), ":1: ", "species is empty"},
        {BOUND("kind = \"deposition\"; velocity_cm_s = 1;"), ":1: ", "has no species"},
        {BOUND("species = \"O3\"; velocity_cm_s = 1;"), ":1: ", "has no kind"},
        {BOUND("species = \"O3\"; knid = \"fixed\";"), ":1: ", "did you mean kind?"},
        {BOUND("species = \"a-name-of-far-more-than-31-letters-x\"; kind = \"fixed\";"), ":1: ", "fit"},
        {"surface = { bounds = (1); };", ":1: ", "write groups"},
        {"surface = { bounds = 1; };", ":1: ", "round brackets"},
        {"surface = { bounds = ({species = \"O3\"; kind = \"fixed\"; mole_fraction = 0;},\n"
         "{species = \"O3\"; kind = \"fixed\"; mole_fraction = 0;}); };",
         ":2: ", "names O3 twice"},
        {"day = { mode = \"explicit\"; };\noutput = { per_year = 366; };", ":2: ", "at most 365"},
        {"day = { mode = \"mean\"; };\noutput = { moments = \"all\"; };", ":2: ", "day.mode = \"mean\""},
        {"output = { moments = \"al\"; };", ":1: ", "none"},
        {"sun = { kind = \"season\"; };\noutput = { moments = \"all\"; };", ":2: ", "from day to day"},
        {"\n@include \"none.cfg\"\n", ":2: ", "cannot be opened"},
        {"@include \"/etc/hostname\"\n", ":1: ", "@include"},
        {"@include \"../outside-of-it.cfg\"\n", ":1: ", "@include"},
        {"@include \"bad.cfg\"\n", "bad.cfg:1: ", "include itself"},
    };
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        char path[300];
        write_file(state, "bad.cfg", cases[c].text, path);
        Settings settings;
        Fault fault = {0};
        if (settings_read(&settings, path, data_dir(), &fault) == 0)
            fail_msg("accepted: %s", cases[c].text);
        check_fault(&fault, "bad.cfg", cases[c].place, cases[c].what, (char *)NULL);
    }
}

static void settings_keeps_to_its_folder(void **state)
{
    char path[300], outside[300], inner[300], link_path[300];
    write_file(state, "outside.cfg", "title = \"outside\";\n", outside);
    snprintf(inner, sizeof inner, "%s/case", (char *)*state);
    assert_int_equal(mkdir(inner, 0700), 0);
    snprintf(link_path, sizeof link_path, "%s/case/link.cfg", (char *)*state);
    assert_int_equal(symlink(outside, link_path), 0);
    static const char *const texts[] = {"@include \"../outside.cfg\"\n", "\t@include  \"link.cfg\"\n"};
    for (int t = 0; t < 2; t++) {
        Settings settings;
        Fault fault = {0};
        write_file(state, "case/escape.cfg", texts[t], path);
        settings_read(&settings, path, data_dir(), &fault);
        check_fault(&fault, ":1: ", "outside the folder of the case", (char *)NULL);
    }
    /* a fault inside an included file names that file */
    Settings settings;
    Fault fault = {0};
    write_file(state, "case/part.cfg", "\n\ngrid = { top_km = 1; };\n", path);
    write_file(state, "case/main.cfg", "@include \"part.cfg\"\n", path);
    settings_read(&settings, path, data_dir(), &fault);
    check_fault(&fault, "case/part.cfg:3: ", "grid.top_km", (char *)NULL);
    Fault syntax = {0};
    write_file(state, "case/part.cfg", "\n\ngrid = { top_km = ; };\n", path);
    write_file(state, "case/main.cfg", "@include \"part.cfg\"\n", path);
    settings_read(&settings, path, data_dir(), &syntax);
    check_fault(&syntax, "case/part.cfg:3: ", "syntax error", (char *)NULL);
}

static void settings_refuses_what_is_no_case(void **state)
{
    Settings settings;
    Fault missing = {0}, folder = {0}, endless = {0};
    settings_read(&settings, "/nowhere/x.cfg", data_dir(), &missing);
    check_fault(&missing, "/nowhere/x.cfg", "cannot be opened", (char *)NULL);
    settings_read(&settings, *state, data_dir(), &folder);
    check_fault(&folder, "is a folder", (char *)NULL);
    char path[2 * SETTINGS_PATH];
    memset(path, 'p', sizeof path - 1);
    path[sizeof path - 1] = '\0';
    settings_read(&settings, path, data_dir(), &endless);
    check_fault(&endless, "shorten", (char *)NULL);
    Fault endless_data = {0};
    settings_read(&settings, "/nowhere/x.cfg", path, &endless_data);
    check_fault(&endless_data, "path of the data", (char *)NULL);
}

/* The built-in case holds together with the shipped data: its files are there, its schedule covers
 * its years, and its surface boundaries are species of its mechanism that the schedule leaves alone. */
static void settings_defaults_fit_the_data(void **state)
{
    (void)state;
    Settings settings;
    settings_default(&settings, data_dir());
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    int files = 0;
    for (size_t k = 0; k < count; k++) {
        const char *name = (const char *)&settings + keys[k].offset;
        if (strcmp(keys[k].group, "files") != 0 || !*name)
            continue;
        char found[2 * SETTINGS_PATH];
        Fault fault = {0};
        if (table_locate(keys[k].name, name, "", data_dir(), found, sizeof found, &fault))
            fail_msg("%s", fault.text);
        files++;
    }
    assert_int_equal(files, 13);

    char path[2 * SETTINGS_PATH], *text;
    Fault fault = {0};
    Schedule schedule;
    snprintf(path, sizeof path, "%s/%s", data_dir(), settings.schedule_file);
    if (schedule_read(&schedule, (const char *const[]){path}, 1, &fault) ||
        schedule_covers(&schedule, settings.first_year, settings.last_year, &fault))
        fail_msg("%s", fault.text);
    snprintf(path, sizeof path, "%s/%s", data_dir(), settings.mechanism_file);
    if (table_text(path, &text, NULL, &fault))
        fail_msg("%s", fault.text);
    for (int b = 0; b < settings.bounds; b++) {
        char entry[60];
        snprintf(entry, sizeof entry, "{ name = \"%s\";", settings.bound[b].species);
        if (!strstr(text, entry))
            fail_msg("the mechanism has no %s", settings.bound[b].species);
        if (schedule_find(&schedule, settings.bound[b].species) >= 0)
            fail_msg("both the schedule and surface.bounds hold %s", settings.bound[b].species);
        assert_int_equal(settings.bound[b].line, 0);
    }
    free(text);
    schedule_free(&schedule);
}

/* The table of keys agrees with itself: defaults in range, names unique, groups together. */
static void settings_table_is_sound(void **state)
{
    (void)state;
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++) {
        assert_true(strlen(keys[k].help) > 5);
        if (keys[k].type == KEY_WHOLE || keys[k].type == KEY_REAL)
            assert_true(keys[k].standard >= keys[k].low && keys[k].standard <= keys[k].high);
        for (size_t j = 0; j < k; j++) {
            assert_false(strcmp(keys[j].group, keys[k].group) == 0 &&
                         strcmp(keys[j].name, keys[k].name) == 0);
            if (strcmp(keys[j].group, keys[k].group) == 0)
                assert_string_equal(keys[j + 1].group, keys[k].group);
        }
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(settings_prints_what_it_reads),       WITH_FOLDER(settings_takes_a_case),
        WITH_FOLDER(settings_refuses_a_bad_case),         WITH_FOLDER(settings_keeps_to_its_folder),
        WITH_FOLDER(settings_refuses_what_is_no_case),    cmocka_unit_test(settings_table_is_sound),
        cmocka_unit_test(settings_defaults_fit_the_data),
    };
    return cmocka_run_group_tests_name("settings", tests, NULL, NULL);
}
