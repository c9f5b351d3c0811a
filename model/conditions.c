/* conditions: see conditions.h. */
#include "conditions.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"
#include "sun.h"
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
    conditions->kept = malloc((size_t)model->mechanism->solved);
    conditions->work = malloc(2 * bytes);
    if (!conditions->temperature || !conditions->air || !conditions->depth || !conditions->aerosol_area ||
        !conditions->aerosol_radius || !conditions->held_fraction || !conditions->solar ||
        !conditions->kept || !conditions->work) {
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
    for (int s = 0; s < model->mechanism->solved; s++)
        conditions->kept[s] = (unsigned char)model_keeps(model, s, model->settings.first_year - 1.0);
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
    free(conditions->kept);
    free(conditions->work);
    free(conditions);
}

void conditions_copy(Conditions *to, const Conditions *from, const Model *model)
{
    size_t bytes = (size_t)model->grid.padded * sizeof(double);
    memcpy(to->temperature, from->temperature, bytes);
    memcpy(to->air, from->air, bytes);
    memcpy(to->depth, from->depth, bytes);
    memcpy(to->aerosol_area, from->aerosol_area, bytes);
    memcpy(to->aerosol_radius, from->aerosol_radius, bytes);
    memcpy(to->held_fraction, from->held_fraction, MODEL_HELD_MOST * bytes);
    memcpy(to->solar, from->solar, (size_t)model->spectra->bins * sizeof(double));
    memcpy(to->kept, from->kept, (size_t)model->mechanism->solved);
    to->phase = from->phase;
    to->day_of_year = from->day_of_year;
}

/* ---- temperature ---- */

/* Temperature of now, [padded]; 0 when it does not vary. */
static int temperature_now(const Model *model, double time, double season, double *kelvin, double *work)
{
    const Variation *variation = model->variation;
    int padded = model->grid.padded;
    int by_month = variation->month_air.times > 0, by_year = variation->change.times > 0;
    if (by_month)
        profiles_in_year(&variation->month_air, 0, season, kelvin);
    else
        memcpy(kelvin, model->air.temperature, (size_t)padded * sizeof(double));
    if (variation->co2 >= 0) {
        double co2 = schedule_abundance(&model->schedule, variation->co2, time);
        double doublings = log2(co2 / variation->co2_reference);
        for (int l = 0; l < padded; l++)
            kelvin[l] += variation->doubling[l] * doublings;
    }
    if (by_year) {
        profiles_at(&variation->change, 0, time, work);
        for (int l = 0; l < padded; l++)
            kelvin[l] += work[l];
    }
    return variation_of_temperature(variation);
}

static int move_air(Conditions *conditions, const Model *model, double time, double season)
{
    int padded = model->grid.padded;
    double *kelvin = conditions->work, most = 0.0;
    if (!temperature_now(model, time, season, kelvin, conditions->work + padded))
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

/* ---- season ---- */

static int move_sun(Conditions *conditions, const Model *model, double season)
{
    if (model->settings.sun != SUN_SEASON)
        return 0;
    double day = 1.0 + 365.25 * (season - floor(season));
    double turn = fabs(sun_declination(day) - sun_declination(conditions->day_of_year)) * 180.0 / PI;
    if (turn <= CONDITIONS_SUN_DEGREES && fabs(day - conditions->day_of_year) <= CONDITIONS_SUN_DAYS)
        return 0;
    conditions->day_of_year = day;
    return CONDITIONS_SUN;
}

/* After move_air: what is held as a density is a share of the air of now. */
static int move_held(Conditions *conditions, const Model *model, double season)
{
    int padded = model->grid.padded, moved = 0;
    for (int h = 0; h < model->held; h++) {
        const Profiles *month = &model->variation->month_held[h];
        if (!month->times)
            continue;
        profiles_in_year(month, 0, season, conditions->work);
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, h, l);
            if (model->held_free[at] != 0.0)
                continue;
            double x = conditions->work[l] / (model->variation->month_density[h] ? conditions->air[l] : 1.0);
            moved |= x != conditions->held_fraction[at] ? CONDITIONS_HELD : 0;
            conditions->held_fraction[at] = x;
        }
    }
    return moved;
}

static int move_ground(Conditions *conditions, const Model *model, double time)
{
    int moved = 0;
    for (int s = 0; s < model->mechanism->solved; s++) {
        if (model->surface_kind[s] != SURFACE_SCHEDULE)
            continue;
        unsigned char kept = (unsigned char)model_keeps(model, s, time);
        if (kept != conditions->kept[s])
            moved = CONDITIONS_GROUND;
        conditions->kept[s] = kept;
    }
    return moved;
}

int conditions_move(Conditions *conditions, const Model *model, double time, double season)
{
    int moved = move_air(conditions, model, time, season) | move_aerosol(conditions, model, time) |
                move_light(conditions, model, time) | move_sun(conditions, model, season) |
                move_ground(conditions, model, time);
    return moved | move_held(conditions, model, season);
}
