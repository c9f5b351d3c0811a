/* calendar: decimal years of the model and the days of a CF time axis.
 *
 * Inside, time is decimal years, each 365.25 days long; readers of a file want dates. Year and fraction are
 * kept: 1980.25 is written as the moment a quarter of calendar year 1980 has passed (Gregorian, "standard"
 * in CF). So the record of 1980 has the bounds 1980-01-01 and 1981-01-01, and every tool shows the right
 * year; an interval's length in days follows the calendar (365 or 366 a year) instead of the model's mean.
 */
#ifndef SKYMEND_CALENDAR_H
#define SKYMEND_CALENDAR_H

#include <math.h>

#define CALENDAR_BASE_YEAR 1950
#define CALENDAR_UNITS "days since 1950-01-01 00:00:00"

static inline int calendar_leap(long year)
{
    return (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
}

/* Days from 0001-01-01 to the first day of year >= 1, proleptic Gregorian. */
static inline double calendar_year_start(long year)
{
    long before = year - 1;
    return 365.0 * (double)before + (double)(before / 4 - before / 100 + before / 400);
}

/* Days from 0001-01-01 to a date; month 1..12. */
static inline double calendar_date(long year, int month, int day)
{
    static const int passed[12] = {0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334};
    return calendar_year_start(year) + passed[month - 1] + (month > 2 && calendar_leap(year)) + day - 1;
}

/* Decimal year >= 1 to days since CALENDAR_UNITS, to the nearest second: the round-off of many added steps
 * must not show as 23:59:59.999 of the day before. */
static inline double calendar_days(double decimal_year)
{
    double year = floor(decimal_year);
    double days = calendar_year_start((long)year) - calendar_year_start(CALENDAR_BASE_YEAR) +
                  (decimal_year - year) * (calendar_leap((long)year) ? 366.0 : 365.0);
    return round(days * 86400.0) / 86400.0;
}

/* The way back: days since 0001-01-01 (>= 0) to a decimal year. */
static inline double calendar_decimal_year(double days)
{
    long year = (long)(days / 365.2425) + 1; /* right or off by one */
    while (calendar_year_start(year) > days)
        year--;
    while (calendar_year_start(year + 1) <= days)
        year++;
    return (double)year + (days - calendar_year_start(year)) / (calendar_leap(year) ? 366.0 : 365.0);
}

#endif
