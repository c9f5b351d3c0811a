/* radiation_slopes: how the actinic flux answers to absorption in each layer, exactly and for all suns at
 * once.
 *
 * The equations of radiation.c, row (layer, direction) times a mu^2, are symmetric: K u = q. So the diffuse
 * light at the middle of a layer k, 4 pi sum a u, is g' q for any beam, with g the light of an isotropic
 * source in that layer, K g = 4 pi a: one elimination serves all suns and layers. For a further absorption
 * depth in layer m
 *
 *     dF_k = dT_k + g' dq - g' dK u,
 *     g' dK u = sum over i of a_i g_m,i u_m,i - a_i mu_i^2 (Vg Vu above m + Vg Vu below m) / 2,
 *
 * T the direct beam and V that of radiation.c, at the edges of layer m: the distance between two middles
 * enters as h V = u' - u. dT and dq are the beam's, weakened along its path; light that the ground sends up
 * is part of q.
 */
#ifndef SKYMEND_RADIATION_SLOPES_H
#define SKYMEND_RADIATION_SLOPES_H

#include "radiation.h"

typedef struct RadiationSlopes RadiationSlopes;

/* slant: kept by reference. above: what lies above the top per unit of the top layer, of what absorbs (its
 * column moves with that layer). threads: that may call radiation_slopes_layer at once. streams as in
 * radiation_solve. Owner: caller. */
int radiation_slopes_make(RadiationSlopes **made, const Slant *slant, int layers, double above,
                          const double *cosine, double albedo, int streams, int threads, Fault *fault);
void radiation_slopes_free(RadiationSlopes *slopes);

/* Solve for PACK wavelengths, first to first + PACK - 1 of width; the arrays are those of radiation_solve,
 * direct and direct_ground must stay until the last layer is done. Every layer's optical depth must be above
 * 0. */
void radiation_slopes_load(RadiationSlopes *slopes, int width, int first, const double *absorption,
                           const double *scattering, const double *direct, const double *direct_ground);
/* For the suns listed, sun [suns] their numbers: out [layers m][suns][PACK], derivative of the actinic flux
 * at the middle of a layer, relative to the incident flux, by the absorption depth of layer m. Scattering of
 * less than 1e-9 of the flux there is left out. flux [suns][PACK] out: the flux itself, made from g (a
 * check), NULL allowed. Layers do not know each other. */
void radiation_slopes_layer(RadiationSlopes *slopes, int layer, const int *sun, int suns, int thread,
                            double *out, double *flux);
/* Of such a change: sum [layers m][PACK] = sum over suns of weight [suns][PACK] times it. */
void radiation_slopes_sum(const RadiationSlopes *slopes, const double *weight, const double *change, int suns,
                          double *sum);
/* The path towards a sun from a target (as in slant_path) through a layer, per vertical length, with above
 * folded into the top layer's; 0 in shadow. */
double radiation_slopes_path(const RadiationSlopes *slopes, int sun, int target, int layer);

#endif
