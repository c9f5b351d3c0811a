/* emission: what the lines of a schedule put into the column.
 *
 * The column stands for the whole Earth: a mass given off anywhere in a year enters it as
 *     kg a-1 / (molar mass) * Avogadro / (365.25 days) / (4 pi R^2)      molecules cm-2 s-1,
 * R the mean radius. At the ground it enters the lowest layer; aloft it is spread evenly by height over the
 * layers it covers. It enters as a constant source of the transport (diffusion_step), or of the chemistry
 * where reactions make the gas as well (stepper_source in stepper.h), so nothing is lost in rounding: what a
 * year gives off is what the schedule says to a few parts in 1e15 a step.
 *
 * Where the value of a layer is prescribed (the lowest layer of a gas that the ground keeps, the layers in
 * which a table holds a species) the reservoir behind it takes what is put there; the ledger says so.
 */
#ifndef SKYMEND_EMISSION_H
#define SKYMEND_EMISSION_H

#include "column.h"

typedef struct Emissions {
    int lines;          /* those of the schedule */
    int *species;       /* [lines] solved number */
    double *molecules;  /* [lines] molecules cm-2 of the gas per kg */
    double *share;      /* [lines][padded] of each layer; the sum is 1 */
    int given;          /* species that any line gives */
    int *given_species; /* [given] */
} Emissions;

/* For model_make, when schedule, grid, mechanism and grounds are there. FAULT_INPUT, at the line's row, for a
 * gas that is not carried or no active species, for an element it does not hold, a height above the grid's
 * top, or an emission of a held species that lies in the held layers altogether. Owner: caller. */
int emissions_make(Emissions **made, const Model *model, Fault *fault);
void emissions_free(Emissions *emissions); /* accepts NULL */
/* A copy to alter: with molecules of a line times 1 - share that share of the line is not given off. Owner:
 * caller. */
int emissions_copy(Emissions **made, const Emissions *from, const Model *model, Fault *fault);

/* At decimal year time, molecules cm-2 s-1: flux [solved] all that lines give; ground [solved] of it, at the
 * ground; layer [solved][padded] by layer, both kinds. NULL: not wanted. */
void emissions_at(const Model *model, double time, double *flux, double *ground, double *layer);

/* kg a-1 of the gas itself, from a flux in molecules cm-2 s-1, for the whole Earth. */
double emission_kg_year(const Model *model, int solved, double flux);
/* Surface of the Earth, cm2. */
double emission_area(void);

#endif
