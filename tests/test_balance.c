/* Tests of the balanced step (model/step, with the sink of transport/diffusion and the source of
 * chem/rosenbrock): what one half of a step is given the other gives back, and where transport is as fast as
 * the chemistry the column does not depend on the step any more. Built-in case on coarse layers. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include <omp.h>

#include "../model/mixing.h"

static Settings coarse(double outer_step_days)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = 2.0;
    settings.first_year = settings.last_year = 1990;
    settings.outer_step_days = outer_step_days;
    return settings;
}

static int solved(const Model *model, const char *name)
{
    int s = mechanism_solved(model->mechanism, name);
    if (s < 0)
        fail_msg("no species %s", name);
    return s;
}

static double mass(const Model *model, const double *x)
{
    double sum = 0.0;
    for (int l = 0; l < model->grid.layers; l++)
        sum += model->air.number_density[l] * model->grid.depth[l] * x[l];
    return sum;
}

/* ---- the sink of the transport ---- */

/* A profile whose tendency is taken away as fast as it arises stays as it is, however long the step, and
 * whatever the sink the books close. */
static void test_sink(void **state)
{
    (void)state;
    Settings settings = coarse(7.0);
    Run run = start(&settings, 1);
    const Model *model = run.model;
    int layers = model->grid.layers, padded = model->grid.padded;
    double x[128], sink[128], before[128], received;
    assert_true(padded <= 128);
    for (int kind = GROUND_CLOSED; kind <= GROUND_DEPOSITION; kind++)
        for (int trial = 0; trial < 4; trial++) {
            Fault fault = {0};
            DiffusionFactor *factor;
            double step = pow(10.0, 3.0 + 2.0 * trial);
            ok(diffusion_factor(&factor, model->diffusion, kind, 0.4, step, &fault), &fault);
            double *work = malloc(diffusion_work(factor, 1) * sizeof(double));
            assert_non_null(work);
            for (int l = 0; l < padded; l++)
                before[l] = x[l] = 1e-6 * (1.5 + sin(0.37 * l + trial));
            if (kind != GROUND_DEPOSITION) {
                diffusion_tendency(model->diffusion, x, sink);
                diffusion_step(factor, x, sink, 1, &received, work);
                for (int l = kind == GROUND_FIXED; l < layers; l++)
                    if (!(fabs(x[l] / before[l] - 1.0) < 1e-11))
                        fail_msg("kind %d, step %g s, layer %d: %.3e of it moved", kind, step, l,
                                 x[l] / before[l] - 1.0);
            }
            double taken = 0.0;
            memcpy(x, before, sizeof x);
            for (int l = 0; l < layers; l++) {
                sink[l] = 1e-7 / step * cos(0.71 * l);
                if (l > 0 || kind != GROUND_FIXED)
                    taken += step * model->air.number_density[l] * model->grid.depth[l] * sink[l];
            }
            diffusion_step(factor, x, sink, 1, &received, work);
            assert_true(fabs(mass(model, x) - mass(model, before) - received + taken) <
                        1e-14 * mass(model, before));
            free(work);
            diffusion_factor_free(factor);
        }
    end(&run);
}

/* ---- the step ---- */

/* Balances belong to carried species of oxygen and hydrogen alone, and never where transport changes nothing.
 */
static void test_who_has_a_balance(void **state)
{
    (void)state;
    Settings settings = coarse(7.609375);
    Run run = start(&settings, 1);
    advance(&run, settings.outer_step_days, 30, 1);
    const Model *model = run.model;
    int padded = model->grid.padded, some = 0;
    for (int s = 0; s < model->mechanism->solved; s++) {
        const char *name = mechanism_name(model->mechanism, s);
        int may = !strcmp(name, "O") || !strcmp(name, "O3") || !strcmp(name, "OH") || !strcmp(name, "HO2") ||
                  !strcmp(name, "H2O2") || !strcmp(name, "H2O") || !strcmp(name, "H2");
        for (int l = 0; l < padded; l++) {
            double b = run.column->balance[FIELD(padded, s, l)];
            some += b != 0.0;
            if (b != 0.0 && !may)
                fail_msg("%s has a balance of %g", name, b);
        }
    }
    assert_true(some > 100);
    /* water, OH: prescribed below the tropopause; hydrogen: kept by the ground */
    for (int l = 0; 1e-5 * model->grid.middle[l] < settings.tropopause_km; l++) {
        assert_true(run.column->balance[FIELD(padded, solved(model, "H2O"), l)] == 0.0);
        assert_true(run.column->balance[FIELD(padded, solved(model, "OH"), l)] == 0.0);
    }
    assert_true(run.column->balance[FIELD(padded, solved(model, "H2"), 0)] == 0.0);
    end(&run);
}

/* Two runs from one start over the same time, one with a quarter of the other's step: largest relative
 * difference of ozone from 60 km up. Factors are off so that nothing but the splitting differs. */
static double top_apart(double days, int forget)
{
    Run run[2];
    int steps = (int)lround(2.0 * 365.25 / days);
    for (int i = 0; i < 2; i++) {
        int parts = i ? 4 : 1;
        Settings settings = coarse(days / parts);
        settings.day = DAY_MEAN;
        run[i] = start(&settings, 1);
        for (int n = 0; n < steps * parts; n++) {
            advance(&run[i], days / parts, 1, 1);
            if (forget) /* the unbalanced step of Strang */
                memset(run[i].column->balance, 0, field_size(run[i].model) * sizeof(double));
        }
    }
    double worst = 0.0;
    int padded = run[0].model->grid.padded, o3 = solved(run[0].model, "O3");
    for (int l = 0; l < run[0].model->grid.layers; l++)
        if (1e-5 * run[0].model->grid.middle[l] > 60.0)
            worst = fmax(
                worst,
                fabs(run[0].column->x[FIELD(padded, o3, l)] / run[1].column->x[FIELD(padded, o3, l)] - 1.0));
    end(&run[0]);
    end(&run[1]);
    return worst;
}

/* Near the top eddy diffusion crosses a layer within hours, as fast as ozone turns over. */
static void test_step_length_makes_no_difference_at_the_top(void **state)
{
    (void)state;
    double balanced = top_apart(7.609375, 0), plain = top_apart(7.609375, 1);
    print_message("   ozone above 60 km, step against a quarter of it: %.2f %% balanced, %.2f %% without\n",
                  100.0 * balanced, 100.0 * plain);
    assert_true(balanced < 0.005);
    assert_true(plain > 4.0 * balanced); /* or the test shows nothing */
}

int main(void)
{
    omp_set_num_threads(1);
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_sink),
        cmocka_unit_test(test_who_has_a_balance),
        cmocka_unit_test(test_step_length_makes_no_difference_at_the_top),
    };
    return cmocka_run_group_tests_name("balance", tests, NULL, NULL);
}
