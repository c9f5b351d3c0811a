/* settle_text: a settled column and the sensitivities of an answer as tables for people, as CSV and as JSON.
 * Writes to the stream it is given.
 */
#ifndef SKYMEND_SETTLE_TEXT_H
#define SKYMEND_SETTLE_TEXT_H

#include <stdio.h>

#include "sensitivity.h"
#include "steady.h"

typedef struct {
    const char *kind;
    char name[64];
    double change; /* of the answer per unit of ln(parameter) */
    double f;      /* 0: none published or none applies */
    double effect; /* of one published uncertainty on the answer */
} Entry;

typedef struct {
    Entry *entry;
    int count;
} Ranking;

typedef struct {
    Ranking reactions; /* by what the published uncertainty does to the answer, most first */
    Ranking borders;   /* by what the parameter does: ground, held profiles, eddy diffusion by bands */
} Rankings;

/* Owner: caller, rankings_free. */
int rankings_make(Rankings *rankings, const Sensitivity *sensitivity, const Unsplit *unsplit, const double *x,
                  Fault *fault);
void rankings_free(Rankings *rankings);

/* year: the surface values are those of its middle. */
void settled_print(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                   int year);
void settled_csv(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                 int year);
/* Begins an object (RFC 8259) and leaves it open for rankings_json; the caller closes it. */
void settled_json(FILE *out, const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                  int year);

/* name: of the answer. rows: of a table. */
void rankings_print(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings,
                    int rows);
void rankings_csv(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings);
void rankings_json(FILE *out, const Sensitivity *sensitivity, const char *name, const Rankings *rankings);

#endif
