/* pack: loading, storing and the explicit day of one pack of layers. */
#include "pack.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* Who carries each element. Not O, of which air is an endless store, and F, which ends in an inert sum. */
static void list_carriers(PackWork *work, const Model *model)
{
    const Mechanism *mechanism = model->mechanism;
    const Kernel *kernel = model->kernel;
    int rows = kernel->species + kernel->tallies;
    for (int e = 0; e < mechanism->elements; e++) {
        if (!strcmp(mechanism->element[e], "O") || !strcmp(mechanism->element[e], "F"))
            continue;
        for (int row = 0; row < rows; row++) {
            double atoms;
            if (row < mechanism->solved)
                atoms = mechanism_atoms(mechanism, row, e);
            else if (row < kernel->species)
                atoms = kernel->counter_element[row - mechanism->solved] == e;
            else
                atoms = mechanism_atoms(
                    mechanism, kernel->reactant[3 * kernel->tally_reaction[row - kernel->species]], e);
            if (atoms == 0.0)
                continue;
            int at = e * rows + work->carriers[e]++;
            work->carrier[at] = row;
            work->carried[at] = atoms;
        }
    }
}

int pack_make(PackWork **made, const Model *model, Fault *fault)
{
    *made = NULL;
    PackWork *work = calloc(1, sizeof *work);
    if (!work)
        return fault_memory(fault, "chemistry of a pack");
    work->conditions = model->base;
    size_t species = (size_t)model->kernel->species, reactions = (size_t)model->kernel->reactions;
    size_t tallies = (size_t)model->kernel->tallies;
    struct {
        double **array;
        size_t rows;
    } part[] = {{&work->y, species},         {&work->k, reactions},        {&work->slope, reactions},
                {&work->sum_y, species},     {&work->sum_w, reactions},    {&work->tally, tallies},
                {&work->held_free, species}, {&work->held_value, species}, {&work->atoms, MECHANISM_ELEMENTS},
                {&work->source, species},    {&work->production, species}, {&work->loss, species}};
    size_t rows = 0, parts = sizeof part / sizeof part[0];
    for (size_t i = 0; i < parts; i++)
        rows += part[i].rows;
    work->block = aligned_alloc(PACK * sizeof(double), rows * PACK * sizeof(double));
    work->held_species = calloc(species, sizeof(int));
    work->carriers = calloc(MECHANISM_ELEMENTS, sizeof(int));
    work->carrier = calloc(MECHANISM_ELEMENTS * (species + tallies), sizeof(int));
    work->carried = calloc(MECHANISM_ELEMENTS * (species + tallies), sizeof(double));
    int code = work->block && work->held_species && work->carriers && work->carrier && work->carried
                   ? solver_work_make(&work->solver, model->kernel, fault)
                   : fault_memory(fault, "chemistry of a pack");
    if (code) {
        pack_free(work);
        return code;
    }
    memset(work->block, 0, rows * PACK * sizeof(double));
    double *at = work->block;
    for (size_t i = 0; i < parts; i++) {
        *part[i].array = at;
        at += part[i].rows * PACK;
    }
    list_carriers(work, model);
    *made = work;
    return 0;
}

void pack_free(PackWork *work)
{
    if (!work)
        return;
    solver_work_free(work->solver);
    free(work->held_species);
    free(work->carriers);
    free(work->carrier);
    free(work->carried);
    free(work->block);
    free(work);
}

/* Atoms cm-3 of an element in each lane: species, counters and tallies. */
static void count_atoms(const PackWork *work, const Model *model, int element, double *atoms)
{
    int rows = model->kernel->species + model->kernel->tallies;
    const int *carrier = work->carrier + element * rows;
    const double *carried = work->carried + element * rows;
    memset(atoms, 0, PACK * sizeof(double));
    for (int c = 0; c < work->carriers[element]; c++) {
        int row = carrier[c];
        const double *y = row < model->kernel->species ? work->y + row * PACK
                                                       : work->tally + (row - model->kernel->species) * PACK;
        for (int l = 0; l < PACK; l++)
            atoms[l] += carried[c] * y[l];
    }
}

static void restore_atoms(PackWork *work, const Model *model)
{
    int rows = model->kernel->species + model->kernel->tallies;
    for (int e = 0; e < model->mechanism->elements; e++) {
        if (!work->carriers[e])
            continue;
        double now[PACK];
        count_atoms(work, model, e, now);
        for (int l = 0; l < PACK; l++) {
            double before = work->atoms[e * PACK + l], defect = before - now[l], most = 0.0;
            int best = -1;
            if (defect == 0.0 || !(fabs(defect) <= PACK_ROUND_OFF * before))
                continue;
            for (int c = 0; c < work->carriers[e] && work->carrier[e * rows + c] < model->mechanism->solved;
                 c++) {
                double here = work->carried[e * rows + c] * work->y[work->carrier[e * rows + c] * PACK + l];
                if (here <= most)
                    continue;
                most = here;
                best = c;
            }
            if (best >= 0)
                work->y[work->carrier[e * rows + best] * PACK + l] += defect / work->carried[e * rows + best];
        }
    }
}

void pack_load(PackWork *work, const Model *model, int first, const double *x)
{
    int padded = model->grid.padded, solved = model->mechanism->solved;
    const double *air = work->conditions->air + first;
    for (int s = 0; s < solved; s++) {
        const double *row = x + FIELD(padded, s, first);
        for (int l = 0; l < PACK; l++)
            work->y[s * PACK + l] = row[l] * air[l];
    }
    memset(work->y + solved * PACK, 0, (size_t)(model->kernel->species - solved) * PACK * sizeof(double));
    memset(work->tally, 0, (size_t)model->kernel->tallies * PACK * sizeof(double));
    work->held = 0;
    for (int h = 0; h < model->held; h++) {
        const double *free_here = model->held_free + FIELD(padded, h, first);
        const double *fraction = work->conditions->held_fraction + FIELD(padded, h, first);
        int any = 0, row = work->held * PACK;
        for (int l = 0; l < PACK; l++) {
            any |= free_here[l] == 0.0;
            work->held_free[row + l] = free_here[l];
            work->held_value[row + l] = fraction[l] * air[l];
        }
        if (any)
            work->held_species[work->held++] = model->held_species[h];
    }
    for (int s = 0; first == 0 && s < solved; s++) {
        if (!work->conditions->kept[s])
            continue;
        double *free_here = work->held_free + work->held * PACK,
               *value = work->held_value + work->held * PACK;
        for (int l = 0; l < PACK; l++) {
            free_here[l] = l > 0;
            value[l] = l > 0 ? 0.0 : work->y[s * PACK];
        }
        work->held_species[work->held++] = s;
    }
    for (int e = 0; e < model->mechanism->elements; e++)
        if (work->carriers[e])
            count_atoms(work, model, e, work->atoms + e * PACK);
}

void pack_source(PackWork *work, const Model *model, int first, const double *balance, double duration)
{
    int padded = model->grid.padded, solved = model->mechanism->solved;
    int rows = model->kernel->species + model->kernel->tallies;
    const double *air = work->conditions->air + first;
    for (int s = 0; s < solved; s++)
        for (int l = 0; l < PACK; l++)
            work->source[s * PACK + l] = balance[FIELD(padded, s, first + l)] * air[l];
    for (int e = 0; e < model->mechanism->elements; e++)
        for (int c = 0; c < work->carriers[e] && work->carrier[e * rows + c] < solved; c++)
            for (int l = 0; l < PACK; l++)
                work->atoms[e * PACK + l] += work->carried[e * rows + c] *
                                             work->source[work->carrier[e * rows + c] * PACK + l] * duration;
}

void pack_rates(PackWork *work, const Model *model, int first, const double *coefficient,
                const double *mean_light, const double *factor)
{
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded;
    for (int r = 0; r < mechanism->reactions; r++) {
        int lit = r >= mechanism->photolysis_first && r < mechanism->surface_first;
        const double *row = lit ? mean_light + FIELD(padded, r - mechanism->photolysis_first, first)
                                : coefficient + FIELD(padded, r, first);
        double *k = work->k + r * PACK;
        if (factor) {
            const double *f = factor + FIELD(padded, r, first);
            for (int l = 0; l < PACK; l++)
                k[l] = row[l] * f[l];
        } else {
            for (int l = 0; l < PACK; l++)
                k[l] = row[l];
        }
    }
}

void pack_store(PackWork *work, const Model *model, int first, double *x, PackLedger *ledger)
{
    int padded = model->grid.padded, solved = model->mechanism->solved;
    int lanes = model->grid.layers - first < PACK ? model->grid.layers - first : PACK;
    const double *air = work->conditions->air + first, *depth = work->conditions->depth + first;
    const double *fraction = work->conditions->held_fraction;
    restore_atoms(work, model);
    for (int s = 0; s < solved; s++) {
        double *row = x + FIELD(padded, s, first), kept = row[0];
        for (int l = 0; l < PACK; l++)
            row[l] = work->y[s * PACK + l] / air[l];
        if (first)
            continue;
        ledger->received[s] = 0.0;
        if (!work->conditions->kept[s])
            continue;
        ledger->received[s] = (kept * air[0] - work->y[s * PACK]) * depth[0];
        row[0] = kept;
    }
    for (int h = 0; h < model->held; h++) {
        ledger->exchanged[h] = 0.0;
        for (int l = 0; l < PACK; l++) {
            size_t at = FIELD(padded, h, first + l);
            if (model->held_free[at] != 0.0)
                continue;
            int s = model->held_species[h];
            if (l < lanes) {
                double held = fraction[at] * air[l];
                ledger->exchanged[h] += (held - work->y[s * PACK + l]) * depth[l];
            }
            x[FIELD(padded, s, first + l)] = fraction[at];
        }
    }
    for (int t = 0; t < model->kernel->tallies; t++) {
        ledger->washed[t] = 0.0;
        for (int l = 0; l < lanes; l++)
            ledger->washed[t] += work->tally[t * PACK + l] * depth[l];
    }
    for (int c = 0; c < model->kernel->counters; c++) {
        ledger->escaped[c] = 0.0;
        for (int l = 0; l < lanes; l++)
            ledger->escaped[c] += work->y[(solved + c) * PACK + l] * depth[l];
    }
}

void pack_turnover(const PackWork *work, const Model *model, int first, double *made, double *lost)
{
    const double *air = work->conditions->air + first;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < PACK; l++) {
            size_t at = FIELD(model->grid.padded, s, first + l);
            made[at] = work->production[s * PACK + l] / air[l];
            lost[at] = work->loss[s * PACK + l] * work->y[s * PACK + l] / air[l];
        }
}

int pack_fault(const Model *model, int first, int result, int where, double time, Fault *fault)
{
    static const char *const why[] = {"", "needed too many steps", "shrank its step to nothing",
                                      "met a value that is no number"};
    int species = model->kernel->species, lane = where / species, s = where % species;
    int layer = first + lane < model->grid.layers ? first + lane : model->grid.layers - 1;
    const char *name = s < model->mechanism->solved ? mechanism_name(model->mechanism, s) : "an atom counter";
    return fault_set(fault, FAULT_NUMERICS,
                     "year %.2f, altitude %.2f km, species %s: the chemistry solver %s; check the "
                     "mechanism's rates or loosen "
                     "numerics.relative_tolerance",
                     time, 1e-5 * model->grid.middle[layer], name, why[result]);
}

PackProblem pack_problem(const PackWork *work, int sums, double step)
{
    return (PackProblem){
        .y = work->y,
        .k = work->k,
        .held = work->held,
        .held_species = work->held_species,
        .held_free = work->held_free,
        .held_value = work->held_value,
        .tally = work->tally,
        .sum_y = sums ? work->sum_y : NULL,
        .sum_w = sums ? work->sum_w : NULL,
        .step = step,
    };
}

/* Photolysis rows of k at one knot. */
static void lit_rates(PackWork *work, const Light *light, int first, int knot)
{
    int padded = light->model->grid.padded, start = light->model->mechanism->photolysis_first;
    for (int j = 0; j < light->reactions; j++) {
        const double *row = light->knot + FIELD(padded, knot * light->reactions + j, first);
        memcpy(work->k + (start + j) * PACK, row, PACK * sizeof(double));
    }
}

/* Slopes from k at this knot to the next knot. */
static void lit_slopes(PackWork *work, const Light *light, int first, int next_knot, double length)
{
    int padded = light->model->grid.padded, start = light->model->mechanism->photolysis_first;
    for (int j = 0; j < light->reactions; j++) {
        const double *row = light->knot + FIELD(padded, next_knot * light->reactions + j, first);
        double *slope = work->slope + (start + j) * PACK;
        const double *k = work->k + (start + j) * PACK;
        for (int l = 0; l < PACK; l++)
            slope[l] = (row[l] - k[l]) / length;
    }
}

static void dark_rates(PackWork *work, const Light *light)
{
    memset(work->k + light->model->mechanism->photolysis_first * PACK, 0,
           (size_t)light->reactions * PACK * sizeof(double));
}

enum { NOON = SUN_KNOTS - 1 };
_Static_assert(NOON % PACK_MORNING_PARTS == 0, "the parts of the morning must end at knots");

/* The part of the morning half that this one is or mirrors. */
static int morning_part(int part)
{
    return part < PACK_DAY_PARTS / 2 ? part : PACK_DAY_PARTS - 1 - part;
}

/* Knot at which a lit part of the morning begins; the next part's knot is its end. */
static int part_knot(int part)
{
    return (part - PACK_NIGHT_PARTS) * (NOON / PACK_MORNING_PARTS);
}

double pack_part_length(const Light *light, int part)
{
    const Sun *sun = &light->sun;
    part = morning_part(part);
    if (part < PACK_NIGHT_PARTS)
        return (sun->rises ? sun->time[0] : 0.5 * DAY_SECONDS) / PACK_NIGHT_PARTS;
    return sun->rises ? sun->time[part_knot(part + 1)] - sun->time[part_knot(part)] : 0.0;
}

int pack_part_lit(int part)
{
    return morning_part(part) >= PACK_NIGHT_PARTS;
}

double pack_lit_time(const Light *light)
{
    double time = 0.0;
    for (int part = 0; part < PACK_DAY_PARTS; part++)
        if (pack_part_lit(part))
            time += pack_part_length(light, part);
    return time;
}

int pack_part(PackWork *work, const Light *light, int first, int part, const Tolerance *tolerance,
              double *step, SolverCounts *counts, int *where)
{
    const Kernel *kernel = light->model->kernel;
    const Sun *sun = &light->sun;
    double length = pack_part_length(light, part);
    if (!(length > 0.0))
        return SOLVER_DONE;
    PackProblem problem = pack_problem(work, 1, *step);
    int code = SOLVER_DONE;
    double first_step = 0.0;
    if (!pack_part_lit(part)) {
        dark_rates(work, light);
        code = solver_advance(kernel, work->solver, &problem, length, tolerance, counts, where);
        first_step = problem.first;
    } else {
        int afternoon = part >= PACK_DAY_PARTS / 2, way = afternoon ? -1 : 1, like = morning_part(part);
        int here = part_knot(like + afternoon), end = part_knot(like + !afternoon);
        problem.k_slope = work->slope;
        problem.slope_first = light->model->mechanism->photolysis_first;
        problem.slope_last = light->model->mechanism->surface_first;
        for (; !code && here != end; here += way) {
            double interval = fabs(sun->time[here + way] - sun->time[here]);
            lit_rates(work, light, first, here);
            lit_slopes(work, light, first, here + way, interval);
            code = solver_advance(kernel, work->solver, &problem, interval, tolerance, counts, where);
            if (first_step == 0.0)
                first_step = problem.first;
        }
    }
    *step = first_step; /* tomorrow's part starts like today's, not like today's ended */
    return code;
}
