/* budget_gases: what families are made of, how long gases live, how two of them are related. */
#include <math.h>
#include <string.h>

#include "../input/constants.h"
#include "budget.h"

/* ---- families ---- */

static const struct {
    const char *name, *element; /* element NULL: the radicals of HOx */
} totals[BUDGET_TOTALS] = {{"HOx", NULL}, {"NOy", "N"}, {"Cly", "Cl"}, {"Bry", "Br"}};

const char *budget_total_name(int total)
{
    return totals[total].name;
}

int budget_member(const Mechanism *mechanism, int total, int solved)
{
    const char *name = mechanism_name(mechanism, solved);
    if (!totals[total].element)
        return !strcmp(name, "H") || !strcmp(name, "OH") || !strcmp(name, "HO2");
    int element = mechanism_element(mechanism, totals[total].element);
    int carbon = mechanism_element(mechanism, "C");
    if (element < 0 || !strcmp(name, "N2O") || (carbon >= 0 && mechanism_atoms(mechanism, solved, carbon)))
        return 0;
    return mechanism_atoms(mechanism, solved, element);
}

void budget_total(const Model *model, const double *x, int total, double *sum)
{
    memset(sum, 0, (size_t)model->grid.layers * sizeof(double));
    for (int s = 0; s < model->mechanism->solved; s++) {
        int atoms = budget_member(model->mechanism, total, s);
        for (int l = 0; atoms && l < model->grid.layers; l++)
            sum[l] += atoms * x[FIELD(model->grid.padded, s, l)];
    }
}

void budget_atoms(const Model *model, const double *x, int element, double *all, double *sources)
{
    const Mechanism *mechanism = model->mechanism;
    int carbon = mechanism_element(mechanism, "C");
    *all = *sources = 0.0;
    for (int s = 0; s < mechanism->solved; s++) {
        int count = mechanism_atoms(mechanism, s, element);
        double atoms = count ? count * column_burden(model, x, s) : 0.0;
        *all += atoms;
        if ((carbon >= 0 && mechanism_atoms(mechanism, s, carbon)) ||
            !strcmp(mechanism_name(mechanism, s), "N2O"))
            *sources += atoms;
    }
}

/* ---- lifetimes ---- */

const char *budget_loss_name(int loss)
{
    static const char *const names[GAS_LOSSES] = {"photolysis", "O(1D)",   "OH",    "Cl",
                                                  "other",      "washout", "ground"};
    return names[loss];
}

/* What a reaction takes species with. */
static int loss_part(const Mechanism *mechanism, const Reaction *reaction, int species)
{
    if (reaction->kind == REACTION_PHOTOLYSIS)
        return LOSS_PHOTOLYSIS;
    if (reaction->kind == REACTION_WASHOUT)
        return LOSS_WASHOUT;
    for (int i = 0; reaction->kind == REACTION_THERMAL && i < reaction->reactants; i++) {
        if (reaction->reactant[i] == species)
            continue;
        const char *name = mechanism_name(mechanism, reaction->reactant[i]);
        if (!strcmp(name, "O(1D)"))
            return LOSS_O1D;
        if (!strcmp(name, "OH"))
            return LOSS_OH;
        if (!strcmp(name, "Cl"))
            return LOSS_CL;
    }
    return LOSS_OTHER;
}

void budget_gas(const Model *model, const double *x, const double *rate, int solved, int kept, GasBudget *gas)
{
    const Mechanism *mechanism = model->mechanism;
    const Grid *grid = &model->grid;
    *gas = (GasBudget){.burden = column_burden(model, x, solved)};
    for (int r = 0; r < mechanism->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        double change = 0.0;
        for (int c = 0; c < reaction->changes; c++)
            if (reaction->changed[c] == solved)
                change += reaction->change[c];
        if (change >= 0.0)
            continue;
        int part = loss_part(mechanism, reaction, solved);
        for (int l = 0; l < grid->layers; l++) {
            double lost = -change * rate[FIELD(grid->padded, r, l)] * grid->depth[l];
            gas->loss[part] += lost;
            if (1e-5 * grid->middle[l] >= model->settings.tropopause_km)
                gas->aloft[part] += lost;
        }
    }
    if (!kept) /* -F of transport/diffusion.h */
        gas->loss[LOSS_GROUND] = model_deposition(model, solved) * model->air.number_density[0] *
                                 x[FIELD(grid->padded, solved, 0)];
}

double budget_lifetime(const GasBudget *gas, const double *loss, int count)
{
    double sum = 0.0;
    for (int i = 0; i < count; i++)
        sum += loss[i];
    return sum > 0.0 ? gas->burden / sum / YEAR_SECONDS : INFINITY;
}

int budget_is_source(const Model *model, int solved)
{
    int kind = model->surface_kind[solved];
    return (kind == SURFACE_SCHEDULE && !model_made_anyway(model, solved)) || kind == SURFACE_FIXED;
}

/* ---- profiles ---- */

double budget_at_km(const Model *model, const double *profile, double km)
{
    const double *middle = model->grid.middle;
    int l = 0;
    while (l + 2 < model->grid.layers && 1e-5 * middle[l + 1] < km)
        l++;
    double share = (1e5 * km - middle[l]) / (middle[l + 1] - middle[l]);
    return profile[l] + share * (profile[l + 1] - profile[l]);
}

int budget_slope(const Model *model, const double *x, const double *y, double low, double high, double *slope)
{
    int count = 0;
    double sum_x = 0.0, sum_y = 0.0, spread = 0.0, common = 0.0;
    for (int pass = 0; pass < 2; pass++)
        for (int l = 0; l < model->grid.layers; l++) {
            if (1e-5 * model->grid.middle[l] < model->settings.tropopause_km || x[l] < low || x[l] > high)
                continue;
            if (!pass) {
                count++;
                sum_x += x[l];
                sum_y += y[l];
            } else {
                double from_mean = x[l] - sum_x / count;
                spread += from_mean * from_mean;
                common += from_mean * (y[l] - sum_y / count);
            }
        }
    *slope = count >= 3 && spread > 0.0 ? common / spread : NAN;
    return count;
}
