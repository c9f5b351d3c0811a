/* conditions: what surrounds the chemistry at a moment: temperature, density, aerosol, held gases, sunlight.
 *
 * Model.base holds the conditions of the case's own tables, which never change. Whoever advances a column
 * owns a Conditions of its own, moves it along with conditions_move, and makes afresh what depends on the
 * parts that moved. Where nothing varies (see variation.h) it stays equal to Model.base to the last bit.
 *
 * Layers are layers of MASS. Model.air and Model.grid name the base atmosphere; the molecules of air per cm2
 * of a layer, base N dz, never change, so transport, burdens and the ledger of atoms do not know that
 * temperature moves. What the chemistry sees is the layer at its own pressure p and the temperature T(t) of
 * now: N = p / (k T) = N_base (T_base / T). The layer is then as deep as holds its mass, depth = dz_base
 * (N_base / N), and whatever the chemistry gives per cm3 goes into columns (ledger, optical depth) with that
 * depth. Altitudes, of the grid as of the file, go on naming the base atmosphere: they are a measure of
 * pressure. The change of geometric height (about 1 km at 80 km for 10 K throughout) is left out of the slant
 * paths.
 */
#ifndef SKYMEND_CONDITIONS_H
#define SKYMEND_CONDITIONS_H

#include "column.h"

enum ConditionsPart {
    CONDITIONS_AIR = 1,   /* temperature, air, depth */
    CONDITIONS_LIGHT = 2, /* solar */
    CONDITIONS_SUN = 4,   /* day_of_year */
    CONDITIONS_AEROSOL = 8,
    CONDITIONS_HELD = 16,
    CONDITIONS_GROUND = 32 /* kept */
};

struct Conditions {
    double *temperature;    /* [padded] K */
    double *air;            /* [padded] cm-3, p / (k T) at the layer's pressure */
    double *depth;          /* [padded] cm, air * depth = molecules cm-2 of the layer */
    double *aerosol_area;   /* [padded] cm2 cm-3 */
    double *aerosol_radius; /* [padded] cm, effective */
    double *held_fraction;  /* [MODEL_HELD_MOST][padded] mole fraction where held, 0 where free */
    double *solar;          /* [bins] sunlight relative to the table of the case */
    unsigned char *kept;    /* [solved] 1: the ground keeps the species at a value; emissions may take over */
    double phase;           /* of the solar cycle, when there is one; NaN before the first move */
    double day_of_year;     /* 1..366.25, of the sun's place */
    double *work;           /* [2][padded] */
};

/* The model's base values, with the ground as it is just before the first year; also for model_make itself,
 * when everything but Model.base is there. Owner: caller.
 */
int conditions_make(Conditions **made, const Model *model, Fault *fault);
void conditions_free(Conditions *conditions); /* accepts NULL */
/* Of the same model. */
void conditions_copy(Conditions *to, const Conditions *from, const Model *model);

/* Move to decimal year time (schedule, trends) and season (a decimal year of which only the fraction counts:
 * the time of year, which goes on when the years stand still in a spin-up). Returns which parts changed,
 * ConditionsPart added up; 0 most of the time. Temperature and sunlight move in small steps
 * (CONDITIONS_KELVIN, CONDITIONS_SOLAR_STEP), since tables must be made afresh when they do. */
#define CONDITIONS_KELVIN 0.02      /* in a steady state about 0.02 % of the ozone at 40 km, where most */
#define CONDITIONS_SOLAR_STEP 0.05  /* of the phase of the solar cycle: about 0.1 % of the ozone column */
#define CONDITIONS_SUN_DEGREES 0.25 /* of declination: a day's length at 45 degrees to 2 minutes */
#define CONDITIONS_SUN_DAYS 15 /* at a solstice the distance of the sun still changes, 0.1 % in this time */
int conditions_move(Conditions *conditions, const Model *model, double time, double season);

#endif
