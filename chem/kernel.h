/* kernel: the mechanism as flat lists of operations over one pack of layers.
 *
 * Symbolic work, done once per mechanism: which reaction feeds which species, where each derivative goes in
 * the sparse Jacobian, an elimination order by Markowitz count (Markowitz 1957, Management Science 3, 255),
 * and every multiply of the LU factorisation written out as an index pair. The numeric loops in
 * rosenbrock_kernel.c walk these lists; one entry is one vector operation over the PACK layers of a pack.
 */
#ifndef SKYMEND_KERNEL_H
#define SKYMEND_KERNEL_H

#include <stdint.h>

#include "../input/fault.h"
#include "mechanism.h"

typedef struct {
    int species;  /* rows: the solved species, then the counters */
    int counters; /* rows that only count atoms leaving for fixed or inert species (N in N2, H in CH3OH),
                     entering ones negative: no feedback, no say in the step size. Set to 0 by the caller
                     before a call, read after it. One for each element but O and F that leaves; washout is
                     tallied, not counted. */
    int counter_element[MECHANISM_ELEMENTS]; /* [counters] index in mechanism->element */
    int reactions;                           /* all reactions */

    /* rates: w[r] = k[r] * y[a] * y[b] (* y[c]), a and b being `species`, a row of ones, where there is none:
     * two multiplies for all without a branch, and a third for the few cubic ones */
    int32_t *order;    /* [reactions] number of solved reactants 0..3 */
    int32_t *reactant; /* [reactions][3], `species` where absent */
    int cubics;
    int32_t *cubic; /* [cubics] reactions of order 3 */

    /* f[s] = sum over e in [source_first[s], source_first[s+1]) of source_weight[e] * w[source_reaction[e]]
     */
    int32_t *source_first; /* [species + 1] */
    int32_t *source_reaction;
    double *source_weight;

    /* derivatives: d[e] = k[r] * y[p] (* y[q]), to be taken multiplicity times, of reaction r with respect to
     * species by; p and q are the other reactants, `species` where absent */
    int derivatives;
    int32_t *derivative_reaction, *derivative_by, *derivative_p, *derivative_q; /* [derivatives] */
    int32_t *derivative_multiplicity;                                           /* [derivatives] 1..3 */
    int cubic_derivatives;
    int32_t *cubic_derivative; /* [cubic_derivatives] those with a q */

    /* matrix: row-compressed in elimination order, fill included; entries 0..entries-1 */
    int entries;
    int32_t *order_of;  /* [species] species at elimination position i */
    int32_t *row_first; /* [species + 1] by position */
    int32_t *column;    /* [entries] position, ascending within a row */
    int32_t *diagonal;  /* [species] entry of (i, i) */

    /* Jacobian entry e = sum over t in [term_first[e], term_first[e+1]) of term_weight[t] *
     * d[term_derivative[t]], multiplicity included in the weight */
    int32_t *term_first; /* [entries + 1] */
    int32_t *term_derivative;
    double *term_weight;

    /* LU, entry e = (i, j) of either factor in storage order:
     *   sum = a[e] - sum over t in [product_first[e], product_first[e+1]) of lu[product_lower[t]] *
     * lu[product_upper[t]] (the k < min(i, j), ascending), and for j < i times the reciprocal pivot of j */
    int32_t *product_first; /* [entries + 1] */
    int32_t *product_lower, *product_upper;

    /* reactions whose events are integrated along (washout): order 1 each */
    int tallies;
    int32_t *tally_reaction; /* [tallies] */
} Kernel;

int kernel_make(Kernel **made, const Mechanism *mechanism, Fault *fault);
void kernel_free(Kernel *kernel);

#endif
