/* schedule: what the ground is given by year: abundances of source gases, or their emissions line by line.
 *
 * Tidy CSV, a row per year, gas and line:  year,gas,kind,amount,unit,line  (language: README, "Schedule").
 * Several files are layered: the first is the base, each further one adds lines or changes what stands below.
 *
 * A gas is driven by its abundance up to its first year of emission at the ground and by its emissions from
 * the start of that year on. An abundance stands for mid-year; an emission is the mass of a calendar year,
 * given off evenly through it. A gas that has emissions only is not in the air before them, unless reactions
 * make it.
 */
#ifndef SKYMEND_SCHEDULE_H
#define SKYMEND_SCHEDULE_H

#include <stdio.h>

#include "fault.h"

/* One line of emissions of one gas, after layers, rules and banks have been worked out. */
typedef struct {
    int gas;               /* index */
    char *label;           /* the schedule's own word for it */
    char element[4];       /* "": amounts are masses of the gas itself; "N": of that element in it */
    double from_km, to_km; /* 0, 0: at the ground; else spread evenly over this height */
    int first_year, years;
    double *amount; /* [years] kg in the calendar year; never below 0 */
    int file, row;  /* where its first row stands: index in path[], line of the file */
    double *stock;  /* [years + 1] kg in the bank at the start of each year (with what is put in then) and at
                       the end; NULL: no bank */
} ScheduleLine;

/* The years that a file after the first speaks of, for one gas, kind and line. */
typedef struct {
    int file, row; /* of the first such row */
    int first_year, last_year;
} ScheduleSpan;

typedef struct {
    int gases;
    char (*gas)[32];             /* [gases] names, in order of first appearance */
    int *first_year;             /* [gases] of its abundances */
    int *years;                  /* [gases] number of consecutive years of abundance; 0: emissions only */
    int *file;                   /* [gases] file of the rows named next, index in path[] */
    int *first_line, *last_line; /* [gases] lines of the first and the last year of abundance (without any:
                                    first row of its first line), for messages */
    double **abundance; /* [gases][years] mole fraction, mol mol-1, global mean at mid-year; none beyond
                           the first year of emissions, whose own serves the way to it if there is one */
    int *emission_from; /* [gases] from the start of this year on emissions at the ground drive it; 0: never.
                           Emissions aloft do not count here: they come on top of whatever the ground does */
    int lines;
    ScheduleLine *line; /* [lines] in order of gas, then of first appearance */
    int spans;
    ScheduleSpan *span; /* [spans] see schedule_meets */
    int files;
    char **path;   /* [files] */
    char **header; /* [files] commented headers, for the archive */
} Schedule;

/* FAULT_INPUT at the first row of path[files] whose gas is none of known[count], with the nearest of them;
 * where names what knows them. Before schedule_read. */
int schedule_check_gases(const char *const *path, int files, const char *const *known, int count,
                         const char *where, Fault *fault);

/* path [count]: base first. Rows outside the run are read and checked as well. Owner: caller. */
int schedule_read(Schedule *schedule, const char *const *path, int count, Fault *fault);
void schedule_free(Schedule *schedule);

/* Index of gas or -1. */
int schedule_find(const Schedule *schedule, const char *gas);

/* Mole fraction of gas at decimal year time (1980.5 = mid-1980): linear between mid-years; constant for the
 * half year before the first. After the last mid-year: constant, but for a gas that its emissions
 * take over at the end of that year, which goes on with its last slope (never below 0), so that the
 * take-over has no kink. 0 of a gas without abundances. The caller makes sure with schedule_covers that the
 * run lies inside. */
double schedule_abundance(const Schedule *schedule, int gas, double time);

/* What drives the ground of gas at time: 1 its emissions, 0 its abundance. */
int schedule_emits(const Schedule *schedule, int gas, double time);

/* kg per year (365.25 days) that a line gives off at time: the amount of its calendar year, evenly; 0 outside
 * its years. */
double schedule_emission(const Schedule *schedule, int line, double time);

/* Fault naming the gas unless every gas has abundances from first_year to the year before its emissions take
 * over (or last_year), and some line of emission at the ground (0 may be written) in every year from then to
 * last_year. A gas without abundances is exempt before its first emission. Fault also for a bank whose years
 * end before last_year while it still holds something. */
int schedule_covers(const Schedule *schedule, int first_year, int last_year, Fault *fault);

/* Fault naming the row when a file after the first changes or adds a line in years that all lie outside
 * first_year..last_year, so that a run of these years would never see it. What concerns a bank counts also
 * when it lies before, since a stock carries on. For runs, not for questions about one year. */
int schedule_meets(const Schedule *schedule, int first_year, int last_year, Fault *fault);

/* What drives each gas when, and the lines with years and totals, every line of text led by prefix. */
void schedule_print(const Schedule *schedule, const char *prefix, FILE *out);

/* 1 when emissions have taken gas over from an abundance that is given for later years as well: its lines are
 * then all that is given off. */
int schedule_supersedes(const Schedule *schedule, int gas);

#endif
