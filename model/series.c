/* series: what can be read off a series of interval means. */
#include "series.h"

#include <math.h>

/* Of a year: what the rounding of dates to seconds leaves, with room. */
static const double SLIVER = 1e-6;

static const SeriesFacts facts[SERIES_KINDS] = {
    {"ozone_column", "ozone_column", "ozone column", 1},
    {"ozone_column_troposphere", NULL, "troposphere", 1},
    {"ozone_column_lower_stratosphere", NULL, "lower stratosphere", 1},
    {"ozone_column_middle_stratosphere", NULL, "middle stratosphere", 1},
    {"ozone_column_upper_stratosphere", NULL, "upper stratosphere and above", 1},
    {"uv_index_noon", "uv_index_noon", "noon UV index", -1},
    {"erythemal_daily_dose", "erythemal_daily_dose", "daily erythemal dose", -1},
    {"equivalent_chlorine_3yr", "equivalent_chlorine_3yr", "equivalent chlorine, 3 yr", -1},
    {"equivalent_chlorine_55yr", "equivalent_chlorine_55yr", "equivalent chlorine, 5.5 yr", -1},
};

const double series_limits[SERIES_LIMITS - 1] = {24.0, 32.0};

const SeriesFacts *series_facts(int kind)
{
    return &facts[kind];
}

Series series_view(const FileSeries *series, int kind)
{
    return (Series){series->count, series->start, series->middle, series->end, series->value[kind]};
}

/* Mean over from..to by overlap; *covered the years of it that intervals fill. */
static double mean_over(const Series *series, double from, double to, int first, double *covered)
{
    double sum = 0.0;
    *covered = 0.0;
    for (int i = first; i < series->count && series->start[i] < to; i++) {
        double overlap = fmin(series->end[i], to) - fmax(series->start[i], from);
        if (overlap <= SLIVER)
            continue;
        sum += overlap * series->value[i];
        *covered += overlap;
    }
    return *covered > 0.0 ? sum / *covered : NAN;
}

double series_year_mean(const Series *series, int year)
{
    double covered, mean = mean_over(series, year, year + 1.0, 0, &covered);
    return covered >= 0.99 ? mean : NAN;
}

Series series_smooth(const Series *series, double years, double *store)
{
    double *start = store, *middle = start + series->count, *end = middle + series->count,
           *value = end + series->count;
    int kept = 0, first = 0;
    for (int i = 0; i < series->count; i++) {
        double from = series->middle[i] - 0.5 * years, to = series->middle[i] + 0.5 * years, covered;
        while (first < i && series->end[first] <= from)
            first++;
        double mean = mean_over(series, from, to, first, &covered);
        if (covered < years - 3.0 * SLIVER)
            continue;
        start[kept] = series->start[i];
        middle[kept] = series->middle[i];
        end[kept] = series->end[i];
        value[kept++] = mean;
    }
    return (Series){kept, start, middle, end, value};
}

int series_extreme(const Series *series, int sign, double from)
{
    int found = -1;
    for (int i = 0; i < series->count; i++)
        if (series->start[i] >= from - SLIVER &&
            (found < 0 || sign * series->value[i] < sign * series->value[found]))
            found = i;
    return found;
}

double series_extreme_spread(const Series *series, int sign, int at, double margin)
{
    double far = 0.0;
    for (int i = 0; i < series->count; i++)
        if (sign * (series->value[i] - series->value[at]) <= margin)
            far = fmax(far, fabs(series->middle[i] - series->middle[at]));
    return far;
}

SeriesReturn series_return(const Series *series, int sign, int benchmark_year)
{
    SeriesReturn found = {RETURN_UNKNOWN, series_year_mean(series, benchmark_year), NAN, NAN, -1};
    if (isnan(found.value))
        return found;
    /* What was low before the benchmark year is no loss to recover from: the return is looked for after the
     * extreme that follows that year, which is the extreme itself in every ordinary projection. */
    int far = series_extreme(series, sign, benchmark_year + 1.0);
    found.state = RETURN_NEVER_AWAY;
    if (far < 0 || sign * series->value[far] >= sign * found.value)
        return found;
    found.state = RETURN_LATER;
    for (int i = far + 1; i < series->count && found.state == RETURN_LATER; i++) {
        double before = series->value[i - 1], after = series->value[i];
        if (sign * after < sign * found.value)
            continue;
        found.state = RETURN_FOUND;
        found.slope = (after - before) / (series->middle[i] - series->middle[i - 1]);
        found.year = series->middle[i - 1] + (found.value - before) / found.slope;
    }
    for (int i = 0; i < series->count && found.state == RETURN_FOUND && found.again < 0; i++)
        if (series->middle[i] > found.year && sign * series->value[i] < sign * found.value)
            found.again = i;
    return found;
}
