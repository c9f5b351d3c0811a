/* erythema: see erythema.h. */
#include "erythema.h"

#include <math.h>

/* weight = 10^(slope (origin - w)) from the end of the piece before to `to`. */
static const struct {
    double from, to, slope, origin;
} pieces[] = {{250, 298, 0, 0}, {298, 328, 0.094, 298}, {328, 400, 0.015, 140}};

enum { PIECES = sizeof pieces / sizeof pieces[0] };

double erythema_weight(double nm)
{
    if (nm < pieces[0].from)
        return 0;
    for (int i = 0; i < PIECES; i++)
        if (nm <= pieces[i].to)
            return pow(10, pieces[i].slope * (pieces[i].origin - nm));
    return 0;
}

double erythema_mean(double lower, double upper)
{
    double sum = 0;
    for (int i = 0; i < PIECES; i++) {
        double a = fmax(lower, pieces[i].from), b = fmin(upper, pieces[i].to), s = pieces[i].slope * log(10);
        if (a >= b)
            continue;
        sum += s > 0 ? exp(s * (pieces[i].origin - a)) * -expm1(-s * (b - a)) / s : b - a;
    }
    return sum / (upper - lower);
}
