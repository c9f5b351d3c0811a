/* unsplit_light: how the rates of the unsplit column answer to what absorbs the light, and to every unknown.
 */
#include "unsplit.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const names[UNSPLIT_ABSORBERS] = {"O3", "NO2", "NO"};

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

int unsplit_slopes(Unsplit *unsplit, const double *x, Fault *fault)
{
    const Model *model = unsplit->model;
    Light *light = unsplit->light;
    int padded = model->grid.padded, layers = unsplit->layers, lit = light->reactions;
    size_t row = UNSPLIT_ABSORBERS * (size_t)layers;
    double *answer = malloc((size_t)layers * (size_t)lit * row * sizeof *answer);
    if (!answer)
        return fault_memory(fault, "the slopes of the light");
    light_refresh(light, x, unsplit->lit);
    unsplit->lights++;
    if (light_slopes(light, x, unsplit->lit, answer, fault)) {
        free(answer);
        return fault->code;
    }
    int kind[UNSPLIT_ABSORBERS];
    for (int a = 0; a < UNSPLIT_ABSORBERS; a++)
        kind[a] = mechanism_solved(model->mechanism, names[a]);
    list_absorbers(unsplit);
    for (int m = 0; m < unsplit->absorbers; m++) {
        int a = 0, layer = unsplit->absorber[m] / unsplit->solved;
        while (kind[a] != unsplit->absorber[m] % unsplit->solved)
            a++;
        for (int j = 0; j < lit; j++)
            for (int l = 0; l < padded; l++) {
                int from = l < layers ? l : layers - 1; /* padding repeats the top layer */
                unsplit->slope[FIELD(padded, m * lit + j, l)] =
                    answer[((size_t)from * (size_t)lit + (size_t)j) * row + (size_t)(a * layers + layer)] *
                    unsplit->factor[FIELD(padded, model->mechanism->photolysis_first + j, l)];
            }
    }
    free(answer);
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
