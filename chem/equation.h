/* equation: chemical formulas and equations as text.
 *
 *   formula   "CCl2F2": element symbols, each with an optional count
 *   equation  "OH + CO (+M) {+ O2} -> CO2 + HO2 (+M)"
 *     terms     a species name, led by a coefficient where it is not 1, parted by " + "
 *     (+M)      decorates both sides of a reaction whose rate law holds the pressure; it is no term
 *     { }       on the left: fixed species taken up by fast steps after the slow one; counted in the atoms
 * only hv        on the left of a photolysis Coefficients of reactants are whole; those of products may be
 * decimal.
 */
#ifndef SKYMEND_EQUATION_H
#define SKYMEND_EQUATION_H

#include "mechanism.h"

#define EQUATION_TERMS 16   /* distinct species on one side */
#define EQUATION_LENGTH 240 /* characters of an equation */

/* Where a text stood, for messages. */
typedef struct {
    const char *file;
    int line;
    const char *label; /* what is being read, e.g.: reaction "O+O3" */
} Place;

typedef struct {
    int species; /* index into Mechanism.item */
    double count;
} Term;

typedef struct {
    int terms; /* a species written twice is one term */
    Term term[EQUATION_TERMS];
} Side;

typedef struct {
    Side left, taken, right; /* reactants, fixed species in braces, products */
    int light;               /* hv on the left */
    int decorated;           /* (+M) on both sides */
} Equation;

/* Atoms by Mechanism.element and the molar mass (g mol-1) of a formula. Faults: unknown elements, no formula.
 */
int formula_read(const Mechanism *mechanism, const char *formula, const Place *place, int *atoms,
                 double *molar_mass, Fault *fault);
/* Is symbol a chemical element the program has an atomic weight of? */
int formula_known_element(const char *symbol);
/* That weight, g mol-1; 0 of an element the program does not know. */
double equation_atomic_weight(const char *symbol);

/* Without a mechanism: atoms of one element in a formula such as C2HCl2F3, -1 when it is none. */
int formula_atoms(const char *formula, const char *symbol);
/* Molar mass, g mol-1; 0 when it is no formula or has an element without a known weight. */
double formula_mass(const char *formula);

/* Parse text against the species of the mechanism. Faults: bad notation, unknown species (nearest suggested),
 * inert species on the left, other than fixed species in braces, (+M) or M on one side only, too long. */
int equation_read(const Mechanism *mechanism, const char *text, const Place *place, Equation *equation,
                  Fault *fault);

/* Fault naming every element that differs, with the counts left (braces included) and right. */
int equation_balance(const Mechanism *mechanism, const Equation *equation, const Place *place, Fault *fault);

/* Coefficient of a species on a side, 0 where it does not stand. */
double equation_count(const Side *side, int species);
/* The same species with the same coefficients, in any order? */
int equation_same(const Side *a, const Side *b);

/* Index into Mechanism.item by name, or -1. */
int equation_species(const Mechanism *mechanism, const char *name);

#endif
