/* variation: reading. */
#include "variation.h"

#include <stdlib.h>
#include <string.h>

#include "../input/table.h"

static const double KM_PER_CM = 1e-5;

static int read_series(Profiles *profiles, const Model *model, const char *what, const char *file,
                       const char *time_name, const ProfilesColumn *column, int columns, char **sources,
                       Fault *fault)
{
    const Settings *settings = &model->settings;
    char path[2 * SETTINGS_PATH + 2];
    double to_km = KM_PER_CM * model->grid.middle[model->grid.layers - 1];
    int code = table_locate(what, file, settings->case_dir, settings->data_dir, path, sizeof path, fault);
    if (!code)
        code = profiles_read(profiles, what, path, time_name, column, columns, &model->grid, to_km, fault);
    if (code)
        return code;
    size_t old = strlen(*sources), more = strlen(what) + strlen(profiles->source) + 4;
    char *longer = realloc(*sources, old + more);
    if (!longer)
        return fault_memory(fault, "list of sources");
    snprintf(longer + old, more, "%s: %s\n", what, profiles->source);
    *sources = longer;
    return 0;
}

/* ---- temperature ---- */

/* The CO2 of the schedule, which must reach the year the air of the case belongs to. */
static int find_co2(Variation *variation, const Model *model, Fault *fault)
{
    const Schedule *schedule = &model->schedule;
    int year = model->settings.reference_year, gas = schedule_find(schedule, "CO2");
    if (gas < 0)
        return fault_at(
            fault, schedule->path, 0,
            "the schedule has no CO2, which temperature.mode = \"co2\" goes by; add the gas, or set "
            "temperature.mode = \"fixed\"");
    int first = schedule->first_year[gas], last = first + schedule->years[gas] - 1;
    if (year < first || year > last)
        return fault_at(
            fault, schedule->path, schedule->first_line[gas],
            "CO2 has values for %d to %d, but temperature.reference_year is %d; add the years, or "
            "correct the key, or set temperature.mode = \"fixed\"",
            first, last, year);
    variation->co2 = gas;
    variation->co2_reference = schedule_abundance(schedule, gas, year + 0.5);
    for (int y = 0; y < schedule->years[gas]; y++)
        if (!(schedule->abundance[gas][y] > 0.0))
            return fault_at(
                fault, schedule->path, schedule->first_line[gas],
                "CO2 is %g in %d; temperature.mode = \"co2\" goes by its logarithm: correct it, or "
                "set temperature.mode = \"fixed\"",
                schedule->abundance[gas][y], first + y);
    return 0;
}

static int read_temperature(Variation *variation, const Model *model, char **sources, Fault *fault)
{
    static const ProfilesColumn doubling = {"K_per_doubling", -40.0, 40.0, 0},
                                change = {"change_K", -80.0, 80.0, 0};
    const Settings *settings = &model->settings;
    if (settings->temperature == TEMPERATURE_CO2) {
        Profiles table;
        int code = find_co2(variation, model, fault);
        if (!code)
            code = read_series(&table, model, "temperature against CO2", settings->co2_cooling_file, NULL,
                               &doubling, 1, sources, fault);
        if (code)
            return code;
        variation->doubling = table.value; /* its one profile */
        table.value = NULL;
        profiles_free(&table);
    }
    if (settings->temperature == TEMPERATURE_FILE) {
        int code = read_series(&variation->change, model, "temperature change", settings->temperature_file,
                               "year", &change, 1, sources, fault);
        if (!code)
            code = profiles_covers(&variation->change, "temperature change", settings->first_year,
                                   settings->last_year + 1, fault);
        if (code)
            return code;
    }
    return 0;
}

int variation_read(Variation **read, const Model *model, char **sources, Fault *fault)
{
    *read = NULL;
    *sources = calloc(1, 1);
    Variation *variation = calloc(1, sizeof *variation);
    if (!variation || !*sources) {
        free(variation);
        return fault_memory(fault, "what varies");
    }
    variation->co2 = -1;
    int code = read_temperature(variation, model, sources, fault);
    if (code) {
        variation_free(variation);
        return code;
    }
    *read = variation;
    return 0;
}

void variation_free(Variation *variation)
{
    if (!variation)
        return;
    free(variation->doubling);
    profiles_free(&variation->change);
    free(variation);
}
