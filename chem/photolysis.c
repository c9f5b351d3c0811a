/* photolysis: see photolysis.h.
 *
 *     J = sum over bins of sigma(T) phi(T, M) F,    F = actinic flux of the bin at the layer's middle.
 *
 * What depends on air alone is kept: sigma phi of every reaction and layer, Rayleigh scattering, O2. A call
 * then
 *   1. adds up the optical depth of each layer (O3, NO2, O2, Rayleigh) and slants it towards each sun: direct
 * beam
 *   2. solves for the diffuse light (radiation.h)
 *   3. multiplies the flux into sigma phi.
 * O2 in the parametrised bins (oxygen.h): the direct beam of every gas is what R_M lets pass times what the
 * other absorbers let pass. Diffuse light there meets O2 as an ordinary absorber with the cross section -d ln
 * R_M / dN at the vertical column times DIFFUSIVITY, since scattered light has come down at all angles. O2 is
 * dissociated by direct and diffuse light alike with R_D / R_M at the slant column of the sun.
 * Gas above the grid's top: O2 by air_above_top; O3, NO2 and NO with the mole fraction of the top layer. It
 * weakens the direct beam and scatters nothing back.
 */
#include "photolysis.h"

#include <math.h>
#include <omp.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "oxygen.h"
#include "photolysis_parts.h"

/* Mean secant of diffuse light (Elsasser 1942). 1 or 3 instead changes global-mean rates by under 0.6 %. */
#define DIFFUSIVITY 1.66
#define NITROGEN_SHARE 0.78084 /* N2 in dry air (U.S. Standard Atmosphere 1976); quenches NO */
#define CHUNK 16               /* bins whose slant depth is summed side by side */
#define ALIGNMENT 64

/* ---- making ---- */

/* Hand out the next array of count doubles from the block; while base is NULL only the need is counted. */
static double *take(char *base, size_t *used, size_t count)
{
    double *array = base ? (double *)(void *)(base + *used) : NULL;
    *used += (count * sizeof(double) + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT;
    return array;
}

static size_t lay_out(Photolysis *p, char *base)
{
    size_t layers = (size_t)p->layers, suns = (size_t)p->suns, stride = (size_t)p->stride, used = 0;
    size_t special = (size_t)p->parametrised, field = layers * stride;
    p->cosine = take(base, &used, suns);
    p->temperature = take(base, &used, layers);
    p->air = take(base, &used, layers);
    p->depth = take(base, &used, layers);
    p->sunlight = take(base, &used, stride);
    p->weight = take(base, &used, field * (size_t)p->reactions);
    p->sigma_ozone = take(base, &used, field);
    p->sigma_dioxide = take(base, &used, field);
    p->absorb_air = take(base, &used, field);
    p->scatter = take(base, &used, field);
    p->extinct_air = take(base, &used, field + stride);
    p->passed = take(base, &used, suns * (layers + 1) * special);
    p->sigma_oxygen = take(base, &used, suns * layers * special);
    p->opacity = take(base, &used, suns * layers * NITRIC_OXIDE_INTERVALS * OXYGEN_TERMS);
    p->overlap = take(base, &used, NITRIC_OXIDE_INTERVALS * special);
    p->efficiency = take(base, &used, layers * NITRIC_OXIDE_INTERVALS);
    p->absorb = take(base, &used, field);
    p->extinct = take(base, &used, field + stride);
    p->clear = take(base, &used, suns * layers * special);
    p->direct = take(base, &used, suns * field);
    p->ground_direct = take(base, &used, suns * stride);
    p->flux = take(base, &used, suns * field);
    p->ground = take(base, &used, suns * stride);
    p->column = take(base, &used, layers + 1);
    p->work = take(base, &used, (size_t)p->threads * radiation_work(p->layers, p->stride, p->suns, STREAMS));
    return used;
}

/* The light of an NO interval is that of the parametrised bins it lies in, by width; none outside the bins.
 */
static void find_overlap(Photolysis *p)
{
    for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++) {
        const NitricOxideInterval *interval = &p->spectra->nitric_oxide->interval[i];
        for (int b = 0; b < p->parametrised; b++) {
            int bin = p->parametrised_bin[b];
            double low = fmax(interval->lower, p->spectra->lower[bin]);
            double high = fmin(interval->upper, p->spectra->upper[bin]);
            p->overlap[i * p->parametrised + b] = fmax(high - low, 0) / (interval->upper - interval->lower);
        }
    }
}

static double fixed_share(const Mechanism *mechanism, const char *name, double otherwise)
{
    for (int i = 0; i < mechanism->species; i++)
        if (mechanism->item[i].role == ROLE_FIXED && strcmp(mechanism->item[i].name, name) == 0)
            return mechanism->item[i].share;
    return otherwise;
}

static int allocate(Photolysis *p, Fault *fault)
{
    p->parametrised_bin = calloc((size_t)p->bins, sizeof *p->parametrised_bin);
    p->first = calloc((size_t)p->reactions + 1, sizeof *p->first);
    p->end = calloc((size_t)p->reactions + 1, sizeof *p->end);
    if (!p->parametrised_bin || !p->first || !p->end)
        return fault_memory(fault, "photolysis");
    for (int k = 0; k < p->bins; k++)
        if (oxygen_parametrised(p->spectra, k))
            p->parametrised_bin[p->parametrised++] = k;
    size_t size = lay_out(p, NULL);
    p->block = aligned_alloc(ALIGNMENT, size);
    if (!p->block)
        return fault_memory(fault, "photolysis rates");
    memset(p->block, 0, size);
    lay_out(p, p->block);
    return 0;
}

int photolysis_make(Photolysis **made, const Mechanism *mechanism, const Spectra *spectra, int layers,
                    int padded, const double *edge_km, const double *temperature, const double *air,
                    const double *depth, double air_above_top, const double *cosine, int suns, double albedo,
                    Fault *fault)
{
    *made = NULL;
    double oxygen_share = fixed_share(mechanism, "O2", -1);
    if (oxygen_share < 0)
        return fault_set(fault, FAULT_INPUT,
                         "the mechanism has no species O2 of role fixed, which absorbs sunlight; add it");
    if (!(albedo >= 0 && albedo <= 1))
        return fault_set(fault, FAULT_INPUT, "ground albedo %g; it must lie in 0 to 1", albedo);
    Photolysis *p = calloc(1, sizeof *p);
    if (!p)
        return fault_memory(fault, "photolysis");
    p->mechanism = mechanism;
    p->spectra = spectra;
    p->layers = layers;
    p->padded = padded;
    p->suns = suns;
    p->threads = omp_get_max_threads();
    p->bins = spectra->bins;
    p->stride = PACK_ROUND(spectra->bins);
    p->reactions = mechanism->surface_first - mechanism->photolysis_first;
    p->oxygen_share = oxygen_share;
    p->nitrogen_share = fixed_share(mechanism, "N2", NITROGEN_SHARE);
    p->albedo = albedo;
    if (slant_make(&p->slant, layers, edge_km, cosine, suns, fault) || allocate(p, fault)) {
        photolysis_free(p);
        return fault->code;
    }
    memcpy(p->cosine, cosine, (size_t)suns * sizeof *cosine);
    for (int b = 0; b < p->stride; b++)
        p->sunlight[b] = 1;
    find_overlap(p);
    photolysis_set_air(p, temperature, air, depth, air_above_top);
    *made = p;
    return 0;
}

void photolysis_free(Photolysis *photolysis)
{
    if (!photolysis)
        return;
    slant_free(photolysis->slant);
    free(photolysis->parametrised_bin);
    free(photolysis->first);
    free(photolysis->end);
    free(photolysis->block);
    free(photolysis);
}

/* The scratch of the threads, of which the two may have a different number, stands last in the block. */
void photolysis_copy(Photolysis *to, const Photolysis *from)
{
    size_t used = (size_t)((const char *)from->work - (const char *)from->block);
    memcpy(to->block, from->block, used);
    memcpy(to->first, from->first, (size_t)from->reactions * sizeof *from->first);
    memcpy(to->end, from->end, (size_t)from->reactions * sizeof *from->end);
    to->above = from->above;
}

/* ---- what depends on air ---- */

/* One spectrum at a temperature: linear in T of sigma or of log sigma, held beyond the table's ends. */
static void at_temperature(const Spectrum *spectrum, int bins, double temperature, double *out)
{
    int last = spectrum->temperatures - 1, i = 0;
    while (i < last - 1 && temperature > spectrum->temperature[i + 1])
        i++;
    const double *low = spectrum->sigma + (size_t)i * (size_t)bins, *high = last > 0 ? low + bins : low;
    double t = 0;
    if (last > 0) {
        t = (temperature - spectrum->temperature[i]) /
            (spectrum->temperature[i + 1] - spectrum->temperature[i]);
        t = fmin(fmax(t, 0), 1);
    }
    for (int b = 0; b < bins; b++) {
        if (spectrum->logarithmic && low[b] > 0 && high[b] > 0)
            out[b] = low[b] * exp(t * log(high[b] / low[b]));
        else
            out[b] = low[b] + t * (high[b] - low[b]);
    }
}

/* sigma phi of one reaction in one layer. Zero where oxygen_rates or nitric_oxide_rates take over. */
static void weigh(const Photolysis *p, int r, int layer, double *yield, double *out)
{
    const Spectra *spectra = p->spectra;
    const Reaction *reaction = &p->mechanism->reaction[p->mechanism->photolysis_first + r];
    int sigma = spectra->reaction_sigma[r], phi = spectra->reaction_yield[r], of_oxygen = 0;
    if (reaction->special == SPECIAL_NO)
        return;
    if (reaction->special != SPECIAL_NONE) {
        sigma = spectra->oxygen;
        of_oxygen = 1;
    }
    at_temperature(&spectra->spectrum[sigma], p->bins, p->temperature[layer], out);
    if (phi < 0) {
        for (int b = 0; b < p->bins; b++)
            out[b] *= reaction->phi * reaction->branch;
        return;
    }
    const Spectrum *table = &spectra->spectrum[phi];
    at_temperature(table, p->bins, p->temperature[layer], yield);
    for (int b = 0; b < p->bins; b++) {
        double y = yield[b];
        if (table->stern_volmer) /* 1 / (1 / y + sv M), written so that no yield is zero yield */
            y /= 1 + y * table->stern_volmer[b] * p->air[layer];
        if (reaction->yield_complement)
            y = 1 - y;
        out[b] *= of_oxygen && oxygen_parametrised(spectra, b) ? 0 : y * reaction->branch;
    }
}

static void set_weights(Photolysis *p)
{
    size_t stride = (size_t)p->stride, reactions = (size_t)p->reactions;
    size_t work = radiation_work(p->layers, p->stride, p->suns, STREAMS);
#pragma omp parallel for schedule(dynamic, 1) num_threads(p->threads)
    for (int r = 0; r < p->reactions; r++) {
        double *yield =
            p->work + (size_t)omp_get_thread_num() * work; /* free between calls, and longer than the bins */
        p->first[r] = p->stride;
        p->end[r] = 0;
        for (int k = 0; k < p->layers; k++) {
            double *to = p->weight + ((size_t)k * reactions + (size_t)r) * stride;
            weigh(p, r, k, yield, to);
            for (int b = 0; b < p->bins; b++)
                if (to[b] > 0) {
                    p->first[r] = b < p->first[r] ? b / PACK * PACK : p->first[r];
                    p->end[r] = b >= p->end[r] ? (b / PACK + 1) * PACK : p->end[r];
                }
        }
    }
}

/* O2 and Rayleigh optical depth of the layers and above the top. Unused lanes copy the last bin. */
static void set_depths(Photolysis *p)
{
    const Spectra *spectra = p->spectra;
    size_t stride = (size_t)p->stride;
    double *oxygen = p->ground; /* free between calls, and as long as the bins */
    double overhead = p->oxygen_share * p->above;
    for (int k = p->layers; k >= 0; k--) {
        double air = k < p->layers ? p->air[k] * p->depth[k] : p->above;
        at_temperature(&spectra->spectrum[spectra->oxygen], p->bins,
                       p->temperature[k < p->layers ? k : k - 1], oxygen);
        double column = DIFFUSIVITY * (overhead + (k < p->layers ? 0.5 * p->oxygen_share * air : 0));
        for (size_t lane = 0; lane < stride; lane++) {
            int b = lane < (size_t)p->bins ? (int)lane : p->bins - 1;
            double rayleigh = air * radiation_rayleigh(0.5 * (spectra->lower[b] + spectra->upper[b]));
            int special = oxygen_parametrised(spectra, b);
            double absorbed =
                p->oxygen_share * air * (special ? oxygen_extinction(spectra, b, column) : oxygen[b]);
            p->extinct_air[(size_t)k * stride + lane] = rayleigh + (special ? 0 : absorbed);
            if (k < p->layers) {
                p->scatter[(size_t)k * stride + lane] = rayleigh;
                p->absorb_air[(size_t)k * stride + lane] = absorbed;
            }
        }
        overhead += k < p->layers ? p->oxygen_share * air : 0;
    }
}

static void set_efficiency(Photolysis *p)
{
    for (int k = 0; k < p->layers; k++)
        for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++)
            p->efficiency[k * NITRIC_OXIDE_INTERVALS + i] = nitric_oxide_efficiency(
                &p->spectra->nitric_oxide->interval[i], p->nitrogen_share * p->air[k]);
}

static void set_oxygen(Photolysis *p)
{
    const Spectra *spectra = p->spectra;
    for (int k = 0; k < p->layers; k++)
        p->column[k] = p->oxygen_share * p->air[k] * p->depth[k];
    for (int s = 0; s < p->suns; s++)
        for (int k = 0; k <= p->layers; k++) {
            double column = slant_column(p->slant, s, k, p->column, p->oxygen_share * p->above);
            double *passed = p->passed + (size_t)(s * (p->layers + 1) + k) * (size_t)p->parametrised;
            for (int b = 0; b < p->parametrised; b++)
                passed[b] = oxygen_transmission(spectra, p->parametrised_bin[b], column);
            if (k == p->layers)
                continue;
            size_t at = (size_t)(s * p->layers + k);
            for (int b = 0; b < p->parametrised; b++)
                p->sigma_oxygen[at * (size_t)p->parametrised + (size_t)b] =
                    oxygen_cross_section(spectra, p->parametrised_bin[b], column);
            double *opacity = p->opacity + at * NITRIC_OXIDE_INTERVALS * OXYGEN_TERMS;
            for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++)
                nitric_oxide_opacity(&spectra->nitric_oxide->interval[i], column, opacity + i * OXYGEN_TERMS);
        }
}

void photolysis_set_sunlight(Photolysis *photolysis, const double *factor)
{
    memcpy(photolysis->sunlight, factor, (size_t)photolysis->bins * sizeof *factor);
}

void photolysis_set_air(Photolysis *photolysis, const double *temperature, const double *air,
                        const double *depth, double air_above_top)
{
    Photolysis *p = photolysis;
    size_t stride = (size_t)p->stride, length = (size_t)p->layers * sizeof *air;
    /* layers that keep their mass keep what O2 and Rayleigh scattering do to the light */
    int same = p->above == air_above_top && p->spectra->spectrum[p->spectra->oxygen].temperatures == 1;
    for (int k = 0; same && k < p->layers; k++)
        same = fabs(air[k] * depth[k] - p->air[k] * p->depth[k]) <= 1e-12 * p->air[k] * p->depth[k];
    memcpy(p->temperature, temperature, length);
    memcpy(p->air, air, length);
    memcpy(p->depth, depth, length);
    p->above = air_above_top;
    for (int k = 0; k < p->layers; k++) {
        const Spectra *spectra = p->spectra;
        at_temperature(&spectra->spectrum[spectra->ozone], p->bins, temperature[k],
                       p->sigma_ozone + (size_t)k * stride);
        at_temperature(&spectra->spectrum[spectra->nitrogen_dioxide], p->bins, temperature[k],
                       p->sigma_dioxide + (size_t)k * stride);
    }
    set_weights(p);
    set_efficiency(p);
    if (same)
        return;
    set_depths(p);
    set_oxygen(p);
}

/* ---- one call ---- */

/* Optical depths with O3 and NO2 added. */
static void add_gases(Photolysis *p, const double *ozone, const double *dioxide)
{
    size_t stride = (size_t)p->stride;
    int top = p->layers - 1;
    for (int k = 0; k <= p->layers; k++) {
        int at = k < p->layers ? k : top;
        double length = k < p->layers ? p->depth[k] : p->above / p->air[top];
        double o3 = ozone[at] * length, no2 = dioxide ? dioxide[at] * length : 0;
        const double *s3 = p->sigma_ozone + (size_t)at * stride, *s2 = p->sigma_dioxide + (size_t)at * stride;
        double *extinct = p->extinct + (size_t)k * stride, *absorb = p->absorb + (size_t)at * stride;
        const double *extinct_air = p->extinct_air + (size_t)k * stride,
                     *absorb_air = p->absorb_air + (size_t)at * stride;
        for (size_t b = 0; b < stride; b++)
            extinct[b] = extinct_air[b] + o3 * s3[b] + no2 * s2[b];
        if (k < p->layers)
            for (size_t b = 0; b < stride; b++)
                absorb[b] = absorb_air[b] + o3 * s3[b] + no2 * s2[b];
    }
}

/* out = exp(-sum of weight[k] extinct[k] over the path) for all bins. */
static void beam(const Photolysis *p, int sun, int target, double *out)
{
    const size_t stride = (size_t)p->stride;
    int lowest;
    const double *weight = slant_path(p->slant, sun, target, &lowest);
    if (!weight) {
        memset(out, 0, stride * sizeof *out);
        return;
    }
    size_t lane = 0;
    for (; lane + CHUNK <= stride; lane += CHUNK) {
        double sum[CHUNK] = {0};
        for (int k = p->layers; k >= lowest; k--) {
            const double *extinct = p->extinct + (size_t)k * stride + lane, w = weight[k];
            for (int l = 0; l < CHUNK; l++)
                sum[l] += w * extinct[l];
        }
        for (int l = 0; l < CHUNK; l++)
            out[lane + (size_t)l] = exp(-sum[l]);
    }
    for (; lane < stride; lane++) {
        double sum = 0;
        for (int k = p->layers; k >= lowest; k--)
            sum += weight[k] * p->extinct[(size_t)k * stride + lane];
        out[lane] = exp(-sum);
    }
}

static void beams(Photolysis *p)
{
    size_t stride = (size_t)p->stride, special = (size_t)p->parametrised;
#pragma omp parallel for schedule(static)
    for (int s = 0; s < p->suns; s++)
        for (int k = 0; k <= p->layers; k++) {
            size_t at = (size_t)(s * p->layers + k);
            double *to = k < p->layers ? p->direct + at * stride : p->ground_direct + (size_t)s * stride;
            const double *passed = p->passed + (size_t)(s * (p->layers + 1) + k) * special;
            beam(p, s, k, to);
            for (size_t b = 0; b < special; b++) {
                double *bin = to + p->parametrised_bin[b];
                if (k < p->layers)
                    p->clear[at * special + b] = *bin;
                *bin *= passed[b];
            }
        }
}

/* rate[r] at one layer for two suns at once: the sum over bins in PACK partial sums, added up in fixed order.
 */
static void multiply(const Photolysis *p, const double *weight, const double *flux_a, const double *flux_b,
                     double *rate_a, double *rate_b)
{
    for (int r = 0; r < p->reactions; r++) {
        const double *w = weight + (size_t)r * (size_t)p->stride;
        double a[PACK] = {0}, b[PACK] = {0};
        for (int bin = p->first[r]; bin < p->end[r]; bin += PACK)
            for (int l = 0; l < PACK; l++) {
                a[l] += w[bin + l] * flux_a[bin + l];
                b[l] += w[bin + l] * flux_b[bin + l];
            }
        rate_a[(size_t)r * (size_t)p->padded] =
            ((a[0] + a[4]) + (a[2] + a[6])) + ((a[1] + a[5]) + (a[3] + a[7]));
        rate_b[(size_t)r * (size_t)p->padded] =
            ((b[0] + b[4]) + (b[2] + b[6])) + ((b[1] + b[5]) + (b[3] + b[7]));
    }
}

/* The parametrised bins of O2 + hv. */
static void oxygen_rates(const Photolysis *p, int r, double *rate)
{
    const Spectra *spectra = p->spectra;
    const double *yield = spectra->spectrum[spectra->reaction_yield[r]].sigma;
    double branch = p->mechanism->reaction[p->mechanism->photolysis_first + r].branch;
    for (int s = 0; s < p->suns; s++)
        for (int k = 0; k < p->layers; k++) {
            size_t at = (size_t)(s * p->layers + k);
            const double *flux = p->flux + at * (size_t)p->stride;
            const double *sigma = p->sigma_oxygen + at * (size_t)p->parametrised;
            double sum = 0;
            for (int b = 0; b < p->parametrised; b++)
                sum += flux[p->parametrised_bin[b]] * sigma[b] * yield[p->parametrised_bin[b]];
            rate[(size_t)(s * p->reactions + r) * (size_t)p->padded + (size_t)k] += branch * sum;
        }
}

/* NO + hv after Minschwaner and Siskind (1993): direct beam only, since the light is gone where much is
 * scattered. */
static void nitric_oxide_rates(Photolysis *p, int r, const double *nitric_oxide, double earth_sun,
                               double *rate)
{
    int top = p->layers - 1;
    double branch = p->mechanism->reaction[p->mechanism->photolysis_first + r].branch;
    for (int k = 0; k < p->layers; k++)
        p->column[k] = nitric_oxide ? nitric_oxide[k] * p->depth[k] : 0;
    double above = nitric_oxide ? nitric_oxide[top] / p->air[top] * p->above : 0;
    for (int s = 0; s < p->suns; s++)
        for (int k = 0; k < p->layers; k++) {
            size_t at = (size_t)(s * p->layers + k);
            double column = slant_column(p->slant, s, k, p->column, above), sum = 0;
            const double *clear = p->clear + at * (size_t)p->parametrised;
            if (column == HUGE_VAL)
                continue;
            for (int i = 0; i < NITRIC_OXIDE_INTERVALS; i++) {
                const NitricOxideInterval *interval = &p->spectra->nitric_oxide->interval[i];
                const double *opacity = p->opacity + (at * NITRIC_OXIDE_INTERVALS + (size_t)i) * OXYGEN_TERMS;
                double light = 0;
                for (int b = 0; b < p->parametrised; b++)
                    light +=
                        p->overlap[i * p->parametrised + b] * p->sunlight[p->parametrised_bin[b]] * clear[b];
                sum += interval->flux * earth_sun * light * p->efficiency[k * NITRIC_OXIDE_INTERVALS + i] *
                       nitric_oxide_cross_section(interval, opacity, column);
            }
            rate[(size_t)(s * p->reactions + r) * (size_t)p->padded + (size_t)k] = branch * sum;
        }
}

static int is_nitric_oxide(const Photolysis *p, int r)
{
    return p->mechanism->reaction[p->mechanism->photolysis_first + r].special == SPECIAL_NO;
}

/* Padding lanes of a reaction repeat the top layer. */
static void pad(const Photolysis *p, int r, double *rate)
{
    for (int s = 0; s < p->suns; s++) {
        double *row = rate + (size_t)(s * p->reactions + r) * (size_t)p->padded;
        for (int k = p->layers; k < p->padded; k++)
            row[k] = row[p->layers - 1];
    }
}

static void all_rates(Photolysis *p, const double *nitric_oxide, double earth_sun, double *rate)
{
    size_t stride = (size_t)p->stride, set = (size_t)p->reactions * (size_t)p->padded;
#pragma omp parallel for schedule(                                                                           \
    static) /* layers are independent: the same bits for any number of threads */
    for (int k = 0; k < p->layers; k++)
        for (int s = 0; s < p->suns; s += 2) {
            int t = s + 1 < p->suns ? s + 1 : s; /* an odd last sun goes with itself */
            multiply(p, p->weight + (size_t)k * (size_t)p->reactions * stride,
                     p->flux + (size_t)(s * p->layers + k) * stride,
                     p->flux + (size_t)(t * p->layers + k) * stride, rate + (size_t)s * set + k,
                     rate + (size_t)t * set + k);
        }
    for (int r = 0; r < p->reactions; r++) {
        int special = p->mechanism->reaction[p->mechanism->photolysis_first + r].special;
        if (special == SPECIAL_O2 || special == SPECIAL_O2_O1D)
            oxygen_rates(p, r, rate);
        if (is_nitric_oxide(p, r))
            nitric_oxide_rates(p, r, nitric_oxide, earth_sun, rate);
        pad(p, r, rate);
    }
}

/* Actinic flux of every sun, the wavelengths shared out among the threads. */
static void scatter_light(Photolysis *p)
{
    size_t work = radiation_work(p->layers, p->stride, p->suns, STREAMS);
#pragma omp parallel for schedule(dynamic, 1) num_threads(p->threads)
    for (int first = 0; first < p->stride; first += PACK)
        radiation_solve_part(p->suns, p->layers, p->stride, first, first + PACK, p->absorb, p->scatter,
                             p->direct, p->ground_direct, p->cosine, p->albedo, STREAMS, p->flux, p->ground,
                             p->work + (size_t)omp_get_thread_num() * work);
}

void photolysis_rates(Photolysis *photolysis, const double *ozone, const double *nitrogen_dioxide,
                      const double *nitric_oxide, double earth_sun, double *rate)
{
    Photolysis *p = photolysis;
    size_t stride = (size_t)p->stride;
    add_gases(p, ozone, nitrogen_dioxide);
    beams(p);
    scatter_light(p);
#pragma omp parallel for schedule(static)
    for (size_t row = 0; row < (size_t)p->suns * (size_t)p->layers; row++)
        for (size_t b = 0; b < stride; b++)
            p->flux[row * stride + b] *=
                b < (size_t)p->bins ? p->spectra->flux[b] * p->sunlight[b] * earth_sun : 0;
    all_rates(p, nitric_oxide, earth_sun, rate);
}

const double *photolysis_actinic(const Photolysis *photolysis)
{
    return photolysis->flux;
}

const double *photolysis_ground(const Photolysis *photolysis)
{
    return photolysis->ground;
}

int photolysis_stride(const Photolysis *photolysis)
{
    return photolysis->stride;
}
