/* odp_weights: what a tonne of a gas counts when emissions are told in ODP-tonnes, by the potentials of the
 * treaty (treaty.h) and by Skymend's own (potency.h), and which gases nature gives off too.
 */
#ifndef SKYMEND_ODP_WEIGHTS_H
#define SKYMEND_ODP_WEIGHTS_H

#include "treaty.h"

#define OWN_POTENTIALS_FILE "own-potentials.csv" /* in the data folder */
#define NATURAL_FILE "natural-sources.csv"

enum OdpWeight { WEIGHT_TREATY, WEIGHT_OWN, WEIGHTS };

typedef struct {
    char gas[MECHANISM_NAME];
    double potential; /* by mass, CFC-11 = 1 */
    double noise;     /* numerical, absolute; NAN: not known */
} OwnPotential;

typedef struct {
    Treaty treaty;
    int own_rows;
    OwnPotential *own;    /* [own_rows] */
    char own_source[900]; /* where they come from, for people */
    int natural_rows;
    char (*natural)[MECHANISM_NAME]; /* [natural_rows] gases that nature gives off too */
} OdpWeights;

/* The treaty's and the natural gases from the data folder; own potentials from own_path, NULL: those of the
 * data. That table is what `skymend potency --csv` writes: columns gas, odp, odp_noise, odp_frozen among
 * others; where odp is empty (--adjoint) odp_frozen counts, without a noise. FAULT_INPUT as for every table,
 * and when CFC-11 is not 1 in it. Owner: caller, weights_free. */
int weights_read(OdpWeights *weights, const char *data_dir, const char *own_path, Fault *fault);
void weights_free(OdpWeights *weights);

/* ODP of a gas; NAN: it has none in that table. */
double weights_potential(const OdpWeights *weights, int weight, const char *gas);
/* Its numerical noise: NAN where it is not known, and of the treaty's, which are agreed on. */
double weights_noise(const OdpWeights *weights, int weight, const char *gas);
int weights_natural(const OdpWeights *weights, const char *gas);

#endif
