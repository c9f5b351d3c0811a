/* standard_light: what the tests of sunlight share: an ozone profile, a quadrature, an error measure. */
#ifndef SKYMEND_TEST_STANDARD_LIGHT_H
#define SKYMEND_TEST_STANDARD_LIGHT_H

#include <math.h>

#include "../input/constants.h"

/* Mid-latitude ozone model of the U.S. Standard Atmosphere 1976 (Krueger and Minzner 1976, J. Geophys. Res.
 * 81, 4477; from memory), cm-3 at 0, 2, ... 74 km; the value of 2 km stands at the ground too. */
static const double standard_ozone[38] = {
    6.8e11,  6.8e11,  5.8e11,  5.7e11,  6.5e11,  1.13e12, 2.02e12, 2.35e12, 2.95e12, 4.04e12,
    4.77e12, 4.86e12, 4.54e12, 4.03e12, 3.24e12, 2.52e12, 2.03e12, 1.58e12, 1.22e12, 8.73e11,
    6.07e11, 3.98e11, 2.74e11, 1.69e11, 1.03e11, 6.64e10, 3.84e10, 2.55e10, 1.61e10, 1.12e10,
    7.33e9,  4.81e9,  3.17e9,  1.72e9,  7.5e8,   5.4e8,   2.2e8,   1.7e8};

/* The same, logarithmic between. */
static inline double ozone_at(double km)
{
    double at = fmin(km / 2, 36.999);
    int k = (int)at;
    return standard_ozone[k] * pow(standard_ozone[k + 1] / standard_ozone[k], km / 2 - k);
}

/* Gauss-Legendre nodes and weights on 0..1 by Newton's method. */
static inline void gauss(int n, double *x, double *w)
{
    for (int i = 0; i < n; i++) {
        double z = cos(PI * (i + 0.75) / (n + 0.5)), slope = 1;
        for (int it = 0; it < 50; it++) {
            double p = 1, before = 0;
            for (int k = 0; k < n; k++) {
                double next = ((2 * k + 1) * z * p - k * before) / (k + 1);
                before = p;
                p = next;
            }
            slope = n * (z * p - before) / (z * z - 1);
            z -= p / slope;
        }
        x[i] = 0.5 * (1 - z);
        w[i] = 1 / ((1 - z * z) * slope * slope);
    }
}

/* The larger of now and the relative error of got. */
static inline double worst(double now, double got, double want)
{
    return fmax(now, fabs(got / want - 1));
}

#endif
