/* schedule_reading: how a schedule is put together. Private to schedule*.c.
 *
 * Each file is cut into rows (schedule_row.c); the rows of a file are applied, in order of their first year,
 * to series of yearly values that the files share (schedule_layers.c, values in schedule_rules.c); the series
 * make the Schedule (schedule.c, banks in schedule_bank.c).
 */
#ifndef SKYMEND_SCHEDULE_READING_H
#define SKYMEND_SCHEDULE_READING_H

#include "schedule.h"
#include "table.h"

enum { EARLIEST_YEAR = 1700, LATEST_YEAR = 2500, SERIES_YEARS = LATEST_YEAR - EARLIEST_YEAR + 1 };

enum Kind { ABUNDANCE, EMISSION, BANK, FILLING, RELEASE, DESTRUCTION, KINDS };
enum Change { NEW, REPLACE, ADD, SCALE, CHANGES };
enum Rule { NUMBER, HOLD, LINEAR, GROWTH };

extern const char *const schedule_kinds[KINDS];

/* Where something was written: index in Schedule.path and line of the file. */
typedef struct {
    int file, line;
} Place;

/* One row, its cells understood. Amounts are mole fractions, kg, or shares of a stock by kind and unit. */
typedef struct {
    Place place;
    int first_year, last_year;
    int kind, change, rule;
    double amount;         /* NUMBER, LINEAR: the value; GROWTH: 0.02 for +2 % per year; SCALE: the factor */
    int has_unit;          /* 0 where a rule needs none and the cell is empty */
    int share;             /* unit is a share of the stock per year, not a mass */
    int per_km;            /* amount is of each km of height */
    char element[4];       /* as in ScheduleLine */
    int has_height;        /* from_km and to_km are filled in */
    double from_km, to_km; /* 0, 0 without */
    const char *gas, *label; /* in the text of the Csv */
    int series;              /* NEW: index of the series it goes to */
} Row;

typedef struct {
    double value;
    int stands;  /* 0: no value for the year */
    Place made;  /* row that first gave the year a value */
    Place last;  /* row that gave it this value */
    Place given; /* last row that spoke of this gas by name */
} Cell;

/* Values by year of one gas, kind and label. The abundances of a gas are one series whatever the labels. */
typedef struct {
    int gas, kind, share;
    char element[4];
    double from_km, to_km;
    char *label;
    Place first;     /* row that began it */
    int has_measure; /* share and element have been set by a row with a unit */
    Cell cell[SERIES_YEARS];
} Series;

typedef struct {
    Schedule *schedule;
    Series **series; /* [count] */
    int count, room, gas_room;
} Reading;

/* ---- schedule_units.c ---- */

enum UnitType { UNIT_FRACTION, UNIT_MASS, UNIT_SHARE };

typedef struct {
    int type;             /* enum UnitType */
    double size;          /* mol mol-1, kg, or share of 1 that one of it is */
    int per_year, per_km; /* 1 where the text says so */
    char element[4];      /* "" or the element that the mass is of */
} Unit;

/* 0 when the text is a unit of any kind. */
int schedule_unit(const char *text, Unit *unit);
int schedule_unit_fits(int kind, const Unit *unit);
/* "an abundance write ppt, ...", and the unit of the kind that text may be a slip of, or NULL. */
const char *schedule_unit_advice(int kind);
const char *schedule_unit_near(int kind, const char *text);
/* Past blanks; index of word in words or count. */
const char *schedule_skip(const char *p);
int schedule_word(const char *word, const char *const *words, int count);

/* ---- schedule_row.c ---- */

/* The rows after the column names. *rows: owner caller, free; they point into csv. */
int schedule_rows(const Csv *csv, const char *path, int file, Row **rows, size_t *count, Fault *fault);

/* ---- schedule_rules.c ---- */

/* Give the years of the row their values: of a change those that stand (all must, unless star is 1). Adds the
 * number of years to *hits. Element, measure and height must be those of the series, which takes them from
 * its first row. */
int schedule_rule(const Reading *reading, Series *series, const Row *row, int star, int *hits, Fault *fault);
/* That check of element, measure and height alone. */
int schedule_same(const Reading *reading, Series *series, const Row *row, Fault *fault);

/* ---- schedule_layers.c ---- */

/* Apply one file and note its spans. Sorts the rows. */
int schedule_apply(Reading *reading, Row *row, size_t count, Fault *fault);
/* Series of a gas, kind and label (label NULL: any), or NULL. */
Series *schedule_series(const Reading *reading, int gas, int kind, const char *label);
/* First and last year with a value as indices of cell; 0 when there is none. */
int series_span(const Series *series, int *first, int *last);
/* Fault unless the years of the series follow each other. */
int series_whole(const Reading *reading, const Series *series, Fault *fault);

/* ---- schedule_bank.c ---- */

/* Work out the stock and the releases of a bank: line->first_year, years, amount, stock. bank is its series
 * of kind BANK. */
int schedule_bank(const Reading *reading, const Series *bank, ScheduleLine *line, Fault *fault);
/* Fault when a filling, release or destruction has no bank, or a label is both a bank and an emission. */
int schedule_bank_kinds(const Reading *reading, Fault *fault);

#endif
