/* table: numeric CSV tables with a commented header.
 *
 * A table is lines "# key: text" (quantity, unit, source, basis, ...), one line of column names, then
 * rows of numbers. Byte-order mark, CRLF and blank lines are accepted; a non-numeric or empty cell, a
 * wrong cell count, or a decimal comma / semicolon is a fault naming file, line and cell.
 */
#ifndef SKYMEND_TABLE_H
#define SKYMEND_TABLE_H

#include <stdio.h>

#include "fault.h"

/* Read a whole text file into *text (NUL-terminated; owner: caller, free) and its length in bytes,
 * a UTF-8 byte-order mark removed. Fault when it is missing, a folder, unreadable, above 256 MB,
 * UTF-16 or holds a NUL byte. length may be NULL. */
int table_text(const char *path, char **text, size_t *length, Fault *fault);

typedef struct {
    char *path; /* as opened */
    size_t rows, columns;
    char **name;   /* [columns] column names as written */
    double *value; /* [columns][rows], column contiguous */
    int *line;     /* [rows] line number in the file, for messages */
    int name_line; /* that of the column names */
    char *header;  /* all "# key: text" lines, '\n' separated, '#' removed; "" if none */
} Table;

/* Read path. On failure *table is left freed/zeroed. Owner: caller, table_free. */
int table_read(Table *table, const char *path, Fault *fault);
void table_free(Table *table); /* accepts a zeroed or half-built table */

/* Index of the column called name, or a fault that lists the columns there are. */
int table_column(const Table *table, const char *name, size_t *index, Fault *fault);
/* Pointer to the rows of a column. */
const double *table_values(const Table *table, size_t column);
/* Text after "key:" in the header, copied into text (empty when absent); returns 1 if found. */
int table_header(const Table *table, const char *key, char *text, size_t size);
/* Fault unless column is strictly increasing (a message names the line). */
int table_require_increasing(const Table *table, size_t column, Fault *fault);
/* Fault unless every value lies in [low, high]. */
int table_require_range(const Table *table, size_t column, double low, double high, Fault *fault);

/* Piecewise linear interpolation at x in xs[count] (strictly increasing); beyond the ends the end value. */
double table_linear(const double *xs, const double *ys, size_t count, double x);
/* The same, linear in log(y); every ys > 0. */
double table_loglinear(const double *xs, const double *ys, size_t count, double x);

/* Find a data file: path itself if absolute or readable from base_dir, else from data_dir.
 * base_dir is the folder of the case file ("" for the built-in baseline: only data_dir is searched,
 * so that no file that happens to lie in the current folder changes it), data_dir that of the
 * installed input/data.
 * Fault (what, path, both folders tried) when neither has it. found: [size] the path to open. */
int table_locate(const char *what, const char *path, const char *base_dir, const char *data_dir, char *found,
                 size_t size, Fault *fault);

/* ---- raw CSV, for tables that hold text (schedules) ---- */
typedef struct {
    char *text; /* whole file, cells are cut in place */
    size_t rows;
    int *line;     /* [rows] */
    size_t *first; /* [rows + 1] index of a row's first cell in cell[] */
    char **cell;   /* trimmed, unquoted */
    char *header;  /* as in Table */
} Csv;
/* Read path; row 0 holds the column names and every row has as many cells as it. Lines that start
 * with '#' are the header, wherever they stand. On failure *csv is left freed/zeroed. Owner: caller,
 * csv_free. */
int csv_read(Csv *csv, const char *path, Fault *fault);
void csv_free(Csv *csv);
/* strtod that must use the whole cell and give a finite number. */
int csv_number(const char *path, int line, const char *column, const char *cell, double *value, Fault *fault);

/* ---- writing CSV ---- */

/* A cell of text, quoted where it must be (RFC 4180). */
void csv_put_text(FILE *out, const char *text);
/* A line "# key: text" of the header; line ends in the text become blanks, since they would end the header.
 */
void csv_put_header(FILE *out, const char *key, const char *text);

#endif
