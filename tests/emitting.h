/* emitting: cases whose gases are given off, for the tests of emissions. Include after _XOPEN_SOURCE 700. */
#ifndef SKYMEND_TEST_EMITTING_H
#define SKYMEND_TEST_EMITTING_H

#include "settled.h"

#define ROWS_MOST 400000

/* Rows of a schedule, put together. */
typedef struct {
    char *text; /* [ROWS_MOST] */
    size_t used;
} Rows;

static inline Rows rows_begin(void)
{
    Rows rows = {malloc(ROWS_MOST), 0};
    assert_non_null(rows.text);
    rows.used = (size_t)snprintf(rows.text, ROWS_MOST, "year,gas,kind,amount,unit,from_km,to_km,line\n");
    return rows;
}

/* years: "1980" or "1980-1985"; height: "10,20", or "," for the ground. */
static inline void row(Rows *rows, const char *years, const char *gas, const char *kind, double amount,
                       const char *unit, const char *height, const char *line)
{
    assert_true(rows->used + 300 < ROWS_MOST);
    rows->used += (size_t)snprintf(rows->text + rows->used, ROWS_MOST - rows->used,
                                   "%s,%s,%s,%.17g,%s,%s,%s\n", years, gas, kind, amount, unit, height, line);
}

static inline void ground(Rows *rows, const char *years, const char *gas, double kt)
{
    row(rows, years, gas, "emission", kt, "kt", ",", "test");
}

/* Lay them over the schedule of the case. */
static inline void lay(Settings *settings, void **state, const char *name, Rows *rows)
{
    char path[300];
    write_file(state, name, rows->text, path);
    snprintf(settings->schedule_layer[settings->schedule_layers++], SETTINGS_PATH, "%s", path);
    free(rows->text);
}

/* A case with the rows as its whole schedule: no other gas, nothing held, a closed ground. */
static inline Settings alone(void **state, Rows *rows, int first_year, int last_year)
{
    Settings settings = coarse_case(DAY_MEAN, first_year);
    settings.last_year = last_year;
    settings.start = START_SPINUP;
    settings.spinup_years = 0.0;
    settings.temperature = TEMPERATURE_FIXED;
    settings.bounds = 0;
    settings.bounds_given = 1;
    settings.tropospheric_oh_file[0] = settings.tropospheric_water_file[0] =
        settings.tropospheric_no2_file[0] = '\0';
    write_file(state, "alone.csv", rows->text, settings.schedule_file);
    free(rows->text);
    return settings;
}

/* The built-in schedule with every gas at its abundance of one year throughout: a column at rest stays so. */
static inline void hold_abundances(Settings *settings, void **state, int year, int first_year, int last_year)
{
    Schedule schedule;
    Fault fault = {0};
    char path[400], years[40];
    snprintf(path, sizeof path, "%s/baseline-schedule.csv", data_dir());
    ok(schedule_read(&schedule, (const char *const[]){path}, 1, &fault), &fault);
    Rows rows = rows_begin();
    snprintf(years, sizeof years, "%d-%d", first_year, last_year);
    for (int g = 0; g < schedule.gases; g++)
        row(&rows, years, schedule.gas[g], "abundance", 1e12 * schedule_abundance(&schedule, g, year + 0.5),
            "ppt", ",", "held");
    schedule_free(&schedule);
    write_file(state, "held.csv", rows.text, settings->schedule_file);
    free(rows.text);
}

static inline double molar_mass(const Model *model, int s)
{
    return model->mechanism->item[model->mechanism->solved_item[s]].molar_mass;
}

static inline int carried(const Model *model, int s)
{
    return model->mechanism->item[model->mechanism->solved_item[s]].transport;
}

/* kt of the whole Earth in molecules cm-2, in plain figures. */
static inline double kt_of(const Model *model, int s, double molecules)
{
    const double radius_cm = 6371e5, area = 4.0 * 3.14159265358979323846 * radius_cm * radius_cm;
    return molecules * area / 6.02214076e23 * molar_mass(model, s) * 1e-9;
}

#endif
