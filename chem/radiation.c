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

/* ---- discrete ordinates ---- */

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
    for (int i = 0; i < n; i++) {
        block->mu[i] = gauss_cosine[n - 1][i];
        for (int k = 0; k < n; k++)
            block->scatter[i * n + k] =
                phase(n, gauss_cosine[n - 1][i], gauss_cosine[n - 1][k]) * gauss_weight[n - 1][k];
    }
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
    size_t n = (size_t)streams, count = (size_t)layers;
    return LANES * ((count + 1) * n * n + 2 * count * n + count + 2 * n + 1);
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
    size_t n = (size_t)streams, count = (size_t)layers;
    Block block = {.n = streams, .layers = layers, .suns = suns, .width = (size_t)width, .albedo = albedo};
    block.gain = work;
    block.source = block.gain + LANES * (count + 1) * n * n;
    block.beam = block.source + LANES * count * n;
    block.gap = block.beam + LANES * count * n;
    block.ground = block.gap + LANES * count;
    block.conduct = block.ground + LANES * (n + 1);
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
