/* answers_emission: emissions in ODP-tonnes, what the answers know of them. Private to answers*.c and the
 * tests.
 *
 * What counts: by the treaty's potentials the substances it controls; by Skymend's own every halocarbon that
 * has one. Of a gas that nature gives off too only what lines of the schedule give counts: an emission
 * implied by an abundance holds what nature gives, and is told apart. Gases with nitrogen and no halogen
 * (N2O) are weighed by Skymend's own potentials and told apart, whole. Other gases (CH4, CO2, H2) make no
 * catalyst of the loss of ozone and are not weighed.
 *
 * Differences of two files count every weighed gas whole, since what nature gives is in both.
 */
#ifndef SKYMEND_ANSWERS_EMISSION_H
#define SKYMEND_ANSWERS_EMISSION_H

#include "answers.h"

enum OdpShare { ODP_COUNTED, ODP_NATURAL, ODP_NITROGEN, ODP_SHARES };

typedef struct OdpTable {
    const OdpWeights *weights;               /* borrowed */
    int first_year, years;                   /* of the file, whether covered whole or not */
    double *by_year[WEIGHTS][ODP_SHARES];    /* [years] t a year; NAN: not covered whole */
    double *difference[WEIGHTS][ODP_SHARES]; /* [years] less the reference; NULL: none */
    double *store;                           /* what they point into */
} OdpTable;

/* "treaty", "own". */
const char *odp_word(int weight);
/* Gg a year of a gas in interval i that belong to a share; 0: none of it. */
double odp_mass(const OdpWeights *weights, int weight, int share, const GasEmission *gas, int i);
void odp_free(OdpTable *odp);
/* In answers_emission_against.c: the file less the reference over the time both cover, as a file of its own
 * whose emissions count whole (all of each gas stands as given by lines, so that nothing is apart). Intervals
 * must match, as answers_against makes sure. Owner: caller, who frees difference->emissions.gas and *store,
 * also on a fault; all else in it is the file's. */
int odp_subtract(FileSeries *difference, const FileSeries *file, const FileSeries *reference, double **store,
                 Fault *fault);

/* In answers_emission_text.c: a table after the others, and an object "odp_emission" after the others. */
void odp_print(const Answers *answers, const FileSeries *file, const FileSeries *reference, FILE *out);
void odp_json(const Answers *answers, const FileSeries *file, FILE *out);

#endif
