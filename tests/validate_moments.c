/* validate_moments: ratios of short-lived gases near noon, in balance with the surface values of STEADY_YEAR.
 */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Of the layers on either side of an altitude, linear in it. */
static double at_km(const Model *model, const double *upper, const double *lower, double km)
{
    const double *middle = model->grid.middle;
    int l = 0;
    while (l + 2 < model->grid.layers && middle[l + 1] < 1e5 * km)
        l++;
    double share = (1e5 * km - middle[l]) / (middle[l + 1] - middle[l]);
    return upper[l] / lower[l] * (1.0 - share) + upper[l + 1] / lower[l + 1] * share;
}

int row_moments(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault)
{
    const Model *model = evidence->run->model;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    char above[32], below[32];
    double km;
    if (sscanf(id, "noon-%31[^/]/%31[^-]-%lf", above, below, &km) != 3)
        return -1;
    int a = mechanism_solved(model->mechanism, above), b = mechanism_solved(model->mechanism, below);
    if (a < 0 || b < 0)
        return fault_set(fault, FAULT_INPUT, "%s: the mechanism has no %s", id, a < 0 ? above : below);
    if (model->settings.day == DAY_MEAN)
        return fault_set(fault, FAULT_INPUT, "%s: a case with day.mode = \"mean\" has no noon", id);
    double *x = malloc(MOMENTS * field * sizeof(double));
    if (!x)
        return fault_memory(fault, "values by time of day");
    stepper_moments(evidence->stepper, evidence->x, x);
    const double *noon = x + MOMENT_NOON * field;
    *value = at_km(model, noon + FIELD(model->grid.padded, a, 0), noon + FIELD(model->grid.padded, b, 0), km);
    snprintf(note, ROW_NOTE, "balance of %d, noon of the case's sun, %g km", STEADY_YEAR, km);
    free(x);
    return 0;
}
