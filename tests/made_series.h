/* made_series: series of yearly means for the tests of series and answers. Include after scratch.h. */
#ifndef SKYMEND_TEST_MADE_SERIES_H
#define SKYMEND_TEST_MADE_SERIES_H

#include "../model/series.h"

enum { YEARS = 146, FIRST = 1955 };

typedef struct {
    double start[YEARS], middle[YEARS], end[YEARS], value[YEARS];
} Yearly;

static inline Series yearly(Yearly *years, int first, const double *value, int count)
{
    for (int i = 0; i < count; i++) {
        years->start[i] = first + i;
        years->middle[i] = first + i + 0.5;
        years->end[i] = first + i + 1.0;
        years->value[i] = value[i];
    }
    return (Series){count, years->start, years->middle, years->end, years->value};
}

/* 300 DU, down by fall a year from 1980.5 to 2000.5, then up by rise a year. */
static inline Series valley(Yearly *years, double fall, double rise)
{
    double value[YEARS];
    for (int i = 0; i < YEARS; i++)
        value[i] =
            300.0 - fall * fmin(fmax(FIRST + i - 1980, 0.0), 20.0) + rise * fmax(FIRST + i - 2000, 0.0);
    return yearly(years, FIRST, value, YEARS);
}

#endif
