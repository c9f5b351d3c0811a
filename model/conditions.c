/* conditions: see conditions.h. */
#include "conditions.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "variation.h"

int conditions_make(Conditions **made, const Model *model, Fault *fault)
{
    *made = NULL;
    size_t padded = (size_t)model->grid.padded, bytes = padded * sizeof(double);
    size_t bins = (size_t)model->spectra->bins;
    Conditions *conditions = calloc(1, sizeof *conditions);
    if (!conditions)
        return fault_memory(fault, "conditions");
    conditions->temperature = malloc(bytes);
    conditions->air = malloc(bytes);
    conditions->depth = malloc(bytes);
    conditions->aerosol_area = malloc(bytes);
    conditions->aerosol_radius = malloc(bytes);
    conditions->held_fraction = malloc(MODEL_HELD_MOST * bytes);
    conditions->solar = malloc(bins * sizeof(double));
    conditions->work = malloc(2 * bytes);
    if (!conditions->temperature || !conditions->air || !conditions->depth || !conditions->aerosol_area ||
        !conditions->aerosol_radius || !conditions->held_fraction || !conditions->solar ||
        !conditions->work) {
        conditions_free(conditions);
        return fault_memory(fault, "conditions");
    }
    memcpy(conditions->temperature, model->air.temperature, bytes);
    memcpy(conditions->air, model->air.number_density, bytes);
    memcpy(conditions->depth, model->grid.depth, bytes);
    memcpy(conditions->aerosol_area, model->aerosol_area, bytes);
    memcpy(conditions->aerosol_radius, model->aerosol_radius, bytes);
    memcpy(conditions->held_fraction, model->held_fraction, MODEL_HELD_MOST * bytes);
    for (size_t b = 0; b < bins; b++)
        conditions->solar[b] = 1.0;
    conditions->phase = NAN;
    conditions->day_of_year = model->settings.day_of_year;
    *made = conditions;
    return 0;
}

void conditions_free(Conditions *conditions)
{
    if (!conditions)
        return;
    free(conditions->temperature);
    free(conditions->air);
    free(conditions->depth);
    free(conditions->aerosol_area);
    free(conditions->aerosol_radius);
    free(conditions->held_fraction);
    free(conditions->solar);
    free(conditions->work);
    free(conditions);
}

/* ---- temperature ---- */

/* Temperature of now, [padded]; 0 when it does not vary. */
static int temperature_now(const Model *model, double time, double *kelvin)
{
    const Variation *variation = model->variation;
    int padded = model->grid.padded;
    if (variation->co2 >= 0) {
        double co2 = schedule_abundance(&model->schedule, variation->co2, time);
        double doublings = log2(co2 / variation->co2_reference);
        for (int l = 0; l < padded; l++)
            kelvin[l] = model->air.temperature[l] + variation->doubling[l] * doublings;
        return 1;
    }
    if (variation->change.times) {
        profiles_at(&variation->change, 0, time, kelvin);
        for (int l = 0; l < padded; l++)
            kelvin[l] += model->air.temperature[l];
        return 1;
    }
    return 0;
}

static int move_air(Conditions *conditions, const Model *model, double time)
{
    double *kelvin = conditions->work, most = 0.0;
    int padded = model->grid.padded;
    if (!temperature_now(model, time, kelvin))
        return 0;
    for (int l = 0; l < padded; l++)
        most = fmax(most, fabs(kelvin[l] - conditions->temperature[l]));
    if (!(most > CONDITIONS_KELVIN))
        return 0;
    for (int l = 0; l < padded; l++) {
        double base = model->air.number_density[l];
        conditions->temperature[l] = kelvin[l];
        conditions->air[l] = base * (model->air.temperature[l] / kelvin[l]);
        conditions->depth[l] = model->grid.depth[l] * (base / conditions->air[l]);
    }
    return CONDITIONS_AIR;
}

/* ---- aerosol ---- */

/* Volume is surface times effective radius over 3, so the radius of two aerosols is the mean by surface. */
static int move_aerosol(Conditions *conditions, const Model *model, double time)
{
    const Profiles *volcanic = &model->variation->volcanic;
    int padded = model->grid.padded, moved = 0;
    double *area = conditions->work, *radius = conditions->work + padded;
    if (!volcanic->times)
        return 0;
    profiles_at(volcanic, 0, time, area);
    profiles_at(volcanic, 1, time, radius);
    for (int l = 0; l < padded; l++) {
        double old = model->aerosol_area[l], added = 1e-8 * area[l], sum = old + added;
        double mean = model->aerosol_radius[l];
        if (added > 0.0)
            mean = (old * mean + added * 1e-4 * radius[l]) / sum;
        if (sum == conditions->aerosol_area[l] && mean == conditions->aerosol_radius[l])
            continue;
        conditions->aerosol_area[l] = sum;
        conditions->aerosol_radius[l] = mean;
        moved = CONDITIONS_AEROSOL;
    }
    return moved;
}

/* ---- sunlight ---- */

static int move_light(Conditions *conditions, const Model *model, double time)
{
    const Variation *variation = model->variation;
    if (!variation->phases)
        return 0;
    double phase = table_linear(variation->year, variation->phase, variation->phases, time);
    if (fabs(phase - conditions->phase) <= CONDITIONS_SOLAR_STEP) /* NaN at first: untrue */
        return 0;
    conditions->phase = phase;
    for (int b = 0; b < model->spectra->bins; b++)
        conditions->solar[b] = 1.0 + variation->amplitude[b] * (phase - 0.5);
    return CONDITIONS_LIGHT;
}

int conditions_move(Conditions *conditions, const Model *model, double time, double season)
{
    (void)season;
    return move_air(conditions, model, time) | move_aerosol(conditions, model, time) |
           move_light(conditions, model, time);
}
