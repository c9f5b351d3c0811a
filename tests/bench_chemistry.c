/* libs: sundials */
/* Timing of the chemistry, no test: a column of 80 layers (10 packs) through an explicit day by the solver,
 * and one layer at a time by CVODE with a dense analytic Jacobian, on one core in one run. Both are asked for
 * several tolerances; what each delivers is measured on every tenth layer against CVODE at relative tolerance
 * 1e-9, and the two are compared at equal delivered error. */
#include <time.h>

#include "../chem/rosenbrock_kernel.h"
#include "chemistry_case.h"

enum { SAMPLES = CASE_LAYERS / 10, ASKED = 4, ASKED_CVODE = 6 };
static const double asked[ASKED] = {1e-2, 1e-3, 1e-4, 1e-5};
static const double asked_cvode[ASKED_CVODE] = {1e-2, 1e-3, 1e-4, 1e-5, 3e-6, 1e-6};
static const double ABSOLUTE = 1e2; /* cm-3 */

typedef struct {
    double seconds, error;
    long steps;
} Outcome;

static double clock_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static int sampled(int layer)
{
    return layer % 10 == 5 ? layer / 10 : -1;
}

/* Root mean square over samples, noon and midnight of error / (relative size + what absolute tolerance
 * hides). */
static double delivered(int n, const double *got, const double *want)
{ /* [2][SAMPLES][n] */
    double sum = 0.0;
    for (int i = 0; i < 2 * SAMPLES * n; i++) {
        double error = (got[i] - want[i]) / (fabs(want[i]) + 100.0 * ABSOLUTE);
        sum += error * error;
    }
    return sqrt(sum / (2 * SAMPLES * n));
}

static Outcome run_solver(const ChemistryCase *c, SolverWork *work, double relative, const double *want,
                          double *got)
{
    int n = c->mechanism->solved;
    double *y = case_array((size_t)c->kernel->species * PACK);
    Tolerance tolerance = {relative, ABSOLUTE, 1000000};
    SolverCounts counts = {0};
    double begin = clock_now();
    for (int first = 0; first < CASE_LAYERS; first += PACK) {
        int layer[PACK], where = 0;
        for (int l = 0; l < PACK; l++)
            layer[l] = first + l;
        PackProblem problem = {.y = y};
        pack_start(c, layer, y);
        for (int half = 0; half < 2; half++) {
            int from = half ? CASE_NOON : 0, to = half ? CASE_SEGMENTS : CASE_NOON;
            if (pack_through(c, work, layer, &problem, from, to, &tolerance, &counts, &where)) {
                fprintf(stderr, "solver stopped at layer %d\n", first + where / c->kernel->species);
                exit(1);
            }
            for (int l = 0; l < PACK; l++)
                for (int s = 0; sampled(layer[l]) >= 0 && s < n; s++)
                    got[(half * SAMPLES + sampled(layer[l])) * n + s] = y[s * PACK + l];
        }
    }
    double seconds = clock_now() - begin;
    free(y);
    return (Outcome){seconds, delivered(n, got, want), counts.factorisations};
}

static Outcome run_cvode(const ChemistryCase *c, double relative, double absolute, int samples_only,
                         const double *want, double *got)
{
    int n = c->mechanism->solved;
    double *y = case_array((size_t)n), *noon = case_array((size_t)n);
    long steps = 0;
    double begin = clock_now();
    for (int l = 0; l < CASE_LAYERS; l++) {
        int sample = sampled(l);
        if (samples_only && sample < 0)
            continue;
        for (int s = 0; s < n; s++)
            y[s] = c->start[s * CASE_LAYERS + l];
        long taken = cvode_day(c, l, y, noon, relative, absolute);
        if (taken < 0) {
            fprintf(stderr, "CVODE stopped with %ld at layer %d\n", taken, l);
            exit(1);
        }
        steps += taken;
        if (sample < 0)
            continue;
        memcpy(got + sample * n, noon, (size_t)n * sizeof *got);
        memcpy(got + (SAMPLES + sample) * n, y, (size_t)n * sizeof *got);
    }
    double seconds = clock_now() - begin;
    free(y);
    free(noon);
    return (Outcome){seconds, want ? delivered(n, got, want) : 0.0, steps};
}

/* Seconds CVODE takes for this error, from its outcomes by interpolation in the logarithms; < 0: outside of
 * them. */
static double cvode_seconds_at(const Outcome outcome[ASKED_CVODE], double error)
{
    for (int i = 1; i < ASKED_CVODE; i++) {
        if (error > outcome[i - 1].error || error < outcome[i].error)
            continue;
        double share = log(outcome[i - 1].error / error) / log(outcome[i - 1].error / outcome[i].error);
        return exp(log(outcome[i - 1].seconds) + share * log(outcome[i].seconds / outcome[i - 1].seconds));
    }
    return -1.0;
}

/* Microseconds of one four-stage step of one pack at 30 km by day: plain, with moving coefficients, with sums
 * too. */
static void time_variants(const ChemistryCase *c, SolverWork *work)
{
    const Mechanism *m = c->mechanism;
    size_t rows = (size_t)c->kernel->species, reactions = (size_t)m->reactions;
    double *start = case_array(rows * PACK), *y = case_array(rows * PACK), *sum_y = case_array(rows * PACK);
    double *k = case_array(reactions * PACK), *slope = case_array(reactions * PACK);
    double *sum_w = case_array(reactions * PACK);
    SolverVariant variant[SOLVER_VARIANTS];
    int variants = solver_variants(variant), layer[PACK];
    for (int l = 0; l < PACK; l++)
        layer[l] = 26 + l;
    pack_start(c, layer, start);
    for (int r = 0; r < m->reactions; r++)
        for (int l = 0; l < PACK; l++) {
            k[r * PACK + l] = case_coefficient(c, r, layer[l], 8, 0);
            slope[r * PACK + l] =
                (case_coefficient(c, r, layer[l], 8, 1) - k[r * PACK + l]) / segment_length(8);
        }
    printf("microseconds of a four-stage step of one pack of %d layers:\n", PACK);
    printf("  %-10s %10s %12s %10s\n", "code", "constant k", "k moves", "and sums");
    for (int v = 0; v < variants; v++) {
        printf("  %-10s", variant[v].name);
        for (int kind = 0; kind < 3; kind++) {
            PackProblem problem = {.y = y,
                                   .k = k,
                                   .k_slope = kind ? slope : NULL,
                                   .slope_first = m->photolysis_first,
                                   .slope_last = m->surface_first,
                                   .sum_y = kind == 2 ? sum_y : NULL,
                                   .sum_w = kind == 2 ? sum_w : NULL};
            Tolerance any = {1e30, 1e30, 1};
            SolverCounts counts = {0};
            double best = HUGE_VAL;
            int where;
            for (int repeat = 0; repeat < 15; repeat++) {
                enum { STEPS = 500 };
                memcpy(y, start, rows * PACK * sizeof *y);
                double begin = clock_now();
                for (int i = 0; i < STEPS; i++) {
                    problem.step = 60.0;
                    variant[v].advance(c->kernel, work, &problem, 60.0, &any, &counts, &where);
                }
                best = fmin(best, (clock_now() - begin) / STEPS * 1e6);
            }
            printf(" %11.2f", best);
        }
        printf("\n");
    }
    free(start);
    free(y);
    free(sum_y);
    free(k);
    free(slope);
    free(sum_w);
}

int main(void)
{
    ChemistryCase c;
    SolverWork *work;
    Fault fault = {0};
    if (case_make(&c, &fault) || solver_work_make(&work, c.kernel, &fault)) {
        fprintf(stderr, "%s\n", fault.text);
        return 1;
    }
    int n = c.mechanism->solved;
    const Kernel *kernel = c.kernel;
    printf("%d species, %d reactions, %d matrix entries, %d products of the factorisation; solver code %s\n",
           n, kernel->reactions, kernel->entries, kernel->product_first[kernel->entries], solver_variant());
    time_variants(&c, work);

    size_t size = 2 * SAMPLES * (size_t)n;
    double *want = case_array(size), *got = case_array(size);
    run_cvode(&c, 1e-9, 1e-4, 1, NULL, want);
    Outcome solver[ASKED], cvode[ASKED_CVODE];
    printf("24 h of %d layers on one core; absolute tolerance %.0e cm-3\n", CASE_LAYERS, ABSOLUTE);
    printf("  %-9s %8s %10s %12s %14s %12s\n", "", "asked", "rms error", "steps", "layer-steps/s", "s");
    for (int i = 0; i < ASKED; i++) {
        Outcome *o = &solver[i];
        *o = run_solver(&c, work, asked[i], want, got);
        printf("  %-9s %8.0e %10.2e %12ld %14.3g %12.4f\n", "solver", asked[i], o->error, o->steps * PACK,
               (double)(o->steps * PACK) / o->seconds, o->seconds);
    }
    for (int i = 0; i < ASKED_CVODE; i++) {
        Outcome *o = &cvode[i];
        *o = run_cvode(&c, asked_cvode[i], ABSOLUTE, 0, want, got);
        printf("  %-9s %8.0e %10.2e %12ld %14.3g %12.4f\n", "CVODE", asked_cvode[i], o->error, o->steps,
               (double)o->steps / o->seconds, o->seconds);
    }
    for (int i = 0; i < ASKED; i++) {
        double seconds = cvode_seconds_at(cvode, solver[i].error);
        if (seconds > 0.0)
            printf("at rms error %.2e the solver takes %.4f s, CVODE %.3f s: ratio %.0f\n", solver[i].error,
                   solver[i].seconds, seconds, seconds / solver[i].seconds);
        else
            printf("rms error %.2e is outside of what CVODE delivered\n", solver[i].error);
    }
    free(want);
    free(got);
    solver_work_free(work);
    case_free(&c);
    return 0;
}
