/* Tests of the ultraviolet at the ground: the action spectrum, what enters above, absorption alone against
 * Beer's law, the day against an integration written here, published figures, and the file of a projection.
 */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "scratch.h"

#include <netcdf.h>
#include <omp.h>

#include "../chem/erythema.h"
#include "../input/constants.h"
#include "../input/table.h"
#include "../model/archive.h"
#include "../model/record.h"
#include "../model/sun.h"
#include "../model/ultraviolet.h"
#include "standard_light.h"

/* The default case in layers of 2 km, its initial profiles. Made once for the group. */
static Model *model;
static Column *column;

static void well(int code, const Fault *fault)
{
    if (code)
        fail_msg("fault %d: %s", code, fault->text);
}

static Model *make_model(void)
{
    Fault fault = {0};
    Settings *settings = malloc(sizeof *settings);
    Model *made;
    assert_non_null(settings);
    settings_default(settings, data_dir());
    settings->spacing_km = 2.0;
    well(model_make(&made, settings, &fault), &fault);
    free(settings);
    return made;
}

static int make_world(void **state)
{
    (void)state;
    Fault fault = {0};
    model = make_model();
    well(column_make(&column, model, &fault), &fault);
    return 0;
}

static int free_world(void **state)
{
    (void)state;
    column_free(column);
    model_free(model);
    return 0;
}

/* [solved][padded] the state with so much ozone, the shape of its profile kept. Owner: caller. */
static double *state_of(double dobson)
{
    size_t size = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    double *x = malloc(size * sizeof *x), scale = dobson / column_ozone_du(model, column->x);
    assert_non_null(x);
    memcpy(x, column->x, size * sizeof *x);
    double *ozone = x + FIELD(model->grid.padded, mechanism_solved(model->mechanism, "O3"), 0);
    for (int l = 0; l < model->grid.padded; l++)
        ozone[l] *= scale;
    return x;
}

/* cosine NULL: the sun of the settings. amplification may be NULL. */
static UltravioletDay look(const double *cosine, const double *x, const double *change, double *amplification)
{
    Fault fault = {0};
    Ultraviolet *ultraviolet;
    UltravioletDay day;
    well(ultraviolet_make(&ultraviolet, model, cosine, &fault), &fault);
    ultraviolet_day(ultraviolet, x, change, &day);
    if (amplification)
        *amplification = ultraviolet_amplification(ultraviolet, x, change);
    ultraviolet_free(ultraviolet);
    return day;
}

static void place(double latitude_deg, double day_of_year)
{
    model->settings.ultraviolet_latitude_deg = latitude_deg;
    model->settings.ultraviolet_day_of_year = day_of_year;
}

static const double overhead = 1.0;

/* ---- the action spectrum ---- */

/* Against the standard's three formulas by hand: 10^(0.094 x -2), 10^-2.82 from both sides of 328 nm,
 * 10^-3.9. */
static void erythema_at_its_break_points(void **state)
{
    (void)state;
    static const double known[][2] = {{249.9, 0},         {250, 1},           {298, 1},
                                      {300, 0.648634},    {328, 1.513561e-3}, {328.001, 1.513509e-3},
                                      {400, 1.258925e-4}, {400.1, 0}};
    for (size_t i = 0; i < sizeof known / sizeof known[0]; i++)
        assert_true(fabs(erythema_weight(known[i][0]) - known[i][1]) <= 1e-6 * known[i][1]);
}

/* The mean of an interval against a sum of midpoints, whose error here is below 1e-6. */
static void erythema_means_are_exact(void **state)
{
    (void)state;
    static const double interval[][2] = {{245, 255}, {297.5, 298.5}, {300, 301},
                                         {327, 330}, {395, 405},     {240, 410}};
    for (size_t i = 0; i < sizeof interval / sizeof interval[0]; i++) {
        double lower = interval[i][0], upper = interval[i][1], sum = 0;
        enum { PARTS = 34000 };
        for (int k = 0; k < PARTS; k++)
            sum += erythema_weight(lower + (upper - lower) * (k + 0.5) / PARTS) / PARTS;
        assert_true(fabs(erythema_mean(lower, upper) / sum - 1) < 1e-5);
    }
}

/* ---- above the atmosphere ---- */

static Table read_data(const char *file)
{
    char path[300];
    Fault fault = {0};
    Table table;
    snprintf(path, sizeof path, "%s/%s", data_dir(), file);
    well(table_read(&table, path, &fault), &fault);
    return table;
}

/* Irradiance of the solar table at a wavelength: steps that reach half-way to the neighbours. */
static double sunlight_at(const Table *sun, double nm)
{
    size_t r = 0;
    while (r + 1 < sun->rows && nm >= 0.5 * (sun->value[r] + sun->value[r + 1]))
        r++;
    return sun->value[sun->rows + r];
}

static double sunlight_between(const Table *sun, double lower, double upper)
{
    const double step = 0.005; /* cuts every nanometre's step alike */
    double sum = 0;
    for (int k = 0; k < (int)round((upper - lower) / step); k++)
        sum += sunlight_at(sun, lower + (k + 0.5) * step) * step;
    return sum;
}

/* ASTM E490-00a integrated here, and the integrals of tests/published-values.csv (uv-toa-*): 16.86 and 83.01
 * W m-2, given to 0.01. */
static void bands_above_are_those_of_the_solar_table(void **state)
{
    (void)state;
    Table sun = read_data("solar-irradiance.csv");
    Fault fault = {0};
    for (int limit = 315; limit <= 320; limit += 5) {
        Ultraviolet *ultraviolet;
        double band[UV_BANDS];
        model->settings.uvb_limit_nm = limit;
        well(ultraviolet_make(&ultraviolet, model, NULL, &fault), &fault);
        ultraviolet_above(ultraviolet, band);
        ultraviolet_free(ultraviolet);
        const double want[UV_BANDS] = {sunlight_between(&sun, 120, 280), sunlight_between(&sun, 280, limit),
                                       sunlight_between(&sun, limit, 400)};
        for (int b = 0; b < UV_BANDS; b++)
            assert_true(fabs(band[b] / want[b] - 1) < 1e-6);
        if (limit == 315) {
            assert_true(fabs(band[UV_B] - 16.86) <= 0.01);
            assert_true(fabs(band[UV_A] - 83.01) <= 0.01);
        }
    }
    model->settings.uvb_limit_nm = 315;
    table_free(&sun);
}

/* ---- Beer's law ---- */

/* Mean over a bin, photons counted, of one column of a cross-section table. */
static double bin_mean(const Table *sun, const Table *sigma, size_t column_index, double lower, double upper)
{
    enum { PARTS = 400 };
    double sum = 0, all = 0;
    for (int k = 0; k < PARTS; k++) {
        double w = lower + (upper - lower) * (k + 0.5) / PARTS, light = sunlight_at(sun, w) * w;
        sum +=
            light * table_loglinear(sigma->value, sigma->value + column_index * sigma->rows, sigma->rows, w);
        all += light;
    }
    return sum / all;
}

/* With air thinned by 1e-12 and ozone's mole fraction raised as much nothing scatters and ozone alone
 * absorbs: over black ground and under the sun overhead exp(-sum of sigma(T) N dz). Bin means are of 400
 * midpoints, which leaves some 1e-8 in the optical depth. */
static void absorption_alone_obeys_beer(void **state)
{
    (void)state;
    static const double kelvin[4] = {218, 243, 273, 298};
    Table sun = read_data("solar-irradiance.csv"), sigma = read_data("xs/O3.csv");
    double *x = state_of(300);
    Fault fault = {0};
    Model *thin = make_model();
    thin->settings.ultraviolet_albedo = 0;
    double *ozone = x + FIELD(thin->grid.padded, mechanism_solved(thin->mechanism, "O3"), 0);
    for (int l = 0; l < thin->grid.padded; l++) {
        thin->air.number_density[l] *= 1e-12;
        ozone[l] *= 1e12;
    }
    thin->air.column_above_top *= 1e-12;
    Ultraviolet *ultraviolet;
    UltravioletDay day;
    well(ultraviolet_make(&ultraviolet, thin, &overhead, &fault), &fault);
    ultraviolet_day(ultraviolet, x, NULL, &day);
    int checked = 0;
    for (int b = 0; b < ultraviolet_bins(ultraviolet); b++) {
        UltravioletBin bin = ultraviolet_bin(ultraviolet, b);
        if (bin.lower < 290)
            continue;
        double table[4], depth = 0;
        for (size_t t = 0; t < 4; t++)
            table[t] = bin_mean(&sun, &sigma, t + 1, bin.lower, bin.upper);
        for (int l = 0; l < thin->grid.layers; l++) {
            double warm = thin->air.temperature[l], length = thin->grid.depth[l];
            int t = warm < 243 ? 0 : warm < 273 ? 1 : 2;
            double f = fmin(fmax((warm - kelvin[t]) / (kelvin[t + 1] - kelvin[t]), 0), 1);
            if (l == thin->grid.layers - 1)
                length += thin->air.column_above_top / thin->air.number_density[l];
            depth +=
                table[t] * pow(table[t + 1] / table[t], f) * ozone[l] * thin->air.number_density[l] * length;
        }
        double got = -log(bin.ground / bin.above);
        if (!(fabs(got - depth) <= 1e-6 * depth))
            fail_msg("%g nm: optical depth %.8g, by hand %.8g", bin.lower, got, depth);
        checked++;
    }
    assert_int_equal(checked, 60);
    ultraviolet_free(ultraviolet);
    model_free(thin);
    free(x);
    table_free(&sun);
    table_free(&sigma);
}

/* ---- published figures ---- */

/* Rows uvi-overhead (11.5 to 15: WHO/WMO guide and common clear-sky calculations) and uv-raf (1.0 to 1.3:
 * McKenzie et al. 2011) of tests/published-values.csv, at 300 DU over albedo 0.05. */
static void overhead_sun_is_as_published(void **state)
{
    (void)state;
    double *x = state_of(300), amplification;
    UltravioletDay day = look(&overhead, x, NULL, &amplification);
    print_message("           UV index %.2f, amplification factor %.3f\n", day.uv_index, amplification);
    assert_true(day.uv_index >= 11.5 && day.uv_index <= 15);
    assert_true(amplification >= 1.0 && amplification <= 1.3);
    assert_true(fabs(day.uv_index - 40 * day.erythemal) < 1e-12);
    assert_true(day.band[UV_C] < 1e-12 && isnan(day.dose) && day.earth_sun == 1);
    free(x);
}

/* ---- what must hold ---- */

static void less_ozone_lets_more_through(void **state)
{
    (void)state;
    UltravioletDay before = {0};
    for (int step = 0; step <= 10; step++) {
        double *x = state_of(100 + 50 * step);
        UltravioletDay day = look(NULL, x, NULL, NULL);
        if (step) {
            assert_true(day.band[UV_B] < before.band[UV_B] && day.band[UV_A] < before.band[UV_A]);
            assert_true(day.erythemal < before.erythemal && day.dose < before.dose);
        }
        before = day;
        free(x);
    }
}

/* The factor is the slope it says it is: a change of ozone by 5 % either way, curvature aside (third order:
 * below 1e-3). */
static void amplification_foretells_the_change(void **state)
{
    (void)state;
    double *x = state_of(300), *more = state_of(315), *less = state_of(285), amplification;
    look(NULL, x, NULL, &amplification);
    double slope = log(look(NULL, less, NULL, NULL).erythemal / look(NULL, more, NULL, NULL).erythemal) /
                   log(315.0 / 285.0);
    assert_true(fabs(slope - amplification) < 2e-3);
    free(x);
    free(more);
    free(less);
}

/* Warm ozone absorbs more beyond 290 nm (its table), and a bright ground adds what the sky sends back. */
static void temperature_and_ground_count(void **state)
{
    (void)state;
    double *x = state_of(300), change[SETTINGS_MAX_EDGES];
    UltravioletDay plain = look(NULL, x, NULL, NULL);
    for (int l = 0; l < model->grid.layers; l++)
        change[l] = 0;
    UltravioletDay same = look(NULL, x, change, NULL);
    assert_true(same.erythemal == plain.erythemal && same.dose == plain.dose);
    for (int l = 0; l < model->grid.layers; l++)
        change[l] = 10;
    UltravioletDay warm = look(NULL, x, change, NULL);
    assert_true(warm.erythemal < plain.erythemal && warm.erythemal > 0.95 * plain.erythemal);
    model->settings.ultraviolet_albedo = 0.8; /* snow */
    UltravioletDay snow = look(NULL, x, NULL, NULL);
    model->settings.ultraviolet_albedo = 0.05;
    assert_true(snow.erythemal > 1.2 * plain.erythemal && snow.erythemal < 1.8 * plain.erythemal);
    free(x);
}

/* The limit moves light from one band to the other and touches nothing else. */
static void limit_of_320_moves_light_between_bands(void **state)
{
    (void)state;
    double *x = state_of(300), between = 0;
    Fault fault = {0};
    Ultraviolet *ultraviolet;
    UltravioletDay iso, older;
    well(ultraviolet_make(&ultraviolet, model, NULL, &fault), &fault);
    ultraviolet_day(ultraviolet, x, NULL, &iso);
    for (int b = 0; b < ultraviolet_bins(ultraviolet); b++) {
        UltravioletBin bin = ultraviolet_bin(ultraviolet, b);
        if (bin.lower >= 315 && bin.upper <= 320)
            between += bin.ground * (bin.upper - bin.lower);
    }
    ultraviolet_free(ultraviolet);
    model->settings.uvb_limit_nm = 320;
    older = look(NULL, x, NULL, NULL);
    model->settings.uvb_limit_nm = 315;
    assert_true(between > 1);
    assert_true(fabs(older.band[UV_B] - iso.band[UV_B] - between) < 1e-9);
    assert_true(fabs(iso.band[UV_A] - older.band[UV_A] - between) < 1e-9);
    assert_true(older.erythemal == iso.erythemal && older.dose == iso.dose &&
                older.band[UV_C] == iso.band[UV_C]);
    free(x);
}

/* ---- the day ---- */

/* The dose against suns computed one by one at Gauss-Legendre times from first light (or midnight) to noon.
 * The program interpolates between 14 heights of the sun above the horizon; 0.3 % is a hundredth of what
 * aerosol takes. */
static void dose_is_the_integral_of_the_day(void **state)
{
    (void)state;
    enum { TIMES = 24 };
    static const double places[][2] = {{45, 172}, {45, 355}, {0, 80}, {70, 172}, {-62, 172}, {90, 172}};
    double *x = state_of(300), time[TIMES], weight[TIMES];
    gauss(TIMES, time, weight);
    for (size_t p = 0; p < sizeof places / sizeof places[0]; p++) {
        double latitude = places[p][0] * PI / 180, tilt = sun_declination(places[p][1]), sum = 0;
        double height = sin(latitude) * sin(tilt), swing = cos(latitude) * cos(tilt);
        double night = height - swing > SUN_TWILIGHT ? 0 : acos((height - SUN_TWILIGHT) / swing) / (2 * PI);
        place(places[p][0], places[p][1]);
        UltravioletDay day = look(NULL, x, NULL, NULL);
        for (int t = 0; t < TIMES; t++) {
            double cosine = height - swing * cos(2 * PI * (night + (0.5 - night) * time[t]));
            sum += 2 * (0.5 - night) * DAY_SECONDS * weight[t] * day.earth_sun *
                   look(&cosine, x, NULL, NULL).erythemal;
        }
        print_message("           latitude %g, day %g: UV index %.2f, dose %.1f J m-2, off by %.3f %%\n",
                      places[p][0], places[p][1], day.uv_index, day.dose, 100 * (day.dose / sum - 1));
        assert_true(fabs(day.dose / sum - 1) < 3e-3);
        double noon = height + swing;
        assert_true(fabs(day.cosine - noon) < 2e-6);
        noon = fmin(noon, 1);
        double alone = look(&noon, x, NULL, NULL).erythemal * day.earth_sun;
        assert_true(fabs(day.erythemal / alone - 1) < 1e-4);
    }
    place(45, 172);
    free(x);
}

static void polar_night_is_dark(void **state)
{
    (void)state;
    double *x = state_of(300), amplification;
    place(85, 355);
    UltravioletDay day = look(NULL, x, NULL, &amplification);
    for (int b = 0; b < UV_BANDS; b++)
        assert_true(day.band[b] == 0);
    assert_true(day.erythemal == 0 && day.uv_index == 0 && day.dose == 0 && isnan(amplification));
    place(70, 355); /* the sun stays below the horizon, but not far */
    day = look(NULL, x, NULL, &amplification);
    assert_true(day.cosine < 0 && day.uv_index > 0 && day.uv_index < 0.1 && isfinite(amplification));
    place(45, 172);
    free(x);
}

static void threads_change_no_bit(void **state)
{
    (void)state;
    double *x = state_of(300), amplification[2];
    UltravioletDay day[2];
    int before = omp_get_max_threads();
    for (int t = 0; t < 2; t++) {
        omp_set_num_threads(t ? 3 : 1);
        day[t] = look(NULL, x, NULL, &amplification[t]);
    }
    omp_set_num_threads(before);
    assert_memory_equal(&day[0], &day[1], sizeof day[0]);
    assert_true(amplification[0] == amplification[1]);
    free(x);
}

/* ---- bad bins ---- */

static void bins_without_a_limit_are_refused(void **state)
{
    char path[300], good[300];
    Fault fault = {0};
    Ultraviolet *ultraviolet;
    Table bins = read_data("ultraviolet-bins.csv");
    char text[8000] = "lower_nm,upper_nm\n";
    for (size_t r = 0; r < bins.rows; r++) {
        double lower = bins.value[r], upper = bins.value[bins.rows + r];
        if (lower == 315) /* joined to the bin before it */
            continue;
        size_t used = strlen(text);
        snprintf(text + used, sizeof text - used, "%.10g,%.10g\n", lower, upper == 315 ? 316 : upper);
    }
    table_free(&bins);
    write_file(state, "bins.csv", text, path);
    strcpy(good, model->settings.ultraviolet_bins_file);
    strcpy(model->settings.ultraviolet_bins_file, path);
    assert_int_equal(ultraviolet_make(&ultraviolet, model, NULL, &fault), FAULT_INPUT);
    assert_null(ultraviolet);
    check_fault(&fault, "bins.csv", "315 nm", "add that edge", (char *)NULL);
    model->settings.uvb_limit_nm = 320; /* needs it not */
    Fault none = {0};
    well(ultraviolet_make(&ultraviolet, model, NULL, &none), &none);
    ultraviolet_free(ultraviolet);
    model->settings.uvb_limit_nm = 315;
    strcpy(model->settings.ultraviolet_bins_file, good);
}

/* ---- the file ---- */

static double read_one(int file, const char *name, const char *attribute, double want)
{
    int id;
    double value = NAN, number;
    if (nc_inq_varid(file, name, &id))
        fail_msg("no variable %s", name);
    assert_int_equal(nc_get_var_double(file, id, &value), 0);
    assert_int_equal(nc_get_att_double(file, id, attribute, &number), 0);
    assert_true(number == want);
    return value;
}

/* The series of a record are those of the module for its ozone and temperature, and say for what sun. */
static void file_holds_the_series(void **state)
{
    char path[300], caution[400] = "";
    snprintf(path, sizeof path, "%s/uv.nc", (char *)*state);
    Fault fault = {0};
    Archive *archive;
    double change[SETTINGS_MAX_EDGES], *x = state_of(280), amplification;
    for (int l = 0; l < model->grid.layers; l++)
        change[l] = -3.0;
    const Record record = {.time = 2000.5,
                           .time_start = 2000,
                           .time_end = 2001,
                           .x = x,
                           .ozone_column = 280,
                           .temperature_change = change};
    place(-35, 15);
    well(archive_create(&archive, model, path, 0, "skymend project", &fault), &fault);
    well(archive_append(archive, &record, &fault), &fault);
    well(archive_close(archive, NULL, &fault), &fault);
    UltravioletDay day = look(NULL, x, change, &amplification);
    int file, id;
    assert_int_equal(nc_open(path, NC_NOWRITE, &file), 0);
    assert_true(read_one(file, "uv_index_noon", "latitude_deg", -35) == day.uv_index);
    assert_true(read_one(file, "surface_erythemal_irradiance_noon", "day_of_year", 15) == day.erythemal);
    assert_true(read_one(file, "erythemal_daily_dose", "surface_albedo", 0.05) == day.dose);
    assert_true(read_one(file, "surface_uvb_irradiance_noon", "uvb_limit_nm", 315) == day.band[UV_B]);
    assert_true(read_one(file, "surface_uva_irradiance_noon", "uvb_limit_nm", 315) == day.band[UV_A]);
    assert_true(read_one(file, "erythemal_amplification_factor", "latitude_deg", -35) == amplification);
    assert_int_equal(nc_inq_varid(file, "uv_index_noon", &id), 0);
    assert_int_equal(nc_get_att_text(file, id, "caution", caution), 0);
    assert_non_null(strstr(caution, "no guide to personal exposure"));
    double latitude;
    assert_int_equal(nc_inq_varid(file, "ultraviolet_latitude", &id), 0);
    assert_int_equal(nc_get_var_double(file, id, &latitude), 0);
    assert_true(latitude == -35);
    nc_close(file);
    double back[SETTINGS_MAX_EDGES] = {0}; /* the temperature it goes by can be had again */
    well(record_read_change(model, path, 2000, back, &fault), &fault);
    assert_memory_equal(back, change, (size_t)model->grid.layers * sizeof *back);
    assert_int_equal(record_read_change(model, path, 2001, back, &fault), FAULT_INPUT);
    place(45, 172);
    free(x);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(erythema_at_its_break_points),
        cmocka_unit_test(erythema_means_are_exact),
        cmocka_unit_test(bands_above_are_those_of_the_solar_table),
        cmocka_unit_test(absorption_alone_obeys_beer),
        cmocka_unit_test(overhead_sun_is_as_published),
        cmocka_unit_test(less_ozone_lets_more_through),
        cmocka_unit_test(amplification_foretells_the_change),
        cmocka_unit_test(temperature_and_ground_count),
        cmocka_unit_test(limit_of_320_moves_light_between_bands),
        cmocka_unit_test(dose_is_the_integral_of_the_day),
        cmocka_unit_test(polar_night_is_dark),
        cmocka_unit_test(threads_change_no_bit),
        WITH_FOLDER(bins_without_a_limit_are_refused),
        WITH_FOLDER(file_holds_the_series),
    };
    return cmocka_run_group_tests_name("ultraviolet", tests, make_world, free_world);
}
