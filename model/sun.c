/* sun: path and interpolation. */
#include "sun.h"

#include <math.h>

#include "../input/constants.h"

/* Earth-sun distance: (mean distance / distance)^2, Spencer (1971, Search 2, 172), good to 1e-4. */
static double earth_sun_factor(double day_of_year)
{
    double angle = 2.0 * PI * (day_of_year - 1.0) / 365.0;
    return 1.000110 + 0.034221 * cos(angle) + 0.001280 * sin(angle) + 0.000719 * cos(2.0 * angle) +
           0.000077 * sin(2.0 * angle);
}

double sun_declination(double day_of_year)
{
    double angle = 2.0 * PI * (day_of_year - 1.0) / 365.0;
    return 0.006918 - 0.399912 * cos(angle) + 0.070257 * sin(angle) - 0.006758 * cos(2.0 * angle) +
           0.000907 * sin(2.0 * angle) - 0.002697 * cos(3.0 * angle) + 0.001480 * sin(3.0 * angle);
}

typedef struct {
    int global;
    double constant, swing; /* latitude: cosine = constant - swing cos(2 pi t / day) */
} Path;

static double path_cosine(const Path *path, double time)
{
    if (path->global) {
        double value = (time - 0.25 * DAY_SECONDS) / (0.25 * DAY_SECONDS);
        return value < 0.0 ? 0.0 : value > 1.0 ? 1.0 : value;
    }
    return path->constant - path->swing * cos(2.0 * PI * time / DAY_SECONDS);
}

/* Nodes from low to high: quadratic crowding towards 0, where rates fall steeply. */
static void place_nodes(Sun *sun, double low, double high, int refine)
{
    int above = refine == 2 ? 20 : 14, below = 0;
    sun->nodes = 0;
    if (low < 0.0) {
        below = refine == 2 ? 7 : 5;
        double top = high < 0.0 ? high : 0.0;
        for (int i = 0; i < below; i++)
            sun->cosine[sun->nodes++] = low + (top - low) * i / below;
        if (high <= 0.0) {
            sun->cosine[sun->nodes++] = high;
            return;
        }
        low = 0.0;
    }
    for (int i = 0; i < above; i++) {
        double s = (double)i / (above - 1);
        sun->cosine[sun->nodes++] = low + (high - low) * s * s;
    }
}

static Path place_path(const Settings *settings, double day_of_year)
{
    double delta = sun_declination(day_of_year), latitude = settings->latitude_deg * PI / 180.0;
    return (Path){.constant = sin(latitude) * sin(delta), .swing = cos(latitude) * cos(delta)};
}

/* Knots from sunrise to noon. */
static void place_knots(Sun *sun, const Path *path, double rise)
{
    double noon = 0.5 * DAY_SECONDS;
    for (int i = 0; i < SUN_KNOTS; i++) {
        double s = (double)i / (SUN_KNOTS - 1);
        /* crowd at sunrise; a real sunrise passes twilight first and needs an even spread */
        sun->time[i] = rise + (noon - rise) * (path->global ? pow(s, 1.6) : s);
        sun->knot[i] = path_cosine(path, sun->time[i]);
        if (i)
            sun->middle[i - 1] = path_cosine(path, 0.5 * (sun->time[i - 1] + sun->time[i]));
    }
    sun->rises = 1;
}

/* The path over a place on a day: earth_sun, rises, and the knots if it does. Returns the lowest cosine that
 * counts. */
static double place_day(Sun *sun, const Path *path, double day_of_year)
{
    double low = path->constant - path->swing, rise = 0.0;
    sun->earth_sun = earth_sun_factor(day_of_year);
    sun->rises = 0;
    if (low < SUN_TWILIGHT) {
        if (path->constant + path->swing <= SUN_TWILIGHT)
            return SUN_TWILIGHT; /* polar night */
        rise = DAY_SECONDS / (2.0 * PI) * acos((path->constant - SUN_TWILIGHT) / path->swing);
        low = SUN_TWILIGHT;
    }
    place_knots(sun, path, rise);
    return low;
}

void sun_set_day(Sun *sun, const Settings *settings, double day_of_year)
{
    Path path = place_path(settings, day_of_year);
    place_day(sun, &path, day_of_year);
}

/* Nodes over every height of the sun in a year, dense, since a winter day uses only the lower ones. */
static void place_year(Sun *sun, const Settings *settings)
{
    double low = 1.0, high = -1.0;
    for (int quarter = 4; quarter < 4 * 367; quarter++) {
        Path path = place_path(settings, 0.25 * quarter);
        low = fmin(low, path.constant - path.swing);
        high = fmax(high, path.constant + path.swing);
    }
    /* the true extremes lie between two quarters of a day */
    place_nodes(sun, fmax(low - 1e-5, SUN_TWILIGHT), fmin(high + 1e-5, 1.0), 2);
    sun_set_day(sun, settings, settings->day_of_year);
}

void sun_make(Sun *sun, const Settings *settings, int refine)
{
    *sun = (Sun){.earth_sun = 1.0};
    if (settings->sun == SUN_SEASON) {
        place_year(sun, settings);
        return;
    }
    Path path = {.global = settings->sun == SUN_GLOBAL};
    double low = 0.0;
    if (path.global) {
        place_knots(sun, &path, 0.25 * DAY_SECONDS);
    } else {
        path = place_path(settings, settings->day_of_year);
        low = place_day(sun, &path, settings->day_of_year);
        if (!sun->rises)
            return;
    }
    double high = path.global ? 1.0 : path.constant + path.swing;
    if (high - low < 1e-6)
        high = low + 1e-6; /* the sun at a pole keeps its height */
    place_nodes(sun, low, high, refine);
}

/* Slopes of the monotone cubic. */
static void slopes(int n, const double *x, const double *y, double *m)
{
    double chord[SUN_NODES];
    for (int i = 0; i + 1 < n; i++)
        chord[i] = (y[i + 1] - y[i]) / (x[i + 1] - x[i]);
    for (int i = 1; i + 1 < n; i++) {
        if (chord[i - 1] * chord[i] <= 0.0) {
            m[i] = 0.0;
            continue;
        }
        double before = x[i] - x[i - 1], after = x[i + 1] - x[i];
        double w1 = 2.0 * after + before, w2 = after + 2.0 * before;
        m[i] = (w1 + w2) / (w1 / chord[i - 1] + w2 / chord[i]);
    }
    for (int end = 0; end < 2; end++) { /* one-sided three-point formula, kept monotone */
        int i = end ? n - 1 : 0, c = end ? n - 2 : 0, d = end ? n - 3 : 1;
        double h0 = fabs(x[i] - x[end ? n - 2 : 1]), h1 = fabs(x[end ? n - 2 : 1] - x[end ? n - 3 : 2]);
        double slope = ((2.0 * h0 + h1) * chord[c] - h0 * chord[d]) / (h0 + h1);
        if (slope * chord[c] <= 0.0)
            slope = 0.0;
        else if (chord[c] * chord[d] <= 0.0 && fabs(slope) > 3.0 * fabs(chord[c]))
            slope = 3.0 * chord[c];
        m[i] = slope;
    }
}

static double cubic(const double *x, const double *y, const double *m, int i, double at)
{
    double h = x[i + 1] - x[i], t = (at - x[i]) / h, u = 1.0 - t;
    return y[i] * u * u * (1.0 + 2.0 * t) + y[i + 1] * t * t * (3.0 - 2.0 * t) +
           h * t * u * (m[i] * u - m[i + 1] * t);
}

/* For cubic at one point: gy and gm += amount times its derivatives by y and m. */
static void cubic_back(const double *x, int i, double at, double amount, double *gy, double *gm)
{
    double h = x[i + 1] - x[i], t = (at - x[i]) / h, u = 1.0 - t;
    gy[i] += amount * u * u * (1.0 + 2.0 * t);
    gy[i + 1] += amount * t * t * (3.0 - 2.0 * t);
    gm[i] += amount * h * t * u * u;
    gm[i + 1] -= amount * h * t * t * u;
}

/* For slopes: gy += gm times their derivatives by y, each on the piece it is on. */
static void slopes_back(int n, const double *x, const double *y, const double *m, const double *gm,
                        double *gy)
{
    double chord[SUN_NODES], gc[SUN_NODES] = {0};
    for (int i = 0; i + 1 < n; i++)
        chord[i] = (y[i + 1] - y[i]) / (x[i + 1] - x[i]);
    for (int i = 1; i + 1 < n; i++) {
        if (chord[i - 1] * chord[i] <= 0.0)
            continue;
        double before = x[i] - x[i - 1], after = x[i + 1] - x[i];
        double w1 = 2.0 * after + before, w2 = after + 2.0 * before, part = gm[i] * m[i] * m[i] / (w1 + w2);
        gc[i - 1] += part * w1 / (chord[i - 1] * chord[i - 1]);
        gc[i] += part * w2 / (chord[i] * chord[i]);
    }
    for (int end = 0; end < 2; end++) {
        int i = end ? n - 1 : 0, c = end ? n - 2 : 0, d = end ? n - 3 : 1;
        double h0 = fabs(x[i] - x[end ? n - 2 : 1]), h1 = fabs(x[end ? n - 2 : 1] - x[end ? n - 3 : 2]);
        double plain = ((2.0 * h0 + h1) * chord[c] - h0 * chord[d]) / (h0 + h1);
        if (plain * chord[c] <= 0.0)
            continue;
        if (chord[c] * chord[d] <= 0.0 && fabs(plain) > 3.0 * fabs(chord[c])) {
            gc[c] += 3.0 * gm[i];
        } else {
            gc[c] += gm[i] * (2.0 * h0 + h1) / (h0 + h1);
            gc[d] -= gm[i] * h0 / (h0 + h1);
        }
    }
    for (int i = 0; i + 1 < n; i++) {
        gy[i + 1] += gc[i] / (x[i + 1] - x[i]);
        gy[i] -= gc[i] / (x[i + 1] - x[i]);
    }
}

/* A rate below this dissociates nothing within the age of the Earth; it only keeps the logarithm finite. */
static const double TINY = 1e-60;

double sun_spread(const Sun *sun, const double *table, int node_stride, double *knot, int knot_stride)
{
    double y[SUN_NODES], m[SUN_NODES];
    int n = sun->rises ? sun->nodes : 0, at = 0, lit = 0;
    for (int i = 0; i < n; i++) {
        double value = table[(size_t)i * (size_t)node_stride];
        lit |= value > 0.0;
        y[i] = log(value + TINY);
    }
    if (!lit) {
        for (int i = 0; i < SUN_KNOTS; i++)
            knot[(size_t)i * (size_t)knot_stride] = 0.0;
        return 0.0;
    }
    slopes(n, sun->cosine, y, m);
    double exact = 0.0, straight = 0.0, last = 0.0;
    for (int i = 0; i < SUN_KNOTS; i++) {
        if (i) {
            double middle = sun->middle[i - 1];
            while (at + 2 < n && sun->cosine[at + 1] < middle)
                at++;
            middle = exp(cubic(sun->cosine, y, m, at, middle));
            exact += middle * (4.0 / 6.0) * (sun->time[i] - sun->time[i - 1]);
        }
        while (at + 2 < n && sun->cosine[at + 1] < sun->knot[i])
            at++;
        double value = exp(cubic(sun->cosine, y, m, at, sun->knot[i]));
        if (i) {
            double length = sun->time[i] - sun->time[i - 1];
            exact += (last + value) / 6.0 * length;
            straight += 0.5 * (last + value) * length;
        }
        knot[(size_t)i * (size_t)knot_stride] = last = value;
    }
    double scale = straight > 0.0 ? exact / straight : 1.0;
    for (int i = 0; i < SUN_KNOTS; i++)
        knot[(size_t)i * (size_t)knot_stride] *= scale;
    return 2.0 * exact / DAY_SECONDS;
}

void sun_gradient(const Sun *sun, const double *table, int node_stride, double *gradient, int gradient_stride)
{
    double y[SUN_NODES], m[SUN_NODES], gy[SUN_NODES] = {0}, gm[SUN_NODES] = {0};
    int n = sun->rises ? sun->nodes : 0, at = 0;
    for (int i = 0; i < sun->nodes; i++)
        gradient[(size_t)i * (size_t)gradient_stride] = 0.0;
    if (!n)
        return;
    for (int i = 0; i < n; i++)
        y[i] = log(table[(size_t)i * (size_t)node_stride] + TINY);
    slopes(n, sun->cosine, y, m);
    for (int i = 0; i < SUN_KNOTS; i++) { /* Simpson's rule, as in sun_spread */
        double before = i ? sun->time[i] - sun->time[i - 1] : 0.0;
        double after = i + 1 < SUN_KNOTS ? sun->time[i + 1] - sun->time[i] : 0.0;
        if (i) {
            while (at + 2 < n && sun->cosine[at + 1] < sun->middle[i - 1])
                at++;
            double rate = exp(cubic(sun->cosine, y, m, at, sun->middle[i - 1]));
            cubic_back(sun->cosine, at, sun->middle[i - 1], rate * before * (4.0 / 6.0), gy, gm);
        }
        while (at + 2 < n && sun->cosine[at + 1] < sun->knot[i])
            at++;
        double rate = exp(cubic(sun->cosine, y, m, at, sun->knot[i]));
        cubic_back(sun->cosine, at, sun->knot[i], rate * (before + after) / 6.0, gy, gm);
    }
    slopes_back(n, sun->cosine, y, m, gm, gy);
    for (int i = 0; i < n; i++)
        gradient[(size_t)i * (size_t)gradient_stride] =
            gy[i] * 2.0 / DAY_SECONDS / (table[(size_t)i * (size_t)node_stride] + TINY);
}
