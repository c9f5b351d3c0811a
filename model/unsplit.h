/* unsplit: the whole column as one system of equations, without splitting.
 *
 * For every solved species and layer
 *     dx/dt = chemistry(x N) / N + eddy diffusion with its ground condition
 * are the equations that step.c takes apart: the rates are coefficients times diurnal factors, photolysis
 * the day's mean under the ozone of the moment, diffusion the flux form of transport/diffusion.h. Species
 * that a table holds below the tropopause and gases that the ground keeps at a value are equations
 * value - x = 0 there (the row loses chemistry and transport); a held species diffuses from its highest held
 * layer up; a species that is not carried has no transport.
 *
 * The matrix of derivatives. Unknowns stand layer by layer, so that it is block-tridiagonal, with full
 * blocks on the diagonal and diagonal ones beside it: a band of `solved` on both sides (LAPACK dgbtrf).
 * Uptake coefficients and HO2 + HO2 depend on species of their own layer, whose derivatives (finite
 * differences of the formulas) belong to the blocks. Photolysis in a layer depends on ozone in every layer,
 * and a little on NO2 and NO: a change of low rank, kept apart as U V' with V the absorbers layer by layer,
 * and put in by the formula of Sherman, Morrison and Woodbury (Hager 1989, SIAM Rev. 31, 221). Its slopes are
 * solved for with the light itself (light_slopes).
 *
 * Unknown i of species s in layer l is l * solved + s, its unit mole fraction; derivatives and tendencies in
 * s-1. Everything here belongs to one thread but for the light, which uses OpenMP's.
 */
#ifndef SKYMEND_UNSPLIT_H
#define SKYMEND_UNSPLIT_H

#include "day.h"
#include "pack.h"

#define UNSPLIT_ABSORBERS 3 /* O3, NO2, NO */

typedef struct UnsplitMatrix UnsplitMatrix; /* band, scales and update: unsplit_matrix.c */

typedef struct {
    const Model *model;
    int solved, layers, unknowns;
    Conditions *conditions; /* of the time of unsplit_set_time */
    Light *light;
    PackWork *pack;
    int has_factors;
    double *factor, *lit; /* frozen diurnal factors [reactions][padded], daylight ratios [solved][padded] */

    /* at the state of the last unsplit_evaluate */
    double *coefficient; /* [reactions][padded] of thermal, surface and washout reactions, no factors */
    double *k;           /* [reactions][padded] as the rates see them, factors and light included */
    double *product;     /* [reactions][padded] product of the reactants' densities */
    double *rate;        /* [reactions][padded] k times product, molecules cm-3 s-1 */
    double *density;     /* [solved][padded] cm-3 */
    double *jacobian;    /* [layers][solved][solved] chemistry within a layer, row by column, s-1 */

    double *block_f, *block; /* work: one pack of the kernel's species */

    double *mass;        /* [layers] N dz, molecules cm-2 */
    double *conductance; /* [layers + 1] K N / distance of middles, molecules cm-2 s-1; 0 at the ends */
    double *deposit;     /* [solved] deposition velocity, cm s-1 */
    double *given; /* [unknowns] molecules cm-2 s-1 that the schedule's lines give, at the ground and aloft */
    double *emission; /* [solved] molecules cm-2 s-1 into the lowest layer besides; 0 until unsplit_emit */
    unsigned char *carried; /* [solved] 1: diffuses */
    unsigned char *kept;    /* [unknowns] 1: the equation is value - x = 0 */
    double *value;          /* [unknowns] that value */
    int *partner;           /* [partners] species that coefficients of their own layer depend on */
    int partners;
    double *shifted; /* [reactions][padded] work: coefficients with a partner shifted */
    double *bend;    /* [partners][reactions][padded] dk/d(mole fraction of the partner), factors included */
    /* slopes of photolysis against what absorbs: O3, NO2 and NO, each in the layers where it counts */
    int absorbers; /* 0 until unsplit_slopes; at most UNSPLIT_ABSORBERS times layers */
    int *absorber; /* [absorbers] unknown */
    double *slope; /* [absorbers][photolysis][padded] d(k)/d(mole fraction), factors included, s-1 */
    UnsplitMatrix *matrix;
    long evaluations, factorisations, lights;
} Unsplit;

/* The model must outlive it. Factors are 1 until unsplit_take_factors. Owner: caller. */
int unsplit_make(Unsplit **made, const Model *model, Fault *fault);
void unsplit_free(Unsplit *unsplit);

/* Diurnal factors and daylight ratios as they now are, by copy; NULL: none (daily means). */
void unsplit_take_factors(Unsplit *unsplit, const Day *day);
/* What the ground keeps and emissions give, and the conditions (conditions.h), at decimal year time. */
void unsplit_set_time(Unsplit *unsplit, double time);
/* Let a flux into the lowest layer, molecules cm-2 s-1, drive the carried species s, and not a value that the
 * ground keeps. */
void unsplit_emit(Unsplit *unsplit, int s, double flux);
/* Put the kept values into x [solved][padded]; padding lanes repeat the top layer. */
void unsplit_keep(const Unsplit *unsplit, double *x);

/* Light, coefficients and rates at x [solved][padded]; tendency [unknowns] out, kept equations value - x (per
 * second). with_jacobian: the blocks as well. */
void unsplit_evaluate(Unsplit *unsplit, const double *x, double *tendency, int with_jacobian);
/* The slopes of photolysis against its absorbers at x, where unsplit_evaluate was last (light_slopes); the
 * same bits for any number of threads. FAULT_MEMORY. The blocks belong to factors and light as they are:
 * evaluate, slopes, factorise, in this order. */
int unsplit_slopes(Unsplit *unsplit, const double *x, Fault *fault);
/* Largest gross rate through each unknown at the last evaluation, s-1 times mole fraction: sum of the
 * absolute terms of its equation; [unknowns] out. What a residual is measured against. */
void unsplit_turnover(const Unsplit *unsplit, const double *x, double *turnover);

/* Factor A - shift M, with A the derivative at the last evaluation with jacobian, M the identity without
 * kept equations, shift in s-1. with_light: the slopes included. FAULT_NUMERICS when singular. */
int unsplit_factorise(Unsplit *unsplit, const double *x, double shift, int with_light, Fault *fault);
/* Solve (A - shift M) z = b, or the transposed system, in place of b [unknowns]. */
void unsplit_solve(const Unsplit *unsplit, double *b, int transposed);
/* out = A z or A' z, matrix-free; with_light as above. For tests and refinement. */
void unsplit_multiply(const Unsplit *unsplit, const double *z, int with_light, int transposed, double *out);

/* gradient [unknowns] += sum over reactions and layers of weight * d(rate)/d(unknown), light included where
 * slopes are known: what unsplit_multiply and the answers of sensitivity.h are made of.
 *   weight [reactions][padded] per rate in molecules cm-3 s-1 */
void unsplit_rate_gradient(const Unsplit *unsplit, const double *weight, double *gradient);

/* ---- through time (unsplit_time.c) ---- */

typedef struct {
    double relative, absolute; /* of a step's error; absolute in molecules cm-3 */
    double fixed;              /* > 0: every step of this many s, whatever its error (order of the method) */
    double step;               /* s, in: to try first (0: chosen), out: to try next */
    long steps, rejections, iterations;
} UnsplitStepping;

/* Carry x [solved][padded] on from *time, decimal years, by years; factors stay those taken, the light
 * follows the state. frozen = 1 keeps the ground and the clock at *time. TR-BDF2, order 2, L-stable, steps
 * ending where the schedule bends. FAULT_NUMERICS when the step shrinks to nothing; x and *time then stand
 * where it got. */
int unsplit_advance(Unsplit *unsplit, double *x, double *time, double years, int frozen,
                    UnsplitStepping *stepping, Fault *fault);

/* private to unsplit*.c */
int unsplit_matrix_make(Unsplit *unsplit, Fault *fault);
void unsplit_matrix_free(UnsplitMatrix *matrix);

#endif
