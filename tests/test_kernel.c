/* Tests of chem/kernel and of one step of chem/rosenbrock on made-up mechanisms, against a dense one-lane
 * reading of the mechanism written here and LAPACK. The lanes of a pack always hold different states, so that
 * a mix-up shows. */
#include <lapacke.h>

#include "../chem/rosenbrock_kernel.h"
#include "made_up.h"

/* ---- a dense reading of a mechanism, one lane, independent of the kernel ---- */

typedef struct {
    const Mechanism *mechanism;
    int lane;
    const double *k;              /* [reactions][PACK] */
    const unsigned char *is_held; /* [species] in this lane, or NULL */
    const double *held_value;     /* [species] */
} Dense;

static double seen(const Dense *dense, const double *y, int s)
{
    return dense->is_held && dense->is_held[s] ? dense->held_value[s] : y[s];
}

static void dense_tendency(const Dense *dense, const double *k, const double *y, double *f)
{
    const Mechanism *m = dense->mechanism;
    for (int s = 0; s < m->solved; s++)
        f[s] = 0.0;
    for (int r = 0; r < m->reactions; r++) {
        const Reaction *reaction = &m->reaction[r];
        double rate = k[r * PACK + dense->lane];
        for (int i = 0; i < reaction->reactants; i++)
            rate *= seen(dense, y, reaction->reactant[i]);
        for (int c = 0; c < reaction->changes; c++)
            f[reaction->changed[c]] += reaction->change[c] * rate;
    }
}

/* jacobian [species][species], row-major, by the product rule reactant by reactant. */
static void dense_jacobian(const Dense *dense, const double *y, double *jacobian)
{
    const Mechanism *m = dense->mechanism;
    int n = m->solved;
    memset(jacobian, 0, (size_t)n * (size_t)n * sizeof *jacobian);
    for (int r = 0; r < m->reactions; r++) {
        const Reaction *reaction = &m->reaction[r];
        for (int by = 0; by < reaction->reactants; by++) {
            int s = reaction->reactant[by];
            if (dense->is_held && dense->is_held[s])
                continue;
            double rate = dense->k[r * PACK + dense->lane];
            for (int i = 0; i < reaction->reactants; i++)
                if (i != by)
                    rate *= seen(dense, y, reaction->reactant[i]);
            for (int c = 0; c < reaction->changes; c++)
                jacobian[reaction->changed[c] * n + s] += reaction->change[c] * rate;
        }
    }
}

/* One RODAS3 step in the method's textbook form, increments k_i = h f'(...) of Hairer and Wanner (1996,
 * IV.7): k_i = h f(t + alpha_i h, y + sum alpha_ij k_j) + h J sum gamma_ij k_j + h^2 gamma_i df/dt with Sandu
 * et al. (1997): gamma = 1/2; alpha_31 = 1, alpha_41 = 3/4, alpha_42 = -1/4, alpha_43 = 1/2; gamma_21 = 1,
 * gamma_31 = gamma_32 = -1/4, gamma_41 = gamma_42 = 1/12, gamma_43 = -2/3; b = (5/6, -1/6, -1/6, 1/2). The
 * solver uses the transformed one, so that agreement checks the transformation. */
static void dense_step(const Dense *dense, const double *slope, double h, const double *y, double *next)
{
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
    if (slope)
        dense_tendency(dense, slope, y, slope_f);
    for (int i = 0; i < n * n; i++)
        matrix[i] = (i % (n + 1) == 0) - 0.5 * h * jacobian[i];
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
        for (int r = 0; r < m->reactions * PACK; r++)
            k_at[r] = dense->k[r] + (slope ? alpha_sum * h * slope[r] : 0.0);
        dense_tendency(dense, k_at, at, increment);
        for (int s = 0; s < n; s++) {
            double product = 0.0;
            for (int j = 0; j < n; j++)
                product += jacobian[s * n + j] * mixed[j];
            increment[s] = h * increment[s] + h * product + h * h * gamma_sum * slope_f[s];
        }
        assert_int_equal(LAPACKE_dgetrs(LAPACK_ROW_MAJOR, 'N', n, 1, matrix, n, pivot, increment, 1), 0);
    }
    for (int s = 0; s < n; s++) {
        next[s] = y[s];
        for (int i = 0; i < 4; i++)
            next[s] += weight[i] * stage[i * n + s];
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

static void dense_of_lane(Dense *dense, const Bench *bench, const Holding *holding, int lane,
                          unsigned char *is_held, double *held_value)
{
    memset(is_held, 0, RANDOM_SPECIES);
    for (int i = 0; holding && i < 2; i++) {
        is_held[holding->species[i]] = holding->is_free[i * PACK + lane] == 0.0;
        held_value[holding->species[i]] = holding->value[i * PACK + lane];
    }
    *dense = (Dense){bench->mechanism, lane, bench->k, is_held, held_value};
}

static void lane_of(const double *pack, int rows, int lane, double *out)
{
    for (int s = 0; s < rows; s++)
        out[s] = pack[s * PACK + lane];
}

/* ---- the symbolic part ---- */

/* The order is a permutation, rows ascend, and the products listed are exactly those of an LU factorisation.
 */
static void test_elimination_is_complete(void **state)
{
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
    /* every (i, k) and (k, j) with k < min(i, j) that are there are a product of an entry (i, j) that is
     * there */
    int entry_at[RANDOM_SPECIES][RANDOM_SPECIES];
    memset(entry_at, -1, sizeof entry_at);
    for (int i = 0; i < n; i++)
        for (int e = kernel->row_first[i]; e < kernel->row_first[i + 1]; e++)
            entry_at[i][kernel->column[e]] = e;
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            int e = entry_at[i][j], t = e < 0 ? 0 : kernel->product_first[e];
            for (int k = 0; k < i && k < j; k++) {
                if (entry_at[i][k] < 0 || entry_at[k][j] < 0)
                    continue;
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

static void check_evaluation(Bench *bench, const Holding *holding)
{
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
        for (int i = 0; i < N; i++)
            size_f = fmax(size_f, fabs(want[i]));
        for (int i = 0; i < N * N; i++)
            size = fmax(size, fabs(dense_j[i]));
        for (int i = 0; i < N; i++)
            check_near("tendency", f[i * PACK + l], want[i], 1e-13 * size_f);
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

static void test_jacobian(void **state)
{
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

/* Returns how many lanes were compared. */
static int check_step(Bench *bench, const Holding *holding, double h)
{
    enum { N = RANDOM_SPECIES };
    int compared = 0;
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
        double size = 1.0; /* cancellation is between the largest members: accuracy is relative to them */
        for (int s = 0; s < N; s++)
            size = fmax(size, fabs(want[s]));
        if (size > 1e4)
            continue; /* this lane explodes: (1/(gamma h) - J) is close to singular */
        compared++;
        for (int s = 0; s < N; s++)
            check_near("step against LAPACK", bench->y[s * PACK + l], want[s], 1e-10 * size);
    }
    free(before);
    return compared;
}

static void test_step_against_lapack(void **state)
{
    (void)state;
    random_start();
    int compared = 0;
    for (int trial = 0; trial < 12; trial++) {
        Bench bench = bench_make(random_mechanism());
        Holding holding = {0};
        double h = pow(10.0, -5.0 + trial % 4);
        random_inputs(&bench);
        if (trial & 1)
            use_slope(&bench);
        if (trial & 2) {
            holding = hold_some(&bench);
            bench.problem.held_species = holding.species;
        }
        compared += check_step(&bench, trial & 2 ? &holding : NULL, h);
        free(holding.is_free);
        free(holding.value);
        bench_free(&bench);
    }
    assert_in_range(compared, 6 * PACK, 12 * PACK);
}

/* ---- variants ---- */

static void test_variants_agree(void **state)
{
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
        if (v == 0)
            memcpy(first, bench.y, sizeof first);
        double worst = 0.0;
        for (int i = 0; i < SIZE; i++) {
            worst = fmax(worst, fabs(bench.y[i] - first[i]) / (1e-3 + fabs(first[i])));
            check_near(variant[v].name, bench.y[i], first[i], 1e-5 * fabs(first[i]) + 1e-8);
        }
        print_message("           %s against baseline: %.1e\n", variant[v].name, worst);
    }
    bench_free(&bench);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_elimination_is_complete),
        cmocka_unit_test(test_jacobian),
        cmocka_unit_test(test_step_against_lapack),
        cmocka_unit_test(test_variants_agree),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
