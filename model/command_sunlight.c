/* skymend sunlight: photolysis rates by altitude; with --ultraviolet see command_ultraviolet.c. */
#include <getopt.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "commands.h"
#include "light.h"
#include "moments.h"
#include "record.h"

enum { WHOLE_DAY = -1 };

static const char *const moment_words[MOMENTS + 1] = {"midnight", "sunrise", "noon", "sunset", NULL};

typedef struct {
    const char *case_path, *state_path; /* NULL when not given */
    int help, cosine_given, year_given;
    int moment;                           /* enum Moment or WHOLE_DAY */
    int ultraviolet, spectrum, benchmark; /* benchmark: year, 0 when not given */
    double cosine, year;
} Request;

/* What the rates are computed for. */
typedef struct {
    int dark;
    double cosine, earth_sun;
    char text[160]; /* of the sun, for the head of the table */
} OneSun;

static const char usage[] =
    "usage: skymend sunlight [CASE.cfg] [--moment M | --cosine C] [--state FILE.nc --year Y]\n"
    "       skymend sunlight [CASE.cfg] --ultraviolet [--spectrum | --benchmark Y] [--cosine C]\n"
    "                        [--state FILE.nc --year Y]\n\n"
    "Photolysis rates by altitude as CSV on standard output: the mean over the day of the case's sun, for "
    "the\n"
    "case's initial profiles. Clear-sky planning figures; no guide to personal exposure.\n\n"
    "      --moment M       noon, sunrise, sunset or midnight of the case's sun instead of the mean over the "
    "day;\n"
    "                       at sunrise and sunset the sun stands on the horizon of the ground\n"
    "      --cosine C       one sun at this cosine of the zenith angle (-0.2 to 1; below 0 it is under the\n"
    "                       horizon), at the mean distance of the Earth\n"
    "      --state FILE.nc  ozone, NO and NO2 from this file of skymend project, made with the same layers;\n"
    "                       their means over the year of --year\n"
    "      --year Y         a year of that file\n"
    "      --ultraviolet    instead of photolysis rates what reaches the ground under a clear sky: UV-A, "
    "UV-B, "
    "UV-C,\n"
    "                       erythemal irradiance and UV index at noon, erythemal dose of the day and "
    "amplification\n"
    "                       factor, under the sun of the case's group ultraviolet or that of --cosine\n"
    "      --spectrum       its spectrum at noon instead\n"
    "      --benchmark Y    beside it the same of another year of --state, and the change against it\n"
    "  -h, --help           this text\n";

static int read_moment(const char *text, int *moment, Fault *fault)
{
    for (*moment = 0; *moment < MOMENTS; (*moment)++)
        if (!strcmp(text, moment_words[*moment]))
            return 0;
    const char *near = fault_nearest(text, moment_words, MOMENTS);
    return fault_set(fault, FAULT_INPUT,
                     "--moment: \"%.60s\" is none of noon, sunrise, sunset, midnight%s%s%s", text,
                     near ? "; did you mean " : "; give one of them", near ? near : "", near ? "?" : "");
}

/* What goes with --ultraviolet and what does not. */
static int check_ultraviolet(const Request *request, Fault *fault)
{
    if (!request->ultraviolet && (request->spectrum || request->benchmark))
        return fault_set(fault, FAULT_INPUT, "sunlight: %s goes with --ultraviolet; add that",
                         request->spectrum ? "--spectrum" : "--benchmark");
    if (request->ultraviolet && request->moment != WHOLE_DAY)
        return fault_set(fault, FAULT_INPUT,
                         "sunlight: --ultraviolet is that of noon and of the whole day under the sun of the "
                         "case's group ultraviolet; leave --moment out, or give --cosine");
    if (request->spectrum && request->benchmark)
        return fault_set(fault, FAULT_INPUT, "sunlight: --spectrum has no change; leave --benchmark out");
    if (request->benchmark && !request->state_path)
        return fault_set(fault, FAULT_INPUT,
                         "sunlight: --benchmark is a year of a file; add --state FILE.nc --year Y");
    return 0;
}

static int read_request(Request *request, int argc, char **argv, Fault *fault)
{
    static const struct option options[] = {{"moment", required_argument, NULL, 'm'},
                                            {"cosine", required_argument, NULL, 'c'},
                                            {"state", required_argument, NULL, 's'},
                                            {"year", required_argument, NULL, 'y'},
                                            {"ultraviolet", no_argument, NULL, 'u'},
                                            {"spectrum", no_argument, NULL, 'p'},
                                            {"benchmark", required_argument, NULL, 'b'},
                                            {"help", no_argument, NULL, 'h'},
                                            {NULL, 0, NULL, 0}};
    static const char *const names[] = {"--moment",   "--cosine",    "--state", "--year", "--ultraviolet",
                                        "--spectrum", "--benchmark", "--help",  NULL};
    int found, before = 1, code = 0;
    *request = (Request){.moment = WHOLE_DAY};
    opterr = 0;
    optind = 1;
    while (!code && (found = getopt_long(argc, argv, ":h", options, NULL)) != -1) {
        switch (found) {
        case 'h': request->help = 1; break;
        case 'm': code = read_moment(optarg, &request->moment, fault); break;
        case 'c':
            request->cosine_given = 1;
            code = option_number("--cosine", optarg, -0.2, 1.0, &request->cosine, fault);
            break;
        case 's': request->state_path = optarg; break;
        case 'u': request->ultraviolet = 1; break;
        case 'p': request->spectrum = 1; break;
        case 'b': code = option_whole("--benchmark", optarg, 1, 9999, &request->benchmark, fault); break;
        case 'y':
            request->year_given = 1;
            code = option_number("--year", optarg, 1, 9999, &request->year, fault);
            if (!code && request->year != floor(request->year))
                code =
                    fault_set(fault, FAULT_INPUT, "--year: %s is no whole year; give one like 2000", optarg);
            break;
        default:
            return option_fault("sunlight", argv, optind > before ? optind - 1 : before, found, names, fault);
        }
        before = optind;
    }
    if (code || request->help)
        return code;
    if (request->cosine_given && request->moment != WHOLE_DAY)
        return fault_set(fault, FAULT_INPUT,
                         "sunlight: --moment and --cosine both say where the sun stands; "
                         "give one of the two");
    if ((request->state_path != NULL) != request->year_given)
        return fault_set(fault, FAULT_INPUT, "sunlight: --state and --year go together; add %s",
                         request->state_path ? "--year" : "--state FILE.nc");
    if (check_ultraviolet(request, fault))
        return fault->code;
    return one_operand("sunlight", argc, argv, optind, &request->case_path, fault);
}

/* ---- the sun ---- */

static int place_sun(const Settings *settings, const Request *request, OneSun *one, Fault *fault)
{
    Sun sun;
    if (request->cosine_given) {
        *one = (OneSun){.cosine = request->cosine, .earth_sun = 1.0};
        snprintf(one->text, sizeof one->text, "cosine of the zenith angle at the ground %g, 1 au",
                 one->cosine);
        return 0;
    }
    sun_make(&sun, settings, 1);
    const char *whose = settings->sun == SUN_GLOBAL ? "global" : "latitude's",
               *word = moment_words[request->moment];
    double low = sun.rises ? sun.knot[0] : -1.0, high = sun.rises ? sun.knot[SUN_KNOTS - 1] : -1.0;
    *one = (OneSun){.earth_sun = sun.earth_sun};
    if (request->moment == MOMENT_NOON) {
        one->dark = !sun.rises;
        one->cosine = high;
    } else if (request->moment == MOMENT_MIDNIGHT) {
        one->dark = !sun.rises || sun.time[0] > 0.0;
        one->cosine = low;
    } else if (low > 0.0 || high < 0.0) {
        return fault_set(
            fault, FAULT_INPUT,
            "--moment: no %s: the sun stays %s the horizon at latitude %g on day %g; choose noon or "
            "midnight, or another day",
            word, low > 0.0 ? "above" : "below", settings->latitude_deg, settings->day_of_year);
    }
    if (one->dark)
        snprintf(one->text, sizeof one->text, "%s of the %s sun of the case, without light", word, whose);
    else
        snprintf(one->text, sizeof one->text,
                 "%s of the %s sun of the case, cosine of the zenith angle at the ground %.6g, flux %.4f of "
                 "that at "
                 "1 au",
                 word, whose, one->cosine, one->earth_sun);
    return 0;
}

/* Rates under one sun. */
static int one_sun(const Model *model, const Column *column, const OneSun *one, double **rate, Fault *fault)
{
    int padded = model->grid.padded, layers = model->grid.layers;
    size_t field =
        (size_t)(model->mechanism->surface_first - model->mechanism->photolysis_first) * (size_t)padded;
    double *edge_km = malloc(((size_t)layers + 1) * sizeof(double)),
           *density = calloc(3 * (size_t)padded, sizeof(double));
    Photolysis *photolysis = NULL;
    *rate = calloc(field, sizeof(double));
    int code = *rate && edge_km && density ? 0 : fault_memory(fault, "photolysis rates");
    if (!code && !one->dark) {
        static const char *const absorber[] = {"O3", "NO2", "NO"};
        for (int i = 0; i <= layers; i++)
            edge_km[i] = 1e-5 * model->grid.edge[i];
        for (int a = 0; a < 3; a++) {
            int s = mechanism_solved(model->mechanism, absorber[a]);
            for (int l = 0; s >= 0 && l < padded; l++) /* below zero within the tolerance absorbs nothing */
                density[a * padded + l] =
                    fmax(0.0, column->x[FIELD(padded, s, l)]) * model->air.number_density[l];
        }
        code = photolysis_make(&photolysis, model->mechanism, model->spectra, layers, padded, edge_km,
                               model->air.temperature, model->air.number_density, model->grid.depth,
                               model->air.column_above_top, &one->cosine, 1, model->settings.surface_albedo,
                               fault);
    }
    if (!code && !one->dark)
        photolysis_rates(photolysis, density, density + padded, density + 2 * padded, one->earth_sun, *rate);
    photolysis_free(photolysis);
    free(edge_km);
    free(density);
    return code;
}

/* ---- the table ---- */

/* light: day means; NULL: rate [photolysis][padded] of one sun. */
static void print_sunlight(const Model *model, const Column *column, const Light *light, const double *rate,
                           const OneSun *one, const Request *request)
{
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded, photolysis = mechanism->surface_first - mechanism->photolysis_first;
    printf("# quantity: photolysis rates\n# unit: altitude_km km; the rest s-1\n");
    if (light)
        printf("# sun: mean over 24 h of the %s sun of the case\n",
               model->settings.sun == SUN_GLOBAL ? "global" : "latitude's");
    else
        printf("# sun: %s\n", one->text);
    printf("# air: the base atmosphere, temperature.mode or months not applied; sunlight as tabulated\n");
    if (request->state_path)
        printf("# state: mean of %g in %s", request->year, request->state_path);
    else
        printf("# state: the case's initial profiles");
    printf(", ozone column %.1f DU, surface albedo %g\n", column_ozone_du(model, column->x),
           model->settings.surface_albedo);
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

static int run(const Request *request, Fault *fault)
{
    static const char *const absorber[] = {"O3", "NO2", "NO"};
    int mean = !request->cosine_given && request->moment == WHOLE_DAY;
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Column *column = NULL;
    Light *light = NULL;
    OneSun one = {0};
    double *rate = NULL;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    if (!code && !mean)
        code = place_sun(settings, request, &one, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = column_make(&column, model, fault);
    if (!code && request->state_path)
        code = record_read(model, request->state_path, (int)request->year, absorber, 3, column->x, fault);
    if (!code && !mean)
        code = one_sun(model, column, &one, &rate, fault);
    if (!code && mean)
        code = light_make(&light, model, 1, fault);
    if (!code && light)
        light_refresh(light, column->x, NULL);
    if (!code)
        print_sunlight(model, column, light, rate, &one, request);
    free(rate);
    light_free(light);
    column_free(column);
    model_free(model);
    free(settings);
    return code;
}

int command_sunlight(int argc, char **argv)
{
    Request request;
    Fault fault = {0};
    int code = read_request(&request, argc, argv, &fault);
    if (!code && request.help)
        fputs(usage, stdout);
    else if (!code && request.ultraviolet) {
        const UltravioletRequest asked = {.case_path = request.case_path,
                                          .state_path = request.state_path,
                                          .year = (int)request.year,
                                          .benchmark = request.benchmark,
                                          .cosine = request.cosine_given ? &request.cosine : NULL,
                                          .spectrum = request.spectrum};
        code = sunlight_ultraviolet(&asked, &fault);
    } else if (!code)
        code = run(&request, &fault);
    return code ? report_fault(&fault) : 0;
}
