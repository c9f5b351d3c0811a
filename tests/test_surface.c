/* Tests of surface reactions: composition of the droplets, reaction probabilities, coefficients.
 * Published values are typed from memory. Run from the project's folder; SKYMEND_DATA overrides the place of
 * the data. */
#define _XOPEN_SOURCE 700 /* scratch.h */
#include "scratch.h"

#include "../chem/nat.h"
#include "../chem/surface.h"
#include "../input/constants.h"

static Mechanism *read_default(void)
{
    char path[300];
    snprintf(path, sizeof path, "%s/mechanism.cfg", data_dir());
    Mechanism *mechanism = NULL;
    Fault fault = {0};
    if (mechanism_read(&mechanism, path, &fault))
        fail_msg("%s", fault.text);
    assert_non_null(mechanism);
    return mechanism;
}

static int index_of(const Mechanism *mechanism, const char *id)
{
    for (int r = 0; r < mechanism->reactions; r++)
        if (strcmp(mechanism->reaction[r].id, id) == 0)
            return r;
    fail_msg("no reaction %s", id);
    return -1;
}

/* 5 ppm of water at 50 hPa: 60 % at 200 K, 75 % at 220 K (Steele and Hamill 1981, J. Aerosol Sci. 12, figure,
 * from memory, read to 2 %). Drier air and warmer droplets are stronger. */
static void acid_strength_is_that_of_the_stratosphere(void **state)
{
    (void)state;
    double water = 5e-6 * 50.0;
    assert_true(fabs(surface_acid_percent(200.0, water) - 60.0) < 2.0);
    assert_true(fabs(surface_acid_percent(220.0, water) - 75.0) < 2.0);
    for (double t = 186.0; t < 300.0; t += 2.0)
        for (double hpa = 1e-9; hpa < 40.0; hpa *= 1.3) {
            double here = surface_acid_percent(t, hpa);
            assert_true(here > 0.0 && here < 100.0);
            assert_true(surface_acid_percent(t, 1.2 * hpa) <= here + 1e-12);
            assert_true(surface_acid_percent(t + 1.0, hpa) >= here - 0.25);
        }
    /* the three ranges of the fit meet at water activities of 0.05 and 0.85 to half a percent and one
     * percent. The pressures are these activities times 0.0441 hPa, saturation at 220 K (Goff and Gratch,
     * over water, from memory). */
    double join[] = {0.05 * 0.0441, 0.85 * 0.0441}, step[] = {0.5, 1.0};
    for (int j = 0; j < 2; j++)
        for (double factor = 0.9; factor < 1.1; factor += 1e-4)
            assert_true(fabs(surface_acid_percent(220.0, join[j] * (factor + 1e-4)) -
                             surface_acid_percent(220.0, join[j] * factor)) < step[j]);
}

static void probabilities_are_of_published_size(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    int by_water = index_of(m, "het-ClONO2-H2O"), by_hcl = index_of(m, "het-ClONO2-HCl");
    int hocl = index_of(m, "het-HOCl-HCl"), bromine = index_of(m, "het-BrONO2-H2O");
    double water = 5e-6 * 50.0, hcl = 1e-9 * 50.0, clono2 = 0.5e-9 * 50.0, radius = 1e-5;
    /* log10 gamma = 1.87 - 0.074 percent (Hanson and Ravishankara 1991, J. Geophys. Res. 96, 17307, from
     * memory): another laboratory's fit, for bulk acid; within a factor of 3 for droplets of 0.1 um where HCl
     * takes no part */
    for (double t = 200.0; t <= 222.0; t += 2.0) {
        double expected = pow(10.0, 1.87 - 0.074 * surface_acid_percent(t, water));
        double gamma = surface_probability(m, by_water, t, water, 0.0, 0.0, radius);
        assert_true(gamma > expected / 3.0 && gamma < 3.0 * expected);
    }
    /* about 0.01 in the coldest droplets, 1e-4 at 215 to 220 K (JPL 19-5, section 5, from memory) */
    assert_true(fabs(log10(surface_probability(m, by_water, 195.0, water, 0.0, 0.0, radius) / 0.01)) < 0.3);
    assert_true(fabs(log10(surface_probability(m, by_water, 217.0, water, 0.0, 0.0, radius) / 1e-4)) < 0.5);
    /* ClONO2 + HCl overtakes near 195 K and HOCl + HCl exceeds 0.01 there (Shi et al. 2001, figures, from
     * memory) */
    assert_true(surface_probability(m, by_hcl, 205.0, water, hcl, clono2, radius) <
                surface_probability(m, by_water, 205.0, water, hcl, clono2, radius));
    assert_true(surface_probability(m, by_hcl, 192.0, water, hcl, clono2, radius) >
                surface_probability(m, by_water, 192.0, water, hcl, clono2, radius));
    assert_true(surface_probability(m, hocl, 193.0, water, hcl, clono2, radius) > 0.01);
    assert_true(surface_probability(m, hocl, 220.0, water, hcl, clono2, radius) < 1e-5);
    /* 0.8 below 70 percent of acid, toward a tenth above 83 (Hanson 2003, from memory): a tenth is the limit
     * of strong acid, and this droplet of some 85 percent is 7 percent above it */
    check_near(surface_probability(m, bromine, 200.0, water, 0.0, 0.0, radius), 0.8, 0.02);
    check_near(surface_probability(m, bromine, 250.0, water, 0.0, 0.0, radius), 0.1, 0.1);
    /* N2O5: about 0.1, 0.05 to 0.2 in all laboratories from 190 to 230 K (JPL 19-5, section 5, from memory)
     */
    for (double t = 190.0; t <= 230.0; t += 2.0) {
        double gamma = surface_probability(m, index_of(m, "het-N2O5-H2O"), t, water, hcl, clono2, radius);
        assert_true(gamma > 0.05 && gamma < 0.2);
    }
    mechanism_free(m);
}

/* Chlorine is set free in the cold: probabilities at 50 hPa with 5 ppm of water, 1 ppb of HCl, 0.5 ppb of
 * ClONO2 lie in the decade that the figures of Shi et al. (2001) and Carslaw et al. (1997, Rev. Geophys. 35,
 * 125) have, from memory: no better than that. */
static void chlorine_is_activated_in_the_cold(void **state)
{
    (void)state;
    static const struct {
        const char *id;
        double temperature, low, high;
    } published[] = {{"het-ClONO2-HCl", 190.0, 0.1, 1.0},   {"het-ClONO2-HCl", 195.0, 0.01, 0.1},
                     {"het-ClONO2-HCl", 200.0, 1e-4, 1e-2}, {"het-ClONO2-HCl", 210.0, 0.0, 1e-4},
                     {"het-HOCl-HCl", 193.0, 0.03, 0.3},    {"het-HOCl-HCl", 197.5, 3e-3, 3e-2},
                     {"het-HOCl-HCl", 210.0, 0.0, 1e-4}};
    Mechanism *m = read_default();
    double water = 5e-6 * 50.0, hcl = 1e-9 * 50.0, clono2 = 0.5e-9 * 50.0, radius = 1.7e-5;
    for (size_t i = 0; i < sizeof published / sizeof *published; i++) {
        double gamma = surface_probability(m, index_of(m, published[i].id), published[i].temperature, water,
                                           hcl, clono2, radius);
        assert_true(gamma > published[i].low && gamma < published[i].high);
    }
    mechanism_free(m);
}

/* Hanson and Mauersberger (1988): with 5 ppm of water and 10 ppb of HNO3 at 50 hPa the solid forms below
 * 195.7 K (often quoted as 195 to 196 K, from memory). The pressures are those of a separate program (NumPy).
 */
static void nat_forms_in_the_cold(void **state)
{
    (void)state;
    static const double vapour[][2] = {
        {190.0, 7.37438e-9}, {195.0, 2.93816e-7}, {196.0, 6.00799e-7}, {200.0, 9.80671e-6}};
    double water = 5e-6 * 50.0, acid = 10e-9 * 50.0;
    for (int i = 0; i < 4; i++)
        check_near(nat_vapour_hpa(vapour[i][0], water), vapour[i][1], 1e-5);
    assert_true(nat_area(196.0, water, acid) == 0.0 && nat_area(195.4, water, acid) > 0.0);
    assert_true(nat_area(190.0, water, 0.0) == 0.0);
    /* more water or more acid shift the threshold upward */
    assert_true(nat_area(196.0, 1.3 * water, acid) > 0.0 && nat_area(196.0, water, 1.3 * acid) > 0.0);
    /* all of 10 ppb at 185 K: 1.957e10 molecules of 117.06 / 1.62 / 6.022e23 cm3 on spheres of 1 um: 3 V / r,
     * by hand; the vapour over the solid is 0.05 % of it */
    check_near(nat_area(185.0, water, acid), 7.05e-8, 3e-3);
}

/* On the solid at 192 K: gamma c A / 4 of the first gas where HCl is plentiful, and no more than the
 * collisions of HCl where it is scarce. Nothing without HNO3 or in warmer air. */
static void nat_coefficients_are_uptake_rates(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    double temperature[PACK], air[PACK], area[PACK] = {0.0}, radius[PACK];
    double *density = calloc((size_t)m->solved * PACK, sizeof *density);
    double *k = calloc((size_t)m->reactions * PACK, sizeof *k);
    assert_true(density && k);
    int hcl = mechanism_solved(m, "HCl"), clono2 = mechanism_solved(m, "ClONO2");
    for (int i = 0; i < PACK; i++) {
        temperature[i] = i == 1 ? 197.0 : 192.0;
        air[i] = 5000.0 / (1.380649e-23 * temperature[i]) * 1e-6; /* 50 hPa */
        radius[i] = 1e-5;
        density[mechanism_solved(m, "H2O") * PACK + i] = 5e-6 * air[i];
        density[mechanism_solved(m, "HNO3") * PACK + i] = i == 2 ? -1e3 : 10e-9 * air[i];
        density[hcl * PACK + i] = i == 3 ? -1e3 : i == 4 ? 1e-6 * air[i] : 1e-9 * air[i];
        density[clono2 * PACK + i] = 0.5e-9 * air[i];
    }
    surface_rates(m, PACK, temperature, air, area, radius, density, k);
    double solid = nat_area(192.0, 5e-6 * 50.0, 10e-9 * 50.0);
    int by_hcl = index_of(m, "nat-ClONO2-HCl"), by_water = index_of(m, "nat-ClONO2-H2O");
    for (int r = m->surface_first; r < m->washout_first; r++) {
        int here = m->reaction[r].surface_model == SURFACE_NAT_H2O ||
                   m->reaction[r].surface_model == SURFACE_NAT_HCL;
        assert_int_equal(k[r * PACK] > 0.0, here); /* no sulfate in this air */
        assert_true(k[r * PACK + 1] == 0.0 && k[r * PACK + 2] == 0.0);
    }
    /* speeds 1474 T^1/2 of ClONO2 and 1474 / 0.612 T^1/2 of HCl (Shi et al. 2001), to their three digits */
    double speed = 1474.0 * sqrt(192.0), hcl_speed = speed / 0.612;
    check_near(k[by_water * PACK], 0.25 * 0.004 * speed * solid, 2e-3);
    check_near(k[by_hcl * PACK + 4] * 1e-6 * air[0], 0.25 * 0.2 * speed * solid, 3e-3);
    check_near(k[by_hcl * PACK] * 1e-9 * air[0], 0.25 * 0.2 * speed * solid / (1.0 + 0.2 * 0.612 * 0.5),
               3e-3);
    check_near(k[by_hcl * PACK + 3] * density[clono2 * PACK + 3], 0.25 * hcl_speed * solid, 3e-3);
    /* ClONO2 is gone within hours (Solomon 1999, Rev. Geophys. 37, 275, from memory: hours to a day) */
    double hours = 1.0 / (k[by_hcl * PACK] * 1e-9 * air[0]) / 3600.0;
    assert_true(hours > 1.0 && hours < 24.0);
    free(density);
    free(k);
    mechanism_free(m);
}

/* The same formulas evaluated by a separate program (NumPy), written apart from surface.c: columns are
 * temperature K; pressures of water, HCl, ClONO2 hPa; radius cm; then percent and the probabilities of ClONO2
 * + H2O, ClONO2 + HCl, HOCl + HCl, N2O5 + H2O. */
static void probabilities_match_another_evaluation(void **state)
{
    (void)state;
    static const double points[][10] = {
        {192, 2.5e-4, 5e-8, 2.5e-8, 1e-5, 47.1643, 1.37120e-2, 3.54906e-1, 9.11702e-2, 0.095623},
        {197, 2.5e-4, 5e-8, 5.0e-7, 2e-5, 55.5804, 6.80497e-3, 4.88834e-3, 8.13052e-3, 0.101481},
        {205, 2.5e-4, 5e-8, 2.5e-8, 1e-5, 64.5172, 8.96589e-4, 3.16810e-5, 4.53917e-5, 0.101912},
        {218, 1.5e-4, 2e-8, 1.0e-8, 5e-6, 75.2736, 4.67392e-5, 1.46885e-8, 1.55006e-8, 0.0917769},
    };
    static const char *const ids[] = {"het-ClONO2-H2O", "het-ClONO2-HCl", "het-HOCl-HCl", "het-N2O5-H2O"};
    Mechanism *m = read_default();
    for (int i = 0; i < 4; i++) {
        const double *p = points[i];
        check_near(surface_acid_percent(p[0], p[1]), p[5], 1e-5);
        for (int r = 0; r < 4; r++)
            check_near(surface_probability(m, index_of(m, ids[r]), p[0], p[1], p[2], p[3], p[4]), p[6 + r],
                       1e-5);
    }
    mechanism_free(m);
}

static void probabilities_have_their_limits(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    int by_water = index_of(m, "het-ClONO2-H2O"), by_hcl = index_of(m, "het-ClONO2-HCl");
    int hocl = index_of(m, "het-HOCl-HCl"), n2o5 = index_of(m, "het-N2O5-H2O");
    /* from the mesopause to the ground, dust-dry to saturated, small to large: a probability, never more */
    double hot[] = {180.0, 187.0, 198.0, 220.0, 250.0, 270.0, 298.0};
    for (int t = 0; t < 7; t++)
        for (double water = 1e-12; water < 40.0; water *= 100.0)
            for (double radius = 1e-8; radius < 1e-2; radius *= 100.0)
                for (double hcl = 1e-18; hcl < 1e-6; hcl *= 1e4) {
                    double a = surface_probability(m, by_water, hot[t], water, hcl, 1e-8, radius);
                    double b = surface_probability(m, by_hcl, hot[t], water, hcl, 1e-8, radius);
                    double c = surface_probability(m, hocl, hot[t], water, hcl, 1e-8, radius);
                    double d = surface_probability(m, n2o5, hot[t], water, hcl, 1e-8, radius);
                    assert_true(a >= 0.0 && b >= 0.0 && c >= 0.0 && a + b <= 1.0 + 1e-12 && c <= 1.0);
                    assert_true(d > 0.0 && d < 1.0);
                }
    double water = 5e-6 * 50.0;
    /* a small droplet reacts through its volume: proportional to radius; a large one through its skin: not at
     * all */
    double small = surface_probability(m, by_water, 210.0, water, 0.0, 0.0, 1e-8);
    check_near(surface_probability(m, by_water, 210.0, water, 0.0, 0.0, 2e-8), 2.0 * small, 1e-3);
    double large = surface_probability(m, by_water, 210.0, water, 0.0, 0.0, 1e-2);
    check_near(surface_probability(m, by_water, 210.0, water, 0.0, 0.0, 2e-2), large, 2e-3);
    /* the depth factor's series and closed form meet at q = 0.01: no step as the radius passes */
    for (double r = 1e-8; r < 1e-6; r *= 1.01) {
        double ratio = surface_probability(m, by_water, 210.0, water, 0.0, 0.0, 1.01 * r) /
                       surface_probability(m, by_water, 210.0, water, 0.0, 0.0, r);
        assert_true(ratio > 1.005 && ratio < 1.0101);
    }
    /* linear in HCl while HCl is scarce */
    double one = surface_probability(m, by_hcl, 200.0, water, 1e-12, 0.0, 1e-5);
    check_near(surface_probability(m, by_hcl, 200.0, water, 2e-12, 0.0, 1e-5), 2.0 * one, 1e-3);
    one = surface_probability(m, hocl, 220.0, water, 1e-12, 0.0, 1e-6);
    check_near(surface_probability(m, hocl, 220.0, water, 2e-12, 0.0, 1e-6), 2.0 * one, 1e-3);
    /* plenty of ClONO2 leaves each less HCl: flow of HCl limits the reaction */
    assert_true(surface_probability(m, by_hcl, 190.0, water, 1e-9, 1e-6, 1e-5) <
                0.1 * surface_probability(m, by_hcl, 190.0, water, 1e-9, 0.0, 1e-5));
    mechanism_free(m);
}

static void surface_coefficients_are_uptake_rates(void **state)
{
    (void)state;
    Mechanism *m = read_default();
    double temperature[PACK], air[PACK], area[PACK], radius[PACK];
    double *density = calloc((size_t)m->solved * PACK, sizeof *density);
    double *k = malloc((size_t)m->reactions * PACK * sizeof *k);
    assert_true(density && k);
    for (int i = 0; i < PACK; i++) {
        temperature[i] = 195.0 + 5.0 * i;
        air[i] = 5000.0 / (1.380649e-23 * temperature[i]) * 1e-6; /* 50 hPa */
        area[i] = i == 3 ? 0.0 : 1e-8 * (i + 1);
        radius[i] = 1e-5;
        density[mechanism_solved(m, "H2O") * PACK + i] = i == 5 ? -1e3 : 5e-6 * air[i];
        density[mechanism_solved(m, "HCl") * PACK + i] = i == 4 ? -1e3 : i == 6 ? 0.0 : 1e-9 * air[i];
        density[mechanism_solved(m, "ClONO2") * PACK + i] = i == 4 ? -1e3 : 0.5e-9 * air[i];
    }
    for (int i = 0; i < m->reactions * PACK; i++)
        k[i] = -1.0;
    surface_rates(m, PACK, temperature, air, area, radius, density, k);
    for (int r = 0; r < m->reactions; r++)
        for (int i = 0; i < PACK; i++) {
            double here = k[r * PACK + i];
            if (m->reaction[r].kind != REACTION_SURFACE) {
                assert_true(here == -1.0);
                continue;
            }
            assert_true(isfinite(here) && here >= 0.0);
            if (strncmp(m->reaction[r].id, "nat-", 4) == 0) {
                assert_true(here == 0.0); /* no HNO3 */
                continue;
            }
            if (i != 5) /* without water there is no solvent, and nothing dissolves to react */
                assert_int_equal(here == 0.0, area[i] == 0.0);
            if (i > 2)
                continue;
            /* gamma c A / 4, c = (8 k T / pi m)^1/2: 1474 T^1/2 for ClONO2, 2009 T^1/2 for HOCl (Shi et al.
             * 2001) */
            const char *name = mechanism_name(m, m->reaction[r].reactant[0]);
            double speed = strcmp(name, "ClONO2") == 0 ? 1474.0 : strcmp(name, "HOCl") == 0 ? 2009.0 : 0.0;
            double want =
                0.25 * speed * sqrt(temperature[i]) * area[i] *
                surface_probability(m, r, temperature[i], 5e-6 * 50.0, 1e-9 * 50.0, 0.5e-9 * 50.0, 1e-5);
            if (m->reaction[r].reactants == 2)
                want /= 1e-9 * air[i];
            if (speed > 0.0)
                check_near(here, want, 2e-3);
        }
    /* an absent partner: the coefficient is the limit of little HCl, not 0 and not infinite */
    int by_hcl = index_of(m, "het-ClONO2-HCl"), hcl = mechanism_solved(m, "HCl");
    double limit = k[by_hcl * PACK + 6];
    density[hcl * PACK + 6] = 1e3;
    surface_rates(m, PACK, temperature, air, area, radius, density, k);
    assert_true(limit > 0.0);
    check_near(k[by_hcl * PACK + 6], limit, 1e-6);
    free(density);
    free(k);
    mechanism_free(m);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(acid_strength_is_that_of_the_stratosphere),
        cmocka_unit_test(probabilities_are_of_published_size),
        cmocka_unit_test(chlorine_is_activated_in_the_cold),
        cmocka_unit_test(nat_forms_in_the_cold),
        cmocka_unit_test(nat_coefficients_are_uptake_rates),
        cmocka_unit_test(probabilities_match_another_evaluation),
        cmocka_unit_test(probabilities_have_their_limits),
        cmocka_unit_test(surface_coefficients_are_uptake_rates),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
