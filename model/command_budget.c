/* skymend budget: what makes and destroys ozone in one year of a case, and how long the gases live. */
#include <getopt.h>
#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "budget_text.h"
#include "commands.h"
#include "progress.h"
#include "projection.h"

/* Explicit days carried from the settled state: ozone above some 25 km follows in that time. */
static const double EXPLICIT_DAYS = 30.0;

typedef struct {
    const char *case_path, *csv, *json, *archive;
    double year;
    int year_given, overwrite, quiet, threads, book, help;
    int altitudes, standard; /* standard: none were named */
    double km[BUDGET_ALTITUDES];
    char command_line[2000];
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend budget [CASE.cfg] --year Y [options]\n\n"
        "Settles the column of a case under the surface values of the middle of year Y and prints what\n"
        "makes and destroys odd oxygen by catalytic family, what the families are made of, and how long the\n"
        "source gases live. Without a case: the built-in baseline. With explicit days the column is settled\n"
        "with diurnal factors and carried for 30 days. A sun with seasons has no rest: its budget stands in\n"
        "the file of skymend project.\n\n"
        "      --year Y          the year whose surface values and light count\n"
        "      --at KM[,KM...]   altitudes of the tables (default 15,20,...,60, the grid's top at most); may "
        "be repeated\n"
        "      --reactions       also print which reaction counts for which family, and its weight\n"
        "      --csv FILE        everything by layer, in tidy form: table,name,part,altitude_km,value,unit\n"
        "      --json FILE       the same as JSON\n"
        "  -o, --output FILE.nc  the state with its budget as a NetCDF file of one record\n"
        "      --overwrite       replace files that are there\n"
        "      --threads N       threads to use (default: OMP_NUM_THREADS or all); results do not depend on "
        "it\n"
        "      --quiet           no progress, no tables\n"
        "  -h, --help            this text\n");
}

static int read_altitudes(Request *request, const char *text, Fault *fault)
{
    char copy[400];
    if (strlen(text) >= sizeof copy)
        return fault_set(fault, FAULT_INPUT, "--at: more than %zu characters; repeat the option instead",
                         sizeof copy - 1);
    strcpy(copy, text);
    for (char *at = copy, *next; at; at = next) {
        next = strchr(at, ',');
        if (next)
            *next++ = '\0';
        if (request->altitudes == BUDGET_ALTITUDES)
            return fault_set(fault, FAULT_INPUT, "--at: more than %d altitudes; name fewer",
                             BUDGET_ALTITUDES);
        if (option_number("--at", at, 0, 200, &request->km[request->altitudes], fault))
            return fault->code;
        request->altitudes++;
    }
    return 0;
}

static int whole(const char *option, const char *text, double low, double high, double *value, Fault *fault)
{
    if (option_number(option, text, low, high, value, fault))
        return fault->code;
    return *value == floor(*value)
               ? 0
               : fault_set(fault, FAULT_INPUT, "%s: %s is no whole number; give one like %g", option, text,
                           floor(*value));
}

static int take_option(Request *request, int found, Fault *fault)
{
    double value;
    switch (found) {
    case 'o': request->archive = optarg; break;
    case 'c': request->csv = optarg; break;
    case 'j': request->json = optarg; break;
    case 'w': request->overwrite = 1; break;
    case 'q': request->quiet = 1; break;
    case 'r': request->book = 1; break;
    case 'h': request->help = 1; break;
    case 'a': return read_altitudes(request, optarg, fault);
    case 'y': request->year_given = 1; return whole("--year", optarg, 1750, 2500, &request->year, fault);
    case 't':
        if (!whole("--threads", optarg, 1, 1024, &value, fault))
            request->threads = (int)value;
        return fault->code;
    }
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"year", required_argument, NULL, 'y'},
                                            {"at", required_argument, NULL, 'a'},
                                            {"reactions", no_argument, NULL, 'r'},
                                            {"csv", required_argument, NULL, 'c'},
                                            {"json", required_argument, NULL, 'j'},
                                            {"output", required_argument, NULL, 'o'},
                                            {"overwrite", no_argument, NULL, 'w'},
                                            {"quiet", no_argument, NULL, 'q'},
                                            {"threads", required_argument, NULL, 't'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--year",    "--at",     "--reactions", "--csv",
                                        "--json",    "--output", "--overwrite", "--quiet",
                                        "--threads", "--help",   NULL};
    join_command_line(argc, argv, request->command_line, sizeof request->command_line);
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":o:h", options, NULL)) != -1) {
        if (found == ':' || found == '?')
            return option_fault("budget", argv, optind > before ? optind - 1 : before, found, names, fault);
        if (take_option(request, found, fault))
            return fault->code;
        before = optind;
    }
    if (request->help || one_operand("budget", argc, argv, optind, &request->case_path, fault))
        return fault->code;
    if (!request->year_given)
        return fault_set(fault, FAULT_INPUT, "budget: no year named; add --year Y");
    request->standard = request->altitudes == 0;
    for (int km = 15; request->standard && km <= 60; km += 5)
        request->km[request->altitudes++] = km;
    return 0;
}

/* Those within the grid: of the standard ones some may lie above it. */
static int altitudes_shown(const Request *request, const Model *model)
{
    int shown = request->altitudes;
    while (request->standard && request->km[shown - 1] > 1e-5 * model->grid.edge[model->grid.layers])
        shown--; /* ends: a grid reaches 20 km at least */
    return shown;
}

static int check_altitudes(const Request *request, const Model *model, Fault *fault)
{
    double top = 1e-5 * model->grid.edge[model->grid.layers];
    for (int i = 0; !request->standard && i < request->altitudes; i++)
        if (request->km[i] > top)
            return fault_set(fault, FAULT_INPUT, "--at: %g km is above the grid's top at %g km; stay below",
                             request->km[i], top);
    return 0;
}

/* ---- files ---- */

static int write_text(const char *path, int overwrite, const BudgetView *view,
                      void (*write)(const BudgetView *, FILE *), Fault *fault)
{
    FILE *out = open_text(path, overwrite, fault);
    if (!out)
        return fault->code;
    write(view, out);
    return close_text(out, path, fault);
}

typedef struct {
    Column *column;
    Stepper *stepper;
    const double *x; /* [solved][padded] daily means, borrowed from one of them */
} State;

static int write_record(const Request *request, const BudgetView *view, const Record *record, Fault *fault)
{
    Archive *archive;
    if (archive_create(&archive, view->model, request->archive, request->overwrite, request->command_line,
                       fault))
        return fault->code;
    if (archive_append(archive, record, fault)) {
        archive_abandon(archive);
        return fault->code;
    }
    return archive_close(archive, NULL, fault); /* no run, no ledger */
}

static int write_archive(const Request *request, const State *state, const BudgetView *view,
                         const double *rate, Fault *fault)
{
    const Model *model = view->model;
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    int course = model->settings.moments != MOMENTS_NONE, code = 0;
    double *change = calloc(padded, sizeof(double));
    double *moments = course ? calloc(MOMENTS * solved * padded, sizeof(double)) : NULL;
    if (!change || (course && !moments))
        code = fault_memory(fault, "the record");
    if (!code) {
        const double *kelvin = stepper_conditions(state->stepper)->temperature;
        for (int l = 0; l < model->grid.layers; l++)
            change[l] = kelvin[l] - model->air.temperature[l];
        if (course)
            stepper_moments(state->stepper, view->x, moments);
        const Record record = {.time = view->year,
                               .time_start = request->year,
                               .time_end = request->year + 1.0,
                               .x = view->x,
                               .ozone_column = column_ozone_du(model, view->x),
                               .moments = moments,
                               .rate = rate,
                               .temperature_change = change};
        code = write_record(request, view, &record, fault);
    }
    free(change);
    free(moments);
    return code;
}

static int put_out(const Request *request, const State *state, const BudgetView *view, const double *rate,
                   Fault *fault)
{
    if (request->csv && write_text(request->csv, request->overwrite, view, budget_csv, fault))
        return fault->code;
    if (request->json && write_text(request->json, request->overwrite, view, budget_json, fault))
        return fault->code;
    if (request->archive && write_archive(request, state, view, rate, fault))
        return fault->code;
    if (request->quiet)
        return 0;
    budget_print(view, stdout);
    if (request->book) {
        printf("\n");
        budget_print_book(view, stdout);
    }
    return 0;
}

/* ---- the run ---- */

static void show_progress(void *context, const Progress *progress)
{
    progress_show(context, progress);
}
static void free_state(State *state)
{
    stepper_free(state->stepper);
    column_free(state->column);
    *state = (State){0};
}

/* The state whose budget is taken: the column at rest under the conditions of the middle of the year. */
static int get_state(const Request *request, const Model *model, State *state, Fault *fault)
{
    if (model->settings.sun == SUN_SEASON)
        return fault_set(fault, FAULT_INPUT,
                         "budget: with sun.kind = \"season\" the column is never at rest; take another sun, "
                         "or the budget of every record in the file of skymend project");
    int code = column_make(&state->column, model, fault);
    if (!code)
        code = stepper_make(&state->stepper, model, request->threads, fault);
    if (code)
        return code;
    state->column->time = request->year + 0.5;
    code = projection_settle(model, state->stepper, state->column, fault);
    state->x = state->column->x;
    if (!code && model->settings.day == DAY_EXPLICIT) {
        ProgressBar bar;
        const Watcher watcher = {.progress = show_progress, .context = &bar};
        progress_open(&bar, request->quiet);
        column_open_ledger(model, state->column);
        code = projection_spin_up(model, state->stepper, state->column,
                                  EXPLICIT_DAYS * DAY_SECONDS / YEAR_SECONDS, 1.0, &watcher, fault);
        progress_close(&bar);
        state->x = stepper_mean(state->stepper);
    }
    return code;
}

/* Budget of the state, and everything written. */
static int account(const Request *request, const Model *model, const State *state, const OxBook *book,
                   Fault *fault)
{
    size_t padded = (size_t)model->grid.padded, solved = (size_t)model->mechanism->solved;
    double *rate = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    double *field = calloc((2 * BUDGET_TERMS + 1) * padded, sizeof(double));
    GasBudget *gas = calloc(solved, sizeof *gas);
    int code = rate && field && gas ? 0 : fault_memory(fault, "the budget");
    if (!code) {
        double *net = field + BUDGET_TERMS * padded, *chain = net + padded;
        BudgetView view = {.model = model,
                           .book = book,
                           .x = state->x,
                           .term = field,
                           .net = net,
                           .chain = chain,
                           .gas = gas,
                           .year = request->year + 0.5,
                           .explicit_days = model->settings.day == DAY_EXPLICIT ? EXPLICIT_DAYS : 0.0,
                           .altitudes = altitudes_shown(request, model)};
        memcpy(view.km, request->km, sizeof view.km);
        budget_step_rates(model, state->stepper, view.x, rate);
        budget_odd_oxygen(book, &model->grid, rate, field, net);
        budget_chain_lengths(book, &model->grid, rate, field, chain);
        for (int s = 0; s < (int)solved; s++)
            budget_gas(model, view.x, rate, s, model_keeps(model, s, state->column->time), &gas[s]);
        code = put_out(request, state, &view, rate, fault);
    }
    free(rate);
    free(field);
    free(gas);
    return code;
}

static int run(const Request *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    OxBook *book = NULL;
    State state = {0};
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    settings->first_year = settings->last_year = (int)request->year;
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = check_altitudes(request, model, fault);
    if (!code)
        code = ox_book_make(&book, model->mechanism, fault);
    const Output outputs[] = {{"--csv", request->csv}, {"--json", request->json}, {"-o", request->archive}};
    if (!code)
        code = check_outputs(outputs, 3, request->overwrite, fault);
    if (!code)
        code = check_inputs(outputs, 3, &request->case_path, 1, fault);
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    if (!code)
        code = get_state(request, model, &state, fault);
    if (!code)
        code = account(request, model, &state, book, fault);
    free_state(&state);
    ox_book_free(book);
    model_free(model);
    free(settings);
    return code;
}

int command_budget(int argc, char **argv)
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
