/* treaty: the potentials by which the Montreal Protocol weighs what it controls.
 *
 * Not to be taken for the potentials of the column (potency.h): these are the figures of the treaty's
 * annexes A, B, C and E, agreed on once, by which its parties report and by which its limits are set.
 */
#ifndef SKYMEND_TREATY_H
#define SKYMEND_TREATY_H

#include "../chem/mechanism.h"

#define TREATY_FILE "treaty-potentials.csv" /* in the data folder */

typedef struct {
    char gas[MECHANISM_NAME];
    char annex[4], group[8]; /* "A", "II"; "" when not controlled */
    double potential;        /* CFC-11 = 1, by mass; NAN when not controlled */
} TreatyGas;

typedef struct {
    int rows;
    TreatyGas *row;    /* [rows] */
    char source[1000]; /* the table's own "# source:", or its path */
} Treaty;

/* Columns gas, annex (A, B, C, E, none), group (I, II, ..., none), potential (above 0 to 100, or none); the
 * last three are none together. Faults name file and line. Owner: caller, treaty_free. */
int treaty_read(Treaty *treaty, const char *path, Fault *fault);
/* The same of TREATY_FILE in the data folder. */
int treaty_find_and_read(Treaty *treaty, const char *data_dir, Fault *fault);
void treaty_free(Treaty *treaty);

enum TreatyStanding {
    TREATY_UNLISTED = -1, /* the table does not know the gas */
    TREATY_FREE = 0,      /* not controlled: the treaty has no potential for it */
    TREATY_CONTROLLED = 1
};
/* How a gas stands; its row (borrowed) where gas_row is not NULL, NULL when unlisted. */
enum TreatyStanding treaty_standing(const Treaty *treaty, const char *gas, const TreatyGas **gas_row);

/* Sum over the controlled of gas [count] of potential times kilotonnes [count], in ODP-tonnes. standing
 * [count] or NULL: how each gas stands, since those that are not controlled or not listed add nothing. */
double treaty_tonnes(const Treaty *treaty, const char *const *gas, const double *kilotonnes, int count,
                     enum TreatyStanding *standing);

#endif
