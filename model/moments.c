/* moments: mole fractions by time of day. */
#include "moments.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "budget.h"
#include "pack.h"

static size_t field(const Model *model)
{
    return (size_t)model->mechanism->solved * (size_t)model->grid.padded;
}

int moments_make(Moments **made, const Model *model, Fault *fault)
{
    *made = NULL;
    Moments *moments = calloc(1, sizeof *moments);
    if (!moments)
        return fault_memory(fault, "values by time of day");
    moments->model = model;
    moments->state = calloc(MOMENTS * field(model), sizeof(double));
    if (!moments->state) {
        moments_free(moments);
        return fault_memory(fault, "values by time of day");
    }
    *made = moments;
    return 0;
}

void moments_free(Moments *moments)
{
    if (!moments)
        return;
    free(moments->state);
    free(moments);
}

void moments_copy(Moments *to, const Moments *from)
{
    memcpy(to->state, from->state, MOMENTS * field(from->model) * sizeof(double));
}

int moments_hours(const Settings *settings, double *hours, Fault *fault)
{
    const double hour = DAY_SECONDS / 24.0, noon = 0.5 * DAY_SECONDS;
    Sun sun;
    sun_make(&sun, settings, 1);
    double rise = sun.rises ? sun.time[0] : noon;
    if (!(rise > 0.0 && rise < noon))
        return fault_at(
            fault, settings->case_path[0] ? settings->case_path : "built-in case", 0,
            "output.moments: at latitude %g on day %g it is %s for 24 h (twilight counts until the sun is "
            "11.5 degrees below the horizon), so there is no dawn and no dusk; choose another day or "
            "latitude, or output.moments = \"none\"",
            settings->latitude_deg, settings->day_of_year, sun.rises ? "light" : "dark");
    hours[MOMENT_MIDNIGHT] = 0.0;
    hours[MOMENT_SUNRISE] = rise / hour;
    hours[MOMENT_NOON] = noon / hour;
    hours[MOMENT_SUNSET] = (DAY_SECONDS - rise) / hour;
    return 0;
}

const char *moment_name(const Settings *settings, int moment)
{
    static const char *const names[2][MOMENTS] = {{"midnight", "sunrise", "noon", "sunset"},
                                                  {"midnight", "dawn", "noon", "dusk"}};
    return names[settings->sun == SUN_LATITUDE][moment];
}

int moments_has(const Model *model, int s)
{
    return !budget_is_source(model, s);
}

void moments_see(Moments *moments, int part, const double *x)
{
    enum { RISE = PACK_NIGHT_PARTS, NOON = PACK_DAY_PARTS / 2, SET = PACK_DAY_PARTS - PACK_NIGHT_PARTS };
    int moment = part == PACK_DAY_PARTS ? MOMENT_MIDNIGHT
                 : part == RISE         ? MOMENT_SUNRISE
                 : part == NOON         ? MOMENT_NOON
                 : part == SET          ? MOMENT_SUNSET
                                        : -1;
    if (moment >= 0)
        memcpy(moments->state + (size_t)moment * field(moments->model), x,
               field(moments->model) * sizeof(double));
}

double moments_ratio(const Moments *moments, const Day *day, int moment, int s, int layer)
{
    const Model *model = moments->model;
    size_t at = FIELD(model->grid.padded, s, layer);
    double mean = day->sum_y[at] / DAY_SECONDS;
    double now = moments->state[(size_t)moment * field(model) + at] * day->conditions->air[layer];
    /* as for the ratio at midnight (day.c): a value below zero is zero within the solver's tolerance */
    return mean > DAY_ABSENT ? fmax(0.0, now) / mean : 1.0;
}

void moments_values(const Moments *moments, const Day *day, const double *mean, double *out)
{
    const Model *model = moments->model;
    if (model->settings.day == DAY_EXPLICIT) {
        memcpy(out, moments->state, MOMENTS * field(model) * sizeof(double));
        return;
    }
    for (int m = 0; m < MOMENTS; m++)
        for (int s = 0; s < model->mechanism->solved; s++)
            for (int l = 0; l < model->grid.padded; l++) {
                size_t at = FIELD(model->grid.padded, s, l);
                out[(size_t)m * field(model) + at] = mean[at] * moments_ratio(moments, day, m, s, l);
            }
}
