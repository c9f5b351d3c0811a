/* settle_text: the settled column and its sensitivities told. */
#include "settle_text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "budget.h"
#include "json.h"

/* ---- the settled column ---- */

static double at_altitude(const Unsplit *unsplit, const double *x, double km)
{
    Answer answer = {.kind = ANSWER_OZONE, .altitude_km = km};
    return answer_value(unsplit, x, &answer);
}

static int shown(const Model *model, double km)
{
    return 1e-5 * model->grid.middle[0] <= km && km <= 1e-5 * model->grid.middle[model->grid.layers - 1];
}

/* Gases that the ground keeps and of which there are any. */
static int has_lifetime(const Model *model, const double *x, int s)
{
    return budget_is_source(model, s) && column_burden(model, x, s) > 0.0;
}

static const double levels[] = {20, 30, 40, 50};
enum { LEVELS = sizeof levels / sizeof levels[0] };

void settled_print(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                   int year)
{
    const Model *model = unsplit->model;
    fprintf(out, "%s\n\nsettled at the surface values of %d (its middle), %s\n", model->settings.title, year,
            unsplit->has_factors ? "with diurnal factors" : "with daily means and no diurnal factors");
    fprintf(out, "  steps %d, not taken %d, turns of the factors %d, %.1f s\n", steady->iterations,
            steady->rejected, steady->turns, steady->seconds);
    fprintf(out, "  residual %.1e of the gross rate (%s, %.1f km); last step of Newton's %.1e",
            steady->residual, mechanism_name(model->mechanism, steady->worst_species),
            1e-5 * model->grid.middle[steady->worst_layer], steady->change);
    if (unsplit->has_factors)
        fprintf(out, ";\n  ozone in the last turn of the factors %.1e", steady->ozone_change);
    fprintf(out, "\n\n  ozone column %11.3f DU\n", column_ozone_du(model, column->x));
    for (int i = 0; i < LEVELS; i++)
        if (shown(model, levels[i]))
            fprintf(out, "  O3 at %g km %12.4f ppm\n", levels[i],
                    1e6 * at_altitude(unsplit, column->x, levels[i]));
    fprintf(out, "\n  %-14s %14s %16s\n", "gas", "lifetime, years", "at the ground");
    for (int s = 0; s < unsplit->solved; s++) {
        if (!has_lifetime(model, column->x, s))
            continue;
        Answer answer = {.kind = ANSWER_LIFETIME, .species = s};
        fprintf(out, "  %-14s %14.4g %12.4g ppt\n", mechanism_name(model->mechanism, s),
                answer_value(unsplit, column->x, &answer), 1e12 * column->x[FIELD(model->grid.padded, s, 0)]);
    }
}

void settled_csv(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                 int year)
{
    const Model *model = unsplit->model;
    fprintf(out, "# quantity: settled column, surface values of the middle of %d, %s\n", year,
            unsplit->has_factors ? "diurnal factors" : "daily means");
    fprintf(out, "table,name,value,unit,uncertainty_factor_298K,effect_of_uncertainty\n");
    fprintf(out, "solution,year,%d,,,\nsolution,steps,%d,,,\nsolution,turns,%d,,,\n", year,
            steady->iterations, steady->turns);
    fprintf(out, "solution,residual,%.3e,of the gross rate,,\nsolution,last_change,%.3e,relative,,\n",
            steady->residual, steady->change);
    fprintf(out, "answer,column,%.6f,DU,,\n", column_ozone_du(model, column->x));
    for (int i = 0; i < LEVELS; i++)
        if (shown(model, levels[i]))
            fprintf(out, "answer,O3@%g,%.6e,mol mol-1,,\n", levels[i],
                    at_altitude(unsplit, column->x, levels[i]));
    for (int s = 0; s < unsplit->solved; s++) {
        Answer answer = {.kind = ANSWER_LIFETIME, .species = s};
        if (has_lifetime(model, column->x, s))
            fprintf(out, "answer,lifetime:%s,%.6g,years,,\n", mechanism_name(model->mechanism, s),
                    answer_value(unsplit, column->x, &answer));
    }
}

/* ---- sensitivities ---- */

static void add_entry(Ranking *ranking, const char *kind, const char *name, double change, double f,
                      double effect)
{
    Entry *entry = &ranking->entry[ranking->count++];
    *entry = (Entry){.kind = kind, .change = change, .f = f, .effect = effect};
    snprintf(entry->name, sizeof entry->name, "%s", name);
}

static const char *kind_of(const Reaction *reaction)
{
    static const char *const name[] = {"thermal", "photolysis", "surface", "washout"};
    return name[reaction->kind];
}

static int make_reactions(Ranking *ranking, const Sensitivity *sensitivity, const Model *model, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    ranking->entry = calloc((size_t)mechanism->reactions, sizeof(Entry));
    if (!ranking->entry)
        return fault_memory(fault, "the ranking");
    for (int r = 0; r < mechanism->reactions; r++)
        add_entry(ranking, kind_of(&mechanism->reaction[r]), mechanism->reaction[r].id,
                  sensitivity_reaction(sensitivity, model, r, 0), mechanism->reaction[r].f,
                  sensitivity_reaction(sensitivity, model, r, 1));
    return 0;
}

/* Mixing by bands of this many km. */
static const double BAND = 10.0;

static int make_borders(Ranking *ranking, const Sensitivity *sensitivity, const Unsplit *unsplit,
                        const double *x, Fault *fault)
{
    const Model *model = unsplit->model;
    double top = 1e-5 * model->grid.edge[unsplit->layers];
    ranking->entry = calloc(3 * (size_t)unsplit->solved + (size_t)ceil(top / BAND) + 1, sizeof(Entry));
    if (!ranking->entry)
        return fault_memory(fault, "the ranking");
    for (int s = 0; s < unsplit->solved; s++) {
        const char *name = mechanism_name(model->mechanism, s);
        if (sensitivity->surface[s] != 0.0)
            add_entry(ranking, "at the ground", name,
                      sensitivity->surface[s] * x[FIELD(model->grid.padded, s, 0)], 0, 0);
        if (sensitivity->deposition[s] != 0.0)
            add_entry(ranking, "deposition", name, sensitivity->deposition[s], 0, 0);
        if (sensitivity->held[s] != 0.0)
            add_entry(ranking, "below the tropopause", name, sensitivity->held[s], 0, 0);
    }
    for (double from = 0.0; from < top; from += BAND) {
        char name[40];
        double sum = 0.0;
        for (int e = 1; e < unsplit->layers; e++)
            if (1e-5 * model->grid.edge[e] >= from && 1e-5 * model->grid.edge[e] < from + BAND)
                sum += sensitivity->eddy[e];
        snprintf(name, sizeof name, "%g to %g km", from, fmin(from + BAND, top));
        add_entry(ranking, "eddy diffusion", name, sum, 0, 0);
    }
    return 0;
}

static int by_effect(const void *a, const void *b)
{
    double left = fabs(((const Entry *)a)->effect), right = fabs(((const Entry *)b)->effect);
    return (left < right) - (left > right);
}

static int by_change(const void *a, const void *b)
{
    double left = fabs(((const Entry *)a)->change), right = fabs(((const Entry *)b)->change);
    return (left < right) - (left > right);
}

int rankings_make(Rankings *rankings, const Sensitivity *sensitivity, const Unsplit *unsplit, const double *x,
                  Fault *fault)
{
    *rankings = (Rankings){0};
    if (make_reactions(&rankings->reactions, sensitivity, unsplit->model, fault) ||
        make_borders(&rankings->borders, sensitivity, unsplit, x, fault)) {
        rankings_free(rankings);
        return fault->code;
    }
    qsort(rankings->reactions.entry, (size_t)rankings->reactions.count, sizeof(Entry), by_effect);
    qsort(rankings->borders.entry, (size_t)rankings->borders.count, sizeof(Entry), by_change);
    return 0;
}

void rankings_free(Rankings *rankings)
{
    free(rankings->reactions.entry);
    free(rankings->borders.entry);
    *rankings = (Rankings){0};
}

void rankings_print(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings,
                    int rows)
{
    const char *unit = answer_unit(&sensitivity->answer);
    double squares = 0.0, whole = sensitivity->value;
    int without = 0;
    for (int i = 0; i < rankings->reactions.count; i++) {
        squares += rankings->reactions.entry[i].effect * rankings->reactions.entry[i].effect;
        without += rankings->reactions.entry[i].f == 0.0 &&
                   strcmp(rankings->reactions.entry[i].kind, "washout") != 0;
    }
    fprintf(out, "\nWhat the laboratory does not know, and what it does to the %s (%.6g %s)\n\n", name, whole,
            unit);
    fprintf(out, "  %-32s %-11s %12s %7s %12s %9s\n", "reaction", "kind", "per +1 %, %", "f(298)", "effect",
            "effect, %");
    for (int i = 0; i < rankings->reactions.count && i < rows && rankings->reactions.entry[i].effect != 0.0;
         i++) {
        const Entry *entry = &rankings->reactions.entry[i];
        fprintf(out, "  %-32s %-11s %+12.5f %7.2f %+12.4g %+9.3f\n", entry->name, entry->kind,
                entry->change / whole, entry->f, entry->effect, 100.0 * entry->effect / whole);
    }
    fprintf(out,
            "  all together, independent of each other: %.4g %s, %.2f %%; %d reactions have no published f\n",
            sqrt(squares), unit, fabs(100.0 * sqrt(squares) / whole), without);
    fprintf(out,
            "  effect: the rate coefficient times f(T) = f exp|g (1/T - 1/298)| at every altitude, to first "
            "order\n");
    fprintf(out, "\nWhat borders and mixing do to the %s\n\n  %-22s %-14s %12s\n", name, "kind", "of",
            "per +1 %, %");
    for (int i = 0; i < rankings->borders.count && i < rows; i++)
        fprintf(out, "  %-22s %-14s %+12.5f\n", rankings->borders.entry[i].kind,
                rankings->borders.entry[i].name, rankings->borders.entry[i].change / whole);
}

void rankings_csv(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings)
{
    const char *unit = answer_unit(&sensitivity->answer);
    const Ranking *all[] = {&rankings->reactions, &rankings->borders};
    for (int i = 0; i < 2; i++)
        for (int j = 0; j < all[i]->count; j++) {
            const Entry *entry = &all[i]->entry[j];
            fprintf(out, "d %s / d ln %s,%s,%.6e,%s,", name, entry->kind, entry->name, entry->change, unit);
            if (entry->f > 0.0)
                fprintf(out, "%g,%.6e\n", entry->f, entry->effect);
            else
                fprintf(out, ",\n");
        }
}

/* ---- JSON ---- */

void settled_json(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                  int year)
{
    const Model *model = unsplit->model;
    int first = 1;
    fputc('{', out);
    json_key(out, 1, 1, "title");
    json_text(out, model->settings.title);
    json_key(out, 1, 0, "year");
    fprintf(out, "%d", year);
    json_key(out, 1, 0, "factors");
    fprintf(out, unsplit->has_factors ? "true" : "false");
    json_key(out, 1, 0, "solution");
    fprintf(out, "{\"steps\": %d, \"turns\": %d, \"residual\": ", steady->iterations, steady->turns);
    json_number(out, steady->residual);
    fprintf(out, ", \"last_change\": ");
    json_number(out, steady->change);
    fprintf(out, ", \"ozone_change\": ");
    json_number(out, steady->ozone_change);
    fputc('}', out);
    json_key(out, 1, 0, "ozone_column_DU");
    json_number(out, column_ozone_du(model, column->x));
    json_key(out, 1, 0, "ozone_mol_mol-1");
    fputc('{', out);
    for (int i = 0; i < LEVELS; i++)
        if (shown(model, levels[i])) {
            fprintf(out, "%s\"%g km\": ", first ? "" : ", ", levels[i]);
            json_number(out, at_altitude(unsplit, column->x, levels[i]));
            first = 0;
        }
    fputc('}', out);
    json_key(out, 1, 0, "gases");
    fputc('{', out);
    first = 1;
    for (int s = 0; s < unsplit->solved; s++) {
        Answer answer = {.kind = ANSWER_LIFETIME, .species = s};
        if (!has_lifetime(model, column->x, s))
            continue;
        json_key(out, 2, first, mechanism_name(model->mechanism, s));
        fprintf(out, "{\"lifetime_years\": ");
        json_number(out, answer_value(unsplit, column->x, &answer));
        fprintf(out, ", \"ground_mol_mol-1\": ");
        json_number(out, column->x[FIELD(model->grid.padded, s, 0)]);
        fputc('}', out);
        first = 0;
    }
    fputc('}', out);
}

static void json_ranking(FILE *out, const char *key, const Ranking *ranking)
{
    json_key(out, 2, 0, key);
    fputc('[', out);
    for (int i = 0; i < ranking->count; i++) {
        const Entry *entry = &ranking->entry[i];
        fprintf(out, "%s\n      {\"kind\": ", i ? "," : "");
        json_text(out, entry->kind);
        fprintf(out, ", \"name\": ");
        json_text(out, entry->name);
        fprintf(out, ", \"per_ln\": ");
        json_number(out, entry->change);
        if (entry->f > 0.0) {
            fprintf(out, ", \"f_298K\": ");
            json_number(out, entry->f);
            fprintf(out, ", \"effect\": ");
            json_number(out, entry->effect);
        }
        fputc('}', out);
    }
    fputc(']', out);
}

void rankings_json(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings)
{
    json_key(out, 1, 0, "sensitivity");
    fputc('{', out);
    json_key(out, 2, 1, "of");
    json_text(out, name);
    json_key(out, 2, 0, "unit");
    json_text(out, answer_unit(&sensitivity->answer));
    json_key(out, 2, 0, "value");
    json_number(out, sensitivity->value);
    json_ranking(out, "reactions", &rankings->reactions);
    json_ranking(out, "borders_and_mixing", &rankings->borders);
    fputc('}', out);
}
