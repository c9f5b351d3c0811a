/* step: the outer step. */
#include "stepper.h"

#include <omp.h>
#include <string.h>

#include "../input/constants.h"

/* Share of a species' production that its balance may take. Of ozone and atomic oxygen, which photolysis
 * turns over within minutes, transport takes far less anywhere. */
static const double BALANCE_SHARE = 0.5;

/* ---- chemistry ---- */

Tolerance stepper_tolerance(const Model *model)
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

void stepper_arrange(const Stepper *stepper, int *order)
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
int stepper_settle_packs(Stepper *stepper, Column *column, Fault *fault)
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
    Tolerance tolerance = stepper_tolerance(model);
    const double *factor = model->settings.day == DAY_FACTORS ? stepper->day->factor : NULL;
    int *order = stepper->order + half * stepper->packs;
    const double *source = stepper_source(stepper, column);
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int i = 0; i < stepper->packs; i++) {
        int p = order[i];
        PackWork *work = stepper->work[omp_get_thread_num()];
        PackOutcome *outcome = &stepper->outcome[p];
        double *first_step = &stepper->half_step[half * stepper->packs + p];
        outcome->counts = (SolverCounts){0};
        pack_load(work, model, p * PACK, column->x);
        pack_source(work, model, p * PACK, source, step);
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
    stepper_arrange(stepper, order);
    return stepper_settle_packs(stepper, column, fault);
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
    stepper_local_coefficients(stepper, column);
    stepper_follow_light(stepper, column);
    charge(&stepper->clock.light, &since);
    int code = stepper_carry_day(stepper, column, years, fault);
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
    stepper_local_coefficients(stepper, column);
    stepper_follow_light(stepper, column);
    charge(&stepper->clock.light, &since);
    code = stepper_follow_day(stepper, column, fault);
    charge(&stepper->clock.factors, &since);
    memset(stepper->turn, 0, (size_t)stepper->balances * (size_t)model->grid.padded * sizeof(double));
    add_turn(stepper, column, 1.0);
    if (!code)
        code = chemistry(stepper, column, 0.5 * step, 0, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code)
        return code;
    add_turn(stepper, column, -2.0);
    mixing_set_ground(stepper->mixing, column, column->time + 0.5 * years);
    stepper_mix(stepper, column, 0, step, column->balance);
    add_turn(stepper, column, 2.0);
    charge(&stepper->clock.transport, &since);
    code = chemistry(stepper, column, 0.5 * step, 1, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code)
        return code;
    add_turn(stepper, column, -1.0);
    rebalance(stepper, column, step);
    mixing_set_ground(stepper->mixing, column, column->time + years);
    for (size_t i = 0; i < field; i++)
        stepper->mean[i] = 0.5 * (stepper->mean[i] + column->x[i]);
    return 0;
}

int stepper_advance(Stepper *stepper, Column *column, double step, int frozen, Fault *fault)
{
    double years = frozen ? 0.0 : step / YEAR_SECONDS, half = 0.5 * step / YEAR_SECONDS;
    if (frozen)
        stepper->spun += 2.0 * half;
    stepper_move(stepper, column->time + 0.5 * years,
                 frozen ? column->time + stepper->spun - half : column->time + half);
    int code = stepper->model->settings.day == DAY_EXPLICIT
                   ? advance_explicit(stepper, column, years, fault)
                   : advance_means(stepper, column, step, years, fault);
    if (code)
        return code;
    column->time += years;
    column->outer_steps++;
    stepper->since_factors += step;
    stepper->logged++;
    return 0;
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
    stepper_follow_light(stepper, column);
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
    stepper_move(stepper, column->time, column->time);
    stepper_local_coefficients(stepper, column);
    renew_light(stepper, column);
    if (!with_day || stepper->model->settings.day == DAY_MEAN)
        return 0;
    int code = stepper_repeat_day(stepper, column, DAY_SETTLED, 0, fault);
    if (!code)
        renew_light(stepper, column); /* by the new shares of daylight */
    return code;
}
