/* series_read: time and series out of a file; contract in series.h. */
#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include <netcdf.h>

#include "calendar.h"
#include "series.h"

/* ---- pieces of a file ---- */

int series_text(int file, int variable, const char *name, char *text, size_t size)
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
        int fits = given && strlen(given) < size;
        if (fits)
            strcpy(text, given);
        nc_free_string(1, &given);
        return fits;
    }
    if (type != NC_CHAR || length >= size || nc_get_att_text(file, variable, name, text) != NC_NOERR)
        return 0;
    text[length] = '\0';
    return 1;
}

/* A global attribute of any length; "" when there is none. Owner: caller. */
static char *global_text(int file, const char *name)
{
    nc_type type;
    size_t length = 0;
    char *given = NULL;
    if (nc_inq_att(file, NC_GLOBAL, name, &type, &length) == NC_NOERR && type == NC_STRING &&
        nc_get_att_string(file, NC_GLOBAL, name, &given) == NC_NOERR) {
        length = given ? strlen(given) : 0;
        nc_free_string(1, &given);
    }
    char *text = calloc(length + 1, 1);
    if (text)
        series_text(file, NC_GLOBAL, name, text, length + 1);
    return text;
}

int series_variable(int file, const char *name, int count, double *values)
{
    int variable, dimensions, dimension[NC_MAX_VAR_DIMS];
    size_t size = 1;
    if (nc_inq_varid(file, name, &variable) != NC_NOERR ||
        nc_inq_var(file, variable, NULL, NULL, &dimensions, dimension, NULL) != NC_NOERR)
        return -1;
    for (int d = 0; d < dimensions; d++) {
        size_t length = 0;
        nc_inq_dimlen(file, dimension[d], &length);
        size *= length;
    }
    return size == (size_t)count && nc_get_var_double(file, variable, values) == NC_NOERR ? 0 : -1;
}

/* A variable that must be there, with one value per record. */
static int read_needed(int file, const char *path, const char *name, size_t records, double *values,
                       int *variable, Fault *fault)
{
    int dimensions, dimension[NC_MAX_VAR_DIMS];
    size_t size = 1;
    if (nc_inq_varid(file, name, variable) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s has no variable %s: is it a Skymend file?", path, name);
    int status = nc_inq_var(file, *variable, NULL, NULL, &dimensions, dimension, NULL);
    for (int d = 0; d < dimensions && status == NC_NOERR; d++) {
        size_t length = 0;
        status = nc_inq_dimlen(file, dimension[d], &length);
        size *= length;
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

/* ---- time ---- */

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
    if (!series_text(file, variable, "units", text, sizeof text) ||
        sscanf(text, "%31s since %d-%d-%d%*[ T]%d:%d:%lf", unit, &year, &month, &date, &hour, &minute,
               &second) < 4 ||
        year < 1583 || month < 1 || month > 12 || date < 1 || date > 31)
        return fault_set(fault, FAULT_INPUT, "%s: time is in \"%s\"; \"days since YYYY-MM-DD\" is wanted",
                         path, text);
    if (series_text(file, variable, "calendar", calendar, sizeof calendar) &&
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

static int to_years(double *time, int count, double day, double base, const char *path, Fault *fault)
{
    for (int i = 0; i < count; i++) {
        double days = base + day * time[i];
        if (!(days >= 0.0 && days < 4e6)) /* years 1 to some 11000 */
            return fault_set(fault, FAULT_INPUT, "%s: record %d: time is %g", path, i + 1, time[i]);
        time[i] = calendar_decimal_year(days);
    }
    return 0;
}

/* Intervals that meet half-way between their middles. */
static void guess_bounds(FileSeries *series)
{
    int last = series->count - 1;
    for (int i = 0; i <= last; i++) {
        double before = i > 0 ? series->middle[i] - series->middle[i - 1] : NAN;
        double after = i < last ? series->middle[i + 1] - series->middle[i] : NAN;
        before = isnan(before) ? after : before;
        after = isnan(after) ? before : after;
        series->start[i] = series->middle[i] - (isnan(before) ? 0.0 : 0.5 * before);
        series->end[i] = series->middle[i] + (isnan(after) ? 0.0 : 0.5 * after);
    }
}

static int read_bounds(FileSeries *series, int file, int variable, double day, double base, Fault *fault)
{
    char name[NC_MAX_NAME + 1];
    if (!series_text(file, variable, "bounds", name, sizeof name)) {
        guess_bounds(series);
        return 0;
    }
    double *pair = malloc(2 * (size_t)series->count * sizeof *pair);
    if (!pair)
        return fault_memory(fault, "the bounds of time");
    if (series_variable(file, name, 2 * series->count, pair)) {
        fault_set(fault, FAULT_INPUT, "%s: the bounds of time, %s, are not there or not two for each time",
                  series->path, name);
    } else if (!to_years(pair, 2 * series->count, day, base, series->path, fault)) {
        for (int i = 0; i < series->count; i++) {
            series->start[i] = pair[2 * i];
            series->end[i] = pair[2 * i + 1];
        }
    }
    free(pair);
    return fault->code;
}

static int check_time(const FileSeries *series, Fault *fault)
{
    for (int i = 1; i < series->count; i++)
        if (!(series->middle[i] > series->middle[i - 1]))
            return fault_set(fault, FAULT_INPUT, "%s: record %d: time does not increase", series->path,
                             i + 1);
    for (int i = 0; i < series->count; i++) {
        if (!(series->start[i] <= series->middle[i] && series->middle[i] <= series->end[i]))
            return fault_set(fault, FAULT_INPUT, "%s: record %d: time %.4f is not within its bounds",
                             series->path, i + 1, series->middle[i]);
        if (i > 0 && series->start[i] < series->end[i - 1] - 1e-6)
            return fault_set(fault, FAULT_INPUT, "%s: record %d begins before the one before it has ended",
                             series->path, i + 1);
    }
    return 0;
}

static int read_time(FileSeries *series, int file, Fault *fault)
{
    int variable;
    double day = 0.0, base = 0.0;
    if (read_needed(file, series->path, "time", (size_t)series->count, series->middle, &variable, fault) ||
        read_clock(file, variable, series->path, &day, &base, fault) ||
        to_years(series->middle, series->count, day, base, series->path, fault) ||
        read_bounds(series, file, variable, day, base, fault))
        return fault->code;
    return check_time(series, fault);
}

/* ---- series ---- */

static int read_column(FileSeries *series, int file, Fault *fault)
{
    int variable;
    double *column = series->value[SERIES_COLUMN] = malloc((size_t)series->count * sizeof *column);
    char *unit = series->unit[SERIES_COLUMN];
    if (!column)
        return fault_memory(fault, "the column series");
    if (read_needed(file, series->path, "ozone_column", (size_t)series->count, column, &variable, fault))
        return fault->code;
    if (!series_text(file, variable, "units", unit, sizeof series->unit[0]) || strcmp(unit, "DU") != 0)
        return fault_set(fault, FAULT_INPUT, "%s: ozone_column is in \"%s\"; DU is wanted", series->path,
                         unit);
    for (int i = 0; i < series->count; i++) /* the upper bound also catches the fill value of a record that
                                               was never written */
        if (!(column[i] > 0.0 && column[i] < 1e5))
            return fault_set(fault, FAULT_INPUT, "%s: record %d: ozone_column is %g DU", series->path, i + 1,
                             column[i]);
    return 0;
}

/* A series that a file may hold or not. Where records lack it the whole is left out: a gap would pass for a
 * change. */
static int read_other(FileSeries *series, int file, int kind, Fault *fault)
{
    const char *name = series_facts(kind)->variable;
    int variable;
    double *value = malloc((size_t)series->count * sizeof *value);
    if (!value)
        return fault_memory(fault, name);
    if (nc_inq_varid(file, name, &variable) != NC_NOERR ||
        series_variable(file, name, series->count, value)) {
        snprintf(series->missing[kind], sizeof series->missing[kind], "not in the file");
        free(value);
        return 0;
    }
    for (int i = 0; i < series->count; i++)
        if (!(fabs(value[i]) < 1e30)) {
            snprintf(series->missing[kind], sizeof series->missing[kind], "record %d of the file lacks %s",
                     i + 1, name);
            free(value);
            return 0;
        }
    series_text(file, variable, "units", series->unit[kind], sizeof series->unit[kind]);
    series->value[kind] = value;
    return 0;
}

static int read_open(FileSeries *series, int file, const double *limit_km, Fault *fault)
{
    int dimension;
    size_t records;
    if (nc_inq_dimid(file, "time", &dimension) != NC_NOERR ||
        nc_inq_dimlen(file, dimension, &records) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s has no dimension time: is it a Skymend file?", series->path);
    if (records < 1)
        return fault_set(fault, FAULT_INPUT,
                         "%s holds no finished interval, so there is nothing to answer from", series->path);
    if (records > 100000000)
        return fault_set(fault, FAULT_INPUT, "%s holds %zu records", series->path, records);
    series->start = malloc(records * sizeof *series->start);
    series->middle = malloc(records * sizeof *series->middle);
    series->end = malloc(records * sizeof *series->end);
    series->title = global_text(file, "title");
    series->resolved_case = global_text(file, "resolved_case");
    if (!series->start || !series->middle || !series->end || !series->title || !series->resolved_case)
        return fault_memory(fault, "the series of a file");
    series->count = (int)records;
    if (read_column(series, file, fault) || read_time(series, file, fault) ||
        series_read_parts(series, file, limit_km, fault))
        return fault->code;
    for (int kind = SERIES_UV; kind < SERIES_KINDS; kind++)
        if (read_other(series, file, kind, fault))
            return fault->code;
    return series_read_emissions(series, file, fault);
}

int series_read(FileSeries *series, const char *path, const double *limit_km, Fault *fault)
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
    series->path = malloc(strlen(path) + 1);
    if (series->path) {
        strcpy(series->path, path);
        read_open(series, file, limit_km, fault);
    } else {
        fault_memory(fault, "a path");
    }
    nc_close(file);
    if (fault->code)
        series_free(series);
    return fault->code;
}

void series_free(FileSeries *series)
{
    if (!series)
        return;
    for (int kind = 0; kind < SERIES_KINDS; kind++)
        free(series->value[kind]);
    series_free_emissions(&series->emissions);
    free(series->path);
    free(series->title);
    free(series->resolved_case);
    free(series->start);
    free(series->middle);
    free(series->end);
    memset(series, 0, sizeof *series);
}
