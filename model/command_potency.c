/* skymend potency: the ozone depletion potentials of the gases of a case. */
#include <getopt.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "commands.h"
#include "potency_text.h"
#include "progress.h"

typedef struct {
    const char *case_path, *csv, *json, *reference;
    int year_given, year, adjoint, overwrite, quiet, threads, help;
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend potency [CASE.cfg] [--year Y] [options]\n\n"
        "Ozone depletion potentials at steady state: what a mass of a gas emitted every year does to the\n"
        "ozone column in the end, over the same of CFC-11; with lifetimes and what takes the gas. For every\n"
        "gas that comes through the ground and holds an element other than C, O and F.\n"
        "Without a case: the built-in baseline.\n\n"
        "      --year Y         year of the schedule (default: the first of the case)\n"
        "      --reference GAS  the gas whose potential is 1 (default CFC-11)\n"
        "      --adjoint        the quick way: diurnal factors do not answer to the gas; potentials differ "
        "by\n"
        "                       a tenth for bromine, a few per cent for chlorine, a third for methane\n"
        "      --csv FILE       the table as CSV\n"
        "      --json FILE      the same as JSON\n"
        "      --overwrite      replace files that are there\n"
        "      --threads N      threads to use (default: OMP_NUM_THREADS or all); results do not depend on "
        "it\n"
        "      --quiet          no progress, no table\n"
        "  -h, --help           this text\n\n"
        "An interrupted run (Ctrl-C) writes nothing.\n");
}

static int take_option(Request *request, int found, Fault *fault)
{
    switch (found) {
    case 'c': request->csv = optarg; break;
    case 'j': request->json = optarg; break;
    case 'r': request->reference = optarg; break;
    case 'a': request->adjoint = 1; break;
    case 'w': request->overwrite = 1; break;
    case 'q': request->quiet = 1; break;
    case 'h': request->help = 1; break;
    case 't': return option_whole("--threads", optarg, 1, 1024, &request->threads, fault);
    case 'y':
        request->year_given = 1;
        return option_whole("--year", optarg, 1750, 2500, &request->year, fault);
    }
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {
        {"year", required_argument, NULL, 'y'}, {"reference", required_argument, NULL, 'r'},
        {"adjoint", no_argument, NULL, 'a'},    {"csv", required_argument, NULL, 'c'},
        {"json", required_argument, NULL, 'j'}, {"overwrite", no_argument, NULL, 'w'},
        {"quiet", no_argument, NULL, 'q'},      {"threads", required_argument, NULL, 't'},
        {"help", no_argument, NULL, 'h'},       {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--year",      "--reference", "--adjoint", "--csv",  "--json",
                                        "--overwrite", "--quiet",     "--threads", "--help", NULL};
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        if (found == ':' || found == '?')
            return option_fault("potency", argv, optind > before ? optind - 1 : before, found, names, fault);
        if (take_option(request, found, fault))
            return fault->code;
        before = optind;
    }
    return request->help ? 0 : one_operand("potency", argc, argv, optind, &request->case_path, fault);
}

static int write_text(const char *path, int overwrite, const PotencyView *view,
                      void (*write)(const PotencyView *, FILE *), Fault *fault)
{
    FILE *out = open_text(path, overwrite, fault);
    if (!out)
        return fault->code;
    write(view, out);
    return close_text(out, path, fault);
}

static int put_out(const Request *request, const PotencyView *view, Fault *fault)
{
    if (request->csv && write_text(request->csv, request->overwrite, view, potency_csv, fault))
        return fault->code;
    if (request->json && write_text(request->json, request->overwrite, view, potency_json, fault))
        return fault->code;
    if (!request->quiet)
        potency_print(view, stdout);
    return 0;
}

static void show_progress(void *context, const Progress *progress)
{
    progress_show(context, progress);
}

/* Settle the column, look beside it, tell. A stop is looked for when the column is settled and then between
 * turns: some seconds at most. */
static int work(const Request *request, const Model *model, int year, Unsplit *unsplit, Stepper *stepper,
                Column *column, Fault *fault)
{
    SteadyReport steady;
    Potencies *potencies = NULL;
    ProgressBar bar;
    const PotencyAsk ask = {.reference = request->reference, .frozen = request->adjoint};
    const Watcher watcher = {.progress = show_progress, .context = &bar, .stop = catch_stop()};
    int code = steady_find(unsplit, stepper, column, year + 0.5, &steady, fault);
    if (code)
        return code;
    progress_open(&bar, request->quiet);
    code = potency_make(&potencies, unsplit, stepper, column, &ask, &watcher, fault);
    progress_close(&bar);
    if (!code) {
        const PotencyView view = {model, potencies, year, unsplit->has_factors};
        code = put_out(request, &view, fault);
    }
    potency_free(potencies);
    return code;
}

static int run(const Request *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Unsplit *unsplit = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    int year = !code && !request->year_given ? settings->first_year : request->year;
    settings->first_year = settings->last_year = year; /* the schedule must cover it */
    const Output outputs[] = {{"--csv", request->csv}, {"--json", request->json}};
    if (!code)
        code = check_outputs(outputs, 2, request->overwrite, fault);
    if (!code)
        code = check_inputs(outputs, 2, &request->case_path, 1, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    if (!code)
        code = stepper_make(&stepper, model, request->threads, fault);
    if (!code)
        code = unsplit_make(&unsplit, model, fault);
    if (!code)
        code = work(request, model, year, unsplit, stepper, column, fault);
    unsplit_free(unsplit);
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_potency(int argc, char **argv)
{
    Request request = {0};
    Fault fault = {0};
    int code = read_request(&request, argc, argv, &fault);
    if (!code && request.help) {
        print_help();
        return 0;
    }
    catch_stop(); /* before any file is begun */
    if (!code)
        code = run(&request, &fault);
    return code ? report_fault(&fault) : 0;
}
