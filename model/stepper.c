/* stepper: making a stepper, and the coefficients it works with. */
#include "stepper.h"

#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/rates.h"
#include "../chem/surface.h"
#include "../input/constants.h"
#include "emission.h"

/* ---- making ---- */

static int allocate(Stepper *stepper, Fault *fault)
{
    const Model *model = stepper->model;
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    size_t packs = (size_t)stepper->packs, threads = (size_t)stepper->threads;
    size_t ledger = (size_t)model->held + solved + (size_t)model->kernel->tallies;
    stepper->work = calloc(threads, sizeof *stepper->work);
    stepper->outcome = calloc(packs, sizeof *stepper->outcome);
    stepper->order = calloc((2 + PACK_DAY_PARTS) * packs, sizeof(int));
    stepper->ledgers = calloc(packs * ledger, sizeof(double));
    stepper->half_step = calloc(2 * packs, sizeof(double));
    stepper->part_step = calloc(PACK_DAY_PARTS * packs, sizeof(double));
    stepper->coefficient = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    stepper->density = calloc(solved * padded, sizeof(double));
    stepper->mean = calloc(solved * padded, sizeof(double));
    stepper->balanced = calloc(solved, sizeof(int));
    stepper->turn = calloc(solved * padded, sizeof(double));
    stepper->made = calloc(solved * padded, sizeof(double));
    stepper->lost = calloc(solved * padded, sizeof(double));
    stepper->daylight = calloc(solved * padded, sizeof(double));
    stepper->given = calloc(solved * padded, sizeof(double));
    stepper->sink = calloc(solved * padded, sizeof(double));
    stepper->flux = calloc(solved, sizeof(double));
    stepper->absorbed = calloc(solved, sizeof(double));
    stepper->reacts = calloc(solved, 1);
    if (!stepper->work || !stepper->outcome || !stepper->order || !stepper->ledgers || !stepper->half_step ||
        !stepper->part_step || !stepper->coefficient || !stepper->density || !stepper->mean ||
        !stepper->balanced || !stepper->turn || !stepper->made || !stepper->lost || !stepper->daylight ||
        !stepper->given || !stepper->sink || !stepper->flux || !stepper->absorbed || !stepper->reacts)
        return fault_memory(fault, "stepper");
    for (size_t i = 0; i < (2 + PACK_DAY_PARTS) * packs; i++)
        stepper->order[i] = (int)(i % packs);
    for (size_t p = 0; p < packs; p++) {
        double *at = stepper->ledgers + p * ledger;
        stepper->outcome[p].ledger = (PackLedger){
            .exchanged = at, .received = at + model->held, .washed = at + (size_t)model->held + solved};
    }
    int code = 0;
    for (size_t t = 0; !code && t < threads; t++)
        code = pack_make(&stepper->work[t], model, fault);
    return code;
}

/* Which species have a balance: those carried whose atoms are O, H and C only. Carbon goes one way, from
 * methane to CO2, so that what is taken from a member comes after from the one before it. Of the other
 * elements the chemistry keeps the sum over a family, whose members, each with a steady sink, would be
 * emptied when the family is. */
static void list_balanced(Stepper *stepper)
{
    const Mechanism *mechanism = stepper->model->mechanism;
    for (int s = 0; s < mechanism->solved; s++) {
        int other = !mechanism->item[mechanism->solved_item[s]].transport;
        for (int e = 0; e < mechanism->elements; e++)
            if (!strchr("OHC", mechanism->element[e][0]) || mechanism->element[e][1])
                other |= mechanism_atoms(mechanism, s, e) != 0;
        if (!other)
            stepper->balanced[stepper->balances++] = s;
    }
}

/* See stepper_source. */
static void list_reacting(Stepper *stepper)
{
    const Model *model = stepper->model;
    for (int s = 0; s < model->mechanism->solved; s++)
        stepper->reacts[s] = !(model_deposition(model, s) > 0.0) && model_makes(model, s);
}

/* All that hang on temperature and air; water enters HO2 + HO2 only and is renewed at every step. */
void stepper_thermal(Stepper *stepper)
{
    const Conditions *now = stepper->conditions;
    rates_thermal(stepper->model->mechanism, stepper->model->grid.padded, now->temperature, now->air,
                  stepper->density, 0, stepper->coefficient);
}

int stepper_make(Stepper **made, const Model *model, int threads, Fault *fault)
{
    *made = NULL;
    Stepper *stepper = calloc(1, sizeof *stepper);
    if (!stepper)
        return fault_memory(fault, "stepper");
    stepper->model = model;
    stepper->threads = threads < 1 ? omp_get_max_threads() : threads;
    stepper->packs = model->grid.padded / PACK;
    int code = allocate(stepper, fault);
    if (!code)
        code = mixing_make(&stepper->mixing, model, stepper->threads, fault);
    if (!code)
        code = conditions_make(&stepper->conditions, model, fault);
    if (!code)
        code = light_make(&stepper->light, model, 1, fault);
    if (!code)
        code = day_make(&stepper->day, model, fault);
    if (!code)
        code = moments_make(&stepper->moments, model, fault);
    if (!code)
        code = column_make(&stepper->sample, model, fault);
    if (code) {
        stepper_free(stepper);
        return code;
    }
    list_balanced(stepper);
    list_reacting(stepper);
    for (int t = 0; t < stepper->threads; t++)
        stepper->work[t]->conditions = stepper->conditions;
    stepper->day->conditions = stepper->conditions;
    light_follow(stepper->light, stepper->conditions, 0);
    stepper_thermal(stepper);
    rates_washout(model->mechanism, model->grid.padded, model->washout_rate, stepper->coefficient);
    *made = stepper;
    return 0;
}

void stepper_free(Stepper *stepper)
{
    if (!stepper)
        return;
    for (int t = 0; stepper->work && t < stepper->threads; t++)
        pack_free(stepper->work[t]);
    mixing_free(stepper->mixing);
    conditions_free(stepper->conditions);
    light_free(stepper->light);
    day_free(stepper->day);
    moments_free(stepper->moments);
    column_free(stepper->sample);
    free(stepper->work);
    free(stepper->outcome);
    free(stepper->order);
    free(stepper->ledgers);
    free(stepper->half_step);
    free(stepper->part_step);
    free(stepper->coefficient);
    free(stepper->density);
    free(stepper->mean);
    free(stepper->balanced);
    free(stepper->turn);
    free(stepper->made);
    free(stepper->lost);
    free(stepper->daylight);
    free(stepper->given);
    free(stepper->sink);
    free(stepper->flux);
    free(stepper->absorbed);
    free(stepper->reacts);
    free(stepper);
}

/* ---- copies ---- */

/* Left out: what each step makes for itself (work of the packs, emissions of now, factors of the transport)
 * and what does not change in a case. */
void stepper_copy(Stepper *to, const Stepper *from)
{
    const Model *model = from->model;
    size_t padded = (size_t)model->grid.padded, packs = (size_t)from->packs;
    size_t field = (size_t)model->mechanism->solved * padded * sizeof(double);
    conditions_copy(to->conditions, from->conditions, model);
    mixing_follow(to->mixing, to->conditions);
    light_copy(to->light, from->light);
    day_copy(to->day, from->day);
    moments_copy(to->moments, from->moments);
    to->spun = from->spun;
    to->since_factors = from->since_factors;
    to->daylight_known = from->daylight_known;
    to->logged = from->logged;
    memcpy(to->order, from->order, (2 + PACK_DAY_PARTS) * packs * sizeof(int));
    memcpy(to->half_step, from->half_step, 2 * packs * sizeof(double));
    memcpy(to->part_step, from->part_step, PACK_DAY_PARTS * packs * sizeof(double));
    memcpy(to->coefficient, from->coefficient, (size_t)model->mechanism->reactions * padded * sizeof(double));
    memcpy(to->mean, from->mean, field);
    memcpy(to->daylight, from->daylight, field);
}

int refresh_log_make(RefreshLog *log, long room, Fault *fault)
{
    *log = (RefreshLog){.room = room};
    log->light = calloc((size_t)room + 1, 1);
    log->days = calloc((size_t)room + 1, 1);
    if (log->light && log->days)
        return 0;
    refresh_log_free(log);
    return fault_memory(fault, "moments of refreshing");
}

void refresh_log_free(RefreshLog *log)
{
    free(log->light);
    free(log->days);
    *log = (RefreshLog){0};
}

void stepper_keep_log(Stepper *stepper, RefreshLog *log)
{
    stepper->kept_log = log;
    stepper->logged = 0;
}

void stepper_follow_log(Stepper *stepper, const RefreshLog *log)
{
    stepper->followed_log = log;
}

/* ---- coefficients and light ---- */

/* Mean photolysis rates go among the coefficients. */
static void take_light(Stepper *stepper)
{
    size_t padded = (size_t)stepper->model->grid.padded;
    memcpy(stepper->coefficient + FIELD(padded, stepper->model->mechanism->photolysis_first, 0),
           stepper->light->mean, (size_t)stepper->light->reactions * padded * sizeof(double));
}

/* What the schedule's lines give off at decimal year time. What falls where a value is prescribed is the
 * reservoir's behind it. */
static void follow_emissions(Stepper *stepper, double time)
{
    const Model *model = stepper->model;
    const Emissions *emissions = model->emissions;
    int padded = model->grid.padded;
    stepper->giving = emissions->given > 0;
    if (!stepper->giving)
        return;
    emissions_at(model, time, stepper->flux, NULL, stepper->given);
    for (int g = 0; g < emissions->given; g++) {
        int s = emissions->given_species[g];
        stepper->absorbed[s] = 0.0;
        for (int l = 0; l < model->grid.layers; l++)
            stepper->absorbed[s] += stepper->given[FIELD(padded, s, l)];
    }
    mixing_mask(stepper->mixing, stepper->given);
    for (int g = 0; g < emissions->given; g++) {
        int s = emissions->given_species[g];
        double *row = stepper->given + FIELD(padded, s, 0), free_part = 0.0;
        for (int l = 0; l < model->grid.layers; l++) {
            free_part += row[l];
            row[l] /= model->air.number_density[l] * model->grid.depth[l];
        }
        stepper->absorbed[s] -= free_part;
    }
}

const double *stepper_source(Stepper *stepper, const Column *column)
{
    const Model *model = stepper->model;
    const Emissions *emissions = model->emissions;
    size_t padded = (size_t)model->grid.padded;
    if (!stepper->giving)
        return column->balance;
    memcpy(stepper->sink, column->balance, (size_t)model->mechanism->solved * padded * sizeof(double));
    for (int g = 0; g < emissions->given; g++) {
        int s = emissions->given_species[g];
        for (size_t l = 0; stepper->reacts[s] && l < padded; l++)
            stepper->sink[FIELD(padded, s, l)] += stepper->given[FIELD(padded, s, l)];
    }
    return stepper->sink;
}

void stepper_mix(Stepper *stepper, Column *column, int slot, double length, const double *balance)
{
    const Model *model = stepper->model;
    const Emissions *emissions = model->emissions;
    size_t padded = (size_t)model->grid.padded, field = (size_t)model->mechanism->solved * padded;
    if (!stepper->giving) {
        mixing_step(stepper->mixing, slot, column, balance);
        return;
    }
    if (balance)
        memcpy(stepper->sink, balance, field * sizeof(double));
    else
        memset(stepper->sink, 0, field * sizeof(double));
    for (int g = 0; g < emissions->given; g++) {
        int s = emissions->given_species[g];
        double *sink = stepper->sink + FIELD(padded, s, 0);
        const double *given = stepper->given + FIELD(padded, s, 0);
        int with_chemistry = balance && stepper->reacts[s];
        for (size_t l = 0; !with_chemistry && l < padded; l++)
            sink[l] -= given[l];
        column->emitted[s] += stepper->flux[s] * length;
        *(model_holds(model, s) ? &column->exchanged[s] : &column->received[s]) -=
            stepper->absorbed[s] * length;
    }
    mixing_step(stepper->mixing, slot, column, stepper->sink);
}

/* Bring the conditions to decimal year time, and what is made of them. */
void stepper_move(Stepper *stepper, double time, double season)
{
    int moved = conditions_move(stepper->conditions, stepper->model, time, season);
    if (moved & CONDITIONS_GROUND)
        mixing_follow(stepper->mixing, stepper->conditions);
    follow_emissions(stepper, time);
    if (!moved)
        return;
    if (moved & CONDITIONS_AIR)
        stepper_thermal(stepper);
    if (moved & CONDITIONS_SUN)
        stepper->day->outdated = 1;
    if (light_follow(stepper->light, stepper->conditions, moved))
        take_light(stepper);
}

void stepper_local_coefficients(Stepper *stepper, const Column *column)
{
    const Model *model = stepper->model;
    const Mechanism *mechanism = model->mechanism;
    const Conditions *now = stepper->conditions;
    int padded = model->grid.padded, water = mechanism_solved(mechanism, "H2O");
    for (int s = 0; s < mechanism->solved; s++)
        for (int l = 0; l < padded; l++)
            stepper->density[FIELD(padded, s, l)] = column->x[FIELD(padded, s, l)] * now->air[l];
    if (water >= 0)
        rates_thermal(mechanism, padded, now->temperature, now->air,
                      stepper->density + FIELD(padded, water, 0), 1, stepper->coefficient);
    surface_rates(mechanism, padded, now->temperature, now->air, now->aerosol_area, now->aerosol_radius,
                  stepper->density, stepper->coefficient);
}

void stepper_follow_light(Stepper *stepper, Column *column)
{
    const double *x = column->x, *lit = stepper->day->lit; /* 1 as long as no day has been made */
    if (stepper->model->settings.day == DAY_EXPLICIT) {
        x = stepper->daylight_known ? stepper->daylight : column->x;
        lit = NULL;
    }
    const RefreshLog *followed = stepper->followed_log;
    int due = light_stale_by(stepper->light, x, lit, followed ? REFRESH_OWN_ACCORD : 1.0);
    if (followed)
        due |= followed->light[stepper->logged];
    else if (stepper->kept_log)
        due |= stepper_day_due(stepper, column);
    if (!due)
        return;
    if (stepper->kept_log)
        stepper->kept_log->light[stepper->logged] = 1;
    light_refresh(stepper->light, x, lit);
    column->photolysis_refreshes++;
    take_light(stepper);
}

/* ---- what a step leaves ---- */

const double *stepper_mean(const Stepper *stepper)
{
    return stepper->mean;
}
const Light *stepper_light(const Stepper *stepper)
{
    return stepper->light;
}
const Conditions *stepper_conditions(const Stepper *stepper)
{
    return stepper->conditions;
}
const Day *stepper_day(const Stepper *stepper)
{
    return stepper->day;
}
void stepper_moments(const Stepper *stepper, const double *mean, double *out)
{
    moments_values(stepper->moments, stepper->day, mean, out);
}
StepClock stepper_clock(const Stepper *stepper)
{
    return stepper->clock;
}
const double *stepper_coefficients(const Stepper *stepper)
{
    return stepper->coefficient;
}
