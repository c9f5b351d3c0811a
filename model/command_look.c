/* skymend check: looking without running. */
#include <getopt.h>
#include <stdio.h>
#include <stdlib.h>

#include "column.h"
#include "commands.h"
#include "ultraviolet.h"

typedef struct {
    const char *operand;
    int keys, help;
} Look;

static int read_look(Look *look, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {
        {"help", no_argument, NULL, 'h'}, {"keys", no_argument, NULL, 'k'}, {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--help", "--keys", NULL};
    int found, before = 1;
    opterr = 0;
    optind = 1;
    while ((found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        switch (found) {
        case 'h': look->help = 1; break;
        case 'k': look->keys = 1; break;
        default:
            return option_fault("check", argv, optind > before ? optind - 1 : before, found, names, fault);
        }
        before = optind;
    }
    return look->help ? 0 : one_operand("check", argc, argv, optind, &look->operand, fault);
}

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
        code = model_check_years(model, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code)
        code = ultraviolet_make(&ultraviolet, model, NULL, fault);
    if (!code) {
        const Mechanism *mechanism = model->mechanism;
        settings_print(settings, look->keys, stdout);
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
    Look look = {0};
    Fault fault = {0};
    int code = read_look(&look, argc, argv, &fault);
    if (!code && look.help)
        printf("usage: skymend check [CASE.cfg] [--keys]\n\n"
               "Reads and checks everything a case names and prints the resolved case, itself a valid case "
               "file.\n"
               "Without a case: the built-in baseline. Runs nothing.\n\n"
               "      --keys  with each key's help, unit and range\n"
               "  -h, --help  this text\n");
    else if (!code)
        code = run_check(&look, &fault);
    return code ? report_fault(&fault) : 0;
}
