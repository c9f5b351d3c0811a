/* radiation_block: the elimination of radiation.c for LANES wavelengths at once, which radiation_slopes.c
 * uses as well. Private to these two; the equations are at the head of radiation.c.
 */
#ifndef SKYMEND_RADIATION_BLOCK_H
#define SKYMEND_RADIATION_BLOCK_H

#include <stddef.h>

#include "../input/constants.h"

#define LANES PACK /* wavelengths solved side by side */
#define MOST_STREAMS 4

/* Gauss-Legendre on 0..1 (Abramowitz and Stegun 1964, table 25.4, moved from -1..1). */
static const double gauss_cosine[MOST_STREAMS][MOST_STREAMS] = {
    {0.5},
    {0.21132486540518711775, 0.78867513459481288225},
    {0.11270166537925831148, 0.5, 0.88729833462074168852},
    {0.06943184420297371239, 0.33000947820757186760, 0.66999052179242813240, 0.93056815579702628761}};
static const double gauss_weight[MOST_STREAMS][MOST_STREAMS] = {
    {1},
    {0.5, 0.5},
    {0.27777777777777777778, 0.44444444444444444444, 0.27777777777777777778},
    {0.17392742256872692869, 0.32607257743127307131, 0.32607257743127307131, 0.17392742256872692869}};

/* Azimuth-mean Rayleigh phase function, mean over the sphere 1. A single stream cannot integrate P2: with it
 * scattering would make light, so it is left out there. */
static double phase(int streams, double mu, double other)
{
    return streams == 1 ? 1 : 1 + 0.5 * (1.5 * mu * mu - 0.5) * (1.5 * other * other - 0.5);
}

/* What one block of LANES wavelengths needs; all inner arrays are [...][LANES]. */
typedef struct {
    int n, layers, suns;
    size_t width;
    double albedo;
    double mu[MOST_STREAMS], scatter[MOST_STREAMS * MOST_STREAMS]; /* cosines; p_jk a_k */
    double *gain;    /* [layers + 1][n][n] T; entry layers: inverse of the ground's matrix */
    double *source;  /* [layers][n] d w / (4 pi mu^2), times p_j0 the source of p; then see forward */
    double *gap;     /* [layers] h from the middle above (the top's edge for the uppermost) */
    double *beam;    /* [layers][n] p of one sun just below the layer */
    double *ground;  /* [n + 1] weight of u_j in the intensity G the ground sends up, and of the beam */
    double *conduct; /* [n] v = conduct (G - u) from the lowest middle to the ground */
} Block;

/* out = inverse of matrix, which is overwritten: Gauss-Jordan without pivoting. The matrices here are
 * M-matrices (positive diagonal, negative elsewhere, diagonally dominant), for which that is stable. */
static inline __attribute__((always_inline)) void invert(int n, double (*matrix)[LANES], double (*out)[LANES])
{
    for (int i = 0; i < n * n; i++)
        for (int l = 0; l < LANES; l++)
            out[i][l] = i % (n + 1) == 0;
    for (int c = 0; c < n; c++) {
        double pivot[LANES];
        for (int l = 0; l < LANES; l++)
            pivot[l] = 1 / matrix[c * n + c][l];
        for (int k = 0; k < n; k++)
            for (int l = 0; l < LANES; l++) {
                matrix[c * n + k][l] *= pivot[l];
                out[c * n + k][l] *= pivot[l];
            }
        for (int r = 0; r < n; r++) {
            if (r == c)
                continue;
            double factor[LANES];
            for (int l = 0; l < LANES; l++)
                factor[l] = matrix[r * n + c][l];
            for (int k = 0; k < n; k++)
                for (int l = 0; l < LANES; l++) {
                    matrix[r * n + k][l] -= factor[l] * matrix[c * n + k][l];
                    out[r * n + k][l] -= factor[l] * out[c * n + k][l];
                }
        }
    }
}

/* The elimination: gain, source, gap, ground of every layer, from the top down. */
static inline __attribute__((always_inline)) void
factorise(const Block *block, int n, const double *absorption, const double *scattering)
{
    const size_t width = block->width;
    double(*gain)[LANES] = (double(*)[LANES])block->gain, (*source)[LANES] = (double(*)[LANES])block->source;
    double(*gap)[LANES] = (double(*)[LANES])block->gap;
    double response[MOST_STREAMS * MOST_STREAMS][LANES]; /* R */
    double upper[LANES] = {0};                           /* depth of the layer above; none above the top */
    for (int i = 0; i < n * n; i++)                      /* no light comes in: u = v, V = u / mu */
        for (int l = 0; l < LANES; l++)
            response[i][l] = i % (n + 1) == 0 ? 1 / block->mu[i / n] : 0;
    for (int layer = block->layers - 1; layer >= 0; layer--) {
        const double *absorb = absorption + (size_t)layer * width,
                     *scatter = scattering + (size_t)layer * width;
        double(*t)[LANES] = gain + layer * n * n;
        double work[MOST_STREAMS * MOST_STREAMS][LANES], depth[LANES];
        for (int l = 0; l < LANES; l++) {
            depth[l] = absorb[l] + scatter[l];
            gap[layer][l] = 0.5 * (upper[l] + depth[l]);
            upper[l] = depth[l];
        }
        for (int i = 0; i < n * n; i++)
            for (int l = 0; l < LANES; l++)
                work[i][l] = (i % (n + 1) == 0) + gap[layer][l] * response[i][l];
        invert(n, work, t);
        for (int i = 0; i < n; i++)
            for (int k = 0; k < n; k++)
                for (int l = 0; l < LANES; l++) {
                    double sum = 0;
                    for (int j = 0; j < n; j++)
                        sum += response[i * n + j][l] * t[j * n + k][l];
                    work[i * n + k][l] = sum;
                }
        for (int i = 0; i < n; i++) {
            double mu2 = 1 / (block->mu[i] * block->mu[i]), isotropic = mu2 / (4 * PI);
            for (int l = 0; l < LANES; l++)
                source[layer * n + i][l] = scatter[l] * isotropic;
            for (int k = 0; k < n; k++)
                for (int l = 0; l < LANES; l++)
                    response[i * n + k][l] =
                        work[i * n + k][l] +
                        mu2 * ((i == k ? depth[l] : 0) - scatter[l] * block->scatter[i * n + k]);
        }
    }
    /* Ground: it sends up G in every direction, so G - 2 v comes down, and with albedo A
     *     G = A (2 sum a mu (G - 2 v) + mu0 T / pi),    v = D (G - u),    D = 1 / (1 + d / (2 mu)). */
    double(*ground)[LANES] = (double(*)[LANES])block->ground,
    (*conduct)[LANES] = (double(*)[LANES])block->conduct;
    double matrix[MOST_STREAMS * MOST_STREAMS][LANES], divide[LANES];
    for (int l = 0; l < LANES; l++)
        divide[l] = 1 - block->albedo;
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++) {
            conduct[i][l] = 1 / (1 + 0.5 * upper[l] / block->mu[i]);
            ground[i][l] = 4 * block->albedo * gauss_weight[n - 1][i] * block->mu[i] * conduct[i][l];
            divide[l] += ground[i][l];
        }
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++)
            ground[i][l] /= divide[l];
    for (int l = 0; l < LANES; l++)
        ground[n][l] = block->albedo / PI / divide[l];
    for (int i = 0; i < n; i++)
        for (int k = 0; k < n; k++)
            for (int l = 0; l < LANES; l++)
                matrix[i * n + k][l] =
                    block->mu[i] * response[i * n + k][l] + conduct[i][l] * ((i == k) - ground[k][l]);
    invert(n, matrix, gain + block->layers * n * n);
}

/* Cosines and scattering of n streams. */
static inline void set_streams(Block *block, int n)
{
    for (int i = 0; i < n; i++) {
        block->mu[i] = gauss_cosine[n - 1][i];
        for (int k = 0; k < n; k++)
            block->scatter[i * n + k] =
                phase(n, gauss_cosine[n - 1][i], gauss_cosine[n - 1][k]) * gauss_weight[n - 1][k];
    }
}

/* Lay the arrays out over memory of LANES * block_size doubles. */
static inline size_t block_size(int layers, int streams)
{
    size_t n = (size_t)streams, count = (size_t)layers;
    return (count + 1) * n * n + 2 * count * n + count + 2 * n + 1;
}

static inline void lay_block(Block *block, double *memory)
{
    size_t n = (size_t)block->n, count = (size_t)block->layers;
    block->gain = memory;
    block->source = block->gain + LANES * (count + 1) * n * n;
    block->beam = block->source + LANES * count * n;
    block->gap = block->beam + LANES * count * n;
    block->ground = block->gap + LANES * count;
    block->conduct = block->ground + LANES * (n + 1);
}

#endif
