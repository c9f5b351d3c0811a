/* radiation_slopes_kernel: inside of radiation_slopes; private to it and its loops, which are compiled once
 * per vector instruction set with KERNEL_SUFFIX set and without fusing, so that all give the same bits.
 */
#ifndef SKYMEND_RADIATION_SLOPES_KERNEL_H
#define SKYMEND_RADIATION_SLOPES_KERNEL_H

#include "radiation_block.h"
#include "radiation_slopes.h"

/* The functions of radiation_slopes.h. */
typedef struct {
    void (*load)(RadiationSlopes *slopes, const double *absorption, const double *scattering);
    void (*layer)(const RadiationSlopes *slopes, int layer, const int *sun, int suns, int thread, double *out,
                  double *flux);
    void (*sum)(int layers, int suns, const double *weight, const double *change, double *sum);
} RadiationKernel;

extern const RadiationKernel radiation_kernel_baseline, radiation_kernel_avx2, radiation_kernel_avx512;

struct RadiationSlopes {
    const RadiationKernel *kernel;
    const Slant *slant;
    int layers, suns, threads;
    double *cosine;  /* [suns] */
    double *path;    /* [suns][layers][layers + 1] by layer on the way, target */
    double *memory;  /* of block */
    double *light;   /* [suns][layers][n][LANES] u */
    double *edge;    /* [suns][layers + 1][n][LANES] V; 0: at the ground */
    double *scatter; /* [layers][LANES] scattering depth / 4 pi */
    double *scratch; /* [threads][each] */
    size_t each;
    int *kept; /* [threads][layers + 1] targets that count */
    Block block;
    const double *direct, *direct_ground; /* of radiation_slopes_load, moved to the first lane */
    size_t width;
};

#endif
