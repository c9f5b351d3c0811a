/* validate_potency: the model's value of the rows on depletion potentials. */
#include "validate.h"

#include <stdio.h>
#include <string.h>

int potencies_measure(const Model *model, Potencies **made, Fault *fault)
{
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
    SteadyReport steady;
    const PotencyAsk ask = {0};
    const Watcher nobody = {0};
    *made = NULL;
    int code = column_make(&column, model, fault);
    if (!code)
        code = stepper_make(&stepper, model, 0, fault);
    if (!code)
        code = unsplit_make(&unsplit, model, fault);
    if (!code)
        code = steady_find(unsplit, stepper, column, STEADY_YEAR + 0.5, &steady, fault);
    if (!code)
        code = potency_make(made, unsplit, stepper, column, &ask, &nobody, fault);
    unsplit_free(unsplit);
    stepper_free(stepper);
    column_free(column);
    return code;
}

int row_potency(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault)
{
    const Mechanism *mechanism = evidence->run->model->mechanism;
    if (strncmp(id, "odp-", 4) != 0)
        return -1;
    for (int i = 0; i < evidence->potencies->count; i++) {
        const Potency *gas = &evidence->potencies->gas[i];
        if (strcmp(mechanism_name(mechanism, gas->species), id + 4) != 0)
            continue;
        *value = gas->odp;
        snprintf(note, ROW_NOTE,
                 "settled at %d, factors made anew, noise %.0e; frozen %.4g; lifetime %.4g years",
                 STEADY_YEAR, gas->odp_noise, gas->odp_frozen, gas->lifetime);
        return 0;
    }
    return fault_set(fault, FAULT_INPUT, "%s: no such gas in the table of potentials", id);
}
