/* apportion_runs: the runs of an apportionment, their common part carried once. Private to apportion*.c. */
#ifndef SKYMEND_APPORTION_RUNS_H
#define SKYMEND_APPORTION_RUNS_H

#include "apportion.h"

/* Progress over all runs. */
typedef struct {
    const Watcher *outer;
    double from, share; /* what these runs are of everything */
    long done, total;   /* outer steps */
} ApportionPace;

/* ---- apportion.c ---- */

/* Items, gases not apportioned and room for columns. Owner: caller, apportion_free. */
int apportion_list(Apportionment **made, const Model *model, const ApportionAsk *ask, Fault *fault);
/* benchmark, return_year and returns of the whole, from its column. */
int apportion_return(Apportionment *to, Fault *fault);

/* ---- apportion_runs.c ---- */

/* Fill in column of the whole, of each item's effect and of all, and the counts of steps. */
int apportion_runs(Apportionment *to, const Model *model, int threads, ApportionPace *pace, Fault *fault);

#endif
