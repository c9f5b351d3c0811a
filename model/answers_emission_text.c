/* answers_emission_text: emissions in ODP-tonnes for people, and as JSON. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "answers_emission.h"
#include "json.h"

/* ---- the table ---- */

/* Thousands, with as many decimals as make sense for emissions: 0.1 t is the least shown. */
static void kilo(FILE *out, int width, int sign, double value)
{
    double size = fabs(value) * 1e-3;
    int decimals = size >= 1000.0 ? 0 : size >= 100.0 ? 1 : size >= 1.0 ? 2 : 4;
    if (isnan(value))
        fprintf(out, " %*s", width, "-");
    else
        fprintf(out, sign ? " %+*.*f" : " %*.*f", width, decimals, 1e-3 * value);
}

/* Words in lines of at most 105 characters, those after the first indented. */
static void wrapped(FILE *out, const char *text)
{
    int used = 0;
    while (*text) {
        int length = (int)strcspn(text, " ");
        if (used > 0 && used + 1 + length > 105) {
            fputs("\n     ", out);
            used = 5;
        }
        used += fprintf(out, "%s%.*s", used ? " " : "  ", length, text);
        text += length;
        text += strspn(text, " ");
    }
    fputc('\n', out);
}

/* "label   treaty   own +-error"; scale: what one of the answer's unit is in those of the table. */
static void print_row(const Answers *answers, const char *label, const char *what, double scale, int sign,
                      FILE *out)
{
    const FileAnswer *answer[WEIGHTS];
    for (int w = 0; w < WEIGHTS; w++)
        answer[w] = answers_find(answers, "odp_emission_%s%s", odp_word(w), what);
    if (!answer[WEIGHT_OWN])
        return;
    fprintf(out, "  %-47s", label);
    for (int w = 0; w < WEIGHTS; w++) {
        kilo(out, 12, sign, answer[w] ? scale * answer[w]->value : NAN);
        if (answer[w] && isfinite(answer[w]->error) && answer[w]->error > 0.0)
            fprintf(out, " +-%.2g", 1e-3 * scale * answer[w]->error);
    }
    fputc('\n', out);
}

static void print_largest(const Answers *answers, const char *of, int sign, FILE *out)
{
    char label[60], what[60];
    const FileAnswer *year[WEIGHTS];
    for (int w = 0; w < WEIGHTS; w++)
        year[w] = answers_find(answers, "odp_emission_%s%s_largest_year", odp_word(w), of);
    const char *word = of[0] ? "  largest calendar year" : "largest calendar year";
    snprintf(label, sizeof label, "%s", word);
    if (year[0] && year[1] && !isnan(year[0]->value) && !isnan(year[1]->value)) {
        if (floor(year[0]->value) == floor(year[1]->value))
            snprintf(label, sizeof label, "%s, %.0f", word, floor(year[0]->value));
        else
            snprintf(label, sizeof label, "%s, %.0f and %.0f", word, floor(year[0]->value),
                     floor(year[1]->value));
    }
    snprintf(what, sizeof what, "%s_largest", of);
    print_row(answers, label, what, 1.0, sign, out);
}

static void print_totals(const Answers *answers, const FileSeries *file, const FileSeries *reference,
                         FILE *out)
{
    const FileAnswer *natural = answers_find(answers, "odp_emission_own_natural_total");
    const FileAnswer *last = answers_find(answers, "odp_emission_treaty_last");
    char label[60], text[1000];
    fprintf(out, "\nemissions, %.0f to %.0f, in thousand ODP-tonnes (CFC-11 = 1)\n", floor(file->middle[0]),
            floor(file->middle[file->count - 1]));
    fprintf(out, "  %-47s %12s %12s +-error\n", "weighed by the potentials of", "the treaty", "Skymend");
    print_row(answers, "total", "_total", 1.0, 0, out);
    print_row(answers, "  of it gases that the treaty controls", "_controlled_total", 1.0, 0, out);
    print_row(answers, "  its mass, thousand tonnes", "_mass_total", 1e3, 0, out);
    print_largest(answers, "", 0, out);
    snprintf(label, sizeof label, "last calendar year, %.4s", last ? last->note : "");
    print_row(answers, label, "_last", 1.0, 0, out);
    print_row(answers, "apart: implied, natural sources in it (1)", "_natural_total", 1.0, 0, out);
    print_row(answers, "apart: N2O", "_nitrogen_total", 1.0, 0, out);
    if (reference && reference->emissions.gases) {
        print_row(answers, "this file less the reference: total", "_difference_total", 1.0, 1, out);
        print_largest(answers, "_difference", 1, out);
        print_row(answers, "  N2O", "_difference_nitrogen_total", 1.0, 1, out);
    } else if (reference) {
        fprintf(out, "  less the reference: left out (emissions: %s)\n", reference->emissions.missing);
    }
    if (natural && natural->note[0]) {
        snprintf(text, sizeof text,
                 "(1) of %s: their abundance is prescribed, and the emission that keeps it there holds what "
                 "nature gives off",
                 natural->note);
        wrapped(out, text);
    }
    for (int w = 0; w < WEIGHTS; w++) {
        const FileAnswer *all = answers_find(answers, "odp_emission_%s_total", odp_word(w));
        if (all && all->note[0]) {
            snprintf(text, sizeof text, "%s: %s", w == WEIGHT_TREATY ? "the treaty" : "Skymend", all->note);
            wrapped(out, text);
        }
    }
    if (last && strchr(last->note, ';'))
        wrapped(out,
                "emissions are those that keep prescribed abundances, unless lines of the schedule give "
                "them: the first year of a file still feels its settled start, and where a schedule of "
                "abundances ends they stand still from the middle of its last year on, which is no plan");
    snprintf(text, sizeof text, "Skymend's own potentials: %s", answers->odp->weights->own_source);
    wrapped(out, text);
    wrapped(out, "those of the halons and of CH3Br are above the ranges published for them, by up to twice, "
                 "and so are the "
                 "tonnes they weigh (README, Validation, says why)");
    wrapped(out, "+-: noise of the potentials; the numerical error of the emissions is not known");
}

static void print_lines(const Answers *answers, const FileSeries *file, FILE *out)
{
    const FileEmissions *emissions = &file->emissions;
    if (!emissions->lines)
        return;
    fprintf(out, "\nlines of the schedule: total emission\n  %-42s %-12s %12s %12s %12s\n", "line", "gas",
            "thousand t", "ODP treaty", "ODP Skymend");
    for (int l = 0; l < emissions->lines; l++) {
        const LineEmission *line = &emissions->line[l];
        double sum = 0.0;
        for (int i = 0; i < file->count; i++)
            sum += line->given[i] * (file->end[i] - file->start[i]);
        fprintf(out, "  %-42.42s %-12.12s", line->label, emissions->gas[line->gas].gas);
        kilo(out, 12, 0, 1e3 * sum);
        for (int w = 0; w < WEIGHTS; w++) {
            const FileAnswer *answer =
                answers_find(answers, "odp_emission_%s_line_%d_total", odp_word(w), l + 1);
            kilo(out, 12, 0, answer ? answer->value : NAN);
        }
        fputc('\n', out);
    }
}

static void print_year(const OdpTable *odp, int y, FILE *out)
{
    fprintf(out, "  %4d", odp->first_year + y);
    for (int w = 0; w < WEIGHTS; w++)
        kilo(out, 11, 0, odp->by_year[w][ODP_COUNTED][y]);
    kilo(out, 11, 0, odp->by_year[WEIGHT_OWN][ODP_NITROGEN][y]);
    for (int w = 0; w < WEIGHTS; w++)
        kilo(out, 11, 0, odp->by_year[w][ODP_NATURAL][y]);
    for (int w = 0; w < WEIGHTS && odp->difference[w][ODP_COUNTED]; w++)
        kilo(out, 11, 1, odp->difference[w][ODP_COUNTED][y]);
    fputc('\n', out);
}

void odp_print(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out)
{
    const OdpTable *odp = answers->odp;
    if (!odp)
        return;
    const int both = odp->difference[WEIGHT_OWN][ODP_COUNTED] != NULL;
    print_totals(answers, file, reference, out);
    print_lines(answers, file, out);
    fprintf(out, "\nthousand ODP-tonnes in calendar years\n        %23s %11s %23s%s\n", "counted, weighed by",
            "apart:", "apart: natural (1) by", both ? "      less the reference" : "");
    fprintf(out, "  %4s", "year");
    for (int c = 0; c < 5 + 2 * both; c++)
        fprintf(out, " %11s", c == 2 ? "N2O" : (c < 2 ? c : c + 1) % 2 ? "Skymend" : "treaty");
    fputc('\n', out);
    for (int y = 0; y < odp->years; y++)
        if (answers_year_shown(answers, file, odp->first_year + y))
            print_year(odp, y, out);
}

/* ---- JSON ---- */

/* "key": [one a year], on a line of its own; by calendar year of an interval series of the file. */
static void json_array(FILE *out, int depth, int first, const char *key, const double *year, int years)
{
    json_key(out, depth, first, key);
    for (int y = 0; y < years; y++) {
        fputs(y ? ", " : "[", out);
        json_number(out, year[y]);
    }
    fputc(']', out);
}

static void json_series(FILE *out, int depth, int first, const char *key, const OdpTable *odp,
                        const FileSeries *file, const double *value)
{
    const Series series = {file->count, file->start, file->middle, file->end, value};
    json_key(out, depth, first, key);
    for (int y = 0; y < odp->years; y++) {
        fputs(y ? ", " : "[", out);
        json_number(out, series_year_mean(&series, odp->first_year + y));
    }
    fputc(']', out);
}

/* Potentials, or their noise, of the gases that have one. */
static void json_potentials(FILE *out, const char *key, const FileSeries *file, const OdpWeights *weights,
                            int weight, double (*of)(const OdpWeights *, int, const char *))
{
    int first = 1;
    json_key(out, 3, 0, key);
    fputc('{', out);
    for (int g = 0; g < file->emissions.gases; g++) {
        const GasEmission *gas = &file->emissions.gas[g];
        if (isnan(weights_potential(weights, weight, gas->gas)) || !(gas->halocarbon || gas->nitrogen))
            continue;
        fputs(first ? "" : ", ", out);
        json_text(out, gas->gas);
        fputs(": ", out);
        json_number(out, of(weights, weight, gas->gas));
        first = 0;
    }
    fputc('}', out);
}

static void json_weight(FILE *out, const OdpTable *odp, const FileSeries *file, int weight)
{
    static const char *const shares[ODP_SHARES] = {"counted", "natural_implied", "nitrogen"};
    static const char *const differences[ODP_SHARES] = {"difference", NULL, "difference_nitrogen"};
    json_key(out, 2, 0, odp_word(weight));
    fputc('{', out);
    json_key(out, 3, 1, "source");
    json_text(out, weight == WEIGHT_TREATY ? odp->weights->treaty.source : odp->weights->own_source);
    json_potentials(out, "potentials", file, odp->weights, weight, weights_potential);
    if (weight == WEIGHT_OWN)
        json_potentials(out, "noise", file, odp->weights, weight, weights_noise);
    for (int s = 0; s < ODP_SHARES; s++) {
        if (s == ODP_NITROGEN && weight == WEIGHT_TREATY)
            continue;
        json_array(out, 3, 0, shares[s], odp->by_year[weight][s], odp->years);
        if (odp->difference[weight][s] && differences[s])
            json_array(out, 3, 0, differences[s], odp->difference[weight][s], odp->years);
    }
    fputs("\n    }", out);
}

static void json_lines(FILE *out, const OdpTable *odp, const FileSeries *file)
{
    const FileEmissions *emissions = &file->emissions;
    json_key(out, 2, 0, "line");
    fputc('[', out);
    for (int l = 0; l < emissions->lines; l++) {
        fputs(l ? ",\n      {\"label\": " : "\n      {\"label\": ", out);
        json_text(out, emissions->line[l].label);
        fputs(", \"gas\": ", out);
        json_text(out, emissions->gas[emissions->line[l].gas].gas);
        json_series(out, 4, 0, "emission_Gg_year", odp, file, emissions->line[l].given);
        fputc('}', out);
    }
    fputc(']', out);
}

void odp_json(const Answers *answers, const FileSeries *file, FILE *out)
{
    const OdpTable *odp = answers->odp;
    json_key(out, 1, 0, "odp_emission");
    fputc('{', out);
    if (!odp) {
        json_key(out, 2, 1, "left_out");
        json_text(out, file->emissions.missing);
        fputs("\n  }", out);
        return;
    }
    json_key(out, 2, 1, "unit");
    json_text(out, "ODP-tonnes (CFC-11 = 1) in a calendar year");
    json_key(out, 2, 0, "year");
    for (int y = 0; y < odp->years; y++)
        fprintf(out, "%s%d", y ? ", " : "[", odp->first_year + y);
    fputc(']', out);
    for (int w = 0; w < WEIGHTS; w++)
        json_weight(out, odp, file, w);
    json_key(out, 2, 0, "emission_Gg_year");
    fputc('{', out);
    for (int g = 0; g < file->emissions.gases; g++)
        json_series(out, 3, g == 0, file->emissions.gas[g].gas, odp, file, file->emissions.gas[g].all);
    fputs("\n    }", out);
    if (file->emissions.lines)
        json_lines(out, odp, file);
    fputs("\n  }", out);
}
