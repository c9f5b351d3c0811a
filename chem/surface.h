/* surface: heterogeneous reactions on background sulfate aerosol and, in cold air, nitric acid trihydrate.
 *
 * First-order uptake of the first reactant: gamma * mean speed * area / 4, with gas-phase diffusion
 * correction left out (radii well below the mean free path in the stratosphere). On sulfate gamma is
 * constant, or after Shi et al. (2001) for ClONO2 + H2O, ClONO2 + HCl and HOCl + HCl, Hanson (2003) for
 * BrONO2 + H2O, and the fit of JPL 19-5 for N2O5 + H2O, all as tabulated there, with sulfuric acid
 * composition from water pressure and temperature (Tabazadeh et al. 1997). On the trihydrate gamma is
 * constant and the area follows from HNO3 and water (nat.h); with HCl the uptake is held to what HCl reaches
 * the surface. A reaction with two solved reactants is returned as a second-order coefficient: uptake /
 * n(second reactant).
 */
#ifndef SKYMEND_SURFACE_H
#define SKYMEND_SURFACE_H

#include "mechanism.h"

/* Sulfuric acid mass fraction (percent) in equilibrium with water partial pressure (hPa) at temperature (K).
 */
double surface_acid_percent(double temperature, double water_hpa);

/* Fill coefficient[r][.] for surface reactions.
 *   temperature K, air cm-3, area of sulfate cm2 cm-3, its radius cm  [padded]
 *   density [solved][padded] number densities of solved species, cm-3 (H2O, HCl, ClONO2, HNO3 and the
 *   reactants are looked up)
 *   coefficient [reactions][padded]; other kinds not touched
 * Where the area is 0 the coefficient is 0. Densities at or below zero count as an absent partner
 * (coefficient finite). */
void surface_rates(const Mechanism *mechanism, int padded, const double *temperature, const double *air,
                   const double *area, const double *radius, const double *density, double *coefficient);

/* Reaction probability of one surface reaction at one point, for tests and listings. Partial pressures in
 * hPa. On the trihydrate it is gamma where HCl is plentiful. */
double surface_probability(const Mechanism *mechanism, int reaction, double temperature, double water_hpa,
                           double hcl_hpa, double clono2_hpa, double radius_cm);

#endif
