/* Tests of the file of a projection (model/archive): its names, dates and contents, and what other programs
 * make of it. The model is made by hand: eight species on uneven layers in the standard atmosphere. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <sys/wait.h>

#include <netcdf.h>

#include "../input/constants.h"
#include "../model/archive.h"
#include "../model/calendar.h"
#include "../model/series.h"
#include "made_archive.h"

/* ---- reading back ---- */

static void check_text(int file, const char *variable, const char *attribute, const char *want)
{
    int id = NC_GLOBAL;
    size_t length;
    char text[2000] = "";
    if (variable && nc_inq_varid(file, variable, &id))
        fail_msg("no variable %s", variable);
    int absent = nc_inq_attlen(file, id, attribute, &length);
    if (!want) {
        assert_int_equal(absent, NC_ENOTATT);
        return;
    }
    if (absent)
        fail_msg("%s: no attribute %s", variable ? variable : "file", attribute);
    assert_true(length < sizeof text);
    assert_int_equal(nc_get_att_text(file, id, attribute, text), 0);
    assert_string_equal(text, want);
}

static double number(int file, const char *attribute)
{
    double value = NAN;
    if (nc_get_att_double(file, NC_GLOBAL, attribute, &value))
        fail_msg("no attribute %s", attribute);
    return value;
}

/* ---- names and dates ---- */

static void test_names(void **state)
{
    static const char *const pairs[][2] = {
        {"O3", "O3"},
        {"CFC-11", "CFC_11"},
        {"O(1D)", "O_1D"},
        {"halon-1301", "halon_1301"},
        {"HO2NO2", "HO2NO2"},
        {"(a)-b", "a_b"},
        {"2-pentyl", "X2_pentyl"},
        {"--", ""},
        {"", ""},
    };
    char name[40];
    (void)state;
    for (size_t p = 0; p < sizeof pairs / sizeof *pairs; p++) {
        archive_name(pairs[p][0], name, sizeof name);
        assert_string_equal(name, pairs[p][1]);
    }
    memset(name, '#', sizeof name); /* no byte beyond the size it was given */
    archive_name("CFC-113", name, 5);
    assert_string_equal(name, "CFC");
    assert_int_equal(name[5], '#');
}

/* Day counts from Python's datetime.date, an independent implementation of the Gregorian calendar. */
static void test_calendar(void **state)
{
    static const struct {
        double year;
        double days;
    } known[] = {{1950.0, 0.0},     {1955.0, 1826.0},  {1980.0, 10957.0}, {1980.5, 11140.0},
                 {1981.0, 11323.0}, {1981.5, 11505.5}, {2000.0, 18262.0}, {2001.0, 18628.0},
                 {2100.0, 54787.0}, {2101.0, 55152.0}};
    (void)state;
    for (size_t k = 0; k < sizeof known / sizeof *known; k++)
        assert_true(calendar_days(known[k].year) == known[k].days);
    /* round-off of many added steps must not leave the date */
    assert_true(calendar_days(1980.0 - 1e-10) == 10957.0);
    assert_true(calendar_date(1980, 7, 2) - calendar_year_start(CALENDAR_BASE_YEAR) == 11140.0);
    assert_true(calendar_date(1900, 3, 1) - calendar_date(1900, 2, 28) == 1.0);
    double base = calendar_year_start(CALENDAR_BASE_YEAR);
    for (double year = 1850.0; year < 2200.0; year += 0.0371) {
        double back = calendar_decimal_year(base + calendar_days(year));
        assert_true(fabs(back - year) < 1.0 / YEAR_SECONDS); /* written to the nearest second */
    }
}

/* ---- the file ---- */

static void test_contents(void **state)
{
    Made *made = made_model();
    const Grid *grid = &made->model.grid;
    char path[PATH];
    double two[2 * 64], values[64];
    path_in(state, "made.nc", path);
    write_years(made, path, 3);
    check_records(path, made, 3);

    int file = open_file(path), id, unlimited, dimensions, dimension[NC_MAX_VAR_DIMS], format, storage;
    size_t chunk[2];
    assert_int_equal(nc_inq_format(file, &format), 0);
    assert_int_equal(format, NC_FORMAT_NETCDF4);
    assert_int_equal(nc_inq_unlimdim(file, &unlimited), 0);
    assert_int_equal(nc_inq_dimid(file, "time", &id), 0);
    assert_int_equal(id, unlimited);
    assert_int_equal(length_of(file, "altitude"), grid->layers);
    assert_int_equal(length_of(file, "nv"), 2);

    /* 1980 is a leap year: bounds at the new years, middle at 2 July, 0 h */
    read_variable(file, "time", values);
    read_variable(file, "time_bnds", two);
    assert_true(values[0] == 11140.0 && values[1] == 11505.5);
    assert_true(two[0] == 10957.0 && two[1] == 11323.0 && two[2] == 11323.0 && two[3] == 11688.0);
    check_text(file, "time", "units", "days since 1950-01-01 00:00:00");
    check_text(file, "time", "calendar", "standard");
    check_text(file, "time", "bounds", "time_bnds");
    check_text(file, "time", "axis", "T");

    read_variable(file, "altitude", values);
    read_variable(file, "altitude_bnds", two);
    for (int i = 0; i < grid->layers; i++) {
        check_near(values[i], grid->middle[i] / 1e5, 1e-15);
        assert_true(two[2 * i] < values[i] && values[i] < two[2 * i + 1]);
        check_near(two[2 * i + 1], grid->edge[i + 1] / 1e5, 1e-15);
    }
    check_text(file, "altitude", "units", "km");
    check_text(file, "altitude", "positive", "up");
    check_text(file, "altitude", "axis", "Z");
    check_text(file, "altitude", "standard_name", "altitude");
    read_variable(file, "air_temperature", values);
    assert_true(values[4] == made->model.air.temperature[4]);
    read_variable(file, "air_pressure", values);
    assert_true(values[4] == made->model.air.pressure[4]);
    read_variable(file, "air_number_density", values);
    assert_true(values[4] == made->model.air.number_density[4]);
    read_variable(file, "eddy_diffusion", values);
    assert_true(values[grid->layers] == 1000.0 * (grid->layers + 1));

    check_text(file, "O3", "standard_name", "mole_fraction_of_ozone_in_air");
    check_text(file, "O3", "units", "mol mol-1");
    check_text(file, "O3", "cell_methods", "time: mean altitude: mean");
    check_text(file, "CFC_11", "standard_name", "mole_fraction_of_cfc11_in_air");
    check_text(file, "CFC_11", "long_name", "mole fraction of CFC-11 (CCl3F) in air");
    check_text(file, "CFC_11", "species", "CFC-11");
    check_text(file, "O_1D", "standard_name", NULL); /* the CF table has none */
    check_text(file, "O_1D", "long_name", "mole fraction of O(1D) (O) in air");
    check_text(file, "ozone_column", "standard_name", "atmosphere_mole_content_of_ozone");
    check_text(file, "ozone_column", "units", "DU");
    check_text(file, "ozone_column", "cell_methods", "time: mean");
    assert_int_equal(nc_inq_varid(file, "O3", &id), 0);
    assert_int_equal(nc_inq_var(file, id, NULL, NULL, &dimensions, dimension, NULL), 0);
    assert_int_equal(dimensions, 2);
    assert_int_equal(dimension[0], unlimited);
    assert_int_equal(nc_inq_var_chunking(file, id, &storage, chunk), 0);
    assert_int_equal(chunk[0], 1); /* a record is never rewritten */
    assert_int_equal(chunk[1], grid->layers);

    char *resolved = settings_text(&made->model.settings), text[20000] = "";
    size_t length;
    assert_non_null(resolved);
    assert_int_equal(nc_inq_attlen(file, NC_GLOBAL, "resolved_case", &length), 0);
    assert_true(length < sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "resolved_case", text), 0);
    assert_string_equal(text, resolved);
    free(resolved);
    check_text(file, NULL, "Conventions", "CF-1.10");
    check_text(file, NULL, "title", "a column made by hand");
    check_text(file, NULL, "references", "first source\nsecond source");
    check_text(file, NULL, "mechanism_version", "7");
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "caution", text), 0);
    assert_non_null(strstr(text, "competent authority"));
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "source", text), 0);
    assert_non_null(strstr(text, "Skymend"));
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "history", text), 0);
    assert_non_null(strstr(text, "Z: skymend project made.cfg"));
    assert_int_equal(nc_close(file), 0);
    made_free(made);
}

/* The atoms of a state whose mole fractions are the same on every layer: value * atoms * air column. */
static void test_summary(void **state)
{
    Made *made = made_model();
    const Grid *grid = &made->model.grid;
    Fault fault = {0};
    char path[PATH];
    double *x = calloc((size_t)SPECIES * (size_t)grid->padded, sizeof *x), air = 0.0;
    double received[SPECIES] = {0}, emitted[SPECIES] = {0}, exchanged[SPECIES] = {0}, washed[SPECIES] = {0};
    assert_non_null(x);
    for (int i = 0; i < grid->layers; i++)
        air += made->model.air.number_density[i] * grid->depth[i];
    for (int s = 0; s < SPECIES; s++)
        for (int i = 0; i < grid->layers; i++)
            x[FIELD(grid->padded, s, i)] = 1e-9 * (s + 1);
    received[2] = 4e15; /* CFC-11: 3 Cl each */
    emitted[2] = 1e15;
    washed[3] = 1e15;    /* HCl */
    exchanged[6] = 2e15; /* CH4 */
    Column column = {.x = x,
                     .time = 1983.0,
                     .received = received,
                     .emitted = emitted,
                     .exchanged = exchanged,
                     .washed = washed};
    column.counts = (SolverCounts){.calls = 11,
                                   .steps = 222,
                                   .rejections = 3,
                                   .factorisations = 225,
                                   .negatives = 4,
                                   .most_negative = -0.25};
    column.outer_steps = 36;
    column.days = 5000000000L; /* beyond an int */
    column.photolysis_refreshes = 9;
    column.factor_refreshes = 2;
    /* 3 * 3 + 1 * 4 parts in 1e9 of Cl; the ledger explains all but 1e12 of what was gained */
    double chlorine = 13e-9 * air, gained = 3 * 5e15 - 1e15;
    column.start_atoms[2] = chlorine - gained - 1e12;

    path_in(state, "summary.nc", path);
    Archive *archive = create(made, path, 0);
    assert_int_equal(append(archive, made, 0, 1980.0, 1.0, &fault), 0);
    assert_int_equal(archive_close(archive, &column, &fault), 0);
    int file = open_file(path);
    assert_true(number(file, "run_outer_steps") == 36.0);
    assert_true(number(file, "run_days") == 5e9);
    assert_true(number(file, "run_photolysis_refreshes") == 9.0);
    assert_true(number(file, "run_factor_refreshes") == 2.0);
    assert_true(number(file, "run_chemistry_calls") == 11.0);
    assert_true(number(file, "run_chemistry_steps") == 222.0);
    assert_true(number(file, "run_chemistry_rejections") == 3.0);
    assert_true(number(file, "run_chemistry_factorisations") == 225.0);
    assert_true(number(file, "run_negative_values") == 4.0);
    assert_true(number(file, "run_most_negative_per_cm3") == -0.25);
    check_near(number(file, "run_atoms_end_Cl_per_cm2"), chlorine, 1e-13);
    check_near(number(file, "run_atoms_start_Cl_per_cm2"), chlorine - gained - 1e12, 1e-13);
    check_near(number(file, "run_atoms_received_Cl_per_cm2"), gained, 1e-13);
    check_near(number(file, "run_closure_Cl"), 1e12 / chlorine, 1e-9);
    check_near(number(file, "run_atoms_end_Br_per_cm2"), 13e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_end_N_per_cm2"), 17e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_end_H_per_cm2"), 32e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_received_H_per_cm2"), 4 * 2e15 - 1e15, 1e-13);
    assert_int_equal(nc_close(file), 0);
    free(x);
    made_free(made);
}

static void test_repeatable(void **state)
{
    Made *made = made_model();
    char path[2][PATH], *bytes[2];
    size_t size[2];
    Fault fault = {0};
    Archive *archive = NULL;
    setenv("SOURCE_DATE_EPOCH", "315532800", 1); /* 1980-01-01 */
    for (int f = 0; f < 2; f++) {
        path_in(state, f ? "second.nc" : "first.nc", path[f]);
        write_years(made, path[f], 4);
        bytes[f] = bytes_of(path[f], &size[f]);
    }
    char never[PATH];
    path_in(state, "never.nc", never);
    setenv("SOURCE_DATE_EPOCH", "yesterday", 1);
    archive_create(&archive, &made->model, never, 0, "", &fault);
    unsetenv("SOURCE_DATE_EPOCH");
    check_fault(&fault, "SOURCE_DATE_EPOCH", "yesterday", NULL);
    assert_int_equal(access(never, F_OK), -1);
    assert_int_equal(size[0], size[1]);
    assert_memory_equal(bytes[0], bytes[1], size[0]);
    int file = open_file(path[0]);
    check_text(file, NULL, "history", "1980-01-01T00:00:00Z: skymend project made.cfg");
    nc_close(file);
    free(bytes[0]);
    free(bytes[1]);
    made_free(made);
}

/* What the archive wrote, as the answers read it. */
static void test_series(void **state)
{
    Made *made = made_model();
    FileSeries series;
    Fault fault = {0};
    char path[PATH];
    path_in(state, "series.nc", path);
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < 48; r++)
        assert_int_equal(append(archive, made, r, 1979.0, 1.0 / 12.0, &fault), 0);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    assert_int_equal(series.count, 48);
    for (int r = 0; r < 48; r++) {
        assert_true(series.value[SERIES_COLUMN][r] == made_column(r));
        assert_true(fabs(series.middle[r] - (1979.0 + (r + 0.5) / 12.0)) < 1.0 / YEAR_SECONDS);
    }
    series_free(&series);
    assert_null(series.middle);
    series_free(&series);
    made_free(made);
}

/* ---- what other programs make of it ---- */

static int run(const char *program, const char *arguments)
{
    char command[5 * PATH];
    snprintf(command, sizeof command, "%s %s", program, arguments);
    int status = system(command);
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

/* A projection of the usual look: a layer of ozone, and a column that is 300 DU until 1980, falls by half a
 * DU a year until 2000 and recovers by 0.3 DU a year: back in 2033.8. */
static void write_projection(const Made *made, const char *path)
{
    const Grid *grid = &made->model.grid;
    Fault fault = {0};
    Archive *archive = create(made, path, 0);
    for (int year = 1955; year <= 2100; year++) {
        double column = 300.0 - 0.5 * fmin(fmax(year - 1980, 0), 20) + 0.3 * fmax(year - 2000, 0);
        double *x = made_state(made, year - 1955);
        for (int i = 0; i < grid->layers; i++) {
            double z = grid->middle[i] / 1e5;
            x[FIELD(grid->padded, 0, i)] = 8e-6 * exp(-pow((z - 33.0) / 13.0, 2)) * column / 300.0 + 3e-8;
        }
        const Record record = {
            .time = year + 0.5, .time_start = year, .time_end = year + 1.0, .x = x, .ozone_column = column};
        if (archive_append(archive, &record, &fault))
            fail_msg("%s", fault.text);
        free(x);
    }
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
}

static const char *python(void)
{
    const char *given = getenv("PYTHON");
    return given ? given : "/usr/bin/python3";
}

static void test_readback(void **state)
{
    Made *made = made_model();
    char path[PATH], arguments[3 * PATH];
    path_in(state, "readback.nc", path);
    write_projection(made, path);
    made_free(made);
    if (run("command -v ncdump cdo ncks", ">/dev/null 2>&1")) {
        print_message("           ncdump, cdo and ncks are not all installed\n");
        skip();
    }
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1 || { cat '%s/log'; false; }", path,
             (char *)*state, (char *)*state);
    assert_int_equal(run("sh tests/check_readback.sh", arguments), 0);
    /* and it does fail: on a file that is cut short, and on one that holds something else */
    char cut[PATH];
    size_t size;
    char *bytes = bytes_of(path, &size);
    write_bytes(state, "cut.nc", bytes, size / 2, cut);
    free(bytes);
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1", cut, (char *)*state);
    assert_int_not_equal(run("sh tests/check_readback.sh", arguments), 0);
    int file, id; /* a column in a unit that is none */
    assert_int_equal(nc_open(path, NC_WRITE, &file), 0);
    assert_int_equal(nc_inq_varid(file, "ozone_column", &id), 0);
    assert_int_equal(nc_put_att_text(file, id, "units", 7, "dobsons"), 0);
    assert_int_equal(nc_close(file), 0);
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1", path, (char *)*state);
    assert_int_not_equal(run("sh tests/check_readback.sh", arguments), 0);
}

static void test_plot(void **state)
{
    Made *made = made_model();
    char path[PATH], image[PATH], arguments[4 * PATH];
    size_t size;
    path_in(state, "plot.nc", path);
    path_in(state, "plot.png", image);
    write_projection(made, path);
    made_free(made);
    if (run(python(), "-c 'import netCDF4, matplotlib' 2>/dev/null")) {
        print_message("           %s has no netCDF4 or matplotlib\n", python());
        skip();
    }
    snprintf(arguments, sizeof arguments, "scripts/plot_cases.py '%s' -o '%s'", path, image);
    assert_int_equal(run(python(), arguments), 0);
    unsigned char *bytes = (unsigned char *)bytes_of(image, &size);
    /* PNG: 8 bytes of signature, then IHDR with width and height, big-endian (ISO/IEC 15948, 11.2.2) */
    assert_true(size > 20000);
    assert_memory_equal(bytes, "\x89PNG\r\n\x1a\n", 8);
    int width = bytes[18] << 8 | bytes[19], height = bytes[22] << 8 | bytes[23];
    assert_in_range(width, 800, 4000);
    assert_in_range(height, 800, 4000);
    free(bytes);
    snprintf(arguments, sizeof arguments, "scripts/plot_cases.py '%s' -o '%s' 2>/dev/null", image, image);
    assert_int_equal(run(python(), arguments), 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_names), cmocka_unit_test(test_calendar), WITH_FOLDER(test_contents),
        WITH_FOLDER(test_summary),    WITH_FOLDER(test_repeatable),    WITH_FOLDER(test_series),
        WITH_FOLDER(test_readback),   WITH_FOLDER(test_plot),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
