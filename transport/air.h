/* air: temperature, pressure and number density on the grid. */
#ifndef SKYMEND_AIR_H
#define SKYMEND_AIR_H

#include "../input/fault.h"
#include "grid.h"

typedef struct {
    double *temperature;      /* [padded] K, at layer middles; padding repeats the top layer */
    double *pressure;         /* [padded] Pa, at layer middles */
    double *number_density;   /* [padded] molecules cm-3, at layer middles */
    double *edge_density;     /* [layers + 1] molecules cm-3, at layer edges */
    double *edge_temperature; /* [layers + 1] K */
    double column_above_top;  /* molecules cm-2 above the grid's top (n * H, local gravity) */
    char source[256];         /* citation (header line "source") or file, for the archive */
} Air;

/* U.S. Standard Atmosphere 1976, defined to 86 km geometric altitude; FAULT_INPUT if the grid goes
 * higher. Published constants: r0 = 6356.766 km, g0 = 9.80665 m s-2, M = 28.9644 kg kmol-1,
 * R = 8314.32 N m kmol-1 K-1; above 80 km the molecular-weight correction of the standard applies.
 * Number density is p / (k T) with the k of 2019, 2e-5 below the standard's own tables.
 * On a fault *air is zeroed. Owner: caller, air_free. */
int air_standard(Air *air, const Grid *grid, Fault *fault);

/* Profile from CSV: columns altitude_km, temperature_K and pressure_Pa (T linear, log p linear in
 * altitude). FAULT_INPUT unless it covers the grid from ground to top, altitude increases, pressure
 * falls, 100 <= T <= 400 K, p <= 1.2e5 Pa, and p at the ground is at least 3e4 Pa (else: hPa?).
 * Hydrostatic balance is the file's own affair. Owner: caller, air_free. */
int air_from_file(Air *air, const Grid *grid, const char *path, Fault *fault);
void air_free(Air *air); /* accepts NULL and a zeroed air */

/* The standard itself at one geometric altitude (km, 0..86): K and Pa. NaN outside. */
void air_standard_at(double altitude_km, double *temperature, double *pressure);

#endif
