/* archive_layout: what stands in the file of a projection: dimensions, variables, attributes. Private to
 * archive.
 *
 * archive.c looks after the life of the file (space, synchronising, replacing); this module looks after its
 * content. Every function returns FAULT_OUTPUT with the library's own words when a call fails.
 */
#ifndef SKYMEND_ARCHIVE_LAYOUT_H
#define SKYMEND_ARCHIVE_LAYOUT_H

#include "column.h"

/* An open NetCDF-4 file and the variables that records go to. Everything is borrowed. */
typedef struct {
    const Model *model;
    const char *path;              /* for messages */
    int file;                      /* NetCDF id */
    int time, time_bounds, column; /* variable ids, set by layout_define */
    int change; /* variable id of the temperature change, set by layout_define; -1: temperature does not vary
                 */
    int *fraction; /* [solved] variable ids, set by layout_define */
} Layout;

/* Define everything in a new file and write what does not change with time. FAULT_INPUT when two species
 * would have the same variable name, or when SOURCE_DATE_EPOCH is no number. */
int layout_define(Layout *out, const char *command_line, Fault *fault);
/* Counts of the run and the ledger of Cl, Br, N, H (atoms cm-2) as global attributes. */
int layout_summary(const Layout *out, const Column *column, Fault *fault);
/* A NetCDF status as a fault (0 when it is none): "path: cannot write what: ...". */
int layout_fault(const char *path, int status, const char *what, Fault *fault);

#endif
