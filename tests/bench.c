/* bench: how long the baseline projection takes on this machine.
 *
 *     build/tests/bench [--csv FILE] [--threads N] [--repeat N]       (make bench)
 *
 * Runs the built-in baseline with its settled start, without writing its file, --repeat times (default 3) and
 * reports each run and the fastest: what disturbs a run only ever makes it slower. A cell-step is one
 * accepted solver step of one layer of the multi-year chemistry; the steps within explicit days for the
 * diurnal factors are not counted by the stepper, so the rate is given over the time of the chemistry as well
 * as over the whole run. Runs from the repository root; SKYMEND_DATA names the data folder (default
 * input/data).
 */
#define _DEFAULT_SOURCE /* getrusage */
#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <time.h>

#include "../chem/rosenbrock.h"
#include "../input/constants.h"
#include "../model/projection.h"

#define REPEATS 32
#ifdef __clang__
#define COMPILER __VERSION__ /* names itself */
#else
#define COMPILER "gcc " __VERSION__
#endif

typedef struct {
    const char *csv;
    int threads, repeats;
} Request;

typedef struct {
    double start_up, run; /* wall, s */
    StepClock part;
    long steps, rejections, outer_steps, days;
    double column_1980, column_last; /* DU: that the run was a run */
} Timing;

typedef struct {
    int layers, years, species, reactions, threads;
    char processor[128], date[32];
    double peak_mb;
} Setting;

/* ---- the machine ---- */

/* First "model name" of /proc/cpuinfo; "unknown" where there is none. */
static void name_processor(char *name, size_t size)
{
    char line[512];
    FILE *in = fopen("/proc/cpuinfo", "r");
    snprintf(name, size, "unknown");
    while (in && fgets(line, sizeof line, in)) {
        char *colon = strchr(line, ':');
        if (strncmp(line, "model name", 10) || !colon)
            continue;
        colon += 1 + strspn(colon + 1, " \t");
        colon[strcspn(colon, "\n")] = '\0';
        snprintf(name, size, "%s", colon);
        break;
    }
    if (in)
        fclose(in);
}

static double peak_megabytes(void)
{
    struct rusage usage;
    return getrusage(RUSAGE_SELF, &usage) ? NAN : (double)usage.ru_maxrss / 1024.0;
}

/* ---- the run ---- */

typedef struct {
    double column_1980, column_last;
} Columns;

static int note_column(void *context, const Record *record, Fault *fault)
{
    Columns *columns = context;
    (void)fault;
    columns->column_last = record->ozone_column;
    if (floor(record->time) == 1980.0)
        columns->column_1980 = record->ozone_column;
    return 0;
}

static int time_projection(const Settings *settings, Setting *setting, Timing *timing, Fault *fault)
{
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    Columns columns = {NAN, NAN};
    Watcher watcher = {note_column, NULL, &columns, NULL};
    double began = omp_get_wtime();
    int code = model_make(&model, settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code)
        code = stepper_make(&stepper, model, setting->threads, fault);
    timing->start_up = omp_get_wtime() - began;
    double since = omp_get_wtime();
    if (!code)
        code = projection_run(model, stepper, column, &watcher, fault);
    timing->run = omp_get_wtime() - since;
    if (!code) {
        timing->part = stepper_clock(stepper);
        timing->steps = column->counts.steps;
        timing->rejections = column->counts.rejections;
        timing->outer_steps = column->outer_steps;
        timing->days = column->days;
        timing->column_1980 = columns.column_1980;
        timing->column_last = columns.column_last;
        setting->layers = model->grid.layers;
        setting->species = model->mechanism->solved;
        setting->reactions = model->mechanism->reactions;
    }
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    return code;
}

/* ---- the report ---- */

typedef struct {
    FILE *csv; /* or NULL */
} Report;

static void put_text(const Report *report, const char *name, const char *value, const char *unit)
{
    printf("%-42s %s%s%s\n", name, value, unit[0] ? " " : "", unit);
    if (report->csv)
        fprintf(report->csv, "%s,\"%s\",%s\n", name, value, unit);
}

static void put(const Report *report, const char *name, double value, const char *unit)
{
    char text[40];
    snprintf(text, sizeof text, fabs(value) >= 1e5 ? "%.4g" : "%.6g", value);
    put_text(report, name, text, unit);
}

static void print_report(const Report *report, const Setting *setting, const Timing *timing, int repeats,
                         int best)
{
    const Timing *t = &timing[best];
    double sum = t->part.transport + t->part.chemistry + t->part.light + t->part.factors, longest = 0.0;
    /* a solver step is one of a pack, which carries PACK layers, padding of the last pack aside */
    double lanes = PACK * (double)setting->layers / PACK_ROUND(setting->layers);
    for (int i = 0; i < repeats; i++)
        longest = fmax(longest, timing[i].run);
    put_text(report, "date", setting->date, "");
    put_text(report, "processor", setting->processor, "");
    put(report, "threads", setting->threads, "");
    put_text(report, "compiler", COMPILER, "");
    put_text(report, "vector code", solver_variant(), "");
    put(report, "layers", setting->layers, "");
    put(report, "species", setting->species, "");
    put(report, "reactions", setting->reactions, "");
    put(report, "years", setting->years, "");
    put(report, "runs", repeats, "");
    put(report, "start-up", t->start_up, "s");
    put(report, "projection, fastest run", t->run, "s");
    put(report, "projection, slowest run", longest, "s");
    put(report, "outer steps", (double)t->outer_steps, "");
    put(report, "explicit days of a pack", (double)t->days, "");
    put(report, "solver steps of a pack", (double)t->steps, "");
    put(report, "solver steps tried and rejected", (double)t->rejections, "");
    put(report, "cell-steps", (double)t->steps * lanes, "");
    put(report, "cell-steps per second of the run", (double)t->steps * lanes / t->run, "s-1");
    put(report, "cell-steps per second of chemistry", (double)t->steps * lanes / t->part.chemistry, "s-1");
    put(report, "share of chemistry", 100.0 * t->part.chemistry / t->run, "%");
    put(report, "share of diurnal factors", 100.0 * t->part.factors / t->run, "%");
    put(report, "share of sunlight", 100.0 * t->part.light / t->run, "%");
    put(report, "share of transport", 100.0 * t->part.transport / t->run, "%");
    put(report, "share of the rest, with the settled start", 100.0 * (1.0 - sum / t->run), "%");
    put(report, "peak resident memory", setting->peak_mb, "MB");
    put(report, "ozone column 1980", t->column_1980, "DU");
    put(report, "ozone column, last year", t->column_last, "DU");
}

/* ---- the request ---- */

static int read_count(const char *option, const char *text, int most, int *value, Fault *fault)
{
    char *end;
    long number = strtol(text, &end, 10);
    if (end == text || *end || number < 1 || number > most)
        return fault_set(fault, FAULT_INPUT, "%s: \"%s\" is no whole number from 1 to %d", option, text,
                         most);
    *value = (int)number;
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    for (int i = 1; i < argc; i++) {
        if (!strcmp(argv[i], "--csv") && i + 1 < argc)
            request->csv = argv[++i];
        else if (!strcmp(argv[i], "--threads") && i + 1 < argc)
            read_count("--threads", argv[++i], 1024, &request->threads, fault);
        else if (!strcmp(argv[i], "--repeat") && i + 1 < argc)
            read_count("--repeat", argv[++i], REPEATS, &request->repeats, fault);
        else
            fault_set(fault, FAULT_INPUT,
                      "unknown option %s; usage: bench [--csv FILE] [--threads N] [--repeat N]", argv[i]);
    }
    return fault->code;
}

static int bench(const Request *request, Fault *fault)
{
    Timing timing[REPEATS] = {{0}};
    Setting setting = {.threads = request->threads > 0 ? request->threads : omp_get_max_threads()};
    const char *data = getenv("SKYMEND_DATA");
    time_t now = time(NULL);
    int best = 0;
    Settings *settings = malloc(sizeof *settings);
    if (!settings)
        return fault_memory(fault, "settings");
    settings_default(settings, data && data[0] ? data : "input/data");
    setting.years = settings->last_year - settings->first_year + 1;
    name_processor(setting.processor, sizeof setting.processor);
    strftime(setting.date, sizeof setting.date, "%Y-%m-%dT%H:%M:%SZ", gmtime(&now));
    omp_set_num_threads(setting.threads);
    for (int i = 0; !fault->code && i < request->repeats; i++) {
        if (time_projection(settings, &setting, &timing[i], fault))
            break;
        fprintf(stderr, "bench: run %d of %d: %.2f s\n", i + 1, request->repeats, timing[i].run);
        if (timing[i].run < timing[best].run)
            best = i;
    }
    free(settings);
    if (fault->code)
        return fault->code;
    setting.peak_mb = peak_megabytes();
    Report report = {request->csv ? fopen(request->csv, "w") : NULL};
    if (request->csv && !report.csv)
        return fault_set(fault, FAULT_OUTPUT, "%s: cannot be written", request->csv);
    if (report.csv)
        fprintf(report.csv, "quantity,value,unit\n");
    print_report(&report, &setting, timing, request->repeats, best);
    int bad = report.csv && ferror(report.csv);
    if (report.csv && (fclose(report.csv) || bad))
        return fault_set(fault, FAULT_OUTPUT, "%s: could not be written to its end", request->csv);
    return 0;
}

int main(int argc, char **argv)
{
    Request request = {NULL, 0, 3};
    Fault fault = {0};
    if (read_request(&request, argc, argv, &fault) || bench(&request, &fault)) {
        fprintf(stderr, "bench: %s\n", fault.text);
        return fault.code;
    }
    return 0;
}
