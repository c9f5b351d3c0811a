/* archive: the NetCDF-4 file of a projection, CF-1.10.
 *
 * One unlimited dimension time (mid-interval, with bounds), altitude with bounds. Each record is the mean
 * over its interval; after each record the file is synchronised, so that an interrupted run leaves a file
 * that opens with every finished interval in it. Never written over an existing file unless overwrite is set.
 */
#ifndef SKYMEND_ARCHIVE_H
#define SKYMEND_ARCHIVE_H

#include "column.h"

typedef struct Archive Archive;

typedef struct {
    double time, time_start, time_end; /* decimal years; written as days since 1950-01-01, see calendar.h */
    const double *x;                   /* [solved][padded] mean mole fractions over the interval */
    double ozone_column;               /* DU, mean over the interval */
    const double *moments; /* [MOMENTS][solved][padded] means over the interval of the mole fractions by time
                              of day (moments.h) when the case asks for them, else NULL */
    const double *rate; /* [reactions][padded] mean rates of reaction, cm-3 s-1; NULL: the budget is left out
                           of this record */
    const double *temperature_change; /* [layers] K against the base atmosphere, mean over the interval; NULL:
                                         not known, left as missing */
    const double *emission; /* [solved] what is given off, molecules cm-2 s-1, mean over the interval: of a
                               gas that the ground keeps at a value what comes through the ground and is
                               emitted besides, of others what is emitted; NULL: not known, left as missing */
} Record;

/* command_line goes into history. Fault FAULT_OUTPUT (exit 4) when the path cannot be written, FAULT_INPUT
 * when it exists and overwrite is 0. On a later write failure (disk full) the file is closed valid or
 * removed. */
int archive_create(Archive **made, const Model *model, const char *path, int overwrite,
                   const char *command_line, Fault *fault);
/* Append and synchronise. Non-finite values: FAULT_NUMERICS naming year, altitude, species; nothing is
 * written. */
int archive_append(Archive *archive, const Record *record, Fault *fault);
/* Run summary as global attributes (counts, ledger closure of Cl, Br, N, H), then close. column may be NULL.
 */
int archive_close(Archive *archive, const Column *column, Fault *fault);
/* Close and remove the file when no record was written, otherwise close it as it is. For failure paths;
 * accepts NULL. */
void archive_abandon(Archive *archive);

/* NetCDF variable name of a species: "CFC-11" -> "CFC_11", "O(1D)" -> "O_1D". */
void archive_name(const char *species, char *name, size_t size);

#endif
