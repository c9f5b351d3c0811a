/* skymend apportion: which line of a schedule costs how much ozone and how many months. */
#include <getopt.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "apportion_text.h"
#include "commands.h"
#include "progress.h"

enum { KEEP_MOST = 32 };

typedef struct {
    const char *case_path, *csv, *json;
    int by, benchmark, quick, no_errors, overwrite, quiet, threads, help;
    double percent;
    const char *keep[KEEP_MOST];
    int keeps;
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend apportion [CASE.cfg] [options]\n\n"
        "For every line of emission in the schedule of a case: the column-years of ozone it costs and the "
        "months by\n"
        "which it delays the return, from runs without it; and how far the lines' sum is from the run "
        "without all\n"
        "of them. Gases driven by their abundance are not taken apart.\n\n"
        "      --by line|gas|both  lines of one label together (default), of one gas, or of one label and "
        "gas\n"
        "      --keep LABEL        leave the lines of this label in every run; may be given several times, "
        "as for the\n"
        "                          emissions that skymend schedule found implied by abundances\n"
        "      --benchmark YEAR    year whose column is to return (default 1980)\n"
        "      --part PERCENT      take away only this much of each item and divide by it (default 100); "
        "near 1 the\n"
        "                          effects are derivatives and add up\n"
        "      --quick             no runs without lines: by the derivative of the settled column, for all "
        "time\n"
        "      --no-error          leave out the coarse runs that give the numerical errors; a third less "
        "time\n"
        "      --csv FILE          the table as CSV\n"
        "      --json FILE         the same as JSON, with the yearly columns of every run\n"
        "      --overwrite         replace files that are there\n"
        "      --threads N         threads to use (default: OMP_NUM_THREADS or all); results do not depend "
        "on it\n"
        "      --quiet             no progress, no table\n"
        "  -h, --help              this text\n\n"
        "An interrupted run (Ctrl-C) writes nothing.\n");
}

static int take_by(Request *request, Fault *fault)
{
    static const char *const names[] = {"line", "gas", "both"};
    for (int i = 0; i < 3; i++)
        if (!strcmp(optarg, names[i])) {
            request->by = i;
            return 0;
        }
    return fault_set(fault, FAULT_INPUT, "--by: \"%.60s\" is none of line, gas and both; give one", optarg);
}

static int take_option(Request *request, int found, Fault *fault)
{
    switch (found) {
    case 'b': return take_by(request, fault);
    case 'y': return option_whole("--benchmark", optarg, 1750, 2500, &request->benchmark, fault);
    case 'p': return option_number("--part", optarg, 1e-4, 100.0, &request->percent, fault);
    case 'k': request->quick = 1; break;
    case 'n': request->no_errors = 1; break;
    case 'l':
        if (request->keeps == KEEP_MOST)
            return fault_set(fault, FAULT_INPUT, "--keep: given more than %d times", KEEP_MOST);
        request->keep[request->keeps++] = optarg;
        break;
    case 'c': request->csv = optarg; break;
    case 'j': request->json = optarg; break;
    case 'w': request->overwrite = 1; break;
    case 'q': request->quiet = 1; break;
    case 'h': request->help = 1; break;
    case 't': return option_whole("--threads", optarg, 1, 1024, &request->threads, fault);
    }
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"by", required_argument, NULL, 'b'},
                                            {"benchmark", required_argument, NULL, 'y'},
                                            {"part", required_argument, NULL, 'p'},
                                            {"no-error", no_argument, NULL, 'n'},
                                            {"quick", no_argument, NULL, 'k'},
                                            {"csv", required_argument, NULL, 'c'},
                                            {"json", required_argument, NULL, 'j'},
                                            {"overwrite", no_argument, NULL, 'w'},
                                            {"quiet", no_argument, NULL, 'q'},
                                            {"threads", required_argument, NULL, 't'},
                                            {"keep", required_argument, NULL, 'l'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--by",   "--benchmark", "--part",      "--no-error", "--quick",
                                        "--csv",  "--json",      "--overwrite", "--quiet",    "--threads",
                                        "--keep", "--help",      NULL};
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        if (found == ':' || found == '?')
            return option_fault("apportion", argv, optind > before ? optind - 1 : before, found, names,
                                fault);
        if (take_option(request, found, fault))
            return fault->code;
        before = optind;
    }
    if (!request->help && request->quick && (request->no_errors || request->percent < 100.0))
        return fault_set(fault, FAULT_INPUT, "--quick makes no runs without lines; leave out --%s",
                         request->no_errors ? "no-error" : "part");
    return request->help ? 0 : one_operand("apportion", argc, argv, optind, &request->case_path, fault);
}

static int write_text(const char *path, int overwrite, const ApportionView *view,
                      void (*write)(const ApportionView *, FILE *), Fault *fault)
{
    FILE *out = open_text(path, overwrite, fault);
    if (!out)
        return fault->code;
    write(view, out);
    return close_text(out, path, fault);
}

static int put_out(const Request *request, const ApportionView *view, Fault *fault)
{
    if (request->csv && write_text(request->csv, request->overwrite, view, apportion_csv, fault))
        return fault->code;
    if (request->json && write_text(request->json, request->overwrite, view, apportion_json, fault))
        return fault->code;
    if (!request->quiet)
        apportion_print(view, stdout);
    return 0;
}

static void show_progress(void *context, const Progress *progress)
{
    progress_show(context, progress);
}

static int work(const Request *request, const Model *model, Fault *fault)
{
    Apportionment *apportionment = NULL;
    ProgressBar bar;
    const Watcher watcher = {.progress = show_progress, .context = &bar, .stop = catch_stop()};
    const ApportionAsk ask = {.by = request->by,
                              .benchmark_year = request->benchmark,
                              .threads = request->threads,
                              .share = 0.01 * request->percent,
                              .errors = !request->no_errors,
                              .keep = request->keep,
                              .keeps = request->keeps};
    if (apportion_check(model, &ask, fault))
        return fault->code;
    if (!request->quiet)
        remark_takeovers(model);
    progress_open(&bar, request->quiet);
    int code = request->quick ? apportion_quick(&apportionment, model, &ask, &watcher, fault)
                              : apportion_make(&apportionment, model, &ask, &watcher, fault);
    progress_close(&bar);
    if (!code) {
        const ApportionView view = {model, apportionment};
        code = put_out(request, &view, fault);
    }
    apportion_free(apportionment);
    return code;
}

static int run(const Request *request, Fault *fault)
{
    const Output outputs[] = {{"--csv", request->csv}, {"--json", request->json}};
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    if (!code)
        code = check_outputs(outputs, 2, request->overwrite, fault);
    if (!code)
        code = check_inputs(outputs, 2, &request->case_path, 1, fault);
    if (!code)
        settings->moments = MOMENTS_NONE;
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    omp_set_max_active_levels(1); /* a run is one thread's, whatever it uses */
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code =
            check_inputs(outputs, 2, (const char *const *)model->schedule.path, model->schedule.files, fault);
    if (!code)
        code = model_check_years(model, fault);
    if (!code)
        code = work(request, model, fault);
    model_free(model);
    free(settings);
    return code;
}

int command_apportion(int argc, char **argv)
{
    Request request = {.benchmark = 1980, .percent = 100.0};
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
