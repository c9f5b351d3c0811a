/* Tests of emissions in ODP-tonnes: files made by hand, whose sums are worked out beside them. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <netcdf.h>

#include "../model/answers.h"
#include "../model/answers_emission.h"

enum { PATH = 300, YEARS = 3 };

/* ---- a file of 1980 to 1982 ---- */

typedef struct {
    const char *species, *formula;
    double emission[YEARS]; /* Gg a year */
} Gas;

typedef struct {
    const char *label, *gas, *mass_of;
    double emission[YEARS]; /* Gg of mass_of a year */
} Line;

/* CH3Br: 30 Gg implied by its abundance each year, besides what the line gives. N2O: 100 Gg, of it 14 Gg of
 * nitrogen by a line. */
static const Gas gases[] = {
    {"CFC-11", "CCl3F", {100.0, 200.0, 50.0}}, {"CH3Br", "CH3Br", {30.0, 40.0, 50.0}},
    {"N2O", "N2O", {100.0, 100.0, 100.0}},     {"halon-1202", "CBr2F2", {1.0, 1.0, 2.0}},
    {"CO2", "CO2", {4e7, 4e7, 4e7}},           {"HCFC-999", "CHClF2", {5.0, 5.0, 5.0}},
};
enum { GASES = sizeof gases / sizeof *gases };
static const Line lines[] = {
    {"fumigation, \"all\"", "CH3Br", "CH3Br", {0.0, 10.0, 20.0}},
    {"soils", "N2O", "N", {14.0, 14.0, 14.0}},
};
enum { LINES = sizeof lines / sizeof *lines };

/* The potentials these sums are made with; CH3Br is 0.6 by the treaty, halon-1202 and HCFC-999 are not in it.
 */
static const char own_table[] = "# quantity: made up\ngas,odp,odp_noise,odp_frozen\nCFC-11,1,0,1\n"
                                "CH3Br,1.5,0.01,1.7\nhalon-1202,2,0.1,3\nN2O,0.03,0.001,0.04\nCH4,-1,0,-1\n";

#define NC(call) assert_int_equal(call, NC_NOERR)

static void put_text(int file, int variable, const char *name, const char *text)
{
    NC(nc_put_att_text(file, variable, name, strlen(text), text));
}

static int put_series(int file, int time, const char *name, const char *unit, const double *value)
{
    int variable;
    NC(nc_def_var(file, name, NC_DOUBLE, 1, &time, &variable));
    put_text(file, variable, "units", unit);
    NC(nc_put_var_double(file, variable, value));
    return variable;
}

static void put_lines(int file, int time, const Line *line, int count)
{
    static const char *const names[] = {"line_label", "line_gas", "line_mass_of"};
    int dimension, variable, word[3];
    NC(nc_def_dim(file, "line", (size_t)count, &dimension));
    NC(nc_def_var(file, "line_emission", NC_DOUBLE, 2, (int[]){time, dimension}, &variable));
    put_text(file, variable, "units", "Gg year-1");
    for (int w = 0; w < 3; w++)
        NC(nc_def_var(file, names[w], NC_STRING, 1, &dimension, &word[w]));
    for (size_t l = 0; l < (size_t)count; l++) {
        const char *said[] = {line[l].label, line[l].gas, line[l].mass_of};
        for (int w = 0; w < 3; w++)
            NC(nc_put_var1_string(file, word[w], &l, &said[w]));
        for (size_t i = 0; i < YEARS; i++)
            NC(nc_put_var1_double(file, variable, (size_t[]){i, l}, &line[l].emission[i]));
    }
}

static void write_made(const char *path, const Gas *gas, int count, const Line *line, int line_count,
                       const char *unit)
{
    static const double days[YEARS] = {183.0, 548.5, 913.5}, column[YEARS] = {300.0, 299.0, 298.0};
    static const double bound[2 * YEARS] = {0.0, 366.0, 366.0, 731.0, 731.0, 1096.0};
    int file, dimension[2], variable;
    NC(nc_create(path, NC_NETCDF4 | NC_CLOBBER, &file));
    NC(nc_def_dim(file, "time", YEARS, &dimension[0]));
    NC(nc_def_dim(file, "two", 2, &dimension[1]));
    variable = put_series(file, dimension[0], "time", "days since 1980-01-01 00:00:00", days);
    put_text(file, variable, "bounds", "time_bounds");
    NC(nc_def_var(file, "time_bounds", NC_DOUBLE, 2, dimension, &variable));
    NC(nc_put_var_double(file, variable, bound));
    put_series(file, dimension[0], "ozone_column", "DU", column);
    for (int g = 0; g < count; g++) {
        char name[60], plain[40];
        snprintf(plain, sizeof plain, "%s", gas[g].species);
        for (char *c = plain; *c; c++)
            *c = *c == '-' ? '_' : *c;
        variable = put_series(file, dimension[0], plain, "mol mol-1", column);
        put_text(file, variable, "species", gas[g].species);
        put_text(file, variable, "formula", gas[g].formula);
        snprintf(name, sizeof name, "emission_%s", plain);
        put_series(file, dimension[0], name, unit, gas[g].emission);
    }
    if (line_count)
        put_lines(file, dimension[0], line, line_count);
    NC(nc_close(file));
}

/* ---- asking ---- */

typedef struct {
    FileSeries file, reference;
    OdpWeights weights;
    Answers answers;
} World;

static void read_world(void **state, World *world, const char *path, const char *reference)
{
    char table[PATH];
    Fault fault = {0};
    NumericalErrors errors;
    *world = (World){0};
    errors_unknown(&errors);
    write_file(state, "own.csv", own_table, table);
    const AnswerWish wish = {1980, 11.0};
    if (weights_read(&world->weights, data_dir(), table, &fault) ||
        series_read(&world->file, path, NULL, &fault) ||
        (reference && series_read(&world->reference, reference, NULL, &fault)) ||
        answers_compute(&world->answers, &world->file, &wish, &errors, &fault) ||
        (reference && answers_against(&world->answers, &world->file, &world->reference, &errors, &fault)) ||
        answers_emission(&world->answers, &world->file, reference ? &world->reference : NULL, &world->weights,
                         &fault))
        fail_msg("%s", fault.text);
}

static void free_world(World *world)
{
    answers_free(&world->answers);
    series_free(&world->file);
    series_free(&world->reference);
    weights_free(&world->weights);
}

/* Sums of a few numbers: round-off alone. */
static void check(const World *world, const char *id, double value, double error, const char *unit)
{
    const FileAnswer *answer = answers_find(&world->answers, "%s", id);
    if (!answer)
        fail_msg("no %s", id);
    if (isnan(value) ? !isnan(answer->value) : !(fabs(answer->value - value) <= 1e-12 * fabs(value)))
        fail_msg("%s is %.17g, want %.17g", id, answer->value, value);
    if (isnan(error) ? !isnan(answer->error) : !(fabs(answer->error - error) <= 1e-12 * fabs(error)))
        fail_msg("the error of %s is %.17g, want %.17g", id, answer->error, error);
    assert_string_equal(answer->unit, unit);
    assert_true(answer->label[0] && answer->method[0]);
}

static char *printed(const World *world)
{
    char *text = NULL;
    size_t size;
    FILE *out = open_memstream(&text, &size);
    assert_non_null(out);
    answers_print(&world->answers, &world->file, world->reference.count ? &world->reference : NULL, out);
    assert_int_equal(fclose(out), 0);
    return text;
}

static void check_pieces(char *text, const char *const *pieces)
{
    for (; *pieces; pieces++)
        if (!strstr(text, *pieces))
            fail_msg("no \"%s\" in:\n%s", *pieces, text);
    free(text);
}

static void path_of(void **state, const char *name, char *path)
{
    snprintf(path, PATH, "%s/%s", (char *)*state, name);
}

/* ---- one file ---- */

static void test_totals(void **state)
{
    char path[PATH];
    World world;
    path_of(state, "a.nc", path);
    write_made(path, gases, GASES, lines, LINES, "Gg year-1");
    read_world(state, &world, path, NULL);
    /* CFC-11 350 Gg in all; of CH3Br the 30 of the line */
    check(&world, "odp_emission_treaty_total", 1e3 * (350.0 + 0.6 * 30.0), NAN, "t");
    check(&world, "odp_emission_treaty_mass_total", 380.0, NAN, "Gg");
    check(&world, "odp_emission_treaty_natural_total", 1e3 * 0.6 * 90.0, NAN, "t");
    check(&world, "odp_emission_treaty_largest", 1e3 * (200.0 + 0.6 * 10.0), NAN, "t year-1");
    check(&world, "odp_emission_treaty_largest_year", 1981.5, NAN, "year");
    check(&world, "odp_emission_treaty_last", 1e3 * (50.0 + 0.6 * 20.0), NAN, "t year-1");
    /* noise: of each gas, times its mass, added up */
    check(&world, "odp_emission_own_total", 1e3 * (350.0 + 1.5 * 30.0 + 2.0 * 4.0),
          1e3 * (0.01 * 30.0 + 0.1 * 4.0), "t");
    check(&world, "odp_emission_own_controlled_total", 1e3 * (350.0 + 1.5 * 30.0), 1e3 * 0.01 * 30.0, "t");
    check(&world, "odp_emission_own_natural_total", 1e3 * 1.5 * 90.0, 1e3 * 0.01 * 90.0, "t");
    check(&world, "odp_emission_own_nitrogen_total", 1e3 * 0.03 * 300.0, 1e3 * 0.001 * 300.0, "t");
    check(&world, "odp_emission_own_largest", 1e3 * (200.0 + 15.0 + 2.0), 1e3 * (0.1 + 0.1), "t year-1");
    check(&world, "odp_emission_own_last", 1e3 * (50.0 + 30.0 + 4.0), 1e3 * (0.2 + 0.2), "t year-1");
    /* by gas, whole */
    check(&world, "odp_emission_treaty_CH3Br_total", 1e3 * 0.6 * 120.0, NAN, "t");
    check(&world, "odp_emission_own_halon_1202_largest", 1e3 * 2.0 * 2.0, 1e3 * 0.1 * 2.0, "t year-1");
    check(&world, "odp_emission_own_N2O_total", 9e3, 300.0, "t");
    check(&world, "emission_CO2_total", 1.2e8, NAN, "Gg");
    assert_null(answers_find(&world.answers, "odp_emission_treaty_halon_1202_total"));
    assert_null(answers_find(&world.answers, "odp_emission_own_CO2_total"));
    assert_null(answers_find(&world.answers, "odp_emission_treaty_N2O_total"));
    /* by line; the weights of N and N2O are the program's own, 14.007 and 44.013 g mol-1 */
    check(&world, "odp_emission_treaty_line_1_total", 1e3 * 0.6 * 30.0, 0.0, "t");
    check(&world, "odp_emission_own_line_1_total", 1e3 * 1.5 * 30.0, 1e3 * 0.01 * 30.0, "t");
    check(&world, "odp_emission_own_line_2_total", 1e3 * 0.03 * 42.0 * 44.013 / 28.014,
          1e3 * 0.001 * 42.0 * 44.013 / 28.014, "t");
    assert_null(answers_find(&world.answers, "odp_emission_treaty_line_2_total"));
    const FileAnswer *answer = answers_find(&world.answers, "odp_emission_treaty_total");
    assert_string_equal(answer->note, "not controlled, so not counted: halon-1202, HCFC-999");
    answer = answers_find(&world.answers, "odp_emission_own_total");
    assert_string_equal(answer->note, "without a potential, so not counted: HCFC-999");
    check_pieces(printed(&world),
                 (const char *[]){"368.0        403.0 +-0.7", "largest calendar year, 1981",
                                  "of CH3Br:", "  fumigation, \"all\"", "45.00\n",
                                  "  1981       206.0       217.0", "halon-1202, HCFC-999\n", NULL});
    free_world(&world);
}

static void test_difference(void **state)
{
    Gas other[GASES];
    char path[PATH], reference[PATH];
    World world;
    memcpy(other, gases, sizeof gases);
    other[0].emission[0] = 80.0;
    other[0].emission[2] = 60.0;
    other[2].emission[1] = 90.0;
    path_of(state, "a.nc", path);
    path_of(state, "b.nc", reference);
    write_made(path, gases, GASES, lines, LINES, "Gg year-1");
    write_made(reference, other, GASES - 1, NULL, 0, "Gg year-1"); /* CH3Br is now implied altogether */
    read_world(state, &world, path, reference);
    check(&world, "odp_emission_treaty_difference_total", 1e3 * (20.0 - 10.0), NAN, "t");
    check(&world, "odp_emission_treaty_difference_largest", 2e4, NAN, "t year-1");
    check(&world, "odp_emission_treaty_difference_largest_year", 1980.5, NAN, "year");
    check(&world, "odp_emission_own_difference_total", 1e4, 0.0,
          "t"); /* of CFC-11 alone, which has no noise */
    check(&world, "odp_emission_own_difference_nitrogen_total", 1e3 * 0.03 * 10.0, 1e3 * 0.001 * 10.0, "t");
    check(&world, "odp_emission_own_difference_CFC_11_total", 1e4, 0.0, "t");
    check(&world, "odp_emission_own_difference_CH3Br_total", 0.0, 0.0, "t");
    const double *years = world.answers.odp->difference[WEIGHT_OWN][ODP_COUNTED];
    assert_true(years[0] == 2e4 && years[1] == 0.0 && years[2] == -1e4);
    check(&world, "odp_emission_treaty_total", 368e3, NAN, "t"); /* that of the file alone is what it was */
    check_pieces(printed(&world), (const char *[]){"+10.00       +10.00", "less the reference", NULL});
    free_world(&world);
    /* itself */
    read_world(state, &world, path, path);
    check(&world, "odp_emission_own_difference_total", 0.0, 0.0, "t");
    check(&world, "odp_emission_own_difference_largest_year", NAN, NAN, "year");
    free_world(&world);
}

static void test_stored(void **state)
{
    char path[PATH];
    World world;
    Fault fault = {0};
    int file, variable;
    double value;
    path_of(state, "stored.nc", path);
    write_made(path, gases, GASES, lines, LINES, "Gg year-1");
    read_world(state, &world, path, NULL);
    if (answers_store(&world.answers, path, &fault))
        fail_msg("%s", fault.text);
    free_world(&world);
    NC(nc_open(path, NC_NOWRITE, &file));
    NC(nc_inq_varid(file, "answer_odp_emission_own_largest", &variable));
    NC(nc_get_var_double(file, variable, &value));
    assert_true(fabs(value - 217e3) < 1e-6);
    /* what the file holds itself, by gas and line, does not become a variable */
    assert_int_equal(nc_inq_varid(file, "answer_odp_emission_own_CH3Br_total", &variable), NC_ENOTVAR);
    assert_int_equal(nc_inq_varid(file, "answer_odp_emission_own_line_1_total", &variable), NC_ENOTVAR);
    NC(nc_close(file));
    read_world(state, &world, path, NULL); /* and the answers in it do not pass for emissions */
    check(&world, "odp_emission_treaty_total", 368e3, NAN, "t");
    free_world(&world);
}

/* ---- files that lack something ---- */

static void check_left_out(void **state, const char *path, const char *why)
{
    World world;
    read_world(state, &world, path, NULL);
    assert_int_equal(world.file.emissions.gases, 0);
    assert_null(answers_find(&world.answers, "odp_emission_treaty_total"));
    check_pieces(printed(&world), (const char *[]){"left out: emissions in ODP-tonnes", why, NULL});
    free_world(&world);
}

static void test_left_out(void **state)
{
    char path[PATH];
    Gas bad = gases[0];
    Fault fault = {0};
    FileSeries series;
    path_of(state, "old.nc", path);
    write_made(path, gases, 0, NULL, 0, "");
    check_left_out(state, path, "(not in the file)");
    bad.emission[1] = NC_FILL_DOUBLE; /* a record never written */
    write_made(path, &bad, 1, NULL, 0, "Gg year-1");
    check_left_out(state, path, "records of the file lack emission_CFC_11");
    bad = (Gas){"CFC-11", "freon", {1.0, 1.0, 1.0}};
    write_made(path, &bad, 1, NULL, 0, "Gg year-1");
    check_left_out(state, path, "does not say of what gas emission_CFC_11 is");
    write_made(path, gases, GASES, NULL, 0, "kg s-1");
    assert_int_equal(series_read(&series, path, NULL, &fault), FAULT_INPUT);
    check_fault(&fault, path, "emission_CFC_11", "kg s-1", "Gg year-1", NULL);
    /* a line whose gas has no emission, and one of an element the gas does not hold */
    const Line stray[] = {{"stray", "CFC-12", "CFC-12", {1.0, 1.0, 1.0}},
                          {"wrong", "CFC-11", "N", {1.0, 1.0, 1.0}}};
    for (int l = 0; l < 2; l++) {
        fault = (Fault){0};
        write_made(path, gases, GASES, &stray[l], 1, "Gg year-1");
        assert_int_equal(series_read(&series, path, NULL, &fault), FAULT_INPUT);
        check_fault(&fault, path, stray[l].label, stray[l].gas, NULL);
    }
}

/* ---- weights ---- */

static void check_refused(void **state, const char *text, const char *piece)
{
    char path[PATH];
    Fault fault = {0};
    OdpWeights weights;
    write_file(state, "bad.csv", text, path);
    assert_int_equal(weights_read(&weights, data_dir(), path, &fault), FAULT_INPUT);
    check_fault(&fault, "bad.csv", piece, NULL);
    assert_null(weights.own);
}

static void test_weights(void **state)
{
    char path[PATH];
    Fault fault = {0};
    OdpWeights weights;
    check_refused(state, "gas,odp,odp_noise\nCFC-11,1,0\n", "odp_frozen");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-11,0.9,0,1\n", "--reference");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-12,1,0,1\n", "CFC-11 is not 1");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-11,1,0,1\nCFC-11,1,0,1\n", "twice");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-11,,,\n", "neither");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-11,1,-1,1\n", "negative");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\nCFC-11,much,0,1\n", "much");
    check_refused(state, "gas,odp,odp_noise,odp_frozen\n,1,0,1\n", "no name");
    /* of skymend potency --adjoint: no factors made anew */
    write_file(state, "frozen.csv", "gas,odp,odp_noise,odp_frozen\nCFC-11,,,1\nCFC-12,,,0.81\n", path);
    assert_int_equal(weights_read(&weights, data_dir(), path, &fault), 0);
    assert_true(weights_potential(&weights, WEIGHT_OWN, "CFC-12") == 0.81);
    assert_true(isnan(weights_noise(&weights, WEIGHT_OWN, "CFC-12")));
    assert_true(isnan(weights_potential(&weights, WEIGHT_OWN, "CFC-113")));
    weights_free(&weights);
}

/* The tables of the data: what is in one of them, against the treaty's own figures. */
static void test_data(void **state)
{
    static const char *const controlled[] = {"CFC-11", "CFC-12", "CFC-113", "CCl4", "HCFC-22", "halon-1301"};
    Fault fault = {0};
    OdpWeights weights;
    (void)state;
    if (weights_read(&weights, data_dir(), NULL, &fault))
        fail_msg("%s", fault.text);
    for (size_t g = 0; g < sizeof controlled / sizeof *controlled; g++) {
        double treaty = weights_potential(&weights, WEIGHT_TREATY, controlled[g]);
        double own = weights_potential(&weights, WEIGHT_OWN, controlled[g]);
        /* the treaty's and a column without polar chemistry: within a factor of 3, the widest being bromine's
         */
        assert_true(own > treaty / 3.0 && own < treaty * 3.0);
        assert_true(weights_noise(&weights, WEIGHT_OWN, controlled[g]) < 2e-3 * own);
        assert_false(weights_natural(&weights, controlled[g]));
    }
    assert_true(isnan(weights_noise(&weights, WEIGHT_TREATY, "CFC-11")));
    assert_true(weights_natural(&weights, "CH3Br") && weights_natural(&weights, "CH3Cl"));
    assert_true(isnan(weights_potential(&weights, WEIGHT_TREATY, "N2O")));
    assert_true(weights_potential(&weights, WEIGHT_OWN, "N2O") > 0.0);
    weights_free(&weights);
}

/* ---- words ---- */

static void test_units(void **state)
{
    static const char *const units[][2] = {{"1e-12", ", ppt"}, {"1", ""}, {"", ""}, {"DU", ", DU"}};
    char word[20];
    (void)state;
    for (size_t u = 0; u < sizeof units / sizeof *units; u++) {
        answers_unit_word(word, sizeof word, ", ", units[u][0]);
        assert_string_equal(word, units[u][1]);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test_setup_teardown(test_totals, make_folder, remove_folder),
        cmocka_unit_test_setup_teardown(test_difference, make_folder, remove_folder),
        cmocka_unit_test_setup_teardown(test_stored, make_folder, remove_folder),
        cmocka_unit_test_setup_teardown(test_left_out, make_folder, remove_folder),
        cmocka_unit_test_setup_teardown(test_weights, make_folder, remove_folder),
        cmocka_unit_test(test_data),
        cmocka_unit_test(test_units),
    };
    return cmocka_run_group_tests_name("answers_emission", tests, NULL, NULL);
}
