/* answers: the list, and what one file gives. */
#include "answers.h"

#include <math.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "answers_emission.h"

/* ---- the list ---- */

FileAnswer *answers_add(Answers *answers, const char *unit, Fault *fault, const char *id, ...)
{
    if (answers->count == answers->room) {
        int room = answers->room ? 2 * answers->room : 64;
        FileAnswer *larger = realloc(answers->item, (size_t)room * sizeof *larger);
        if (!larger) {
            fault_memory(fault, "the answers");
            return NULL;
        }
        answers->item = larger;
        answers->room = room;
    }
    FileAnswer *answer = &answers->item[answers->count++];
    *answer = (FileAnswer){.value = NAN, .error = NAN};
    snprintf(answer->unit, sizeof answer->unit, "%s", unit);
    va_list values;
    va_start(values, id);
    vsnprintf(answer->id, sizeof answer->id, id, values);
    va_end(values);
    return answer;
}

const FileAnswer *answers_find(const Answers *answers, const char *id, ...)
{
    char wanted[sizeof answers->item->id];
    va_list values;
    va_start(values, id);
    vsnprintf(wanted, sizeof wanted, id, values);
    va_end(values);
    for (int i = 0; i < answers->count; i++)
        if (!strcmp(answers->item[i].id, wanted))
            return &answers->item[i];
    return NULL;
}

void answers_free(Answers *answers)
{
    if (!answers)
        return;
    free(answers->item);
    odp_free(answers->odp);
    *answers = (Answers){0};
}

void answers_unit_word(char *word, size_t size, const char *before, const char *unit)
{
    int pure = !strcmp(unit, "1") || !unit[0];
    snprintf(word, size, "%s%s", pure ? "" : before, pure ? "" : !strcmp(unit, "1e-12") ? "ppt" : unit);
}

const char *answers_ending(int smoothed)
{
    return smoothed ? "_smoothed" : "";
}

Series answers_series(const Answers *answers, const FileSeries *file, int kind, int smoothed, double *store)
{
    Series series = series_view(file, kind);
    return smoothed ? series_smooth(&series, answers->smooth_years, store) : series;
}

/* ---- one series ---- */

/* What one series is asked, and with which errors. */
typedef struct {
    Answers *answers;
    const FileSeries *file;
    Series series; /* smoothed or not */
    int kind, smoothed;
    double level, change; /* numerical errors */
    SeriesReturn back;
    char of[160]; /* words for the method: of which means */
    Fault *fault;
} Ask;

static const char *extreme_word(int kind)
{
    return series_facts(kind)->sign > 0 ? "lowest" : "highest";
}

/* An entry with its label; note says why there is no value, when there is none. */
static FileAnswer *entry(const Ask *ask, const char *unit, const char *what, const char *label)
{
    const SeriesFacts *facts = series_facts(ask->kind);
    FileAnswer *answer = answers_add(ask->answers, unit, ask->fault, "%s_%s%s", facts->id, what,
                                     answers_ending(ask->smoothed));
    if (!answer)
        return NULL;
    if (ask->smoothed)
        snprintf(answer->label, sizeof answer->label, "%s: %s, running mean", facts->label, label);
    else
        snprintf(answer->label, sizeof answer->label, "%s: %s", facts->label, label);
    if (ask->series.count == 0)
        snprintf(answer->note, sizeof answer->note, "no window of %g years fits into the file",
                 ask->answers->smooth_years);
    return answer;
}

static void no_benchmark(const Ask *ask, FileAnswer *answer)
{
    if (!answer->note[0])
        snprintf(answer->note, sizeof answer->note, "the %s not cover the whole of %d",
                 ask->smoothed ? "running means do" : "file does", ask->answers->benchmark_year);
}

static int add_benchmark(const Ask *ask)
{
    char label[80];
    snprintf(label, sizeof label, "mean of %d", ask->answers->benchmark_year);
    FileAnswer *answer = entry(ask, ask->file->unit[ask->kind], "benchmark", label);
    if (!answer)
        return ask->fault->code;
    answer->value = ask->back.value;
    answer->error = isfinite(answer->value) ? ask->level : NAN;
    if (isnan(answer->value))
        no_benchmark(ask, answer);
    snprintf(answer->method, sizeof answer->method, "mean over calendar year %d of the %s",
             ask->answers->benchmark_year, ask->of);
    return 0;
}

static int add_extreme(const Ask *ask, int at)
{
    const char *word = extreme_word(ask->kind);
    int sign = series_facts(ask->kind)->sign;
    char year[20];
    FileAnswer *answer = entry(ask, ask->file->unit[ask->kind], word, word);
    if (!answer)
        return ask->fault->code;
    snprintf(answer->method, sizeof answer->method, "%s of the %s", word, ask->of);
    if (at >= 0) {
        answer->value = ask->series.value[at];
        answer->error = ask->level;
    }
    snprintf(year, sizeof year, "%s_year", word);
    answer = entry(ask, "year", year, "its year");
    if (!answer)
        return ask->fault->code;
    snprintf(
        answer->method, sizeof answer->method,
        "middle, in decimal years, of the %s of the %s; error: how far off the intervals lie that twice the "
        "error of a change could make the %s",
        word, ask->of, word);
    if (at >= 0) {
        answer->value = ask->series.middle[at];
        answer->error =
            isfinite(ask->change) ? series_extreme_spread(&ask->series, sign, at, 2.0 * ask->change) : NAN;
    }
    return 0;
}

/* value less benchmark, absolute and in per cent. */
static int add_change(const Ask *ask, const char *what, const char *label, const char *of, double value,
                      const char *none)
{
    char percent[40];
    double benchmark = ask->back.value, change = value - benchmark;
    snprintf(percent, sizeof percent, "%s_percent", what);
    for (int relative = 0; relative < 2; relative++) {
        FileAnswer *answer =
            entry(ask, relative ? "percent" : ask->file->unit[ask->kind], relative ? percent : what, label);
        if (!answer)
            return ask->fault->code;
        snprintf(answer->method, sizeof answer->method, "%s less the mean of %d%s", of,
                 ask->answers->benchmark_year, relative ? ", in per cent of that" : "");
        if (isnan(benchmark)) {
            no_benchmark(ask, answer);
            continue;
        }
        if (isnan(value)) {
            snprintf(answer->note, sizeof answer->note, "%s", none);
            continue;
        }
        if (relative && benchmark == 0.0) {
            snprintf(answer->note, sizeof answer->note, "the benchmark is 0");
            continue;
        }
        answer->value = relative ? 100.0 * change / benchmark : change;
        answer->error = relative ? 100.0 * (ask->change / fabs(benchmark) +
                                            fabs(change) * ask->level / (benchmark * benchmark))
                                 : ask->change;
    }
    return 0;
}

static int add_changes(const Ask *ask, int at)
{
    char of[240], label[80], none[120];
    double last = NAN;
    int year = 0;
    snprintf(of, sizeof of, "the %s of the %s", extreme_word(ask->kind), ask->of);
    snprintf(label, sizeof label, "%s less %d", extreme_word(ask->kind), ask->answers->benchmark_year);
    if (add_change(ask, "change", label, of, at >= 0 ? ask->series.value[at] : NAN, "no value"))
        return ask->fault->code;
    /* the last calendar year that is covered: that of the last interval, or the one before */
    if (ask->series.count > 0) {
        year = (int)floor(ask->series.middle[ask->series.count - 1]);
        last = series_year_mean(&ask->series, year);
        if (isnan(last))
            last = series_year_mean(&ask->series, --year);
    }
    snprintf(of, sizeof of, "the mean of %d, the last calendar year covered, of the %s", year, ask->of);
    snprintf(none, sizeof none, "no calendar year is covered");
    snprintf(label, sizeof label, "last year (%d) less %d", year, ask->answers->benchmark_year);
    return add_change(ask, "last_change", label, of, last, none);
}

static void remark_return(const Ask *ask, FileAnswer *answer)
{
    const Series *series = &ask->series;
    int benchmark = ask->answers->benchmark_year, sign = series_facts(ask->kind)->sign;
    char unit[32]; /* with the blank before it */
    double gap;
    answers_unit_word(unit, sizeof unit, " ", ask->file->unit[ask->kind]);
    switch (ask->back.state) {
    case RETURN_UNKNOWN: no_benchmark(ask, answer); break;
    case RETURN_NEVER_AWAY:
        snprintf(answer->note, sizeof answer->note, "no return to speak of: never %s %.5g%s after %d",
                 sign > 0 ? "below" : "above", ask->back.value, unit, benchmark);
        break;
    case RETURN_LATER:
        gap = fabs(ask->back.value - series->value[series->count - 1]);
        snprintf(answer->note, sizeof answer->note, "not by the end of the %s (%.1f): still %.*f%s %s",
                 ask->smoothed ? "running means" : "file", series->end[series->count - 1], gap < 0.1 ? 4 : 2,
                 gap, unit, sign > 0 ? "below" : "above");
        break;
    case RETURN_FOUND:
        if (ask->back.again >= 0)
            snprintf(answer->note, sizeof answer->note, "but %s it again in %.2f (by %.4g%s)",
                     sign > 0 ? "below" : "above", series->middle[ask->back.again],
                     fabs(series->value[ask->back.again] - ask->back.value), unit);
        break;
    }
}

static int add_return(const Ask *ask)
{
    char label[80];
    snprintf(label, sizeof label, "return to %d", ask->answers->benchmark_year);
    FileAnswer *answer = entry(ask, "year", "return_year", label);
    if (!answer)
        return ask->fault->code;
    snprintf(answer->method, sizeof answer->method,
             "%s, in decimal years linear between interval middles, at which the %s are back at their mean "
             "over %d, "
             "after their %s later than %d; error: that of a change over the slope there",
             "first time", ask->of, ask->answers->benchmark_year, extreme_word(ask->kind),
             ask->answers->benchmark_year);
    answer->value = ask->back.year;
    if (ask->back.state == RETURN_FOUND)
        answer->error = ask->change / fabs(ask->back.slope);
    remark_return(ask, answer);
    return 0;
}

static int add_series(Answers *answers, const FileSeries *file, int kind, int smoothed,
                      const NumericalErrors *errors, Fault *fault)
{
    double *store = malloc(4 * (size_t)file->count * sizeof *store);
    if (!store)
        return fault_memory(fault, "running means");
    Ask ask = {.answers = answers,
               .file = file,
               .kind = kind,
               .smoothed = smoothed,
               .level = errors->level[kind],
               .change = errors->change[kind],
               .fault = fault};
    int sign = series_facts(kind)->sign;
    ask.series = answers_series(answers, file, kind, smoothed, store);
    ask.back = series_return(&ask.series, sign, answers->benchmark_year);
    if (smoothed)
        snprintf(ask.of, sizeof ask.of,
                 "running means over %g years, centred, where the file covers the whole window",
                 answers->smooth_years);
    else
        snprintf(ask.of, sizeof ask.of, "interval means of the file, unsmoothed");
    int at = series_extreme(&ask.series, sign, -INFINITY);
    if (!add_benchmark(&ask) && !add_extreme(&ask, at) && !add_changes(&ask, at))
        add_return(&ask);
    free(store);
    return fault->code;
}

/* ---- the share above the tropopause ---- */

static int add_share(Answers *answers, const FileSeries *file, const NumericalErrors *errors, Fault *fault)
{
    Series column = series_view(file, SERIES_COLUMN), below = series_view(file, SERIES_TROPOSPHERE);
    FileAnswer *answer = answers_add(answers, "percent", fault, "ozone_column_share_above_tropopause");
    if (!answer)
        return fault->code;
    /* of the benchmark year, or of the whole file where that year is not in it */
    double total = series_year_mean(&column, answers->benchmark_year);
    double part = series_year_mean(&below, answers->benchmark_year);
    if (isnan(total) || isnan(part)) {
        double length = 0.0;
        total = part = 0.0;
        for (int i = 0; i < file->count; i++) {
            double weight = file->count == 1 ? 1.0 : file->end[i] - file->start[i];
            total += weight * column.value[i];
            part += weight * below.value[i];
            length += weight;
        }
        total /= length;
        part /= length;
        snprintf(answer->note, sizeof answer->note, "mean of the whole file");
    } else {
        snprintf(answer->note, sizeof answer->note, "mean of %d", answers->benchmark_year);
    }
    snprintf(answer->label, sizeof answer->label, "share of the ozone column above the tropopause");
    snprintf(answer->method, sizeof answer->method,
             "1 less the partial column up to %g km over the ozone column, unsmoothed; error: those of both, "
             "added",
             file->limit_km[0]);
    answer->value = 100.0 * (1.0 - part / total);
    answer->error = 100.0 * (errors->level[SERIES_TROPOSPHERE] / total +
                             part * errors->level[SERIES_COLUMN] / (total * total));
    return 0;
}

int answers_compute(Answers *answers, const FileSeries *file, const AnswerWish *wish,
                    const NumericalErrors *errors, Fault *fault)
{
    *answers = (Answers){.benchmark_year = wish->benchmark_year, .smooth_years = wish->smooth_years};
    for (int kind = 0; kind < SERIES_KINDS && !fault->code; kind++)
        for (int smoothed = 0; smoothed < 2 && !fault->code && file->value[kind]; smoothed++)
            add_series(answers, file, kind, smoothed, errors, fault);
    if (!fault->code && file->value[SERIES_TROPOSPHERE])
        add_share(answers, file, errors, fault);
    if (fault->code)
        answers_free(answers);
    return fault->code;
}
