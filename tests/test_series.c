/* Tests of model/series: what can be read off series known in closed form, partial columns of a profile whose
 * parts are sums on paper, and files that are no series. */
#define _XOPEN_SOURCE 700
#include "made_archive.h"

#include "../input/constants.h"
#include "../model/series.h"
#include "made_series.h"

/* ---- minimum and return ---- */

static void test_valley(void **state)
{
    Yearly years;
    (void)state;
    /* 10 DU down, 0.3 DU a year up: back after 10 / 0.3 years */
    Series series = valley(&years, 0.5, 0.3);
    SeriesReturn back = series_return(&series, 1, 1980);
    int low = series_extreme(&series, 1, -INFINITY);
    assert_true(series.middle[low] == 2000.5);
    check_near(series.value[low], 290.0, 1e-14);
    assert_int_equal(back.state, RETURN_FOUND);
    check_near(back.value, 300.0, 1e-14);
    check_near(back.year, 2000.5 + 10.0 / 0.3, 1e-12);
    check_near(back.slope, 0.3, 1e-11);
    assert_int_equal(back.again, -1);
    /* a benchmark on the way down: 300 - 0.5 * 10 DU */
    back = series_return(&series, 1, 1990);
    check_near(back.value, 295.0, 1e-14);
    check_near(back.year, 2000.5 + 5.0 / 0.3, 1e-12);
    /* the same upside down, as chlorine goes */
    for (int i = 0; i < YEARS; i++)
        years.value[i] = 600.0 - years.value[i];
    back = series_return(&series, -1, 1980);
    assert_true(series.middle[series_extreme(&series, -1, -INFINITY)] == 2000.5);
    check_near(back.year, 2000.5 + 10.0 / 0.3, 1e-12);
    check_near(back.slope, -0.3, 1e-11);
    /* too slow to be back in 2100.5: 300 - 10 + 0.09 * 100 */
    series = valley(&years, 0.5, 0.09);
    back = series_return(&series, 1, 1980);
    assert_int_equal(back.state, RETURN_LATER);
    assert_true(isnan(back.year));
    series = valley(&years, -0.1, 0.3);
    assert_int_equal(series_return(&series, 1, 1980).state, RETURN_NEVER_AWAY);
    /* benchmark not in the file */
    series = valley(&years, 0.5, 0.3);
    assert_int_equal(series_return(&series, 1, 1950).state, RETURN_UNKNOWN);
    assert_true(isnan(series_return(&series, 1, 1950).value));
    assert_int_equal(series_return(&series, 1, 2101).state, RETURN_UNKNOWN);
}

static void test_first_crossing(void **state)
{
    Yearly years;
    const double middle[10] = {300, 300, 290, 280, 295, 301, 299, 298, 302, 303};
    (void)state;
    Series series = yearly(&years, 1979, middle, 10);
    SeriesReturn back = series_return(&series, 1, 1980);
    check_near(back.year, 1983.5 + 5.0 / 6.0, 1e-14); /* 295 to 301 passes 300, not 298 to 302 */
    assert_int_equal(back.again, 6);                  /* 299 in 1985 */
    /* lowest of all before the benchmark year: no loss to come back from */
    const double early[10] = {200, 250, 290, 280, 295, 301, 299, 298, 302, 303};
    series = yearly(&years, 1979, early, 10);
    assert_int_equal(series_extreme(&series, 1, -INFINITY), 0);
    assert_int_equal(series_return(&series, 1, 1980).state, RETURN_NEVER_AWAY);
    /* up through the benchmark on the way to the minimum is no return */
    const double late[10] = {300, 300, 299, 301, 290, 280, 295, 299, 301, 303};
    series = yearly(&years, 1979, late, 10);
    check_near(series_return(&series, 1, 1980).year, 1987.0, 1e-14); /* half-way from 299 to 301 */
    series.count = 0;
    assert_int_equal(series_return(&series, 1, 1980).state, RETURN_UNKNOWN);
    assert_int_equal(series_extreme(&series, 1, -INFINITY), -1);
}

/* Quarters: the benchmark is the mean of the four, a year with three is not covered. */
static void test_quarters(void **state)
{
    double start[12], middle[12], end[12],
        value[12] = {301, 303, 299, 297, 290, 291, 292, 293, 301, 302, 303, 304};
    (void)state;
    for (int i = 0; i < 12; i++) {
        start[i] = 1980.0 + 0.25 * i;
        middle[i] = start[i] + 0.125;
        end[i] = start[i] + 0.25;
    }
    Series series = {12, start, middle, end, value};
    SeriesReturn back = series_return(&series, 1, 1980);
    check_near(back.value, 300.0, 1e-15);
    check_near(back.year, 1981.875 + 0.25 * 7.0 / 8.0, 1e-14);
    series.count = 11;
    assert_true(isnan(series_year_mean(&series, 1982)));
    check_near(series_year_mean(&series, 1981), 291.5, 1e-15);
    /* an interval that lies in two years counts to each by its share: 1/4 of 400 and 3/4 of 300 */
    const double begin[2] = {1980.0, 1980.75}, mid[2] = {1980.375, 1981.25}, stop[2] = {1980.75, 1981.75},
                 across[2] = {300.0, 400.0};
    series = (Series){2, begin, mid, stop, across};
    check_near(series_year_mean(&series, 1980), 325.0, 1e-14);
}

/* ---- smoothing ---- */

static void test_smoothing(void **state)
{
    Yearly years;
    double store[4 * YEARS], value[YEARS];
    (void)state;
    /* a straight line stays one, and loses five years at either end */
    for (int i = 0; i < YEARS; i++)
        value[i] = 300.0 + 0.1 * i;
    Series series = yearly(&years, FIRST, value, YEARS), smooth = series_smooth(&series, 11.0, store);
    assert_int_equal(smooth.count, YEARS - 10);
    assert_true(smooth.middle[0] == FIRST + 5.5 && smooth.middle[YEARS - 11] == FIRST + YEARS - 5.5);
    for (int i = 0; i < smooth.count; i++)
        check_near(smooth.value[i], 300.0 + 0.1 * (i + 5), 1e-14);
    /* a cycle of eleven years is gone */
    for (int i = 0; i < YEARS; i++)
        value[i] = 300.0 + 3.0 * sin(2.0 * PI * i / 11.0);
    series = yearly(&years, FIRST, value, YEARS);
    smooth = series_smooth(&series, 11.0, store);
    for (int i = 0; i < smooth.count; i++)
        check_near(smooth.value[i], 300.0, 1e-14);
    /* four years cut the outer intervals in half: of squares, (4 / 2 + 1 + 0 + 1 + 4 / 2) / 4 = 1.5 more */
    for (int i = 0; i < YEARS; i++)
        value[i] = (double)i * i;
    series = yearly(&years, FIRST, value, YEARS);
    smooth = series_smooth(&series, 4.0, store);
    assert_int_equal(smooth.count, YEARS - 4);
    for (int i = 0; i < smooth.count; i++)
        check_near(smooth.value[i], (i + 2.0) * (i + 2.0) + 1.5, 1e-13);
    /* nothing over a gap, nothing from a file shorter than the window */
    for (int i = 50; i < YEARS; i++) {
        years.start[i] += 1.0;
        years.middle[i] += 1.0;
        years.end[i] += 1.0;
    }
    smooth = series_smooth(&series, 11.0, store);
    assert_int_equal(smooth.count, YEARS - 20);
    series.count = 10;
    assert_int_equal(series_smooth(&series, 11.0, store).count, 0);
}

/* The valley smoothed: its sides stay as they are, its corner of 1980 is 0.5 (1 + ... + 5) / 11 lower. */
static void test_smoothed_return(void **state)
{
    Yearly years;
    double store[4 * YEARS];
    (void)state;
    Series series = valley(&years, 0.5, 0.3), smooth = series_smooth(&series, 11.0, store);
    SeriesReturn back = series_return(&smooth, 1, 1980);
    check_near(back.value, 300.0 - 7.5 / 11.0, 1e-14);
    check_near(back.year, 2000.5 + (10.0 - 7.5 / 11.0) / 0.3, 1e-12);
    /* at the bottom (0.5 + 0.3) 15 / 11 higher */
    int low = series_extreme(&smooth, 1, -INFINITY);
    check_near(smooth.value[series_extreme(&smooth, 1, 2000.0)], smooth.value[low], 1e-15);
    double bottom = NAN;
    for (int i = 0; i < smooth.count; i++)
        if (smooth.middle[i] == 2000.5)
            bottom = smooth.value[i];
    check_near(bottom, 290.0 + 0.8 * 15.0 / 11.0, 1e-14);
}

static void test_spread(void **state)
{
    Yearly years;
    (void)state;
    Series series = valley(&years, 0.5, 0.3);
    int low = series_extreme(&series, 1, -INFINITY);
    /* within 1 DU of the lowest: two years down the steep side, three up the other */
    assert_true(series_extreme_spread(&series, 1, low, 1.05) == 3.0);
    assert_true(series_extreme_spread(&series, 1, low, 0.55) == 1.0);
    assert_true(series_extreme_spread(&series, 1, low, 0.0) == 0.0);
}

/* ---- partial columns ---- */

/* The made column with ozone_column as its layers have it, times off. */
static void write_ozone(const Made *made, const char *path, double off)
{
    Fault fault = {0};
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < 3; r++) {
        double *x = made_state(made, r);
        const Record record = {.time = 1980.5 + r,
                               .time_start = 1980.0 + r,
                               .time_end = 1981.0 + r,
                               .x = x,
                               .ozone_column = off * column_ozone_du(&made->model, x)};
        if (archive_append(archive, &record, &fault))
            fail_msg("%s", fault.text);
        free(x);
    }
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
}

/* Ozone of the layers first..last (shares of the first and last), DU. */
static double layers_du(const Made *made, int record, int first, double of_first, int last, double of_last)
{
    const Grid *grid = &made->model.grid;
    double sum = 0.0;
    for (int i = first; i <= last; i++)
        sum += (i == first  ? of_first
                : i == last ? of_last
                            : 1.0) *
               made_value(record, 0, i) * made->model.air.number_density[i] * grid->depth[i] / DOBSON_CM2;
    return sum;
}

static void test_parts(void **state)
{
    Made *made = made_model();
    FileSeries series;
    Fault fault = {0};
    char path[PATH];
    path_in(state, "parts.nc", path);
    made->model.settings.tropopause_km = 12.0;
    write_ozone(made, path, 1.0);
    if (series_read(&series, path, NULL, &fault))
        fail_msg("%s", fault.text);
    assert_true(series.limit_km[0] == 12.0 && series.limit_km[1] == 24.0 && series.limit_km[2] == 32.0);
    for (int r = 0; r < 3; r++) {
        /* layers end at 0 2 5 9 14 20 27 35 44 ... km: 12, 24 and 32 km cut them at 3/5, 4/7 and 5/8 */
        check_near(series.value[SERIES_TROPOSPHERE][r], layers_du(made, r, 0, 1.0, 3, 0.6), 1e-13);
        check_near(series.value[SERIES_LOWER][r], layers_du(made, r, 3, 0.4, 5, 4.0 / 7.0), 1e-13);
        check_near(series.value[SERIES_MIDDLE][r], layers_du(made, r, 5, 3.0 / 7.0, 6, 5.0 / 8.0), 1e-13);
        double above = made_value(r, 0, 10) * made->model.air.column_above_top / DOBSON_CM2;
        check_near(series.value[SERIES_UPPER][r], layers_du(made, r, 6, 3.0 / 8.0, 10, 1.0) + above, 1e-12);
        double sum = 0.0;
        for (int kind = SERIES_TROPOSPHERE; kind <= SERIES_UPPER; kind++)
            sum += series.value[kind][r];
        check_near(sum, series.value[SERIES_COLUMN][r], 2e-16);
    }
    series_free(&series);
    /* limits at edges of layers */
    const double limits[3] = {14.0, 20.0, 35.0};
    assert_int_equal(series_read(&series, path, limits, &fault), 0);
    check_near(series.value[SERIES_LOWER][1], layers_du(made, 1, 4, 1.0, 4, 1.0), 1e-13);
    check_near(series.value[SERIES_MIDDLE][1], layers_du(made, 1, 5, 1.0, 6, 1.0), 1e-13);
    series_free(&series);
    /* limits that are none leave the parts out and say so */
    const double above_top[3] = {14.0, 20.0, 90.0};
    assert_int_equal(series_read(&series, path, above_top, &fault), 0);
    assert_null(series.value[SERIES_LOWER]);
    assert_non_null(strstr(series.missing[SERIES_LOWER], "90 km"));
    assert_non_null(series.value[SERIES_COLUMN]);
    series_free(&series);
    /* so does a column that is not that of the layers; single precision does not */
    path_in(state, "rounded.nc", path);
    write_ozone(made, path, 1.0 + 1e-7);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    assert_non_null(series.value[SERIES_LOWER]);
    series_free(&series);
    path_in(state, "other.nc", path);
    write_ozone(made, path, 1.01);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    assert_null(series.value[SERIES_UPPER]);
    assert_non_null(strstr(series.missing[SERIES_UPPER], "differ by up to"));
    series_free(&series);
    made_free(made);
}

/* ---- other series, other files ---- */

static void test_others(void **state)
{
    Made *made = made_model();
    FileSeries series;
    Fault fault = {0};
    char path[PATH];
    int file, dimension, variable;
    const double ppt[3] = {1800.0, 1850.0, 1900.0}, index[3] = {9.0, NC_FILL_DOUBLE, 9.2};
    path_in(state, "others.nc", path);
    write_ozone(made, path, 1.0);
    assert_int_equal(nc_open(path, NC_WRITE, &file), 0);
    assert_int_equal(nc_inq_dimid(file, "time", &dimension), 0);
    assert_int_equal(nc_redef(file), 0);
    assert_int_equal(nc_def_var(file, "equivalent_chlorine_3yr", NC_DOUBLE, 1, &dimension, &variable), 0);
    assert_int_equal(nc_put_att_text(file, variable, "units", 3, "ppt"), 0);
    assert_int_equal(nc_enddef(file), 0);
    assert_int_equal(nc_put_var_double(file, variable, ppt), 0);
    assert_int_equal(nc_redef(file), 0);
    assert_int_equal(nc_def_var(file, "uv_index_noon", NC_DOUBLE, 1, &dimension, &variable), 0);
    assert_int_equal(nc_enddef(file), 0);
    assert_int_equal(nc_put_var_double(file, variable, index), 0);
    assert_int_equal(nc_close(file), 0);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    assert_memory_equal(series.value[SERIES_EESC3], ppt, sizeof ppt);
    assert_string_equal(series.unit[SERIES_EESC3], "ppt");
    assert_null(series.value[SERIES_EESC55]);
    assert_null(series.value[SERIES_UV]); /* a record lacks it */
    assert_non_null(strstr(series.missing[SERIES_UV], "record 2"));
    series_free(&series);
    made_free(made);
}

/* A small file as another tool might leave it. */
static void write_other(const char *path, const char *name, const char *units, const char *column_units,
                        const char *calendar, double later, double column)
{
    int file, dimension, time, value;
    const double times[2] = {0.0, later}, columns[2] = {300.0, column};
    assert_int_equal(nc_create(path, NC_CLOBBER, &file), 0);
    assert_int_equal(nc_def_dim(file, "time", 2, &dimension), 0);
    assert_int_equal(nc_def_var(file, "time", NC_DOUBLE, 1, &dimension, &time), 0);
    assert_int_equal(nc_def_var(file, name, NC_DOUBLE, 1, &dimension, &value), 0);
    assert_int_equal(nc_put_att_text(file, time, "units", strlen(units), units), 0);
    assert_int_equal(nc_put_att_text(file, time, "calendar", strlen(calendar), calendar), 0);
    assert_int_equal(nc_put_att_text(file, value, "units", strlen(column_units), column_units), 0);
    assert_int_equal(nc_enddef(file), 0);
    assert_int_equal(nc_put_var_double(file, time, times), 0);
    assert_int_equal(nc_put_var_double(file, value, columns), 0);
    assert_int_equal(nc_close(file), 0);
}

static void test_series_other(void **state)
{
    static const struct {
        const char *name, *units, *column_units, *calendar;
        double later, column;
        const char *complaint;
    } wrong[] = {
        {"column", "days since 1980-07-02", "DU", "standard", 365.0, 299.0, "no variable ozone_column"},
        {"ozone_column", "years since 1980", "DU", "standard", 1.0, 299.0, "\"years since 1980\""},
        {"ozone_column", "months since 1980-01-01", "DU", "standard", 1.0, 299.0,
         "days, hours, minutes or seconds"},
        {"ozone_column", "days since 1980-07-02", "DU", "360_day", 365.0, 299.0, "360_day"},
        {"ozone_column", "days since 1980-07-02", "mol m-2", "standard", 365.0, 299.0, "DU is wanted"},
        {"ozone_column", "days since 1980-07-02", "DU", "standard", -1.0, 299.0, "time does not increase"},
        {"ozone_column", "days since 1980-07-02", "DU", "standard", 365.0, NC_FILL_DOUBLE, "record 2"},
        {"ozone_column", "days since 1980-07-02", "DU", "standard", 365.0, NAN, "record 2"},
    };
    FileSeries series;
    Fault fault = {0};
    char path[PATH];
    snprintf(path, sizeof path, "%s/other.nc", (char *)*state);
    write_other(path, "ozone_column", "hours since 1980-07-02T12:00:00", "DU", "proleptic_gregorian", 8760.0,
                299.0);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0); /* 183.5 days into 366, 182.5 into 365 */
    check_near(series.middle[0], 1980.0 + 183.5 / 366.0, 1e-15);
    check_near(series.middle[1], 1981.0 + 182.5 / 365.0, 1e-15);
    /* no bounds: intervals as long as the step to the neighbour, half on either side */
    check_near(series.start[0], series.middle[0] - 0.5 * (series.middle[1] - series.middle[0]), 1e-15);
    check_near(series.end[0], 0.5 * (series.middle[0] + series.middle[1]), 1e-15);
    for (int kind = SERIES_TROPOSPHERE; kind < SERIES_KINDS; kind++) {
        assert_null(series.value[kind]);
        assert_true(series.missing[kind][0] != '\0');
    }
    series_free(&series);
    for (size_t w = 0; w < sizeof wrong / sizeof *wrong; w++) {
        fault = (Fault){0};
        write_other(path, wrong[w].name, wrong[w].units, wrong[w].column_units, wrong[w].calendar,
                    wrong[w].later, wrong[w].column);
        assert_int_equal(series_read(&series, path, NULL, &fault), FAULT_INPUT);
        check_fault(&fault, path, wrong[w].complaint, NULL);
        assert_null(series.middle);
    }
    fault = (Fault){0};
    write_file(state, "text.nc", "year,column\n1980,300\n", path);
    assert_int_equal(series_read(&series, path, NULL, &fault), FAULT_INPUT);
    check_fault(&fault, path, "NetCDF", NULL);
    fault = (Fault){0};
    snprintf(path, sizeof path, "%s/missing.nc", (char *)*state);
    assert_int_equal(series_read(&series, path, NULL, &fault), FAULT_INPUT);
    check_fault(&fault, path, "No such file", NULL);
    fault = (Fault){0};
    assert_int_equal(series_read(&series, *state, NULL, &fault), FAULT_INPUT);
    check_fault(&fault, "is not a file", NULL);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_valley),
        cmocka_unit_test(test_first_crossing),
        cmocka_unit_test(test_quarters),
        cmocka_unit_test(test_smoothing),
        cmocka_unit_test(test_smoothed_return),
        cmocka_unit_test(test_spread),
        WITH_FOLDER(test_parts),
        WITH_FOLDER(test_others),
        WITH_FOLDER(test_series_other),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
