/* projection: the column through the years of a case. */
#ifndef SKYMEND_PROJECTION_H
#define SKYMEND_PROJECTION_H

#include <signal.h>

#include "archive.h"
#include "step.h"

typedef struct {
    int spinning_up;
    double time;      /* decimal years */
    double share;     /* of the work done, 0..1 */
    double column_du; /* ozone column now */
} Progress;

/* What the outside sees of a run. Any of the functions may be NULL. */
typedef struct {
    int (*record)(void *context, const Record *record,
                  Fault *fault); /* every output interval; non-zero stops the run */
    void (*progress)(void *context, const Progress *progress); /* every outer step */
    void *context;
    volatile sig_atomic_t *stop; /* checked every outer step; non-zero: FAULT_INTERRUPTED */
} Watcher;

/* Start as numerics.start says, settled or spun up at the first year's values, then run first_year..last_year
 * of the case, both included. The ledger of column is opened after the start. */
int projection_run(const Model *model, Stepper *stepper, Column *column, const Watcher *watcher,
                   Fault *fault);
/* The same in parts, so that a run can be left and taken up again (column_copy, stepper_copy): the start, the
 * clock then at the first year and the ledger open; output intervals from first to end - 1 of the run, which
 * has years times outputs_per_year, column standing at the start of the first; the outer steps these take.
 * share of the progress: of these intervals. projection_run is the start and all intervals. */
int projection_begin(const Model *model, Stepper *stepper, Column *column, const Watcher *watcher,
                     Fault *fault);
int projection_continue(const Model *model, Stepper *stepper, Column *column, long first, long end,
                        const Watcher *watcher, Fault *fault);
long projection_steps(const Model *model, long first, long end);
/* Only the settled start: column at rest under the values of its time (steady.h), stepper with the light and
 * factors of that state. */
int projection_settle(const Model *model, Stepper *stepper, Column *column, Fault *fault);
/* Only the spin-up (years of it), schedule and clock held. share_of_all scales the progress. */
int projection_spin_up(const Model *model, Stepper *stepper, Column *column, double years,
                       double share_of_all, const Watcher *watcher, Fault *fault);

#endif
