/* skymend schedule: abundances as emissions, emissions as abundances. */
#include <getopt.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "commands.h"
#include "conversion.h"
#include "emission.h"
#include "potency.h"
#include "progress.h"

#ifndef SKYMEND_VERSION
#define SKYMEND_VERSION "unknown"
#endif

/* Of the emissions above zero: what may be missing below without a word more than one. */
static const double UPTAKE_SHARE = 0.01;

enum Kind { AS_NOTHING, AS_EMISSION, AS_ABUNDANCE };

typedef struct {
    const char *case_path, *output, *gases;
    int as, from, overwrite, quiet, threads, help;
    char command_line[2000];
} Request;

static void print_help(void)
{
    printf(
        "usage: skymend schedule [CASE.cfg] --as emission|abundance -o FILE.csv [options]\n\n"
        "Turns the abundances of a case into emissions, or its emissions into abundances, as this column "
        "has\n"
        "them, and writes a complete schedule. Without a case: the built-in baseline.\n\n"
        "      --as emission     what must be given off each year to keep a gas at its abundances, losses "
        "by\n"
        "                        the column's own chemistry included\n"
        "      --as abundance    what emissions lead to in the lowest layer at mid-year\n"
        "      --from YEAR       emissions begin in this year, abundances stand before it (default: the "
        "second\n"
        "                        year of the case)\n"
        "      --gas G[,G...]    only these gases (default: every one but those of C, O and F alone); "
        "others\n"
        "                        are written as they are\n"
        "  -o, --output FILE.csv the file to write\n"
        "      --overwrite       replace it if it is there\n"
        "      --threads N       threads to use (default: OMP_NUM_THREADS or all); results do not depend "
        "on it\n"
        "      --quiet           no progress, no table\n"
        "  -h, --help            this text\n\n"
        "A gas whose abundance falls faster than this column takes it away would need emissions below zero. "
        "Where those come\n"
        "to less than 1 %% of its emissions they are put at 0, else the gas is left as it is; both are "
        "said.\n"
        "An interrupted run (Ctrl-C) writes nothing.\n");
}

static int take_option(Request *request, int found, Fault *fault)
{
    switch (found) {
    case 'a':
        request->as = !strcmp(optarg, "emission")    ? AS_EMISSION
                      : !strcmp(optarg, "abundance") ? AS_ABUNDANCE
                                                     : AS_NOTHING;
        if (request->as == AS_NOTHING)
            return fault_set(fault, FAULT_INPUT,
                             "--as: \"%.60s\" is neither emission nor abundance; give one", optarg);
        break;
    case 'f': return option_whole("--from", optarg, 1750, 2500, &request->from, fault);
    case 'g': request->gases = optarg; break;
    case 'o': request->output = optarg; break;
    case 'w': request->overwrite = 1; break;
    case 'q': request->quiet = 1; break;
    case 'h': request->help = 1; break;
    case 't': return option_whole("--threads", optarg, 1, 1024, &request->threads, fault);
    }
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"as", required_argument, NULL, 'a'},
                                            {"from", required_argument, NULL, 'f'},
                                            {"gas", required_argument, NULL, 'g'},
                                            {"output", required_argument, NULL, 'o'},
                                            {"overwrite", no_argument, NULL, 'w'},
                                            {"quiet", no_argument, NULL, 'q'},
                                            {"threads", required_argument, NULL, 't'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--as",      "--from",  "--gas",  "--output", "--overwrite",
                                        "--threads", "--quiet", "--help", NULL};
    join_command_line(argc, argv, request->command_line, sizeof request->command_line);
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":o:h", options, NULL)) != -1) {
        if (found == ':' || found == '?')
            return option_fault("schedule", argv, optind > before ? optind - 1 : before, found, names, fault);
        if (take_option(request, found, fault))
            return fault->code;
        before = optind;
    }
    if (request->help)
        return 0;
    if (one_operand("schedule", argc, argv, optind, &request->case_path, fault))
        return fault->code;
    if (request->as == AS_NOTHING)
        return fault_set(fault, FAULT_INPUT,
                         "schedule: say what to turn it into: --as emission or --as abundance");
    if (!request->output)
        return fault_set(fault, FAULT_INPUT, "schedule: no output file named; add -o FILE.csv");
    if (request->as == AS_ABUNDANCE && request->from)
        return fault_set(fault, FAULT_INPUT,
                         "--from says when emissions begin; leave it out with --as abundance");
    return 0;
}

/* ---- which gases ---- */

/* Whether name stands in the comma-separated list. */
static int listed(const char *list, const char *name)
{
    size_t length = strlen(name);
    for (const char *at = list; at; at = strchr(at, ',')) {
        at += *at == ',';
        if (!strncmp(at, name, length) && (at[length] == ',' || at[length] == '\0'))
            return 1;
    }
    return 0;
}

/* Every name of the list must be a gas of the schedule. */
static int check_gases(const Request *request, const Model *model, Fault *fault)
{
    char name[64];
    if (request->gases && !*request->gases)
        return fault_set(fault, FAULT_INPUT, "--gas: no gas is named; name some, such as CFC-11,CFC-12");
    for (const char *at = request->gases; at && *at;) {
        size_t length = strcspn(at, ",");
        snprintf(name, sizeof name, "%.*s", (int)length, at);
        if (schedule_find(&model->schedule, name) < 0) {
            const char **names = malloc((size_t)model->schedule.gases * sizeof *names);
            if (!names)
                return fault_memory(fault, "names of gases");
            for (int g = 0; g < model->schedule.gases; g++)
                names[g] = model->schedule.gas[g];
            const char *near = fault_nearest(name, names, (size_t)model->schedule.gases);
            fault_set(fault, FAULT_INPUT, "--gas: \"%s\" is no gas of the schedule%s%s%s", name,
                      near ? "; did you mean " : "; skymend check lists them", near ? near : "",
                      near ? "?" : "");
            free(names);
            return fault->code;
        }
        at += length + (at[length] == ',');
    }
    return 0;
}

static int first_emission(const Request *request, const Model *model)
{
    return request->from ? request->from : model->settings.first_year + 1;
}

/* 1: of schedule gas g the emission (abundance) is to be written in place of what drives it. FAULT_INPUT when
 * there is none. */
static int choose_gases(const Request *request, const Model *model, int *chosen, int *work, Fault *fault)
{
    int any = 0, count = potency_gases(model, work);
    for (int g = 0; g < model->schedule.gases; g++) {
        int s = mechanism_solved(model->mechanism, model->schedule.gas[g]);
        chosen[g] = 0;
        for (int i = 0; !request->gases && i < count; i++)
            chosen[g] |= work[i] == s;
        if (request->gases)
            chosen[g] = listed(request->gases, model->schedule.gas[g]);
        int emits = model->schedule.emission_from[g];
        if (request->as == AS_EMISSION) /* what emissions drive already stays */
            chosen[g] &= model->schedule.years[g] > 0 && (!emits || emits > first_emission(request, model));
        else
            chosen[g] &= emits > 0;
        any |= chosen[g];
    }
    if (any)
        return 0;
    return fault_set(fault, FAULT_INPUT,
                     "--as %s: no gas%s%s is driven by %s, so there is nothing to turn; "
                     "%s, or turn the other way",
                     request->as == AS_EMISSION ? "emission" : "abundance",
                     request->gases ? " of --gas " : "", request->gases ? request->gases : "",
                     request->as == AS_EMISSION ? "its abundance" : "emissions at the ground",
                     request->gases ? "name other gases" : "give another case");
}

/* ---- writing ---- */

static int aloft(const Model *model)
{
    int any = 0;
    for (int i = 0; i < model->schedule.lines; i++)
        any |= model->schedule.line[i].to_km > 0.0;
    return any;
}

static void put_row(FILE *out, int year, const char *gas, const char *kind, double amount, const char *unit,
                    const char *height, const char *label)
{
    fprintf(out, "%d,%s,%s,%.10g,%s%s,", year, gas, kind, amount, unit, height);
    csv_put_text(out, label);
    fputc('\n', out);
}

/* Lines of emission as the schedule has them; only: those aloft. */
static void put_lines(FILE *out, const Model *model, int g, int only_aloft, int with_height)
{
    const Schedule *schedule = &model->schedule;
    for (int i = 0; i < schedule->lines; i++) {
        const ScheduleLine *line = &schedule->line[i];
        char unit[16], height[64] = "";
        if (line->gas != g || (only_aloft && !(line->to_km > 0.0)))
            continue;
        snprintf(unit, sizeof unit, line->element[0] ? "kt %s" : "kt", line->element);
        if (with_height && line->to_km > 0.0)
            snprintf(height, sizeof height, ",%.10g,%.10g", line->from_km, line->to_km);
        else if (with_height)
            snprintf(height, sizeof height, ",,");
        for (int y = 0; y < line->years; y++)
            put_row(out, line->first_year + y, schedule->gas[g], "emission", 1e-6 * line->amount[y], unit,
                    height, line->label);
    }
}

static void put_gas(FILE *out, const Request *request, const Model *model, const Conversion *conversion,
                    int g, int chosen)
{
    const Schedule *schedule = &model->schedule;
    const char *gas = schedule->gas[g];
    int s = mechanism_solved(model->mechanism, gas), first = conversion->first_year,
        with_height = aloft(model);
    int end = first + conversion->years, from = end;
    const char *none = with_height ? ",," : "";
    if (request->as == AS_EMISSION && chosen)
        from = first_emission(request, model);
    int drives_from = schedule->emission_from[g] ? schedule->emission_from[g] : end;
    for (int year = first; year < end; year++) {
        if (year < from && year < drives_from && schedule->years[g])
            put_row(out, year, gas, "abundance", 1e12 * schedule_abundance(schedule, g, year + 0.5), "ppt",
                    none, "as given");
        else if (request->as == AS_ABUNDANCE && chosen)
            put_row(out, year, gas, "abundance", 1e12 * conversion_abundance(conversion, s, year), "ppt",
                    none, "from emissions");
        else if (request->as == AS_EMISSION && chosen && year < drives_from)
            put_row(out, year, gas, "emission", 1e-6 * conversion_emission(conversion, s, year), "kt", none,
                    "implied by abundance");
    }
    put_lines(out, model, g, request->as == AS_ABUNDANCE && chosen, with_height);
}

static int write_schedule(const Request *request, const Model *model, const Conversion *conversion,
                          const int *chosen, Fault *fault)
{
    FILE *out = open_text(request->output, request->overwrite, fault);
    if (!out)
        return fault->code;
    csv_put_header(out, "title", model->settings.title);
    fprintf(out,
            "# quantity: abundance at mid-year in the lowest layer, emission in the year by the whole Earth\n"
            "# unit: in each row\n# source: computed by skymend %s from the schedule of the case\n"
            "# method: emission = what crosses the ground of the column, %.6g cm2 of Earth; loss by the "
            "column's own chemistry\n",
            SKYMEND_VERSION, emission_area());
    csv_put_header(out, "made by", request->command_line);
    fprintf(out, "year,gas,kind,amount,unit%s,line\n", aloft(model) ? ",from_km,to_km" : "");
    for (int g = 0; g < model->schedule.gases; g++)
        put_gas(out, request, model, conversion, g, chosen[g]);
    return close_text(out, request->output, fault);
}

/* Gases that would need a negative emission: 0 where that is next to nothing, else they stay abundances; said
 * on standard error. */
static void settle_uptake(const Request *request, const Model *model, Conversion *conversion, int *chosen)
{
    int from = first_emission(request, model);
    for (int g = 0; request->as == AS_EMISSION && g < model->schedule.gases; g++) {
        int s = mechanism_solved(model->mechanism, model->schedule.gas[g]);
        Uptake uptake = chosen[g] ? conversion_uptake(conversion, s, from) : (Uptake){0};
        if (!uptake.year)
            continue;
        if (uptake.below <= UPTAKE_SHARE * uptake.above) {
            conversion_lift(conversion, s, from);
            fprintf(stderr,
                    "skymend: remark: %s: emissions below zero are put at 0, %.3g kt in all against %.3g kt "
                    "above "
                    "(first in %d)\n",
                    model->schedule.gas[g], 1e-6 * uptake.below, 1e-6 * uptake.above, uptake.year);
            continue;
        }
        chosen[g] = 0;
        fprintf(stderr,
                "skymend: remark: %s stays an abundance in all years: it falls faster than this column takes "
                "it away, from %d "
                "on by %.3g kt in "
                "all (emissions above zero: %.3g kt)\n",
                model->schedule.gas[g], uptake.year, 1e-6 * uptake.below, 1e-6 * uptake.above);
    }
}

static void print_table(const Request *request, const Model *model, const Conversion *conversion,
                        const int *chosen)
{
    int end = conversion->first_year + conversion->years;
    printf("%s in %s of every tenth year\n\n  year", request->as == AS_EMISSION ? "emission" : "abundance",
           request->as == AS_EMISSION ? "kt" : "ppt");
    for (int g = 0; g < model->schedule.gases; g++)
        if (chosen[g])
            printf(" %11s", model->schedule.gas[g]);
    printf("\n");
    for (int year = conversion->first_year; year < end; year++) {
        if (year % 10 && year != end - 1)
            continue;
        printf("  %4d", year);
        for (int g = 0; g < model->schedule.gases; g++) {
            int s = mechanism_solved(model->mechanism, model->schedule.gas[g]);
            if (chosen[g])
                printf(" %11.5g", request->as == AS_EMISSION
                                      ? 1e-6 * conversion_emission(conversion, s, year)
                                      : 1e12 * conversion_abundance(conversion, s, year));
        }
        printf("\n");
    }
    printf("\nwritten: %s\n", request->output);
}

static void show_progress(void *context, const Progress *progress)
{
    progress_show(context, progress);
}

static int put_out(const Request *request, const Model *model, Stepper *stepper, Column *column, Fault *fault)
{
    Conversion *conversion = NULL;
    ProgressBar bar;
    Watcher watcher = {NULL, show_progress, &bar, catch_stop()};
    int *chosen = calloc((size_t)model->schedule.gases, sizeof(int));
    int *work = calloc((size_t)model->mechanism->solved, sizeof(int));
    int code =
        chosen && work ? check_gases(request, model, fault) : fault_memory(fault, "gases of the schedule");
    if (!code && request->from &&
        (request->from <= model->settings.first_year || request->from > model->settings.last_year))
        code = fault_set(fault, FAULT_INPUT,
                         "--from: %d is not after the first and within the last year of the case, %d to %d",
                         request->from, model->settings.first_year, model->settings.last_year);
    if (!code)
        code = choose_gases(request, model, chosen, work, fault);
    if (!code) {
        progress_open(&bar, request->quiet);
        code = conversion_run(&conversion, model, stepper, column, &watcher, fault);
        progress_close(&bar);
    }
    if (!code) {
        settle_uptake(request, model, conversion, chosen);
        code = write_schedule(request, model, conversion, chosen, fault);
    }
    if (!code && !request->quiet)
        print_table(request, model, conversion, chosen);
    conversion_free(conversion);
    free(chosen);
    free(work);
    return code;
}

static int run(const Request *request, Fault *fault)
{
    const Output output = {"--output", request->output};
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Stepper *stepper = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    if (!code)
        code = check_outputs(&output, 1, request->overwrite, fault);
    if (!code)
        code = check_inputs(&output, 1, &request->case_path, 1, fault);
    if (!code) {
        conversion_settings(settings);
        code = model_make(&model, settings, fault);
    }
    if (!code)
        code =
            check_inputs(&output, 1, (const char *const *)model->schedule.path, model->schedule.files, fault);
    if (!code)
        code = model_check_years(model, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && request->threads)
        omp_set_num_threads(request->threads);
    if (!code)
        code = stepper_make(&stepper, model, request->threads, fault);
    if (!code)
        code = put_out(request, model, stepper, column, fault);
    stepper_free(stepper);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_schedule(int argc, char **argv)
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
