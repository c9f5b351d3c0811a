/* libs: sundials */
/* Tests of the stiff solver on the whole mechanism through an explicit day, against CVODE (SUNDIALS; Hindmarsh et al. 2005,
 * ACM Trans. Math. Softw. 31, 363): BDF, dense analytic Jacobian, relative tolerance 1e-9. CVODE's equations are read
 * from the mechanism by a plain double loop and share no code with the kernel. */
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

static int make_world(void **state) {
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
        for (int s = 0; s < n; s++) y[s] = world.c.start[s * CASE_LAYERS + test_layer[l]];
        long steps = cvode_day(&world.c, test_layer[l], y, world.noon + l * n, 1e-9, 1e-6);
        if (steps < 0) {
            fprintf(stderr, "CVODE stopped with %ld\n", steps);
            return -1;
        }
    }
    *state = &world;
    return 0;
}

static int free_world(void **state) {
    World *world = *state;
    case_free(&world->c);
    solver_work_free(world->work);
    free(world->noon);
    free(world->end);
    return 0;
}

/* Largest |y - reference| / (absolute + relative |reference|) over pack and species; *which = lane * solved + s. */
static double worst_error(const World *world, const double *y, const double *reference, const Tolerance *tolerance,
                          int *which) {
    int n = world->c.mechanism->solved;
    double worst = 0.0;
    for (int l = 0; l < PACK; l++)
        for (int s = 0; s < n; s++) {
            double want = reference[l * n + s];
            double error = fabs(y[s * PACK + l] - want) / (tolerance->absolute + tolerance->relative * fabs(want));
            if (error > worst || isnan(error)) {
                worst = isnan(error) ? HUGE_VAL : error;
                *which = l * n + s;
            }
        }
    return worst;
}

static const char *name_of(const World *world, int which, char *text) { /* text: [60] */
    int n = world->c.mechanism->solved;
    snprintf(text, 60, "%s at %.1f km", mechanism_name(world->c.mechanism, which % n),
             test_layer[which / n] + 0.5);
    return text;
}

/* A day at three tolerances: at noon and at midnight every species is within 10 times what was asked for. */
static void test_day_against_cvode(void **state) {
    World *world = *state;
    const ChemistryCase *c = &world->c;
    double *y = case_array((size_t)c->kernel->species * PACK);
    char text[60];
    print_message("           asked  abs cm-3  steps rejected  noon: error/asked  worst             midnight:\n");
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
        assert_int_equal(pack_through(c, world->work, test_layer, &problem, CASE_NOON, CASE_SEGMENTS, &tolerance,
                                      &counts, &where),
                         SOLVER_DONE);
        double end = worst_error(world, y, world->end, &tolerance, &at_end);
        print_message("           %.0e %8.0e %6ld %8ld  %6.2f %-22s", tolerance.relative, tolerance.absolute,
                      counts.steps, counts.rejections, noon, name_of(world, at_noon, text));
        print_message(" %6.2f %-22s lowest %.1e\n", end, name_of(world, at_end, text), counts.most_negative);
if(getenv("DBG")){ int n=c->mechanism->solved; for(int l=0;l<PACK;l++)for(int q=0;q<n;q++){double w=world->end[l*n+q],g=y[q*PACK+l];double e=fabs(g-w)/(tolerance.absolute+tolerance.relative*fabs(w));if(e>3)printf("   %s %d: got %.5g want %.5g e %.2f noon %.3g\n",mechanism_name(c->mechanism,q),test_layer[l],g,w,e,world->noon[l*n+q]);}continue;}
        if (!(noon <= 10.0)) fail_msg("noon: %s is off by %g times the tolerance", name_of(world, at_noon, text), noon);
        if (!(end <= 10.0)) fail_msg("midnight: %s is off by %g times the tolerance", name_of(world, at_end, text), end);
        assert_true(counts.most_negative > -10.0 * tolerance.absolute);
    }
    free(y);
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_day_against_cvode),
    };
    return cmocka_run_group_tests(tests, make_world, free_world);
}
