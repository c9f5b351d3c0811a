/* archive_emission: what is given off by gas and by line, in the file of a projection. */
#include <math.h>
#include <string.h>

#include <netcdf.h>

#include "archive_layout.h"
#include "emission.h"

/* A year of 365.25 days has 365.25 / 365.2425 of the library's "year", within 2e-5; said in the long_name. */
static const double GG_PER_KG = 1e-6;

static int is_given(const Model *model, int s)
{
    for (int g = 0; g < model->emissions->given; g++)
        if (model->emissions->given_species[g] == s)
            return 1;
    return 0;
}

static int has_emission(const Model *model, int s)
{
    return model->surface_kind[s] == SURFACE_SCHEDULE || is_given(model, s);
}

size_t layout_emission_variables(const Layout *out)
{
    size_t count = out->model->emissions->lines ? 4 : 0;
    for (int s = 0; s < out->model->mechanism->solved; s++)
        count += (size_t)has_emission(out->model, s);
    return count;
}

static int define_gases(Layout *out, int time, size_t time_chunk, Fault *fault)
{
    const Mechanism *mechanism = out->model->mechanism;
    for (int s = 0; s < mechanism->solved; s++) {
        char species[MECHANISM_NAME + 2], name[MECHANISM_NAME + 16], longer[2 * MECHANISM_NAME + 200];
        out->emission[s] = -1;
        if (!has_emission(out->model, s))
            continue;
        archive_name(mechanism_name(mechanism, s), species, sizeof species);
        snprintf(name, sizeof name, "emission_%s", species);
        snprintf(longer, sizeof longer,
                 "%s given off in a year of 365.25 days, whole Earth; while its abundance is given, the "
                 "emission that "
                 "keeps it there",
                 mechanism_name(mechanism, s));
        const Description d = {name, "Gg year-1", NULL, longer, "time: mean"};
        if (layout_variable(out, &d, 1, &time, &time_chunk, &out->emission[s], fault))
            return fault->code;
    }
    return 0;
}

static int define_words(const Layout *out, const char *name, const char *longer, int line, int *variable,
                        Fault *fault)
{
    int status = nc_def_var(out->file, name, NC_STRING, 1, &line, variable);
    if (status == NC_NOERR)
        status = nc_put_att_text(out->file, *variable, "long_name", strlen(longer), longer);
    return layout_fault(out->path, status, name, fault);
}

static int put_words(const Layout *out, const int *variable, Fault *fault)
{
    const Schedule *schedule = &out->model->schedule;
    int status = NC_NOERR;
    for (int i = 0; i < schedule->lines && status == NC_NOERR; i++) {
        const size_t at = (size_t)i;
        const char *word[] = {schedule->line[i].label, schedule->gas[schedule->line[i].gas],
                              schedule->line[i].element[0] ? schedule->line[i].element
                                                           : schedule->gas[schedule->line[i].gas]};
        for (int v = 0; v < 3 && status == NC_NOERR; v++)
            status = nc_put_var1_string(out->file, variable[v], &at, &word[v]);
    }
    return layout_fault(out->path, status, "the lines of the schedule", fault);
}

int layout_emission_define(Layout *out, int time, size_t time_chunk, Fault *fault)
{
    static const Description amount = {"line_emission", "Gg year-1", NULL,
                                       "emission of each line of the schedule, mass of line_mass_of",
                                       "time: mean"};
    int line, words[3];
    out->line = -1;
    if (define_gases(out, time, time_chunk, fault) || !out->model->schedule.lines)
        return fault->code;
    int status = nc_def_dim(out->file, "line", (size_t)out->model->schedule.lines, &line);
    if (layout_fault(out->path, status, "the lines of the schedule", fault))
        return fault->code;
    const int field[2] = {time, line};
    const size_t chunk[2] = {1, (size_t)out->model->schedule.lines};
    if (layout_variable(out, &amount, 2, field, chunk, &out->line, fault) ||
        define_words(out, "line_label", "the schedule's own word for the line", line, &words[0], fault) ||
        define_words(out, "line_gas", "gas of the line", line, &words[1], fault) ||
        define_words(out, "line_mass_of", "what the mass is of: the gas, or an element in it", line,
                     &words[2], fault))
        return fault->code;
    return put_words(out, words, fault);
}

int layout_emission_put(const Layout *out, size_t index, const Record *record)
{
    const Model *model = out->model;
    int status = NC_NOERR;
    for (int s = 0; s < model->mechanism->solved && status == NC_NOERR; s++) {
        if (out->emission[s] < 0 || !record->emission)
            continue;
        double value = GG_PER_KG * emission_kg_year(model, s, record->emission[s]);
        status = nc_put_var1_double(out->file, out->emission[s], &index, &value);
    }
    for (int i = 0; out->line >= 0 && i < model->schedule.lines && status == NC_NOERR; i++) {
        const size_t at[2] = {index, (size_t)i};
        double value = GG_PER_KG * schedule_emission(&model->schedule, i, record->time);
        status = nc_put_var1_double(out->file, out->line, at, &value);
    }
    return status;
}
