/* diffusion: see diffusion.h for the equation.
 *
 * Let M = diag(N dz) and L X the flux differences (L symmetric; its rows sum to zero in a closed
 * column). The stages of the SDIRK scheme give the increments q = h dX/dt:
 *     (M - gamma h L) q1 = h L X,    (M - gamma h L) q2 = h L (X + (1 - gamma) q1),
 *     X after = X + (1 - gamma) q1 + gamma q2.
 * The matrix is symmetric and diagonally dominant, so its factorisation never exchanges rows. The
 * right side is a difference of fluxes, exactly zero for uniform X: hence no change at all.
 *
 * For long steps h L outgrows M, the matrix is nearly singular along the uniform vector, and
 * rounding would leak mass in proportion to h. The sum of all rows of the system is the mass
 * budget, and that vector alone decides it (L does not see it), so a uniform shift of q restores
 * the budget to round-off whatever h: one step of iterative refinement in the one direction that
 * needs it.
 */
#include "diffusion.h"

#include <lapacke.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"

#define CM_PER_KM 1e5
#define COVER_TOLERANCE_KM 1e-9      /* round-off in the conversion between km and cm */
#define GAMMA 0.29289321881345247560 /* 1 - 1/sqrt(2) */

struct Diffusion {
    int layers, padded;
    double *mass;          /* [layers] N dz, molecules cm-2 */
    double *conductance;   /* [layers + 1] K N / distance of middles, molecules cm-2 s-1; ends 0 */
    double ground_density; /* N of the lowest layer, molecules cm-3 */
};

struct DiffusionFactor {
    const Diffusion *diffusion;
    int kind;
    double step;          /* s */
    double deposit;       /* v N_0, molecules cm-2 s-1; 0 unless GROUND_DEPOSITION */
    double budget_weight; /* sum(M) + gamma h v N_0: the budget's answer to a uniform shift of q */
    double *lower, *diagonal, *upper, *upper2; /* LAPACK dgttrf factors: n-1, n, n-1, n-2 used */
    lapack_int *pivot;                         /* [layers] */
};

int diffusion_make(Diffusion **made, const Grid *grid, const Air *air, const double *eddy, Fault *fault)
{
    *made = NULL;
    int layers = grid->layers;
    for (int e = 1; e < layers; e++)
        if (!(isfinite(eddy[e]) && eddy[e] >= 0.0))
            return fault_set(fault, FAULT_INPUT,
                             "diffusion: the eddy coefficient at %g km is %g cm2 s-1; it must be a "
                             "number, not below 0",
                             grid->edge[e] / CM_PER_KM, eddy[e]);

    Diffusion *diffusion = calloc(1, sizeof *diffusion);
    if (!diffusion)
        return fault_memory(fault, "the diffusion operator");
    diffusion->mass = malloc((size_t)layers * sizeof(double));
    diffusion->conductance = calloc((size_t)layers + 1, sizeof(double));
    if (!diffusion->mass || !diffusion->conductance) {
        diffusion_free(diffusion);
        return fault_memory(fault, "the diffusion operator");
    }
    diffusion->layers = layers;
    diffusion->padded = grid->padded;
    diffusion->ground_density = air->number_density[0];
    for (int i = 0; i < layers; i++)
        diffusion->mass[i] = air->number_density[i] * grid->depth[i];
    for (int e = 1; e < layers; e++)
        diffusion->conductance[e] = eddy[e] * air->edge_density[e] / (grid->middle[e] - grid->middle[e - 1]);
    *made = diffusion;
    return 0;
}

int diffusion_make_above(Diffusion **made, const Grid *grid, const Air *air, const double *eddy, int first,
                         Fault *fault)
{
    Grid above = *grid;
    Air air_above = *air;
    above.layers -= first;
    above.edge += first;
    above.middle += first;
    above.depth += first;
    air_above.number_density += first;
    air_above.edge_density += first;
    return diffusion_make(made, &above, &air_above, eddy + first, fault);
}

void diffusion_free(Diffusion *diffusion)
{
    if (!diffusion)
        return;
    free(diffusion->mass);
    free(diffusion->conductance);
    free(diffusion);
}

static int fill_eddy(double *eddy, const Grid *grid, const Table *table, Fault *fault)
{
    size_t z = 0, k = 0;
    if (table_column(table, "altitude_km", &z, fault) || table_column(table, "eddy_cm2_s-1", &k, fault) ||
        table_require_increasing(table, z, fault) || table_require_range(table, k, 1.0, 1e9, fault))
        return fault->code;

    const double *altitude = table_values(table, z), *value = table_values(table, k);
    size_t rows = table->rows;
    double first = grid->edge[1] / CM_PER_KM, last = grid->edge[grid->layers - 1] / CM_PER_KM;
    if (rows < 2 || altitude[0] > first + COVER_TOLERANCE_KM ||
        altitude[rows - 1] < last - COVER_TOLERANCE_KM)
        return fault_at(fault, table->path, 0,
                        "the eddy coefficient must cover the edges between layers, %g to %g km; the "
                        "table has %zu rows from %g to %g km",
                        first, last, rows, rows ? altitude[0] : NAN, rows ? altitude[rows - 1] : NAN);
    for (int e = 1; e < grid->layers; e++)
        eddy[e] = table_loglinear(altitude, value, rows, grid->edge[e] / CM_PER_KM);
    eddy[0] = eddy[grid->layers] = 0.0; /* nothing diffuses through the ends */
    return 0;
}

int diffusion_read_eddy(double *eddy, const Grid *grid, const char *path, char *source, size_t size,
                        Fault *fault)
{
    Table table = {0};
    if (table_read(&table, path, fault))
        return fault->code;
    int code = fill_eddy(eddy, grid, &table, fault);
    if (!code && !table_header(&table, "source", source, size) && size > 0) {
        strncpy(source, path, size - 1);
        source[size - 1] = '\0';
    }
    table_free(&table);
    return code;
}

static int check_step(int kind, double velocity, double step, Fault *fault)
{
    if (kind != GROUND_CLOSED && kind != GROUND_FIXED && kind != GROUND_DEPOSITION)
        return fault_set(fault, FAULT_INPUT, "diffusion: there is no ground condition %d", kind);
    if (!(isfinite(step) && step > 0.0))
        return fault_set(fault, FAULT_INPUT, "diffusion: the step is %g s; it must be positive", step);
    if (kind == GROUND_DEPOSITION && !(isfinite(velocity) && velocity >= 0.0))
        return fault_set(fault, FAULT_INPUT,
                         "diffusion: the deposition velocity is %g cm s-1; it must not be negative",
                         velocity);
    return 0;
}

/* M - gamma h L into the three diagonals. */
static void assemble(DiffusionFactor *factor)
{
    const Diffusion *diffusion = factor->diffusion;
    const double *conductance = diffusion->conductance;
    int layers = diffusion->layers;
    double reach = GAMMA * factor->step;
    factor->budget_weight = reach * factor->deposit;
    for (int i = 0; i < layers; i++) {
        factor->diagonal[i] = diffusion->mass[i] + reach * (conductance[i] + conductance[i + 1]);
        factor->budget_weight += diffusion->mass[i];
        if (i + 1 < layers)
            factor->lower[i] = factor->upper[i] = -reach * conductance[i + 1];
    }
    factor->diagonal[0] += reach * factor->deposit;
    /* A held layer has the increment 0: its own row says so, and no other row sees it. */
    if (factor->kind == GROUND_FIXED)
        factor->lower[0] = factor->upper[0] = 0.0;
}

int diffusion_factor(DiffusionFactor **made, const Diffusion *diffusion, int kind, double velocity,
                     double step, Fault *fault)
{
    *made = NULL;
    if (check_step(kind, velocity, step, fault))
        return fault->code;
    DiffusionFactor *factor = calloc(1, sizeof *factor);
    if (!factor)
        return fault_memory(fault, "the diffusion factorisation");
    size_t n = (size_t)diffusion->layers;
    /* all of length n: the part above a high tropopause may be a single layer, which has no neighbours */
    factor->lower = malloc(n * sizeof(double));
    factor->diagonal = malloc(n * sizeof(double));
    factor->upper = malloc(n * sizeof(double));
    factor->upper2 = malloc(n * sizeof(double));
    factor->pivot = malloc(n * sizeof(lapack_int));
    if (!factor->lower || !factor->diagonal || !factor->upper || !factor->upper2 || !factor->pivot) {
        diffusion_factor_free(factor);
        return fault_memory(fault, "the diffusion factorisation");
    }
    factor->diffusion = diffusion;
    factor->kind = kind;
    factor->step = step;
    factor->deposit = kind == GROUND_DEPOSITION ? velocity * diffusion->ground_density : 0.0;
    assemble(factor);

    lapack_int info = LAPACKE_dgttrf_work((lapack_int)n, factor->lower, factor->diagonal, factor->upper,
                                          factor->upper2, factor->pivot);
    /* Dominance makes the matrix regular; only a density that is no number gets here. */
    if (info != 0 || !isfinite(factor->budget_weight) || !isfinite(factor->diagonal[n - 1])) {
        diffusion_factor_free(factor);
        return fault_set(fault, FAULT_NUMERICS,
                         "diffusion: the matrix for a step of %g s cannot be factored (LAPACK %d); "
                         "check the air and the eddy coefficient",
                         step, (int)info);
    }
    *made = factor;
    return 0;
}

void diffusion_factor_free(DiffusionFactor *factor)
{
    if (!factor)
        return;
    free(factor->lower);
    free(factor->diagonal);
    free(factor->upper);
    free(factor->upper2);
    free(factor->pivot);
    free(factor);
}

/* out = scale * L x: [layers], the flux in from above less the flux out below. No aliasing. */
static void flux_differences(const Diffusion *diffusion, double scale, const double *x, double *out)
{
    const double *conductance = diffusion->conductance;
    int last = diffusion->layers - 1;
    double below = 0.0;
    for (int i = 0; i < last; i++) {
        double above = scale * conductance[i + 1] * (x[i + 1] - x[i]);
        out[i] = above - below;
        below = above;
    }
    out[last] = -below;
}

/* Right side h (L x - M sink) of a stage for one species; returns what deposition and sink add to the column:
 * the sum of the right side's rows. sink may be NULL. */
static double fill_stage(const DiffusionFactor *factor, const double *x, const double *sink, double *right)
{
    const Diffusion *diffusion = factor->diffusion;
    flux_differences(diffusion, factor->step, x, right);
    double gain = -factor->step * factor->deposit * x[0];
    right[0] += gain;
    for (int i = 0; sink && i < diffusion->layers; i++) {
        double taken = factor->step * diffusion->mass[i] * sink[i];
        right[i] -= taken;
        gain -= taken;
    }
    if (factor->kind == GROUND_FIXED)
        right[0] = 0.0;
    return gain;
}

/* Shift q uniformly so that the sum of rows of (M - gamma h L) q = h L x holds; see the head. */
static void restore_budget(const DiffusionFactor *factor, double gain, double *q)
{
    if (factor->kind == GROUND_FIXED)
        return; /* the uniform vector is no near-null vector there */
    const Diffusion *diffusion = factor->diffusion;
    double sum = GAMMA * factor->step * factor->deposit * q[0];
    for (int i = 0; i < diffusion->layers; i++)
        sum += diffusion->mass[i] * q[i];
    double shift = (gain - sum) / factor->budget_weight;
    for (int i = 0; i < diffusion->layers; i++)
        q[i] += shift;
}

/* q: right sides in, increments out, for all species at once; gain: [count] from fill_stage. */
static void solve_stage(const DiffusionFactor *factor, double *q, int count, const double *gain)
{
    const Diffusion *diffusion = factor->diffusion;
    size_t padded = (size_t)diffusion->padded;
    LAPACKE_dgttrs_work(LAPACK_COL_MAJOR, 'N', diffusion->layers, count, factor->lower, factor->diagonal,
                        factor->upper, factor->upper2, factor->pivot, q, diffusion->padded);
    for (int s = 0; s < count; s++)
        restore_budget(factor, gain[s], q + (size_t)s * padded);
}

size_t diffusion_work(const DiffusionFactor *factor, int count)
{
    /* Increments of both stages for every species, and the stage state of one. */
    return (2 * (size_t)count + 1) * (size_t)factor->diffusion->padded;
}

void diffusion_step(const DiffusionFactor *factor, double *x, const double *sink, int count, double *received,
                    double *work)
{
    const Diffusion *diffusion = factor->diffusion;
    size_t padded = (size_t)diffusion->padded, species = (size_t)count;
    int layers = diffusion->layers;
    double *q1 = work, *q2 = work + species * padded, *stage = work + 2 * species * padded;
    double *gain = received; /* of the stage at hand, until the end */

    for (size_t s = 0; s < species; s++)
        gain[s] = fill_stage(factor, x + s * padded, sink ? sink + s * padded : NULL, q1 + s * padded);
    solve_stage(factor, q1, count, gain);

    for (size_t s = 0; s < species; s++) {
        const double *state = x + s * padded, *first = q1 + s * padded;
        for (int i = 0; i < layers; i++)
            stage[i] = state[i] + (1.0 - GAMMA) * first[i];
        gain[s] = fill_stage(factor, stage, sink ? sink + s * padded : NULL, q2 + s * padded);
    }
    solve_stage(factor, q2, count, gain);

    for (size_t s = 0; s < species; s++) {
        const double *first = q1 + s * padded, *second = q2 + s * padded;
        double *state = x + s * padded, change = 0.0;
        for (int i = 0; i < layers; i++) {
            double after = state[i] + ((1.0 - GAMMA) * first[i] + GAMMA * second[i]);
            change += diffusion->mass[i] * (after - state[i]);
            state[i] = after;
        }
        for (int i = factor->kind == GROUND_FIXED; sink && i < layers; i++)
            change += factor->step * diffusion->mass[i] * sink[s * padded + (size_t)i];
        /* Summed from what was stored, not from the fluxes, so the caller's books close. */
        received[s] = factor->kind == GROUND_CLOSED ? 0.0 : change;
    }
}

void diffusion_tendency(const Diffusion *diffusion, const double *x, double *dxdt)
{
    flux_differences(diffusion, 1.0, x, dxdt);
    for (int i = 0; i < diffusion->layers; i++)
        dxdt[i] /= diffusion->mass[i];
}
