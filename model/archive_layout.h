/* archive_layout: what stands in the file of a projection: dimensions, variables, attributes. Private to
 * archive.
 *
 * archive.c looks after the life of the file (space, synchronising, replacing); this module looks after its
 * content. Every function returns FAULT_OUTPUT with the library's own words when a call fails.
 */
#ifndef SKYMEND_ARCHIVE_LAYOUT_H
#define SKYMEND_ARCHIVE_LAYOUT_H

#include "archive.h"
#include "budget.h"
#include "ultraviolet.h"

#define LAYOUT_ULTRAVIOLET 6 /* series of the ultraviolet at the ground */

/* An open NetCDF-4 file and the variables that records go to. Everything is borrowed. */
typedef struct {
    const Model *model;
    const char *path;              /* for messages */
    int file;                      /* NetCDF id */
    int time, time_bounds, column; /* variable ids, set by layout_define */
    int change; /* variable id of the temperature change, set by layout_define; -1: temperature does not vary
                 */
    int *fraction; /* [solved] variable ids, set by layout_define */
    int *course; /* [solved] variable ids of the mole fractions by time of day, -1 for a species without; NULL
                    when the case does not ask for them. Set by layout_moments; owner: archive */
    OxBook *book;               /* NULL: the mechanism has no odd oxygen and the file no budget */
    int term[BUDGET_TERMS + 1]; /* variable ids of the odd-oxygen budget, the net last */
    int *lifetime;              /* [solved] variable ids, -1 for a gas that is no source gas */
    int *emission;            /* [solved] variable ids, -1 for a gas that neither schedule nor ground gives */
    int line;                 /* variable id of the emission by line of the schedule, -1: it has none */
    double *budget;           /* [BUDGET_TERMS + 1][padded] work */
    Ultraviolet *ultraviolet; /* NULL: a model without spectra, and the file has no ultraviolet. Owner:
                                 archive */
    int series[LAYOUT_ULTRAVIOLET]; /* variable ids of it */
} Layout;

/* A variable with its attributes; NULL: left out. */
typedef struct {
    const char *name, *units, *standard, *longer, *methods;
} Description;

/* Define everything in a new file and write what does not change with time. FAULT_INPUT when two species
 * would have the same variable name, or when SOURCE_DATE_EPOCH is no number. */
int layout_define(Layout *out, const char *command_line, Fault *fault);
/* The same for the mole fractions by time of day, NAME_course(time, local_time, altitude); before
 * layout_define ends the definitions. time, altitude: dimension ids. FAULT_INPUT when it is light or dark
 * for 24 h. In archive_moments.c. */
int layout_moments(Layout *out, int time, int altitude, Fault *fault);
/* Write record number `record` of them: moments as in Record. */
int layout_put_moments(const Layout *out, size_t record, const double *moments, Fault *fault);
/* Counts of the run and the ledger of Cl, Br, N, H (atoms cm-2) as global attributes. */
int layout_summary(const Layout *out, const Column *column, Fault *fault);
/* Define one variable of doubles. chunk [dimensions] or NULL: the library's choice. */
int layout_variable(const Layout *out, const Description *description, int dimensions, const int *dimension,
                    const size_t *chunk, int *variable, Fault *fault);
/* A NetCDF status as a fault (0 when it is none): "path: cannot write what: ...". */
int layout_fault(const char *path, int status, const char *what, Fault *fault);

/* ---- archive_budget.c: the budget of odd oxygen and the lifetimes ---- */

/* Number of variables layout_budget_define makes. */
size_t layout_budget_variables(const Layout *out);
/* Define them (time, altitude: dimension ids); nothing when book is NULL. */
int layout_budget_define(Layout *out, int time, int altitude, size_t time_chunk, Fault *fault);
/* Write those of one record; nothing when book or record->rate is NULL. A NetCDF status. */
int layout_budget_put(const Layout *out, size_t index, const Record *record);

/* ---- archive_emission.c: emissions by gas and by line ---- */

/* Number of variables layout_emission_define makes. */
size_t layout_emission_variables(const Layout *out);
/* Define them (time: dimension id). */
int layout_emission_define(Layout *out, int time, size_t time_chunk, Fault *fault);
/* Write those of one record. A NetCDF status. */
int layout_emission_put(const Layout *out, size_t index, const Record *record);
/* ---- archive_ultraviolet.c: the ultraviolet at the ground ---- */

/* Define its LAYOUT_ULTRAVIOLET series; nothing when ultraviolet is NULL. */
int layout_ultraviolet_define(Layout *out, int time, size_t time_chunk, Fault *fault);
/* Compute and write those of one record. A NetCDF status. */
int layout_ultraviolet_put(const Layout *out, size_t index, const Record *record);

#endif
