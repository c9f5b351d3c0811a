/* balance: a column in balance with the conditions of one time, the schedule and the clock held. */
#ifndef SKYMEND_BALANCE_H
#define SKYMEND_BALANCE_H

#include "projection.h"

typedef struct {
    Column *column;
    Stepper *stepper;
    double drift; /* DU by which the ozone column moved in the last year carried; NAN below two years */
} Balance;

/* Carry model's column for years under the schedule of decimal year time: from x [solved][padded], or from
 * the initial profiles when x is NULL. The slowest exchange of the stratosphere takes 5 to 10 years. threads
 * as in stepper_make. watcher->progress is told how far it is. Owner: caller, balance_free. The model must
 * outlive it. */
int balance_make(Balance *balance, const Model *model, const double *x, double time, double years,
                 int threads, const Watcher *watcher, Fault *fault);
void balance_free(Balance *balance);
/* Daily means of the state, [solved][padded]: column->x, or with explicit days the mean of the last of them.
 */
const double *balance_means(const Balance *balance, const Model *model);

#endif
