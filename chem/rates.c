/* rates: rate coefficients after the forms of JPL Publication 19-5 (Burkholder et al. 2019), see rates.h.
 *
 * Each law is a loop over layers; a single point is a loop of length one: every form stands here once. */
#include "rates.h"

#include <math.h>

/* State of a run of layers. */
typedef struct {
    int count;
    const double *temperature; /* K */
    const double *air;         /* cm-3 */
    const double *water;       /* cm-3 */
} Layers;

/* A exp(-ER/T) (T/Tref)^-n; p: A, ER, n, Tref. */
static void arrhenius(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++) {
        double t = layers->temperature[i];
        k[i] = p[0] * exp(-p[1] / t) * pow(t / p[3], -p[2]);
    }
}

/* Pressure fall-off between k0 [M] and ki with the broadening 0.6^(1/(1 + log10(k0 [M]/ki)^2)) (JPL 19-5,
 * section 2). limits: k0, n0, ki, ni, Tref. *high is ki at this temperature. */
static double falloff_at(const double *limits, double temperature, double air, double *high)
{
    double ratio = temperature / limits[4];
    double low = limits[0] * pow(ratio, -limits[1]) * air;
    *high = limits[2] * pow(ratio, -limits[3]);
    double order = low / *high;
    if (order <= 0.0)
        return 0.0; /* no air: no third body, and no logarithm */
    double decades = log10(order);
    return low / (1.0 + order) * pow(0.6, 1.0 / (1.0 + decades * decades));
}

static void falloff(const double *p, const Layers *layers, double *k)
{
    double high;
    for (int i = 0; i < layers->count; i++)
        k[i] = falloff_at(p, layers->temperature[i], layers->air[i], &high);
}

/* Chemical activation (new in JPL 19-5, section 2): what does not associate, A exp(-ER/T) (1 - kf/ki).
 * p: A, ER, then the limits of the association. */
static void activated(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++) {
        double high, t = layers->temperature[i];
        double association = falloff_at(p + 2, t, layers->air[i], &high);
        k[i] = p[0] * exp(-p[1] / t) * (1.0 - association / high);
    }
}

/* k of the forward reaction in, that of its reverse out: k / (KA exp(KB/T)). */
static void divide_by_equilibrium(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++)
        k[i] /= p[0] * exp(p[1] / layers->temperature[i]);
}

/* (A1 exp(-ER1/T) + A2 exp(-ER2/T) [M]) (1 + AW exp(-ERW/T) [H2O]). */
static void ho2_ho2(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++) {
        double t = layers->temperature[i];
        double dry = p[0] * exp(-p[1] / t) + p[2] * exp(-p[3] / t) * layers->air[i];
        k[i] = dry * (1.0 + p[4] * exp(-p[5] / t) * layers->water[i]);
    }
}

/* Editions up to JPL 15-10: ka + kb [M] / (1 + kb [M] / kc). */
static void oh_hno3(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++) {
        double t = layers->temperature[i];
        double third = p[2] * exp(-p[3] / t) * layers->air[i];
        k[i] = p[0] * exp(-p[1] / t) + third / (1.0 + third / (p[4] * exp(-p[5] / t)));
    }
}

static void sum2(const double *p, const Layers *layers, double *k)
{
    for (int i = 0; i < layers->count; i++) {
        double t = layers->temperature[i];
        k[i] = p[0] * exp(-p[1] / t) + p[2] * exp(-p[3] / t);
    }
}

static void evaluate_law(const Mechanism *mechanism, const Reaction *reaction, const Layers *layers,
                         double *k)
{
    const double *p = reaction->parameter;
    switch (reaction->law) {
    case LAW_ARRHENIUS:
    case LAW_TERMOLECULAR: arrhenius(p, layers, k); break;
    case LAW_FALLOFF: falloff(p, layers, k); break;
    case LAW_ACTIVATED: activated(p, layers, k); break;
    case LAW_EQUILIBRIUM: {
        /* mechanism_read made sure that the forward law is a fall-off. Its branch belongs to the coefficient
         * of the channel that is reversed. */
        const Reaction *forward = &mechanism->reaction[reaction->forward];
        falloff(forward->parameter, layers, k);
        for (int i = 0; i < layers->count; i++)
            k[i] *= forward->branch;
        divide_by_equilibrium(p, layers, k);
        break;
    }
    case LAW_HO2_HO2: ho2_ho2(p, layers, k); break;
    case LAW_OH_HNO3: oh_hno3(p, layers, k); break;
    case LAW_SUM2: sum2(p, layers, k); break;
    default:
        for (int i = 0; i < layers->count; i++)
            k[i] = NAN; /* no thermal reaction: the caller's mistake must show */
    }
}

double rates_law(const Mechanism *mechanism, int reaction, double temperature, double air, double water)
{
    const Layers point = {1, &temperature, &air, &water};
    double k;
    evaluate_law(mechanism, &mechanism->reaction[reaction], &point, &k);
    return k;
}

void rates_thermal(const Mechanism *mechanism, int padded, const double *temperature, const double *air,
                   const double *water, int water_only, double *coefficient)
{
    const Layers layers = {padded, temperature, air, water};
    for (int r = mechanism->thermal_first; r < mechanism->photolysis_first; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        if (water_only && reaction->law != LAW_HO2_HO2)
            continue;
        double *k = coefficient + (size_t)r * (size_t)padded;
        evaluate_law(mechanism, reaction, &layers, k);
        double share = reaction->branch * reaction->fixed_share;
        for (int i = 0; i < padded; i++)
            k[i] *= share;
        for (int order = 0; order < reaction->fixed_order; order++)
            for (int i = 0; i < padded; i++)
                k[i] *= air[i];
    }
}

void rates_washout(const Mechanism *mechanism, int padded, const double *rate, double *coefficient)
{
    for (int r = mechanism->washout_first; r < mechanism->reactions; r++) {
        int species = mechanism->solved_item[mechanism->reaction[r].reactant[0]];
        double solubility = mechanism->item[species].washout;
        double *k = coefficient + (size_t)r * (size_t)padded;
        for (int i = 0; i < padded; i++)
            k[i] = solubility * rate[i];
    }
}
