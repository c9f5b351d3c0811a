/* emission: see emission.h. */
#include "emission.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/equation.h"
#include "../input/constants.h"

double emission_area(void)
{
    return 4.0 * PI * EARTH_RADIUS_KM * EARTH_RADIUS_KM * 1e10;
}

static double molar_mass(const Model *model, int solved)
{
    return model->mechanism->item[model->mechanism->solved_item[solved]].molar_mass;
}

double emission_kg_year(const Model *model, int solved, double flux)
{
    return flux * YEAR_SECONDS * emission_area() / AVOGADRO * molar_mass(model, solved) * 1e-3;
}

/* ---- making ---- */

static const ScheduleLine *line_of(const Model *model, int line)
{
    return &model->schedule.line[line];
}

static int at_ground(const ScheduleLine *line)
{
    return line->to_km <= 0.0;
}

/* Molecules of the gas per kg that the line counts. */
static int set_molecules(Emissions *emissions, const Model *model, int i, Fault *fault)
{
    const ScheduleLine *line = line_of(model, i);
    const char *file = model->schedule.path[line->file], *gas = model->schedule.gas[line->gas];
    int s = emissions->species[i];
    double grams = molar_mass(model, s); /* of what the line counts, per mole of gas */
    if (line->element[0]) {
        int element = mechanism_element(model->mechanism, line->element);
        int atoms = element >= 0 ? mechanism_atoms(model->mechanism, s, element) : 0;
        if (!atoms)
            return fault_at(
                fault, file, line->row,
                "%s, line \"%.60s\": amounts are masses of %s, which %s does not hold; correct the unit", gas,
                line->label, line->element, gas);
        grams = atoms * equation_atomic_weight(line->element);
    }
    emissions->molecules[i] = 1e3 / grams * AVOGADRO / emission_area();
    return 0;
}

static int set_share(Emissions *emissions, const Model *model, int i, Fault *fault)
{
    const ScheduleLine *line = line_of(model, i);
    const Grid *grid = &model->grid;
    const char *file = model->schedule.path[line->file], *gas = model->schedule.gas[line->gas];
    double *share = emissions->share + FIELD(grid->padded, i, 0);
    double low = 1e5 * line->from_km, high = 1e5 * line->to_km;
    if (at_ground(line)) {
        share[0] = 1.0;
        return 0;
    }
    if (high > grid->edge[grid->layers] * (1.0 + 1e-12))
        return fault_at(fault, file, line->row,
                        "%s, line \"%.60s\": to_km is %g, above the top of the column, %g km; lower it", gas,
                        line->label, line->to_km, 1e-5 * grid->edge[grid->layers]);
    int h = 0;
    while (h < model->held && model->held_species[h] != emissions->species[i])
        h++;
    double free_share = 0.0;
    for (int l = 0; l < grid->layers; l++) {
        double inside = fmin(high, grid->edge[l + 1]) - fmax(low, grid->edge[l]);
        share[l] = inside > 0.0 ? inside / (high - low) : 0.0;
        if (h == model->held || model->held_free[FIELD(grid->padded, h, l)] != 0.0)
            free_share += share[l];
    }
    if (free_share > 0.0)
        return 0;
    return fault_at(
        fault, file, line->row,
        "%s, line \"%.60s\": it is given off where a table of the case holds %s (below %g km), and would do "
        "nothing; raise to_km",
        gas, line->label, gas, model->settings.tropopause_km);
}

static int set_line(Emissions *emissions, const Model *model, int i, Fault *fault)
{
    const ScheduleLine *line = line_of(model, i);
    const Mechanism *mechanism = model->mechanism;
    const char *gas = model->schedule.gas[line->gas];
    int s = mechanism_solved(mechanism, gas);
    if (s < 0)
        return fault_at(
            fault, model->schedule.path[line->file], line->row,
            "gas %s is not an active species of mechanism %s; correct the name or add the species", gas,
            mechanism->path);
    if (!mechanism->item[mechanism->solved_item[s]].transport)
        return fault_at(
            fault, model->schedule.path[line->file], line->row,
            "gas %s is too short-lived to be carried (transport = false in %s); emit a species that is", gas,
            mechanism->path);
    emissions->species[i] = s;
    int g = 0;
    while (g < emissions->given && emissions->given_species[g] != s)
        g++;
    if (g == emissions->given)
        emissions->given_species[emissions->given++] = s;
    return set_molecules(emissions, model, i, fault) || set_share(emissions, model, i, fault) ? fault->code
                                                                                              : 0;
}

static Emissions *allocate(int lines, const Model *model, Fault *fault)
{
    size_t count = (size_t)lines;
    Emissions *emissions = calloc(1, sizeof *emissions);
    if (emissions) {
        emissions->lines = lines;
        emissions->species = calloc(count + 1, sizeof(int));
        emissions->given_species = calloc(count + 1, sizeof(int));
        emissions->molecules = calloc(count + 1, sizeof(double));
        emissions->share = calloc(count * (size_t)model->grid.padded + 1, sizeof(double));
        if (emissions->species && emissions->given_species && emissions->molecules && emissions->share)
            return emissions;
    }
    emissions_free(emissions);
    fault_memory(fault, "emissions");
    return NULL;
}

int emissions_make(Emissions **made, const Model *model, Fault *fault)
{
    *made = NULL;
    Emissions *emissions = allocate(model->schedule.lines, model, fault);
    if (!emissions)
        return fault->code;
    int code = 0;
    for (int i = 0; !code && i < emissions->lines; i++)
        code = set_line(emissions, model, i, fault);
    if (code) {
        emissions_free(emissions);
        return code;
    }
    *made = emissions;
    return 0;
}

void emissions_free(Emissions *emissions)
{
    if (!emissions)
        return;
    free(emissions->species);
    free(emissions->given_species);
    free(emissions->molecules);
    free(emissions->share);
    free(emissions);
}

int emissions_copy(Emissions **made, const Emissions *from, const Model *model, Fault *fault)
{
    *made = NULL;
    size_t lines = (size_t)from->lines;
    Emissions *copy = allocate(from->lines, model, fault);
    if (!copy)
        return fault->code;
    copy->given = from->given;
    memcpy(copy->species, from->species, lines * sizeof(int));
    memcpy(copy->given_species, from->given_species, lines * sizeof(int));
    memcpy(copy->molecules, from->molecules, lines * sizeof(double));
    memcpy(copy->share, from->share, lines * (size_t)model->grid.padded * sizeof(double));
    *made = copy;
    return 0;
}

/* ---- use ---- */

void emissions_at(const Model *model, double time, double *flux, double *ground, double *layer)
{
    const Emissions *emissions = model->emissions;
    size_t solved = (size_t)model->mechanism->solved, padded = (size_t)model->grid.padded;
    if (flux)
        memset(flux, 0, solved * sizeof(double));
    if (ground)
        memset(ground, 0, solved * sizeof(double));
    if (layer)
        memset(layer, 0, solved * padded * sizeof(double));
    for (int i = 0; i < emissions->lines; i++) {
        int s = emissions->species[i];
        double rate = schedule_emission(&model->schedule, i, time) * emissions->molecules[i] / YEAR_SECONDS;
        if (flux)
            flux[s] += rate;
        if (ground && at_ground(line_of(model, i)))
            ground[s] += rate;
        for (int l = 0; layer && l < model->grid.layers; l++)
            layer[FIELD(padded, s, l)] += rate * emissions->share[FIELD(padded, i, l)];
    }
}
