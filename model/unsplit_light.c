/* unsplit_light: how the rates of the unsplit column answer to what absorbs the light, and to every unknown.
 */
#include "unsplit.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

/* Relative shift of an absorber: radiation stands between it and the rates, and the error of the difference,
 * of first order in the shift, stays below 1e-4. */
static const double ABSORBER_SHIFT = 1e-4;

/* Threads at most that shift absorbers: each has a light, some 15 MB. */
enum { SHIFTERS = 16 };

/* Whether NO absorbs anything that matters in layer l: the light of its bands is gone where its own
 * photolysis is 1e-5 of that at the top. */
static int lights_nitric_oxide(const Unsplit *unsplit, int l)
{
    static const double GONE = 1e-5;
    const Mechanism *mechanism = unsplit->model->mechanism;
    int padded = unsplit->model->grid.padded, top = unsplit->layers - 1;
    for (int j = 0; j < unsplit->light->reactions; j++)
        if (mechanism->reaction[mechanism->photolysis_first + j].special == SPECIAL_NO)
            return unsplit->light->mean[FIELD(padded, j, l)] >
                   GONE * unsplit->light->mean[FIELD(padded, j, top)];
    return 0;
}

/* Ozone counts in every layer; NO2 where the optical depth of the layer at 400 nm, 6e-19 cm2 (JPL 19-5), is
 * more than a millionth; NO where its own light is. */
static void list_absorbers(Unsplit *unsplit)
{
    static const char *const names[UNSPLIT_ABSORBERS] = {"O3", "NO2", "NO"};
    static const double SECTION = 6e-19, COUNTS = 1e-6;
    const Model *model = unsplit->model;
    unsplit->absorbers = 0;
    for (int a = 0; a < UNSPLIT_ABSORBERS; a++) {
        int s = mechanism_solved(model->mechanism, names[a]);
        for (int l = 0; s >= 0 && l < unsplit->layers; l++) {
            double column = unsplit->density[FIELD(model->grid.padded, s, l)] * unsplit->conditions->depth[l];
            if (a == 0 || (a == 1 ? column * SECTION > COUNTS : lights_nitric_oxide(unsplit, l)))
                unsplit->absorber[unsplit->absorbers++] = l * unsplit->solved + s;
        }
    }
}

/* What one thread shifts. */
typedef struct {
    Light *light;
    double *x; /* [solved][padded] */
} Shifter;

/* The slopes against absorber m; before: light->mean at the state of the shifter. */
static void take_slope(const Unsplit *unsplit, const Shifter *shifter, const double *before, int m)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    Light *light = shifter->light;
    int padded = model->grid.padded, top = unsplit->layers - 1;
    int s = unsplit->absorber[m] % unsplit->solved, layer = unsplit->absorber[m] / unsplit->solved;
    int lanes = layer == top ? padded - top : 1;
    double *here = shifter->x + FIELD(padded, s, layer);
    double *slope = unsplit->slope + (size_t)m * (size_t)light->reactions * (size_t)padded;
    double kept = *here, step = ABSORBER_SHIFT * fmax(fabs(kept), 1e-12);
    for (int l = 0; l < lanes; l++)
        here[l] = kept + step;
    if (s == mechanism_solved(mechanism, "NO"))
        light_nitric_oxide(light, shifter->x, unsplit->lit);
    else
        light_refresh(light, shifter->x, unsplit->lit);
    for (int l = 0; l < lanes; l++)
        here[l] = kept;
    for (int j = 0; j < light->reactions; j++)
        for (int l = 0; l < padded; l++) {
            size_t at = FIELD(padded, j, l);
            slope[at] = (light->mean[at] - before[at]) / step *
                        unsplit->factor[FIELD(padded, mechanism->photolysis_first + j, l)];
        }
}

static void free_shifters(Shifter *shifter, int count)
{
    for (int i = 0; shifter && i < count; i++) {
        if (i)
            light_free(shifter[i].light); /* the first is that of the column */
        free(shifter[i].x);
    }
    free(shifter);
}

static int make_shifters(Shifter **made, int count, const Unsplit *unsplit, const double *x, Fault *fault)
{
    size_t bytes = (size_t)unsplit->solved * (size_t)unsplit->model->grid.padded * sizeof(double);
    int moved =
        CONDITIONS_AIR | CONDITIONS_LIGHT | (unsplit->model->settings.sun == SUN_SEASON ? CONDITIONS_SUN : 0);
    Shifter *shifter = calloc((size_t)count, sizeof *shifter);
    int code = shifter ? 0 : fault_memory(fault, "the slopes of the light");
    for (int i = 0; !code && i < count; i++) {
        shifter[i].light = i ? NULL : unsplit->light;
        if (!(shifter[i].x = malloc(bytes)))
            code = fault_memory(fault, "the slopes of the light");
        else
            memcpy(shifter[i].x, x, bytes);
        if (!code && i)
            code = light_make(&shifter[i].light, unsplit->model, 1, fault);
        if (!code && i)
            light_follow(shifter[i].light, unsplit->conditions, moved);
    }
    if (code)
        free_shifters(shifter, count);
    else
        *made = shifter;
    return code;
}

int unsplit_slopes(Unsplit *unsplit, const double *x, Fault *fault)
{
    const Model *model = unsplit->model;
    Light *light = unsplit->light;
    size_t field = (size_t)light->reactions * (size_t)model->grid.padded;
    int nitric_oxide = mechanism_solved(model->mechanism, "NO");
    int threads = omp_get_max_threads() < SHIFTERS ? omp_get_max_threads() : SHIFTERS;
    Shifter *shifter;
    double *before = malloc(field * sizeof(double));
    if (!before)
        return fault_memory(fault, "the slopes of the light");
    if (make_shifters(&shifter, threads, unsplit, x, fault)) {
        free(before);
        return fault->code;
    }
    light_refresh(light, x, unsplit->lit);
    list_absorbers(unsplit);
    memcpy(before, light->mean, field * sizeof(double));
    int others = 0; /* NO stands last in the list and goes by what the light is now */
    for (int m = 0; m < unsplit->absorbers; m++) {
        if (unsplit->absorber[m] % unsplit->solved == nitric_oxide)
            take_slope(unsplit, &shifter[0], before, m);
        else
            others = m + 1;
    }
#pragma omp parallel for schedule(dynamic, 1) num_threads(threads)
    for (int m = 0; m < others; m++)
        take_slope(unsplit, &shifter[omp_get_thread_num()], before, m);
    light_refresh(light, x, unsplit->lit);
    unsplit->lights += others + 2;
    free_shifters(shifter, threads);
    free(before);
    return 0;
}

void unsplit_rate_gradient(const Unsplit *unsplit, const double *weight, double *gradient)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded, solved = unsplit->solved, layers = unsplit->layers;
    int lit_first = mechanism->photolysis_first, reactions = mechanism->reactions;
    for (int r = 0; r < reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        for (int i = 0; i < reaction->reactants; i++)
            for (int l = 0; l < layers; l++) {
                double others = 1.0;
                for (int j = 0; j < reaction->reactants; j++)
                    if (j != i)
                        others *= unsplit->density[FIELD(padded, reaction->reactant[j], l)];
                size_t at = FIELD(padded, r, l);
                gradient[l * solved + reaction->reactant[i]] +=
                    weight[at] * unsplit->k[at] * others * unsplit->conditions->air[l];
            }
    }
    for (int p = 0; p < unsplit->partners; p++)
        for (int r = 0; r < reactions; r++)
            for (int l = 0; l < layers; l++) {
                size_t at = FIELD(padded, r, l);
                gradient[l * solved + unsplit->partner[p]] +=
                    weight[at] * unsplit->product[at] * unsplit->bend[FIELD(padded, p * reactions + r, l)];
            }
    for (int m = 0; m < unsplit->absorbers; m++) {
        const double *slope = unsplit->slope + (size_t)m * (size_t)unsplit->light->reactions * (size_t)padded;
        double sum = 0.0;
        for (int j = 0; j < unsplit->light->reactions; j++)
            for (int l = 0; l < layers; l++) {
                size_t at = FIELD(padded, lit_first + j, l);
                sum += weight[at] * unsplit->product[at] * slope[FIELD(padded, j, l)];
            }
        gradient[unsplit->absorber[m]] += sum;
    }
}
