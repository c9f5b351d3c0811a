/* skymend answers: what finished files say. */
#include <getopt.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "answers.h"
#include "commands.h"

enum { FILE_OWN, FILE_REFERENCE, FILE_FINER, FILE_FINER_REFERENCE, FILES };

typedef struct {
    const char *path[FILES], *csv, *json, *potentials;
    AnswerWish wish;
    double limit_km[SERIES_LIMITS];
    int limits, overwrite, quiet, help;
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend answers FILE.nc [--against REFERENCE.nc] [options]\n\n"
        "Ozone column and its parts, ultraviolet and equivalent chlorine where the file has them: extreme "
        "and its\n"
        "year, change against a benchmark year, year of return, unsmoothed and smoothed, each with its "
        "numerical\n"
        "error; emissions in ODP-tonnes; against a second file the integrated ozone depletion, the delay of "
        "the\n"
        "return and the difference of emissions.\n\n"
        "      --against REF.nc   the case without the emission in question\n"
        "      --benchmark YEAR   default %d\n"
        "      --smooth YEARS     window of the running mean, default %g\n"
        "      --limits KM,KM,KM  tops of troposphere, lower and middle stratosphere; default: tropopause "
        "of the\n"
        "                         file, %g and %g\n"
        "      --finer FILE2.nc   the same case run with finer numerics: errors are the differences from "
        "it;\n"
        "                         without, they are those measured on the baseline\n"
        "      --finer-against R  the same for the reference\n"
        "      --potentials FILE  depletion potentials of your own case, as skymend potency --csv writes "
        "them;\n"
        "                         default: those of the baseline in the data\n"
        "      --csv FILE         a row per answer, with its method\n"
        "      --json FILE        the same as JSON, with the means of calendar years\n"
        "      --overwrite        replace files that are there\n"
        "      --quiet            no table\n"
        "  -h, --help             this text\n",
        ANSWERS_BENCHMARK, ANSWERS_SMOOTH_YEARS, series_limits[0], series_limits[1]);
}

static int read_limits(Request *request, const char *text, Fault *fault)
{
    char copy[100], *at = copy;
    if (strlen(text) >= sizeof copy)
        return fault_set(fault, FAULT_INPUT,
                         "--limits: \"%.20s...\" is too long; give three altitudes, 12,24,32", text);
    strcpy(copy, text);
    for (int l = 0; l < SERIES_LIMITS; l++) {
        char *comma = at ? strchr(at, ',') : NULL;
        if (!at || (comma != NULL) != (l < SERIES_LIMITS - 1))
            return fault_set(fault, FAULT_INPUT,
                             "--limits: \"%s\" is not three altitudes; give three, 12,24,32", text);
        if (comma)
            *comma++ = '\0';
        if (option_number("--limits", at, 0.0, 200.0, &request->limit_km[l], fault))
            return fault->code;
        at = comma;
    }
    request->limits = 1;
    if (!(request->limit_km[0] < request->limit_km[1] && request->limit_km[1] < request->limit_km[2]))
        return fault_set(fault, FAULT_INPUT, "--limits: %s do not increase; give three altitudes, 12,24,32",
                         text);
    return 0;
}

static int take_option(Request *request, int found, Fault *fault)
{
    switch (found) {
    case 'a': request->path[FILE_REFERENCE] = optarg; return 0;
    case 'f': request->path[FILE_FINER] = optarg; return 0;
    case 'F': request->path[FILE_FINER_REFERENCE] = optarg; return 0;
    case 'b': return option_whole("--benchmark", optarg, 1750, 2500, &request->wish.benchmark_year, fault);
    case 's': return option_number("--smooth", optarg, 0.1, 1000.0, &request->wish.smooth_years, fault);
    case 'l': return read_limits(request, optarg, fault);
    case 'p': request->potentials = optarg; return 0;
    case 'c': request->csv = optarg; return 0;
    case 'j': request->json = optarg; return 0;
    case 'w': request->overwrite = 1; return 0;
    case 'q': request->quiet = 1; return 0;
    default: request->help = 1; return 0;
    }
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"against", required_argument, NULL, 'a'},
                                            {"benchmark", required_argument, NULL, 'b'},
                                            {"smooth", required_argument, NULL, 's'},
                                            {"limits", required_argument, NULL, 'l'},
                                            {"finer", required_argument, NULL, 'f'},
                                            {"finer-against", required_argument, NULL, 'F'},
                                            {"potentials", required_argument, NULL, 'p'},
                                            {"csv", required_argument, NULL, 'c'},
                                            {"json", required_argument, NULL, 'j'},
                                            {"overwrite", no_argument, NULL, 'w'},
                                            {"quiet", no_argument, NULL, 'q'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--against", "--benchmark",     "--smooth",     "--limits",
                                        "--finer",   "--finer-against", "--potentials", "--csv",
                                        "--json",    "--overwrite",     "--quiet",      "--help",
                                        NULL};
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        if (found == ':' || found == '?')
            return option_fault("answers", argv, optind > before ? optind - 1 : before, found, names, fault);
        if (take_option(request, found, fault))
            return fault->code;
        before = optind;
    }
    if (request->help || one_operand("answers", argc, argv, optind, &request->path[FILE_OWN], fault))
        return fault->code;
    if (!request->path[FILE_OWN])
        return fault_set(fault, FAULT_INPUT, "answers: no file named; give one made by skymend project");
    if (request->path[FILE_FINER_REFERENCE] && !request->path[FILE_REFERENCE])
        return fault_set(fault, FAULT_INPUT,
                         "--finer-against is for the file of --against, which is not given");
    if (request->path[FILE_REFERENCE] && !request->path[FILE_FINER] != !request->path[FILE_FINER_REFERENCE])
        return fault_set(fault, FAULT_INPUT,
                         "with --against the errors need finer runs of both files: give --finer and "
                         "--finer-against, or neither");
    const Output outputs[] = {{"--csv", request->csv}, {"--json", request->json}};
    const char *inputs[FILES + 1] = {request->potentials};
    memcpy(inputs + 1, request->path, sizeof request->path);
    return check_outputs(outputs, 2, request->overwrite, fault) ||
                   check_inputs(outputs, 2, inputs, FILES + 1, fault)
               ? fault->code
               : 0;
}

int answers_baseline_errors(NumericalErrors *errors, char *source, size_t size, Fault *fault)
{
    char folder[SETTINGS_PATH], path[SETTINGS_PATH + 40];
    if (find_data(folder, sizeof folder, fault))
        return fault->code;
    snprintf(path, sizeof path, "%s/numerical-error.csv", folder);
    snprintf(source, size, "measured on the baseline, not on this file (numerical-error.csv of the data)");
    return errors_read(errors, path, fault);
}

int answers_weights(OdpWeights *weights, const char *potentials, Fault *fault)
{
    char folder[SETTINGS_PATH];
    memset(weights, 0, sizeof *weights);
    return find_data(folder, sizeof folder, fault) ? fault->code
                                                   : weights_read(weights, folder, potentials, fault);
}

/* The answers of a file, and against another where there is one. */
static int compute(Answers *answers, const AnswerWish *wish, const FileSeries *file,
                   const FileSeries *reference, const NumericalErrors *errors, const OdpWeights *weights,
                   Fault *fault)
{
    int code = answers_compute(answers, file, wish, errors, fault);
    if (!code && reference)
        code = answers_against(answers, file, reference, errors, fault);
    return code ? code : answers_emission(answers, file, reference, weights, fault);
}

static int find_errors(Answers *answers, const Request *request, FileSeries *const *series,
                       const OdpWeights *weights, Fault *fault)
{
    Answers finer = {0};
    NumericalErrors unknown;
    errors_unknown(&unknown);
    if (answers_check_finer(series[FILE_OWN], series[FILE_FINER], fault) ||
        (series[FILE_REFERENCE] &&
         answers_check_finer(series[FILE_REFERENCE], series[FILE_FINER_REFERENCE], fault)))
        return fault->code;
    int code = compute(&finer, &request->wish, series[FILE_FINER], series[FILE_FINER_REFERENCE], &unknown,
                       weights, fault);
    if (!code)
        answers_compare(answers, &finer);
    snprintf(answers->error_source, sizeof answers->error_source, "difference from finer numerics, %s",
             request->path[FILE_FINER]);
    answers_free(&finer);
    return code;
}

static int tell(const Answers *answers, const Request *request, const FileSeries *file,
                const FileSeries *reference, Fault *fault)
{
    const struct {
        const char *path;
        void (*write)(const Answers *, const FileSeries *, const FileSeries *, FILE *);
    } files[] = {{request->csv, answers_csv}, {request->json, answers_json}};
    for (size_t f = 0; f < sizeof files / sizeof *files; f++) {
        if (!files[f].path)
            continue;
        FILE *out = open_text(files[f].path, request->overwrite, fault);
        if (!out)
            return fault->code;
        files[f].write(answers, file, reference, out);
        if (close_text(out, files[f].path, fault))
            return fault->code;
    }
    if (!request->quiet)
        answers_print(answers, file, reference, stdout);
    return 0;
}

static int run(const Request *request, Fault *fault)
{
    FileSeries store[FILES] = {{0}}, *series[FILES] = {NULL};
    NumericalErrors errors;
    OdpWeights weights;
    Answers answers = {0};
    char source[sizeof answers.error_source] = "";
    int code = answers_weights(&weights, request->potentials, fault);
    for (int f = 0; f < FILES && !code; f++)
        if (request->path[f]) {
            series[f] = &store[f];
            code =
                series_read(series[f], request->path[f], request->limits ? request->limit_km : NULL, fault);
        }
    errors_unknown(&errors);
    if (!code && !series[FILE_FINER])
        code = answers_baseline_errors(&errors, source, sizeof source, fault);
    if (!code)
        code = compute(&answers, &request->wish, series[FILE_OWN], series[FILE_REFERENCE], &errors, &weights,
                       fault);
    if (!code) {
        memcpy(answers.error_source, source, sizeof source);
        code = series[FILE_FINER] ? find_errors(&answers, request, series, &weights, fault) : 0;
    }
    if (!code)
        code = tell(&answers, request, series[FILE_OWN], series[FILE_REFERENCE], fault);
    answers_free(&answers);
    weights_free(&weights);
    for (int f = 0; f < FILES; f++)
        series_free(&store[f]);
    return code;
}

int answers_of_run(const char *path, const NumericalErrors *errors, const char *source,
                   const OdpWeights *weights, int print, Fault *fault)
{
    const AnswerWish wish = {ANSWERS_BENCHMARK, ANSWERS_SMOOTH_YEARS};
    FileSeries series = {0};
    Answers answers = {0};
    int code = series_read(&series, path, NULL, fault);
    if (!code)
        code = compute(&answers, &wish, &series, NULL, errors, weights, fault);
    if (!code) {
        snprintf(answers.error_source, sizeof answers.error_source, "%s", source);
        code = answers_store(&answers, path, fault);
    }
    if (!code && print)
        answers_print(&answers, &series, NULL, stdout);
    answers_free(&answers);
    series_free(&series);
    return code;
}

int command_answers(int argc, char **argv)
{
    Request request = {.wish = {ANSWERS_BENCHMARK, ANSWERS_SMOOTH_YEARS}};
    Fault fault = {0};
    int code = read_request(&request, argc, argv, &fault);
    if (!code && request.help)
        print_help();
    else if (!code)
        code = run(&request, &fault);
    return code ? report_fault(&fault) : 0;
}
