/* nat: nitric acid trihydrate, see nat.h. The vapour pressure: Hanson, D., and K. Mauersberger (1988),
 * Geophys. Res. Lett. 15, 855, typed from memory; it gives the published threshold of some 196 K at 50 hPa.
 */
#include "nat.h"

#include <math.h>

#include "../input/constants.h"

#define HPA_PER_TORR 1.333224
/* Particles of type I clouds: 0.5 to 1 um after Turco, R. P., et al. (1989), J. Geophys. Res. 94, 16493, and
 * few larger ones. From memory; the surface goes as 1 / radius. */
#define RADIUS_CM 1e-4
/* cm3 per molecule of HNO3: 117.06 g mol-1 at 1.62 g cm-3 (crystal: Taesler et al. 1975, from memory) */
#define MOLECULE_CM3 (117.06 / 1.62 / AVOGADRO)

double nat_vapour_hpa(double t, double water_hpa)
{
    double slope = -2.7836 - 0.00088 * t, constant = 38.9855 - 11397.0 / t + 0.009179 * t;
    return HPA_PER_TORR * pow(10.0, slope * log10(water_hpa / HPA_PER_TORR) + constant);
}

double nat_area(double t, double water_hpa, double hno3_hpa)
{
    double condensed = hno3_hpa - nat_vapour_hpa(t, water_hpa);
    if (!(condensed > 0.0))
        return 0.0;
    double molecules = 100.0 * condensed / (BOLTZMANN * t) * 1e-6; /* cm-3 */
    return 3.0 * molecules * MOLECULE_CM3 / RADIUS_CM;
}
