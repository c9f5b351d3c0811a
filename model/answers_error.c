/* answers_error: how far the numerics may be off; contract in answers.h. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "answers.h"

/* ---- the table ---- */

enum Place { PLACE_SERIES, PLACE_OF, PLACE_ERROR, PLACES };
static const char *const columns[PLACES] = {"series", "of", "error"};
static const char *const figures[] = {"level", "change", "difference", "mean_difference"};
enum { FIGURES = sizeof figures / sizeof figures[0] };

void errors_unknown(NumericalErrors *errors)
{
    for (int kind = 0; kind < SERIES_KINDS; kind++)
        errors->level[kind] = errors->change[kind] = errors->difference[kind] =
            errors->mean_difference[kind] = NAN;
}

static int read_row(NumericalErrors *errors, const Csv *csv, size_t row, const size_t *place,
                    const char *path, Fault *fault)
{
    double *const of[FIGURES] = {errors->level, errors->change, errors->difference, errors->mean_difference};
    char *const *cell = csv->cell + csv->first[row];
    int kind = 0, figure = 0;
    double error;
    while (kind < SERIES_KINDS && strcmp(series_facts(kind)->id, cell[place[PLACE_SERIES]]))
        kind++;
    if (kind == SERIES_KINDS)
        return fault_at(fault, path, csv->line[row], "unknown series \"%.60s\"; ozone_column is one",
                        cell[place[PLACE_SERIES]]);
    while (figure < FIGURES && strcmp(figures[figure], cell[place[PLACE_OF]]))
        figure++;
    if (figure == FIGURES)
        return fault_at(
            fault, path, csv->line[row],
            "\"%.60s\" is no word for column of; write level, change, difference or mean_difference",
            cell[place[PLACE_OF]]);
    if (csv_number(path, csv->line[row], "error", cell[place[PLACE_ERROR]], &error, fault))
        return fault->code;
    if (error < 0.0)
        return fault_at(fault, path, csv->line[row], "error is %g; it cannot be negative", error);
    of[figure][kind] = error + (isnan(of[figure][kind]) ? 0.0 : of[figure][kind]);
    return 0;
}

int errors_read(NumericalErrors *errors, const char *path, Fault *fault)
{
    Csv csv;
    size_t place[PLACES];
    errors_unknown(errors);
    if (csv_read(&csv, path, fault))
        return fault->code;
    for (int p = 0; p < PLACES && !fault->code; p++) {
        for (place[p] = 0; place[p] < csv.first[1]; place[p]++)
            if (!strcmp(csv.cell[place[p]], columns[p]))
                break;
        if (place[p] == csv.first[1])
            fault_at(fault, path, csv.line[0], "no column %s; series, of and error are needed", columns[p]);
    }
    for (size_t row = 1; row < csv.rows && !fault->code; row++)
        read_row(errors, &csv, row, place, path, fault);
    csv_free(&csv);
    return fault->code;
}

/* ---- finer runs ---- */

void answers_compare(Answers *answers, const Answers *finer)
{
    for (int i = 0; i < answers->count; i++) {
        FileAnswer *answer = &answers->item[i];
        const FileAnswer *other = answers_find(finer, "%s", answer->id);
        double value = other ? other->value : NAN;
        answer->error = fabs(answer->value - value);
        if (isfinite(answer->value) && isnan(value))
            snprintf(answer->note, sizeof answer->note, "the finer run has no such answer");
        else if (isnan(answer->value) && isfinite(value))
            snprintf(answer->note, sizeof answer->note, "none here, but %.6g in the finer run", value);
    }
}

static void append(char **end, const char *text, size_t length)
{
    memcpy(*end, text, length);
    *end += length;
    **end = '\0';
}

/* A resolved case taken apart: the lines of the groups that may differ, and the rest without its title. Each
 * buffer as large as the text. */
static void take_apart(const char *text, char *numerics, char *rest)
{
    static const char *const free_groups[] = {"numerics = {", "day = {", "grid = {"};
    int inside = 0;
    *numerics = *rest = '\0';
    while (*text) {
        size_t length = strcspn(text, "\n");
        length += text[length] == '\n';
        for (size_t g = 0; g < sizeof free_groups / sizeof *free_groups; g++)
            inside |= !strncmp(text, free_groups[g], strlen(free_groups[g]));
        if (inside)
            append(&numerics, text, length);
        else if (strncmp(text, "title =", 7))
            append(&rest, text, length);
        if (!strncmp(text, "};", 2))
            inside = 0;
        text += length;
    }
}

/* First line in which two texts differ, without the blanks before it; "nothing" at an end. */
static void first_difference(const char *a, const char *b, char *line_a, char *line_b, size_t size)
{
    size_t same = 0;
    while (a[same] && a[same] == b[same])
        same++;
    while (same > 0 && a[same - 1] != '\n')
        same--;
    a += same + strspn(a + same, " ");
    b += same + strspn(b + same, " ");
    snprintf(line_a, size, "%.*s", *a ? (int)strcspn(a, ";\n") : 7, *a ? a : "nothing");
    snprintf(line_b, size, "%.*s", *b ? (int)strcspn(b, ";\n") : 7, *b ? b : "nothing");
}

int answers_check_finer(const FileSeries *file, const FileSeries *finer, Fault *fault)
{
    const FileSeries *const both[2] = {file, finer};
    char *numerics[2] = {NULL, NULL}, *rest[2] = {NULL, NULL}, line[2][120];
    for (int f = 0; f < 2 && !fault->code; f++) {
        size_t size = strlen(both[f]->resolved_case) + 1;
        numerics[f] = malloc(size);
        rest[f] = malloc(size);
        if (!numerics[f] || !rest[f])
            fault_memory(fault, "a resolved case");
        else if (size == 1)
            fault_set(fault, FAULT_INPUT,
                      "%s does not say of what case it is (attribute resolved_case); give a file as skymend "
                      "project wrote it",
                      both[f]->path);
        else
            take_apart(both[f]->resolved_case, numerics[f], rest[f]);
    }
    if (!fault->code && strcmp(rest[0], rest[1])) {
        first_difference(rest[0], rest[1], line[0], line[1], sizeof line[0]);
        fault_set(
            fault, FAULT_INPUT,
            "%s is another case than %s: it has \"%s\" where that has \"%s\"; only numerics, day and grid "
            "may differ",
            finer->path, file->path, line[1], line[0]);
    }
    if (!fault->code && !strcmp(numerics[0], numerics[1]))
        fault_set(fault, FAULT_INPUT,
                  "%s was run with the same numerics as %s, so their difference says nothing of an error; "
                  "lower numerics.outer_step_days or relative_tolerance",
                  finer->path, file->path);
    for (int f = 0; f < 2; f++) {
        free(numerics[f]);
        free(rest[f]);
    }
    return fault->code;
}
