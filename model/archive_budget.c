/* archive_budget: odd oxygen by family and the lifetimes of the source gases in the file of a projection. */
#include <math.h>
#include <string.h>

#include <netcdf.h>

#include "archive_layout.h"

/* Names as in the file, by enum BudgetTerm, the net last. */
static const struct {
    const char *name, *longer;
} terms[BUDGET_TERMS + 1] = {
    {"odd_oxygen_production_by_O2_photolysis", "production of odd oxygen by photolysis of O2"},
    {"odd_oxygen_production_by_oxidation",
     "production of odd oxygen by HO2 + NO and CH3O2 + NO, less what OH + O3 undoes"},
    {"odd_oxygen_production_by_other", "production of odd oxygen by all other reactions"},
    {"odd_oxygen_loss_by_Ox", "loss of odd oxygen by the reactions of oxygen alone"},
    {"odd_oxygen_loss_by_HOx", "loss of odd oxygen by hydrogen radicals"},
    {"odd_oxygen_loss_by_NOx", "loss of odd oxygen by nitrogen oxides"},
    {"odd_oxygen_loss_by_ClOx", "loss of odd oxygen by chlorine radicals, ClO + HO2 included"},
    {"odd_oxygen_loss_by_BrOx", "loss of odd oxygen by bromine radicals, BrO + ClO and BrO + HO2 included"},
    {"odd_oxygen_loss_by_washout", "loss of odd oxygen by washout of its reservoirs"},
    {"odd_oxygen_net_source", "net chemical source of odd oxygen"},
};

size_t layout_budget_variables(const Layout *out)
{
    size_t count = 0;
    if (!out->book)
        return 0;
    for (int s = 0; s < out->model->mechanism->solved; s++)
        count += (size_t)budget_is_source(out->model, s);
    return count + BUDGET_TERMS + 1;
}

int layout_budget_define(Layout *out, int time, int altitude, size_t time_chunk, Fault *fault)
{
    const Mechanism *mechanism = out->model->mechanism;
    const int field[2] = {time, altitude};
    const size_t chunk[2] = {1, (size_t)out->model->grid.layers};
    if (!out->book)
        return 0;
    for (int t = 0; t <= BUDGET_TERMS; t++) {
        const Description d = {terms[t].name, "cm-3 s-1", NULL, terms[t].longer, "time: mean altitude: mean"};
        if (layout_variable(out, &d, 2, field, chunk, &out->term[t], fault))
            return fault->code;
    }
    for (int s = 0; s < mechanism->solved; s++) {
        char species[MECHANISM_NAME + 2], name[MECHANISM_NAME + 16], longer[MECHANISM_NAME + 100];
        out->lifetime[s] = -1;
        if (!budget_is_source(out->model, s))
            continue;
        archive_name(mechanism_name(mechanism, s), species, sizeof species);
        snprintf(name, sizeof name, "lifetime_%s", species);
        snprintf(longer, sizeof longer, "lifetime of %s: burden over gross loss, in years of 365.25 days",
                 mechanism_name(mechanism, s));
        const Description d = {name, "year", NULL, longer, "time: mean"};
        if (layout_variable(out, &d, 1, &time, &time_chunk, &out->lifetime[s], fault))
            return fault->code;
    }
    return 0;
}

int layout_budget_put(const Layout *out, size_t index, const Record *record)
{
    const Model *model = out->model;
    const Grid *grid = &model->grid;
    const size_t start[2] = {index, 0}, count[2] = {1, (size_t)grid->layers};
    int status = NC_NOERR;
    if (!out->book || !record->rate)
        return status;
    double *net = out->budget + FIELD(grid->padded, BUDGET_TERMS, 0);
    budget_odd_oxygen(out->book, grid, record->rate, out->budget, net);
    for (int t = 0; t <= BUDGET_TERMS && status == NC_NOERR; t++)
        status = nc_put_vara_double(out->file, out->term[t], start, count,
                                    out->budget + FIELD(grid->padded, t, 0));
    for (int s = 0; s < model->mechanism->solved && status == NC_NOERR; s++) {
        GasBudget gas;
        if (out->lifetime[s] < 0)
            continue;
        budget_gas(model, record->x, record->rate, s, model_keeps(model, s, record->time), &gas);
        double years = budget_lifetime(&gas, gas.loss, GAS_LOSSES);
        if (isfinite(years)) /* what is not lost, or not there, keeps the fill value */
            status = nc_put_vara_double(out->file, out->lifetime[s], start, count, &years);
    }
    return status;
}
