/* variation: what changes the conditions of a run in time: the tables, read and put onto the layers.
 *
 * Temperature change by CO2 (temperature.mode = "co2"): change = K per doubling (table, by altitude) times
 * log2(CO2 now / temperature.reference_co2_ppm), CO2 of the schedule at the ground; or given by year and
 * altitude (mode = "file"). That ozone itself warms the stratosphere is not included: a loss of ozone cools
 * about as much as CO2 did between 1980 and 2000, and its return warms again.
 *
 * Volcanic aerosol (files.volcanic): surface added to the background by year and altitude, with its own
 * effective radius; the radius of both together follows from their surface and volume. Sunlight that aerosol
 * scatters and the warming it brings are not included.
 *
 * Solar cycle (files.solar_cycle, an index by year, with files.solar_amplitude by wavelength): sunlight of
 * the case times 1 + amplitude (phase - 1/2).
 *
 * Season (sun.kind = "season"): temperature by month at the pressure of the layers, and the gases held in the
 * troposphere by month. Layers stay the masses of files.air, which should be the annual mean.
 */
#ifndef SKYMEND_VARIATION_H
#define SKYMEND_VARIATION_H

#include "column.h"
#include "profiles.h"

struct Variation {
    /* temperature */
    int co2; /* gas of the schedule that goes with cooling, -1 when there is none */
    double co2_reference;
    double *doubling; /* [padded] K per doubling of CO2 */
    Profiles change;  /* by year: K; times 0 when there is none */

    Profiles
        volcanic; /* by year: added surface um2 cm-3, its effective radius um; times 0 when there is none */

    /* season; times 0 where there is none */
    Profiles month_air;                   /* by month: temperature, K, at the pressure of the layers */
    Profiles month_held[MODEL_HELD_MOST]; /* by month and held species of the model */
    int month_density[MODEL_HELD_MOST];   /* 1: in cm-3, 0: in mole fraction */

    /* solar cycle */
    size_t phases;     /* 0 when there is none */
    double *year;      /* [phases] ascending */
    double *phase;     /* [phases] 0 minimum, 1 maximum */
    double *amplitude; /* [bins] maximum less minimum, relative to their mean */
};

/* The tables the case names. Needs everything of the model but base. Their citations are appended to
 * *sources, text from malloc, one a line. Owner: caller. */
int variation_read(Variation **read, const Model *model, char **sources, Fault *fault);
/* 1 when temperature may differ from that of the base atmosphere; accepts NULL (0). */
int variation_of_temperature(const Variation *variation);
void variation_free(Variation *variation); /* accepts NULL */

#endif
