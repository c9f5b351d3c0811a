/* steady: the column at rest under the surface values of one moment.
 *
 * Newton's method on the unsplit equations (unsplit.h) with pseudo-transient continuation (Kelley and Keyes
 * 1998, SIAM J. Numer. Anal. 35, 508): each iteration is a linearly implicit Euler step of length h, which
 * grows the faster the less the step changed, until it is Newton's step. A step that would take a number
 * density below zero by more than STEADY_BELOW is not taken but tried again with a quarter of its length; no
 * value is ever set. The slopes of the light are used when they are known, else the light follows the state
 * from iteration to iteration (each then leaves some three tenths of the error, and costs as much less).
 *
 * The state is settled when a step of Newton's changes no species by more than STEADY_CHANGE of itself. That
 * counts the slowest gases as well (CFC-115 lives five centuries): at that length of step nothing is slow.
 *
 * With diurnal factors Newton's method, at frozen factors, and explicit days (stepper_refresh) take turns
 * until the ozone of no layer moves by more than STEADY_OZONE of itself from one turn to the next.
 */
#ifndef SKYMEND_STEADY_H
#define SKYMEND_STEADY_H

#include "step.h"
#include "unsplit.h"

#define STEADY_BELOW 1e-2       /* cm-3 */
#define STEADY_SCARCE 10.0      /* cm-3: below it a species' change is measured against this */
#define STEADY_CHANGE 1e-8      /* of a density in Newton's last step */
#define STEADY_TURN_CHANGE 1e-4 /* the same while the factors are still to change */
#define STEADY_OZONE 1e-3 /* of ozone between turns of factors; factors themselves settle to DAY_SETTLED */
#define STEADY_ITERATIONS 300 /* in one turn, rejected steps included */
#define STEADY_TURNS 25

typedef struct {
    int iterations, rejected, turns; /* steps taken, steps not taken, turns of the factors */
    double residual;                 /* largest |tendency| of an unknown over the sum of its gross rates */
    int worst_species, worst_layer;  /* where */
    double change;                   /* largest relative change in the last step of Newton's */
    double ozone_change; /* largest relative change of a layer's ozone in the last turn; 0 of means */
    double seconds;
} SteadyReport;

/* Settle x [solved][padded] at the factors and kept values of unsplit; x is where it starts. FAULT_NUMERICS,
 * with residual, species and altitude, when it does not come to rest; *steady tells how far it got. */
int steady_settle(Unsplit *unsplit, double *x, SteadyReport *steady, Fault *fault);

/* The same for the surface values of a time, with the factors of the case made for the settled state. column:
 * in, where to start; out, settled, its time that time. FAULT_INPUT for a sun with seasons. The stepper is
 * left with the light and coefficients of that state and the factors of the last turn; unsplit has the same.
 */
int steady_find(Unsplit *unsplit, Stepper *stepper, Column *column, double time, SteadyReport *steady,
                Fault *fault);
/* On from a state of steady_find, or one near it (a value or flux of unsplit's changed a little), until ozone
 * moves by no more than ozone from one turn to the next. Neither the column's time nor unsplit's values are
 * touched. */
int steady_tighten(Unsplit *unsplit, Stepper *stepper, Column *column, double ozone, SteadyReport *steady,
                   Fault *fault);

#endif
