/* settings: the case file (libconfig), checked.
 *
 * Every key has a default, a unit in its name, a range and one line of help; they stand in one table
 * in settings_keys.c, which drives reading, checking and printing. An unknown or repeated key is a
 * fault with file, line and the nearest known key. Whole numbers serve where decimals are wanted.
 * Includes are not followed outside the case's folder. A file the case names must exist: else the
 * fault is at the line that names it. settings_print writes the resolved case,
 * itself a valid case file.
 */
#ifndef SKYMEND_SETTINGS_H
#define SKYMEND_SETTINGS_H

#include <stdio.h>

#include "fault.h"

#define SETTINGS_PATH 512
#define SETTINGS_MAX_EDGES 512
#define SETTINGS_MAX_BOUNDS 64
#define SETTINGS_MAX_LAYERS 32

enum DayMode { DAY_MEAN, DAY_FACTORS, DAY_EXPLICIT };
enum MomentsOut { MOMENTS_NONE, MOMENTS_ALL };
enum StartMode { START_SETTLED, START_SPINUP };
enum SunMode { SUN_GLOBAL, SUN_LATITUDE, SUN_SEASON };
enum TemperatureMode { TEMPERATURE_FIXED, TEMPERATURE_CO2, TEMPERATURE_FILE };
enum BoundKind { BOUND_FIXED, BOUND_DEPOSITION };

typedef struct {
    char species[32];
    int kind;     /* enum BoundKind */
    double value; /* BOUND_FIXED: mole fraction mol mol-1; BOUND_DEPOSITION: velocity cm s-1 */
    int line;     /* in the case file, for messages; 0 when built in or from an included file */
} SurfaceBound;

typedef struct {
    char case_path[SETTINGS_PATH]; /* "" for the built-in baseline */
    char case_dir[SETTINGS_PATH];  /* folder that relative paths start from */
    char data_dir[SETTINGS_PATH];  /* input/data as found at start */

    char title[256];
    int first_year, last_year; /* years of the run, both included */

    /* grid */
    double top_km;                      /* 80 */
    double spacing_km;                  /* 1 */
    int edges;                          /* 0, or the number of edges listed */
    double edge_km[SETTINGS_MAX_EDGES]; /* own edges, ascending from 0; override spacing; top_km is
                                           then the last of them */

    /* files (resolved by table_locate when used) */
    char air_file[SETTINGS_PATH];       /* "" = U.S. Standard Atmosphere 1976 */
    char eddy_file[SETTINGS_PATH];      /* eddy-diffusion.csv */
    char mechanism_file[SETTINGS_PATH]; /* mechanism.cfg */
    char schedule_file[SETTINGS_PATH];  /* baseline-schedule.csv */
    int schedule_layers;                /* files laid over it, in this order */
    char schedule_layer[SETTINGS_MAX_LAYERS][SETTINGS_PATH];
    char aerosol_file[SETTINGS_PATH];            /* aerosol-surface.csv */
    char bins_file[SETTINGS_PATH];               /* wavelength-bins.csv */
    char ultraviolet_bins_file[SETTINGS_PATH];   /* ultraviolet-bins.csv */
    char solar_file[SETTINGS_PATH];              /* solar-irradiance.csv */
    char initial_file[SETTINGS_PATH];            /* initial-profiles.csv */
    char tropospheric_oh_file[SETTINGS_PATH];    /* tropospheric-oh.csv; "" = OH computed everywhere */
    char tropospheric_water_file[SETTINGS_PATH]; /* tropospheric-water.csv */
    char tropospheric_no2_file[SETTINGS_PATH];   /* tropospheric-nitrogen-dioxide.csv; "" = NO2 computed
                                                    everywhere */

    char co2_cooling_file[SETTINGS_PATH]; /* co2-cooling.csv */
    char month_air_file[SETTINGS_PATH];   /* by month, SUN_SEASON; "" = none, as the next three */
    char month_oh_file[SETTINGS_PATH];
    char month_water_file[SETTINGS_PATH];
    char month_no2_file[SETTINGS_PATH];
    char volcanic_file[SETTINGS_PATH];        /* "" = background aerosol alone */
    char solar_cycle_file[SETTINGS_PATH];     /* "" = steady sun */
    char solar_amplitude_file[SETTINGS_PATH]; /* solar-cycle-amplitude.csv */
    char temperature_file[SETTINGS_PATH];     /* "" unless temperature is TEMPERATURE_FILE */

    /* temperature */
    int temperature;          /* enum TemperatureMode */
    double reference_co2_ppm; /* CO2 the air of the case goes with, TEMPERATURE_CO2 */

    /* sun */
    int sun;               /* enum SunMode */
    double latitude_deg;   /* SUN_LATITUDE, SUN_SEASON */
    double day_of_year;    /* SUN_LATITUDE, 1..366 */
    double surface_albedo; /* 0..1 */

    /* ultraviolet at the ground, under a sun of its own */
    double ultraviolet_latitude_deg, ultraviolet_day_of_year;
    double ultraviolet_albedo; /* 0..1, clear ground */
    int uvb_limit_nm;          /* 315 or 320 */

    /* day */
    int day;               /* enum DayMode */
    double refresh_column; /* relative change of overhead ozone that refreshes photolysis rates */
    double refresh_state;  /* relative change of the state that refreshes the diurnal factors */
    double refresh_years;  /* and the time after which they are made afresh all the same */

    /* boundaries */
    double tropopause_km;   /* prescribed water, OH and NO2, washout below */
    double washout_per_day; /* first-order rate of a fully soluble gas at the ground, falling to 0 at
                               the tropopause */
    int bounds;
    int bounds_given; /* 1: the case lists them, 0: the built-in ones */
    SurfaceBound bound[SETTINGS_MAX_BOUNDS];

    /* numerics */
    double outer_step_days;        /* splitting step */
    double relative_tolerance;     /* chemistry */
    double absolute_tolerance_cm3; /* chemistry, molecules cm-3 */
    int start;                     /* enum StartMode */
    double spinup_years;           /* START_SPINUP: balance at the first year's values before the run */

    /* output */
    int outputs_per_year; /* number of equal intervals per year, each record is the mean over its interval */
    int moments;          /* enum MomentsOut: mole fractions by time of day as well */
} Settings;

/* The built-in baseline. data_dir is copied; it must be shorter than SETTINGS_PATH. */
void settings_default(Settings *settings, const char *data_dir);
/* Read and check a case over the defaults. On a fault *settings holds the defaults and whatever was
 * read before it. A surface.bounds list replaces the built-in list as a whole. */
int settings_read(Settings *settings, const char *path, const char *data_dir, Fault *fault);
/* The resolved case as text (a valid case file); with help=1 each key carries its help and range. */
void settings_print(const Settings *settings, int help, FILE *out);
/* The same into a new string; owner: caller. NULL when out of memory. */
char *settings_text(const Settings *settings);

#endif
