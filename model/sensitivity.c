/* sensitivity: the adjoint of the settled column. */
#include "sensitivity.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

static const double STANDARD_TEMPERATURE = 298.0; /* K, that f of the mechanism is given for */

/* ---- answers ---- */

static int read_species(Answer *answer, const char *name, const Model *model, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    answer->species = mechanism_solved(mechanism, name);
    if (answer->species >= 0)
        return 0;
    const char **names = malloc((size_t)mechanism->solved * sizeof *names);
    if (!names)
        return fault_memory(fault, "names of species");
    for (int s = 0; s < mechanism->solved; s++)
        names[s] = mechanism_name(mechanism, s);
    const char *near = fault_nearest(name, names, (size_t)mechanism->solved);
    free(names);
    return fault_set(fault, FAULT_INPUT, "\"%s\" is no active species of %s%s%s%s", name, mechanism->path,
                     near ? "; did you mean " : "", near ? near : "", near ? "?" : "; correct the name");
}

int answer_read(Answer *answer, const char *text, const Model *model, Fault *fault)
{
    *answer = (Answer){0};
    if (!strcmp(text, "column"))
        return 0;
    if (!strncmp(text, "O3@", 3)) {
        char *end;
        double top = 1e-5 * model->grid.middle[model->grid.layers - 1];
        answer->kind = ANSWER_OZONE;
        answer->altitude_km = strtod(text + 3, &end);
        if (end == text + 3 || *end)
            return fault_set(fault, FAULT_INPUT, "\"%s\": give an altitude in km after O3@, as in O3@40",
                             text);
        if (!(answer->altitude_km >= 1e-5 * model->grid.middle[0] && answer->altitude_km <= top))
            return fault_set(fault, FAULT_INPUT, "\"%s\": the middles of the layers reach from %g to %g km",
                             text, 1e-5 * model->grid.middle[0], top);
        return 0;
    }
    if (!strncmp(text, "lifetime:", 9)) {
        answer->kind = ANSWER_LIFETIME;
        return read_species(answer, text + 9, model, fault);
    }
    if (!strncmp(text, "flux:", 5)) {
        answer->kind = ANSWER_FLUX;
        int code = read_species(answer, text + 5, model, fault);
        int kind = code ? 0 : model->surface_kind[answer->species];
        if (!code && kind != SURFACE_SCHEDULE && kind != SURFACE_FIXED)
            return fault_set(fault, FAULT_INPUT,
                             "\"%s\": the ground keeps no value of %s; name a gas it keeps", text, text + 5);
        return code;
    }
    return fault_set(
        fault, FAULT_INPUT,
        "\"%s\" is no answer; give column, O3@KM, lifetime:GAS or flux:GAS (O3@40, lifetime:N2O)", text);
}

void answer_name(const Answer *answer, const Model *model, char *text, size_t size)
{
    switch (answer->kind) {
    case ANSWER_OZONE: snprintf(text, size, "O3@%g", answer->altitude_km); break;
    case ANSWER_LIFETIME:
        snprintf(text, size, "lifetime:%s", mechanism_name(model->mechanism, answer->species));
        break;
    case ANSWER_FLUX:
        snprintf(text, size, "flux:%s", mechanism_name(model->mechanism, answer->species));
        break;
    default: snprintf(text, size, "column");
    }
}

const char *answer_unit(const Answer *answer)
{
    static const char *const unit[] = {"DU", "mol mol-1", "years", "molecules cm-2 s-1"};
    return unit[answer->kind];
}

/* Layer below the altitude and share of the one above it. */
static int find_layer(const Grid *grid, double altitude_km, double *share)
{
    double z = 1e5 * altitude_km;
    int l = 0;
    while (l + 2 < grid->layers && grid->middle[l + 1] <= z)
        l++;
    *share = (z - grid->middle[l]) / (grid->middle[l + 1] - grid->middle[l]);
    return l;
}

/* Molecules cm-2 s-1 that chemistry and washout take of species s. */
static double gross_loss(const Unsplit *unsplit, int s)
{
    const Model *model = unsplit->model;
    double loss = 0.0;
    for (int r = 0; r < model->mechanism->reactions; r++) {
        const Reaction *reaction = &model->mechanism->reaction[r];
        for (int c = 0; c < reaction->changes; c++)
            for (int l = 0; reaction->changed[c] == s && reaction->change[c] < 0.0 && l < unsplit->layers;
                 l++)
                loss -= reaction->change[c] * unsplit->rate[FIELD(model->grid.padded, r, l)] *
                        unsplit->conditions->depth[l];
    }
    return loss;
}

/* What keeping the value of s in the lowest layer takes, molecules cm-2 s-1. */
static double ground_flux(const Unsplit *unsplit, const double *x, int s)
{
    const Model *model = unsplit->model;
    const double *row = x + FIELD(model->grid.padded, s, 0);
    double gain = unsplit->carried[s] ? unsplit->conductance[1] * (row[1] - row[0]) : 0.0;
    for (int r = 0; r < model->mechanism->reactions; r++) {
        const Reaction *reaction = &model->mechanism->reaction[r];
        for (int c = 0; c < reaction->changes; c++)
            if (reaction->changed[c] == s)
                gain += reaction->change[c] * unsplit->rate[FIELD(model->grid.padded, r, 0)] *
                        unsplit->conditions->depth[0];
    }
    return -gain;
}

double answer_value(const Unsplit *unsplit, const double *x, const Answer *answer)
{
    const Model *model = unsplit->model;
    if (answer->kind == ANSWER_COLUMN)
        return column_ozone_du(model, x);
    if (answer->kind == ANSWER_OZONE) {
        double share;
        int l = find_layer(&model->grid, answer->altitude_km, &share);
        const double *row = x + FIELD(model->grid.padded, mechanism_solved(model->mechanism, "O3"), 0);
        return (1.0 - share) * row[l] + share * row[l + 1];
    }
    if (answer->kind == ANSWER_LIFETIME)
        return column_burden(model, x, answer->species) / gross_loss(unsplit, answer->species) / YEAR_SECONDS;
    return ground_flux(unsplit, x, answer->species);
}

/* ---- the adjoint ---- */

/* An answer's own derivatives: gradient [unknowns] at fixed rates, weight [reactions][padded] of the rates
 * (cm-3 s-1), and, of a flux, which row of the equations it is. All in. */
static void differentiate(const Unsplit *unsplit, const double *x, const Answer *answer, double *gradient,
                          double *weight)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int solved = unsplit->solved, padded = model->grid.padded, s = answer->species, layers = unsplit->layers;
    int ozone = mechanism_solved(mechanism, "O3");
    if (answer->kind == ANSWER_COLUMN) {
        for (int l = 0; l < layers; l++)
            gradient[l * solved + ozone] = unsplit->mass[l] / DOBSON_CM2;
        gradient[(layers - 1) * solved + ozone] += model->air.column_above_top / DOBSON_CM2;
    } else if (answer->kind == ANSWER_OZONE) {
        double share;
        int l = find_layer(&model->grid, answer->altitude_km, &share);
        gradient[l * solved + ozone] = 1.0 - share;
        gradient[(l + 1) * solved + ozone] = share;
    } else if (answer->kind == ANSWER_LIFETIME) {
        double loss = gross_loss(unsplit, s), burden = column_burden(model, x, s);
        for (int l = 0; l < layers; l++)
            gradient[l * solved + s] = unsplit->mass[l] / loss / YEAR_SECONDS;
        for (int r = 0; r < mechanism->reactions; r++) {
            const Reaction *reaction = &mechanism->reaction[r];
            for (int c = 0; c < reaction->changes; c++)
                for (int l = 0; reaction->changed[c] == s && reaction->change[c] < 0.0 && l < layers; l++)
                    weight[FIELD(padded, r, l)] += reaction->change[c] * unsplit->conditions->depth[l] *
                                                   burden / (loss * loss) / YEAR_SECONDS;
        }
    } else {
        if (unsplit->carried[s]) {
            gradient[s] += unsplit->conductance[1];
            gradient[solved + s] -= unsplit->conductance[1];
        }
        for (int r = 0; r < mechanism->reactions; r++) {
            const Reaction *reaction = &mechanism->reaction[r];
            for (int c = 0; c < reaction->changes; c++)
                if (reaction->changed[c] == s)
                    weight[FIELD(padded, r, 0)] -= reaction->change[c] * unsplit->conditions->depth[0];
        }
    }
}

int sensitivity_prepare(Unsplit *unsplit, const double *x, Fault *fault)
{
    double *tendency = malloc((size_t)unsplit->unknowns * sizeof(double));
    if (!tendency)
        return fault_memory(fault, "sensitivities");
    unsplit_evaluate(unsplit, x, tendency, 1);
    free(tendency);
    if (unsplit_slopes(unsplit, x, fault))
        return fault->code;
    return unsplit_factorise(unsplit, x, 0.0, 1, fault);
}

/* What each reaction's logarithm does, from the adjoint m and the answer's own weight of the rates. */
static void take_reactions(Sensitivity *sensitivity, const Unsplit *unsplit, const double *m,
                           const double *weight)
{
    const Model *model = unsplit->model;
    int solved = unsplit->solved, padded = model->grid.padded;
    for (int r = 0; r < model->mechanism->reactions; r++) {
        const Reaction *reaction = &model->mechanism->reaction[r];
        for (int l = 0; l < unsplit->layers; l++) {
            size_t at = FIELD(padded, r, l);
            double sum = 0.0;
            for (int c = 0; c < reaction->changes; c++) {
                int i = l * solved + reaction->changed[c];
                sum += unsplit->kept[i] ? 0.0 : reaction->change[c] * m[i];
            }
            sensitivity->reaction[at] = (sum / unsplit->conditions->air[l] + weight[at]) * unsplit->rate[at];
        }
    }
}

static void take_borders(Sensitivity *sensitivity, const Unsplit *unsplit, const double *x, const double *m)
{
    const Model *model = unsplit->model;
    int solved = unsplit->solved, padded = model->grid.padded;
    for (int s = 0; s < solved; s++) {
        const double *row = x + FIELD(padded, s, 0);
        int held = model_holds(model, s);
        if (unsplit->kept[s] && !held)
            sensitivity->surface[s] = m[s];
        if (!unsplit->kept[s]) {
            sensitivity->flux[s] = m[s] / unsplit->mass[0];
            sensitivity->deposition[s] = -m[s] * unsplit->deposit[s] * row[0] / model->grid.depth[0];
        }
        for (int l = 0; held && l < unsplit->layers; l++)
            if (unsplit->kept[l * solved + s])
                sensitivity->held[s] += m[l * solved + s] * unsplit->value[l * solved + s];
    }
}

/* m of a kept row is that of its value, not of what transport brings there. */
static double moved_by(const Unsplit *unsplit, const double *m, int s, int l)
{
    int i = l * unsplit->solved + s;
    return unsplit->kept[i] ? 0.0 : m[i] / unsplit->mass[l];
}

static void take_eddy(Sensitivity *sensitivity, const Unsplit *unsplit, const double *x, const double *m)
{
    const Model *model = unsplit->model;
    const Answer *answer = &sensitivity->answer;
    for (int s = 0; s < unsplit->solved; s++) {
        const double *row = x + FIELD(model->grid.padded, s, 0);
        for (int e = 1; unsplit->carried[s] && e < unsplit->layers; e++) {
            double down = unsplit->conductance[e] * (row[e] - row[e - 1]); /* molecules cm-2 s-1 */
            sensitivity->eddy[e] += down * (moved_by(unsplit, m, s, e - 1) - moved_by(unsplit, m, s, e));
            if (answer->kind == ANSWER_FLUX && answer->species == s && e == 1)
                sensitivity->eddy[e] -= down;
        }
    }
}

static int allocate(Sensitivity *sensitivity, const Unsplit *unsplit, Fault *fault)
{
    size_t padded = (size_t)unsplit->model->grid.padded, solved = (size_t)unsplit->solved;
    sensitivity->reaction = calloc((size_t)unsplit->model->mechanism->reactions * padded, sizeof(double));
    sensitivity->surface = calloc(solved, sizeof(double));
    sensitivity->flux = calloc(solved, sizeof(double));
    sensitivity->deposition = calloc(solved, sizeof(double));
    sensitivity->held = calloc(solved, sizeof(double));
    sensitivity->eddy = calloc((size_t)unsplit->layers + 1, sizeof(double));
    sensitivity->temperature = calloc((size_t)unsplit->layers, sizeof(double));
    if (!sensitivity->reaction || !sensitivity->surface || !sensitivity->flux || !sensitivity->deposition ||
        !sensitivity->held || !sensitivity->eddy || !sensitivity->temperature)
        return fault_memory(fault, "sensitivities");
    memcpy(sensitivity->temperature, unsplit->conditions->temperature,
           (size_t)unsplit->layers * sizeof(double));
    return 0;
}

int sensitivity_make(Sensitivity **made, const Unsplit *unsplit, const double *x, const Answer *answer,
                     Fault *fault)
{
    *made = NULL;
    size_t n = (size_t)unsplit->unknowns;
    size_t rates = (size_t)unsplit->model->mechanism->reactions * (size_t)unsplit->model->grid.padded;
    Sensitivity *sensitivity = calloc(1, sizeof *sensitivity);
    double *m = calloc(n + rates, sizeof(double)), *weight = m + n;
    int code =
        sensitivity && m ? allocate(sensitivity, unsplit, fault) : fault_memory(fault, "sensitivities");
    if (code) {
        free(m);
        sensitivity_free(sensitivity);
        return code;
    }
    sensitivity->answer = *answer;
    sensitivity->value = answer_value(unsplit, x, answer);
    differentiate(unsplit, x, answer, m, weight);
    unsplit_rate_gradient(unsplit, weight, m);
    for (size_t i = 0; i < n; i++)
        m[i] = -m[i];
    unsplit_solve(unsplit, m, 1);
    take_reactions(sensitivity, unsplit, m, weight);
    take_borders(sensitivity, unsplit, x, m);
    take_eddy(sensitivity, unsplit, x, m);
    free(m);
    *made = sensitivity;
    return 0;
}

void sensitivity_free(Sensitivity *sensitivity)
{
    if (!sensitivity)
        return;
    free(sensitivity->reaction);
    free(sensitivity->surface);
    free(sensitivity->flux);
    free(sensitivity->deposition);
    free(sensitivity->held);
    free(sensitivity->eddy);
    free(sensitivity->temperature);
    free(sensitivity);
}

int sensitivity_per_flux(const Unsplit *unsplit, const double *x, const Sensitivity *sensitivity, int s,
                         double *derivative, Fault *fault)
{
    if (!unsplit->kept[s]) {
        *derivative = sensitivity->flux[s];
        return 0;
    }
    Answer flux = {.kind = ANSWER_FLUX, .species = s};
    Sensitivity *of_flux;
    int code = sensitivity_make(&of_flux, unsplit, x, &flux, fault);
    if (code)
        return code;
    double slope = of_flux->surface[s];
    sensitivity_free(of_flux);
    if (!(fabs(slope) > 0.0))
        return fault_set(fault, FAULT_INPUT, "the flux of %s does not depend on its value at the ground",
                         mechanism_name(unsplit->model->mechanism, s));
    *derivative = sensitivity->surface[s] / slope;
    return 0;
}

static double sum_over_layers(const Sensitivity *sensitivity, const Model *model, int r,
                              const Reaction *uncertain)
{
    const double *row = sensitivity->reaction + FIELD(model->grid.padded, r, 0);
    double sum = 0.0;
    for (int l = 0; l < model->grid.layers; l++) {
        double bend =
            uncertain ? fabs(uncertain->g * (1.0 / sensitivity->temperature[l] - 1.0 / STANDARD_TEMPERATURE))
                      : 0.0;
        sum += row[l] * (uncertain ? log(uncertain->f) + bend : 1.0);
    }
    return sum;
}

double sensitivity_reaction(const Sensitivity *sensitivity, const Model *model, int r, int with_uncertainty)
{
    const Mechanism *mechanism = model->mechanism;
    const Reaction *uncertain = with_uncertainty ? &mechanism->reaction[r] : NULL;
    if (uncertain && !(uncertain->f > 0.0))
        return 0.0;
    double sum = sum_over_layers(sensitivity, model, r, uncertain);
    for (int reverse = mechanism->thermal_first; reverse < mechanism->photolysis_first; reverse++)
        if (mechanism->reaction[reverse].law == LAW_EQUILIBRIUM && mechanism->reaction[reverse].forward == r)
            sum += sum_over_layers(sensitivity, model, reverse, uncertain);
    return sum;
}
