/* apportion: items, and what their runs show. The runs are in apportion_runs.c. */
#include "apportion.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "apportion_runs.h"
#include "emission.h"
#include "series.h"

/* ---- items ---- */

static int same_item(const ApportionItem *item, const ScheduleLine *line)
{
    return (item->gas < 0 || item->gas == line->gas) && (!item->label || !strcmp(item->label, line->label));
}

/* kg of gas of a line within the run; its first year that gives something, or 0. */
static double given_off(const Apportionment *to, const Model *model, int l, int *first)
{
    const ScheduleLine *line = &model->schedule.line[l];
    double molecules = model->emissions->molecules[l];
    double sum = 0.0;
    *first = 0;
    for (int y = 0; y < line->years; y++) {
        int year = line->first_year + y;
        if (year < to->first_year || year >= to->first_year + to->years || !(line->amount[y] > 0.0))
            continue;
        sum += line->amount[y];
        *first = *first ? *first : year;
    }
    return emission_kg_year(model, model->emissions->species[l], sum * molecules / YEAR_SECONDS);
}

static int add_line(Apportionment *to, const Model *model, int l, Fault *fault)
{
    const ScheduleLine *line = &model->schedule.line[l];
    int i = 0, first;
    while (i < to->items && !same_item(&to->item[i], line))
        i++;
    ApportionItem *item = &to->item[i];
    if (i == to->items) {
        item->label = to->by == APPORTION_GAS ? NULL : line->label;
        item->gas = to->by == APPORTION_LINE ? -1 : line->gas;
        item->line = calloc((size_t)model->schedule.lines, sizeof(int));
        item->kg = calloc((size_t)model->schedule.lines, sizeof(double));
        item->effect.column = calloc((size_t)to->years, sizeof(double));
        to->items++;
        if (!item->line || !item->kg || !item->effect.column)
            return fault_memory(fault, "items of the schedule");
    }
    item->line[item->lines] = l;
    item->kg[item->lines] = given_off(to, model, l, &first);
    item->lines++;
    if (first && (!item->first_year || first < item->first_year))
        item->first_year = first;
    return 0;
}

static int is_kept(const ApportionAsk *ask, const char *label)
{
    for (int k = 0; k < ask->keeps; k++)
        if (!strcmp(ask->keep[k], label))
            return 1;
    return 0;
}

static int check_keeps(const Schedule *schedule, const ApportionAsk *ask, Fault *fault)
{
    for (int k = 0; k < ask->keeps; k++) {
        int l = 0;
        while (l < schedule->lines && strcmp(schedule->line[l].label, ask->keep[k]))
            l++;
        if (l < schedule->lines)
            continue;
        const char **labels = malloc(((size_t)schedule->lines + 1) * sizeof *labels);
        if (!labels)
            return fault_memory(fault, "labels of the schedule");
        for (l = 0; l < schedule->lines; l++)
            labels[l] = schedule->line[l].label;
        const char *near = fault_nearest(ask->keep[k], labels, (size_t)schedule->lines);
        fault_set(fault, FAULT_INPUT, "--keep: no line of emission is labelled \"%.60s\"%s%s%s", ask->keep[k],
                  near ? "; did you mean \"" : "; skymend check lists them", near ? near : "",
                  near ? "\"?" : "");
        free(labels);
        return fault->code;
    }
    return 0;
}

static int list_items(Apportionment *to, const Model *model, const ApportionAsk *ask, Fault *fault)
{
    const Schedule *schedule = &model->schedule;
    int any = 0;
    to->item = calloc((size_t)schedule->lines + 1, sizeof *to->item);
    to->abundance_gas = calloc((size_t)schedule->gases + 1, sizeof(int));
    to->column = calloc((size_t)to->years, sizeof(double));
    to->all.column = calloc((size_t)to->years, sizeof(double));
    if (!to->item || !to->abundance_gas || !to->column || !to->all.column)
        return fault_memory(fault, "items of the schedule");
    if (check_keeps(schedule, ask, fault))
        return fault->code;
    for (int l = 0; l < schedule->lines; l++) {
        if (is_kept(ask, schedule->line[l].label))
            to->kept_lines++;
        else if (add_line(to, model, l, fault))
            return fault->code;
    }
    for (int i = 0; i < to->items; i++)
        any |= to->item[i].first_year > 0;
    for (int g = 0; g < schedule->gases; g++) {
        int from = schedule->emission_from[g];
        if (schedule->years[g] && (!from || from >= to->first_year + to->years))
            to->abundance_gas[to->not_apportioned++] = g;
    }
    if (any)
        return 0;
    if (to->kept_lines)
        return fault_set(fault, FAULT_INPUT,
                         "--keep: no other line gives anything off from %d to %d, so there is nothing to "
                         "apportion; keep fewer, or add lines (files.schedule_layers)",
                         to->first_year, to->first_year + to->years - 1);
    return fault_set(
        fault, FAULT_INPUT,
        "%s: no line of emission gives anything off from %d to %d, so there is nothing to apportion; turn "
        "abundances into emissions (skymend schedule --as emission) or add lines (files.schedule_layers)",
        schedule->path[0], to->first_year, to->first_year + to->years - 1);
}

/* ---- what the runs show ---- */

/* The return of yearly means to the benchmark year's value of the whole. *returns: 1 found, 0 not by the end,
 * -1 never below or no such year. */
static int find_return(const Apportionment *to, const double *column, double *year, double *benchmark,
                       int *returns, Fault *fault)
{
    size_t years = (size_t)to->years;
    double *start = malloc(4 * years * sizeof(double));
    if (!start)
        return fault_memory(fault, "return of the column");
    double *middle = start + years, *end = middle + years, *value = end + years;
    for (int y = 0; y < to->years; y++) {
        start[y] = to->first_year + y;
        middle[y] = start[y] + 0.5;
        end[y] = start[y] + 1.0;
        value[y] = to->first_year + y == to->benchmark_year ? to->column[y] : column[y];
    }
    const Series series = {to->years, start, middle, end, value};
    SeriesReturn found = series_return(&series, 1, to->benchmark_year);
    free(start);
    *returns = found.state == RETURN_FOUND ? 1 : found.state == RETURN_LATER ? 0 : -1;
    *year = found.year;
    if (benchmark)
        *benchmark = found.state == RETURN_UNKNOWN ? NAN : found.value;
    return 0;
}

static int show_effect(const Apportionment *to, Effect *effect, Fault *fault)
{
    int returns;
    effect->lost = effect->largest = 0.0;
    effect->largest_year = to->first_year;
    for (int y = 0; y < to->years; y++) {
        double difference = (effect->column[y] - to->column[y]) / to->share;
        effect->lost += difference; /* times one year */
        effect->last = difference;
        if (fabs(difference) > fabs(effect->largest)) {
            effect->largest = difference;
            effect->largest_year = to->first_year + y;
        }
    }
    if (find_return(to, effect->column, &effect->return_year, NULL, &returns, fault))
        return fault->code;
    effect->delay = NAN;
    effect->delay_kind = returns < 0 || to->returns < 0 ? DELAY_NEVER_BELOW
                         : returns == 0                 ? DELAY_NO_RETURN
                         : to->returns == 0             ? DELAY_AT_LEAST
                                                        : DELAY_FOUND;
    double whole = to->returns == 1 ? to->return_year : to->first_year + to->years;
    if (effect->delay_kind == DELAY_FOUND || effect->delay_kind == DELAY_AT_LEAST)
        effect->delay = 12.0 * (whole - effect->return_year) / to->share;
    return 0;
}

int apportion_return(Apportionment *to, Fault *fault)
{
    return find_return(to, to->column, &to->return_year, &to->benchmark, &to->returns, fault);
}

static int show_effects(Apportionment *to, Fault *fault)
{
    int code = apportion_return(to, fault);
    for (int i = 0; !code && i < to->items; i++) {
        code = show_effect(to, &to->item[i].effect, fault);
        to->sum += to->item[i].effect.lost;
    }
    if (!code)
        code = show_effect(to, &to->all, fault);
    to->remainder = to->all.lost - to->sum;
    return code;
}

/* ---- the error ---- */

void apportion_coarser(Settings *settings)
{
    settings->outer_step_days *= 2.0;
    settings->relative_tolerance *= 2.0;
    settings->absolute_tolerance_cm3 *= 2.0;
    settings->refresh_column *= 2.0;
    settings->refresh_state *= 2.0;
    settings->refresh_years *= 2.0;
}

static EffectError moved(const Effect *fine, const Effect *coarse)
{
    return (EffectError){.lost = fabs(fine->lost - coarse->lost),
                         .largest = fabs(fine->largest - coarse->largest),
                         .last = fabs(fine->last - coarse->last),
                         .delay = fabs(fine->delay - coarse->delay),
                         .return_year = fabs(fine->return_year - coarse->return_year)};
}

static void take_errors(Apportionment *to, const Apportionment *coarse)
{
    for (int i = 0; i < to->items; i++) {
        to->item[i].error = moved(&to->item[i].effect, &coarse->item[i].effect);
        to->sum_error += to->item[i].error.lost;
    }
    to->all_error = moved(&to->all, &coarse->all);
    to->remainder_error = fabs(to->remainder - coarse->remainder);
    to->return_error = fabs(to->return_year - coarse->return_year);
    to->has_errors = 1;
}

/* ---- all together ---- */

int apportion_list(Apportionment **made, const Model *model, const ApportionAsk *ask, Fault *fault)
{
    *made = NULL;
    Apportionment *to = calloc(1, sizeof *to);
    if (!to)
        return fault_memory(fault, "apportionment");
    to->first_year = model->settings.first_year;
    to->years = model->settings.last_year - to->first_year + 1;
    to->by = ask->by;
    to->share = ask->share;
    to->benchmark_year = ask->benchmark_year;
    if (list_items(to, model, ask, fault)) {
        apportion_free(to);
        return fault->code;
    }
    *made = to;
    return 0;
}

int apportion_check(const Model *model, const ApportionAsk *ask, Fault *fault)
{
    Apportionment *listed;
    if (!apportion_list(&listed, model, ask, fault))
        apportion_free(listed);
    return fault->code;
}

static int make_once(Apportionment **made, const Model *model, const ApportionAsk *ask, ApportionPace *pace,
                     Fault *fault)
{
    int code = apportion_list(made, model, ask, fault);
    if (!code)
        code = apportion_runs(*made, model, ask->threads, pace, fault);
    return code ? code : show_effects(*made, fault);
}

int apportion_make(Apportionment **made, const Model *model, const ApportionAsk *ask, const Watcher *watcher,
                   Fault *fault)
{
    double since = omp_get_wtime();
    Apportionment *coarse = NULL;
    Model *second = NULL; /* the same, but for its settings */
    ApportionPace pace = {.outer = watcher, .share = ask->errors ? 2.0 / 3.0 : 1.0};
    *made = NULL;
    if (!(ask->share > 0.0 && ask->share <= 1.0))
        return fault_set(fault, FAULT_INPUT, "share to take away: %g is not above 0 and at most 1",
                         ask->share);
    int code = make_once(made, model, ask, &pace, fault);
    if (!code && ask->errors) {
        second = malloc(sizeof *second);
        code = second ? 0 : fault_memory(fault, "coarse runs");
    }
    if (!code && ask->errors) {
        *second = *model;
        apportion_coarser(&second->settings);
        pace = (ApportionPace){.outer = watcher, .from = 2.0 / 3.0, .share = 1.0 / 3.0};
        code = make_once(&coarse, second, ask, &pace, fault);
    }
    if (!code && ask->errors)
        take_errors(*made, coarse);
    apportion_free(coarse);
    free(second);
    if (code) {
        apportion_free(*made);
        *made = NULL;
        return code;
    }
    (*made)->seconds = omp_get_wtime() - since;
    return 0;
}

void apportion_free(Apportionment *apportionment)
{
    if (!apportionment)
        return;
    for (int i = 0; apportionment->item && i < apportionment->items; i++) {
        free(apportionment->item[i].line);
        free(apportionment->item[i].kg);
        free(apportionment->item[i].effect.column);
    }
    free(apportionment->item);
    free(apportionment->abundance_gas);
    free(apportionment->column);
    free(apportionment->all.column);
    free(apportionment);
}
