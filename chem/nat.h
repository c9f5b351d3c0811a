/* nat: nitric acid trihydrate, the solid of which cold stratospheric clouds of type I are made.
 *
 * The solid stands in equilibrium with its vapours (Hanson and Mauersberger 1988). Whatever HNO3 the gas
 * holds beyond that is taken as condensed at once onto particles of one radius: no barrier to freezing, no
 * settling of particles, and the little water they bind (three to one, of a thousand) left in the gas. The
 * solved HNO3 is the sum of gas and solid.
 */
#ifndef SKYMEND_NAT_H
#define SKYMEND_NAT_H

/* HNO3 over the solid, hPa, at temperature (K) and water pressure (hPa, above 0). Measured at 190 to 205 K.
 */
double nat_vapour_hpa(double temperature, double water_hpa);

/* Surface of the solid, cm2 cm-3, where the air holds hno3_hpa of HNO3 in gas and solid together; 0 where all
 * of it stays in the gas. */
double nat_area(double temperature, double water_hpa, double hno3_hpa);

#endif
