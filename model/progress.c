/* progress: bar and log lines. */
#include "progress.h"

#include <string.h>
#include <time.h>
#include <unistd.h>

static double now(void)
{
    struct timespec at;
    clock_gettime(CLOCK_MONOTONIC, &at);
    return (double)at.tv_sec + 1e-9 * (double)at.tv_nsec;
}

void progress_open(ProgressBar *bar, int quiet)
{
    bar->out = quiet ? NULL : stderr;
    bar->terminal = isatty(STDERR_FILENO);
    bar->started = bar->last = now();
}

void progress_show(ProgressBar *bar, const Progress *progress)
{
    if (!bar->out)
        return;
    double at = now();
    if (at - bar->last < (bar->terminal ? 0.2 : 10.0))
        return;
    bar->last = at;
    double left =
        progress->share > 0.0 ? (at - bar->started) * (1.0 - progress->share) / progress->share : 0.0;
    char when[32];
    if (progress->spinning_up)
        snprintf(when, sizeof when, "spin-up");
    else
        snprintf(when, sizeof when, "%.1f", progress->time);
    if (bar->terminal) {
        char fill[31];
        int filled = (int)(30.0 * progress->share);
        memset(fill, '.', 30);
        memset(fill, '=', (size_t)filled);
        fill[30] = '\0';
        fprintf(bar->out, "\r[%s] %3.0f %%  %-8s ozone %.1f DU  %.0f s left   ", fill,
                100.0 * progress->share, when, progress->column_du, left);
    } else {
        fprintf(bar->out, "%.0f %% done, %s, ozone %.1f DU, %.0f s left\n", 100.0 * progress->share, when,
                progress->column_du, left);
    }
    fflush(bar->out);
}

void progress_close(ProgressBar *bar)
{
    if (bar->out && bar->terminal)
        fprintf(bar->out, "\r%78s\r", "");
    bar->out = NULL;
}
