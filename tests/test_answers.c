/* Tests of model/answers: lists made of series known in closed form, their errors, one file against another,
 * and how they are told and stored. */
#define _XOPEN_SOURCE 700
#include "made_archive.h"

#include <signal.h>
#include <sys/resource.h>

#include "../model/answers.h"
#include "made_series.h"

static const AnswerWish wish = {1980, 11.0};

/* ---- files in memory ---- */

typedef struct {
    Yearly years;
    FileSeries file;
} Memory;

/* A file that holds the valley as its column. */
static void remember(Memory *memory, double fall, double rise)
{
    Series series = valley(&memory->years, fall, rise);
    memory->file = (FileSeries){.path = "memory.nc",
                                .title = "made up",
                                .resolved_case = "",
                                .count = series.count,
                                .start = memory->years.start,
                                .middle = memory->years.middle,
                                .end = memory->years.end};
    memory->file.value[SERIES_COLUMN] = memory->years.value;
    for (int kind = 0; kind < SERIES_KINDS; kind++)
        strcpy(memory->file.unit[kind], kind < SERIES_UV ? "DU" : "1");
    for (int kind = 1; kind < SERIES_KINDS; kind++)
        strcpy(memory->file.missing[kind], "not in the file");
}

static NumericalErrors some_errors(void)
{
    NumericalErrors errors;
    errors_unknown(&errors);
    errors.level[SERIES_COLUMN] = 0.4;
    errors.change[SERIES_COLUMN] = 0.06;
    errors.difference[SERIES_COLUMN] = 0.03;
    errors.mean_difference[SERIES_COLUMN] = 0.01;
    return errors;
}

static void compute(Answers *answers, const FileSeries *file, const NumericalErrors *errors)
{
    Fault fault = {0};
    if (answers_compute(answers, file, &wish, errors, &fault))
        fail_msg("%s", fault.text);
}

static void check(const Answers *answers, const char *id, double value, double error, const char *unit)
{
    const FileAnswer *answer = answers_find(answers, "%s", id);
    if (!answer)
        fail_msg("no %s", id);
    if (isnan(value) ? !isnan(answer->value) : !(fabs(answer->value - value) <= 1e-11 * fabs(value)))
        fail_msg("%s is %.17g, want %.17g", id, answer->value, value);
    if (isnan(error) ? !isnan(answer->error) : !(fabs(answer->error - error) <= 1e-9 * fabs(error)))
        fail_msg("the error of %s is %.17g, want %.17g", id, answer->error, error);
    assert_string_equal(answer->unit, unit);
    assert_true(answer->method[0] != '\0' && answer->label[0] != '\0');
    if (isnan(value)) /* what is none says why */
        assert_true(answer->note[0] != '\0');
}

/* ---- one file ---- */

static void test_list(void **state)
{
    Memory memory;
    Answers answers;
    NumericalErrors errors = some_errors();
    (void)state;
    remember(&memory, 0.5, 0.3);
    compute(&answers, &memory.file, &errors);
    check(&answers, "ozone_column_benchmark", 300.0, 0.4, "DU");
    check(&answers, "ozone_column_lowest", 290.0, 0.4, "DU");
    check(&answers, "ozone_column_lowest_year", 2000.5, 0.0,
          "year"); /* neighbours are 0.3 DU up, more than 0.12 */
    check(&answers, "ozone_column_change", -10.0, 0.06, "DU");
    /* d(100 c / b) = 100 (dc / b + c db / b^2) */
    check(&answers, "ozone_column_change_percent", -100.0 / 30.0, 100.0 * (0.06 / 300.0 + 10.0 * 0.4 / 9e4),
          "percent");
    check(&answers, "ozone_column_last_change", 20.0, 0.06, "DU");
    check(&answers, "ozone_column_return_year", 2000.5 + 10.0 / 0.3, 0.06 / 0.3, "year");
    check(&answers, "ozone_column_benchmark_smoothed", 300.0 - 7.5 / 11.0, 0.4, "DU");
    check(&answers, "ozone_column_return_year_smoothed", 2000.5 + (10.0 - 7.5 / 11.0) / 0.3, 0.06 / 0.3,
          "year");
    assert_null(answers_find(&answers, "uv_index_noon_highest")); /* not in the file */
    assert_null(answers_find(&answers, "ozone_column_share_above_tropopause"));
    answers_free(&answers);
    /* an error that makes the neighbours as likely: 2 * 0.2 DU reach 0.3 DU up, one year on, not 0.5 or 0.6
     */
    errors.change[SERIES_COLUMN] = 0.2;
    compute(&answers, &memory.file, &errors);
    check(&answers, "ozone_column_lowest_year", 2000.5, 1.0, "year");
    answers_free(&answers);
    /* without errors there are none, and without the year no benchmark */
    errors_unknown(&errors);
    assert_int_equal(answers_compute(&answers, &memory.file, &(AnswerWish){1950, 11.0}, &errors, &(Fault){0}),
                     0);
    check(&answers, "ozone_column_benchmark", NAN, NAN, "DU");
    check(&answers, "ozone_column_change", NAN, NAN, "DU");
    check(&answers, "ozone_column_return_year", NAN, NAN, "year");
    check(&answers, "ozone_column_lowest", 290.0, NAN, "DU");
    answers_free(&answers);
    /* a window longer than the file */
    assert_int_equal(
        answers_compute(&answers, &memory.file, &(AnswerWish){1980, 147.0}, &errors, &(Fault){0}), 0);
    check(&answers, "ozone_column_lowest_smoothed", NAN, NAN, "DU");
    check(&answers, "ozone_column_return_year_smoothed", NAN, NAN, "year");
    answers_free(&answers);
}

/* What harms by being high, and the share of the parts. */
static void test_kinds(void **state)
{
    Memory memory;
    Answers answers;
    NumericalErrors errors = some_errors();
    double chlorine[YEARS], below[YEARS];
    (void)state;
    remember(&memory, 0.5, 0.3);
    for (int i = 0; i < YEARS; i++) {
        chlorine[i] = 5000.0 - 10.0 * memory.years.value[i]; /* 2000 in 1980, 2100 in 2000 */
        below[i] = 30.0;
    }
    memory.file.value[SERIES_EESC3] = chlorine;
    strcpy(memory.file.unit[SERIES_EESC3], "ppt");
    memory.file.value[SERIES_TROPOSPHERE] = below;
    errors.level[SERIES_TROPOSPHERE] = 0.1;
    compute(&answers, &memory.file, &errors);
    check(&answers, "equivalent_chlorine_3yr_highest", 2100.0, NAN, "ppt");
    check(&answers, "equivalent_chlorine_3yr_highest_year", 2000.5, NAN, "year");
    check(&answers, "equivalent_chlorine_3yr_change_percent", 5.0, NAN, "percent");
    check(&answers, "equivalent_chlorine_3yr_return_year", 2000.5 + 10.0 / 0.3, NAN, "year");
    check(&answers, "ozone_column_share_above_tropopause", 90.0, 100.0 * (0.1 / 300.0 + 30.0 * 0.4 / 9e4),
          "percent");
    answers_free(&answers);
}

/* ---- against another file ---- */

static void test_against(void **state)
{
    Memory own, other;
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    (void)state;
    remember(&own, 0.5, 0.3);
    remember(&other, 0.5, 0.3);
    for (int i = 0; i < YEARS; i++) /* 2 DU less in ten years, one more in five, 3 less in 2025 */
        own.years.value[i] -= FIRST + i >= 2010 && FIRST + i < 2020  ? 2.0
                              : FIRST + i == 2025                    ? 3.0
                              : FIRST + i > 2090 && FIRST + i < 2096 ? -1.0
                                                                     : 0.0;
    compute(&answers, &own.file, &errors);
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), 0);
    check(&answers, "ozone_column_integrated_depletion", 20.0 + 3.0 - 5.0, 0.01 * YEARS, "DU year");
    check(&answers, "ozone_column_integrated_depletion_where_less", 23.0, 0.03 * 11.0, "DU year");
    check(&answers, "ozone_column_integrated_depletion_where_more", 5.0, 0.03 * 5.0, "DU year");
    check(&answers, "ozone_column_difference_mean", -18.0 / YEARS, 0.01, "DU");
    check(&answers, "ozone_column_difference_largest", -3.0, 0.03, "DU");
    check(&answers, "ozone_column_difference_largest_year", 2025.5, 0.0, "year");
    check(&answers, "ozone_column_return_delay", 0.0, 0.03 / 0.3, "year");
    answers_free(&answers);
    /* a slower rise: 10 / 0.25 years in place of 10 / 0.3, and over the years they share alone */
    remember(&own, 0.5, 0.25);
    compute(&answers, &own.file, &errors);
    other.file.count = YEARS - 50; /* to 2050 */
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), 0);
    /* of 0.05 DU a year from 2001 to 2050: 1 + ... + 50 */
    check(&answers, "ozone_column_integrated_depletion", 0.05 * 25.0 * 51.0, 0.01 * (YEARS - 50), "DU year");
    check(&answers, "ozone_column_return_delay", 10.0 / 0.25 - 10.0 / 0.3, 0.03 / 0.25, "year");
    answers_free(&answers);
    /* not back at all */
    remember(&own, 0.5, 0.09);
    compute(&answers, &own.file, &errors);
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), 0);
    check(&answers, "ozone_column_return_delay", NAN, NAN, "year");
    assert_non_null(
        strstr(answers_find(&answers, "ozone_column_return_delay")->note, "more than 67.2 years"));
    answers_free(&answers);
    /* ultraviolet counts the other way round */
    double index[2][YEARS];
    for (int i = 0; i < YEARS; i++) {
        index[0][i] = 9.25;
        index[1][i] = 9.0;
    }
    own.file.value[SERIES_UV] = index[0];
    other.file.value[SERIES_UV] = index[1];
    compute(&answers, &own.file, &errors);
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), 0);
    check(&answers, "uv_index_noon_integrated_excess", 0.25 * (YEARS - 50), NAN, "year");
    check(&answers, "uv_index_noon_difference_mean", 0.25, NAN, "1");
    answers_free(&answers);
}

static void test_against_itself(void **state)
{
    Memory memory;
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    (void)state;
    remember(&memory, 0.5, 0.3);
    compute(&answers, &memory.file, &errors);
    int alone = answers.count;
    assert_int_equal(answers_against(&answers, &memory.file, &memory.file, &errors, &fault), 0);
    assert_true(answers.count > alone);
    for (int i = alone; i < answers.count; i++)
        assert_true(answers.item[i].value == 0.0 || isnan(answers.item[i].value));
    check(&answers, "ozone_column_integrated_depletion", 0.0, 0.01 * YEARS, "DU year");
    check(&answers, "ozone_column_difference_largest_year", NAN, NAN, "year");
    check(&answers, "ozone_column_return_delay_smoothed", 0.0, 0.1, "year");
    answers_free(&answers);
}

static void test_mismatched(void **state)
{
    Memory own, other;
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    (void)state;
    remember(&own, 0.5, 0.3);
    remember(&other, 0.5, 0.3);
    compute(&answers, &own.file, &errors);
    for (int i = 0; i < YEARS; i++) {
        other.years.start[i] += 200.0;
        other.years.middle[i] += 200.0;
        other.years.end[i] += 200.0;
    }
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), FAULT_INPUT);
    check_fault(&fault, "memory.nc", "no time in common", "1955.00 to 2101.00", NULL);
    fault = (Fault){0};
    remember(&other, 0.5, 0.3);
    for (int i = 0; i < 40; i++) { /* decades in place of years */
        other.years.start[i] = 1960.0 + 10.0 * i;
        other.years.middle[i] = 1965.0 + 10.0 * i;
        other.years.end[i] = 1970.0 + 10.0 * i;
    }
    other.file.count = 10;
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), FAULT_INPUT);
    check_fault(&fault, "different intervals", "1960.000", NULL);
    fault = (Fault){0};
    remember(&other, 0.5, 0.3);
    strcpy(other.file.unit[SERIES_COLUMN], "mm");
    assert_int_equal(answers_against(&answers, &own.file, &other.file, &errors, &fault), FAULT_INPUT);
    check_fault(&fault, "\"DU\"", "\"mm\"", NULL);
    answers_free(&answers);
}

/* ---- errors ---- */

static void test_finer(void **state)
{
    Memory own, finer;
    Answers answers, fine;
    NumericalErrors errors;
    Fault fault = {0};
    (void)state;
    errors_unknown(&errors);
    remember(&own, 0.5, 0.3);
    remember(&finer, 0.5, 0.31);
    compute(&answers, &own.file, &errors);
    compute(&fine, &finer.file, &errors);
    answers_compare(&answers, &fine);
    check(&answers, "ozone_column_lowest", 290.0, 0.0, "DU");
    check(&answers, "ozone_column_last_change", 20.0, 1.0, "DU");
    check(&answers, "ozone_column_return_year", 2000.5 + 10.0 / 0.3, 10.0 / 0.3 - 10.0 / 0.31, "year");
    answers_free(&fine);
    answers_free(&answers);
    /* what may differ between a case and its finer twin, and what may not */
    own.file.resolved_case =
        "title = \"a\";\nyears = {\n    first = 1955;\n};\nnumerics = {\n    step = 7;\n};\n";
    const struct {
        char *text;
        const char *pieces[2];
    } wrong[] = {
        {"", {"resolved_case", "memory.nc"}},
        {"title = \"b\";\nyears = {\n    first = 1955;\n};\nnumerics = {\n    step = 7;\n};\n",
         {"same numerics", "outer_step_days"}},
        {"title = \"a\";\nyears = {\n    first = 1956;\n};\nnumerics = {\n    step = 3;\n};\n",
         {"another case", "\"first = 1956\" where that has \"first = 1955\""}},
        {"title = \"a\";\nnumerics = {\n    step = 3;\n};\n", {"another case", "\"nothing\""}},
    };
    for (size_t w = 0; w < sizeof wrong / sizeof *wrong; w++) {
        fault = (Fault){0};
        finer.file.resolved_case = wrong[w].text;
        assert_int_equal(answers_check_finer(&own.file, &finer.file, &fault), FAULT_INPUT);
        check_fault(&fault, wrong[w].pieces[0], wrong[w].pieces[1], NULL);
    }
    fault = (Fault){0};
    finer.file.resolved_case =
        "title = \"b\";\nyears = {\n    first = 1955;\n};\nnumerics = {\n    step = 3;\n};\n";
    assert_int_equal(answers_check_finer(&own.file, &finer.file, &fault), 0);
}

static void test_table_of_errors(void **state)
{
    NumericalErrors errors;
    Fault fault = {0};
    char path[PATH];
    write_file(state, "errors.csv",
               "# quantity: errors\nseries,of,cause,error,unit,how\nozone_column,level,time,0.02,DU,so\n"
               "ozone_column,level,grid,0.3,DU,\"so, too\"\nuv_index_noon,change,time,0.001,1,so\n",
               path);
    assert_int_equal(errors_read(&errors, path, &fault), 0);
    check_near(errors.level[SERIES_COLUMN], 0.32, 1e-14); /* causes add up */
    assert_true(errors.change[SERIES_UV] == 0.001);
    assert_true(isnan(errors.change[SERIES_COLUMN]) && isnan(errors.level[SERIES_UV]));
    static const struct {
        const char *text, *pieces[2];
    } wrong[] = {
        {"series,of,cause,unit\nozone_column,level,time,DU\n", {"no column error", ":1"}},
        {"series,of,error\nozone_colum,level,0.1\n", {"ozone_colum", ":2"}},
        {"series,of,error\nozone_column,leve,0.1\n", {"leve", ":2"}},
        {"series,of,error\nozone_column,level,-0.1\n", {"negative", ":2"}},
        {"series,of,error\nozone_column,level,small\n", {"small", ":2"}},
    };
    for (size_t w = 0; w < sizeof wrong / sizeof *wrong; w++) {
        fault = (Fault){0};
        write_file(state, "wrong.csv", wrong[w].text, path);
        assert_int_equal(errors_read(&errors, path, &fault), FAULT_INPUT);
        check_fault(&fault, "wrong.csv", wrong[w].pieces[0], wrong[w].pieces[1], NULL);
    }
    /* the table that is shipped knows the column and its parts */
    fault = (Fault){0};
    snprintf(path, sizeof path, "%s/numerical-error.csv", data_dir());
    assert_int_equal(errors_read(&errors, path, &fault), 0);
    for (int kind = SERIES_COLUMN; kind <= SERIES_UPPER; kind++)
        assert_true(errors.level[kind] > 0.0 && errors.change[kind] > 0.0 && errors.difference[kind] > 0.0 &&
                    errors.mean_difference[kind] >= 0.0);
}

/* ---- telling and storing ---- */

static void check_printed(const FileSeries *file, int benchmark, const FileSeries *reference,
                          const char *const *pieces)
{
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    char *text = NULL;
    size_t size;
    assert_int_equal(answers_compute(&answers, file, &(AnswerWish){benchmark, 11.0}, &errors, &fault), 0);
    if (reference)
        assert_int_equal(answers_against(&answers, file, reference, &errors, &fault), 0);
    FILE *out = open_memstream(&text, &size);
    assert_non_null(out);
    answers_print(&answers, file, reference, out);
    assert_int_equal(fclose(out), 0);
    for (; *pieces; pieces++)
        if (!strstr(text, *pieces))
            fail_msg("no \"%s\" in:\n%s", *pieces, text);
    free(text);
    answers_free(&answers);
}

static void test_table(void **state)
{
    Memory memory, other;
    (void)state;
    remember(&memory, 0.5, 0.3);
    check_printed(&memory.file, 1980, NULL,
                  (const char *[]){"290.00  2000.5   -10.00 +-0.06", "2033.8 +-0.2",
                                   "  1960      300.00     +0.00",
                                   "  1980*     300.00     +0.00     +0.00\n",
                                   "  1990      295.00     -5.00     -1.67\n",
                                   "  2050      305.00     +5.00     +1.67\n", "  2100      320.00",
                                   "competent authority", "noon UV index", "(not in the file)", NULL});
    check_printed(&memory.file, 1985, NULL,
                  (const char *[]){"  1985*     297.50     +0.00     +0.00\n", NULL});
    check_printed(&memory.file, 1900, NULL,
                  (const char *[]){"the file does not cover the whole of 1900",
                                   "  1990      295.00         -         -\n", NULL});
    memory.file.value[SERIES_UV] = memory.years.value;
    check_printed(&memory.file, 1980, NULL, (const char *[]){"personal exposure", NULL});
    remember(&memory, 0.5, 0.09);
    check_printed(&memory.file, 1980, NULL,
                  (const char *[]){"not by the end of the file (2101.0): still 1.00 DU below", NULL});
    remember(&memory, -0.1, 0.3);
    check_printed(&memory.file, 1980, NULL, (const char *[]){"never below 300 DU after 1980", NULL});
    remember(&memory, 0.5, 0.3);
    memory.years.value[YEARS - 1] = 299.0; /* back in between, and below again at the end */
    check_printed(&memory.file, 1980, NULL,
                  (const char *[]){"2033.8", "but below it again in 2100.50 (by 1 DU)", NULL});
    remember(&memory, 0.5, 0.25);
    remember(&other, 0.5, 0.3);
    check_printed(&memory.file, 1980, &other.file,
                  (const char *[]){"against memory.nc: made up", "+252.50 +-1.5", "+6.67 +-0.12", NULL});
}

static void test_store(void **state)
{
    Made *made = made_model();
    FileSeries series;
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    char path[PATH], text[400] = "";
    double value;
    int file, variable;
    path_in(state, "store.nc", path);
    write_years(made, path, 30); /* from 1980: 300 - 0.37 r */
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    compute(&answers, &series, &errors);
    strcpy(answers.error_source, "made up");
    if (answers_store(&answers, path, &fault))
        fail_msg("%s", fault.text);
    check_records(path, made, 30); /* and the rest is as it was */
    file = open_file(path);
    assert_int_equal(nc_inq_varid(file, "answer_ozone_column_lowest", &variable), 0);
    assert_int_equal(nc_get_var_double(file, variable, &value), 0);
    assert_true(value == made_column(29));
    assert_int_equal(nc_get_att_double(file, variable, "numerical_error", &value), 0);
    assert_true(value == 0.4);
    assert_int_equal(nc_get_att_text(file, variable, "units", text), 0);
    assert_string_equal(text, "DU");
    assert_int_equal(nc_inq_att(file, variable, "method", NULL, NULL), 0);
    assert_int_equal(nc_inq_att(file, variable, "long_name", NULL, NULL), 0);
    assert_int_equal(nc_inq_varid(file, "answer_ozone_column_return_year", &variable), 0);
    assert_int_equal(nc_get_var_double(file, variable, &value), 0);
    assert_true(value == NC_FILL_DOUBLE); /* falls to the end: none, and the note says so */
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, variable, "note", text), 0);
    assert_non_null(strstr(text, "still 10.73 DU below"));
    assert_int_equal(nc_close(file), 0);
    /* a file with its answers gives the same ones; a place that cannot be written is a fault */
    FileSeries again;
    assert_int_equal(series_read(&again, path, NULL, &fault), 0);
    assert_memory_equal(again.value[SERIES_COLUMN], series.value[SERIES_COLUMN], 30 * sizeof(double));
    series_free(&again);
    assert_int_equal(answers_store(&answers, path, &fault), FAULT_OUTPUT); /* they are there already */
    fault = (Fault){0};
    path_in(state, "nowhere.nc", path);
    assert_int_equal(answers_store(&answers, path, &fault), FAULT_OUTPUT);
    answers_free(&answers);
    series_free(&series);
    made_free(made);
}

/* A file that may not grow stays as it was, to the byte. */
static void test_store_full(void **state)
{
    Made *made = made_model();
    FileSeries series;
    Answers answers;
    NumericalErrors errors = some_errors();
    Fault fault = {0};
    char path[PATH];
    size_t size, later;
    struct rlimit before, limit;
    path_in(state, "full.nc", path);
    write_years(made, path, 30);
    made_free(made);
    assert_int_equal(series_read(&series, path, NULL, &fault), 0);
    compute(&answers, &series, &errors);
    char *bytes = bytes_of(path, &size);
    signal(SIGXFSZ, SIG_IGN);
    assert_int_equal(getrlimit(RLIMIT_FSIZE, &before), 0);
    limit = before;
    limit.rlim_cur = size + 20000; /* what they take is more */
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &limit), 0);
    assert_int_equal(answers_store(&answers, path, &fault), FAULT_OUTPUT);
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &before), 0);
    assert_non_null(strstr(fault.text, "no room for its answers"));
    char *after = bytes_of(path, &later);
    assert_int_equal(later, size);
    assert_memory_equal(after, bytes, size);
    free(bytes);
    free(after);
    answers_free(&answers);
    series_free(&series);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_list),       cmocka_unit_test(test_kinds),
        cmocka_unit_test(test_against),    cmocka_unit_test(test_against_itself),
        cmocka_unit_test(test_mismatched), cmocka_unit_test(test_finer),
        WITH_FOLDER(test_table_of_errors), cmocka_unit_test(test_table),
        WITH_FOLDER(test_store),           WITH_FOLDER(test_store_full),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
