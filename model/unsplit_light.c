/* unsplit_light: how the rates of the unsplit column answer to what absorbs the light, and to every unknown.
 */
#include "unsplit.h"

#include <math.h>
#include <string.h>

/* Relative shift of an absorber: radiation stands between it and the rates, and the error of the difference,
 * of first order in the shift, stays below 1e-4. */
static const double ABSORBER_SHIFT = 1e-4;

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

void unsplit_slopes(Unsplit *unsplit, const double *x)
{
    const Model *model = unsplit->model;
    const Mechanism *mechanism = model->mechanism;
    Light *light = unsplit->light;
    int padded = model->grid.padded, top = unsplit->layers - 1;
    size_t field = (size_t)light->reactions * (size_t)padded, all = (size_t)unsplit->solved * (size_t)padded;
    double *shifted = unsplit->ahead, *before = shifted + all;
    memcpy(shifted, x, all * sizeof(double));
    light_refresh(light, x, unsplit->lit);
    list_absorbers(unsplit);
    memcpy(before, light->mean, field * sizeof(double));
    for (int m = 0; m < unsplit->absorbers; m++) {
        int s = unsplit->absorber[m] % unsplit->solved, layer = unsplit->absorber[m] / unsplit->solved;
        double *here = shifted + FIELD(padded, s, layer), *slope = unsplit->slope + (size_t)m * field;
        double kept = *here, step = ABSORBER_SHIFT * fmax(fabs(kept), 1e-12);
        for (int l = 0; l < (layer == top ? padded - top : 1); l++)
            here[l] = kept + step;
        light_refresh(light, shifted, unsplit->lit);
        for (int l = 0; l < (layer == top ? padded - top : 1); l++)
            here[l] = kept;
        for (int j = 0; j < light->reactions; j++)
            for (int l = 0; l < padded; l++) {
                size_t at = FIELD(padded, j, l);
                slope[at] = (light->mean[at] - before[at]) / step *
                            unsplit->factor[FIELD(padded, mechanism->photolysis_first + j, l)];
            }
    }
    memcpy(light->mean, before, field * sizeof(double));
    unsplit->lights += unsplit->absorbers + 1;
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
