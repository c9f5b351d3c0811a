/* radiation_slopes: see radiation_slopes.h. */
#include "radiation_slopes.h"

#include <stdlib.h>
#include <string.h>

#include "radiation_slopes_kernel.h"
#include "vector.h"

static const RadiationKernel *const every_kernel[] = {
    &radiation_kernel_baseline,
#ifdef SKYMEND_X86
    &radiation_kernel_avx2,
    &radiation_kernel_avx512,
#endif
};

/* See Scratch in radiation_slopes_kernel.c. */
static size_t scratch_size(int layers, int n)
{
    return LANES * (size_t)(layers * (4 * n + 3) + n + 1);
}

static void take_paths(RadiationSlopes *slopes, double above)
{
    int layers = slopes->layers, lowest;
    for (int s = 0; s < slopes->suns; s++)
        for (int t = 0; t <= layers; t++) {
            const double *weight = slant_path(slopes->slant, s, t, &lowest);
            for (int m = 0; weight && m < layers; m++)
                slopes->path[(size_t)(s * layers + m) * (size_t)(layers + 1) + (size_t)t] =
                    weight[m] + (m == layers - 1 ? above * weight[layers] : 0);
        }
}

int radiation_slopes_make(RadiationSlopes **made, const Slant *slant, int layers, double above,
                          const double *cosine, double albedo, int streams, int threads, Fault *fault)
{
    *made = NULL;
    size_t suns = (size_t)slant_suns(slant), count = (size_t)layers, n = (size_t)streams;
    RadiationSlopes *slopes = calloc(1, sizeof *slopes);
    if (!slopes)
        return fault_memory(fault, "the slopes of the light");
    slopes->kernel = every_kernel[vector_set()];
    slopes->slant = slant;
    slopes->layers = layers;
    slopes->suns = (int)suns;
    slopes->threads = threads;
    slopes->each = scratch_size(layers, streams);
    slopes->cosine = malloc((suns + 1) * sizeof(double));
    slopes->path = calloc(suns * (count + 1) * count + 1, sizeof(double));
    slopes->memory = malloc(LANES * block_size(layers, streams) * sizeof(double));
    slopes->light = malloc((suns * count * n * LANES + 1) * sizeof(double));
    slopes->edge = malloc((suns * (count + 1) * n * LANES + 1) * sizeof(double));
    slopes->scatter = malloc(count * LANES * sizeof(double));
    slopes->scratch = malloc((size_t)threads * slopes->each * sizeof(double));
    slopes->kept = malloc((size_t)threads * (count + 1) * sizeof(int));
    if (!slopes->cosine || !slopes->path || !slopes->memory || !slopes->light || !slopes->edge ||
        !slopes->scatter || !slopes->scratch || !slopes->kept) {
        radiation_slopes_free(slopes);
        return fault_memory(fault, "the slopes of the light");
    }
    memcpy(slopes->cosine, cosine, suns * sizeof *cosine);
    slopes->block = (Block){.n = streams, .layers = layers, .suns = (int)suns, .albedo = albedo};
    lay_block(&slopes->block, slopes->memory);
    set_streams(&slopes->block, streams);
    take_paths(slopes, above);
    *made = slopes;
    return 0;
}

void radiation_slopes_free(RadiationSlopes *slopes)
{
    if (!slopes)
        return;
    free(slopes->cosine);
    free(slopes->path);
    free(slopes->memory);
    free(slopes->light);
    free(slopes->edge);
    free(slopes->scatter);
    free(slopes->scratch);
    free(slopes->kept);
    free(slopes);
}

double radiation_slopes_path(const RadiationSlopes *slopes, int sun, int target, int layer)
{
    return slopes
        ->path[(size_t)(sun * slopes->layers + layer) * (size_t)(slopes->layers + 1) + (size_t)target];
}

void radiation_slopes_load(RadiationSlopes *slopes, int width, int first, const double *absorption,
                           const double *scattering, const double *direct, const double *direct_ground)
{
    slopes->width = slopes->block.width = (size_t)width;
    slopes->direct = direct + first;
    slopes->direct_ground = direct_ground + first;
    slopes->kernel->load(slopes, absorption + first, scattering + first);
}

void radiation_slopes_layer(RadiationSlopes *slopes, int layer, const int *sun, int suns, int thread,
                            double *out, double *flux)
{
    slopes->kernel->layer(slopes, layer, sun, suns, thread, out, flux);
}

void radiation_slopes_sum(const RadiationSlopes *slopes, const double *weight, const double *change, int suns,
                          double *sum)
{
    slopes->kernel->sum(slopes->layers, suns, weight, change, sum);
}
