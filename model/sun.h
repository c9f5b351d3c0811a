/* sun: the path of the sun through one day, and photolysis rates along it.
 *
 * The global sun is a day of 12 h whose cosine of the zenith angle rises linearly from 0 to 1 and falls back,
 * then 12 h of dark: the mean of a rate over it is half its integral over the cosine, the true global mean. A
 * latitude's sun follows the hour angle, with twilight to 11.5 degrees below the horizon.
 *
 * With a season the sun of a latitude goes through its year: the nodes span all heights the year has, so that
 * the rates at them outlast the day, and sun_set_day moves the knots.
 *
 * Photolysis is computed at a few cosines (nodes). Between them log J is interpolated by the monotone cubic
 * of Fritsch and Carlson (1980) onto the knots, times from sunrise to noon that crowd at sunrise; the
 * afternoon mirrors them. Between knots J is linear in time, scaled for each reaction and layer so that its
 * day mean is that of the interpolant.
 */
#ifndef SKYMEND_SUN_H
#define SKYMEND_SUN_H

#include "../input/fault.h"
#include "../input/settings.h"

#define SUN_KNOTS 21        /* morning knots, sunrise and noon included */
#define SUN_NODES 28        /* at most */
#define SUN_TWILIGHT (-0.2) /* cosine below which a real sun gives no light worth counting */

typedef struct {
    int nodes;                    /* 0: the sun does not rise, all year where there is a season */
    int rises;                    /* 0: no light on this day */
    double cosine[SUN_NODES];     /* [nodes] ascending */
    double time[SUN_KNOTS];       /* s after midnight, time[SUN_KNOTS - 1] = noon */
    double knot[SUN_KNOTS];       /* cosine at the knots */
    double middle[SUN_KNOTS - 1]; /* cosine half-way (in time) between knots, for the quadrature */
    double earth_sun;             /* flux relative to that at 1 au */
} Sun;

/* refine = 1: as used; 2: nodes twice as dense (tests of the interpolation, and always with a season). */
void sun_make(Sun *sun, const Settings *settings, int refine);

/* SUN_SEASON: the path on a day of the year (1 = the beginning of 1 January; fractions and 365.25 days
 * serve). sun_make sets that of settings->day_of_year. */
void sun_set_day(Sun *sun, const Settings *settings, double day_of_year);
/* Declination of the sun, radians, Spencer (1971, Search 2, 172), good to 0.035 degrees. */
double sun_declination(double day_of_year);

/* Interpolate one reaction onto the knots and average it.
 *   table [nodes] with stride node_stride: rate at each node, >= 0
 *   knot  [SUN_KNOTS] with stride knot_stride, out: rates at the knots, scaled to the mean
 * Returns the mean over 24 h. */
double sun_spread(const Sun *sun, const double *table, int node_stride, double *knot, int knot_stride);
/* Derivative of that mean by the rate at each node: gradient [nodes] with stride gradient_stride, out. The
 * mean is the sum of gradient times rate, but for what the monotone cubic's switches do between its pieces.
 */
void sun_gradient(const Sun *sun, const double *table, int node_stride, double *gradient,
                  int gradient_stride);

#endif
