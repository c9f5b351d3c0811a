/* unsplit: rates, tendencies and their derivatives. */
#include "unsplit.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/rates.h"
#include "../chem/surface.h"
#include "../input/constants.h"
#include "emission.h"

/* Relative shift of a density for the derivative of a coefficient: half the digits of a double. */
static const double PARTNER_SHIFT = 1e-6;
/* Density, cm-3, below which a partner counts as absent: surface.c has reached its limit there. */
static const double ABSENT = 10.0;

static int is_lit(const Mechanism *mechanism, int r)
{
    return r >= mechanism->photolysis_first && r < mechanism->surface_first;
}

/* ---- making ---- */

static void keep_held(Unsplit *unsplit)
{
    const Model *model = unsplit->model;
    int padded = model->grid.padded;
    for (int h = 0; h < model->held; h++)
        for (int l = 0; l < unsplit->layers; l++) {
            int i = l * unsplit->solved + model->held_species[h];
            if (model->held_free[FIELD(padded, h, l)] != 0.0)
                continue;
            unsplit->kept[i] = 1;
            unsplit->value[i] = unsplit->conditions->held_fraction[FIELD(padded, h, l)];
        }
}

static void mark_kept(Unsplit *unsplit)
{
    const Model *model = unsplit->model;
    int solved = unsplit->solved;
    for (int s = 0; s < solved; s++) {
        unsplit->carried[s] = model->mechanism->item[model->mechanism->solved_item[s]].transport != 0;
        if (model_holds(model, s))
            continue;
        unsplit->kept[s] = unsplit->conditions->kept[s];
        unsplit->value[s] = model->surface_kind[s] == SURFACE_FIXED ? model->surface_value[s] : 0.0;
        unsplit->deposit[s] = !unsplit->kept[s] && unsplit->carried[s] ? model_deposition(model, s) : 0.0;
    }
    keep_held(unsplit);
}

static void add_partner(Unsplit *unsplit, int s)
{
    for (int p = 0; p < unsplit->partners; p++)
        if (unsplit->partner[p] == s)
            return;
    if (s >= 0)
        unsplit->partner[unsplit->partners++] = s;
}

/* Whatever rates.c and surface.c look up or divide by. */
static void list_partners(Unsplit *unsplit)
{
    static const char *const looked_up[] = {"H2O", "HCl", "ClONO2", "HNO3"};
    const Mechanism *mechanism = unsplit->model->mechanism;
    for (size_t i = 0; i < sizeof looked_up / sizeof looked_up[0]; i++)
        add_partner(unsplit, mechanism_solved(mechanism, looked_up[i]));
    for (int r = mechanism->surface_first; r < mechanism->washout_first; r++)
        if (mechanism->reaction[r].reactants == 2)
            add_partner(unsplit, mechanism->reaction[r].reactant[1]);
}

static int allocate(Unsplit *unsplit, Fault *fault)
{
    const Model *model = unsplit->model;
    size_t padded = (size_t)model->grid.padded, solved = (size_t)unsplit->solved;
    size_t layers = (size_t)unsplit->layers, reactions = (size_t)model->mechanism->reactions;
    size_t lit = (size_t)(model->mechanism->surface_first - model->mechanism->photolysis_first);
    struct {
        double **array;
        size_t size;
    } part[] = {{&unsplit->factor, reactions * padded},
                {&unsplit->lit, solved * padded},
                {&unsplit->coefficient, reactions * padded},
                {&unsplit->k, reactions * padded},
                {&unsplit->product, reactions * padded},
                {&unsplit->rate, reactions * padded},
                {&unsplit->density, solved * padded},
                {&unsplit->jacobian, layers * solved * solved},
                {&unsplit->block_f, ((size_t)model->kernel->species) * PACK},
                {&unsplit->block, (size_t)model->kernel->species * (size_t)model->kernel->species * PACK},
                {&unsplit->mass, layers},
                {&unsplit->conductance, layers + 1},
                {&unsplit->deposit, solved},
                {&unsplit->emission, solved},
                {&unsplit->given, solved * layers},
                {&unsplit->value, solved * layers},
                {&unsplit->shifted, reactions * padded},
                {&unsplit->bend, solved * reactions * padded},
                {&unsplit->slope, UNSPLIT_ABSORBERS * layers * lit * padded + 1}};
    unsplit->carried = calloc(solved, 1);
    unsplit->kept = calloc(solved * layers, 1);
    unsplit->partner = calloc(solved, sizeof(int));
    unsplit->absorber = calloc(UNSPLIT_ABSORBERS * layers, sizeof(int));
    if (!unsplit->carried || !unsplit->kept || !unsplit->partner || !unsplit->absorber)
        return fault_memory(fault, "the unsplit column");
    list_partners(unsplit);
    for (size_t i = 0; i < sizeof part / sizeof part[0]; i++) {
        size_t size = part[i].array == &unsplit->bend ? (size_t)unsplit->partners * reactions * padded + 1
                                                      : part[i].size;
        *part[i].array = aligned_alloc(64, (size * sizeof(double) + 63) / 64 * 64);
        if (!*part[i].array)
            return fault_memory(fault, "the unsplit column");
        memset(*part[i].array, 0, size * sizeof(double));
    }
    return 0;
}

/* What depends on water is renewed at every evaluation. */
static void thermal_coefficients(Unsplit *unsplit)
{
    const Model *model = unsplit->model;
    const Conditions *now = unsplit->conditions;
    rates_thermal(model->mechanism, model->grid.padded, now->temperature, now->air, unsplit->density, 0,
                  unsplit->coefficient);
    memcpy(unsplit->shifted, unsplit->coefficient,
           (size_t)model->mechanism->reactions * (size_t)model->grid.padded * sizeof(double));
}

int unsplit_make(Unsplit **made, const Model *model, Fault *fault)
{
    *made = NULL;
    Unsplit *unsplit = calloc(1, sizeof *unsplit);
    if (!unsplit)
        return fault_memory(fault, "the unsplit column");
    unsplit->model = model;
    unsplit->solved = model->mechanism->solved;
    unsplit->layers = model->grid.layers;
    unsplit->unknowns = unsplit->solved * unsplit->layers;
    int code = allocate(unsplit, fault);
    if (!code)
        code = conditions_make(&unsplit->conditions, model, fault);
    if (!code)
        code = light_make(&unsplit->light, model, 1, fault);
    if (!code)
        code = pack_make(&unsplit->pack, model, fault);
    if (!code)
        code = unsplit_matrix_make(unsplit, fault);
    if (code) {
        unsplit_free(unsplit);
        return code;
    }
    const Air *air = &model->air;
    const Grid *grid = &model->grid;
    for (int l = 0; l < unsplit->layers; l++)
        unsplit->mass[l] = air->number_density[l] * grid->depth[l];
    for (int e = 1; e < unsplit->layers; e++)
        unsplit->conductance[e] =
            model->eddy[e] * air->edge_density[e] / (grid->middle[e] - grid->middle[e - 1]);
    unsplit->pack->conditions = unsplit->conditions;
    light_follow(unsplit->light, unsplit->conditions, 0);
    mark_kept(unsplit);
    unsplit_take_factors(unsplit, NULL);
    rates_washout(model->mechanism, grid->padded, model->washout_rate, unsplit->coefficient);
    thermal_coefficients(unsplit);
    *made = unsplit;
    return 0;
}

void unsplit_free(Unsplit *unsplit)
{
    if (!unsplit)
        return;
    light_free(unsplit->light);
    conditions_free(unsplit->conditions);
    pack_free(unsplit->pack);
    unsplit_matrix_free(unsplit->matrix);
    double *array[] = {unsplit->emission,    unsplit->given,       unsplit->factor,  unsplit->lit,
                       unsplit->coefficient, unsplit->k,           unsplit->product, unsplit->rate,
                       unsplit->density,     unsplit->jacobian,    unsplit->block_f, unsplit->block,
                       unsplit->mass,        unsplit->conductance, unsplit->deposit, unsplit->value,
                       unsplit->shifted,     unsplit->bend,        unsplit->slope};
    for (size_t i = 0; i < sizeof array / sizeof array[0]; i++)
        free(array[i]);
    free(unsplit->carried);
    free(unsplit->kept);
    free(unsplit->partner);
    free(unsplit->absorber);
    free(unsplit);
}

/* ---- what is given from outside ---- */

void unsplit_take_factors(Unsplit *unsplit, const Day *day)
{
    size_t padded = (size_t)unsplit->model->grid.padded;
    size_t factors = (size_t)unsplit->model->mechanism->reactions * padded,
           lit = (size_t)unsplit->solved * padded;
    unsplit->has_factors = day != NULL;
    for (size_t i = 0; i < factors; i++)
        unsplit->factor[i] = day ? day->factor[i] : 1.0;
    for (size_t i = 0; i < lit; i++)
        unsplit->lit[i] = day ? day->lit[i] : 1.0;
    unsplit->absorbers = 0;
}

static void take_emissions(Unsplit *unsplit, double time)
{
    const Model *model = unsplit->model;
    if (!model->emissions->given)
        return;
    size_t padded = (size_t)model->grid.padded;
    double *layer = unsplit->density; /* made anew by the evaluation that follows a change of time */
    emissions_at(model, time, NULL, NULL, layer);
    for (int i = 0; i < unsplit->unknowns; i++)
        unsplit->given[i] = layer[FIELD(padded, i % unsplit->solved, i / unsplit->solved)];
}

void unsplit_set_time(Unsplit *unsplit, double time)
{
    const Model *model = unsplit->model;
    int moved = conditions_move(unsplit->conditions, model, time, time);
    if (moved & CONDITIONS_AIR)
        thermal_coefficients(unsplit);
    if (moved & CONDITIONS_HELD)
        keep_held(unsplit);
    if (moved)
        light_follow(unsplit->light, unsplit->conditions, moved);
    if (moved & CONDITIONS_GROUND)
        mark_kept(unsplit);
    for (int s = 0; s < unsplit->solved; s++)
        if (model->surface_kind[s] == SURFACE_SCHEDULE && unsplit->conditions->kept[s])
            unsplit->value[s] = schedule_abundance(&model->schedule, model->surface_gas[s], time);
    take_emissions(unsplit, time);
}

void unsplit_emit(Unsplit *unsplit, int s, double flux)
{
    unsplit->kept[s] = 0;
    unsplit->emission[s] = flux;
}

void unsplit_keep(const Unsplit *unsplit, double *x)
{
    int padded = unsplit->model->grid.padded, top = unsplit->layers - 1;
    for (int i = 0; i < unsplit->unknowns; i++)
        if (unsplit->kept[i])
            x[FIELD(padded, i % unsplit->solved, i / unsplit->solved)] = unsplit->value[i];
    for (int s = 0; s < unsplit->solved; s++)
        for (int l = top + 1; l < padded; l++)
            x[FIELD(padded, s, l)] = x[FIELD(padded, s, top)];
}

/* ---- rates ---- */

static void local_coefficients(const Unsplit *unsplit, const double *density, double *coefficient)
{
    const Model *model = unsplit->model;
    const Conditions *now = unsplit->conditions;
    int padded = model->grid.padded, water = mechanism_solved(model->mechanism, "H2O");
    if (water >= 0)
        rates_thermal(model->mechanism, padded, now->temperature, now->air, density + FIELD(padded, water, 0),
                      1, coefficient);
    surface_rates(model->mechanism, padded, now->temperature, now->air, now->aerosol_area,
                  now->aerosol_radius, density, coefficient);
}

static void fill_rates(Unsplit *unsplit, const double *x)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded;
    for (int s = 0; s < unsplit->solved; s++)
        for (int l = 0; l < padded; l++)
            unsplit->density[FIELD(padded, s, l)] = x[FIELD(padded, s, l)] * unsplit->conditions->air[l];
    local_coefficients(unsplit, unsplit->density, unsplit->coefficient);
    light_refresh(unsplit->light, x, unsplit->lit);
    unsplit->lights++;
    for (int r = 0; r < mechanism->reactions; r++) {
        size_t row = FIELD(padded, r, 0);
        const double *k = is_lit(mechanism, r)
                              ? unsplit->light->mean + FIELD(padded, r - mechanism->photolysis_first, 0)
                              : unsplit->coefficient + row;
        const Reaction *reaction = &mechanism->reaction[r];
        for (int l = 0; l < padded; l++) {
            double product = 1.0;
            for (int i = 0; i < reaction->reactants; i++)
                product *= unsplit->density[FIELD(padded, reaction->reactant[i], l)];
            unsplit->k[row + (size_t)l] = k[l] * unsplit->factor[row + (size_t)l];
            unsplit->product[row + (size_t)l] = product;
            unsplit->rate[row + (size_t)l] = unsplit->k[row + (size_t)l] * product;
        }
    }
}

/* Coefficients that depend on species of their own layer. */
static void bend_coefficients(Unsplit *unsplit)
{
    const Mechanism *mechanism = unsplit->model->mechanism;
    int padded = unsplit->model->grid.padded;
    size_t reactions = (size_t)mechanism->reactions;
    for (int p = 0; p < unsplit->partners; p++) {
        double *density = unsplit->density + FIELD(padded, unsplit->partner[p], 0);
        double kept[PACK_ROUND(SETTINGS_MAX_EDGES)],
            *bend = unsplit->bend + (size_t)p * reactions * (size_t)padded;
        for (int l = 0; l < padded; l++) {
            kept[l] = density[l];
            if (density[l] > ABSENT)
                density[l] *= 1.0 + PARTNER_SHIFT;
        }
        local_coefficients(unsplit, unsplit->density, unsplit->shifted);
        for (int r = 0; r < mechanism->reactions; r++)
            for (int l = 0; l < padded; l++) {
                size_t at = FIELD(padded, r, l);
                double change = (unsplit->shifted[at] - unsplit->coefficient[at]) * unsplit->factor[at];
                bend[at] = kept[l] > ABSENT && !is_lit(mechanism, r)
                               ? change / (density[l] - kept[l]) * unsplit->conditions->air[l]
                               : 0.0;
            }
        memcpy(density, kept, (size_t)padded * sizeof(double));
        /* lanes that were not shifted hold the same coefficients; nothing else needs setting back */
    }
}

/* ---- tendencies ---- */

static void load_pack(Unsplit *unsplit, int first)
{
    const Model *model = unsplit->model;
    PackWork *pack = unsplit->pack;
    int padded = model->grid.padded;
    for (int s = 0; s < unsplit->solved; s++)
        memcpy(pack->y + s * PACK, unsplit->density + FIELD(padded, s, first), PACK * sizeof(double));
    memset(pack->y + unsplit->solved * PACK, 0,
           (size_t)(model->kernel->species - unsplit->solved) * PACK * sizeof(double));
    for (int r = 0; r < model->mechanism->reactions; r++)
        memcpy(pack->k + r * PACK, unsplit->k + FIELD(padded, r, first), PACK * sizeof(double));
    /* Held species stand in the state with their values: nothing is to be replaced, and the derivatives
     * against them are wanted. */
    pack->held = 0;
}

static void evaluate_chemistry(Unsplit *unsplit, double *tendency, int with_jacobian)
{
    const Model *model = unsplit->model;
    const double *air = unsplit->conditions->air;
    int solved = unsplit->solved, species = model->kernel->species;
    size_t square = (size_t)solved * (size_t)solved;
    for (int first = 0; first < unsplit->layers; first += PACK) {
        load_pack(unsplit, first);
        PackProblem problem = pack_problem(unsplit->pack, 0, 0.0);
        solver_evaluate(model->kernel, unsplit->pack->solver, &problem, unsplit->block_f,
                        with_jacobian ? unsplit->block : NULL);
        int lanes = unsplit->layers - first < PACK ? unsplit->layers - first : PACK;
        for (int lane = 0; lane < lanes; lane++) {
            int l = first + lane;
            for (int s = 0; s < solved; s++)
                tendency[l * solved + s] = unsplit->block_f[s * PACK + lane] / air[l];
            double *to = unsplit->jacobian + (size_t)l * square;
            for (int i = 0; with_jacobian && i < solved; i++)
                for (int j = 0; j < solved; j++)
                    to[i * solved + j] =
                        unsplit->block[((size_t)i * (size_t)species + (size_t)j) * PACK + (size_t)lane];
        }
    }
}

static void add_bends(Unsplit *unsplit)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded, solved = unsplit->solved;
    for (int p = 0; p < unsplit->partners; p++)
        for (int r = 0; r < mechanism->reactions; r++) {
            const Reaction *reaction = &mechanism->reaction[r];
            for (int l = 0; l < unsplit->layers; l++) {
                double bend = unsplit->bend[FIELD(padded, p * mechanism->reactions + r, l)];
                if (bend == 0.0)
                    continue;
                double change = bend * unsplit->product[FIELD(padded, r, l)] / unsplit->conditions->air[l];
                double *block = unsplit->jacobian + (size_t)l * (size_t)solved * (size_t)solved;
                for (int c = 0; c < reaction->changes; c++)
                    block[reaction->changed[c] * solved + unsplit->partner[p]] +=
                        reaction->change[c] * change;
            }
        }
}

static void add_transport(const Unsplit *unsplit, const double *x, double *tendency)
{
    int padded = unsplit->model->grid.padded, solved = unsplit->solved;
    for (int s = 0; s < solved; s++) {
        if (!unsplit->carried[s])
            continue;
        const double *row = x + FIELD(padded, s, 0);
        double below =
            unsplit->deposit[s] * unsplit->model->air.number_density[0] * row[0] - unsplit->emission[s];
        for (int l = 0; l < unsplit->layers; l++) {
            double above =
                l + 1 < unsplit->layers ? unsplit->conductance[l + 1] * (row[l + 1] - row[l]) : 0.0;
            tendency[l * solved + s] += (above - below + unsplit->given[l * solved + s]) / unsplit->mass[l];
            below = above;
        }
    }
}

void unsplit_evaluate(Unsplit *unsplit, const double *x, double *tendency, int with_jacobian)
{
    int padded = unsplit->model->grid.padded;
    fill_rates(unsplit, x);
    evaluate_chemistry(unsplit, tendency, with_jacobian);
    add_transport(unsplit, x, tendency);
    for (int i = 0; i < unsplit->unknowns; i++)
        if (unsplit->kept[i])
            tendency[i] = unsplit->value[i] - x[FIELD(padded, i % unsplit->solved, i / unsplit->solved)];
    if (with_jacobian) {
        bend_coefficients(unsplit);
        add_bends(unsplit);
    }
    unsplit->evaluations++;
}

void unsplit_turnover(const Unsplit *unsplit, const double *x, double *turnover)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded, solved = unsplit->solved;
    for (int i = 0; i < unsplit->unknowns; i++)
        turnover[i] = 0.0;
    for (int r = 0; r < mechanism->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        for (int c = 0; c < reaction->changes; c++)
            for (int l = 0; l < unsplit->layers; l++)
                turnover[l * solved + reaction->changed[c]] +=
                    fabs(reaction->change[c] * unsplit->rate[FIELD(padded, r, l)]) /
                    unsplit->conditions->air[l];
    }
    for (int s = 0; s < solved; s++)
        for (int l = 0; l < unsplit->layers; l++) {
            double *to = &turnover[l * solved + s];
            const double *row = x + FIELD(padded, s, 0);
            if (unsplit->kept[l * solved + s]) {
                *to = fabs(row[l]);
                continue;
            }
            if (!unsplit->carried[s])
                continue;
            *to += unsplit->given[l * solved + s] / unsplit->mass[l];
            if (l == 0)
                *to += fabs(unsplit->deposit[s] * row[0]) / model->grid.depth[0] +
                       fabs(unsplit->emission[s]) / unsplit->mass[0];
            if (l > 0)
                *to += fabs(unsplit->conductance[l] * (row[l] - row[l - 1])) / unsplit->mass[l];
            if (l + 1 < unsplit->layers)
                *to += fabs(unsplit->conductance[l + 1] * (row[l + 1] - row[l])) / unsplit->mass[l];
        }
}
