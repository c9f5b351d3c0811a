/* equivalent_chlorine_file: equivalent chlorine out of the file of a projection and into it. */
#define _XOPEN_SOURCE 700 /* realpath */
#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <netcdf.h>

#include "../chem/equation.h"
#include "equivalent_chlorine.h"
#include "series.h"

/* ---- reading ---- */

typedef struct {
    int file;
    const char *path;
    int time, altitude; /* dimension ids */
    size_t records;
    size_t lowest; /* index of the lowest layer */
} Open;

static int find_lowest(Open *in, Fault *fault)
{
    size_t layers;
    int variable;
    if (nc_inq_dimid(in->file, "time", &in->time) != NC_NOERR ||
        nc_inq_dimlen(in->file, in->time, &in->records) != NC_NOERR ||
        nc_inq_dimid(in->file, "altitude", &in->altitude) != NC_NOERR ||
        nc_inq_dimlen(in->file, in->altitude, &layers) != NC_NOERR ||
        nc_inq_varid(in->file, "altitude", &variable) != NC_NOERR || layers < 1)
        return fault_set(fault, FAULT_INPUT, "%s has no times and altitudes: is it a Skymend file?",
                         in->path);
    double *altitude = malloc(layers * sizeof *altitude);
    if (!altitude)
        return fault_memory(fault, "altitudes");
    int status = nc_get_var_double(in->file, variable, altitude);
    in->lowest = 0;
    for (size_t l = 1; status == NC_NOERR && l < layers; l++)
        if (altitude[l] < altitude[in->lowest]) /* other tools may have turned the axis over */
            in->lowest = l;
    free(altitude);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s: cannot read altitude: %s", in->path, nc_strerror(status));
    return 0;
}

/* Whether a variable is the mole fraction of a source gas with chlorine or bromine, and which: *is. */
static int look_at(const Open *in, int variable, int *is, SurfaceGas *gas, Fault *fault)
{
    int dimensions, dimension[NC_MAX_VAR_DIMS];
    char formula[MECHANISM_NAME], name[NC_MAX_NAME + 1];
    *is = 0;
    if (nc_inq_var(in->file, variable, name, NULL, &dimensions, dimension, NULL) != NC_NOERR ||
        dimensions != 2 || dimension[0] != in->time || dimension[1] != in->altitude ||
        !series_text(in->file, variable, "species", gas->name, sizeof gas->name))
        return 0;
    if (!series_text(in->file, variable, "formula", formula, sizeof formula))
        return fault_set(
            fault, FAULT_INPUT,
            "%s: %s has no attribute formula, so that its chlorine is not known; make the file anew "
            "with this version",
            in->path, name);
    gas->chlorine = formula_atoms(formula, "Cl");
    gas->bromine = formula_atoms(formula, "Br");
    if (gas->chlorine < 0 || gas->bromine < 0)
        return fault_set(fault, FAULT_INPUT, "%s: %s has the formula \"%s\", which is none", in->path, name,
                         formula);
    *is = formula_atoms(formula, "C") > 0 && (gas->chlorine || gas->bromine);
    return 0;
}

static int read_lowest(const Open *in, int variable, const char *gas, double *fraction, Fault *fault)
{
    const size_t start[2] = {0, in->lowest}, count[2] = {in->records, 1};
    int status = nc_get_vara_double(in->file, variable, start, count, fraction);
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s: cannot read %s: %s", in->path, gas, nc_strerror(status));
    for (size_t r = 0; r < in->records; r++)
        if (!(fabs(fraction[r]) < 1.0)) /* the fill value of a record never written is far above */
            return fault_set(fault, FAULT_INPUT,
                             "%s: record %zu: %s is %g at the ground, which is no mole fraction", in->path,
                             r + 1, gas, fraction[r]);
    return 0;
}

static int read_gases(SurfaceSeries *series, Open *in, Fault *fault)
{
    int variables, is;
    if (find_lowest(in, fault))
        return fault->code;
    if (in->records != (size_t)series->count || nc_inq_nvars(in->file, &variables) != NC_NOERR)
        return fault_set(fault, FAULT_INPUT, "%s changed while it was read; try again", in->path);
    SurfaceGas *gas = malloc(((size_t)variables + 1) * sizeof *gas);
    int *source = malloc(((size_t)variables + 1) * sizeof *source), gases = 0;
    if (!gas || !source)
        fault_memory(fault, "the gases of a file");
    for (int v = 0; !fault->code && v < variables; v++) /* NetCDF numbers variables from 0 */
        if (!look_at(in, v, &is, &gas[gases], fault) && is)
            source[gases++] = v;
    double *time = series->time;
    SurfaceSeries full = {0};
    if (!fault->code && !surface_make(&full, series->count, gases, fault)) {
        memcpy(full.time, time, (size_t)series->count * sizeof *time);
        memcpy(full.gas, gas, (size_t)gases * sizeof *gas);
        for (int g = 0; g < gases && !fault->code; g++)
            read_lowest(in, source[g], gas[g].name, full.fraction + (size_t)g * in->records, fault);
        surface_free(series);
        *series = full;
    }
    free(gas);
    free(source);
    return fault->code;
}

int surface_read(SurfaceSeries *series, const char *path, Fault *fault)
{
    FileSeries column = {0};
    Open in = {.path = path};
    memset(series, 0, sizeof *series);
    int code = series_read(&column, path, NULL, fault); /* the clock of the file, checked */
    if (!code)
        code = surface_make(series, column.count, 0, fault);
    if (!code)
        memcpy(series->time, column.middle, (size_t)column.count * sizeof *column.middle);
    series_free(&column);
    if (!code) {
        int status = nc_open(path, NC_NOWRITE, &in.file);
        if (status != NC_NOERR) {
            code = fault_set(fault, FAULT_INPUT, "%s: cannot be read: %s", path, nc_strerror(status));
        } else {
            code = read_gases(series, &in, fault);
            nc_close(in.file);
        }
    }
    if (code)
        surface_free(series);
    return code;
}

int equivalent_chlorine_read(EquivalentChlorine *out, const char *path, const char *data_dir, double mean_age,
                             Fault *fault)
{
    ReleaseTable table;
    SurfaceSeries series = {0};
    memset(out, 0, sizeof *out);
    int code = release_find_and_read(&table, data_dir, fault);
    if (!code)
        code = surface_read(&series, path, fault);
    if (!code)
        code = equivalent_chlorine_compute(out, &series, &table, mean_age, fault);
    surface_free(&series);
    release_free(&table);
    return code;
}

/* ---- writing ---- */

static int store_fault(const char *path, const char *why, Fault *fault)
{
    return fault_set(fault, FAULT_OUTPUT,
                     "%s: cannot add equivalent chlorine: %s; the file is whole without it; free some space "
                     "or write elsewhere",
                     path, why);
}

enum { TIME_CHUNK = 512 }; /* records per chunk, as for the other series of the file */

static int put_text(int file, int variable, const char *name, const char *text)
{
    return nc_put_att_text(file, variable, name, strlen(text), text);
}

/* The variable of a series, made where it is not there yet; a NetCDF status. The file is in define mode. */
static int define(int file, const char *name, const char *units, const char *longer, int *variable)
{
    const size_t chunk = TIME_CHUNK;
    int time, status = nc_inq_varid(file, name, variable);
    if (status == NC_ENOTVAR) {
        status = nc_inq_dimid(file, "time", &time);
        if (status == NC_NOERR)
            status = nc_def_var(file, name, NC_DOUBLE, 1, &time, variable);
        if (status == NC_NOERR)
            status = nc_def_var_chunking(file, *variable, NC_CHUNKED, &chunk);
    }
    if (status == NC_NOERR)
        status = put_text(file, *variable, "long_name", longer);
    if (status == NC_NOERR)
        status = put_text(file, *variable, "units", units);
    return status == NC_NOERR ? put_text(file, *variable, "cell_methods", "time: point") : status;
}

/* "equivalent_chlorine_55yr" for 5.5 years: mean ages are below 10, so digits without a point are unique. */
static void name_of(double mean_age, char *name, size_t size)
{
    char age[24];
    snprintf(age, sizeof age, "%g", mean_age);
    char *point = strchr(age, '.');
    if (point)
        memmove(point, point + 1, strlen(point));
    snprintf(name, size, "equivalent_chlorine_%syr", age);
}

static int put_one(int file, const EquivalentChlorine *chlorine)
{
    char name[60], known[70], longer[200], *comment;
    int variable, share;
    const size_t start = 0, count = (size_t)chlorine->count;
    name_of(chlorine->mean_age, name, sizeof name);
    snprintf(known, sizeof known, "%s_known", name);
    size_t size = strlen(chlorine->counted) + strlen(chlorine->left_out) + strlen(chlorine->source) + 1000;
    comment = malloc(size);
    if (!comment)
        return NC_ENOMEM;
    snprintf(
        comment, size,
        "Method of Newman et al. (2007, Atmos. Chem. Phys. 7, 4537) from the mole fractions in the lowest "
        "layer: age spectrum inverse Gaussian, mean age %g years, width %g years; bromine counts alpha = %g "
        "times. Before the first time the first values are held. Counted: %s. Left out, having no published "
        "fractional release (very short-lived gases usually are): %s. Fractional release: %s",
        chlorine->mean_age, chlorine->width, chlorine->alpha,
        chlorine->counted[0] ? chlorine->counted : "none",
        chlorine->left_out[0] ? chlorine->left_out : "none", chlorine->source);
    snprintf(longer, sizeof longer,
             "equivalent effective stratospheric chlorine at a mean age of air of %g years",
             chlorine->mean_age);
    int status = define(file, name, "1e-12", longer, &variable);
    if (status == NC_NOERR)
        status = put_text(file, variable, "comment", comment);
    if (status == NC_NOERR)
        status = put_text(file, variable, "ancillary_variables", known);
    if (status == NC_NOERR)
        status = nc_put_att_double(file, variable, "mean_age_years", NC_DOUBLE, 1, &chlorine->mean_age);
    if (status == NC_NOERR)
        status = nc_put_att_double(file, variable, "alpha", NC_DOUBLE, 1, &chlorine->alpha);
    snprintf(longer, sizeof longer, "share of the age spectrum of %g years that lies within the file",
             chlorine->mean_age);
    if (status == NC_NOERR)
        status = define(file, known, "1", longer, &share);
    if (status == NC_NOERR)
        status = nc_enddef(file);
    if (status == NC_NOERR)
        status = nc_put_vara_double(file, variable, &start, &count, chlorine->value);
    if (status == NC_NOERR)
        status = nc_put_vara_double(file, share, &start, &count, chlorine->known);
    free(comment);
    return status;
}

/* Of every mean age, into the copy; path: for messages. */
static int put_all(const char *path, const char *copy, const SurfaceSeries *series, const ReleaseTable *table,
                   Fault *fault)
{
    int file, status = nc_open(copy, NC_WRITE, &file);
    int opened = status == NC_NOERR;
    for (int a = 0; a < table->ages && status == NC_NOERR; a++) {
        EquivalentChlorine one;
        if (equivalent_chlorine_compute(&one, series, table, table->mean_age[a], fault))
            break;
        status = nc_redef(file);
        if (status == NC_NOERR)
            status = put_one(file, &one);
        equivalent_chlorine_free(&one);
    }
    int closed = opened ? nc_close(file) : NC_NOERR;
    if (status == NC_NOERR)
        status = closed;
    return status == NC_NOERR ? fault->code : store_fault(path, nc_strerror(status), fault);
}

/* Every byte of path into a new file of the same permissions, on the disk. An errno value. */
static int copy_file(const char *path, const char *copy)
{
    enum { BLOCK = 1 << 18 };
    struct stat status;
    char *block = malloc(BLOCK);
    int error = block ? 0 : ENOMEM, in = open(path, O_RDONLY | O_CLOEXEC), out = -1;
    if (!error && (in < 0 || fstat(in, &status)))
        error = errno;
    if (!error && (out = open(copy, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, status.st_mode & 0777)) < 0)
        error = errno;
    for (ssize_t got = 1; !error && got != 0;) {
        got = read(in, block, BLOCK);
        if (got < 0 && errno != EINTR)
            error = errno;
        for (ssize_t done = 0; !error && done < got;) {
            ssize_t put = write(out, block + done, (size_t)(got - done));
            if (put > 0)
                done += put;
            else if (put < 0 && errno != EINTR)
                error = errno;
        }
    }
    if (in >= 0)
        close(in);
    if (out >= 0 && close(out) && !error)
        error = errno;
    free(block);
    return error;
}

static int bring_to_disk(const char *path)
{
    int file = open(path, O_RDONLY | O_CLOEXEC);
    int error = file < 0 || fsync(file) ? errno : 0;
    if (file >= 0)
        close(file);
    return error;
}

static int exchange(const char *path, const SurfaceSeries *series, const ReleaseTable *table, Fault *fault)
{
    char *real = realpath(path, NULL); /* a link stays a link */
    if (!real)
        return store_fault(path, strerror(errno), fault);
    size_t size = strlen(real) + 40;
    char *copy = malloc(size);
    if (!copy) {
        free(real);
        return fault_memory(fault, "a path");
    }
    snprintf(copy, size, "%s.part-%ld", real, (long)getpid());
    int error = copy_file(real, copy);
    if (!error && !put_all(path, copy, series, table, fault)) {
        error = bring_to_disk(copy);
        if (!error && rename(copy, real))
            error = errno;
    }
    if (error)
        store_fault(path, strerror(error), fault);
    if (fault->code && error != EEXIST) /* a file of that name that is not ours stays */
        unlink(copy);
    free(real);
    free(copy);
    return fault->code;
}

int chlorine_store(const char *path, const ReleaseTable *table, Fault *fault)
{
    SurfaceSeries series = {0};
    int code = surface_read(&series, path, fault);
    if (!code)
        code = exchange(path, &series, table, fault);
    surface_free(&series);
    return code;
}
