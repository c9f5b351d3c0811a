/* day: the diurnal factors, from the time integrals of an explicit day.
 *
 * Turco and Whitten (1978, J. Atmos. Terr. Phys. 40, 13): for each reaction and layer the factor is the 24 h
 * mean of the reaction's rate over the product of the 24 h means of its coefficient and its reactants.
 * Multiplying the coefficients of a run that knows only daily means, the factors make its rates those of the
 * real day.
 *
 * The day itself is carried by step_day.c, transport included: near the top of the column diffusion works
 * within hours. Each midnight every species is set to the run's daily mean times the ratio of midnight value
 * to daily mean found on the day before, so that the day stays that of the run. It is repeated until the
 * factors of all reactions that matter change by less than DAY_SETTLED. The first time, when most radicals of
 * the run are still zero, DAY_COLD days run freely instead.
 */
#ifndef SKYMEND_DAY_H
#define SKYMEND_DAY_H

#include "light.h"

#define DAY_SETTLED 0.005 /* relative change of factors between days at which the day counts as repeating */
#define DAY_FOLLOWED                                                                                         \
    0.01            /* the same in the course of a run, where the next refresh goes on from this one: moves  \
                       the column by 0.013 DU at most in 146 years */
#define DAY_MOST 15 /* days tried */
#define DAY_COLD 10 /* days of the first time */
/* Mean number density, cm-3, below which a species is as good as absent, its factors and ratios 1: one
 * molecule in 10 l. */
#define DAY_ABSENT 1e-4

typedef struct {
    const Model *model;
    const Conditions *conditions; /* Model.base until the stepper sets its own */
    double *factor;               /* [reactions][padded] */
    double *ratio;                /* [solved][padded] midnight value over daily mean of the last day */
    double *lit;                  /* [solved][padded] mean while the sun is up over daily mean */
    double *reference;            /* [solved][padded] mole fractions when the factors were made */
    /* time integrals of a day, cleared by day_clear and added to by whoever carries it */
    double *sum_y;   /* [solved][padded] cm-3 s */
    double *sum_lit; /* [solved][padded] cm-3 s, while the sun is up */
    double *sum_w;   /* [reactions][padded] cm-3 */
    double *loss;    /* [solved] work */
    int outdated;    /* the sun has moved since the factors were made */
    int ready;
} Day;

int day_make(Day **made, const Model *model, Fault *fault);
void day_free(Day *day);
/* Factors and the last day of from into to, of the same case; to keeps its own conditions. */
void day_copy(Day *to, const Day *from);

/* 1 when some species with a diurnal course has moved by more than refresh_state since the factors were made.
 */
int day_stale(const Day *day, const double *x);
/* The same with `times` refresh_state in place of refresh_state. */
int day_stale_by(const Day *day, const double *x, double times);
/* Mole fractions at midnight for the daily means x: start [solved][padded] out. */
void day_midnight(const Day *day, const double *x, double *start);
void day_clear(Day *day);
/* Ratios and factors from the integrals of the day that ended with mole fractions end. lit_time: s with the
 * sun up. coefficient [reactions][padded]: thermal, surface, washout. Returns the largest relative change of
 * a factor that matters. */
double day_take(Day *day, const Light *light, const double *end, double lit_time, const double *coefficient);
/* The factors now belong to the daily means x. */
void day_settle(Day *day, const double *x);

#endif
