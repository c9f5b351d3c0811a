/* apportion_text: an apportionment told. */
#include "apportion_text.h"

#include <math.h>
#include <string.h>

#include "../input/table.h"
#include "json.h"

enum { NAME_WIDTH = 40 };

static const char *const delay_names[] = {"found", "at least", "no return", "never below"};

const char *apportion_by_name(int by)
{
    return by == APPORTION_LINE ? "line" : by == APPORTION_GAS ? "gas" : "line and gas";
}

void apportion_item_name(const Model *model, const ApportionItem *item, char *text, size_t size)
{
    const char *gas = item->gas < 0 ? "" : model->schedule.gas[item->gas];
    const char *label = item->label ? item->label : "";
    snprintf(text, size, "%s%s%s", label, *label && *gas ? ", " : "", gas);
}

static double tonnes(const ApportionItem *item)
{
    double sum = 0.0;
    for (int l = 0; l < item->lines; l++)
        sum += 1e-3 * item->kg[l];
    return sum;
}

static double percent(const Apportionment *from, double lost)
{
    return from->all.lost != 0.0 ? 100.0 * lost / from->all.lost : NAN;
}

/* ---- for people ---- */

/* A number, or a dash where there is none. */
static void put(FILE *out, int width, const char *form, double value)
{
    if (isfinite(value))
        fprintf(out, form, width, value);
    else
        fprintf(out, "%*s", width, "-");
}

static void print_delay(FILE *out, const Effect *effect)
{
    char text[32];
    if (effect->delay_kind == DELAY_AT_LEAST)
        snprintf(text, sizeof text, ">%.1f", effect->delay);
    else if (effect->delay_kind == DELAY_FOUND)
        snprintf(text, sizeof text, "%.1f", effect->delay);
    else
        snprintf(text, sizeof text, "-");
    fprintf(out, "%9s", text);
}

static void print_effect(const Apportionment *from, const char *name, const Effect *effect,
                         const EffectError *error, FILE *out)
{
    fprintf(out, "  %-*.*s %10.3f", NAME_WIDTH, NAME_WIDTH, name, effect->lost);
    put(out, 9, "%*.2g", from->has_errors ? error->lost : NAN);
    put(out, 8, "%*.2f", percent(from, effect->lost));
    fprintf(out, "%9.4f%6d%9.4f", effect->largest, effect->largest_year, effect->last);
    print_delay(out, effect);
    put(out, 8, "%*.2g", from->has_errors && effect->delay_kind == DELAY_FOUND ? error->delay : NAN);
    fprintf(out, "\n");
}

static void print_sum(const Apportionment *from, const char *name, double lost, double error, FILE *out)
{
    fprintf(out, "  %-*s %10.3f", NAME_WIDTH, name, lost);
    put(out, 9, "%*.2g", from->has_errors ? error : NAN);
    put(out, 8, "%*.2f", percent(from, lost));
    fprintf(out, "\n");
}

static void print_whole(const Apportionment *from, FILE *out)
{
    int last = from->first_year + from->years - 1;
    if (!isfinite(from->benchmark)) {
        fprintf(out, "no delays: %d, the benchmark year, is no year of the run\n", from->benchmark_year);
        return;
    }
    fprintf(out, "the whole: %.3f DU in %d, ", from->benchmark, from->benchmark_year);
    if (from->returns < 0)
        fprintf(out, "never below it afterwards\n");
    else if (from->returns == 0)
        fprintf(out, "not back by the end of %d (%.3f DU)\n", last, from->column[from->years - 1]);
    else if (from->has_errors && isfinite(from->return_error))
        fprintf(out, "back in %.2f +- %.2g (between yearly means)\n", from->return_year, from->return_error);
    else
        fprintf(out, "back in %.2f (between yearly means)\n", from->return_year);
}

static void print_abundances(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    if (from->kept_lines)
        fprintf(out, "  Left in every run as asked (--keep): %d lines\n", from->kept_lines);
    if (!from->not_apportioned)
        return;
    fprintf(out, "  Driven by their abundance, so not taken apart:");
    for (int g = 0; g < from->not_apportioned; g++)
        fprintf(out, "%s %s", g ? "," : "", view->model->schedule.gas[from->abundance_gas[g]]);
    fprintf(out, "\n");
}

static void print_quick_row(const char *name, double all_time, double error, double within, FILE *out)
{
    fprintf(out, "  %-*.*s", NAME_WIDTH, NAME_WIDTH, name);
    put(out, 11, "%*.3f", all_time);
    put(out, 9, "%*.2g", error);
    put(out, 11, "%*.3f", within);
    put(out, 8, "%*.1f", all_time != 0.0 ? 100.0 * (all_time - within) / all_time : NAN);
    fprintf(out, "\n");
}

/* What items are ranked by: their loss, for all time in the quick way; last where there is none. */
static double rank(const Apportionment *from, int i)
{
    double loss = from->quick ? from->item[i].all_time : from->item[i].effect.lost;
    return isfinite(loss) ? loss : -INFINITY;
}

/* The item that comes after item `before` (-1: the first) in order of falling loss, equals in order of the
 * schedule; -1 after the last. */
static int next_ranked(const Apportionment *from, int before)
{
    int next = -1;
    for (int i = 0; i < from->items; i++) {
        int after = before < 0 || rank(from, i) < rank(from, before) ||
                    (rank(from, i) == rank(from, before) && i > before);
        if (after && (next < 0 || rank(from, i) > rank(from, next)))
            next = i;
    }
    return next;
}

static void print_quick(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    int last = from->first_year + from->years - 1;
    fprintf(out, "\n  %-*s%11s%9s%11s%8s\n", NAME_WIDTH, "", "all time", "+-", "within", "after");
    fprintf(out, "  %-*s%11s%9s%11s%8s\n", NAME_WIDTH, apportion_by_name(from->by), "DU-years", "",
            "DU-years", "%");
    for (int i = next_ranked(from, -1); i >= 0; i = next_ranked(from, i)) {
        char name[128];
        const ApportionItem *item = &from->item[i];
        apportion_item_name(view->model, item, name, sizeof name);
        print_quick_row(name, item->all_time, item->all_time_error, item->within, out);
    }
    fprintf(out, "\n");
    print_quick_row("sum", from->sum_all_time, from->sum_all_time_error, from->sum_within, out);
    fprintf(
        out,
        "\n  By the derivative of the column settled at the abundances of %d, %d and %d. all time: of what "
        "is\n  given off from %d to %d, for good; within: what of it falls by the end of %d; after: the "
        "rest.\n  Derivatives add up where runs without lines do not. +-: noise of the derivatives and what "
        "the\n  middle year changes. -: given off aloft, taken up by the ground, or made in the air too\n",
        from->background[0], from->background[1], from->background[2], from->first_year, last, last);
    print_abundances(view, out);
}

static void print_notes(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    int some = 0, none = 0, never = 0;
    for (int i = 0; i < from->items; i++) {
        some |= from->item[i].effect.delay_kind == DELAY_AT_LEAST;
        none |= from->item[i].effect.delay_kind == DELAY_NO_RETURN;
        never |= from->item[i].effect.delay_kind == DELAY_NEVER_BELOW;
    }
    fprintf(out,
            "\n  lost: column without the item less column of the whole, summed over the years of the run; "
            "per cent of\n  all; delay: of the return to the benchmark year's column\n");
    if (some)
        fprintf(out, "  >: the whole does not return by the end of the run, without the item it does\n");
    if (isfinite(from->benchmark) && (none || never))
        fprintf(out, "  no delay (-): %s\n",
                none ? "neither run returns by the end of the years"
                     : "a run is never below the benchmark year's column");
    if (from->share < 1.0)
        fprintf(out, "  Of each item %g %% is taken away, and what that does divided by it.\n",
                100.0 * from->share);
    if (from->has_errors)
        fprintf(out,
                "  +-: how far the figure moves with steps and refreshes twice as long and tolerances twice "
                "as wide; layers not\n  counted\n");
    print_abundances(view, out);
    fprintf(
        out,
        "  What was in the air before the lines begin is in every run. %ld runs, %ld outer steps in place of "
        "%ld.\n",
        from->runs, from->steps_shared, from->steps_alone);
}

void apportion_print(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    fprintf(out, "%s\n\nozone lost by %s of the schedule, %d to %d\n", view->model->settings.title,
            apportion_by_name(from->by), from->first_year, from->first_year + from->years - 1);
    print_whole(from, out);
    if (from->quick) {
        print_quick(view, out);
        return;
    }
    fprintf(out, "\n  %-*s %10s%9s%8s%9s%6s%9s%9s%8s\n", NAME_WIDTH, "", "lost", "+-", "of all", "largest",
            "in", "in", "delay", "+-");
    fprintf(out, "  %-*s %10s%9s%8s%9s%6s%9d%9s%8s\n", NAME_WIDTH, apportion_by_name(from->by), "DU-years",
            "", "%", "DU", "", from->first_year + from->years - 1, "months", "");
    for (int i = next_ranked(from, -1); i >= 0; i = next_ranked(from, i)) {
        char name[128];
        apportion_item_name(view->model, &from->item[i], name, sizeof name);
        print_effect(from, name, &from->item[i].effect, &from->item[i].error, out);
    }
    fprintf(out, "\n");
    print_sum(from, "sum of the above", from->sum, from->sum_error, out);
    print_effect(from, "all of them off", &from->all, &from->all_error, out);
    print_sum(from, "remainder (all less sum)", from->remainder, from->remainder_error, out);
    print_notes(view, out);
}

/* ---- CSV ---- */

static void cell(FILE *out, double value)
{
    fputc(',', out);
    if (isfinite(value))
        fprintf(out, "%.9g", value);
}

static void csv_effect(const Apportionment *from, const Effect *effect, const EffectError *error, FILE *out)
{
    double none = from->has_errors ? 0.0 : NAN; /* errors not asked for */
    cell(out, effect->lost);
    cell(out, error->lost + none);
    cell(out, percent(from, effect->lost));
    cell(out, effect->largest);
    fprintf(out, ",%d", effect->largest_year);
    cell(out, effect->last);
    cell(out, error->last + none);
    fprintf(out, ",%s", delay_names[effect->delay_kind]);
    cell(out, effect->delay);
    cell(out, error->delay + none);
    cell(out, effect->return_year);
    fputc('\n', out);
}

static void csv_sum(const Apportionment *from, const char *what, double lost, double error, FILE *out)
{
    fprintf(out, "%s,,,,", what);
    cell(out, lost);
    cell(out, from->has_errors ? error : NAN);
    cell(out, percent(from, lost));
    fprintf(out, ",,,,,,,,\n");
}

static void csv_quick_row(double all_time, double error, double within, FILE *out)
{
    cell(out, all_time);
    cell(out, error);
    cell(out, within);
    fputc('\n', out);
}

static void csv_item(const ApportionView *view, const ApportionItem *item, FILE *out)
{
    fputs("item,", out);
    csv_put_text(out, item->label ? item->label : "");
    fprintf(out, ",%s", item->gas < 0 ? "" : view->model->schedule.gas[item->gas]);
    cell(out, tonnes(item));
    cell(out, item->first_year ? item->first_year : NAN);
}

static void csv_quick(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    fprintf(
        out,
        "# quantity: ozone lost by %s of the schedule, %d to %d, by the derivative of the column settled at "
        "the abundances of %d, %d and %d\nrow,line,gas,emitted_t,first_year,all_time_DU_years,all_time_"
        "error,within_DU_years\n",
        apportion_by_name(from->by), from->first_year, from->first_year + from->years - 1,
        from->background[0], from->background[1], from->background[2]);
    for (int i = 0; i < from->items; i++) {
        const ApportionItem *item = &from->item[i];
        csv_item(view, item, out);
        csv_quick_row(item->all_time, item->all_time_error, item->within, out);
    }
    fprintf(out, "sum,,,,");
    csv_quick_row(from->sum_all_time, from->sum_all_time_error, from->sum_within, out);
}

void apportion_csv(const ApportionView *view, FILE *out)
{
    if (view->apportionment->quick) {
        csv_quick(view, out);
        return;
    }
    const Apportionment *from = view->apportionment;
    fprintf(out,
            "# quantity: ozone lost by %s of the schedule, %d to %d: column without it less column of the "
            "whole; benchmark %d\n# share taken away: %.9g\n",
            apportion_by_name(from->by), from->first_year, from->first_year + from->years - 1,
            from->benchmark_year, from->share);
    if (isfinite(from->benchmark))
        fprintf(out, "# column of %d: %.9g DU\n", from->benchmark_year, from->benchmark);
    if (isfinite(from->return_year))
        fprintf(out, "# return of the whole: %.9g\n", from->return_year);
    fprintf(out,
            "row,line,gas,emitted_t,first_year,lost_DU_years,lost_error,percent_of_all,largest_DU,largest_"
            "year,last_year_DU,last_year_error,delay_kind,delay_months,delay_error,return_year\n");
    for (int i = 0; i < from->items; i++) {
        const ApportionItem *item = &from->item[i];
        csv_item(view, item, out);
        csv_effect(from, &item->effect, &item->error, out);
    }
    fprintf(out, "all,,,,");
    csv_effect(from, &from->all, &from->all_error, out);
    csv_sum(from, "sum", from->sum, from->sum_error, out);
    csv_sum(from, "remainder", from->remainder, from->remainder_error, out);
}

/* ---- JSON ---- */

static void pair(FILE *out, const char *lead, const char *key, double value)
{
    fputs(lead, out);
    json_text(out, key);
    fputs(": ", out);
    json_number(out, value);
}

static void json_columns(FILE *out, const char *key, const double *column, int years)
{
    fprintf(out, ",\n      ");
    json_text(out, key);
    fputs(": [", out);
    for (int y = 0; y < years; y++) {
        fputs(y ? ", " : "", out);
        json_number(out, column[y]);
    }
    fputc(']', out);
}

static void json_effect(const Apportionment *from, const Effect *effect, const EffectError *error, FILE *out)
{
    double none = from->has_errors ? 0.0 : NAN;
    pair(out, "", "lost_DU_years", effect->lost);
    pair(out, ", ", "lost_error", error->lost + none);
    pair(out, ", ", "percent_of_all", percent(from, effect->lost));
    pair(out, ",\n      ", "largest_DU", effect->largest);
    pair(out, ", ", "largest_error", error->largest + none);
    pair(out, ", ", "largest_year", effect->largest_year);
    pair(out, ",\n      ", "last_year_DU", effect->last);
    pair(out, ", ", "last_year_error", error->last + none);
    fputs(",\n      \"delay_kind\": ", out);
    json_text(out, delay_names[effect->delay_kind]);
    pair(out, ", ", "delay_months", effect->delay);
    pair(out, ", ", "delay_error", error->delay + none);
    pair(out, ", ", "return_year", effect->return_year);
    json_columns(out, "column_without_DU", effect->column, from->years);
}

static void json_item(const ApportionView *view, int i, FILE *out)
{
    const ApportionItem *item = &view->apportionment->item[i];
    fprintf(out, "%s\n    {\"line\": ", i ? "," : "");
    if (item->label)
        json_text(out, item->label);
    else
        fputs("null", out);
    fputs(", \"gas\": ", out);
    if (item->gas >= 0)
        json_text(out, view->model->schedule.gas[item->gas]);
    else
        fputs("null", out);
    pair(out, ", ", "emitted_t", tonnes(item));
    pair(out, ", ", "first_year", item->first_year ? item->first_year : NAN);
    if (view->apportionment->quick) {
        pair(out, ",\n      ", "all_time_DU_years", item->all_time);
        pair(out, ", ", "all_time_error", item->all_time_error);
        pair(out, ", ", "within_DU_years", item->within);
    } else {
        fputs(",\n      ", out);
        json_effect(view->apportionment, &item->effect, &item->error, out);
    }
    fputc('}', out);
}

static void json_pair(FILE *out, const char *key, double value)
{
    json_key(out, 1, 0, key);
    json_number(out, value);
}

static void json_runs(const Apportionment *from, FILE *out)
{
    double none = from->has_errors ? 0.0 : NAN;
    json_key(out, 1, 0, "all");
    fputc('{', out);
    json_effect(from, &from->all, &from->all_error, out);
    fputc('}', out);
    json_pair(out, "sum_DU_years", from->sum);
    json_pair(out, "sum_error", from->sum_error + none);
    json_pair(out, "remainder_DU_years", from->remainder);
    json_pair(out, "remainder_error", from->remainder_error + none);
    json_pair(out, "remainder_percent_of_all", percent(from, from->remainder));
}

static void json_quick(const Apportionment *from, FILE *out)
{
    json_key(out, 1, 0, "derivatives_of_years");
    fprintf(out, "[%d, %d, %d]", from->background[0], from->background[1], from->background[2]);
    json_pair(out, "sum_all_time_DU_years", from->sum_all_time);
    json_pair(out, "sum_all_time_error", from->sum_all_time_error);
    json_pair(out, "sum_within_DU_years", from->sum_within);
}

void apportion_json(const ApportionView *view, FILE *out)
{
    const Apportionment *from = view->apportionment;
    double none = from->has_errors ? 0.0 : NAN;
    fputc('{', out);
    json_key(out, 1, 1, "title");
    json_text(out, view->model->settings.title);
    json_key(out, 1, 0, "quantity");
    json_text(out, "ozone column without an item less ozone column of the whole");
    json_key(out, 1, 0, "by");
    json_text(out, apportion_by_name(from->by));
    json_pair(out, "first_year", from->first_year);
    json_pair(out, "years", from->years);
    json_pair(out, "share_taken_away", from->share);
    json_pair(out, "benchmark_year", from->benchmark_year);
    json_pair(out, "benchmark_DU", from->benchmark);
    json_pair(out, "return_year", from->return_year);
    json_pair(out, "return_error", from->return_error + none);
    json_key(out, 1, 0, "column_DU");
    fputc('[', out);
    for (int y = 0; y < from->years; y++) {
        fputs(y ? ", " : "", out);
        json_number(out, from->column[y]);
    }
    fputc(']', out);
    json_pair(out, "lines_kept", from->kept_lines);
    json_key(out, 1, 0, "not_apportioned");
    fputc('[', out);
    for (int g = 0; g < from->not_apportioned; g++) {
        fputs(g ? ", " : "", out);
        json_text(out, view->model->schedule.gas[from->abundance_gas[g]]);
    }
    fputc(']', out);
    json_key(out, 1, 0, "items");
    fputc('[', out);
    for (int i = 0; i < from->items; i++)
        json_item(view, i, out);
    fputc(']', out);
    if (from->quick)
        json_quick(from, out);
    else
        json_runs(from, out);
    fprintf(out, "\n}\n");
}
