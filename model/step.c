/* step: the outer step. */
#include "step.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/rates.h"
#include "../chem/surface.h"
#include "../input/constants.h"

/* One transport operator: species that share a ground condition share its factorisation. */
typedef struct {
    int kind; /* enum GroundKind */
    double velocity;
    int held; /* 1: prescribed up to layer Stepper.held_top, carried from there up */
    DiffusionFactor *factor;
} Ground;

typedef struct {
    int result, where; /* of the solver */
    int settled;
    long days;
    SolverCounts counts;
    PackLedger ledger;
    Fault fault;
} PackOutcome;

struct Stepper {
    const Model *model;
    int threads, packs;
    Light *light;
    Day *day;
    PackWork **work;          /* [threads] */
    double **transport_work;  /* [threads] */
    PackOutcome *outcome;     /* [packs] */
    double *ledgers;          /* [packs][held + solved + tallies], behind outcome[].ledger */
    double *pack_step;        /* [2][packs] solver step to try first: before the transport, after it */
    double *coefficient;      /* [reactions][padded] */
    double *density;          /* [solved][padded] work */
    double *mean;             /* [solved][padded] */
    double *received;         /* [solved] work */
    int grounds;
    Ground *ground;           /* [grounds] */
    int *ground_of;           /* [solved], -1: not transported */
    double factored_step;     /* s the operators are factorised for, 0: none */
    Diffusion *above;         /* the column from held_top up; NULL when nothing is held */
    int held_top;             /* highest layer that is prescribed */
    StepClock clock;
};

/* ---- making ---- */

static void list_grounds(Stepper *stepper) {
    const Model *model = stepper->model;
    for (int s = 0; s < model->mechanism->solved; s++) {
        stepper->ground_of[s] = -1;
        if (!model->mechanism->item[model->mechanism->solved_item[s]].transport) continue;
        int kind = GROUND_CLOSED;
        double velocity = 0.0;
        if (model->surface_kind[s] == SURFACE_SCHEDULE || model->surface_kind[s] == SURFACE_FIXED) kind = GROUND_FIXED;
        if (model->surface_kind[s] == SURFACE_DEPOSITION) {
            kind = GROUND_DEPOSITION;
            velocity = model->surface_value[s];
        }
        int held = 0;
        for (int h = 0; h < model->held; h++) held |= model->held_species[h] == s;
        if (held) {
            kind = GROUND_FIXED;
            velocity = 0.0;
        }
        int g = 0;
        while (g < stepper->grounds && (stepper->ground[g].kind != kind || stepper->ground[g].velocity != velocity ||
                                        stepper->ground[g].held != held))
            g++;
        if (g == stepper->grounds) stepper->ground[stepper->grounds++] = (Ground){kind, velocity, held, NULL};
        stepper->ground_of[s] = g;
    }
}

/* Water falls a thousandfold within the troposphere. Letting it diffuse there between two moments of being set right would
 * wet the stratosphere; it is carried from its highest prescribed layer up, whose value stands fixed. */
static int make_above(Stepper *stepper, Fault *fault) {
    const Model *model = stepper->model;
    if (!model->held) return 0;
    int top = 0;
    while (top + 1 < model->grid.layers && model->held_free[top + 1] == 0.0) top++;
    stepper->held_top = top;
    return diffusion_make_above(&stepper->above, &model->grid, &model->air, model->eddy, top, fault);
}

static int allocate(Stepper *stepper, Fault *fault) {
    const Model *model = stepper->model;
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    size_t reactions = (size_t)model->mechanism->reactions, packs = (size_t)stepper->packs;
    size_t threads = (size_t)stepper->threads, tallies = (size_t)model->kernel->tallies;
    stepper->work = calloc(threads, sizeof *stepper->work);
    stepper->transport_work = calloc(threads, sizeof *stepper->transport_work);
    stepper->outcome = calloc(packs, sizeof *stepper->outcome);
    size_t ledger = (size_t)model->held + solved + tallies;
    stepper->ledgers = calloc(packs * ledger, sizeof(double));
    stepper->pack_step = calloc(2 * packs, sizeof(double));
    stepper->coefficient = calloc(reactions * padded, sizeof(double));
    stepper->density = calloc(solved * padded, sizeof(double));
    stepper->mean = calloc(solved * padded, sizeof(double));
    stepper->received = calloc(solved, sizeof(double));
    stepper->ground = calloc(solved, sizeof *stepper->ground);
    stepper->ground_of = calloc(solved, sizeof(int));
    if (!stepper->work || !stepper->transport_work || !stepper->outcome || !stepper->ledgers || !stepper->pack_step ||
        !stepper->coefficient || !stepper->density || !stepper->mean || !stepper->received || !stepper->ground ||
        !stepper->ground_of)
        return fault_memory(fault, "stepper");
    for (size_t p = 0; p < packs; p++) {
        double *at = stepper->ledgers + p * ledger;
        stepper->outcome[p].ledger = (PackLedger){.exchanged = at, .received = at + model->held, .washed = at + model->held + solved};
    }
    int code = 0;
    for (size_t t = 0; !code && t < threads; t++) code = pack_make(&stepper->work[t], model, fault);
    return code;
}

int stepper_make(Stepper **made, const Model *model, int threads, Fault *fault) {
    *made = NULL;
    Stepper *stepper = calloc(1, sizeof *stepper);
    if (!stepper) return fault_memory(fault, "stepper");
    stepper->model = model;
    stepper->threads = threads < 1 ? omp_get_max_threads() : threads;
    stepper->packs = model->grid.padded / PACK;
    int code = allocate(stepper, fault);
    if (!code) code = light_make(&stepper->light, model, 1, fault);
    if (!code) code = day_make(&stepper->day, model, fault);
    if (!code) code = make_above(stepper, fault);
    if (code) {
        stepper_free(stepper);
        return code;
    }
    list_grounds(stepper);
    const Air *air = &model->air;
    /* water enters HO2 + HO2 only and is renewed at every step */
    rates_thermal(model->mechanism, model->grid.padded, air->temperature, air->number_density, stepper->density, 0,
                  stepper->coefficient);
    rates_washout(model->mechanism, model->grid.padded, model->washout_rate, stepper->coefficient);
    *made = stepper;
    return 0;
}

void stepper_free(Stepper *stepper) {
    if (!stepper) return;
    for (int t = 0; t < stepper->threads; t++) {
        if (stepper->work) pack_free(stepper->work[t]);
        if (stepper->transport_work) free(stepper->transport_work[t]);
    }
    for (int g = 0; g < stepper->grounds; g++) diffusion_factor_free(stepper->ground[g].factor);
    diffusion_free(stepper->above);
    light_free(stepper->light);
    day_free(stepper->day);
    free(stepper->work);
    free(stepper->transport_work);
    free(stepper->outcome);
    free(stepper->ledgers);
    free(stepper->pack_step);
    free(stepper->coefficient);
    free(stepper->density);
    free(stepper->mean);
    free(stepper->received);
    free(stepper->ground);
    free(stepper->ground_of);
    free(stepper);
}

/* ---- transport ---- */

static int factorise(Stepper *stepper, double step, Fault *fault) {
    if (stepper->factored_step == step) return 0;
    stepper->factored_step = 0.0;
    for (int g = 0; g < stepper->grounds; g++) {
        Ground *ground = &stepper->ground[g];
        diffusion_factor_free(ground->factor);
        ground->factor = NULL;
        const Diffusion *diffusion = ground->held ? stepper->above : stepper->model->diffusion;
        int code = diffusion_factor(&ground->factor, diffusion, ground->kind, ground->velocity, step, fault);
        if (code) return code;
    }
    for (int t = 0; t < stepper->threads; t++) {
        if (stepper->transport_work[t]) continue;
        size_t most = 0;
        for (int g = 0; g < stepper->grounds; g++) {
            size_t size = diffusion_work(stepper->ground[g].factor, 1);
            if (size > most) most = size;
        }
        stepper->transport_work[t] = malloc(most * sizeof(double));
        if (!stepper->transport_work[t]) return fault_memory(fault, "transport");
    }
    stepper->factored_step = step;
    return 0;
}

/* Give the lowest layer its scheduled or fixed values; what that takes from or adds to it has come through the ground. */
static void set_ground(const Model *model, Column *column, double time) {
    int padded = model->grid.padded;
    double cell = model->air.number_density[0] * model->grid.depth[0];
    for (int s = 0; s < model->mechanism->solved; s++) {
        double value = model->surface_value[s];
        if (model->surface_kind[s] == SURFACE_SCHEDULE)
            value = schedule_abundance(&model->schedule, model->surface_gas[s], time);
        else if (model->surface_kind[s] != SURFACE_FIXED)
            continue;
        double *x = &column->x[FIELD(padded, s, 0)];
        column->received[s] += (value - *x) * cell;
        *x = value;
    }
}

static void transport(Stepper *stepper, Column *column) {
    const Model *model = stepper->model;
    int solved = model->mechanism->solved, padded = model->grid.padded, layers = model->grid.layers;
#pragma omp parallel for schedule(static) num_threads(stepper->threads)
    for (int s = 0; s < solved; s++) {
        stepper->received[s] = 0.0;
        if (stepper->ground_of[s] < 0) continue;
        const Ground *ground = &stepper->ground[stepper->ground_of[s]];
        double *x = column->x + FIELD(padded, s, 0);
        diffusion_step(ground->factor, x + (ground->held ? stepper->held_top : 0), 1, &stepper->received[s],
                       stepper->transport_work[omp_get_thread_num()]);
        for (int l = layers; l < padded; l++) x[l] = x[layers - 1];
    }
    for (int s = 0; s < solved; s++) {
        int held = stepper->ground_of[s] >= 0 && stepper->ground[stepper->ground_of[s]].held;
        *(held ? &column->exchanged[s] : &column->received[s]) += stepper->received[s];
    }
}

/* ---- chemistry ---- */

static void refresh_coefficients(Stepper *stepper, const Column *column) {
    const Model *model = stepper->model;
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded;
    const Air *air = &model->air;
    for (int s = 0; s < mechanism->solved; s++)
        for (int l = 0; l < padded; l++)
            stepper->density[FIELD(padded, s, l)] = column->x[FIELD(padded, s, l)] * air->number_density[l];
    int water = mechanism_solved(mechanism, "H2O");
    if (water >= 0)
        rates_thermal(mechanism, padded, air->temperature, air->number_density, stepper->density + FIELD(padded, water, 0), 1,
                      stepper->coefficient);
    surface_rates(mechanism, padded, air->temperature, air->number_density, model->aerosol_area, model->aerosol_radius,
                  stepper->density, stepper->coefficient);
}

static void refresh_light(Stepper *stepper, Column *column) {
    if (!light_stale(stepper->light, column->x)) return;
    light_refresh(stepper->light, column->x);
    column->photolysis_refreshes++;
    const Mechanism *mechanism = stepper->model->mechanism;
    memcpy(stepper->coefficient + FIELD(stepper->model->grid.padded, mechanism->photolysis_first, 0), stepper->light->mean,
           (size_t)stepper->light->reactions * (size_t)stepper->model->grid.padded * sizeof(double));
}

static Tolerance tolerance_of(const Model *model) {
    return (Tolerance){model->settings.relative_tolerance, model->settings.absolute_tolerance_cm3, 20000};
}

static void add_counts(SolverCounts *sum, const SolverCounts *part) {
    sum->calls += part->calls;
    sum->steps += part->steps;
    sum->rejections += part->rejections;
    sum->factorisations += part->factorisations;
    sum->negatives += part->negatives;
    if (part->most_negative < sum->most_negative) sum->most_negative = part->most_negative;
}

static int refresh_factors(Stepper *stepper, Column *column, Fault *fault) {
    if (stepper->model->settings.day != DAY_FACTORS || !day_stale(stepper->day, column->x)) return 0;
    Tolerance tolerance = tolerance_of(stepper->model);
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int p = 0; p < stepper->packs; p++) {
        PackOutcome *outcome = &stepper->outcome[p];
        outcome->counts = (SolverCounts){0};
        outcome->fault.code = 0;
        outcome->result = day_factors(stepper->day, stepper->work[omp_get_thread_num()], stepper->light, p * PACK, column->x,
                                      stepper->coefficient, column->time, &tolerance, &outcome->counts, &outcome->days,
                                      &outcome->settled, &outcome->fault);
    }
    for (int p = 0; p < stepper->packs; p++) {
        const PackOutcome *outcome = &stepper->outcome[p];
        if (outcome->result) return fault_set(fault, outcome->fault.code, "%s", outcome->fault.text);
        column->days += outcome->days;
        column->unsettled += !outcome->settled;
    }
    stepper->day->ready = 1;
    column->factor_refreshes++;
    return 0;
}

/* After the packs: sums in their order, or the first fault. */
static int settle_packs(Stepper *stepper, Column *column, Fault *fault) {
    const Model *model = stepper->model;
    const Kernel *kernel = model->kernel;
    for (int p = 0; p < stepper->packs; p++) {
        PackOutcome *outcome = &stepper->outcome[p];
        if (outcome->result) return day_fault(model, p * PACK, outcome->result, outcome->where, column->time, fault);
        for (int s = 0; p == 0 && s < model->mechanism->solved; s++) column->received[s] += outcome->ledger.received[s];
        for (int h = 0; h < model->held; h++) column->exchanged[model->held_species[h]] += outcome->ledger.exchanged[h];
        for (int t = 0; t < kernel->tallies; t++)
            column->washed[kernel->reactant[3 * kernel->tally_reaction[t]]] += outcome->ledger.washed[t];
        for (int c = 0; c < kernel->counters; c++) column->escaped[c] += outcome->ledger.escaped[c];
        add_counts(&column->counts, &outcome->counts);
    }
    return 0;
}

/* half: 0 before the transport, 1 after it. The two start differently: the second with radicals that transport has thrown out of
 * balance. */
static int chemistry(Stepper *stepper, Column *column, double step, int half, Fault *fault) {
    const Model *model = stepper->model;
    Tolerance tolerance = tolerance_of(model);
    const double *factor = model->settings.day == DAY_FACTORS ? stepper->day->factor : NULL;
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int p = 0; p < stepper->packs; p++) {
        PackWork *work = stepper->work[omp_get_thread_num()];
        PackOutcome *outcome = &stepper->outcome[p];
        outcome->counts = (SolverCounts){0};
        pack_load(work, model, p * PACK, column->x);
        pack_rates(work, model, p * PACK, stepper->coefficient, stepper->light->mean, factor);
        double *first_step = &stepper->pack_step[half * stepper->packs + p];
        PackProblem problem = pack_problem(work, 0, *first_step);
        outcome->result =
            solver_advance(model->kernel, work->solver, &problem, step, &tolerance, &outcome->counts, &outcome->where);
        *first_step = problem.first;
        if (!outcome->result) pack_store(work, model, p * PACK, column->x, &outcome->ledger);
    }
    return settle_packs(stepper, column, fault);
}

int stepper_explicit_day(Stepper *stepper, Column *column, double *mean, Fault *fault) {
    const Model *model = stepper->model;
    Tolerance tolerance = tolerance_of(model);
    int padded = model->grid.padded, solved = model->mechanism->solved;
    refresh_coefficients(stepper, column);
    refresh_light(stepper, column);
#pragma omp parallel for schedule(dynamic, 1) num_threads(stepper->threads)
    for (int p = 0; p < stepper->packs; p++) {
        PackWork *work = stepper->work[omp_get_thread_num()];
        PackOutcome *outcome = &stepper->outcome[p];
        outcome->counts = (SolverCounts){0};
        pack_load(work, model, p * PACK, column->x);
        pack_rates(work, model, p * PACK, stepper->coefficient, stepper->light->mean, NULL);
        memset(work->sum_y, 0, (size_t)model->kernel->species * PACK * sizeof(double));
        memset(work->sum_w, 0, (size_t)model->kernel->reactions * PACK * sizeof(double));
        outcome->result = pack_day(work, stepper->light, p * PACK, 1, &tolerance, &stepper->pack_step[p], &outcome->counts,
                                   &outcome->where);
        if (outcome->result) continue;
        pack_store(work, model, p * PACK, column->x, &outcome->ledger);
        for (int s = 0; s < solved; s++)
            for (int l = 0; l < PACK; l++)
                mean[FIELD(padded, s, p * PACK + l)] =
                    work->sum_y[s * PACK + l] / DAY_SECONDS / model->air.number_density[p * PACK + l];
    }
    column->days += stepper->packs;
    return settle_packs(stepper, column, fault);
}

/* ---- the step ---- */

static void count_negatives(const Model *model, Column *column) {
    int padded = model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int l = 0; l < model->grid.layers; l++) {
            double y = column->x[FIELD(padded, s, l)] * model->air.number_density[l];
            if (y >= 0.0) continue;
            column->counts.negatives++;
            if (y < column->counts.most_negative) column->counts.most_negative = y;
        }
}

/* Part of the clock that ends now. */
static void charge(double *part, double *since) {
    double now = omp_get_wtime();
    *part += now - *since;
    *since = now;
}

static int advance_explicit(Stepper *stepper, Column *column, double step, double years, Fault *fault) {
    const Model *model = stepper->model;
    double since = omp_get_wtime();
    int code = factorise(stepper, 0.5 * step, fault);
    if (code) return code;
    set_ground(model, column, column->time + 0.25 * years);
    transport(stepper, column);
    charge(&stepper->clock.transport, &since);
    code = stepper_explicit_day(stepper, column, stepper->mean, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code) return code;
    set_ground(model, column, column->time + 0.75 * years);
    transport(stepper, column);
    set_ground(model, column, column->time + years);
    charge(&stepper->clock.transport, &since);
    return 0;
}

static int advance_means(Stepper *stepper, Column *column, double step, double years, Fault *fault) {
    const Model *model = stepper->model;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    double since = omp_get_wtime();
    int code = factorise(stepper, step, fault);
    if (code) return code;
    memcpy(stepper->mean, column->x, field * sizeof(double));
    refresh_coefficients(stepper, column);
    refresh_light(stepper, column);
    charge(&stepper->clock.light, &since);
    code = refresh_factors(stepper, column, fault);
    charge(&stepper->clock.factors, &since);
    if (!code) code = chemistry(stepper, column, 0.5 * step, 0, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code) return code;
    set_ground(model, column, column->time + 0.5 * years);
    transport(stepper, column);
    charge(&stepper->clock.transport, &since);
    code = chemistry(stepper, column, 0.5 * step, 1, fault);
    charge(&stepper->clock.chemistry, &since);
    if (code) return code;
    set_ground(model, column, column->time + years);
    for (size_t i = 0; i < field; i++) stepper->mean[i] = 0.5 * (stepper->mean[i] + column->x[i]);
    return 0;
}

int stepper_advance(Stepper *stepper, Column *column, double step, int frozen, Fault *fault) {
    double years = frozen ? 0.0 : step / YEAR_SECONDS;
    int code = stepper->model->settings.day == DAY_EXPLICIT ? advance_explicit(stepper, column, step, years, fault)
                                                            : advance_means(stepper, column, step, years, fault);
    if (code) return code;
    column->time += years;
    count_negatives(stepper->model, column);
    column->outer_steps++;
    return 0;
}

const double *stepper_mean(const Stepper *stepper) { return stepper->mean; }
const Light *stepper_light(const Stepper *stepper) { return stepper->light; }
const Day *stepper_day(const Stepper *stepper) { return stepper->day; }
StepClock stepper_clock(const Stepper *stepper) { return stepper->clock; }
const double *stepper_coefficients(const Stepper *stepper) { return stepper->coefficient; }
