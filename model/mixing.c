/* mixing: grounds, factors and steps. */
#include "mixing.h"

#include <omp.h>
#include <stdlib.h>
#include <string.h>

typedef struct {
    int kind; /* enum GroundKind */
    double velocity;
    int held; /* 1: prescribed up to layer Mixing.held_top, carried from there up */
    DiffusionFactor *factor[MIXING_SLOTS];
} Ground;

struct Mixing {
    const Model *model;
    int threads;
    double **work;    /* [threads] */
    double *received; /* [solved] */
    int grounds;
    Ground *ground;                 /* [grounds] */
    int *ground_of;                 /* [solved], -1: not carried */
    int *kept_ground, *open_ground; /* [solved] that of a gas the ground keeps, and of one it does not; the
                                       same where nothing changes */
    unsigned char *kept;            /* [solved] */
    double ready[MIXING_SLOTS];     /* step in s the factors are for, 0: none */
    Diffusion *above;               /* the column from held_top up; NULL when nothing is held */
    int held_top;                   /* highest layer that is prescribed */
};

static int place_ground(Mixing *mixing, Ground ground)
{
    int g = 0;
    while (g < mixing->grounds &&
           (mixing->ground[g].kind != ground.kind || mixing->ground[g].held != ground.held ||
            mixing->ground[g].velocity != ground.velocity))
        g++;
    if (g == mixing->grounds)
        mixing->ground[mixing->grounds++] = ground;
    return g;
}

static void list_grounds(Mixing *mixing)
{
    const Model *model = mixing->model;
    for (int s = 0; s < model->mechanism->solved; s++) {
        mixing->kept_ground[s] = mixing->open_ground[s] = -1;
        if (!model->mechanism->item[model->mechanism->solved_item[s]].transport)
            continue;
        double velocity = model_deposition(model, s);
        Ground fixed = {.kind = GROUND_FIXED, .held = model_holds(model, s)};
        Ground open = {.kind = velocity > 0.0 ? GROUND_DEPOSITION : GROUND_CLOSED, .velocity = velocity};
        int kind = model->surface_kind[s];
        int kept = fixed.held || kind == SURFACE_SCHEDULE || kind == SURFACE_FIXED;
        int opens = !kept || (!fixed.held && kind == SURFACE_SCHEDULE &&
                              model->schedule.emission_from[model->surface_gas[s]] > 0);
        if (kept)
            mixing->kept_ground[s] = place_ground(mixing, fixed);
        if (opens)
            mixing->open_ground[s] = place_ground(mixing, open);
        if (!kept)
            mixing->kept_ground[s] = mixing->open_ground[s];
        if (!opens)
            mixing->open_ground[s] = mixing->kept_ground[s];
    }
}

void mixing_follow(Mixing *mixing, const Conditions *conditions)
{
    for (int s = 0; s < mixing->model->mechanism->solved; s++) {
        mixing->kept[s] = conditions->kept[s];
        mixing->ground_of[s] = conditions->kept[s] ? mixing->kept_ground[s] : mixing->open_ground[s];
    }
}

static int make_above(Mixing *mixing, Fault *fault)
{
    const Model *model = mixing->model;
    if (!model->held)
        return 0;
    int top = 0;
    while (top + 1 < model->grid.layers && model->held_free[top + 1] == 0.0)
        top++;
    mixing->held_top = top;
    return diffusion_make_above(&mixing->above, &model->grid, &model->air, model->eddy, top, fault);
}

int mixing_make(Mixing **made, const Model *model, int threads, Fault *fault)
{
    *made = NULL;
    size_t solved = (size_t)model->mechanism->solved;
    Mixing *mixing = calloc(1, sizeof *mixing);
    if (!mixing)
        return fault_memory(fault, "mixing");
    mixing->model = model;
    mixing->threads = threads;
    mixing->work = calloc((size_t)threads, sizeof *mixing->work);
    mixing->received = calloc(solved, sizeof(double));
    mixing->ground = calloc(2 * solved, sizeof *mixing->ground);
    mixing->ground_of = calloc(solved, sizeof(int));
    mixing->kept_ground = calloc(solved, sizeof(int));
    mixing->open_ground = calloc(solved, sizeof(int));
    mixing->kept = calloc(solved, 1);
    int code = 0;
    if (!mixing->work || !mixing->received || !mixing->ground || !mixing->ground_of || !mixing->kept_ground ||
        !mixing->open_ground || !mixing->kept)
        code = fault_memory(fault, "mixing");
    if (!code) {
        list_grounds(mixing);
        mixing_follow(mixing, model->base);
    }
    if (!code)
        code = make_above(mixing, fault);
    if (code) {
        mixing_free(mixing);
        return code;
    }
    *made = mixing;
    return 0;
}

void mixing_free(Mixing *mixing)
{
    if (!mixing)
        return;
    for (int t = 0; mixing->work && t < mixing->threads; t++)
        free(mixing->work[t]);
    for (int g = 0; g < mixing->grounds; g++)
        for (int i = 0; i < MIXING_SLOTS; i++)
            diffusion_factor_free(mixing->ground[g].factor[i]);
    diffusion_free(mixing->above);
    free(mixing->work);
    free(mixing->received);
    free(mixing->ground);
    free(mixing->ground_of);
    free(mixing->kept_ground);
    free(mixing->open_ground);
    free(mixing->kept);
    free(mixing);
}

int mixing_prepare(Mixing *mixing, int slot, double step, Fault *fault)
{
    if (mixing->ready[slot] == step)
        return 0;
    mixing->ready[slot] = 0.0;
    size_t most = 0;
    for (int g = 0; g < mixing->grounds; g++) {
        Ground *ground = &mixing->ground[g];
        diffusion_factor_free(ground->factor[slot]);
        ground->factor[slot] = NULL;
        int code =
            diffusion_factor(&ground->factor[slot], ground->held ? mixing->above : mixing->model->diffusion,
                             ground->kind, ground->velocity, step, fault);
        if (code)
            return code;
        size_t size = diffusion_work(ground->factor[slot], 1);
        if (size > most)
            most = size;
    }
    for (int t = 0; t < mixing->threads; t++) {
        if (mixing->work[t])
            continue;
        mixing->work[t] = malloc(most * sizeof(double));
        if (!mixing->work[t])
            return fault_memory(fault, "mixing");
    }
    mixing->ready[slot] = step;
    return 0;
}

void mixing_step(Mixing *mixing, int slot, Column *column, const double *sink)
{
    const Model *model = mixing->model;
    int solved = model->mechanism->solved, padded = model->grid.padded, layers = model->grid.layers;
#pragma omp parallel for schedule(static) num_threads(mixing->threads)
    for (int s = 0; s < solved; s++) {
        mixing->received[s] = 0.0;
        if (mixing->ground_of[s] < 0)
            continue;
        const Ground *ground = &mixing->ground[mixing->ground_of[s]];
        int first = ground->held ? mixing->held_top : 0;
        double *x = column->x + FIELD(padded, s, 0);
        diffusion_step(ground->factor[slot], x + first, sink ? sink + FIELD(padded, s, first) : NULL, 1,
                       &mixing->received[s], mixing->work[omp_get_thread_num()]);
        for (int l = layers; l < padded; l++)
            x[l] = x[layers - 1];
    }
    for (int s = 0; s < solved; s++) {
        int held = mixing->ground_of[s] >= 0 && mixing->ground[mixing->ground_of[s]].held;
        *(held ? &column->exchanged[s] : &column->received[s]) += mixing->received[s];
    }
}

void mixing_tendency(const Mixing *mixing, const double *x, int s, double *rate)
{
    const Model *model = mixing->model;
    const double *row = x + FIELD(model->grid.padded, s, 0);
    memset(rate, 0, (size_t)model->grid.padded * sizeof(double));
    if (mixing->ground_of[s] < 0)
        return;
    const Ground *ground = &mixing->ground[mixing->ground_of[s]];
    diffusion_tendency(model->diffusion, row, rate);
    if (ground->kind == GROUND_DEPOSITION)
        rate[0] -= ground->velocity * row[0] / model->grid.depth[0];
}

void mixing_mask(const Mixing *mixing, double *rate)
{
    const Model *model = mixing->model;
    int padded = model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++) {
        int kept = padded; /* layers from the ground up that transport leaves alone */
        if (mixing->ground_of[s] >= 0) {
            const Ground *ground = &mixing->ground[mixing->ground_of[s]];
            kept = ground->held ? mixing->held_top + 1 : ground->kind == GROUND_FIXED;
        }
        for (int l = 0; l < kept; l++)
            rate[FIELD(padded, s, l)] = 0.0;
    }
}

void mixing_set_ground(const Mixing *mixing, Column *column, double time)
{
    const Model *model = mixing->model;
    int padded = model->grid.padded;
    double cell = model->air.number_density[0] * model->grid.depth[0];
    for (int s = 0; s < model->mechanism->solved; s++) {
        if (!mixing->kept[s])
            continue;
        double value = model->surface_kind[s] == SURFACE_SCHEDULE
                           ? schedule_abundance(&model->schedule, model->surface_gas[s], time)
                           : model->surface_value[s];
        double *x = &column->x[FIELD(padded, s, 0)];
        column->received[s] += (value - *x) * cell;
        *x = value;
    }
}
