/* progress: how far a long run is, on standard error: a bar with time left on a terminal, a line every ten
 * seconds in a log. */
#ifndef SKYMEND_PROGRESS_H
#define SKYMEND_PROGRESS_H

#include <stdio.h>

#include "projection.h"

typedef struct {
    FILE *out; /* NULL: silent */
    int terminal;
    double started, last; /* s, monotonic clock */
} ProgressBar;

void progress_open(ProgressBar *bar, int quiet);
void progress_show(ProgressBar *bar, const Progress *progress);
void progress_close(ProgressBar *bar); /* clears the bar on a terminal */

#endif
