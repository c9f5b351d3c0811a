/* pulse: see pulse.h. */
#include "pulse.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

static double product(const double *a, const double *b, int count)
{
    double sum = 0.0;
    for (int i = 0; i < count; i++)
        sum += a[i] * b[i];
    return sum;
}

/* Derivative of the ozone column by each unknown, over anything. */
static void ozone_weight(const Unsplit *unsplit, double *weight)
{
    const Model *model = unsplit->model;
    int o3 = mechanism_solved(model->mechanism, "O3"), top = unsplit->layers - 1;
    memset(weight, 0, (size_t)unsplit->unknowns * sizeof(double));
    for (int l = 0; l < unsplit->layers; l++)
        weight[l * unsplit->solved + o3] = unsplit->mass[l];
    weight[top * unsplit->solved + o3] += model->air.column_above_top;
}

/* One step of z' = A z by the matrix A - shift, shift = 1 / (gamma step). */
static void advance(const Unsplit *unsplit, double shift, double *z, double *stage)
{
    const double gamma = 1.0 - sqrt(0.5);
    int n = unsplit->unknowns;
    for (int i = 0; i < n; i++)
        stage[i] = -shift * z[i];
    unsplit_solve(unsplit, stage, 0);
    for (int i = 0; i < n; i++) /* (1 - gamma) step A stage, A stage = shift (stage - z) */
        z[i] += (1.0 - gamma) / gamma * (stage[i] - z[i]);
    for (int i = 0; i < n; i++)
        z[i] *= -shift;
    unsplit_solve(unsplit, z, 0);
}

static int through_time(Unsplit *unsplit, const double *x, int s, int steps, double step, double *work,
                        double *fallen, Fault *fault)
{
    int n = unsplit->unknowns;
    double *adjoint = work, *z = work + n, *stage = work + 2 * n;
    double shift = 1.0 / ((1.0 - sqrt(0.5)) * step * YEAR_SECONDS);
    unsplit_evaluate(unsplit, x, z, 1);
    int code = unsplit_slopes(unsplit, x, fault);
    if (!code)
        code = unsplit_factorise(unsplit, x, 0.0, 1, fault);
    if (code)
        return code;
    ozone_weight(unsplit, adjoint);
    unsplit_solve(unsplit, adjoint, 1);
    memset(z, 0, (size_t)n * sizeof(double));
    z[s] = 1.0 / unsplit->mass[0];
    double all = product(adjoint, z, n);
    if (!(fabs(all) > 0.0))
        return fault_set(fault, FAULT_NUMERICS, "a pulse of %s does nothing to the ozone column",
                         mechanism_name(unsplit->model->mechanism, s));
    code = unsplit_factorise(unsplit, x, shift, 1, fault);
    fallen[0] = 0.0;
    for (int i = 1; !code && i <= steps; i++) {
        advance(unsplit, shift, z, stage);
        fallen[i] = 1.0 - product(adjoint, z, n) / all;
    }
    return code;
}

int pulse_response(Unsplit *unsplit, const double *x, int s, int steps, double step, double *fallen,
                   Fault *fault)
{
    double *work = malloc(3 * (size_t)unsplit->unknowns * sizeof(double));
    if (!work)
        return fault_memory(fault, "pulse of a gas");
    unsigned char kept = unsplit->kept[s];
    double emission = unsplit->emission[s];
    unsplit_emit(unsplit, s, emission); /* what flux does not matter to what is linear in it */
    int code = through_time(unsplit, x, s, steps, step, work, fallen, fault);
    unsplit->kept[s] = kept;
    unsplit->emission[s] = emission;
    free(work);
    return code;
}
