/* steady: Newton's method with pseudo-transient continuation. */
#include "steady.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* s: the first step, in which radicals that start from nothing move half-way; the first after the factors
 * have moved; the length that counts as Newton's: a hundred million years; and where to give up. */
static const double FIRST = 1.0, AGAIN = 1e7, NEWTON = 3e15, SHORTEST = 1e-6;

/* How much longer the next step is, by the largest relative change of the last one. */
static double growth(double change)
{
    return change < 1e-3 ? 1e4 : change < 0.1 ? 100.0 : change < 0.3 ? 10.0 : change < 0.9 ? 4.0 : 2.0;
}

typedef struct {
    double *tendency, *step, *turnover;
} Room;

static double at(const Unsplit *unsplit, const double *x, int i)
{
    return x[FIELD(unsplit->model->grid.padded, i % unsplit->solved, i / unsplit->solved)];
}

static double air_of(const Unsplit *unsplit, int i)
{
    return unsplit->conditions->air[i / unsplit->solved];
}

static void find_residual(const Unsplit *unsplit, const double *x, const Room *room, SteadyReport *steady)
{
    unsplit_turnover(unsplit, x, room->turnover);
    steady->residual = 0.0;
    for (int i = 0; i < unsplit->unknowns; i++) {
        if (unsplit->kept[i] || !(fabs(room->tendency[i]) > 0.0))
            continue;
        /* what is scarcer than counts has no balance to judge: its turnover is at least that of STEADY_SCARCE
         * once in a century */
        double least = STEADY_SCARCE / air_of(unsplit, i) / (100.0 * YEAR_SECONDS);
        double value = fabs(room->tendency[i]) / fmax(room->turnover[i], least);
        if (!(value <= steady->residual)) {
            steady->residual = value;
            steady->worst_species = i % unsplit->solved;
            steady->worst_layer = i / unsplit->solved;
        }
    }
}

static int not_settled(const Unsplit *unsplit, const SteadyReport *steady, const char *why, Fault *fault)
{
    const Model *model = unsplit->model;
    return fault_set(
        fault, FAULT_NUMERICS,
        "no steady state: %s after %d steps; the residual is %.2g of the gross rate at species %s, "
        "altitude %.2f km; check the case, or give numerics.start = \"spinup\"",
        why, steady->iterations, steady->residual, mechanism_name(model->mechanism, steady->worst_species),
        1e-5 * model->grid.middle[steady->worst_layer]);
}

/* The step in room->step: its largest relative change, and whether it falls below zero. */
static int judge(const Unsplit *unsplit, const double *x, const Room *room, double *change)
{
    int falls = 0;
    *change = 0.0;
    for (int i = 0; i < unsplit->unknowns; i++) {
        double before = at(unsplit, x, i), step = room->step[i], air = air_of(unsplit, i);
        double value = fabs(step) / fmax(fmax(fabs(before), fabs(before + step)), STEADY_SCARCE / air);
        if (isnan(value))
            return 1;
        *change = fmax(*change, value);
        falls |= step < 0.0 && (before + step) * air < -STEADY_BELOW;
    }
    return falls || !isfinite(*change);
}

static int iterate(Unsplit *unsplit, double *x, const Room *room, double first, double enough,
                   SteadyReport *steady, Fault *fault)
{
    int padded = unsplit->model->grid.padded, solved = unsplit->solved, fresh = 0;
    double h = first;
    unsplit_keep(unsplit, x);
    for (int tries = 0; tries < STEADY_ITERATIONS; tries++) {
        if (!fresh)
            unsplit_evaluate(unsplit, x, room->tendency, 1);
        fresh = 1;
        int code = unsplit_factorise(unsplit, x, 1.0 / h, 1, fault);
        if (code)
            return code;
        for (int i = 0; i < unsplit->unknowns; i++)
            room->step[i] = -room->tendency[i];
        unsplit_solve(unsplit, room->step, 0);
        double change;
        if (judge(unsplit, x, room, &change)) {
            steady->rejected++;
            h *= 0.25;
            if (!(h >= SHORTEST)) {
                find_residual(unsplit, x, room, steady);
                return not_settled(unsplit, steady, "the step shrank to nothing", fault);
            }
            continue;
        }
        for (int i = 0; i < unsplit->unknowns; i++)
            x[FIELD(padded, i % solved, i / solved)] += room->step[i];
        unsplit_keep(unsplit, x);
        fresh = 0;
        steady->iterations++;
        steady->change = change;
        if (h >= NEWTON && change <= enough) {
            unsplit_evaluate(unsplit, x, room->tendency, 1);
            find_residual(unsplit, x, room, steady);
            return 0;
        }
        h = fmin(h * growth(change), NEWTON);
    }
    unsplit_evaluate(unsplit, x, room->tendency, 1);
    find_residual(unsplit, x, room, steady);
    return not_settled(unsplit, steady, "the state still moves", fault);
}

static int settle_from(Unsplit *unsplit, double *x, double first, double enough, SteadyReport *steady,
                       Fault *fault)
{
    size_t n = (size_t)unsplit->unknowns;
    double *block = malloc(3 * n * sizeof(double));
    if (!block)
        return fault_memory(fault, "the steady state");
    Room room = {block, block + n, block + 2 * n};
    int code = iterate(unsplit, x, &room, first, enough, steady, fault);
    free(block);
    return code;
}

int steady_settle(Unsplit *unsplit, double *x, SteadyReport *steady, Fault *fault)
{
    *steady = (SteadyReport){0};
    double since = omp_get_wtime();
    int code = settle_from(unsplit, x, FIRST, STEADY_CHANGE, steady, fault);
    steady->seconds = omp_get_wtime() - since;
    return code;
}

/* Largest relative change of a layer's ozone, and now becomes before. */
static double ozone_moved(const Unsplit *unsplit, const double *x, double *before)
{
    const Model *model = unsplit->model;
    int padded = model->grid.padded, ozone = mechanism_solved(model->mechanism, "O3");
    double most = 0.0;
    for (int l = 0; l < unsplit->layers; l++) {
        double now = x[FIELD(padded, ozone, l)];
        most = fmax(most, fabs(now - before[l]) / fmax(now, before[l]));
        before[l] = now;
    }
    return most;
}

/* Until ozone moves by no more than enough. first: s, the first step. */
static int take_turns(Unsplit *unsplit, Stepper *stepper, Column *column, double first, double enough,
                      SteadyReport *steady, Fault *fault)
{
    double before[SETTINGS_MAX_EDGES];
    ozone_moved(unsplit, column->x, before);
    for (;; first = AGAIN) {
        int code = stepper_refresh(stepper, column, 1, fault);
        if (code)
            return code;
        unsplit_take_factors(unsplit, stepper_day(stepper));
        code = settle_from(unsplit, column->x, first, STEADY_TURN_CHANGE, steady, fault);
        if (code)
            return code;
        steady->turns++;
        steady->ozone_change = ozone_moved(unsplit, column->x, before);
        if (steady->turns > 1 && steady->ozone_change <= enough)
            return settle_from(unsplit, column->x, NEWTON, STEADY_CHANGE, steady, fault);
        if (steady->turns == STEADY_TURNS)
            return fault_set(
                fault, FAULT_NUMERICS,
                "no steady state: after %d turns of diurnal factors ozone still moves by %.2g of "
                "itself; check the case, or give numerics.start = \"spinup\"",
                steady->turns, steady->ozone_change);
    }
}

int steady_find(Unsplit *unsplit, Stepper *stepper, Column *column, double time, SteadyReport *steady,
                Fault *fault)
{
    *steady = (SteadyReport){0};
    if (unsplit->model->settings.sun == SUN_SEASON)
        return fault_set(fault, FAULT_INPUT,
                         "with sun.kind = \"season\" the column is never at rest; take another sun, or, to "
                         "project, numerics.start = \"spinup\"");
    double since = omp_get_wtime();
    column->time = time;
    unsplit_set_time(unsplit, time);
    unsplit_keep(unsplit, column->x);
    int code;
    if (unsplit->model->settings.day == DAY_MEAN) {
        unsplit_take_factors(unsplit, NULL);
        code = settle_from(unsplit, column->x, FIRST, STEADY_CHANGE, steady, fault);
    } else {
        code = take_turns(unsplit, stepper, column, FIRST, STEADY_OZONE, steady, fault);
    }
    if (!code)
        code = stepper_refresh(stepper, column, 0, fault);
    steady->seconds = omp_get_wtime() - since;
    return code;
}

int steady_tighten(Unsplit *unsplit, Stepper *stepper, Column *column, double ozone, SteadyReport *steady,
                   Fault *fault)
{
    *steady = (SteadyReport){0};
    double since = omp_get_wtime();
    int code = unsplit->has_factors ? take_turns(unsplit, stepper, column, AGAIN, ozone, steady, fault)
                                    : settle_from(unsplit, column->x, AGAIN, STEADY_CHANGE, steady, fault);
    if (!code)
        code = stepper_refresh(stepper, column, 0, fault);
    steady->seconds = omp_get_wtime() - since;
    return code;
}
