/* archive_ultraviolet: the ultraviolet at the ground in the file of a projection. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include <netcdf.h>

#include "archive_layout.h"

/* In the order of layout_ultraviolet_put. The standard name is of the CF standard name table, from memory. */
static const Description series[LAYOUT_ULTRAVIOLET] = {
    {"surface_uva_irradiance_noon", "W m-2", NULL,
     "downward UV-A irradiance at the ground at noon, clear sky", "time: mean"},
    {"surface_uvb_irradiance_noon", "W m-2", NULL,
     "downward UV-B irradiance at the ground at noon, clear sky", "time: mean"},
    {"surface_erythemal_irradiance_noon", "W m-2", NULL,
     "downward irradiance at the ground at noon, clear sky, weighted with the action spectrum of erythema "
     "(ISO/CIE 17166:2019)",
     "time: mean"},
    {"uv_index_noon", "1", "ultraviolet_index_assuming_clear_sky",
     "UV index at noon, clear sky: 40 m2 W-1 times the erythemal irradiance", "time: mean"},
    {"erythemal_daily_dose", "J m-2 day-1", NULL,
     "erythemal radiant exposure of level ground in a day, clear sky; 100 J m-2 are a standard erythemal "
     "dose",
     "time: mean"},
    {"erythemal_amplification_factor", "1", NULL,
     "radiation amplification factor: - d ln(erythemal irradiance at noon) / d ln(ozone)", "time: mean"},
};

static int put_text(const Layout *out, int variable, const char *name, const char *text, Fault *fault)
{
    return layout_fault(out->path, nc_put_att_text(out->file, variable, name, strlen(text), text), name,
                        fault);
}

/* What every one of the variables goes by. */
static int put_conditions(const Layout *out, int variable, Fault *fault)
{
    const Settings *settings = &out->model->settings;
    const struct {
        const char *name;
        double value;
    } numbers[] = {{"latitude_deg", settings->ultraviolet_latitude_deg},
                   {"day_of_year", settings->ultraviolet_day_of_year},
                   {"surface_albedo", settings->ultraviolet_albedo},
                   {"uvb_limit_nm", settings->uvb_limit_nm}};
    int status = NC_NOERR;
    for (size_t n = 0; n < sizeof numbers / sizeof *numbers && status == NC_NOERR; n++)
        status = nc_put_att_double(out->file, variable, numbers[n].name, NC_DOUBLE, 1, &numbers[n].value);
    if (layout_fault(out->path, status, "the conditions of the ultraviolet", fault) ||
        put_text(out, variable, "coordinates", "ultraviolet_latitude", fault) ||
        put_text(out, variable, "comment",
                 "From the ozone, NO2 and temperature of the interval, under the sun that day_of_year has at "
                 "latitude_deg, over ground of surface_albedo at sea level.",
                 fault))
        return fault->code;
    return put_text(out, variable, "caution", ultraviolet_caution, fault);
}

int layout_ultraviolet_define(Layout *out, int time, size_t time_chunk, Fault *fault)
{
    static const Description latitude = {"ultraviolet_latitude", "degrees_north", "latitude",
                                         "latitude of the ultraviolet at the ground", NULL};
    int variable;
    if (!out->ultraviolet)
        return 0;
    if (layout_variable(out, &latitude, 0, NULL, NULL, &variable, fault) ||
        layout_fault(out->path,
                     nc_put_var_double(out->file, variable, &out->model->settings.ultraviolet_latitude_deg),
                     latitude.name, fault))
        return fault->code;
    for (int i = 0; i < LAYOUT_ULTRAVIOLET; i++)
        if (layout_variable(out, &series[i], 1, &time, &time_chunk, &out->series[i], fault) ||
            put_conditions(out, out->series[i], fault))
            return fault->code;
    return 0;
}

int layout_ultraviolet_put(const Layout *out, size_t index, const Record *record)
{
    UltravioletDay day;
    int status = NC_NOERR;
    if (!out->ultraviolet)
        return status;
    ultraviolet_day(out->ultraviolet, record->x, record->temperature_change, &day);
    const double value[LAYOUT_ULTRAVIOLET] = {
        day.band[UV_A], day.band[UV_B],
        day.erythemal,  day.uv_index,
        day.dose,       ultraviolet_amplification(out->ultraviolet, record->x, record->temperature_change)};
    for (int i = 0; i < LAYOUT_ULTRAVIOLET && status == NC_NOERR; i++)
        if (isfinite(value[i])) /* without light there is no factor, and the fill value stays */
            status = nc_put_var1_double(out->file, out->series[i], &index, &value[i]);
    return status;
}
