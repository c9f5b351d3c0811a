/* profiles: a table by time and altitude, put onto the layers.
 *
 * CSV with a time column (year, decimal, or month, 1 to 12), altitude_km and value columns. Rows of one time
 * stand together, altitude ascending; times ascend from profile to profile. Every profile has its own
 * altitudes and must cover what is asked for. A table whose time column is not asked for (NULL) is one
 * profile.
 */
#ifndef SKYMEND_PROFILES_H
#define SKYMEND_PROFILES_H

#include "../input/fault.h"
#include "../transport/grid.h"

#define PROFILES_COLUMNS 3
#define PROFILES_MONTHS 12

typedef struct {
    const char *name;
    double low, high; /* accepted values */
    int logarithmic;  /* 1: linear in the logarithm with altitude (low > 0); 0: linear */
} ProfilesColumn;

typedef struct {
    int times, columns, padded;
    double *time;  /* [times] ascending */
    double *value; /* [columns][times][padded] at the middles of the layers; padding repeats the top layer */
    char path[1024];  /* as opened */
    char source[600]; /* the header's "source", or else the path */
    int last_line;    /* that of the last row, for messages */
} Profiles;

/* Read path and put it onto the grid. what names the table in messages. FAULT_INPUT unless every profile
 * covers altitudes 0 to to_km and every value lies in its range; time_name "month" needs the months 1 to 12,
 * each once. On a fault *profiles is zeroed. Owner: caller, profiles_free. */
int profiles_read(Profiles *profiles, const char *what, const char *path, const char *time_name,
                  const ProfilesColumn *column, int columns, const Grid *grid, double to_km, Fault *fault);
void profiles_free(Profiles *profiles); /* accepts NULL and a zeroed profiles */

/* FAULT_INPUT unless the times cover first..last (decimal years). */
int profiles_covers(const Profiles *profiles, const char *what, double first, double last, Fault *fault);

/* One column at a time inside the times: [padded] out. By year linear; a table by month takes the share of
 * the year that has passed (0..1) and goes smoothly through the values, which stand at mid-month: periodic
 * monotone cubic (Fritsch and Carlson 1980), so that no value leaves the range of its two neighbours. */
void profiles_at(const Profiles *profiles, int column, double time, double *out);
void profiles_in_year(const Profiles *profiles, int column, double share, double *out);

#endif
