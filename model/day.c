/* day: diurnal factors from the explicit day. */
#include "day.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* A reaction matters for convergence when it is this share of the loss of one of its reactants. */
static const double SHARE_THAT_MATTERS = 0.01;
/* Mean number density, cm-3, below which a reactant is as good as absent and its factors stay 1: one molecule in 10 l. */
static const double ABSENT = 1e-4;
/* Species whose midnight value is within this of the mean have no diurnal course worth watching. */
static const double FLAT = 0.05;

int day_make(Day **made, const Model *model, Fault *fault) {
    *made = NULL;
    Day *day = calloc(1, sizeof *day);
    if (!day) return fault_memory(fault, "diurnal factors");
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    size_t reactions = (size_t)model->mechanism->reactions;
    day->model = model;
    day->factor = malloc(reactions * padded * sizeof(double));
    day->ratio = malloc(solved * padded * sizeof(double));
    day->reference = calloc(solved * padded, sizeof(double));
    day->step = calloc(padded / PACK, sizeof(double));
    if (!day->factor || !day->ratio || !day->reference || !day->step) {
        day_free(day);
        return fault_memory(fault, "diurnal factors");
    }
    for (size_t i = 0; i < reactions * padded; i++) day->factor[i] = 1.0;
    for (size_t i = 0; i < solved * padded; i++) day->ratio[i] = 1.0;
    *made = day;
    return 0;
}

void day_free(Day *day) {
    if (!day) return;
    free(day->factor);
    free(day->ratio);
    free(day->reference);
    free(day->step);
    free(day);
}

int day_stale(const Day *day, const double *x) {
    if (!day->ready) return 1;
    const Model *model = day->model;
    int padded = model->grid.padded;
    /* A tenth of a part per trillion of anything destroys no ozone worth counting. */
    const double enough = 1e-13;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < model->grid.layers; l++) {
            size_t at = FIELD(padded, s, l);
            if (fabs(day->ratio[at] - 1.0) < FLAT || !(x[at] > enough || day->reference[at] > enough)) continue;
            if (fabs(x[at] - day->reference[at]) > model->settings.refresh_state * fmax(day->reference[at], enough))
                return 1;
        }
    return 0;
}

int day_fault(const Model *model, int first, int result, int where, double time, Fault *fault) {
    static const char *const why[] = {"", "needed too many steps", "shrank its step to nothing", "met a value that is no number"};
    int species = model->kernel->species, lane = where / species, s = where % species;
    int layer = first + lane < model->grid.layers ? first + lane : model->grid.layers - 1;
    const char *name = s < model->mechanism->solved ? mechanism_name(model->mechanism, s) : "an atom counter";
    return fault_set(fault, FAULT_NUMERICS,
                     "year %.2f, altitude %.2f km, species %s: the chemistry solver %s; check the mechanism's rates or loosen "
                     "numerics.relative_tolerance",
                     time, 1e-5 * model->grid.middle[layer], name, why[result]);
}

/* Factors of one pack from the sums of one day; returns the largest change among reactions that matter. */
static double take_factors(Day *day, const PackWork *work, const Light *light, int first, const double *coefficient) {
    const Model *model = day->model;
    const Mechanism *mechanism = model->mechanism;
    const Kernel *kernel = model->kernel;
    int padded = model->grid.padded;
    double change = 0.0;
    memset(work->loss, 0, (size_t)kernel->species * PACK * sizeof(double));
    for (int r = 0; r < kernel->reactions; r++)
        for (int i = 0; i < kernel->order[r]; i++)
            for (int l = 0; l < PACK; l++)
                work->loss[kernel->reactant[3 * r + i] * PACK + l] += work->sum_w[r * PACK + l] / DAY_SECONDS;
    for (int l = 0; l < PACK; l++)
        for (int r = 0; r < kernel->reactions; r++) {
            int lit = r >= mechanism->photolysis_first && r < mechanism->surface_first;
            double mean = lit ? light->mean[FIELD(padded, r - mechanism->photolysis_first, first + l)]
                              : coefficient[FIELD(padded, r, first + l)];
            double rate = work->sum_w[r * PACK + l] / DAY_SECONDS;
            int absent = !(mean > 0.0), matters = 0;
            for (int i = 0; i < kernel->order[r]; i++) {
                int s = kernel->reactant[3 * r + i];
                double y = work->sum_y[s * PACK + l] / DAY_SECONDS;
                absent |= !(y > ABSENT);
                mean *= y;
                matters |= rate > SHARE_THAT_MATTERS * work->loss[s * PACK + l];
            }
            double *factor = &day->factor[FIELD(padded, r, first + l)], last = *factor;
            *factor = absent || !(mean > 0.0) || !(rate > 0.0) ? 1.0 : rate / mean;
            if (matters && !absent) change = fmax(change, fabs(*factor - last) / fmax(*factor, last));
        }
    return change;
}

static void hold(PackWork *work) {
    for (int h = 0; h < work->held; h++)
        for (int l = 0; l < PACK; l++)
            if (work->held_free[h * PACK + l] == 0.0)
                work->y[work->held_species[h] * PACK + l] = work->held_value[h * PACK + l];
}

/* Densities at midnight: daily means of the run times the ratios of the last day. */
static void set_midnight(const Day *day, PackWork *work, int first, const double *x) {
    int padded = day->model->grid.padded;
    pack_load(work, day->model, first, x);
    for (int s = 0; s < day->model->mechanism->solved; s++)
        for (int l = 0; l < PACK; l++) work->y[s * PACK + l] *= day->ratio[FIELD(padded, s, first + l)];
}

static void take_ratios(Day *day, const PackWork *work, int first) {
    int padded = day->model->grid.padded;
    for (int s = 0; s < day->model->mechanism->solved; s++)
        for (int l = 0; l < PACK; l++) {
            double mean = work->sum_y[s * PACK + l] / DAY_SECONDS;
            day->ratio[FIELD(padded, s, first + l)] = mean > ABSENT ? fmax(0.0, work->y[s * PACK + l]) / mean : 1.0;
        }
}

int day_factors(Day *day, PackWork *work, const Light *light, int first, const double *x, const double *coefficient,
                double time, const Tolerance *tolerance, SolverCounts *counts, long *days, int *settled, Fault *fault) {
    const Model *model = day->model;
    int padded = model->grid.padded, solved = model->mechanism->solved, pack = first / PACK;
    *days = 0;
    *settled = 0;
    pack_load(work, model, first, x);
    while (day->ready ? !*settled && *days < DAY_MOST : *days < DAY_COLD) {
        if (day->ready) set_midnight(day, work, first, x);
        hold(work);
        memset(work->sum_y, 0, (size_t)model->kernel->species * PACK * sizeof(double));
        memset(work->sum_w, 0, (size_t)model->kernel->reactions * PACK * sizeof(double));
        pack_rates(work, model, first, coefficient, light->mean, NULL);
        int where, result = pack_day(work, light, first, 1, tolerance, &day->step[pack], counts, &where);
        if (result) return day_fault(model, first, result, where, time, fault);
        ++*days;
        take_ratios(day, work, first);
        *settled = take_factors(day, work, light, first, coefficient) < DAY_SETTLED;
    }
    for (int s = 0; s < solved; s++)
        memcpy(day->reference + FIELD(padded, s, first), x + FIELD(padded, s, first), PACK * sizeof(double));
    return 0;
}
