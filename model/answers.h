/* answers: what an analyst asks of a finished file, as one list of numbers with their units, numerical errors
 * and methods. The list is told as a table (answers_text.c), CSV and JSON (answers_files.c), and stored in
 * the file (answers_store.c); a new answer is a call of answers_add and shows up in all of them.
 */
#ifndef SKYMEND_ANSWERS_H
#define SKYMEND_ANSWERS_H

#include <stdio.h>

#include "odp_weights.h"
#include "series.h"

/* ---- numerical errors ---- */

/* How far the numerics may be off, in the unit of each series; NAN: not known. Of a value; of its change
 * against a benchmark year; of the difference between two cases in a year, and of the mean of that difference
 * over many years. */
typedef struct {
    double level[SERIES_KINDS], change[SERIES_KINDS];
    double difference[SERIES_KINDS], mean_difference[SERIES_KINDS];
} NumericalErrors;

/* All unknown. */
void errors_unknown(NumericalErrors *errors);
/* The table numerical-error.csv in the folder of the data: errors measured on the baseline. The rows of one
 * series and `of` are causes of their own and add up. FAULT_INPUT as for every table. */
int errors_read(NumericalErrors *errors, const char *path, Fault *fault);

/* ---- the list ---- */

typedef struct {
    char id[80]; /* also, after "answer_", the name of its variable */
    char label[160];
    char unit[24];  /* as NetCDF tools read it; "year" of a point in time is a decimal year */
    double value;   /* NAN: there is none, and note says why */
    double error;   /* numerical, in the unit; NAN: not known */
    char note[200]; /* "": nothing to remark */
    char method[400];
    int detail; /* 1: for CSV and JSON alone; the file holds what it is made of and needs no variable more */
} FileAnswer;

/* What is told of emissions besides the list: calendar years (answers_emission.h). */
struct OdpTable;

typedef struct {
    FileAnswer *item; /* [count] */
    int count, room;
    int benchmark_year;
    double smooth_years;
    char error_source[300]; /* where the errors come from */
    struct OdpTable *odp;   /* NULL: nothing of emissions */
} Answers;

typedef struct {
    int benchmark_year;
    double smooth_years; /* window of the running mean, greater than 0 */
} AnswerWish;

/* Eleven years: a whole solar cycle, the longest regular variation a case can have, is in every window, and
 * so cancels. */
#define ANSWERS_SMOOTH_YEARS 11.0
#define ANSWERS_BENCHMARK 1980

/* The answers a single file gives. Owner: caller, answers_free. */
int answers_compute(Answers *answers, const FileSeries *file, const AnswerWish *wish,
                    const NumericalErrors *errors, Fault *fault);
/* Add those that set it against another file over the years both cover: time integrals and means of the
 * difference, its extreme, and the delay of the return. FAULT_INPUT when no interval is in both, or when
 * intervals do not match. */
int answers_against(Answers *answers, const FileSeries *file, const FileSeries *reference,
                    const NumericalErrors *errors, Fault *fault);
/* Add emissions in ODP-tonnes, by both kinds of weights; with a reference (NULL: none) their difference over
 * the time both cover. Nothing is added where the file gives no emissions. weights are borrowed as long as
 * the answers live. See answers_emission.h for what counts. */
int answers_emission(Answers *answers, const FileSeries *file, const FileSeries *reference,
                     const OdpWeights *weights, Fault *fault);
/* Errors as the differences from the same answers of finer runs. */
void answers_compare(Answers *answers, const Answers *finer);
/* FAULT_INPUT unless finer is the case of file (both resolved cases in their attributes) with nothing but
 * numerics, the refreshing of the day or the grid changed, and at least one of those. */
int answers_check_finer(const FileSeries *file, const FileSeries *finer, Fault *fault);
void answers_free(Answers *answers);

/* A new entry at the end, filled with NAN and ""; NULL with a fault. id as printf would. */
FileAnswer *answers_add(Answers *answers, const char *unit, Fault *fault, const char *id, ...)
    __attribute__((format(printf, 4, 5)));
/* NULL: no such entry. */
const FileAnswer *answers_find(const Answers *answers, const char *id, ...)
    __attribute__((format(printf, 2, 3)));
/* A unit as people read it, led by before: "ppt" of "1e-12"; "" of a pure number. */
void answers_unit_word(char *word, size_t size, const char *before, const char *unit);
/* "" or "_smoothed": the end of an id. */
const char *answers_ending(int smoothed);
/* Unsmoothed view of a kind, or the smoothed one in store [4 * count]. */
Series answers_series(const Answers *answers, const FileSeries *file, int kind, int smoothed, double *store);

/* ---- telling them ---- */

/* Whether the tables by calendar year show this one: decades, ends, benchmark; all of a short file. */
int answers_year_shown(const Answers *answers, const FileSeries *file, int year);
/* The table, reference NULL when there is none. */
void answers_print(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out);
/* id,label,value,unit,numerical_error,note,method; a row per answer. */
void answers_csv(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out);
/* The same as JSON, with the means of calendar years of every series of the file. */
void answers_json(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out);
/* Into the NetCDF file at path, which must not be open: a variable without dimensions per answer that is no
 * detail.
 * FAULT_OUTPUT when it cannot be written; space is reserved first, so that a full disk leaves the file as it
 * was. */
int answers_store(const Answers *answers, const char *path, Fault *fault);

#endif
