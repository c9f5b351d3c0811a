/* budget_text: a budget as tables for people, as CSV and as JSON. Writes to the stream it is given. */
#ifndef SKYMEND_BUDGET_TEXT_H
#define SKYMEND_BUDGET_TEXT_H

#include <stdio.h>

#include "budget.h"

#define BUDGET_ALTITUDES 64

/* Everything there is to say of one state. Arrays are owned by whoever made the structure. */
typedef struct {
    const Model *model;
    const OxBook *book;
    const double *x;             /* [solved][padded] */
    const double *term, *net;    /* [BUDGET_TERMS][padded], [padded] as from budget_odd_oxygen */
    const double *chain;         /* [BUDGET_TERMS][padded] */
    const GasBudget *gas;        /* [solved]; those of budget_is_source are shown */
    double year;                 /* whose conditions the column is at rest with */
    double explicit_days;        /* carried from there; 0: none */
    int altitudes;               /* number of */
    double km[BUDGET_ALTITUDES]; /* shown in the tables; CSV and JSON hold every layer */
} BudgetView;

void budget_print(const BudgetView *view, FILE *out);
/* The reactions that count, with weight, by family. */
void budget_print_book(const BudgetView *view, FILE *out);

/* ---- budget_files.c ---- */

/* Tidy: table,name,part,altitude_km,value,unit; altitude_km empty where the value is of the whole column,
 * value empty where there is none. */
void budget_csv(const BudgetView *view, FILE *out);
/* RFC 8259; null for what is not a number. */
void budget_json(const BudgetView *view, FILE *out);

#endif
