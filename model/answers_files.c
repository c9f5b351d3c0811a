/* answers_files: the answers as CSV and JSON. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "../input/table.h"
#include "answers_emission.h"
#include "json.h"

static const char caution[] = "one near-global column without polar winter, ozone hole, change of "
                              "circulation or temperature that answers to "
                              "ozone; clear-sky ultraviolet; planning figures, no guide to personal "
                              "exposure; health and regulatory decisions "
                              "defer to the competent authority and its methods";

/* ---- CSV ---- */

/* Empty for what is not there. */
static void number(FILE *out, double value)
{
    fputc(',', out);
    if (isfinite(value))
        fprintf(out, "%.9g", value);
}

void answers_csv(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out)
{
    csv_put_header(out, "quantity", "answers of a projection of the ozone layer");
    csv_put_header(out, "file", file->path);
    csv_put_header(out, "title", file->title);
    if (reference)
        csv_put_header(out, "against", reference->path);
    csv_put_header(out, "errors", answers->error_source);
    csv_put_header(out, "caution", caution);
    fputs("id,label,value,unit,numerical_error,note,method\n", out);
    for (int i = 0; i < answers->count; i++) {
        const FileAnswer *answer = &answers->item[i];
        fprintf(out, "%s,", answer->id);
        csv_put_text(out, answer->label);
        number(out, answer->value);
        fputc(',', out);
        csv_put_text(out, answer->unit);
        number(out, answer->error);
        fputc(',', out);
        csv_put_text(out, answer->note);
        fputc(',', out);
        csv_put_text(out, answer->method);
        fputc('\n', out);
    }
}

/* ---- JSON ---- */

static void text_of(FILE *out, const char *key, const char *text)
{
    json_key(out, 1, 0, key);
    json_text(out, text);
}

static void json_answer(FILE *out, const FileAnswer *answer, int first)
{
    json_key(out, 2, first, answer->id);
    fputs("{\"label\": ", out);
    json_text(out, answer->label);
    fputs(", \"value\": ", out);
    json_number(out, answer->value);
    fputs(", \"unit\": ", out);
    json_text(out, answer->unit);
    fputs(", \"numerical_error\": ", out);
    json_number(out, answer->error);
    fputs(", \"note\": ", out);
    json_text(out, answer->note);
    fputs(", \"method\": ", out);
    json_text(out, answer->method);
    fputc('}', out);
}

/* Calendar years that the column covers, and every series in them. */
static void json_years(FILE *out, const FileSeries *file)
{
    int first = (int)floor(file->middle[0]), last = (int)floor(file->middle[file->count - 1]);
    Series column = series_view(file, SERIES_COLUMN);
    for (int kind = -1; kind < SERIES_KINDS; kind++) {
        if (kind >= 0 && !file->value[kind])
            continue;
        Series series = series_view(file, kind < 0 ? SERIES_COLUMN : kind);
        int begun = 0;
        json_key(out, 2, kind < 0, kind < 0 ? "year" : series_facts(kind)->id);
        fputc('[', out);
        for (int year = first; year <= last; year++) {
            if (isnan(series_year_mean(&column, year)))
                continue;
            fputs(begun++ ? ", " : "", out);
            json_number(out, kind < 0 ? year : series_year_mean(&series, year));
        }
        fputc(']', out);
    }
}

void answers_json(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out)
{
    fputc('{', out);
    json_key(out, 1, 1, "file");
    json_text(out, file->path);
    text_of(out, "title", file->title);
    if (reference) {
        text_of(out, "against", reference->path);
        text_of(out, "against_title", reference->title);
    }
    text_of(out, "errors", answers->error_source);
    text_of(out, "caution", caution);
    json_key(out, 1, 0, "benchmark_year");
    json_number(out, answers->benchmark_year);
    json_key(out, 1, 0, "smooth_years");
    json_number(out, answers->smooth_years);
    if (file->value[SERIES_TROPOSPHERE]) {
        json_key(out, 1, 0, "limits_km");
        for (int l = 0; l < SERIES_LIMITS; l++) {
            fputs(l ? ", " : "[", out);
            json_number(out, file->limit_km[l]);
        }
        fputc(']', out);
    }
    json_key(out, 1, 0, "answers");
    fputc('{', out);
    for (int i = 0; i < answers->count; i++)
        json_answer(out, &answers->item[i], i == 0);
    fputs("\n  }", out);
    json_key(out, 1, 0, "calendar_year_means");
    fputc('{', out);
    json_years(out, file);
    fputs("\n  }", out);
    odp_json(answers, file, out);
    fputs("\n}\n", out);
}
