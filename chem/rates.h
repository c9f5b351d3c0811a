/* rates: rate coefficients of all thermal and washout reactions on all layers.
 *
 * Coefficients are held as [reaction][padded], layers contiguous, for every reaction of the mechanism, in
 * units such that rate (molecules cm-3 s-1) = coefficient * product of number densities of the solved
 * reactants: fixed reactants (M, O2, N2) are folded in.
 */
#ifndef SKYMEND_RATES_H
#define SKYMEND_RATES_H

#include "mechanism.h"

/* One law at one point, without branch and fixed reactants: cm3 s-1 (bimolecular and effective fall-off), cm6
 * s-1, or s-1 (decomposition). temperature K, air cm-3, water cm-3. For tests and listings. */
double rates_law(const Mechanism *mechanism, int reaction, double temperature, double air, double water);

/* Fill coefficient[r][.] for thermal reactions.
 *   temperature, air, water  [padded] K, cm-3, cm-3
 *   coefficient [reactions][padded]; other kinds are not touched
 * Only HO2 + HO2 depends on water: with water_only = 1 just those are refreshed. */
void rates_thermal(const Mechanism *mechanism, int padded, const double *temperature, const double *air,
                   const double *water, int water_only, double *coefficient);

/* Washout: coefficient = relative solubility * rate[layer] (s-1). */
void rates_washout(const Mechanism *mechanism, int padded, const double *rate, double *coefficient);

#endif
