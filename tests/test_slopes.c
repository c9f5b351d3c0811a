/* Tests of how the light answers to absorption (chem/radiation_slopes) and the day's mean to the rates under
 * each sun (model/sun): against central differences of what they differentiate. */
#define _XOPEN_SOURCE 700 /* scratch.h */
#include "scratch.h"

#include "../chem/radiation_slopes.h"
#include "../input/constants.h"
#include "../model/sun.h"

enum { LAYERS = 24, SUNS = 3 };

static const double cosine[SUNS] = {-0.05, 0.15, 0.9};

typedef struct {
    double absorb[LAYERS * PACK], scatter[LAYERS * PACK], direct[SUNS * LAYERS * PACK], ground[SUNS * PACK],
        flux[SUNS * LAYERS * PACK];
} Optics;

/* Beam and flux; what lies above the top holds above times the absorption of the top layer. */
static void solve(Optics *o, const Slant *slant, double above, double albedo, int streams)
{
    for (int l = 0; l < PACK; l++) {
        double depth[LAYERS];
        for (int k = 0; k < LAYERS; k++)
            depth[k] = o->absorb[k * PACK + l] + o->scatter[k * PACK + l];
        for (int s = 0; s < SUNS; s++)
            for (int k = 0; k <= LAYERS; k++)
                *(k < LAYERS ? &o->direct[(s * LAYERS + k) * PACK + l] : &o->ground[s * PACK + l]) =
                    exp(-slant_column(slant, s, k, depth, above * o->absorb[(LAYERS - 1) * PACK + l]));
    }
    double *work = malloc(radiation_work(LAYERS, PACK, SUNS, streams) * sizeof *work);
    assert_non_null(work);
    radiation_solve(SUNS, LAYERS, PACK, o->absorb, o->scatter, o->direct, o->ground, cosine, albedo, streams,
                    o->flux, NULL, work);
    free(work);
}

/* Eight wavelengths from thick and hardly scattering to clear, over bright and dark ground. The differences
 * are good to the square of their shift, 1e-4 of a layer's depth, and to round-off over it: 1e-7 of the flux
 * per depth, where the slopes are of order 1; the flux from the symmetric form to round-off. */
static void test_radiation_slopes(void **state)
{
    (void)state;
    static Optics o, up, down;
    static double out[LAYERS * SUNS * PACK], flux[SUNS * PACK];
    const double above = 0.7;
    double edge[LAYERS + 1], worst = 0.0, off = 0.0;
    const int sun[SUNS] = {0, 1, 2};
    Fault fault = {0};
    Slant *slant;
    RadiationSlopes *slopes;
    for (int k = 0; k <= LAYERS; k++)
        edge[k] = 3.0 * k;
    for (int k = 0; k < LAYERS; k++)
        for (int l = 0; l < PACK; l++) {
            o.scatter[k * PACK + l] = 0.3 * (l == 0 ? 1e-3 : 1.0) * exp(-edge[k] / 7.0);
            o.absorb[k * PACK + l] = pow(10.0, -0.5 - 0.7 * l) * exp(-pow((edge[k] - 24.0) / 15.0, 2.0));
        }
    assert_int_equal(slant_make(&slant, LAYERS, edge, cosine, SUNS, &fault), 0);
    for (int streams = 1; streams <= 4; streams++) {
        double albedo = streams == 2 ? 0.0 : 0.2 * streams;
        assert_int_equal(
            radiation_slopes_make(&slopes, slant, LAYERS, above, cosine, albedo, streams, 1, &fault), 0);
        solve(&o, slant, above, albedo, streams);
        radiation_slopes_load(slopes, PACK, 0, o.absorb, o.scatter, o.direct, o.ground);
        for (int m = 0; m < LAYERS; m += m == 0 ? 1 : 11 - (m > 12)) { /* 0, 1, 12, 23: ends and middle */
            up = down = o;
            double shift[PACK];
            for (int l = 0; l < PACK; l++) {
                shift[l] = 1e-4 * (o.absorb[m * PACK + l] + o.scatter[m * PACK + l]);
                up.absorb[m * PACK + l] += shift[l];
                down.absorb[m * PACK + l] -= shift[l];
            }
            solve(&up, slant, above, albedo, streams);
            solve(&down, slant, above, albedo, streams);
            for (int k = 0; k < LAYERS; k++) {
                radiation_slopes_layer(slopes, k, sun, SUNS, 0, out, flux);
                for (int s = 0; s < SUNS; s++)
                    for (int l = 0; l < PACK; l++) {
                        size_t at = (size_t)((s * LAYERS + k) * PACK + l);
                        double want = (up.flux[at] - down.flux[at]) / (2.0 * shift[l]);
                        double noise = 1e-15 * o.flux[at] / shift[l];
                        double size = fmax(fabs(want), o.flux[at]);
                        if (size > 0.0)
                            worst = fmax(worst,
                                         (fabs(out[(m * SUNS + s) * PACK + l] - want) - 4.0 * noise) / size);
                        if (o.flux[at] > 0.0)
                            off = fmax(off, fabs(flux[s * PACK + l] / o.flux[at] - 1.0));
                    }
            }
        }
        radiation_slopes_free(slopes);
    }
    slant_free(slant);
    print_message("   slopes off by %.1e, flux by %.1e\n", worst, off);
    assert_true(worst < 1e-6 && off < 1e-9);
}

/* Rates that fall towards sunset by powers of ten; the mean is homogeneous of degree 1 in them. */
static void test_sun_gradient(void **state)
{
    (void)state;
    for (int place = 0; place < 2; place++) {
        Settings settings;
        Sun sun;
        settings_default(&settings, "input/data");
        settings.sun = place ? SUN_LATITUDE : SUN_GLOBAL;
        settings.latitude_deg = 47.0;
        settings.day_of_year = 100.0;
        sun_make(&sun, &settings, 1);
        for (int kind = 0; kind < 4; kind++) {
            double table[SUN_NODES], gradient[SUN_NODES], knot[SUN_KNOTS], whole = 0.0;
            for (int i = 0; i < sun.nodes; i++)
                table[i] = exp(-0.3 * pow(6.0, kind) / (sun.cosine[i] + 0.35));
            double mean = sun_spread(&sun, table, 1, knot, 1);
            sun_gradient(&sun, table, 1, gradient, 1);
            for (int i = 0; i < sun.nodes; i++) {
                double kept = table[i], shift = 1e-5 * kept;
                table[i] = kept + shift;
                double more = sun_spread(&sun, table, 1, knot, 1);
                table[i] = kept - shift;
                double want = (more - sun_spread(&sun, table, 1, knot, 1)) / (2.0 * shift);
                table[i] = kept;
                whole += gradient[i] * kept;
                /* round-off of the mean over the shift, 1e-11, and its square */
                assert_true(fabs(gradient[i] - want) * kept < 1e-9 * mean);
            }
            assert_true(fabs(whole / mean - 1.0) < 1e-9);
        }
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_radiation_slopes),
                                       cmocka_unit_test(test_sun_gradient)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
