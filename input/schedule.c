/* schedule: the files read and put together; contract in schedule.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule.h"

#include <stdlib.h>
#include <string.h>

#include "schedule_reading.h"

/* ---- from series to the schedule ---- */

static int make_arrays(Schedule *schedule, Fault *fault)
{
    size_t gases = (size_t)schedule->gases + 1; /* never 0 */
    schedule->first_year = calloc(gases, sizeof *schedule->first_year);
    schedule->years = calloc(gases, sizeof *schedule->years);
    schedule->file = calloc(gases, sizeof *schedule->file);
    schedule->first_line = calloc(gases, sizeof *schedule->first_line);
    schedule->last_line = calloc(gases, sizeof *schedule->last_line);
    schedule->abundance = calloc(gases, sizeof *schedule->abundance);
    schedule->emission_from = calloc(gases, sizeof *schedule->emission_from);
    if (!schedule->first_year || !schedule->years || !schedule->file || !schedule->first_line ||
        !schedule->last_line || !schedule->abundance || !schedule->emission_from)
        return fault_memory(fault, "schedule");
    return 0;
}

/* Plain emissions of one series. */
static int make_line(const Reading *reading, const Series *series, ScheduleLine *line, Fault *fault)
{
    int first, last;
    if (series_whole(reading, series, fault) || !series_span(series, &first, &last))
        return fault->code;
    line->first_year = EARLIEST_YEAR + first;
    line->years = last - first + 1;
    line->amount = malloc((size_t)line->years * sizeof *line->amount);
    if (!line->amount)
        return fault_memory(fault, "emissions of the schedule");
    for (int y = first; y <= last; y++)
        line->amount[y - first] = series->cell[y].value;
    return 0;
}

static int make_lines(const Reading *reading, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    schedule->line = calloc((size_t)reading->count + 1, sizeof *schedule->line);
    if (!schedule->line)
        return fault_memory(fault, "lines of the schedule");
    for (int g = 0; g < schedule->gases; g++)
        for (int s = 0; s < reading->count; s++) {
            const Series *series = reading->series[s];
            if (series->gas != g || (series->kind != EMISSION && series->kind != BANK))
                continue;
            ScheduleLine *line = &schedule->line[schedule->lines++];
            line->gas = g;
            line->label = strdup(series->label);
            if (!line->label)
                return fault_memory(fault, "lines of the schedule");
            strcpy(line->element, series->element);
            line->from_km = series->from_km;
            line->to_km = series->to_km;
            line->file = series->first.file;
            line->row = series->first.line;
            if (series->kind == BANK ? schedule_bank(reading, series, line, fault)
                                     : make_line(reading, series, line, fault))
                return fault->code;
            if (!(line->to_km > 0) &&
                (!schedule->emission_from[g] || line->first_year < schedule->emission_from[g]))
                schedule->emission_from[g] = line->first_year;
        }
    return 0;
}

/* No abundance may stand in or after the first year of emission but from a file below that of the
 * emission. Scaling all gases says nothing of the one. */
static int check_both_ways(const Reading *reading, const Series *abundance, Fault *fault)
{
    const Schedule *schedule = reading->schedule;
    for (int s = 0; s < reading->count; s++) {
        const Series *other = reading->series[s];
        int first, last;
        if (other->gas != abundance->gas || other->to_km > 0 ||
            (other->kind != EMISSION && other->kind != BANK) || !series_span(other, &first, &last))
            continue;
        for (int y = first; y < SERIES_YEARS; y++) {
            Place by = abundance->cell[y].given, from = other->cell[first].made;
            if (abundance->cell[y].stands && by.file >= from.file)
                return fault_at(
                    fault, schedule->path[by.file], by.line,
                    "%s has an abundance for %d, but %s:%d has emissions from %d on; remove one of "
                    "the two",
                    schedule->gas[other->gas], EARLIEST_YEAR + y, schedule->path[from.file], from.line,
                    EARLIEST_YEAR + first);
        }
    }
    return 0;
}

/* The abundances of a gas, up to and with the first year of emissions: its mid-year serves the
 * interpolation through the change. */
static int make_abundances(const Reading *reading, const Series *series, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    int g = series->gas, first, last, from = schedule->emission_from[g];
    if (series_whole(reading, series, fault) || check_both_ways(reading, series, fault) ||
        !series_span(series, &first, &last))
        return fault->code;
    if (from && EARLIEST_YEAR + last > from)
        last = from - EARLIEST_YEAR;
    if (last < first)
        return 0; /* emissions have replaced it from before its first year */
    double *values = malloc((size_t)(last - first + 1) * sizeof *values);
    if (!values)
        return fault_memory(fault, "abundances of the schedule");
    for (int y = first; y <= last; y++)
        values[y - first] = series->cell[y].value;
    schedule->abundance[g] = values;
    schedule->first_year[g] = EARLIEST_YEAR + first;
    schedule->years[g] = last - first + 1;
    return 0;
}

/* Rows that messages about a gas point to: of its abundances, else of its first line. */
static void name_rows(const Reading *reading, int gas)
{
    Schedule *schedule = reading->schedule;
    const Series *series = schedule->years[gas] ? schedule_series(reading, gas, ABUNDANCE, NULL) : NULL;
    if (series) {
        const Cell *cell = series->cell + (schedule->first_year[gas] - EARLIEST_YEAR);
        Place first = cell[0].made, last = cell[schedule->years[gas] - 1].made;
        schedule->file[gas] = first.file;
        schedule->first_line[gas] = first.line;
        schedule->last_line[gas] = last.file == first.file ? last.line : first.line;
        return;
    }
    for (int l = schedule->lines - 1; l >= 0; l--)
        if (schedule->line[l].gas == gas) {
            schedule->file[gas] = schedule->line[l].file;
            schedule->first_line[gas] = schedule->last_line[gas] = schedule->line[l].row;
        }
}

static int build(const Reading *reading, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    if (make_arrays(schedule, fault) || schedule_bank_kinds(reading, fault) || make_lines(reading, fault))
        return fault->code;
    for (int s = 0; s < reading->count; s++)
        if (reading->series[s]->kind == ABUNDANCE && make_abundances(reading, reading->series[s], fault))
            return fault->code;
    for (int g = 0; g < schedule->gases; g++)
        name_rows(reading, g);
    return 0;
}

/* ---- files ---- */

static int read_file(Reading *reading, int file, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    const char *path = schedule->path[file];
    Csv csv;
    Row *row = NULL;
    size_t count;
    if (csv_read(&csv, path, fault))
        return fault->code;
    schedule->header[file] = strdup(csv.header);
    if (!schedule->header[file])
        fault_memory(fault, path);
    else if (!schedule_rows(&csv, path, file, &row, &count, fault))
        schedule_apply(reading, row, count, fault);
    free(row);
    csv_free(&csv);
    return fault->code;
}

static int read_files(Reading *reading, const char *const *path, int count, Fault *fault)
{
    Schedule *schedule = reading->schedule;
    schedule->path = calloc((size_t)count, sizeof *schedule->path);
    schedule->header = calloc((size_t)count, sizeof *schedule->header);
    if (!schedule->path || !schedule->header)
        return fault_memory(fault, "schedule");
    schedule->files = count;
    for (int f = 0; f < count; f++)
        if (!(schedule->path[f] = strdup(path[f])))
            return fault_memory(fault, "schedule");
    for (int f = 0; f < count; f++)
        if (read_file(reading, f, fault))
            return fault->code;
    return build(reading, fault);
}

int schedule_read(Schedule *schedule, const char *const *path, int count, Fault *fault)
{
    memset(schedule, 0, sizeof *schedule);
    Reading reading = {.schedule = schedule};
    int code = read_files(&reading, path, count, fault);
    for (int s = 0; s < reading.count; s++) {
        free(reading.series[s]->label);
        free(reading.series[s]);
    }
    free(reading.series);
    if (code)
        schedule_free(schedule);
    return code;
}

void schedule_free(Schedule *schedule)
{
    for (int g = 0; schedule->abundance && g < schedule->gases; g++)
        free(schedule->abundance[g]);
    for (int l = 0; l < schedule->lines; l++) {
        free(schedule->line[l].label);
        free(schedule->line[l].amount);
        free(schedule->line[l].stock);
    }
    for (int f = 0; f < schedule->files; f++) {
        free(schedule->path[f]);
        free(schedule->header[f]);
    }
    free(schedule->gas);
    free(schedule->first_year);
    free(schedule->years);
    free(schedule->file);
    free(schedule->first_line);
    free(schedule->last_line);
    free(schedule->abundance);
    free(schedule->emission_from);
    free(schedule->line);
    free(schedule->span);
    free(schedule->path);
    free(schedule->header);
    memset(schedule, 0, sizeof *schedule);
}
