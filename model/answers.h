/* answers: what an analyst asks of a finished file. */
#ifndef SKYMEND_ANSWERS_H
#define SKYMEND_ANSWERS_H

#include <stdio.h>

#include "../input/fault.h"

typedef struct {
    int count;
    double *time;   /* [count] decimal years, mid-interval */
    double *column; /* [count] ozone column, DU */
} ColumnSeries;

typedef struct {
    int has_minimum;
    double minimum_year, minimum;     /* lowest interval, DU */
    double benchmark_year, benchmark; /* the value to return to */
    int returns;        /* 1: returned; 0: not within the file; -1: never fell below or year not covered */
    double return_year; /* linear interpolation between intervals, decimal year */
} Answers;

int series_read(ColumnSeries *series, const char *path, Fault *fault);
void series_free(ColumnSeries *series);
/* Benchmark = the mean of intervals of calendar year benchmark_year. Return: after the minimum, the first
 * crossing back up. */
int answers_compute(Answers *answers, const ColumnSeries *series, int benchmark_year, Fault *fault);
/* The table of answers: minimum, decades (mean of the year), change against the benchmark, return year; with
 * the caution. */
void answers_print(const Answers *answers, const ColumnSeries *series, FILE *out);

#endif
