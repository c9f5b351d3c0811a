/* photolysis_slopes: how the rates answer to what absorbs; see photolysis.h. */
#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "oxygen.h"
#include "photolysis_parts.h"
#include "radiation_slopes.h"

enum { OZONE, DIOXIDE, NITRIC_OXIDE, ABSORBERS };

typedef struct {
    RadiationSlopes *light;
    double *photons; /* [stride] photons cm-2 s-1 of the bin that come in */
    double *deepest; /* [stride] largest optical depth of O3 and NO2 in a layer */
    size_t each;     /* doubles of a thread's work */
    double *
        work; /* [threads] change [layers][suns][PACK], weight [reactions][suns][PACK], sums [layers][PACK] */
    int *list; /* [threads][reactions + suns] that matter */
} Slopes;

static void free_slopes(Slopes *slopes)
{
    radiation_slopes_free(slopes->light);
    free(slopes->photons);
    free(slopes->deepest);
    free(slopes->work);
    free(slopes->list);
}

static int make_slopes(Slopes *slopes, const Photolysis *p, const double *column, double earth_sun,
                       Fault *fault)
{
    size_t stride = (size_t)p->stride, layers = (size_t)p->layers;
    int top = p->layers - 1;
    *slopes = (Slopes){.each = ((layers + (size_t)p->reactions) * (size_t)p->suns + layers) * PACK};
    slopes->photons = calloc(stride, sizeof(double));
    slopes->deepest = calloc(stride, sizeof(double));
    slopes->work = malloc((size_t)p->threads * slopes->each * sizeof(double));
    slopes->list = malloc((size_t)p->threads * (size_t)(p->reactions + p->suns) * sizeof(int));
    int code = slopes->list && slopes->photons && slopes->deepest && slopes->work
                   ? 0
                   : fault_memory(fault, "the slopes of the light");
    if (!code)
        code =
            radiation_slopes_make(&slopes->light, p->slant, p->layers, p->above / p->air[top] / p->depth[top],
                                  p->cosine, p->albedo, STREAMS, p->threads, fault);
    if (code) {
        free_slopes(slopes);
        return code;
    }
    for (int b = 0; b < p->bins; b++)
        slopes->photons[b] = p->spectra->flux[b] * p->sunlight[b] * earth_sun;
    for (size_t k = 0; k < layers; k++)
        for (size_t b = 0; b < stride; b++)
            slopes->deepest[b] =
                fmax(slopes->deepest[b], column[k] * p->sigma_ozone[k * stride + b] +
                                             column[layers + k] * p->sigma_dioxide[k * stride + b]);
    return 0;
}

static int special_of(const Photolysis *p, int r)
{
    return p->mechanism->reaction[p->mechanism->photolysis_first + r].special;
}

static int of_oxygen(const Photolysis *p, int r)
{
    return special_of(p, r) == SPECIAL_O2 || special_of(p, r) == SPECIAL_O2_O1D;
}

/* weight [suns][PACK]: what the actinic flux in layer k counts for in the sum of reaction r, bins first to
 * first + PACK - 1. */
static void weigh(const Photolysis *p, const double *share, int r, int k, int first, double *weight)
{
    const Spectra *spectra = p->spectra;
    const double *sigma =
        p->weight + ((size_t)k * (size_t)p->reactions + (size_t)r) * (size_t)p->stride + (size_t)first;
    for (int s = 0; s < p->suns; s++) {
        double part = share[(size_t)(s * p->reactions + r) * (size_t)p->padded + (size_t)k];
        for (int l = 0; l < PACK; l++)
            weight[s * PACK + l] = part * sigma[l];
    }
    if (!of_oxygen(p, r))
        return;
    const double *yield = spectra->spectrum[spectra->reaction_yield[r]].sigma;
    double branch = p->mechanism->reaction[p->mechanism->photolysis_first + r].branch;
    for (int b = 0; b < p->parametrised; b++) {
        int bin = p->parametrised_bin[b], lane = bin - first;
        for (int s = 0; s < p->suns && lane >= 0 && lane < PACK; s++)
            weight[s * PACK + lane] +=
                share[(size_t)(s * p->reactions + r) * (size_t)p->padded + (size_t)k] * branch * yield[bin] *
                p->sigma_oxygen[(size_t)(s * p->layers + k) * (size_t)p->parametrised + (size_t)b];
    }
}

/* Does it matter to a sum in layer k what the absorbers do in these bins? Marks the suns by which it does. */
static int matters(const Photolysis *p, const Slopes *slopes, const double *weight, int k, int first,
                   double sum, int *marked)
{
    int any = 0;
    for (int s = 0; s < p->suns; s++) {
        const double *flux = p->flux + (size_t)(s * p->layers + k) * (size_t)p->stride + (size_t)first;
        double most = 0;
        for (int l = 0; l < PACK; l++)
            most += fabs(weight[s * PACK + l]) * flux[l] * slopes->deepest[first + l];
        if (most > PHOTOLYSIS_COUNTS * fabs(sum))
            any = marked[s] = 1;
    }
    return any;
}

static double add_lanes(const double *x)
{
    return ((x[0] + x[4]) + (x[2] + x[6])) + ((x[1] + x[5]) + (x[3] + x[7]));
}

/* slope [ABSORBERS][layers] of one reaction += change [layers][PACK] by depth times what absorbs. */
static void add_up(const Photolysis *p, const Slopes *slopes, const double *change, int first, double *slope)
{
    const double *photons = slopes->photons + first;
    for (int m = 0; m < p->layers; m++) {
        const double *sigma_ozone = p->sigma_ozone + (size_t)m * (size_t)p->stride + (size_t)first;
        const double *sigma_dioxide = p->sigma_dioxide + (size_t)m * (size_t)p->stride + (size_t)first;
        double ozone[PACK], dioxide[PACK];
        for (int l = 0; l < PACK; l++) {
            double here = change[m * PACK + l] * photons[l];
            ozone[l] = here * sigma_ozone[l];
            dioxide[l] = here * sigma_dioxide[l];
        }
        slope[OZONE * p->layers + m] += add_lanes(ozone) * p->depth[m];
        slope[DIOXIDE * p->layers + m] += add_lanes(dioxide) * p->depth[m];
    }
}

/* Bins first to first + PACK - 1 of every reaction but NO in layer k. */
static void one_layer(const Photolysis *p, const Slopes *slopes, const double *share, const double *sum,
                      int k, int first, double *slope)
{
    const int thread = omp_get_thread_num();
    const size_t each = (size_t)p->suns * PACK;
    double *change = slopes->work + (size_t)thread * slopes->each;
    double *weight = change + (size_t)p->layers * each, *together = weight + (size_t)p->reactions * each;
    int *reaction = slopes->list + thread * (p->reactions + p->suns), *sun = reaction + p->reactions;
    int reactions = 0, suns = 0;
    memset(sun, 0, (size_t)p->suns * sizeof *sun);
    for (int r = 0; r < p->reactions; r++) {
        double *to = weight + (size_t)reactions * each;
        if (special_of(p, r) == SPECIAL_NO ||
            (!of_oxygen(p, r) && (first < p->first[r] || first >= p->end[r])))
            continue;
        weigh(p, share, r, k, first, to);
        if (matters(p, slopes, to, k, first, sum[r * p->padded + k], sun))
            reaction[reactions++] = r;
    }
    for (int s = 0; s < p->suns; s++) /* marks into a list */
        if (sun[s])
            sun[suns++] = s;
    if (!reactions)
        return;
    radiation_slopes_layer(slopes->light, k, sun, suns, thread, change, NULL);
    for (int i = 0; i < reactions; i++) {
        double *of = weight + (size_t)i * each;
        for (int n = 0; n < suns; n++) /* the suns listed, side by side */
            memmove(of + n * PACK, of + sun[n] * PACK, PACK * sizeof *of);
        radiation_slopes_sum(slopes->light, of, change, suns, together);
        add_up(p, slopes, together, first, slope + (size_t)reaction[i] * ABSORBERS * (size_t)p->layers);
    }
}

/* NO + hv, which sees the direct beam alone: nitric_oxide_rates of photolysis.c, differentiated. */
static void nitric_oxide(const Photolysis *p, const Slopes *slopes, const double *share,
                         const double *density, double earth_sun, int r, int k, double *slope)
{
    const size_t special = (size_t)p->parametrised, stride = (size_t)p->stride;
    double *light = slopes->work + (size_t)omp_get_thread_num() * slopes->each; /* [parametrised] */
    int layers = p->layers, top = layers - 1;
    double branch = p->mechanism->reaction[p->mechanism->photolysis_first + r].branch;
    for (int s = 0; s < p->suns; s++) {
        const size_t at = (size_t)(s * layers + k);
        const double *clear = p->clear + at * special;
        double part = share[(size_t)(s * p->reactions + r) * (size_t)p->padded + (size_t)k] * branch;
        double column = 0, bend = 0;
        memset(light, 0, special * sizeof *light);
        for (int m = top; m >= 0; m--)
            column += radiation_slopes_path(slopes->light, s, k, m) * density[m] * p->depth[m];
        for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++) {
            const NitricOxideInterval *interval = &p->spectra->nitric_oxide->interval[i];
            const double *opacity = p->opacity + (at * NITRIC_OXIDE_INTERVALS + (size_t)i) * OXYGEN_TERMS;
            double factor = part * interval->flux * earth_sun * p->efficiency[k * NITRIC_OXIDE_INTERVALS + i];
            double sigma = nitric_oxide_cross_section(interval, opacity, column);
            double steep = nitric_oxide_cross_section_slope(interval, opacity, column);
            for (size_t b = 0; b < special; b++) {
                double here = factor * p->overlap[(size_t)i * special + b] *
                              p->sunlight[p->parametrised_bin[b]] * clear[b];
                light[b] += here * sigma;
                bend += here * steep;
            }
        }
        for (int m = 0; m < layers; m++) {
            double length = radiation_slopes_path(slopes->light, s, k, m) * p->depth[m];
            double ozone = 0, dioxide = 0;
            for (size_t b = 0; b < special; b++) {
                size_t bin = (size_t)m * stride + (size_t)p->parametrised_bin[b];
                ozone -= light[b] * p->sigma_ozone[bin];
                dioxide -= light[b] * p->sigma_dioxide[bin];
            }
            slope[OZONE * layers + m] += length * ozone;
            slope[DIOXIDE * layers + m] += length * dioxide;
            slope[NITRIC_OXIDE * layers + m] += length * bend;
        }
    }
}

int photolysis_slopes(Photolysis *photolysis, const double *share, const double *sum, const double *column,
                      const double *density, double earth_sun, double *slope, Fault *fault)
{
    const Photolysis *p = photolysis;
    const size_t row = ABSORBERS * (size_t)p->layers, set = (size_t)p->reactions * row;
    Slopes slopes;
    if (make_slopes(&slopes, p, column, earth_sun, fault))
        return fault->code;
    memset(slope, 0, (size_t)p->layers * set * sizeof *slope);
    for (int first = 0; first < p->stride; first += PACK) {
        radiation_slopes_load(slopes.light, p->stride, first, p->absorb, p->scatter, p->direct,
                              p->ground_direct);
#pragma omp parallel for schedule(dynamic, 1) num_threads(p->threads)
        for (int k = 0; k < p->layers; k++) /* one thread adds up a layer, in the order of the bins */
            one_layer(p, &slopes, share, sum, k, first, slope + (size_t)k * set);
    }
    for (int r = 0; r < p->reactions; r++)
        for (int k = 0; special_of(p, r) == SPECIAL_NO && k < p->layers; k++)
            nitric_oxide(p, &slopes, share, density, earth_sun, r, k,
                         slope + (size_t)k * set + (size_t)r * row);
    free_slopes(&slopes);
    return 0;
}
