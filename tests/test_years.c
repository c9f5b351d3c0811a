/* Tests of the projection: the records and progress of a run, its interruption, the length of explicit days,
 * and that chlorine destroys ozone and ozone comes back. Built-in case on coarse layers. */
#define _XOPEN_SOURCE 700
#include "projection_room.h"

#include <omp.h>

/* ---- the projection ---- */

typedef struct {
    const Run *run;
    int records, steps, spinning;
    double last_end, share, sum_of_means;
    double first_column, last_column;
    int stop_after; /* records; 0: never */
    volatile sig_atomic_t stop;
    double *sum; /* [field] of step means of this interval */
    long in_interval;
    double worst;
} Notes;

static int on_record(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Notes *notes = context;
    const Model *model = notes->run->model;
    size_t size = field_size(model);
    assert_true(record->time_start == notes->last_end && record->time_end > record->time_start);
    check_near(record->time, 0.5 * (record->time_start + record->time_end), 1e-15);
    assert_true(notes->run->column->time == record->time_end);
    check_near(record->ozone_column, column_ozone_du(model, record->x), 1e-14);
    for (size_t i = 0; i < size; i++) {
        double mean = notes->sum[i] / (double)notes->in_interval;
        notes->worst = fmax(notes->worst, fabs(record->x[i] - mean) / (fabs(mean) + 1e-30));
    }
    memset(notes->sum, 0, size * sizeof(double));
    notes->in_interval = 0;
    notes->last_end = record->time_end;
    if (!notes->records++)
        notes->first_column = record->ozone_column;
    notes->last_column = record->ozone_column;
    if (notes->records == notes->stop_after)
        notes->stop = 1;
    return 0;
}

static void on_progress(void *context, const Progress *progress)
{
    Notes *notes = context;
    assert_true(progress->share >= notes->share && progress->share <= 1.0 + 1e-12);
    notes->share = progress->share;
    notes->spinning += progress->spinning_up;
    notes->steps++;
    if (progress->spinning_up)
        return;
    const double *mean = stepper_mean(notes->run->stepper);
    for (size_t i = 0; i < field_size(notes->run->model); i++)
        notes->sum[i] += mean[i];
    notes->in_interval++;
}

static Notes watch(const Run *run, Watcher *watcher)
{
    Notes notes = {.run = run, .last_end = run->model->settings.first_year};
    notes.sum = calloc(field_size(run->model), sizeof(double));
    assert_non_null(notes.sum);
    *watcher = (Watcher){.record = on_record, .progress = on_progress};
    return notes;
}

static void test_records(void **state)
{
    (void)state;
    Settings settings = coarse(4.0, 1985);
    settings.last_year = 1986;
    settings.spinup_years = 1.0;
    settings.outputs_per_year = 3;
    settings.outer_step_days = 15.0;
    Run run = start(&settings, 1);
    Watcher watcher;
    Notes notes = watch(&run, &watcher);
    watcher.context = &notes;
    watcher.stop = &notes.stop;
    Fault fault = {0};
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    assert_int_equal(notes.records, 6);
    assert_int_equal(notes.spinning, 25);               /* a year in steps of at most 15 days */
    assert_int_equal(notes.steps - notes.spinning, 54); /* six thirds of it, 121.75 days in 9 steps each */
    assert_int_equal(run.column->outer_steps, 54);      /* counted since the spin-up */
    check_near(notes.share, 1.0, 1e-12);
    assert_true(notes.last_end == 1987.0 && run.column->time == 1987.0);
    assert_true(notes.worst < 1e-12);
    check_closure(&run, "a projection");
    free(notes.sum);
    end(&run);
}

static void test_interruption(void **state)
{
    (void)state;
    Settings settings = coarse(4.0, 1985);
    settings.last_year = 1990;
    Run run = start(&settings, 1);
    Watcher watcher;
    Notes notes = watch(&run, &watcher);
    watcher.context = &notes;
    watcher.stop = &notes.stop;
    notes.stop_after = 2;
    Fault fault = {0};
    assert_int_equal(projection_run(run.model, run.stepper, run.column, &watcher, &fault), FAULT_INTERRUPTED);
    assert_int_equal(notes.records, 2);
    assert_non_null(strstr(fault.text, "1987"));
    free(notes.sum);
    end(&run);

    settings.spinup_years = 3.0;
    run = start(&settings, 1);
    notes = watch(&run, &watcher);
    watcher.context = &notes;
    watcher.stop = &notes.stop;
    notes.stop = 1;
    fault = (Fault){0};
    assert_int_equal(projection_run(run.model, run.stepper, run.column, &watcher, &fault), FAULT_INTERRUPTED);
    assert_int_equal(notes.records, 0);
    assert_int_equal(notes.steps, 1);
    assert_non_null(strstr(fault.text, "spin-up"));
    free(notes.sum);
    end(&run);
}

/* A year of explicit days has 365 or 366 of them, four years 1461. */
static void test_explicit_days_fill_the_years(void **state)
{
    (void)state;
    Settings settings = coarse(5.0, 1985);
    settings.day = DAY_EXPLICIT;
    settings.outputs_per_year = 4;
    Run run = start(&settings, 1);
    Watcher watcher;
    Notes notes = watch(&run, &watcher);
    watcher.context = &notes;
    watcher.stop = &notes.stop;
    Fault fault = {0};
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    assert_true(notes.steps == 365 || notes.steps == 366);
    assert_int_equal(notes.records, 4);
    assert_true(notes.worst < 1e-12);
    free(notes.sum);
    end(&run);
}

/* ---- chlorine and ozone ---- */

/* Ozone column of the record that holds a year, and the settings' whole schedule run. */
typedef struct {
    double column[400];
    int first;
} Series;

static int keep_column(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Series *series = context;
    series->column[(int)record->time_start - series->first] = record->ozone_column;
    return 0;
}

static double in_year(const Series *series, int year)
{
    return series->column[year - series->first];
}

static int lowest_year(const Series *series, int first, int last)
{
    int lowest = first;
    for (int year = first; year <= last; year++)
        if (in_year(series, year) < in_year(series, lowest))
            lowest = year;
    return lowest;
}

static void project(Settings *settings, Series *series, const char *what)
{
    Run run = start(settings, 1);
    Watcher watcher = {.record = keep_column, .context = series};
    Fault fault = {0};
    series->first = settings->first_year;
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    print_message("   %s: lowest in %d; 1960 %.2f, 1980 %.2f, 1998 %.2f, 2040 %.2f, %d %.2f DU\n", what,
                  lowest_year(series, settings->first_year, settings->last_year), in_year(series, 1960),
                  in_year(series, 1980), in_year(series, 1998), in_year(series, 2040), settings->last_year,
                  in_year(series, settings->last_year));
    check_closure(&run, what);
    end(&run);
}

/* The built-in schedule with N2O, CH4 and CO2 of 1960 throughout: only halogens differ between its years. */
static void write_halogens_only(void **state, char *path)
{
    char from[400], line[400], kept[3][40] = {"", "", ""};
    static const char *const constant[] = {"N2O", "CH4", "CO2"};
    snprintf(from, sizeof from, "%s/baseline-schedule.csv", data_dir());
    snprintf(path, 300, "%s/halogens.csv", (char *)*state);
    for (int pass = 0; pass < 2; pass++) {
        FILE *in = fopen(from, "r"), *out = pass ? fopen(path, "w") : NULL;
        assert_non_null(in);
        while (fgets(line, sizeof line, in)) {
            char year[8], gas[32], amount[40], rest[300];
            int which = 3;
            if (sscanf(line, "%4[0-9],%31[^,],abundance,%39[^,],%299[^\n]", year, gas, amount, rest) == 4)
                for (which = 0; which < 3 && strcmp(gas, constant[which]); which++)
                    continue;
            if (which < 3 && !strcmp(year, "1960"))
                strcpy(kept[which], amount);
            if (out && which < 3)
                fprintf(out, "%s,%s,abundance,%s,%s\n", year, gas, kept[which], rest);
            else if (out)
                fputs(line, out);
        }
        fclose(in);
        if (out)
            assert_int_equal(fclose(out), 0);
    }
    for (int i = 0; i < 3; i++)
        assert_true(kept[i][0] != '\0');
}

/* More chlorine, less ozone, and back: nothing but the halogens changes. */
static void test_chlorine_destroys_ozone(void **state)
{
    char path[300];
    write_halogens_only(state, path);
    Settings settings = coarse(2.5, 1955);
    settings.last_year = 2060;
    settings.refresh_state = 0.2;
    settings.spinup_years = 6.0;
    settings.outer_step_days = 365.25 / 12;
    snprintf(settings.schedule_file, sizeof settings.schedule_file, "%s", path);
    Series series = {{0}, 0};
    project(&settings, &series, "halogens alone");
    double start_column = in_year(&series, 1960), low = in_year(&series, 1998), late = in_year(&series, 2060);
    double loss = 1.0 - low / start_column;
    assert_true(loss > 0.01 && loss < 0.08);
    assert_true(in_year(&series, 1980) < start_column && low < in_year(&series, 1980));
    int lowest = lowest_year(&series, 1955, 2060);
    assert_true(lowest >= 1994 && lowest <= 2010);
    assert_true(in_year(&series, 2040) > low && late > in_year(&series, 2040));
    assert_true(late - low > 0.35 * (start_column - low)); /* chlorine itself is half-way back by then */
    assert_true(late < start_column + 0.002 * start_column);
}

/* The whole schedule on a coarse case: falls from 1960 to the late 1990s and recovers. */
static void test_baseline_falls_and_recovers(void **state)
{
    (void)state;
    Settings settings = coarse(4.0, 1955);
    settings.last_year = 2080;
    settings.refresh_state = 0.2;
    settings.spinup_years = 6.0;
    settings.outer_step_days = 365.25 / 12;
    Series series = {{0}, 0};
    project(&settings, &series, "baseline");
    double start_column = in_year(&series, 1960), low = in_year(&series, 1998), late = in_year(&series, 2080);
    double loss = 1.0 - low / start_column;
    assert_true(loss > 0.01 && loss < 0.08);
    int lowest = lowest_year(&series, 1955, 2080);
    assert_true(lowest >= 1994 && lowest <= 2010);
    assert_true(late > low + 0.2 * (start_column - low));
}

int main(void)
{
    omp_set_num_threads(1); /* one core serves as well, and waiting threads would take the others */
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_records),
        cmocka_unit_test(test_interruption),
        cmocka_unit_test(test_explicit_days_fill_the_years),
        WITH_FOLDER(test_chlorine_destroys_ozone),
        cmocka_unit_test(test_baseline_falls_and_recovers),
    };
    return cmocka_run_group_tests_name("years", tests, NULL, NULL);
}
