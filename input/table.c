/* table: see table.h. */
#define _POSIX_C_SOURCE 200809L
#include "table.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* ---- reading ---- */

static int take_names(Table *table, const Csv *csv, Fault *fault)
{
    for (size_t c = 0; c < table->columns; c++) {
        const char *name = csv->cell[c];
        if (*name == '\0')
            return fault_at(fault, table->path, csv->line[0], "column %zu has no name; name it", c + 1);
        for (size_t b = 0; b < c; b++)
            if (strcmp(table->name[b], name) == 0)
                return fault_at(fault, table->path, csv->line[0],
                                "two columns are called %s; rename or remove one", name);
        table->name[c] = strdup(name);
        if (!table->name[c])
            return fault_memory(fault, table->path);
    }
    return 0;
}

static int take_values(Table *table, const Csv *csv, Fault *fault)
{
    for (size_t r = 0; r < table->rows; r++) {
        table->line[r] = csv->line[r + 1];
        for (size_t c = 0; c < table->columns; c++)
            if (csv_number(table->path, table->line[r], table->name[c], csv->cell[csv->first[r + 1] + c],
                           &table->value[c * table->rows + r], fault))
                return fault->code;
    }
    return 0;
}

static int fill_table(Table *table, const Csv *csv, const char *path, Fault *fault)
{
    table->path = strdup(path);
    table->header = strdup(csv->header);
    if (!table->path || !table->header)
        return fault_memory(fault, path);
    if (csv->rows < 2)
        return fault_at(fault, path, csv->line[0], "no rows follow the column names; add them");
    table->name_line = csv->line[0];
    table->columns = csv->first[1];
    table->rows = csv->rows - 1;
    table->name = calloc(table->columns, sizeof *table->name);
    table->line = malloc(table->rows * sizeof *table->line);
    table->value = malloc(table->rows * table->columns * sizeof *table->value);
    if (!table->name || !table->line || !table->value)
        return fault_memory(fault, path);
    if (take_names(table, csv, fault))
        return fault->code;
    return take_values(table, csv, fault);
}

int table_read(Table *table, const char *path, Fault *fault)
{
    memset(table, 0, sizeof *table);
    Csv csv;
    if (csv_read(&csv, path, fault))
        return fault->code;
    int code = fill_table(table, &csv, path, fault);
    csv_free(&csv);
    if (code)
        table_free(table);
    return code;
}

void table_free(Table *table)
{
    if (table->name)
        for (size_t c = 0; c < table->columns; c++)
            free(table->name[c]);
    free(table->name);
    free(table->path);
    free(table->value);
    free(table->line);
    free(table->header);
    memset(table, 0, sizeof *table);
}

/* ---- looking things up ---- */

int table_column(const Table *table, const char *name, size_t *index, Fault *fault)
{
    for (size_t c = 0; c < table->columns; c++)
        if (strcmp(table->name[c], name) == 0) {
            *index = c;
            return 0;
        }
    char list[400] = "";
    for (size_t c = 0, used = 0; c < table->columns && used + 4 < sizeof list; c++)
        used += (size_t)snprintf(list + used, sizeof list - used, "%s%s", c ? ", " : "", table->name[c]);
    const char *near = fault_nearest(name, (const char *const *)table->name, table->columns);
    if (near)
        return fault_at(fault, table->path, table->name_line, "has no column %s; is it %s? (it has: %s)",
                        name, near, list);
    return fault_at(fault, table->path, table->name_line, "has no column %s; add it (it has: %s)", name,
                    list);
}

const double *table_values(const Table *table, size_t column)
{
    return table->value + column * table->rows;
}

int table_header(const Table *table, const char *key, char *text, size_t size)
{
    size_t length = strlen(key);
    text[0] = '\0';
    const char *line = table->header;
    while (line && *line) {
        const char *end = strchr(line, '\n');
        size_t n = end ? (size_t)(end - line) : strlen(line);
        if (n > length && strncmp(line, key, length) == 0 && line[length] == ':') {
            const char *start = line + length + 1;
            start += strspn(start, " \t");
            snprintf(text, size, "%.*s", start < line + n ? (int)(line + n - start) : 0, start);
            return 1;
        }
        line = end ? end + 1 : NULL;
    }
    return 0;
}

int table_require_increasing(const Table *table, size_t column, Fault *fault)
{
    const double *value = table_values(table, column);
    for (size_t r = 1; r < table->rows; r++)
        if (!(value[r] > value[r - 1]))
            return fault_at(fault, table->path, table->line[r],
                            "%s is %g after %g; it must increase from row to row", table->name[column],
                            value[r], value[r - 1]);
    return 0;
}

int table_require_range(const Table *table, size_t column, double low, double high, Fault *fault)
{
    const double *value = table_values(table, column);
    for (size_t r = 0; r < table->rows; r++)
        if (!(value[r] >= low && value[r] <= high))
            return fault_at(fault, table->path, table->line[r], "%s is %g; it must lie between %g and %g",
                            table->name[column], value[r], low, high);
    return 0;
}

/* ---- interpolation ---- */

/* Index i with xs[i] <= x < xs[i+1]; x lies strictly inside the table. */
static size_t bracket(const double *xs, size_t count, double x)
{
    size_t low = 0, high = count - 1;
    while (high - low > 1) {
        size_t middle = low + (high - low) / 2;
        if (xs[middle] <= x)
            low = middle;
        else
            high = middle;
    }
    return low;
}

double table_linear(const double *xs, const double *ys, size_t count, double x)
{
    if (x <= xs[0])
        return ys[0];
    if (x >= xs[count - 1])
        return ys[count - 1];
    size_t i = bracket(xs, count, x);
    double part = (x - xs[i]) / (xs[i + 1] - xs[i]);
    return ys[i] + part * (ys[i + 1] - ys[i]);
}

double table_loglinear(const double *xs, const double *ys, size_t count, double x)
{
    if (x <= xs[0])
        return ys[0];
    if (x >= xs[count - 1])
        return ys[count - 1];
    size_t i = bracket(xs, count, x);
    double part = (x - xs[i]) / (xs[i + 1] - xs[i]);
    return ys[i] * exp(part * log(ys[i + 1] / ys[i]));
}

/* ---- finding files ---- */

static int is_file(const char *path)
{
    struct stat status;
    return stat(path, &status) == 0 && !S_ISDIR(status.st_mode) && access(path, R_OK) == 0;
}

/* Join folder and path into found; 0 when it does not fit or is no readable file. */
static int try_folder(const char *folder, const char *path, char *found, size_t size)
{
    const char *slash = folder[0] && folder[strlen(folder) - 1] == '/' ? "" : "/";
    int length = snprintf(found, size, "%s%s%s", folder, slash, path);
    return length >= 0 && (size_t)length < size && is_file(found);
}

int table_locate(const char *what, const char *path, const char *base_dir, const char *data_dir, char *found,
                 size_t size, Fault *fault)
{
    if (path[0] == '\0')
        return fault_set(fault, FAULT_INPUT, "%s: no file is named; name one in the case", what);
    if (path[0] == '/') {
        int length = snprintf(found, size, "%s", path);
        if (length >= 0 && (size_t)length < size && is_file(path))
            return 0;
        return fault_at(fault, path, 0, "cannot be read (%s); check the name in the case", what);
    }
    if (base_dir && base_dir[0] && try_folder(base_dir, path, found, size))
        return 0;
    if (data_dir && data_dir[0] && try_folder(data_dir, path, found, size))
        return 0;
    return fault_at(fault, path, 0,
                    "not found (%s); looked in \"%s\" and \"%s\"; put it in one of them or correct "
                    "the name in the case",
                    what, base_dir ? base_dir : "", data_dir ? data_dir : "");
}
