/* equivalent_chlorine: equivalent effective stratospheric chlorine, EESC.
 *
 * How much chlorine, and bromine counted as chlorine, is free to destroy ozone in air of a mean age, told
 * from what the air held at the ground (Newman, Daniel, Waugh and Nash 2007, Atmos. Chem. Phys. 7, 4537):
 *
 *     EESC(t) = sum over gases of f (n_Cl + alpha n_Br) <x>(t)
 *
 * with n the atoms of a molecule, f the fractional release at that age, alpha the efficiency of bromine, and
 * <x> the mole fraction at the ground averaged over the age spectrum (age_spectrum.h), whose width is half
 * of the mean age. Mean ages of 3 and 5.5 years stand for the lower stratosphere of middle and of polar
 * latitudes. It is a figure of bookkeeping: nothing of the column's own transport and chemistry is in it.
 *
 * Counted are the source gases (those with carbon) that hold chlorine or bromine and have a value in the
 * table of fractional release. The others are named, never passed over in silence; very short-lived gases,
 * usually no part of EESC, are among them.
 */
#ifndef SKYMEND_EQUIVALENT_CHLORINE_H
#define SKYMEND_EQUIVALENT_CHLORINE_H

#include "../chem/mechanism.h"

#define RELEASE_FILE "fractional-release.csv" /* in the data folder */
#define CHLORINE_AGES 8                       /* most mean ages of a table */
#define CHLORINE_KNOWN                                                                                       \
    0.99 /* share of the spectrum within the series from which on a value is called known */

/* ---- fractional release ---- */

typedef struct {
    double mean_age;
    char gas[MECHANISM_NAME];
    double value;
} Release;

typedef struct {
    int ages;
    double mean_age[CHLORINE_AGES], alpha[CHLORINE_AGES]; /* years, in order of first appearance */
    int rows;
    Release *row;      /* [rows] */
    char source[1000]; /* the table's own "# source:", or its path */
} ReleaseTable;

/* Columns mean_age_year (0.5 to below 10), quantity ("alpha", "release"), of (Br; a gas), value. Faults name
 * file and line: unknown quantity, value out of range (release 0 to 1, alpha 0 to 1000), a row given twice, a
 * mean age without alpha. Owner: caller, release_free. */
int release_read(ReleaseTable *table, const char *path, Fault *fault);
/* The same of RELEASE_FILE in the data folder. */
int release_find_and_read(ReleaseTable *table, const char *data_dir, Fault *fault);
void release_free(ReleaseTable *table);
/* Fractional release of gas at a mean age; 1 if the table has it. */
int release_find(const ReleaseTable *table, double mean_age, const char *gas, double *value);

/* ---- the series ---- */

typedef struct {
    char name[MECHANISM_NAME];
    int chlorine, bromine; /* atoms of a molecule */
} SurfaceGas;

/* Mole fractions at the ground of the source gases with chlorine or bromine. */
typedef struct {
    int count;    /* times */
    double *time; /* [count] decimal years, increasing */
    int gases;
    SurfaceGas *gas;  /* [gases] */
    double *fraction; /* [gases][count] mol mol-1 */
} SurfaceSeries;

/* Room for a series, values zero. On failure *series is left zeroed. Owner: caller, surface_free. */
int surface_make(SurfaceSeries *series, int count, int gases, Fault *fault);
void surface_free(SurfaceSeries *series);

typedef struct {
    double mean_age, width, alpha; /* years, years, 1 */
    int count;
    double *time;   /* [count] decimal years, as in the series */
    double *value;  /* [count] EESC, ppt */
    double *known;  /* [count] share of the age spectrum that lies within the series; the rest is taken to be
                       at  the first value */
    char *counted;  /* gases counted, "CFC-11, CFC-12, ..." */
    char *left_out; /* gases with chlorine or bromine, not zero throughout, that the table has not; "" */
    char source[1000]; /* of the fractional release */
} EquivalentChlorine;

/* FAULT_INPUT when the table has no such mean age. On failure *out is left zeroed. Owner: caller,
 * equivalent_chlorine_free. */
int equivalent_chlorine_compute(EquivalentChlorine *out, const SurfaceSeries *series,
                                const ReleaseTable *table, double mean_age, Fault *fault);
void equivalent_chlorine_free(EquivalentChlorine *chlorine);

typedef struct {
    double benchmark_year, benchmark; /* decimal year, EESC then, ppt; NAN when the series does not hold it */
    double known;                     /* share of the age spectrum within the series at that time */
    double peak_year, peak;           /* largest value at or after the benchmark; NAN without a benchmark */
    int returns; /* 1: falls back; 0: not within the series; -1: no benchmark, or never above it after */
    double return_year; /* decimal year, linear between times; NAN unless returns is 1 */
} ChlorineReturn;

/* When EESC is back at its value of the decimal year benchmark_year (1980.5: the middle, and in records of a
 * year the mean, of 1980): the first fall to it after the peak. */
void equivalent_chlorine_return(const EquivalentChlorine *chlorine, double benchmark_year,
                                ChlorineReturn *out);

/* ---- equivalent_chlorine_file.c: in the file of a projection ---- */

/* The series of the lowest layer of a finished, interrupted or cut file. FAULT_INPUT when it is none, or its
 * species have no attribute `formula` (made by an earlier version). Owner: caller, surface_free. */
int surface_read(SurfaceSeries *series, const char *path, Fault *fault);
/* EESC of a file for one mean age; data_dir: where RELEASE_FILE lies. Owner: caller. */
int equivalent_chlorine_read(EquivalentChlorine *out, const char *path, const char *data_dir, double mean_age,
                             Fault *fault);
/* Put EESC of every mean age of the table into a finished file, as equivalent_chlorine_3yr(time),
 * equivalent_chlorine_55yr(time) and, with _known behind the name, the share known. What is there already is
 * replaced. The file is changed in a copy beside it, which then takes its place: whatever goes wrong it stays
 * whole. FAULT_OUTPUT when it cannot be written. */
int chlorine_store(const char *path, const ReleaseTable *table, Fault *fault);

#endif
