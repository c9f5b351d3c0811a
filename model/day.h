/* day: the explicit repeating day and the diurnal factors it gives.
 *
 * Turco and Whitten (1978, J. Atmos. Terr. Phys. 40, 13): for each reaction and layer the factor is the 24 h mean of
 * the reaction's rate over the product of the 24 h means of its coefficient and its reactants. Multiplying the
 * coefficients of a run that knows only daily means, the factors make its rates those of the real day.
 *
 * Each midnight every species is set to the run's daily mean times the ratio of midnight value to daily mean found on the
 * day before: what transport and slow change would have done over the day happens at midnight. The day is repeated until
 * the factors of all reactions that matter change by less than DAY_SETTLED. The first time, when most radicals of the
 * run are still zero, DAY_COLD days run freely instead.
 */
#ifndef SKYMEND_DAY_H
#define SKYMEND_DAY_H

#include "light.h"
#include "pack.h"

#define DAY_SETTLED 0.005 /* relative change of factors between days at which the day counts as repeating */
#define DAY_MOST 15       /* days tried */
#define DAY_COLD 10       /* days of the first time */

typedef struct {
    const Model *model;
    double *factor;    /* [reactions][padded] */
    double *ratio;     /* [solved][padded] midnight value over daily mean of the last day */
    double *reference; /* [solved][padded] mole fractions when the factors were made */
    double *step;      /* [packs] solver step to try */
    int ready;
} Day;

int day_make(Day **made, const Model *model, Fault *fault);
void day_free(Day *day);

/* 1 when some species with a diurnal course has moved by more than refresh_state since the factors were made. */
int day_stale(const Day *day, const double *x);

/* Make the factors of the pack that starts at layer first from daily means x. coefficient [reactions][padded]: thermal,
 * surface, washout. time: decimal year, for messages. days out: number carried out; settled out: 1 if they repeat. Fault FAULT_NUMERICS naming altitude and species when the solver fails. */
int day_factors(Day *day, PackWork *work, const Light *light, int first, const double *x, const double *coefficient,
                double time, const Tolerance *tolerance, SolverCounts *counts, long *days, int *settled, Fault *fault);

/* FAULT_NUMERICS for a solver that failed in the pack starting at first. */
int day_fault(const Model *model, int first, int result, int where, double time, Fault *fault);

#endif
