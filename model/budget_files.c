/* budget_files: a budget as CSV and as JSON, by layer. */
#include <math.h>

#include "budget_text.h"
#include "json.h"

static const double *row_of(const BudgetView *view, const double *field, int row)
{
    return field + FIELD(view->model->grid.padded, row, 0);
}

/* Share of a species in the family at a layer; sum as from budget_total. */
static double share(const BudgetView *view, int total, int species, const double *sum, int layer)
{
    return budget_member(view->model->mechanism, total, species) *
           view->x[FIELD(view->model->grid.padded, species, layer)] / sum[layer];
}

static const char *side(int term)
{
    return term < BUDGET_LOSS_FIRST ? "production" : "loss";
}

/* ---- CSV ---- */

static void quoted(FILE *out, const char *text)
{
    if (text[0] == '\0')
        return;
    fputc('"', out);
    for (; *text; text++) {
        if (*text == '"')
            fputc('"', out);
        fputc(*text, out);
    }
    fputc('"', out);
}

/* km NAN: of the whole column. */
static void line(FILE *out, const char *table, const char *name, const char *part, double km, double value,
                 const char *unit)
{
    fprintf(out, "%s,", table);
    quoted(out, name);
    fputc(',', out);
    quoted(out, part);
    fputc(',', out);
    if (isfinite(km))
        fprintf(out, "%.10g", km);
    fputc(',', out);
    if (isfinite(value))
        fprintf(out, "%.9g", value);
    fprintf(out, ",%s\n", unit);
}

static void csv_profile(const BudgetView *view, FILE *out, const char *table, const char *name,
                        const char *part, const double *profile, const char *unit)
{
    for (int l = 0; l < view->model->grid.layers; l++)
        line(out, table, name, part, 1e-5 * view->model->grid.middle[l], profile[l], unit);
}

static void csv_partition(const BudgetView *view, int total, FILE *out)
{
    double sum[SETTINGS_MAX_EDGES], part[SETTINGS_MAX_EDGES];
    const Mechanism *mechanism = view->model->mechanism;
    const char *name = budget_total_name(total);
    budget_total(view->model, view->x, total, sum);
    csv_profile(view, out, "partition", name, "total", sum, "mol mol-1");
    for (int s = 0; s < mechanism->solved; s++) {
        if (!budget_member(mechanism, total, s))
            continue;
        for (int l = 0; l < view->model->grid.layers; l++)
            part[l] = share(view, total, s, sum, l);
        csv_profile(view, out, "partition", name, mechanism_name(mechanism, s), part, "1");
    }
}

static void csv_gas(const BudgetView *view, int species, FILE *out)
{
    const GasBudget *gas = &view->gas[species];
    const char *name = mechanism_name(view->model->mechanism, species);
    line(out, "burden", name, "all", NAN, gas->burden, "cm-2");
    line(out, "lifetime", name, "all", NAN, budget_lifetime(gas, gas->loss, GAS_LOSSES), "year");
    line(out, "lifetime", name, "above tropopause", NAN, budget_lifetime(gas, gas->aloft, GAS_LOSSES),
         "year");
    for (int p = 0; p < GAS_LOSSES; p++) {
        line(out, "loss", name, budget_loss_name(p), NAN, gas->loss[p], "cm-2 s-1");
        line(out, "loss above tropopause", name, budget_loss_name(p), NAN, gas->aloft[p], "cm-2 s-1");
    }
}

void budget_csv(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    fprintf(out, "table,name,part,altitude_km,value,unit\n");
    line(out, "state", "year", "", NAN, view->year, "year");
    line(out, "state", "ozone column", "", NAN, column_ozone_du(view->model, view->x), "DU");
    for (int t = 0; t < BUDGET_TERMS; t++)
        csv_profile(view, out, "odd oxygen", side(t), budget_term_name(t), row_of(view, view->term, t),
                    "cm-3 s-1");
    csv_profile(view, out, "odd oxygen", "net", "", view->net, "cm-3 s-1");
    for (int t = BUDGET_HOX; t <= BUDGET_BROX; t++)
        csv_profile(view, out, "chain length", budget_term_name(t), "", row_of(view, view->chain, t), "1");
    for (int total = 0; total < BUDGET_TOTALS; total++)
        csv_partition(view, total, out);
    for (int s = 0; s < mechanism->solved; s++)
        if (budget_is_source(view->model, s))
            csv_gas(view, s, out);
    for (int e = 0; e < mechanism->elements; e++) {
        double all, sources;
        budget_atoms(view->model, view->x, e, &all, &sources);
        line(out, "atoms", mechanism->element[e], "all", NAN, all, "cm-2");
        line(out, "atoms", mechanism->element[e], "source gases", NAN, sources, "cm-2");
    }
}

/* ---- JSON ---- */

static void json_profile(const BudgetView *view, FILE *out, const double *profile, double scale)
{
    for (int l = 0; l < view->model->grid.layers; l++) {
        fprintf(out, l ? ", " : "[");
        json_number(out, scale * profile[l]);
    }
    fputc(']', out);
}

static void json_odd_oxygen(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    int first = 1;
    json_key(out, 2, 1, "unit");
    json_text(out, "cm-3 s-1");
    json_key(out, 2, 0, "content");
    fputc('{', out);
    for (int s = 0; s < mechanism->solved; s++)
        if (view->book->content[s] != 0.0) {
            fprintf(out, first ? "" : ", ");
            json_text(out, mechanism_name(mechanism, s));
            fprintf(out, ": %g", view->book->content[s]);
            first = 0;
        }
    fputc('}', out);
    for (int t = 0; t < BUDGET_TERMS; t++) {
        if (t == 0 || t == BUDGET_LOSS_FIRST) {
            fprintf(out, t ? "}" : "");
            json_key(out, 2, 0, side(t));
            fputc('{', out);
        }
        json_key(out, 3, t == 0 || t == BUDGET_LOSS_FIRST, budget_term_name(t));
        json_profile(view, out, row_of(view, view->term, t), 1.0);
    }
    fputc('}', out);
    json_key(out, 2, 0, "net");
    json_profile(view, out, view->net, 1.0);
    json_key(out, 2, 0, "reactions");
    first = 1;
    for (int r = 0; r < mechanism->reactions; r++) {
        if (view->book->term[r] < 0)
            continue;
        fprintf(out, "%s\n      {\"id\": ", first ? "[" : ",");
        json_text(out, mechanism->reaction[r].id);
        fprintf(out, ", \"equation\": ");
        json_text(out, mechanism->reaction[r].equation);
        fprintf(out, ", \"weight\": %g, \"side\": \"%s\", \"family\": ", view->book->weight[r],
                side(view->book->term[r]));
        json_text(out, r == view->book->shared ? "shared" : budget_term_name(view->book->term[r]));
        fputc('}', out);
        first = 0;
    }
    fprintf(out, first ? "[]" : "]");
}

static void json_partition(const BudgetView *view, int total, FILE *out)
{
    double sum[SETTINGS_MAX_EDGES], part[SETTINGS_MAX_EDGES];
    const Mechanism *mechanism = view->model->mechanism;
    int first = 1;
    budget_total(view->model, view->x, total, sum);
    json_key(out, 2, total == 0, budget_total_name(total));
    fputc('{', out);
    json_key(out, 3, 1, "mole_fraction");
    json_profile(view, out, sum, 1.0);
    json_key(out, 3, 0, "share");
    fputc('{', out);
    for (int s = 0; s < mechanism->solved; s++) {
        if (!budget_member(mechanism, total, s))
            continue;
        for (int l = 0; l < view->model->grid.layers; l++)
            part[l] = share(view, total, s, sum, l);
        json_key(out, 4, first, mechanism_name(mechanism, s));
        json_profile(view, out, part, 1.0);
        first = 0;
    }
    fprintf(out, "}}");
}

static void json_losses(FILE *out, const double *loss)
{
    for (int p = 0; p < GAS_LOSSES; p++) {
        fprintf(out, p ? ", " : "{");
        json_text(out, budget_loss_name(p));
        fprintf(out, ": ");
        json_number(out, loss[p]);
    }
    fputc('}', out);
}

static void json_gas(const BudgetView *view, int species, int first, FILE *out)
{
    const GasBudget *gas = &view->gas[species];
    json_key(out, 2, first, mechanism_name(view->model->mechanism, species));
    fprintf(out, "{\"lifetime_years\": ");
    json_number(out, budget_lifetime(gas, gas->loss, GAS_LOSSES));
    fprintf(out, ", \"lifetime_above_tropopause_years\": ");
    json_number(out, budget_lifetime(gas, gas->aloft, GAS_LOSSES));
    fprintf(out, ", \"burden_cm-2\": ");
    json_number(out, gas->burden);
    fprintf(out, ",\n      \"loss_cm-2_s-1\": ");
    json_losses(out, gas->loss);
    fprintf(out, ",\n      \"loss_above_tropopause_cm-2_s-1\": ");
    json_losses(out, gas->aloft);
    fputc('}', out);
}

static void json_state(const BudgetView *view, FILE *out)
{
    json_key(out, 1, 1, "title");
    json_text(out, view->model->settings.title);
    json_key(out, 1, 0, "year");
    json_number(out, view->year);
    json_key(out, 1, 0, "explicit_days");
    json_number(out, view->explicit_days);
    json_key(out, 1, 0, "ozone_column_DU");
    json_number(out, column_ozone_du(view->model, view->x));
    json_key(out, 1, 0, "tropopause_km");
    json_number(out, view->model->settings.tropopause_km);
    json_key(out, 1, 0, "altitude_km");
    json_profile(view, out, view->model->grid.middle, 1e-5);
}

void budget_json(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    int first = 1;
    fputc('{', out);
    json_state(view, out);
    json_key(out, 1, 0, "odd_oxygen");
    fputc('{', out);
    json_odd_oxygen(view, out);
    fputc('}', out);
    json_key(out, 1, 0, "chain_length");
    fputc('{', out);
    for (int t = BUDGET_HOX; t <= BUDGET_BROX; t++) {
        json_key(out, 2, t == BUDGET_HOX, budget_term_name(t));
        json_profile(view, out, row_of(view, view->chain, t), 1.0);
    }
    fputc('}', out);
    json_key(out, 1, 0, "partition");
    fputc('{', out);
    for (int total = 0; total < BUDGET_TOTALS; total++)
        json_partition(view, total, out);
    fputc('}', out);
    json_key(out, 1, 0, "gases");
    fputc('{', out);
    for (int s = 0; s < mechanism->solved; s++) {
        if (!budget_is_source(view->model, s))
            continue;
        json_gas(view, s, first, out);
        first = 0;
    }
    fputc('}', out);
    json_key(out, 1, 0, "atoms_cm-2");
    fputc('{', out);
    for (int e = 0; e < mechanism->elements; e++) {
        double all, sources;
        budget_atoms(view->model, view->x, e, &all, &sources);
        json_key(out, 2, e == 0, mechanism->element[e]);
        fprintf(out, "{\"all\": ");
        json_number(out, all);
        fprintf(out, ", \"source_gases\": ");
        json_number(out, sources);
        fputc('}', out);
    }
    fprintf(out, "}\n}\n");
}
