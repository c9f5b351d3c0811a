/* series_parts: partial columns of ozone out of its mole fractions; contract in series.h. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <netcdf.h>

#include "../input/constants.h"
#include "series.h"

#define CM_PER_KM 1e5

/* Of the column: layers, what is above them, and ozone_column agree to this when they belong together; single
 * precision, as other tools write it, leaves 1e-7. */
static const double AGREEMENT = 1e-5;

typedef struct {
    int layers;
    double *edge;      /* [layers + 1] km */
    double *molecules; /* [layers] of air, cm-2 */
    double above;      /* of air above the top, cm-2 */
    double *ozone;     /* [records][layers] mole fraction */
} Profiles;

static void profiles_free(Profiles *profiles)
{
    free(profiles->edge);
    free(profiles->molecules);
    free(profiles->ozone);
}

static void leave_out(FileSeries *series, const char *reason)
{
    for (int part = 0; part < SERIES_PARTS; part++)
        snprintf(series->missing[SERIES_TROPOSPHERE + part], sizeof series->missing[0], "%s", reason);
}

/* 1 when read, 0 with the reason when the file lacks something. */
static int read_profiles(Profiles *profiles, FileSeries *series, int file, Fault *fault)
{
    static const char *const needed =
        "the file lacks O3, altitude_edge, air_number_density or air_column_above_top";
    int dimension;
    size_t layers = 0;
    if (nc_inq_dimid(file, "altitude", &dimension) != NC_NOERR ||
        nc_inq_dimlen(file, dimension, &layers) != NC_NOERR || layers < 1 || layers > 100000 ||
        layers * (size_t)series->count > 100000000) {
        leave_out(series, needed);
        return 0;
    }
    profiles->layers = (int)layers;
    profiles->edge = malloc((layers + 1) * sizeof *profiles->edge);
    profiles->molecules = malloc(layers * sizeof *profiles->molecules);
    profiles->ozone = malloc(layers * (size_t)series->count * sizeof *profiles->ozone);
    if (!profiles->edge || !profiles->molecules || !profiles->ozone) {
        fault_memory(fault, "the profiles of a file");
        return 0;
    }
    if (series_variable(file, "altitude_edge", profiles->layers + 1, profiles->edge) ||
        series_variable(file, "air_number_density", profiles->layers, profiles->molecules) ||
        series_variable(file, "air_column_above_top", 1, &profiles->above) ||
        series_variable(file, "O3", series->count * profiles->layers, profiles->ozone)) {
        leave_out(series, needed);
        return 0;
    }
    for (int i = 0; i < profiles->layers; i++)
        profiles->molecules[i] *= CM_PER_KM * (profiles->edge[i + 1] - profiles->edge[i]);
    series->top_km = profiles->edge[profiles->layers];
    return 1;
}

/* 1 when the limits are known and make sense. */
static int find_limits(FileSeries *series, int file, const double *limit_km)
{
    char reason[200];
    if (limit_km) {
        memcpy(series->limit_km, limit_km, sizeof series->limit_km);
    } else if (series_variable(file, "tropopause_altitude", 1, series->limit_km)) {
        leave_out(series, "the file does not say where its tropopause is; give --limits");
        return 0;
    } else {
        memcpy(series->limit_km + 1, series_limits, sizeof series_limits);
    }
    const double *limit = series->limit_km;
    if (limit[0] >= 0.0 && limit[0] < limit[1] && limit[1] < limit[2])
        return 1;
    snprintf(reason, sizeof reason, "the limits %g, %g, %g km do not increase; give --limits", limit[0],
             limit[1], limit[2]);
    leave_out(series, reason);
    return 0;
}

/* Share of a layer that lies between two altitudes. */
static double share_between(double bottom, double top, double from, double to)
{
    return fmax(0.0, fmin(top, to) - fmax(bottom, from)) / (top - bottom);
}

int series_read_parts(FileSeries *series, int file, const double *limit_km, Fault *fault)
{
    Profiles profiles = {0};
    char reason[200];
    if (!read_profiles(&profiles, series, file, fault) || !find_limits(series, file, limit_km)) {
        profiles_free(&profiles);
        return fault->code;
    }
    double *part[SERIES_PARTS], worst = 0.0;
    int code = 0;
    for (int p = 0; p < SERIES_PARTS; p++) {
        part[p] = series->value[SERIES_TROPOSPHERE + p] = calloc((size_t)series->count, sizeof(double));
        strcpy(series->unit[SERIES_TROPOSPHERE + p], "DU");
        if (!part[p])
            code = fault_memory(fault, "the partial columns");
    }
    const double floor_km[SERIES_PARTS] = {-INFINITY, series->limit_km[0], series->limit_km[1],
                                           series->limit_km[2]};
    const double top = profiles.edge[profiles.layers];
    for (int r = 0; r < series->count && !code; r++) {
        const double *ozone = profiles.ozone + (size_t)r * (size_t)profiles.layers;
        double total = series->value[SERIES_COLUMN][r], below = 0.0;
        double sum = ozone[profiles.layers - 1] * profiles.above / DOBSON_CM2;
        for (int i = 0; i < profiles.layers; i++) {
            double layer = ozone[i] * profiles.molecules[i] / DOBSON_CM2;
            sum += layer;
            for (int p = 0; p < SERIES_PARTS - 1; p++)
                part[p][r] += layer * share_between(profiles.edge[i], profiles.edge[i + 1], floor_km[p],
                                                    floor_km[p + 1]);
        }
        for (int p = 0; p < SERIES_PARTS - 1; p++)
            below += part[p][r];
        part[SERIES_PARTS - 1][r] = total - below; /* and so the parts add up to the total */
        worst = fmax(worst, isfinite(sum) ? fabs(sum / total - 1.0) : INFINITY);
    }
    profiles_free(&profiles);
    if (!code && series->limit_km[2] >= top)
        snprintf(reason, sizeof reason, "the limit %g km is not below the top of the grid, %g km",
                 series->limit_km[2], top);
    else if (!code && worst > AGREEMENT)
        snprintf(reason, sizeof reason, "O3 by layer and ozone_column differ by up to %.2g of the column",
                 worst);
    else
        return code;
    leave_out(series, reason);
    for (int p = 0; p < SERIES_PARTS; p++) {
        free(part[p]);
        series->value[SERIES_TROPOSPHERE + p] = NULL;
    }
    return 0;
}
