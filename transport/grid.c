/* grid: see grid.h. Edges are the primary quantity; middles and depths follow from them, so that
 * the depths add up to the top to round-off whatever way the edges were given. */
#include "grid.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

enum { LAYERS_LEAST = 4, LAYERS_MOST = 511 };
#define CM_PER_KM 1e5
#define WHOLE_TOLERANCE 1e-6 /* how far top / spacing may be from a whole number */

static int check_layers(double layers, Fault *fault)
{
    if (layers >= LAYERS_LEAST && layers <= LAYERS_MOST)
        return 0;
    return fault_set(fault, FAULT_INPUT,
                     "grid: %.0f layers asked for, between %d and %d can be used; change the top, "
                     "the spacing or the list of edges",
                     layers, LAYERS_LEAST, LAYERS_MOST);
}

static int count_uniform(int *layers, double top_km, double spacing_km, Fault *fault)
{
    if (!(isfinite(top_km) && top_km > 0.0))
        return fault_set(fault, FAULT_INPUT, "grid: the top is %g km; give a positive altitude", top_km);
    if (!(isfinite(spacing_km) && spacing_km > 0.0))
        return fault_set(fault, FAULT_INPUT, "grid: the spacing is %g km; give a positive depth", spacing_km);
    double exact = top_km / spacing_km, whole = round(exact);
    if (check_layers(whole, fault))
        return fault->code;
    if (fabs(exact - whole) > WHOLE_TOLERANCE)
        return fault_set(fault, FAULT_INPUT,
                         "grid: a top of %g km is %g layers of %g km; make it a whole number, for "
                         "example a top of %g km",
                         top_km, exact, spacing_km, whole * spacing_km);
    *layers = (int)whole;
    return 0;
}

static int check_edges(const double *edge_km, int edges, Fault *fault)
{
    if (check_layers((double)edges - 1.0, fault))
        return fault->code;
    if (edge_km[0] != 0.0)
        return fault_set(fault, FAULT_INPUT, "grid: the first edge is %g km; it must be 0, the ground",
                         edge_km[0]);
    for (int e = 1; e < edges; e++)
        if (!(isfinite(edge_km[e]) && edge_km[e] > edge_km[e - 1]))
            return fault_set(fault, FAULT_INPUT,
                             "grid: edge %d is %g km and follows %g km; edges must ascend", e + 1, edge_km[e],
                             edge_km[e - 1]);
    return 0;
}

int grid_make(Grid *grid, double top_km, double spacing_km, const double *edge_km, int edges, Fault *fault)
{
    memset(grid, 0, sizeof *grid);
    int own = edges > 0, layers = edges - 1;
    if (own ? check_edges(edge_km, edges, fault) : count_uniform(&layers, top_km, spacing_km, fault))
        return fault->code;

    int padded = PACK_ROUND(layers);
    grid->layers = layers;
    grid->padded = padded;
    grid->edge = malloc(((size_t)layers + 1) * sizeof *grid->edge);
    grid->middle = malloc((size_t)padded * sizeof *grid->middle);
    grid->depth = malloc((size_t)padded * sizeof *grid->depth);
    if (!grid->edge || !grid->middle || !grid->depth) {
        grid_free(grid);
        return fault_memory(fault, "the vertical grid");
    }

    /* top * e / layers rather than e * spacing: the last edge is then the top exactly. */
    for (int e = 0; e <= layers; e++)
        grid->edge[e] = CM_PER_KM * (own ? edge_km[e] : top_km * e / layers);
    for (int i = 0; i < padded; i++) {
        int layer = i < layers ? i : layers - 1;
        double low = grid->edge[layer], high = grid->edge[layer + 1];
        grid->middle[i] = 0.5 * (low + high);
        grid->depth[i] = high - low;
    }
    return 0;
}

void grid_free(Grid *grid)
{
    if (!grid)
        return;
    free(grid->edge);
    free(grid->middle);
    free(grid->depth);
    memset(grid, 0, sizeof *grid);
}
