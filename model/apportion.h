/* apportion: which line of a schedule costs how much ozone and how many months of delay, by leaving it out.
 *
 * The whole case is carried through its years, and again without each item (the lines of one label, of one
 * gas, or of both) and without all of them. For each:
 *
 *     lost   = integral over the years of the run of (column without - column of the whole), DU-years
 *     delay  = return of the whole - return without, to the whole's own column of the benchmark year
 *
 * Apportioned is what the lines give off in the years of the run. What is in the air when they begin, and
 * gases that their abundance drives, are the same in every run. The effects of the items do not quite add up
 * to that of all of them, since ozone answers to chlorine and bromine together; the remainder is told. With
 * a share below 1 only that share of each item is taken away and its effect divided by it: as the share
 * goes to 0 the remainder does (the derivative).
 *
 * All runs are one until an item first gives something off: that much is carried once, with the settled
 * start, and left by copies (column_copy, stepper_copy). From there on they make light and diurnal factors
 * afresh at the moments of the whole (RefreshLog), or the differences would drown in those of the moments.
 * Runs are spread over the threads, a run a thread; the result does not depend on their number.
 *
 * The quick way, without those runs: the whole is carried once, columns are settled at the abundances it has
 * in APPORTION_YEARS of its years, and potency.h gives what a molecule of each gas takes from the ozone
 * there, summed over all time to come. A line then costs
 *
 *     all time = sum over years of emission times the mean over t of D(year + t) k(t)
 *
 * with D interpolated linearly between those years (constant outside) and k the share of the effect that
 * falls into each later year (pulse.h, at the middle one of those years). What of it falls within the years
 * of the run stands beside the runs' `lost`.
 *
 * The numerical error of each figure is how far it moves when everything is done twice as coarsely
 * (apportion_coarser). It does not count that of the layers.
 */
#ifndef SKYMEND_APPORTION_H
#define SKYMEND_APPORTION_H

#include "projection.h"

#define APPORTION_YEARS 3

enum ApportionBy { APPORTION_LINE, APPORTION_GAS, APPORTION_BOTH };

/* How a return was found. */
enum DelayKind {
    DELAY_FOUND,      /* both runs return */
    DELAY_AT_LEAST,   /* the whole does not return within the years, the run without does: months are to the
                         end of the last year */
    DELAY_NO_RETURN,  /* neither returns */
    DELAY_NEVER_BELOW /* the run without never falls below the benchmark, or the whole does not */
};

/* What one run shows against the whole. Everything but the years and return_year is divided by the share. */
typedef struct {
    double lost;    /* DU-years */
    double largest; /* DU: largest difference of yearly means, with its sign: above 0 the item takes ozone */
    int largest_year;
    double last; /* DU: difference in the last year */
    int delay_kind;
    double delay;       /* months; NAN where delay_kind has none */
    double return_year; /* of the run itself; NAN when it does not return */
    double *column;     /* [years] DU, yearly means of the run itself */
} Effect;

/* How far the figures moved when done coarsely; 0 where nothing was run, NAN where one of the two has none.
 */
typedef struct {
    double lost, largest, last, delay, return_year;
} EffectError;

typedef struct {
    const char *label; /* of its lines; NULL: any (in the text of the model) */
    int gas;           /* of the schedule; -1: any */
    int lines, *line;  /* indices in the schedule */
    int first_year;    /* in which it gives something off, in the run; 0: never, and its effect is 0 */
    double *kg;        /* [lines] of the gas itself, in the years of the run */
    Effect effect;
    EffectError error;
    /* the quick way: DU-years for all time and within the run; NAN where a gas is given off aloft, taken
     * up by the ground, or without a derivative. error: of all_time, noise of the derivatives plus what fewer
     * years of them would change */
    double all_time, within, all_time_error;
} ApportionItem;

typedef struct {
    int first_year, years, by, benchmark_year;
    double share;
    int items;
    ApportionItem *item; /* [items] in order of the schedule */
    double *column;      /* [years] DU, yearly means of the whole */
    double benchmark; /* DU: the whole's column of the benchmark year; NAN when that is no year of the run */
    double return_year; /* of the whole; NAN when it does not return */
    int returns;        /* as Answers.returns */
    Effect all;         /* without any item */
    EffectError all_error;
    double sum, sum_error;             /* of lost over the items, DU-years; sum of their errors */
    double remainder, remainder_error; /* all.lost - sum; how far it moved */
    double return_error;
    int has_errors, quick;
    int background[APPORTION_YEARS];                     /* years the derivatives are of */
    double sum_all_time, sum_within, sum_all_time_error; /* over the items that have them */
    int kept_lines;                                      /* lines of the labels to keep */
    int not_apportioned, *abundance_gas;  /* gases of the schedule that lines of the run do not drive */
    long steps_shared, steps_alone, runs; /* outer steps carried once, and if every run had been carried
                                             whole; the runs (coarse ones not counted) */
    double seconds, seconds_run;          /* wall: all of it; of one run from its fork, on one thread, mean */
} Apportionment;

typedef struct {
    int by, benchmark_year, threads; /* threads < 1: as many as OpenMP gives */
    double share;                    /* taken away of each item, above 0 to 1 */
    int errors;                      /* 1: once more coarsely */
    const char *const *keep;         /* [keeps] labels whose lines stay in every run and are no item */
    int keeps;
} ApportionAsk;

/* FAULT_INPUT when no line gives anything off in the years of the case, or a label to keep is none;
 * FAULT_INTERRUPTED when watcher says so. progress and stop of watcher are used; progress is called by one
 * thread at a time, share over all runs. Owner: caller; model must outlive it. */
int apportion_make(Apportionment **made, const Model *model, const ApportionAsk *ask, const Watcher *watcher,
                   Fault *fault);
/* The quick way: items with all_time and within, column of the whole; no runs without items, no errors of
 * runs (ask->errors, ask->share are not looked at). FAULT_INPUT for a sun with seasons besides. */
int apportion_quick(Apportionment **made, const Model *model, const ApportionAsk *ask, const Watcher *watcher,
                    Fault *fault);
/* What of this can be known before a run: the faults of labels to keep and of nothing to apportion. */
int apportion_check(const Model *model, const ApportionAsk *ask, Fault *fault);
void apportion_free(Apportionment *apportionment);

/* Settings of the coarse runs: outer steps and all that makes light and factors afresh twice as rarely, the
 * solver's tolerances twice as wide. */
void apportion_coarser(Settings *settings);

#endif
