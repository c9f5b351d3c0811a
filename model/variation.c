/* variation: reading. */
#include "variation.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"

static const double KM_PER_CM = 1e-5;

/* Append "what: text" to the list of sources. */
static int add_source(char **sources, const char *what, const char *text, Fault *fault)
{
    size_t old = strlen(*sources), more = strlen(what) + strlen(text) + 4;
    char *longer = realloc(*sources, old + more);
    if (!longer)
        return fault_memory(fault, "list of sources");
    snprintf(longer + old, more, "%s: %s\n", what, text);
    *sources = longer;
    return 0;
}

static int read_table(Profiles *profiles, const Model *model, const char *what, const char *file,
                      const char *time_name, const ProfilesColumn *column, int columns, char **sources,
                      Fault *fault)
{
    const Settings *settings = &model->settings;
    char path[2 * SETTINGS_PATH + 2];
    double to_km = KM_PER_CM * model->grid.middle[model->grid.layers - 1];
    int code = table_locate(what, file, settings->case_dir, settings->data_dir, path, sizeof path, fault);
    if (!code)
        code = profiles_read(profiles, what, path, time_name, column, columns, &model->grid, to_km, fault);
    return code ? code : add_source(sources, what, profiles->source, fault);
}

/* ---- temperature ---- */

static int find_co2(Variation *variation, const Model *model, Fault *fault)
{
    const Schedule *schedule = &model->schedule;
    int gas = schedule_find(schedule, "CO2");
    if (gas < 0)
        return fault_at(
            fault, schedule->path[0], 0,
            "the schedule has no CO2, which temperature.mode = \"co2\" goes by; add the gas, or set "
            "temperature.mode = \"fixed\"");
    if (schedule->emission_from[gas] || schedule->years[gas] == 0)
        return fault_at(
            fault, schedule->path[schedule->file[gas]], schedule->first_line[gas],
            "CO2 is given as emissions, but temperature.mode = \"co2\" goes by its abundance; give "
            "abundances, or set temperature.mode = \"fixed\"");
    variation->co2 = gas;
    variation->co2_reference = 1e-6 * model->settings.reference_co2_ppm;
    for (int y = 0; y < schedule->years[gas]; y++)
        if (!(schedule->abundance[gas][y] > 0.0))
            return fault_at(
                fault, schedule->path[schedule->file[gas]], schedule->first_line[gas],
                "CO2 is %g in %d; temperature.mode = \"co2\" goes by its logarithm: correct it, or "
                "set temperature.mode = \"fixed\"",
                schedule->abundance[gas][y], schedule->first_year[gas] + y);
    return 0;
}

static int read_temperature(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    static const ProfilesColumn doubling = {"K_per_doubling", -40.0, 40.0, 0},
                                change = {"change_K", -150.0, 150.0, 0};
    const Settings *settings = &model->settings;
    if (settings->temperature == TEMPERATURE_CO2) {
        Profiles table;
        int code = find_co2(variation, model, fault);
        if (!code)
            code = read_table(&table, model, "temperature against CO2", settings->co2_cooling_file, NULL,
                              &doubling, 1, sources, fault);
        if (code)
            return code;
        variation->doubling = table.value; /* its one profile */
        table.value = NULL;
        profiles_free(&table);
    }
    if (settings->temperature == TEMPERATURE_FILE) {
        int code = read_table(&variation->change, model, "temperature change", settings->temperature_file,
                              "year", &change, 1, sources, fault);
        if (!code)
            code = profiles_covers(&variation->change, "temperature change", settings->first_year,
                                   settings->last_year + 1, fault);
        if (code)
            return code;
    }
    return 0;
}

/* ---- aerosol ---- */

static int read_volcanic(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    static const ProfilesColumn column[] = {{"surface_um2_cm-3", 0.0, 1e4, 0},
                                            {"effective_radius_um", 1e-3, 100.0, 1}};
    const Settings *settings = &model->settings;
    if (!settings->volcanic_file[0])
        return 0;
    int code = read_table(&variation->volcanic, model, "volcanic aerosol", settings->volcanic_file, "year",
                          column, 2, sources, fault);
    return code ? code
                : profiles_covers(&variation->volcanic, "volcanic aerosol", settings->first_year,
                                  settings->last_year + 1, fault);
}

/* ---- season ---- */

/* Replace the altitude's temperature by that at the layer's pressure. The table gives both by altitude; put
 * onto the layers they are a curve T(p), read where the layer's own pressure lies. */
static int read_month_air(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    const Settings *settings = &model->settings;
    char path[2 * SETTINGS_PATH + 2];
    Table table = {0};
    size_t month = 0, kelvin = 0, pascal = 0, padded = (size_t)model->grid.padded;
    Profiles *air = &variation->month_air;
    /* read once as profiles by altitude, which checks months, order, ranges and cover */
    static const ProfilesColumn column[] = {{"temperature_K", 100.0, 400.0, 0},
                                            {"pressure_Pa", 1e-6, 1.2e5, 1}};
    int code =
        read_table(air, model, "air by month", settings->month_air_file, "month", column, 2, sources, fault);
    if (!code)
        code = table_locate("air by month", settings->month_air_file, settings->case_dir, settings->data_dir,
                            path, sizeof path, fault);
    if (!code)
        code = table_read(&table, path, fault);
    if (!code)
        code = table_column(&table, "month", &month, fault);
    if (!code)
        code = table_column(&table, "temperature_K", &kelvin, fault);
    if (!code)
        code = table_column(&table, "pressure_Pa", &pascal, fault);
    double *height = code ? NULL : malloc(table.rows * sizeof(double)); /* minus log p: ascending */
    if (!code && !height)
        code = fault_memory(fault, "air by month");
    for (size_t first = 0, end = 0; !code && first < table.rows; first = end) {
        const double *m = table_values(&table, month), *p = table_values(&table, pascal);
        for (end = first; !code && end < table.rows && m[end] == m[first]; end++) {
            height[end] = -log(p[end]);
            if (end > first && !(p[end] < p[end - 1]))
                code = fault_at(fault, path, table.line[end],
                                "pressure_Pa is %g after %g; it must fall with altitude", p[end], p[end - 1]);
        }
        for (size_t l = 0; !code && l < padded; l++) {
            double at = -log(model->air.pressure[l]);
            if (at < height[first] || at > height[end - 1])
                code = fault_at(fault, path, table.line[end - 1],
                                "month %g covers %g to %g Pa, but the layer at %g km has %g Pa; add rows",
                                m[first], p[first], p[end - 1], KM_PER_CM * model->grid.middle[l],
                                model->air.pressure[l]);
            else
                air->value[((size_t)m[first] - 1) * padded + l] =
                    table_linear(height + first, table_values(&table, kelvin) + first, end - first, at);
        }
    }
    free(height);
    table_free(&table);
    return code;
}

static int read_month_held(Variation *variation, const Model *model, const char *species, const char *file,
                           const ProfilesColumn *column, int density, char **sources, Fault *fault)
{
    int solved = mechanism_solved(model->mechanism, species), h = 0;
    while (h < model->held && model->held_species[h] != solved)
        h++;
    if (!file[0] || h == model->held)
        return 0;
    const Settings *settings = &model->settings;
    char path[2 * SETTINGS_PATH + 2], what[60];
    snprintf(what, sizeof what, "tropospheric %s by month", species);
    int code = table_locate(what, file, settings->case_dir, settings->data_dir, path, sizeof path, fault);
    if (!code)
        code = profiles_read(&variation->month_held[h], what, path, "month", column, 1, &model->grid,
                             settings->tropopause_km, fault);
    variation->month_density[h] = density;
    return code ? code : add_source(sources, what, variation->month_held[h].source, fault);
}

static int read_season(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    static const ProfilesColumn water = {"H2O_mol_mol-1", 1e-15, 0.1, 1}, oh = {"OH_cm-3", 0.0, 1e9, 0},
                                no2 = {"NO2_mol_mol-1", 1e-15, 0.1, 1};
    const Settings *settings = &model->settings;
    int code = 0;
    if (settings->month_air_file[0])
        code = read_month_air(variation, model, sources, fault);
    if (!code)
        code =
            read_month_held(variation, model, "H2O", settings->month_water_file, &water, 0, sources, fault);
    if (!code)
        code = read_month_held(variation, model, "OH", settings->month_oh_file, &oh, 1, sources, fault);
    if (!code)
        code = read_month_held(variation, model, "NO2", settings->month_no2_file, &no2, 0, sources, fault);
    return code;
}

/* ---- solar cycle ---- */

/* Two columns of a table, the first ascending, the second within its range, covering first..last. */
static int read_pairs(Table *table, const Model *model, const char *what, const char *file,
                      const char *x_name, const char *y_name, double low, double high, double first,
                      double last, const double **x, const double **y, char **sources, Fault *fault)
{
    char path[2 * SETTINGS_PATH + 2], source[600];
    size_t x_column, y_column;
    if (table_locate(what, file, model->settings.case_dir, model->settings.data_dir, path, sizeof path,
                     fault) ||
        table_read(table, path, fault) || table_column(table, x_name, &x_column, fault) ||
        table_require_increasing(table, x_column, fault) || table_column(table, y_name, &y_column, fault) ||
        table_require_range(table, y_column, low, high, fault))
        return fault->code;
    *x = table_values(table, x_column);
    *y = table_values(table, y_column);
    size_t end = table->rows - 1;
    if (table->rows < 2 || (*x)[0] > first || (*x)[end] < last)
        return fault_at(fault, path, table->line[end],
                        "%s covers %s %g to %g, but %g to %g is needed; add rows", what, x_name, (*x)[0],
                        (*x)[end], first, last);
    if (!table_header(table, "source", source, sizeof source))
        snprintf(source, sizeof source, "%.590s", path);
    return add_source(sources, what, source, fault);
}

static int read_cycle(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    const Settings *settings = &model->settings;
    const Spectra *spectra = model->spectra;
    if (!settings->solar_cycle_file[0])
        return 0;
    Table index = {0}, amplitude = {0};
    const double *x, *y;
    double shortest = spectra->lower[0], longest = spectra->upper[spectra->bins - 1];
    int code = read_pairs(&index, model, "solar cycle", settings->solar_cycle_file, "year", "phase", -0.5,
                          2.5, settings->first_year, settings->last_year + 1, &x, &y, sources, fault);
    if (!code) {
        size_t bytes = index.rows * sizeof(double);
        variation->phases = index.rows;
        variation->year = malloc(bytes);
        variation->phase = malloc(bytes);
        variation->amplitude = malloc((size_t)spectra->bins * sizeof(double));
        if (!variation->year || !variation->phase || !variation->amplitude) {
            code = fault_memory(fault, "solar cycle");
        } else {
            memcpy(variation->year, x, bytes);
            memcpy(variation->phase, y, bytes);
        }
    }
    if (!code)
        code = read_pairs(&amplitude, model, "amplitude of the solar cycle", settings->solar_amplitude_file,
                          "wavelength_nm", "change_percent", -50.0, 190.0, shortest, longest, &x, &y, sources,
                          fault);
    for (int b = 0; !code && b < spectra->bins; b++)
        variation->amplitude[b] =
            0.01 * table_linear(x, y, amplitude.rows, 0.5 * (spectra->lower[b] + spectra->upper[b]));
    table_free(&index);
    table_free(&amplitude);
    return code;
}

/* The laws of the chemistry were measured within these, and a slip of the tables shows here. */
static int check_range(const Variation *variation, const Model *model, Fault *fault)
{
    const double least = 100.0, most = 400.0;
    int co2 = variation->co2, years = co2 >= 0 ? model->schedule.years[co2] : variation->change.times;
    int padded = model->grid.padded, months = variation->month_air.times;
    /* between months and years temperature lies between theirs */
    for (int i = 0; i < years * (months ? months : 1); i++) {
        int y = i % years, month = i / years;
        const double *base =
            months ? variation->month_air.value + FIELD(padded, month, 0) : model->air.temperature;
        double doublings =
            co2 >= 0 ? log2(model->schedule.abundance[co2][y] / variation->co2_reference) : 0.0;
        for (int l = 0; l < padded; l++) {
            double change = co2 >= 0 ? variation->doubling[l] * doublings
                                     : variation->change.value[(size_t)y * (size_t)padded + (size_t)l];
            double kelvin = base[l] + change;
            if (!(kelvin >= least && kelvin <= most))
                return fault_at(
                    fault,
                    co2 >= 0 ? model->schedule.path[model->schedule.file[co2]] : variation->change.path, 0,
                    "the temperature at %g km would be %.0f K in %g; it must lie between %g and %g K: "
                    "correct the table, or set temperature.mode = \"fixed\"",
                    KM_PER_CM * model->grid.middle[l], kelvin,
                    co2 >= 0 ? model->schedule.first_year[co2] + y : variation->change.time[y], least, most);
        }
    }
    return 0;
}

int variation_read(Variation **read, const Model *model, char **sources, Fault *fault)
{
    *read = NULL;
    Variation *variation = calloc(1, sizeof *variation);
    if (!variation)
        return fault_memory(fault, "what varies");
    variation->co2 = -1;
    int code = read_temperature(variation, model, sources, fault);
    if (!code)
        code = read_volcanic(variation, model, sources, fault);
    if (!code)
        code = read_season(variation, model, sources, fault);
    if (!code)
        code = check_range(variation, model, fault);
    if (!code)
        code = read_cycle(variation, model, sources, fault);
    if (code) {
        variation_free(variation);
        return code;
    }
    *read = variation;
    return 0;
}

int variation_of_temperature(const Variation *variation)
{
    return variation && (variation->co2 >= 0 || variation->change.times || variation->month_air.times);
}

void variation_free(Variation *variation)
{
    if (!variation)
        return;
    free(variation->doubling);
    profiles_free(&variation->change);
    profiles_free(&variation->volcanic);
    profiles_free(&variation->month_air);
    for (int h = 0; h < MODEL_HELD_MOST; h++)
        profiles_free(&variation->month_held[h]);
    free(variation->year);
    free(variation->phase);
    free(variation->amplitude);
    free(variation);
}
