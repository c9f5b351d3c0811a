/* treaty: see treaty.h. */
#include "treaty.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"

#define TONNES_PER_KILOTONNE 1e3

enum { GAS, ANNEX, GROUP, POTENTIAL, COLUMNS };
static const char *const column_names[COLUMNS] = {"gas", "annex", "group", "potential"};

enum TreatyStanding treaty_standing(const Treaty *treaty, const char *gas, const TreatyGas **gas_row)
{
    for (int r = 0; r < treaty->rows; r++)
        if (!strcmp(treaty->row[r].gas, gas)) {
            if (gas_row)
                *gas_row = &treaty->row[r];
            return isnan(treaty->row[r].potential) ? TREATY_FREE : TREATY_CONTROLLED;
        }
    if (gas_row)
        *gas_row = NULL;
    return TREATY_UNLISTED;
}

double treaty_tonnes(const Treaty *treaty, const char *const *gas, const double *kilotonnes, int count,
                     enum TreatyStanding *standing)
{
    double sum = 0.0;
    for (int g = 0; g < count; g++) {
        const TreatyGas *row;
        enum TreatyStanding one = treaty_standing(treaty, gas[g], &row);
        if (one == TREATY_CONTROLLED)
            sum += row->potential * kilotonnes[g] * TONNES_PER_KILOTONNE;
        if (standing)
            standing[g] = one;
    }
    return sum;
}

static int take_row(Treaty *treaty, const char *path, int line, char *const *cell, Fault *fault)
{
    static const char *const annexes[] = {"A", "B", "C", "E"}, *const groups[] = {"I", "II", "III"};
    TreatyGas *row = &treaty->row[treaty->rows];
    int annex = 0, group = 0, none = 0;
    *row = (TreatyGas){.potential = NAN};
    if (!cell[GAS][0] || strlen(cell[GAS]) >= sizeof row->gas)
        return fault_at(fault, path, line, "\"%.60s\" is no name of a gas; write one of 1 to %zu characters",
                        cell[GAS], sizeof row->gas - 1);
    if (treaty_standing(treaty, cell[GAS], NULL) != TREATY_UNLISTED)
        return fault_at(fault, path, line, "%s is listed twice; remove one", cell[GAS]);
    strcpy(row->gas, cell[GAS]);
    for (int c = ANNEX; c <= POTENTIAL; c++)
        none += !strcmp(cell[c], "none");
    if (none == 3) {
        treaty->rows++;
        return 0;
    }
    if (none)
        return fault_at(fault, path, line,
                        "%s: annex, group and potential must all be none, or none of them; complete the row",
                        row->gas);
    for (size_t a = 0; a < sizeof annexes / sizeof *annexes; a++)
        annex |= !strcmp(cell[ANNEX], annexes[a]);
    for (size_t g = 0; g < sizeof groups / sizeof *groups; g++)
        group |= !strcmp(cell[GROUP], groups[g]);
    if (!annex)
        return fault_at(fault, path, line, "unknown annex \"%.40s\"; write A, B, C, E or none", cell[ANNEX]);
    if (!group)
        return fault_at(fault, path, line, "unknown group \"%.40s\"; write I, II, III or none", cell[GROUP]);
    strcpy(row->annex, cell[ANNEX]);
    strcpy(row->group, cell[GROUP]);
    if (csv_number(path, line, column_names[POTENTIAL], cell[POTENTIAL], &row->potential, fault))
        return fault->code;
    if (!(row->potential > 0.0 && row->potential <= 100.0))
        return fault_at(fault, path, line, "%s: a potential of %g; it must lie above 0 and not above 100",
                        row->gas, row->potential);
    treaty->rows++;
    return 0;
}

static int take_rows(Treaty *treaty, const Csv *csv, const char *path, Fault *fault)
{
    int same = csv->first[1] == COLUMNS;
    for (size_t c = 0; same && c < COLUMNS; c++)
        same = !strcmp(csv->cell[c], column_names[c]);
    if (!same)
        return fault_at(fault, path, csv->line[0],
                        "unexpected columns; gas,annex,group,potential are wanted, in this order");
    if (csv->rows < 2)
        return fault_at(fault, path, csv->line[0], "no rows follow the column names; add them");
    treaty->row = malloc(csv->rows * sizeof *treaty->row);
    if (!treaty->row)
        return fault_memory(fault, path);
    for (size_t r = 1; r < csv->rows; r++)
        if (take_row(treaty, path, csv->line[r], csv->cell + csv->first[r], fault))
            return fault->code;
    return 0;
}

int treaty_read(Treaty *treaty, const char *path, Fault *fault)
{
    Csv csv;
    memset(treaty, 0, sizeof *treaty);
    if (csv_read(&csv, path, fault))
        return fault->code;
    int code = take_rows(treaty, &csv, path, fault);
    const Table header = {.header = csv.header};
    if (!table_header(&header, "source", treaty->source, sizeof treaty->source))
        snprintf(treaty->source, sizeof treaty->source, "%s", path);
    csv_free(&csv);
    if (code)
        treaty_free(treaty);
    return code;
}

int treaty_find_and_read(Treaty *treaty, const char *data_dir, Fault *fault)
{
    char path[4096];
    memset(treaty, 0, sizeof *treaty);
    int code = table_locate("treaty potentials", TREATY_FILE, "", data_dir, path, sizeof path, fault);
    return code ? code : treaty_read(treaty, path, fault);
}

void treaty_free(Treaty *treaty)
{
    if (!treaty)
        return;
    free(treaty->row);
    memset(treaty, 0, sizeof *treaty);
}
