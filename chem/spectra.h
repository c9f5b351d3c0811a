/* spectra: laboratory tables put onto the wavelength bins. Immutable after reading.
 *
 * Bins are contiguous. Cross sections of a bin are photon-flux-weighted means over the bin; temperature
 * dependence is kept at the table's own temperatures. The Lyman-alpha bin and the Schumann-Runge bands carry
 * published parameterisations for O2 (Chabrillat and Kockarts 1997; Kockarts 1994) and NO (Minschwaner and
 * Siskind 1993).
 */
#ifndef SKYMEND_SPECTRA_H
#define SKYMEND_SPECTRA_H

#include "mechanism.h"

#define SPECTRUM_TEMPERATURES 8

typedef struct {
    char name[MECHANISM_NAME];
    int temperatures;
    double temperature[SPECTRUM_TEMPERATURES]; /* K, ascending */
    double *sigma;                             /* [temperatures][bins] cm2 (cross section) or 1 (yield) */
    double *stern_volmer;                      /* [bins] cm3 or NULL */
    int logarithmic;                           /* interpolate log(sigma) in temperature */
} Spectrum;

typedef struct Spectra {
    int bins;
    double *lower, *upper; /* [bins] nm */
    double *flux;          /* [bins] photons cm-2 s-1 above the atmosphere at 1 au */
    double *irradiance;    /* [bins] W m-2 in the bin */
    int spectra;           /* cross sections and yields, each table once */
    Spectrum *spectrum;
    int *reaction_sigma; /* [photolysis reactions] index into spectrum, -1 for specials */
    int *reaction_yield; /* [photolysis reactions] index or -1 */
    int ozone, oxygen,
        nitrogen_dioxide;     /* absorbers of the radiative transfer: indices into spectrum, -1 when absent */
    int lyman_alpha;          /* bin */
    int bands_first, bands;   /* Schumann-Runge bins, consecutive */
    double *band_coefficient; /* [bands][4][6] a, b, c, d; see spectra.c */
    double lyman_coefficient[3][4];   /* b, c, d, e */
    struct NitricOxide *nitric_oxide; /* Minschwaner and Siskind tables */
    char *sources;                    /* citations of every table read, one a line */
} Spectra;

/* data_dir holds xs/, yield/, o2/; bins_path, solar_path CSV. Faults: missing tables, tables with bad
 * numbers, bins that are not contiguous, the solar table not covering the bins. Owner: caller. */
int spectra_read(Spectra **read, const Mechanism *mechanism, const char *data_dir, const char *bins_path,
                 const char *solar_path, Fault *fault);
void spectra_free(Spectra *spectra);

#endif
