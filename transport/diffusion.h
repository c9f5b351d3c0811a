/* diffusion: vertical eddy diffusion of mole fractions, implicit, conservative.
 *
 * Per layer i of thickness dz and density N, with the flux F = -K N dX/dz at edges (up positive):
 *     N_i dz_i dX_i/dt = F_{i-1/2} - F_{i+1/2},   F_top = 0,
 * and at the ground one of: zero flux, a fixed X in the lowest layer, or deposition F = -v N_0 X_0
 * (N_0, X_0 of the lowest layer's middle: first order in its depth; the rest is second order).
 * Time: two-stage L-stable SDIRK (gamma = 1 - 1/sqrt 2, second order; Alexander 1977), solved for
 * stage increments from flux differences, so that a uniform mole fraction gives exactly zero change
 * and a closed column keeps sum(N dz X) to round-off for any step. One tridiagonal factorisation
 * (LAPACK dgttrf) serves both stages and all species with the same ground condition.
 * L-stable is not positive: a step much longer than dz^2/K across a sharp edge can undershoot; the
 * caller decides what a negative value means, nothing is clipped here.
 */
#ifndef SKYMEND_DIFFUSION_H
#define SKYMEND_DIFFUSION_H

#include "../input/fault.h"
#include "air.h"
#include "grid.h"

enum GroundKind { GROUND_CLOSED, GROUND_FIXED, GROUND_DEPOSITION };

typedef struct Diffusion Diffusion;             /* the operator for one grid, air, K: fixed after making */
typedef struct DiffusionFactor DiffusionFactor; /* for one step length and ground condition */

/* eddy: [layers + 1] eddy diffusion coefficient at edges, cm2 s-1 (entries 0 and layers are not
 * looked at); FAULT_INPUT if one is negative or no number. Grid, air and eddy are copied from.
 * Owner: caller, diffusion_free. */
int diffusion_make(Diffusion **made, const Grid *grid, const Air *air, const double *eddy, Fault *fault);
/* The same for the part of the column from layer first up, its layers renumbered from 0: for species that are
 * prescribed below, whose fixed value then stands in layer first (GROUND_FIXED). */
int diffusion_make_above(Diffusion **made, const Grid *grid, const Air *air, const double *eddy, int first,
                         Fault *fault);
void diffusion_free(Diffusion *diffusion); /* accepts NULL */

/* Eddy diffusion coefficient at the edges from CSV (columns altitude_km, eddy_cm2_s-1), linear in
 * log K. FAULT_INPUT unless it covers every edge between layers, altitude increases and
 * 1 <= K <= 1e9 cm2 s-1.
 *   eddy   [layers + 1] out, cm2 s-1; 0 at ground and top, through which nothing diffuses
 *   source [size] out: the header's "source", or else the path */
int diffusion_read_eddy(double *eddy, const Grid *grid, const char *path, char *source, size_t size,
                        Fault *fault);

/* kind, velocity (cm s-1, >= 0, GROUND_DEPOSITION only), step in s (> 0). The diffusion must
 * outlive the factor. Both are read only afterwards and may be shared by threads. Owner: caller,
 * diffusion_factor_free. */
int diffusion_factor(DiffusionFactor **made, const Diffusion *diffusion, int kind, double velocity,
                     double step, Fault *fault);
void diffusion_factor_free(DiffusionFactor *factor); /* accepts NULL */

/* Advance count species by the factor's step.
 *   x        [count][padded] mole fractions in place; GROUND_FIXED keeps x[.][0] as on entry
 *   sink     [count][padded] what is taken away all along at a constant rate, mole fraction s-1 (below zero:
 *            given), or NULL: nothing; GROUND_FIXED does not look at sink[.][0]
 *   received [count] out: molecules cm-2 that entered the column through the ground during the step
 *            (negative: deposited; GROUND_FIXED: what holding the value let in; closed: 0). Exact
 *            for the scheme: sum(N dz X) after = before + received - step sum(N dz sink), to round-off.
 *   work     [diffusion_work(factor, count)] doubles, overwritten
 * No allocation, no error. Padding lanes are left as they are. Arrays must not overlap. */
void diffusion_step(const DiffusionFactor *factor, double *x, const double *sink, int count, double *received,
                    double *work);
size_t diffusion_work(const DiffusionFactor *factor, int count);

/* dX/dt = A x of the operator itself, ground closed, for tests and budgets: mole fraction s-1.
 * x, dxdt: [padded], no overlap; padding lanes of dxdt are left as they are. */
void diffusion_tendency(const Diffusion *diffusion, const double *x, double *dxdt);

#endif
