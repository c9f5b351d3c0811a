/* step: the outer step. */
#include "step.h"

#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/rates.h"
#include "../chem/surface.h"
#include "../input/constants.h"
#include "mixing.h"

_Static_assert(2 + PACK_DAY_PARTS / 2 <= MIXING_SLOTS, "a slot for each border of parts of the day");

/* Share of a species' production that its balance may take. Of ozone and atomic oxygen, which photolysis
 * turns over within minutes, transport takes far less anywhere. */
static const double BALANCE_SHARE = 0.5;

typedef struct {
    int result, where; /* of the solver */
    SolverCounts counts;
    PackLedger ledger;
} PackOutcome;

struct Stepper {
    const Model *model;
    Conditions *conditions; /* of now */
    double spun;            /* years spent with the clock standing still: the seasons go on */
    int threads, packs;
    Mixing *mixing; /* slot 0: the step of a run of means; the others: borders of parts of the day with their
                       mirror images */
    Light *light;
    Day *day;
    Moments *moments;
    Column *sample;       /* the column of the explicit days that give the factors; its ledger is nobody's */
    PackWork **work;      /* [threads] */
    PackOutcome *outcome; /* [packs] */
    int *order; /* [2 + PACK_DAY_PARTS][packs] packs by the work they were last time, most first: threads end
                   together */
    double *ledgers;     /* [packs][held + solved + tallies], behind outcome[].ledger */
    double *half_step;   /* [2][packs] solver step to try first: before the transport, after it */
    double *part_step;   /* [PACK_DAY_PARTS][packs] the same for the parts of the day */
    double *coefficient; /* [reactions][padded] */
    double *density;     /* [solved][padded] work */
    double *mean;        /* [solved][padded] */
    int balances;        /* species with a balance */
    int *balanced;       /* [balances] which */
    double *turn;        /* [balances][padded] running sum for the balance of a step */
    double *made, *lost; /* [solved][padded] by the chemistry at the end of a step, mole fraction s-1 */
    double *daylight;    /* [solved][padded] explicit days: mean of the last day while the sun was up */
    int daylight_known;
    double since_factors; /* s of the run since the diurnal factors were made */
    StepClock clock;
};

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
    if (!stepper->work || !stepper->outcome || !stepper->order || !stepper->ledgers || !stepper->half_step ||
        !stepper->part_step || !stepper->coefficient || !stepper->density || !stepper->mean ||
        !stepper->balanced || !stepper->turn || !stepper->made || !stepper->lost || !stepper->daylight)
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

/* Which species have a balance: those carried whose atoms are O and H only. Of the other elements the
 * chemistry keeps the sum over a family, whose members, each with a steady sink, would be emptied when the
 * family is. */
static void list_balanced(Stepper *stepper)
{
    const Mechanism *mechanism = stepper->model->mechanism;
    for (int s = 0; s < mechanism->solved; s++) {
        int other = !mechanism->item[mechanism->solved_item[s]].transport;
        for (int e = 0; e < mechanism->elements; e++)
            if (strcmp(mechanism->element[e], "O") && strcmp(mechanism->element[e], "H"))
                other |= mechanism_atoms(mechanism, s, e) != 0;
        if (!other)
            stepper->balanced[stepper->balances++] = s;
    }
}

/* All that hang on temperature and air; water enters HO2 + HO2 only and is renewed at every step. */
static void thermal_coefficients(Stepper *stepper)
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
    for (int t = 0; t < stepper->threads; t++)
        stepper->work[t]->conditions = stepper->conditions;
    stepper->day->conditions = stepper->conditions;
    light_follow(stepper->light, stepper->conditions, 0);
    thermal_coefficients(stepper);
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
    free(stepper);
}

/* ---- coefficients and light ---- */

/* Mean photolysis rates go among the coefficients. */
static void take_light(Stepper *stepper)
{
    size_t padded = (size_t)stepper->model->grid.padded;
    memcpy(stepper->coefficient + FIELD(padded, stepper->model->mechanism->photolysis_first, 0),
           stepper->light->mean, (size_t)stepper->light->reactions * padded * sizeof(double));
}

/* Bring the conditions to decimal year time, and what is made of them. */
static void move_conditions(Stepper *stepper, double time, double season)
{
    int moved = conditions_move(stepper->conditions, stepper->model, time, season);
    if (!moved)
        return;
    if (moved & CONDITIONS_AIR)
        thermal_coefficients(stepper);
    if (moved & CONDITIONS_SUN)
        stepper->day->outdated = 1;
    if (light_follow(stepper->light, stepper->conditions, moved))
        take_light(stepper);
}

static void refresh_coefficients(Stepper *stepper, const Column *column)
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

static void refresh_light(Stepper *stepper, Column *column)
{
    const double *x = column->x, *lit = stepper->day->lit; /* 1 as long as no day has been made */
    if (stepper->model->settings.day == DAY_EXPLICIT) {
        x = stepper->daylight_known ? stepper->daylight : column->x;
        lit = NULL;
    }
    if (!light_stale(stepper->light, x, lit))
        return;
    light_refresh(stepper->light, x, lit);
    column->photolysis_refreshes++;
    take_light(stepper);
}

/* ---- chemistry ---- */

static Tolerance tolerance_of(const Model *model)
{
    return (Tolerance){model->settings.relative_tolerance, model->settings.absolute_tolerance_cm3, 20000};
}

static void add_counts(SolverCounts *sum, const SolverCounts *part)
{
    sum->calls += part->calls;
    sum->steps += part->steps;
    sum->rejections += part->rejections;
    sum->factorisations += part->factorisations;
    sum->negatives += part->negatives;
    if (part->most_negative < sum->most_negative)
        sum->most_negative = part->most_negative;
}

static void arrange(const Stepper *stepper, int *order)
{
    for (int i = 1; i < stepper->packs; i++) { /* nearly sorted already */
        int pack = order[i], j = i;
        for (; j > 0 && stepper->outcome[order[j - 1]].counts.factorisations <
                            stepper->outcome[pack].counts.factorisations;
             j--)
            order[j] = order[j - 1];
        order[j] = pack;
    }
}

/* After the packs: sums in their order, or the first fault. */
static int settle_packs(Stepper *stepper, Column *column, Fault *fault)
{
    const Model *model = stepper->model;
    const Kernel *kernel = model->kernel;
    for (int p = 0; p < stepper->packs; p++) {
        PackOutcome *outcome = &stepper->outcome[p];
        if (outcome->result)
            return pack_fault(model, p * PACK, outcome->result, outcome->where, column->time, fault);
        for (int s = 0; p == 0 && s < model->mechanism->solved; s++)
            column->received[s] += outcome->ledger.received[s];
        for (int h = 0; h < model->held; h++)
            column->exchanged[model->held_species[h]] += outcome->ledger.exchanged[h];
        for (int t = 0; t < kernel->tallies; t++)
            column->washed[kernel->reactant[3 * kernel->tally_reaction[t]]] += outcome->ledger.washed[t];
        for (int c = 0; c < kernel->counters; c++)
            column->escaped[c] += outcome->ledger.escaped[c];
        add_counts(&column->counts, &outcome->counts);
    }
    return 0;
}

/* half: 0 before the transport, 1 after it. The two start differently: the second with radicals that
 * transport has thrown out of balance. */
static int chemistry(Stepper *stepper, Column *column, double step, int half, Fault *fault)
{
    const Model *model = stepper->model;
    Tolerance tolerance = tolerance_of(model);
    const double *factor = model->settings.day == DAY_FACTORS ? stepper->day->factor : NULL;
    int *order = stepper->order + half * stepper->packs;
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int i = 0; i < stepper->packs; i++) {
        int p = order[i];
        PackWork *work = stepper->work[omp_get_thread_num()];
        PackOutcome *outcome = &stepper->outcome[p];
        double *first_step = &stepper->half_step[half * stepper->packs + p];
        outcome->counts = (SolverCounts){0};
        pack_load(work, model, p * PACK, column->x);
        pack_source(work, model, p * PACK, column->balance, step);
        pack_rates(work, model, p * PACK, stepper->coefficient, stepper->light->mean, factor);
        PackProblem problem = pack_problem(work, 0, *first_step);
        problem.source = work->source;
        problem.production = work->production;
        problem.loss = work->loss;
        outcome->result = solver_advance(model->kernel, work->solver, &problem, step, &tolerance,
                                         &outcome->counts, &outcome->where);
        *first_step = problem.first;
        if (outcome->result)
            continue;
        pack_turnover(work, model, p * PACK, stepper->made, stepper->lost);
        pack_store(work, model, p * PACK, column->x, &outcome->ledger);
    }
    arrange(stepper, order);
    return settle_packs(stepper, column, fault);
}

/* ---- the day ---- */

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
    Tolerance tolerance = tolerance_of(model);
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
    arrange(stepper, order);
    return settle_packs(stepper, column, fault);
}

/* Transport over the border at which part begins (PACK_DAY_PARTS: the day's end): the half of the part before
 * and the half of this one, in one. */
static int carry_border(Stepper *stepper, Column *column, int part, double length, Fault *fault)
{
    int slot = 1 + (part < PACK_DAY_PARTS / 2 ? part : PACK_DAY_PARTS - part);
    int code = mixing_prepare(stepper->mixing, slot, length, fault);
    if (!code)
        mixing_step(stepper->mixing, slot, column, NULL);
    return code;
}

/* From midnight to midnight in parts, each half its transport, its chemistry, half its transport. Leaves the
 * time integrals in stepper->day. years: what the schedule's clock moves by. */
static int carry_day(Stepper *stepper, Column *column, double years, Fault *fault)
{
    double elapsed = 0.0, half = 0.0;
    day_clear(stepper->day);
    for (int part = 0; part < PACK_DAY_PARTS; part++) {
        double length = pack_part_length(stepper->light, part);
        moments_see(stepper->moments, part, column->x);
        if (!(length > 0.0))
            continue;
        mixing_set_ground(stepper->model, column, column->time + elapsed / DAY_SECONDS * years);
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
    mixing_set_ground(stepper->model, column, column->time + years);
    return 0;
}

/* Repeat the day of the column's state until it gives the same factors. */
static int repeat_day(Stepper *stepper, Column *column, Fault *fault)
{
    const Model *model = stepper->model;
    Day *day = stepper->day;
    Column *sample = stepper->sample;
    int cold = !day->ready, settled = 0, days = 0;
    memcpy(sample->x, column->x,
           (size_t)model->mechanism->solved * (size_t)model->grid.padded * sizeof(double));
    sample->time = column->time;
    while (cold ? days < DAY_COLD : !settled && days < DAY_MOST) {
        if (!cold)
            day_midnight(day, column->x, sample->x);
        int code = carry_day(stepper, sample, 0.0, fault);
        if (code)
            return code;
        settled = day_take(day, stepper->light, sample->x, pack_lit_time(stepper->light),
                           stepper->coefficient) < DAY_SETTLED;
        days++;
    }
    day_settle(day, column->x);
    column->days += days;
    column->unsettled += !cold && !settled;
    column->factor_refreshes++;
    stepper->since_factors = 0.0;
    return 0;
}

static int refresh_factors(Stepper *stepper, Column *column, Fault *fault)
{
    const Settings *settings = &stepper->model->settings;
    if (settings->day != DAY_FACTORS || (stepper->since_factors < settings->refresh_years * YEAR_SECONDS &&
                                         !day_stale(stepper->day, column->x)))
        return 0;
    return repeat_day(stepper, column, fault);
}

/* ---- the step ---- */

/* The solver counts at the end of each call; this is for a state that transport had last. */
static void count_negatives(const Model *model, Column *column)
{
    int padded = model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < model->grid.layers; l++) {
            double y = column->x[FIELD(padded, s, l)] * model->air.number_density[l];
            if (y >= 0.0)
                continue;
            column->counts.negatives++;
            if (y < column->counts.most_negative)
                column->counts.most_negative = y;
        }
}

/* Part of the clock that ends now. */
static void charge(double *part, double *since)
{
    double now = omp_get_wtime();
    *part += now - *since;
    *since = now;
}

static int advance_explicit(Stepper *stepper, Column *column, double years, Fault *fault)
{
    const Model *model = stepper->model;
    size_t padded = (size_t)model->grid.padded, field = (size_t)model->mechanism->solved * padded;
    double since = omp_get_wtime(), lit_time = pack_lit_time(stepper->light);
    refresh_coefficients(stepper, column);
    refresh_light(stepper, column);
    charge(&stepper->clock.light, &since);
    int code = carry_day(stepper, column, years, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code)
        return code;
    for (size_t i = 0; i < field; i++) {
        double air = stepper->conditions->air[i % padded];
        stepper->mean[i] = stepper->day->sum_y[i] / DAY_SECONDS / air;
        if (lit_time > 0.0)
            stepper->daylight[i] = stepper->day->sum_lit[i] / lit_time / air;
    }
    stepper->daylight_known = lit_time > 0.0;
    count_negatives(model, column);
    column->days++;
    return 0;
}

/* turn += weight x, rows of balanced species. */
static void add_turn(Stepper *stepper, const Column *column, double weight)
{
    int padded = stepper->model->grid.padded;
    for (int i = 0; i < stepper->balances; i++) {
        double *turn = stepper->turn + FIELD(padded, i, 0);
        const double *x = column->x + FIELD(padded, stepper->balanced[i], 0);
        for (int l = 0; l < padded; l++)
            turn[l] += weight * x[l];
    }
}

/* The balance of the next step. With x0 .. x3 the states before, between and after the parts of this one, the
 * chemistry has worked at the mean rate (x1 - x0 + x3 - x2)/h - b and the transport at (x2 - x1)/h + b; the
 * new b is half the second less the first, and turn = x0 - 2 x1 + 2 x2 - x3. What the chemistry must give may
 * not exceed BALANCE_SHARE of what it makes, what it must take not what it loses: in balance b is loss less
 * production, and a column on its way there could be driven below zero. */
static void rebalance(Stepper *stepper, Column *column, double step)
{
    int padded = stepper->model->grid.padded;
    for (int i = 0; i < stepper->balances; i++)
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, stepper->balanced[i], l);
            double b = column->balance[at] + stepper->turn[FIELD(padded, i, l)] / (2.0 * step);
            double least = -BALANCE_SHARE * stepper->made[at], most = stepper->lost[at];
            if (b < 0.0)
                b = least > 0.0 ? 0.0 : b < least ? least : b;
            else
                b = most < 0.0 ? 0.0 : b > most ? most : b;
            column->balance[at] = b;
        }
    mixing_mask(stepper->mixing, column->balance);
}

static int advance_means(Stepper *stepper, Column *column, double step, double years, Fault *fault)
{
    const Model *model = stepper->model;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    double since = omp_get_wtime();
    int code = mixing_prepare(stepper->mixing, 0, step, fault);
    if (code)
        return code;
    memcpy(stepper->mean, column->x, field * sizeof(double));
    refresh_coefficients(stepper, column);
    refresh_light(stepper, column);
    charge(&stepper->clock.light, &since);
    code = refresh_factors(stepper, column, fault);
    charge(&stepper->clock.factors, &since);
    memset(stepper->turn, 0, (size_t)stepper->balances * (size_t)model->grid.padded * sizeof(double));
    add_turn(stepper, column, 1.0);
    if (!code)
        code = chemistry(stepper, column, 0.5 * step, 0, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code)
        return code;
    add_turn(stepper, column, -2.0);
    mixing_set_ground(model, column, column->time + 0.5 * years);
    mixing_step(stepper->mixing, 0, column, column->balance);
    add_turn(stepper, column, 2.0);
    charge(&stepper->clock.transport, &since);
    code = chemistry(stepper, column, 0.5 * step, 1, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code)
        return code;
    add_turn(stepper, column, -1.0);
    rebalance(stepper, column, step);
    mixing_set_ground(model, column, column->time + years);
    for (size_t i = 0; i < field; i++)
        stepper->mean[i] = 0.5 * (stepper->mean[i] + column->x[i]);
    return 0;
}

int stepper_advance(Stepper *stepper, Column *column, double step, int frozen, Fault *fault)
{
    double years = frozen ? 0.0 : step / YEAR_SECONDS, half = 0.5 * step / YEAR_SECONDS;
    if (frozen)
        stepper->spun += 2.0 * half;
    move_conditions(stepper, column->time + 0.5 * years,
                    frozen ? column->time + stepper->spun - half : column->time + half);
    int code = stepper->model->settings.day == DAY_EXPLICIT
                   ? advance_explicit(stepper, column, years, fault)
                   : advance_means(stepper, column, step, years, fault);
    if (code)
        return code;
    column->time += years;
    column->outer_steps++;
    stepper->since_factors += step;
    return 0;
}

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

/* ---- for who finds the state by other means ---- */

static void renew_light(Stepper *stepper, Column *column)
{
    size_t field = (size_t)stepper->model->mechanism->solved * (size_t)stepper->model->grid.padded;
    if (stepper->model->settings.day == DAY_EXPLICIT) {
        for (size_t i = 0; i < field; i++)
            stepper->daylight[i] = column->x[i] * stepper->day->lit[i];
        stepper->daylight_known = 1;
    }
    stepper->light->ready = 0;
    refresh_light(stepper, column);
}

void stepper_balance(const Stepper *stepper, Column *column)
{
    int padded = stepper->model->grid.padded;
    for (int i = 0; i < stepper->balances; i++)
        mixing_tendency(stepper->mixing, column->x, stepper->balanced[i],
                        column->balance + FIELD(padded, stepper->balanced[i], 0));
    mixing_mask(stepper->mixing, column->balance);
}

int stepper_refresh(Stepper *stepper, Column *column, int with_day, Fault *fault)
{
    move_conditions(stepper, column->time, column->time);
    refresh_coefficients(stepper, column);
    renew_light(stepper, column);
    if (!with_day || stepper->model->settings.day == DAY_MEAN)
        return 0;
    int code = repeat_day(stepper, column, fault);
    if (!code)
        renew_light(stepper, column); /* by the new shares of daylight */
    return code;
}
