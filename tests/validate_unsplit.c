/* validate_unsplit: what the splitting of a step into chemistry and transport does, against the unsplit
 * column. */
#include "validate.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../model/steady.h"

/* Light that follows at every step, as it does unsplit: what is left is the splitting, and what it does to
 * the factors. Those the unsplit column keeps from the settled start; the steps make them anew by
 * refresh_years, from what stands at the end of a step. */
static Settings splitting_alone(const Settings *from, int first_year, int years)
{
    Settings settings = *from;
    settings.first_year = first_year;
    settings.last_year = first_year + years - 1;
    settings.refresh_column = 1e-5;
    settings.refresh_state = 10.0;
    settings.outer_step_days = 365.25 / ceil(365.25 / settings.outer_step_days - 1e-9);
    return settings;
}

static int carry_both(const Model *model, Unsplit *unsplit, Stepper *stepper, Column *column, double *x,
                      int years, Fault *fault)
{
    UnsplitStepping stepping = {.relative = 1e-4, .absolute = 1.0};
    double time = column->time;
    long steps = lround(years * 365.25 / model->settings.outer_step_days);
    int code = unsplit_advance(unsplit, x, &time, years, 0, &stepping, fault);
    for (long i = 0; !code && i < steps; i++)
        code = stepper_advance(stepper, column, model->settings.outer_step_days * 86400.0, 0, fault);
    return code;
}

int splitting_error(const Settings *from, int first_year, int years, double *column_du, double *layer,
                    double *altitude_km, Fault *fault)
{
    Settings settings = splitting_alone(from, first_year, years);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
    SteadyReport report;
    double *x = NULL;
    int code = model_make(&model, &settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code)
        code = stepper_make(&stepper, model, 0, fault);
    if (!code)
        code = unsplit_make(&unsplit, model, fault);
    if (!code)
        code = steady_find(unsplit, stepper, column, first_year, &report, fault);
    size_t field = code ? 0 : (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    if (!code && !(x = malloc(field * sizeof(double))))
        code = fault_memory(fault, "the unsplit column");
    if (!code) {
        stepper_balance(stepper, column);
        memcpy(x, column->x, field * sizeof(double));
        code = carry_both(model, unsplit, stepper, column, x, years, fault);
    }
    if (!code) {
        size_t row = FIELD(model->grid.padded, mechanism_solved(model->mechanism, "O3"), 0);
        *column_du = column_ozone_du(model, column->x) - column_ozone_du(model, x);
        *layer = 0.0;
        for (int l = 0; l < model->grid.layers; l++) {
            double apart = fabs(column->x[row + (size_t)l] / x[row + (size_t)l] - 1.0);
            if (apart <= *layer)
                continue;
            *layer = apart;
            *altitude_km = 1e-5 * model->grid.middle[l];
        }
    }
    free(x);
    unsplit_free(unsplit);
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    return code;
}
