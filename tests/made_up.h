/* made_up: what the tests of kernel and solver share: made-up mechanisms, by hand and at random, with a pack
 * of states to run them on. SKYMEND_SEED in the environment changes the random inputs; the seed is printed.
 */
#ifndef SKYMEND_TEST_MADE_UP_H
#define SKYMEND_TEST_MADE_UP_H

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "../chem/kernel.h"
#include "../chem/rosenbrock.h"
#include "../input/constants.h"

/* ---- random numbers and checks ---- */

static uint64_t random_state;

static inline void random_start(void)
{
    const char *text = getenv("SKYMEND_SEED");
    random_state = text ? strtoull(text, NULL, 10) : 1931u;
    print_message("           random seed %llu\n", (unsigned long long)random_state);
}

static inline double random_unit(void)
{ /* splitmix64 (Steele, Lea, Flood 2014), uniform in [0, 1) */
    uint64_t z = (random_state += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return (double)((z ^ (z >> 31)) >> 11) * 0x1p-53;
}

static inline int random_below(int count)
{
    return (int)(random_unit() * count);
}

static inline void check_near(const char *what, double got, double want, double tolerance)
{
    if (!(fabs(got - want) <= tolerance))
        fail_msg("%s: got %.17g, want %.17g within %.3g", what, got, want, tolerance);
}

static inline double *field(int rows)
{ /* [rows][PACK] */
    double *made = aligned_alloc(64, (size_t)(rows ? rows : 1) * PACK * sizeof *made);
    assert_non_null(made);
    memset(made, 0, (size_t)(rows ? rows : 1) * PACK * sizeof *made);
    return made;
}

/* ---- mechanisms by hand ---- */

typedef struct {
    int reactants, reactant[3];
    int products, product[6];
} Sketch;

/* A mechanism with nothing but what the kernel reads; the last `washouts` reactions are washout. */
static inline Mechanism *sketch_mechanism(int species, const Sketch *sketch, int reactions, int washouts)
{
    Mechanism *mechanism = calloc(1, sizeof *mechanism);
    assert_non_null(mechanism);
    mechanism->species = mechanism->solved = species;
    mechanism->reactions = reactions;
    mechanism->washout_first = reactions - washouts;
    mechanism->photolysis_first = mechanism->surface_first = mechanism->washout_first;
    mechanism->reaction = calloc((size_t)reactions, sizeof *mechanism->reaction);
    assert_non_null(mechanism->reaction);
    for (int r = 0; r < reactions; r++) {
        Reaction *reaction = &mechanism->reaction[r];
        int net[64] = {0};
        assert_true(species <= 64);
        reaction->reactants = sketch[r].reactants;
        for (int i = 0; i < sketch[r].reactants; i++) {
            reaction->reactant[i] = sketch[r].reactant[i];
            net[sketch[r].reactant[i]]--;
        }
        for (int i = 0; i < sketch[r].products; i++)
            net[sketch[r].product[i]]++;
        for (int s = 0; s < species; s++)
            if (net[s]) {
                reaction->changed[reaction->changes] = s;
                reaction->change[reaction->changes++] = net[s];
            }
    }
    return mechanism;
}

/* ---- a bench: one mechanism with everything a call needs ---- */

typedef struct {
    Mechanism *mechanism;
    Kernel *kernel;
    SolverWork *work;
    PackProblem problem;
    double *y, *k, *slope;
    SolverCounts counts;
    Tolerance tolerance;
    int where;
} Bench;

static inline Bench bench_make(Mechanism *mechanism)
{
    Bench bench = {.mechanism = mechanism, .tolerance = {1e-6, 1e-12, 100000}};
    Fault fault = {0};
    assert_int_equal(kernel_make(&bench.kernel, mechanism, &fault), 0);
    assert_int_equal(solver_work_make(&bench.work, bench.kernel, &fault), 0);
    bench.y = field(mechanism->solved);
    bench.k = field(mechanism->reactions);
    bench.slope = field(mechanism->reactions);
    bench.problem = (PackProblem){.y = bench.y, .k = bench.k};
    return bench;
}

static inline void bench_free(Bench *bench)
{
    kernel_free(bench->kernel);
    solver_work_free(bench->work);
    free(bench->y);
    free(bench->k);
    free(bench->slope);
    free(bench->mechanism->reaction);
    free(bench->mechanism);
}

static inline int bench_run(Bench *bench, double duration)
{
    return solver_advance(bench->kernel, bench->work, &bench->problem, duration, &bench->tolerance,
                          &bench->counts, &bench->where);
}

static inline void use_slope(Bench *bench)
{
    bench->problem.k_slope = bench->slope;
    bench->problem.slope_last = bench->mechanism->reactions;
}

/* The same duration in `count` steps of equal length, whatever the error estimate says. */
static inline void bench_fixed_steps(Bench *bench, double duration, int count)
{
    bench->tolerance = (Tolerance){1e30, 1e30, 1};
    for (int i = 0; i < count; i++) {
        bench->problem.step = duration / count;
        assert_int_equal(bench_run(bench, duration / count), SOLVER_DONE);
    }
}

/* ---- random mechanisms that keep atoms ---- */

enum { RANDOM_SPECIES = 17, RANDOM_REACTIONS = 60, RANDOM_WASHOUTS = 3 };

static inline int atoms_of(int species)
{
    return 1 + species % 3;
}

/* Orders 0 to 3 with repeats; species s holds 1 + s % 3 atoms and every reaction of order above 0 keeps them.
 */
static inline Mechanism *random_mechanism(void)
{
    Sketch sketch[RANDOM_REACTIONS] = {0};
    for (int r = 0; r < RANDOM_REACTIONS - RANDOM_WASHOUTS; r++) {
        Sketch *one = &sketch[r];
        int atoms = 0;
        one->reactants = 1 + random_below(3);
        for (int i = 0; i < one->reactants; i++) {
            one->reactant[i] = i && random_unit() < 0.3 ? one->reactant[0] : random_below(RANDOM_SPECIES);
            atoms += atoms_of(one->reactant[i]);
        }
        while (atoms > 0) {
            int s = random_below(RANDOM_SPECIES);
            if (one->products == 5) /* room for one more: the one that fits exactly, if it exists */
                s = atoms - 1;
            if (atoms_of(s) > atoms || (one->products == 5 && atoms > 3)) {
                one->products = 0;
                atoms = 0;
                for (int i = 0; i < one->reactants; i++)
                    atoms += atoms_of(one->reactant[i]);
                continue;
            }
            one->product[one->products++] = s;
            atoms -= atoms_of(s);
        }
    }
    for (int w = 0; w < RANDOM_WASHOUTS; w++) {
        Sketch *one = &sketch[RANDOM_REACTIONS - RANDOM_WASHOUTS + w];
        one->reactants = 1;
        one->reactant[0] = 4 * w + 1;
    }
    return sketch_mechanism(RANDOM_SPECIES, sketch, RANDOM_REACTIONS, RANDOM_WASHOUTS);
}

/* Stiff: coefficients over eight decades. */
static inline void random_inputs(Bench *bench)
{
    for (int i = 0; i < bench->mechanism->solved * PACK; i++)
        bench->y[i] = 0.1 + random_unit();
    for (int r = 0; r < bench->mechanism->reactions; r++)
        for (int l = 0; l < PACK; l++) {
            bench->k[r * PACK + l] = pow(10.0, 4.0 - 8.0 * random_unit());
            bench->slope[r * PACK + l] =
                r < bench->mechanism->washout_first ? bench->k[r * PACK + l] * (random_unit() - 0.4) : 0.0;
        }
}

/* Two held species, each in some lanes. */
typedef struct {
    int species[2];
    double *is_free, *value; /* [2][PACK] */
} Holding;

static inline Holding hold_some(Bench *bench)
{
    Holding holding = {{2, 9}, field(2), field(2)};
    for (int i = 0; i < 2; i++)
        for (int l = 0; l < PACK; l++) {
            int held = (l + i) % 3 == 0;
            holding.is_free[i * PACK + l] = !held;
            holding.value[i * PACK + l] = held ? 0.2 + random_unit() : 0.0;
        }
    bench->problem.held = 2;
    bench->problem.held_species = NULL; /* set by the caller, whose copy stays in place */
    bench->problem.held_free = holding.is_free;
    bench->problem.held_value = holding.value;
    return holding;
}

#endif
