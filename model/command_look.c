/* skymend check, skymend answers: looking without running. */
#include <getopt.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "answers.h"
#include "column.h"
#include "commands.h"
#include "ultraviolet.h"

typedef struct {
    const char *verb;
    const char *usage;
    const char *operand;
    const char *number_option; /* long option that takes a number, NULL for none */
    double low, high;
    const char *flag_option; /* NULL for none */
    int given, flag, help;
    double number;
} Look;

/* Both verbs take one file, at most one number and one flag. */
static int read_look(Look *look, int argc, char **argv, Fault *fault)
{
    struct option options[4] = {{"help", no_argument, NULL, 'h'}};
    char text[2][40];
    const char *names[4] = {"--help"};
    int count = 1;
    if (look->number_option) {
        options[count] = (struct option){look->number_option, required_argument, NULL, 'n'};
        snprintf(text[0], sizeof text[0], "--%s", look->number_option);
        names[count++] = text[0];
    }
    if (look->flag_option) {
        options[count] = (struct option){look->flag_option, no_argument, NULL, 'f'};
        snprintf(text[1], sizeof text[1], "--%s", look->flag_option);
        names[count++] = text[1];
    }
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        switch (found) {
        case 'h': look->help = 1; break;
        case 'f': look->flag = 1; break;
        case 'n':
            if (option_number(text[0], optarg, look->low, look->high, &look->number, fault))
                return fault->code;
            look->given = 1;
            break;
        default:
            return option_fault(look->verb, argv, optind > before ? optind - 1 : before, found, names, fault);
        }
        before = optind;
    }
    if (look->help) {
        fputs(look->usage, stdout);
        return 0;
    }
    return one_operand(look->verb, argc, argv, optind, &look->operand, fault);
}

/* ---- check ---- */

static int run_check(const Look *look, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Ultraviolet *ultraviolet = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, look->operand, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = model_check_start(model, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code)
        code = ultraviolet_make(&ultraviolet, model, NULL, fault);
    if (!code) {
        const Mechanism *mechanism = model->mechanism;
        settings_print(settings, look->flag, stdout);
        printf("\n// in order: %d layers to %.1f km; %d active species, %d thermal reactions, %d photolysis "
               "channels, %d surface "
               "reactions, all balanced;\n// %d wavelength bins; %d gases by year; first state %.1f DU\n",
               model->grid.layers, 1e-5 * model->grid.edge[model->grid.layers], mechanism->solved,
               mechanism->photolysis_first, mechanism->surface_first - mechanism->photolysis_first,
               mechanism->washout_first - mechanism->surface_first, model->spectra->bins,
               model->schedule.gases, column_ozone_du(model, column->x));
        schedule_print(&model->schedule, "// ", stdout);
    }
    ultraviolet_free(ultraviolet);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_check(int argc, char **argv)
{
    Look look = {.verb = "check",
                 .flag_option = "keys",
                 .usage = "usage: skymend check [CASE.cfg] [--keys]\n\n"
                          "Reads and checks everything a case names and prints the resolved case, itself a "
                          "valid case file.\n"
                          "Without a case: the built-in baseline. Runs nothing.\n\n"
                          "      --keys  with each key's help, unit and range\n"
                          "  -h, --help  this text\n"};
    Fault fault = {0};
    int code = read_look(&look, argc, argv, &fault);
    if (!code && !look.help)
        code = run_check(&look, &fault);
    return code ? report_fault(&fault) : 0;
}

/* ---- answers ---- */

static int run_answers(const Look *look, Fault *fault)
{
    ColumnSeries series = {0};
    Answers answers;
    if (!look->operand)
        return fault_set(fault, FAULT_INPUT, "answers: no file named; give one made by skymend project");
    int code = series_read(&series, look->operand, fault);
    if (!code)
        code = answers_compute(&answers, &series, look->given ? (int)look->number : 1980, fault);
    if (!code)
        answers_print(&answers, &series, stdout);
    series_free(&series);
    return code;
}

int command_answers(int argc, char **argv)
{
    Look look = {.verb = "answers",
                 .number_option = "benchmark",
                 .low = 1750,
                 .high = 2500,
                 .usage = "usage: skymend answers FILE.nc [--benchmark YEAR]\n\n"
                          "Lowest column and its year, year of return to the column of the benchmark year, "
                          "column by decade.\n\n"
                          "      --benchmark YEAR  default 1980\n"
                          "  -h, --help            this text\n"};
    Fault fault = {0};
    int code = read_look(&look, argc, argv, &fault);
    if (!code && !look.help && look.given && look.number != floor(look.number))
        code = fault_set(&fault, FAULT_INPUT, "--benchmark: %g is no whole year; give one like 1980",
                         look.number);
    if (!code && !look.help)
        code = run_answers(&look, &fault);
    return code ? report_fault(&fault) : 0;
}
