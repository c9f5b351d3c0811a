/* Tests of spectra and oxygen against published figures and sums by hand; faults of their tables. */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "sunlight_world.h"

#include "../chem/oxygen.h"
#include "../input/table.h"

/* ---- spectra ---- */

/* E490 as Debian's python3-pyspectral ships it. The bins must hold the same energy as its own steps, and its
 * whole must be the solar constant of the standard, 1366.1 W m-2 (ASTM E490-00a). */
static void test_solar_total(void **state)
{
    (void)state;
    static double x[3000], y[3000];
    double sum = 0, total = 0, part = 0;
    for (int k = 0; k < world.spectra->bins; k++)
        sum += world.spectra->irradiance[k];
    double low = world.spectra->lower[0], high = world.spectra->upper[world.spectra->bins - 1];
    FILE *in = fopen("/usr/lib/python3/dist-packages/pyspectral/data/e490_00a.dat", "r");
    if (!in) {
        print_message("           python3-pyspectral is not installed: E490 not compared\n");
        skip();
    }
    char line[200];
    int count = 0;
    while (fgets(line, sizeof line, in) && count < 3000)
        if (sscanf(line, "%lf %lf", &x[count], &y[count]) == 2)
            count++;
    fclose(in);
    for (int i = 0; i < count; i++) {
        double left = i > 0 ? 0.5 * (x[i - 1] + x[i]) : 1.5 * x[0] - 0.5 * x[1];
        double right = i + 1 < count ? 0.5 * (x[i] + x[i + 1]) : x[i];
        total += (right - left) * y[i];
        part += fmax(fmin(right, high * 1e-3) - fmax(left, low * 1e-3), 0) * y[i];
    }
    print_message("           E490 holds %.2f W m-2, %.3f of it from %g to %g nm; bins %.3f\n", total, part,
                  low, high, sum);
    check_near(total, 1366.1, 1e-4);
    check_near(sum, part, 1e-9);
}

/* Photons of a bin from its irradiance: between those of its two edges. */
static void test_solar_photons(void **state)
{
    (void)state;
    for (int k = 0; k < world.spectra->bins; k++) {
        double joule = PLANCK * LIGHT_SPEED / 1e-9 * 1e4, photons = world.spectra->flux[k] * joule;
        assert_true(photons >= world.spectra->lower[k] * world.spectra->irradiance[k]);
        assert_true(photons <= world.spectra->upper[k] * world.spectra->irradiance[k]);
    }
}

/* Johnston et al. 1996 (J. Phys. Chem. 100, 4713): NO3 under the sun outside the atmosphere, 298 K: 0.156 and
 * 0.020 s-1 (as the headers of the yield tables give them). The typed yield of NO + O2 misses its figure by a
 * quarter before any bins: 0.0152 s-1 from the tables in steps of 0.01 nm; the header of NO3-NO says where.
 */
static void test_published_nitrate(void **state)
{
    (void)state;
    const Spectrum *sigma = find("NO3", 1), *dioxide = find("NO3-NO2", 0), *oxide = find("NO3-NO", 0);
    size_t bins = (size_t)world.spectra->bins, warm = 2 * bins;
    assert_true(dioxide->temperatures == 3 && dioxide->temperature[2] == 298);
    double a = 0, b = 0;
    for (size_t k = 0; k < bins; k++) {
        a += sigma->sigma[k] * dioxide->sigma[warm + k] * world.spectra->flux[k];
        b += sigma->sigma[k] * oxide->sigma[warm + k] * world.spectra->flux[k];
    }
    print_message("           J(NO3) at 1 au: %.3f and %.4f s-1\n", a, b);
    check_near(a, 0.156, 0.1);
    check_near(b, 0.020, 0.3);
    check_near(b, 0.0152, 0.03);
}

/* Tables put on bins by hand-made midpoint sums of 0.001 nm. */
static void test_bin_means(void **state)
{
    (void)state;
    static const struct {
        const char *name;
        int log, step;
    } tables[] = {{"O3", 1, 0}, {"NO2", 1, 0}, {"BrO", 0, 1}, {"CH2O", 0, 0}};
    Table sun, table;
    Fault fault = {0};
    char path[300];
    in_data(path, "solar-irradiance.csv");
    assert_int_equal(table_read(&sun, path, &fault), 0);
    for (size_t t = 0; t < 4; t++) {
        char file[60];
        snprintf(file, sizeof file, "xs/%s.csv", tables[t].name);
        in_data(path, file);
        assert_int_equal(table_read(&table, path, &fault), 0);
        const double *x = table.value, *y = table.value + table.rows;
        const Spectrum *spectrum = find(tables[t].name, 1);
        for (int k = 24; k < world.spectra->bins; k += 7) {
            double low = world.spectra->lower[k], high = world.spectra->upper[k], up = 0, down = 0;
            int count = (int)((high - low) * 1000);
            for (int i = 0; i < count; i++) {
                double w = low + (high - low) * (i + 0.5) / count, e = 0, value = 0;
                for (size_t r = 0; r < sun.rows; r++) { /* nearest row of the solar table */
                    double left = r > 0 ? 0.5 * (sun.value[r - 1] + sun.value[r]) : 0;
                    if (w >= left)
                        e = sun.value[sun.rows + r];
                    else
                        break;
                }
                for (size_t r = 0; r + 1 < table.rows; r++)
                    if (w >= x[r] && w < x[r + 1]) {
                        double f = (w - x[r]) / (x[r + 1] - x[r]);
                        value = tables[t].step  ? y[r]
                                : tables[t].log ? exp((1 - f) * log(y[r]) + f * log(y[r + 1]))
                                                : (1 - f) * y[r] + f * y[r + 1];
                    }
                up += e * w * value;
                down += e * w;
            }
            if (fabs(spectrum->sigma[k] * down - up) > 5e-4 * up + 1e-30 * down)
                fail_msg("%s, %g to %g nm: %g, want %g", tables[t].name, low, high, spectrum->sigma[k],
                         up / down);
        }
        table_free(&table);
    }
    table_free(&sun);
}

/* A logarithmic line cannot reach zero and is read as a straight one where it meets it, which no shipped
 * cross section asks for; the zero that closes a table of steps is never read: BrO keeps its last mean to 375
 * nm. */
static void test_zeros_of_tables(void **state)
{
    (void)state;
    const Spectra *s = world.spectra;
    int closed = 0;
    for (int i = 0; i < s->spectra; i++) {
        char path[300], file[80], word[20];
        snprintf(file, sizeof file, "xs/%s.csv", s->spectrum[i].name);
        if (!s->spectrum[i].logarithmic)
            continue;
        Table table;
        Fault fault = {0};
        in_data(path, file);
        assert_int_equal(table_read(&table, path, &fault), 0);
        assert_true(table_header(&table, "interpolation", word, sizeof word));
        int step = !strcmp(word, "step");
        for (size_t c = 1; c < table.columns; c++) {
            for (size_t r = 0; r + (step ? 1 : 0) < table.rows; r++)
                if (!(table_values(&table, c)[r] > 0) && strcmp(word, "linear") != 0)
                    fail_msg("%s: zero in row %zu", file, r);
            closed += step && table_values(&table, c)[table.rows - 1] == 0;
        }
        table_free(&table);
    }
    assert_int_equal(closed, 3); /* BrO, ClO, OClO */
    const double *bromine = find("BrO", 1)->sigma;
    int last = 0;
    for (int k = 0; k < s->bins; k++) {
        if (s->lower[k] >= 375)
            assert_true(bromine[k] == 0);
        if (s->lower[k] >= 370 && s->upper[k] <= 375) {
            check_near(bromine[k], 5.1e-19, 1e-12);
            last++;
        }
    }
    assert_true(last > 0);
}

static void test_oxygen_yields(void **state)
{
    (void)state;
    const Spectra *s = world.spectra;
    const double *excited = s->spectrum[s->reaction_yield[reaction("J-O2-O1D")]].sigma;
    const double *ground = s->spectrum[s->reaction_yield[reaction("J-O2")]].sigma;
    for (int k = 0; k < s->bins; k++) {
        double all = excited[k] + ground[k];
        if (k == s->lyman_alpha)
            assert_true(excited[k] == 0.53 && all == 1);
        else if (s->upper[k] <= 175)
            assert_true(fabs(excited[k] - 1) < 1e-12);
        else if (s->lower[k] >= 175 && s->upper[k] <= 242)
            assert_true(excited[k] == 0 && fabs(all - 1) < 1e-12);
        else if (s->lower[k] >= 242.4)
            assert_true(all == 0);
        else
            assert_true(all > 0 && all <= 1 + 1e-12); /* the two bins that hold a threshold */
    }
    assert_int_equal(s->bands, 16);
    check_near(s->lower[s->lyman_alpha], 121, 1e-12);
}

/* R_M is a transmission (1 at the top, falling), its slope the extinction, and the cross section stays
 * bounded where no light is left, at any column up to infinity. */
static void test_oxygen_sums(void **state)
{
    (void)state;
    const Spectra *s = world.spectra;
    int seen = 0;
    for (int k = 0; k < s->bins; k++) {
        if (!oxygen_parametrised(s, k))
            continue;
        seen++;
        check_near(oxygen_transmission(s, k, 0), 1, 0.012);
        double before = 2, first = oxygen_cross_section(s, k, 0);
        for (double column = 1e16; column < 1e27; column *= 3) {
            double passed = oxygen_transmission(s, k, column), sigma = oxygen_cross_section(s, k, column);
            assert_true(passed <= before && passed >= 0);
            assert_true(sigma > 0 && sigma <= first * 1.05);
            before = passed;
            if (passed > 1e-15 && column < 1e24) {
                double h = column * 1e-4, slope = log(oxygen_transmission(s, k, column - h) /
                                                      oxygen_transmission(s, k, column + h));
                check_near(oxygen_extinction(s, k, column), slope / (2 * h), 1e-4);
            }
        }
        assert_true(oxygen_transmission(s, k, HUGE_VAL) == 0);
        assert_true(oxygen_cross_section(s, k, HUGE_VAL) == oxygen_cross_section(s, k, 1e25));
        assert_true(oxygen_extinction(s, k, HUGE_VAL) > 0);
    }
    assert_int_equal(seen, 17);
}

/* Quenching of NO by hand: half of the excited NO is quenched where [N2] = (1.65e9 + 5.1e7) / 1.5e-9; without
 * any O2 or NO overhead the cross section is the sum of weights times cross sections, and a thick column
 * leaves nothing. */
static void test_nitric_oxide_parts(void **state)
{
    (void)state;
    const NitricOxideInterval *first = &world.spectra->nitric_oxide->interval[0];
    double passed[OXYGEN_TERMS], sum = 0;
    check_near(nitric_oxide_efficiency(first, 0), 1.65e9 / 1.701e9, 1e-12);
    check_near(nitric_oxide_efficiency(first, 1.701e9 / 1.5e-9), 0.5 * 1.65e9 / 1.701e9, 1e-12);
    check_near(nitric_oxide_efficiency(first + 1, 1e19), 1, 1e-12); /* delta(1-0) is not quenched */
    for (int i = 0; i < OXYGEN_TERMS; i++)
        sum += first->weight[i][0] * first->sigma[i][0] + first->weight[i][1] * first->sigma[i][1];
    nitric_oxide_opacity(first, 0, passed);
    check_near(nitric_oxide_cross_section(first, passed, 0), sum, 1e-14);
    nitric_oxide_opacity(first, HUGE_VAL, passed);
    assert_true(nitric_oxide_cross_section(first, passed, 0) == 0);
    /* photons cm-2 s-1 nm-1 of Minschwaner and Siskind 1993 (as the table's header gives them), of another
     * sun */
    static const double flux[3] = {3.98e11, 2.21e11, 2.30e11};
    for (int i = 0; i < 3; i++)
        check_near(first[i].flux / (first[i].upper - first[i].lower), flux[i], 0.2);
}

/* ---- faults of the tables ---- */

/* A copy of the data in the test's folder, to be spoilt. */
static void copy_data(void **state)
{
    char command[700], from[300];
    snprintf(from, sizeof from, "%s", data_dir());
    snprintf(command, sizeof command, "cp -r '%s/.' '%s'", from, (char *)*state);
    assert_int_equal(system(command), 0);
}

static void expect_fault(void **state, const char *first, const char *second)
{
    char bins[300], sun[300];
    Spectra *read;
    Fault fault = {0};
    snprintf(bins, sizeof bins, "%s/wavelength-bins.csv", (char *)*state);
    snprintf(sun, sizeof sun, "%s/solar-irradiance.csv", (char *)*state);
    assert_int_equal(spectra_read(&read, world.mechanism, *state, bins, sun, &fault), FAULT_INPUT);
    assert_null(read);
    check_fault(&fault, first, second, NULL);
}

static void spoil(void **state, const char *file, const char *text)
{
    char path[300];
    write_file(state, file, text, path);
}

static void test_faults_of_tables(void **state)
{
    char path[300];
    copy_data(state);
    const char *broken = "# interpolation: log\nwavelength_nm,sigma_298K\n200,1e-20\n200,1e-21\n";
    spoil(state, "xs/HCl.csv", broken);
    expect_fault(state, "xs/HCl.csv:4", "wavelength_nm");
    spoil(state, "xs/HCl.csv", "# interpolation: cubic\nwavelength_nm,sigma_298K\n200,1e-20\n210,1e-21\n");
    expect_fault(state, "cubic", "linear, log, step");
    spoil(state, "xs/HCl.csv", "wavelength_nm,sigma_298K\n200,1e-20\n210,1e-21\n");
    expect_fault(state, "xs/HCl.csv", "interpolation");
    spoil(state, "xs/HCl.csv", "# interpolation: log\nwavelength_nm,sigma_298C\n200,1e-20\n210,1e-21\n");
    expect_fault(state, "sigma_298C", "sigma_<temperature>K");
    spoil(state, "xs/HCl.csv",
          "# interpolation: log\nwavelength_nm,sigma_298K,sigma_250K\n200,1e-20,1e-20\n");
    expect_fault(state, "sigma_250K", "increase");
    spoil(state, "xs/HCl.csv", "# interpolation: log\nwavelength_nm,sigma_298K\n200,-1e-20\n210,1e-21\n");
    expect_fault(state, "xs/HCl.csv:3", "sigma_298K");
    spoil(state, "xs/HCl.csv", "# interpolation: log\nwavelength_nm,sigma_298K\n200,1e-2\n210,1e-21\n");
    expect_fault(state, "xs/HCl.csv:3", "sigma_298K");
    snprintf(path, sizeof path, "%s/xs/HCl.csv", (char *)*state);
    assert_int_equal(unlink(path), 0);
    expect_fault(state, "xs/HCl.csv", "");
}

static void test_faults_of_bins(void **state)
{
    copy_data(state);
    spoil(state, "wavelength-bins.csv", "lower_nm,upper_nm\n300,301\n302,303\n");
    expect_fault(state, "wavelength-bins.csv:3", "contiguous");
    spoil(state, "wavelength-bins.csv", "lower_nm,upper_nm\n300,301\n301,301\n");
    expect_fault(state, "wavelength-bins.csv:3", "exceed");
    spoil(state, "wavelength-bins.csv", "lower_nm,upper_nm\n120,121.5\n121.5,122\n");
    expect_fault(state, "Lyman-alpha", "121");
    spoil(state, "wavelength-bins.csv", "lower_nm,upper_nm\n175,190\n190,210\n");
    expect_fault(state, "Schumann-Runge", "175.4386");
    spoil(state, "wavelength-bins.csv", "lower_nm,upper_nm\n300,400\n400,950\n");
    expect_fault(state, "solar-irradiance.csv", "950");
}

static void test_faults_of_sun(void **state)
{
    copy_data(state);
    spoil(state, "solar-irradiance.csv",
          "# interpolation: centred\nwavelength_nm,irradiance_W_m-2_nm-1\n119,1\n118,1\n");
    expect_fault(state, "solar-irradiance.csv:4", "wavelength_nm");
    spoil(state, "solar-irradiance.csv",
          "# interpolation: centred\nwavelength_nm,irradiance_W_m-2_nm-1\n200,1\n201,1\n900,1\n");
    expect_fault(state, "covers", "120 to 850");
    spoil(state, "solar-irradiance.csv",
          "# interpolation: log\nwavelength_nm,irradiance_W_m-2_nm-1\n100,1\n900,1\n");
    expect_fault(state, "solar-irradiance.csv", "centred");
    spoil(state, "solar-irradiance.csv",
          "# interpolation: linear\nwavelength_nm,irradiance_W_m-2_nm-1\n100,0\n400,0\n900,1\n");
    expect_fault(state, "no sunlight", "120");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_solar_total),       cmocka_unit_test(test_solar_photons),
        cmocka_unit_test(test_published_nitrate), cmocka_unit_test(test_bin_means),
        cmocka_unit_test(test_zeros_of_tables),   cmocka_unit_test(test_oxygen_yields),
        cmocka_unit_test(test_oxygen_sums),       cmocka_unit_test(test_nitric_oxide_parts),
        WITH_FOLDER(test_faults_of_tables),       WITH_FOLDER(test_faults_of_bins),
        WITH_FOLDER(test_faults_of_sun),
    };
    return cmocka_run_group_tests(tests, make_world, free_world);
}
