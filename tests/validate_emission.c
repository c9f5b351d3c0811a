/* validate_emission: abundances that published emissions lead to, emissions that observed abundances imply,
 * and what more of a gas does to its own lifetime. */
#define _XOPEN_SOURCE 700 /* realpath */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../model/emission.h"
#include "../model/sensitivity.h"
#include "../model/steady.h"

/* AROUND: years on both sides that are averaged, as the difference of two observed years is not good to a
 * tenth of an emission. */
enum { FIRST = 1955, LAST = 2012, LED_LAST = 2010, AROUND = 2 };
static const double SPACING_KM = 2.0;
static const double MORE = 1e-3; /* of the flux */

static int convert(Conversion **made, Settings *settings, Model **model, const char *what, Fault *fault)
{
    Carried carried = {0};
    const Watcher watcher = {0};
    conversion_settings(settings);
    fprintf(stderr, "%s: %d to %d on layers of %g km\n", what, settings->first_year, settings->last_year,
            settings->spacing_km);
    int code = model_make(model, settings, fault);
    if (!code)
        code = carried_make(&carried, *model, NULL, settings->first_year, fault);
    if (!code)
        code = conversion_run(made, *model, carried.stepper, carried.column, &watcher, fault);
    carried_free(&carried);
    return code;
}

/* Burden after a little more flux over that flux, against burden over flux. */
static int measure_feedback(const Model *model, const Stepper *stepper, const double *x, int s,
                            double *feedback, Fault *fault)
{
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    Unsplit *unsplit = NULL;
    SteadyReport report;
    double *y = malloc(field * sizeof(double)), *tendency = NULL, burden[2];
    int code = y ? unsplit_make(&unsplit, model, fault) : fault_memory(fault, "feedback of a gas");
    if (!code && !(tendency = malloc((size_t)unsplit->unknowns * sizeof(double))))
        code = fault_memory(fault, "feedback of a gas");
    if (!code) {
        memcpy(y, x, field * sizeof(double));
        if (model->settings.day != DAY_MEAN)
            unsplit_take_factors(unsplit, stepper_day(stepper));
        unsplit_set_time(unsplit, STEADY_YEAR + 0.5);
        unsplit_keep(unsplit, y);
        code = steady_settle(unsplit, y, &report, fault);
    }
    if (!code) {
        unsplit_evaluate(unsplit, y, tendency, 0);
        double flux = answer_value(unsplit, y, &(Answer){.kind = ANSWER_FLUX, .species = s});
        for (int more = 0; !code && more < 2; more++) {
            unsplit_emit(unsplit, s, (1.0 + more * MORE) * flux);
            code = steady_settle(unsplit, y, &report, fault);
            burden[more] = column_burden(model, y, s);
        }
        *feedback = (burden[1] / burden[0] - 1.0) / MORE;
    }
    unsplit_free(unsplit);
    free(y);
    free(tendency);
    return code;
}

int emissions_measure(EmissionEvidence *evidence, const Settings *from, const Model *rest_model,
                      const Stepper *stepper, const double *x, Fault *fault)
{
    Settings settings = *from;
    *evidence = (EmissionEvidence){0};
    settings.spacing_km = SPACING_KM;
    settings.edges = 0;
    settings.first_year = FIRST;
    settings.last_year = LAST;
    int code = convert(&evidence->implied, &settings, &evidence->model, "emissions implied", fault);
    settings.last_year = LED_LAST;
    if (!code && settings.schedule_layers == SETTINGS_MAX_LAYERS)
        code = fault_set(fault, FAULT_INPUT, "the case has no room for another layer of its schedule");
    char *path = realpath("tests/cfc11-emissions.csv", NULL); /* files of a case are not sought from here */
    if (!code && (!path || strlen(path) >= SETTINGS_PATH))
        code = fault_set(fault, FAULT_INPUT,
                         "tests/cfc11-emissions.csv: not found; run from the project's folder");
    if (!code)
        strcpy(settings.schedule_layer[settings.schedule_layers++], path);
    free(path);
    Model *model = NULL; /* the same gases in the same order */
    if (!code)
        code = convert(&evidence->led, &settings, &model, "CFC-11 from emissions", fault);
    model_free(model);
    int n2o = mechanism_solved(rest_model->mechanism, "N2O");
    if (!code)
        code = measure_feedback(rest_model, stepper, x, n2o, &evidence->feedback_n2o, fault);
    return code;
}

void emissions_evidence_free(EmissionEvidence *evidence)
{
    conversion_free(evidence->implied);
    conversion_free(evidence->led);
    model_free(evidence->model);
    *evidence = (EmissionEvidence){0};
}

/* Air of the column against that of the Earth, Trenberth and Smith 2005 (J. Climate 18, 864): 5.148e18 kg. */
static double air_ratio(const Model *model)
{
    double molecules = 0.0;
    for (int l = 0; l < model->grid.layers; l++)
        molecules += model->air.number_density[l] * model->grid.depth[l];
    return molecules * emission_area() / AVOGADRO * 28.9644e-3 / 5.148e18;
}

/* "led-CFC-11-1980", "implied-CFC-12-1990", "feedback-N2O", "air-mass". */
int row_emission(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault)
{
    const EmissionEvidence *with = evidence->emissions;
    char gas[32];
    int year;
    if (!strcmp(id, "air-mass")) {
        *value = air_ratio(with->model);
        snprintf(note, ROW_NOTE, "standard atmosphere from sea level up");
        return 0;
    }
    if (!strcmp(id, "feedback-N2O")) {
        *value = with->feedback_n2o;
        snprintf(note, ROW_NOTE, "settled %d, %g more of the flux, factors as they are", STEADY_YEAR, MORE);
        return 0;
    }
    const char *dash = strrchr(id, '-');
    int led = !strncmp(id, "led-", 4);
    if (!dash || (!led && strncmp(id, "implied-", 8)) || (year = atoi(dash + 1)) < FIRST)
        return -1;
    const char *name = id + (led ? 4 : 8);
    snprintf(gas, sizeof gas, "%.*s", (int)(dash - name), name);
    int s = mechanism_solved(with->model->mechanism, gas);
    if (s < 0 || year > (led ? LED_LAST : LAST - AROUND))
        return fault_set(fault, FAULT_INPUT, "%s: no such gas or year", id);
    if (led) {
        *value = 1e12 * conversion_abundance(with->led, s, year);
        double seen = 1e12 * conversion_abundance(with->implied, s, year);
        snprintf(note, ROW_NOTE, "%.3f of the observed; layers of %g km", *value / seen, SPACING_KM);
        return 0;
    }
    *value = 0.0;
    for (int y = year - AROUND; y <= year + AROUND; y++)
        *value += 1e-6 * conversion_emission(with->implied, s, y) / (2 * AROUND + 1);
    snprintf(note, ROW_NOTE, "mean of the years %d to %d; layers of %g km", year - AROUND, year + AROUND,
             SPACING_KM);
    return 0;
}
