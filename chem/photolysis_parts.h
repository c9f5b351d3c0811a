/* photolysis_parts: what a Photolysis is made of; private to photolysis.c and photolysis_slopes.c. */
#ifndef SKYMEND_PHOTOLYSIS_PARTS_H
#define SKYMEND_PHOTOLYSIS_PARTS_H

#include "photolysis.h"

/* Streams per hemisphere. With 4 the flux from 300 nm on is within 1 % for cosines of 0.2 and more
 * (tests/test_radiation.c) and was seen 2.5 % off at 0.05; near 210 nm below 18 km, diffuse light came out 10
 * % and more too strong, 1 km being thick there. */
#define STREAMS 4

struct Photolysis {
    const Mechanism *mechanism;
    const Spectra *spectra;
    Slant *slant;
    int layers, padded, suns, bins, stride, reactions;  /* photolysis reactions */
    int parametrised, *parametrised_bin;                /* bins treated by oxygen.h */
    double oxygen_share, nitrogen_share, albedo, above; /* above: air, cm-2 */
    int *first, *end;                                   /* [reactions] bins that matter, whole packs */
    void *block;                                        /* holds every array below */
    double *cosine;                                     /* [suns] */
    double *temperature, *air, *depth;                  /* [layers] */
    double *sunlight;                                   /* [stride] relative to the spectrum's flux */
    double *weight;                                     /* [layers][reactions][stride] sigma phi, cm2 */
    double *sigma_ozone, *sigma_dioxide;                /* [layers][stride] */
    double *absorb_air, *scatter; /* [layers][stride] optical depth of O2 for diffuse light; of Rayleigh */
    double *extinct_air;      /* [layers + 1][stride] Rayleigh and unparametrised O2; last: above the top */
    double *passed;           /* [suns][layers + 1][parametrised] R_M; last: ground */
    double *sigma_oxygen;     /* [suns][layers][parametrised] R_D / R_M, cm2 */
    double *opacity;          /* [suns][layers][intervals][terms] exp(-sigma_O2 N) of NO's bands */
    double *overlap;          /* [intervals][parametrised] share of the bin in the light of an NO interval */
    double *efficiency;       /* [layers][intervals] of NO: dissociations per absorbed photon */
    double *absorb, *extinct; /* of the last call, as absorb_air and extinct_air, with O3 and NO2 */
    double *clear;            /* [suns][layers][parametrised] direct beam without O2 */
    double *direct, *ground_direct; /* [suns][layers][stride], [suns][stride] */
    double *flux, *ground;          /* actinic flux [suns][layers][stride]; irradiance [suns][stride] */
    double *column;                 /* [layers + 1] vertical columns, scratch */
    int threads;                    /* that may solve for the scattered light at once */
    double *work;                   /* [threads] of radiation_solve */
};

#endif
