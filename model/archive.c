/* archive: see archive.h.
 *
 * What keeps the file whole when a run ends badly:
 *   - a record is one chunk of each variable, written once and never moved, so that a run killed between
 *     two synchronisations leaves every earlier record readable. Chunks so small are not worth deflating
 *     (15 % of the file);
 *   - before a record is handed to the library, space for it is reserved and released again. A full disk
 *     or quota is thus met while the file on disk is still consistent, not half-way through a flush;
 *   - an existing file is replaced (rename, same folder) only after the first record of the new one is
 *     written.
 *
 * The NetCDF library is not thread-safe: archives of several columns are written from one thread at a time.
 */
#define _XOPEN_SOURCE 700 /* realpath */
#include "archive.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <netcdf.h>

#include "archive_layout.h"
#include "calendar.h"
#include "moments.h"
#include "room.h"

#define CM_PER_KM 1e5

enum {
    INDEX_BYTES = 16384,   /* room a variable's chunk index may take when its nodes split */
    SUMMARY_BYTES = 131072 /* room for the run summary and what closing writes */
};

struct Archive {
    Layout out;    /* model, NetCDF id (-1 when closed), variables */
    char *path;    /* where the file is to stand (links resolved) */
    char *current; /* where it stands now: path, or a name beside it until the first record is written */
    int probe;     /* descriptor of the same file, for reserving space and fsync; -1 when none */
    size_t records;
    double last_end; /* decimal years; end of the last record */
    int broken;      /* a library call failed: what is on disk must be looked at before it is kept */
};

/* ---- failures ---- */

/* Of the NetCDF library. */
static int library_fault(Archive *archive, int status, const char *what, Fault *fault)
{
    if (status != NC_NOERR)
        archive->broken = 1;
    return layout_fault(archive->path, status, what, fault);
}

/* Of the system; error is an errno value. */
static int system_fault(const char *path, const char *what, int error, Fault *fault)
{
    return fault_set(fault, FAULT_OUTPUT, "%s: cannot %s: %s; choose a place that can be written", path, what,
                     strerror(error));
}

/* Whether the file has room to grow by bytes. */
static int reserve_space(const Archive *archive, size_t bytes, Fault *fault)
{
    int error = room_reserve(archive->probe, bytes);
    if (error)
        return fault_set(
            fault, FAULT_OUTPUT,
            "%s: no room for another %zu kB (%zu records written so far): %s; free some space or "
            "write elsewhere",
            archive->path, (bytes + 1023) / 1024, archive->records, strerror(error));
    return 0;
}

/* ---- making and ending ---- */

static void archive_free(Archive *archive)
{
    if (archive->probe >= 0)
        close(archive->probe);
    free(archive->path);
    free(archive->current);
    free(archive->out.fraction);
    free(archive->out.course);
    free(archive->out.lifetime);
    free(archive->out.emission);
    free(archive->out.budget);
    ox_book_free(archive->out.book);
    ultraviolet_free(archive->out.ultraviolet);
    free(archive);
}

/* Decide where the file is to stand and, if another stands there, under which name it grows up. */
static int choose_path(Archive *archive, const char *path, int overwrite, Fault *fault)
{
    struct stat old;
    int exists = stat(path, &old) == 0;
    if (exists && !overwrite)
        return fault_set(fault, FAULT_INPUT, "%s exists already: choose another name, or add --overwrite",
                         path);
    if (exists && !S_ISREG(old.st_mode))
        return fault_set(fault, FAULT_OUTPUT, "%s is not a regular file and cannot be replaced", path);
    if (exists && access(path, W_OK))
        return system_fault(path, "replace the file", errno, fault);
    archive->path = exists ? realpath(path, NULL) : strdup(path);
    if (!archive->path)
        return exists ? system_fault(path, "follow the path", errno, fault) : fault_memory(fault, "a path");
    size_t size = strlen(archive->path) + 40;
    archive->current = malloc(size);
    if (!archive->current)
        return fault_memory(fault, "a path");
    snprintf(archive->current, size, exists ? "%s.part-%ld" : "%s", archive->path, (long)getpid());
    return 0;
}

int archive_create(Archive **made, const Model *model, const char *path, int overwrite,
                   const char *command_line, Fault *fault)
{
    *made = NULL;
    Archive *archive = calloc(1, sizeof *archive);
    if (!archive)
        return fault_memory(fault, "the archive");
    archive->out.model = model;
    archive->out.file = archive->probe = -1;
    archive->last_end = -INFINITY;
    archive->out.fraction = calloc((size_t)model->mechanism->solved + 1, sizeof *archive->out.fraction);
    archive->out.lifetime = calloc((size_t)model->mechanism->solved + 1, sizeof *archive->out.lifetime);
    archive->out.emission = calloc((size_t)model->mechanism->solved + 1, sizeof *archive->out.emission);
    archive->out.budget = calloc((BUDGET_TERMS + 1) * (size_t)model->grid.padded, sizeof(double));
    if (!archive->out.fraction || !archive->out.lifetime || !archive->out.emission || !archive->out.budget)
        fault_memory(fault, "the archive");
    else if (ox_book_possible(model->mechanism, NULL))
        ox_book_make(&archive->out.book, model->mechanism, fault);
    if (!fault->code && model->spectra)
        ultraviolet_make(&archive->out.ultraviolet, model, NULL, fault);
    if (fault->code || choose_path(archive, path, overwrite, fault)) {
        archive_free(archive);
        return fault->code;
    }
    archive->out.path = archive->path;
    /* Made here and not by the library: exclusive, and with the system's own word on what is wrong. */
    archive->probe = open(archive->current, O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (archive->probe < 0) {
        system_fault(archive->current, "create the file", errno, fault);
        archive_free(archive);
        return fault->code;
    }
    size_t variables = (size_t)model->mechanism->solved * (model->settings.moments == MOMENTS_NONE ? 1 : 2) +
                       layout_budget_variables(&archive->out) + layout_emission_variables(&archive->out) +
                       LAYOUT_ULTRAVIOLET;
    size_t bytes = SUMMARY_BYTES + variables * INDEX_BYTES;
    int status = NC_NOERR;
    if (!reserve_space(archive, bytes, fault))
        status = nc_create(archive->current, NC_NETCDF4 | NC_CLOBBER, &archive->out.file);
    if (status != NC_NOERR)
        archive->out.file = -1;
    if (fault->code || library_fault(archive, status, "the file", fault) ||
        layout_define(&archive->out, command_line, fault)) {
        archive_abandon(archive);
        return fault->code;
    }
    *made = archive;
    return 0;
}

/* Whether the file at path opens and holds records. */
static int readable(const char *path, size_t records)
{
    int file, dimension;
    size_t found = 0;
    if (nc_open(path, NC_NOWRITE, &file) != NC_NOERR)
        return 0;
    int fine = nc_inq_dimid(file, "time", &dimension) == NC_NOERR &&
               nc_inq_dimlen(file, dimension, &found) == NC_NOERR && found >= records;
    nc_close(file);
    return fine;
}

void archive_abandon(Archive *archive)
{
    if (!archive)
        return;
    int closed = archive->out.file < 0 || nc_close(archive->out.file) == NC_NOERR;
    if (archive->records == 0 ||
        ((archive->broken || !closed) && !readable(archive->current, archive->records)))
        unlink(archive->current);
    archive_free(archive);
}

/* ---- records ---- */

static int check_record(const Archive *archive, const Record *record, Fault *fault)
{
    const Model *model = archive->out.model;
    if (!isfinite(record->time) || !isfinite(record->time_start) || !isfinite(record->time_end))
        return fault_set(fault, FAULT_NUMERICS, "%s: the time of record %zu is not finite", archive->path,
                         archive->records + 1);
    if (!(record->time_start >= archive->last_end - 1e-6 && record->time_start <= record->time &&
          record->time <= record->time_end && record->time_start < record->time_end &&
          record->time_start >= 1.0))
        return fault_set(fault, FAULT_NUMERICS,
                         "%s: record %zu covers %.6f to %.6f (time %.6f), which does not follow "
                         "the one before",
                         archive->path, archive->records + 1, record->time_start, record->time_end,
                         record->time);
    for (int s = 0; s < model->mechanism->solved; s++)
        for (int i = 0; i < model->grid.layers; i++) {
            double x = record->x[FIELD(model->grid.padded, s, i)];
            if (!isfinite(x))
                return fault_set(
                    fault, FAULT_NUMERICS,
                    "year %.2f, %.2f km: the mole fraction of %s is %g; the record is not written",
                    record->time, model->grid.middle[i] / CM_PER_KM, mechanism_name(model->mechanism, s), x);
        }
    size_t all = record->moments ? MOMENTS * (size_t)model->mechanism->solved : 0;
    for (size_t row = 0; row < all; row++)
        for (int i = 0; i < model->grid.layers; i++) {
            double x = record->moments[FIELD(model->grid.padded, row, i)];
            if (!isfinite(x))
                return fault_set(fault, FAULT_NUMERICS,
                                 "year %.2f, %.2f km: the mole fraction of %s at %s is %g; the record is not "
                                 "written",
                                 record->time, model->grid.middle[i] / CM_PER_KM,
                                 mechanism_name(model->mechanism, (int)row % model->mechanism->solved),
                                 moment_name(&model->settings, (int)row / model->mechanism->solved), x);
        }
    if ((archive->out.course != NULL) != (record->moments != NULL))
        return fault_set(fault, FAULT_NUMERICS, "%s: record %zu %s values by time of day", archive->path,
                         archive->records + 1, record->moments ? "holds unasked" : "lacks");
    if (!isfinite(record->ozone_column))
        return fault_set(fault, FAULT_NUMERICS,
                         "year %.2f: the ozone column (O3, whole column) is %g; the record is "
                         "not written",
                         record->time, record->ozone_column);
    return 0;
}

static int put_record(Archive *archive, const Record *record, Fault *fault)
{
    const Model *model = archive->out.model;
    const size_t start[2] = {archive->records, 0}, one[2] = {1, (size_t)model->grid.layers}, pair[2] = {1, 2};
    const double middle = calendar_days(record->time);
    const double bounds[2] = {calendar_days(record->time_start), calendar_days(record->time_end)};
    for (int s = 0; s < model->mechanism->solved; s++)
        if (library_fault(archive,
                          nc_put_vara_double(archive->out.file, archive->out.fraction[s], start, one,
                                             record->x + FIELD(model->grid.padded, s, 0)),
                          mechanism_name(model->mechanism, s), fault))
            return fault->code;
    if (archive->out.change >= 0 && record->temperature_change &&
        library_fault(archive,
                      nc_put_vara_double(archive->out.file, archive->out.change, start, one,
                                         record->temperature_change),
                      "temperature_change", fault))
        return fault->code;
    if (record->moments && layout_put_moments(&archive->out, archive->records, record->moments, fault)) {
        archive->broken = 1;
        return fault->code;
    }
    if (library_fault(archive, layout_budget_put(&archive->out, archive->records, record), "the budget",
                      fault) ||
        library_fault(archive, layout_emission_put(&archive->out, archive->records, record), "the emissions",
                      fault) ||
        library_fault(archive, layout_ultraviolet_put(&archive->out, archive->records, record),
                      "the ultraviolet", fault) ||
        library_fault(
            archive,
            nc_put_vara_double(archive->out.file, archive->out.column, start, one, &record->ozone_column),
            "ozone_column", fault) ||
        library_fault(archive,
                      nc_put_vara_double(archive->out.file, archive->out.time_bounds, start, pair, bounds),
                      "time_bnds", fault) ||
        library_fault(archive, nc_put_vara_double(archive->out.file, archive->out.time, start, one, &middle),
                      "time", fault))
        return fault->code;
    return library_fault(archive, nc_sync(archive->out.file), "a record", fault);
}

/* Take the place of the file that is to be replaced; nothing to do when the archive stands there already. */
static int take_place(Archive *archive, Fault *fault)
{
    if (strcmp(archive->current, archive->path) == 0)
        return 0;
    if (rename(archive->current, archive->path))
        return system_fault(archive->path, "replace the file", errno, fault);
    strcpy(archive->current, archive->path); /* the shorter of the two */
    return 0;
}

int archive_append(Archive *archive, const Record *record, Fault *fault)
{
    const Model *model = archive->out.model;
    size_t variables = (size_t)model->mechanism->solved + 4 + LAYOUT_ULTRAVIOLET +
                       layout_budget_variables(&archive->out) + layout_emission_variables(&archive->out);
    size_t bytes = 2 * variables * (size_t)model->grid.layers * sizeof(double) + variables * INDEX_BYTES;
    if (record->moments)
        bytes += (size_t)model->mechanism->solved *
                 (2 * MOMENTS * (size_t)model->grid.layers * sizeof(double) + INDEX_BYTES);
    if (archive->broken)
        return fault_set(fault, FAULT_OUTPUT, "%s: an earlier write failed, nothing can be added",
                         archive->path);
    if (check_record(archive, record, fault) || reserve_space(archive, bytes, fault) ||
        put_record(archive, record, fault) || take_place(archive, fault))
        return fault->code;
    archive->records++;
    archive->last_end = record->time_end;
    return 0;
}

int archive_close(Archive *archive, const Column *column, Fault *fault)
{
    if (archive->broken)
        fault_set(fault, FAULT_OUTPUT, "%s: an earlier write failed", archive->path);
    else if (!reserve_space(archive, SUMMARY_BYTES, fault) && column)
        layout_summary(&archive->out, column, fault);
    if (!fault->code)
        library_fault(archive, nc_sync(archive->out.file), "the run summary", fault);
    if (!fault->code) {
        int status = nc_close(archive->out.file);
        archive->out.file = -1;
        library_fault(archive, status, "the end of the file", fault);
    }
    if (!fault->code && fsync(archive->probe))
        system_fault(archive->path, "bring the file to the disk", errno, fault);
    if (!fault->code)
        take_place(archive, fault);
    if (fault->code) {
        archive_abandon(archive);
        return fault->code;
    }
    archive_free(archive);
    return 0;
}
