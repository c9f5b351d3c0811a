/* step: one outer step of the column: half the chemistry, the transport, half the chemistry (Strang 1968).
 *
 * The stiff part comes last (Sportisse 2000): a step leaves radicals in balance with each other instead of
 * smeared by diffusion. With explicit days the step is a day in eight parts, each transport, chemistry,
 * transport: in the mesosphere diffusion works within hours, and on profiles that differ between day and
 * night.
 *
 * Before the step, photolysis rates, uptake on aerosol and diurnal factors are made afresh where the state
 * has moved enough. Packs of layers are independent within the chemistry and go through it in parallel;
 * everything that is summed over them is summed in order afterwards, so that results do not depend on the
 * number of threads.
 */
#ifndef SKYMEND_STEP_H
#define SKYMEND_STEP_H

#include "day.h"
#include "pack.h"

/* Time spent by part, s, for the bench. */
typedef struct {
    double transport, chemistry, light, factors;
} StepClock;

typedef struct Stepper Stepper;

/* threads < 1: as many as OpenMP gives. The model must outlive the stepper. Owner: caller. */
int stepper_make(Stepper **made, const Model *model, int threads, Fault *fault);
void stepper_free(Stepper *stepper);

/* Advance column by step s (DAY_EXPLICIT: step must be one day). frozen = 1 keeps the schedule at
 * column->time and the clock where it is (spin-up). On a fault the column holds a partly advanced state. */
int stepper_advance(Stepper *stepper, Column *column, double step, int frozen, Fault *fault);

/* Light and coefficients and, with_day, unless the case runs on daily means, diurnal factors afresh for the
 * daily means column->x, whatever has moved or not; the state and its time stay. With explicit days the
 * factors, which such a run does without, tell what the day makes of the means (stepper_day). */
int stepper_refresh(Stepper *stepper, Column *column, int with_day, Fault *fault);

/* Mean mole fractions over the last step [solved][padded]: of its two ends, or of the explicit day. */
const double *stepper_mean(const Stepper *stepper);
const Light *stepper_light(const Stepper *stepper);
const Day *stepper_day(const Stepper *stepper);
StepClock stepper_clock(const Stepper *stepper);
/* Rate coefficients of the last step without factors, [reactions][padded]; photolysis rows hold day means
 * (Light.mean). */
const double *stepper_coefficients(const Stepper *stepper);

#endif
