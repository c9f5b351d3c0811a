/* Tests of chem/kernel and chem/rosenbrock on made-up mechanisms: everything is checked against closed forms, a
 * dense one-lane reading of the mechanism written here, or LAPACK. The lanes of a pack always hold different
 * states, so that a mix-up of lanes shows. SKYMEND_SEED in the environment changes the random inputs. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>
#include <lapacke.h>

#include "../chem/kernel.h"
#include "../chem/rosenbrock.h"
#include "../chem/rosenbrock_kernel.h"
#include "../input/constants.h"

/* ---- random numbers and checks ---- */

static uint64_t random_state;

static void random_start(void) {
    const char *text = getenv("SKYMEND_SEED");
    random_state = text ? strtoull(text, NULL, 10) : 1931u;
    print_message("           random seed %llu\n", (unsigned long long)random_state);
}

static double random_unit(void) { /* splitmix64 (Steele, Lea, Flood 2014), uniform in [0, 1) */
    uint64_t z = (random_state += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return (double)((z ^ (z >> 31)) >> 11) * 0x1p-53;
}

static int random_below(int count) { return (int)(random_unit() * count); }

static void check_near(const char *what, double got, double want, double tolerance) {
    if (!(fabs(got - want) <= tolerance))
        fail_msg("%s: got %.17g, want %.17g within %.3g", what, got, want, tolerance);
}

static double *field(int rows) { /* [rows][PACK] */
    double *made = aligned_alloc(64, (size_t)(rows ? rows : 1) * PACK * sizeof *made);
    assert_non_null(made);
    memset(made, 0, (size_t)(rows ? rows : 1) * PACK * sizeof *made);
    return made;
}

/* ---- mechanisms by hand ---- */

typedef struct {
    int reactants, reactant[3];
    int products, product[6];
} Sketch;

/* A mechanism with nothing but what the kernel reads; the last `washouts` reactions are washout. */
static Mechanism *sketch_mechanism(int species, const Sketch *sketch, int reactions, int washouts) {
    Mechanism *mechanism = calloc(1, sizeof *mechanism);
    assert_non_null(mechanism);
    mechanism->species = mechanism->solved = species;
    mechanism->reactions = reactions;
    mechanism->washout_first = reactions - washouts;
    mechanism->photolysis_first = mechanism->surface_first = mechanism->washout_first;
    mechanism->reaction = calloc((size_t)reactions, sizeof *mechanism->reaction);
    assert_non_null(mechanism->reaction);
    for (int r = 0; r < reactions; r++) {
        Reaction *reaction = &mechanism->reaction[r];
        int net[64] = {0};
        assert_true(species <= 64);
        reaction->reactants = sketch[r].reactants;
        for (int i = 0; i < sketch[r].reactants; i++) {
            reaction->reactant[i] = sketch[r].reactant[i];
            net[sketch[r].reactant[i]]--;
        }
        for (int i = 0; i < sketch[r].products; i++) net[sketch[r].product[i]]++;
        for (int s = 0; s < species; s++)
            if (net[s]) {
                reaction->changed[reaction->changes] = s;
                reaction->change[reaction->changes++] = net[s];
            }
    }
    return mechanism;
}

/* ---- a bench: one mechanism with everything a call needs ---- */

typedef struct {
    Mechanism *mechanism;
    Kernel *kernel;
    SolverWork *work;
    PackProblem problem;
    double *y, *k, *slope;
    SolverCounts counts;
    Tolerance tolerance;
    int where;
} Bench;

static Bench bench_make(Mechanism *mechanism) {
    Bench bench = {.mechanism = mechanism, .tolerance = {1e-6, 1e-12, 100000}};
    Fault fault = {0};
    assert_int_equal(kernel_make(&bench.kernel, mechanism, &fault), 0);
    assert_int_equal(solver_work_make(&bench.work, bench.kernel, &fault), 0);
    bench.y = field(mechanism->solved);
    bench.k = field(mechanism->reactions);
    bench.slope = field(mechanism->reactions);
    bench.problem = (PackProblem){.y = bench.y, .k = bench.k};
    return bench;
}

static void bench_free(Bench *bench) {
    kernel_free(bench->kernel);
    solver_work_free(bench->work);
    free(bench->y);
    free(bench->k);
    free(bench->slope);
    free(bench->mechanism->reaction);
    free(bench->mechanism);
}

static int bench_run(Bench *bench, double duration) {
    return solver_advance(bench->kernel, bench->work, &bench->problem, duration, &bench->tolerance, &bench->counts,
                          &bench->where);
}

static void use_slope(Bench *bench) {
    bench->problem.k_slope = bench->slope;
    bench->problem.slope_last = bench->mechanism->reactions;
}

/* The same duration in `count` steps of equal length, whatever the error estimate says. */
static void bench_fixed_steps(Bench *bench, double duration, int count) {
    bench->tolerance = (Tolerance){1e30, 1e30, 1};
    for (int i = 0; i < count; i++) {
        bench->problem.step = duration / count;
        assert_int_equal(bench_run(bench, duration / count), SOLVER_DONE);
    }
}

/* ---- a dense reading of a mechanism, one lane, independent of the kernel ---- */

typedef struct {
    const Mechanism *mechanism;
    int lane;
    const double *k; /* [reactions][PACK] */
    const unsigned char *is_held; /* [species] in this lane, or NULL */
    const double *held_value;     /* [species] */
} Dense;

static double seen(const Dense *dense, const double *y, int s) {
    return dense->is_held && dense->is_held[s] ? dense->held_value[s] : y[s];
}

static void dense_tendency(const Dense *dense, const double *k, const double *y, double *f) {
    const Mechanism *m = dense->mechanism;
    for (int s = 0; s < m->solved; s++) f[s] = 0.0;
    for (int r = 0; r < m->reactions; r++) {
        const Reaction *reaction = &m->reaction[r];
        double rate = k[r * PACK + dense->lane];
        for (int i = 0; i < reaction->reactants; i++) rate *= seen(dense, y, reaction->reactant[i]);
        for (int c = 0; c < reaction->changes; c++) f[reaction->changed[c]] += reaction->change[c] * rate;
    }
}

/* jacobian [species][species], row-major, by the product rule reactant by reactant. */
static void dense_jacobian(const Dense *dense, const double *y, double *jacobian) {
    const Mechanism *m = dense->mechanism;
    int n = m->solved;
    memset(jacobian, 0, (size_t)n * (size_t)n * sizeof *jacobian);
    for (int r = 0; r < m->reactions; r++) {
        const Reaction *reaction = &m->reaction[r];
        for (int by = 0; by < reaction->reactants; by++) {
            int s = reaction->reactant[by];
            if (dense->is_held && dense->is_held[s]) continue;
            double rate = dense->k[r * PACK + dense->lane];
            for (int i = 0; i < reaction->reactants; i++)
                if (i != by) rate *= seen(dense, y, reaction->reactant[i]);
            for (int c = 0; c < reaction->changes; c++)
                jacobian[reaction->changed[c] * n + s] += reaction->change[c] * rate;
        }
    }
}

/* One RODAS3 step in the method's textbook form, increments k_i = h f'(...) of Hairer and Wanner (1996, IV.7):
 *     k_i = h f(t + alpha_i h, y + sum alpha_ij k_j) + h J sum gamma_ij k_j + h^2 gamma_i df/dt
 * with Sandu et al. (1997): gamma = 1/2; alpha_31 = 1, alpha_41 = 3/4, alpha_42 = -1/4, alpha_43 = 1/2;
 * gamma_21 = 1, gamma_31 = gamma_32 = -1/4, gamma_41 = gamma_42 = 1/12, gamma_43 = -2/3;
 * b = (5/6, -1/6, -1/6, 1/2). The solver uses the transformed one, so that agreement checks the transformation. */
static void dense_step(const Dense *dense, const double *slope, double h, const double *y, double *next) {
    static const double alpha[4][4] = {{0}, {0}, {1.0}, {0.75, -0.25, 0.5}};
    static const double gamma[4][4] = {
        {0.5}, {1.0, 0.5}, {-0.25, -0.25, 0.5}, {1.0 / 12, 1.0 / 12, -2.0 / 3, 0.5}};
    static const double weight[4] = {5.0 / 6, -1.0 / 6, -1.0 / 6, 0.5};
    const Mechanism *m = dense->mechanism;
    int n = m->solved;
    double *jacobian = malloc((size_t)n * (size_t)n * sizeof *jacobian);
    double *matrix = malloc((size_t)n * (size_t)n * sizeof *matrix);
    double *stage = calloc(4 * (size_t)n, sizeof *stage), *at = malloc((size_t)n * sizeof *at);
    double *slope_f = calloc((size_t)n, sizeof *slope_f), *mixed = malloc((size_t)n * sizeof *mixed);
    double *k_at = field(m->reactions);
    lapack_int *pivot = malloc((size_t)n * sizeof *pivot);
    assert_true(jacobian && matrix && stage && at && slope_f && mixed && pivot);
    dense_jacobian(dense, y, jacobian);
    if (slope) dense_tendency(dense, slope, y, slope_f);
    for (int i = 0; i < n * n; i++) matrix[i] = (i % (n + 1) == 0) - 0.5 * h * jacobian[i];
    assert_int_equal(LAPACKE_dgetrf(LAPACK_ROW_MAJOR, n, n, matrix, n, pivot), 0);
    for (int i = 0; i < 4; i++) {
        double *increment = stage + i * n, alpha_sum = 0.0, gamma_sum = 0.0;
        for (int j = 0; j < 4; j++) {
            alpha_sum += alpha[i][j];
            gamma_sum += gamma[i][j];
        }
        for (int s = 0; s < n; s++) {
            at[s] = y[s];
            mixed[s] = 0.0;
            for (int j = 0; j < i; j++) {
                at[s] += alpha[i][j] * stage[j * n + s];
                mixed[s] += gamma[i][j] * stage[j * n + s];
            }
        }
        for (int r = 0; r < m->reactions * PACK; r++) k_at[r] = dense->k[r] + (slope ? alpha_sum * h * slope[r] : 0.0);
        dense_tendency(dense, k_at, at, increment);
        for (int s = 0; s < n; s++) {
            double product = 0.0;
            for (int j = 0; j < n; j++) product += jacobian[s * n + j] * mixed[j];
            increment[s] = h * increment[s] + h * product + h * h * gamma_sum * slope_f[s];
        }
        assert_int_equal(LAPACKE_dgetrs(LAPACK_ROW_MAJOR, 'N', n, 1, matrix, n, pivot, increment, 1), 0);
    }
    for (int s = 0; s < n; s++) {
        next[s] = y[s];
        for (int i = 0; i < 4; i++) next[s] += weight[i] * stage[i * n + s];
    }
    free(jacobian);
    free(matrix);
    free(stage);
    free(at);
    free(slope_f);
    free(mixed);
    free(k_at);
    free(pivot);
}

/* ---- random mechanisms that keep atoms ---- */

enum { RANDOM_SPECIES = 17, RANDOM_REACTIONS = 60, RANDOM_WASHOUTS = 3 };

static int atoms_of(int species) { return 1 + species % 3; }

/* Orders 0 to 3 with repeats; species s holds 1 + s % 3 atoms and every reaction of order above 0 keeps them. */
static Mechanism *random_mechanism(void) {
    Sketch sketch[RANDOM_REACTIONS] = {0};
    for (int r = 0; r < RANDOM_REACTIONS - RANDOM_WASHOUTS; r++) {
        Sketch *one = &sketch[r];
        int atoms = 0;
        one->reactants = 1 + random_below(3);
        for (int i = 0; i < one->reactants; i++) {
            one->reactant[i] = i && random_unit() < 0.3 ? one->reactant[0] : random_below(RANDOM_SPECIES);
            atoms += atoms_of(one->reactant[i]);
        }
        while (atoms > 0) {
            int s = random_below(RANDOM_SPECIES);
            if (one->products == 5) /* room for one more: the one that fits exactly, if it exists */
                s = atoms - 1;
            if (atoms_of(s) > atoms || (one->products == 5 && atoms > 3)) {
                one->products = 0;
                atoms = 0;
                for (int i = 0; i < one->reactants; i++) atoms += atoms_of(one->reactant[i]);
                continue;
            }
            one->product[one->products++] = s;
            atoms -= atoms_of(s);
        }
    }
    for (int w = 0; w < RANDOM_WASHOUTS; w++) {
        Sketch *one = &sketch[RANDOM_REACTIONS - RANDOM_WASHOUTS + w];
        one->reactants = 1;
        one->reactant[0] = 4 * w + 1;
    }
    return sketch_mechanism(RANDOM_SPECIES, sketch, RANDOM_REACTIONS, RANDOM_WASHOUTS);
}

/* Stiff: coefficients over eight decades. */
static void random_inputs(Bench *bench) {
    for (int i = 0; i < bench->mechanism->solved * PACK; i++) bench->y[i] = 0.1 + random_unit();
    for (int r = 0; r < bench->mechanism->reactions; r++)
        for (int l = 0; l < PACK; l++) {
            bench->k[r * PACK + l] = pow(10.0, 4.0 - 8.0 * random_unit());
            bench->slope[r * PACK + l] = r < bench->mechanism->washout_first
                                             ? bench->k[r * PACK + l] * (random_unit() - 0.4)
                                             : 0.0;
        }
}

/* Two held species, each in some lanes. */
typedef struct {
    int species[2];
    double *is_free, *value; /* [2][PACK] */
} Holding;

static Holding hold_some(Bench *bench) {
    Holding holding = {{2, 9}, field(2), field(2)};
    for (int i = 0; i < 2; i++)
        for (int l = 0; l < PACK; l++) {
            int held = (l + i) % 3 == 0;
            holding.is_free[i * PACK + l] = !held;
            holding.value[i * PACK + l] = held ? 0.2 + random_unit() : 0.0;
        }
    bench->problem.held = 2;
    bench->problem.held_species = NULL; /* set by the caller, whose copy stays in place */
    bench->problem.held_free = holding.is_free;
    bench->problem.held_value = holding.value;
    return holding;
}

static void dense_of_lane(Dense *dense, const Bench *bench, const Holding *holding, int lane, unsigned char *is_held,
                          double *held_value) {
    memset(is_held, 0, RANDOM_SPECIES);
    for (int i = 0; holding && i < 2; i++) {
        is_held[holding->species[i]] = holding->is_free[i * PACK + lane] == 0.0;
        held_value[holding->species[i]] = holding->value[i * PACK + lane];
    }
    *dense = (Dense){bench->mechanism, lane, bench->k, is_held, held_value};
}

static void lane_of(const double *pack, int rows, int lane, double *out) {
    for (int s = 0; s < rows; s++) out[s] = pack[s * PACK + lane];
}

/* ---- the symbolic part ---- */

/* The order is a permutation, rows ascend, and the products listed are exactly those of an LU factorisation. */
static void test_elimination_is_complete(void **state) {
    (void)state;
    random_start();
    Bench bench = bench_make(random_mechanism());
    const Kernel *kernel = bench.kernel;
    int n = kernel->species;
    unsigned char used[RANDOM_SPECIES] = {0};
    for (int i = 0; i < n; i++) {
        assert_in_range(kernel->order_of[i], 0, n - 1);
        assert_false(used[kernel->order_of[i]]++);
        assert_int_equal(kernel->column[kernel->diagonal[i]], i);
        for (int e = kernel->row_first[i] + 1; e < kernel->row_first[i + 1]; e++)
            assert_true(kernel->column[e - 1] < kernel->column[e]);
    }
    /* every (i, k) and (k, j) with k < min(i, j) that are there are a product of an entry (i, j) that is there */
    int entry_at[RANDOM_SPECIES][RANDOM_SPECIES];
    memset(entry_at, -1, sizeof entry_at);
    for (int i = 0; i < n; i++)
        for (int e = kernel->row_first[i]; e < kernel->row_first[i + 1]; e++) entry_at[i][kernel->column[e]] = e;
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            int e = entry_at[i][j], t = e < 0 ? 0 : kernel->product_first[e];
            for (int k = 0; k < i && k < j; k++) {
                if (entry_at[i][k] < 0 || entry_at[k][j] < 0) continue;
                assert_true(e >= 0 && t < kernel->product_first[e + 1]);
                assert_int_equal(kernel->product_lower[t], entry_at[i][k]);
                assert_int_equal(kernel->product_upper[t++], entry_at[k][j]);
            }
            assert_true(e < 0 || t == kernel->product_first[e + 1]);
        }
    assert_int_equal(kernel->tallies, RANDOM_WASHOUTS);
    bench_free(&bench);
}

/* ---- rates and Jacobian ---- */

static void check_evaluation(Bench *bench, const Holding *holding) {
    enum { N = RANDOM_SPECIES };
    double *f = field(N), *jacobian = field(N * N);
    solver_evaluate(bench->kernel, bench->work, &bench->problem, f, jacobian);
    for (int l = 0; l < PACK; l++) {
        unsigned char is_held[N];
        double held_value[N], y[N], want[N], dense_j[N * N], up[N], down[N], size = 0.0, size_f = 0.0;
        Dense dense;
        dense_of_lane(&dense, bench, holding, l, is_held, held_value);
        lane_of(bench->y, N, l, y);
        dense_tendency(&dense, bench->k, y, want);
        dense_jacobian(&dense, y, dense_j);
        for (int i = 0; i < N; i++) size_f = fmax(size_f, fabs(want[i]));
        for (int i = 0; i < N * N; i++) size = fmax(size, fabs(dense_j[i]));
        for (int i = 0; i < N; i++) check_near("tendency", f[i * PACK + l], want[i], 1e-13 * size_f);
        for (int i = 0; i < N * N; i++)
            check_near("Jacobian against dense", jacobian[i * PACK + l], dense_j[i], 1e-13 * size);
        /* central differences are exact for orders up to 2; the cubic term leaves delta^2 k */
        for (int j = 0; j < N; j++) {
            double delta = 1e-4, kept = y[j];
            y[j] = kept + delta;
            dense_tendency(&dense, bench->k, y, up);
            y[j] = kept - delta;
            dense_tendency(&dense, bench->k, y, down);
            y[j] = kept;
            for (int i = 0; i < N; i++)
                check_near("Jacobian against differences", jacobian[(i * N + j) * PACK + l],
                           (up[i] - down[i]) / (2.0 * delta), 1e-7 * size);
        }
    }
    free(f);
    free(jacobian);
}

static void test_jacobian(void **state) {
    (void)state;
    random_start();
    for (int trial = 0; trial < 10; trial++) {
        Bench bench = bench_make(random_mechanism());
        random_inputs(&bench);
        check_evaluation(&bench, NULL);
        Holding holding = hold_some(&bench);
        bench.problem.held_species = holding.species;
        check_evaluation(&bench, &holding);
        free(holding.is_free);
        free(holding.value);
        bench_free(&bench);
    }
}

/* ---- one step against LAPACK ---- */

static void check_step(Bench *bench, const Holding *holding, double h) {
    enum { N = RANDOM_SPECIES };
    double *before = field(N);
    memcpy(before, bench->y, N * PACK * sizeof *before);
    bench->tolerance = (Tolerance){1e30, 1e30, 1};
    bench->problem.step = h;
    assert_int_equal(bench_run(bench, h), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        unsigned char is_held[N];
        double held_value[N], y[N], want[N];
        Dense dense;
        dense_of_lane(&dense, bench, holding, l, is_held, held_value);
        lane_of(before, N, l, y);
        dense_step(&dense, bench->problem.k_slope, h, y, want);
        double size = 1.0; /* cancellation happens between the largest members; no species is below it in accuracy */
        for (int s = 0; s < N; s++) size = fmax(size, fabs(want[s]));
        for (int s = 0; s < N; s++) check_near("step against LAPACK", bench->y[s * PACK + l], want[s], 1e-10 * size);
    }
    free(before);
}

static void test_step_against_lapack(void **state) {
    (void)state;
    random_start();
    for (int trial = 0; trial < 12; trial++) {
        Bench bench = bench_make(random_mechanism());
        Holding holding = {0};
        double h = pow(10.0, -5.0 + trial % 4);
        random_inputs(&bench);
        if (trial & 1) use_slope(&bench);
        if (trial & 2) {
            holding = hold_some(&bench);
            bench.problem.held_species = holding.species;
        }
        check_step(&bench, trial & 2 ? &holding : NULL, h);
        free(holding.is_free);
        free(holding.value);
        bench_free(&bench);
    }
}

/* ---- closed forms ---- */

/* A -> B -> C with the start and the rates of each lane scaled differently (Bateman 1910). */
static void chain_exact(double a, double b, double start, double t, double *y) {
    y[0] = start * exp(-a * t);
    y[1] = start * a / (b - a) * (exp(-a * t) - exp(-b * t));
    y[2] = start - y[0] - y[1];
}

static const Sketch chain[] = {{1, {0}, 1, {1}}, {1, {1}, 1, {2}}};
static const Sketch pair_decay[] = {{2, {0, 0}, 1, {1}}};
static const Sketch decay[] = {{1, {0}, 1, {1}}};

static void test_linear_chain(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(3, chain, 2, 0));
    bench.tolerance = (Tolerance){1e-7, 1e-9, 100000};
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 100.0 * (l + 1);
        bench.k[l] = 0.3 + 0.05 * l;
        bench.k[PACK + l] = 2.0 + l;
    }
    assert_int_equal(bench_run(&bench, 2.385), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double want[3];
        chain_exact(bench.k[l], bench.k[PACK + l], 100.0 * (l + 1), 2.385, want);
        for (int s = 0; s < 3; s++) check_near("chain", bench.y[s * PACK + l], want[s], 2e-6 * want[s]);
    }
    bench_free(&bench);
}

/* 2 A -> B, coefficient linear in time: 1/A = 1/A0 + 2 (k t + s t^2 / 2). */
static void test_second_order_with_slope(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, pair_decay, 1, 0));
    bench.tolerance = (Tolerance){1e-8, 1e-12, 100000};
    use_slope(&bench);
    double t = 1.713;
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 1.0 + 0.25 * l;
        bench.k[l] = 0.1 * l;
        bench.slope[l] = 0.7 - 0.08 * l;
    }
    assert_int_equal(bench_run(&bench, t), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double start = 1.0 + 0.25 * l;
        double want = 1.0 / (1.0 / start + 2.0 * (bench.k[l] * t + 0.5 * bench.slope[l] * t * t));
        check_near("second-order decay", bench.y[l], want, 2e-7 * want);
        check_near("its product", bench.y[PACK + l], 0.5 * (start - want), 2e-7 * start);
    }
    bench_free(&bench);
}

/* A slope that starts from nothing must act within the very first step: y = exp(-s t^2 / 2). Only reactions inside
 * the range may see their slope: the second decay's is outside it. */
static void test_slope_from_zero_and_range(void **state) {
    (void)state;
    static const Sketch two[] = {{1, {0}, 1, {2}}, {1, {1}, 1, {2}}};
    Bench bench = bench_make(sketch_mechanism(3, two, 2, 0));
    bench.tolerance = (Tolerance){1e-8, 1e-12, 100000};
    bench.problem.k_slope = bench.slope;
    bench.problem.slope_first = 0;
    bench.problem.slope_last = 1;
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = bench.y[PACK + l] = 3.0;
        bench.k[PACK + l] = 0.5;
        bench.slope[l] = 0.2 * (l + 1);
        bench.slope[PACK + l] = 1e3;
    }
    bench.problem.step = 1.0;
    assert_int_equal(bench_run(&bench, 1.4), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double want = 3.0 * exp(-0.5 * bench.slope[l] * 1.4 * 1.4);
        check_near("decay from zero", bench.y[l], want, 2e-7 * want);
        check_near("decay outside the range", bench.y[PACK + l], 3.0 * exp(-0.7), 1e-6);
    }
    bench_free(&bench);
}

/* Robertson (1966) in Numerical Analysis: An Introduction, Academic Press; at t = 40 the published reference
 * (documentation of SUNDIALS, example cvRoberts) is 0.7158, 9.185e-6, 0.2842. More digits, from SciPy's
 * Radau at relative tolerance 1e-12: 0.71582706872, 9.185534765e-6, 0.28416374575. */
static const Sketch robertson[] = {{1, {0}, 1, {1}}, {2, {1, 1}, 2, {1, 2}}, {2, {1, 2}, 2, {0, 2}}};
static const double robertson_at_40[3] = {0.71582706872, 9.185534765e-6, 0.28416374575};

static Bench robertson_bench(void) {
    Bench bench = bench_make(sketch_mechanism(3, robertson, 3, 0));
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 1.0;
        bench.k[l] = 0.04;
        bench.k[PACK + l] = 3e7;
        bench.k[2 * PACK + l] = 1e4;
    }
    return bench;
}

static void test_robertson(void **state) {
    (void)state;
    Bench bench = robertson_bench();
    bench.tolerance = (Tolerance){1e-7, 1e-13, 100000};
    assert_int_equal(bench_run(&bench, 40.0), SOLVER_DONE);
    for (int l = 0; l < PACK; l++)
        for (int s = 0; s < 3; s++)
            check_near("Robertson", bench.y[s * PACK + l], robertson_at_40[s], 1e-6 * robertson_at_40[s]);
    assert_in_range(bench.counts.steps, 50, 2000);
    bench_free(&bench);
}

/* ---- order of accuracy ---- */

/* Halving the step must divide the error by eight, twice over. */
static void check_order(const char *what, const double error[3]) {
    for (int i = 0; i < 2; i++) {
        double order = log2(error[i] / error[i + 1]);
        print_message("           %s: error %.3e -> %.3e, order %.2f\n", what, error[i], error[i + 1], order);
        if (!(order > 2.8 && order < 3.3)) fail_msg("%s: order %.3f", what, order);
    }
}

static void test_order_smooth(void **state) {
    (void)state;
    double error[3] = {0}, error_slope[3] = {0};
    for (int i = 0; i < 3; i++) {
        Bench bench = bench_make(sketch_mechanism(3, chain, 2, 0));
        for (int l = 0; l < PACK; l++) {
            bench.y[l] = 1.0;
            bench.k[l] = 0.5 + 0.1 * l;
            bench.k[PACK + l] = 1.6;
        }
        bench_fixed_steps(&bench, 2.0, 20 << i);
        double want[3];
        for (int l = 0; l < PACK; l++) {
            chain_exact(bench.k[l], 1.6, 1.0, 2.0, want);
            error[i] = fmax(error[i], fabs(bench.y[PACK + l] - want[1]));
        }
        bench_free(&bench);

        bench = bench_make(sketch_mechanism(2, pair_decay, 1, 0));
        use_slope(&bench);
        double end = 2.0 / (20 << i);
        for (int l = 0; l < PACK; l++) bench.y[l] = 1.0;
        for (int step = 0; step < 20 << i; step++) { /* the slope goes on from call to call: k = 0.2 + 0.6 t */
            for (int l = 0; l < PACK; l++) {
                bench.k[l] = 0.2 + 0.6 * step * end;
                bench.slope[l] = 0.6;
            }
            bench_fixed_steps(&bench, end, 1);
        }
        error_slope[i] = fabs(bench.y[3] - 1.0 / (1.0 + 2.0 * (0.4 + 0.3 * 4.0)));
        bench_free(&bench);
    }
    check_order("linear chain", error);
    check_order("second order, coefficient linear in time", error_slope);
}

/* Robertson from t = 40 to 80 at steps some 1e3 times the fastest time constant. The reference is the same problem
 * with 16 times more steps than the finest, which test_robertson ties to outside values. */
static void test_order_stiff(void **state) {
    (void)state;
    double end[4][3], error[3];
    for (int i = 0; i < 4; i++) {
        Bench bench = robertson_bench();
        bench.tolerance = (Tolerance){1e-10, 1e-16, 1000000};
        assert_int_equal(bench_run(&bench, 40.0), SOLVER_DONE);
        bench_fixed_steps(&bench, 40.0, i < 3 ? 20 << i : 20 << 6);
        for (int s = 0; s < 3; s++) end[i][s] = bench.y[s * PACK + 5];
        bench_free(&bench);
    }
    for (int i = 0; i < 3; i++) error[i] = fabs(end[i][0] - end[3][0]);
    check_order("Robertson", error);
}

/* L-stability: a step of 1e8 time constants leaves nothing of a fast transient. The product row then cancels terms
 * of k h times the amount, so that 1e8 round-offs are what is kept: atoms are exact to round-off of what turned over
 * during a step, not of what is there. */
static void test_fast_decay_vanishes(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 5.0;
        bench.k[l] = 1e8;
    }
    bench_fixed_steps(&bench, 1.0, 1);
    for (int l = 0; l < PACK; l++) {
        check_near("what is left", bench.y[l], 0.0, 1e-6);
        check_near("product", bench.y[PACK + l], 5.0, 5.0 * 1e8 * 4e-16);
    }
    bench_free(&bench);
}

/* ---- what is kept ---- */

static double atoms_in(const double *y, int lane) {
    double sum = 0.0;
    for (int s = 0; s < RANDOM_SPECIES; s++) sum += atoms_of(s) * y[s * PACK + lane];
    return sum;
}

/* Atoms in the state and in what was washed out stay the same to round-off, with held species counting in their own
 * row (the exchange with their reservoir), slopes, and an ordinary error-controlled run. */
static void test_atoms_are_kept(void **state) {
    (void)state;
    random_start();
    for (int trial = 0; trial < 8; trial++) {
        Bench bench = bench_make(random_mechanism());
        Holding holding = {0};
        double *tally = field(RANDOM_WASHOUTS), before[PACK], washed_total = 0.0;
        random_inputs(&bench);
        if (trial & 1) use_slope(&bench);
        double duration = 0.7;
        if (trial & 2) { /* a reservoir without end can feed an explosion: a short while, then */
            holding = hold_some(&bench);
            bench.problem.held_species = holding.species;
            duration = 1e-5;
        }
        bench.problem.tally = tally;
        bench.tolerance = (Tolerance){1e-3, 1e-6, 100000};
        for (int l = 0; l < PACK; l++) before[l] = atoms_in(bench.y, l);
        assert_int_equal(bench_run(&bench, duration), SOLVER_DONE);
        for (int l = 0; l < PACK; l++) {
            double after = atoms_in(bench.y, l), size = 0.0;
            for (int s = 0; s < RANDOM_SPECIES; s++) size += atoms_of(s) * fabs(bench.y[s * PACK + l]);
            for (int w = 0; w < RANDOM_WASHOUTS; w++) {
                after += atoms_of(4 * w + 1) * tally[w * PACK + l];
                washed_total += tally[w * PACK + l];
            }
            /* each of some hundred steps rounds the largest member a few times */
            check_near("atoms", after, before[l], 1e-16 * (double)(bench.counts.steps + 10) * 20.0 * fmax(size, before[l]));
        }
        assert_true(washed_total > 0.0);
        free(holding.is_free);
        free(holding.value);
        free(tally);
        bench_free(&bench);
    }
}

/* A held source makes product at a constant rate and its own row counts what that took from the reservoir; the
 * washout tally of a held species is k times the held value times the time. */
static void test_held_exchange(void **state) {
    (void)state;
    static const Sketch held_decay[] = {{1, {0}, 1, {1}}, {1, {0}, 0, {0}}};
    Bench bench = bench_make(sketch_mechanism(2, held_decay, 2, 1));
    double *is_free = field(1), *value = field(1), *tally = field(1);
    int species[1] = {0};
    for (int l = 0; l < PACK; l++) {
        is_free[l] = l % 2;
        value[l] = l % 2 ? 0.0 : 7.0;
        bench.y[l] = 7.0;
        bench.k[l] = 0.25;
        bench.k[PACK + l] = 0.5;
    }
    bench.problem.held = 1;
    bench.problem.held_species = species;
    bench.problem.held_free = is_free;
    bench.problem.held_value = value;
    bench.problem.tally = tally;
    bench.tolerance = (Tolerance){1e-8, 1e-12, 100000};
    assert_int_equal(bench_run(&bench, 3.0), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double gone = l % 2 ? 7.0 * (1.0 - exp(-0.75 * 3.0)) : 0.75 * 7.0 * 3.0;
        check_near("own row", bench.y[l], 7.0 - gone, 1e-6);
        check_near("product", bench.y[PACK + l], gone / 3.0, 1e-6);
        check_near("tally", tally[l], gone * 2.0 / 3.0, 1e-6);
    }
    assert_int_equal(bench.counts.negatives, 0); /* the debt of a held species is no negative value */
    free(is_free);
    free(value);
    free(tally);
    bench_free(&bench);
}

/* ---- time integrals ---- */

/* Of A -> B: integral of A = (1 - exp(-k t)) A0 / k, integral of the rate = what is gone. Sums are added to. They are
 * trapezoidal (second order) on the solver's steps, so that at relative tolerance 1e-7 some 1e-5 remains. */
static void test_integrals(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    double *sum_y = field(2), *sum_w = field(1);
    bench.tolerance = (Tolerance){1e-7, 1e-12, 100000};
    use_slope(&bench);
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 2.0 + l;
        bench.k[l] = 0.4 + 0.1 * l;
        sum_y[l] = 10.0;
        sum_w[l] = 20.0;
    }
    bench.problem.sum_y = sum_y;
    bench.problem.sum_w = sum_w;
    double t = 1.5;
    assert_int_equal(bench_run(&bench, 0.6), SOLVER_DONE); /* in two calls: the sums must go on */
    assert_int_equal(bench_run(&bench, t - 0.6), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double start = 2.0 + l, k = bench.k[l], gone = start * (1.0 - exp(-k * t));
        check_near("integral of y", sum_y[l] - 10.0, gone / k, 3e-5 * gone / k);
        check_near("integral of the rate", sum_w[l] - 20.0, gone, 3e-5 * gone);
        check_near("integral of the product", sum_y[PACK + l], start * t - gone / k, 3e-5 * start);
    }
    free(sum_y);
    free(sum_w);
    bench_free(&bench);
}

/* Sums do not change what is computed, and with rejected steps in between they still add up to the duration:
 * the integral of a constant species is its value times the time, to round-off. */
static void test_integrals_with_rejections(void **state) {
    (void)state;
    double end[2][3 * PACK];
    for (int with = 0; with < 2; with++) {
        Bench bench = robertson_bench();
        double *sum_y = field(3), *sum_w = field(3);
        bench.tolerance = (Tolerance){1e-4, 1e-10, 100000};
        bench.problem.step = 10.0; /* far too long: rejected */
        if (with) {
            bench.problem.sum_y = sum_y;
            bench.problem.sum_w = sum_w;
        }
        assert_int_equal(bench_run(&bench, 40.0), SOLVER_DONE);
        assert_true(bench.counts.rejections > 0);
        for (int l = 0; with && l < PACK; l++)
            check_near("sum over all species", sum_y[l] + sum_y[PACK + l] + sum_y[2 * PACK + l], 40.0, 1e-11);
        memcpy(end[with], bench.y, sizeof end[with]);
        free(sum_y);
        free(sum_w);
        bench_free(&bench);
    }
    assert_memory_equal(end[0], end[1], sizeof end[0]);
}

/* ---- variants ---- */

static void test_variants_agree(void **state) {
    (void)state;
    random_start();
    SolverVariant variant[SOLVER_VARIANTS];
    int variants = solver_variants(variant);
    assert_in_range(variants, 1, SOLVER_VARIANTS);
    assert_string_equal(variant[0].name, "baseline");
    assert_string_equal(variant[variants - 1].name, solver_variant());
    Bench bench = bench_make(random_mechanism());
    random_inputs(&bench);
    use_slope(&bench);
    enum { SIZE = RANDOM_SPECIES * PACK };
    double start[SIZE], first[SIZE];
    memcpy(start, bench.y, sizeof start);
    bench.tolerance = (Tolerance){1e-5, 1e-8, 100000};
    for (int v = 0; v < variants; v++) {
        memcpy(bench.y, start, sizeof start);
        bench.problem.step = 0.0;
        assert_int_equal(variant[v].advance(bench.kernel, bench.work, &bench.problem, 0.5, &bench.tolerance,
                                            &bench.counts, &bench.where),
                         SOLVER_DONE);
        if (v == 0) memcpy(first, bench.y, sizeof first);
        double worst = 0.0;
        for (int i = 0; i < SIZE; i++) {
            worst = fmax(worst, fabs(bench.y[i] - first[i]) / (1e-3 + fabs(first[i])));
            check_near(variant[v].name, bench.y[i], first[i], 1e-5 * fabs(first[i]) + 1e-8);
        }
        print_message("           %s against baseline: %.1e\n", variant[v].name, worst);
    }
    bench_free(&bench);
}

/* ---- failures ---- */

/* Blow-up: 3 A -> 4 A reaches infinity at t = 1/(2 A0^2), in lane 6 first (a pole of A' = A^2 would not do: the
 * method is exact for that equation and steps over it). A second species counts the time, so that
 * the state left behind can be compared with the closed form at the time it stands for. */
static void test_failures_leave_last_state(void **state) {
    (void)state;
    static const Sketch blow_up[] = {{3, {0, 0, 0}, 4, {0, 0, 0, 0}}, {0, {0}, 1, {1}}};
    for (int few = 0; few < 2; few++) {
        Bench bench = bench_make(sketch_mechanism(2, blow_up, 2, 0));
        bench.tolerance = (Tolerance){1e-6, 1e-12, few ? 30 : 100000};
        for (int l = 0; l < PACK; l++) {
            bench.y[l] = l == 6 ? 2.0 : 1.0;
            bench.k[l] = 1.0;
            bench.k[PACK + l] = 1.0;
        }
        int result = bench_run(&bench, 3.0);
        if (few)
            assert_int_equal(result, SOLVER_TOO_MANY_STEPS);
        else
            assert_true(result == SOLVER_STEP_UNDERFLOW || result == SOLVER_NOT_FINITE);
        assert_int_equal(bench.where, 6 * 2 + 0);
        double t = bench.y[PACK];
        assert_true(t > 0.0 && t < 0.125 + 1e-6);
        double want = 1.0 / sqrt(1.0 - 2.0 * t);
        check_near("a lane that did not fail", bench.y[0], want, 1e-5 * want);
        assert_true(isfinite(bench.y[6]) && bench.y[6] > 2.0);
        bench_free(&bench);
    }
}

static void test_not_finite(void **state) {
    (void)state;
    for (int trial = 0; trial < 3; trial++) {
        Bench bench = bench_make(sketch_mechanism(3, chain, 2, 0));
        double start[3 * PACK];
        for (int l = 0; l < PACK; l++) {
            bench.y[l] = 1.0;
            bench.k[l] = bench.k[PACK + l] = 1.0;
        }
        if (trial == 0) bench.k[PACK + 3] = NAN;
        if (trial == 1) bench.y[2 * PACK + 3] = NAN; /* an end product, which feeds nothing */
        if (trial == 2) bench.y[PACK + 3] = HUGE_VAL;
        memcpy(start, bench.y, sizeof start);
        assert_int_equal(bench_run(&bench, 1.0), SOLVER_NOT_FINITE);
        assert_int_equal(bench.where / 3, 3);
        assert_int_equal(bench.where % 3, trial == 1 ? 2 : 1);
        assert_memory_equal(bench.y, start, sizeof start);
        assert_int_equal(bench.counts.steps, 0);
        bench_free(&bench);
    }
}

/* No step allowed at all: refused at once, whatever the workspace held. */
static void test_no_steps_allowed(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    bench.tolerance.max_steps = 0;
    assert_int_equal(bench_run(&bench, 1.0), SOLVER_TOO_MANY_STEPS);
    assert_in_range(bench.where, 0, 2 * PACK - 1);
    bench_free(&bench);
}

/* The step handed back serves the next call: short calls in a row do not collapse it. */
static void test_step_is_remembered(void **state) {
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 1.0;
        bench.k[l] = 1e-3;
    }
    bench.tolerance = (Tolerance){1e-4, 1e-12, 100000};
    for (int i = 0; i < 50; i++) assert_int_equal(bench_run(&bench, 1.0), SOLVER_DONE);
    assert_true(bench.problem.step >= 1.0);
    assert_in_range(bench.counts.steps, 50, 60);
    bench_free(&bench);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_elimination_is_complete),
        cmocka_unit_test(test_jacobian),
        cmocka_unit_test(test_step_against_lapack),
        cmocka_unit_test(test_linear_chain),
        cmocka_unit_test(test_second_order_with_slope),
        cmocka_unit_test(test_slope_from_zero_and_range),
        cmocka_unit_test(test_robertson),
        cmocka_unit_test(test_order_smooth),
        cmocka_unit_test(test_order_stiff),
        cmocka_unit_test(test_fast_decay_vanishes),
        cmocka_unit_test(test_atoms_are_kept),
        cmocka_unit_test(test_held_exchange),
        cmocka_unit_test(test_integrals),
        cmocka_unit_test(test_integrals_with_rejections),
        cmocka_unit_test(test_variants_agree),
        cmocka_unit_test(test_failures_leave_last_state),
        cmocka_unit_test(test_not_finite),
        cmocka_unit_test(test_no_steps_allowed),
        cmocka_unit_test(test_step_is_remembered),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
