/* surface: uptake on sulfuric acid droplets and cold solid particles, see surface.h.
 *
 * Composition: Tabazadeh, A., et al. (1997), Geophys. Res. Lett. 24, 1931, molality against water activity.
 *
 * ClONO2 and HOCl: Shi, Q., et al. (2001), J. Geophys. Res. 106, 24259, tables A1 to A4, as recommended by
 * JPL 19-5 section 5: accommodation, bulk reaction within a diffusion length, surface reaction, HCl supply.
 *
 * BrONO2: Hanson, D. R. (2003), J. Geophys. Res. 108, 4239, his fit with all its digits: two digits of each
 * would lower the probability by 15 percent at 75 percent of acid.
 *
 * N2O5: JPL 19-5 section 5, fit to Robinson, G. N., et al. (1997), J. Geophys. Res. 102, 3583, Hallquist, M.,
 * et al. (2000), J. Phys. Chem. A 104, 3984, and others.
 *
 * Every number of these fits is typed from memory: compare with the papers before relying on the last digit.
 * The fits were made for 185 to 260 K and some 40 to 80 percent of acid. They are evaluated beyond, where
 * they matter little: warm and wet, uptake competes with washout; above about 85 percent (over 35 km) the
 * density fit rises steeply, so solubility and the ClONO2 and HOCl probabilities, already below 1e-5, go to
 * zero.
 */
#include "surface.h"

#include <math.h>

#include "../input/constants.h"
#include "nat.h"

#define HPA_PER_ATM 1013.25
#define LITRE_ATM 0.082 /* gas constant as used by Shi et al., l atm mol-1 K-1 */
/* Density that stands for an absent partner: every expression has reached its limit there. */
#define ABSENT_CM3 1.0

/* A droplet in equilibrium with the water vapour around it, in the units of Shi et al. */
typedef struct {
    double temperature; /* K */
    double percent;     /* acid, mass */
    double molarity;    /* acid, mol l-1 */
    double fraction;    /* acid, mole fraction */
    double water_activity;
    double acid_activity; /* of H+, mol l-1 */
    double fluidity;      /* 1 / viscosity, 1/cP; 0 in a glass */
    double radius;        /* cm */
} Droplet;

/* Saturation pressure over supercooled water, hPa (Tabazadeh et al. 1997, equation 1 of the appendix). */
static double saturation(double t)
{
    return exp(18.452406985 - 3505.1578807 / t - 330918.55082 / (t * t) + 12725068.262 / (t * t * t));
}

/* Water activity. Nothing liquid is in equilibrium with more than saturated air: the fit ends at 1. */
static double water_activity(double t, double water_hpa)
{
    return fmin(water_hpa / saturation(t), 1.0);
}

/* Molality of the acid, mol kg-1: at 190 K and 260 K as a function of activity, linear in temperature. Beyond
 * 260 K the straight line would go below 0 near saturation, so the composition there is that of 260 K. */
static double molality_at(double t, double activity)
{
    static const struct {
        double most;             /* up to this activity */
        double cold[4], warm[4]; /* y = a x^b + c x + d */
    } fits[] = {
        {0.05,
         {12.37208932, -0.16125516114, -30.490657554, -2.1133114241},
         {13.455394705, -0.1921312255, -34.285174607, -1.7620073078}},
        {0.85,
         {11.820654354, -0.20786404244, -4.807306373, -5.1727540348},
         {12.891938068, -0.23233847708, -6.4261237757, -4.9005471319}},
        {1.0,
         {-180.06541028, -0.38601102592, -93.317846778, 273.88132245},
         {-176.95814097, -0.36257048154, -90.469744201, 267.45509988}},
    };
    int range = activity <= fits[0].most ? 0 : activity <= fits[1].most ? 1 : 2;
    const double *c = fits[range].cold, *w = fits[range].warm;
    double cold = c[0] * pow(activity, c[1]) + c[2] * activity + c[3];
    double warm = w[0] * pow(activity, w[1]) + w[2] * activity + w[3];
    return cold + (fmin(t, 260.0) - 190.0) * (warm - cold) / 70.0;
}

static double percent_of(double molality)
{
    return 9800.0 * molality / (98.0 * molality + 1000.0);
}

double surface_acid_percent(double temperature, double water_hpa)
{
    if (!(water_hpa > 0.0))
        return 100.0; /* the limit of dry air */
    return percent_of(molality_at(temperature, water_activity(temperature, water_hpa)));
}

/* Shi et al. (2001), table A1. water_hpa > 0. */
static Droplet make_droplet(double t, double water_hpa, double radius)
{
    Droplet droplet = {.temperature = t, .radius = radius};
    double activity = water_activity(t, water_hpa), m = molality_at(t, activity), w = percent_of(m);
    double z1 = 0.12364 - 5.6e-7 * t * t, z2 = -0.02954 + 1.814e-7 * t * t;
    double z3 = 2.343e-3 - 1.487e-6 * t - 1.324e-8 * t * t;
    double density = 1.0 + z1 * m + z2 * m * sqrt(m) + z3 * m * m; /* g cm-3 */
    droplet.water_activity = activity;
    droplet.percent = w;
    droplet.molarity = density * w / 9.8;
    droplet.fraction = w / (w + (100.0 - w) * 98.0 / 18.0);
    droplet.acid_activity =
        exp(60.51 - 0.095 * w + 0.0077 * w * w - 1.61e-5 * w * w * w - (1.76 + 2.52e-4 * w * w) * sqrt(t) +
            (-805.89 + 253.05 * pow(w, 0.076)) / sqrt(t));
    double a = 169.5 + 5.18 * w - 0.0825 * w * w + 3.27e-3 * w * w * w;
    double glass = 144.11 + 0.166 * w - 0.015 * w * w + 2.18e-4 * w * w * w;
    if (t > glass)
        droplet.fluidity = exp(-448.0 / (t - glass)) * pow(t, 1.43) / a;
    return droplet;
}

/* HCl in the droplet, mol l-1 (table A3). */
static double dissolved_hcl(const Droplet *droplet, double hcl_hpa)
{
    double x = droplet->fraction, t = droplet->temperature;
    double henry = (0.094 - 0.61 * x + 1.2 * x * x) * exp(-8.68 + (8515.0 - 10718.0 * pow(x, 0.7)) / t);
    return henry * hcl_hpa / HPA_PER_ATM;
}

/* Bulk uptake 4 H R T sqrt(D k) / c within a sphere: the factor coth(q) - 1/q, q = radius / sqrt(D/k), tells
 * how much of an infinite depth the droplet offers. */
static double bulk_uptake(const Droplet *droplet, double henry, double diffusion, double rate, double speed)
{
    if (!(diffusion > 0.0) || !(rate > 0.0))
        return 0.0;
    double q = droplet->radius * sqrt(rate / diffusion);
    /* the difference cancels for small q; its series is q/3 - q^3/45 + ... */
    double depth = q < 1e-2 ? q / 3.0 : 1.0 / tanh(q) - 1.0 / q;
    return depth * 4.0 * henry * LITRE_ATM * droplet->temperature * sqrt(diffusion * rate) / speed;
}

/* 1 / (1 + 1/uptake) with full accommodation, and its limit at 0. */
static double with_accommodation(double uptake)
{
    return uptake > 0.0 ? 1.0 / (1.0 + 1.0 / uptake) : 0.0;
}

typedef struct {
    double with_water, with_hcl; /* probabilities of ClONO2 */
    double hcl_supply;           /* share of the HCl reactions that the flow of HCl to the droplet allows */
} Clono2Uptake;

/* Tables A2 and A3. hcl_hpa > 0. */
static Clono2Uptake clono2_uptake(const Droplet *droplet, double hcl_hpa, double clono2_hpa)
{
    double t = droplet->temperature, speed = 1474.0 * sqrt(t);
    double henry = 1.6e-6 * exp(4710.0 / t - (0.306 + 24.0 / t) * droplet->molarity);
    double diffusion = 5e-8 * t * droplet->fluidity;
    double hcl = dissolved_hcl(droplet, hcl_hpa);
    double hydrolysis = (1.95e10 * exp(-2800.0 / t) + 1.22e12 * exp(-6200.0 / t) * droplet->acid_activity) *
                        droplet->water_activity;
    double chlorination = 7.9e11 * droplet->acid_activity * diffusion * hcl;
    double total = hydrolysis + chlorination;
    double bulk = bulk_uptake(droplet, henry, diffusion, total, speed);
    double bulk_hcl = bulk * chlorination / total, bulk_water = bulk * hydrolysis / total;
    double film = 66.12 * exp(-1374.0 / t) * henry * hcl;

    Clono2Uptake uptake;
    uptake.hcl_supply = 1.0 / (1.0 + 0.612 * (film + bulk_hcl) * clono2_hpa / hcl_hpa);
    double by_hcl = uptake.hcl_supply * (film + bulk_hcl), sum = by_hcl + bulk_water;
    double probability = with_accommodation(sum);
    uptake.with_hcl = sum > 0.0 ? probability * (by_hcl / sum) : 0.0;
    uptake.with_water = sum > 0.0 ? probability * (bulk_water / sum) : 0.0;
    return uptake;
}

/* Table A4. */
static double hocl_probability(const Droplet *droplet, double hcl_hpa, double clono2_hpa)
{
    double t = droplet->temperature, speed = 2009.0 * sqrt(t);
    double henry = 1.91e-6 * exp(5862.4 / t - (0.0776 + 59.18 / t) * droplet->molarity);
    double diffusion = 6.4e-8 * t * droplet->fluidity;
    double rate = 1.25e9 * droplet->acid_activity * diffusion * dissolved_hcl(droplet, hcl_hpa);
    double supply = clono2_uptake(droplet, hcl_hpa, clono2_hpa).hcl_supply;
    return with_accommodation(bulk_uptake(droplet, henry, diffusion, rate, speed) * supply);
}

/* 1/gamma = 1/0.805 + 1/(0.114 + exp(29.24 - 0.396 percent)). */
static double brono2_probability(const Droplet *droplet)
{
    return 1.0 / (1.0 / 0.805 + 1.0 / (0.114 + exp(29.24 - 0.396 * droplet->percent)));
}

/* ln gamma is a quadratic in 1/T whose coefficients are cubics in the acid's percentage; made for 180 to 300
 * K and 0 to 95 percent or so, without limit of size: the droplets are as good as flat for N2O5. */
static double n2o5_probability(const Droplet *droplet)
{
    double w = droplet->percent, x = 1.0 / droplet->temperature;
    double k0 = -25.5265 + w * (-0.133188 + w * (0.00930846 - 9.0194e-5 * w));
    double k1 = 9283.76 + w * (115.345 + w * (-5.19258 + 0.0483464 * w));
    double k2 = -851801.0 + w * (-22191.2 + w * (766.916 - 6.85427 * w));
    return exp(k0 + x * (k1 + x * k2));
}

static double probability_of(const Reaction *reaction, const Droplet *droplet, double hcl_hpa,
                             double clono2_hpa)
{
    switch (reaction->surface_model) {
    case SURFACE_CLONO2_H2O: return clono2_uptake(droplet, hcl_hpa, clono2_hpa).with_water;
    case SURFACE_CLONO2_HCL: return clono2_uptake(droplet, hcl_hpa, clono2_hpa).with_hcl;
    case SURFACE_HOCL_HCL: return hocl_probability(droplet, hcl_hpa, clono2_hpa);
    case SURFACE_BRONO2_H2O: return brono2_probability(droplet);
    case SURFACE_N2O5_H2O: return n2o5_probability(droplet);
    default: return reaction->gamma;
    }
}

static double pressure_hpa(double density, double temperature)
{
    return density * 1e6 * BOLTZMANN * temperature / 100.0; /* from cm-3 by way of m-3 and Pa */
}

double surface_probability(const Mechanism *mechanism, int reaction, double temperature, double water_hpa,
                           double hcl_hpa, double clono2_hpa, double radius_cm)
{
    double least = pressure_hpa(ABSENT_CM3, temperature);
    Droplet droplet = make_droplet(temperature, fmax(water_hpa, least), radius_cm);
    return probability_of(&mechanism->reaction[reaction], &droplet, fmax(hcl_hpa, least),
                          fmax(clono2_hpa, 0.0));
}

/* Density of solved species s in layer i, or least where it is absent, unknown (s < 0) or not above least. */
static double density_at(const double *density, int padded, int s, int i, double least)
{
    return s < 0 ? least : fmax(density[(size_t)s * (size_t)padded + (size_t)i], least);
}

static int on_nat(const Reaction *reaction)
{
    return reaction->surface_model == SURFACE_NAT_H2O || reaction->surface_model == SURFACE_NAT_HCL;
}

/* cm s-1 from J and g */
static double mean_speed(const Mechanism *mechanism, int solved, double temperature)
{
    double molar_mass = mechanism->item[mechanism->solved_item[solved]].molar_mass;
    return 100.0 * sqrt(8.0 * GAS_CONSTANT * temperature / (PI * 1e-3 * molar_mass));
}

/* Share of an uptake by gamma that the flow of the partner to the surface allows, every collision of which
 * counts: the form of Shi et al. (2001) for the droplets. */
static double supply(double gamma, double speed, double density, double partner_speed, double partner_density)
{
    return 1.0 / (1.0 + gamma * speed * density / (partner_speed * partner_density));
}

void surface_rates(const Mechanism *mechanism, int padded, const double *temperature, const double *air,
                   const double *area, const double *radius, const double *density, double *coefficient)
{
    (void)air; /* pressures follow from densities; kept for a gas-phase diffusion correction */
    int water = mechanism_solved(mechanism, "H2O"), hcl = mechanism_solved(mechanism, "HCl");
    int clono2 = mechanism_solved(mechanism, "ClONO2"), hno3 = mechanism_solved(mechanism, "HNO3");
    for (int i = 0; i < padded; i++) {
        double t = temperature[i];
        double water_hpa = pressure_hpa(density_at(density, padded, water, i, ABSENT_CM3), t);
        double hcl_hpa = pressure_hpa(density_at(density, padded, hcl, i, ABSENT_CM3), t);
        double clono2_hpa = pressure_hpa(density_at(density, padded, clono2, i, 0.0), t);
        double solid = nat_area(t, water_hpa, pressure_hpa(density_at(density, padded, hno3, i, 0.0), t));
        Droplet droplet = {0};
        if (area[i] > 0.0)
            droplet = make_droplet(t, water_hpa, radius[i]);
        for (int r = mechanism->surface_first; r < mechanism->washout_first; r++) {
            const Reaction *reaction = &mechanism->reaction[r];
            double *k = coefficient + (size_t)r * (size_t)padded + i;
            double here = on_nat(reaction) ? solid : area[i];
            *k = 0.0;
            if (!(here > 0.0))
                continue;
            double gamma = probability_of(reaction, &droplet, hcl_hpa, clono2_hpa);
            double speed = mean_speed(mechanism, reaction->reactant[0], t);
            if (reaction->surface_model == SURFACE_NAT_HCL)
                gamma *=
                    supply(gamma, speed, density_at(density, padded, reaction->reactant[0], i, 0.0),
                           mean_speed(mechanism, hcl, t), density_at(density, padded, hcl, i, ABSENT_CM3));
            *k = 0.25 * gamma * speed * here;
            if (reaction->reactants == 2)
                *k /= density_at(density, padded, reaction->reactant[1], i, ABSENT_CM3);
        }
    }
}
