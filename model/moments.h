/* moments: mole fractions by time of day.
 *
 * The explicit day goes in parts from midnight to midnight; at four of their borders the state is kept:
 * midnight, sunrise, noon, sunset. A run of daily means has for each species and layer
 *
 *     value(moment) = daily mean x (value at the moment / daily mean)        ratio of the last day carried
 *
 * and a run of explicit days the values themselves. Sunrise is the first light that the case's sun counts.
 * The global sun rises and sets at cosine 0; a latitude's sun has twilight before that, and its moments are
 * dawn and dusk, 11.5 degrees below the horizon (SUN_TWILIGHT).
 */
#ifndef SKYMEND_MOMENTS_H
#define SKYMEND_MOMENTS_H

#include "day.h"

enum Moment { MOMENT_MIDNIGHT, MOMENT_SUNRISE, MOMENT_NOON, MOMENT_SUNSET, MOMENTS };

typedef struct {
    const Model *model;
    double *state; /* [MOMENTS][solved][padded] mole fractions of the last day carried */
} Moments;

/* Owner: caller. */
int moments_make(Moments **made, const Model *model, Fault *fault);
void moments_free(Moments *moments);
void moments_copy(Moments *to, const Moments *from); /* of the same model */

/* Local solar time of each moment, h after midnight, ascending: hours [MOMENTS] out. FAULT_INPUT when it
 * is light or dark for 24 h (twilight is light). */
int moments_hours(const Settings *settings, double *hours, Fault *fault);
/* "midnight", "sunrise" or "dawn", "noon", "sunset" or "dusk". */
const char *moment_name(const Settings *settings, int moment);
/* Whether solved species s has a course through the day worth writing: every gas but those that the ground
 * keeps at a value, or keeps until emissions take over, which live for weeks and more. */
int moments_has(const Model *model, int s);

/* Keep x [solved][padded], the state where a part of the day (0 to PACK_DAY_PARTS, pack.h) begins. */
void moments_see(Moments *moments, int part, const double *x);
/* Value at a moment over the daily mean of the last day; 1 where the species is absent. The time integrals in
 * day are those of that day. */
double moments_ratio(const Moments *moments, const Day *day, int moment, int s, int layer);
/* out [MOMENTS][solved][padded]: mole fractions for the daily means [solved][padded]; with explicit days
 * those of the last day. A day must have been carried. */
void moments_values(const Moments *moments, const Day *day, const double *mean, double *out);

#endif
