/* schedule_series: what a finished schedule says at a time; contract in schedule.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule.h"

#include <math.h>
#include <string.h>

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
    if (years == 0)
        return 0;
    double place = time - 0.5 - schedule->first_year[gas]; /* years after the first mid-year */
    if (!(place > 0))
        return series[0];
    if (place < years - 1) {
        int i = (int)place;
        return series[i] + (place - i) * (series[i + 1] - series[i]);
    }
    int taken_over = schedule->emission_from[gas] == schedule->first_year[gas] + years;
    if (!taken_over || years < 2)
        return series[years - 1];
    double on = series[years - 1] + (place - (years - 1)) * (series[years - 1] - series[years - 2]);
    return on > 0 ? on : 0;
}

int schedule_emits(const Schedule *schedule, int gas, double time)
{
    return schedule->emission_from[gas] && time >= schedule->emission_from[gas];
}

double schedule_emission(const Schedule *schedule, int line, double time)
{
    const ScheduleLine *of = &schedule->line[line];
    double year = floor(time) - of->first_year;
    return year >= 0 && year < of->years ? of->amount[(int)year] : 0;
}

/* ---- years of a run ---- */

static int covers_abundance(const Schedule *schedule, int g, int first_year, int last_year, Fault *fault)
{
    int first = schedule->first_year[g], last = first + schedule->years[g] - 1;
    if (first > first_year || last < last_year)
        return fault_at(fault, schedule->path[schedule->file[g]],
                        first > first_year ? schedule->first_line[g] : schedule->last_line[g],
                        "%s has values for %d to %d, but the run needs %d to %d; add the missing "
                        "years or change years.first and years.last",
                        schedule->gas[g], first, last, first_year, last_year);
    return 0;
}

/* Is there a line at the ground for the gas in the year? last: the one that ends latest. */
static int has_line(const Schedule *schedule, int g, int year, int *last)
{
    *last = -1;
    for (int l = 0; l < schedule->lines; l++) {
        const ScheduleLine *line = &schedule->line[l];
        if (line->gas != g || line->to_km > 0)
            continue;
        if (year >= line->first_year && year < line->first_year + line->years)
            return 1;
        if (*last < 0 ||
            line->first_year + line->years > schedule->line[*last].first_year + schedule->line[*last].years)
            *last = l;
    }
    return 0;
}

/* A bank does not stop giving off because its rows stop. */
static int covers_banks(const Schedule *schedule, int last_year, Fault *fault)
{
    for (int l = 0; l < schedule->lines; l++) {
        const ScheduleLine *line = &schedule->line[l];
        int end = line->first_year + line->years - 1;
        if (line->stock && end < last_year && line->stock[line->years] > 0)
            return fault_at(
                fault, schedule->path[line->file], line->row,
                "the bank of %s, line \"%.60s\", still holds %.6g kt%s%s at the end of %d, while the "
                "run goes to %d; carry its release on (0 for none), or change years.last",
                schedule->gas[line->gas], line->label, line->stock[line->years] * 1e-6,
                line->element[0] ? " " : "", line->element, end, last_year);
    }
    return 0;
}

int schedule_covers(const Schedule *schedule, int first_year, int last_year, Fault *fault)
{
    for (int g = 0; g < schedule->gases; g++) {
        int from = schedule->emission_from[g], last;
        if (schedule->years[g] && (!from || from > first_year) &&
            covers_abundance(schedule, g, first_year, from && from <= last_year ? from - 1 : last_year,
                             fault))
            return fault->code;
        if (!from)
            continue;
        for (int year = from > first_year ? from : first_year; year <= last_year; year++)
            if (!has_line(schedule, g, year, &last))
                return fault_at(
                    fault, schedule->path[schedule->line[last].file], schedule->line[last].row,
                    "%s is driven by emissions from %d on, but no line has any in %d, while the run "
                    "goes to %d; add rows (0 for none) or change years.last",
                    schedule->gas[g], from, year, last_year);
    }
    return covers_banks(schedule, last_year, fault);
}

int schedule_meets(const Schedule *schedule, int first_year, int last_year, Fault *fault)
{
    for (int s = 0; s < schedule->spans; s++) {
        const ScheduleSpan *span = &schedule->span[s];
        if (span->last_year < first_year || span->first_year > last_year)
            return fault_at(
                fault, schedule->path[span->file], span->row,
                "this line is given for %d to %d, outside the run's %d to %d, which would never see "
                "it; correct the years, change years.first and years.last, or leave the rows out",
                span->first_year, span->last_year, first_year, last_year);
    }
    return 0;
}

int schedule_supersedes(const Schedule *schedule, int gas)
{
    int from = schedule->emission_from[gas];
    return from > 0 && schedule->years[gas] > 0 && schedule->first_year[gas] + schedule->years[gas] > from;
}
