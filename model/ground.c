/* ground: what a case and its schedule say of the ground, by gas. Contract in column.h and column_parts.h. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "column_parts.h"
#include "emission.h"

/* ---- ground conditions ---- */

int model_holds(const Model *model, int solved)
{
    for (int h = 0; h < model->held; h++)
        if (model->held_species[h] == solved)
            return 1;
    return 0;
}

int model_makes(const Model *model, int solved)
{
    const Mechanism *mechanism = model->mechanism;
    for (int r = 0; r < mechanism->reactions; r++)
        for (int c = 0; c < mechanism->reaction[r].changes; c++)
            if (mechanism->reaction[r].changed[c] == solved && mechanism->reaction[r].change[c] > 0.0)
                return 1;
    return 0;
}

int model_made_anyway(const Model *model, int solved)
{
    int gas = model->surface_kind[solved] == SURFACE_SCHEDULE ? model->surface_gas[solved] : -1;
    return gas >= 0 && model->schedule.years[gas] == 0 && strcmp(model->schedule.gas[gas], "CO2") &&
           model_makes(model, solved);
}

int model_keeps(const Model *model, int solved, double time)
{
    int kind = model->surface_kind[solved];
    if (model_holds(model, solved))
        return 0;
    /* kept at 0 until it is given off, a gas made anyway would be taken out of the air, its family with it */
    return kind == SURFACE_FIXED || (kind == SURFACE_SCHEDULE && !model_made_anyway(model, solved) &&
                                     !schedule_emits(&model->schedule, model->surface_gas[solved], time));
}

double model_deposition(const Model *model, int solved)
{
    int kind = model->surface_kind[solved];
    return kind == SURFACE_DEPOSITION || kind == SURFACE_SCHEDULE ? model->surface_value[solved] : 0.0;
}

int model_check_start(const Model *model, Fault *fault)
{
    const Schedule *schedule = &model->schedule;
    int start = model->settings.first_year;
    for (int i = 0; i < schedule->lines; i++) {
        const ScheduleLine *line = &schedule->line[i];
        int from = schedule->emission_from[line->gas];
        if (from == 0 || from >= start)
            continue;
        return fault_at(
            fault, schedule->path[line->file], line->row,
            "emissions drive %s from %d on, but the run begins in %d and does not know how much of it is in "
            "the air then; begin in %d or earlier (years.first), or let its abundance stand to %d",
            schedule->gas[line->gas], from, start, from, start - 1);
    }
    return 0;
}

int model_check_years(const Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    if (schedule_meets(&model->schedule, settings->first_year, settings->last_year, fault))
        return fault->code;
    return model_check_start(model, fault);
}

int model_set_ground(Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    const Mechanism *mechanism = model->mechanism;
    for (int s = 0; s < mechanism->solved; s++) {
        model->surface_kind[s] = SURFACE_CLOSED;
        model->surface_gas[s] = -1;
    }
    for (int g = 0; g < model->schedule.gases; g++) {
        const char *gas = model->schedule.gas[g];
        int s = mechanism_solved(mechanism, gas);
        if (!model->schedule.years[g] && !model->schedule.emission_from[g])
            continue; /* given off aloft only, which the ground knows nothing of */
        if (s < 0)
            return fault_at(
                fault, model->schedule.path[model->schedule.file[g]], model->schedule.first_line[g],
                "gas %s is not an active species of mechanism %s; correct the name or add the species", gas,
                mechanism->path);
        if (model_holds(model, s))
            return fault_at(
                fault, model->schedule.path[model->schedule.file[g]], model->schedule.first_line[g],
                "gas %s is also held up to the tropopause by a table of the case; remove one of the two",
                gas);
        model->surface_kind[s] = SURFACE_SCHEDULE;
        model->surface_gas[s] = g;
    }
    for (int b = 0; b < settings->bounds; b++) {
        const SurfaceBound *bound = &settings->bound[b];
        const char *file = settings->case_path[0] ? settings->case_path : "built-in case";
        int s = mechanism_solved(mechanism, bound->species), built_in = !settings->bounds_given;
        if (s < 0 && built_in)
            continue; /* a mechanism of the user's own may do without */
        if (s < 0)
            return fault_at(fault, file, bound->line,
                            "surface.bounds names %s, which is no active species of %s; correct the name",
                            bound->species, mechanism->path);
        int emitted = model->surface_kind[s] == SURFACE_SCHEDULE &&
                      model->schedule.emission_from[model->surface_gas[s]] > 0;
        if (emitted && bound->kind == BOUND_DEPOSITION) {
            model->surface_value[s] = bound->value;
            continue;
        }
        if (model->surface_kind[s] == SURFACE_SCHEDULE && built_in)
            return fault_at(fault, file, 0,
                            "the built-in surface.bounds holds %s, which the schedule %s carries; give "
                            "surface.bounds without it, "
                            "or take it out of the schedule",
                            bound->species,
                            model->schedule.path[model->schedule.file[model->surface_gas[s]]]);
        if (model->surface_kind[s] == SURFACE_SCHEDULE)
            return fault_at(fault, file, bound->line,
                            "surface.bounds names %s, which the schedule %s carries; keep one of the two",
                            bound->species,
                            model->schedule.path[model->schedule.file[model->surface_gas[s]]]);
        if (model_holds(model, s))
            return fault_at(
                fault, file, bound->line,
                "surface.bounds names %s, which a table holds up to the tropopause; remove one of the two",
                bound->species);
        model->surface_kind[s] = bound->kind == BOUND_FIXED ? SURFACE_FIXED : SURFACE_DEPOSITION;
        model->surface_value[s] = bound->value;
    }
    if (schedule_covers(&model->schedule, settings->first_year, settings->last_year, fault))
        return fault->code;
    return emissions_make(&model->emissions, model, fault);
}

/* ---- the schedule ---- */

static int check_gases(const Model *model, const char *const *path, int files, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    const char **names = malloc(((size_t)mechanism->solved + 1) * sizeof *names), *slash;
    char where[100];
    if (!names)
        return fault_memory(fault, "names of gases");
    for (int s = 0; s < mechanism->solved; s++)
        names[s] = mechanism_name(mechanism, s);
    slash = strrchr(mechanism->path, '/');
    snprintf(where, sizeof where, "mechanism %.80s", slash ? slash + 1 : mechanism->path);
    int code = schedule_check_gases(path, files, names, mechanism->solved, where, fault);
    free(names);
    return code;
}

int model_read_schedule(Model *model, Fault *fault)
{
    const Settings *settings = &model->settings;
    char(*path)[SETTINGS_PATH] = calloc(SETTINGS_MAX_LAYERS + 1, sizeof *path);
    const char *paths[SETTINGS_MAX_LAYERS + 1];
    if (!path)
        return fault_memory(fault, "paths of the schedule");
    int files = 1 + settings->schedule_layers;
    int code = model_locate(settings, "schedule", settings->schedule_file, path[0], fault);
    for (int f = 1; !code && f < files; f++)
        code = model_locate(settings, "schedule layer", settings->schedule_layer[f - 1], path[f], fault);
    for (int f = 0; f < files; f++)
        paths[f] = path[f];
    if (!code)
        code = check_gases(model, paths, files, fault);
    if (!code)
        code = schedule_read(&model->schedule, paths, files, fault);
    for (int f = 0; !code && f < files; f++)
        code = model_add_source(model, fault, f ? "schedule layer" : "schedule", model->schedule.header[f]);
    free(path);
    return code;
}
