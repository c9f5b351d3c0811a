/* conversion: the abundances of a case as emissions, its emissions as abundances, both as the column itself
 * has them.
 *
 * The column is carried through the years of its case in two intervals a year. What comes through the ground
 * of a gas whose abundance is given is the emission that keeps it there, loss by the column's own chemistry
 * included. In the first and the last year, where an abundance stands still for half a year for want of
 * another, the other half counts for both. The lowest layer at mid-year is the abundance that emissions lead
 * to.
 */
#ifndef SKYMEND_CONVERSION_H
#define SKYMEND_CONVERSION_H

#include "projection.h"

typedef struct {
    int first_year, years; /* finished ones */
    int solved;
    double *emission;  /* [solved][years of the case] kg in the year, of gases that the schedule carries */
    double *abundance; /* [solved][years of the case] mole fraction of the lowest layer at mid-year */
    int room;          /* years of the case */
} Conversion;

/* Settings of the case with the intervals that conversion_run needs. */
void conversion_settings(Settings *settings);
/* Run the model, made of such settings. progress and stop of watcher are used. FAULT_INTERRUPTED leaves
 * nothing. Owner: caller. */
int conversion_run(Conversion **made, const Model *model, Stepper *stepper, Column *column,
                   const Watcher *watcher, Fault *fault);
void conversion_free(Conversion *conversion);

/* Of solved species s in a year of the run. */
double conversion_emission(const Conversion *conversion, int s, int year);
double conversion_abundance(const Conversion *conversion, int s, int year);
/* What a gas whose abundance falls faster than this column takes it away would need: kg below zero (as a
 * positive number), and above it, in all years from `from` on, and the first year below; 0 when there is
 * none. */
typedef struct {
    double below, above;
    int year;
} Uptake;
Uptake conversion_uptake(const Conversion *conversion, int s, int from);
/* Put the emission of s at 0 where it is below, from `from` on. */
void conversion_lift(Conversion *conversion, int s, int from);

#endif
