/* skymend settle: the column at rest under one year's surface values, and what every parameter does to it. */
#include <getopt.h>
#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "archive.h"
#include "budget.h"
#include "commands.h"
#include "sensitivity.h"
#include "steady.h"

typedef struct {
    const char *case_path, *of, *output;
    char command_line[2000];
    int overwrite, year_given, year, sensitivity, csv, threads, rows, help;
} Request;

static void print_help(void)
{
    printf("usage: skymend settle [CASE.cfg] [--year Y] [--csv] [--sensitivity [--of ANSWER]]\n\n"
           "The column at rest under the surface values of one year (those of its middle): ozone and the\n"
           "lifetimes of the gases that the ground keeps. Without a case: the built-in baseline.\n\n"
           "      --year Y         year of the schedule (default: the first of the case)\n"
           "      --sensitivity    what every reaction and boundary does to an answer, ranked, and what the\n"
           "                       published uncertainties of the reactions make of it\n"
           "      --of ANSWER      the answer: column (default), O3@KM, lifetime:GAS or flux:GAS,\n"
           "                       as in O3@40 and lifetime:N2O\n"
           "      --rows N         lines of a ranking (default 20)\n"
           "      --csv            everything as CSV\n"
           "  -o, --output FILE.nc the settled column as a NetCDF file of one record\n"
           "      --overwrite      replace FILE.nc if it is there\n"
           "      --threads N      threads to use (default: OMP_NUM_THREADS or all); results do not depend "
           "on it\n"
           "  -h, --help           this text\n\n"
           "Sensitivities are first-order, of the column settled anew; diurnal factors stay as they are.\n");
}

static int whole_number(const char *option, const char *text, double low, double high, int *to, Fault *fault)
{
    double value;
    if (option_number(option, text, low, high, &value, fault))
        return fault->code;
    *to = (int)value;
    if (*to != value)
        return fault_set(fault, FAULT_INPUT, "%s: %s is no whole number", option, text);
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {
        {"output", required_argument, NULL, 'f'}, {"overwrite", no_argument, NULL, 'w'},
        {"year", required_argument, NULL, 'y'},   {"sensitivity", no_argument, NULL, 's'},
        {"of", required_argument, NULL, 'O'},     {"rows", required_argument, NULL, 'r'},
        {"csv", no_argument, NULL, 'c'},          {"threads", required_argument, NULL, 't'},
        {"help", no_argument, NULL, 'h'},         {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--year",    "--sensitivity", "--of",     "--rows",      "--csv",
                                        "--threads", "--help",        "--output", "--overwrite", NULL};
    int found, before = 1, code = 0;
    size_t used = (size_t)snprintf(request->command_line, sizeof request->command_line, "skymend");
    for (int i = 0; i < argc && used < sizeof request->command_line; i++)
        used += (size_t)snprintf(request->command_line + used, sizeof request->command_line - used, " %s",
                                 argv[i]);
    request->rows = 20;
    opterr = 0;
    optind = 1;
    while (!code && (found = getopt_long(argc, argv, ":o:h", options, NULL)) != -1) {
        switch (found) {
        case 's': request->sensitivity = 1; break;
        case 'O': request->of = optarg; break;
        case 'f':
        case 'o': request->output = optarg; break;
        case 'w': request->overwrite = 1; break;
        case 'c': request->csv = 1; break;
        case 'h': request->help = 1; break;
        case 'r': code = whole_number("--rows", optarg, 1, 10000, &request->rows, fault); break;
        case 't': code = whole_number("--threads", optarg, 1, 1024, &request->threads, fault); break;
        case 'y':
            code = whole_number("--year", optarg, 1750, 2500, &request->year, fault);
            request->year_given = 1;
            break;
        default:
            return option_fault("settle", argv, optind > before ? optind - 1 : before, found, names, fault);
        }
        before = optind;
    }
    if (code || request->help)
        return code;
    if (request->of && !request->sensitivity)
        return fault_set(fault, FAULT_INPUT, "--of: says what --sensitivity is of; add --sensitivity");
    return one_operand("settle", argc, argv, optind, &request->case_path, fault);
}

/* ---- the settled column ---- */

static double at_altitude(const Unsplit *unsplit, const double *x, double km)
{
    Answer answer = {.kind = ANSWER_OZONE, .altitude_km = km};
    return answer_value(unsplit, x, &answer);
}

static int shown(const Model *model, double km)
{
    return 1e-5 * model->grid.middle[0] <= km && km <= 1e-5 * model->grid.middle[model->grid.layers - 1];
}

/* Gases that the ground keeps and of which there are any. */
static int has_lifetime(const Model *model, const double *x, int s)
{
    int kind = model->surface_kind[s];
    return (kind == SURFACE_SCHEDULE || kind == SURFACE_FIXED) && column_burden(model, x, s) > 0.0;
}

static const double levels[] = {20, 30, 40, 50};
enum { LEVELS = sizeof levels / sizeof levels[0] };

static void print_settled(const Unsplit *unsplit, const Column *column, const SteadyReport *steady, int year)
{
    const Model *model = unsplit->model;
    printf("%s\n\nsettled at the surface values of %d (its middle), %s\n", model->settings.title, year,
           unsplit->has_factors ? "with diurnal factors" : "with daily means and no diurnal factors");
    printf("  steps %d, not taken %d, turns of the factors %d, %.1f s\n", steady->iterations,
           steady->rejected, steady->turns, steady->seconds);
    printf("  residual %.1e of the gross rate (%s, %.1f km); last step of Newton's %.1e", steady->residual,
           mechanism_name(model->mechanism, steady->worst_species),
           1e-5 * model->grid.middle[steady->worst_layer], steady->change);
    if (unsplit->has_factors)
        printf(";\n  ozone in the last turn of the factors %.1e", steady->ozone_change);
    printf("\n\n  ozone column %11.3f DU\n", column_ozone_du(model, column->x));
    for (int i = 0; i < LEVELS; i++)
        if (shown(model, levels[i]))
            printf("  O3 at %g km %12.4f ppm\n", levels[i], 1e6 * at_altitude(unsplit, column->x, levels[i]));
    printf("\n  %-14s %14s %16s\n", "gas", "lifetime, years", "at the ground");
    for (int s = 0; s < unsplit->solved; s++) {
        if (!has_lifetime(model, column->x, s))
            continue;
        Answer answer = {.kind = ANSWER_LIFETIME, .species = s};
        printf("  %-14s %14.4g %12.4g ppt\n", mechanism_name(model->mechanism, s),
               answer_value(unsplit, column->x, &answer), 1e12 * column->x[FIELD(model->grid.padded, s, 0)]);
    }
}

static void print_settled_csv(const Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                              int year)
{
    const Model *model = unsplit->model;
    printf("# quantity: settled column, surface values of the middle of %d, %s\n", year,
           unsplit->has_factors ? "diurnal factors" : "daily means");
    printf("table,name,value,unit,uncertainty_factor_298K,effect_of_uncertainty\n");
    printf("solution,year,%d,,,\nsolution,steps,%d,,,\nsolution,turns,%d,,,\n", year, steady->iterations,
           steady->turns);
    printf("solution,residual,%.3e,of the gross rate,,\nsolution,last_change,%.3e,relative,,\n",
           steady->residual, steady->change);
    printf("answer,column,%.6f,DU,,\n", column_ozone_du(model, column->x));
    for (int i = 0; i < LEVELS; i++)
        if (shown(model, levels[i]))
            printf("answer,O3@%g,%.6e,mol mol-1,,\n", levels[i], at_altitude(unsplit, column->x, levels[i]));
    for (int s = 0; s < unsplit->solved; s++) {
        Answer answer = {.kind = ANSWER_LIFETIME, .species = s};
        if (has_lifetime(model, column->x, s))
            printf("answer,lifetime:%s,%.6g,years,,\n", mechanism_name(model->mechanism, s),
                   answer_value(unsplit, column->x, &answer));
    }
}

/* ---- sensitivities ---- */

typedef struct {
    const char *kind;
    char name[64];
    double change; /* of the answer per unit of ln(parameter) */
    double f;      /* 0: none published or none applies */
    double effect; /* of one published uncertainty on the answer */
} Entry;

typedef struct {
    Entry *entry;
    int count;
} Ranking;

static void add_entry(Ranking *ranking, const char *kind, const char *name, double change, double f,
                      double effect)
{
    Entry *entry = &ranking->entry[ranking->count++];
    *entry = (Entry){.kind = kind, .change = change, .f = f, .effect = effect};
    snprintf(entry->name, sizeof entry->name, "%s", name);
}

static const char *kind_of(const Reaction *reaction)
{
    static const char *const name[] = {"thermal", "photolysis", "surface", "washout"};
    return name[reaction->kind];
}

static int make_reactions(Ranking *ranking, const Sensitivity *sensitivity, const Model *model, Fault *fault)
{
    const Mechanism *mechanism = model->mechanism;
    ranking->entry = calloc((size_t)mechanism->reactions, sizeof(Entry));
    if (!ranking->entry)
        return fault_memory(fault, "the ranking");
    for (int r = 0; r < mechanism->reactions; r++)
        add_entry(ranking, kind_of(&mechanism->reaction[r]), mechanism->reaction[r].id,
                  sensitivity_reaction(sensitivity, model, r, 0), mechanism->reaction[r].f,
                  sensitivity_reaction(sensitivity, model, r, 1));
    return 0;
}

/* Mixing by bands of this many km. */
static const double BAND = 10.0;

static int make_borders(Ranking *ranking, const Sensitivity *sensitivity, const Unsplit *unsplit,
                        const double *x, Fault *fault)
{
    const Model *model = unsplit->model;
    double top = 1e-5 * model->grid.edge[unsplit->layers];
    ranking->entry = calloc(3 * (size_t)unsplit->solved + (size_t)ceil(top / BAND) + 1, sizeof(Entry));
    if (!ranking->entry)
        return fault_memory(fault, "the ranking");
    for (int s = 0; s < unsplit->solved; s++) {
        const char *name = mechanism_name(model->mechanism, s);
        if (sensitivity->surface[s] != 0.0)
            add_entry(ranking, "at the ground", name,
                      sensitivity->surface[s] * x[FIELD(model->grid.padded, s, 0)], 0, 0);
        if (sensitivity->deposition[s] != 0.0)
            add_entry(ranking, "deposition", name, sensitivity->deposition[s], 0, 0);
        if (sensitivity->held[s] != 0.0)
            add_entry(ranking, "below the tropopause", name, sensitivity->held[s], 0, 0);
    }
    for (double from = 0.0; from < top; from += BAND) {
        char name[40];
        double sum = 0.0;
        for (int e = 1; e < unsplit->layers; e++)
            if (1e-5 * model->grid.edge[e] >= from && 1e-5 * model->grid.edge[e] < from + BAND)
                sum += sensitivity->eddy[e];
        snprintf(name, sizeof name, "%g to %g km", from, fmin(from + BAND, top));
        add_entry(ranking, "eddy diffusion", name, sum, 0, 0);
    }
    return 0;
}

static int by_effect(const void *a, const void *b)
{
    double left = fabs(((const Entry *)a)->effect), right = fabs(((const Entry *)b)->effect);
    return (left < right) - (left > right);
}

static int by_change(const void *a, const void *b)
{
    double left = fabs(((const Entry *)a)->change), right = fabs(((const Entry *)b)->change);
    return (left < right) - (left > right);
}

static void print_rankings(const Sensitivity *sensitivity, const char *name, Ranking *reactions,
                           Ranking *borders, int rows)
{
    const char *unit = answer_unit(&sensitivity->answer);
    double squares = 0.0, whole = sensitivity->value;
    int without = 0;
    for (int i = 0; i < reactions->count; i++) {
        squares += reactions->entry[i].effect * reactions->entry[i].effect;
        without += reactions->entry[i].f == 0.0 && strcmp(reactions->entry[i].kind, "washout") != 0;
    }
    printf("\nWhat the laboratory does not know, and what it does to the %s (%.6g %s)\n\n", name, whole,
           unit);
    printf("  %-32s %-11s %12s %7s %12s %9s\n", "reaction", "kind", "per +1 %, %", "f(298)", "effect",
           "effect, %");
    qsort(reactions->entry, (size_t)reactions->count, sizeof(Entry), by_effect);
    for (int i = 0; i < reactions->count && i < rows && reactions->entry[i].effect != 0.0; i++) {
        const Entry *entry = &reactions->entry[i];
        printf("  %-32s %-11s %+12.5f %7.2f %+12.4g %+9.3f\n", entry->name, entry->kind,
               entry->change / whole, entry->f, entry->effect, 100.0 * entry->effect / whole);
    }
    printf("  all together, independent of each other: %.4g %s, %.2f %%; %d reactions have no published f\n",
           sqrt(squares), unit, fabs(100.0 * sqrt(squares) / whole), without);
    printf("  effect: the rate coefficient times f(T) = f exp|g (1/T - 1/298)| at every altitude, to first "
           "order\n");
    printf("\nWhat borders and mixing do to the %s\n\n  %-22s %-14s %12s\n", name, "kind", "of",
           "per +1 %, %");
    qsort(borders->entry, (size_t)borders->count, sizeof(Entry), by_change);
    for (int i = 0; i < borders->count && i < rows; i++)
        printf("  %-22s %-14s %+12.5f\n", borders->entry[i].kind, borders->entry[i].name,
               borders->entry[i].change / whole);
}

static void print_rankings_csv(const Sensitivity *sensitivity, const char *name, Ranking *reactions,
                               Ranking *borders)
{
    const char *unit = answer_unit(&sensitivity->answer);
    Ranking *all[] = {reactions, borders};
    qsort(reactions->entry, (size_t)reactions->count, sizeof(Entry), by_effect);
    qsort(borders->entry, (size_t)borders->count, sizeof(Entry), by_change);
    for (int i = 0; i < 2; i++)
        for (int j = 0; j < all[i]->count; j++) {
            const Entry *entry = &all[i]->entry[j];
            printf("d %s / d ln %s,%s,%.6e,%s,", name, entry->kind, entry->name, entry->change, unit);
            if (entry->f > 0.0)
                printf("%g,%.6e\n", entry->f, entry->effect);
            else
                printf(",\n");
        }
}

static int run_sensitivity(Unsplit *unsplit, const double *x, const Answer *answer, const Request *request,
                           Fault *fault)
{
    const Model *model = unsplit->model;
    Sensitivity *sensitivity = NULL;
    Ranking reactions = {0}, borders = {0};
    char name[80];
    answer_name(answer, model, name, sizeof name);
    int code = sensitivity_prepare(unsplit, x, fault);
    if (!code)
        code = sensitivity_make(&sensitivity, unsplit, x, answer, fault);
    if (!code)
        code = make_reactions(&reactions, sensitivity, model, fault);
    if (!code)
        code = make_borders(&borders, sensitivity, unsplit, x, fault);
    if (!code && request->csv)
        print_rankings_csv(sensitivity, name, &reactions, &borders);
    else if (!code)
        print_rankings(sensitivity, name, &reactions, &borders, request->rows);
    free(reactions.entry);
    free(borders.entry);
    sensitivity_free(sensitivity);
    return code;
}

static int write_record(Archive *archive, const Stepper *stepper, const Column *column, const Model *model,
                        int year, Fault *fault)
{
    size_t padded = (size_t)model->grid.padded, course = MOMENTS * (size_t)model->mechanism->solved * padded;
    double *rate = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    double *moments = calloc(course, sizeof(double));
    int code = rate && moments ? 0 : fault_memory(fault, "the settled column's record");
    if (!code) {
        budget_step_rates(model, stepper, column->x, rate);
        if (model->settings.moments != MOMENTS_NONE)
            stepper_moments(stepper, column->x, moments);
        Record record = {.time = year + 0.5,
                         .time_start = year,
                         .time_end = year + 1.0,
                         .x = column->x,
                         .ozone_column = column_ozone_du(model, column->x),
                         .moments = model->settings.moments == MOMENTS_NONE ? NULL : moments,
                         .rate = rate};
        code = archive_append(archive, &record, fault);
    }
    if (code)
        archive_abandon(archive);
    else
        code = archive_close(archive, NULL, fault); /* no run, no ledger */
    free(rate);
    free(moments);
    return code;
}

static int run(const Request *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
    Archive *archive = NULL;
    SteadyReport steady = {0};
    Answer answer = {0};
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    int year = !code && !request->year_given ? settings->first_year : request->year;
    settings->first_year = settings->last_year = year; /* the schedule must cover it */
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code && request->of)
        code = answer_read(&answer, request->of, model, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    if (!code)
        code = stepper_make(&stepper, model, request->threads, fault);
    if (!code)
        code = unsplit_make(&unsplit, model, fault);
    if (!code && request->output)
        code = archive_create(&archive, model, request->output, request->overwrite, request->command_line,
                              fault);
    if (!code)
        code = steady_find(unsplit, stepper, column, year + 0.5, &steady, fault);
    if (archive && code)
        archive_abandon(archive);
    if (archive && !code)
        code = write_record(archive, stepper, column, model, year, fault);
    if (!code && request->csv)
        print_settled_csv(unsplit, column, &steady, year);
    else if (!code)
        print_settled(unsplit, column, &steady, year);
    if (!code && request->sensitivity)
        code = run_sensitivity(unsplit, column->x, &answer, request, fault);
    unsplit_free(unsplit);
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_settle(int argc, char **argv)
{
    Request request = {0};
    Fault fault = {0};
    int code = read_request(&request, argc, argv, &fault);
    if (!code && request.help) {
        print_help();
        return 0;
    }
    if (!code)
        code = run(&request, &fault);
    return code ? report_fault(&fault) : 0;
}
