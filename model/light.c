/* light: photolysis rates along the day. */
#include "light.h"

#include "../input/constants.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Absorption cross section of ozone at its maximum is 1.15e-17 cm2 (JPL 19-5): optical depth 1 is this
 * column. */
static const double UNIT_DEPTH = 8.7e16;

int light_make(Light **made, const Model *model, int refine, Fault *fault)
{
    *made = NULL;
    Light *light = calloc(1, sizeof *light);
    if (!light)
        return fault_memory(fault, "photolysis rates");
    const Mechanism *mechanism = model->mechanism;
    size_t padded = (size_t)model->grid.padded;
    light->model = model;
    light->conditions = model->base;
    light->reactions = mechanism->surface_first - mechanism->photolysis_first;
    sun_make(&light->sun, &model->settings, refine);
    size_t field = (size_t)light->reactions * padded;
    light->table = calloc((size_t)light->sun.nodes * field + 1, sizeof(double));
    light->knot = calloc(SUN_KNOTS * field + 1, sizeof(double));
    light->mean = calloc(field + 1, sizeof(double));
    light->overhead = calloc(padded, sizeof(double));
    light->kelvin = calloc(padded, sizeof(double));
    light->air = calloc(padded, sizeof(double));
    light->density = calloc(3 * padded, sizeof(double));
    double *edge_km = calloc((size_t)model->grid.layers + 1, sizeof(double));
    int code = 0;
    if (!light->table || !light->knot || !light->mean || !light->overhead || !light->kelvin || !light->air ||
        !light->density || !edge_km)
        code = fault_memory(fault, "photolysis rates");
    if (!code)
        memcpy(light->kelvin, model->air.temperature, padded * sizeof(double));
    if (!code && light->sun.nodes) {
        for (int i = 0; i <= model->grid.layers; i++)
            edge_km[i] = 1e-5 * model->grid.edge[i];
        code = photolysis_make(&light->photolysis, mechanism, model->spectra, model->grid.layers,
                               model->grid.padded, edge_km, model->air.temperature, model->air.number_density,
                               model->grid.depth, model->air.column_above_top, light->sun.cosine,
                               light->sun.nodes, model->settings.surface_albedo, fault);
    }
    free(edge_km);
    if (code) {
        light_free(light);
        return code;
    }
    *made = light;
    return 0;
}

void light_free(Light *light)
{
    if (!light)
        return;
    photolysis_free(light->photolysis);
    free(light->table);
    free(light->knot);
    free(light->mean);
    free(light->overhead);
    free(light->kelvin);
    free(light->air);
    free(light->density);
    free(light);
}

void light_copy(Light *to, const Light *from)
{
    size_t padded = (size_t)from->model->grid.padded, field = (size_t)from->reactions * padded;
    to->sun = from->sun;
    if (from->photolysis)
        photolysis_copy(to->photolysis, from->photolysis);
    memcpy(to->table, from->table, (size_t)from->sun.nodes * field * sizeof(double));
    memcpy(to->knot, from->knot, SUN_KNOTS * field * sizeof(double));
    memcpy(to->mean, from->mean, field * sizeof(double));
    memcpy(to->kelvin, from->kelvin, padded * sizeof(double));
    memcpy(to->air, from->air, padded * sizeof(double));
    memcpy(to->overhead, from->overhead, padded * sizeof(double));
    to->ready = from->ready;
    to->turned = from->turned;
}

static double temperature_moved(const Light *light)
{
    double most = 0.0;
    for (int l = 0; l < light->model->grid.padded; l++)
        most = fmax(most, fabs(light->conditions->temperature[l] - light->kelvin[l]));
    return most;
}

/* Times the number density of the fixed reactants of a photolysis reaction is to be taken. */
static int fixed_order(const Light *light, int reaction)
{
    const Mechanism *mechanism = light->model->mechanism;
    return mechanism->reaction[mechanism->photolysis_first + reaction].fixed_order;
}

/* Coefficients of fixed reactants to the density of now. */
static void scale_fixed_reactants(Light *light)
{
    int padded = light->model->grid.padded;
    for (int l = 0; l < padded; l++) {
        double ratio = light->conditions->air[l] / light->air[l];
        light->air[l] = light->conditions->air[l];
        for (int r = 0; r < light->reactions; r++) {
            if (!fixed_order(light, r))
                continue;
            double scale = pow(ratio, fixed_order(light, r));
            light->mean[FIELD(padded, r, l)] *= scale;
            for (int k = 0; k < SUN_KNOTS; k++)
                light->knot[FIELD(padded, k * light->reactions + r, l)] *= scale;
            for (int n = 0; n < light->sun.nodes; n++)
                light->table[FIELD(padded, n * light->reactions + r, l)] *= scale;
        }
    }
}

int light_follow(Light *light, const Conditions *conditions, int moved)
{
    light->conditions = conditions;
    int follows = light->ready && moved & CONDITIONS_AIR;
    if (follows)
        scale_fixed_reactants(light);
    if (moved & CONDITIONS_LIGHT || (follows && temperature_moved(light) > LIGHT_KELVIN))
        light->ready = 0;
    if (moved & CONDITIONS_SUN) {
        sun_set_day(&light->sun, &light->model->settings, conditions->day_of_year);
        light->turned = 1;
    }
    if (moved & CONDITIONS_LIGHT && light->photolysis)
        photolysis_set_sunlight(light->photolysis, conditions->solar);
    return follows;
}

/* Ozone above the middle of each layer, cm-2. */
static void overhead_column(const Model *model, const double *x, const double *lit, double *out)
{
    int layers = model->grid.layers, padded = model->grid.padded, top = layers - 1;
    size_t row = FIELD(padded, mechanism_solved(model->mechanism, "O3"), 0);
    const double *o3 = x + row;
    double above = o3[top] * (lit ? lit[row + (size_t)top] : 1.0) * model->air.column_above_top;
    for (int l = top; l >= 0; l--) {
        double share = lit ? lit[row + (size_t)l] : 1.0;
        double half = 0.5 * o3[l] * share * model->air.number_density[l] * model->grid.depth[l];
        out[l] = above + half;
        above += 2.0 * half;
    }
}

static int overhead_moved(const Light *light, const double *x, const double *lit, double times)
{
    const Model *model = light->model;
    double now[PACK_ROUND(SETTINGS_MAX_EDGES)];
    overhead_column(model, x, lit, now);
    for (int l = 0; l < model->grid.layers; l++) {
        double scale = fmax(light->overhead[l], UNIT_DEPTH);
        if (fabs(now[l] - light->overhead[l]) > times * model->settings.refresh_column * scale)
            return 1;
    }
    return 0;
}

int light_stale_by(const Light *light, const double *x, const double *lit, double times)
{
    return !light->ready || light->turned || overhead_moved(light, x, lit, times);
}

int light_stale(const Light *light, const double *x, const double *lit)
{
    return light_stale_by(light, x, lit, 1.0);
}

/* A negative mole fraction within the tolerance absorbs nothing. */
static void number_density(const Light *light, const double *x, const double *lit, const char *name,
                           double *out)
{
    const Model *model = light->model;
    int solved = mechanism_solved(model->mechanism, name), padded = model->grid.padded;
    for (int l = 0; l < padded; l++) {
        size_t at = solved < 0 ? 0 : FIELD(padded, solved, l);
        double share = lit ? lit[at] : 1.0;
        out[l] = solved < 0 ? 0.0 : fmax(0.0, x[at]) * share * light->conditions->air[l];
    }
}

/* Number density of the fixed reactants of a photolysis reaction; 1 when the absorber is a solved species. */
static double fixed_density(const Light *light, int reaction, int layer)
{
    const Model *model = light->model;
    const Reaction *photolysis = &model->mechanism->reaction[model->mechanism->photolysis_first + reaction];
    return photolysis->fixed_order
               ? photolysis->fixed_share * pow(light->conditions->air[layer], photolysis->fixed_order)
               : 1.0;
}

double light_mean_rate(const Light *light, int reaction, int layer)
{
    return light->mean[FIELD(light->model->grid.padded, reaction, layer)] /
           fixed_density(light, reaction, layer);
}

static void fold_fixed_reactants(Light *light, int r)
{
    int padded = light->model->grid.padded;
    if (!fixed_order(light, r))
        return;
    for (int l = 0; l < padded; l++)
        for (int n = 0; n < light->sun.nodes; n++)
            light->table[FIELD(padded, n * light->reactions + r, l)] *= fixed_density(light, r, l);
}

/* Let the photolysis have the air of now. */
static void take_air(Light *light)
{
    const Conditions *now = light->conditions;
    size_t size = (size_t)light->model->grid.padded * sizeof(double);
    memcpy(light->air, now->air, size);
    if (!(temperature_moved(light) > 0.0))
        return;
    photolysis_set_air(light->photolysis, now->temperature, now->air, now->depth,
                       light->model->air.column_above_top);
    memcpy(light->kelvin, now->temperature, size);
}

/* Rates at the nodes, [nodes][reactions][padded]. */
static void fill_table(Light *light, const double *x, const double *lit, double earth_sun)
{
    int padded = light->model->grid.padded;
    take_air(light);
    number_density(light, x, lit, "O3", light->density);
    number_density(light, x, lit, "NO2", light->density + padded);
    number_density(light, x, lit, "NO", light->density + 2 * padded);
    photolysis_rates(light->photolysis, light->density, light->density + padded, light->density + 2 * padded,
                     earth_sun, light->table);
    for (int r = 0; r < light->reactions; r++)
        fold_fixed_reactants(light, r);
    overhead_column(light->model, x, lit, light->overhead);
}

/* With a season the table outlasts the day and is that of 1 au. */
static double table_sun(const Light *light)
{
    return light->model->settings.sun == SUN_SEASON ? 1.0 : light->sun.earth_sun;
}

/* From the nodes onto knots and mean, of reactions first to end - 1. */
static void spread(Light *light, int first, int end)
{
    const Sun *sun = &light->sun;
    int season = light->model->settings.sun == SUN_SEASON, padded = light->model->grid.padded,
        stride = light->reactions * padded;
#pragma omp parallel for schedule(static)
    for (int i = first * padded; i < end * padded; i++) {
        light->mean[i] = sun_spread(sun, light->table + i, stride, light->knot + i, stride);
        for (int k = 0; season && k < SUN_KNOTS; k++)
            light->knot[(size_t)k * (size_t)stride + (size_t)i] *= sun->earth_sun;
        if (season)
            light->mean[i] *= sun->earth_sun;
    }
}

void light_refresh(Light *light, const double *x, const double *lit)
{
    const Sun *sun = &light->sun;
    int only_turned = light->ready && light->turned && !overhead_moved(light, x, lit, 1.0);
    if (!only_turned && sun->nodes)
        fill_table(light, x, lit, table_sun(light));
    else if (!only_turned)
        overhead_column(light->model, x, lit, light->overhead);
    if (sun->nodes)
        spread(light, 0, light->reactions);
    light->ready = 1;
    light->turned = 0;
}

/* share [nodes][reactions][padded]: derivative of the mean by the rate at a node, coefficients of fixed
 * reactants and the sun's distance included. */
static void take_shares(const Light *light, double *share)
{
    int padded = light->model->grid.padded, stride = light->reactions * padded;
    double distance = light->model->settings.sun == SUN_SEASON ? light->sun.earth_sun : 1.0;
#pragma omp parallel for schedule(static)
    for (int i = 0; i < stride; i++) {
        sun_gradient(&light->sun, light->table + i, stride, share + i, stride);
        double scale = distance * fixed_density(light, i / padded, i % padded);
        for (int n = 0; n < light->sun.nodes; n++)
            share[(size_t)n * (size_t)stride + (size_t)i] *= scale;
    }
}

int light_slopes(Light *light, const double *x, const double *lit, double *slope, Fault *fault)
{
    static const char *const name[3] = {"O3", "NO2", "NO"};
    const Model *model = light->model;
    int layers = model->grid.layers, padded = model->grid.padded;
    size_t rows = (size_t)layers * (size_t)light->reactions,
           field = (size_t)light->reactions * (size_t)padded;
    memset(slope, 0, 3 * rows * (size_t)layers * sizeof *slope);
    if (!light->sun.nodes || !light->sun.rises)
        return 0;
    double *share = malloc(((size_t)light->sun.nodes * field + 2 * (size_t)layers) * sizeof *share);
    if (!share)
        return fault_memory(fault, "the slopes of the light");
    double *column = share + (size_t)light->sun.nodes * field;
    for (int a = 0; a < 2; a++)
        for (int l = 0; l < layers; l++)
            column[a * layers + l] = light->density[a * padded + l] * light->conditions->depth[l];
    take_shares(light, share);
    int code = photolysis_slopes(light->photolysis, share, light->mean, column, light->density + 2 * padded,
                                 table_sun(light), slope, fault);
    free(share);
    if (code)
        return code;
    double unit[3][SETTINGS_MAX_EDGES]; /* number density per mole fraction */
    for (int a = 0; a < 3; a++) {
        int s = mechanism_solved(model->mechanism, name[a]);
        for (int l = 0; l < layers; l++) {
            size_t at = s < 0 ? 0 : FIELD(padded, s, l);
            unit[a][l] = s < 0 || x[at] < 0.0 ? 0.0 : (lit ? lit[at] : 1.0) * light->conditions->air[l];
        }
    }
    for (size_t row = 0; row < rows; row++)
        for (int a = 0; a < 3; a++)
            for (int l = 0; l < layers; l++)
                slope[(row * 3 + (size_t)a) * (size_t)layers + (size_t)l] *= unit[a][l];
    return 0;
}
