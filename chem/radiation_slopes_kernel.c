/* radiation_slopes_kernel: the loops of radiation_slopes, for one vector instruction set. */
#include "radiation_slopes_kernel.h"

#include <math.h>
#include <omp.h>

#define JOIN_(a, b) a##b
#define JOIN(a, b) JOIN_(a, b)

#define INLINE inline __attribute__((always_inline))

/* LANES wavelengths as one value, anywhere in an array of double. */
typedef double Lanes __attribute__((vector_size(LANES * sizeof(double)), aligned(sizeof(double)), may_alias));

/* What one thread needs for a layer. */
typedef struct {
    Lanes *source;      /* [layers][n] feed of one sweep */
    Lanes *beam;        /* [layers][n] */
    Lanes *light;       /* [layers][n] a g */
    Lanes *edge;        /* [layers + 1][n] a mu^2 Vg / 2 */
    Lanes *even, *tilt; /* [layers] g' q per unit of direct beam: even + P2(cosine) tilt */
    Lanes *share; /* [layers + 1] of one sun: part of the flux by the beam at each target; ground last */
} Scratch;

/* Part of the flux below which scattering is left out. */
static const double COUNTS = 1e-9;

static double legendre(double mu)
{
    return 1.5 * mu * mu - 0.5;
}

static Scratch lay_scratch(const RadiationSlopes *slopes, int thread)
{
    int n = slopes->block.n, layers = slopes->layers;
    Scratch s = {.source = (Lanes *)(slopes->scratch + (size_t)thread * slopes->each)};
    s.beam = s.source + layers * n;
    s.light = s.beam + layers * n;
    s.edge = s.light + layers * n;
    s.even = s.edge + (layers + 1) * n;
    s.tilt = s.even + layers;
    s.share = s.tilt + layers;
    return s;
}

/* Light of a source, feed [layers][n], in layers low to high, and of bright, mu0 T at the ground: u
 * [layers][n] and V [layers + 1][n]. Returns what the ground sends up. V is a quotient of differences: with
 * middles 1e-8 apart 8 digits are left, far more than the term it is part of is worth there. */
static INLINE Lanes sweep(const Block *block, int n, int low, int high, const Lanes *feed, Lanes bright,
                          Lanes *beam, Lanes *u, Lanes *v)
{
    const int layers = block->layers;
    const Lanes *gain = (const Lanes *)block->gain, *gap = (const Lanes *)block->gap;
    const Lanes *ground = (const Lanes *)block->ground, *conduct = (const Lanes *)block->conduct;
    Lanes p[MOST_STREAMS] = {{0}}, next[MOST_STREAMS];
    for (int layer = high; layer >= 0; layer--) {
        const Lanes *t = gain + layer * n * n;
        for (int i = 0; i < n; i++) {
            next[i] = layer >= low ? feed[layer * n + i] : (Lanes){0};
            for (int k = 0; k < n; k++)
                next[i] += t[i * n + k] * p[k];
        }
        for (int i = 0; i < n; i++)
            beam[layer * n + i] = p[i] = next[i];
    }
    const Lanes *last = gain + layers * n * n;
    Lanes sent = ground[n] * bright, up = sent;
    for (int k = 0; k < n; k++)
        next[k] = block->mu[k] * p[k] + conduct[k] * sent;
    for (int i = 0; i < n; i++) {
        u[i] = last[i * n] * next[0];
        for (int k = 1; k < n; k++)
            u[i] += last[i * n + k] * next[k];
    }
    for (int k = 0; k < n; k++)
        up += ground[k] * u[k];
    for (int i = 0; i < n; i++)
        v[i] = conduct[i] * (up - u[i]) / block->mu[i];
    for (int layer = 0; layer + 1 < layers; layer++) {
        const Lanes *t = gain + layer * n * n, *q = beam + (layer + 1) * n;
        Lanes *here = u + layer * n, *above = here + n, closer = 1 / gap[layer];
        for (int i = 0; i < n; i++) {
            next[i] = here[i];
            if (layer < high)
                next[i] += gap[layer] * q[i];
        }
        for (int i = 0; i < n; i++) {
            Lanes sum = t[i * n] * next[0];
            for (int k = 1; k < n; k++)
                sum += t[i * n + k] * next[k];
            above[i] = sum;
            v[(layer + 1) * n + i] = (here[i] - sum) * closer;
        }
    }
    for (int i = 0; i < n; i++)
        v[layers * n + i] = u[(layers - 1) * n + i] / (block->mu[i] + gap[layers - 1]);
    return up;
}

/* Wavelengths of one sun in [][width], at row. */
static INLINE Lanes row_of(const RadiationSlopes *slopes, const double *field, int row)
{
    return *(const Lanes *)(field + (size_t)row * slopes->width);
}

static INLINE void load(RadiationSlopes *slopes, int n, const double *absorption, const double *scattering)
{
    Block *block = &slopes->block;
    const int layers = slopes->layers;
    factorise(block, n, absorption, scattering);
    for (int k = 0; k < layers; k++)
        ((Lanes *)slopes->scatter)[k] = row_of(slopes, scattering, k) / (4 * PI);
#pragma omp parallel for schedule(static) num_threads(slopes->threads)
    for (int s = 0; s < slopes->suns; s++) {
        Scratch w = lay_scratch(slopes, omp_get_thread_num());
        const Lanes *source = (const Lanes *)block->source;
        for (int k = 0; k < layers; k++)
            for (int i = 0; i < n; i++)
                w.source[k * n + i] = source[k * n + i] * phase(n, block->mu[i], slopes->cosine[s]) *
                                      row_of(slopes, slopes->direct, s * layers + k);
        sweep(block, n, 0, layers - 1, w.source,
              fmax(slopes->cosine[s], 0) * row_of(slopes, slopes->direct_ground, s), w.beam,
              (Lanes *)slopes->light + s * layers * n, (Lanes *)slopes->edge + s * (layers + 1) * n);
    }
}

/* Light of an isotropic source in a layer, and what it makes of a beam. Returns what the ground sends up. */
static INLINE Lanes answer(const RadiationSlopes *slopes, int n, int layer, const Scratch *w)
{
    const Block *block = &slopes->block;
    const int layers = slopes->layers;
    const Lanes *scatter = (const Lanes *)slopes->scatter;
    double half[MOST_STREAMS], slanted[MOST_STREAMS];
    for (int i = 0; i < n; i++) {
        half[i] = 0.5 * gauss_weight[n - 1][i] * block->mu[i] * block->mu[i];
        slanted[i] = phase(n, block->mu[i], 1) - 1;
        w->source[layer * n + i] = (Lanes){0} + 4 * PI / (block->mu[i] * block->mu[i]);
    }
    Lanes up = sweep(block, n, layer, layer, w->source, (Lanes){0}, w->beam, w->light, w->edge);
    for (int k = 0; k < layers; k++) {
        Lanes even = {0}, tilt = {0};
        for (int i = 0; i < n; i++) {
            Lanes g = w->light[k * n + i] * gauss_weight[n - 1][i];
            even += g;
            tilt += g * slanted[i];
            w->light[k * n + i] = g;
        }
        w->even[k] = scatter[k] * even;
        w->tilt[k] = scatter[k] * tilt;
    }
    for (int k = 0; k <= layers; k++)
        for (int i = 0; i < n; i++)
            w->edge[k * n + i] *= half[i];
    return up;
}

/* share [layers + 1] of one sun, and their sum; kept: targets that count, the ground first. Returns how many.
 */
static int share_out(const RadiationSlopes *slopes, int layer, int s, const Scratch *w, Lanes up, int *kept,
                     Lanes *sum)
{
    const int layers = slopes->layers;
    double p2 = legendre(slopes->cosine[s]), bright = fmax(slopes->cosine[s], 0) / (4 * PI);
    Lanes all = w->share[layers] = up * bright * row_of(slopes, slopes->direct_ground, s);
    for (int t = 0; t < layers; t++) {
        Lanes part = w->even[t] + p2 * w->tilt[t];
        if (t == layer)
            part += 1;
        w->share[t] = part * row_of(slopes, slopes->direct, s * layers + t);
        all += w->share[t];
    }
    int count = 0;
    for (int j = 0; j <= layers; j++) {
        int t = j ? j - 1 : layers, counts = 0;
        for (int l = 0; l < LANES; l++)
            counts |= fabs(w->share[t][l]) > COUNTS * all[l];
        if (counts)
            kept[count++] = t;
    }
    *sum = all;
    return count;
}

/* The beam weakened: to[m] = - sum over targets of path weight[m] times share. Two layers at a time. */
static void weaken(const RadiationSlopes *slopes, int s, const Scratch *w, const int *kept, int count,
                   Lanes *to, int stride)
{
    const int layers = slopes->layers;
    for (int m = 0; m < layers; m += 2) {
        int next = m + 1 < layers ? m + 1 : m;
        const double *x = slopes->path + (size_t)(s * layers + m) * (size_t)(layers + 1);
        const double *y = slopes->path + (size_t)(s * layers + next) * (size_t)(layers + 1);
        Lanes a = {0}, b = {0};
        for (int j = 0; j < count; j++) {
            int t = kept[j];
            if (t < layers && t > next && slopes->cosine[s] >= 0)
                break; /* no beam comes up from below; kept is in order but for the ground */
            a += x[t] * w->share[t];
            b += y[t] * w->share[t];
        }
        to[m * stride] = -a;
        to[next * stride] = -b;
    }
}

/* The diffuse light absorbed: to[m] -= g' dK u. */
static INLINE void absorb(const RadiationSlopes *slopes, int n, int s, const Scratch *w, Lanes *to,
                          int stride)
{
    const int layers = slopes->layers;
    const Lanes *g = w->light, *vg = w->edge, *u = (const Lanes *)slopes->light + s * layers * n,
                *v = (const Lanes *)slopes->edge + s * (layers + 1) * n;
    Lanes below = {0};
    for (int i = 0; i < n; i++)
        below += vg[i] * v[i];
    for (int m = 0; m < layers; m++) {
        Lanes above = {0}, here = {0};
        for (int i = 0; i < n; i++) {
            above += vg[(m + 1) * n + i] * v[(m + 1) * n + i];
            here += g[m * n + i] * u[m * n + i];
        }
        to[m * stride] += above + below - here;
        below = above;
    }
}

static INLINE void one_layer(const RadiationSlopes *slopes, int n, int layer, const int *sun, int suns,
                             int thread, Lanes *out, Lanes *flux)
{
    Scratch w = lay_scratch(slopes, thread);
    int *kept = slopes->kept + (size_t)thread * (size_t)(slopes->layers + 1);
    Lanes up = answer(slopes, n, layer, &w), sum;
    for (int i = 0; i < suns; i++) {
        int count = share_out(slopes, layer, sun[i], &w, up, kept, &sum);
        weaken(slopes, sun[i], &w, kept, count, out + i, suns);
        absorb(slopes, n, sun[i], &w, out + i, suns);
        if (flux)
            flux[i] = sum;
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
    Lanes *to = (Lanes *)out, *whole = (Lanes *)flux;
    switch (slopes->block.n) {
    case 1: one_layer(slopes, 1, layer, sun, suns, thread, to, whole); break;
    case 2: one_layer(slopes, 2, layer, sun, suns, thread, to, whole); break;
    case 3: one_layer(slopes, 3, layer, sun, suns, thread, to, whole); break;
    default: one_layer(slopes, 4, layer, sun, suns, thread, to, whole); break;
    }
}

static void sum_suns(int layers, int suns, const double *weight, const double *change, double *sum)
{
    const Lanes *w = (const Lanes *)weight, *from = (const Lanes *)change;
    for (int m = 0; m < layers; m++) {
        Lanes all = {0};
        for (int s = 0; s < suns; s++)
            all += w[s] * from[m * suns + s];
        ((Lanes *)sum)[m] = all;
    }
}

const RadiationKernel JOIN(radiation_kernel_, KERNEL_SUFFIX) = {load_any, layer_any, sum_suns};
