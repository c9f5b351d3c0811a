/* radiation: actinic flux by discrete ordinates for many suns at once.
 *
 * For each bin the azimuth-mean, unpolarised equation of transfer with Rayleigh scattering and absorption is
 * solved in Feautrier form with double-Gauss streams (1 to 4 per hemisphere; photolysis.c takes 4). The
 * factorisation depends on optical depth only and serves all zenith angles. The direct beam follows the
 * spherical slant path (sun below the horizon included), Lambertian ground. Vectorised over wavelength bins.
 */
#ifndef SKYMEND_RADIATION_H
#define SKYMEND_RADIATION_H

#include "../input/fault.h"

typedef struct Slant Slant; /* geometry of a set of suns on a grid: immutable */

/* edge_km [layers + 1] layer edges; cosine [suns] cosines of the zenith angle at the ground, -0.3..1. Owner:
 * caller. */
int slant_make(Slant **made, int layers, const double *edge_km, const double *cosine, int suns, Fault *fault);
void slant_free(Slant *slant);
int slant_suns(const Slant *slant);
/* Slant columns above each layer's MIDDLE towards each sun: out[suns][layers]; vertical [layers] column of
 * each layer (any additive quantity), above_top the column above the grid's top (spread exponentially:
 * slanted with the top's geometry). Shadowed middles (path meets the ground) give HUGE_VAL. */
void slant_columns(const Slant *slant, const double *vertical, double above_top, double *out);

/* The same for one sun and target: a layer's middle, or the ground for target = layers. */
double slant_column(const Slant *slant, int sun, int target, const double *vertical, double above_top);
/* The weights behind it: slant column = sum of weight[k] vertical[k] over k = *lowest .. layers - 1, plus
 * weight[layers] above_top. NULL in shadow. Owner: slant. */
const double *slant_path(const Slant *slant, int sun, int target, int *lowest);

/* Actinic flux at layer middles relative to the incident flux (direct + diffuse), for lanes wavelengths at
 * once. suns, layers; width: number of wavelength lanes (multiple of 8), contiguous absorption, scattering
 * [layers][width] vertical optical depth of each layer (index 0 = lowest) direct [suns][layers][width]
 * transmission of the direct beam to each layer middle (exp(-slant depth), 0 in shadow), and direct_ground
 * [suns][width] at the ground cosine [suns]; albedo streams: quadrature angles per hemisphere, 1..4 flux
 * [suns][layers][width] out: total actinic flux / incident flux down_ground [suns][width] out, may be NULL:
 * downward irradiance at the ground / incident flux (direct*mu + diffuse) work [radiation_work(layers, width,
 * suns, streams)] doubles; no allocation. */
void radiation_solve(int suns, int layers, int width, const double *absorption, const double *scattering,
                     const double *direct, const double *direct_ground, const double *cosine, double albedo,
                     int streams, double *flux, double *down_ground, double *work);
/* The same for wavelengths first to end - 1 alone, both multiples of PACK: parts
 * do not know each other and may be solved at the same time, each with work of its own. */
void radiation_solve_part(int suns, int layers, int width, int first, int end, const double *absorption,
                          const double *scattering, const double *direct, const double *direct_ground,
                          const double *cosine, double albedo, int streams, double *flux, double *down_ground,
                          double *work);
size_t radiation_work(int layers, int width, int suns, int streams);

/* Rayleigh scattering cross section of air, cm2, at wavelength nm (Bucholtz 1995). */
double radiation_rayleigh(double wavelength_nm);

#endif
