/* settings_scan: see settings_scan.h. */
#define _XOPEN_SOURCE 700
#include "settings_scan.h"

#include <ctype.h>
#include <errno.h>
#include <limits.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "table.h"

enum { DEEPEST_INCLUDE = 8 };

typedef struct {
    const char *path;
    const char *folder;
    int line;
    int depth;
    Fault *fault;
} Scan;

static int scan_text(Scan *scan, const char *text);

/* Is the file at path inside folder, links followed? */
static int inside(const char *path, const char *folder)
{
    char *real_path = realpath(path, NULL), *real_folder = realpath(folder, NULL);
    int result = 0;
    if (real_path && real_folder) {
        size_t length = strlen(real_folder);
        result = strncmp(real_path, real_folder, length) == 0 &&
                 (real_path[length] == '/' || strcmp(real_folder, "/") == 0);
    }
    free(real_path);
    free(real_folder);
    return result;
}

static int scan_include(const Scan *scan, const char *name, size_t length)
{
    char path[1024];
    if (scan->depth == DEEPEST_INCLUDE)
        return fault_at(scan->fault, scan->path, scan->line,
                        "@include nests more than %d deep; does a file include itself?", DEEPEST_INCLUDE);
    if (memchr(name, '\\', length) || strlen(scan->folder) + length + 2 > sizeof path)
        return fault_at(scan->fault, scan->path, scan->line,
                        "@include names a file with a backslash or too long a name; rename it");
    snprintf(path, sizeof path, "%s/%.*s", scan->folder, (int)length, name);
    char *text;
    Fault unread = {0};
    if (table_text(path, &text, NULL, &unread))
        return fault_at(scan->fault, scan->path, scan->line, "@include: %s", unread.text);
    Scan inner = {path, scan->folder, 1, scan->depth + 1, scan->fault};
    int code =
        inside(path, scan->folder)
            ? scan_text(&inner, text)
            : fault_at(scan->fault, scan->path, scan->line,
                       "@include leads outside the folder of the case (\"%s\"); copy the file there", path);
    free(text);
    return code;
}

/* A number starts at p; returns where it ends, or NULL with a fault. */
static const char *scan_number(const Scan *scan, const char *p)
{
    const char *end = p;
    while (isalnum((unsigned char)*end) || *end == '.' ||
           ((*end == '-' || *end == '+') && (end[-1] == 'e' || end[-1] == 'E')))
        end++;
    size_t length = (size_t)(end - p);
    int hexadecimal = p[0] == '0' && (p[1] == 'x' || p[1] == 'X');
    if (!hexadecimal && (memchr(p, '.', length) || memchr(p, 'e', length) || memchr(p, 'E', length)))
        return end;
    int marked_long = end[-1] == 'L';
    errno = 0;
    unsigned long long value = strtoull(p, NULL, hexadecimal ? 16 : 10);
    unsigned long long most = marked_long ? LLONG_MAX : INT_MAX;
    if (errno == ERANGE || value > most) {
        fault_at(scan->fault, scan->path, scan->line,
                 "the whole number %.*s is too large to be read; write it with a decimal point",
                 length > 40 ? 40 : (int)length, p);
        return NULL;
    }
    return end;
}

/* Skip a comment or text that starts at p, counting lines; NULL when nothing of the kind starts. */
static const char *skip_quiet(Scan *scan, const char *p)
{
    const char *end;
    if (*p == '#' || (p[0] == '/' && p[1] == '/'))
        return p + strcspn(p, "\n");
    if (p[0] == '/' && p[1] == '*') {
        end = strstr(p + 2, "*/");
        end = end ? end + 2 : p + strlen(p);
    } else if (*p == '"') {
        end = p + 1;
        while (*end && *end != '"')
            end += *end == '\\' && end[1] ? 2 : 1;
        end += *end == '"';
    } else {
        return NULL;
    }
    for (; p < end; p++)
        scan->line += *p == '\n';
    return end;
}

static int scan_text(Scan *scan, const char *text)
{
    const char *p = text;
    while (*p) {
        const char *after = skip_quiet(scan, p);
        if (after) {
            p = after;
        } else if (*p == '@') {
            const char *quote = p + strcspn(p, "\"\n");
            const char *close = *quote == '"' ? quote + 1 + strcspn(quote + 1, "\"\n") : quote;
            if (*quote == '"' && *close == '"' && scan_include(scan, quote + 1, (size_t)(close - quote - 1)))
                return scan->fault->code;
            p = *close == '"' ? close + 1 : close;
        } else if (isalpha((unsigned char)*p) || *p == '_' || *p == '*') {
            /* a name, which may hold digits */
            while (isalnum((unsigned char)*p) || strchr("_-*", *p ? *p : ' '))
                p++;
        } else if (*p == '.' && isdigit((unsigned char)p[1])) {
            /* a fraction such as .5: its digits are no whole number */
            p += 1 + strspn(p + 1, "0123456789eE");
        } else if (isdigit((unsigned char)*p)) {
            p = scan_number(scan, p);
            if (!p)
                return scan->fault->code;
        } else {
            scan->line += *p == '\n';
            p++;
        }
    }
    return 0;
}

int settings_scan(const char *text, const char *path, const char *folder, Fault *fault)
{
    Scan scan = {path, folder, 1, 0, fault};
    return scan_text(&scan, text);
}
