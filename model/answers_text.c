/* answers_text: the table of answers for people. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "answers_emission.h"

enum { DECADE = 10, SHORT_FILE = 15 /* years */, NOTES = 60 };

/* Remarks told below a table, numbered as they come; the same words get the same number. */
typedef struct {
    const char *of[NOTES];
    int count;
} Remarks;

/* ---- cells ---- */

static void number(FILE *out, int width, int decimals, int sign, double value)
{
    if (isnan(value))
        fprintf(out, " %*s", width, "-");
    else
        fprintf(out, sign ? " %+*.*f" : " %*.*f", width, decimals, value);
}

/* The error behind a value, nine characters. */
static void plus_minus(FILE *out, const FileAnswer *answer)
{
    char text[20] = "";
    if (isfinite(answer->value) && isfinite(answer->error))
        snprintf(text, sizeof text, "+-%.2g", answer->error);
    fprintf(out, " %-8s", text);
}

/* The mark of a remark, at the end of a line. */
static void mark(FILE *out, Remarks *remarks, const FileAnswer *answer)
{
    int i = 0;
    while (i < remarks->count && strcmp(remarks->of[i], answer->note))
        i++;
    if (!answer->note[0] || i == NOTES)
        return;
    if (i == remarks->count)
        remarks->of[remarks->count++] = answer->note;
    fprintf(out, "(%d)", i + 1);
}

static void print_remarks(FILE *out, const Remarks *remarks)
{
    for (int i = 0; i < remarks->count; i++)
        fprintf(out, "  (%d) %s\n", i + 1, remarks->of[i]);
}

/* Digits behind the point, so that about five are shown. */
static int decimals_of(double value)
{
    double size = fabs(value);
    return size >= 1000.0 ? 1 : size >= 20.0 ? 2 : size >= 1.0 ? 3 : 4;
}

static void name_series(char *name, size_t size, const FileSeries *file, int kind)
{
    const double *limit = file->limit_km;
    char unit[32];
    answers_unit_word(unit, sizeof unit, ", ", file->unit[kind]);
    switch (kind) {
    case SERIES_TROPOSPHERE: snprintf(name, size, "  0-%g km (troposphere)", limit[0]); break;
    case SERIES_LOWER: snprintf(name, size, "  %g-%g km", limit[0], limit[1]); break;
    case SERIES_MIDDLE: snprintf(name, size, "  %g-%g km", limit[1], limit[2]); break;
    case SERIES_UPPER: snprintf(name, size, "  above %g km", limit[2]); break;
    case SERIES_UV: snprintf(name, size, "noon UV index"); break;
    case SERIES_DOSE: snprintf(name, size, "erythemal dose%s", unit); break; /* short, for the table */
    case SERIES_EESC3: snprintf(name, size, "equiv. chlorine 3 yr%s", unit); break;
    case SERIES_EESC55: snprintf(name, size, "equiv. chlorine 5.5 yr%s", unit); break;
    default: snprintf(name, size, "%s%s", series_facts(kind)->label, unit);
    }
}

/* ---- one file ---- */

static void print_series(const Answers *answers, const FileSeries *file, int kind, int smoothed,
                         Remarks *remarks, FILE *out)
{
    const char *id = series_facts(kind)->id, *end = answers_ending(smoothed);
    const char *word = series_facts(kind)->sign > 0 ? "lowest" : "highest";
    const FileAnswer *benchmark = answers_find(answers, "%s_benchmark%s", id, end);
    const FileAnswer *extreme = answers_find(answers, "%s_%s%s", id, word, end);
    const FileAnswer *year = answers_find(answers, "%s_%s_year%s", id, word, end);
    const FileAnswer *change = answers_find(answers, "%s_change%s", id, end);
    const FileAnswer *percent = answers_find(answers, "%s_change_percent%s", id, end);
    const FileAnswer *last = answers_find(answers, "%s_last_change%s", id, end);
    const FileAnswer *back = answers_find(answers, "%s_return_year%s", id, end);
    char name[80];
    if (!benchmark || !extreme || !year || !change || !percent || !last || !back)
        return;
    int decimals = decimals_of(extreme->value);
    name_series(name, sizeof name, file, kind);
    fprintf(out, "  %-29s", name);
    number(out, 8, decimals, 0, benchmark->value);
    number(out, 8, decimals, 0, extreme->value);
    number(out, 7, 1, 0, year->value);
    number(out, 8, decimals, 1, change->value);
    plus_minus(out, change);
    number(out, 6, 2, 1, percent->value);
    number(out, 8, decimals, 1, last->value);
    number(out, 7, 1, 0, back->value);
    plus_minus(out, back);
    mark(out, remarks, back);
    fputc('\n', out);
}

static void print_block(const Answers *answers, const FileSeries *file, int smoothed, Remarks *remarks,
                        FILE *out)
{
    char title[80];
    const FileAnswer *lowest = answers_find(answers, "ozone_column_lowest%s", answers_ending(smoothed));
    if (smoothed)
        snprintf(title, sizeof title, "running mean of %g years", answers->smooth_years);
    else
        snprintf(title, sizeof title, "unsmoothed: interval means");
    if (!lowest || isnan(lowest->value)) {
        fprintf(out, "  %s: %s\n\n", title, lowest ? lowest->note : "none");
        return;
    }
    fprintf(out, "  %-29s %8d %8s %7s %8s %-8s %6s %8s %7s +-error\n", title, answers->benchmark_year,
            "extreme", "in", "change", "+-error", "%", "at end", "back in");
    for (int kind = 0; kind < SERIES_KINDS; kind++)
        if (file->value[kind])
            print_series(answers, file, kind, smoothed, remarks, out);
    fputc('\n', out);
}

/* What the file does not give, those with the same reason together. */
static void print_missing(const FileSeries *file, FILE *out)
{
    for (int kind = 0, next; kind < SERIES_KINDS; kind = next) {
        next = kind + 1;
        if (file->value[kind] || !file->missing[kind][0])
            continue;
        fprintf(out, "  left out: %s",
                kind == SERIES_TROPOSPHERE ? "partial columns" : series_facts(kind)->label);
        for (; next < SERIES_KINDS && !strcmp(file->missing[next], file->missing[kind]); next++)
            if (next > SERIES_UPPER)
                fprintf(out, "; %s", series_facts(next)->label);
        fprintf(out, " (%s)\n", file->missing[kind]);
    }
    if (file->emissions.missing[0])
        fprintf(out, "  left out: emissions in ODP-tonnes (%s)\n", file->emissions.missing);
}

/* ---- calendar years ---- */

static void print_year(const Answers *answers, const FileSeries *file, int year, FILE *out)
{
    Series column = series_view(file, SERIES_COLUMN);
    double value = series_year_mean(&column, year);
    double benchmark = series_year_mean(&column, answers->benchmark_year);
    if (isnan(value))
        return;
    fprintf(out, "  %4d%c", year, year == answers->benchmark_year ? '*' : ' ');
    number(out, 10, 2, 0, value);
    number(out, 9, 2, 1, value - benchmark);
    number(out, 9, 2, 1, 100.0 * (value - benchmark) / benchmark);
    for (int kind = SERIES_UV; kind < SERIES_KINDS; kind++) {
        Series series = series_view(file, kind);
        if (!file->value[kind])
            continue;
        value = series_year_mean(&series, year);
        benchmark = series_year_mean(&series, answers->benchmark_year);
        number(out, 10, fabs(value) >= 1000.0 ? 1 : 2, 0, value);
        number(out, 7, 2, 1, 100.0 * (value - benchmark) / benchmark);
    }
    fputc('\n', out);
}

int answers_year_shown(const Answers *answers, const FileSeries *file, int year)
{
    int first = (int)floor(file->middle[0]), last = (int)floor(file->middle[file->count - 1]);
    int every = last - first < SHORT_FILE ? 1 : DECADE; /* a short file may hold no decade at all */
    return year % every == 0 || year == first || year == last || year == answers->benchmark_year;
}

static void print_years(const Answers *answers, const FileSeries *file, FILE *out)
{
    static const char *const heads[SERIES_KINDS] = {[SERIES_UV] = "UV index",
                                                    [SERIES_DOSE] = "daily dose",
                                                    [SERIES_EESC3] = "EESC 3 yr",
                                                    [SERIES_EESC55] = "EESC 5.5yr"};
    int first = (int)floor(file->middle[0]), last = (int)floor(file->middle[file->count - 1]);
    fprintf(out, "means of calendar years; change is against %d (*)\n", answers->benchmark_year);
    fprintf(out, "  %4s  %10s %9s %9s", "year", "column, DU", "change", "%");
    for (int kind = SERIES_UV; kind < SERIES_KINDS; kind++)
        if (file->value[kind])
            fprintf(out, " %10s %7s", heads[kind], "%");
    fputc('\n', out);
    for (int year = first; year <= last; year++)
        if (answers_year_shown(answers, file, year))
            print_year(answers, file, year, out);
}

/* ---- against ---- */

static void print_pair(const Answers *answers, const FileSeries *file, int kind, Remarks *remarks, FILE *out)
{
    const SeriesFacts *facts = series_facts(kind);
    const FileAnswer *integral =
        answers_find(answers, "%s_integrated_%s", facts->id, facts->sign > 0 ? "depletion" : "excess");
    const FileAnswer *mean = answers_find(answers, "%s_difference_mean", facts->id);
    const FileAnswer *largest = answers_find(answers, "%s_difference_largest", facts->id);
    const FileAnswer *year = answers_find(answers, "%s_difference_largest_year", facts->id);
    const FileAnswer *delay[2] = {answers_find(answers, "%s_return_delay", facts->id),
                                  answers_find(answers, "%s_return_delay_smoothed", facts->id)};
    char name[80];
    if (!integral || !mean || !largest || !year || !delay[0] || !delay[1])
        return;
    name_series(name, sizeof name, file, kind);
    fprintf(out, "  %-29s", name);
    number(out, 9, decimals_of(integral->value), 1, integral->value);
    plus_minus(out, integral);
    number(out, 8, decimals_of(mean->value), 1, mean->value);
    number(out, 8, decimals_of(largest->value), 1, largest->value);
    number(out, 7, 1, 0, year->value);
    number(out, 6, 2, 1, delay[0]->value);
    plus_minus(out, delay[0]);
    number(out, 6, 2, 1, delay[1]->value);
    plus_minus(out, delay[1]);
    mark(out, remarks, delay[0]);
    fputc('\n', out);
}

static void print_against(const Answers *answers, const FileSeries *file, const FileSeries *reference,
                          FILE *out)
{
    Remarks remarks = {.count = 0};
    const FileAnswer *less = answers_find(answers, "ozone_column_integrated_depletion_where_less");
    const FileAnswer *more = answers_find(answers, "ozone_column_integrated_depletion_where_more");
    fprintf(out, "against %s%s%s; difference: this file less the reference\n", reference->path,
            reference->title[0] ? ": " : "", reference->title);
    fprintf(out, "  %-29s %9s %-8s %8s %8s %7s %6s %-8s %s\n", "", "integral", "+-error", "mean", "largest",
            "in", "delay,", "years", "smoothed");
    for (int kind = 0; kind < SERIES_KINDS; kind++)
        print_pair(answers, file, kind, &remarks, out);
    if (less && more && more->value > 0.0)
        fprintf(out,
                "  of the column's %+.3f DU year: %.3f from years with less ozone than the reference, %.3f "
                "made up in years with more\n",
                less->value - more->value, less->value, more->value);
    print_remarks(out, &remarks);
    fprintf(
        out,
        "  integral: over time of the ozone that this file has less (integrated ozone depletion, DU year), "
        "or of the\n  ultraviolet or chlorine that it has more; delay: later return to the value of %d\n\n",
        answers->benchmark_year);
}

/* ---- the whole ---- */

void answers_print(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out)
{
    Remarks remarks = {.count = 0};
    const FileAnswer *share = answers_find(answers, "ozone_column_share_above_tropopause");
    fprintf(out, "%s%s%s\n\n", file->title, file->title[0] ? ", " : "", file->path);
    fprintf(out, "Ozone column, near-global mean, %.0f to %.0f: change against %d and return to it\n\n",
            floor(file->middle[0]), floor(file->middle[file->count - 1]), answers->benchmark_year);
    print_block(answers, file, 0, &remarks, out);
    print_block(answers, file, 1, &remarks, out);
    fprintf(
        out,
        "  extreme: lowest ozone, highest ultraviolet or chlorine; change: extreme less %d; at end: last "
        "calendar\n  year less %d; +-: numerical error, no uncertainty of chemistry, schedule or mixing\n",
        answers->benchmark_year, answers->benchmark_year);
    fprintf(out, "  errors: %s\n", answers->error_source);
    if (file->count > 1 && file->end[0] - file->start[0] < 0.9)
        fprintf(out, "  intervals are shorter than a year: unsmoothed answers hold the season\n");
    if (share)
        fprintf(out, "  share of the column above the tropopause (%g km): %.2f %% (%s)\n", file->limit_km[0],
                share->value, share->note);
    print_remarks(out, &remarks);
    print_missing(file, out);
    fputc('\n', out);
    if (reference)
        print_against(answers, file, reference, out);
    print_years(answers, file, out);
    odp_print(answers, file, reference, out);
    fprintf(out,
            "\nCaution: one near-global column, without polar winter, ozone hole, change of circulation, or\n"
            "temperature that answers to ozone; a planning figure. Health and regulatory decisions defer to\n"
            "the competent authority and its methods.\n");
    if (file->value[SERIES_UV] || file->value[SERIES_DOSE])
        fprintf(out,
                "Ultraviolet is that of a clear sky for the case's sun and surface; no guide to personal "
                "exposure.\n");
}
