/* archive_moments: the mole fractions by time of day in the file of a projection.
 *
 * One variable per species with a dimension local_time, and not one per species and moment: a course is then
 * one object to select from (xarray: NO_course.sel(local_time=12)) or to plot, and the file has half as many
 * variables and a quarter as many chunks. The coordinate is a number, because text coordinates are beyond
 * cdo; what the hours are called stands in its flag_meanings. Its unit is written "h": xarray turns "hours"
 * into spans of time.
 */
#include "archive_layout.h"

#include <stdlib.h>
#include <string.h>

#include <netcdf.h>

#include "archive.h"
#include "moments.h"

static int put_text(const Layout *out, int variable, const char *name, const char *text, Fault *fault)
{
    return layout_fault(out->path, nc_put_att_text(out->file, variable, name, strlen(text), text), name,
                        fault);
}

static int define_local_time(const Layout *out, int *dimension, Fault *fault)
{
    const Settings *settings = &out->model->settings;
    int variable, global = settings->sun == SUN_GLOBAL;
    double hours[MOMENTS];
    char names[80] = "";
    if (moments_hours(settings, hours, fault))
        return fault->code;
    for (int m = 0; m < MOMENTS; m++) {
        strcat(names, m ? " " : "");
        strcat(names, moment_name(settings, m));
    }
    int status = nc_def_dim(out->file, "local_time", MOMENTS, dimension);
    if (status == NC_NOERR)
        status = nc_def_var(out->file, "local_time", NC_DOUBLE, 1, dimension, &variable);
    if (status == NC_NOERR)
        status = nc_put_att_double(out->file, variable, "flag_values", NC_DOUBLE, MOMENTS, hours);
    if (layout_fault(out->path, status, "local_time", fault) ||
        put_text(out, variable, "long_name", "local solar time of the case's sun", fault) ||
        put_text(out, variable, "units", "h", fault) ||
        put_text(out, variable, "flag_meanings", names, fault) ||
        put_text(out, variable, "comment",
                 global
                     ? "Hours after midnight of the global sun, whose cosine of the zenith angle rises "
                       "linearly from 0 at sunrise to 1 at noon."
                     : "Hours after midnight of the sun at sun.latitude_deg on sun.day_of_year; at dawn and "
                       "dusk it stands 11.5 degrees below the horizon.",
                 fault))
        return fault->code;
    return layout_fault(out->path, nc_put_var_double(out->file, variable, hours), "local_time", fault);
}

static int define_course(const Layout *out, int s, const int *dimension, Fault *fault)
{
    static const char *const same[] = {"standard_name", "units", "species"};
    const size_t chunk[3] = {1, MOMENTS, (size_t)out->model->grid.layers};
    const char *species = mechanism_name(out->model->mechanism, s);
    char name[MECHANISM_NAME + 10], longer[MECHANISM_NAME + 80];
    int taken, from = out->fraction[s], *variable = &out->course[s];
    archive_name(species, name, MECHANISM_NAME + 2);
    strcat(name, "_course");
    if (nc_inq_varid(out->file, name, &taken) == NC_NOERR)
        return fault_set(
            fault, FAULT_INPUT,
            "species %s: \"%s\" cannot be a variable of its course through the day (taken); rename "
            "the species",
            species, name);
    int status = nc_def_var(out->file, name, NC_DOUBLE, 3, dimension, variable);
    if (status == NC_NOERR)
        status = nc_def_var_chunking(out->file, *variable, NC_CHUNKED, chunk);
    for (size_t a = 0; status == NC_NOERR && a < sizeof same / sizeof *same; a++) {
        int number;
        if (nc_inq_attid(out->file, from, same[a], &number) == NC_NOERR)
            status = nc_copy_att(out->file, from, same[a], out->file, *variable);
    }
    snprintf(longer, sizeof longer, "mole fraction of %s in air at moments of the local solar day", species);
    if (layout_fault(out->path, status, name, fault) ||
        put_text(out, *variable, "long_name", longer, fault) ||
        put_text(out, *variable, "cell_methods", "time: mean local_time: point altitude: mean", fault))
        return fault->code;
    return put_text(
        out, *variable, "comment",
        out->model->settings.day == DAY_EXPLICIT
            ? "Mean over the days of the interval at the same local solar time."
            : "Daily mean times the ratio of the moment to the daily mean of the last explicit day "
              "carried for the diurnal factors, averaged over the interval.",
        fault);
}

int layout_moments(Layout *out, int time, int altitude, Fault *fault)
{
    const Model *model = out->model;
    int local;
    if (model->settings.moments == MOMENTS_NONE)
        return 0;
    out->course = malloc((size_t)model->mechanism->solved * sizeof *out->course);
    if (!out->course)
        return fault_memory(fault, "the archive");
    if (define_local_time(out, &local, fault))
        return fault->code;
    const int dimension[3] = {time, local, altitude};
    for (int s = 0; s < model->mechanism->solved; s++) {
        out->course[s] = -1;
        if (moments_has(model, s) && define_course(out, s, dimension, fault))
            return fault->code;
    }
    return 0;
}

int layout_put_moments(const Layout *out, size_t record, const double *moments, Fault *fault)
{
    const Model *model = out->model;
    size_t field = (size_t)model->mechanism->solved * (size_t)model->grid.padded;
    for (int s = 0; s < model->mechanism->solved; s++)
        for (size_t m = 0; out->course[s] >= 0 && m < MOMENTS; m++) {
            const size_t start[3] = {record, m, 0}, count[3] = {1, 1, (size_t)model->grid.layers};
            int status = nc_put_vara_double(out->file, out->course[s], start, count,
                                            moments + m * field + FIELD(model->grid.padded, s, 0));
            if (layout_fault(out->path, status, mechanism_name(model->mechanism, s), fault))
                return fault->code;
        }
    return 0;
}
