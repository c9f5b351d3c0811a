/* Tests of transport/: grid, air and the table of eddy diffusion, each against figures or solutions from
 * outside it. */
#define _POSIX_C_SOURCE 200809L /* mkstemp, fdopen */
#include "transport_room.h"

/* ---- grid ---- */

static void test_grid_shapes(void **state)
{
    (void)state;
    Fault fault = {0};
    Grid grid;
    assert_int_equal(grid_make(&grid, 80.0, 1.6, NULL, 0, &fault), 0);
    assert_int_equal(grid.layers, 50);
    assert_int_equal(grid.padded, PACK_ROUND(50));
    assert_true(grid.edge[0] == 0.0 && grid.edge[50] == 80.0 * KM);
    check_near("middle of layer 3", grid.middle[3], 5.6 * KM, 1e-8);
    assert_true(grid.middle[55] == grid.middle[49] && grid.depth[50] == grid.depth[49]);
    grid_free(&grid);
    grid_free(&grid); /* a zeroed grid is accepted */

    double edge[] = {0.0, 0.5, 1.75, 4.0, 9.5};
    assert_int_equal(grid_make(&grid, NAN, NAN, edge, 5, &fault), 0);
    assert_int_equal(grid.layers, 4);
    check_near("own middle", grid.middle[2], 2.875 * KM, 1e-8);
    check_near("own depth", grid.depth[3], 5.5 * KM, 1e-8);
    grid_free(&grid);
}

static void test_grid_faults(void **state)
{
    (void)state;
    static const struct {
        double top, spacing;
    } bad[] = {{80.0, 0.7}, {3.0, 1.0},  {80.0, 0.01},    {-80.0, 1.0}, {80.0, 0.0},
               {NAN, 1.0},  {80.0, NAN}, {INFINITY, 1.0}, {80.0, -2.0}, {1e300, 1e-300}};
    for (size_t b = 0; b < sizeof bad / sizeof bad[0]; b++) {
        Fault fault = {0};
        Grid grid;
        assert_int_equal(grid_make(&grid, bad[b].top, bad[b].spacing, NULL, 0, &fault), FAULT_INPUT);
        assert_null(grid.edge);
        assert_non_null(strstr(fault.text, "grid"));
    }
    static const double own[][6] = {{0, 1, 2, 2, 4, 5},
                                    {0.1, 1, 2, 3, 4, 5},
                                    {0, 1, 2, NAN, 4, 5},
                                    {0, 1, 2, 3, 2, 5},
                                    {0, 1, 2, 3, 4, INFINITY}};
    for (size_t b = 0; b < sizeof own / sizeof own[0]; b++) {
        Fault fault = {0};
        Grid grid;
        assert_int_equal(grid_make(&grid, 5.0, 1.0, own[b], 6, &fault), FAULT_INPUT);
    }
    Fault few = {0};
    Grid grid;
    assert_int_equal(grid_make(&grid, 0, 0, own[0], 3, &few), FAULT_INPUT);
}

/* ---- air ---- */

static void test_standard_published(void **state)
{
    (void)state;
    /* U.S. Standard Atmosphere 1976, main tables (published, values from memory): geometric
     * altitude km, K, Pa, and half a unit of the temperature's last printed digit (with room for
     * the printed figures at 10 to 80 km having been rounded once more). */
    static const double row[][4] = {
        {0, 288.15, 101325, 2e-3},   {10, 223.252, 26499.9, 2e-3}, {20, 216.65, 5529.3, 2e-3},
        {30, 226.509, 1197.0, 2e-3}, {40, 250.35, 287.14, 2e-3},   {50, 270.65, 79.779, 2e-3},
        {60, 247.021, 21.958, 2e-3}, {70, 219.585, 5.2209, 2e-3},  {80, 198.639, 1.0524, 2e-3},
        {86, 186.87, 0.37338, 5e-3},
    };
    for (size_t r = 0; r < sizeof row / sizeof row[0]; r++) {
        double kelvin, pascal;
        air_standard_at(row[r][0], &kelvin, &pascal);
        check_near("temperature, K", kelvin, row[r][1], row[r][3]);
        check_near("pressure, Pa", pascal, row[r][2], 1e-4 * row[r][2]);
    }
    double kelvin, pascal;
    air_standard_at(86.1, &kelvin, &pascal);
    assert_true(isnan(kelvin) && isnan(pascal));
    air_standard_at(-0.1, &kelvin, &pascal);
    assert_true(isnan(kelvin) && isnan(pascal));
}

static void test_standard_hydrostatic(void **state)
{
    (void)state;
    /* dp/dz = -M g(z) p / (R T_M) by central differences over 1 m, so short that no kink of T falls
     * inside; below 80 km T is T_M. */
    for (double z = 0.5; z < 79.5; z += 0.37) {
        double t, p, unused, over, under, h = 1e-3;
        air_standard_at(z, &t, &p);
        air_standard_at(z + h, &unused, &over);
        air_standard_at(z - h, &unused, &under);
        double slope = log(over / under) / (2e3 * h);
        double gravity = 9.80665 * pow(6356.766 / (6356.766 + z), 2.0);
        check_near("d ln p / dz over balance", slope / (-28.9644 * gravity / (8314.32 * t)), 1.0, 1e-8);
    }
    /* The weight of the standard atmosphere's air: the whole column carries the ground pressure.
     * With g falling by 2.6 % to 80 km the column is p0 / (m g0) and a little more. */
    Fault fault = {0};
    Grid grid;
    Air air;
    assert_int_equal(grid_make(&grid, 80.0, 0.25, NULL, 0, &fault), 0);
    assert_int_equal(air_standard(&air, &grid, &fault), 0);
    double weight = 0.0, molecule = 28.9644e-3 / AVOGADRO;
    for (int i = 0; i < grid.layers; i++) {
        double gravity = 9.80665 * pow(6356.766 / (6356.766 + grid.middle[i] / KM), 2.0);
        weight += 1e4 * molecule * gravity * air.number_density[i] * grid.depth[i];
        check_near("ideal gas", air.number_density[i] * 1e6 * BOLTZMANN * air.temperature[i], air.pressure[i],
                   1e-12 * air.pressure[i]);
    }
    weight += 1e4 * molecule * 9.80665 * pow(6356.766 / 6436.766, 2.0) * air.column_above_top;
    double top_kelvin, top_pascal;
    air_standard_at(80.0, &top_kelvin, &top_pascal);
    double top_gravity = 9.80665 * pow(6356.766 / 6436.766, 2.0);
    check_near("weight above the top", 1e4 * molecule * top_gravity * air.column_above_top, top_pascal,
               1e-4 * top_pascal);
    check_near("weight of the column, Pa", weight, 101325.0, 1e-4 * 101325.0);
    /* Loschmidt-like figure of the standard: 2.5470e25 m-3 at the ground (published, from memory).
     */
    check_near("density at the ground", air.edge_density[0], 2.5470e19, 1e-4 * 2.547e19);
    assert_true(air.edge_temperature[0] == 288.15 && strstr(air.source, "1976"));
    air_free(&air);
    grid_free(&grid);

    assert_int_equal(grid_make(&grid, 88.0, 2.0, NULL, 0, &fault), 0);
    assert_int_equal(air_standard(&air, &grid, &fault), FAULT_INPUT);
    assert_null(air.temperature);
    grid_free(&grid);
}

/* Write a file in the test's own temporary folder; returns its path (static). */
static const char *write_file(const char *text)
{
    static char path[256];
    const char *folder = getenv("TMPDIR");
    snprintf(path, sizeof path, "%s/skymend-transport-XXXXXX", folder ? folder : "/tmp");
    int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    FILE *file = fdopen(descriptor, "w");
    assert_non_null(file);
    fputs(text, file);
    assert_int_equal(fclose(file), 0);
    return path;
}

static void test_air_file(void **state)
{
    (void)state;
    Fault fault = {0};
    Grid grid;
    Air air;
    assert_int_equal(grid_make(&grid, 20.0, 2.5, NULL, 0, &fault), 0);
    /* Straight lines in T and log p over unequal rows: the closed form holds at every layer. */
    char text[512];
    snprintf(text, sizeof text,
             "# source: a made-up sounding\naltitude_km,temperature_K,pressure_Pa\n0,290.25,%.17g\n"
             "7.7,%.17g,%.17g\n21,%.17g,%.17g\n",
             99000.0, 290.25 - 4.5 * 7.7, 99000.0 * exp(-7.7 / 7.3), 290.25 - 4.5 * 21.0,
             99000.0 * exp(-21.0 / 7.3));
    const char *path = write_file(text);
    if (air_from_file(&air, &grid, path, &fault))
        fail_msg("%s", fault.text);
    remove(path);
    assert_string_equal(air.source, "a made-up sounding");
    for (int i = 0; i < grid.layers; i++) {
        double z = grid.middle[i] / KM, p = 99000.0 * exp(-z / 7.3);
        check_near("own T", air.temperature[i], 290.25 - 4.5 * z, 1e-11);
        check_near("own p", air.pressure[i], p, 1e-13 * p);
        check_near("own n", air.number_density[i], 1e-6 * p / (BOLTZMANN * air.temperature[i]),
                   1e-12 * air.number_density[i]);
    }
    check_near("own top T", air.edge_temperature[8], 290.25 - 90.0, 1e-11);
    air_free(&air);

    static const struct {
        const char *rows, *word;
    } bad[] = {
        {"altitude_km,temperature_K,pressure_Pa\n0,290,1e5\n19,220,6000\n", "cover"},
        {"altitude_km,temperature_K,pressure_Pa\n1,290,1e5\n25,220,6000\n", "cover"},
        {"altitude_km,temperature_K,pressure_Pa\n0,290,1e5\n9,220,2e4\n25,220,2e4\n", "fall"},
        {"altitude_km,temperature_K,pressure_Pa\n0,290,1013\n25,220,25\n", "hPa"},
        {"altitude_km,temperature_K,pressure_Pa\n0,15,1e5\n25,-50,3000\n", "temperature_K"},
        {"altitude_km,temperature_K\n0,290\n25,220\n", "pressure_Pa"},
        {"altitude_km,temperature_K,pressure_Pa\n0,290,1e5\n30,240,1e3\n25,220,3e3\n", "altitude_km"},
    };
    for (size_t b = 0; b < sizeof bad / sizeof bad[0]; b++) {
        Fault each = {0};
        path = write_file(bad[b].rows);
        assert_int_equal(air_from_file(&air, &grid, path, &each), FAULT_INPUT);
        remove(path);
        if (!strstr(each.text, bad[b].word))
            fail_msg("%s: no '%s'", each.text, bad[b].word);
        assert_null(air.temperature);
    }
    grid_free(&grid);
}

/* ---- eddy table ---- */

static void test_eddy_file(void **state)
{
    (void)state;
    Fault fault = {0};
    Grid grid;
    double eddy[11], expected;
    char source[64];
    assert_int_equal(grid_make(&grid, 20.0, 2.0, NULL, 0, &fault), 0);
    /* log K is linear in altitude with one kink at 7 km: closed form on both sides. */
    char text[256];
    snprintf(text, sizeof text, "altitude_km,eddy_cm2_s-1\n2,2e5\n7,%.17g\n18,%.17g\n", 2e5 * exp(-5.0 / 2.1),
             2e5 * exp(-5.0 / 2.1) * exp(11.0 / 6.3));
    const char *path = write_file(text);
    if (diffusion_read_eddy(eddy, &grid, path, source, sizeof source, &fault))
        fail_msg("%s", fault.text);
    assert_int_equal(strncmp(source, path, sizeof source - 1), 0);
    remove(path);
    for (int e = 1; e < 10; e++) {
        double z = 2.0 * e;
        expected = z < 7.0 ? 2e5 * exp(-(z - 2.0) / 2.1) : 2e5 * exp(-5.0 / 2.1) * exp((z - 7.0) / 6.3);
        check_near("K", eddy[e], expected, 1e-13 * expected);
    }
    assert_true(eddy[0] == 0.0 && eddy[10] == 0.0);

    static const char *const bad[] = {
        "altitude_km,eddy_cm2_s-1\n2.5,2e5\n18,1e4\n", "altitude_km,eddy_cm2_s-1\n2,2e5\n17,1e4\n",
        "altitude_km,eddy_cm2_s-1\n2,2e5\n18,0\n", "altitude_km,eddy_m2_s-1\n2,2e5\n18,1e4\n"};
    for (size_t b = 0; b < sizeof bad / sizeof bad[0]; b++) {
        Fault each = {0};
        path = write_file(bad[b]);
        assert_int_equal(diffusion_read_eddy(eddy, &grid, path, source, sizeof source, &each), FAULT_INPUT);
        remove(path);
    }
    grid_free(&grid);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_grid_shapes),        cmocka_unit_test(test_grid_faults),
        cmocka_unit_test(test_standard_published), cmocka_unit_test(test_standard_hydrostatic),
        cmocka_unit_test(test_air_file),           cmocka_unit_test(test_eddy_file),
    };
    return cmocka_run_group_tests_name("air", tests, NULL, NULL);
}
