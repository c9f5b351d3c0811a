/* age_spectrum: see age_spectrum.h. */
#include "age_spectrum.h"

#include <math.h>
#include <string.h>

static const double pi = 3.14159265358979323846;

double age_density(const AgeSpectrum *spectrum, double age)
{
    double mean = spectrum->mean, width = spectrum->width;
    if (!(age > 0.0))
        return 0.0;
    double off = (age - mean) / width;
    return sqrt(mean / (4.0 * pi * age)) * mean / (width * age) * exp(-0.25 * mean / age * off * off);
}

/* The two terms that share and moment are made of (Chhikara and Folks 1974, J. Am. Stat. Assoc. 69, 250): the
 * normal distribution at sqrt(shape/a) (a/mean - 1), and exp(2 shape/mean) times that at -sqrt(shape/a)
 * (a/mean + 1), with shape = mean^3 / (2 width^2). */
static void normal_terms(const AgeSpectrum *spectrum, double age, double *near, double *far)
{
    double ratio = spectrum->mean / spectrum->width;
    double root = 0.5 * ratio * sqrt(spectrum->mean / age); /* sqrt(shape/a) / sqrt(2) */
    *near = 0.5 * erfc(-root * (age / spectrum->mean - 1.0));
    *far = 0.5 * exp(ratio * ratio) * erfc(root * (age / spectrum->mean + 1.0));
}

double age_share(const AgeSpectrum *spectrum, double age)
{
    double near, far;
    if (!(age > 0.0))
        return 0.0;
    if (isinf(age))
        return 1.0;
    normal_terms(spectrum, age, &near, &far);
    return near + far;
}

double age_moment(const AgeSpectrum *spectrum, double age)
{
    double near, far;
    if (!(age > 0.0))
        return 0.0;
    if (isinf(age))
        return spectrum->mean;
    normal_terms(spectrum, age, &near, &far);
    return spectrum->mean * (near - far);
}

void age_weights(const AgeSpectrum *spectrum, const double *time, int count, double at, double *weight)
{
    memset(weight, 0, (size_t)count * sizeof *weight);
    double share = age_share(spectrum, at - time[0]), moment = age_moment(spectrum, at - time[0]);
    weight[0] = 1.0 - share; /* what is older than the series */
    for (int i = 0; i + 1 < count && time[i] < at; i++) {
        double next_share = age_share(spectrum, at - time[i + 1]);
        double next_moment = age_moment(spectrum, at - time[i + 1]);
        /* of the air that left within this step, how much counts with the value at its end */
        double within = share - next_share;
        double late = ((at - time[i]) * within - (moment - next_moment)) / (time[i + 1] - time[i]);
        weight[i] += within - late;
        weight[i + 1] += late;
        share = next_share;
        moment = next_moment;
    }
    if (at > time[count - 1])
        weight[count - 1] += share; /* what is younger than the series */
}
