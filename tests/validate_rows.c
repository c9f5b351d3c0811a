/* validate_rows: the model's value of each published row. */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../chem/oxygen.h"
#include "../chem/rates.h"
#include "../input/constants.h"
#include "../input/table.h"
#include "../model/series.h"

typedef struct {
    const Run *run;
    const Evidence *evidence;
    const Model *model;
    const char *id, *conditions;
    char *note;
    Fault *fault;
} Ask;

static int begins(const char *text, const char *start)
{
    return strncmp(text, start, strlen(start)) == 0;
}

static int note(const Ask *ask, const char *format, double number)
{
    snprintf(ask->note, ROW_NOTE, format, number);
    return 0;
}

static int plain_note(const Ask *ask, const char *text)
{
    snprintf(ask->note, ROW_NOTE, "%s", text);
    return 0;
}

/* ---- fields ---- */

static double layer_km(const Model *model, int layer)
{
    return 1e-5 * model->grid.middle[layer];
}

/* Layer of the largest value from low to high km. */
static int highest(const Model *model, const double *profile, double low, double high)
{
    int best = -1;
    for (int l = 0; l < model->grid.layers; l++) {
        if (layer_km(model, l) < low || layer_km(model, l) > high)
            continue;
        if (best < 0 || profile[l] > profile[best])
            best = l;
    }
    return best;
}

static int solved(const Ask *ask, const char *name, int *index)
{
    *index = mechanism_solved(ask->model->mechanism, name);
    return *index >= 0 ? 0 : fault_set(ask->fault, FAULT_INPUT, "%s: the mechanism has no %s", ask->id, name);
}

/* Mean over calendar years of one species, [layers]. */
static void mean_profile(const Ask *ask, int species, int first, int last, double *profile)
{
    for (int l = 0; l < ask->model->grid.layers; l++) {
        double sum = 0.0;
        for (int year = first; year <= last; year++)
            sum += run_fields(ask->run, year)[FIELD(ask->model->grid.padded, species, l)];
        profile[l] = sum / (last - first + 1);
    }
}

/* ---- the standard atmosphere ---- */

static int standard_air(const Ask *ask, double *value)
{
    double km = atof(ask->id + strlen("us76-T-")), temperature, pressure;
    air_standard_at(km, &temperature, &pressure);
    *value = ask->id[strlen("us76-")] == 'T' ? temperature : pressure;
    return note(ask, "the standard's formulas at %g km", km);
}

/* ---- rate coefficients ---- */

/* Names on the left of an equation that has exactly two reactants; 0 when it has not. */
static int two_reactants(const char *equation, char name[2][MECHANISM_NAME])
{
    char left[200];
    size_t length = strcspn(equation, ",{");
    const char *arrow = strstr(equation, " ->");
    if (arrow && (size_t)(arrow - equation) < length)
        length = (size_t)(arrow - equation);
    if (length >= sizeof left)
        return 0;
    memcpy(left, equation, length);
    left[length] = '\0';
    char tail[MECHANISM_NAME] = "";
    return sscanf(left, " %31s + %31s %31s", name[0], name[1], tail) == 2;
}

static int coefficient_298(const Ask *ask, double *value)
{
    const Mechanism *mechanism = ask->model->mechanism;
    const double air = 101325.0 / (BOLTZMANN * 298.0) * 1e-6;
    char wanted[2][MECHANISM_NAME], name[2][MECHANISM_NAME];
    int channels = 0;
    if (!two_reactants(ask->conditions, wanted))
        return fault_set(ask->fault, FAULT_INPUT, "%s: no two reactants in \"%s\"", ask->id, ask->conditions);
    *value = 0.0;
    for (int r = mechanism->thermal_first; r < mechanism->photolysis_first; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        if (strstr(reaction->equation, "(+M)") || !two_reactants(reaction->equation, name))
            continue;
        int same = !strcmp(name[0], wanted[0]) && !strcmp(name[1], wanted[1]);
        int swapped = !strcmp(name[0], wanted[1]) && !strcmp(name[1], wanted[0]);
        if (!same && !swapped)
            continue;
        *value += reaction->branch * rates_law(mechanism, r, 298.0, air, 0.0);
        channels++;
    }
    if (!channels)
        return fault_set(ask->fault, FAULT_INPUT, "%s: no reaction %s + %s in the mechanism", ask->id,
                         wanted[0], wanted[1]);
    return note(ask, "sum over %g channel(s)", channels);
}

/* ---- lifetimes ---- */

static int lifetime(const Ask *ask, double *value)
{
    const char *gas = ask->id + strlen("tau-");
    int species, aloft = strstr(ask->conditions, "stratospheric loss only") != NULL;
    GasBudget budget;
    if (solved(ask, gas, &species))
        return ask->fault->code;
    budget_gas(ask->model, ask->evidence->x, ask->evidence->rate, species,
               model_keeps(ask->model, species, 2000.0), &budget);
    *value = budget_lifetime(&budget, aloft ? budget.aloft : budget.loss, GAS_LOSSES);
    if (!isfinite(*value))
        return fault_set(ask->fault, FAULT_NUMERICS, "%s: %s is not lost", ask->id, gas);
    return note(ask, aloft ? "balance of %g, loss above the tropopause" : "balance of %g, all loss",
                STEADY_YEAR);
}

/* ---- relations of long-lived gases in the lower stratosphere ---- */

static int slope(const Ask *ask, double *value)
{
    static const struct {
        const char *id, *gas;
        int total; /* against gas, where no other gas is named */
        const char *other;
        double low, high; /* of gas, mole fraction */
    } rows[] = {{"slope-NOy-N2O", "N2O", TOTAL_NOY, NULL, 150e-9, 300e-9},
                {"slope-Cly-N2O", "N2O", TOTAL_CLY, NULL, 150e-9, 300e-9},
                {"slope-CFC-11-CFC-12", "CFC-12", 0, "CFC-11", 0.85, 0.99}}; /* of its value at the ground */
    double y[SETTINGS_MAX_EDGES];
    const double *x = ask->evidence->x;
    int padded = ask->model->grid.padded;
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        int species, other = -1;
        if (strcmp(ask->id, rows[i].id))
            continue;
        if (solved(ask, rows[i].gas, &species) || (rows[i].other && solved(ask, rows[i].other, &other)))
            return ask->fault->code;
        const double *against = x + FIELD(padded, species, 0), *of = y;
        double scale = 1.0, unit = 1.0;
        if (other >= 0) { /* each relative to its value at the ground */
            of = x + FIELD(padded, other, 0);
            unit = against[0];
            scale = against[0] / of[0];
        } else {
            budget_total(ask->model, x, rows[i].total, y);
        }
        int layers = budget_slope(ask->model, against, of, rows[i].low * unit, rows[i].high * unit, value);
        *value *= scale;
        return note(ask, "balance of 2000, least squares over %g layers", layers);
    }
    return -1;
}

/* ---- loss of odd oxygen by family ---- */

/* The altitude from low to high km at which family one overtakes family two on the way up. */
static int overtaking(const Ask *ask, int one, int two, double low, double high, double *value)
{
    const Model *model = ask->model;
    const double *a = ask->evidence->term + FIELD(model->grid.padded, one, 0);
    const double *b = ask->evidence->term + FIELD(model->grid.padded, two, 0);
    *value = NAN;
    for (int l = 0; l + 1 < model->grid.layers; l++) {
        double below = a[l] - b[l], above = a[l + 1] - b[l + 1];
        if (layer_km(model, l) < low || layer_km(model, l + 1) > high || below > 0.0 || above <= 0.0)
            continue;
        double share = below / (below - above);
        *value = (1.0 - share) * layer_km(model, l) + share * layer_km(model, l + 1);
        return note(ask, "balance of %g, between layers", STEADY_YEAR);
    }
    return plain_note(ask, "there is none");
}

static int largest_share(const Ask *ask, int family, double low, double high, double *value)
{
    const Model *model = ask->model;
    int padded = model->grid.padded, best = -1;
    *value = NAN;
    for (int l = 0; l < model->grid.layers; l++) {
        double all = 0.0;
        for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++)
            all += ask->evidence->term[FIELD(padded, t, l)];
        double share = 100.0 * ask->evidence->term[FIELD(padded, family, l)] / all;
        if (layer_km(model, l) < low || layer_km(model, l) > high || (best >= 0 && share <= *value))
            continue;
        best = l;
        *value = share;
    }
    return note(ask, "balance of 2000, at %g km", best >= 0 ? layer_km(model, best) : NAN);
}

static int odd_oxygen(const Ask *ask, double *value)
{
    if (!strcmp(ask->id, "loss-NOx-over-HOx"))
        return overtaking(ask, BUDGET_NOX, BUDGET_HOX, 14.0, 35.0, value);
    if (!strcmp(ask->id, "loss-HOx-over-NOx"))
        return overtaking(ask, BUDGET_HOX, BUDGET_NOX, 35.0, 60.0, value);
    if (!strcmp(ask->id, "loss-NOx-most"))
        return largest_share(ask, BUDGET_NOX, 20.0, 45.0, value);
    if (!strcmp(ask->id, "loss-ClOx-most"))
        return largest_share(ask, BUDGET_CLOX, 30.0, 50.0, value);
    return -1;
}

/* ---- ozone ---- */

enum { EARLY_FIRST = 1964, EARLY_LAST = 1980, LATE_FIRST = 1996, LATE_LAST = 2000 };

static int ozone(const Ask *ask, double *value)
{
    const Model *model = ask->model;
    double profile[SETTINGS_MAX_EDGES], density[SETTINGS_MAX_EDGES], early;
    int species;
    if (solved(ask, "O3", &species))
        return ask->fault->code;
    mean_profile(ask, species, EARLY_FIRST, EARLY_LAST, profile);
    for (int l = 0; l < model->grid.layers; l++)
        density[l] = profile[l] * model->air.number_density[l];
    early = run_column(ask->run, EARLY_FIRST, EARLY_LAST);
    int most = highest(model, profile, 0, 100), thickest = highest(model, density, 0, 100);
    plain_note(ask, "mean of 1964-1980");
    if (!strcmp(ask->id, "O3-column")) {
        *value = early;
    } else if (!strcmp(ask->id, "O3-peak-x")) {
        *value = 1e6 * profile[most];
    } else if (!strcmp(ask->id, "O3-peak-x-z")) {
        *value = layer_km(model, most);
    } else if (!strcmp(ask->id, "O3-peak-n-z")) {
        *value = layer_km(model, thickest);
    } else if (!strcmp(ask->id, "us76-O3-peak")) {
        *value = density[thickest];
        note(ask, "mean of 1964-1980, at %g km", layer_km(model, thickest));
    } else if (!strcmp(ask->id, "O3-strat-share")) {
        double below = 0.0;
        for (int l = 0; l < model->grid.layers; l++)
            if (layer_km(model, l) < model->settings.tropopause_km)
                below += density[l] * model->grid.depth[l] / DOBSON_CM2;
        *value = 1.0 - below / early;
        note(ask, "mean of 1964-1980; %.1f DU below the tropopause", below);
    } else if (!strcmp(ask->id, "O3-loss-2000")) {
        *value = 100.0 * (run_column(ask->run, LATE_FIRST, LATE_LAST) / early - 1.0);
        note(ask, "1996-2000 against %.2f DU", early);
    } else {
        return -1;
    }
    return 0;
}

static int return_year(const Ask *ask, double *value)
{
    const Run *run = ask->run;
    double *edge = malloc(2 * (size_t)run->years * sizeof *edge);
    if (!edge)
        return fault_memory(ask->fault, "the ends of years");
    for (int i = 0; i < run->years; i++) {
        edge[i] = run->first_year + i;
        edge[run->years + i] = run->first_year + i + 1.0;
    }
    const Series series = {run->years, edge, run->time, edge + run->years, run->column};
    SeriesReturn back = series_return(&series, 1, 1980);
    *value = back.year;
    note(ask,
         back.state == RETURN_FOUND ? "lowest year mean %.2f DU"
                                    : "no return by 2100; lowest year mean %.2f DU",
         run->column[series_extreme(&series, 1, -INFINITY)]);
    free(edge);
    return 0;
}

/* ---- other gases, year 2000 ---- */

static int highest_above(const Ask *ask, const double *profile, double scale, double *value)
{
    int l = highest(ask->model, profile, ask->model->settings.tropopause_km, 60.0);
    *value = scale * profile[l];
    return note(ask, "year 2000, largest above the tropopause, at %g km", layer_km(ask->model, l));
}

static int at_altitude(const Ask *ask, const double *profile, double km, double scale, double *value)
{
    *value = scale * budget_at_km(ask->model, profile, km);
    return note(ask, "year 2000, %g km", km);
}

static int composition(const Ask *ask, double *value)
{
    static const struct {
        const char *id, *species; /* NULL: a total */
        int total;
        double km; /* 0: the largest */
        double scale;
    } rows[] = {{"H2O-50", "H2O", 0, 50, 1e6},        {"NOy-max", NULL, TOTAL_NOY, 0, 1e9},
                {"HNO3-max", "HNO3", 0, 0, 1e9},      {"ClO-max", "ClO", 0, 0, 1e9},
                {"HCl-50", "HCl", 0, 50, 1e9},        {"Cly-50", NULL, TOTAL_CLY, 50, 1e9},
                {"Bry-30", NULL, TOTAL_BRY, 30, 1e12}};
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        if (strcmp(ask->id, rows[i].id))
            continue;
        double profile[SETTINGS_MAX_EDGES];
        int species;
        if (rows[i].species) {
            if (solved(ask, rows[i].species, &species))
                return ask->fault->code;
            mean_profile(ask, species, 2000, 2000, profile);
        } else {
            budget_total(ask->model, run_fields(ask->run, 2000), rows[i].total, profile);
        }
        return rows[i].km > 0 ? at_altitude(ask, profile, rows[i].km, rows[i].scale, value)
                              : highest_above(ask, profile, rows[i].scale, value);
    }
    return -1;
}

/* ---- sunlight ---- */

/* The longest wavelength at which the program dissociates O2. */
static int oxygen_threshold(const Ask *ask, double *value)
{
    const Spectra *spectra = ask->model->spectra;
    const Mechanism *mechanism = ask->model->mechanism;
    *value = 0.0;
    for (int r = mechanism->photolysis_first; r < mechanism->surface_first; r++) {
        if (mechanism->reaction[r].special != SPECIAL_O2)
            continue;
        int yield = spectra->reaction_yield[r - mechanism->photolysis_first];
        for (int b = 0; b < spectra->bins; b++) {
            double phi = yield >= 0 ? spectra->spectrum[yield].sigma[b] : 1.0;
            if (phi * spectra->spectrum[spectra->oxygen].sigma[b] > 0.0)
                *value = fmax(*value, fmin(spectra->upper[b], OXYGEN_DISSOCIATION_EDGE_NM));
        }
    }
    return plain_note(ask, "end of the last bin with O2 + hv, or the edge within it");
}

/* "Strongly": the vertical ozone column of 1964-1980 takes at least a tenth of the light. */
static int ozone_strong(const Ask *ask, double *value)
{
    const Spectra *spectra = ask->model->spectra;
    const Spectrum *sigma = &spectra->spectrum[spectra->ozone];
    double column = run_column(ask->run, EARLY_FIRST, EARLY_LAST) * DOBSON_CM2;
    *value = 0.0;
    for (int b = 0; b < spectra->bins && spectra->upper[b] < 400.0; b++)
        if (sigma->sigma[(size_t)(sigma->temperatures - 1) * (size_t)spectra->bins + (size_t)b] * column >
            -log(0.9))
            *value = spectra->upper[b];
    return plain_note(ask, "the column of 1964-1980 takes a tenth of the light overhead");
}

/* ---- which is which ---- */

int row_compute(const Evidence *evidence, const char *id, const char *conditions, int *state, double *value,
                char *note_text, Fault *fault)
{
    static const char *const later[] = {"uv-bands"};
    const Ask ask = {evidence->run, evidence, evidence->run->model, id, conditions, note_text, fault};
    note_text[0] = '\0';
    *value = NAN;
    for (size_t i = 0; i < sizeof later / sizeof later[0]; i++)
        if (begins(id, later[i])) {
            *state = ROW_LATER;
            return 0;
        }
    *state = ROW_COMPUTED;
    int code = -1;
    if (begins(id, "us76-T-") || begins(id, "us76-p-"))
        code = standard_air(&ask, value);
    else if (begins(id, "k298-"))
        code = coefficient_298(&ask, value);
    else if (begins(id, "tau-"))
        code = lifetime(&ask, value);
    else if (begins(id, "slope-"))
        code = slope(&ask, value);
    else if (begins(id, "loss-"))
        code = odd_oxygen(&ask, value);
    else if (!strcmp(id, "return-1980"))
        code = return_year(&ask, value);
    else if (!strcmp(id, "O2-threshold"))
        code = oxygen_threshold(&ask, value);
    else if (!strcmp(id, "O3-strong"))
        code = ozone_strong(&ask, value);
    else if ((code = row_emission(evidence, id, value, note_text, fault)) == -1 &&
             (code = row_potency(evidence, id, value, note_text, fault)) == -1 &&
             (code = row_moments(evidence, id, value, note_text, fault)) == -1 &&
             (code = row_perturbed(evidence, id, value, note_text)) == -1 &&
             (code = row_chlorine(evidence, id, value, note_text, fault)) == -1 &&
             (code = row_ultraviolet(evidence, id, value, note_text, fault)) == -1 &&
             (code = composition(&ask, value)) == -1)
        code = ozone(&ask, value);
    if (code == -1)
        return fault_set(fault, FAULT_INPUT, "row %s: the program does not know how to compute it", id);
    return code;
}
