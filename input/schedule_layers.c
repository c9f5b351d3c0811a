/* schedule_layers: the rows of one file laid over what the files before it have left; contract in
 * schedule_reading.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *path_of(const Reading *reading, Place place)
{
    return reading->schedule->path[place.file];
}

/* ---- series ---- */

Series *schedule_series(const Reading *reading, int gas, int kind, const char *label)
{
    for (int s = 0; s < reading->count; s++) {
        Series *series = reading->series[s];
        if (series->gas == gas && series->kind == kind &&
            (!label || kind == ABUNDANCE || strcmp(series->label, label) == 0))
            return series;
    }
    return NULL;
}

int series_span(const Series *series, int *first, int *last)
{
    int found = 0;
    for (int y = 0; y < SERIES_YEARS; y++)
        if (series->cell[y].stands) {
            if (!found)
                *first = y;
            *last = y;
            found = 1;
        }
    return found;
}

int series_whole(const Reading *reading, const Series *series, Fault *fault)
{
    int first = 0, last = 0;
    if (!series_span(series, &first, &last))
        return 0;
    int before = first;
    for (int y = first + 1; y <= last; y++) {
        if (!series->cell[y].stands)
            continue;
        if (y > before + 1) {
            int several = y > before + 2;
            char years[40], label[100] = "";
            if (several)
                snprintf(years, sizeof years, "years %d to %d", EARLIEST_YEAR + before + 1,
                         EARLIEST_YEAR + y - 1);
            else
                snprintf(years, sizeof years, "year %d", EARLIEST_YEAR + y - 1);
            if (series->kind != ABUNDANCE)
                snprintf(label, sizeof label, ", %s of line \"%.60s\",", schedule_kinds[series->kind],
                         series->label);
            Place place = series->cell[y].made;
            return fault_at(fault, path_of(reading, place), place.line,
                            "%s%s lacks the %s; add a row for %s%s", reading->schedule->gas[series->gas],
                            label, years, several ? "each" : "it",
                            series->kind == ABUNDANCE ? "" : ", 0 where there is none");
        }
        before = y;
    }
    return 0;
}

/* Index of the gas, added when new. */
static int place_gas(Reading *reading, const char *name, int *gas, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    *gas = schedule_find(schedule, name);
    if (*gas >= 0)
        return 0;
    if (schedule->gases == reading->gas_room) {
        int room = reading->gas_room ? 2 * reading->gas_room : 32;
        void *larger = realloc(schedule->gas, (size_t)room * sizeof *schedule->gas);
        if (!larger)
            return fault_memory(fault, "gases of the schedule");
        schedule->gas = larger;
        reading->gas_room = room;
    }
    *gas = schedule->gases++;
    strcpy(schedule->gas[*gas], name);
    return 0;
}

static int add_series(Reading *reading, int gas, const Row *row, int *index, Fault *fault)
{
    if (reading->count == reading->room) {
        int room = reading->room ? 2 * reading->room : 32;
        void *larger = realloc(reading->series, (size_t)room * sizeof *reading->series);
        if (!larger)
            return fault_memory(fault, "lines of the schedule");
        reading->series = larger;
        reading->room = room;
    }
    Series *series = calloc(1, sizeof *series);
    if (!series || !(series->label = strdup(row->label))) {
        free(series);
        return fault_memory(fault, "lines of the schedule");
    }
    series->gas = gas;
    series->kind = row->kind;
    series->from_km = row->from_km;
    series->to_km = row->to_km;
    series->first = row->place;
    *index = reading->count;
    reading->series[reading->count++] = series;
    return 0;
}

/* Element and measure of a line, and its height, are the same in all its rows; a change may leave the
 * height out. */
static int check_same(const Reading *reading, Series *series, const Row *row, Fault *fault)
{
    const char *path = path_of(reading, row->place), *first = path_of(reading, series->first);
    if (row->has_unit && !series->has_measure) {
        series->has_measure = 1;
        series->share = row->share;
        strcpy(series->element, row->element);
    }
    if (row->has_unit && series->share != row->share)
        return fault_at(fault, path, row->place.line,
                        "the %s of line \"%.60s\" is a %s here and a %s at %s:%d; write one of the two",
                        schedule_kinds[row->kind], series->label, row->share ? "share" : "mass",
                        row->share ? "mass" : "share", first, series->first.line);
    if (row->has_unit && strcmp(series->element, row->element) != 0)
        return fault_at(fault, path, row->place.line,
                        "line \"%.60s\" is given as mass of %s here and of %s at %s:%d; write one of the two",
                        series->label, row->element[0] ? row->element : "the gas",
                        series->element[0] ? series->element : "the gas", first, series->first.line);
    if ((row->change == NEW || row->has_height) &&
        (series->from_km != row->from_km || series->to_km != row->to_km)) {
        char here[60] = "at the ground", there[60] = "at the ground";
        if (row->has_height)
            snprintf(here, sizeof here, "at %g to %g km", row->from_km, row->to_km);
        if (series->to_km > 0)
            snprintf(there, sizeof there, "at %g to %g km", series->from_km, series->to_km);
        return fault_at(fault, path, row->place.line,
                        "line \"%.60s\" of %s is %s here and %s at %s:%d; give each height a line of its own",
                        series->label, reading->schedule->gas[series->gas], here, there, first,
                        series->first.line);
    }
    if (row->per_km && !(series->to_km > 0))
        return fault_at(
            fault, path, row->place.line,
            "the unit is per km, but from_km and to_km are empty; fill them in, or leave /km out");
    return 0;
}

/* ---- values ---- */

static int check_value(const Reading *reading, const Series *series, const Row *row, int year, double value,
                       Fault *fault)
{
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    if (value < 0)
        return fault_at(fault, path, row->place.line,
                        "takes %g from the %s of %s, line \"%.60s\", more than the %g that stand in %d; take "
                        "less, or replace it",
                        -row->amount, schedule_kinds[series->kind], gas, series->label,
                        series->cell[year - EARLIEST_YEAR].value, year);
    if (series->kind == ABUNDANCE && value > 1)
        return fault_at(fault, path, row->place.line,
                        "%s comes to %g mol/mol in %d, more than the air itself; check amount and unit", gas,
                        value, year);
    if (series->share && value > 1)
        return fault_at(fault, path, row->place.line,
                        "the %s of %s, line \"%.60s\", comes to %g %% of the stock in %d; at most 100 %% can "
                        "leave it",
                        schedule_kinds[series->kind], gas, series->label, 100 * value, year);
    if (!isfinite(value))
        return fault_at(fault, path, row->place.line,
                        "%s, line \"%.60s\", grows beyond all bounds by %d; shorten the span", gas,
                        series->label, year);
    return 0;
}

/* What row makes of year. before: value of the year before its span, for the rules. */
static double value_of(const Series *series, const Row *row, int year, double before)
{
    double amount = row->per_km ? row->amount * (series->to_km - series->from_km) : row->amount;
    double was = series->cell[year - EARLIEST_YEAR].value;
    int step = year - row->first_year + 1, steps = row->last_year - row->first_year + 1;
    if (row->change == SCALE)
        return was * row->amount;
    if (row->change == ADD)
        return was + amount;
    switch (row->rule) {
    case HOLD: return before;
    case LINEAR: return step == steps ? amount : before + (amount - before) * step / steps;
    case GROWTH: return before * pow(1 + row->amount, step);
    default: return amount;
    }
}

static int twice(const Reading *reading, const Series *series, const Row *row, int year, Fault *fault)
{
    Place other = series->cell[year - EARLIEST_YEAR].last;
    int first = other.line < row->place.line ? other.line : row->place.line;
    int second = other.line < row->place.line ? row->place.line : other.line;
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    if (series->kind == ABUNDANCE)
        return fault_at(fault, path, second, "%s has year %d twice, first on line %d; keep one", gas, year,
                        first);
    return fault_at(fault, path, second,
                    "%s, %s of line \"%.60s\", has year %d twice, first on line %d; keep one, or put the "
                    "second into a file of its own",
                    gas, schedule_kinds[series->kind], series->label, year, first);
}

/* Apply row to the years of a series that it names: all of them, or, with a star, those that stand. */
static int apply_row(const Reading *reading, Series *series, const Row *row, int star, int *hits,
                     Fault *fault)
{
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    double before = 0;
    if (check_same(reading, series, row, fault))
        return fault->code;
    if (row->rule != NUMBER) {
        int year = row->first_year - 1;
        if (year < EARLIEST_YEAR || !series->cell[year - EARLIEST_YEAR].stands)
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has no value in %d for the rule to start from; give "
                            "that year a number",
                            gas, schedule_kinds[series->kind], series->label, year);
        before = series->cell[year - EARLIEST_YEAR].value;
    }
    for (int year = row->first_year; year <= row->last_year; year++) {
        Cell *cell = &series->cell[year - EARLIEST_YEAR];
        if (!cell->stands && row->change != NEW) {
            if (star)
                continue;
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has no value in %d to change; shorten the span, or "
                            "leave change empty to add years",
                            gas, schedule_kinds[series->kind], series->label, year);
        }
        if (cell->stands && cell->last.file == row->place.file)
            return twice(reading, series, row, year, fault);
        if (cell->stands && row->change == NEW)
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has a value in %d already, from %s:%d; write replace, "
                            "add or scale under change, or another line",
                            gas, schedule_kinds[series->kind], series->label, year,
                            path_of(reading, cell->last), cell->last.line);
        double value = value_of(series, row, year, before);
        if (check_value(reading, series, row, year, value, fault))
            return fault->code;
        if (!cell->stands)
            cell->made = row->place;
        cell->value = value;
        cell->stands = 1;
        cell->last = row->place;
        ++*hits;
    }
    return 0;
}

/* ---- rows ---- */

/* A change that found nothing: say what there is. */
static int nothing_hit(const Reading *reading, const Row *row, int gas, Fault *fault)
{
    const Schedule *schedule = reading->schedule;
    const char *path = path_of(reading, row->place), *near = NULL, *kind = schedule_kinds[row->kind];
    size_t room = (size_t)(reading->count > schedule->gases ? reading->count : schedule->gases), count = 0;
    const char **words = calloc(room + 1, sizeof *words);
    if (!words)
        return fault_memory(fault, "names of the schedule");
    int no_gas = gas < 0 && strcmp(row->gas, "*") != 0;
    if (no_gas) {
        for (int g = 0; g < schedule->gases; g++)
            words[count++] = schedule->gas[g];
    } else {
        for (int s = 0; s < reading->count; s++)
            if (reading->series[s]->kind == row->kind && (gas < 0 || reading->series[s]->gas == gas))
                words[count++] = reading->series[s]->label;
    }
    near = fault_nearest(no_gas ? row->gas : row->label, words, count);
    if (!near && count == 1)
        near = words[0];
    if (no_gas)
        fault_at(fault, path, row->place.line, "no file below has gas %s to change; %s%s%s", row->gas,
                 near ? "did you mean " : "correct the name", near ? near : "", near ? "?" : "");
    else if (schedule_series(reading, gas, row->kind, row->label) || strcmp(row->label, "*") == 0)
        fault_at(fault, path, row->place.line,
                 "no file below has an amount of kind %s for gas %s in %d to %d; "
                 "correct kind or years",
                 kind, row->gas, row->first_year, row->last_year);
    else
        fault_at(fault, path, row->place.line,
                 "no file below has a line \"%.60s\" of kind %s for gas %s; %s%s%s", row->label, kind,
                 row->gas, near ? "did you mean \"" : "correct gas, kind or line", near ? near : "",
                 near ? "\"?" : "");
    free(words);
    return fault->code;
}

static int apply_change(const Reading *reading, const Row *row, Fault *fault)
{
    int all_gases = strcmp(row->gas, "*") == 0, hits = 0;
    int any_line = strcmp(row->label, "*") == 0 || row->kind == ABUNDANCE;
    int gas = all_gases ? -1 : schedule_find(reading->schedule, row->gas);
    for (int s = 0; s < reading->count; s++) {
        Series *series = reading->series[s];
        if (series->kind != row->kind || (!all_gases && series->gas != gas) ||
            (!any_line && strcmp(series->label, row->label) != 0))
            continue;
        int star = all_gases || strcmp(row->label, "*") == 0;
        if (apply_row(reading, series, row, star, &hits, fault))
            return fault->code;
    }
    return hits ? 0 : nothing_hit(reading, row, gas, fault);
}

static int compare_rows(const void *a, const void *b)
{
    const Row *x = a, *y = b;
    if (x->first_year != y->first_year)
        return x->first_year < y->first_year ? -1 : 1;
    return (x->place.line > y->place.line) - (x->place.line < y->place.line);
}

int schedule_apply(Reading *reading, Row *row, size_t count, Fault *fault)
{
    int gas, hits = 0;
    for (size_t r = 0; r < count; r++) { /* in the order of the file, which is that of gases and lines */
        if (row[r].change != NEW)
            continue;
        if (place_gas(reading, row[r].gas, &gas, fault))
            return fault->code;
        row[r].series = -1;
        for (int s = 0; s < reading->count && row[r].series < 0; s++)
            if (reading->series[s] == schedule_series(reading, gas, row[r].kind, row[r].label))
                row[r].series = s;
        if (row[r].series < 0 && add_series(reading, gas, &row[r], &row[r].series, fault))
            return fault->code;
        if (check_same(reading, reading->series[row[r].series], &row[r], fault))
            return fault->code;
    }
    /* No year of a series is touched twice by a file, so this order alone gives every rule its year before.
     */
    qsort(row, count, sizeof *row, compare_rows);
    for (size_t r = 0; r < count; r++)
        if (row[r].change == NEW
                ? apply_row(reading, reading->series[row[r].series], &row[r], 0, &hits, fault)
                : apply_change(reading, &row[r], fault))
            return fault->code;
    return 0;
}
