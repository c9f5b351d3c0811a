/* rosenbrock_kernel: what rosenbrock.c and its vector variants share; private to those files.
 *
 * rosenbrock_kernel.c is compiled once per vector instruction set with SOLVER_SUFFIX set; rosenbrock.c picks
 * the widest variant the machine runs.
 */
#ifndef SKYMEND_ROSENBROCK_KERNEL_H
#define SKYMEND_ROSENBROCK_KERNEL_H

#include "../input/constants.h"
#include "rosenbrock.h"

/* Rows of PACK doubles, 64-byte aligned. "Seen" is what the rates see of a state: held lanes replaced, and
 * row `species` all ones, the partner of reactants that are not there. */
struct SolverWork {
    double *u;        /* [species + 1] state at the start of the step, seen */
    double *stage_u;  /* [species + 1] stage argument, seen */
    double *w;        /* [reactions] rates at the start of the step */
    double *w3, *w4;  /* [reactions] rates of stages 3 and 4 */
    double *d;        /* [derivatives] at the start of the step */
    double *jacobian; /* [entries] */
    double *lu;       /* [entries] */
    double *pivot;    /* [species] reciprocal pivots */
    double *f;        /* [species] tendency at the start of the step */
    double *slope;    /* [species] df/dt at fixed y */
    double *stage;    /* [4][species] K1..K4 */
    double *next;     /* [species] candidate state */
    double *k;        /* [reactions] coefficients at the start of the step, when they change in time */
    double *k_end;    /* [reactions] coefficients at its end, likewise */
    double *free;     /* [species] 1 free, 0 held */
    double *held;     /* [species] held value, 0 where free */
    double *rhs;      /* [species] by elimination position */
    void *block;      /* the one allocation behind all of these */
    /* sources of each species among the reactions whose coefficients change in time, and the range they are
     * for */
    int32_t *slope_from, *slope_to; /* [species] */
    int slope_first, slope_last;
};

typedef int SolverAdvance(const Kernel *, SolverWork *, PackProblem *, double, const Tolerance *,
                          SolverCounts *, int *);
typedef void SolverEvaluate(const Kernel *, SolverWork *, const PackProblem *, double *, double *);

SolverAdvance solver_advance_baseline;
SolverEvaluate solver_evaluate_baseline;
#ifdef SKYMEND_X86
SolverAdvance solver_advance_avx2, solver_advance_avx512;
SolverEvaluate solver_evaluate_avx2, solver_evaluate_avx512;
#endif

typedef struct {
    const char *name;
    SolverAdvance *advance;
    SolverEvaluate *evaluate;
} SolverVariant;

/* The variants this build holds and this machine runs, narrowest first; returns how many, at least 1. For
 * tests and timings. */
#define SOLVER_VARIANTS 3
int solver_variants(SolverVariant variant[SOLVER_VARIANTS]);

#endif
