/* air: see air.h. The standard is integrated layer by layer from the ground in geopotential
 * altitude, where its molecular-scale temperature is piecewise linear and the barometric formula is
 * exact. */
#include "air.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"

#define CM_PER_KM 1e5
#define COVER_TOLERANCE_KM 1e-9 /* round-off in the conversion between km and cm */

/* U.S. Standard Atmosphere, 1976 (NOAA, NASA, USAF; NOAA-S/T 76-1562): adopted constants, lapse
 * rates of the seven layers, and the molecular weight from 80 to 86 km. basis: from memory. */
#define US76_TOP_KM 86.0
#define US76_RADIUS_KM 6356.766
#define US76_GRAVITY 9.80665      /* m s-2 at the ground */
#define US76_MOLAR_MASS 28.9644   /* kg kmol-1 */
#define US76_GAS_CONSTANT 8314.32 /* N m kmol-1 K-1; the standard's own, not that of 2019 */
#define US76_GROUND_KELVIN 288.15
#define US76_GROUND_PASCAL 101325.0

static const struct {
    double base; /* geopotential altitude where the layer begins, km */
    double rate; /* gradient of the molecular-scale temperature in it, K km-1 */
} us76_layer[] = {
    {0.0, -6.5}, {11.0, 0.0}, {20.0, 1.0}, {32.0, 2.8}, {47.0, 0.0}, {51.0, -2.8}, {71.0, -2.0},
};
enum { US76_LAYERS = sizeof us76_layer / sizeof us76_layer[0] };

/* Molecular weight over its ground value at 80, 80.5, ... 86 km geometric altitude. The kinetic
 * temperature is the molecular-scale temperature times this ratio. */
#define US76_WEIGHT_BASE_KM 80.0
#define US76_WEIGHT_STEP_KM 0.5
static const double us76_weight_ratio[] = {
    1.000000, 0.999996, 0.999989, 0.999971, 0.999941, 0.999909, 0.999870,
    0.999829, 0.999786, 0.999741, 0.999694, 0.999641, 0.999579,
};
enum { US76_WEIGHTS = sizeof us76_weight_ratio / sizeof us76_weight_ratio[0] };

static double weight_ratio(double altitude_km)
{
    double place = (altitude_km - US76_WEIGHT_BASE_KM) / US76_WEIGHT_STEP_KM;
    if (place <= 0.0)
        return 1.0;
    int below = (int)place;
    if (below > US76_WEIGHTS - 2)
        below = US76_WEIGHTS - 2;
    double part = place - below;
    return (1.0 - part) * us76_weight_ratio[below] + part * us76_weight_ratio[below + 1];
}

void air_standard_at(double altitude_km, double *temperature, double *pressure)
{
    *temperature = *pressure = NAN;
    if (!(altitude_km >= 0.0 && altitude_km <= US76_TOP_KM))
        return;

    /* M g0 / R in K per geopotential km: what the temperature gradient is compared with. */
    const double weight = 1000.0 * US76_GRAVITY * US76_MOLAR_MASS / US76_GAS_CONSTANT;
    double height = US76_RADIUS_KM * altitude_km / (US76_RADIUS_KM + altitude_km);
    double kelvin = US76_GROUND_KELVIN, pascal = US76_GROUND_PASCAL;
    for (int l = 0; l < US76_LAYERS && height > us76_layer[l].base; l++) {
        double end = l + 1 < US76_LAYERS ? fmin(height, us76_layer[l + 1].base) : height;
        double rise = end - us76_layer[l].base, rate = us76_layer[l].rate;
        double next = kelvin + rate * rise;
        pascal *= rate == 0.0 ? exp(-weight * rise / kelvin) : pow(kelvin / next, weight / rate);
        kelvin = next;
    }
    *temperature = kelvin * weight_ratio(altitude_km);
    *pressure = pascal;
}

/* Molecules cm-3 of an ideal gas at K and Pa. */
static double ideal_density(double temperature, double pressure)
{
    return 1e-6 * pressure / (BOLTZMANN * temperature);
}

static int make_arrays(Air *air, const Grid *grid, Fault *fault)
{
    size_t padded = (size_t)grid->padded, edges = (size_t)grid->layers + 1;
    air->temperature = malloc(padded * sizeof(double));
    air->pressure = malloc(padded * sizeof(double));
    air->number_density = malloc(padded * sizeof(double));
    air->edge_density = malloc(edges * sizeof(double));
    air->edge_temperature = malloc(edges * sizeof(double));
    if (air->temperature && air->pressure && air->number_density && air->edge_density &&
        air->edge_temperature)
        return 0;
    air_free(air);
    return fault_memory(fault, "the air profile");
}

/* One altitude (km) of whichever profile; profile is the function's own. */
typedef void (*ProfileAt)(const void *profile, double altitude_km, double *temperature, double *pressure);

static void fill_air(Air *air, const Grid *grid, ProfileAt at, const void *profile)
{
    /* The grid's padding repeats the top middle, so the padding here repeats the top layer. */
    for (int i = 0; i < grid->padded; i++) {
        at(profile, grid->middle[i] / CM_PER_KM, &air->temperature[i], &air->pressure[i]);
        air->number_density[i] = ideal_density(air->temperature[i], air->pressure[i]);
    }
    double pressure = 0.0;
    for (int e = 0; e <= grid->layers; e++) {
        at(profile, grid->edge[e] / CM_PER_KM, &air->edge_temperature[e], &pressure);
        air->edge_density[e] = ideal_density(air->edge_temperature[e], pressure);
    }

    /* n H with H = k T / (m g) at the top edge: what hydrostatic balance at the local g holds up.
     */
    double top_km = grid->edge[grid->layers] / CM_PER_KM;
    double shrink = US76_RADIUS_KM / (US76_RADIUS_KM + top_km);
    double mass = 1e-3 * US76_MOLAR_MASS / AVOGADRO; /* kg per molecule */
    double height_m =
        BOLTZMANN * air->edge_temperature[grid->layers] / (mass * US76_GRAVITY * shrink * shrink);
    air->column_above_top = air->edge_density[grid->layers] * 100.0 * height_m;
}

static void standard_profile(const void *profile, double altitude_km, double *temperature, double *pressure)
{
    (void)profile;
    air_standard_at(altitude_km, temperature, pressure);
}

int air_standard(Air *air, const Grid *grid, Fault *fault)
{
    memset(air, 0, sizeof *air);
    double top_km = grid->edge[grid->layers] / CM_PER_KM;
    if (top_km > US76_TOP_KM)
        return fault_set(fault, FAULT_INPUT,
                         "air: the grid reaches %g km and the standard atmosphere is defined to "
                         "%g km; lower the top or give an air profile of your own",
                         top_km, US76_TOP_KM);
    if (make_arrays(air, grid, fault))
        return fault->code;
    fill_air(air, grid, standard_profile, NULL);
    snprintf(air->source, sizeof air->source, "U.S. Standard Atmosphere, 1976 (NOAA-S/T 76-1562)");
    return 0;
}

typedef struct {
    const double *altitude, *temperature, *pressure; /* [rows] km, K, Pa */
    size_t rows;
} TableProfile;

static void table_profile(const void *profile, double altitude_km, double *temperature, double *pressure)
{
    const TableProfile *own = profile;
    *temperature = table_linear(own->altitude, own->temperature, own->rows, altitude_km);
    *pressure = table_loglinear(own->altitude, own->pressure, own->rows, altitude_km);
}

/* Columns of the table, checked: order, plausible size, cover of the grid. */
static int check_profile(TableProfile *own, const Table *table, const Grid *grid, Fault *fault)
{
    size_t z = 0, t = 0, p = 0;
    if (table_column(table, "altitude_km", &z, fault) || table_column(table, "temperature_K", &t, fault) ||
        table_column(table, "pressure_Pa", &p, fault) || table_require_increasing(table, z, fault))
        return fault->code;
    /* Wide enough for any season and place below 100 km, narrow enough to catch degrees Celsius. */
    if (table_require_range(table, t, 100.0, 400.0, fault) ||
        table_require_range(table, p, 1e-6, 1.2e5, fault))
        return fault->code;

    *own =
        (TableProfile){table_values(table, z), table_values(table, t), table_values(table, p), table->rows};
    for (size_t r = 1; r < own->rows; r++)
        if (!(own->pressure[r] < own->pressure[r - 1]))
            return fault_at(fault, table->path, table->line[r],
                            "pressure_Pa is %g and does not fall from %g in the row before; pressure "
                            "must fall with altitude",
                            own->pressure[r], own->pressure[r - 1]);

    double top_km = grid->edge[grid->layers] / CM_PER_KM;
    if (own->rows < 2 || own->altitude[0] > COVER_TOLERANCE_KM ||
        own->altitude[own->rows - 1] < top_km - COVER_TOLERANCE_KM)
        return fault_at(fault, table->path, 0,
                        "the air profile must cover the grid, 0 to %g km; it has %zu rows from %g "
                        "to %g km",
                        top_km, own->rows, own->rows ? own->altitude[0] : NAN,
                        own->rows ? own->altitude[own->rows - 1] : NAN);
    /* A profile in hPa looks fine row by row; only its ground value gives it away. */
    double ground = table_loglinear(own->altitude, own->pressure, own->rows, 0.0);
    if (ground < 3e4)
        return fault_at(fault, table->path, table->line[0],
                        "the pressure at the ground is %g Pa, below 30000; is the column in hPa?", ground);
    return 0;
}

int air_from_file(Air *air, const Grid *grid, const char *path, Fault *fault)
{
    memset(air, 0, sizeof *air);
    Table table = {0};
    TableProfile own = {0};
    if (table_read(&table, path, fault))
        return fault->code;
    if (!check_profile(&own, &table, grid, fault) && !make_arrays(air, grid, fault)) {
        fill_air(air, grid, table_profile, &own);
        if (!table_header(&table, "source", air->source, sizeof air->source))
            snprintf(air->source, sizeof air->source, "%s", path);
    }
    table_free(&table);
    return fault->code;
}

void air_free(Air *air)
{
    if (!air)
        return;
    free(air->temperature);
    free(air->pressure);
    free(air->number_density);
    free(air->edge_density);
    free(air->edge_temperature);
    memset(air, 0, sizeof *air);
}
