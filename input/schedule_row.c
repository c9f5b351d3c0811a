/* schedule_row: the cells of one row of a schedule; contract in schedule_reading.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum Column { YEAR, GAS, KIND, AMOUNT, UNIT, LINE, NEEDED, CHANGE = NEEDED, FROM, TO, COLUMNS };
static const char *const column_names[COLUMNS] = {"year", "gas",    "kind",    "amount", "unit",
                                                  "line", "change", "from_km", "to_km"};

const char *const schedule_kinds[KINDS] = {"abundance", "emission", "bank",
                                           "filling",   "release",  "destruction"};
static const char *const changes[CHANGES] = {"new", "replace", "add", "scale"};

static const double highest_km = 100; /* no vehicle that burns its way through the air flies above */

typedef struct {
    const char *path;
    const Csv *csv;
    size_t place[COLUMNS]; /* of each column among the cells; the number of cells when there is none */
    Fault *fault;
} Sheet;

static int find_columns(Sheet *sheet)
{
    const Csv *csv = sheet->csv;
    size_t count = csv->first[1];
    for (int k = 0; k < COLUMNS; k++)
        sheet->place[k] = count;
    for (size_t c = 0; c < count; c++) {
        int k = 0;
        if (!csv->cell[c][0]) { /* a spreadsheet may have added empty columns */
            size_t r = 1;
            while (r < csv->rows && !csv->cell[csv->first[r] + c][0])
                r++;
            if (r == csv->rows)
                continue;
            return fault_at(sheet->fault, sheet->path, csv->line[r],
                            "\"%.60s\" stands in a column without a name; name the column, or empty the cell",
                            csv->cell[csv->first[r] + c]);
        }
        while (k < COLUMNS && strcmp(csv->cell[c], column_names[k]) != 0)
            k++;
        if (k == COLUMNS) {
            const char *near = fault_nearest(csv->cell[c], column_names, COLUMNS);
            return fault_at(sheet->fault, sheet->path, csv->line[0], "unknown column \"%.60s\"; %s%s%s",
                            csv->cell[c],
                            near ? "did you mean "
                                 : "the columns are year,gas,kind,amount,unit,line, and where wanted "
                                   "change,from_km,to_km",
                            near ? near : "", near ? "?" : "");
        }
        if (sheet->place[k] != count)
            return fault_at(sheet->fault, sheet->path, csv->line[0], "two columns are called %s; remove one",
                            column_names[k]);
        sheet->place[k] = c;
    }
    for (int k = 0; k < NEEDED; k++)
        if (sheet->place[k] == count)
            return fault_at(sheet->fault, sheet->path, csv->line[0],
                            "no column %s; the columns are year,gas,kind,amount,unit,line", column_names[k]);
    return 0;
}

/* Text under a column in a row of the Csv; "" when there is no such column. */
static const char *cell_of(const Sheet *sheet, size_t row, int column)
{
    const Csv *csv = sheet->csv;
    return sheet->place[column] < csv->first[1] ? csv->cell[csv->first[row] + sheet->place[column]] : "";
}

/* ---- years ---- */

/* The second year of "2030-2060", with a hyphen or the dash a word processor makes of it; NULL otherwise. */
static const char *second_year(const char *cell)
{
    const char *p = schedule_skip(cell + strspn(cell, "0123456789"));
    if (p == cell)
        return NULL;
    if (*p == '-')
        return schedule_skip(p + 1);
    return strncmp(p, "\xe2\x80\x93", 3) == 0 ? schedule_skip(p + 3) : NULL;
}

static int read_years(const Sheet *sheet, const char *cell, Row *row)
{
    const char *second = second_year(cell);
    double first, last;
    if (second) {
        char *end;
        first = strtod(cell, NULL);
        last = strtod(second, &end);
        if (!isdigit((unsigned char)*second) || *end)
            return fault_at(sheet->fault, sheet->path, row->place.line,
                            "year is \"%.60s\"; write a year, or a span such as 2030-2060", cell);
    } else {
        if (csv_number(sheet->path, row->place.line, "year", cell, &first, sheet->fault))
            return sheet->fault->code;
        last = first;
    }
    if (first != floor(first) || last != floor(last) || first < EARLIEST_YEAR || last > LATEST_YEAR ||
        last < EARLIEST_YEAR || first > LATEST_YEAR)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "year is %.60s; write a whole year from %d to %d, or a span such as 2030-2060", cell,
                        EARLIEST_YEAR, LATEST_YEAR);
    if (last < first)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "year is %.60s, a span that ends before it begins; swap the two", cell);
    row->first_year = (int)first;
    row->last_year = (int)last;
    return 0;
}

/* ---- amounts ---- */

/* size: what an amount in this unit is multiplied by. */
static int read_row_unit(const Sheet *sheet, const char *cell, Row *row, double *size)
{
    Unit unit;
    *size = 1;
    if (!*cell && (row->rule == HOLD || row->rule == GROWTH || (row->rule == LINEAR && row->amount == 0)))
        return 0;
    int unknown = schedule_unit(cell, &unit);
    if (row->change == SCALE) {
        if (unknown || unit.type != UNIT_SHARE || unit.per_year || unit.per_km)
            return fault_at(sheet->fault, sheet->path, row->place.line,
                            "unit is \"%.60s\"; to scale write a factor with unit 1, or one with unit %%",
                            cell);
        *size = unit.size;
        return 0;
    }
    if (unknown || !schedule_unit_fits(row->kind, &unit)) {
        const char *near = unknown ? schedule_unit_near(row->kind, cell) : NULL;
        return fault_at(sheet->fault, sheet->path, row->place.line, "unit is \"%.60s\"; for %s%s%s%s", cell,
                        schedule_unit_advice(row->kind), near ? " (did you mean " : "", near ? near : "",
                        near ? "?)" : "");
    }
    row->has_unit = 1;
    row->share = unit.type == UNIT_SHARE;
    row->per_km = unit.per_km;
    strcpy(row->element, unit.element);
    *size = unit.size;
    return 0;
}

/* What follows p when it starts with word and a blank (or its end), else NULL. */
static const char *after_word(const char *p, const char *word)
{
    size_t n = strlen(word);
    if (strncmp(p, word, n) != 0 || (p[n] != '\0' && p[n] != ' ' && p[n] != '\t'))
        return NULL;
    return schedule_skip(p + n);
}

/* "+2 % per year", "-5 %/yr", "up 2 % per year", "down 5 % per year" (a spreadsheet takes a leading sign for
 * a formula). 0 when understood. */
static int read_growth(const char *cell, double *growth)
{
    const char *p = cell, *word;
    double sign = 1;
    if ((word = after_word(p, "up")) || (word = after_word(p, "down"))) {
        sign = *p == 'u' ? 1 : -1;
        p = word;
        if (!isdigit((unsigned char)*p) && *p != '.')
            return 1;
    }
    size_t digits = strspn(p + (*p == '+' || *p == '-'), "0123456789.");
    if (digits == 0)
        return 1;
    char *end;
    *growth = sign * strtod(p, &end) / 100;
    p = schedule_skip(end);
    if (*p != '%')
        return 1;
    p = schedule_skip(p + 1);
    return strcmp(p, "per year") != 0 && strcmp(p, "/yr") != 0 && strcmp(p, "/year") != 0 &&
           strcmp(p, "per yr") != 0;
}

static int read_amount(const Sheet *sheet, const char *cell, Row *row)
{
    const char *rest;
    int line = row->place.line;
    row->rule = NUMBER;
    if (strcmp(cell, "hold") == 0) {
        row->rule = HOLD;
        return 0;
    }
    if ((rest = after_word(cell, "linear"))) {
        rest = after_word(rest, "to");
        if (!rest || !*rest)
            return fault_at(sheet->fault, sheet->path, line,
                            "amount is \"%.60s\"; write linear to and the amount of the last year, such as "
                            "linear to 0",
                            cell);
        row->rule = LINEAR;
        return csv_number(sheet->path, line, "amount, after linear to,", rest, &row->amount, sheet->fault);
    }
    if (strchr(cell, '%') || after_word(cell, "up") || after_word(cell, "down")) {
        row->rule = GROWTH;
        if (read_growth(cell, &row->amount))
            return fault_at(sheet->fault, sheet->path, line,
                            "amount is \"%.60s\"; write a growth as +2 %% per year, a decline as -5 %% per "
                            "year (or up 2 %% per year, down 5 %% per year)",
                            cell);
        if (row->amount < -1)
            return fault_at(sheet->fault, sheet->path, line,
                            "amount is %.60s; nothing can fall by more than 100 %% a year", cell);
        return 0;
    }
    if (isalpha((unsigned char)*cell))
        return fault_at(sheet->fault, sheet->path, line,
                        "\"%.60s\" under amount is no number and no rule; write a number, hold, linear to 0, "
                        "or +2 %% per year",
                        cell);
    return csv_number(sheet->path, line, "amount", cell, &row->amount, sheet->fault);
}

/* ---- kind, change, height ---- */

static int read_kind(const Sheet *sheet, const char *cell, Row *row)
{
    row->kind = schedule_word(cell, schedule_kinds, KINDS);
    if (row->kind < KINDS)
        return 0;
    const char *near = fault_nearest(cell, schedule_kinds, KINDS);
    return fault_at(sheet->fault, sheet->path, row->place.line, "kind is \"%.60s\"; %s%s%s", cell,
                    near ? "did you mean "
                         : "write abundance, emission, bank, filling, release or destruction",
                    near ? near : "", near ? "?" : "");
}

static int read_change(const Sheet *sheet, const char *cell, Row *row)
{
    row->change = *cell ? schedule_word(cell, changes, CHANGES) : NEW;
    if (row->change == CHANGES) {
        const char *near = fault_nearest(cell, changes, CHANGES);
        return fault_at(sheet->fault, sheet->path, row->place.line, "change is \"%.60s\"; %s%s%s", cell,
                        near ? "did you mean " : "write new, replace, add or scale, or leave it empty",
                        near ? near : "", near ? "?" : "");
    }
    if (row->change != NEW && row->place.file == 0)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "change is %s, but nothing lies below the first file; put the row into a file of "
                        "files.schedule_layers",
                        cell);
    return 0;
}

static int read_height(const Sheet *sheet, const char *from, const char *to, Row *row)
{
    if (!*from && !*to)
        return 0;
    if (!*from || !*to)
        return fault_at(
            sheet->fault, sheet->path, row->place.line,
            "%s is empty; an emission at altitude needs both from_km and to_km, one at the ground "
            "neither",
            *from ? "to_km" : "from_km");
    if (csv_number(sheet->path, row->place.line, "from_km", from, &row->from_km, sheet->fault) ||
        csv_number(sheet->path, row->place.line, "to_km", to, &row->to_km, sheet->fault))
        return sheet->fault->code;
    if (row->kind != EMISSION)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "a row of kind %s has from_km and to_km; leave them empty, only an emission has an "
                        "altitude",
                        schedule_kinds[row->kind]);
    if (!(row->from_km >= 0 && row->from_km < row->to_km && row->to_km <= highest_km))
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "from_km is %s and to_km %s; write 0 <= from_km < to_km <= %g", from, to, highest_km);
    row->has_height = 1;
    return 0;
}

/* What a change may say with a star and with a rule. */
static int check_change(const Sheet *sheet, const Row *row)
{
    int all_gases = strcmp(row->gas, "*") == 0, all_lines = strcmp(row->label, "*") == 0;
    if ((row->change == SCALE || row->change == ADD) && row->rule != NUMBER)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "%s goes with a number; to write a rule, replace the line", changes[row->change]);
    if (all_gases && row->change != SCALE)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "gas is *, all gases, which only scale can change; name the gas");
    if (all_lines && row->change != SCALE && (row->kind != ABUNDANCE || row->change == NEW))
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "line is *, all lines, which only scale can change; name the line that is to have "
                        "the amount");
    return 0;
}

/* ---- the row ---- */

static int read_row(const Sheet *sheet, size_t at, Row *row)
{
    double size;
    row->gas = cell_of(sheet, at, GAS);
    row->label = cell_of(sheet, at, LINE);
    const char *amount = cell_of(sheet, at, AMOUNT), *unit = cell_of(sheet, at, UNIT);
    if (read_years(sheet, cell_of(sheet, at, YEAR), row) || read_kind(sheet, cell_of(sheet, at, KIND), row) ||
        read_change(sheet, cell_of(sheet, at, CHANGE), row) || read_amount(sheet, amount, row) ||
        read_row_unit(sheet, unit, row, &size) ||
        read_height(sheet, cell_of(sheet, at, FROM), cell_of(sheet, at, TO), row))
        return sheet->fault->code;
    if (row->rule != GROWTH && row->amount < 0 && row->change != ADD)
        return fault_at(sheet->fault, sheet->path, row->place.line, "amount is %.60s; %s cannot be negative",
                        amount,
                        row->change == SCALE     ? "a factor"
                        : row->kind == ABUNDANCE ? "an abundance"
                        : row->kind == EMISSION  ? "an emission"
                                                 : "what goes into or out of a bank");
    if (row->rule != GROWTH)
        row->amount *= size;
    if (row->kind == BANK &&
        (row->rule != NUMBER || (row->first_year != row->last_year && row->change == NEW)))
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "a bank row is what lies in the bank, or is added to it, at the start of one year; "
                        "give a year and a number");
    if (!*row->gas)
        return fault_at(sheet->fault, sheet->path, row->place.line, "gas is empty; name a species");
    if (strlen(row->gas) >= sizeof((Schedule *)0)->gas[0])
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "gas \"%.60s\" has more than %zu letters; shorten it", row->gas,
                        sizeof((Schedule *)0)->gas[0] - 1);
    if (!*row->label)
        return fault_at(sheet->fault, sheet->path, row->place.line,
                        "line is empty; write a label that says where the figure comes from");
    return check_change(sheet, row);
}

/* A row of commas alone, as a spreadsheet leaves it. */
static int is_blank(const Csv *csv, size_t row)
{
    for (size_t c = csv->first[row]; c < csv->first[row + 1]; c++)
        if (csv->cell[c][0])
            return 0;
    return 1;
}

int schedule_rows(const Csv *csv, const char *path, int file, Row **rows, size_t *count, Fault *fault)
{
    Sheet sheet = {.path = path, .csv = csv, .fault = fault};
    *rows = NULL;
    *count = 0;
    if (find_columns(&sheet))
        return fault->code;
    Row *made = calloc(csv->rows, sizeof *made);
    if (!made)
        return fault_memory(fault, path);
    for (size_t r = 1; r < csv->rows; r++) {
        if (is_blank(csv, r))
            continue;
        made[*count].place = (Place){file, csv->line[r]};
        if (read_row(&sheet, r, &made[*count])) {
            free(made);
            return fault->code;
        }
        ++*count;
    }
    if (*count == 0) {
        free(made);
        return fault_at(fault, path, csv->line[0], "no rows follow the column names; add them");
    }
    *rows = made;
    return 0;
}
