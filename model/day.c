/* day: diurnal factors. */
#include "day.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* A reaction matters for convergence when it is this share of the loss of one of its reactants, and faster
 * than this, cm-3 s-1: in a year it then turns over 3e5 cm-3, of ozone's 1e10 and more. */
static const double SHARE_THAT_MATTERS = 0.01, RATE_THAT_MATTERS = 0.01;
/* Species whose midnight value is within this of the mean have no diurnal course worth watching. */
static const double FLAT = 0.05;
/* Mole fraction below which no change is worth watching: a tenth of a part per trillion destroys no ozone to
 * speak of. */
static const double ENOUGH = 1e-13;

int day_make(Day **made, const Model *model, Fault *fault)
{
    *made = NULL;
    Day *day = calloc(1, sizeof *day);
    if (!day)
        return fault_memory(fault, "diurnal factors");
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    size_t reactions = (size_t)model->mechanism->reactions;
    day->model = model;
    day->conditions = model->base;
    day->factor = malloc(reactions * padded * sizeof(double));
    day->ratio = malloc(solved * padded * sizeof(double));
    day->lit = malloc(solved * padded * sizeof(double));
    day->reference = calloc(solved * padded, sizeof(double));
    day->sum_y = calloc(solved * padded, sizeof(double));
    day->sum_lit = calloc(solved * padded, sizeof(double));
    day->sum_w = calloc(reactions * padded, sizeof(double));
    day->loss = calloc(solved, sizeof(double));
    if (!day->factor || !day->ratio || !day->lit || !day->reference || !day->sum_y || !day->sum_lit ||
        !day->sum_w || !day->loss) {
        day_free(day);
        return fault_memory(fault, "diurnal factors");
    }
    for (size_t i = 0; i < reactions * padded; i++)
        day->factor[i] = 1.0;
    for (size_t i = 0; i < solved * padded; i++)
        day->ratio[i] = day->lit[i] = 1.0;
    *made = day;
    return 0;
}

void day_free(Day *day)
{
    if (!day)
        return;
    free(day->factor);
    free(day->ratio);
    free(day->lit);
    free(day->reference);
    free(day->sum_y);
    free(day->sum_lit);
    free(day->sum_w);
    free(day->loss);
    free(day);
}

int day_stale(const Day *day, const double *x)
{
    return day_stale_by(day, x, 1.0);
}

int day_stale_by(const Day *day, const double *x, double times)
{
    if (!day->ready || day->outdated)
        return 1;
    const Model *model = day->model;
    int padded = model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < model->grid.layers; l++) {
            size_t at = FIELD(padded, s, l);
            if (fabs(day->ratio[at] - 1.0) < FLAT || !(x[at] > ENOUGH || day->reference[at] > ENOUGH))
                continue;
            if (fabs(x[at] - day->reference[at]) >
                times * model->settings.refresh_state * fmax(day->reference[at], ENOUGH))
                return 1;
        }
    return 0;
}

static size_t fields(const Day *day, int rows)
{
    return (size_t)rows * (size_t)day->model->grid.padded;
}

void day_copy(Day *to, const Day *from)
{
    size_t field = fields(from, from->model->mechanism->solved) * sizeof(double);
    size_t rates = fields(from, from->model->mechanism->reactions) * sizeof(double);
    memcpy(to->factor, from->factor, rates);
    memcpy(to->ratio, from->ratio, field);
    memcpy(to->lit, from->lit, field);
    memcpy(to->reference, from->reference, field);
    memcpy(to->sum_y, from->sum_y, field);
    memcpy(to->sum_lit, from->sum_lit, field);
    memcpy(to->sum_w, from->sum_w, rates);
    to->outdated = from->outdated;
    to->ready = from->ready;
}

void day_midnight(const Day *day, const double *x, double *start)
{
    for (size_t i = 0; i < fields(day, day->model->mechanism->solved); i++)
        start[i] = x[i] * day->ratio[i];
}

void day_clear(Day *day)
{
    memset(day->sum_y, 0, fields(day, day->model->mechanism->solved) * sizeof(double));
    memset(day->sum_lit, 0, fields(day, day->model->mechanism->solved) * sizeof(double));
    memset(day->sum_w, 0, fields(day, day->model->mechanism->reactions) * sizeof(double));
}

static void take_ratios(Day *day, const double *end, double lit_time)
{
    int padded = day->model->grid.padded;
    for (int s = 0; s < day->model->mechanism->solved; s++)
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, s, l);
            double mean = day->sum_y[at] / DAY_SECONDS, midnight = end[at] * day->conditions->air[l];
            int there = mean > DAY_ABSENT;
            /* a value below zero is within the solver's tolerance of zero, and a ratio cannot say more than
             * that */
            day->ratio[at] = there ? fmax(0.0, midnight) / mean : 1.0;
            day->lit[at] = there && lit_time > 0.0 ? fmax(0.0, day->sum_lit[at]) / lit_time / mean : 1.0;
        }
}

/* One layer; returns the largest change among reactions that matter. */
static double take_factors(Day *day, const Light *light, int layer, const double *coefficient)
{
    const Mechanism *mechanism = day->model->mechanism;
    const Kernel *kernel = day->model->kernel;
    int padded = day->model->grid.padded;
    double change = 0.0;
    memset(day->loss, 0, (size_t)mechanism->solved * sizeof(double));
    for (int r = 0; r < kernel->reactions; r++)
        for (int i = 0; i < kernel->order[r]; i++)
            day->loss[kernel->reactant[3 * r + i]] += day->sum_w[FIELD(padded, r, layer)] / DAY_SECONDS;
    for (int r = 0; r < kernel->reactions; r++) {
        size_t at = FIELD(padded, r, layer);
        int lit = r >= mechanism->photolysis_first && r < mechanism->surface_first;
        double mean =
            lit ? light->mean[FIELD(padded, r - mechanism->photolysis_first, layer)] : coefficient[at];
        double rate = day->sum_w[at] / DAY_SECONDS, last = day->factor[at];
        int absent = !(mean > 0.0), matters = 0;
        for (int i = 0; i < kernel->order[r]; i++) {
            int s = kernel->reactant[3 * r + i];
            double y = day->sum_y[FIELD(padded, s, layer)] / DAY_SECONDS;
            absent |= !(y > DAY_ABSENT);
            mean *= y;
            matters |= rate > SHARE_THAT_MATTERS * day->loss[s] && rate > RATE_THAT_MATTERS;
        }
        absent |= !(mean > 0.0) || !(rate > 0.0);
        day->factor[at] = absent ? 1.0 : rate / mean;
        if (matters && !absent)
            change = fmax(change, fabs(day->factor[at] - last) / fmax(day->factor[at], last));
    }
    return change;
}

double day_take(Day *day, const Light *light, const double *end, double lit_time, const double *coefficient)
{
    double change = 0.0;
    take_ratios(day, end, lit_time);
    for (int l = 0; l < day->model->grid.padded; l++)
        change = fmax(change, take_factors(day, light, l, coefficient));
    return change;
}

void day_settle(Day *day, const double *x)
{
    memcpy(day->reference, x, fields(day, day->model->mechanism->solved) * sizeof(double));
    day->outdated = 0;
    day->ready = 1;
}
