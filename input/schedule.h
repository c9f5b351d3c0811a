/* schedule: abundances of source gases by year.
 *
 * Tidy CSV, a row per year, gas and line:  year,gas,kind,amount,unit,line
 *   kind    abundance   (emission comes with a later version and is refused with a clear word)
 *   unit    ppt | ppb | ppm | mol/mol
 *   line    the schedule's own label
 * Years of a gas must be whole, without a gap and without a duplicate; a value stands for mid-year.
 */
#ifndef SKYMEND_SCHEDULE_H
#define SKYMEND_SCHEDULE_H

#include "fault.h"

typedef struct {
    int gases;
    char (*gas)[32];             /* [gases] names, in order of first appearance */
    int *first_year;             /* [gases] */
    int *years;                  /* [gases] number of consecutive years */
    int *first_line, *last_line; /* [gases] lines of the first and the last year, for messages */
    double **abundance;          /* [gases][years] mole fraction, mol mol-1, global mean at mid-year */
    char *path;
    char *header; /* commented header, for the archive */
} Schedule;

int schedule_read(Schedule *schedule, const char *path, Fault *fault);
void schedule_free(Schedule *schedule);

/* Index of gas or -1. */
int schedule_find(const Schedule *schedule, const char *gas);

/* Mole fraction of gas at decimal year time (1980.5 = mid-1980): linear between mid-years, constant
 * for the half year before the first and after the last mid-year. The caller makes sure with
 * schedule_covers that the run lies inside. */
double schedule_abundance(const Schedule *schedule, int gas, double time);

/* Fault naming the gas unless every gas has values for first_year..last_year. */
int schedule_covers(const Schedule *schedule, int first_year, int last_year, Fault *fault);

#endif
