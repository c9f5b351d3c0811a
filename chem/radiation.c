/* radiation: see radiation.h.
 *
 * Along each of the n double-Gauss cosines mu_j of a hemisphere (Sykes 1951) let u and v be half the sum and
 * half the difference of upward and downward intensity. Rayleigh scattering treats both alike, so (Feautrier
 * 1964) mu du/dt = v,    mu dv/dt = u - w (sum_k p_jk a_k u_k + p_j0 T / 4 pi), t optical depth downward, w
 * single-scattering albedo, a the weights, T the direct beam, p the azimuth-mean phase function 1 + P2(mu)
 * P2(mu') / 2. Finite volumes: u at layer middles, v at layer edges. With V = v / mu, u' - u = h V across the
 * distance h between two middles,    V' - V = (d / mu^2)(u - scattering) across a layer.
 *
 * The block tridiagonal system is eliminated downward as V = R u - p, R an n by n matrix, p the beam of one
 * sun: from middle to middle   T = (1 + h R)^-1,   R <- R T,   p <- T p through a layer         R <- R + (d /
 * mu^2)(1 - w P a),   p <- p + (d w / mu^2) p_0 T / 4 pi and solved upward as u <- T (u + h p). T and R do
 * not depend on the sun; all terms of p and u are positive, so nothing cancels however thin or thick the
 * layers; and the sum over directions of a mu^2 V is the net flux, which a layer without absorption passes on
 * unchanged, to round-off. Second order in layer depth.
 */
#include "radiation.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "radiation_block.h"

/* ---- slant paths ---- */

#define ABOVE_SCALE_KM 7.0 /* scale height of what lies above the grid's top */
#define ABOVE_SHELLS 64    /* shells of ABOVE_SCALE_KM / 8 */
#define LOWEST_COSINE (-0.3)

struct Slant {
    int layers, suns;
    double *weight; /* [suns][layers + 1][layers + 1] by sun, target (the ground last), layer (above the top
                       last) */
    int *lowest;    /* [suns][layers + 1] lowest layer the path meets; -1 when the target is in shadow */
};

/* Distance along a ray of impact parameter b between radii low and high, both at or above b. */
static double along(double b, double low, double high)
{
    double far = sqrt((high - b) * (high + b)), near = low > b ? sqrt((low - b) * (low + b)) : 0;
    return (high - low) * (high + low) / (far + near);
}

/* Mean of path length per vertical length over what lies above radius top, for a ray of impact parameter b.
 */
static double above_factor(double b, double top)
{
    const double step = ABOVE_SCALE_KM / 8;
    double sum = 0, mass = 0;
    for (int k = 0; k < ABOVE_SHELLS; k++) {
        double low = top + k * step, share = exp(-k / 8.0) - exp(-(k + 1) / 8.0);
        sum += share * along(b, fmax(low, b), low + step) / step;
        mass += share;
    }
    return sum / mass;
}

/* Path weights from radius r towards a sun of this cosine. Returns the lowest layer met, -1 in shadow. */
static int trace(int layers, const double *edge_km, double r, double cosine, double *weight)
{
    double b = r * sqrt((1 - cosine) * (1 + cosine));
    memset(weight, 0, (size_t)(layers + 1) * sizeof *weight);
    if (cosine < 0 && b < EARTH_RADIUS_KM + edge_km[0])
        return -1;
    int lowest = layers;
    for (int k = layers - 1; k >= 0; k--) {
        double low = EARTH_RADIUS_KM + edge_km[k], high = EARTH_RADIUS_KM + edge_km[k + 1], path = 0;
        if (high > r) /* beyond the target, towards the sun */
            path += along(b, fmax(low, r), high);
        if (cosine < 0 && high > b && low < r) /* down to the lowest point of the ray and up again */
            path += 2 * along(b, fmax(low, b), fmin(high, r));
        if (path > 0) {
            weight[k] = path / (high - low);
            lowest = k;
        }
    }
    weight[layers] = above_factor(b, EARTH_RADIUS_KM + edge_km[layers]);
    return lowest;
}

int slant_make(Slant **made, int layers, const double *edge_km, const double *cosine, int suns, Fault *fault)
{
    *made = NULL;
    for (int k = 0; k < layers; k++)
        if (!(edge_km[k] < edge_km[k + 1]) || !(edge_km[0] > -EARTH_RADIUS_KM))
            return fault_set(fault, FAULT_INPUT,
                             "layer edges must increase, edge %d does not; correct the grid", k + 1);
    for (int s = 0; s < suns; s++)
        if (!(cosine[s] >= LOWEST_COSINE && cosine[s] <= 1))
            return fault_set(fault, FAULT_INPUT,
                             "cosine of the solar zenith angle %g; it must lie in %g to 1", cosine[s],
                             LOWEST_COSINE);
    size_t targets = (size_t)layers + 1;
    Slant *slant = calloc(1, sizeof *slant);
    if (slant) {
        slant->layers = layers;
        slant->suns = suns;
        slant->weight = calloc((size_t)suns * targets * targets + 1, sizeof *slant->weight);
        slant->lowest = calloc((size_t)suns * targets + 1, sizeof *slant->lowest);
    }
    if (!slant || !slant->weight || !slant->lowest) {
        slant_free(slant);
        return fault_memory(fault, "slant paths");
    }
    for (int s = 0; s < suns; s++)
        for (int i = 0; i <= layers; i++) {
            size_t at = (size_t)s * targets + (size_t)i;
            double height = i < layers ? 0.5 * (edge_km[i] + edge_km[i + 1]) : edge_km[0];
            slant->lowest[at] =
                trace(layers, edge_km, EARTH_RADIUS_KM + height, cosine[s], slant->weight + at * targets);
        }
    *made = slant;
    return 0;
}

void slant_free(Slant *slant)
{
    if (!slant)
        return;
    free(slant->weight);
    free(slant->lowest);
    free(slant);
}

int slant_suns(const Slant *slant)
{
    return slant->suns;
}

const double *slant_path(const Slant *slant, int sun, int target, int *lowest)
{
    size_t targets = (size_t)slant->layers + 1, at = (size_t)sun * targets + (size_t)target;
    *lowest = slant->lowest[at];
    return *lowest < 0 ? NULL : slant->weight + at * targets;
}

double slant_column(const Slant *slant, int sun, int target, const double *vertical, double above_top)
{
    int lowest;
    const double *weight = slant_path(slant, sun, target, &lowest);
    if (!weight)
        return HUGE_VAL;
    double sum = weight[slant->layers] * above_top;
    for (int k = slant->layers - 1; k >= lowest; k--)
        sum += weight[k] * vertical[k];
    return sum;
}

void slant_columns(const Slant *slant, const double *vertical, double above_top, double *out)
{
    for (int s = 0; s < slant->suns; s++)
        for (int i = 0; i < slant->layers; i++)
            out[s * slant->layers + i] = slant_column(slant, s, i, vertical, above_top);
}

/* ---- discrete ordinates: the elimination itself is in radiation_block.h ---- */

/* One sun: its beam carried downward, then the light found from the ground up. */
static inline __attribute__((always_inline)) void substitute(const Block *block, int n, const double *direct,
                                                             const double *direct_ground, double cosine,
                                                             double *flux, double *down_ground)
{
    const size_t width = block->width;
    const int layers = block->layers;
    double(*gain)[LANES] = (double(*)[LANES])block->gain, (*source)[LANES] = (double(*)[LANES])block->source;
    double(*gap)[LANES] = (double(*)[LANES])block->gap, (*beam)[LANES] = (double(*)[LANES])block->beam;
    double(*ground)[LANES] = (double(*)[LANES])block->ground,
    (*conduct)[LANES] = (double(*)[LANES])block->conduct;
    double p[MOST_STREAMS][LANES] = {{0}}, u[MOST_STREAMS][LANES], next[MOST_STREAMS][LANES],
           into[MOST_STREAMS];
    for (int i = 0; i < n; i++)
        into[i] = phase(n, block->mu[i], cosine);
    for (int layer = layers - 1; layer >= 0; layer--) {
        double(*t)[LANES] = gain + layer * n * n;
        const double *sun = direct + (size_t)layer * width;
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                double sum = source[layer * n + i][l] * into[i] * sun[l];
                for (int k = 0; k < n; k++)
                    sum += t[i * n + k][l] * p[k][l];
                next[i][l] = sum;
            }
        memcpy(p, next, sizeof(double) * LANES * (size_t)n);
        memcpy(beam + layer * n, next, sizeof(double) * LANES * (size_t)n);
    }
    double bright[LANES], sent[LANES],
        down[LANES]; /* mu0 T, intensity of the ground by the beam alone, irradiance */
    for (int l = 0; l < LANES; l++) {
        bright[l] = fmax(cosine, 0) * direct_ground[l];
        sent[l] = ground[n][l] * bright[l];
    }
    double(*last)[LANES] = gain + layers * n * n;
    for (int i = 0; i < n; i++)
        for (int l = 0; l < LANES; l++) {
            double sum = 0;
            for (int k = 0; k < n; k++)
                sum += last[i * n + k][l] * (block->mu[k] * p[k][l] + conduct[k][l] * sent[l]);
            u[i][l] = sum;
        }
    for (int l = 0; l < LANES; l++)
        down[l] = bright[l];
    for (int k = 0; k < n; k++) /* G complete */
        for (int l = 0; l < LANES; l++)
            sent[l] += ground[k][l] * u[k][l];
    for (int k = 0; k < n; k++) {
        double share = 2 * PI * gauss_weight[n - 1][k] * block->mu[k];
        for (int l = 0; l < LANES; l++)
            down[l] += share * (sent[l] - 2 * conduct[k][l] * (sent[l] - u[k][l]));
    }
    if (down_ground)
        memcpy(down_ground, down, sizeof down);
    for (int layer = 0; layer < layers; layer++) {
        double *to = flux + (size_t)layer * width;
        const double *sun = direct + (size_t)layer * width;
        for (int l = 0; l < LANES; l++) {
            double sum = 0;
            for (int i = 0; i < n; i++)
                sum += 4 * PI * gauss_weight[n - 1][i] * u[i][l];
            to[l] = sun[l] + sum;
        }
        if (layer + 1 == layers)
            break;
        double(*t)[LANES] = gain + layer * n * n, (*q)[LANES] = beam + (layer + 1) * n;
        for (int i = 0; i < n; i++)
            for (int l = 0; l < LANES; l++) {
                double sum = 0;
                for (int k = 0; k < n; k++)
                    sum += t[i * n + k][l] * (u[k][l] + gap[layer][l] * q[k][l]);
                next[i][l] = sum;
            }
        memcpy(u, next, sizeof(double) * LANES * (size_t)n);
    }
}

static inline __attribute__((always_inline)) void solve(Block *block, int n, const double *absorption,
                                                        const double *scattering, const double *direct,
                                                        const double *direct_ground, const double *cosine,
                                                        double *flux, double *down_ground, size_t first,
                                                        size_t end)
{
    const size_t width = block->width, field = (size_t)block->layers * width;
    set_streams(block, n);
    for (size_t lane = first; lane < end; lane += LANES) {
        factorise(block, n, absorption + lane, scattering + lane);
        for (size_t s = 0; s < (size_t)block->suns; s++)
            substitute(block, n, direct + s * field + lane, direct_ground + s * width + lane, cosine[s],
                       flux + s * field + lane, down_ground ? down_ground + s * width + lane : NULL);
    }
}

size_t radiation_work(int layers, int width, int suns, int streams)
{
    (void)width; /* one block of wavelengths and one sun at a time */
    (void)suns;
    return LANES * block_size(layers, streams);
}

void radiation_solve(int suns, int layers, int width, const double *absorption, const double *scattering,
                     const double *direct, const double *direct_ground, const double *cosine, double albedo,
                     int streams, double *flux, double *down_ground, double *work)
{
    radiation_solve_part(suns, layers, width, 0, width, absorption, scattering, direct, direct_ground, cosine,
                         albedo, streams, flux, down_ground, work);
}

void radiation_solve_part(int suns, int layers, int width, int first, int end, const double *absorption,
                          const double *scattering, const double *direct, const double *direct_ground,
                          const double *cosine, double albedo, int streams, double *flux, double *down_ground,
                          double *work)
{
    size_t from = (size_t)first, to = (size_t)end;
    Block block = {.n = streams, .layers = layers, .suns = suns, .width = (size_t)width, .albedo = albedo};
    lay_block(&block, work);
    switch (streams) { /* a constant number of streams lets the compiler unroll */
    case 1:
        solve(&block, 1, absorption, scattering, direct, direct_ground, cosine, flux, down_ground, from, to);
        break;
    case 2:
        solve(&block, 2, absorption, scattering, direct, direct_ground, cosine, flux, down_ground, from, to);
        break;
    case 3:
        solve(&block, 3, absorption, scattering, direct, direct_ground, cosine, flux, down_ground, from, to);
        break;
    default:
        solve(&block, 4, absorption, scattering, direct, direct_ground, cosine, flux, down_ground, from, to);
        break;
    }
}

/* Bucholtz 1995 (Appl. Opt. 34, 2765), fit of eq. 8 and table 3, from memory; for 200 nm on, continued below
 * it. */
double radiation_rayleigh(double wavelength_nm)
{
    double w = wavelength_nm * 1e-3; /* micrometres */
    if (w <= 0.5)
        return 3.01577e-28 * pow(w, -(3.55212 + 1.35579 * w + 0.11563 / w));
    return 4.01061e-28 * pow(w, -(3.99668 + 1.10298e-3 * w + 2.71393e-2 / w));
}
