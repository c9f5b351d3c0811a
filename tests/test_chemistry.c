/* libs: sundials */
/* Tests of the stiff solver on the whole mechanism through an explicit day, against CVODE (SUNDIALS;
 * Hindmarsh et al. 2005, ACM Trans. Math. Softw. 31, 363): BDF, dense analytic Jacobian, relative tolerance
 * 1e-9. CVODE's equations are read from the mechanism by a plain double loop and share no code with the
 * kernel. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "chemistry_case.h"

/* 15, 25, 35, 45 and 60 km, and three more to fill a pack; lowest layer first. */
static const int test_layer[PACK] = {15, 20, 25, 30, 35, 45, 50, 60};

typedef struct {
    ChemistryCase c;
    SolverWork *work;
    double *noon, *end; /* [PACK][solved] by CVODE */
} World;

static int make_world(void **state)
{
    static World world;
    Fault fault = {0};
    if (case_make(&world.c, &fault) || solver_work_make(&world.work, world.c.kernel, &fault)) {
        fprintf(stderr, "%s\n", fault.text);
        return -1;
    }
    int n = world.c.mechanism->solved;
    world.noon = case_array((size_t)n * PACK);
    world.end = case_array((size_t)n * PACK);
    for (int l = 0; l < PACK; l++) {
        double *y = world.end + l * n;
        for (int s = 0; s < n; s++)
            y[s] = world.c.start[s * CASE_LAYERS + test_layer[l]];
        long steps = cvode_day(&world.c, test_layer[l], y, world.noon + l * n, 1e-9, 1e-6);
        if (steps < 0) {
            fprintf(stderr, "CVODE stopped with %ld\n", steps);
            return -1;
        }
    }
    *state = &world;
    return 0;
}

static int free_world(void **state)
{
    World *world = *state;
    case_free(&world->c);
    solver_work_free(world->work);
    free(world->noon);
    free(world->end);
    return 0;
}

/* Largest |y - reference| / (absolute + relative |reference|) over pack and species; *which = lane * solved +
 * s. */
static double worst_error(const World *world, const double *y, const double *reference,
                          const Tolerance *tolerance, int *which)
{
    int n = world->c.mechanism->solved;
    double worst = 0.0;
    for (int l = 0; l < PACK; l++)
        for (int s = 0; s < n; s++) {
            double want = reference[l * n + s];
            double error =
                fabs(y[s * PACK + l] - want) / (tolerance->absolute + tolerance->relative * fabs(want));
            if (error > worst || isnan(error)) {
                worst = isnan(error) ? HUGE_VAL : error;
                *which = l * n + s;
            }
        }
    return worst;
}

static const char *name_of(const World *world, int which, char *text)
{ /* text: [60] */
    int n = world->c.mechanism->solved;
    snprintf(text, 60, "%s at %.1f km", mechanism_name(world->c.mechanism, which % n),
             test_layer[which / n] + 0.5);
    return text;
}

/* A day at three relative and three absolute tolerances: at noon and at midnight every species is within 10
 * times what was asked for. At an absolute tolerance of 1 cm-3 radicals count that have died away from 1e8
 * cm-3 to some hundred since dusk: what is left of exp(-k t) carries k t times the relative error, some 15
 * times, and the bound is wider. */
static void test_day_against_cvode(void **state)
{
    World *world = *state;
    const ChemistryCase *c = &world->c;
    double *y = case_array((size_t)c->kernel->species * PACK);
    char text[60];
    print_message(
        "           asked  abs cm-3  steps rejected  noon: error/asked  worst             midnight:\n");
    for (int i = 0; i < 9; i++) {
        Tolerance tolerance = {pow(10.0, -2 - i / 3), (double[]){1.0, 1e2, 1e4}[i % 3], 100000};
        SolverCounts counts = {0};
        PackProblem problem = {.y = y};
        int where = 0, at_noon = 0, at_end = 0;
        pack_start(c, test_layer, y);
        assert_int_equal(
            pack_through(c, world->work, test_layer, &problem, 0, CASE_NOON, &tolerance, &counts, &where),
            SOLVER_DONE);
        double noon = worst_error(world, y, world->noon, &tolerance, &at_noon);
        assert_int_equal(pack_through(c, world->work, test_layer, &problem, CASE_NOON, CASE_SEGMENTS,
                                      &tolerance, &counts, &where),
                         SOLVER_DONE);
        double end = worst_error(world, y, world->end, &tolerance, &at_end);
        print_message("           %.0e %8.0e %6ld %8ld  %6.2f %-22s", tolerance.relative, tolerance.absolute,
                      counts.steps, counts.rejections, noon, name_of(world, at_noon, text));
        print_message(" %6.2f %-22s lowest %.1e\n", end, name_of(world, at_end, text), counts.most_negative);
        double bound = tolerance.absolute < 10.0 ? 60.0 : 10.0;
        if (!(noon <= bound))
            fail_msg("noon: %s is off %g times the tolerance", name_of(world, at_noon, text), noon);
        if (!(end <= bound))
            fail_msg("midnight: %s is off %g times the tolerance", name_of(world, at_end, text), end);
        assert_true(counts.most_negative > -10.0 * tolerance.absolute);
    }
    free(y);
}

/* Atoms in solved species, counters and washout after a day against those before. The species turn over many
 * times a day (OH some 1e3 times), so that more than the last digit may go. O and F are not counted by the
 * kernel. */
static void test_atoms_through_a_day(void **state)
{
    World *world = *state;
    const ChemistryCase *c = &world->c;
    const Kernel *kernel = c->kernel;
    const Mechanism *m = c->mechanism;
    double *y = case_array((size_t)kernel->species * PACK),
           *start = case_array((size_t)kernel->species * PACK);
    double *tally = case_array((size_t)kernel->tallies * PACK);
    static const char *const element[] = {"H", "C", "N", "Cl", "Br"};
    Tolerance tolerance = {1e-2, 1e2, 100000};
    SolverCounts counts = {0};
    PackProblem problem = {.y = y, .tally = tally};
    int where = 0;
    pack_start(c, test_layer, y);
    memcpy(start, y, (size_t)kernel->species * PACK * sizeof *y);
    assert_int_equal(
        pack_through(c, world->work, test_layer, &problem, 0, CASE_SEGMENTS, &tolerance, &counts, &where),
        SOLVER_DONE);
    for (size_t i = 0; i < sizeof element / sizeof element[0]; i++) {
        int e = mechanism_element(m, element[i]);
        double worst = 0.0;
        for (int l = 0; l < PACK; l++) {
            double before = 0.0, after = 0.0;
            for (int s = 0; s < m->solved; s++) {
                before += mechanism_atoms(m, s, e) * start[s * PACK + l];
                after += mechanism_atoms(m, s, e) * y[s * PACK + l];
            }
            for (int k = 0; k < kernel->counters; k++)
                if (kernel->counter_element[k] == e)
                    after += y[(m->solved + k) * PACK + l];
            for (int t = 0; t < kernel->tallies; t++) {
                int s = kernel->reactant[3 * kernel->tally_reaction[t]];
                after += mechanism_atoms(m, s, e) * tally[t * PACK + l];
            }
            worst = fmax(worst, fabs(after / before - 1.0));
        }
        print_message("           %-2s kept to %.1e\n", element[i], worst);
        assert_true(worst < 1e-12);
    }
    double counted = 0.0;
    for (int k = 0; k < kernel->counters; k++)
        if (kernel->counter_element[k] == mechanism_element(m, "N"))
            counted += fabs(y[(m->solved + k) * PACK + 5]);
    assert_true(counted > 0.0); /* N + NO -> N2 + O at 45 km does take nitrogen away */
    free(y);
    free(start);
    free(tally);
}

/* Lanes do not know each other: a lane's result depends on its neighbours through the shared step only. At a
 * tight tolerance a pack of eight times the same layer gives what the mixed pack gave. */
static void test_lanes_are_apart(void **state)
{
    World *world = *state;
    const ChemistryCase *c = &world->c;
    size_t size = (size_t)c->kernel->species * PACK;
    double *mixed = case_array(size), *alone = case_array(size);
    Tolerance tolerance = {1e-6, 1e-2, 1000000};
    SolverCounts counts = {0};
    int where = 0, same[PACK];
    for (int l = 0; l < PACK; l++)
        same[l] = test_layer[4];
    PackProblem problem = {.y = mixed};
    pack_start(c, test_layer, mixed);
    assert_int_equal(
        pack_through(c, world->work, test_layer, &problem, 0, CASE_NOON, &tolerance, &counts, &where),
        SOLVER_DONE);
    problem = (PackProblem){.y = alone};
    pack_start(c, same, alone);
    assert_int_equal(pack_through(c, world->work, same, &problem, 0, CASE_NOON, &tolerance, &counts, &where),
                     SOLVER_DONE);
    for (int s = 0; s < c->mechanism->solved; s++) {
        double want = mixed[s * PACK + 4];
        for (int l = 0; l < PACK; l++) {
            assert_true(alone[s * PACK + l] == alone[s * PACK]);
            if (!(fabs(alone[s * PACK + l] - want) <= 2e-5 * fabs(want) + 1.0))
                fail_msg("%s: %g alone, %g among others", mechanism_name(c->mechanism, s),
                         alone[s * PACK + l], want);
        }
    }
    free(mixed);
    free(alone);
}

/* ---- for tests/check_chemistry.py ---- */

/* Write reactions.csv (id, equation, coefficient at every knot of the day; first line: the knots' times in s,
 * a knot listed twice where light goes on or off) and states.csv (species, start, noon, midnight by the
 * solver) of the layer in lane 2. Returns 0 or 1. */
static int write_case(World *world, const char *folder, int lane)
{
    const ChemistryCase *c = &world->c;
    const Mechanism *m = c->mechanism;
    char path[500];
    snprintf(path, sizeof path, "%s/reactions.csv", folder);
    FILE *out = fopen(path, "w");
    if (!out)
        return 1;
    fprintf(out, "id;equation");
    double now = 0.0;
    for (int segment = 0; segment < CASE_SEGMENTS; segment++) {
        fprintf(out, ";%.17g;%.17g", now, now + segment_length(segment));
        now += segment_length(segment);
    }
    fputc('\n', out);
    for (int r = 0; r < m->reactions; r++) {
        fprintf(out, "%s;%s", m->reaction[r].id, m->reaction[r].equation);
        for (int segment = 0; segment < CASE_SEGMENTS; segment++)
            for (int end = 0; end < 2; end++)
                fprintf(out, ";%.17g", case_coefficient(c, r, test_layer[lane], segment, end));
        fputc('\n', out);
    }
    int failed = fclose(out);

    size_t size = (size_t)c->kernel->species * PACK;
    double *y = case_array(size), *start = case_array(size), *noon = case_array(size);
    Tolerance tolerance = {1e-6, 1e-2, 1000000};
    SolverCounts counts = {0};
    PackProblem problem = {.y = y};
    int where = 0;
    pack_start(c, test_layer, y);
    memcpy(start, y, size * sizeof *y);
    failed |= pack_through(c, world->work, test_layer, &problem, 0, CASE_NOON, &tolerance, &counts, &where);
    memcpy(noon, y, size * sizeof *y);
    failed |= pack_through(c, world->work, test_layer, &problem, CASE_NOON, CASE_SEGMENTS, &tolerance,
                           &counts, &where);
    snprintf(path, sizeof path, "%s/states.csv", folder);
    out = fopen(path, "w");
    if (out) {
        fprintf(out, "species;start;noon;midnight\n");
        for (int s = 0; s < m->solved; s++) {
            int at = s * PACK + lane;
            fprintf(out, "%s;%.17g;%.17g;%.17g\n", mechanism_name(m, s), start[at], noon[at], y[at]);
        }
        failed |= fclose(out);
    } else
        failed = 1;
    free(y);
    free(start);
    free(noon);
    return failed != 0;
}

int main(void)
{
    const char *folder =
        getenv("SKYMEND_CHEMISTRY_CASE"); /* write the case for another program instead of testing */
    if (folder) {
        World world = {0};
        Fault fault = {0};
        if (case_make(&world.c, &fault) || solver_work_make(&world.work, world.c.kernel, &fault)) {
            fprintf(stderr, "%s\n", fault.text);
            return 1;
        }
        const char *lane = getenv("SKYMEND_CHEMISTRY_LANE"); /* of the pack's eight layers */
        int failed = write_case(&world, folder, lane && *lane >= '0' && *lane < '0' + PACK ? *lane - '0' : 2);
        case_free(&world.c);
        solver_work_free(world.work);
        return failed;
    }
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_day_against_cvode),
        cmocka_unit_test(test_atoms_through_a_day),
        cmocka_unit_test(test_lanes_are_apart),
    };
    return cmocka_run_group_tests(tests, make_world, free_world);
}
