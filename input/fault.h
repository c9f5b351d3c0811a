/* fault: how a failure travels upward.
 *
 * Every fallible function takes a Fault * as its last argument, returns 0 on success and the fault's
 * code otherwise. The code is also the exit code of the program. A Fault holds one line: file and
 * line, what is wrong, what to do. Nothing is printed below model/main.c and there is no global
 * state, so a thousand columns can fail side by side.
 */
#ifndef SKYMEND_FAULT_H
#define SKYMEND_FAULT_H

#include <stddef.h>

enum FaultCode {
    FAULT_NONE = 0,
    FAULT_INPUT = 2,        /* the request or an input is wrong */
    FAULT_NUMERICS = 3,     /* the numerics failed */
    FAULT_OUTPUT = 4,       /* the output could not be written */
    FAULT_INTERRUPTED = 130 /* stopped by a signal, state saved */
};

typedef struct {
    int code;        /* enum FaultCode */
    char text[1200]; /* one line, no newline at its end */
} Fault;

/* Record a fault (printf style) and return its code. Keeps the first fault if one is already set. */
int fault_set(Fault *fault, int code, const char *format, ...) __attribute__((format(printf, 3, 4)));

/* The same, led by "file:line: ". line <= 0 leaves the line out. Code is FAULT_INPUT. */
int fault_at(Fault *fault, const char *file, int line, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

/* Out of memory, in one wording (FAULT_NUMERICS); what names the thing that was to be made. */
int fault_memory(Fault *fault, const char *what);

/* The entry of words[count] nearest to word by edit distance, or NULL when none is near enough to be
 * worth suggesting: distance above a third of the word's length (at least 2), a wrong case or a hyphen
 * for an underscore counting half, unless word (3 letters or more) is the start of the entry. */
const char *fault_nearest(const char *word, const char *const *words, size_t count);

#endif
