/* pack: one pack of layers on its way through the chemistry: the bridge between fields and the solver.
 *
 * A PackWork belongs to one thread. Loading gathers PACK layers of every field into [row][PACK] blocks;
 * storing puts them back and says what crossed the column's borders on the way.
 */
#ifndef SKYMEND_PACK_H
#define SKYMEND_PACK_H

#include "column.h"
#include "light.h"

#define PACK_ROUND_OFF 1e-10 /* relative defect of an element's atoms that counts as round-off */

typedef struct {
    const Conditions *conditions; /* Model.base until the stepper sets its own */
    SolverWork *solver;
    double *y;                      /* [kernel species][PACK] cm-3 */
    double *k;                      /* [reactions][PACK] */
    double *slope;                  /* [reactions][PACK] per s; rows of photolysis only */
    double *sum_y;                  /* [kernel species][PACK] cm-3 s */
    double *sum_w;                  /* [reactions][PACK] cm-3 */
    double *tally;                  /* [tallies][PACK] cm-3 */
    double *source;                 /* [kernel species][PACK] cm-3 s-1 */
    double *production, *loss;      /* [kernel species][PACK] cm-3 s-1, s-1: as of PackProblem */
    double *held_free, *held_value; /* [held][PACK] */
    double *atoms;                  /* [elements][PACK] atoms cm-3 at loading */
    int *carriers; /* [elements] rows (species, then counters, then tallies) that hold an element; 0 for O and
                      F */
    int *carrier;  /* [elements][rows] which */
    double *carried;         /* [elements][rows] atoms of the element in each */
    int held, *held_species; /* prescribed somewhere in this pack: below the tropopause, or in the lowest
                                layer by the ground */
    void *block;
} PackWork;

/* What crossed the borders in one pack, per cm2 of ground. */
typedef struct {
    double *exchanged; /* [held species of the model] given by the reservoir that holds it */
    double *received;  /* [solved] given by the ground to gases it keeps at a value; only the lowest pack has
                          any */
    double *washed;    /* [tallies] */
    double escaped[MECHANISM_ELEMENTS]; /* [counters] atoms */
} PackLedger;

int pack_make(PackWork **made, const Model *model, Fault *fault);
void pack_free(PackWork *work);

/* y = x N, held lanes (for gases kept by the ground: at their x of the lowest layer) and empty counters and
 * tallies of the pack that starts at layer first. */
void pack_load(PackWork *work, const Model *model, int first, const double *x);
/* source = balance N [solved][padded], for a call that lasts duration s. To come after pack_load. */
void pack_source(PackWork *work, const Model *model, int first, const double *balance, double duration);
/* What the last call's chemistry made and lost at its end, mole fraction s-1: rows of fields
 * [solved][padded]. */
void pack_turnover(const PackWork *work, const Model *model, int first, double *made, double *lost);
/* k = coefficient, photolysis rows from mean light [photolysis][padded], times factor [reactions][padded]
 * (NULL: 1). */
void pack_rates(PackWork *work, const Model *model, int first, const double *coefficient,
                const double *mean_light, const double *factor);
/* x = y / N and the ledger of this pack; held lanes go back to their values, the difference counted. Values
 * below zero are left as they are. The solver keeps the atoms of every element but for the round-off of its
 * linear algebra, about 1e-12 a call and always the same way once the state is steady; that much, and not
 * more than PACK_ROUND_OFF, is put back onto the element's most abundant carrier in the lane. A larger defect
 * is a fault of the chemistry and stays for the ledger to show. */
void pack_store(PackWork *work, const Model *model, int first, double *x, PackLedger *ledger);
/* FAULT_NUMERICS for a solver that failed in the pack that starts at layer first, naming altitude and
 * species. */
int pack_fault(const Model *model, int first, int result, int where, double time, Fault *fault);
/* The solver's problem over this pack; sums = 1 asks for time integrals. slope and source are not set. */
PackProblem pack_problem(const PackWork *work, int sums, double step);

/* A day goes in PACK_DAY_PARTS parts: PACK_NIGHT_PARTS of the night to sunrise, PACK_MORNING_PARTS of the
 * morning, and their mirror images about noon. Length of a part, s: the same for a part and its image; 0
 * where there is no night. */
#define PACK_NIGHT_PARTS 4
#define PACK_MORNING_PARTS 4
#define PACK_DAY_PARTS (2 * (PACK_NIGHT_PARTS + PACK_MORNING_PARTS))
double pack_part_length(const Light *light, int part);
int pack_part_lit(int part);
/* s of a day with the sun up. */
double pack_lit_time(const Light *light);

/* Carry y through one part of the day under its light; k must hold everything but photolysis. Time integrals
 * are added to sum_y and sum_w. step in/out: the solver's step to try first. Returns enum SolverResult;
 * *where as solver_advance. */
int pack_part(PackWork *work, const Light *light, int first, int part, const Tolerance *tolerance,
              double *step, SolverCounts *counts, int *where);

#endif
