/* radiation_slopes_kernel: the loops of radiation_slopes, for one vector instruction set. */
#include "radiation_slopes_kernel.h"

#include <math.h>
#include <omp.h>
#include <string.h>

#define JOIN_(a, b) a##b
#define JOIN(a, b) JOIN_(a, b)

/* What one thread needs for a layer; all but source in [...][LANES]. */
typedef struct {
    double *source;      /* [layers][n] feed of one sweep */
    double *beam;        /* [layers][n] */
    double *light;       /* [layers][n] a g */
    double *edge;        /* [layers + 1][n] a mu^2 Vg / 2 */
    double *even, *tilt; /* [layers] g' q per unit of direct beam: even + P2(cosine) tilt */
    double *share; /* [layers + 1] of one sun: part of the flux by the beam at each target; ground last */
} Scratch;

/* Part of the flux below which scattering is left out. */
static const double COUNTS = 1e-9;

static double legendre(double mu)
{
    return 1.5 * mu * mu - 0.5;
}

static Scratch lay_scratch(const RadiationSlopes *slopes, int thread)
{
    size_t n = (size_t)slopes->block.n * LANES, layers = (size_t)slopes->layers;
    Scratch s = {.source = slopes->scratch + (size_t)thread * slopes->each};
    s.beam = s.source + layers * n;
    s.light = s.beam + layers * n;
    s.edge = s.light + layers * n;
    s.even = s.edge + (layers + 1) * n;
    s.tilt = s.even + layers * LANES;
    s.share = s.tilt + layers * LANES;
    return s;
}

/* Light of a source, feed [layers][n], in layers low to high, and of bright, mu0 T at the ground: u
 * [layers][n] and V [layers + 1][n]. Returns in up what the ground sends up. V is a quotient of differences:
 * with middles 1e-8 apart 8 digits are left, far more than the term it is part of is worth there. */
static inline __attribute__((always_inline)) void sweep(const Block *block, int n, int low, int high,
                                                        const double *feed_from, const double *bright,
                                                        double *beam_to, double *light, double *edge,
                                                        double *up)
{
    const int layers = block->layers;
    const double(*feed)[LANES] = (const double(*)[LANES])feed_from;
    double(*gain)[LANES] = (double(*)[LANES])block->gain, (*gap)[LANES] = (double(*)[LANES])block->gap;
    double(*ground)[LANES] = (double(*)[LANES])block->ground,
    (*conduct)[LANES] = (double(*)[LANES])block->conduct;
    double(*beam)[LANES] = (double(*)[LANES])beam_to, (*u)[LANES] = (double(*)[LANES])light,
    (*v)[LANES] = (double(*)[LANES])edge;
    double p[MOST_STREAMS][LANES] = {{0}}, next[MOST_STREAMS][LANES];
    for (int layer = high; layer >= 0; layer--) {
        double(*t)[LANES] = gain + layer * n * n;
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                double sum = layer >= low ? feed[layer * n + i][l] : 0;
                for (int k = 0; k < n; k++)
                    sum += t[i * n + k][l] * p[k][l];
                next[i][l] = sum;
            }
        memcpy(p, next, sizeof(double) * LANES * (size_t)n);
        memcpy(beam + layer * n, next, sizeof(double) * LANES * (size_t)n);
    }
    double sent[LANES];
    for (int l = 0; l < LANES; l++)
        sent[l] = up[l] = ground[n][l] * bright[l];
    double(*last)[LANES] = gain + layers * n * n;
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++) {
            double sum = 0;
            for (int k = 0; k < n; k++)
                sum += last[i * n + k][l] * (block->mu[k] * p[k][l] + conduct[k][l] * sent[l]);
            u[i][l] = sum;
        }
    for (int k = 0; k < n; k++)
        for (int l = 0; l < LANES; l++)
            up[l] += ground[k][l] * u[k][l];
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++)
            v[i][l] = conduct[i][l] * (up[l] - u[i][l]) / block->mu[i];
    for (int layer = 0; layer + 1 < layers; layer++) {
        double(*t)[LANES] = gain + layer * n * n, (*q)[LANES] = beam + (layer + 1) * n;
        double(*here)[LANES] = u + layer * n, (*above)[LANES] = here + n;
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++)
                next[i][l] = here[i][l] + (layer < high ? gap[layer][l] * q[i][l] : 0);
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                double sum = 0;
                for (int k = 0; k < n; k++)
                    sum += t[i * n + k][l] * next[k][l];
                above[i][l] = sum;
                v[(layer + 1) * n + i][l] = (here[i][l] - sum) / gap[layer][l];
            }
    }
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++)
            v[layers * n + i][l] = u[(layers - 1) * n + i][l] / (block->mu[i] + gap[layers - 1][l]);
}

static inline __attribute__((always_inline)) void load(RadiationSlopes *slopes, int n,
                                                       const double *absorption, const double *scattering)
{
    Block *block = &slopes->block;
    const int layers = slopes->layers;
    double(*scatter)[LANES] = (double(*)[LANES])slopes->scatter;
    factorise(block, n, absorption, scattering);
    for (int k = 0; k < layers; k++)
        for (int l = 0; l < LANES; l++)
            scatter[k][l] = scattering[(size_t)k * slopes->width + (size_t)l] / (4 * PI);
#pragma omp parallel for schedule(static) num_threads(slopes->threads)
    for (int s = 0; s < slopes->suns; s++) {
        Scratch w = lay_scratch(slopes, omp_get_thread_num());
        const double *direct = slopes->direct + (size_t)(s * layers) * slopes->width;
        const double *direct_ground = slopes->direct_ground + (size_t)s * slopes->width;
        double(*source)[LANES] = (double(*)[LANES])block->source, (*feed)[LANES] = (double(*)[LANES])w.source;
        double bright[LANES], up[LANES];
        for (int l = 0; l < LANES; l++)
            bright[l] = fmax(slopes->cosine[s], 0) * direct_ground[l];
        for (int k = 0; k < layers; k++)
            for (int i = 0; i < n; i++)
                for (int l = 0; l < LANES; l++)
                    feed[k * n + i][l] = source[k * n + i][l] * phase(n, block->mu[i], slopes->cosine[s]) *
                                         direct[(size_t)k * slopes->width + (size_t)l];
        sweep(block, n, 0, layers - 1, w.source, bright, w.beam,
              slopes->light + (size_t)(s * layers * n) * LANES,
              slopes->edge + (size_t)(s * (layers + 1) * n) * LANES, up);
    }
}

/* Light of an isotropic source in a layer, and what it makes of a beam; up: what the ground sends up. */
static inline __attribute__((always_inline)) void answer(const RadiationSlopes *slopes, int n, int layer,
                                                         const Scratch *w, double *up)
{
    const Block *block = &slopes->block;
    const int layers = slopes->layers;
    const double(*scatter)[LANES] = (const double(*)[LANES])slopes->scatter, dark[LANES] = {0};
    double(*feed)[LANES] = (double(*)[LANES])w->source;
    double(*even)[LANES] = (double(*)[LANES])w->even, (*tilt)[LANES] = (double(*)[LANES])w->tilt;
    double(*g)[LANES] = (double(*)[LANES])w->light, (*v)[LANES] = (double(*)[LANES])w->edge;
    double half[MOST_STREAMS];
    for (int i = 0; i < n; i++) {
        half[i] = 0.5 * gauss_weight[n - 1][i] * block->mu[i] * block->mu[i];
        for (int l = 0; l < LANES; l++)
            feed[layer * n + i][l] = 4 * PI / (block->mu[i] * block->mu[i]);
    }
    sweep(block, n, layer, layer, w->source, dark, w->beam, w->light, w->edge, up);
    for (int k = 0; k < layers; k++) {
        for (int l = 0; l < LANES; l++)
            even[k][l] = tilt[k][l] = 0;
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                g[k * n + i][l] *= gauss_weight[n - 1][i];
                even[k][l] += scatter[k][l] * g[k * n + i][l];
                tilt[k][l] += scatter[k][l] * g[k * n + i][l] * (phase(n, block->mu[i], 1) - 1);
            }
    }
    for (int k = 0; k <= layers; k++)
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++)
                v[k * n + i][l] *= half[i];
}

/* share [layers + 1] of one sun, and their sum; kept: targets that count, the ground first. Returns how many.
 */
static int share_out(const RadiationSlopes *slopes, int layer, int s, const Scratch *w, const double *up,
                     int *kept, double *sum)
{
    const int layers = slopes->layers;
    const double *direct = slopes->direct + (size_t)(s * layers) * slopes->width;
    const double *direct_ground = slopes->direct_ground + (size_t)s * slopes->width;
    const double(*even)[LANES] = (const double(*)[LANES])w->even,
          (*tilt)[LANES] = (const double(*)[LANES])w->tilt;
    double(*share)[LANES] = (double(*)[LANES])w->share;
    double p2 = legendre(slopes->cosine[s]), bright = fmax(slopes->cosine[s], 0) / (4 * PI);
    for (int l = 0; l < LANES; l++)
        sum[l] = share[layers][l] = up[l] * bright * direct_ground[l];
    for (int t = 0; t < layers; t++)
        for (int l = 0; l < LANES; l++) {
            double part = even[t][l] + p2 * tilt[t][l] + (t == layer);
            share[t][l] = part * direct[(size_t)t * slopes->width + (size_t)l];
            sum[l] += share[t][l];
        }
    int count = 0;
    for (int j = 0; j <= layers; j++) {
        int t = j ? j - 1 : layers, counts = 0;
        for (int l = 0; l < LANES; l++)
            counts |= fabs(share[t][l]) > COUNTS * sum[l];
        if (counts)
            kept[count++] = t;
    }
    return count;
}

/* The beam weakened: to[m] = - sum over targets of path weight[m] times share. Two layers at a time. */
static void weaken(const RadiationSlopes *slopes, int s, const Scratch *w, const int *kept, int count,
                   double *out, int stride)
{
    const int layers = slopes->layers;
    const double(*share)[LANES] = (const double(*)[LANES])w->share;
    double(*to)[LANES] = (double(*)[LANES])out;
    for (int m = 0; m < layers; m += 2) {
        int next = m + 1 < layers ? m + 1 : m;
        const double *x = slopes->path + (size_t)(s * layers + m) * (size_t)(layers + 1);
        const double *y = slopes->path + (size_t)(s * layers + next) * (size_t)(layers + 1);
        double a[LANES] = {0}, b[LANES] = {0};
        for (int j = 0; j < count; j++) {
            int t = kept[j];
            if (t < layers && t > next && slopes->cosine[s] >= 0)
                break; /* no beam comes up from below; kept is in order but for the ground */
            for (int l = 0; l < LANES; l++) {
                a[l] += x[t] * share[t][l];
                b[l] += y[t] * share[t][l];
            }
        }
        for (int l = 0; l < LANES; l++) {
            to[m * stride][l] = -a[l];
            to[next * stride][l] = -b[l];
        }
    }
}

/* The diffuse light absorbed: to[m] -= g' dK u. */
static inline __attribute__((always_inline)) void absorb(const RadiationSlopes *slopes, int n, int s,
                                                         const Scratch *w, double *out, int stride)
{
    const int layers = slopes->layers;
    double(*to)[LANES] = (double(*)[LANES])out;
    const double(*g)[LANES] = (const double(*)[LANES])w->light,
          (*vg)[LANES] = (const double(*)[LANES])w->edge;
    const double(*u)[LANES] = (const double(*)[LANES])slopes->light + s * layers * n;
    const double(*v)[LANES] = (const double(*)[LANES])slopes->edge + s * (layers + 1) * n;
    double below[LANES] = {0};
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++)
            below[l] += vg[i][l] * v[i][l];
    for (int m = 0; m < layers; m++) {
        double above[LANES] = {0}, here[LANES] = {0};
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                above[l] += vg[(m + 1) * n + i][l] * v[(m + 1) * n + i][l];
                here[l] += g[m * n + i][l] * u[m * n + i][l];
            }
        for (int l = 0; l < LANES; l++) {
            to[m * stride][l] += above[l] + below[l] - here[l];
            below[l] = above[l];
        }
    }
}

static inline __attribute__((always_inline)) void one_layer(const RadiationSlopes *slopes, int n, int layer,
                                                            const int *sun, int suns, int thread, double *out,
                                                            double *flux)
{
    Scratch w = lay_scratch(slopes, thread);
    int *kept = slopes->kept + (size_t)thread * (size_t)(slopes->layers + 1);
    double up[LANES], sum[LANES];
    answer(slopes, n, layer, &w, up);
    for (int i = 0; i < suns; i++) {
        int count = share_out(slopes, layer, sun[i], &w, up, kept, sum);
        weaken(slopes, sun[i], &w, kept, count, out + i * LANES, suns);
        absorb(slopes, n, sun[i], &w, out + i * LANES, suns);
        if (flux)
            memcpy(flux + i * LANES, sum, sizeof sum);
    }
}

static void load_any(RadiationSlopes *slopes, const double *absorption, const double *scattering)
{
    switch (slopes->block.n) { /* a constant number of streams lets the compiler unroll */
    case 1: load(slopes, 1, absorption, scattering); break;
    case 2: load(slopes, 2, absorption, scattering); break;
    case 3: load(slopes, 3, absorption, scattering); break;
    default: load(slopes, 4, absorption, scattering); break;
    }
}

static void layer_any(const RadiationSlopes *slopes, int layer, const int *sun, int suns, int thread,
                      double *out, double *flux)
{
    switch (slopes->block.n) {
    case 1: one_layer(slopes, 1, layer, sun, suns, thread, out, flux); break;
    case 2: one_layer(slopes, 2, layer, sun, suns, thread, out, flux); break;
    case 3: one_layer(slopes, 3, layer, sun, suns, thread, out, flux); break;
    default: one_layer(slopes, 4, layer, sun, suns, thread, out, flux); break;
    }
}

static void sum_suns(int layers, int suns, const double *weight, const double *change, double *sum)
{
    const double(*w)[LANES] = (const double(*)[LANES])weight, (*from)[LANES] = (const double(*)[LANES])change;
    double(*to)[LANES] = (double(*)[LANES])sum;
    for (int m = 0; m < layers; m++) {
        double all[LANES] = {0};
        for (int s = 0; s < suns; s++)
            for (int l = 0; l < LANES; l++)
                all[l] += w[s][l] * from[m * suns + s][l];
        memcpy(to[m], all, sizeof all);
    }
}

const RadiationKernel JOIN(radiation_kernel_, KERNEL_SUFFIX) = {load_any, layer_any, sum_suns};
