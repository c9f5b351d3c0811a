/* potency_text: depletion potentials told. */
#include "potency_text.h"

#include <math.h>

#include "json.h"

/* What the loss of a gas is made of in the tables; the rest, washout and uptake by the ground, is "other". */
static const int parts[] = {LOSS_PHOTOLYSIS, LOSS_O1D, LOSS_OH, LOSS_CL};
enum { PARTS = sizeof parts / sizeof parts[0] };

static double total(const double *loss)
{
    double sum = 0.0;
    for (int p = 0; p < GAS_LOSSES; p++)
        sum += loss[p];
    return sum;
}

/* Per cent of all loss; NAN where there is none. */
static double percent(const Potency *gas, int part)
{
    return 100.0 * gas->budget.loss[part] / total(gas->budget.loss);
}

static double percent_other(const Potency *gas)
{
    double rest = 100.0;
    for (int p = 0; p < PARTS; p++)
        rest -= percent(gas, parts[p]);
    return fabs(rest) < 1e-9 ? 0.0 : rest;
}

static double percent_aloft(const Potency *gas)
{
    return 100.0 * total(gas->budget.aloft) / total(gas->budget.loss);
}

static const char *name_of(const PotencyView *view, int i)
{
    return mechanism_name(view->model->mechanism, view->potencies->gas[i].species);
}

static const Species *species_of(const PotencyView *view, int i)
{
    const Mechanism *mechanism = view->model->mechanism;
    return &mechanism->item[mechanism->solved_item[view->potencies->gas[i].species]];
}

static const char *way(const PotencyView *view)
{
    if (!view->factors)
        return "daily means, no diurnal factors";
    return view->potencies->anew ? "diurnal factors made anew" : "diurnal factors frozen";
}

/* Of the way asked for. */
static double per_flux(const PotencyView *view, const Potency *gas)
{
    return view->potencies->anew ? gas->anew : gas->frozen;
}

/* ---- for people ---- */

/* Per cent as a whole number, in a column of seven; a dash where there is none. */
static void print_percent(FILE *out, double value)
{
    if (isfinite(value))
        fprintf(out, " %6.0f", value);
    else
        fprintf(out, " %6s", "-");
}

static void print_gas(const PotencyView *view, int i, FILE *out)
{
    const Potency *gas = &view->potencies->gas[i];
    fprintf(out, "  %-12s", name_of(view, i));
    if (isfinite(gas->lifetime))
        fprintf(out, " %9.4g", gas->lifetime);
    else
        fprintf(out, " %9s", "-");
    print_percent(out, percent_aloft(gas));
    for (int p = 0; p < PARTS; p++)
        print_percent(out, percent(gas, parts[p]));
    print_percent(out, percent_other(gas));
    if (view->potencies->anew)
        fprintf(out, "  %11.4g %9.1e %11.4g", gas->odp, gas->odp_noise, gas->odp_frozen);
    else
        fprintf(out, "  %11.4g", gas->odp_frozen);
    fprintf(out, " %12.4g\n", potency_per_gg_year(per_flux(view, gas), gas->molar_mass));
}

void potency_print(const PotencyView *view, FILE *out)
{
    const Potencies *potencies = view->potencies;
    fprintf(out, "%s\n\nozone depletion potentials at steady state, by mass, %s = 1\n",
            view->model->settings.title, name_of(view, potencies->reference));
    fprintf(out, "surface values of %d (its middle), %s; ozone column %.3f DU\n\n", view->year, way(view),
            potencies->ozone);
    fprintf(out, "  %-12s %9s %6s %6s %6s %6s %6s %6s  ", "", "lifetime", "aloft", "light", "O(1D)", "OH",
            "Cl", "other");
    if (potencies->anew)
        fprintf(out, "%11s %9s %11s %12s\n", "potential", "noise", "frozen", "DU per");
    else
        fprintf(out, "%11s %12s\n", "potential", "DU per");
    fprintf(out, "  %-12s %9s %6s %6s %6s %6s %6s %6s  ", "gas", "years", "%", "%", "%", "%", "%", "%");
    if (potencies->anew)
        fprintf(out, "%11s %9s %11s %12s\n", "", "", "factors", "Gg a year");
    else
        fprintf(out, "%11s %12s\n", "(frozen)", "Gg a year");
    for (int i = 0; i < potencies->count; i++)
        print_gas(view, i, out);
    fprintf(out,
            "\n  lifetime: burden over all loss in the column, ocean and soil not counted; aloft: the share "
            "of the loss\n  above %g km; light to other: what takes the gas\n",
            view->model->settings.tropopause_km);
    if (potencies->anew)
        fprintf(out,
                "  noise: what the last turns of the factors still moved; frozen: the same by the adjoint, "
                "whose\n  factors do not answer to the gas\n");
    fprintf(out, "  One column for the globe: no polar chemistry, no loss to ocean and soil, and a gas that "
                 "lives less than\n  half a year is not mixed well enough for it.\n");
}

/* ---- CSV ---- */

/* A cell with a comma before it. */
static void cell(FILE *out, double value)
{
    fputc(',', out);
    if (isfinite(value))
        fprintf(out, "%.9g", value);
}

void potency_csv(const PotencyView *view, FILE *out)
{
    const Potencies *potencies = view->potencies;
    fprintf(out,
            "# quantity: ozone depletion potentials at steady state by mass, %s = 1, surface values of the "
            "middle of %d, %s, ozone column %.9g DU\n",
            name_of(view, potencies->reference), view->year, way(view), potencies->ozone);
    fprintf(out, "gas,formula,molar_mass_g_mol-1,ground_mol_mol-1,lifetime_years,lifetime_aloft_years");
    for (int p = 0; p < PARTS; p++)
        fprintf(out, ",loss_%s_percent", budget_loss_name(parts[p]));
    fprintf(out, ",loss_other_percent,ground_flux_cm-2_s-1,odp,odp_noise,odp_frozen,DU_per_Gg_year,"
                 "DU_per_Gg_year_frozen,nonlinearity\n");
    for (int i = 0; i < potencies->count; i++) {
        const Potency *gas = &potencies->gas[i];
        fprintf(out, "%s,%s", name_of(view, i), species_of(view, i)->formula);
        cell(out, gas->molar_mass);
        cell(out, gas->abundance);
        cell(out, gas->lifetime);
        cell(out,
             gas->budget.burden > 0.0 ? budget_lifetime(&gas->budget, gas->budget.aloft, GAS_LOSSES) : NAN);
        for (int p = 0; p < PARTS; p++)
            cell(out, percent(gas, parts[p]));
        cell(out, percent_other(gas));
        cell(out, gas->flux);
        cell(out, gas->odp);
        cell(out, gas->odp_noise);
        cell(out, gas->odp_frozen);
        cell(out, potency_per_gg_year(gas->anew, gas->molar_mass));
        cell(out, potency_per_gg_year(gas->frozen, gas->molar_mass));
        cell(out, gas->bend);
        fputc('\n', out);
    }
}

/* ---- JSON ---- */

/* "key": value, on the line. */
static void pair(FILE *out, const char *lead, const char *key, double value)
{
    fputs(lead, out);
    json_text(out, key);
    fputs(": ", out);
    json_number(out, value);
}

static void json_gas(const PotencyView *view, int i, FILE *out)
{
    const Potency *gas = &view->potencies->gas[i];
    json_key(out, 2, i == 0, name_of(view, i));
    fputs("{\"formula\": ", out);
    json_text(out, species_of(view, i)->formula);
    pair(out, ", ", "molar_mass_g_mol-1", gas->molar_mass);
    pair(out, ", ", "ground_mol_mol-1", gas->abundance);
    pair(out, ",\n      ", "odp", gas->odp);
    pair(out, ", ", "odp_noise", gas->odp_noise);
    pair(out, ", ", "odp_frozen", gas->odp_frozen);
    pair(out, ",\n      ", "DU_per_Gg_year", potency_per_gg_year(gas->anew, gas->molar_mass));
    pair(out, ", ", "DU_per_Gg_year_frozen", potency_per_gg_year(gas->frozen, gas->molar_mass));
    pair(out, ", ", "nonlinearity", gas->bend);
    pair(out, ",\n      ", "lifetime_years", gas->lifetime);
    pair(out, ", ", "ground_flux_cm-2_s-1", gas->flux);
    pair(out, ", ", "burden_cm-2", gas->budget.burden);
    fputs(",\n      \"loss_cm-2_s-1\": {", out);
    for (int p = 0; p < GAS_LOSSES; p++)
        pair(out, p ? ", " : "", budget_loss_name(p), gas->budget.loss[p]);
    fputs("}}", out);
}

void potency_json(const PotencyView *view, FILE *out)
{
    const Potencies *potencies = view->potencies;
    fputc('{', out);
    json_key(out, 1, 1, "title");
    json_text(out, view->model->settings.title);
    json_key(out, 1, 0, "quantity");
    json_text(out, "ozone depletion potential at steady state, by mass");
    json_key(out, 1, 0, "reference");
    json_text(out, name_of(view, potencies->reference));
    json_key(out, 1, 0, "year");
    json_number(out, view->year);
    json_key(out, 1, 0, "factors");
    json_text(out, way(view));
    json_key(out, 1, 0, "ozone_column_DU");
    json_number(out, potencies->ozone);
    json_key(out, 1, 0, "gases");
    fputc('{', out);
    for (int i = 0; i < potencies->count; i++)
        json_gas(view, i, out);
    fprintf(out, "}\n}\n");
}
