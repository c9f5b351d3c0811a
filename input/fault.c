/* fault: see fault.h. */
#define _POSIX_C_SOURCE 200809L
#include "fault.h"

#include <ctype.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

enum { LONGEST_WORD = 63 };

/* A fault is one line whatever stood in the user's file, so control characters become blanks. */
static void flatten(char *text)
{
    for (; *text; text++)
        if (iscntrl((unsigned char)*text))
            *text = ' ';
}

static int record(Fault *fault, int code, const char *lead, const char *format, va_list arguments)
{
    if (fault->code != FAULT_NONE)
        return fault->code;
    fault->code = code;
    size_t used = strlen(lead);
    if (used >= sizeof fault->text)
        used = sizeof fault->text - 1;
    memcpy(fault->text, lead, used);
    vsnprintf(fault->text + used, sizeof fault->text - used, format, arguments);
    flatten(fault->text);
    return code;
}

int fault_set(Fault *fault, int code, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    int result = record(fault, code, "", format, arguments);
    va_end(arguments);
    return result;
}

int fault_at(Fault *fault, const char *file, int line, const char *format, ...)
{
    /* A path may be long; half the text stays free for the message itself. */
    char lead[sizeof fault->text / 2];
    if (line > 0)
        snprintf(lead, sizeof lead, "%s:%d: ", file, line);
    else
        snprintf(lead, sizeof lead, "%s: ", file);
    va_list arguments;
    va_start(arguments, format);
    int result = record(fault, FAULT_INPUT, lead, format, arguments);
    va_end(arguments);
    return result;
}

int fault_memory(Fault *fault, const char *what)
{
    return fault_set(fault, FAULT_NUMERICS, "out of memory for %s; use fewer layers or free some memory",
                     what);
}

/* ---- nearest word ---- */

static int least(int a, int b)
{
    return a < b ? a : b;
}

/* Cost of reading b for a, in half edits: a wrong case or a hyphen for an underscore is half a slip,
 * so that cfc-11 is nearer to CFC-11 than to any other gas. */
static int swap_cost(char a, char b)
{
    if (a == b)
        return 0;
    if (tolower((unsigned char)a) == tolower((unsigned char)b))
        return 1;
    if ((a == '-' || a == '_' || a == ' ') && (b == '-' || b == '_' || b == ' '))
        return 1;
    return 2;
}

/* Optimal string alignment distance in half edits: insert, delete, replace, swap of neighbours. */
static int distance(const char *a, size_t na, const char *b, size_t nb)
{
    int row[3][LONGEST_WORD + 1];
    int *before = row[0], *last = row[1], *now = row[2];
    for (size_t j = 0; j <= nb; j++)
        last[j] = 2 * (int)j;
    memcpy(before, last, sizeof row[0]);
    for (size_t i = 1; i <= na; i++) {
        now[0] = 2 * (int)i;
        for (size_t j = 1; j <= nb; j++) {
            int cost = last[j - 1] + swap_cost(a[i - 1], b[j - 1]);
            cost = least(cost, least(last[j], now[j - 1]) + 2);
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                cost = least(cost, before[j - 2] + 2);
            now[j] = cost;
        }
        int *free_row = before;
        before = last;
        last = now;
        now = free_row;
    }
    return last[nb];
}

/* Is word the start of other, up to case? A unit left off, such as top for top_km, is not near by
 * edit distance but plain to see. */
static int starts(const char *word, size_t length, const char *other)
{
    return length >= 3 && strncasecmp(word, other, length) == 0;
}

const char *fault_nearest(const char *word, const char *const *words, size_t count)
{
    size_t length = strlen(word);
    if (length == 0 || length > LONGEST_WORD)
        return NULL;
    int limit = length / 3 > 2 ? (int)(length / 3) : 2;
    const char *best = NULL;
    int best_cost = 2 * limit + 1;
    for (size_t k = 0; k < count; k++) {
        size_t other = strlen(words[k]);
        if (other > LONGEST_WORD)
            continue;
        int cost = distance(word, length, words[k], other);
        if (cost > 2 * limit && starts(word, length, words[k]))
            cost = 2 * limit;
        /* Replacing every letter is no likeness: a short word needs something in common. */
        if (cost < best_cost && cost < 2 * (int)length) {
            best = words[k];
            best_cost = cost;
        }
    }
    return best;
}
