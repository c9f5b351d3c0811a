/* validate_perturb: what known perturbations do to the settled column of STEADY_YEAR, temperature fixed. */
#include "validate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct {
    double cly_ppb;           /* Cly at 50 km to be met; 0: the chlorine of state */
    int state;                /* one from above whose chlorine is taken; -1: that of the year */
    double n2o, ch4, aerosol; /* times that of the year */
} Plan;

enum {
    PLAIN,
    CL_1,
    CL_3_5,
    CL_7,
    N2O_DOUBLED,
    CH4_DOUBLED,
    AEROSOL_MORE,
    AEROSOL_MORE_CL_1,
    GAS_CL_1_3, /* gas phase alone, from here on */
    GAS_CL_8,
    GAS_N2O_MORE,
    GAS_CH4_DOUBLED,
    GAS_ALL,
    STATES
};
_Static_assert(STATES == PERTURBED_STATES, "Perturbed holds them all");

static const Plan plans[STATES] = {
    [PLAIN] = {0, -1, 1, 1, 1},
    [CL_1] = {1.0, -1, 1, 1, 1},
    [CL_3_5] = {3.5, -1, 1, 1, 1},
    [CL_7] = {7.0, -1, 1, 1, 1},
    [N2O_DOUBLED] = {0, -1, 2, 1, 1},
    [CH4_DOUBLED] = {0, -1, 1, 2, 1},
    [AEROSOL_MORE] = {0, -1, 1, 1, 1.2},
    [AEROSOL_MORE_CL_1] = {0, CL_1, 1, 1, 1.2},
    [GAS_CL_1_3] = {1.3, -1, 1, 1, 0},
    [GAS_CL_8] = {8.0, -1, 1, 1, 0},
    [GAS_N2O_MORE] = {0, GAS_CL_1_3, 1.2, 1, 0},
    [GAS_CH4_DOUBLED] = {0, GAS_CL_1_3, 1, 2, 0},
    [GAS_ALL] = {0, GAS_CL_8, 1.2, 2, 0},
};

/* The share of Cly at 50 km that may be missed: 1e-3 of it moves the column by less than 0.003 %. */
static const double CLY_MISSED = 1e-3;
static const int CLY_TRIES = 6;

/* Settle one plan from *x, which becomes the state found. Where Cly is to be met the ground's chlorine is
 * scaled by what is missing until it is. */
static int settle_plan(const Settings *settings, const Plan *plan, double chlorine, double **x,
                       PerturbedState *found, Fault *fault)
{
    for (int tries = 0;; tries++) {
        Change change = CHANGE_NOTHING;
        Settled settled;
        change.chlorine = chlorine;
        change.n2o = plan->n2o;
        change.ch4 = plan->ch4;
        change.aerosol = plan->aerosol;
        if (settled_make(&settled, settings, &change, STEADY_YEAR, *x, fault))
            return fault->code;
        *found = (PerturbedState){settled.column, settled.ozone_40, settled.cly_50, chlorine};
        free(*x);
        *x = settled.x;
        settled.x = NULL;
        settled_free(&settled);
        double wanted = 1e-9 * plan->cly_ppb;
        if (wanted <= 0.0 || fabs(found->cly_50 / wanted - 1.0) <= CLY_MISSED)
            return 0;
        if (tries == CLY_TRIES || !(found->cly_50 > 0.0))
            return fault_set(fault, FAULT_NUMERICS, "Cly at 50 km does not come to %g ppb: %g", plan->cly_ppb,
                             1e9 * found->cly_50);
        chlorine *= wanted / found->cly_50;
    }
}

int perturb_all(Perturbed *perturbed, const Settings *from, Fault *fault)
{
    Settings settings = *from;
    double *x = NULL;
    int code = 0;
    settings.temperature = TEMPERATURE_FIXED;
    for (int i = 0; !code && i < STATES; i++) {
        const Plan *plan = &plans[i];
        double chlorine = plan->state >= 0 ? perturbed->state[plan->state].chlorine : 1.0;
        if (plan->cly_ppb > 0.0)
            chlorine = 1e-9 * plan->cly_ppb / perturbed->state[PLAIN].cly_50;
        code = settle_plan(&settings, plan, chlorine, &x, &perturbed->state[i], fault);
        if (!code)
            fprintf(stderr, "perturbed %d of %d: %.3f DU\n", i + 1, STATES, perturbed->state[i].column);
    }
    free(x);
    return code;
}

int row_perturbed(const Evidence *evidence, const char *id, double *value, char *note)
{
    static const struct {
        const char *id;
        int from, to, at_40; /* at_40: ozone at 40 km and not the column */
    } rows[] = {{"perturb-Cl-1-3.5", CL_1, CL_3_5, 0},
                {"perturb-Cl-1-3.5-40km", CL_1, CL_3_5, 1},
                {"perturb-Cl-3.5-7", CL_3_5, CL_7, 0},
                {"perturb-N2O-2x", PLAIN, N2O_DOUBLED, 0},
                {"perturb-CH4-2x", PLAIN, CH4_DOUBLED, 0},
                {"perturb-SAD-1.2", PLAIN, AEROSOL_MORE, 0},
                {"perturb-SAD-1.2-low-Cl", CL_1, AEROSOL_MORE_CL_1, 0},
                {"perturb85-Cl-1.3-8", GAS_CL_1_3, GAS_CL_8, 0},
                {"perturb85-N2O-1.2x", GAS_CL_1_3, GAS_N2O_MORE, 0},
                {"perturb85-CH4-2x", GAS_CL_1_3, GAS_CH4_DOUBLED, 0},
                {"perturb85-all", GAS_CL_1_3, GAS_ALL, 0}};
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        if (strcmp(id, rows[i].id))
            continue;
        const PerturbedState *from = &evidence->perturbed->state[rows[i].from],
                             *to = &evidence->perturbed->state[rows[i].to];
        if (rows[i].at_40) {
            *value = 100.0 * (to->ozone_40 / from->ozone_40 - 1.0);
            snprintf(note, ROW_NOTE, "settled %d, from %.3f to %.3f ppm", STEADY_YEAR, 1e6 * from->ozone_40,
                     1e6 * to->ozone_40);
        } else {
            *value = 100.0 * (to->column / from->column - 1.0);
            snprintf(note, ROW_NOTE, "settled %d, from %.2f to %.2f DU, Cly %.2f to %.2f ppb", STEADY_YEAR,
                     from->column, to->column, 1e9 * from->cly_50, 1e9 * to->cly_50);
        }
        return 0;
    }
    return -1;
}
