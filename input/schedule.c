/* schedule: see schedule.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "table.h"

enum { EARLIEST_YEAR = 1700, LATEST_YEAR = 2500 };

enum Column { YEAR, GAS, KIND, AMOUNT, UNIT, LINE, COLUMNS };
static const char *const column_names[COLUMNS] = {"year", "gas", "kind", "amount", "unit", "line"};

static const char *const kinds[] = {"abundance", "emission"};

static const char *const units[] = {"ppt", "ppb", "ppm", "mol/mol"};
static const double unit_size[] = {1e-12, 1e-9, 1e-6, 1};
enum { UNITS = sizeof units / sizeof units[0] };

typedef struct {
    int gas, year, line;
    double abundance;
} Entry;

/* ---- one row ---- */

static int find_columns(const Csv *csv, const char *path, size_t *place, Fault *fault)
{
    size_t count = csv->first[1];
    for (int k = 0; k < COLUMNS; k++)
        place[k] = count;
    for (size_t c = 0; c < count; c++) {
        int k = 0;
        while (k < COLUMNS && strcmp(csv->cell[c], column_names[k]) != 0)
            k++;
        if (k == COLUMNS) {
            const char *near = fault_nearest(csv->cell[c], column_names, COLUMNS);
            return fault_at(fault, path, csv->line[0], "unknown column \"%.60s\"; %s%s%s", csv->cell[c],
                            near ? "did you mean " : "the columns are year,gas,kind,amount,unit,line",
                            near ? near : "", near ? "?" : "");
        }
        if (place[k] != count)
            return fault_at(fault, path, csv->line[0], "two columns are called %s; remove one",
                            column_names[k]);
        place[k] = c;
    }
    for (int k = 0; k < COLUMNS; k++)
        if (place[k] == count)
            return fault_at(fault, path, csv->line[0],
                            "no column %s; the columns are year,gas,kind,amount,unit,line", column_names[k]);
    return 0;
}

static int read_year(const char *path, int line, const char *cell, int *year, Fault *fault)
{
    double value;
    if (csv_number(path, line, "year", cell, &value, fault))
        return fault->code;
    if (value != floor(value) || value < EARLIEST_YEAR || value > LATEST_YEAR)
        return fault_at(fault, path, line, "year is %s; write a whole year from %d to %d", cell,
                        EARLIEST_YEAR, LATEST_YEAR);
    *year = (int)value;
    return 0;
}

static int read_amount(const char *path, int line, const char *cell, const char *unit, double *abundance,
                       Fault *fault)
{
    double amount;
    if (csv_number(path, line, "amount", cell, &amount, fault))
        return fault->code;
    int u = 0;
    while (u < UNITS && strcmp(unit, units[u]) != 0)
        u++;
    if (u == UNITS) {
        const char *near = fault_nearest(unit, units, UNITS);
        return fault_at(fault, path, line, "unit is \"%.60s\"; write ppt, ppb, ppm or mol/mol%s%s%s", unit,
                        near ? " (did you mean " : "", near ? near : "", near ? "?)" : "");
    }
    if (amount < 0)
        return fault_at(fault, path, line, "amount is %s; an abundance cannot be negative", cell);
    *abundance = amount * unit_size[u];
    if (*abundance > 1)
        return fault_at(fault, path, line, "amount is %s %s, more than the air itself; check the unit", cell,
                        unit);
    return 0;
}

static int check_kind(const char *path, int line, const char *kind, Fault *fault)
{
    if (strcmp(kind, kinds[0]) == 0)
        return 0;
    if (strcmp(kind, kinds[1]) == 0)
        return fault_at(fault, path, line,
                        "kind is emission, which this version does not run; give abundances");
    const char *near = fault_nearest(kind, kinds, 2);
    return fault_at(fault, path, line, "kind is \"%.60s\"; %s", kind,
                    near == kinds[0] ? "did you mean abundance?" : "write abundance");
}

/* Index of the gas, added when new. The names have room for one per row. */
static int place_gas(Schedule *schedule, const char *name, int line, int *gas, Fault *fault)
{
    if (name[0] == '\0')
        return fault_at(fault, schedule->path, line, "gas is empty; name a species");
    if (strlen(name) >= sizeof schedule->gas[0])
        return fault_at(fault, schedule->path, line, "gas \"%.60s\" has more than %zu letters; shorten it",
                        name, sizeof schedule->gas[0] - 1);
    *gas = schedule_find(schedule, name);
    if (*gas < 0) {
        *gas = schedule->gases++;
        strcpy(schedule->gas[*gas], name);
    }
    return 0;
}

static int read_entry(Schedule *schedule, const Csv *csv, size_t row, const size_t *place, Entry *entry,
                      Fault *fault)
{
    char *const *cell = csv->cell + csv->first[row];
    entry->line = csv->line[row];
    if (read_year(schedule->path, entry->line, cell[place[YEAR]], &entry->year, fault) ||
        check_kind(schedule->path, entry->line, cell[place[KIND]], fault) ||
        read_amount(schedule->path, entry->line, cell[place[AMOUNT]], cell[place[UNIT]], &entry->abundance,
                    fault) ||
        place_gas(schedule, cell[place[GAS]], entry->line, &entry->gas, fault))
        return fault->code;
    if (cell[place[LINE]][0] == '\0')
        return fault_at(fault, schedule->path, entry->line,
                        "line is empty; write a label that says where the figure comes from");
    return 0;
}

/* ---- series ---- */

static int compare_entries(const void *a, const void *b)
{
    const Entry *x = a, *y = b;
    if (x->gas != y->gas)
        return x->gas < y->gas ? -1 : 1;
    if (x->year != y->year)
        return x->year < y->year ? -1 : 1;
    return (x->line > y->line) - (x->line < y->line);
}

/* entry[count] holds the years of one gas in order. */
static int check_series(const Schedule *schedule, const Entry *entry, size_t count, Fault *fault)
{
    for (size_t e = 1; e < count; e++) {
        const char *gas = schedule->gas[entry[e].gas];
        int before = entry[e - 1].year, year = entry[e].year;
        if (year == before)
            return fault_at(fault, schedule->path, entry[e].line,
                            "%s has year %d twice, first on line %d; keep one", gas, year, entry[e - 1].line);
        if (year == before + 2)
            return fault_at(fault, schedule->path, entry[e].line, "%s lacks the year %d; add a row for it",
                            gas, before + 1);
        if (year != before + 1)
            return fault_at(fault, schedule->path, entry[e].line,
                            "%s lacks the years %d to %d; add a row for each", gas, before + 1, year - 1);
    }
    return 0;
}

/* Cut the sorted entries into one series per gas. */
static int build_series(Schedule *schedule, const Entry *entry, size_t count, Fault *fault)
{
    size_t gases = (size_t)schedule->gases;
    schedule->first_year = calloc(gases, sizeof *schedule->first_year);
    schedule->years = calloc(gases, sizeof *schedule->years);
    schedule->first_line = calloc(gases, sizeof *schedule->first_line);
    schedule->last_line = calloc(gases, sizeof *schedule->last_line);
    schedule->abundance = calloc(gases, sizeof *schedule->abundance);
    if (!schedule->first_year || !schedule->years || !schedule->first_line || !schedule->last_line ||
        !schedule->abundance)
        return fault_memory(fault, schedule->path);
    for (size_t start = 0, end; start < count; start = end) {
        int gas = entry[start].gas;
        end = start + 1;
        while (end < count && entry[end].gas == gas)
            end++;
        if (check_series(schedule, entry + start, end - start, fault))
            return fault->code;
        double *series = malloc((end - start) * sizeof *series);
        if (!series)
            return fault_memory(fault, schedule->path);
        for (size_t e = start; e < end; e++)
            series[e - start] = entry[e].abundance;
        schedule->abundance[gas] = series;
        schedule->first_year[gas] = entry[start].year;
        schedule->years[gas] = (int)(end - start);
        schedule->first_line[gas] = entry[start].line;
        schedule->last_line[gas] = entry[end - 1].line;
    }
    return 0;
}

static int build(Schedule *schedule, const Csv *csv, const char *path, Entry *entry, Fault *fault)
{
    size_t place[COLUMNS], rows = csv->rows - 1;
    schedule->path = strdup(path);
    schedule->header = strdup(csv->header);
    schedule->gas = calloc(rows, sizeof *schedule->gas);
    if (!schedule->path || !schedule->header || !schedule->gas || !entry)
        return fault_memory(fault, path);
    if (find_columns(csv, path, place, fault))
        return fault->code;
    for (size_t r = 0; r < rows; r++)
        if (read_entry(schedule, csv, r + 1, place, &entry[r], fault))
            return fault->code;
    qsort(entry, rows, sizeof *entry, compare_entries);
    return build_series(schedule, entry, rows, fault);
}

int schedule_read(Schedule *schedule, const char *path, Fault *fault)
{
    memset(schedule, 0, sizeof *schedule);
    Csv csv;
    if (csv_read(&csv, path, fault))
        return fault->code;
    int code;
    if (csv.rows < 2) {
        code = fault_at(fault, path, csv.line[0], "no rows follow the column names; add them");
    } else {
        Entry *entry = malloc((csv.rows - 1) * sizeof *entry);
        code = build(schedule, &csv, path, entry, fault);
        free(entry);
    }
    csv_free(&csv);
    if (code)
        schedule_free(schedule);
    return code;
}

void schedule_free(Schedule *schedule)
{
    if (schedule->abundance)
        for (int g = 0; g < schedule->gases; g++)
            free(schedule->abundance[g]);
    free(schedule->gas);
    free(schedule->first_year);
    free(schedule->years);
    free(schedule->first_line);
    free(schedule->last_line);
    free(schedule->abundance);
    free(schedule->path);
    free(schedule->header);
    memset(schedule, 0, sizeof *schedule);
}

/* ---- use ---- */

int schedule_find(const Schedule *schedule, const char *gas)
{
    for (int g = 0; g < schedule->gases; g++)
        if (strcmp(schedule->gas[g], gas) == 0)
            return g;
    return -1;
}

double schedule_abundance(const Schedule *schedule, int gas, double time)
{
    const double *series = schedule->abundance[gas];
    int years = schedule->years[gas];
    double place = time - 0.5 - schedule->first_year[gas]; /* years after the first mid-year */
    if (!(place > 0))
        return series[0];
    if (place >= years - 1)
        return series[years - 1];
    int i = (int)place;
    return series[i] + (place - i) * (series[i + 1] - series[i]);
}

int schedule_covers(const Schedule *schedule, int first_year, int last_year, Fault *fault)
{
    for (int g = 0; g < schedule->gases; g++) {
        int first = schedule->first_year[g], last = first + schedule->years[g] - 1;
        if (first > first_year || last < last_year)
            return fault_at(fault, schedule->path,
                            first > first_year ? schedule->first_line[g] : schedule->last_line[g],
                            "%s has values for %d to %d, but the run needs %d to %d; add the missing "
                            "years or change years.first and years.last",
                            schedule->gas[g], first, last, first_year, last_year);
    }
    return 0;
}
