/* apportion_text: an apportionment as tables, CSV and JSON. */
#ifndef SKYMEND_APPORTION_TEXT_H
#define SKYMEND_APPORTION_TEXT_H

#include "apportion.h"

typedef struct {
    const Model *model;
    const Apportionment *apportionment;
} ApportionView;

/* For people. */
void apportion_print(const ApportionView *view, FILE *out);
/* A row an item, then all, sum and remainder; cells that have no value are empty. */
void apportion_csv(const ApportionView *view, FILE *out);
/* The same, with the yearly columns of every run. */
void apportion_json(const ApportionView *view, FILE *out);

/* "line", "gas", "line and gas". */
const char *apportion_by_name(int by);
/* Of an item: its label, its gas, or both with a comma between, cut at size. */
void apportion_item_name(const Model *model, const ApportionItem *item, char *text, size_t size);

#endif
