/* Tests of chem/rosenbrock against closed forms: accuracy, order, what is kept, time integrals, failures. The
 * lanes of a pack hold different states wherever the problem allows. */
#include "made_up.h"

/* ---- closed forms ---- */

/* A -> B -> C with the start and the rates of each lane scaled differently (Bateman 1910). */
static void chain_exact(double a, double b, double start, double t, double *y)
{
    y[0] = start * exp(-a * t);
    y[1] = start * a / (b - a) * (exp(-a * t) - exp(-b * t));
    y[2] = start - y[0] - y[1];
}

static const Sketch chain[] = {{1, {0}, 1, {1}}, {1, {1}, 1, {2}}};
static const Sketch pair_decay[] = {{2, {0, 0}, 1, {1}}};
static const Sketch decay[] = {{1, {0}, 1, {1}}};

static void test_linear_chain(void **state)
{
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
        for (int s = 0; s < 3; s++)
            check_near("chain", bench.y[s * PACK + l], want[s], 2e-6 * want[s]);
    }
    bench_free(&bench);
}

/* 2 A -> B, coefficient linear in time: 1/A = 1/A0 + 2 (k t + s t^2 / 2). */
static void test_second_order_with_slope(void **state)
{
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

/* A source besides a decay: y = s/k + (y0 - s/k) exp(-k t), a sink likewise; and the turnover that is
 * reported is that of the chemistry alone. */
static void test_source_from_outside(void **state)
{
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    bench.tolerance = (Tolerance){1e-8, 1e-12, 100000};
    double *source = field(2), *production = field(2), *loss = field(2), t = 1.713;
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 3.0 + l;
        bench.y[PACK + l] = 50.0;
        bench.k[l] = 0.4 + 0.1 * l;
        source[l] = 0.7 - 0.1 * l;
        source[PACK + l] = -2.0;
    }
    bench.problem.source = source;
    bench.problem.production = production;
    bench.problem.loss = loss;
    assert_int_equal(bench_run(&bench, t), SOLVER_DONE);
    for (int l = 0; l < PACK; l++) {
        double steady = source[l] / bench.k[l], want = steady + (3.0 + l - steady) * exp(-bench.k[l] * t);
        check_near("decay with a source", bench.y[l], want, 2e-7 * (3.0 + l));
        /* what has come and gone in all is exact: a linear invariant */
        check_near("sum", bench.y[l] + bench.y[PACK + l], 53.0 + l + t * (source[l] - 2.0), 1e-13 * 60.0);
        check_near("loss frequency", loss[l], bench.k[l], 1e-12);
        check_near("production of nothing", production[l], 0.0, 1e-12);
        /* at the start of the last step, whose length the solver chose */
        assert_true(production[PACK + l] > 0.9 * bench.k[l] * bench.y[l]);
        check_near("no loss", loss[PACK + l], 0.0, 1e-12);
    }
    free(source);
    free(production);
    free(loss);
    bench_free(&bench);
}

/* A slope that starts from nothing must act within the very first step: y = exp(-s t^2 / 2). Only reactions
 * inside the range may see their slope: the second decay's is outside it. */
static void test_slope_from_zero_and_range(void **state)
{
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

/* An empty range of moving coefficients, from a fresh workspace, is none. */
static void test_empty_slope_range(void **state)
{
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    bench.problem.k_slope = bench.slope;
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = bench.k[l] = 1.0;
        bench.slope[l] = 1e3;
    }
    assert_int_equal(bench_run(&bench, 1.0), SOLVER_DONE);
    check_near("decay", bench.y[5], exp(-1.0), 1e-5);
    bench_free(&bench);
}

/* Robertson (1966) in Numerical Analysis: An Introduction, Academic Press; at t = 40 the published reference
 * (documentation of SUNDIALS, example cvRoberts) is 0.7158, 9.185e-6, 0.2842. More digits, from SciPy's
 * Radau at relative tolerance 1e-12: 0.71582706872, 9.185534765e-6, 0.28416374575. */
static const Sketch robertson[] = {{1, {0}, 1, {1}}, {2, {1, 1}, 2, {1, 2}}, {2, {1, 2}, 2, {0, 2}}};
static const double robertson_at_40[3] = {0.71582706872, 9.185534765e-6, 0.28416374575};

static Bench robertson_bench(void)
{
    Bench bench = bench_make(sketch_mechanism(3, robertson, 3, 0));
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 1.0;
        bench.k[l] = 0.04;
        bench.k[PACK + l] = 3e7;
        bench.k[2 * PACK + l] = 1e4;
    }
    return bench;
}

static void test_robertson(void **state)
{
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
static void check_order(const char *what, const double error[3])
{
    for (int i = 0; i < 2; i++) {
        double order = log2(error[i] / error[i + 1]);
        print_message("           %s: error %.3e -> %.3e, order %.2f\n", what, error[i], error[i + 1], order);
        if (!(order > 2.8 && order < 3.3))
            fail_msg("%s: order %.3f", what, order);
    }
}

static void test_order_smooth(void **state)
{
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
        for (int l = 0; l < PACK; l++)
            bench.y[l] = 1.0;
        for (int step = 0; step < 20 << i;
             step++) { /* the slope goes on from call to call: k = 0.2 + 0.6 t */
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

/* Robertson from t = 40 to 80 at steps some 1e3 times the fastest time constant. The reference is the same
 * problem with 16 times more steps than the finest, which test_robertson ties to outside values. */
static void test_order_stiff(void **state)
{
    (void)state;
    double end[4][3], error[3];
    for (int i = 0; i < 4; i++) {
        Bench bench = robertson_bench();
        bench.tolerance = (Tolerance){1e-10, 1e-16, 1000000};
        assert_int_equal(bench_run(&bench, 40.0), SOLVER_DONE);
        bench_fixed_steps(&bench, 40.0, i < 3 ? 20 << i : 20 << 6);
        for (int s = 0; s < 3; s++)
            end[i][s] = bench.y[s * PACK + 5];
        bench_free(&bench);
    }
    for (int i = 0; i < 3; i++)
        error[i] = fabs(end[i][0] - end[3][0]);
    check_order("Robertson", error);
}

/* L-stability: a step of 1e8 time constants leaves nothing of a fast transient. The product row then cancels
 * terms of k h times the amount, so that 1e8 round-offs are what is kept: atoms are exact to round-off of
 * what turned over during a step, not of what is there. */
static void test_fast_decay_vanishes(void **state)
{
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

static double atoms_in(const double *y, int lane)
{
    double sum = 0.0;
    for (int s = 0; s < RANDOM_SPECIES; s++)
        sum += atoms_of(s) * y[s * PACK + lane];
    return sum;
}

/* Atoms in the state and in what was washed out stay the same to round-off, with held species counting in
 * their own row (the exchange with their reservoir), slopes, and an ordinary error-controlled run. */
static void test_atoms_are_kept(void **state)
{
    (void)state;
    random_start();
    for (int trial = 0; trial < 8; trial++) {
        Bench bench = bench_make(random_mechanism());
        Holding holding = {0};
        double *tally = field(RANDOM_WASHOUTS), before[PACK], washed_total = 0.0;
        random_inputs(&bench);
        if (trial & 1)
            use_slope(&bench);
        double duration = 0.7;
        if (trial & 2) { /* a reservoir without end can feed an explosion: a short while, then */
            holding = hold_some(&bench);
            bench.problem.held_species = holding.species;
            duration = 1e-5;
        }
        bench.problem.tally = tally;
        bench.tolerance = (Tolerance){1e-3, 1e-6, 100000};
        for (int l = 0; l < PACK; l++)
            before[l] = atoms_in(bench.y, l);
        assert_int_equal(bench_run(&bench, duration), SOLVER_DONE);
        for (int l = 0; l < PACK; l++) {
            double after = atoms_in(bench.y, l), size = 0.0;
            for (int s = 0; s < RANDOM_SPECIES; s++)
                size += atoms_of(s) * fabs(bench.y[s * PACK + l]);
            for (int w = 0; w < RANDOM_WASHOUTS; w++) {
                after += atoms_of(4 * w + 1) * tally[w * PACK + l];
                washed_total += tally[w * PACK + l];
            }
            /* each of some hundred steps rounds the largest member a few times */
            check_near("atoms", after, before[l],
                       1e-16 * (double)(bench.counts.steps + 10) * 20.0 * fmax(size, before[l]));
        }
        assert_true(washed_total > 0.0);
        free(holding.is_free);
        free(holding.value);
        free(tally);
        bench_free(&bench);
    }
}

/* A held source makes product at a constant rate and its own row counts what that took from the reservoir;
 * the washout tally of a held species is k times the held value times the time. */
static void test_held_exchange(void **state)
{
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

/* Of A -> B with a coefficient k: integral of A = (1 - exp(-k t)) A0 / k, integral of the rate = what is
 * gone. Sums are added to, over two calls. */
static void test_integrals(void **state)
{
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
        check_near("integral of y", sum_y[l] - 10.0, gone / k, 1e-6 * gone / k);
        check_near("integral of the rate", sum_w[l] - 20.0, gone, 1e-6 * gone);
        check_near("integral of the product", sum_y[PACK + l], start * t - gone / k, 1e-6 * start);
    }
    free(sum_y);
    free(sum_w);
    bench_free(&bench);
}

/* Integrated rates are the other side of the state's change: change = sum of weight times integral, and
 * washout tallies are integrals themselves, to round-off, whatever slopes and held species do. */
static void test_integrals_close_the_budget(void **state)
{
    (void)state;
    random_start();
    enum { N = RANDOM_SPECIES, R = RANDOM_REACTIONS };
    for (int trial = 0; trial < 8; trial++) {
        Bench bench = bench_make(random_mechanism());
        Holding holding = {0};
        double *sum_y = field(N), *sum_w = field(R), *tally = field(RANDOM_WASHOUTS), start[N * PACK];
        random_inputs(&bench);
        if (trial & 1)
            use_slope(&bench);
        if (trial & 2) {
            holding = hold_some(&bench);
            bench.problem.held_species = holding.species;
        }
        bench.problem.sum_y = sum_y;
        bench.problem.sum_w = sum_w;
        bench.problem.tally = tally;
        bench.tolerance = (Tolerance){1e-3, 1e-6, 100000};
        memcpy(start, bench.y, sizeof start);
        assert_int_equal(bench_run(&bench, trial & 2 ? 1e-5 : 0.01), SOLVER_DONE);
        for (int l = 0; l < PACK; l++) {
            double change[N] = {0}, size[N] = {0};
            for (int r = 0; r < R; r++) {
                const Reaction *reaction = &bench.mechanism->reaction[r];
                for (int c = 0; c < reaction->changes; c++) {
                    change[reaction->changed[c]] += reaction->change[c] * sum_w[r * PACK + l];
                    size[reaction->changed[c]] += fabs(reaction->change[c] * sum_w[r * PACK + l]);
                }
            }
            for (int s = 0; s < N; s++)
                check_near("budget", bench.y[s * PACK + l] - start[s * PACK + l], change[s],
                           1e-13 * (size[s] + start[s * PACK + l]) * (double)(10 + bench.counts.steps));
            for (int w = 0; w < RANDOM_WASHOUTS; w++)
                check_near("washout", tally[w * PACK + l], sum_w[(R - RANDOM_WASHOUTS + w) * PACK + l],
                           1e-13);
        }
        free(holding.is_free);
        free(holding.value);
        free(sum_y);
        free(sum_w);
        free(tally);
        bench_free(&bench);
    }
}

/* Q of A -> A + Q (coefficient 1) is the integral of A by the solver itself: sum_y must be that to round-off,
 * whatever the steps, also where A is held. */
static void test_integral_is_a_row_of_the_method(void **state)
{
    (void)state;
    static const Sketch with_integral[] = {{2, {0, 0}, 1, {1}}, {1, {1}, 2, {0, 0}}, {1, {0}, 2, {0, 2}}};
    Bench bench = bench_make(sketch_mechanism(3, with_integral, 3, 0));
    double *sum_y = field(3), *sum_w = field(3), *is_free = field(1), *value = field(1);
    int species[1] = {0};
    for (int l = 0; l < PACK; l++) {
        is_free[l] = l != 3;
        value[l] = l != 3 ? 0.0 : 0.8;
        bench.y[l] = 1.0 + l;
        bench.k[l] = 2.0;
        bench.k[PACK + l] = 0.3;
        bench.k[2 * PACK + l] = 1.0;
        bench.slope[l] = 0.5;
    }
    use_slope(&bench);
    bench.problem.held = 1;
    bench.problem.held_species = species;
    bench.problem.held_free = is_free;
    bench.problem.held_value = value;
    bench.problem.sum_y = sum_y;
    bench.problem.sum_w = sum_w;
    bench_fixed_steps(&bench, 1.0, 1); /* one rough step, in which every stage counts */
    for (int l = 0; l < PACK; l++) {
        check_near("integral of A", sum_y[l], bench.y[2 * PACK + l], 1e-13 * fabs(sum_y[l]));
        check_near("integral of its rate", sum_w[2 * PACK + l], sum_y[l], 1e-13 * fabs(sum_y[l]));
    }
    free(sum_y);
    free(sum_w);
    free(is_free);
    free(value);
    bench_free(&bench);
}

/* What the reservoir of a held species owes has no say in the step size: the same steps whether its row
 * starts from nothing, where any error is relatively large, or from plenty. */
static void test_held_row_does_not_set_the_step(void **state)
{
    (void)state;
    long steps[2];
    for (int plenty = 0; plenty < 2; plenty++) {
        Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
        double *is_free = field(1), *value = field(1);
        int species[1] = {1};
        for (int l = 0; l < PACK; l++) {
            bench.y[l] = 1e3;
            bench.k[l] = 1.0;
            value[l] = 5.0;
            bench.y[PACK + l] = plenty ? 1e9 : 0.0;
        }
        bench.problem.held = 1;
        bench.problem.held_species = species;
        bench.problem.held_free = is_free;
        bench.problem.held_value = value;
        bench.tolerance = (Tolerance){1e-4, 1e-9, 100000};
        bench.problem.step = 0.2;
        assert_int_equal(bench_run(&bench, 3.0), SOLVER_DONE);
        steps[plenty] = bench.counts.steps + bench.counts.rejections;
        free(is_free);
        free(value);
        bench_free(&bench);
    }
    assert_int_equal(steps[0], steps[1]);
}

/* Sums do not change what is computed, and with rejected steps in between they still add up to the duration:
 * the integral of a constant species is its value times the time, to round-off. */
static void test_integrals_with_rejections(void **state)
{
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

/* ---- failures ---- */

/* Blow-up: 3 A -> 4 A reaches infinity at t = 1/(2 A0^2), in lane 6 first (a pole of A' = A^2 would not do:
 * the method is exact for that equation and steps over it). A second species counts the time, so that the
 * state left behind can be compared with the closed form at the time it stands for. */
static void test_failures_leave_last_state(void **state)
{
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

static void test_not_finite(void **state)
{
    (void)state;
    for (int trial = 0; trial < 3; trial++) {
        Bench bench = bench_make(sketch_mechanism(3, chain, 2, 0));
        double start[3 * PACK];
        for (int l = 0; l < PACK; l++) {
            bench.y[l] = 1.0;
            bench.k[l] = bench.k[PACK + l] = 1.0;
        }
        if (trial == 0)
            bench.k[PACK + 3] = NAN;
        if (trial == 1)
            bench.y[2 * PACK + 3] = NAN; /* an end product, which feeds nothing */
        if (trial == 2)
            bench.y[PACK + 3] = HUGE_VAL;
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
static void test_no_steps_allowed(void **state)
{
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    bench.tolerance.max_steps = 0;
    assert_int_equal(bench_run(&bench, 1.0), SOLVER_TOO_MANY_STEPS);
    assert_in_range(bench.where, 0, 2 * PACK - 1);
    bench_free(&bench);
}

/* The step handed back serves the next call: short calls in a row do not collapse it. */
static void test_step_is_remembered(void **state)
{
    (void)state;
    Bench bench = bench_make(sketch_mechanism(2, decay, 1, 0));
    for (int l = 0; l < PACK; l++) {
        bench.y[l] = 1.0;
        bench.k[l] = 1e-3;
    }
    bench.tolerance = (Tolerance){1e-4, 1e-12, 100000};
    for (int i = 0; i < 50; i++)
        assert_int_equal(bench_run(&bench, 1.0), SOLVER_DONE);
    assert_true(bench.problem.step >= 1.0);
    bench.problem.step = 500.0; /* cut short by the call's end, and still what was known to do */
    assert_int_equal(bench_run(&bench, 1.0), SOLVER_DONE);
    assert_true(bench.problem.step == 500.0);
    assert_in_range(bench.counts.steps, 51, 61);
    bench_free(&bench);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_linear_chain),
        cmocka_unit_test(test_second_order_with_slope),
        cmocka_unit_test(test_source_from_outside),
        cmocka_unit_test(test_slope_from_zero_and_range),
        cmocka_unit_test(test_robertson),
        cmocka_unit_test(test_order_smooth),
        cmocka_unit_test(test_order_stiff),
        cmocka_unit_test(test_fast_decay_vanishes),
        cmocka_unit_test(test_atoms_are_kept),
        cmocka_unit_test(test_held_exchange),
        cmocka_unit_test(test_integrals),
        cmocka_unit_test(test_integrals_close_the_budget),
        cmocka_unit_test(test_integral_is_a_row_of_the_method),
        cmocka_unit_test(test_held_row_does_not_set_the_step),
        cmocka_unit_test(test_empty_slope_range),
        cmocka_unit_test(test_integrals_with_rejections),
        cmocka_unit_test(test_failures_leave_last_state),
        cmocka_unit_test(test_not_finite),
        cmocka_unit_test(test_no_steps_allowed),
        cmocka_unit_test(test_step_is_remembered),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
