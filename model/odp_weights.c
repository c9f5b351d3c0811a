/* odp_weights: see odp_weights.h. */
#include "odp_weights.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"

/* Place of a column that must be there. */
static int find_column(const Csv *csv, const char *path, const char *name, size_t *place, Fault *fault)
{
    for (*place = 0; *place < csv->first[1]; ++*place)
        if (!strcmp(csv->cell[*place], name))
            return 0;
    return fault_at(fault, path, csv->line[0], "no column \"%s\"; add it", name);
}

static int take_name(char *name, const Csv *csv, size_t row, size_t place, const char *path, Fault *fault)
{
    const char *cell = csv->cell[csv->first[row] + place];
    if (!cell[0] || strlen(cell) >= MECHANISM_NAME)
        return fault_at(fault, path, csv->line[row],
                        "\"%.60s\" is no name of a gas; write one of 1 to %d characters", cell,
                        MECHANISM_NAME - 1);
    strcpy(name, cell);
    return 0;
}

/* ---- own potentials ---- */

static const OwnPotential *find_own(const OdpWeights *weights, const char *gas)
{
    for (int r = 0; r < weights->own_rows; r++)
        if (!strcmp(weights->own[r].gas, gas))
            return &weights->own[r];
    return NULL;
}

enum { GAS, ODP, NOISE, FROZEN, COLUMNS };

static int take_own(OdpWeights *weights, const Csv *csv, size_t row, const size_t *place, const char *path,
                    Fault *fault)
{
    static const char *const names[COLUMNS] = {"gas", "odp", "odp_noise", "odp_frozen"};
    OwnPotential *own = &weights->own[weights->own_rows];
    double value[COLUMNS];
    *own = (OwnPotential){.potential = NAN, .noise = NAN};
    if (take_name(own->gas, csv, row, place[GAS], path, fault))
        return fault->code;
    if (find_own(weights, own->gas))
        return fault_at(fault, path, csv->line[row], "%s is listed twice; remove one", own->gas);
    for (int c = ODP; c < COLUMNS; c++) {
        const char *cell = csv->cell[csv->first[row] + place[c]];
        value[c] = NAN;
        if (cell[0] && csv_number(path, csv->line[row], names[c], cell, &value[c], fault))
            return fault->code;
    }
    own->potential = isnan(value[ODP]) ? value[FROZEN] : value[ODP];
    own->noise = isnan(value[ODP]) ? NAN : value[NOISE];
    if (isnan(own->potential))
        return fault_at(fault, path, csv->line[row],
                        "%s has neither odp nor odp_frozen; make the table anew with skymend potency --csv",
                        own->gas);
    if (own->noise < 0.0)
        return fault_at(fault, path, csv->line[row], "%s: odp_noise is %g; it cannot be negative", own->gas,
                        own->noise);
    weights->own_rows++;
    return 0;
}

static void say_source(OdpWeights *weights, const Csv *csv, const char *path)
{
    char quantity[400], source[200];
    const Table header = {.header = csv->header};
    table_header(&header, "quantity", quantity, sizeof quantity);
    table_header(&header, "source", source, sizeof source);
    const char *name = strrchr(path, '/');
    snprintf(weights->own_source, sizeof weights->own_source, "%.200s%s%s%s%s", name ? name + 1 : path,
             quantity[0] ? ": " : "", quantity, source[0] ? "; " : "", source);
}

static int read_own(OdpWeights *weights, const char *path, Fault *fault)
{
    static const char *const names[COLUMNS] = {"gas", "odp", "odp_noise", "odp_frozen"};
    Csv csv;
    size_t place[COLUMNS];
    if (csv_read(&csv, path, fault))
        return fault->code;
    for (int c = 0; c < COLUMNS && !fault->code; c++)
        find_column(&csv, path, names[c], &place[c], fault);
    if (!fault->code && !(weights->own = malloc(csv.rows * sizeof *weights->own)))
        fault_memory(fault, path);
    for (size_t row = 1; row < csv.rows && !fault->code; row++)
        take_own(weights, &csv, row, place, path, fault);
    if (!fault->code) {
        const OwnPotential *reference = find_own(weights, "CFC-11");
        if (!reference || fabs(reference->potential - 1.0) > 1e-12)
            fault_at(
                fault, path, csv.line[0],
                "the potential of CFC-11 is not 1, so these are not what ODP-tonnes are weighed by; make "
                "the table without --reference");
        say_source(weights, &csv, path);
    }
    csv_free(&csv);
    return fault->code;
}

/* ---- natural gases ---- */

static int read_natural(OdpWeights *weights, const char *path, Fault *fault)
{
    Csv csv;
    size_t place;
    if (csv_read(&csv, path, fault))
        return fault->code;
    if (!find_column(&csv, path, "gas", &place, fault) &&
        !(weights->natural = malloc(csv.rows * sizeof *weights->natural)))
        fault_memory(fault, path);
    for (size_t row = 1; row < csv.rows && !fault->code; row++)
        if (!take_name(weights->natural[weights->natural_rows], &csv, row, place, path, fault))
            weights->natural_rows++;
    csv_free(&csv);
    return fault->code;
}

/* ---- the whole ---- */

int weights_read(OdpWeights *weights, const char *data_dir, const char *own_path, Fault *fault)
{
    char path[4096];
    memset(weights, 0, sizeof *weights);
    if (!treaty_find_and_read(&weights->treaty, data_dir, fault) &&
        !table_locate("natural sources", NATURAL_FILE, "", data_dir, path, sizeof path, fault) &&
        !read_natural(weights, path, fault) &&
        (own_path ||
         !table_locate("own potentials", OWN_POTENTIALS_FILE, "", data_dir, path, sizeof path, fault)))
        read_own(weights, own_path ? own_path : path, fault);
    if (fault->code)
        weights_free(weights);
    return fault->code;
}

void weights_free(OdpWeights *weights)
{
    if (!weights)
        return;
    treaty_free(&weights->treaty);
    free(weights->own);
    free(weights->natural);
    memset(weights, 0, sizeof *weights);
}

double weights_potential(const OdpWeights *weights, int weight, const char *gas)
{
    if (weight == WEIGHT_TREATY) {
        const TreatyGas *row;
        return treaty_standing(&weights->treaty, gas, &row) == TREATY_CONTROLLED ? row->potential : NAN;
    }
    const OwnPotential *own = find_own(weights, gas);
    return own ? own->potential : NAN;
}

double weights_noise(const OdpWeights *weights, int weight, const char *gas)
{
    const OwnPotential *own = weight == WEIGHT_OWN ? find_own(weights, gas) : NULL;
    return own ? own->noise : NAN;
}

int weights_natural(const OdpWeights *weights, const char *gas)
{
    for (int r = 0; r < weights->natural_rows; r++)
        if (!strcmp(weights->natural[r], gas))
            return 1;
    return 0;
}
