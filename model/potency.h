/* potency: what the emission of a gas does to the ozone column, for good.
 *
 * The steady-state ozone depletion potential is the change of the global ozone column per mass emitted per
 * time, the emission kept up until nothing changes any more, over the same of a reference gas, CFC-11
 * (Wuebbles 1983, J. Geophys. Res. 88, 1433; Fisher et al. 1990, Nature 344, 508; WMO assessments since 1989;
 * references from memory):
 *
 *     ODP = (dQ/dE / M) / (dQ/dE / M of the reference)
 *
 * with Q the ozone column, E the flux of the gas through the ground and M its molar mass. All other gases
 * stay at the values or fluxes their grounds keep.
 *
 * Found in two ways. *Frozen*: by the adjoint (sensitivity.h), diurnal factors as they are: one solve a gas,
 * and short, since the factors answer to the gas as well. *Made anew*: two columns beside the settled one,
 * with the value at the ground (or the flux, where the ground keeps none) shifted by as much as moves the
 * column by some POTENCY_CHANGE, settled with factors made anew; E and Q of the three columns give dQ/dE by
 * the parabola through them. E of a gas that the ground keeps is the sum of its chemistry over the column,
 * which at rest is what comes through the ground. Shifts are up and down, or once and twice up where there is
 * too little of the gas to take away.
 *
 * The columns beside are settled by the factored matrix of the settled one, light included, which does not
 * change (chord iteration): each iteration leaves a few per cent of the error. Then the day is gone through
 * again, and so on in turns until the column moves by less than POTENCY_TURN of its shift. In the explicit
 * day the lowest layer is at the ground's own value, unshifted: a day's transport carries nothing of that to
 * where it matters.
 *
 * Which gases: those that the ground keeps at a value, by schedule or fixed, or that no reaction of the
 * mechanism makes; carried, and holding an element other than C, O and F, of which no catalytic family is
 * made. (So not CO, CO2 and CF4; but CH4, H2 and N2O.) Held species (column.h) do not count.
 */
#ifndef SKYMEND_POTENCY_H
#define SKYMEND_POTENCY_H

#include "budget.h"
#include "projection.h"
#include "sensitivity.h"
#include "steady.h"

#define POTENCY_CHANGE 0.25 /* DU */
#define POTENCY_TURN 5e-4   /* of the shift of the column: its move in the last turn */
#define POTENCY_TURNS 12
#define POTENCY_MOST                                                                                         \
    1e-8                  /* shift of the mole fraction at the ground, unless half of what is there is more  \
                           */
#define POTENCY_BASE 1e-5 /* of ozone: the settled column itself, in place of STEADY_OZONE */

typedef struct {
    int species;       /* solved number */
    double molar_mass; /* g mol-1 */
    double abundance;  /* mole fraction in the lowest layer */
    double flux; /* into the settled column through the ground, and given off aloft, molecules cm-2 s-1 */
    GasBudget budget;
    double lifetime; /* burden over gross loss, years; NAN where there is none of the gas */
    /* d(ozone column)/d(flux), DU per (molecule cm-2 s-1) */
    double frozen; /* diurnal factors as they are */
    double anew;   /* factors made anew; NAN when not asked for */
    double noise;  /* of anew, relative: what the last turns still moved, NAN with anew */
    double
        bend; /* of anew, relative: half of what the slopes on either side (or of the two steps) differ by */
    double odp_frozen, odp, odp_noise; /* by mass; noise absolute, that of the reference in it */
} Potency;

typedef struct {
    int count, reference; /* gases; which of them is 1 */
    Potency *gas;         /* [count] in order of the mechanism */
    double ozone;         /* column, DU, of the settled state */
    double unsettled;     /* DU that the column still moved in its last turn of factors */
    int anew;
    double seconds; /* wall, without the settling of the column */
} Potencies;

typedef struct {
    const char *reference; /* NULL: "CFC-11" */
    int frozen;            /* 1: only the adjoint */
    double change;         /* DU; 0: POTENCY_CHANGE */
    const unsigned char
        *wanted; /* [solved] 1: this gas, the reference must be one; NULL: every gas there is */
} PotencyAsk;

/* Solved numbers of the gases, gas [solved] out; returns their count. */
int potency_gases(const Model *model, int *gas);

/* From the state of steady_find, whose unsplit, stepper and column come back settled the tighter. FAULT_INPUT
 * when the reference is no gas of the list or does nothing to the column; FAULT_NUMERICS when a column beside
 * does not settle; FAULT_INTERRUPTED when watcher says so, looked at between turns. progress of watcher: once
 * a gas. Owner: caller. */
int potency_make(Potencies **made, Unsplit *unsplit, Stepper *stepper, Column *column, const PotencyAsk *ask,
                 const Watcher *watcher, Fault *fault);
void potency_free(Potencies *potencies);

/* DU of the global column per Gg a year, from d(column)/d(flux). */
double potency_per_gg_year(double per_flux, double molar_mass);

#endif
