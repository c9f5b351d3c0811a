/* record: mole fractions and temperature out of a file. */
#include "record.h"

#include <errno.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <netcdf.h>

#include "archive.h"
#include "calendar.h"

/* A whole variable of `count` values. */
static int read_whole(int file, const char *path, const char *name, size_t count, double *values,
                      Fault *fault)
{
    int variable, dimensions, dimension[NC_MAX_VAR_DIMS];
    size_t size = 1;
    if (nc_inq_varid(file, name, &variable) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s has no variable %s: is it a Skymend file?", path, name);
    int status = nc_inq_var(file, variable, NULL, NULL, &dimensions, dimension, NULL);
    for (int d = 0; d < dimensions && status == NC_NOERR; d++) {
        size_t length = 0;
        status = nc_inq_dimlen(file, dimension[d], &length);
        size *= length;
    }
    if (status == NC_NOERR && size != count)
        return fault_set(
            fault, FAULT_INPUT,
            "%s: %s has %zu values, the case needs %zu; name the case that the file was made with", path,
            name, size, count);
    if (status == NC_NOERR)
        status = nc_get_var_double(file, variable, values);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s: cannot read %s: %s", path, name, nc_strerror(status));
    return 0;
}

static int check_layers(const Model *model, int file, const char *path, Fault *fault)
{
    double edge[SETTINGS_MAX_EDGES];
    size_t edges = (size_t)model->grid.layers + 1;
    if (read_whole(file, path, "altitude_edge", edges, edge, fault))
        return fault->code;
    for (size_t e = 0; e < edges; e++)
        if (!(fabs(edge[e] - 1e-5 * model->grid.edge[e]) < 1e-6))
            return fault_set(
                fault, FAULT_INPUT,
                "%s: a layer edge at %g km, where the case has %g km; name the case that the file "
                "was made with",
                path, edge[e], 1e-5 * model->grid.edge[e]);
    return 0;
}

/* Mean of one gas over records first..last. all: [records][layers] work. */
static int read_gas(const Model *model, int file, const char *path, const char *gas, size_t records,
                    const int *in, double *all, double *row, Fault *fault)
{
    char name[MECHANISM_NAME + 2];
    size_t layers = (size_t)model->grid.layers, padded = (size_t)model->grid.padded;
    archive_name(gas, name, sizeof name);
    if (read_whole(file, path, name, records * layers, all, fault))
        return fault->code;
    for (size_t l = 0; l < layers; l++) {
        double sum = 0.0, taken = 0.0;
        for (size_t r = 0; r < records; r++) {
            sum += in[r] ? all[r * layers + l] : 0.0;
            taken += in[r];
        }
        row[l] = sum / taken;
        if (!(fabs(row[l]) < 1.0)) /* the fill value of a record never written is far above */
            return fault_set(fault, FAULT_INPUT, "%s: %s is %g at %g km, which is no mole fraction", path,
                             name, row[l], 1e-5 * model->grid.middle[l]);
    }
    for (size_t l = layers; l < padded; l++)
        row[l] = row[layers - 1];
    return 0;
}

/* Mean change of temperature over the same records. */
static int read_change(const Model *model, int file, const char *path, size_t records, const int *in,
                       double *all, double *change, Fault *fault)
{
    static const char name[] = "temperature_change";
    size_t layers = (size_t)model->grid.layers;
    int variable;
    memset(change, 0, layers * sizeof *change);
    if (nc_inq_varid(file, name, &variable) != NC_NOERR)
        return 0;
    if (read_whole(file, path, name, records * layers, all, fault))
        return fault->code;
    for (size_t l = 0; l < layers; l++) {
        double taken = 0.0;
        for (size_t r = 0; r < records; r++) {
            change[l] += in[r] ? all[r * layers + l] : 0.0;
            taken += in[r];
        }
        change[l] /= taken;
        if (!(fabs(change[l]) < 1000.0)) /* the fill value is far above */
            return fault_set(fault, FAULT_INPUT, "%s: %s is %g at %g km, which is no temperature", path, name,
                             change[l], 1e-5 * model->grid.middle[l]);
    }
    return 0;
}

/* x, change: NULL when not asked for. */
static int read_open(const Model *model, int file, const char *path, int year, const char *const *names,
                     int count, double *x, double *change, Fault *fault)
{
    int dimension, found = 0;
    size_t records = 0;
    if (nc_inq_dimid(file, "time", &dimension) != NC_NOERR ||
        nc_inq_dimlen(file, dimension, &records) != NC_NOERR || records < 1)
        return fault_set(fault, FAULT_INPUT, "%s holds no records: is it a Skymend file?", path);
    double *all = malloc(records * (size_t)(model->grid.layers + 1) * sizeof *all);
    int *in = calloc(records, sizeof *in),
        code = all && in ? 0 : fault_memory(fault, "the records of a file");
    if (!code)
        code = check_layers(model, file, path, fault);
    if (!code)
        code = read_whole(file, path, "time", records, all, fault);
    for (size_t r = 0; !code && r < records; r++)
        found += in[r] = all[r] >= calendar_days(year) && all[r] < calendar_days(year + 1.0);
    if (!code && !found)
        code = fault_set(fault, FAULT_INPUT, "%s has no record in %d; name a year it covers", path, year);
    for (int n = 0; !code && n < count; n++) {
        int s = mechanism_solved(model->mechanism, names[n]);
        if (s >= 0)
            code = read_gas(model, file, path, names[n], records, in, all,
                            x + FIELD(model->grid.padded, s, 0), fault);
    }
    if (!code && change)
        code = read_change(model, file, path, records, in, all, change, fault);
    free(all);
    free(in);
    return code;
}

static int read_path(const Model *model, const char *path, int year, const char *const *names, int count,
                     double *x, double *change, Fault *fault)
{
    int file, status = nc_open(path, NC_NOWRITE, &file);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s: cannot be read: %s", path, nc_strerror(status));
    int code = read_open(model, file, path, year, names, count, x, change, fault);
    nc_close(file);
    return code;
}

int record_read(const Model *model, const char *path, int year, const char *const *names, int count,
                double *x, Fault *fault)
{
    return read_path(model, path, year, names, count, x, NULL, fault);
}

int record_read_change(const Model *model, const char *path, int year, double *change, Fault *fault)
{
    return read_path(model, path, year, NULL, 0, NULL, change, fault);
}
