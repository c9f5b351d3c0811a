/* Tests of model/answers: series whose minimum and return year are known in closed form, files that are no
 * series, and the printed table. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <netcdf.h>

#include "../model/answers.h"

enum { PATH = 300 };

/* ---- computing ---- */

/* A series of yearly means: down by fall a year from 1980.5 to 2000.5, then up by rise a year. */
enum { YEARS = 146, FIRST = 1955 };

static ColumnSeries valley(double *time, double *column, int count, double fall, double rise)
{
    for (int i = 0; i < count; i++) {
        time[i] = FIRST + i + 0.5;
        column[i] =
            300.0 - fall * fmin(fmax(time[i] - 1980.5, 0.0), 20.0) + rise * fmax(time[i] - 2000.5, 0.0);
    }
    return (ColumnSeries){count, time, column};
}

static void test_valley(void **state)
{
    double time[YEARS], column[YEARS];
    Answers answers;
    Fault fault = {0};
    ColumnSeries series = valley(time, column, YEARS, 0.5, 0.3);
    (void)state;
    /* 10 DU down, 0.3 DU a year up: back after 10 / 0.3 years */
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    assert_int_equal(answers.has_minimum, 1);
    assert_true(answers.minimum_year == 2000.5);
    check_near(answers.minimum, 290.0, 1e-14);
    assert_true(answers.benchmark_year == 1980.0);
    check_near(answers.benchmark, 300.0, 1e-14);
    assert_int_equal(answers.returns, 1);
    check_near(answers.return_year, 2000.5 + 10.0 / 0.3, 1e-12);
    /* a benchmark on the way down: 300 - 0.5 * 10 DU */
    assert_int_equal(answers_compute(&answers, &series, 1990, &fault), 0);
    check_near(answers.benchmark, 295.0, 1e-14);
    check_near(answers.return_year, 2000.5 + 5.0 / 0.3, 1e-12);
    /* too slow to be back in 2100.5: 300 - 10 + 0.09 * 100 */
    series = valley(time, column, YEARS, 0.5, 0.09);
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    assert_int_equal(answers.returns, 0);
    assert_true(isnan(answers.return_year));
    /* never below */
    series = valley(time, column, YEARS, -0.1, 0.3);
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    assert_int_equal(answers.returns, -1);
    /* benchmark not in the file: minimum all the same */
    series = valley(time, column, YEARS, 0.5, 0.3);
    assert_int_equal(answers_compute(&answers, &series, 1950, &fault), 0);
    assert_int_equal(answers.returns, -1);
    assert_true(isnan(answers.benchmark));
    assert_true(answers.has_minimum && answers.minimum_year == 2000.5);
    assert_int_equal(answers_compute(&answers, &series, 2101, &fault), 0);
    assert_int_equal(answers.returns, -1);
}

static void test_first_crossing(void **state)
{
    double time[10], column[10] = {300, 300, 290, 280, 295, 301, 299, 298, 302, 303};
    Answers answers;
    Fault fault = {0};
    (void)state;
    for (int i = 0; i < 10; i++)
        time[i] = 1979.5 + i;
    ColumnSeries series = {10, time, column};
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    check_near(answers.return_year, 1983.5 + 5.0 / 6.0, 1e-14); /* 295 to 301 passes 300, not 298 to 302 */
    /* lowest of all before the benchmark year: no loss to come back from */
    double early[10] = {200, 250, 290, 280, 295, 301, 299, 298, 302, 303};
    series.column = early;
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    assert_true(answers.minimum == 200.0 && answers.minimum_year == 1979.5);
    assert_int_equal(answers.returns, -1);
    /* up through the benchmark on the way to the minimum is no return */
    double late[10] = {300, 300, 299, 301, 290, 280, 295, 299, 301, 303};
    series.column = late;
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    check_near(answers.return_year, 1987.0, 1e-14); /* half-way between 299 in 1986.5 and 301 in 1987.5 */
    series.count = 0;
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), FAULT_INPUT);
}

/* Quarters: the benchmark is the mean of the four, a year with three is not covered. */
static void test_quarters(void **state)
{
    double time[12], column[12] = {301, 303, 299, 297, 290, 291, 292, 293, 301, 302, 303, 304};
    Answers answers;
    Fault fault = {0};
    (void)state;
    for (int i = 0; i < 12; i++)
        time[i] = 1980.125 + 0.25 * i;
    ColumnSeries series = {12, time, column};
    assert_int_equal(answers_compute(&answers, &series, 1980, &fault), 0);
    check_near(answers.benchmark, 300.0, 1e-15);
    assert_int_equal(answers.returns, 1);
    check_near(answers.return_year, 1981.875 + 0.25 * 7.0 / 8.0, 1e-14);
    series.count = 11;
    assert_int_equal(answers_compute(&answers, &series, 1982, &fault), 0);
    assert_true(isnan(answers.benchmark));
    assert_int_equal(answers.returns, -1);
}

static char *printed(const ColumnSeries *series, int benchmark)
{
    Answers answers;
    Fault fault = {0};
    char *text = NULL;
    size_t size;
    assert_int_equal(answers_compute(&answers, series, benchmark, &fault), 0);
    FILE *out = open_memstream(&text, &size);
    assert_non_null(out);
    answers_print(&answers, series, out);
    assert_int_equal(fclose(out), 0);
    return text;
}

static void check_printed(const ColumnSeries *series, int benchmark, const char *const *pieces)
{
    char *text = printed(series, benchmark);
    for (; *pieces; pieces++)
        if (!strstr(text, *pieces))
            fail_msg("no \"%s\" in:\n%s", *pieces, text);
    free(text);
}

static void test_table(void **state)
{
    double time[YEARS], column[YEARS];
    ColumnSeries series = valley(time, column, YEARS, 0.5, 0.3);
    (void)state;
    check_printed(&series, 1980,
                  (const char *[]){
                      "290.00 DU in 2000.50", "return to 1980     2033.8", "  1960      300.00     +0.00",
                      "  1980      300.00     +0.00     +0.00  benchmark",
                      "  1990      295.00     -5.00     -1.67\n", "  2050      305.00     +5.00     +1.67\n",
                      "  2100      320.00", "competent authority", NULL});
    check_printed(&series, 1985, (const char *[]){"  1985      297.50     +0.00     +0.00  benchmark", NULL});
    check_printed(&series, 1900,
                  (const char *[]){"not known: the file does not cover the whole of 1900",
                                   "  1990      295.00         -         -\n", NULL});
    series = valley(time, column, YEARS, 0.5, 0.09);
    check_printed(&series, 1980,
                  (const char *[]){"not by the end of the file (2100.50): still 1.00 DU below", NULL});
    series = valley(time, column, YEARS, -0.1, 0.3);
    check_printed(&series, 1980, (const char *[]){"never below 300.00 DU after 1980", NULL});
    column[YEARS - 1] = 250.0; /* back in between, and below again at the end */
    series = valley(time, column, YEARS, 0.5, 0.3);
    column[YEARS - 1] = 299.0;
    check_printed(&series, 1980,
                  (const char *[]){"2033.8", "but below it again in 2100.50 (299.00 DU)", NULL});
}

/* ---- reading ---- */

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
    ColumnSeries series;
    Fault fault = {0};
    char path[PATH];
    snprintf(path, sizeof path, "%s/other.nc", (char *)*state);
    write_other(path, "ozone_column", "hours since 1980-07-02T12:00:00", "DU", "proleptic_gregorian", 8760.0,
                299.0);
    assert_int_equal(series_read(&series, path, &fault), 0); /* 183.5 days into 366, 182.5 into 365 */
    check_near(series.time[0], 1980.0 + 183.5 / 366.0, 1e-15);
    check_near(series.time[1], 1981.0 + 182.5 / 365.0, 1e-15);
    series_free(&series);
    for (size_t w = 0; w < sizeof wrong / sizeof *wrong; w++) {
        fault = (Fault){0};
        write_other(path, wrong[w].name, wrong[w].units, wrong[w].column_units, wrong[w].calendar,
                    wrong[w].later, wrong[w].column);
        assert_int_equal(series_read(&series, path, &fault), FAULT_INPUT);
        check_fault(&fault, path, wrong[w].complaint, NULL);
        assert_null(series.time);
    }
    fault = (Fault){0};
    write_file(state, "text.nc", "year,column\n1980,300\n", path);
    assert_int_equal(series_read(&series, path, &fault), FAULT_INPUT);
    check_fault(&fault, path, "NetCDF", NULL);
    fault = (Fault){0};
    snprintf(path, sizeof path, "%s/missing.nc", (char *)*state);
    assert_int_equal(series_read(&series, path, &fault), FAULT_INPUT);
    check_fault(&fault, path, "No such file", NULL);
    fault = (Fault){0};
    assert_int_equal(series_read(&series, *state, &fault), FAULT_INPUT);
    check_fault(&fault, "is not a file", NULL);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_valley), cmocka_unit_test(test_first_crossing), cmocka_unit_test(test_quarters),
        cmocka_unit_test(test_table),  WITH_FOLDER(test_series_other),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
