/* grid: the vertical layers. Altitudes are geometric, in cm inside the program, km at its edge. */
#ifndef SKYMEND_GRID_H
#define SKYMEND_GRID_H

#include "../input/fault.h"

typedef struct {
    int layers;     /* number of layers */
    int padded;     /* layers rounded up to a multiple of PACK: length of arrays over layers */
    double *edge;   /* [layers + 1] altitude of layer edges, cm, ascending from the ground */
    double *middle; /* [padded] altitude of layer middles, cm; padding repeats the top layer */
    double *depth;  /* [padded] thickness, cm; padding repeats the top layer */
} Grid;

/* Uniform layers of spacing_km up to top_km (top a whole number of layers, to 1e-6), or own edges
 * (edges > 0: edge_km[edges], strictly ascending from 0; top_km and spacing_km are then not looked
 * at). At least 4 and at most 511 layers. FAULT_INPUT otherwise, *grid then zeroed. Owner: caller,
 * grid_free. */
int grid_make(Grid *grid, double top_km, double spacing_km, const double *edge_km, int edges, Fault *fault);
void grid_free(Grid *grid); /* accepts NULL and a zeroed grid */

#endif
