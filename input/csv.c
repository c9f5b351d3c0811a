/* csv: the raw reading of comma-separated text, and its writing; contract in table.h. */
#define _POSIX_C_SOURCE 200809L
#include <ctype.h>
#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "table.h"

static const size_t LARGEST_FILE = (size_t)256 << 20;

/* ---- whole files ---- */

/* The whole stream as a NUL-terminated string, or NULL with a fault. */
static char *read_stream(FILE *stream, const char *path, size_t *length, Fault *fault)
{
    size_t room = 1 << 14, used = 0;
    char *buffer = malloc(room);
    if (!buffer) {
        fault_memory(fault, path);
        return NULL;
    }
    for (;;) {
        used += fread(buffer + used, 1, room - used - 1, stream);
        if (ferror(stream)) {
            int reason = errno;
            free(buffer);
            fault_at(fault, path, 0, "cannot be read: %s; check the file", strerror(reason));
            return NULL;
        }
        if (used > LARGEST_FILE) {
            free(buffer);
            fault_at(fault, path, 0, "is larger than 256 MB; is this the right file?");
            return NULL;
        }
        if (feof(stream))
            break;
        if (used + 1 == room) {
            char *larger = realloc(buffer, room *= 2);
            if (!larger) {
                free(buffer);
                fault_memory(fault, path);
                return NULL;
            }
            buffer = larger;
        }
    }
    buffer[used] = '\0';
    *length = used;
    return buffer;
}

/* Refuse what is not plain text; take the byte-order mark off. */
static int check_text(const char *path, char *text, size_t *length, Fault *fault)
{
    const unsigned char *byte = (const unsigned char *)text;
    if (*length >= 2 && ((byte[0] == 0xff && byte[1] == 0xfe) || (byte[0] == 0xfe && byte[1] == 0xff)))
        return fault_at(fault, path, 1, "is UTF-16 text; save it as UTF-8");
    if (*length >= 3 && byte[0] == 0xef && byte[1] == 0xbb && byte[2] == 0xbf) {
        *length -= 3;
        memmove(text, text + 3, *length + 1);
    }
    const char *nul = memchr(text, '\0', *length);
    if (nul) {
        int line = 1;
        for (const char *p = text; p < nul; p++)
            line += *p == '\n';
        return fault_at(fault, path, line, "holds a NUL byte, so it is no text file; check its name");
    }
    return 0;
}

int table_text(const char *path, char **text, size_t *length, Fault *fault)
{
    *text = NULL;
    struct stat status;
    if (stat(path, &status) != 0)
        return fault_at(fault, path, 0, "cannot be opened: %s; check the name", strerror(errno));
    if (S_ISDIR(status.st_mode))
        return fault_at(fault, path, 0, "is a folder; name a file in it");
    FILE *stream = fopen(path, "rb");
    if (!stream)
        return fault_at(fault, path, 0, "cannot be opened: %s; check its permissions", strerror(errno));
    size_t size = 0;
    char *whole = read_stream(stream, path, &size, fault);
    fclose(stream);
    if (!whole)
        return fault->code;
    if (check_text(path, whole, &size, fault)) {
        free(whole);
        return fault->code;
    }
    *text = whole;
    if (length)
        *length = size;
    return 0;
}

/* ---- cells ---- */

static char *skip_blank(char *p)
{
    while (*p == ' ' || *p == '\t')
        p++;
    return p;
}

static void trim_end(char *start, const char *also)
{
    size_t n = strlen(start);
    while (n > 0 && (isspace((unsigned char)start[n - 1]) || strchr(also, start[n - 1])))
        start[--n] = '\0';
}

/* Cut the line end off at p and return the start of the next line; NULL after the last. CRLF, LF and
 * a lone CR all end a line. */
static char *end_line(char *p)
{
    char *end = p + strcspn(p, "\r\n");
    if (*end == '\0')
        return NULL;
    char *next = end + (end[0] == '\r' && end[1] == '\n' ? 2 : 1);
    *end = '\0';
    return next;
}

/* Undo the quotes of the cell that starts at p ('"'), in place. Returns where its text ended (at the
 * comma or the line end) or NULL when the quote is not closed. */
static char *unquote(char *p)
{
    char *to = p, *from = p + 1;
    for (;;) {
        if (*from == '\0')
            return NULL;
        if (*from == '"' && from[1] == '"')
            from++;
        else if (*from == '"')
            break;
        *to++ = *from++;
    }
    from = skip_blank(from + 1);
    if (*from != ',' && *from != '\0')
        return NULL;
    char after = *from;
    *to = '\0';
    *from = after;
    return from;
}

/* Cut one line into cells, appended at csv->cell[*used]. */
static int cut_cells(Csv *csv, char *p, int line, size_t *used, const char *path, Fault *fault)
{
    for (;;) {
        p = skip_blank(p);
        csv->cell[(*used)++] = p;
        char *end;
        if (*p == '"') {
            end = unquote(p);
            if (!end)
                return fault_at(fault, path, line,
                                "a quoted cell is not closed on its line; close or remove the quote");
        } else {
            end = p + strcspn(p, ",");
        }
        int more = *end == ',';
        *end = '\0';
        trim_end(p, "");
        if (!more)
            return 0;
        p = end + 1;
    }
}

/* A spreadsheet may have quoted a comment line and padded it with commas; both are undone. */
static int is_comment(const char *p)
{
    return p[0] == '#' || (p[0] == '"' && p[1] == '#');
}

static char *append_comment(char *to, char *p)
{
    if (*p == '"') {
        trim_end(p, ",");
        if (!unquote(p))
            p++;
    }
    p = skip_blank(p + strspn(p, "#"));
    trim_end(p, ",");
    size_t n = strlen(p);
    memcpy(to, p, n);
    to[n] = '\n';
    return to + n + 1;
}

static int check_separator(char *line_text, int line, const char *path, Fault *fault)
{
    if (!strchr(line_text, ',') && strpbrk(line_text, ";\t"))
        return fault_at(fault, path, line,
                        "cells are separated by %s; save the table with commas between cells and "
                        "points in numbers",
                        strchr(line_text, ';') ? "semicolons" : "tabs");
    return 0;
}

static int cut_lines(Csv *csv, const char *path, Fault *fault)
{
    char *next, *header = csv->header;
    size_t used = 0;
    int line = 1;
    for (char *p = csv->text; p; p = next, line++) {
        next = end_line(p);
        p = skip_blank(p);
        if (*p == '\0')
            continue;
        if (is_comment(p)) {
            header = append_comment(header, p);
            continue;
        }
        if (csv->rows == 0 && check_separator(p, line, path, fault))
            return fault->code;
        csv->line[csv->rows] = line;
        csv->first[csv->rows] = used;
        if (cut_cells(csv, p, line, &used, path, fault))
            return fault->code;
        csv->rows++;
        csv->first[csv->rows] = used;
        size_t cells = used - csv->first[csv->rows - 1], columns = csv->first[1];
        if (cells != columns)
            return fault_at(fault, path, line, "%zu cells where the line of column names has %zu; %s", cells,
                            columns,
                            cells > columns ? "remove cells, or write decimal points for commas"
                                            : "fill in the missing cells");
    }
    if (header > csv->header)
        header--; /* no newline after the last line */
    *header = '\0';
    if (csv->rows == 0)
        return fault_at(fault, path, 0, "has no line of column names; is the file empty?");
    return 0;
}

int csv_read(Csv *csv, const char *path, Fault *fault)
{
    memset(csv, 0, sizeof *csv);
    size_t length;
    if (table_text(path, &csv->text, &length, fault))
        return fault->code;
    size_t lines = 1, cells = 1;
    for (const char *p = csv->text; *p; p++) {
        lines += *p == '\n' || *p == '\r';
        cells += *p == '\n' || *p == '\r' || *p == ',';
    }
    csv->line = malloc(lines * sizeof *csv->line);
    csv->first = calloc(lines + 1, sizeof *csv->first);
    csv->cell = malloc(cells * sizeof *csv->cell);
    csv->header = malloc(length + 2);
    if (!csv->line || !csv->first || !csv->cell || !csv->header)
        fault_memory(fault, path);
    else
        cut_lines(csv, path, fault);
    if (fault->code)
        csv_free(csv);
    return fault->code;
}

void csv_free(Csv *csv)
{
    free(csv->text);
    free(csv->line);
    free(csv->first);
    free(csv->cell);
    free(csv->header);
    memset(csv, 0, sizeof *csv);
}

int csv_number(const char *path, int line, const char *column, const char *cell, double *value, Fault *fault)
{
    if (*cell == '\0')
        return fault_at(fault, path, line, "the cell under %s is empty; write a number", column);
    /* strtod also takes hexadecimal, nan and inf; a table of measurements has no use for them. */
    size_t length = strlen(cell);
    char *end = NULL;
    if (strspn(cell, "+-.0123456789eE") == length)
        *value = strtod(cell, &end);
    if (!end || end == cell || *end != '\0' || !isfinite(*value)) {
        if (strpbrk(cell, ",;"))
            return fault_at(fault, path, line,
                            "\"%.60s\" under %s is no number; write a decimal point and separate "
                            "cells by commas",
                            cell, column);
        return fault_at(fault, path, line, "\"%.60s\" under %s is no %snumber; correct the cell", cell,
                        column, end && end != cell && *end == '\0' ? "finite " : "");
    }
    return 0;
}

/* ---- writing ---- */

void csv_put_text(FILE *out, const char *text)
{
    if (!strpbrk(text, ",\"\r\n")) {
        fputs(text, out);
        return;
    }
    fputc('"', out);
    for (; *text; text++) {
        if (*text == '"')
            fputc('"', out);
        fputc(*text, out);
    }
    fputc('"', out);
}

void csv_put_header(FILE *out, const char *key, const char *text)
{
    fprintf(out, "# %s: ", key);
    for (; *text; text++)
        fputc(*text == '\n' || *text == '\r' ? ' ' : *text, out);
    fputc('\n', out);
}
