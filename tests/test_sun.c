/* Tests of the sun's path through the day and of photolysis rates along it (model/sun), against integrals by
 * a fine Simpson rule and against the sun of the Astronomical Almanac. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "../input/constants.h"
#include "../model/sun.h"

static const double degree = PI / 180.0;

static Settings global_case(void)
{
    Settings settings;
    settings_default(&settings, "input/data");
    assert_int_equal(settings.sun, SUN_GLOBAL);
    return settings;
}

static Settings place(double latitude, double day)
{
    Settings settings = global_case();
    settings.sun = SUN_LATITUDE;
    settings.latitude_deg = latitude;
    settings.day_of_year = day;
    return settings;
}

/* ---- rates as functions of the cosine ---- */

typedef double Rate(double cosine, double depth);

static double constant(double cosine, double depth)
{
    return (void)cosine, depth;
}
static double beam(double cosine, double depth)
{
    return cosine > 0.0 ? exp(-depth / cosine) : 0.0;
}
static double exponential(double cosine, double depth)
{
    return exp(depth * cosine);
}
/* Light through a shell: the slant factor is 1 overhead, 18 at the horizon, 70 at the end of twilight. */
static double shell(double cosine, double depth)
{
    return exp(-depth * 2.0 / (cosine + sqrt(cosine * cosine + 0.012)));
}

static void sample(const Sun *sun, Rate *rate, double depth, double *table, int stride)
{
    for (int i = 0; i < sun->nodes; i++)
        table[i * stride] = rate(sun->cosine[i], depth);
}

static double spread(const Settings *settings, int refine, Rate *rate, double depth, double *knot)
{
    Sun sun;
    double table[SUN_NODES];
    sun_make(&sun, settings, refine);
    sample(&sun, rate, depth, table, 1);
    return sun_spread(&sun, table, 1, knot, 1);
}

/* Half the integral over the cosine from 0 to 1: the mean over the globe, half of which is dark. */
static double global_mean(Rate *rate, double depth)
{
    enum { PARTS = 20000 };
    double sum = 0.0;
    for (int i = 0; i <= PARTS; i++)
        sum += (i == 0 || i == PARTS ? 1.0 : i % 2 ? 4.0 : 2.0) * rate((double)i / PARTS, depth);
    return 0.5 * sum / (3.0 * PARTS);
}

/* Mean over the day of a place with declination delta (radians), dark below SUN_TWILIGHT: over half the day,
 * midnight to noon, whose other half mirrors it. */
static double place_mean(Rate *rate, double depth, double latitude, double delta)
{
    enum { PARTS = 20000 };
    double constant_part = sin(latitude) * sin(delta), swing = cos(latitude) * cos(delta), sum = 0.0;
    double lowest = constant_part - swing, rise = 0.0;
    if (lowest < SUN_TWILIGHT)
        rise = acos((constant_part - SUN_TWILIGHT) / swing);
    for (int i = 0; i <= PARTS; i++) {
        double angle = rise + (PI - rise) * i / PARTS;
        sum += (i == 0 || i == PARTS ? 1.0
                : i % 2              ? 4.0
                                     : 2.0) *
               rate(constant_part - swing * cos(angle), depth);
    }
    return sum / (3.0 * PARTS) * (PI - rise) / PI;
}

static double relative(double got, double want)
{
    return fabs(got / want - 1.0);
}

/* ---- the global sun ---- */

static void test_global_path(void **state)
{
    (void)state;
    Settings settings = global_case();
    for (int refine = 1; refine <= 2; refine++) {
        Sun sun;
        sun_make(&sun, &settings, refine);
        assert_in_range(sun.nodes, 8, SUN_NODES);
        assert_true(sun.cosine[0] == 0.0 && fabs(sun.cosine[sun.nodes - 1] - 1.0) < 1e-15);
        for (int i = 1; i < sun.nodes; i++)
            assert_true(sun.cosine[i] > sun.cosine[i - 1]);
        assert_true(sun.earth_sun == 1.0);
        assert_true(fabs(sun.time[0] - 6.0 * 3600.0) < 1e-9 &&
                    fabs(sun.time[SUN_KNOTS - 1] - 12.0 * 3600.0) < 1e-9);
        for (int i = 0; i < SUN_KNOTS; i++) {
            /* the cosine rises linearly from 0 at six to 1 at noon */
            assert_true(fabs(sun.knot[i] - (sun.time[i] / 3600.0 - 6.0) / 6.0) < 1e-14);
            if (!i)
                continue;
            assert_true(sun.time[i] > sun.time[i - 1]);
            assert_true(fabs(sun.middle[i - 1] - 0.5 * (sun.knot[i - 1] + sun.knot[i])) < 1e-14);
        }
    }
    Settings other = settings; /* latitude and season are not looked at */
    other.latitude_deg = 70.0;
    other.day_of_year = 355.0;
    Sun a, b;
    sun_make(&a, &settings, 1);
    sun_make(&b, &other, 1);
    assert_memory_equal(&a, &b, sizeof a);
}

static void test_global_mean(void **state)
{
    (void)state;
    Settings settings = global_case();
    double knot[SUN_KNOTS];
    /* Constant light: half the day is dark. A missing half or an extra cosine shows here at once. */
    assert_true(relative(spread(&settings, 1, constant, 3e-5, knot), 1.5e-5) < 1e-12);
    /* The logarithm is linear in the cosine, so the interpolant is exact and Simpson's rule is all the error.
     */
    assert_true(relative(spread(&settings, 1, exponential, 1.0, knot), 0.5 * (exp(1.0) - 1.0)) < 1e-6);
    assert_true(relative(spread(&settings, 1, exponential, 4.0, knot), 0.5 * (exp(4.0) - 1.0) / 4.0) < 1e-5);
    /* beam: exp(-tau / mu), the limit of a flat atmosphere, whose logarithm is infinite at the horizon */
    static const struct {
        Rate *rate;
        double depth, near; /* allowed relative error */
    } smooth[] = {
        {shell, 0.03, 1e-3}, {shell, 0.3, 1e-3}, {shell, 1.0, 1e-3}, {shell, 3.0, 2e-3}, {shell, 10.0, 1e-2},
        {beam, 0.03, 1e-3},  {beam, 0.3, 1e-3},  {beam, 1.0, 1e-3},  {beam, 3.0, 2e-3},  {beam, 10.0, 1e-2},
    };
    for (size_t i = 0; i < sizeof smooth / sizeof smooth[0]; i++) {
        double want = global_mean(smooth[i].rate, smooth[i].depth);
        double coarse = relative(spread(&settings, 1, smooth[i].rate, smooth[i].depth, knot), want);
        double fine = relative(spread(&settings, 2, smooth[i].rate, smooth[i].depth, knot), want);
        print_message("%s, depth %5.2f: error %.1e, twice as dense %.1e\n",
                      smooth[i].rate == shell ? "shell" : "beam", smooth[i].depth, coarse, fine);
        assert_true(coarse < smooth[i].near);
        assert_true(fine < fmax(0.5 * coarse, 1e-5)); /* it is the interpolation, and it converges */
    }
    /* the closed form of one of them: half of E2(1), Abramowitz and Stegun 1964, table 5.1 with E2 = exp(-1)
     * - E1(1) */
    assert_true(relative(global_mean(beam, 1.0), 0.5 * (exp(-1.0) - 0.219383934395520)) < 1e-6);
}

/* What the chemistry integrates, linear between knots, must have the mean that goes with it, and be near the
 * rate itself. */
static void check_knots(const Settings *settings, Rate *rate, double depth, double near)
{
    Sun sun;
    double table[SUN_NODES], knot[SUN_KNOTS], sum = 0.0, top = 0.0;
    sun_make(&sun, settings, 1);
    sample(&sun, rate, depth, table, 1);
    double mean = sun_spread(&sun, table, 1, knot, 1);
    for (int i = 1; i < SUN_KNOTS; i++)
        sum += 0.5 * (knot[i] + knot[i - 1]) * (sun.time[i] - sun.time[i - 1]);
    assert_true(relative(2.0 * sum / DAY_SECONDS, mean) < 1e-13);
    for (int i = 0; i < SUN_KNOTS; i++)
        top = fmax(top, knot[i]);
    for (int i = 0; i < SUN_KNOTS; i++)
        if (fabs(knot[i] - rate(sun.knot[i], depth)) > near * top)
            fail_msg("knot %d: got %g, want %g", i, knot[i], rate(sun.knot[i], depth));
}

static void test_knots_carry_the_mean(void **state)
{
    (void)state;
    Settings settings = global_case();
    check_knots(&settings, constant, 1.0, 1e-12);
    check_knots(&settings, exponential, 2.0, 2e-3);
    for (double depth = 0.03; depth < 1.0; depth *= 3.0)
        check_knots(&settings, shell, depth, 1e-2);
    /* a rate of the minutes around noon: straight lines between the knots make it broad, and the scaling
     * lower */
    check_knots(&settings, shell, 3.0, 3e-2);
    check_knots(&settings, shell, 10.0, 2e-1);
    for (double latitude = -80.0; latitude <= 80.0; latitude += 20.0)
        for (double day = 10.0; day < 366.0; day += 40.0) {
            settings = place(latitude, day);
            Sun sun;
            sun_make(&sun, &settings, 1);
            if (!sun.nodes)
                continue;
            check_knots(&settings, exponential, 2.0, 2e-2);
            check_knots(&settings, shell, 0.3, 3e-2);
        }
}

/* Rates that rise with the sun stay rising: the interpolant does not overshoot, whatever the jumps between
 * nodes. */
static void test_monotone_and_positive(void **state)
{
    (void)state;
    Settings settings = global_case();
    Sun sun;
    sun_make(&sun, &settings, 1);
    srand(1);
    for (int trial = 0; trial < 200; trial++) {
        double table[SUN_NODES], knot[SUN_KNOTS], log_rate = -80.0;
        for (int i = 0; i < sun.nodes; i++) {
            log_rate += trial % 2 ? 8.0 * rand() / RAND_MAX : (rand() % 4 ? 0.0 : 20.0 * rand() / RAND_MAX);
            table[i] = exp(log_rate);
        }
        double mean = sun_spread(&sun, table, 1, knot, 1);
        assert_true(mean > 0.0 && mean <= 0.5 * table[sun.nodes - 1] * (1.0 + 1e-12));
        for (int i = 1; i < SUN_KNOTS; i++)
            assert_true(knot[i] >= knot[i - 1] * (1.0 - 1e-12));
    }
}

static void test_zero_rates_and_strides(void **state)
{
    (void)state;
    enum { STRIDE = 7 };
    Settings settings = global_case();
    Sun sun;
    sun_make(&sun, &settings, 1);
    double table[SUN_NODES * STRIDE], knot[SUN_KNOTS * STRIDE], plain[SUN_NODES], plain_knot[SUN_KNOTS];
    for (int i = 0; i < SUN_NODES * STRIDE; i++)
        table[i] = -1e30; /* must not be looked at */
    for (int i = 0; i < SUN_KNOTS * STRIDE; i++)
        knot[i] = 5.0;
    for (int i = 0; i < sun.nodes; i++)
        plain[i] = table[i * STRIDE] = shell(sun.cosine[i], 1.0);
    double a = sun_spread(&sun, plain, 1, plain_knot, 1), b = sun_spread(&sun, table, STRIDE, knot, STRIDE);
    assert_true(a == b);
    for (int i = 0; i < SUN_KNOTS * STRIDE; i++)
        assert_true(knot[i] == (i % STRIDE ? 5.0 : plain_knot[i / STRIDE]));

    for (int i = 0; i < sun.nodes; i++)
        plain[i] = 0.0;
    assert_true(sun_spread(&sun, plain, 1, plain_knot, 1) == 0.0);
    for (int i = 0; i < SUN_KNOTS; i++)
        assert_true(plain_knot[i] == 0.0);

    /* dark at low sun, lit at noon: finite, and nothing where the nodes say nothing */
    for (int i = 0; i < sun.nodes; i++)
        plain[i] = sun.cosine[i] > 0.5 ? 1e-6 : 0.0;
    double mean = sun_spread(&sun, plain, 1, plain_knot, 1);
    assert_true(mean > 0.0 && mean <= 0.5e-6);
    for (int i = 0; i < SUN_KNOTS; i++)
        assert_true(isfinite(plain_knot[i]) && (sun.knot[i] > 0.3 || plain_knot[i] < 1e-50));
}

/* ---- the sun of a latitude ---- */

/* Declination by what the program shows of it: at 60 degrees north the noon sun stands at 90 - 60 +
 * declination. */
static double shown_declination(double day)
{
    Settings settings = place(60.0, day);
    Sun sun;
    sun_make(&sun, &settings, 1);
    assert_true(sun.nodes > 0);
    return 60.0 - acos(sun.knot[SUN_KNOTS - 1]) / degree;
}

/* Low-precision sun of the Astronomical Almanac (page C5 of recent volumes, from memory; good to 0.01 degrees
 * between 1950 and 2050) at noon of a day of a year; distance in au. */
static double almanac(int year, double day, double *distance)
{
    /* days since J2000 = 2000 January 1, 12 h; years 1950..2050 */
    double d = 365.0 * (year - 2000) + floor((year - 2000 + 3) / 4.0) + day - 1.0;
    double g = (357.529 + 0.98560028 * d) * degree, l = (280.459 + 0.98564736 * d) * degree;
    double lambda = l + (1.915 * sin(g) + 0.020 * sin(2.0 * g)) * degree;
    *distance = 1.00014 - 0.01671 * cos(g) - 0.00014 * cos(2.0 * g);
    return asin(sin((23.439 - 3.6e-7 * d) * degree) * sin(lambda)) / degree;
}

static void test_declination(void **state)
{
    (void)state;
    /* solstices: the obliquity of the ecliptic, 23.44 degrees; Spencer's series is good to 0.035 */
    assert_true(fabs(shown_declination(172.0) - 23.44) < 0.035);
    assert_true(fabs(shown_declination(355.0) + 23.44) < 0.035);
    /* equinoxes: 20 or 21 March, 22 or 23 September */
    assert_true(shown_declination(79.0) < 0.0 && shown_declination(81.0) > 0.0);
    assert_true(shown_declination(265.0) > 0.0 && shown_declination(267.0) < 0.0);
    /* The series has one calendar, the sun's drifts by up to a day (0.4 degrees at the equinoxes) between
     * leap years; they agree at noon of a leap year, within the 0.035 degrees that Spencer gives. */
    for (double day = 1.0; day <= 365.0; day += 1.0) {
        double distance, want = almanac(1952, day, &distance);
        if (fabs(shown_declination(day) - want) > 0.035)
            fail_msg("day %g: declination %.3f, almanac %.3f", day, shown_declination(day), want);
    }
}

static void test_earth_sun(void **state)
{
    (void)state;
    double mean = 0.0;
    for (double day = 1.0; day <= 365.0; day += 1.0) {
        Settings settings = place(0.0, day);
        Sun sun;
        double distance;
        sun_make(&sun, &settings, 1);
        almanac(1970, day, &distance);
        /* Spencer's series swings by 3.42 %, twice the eccentricity is 3.34 %: 9e-4 apart at the apsides */
        assert_true(relative(sun.earth_sun, 1.0 / (distance * distance)) < 1e-3);
        mean += sun.earth_sun / 365.0;
    }
    /* the mean of 1 / r2 over time is 1 / sqrt(1 - e2), e = 0.0167 */
    assert_true(fabs(mean - 1.0 / sqrt(1.0 - 0.0167 * 0.0167)) < 1e-4);
    Settings january = place(0.0, 3.0), july = place(0.0, 185.0);
    Sun near, far;
    sun_make(&near, &january, 1);
    sun_make(&far, &july, 1);
    assert_true(fabs(near.earth_sun - 1.0343) < 1e-3); /* perihelion 0.9833 au (Astronomical Almanac) */
    assert_true(fabs(far.earth_sun - 0.9674) < 1e-3);  /* aphelion 1.0167 au */
}

static void test_noon_and_day_length(void **state)
{
    (void)state;
    for (double latitude = -85.0; latitude <= 85.0; latitude += 10.0)
        for (double day = 1.0; day < 366.0; day += 26.0) {
            Settings settings = place(latitude, day);
            Sun sun;
            sun_make(&sun, &settings, 1);
            if (!sun.nodes)
                continue;
            double delta = shown_declination(day) * degree, phi = latitude * degree;
            assert_true(fabs(sun.knot[SUN_KNOTS - 1] - cos(phi - delta)) < 1e-9);
            assert_true(fabs(sun.time[SUN_KNOTS - 1] - 43200.0) < 1e-9);
            for (int i = 1; i < sun.nodes; i++)
                assert_true(sun.cosine[i] > sun.cosine[i - 1]);
            assert_true(sun.cosine[0] <= sun.knot[0] + 1e-9);
            assert_true(sun.cosine[sun.nodes - 1] >= sun.knot[SUN_KNOTS - 1] - 1e-9);
            /* the hour angle at every knot */
            for (int i = 0; i < SUN_KNOTS; i++) {
                double hour = 2.0 * PI * (sun.time[i] / DAY_SECONDS - 0.5);
                double want = sin(phi) * sin(delta) + cos(phi) * cos(delta) * cos(hour);
                assert_true(fabs(sun.knot[i] - want) < 1e-9);
                if (i)
                    assert_true(sun.time[i] > sun.time[i - 1]);
            }
            /* light begins where the cosine is that of the end of twilight, or at midnight */
            if (sun.time[0] > 0.0)
                assert_true(fabs(sun.knot[0] - SUN_TWILIGHT) < 1e-9);
            else
                assert_true(sun.knot[0] >= SUN_TWILIGHT);
        }
    /* On the equator at the equinox the sun rises at six through the vertical: twilight of 11.54 degrees
     * takes 46.1 min. */
    Settings settings = place(0.0, 80.0);
    Sun sun;
    sun_make(&sun, &settings, 1);
    assert_true(fabs(sun.time[0] - (6.0 * 3600.0 - 11.537 / 15.0 * 3600.0)) < 20.0);
    assert_true(fabs(sun.knot[SUN_KNOTS - 1] - 1.0) < 1e-4);
    /* Twilight included, midsummer at 50 north is light for 16 h 22 min (geometric) and its twilights. */
    settings = place(50.0, 172.0);
    sun_make(&sun, &settings, 1);
    double half = acos((SUN_TWILIGHT - sin(50.0 * degree) * sin(23.44 * degree)) /
                       (cos(50.0 * degree) * cos(23.44 * degree)));
    assert_true(fabs(2.0 * (43200.0 - sun.time[0]) - half / PI * DAY_SECONDS) < 60.0);
}

static void test_polar_day_and_night(void **state)
{
    (void)state;
    Settings settings = place(85.0, 355.0); /* noon sun 18 degrees below the horizon */
    Sun sun;
    sun_make(&sun, &settings, 1);
    assert_int_equal(sun.nodes, 0);
    double knot[SUN_KNOTS];
    for (int i = 0; i < SUN_KNOTS; i++)
        knot[i] = 7.0;
    assert_true(sun_spread(&sun, NULL, 1, knot, 1) == 0.0);
    for (int i = 0; i < SUN_KNOTS; i++)
        assert_true(knot[i] == 0.0);

    settings = place(72.0, 355.0); /* noon 5 degrees below: a few hours of twilight, no sun */
    sun_make(&sun, &settings, 1);
    assert_true(sun.nodes > 0 && sun.cosine[sun.nodes - 1] < 0.0);
    assert_true(sun.time[0] > 6.0 * 3600.0);

    for (int south = 0; south <= 1; south++) { /* midnight sun */
        settings = place(south ? -80.0 : 80.0, south ? 355.0 : 172.0);
        sun_make(&sun, &settings, 1);
        assert_true(sun.time[0] == 0.0 && sun.knot[0] > 0.2); /* 13.4 degrees above the horizon at midnight */
        settings.latitude_deg *= 90.0 / 80.0;
        double at_pole = spread(&settings, 1, shell, 0.3, knot), height = sin(23.44 * degree);
        assert_true(relative(at_pole, shell(height, 0.3)) < 5e-3);
        for (int i = 0; i < SUN_KNOTS; i++)
            assert_true(relative(knot[i], at_pole) < 1e-4);
    }
}

static void test_place_mean(void **state)
{
    (void)state;
    static const double depths[] = {0.03, 0.3, 1.0, 3.0};
    double worst = 0.0, worst_fine = 0.0, worst_dim = 0.0;
    for (double latitude = -90.0; latitude <= 90.0; latitude += 15.0)
        for (double day = 1.0; day < 366.0; day += 30.0) {
            Settings settings = place(latitude, day);
            double knot[SUN_KNOTS], delta = shown_declination(day) * degree;
            Sun sun;
            sun_make(&sun, &settings, 1);
            if (!sun.nodes)
                continue;
            double light =
                place_mean(shell, 0.0, latitude * degree, delta); /* share of the day that is light */
            assert_true(relative(spread(&settings, 1, constant, 2.0, knot), 2.0 * light) < 1e-9);
            for (size_t i = 0; i < sizeof depths / sizeof depths[0]; i++) {
                double want = place_mean(shell, depths[i], latitude * degree, delta);
                double coarse = relative(spread(&settings, 1, shell, depths[i], knot), want);
                double fine = relative(spread(&settings, 2, shell, depths[i], knot), want);
                if (sun.cosine[sun.nodes - 1] > 0.1) {
                    worst = fmax(worst, coarse);
                    worst_fine = fmax(worst_fine, fine);
                } else { /* a day of twilight: rates below 1e-40 are nothing */
                    worst_dim = fmax(worst_dim, coarse * want / (want + 1e-40));
                }
            }
        }
    print_message("day means at latitudes: worst error %.1e, nodes twice as dense %.1e; twilight days %.1e\n",
                  worst, worst_fine, worst_dim);
    assert_true(worst < 5e-3);
    assert_true(worst_fine < 0.4 * worst);
    assert_true(worst_dim < 2e-2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_global_path),
        cmocka_unit_test(test_global_mean),
        cmocka_unit_test(test_knots_carry_the_mean),
        cmocka_unit_test(test_monotone_and_positive),
        cmocka_unit_test(test_zero_rates_and_strides),
        cmocka_unit_test(test_declination),
        cmocka_unit_test(test_earth_sun),
        cmocka_unit_test(test_noon_and_day_length),
        cmocka_unit_test(test_polar_day_and_night),
        cmocka_unit_test(test_place_mean),
    };
    return cmocka_run_group_tests_name("sun", tests, NULL, NULL);
}
