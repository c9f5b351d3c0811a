/* skymend settle: the column at rest under one year's surface values, and what every parameter does to it. */
#include <getopt.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"
#include "archive.h"
#include "budget.h"
#include "commands.h"
#include "settle_text.h"

typedef struct {
    const char *case_path, *of, *output, *json;
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
           "      --csv            everything as CSV, in place of the tables\n"
           "      --json FILE      everything as JSON as well\n"
           "  -o, --output FILE.nc the settled column as a NetCDF file of one record\n"
           "      --overwrite      replace files that are there\n"
           "      --threads N      threads to use (default: OMP_NUM_THREADS or all); results do not depend "
           "on it\n"
           "  -h, --help           this text\n\n"
           "Sensitivities are first-order, of the column settled anew; diurnal factors stay as they are.\n");
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"output", required_argument, NULL, 'f'},
                                            {"overwrite", no_argument, NULL, 'w'},
                                            {"year", required_argument, NULL, 'y'},
                                            {"sensitivity", no_argument, NULL, 's'},
                                            {"of", required_argument, NULL, 'O'},
                                            {"rows", required_argument, NULL, 'r'},
                                            {"csv", no_argument, NULL, 'c'},
                                            {"json", required_argument, NULL, 'j'},
                                            {"threads", required_argument, NULL, 't'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--year",      "--sensitivity", "--of",   "--rows",
                                        "--csv",       "--threads",     "--help", "--output",
                                        "--overwrite", "--json",        NULL};
    int found, before = 1, code = 0;
    join_command_line(argc, argv, request->command_line, sizeof request->command_line);
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
        case 'j': request->json = optarg; break;
        case 'h': request->help = 1; break;
        case 'r': code = option_whole("--rows", optarg, 1, 10000, &request->rows, fault); break;
        case 't': code = option_whole("--threads", optarg, 1, 1024, &request->threads, fault); break;
        case 'y':
            code = option_whole("--year", optarg, 1750, 2500, &request->year, fault);
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
    if (request->rows && !request->sensitivity)
        return fault_set(fault, FAULT_INPUT, "--rows: is the length of the rankings; add --sensitivity");
    if (request->overwrite && !request->json && !request->output)
        return fault_set(fault, FAULT_INPUT, "--overwrite: no file is to be written; add --json or -o");
    if (!request->rows)
        request->rows = 20;
    return one_operand("settle", argc, argv, optind, &request->case_path, fault);
}

/* ---- what is told ---- */

/* json: where not NULL, into the object begun there. */
static int run_sensitivity(Unsplit *unsplit, const double *x, const Answer *answer, const Request *request,
                           FILE *json, Fault *fault)
{
    Sensitivity *sensitivity = NULL;
    Rankings rankings = {0};
    char name[80];
    answer_name(answer, unsplit->model, name, sizeof name);
    int code = sensitivity_prepare(unsplit, x, fault);
    if (!code)
        code = sensitivity_make(&sensitivity, unsplit, x, answer, fault);
    if (!code)
        code = rankings_make(&rankings, sensitivity, unsplit, x, fault);
    if (!code && json)
        rankings_json(json, sensitivity, name, &rankings);
    if (!code && request->csv)
        rankings_csv(stdout, sensitivity, name, &rankings);
    else if (!code)
        rankings_print(stdout, sensitivity, name, &rankings, request->rows);
    rankings_free(&rankings);
    sensitivity_free(sensitivity);
    return code;
}

/* The state as the one record of a file. */
static int write_record(const Request *request, const Stepper *stepper, const Column *column,
                        const Model *model, int year, Fault *fault)
{
    size_t padded = (size_t)model->grid.padded, course = MOMENTS * (size_t)model->mechanism->solved * padded;
    int with_course = model->settings.moments != MOMENTS_NONE;
    double *rate = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    double *moments = calloc(course, sizeof(double)), *change = calloc(padded, sizeof(double));
    Archive *archive = NULL;
    int code = rate && moments && change ? 0 : fault_memory(fault, "the settled column's record");
    if (!code)
        code = archive_create(&archive, model, request->output, request->overwrite, request->command_line,
                              fault);
    if (!code) {
        const double *kelvin = stepper_conditions(stepper)->temperature;
        for (int l = 0; l < model->grid.layers; l++)
            change[l] = kelvin[l] - model->air.temperature[l];
        budget_step_rates(model, stepper, column->x, rate);
        if (with_course)
            stepper_moments(stepper, column->x, moments);
        Record record = {.time = year + 0.5,
                         .time_start = year,
                         .time_end = year + 1.0,
                         .x = column->x,
                         .ozone_column = column_ozone_du(model, column->x),
                         .moments = with_course ? moments : NULL,
                         .rate = rate,
                         .temperature_change = change};
        code = archive_append(archive, &record, fault);
        if (code)
            archive_abandon(archive);
        else
            code = archive_close(archive, NULL, fault); /* no run, no ledger */
    }
    free(rate);
    free(moments);
    free(change);
    return code;
}

/* Tables or CSV on standard output, JSON into its file. */
static int tell(const Request *request, Unsplit *unsplit, const Column *column, const SteadyReport *steady,
                int year, const Answer *answer, Fault *fault)
{
    FILE *json = request->json ? open_text(request->json, request->overwrite, fault) : NULL;
    if (request->json && !json)
        return fault->code;
    if (json)
        settled_json(json, unsplit, column, steady, year);
    if (request->csv)
        settled_csv(stdout, unsplit, column, steady, year);
    else
        settled_print(stdout, unsplit, column, steady, year);
    if (request->sensitivity)
        run_sensitivity(unsplit, column->x, answer, request, json, fault);
    if (json) {
        fprintf(json, "\n}\n");
        close_text(json, request->json, fault);
    }
    return fault->code;
}

static int run(const Request *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
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
    const Output outputs[] = {{"--json", request->json}, {"-o", request->output}};
    if (!code)
        code = check_outputs(outputs, 2, request->overwrite, fault);
    if (!code)
        code = check_inputs(outputs, 2, &request->case_path, 1, fault);
    if (!code)
        code = steady_find(unsplit, stepper, column, year + 0.5, &steady, fault);
    if (!code && request->output)
        code = write_record(request, stepper, column, model, year, fault);
    if (!code)
        code = tell(request, unsplit, column, &steady, year, &answer, fault);
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
