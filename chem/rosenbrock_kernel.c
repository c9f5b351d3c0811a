/* rosenbrock_kernel: the numeric loops and the step. Compiled once per vector instruction set.
 *
 * With K_i the stage increments, h the step, J = df/dy, the method in its transformed form is
 *     (1/(gamma h) I - J) K_i = f(t + alpha_i h, y + sum_j a_ij K_j) + sum_j c_ij/h K_j + h gamma_i df/dt
 * with gamma = 1/2 and (Sandu et al. 1997, RODAS3)
 *     K1:  u = y,              + 1/2 h df/dt
 *     K2:  u = y,              + 4/h K1,               + 3/2 h df/dt
 *     K3:  u = y + 2 K1,       + (K1 - K2)/h,          at t + h
 *     K4:  u = y + 2 K1 + K3,  + (K1 - K2 - 8/3 K3)/h, at t + h
 *     y_new = y + 2 K1 + K3 + K4,   error estimate K4.
 */
#include "rosenbrock_kernel.h"

#include <math.h>
#include <string.h>

#define JOIN2(a, b) a##b
#define JOIN(a, b) JOIN2(a, b)

/* One row of a pack as native vectors: wider ones the compiler would keep in memory. */
#if defined(__AVX512F__)
#define WIDTH 8
#elif defined(__AVX__)
#define WIDTH 4
#else
#define WIDTH 2
#endif
typedef double Native __attribute__((vector_size(WIDTH * sizeof(double))));
typedef int64_t NativeMask __attribute__((vector_size(WIDTH * sizeof(int64_t))));
enum { PARTS = PACK / WIDTH };
typedef struct {
    Native at[PARTS];
} Vec;
#define EACH(p) for (int p = 0; p < PARTS; p++) /* for one short statement */

static const double GAMMA = 0.5;
static const double SAFETY = 0.9, SHRINK = 0.2, GROW = 6.0;

/* Sum of weight[e] * x[index[e]] for e in [first, last). Two running sums halve the wait of an addition for
 * the one before. */
static inline Vec weighted_sum(const double *weight, const int32_t *index, int first, int last, const Vec *x)
{
    Vec even = {0}, odd = {0};
    int e = first;
    for (; e + 1 < last; e += 2) {
        EACH(p) even.at[p] += weight[e] * x[index[e]].at[p];
        EACH(p) odd.at[p] += weight[e + 1] * x[index[e + 1]].at[p];
    }
    if (e < last)
        EACH(p) even.at[p] += weight[e] * x[index[e]].at[p];
    EACH(p) even.at[p] += odd.at[p];
    return even;
}

/* w[r] = k[r] * product of reactants; u is seen. */
static void evaluate_rates(const Kernel *kernel, const Vec *restrict k, const Vec *restrict u,
                           Vec *restrict w)
{
    const int32_t *reactant = kernel->reactant;
    for (int r = 0; r < kernel->reactions; r++, reactant += 3)
        EACH(p) w[r].at[p] = k[r].at[p] * u[reactant[0]].at[p] * u[reactant[1]].at[p];
    for (int i = 0; i < kernel->cubics; i++) {
        int r = kernel->cubic[i];
        EACH(p) w[r].at[p] *= u[kernel->reactant[3 * r + 2]].at[p];
    }
}

/* f[s] = sum of weight * w. */
static void gather_sources(const Kernel *kernel, const Vec *restrict w, Vec *restrict f)
{
    const int32_t *first = kernel->source_first;
    for (int s = 0; s < kernel->species; s++)
        f[s] = weighted_sum(kernel->source_weight, kernel->source_reaction, first[s], first[s + 1], w);
}

/* Find the sources among the reactions of the problem's slope range; they stand in reaction order. */
static void load_slope_range(const Kernel *kernel, SolverWork *work, int first_reaction, int last_reaction)
{
    if (work->slope_first == first_reaction && work->slope_last == last_reaction)
        return;
    for (int s = 0; s < kernel->species; s++) {
        int e = kernel->source_first[s], end = kernel->source_first[s + 1];
        while (e < end && kernel->source_reaction[e] < first_reaction)
            e++;
        work->slope_from[s] = e;
        while (e < end && kernel->source_reaction[e] < last_reaction)
            e++;
        work->slope_to[s] = e;
    }
    work->slope_first = first_reaction;
    work->slope_last = last_reaction;
}

/* slope = df/dt at fixed y. w is scratch. */
static void gather_slope(const Kernel *kernel, const SolverWork *work, const Vec *restrict k_slope,
                         const Vec *restrict u, Vec *restrict w, Vec *restrict slope)
{
    for (int r = work->slope_first; r < work->slope_last; r++) {
        const int32_t *reactant = &kernel->reactant[3 * r];
        for (int p = 0; p < PARTS; p++) {
            w[r].at[p] =
                k_slope[r].at[p] * u[reactant[0]].at[p] * u[reactant[1]].at[p] * u[reactant[2]].at[p];
        }
    }
    for (int s = 0; s < kernel->species; s++)
        slope[s] = weighted_sum(kernel->source_weight, kernel->source_reaction, work->slope_from[s],
                                work->slope_to[s], w);
}

/* Jacobian entries from u; columns of held lanes are zero because rates there see the held value. is_free may
 * be NULL: nothing held. */
static void evaluate_jacobian(const Kernel *kernel, const Vec *restrict k, const Vec *restrict u,
                              const Vec *restrict is_free, Vec *restrict d, Vec *restrict jacobian)
{
    for (int e = 0; e < kernel->derivatives; e++)
        EACH(p) d[e].at[p] = k[kernel->derivative_reaction[e]].at[p] * u[kernel->derivative_p[e]].at[p];
    for (int i = 0; i < kernel->cubic_derivatives; i++) {
        int e = kernel->cubic_derivative[i];
        EACH(p) d[e].at[p] *= u[kernel->derivative_q[e]].at[p];
    }
    for (int e = 0; is_free && e < kernel->derivatives; e++)
        EACH(p) d[e].at[p] *= is_free[kernel->derivative_by[e]].at[p];
    for (int e = 0; e < kernel->entries; e++)
        jacobian[e] = weighted_sum(kernel->term_weight, kernel->term_derivative, kernel->term_first[e],
                                   kernel->term_first[e + 1], d);
}

/* Entry e of the factors before scaling: start less the products listed for it. */
static inline Vec less_products(const Kernel *kernel, int e, Vec start, const Vec *lu)
{
    for (int t = kernel->product_first[e]; t < kernel->product_first[e + 1]; t++)
        EACH(p) start.at[p] -= lu[kernel->product_lower[t]].at[p] * lu[kernel->product_upper[t]].at[p];
    return start;
}

/* lu = factors of (shift I - jacobian), unit lower and upper; pivot = reciprocal of the upper's diagonal. No
 * pivoting for size: the matrix is close to an M-matrix, and a bad step shows in the error estimate. */
static void factorise(const Kernel *kernel, double shift, const Vec *restrict jacobian, Vec *restrict lu,
                      Vec *restrict pivot)
{
    for (int i = 0; i < kernel->species; i++) {
        int e = kernel->row_first[i], diagonal = kernel->diagonal[i];
        for (; e < diagonal; e++) {
            Vec value;
            EACH(p) value.at[p] = -jacobian[e].at[p];
            value = less_products(kernel, e, value, lu);
            EACH(p) lu[e].at[p] = value.at[p] * pivot[kernel->column[e]].at[p];
        }
        Vec value;
        EACH(p) value.at[p] = shift - jacobian[e].at[p];
        lu[e] = less_products(kernel, e, value, lu);
        EACH(p) pivot[i].at[p] = 1.0 / lu[e].at[p];
        for (e++; e < kernel->row_first[i + 1]; e++) {
            EACH(p) value.at[p] = -jacobian[e].at[p];
            lu[e] = less_products(kernel, e, value, lu);
        }
    }
}

/* Solve in place of x [species], which is by species; rhs is scratch by elimination position. */
static void solve(const Kernel *kernel, const Vec *restrict lu, const Vec *restrict pivot, Vec *restrict rhs,
                  Vec *restrict x)
{
    int n = kernel->species;
    const int32_t *column = kernel->column;
    for (int i = 0; i < n; i++) {
        Vec sum = x[kernel->order_of[i]];
        for (int e = kernel->row_first[i]; e < kernel->diagonal[i]; e++)
            EACH(p) sum.at[p] -= lu[e].at[p] * rhs[column[e]].at[p];
        rhs[i] = sum;
    }
    for (int i = n - 1; i >= 0; i--) {
        Vec sum = rhs[i];
        for (int e = kernel->diagonal[i] + 1; e < kernel->row_first[i + 1]; e++)
            EACH(p) sum.at[p] -= lu[e].at[p] * rhs[column[e]].at[p];
        EACH(p) rhs[i].at[p] = sum.at[p] * pivot[i].at[p];
        x[kernel->order_of[i]] = rhs[i];
    }
}

static inline Native magnitude(Native x)
{
    return (Native)((NativeMask)x & INT64_MAX);
}

/* A NaN in b comes through. */
static inline Native larger(Native a, Native b)
{
    NativeMask first = a > b;
    return (Native)(((NativeMask)a & first) | ((NativeMask)b & ~first));
}

/* Weighted root-mean-square error, over the solved species, of the worst lane; *lane is that lane. NaN counts
 * as infinite. */
static double error_norm(const Kernel *kernel, const Vec *restrict y, const Vec *restrict next,
                         const Vec *restrict error, const Vec *restrict is_free, const Tolerance *tolerance,
                         int *lane)
{
    union {
        Vec pack;
        double lane[PACK];
    } sum = {.lane = {0}};
    Vec total = {0};
    int solved = kernel->species - kernel->counters;
    for (int s = 0; s < solved; s++)
        for (int p = 0; p < PARTS; p++) {
            Native size = larger(magnitude(y[s].at[p]), magnitude(next[s].at[p]));
            Native scaled =
                is_free[s].at[p] * error[s].at[p] / (tolerance->absolute + tolerance->relative * size);
            total.at[p] += scaled * scaled;
        }
    sum.pack = total;
    double worst = -1.0;
    for (int l = 0; l < PACK; l++) {
        double value = isfinite(sum.lane[l]) ? sum.lane[l] : HUGE_VAL;
        if (value > worst) {
            worst = value;
            *lane = l;
        }
    }
    return sqrt(worst / solved);
}

/* Whether the step takes a value further below zero than is allowed. The error of a gas that decays to
 * nothing within one step is measured against what it was and would let that pass. */
static int falls_too_low(const Kernel *kernel, const Vec *restrict y, const Vec *restrict next,
                         const Vec *restrict is_free, double allowed)
{
    union {
        Vec pack;
        double lane[PACK];
    } low = {.lane = {0}};
    Vec most = {0};
    for (int s = 0; s < kernel->species - kernel->counters; s++)
        for (int p = 0; p < PARTS; p++) {
            Native below = -next[s].at[p] * is_free[s].at[p];
            NativeMask falls = next[s].at[p] < y[s].at[p];
            most.at[p] = larger((Native)((NativeMask)below & falls), most.at[p]);
        }
    low.pack = most;
    for (int l = 0; l < PACK; l++)
        if (low.lane[l] > allowed)
            return 1;
    return 0;
}

/* How far below zero a step may go: the absolute tolerance, or twice the lowest value the call was given,
 * since what follows a negative value (ClOO follows Cl within milliseconds) cannot but be negative too. */
static double lowest_allowed(const Kernel *kernel, const double *y, const double *is_free, double absolute)
{
    double allowed = absolute;
    for (int i = 0; i < (kernel->species - kernel->counters) * PACK; i++)
        if (is_free[i] != 0.0 && -2.0 * y[i] > allowed)
            allowed = -2.0 * y[i];
    return allowed;
}

/* What failed, as lane * species + s: of the lane's free species the first whose state or error is not
 * finite, else the one with the largest scaled error. */
static int blame(const Kernel *kernel, const SolverWork *work, const double *y, const Tolerance *tolerance,
                 int lane)
{
    const double *error = work->stage + 3 * PACK * (size_t)kernel->species;
    int worst = 0;
    double worst_value = -1.0;
    for (int s = 0; s < kernel->species - kernel->counters; s++) {
        size_t at = (size_t)s * PACK + (size_t)lane;
        if (work->free[at] == 0.0)
            continue;
        double value = fabs(error[at]) / (tolerance->absolute + tolerance->relative * fabs(y[at]));
        if (!isfinite(value))
            return lane * kernel->species + s;
        if (value > worst_value) {
            worst_value = value;
            worst = s;
        }
    }
    return lane * kernel->species + worst;
}

/* Let the rates see held values instead of u's. */
static void see(const PackProblem *problem, const SolverWork *work, Vec *u)
{
    const Vec *is_free = (const Vec *)work->free, *held = (const Vec *)work->held;
    for (int i = 0; i < problem->held; i++) {
        int s = problem->held_species[i];
        EACH(p) u[s].at[p] = is_free[s].at[p] * u[s].at[p] + held[s].at[p];
    }
}

static void load_held(const Kernel *kernel, SolverWork *work, const PackProblem *problem)
{
    size_t row = PACK * sizeof(double);
    for (int i = 0; i < kernel->species * PACK; i++)
        work->free[i] = 1.0;
    memset(work->held, 0, (size_t)kernel->species * row);
    for (int i = 0; i < problem->held; i++) {
        int s = problem->held_species[i];
        memcpy(work->free + s * PACK, problem->held_free + i * PACK, row);
        memcpy(work->held + s * PACK, problem->held_value + i * PACK, row);
    }
}

/* What of the coefficients does not change in time. */
static void load_coefficients(const Kernel *kernel, SolverWork *work, const PackProblem *problem)
{
    if (!problem->k_slope)
        return;
    size_t size = (size_t)kernel->reactions * PACK * sizeof(double);
    memcpy(work->k, problem->k, size);
    memcpy(work->k_end, problem->k, size);
    load_slope_range(kernel, work, problem->slope_first, problem->slope_last);
}

/* Coefficients after elapsed seconds: the problem's own, or set in `moving` (work->k or work->k_end). */
static const Vec *coefficients_at(const PackProblem *problem, double elapsed, double *restrict moving)
{
    if (!problem->k_slope)
        return (const Vec *)problem->k;
    for (int i = problem->slope_first * PACK; i < problem->slope_last * PACK; i++)
        moving[i] = problem->k[i] + elapsed * problem->k_slope[i];
    return (const Vec *)moving;
}

/* Time integrals of state and rates over an accepted step: rows q' = y and q' = w of the same method, which
 * feed nothing back. With the weights b = (5/6, -1/6, -1/6, 1/2) of the method's plain form the increment of
 * the latter is h (sum b_i w_i + dw/dy sum b_i K_i + h/6 dw/dt),   w_1 = w_2, so that integrals are of order
 * 3 too, and state changes equal integrated rates to round-off. */
static void add_sums(const Kernel *kernel, PackProblem *problem, const SolverWork *work, double h)
{
    if (!problem->sum_y)
        return;
    int size = kernel->species * PACK;
    const double *restrict k1 = work->stage, *restrict k2 = k1 + size, *restrict k3 = k2 + size,
                           *restrict k4 = k3 + size;
    const double *restrict u = work->u, *restrict is_free = work->free;
    double *restrict mix = work->rhs, *restrict sum_y = problem->sum_y;
    for (int i = 0; i < size; i++) {
        mix[i] = h * ((5.0 / 6.0) * k1[i] - (1.0 / 6.0) * (k2[i] + k3[i]) + 0.5 * k4[i]);
        /* the same sum with u_3 = y + 2 K1 and u_4 = u_3 + K3 put in */
        sum_y[i] +=
            h * (u[i] + is_free[i] * (1.5 * k1[i] - (1.0 / 6.0) * k2[i] + (1.0 / 3.0) * k3[i] + 0.5 * k4[i]));
    }
    const double *restrict w = work->w, *restrict w3 = work->w3, *restrict w4 = work->w4;
    double *restrict sum_w = problem->sum_w;
    for (int i = 0; i < kernel->reactions * PACK; i++)
        sum_w[i] += h * ((2.0 / 3.0) * w[i] - (1.0 / 6.0) * w3[i] + 0.5 * w4[i]);
    Vec *sum = (Vec *)problem->sum_w;
    const Vec *d = (const Vec *)work->d, *step = (const Vec *)work->rhs, *seen = (const Vec *)work->u;
    for (int e = 0; e < kernel->derivatives; e++) {
        int r = kernel->derivative_reaction[e];
        double multiplicity = kernel->derivative_multiplicity[e];
        EACH(p) sum[r].at[p] += multiplicity * d[e].at[p] * step[kernel->derivative_by[e]].at[p];
    }
    const Vec *k_slope = (const Vec *)problem->k_slope;
    for (int r = problem->slope_first; k_slope && r < problem->slope_last; r++) {
        const int32_t *reactant = &kernel->reactant[3 * r];
        for (int p = 0; p < PARTS; p++) {
            sum[r].at[p] += (h * h / 6.0) * k_slope[r].at[p] * seen[reactant[0]].at[p] *
                            seen[reactant[1]].at[p] * seen[reactant[2]].at[p];
        }
    }
}

/* Events of the tallied first-order reactions over an accepted step, consistent with the stages: each obeys
 * q' = k u, one more row of the same linear systems, so that atoms in state plus tallies are kept exactly.
 * The step's increment is 2 Kq1 + Kq3 + Kq4, with (1/(gamma h)) Kqi = k (u_i + K_i) + sum_j c_ij/h Kqj and
 * K_i zero where held. Their coefficients do not change in time. */
static void add_tallies(const Kernel *kernel, PackProblem *problem, const SolverWork *work, double h)
{
    if (!problem->tally)
        return;
    int n = kernel->species;
    Vec *tally = (Vec *)problem->tally;
    const Vec *stage = (const Vec *)work->stage, *start = (const Vec *)work->u,
              *coefficient = (const Vec *)problem->k;
    const Vec *is_free = (const Vec *)work->free;
    double inverse = 1.0 / h, gamma_h = GAMMA * h;
    for (int t = 0; t < kernel->tallies; t++) {
        int r = kernel->tally_reaction[t], s = kernel->reactant[3 * r];
        for (int p = 0; p < PARTS; p++) {
            Native k = coefficient[r].at[p], moves = is_free[s].at[p], u = start[s].at[p];
            Native k1 = moves * stage[s].at[p], k2 = moves * stage[n + s].at[p];
            Native k3 = moves * stage[2 * n + s].at[p], k4 = moves * stage[3 * n + s].at[p];
            Native u3 = u + 2.0 * k1, u4 = u3 + k3;
            Native q1 = gamma_h * (k * (u + k1));
            Native q2 = gamma_h * (k * (u + k2) + 4.0 * inverse * q1);
            Native q3 = gamma_h * (k * (u3 + k3) + inverse * (q1 - q2));
            Native q4 = gamma_h * (k * (u4 + k4) + inverse * (q1 - q2 - (8.0 / 3.0) * q3));
            tally[t].at[p] += 2.0 * q1 + q3 + q4;
        }
    }
}

/* f plus what comes from outside. */
static void add_source(const Kernel *kernel, const PackProblem *problem, double *restrict f)
{
    const double *restrict source = problem->source;
    for (int i = 0; source && i < kernel->species * PACK; i++)
        f[i] += source[i];
}

/* stage = f and w = rates of work->stage_u, which is made seen first, with coefficients k. */
static void stage_tendency(const Kernel *kernel, SolverWork *work, const PackProblem *problem, const Vec *k,
                           double *w, double *stage)
{
    see(problem, work, (Vec *)work->stage_u);
    evaluate_rates(kernel, k, (const Vec *)work->stage_u, (Vec *)w);
    gather_sources(kernel, (const Vec *)w, (Vec *)stage);
    add_source(kernel, problem, stage);
}

/* One attempted step of length h from y, for which prepare_step was run. Leaves the candidate in work->next
 * and the error estimate in stage 4; what prepare_step made stays as it is. */
static void attempt_step(const Kernel *kernel, SolverWork *work, const PackProblem *problem,
                         const double *restrict y, double elapsed, double h)
{
    int n = kernel->species, size = n * PACK;
    double *restrict k1 = work->stage, *restrict k2 = k1 + size, *restrict k3 = k2 + size,
                     *restrict k4 = k3 + size;
    double *restrict u = work->stage_u, *restrict next = work->next;
    const double *restrict f = work->f, *restrict slope = work->slope;
    const Vec *lu = (const Vec *)work->lu, *pivot = (const Vec *)work->pivot;
    Vec *rhs = (Vec *)work->rhs;
    double inverse = 1.0 / h, slope1 = GAMMA * h, slope2 = 1.5 * h;

    factorise(kernel, inverse / GAMMA, (const Vec *)work->jacobian, (Vec *)work->lu, (Vec *)work->pivot);
    for (int i = 0; i < size; i++)
        k1[i] = f[i] + slope1 * slope[i];
    solve(kernel, lu, pivot, rhs, (Vec *)k1);
    for (int i = 0; i < size; i++)
        k2[i] = f[i] + 4.0 * inverse * k1[i] + slope2 * slope[i];
    solve(kernel, lu, pivot, rhs, (Vec *)k2);

    const Vec *k_end = coefficients_at(problem, elapsed + h, work->k_end);
    for (int i = 0; i < size; i++)
        u[i] = y[i] + 2.0 * k1[i];
    stage_tendency(kernel, work, problem, k_end, work->w3, k3);
    for (int i = 0; i < size; i++)
        k3[i] += inverse * (k1[i] - k2[i]);
    solve(kernel, lu, pivot, rhs, (Vec *)k3);

    for (int i = 0; i < size; i++)
        next[i] = u[i] = y[i] + 2.0 * k1[i] + k3[i];
    stage_tendency(kernel, work, problem, k_end, work->w4, k4);
    for (int i = 0; i < size; i++)
        k4[i] += inverse * (k1[i] - k2[i] - (8.0 / 3.0) * k3[i]);
    solve(kernel, lu, pivot, rhs, (Vec *)k4);
    for (int i = 0; i < size; i++)
        next[i] += k4[i];
}

/* Everything at y that does not depend on the step's length: rates, tendency, Jacobian and slope. */
static void prepare_step(const Kernel *kernel, SolverWork *work, const PackProblem *problem, const double *y,
                         double elapsed)
{
    const Vec *k = coefficients_at(problem, elapsed, work->k), *u = (const Vec *)work->u;
    memcpy(work->u, y, (size_t)kernel->species * PACK * sizeof *y);
    see(problem, work, (Vec *)work->u);
    evaluate_rates(kernel, k, u, (Vec *)work->w);
    gather_sources(kernel, (const Vec *)work->w, (Vec *)work->f);
    add_source(kernel, problem, work->f);
    evaluate_jacobian(kernel, k, u, problem->held ? (const Vec *)work->free : NULL, (Vec *)work->d,
                      (Vec *)work->jacobian);
    if (problem->k_slope)
        gather_slope(kernel, work, (const Vec *)problem->k_slope, u, (Vec *)work->w3, (Vec *)work->slope);
    else
        memset(work->slope, 0, (size_t)kernel->species * PACK * sizeof *work->slope);
}

/* Turnover from what prepare_step made last: loss frequency is the diagonal of the Jacobian, production what
 * the tendency is above it. y: state it was made for, still in work->u where it is not held. */
static void give_turnover(const Kernel *kernel, const SolverWork *work, PackProblem *problem)
{
    if (!problem->loss)
        return;
    for (int i = 0; i < kernel->species; i++) {
        int s = kernel->order_of[i];
        const double *diagonal = work->jacobian + PACK * (size_t)kernel->diagonal[i];
        for (int l = 0; l < PACK; l++) {
            size_t at = (size_t)s * PACK + (size_t)l;
            double outside = problem->source ? problem->source[at] : 0.0;
            problem->loss[at] = -diagonal[l];
            problem->production[at] = work->f[at] - outside - diagonal[l] * work->u[at];
        }
    }
}

static void count_negatives(const Kernel *kernel, const double *y, const double *is_free,
                            SolverCounts *counts)
{
    for (int i = 0; i < (kernel->species - kernel->counters) * PACK; i++)
        if (y[i] < 0.0 && is_free[i] != 0.0) {
            counts->negatives++;
            if (y[i] < counts->most_negative)
                counts->most_negative = y[i];
        }
}

int JOIN(solver_advance_, SOLVER_SUFFIX)(const Kernel *kernel, SolverWork *work, PackProblem *problem,
                                         double duration, const Tolerance *tolerance, SolverCounts *counts,
                                         int *where)
{
    double *y = problem->y;
    const double *error = work->stage + 3 * PACK * (size_t)kernel->species;
    double elapsed = 0.0, h = problem->step > 0.0 ? problem->step : 1e-3 * duration;
    double next_step = h;
    int rejected = 0, lane = 0;

    counts->calls++;
    problem->first = h;
    load_held(kernel, work, problem);
    load_coefficients(kernel, work, problem);
    double allowed = lowest_allowed(kernel, y, work->free, tolerance->absolute);
    for (int step = 0; elapsed < duration;) {
        if (!rejected)
            prepare_step(kernel, work, problem, y, elapsed);
        double left = duration - elapsed;
        int last = h >= left * (1.0 - 1e-12);
        double tried = last ? left : h;
        if (step++ >= tolerance->max_steps) {
            *where = blame(kernel, work, y, tolerance, lane);
            return SOLVER_TOO_MANY_STEPS;
        }
        attempt_step(kernel, work, problem, y, elapsed, tried);
        counts->factorisations++;
        double norm = error_norm(kernel, (const Vec *)y, (const Vec *)work->next, (const Vec *)error,
                                 (const Vec *)work->free, tolerance, &lane);
        int low = norm <= 1.0 && falls_too_low(kernel, (const Vec *)y, (const Vec *)work->next,
                                               (const Vec *)work->free, allowed);
        if (!(norm <= 1.0) || low) {
            counts->rejections++;
            rejected = 1;
            h = tried * (low ? 0.5 : isfinite(norm) ? fmax(SHRINK, SAFETY / cbrt(norm)) : 0.1);
            if (h < 1e-14 * duration || h < 1e-10) {
                *where = blame(kernel, work, y, tolerance, lane);
                return isfinite(norm) ? SOLVER_STEP_UNDERFLOW : SOLVER_NOT_FINITE;
            }
            continue;
        }
        counts->steps++;
        add_tallies(kernel, problem, work, tried);
        add_sums(kernel, problem, work, tried);
        memcpy(y, work->next, (size_t)kernel->species * PACK * sizeof *y);
        double factor = norm > 0.0 ? SAFETY / cbrt(norm) : GROW;
        if (factor > GROW)
            factor = GROW;
        if (factor < SHRINK)
            factor = SHRINK;
        if (rejected && factor > 1.0)
            factor = 1.0;
        rejected = 0;
        h = tried * factor;
        if (elapsed == 0.0)
            problem->first = last && factor > 1.0 && h < problem->first ? problem->first : h;
        /* a step cut short by the end of the call says nothing against the longer one it was cut from */
        next_step = last && h < next_step && factor > 1.0 ? next_step : h;
        elapsed = last ? duration : elapsed + tried;
    }
    problem->step = next_step;
    give_turnover(kernel, work, problem);
    count_negatives(kernel, y, work->free, counts);
    return SOLVER_DONE;
}

void JOIN(solver_evaluate_, SOLVER_SUFFIX)(const Kernel *kernel, SolverWork *work, const PackProblem *problem,
                                           double *f, double *jacobian)
{
    size_t n = (size_t)kernel->species, row = PACK * sizeof(double);
    load_held(kernel, work, problem);
    load_coefficients(kernel, work, problem);
    prepare_step(kernel, work, problem, problem->y, 0.0);
    memcpy(f, work->f, n * row);
    if (!jacobian)
        return;
    memset(jacobian, 0, n * n * row);
    for (int i = 0; i < kernel->species; i++)
        for (int e = kernel->row_first[i]; e < kernel->row_first[i + 1]; e++) {
            size_t to = (size_t)kernel->order_of[i] * n + (size_t)kernel->order_of[kernel->column[e]];
            memcpy(jacobian + to * PACK, work->jacobian + (size_t)e * PACK, row);
        }
}
