/* photolysis: photolysis rates of every photolysis reaction, every layer, every sun of a set. */
#ifndef SKYMEND_PHOTOLYSIS_H
#define SKYMEND_PHOTOLYSIS_H

#include "mechanism.h"
#include "radiation.h"
#include "spectra.h"

typedef struct Photolysis
    Photolysis; /* one column's photolysis module with its workspace: one per thread/column */

/* layers/padded and edges of the grid; temperature K and air cm-3 at layer middles [padded] (kept by copy;
 * may be renewed with photolysis_set_air); depth cm [padded]; air_above_top cm-2; cosine [suns]. mechanism
 * and spectra are kept by reference. */
int photolysis_make(Photolysis **made, const Mechanism *mechanism, const Spectra *spectra, int layers,
                    int padded, const double *edge_km, const double *temperature, const double *air,
                    const double *depth, double air_above_top, const double *cosine, int suns, double albedo,
                    Fault *fault);
void photolysis_free(Photolysis *photolysis);
/* Everything of from, the air it was given and what it last computed included, into to: made of the same
 * mechanism, spectra, layers and suns. */
void photolysis_copy(Photolysis *to, const Photolysis *from);
/* depth [padded]: air * depth is the layer's air, cm-2; the paths of light keep the edges of the making. */
void photolysis_set_air(Photolysis *photolysis, const double *temperature, const double *air,
                        const double *depth, double air_above_top);
/* Sunlight relative to the spectrum read, [bins]; 1 until it is set. */
void photolysis_set_sunlight(Photolysis *photolysis, const double *factor);

/* rate [suns][photolysis reactions][padded] s-1 out, padding lanes repeat the top layer. ozone,
 * nitrogen_dioxide, nitric_oxide: number densities cm-3 [padded]. O2 is air times the mechanism's share.
 * earth_sun: flux multiplier (1 at 1 au). */
void photolysis_rates(Photolysis *photolysis, const double *ozone, const double *nitrogen_dioxide,
                      const double *nitric_oxide, double earth_sun, double *rate);

/* How the rates answer to what absorbs, at the state of the last call of photolysis_rates, by solving for the
 * change of the light itself (radiation_slopes.h), scattered light included.
 * Of every reaction j and layer k it takes the sum over suns of share times rate, share
 * [suns][reactions][padded], which is what a mean over the day is to first order. sum [reactions][padded]:
 * that sum, and column [2][layers]: molecules cm-2 of O3 and of NO2 in a layer, both to tell what matters;
 * nitric_oxide [layers]: its number density, earth_sun as there slope [layers k][reactions j][3][layers m]
 * out: derivative of that sum in layer k by the number density of O3, NO2 and NO in layer m (in the top layer
 * with what lies above it); of NO only the rates of NO answer. Eight bins are left out where the absorber of
 * any one layer, all of it, could change the sum through them by less than PHOTOLYSIS_COUNTS of itself. The
 * same bits for any number of threads. FAULT_MEMORY. */
#define PHOTOLYSIS_COUNTS 1e-10
int photolysis_slopes(Photolysis *photolysis, const double *share, const double *sum, const double *column,
                      const double *nitric_oxide, double earth_sun, double *slope, Fault *fault);

/* Actinic flux of the last call, photons cm-2 s-1 per bin: pointer to [suns][layers][stride] with stride =
 * photolysis_stride() >= bins. */
const double *photolysis_actinic(const Photolysis *photolysis);
/* Downward irradiance at the ground of the last call relative to the incident: [suns][stride]. */
const double *photolysis_ground(const Photolysis *photolysis);
int photolysis_stride(const Photolysis *photolysis);

#endif
