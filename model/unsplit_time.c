/* unsplit_time: the unsplit column through time.
 *
 * TR-BDF2 (Bank et al. 1985, IEEE Trans. Electron Devices 32, 1992) as an implicit Runge-Kutta method with an
 * explicit first stage (Hosea and Shampine 1996, Appl. Numer. Math. 20, 21): order 2, L-stable, stiffly
 * accurate, both stages with the matrix A - M / (d h). With z = h f,
 *     X1 = x + d (z0 + z1)           at t + 2 d h,   d = 1 - sqrt(2)/2,
 *     X2 = x + w (z0 + z1) + d z2    at t + h,       w = sqrt(2)/4,   x after = X2,
 * and the error by the companion of order 3, weights (1-w)/3, (3w+1)/3, d/3, filtered through the matrix. The
 * tendency at the end of a step comes from the stage's own equation, not from a fresh evaluation, which would
 * carry what Newton's method left over times the fastest rate.
 */
#include "unsplit.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

static const double D = 0.29289321881345247560, W = 0.35355339059327376220;
static const double SAFETY = 0.8, SHRINK = 0.2, GROW = 3.0;
/* s: the first step of a run that says nothing, and where to give up. */
static const double FIRST = 60.0, SHORTEST = 1e-3;
static const double NEWTON = 0.02; /* of the tolerance: what an iteration may leave */
static const int ITERATIONS = 10;

typedef struct {
    double *before, *z0, *z1, *z2, *known, *tendency, *step; /* [unknowns] */
    double *x;                                               /* [solved][padded] */
    unsigned char *was_kept;                                 /* [unknowns] */
    double *block;
} Room;

static int make_room(Room *room, const Unsplit *unsplit, Fault *fault)
{
    size_t n = (size_t)unsplit->unknowns;
    size_t field = (size_t)unsplit->solved * (size_t)unsplit->model->grid.padded;
    double **array[] = {&room->before, &room->z0,       &room->z1,  &room->z2,
                        &room->known,  &room->tendency, &room->step};
    size_t arrays = sizeof array / sizeof array[0];
    room->block = calloc(arrays * n + field, sizeof(double));
    room->was_kept = calloc(n, 1);
    if (!room->block || !room->was_kept) {
        free(room->block);
        free(room->was_kept);
        return fault_memory(fault, "the unsplit column's steps");
    }
    for (size_t i = 0; i < arrays; i++)
        *array[i] = room->block + i * n;
    room->x = room->block + arrays * n;
    return 0;
}

static double *entry(const Unsplit *unsplit, double *x, int i)
{
    return &x[FIELD(unsplit->model->grid.padded, i % unsplit->solved, i / unsplit->solved)];
}

/* Root mean square over the species, of the worst layer; kept equations have no error. */
static double norm(const Unsplit *unsplit, const double *error, const double *before, double *x,
                   const UnsplitStepping *stepping)
{
    double worst = 0.0;
    for (int l = 0; l < unsplit->layers; l++) {
        double sum = 0.0, least = stepping->absolute / unsplit->conditions->air[l];
        for (int s = 0; s < unsplit->solved; s++) {
            int i = l * unsplit->solved + s;
            double size = fmax(fabs(before[i]), fabs(*entry(unsplit, x, i)));
            double value = unsplit->kept[i] ? 0.0 : error[i] / (least + stepping->relative * size);
            sum += value * value;
        }
        if (isnan(sum))
            return sum;
        worst = fmax(worst, sum);
    }
    return sqrt(worst / unsplit->solved);
}

/* Solve z = h f(known + d z) at the time set, from x = room->x, which becomes the stage. 1: no convergence.
 */
static int solve_stage(Unsplit *unsplit, Room *room, double h, double *z, UnsplitStepping *stepping)
{
    double last = HUGE_VAL;
    unsplit_keep(unsplit, room->x);
    for (int iteration = 0; iteration < ITERATIONS; iteration++) {
        unsplit_evaluate(unsplit, room->x, room->tendency, 0);
        stepping->iterations++;
        for (int i = 0; i < unsplit->unknowns; i++) {
            double away = unsplit->kept[i] ? 0.0 : (*entry(unsplit, room->x, i) - room->known[i]) / (D * h);
            room->step[i] = away - room->tendency[i];
        }
        unsplit_solve(unsplit, room->step, 0);
        double size = norm(unsplit, room->step, room->before, room->x, stepping);
        if (!isfinite(size) || (iteration > 1 && size > 2.0 * last))
            return 1;
        for (int i = 0; i < unsplit->unknowns; i++)
            *entry(unsplit, room->x, i) += room->step[i];
        unsplit_keep(unsplit, room->x);
        if (size <= NEWTON) {
            for (int i = 0; i < unsplit->unknowns; i++)
                z[i] = unsplit->kept[i] ? 0.0 : (*entry(unsplit, room->x, i) - room->known[i]) / D;
            return 0;
        }
        last = size;
    }
    return 1;
}

static double years_at(double time, double seconds, int frozen)
{
    return frozen ? time : time + seconds / YEAR_SECONDS;
}

/* The moment itself, but just before it where a year begins. */
static double before_jump(double time)
{
    double year = round(time);
    return fabs(time - year) < 1e-9 ? nextafter(year, 0.0) : time;
}

/* Both stages and the error's norm; 1 when a stage does not converge. z0 is h f at the start. */
static int attempt(Unsplit *unsplit, Room *room, double time, double h, int frozen, double *error,
                   UnsplitStepping *stepping)
{
    int n = unsplit->unknowns;
    unsplit_set_time(unsplit, years_at(time, 2.0 * D * h, frozen));
    for (int i = 0; i < n; i++)
        room->known[i] = room->before[i] + D * room->z0[i];
    if (solve_stage(unsplit, room, h, room->z1, stepping))
        return 1;
    unsplit_set_time(unsplit, frozen ? time : before_jump(years_at(time, h, 0)));
    for (int i = 0; i < n; i++)
        room->known[i] = room->before[i] + W * (room->z0[i] + room->z1[i]);
    if (solve_stage(unsplit, room, h, room->z2, stepping))
        return 1;
    /* (1 - d h A)^-1 e = -(A - M / (d h))^-1 e / (d h) */
    for (int i = 0; i < n; i++) {
        double raw = (W - (1.0 - W) / 3.0) * room->z0[i] + (W - (3.0 * W + 1.0) / 3.0) * room->z1[i] +
                     (D - D / 3.0) * room->z2[i];
        room->step[i] = unsplit->kept[i] ? 0.0 : -raw / (D * h);
    }
    unsplit_solve(unsplit, room->step, 0);
    *error = norm(unsplit, room->step, room->before, room->x, stepping);
    return 0;
}

/* Below minus the absolute tolerance where it was not before. */
static int falls_too_low(const Unsplit *unsplit, const Room *room, double absolute)
{
    for (int i = 0; i < unsplit->unknowns; i++) {
        double now = *entry(unsplit, room->x, i), air = unsplit->conditions->air[i / unsplit->solved];
        if (now * air < -absolute && now < 2.0 * room->before[i])
            return 1;
    }
    return 0;
}

/* When the schedule next bends: abundances in the middles of years; emissions jump where years begin, and may
 * take over from an abundance there. */
static double next_bend(const Unsplit *unsplit, double time)
{
    double middle = floor(time + 0.5 + 1e-9) + 0.5, start = floor(time + 1e-9) + 1.0;
    return unsplit->model->schedule.lines && start < middle ? start : middle;
}

/* The end of a step belongs to the year before, the start of the next one to the year that begins. Put what
 * has jumped between the two into z0, which is for steps of h: room->step and was_kept hold what was given
 * and kept, room->tendency is that of now. */
static void jump(const Unsplit *unsplit, Room *room, double h)
{
    for (int i = 0; i < unsplit->unknowns; i++) {
        if (unsplit->kept[i])
            room->z0[i] = 0.0;
        else if (room->was_kept[i]) /* emissions take over: nothing is known yet */
            room->z0[i] = h * room->tendency[i];
        else
            room->z0[i] += h * (unsplit->given[i] - room->step[i]) / unsplit->mass[i / unsplit->solved];
    }
}

static int advance(Unsplit *unsplit, double *x, double *time, double seconds, int frozen,
                   UnsplitStepping *stepping, Room *room, Fault *fault)
{
    int n = unsplit->unknowns, fresh = 0;
    size_t bytes = (size_t)unsplit->solved * (size_t)unsplit->model->grid.padded * sizeof(double);
    double left = seconds, h = stepping->step > 0.0 ? stepping->step : FIRST, error = 0.0;
    for (int i = 0; i < n; i++)
        room->z0[i] = NAN; /* until evaluated */
    for (double z0_is_for = 0.0; left > 1e-9 * seconds;) {
        double bend = next_bend(unsplit, *time);
        double most = frozen ? left : fmin(left, (bend - *time) * YEAR_SECONDS);
        double tried = h < 0.9 * most ? h : h < most ? 0.5 * most : most;
        if (stepping->fixed > 0.0)
            tried = fmin(stepping->fixed, most);
        if (!fresh) {
            memcpy(room->step, unsplit->given, (size_t)n * sizeof(double));
            memcpy(room->was_kept, unsplit->kept, (size_t)n);
            unsplit_set_time(unsplit, *time);
            unsplit_keep(unsplit, x);
            unsplit_evaluate(unsplit, x, room->tendency, 1);
            for (int i = 0; i < n; i++)
                room->before[i] = *entry(unsplit, x, i);
            for (int i = 0; z0_is_for == 0.0 && i < n; i++)
                room->z0[i] = unsplit->kept[i] ? 0.0 : room->tendency[i] * tried;
            if (z0_is_for == 0.0)
                z0_is_for = tried;
            else
                jump(unsplit, room, z0_is_for);
            fresh = 1;
        }
        for (int i = 0; i < n; i++)
            room->z0[i] *= tried / z0_is_for;
        z0_is_for = tried;
        int code = unsplit_factorise(unsplit, x, 1.0 / (D * tried), 1, fault);
        if (code)
            return code;
        memcpy(room->x, x, bytes);
        int failed = attempt(unsplit, room, *time, tried, frozen, &error, stepping);
        int low = !failed && falls_too_low(unsplit, room, stepping->absolute);
        if (failed || low || (!(error <= 1.0) && !(stepping->fixed > 0.0))) {
            stepping->rejections++;
            h = tried * (failed || low ? 0.25 : fmax(SHRINK, SAFETY / cbrt(error)));
            if (!(h > SHORTEST) || stepping->fixed > 0.0)
                return fault_set(fault, FAULT_NUMERICS,
                                 "unsplit column, year %.3f: a step of %.3g s fails; loosen the tolerance or "
                                 "shorten the step",
                                 *time, tried);
            continue;
        }
        stepping->steps++;
        memcpy(x, room->x, bytes);
        for (int i = 0; i < n; i++)
            room->z0[i] = room->z2[i];
        left -= tried;
        *time = years_at(*time, tried, frozen);
        if (!frozen && fabs(*time - bend) < 1e-9)
            *time = bend; /* not a year too early by rounding */
        h = tried * fmin(GROW, fmax(SHRINK, error > 0.0 ? SAFETY / cbrt(error) : GROW));
        stepping->step = h;
        fresh = 0;
    }
    return 0;
}

int unsplit_advance(Unsplit *unsplit, double *x, double *time, double years, int frozen,
                    UnsplitStepping *stepping, Fault *fault)
{
    Room room;
    double end = *time + years;
    int code = make_room(&room, unsplit, fault);
    if (code)
        return code;
    code = advance(unsplit, x, time, years * YEAR_SECONDS, frozen, stepping, &room, fault);
    if (!code && !frozen)
        *time = end; /* no drift from adding steps */
    free(room.block);
    free(room.was_kept);
    return code;
}
