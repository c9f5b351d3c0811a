/* rosenbrock: stiff chemistry of one pack of layers, error-controlled.
 *
 * RODAS3 (Sandu et al. 1997, Atmos. Environ. 31, 3459): four stages, order 3(2), L-stable, stiffly accurate,
 * with an analytic sparse Jacobian. All PACK layers of a pack share the step, chosen for the worst of them.
 * Rate coefficients may change linearly in time within one call, so sunrise and sunset are resolved without
 * a jump.
 *
 * A step that takes a value below minus the absolute tolerance (or minus twice the lowest value given) is
 * rejected, whatever its error.
 *
 * Held species (prescribed on some layers, e.g. tropospheric OH): in those lanes every rate sees the held
 * value, and the species' own row integrates what the chemistry would have changed: the exchange with the
 * reservoir that holds it. Linear invariants (atoms) are therefore kept exactly, exchange included: to
 * round-off of what turns over during a step.
 */
#ifndef SKYMEND_ROSENBROCK_H
#define SKYMEND_ROSENBROCK_H

#include "kernel.h"

typedef struct {
    double relative; /* of the step's error, root mean square over the species */
    double absolute; /* molecules cm-3: counts in full where a species is scarcer than absolute / relative */
    int max_steps;   /* per call */
} Tolerance;

typedef struct {
    long calls, steps, rejections, factorisations;
    long negatives;       /* values below zero (no lower than a step may fall) at the ends of calls */
    double most_negative; /* lowest value met at the end of a call, cm-3 */
} SolverCounts;

/* What one call works on. Arrays over [.][PACK], 64-byte aligned. */
typedef struct {
    double *y;             /* [species][PACK] number densities, cm-3, in place; counters of the kernel last */
    const double *k;       /* [reactions][PACK] coefficients at the start of the call */
    const double *k_slope; /* [reactions][PACK] per s, or NULL: constant. Only reactions in
                              [slope_first, slope_last), which must hold no tallied one */
    int slope_first, slope_last;
    int held;                 /* species held somewhere in this pack */
    const int *held_species;  /* [held] */
    const double *held_free;  /* [held][PACK] 1 where free, 0 where held */
    const double *held_value; /* [held][PACK] value where held, 0 where free */
    double *tally;            /* [tallies][PACK] events added, cm-3; may be NULL */
    /* Chemical turnover at the start of the last step, or both NULL: gross production cm-3 s-1 (of a gas that
     * reacts with itself up to twice that) and loss frequency s-1, [species][PACK] out */
    double *production, *loss;
    const double *source; /* [species][PACK] what comes from outside at a constant rate (below zero: goes),
                             cm-3 s-1, or NULL: nothing */
    /* Time integrals added: of y as the rates see it and of the rates, of order 3 and consistent with the
     * step: what a row changes by is the sum of its sources' integrals, to round-off. Both or none NULL. */
    double *sum_y; /* [species][PACK] cm-3 s */
    double *sum_w; /* [reactions][PACK] cm-3 */
    double step;   /* s: in: first step to try (<= 0: chosen); out: step to try next */
    double
        first; /* s, out: the step that suited the start of this call: to try first when a like call comes */
} PackProblem;

typedef struct SolverWork SolverWork; /* one per thread */
int solver_work_make(SolverWork **made, const Kernel *kernel, Fault *fault);
void solver_work_free(SolverWork *work);

enum SolverResult {
    SOLVER_DONE = 0,
    SOLVER_TOO_MANY_STEPS = 1,
    SOLVER_STEP_UNDERFLOW = 2,
    SOLVER_NOT_FINITE = 3
};

/* Advance problem by duration s. Chooses the widest vector code the machine runs. On failure y, tally and
 * sums stand at the last accepted step, and *where names the lane and species that failed (lane * species +
 * s). Returns enum SolverResult. */
int solver_advance(const Kernel *kernel, SolverWork *work, PackProblem *problem, double duration,
                   const Tolerance *tolerance, SolverCounts *counts, int *where);

/* Which vector code solver_advance runs: "avx512", "avx2" or "baseline". */
const char *solver_variant(void);

/* f and the Jacobian of one pack at y, for tests: f [species][PACK]; jacobian [species][species][PACK] dense,
 * or NULL. */
void solver_evaluate(const Kernel *kernel, SolverWork *work, const PackProblem *problem, double *f,
                     double *jacobian);

#endif
