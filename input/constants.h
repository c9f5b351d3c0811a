/* Physical constants, each with its source. SI unless the name says otherwise. */
#ifndef SKYMEND_CONSTANTS_H
#define SKYMEND_CONSTANTS_H

#define PI 3.14159265358979323846
#define BOLTZMANN 1.380649e-23        /* J K-1, exact (SI 2019) */
#define AVOGADRO 6.02214076e23        /* mol-1, exact (SI 2019) */
#define GAS_CONSTANT 8.31446261815324 /* J mol-1 K-1, exact (SI 2019) */
#define PLANCK 6.62607015e-34         /* J s, exact (SI 2019) */
#define LIGHT_SPEED 2.99792458e8      /* m s-1, exact */
#define EARTH_RADIUS_KM 6371.0        /* mean radius, IUGG (common practice) */
#define DOBSON_CM2 2.6867e16          /* molecules cm-2 per DU (1e-5 m at 0 C and 101325 Pa) */
#define DAY_SECONDS 86400.0
#define YEAR_SECONDS 31557600.0 /* Julian year of 365.25 days */

/* Layers are stored in packs of this many; arrays over layers are padded to a multiple of it. */
#define PACK 8
#define PACK_ROUND(n) ((((n) + PACK - 1) / PACK) * PACK)

#endif
