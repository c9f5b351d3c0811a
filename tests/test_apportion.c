/* Tests of apportioning (model/apportion): leaving a line out is the same as a case without it; small parts
 * of a line do as much for their size as large ones; delays, errors, the quick way against runs. Coarse
 * layers, INVENTED emissions; nothing here is compared with the world. */
#define _XOPEN_SOURCE 700
#include "lines.h"

#include "../model/apportion.h"

static Model *model_of(const Settings *settings)
{
    Model *model;
    Fault fault = {0};
    ok(model_make(&model, settings, &fault), &fault);
    return model;
}

static Apportionment *apportion(const Model *model, const ApportionAsk *ask)
{
    Apportionment *made;
    Fault fault = {0};
    const Watcher watcher = {0};
    ok(apportion_make(&made, model, ask, &watcher, &fault), &fault);
    return made;
}

static const ApportionItem *item_of(const Apportionment *from, const char *label)
{
    for (int i = 0; i < from->items; i++)
        if (from->item[i].label && !strcmp(from->item[i].label, label))
            return &from->item[i];
    fail_msg("no item %s", label);
    return NULL;
}

/* ---- apportioning ---- */

static void test_items(void **state)
{
    Settings settings = coarse(state, 1989, 1992);
    settings.day = DAY_MEAN;
    Model *model = model_of(&settings);
    static const int items[] = {4, 4, 5}; /* foam, solvent, idle, fumigation; CFC-11, CFC-12, CCl4, CH3Br */
    for (int by = APPORTION_LINE; by <= APPORTION_BOTH; by++) {
        Apportionment *made = apportion(model, &(ApportionAsk){.by = by, .share = 1.0, .threads = 1});
        assert_int_equal(made->items, items[by]);
        double kg = 0.0;
        for (int i = 0; i < made->items; i++)
            for (int l = 0; l < made->item[i].lines; l++)
                kg += made->item[i].kg[l];
        double want = 0.0; /* kt to the end of 1992 */
        for (int year = 1990; year <= 1992; year++)
            want += 500 * exp(-(year - 1990) / 3.0) + (year == 1992 ? 160.0 : 0.0);
        check_near(kg, 1e6 * want, 1e-5); /* %g of the table keeps six digits */
        assert_int_equal(made->not_apportioned, model->schedule.gases - 4);
        if (by != APPORTION_GAS) {
            const ApportionItem *idle = item_of(made, "idle"), *late = item_of(made, "solvent");
            assert_int_equal(idle->first_year, 0);
            assert_true(idle->effect.lost == 0.0 && idle->effect.largest == 0.0 && late->effect.lost == 0.0);
        }
        apportion_free(made);
    }
    model_free(model);
}

typedef struct {
    double column[40];
    int records;
} Yearly;

static int take_column(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Yearly *yearly = context;
    yearly->column[yearly->records++] = record->ozone_column;
    return 0;
}

/* The run without a line is that of a case in which the line gives nothing off, to the last bit, when light
 * is made afresh at every step in both (no other moments matter with daily means). */
static void test_leaving_out_is_a_case_without(void **state)
{
    Settings settings = coarse(state, 1989, 1996);
    settings.day = DAY_MEAN;
    settings.refresh_column = 0.0;
    Model *model = model_of(&settings);
    Apportionment *made = apportion(model, &(ApportionAsk){.share = 1.0, .threads = 2});
    const Watcher watcher = {.record = take_column};
    static const char *const labels[] = {"foam", "fumigation", "solvent"};
    for (int i = -1; i < 3; i++) {
        char path[300];
        Settings without = settings;
        Yearly yearly = {{0}, 0};
        Watcher watch = watcher;
        Fault fault = {0};
        watch.context = &yearly;
        if (i >= 0) {
            char text[400];
            snprintf(text, sizeof text,
                     "year,gas,kind,amount,unit,line,change\n%d-2010,%s,emission,0,1,%s,scale\n%s",
                     i == 1 ? 1992 : 1990, i == 1 ? "CH3Br" : "CFC-11", labels[i],
                     i == 0 ? "1990-2010,CFC-12,emission,0,1,foam,scale\n" : "");
            write_file(state, "without.csv", text, path);
            without.schedule_layers = 2;
            snprintf(without.schedule_layer[1], sizeof without.schedule_layer[1], "%s", path);
        }
        Run run = start(&without, 1);
        ok(projection_run(run.model, run.stepper, run.column, &watch, &fault), &fault);
        const ApportionItem *item = i < 0 ? NULL : item_of(made, labels[i]);
        same(i < 0 ? "whole" : labels[i], item ? item->effect.column : made->column, yearly.column,
             (size_t)made->years);
        double sum = 0.0;
        for (int y = 0; item && y < made->years; y++)
            sum += yearly.column[y] - made->column[y];
        if (item)
            check_near(item->effect.lost, sum, 1e-12);
        end(&run);
    }
    assert_true(item_of(made, "foam")->effect.lost > 0.1); /* the comparison above shows something */
    assert_true(item_of(made, "solvent")->effect.lost > 0.0);
    apportion_free(made);
    model_free(model);
}

/* Year in which a series comes back to value from below: by hand, without answers.h. */
static double back(const double *column, int years, double value)
{
    int low = 0;
    for (int y = 1; y < years; y++)
        low = column[y] < column[low] ? y : low;
    for (int y = low + 1; y < years; y++)
        if (column[y - 1] < value && column[y] >= value)
            return y - 1 + (value - column[y - 1]) / (column[y] - column[y - 1]);
    return NAN;
}

/* What does not depend on threads; that small parts of an item do as much for their size as large ones, so
 * that differences do not drown in the moments of refreshing; that derivatives add up and whole items nearly;
 * delays. */
static void test_runs(void **state)
{
    Settings settings = coarse(state, 1989, 2001);
    Model *model = model_of(&settings);
    static const double share[] = {1.0, 0.1, 1e-3};
    enum { PARTS = 3 };
    Apportionment *part[PARTS];
    for (int p = 0; p < PARTS; p++)
        part[p] = apportion(
            model, &(ApportionAsk){.share = share[p], .threads = p == 0 ? 1 : 2, .benchmark_year = 1990});
    Apportionment *again =
        apportion(model, &(ApportionAsk){.share = 1.0, .threads = 3, .benchmark_year = 1990});
    for (int i = 0; i < again->items; i++)
        same("three threads", again->item[i].effect.column, part[0]->item[i].effect.column,
             (size_t)again->years);
    same("three threads", again->all.column, part[0]->all.column, (size_t)again->years);
    apportion_free(again);

    /* A thousandth of foam moves the column by 0.001 DU at most. Its moments followed, what is left of noise
     * are single decisions of the solver, 1e-3 DU-years undivided at worst; seen here: below 2e-5. */
    for (int p = 1; p < PARTS; p++)
        for (int i = 0; i < part[p]->items; i++) {
            double one = part[1]->item[i].effect.lost, other = part[p]->item[i].effect.lost;
            print_message("   %5.1f %% of %-10s %9.5f DU-years\n", 100.0 * share[p], part[p]->item[i].label,
                          other);
            if (!(fabs(other - one) <= 0.01 * fabs(one)))
                fail_msg("%s: a part of %g does %.6f, one of 0.1 %.6f DU-years", part[p]->item[i].label,
                         share[p], other, one);
        }
    /* Bending is of the second order in the part taken away: with a tenth of each it is a tenth. */
    double whole = part[0]->remainder / part[0]->all.lost, tenth = part[1]->remainder / part[1]->all.lost;
    print_message("   remainder: %.2f %% of the whole, %.3f %% of a tenth\n", 100 * whole, 100 * tenth);
    assert_true(fabs(whole) < 0.1);
    assert_true(fabs(tenth) < 0.2 * fabs(whole) + 1e-4);
    check_near(part[0]->all.lost - part[0]->sum, part[0]->remainder, 1e-12);

    const Apportionment *from = part[0];
    assert_true(from->benchmark == from->column[1]);
    double returned = from->first_year + 0.5 + back(from->column, from->years, from->benchmark);
    int found = 0;
    for (int i = 0; i < from->items; i++) {
        const Effect *effect = &from->item[i].effect;
        double without = from->first_year + 0.5 + back(effect->column, from->years, from->benchmark);
        if (effect->delay_kind == DELAY_FOUND) {
            check_near(effect->delay, 12.0 * (returned - without), 1e-9);
            found += from->item[i].first_year > 0;
        } else if (effect->delay_kind == DELAY_AT_LEAST) {
            assert_true(isnan(returned));
            check_near(effect->delay, 12.0 * (2002.0 - without), 1e-9);
            found++;
        } else {
            assert_true(isnan(effect->delay));
        }
        print_message("   %-10s delay %d %.2f months\n", from->item[i].label, effect->delay_kind,
                      effect->delay);
    }
    assert_true(found > 0);
    assert_true(from->steps_shared < from->steps_alone);
    for (int p = 0; p < PARTS; p++)
        apportion_free(part[p]);
    model_free(model);
}

/* The error told is that of a run with everything twice as coarse: it covers, with room, what four times
 * smaller steps and thresholds would still change. */
static void test_error(void **state)
{
    Settings settings = coarse(state, 1989, 1995), fine = settings;
    fine.outer_step_days *= 0.5;
    fine.relative_tolerance *= 0.25;
    fine.absolute_tolerance_cm3 *= 0.25;
    fine.refresh_column *= 0.25;
    fine.refresh_state *= 0.25;
    fine.refresh_years *= 0.25;
    Model *model = model_of(&settings), *finer = model_of(&fine);
    Apportionment *made = apportion(model, &(ApportionAsk){.share = 1.0, .threads = 2, .errors = 1});
    Apportionment *better = apportion(finer, &(ApportionAsk){.share = 1.0, .threads = 2});
    assert_true(made->has_errors && !better->has_errors);
    for (int i = 0; i < made->items; i++) {
        const ApportionItem *item = &made->item[i];
        double off = fabs(item->effect.lost - better->item[i].effect.lost);
        print_message("   %-10s %9.5f DU-years, error told %.1e, off %.1e\n", item->label, item->effect.lost,
                      item->error.lost, off);
        assert_true(item->first_year == 0 || item->error.lost > 0.0);
        if (!(off <= 2.0 * item->error.lost + 0.002 * fabs(item->effect.lost)))
            fail_msg("%s is off by %g, told %g", item->label, off, item->error.lost);
    }
    apportion_free(made);
    apportion_free(better);
    model_free(model);
    model_free(finer);
}

/* By derivative against runs with a hundredth left out. The derivatives are those of settled columns, whose
 * stratosphere has caught up with the ground, and when an effect falls is computed at frozen factors: seen to
 * be within 2 % (31 years of lines, 4 km); 5 % is asked. */
static void test_quick(void **state)
{
    Settings settings = coarse(state, 1989, 2006);
    Model *model = model_of(&settings);
    const Watcher watcher = {0};
    Fault fault = {0};
    Apportionment *quick, *runs = apportion(model, &(ApportionAsk){.share = 0.01, .threads = 2});
    ok(apportion_quick(&quick, model, &(ApportionAsk){.share = 1.0, .threads = 2}, &watcher, &fault), &fault);
    for (int i = 0; i < quick->items; i++) {
        const ApportionItem *item = &quick->item[i];
        double run = runs->item[i].effect.lost;
        print_message("   %-10s runs %8.4f, derivative %8.4f within, %8.4f +- %.4f for all time\n",
                      item->label, run, item->within, item->all_time, item->all_time_error);
        if (!item->first_year) {
            assert_true(item->all_time == 0.0 && item->within == 0.0);
            continue;
        }
        assert_true(item->all_time > item->within && item->within > 0.0);
        if (!(fabs(item->within - run) <= 0.05 * run))
            fail_msg("%s: %g DU-years by derivative, %g by runs", item->label, item->within, run);
    }
    apportion_free(quick);
    apportion_free(runs);
    model_free(model);
}

/* ---- mishaps ---- */

typedef struct {
    volatile sig_atomic_t stop;
    int calls, after;
    double last;
} Stopper;

static void count_calls(void *context, const Progress *progress)
{
    Stopper *stopper = context;
    assert_true(progress->share >= stopper->last && progress->share <= 1.0 + 1e-12);
    stopper->last = progress->share;
    stopper->stop = ++stopper->calls >= stopper->after;
}

static void test_interrupt(void **state)
{
    Settings settings = coarse(state, 1989, 1991);
    settings.day = DAY_MEAN;
    Model *model = model_of(&settings);
    static const int after[] = {10, 200, 1000000}; /* in the trunk, in the runs, never */
    for (int i = 0; i < 3; i++) {
        Stopper stopper = {.after = after[i]};
        const Watcher watcher = {.progress = count_calls, .context = &stopper, .stop = &stopper.stop};
        Apportionment *made = NULL;
        Fault fault = {0};
        int code = apportion_make(&made, model, &(ApportionAsk){.share = 1.0, .threads = 2, .errors = 1},
                                  &watcher, &fault);
        if (i < 2) {
            assert_int_equal(code, FAULT_INTERRUPTED);
            assert_null(made);
            assert_true(stopper.calls < after[i] + 10);
        } else {
            ok(code, &fault);
            assert_true(stopper.last > 0.999);
        }
        apportion_free(made);
    }
    model_free(model);
}

static void test_nothing_to_apportion(void **state)
{
    Settings settings = coarse(state, 1985, 1988); /* lines begin in 1990 */
    Model *model = model_of(&settings);
    Apportionment *made;
    const Watcher watcher = {0};
    Fault fault = {0};
    assert_int_equal(apportion_make(&made, model, &(ApportionAsk){.share = 1.0}, &watcher, &fault),
                     FAULT_INPUT);
    check_fault(&fault, "gives anything off from 1985 to 1988", "skymend schedule --as emission", NULL);
    assert_null(made);
    fault = (Fault){0};
    assert_int_equal(apportion_make(&made, model, &(ApportionAsk){.share = 1.5}, &watcher, &fault),
                     FAULT_INPUT);
    model_free(model);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(test_items),
        WITH_FOLDER(test_leaving_out_is_a_case_without),
        WITH_FOLDER(test_runs),
        WITH_FOLDER(test_error),
        WITH_FOLDER(test_quick),
        WITH_FOLDER(test_interrupt),
        WITH_FOLDER(test_nothing_to_apportion),
    };
    return cmocka_run_group_tests_name("apportion", tests, NULL, NULL);
}
