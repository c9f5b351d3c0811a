/* Tests of radiation: slant paths against Chapman's function and quadrature along the ray; the discrete
 * ordinates against conservation, a closed form and another solution of the equation of transfer written
 * here. */
#define _XOPEN_SOURCE 700 /* scratch.h */
#include "scratch.h"

#include "../chem/radiation.h"
#include "../input/constants.h"
#include "../transport/air.h"
#include "standard_light.h"

enum { LAYERS = 80 };

/* ---- slant paths ---- */

/* Column from radius r towards the sun through exp(-z / scale), by Simpson's rule along the ray. */
static double ray_column(double r, double cosine, double scale)
{
    double b2 = r * r * (1 - cosine * cosine), start = r * cosine, sum = 0, step = 0.25;
    int count = 16000;
    for (int i = 0; i <= count; i++) {
        double s = start + i * step, z = sqrt(b2 + s * s) - EARTH_RADIUS_KM;
        sum += (i == 0 || i == count ? 1 : i % 2 ? 4 : 2) * exp(-z / scale);
    }
    return sum * step / 3;
}

enum { FINE = 320 };

static void fine_slant(Slant **slant, double *vertical, const double *cosine, int suns, double scale)
{
    double edge[FINE + 1];
    Fault fault = {0};
    for (int k = 0; k <= FINE; k++)
        edge[k] = 0.25 * k;
    for (int k = 0; k < FINE; k++)
        vertical[k] = scale * (exp(-edge[k] / scale) - exp(-edge[k + 1] / scale));
    assert_int_equal(slant_make(slant, FINE, edge, cosine, suns, &fault), 0);
    assert_int_equal(slant_suns(*slant), suns);
}

static void test_slant_high_sun(void **state)
{
    (void)state;
    static double vertical[FINE], out[2 * FINE];
    const double cosine[2] = {1, 0.8}, scale = 7, above = scale * exp(-80 / scale);
    Slant *slant;
    fine_slant(&slant, vertical, cosine, 2, scale);
    slant_columns(slant, vertical, above, out);
    double overhead = above;
    for (int k = FINE - 1; k >= 0; k--) { /* overhead: the sum itself, whatever the layers hold */
        check_near(out[k], overhead + 0.5 * vertical[k], 1e-12);
        /* secant law, too large by about tan2 scale / radius = 6e-4 */
        check_near(out[FINE + k] * 0.8, out[k], 1e-3);
        assert_true(out[FINE + k] * 0.8 < out[k]);
        overhead += vertical[k];
    }
    slant_free(slant);
}

/* Chapman 1931: horizontal path X exp(X) K1(X) scale heights, X = r / scale; K1 by its asymptotic series
 * (Abramowitz and Stegun 1964, 9.7.2), whose next term is below 1e-9 here. */
static void test_slant_chapman(void **state)
{
    (void)state;
    static double vertical[FINE], out[FINE];
    const double cosine = 0, scale = 7, above = scale * exp(-80 / scale);
    Slant *slant;
    fine_slant(&slant, vertical, &cosine, 1, scale);
    slant_columns(slant, vertical, above, out);
    double error = 0;
    for (int k = 0; k < FINE - 20; k++) {
        double z = 0.25 * (k + 0.5), x = (EARTH_RADIUS_KM + z) / scale;
        double chapman = sqrt(PI * x / 2) * (1 + 3 / (8 * x) - 15 / (128 * x * x));
        error = worst(error, out[k], scale * exp(-z / scale) * chapman);
    }
    print_message("           horizontal columns within %.2g of Chapman's function\n", error);
    assert_true(error < 5e-3); /* layers of 0.25 km with uniform density */
    slant_free(slant);
}

static void test_slant_twilight(void **state)
{
    (void)state;
    static double vertical[FINE], out[5 * FINE];
    const double cosine[5] = {0.5, 0.1, 0.02, -0.05, -0.12}, scale = 7;
    Slant *slant;
    fine_slant(&slant, vertical, cosine, 5, scale);
    slant_columns(slant, vertical, scale * exp(-80 / scale), out);
    double error = 0;
    for (int s = 0; s < 5; s++)
        for (int k = 0; k < FINE - 20; k++) {
            double r = EARTH_RADIUS_KM + 0.25 * (k + 0.5), lowest = r * sqrt(1 - cosine[s] * cosine[s]);
            if (cosine[s] < 0 && lowest < EARTH_RADIUS_KM)
                assert_true(out[s * FINE + k] == HUGE_VAL); /* behind the Earth */
            else
                error = worst(error, out[s * FINE + k], ray_column(r, cosine[s], scale));
        }
    print_message("           slant columns within %.2g of quadrature along the ray\n", error);
    assert_true(error < 5e-3);
    slant_free(slant);
}

static void test_slant_faults(void **state)
{
    (void)state;
    const double edge[3] = {0, 1, 2}, tangled[3] = {0, 1, 1}, low = -0.31, nowhere = NAN, fine = 0.5;
    Slant *slant;
    Fault a = {0}, b = {0}, c = {0};
    assert_int_equal(slant_make(&slant, 2, edge, &low, 1, &a), FAULT_INPUT);
    check_fault(&a, "-0.31", "cosine", NULL);
    assert_null(slant);
    assert_int_equal(slant_make(&slant, 2, edge, &nowhere, 1, &b), FAULT_INPUT);
    assert_int_equal(slant_make(&slant, 2, tangled, &fine, 1, &c), FAULT_INPUT);
    check_fault(&c, "edges must increase", NULL);
}

/* ---- an independent solution of the equation of transfer ---- */

enum { SPLIT = 8, REF_ANGLES = 16, REF_MOST = LAYERS * SPLIT + 1 };

/* Plane-parallel actinic flux at layer middles and downward irradiance at the ground by iteration of the
 * source function along 32 directions (short characteristics, linear source) on layers split SPLIT-fold:
 * another form of the equation, another quadrature, another discretisation than the program's. [layers],
 * index 0 lowest. */
static double iterate_source(int layers, const double *absorb, const double *scatter, double mu0,
                             double albedo, double *flux)
{
    static double j0[REF_MOST], j2[REF_MOST], beam[REF_MOST], n0[REF_MOST], n2[REF_MOST], steps[REF_MOST];
    double x[REF_ANGLES], w[REF_ANGLES], ground = 0;
    int last = layers * SPLIT; /* nodes from the top, 0, to the ground */
    gauss(REF_ANGLES, x, w);
    double tau = 0;
    for (int k = 0; k <= last; k++) {
        int layer = layers - 1 - (k < last ? k : last - 1) / SPLIT;
        steps[k] = (absorb[layer] + scatter[layer]) / SPLIT;
        beam[k] = exp(-tau / mu0) / (4 * PI);
        tau += steps[k];
        j0[k] = j2[k] = 0;
    }
    double p0 = 1.5 * mu0 * mu0 - 0.5, change = 1;
    for (int it = 0; it < 3000 && change > 1e-9; it++) {
        double down = 0;
        for (int k = 0; k <= last; k++)
            n0[k] = n2[k] = 0;
        for (int a = 0; a < REF_ANGLES; a++)
            for (int way = 0; way < 2; way++) { /* down with the old ground, then up */
                double mu = x[a], p = 1.5 * mu * mu - 0.5, light = way == 0 ? 0 : ground;
                for (int step = 0; step <= last; step++) {
                    int k = way == 0 ? step : last - step;
                    if (step > 0) {
                        int cell = way == 0 ? k - 1 : k, from = way == 0 ? k - 1 : k + 1;
                        int layer = layers - 1 - cell / SPLIT;
                        double o = scatter[layer] / (scatter[layer] + absorb[layer]), t = steps[cell] / mu,
                               e = exp(-t);
                        double s_from = o * (j0[from] + beam[from] + 0.5 * p * (j2[from] + p0 * beam[from]));
                        double s_to = o * (j0[k] + beam[k] + 0.5 * p * (j2[k] + p0 * beam[k]));
                        double slope = t > 1e-3 ? (1 - e) / t : 1 - t / 2 + t * t / 6;
                        light = light * e + s_from * (slope - e) + s_to * (1 - slope);
                    }
                    n0[k] += 0.5 * w[a] * light;
                    n2[k] += 0.5 * w[a] * p * light;
                }
                if (way == 0)
                    down += 2 * PI * w[a] * mu * light;
            }
        double sent = albedo / PI * (down + mu0 * 4 * PI * beam[last]);
        change = fabs(sent - ground) / (sent + 1e-30);
        ground = sent;
        for (int k = 0; k <= last; k++) {
            change = fmax(change, fabs(n0[k] - j0[k]) / (n0[k] + 1e-30));
            j0[k] = n0[k];
            j2[k] = n2[k];
        }
    }
    for (int i = 0; i < layers; i++) {
        int k = (layers - 1 - i) * SPLIT + SPLIT / 2;
        flux[i] = 4 * PI * (j0[k] + beam[k]);
    }
    return ground * PI / albedo;
}

/* ---- radiation ---- */

enum { WIDE = 8 };

/* One optical problem, the same in all lanes; [layers][WIDE] arrays from 0 at the ground. */
typedef struct {
    int layers;
    double *absorb, *scatter, *direct, *flux, ground[WIDE], down[WIDE];
} Optics;

static Optics make_optics(int layers)
{
    Optics o = {.layers = layers};
    double **array[] = {&o.absorb, &o.scatter, &o.direct, &o.flux};
    for (int a = 0; a < 4; a++)
        assert_non_null(*array[a] = calloc((size_t)layers * WIDE, sizeof(double)));
    return o;
}

static void free_optics(Optics *o)
{
    free(o->absorb);
    free(o->scatter);
    free(o->direct);
    free(o->flux);
}

/* Plane-parallel direct beam. */
static void light_optics(Optics *o, double mu0)
{
    for (int l = 0; l < WIDE; l++) {
        double tau = 0;
        for (int k = o->layers - 1; k >= 0; k--) {
            double depth = o->absorb[k * WIDE + l] + o->scatter[k * WIDE + l];
            o->direct[k * WIDE + l] = exp(-(tau + 0.5 * depth) / mu0);
            tau += depth;
        }
        o->ground[l] = exp(-tau / mu0);
    }
}

static void solve_optics(Optics *o, double mu0, double albedo, int streams)
{
    double *work = malloc(radiation_work(o->layers, WIDE, 1, streams) * sizeof *work);
    assert_non_null(work);
    radiation_solve(1, o->layers, WIDE, o->absorb, o->scatter, o->direct, o->ground, &mu0, albedo, streams,
                    o->flux, o->down, work);
    free(work);
}

/* A transparent atmosphere over a Lambertian ground: flux 1 + 2 A mu0 everywhere (upward intensity A mu0 / pi
 * over a hemisphere), and mu0 comes down. */
static void test_radiation_ground_only(void **state)
{
    (void)state;
    Optics o = make_optics(5);
    for (int streams = 1; streams <= 4; streams++) {
        light_optics(&o, 0.37);
        solve_optics(&o, 0.37, 0.6, streams);
        for (int k = 0; k < 5; k++)
            check_near(o.flux[k * WIDE + 3], 1 + 2 * 0.6 * 0.37, 1e-13);
        check_near(o.down[3], 0.37, 1e-13);
    }
    free_optics(&o);
}

/* Photons are kept: what enters is absorbed in layers, by the ground, or leaves through the top, where a
 * thick absorbing lid without beam catches it. The beam is handed over as the mean of each layer, so that the
 * balance holds to round-off; scattering conserves whatever the optical depth of layers (1e-9 to 30). */
static void test_radiation_conserves(void **state)
{
    (void)state;
    const double mu0 = 0.43;
    double error = 0;
    for (int streams = 1; streams <= 4; streams++)
        for (int absorbing = 0; absorbing < 2; absorbing++)
            for (int shade = 0; shade < 3; shade++) {
                double albedo = 0.5 * shade, tau = 0;
                Optics o = make_optics(30);
                for (int k = 0; k < 20; k++)
                    for (int l = 0; l < WIDE; l++) {
                        o.scatter[k * WIDE + l] = 30 * pow(10, -(k + l) / 3.0);
                        o.absorb[k * WIDE + l] = absorbing ? 0.1 * o.scatter[k * WIDE + l] : 0;
                    }
                for (int i = 20 * WIDE; i < 30 * WIDE; i++)
                    o.absorb[i] = 20;
                for (int l = 0; l < WIDE; l++) {
                    tau = 0;
                    for (int k = 19; k >= 0; k--) {
                        double depth = o.absorb[k * WIDE + l] + o.scatter[k * WIDE + l];
                        o.direct[k * WIDE + l] = -exp(-tau / mu0) * expm1(-depth / mu0) * mu0 / depth;
                        tau += depth;
                    }
                    o.ground[l] = exp(-tau / mu0);
                }
                solve_optics(&o, mu0, albedo, streams);
                for (int l = 0; l < WIDE; l++) {
                    double taken = (1 - albedo) * o.down[l];
                    for (int k = 0; k < 30; k++)
                        taken += o.absorb[k * WIDE + l] * o.flux[k * WIDE + l];
                    error = worst(error, taken, mu0);
                }
                free_optics(&o);
            }
    print_message("           photons kept to %.1g\n", error);
    assert_true(error < 1e-11);
}

/* Ozone of the standard profile times sigma, and Rayleigh scattering of the standard air at nm. */
static void real_optics(Optics *o, double nm, double sigma, int refine)
{
    Grid grid;
    Air air;
    Fault fault = {0};
    assert_int_equal(o->layers, LAYERS * refine);
    assert_int_equal(grid_make(&grid, LAYERS, 1, NULL, 0, &fault), 0);
    assert_int_equal(air_standard(&air, &grid, &fault), 0);
    for (int k = 0; k < o->layers; k++)
        for (int l = 0; l < WIDE; l++) {
            int layer = k / refine;
            o->absorb[k * WIDE + l] = ozone_at(layer + 0.5) * 1e5 * sigma / refine;
            o->scatter[k * WIDE + l] = air.number_density[layer] * 1e5 * radiation_rayleigh(nm) / refine;
        }
    air_free(&air);
    grid_free(&grid);
}

/* Against the independent solution above. The error of double Gauss falls with the number of streams; four
 * are what photolysis.c uses. Low sun at 300 nm is the hardest case that matters. */
static void test_radiation_independent(void **state)
{
    (void)state;
    static const struct {
        double nm, sigma, albedo, mu0, limit[3]; /* largest error at any middle for 1, 2, 4 streams */
    } cases[] = {{330, 1e-21, 0.1, 1.0, {0.13, 0.02, 0.008}}, {330, 1e-21, 0.8, 0.2, {0.13, 0.03, 0.008}},
                 {312, 5e-20, 0.1, 0.5, {0.10, 0.03, 0.008}}, {300, 4e-19, 0.1, 0.2, {0.90, 0.12, 0.012}},
                 {400, 1e-24, 0.3, 0.5, {0.15, 0.04, 0.012}}, {580, 3e-21, 0.8, 0.5, {0.08, 0.03, 0.012}}};
    static const int streams[3] = {1, 2, 4};
    double absorb[LAYERS], scatter[LAYERS], want[LAYERS];
    Optics o = make_optics(LAYERS);
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        real_optics(&o, cases[c].nm, cases[c].sigma, 1);
        for (int k = 0; k < LAYERS; k++) {
            absorb[k] = o.absorb[k * WIDE];
            scatter[k] = o.scatter[k * WIDE];
        }
        double ground = iterate_source(LAYERS, absorb, scatter, cases[c].mu0, cases[c].albedo, want);
        light_optics(&o, cases[c].mu0);
        double error[3] = {0}, down[3];
        for (int n = 0; n < 3; n++) {
            solve_optics(&o, cases[c].mu0, cases[c].albedo, streams[n]);
            for (int k = 0; k < LAYERS; k++)
                error[n] = worst(error[n], o.flux[k * WIDE], want[k]);
            down[n] = fabs(o.down[0] / ground - 1);
        }
        print_message("           %g nm, albedo %g, cosine %g: flux within %.2g, %.2g, %.2g; ground %.2g, "
                      "%.2g, %.2g (1, 2, 4 "
                      "streams)\n",
                      cases[c].nm, cases[c].albedo, cases[c].mu0, error[0], error[1], error[2], down[0],
                      down[1], down[2]);
        for (int n = 0; n < 3; n++)
            assert_true(error[n] < cases[c].limit[n]);
        assert_true(down[2] < 0.006);
    }
    free_optics(&o);
}

/* Layers cut in 2 and 4, against 16: the error falls fourfold each time. */
static void test_radiation_order(void **state)
{
    (void)state;
    static const int refine[4] = {1, 2, 4, 16};
    double flux[4];
    for (int i = 0; i < 4; i++) {
        Optics o = make_optics(LAYERS * refine[i]);
        real_optics(&o, 310, 1e-19, refine[i]);
        light_optics(&o, 0.3);
        solve_optics(&o, 0.3, 0.2, 4);
        flux[i] = o.down[0];
        free_optics(&o);
    }
    double first = flux[0] - flux[3], second = flux[1] - flux[3], third = flux[2] - flux[3];
    print_message("           irradiance of 310 nm with layers of 1, 1/2, 1/4 km off by %.2g %.2g %.2g\n",
                  first / flux[3], second / flux[3], third / flux[3]);
    assert_true(first / second > 3.5 && second / third > 3.5);
}

/* A sun and a lane give the same bits whatever stands beside them. */
static void test_radiation_lanes(void **state)
{
    (void)state;
    enum { SUNS = 3, WIDTH = 16, COUNT = 12 };
    static double absorb[COUNT * WIDTH], scatter[COUNT * WIDTH], direct[SUNS * COUNT * WIDTH],
        ground[SUNS * WIDTH], flux[SUNS * COUNT * WIDTH], down[SUNS * WIDTH], alone[COUNT * WIDE];
    const double cosine[SUNS] = {0.9, 0.2, -0.04};
    for (int i = 0; i < COUNT * WIDTH; i++) {
        absorb[i] = 0.01 * (1 + i % 7);
        scatter[i] = 0.02 * (1 + i % 5);
        for (int s = 0; s < SUNS; s++)
            direct[s * COUNT * WIDTH + i] = exp(-0.1 * (s + i / WIDTH));
    }
    for (int i = 0; i < SUNS * WIDTH; i++)
        ground[i] = i < 2 * WIDTH ? 0.1 : 0;
    double *work = malloc(radiation_work(COUNT, WIDTH, SUNS, 4) * sizeof *work);
    radiation_solve(SUNS, COUNT, WIDTH, absorb, scatter, direct, ground, cosine, 0.3, 4, flux, down, work);
    for (int s = 0; s < SUNS; s++) {
        Optics o = make_optics(COUNT);
        for (int k = 0; k < COUNT; k++)
            for (int l = 0; l < WIDE; l++) { /* lanes 8 to 15 in reverse */
                int from = k * WIDTH + 15 - l;
                o.absorb[k * WIDE + l] = absorb[from];
                o.scatter[k * WIDE + l] = scatter[from];
                o.direct[k * WIDE + l] = direct[s * COUNT * WIDTH + from];
                o.ground[l] = ground[s * WIDTH + 15 - l];
            }
        radiation_solve(1, COUNT, WIDE, o.absorb, o.scatter, o.direct, o.ground, &cosine[s], 0.3, 4, alone,
                        NULL, work);
        for (int k = 0; k < COUNT; k++)
            for (int l = 0; l < WIDE; l++)
                assert_true(alone[k * WIDE + l] == flux[(s * COUNT + k) * WIDTH + 15 - l]);
        free_optics(&o);
    }
    free(work);
}

/* Bucholtz 1995, table 2 (from memory): 200, 300, 400, 550 nm; and whole-column depths at sea level, 1013.25
 * hPa. */
static void test_radiation_rayleigh(void **state)
{
    (void)state;
    check_near(radiation_rayleigh(200), 3.612e-25, 0.01);
    check_near(radiation_rayleigh(300), 5.676e-26, 0.01);
    check_near(radiation_rayleigh(400), 1.674e-26, 0.01);
    check_near(radiation_rayleigh(550), 4.513e-27, 0.01);
    double below = radiation_rayleigh(500), beyond = radiation_rayleigh(500.001);
    check_near(beyond, below, 2e-3);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_slant_high_sun),        cmocka_unit_test(test_slant_chapman),
        cmocka_unit_test(test_slant_twilight),        cmocka_unit_test(test_slant_faults),
        cmocka_unit_test(test_radiation_ground_only), cmocka_unit_test(test_radiation_conserves),
        cmocka_unit_test(test_radiation_independent), cmocka_unit_test(test_radiation_order),
        cmocka_unit_test(test_radiation_lanes),       cmocka_unit_test(test_radiation_rayleigh),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
