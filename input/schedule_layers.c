/* schedule_layers: the rows of one file laid over what the files before it have left; contract in
 * schedule_reading.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *path_of(const Reading *reading, Place place)
{
    return reading->schedule->path[place.file];
}

/* ---- series ---- */

static int find_series(const Reading *reading, int gas, int kind, const char *label)
{
    for (int s = 0; s < reading->count; s++) {
        const Series *series = reading->series[s];
        if (series->gas == gas && series->kind == kind &&
            (!label || kind == ABUNDANCE || strcmp(series->label, label) == 0))
            return s;
    }
    return -1;
}

Series *schedule_series(const Reading *reading, int gas, int kind, const char *label)
{
    int s = find_series(reading, gas, kind, label);
    return s >= 0 ? reading->series[s] : NULL;
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

/* ---- rows ---- */

/* A kind that the label has, or NULL. */
static const char *other_kind(const Reading *reading, int gas, const char *label)
{
    for (int s = 0; s < reading->count; s++)
        if (reading->series[s]->gas == gas && strcmp(reading->series[s]->label, label) == 0)
            return schedule_kinds[reading->series[s]->kind];
    return NULL;
}

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
    else if (other_kind(reading, gas, row->label))
        fault_at(fault, path, row->place.line,
                 "line \"%.60s\" of %s has no %s below: it is of kind %s; correct the kind", row->label,
                 row->gas, kind, other_kind(reading, gas, row->label));
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
        if (schedule_rule(reading, series, row, star, &hits, fault))
            return fault->code;
    }
    return hits ? 0 : nothing_hit(reading, row, gas, fault);
}

/* ---- spans ---- */

static int same_span(const Row *a, const Row *b)
{
    return a->kind == b->kind && strcmp(a->gas, b->gas) == 0 && strcmp(a->label, b->label) == 0;
}

static int order_spans(const void *a, const void *b)
{
    const Row *const *p = a, *const *q = b;
    const Row *x = *p, *y = *q;
    int gas = strcmp(x->gas, y->gas), label = strcmp(x->label, y->label);
    if (gas || label)
        return gas ? gas : label;
    if (x->kind != y->kind)
        return x->kind < y->kind ? -1 : 1;
    return (x->place.line > y->place.line) - (x->place.line < y->place.line);
}

/* One span for each gas, kind and label of a file after the first. */
static int note_spans(Reading *reading, const Row *row, size_t count, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    const Row **sorted = malloc(count * sizeof *sorted);
    ScheduleSpan *larger = realloc(schedule->span, ((size_t)schedule->spans + count) * sizeof *larger);
    if (larger)
        schedule->span = larger;
    if (!sorted || !larger) {
        free(sorted);
        return fault_memory(fault, "spans of the schedule");
    }
    for (size_t r = 0; r < count; r++)
        sorted[r] = &row[r];
    qsort(sorted, count, sizeof *sorted, order_spans);
    for (size_t r = 0; r < count; r++) {
        const Row *of = sorted[r];
        if (r == 0 || !same_span(sorted[r - 1], of))
            schedule->span[schedule->spans++] =
                (ScheduleSpan){of->place.file, of->place.line, of->first_year, of->last_year};
        ScheduleSpan *span = &schedule->span[schedule->spans - 1];
        if (of->first_year < span->first_year)
            span->first_year = of->first_year;
        if (of->last_year > span->last_year)
            span->last_year = of->last_year;
        if (of->kind != ABUNDANCE && of->kind != EMISSION)
            span->last_year = LATEST_YEAR; /* a stock carries on */
    }
    free(sorted);
    return 0;
}

/* ---- the file ---- */

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
        row[r].series = find_series(reading, gas, row[r].kind, row[r].label);
        if (row[r].series < 0 && add_series(reading, gas, &row[r], &row[r].series, fault))
            return fault->code;
        if (schedule_same(reading, reading->series[row[r].series], &row[r], fault))
            return fault->code;
    }
    if (count > 0 && row[0].place.file > 0 && note_spans(reading, row, count, fault))
        return fault->code;
    /* No year of a series is touched twice by a file, so this order alone gives every rule its year before.
     */
    qsort(row, count, sizeof *row, compare_rows);
    for (size_t r = 0; r < count; r++)
        if (row[r].change == NEW
                ? schedule_rule(reading, reading->series[row[r].series], &row[r], 0, &hits, fault)
                : apply_change(reading, &row[r], fault))
            return fault->code;
    return 0;
}
