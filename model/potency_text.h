/* potency_text: depletion potentials as a table for people, as CSV and as JSON. Writes to the stream it is
 * given. */
#ifndef SKYMEND_POTENCY_TEXT_H
#define SKYMEND_POTENCY_TEXT_H

#include <stdio.h>

#include "potency.h"

typedef struct {
    const Model *model;
    const Potencies *potencies;
    int year;    /* surface values of its middle */
    int factors; /* 1: the case has diurnal factors */
} PotencyView;

void potency_print(const PotencyView *view, FILE *out);
/* One row a gas, empty where there is no number; a first line that begins with # tells the conditions. */
void potency_csv(const PotencyView *view, FILE *out);
/* RFC 8259; null for what is not a number. */
void potency_json(const PotencyView *view, FILE *out);

#endif
