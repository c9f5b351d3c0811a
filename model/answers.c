/* answers: see answers.h.
 *
 * Works on the series of interval means alone, so that a file gives the same answers when it is finished,
 * read back later, or cut and joined with other tools.
 */
#include "answers.h"

#include <errno.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include <netcdf.h>

#include "calendar.h"

enum { DECADE = 10, SHORT_FILE = 15 /* years */ };

/* ---- reading ---- */

static int read_text(int file, int variable, const char *name, char *text, size_t size)
{
    nc_type type;
    size_t length;
    char *given = NULL;
    text[0] = '\0';
    if (nc_inq_att(file, variable, name, &type, &length) != NC_NOERR)
        return 0;
    if (type == NC_STRING && length == 1) { /* as xarray and others write it */
        if (nc_get_att_string(file, variable, name, &given) != NC_NOERR)
            return 0;
        snprintf(text, size, "%s", given ? given : "");
        nc_free_string(1, &given);
        return 1;
    }
    if (type != NC_CHAR || length >= size || nc_get_att_text(file, variable, name, text) != NC_NOERR)
        return 0;
    text[length] = '\0';
    return 1;
}

/* A variable with one value per record; dimensions of length 1, which tools like to add, do not matter. */
static int read_series(int file, const char *path, const char *name, size_t records, double *values,
                       int *variable, Fault *fault)
{
    int dimensions, dimension[NC_MAX_VAR_DIMS];
    size_t size = 1;
    if (nc_inq_varid(file, name, variable) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s has no variable %s: is it a Skymend file?", path, name);
    int status = nc_inq_var(file, *variable, NULL, NULL, &dimensions, dimension, NULL);
    for (int d = 0; d < dimensions && status == NC_NOERR; d++) {
        size_t length;
        status = nc_inq_dimlen(file, dimension[d], &length);
        size *= status == NC_NOERR ? length : 1;
    }
    if (status == NC_NOERR && size != records)
        return fault_set(fault, FAULT_INPUT, "%s: %s has %zu values for %zu times", path, name, size,
                         records);
    if (status == NC_NOERR)
        status = nc_get_var_double(file, *variable, values);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s: cannot read %s: %s", path, name, nc_strerror(status));
    return 0;
}

/* How a time axis counts: value * day + base = days since 0001-01-01. */
static int read_clock(int file, int variable, const char *path, double *day, double *base, Fault *fault)
{
    static const struct {
        const char *name;
        double day;
    } units[] = {{"days", 1.0},
                 {"day", 1.0},
                 {"hours", 1.0 / 24.0},
                 {"hour", 1.0 / 24.0},
                 {"minutes", 1.0 / 1440.0},
                 {"minute", 1.0 / 1440.0},
                 {"seconds", 1.0 / 86400.0},
                 {"second", 1.0 / 86400.0}};
    char text[128], unit[32], calendar[64];
    int year, month, date, hour = 0, minute = 0;
    double second = 0.0;
    if (!read_text(file, variable, "units", text, sizeof text) ||
        sscanf(text, "%31s since %d-%d-%d%*[ T]%d:%d:%lf", unit, &year, &month, &date, &hour, &minute,
               &second) < 4 ||
        year < 1583 || month < 1 || month > 12 || date < 1 || date > 31)
        return fault_set(fault, FAULT_INPUT, "%s: time is in \"%s\"; \"days since YYYY-MM-DD\" is wanted",
                         path, text);
    if (read_text(file, variable, "calendar", calendar, sizeof calendar) &&
        strcmp(calendar, "standard") != 0 && strcmp(calendar, "gregorian") != 0 &&
        strcmp(calendar, "proleptic_gregorian") != 0)
        return fault_set(fault, FAULT_INPUT, "%s: time is in the calendar \"%s\"; \"standard\" is wanted",
                         path, calendar);
    *base = calendar_date(year, month, date) + (hour * 3600.0 + minute * 60.0 + second) / 86400.0;
    for (size_t u = 0; u < sizeof units / sizeof *units; u++)
        if (strcmp(units[u].name, unit) == 0) {
            *day = units[u].day;
            return 0;
        }
    return fault_set(fault, FAULT_INPUT, "%s: time is in \"%s\"; days, hours, minutes or seconds are wanted",
                     path, text);
}

static int check_series(const ColumnSeries *series, const char *path, Fault *fault)
{
    for (int i = 0; i < series->count; i++) {
        /* The upper bound also catches the fill value of a record that was never written. */
        if (!(series->column[i] > 0.0 && series->column[i] < 1e5))
            return fault_set(fault, FAULT_INPUT, "%s: record %d: ozone_column is %g DU", path, i + 1,
                             series->column[i]);
        if (i > 0 && !(series->time[i] > series->time[i - 1]))
            return fault_set(fault, FAULT_INPUT, "%s: record %d: time does not increase", path, i + 1);
    }
    return 0;
}

static int read_open(ColumnSeries *series, int file, const char *path, Fault *fault)
{
    int dimension, variable;
    size_t records;
    double day = 0.0, base = 0.0;
    char units[32];
    if (nc_inq_dimid(file, "time", &dimension) != NC_NOERR ||
        nc_inq_dimlen(file, dimension, &records) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s has no dimension time: is it a Skymend file?", path);
    if (records < 1 || records > 100000000)
        return fault_set(fault, FAULT_INPUT, "%s holds %zu records", path, records);
    series->time = malloc(records * sizeof *series->time);
    series->column = malloc(records * sizeof *series->column);
    if (!series->time || !series->column)
        return fault_memory(fault, "the column series");
    series->count = (int)records;
    if (read_series(file, path, "ozone_column", records, series->column, &variable, fault))
        return fault->code;
    if (!read_text(file, variable, "units", units, sizeof units) || strcmp(units, "DU") != 0)
        return fault_set(fault, FAULT_INPUT, "%s: ozone_column is in \"%s\"; DU is wanted", path, units);
    if (read_series(file, path, "time", records, series->time, &variable, fault) ||
        read_clock(file, variable, path, &day, &base, fault))
        return fault->code;
    for (int i = 0; i < series->count; i++) {
        double days = base + day * series->time[i];
        if (!(days >= 0.0 && days < 4e6)) /* years 1 to some 11000 */
            return fault_set(fault, FAULT_INPUT, "%s: record %d: time is %g", path, i + 1, series->time[i]);
        series->time[i] = calendar_decimal_year(days);
    }
    return check_series(series, path, fault);
}

int series_read(ColumnSeries *series, const char *path, Fault *fault)
{
    struct stat found;
    int file;
    memset(series, 0, sizeof *series);
    if (stat(path, &found))
        return fault_set(fault, FAULT_INPUT, "%s: cannot be opened: %s; give a file made by skymend project",
                         path, strerror(errno));
    if (!S_ISREG(found.st_mode))
        return fault_set(fault, FAULT_INPUT, "%s is not a file", path);
    int status = nc_open(path, NC_NOWRITE, &file);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT,
                         "%s cannot be read as NetCDF (%s); give a file made by skymend project", path,
                         nc_strerror(status));
    int code = read_open(series, file, path, fault);
    nc_close(file);
    if (code)
        series_free(series);
    return code;
}

void series_free(ColumnSeries *series)
{
    if (!series)
        return;
    free(series->time);
    free(series->column);
    memset(series, 0, sizeof *series);
}

/* ---- computing ---- */

/* Mean of the intervals whose middle lies in a calendar year; 1 if they fill it. An interval is taken to be
 * as long as the smallest step to a neighbour: a file that breaks off in June has no mean of that year. */
static int year_mean(const ColumnSeries *series, int year, double *mean)
{
    double sum = 0.0, length = INFINITY;
    int inside = 0;
    for (int i = 0; i < series->count; i++) {
        if (floor(series->time[i]) != year)
            continue;
        sum += series->column[i];
        inside++;
        if (i > 0)
            length = fmin(length, series->time[i] - series->time[i - 1]);
        if (i + 1 < series->count)
            length = fmin(length, series->time[i + 1] - series->time[i]);
    }
    if (inside == 0 || inside * length < 0.99)
        return 0;
    *mean = sum / inside;
    return 1;
}

/* Lowest interval at or after `from`; -1 when there is none. */
static int lowest(const ColumnSeries *series, double from)
{
    int found = -1;
    for (int i = 0; i < series->count; i++)
        if (series->time[i] >= from && (found < 0 || series->column[i] < series->column[found]))
            found = i;
    return found;
}

/* The interval before which the column crosses value upward, looking from interval `from` on; -1 if never. */
static int crossing(const ColumnSeries *series, int from, double value)
{
    for (int i = from + 1; i < series->count; i++)
        if (series->column[i - 1] < value && series->column[i] >= value)
            return i;
    return -1;
}

int answers_compute(Answers *answers, const ColumnSeries *series, int benchmark_year, Fault *fault)
{
    memset(answers, 0, sizeof *answers);
    answers->benchmark_year = benchmark_year;
    answers->benchmark = answers->return_year = answers->minimum = answers->minimum_year = NAN;
    answers->returns = -1;
    if (series->count < 1)
        return fault_set(fault, FAULT_INPUT,
                         "the file holds no finished interval, so there is nothing to answer from");
    int low = lowest(series, -INFINITY);
    answers->has_minimum = 1;
    answers->minimum_year = series->time[low];
    answers->minimum = series->column[low];
    if (!year_mean(series, benchmark_year, &answers->benchmark)) {
        answers->benchmark = NAN;
        return 0;
    }
    /* What was low before the benchmark year is no loss to recover from: the return is looked for after the
     * lowest interval that follows that year, which is the minimum itself in every ordinary projection. */
    int dip = lowest(series, benchmark_year + 1.0);
    if (dip < 0 || series->column[dip] >= answers->benchmark)
        return 0;
    int up = crossing(series, dip, answers->benchmark);
    answers->returns = up > 0;
    if (up > 0) {
        double below = series->column[up - 1], above = series->column[up];
        double share = (answers->benchmark - below) / (above - below);
        answers->return_year = series->time[up - 1] + share * (series->time[up] - series->time[up - 1]);
    }
    return 0;
}

/* ---- printing ---- */

static void print_row(const Answers *answers, int year, double column, FILE *out)
{
    fprintf(out, "  %4d    %8.2f", year, column);
    if (isfinite(answers->benchmark))
        fprintf(out, "  %+8.2f  %+8.2f", column - answers->benchmark,
                100.0 * (column - answers->benchmark) / answers->benchmark);
    else
        fprintf(out, "  %8s  %8s", "-", "-");
    fprintf(out, "%s\n", year == (int)answers->benchmark_year ? "  benchmark" : "");
}

static void print_decades(const Answers *answers, const ColumnSeries *series, FILE *out)
{
    int first = (int)floor(series->time[0]), last = (int)floor(series->time[series->count - 1]);
    double column;
    fprintf(out, "  year   column/DU  change/DU  change/%%\n");
    int every = last - first < SHORT_FILE ? 1 : DECADE; /* a short file may hold no decade at all */
    for (int year = first; year <= last; year++)
        if ((year % every == 0 || year == first || year == last || year == (int)answers->benchmark_year) &&
            year_mean(series, year, &column))
            print_row(answers, year, column, out);
}

static void print_return(const Answers *answers, const ColumnSeries *series, FILE *out)
{
    int benchmark = (int)answers->benchmark_year;
    if (!isfinite(answers->benchmark)) {
        fprintf(out, "return to %d     not known: the file does not cover the whole of %d\n", benchmark,
                benchmark);
    } else if (answers->returns < 0) {
        fprintf(out, "return to %d     no return to speak of: the column is never below %.2f DU after %d\n",
                benchmark, answers->benchmark, benchmark);
    } else if (answers->returns == 0) {
        fprintf(out, "return to %d     not by the end of the file (%.2f): still %.2f DU below\n", benchmark,
                series->time[series->count - 1], answers->benchmark - series->column[series->count - 1]);
    } else {
        fprintf(out, "return to %d     %.1f (to %.2f DU, linear between intervals)\n", benchmark,
                answers->return_year, answers->benchmark);
        for (int i = 0; i < series->count; i++)
            if (series->time[i] > answers->return_year && series->column[i] < answers->benchmark) {
                fprintf(out, "                   but below it again in %.2f (%.2f DU)\n", series->time[i],
                        series->column[i]);
                break;
            }
    }
}

void answers_print(const Answers *answers, const ColumnSeries *series, FILE *out)
{
    if (!answers->has_minimum || series->count < 1) {
        fprintf(out, "no finished interval: no answers\n");
        return;
    }
    fprintf(out, "Ozone column, near-global mean\n\n");
    fprintf(out, "lowest interval    %.2f DU in %.2f\n", answers->minimum, answers->minimum_year);
    print_return(answers, series, out);
    fprintf(out, "\nmeans of calendar years; change is against %d\n", (int)answers->benchmark_year);
    print_decades(answers, series, out);
    fprintf(out,
            "\nCaution: one near-global column, without polar winter, ozone hole, change of circulation, or\n"
            "temperature that answers to ozone; a planning figure. Health and regulatory decisions defer to\n"
            "the competent authority and its methods.\n");
}
