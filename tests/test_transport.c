/* Tests of transport/: eddy diffusion, against solutions from outside it and what holds whatever the input.
 * Grid and air are tested in test_air.c. SKYMEND_SEED in the environment changes the random inputs; the seed
 * is printed. */
#include "transport_room.h"

/* ---- helpers ---- */

static uint64_t random_state;

static void random_start(void)
{
    const char *text = getenv("SKYMEND_SEED");
    random_state = text ? strtoull(text, NULL, 10) : 20260u;
    print_message("           random seed %llu\n", (unsigned long long)random_state);
}

static double random_unit(void) /* splitmix64 (Steele, Lea, Flood 2014), uniform in [0, 1) */
{
    uint64_t z = (random_state += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return (double)((z ^ (z >> 31)) >> 11) * 0x1p-53;
}

static double *array(int count)
{
    double *made = calloc((size_t)count, sizeof *made);
    assert_non_null(made);
    return made;
}

/* A column with everything a test of the operator needs. */
typedef struct {
    Grid grid;
    Air air;
    double *eddy;
    Diffusion *diffusion;
} Column;

/* Density n exp(-z / scale_km), constant when scale_km is INFINITY; eddy coefficient constant.
 * Edges z = top ((1 - stretch) u + stretch u^2) with u even in 0..1. */
static Column column_ideal(double top_km, int layers, double scale_km, double eddy, double stretch)
{
    Column c;
    Fault fault = {0};
    double *edge = array(layers + 1);
    memset(&c, 0, sizeof c);
    for (int e = 0; e <= layers; e++) {
        double u = (double)e / layers;
        edge[e] = top_km * ((1.0 - stretch) * u + stretch * u * u);
    }
    assert_int_equal(grid_make(&c.grid, 0.0, 0.0, edge, layers + 1, &fault), 0);
    free(edge);
    c.air.number_density = array(c.grid.padded);
    c.air.edge_density = array(layers + 1);
    c.eddy = array(layers + 1);
    for (int i = 0; i < c.grid.padded; i++)
        c.air.number_density[i] = 2.5e19 * exp(-c.grid.middle[i] / (scale_km * KM));
    for (int e = 0; e <= layers; e++) {
        c.air.edge_density[e] = 2.5e19 * exp(-c.grid.edge[e] / (scale_km * KM));
        c.eddy[e] = eddy;
    }
    assert_int_equal(diffusion_make(&c.diffusion, &c.grid, &c.air, c.eddy, &fault), 0);
    return c;
}

/* Standard air on layers of uneven depth, with an eddy profile that has the minimum and the rise of
 * a real one. */
static Column column_uneven(void)
{
    Column c;
    Fault fault = {0};
    double edge[64], z = 0.0;
    int edges = 0;
    memset(&c, 0, sizeof c);
    for (; z < 79.0; z += 0.4 + 0.035 * z + 0.3 * (edges % 3 == 1))
        edge[edges++] = z;
    edge[edges++] = 80.0;
    assert_int_equal(grid_make(&c.grid, 0.0, 0.0, edge, edges, &fault), 0);
    assert_int_equal(air_standard(&c.air, &c.grid, &fault), 0);
    c.eddy = array(edges);
    for (int e = 0; e < edges; e++)
        c.eddy[e] = edge[e] < 12.0 ? 1e5 : 4e3 * exp((edge[e] - 12.0) / 10.0);
    assert_int_equal(diffusion_make(&c.diffusion, &c.grid, &c.air, c.eddy, &fault), 0);
    return c;
}

static void column_free(Column *c)
{
    diffusion_free(c->diffusion);
    free(c->eddy);
    air_free(&c->air);
    grid_free(&c->grid);
}

static DiffusionFactor *factor_of(const Column *c, int kind, double velocity, double step)
{
    Fault fault = {0};
    DiffusionFactor *made = NULL;
    if (diffusion_factor(&made, c->diffusion, kind, velocity, step, &fault))
        fail_msg("%s", fault.text);
    return made;
}

static double column_mass(const Column *c, const double *x)
{
    long double sum = 0.0L; /* so that the yardstick adds no rounding of its own */
    for (int i = 0; i < c->grid.layers; i++)
        sum += (long double)c->air.number_density[i] * c->grid.depth[i] * x[i];
    return (double)sum;
}

/* steps steps of one species; returns what was received in all of them. */
static double run(const Column *c, int kind, double velocity, double step, int steps, double *x)
{
    DiffusionFactor *factor = factor_of(c, kind, velocity, step);
    double *work = malloc(diffusion_work(factor, 1) * sizeof *work), received, sum = 0.0;
    assert_non_null(work);
    for (int s = 0; s < steps; s++) {
        diffusion_step(factor, x, NULL, 1, &received, work);
        sum += received;
    }
    free(work);
    diffusion_factor_free(factor);
    return sum;
}

/* ---- diffusion: exact solutions ---- */

#define GAMMA (1.0 - sqrt(0.5))

static double growth(double z) /* stability function of the scheme, z = eigenvalue * step */
{
    return (1.0 + (1.0 - 2.0 * GAMMA) * z) / ((1.0 - GAMMA * z) * (1.0 - GAMMA * z));
}

static void test_discrete_modes(void **state)
{
    (void)state;
    /* Constant N and K, closed ends: cos(m pi (i + 1/2) / n) is an eigenvector of the finite
     * volumes with -4 K / dz^2 sin^2(m pi / 2 n), so one step multiplies it by growth() to
     * round-off. */
    const int n = 43;
    Column c = column_ideal(60.0, n, INFINITY, 5e4, 0.0);
    double *x = array(c.grid.padded), *slope = array(c.grid.padded), dz = 60.0 * KM / n;
    const int mode[] = {1, 5, 42};
    const double step[] = {3600.0, 15 * DAY_SECONDS, 1e10};
    for (int a = 0; a < 3; a++) {
        double value = -4.0 * 5e4 / (dz * dz) * pow(sin(0.5 * mode[a] * PI / n), 2.0);
        for (int b = 0; b < 3; b++) {
            for (int i = 0; i < n; i++)
                x[i] = 1.0 + 0.5 * cos(mode[a] * PI * (i + 0.5) / n);
            diffusion_tendency(c.diffusion, x, slope);
            for (int i = 0; i < n; i++)
                check_near("tendency", slope[i], value * (x[i] - 1.0), 1e-13 * 4.0 * 5e4 / (dz * dz));
            assert_true(run(&c, GROUND_CLOSED, 0.0, step[b], 1, x) == 0.0);
            for (int i = 0; i < n; i++)
                check_near("mode after a step", x[i],
                           1.0 + 0.5 * growth(value * step[b]) * cos(mode[a] * PI * (i + 0.5) / n), 1e-13);
        }
    }
    free(x);
    free(slope);
    column_free(&c);
}

/* Largest error after `time` s of the continuous mode m, closed, constant N and K. */
static double mode_error(int layers, double stretch, int m, double time, int steps)
{
    Column c = column_ideal(60.0, layers, INFINITY, 5e4, stretch);
    double *x = array(c.grid.padded), wave = m * PI / (60.0 * KM), worst = 0.0;
    for (int i = 0; i < layers; i++)
        x[i] = 1.0 + 0.5 * cos(wave * c.grid.middle[i]);
    run(&c, GROUND_CLOSED, 0.0, time / steps, steps, x);
    for (int i = 0; i < layers; i++) {
        double exact = 1.0 + 0.5 * exp(-5e4 * wave * wave * time) * cos(wave * c.grid.middle[i]);
        worst = fmax(worst, fabs(x[i] - exact));
    }
    free(x);
    column_free(&c);
    return worst;
}

static void check_order(const char *what, double coarse, double fine, double order)
{
    double got = log2(coarse / fine);
    print_message("           %s: error %.3g then %.3g, order %.2f\n", what, coarse, fine, got);
    check_near(what, got, order, 0.25);
}

static void test_order(void **state)
{
    (void)state;
    double time = 1.0 / (5e4 * pow(2.0 * PI / (60.0 * KM), 2.0)); /* one e-folding of mode 2 */
    check_order("even layers", mode_error(20, 0.0, 2, time, 400), mode_error(40, 0.0, 2, time, 400), 2);
    check_order("even layers, finer", mode_error(40, 0.0, 2, time, 400), mode_error(80, 0.0, 2, time, 400),
                2);
    check_order("stretched layers", mode_error(20, 0.6, 2, time, 400), mode_error(40, 0.6, 2, time, 400), 2);
    check_order("stretched layers, finer", mode_error(40, 0.6, 2, time, 400),
                mode_error(80, 0.6, 2, time, 400), 2);

    /* In time: against the exact exponential of the discrete eigenvalue, so that dz plays no part.
     */
    const int n = 32;
    double dz = 60.0 * KM / n, value = -4.0 * 5e4 / (dz * dz) * pow(sin(PI / n), 2.0), error[3];
    Column c = column_ideal(60.0, n, INFINITY, 5e4, 0.0);
    double *x = array(c.grid.padded);
    for (int r = 0; r < 3; r++) {
        int steps = 8 << r;
        error[r] = 0.0;
        for (int i = 0; i < n; i++)
            x[i] = cos(2.0 * PI * (i + 0.5) / n);
        run(&c, GROUND_CLOSED, 0.0, 2.0 / -value / steps, steps, x);
        for (int i = 0; i < n; i++)
            error[r] = fmax(error[r], fabs(x[i] - exp(-2.0) * cos(2.0 * PI * (i + 0.5) / n)));
    }
    check_order("step", error[0], error[1], 2);
    check_order("step, finer", error[1], error[2], 2);
    free(x);
    column_free(&c);
}

/* Exponential atmosphere of scale height H, K constant, closed top at L. With X = e^(z/2H) y the
 * equation is K (y'' - y / 4H^2) = -rate y: modes are sines whose wave number the two ends decide.
 */
enum { SCALE_KM = 7, TOP_KM = 42 };

/* dX/dz at the top and X at z of the mode e^(z/2H) (a cos kz + b sin kz). */
static double mode_value(double a, double b, double k, double z)
{
    return exp(z / (2.0 * SCALE_KM * KM)) * (a * cos(k * z) + b * sin(k * z));
}

static double mode_slope(double a, double b, double k, double z)
{
    return mode_value(a, b, k, z) / (2.0 * SCALE_KM * KM) + k * mode_value(b, -a, k, z);
}

/* Relative error of the slowest decaying mode after one e-folding. */
static double decay_error(int layers, int kind, double velocity)
{
    const double eddy = 1e5, half = 1.0 / (2.0 * SCALE_KM * KM), held = 2.385;
    Column c = column_ideal(TOP_KM, layers, SCALE_KM, eddy, 0.0);
    /* What is held is the lowest layer's middle: that is where the mode has its node. */
    double origin = kind == GROUND_FIXED ? c.grid.middle[0] : 0.0, far = TOP_KM * KM - origin;
    double low = 1e-3 / far, high = PI / far, a = kind == GROUND_FIXED ? 0.0 : 1.0, b = 1.0, k = 0.0;
    for (int bisect = 0; bisect < 200; bisect++) {
        k = 0.5 * (low + high);
        if (kind == GROUND_DEPOSITION)
            b = (velocity / eddy - half) / k; /* K X' = v X at 0 */
        if (mode_slope(a, b, k, far) > 0.0)
            low = k;
        else
            high = k;
    }
    double rate = eddy * (k * k + half * half), worst = 0.0, size = 0.0;
    double base = kind == GROUND_FIXED ? held : 0.0;
    double *x = array(c.grid.padded);
    for (int i = 0; i < layers; i++) {
        x[i] = base + mode_value(a, b, k, c.grid.middle[i] - origin);
        size = fmax(size, fabs(x[i] - base));
    }
    run(&c, kind, velocity, 1.0 / rate / 800, 800, x);
    for (int i = 0; i < layers; i++) {
        double exact = base + exp(-1.0) * mode_value(a, b, k, c.grid.middle[i] - origin);
        worst = fmax(worst, fabs(x[i] - exact) / size);
    }
    if (kind == GROUND_FIXED)
        assert_true(x[0] == held + mode_value(a, b, k, 0.0));
    free(x);
    column_free(&c);
    return worst;
}

static void test_exponential_decay(void **state)
{
    (void)state;
    double coarse = decay_error(42, GROUND_FIXED, 0.0), fine = decay_error(84, GROUND_FIXED, 0.0);
    check_order("held ground", coarse, fine, 2);
    assert_true(fine < 1e-3);
    coarse = decay_error(168, GROUND_DEPOSITION, 2.0);
    fine = decay_error(336, GROUND_DEPOSITION, 2.0);
    check_order("deposition", coarse, fine, 1); /* first order: see the header */
    assert_true(fine < 1e-2);
}

/* Steady profile under a uniform source s (mole fraction s-1), run into from zero; error relative
 * to the profile's largest value. The downward flux at z is all that is made above: K N dX/dz = s N
 * H (1 - e^((z - L)/H)). */
static double steady_error(int layers, int kind, double velocity)
{
    const double eddy = 1e5, source = 1e-15, h = SCALE_KM * KM, top = TOP_KM * KM, held = 3e-9;
    Column c = column_ideal(TOP_KM, layers, SCALE_KM, eddy, 0.0);
    double *x = array(c.grid.padded), z0 = c.grid.middle[0], made = 0.0, received = 0.0;
    int first = kind == GROUND_FIXED;
    if (first)
        x[0] = held;
    for (int i = first; i < layers; i++)
        made += source * c.air.number_density[i] * c.grid.depth[i];

    /* Days first to get near, hours to shrink the splitting error of the source (2e-6 here). */
    const double step[] = {10 * DAY_SECONDS, 3600.0};
    const int steps[] = {300, 20000};
    for (int r = 0; r < 2; r++) {
        DiffusionFactor *factor = factor_of(&c, kind, velocity, step[r]);
        double *work = malloc(diffusion_work(factor, 1) * sizeof *work);
        assert_non_null(work);
        for (int s = 0; s < steps[r]; s++) {
            for (int i = first; i < layers; i++)
                x[i] += 0.5 * step[r] * source;
            diffusion_step(factor, x, NULL, 1, &received, work);
            for (int i = first; i < layers; i++)
                x[i] += 0.5 * step[r] * source;
        }
        free(work);
        diffusion_factor_free(factor);
    }
    /* Steady: what is made leaves through the ground, and deposition is v N_0 X_0. */
    check_near("received over made", -received / (made * 3600.0), 1.0, 1e-6);
    if (!first)
        check_near("v N X", velocity * c.air.number_density[0] * x[0] / made, 1.0, 1e-3);

    double worst = 0.0, ground = held;
    if (!first)
        ground = source * h * exp(z0 / h) * (1.0 - exp(-top / h)) / velocity;
    for (int i = 0; i < layers; i++) {
        double z = c.grid.middle[i];
        double exact = ground + source * h / eddy * (z - z0 - h * (exp((z - top) / h) - exp((z0 - top) / h)));
        worst = fmax(worst, fabs(x[i] - exact));
    }
    worst /= x[layers - 1];
    free(x);
    column_free(&c);
    return worst;
}

static void test_exponential_steady(void **state)
{
    (void)state;
    double coarse = steady_error(21, GROUND_FIXED, 0.0), fine = steady_error(42, GROUND_FIXED, 0.0);
    check_order("held ground", coarse, fine, 2);
    assert_true(fine < 1e-3);
    coarse = steady_error(21, GROUND_DEPOSITION, 0.1);
    fine = steady_error(42, GROUND_DEPOSITION, 0.1);
    check_order("deposition", coarse, fine, 2); /* against the flux at the middle: second order */
    assert_true(fine < 1e-3);
}

/* ---- diffusion: what holds whatever the input ---- */

static void test_long_step(void **state)
{
    (void)state;
    random_start();
    Column c = column_uneven();
    double *x = array(c.grid.padded), air = 0.0, most = 0.0;
    for (int i = 0; i < c.grid.layers; i++) {
        x[i] = random_unit();
        most = fmax(most, x[i]);
        air += c.air.number_density[i] * c.grid.depth[i];
    }
    double before = column_mass(&c, x), mean = before / air;
    run(&c, GROUND_CLOSED, 0.0, 1e16, 1, x);
    for (int i = 0; i < c.grid.layers; i++)
        check_near("well mixed", x[i], mean, 1e-7 * mean);
    check_near("mass", column_mass(&c, x) / before, 1.0, 2e-15);

    for (int i = 0; i < c.grid.layers; i++)
        x[i] = random_unit();
    run(&c, GROUND_DEPOSITION, 0.5, 1e16, 1, x);
    for (int i = 0; i < c.grid.layers; i++)
        check_near("all deposited", x[i], 0.0, 1e-6);
    for (int i = 0; i < c.grid.layers; i++)
        x[i] = random_unit();
    double held = x[0];
    run(&c, GROUND_FIXED, 0.0, 1e16, 1, x);
    for (int i = 0; i < c.grid.layers; i++)
        check_near("all as held", x[i], held, 1e-6);
    free(x);
    column_free(&c);
}

static void test_uniform(void **state)
{
    (void)state;
    Column c = column_uneven();
    const int kind[] = {GROUND_CLOSED, GROUND_FIXED};
    const double step[] = {900.0, 1e7};
    for (int a = 0; a < 4; a++) {
        double *x = array(c.grid.padded);
        for (int i = 0; i < c.grid.layers; i++)
            x[i] = 3.7e-7;
        double received = run(&c, kind[a & 1], 0.0, step[a >> 1], 10000, x);
        assert_true(received == 0.0);
        for (int i = 0; i < c.grid.layers; i++)
            assert_true(x[i] == 3.7e-7);
        free(x);
    }
    column_free(&c);
}

static void test_closed_century(void **state)
{
    (void)state;
    random_start();
    Column c = column_uneven();
    double *x = array(c.grid.padded);
    for (int start = 0; start < 5; start++) {
        for (int i = 0; i < c.grid.layers; i++)
            x[i] = pow(10.0, -12.0 + 6.0 * random_unit());
        double before = column_mass(&c, x);
        run(&c, GROUND_CLOSED, 0.0, 15 * DAY_SECONDS, 2435, x);
        double drift = column_mass(&c, x) / before - 1.0;
        print_message("           drift of mass in a century %.1e\n", drift);
        check_near("mass after a century", drift, 0.0, 1e-13);
    }
    free(x);
    column_free(&c);
}

static void test_budget(void **state)
{
    (void)state;
    random_start();
    Column c = column_uneven();
    double *x = array(c.grid.padded), worst = 0.0;
    for (int trial = 0; trial < 400; trial++) {
        int kind = trial % 3;
        double velocity = 2.0 * random_unit(), step = pow(10.0, 1.0 + 12.0 * random_unit());
        for (int i = 0; i < c.grid.layers; i++)
            x[i] = pow(10.0, -12.0 + 6.0 * random_unit());
        double before = column_mass(&c, x), held = x[0];
        double received = run(&c, kind, velocity, step, 1, x);
        worst = fmax(worst, fabs(column_mass(&c, x) - before - received) / (before + fabs(received)));
        if (kind == GROUND_FIXED)
            assert_true(x[0] == held);
        if (kind == GROUND_CLOSED)
            assert_true(received == 0.0);
        if (kind == GROUND_DEPOSITION)
            assert_true(received < 0.0);
    }
    print_message("           worst budget gap %.1e\n", worst);
    assert_true(worst < 2e-15);

    /* The same quantity from the flux: -v N_0 times the time integral of X_0 (trapezoids). */
    double received = 0.0, integral = 0.0;
    for (int i = 0; i < c.grid.layers; i++)
        x[i] = random_unit();
    for (int s = 0; s < 500; s++) {
        double start = x[0];
        received += run(&c, GROUND_DEPOSITION, 1.3, 20.0, 1, x);
        integral += 20.0 * 0.5 * (start + x[0]);
    }
    check_near("received over flux", received / (-1.3 * c.air.number_density[0] * integral), 1.0, 1e-6);
    free(x);
    column_free(&c);
}

static void test_linear_and_batch(void **state)
{
    (void)state;
    random_start();
    Column c = column_uneven();
    size_t padded = (size_t)c.grid.padded;
    for (int kind = GROUND_CLOSED; kind <= GROUND_DEPOSITION; kind++) {
        DiffusionFactor *factor = factor_of(&c, kind, 0.7, 3.0e6);
        double *x = array(3 * c.grid.padded), *alone = array(c.grid.padded);
        double *work = malloc(diffusion_work(factor, 3) * sizeof *work);
        double received[3], one, a = 2.385, b = -0.71;
        assert_non_null(work);
        for (size_t i = 0; i < padded; i++) {
            int padding = i >= (size_t)c.grid.layers;
            x[i] = padding ? 7.0 : random_unit();
            x[padded + i] = padding ? NAN : random_unit();
            x[2 * padded + i] = padding ? 9.0 : a * x[i] + b * x[padded + i];
        }
        memcpy(alone, x + padded, padded * sizeof *alone);
        diffusion_step(factor, x, NULL, 3, received, work);
        for (int i = 0; i < c.grid.layers; i++)
            check_near("a x + b y", x[2 * padded + (size_t)i], a * x[i] + b * x[padded + (size_t)i], 2e-14);
        check_near("received of a x + b y", received[2], a * received[0] + b * received[1], 1e-14 * 2e25);
        for (size_t i = (size_t)c.grid.layers; i < padded; i++)
            assert_true(x[i] == 7.0 && isnan(x[padded + i]) && x[2 * padded + i] == 9.0);
        /* Neighbours in the batch change nothing. */
        diffusion_step(factor, alone, NULL, 1, &one, work);
        for (int i = 0; i < c.grid.layers; i++)
            check_near("alone", alone[i], x[padded + (size_t)i], 1e-15);
        diffusion_step(factor, NULL, NULL, 0, NULL, work);
        free(x);
        free(alone);
        free(work);
        diffusion_factor_free(factor);
    }
    column_free(&c);
}

/* The column from a held layer up is the whole column with everything below held too; of one layer alone,
 * nothing moves. */
static void test_above(void **state)
{
    (void)state;
    Column c = column_uneven();
    int layers = c.grid.layers, first[] = {0, 5, layers - 1};
    double step = 5.0 * 86400.0, cell = 0.0;
    for (int f = 0; f < 3; f++) {
        Fault fault = {0};
        Diffusion *above = NULL;
        DiffusionFactor *factor = NULL;
        assert_int_equal(diffusion_make_above(&above, &c.grid, &c.air, c.eddy, first[f], &fault), 0);
        assert_int_equal(diffusion_factor(&factor, above, GROUND_FIXED, 0.0, step, &fault), 0);
        double *x = array(c.grid.padded), *work = array((int)diffusion_work(factor, 1)), received = NAN,
               change = 0.0;
        x[first[f]] = 1e-6;
        diffusion_step(factor, x + first[f], NULL, 1, &received, work);
        assert_true(x[first[f]] == 1e-6);
        for (int i = 0; i < layers; i++) {
            cell = c.air.number_density[i] * c.grid.depth[i];
            assert_true(i >= first[f] || x[i] == 0.0);
            if (i != first[f])
                change += cell * x[i];
        }
        check_near("received over change", received, change, 1e-12 * change);
        assert_true(first[f] == layers - 1 ? received == 0.0 : received > 0.0 && x[first[f] + 1] > 0.0);
        free(x);
        free(work);
        diffusion_factor_free(factor);
        diffusion_free(above);
    }
    column_free(&c);
}

static void test_diffusion_faults(void **state)
{
    (void)state;
    Column c = column_ideal(20.0, 10, 7.0, 1e5, 0.0);
    const double bad_eddy[] = {-1.0, NAN, INFINITY};
    for (int b = 0; b < 3; b++) {
        Fault fault = {0};
        Diffusion *made;
        c.eddy[4] = bad_eddy[b];
        assert_int_equal(diffusion_make(&made, &c.grid, &c.air, c.eddy, &fault), FAULT_INPUT);
        assert_null(made);
        assert_non_null(strstr(fault.text, "8 km"));
    }
    static const struct {
        int kind;
        double velocity, step;
    } bad[] = {{7, 0.0, 60.0},
               {-1, 0.0, 60.0},
               {GROUND_CLOSED, 0.0, 0.0},
               {GROUND_FIXED, 0.0, NAN},
               {GROUND_CLOSED, 0.0, -60.0},
               {GROUND_DEPOSITION, -0.1, 60.0},
               {GROUND_DEPOSITION, NAN, 60.0},
               {GROUND_CLOSED, 0.0, INFINITY}};
    for (size_t b = 0; b < sizeof bad / sizeof bad[0]; b++) {
        Fault fault = {0};
        DiffusionFactor *made;
        assert_int_equal(
            diffusion_factor(&made, c.diffusion, bad[b].kind, bad[b].velocity, bad[b].step, &fault),
            FAULT_INPUT);
        assert_null(made);
    }
    diffusion_free(NULL);
    diffusion_factor_free(NULL);
    column_free(&c);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_discrete_modes),    cmocka_unit_test(test_order),
        cmocka_unit_test(test_exponential_decay), cmocka_unit_test(test_exponential_steady),
        cmocka_unit_test(test_long_step),         cmocka_unit_test(test_uniform),
        cmocka_unit_test(test_closed_century),    cmocka_unit_test(test_budget),
        cmocka_unit_test(test_linear_and_batch),  cmocka_unit_test(test_above),
        cmocka_unit_test(test_diffusion_faults),
    };
    return cmocka_run_group_tests_name("transport", tests, NULL, NULL);
}
