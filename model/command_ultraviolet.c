/* skymend sunlight --ultraviolet: what reaches the ground, for a column and a sun. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "../chem/erythema.h"
#include "commands.h"
#include "record.h"
#include "ultraviolet.h"

/* Of one state. */
typedef struct {
    UltravioletDay day;
    double amplification, column; /* column: DU */
} Look;

static int look_at(const Model *model, Ultraviolet *ultraviolet, const UltravioletRequest *request, int year,
                   Look *look, Fault *fault)
{
    static const char *const absorber[] = {"O3", "NO2"};
    Column *column;
    double change[SETTINGS_MAX_EDGES] = {0};
    if (column_make(&column, model, fault))
        return fault->code;
    if (!request->state_path ||
        (!record_read(model, request->state_path, year, absorber, 2, column->x, fault) &&
         !record_read_change(model, request->state_path, year, change, fault))) {
        look->column = column_ozone_du(model, column->x);
        look->amplification = ultraviolet_amplification(ultraviolet, column->x, change);
        ultraviolet_day(ultraviolet, column->x, change, &look->day);
    }
    column_free(column);
    return fault->code;
}

static void print_head(const Model *model, const UltravioletRequest *request, const Look *now,
                       const Look *benchmark)
{
    const Settings *settings = &model->settings;
    const char *quantity = request->spectrum ? "spectral ultraviolet irradiance" : "ultraviolet irradiance";
    printf("# quantity: downward %s on level ground at sea level under a clear sky without aerosol\n",
           quantity);
    if (request->spectrum)
        printf("# unit: lower_nm, upper_nm nm; above_atmosphere (facing the sun at 1 au), ground W m-2 nm-1; "
               "erythemal_weight 1\n");
    if (request->cosine)
        printf("# sun: cosine of the zenith angle at the ground %g, 1 au\n", *request->cosine);
    else if (now->day.cosine < 0.0)
        printf("# sun: latitude %g, day %g, below the horizon at noon\n", settings->ultraviolet_latitude_deg,
               settings->ultraviolet_day_of_year);
    else
        printf(
            "# sun: noon at latitude %g on day %g, cosine of the zenith angle %.6g, flux %.4f of that at 1 "
            "au\n",
            settings->ultraviolet_latitude_deg, settings->ultraviolet_day_of_year, now->day.cosine,
            now->day.earth_sun);
    printf("# air: %s; sunlight as tabulated\n", request->state_path
                                                     ? "temperature of the state"
                                                     : "the base atmosphere, temperature.mode or months not "
                                                       "applied");
    if (request->state_path)
        printf("# state: mean of %d in %s, ozone column %.1f DU", request->year, request->state_path,
               now->column);
    else
        printf("# state: the case's initial profiles, ozone column %.1f DU", now->column);
    if (benchmark)
        printf("; benchmark: mean of %d, ozone column %.1f DU", request->benchmark, benchmark->column);
    printf("\n# ground: albedo %g\n", settings->ultraviolet_albedo);
    printf(
        "# bands: UV-C 120 to 280 nm, UV-B 280 to %d nm, UV-A %d to 400 nm (%s); above the atmosphere facing "
        "the sun "
        "at 1 au\n",
        settings->uvb_limit_nm, settings->uvb_limit_nm,
        settings->uvb_limit_nm == 315 ? "ISO 21348" : "limit of 320 nm in place of 315");
    printf("# erythema: action spectrum of ISO/CIE 17166:2019; UV index 40 m2 W-1 times the erythemal "
           "irradiance\n");
    printf("# caution: %s\n", ultraviolet_caution);
}

/* A number as a cell, empty when there is none. */
static void print_cell(double value)
{
    if (isfinite(value))
        printf(",%.6g", value);
    else
        printf(",");
}

static void print_row(const char *name, const char *suffix, const char *unit, double now, double before,
                      int compare)
{
    printf("%s%s,%s", name, suffix, unit);
    print_cell(now);
    if (compare) {
        print_cell(before);
        print_cell(before > 0.0 ? 100.0 * (now / before - 1.0) : NAN);
    }
    printf("\n");
}

/* benchmark NULL: not asked for. */
static void print_table(const Ultraviolet *ultraviolet, const UltravioletRequest *request, const Look *now,
                        const Look *benchmark)
{
    static const char *const band[UV_BANDS] = {"uvc", "uvb", "uva"};
    const Look *old = benchmark ? benchmark : now;
    const UltravioletDay *day = &now->day, *before = &old->day;
    const char *noon = request->cosine ? "" : "_noon";
    int compare = benchmark != NULL;
    double above[UV_BANDS];
    char name[40];
    ultraviolet_above(ultraviolet, above);
    printf("quantity,unit,value%s\n", compare ? ",benchmark,change_percent" : "");
    for (int b = 0; b < UV_BANDS; b++) {
        snprintf(name, sizeof name, "%s_irradiance_above_atmosphere", band[b]);
        print_row(name, "", "W m-2", above[b], above[b], compare);
    }
    for (int b = 0; b < UV_BANDS; b++) {
        snprintf(name, sizeof name, "surface_%s_irradiance", band[b]);
        print_row(name, noon, "W m-2", day->band[b], before->band[b], compare);
    }
    print_row("surface_erythemal_irradiance", noon, "W m-2", day->erythemal, before->erythemal, compare);
    print_row("uv_index", noon, "1", day->uv_index, before->uv_index, compare);
    if (!request->cosine) {
        print_row("erythemal_daily_dose", "", "J m-2 day-1", day->dose, before->dose, compare);
        print_row("erythemal_daily_dose", "", "SED day-1", day->dose / STANDARD_ERYTHEMAL_DOSE,
                  before->dose / STANDARD_ERYTHEMAL_DOSE, compare);
    }
    print_row("erythemal_amplification_factor", "", "1", now->amplification, old->amplification, compare);
}

static void print_spectrum(const Ultraviolet *ultraviolet)
{
    printf("lower_nm,upper_nm,above_atmosphere,ground,erythemal_weight\n");
    for (int b = 0; b < ultraviolet_bins(ultraviolet); b++) {
        UltravioletBin bin = ultraviolet_bin(ultraviolet, b);
        printf("%g,%g,%.5e,%.5e,%.5e\n", bin.lower, bin.upper, bin.above, bin.ground, bin.weight);
    }
}

int sunlight_ultraviolet(const UltravioletRequest *request, Fault *fault)
{
    Settings *settings = malloc(sizeof *settings);
    Model *model = NULL;
    Ultraviolet *ultraviolet = NULL;
    Look now, benchmark;
    int compare = request->benchmark != 0;
    if (!settings)
        return fault_memory(fault, "settings");
    int code = load_case(settings, request->case_path, fault);
    if (!code)
        code = model_make(&model, settings, fault);
    if (!code)
        code = ultraviolet_make(&ultraviolet, model, request->cosine, fault);
    if (!code && compare)
        code = look_at(model, ultraviolet, request, request->benchmark, &benchmark, fault);
    if (!code) /* last, since the spectrum is that of the last day computed */
        code = look_at(model, ultraviolet, request, request->year, &now, fault);
    if (!code) {
        print_head(model, request, &now, compare ? &benchmark : NULL);
        if (request->spectrum)
            print_spectrum(ultraviolet);
        else
            print_table(ultraviolet, request, &now, compare ? &benchmark : NULL);
    }
    ultraviolet_free(ultraviolet);
    model_free(model);
    free(settings);
    return code;
}
