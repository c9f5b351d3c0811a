/* age_spectrum: how long the air of a place has been in the stratosphere.
 *
 * The age spectrum G(a) is the share of air that left the ground a years ago. It is taken as the inverse
 * Gaussian of mean age Gamma and width Delta, half of whose variance is Delta squared (Waugh and Hall 2002,
 * Rev. Geophys. 40, 1010, equation 9; from memory):
 *
 *     G(a) = sqrt(Gamma^3 / (4 pi Delta^2 a^3)) exp(-Gamma (a - Gamma)^2 / (4 Delta^2 a))
 *
 * Its integral and first moment up to an age have closed forms, so that the mean of a series over the
 * spectrum is exact where the series is linear between its times. Ages in years.
 */
#ifndef SKYMEND_AGE_SPECTRUM_H
#define SKYMEND_AGE_SPECTRUM_H

typedef struct {
    double mean, width; /* years; mean > 0, mean/20 <= width, narrower ones overflow */
} AgeSpectrum;

double age_density(const AgeSpectrum *spectrum, double age); /* G, year-1; 0 for age <= 0 */
double age_share(const AgeSpectrum *spectrum, double age);   /* of air younger than age */
/* Integral of a G(a) from 0 to age, years: the mean age when age is infinite. */
double age_moment(const AgeSpectrum *spectrum, double age);

/* Weights [count] by which the values of a series at times time [count] (decimal years, increasing, count >=
 * 1) are summed to its mean over the spectrum at the time `at`; they sum to 1. The series is linear between
 * its times; before the first it is held at the first value, after the last at the last. */
void age_weights(const AgeSpectrum *spectrum, const double *time, int count, double at, double *weight);

#endif
