/* series: what a finished file says of a quantity over time, and what can be read off it.
 *
 * Works on interval means alone, so that a file gives the same answers when it is finished, read back later,
 * or cut and joined with other tools. Time is decimal years (calendar.h).
 */
#ifndef SKYMEND_SERIES_H
#define SKYMEND_SERIES_H

#include "../input/fault.h"

enum SeriesKind {
    SERIES_COLUMN, /* the four partial columns follow, from the ground up; they add up to it */
    SERIES_TROPOSPHERE,
    SERIES_LOWER,
    SERIES_MIDDLE,
    SERIES_UPPER,
    SERIES_UV,   /* noon ultraviolet index */
    SERIES_DOSE, /* erythemal dose of a day */
    SERIES_EESC3,
    SERIES_EESC55, /* equivalent effective stratospheric chlorine, 3 and 5.5 years of age */
    SERIES_KINDS
};
enum { SERIES_PARTS = 4, SERIES_LIMITS = 3 };

typedef struct {
    const char *id;       /* first part of the ids of its answers */
    const char *variable; /* in the file; NULL: computed from O3 */
    const char *label;
    int sign; /* 1: the harm is a low value, and the return one upward (ozone); -1: the other way round */
} SeriesFacts;

/* Of a kind. */
const SeriesFacts *series_facts(int kind);

/* A view of one quantity; everything is borrowed. value[i] is the mean over start[i]..end[i]. */
typedef struct {
    int count;
    const double *start, *middle, *end; /* [count] decimal years, increasing */
    const double *value;                /* [count] */
} Series;

/* What is given off of a gas, Gg of the gas a year. */
typedef struct {
    char gas[32], variable[32]; /* "CFC-11", "CFC_11" */
    int halocarbon, nitrogen;   /* it holds C and Cl, Br or I; it holds N and no halogen */
    double *all;                /* [count] */
    double *lines; /* [count] of it, what lines of the schedule give; the rest is implied: what keeps a
                      prescribed abundance */
} GasEmission;

typedef struct {
    char label[160];
    int gas;       /* index */
    double *given; /* [count] Gg of the gas, not of an element in it, a year */
} LineEmission;

typedef struct {
    int gases, lines;
    GasEmission *gas;   /* [gases] in order of the file; none: it does not give them ... */
    LineEmission *line; /* [lines] */
    char missing[200];  /* ... for this reason */
    double *store;      /* what all and lines and given point into */
} FileEmissions;

typedef struct {
    char *path, *title, *resolved_case; /* "" when the file does not say */
    int count;
    double *start, *middle, *end;    /* [count] as in Series */
    double *value[SERIES_KINDS];     /* [count]; NULL: the file does not give it ... */
    char missing[SERIES_KINDS][200]; /* ... for this reason */
    char unit[SERIES_KINDS][24];     /* as in the file */
    double limit_km[SERIES_LIMITS];  /* tropopause, lower to middle, middle to upper stratosphere */
    double top_km;                   /* of the grid */
    FileEmissions emissions;
} FileSeries;

/* Where the middle stratosphere begins and ends unless told otherwise, km: 24 and 32, near 32 and 10 hPa, the
 * limits of the partial columns of Ball et al. (2018, Atmos. Chem. Phys. 18, 1379). */
extern const double series_limits[SERIES_LIMITS - 1];

/* Read a file that skymend project wrote, or one made of it by other tools: time, ozone_column (both must be
 * there) and whatever else it holds. limit_km: [SERIES_LIMITS] increasing, NULL: the tropopause of the file
 * and series_limits. Where time has no bounds the intervals meet half-way between their middles. Partial
 * columns: molecules of each layer (air_number_density times depth times O3), a layer that a limit cuts
 * shared out by depth; what lies above the top of the grid counts to the upper stratosphere, so that the
 * parts add up to ozone_column exactly. They are left out when the layers and ozone_column do not belong
 * together (1e-5 of the column). FAULT_INPUT when the file is no such file, has no record, or time or column
 * make no sense. On failure *series is freed and zeroed. */
int series_read(FileSeries *series, const char *path, const double *limit_km, Fault *fault);
void series_free(FileSeries *series);
/* In series_parts.c: the partial columns of an open NetCDF file, or the reason why not. */
int series_read_parts(FileSeries *series, int file, const double *limit_km, Fault *fault);
/* In series_emission.c: emissions by gas (emission_GAS, with species and formula of the variable GAS) and by
 * line, or the reason why not. A gap in one leaves all out, since a total without it would pass for the
 * whole. FAULT_INPUT when a unit is not Gg year-1 or the lines do not fit the gases. */
int series_read_emissions(FileSeries *series, int file, Fault *fault);
void series_free_emissions(FileEmissions *emissions);
/* Values of a variable of the file, `count` in all (dimensions of length 1 do not matter); -1 when it is not
 * there or has another size, 0 when read. */
int series_variable(int file, const char *name, int count, double *values);
/* Attribute of one text, cut to nothing when it is none or does not fit; 1 when found. */
int series_text(int file, int variable, const char *name, char *text, size_t size);

/* View of a kind that the file gives. */
Series series_view(const FileSeries *series, int kind);

/* ---- what can be read off (series.c) ---- */

/* Mean over calendar year `year`; NAN unless the intervals fill it to 99 %. */
double series_year_mean(const Series *series, int year);
/* Running mean over `years` centred on each interval, for intervals whose whole window the series covers; the
 * ends are not extrapolated, so the result has fewer intervals, down to none. store: [4 * count], where it is
 * put. */
Series series_smooth(const Series *series, double years, double *store);
/* Interval with the lowest sign * value among those that begin at or after `from`; -1: none. */
int series_extreme(const Series *series, int sign, double from);
/* Greatest distance in time between interval `at` and any whose sign * value is less than `margin` above its
 * own: by how much the year of an extreme may be off when the values may. */
double series_extreme_spread(const Series *series, int sign, int at, double margin);

enum Return {
    RETURN_FOUND,
    RETURN_LATER,      /* not by the end */
    RETURN_NEVER_AWAY, /* never on the far side of the benchmark after its year */
    RETURN_UNKNOWN     /* the series does not cover the benchmark year */
};
typedef struct {
    int state;    /* enum Return */
    double value; /* the benchmark: mean of its calendar year */
    double year;  /* of the first crossing after the extreme that follows the benchmark year, linear between
                     interval  middles; NAN unless found */
    double slope; /* there, per year */
    int again;    /* an interval after it on the far side again; -1: none */
} SeriesReturn;
SeriesReturn series_return(const Series *series, int sign, int benchmark_year);

#endif
