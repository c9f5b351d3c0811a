/* erythema: the reference action spectrum of the reddening of skin, ISO/CIE 17166:2019: 1 from 250 to 298 nm,
 * 10^(0.094 (298 - w)) to 328 nm, 10^(0.015 (140 - w)) to 400 nm; defined there alone, 0 elsewhere. (McKinlay
 * and Diffey 1987, CIE J. 6, 17, had 139 in place of 140.)
 */
#ifndef SKYMEND_ERYTHEMA_H
#define SKYMEND_ERYTHEMA_H

/* UV index per erythemal irradiance, m2 W-1 (WHO, WMO, UNEP, ICNIRP 2002, Global Solar UV Index). */
#define UV_INDEX_M2_W 40.0
/* Standard erythemal dose, J m-2 (ISO/CIE 17166:2019). */
#define STANDARD_ERYTHEMAL_DOSE 100.0

/* Weight at a wavelength, nm. */
double erythema_weight(double nm);
/* Its mean from lower to upper nm, lower < upper: exact. */
double erythema_mean(double lower, double upper);

#endif
