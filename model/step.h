/* step: one outer step of the column: half the chemistry, the transport, half the chemistry (Strang 1968).
 *
 * The stiff part comes last (Sportisse 2000): a step leaves radicals in balance with each other instead of
 * smeared by diffusion. In runs of means the two halves are balanced, for species of O, H and C alone (Speth
 * et al. 2013, SIAM J. Numer. Anal. 51, 3084): the chemistry works with a source b = Column.balance, the
 * transport with -b, b being what transport does on average less what the chemistry does, halved. In the
 * mesosphere diffusion is as fast as the turnover of ozone, and no plain splitting by days comes out right
 * there. With explicit days the step is a day in sixteen parts, each transport, chemistry, transport.
 *
 * Before the step, photolysis rates, uptake on aerosol and diurnal factors are made afresh where the state
 * has moved enough. Packs of layers are independent within the chemistry and go through it in parallel;
 * everything that is summed over them is summed in order afterwards, so that results do not depend on the
 * number of threads.
 */
#ifndef SKYMEND_STEP_H
#define SKYMEND_STEP_H

#include "day.h"
#include "moments.h"
#include "pack.h"

/* Time spent by part, s, for the bench. */
typedef struct {
    double transport, chemistry, light, factors;
} StepClock;

typedef struct Stepper Stepper;

/* threads < 1: as many as OpenMP gives. The model must outlive the stepper. Owner: caller. */
int stepper_make(Stepper **made, const Model *model, int threads, Fault *fault);
void stepper_free(Stepper *stepper);

/* Make to, whose next steps are then those of from to the last bit, whatever the two did before. Both of one
 * case; their models may differ in what the lines give off (Model.emissions), their threads in number. Which
 * log to keep or follow is not copied, how far it has come is. */
void stepper_copy(Stepper *to, const Stepper *from);

/* When light and diurnal factors were made afresh in a run, step by step, so that another run can do so at
 * the same moments. Whether a refresh is due depends on the state by thresholds, and each moves the column by
 * some 0.01 DU: in two runs that refresh at their own moments a difference of 0.01 DU drowns. */
typedef struct {
    long room;            /* steps it can hold */
    unsigned char *light; /* [room] 1: photolysis rates */
    unsigned char *days;  /* [room] days carried for the factors; 0: none made */
} RefreshLog;

int refresh_log_make(RefreshLog *log, long room, Fault *fault);
void refresh_log_free(RefreshLog *log);
/* From the next step on, which is the log's first, note the moments in log; NULL: no more. The steps must fit
 * in. Meanwhile the light is made afresh whenever the factors are: by its threshold alone, in years when the
 * column of the log stands still, it would not be, and runs that follow would go by their own moments. */
void stepper_keep_log(Stepper *stepper, RefreshLog *log);
/* From the next step on, which is as many steps into the log as the stepper (or the one it was copied from)
 * has kept or followed it, refresh when the log says so, and besides when the state has moved by
 * REFRESH_OWN_ACCORD times the case's thresholds: so that a run far away from that of the log is right as
 * well. NULL: by the thresholds alone. */
#define REFRESH_OWN_ACCORD 1.5
void stepper_follow_log(Stepper *stepper, const RefreshLog *log);

/* Advance column by step s (DAY_EXPLICIT: step must be one day). frozen = 1 keeps the schedule at
 * column->time and the clock where it is (spin-up). On a fault the column holds a partly advanced state. */
int stepper_advance(Stepper *stepper, Column *column, double step, int frozen, Fault *fault);

/* Light and coefficients and, with_day, unless the case runs on daily means, diurnal factors afresh for the
 * daily means column->x, whatever has moved or not; the state and its time stay. With explicit days the
 * factors, which such a run does without, tell what the day makes of the means (stepper_day). */
int stepper_refresh(Stepper *stepper, Column *column, int with_day, Fault *fault);

/* Set the balance to that of a column at rest: what transport does to it now. Not for a column that is not:
 * the balance of one that moves is found step by step. */
void stepper_balance(const Stepper *stepper, Column *column);

/* Mean mole fractions over the last step [solved][padded]: of its two ends, or of the explicit day. */
const double *stepper_mean(const Stepper *stepper);
const Light *stepper_light(const Stepper *stepper);
/* What surrounds the chemistry in the last step. */
const Conditions *stepper_conditions(const Stepper *stepper);
const Day *stepper_day(const Stepper *stepper);
/* Mole fractions by time of day that belong to the daily means [solved][padded]; day.mode other than
 * DAY_MEAN. out [MOMENTS][solved][padded]. */
void stepper_moments(const Stepper *stepper, const double *mean, double *out);
StepClock stepper_clock(const Stepper *stepper);
/* Rate coefficients of the last step without factors, [reactions][padded]; photolysis rows hold day means
 * (Light.mean). */
const double *stepper_coefficients(const Stepper *stepper);

#endif
