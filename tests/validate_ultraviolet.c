/* validate_ultraviolet: ultraviolet above the atmosphere and at the ground. */
#include "validate.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../model/ultraviolet.h"

#define TOTAL_DU 300.0 /* of the published rows */
#define LOW_SUN 0.5    /* 60 degrees from the zenith, for the note */

/* Under one sun at 1 au: the state of STEADY_YEAR with its ozone scaled to TOTAL_DU. */
static int under_sun(const Evidence *evidence, double cosine, double *uv_index, double *amplification,
                     Fault *fault)
{
    const Model *model = evidence->run->model;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    const double *state = run_fields(evidence->run, STEADY_YEAR);
    double *x = malloc(field * sizeof *x), scale = TOTAL_DU / column_ozone_du(model, state);
    double *ozone = x + FIELD(model->grid.padded, mechanism_solved(model->mechanism, "O3"), 0);
    Ultraviolet *ultraviolet = NULL;
    UltravioletDay day;
    if (!x)
        return fault_memory(fault, "a column under the sun");
    memcpy(x, state, field * sizeof *x);
    for (int l = 0; l < model->grid.padded; l++)
        ozone[l] *= scale;
    if (!ultraviolet_make(&ultraviolet, model, &cosine, fault)) {
        ultraviolet_day(ultraviolet, x, NULL, &day);
        *uv_index = day.uv_index;
        *amplification = ultraviolet_amplification(ultraviolet, x, NULL);
    }
    ultraviolet_free(ultraviolet);
    free(x);
    return fault->code;
}

static int above(const Evidence *evidence, double low, double *value, Fault *fault)
{
    Ultraviolet *ultraviolet;
    double band[UV_BANDS];
    if (ultraviolet_make(&ultraviolet, evidence->run->model, NULL, fault))
        return fault->code;
    ultraviolet_above(ultraviolet, band);
    *value = band[low < 300.0 ? UV_B : UV_A];
    ultraviolet_free(ultraviolet);
    return 0;
}

int row_ultraviolet(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault)
{
    double low, high, high_sun[2], low_sun[2];
    if (sscanf(id, "uv-toa-%lf-%lf", &low, &high) == 2) {
        snprintf(note, ROW_NOTE, "facing the sun at 1 au");
        return above(evidence, low, value, fault);
    }
    int factor = !strcmp(id, "uv-raf");
    if (!factor && strcmp(id, "uvi-overhead") != 0)
        return -1;
    if (under_sun(evidence, 1.0, &high_sun[0], &high_sun[1], fault) ||
        under_sun(evidence, LOW_SUN, &low_sun[0], &low_sun[1], fault))
        return fault->code;
    *value = high_sun[factor];
    snprintf(note, ROW_NOTE, "profile of %d scaled to %g DU, sun overhead; at 60 degrees %.4g", STEADY_YEAR,
             TOTAL_DU, low_sun[factor]);
    return 0;
}
