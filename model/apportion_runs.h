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

/* Fill in column of the whole, of each item's effect and of all, and the counts of steps. */
int apportion_runs(Apportionment *to, const Model *model, int threads, ApportionPace *pace, Fault *fault);

#endif
