/* Tests of the unsplit column (model/unsplit*): the same equations as the split operators, their derivatives
 * against finite differences, the linear algebra, and the order of the method in time. Built-in case on
 * coarse layers. */
#define _XOPEN_SOURCE 700
#include "settled.h"

#include <omp.h>

#include "../model/mixing.h"

/* A settled column, whose radicals are in balance; the stepper has made its light and factors. */
static Rest balanced(int day)
{
    Settings settings = coarse_case(day, 1995);
    Rest rest = make_rest(&settings);
    find_rest(&rest);
    if (day == DAY_FACTORS) /* the last turn's, as unsplit has them */
        unsplit_take_factors(rest.unsplit, stepper_day(rest.run.stepper));
    return rest;
}

/* ---- the same equations as the split operators ---- */

/* Without chemistry what is left is diffusion: against a second of mixing_step. The scheme's own error in a
 * second is (1 s)/(2 tau) of the change, tau the time of diffusion through a layer, a day and more: 1e-5. */
static void test_transport_is_that_of_mixing(void **state)
{
    (void)state;
    Rest rest = balanced(DAY_MEAN);
    Unsplit *unsplit = rest.unsplit;
    const Model *model = rest.run.model;
    Column *column = rest.run.column;
    double *tendency = unknowns(unsplit), *before = field_copy(model, column->x), *gross = unknowns(unsplit);
    for (size_t i = 0; i < (size_t)model->mechanism->reactions * (size_t)model->grid.padded; i++)
        unsplit->factor[i] = 0.0;
    unsplit_evaluate(unsplit, column->x, tendency, 0);
    unsplit_turnover(unsplit, column->x, gross);
    Mixing *mixing;
    Fault fault = {0};
    ok(mixing_make(&mixing, model, 1, &fault), &fault);
    ok(mixing_prepare(mixing, 0, 1.0, &fault), &fault);
    mixing_step(mixing, 0, column, NULL);
    int moved = 0;
    double worst = 0.0;
    for (int i = 0; i < unsplit->unknowns; i++) {
        double change = column->x[place(unsplit, i)] - before[place(unsplit, i)];
        if (unsplit->kept[i]) {
            assert_true(tendency[i] == 0.0);
            assert_true(change == 0.0 || i >= unsplit->solved); /* held ones are put back by the chemistry */
            continue;
        }
        /* the change is a difference of mole fractions stored to 16 digits */
        double noise = 4e-16 * fabs(before[place(unsplit, i)]);
        if (before[place(unsplit, i)] * unsplit->conditions->air[i / unsplit->solved] < 1.0)
            continue; /* less than a molecule per cm3 */
        worst = fmax(worst, (fabs(change - tendency[i]) - noise) / gross[i]);
        moved += change != 0.0;
    }
    print_message("   %d unknowns diffuse; largest difference %.1e of the gross rate\n", moved, worst);
    assert_true(moved > 1000 && worst < 1e-4);
    mixing_free(mixing);
    free(tendency);
    free(before);
    free(gross);
    end_rest(&rest);
}

/* Without transport what is left is chemistry. (a) The rates: light, coefficients and factors go through
 * pack_rates like those of a step. (b) The change of species that live longer than a minute over a hundredth
 * of a second of the solver: radicals, in balance, do not move within it. */
static void test_chemistry_is_that_of_the_packs(void **state)
{
    (void)state;
    Rest rest = balanced(DAY_FACTORS);
    Unsplit *unsplit = rest.unsplit;
    const Model *model = rest.run.model;
    const Stepper *stepper = rest.run.stepper;
    int padded = model->grid.padded, solved = unsplit->solved, compared = 0;
    double *tendency = unknowns(unsplit), *gross = unknowns(unsplit), worst = 0.0, step = 1e-2;
    for (int e = 0; e <= unsplit->layers; e++)
        unsplit->conductance[e] = 0.0;
    for (int s = 0; s < solved; s++)
        unsplit->deposit[s] = 0.0;
    unsplit_evaluate(unsplit, rest.run.column->x, tendency, 0);
    unsplit_turnover(unsplit, rest.run.column->x, gross);
    PackWork *work;
    Fault fault = {0};
    ok(pack_make(&work, model, &fault), &fault);
    work->conditions = unsplit->conditions;
    for (int first = 0; first < padded; first += PACK) {
        pack_load(work, model, first, rest.run.column->x);
        pack_rates(work, model, first, stepper_coefficients(stepper), stepper_light(stepper)->mean,
                   stepper_day(stepper)->factor);
        for (int r = 0; r < model->mechanism->reactions; r++)
            for (int lane = 0; lane < PACK; lane++)
                check_near(unsplit->k[FIELD(padded, r, first + lane)], work->k[r * PACK + lane], 1e-12);
        PackProblem problem = pack_problem(work, 0, 0.0);
        Tolerance tolerance = {1e-8, 1e-6, 20000};
        SolverCounts counts = {0};
        int where;
        double before[PACK * 200];
        assert_true(model->kernel->species <= 200);
        memcpy(before, work->y, (size_t)solved * PACK * sizeof(double));
        assert_int_equal(
            solver_advance(model->kernel, work->solver, &problem, step, &tolerance, &counts, &where),
            SOLVER_DONE);
        for (int lane = 0; lane < PACK && first + lane < unsplit->layers; lane++)
            for (int s = 0; s < solved; s++) {
                int i = (first + lane) * solved + s;
                double air = unsplit->conditions->air[first + lane], y = before[s * PACK + lane];
                if (unsplit->kept[i] || gross[i] * air > y / 60.0 || y < 1e4)
                    continue;
                double change = (work->y[s * PACK + lane] - y) / step, noise = 4e-16 * y / step;
                worst = fmax(worst, (fabs(change - tendency[i] * air) - noise) / (gross[i] * air));
                compared++;
            }
    }
    print_message("   %d unknowns compared; largest difference %.1e of the gross rate\n", compared, worst);
    assert_true(compared > 500 && worst < 1e-3);
    pack_free(work);
    free(tendency);
    free(gross);
    end_rest(&rest);
}

/* ---- derivatives ---- */

/* Columns of the matrix against central differences of the tendency, relative to the entry or to a thousandth
 * of the column's largest where that is more. The differences are good to the square of the shift, 1e-6, and
 * those of the light in the matrix to 1e-3 (unsplit_light.c). */
static void test_jacobian(void **state)
{
    (void)state;
    Fault fault = {0};
    static const struct {
        const char *name;
        int layer;
    } column[] = {{"O3", 5},     {"O3", 12},    {"O3", 20},   {"O3", 29},    {"NO2", 12},   {"NO", 25},
                  {"HCl", 10},   {"ClONO2", 9}, {"H2O", 11},  {"CFC-11", 8}, {"O(1D)", 15}, {"OH", 22},
                  {"CFC-12", 0}, {"HNO3", 0},   {"HOCl", 10}, {"Br", 14},    {"CH4", 0},    {"Cl2O2", 10}};
    Rest rest = balanced(DAY_FACTORS);
    Unsplit *unsplit = rest.unsplit;
    const Model *model = rest.run.model;
    double *x = rest.run.column->x, *up = unknowns(unsplit), *down = unknowns(unsplit),
           *unit = unknowns(unsplit), *got = unknowns(unsplit);
    unsplit_evaluate(unsplit, x, up, 1);
    ok(unsplit_slopes(unsplit, x, &fault), &fault);
    unsplit_evaluate(unsplit, x, up, 1);
    double worst_of_all = 0.0;
    for (size_t c = 0; c < sizeof column / sizeof column[0]; c++) {
        int j = column[c].layer * unsplit->solved + solved_of(model, column[c].name);
        double *here = &x[place(unsplit, j)], kept = *here, shift = 1e-3 * kept, largest = 0.0, worst = 0.0;
        assert_true(kept > 0.0);
        unit[j] = 1.0;
        unsplit_evaluate(unsplit, x, down, 1);
        unsplit_multiply(unsplit, unit, 1, 0, got);
        unit[j] = 0.0;
        *here = kept + shift;
        unsplit_evaluate(unsplit, x, up, 0);
        *here = kept - shift;
        unsplit_evaluate(unsplit, x, down, 0);
        *here = kept;
        for (int i = 0; i < unsplit->unknowns; i++)
            largest = fmax(largest, fabs(got[i]));
        for (int i = 0; i < unsplit->unknowns; i++) {
            double want = (up[i] - down[i]) / (2.0 * shift);
            worst = fmax(worst, fabs(got[i] - want) / fmax(fabs(want), 1e-3 * largest));
        }
        worst_of_all = fmax(worst_of_all, worst);
        if (!(worst < 5e-3))
            fail_msg("column of %s in layer %d: off by %.2e", column[c].name, column[c].layer, worst);
    }
    print_message("   largest difference of 18 columns %.1e\n", worst_of_all);
    free(up);
    free(down);
    free(unit);
    free(got);
    end_rest(&rest);
}

/* z' (A u) = u' (A' z), the solves undo the products, with and without light and both ways; and the gradient
 * of the rates, which the transposed product does not use, gives its chemistry. */
/* The slopes of the light are the same bits for any number of threads, and leave the light as it was. */
static void test_slopes_threads(void **state)
{
    (void)state;
    Rest rest = balanced(DAY_FACTORS);
    Unsplit *unsplit = rest.unsplit;
    const double *x = rest.run.column->x;
    size_t lit = (size_t)unsplit->light->reactions * (size_t)rest.run.model->grid.padded;
    double *tendency = unknowns(unsplit), *mean = malloc(lit * sizeof(double)), *slope = NULL;
    int most = omp_get_max_threads(), absorbers = 0;
    Fault fault = {0};
    assert_non_null(mean);
    unsplit_evaluate(unsplit, x, tendency, 1);
    memcpy(mean, unsplit->light->mean, lit * sizeof(double));
    for (int threads = 1; threads <= 3; threads++) {
        omp_set_num_threads(threads);
        ok(unsplit_slopes(unsplit, x, &fault), &fault);
        assert_memory_equal(unsplit->light->mean, mean, lit * sizeof(double));
        size_t bytes = (size_t)unsplit->absorbers * lit * sizeof(double);
        if (threads == 1) {
            absorbers = unsplit->absorbers;
            slope = malloc(bytes);
            assert_non_null(slope);
            memcpy(slope, unsplit->slope, bytes);
        }
        assert_int_equal(unsplit->absorbers, absorbers);
        assert_memory_equal(unsplit->slope, slope, bytes);
        memset(unsplit->slope, 0, bytes);
    }
    omp_set_num_threads(most);
    free(slope);
    free(mean);
    free(tendency);
    end_rest(&rest);
}

static void test_linear_algebra(void **state)
{
    (void)state;
    Fault fault = {0};
    Rest rest = balanced(DAY_MEAN);
    Unsplit *unsplit = rest.unsplit;
    const Model *model = rest.run.model;
    const Mechanism *mechanism = model->mechanism;
    double *x = rest.run.column->x;
    int n = unsplit->unknowns, padded = model->grid.padded;
    double *u = unknowns(unsplit), *z = unknowns(unsplit), *au = unknowns(unsplit), *az = unknowns(unsplit);
    unsplit_evaluate(unsplit, x, au, 1);
    ok(unsplit_slopes(unsplit, x, &fault), &fault);
    assert_true(unsplit->absorbers > unsplit->layers &&
                unsplit->absorbers <= UNSPLIT_ABSORBERS * unsplit->layers);
    for (int i = 0; i < n; i++) { /* of the size of the unknowns; rows in inverse proportion */
        u[i] = x[place(unsplit, i)] * (1.0 + 0.5 * sin(1.0 + i));
        z[i] = cos(3.0 * i) / (x[place(unsplit, i)] + 1e-20);
    }
    for (int light = 0; light < 2; light++) {
        double left = 0.0, right = 0.0, size = 0.0;
        unsplit_multiply(unsplit, u, light, 0, au);
        unsplit_multiply(unsplit, z, light, 1, az);
        for (int i = 0; i < n; i++) {
            left += z[i] * au[i];
            right += u[i] * az[i];
            size += fabs(z[i] * au[i]);
        }
        assert_true(fabs(left - right) < 1e-11 * size);
        Fault fault = {0};
        ok(unsplit_factorise(unsplit, x, 0.0, light, &fault), &fault);
        unsplit_solve(unsplit, au, 0);
        double worst = 0.0;
        for (int i = 0; i < n; i++) {
            double scale = fmax(fabs(u[i]), 1.0 / unsplit->conditions->air[i / unsplit->solved]);
            worst = fmax(worst, fabs(au[i] - u[i]) / scale);
        }
        /* z' A^-1 b = b' A'^-1 z for b of the size of the turnover */
        unsplit_turnover(unsplit, x, au);
        memcpy(az, z, (size_t)n * sizeof(double));
        unsplit_solve(unsplit, az, 1);
        right = size = 0.0;
        for (int i = 0; i < n; i++)
            right += au[i] * az[i];
        unsplit_solve(unsplit, au, 0);
        left = 0.0;
        for (int i = 0; i < n; i++) {
            left += z[i] * au[i];
            size += fabs(z[i] * au[i]);
        }
        print_message("   light %d: solve after product off by %.1e; two ways to one number by %.1e\n", light,
                      worst, fabs(left - right) / size);
        /* lifetimes from 1e-9 s to centuries: ten digits of sixteen may go */
        assert_true(worst < 1e-5 && fabs(left - right) < 1e-6 * size);
    }
    size_t rates = (size_t)mechanism->reactions * (size_t)padded;
    double *weight = calloc(rates, sizeof(double)), *gradient = unknowns(unsplit);
    assert_non_null(weight);
    for (int e = 0; e <= unsplit->layers; e++)
        unsplit->conductance[e] = 0.0;
    for (int s = 0; s < unsplit->solved; s++)
        unsplit->deposit[s] = 0.0;
    for (int i = 0; i < n; i++)
        z[i] = unsplit->kept[i] ? 0.0 : cos(3.0 * i) / (x[place(unsplit, i)] + 1e-20);
    for (int r = 0; r < mechanism->reactions; r++)
        for (int l = 0; l < unsplit->layers; l++)
            for (int c = 0; c < mechanism->reaction[r].changes; c++)
                weight[FIELD(padded, r, l)] += mechanism->reaction[r].change[c] *
                                               z[l * unsplit->solved + mechanism->reaction[r].changed[c]] /
                                               unsplit->conditions->air[l];
    unsplit_rate_gradient(unsplit, weight, gradient);
    unsplit_multiply(unsplit, z, 1, 1, az);
    double worst = 0.0, size = 0.0;
    for (int i = 0; i < n; i++)
        size = fmax(size, fabs(az[i]));
    for (int i = 0; i < n; i++)
        worst = fmax(worst, fabs(gradient[i] - az[i]));
    assert_true(size > 0.0 && worst < 1e-9 * size);
    free(weight);
    free(gradient);
    free(u);
    free(z);
    free(au);
    free(az);
    end_rest(&rest);
}

/* ---- through time ---- */

static double *carried(Rest *rest, const double *from, double years, UnsplitStepping stepping, long *steps)
{
    double *x = field_copy(rest->run.model, from), time = rest->run.column->time;
    Fault fault = {0};
    ok(unsplit_advance(rest->unsplit, x, &time, years, 0, &stepping, &fault), &fault);
    check_near(time, rest->run.column->time + years, 1e-12);
    *steps = stepping.steps;
    return x;
}

/* Slow gases, their profiles bent, on their way back: in fixed steps against steps of a sixteenth, the error
 * falls as the square of the step. The bend is let go for a tenth of a year first, so that radicals follow
 * it. */
static void test_order(void **state)
{
    (void)state;
    static const char *const watched[] = {"CFC-11", "CFC-12", "N2O", "CH4"};
    enum { WATCHED = sizeof watched / sizeof watched[0] };
    Settings settings = coarse_case(DAY_MEAN, 1985);
    settings.last_year = 1990;
    Rest rest = make_rest(&settings);
    find_rest(&rest);
    const Model *model = rest.run.model;
    int padded = model->grid.padded;
    double *x = rest.run.column->x;
    for (int w = 0; w < WATCHED; w++)
        for (int l = 1; l < model->grid.layers; l++)
            x[FIELD(padded, solved_of(model, watched[w]), l)] *= 1.0 + 0.3 * sin(0.2 * l);
    const UnsplitStepping careful = {.relative = 1e-6, .absolute = 1e-2};
    Fault fault = {0};
    UnsplitStepping first = careful;
    first.relative = 1e-4;
    ok(unsplit_advance(rest.unsplit, x, &rest.run.column->time, 0.1, 0, &first, &fault), &fault);
    double *result[4], error[3] = {0};
    for (int i = 0; i < 4; i++) {
        UnsplitStepping stepping = careful;
        long taken, count = i < 3 ? 4L << i : 64;
        stepping.fixed = 0.3 / (double)count * YEAR_SECONDS;
        result[i] = carried(&rest, x, 0.3, stepping, &taken);
        assert_true(taken == count);
    }
    for (int i = 0; i < 3; i++)
        for (int w = 0; w < WATCHED; w++)
            for (int l = 0; l < model->grid.layers; l++) {
                size_t at = FIELD(padded, solved_of(model, watched[w]), l);
                error[i] += fabs(result[i][at] / result[3][at] - 1.0);
            }
    double before = log2(error[0] / error[1]), after = log2(error[1] / error[2]);
    print_message("   errors %.1e %.1e %.1e: order %.2f, then %.2f\n", error[0], error[1], error[2], before,
                  after);
    assert_true(after > 1.7 && after < 2.4);
    for (int i = 0; i < 4; i++)
        free(result[i]);
    end_rest(&rest);
}

/* Split and unsplit over three years of a changing schedule: the shorter the outer step the nearer, and near.
 */
static void test_split_comes_near(void **state)
{
    (void)state;
    Settings settings = coarse_case(DAY_MEAN, 1985);
    settings.last_year = 1990;
    settings.refresh_column = 1e-5; /* the light follows at every step, as it does unsplit */
    settings.relative_tolerance = 1e-3;
    Rest rest = make_rest(&settings);
    find_rest(&rest);
    const Model *model = rest.run.model;
    long steps;
    double *start_x = field_copy(model, rest.run.column->x), apart[3], begun = rest.run.column->time;
    double *x = carried(&rest, start_x, 3.0, (UnsplitStepping){.relative = 1e-4, .absolute = 1.0}, &steps);
    double want = column_ozone_du(model, x);
    for (int i = 0; i < 3; i++) {
        long count = 48L << i;
        memcpy(rest.run.column->x, start_x, field_size(model) * sizeof(double));
        rest.run.column->time = begun;
        advance(&rest.run, 3.0 * 365.25 / (3.0 * (double)count), 3 * count, 0);
        apart[i] = column_ozone_du(model, rest.run.column->x) - want;
    }
    print_message(
        "   unsplit %.4f DU in %ld steps; split by 48, 96, 192 steps a year: %+.4f %+.4f %+.4f DU\n", want,
        steps, apart[0], apart[1], apart[2]);
    assert_true(fabs(apart[0]) < 0.2 && fabs(apart[2]) < 0.03);
    assert_true(fabs(apart[2]) < 0.7 * fabs(apart[0]) || fabs(apart[0]) < 0.01);
    free(x);
    free(start_x);
    end_rest(&rest);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_transport_is_that_of_mixing),
                                       cmocka_unit_test(test_chemistry_is_that_of_the_packs),
                                       cmocka_unit_test(test_jacobian),
                                       cmocka_unit_test(test_slopes_threads),
                                       cmocka_unit_test(test_linear_algebra),
                                       cmocka_unit_test(test_order),
                                       cmocka_unit_test(test_split_comes_near)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
