/* light: photolysis rates of a column through its day, refreshed when overhead ozone has moved. */
#ifndef SKYMEND_LIGHT_H
#define SKYMEND_LIGHT_H

#include "../chem/photolysis.h"
#include "conditions.h"
#include "sun.h"

typedef struct {
    const Model *model;
    const Conditions *conditions; /* Model.base until light_follow */
    Sun sun;
    Photolysis *photolysis;
    int reactions; /* photolysis reactions; row 0 is the mechanism's reaction photolysis_first */
    /* rate coefficients: photolysis rate, s-1, times the number density of the fixed reactant where there is
     * one (O2), as the kernel wants it */
    double *table;    /* [nodes][reactions][padded] */
    double *knot;     /* [SUN_KNOTS][reactions][padded], morning */
    double *mean;     /* [reactions][padded], mean over 24 h */
    double *kelvin;   /* [padded] temperature the photolysis has its cross sections for */
    double *air;      /* [padded] cm-3, number density of air in the coefficients of fixed reactants */
    double *overhead; /* [padded] ozone above each layer's middle at the last refresh, cm-2 */
    double *density;  /* [3][padded] work: number densities of O3, NO2, NO */
    int ready;        /* rates have been computed */
    int turned;       /* the sun has moved since: rates at the nodes hold, those of the day do not */
} Light;

/* Owner: caller. refine as in sun_make. */
int light_make(Light **made, const Model *model, int refine, Fault *fault);
void light_free(Light *light);
/* The rates of from and all they stand for into to, of the same case and refinement; to keeps its own
 * conditions, which must be equal. */
void light_copy(Light *to, const Light *from);

/* Take conditions (kept by reference) in place of what light went by; moved says which parts changed since
 * then, ConditionsPart added up. Rates count as stale afterwards where they depend on them; of temperature,
 * when it has moved by more than LIGHT_KELVIN, while number densities in the coefficients follow at once.
 * Returns 1 when coefficients have changed. */
#define LIGHT_KELVIN 0.1 /* cross sections move by less than 1e-3 of themselves */
int light_follow(Light *light, const Conditions *conditions, int moved);

/* Absorbers while the sun is up: x [solved][padded] mole fractions, times lit [solved][padded] where that is
 * not NULL (mean by daylight over daily mean: in the mesosphere ozone by day is a fraction of that by night).
 *
 * light_stale: 1 when the ozone above some layer has changed by more than refresh_column since the last
 * refresh, relative to itself or, where it is thinner, to a column of optical depth 1 at the ozone maximum of
 * absorption. light_refresh: compute the rates. */
int light_stale(const Light *light, const double *x, const double *lit);
/* The same with `times` refresh_column in place of refresh_column. */
int light_stale_by(const Light *light, const double *x, const double *lit, double times);
void light_refresh(Light *light, const double *x, const double *lit);
/* After light_refresh at the same state: how mean answers to O3, NO2 and NO, to first order, at the
 * interpolation's present pieces (sun_gradient); by finite differences it would take as many lights as there
 * are layers. slope [layers k][reactions j][3][layers m] out: d mean of reaction j in layer k by the mole
 * fraction of O3, NO2 and NO in layer m, what lies above the top moving with the top layer; 0 where a mole
 * fraction is negative. Not with a sun that has turned since. FAULT_MEMORY. */
int light_slopes(Light *light, const double *x, const double *lit, double *slope, Fault *fault);
/* Photolysis rate itself, s-1, mean over 24 h. */
double light_mean_rate(const Light *light, int reaction, int layer);

#endif
