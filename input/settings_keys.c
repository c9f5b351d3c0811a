/* settings_keys: the table of case-file keys and the built-in surface boundaries. */
#include "settings_keys.h"

static const char *const moments_choices[] = {"none", "all", NULL};
static const char *const start_choices[] = {"settled", "spinup", NULL};
static const char *const sun_choices[] = {"global", "latitude", "season", NULL};
static const char *const temperature_choices[] = {"fixed", "co2", "file", NULL};
static const char *const day_choices[] = {"mean", "factors", "explicit", NULL};

const char *const bound_kinds[] = {"fixed", "deposition", NULL};
const char *const bound_value_keys[] = {"mole_fraction", "velocity_cm_s", NULL};

#define AT(member) offsetof(Settings, member)
#define WHOLE(group, name, member, standard, low, high, unit, help)                                          \
    {                                                                                                        \
        group, name, KEY_WHOLE, AT(member), 0, standard, "", low, high, unit, NULL, help                     \
    }
#define REAL(group, name, member, standard, low, high, unit, help)                                           \
    {                                                                                                        \
        group, name, KEY_REAL, AT(member), 0, standard, "", low, high, unit, NULL, help                      \
    }
#define CHOICE(group, name, member, standard, choices, help)                                                 \
    {                                                                                                        \
        group, name, KEY_CHOICE, AT(member), 0, standard, "", 0, 0, "", choices, help                        \
    }
#define TEXT_OF(group, name, member, standard, least, help)                                                  \
    {                                                                                                        \
        group, name, KEY_TEXT, AT(member), sizeof((Settings *)0)->member, 0, standard, least, 0, "", NULL,   \
            help                                                                                             \
    }
#define TEXT(group, name, member, standard, help) TEXT_OF(group, name, member, standard, 0, help)
/* a file the model cannot do without: its name may not be empty */
#define NAMED(group, name, member, standard, help) TEXT_OF(group, name, member, standard, 1, help)
#define LIST(group, name, type, low, high, unit, help)                                                       \
    {                                                                                                        \
        group, name, type, 0, 0, 0, "", low, high, unit, NULL, help                                          \
    }

static const SettingKey keys[] = {
    TEXT("", "title", title, "Baseline projection of the ozone layer",
         "what the run is, copied into the output file"),

    WHOLE("years", "first", first_year, 1955, 1750, 2500, "", "first year of the run"),
    WHOLE("years", "last", last_year, 2100, 1750, 2500, "", "last year of the run, included"),

    REAL("grid", "top_km", top_km, 80, 20, 86, "km",
         "top of the column; the standard atmosphere's formulas end at 86 km"),
    REAL("grid", "spacing_km", spacing_km, 1, 0.1, 5, "km",
         "depth of a layer; top_km must be a whole number of them"),
    LIST("grid", "edges_km", KEY_EDGES, 0, 86, "km",
         "own layer edges from 0 upward, in place of top_km and spacing_km; empty for even layers"),

    TEXT("files", "air", air_file, "",
         "CSV profile of temperature and pressure; empty for the U.S. Standard Atmosphere 1976"),
    NAMED("files", "eddy", eddy_file, "eddy-diffusion.csv", "CSV profile of the eddy coefficient"),
    NAMED("files", "mechanism", mechanism_file, "mechanism.cfg", "species and reactions"),
    NAMED("files", "schedule", schedule_file, "baseline-schedule.csv",
          "CSV of source-gas abundances and emissions by year"),
    LIST("files", "schedule_layers", KEY_LAYERS, 0, 0, "",
         "CSVs laid over the schedule one after the other, such as [ \"late.csv\", \"leak.csv\" ]: each adds "
         "lines or changes what stands below"),
    NAMED("files", "aerosol", aerosol_file, "aerosol-surface.csv", "CSV profile of sulfate surface area"),
    NAMED("files", "bins", bins_file, "wavelength-bins.csv", "CSV of wavelength intervals"),
    NAMED("files", "ultraviolet_bins", ultraviolet_bins_file, "ultraviolet-bins.csv",
          "CSV of wavelength intervals of the ultraviolet at the ground"),
    NAMED("files", "solar", solar_file, "solar-irradiance.csv", "CSV of sunlight above the atmosphere"),
    NAMED("files", "initial", initial_file, "initial-profiles.csv",
          "CSV of the state that spin-up and steady state start from"),
    TEXT("files", "tropospheric_oh", tropospheric_oh_file, "tropospheric-oh.csv",
         "CSV profile of OH held below the tropopause; empty to compute OH everywhere"),
    NAMED("files", "tropospheric_water", tropospheric_water_file, "tropospheric-water.csv",
          "CSV profile of water vapour held below the tropopause"),
    TEXT("files", "tropospheric_no2", tropospheric_no2_file, "tropospheric-nitrogen-dioxide.csv",
         "CSV profile of NO2 held below the tropopause; empty to compute NO2 everywhere"),
    NAMED("files", "co2_cooling", co2_cooling_file, "co2-cooling.csv",
          "CSV profile of the change of temperature for a doubling of CO2"),
    TEXT("files", "temperature_change", temperature_file, "",
         "CSV of the change of temperature by year and altitude; used when temperature.mode is file"),
    TEXT("files", "air_by_month", month_air_file, "",
         "CSV of temperature and pressure by month and altitude, used when sun.kind is season; files.air is "
         "then "
         "the annual mean"),
    TEXT("files", "tropospheric_oh_by_month", month_oh_file, "",
         "CSV of OH held below the tropopause by month and altitude, used when sun.kind is season"),
    TEXT("files", "tropospheric_water_by_month", month_water_file, "",
         "CSV of water vapour held below the tropopause by month and altitude, used when sun.kind is season"),
    TEXT("files", "tropospheric_no2_by_month", month_no2_file, "",
         "CSV of NO2 held below the tropopause by month and altitude, used when sun.kind is season"),
    TEXT("files", "volcanic", volcanic_file, "",
         "CSV of sulfate surface that volcanoes add, by year and altitude; empty for the background alone"),
    TEXT("files", "solar_cycle", solar_cycle_file, "",
         "CSV of the phase of the solar cycle by year, such as solar-cycle-idealised.csv; empty for a steady "
         "sun"),
    NAMED("files", "solar_amplitude", solar_amplitude_file, "solar-cycle-amplitude.csv",
          "CSV of the change of sunlight over the solar cycle by wavelength"),

    CHOICE("temperature", "mode", temperature, TEMPERATURE_CO2, temperature_choices,
           "fixed: that of the air profile; co2: cooling with the CO2 of the schedule by a published linear "
           "relation; file: change by year and altitude as in files.temperature_change"),
    REAL("temperature", "reference_co2_ppm", reference_co2_ppm, 338.9, 100, 10000, "ppm",
         "CO2 at which the air profile holds, used when mode is co2; the default is the global mean of 1980"),

    CHOICE(
        "sun", "kind", sun, SUN_GLOBAL, sun_choices,
        "global: mean sun; latitude: the sun of latitude_deg on day_of_year, every day; season: the sun of "
        "latitude_deg through the year"),
    REAL("sun", "latitude_deg", latitude_deg, 0, -90, 90, "degrees north",
         "used when kind is latitude or season"),
    REAL("sun", "day_of_year", day_of_year, 80, 1, 366, "",
         "used when kind is latitude, and by the verb sunlight when it is season; 1 = 1 January"),
    REAL("sun", "surface_albedo", surface_albedo, 0.3, 0, 1, "",
         "share of light the lower boundary returns; 0.3 is the whole Earth with its clouds "
         "(common practice), clear ground is near 0.1 and less in the ultraviolet"),

    REAL("ultraviolet", "latitude_deg", ultraviolet_latitude_deg, 45, -90, 90, "degrees north",
         "place of the ultraviolet at the ground, whatever the sun of the column; under clear sky at sea "
         "level"),
    REAL("ultraviolet", "day_of_year", ultraviolet_day_of_year, 172, 1, 366, "",
         "its day; 1 = 1 January, 172 = 21 June"),
    REAL("ultraviolet", "surface_albedo", ultraviolet_albedo, 0.05, 0, 1, "",
         "share of ultraviolet the ground there returns: land without snow 0.02 to 0.05, sea 0.05 to 0.1, "
         "fresh "
         "snow up to 0.9 (common practice)"),
    WHOLE("ultraviolet", "uvb_limit_nm", uvb_limit_nm, 315, 315, 320, "nm",
          "where UV-B ends and UV-A begins: 315 (ISO 21348, CIE) or 320 (older practice)"),

    CHOICE("day", "mode", day, DAY_FACTORS, day_choices,
           "mean: constant mean light (wrong for chlorine, for comparison only); factors: diurnal "
           "factors from a repeating day; explicit: every day resolved (slow)"),
    REAL("day", "refresh_column", refresh_column, 0.0015, 1e-5, 1, "relative",
         "change of overhead ozone at which photolysis rates are made afresh"),
    REAL("day", "refresh_state", refresh_state, 0.03, 1e-4, 10, "relative",
         "change of the state at which the diurnal factors are made afresh"),
    REAL("day", "refresh_years", refresh_years, 0.5, 1e-3, 1e3, "years",
         "time after which the diurnal factors are made afresh however little has changed"),

    REAL("surface", "tropopause_km", tropopause_km, 12, 5, 20, "km",
         "water, OH and NO2 are prescribed and washout acts below it; the global mean of the thermal "
         "tropopause "
         "is 12 to 13 km (common practice), the standard atmosphere turns isothermal at 11 km"),
    REAL("surface", "washout_per_day", washout_per_day, 0.2, 0, 10, "per day",
         "loss of a fully soluble gas at the ground, falling to 0 at the tropopause; 0.2 is a "
         "residence time of 5 days (common practice)"),
    LIST("surface", "bounds", KEY_BOUNDS, 0, 0, "",
         "gases held or taken up at the ground; a list given here replaces the built-in one; a gas of "
         "the schedule needs no entry"),

    REAL("numerics", "outer_step_days", outer_step_days, 30.4375 / 4, 0.01, 366, "days",
         "step of the splitting between transport and chemistry; the default is a quarter of a mean month"),
    REAL("numerics", "relative_tolerance", relative_tolerance, 1e-2, 1e-10, 0.1, "",
         "error allowed per step of the chemistry"),
    REAL("numerics", "absolute_tolerance_cm3", absolute_tolerance_cm3, 1e2, 1e-6, 1e8, "molecules cm-3",
         "the same for gases too scarce to matter"),
    CHOICE("numerics", "start", start, START_SETTLED, start_choices,
           "settled: from the steady state under the first year's values; spinup: from the initial profiles "
           "after spinup_years under them, which sun.kind = season takes always"),
    REAL("numerics", "spinup_years", spinup_years, 15, 0, 500, "years",
         "balance at the first year's values before the run starts, with start = \"spinup\""),

    WHOLE("output", "per_year", outputs_per_year, 1, 1, 366, "",
          "equal intervals per year; each record is the mean over its interval"),
    CHOICE("output", "moments", moments, MOMENTS_NONE, moments_choices,
           "all: mole fractions at midnight, sunrise, noon and sunset as well, for every gas but those kept "
           "at a "
           "value at the ground; needs day.mode factors or explicit, and a sun without seasons"),
};

_Static_assert(sizeof keys / sizeof keys[0] <= SETTINGS_MOST_KEYS, "raise SETTINGS_MOST_KEYS");

/* Boundaries of gases that no schedule carries. Mole fractions in mol mol-1, velocities in cm s-1.
 * basis of all: from memory. CH2Br2, CHBr3, CH2Cl2, CHCl3 are in the baseline schedule. */
static const StandardBound standard_bounds[] = {
    {"O3", BOUND_DEPOSITION, 0.1,
     "0.3-0.5 cm/s over land, 0.03-0.05 over sea by area; takes up about 950 Tg a year at 35 ppb, "
     "as the assessments have it (e.g. Ganzeveld et al. 2009 for the sea)"},
    {"CO", BOUND_FIXED, 90e-9, "global mean of about 80-100 ppb (Novelli et al. 1998 and later)"},
    {"H2", BOUND_FIXED, 530e-9, "global mean of 530 ppb (Novelli et al. 1999)"},
    {"HNO3", BOUND_DEPOSITION, 1.0, "limited by turbulence alone (common practice)"},
    {"H2O2", BOUND_DEPOSITION, 0.5, "common practice"},
    {"CH2O", BOUND_DEPOSITION, 0.5, "common practice"},
    {"CH3OOH", BOUND_DEPOSITION, 0.5, "common practice, soluble but less so than H2O2"},
    {"HCl", BOUND_DEPOSITION, 1.0, "as HNO3 (common practice)"},
    {"HBr", BOUND_DEPOSITION, 1.0, "as HNO3 (common practice)"},
};

const SettingKey *settings_keys(size_t *count)
{
    *count = sizeof keys / sizeof keys[0];
    return keys;
}

const StandardBound *settings_standard_bounds(size_t *count)
{
    *count = sizeof standard_bounds / sizeof standard_bounds[0];
    return standard_bounds;
}
