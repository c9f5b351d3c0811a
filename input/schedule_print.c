/* schedule_print: a finished schedule in short, for people; contract in schedule.h. */
#include "schedule.h"

#include <string.h>

enum { WIDEST = 110 };

/* Last year of the abundances that drive the ground. */
static int last_abundance(const Schedule *schedule, int g)
{
    int last = schedule->first_year[g] + schedule->years[g] - 1, from = schedule->emission_from[g];
    return from && last >= from ? from - 1 : last;
}

static int lines_of(const Schedule *schedule, int g)
{
    int count = 0;
    for (int l = 0; l < schedule->lines; l++)
        count += schedule->line[l].gas == g;
    return count;
}

static int abundance_alone(const Schedule *schedule, int g)
{
    return schedule->years[g] && !lines_of(schedule, g);
}

static int same_years(const Schedule *schedule, int g, int h)
{
    return abundance_alone(schedule, g) && abundance_alone(schedule, h) &&
           schedule->first_year[g] == schedule->first_year[h] && schedule->years[g] == schedule->years[h];
}

/* Gases given as abundances alone, those of the same years together. */
static void print_abundances(const Schedule *schedule, const char *prefix, FILE *out)
{
    for (int g = 0; g < schedule->gases; g++) {
        int named = !abundance_alone(schedule, g);
        for (int h = 0; !named && h < g; h++)
            named = same_years(schedule, g, h);
        if (named)
            continue;
        int wide =
            fprintf(out, "%sabundance %d-%d:", prefix, schedule->first_year[g], last_abundance(schedule, g));
        for (int h = g; h < schedule->gases; h++) {
            if (!same_years(schedule, g, h))
                continue;
            if (wide + (int)strlen(schedule->gas[h]) + 2 > WIDEST)
                wide = fprintf(out, ",\n%s   ", prefix) - 2;
            else if (h > g)
                wide += fprintf(out, ",");
            wide += fprintf(out, " %s", schedule->gas[h]);
        }
        fputs("\n", out);
    }
}

static void print_line(const ScheduleLine *line, const char *prefix, FILE *out)
{
    double total = 0;
    for (int y = 0; y < line->years; y++)
        total += line->amount[y];
    const char *of = line->element[0] ? " " : "";
    fprintf(out, "%s    %-28s %d-%d  %10.4g kt%s%s", prefix, line->label, line->first_year,
            line->first_year + line->years - 1, total * 1e-6, of, line->element);
    if (line->to_km > 0)
        fprintf(out, " at %g to %g km", line->from_km, line->to_km);
    if (line->stock)
        fprintf(out, "; bank from %.4g to %.4g kt%s%s", line->stock[0] * 1e-6,
                line->stock[line->years] * 1e-6, of, line->element);
    fputs("\n", out);
}

void schedule_print(const Schedule *schedule, const char *prefix, FILE *out)
{
    print_abundances(schedule, prefix, out);
    for (int g = 0; g < schedule->gases; g++) {
        int lines = lines_of(schedule, g), from = schedule->emission_from[g];
        if (!lines)
            continue;
        fprintf(out, "%s%s: ", prefix, schedule->gas[g]);
        if (schedule->years[g])
            fprintf(out, "abundance %d-%d, ", schedule->first_year[g], last_abundance(schedule, g));
        if (from)
            fprintf(out, "emissions from %d: ", from);
        else
            fputs("emissions at altitude: ", out);
        fprintf(out, "%d line%s%s\n", lines, lines > 1 ? "s" : "",
                schedule_supersedes(schedule, g) ? ", in place of the abundances given from then on" : "");
        for (int l = 0; l < schedule->lines; l++)
            if (schedule->line[l].gas == g)
                print_line(&schedule->line[l], prefix, out);
    }
}
