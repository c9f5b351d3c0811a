/* unsplit_matrix: the band matrix of the unsplit column and its update of low rank.
 *
 * Mole fractions span 24 decades. The band holds R (A - shift M) C with C the size of each unknown and R what
 * makes the largest entry of a row 1: pivots are then chosen among relative changes. With B = R (A - shift
 * M) C banded and the light as U V', the whole is B + R U (V' C), solved by
 *     (B + P Q')^-1 b = B^-1 (b - P G^-1 Q' B^-1 b),   G = 1 + Q' B^-1 P,
 * and the transposed system by the transposed steps: only the small G need be kept.
 */
#include "unsplit.h"

#include <lapacke.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

struct UnsplitMatrix {
    int width, stride;    /* band on either side; leading dimension of LAPACK's storage */
    double *band;         /* [unknowns][stride] */
    double *row, *column; /* [unknowns] scales */
    lapack_int *pivot;    /* [unknowns] */
    /* rank: absorbers of the light, as they were when it was factored */
    int rank;              /* 0: without light */
    double *update;        /* [rank][unknowns] P */
    double *solved_update; /* [rank][unknowns] B^-1 P, while G is made */
    double *small;         /* [rank][rank] G factored */
    double *part;          /* [rank] work */
    lapack_int *small_pivot;
};

/* Number density, cm-3, whose mole fraction is the least scale of an unknown: scarcer species count as
 * absent. */
static const double SCARCE = 1e-3;

int unsplit_matrix_make(Unsplit *unsplit, Fault *fault)
{
    UnsplitMatrix *matrix = calloc(1, sizeof *matrix);
    if (!matrix)
        return fault_memory(fault, "the matrix of the unsplit column");
    unsplit->matrix = matrix;
    size_t n = (size_t)unsplit->unknowns, most = UNSPLIT_ABSORBERS * (size_t)unsplit->layers;
    matrix->width = unsplit->solved;
    matrix->stride = 3 * matrix->width + 1;
    matrix->band = malloc(n * (size_t)matrix->stride * sizeof(double));
    matrix->row = malloc(n * sizeof(double));
    matrix->column = malloc(n * sizeof(double));
    matrix->pivot = malloc(n * sizeof(lapack_int));
    matrix->update = malloc(most * n * sizeof(double));
    matrix->solved_update = malloc(most * n * sizeof(double));
    matrix->small = malloc(most * most * sizeof(double));
    matrix->part = malloc(most * sizeof(double));
    matrix->small_pivot = malloc(most * sizeof(lapack_int));
    if (!matrix->band || !matrix->row || !matrix->column || !matrix->pivot || !matrix->update ||
        !matrix->solved_update || !matrix->small || !matrix->part || !matrix->small_pivot)
        return fault_memory(fault, "the matrix of the unsplit column");
    return 0;
}

void unsplit_matrix_free(UnsplitMatrix *matrix)
{
    if (!matrix)
        return;
    free(matrix->band);
    free(matrix->row);
    free(matrix->column);
    free(matrix->pivot);
    free(matrix->update);
    free(matrix->solved_update);
    free(matrix->small);
    free(matrix->part);
    free(matrix->small_pivot);
    free(matrix);
}

/* The three transport coefficients of row (s, l), s-1: against the layer below, itself, the layer above. */
static void transport_row(const Unsplit *unsplit, int s, int l, double *below, double *here, double *above)
{
    *below = *here = *above = 0.0;
    if (!unsplit->carried[s])
        return;
    *below = unsplit->conductance[l] / unsplit->mass[l];
    *above = l + 1 < unsplit->layers ? unsplit->conductance[l + 1] / unsplit->mass[l] : 0.0;
    *here = -*below - *above;
    if (l == 0)
        *here -= unsplit->deposit[s] / unsplit->model->grid.depth[0];
}

/* Row i of A - shift M into values [3 * solved]: entries of columns (l - 1) solved onward. */
static void fill_row(const Unsplit *unsplit, int i, double shift, double *values)
{
    int solved = unsplit->solved, l = i / solved, s = i % solved;
    memset(values, 0, 3 * (size_t)solved * sizeof(double));
    if (unsplit->kept[i]) {
        values[solved + s] = -1.0;
        return;
    }
    double below, here, above;
    transport_row(unsplit, s, l, &below, &here, &above);
    memcpy(values + solved, unsplit->jacobian + (size_t)i * (size_t)solved, (size_t)solved * sizeof(double));
    values[s] = below;
    values[solved + s] += here - shift;
    values[2 * solved + s] = above;
}

static void assemble(Unsplit *unsplit, double shift)
{
    UnsplitMatrix *matrix = unsplit->matrix;
    int solved = unsplit->solved, n = unsplit->unknowns, width = matrix->width;
    size_t stride = (size_t)matrix->stride;
    double *values = unsplit->block; /* large enough: species^2 PACK */
    memset(matrix->band, 0, (size_t)n * stride * sizeof(double));
    for (int i = 0; i < n; i++) {
        int start = (i / solved - 1) * solved, first = start < 0 ? 0 : start;
        int end = start + 3 * solved < n ? start + 3 * solved : n;
        double largest = 0.0;
        fill_row(unsplit, i, shift, values);
        for (int j = first; j < end; j++) {
            values[j - start] *= matrix->column[j];
            largest = fmax(largest, fabs(values[j - start]));
        }
        matrix->row[i] = largest > 0.0 ? 1.0 / largest : 1.0;
        /* beyond the band of this row there are only zeros */
        first = i - width > first ? i - width : first;
        end = i + width + 1 < end ? i + width + 1 : end;
        for (int j = first; j < end; j++)
            matrix->band[(size_t)j * stride + (size_t)(2 * width + i - j)] =
                matrix->row[i] * values[j - start];
    }
}

/* P: what each absorber does through the light. */
static void fill_update(Unsplit *unsplit)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    UnsplitMatrix *matrix = unsplit->matrix;
    int padded = model->grid.padded, solved = unsplit->solved, lit = unsplit->light->reactions;
    size_t n = (size_t)unsplit->unknowns;
    memset(matrix->update, 0, (size_t)matrix->rank * n * sizeof(double));
    for (int m = 0; m < matrix->rank; m++) {
        double *to = matrix->update + (size_t)m * n;
        for (int j = 0; j < lit; j++) {
            int r = mechanism->photolysis_first + j;
            const Reaction *reaction = &mechanism->reaction[r];
            const double *slope = unsplit->slope + FIELD(padded, m * lit + j, 0);
            const double *product = unsplit->product + FIELD(padded, r, 0);
            for (int c = 0; c < reaction->changes; c++)
                for (int l = 0; l < unsplit->layers; l++)
                    to[l * solved + reaction->changed[c]] +=
                        reaction->change[c] * slope[l] * product[l] / unsplit->conditions->air[l];
        }
        for (size_t i = 0; i < n; i++)
            if (unsplit->kept[i])
                to[i] = 0.0;
    }
}

static int factorise_small(Unsplit *unsplit, Fault *fault)
{
    UnsplitMatrix *matrix = unsplit->matrix;
    int rank = matrix->rank;
    size_t n = (size_t)unsplit->unknowns;
    fill_update(unsplit);
    for (int m = 0; m < rank; m++)
        for (size_t i = 0; i < n; i++)
            matrix->update[(size_t)m * n + i] *= matrix->row[i];
    memcpy(matrix->solved_update, matrix->update, (size_t)rank * n * sizeof(double));
    LAPACKE_dgbtrs_work(LAPACK_COL_MAJOR, 'N', (lapack_int)n, matrix->width, matrix->width, rank,
                        matrix->band, matrix->stride, matrix->pivot, matrix->solved_update, (lapack_int)n);
    for (int m = 0; m < rank; m++)
        for (int k = 0; k < rank; k++) {
            size_t at = (size_t)unsplit->absorber[k];
            matrix->small[(size_t)m * (size_t)rank + (size_t)k] =
                (k == m) + matrix->column[at] * matrix->solved_update[(size_t)m * n + at];
        }
    if (LAPACKE_dgetrf_work(LAPACK_COL_MAJOR, rank, rank, matrix->small, rank, matrix->small_pivot))
        return fault_set(fault, FAULT_NUMERICS, "unsplit column: the feedback of ozone on light is singular");
    return 0;
}

int unsplit_factorise(Unsplit *unsplit, const double *x, double shift, int with_light, Fault *fault)
{
    const Model *model = unsplit->model;
    UnsplitMatrix *matrix = unsplit->matrix;
    int padded = model->grid.padded, n = unsplit->unknowns;
    for (int i = 0; i < n; i++) {
        int l = i / unsplit->solved;
        matrix->column[i] =
            fmax(fabs(x[FIELD(padded, i % unsplit->solved, l)]), SCARCE / unsplit->conditions->air[l]);
    }
    assemble(unsplit, shift);
    unsplit->factorisations++;
    lapack_int info = LAPACKE_dgbtrf_work(LAPACK_COL_MAJOR, n, n, matrix->width, matrix->width, matrix->band,
                                          matrix->stride, matrix->pivot);
    if (info > 0) {
        int i = (int)info - 1;
        return fault_set(fault, FAULT_NUMERICS,
                         "unsplit column: the matrix is singular at species %s, altitude %.2f km",
                         mechanism_name(model->mechanism, i % unsplit->solved),
                         1e-5 * model->grid.middle[i / unsplit->solved]);
    }
    matrix->rank = with_light ? unsplit->absorbers : 0;
    return matrix->rank ? factorise_small(unsplit, fault) : 0;
}

static void solve_band(const Unsplit *unsplit, double *b, char form)
{
    const UnsplitMatrix *matrix = unsplit->matrix;
    LAPACKE_dgbtrs_work(LAPACK_COL_MAJOR, form, unsplit->unknowns, matrix->width, matrix->width, 1,
                        matrix->band, matrix->stride, matrix->pivot, b, unsplit->unknowns);
}

/* b -= P G^-1 Q' B^-1 b, by way of a copy. */
static void subtract_light(const Unsplit *unsplit, double *b)
{
    const UnsplitMatrix *matrix = unsplit->matrix;
    int rank = matrix->rank;
    size_t n = (size_t)unsplit->unknowns;
    double *copy = matrix->solved_update;
    memcpy(copy, b, n * sizeof(double));
    solve_band(unsplit, copy, 'N');
    for (int m = 0; m < rank; m++) {
        size_t at = (size_t)unsplit->absorber[m];
        matrix->part[m] = matrix->column[at] * copy[at];
    }
    LAPACKE_dgetrs_work(LAPACK_COL_MAJOR, 'N', rank, 1, matrix->small, rank, matrix->small_pivot,
                        matrix->part, rank);
    for (int m = 0; m < rank; m++)
        for (size_t i = 0; i < n; i++)
            b[i] -= matrix->part[m] * matrix->update[(size_t)m * n + i];
}

/* (B' + Q P')^-1 b = B'^-1 (b - Q G'^-1 P' B'^-1 b). */
static void subtract_light_transposed(const Unsplit *unsplit, double *b)
{
    const UnsplitMatrix *matrix = unsplit->matrix;
    int rank = matrix->rank;
    size_t n = (size_t)unsplit->unknowns;
    double *copy = matrix->solved_update;
    memcpy(copy, b, n * sizeof(double));
    solve_band(unsplit, copy, 'T');
    for (int m = 0; m < rank; m++) {
        double sum = 0.0;
        for (size_t i = 0; i < n; i++)
            sum += matrix->update[(size_t)m * n + i] * copy[i];
        matrix->part[m] = sum;
    }
    LAPACKE_dgetrs_work(LAPACK_COL_MAJOR, 'T', rank, 1, matrix->small, rank, matrix->small_pivot,
                        matrix->part, rank);
    for (int m = 0; m < rank; m++) {
        size_t at = (size_t)unsplit->absorber[m];
        b[at] -= matrix->column[at] * matrix->part[m];
    }
}

void unsplit_solve(const Unsplit *unsplit, double *b, int transposed)
{
    const UnsplitMatrix *matrix = unsplit->matrix;
    const double *before = transposed ? matrix->column : matrix->row;
    const double *after = transposed ? matrix->row : matrix->column;
    for (int i = 0; i < unsplit->unknowns; i++)
        b[i] *= before[i];
    if (matrix->rank) {
        if (transposed)
            subtract_light_transposed(unsplit, b);
        else
            subtract_light(unsplit, b);
    }
    solve_band(unsplit, b, transposed ? 'T' : 'N');
    for (int i = 0; i < unsplit->unknowns; i++)
        b[i] *= after[i];
}

void unsplit_multiply(const Unsplit *unsplit, const double *z, int with_light, int transposed, double *out)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int solved = unsplit->solved, n = unsplit->unknowns, padded = model->grid.padded;
    int lit = unsplit->light->reactions;
    double *values = unsplit->block;
    memset(out, 0, (size_t)n * sizeof(double));
    for (int i = 0; i < n; i++) {
        int start = (i / solved - 1) * solved, first = start < 0 ? 0 : start;
        int end = start + 3 * solved < n ? start + 3 * solved : n;
        fill_row(unsplit, i, 0.0, values);
        for (int j = first; j < end; j++) {
            if (transposed)
                out[j] += values[j - start] * z[i];
            else
                out[i] += values[j - start] * z[j];
        }
    }
    for (int m = 0; with_light && m < unsplit->absorbers; m++)
        for (int j = 0; j < lit; j++) {
            int r = mechanism->photolysis_first + j;
            const Reaction *reaction = &mechanism->reaction[r];
            for (int l = 0; l < unsplit->layers; l++) {
                double change = unsplit->slope[FIELD(padded, m * lit + j, l)] *
                                unsplit->product[FIELD(padded, r, l)] / unsplit->conditions->air[l];
                for (int c = 0; c < reaction->changes; c++) {
                    int i = l * solved + reaction->changed[c], o = unsplit->absorber[m];
                    if (unsplit->kept[i])
                        continue;
                    if (transposed)
                        out[o] += reaction->change[c] * change * z[i];
                    else
                        out[i] += reaction->change[c] * change * z[o];
                }
            }
        }
}
