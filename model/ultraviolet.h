/* ultraviolet: what reaches the ground under a clear sky, by band and as the skin answers to it.
 *
 * Downward irradiance on level ground at the foot of the column (sea level): direct and scattered light, no
 * clouds, no aerosol, absorption by O3, NO2 and O2, under the sun of ultraviolet.latitude_deg on
 * ultraviolet.day_of_year, over ground of ultraviolet.surface_albedo. The light is that of chem/photolysis.h,
 * on wavelength bins of its own (files.ultraviolet_bins), since that of the chemistry are too coarse for what
 * follows. Sunlight is that of files.solar, without the solar cycle, which above 290 nm is within 0.6 % from
 * its minimum to its maximum.
 *
 * Bands after ISO 21348:2007: UV-C 100 to 280 nm, UV-B 280 to 315 nm (ultraviolet.uvb_limit_nm = 320 on
 * request), UV-A from there to 400 nm. Of UV-C the part from 100 to 120 nm, about 1 mW m-2 above the
 * atmosphere, is left out. Clear-sky planning figures; no guide to personal exposure.
 */
#ifndef SKYMEND_ULTRAVIOLET_H
#define SKYMEND_ULTRAVIOLET_H

#include "column.h"

enum UltravioletBand { UV_C, UV_B, UV_A, UV_BANDS };

/* With its workspace: one per thread. */
typedef struct Ultraviolet Ultraviolet;

typedef struct {
    double cosine;         /* of the zenith angle at noon; without a rising sun -1 */
    double earth_sun;      /* sunlight above the atmosphere relative to that at 1 au */
    double band[UV_BANDS]; /* W m-2, at the ground at noon */
    double erythemal;      /* W m-2, at the ground at noon */
    double uv_index;       /* of it */
    double dose;           /* J m-2, erythemal, from midnight to midnight; NAN of a sun that stands still */
} UltravioletDay;

/* Caution that goes with every figure of this module. */
extern const char *const ultraviolet_caution;

/* cosine NULL: the sun of the group ultraviolet; else one sun at that cosine of the zenith angle (-0.2..1) at
 * 1 au that stands still. Model is kept by reference. FAULT_INPUT for bins without the edges of the bands.
 * Owner: caller. */
int ultraviolet_make(Ultraviolet **made, const Model *model, const double *cosine, Fault *fault);
void ultraviolet_free(Ultraviolet *ultraviolet);

/* For x [solved][padded] mole fractions, daily means; change [layers] K against the base atmosphere, or NULL.
 * A negative mole fraction within the tolerance absorbs nothing. Some 5 ms on one core. */
void ultraviolet_day(Ultraviolet *ultraviolet, const double *x, const double *change, UltravioletDay *day);
/* Radiation amplification factor at noon, -d ln(erythemal irradiance) / d ln(ozone): central difference of
 * ozone 1 % up and down at every altitude. NAN without light. Arguments as before. */
double ultraviolet_amplification(Ultraviolet *ultraviolet, const double *x, const double *change);

/* Above the atmosphere, on a surface that faces the sun at 1 au, W m-2: [UV_BANDS] out. */
void ultraviolet_above(const Ultraviolet *ultraviolet, double *band);

/* By bin: edges, nm; above the atmosphere as in ultraviolet_above and at the ground at noon of the last call
 * of ultraviolet_day, W m-2 nm-1; mean weight of erythema. */
typedef struct {
    double lower, upper, above, ground, weight;
} UltravioletBin;
int ultraviolet_bins(const Ultraviolet *ultraviolet);
UltravioletBin ultraviolet_bin(const Ultraviolet *ultraviolet, int bin);

#endif
