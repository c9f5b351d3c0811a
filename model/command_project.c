/* skymend project: run a case through its years. */
#include <getopt.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "commands.h"
#include "equivalent_chlorine.h"
#include "progress.h"
#include "projection.h"

typedef struct {
    const char *case_path, *output;
    int overwrite, quiet, threads, help;
    char command_line[2000];
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend project [CASE.cfg] -o FILE.nc [options]\n\n"
        "Carries the column of a case through its years and writes a CF NetCDF file; then prints the\n"
        "table of answers. Without a case: the built-in baseline, 1955 to 2100.\n\n"
        "  -o, --output FILE.nc  the file to write\n"
        "      --overwrite       replace FILE.nc if it is there\n"
        "      --threads N       threads to use (default: OMP_NUM_THREADS or all); results do not depend on "
        "it\n"
        "      --quiet           no progress, no table\n"
        "  -h, --help            this text\n\n"
        "An interrupted run (Ctrl-C) leaves FILE.nc with every finished interval in it; before the first is\n"
        "finished there is no file.\n");
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {
        {"output", required_argument, NULL, 'o'}, {"overwrite", no_argument, NULL, 'w'},
        {"quiet", no_argument, NULL, 'q'},        {"threads", required_argument, NULL, 't'},
        {"help", no_argument, NULL, 'h'},         {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--output", "--overwrite", "--quiet", "--threads", "--help", NULL};
    join_command_line(argc, argv, request->command_line, sizeof request->command_line);
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":o:h", options, NULL)) != -1) {
        double value;
        switch (found) {
        case 'o': request->output = optarg; break;
        case 'w': request->overwrite = 1; break;
        case 'q': request->quiet = 1; break;
        case 'h': request->help = 1; break;
        case 't':
            if (option_number("--threads", optarg, 1, 1024, &value, fault))
                return fault->code;
            request->threads = (int)value;
            if (request->threads != value)
                return fault_set(fault, FAULT_INPUT, "--threads: %s is no whole number; give 1, 2, 3, ...",
                                 optarg);
            break;
        default:
            return option_fault("project", argv, optind > before ? optind - 1 : before, found, names, fault);
        }
        before = optind;
    }
    if (request->help)
        return 0;
    int code = one_operand("project", argc, argv, optind, &request->case_path, fault);
    if (!code && !request->output)
        code = fault_set(fault, FAULT_INPUT, "project: no output file named; add -o FILE.nc");
    return code;
}

typedef struct {
    Archive *archive;
    ProgressBar bar;
} Outlets;

static int write_record(void *context, const Record *record, Fault *fault)
{
    return archive_append(((Outlets *)context)->archive, record, fault);
}

static void show_progress(void *context, const Progress *progress)
{
    progress_show(&((Outlets *)context)->bar, progress);
}

static void print_summary(const Model *model, const Column *column)
{
    const SolverCounts *counts = &column->counts;
    printf("chemistry: %ld solver steps, %ld rejected; values below zero at ends of calls: %ld, the lowest "
           "%.2g cm-3 "
           "(absolute tolerance %g)\n",
           counts->steps, counts->rejections, counts->negatives, counts->most_negative,
           model->settings.absolute_tolerance_cm3);
    printf("refreshes: photolysis rates %ld, diurnal factors %ld (%ld from a day that did not repeat)\n",
           column->photolysis_refreshes, column->factor_refreshes, column->unsettled);
    static const char *const elements[] = {"Cl", "Br", "N", "H"};
    printf("atoms unaccounted for, relative:");
    for (int i = 0; i < 4; i++) {
        int element = mechanism_element(model->mechanism, elements[i]);
        if (element >= 0)
            printf(" %s %.1e", elements[i], column_closure(model, column, element));
    }
    printf("\n");
}

static int run(const Request *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Outlets outlets = {0};
    ReleaseTable release = {0};
    NumericalErrors errors;
    OdpWeights weights = {0};
    char source[200];
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    if (!code) /* now, not after the run */
        code = answers_baseline_errors(&errors, source, sizeof source, fault);
    if (!code)
        code = answers_weights(&weights, NULL, fault);
    if (!code)
        code = release_find_and_read(&release, settings->data_dir, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = model_check_years(model, fault);
    if (!code && !request->quiet)
        remark_takeovers(model);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    if (!code)
        code = stepper_make(&stepper, model, request->threads, fault);
    if (!code)
        code = check_inputs(&(const Output){"--output", request->output}, 1, &request->case_path, 1, fault);
    if (!code)
        code = archive_create(&outlets.archive, model, request->output, request->overwrite,
                              request->command_line, fault);
    if (!code) {
        Watcher watcher = {write_record, show_progress, &outlets, catch_stop()};
        progress_open(&outlets.bar, request->quiet);
        code = projection_run(model, stepper, column, &watcher, fault);
        progress_close(&outlets.bar);
        if (code)
            archive_abandon(outlets.archive);
        else
            code = archive_close(outlets.archive, column, fault);
    }
    if (!code)
        code = chlorine_store(request->output, &release, fault);
    if (!code)
        code = answers_of_run(request->output, &errors, source, &weights, !request->quiet, fault);
    if (!code && !request->quiet) {
        printf("\n");
        print_summary(model, column);
        printf("written: %s\n", request->output);
    }
    weights_free(&weights);
    release_free(&release);
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_project(int argc, char **argv)
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
