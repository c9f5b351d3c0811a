/* profiles: reading and interpolation. */
#include "profiles.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "../input/table.h"

/* Rows first .. end - 1 of the table are one profile. */
typedef struct {
    const Table *table;
    const double *altitude;
    size_t first, end;
} Profile;

static int check_profile(const Profile *profile, const char *what, double from_km, double to_km, Fault *fault)
{
    const Table *table = profile->table;
    for (size_t r = profile->first + 1; r < profile->end; r++)
        if (!(profile->altitude[r] > profile->altitude[r - 1]))
            return fault_at(fault, table->path, table->line[r],
                            "altitude_km is %g after %g; it must increase within a profile",
                            profile->altitude[r], profile->altitude[r - 1]);
    double low = profile->altitude[profile->first], high = profile->altitude[profile->end - 1];
    if (low > from_km || high < to_km * (1.0 - 1e-9))
        return fault_at(fault, table->path, table->line[profile->end - 1],
                        "this profile of %s covers %g to %g km, but 0 to %g km is needed; add rows", what,
                        low, high, to_km);
    return 0;
}

/* Where each profile begins: start[0 .. times], start[times] = rows. */
static int split(const Table *table, const double *time, const char *time_name, size_t *start, int *times,
                 Fault *fault)
{
    *times = 0;
    for (size_t r = 0; r < table->rows; r++) {
        if (time && r && time[r] < time[r - 1])
            return fault_at(fault, table->path, table->line[r],
                            "%s is %g after %g; keep the rows of one %s together and in order", time_name,
                            time[r], time[r - 1], time_name);
        if (r == 0 || (time && time[r] > time[r - 1]))
            start[(*times)++] = r;
    }
    start[*times] = table->rows;
    return 0;
}

static int check_months(const Table *table, const double *month, const size_t *start, int times, Fault *fault)
{
    for (int t = 0; t < times; t++)
        if (month[start[t]] != t + 1)
            return fault_at(fault, table->path, table->line[start[t]],
                            "month is %g where month %d is due; give the months 1 to 12, each once, in order",
                            month[start[t]], t + 1);
    if (times != PROFILES_MONTHS)
        return fault_at(fault, table->path, table->line[table->rows - 1],
                        "the table ends with month %d; give the months 1 to 12", times);
    return 0;
}

static int fill(Profiles *profiles, const Table *table, const char *what, const size_t *start,
                const ProfilesColumn *column, const Grid *grid, double to_km, Fault *fault)
{
    size_t index = 0, padded = (size_t)grid->padded;
    int code = table_column(table, "altitude_km", &index, fault);
    if (code)
        return code;
    Profile profile = {.table = table, .altitude = table_values(table, index)};
    for (int t = 0; t < profiles->times; t++) {
        profile.first = start[t];
        profile.end = start[t + 1];
        code = check_profile(&profile, what, 1e-5 * grid->middle[0], to_km, fault);
        if (code)
            return code;
    }
    for (int c = 0; c < profiles->columns; c++) {
        code = table_column(table, column[c].name, &index, fault);
        if (!code)
            code = table_require_range(table, index, column[c].low, column[c].high, fault);
        if (code)
            return code;
        const double *value = table_values(table, index);
        for (int t = 0; t < profiles->times; t++)
            for (size_t l = 0; l < padded; l++) {
                size_t first = start[t], count = start[t + 1] - first;
                double km = 1e-5 * grid->middle[l];
                profiles->value[((size_t)c * (size_t)profiles->times + (size_t)t) * padded + l] =
                    column[c].logarithmic
                        ? table_loglinear(profile.altitude + first, value + first, count, km)
                        : table_linear(profile.altitude + first, value + first, count, km);
            }
    }
    return 0;
}

int profiles_read(Profiles *profiles, const char *what, const char *path, const char *time_name,
                  const ProfilesColumn *column, int columns, const Grid *grid, double to_km, Fault *fault)
{
    memset(profiles, 0, sizeof *profiles);
    Table table = {0};
    size_t index, *start = NULL;
    const double *time = NULL;
    int code = table_read(&table, path, fault);
    if (!code && table.rows == 0)
        code = fault_at(fault, path, table.name_line, "no rows follow the column names; add them");
    if (!code && time_name)
        code = table_column(&table, time_name, &index, fault);
    if (!code && time_name)
        time = table_values(&table, index);
    if (!code && !(start = malloc((table.rows + 1) * sizeof *start)))
        code = fault_memory(fault, what);
    if (!code)
        code = split(&table, time, time_name, start, &profiles->times, fault);
    if (!code && time_name && !strcmp(time_name, "month"))
        code = check_months(&table, time, start, profiles->times, fault);
    if (!code) {
        size_t times = (size_t)profiles->times;
        profiles->columns = columns;
        profiles->padded = grid->padded;
        profiles->time = calloc(times, sizeof(double));
        profiles->value = calloc((size_t)columns * times * (size_t)grid->padded, sizeof(double));
        if (!profiles->time || !profiles->value)
            code = fault_memory(fault, what);
        for (size_t t = 0; !code && time && t < times; t++)
            profiles->time[t] = time[start[t]];
    }
    if (!code)
        code = fill(profiles, &table, what, start, column, grid, to_km, fault);
    if (!code) {
        snprintf(profiles->path, sizeof profiles->path, "%s", path);
        if (!table_header(&table, "source", profiles->source, sizeof profiles->source))
            snprintf(profiles->source, sizeof profiles->source, "%.590s", path);
        profiles->last_line = table.line[table.rows - 1];
    }
    free(start);
    table_free(&table);
    if (code)
        profiles_free(profiles);
    return code;
}

void profiles_free(Profiles *profiles)
{
    if (!profiles)
        return;
    free(profiles->time);
    free(profiles->value);
    memset(profiles, 0, sizeof *profiles);
}

int profiles_covers(const Profiles *profiles, const char *what, double first, double last, Fault *fault)
{
    double start = profiles->time[0], end = profiles->time[profiles->times - 1];
    if (start <= first && end >= last)
        return 0;
    return fault_at(
        fault, profiles->path, profiles->last_line,
        "%s covers the years %g to %g, but %g to %g is needed; add rows or change years.first and "
        "years.last",
        what, start, end, first, last);
}

/* ---- use ---- */

static const double *row(const Profiles *profiles, int column, int time)
{
    return profiles->value +
           ((size_t)column * (size_t)profiles->times + (size_t)time) * (size_t)profiles->padded;
}

void profiles_at(const Profiles *profiles, int column, double time, double *out)
{
    int i = 0;
    while (i + 2 < profiles->times && profiles->time[i + 1] <= time)
        i++;
    const double *before = row(profiles, column, i);
    if (profiles->times == 1) {
        memcpy(out, before, (size_t)profiles->padded * sizeof(double));
        return;
    }
    const double *after = row(profiles, column, i + 1);
    double part = (time - profiles->time[i]) / (profiles->time[i + 1] - profiles->time[i]);
    for (int l = 0; l < profiles->padded; l++)
        out[l] = before[l] + part * (after[l] - before[l]);
}

/* Slope of the monotone cubic at a month, per month: harmonic mean of the chords, 0 at an extreme. */
static double slope(double before, double here, double after)
{
    double left = here - before, right = after - here;
    return left * right <= 0.0 ? 0.0 : 2.0 * left * right / (left + right);
}

void profiles_in_year(const Profiles *profiles, int column, double share, double *out)
{
    double place = PROFILES_MONTHS * (share - floor(share)) - 0.5; /* months after mid-January */
    int month = (int)floor(place);
    double t = place - month, u = 1.0 - t;
    const double *y[4];
    for (int i = 0; i < 4; i++)
        y[i] = row(profiles, column, (month - 1 + i + PROFILES_MONTHS) % PROFILES_MONTHS);
    for (int l = 0; l < profiles->padded; l++) {
        double m1 = slope(y[0][l], y[1][l], y[2][l]), m2 = slope(y[1][l], y[2][l], y[3][l]);
        out[l] =
            y[1][l] * u * u * (1.0 + 2.0 * t) + y[2][l] * t * t * (3.0 - 2.0 * t) + t * u * (m1 * u - m2 * t);
    }
}
