/* answers_against: one file set against another. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "answers.h"

/* Of a year: dates are kept to the second. */
static const double SLIVER = 1e-6;

/* The intervals of two files that cover the same time. */
typedef struct {
    int file, reference, count; /* first interval in each, and how many */
    double years;               /* their length together */
} Common;

typedef struct {
    Answers *answers;
    const FileSeries *file, *reference;
    Common common;
    const NumericalErrors *errors;
    int kind;
    Series difference; /* file less reference, over the common intervals */
    Fault *fault;
} Pair;

static int first_from(const FileSeries *series, double from)
{
    int i = 0;
    while (i < series->count && series->end[i] <= from + SLIVER)
        i++;
    return i;
}

static int find_common(Common *common, const FileSeries *file, const FileSeries *reference, Fault *fault)
{
    double from = fmax(file->start[0], reference->start[0]);
    double to = fmin(file->end[file->count - 1], reference->end[reference->count - 1]);
    if (!(to - from > SLIVER))
        return fault_set(
            fault, FAULT_INPUT,
            "%s covers %.2f to %.2f and %s %.2f to %.2f: no time in common; give files that overlap",
            file->path, file->start[0], file->end[file->count - 1], reference->path, reference->start[0],
            reference->end[reference->count - 1]);
    *common = (Common){first_from(file, from), first_from(reference, from), 0, 0.0};
    for (;; common->count++) {
        int i = common->file + common->count, j = common->reference + common->count;
        int more = i < file->count && file->start[i] < to - SLIVER;
        int more_reference = j < reference->count && reference->start[j] < to - SLIVER;
        if (!more && !more_reference)
            return 0;
        if (!more || !more_reference || fabs(file->start[i] - reference->start[j]) > SLIVER ||
            fabs(file->end[i] - reference->end[j]) > SLIVER)
            return fault_set(fault, FAULT_INPUT,
                             "%s and %s have different intervals from %.3f on; give files with the same "
                             "output.per_year",
                             file->path, reference->path, more ? file->start[i] : reference->start[j]);
        common->years += file->end[i] - file->start[i];
    }
}

static FileAnswer *entry(const Pair *pair, const char *unit, const char *what, const char *label)
{
    const SeriesFacts *facts = series_facts(pair->kind);
    FileAnswer *answer = answers_add(pair->answers, unit, pair->fault, "%s_%s", facts->id, what);
    if (answer)
        snprintf(answer->label, sizeof answer->label, "%s: %s", facts->label, label);
    return answer;
}

/* Time integral of the harm: of what the file has less of ozone than the reference, more of the others.
 * which: 0 all intervals, 1 those where there is harm, -1 the others, taken positive. */
static int add_integral(const Pair *pair, int which)
{
    static const char *const ends[] = {"_where_more", "", "_where_less"};
    const int sign = series_facts(pair->kind)->sign;
    char what[60], label[100], unit[40];
    const char *name = sign > 0 ? "integrated_depletion" : "integrated_excess";
    const Series *difference = &pair->difference;
    double sum = 0.0, length = 0.0;
    for (int i = 0; i < difference->count; i++) {
        double years = difference->end[i] - difference->start[i], harm = -sign * difference->value[i];
        if (which != 0 && which * harm <= 0.0)
            continue;
        sum += years * (which < 0 ? -harm : harm);
        length += years;
    }
    snprintf(what, sizeof what, "%s%s", name, ends[which + 1]);
    const char *plain = pair->file->unit[pair->kind];
    snprintf(unit, sizeof unit, "%s%syear", strcmp(plain, "1") ? plain : "", strcmp(plain, "1") ? " " : "");
    snprintf(label, sizeof label, "%s%s", sign > 0 ? "integrated depletion" : "integrated excess",
             which > 0   ? ", years with less ozone"
             : which < 0 ? ", years with more ozone, taken positive"
                         : "");
    FileAnswer *answer = entry(pair, unit, what, label);
    if (!answer)
        return pair->fault->code;
    answer->value = sum;
    answer->error = which ? pair->errors->difference[pair->kind] * length
                          : pair->errors->mean_difference[pair->kind] * length;
    snprintf(answer->method, sizeof answer->method,
             "integral over %.2f years, %.2f to %.2f, of %s%s; interval means times their length", length,
             difference->start[0], difference->end[difference->count - 1],
             sign > 0 ? "reference less this file" : "this file less reference",
             which > 0   ? " where that is positive"
             : which < 0 ? " where that is negative, sign reversed"
                         : "");
    return 0;
}

static int add_differences(const Pair *pair)
{
    const Series *difference = &pair->difference;
    const char *unit = pair->file->unit[pair->kind];
    double mean = 0.0, error = pair->errors->difference[pair->kind];
    int most = 0;
    for (int i = 0; i < difference->count; i++) {
        mean += difference->value[i] * (difference->end[i] - difference->start[i]) / pair->common.years;
        if (fabs(difference->value[i]) > fabs(difference->value[most]))
            most = i;
    }
    FileAnswer *answer = entry(pair, unit, "difference_mean", "mean difference");
    if (!answer)
        return pair->fault->code;
    answer->value = mean;
    answer->error = pair->errors->mean_difference[pair->kind];
    snprintf(answer->method, sizeof answer->method, "this file less reference, mean over %.2f to %.2f",
             difference->start[0], difference->end[difference->count - 1]);
    answer = entry(pair, unit, "difference_largest", "largest difference");
    if (!answer)
        return pair->fault->code;
    answer->value = difference->value[most];
    answer->error = error;
    snprintf(answer->method, sizeof answer->method,
             "this file less reference, of the interval where it is largest, whatever its sign");
    answer = entry(pair, "year", "difference_largest_year", "year of the largest difference");
    if (!answer)
        return pair->fault->code;
    snprintf(answer->method, sizeof answer->method,
             "middle of that interval; error: how far off the intervals lie that twice the error of a "
             "difference could make the largest");
    if (difference->value[most] == 0.0) {
        snprintf(answer->note, sizeof answer->note, "the files do not differ");
        return 0;
    }
    answer->value = difference->middle[most];
    if (isfinite(error))
        answer->error =
            series_extreme_spread(difference, difference->value[most] > 0.0 ? -1 : 1, most, 2.0 * error);
    return 0;
}

static int add_delay(const Pair *pair, int smoothed, double *store)
{
    const SeriesFacts *facts = series_facts(pair->kind);
    const char *ending = answers_ending(smoothed);
    FileAnswer *answer =
        answers_add(pair->answers, "year", pair->fault, "%s_return_delay%s", facts->id, ending);
    if (!answer)
        return pair->fault->code;
    int year = pair->answers->benchmark_year;
    Series own = answers_series(pair->answers, pair->file, pair->kind, smoothed, store);
    SeriesReturn late = series_return(&own, facts->sign, year);
    Series other = answers_series(pair->answers, pair->reference, pair->kind, smoothed, store);
    SeriesReturn early = series_return(&other, facts->sign, year);
    snprintf(answer->label, sizeof answer->label, "%s: delay of the return to %d%s", facts->label, year,
             smoothed ? ", running mean" : "");
    snprintf(answer->method, sizeof answer->method,
             "year of return of this file less that of the reference, each to its own mean of %d, as in "
             "%s_return_year%s; "
             "error: that of a difference over the flatter slope",
             year, facts->id, ending);
    if (late.state == RETURN_FOUND && early.state == RETURN_FOUND) {
        answer->value = late.year - early.year;
        answer->error = pair->errors->difference[pair->kind] / fmin(fabs(late.slope), fabs(early.slope));
    } else if (late.state == RETURN_LATER && early.state == RETURN_FOUND) {
        snprintf(answer->note, sizeof answer->note,
                 "more than %.1f years: the reference is back in %.1f, this "
                 "file not by its end",
                 pair->file->end[pair->file->count - 1] - early.year, early.year);
    } else {
        snprintf(answer->note, sizeof answer->note, "no year of return in %s",
                 late.state == RETURN_FOUND    ? "the reference"
                 : early.state == RETURN_FOUND ? "this file"
                                               : "either file");
    }
    return 0;
}

static int add_pair(Pair *pair)
{
    const int count = pair->common.count, i = pair->common.file;
    const int most = pair->file->count > pair->reference->count ? pair->file->count : pair->reference->count;
    const double *own = pair->file->value[pair->kind] + i,
                 *other = pair->reference->value[pair->kind] + pair->common.reference;
    double *value = malloc((size_t)count * sizeof *value), *store = malloc(4 * (size_t)most * sizeof *store);
    if (value && store) {
        for (int k = 0; k < count; k++)
            value[k] = own[k] - other[k];
        pair->difference =
            (Series){count, pair->file->start + i, pair->file->middle + i, pair->file->end + i, value};
        int parts = pair->kind == SERIES_COLUMN; /* only there is it told by sign */
        if (!add_integral(pair, 0) && !(parts && (add_integral(pair, 1) || add_integral(pair, -1))) &&
            !add_differences(pair) && !add_delay(pair, 0, store))
            add_delay(pair, 1, store);
    } else {
        fault_memory(pair->fault, "a difference of two files");
    }
    free(value);
    free(store);
    return pair->fault->code;
}

int answers_against(Answers *answers, const FileSeries *file, const FileSeries *reference,
                    const NumericalErrors *errors, Fault *fault)
{
    Pair pair = {answers, file, reference, {0}, errors, 0, {0}, fault};
    if (find_common(&pair.common, file, reference, fault))
        return fault->code;
    for (pair.kind = 0; pair.kind < SERIES_KINDS; pair.kind++) {
        if (!file->value[pair.kind] || !reference->value[pair.kind])
            continue;
        if (strcmp(file->unit[pair.kind], reference->unit[pair.kind]))
            return fault_set(fault, FAULT_INPUT, "%s has %s in \"%s\", %s in \"%s\"; bring them to one unit",
                             file->path, series_facts(pair.kind)->id, file->unit[pair.kind], reference->path,
                             reference->unit[pair.kind]);
        if (pair.kind >= SERIES_TROPOSPHERE && pair.kind <= SERIES_UPPER &&
            memcmp(file->limit_km, reference->limit_km, sizeof file->limit_km))
            return fault_set(fault, FAULT_INPUT,
                             "%s and %s have different tropopauses (%g and %g km); give --limits", file->path,
                             reference->path, file->limit_km[0], reference->limit_km[0]);
        if (add_pair(&pair))
            return fault->code;
    }
    return 0;
}
