/* step_day: the explicit day. */
#include "stepper.h"

#include <omp.h>
#include <string.h>

#include "../input/constants.h"

_Static_assert(2 + PACK_DAY_PARTS / 2 <= MIXING_SLOTS, "a slot for each border of parts of the day");

/* Time integrals of a part of the day, from one pack to those of the day. */
static void add_integrals(Stepper *stepper, const PackWork *work, int first, int part)
{
    const Model *model = stepper->model;
    Day *day = stepper->day;
    int padded = model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < PACK; l++) {
            day->sum_y[FIELD(padded, s, first + l)] += work->sum_y[s * PACK + l];
            if (pack_part_lit(part))
                day->sum_lit[FIELD(padded, s, first + l)] += work->sum_y[s * PACK + l];
        }
    for (int r = 0; r < model->kernel->reactions; r++)
        for (int l = 0; l < PACK; l++)
            day->sum_w[FIELD(padded, r, first + l)] += work->sum_w[r * PACK + l];
}

static int carry_part(Stepper *stepper, Column *column, int part, Fault *fault)
{
    const Model *model = stepper->model;
    Tolerance tolerance = stepper_tolerance(model);
    int *order = stepper->order + (2 + part) * stepper->packs;
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int i = 0; i < stepper->packs; i++) {
        int p = order[i];
        PackWork *work = stepper->work[omp_get_thread_num()];
        PackOutcome *outcome = &stepper->outcome[p];
        outcome->counts = (SolverCounts){0};
        pack_load(work, model, p * PACK, column->x);
        pack_rates(work, model, p * PACK, stepper->coefficient, stepper->light->mean, NULL);
        memset(work->sum_y, 0, (size_t)model->kernel->species * PACK * sizeof(double));
        memset(work->sum_w, 0, (size_t)model->kernel->reactions * PACK * sizeof(double));
        outcome->result =
            pack_part(work, stepper->light, p * PACK, part, &tolerance,
                      &stepper->part_step[part * stepper->packs + p], &outcome->counts, &outcome->where);
        if (outcome->result)
            continue;
        pack_store(work, model, p * PACK, column->x, &outcome->ledger);
        add_integrals(stepper, work, p * PACK, part);
    }
    stepper_arrange(stepper, order);
    return stepper_settle_packs(stepper, column, fault);
}

/* Transport over the border at which part begins (PACK_DAY_PARTS: the day's end): the half of the part before
 * and the half of this one, in one. */
static int carry_border(Stepper *stepper, Column *column, int part, double length, Fault *fault)
{
    int slot = 1 + (part < PACK_DAY_PARTS / 2 ? part : PACK_DAY_PARTS - part);
    int code = mixing_prepare(stepper->mixing, slot, length, fault);
    if (!code)
        stepper_mix(stepper, column, slot, length, NULL);
    return code;
}

/* From midnight to midnight in parts, each half its transport, its chemistry, half its transport. Leaves the
 * time integrals in stepper->day. years: what the schedule's clock moves by. */
int stepper_carry_day(Stepper *stepper, Column *column, double years, Fault *fault)
{
    double elapsed = 0.0, half = 0.0;
    day_clear(stepper->day);
    for (int part = 0; part < PACK_DAY_PARTS; part++) {
        double length = pack_part_length(stepper->light, part);
        moments_see(stepper->moments, part, column->x);
        if (!(length > 0.0))
            continue;
        mixing_set_ground(stepper->mixing, column, column->time + elapsed / DAY_SECONDS * years);
        int code = carry_border(stepper, column, part, half + 0.5 * length, fault);
        if (!code)
            code = carry_part(stepper, column, part, fault);
        if (code)
            return code;
        half = 0.5 * length;
        elapsed += length;
    }
    int code = carry_border(stepper, column, PACK_DAY_PARTS, half, fault);
    if (code)
        return code;
    moments_see(stepper->moments, PACK_DAY_PARTS, column->x);
    mixing_set_ground(stepper->mixing, column, column->time + years);
    return 0;
}

/* Repeat the day of the column's state until it gives the same factors. */
int stepper_repeat_day(Stepper *stepper, Column *column, double enough, int exactly, Fault *fault)
{
    const Model *model = stepper->model;
    Day *day = stepper->day;
    Column *sample = stepper->sample;
    int cold = !day->ready, settled = 0, days = 0;
    memcpy(sample->x, column->x,
           (size_t)model->mechanism->solved * (size_t)model->grid.padded * sizeof(double));
    sample->time = column->time;
    while (exactly > 0 ? days < exactly : cold ? days < DAY_COLD : !settled && days < DAY_MOST) {
        if (!cold)
            day_midnight(day, column->x, sample->x);
        int code = stepper_carry_day(stepper, sample, 0.0, fault);
        if (code)
            return code;
        settled = day_take(day, stepper->light, sample->x, pack_lit_time(stepper->light),
                           stepper->coefficient) < enough;
        days++;
    }
    day_settle(day, column->x);
    column->days += days;
    column->unsettled += !cold && !settled;
    column->factor_refreshes++;
    stepper->since_factors = 0.0;
    return 0;
}

int stepper_day_due(const Stepper *stepper, const Column *column)
{
    if (stepper->model->settings.day != DAY_FACTORS)
        return 0;
    double times = stepper->followed_log ? REFRESH_OWN_ACCORD : 1.0;
    return stepper->since_factors >= times * stepper->model->settings.refresh_years * YEAR_SECONDS ||
           day_stale_by(stepper->day, column->x, times);
}

int stepper_follow_day(Stepper *stepper, Column *column, Fault *fault)
{
    if (stepper->model->settings.day != DAY_FACTORS)
        return 0;
    int days = stepper->followed_log ? stepper->followed_log->days[stepper->logged] : 0;
    if (!days && !stepper_day_due(stepper, column))
        return 0;
    long before = column->days;
    int code = stepper_repeat_day(stepper, column, DAY_FOLLOWED, days, fault);
    if (stepper->kept_log)
        stepper->kept_log->days[stepper->logged] = (unsigned char)(column->days - before);
    return code;
}
