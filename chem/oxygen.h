/* oxygen: light that passes, and breaks, molecular oxygen where its lines cannot be resolved by bins.
 *
 * In the Lyman-alpha bin (Chabrillat and Kockarts 1997) and in the 500 cm-1 bins of the Schumann-Runge bands
 * (Kockarts 1994) the flux that remains after an O2 slant column N and the dissociation it causes are sums of
 * exponentials, R_M(N) and R_D(N). These are the "parametrised" bins. NO is dissociated inside the same bands
 * after Minschwaner and Siskind (1993).
 */
#ifndef SKYMEND_OXYGEN_H
#define SKYMEND_OXYGEN_H

#include "../input/table.h"
#include "spectra.h"

#define OXYGEN_TERMS 6         /* terms of R_M and of R_D in a band */
#define OXYGEN_COLUMN_CAP 1e24 /* cm-2; beyond it R_D / R_M of Kockarts (1994) grows without bound */
#define NITRIC_OXIDE_INTERVALS 3

/* O2 + hv -> O + O(1D): yield of the whole absorption. Threshold 175.0 nm, of O + O 242.4 nm (JPL 19-5).
 * Lyman-alpha: Lacoursiere et al. 1999 (J. Chem. Phys. 110, 1949), as o2/lyman-alpha.csv gives it. */
#define OXYGEN_O1D_EDGE_NM 175.0
#define OXYGEN_DISSOCIATION_EDGE_NM 242.4
#define OXYGEN_O1D_LYMAN_ALPHA 0.53

/* Minschwaner and Siskind (1993), Tables 1 to 3. */
typedef struct {
    double lower, upper;                      /* nm */
    double flux;                              /* photons cm-2 s-1 within it above the atmosphere at 1 au */
    double predissociation, emission, quench; /* s-1, s-1, cm3 s-1 (by N2) */
    double sigma_oxygen[OXYGEN_TERMS];        /* cm2 */
    double weight[OXYGEN_TERMS][2], sigma[OXYGEN_TERMS][2]; /* 1, cm2 */
} NitricOxideInterval;

struct NitricOxide {
    NitricOxideInterval interval[NITRIC_OXIDE_INTERVALS];
};

/* Read data_dir/o2/ into spectra, whose bins are set: lyman_alpha, bands and their coefficients, nitric_oxide
 * with flux still 0. Intervals outside the bins are left out. Faults: a bin that cuts the Lyman-alpha line or
 * an interval of Kockarts, tables of another shape. */
int oxygen_read(Spectra *spectra, const char *data_dir, Fault *fault);

/* Read data_dir/file and note its source in spectra->sources. Owner of table: caller. Defined in spectra.c.
 */
int spectra_table(Table *table, Spectra *spectra, const char *data_dir, const char *file, Fault *fault);

/* Is the bin parametrised? */
int oxygen_parametrised(const Spectra *spectra, int bin);
/* The three below hold for parametrised bins; column is the O2 slant column in cm-2, HUGE_VAL allowed. */
/* R_M: the share of the bin's photons that O2 lets pass. */
double oxygen_transmission(const Spectra *spectra, int bin, double column);
/* R_D / R_M, cm2: dissociation per O2 molecule and photon that has passed the column. The column is held
 * where no light is left (R_M near exp(-40)), and at OXYGEN_COLUMN_CAP at most. */
double oxygen_cross_section(const Spectra *spectra, int bin, double column);
/* -d ln R_M / dN, cm2: what further O2 takes from light that has passed the column. */
double oxygen_extinction(const Spectra *spectra, int bin, double column);

/* NO: dissociations per photon absorbed; nitrogen is the density of N2, cm-3. */
double nitric_oxide_efficiency(const NitricOxideInterval *interval, double nitrogen);
/* Transmission of O2 in each term of the interval below a slant column (cm-2, HUGE_VAL allowed); passed:
 * [OXYGEN_TERMS]. */
void nitric_oxide_opacity(const NitricOxideInterval *interval, double column, double *passed);
/* Effective cross section of NO, cm2 per photon of the interval outside the atmosphere, below a slant column
 * of NO (cm-2) and O2 that lets the shares passed [OXYGEN_TERMS] through. */
double nitric_oxide_cross_section(const NitricOxideInterval *interval, const double *passed, double column);
/* Its derivative by the slant column of NO, cm4. */
double nitric_oxide_cross_section_slope(const NitricOxideInterval *interval, const double *passed,
                                        double column);

#endif
