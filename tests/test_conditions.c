/* Tests of what surrounds the chemistry and changes with time: temperature, volcanic aerosol, solar cycle.
 * Run from the project's folder; SKYMEND_DATA overrides the place of the data.
 *
 * The volcanic and temperature tables here are invented for the tests. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include "../model/conditions.h"
#include "../model/projection.h"
#include "../model/variation.h"
#include "../transport/air.h"

/* Twenty layers; years that hold the trends below. */
static Settings coarse(int first, int last)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = 4.0;
    settings.first_year = first;
    settings.last_year = last;
    settings.temperature = TEMPERATURE_FIXED;
    return settings;
}

/* Temperature change by year at three altitudes: low up to 20 km, high from 35 km on. */
static void use_change(void **state, Settings *settings, const char *name, double first_low,
                       double first_high, double last_low, double last_high)
{
    char text[600], path[300];
    snprintf(text, sizeof text,
             "# source: invented\nyear,altitude_km,change_K\n%d,0,%g\n%d,20,%g\n%d,35,%g\n%d,90,%g\n"
             "%d,0,%g\n%d,20,%g\n%d,35,%g\n%d,90,%g\n",
             settings->first_year, first_low, settings->first_year, first_low, settings->first_year,
             first_high, settings->first_year, first_high, settings->last_year + 1, last_low,
             settings->last_year + 1, last_low, settings->last_year + 1, last_high, settings->last_year + 1,
             last_high);
    write_file(state, name, text, path);
    settings->temperature = TEMPERATURE_FILE;
    snprintf(settings->temperature_file, SETTINGS_PATH, "%s", path);
}

static double ozone_at(const Run *run, double km)
{
    const Model *model = run->model;
    int o3 = mechanism_solved(model->mechanism, "O3"), best = 0;
    for (int l = 1; l < model->grid.layers; l++)
        if (fabs(1e-5 * model->grid.middle[l] - km) < fabs(1e-5 * model->grid.middle[best] - km))
            best = l;
    return run->column->x[FIELD(model->grid.padded, o3, best)];
}

static double column_of(const Run *run)
{
    return column_ozone_du(run->model, run->column->x);
}

static void check_closure(const Run *run)
{
    static const char *const elements[] = {"Cl", "Br", "N", "H"};
    for (int i = 0; i < 4; i++)
        for (int e = 0; e < run->model->mechanism->elements; e++)
            if (!strcmp(run->model->mechanism->element[e], elements[i])) {
                double closure = column_closure(run->model, run->column, e);
                if (!(fabs(closure) < 1e-12)) /* round-off of some hundred steps */
                    fail_msg("closure of %s: %g", elements[i], closure);
            }
}

/* A change of nothing leaves every bit as it is, given either way. */
static void no_change_is_no_change(void **state)
{
    Settings fixed = coarse(1990, 1991), file = fixed, co2 = fixed;
    use_change(state, &file, "zero.csv", 0, 0, 0, 0);
    char path[300];
    write_file(state, "zero-cooling.csv", "altitude_km,K_per_doubling\n0,0\n90,0\n", path);
    co2.temperature = TEMPERATURE_CO2;
    snprintf(co2.co2_cooling_file, SETTINGS_PATH, "%s", path);
    Run runs[3] = {start(&fixed, 1), start(&file, 1), start(&co2, 1)};
    size_t bytes = field_size(runs[0].model) * sizeof(double);
    for (int r = 0; r < 3; r++)
        advance(&runs[r], 7.6, 30, 0);
    for (int r = 1; r < 3; r++) {
        assert_memory_equal(runs[r].column->x, runs[0].column->x, bytes);
        assert_int_equal(runs[r].column->photolysis_refreshes, runs[0].column->photolysis_refreshes);
    }
    for (int r = 0; r < 3; r++)
        end(&runs[r]);
}

/* The standard atmosphere with another temperature at the same pressure, as an air profile whose rows are the
 * middles and edges of the grid: km of a layer's edges and middle given by `expand`. */
static void write_air(void **state, const char *name, const double *km, int rows, const double *base_km,
                      double change, char *path)
{
    char text[6000];
    size_t used = (size_t)snprintf(text, sizeof text, "altitude_km,temperature_K,pressure_Pa\n");
    for (int r = 0; r < rows; r++) {
        double kelvin, pascal;
        air_standard_at(base_km[r], &kelvin, &pascal);
        used += (size_t)snprintf(text + used, sizeof text - used, "%.15g,%.15g,%.15g\n", km[r],
                                 kelvin + change, pascal);
    }
    write_file(state, name, text, path);
}

/* 1 K cooler by the trend is 1 K cooler by the air profile at the same pressure: every thermal and surface
 * coefficient agrees to the round-off of writing the profile down (15 digits, some laws steep in T). */
static void cooler_by_trend_is_cooler_by_profile(void **state)
{
    Settings trend = coarse(1990, 1991), profile = trend;
    use_change(state, &trend, "cool.csv", -1, -1, -1, -1);
    double km[41];
    for (int r = 0; r < 41; r++)
        km[r] = 2.0 * r;
    char path[300];
    write_air(state, "air.csv", km, 41, km, -1.0, path);
    snprintf(profile.air_file, SETTINGS_PATH, "%s", path);
    Run a = start(&trend, 1), b = start(&profile, 1), plain;
    Settings fixed = coarse(1990, 1991);
    plain = start(&fixed, 1);
    /* the state must be the same: OH is prescribed as a density and lies 0.4 % off in mole fraction */
    memcpy(b.column->x, a.column->x, field_size(a.model) * sizeof(double));
    advance(&a, 0.01, 1, 0);
    advance(&b, 0.01, 1, 0);
    advance(&plain, 0.01, 1, 0);
    const Mechanism *mechanism = a.model->mechanism;
    int padded = a.model->grid.padded, differ = 0;
    for (int r = 0; r < mechanism->reactions; r++) {
        if (r >= mechanism->photolysis_first && r < mechanism->surface_first)
            continue;
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, r, l);
            check_near(stepper_coefficients(a.stepper)[at], stepper_coefficients(b.stepper)[at], 1e-11);
            differ |= fabs(stepper_coefficients(a.stepper)[at] / stepper_coefficients(plain.stepper)[at] -
                           1) > 0.01;
        }
    }
    assert_true(differ); /* 1 K matters by more than 1 % somewhere */
    end(&a);
    end(&b);
    end(&plain);
}

/* Photolysis sees the same mass at another temperature: compared with a column whose layers really are as
 * deep as their mass needs. Left over is the geometry of slant paths (a lift of up to 1.5 km in 6371 km, more
 * at low sun). */
static void light_keeps_the_mass_of_layers(void **state)
{
    const double change = -5.0;
    Settings trend = coarse(1990, 1991), deep = trend;
    use_change(state, &trend, "cool.csv", change, change, change, change);
    double base_km[41], km[41];
    for (int r = 0; r < 41; r++)
        base_km[r] = 2.0 * r;
    km[0] = 0.0;
    deep.edges = 21;
    deep.edge_km[0] = 0.0;
    for (int l = 0; l < 20; l++) {
        double kelvin, pascal;
        air_standard_at(base_km[2 * l + 1], &kelvin, &pascal);
        km[2 * l + 1] = km[2 * l] + 2.0 * (kelvin + change) / kelvin;
        km[2 * l + 2] = km[2 * l] + 4.0 * (kelvin + change) / kelvin;
        deep.edge_km[l + 1] = km[2 * l + 2];
    }
    deep.top_km = deep.edge_km[20];
    char path[300];
    write_air(state, "air.csv", km, 41, base_km, change, path);
    snprintf(deep.air_file, SETTINGS_PATH, "%s", path);
    Run a = start(&trend, 1), b = start(&deep, 1), plain;
    Settings fixed = coarse(1990, 1991);
    plain = start(&fixed, 1);
    memcpy(b.column->x, a.column->x, field_size(a.model) * sizeof(double));
    advance(&a, 0.01, 1, 0);
    advance(&b, 0.01, 1, 0);
    advance(&plain, 0.01, 1, 0);
    const Light *one = stepper_light(a.stepper), *two = stepper_light(b.stepper),
                *old = stepper_light(plain.stepper);
    double worst = 0.0, cooling = 0.0;
    for (int r = 0; r < one->reactions; r++)
        for (int l = 3; l < 20; l++) { /* from 12 km up */
            double j = light_mean_rate(two, r, l);
            if (!(j > 1e-12)) /* what dissociates once in 30000 years hangs on the last light of low sun */
                continue;
            worst = fmax(worst, fabs(light_mean_rate(one, r, l) / j - 1.0));
            cooling = fmax(cooling, fabs(light_mean_rate(old, r, l) / j - 1.0));
        }
    print_message("           photolysis against a column of true depths: %.2g; against no cooling: %.2g\n",
                  worst, cooling);
    assert_true(worst < 0.01 && cooling > 0.02);
    end(&a);
    end(&b);
    end(&plain);
}

/* Atoms are accounted for while temperature falls 10 K in two years, 500 times faster than with CO2; the
 * conditions follow within CONDITIONS_KELVIN, at the layer's pressure and mass. */
static void atoms_close_under_a_trend(void **state)
{
    Settings settings = coarse(1990, 1991);
    use_change(state, &settings, "trend.csv", 0, 0, -4, -10);
    Run run = start(&settings, 1);
    column_open_ledger(run.model, run.column);
    advance(&run, 7.609375, 96, 0);
    check_closure(&run);
    const Model *model = run.model;
    const Conditions *now = stepper_conditions(run.stepper);
    for (int l = 0; l < model->grid.padded; l++) {
        double km = 1e-5 * model->grid.middle[l], place = (km - 20.0) / 15.0;
        double change = -4.0 - 6.0 * fmin(fmax(place, 0.0), 1.0);
        assert_true(fabs(now->temperature[l] - model->air.temperature[l] - change) < 0.1 + CONDITIONS_KELVIN);
        check_near(now->air[l], 1e-6 * model->air.pressure[l] / (BOLTZMANN * now->temperature[l]), 1e-14);
        check_near(now->air[l] * now->depth[l], model->air.number_density[l] * model->grid.depth[l], 1e-15);
    }
    end(&run);
}

/* The default follows the CO2 of the schedule: -K per doubling at the year that doubles nothing is 0, and in
 * 2090 (CO2 590 ppm after 339) some 8 K at 50 km by the table: log2(590 / 339) * 10.5 = 8.4 K. */
static void temperature_follows_co2(void **state)
{
    (void)state;
    Settings settings = coarse(1980, 2090);
    settings.temperature = TEMPERATURE_CO2;
    Run run = start(&settings, 1);
    advance(&run, 1.0, 1, 1);
    const Conditions *now = stepper_conditions(run.stepper);
    for (int l = 0; l < run.model->grid.padded; l++)
        assert_true(fabs(now->temperature[l] - run.model->air.temperature[l]) <= CONDITIONS_KELVIN + 0.1);
    run.column->time = 2090.5;
    advance(&run, 1.0, 1, 1);
    int co2 = schedule_find(&run.model->schedule, "CO2");
    double doublings = log2(schedule_abundance(&run.model->schedule, co2, 2090.5) / 338.9e-6);
    assert_true(doublings > 0.7 && doublings < 0.9);
    int layer = 12; /* 50 km, a row of the table */
    check_near(run.model->grid.middle[layer], 50e5, 1e-12);
    check_near(now->temperature[layer] - run.model->air.temperature[layer], -10.5 * doublings, 1e-9);
    check_near(now->temperature[0], run.model->air.temperature[0], 0.0); /* troposphere as it is */
    end(&run);
}

static int take_record(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    double *change = context;
    *change = record->temperature_change[12];
    return 0;
}

/* What the file is told of the change is its mean over the interval: the trend of 50 km, 0 to -10 K in two
 * years, is -2.5 K in the mean of the first and -7.5 K in that of the second year. Tolerance: half a step of
 * the conditions. */
static void the_record_tells_the_change(void **state)
{
    Settings settings = coarse(1990, 1991);
    settings.spinup_years = 0.0;
    use_change(state, &settings, "trend.csv", 0, 0, -4, -10);
    double change = 0.0;
    Watcher watcher = {.record = take_record, .context = &change};
    Fault fault = {0};
    Run run = start(&settings, 1);
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    assert_true(fabs(change + 7.5) < 0.05);
    assert_true(variation_of_temperature(run.model->variation));
    end(&run);
    settings.last_year = 1990;
    run = start(&settings, 1);
    ok(projection_run(run.model, run.stepper, run.column, &watcher, &fault), &fault);
    assert_true(fabs(change + 2.5) < 0.05);
    end(&run);
}

/* Ozone of the upper stratosphere rises by 1 to 1.5 % per K of cooling at 2 hPa (Barnett, Houghton and Pyle,
 * Q. J. R. Meteorol. Soc. 101, 245, 1975; Haigh and Pyle, ibid. 108, 551, 1982; from memory). Tolerance: the
 * published figures themselves spread, and hang on the mix of catalysts. */
static void cooling_makes_ozone_in_the_upper_stratosphere(void **state)
{
    Settings warm = coarse(1990, 1991), cool = warm;
    use_change(state, &cool, "cool.csv", 0, -5, 0, -5);
    Run a = start(&warm, 1), b = start(&cool, 1);
    advance(&a, 7.609375, 48, 1);
    advance(&b, 7.609375, 48, 1);
    double rise = 100.0 * log(ozone_at(&b, 42.0) / ozone_at(&a, 42.0)) / 5.0;
    print_message("           ozone at 42 km: %+.2f %% per K of cooling\n", rise);
    assert_true(rise > 0.7 && rise < 2.0);
    end(&a);
    end(&b);
}

/* The ozone column is 1 to 2 % larger at solar maximum than at minimum (WMO/UNEP 2018 and earlier
 * assessments; Hood, J. Geophys. Res. 102, 1355, 1997; from memory), as models of fixed dynamics find too.
 * Idealised cycle at its two ends, held for 8 years. */
static void solar_maximum_makes_ozone(void **state)
{
    Settings low = coarse(1990, 1991), high = low;
    char path[300];
    write_file(state, "low.csv", "year,phase\n1990,0\n1992,0\n", path);
    snprintf(low.solar_cycle_file, SETTINGS_PATH, "%s", path);
    write_file(state, "high.csv", "year,phase\n1990,1\n1992,1\n", path);
    snprintf(high.solar_cycle_file, SETTINGS_PATH, "%s", path);
    Run a = start(&low, 1), b = start(&high, 1);
    advance(&a, 15.21875, 8 * 24, 1);
    advance(&b, 15.21875, 8 * 24, 1);
    double rise = 100.0 * (column_of(&b) / column_of(&a) - 1.0);
    double top = 100.0 * (ozone_at(&b, 42.0) / ozone_at(&a, 42.0) - 1.0);
    print_message("           solar maximum: column %+.2f %%, 42 km %+.2f %%\n", rise, top);
    assert_true(rise > 0.7 && rise < 3.0 && top > 0.5 && top < 5.0);
    assert_true(stepper_conditions(a.stepper)->solar[0] < 1.0 &&
                stepper_conditions(b.stepper)->solar[0] > 1.0);
    end(&a);
    end(&b);
}

/* Effect on the ozone column, percent, of a year under the aerosol of a great eruption: some 20 um2 cm-3 from
 * 20 to 23 km, twenty times the background, the shape of 1992 (Deshler et al., Geophys. Res. Lett. 20, 1435,
 * 1993; from memory). Layers of 2 km: with 4 km the loss below 20 km comes out too large. */
static double volcano(void **state, int year)
{
    static const double profile[][2] = {{0, 0},  {12, 0}, {16, 8}, {20, 20}, {23, 20},
                                        {26, 8}, {30, 1}, {34, 0}, {90, 0}};
    char text[800], path[300];
    size_t used = (size_t)snprintf(
        text, sizeof text, "# source: invented\nyear,altitude_km,surface_um2_cm-3,effective_radius_um\n");
    for (int t = year; t <= year + 1; t++)
        for (size_t r = 0; r < sizeof profile / sizeof profile[0]; r++)
            used += (size_t)snprintf(text + used, sizeof text - used, "%d,%g,%g,0.5\n", t, profile[r][0],
                                     profile[r][1]);
    write_file(state, "volcanic.csv", text, path);
    Settings quiet = coarse(year, year);
    quiet.spacing_km = 2.0;
    Settings loud = quiet;
    snprintf(loud.volcanic_file, SETTINGS_PATH, "%s", path);
    Run a = start(&quiet, 1), b = start(&loud, 1);
    advance(&a, 30.4375, 12 * 10, 1);
    memcpy(b.column->x, a.column->x, field_size(a.model) * sizeof(double));
    advance(&a, 7.609375, 48, 1);
    advance(&b, 7.609375, 48, 1);
    const Conditions *now = stepper_conditions(b.stepper);
    int layer = 10; /* 21 km */
    check_near(now->aerosol_area[layer], b.model->aerosol_area[layer] + 20e-8, 1e-12);
    double volume = b.model->aerosol_area[layer] * b.model->aerosol_radius[layer] + 20e-8 * 0.5e-4;
    check_near(now->aerosol_radius[layer], volume / now->aerosol_area[layer], 1e-9);
    double effect = 100.0 * (column_of(&b) / column_of(&a) - 1.0);
    end(&a);
    end(&b);
    return effect;
}

/* With the chlorine of the 1990s aerosol destroys ozone, in 1992 some percent of the column (Solomon et al.,
 * J. Geophys. Res. 101, 6713, 1996; Randel et al., J. Geophys. Res. 100, 16753, 1995: 2 to 4 %); with that of
 * the 1960s it takes NOx away and ozone rises (Tie and Brasseur, Geophys. Res. Lett. 22, 3035, 1995). A
 * column knows no latitude and no changed circulation: sign and order of magnitude are held. */
static void volcanic_aerosol_works_by_chlorine(void **state)
{
    double now = volcano(state, 1992), then = volcano(state, 1962);
    print_message("           aerosol of a great eruption: ozone column %+.2f %% in 1992, %+.2f %% in 1962\n",
                  now, then);
    assert_true(now < -0.3 && now > -6.0);
    assert_true(then > -0.1 && then < 6.0);
}

/* ---- season ---- */

static Settings season_case(double latitude)
{
    Settings settings = coarse(1980, 1980);
    settings.sun = SUN_SEASON;
    settings.latitude_deg = latitude;
    return settings;
}

/* Hours with the sun's centre above the horizon: the knots pass cosine 0 in the morning. */
static double day_length(const Sun *sun)
{
    int i = 1;
    while (sun->knot[i] < 0.0)
        i++;
    double part = -sun->knot[i - 1] / (sun->knot[i] - sun->knot[i - 1]);
    return 2.0 * (12.0 - (sun->time[i - 1] + part * (sun->time[i] - sun->time[i - 1])) / 3600.0);
}

/* Days at 45 N last 15 h 37 min at the summer and 8 h 46 min at the winter solstice by the almanac, from
 * upper limb to upper limb with refraction; without those 50 minutes of arc, 11 minutes less. At the
 * equinoxes the centre of the sun is up for 12 h. Tolerance: 3 minutes for straight lines between knots, the
 * leap year and Spencer's 0.035 degrees. Declination 23.44 degrees at the solstices; distance 0.9833
 * and 1.0167 au at its ends (almanac). */
static void the_year_of_the_sun(void **state)
{
    (void)state;
    Settings settings = season_case(45.0);
    Sun sun;
    sun_make(&sun, &settings, 1);
    static const struct {
        double day, hours;
    } expected[] = {{172.0, 15.0 + 26.0 / 60.0}, {355.5, 8.0 + 35.0 / 60.0}, {80.0, 12.0}, {266.0, 12.0}};
    for (int i = 0; i < 4; i++) {
        sun_set_day(&sun, &settings, expected[i].day);
        if (!(fabs(day_length(&sun) - expected[i].hours) <
              (i < 2 ? 0.05 : 0.1))) /* the equinox moves by a day */
            fail_msg("day %g lasts %g h, not %g", expected[i].day, day_length(&sun), expected[i].hours);
    }
    assert_true(fabs(sun_declination(172.0) * 180.0 / PI - 23.44) < 0.05);
    assert_true(fabs(sun_declination(355.5) * 180.0 / PI + 23.44) < 0.05);
    sun_set_day(&sun, &settings, 3.0);
    check_near(sun.earth_sun, 1.0 / (0.9833 * 0.9833), 1e-3);
    sun_set_day(&sun, &settings, 185.0);
    check_near(sun.earth_sun, 1.0 / (1.0167 * 1.0167), 1e-3);
}

/* On a given day the season's light is that of the latitude's own sun on that day, its nodes dense. Knots are
 * the same; the nodes lie elsewhere, which leaves the error of the interpolation (0.13 % for dense nodes in
 * test_sun.c, on each side). */
static void season_agrees_with_the_day(void **state)
{
    (void)state;
    static const double days[] = {15.0, 80.0, 172.0, 300.0};
    Settings year = season_case(45.0);
    Model *model;
    Light *light, *own;
    Column *column;
    Fault fault = {0};
    ok(model_make(&model, &year, &fault), &fault);
    ok(column_make(&column, model, &fault), &fault);
    ok(light_make(&light, model, 1, &fault), &fault);
    light_refresh(light, column->x, NULL);
    Conditions *now;
    ok(conditions_make(&now, model, &fault), &fault);
    double worst = 0.0;
    for (int d = 0; d < 4; d++) {
        Model fixed = *model; /* borrows everything but the settings */
        fixed.settings.sun = SUN_LATITUDE;
        fixed.settings.day_of_year = days[d];
        ok(light_make(&own, &fixed, 2, &fault), &fault);
        light_refresh(own, column->x, NULL);
        now->day_of_year = days[d];
        light_follow(light, now, CONDITIONS_SUN);
        assert_true(light_stale(light, column->x, NULL));
        light_refresh(light, column->x, NULL);
        assert_false(light_stale(light, column->x, NULL));
        assert_memory_equal(light->sun.knot, own->sun.knot, sizeof own->sun.knot);
        assert_true(light->sun.earth_sun == own->sun.earth_sun);
        for (int r = 0; r < light->reactions; r++)
            for (int l = 3; l < model->grid.layers; l++) {
                double j = light_mean_rate(own, r, l);
                if (j > 1e-10)
                    worst = fmax(worst, fabs(light_mean_rate(light, r, l) / j - 1.0));
            }
        light_free(own);
    }
    print_message("           day means of the season against the day's own sun: worst %.2g\n", worst);
    assert_true(worst < 0.005);
    conditions_free(now);
    light_free(light);
    column_free(column);
    model_free(model);
}

/* At mid-month temperature is that of the table at the pressure of the layer, OH the table's density; New
 * Year is no jump. The table here is the standard atmosphere, month m warmer by 10 sin(2 pi m / 12) K, and
 * lifted: at the altitudes it names, pressure is 5 % higher, so reading by altitude instead of pressure would
 * show. */
static void months_are_met(void **state)
{
    Settings settings = season_case(45.0);
    static char text[60000];
    char path[300];
    size_t used = (size_t)snprintf(text, sizeof text, "month,altitude_km,temperature_K,pressure_Pa\n");
    for (int m = 1; m <= 12; m++)
        for (int km = 0; km <= 84; km += 2) {
            double kelvin, pascal;
            air_standard_at(km, &kelvin, &pascal);
            used += (size_t)snprintf(text + used, sizeof text - used, "%d,%d,%.12g,%.12g\n", m, km,
                                     kelvin + 10.0 * sin(2.0 * PI * m / 12.0), 1.05 * pascal);
        }
    write_file(state, "air.csv", text, path);
    snprintf(settings.month_air_file, SETTINGS_PATH, "%s", path);
    used = (size_t)snprintf(text, sizeof text, "month,altitude_km,OH_cm-3\n");
    for (int m = 1; m <= 12; m++)
        used +=
            (size_t)snprintf(text + used, sizeof text - used, "%d,0,%g\n%d,15,%g\n", m, m * 1e5, m, m * 1e5);
    write_file(state, "oh.csv", text, path);
    snprintf(settings.month_oh_file, SETTINGS_PATH, "%s", path);
    Model *model;
    Conditions *now;
    Fault fault = {0};
    ok(model_make(&model, &settings, &fault), &fault);
    ok(conditions_make(&now, model, &fault), &fault);
    int padded = model->grid.padded, oh = 0;
    while (model->held_species[oh] != mechanism_solved(model->mechanism, "OH"))
        oh++;
    for (int m = 1; m <= 12; m++) {
        int moved = conditions_move(now, model, 1980.0, 1980.0 + (m - 0.5) / 12.0);
        assert_true(moved & CONDITIONS_AIR && moved & CONDITIONS_HELD && moved & CONDITIONS_SUN);
        for (int l = 0; l < padded; l++) {
            double kelvin, pascal, km = 1e-5 * model->grid.middle[l];
            /* where the table has the layer's pressure: 5 % in pressure is up by some 340 m */
            double low = km, high = km + 1.0, below, above, p;
            low = 2.0 * floor(km / 2.0);
            do {
                air_standard_at(low, &kelvin, &p);
                below = 1.05 * p;
                air_standard_at(low + 2.0, &kelvin, &p);
                above = 1.05 * p;
                high = low + 2.0;
                low += 2.0;
            } while (above > model->air.pressure[l]);
            double t_low, t_high;
            air_standard_at(high - 2.0, &t_low, &pascal);
            air_standard_at(high, &t_high, &pascal);
            double part = log(below / model->air.pressure[l]) / log(below / above);
            check_near(now->temperature[l], t_low + part * (t_high - t_low) + 10.0 * sin(2.0 * PI * m / 12.0),
                       1e-9);
            check_near(now->air[l] * now->depth[l], model->air.number_density[l] * model->grid.depth[l],
                       1e-15);
            if (model->held_free[FIELD(padded, oh, l)] == 0.0)
                check_near(now->held_fraction[FIELD(padded, oh, l)] * now->air[l], m * 1e5, 1e-12);
        }
    }
    conditions_move(now, model, 1980.0, 1980.9999);
    double december = now->held_fraction[FIELD(padded, oh, 0)] * now->air[0];
    conditions_move(now, model, 1980.0, 1981.0001);
    check_near(now->held_fraction[FIELD(padded, oh, 0)] * now->air[0], december, 1e-2);
    assert_true(december > 1e5 && december < 12e5); /* between January's and December's */
    conditions_free(now);
    model_free(model);
}

/* With the years held and the seasons going on, the third year is the second again: to 0.5 %, since the
 * long-lived gases still settle; and the seasons themselves are many times that. Atoms are accounted for
 * throughout. */
static void the_year_comes_round(void **state)
{
    (void)state;
    Settings settings = season_case(45.0);
    snprintf(settings.air_file, SETTINGS_PATH, "air-45N.csv");
    snprintf(settings.month_air_file, SETTINGS_PATH, "air-45N-by-month.csv");
    Run run = start(&settings, 1);
    double du[2][4];
    advance(&run, 365.25 / 12.0, 12 * 6, 1);
    column_open_ledger(run.model, run.column);
    for (int year = 0; year < 2; year++)
        for (int quarter = 0; quarter < 4; quarter++) {
            advance(&run, 365.25 / 24.0, 6, 1);
            du[year][quarter] = column_of(&run);
        }
    double least = du[1][0], most = du[1][0];
    for (int quarter = 0; quarter < 4; quarter++) {
        print_message("           quarter %d: %.1f DU, a year later %.1f DU\n", quarter + 1, du[0][quarter],
                      du[1][quarter]);
        check_near(du[1][quarter], du[0][quarter], 0.005);
        least = fmin(least, du[1][quarter]);
        most = fmax(most, du[1][quarter]);
    }
    assert_true(most / least > 1.05);
    check_closure(&run);
    end(&run);
}

/* At 85 N no light at all about New Year, plenty in June; the column runs through with atoms accounted for,
 * the same for any number of threads. */
static void the_polar_night_passes(void **state)
{
    (void)state;
    Settings settings = season_case(85.0);
    Run one = start(&settings, 1), two = start(&settings, 2);
    size_t bytes = field_size(one.model) * sizeof(double);
    int padded = one.model->grid.padded;
    for (int month = 0; month < 6; month++) {
        advance(&one, 365.25 / 48.0, 4, 0);
        advance(&two, 365.25 / 48.0, 4, 0);
        const Light *light = stepper_light(one.stepper);
        assert_int_equal(light->sun.rises, month > 0);
        double most = 0.0;
        for (int r = 0; r < light->reactions; r++)
            for (int l = 0; l < padded; l++)
                most = fmax(most, light->mean[FIELD(padded, r, l)]);
        if (month == 0)
            assert_true(most == 0.0 && pack_lit_time(light) == 0.0);
        else
            assert_true(most > 1e-6);
        for (size_t i = 0; i < field_size(one.model); i++)
            assert_true(isfinite(one.column->x[i]));
        assert_memory_equal(one.column->x, two.column->x, bytes);
    }
    assert_true(column_of(&one) > 50.0 && column_of(&one) < 600.0);
    check_closure(&one);
    end(&one);
    end(&two);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(no_change_is_no_change),
        WITH_FOLDER(cooler_by_trend_is_cooler_by_profile),
        WITH_FOLDER(light_keeps_the_mass_of_layers),
        WITH_FOLDER(atoms_close_under_a_trend),
        WITH_FOLDER(temperature_follows_co2),
        WITH_FOLDER(the_record_tells_the_change),
        WITH_FOLDER(cooling_makes_ozone_in_the_upper_stratosphere),
        WITH_FOLDER(solar_maximum_makes_ozone),
        WITH_FOLDER(volcanic_aerosol_works_by_chlorine),
        WITH_FOLDER(the_year_of_the_sun),
        WITH_FOLDER(season_agrees_with_the_day),
        WITH_FOLDER(months_are_met),
        WITH_FOLDER(the_year_comes_round),
        WITH_FOLDER(the_polar_night_passes),
    };
    return cmocka_run_group_tests_name("conditions", tests, NULL, NULL);
}
