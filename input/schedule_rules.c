/* schedule_rules: what a row makes of the years of a series; contract in schedule_reading.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* A remainder below this share of what stood is round-off of the decimal figures. */
static const double round_off = 1e-12;

static const char *path_of(const Reading *reading, Place place)
{
    return reading->schedule->path[place.file];
}

/* Element and measure of a line, and its height, are the same in all its rows; a change may leave the
 * height out. */
int schedule_same(const Reading *reading, Series *series, const Row *row, Fault *fault)
{
    const char *path = path_of(reading, row->place), *first = path_of(reading, series->first);
    if (row->has_unit && !series->has_measure) {
        series->has_measure = 1;
        series->share = row->share;
        strcpy(series->element, row->element);
    }
    if (row->has_unit && series->share != row->share)
        return fault_at(fault, path, row->place.line,
                        "the %s of line \"%.60s\" is a %s here and a %s at %s:%d; write one of the two",
                        schedule_kinds[row->kind], series->label, row->share ? "share" : "mass",
                        row->share ? "mass" : "share", first, series->first.line);
    if (row->has_unit && strcmp(series->element, row->element) != 0)
        return fault_at(fault, path, row->place.line,
                        "line \"%.60s\" is given as mass of %s here and of %s at %s:%d; write one of the two",
                        series->label, row->element[0] ? row->element : "the gas",
                        series->element[0] ? series->element : "the gas", first, series->first.line);
    if ((row->change == NEW || row->has_height) &&
        (series->from_km != row->from_km || series->to_km != row->to_km)) {
        char here[60] = "at the ground", there[60] = "at the ground";
        if (row->has_height)
            snprintf(here, sizeof here, "at %g to %g km", row->from_km, row->to_km);
        if (series->to_km > 0)
            snprintf(there, sizeof there, "at %g to %g km", series->from_km, series->to_km);
        return fault_at(fault, path, row->place.line,
                        "line \"%.60s\" of %s is %s here and %s at %s:%d; give each height a line of its own",
                        series->label, reading->schedule->gas[series->gas], here, there, first,
                        series->first.line);
    }
    if (row->per_km && !(series->to_km > 0))
        return fault_at(
            fault, path, row->place.line,
            "the unit is per km, but from_km and to_km are empty; fill them in, or leave /km out");
    return 0;
}

/* ---- values ---- */

/* In the unit that messages use. */
static void say(const Series *series, double value, char text[40])
{
    if (series->kind == ABUNDANCE)
        snprintf(text, 40, "%.6g ppt", value * 1e12);
    else if (series->share)
        snprintf(text, 40, "%.6g %%", value * 100);
    else
        snprintf(text, 40, "%.6g kt%s%s", value * 1e-6, series->element[0] ? " " : "", series->element);
}

static int check_value(const Reading *reading, const Series *series, const Row *row, int year, double value,
                       Fault *fault)
{
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    const char *kind = schedule_kinds[series->kind];
    if (value < 0) {
        char stands[40], taken[40];
        double was = series->cell[year - EARLIEST_YEAR].value;
        say(series, was, stands);
        say(series, was - value, taken);
        return fault_at(
            fault, path, row->place.line,
            "takes %s from the %s of %s, line \"%.60s\", which is %s in %d; take less, or replace it", taken,
            kind, gas, series->label, stands, year);
    }
    if (!isfinite(value))
        return fault_at(fault, path, row->place.line,
                        "the %s of %s, line \"%.60s\", grows beyond all bounds by %d; shorten the span", kind,
                        gas, series->label, year);
    if (series->kind == ABUNDANCE && value > 1)
        return fault_at(fault, path, row->place.line,
                        "%s comes to %.6g mol/mol in %d, more than the air itself; check amount and unit",
                        gas, value, year);
    if (series->share && value > 1)
        return fault_at(
            fault, path, row->place.line,
            "the %s of %s, line \"%.60s\", comes to %.6g %% of the stock in %d; at most 100 %% can "
            "leave it",
            kind, gas, series->label, 100 * value, year);
    return 0;
}

/* What row makes of year. before: value of the year before its span, for the rules. */
static double value_of(const Series *series, const Row *row, int year, double before)
{
    double amount = row->per_km ? row->amount * (series->to_km - series->from_km) : row->amount;
    double was = series->cell[year - EARLIEST_YEAR].value;
    int step = year - row->first_year + 1, steps = row->last_year - row->first_year + 1;
    if (row->change == SCALE)
        return was * row->amount;
    if (row->change == ADD)
        return fabs(was + amount) <= round_off * was ? 0 : was + amount;
    switch (row->rule) {
    case HOLD: return before;
    case LINEAR: return step == steps ? amount : before + (amount - before) * step / steps;
    case GROWTH: return before * pow(1 + row->amount, step);
    default: return amount;
    }
}

static int twice(const Reading *reading, const Series *series, const Row *row, int year, Fault *fault)
{
    Place other = series->cell[year - EARLIEST_YEAR].last;
    int first = other.line < row->place.line ? other.line : row->place.line;
    int second = other.line < row->place.line ? row->place.line : other.line;
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    if (series->kind == ABUNDANCE)
        return fault_at(fault, path, second, "%s has year %d twice, first on line %d; keep one", gas, year,
                        first);
    return fault_at(fault, path, second,
                    "%s, %s of line \"%.60s\", has year %d twice, first on line %d; keep one, or put the "
                    "second into a file of its own",
                    gas, schedule_kinds[series->kind], series->label, year, first);
}

int schedule_rule(const Reading *reading, Series *series, const Row *row, int star, int *hits, Fault *fault)
{
    const char *path = path_of(reading, row->place), *gas = reading->schedule->gas[series->gas];
    double before = 0;
    if (schedule_same(reading, series, row, fault))
        return fault->code;
    if (row->rule != NUMBER) {
        int year = row->first_year - 1;
        if (year < EARLIEST_YEAR || !series->cell[year - EARLIEST_YEAR].stands)
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has no value in %d for the rule to start from; give "
                            "that year a number",
                            gas, schedule_kinds[series->kind], series->label, year);
        before = series->cell[year - EARLIEST_YEAR].value;
    }
    for (int year = row->first_year; year <= row->last_year; year++) {
        Cell *cell = &series->cell[year - EARLIEST_YEAR];
        if (!cell->stands && row->change != NEW) {
            if (star)
                continue;
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has no value in %d to change; shorten the span, or "
                            "leave change empty to add years",
                            gas, schedule_kinds[series->kind], series->label, year);
        }
        if (cell->stands && cell->last.file == row->place.file)
            return twice(reading, series, row, year, fault);
        if (cell->stands && row->change == NEW)
            return fault_at(fault, path, row->place.line,
                            "%s, %s of line \"%.60s\", has a value in %d already, from %s:%d; write replace, "
                            "add or scale under change, or another line",
                            gas, schedule_kinds[series->kind], series->label, year,
                            path_of(reading, cell->last), cell->last.line);
        double value = value_of(series, row, year, before);
        if (check_value(reading, series, row, year, value, fault))
            return fault->code;
        if (!cell->stands)
            cell->made = row->place;
        cell->value = value;
        cell->stands = 1;
        cell->last = row->place;
        if (strcmp(row->gas, "*") != 0)
            cell->given = row->place;
        ++*hits;
    }
    return 0;
}
