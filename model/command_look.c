/* skymend check, skymend answers, skymend sunlight: looking without running. */
#include <getopt.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "answers.h"
#include "commands.h"
#include "light.h"

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

/* All three verbs take one file, at most one number and one flag. */
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
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, look->operand, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
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
    }
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

/* ---- sunlight ---- */

/* light: day means; NULL: rate [photolysis][padded] of one sun. */
static void print_sunlight(const Model *model, const Column *column, const Light *light, const double *rate,
                           const Look *look)
{
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded, photolysis = mechanism->surface_first - mechanism->photolysis_first;
    printf("# quantity: photolysis rates\n# unit: altitude_km km; the rest s-1\n");
    if (look->given)
        printf("# sun: cosine of the zenith angle at the ground %g, 1 au\n", look->number);
    else
        printf("# sun: mean over 24 h of the %s sun of the case\n",
               model->settings.sun == SUN_GLOBAL ? "global" : "latitude's");
    printf("# state: the case's initial profiles, ozone column %.1f DU, surface albedo %g\n",
           column_ozone_du(model, column->x), model->settings.surface_albedo);
    printf("altitude_km");
    for (int r = 0; r < photolysis; r++)
        printf(",%s", mechanism->reaction[mechanism->photolysis_first + r].id);
    printf("\n");
    for (int l = 0; l < model->grid.layers; l++) {
        printf("%g", 1e-5 * model->grid.middle[l]);
        for (int r = 0; r < photolysis; r++)
            printf(",%.4e", light ? light_mean_rate(light, r, l) : rate[FIELD(padded, r, l)]);
        printf("\n");
    }
}

/* Rates under one sun. */
static int one_sun(const Model *model, const Column *column, double cosine, double **rate, Fault *fault)
{
    int padded = model->grid.padded, layers = model->grid.layers;
    size_t field =
        (size_t)(model->mechanism->surface_first - model->mechanism->photolysis_first) * (size_t)padded;
    double *edge_km = malloc(((size_t)layers + 1) * sizeof(double)),
           *density = calloc(3 * (size_t)padded, sizeof(double));
    Photolysis *photolysis = NULL;
    *rate = calloc(field, sizeof(double));
    int code = *rate && edge_km && density ? 0 : fault_memory(fault, "photolysis rates");
    if (!code) {
        static const char *const absorber[] = {"O3", "NO2", "NO"};
        for (int i = 0; i <= layers; i++)
            edge_km[i] = 1e-5 * model->grid.edge[i];
        for (int a = 0; a < 3; a++) {
            int s = mechanism_solved(model->mechanism, absorber[a]);
            for (int l = 0; s >= 0 && l < padded; l++)
                density[a * padded + l] = column->x[FIELD(padded, s, l)] * model->air.number_density[l];
        }
        code =
            photolysis_make(&photolysis, model->mechanism, model->spectra, layers, padded, edge_km,
                            model->air.temperature, model->air.number_density, model->grid.depth,
                            model->air.column_above_top, &cosine, 1, model->settings.surface_albedo, fault);
    }
    if (!code)
        photolysis_rates(photolysis, density, density + padded, density + 2 * padded, 1.0, *rate);
    photolysis_free(photolysis);
    free(edge_km);
    free(density);
    return code;
}

static int run_sunlight(const Look *look, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Light *light = NULL;
    double *rate = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, look->operand, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && look->given)
        code = one_sun(model, column, look->number, &rate, fault);
    if (!code && !look->given)
        code = light_make(&light, model, 1, fault);
    if (!code && light)
        light_refresh(light, column->x, NULL);
    if (!code)
        print_sunlight(model, column, light, rate, look);
    free(rate);
    light_free(light);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_sunlight(int argc, char **argv)
{
    Look look = {
        .verb = "sunlight",
        .number_option = "cosine",
        .low = -0.2,
        .high = 1.0,
        .usage =
            "usage: skymend sunlight [CASE.cfg] [--cosine C]\n\n"
            "Photolysis rates by altitude for a case's initial profiles and sun, as CSV on standard output.\n"
            "Clear-sky planning figures; no guide to personal exposure.\n\n"
            "      --cosine C  one sun at this cosine of the zenith angle (-0.2 to 1; below 0 it is under\n"
            "                  the horizon) instead of the mean over the day\n"
            "  -h, --help      this text\n"};
    Fault fault = {0};
    int code = read_look(&look, argc, argv, &fault);
    if (!code && !look.help)
        code = run_sunlight(&look, &fault);
    return code ? report_fault(&fault) : 0;
}
