/* rosenbrock: workspace and the choice of vector variant. */
#include "rosenbrock.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "rosenbrock_kernel.h"
#include "vector.h"

int solver_work_make(SolverWork **made, const Kernel *kernel, Fault *fault)
{
    *made = NULL;
    SolverWork *work = calloc(1, sizeof *work);
    if (!work)
        return fault_memory(fault, "solver workspace");
    size_t species = (size_t)kernel->species, reactions = (size_t)kernel->reactions;
    size_t entries = (size_t)kernel->entries, derivatives = (size_t)kernel->derivatives;
    struct {
        double **array;
        size_t rows;
    } part[] = {
        {&work->u, species + 1},    {&work->stage_u, species + 1}, {&work->w, reactions},
        {&work->w3, reactions},     {&work->w4, reactions},        {&work->d, derivatives},
        {&work->jacobian, entries}, {&work->lu, entries},          {&work->pivot, species},
        {&work->f, species},        {&work->slope, species},       {&work->stage, 4 * species},
        {&work->next, species},     {&work->k, reactions},         {&work->k_end, reactions},
        {&work->free, species},     {&work->held, species},        {&work->rhs, species},
    };
    size_t total = 0, parts = sizeof part / sizeof part[0];
    for (size_t i = 0; i < parts; i++)
        total += part[i].rows * PACK;
    work->block = aligned_alloc(PACK * sizeof(double), total * sizeof(double));
    work->slope_from = malloc(species * sizeof *work->slope_from);
    work->slope_to = malloc(species * sizeof *work->slope_to);
    if (!work->block || !work->slope_from || !work->slope_to) {
        solver_work_free(work);
        return fault_memory(fault, "solver workspace");
    }
    double *at = work->block;
    memset(at, 0, total * sizeof *at);
    for (size_t i = 0; i < parts; i++) {
        *part[i].array = at;
        at += part[i].rows * PACK;
    }
    for (size_t lane = 0; lane < PACK; lane++)
        work->u[species * PACK + lane] = work->stage_u[species * PACK + lane] = 1.0;
    work->slope_first = work->slope_last = -1; /* no range yet */
    *made = work;
    return 0;
}

void solver_work_free(SolverWork *work)
{
    if (!work)
        return;
    free(work->block);
    free(work->slope_from);
    free(work->slope_to);
    free(work);
}

/* Narrowest first. */
static const SolverVariant every_variant[] = {
    {"baseline", solver_advance_baseline, solver_evaluate_baseline},
#ifdef SKYMEND_X86
    {"avx2", solver_advance_avx2, solver_evaluate_avx2},
    {"avx512", solver_advance_avx512, solver_evaluate_avx512},
#endif
};

static const SolverVariant *widest(void)
{
    return &every_variant[vector_set()];
}

int solver_variants(SolverVariant variant[SOLVER_VARIANTS])
{
    int count = (int)(widest() - every_variant) + 1;
    for (int i = 0; i < count; i++)
        variant[i] = every_variant[i];
    return count;
}

const char *solver_variant(void)
{
    return widest()->name;
}

int solver_advance(const Kernel *kernel, SolverWork *work, PackProblem *problem, double duration,
                   const Tolerance *tolerance, SolverCounts *counts, int *where)
{
    return widest()->advance(kernel, work, problem, duration, tolerance, counts, where);
}

void solver_evaluate(const Kernel *kernel, SolverWork *work, const PackProblem *problem, double *f,
                     double *jacobian)
{
    widest()->evaluate(kernel, work, problem, f, jacobian);
}
