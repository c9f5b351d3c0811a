/* Tests of photolysis against published figures and an integration written here. */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "sunlight_world.h"

#include <time.h>

#include "../input/table.h"

enum { MOST_SUNS = 16 };

static Photolysis *make_photolysis(const double *cosine, int suns, double albedo)
{
    Photolysis *made;
    Fault fault = {0};
    if (photolysis_make(&made, world.mechanism, world.spectra, LAYERS, world.grid.padded, world.edge_km,
                        world.air.temperature, world.air.number_density, world.grid.depth,
                        world.air.column_above_top, cosine, suns, albedo, &fault))
        fail_msg("%s", fault.text);
    return made;
}

/* Rates [suns][reactions][padded] of the world under these suns. Owner: caller. */
static double *world_rates(const double *cosine, int suns, double albedo)
{
    Photolysis *photolysis = make_photolysis(cosine, suns, albedo);
    double *rate = calloc((size_t)suns * (size_t)world.reactions * (size_t)world.grid.padded, sizeof *rate);
    assert_non_null(rate);
    photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1, rate);
    photolysis_free(photolysis);
    return rate;
}

static double rate_of(const double *rate, int sun, int r, int layer)
{
    return rate[(size_t)(sun * world.reactions + r) * (size_t)world.grid.padded + (size_t)layer];
}

/* ---- photolysis ---- */

/* Columns of tables for the independent integration. */
typedef struct {
    Table sun, oxygen, ozone, bands, line;
} Sources;

static void read_sources(Sources *sources)
{
    const struct {
        Table *table;
        const char *file;
    } want[] = {{&sources->sun, "solar-irradiance.csv"},
                {&sources->oxygen, "xs/O2.csv"},
                {&sources->ozone, "xs/O3.csv"},
                {&sources->bands, "o2/schumann-runge.csv"},
                {&sources->line, "o2/lyman-alpha.csv"}};
    for (size_t i = 0; i < 5; i++) {
        char path[300];
        Fault fault = {0};
        in_data(path, want[i].file);
        if (table_read(want[i].table, path, &fault))
            fail_msg("%s", fault.text);
    }
}

static void free_sources(Sources *sources)
{
    table_free(&sources->sun);
    table_free(&sources->oxygen);
    table_free(&sources->ozone);
    table_free(&sources->bands);
    table_free(&sources->line);
}

static double column_at(const Table *table, int column, double w)
{
    return w < table->value[0] || w > table->value[table->rows - 1]
               ? 0
               : table_loglinear(table->value, table->value + (size_t)column * table->rows, table->rows, w);
}

static double photons_at(const Sources *sources, double w) /* cm-2 s-1 nm-1 */
{
    const Table *sun = &sources->sun;
    size_t r = 0;
    while (r + 1 < sun->rows && w >= 0.5 * (sun->value[r] + sun->value[r + 1]))
        r++;
    return sun->value[sun->rows + r] * w * 1e-13 / (PLANCK * LIGHT_SPEED);
}

/* Direct beam by marching along the ray in steps of 0.5 km: columns of air, and of O3 weighted for the two
 * temperatures of its table about the local one, then wavelength by wavelength (0.05 nm). Nothing is shared
 * with the program but the tables. J(O2) and J(O3), all products; [0] as if nothing were scattered, [1] as if
 * all that is scattered were lost. */
static void march(const Sources *sources, double km, double mu, double *j_oxygen, double *j_ozone)
{
    static const double kelvin[4] = {218, 243, 273, 298}; /* columns of the ozone table */
    const Table *bands = &sources->bands, *line = &sources->line;
    double r = EARTH_RADIUS_KM + km, b2 = r * r * (1 - mu * mu), air = 0, o3[4] = {0}, here[4] = {0};
    for (int i = -1; i < 4000; i++) {
        double s = r * mu + 0.5 * (i + 0.5), z = i < 0 ? km : sqrt(b2 + s * s) - EARTH_RADIUS_KM, temperature,
               pressure;
        if (z > 150)
            break;
        air_standard_at(fmin(z, 86), &temperature, &pressure);
        pressure *= exp(-fmax(z - 86, 0) / 5.6); /* scale height of 187 K */
        int t = temperature < 243 ? 0 : temperature < 273 ? 1 : 2;
        double f = fmin(fmax((temperature - kelvin[t]) / (kelvin[t + 1] - kelvin[t]), 0), 1);
        if (i < 0) {
            here[t] = 1 - f;
            here[t + 1] = f;
            continue;
        }
        air += pressure / (BOLTZMANN * temperature) * 1e-6 * 0.5e5;
        o3[t] += (1 - f) * ozone_at(z) * 0.5e5;
        o3[t + 1] += f * ozone_at(z) * 0.5e5;
    }
    double o2 = 0.20948 * air;
    j_oxygen[0] = j_oxygen[1] = j_ozone[0] = j_ozone[1] = 0;
    for (double w = 120.025; w < 850; w += 0.05) {
        double depth = 0, sigma = 0, passed = 0, broken = 0;
        for (int t = 0; t < 4; t++) {
            double s = column_at(&sources->ozone, 1 + t, w);
            depth += s * o3[t];
            sigma += s * here[t];
        }
        if (w > 121 && w < 122) {
            for (size_t i = 0; i < line->rows; i++) {
                passed += line->value[i] * exp(-line->value[line->rows + i] * o2);
                broken += line->value[2 * line->rows + i] * exp(-line->value[3 * line->rows + i] * o2);
            }
        } else if (w > 175.4386 && w < 204.0816) {
            const double *row = bands->value;
            while (w > row[3 * bands->rows])
                row++;
            for (size_t i = 0; i < 6; i++) {
                passed += row[(4 + 2 * i) * bands->rows] * exp(-row[(5 + 2 * i) * bands->rows] * o2);
                broken += row[(16 + 2 * i) * bands->rows] * exp(-row[(17 + 2 * i) * bands->rows] * o2);
            }
        } else {
            /* the table steps down between 175.4 and 175.5 nm, where the bands begin */
            double s = column_at(&sources->oxygen, 1, w > 175.4 && w < 175.5 ? 175.4 : w);
            passed = exp(-s * o2);
            broken = w < 242.4 ? s * passed : 0;
        }
        double light = photons_at(sources, w) * exp(-depth) * 0.05, kept = exp(-radiation_rayleigh(w) * air);
        for (int lost = 0; lost < 2; lost++, light *= kept) {
            j_oxygen[lost] += light * broken;
            j_ozone[lost] += light * passed * sigma;
        }
    }
}

/* The program must lie between the two marches, where they nearly agree: tightly from 40 km up. Below, part
 * of what is scattered comes back and reaches O2 all the same, and from some 30 km down at low sun scattered
 * light, which came straight down where it was scattered, is all there is: only the lower bound holds.
 * Reflected visible light (the Chappuis band) adds to J(O3) everywhere: some per cent above an albedo of 0.
 */
static void test_photolysis_direct(void **state)
{
    (void)state;
    static const double cosine[3] = {1, 0.5, 0.15};
    static const int layer[6] = {15, 22, 30, 40, 55, 75};
    Sources sources;
    read_sources(&sources);
    double *rate = world_rates(cosine, 3, 0);
    int o2 = reaction("J-O2"), o2d = reaction("J-O2-O1D"), o3 = reaction("J-O3"), o3d = reaction("J-O3-O1D");
    for (int s = 0; s < 3; s++)
        for (int i = 0; i < 6; i++) {
            double oxygen[2], ozone[2], km = world.grid.middle[layer[i]] * 1e-5;
            march(&sources, km, cosine[s], oxygen, ozone);
            double a = rate_of(rate, s, o2, layer[i]) + rate_of(rate, s, o2d, layer[i]);
            double b = rate_of(rate, s, o3, layer[i]) + rate_of(rate, s, o3d, layer[i]);
            print_message(
                "           cosine %.2f, %4.1f km: J(O2) %.3e, of marches %.3f %.3f; J(O3) %.3e, %.3f %.3f\n",
                cosine[s], km, a, a / oxygen[0], a / oxygen[1], b, b / ozone[0], b / ozone[1]);
            assert_true(a > 0.99 * oxygen[1] && b > 0.99 * ozone[1]);
            if (km > 40)
                assert_true(a < 1.015 * oxygen[0]);
            else if (cosine[s] >= (km > 20 ? 0.5 : 1))
                assert_true(a < oxygen[0]);
            assert_true(b < (km > 50 ? 1.015 : km > 40 ? 1.05 : 1.25) * ozone[0]);
        }
    free(rate);
    free_sources(&sources);
}

/* Nicolet 1979 (Planet. Space Sci. 27, 939; formula from memory): J(NO) = 4.5e-6 exp(-1e-8 N(O2)^0.38)
 * exp(-5e-19 N(NO)) s-1 in the mesosphere. An older line list and sun: the magnitude to a factor 1.5, but the
 * shape from 55 to 80 km, where J falls to two fifths, to 6 %. */
static void test_photolysis_nitric_oxide(void **state)
{
    (void)state;
    const double overhead = 1;
    double *rate = world_rates(&overhead, 1, 0.1);
    double air = world.air.column_above_top, no = air * world.nitric_oxide[79] / world.air.number_density[79];
    double least = HUGE_VAL, most = 0;
    for (int k = LAYERS - 1; k >= 55; k--) {
        double half = 0.5e5 * world.air.number_density[k], half_no = 0.5e5 * world.nitric_oxide[k];
        double nicolet =
            4.5e-6 * exp(-1e-8 * pow(0.20948 * (air + half), 0.38)) * exp(-5e-19 * (no + half_no));
        double ratio = rate_of(rate, 0, reaction("J-NO"), k) / nicolet;
        least = fmin(least, ratio);
        most = fmax(most, ratio);
        air += 2 * half;
        no += 2 * half_no;
    }
    print_message("           J(NO) above 55 km is %.2f to %.2f of Nicolet's formula\n", least, most);
    assert_true(least > 1 / 1.5 && most < 1.5 && most / least < 1.06);
    free(rate);
}

/* Half the integral of J over the cosine from 0 to 1 is the global mean. Sixteen Gauss suns against the
 * midpoint rule of 160. */
static void test_photolysis_global_mean(void **state)
{
    (void)state;
    enum { MANY = 160 };
    double x[MOST_SUNS], w[MOST_SUNS], even[MANY], error = 0;
    gauss(MOST_SUNS, x, w);
    for (int s = 0; s < MANY; s++)
        even[s] = (s + 0.5) / MANY;
    double *few = world_rates(x, MOST_SUNS, 0.1), *many = world_rates(even, MANY, 0.1);
    static const char *const id[] = {"J-O2",  "J-O3",     "J-O3-O1D", "J-NO2",
                                     "J-N2O", "J-CFC-11", "J-HNO3",   "J-NO3-NO2"};
    for (size_t i = 0; i < sizeof id / sizeof id[0]; i++)
        for (int k = 15; k < LAYERS; k++) {
            double a = 0, b = 0;
            for (int s = 0; s < MOST_SUNS; s++)
                a += 0.5 * w[s] * rate_of(few, s, reaction(id[i]), k);
            for (int s = 0; s < MANY; s++)
                b += 0.5 / MANY * rate_of(many, s, reaction(id[i]), k);
            error = worst(error, a, b);
        }
    print_message("           global means above 15 km: 16 Gauss suns within %.2g of 160 even ones\n", error);
    assert_true(error < 2e-3);
    free(few);
    free(many);
}

/* Below the horizon: dark behind the Earth but for scattered light from the sunlit layers above, falling as
 * the sun sinks; at cosine -0.3 the shadow reaches 307 km and nothing is lit. */
static void test_photolysis_twilight(void **state)
{
    (void)state;
    static const double cosine[6] = {0.02, -0.02, -0.06, -0.1, -0.14, -0.3};
    double *rate = world_rates(cosine, 6, 0.1);
    int no2 = reaction("J-NO2");
    for (int k = 0; k < LAYERS; k++) {
        for (int s = 1; s < 6; s++)
            assert_true(rate_of(rate, s, no2, k) <= rate_of(rate, s - 1, no2, k));
        for (int s = 0; s < 5; s++)
            assert_true(rate_of(rate, s, no2, k) > 0);
        assert_true(rate_of(rate, 5, no2, k) == 0);
    }
    /* Behind the shadow's edge (32 km at -0.1) light falls by orders of magnitude, in the sun it is nearly
     * whole. */
    assert_true(rate_of(rate, 3, no2, 20) < 1e-3 * rate_of(rate, 3, no2, 75));
    assert_true(rate_of(rate, 3, no2, 75) > 0.5 * rate_of(rate, 0, no2, 75));
    for (size_t i = 0; i < 6 * (size_t)world.reactions * (size_t)world.grid.padded; i++)
        assert_true(isfinite(rate[i]) && rate[i] >= 0);
    free(rate);
}

static void test_photolysis_linear_and_same(void **state)
{
    (void)state;
    const double cosine[3] = {0.9, 0.35, -0.03};
    size_t set = (size_t)world.reactions * (size_t)world.grid.padded;
    double *three = world_rates(cosine, 3, 0.2);
    for (int s = 0; s < 3; s++) { /* a sun alone: the same bits */
        double *one = world_rates(&cosine[s], 1, 0.2);
        assert_memory_equal(one, three + (size_t)s * set, set * sizeof *one);
        free(one);
    }
    Photolysis *photolysis = make_photolysis(cosine, 3, 0.2);
    double *rate = malloc(3 * set * sizeof *rate);
    photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1.034, rate);
    for (size_t i = 0; i < 3 * set; i++)
        if (fabs(rate[i] - 1.034 * three[i]) > 1e-12 * rate[i])
            fail_msg("rate %zu: %g, want %g", i, rate[i], 1.034 * three[i]);
    /* other air and back again: nothing lingers */
    double thin[LAYERS];
    for (int k = 0; k < LAYERS; k++)
        thin[k] = 0.5 * world.air.number_density[k];
    photolysis_set_air(photolysis, world.air.temperature, thin, world.grid.depth,
                       0.5 * world.air.column_above_top);
    photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1, rate);
    assert_true(rate_of(rate, 0, reaction("J-O2"), 20) > 1.5 * rate_of(three, 0, reaction("J-O2"), 20));
    photolysis_set_air(photolysis, world.air.temperature, world.air.number_density, world.grid.depth,
                       world.air.column_above_top);
    photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1, rate);
    assert_memory_equal(rate, three, 3 * set * sizeof *rate);
    /* flux and irradiance handed out belong to the call: J(Cl2) by hand at its warmest table, within its T
     * range */
    const double *flux = photolysis_actinic(photolysis), *ground = photolysis_ground(photolysis);
    int stride = photolysis_stride(photolysis), bins = world.spectra->bins;
    assert_true(stride >= bins && stride % PACK == 0);
    const Spectrum *bromine = find("Br2", 1);
    for (int k = 0; k < LAYERS; k += 13) {
        double sum = 0;
        for (int b = 0; b < bins; b++)
            sum += bromine->sigma[b] * flux[k * stride + b];
        check_near(rate_of(three, 0, reaction("J-Br2"), k), sum, 1e-12);
    }
    for (int b = 0; b < bins; b++)
        assert_true(ground[b] >= 0 &&
                    ground[b] <= 0.9 * 1.4); /* mu0, and what an albedo of 0.2 sends to and fro */
    photolysis_free(photolysis);
    free(rate);
    free(three);
}

/* Quenching: J(CH2O -> H2 + CO) of 1 / (1 / phi + sv M) by hand at the ground, 288 K (one temperature in the
 * table). */
static void test_photolysis_stern_volmer(void **state)
{
    (void)state;
    const double overhead = 1;
    Photolysis *photolysis = make_photolysis(&overhead, 1, 0.1);
    double *rate = malloc((size_t)world.reactions * (size_t)world.grid.padded * sizeof *rate);
    photolysis_rates(photolysis, world.ozone, NULL, NULL, 1, rate);
    const double *flux = photolysis_actinic(photolysis);
    const Spectrum *sigma = find("CH2O", 1), *phi = find("CH2O-H2", 0);
    double sum = 0, free_sum = 0, m = world.air.number_density[0];
    assert_non_null(phi->stern_volmer);
    for (int b = 0; b < world.spectra->bins; b++) {
        free_sum += sigma->sigma[b] * phi->sigma[b] * flux[b];
        if (phi->sigma[b] > 0)
            sum += sigma->sigma[b] * flux[b] / (1 / phi->sigma[b] + phi->stern_volmer[b] * m);
    }
    check_near(rate_of(rate, 0, reaction("J-CH2O-H2"), 0), sum, 1e-12);
    assert_true(sum < 0.9 * free_sum);
    for (int r = 0; r < world.reactions; r++) /* padding repeats the top layer */
        for (int k = LAYERS; k < world.grid.padded; k++)
            assert_true(rate_of(rate, 0, r, k) == rate_of(rate, 0, r, LAYERS - 1));
    free(rate);
    photolysis_free(photolysis);
}

/* Temperature dependence by hand from the flux of the call: log sigma linear in T between the tables (N2O5 at
 * 0.5 and 25.5 km), held beyond them (CFC-11 at 199 K, whose table begins at 210 K); yield linear (O3 at 25.5
 * km). */
static void test_photolysis_temperature(void **state)
{
    (void)state;
    const double overhead = 0.8;
    Photolysis *photolysis = make_photolysis(&overhead, 1, 0.1);
    double *rate = malloc((size_t)world.reactions * (size_t)world.grid.padded * sizeof *rate);
    assert_non_null(rate);
    photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1, rate);
    size_t stride = (size_t)photolysis_stride(photolysis), bins = (size_t)world.spectra->bins;
    const Spectrum *n2o5 = find("N2O5", 1), *cfc = find("CFC-11", 1), *o3 = find("O3", 1);
    const Spectrum *yield = find("O3-O1D", 0);
    static const int layer[2] = {0, 25};
    for (int i = 0; i < 2; i++) {
        const double *flux = photolysis_actinic(photolysis) + (size_t)layer[i] * stride;
        double kelvin = world.air.temperature[layer[i]], want = 0;
        assert_true(n2o5->temperature[i ? 0 : 2] <= 275 && n2o5->temperatures == 4);
        int t = i ? 0 : 2; /* 225..250 K holds none of 222 K: below the table, held */
        double f = (kelvin - n2o5->temperature[t]) / (n2o5->temperature[t + 1] - n2o5->temperature[t]);
        f = fmax(f, 0);
        for (size_t b = 0; b < bins; b++)
            if (n2o5->sigma[b] > 0)
                want += flux[b] * pow(n2o5->sigma[(size_t)t * bins + b], 1 - f) *
                        pow(n2o5->sigma[(size_t)(t + 1) * bins + b], f);
        check_near(rate_of(rate, 0, reaction("J-N2O5"), layer[i]), want, 1e-10);
    }
    const double *flux = photolysis_actinic(photolysis) + 79 * stride;
    double held = 0;
    assert_true(cfc->temperature[0] == 210 && world.air.temperature[79] < 205);
    for (size_t b = 0; b < bins; b++)
        held += flux[b] * cfc->sigma[b];
    check_near(rate_of(rate, 0, reaction("J-CFC-11"), 79), held, 1e-12);
    flux = photolysis_actinic(photolysis) + 25 * stride;
    double kelvin = world.air.temperature[25], excited = 0, f = (kelvin - 220) / 20, g = (kelvin - 218) / 25;
    assert_true(yield->temperature[2] == 220 && yield->temperature[3] == 240 && kelvin > 220 && kelvin < 240);
    assert_true(o3->temperature[0] == 218 && o3->temperature[1] == 243);
    for (size_t b = 0; b < bins; b++)
        excited += flux[b] * pow(o3->sigma[b], 1 - g) * pow(o3->sigma[bins + b], g) *
                   ((1 - f) * yield->sigma[2 * bins + b] + f * yield->sigma[3 * bins + b]);
    check_near(rate_of(rate, 0, reaction("J-O3-O1D"), 25), excited, 1e-10);
    free(rate);
    photolysis_free(photolysis);
}

/* A grid that ends at 40 km sees the light of the whole one, when what it leaves out has the mole fraction of
 * its top: ozone, NO2 and NO at constant mole fractions. What differs is the spreading above the top and
 * light scattered there. */
static void test_photolysis_above_top(void **state)
{
    (void)state;
    enum { CUT = 40 };
    const double cosine[2] = {0.9, 0.2};
    double mixed[3][LAYERS + PACK], above = world.air.column_above_top, error = 0;
    for (int k = 0; k < world.grid.padded; k++) {
        mixed[0][k] = 4e-6 * world.air.number_density[k];
        mixed[1][k] = 1e-9 * world.air.number_density[k];
        mixed[2][k] = 1e-8 * world.air.number_density[k];
    }
    for (int k = CUT; k < LAYERS; k++)
        above += world.air.number_density[k] * world.grid.depth[k];
    Photolysis *whole = make_photolysis(cosine, 2, 0.1), *cut;
    Fault fault = {0};
    assert_int_equal(photolysis_make(&cut, world.mechanism, world.spectra, CUT, CUT, world.edge_km,
                                     world.air.temperature, world.air.number_density, world.grid.depth, above,
                                     cosine, 2, 0.1, &fault),
                     0);
    double *a = malloc(2 * (size_t)world.reactions * (size_t)world.grid.padded * sizeof *a);
    double *b = malloc(2 * (size_t)world.reactions * CUT * sizeof *b);
    assert_true(a && b);
    photolysis_rates(whole, mixed[0], mixed[1], mixed[2], 1, a);
    photolysis_rates(cut, mixed[0], mixed[1], mixed[2], 1, b);
    static const char *const id[] = {"J-O3-O1D", "J-NO2", "J-NO", "J-O2", "J-N2O", "J-CFC-11"};
    for (int i = 0; i < 6; i++)
        for (int s = 0; s < (i < 3 ? 2 : 1); s++)
            for (int k = 25; k < 38; k++)
                error = worst(error, b[(s * world.reactions + reaction(id[i])) * CUT + k],
                              rate_of(a, s, reaction(id[i]), k));
    print_message("           rates under a top of 40 km within %.2g of those under 80 km\n", error);
    assert_true(error < 0.02);
    free(a);
    free(b);
    photolysis_free(whole);
    photolysis_free(cut);
}

static void test_photolysis_faults(void **state)
{
    (void)state;
    Photolysis *made;
    const double cosine = 0.5, far = 1.2;
    Fault a = {0}, b = {0};
    assert_int_equal(photolysis_make(&made, world.mechanism, world.spectra, LAYERS, world.grid.padded,
                                     world.edge_km, world.air.temperature, world.air.number_density,
                                     world.grid.depth, world.air.column_above_top, &cosine, 1, 1.5, &a),
                     FAULT_INPUT);
    check_fault(&a, "albedo", "1.5", NULL);
    assert_null(made);
    assert_int_equal(photolysis_make(&made, world.mechanism, world.spectra, LAYERS, world.grid.padded,
                                     world.edge_km, world.air.temperature, world.air.number_density,
                                     world.grid.depth, world.air.column_above_top, &far, 1, 0.1, &b),
                     FAULT_INPUT);
    check_fault(&b, "cosine", "1.2", NULL);
    assert_null(made);
}

/* How long one call takes: printed, not judged. */
static void test_photolysis_time(void **state)
{
    (void)state;
    double x[MOST_SUNS], w[MOST_SUNS], best = HUGE_VAL;
    gauss(MOST_SUNS, x, w);
    Photolysis *photolysis = make_photolysis(x, MOST_SUNS, 0.1);
    double *rate = malloc(MOST_SUNS * (size_t)world.reactions * (size_t)world.grid.padded * sizeof *rate);
    for (int i = 0; i < 5; i++) {
        struct timespec from, to;
        clock_gettime(CLOCK_MONOTONIC, &from);
        photolysis_rates(photolysis, world.ozone, world.dioxide, world.nitric_oxide, 1, rate);
        clock_gettime(CLOCK_MONOTONIC, &to);
        best =
            fmin(best, 1e3 * (double)(to.tv_sec - from.tv_sec) + 1e-6 * (double)(to.tv_nsec - from.tv_nsec));
    }
    print_message("           %d layers, %d suns, %d bins, %d reactions: %.1f ms\n", LAYERS, MOST_SUNS,
                  world.spectra->bins, world.reactions, best);
    assert_true(rate_of(rate, 0, reaction("J-NO2"), 0) > 0);
    free(rate);
    photolysis_free(photolysis);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_photolysis_direct),          cmocka_unit_test(test_photolysis_nitric_oxide),
        cmocka_unit_test(test_photolysis_global_mean),     cmocka_unit_test(test_photolysis_twilight),
        cmocka_unit_test(test_photolysis_linear_and_same), cmocka_unit_test(test_photolysis_stern_volmer),
        cmocka_unit_test(test_photolysis_temperature),     cmocka_unit_test(test_photolysis_above_top),
        cmocka_unit_test(test_photolysis_faults),          cmocka_unit_test(test_photolysis_time),
    };
    return cmocka_run_group_tests(tests, make_world, free_world);
}
