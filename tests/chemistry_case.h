/* chemistry_case: what the test and the benchmark of the chemistry share: the whole mechanism on a column of
 * 80 layers through one day, by the solver under test and by CVODE.
 *
 * Standard atmosphere, photolysis of the program at 13 suns, first-guess gas profiles with the halogen source
 * gases of 1995. A day has 12 h of light whose cosine of the zenith angle rises linearly to 1 and falls back;
 * between half-hourly knots every photolysis coefficient is linear in time, so both solvers see exactly the
 * same equations. */
#ifndef SKYMEND_TEST_CHEMISTRY_CASE_H
#define SKYMEND_TEST_CHEMISTRY_CASE_H

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cvode/cvode.h>
#include <nvector/nvector_serial.h>
#include <sunlinsol/sunlinsol_dense.h>
#include <sunmatrix/sunmatrix_dense.h>

#include "../chem/kernel.h"
#include "../chem/mechanism.h"
#include "../chem/photolysis.h"
#include "../chem/rates.h"
#include "../chem/rosenbrock.h"
#include "../chem/surface.h"
#include "../input/constants.h"
#include "../input/schedule.h"
#include "../input/table.h"
#include "../transport/air.h"

enum { CASE_LAYERS = 80, CASE_SUNS = 13, CASE_SEGMENTS = 26, CASE_NOON = 13 /* segments before noon */ };

typedef struct {
    Mechanism *mechanism;
    Kernel *kernel;
    Grid grid;
    Air air;
    double *coefficient; /* [reactions][CASE_LAYERS], photolysis rows unused */
    double *light;       /* [CASE_SUNS][photolysis reactions][CASE_LAYERS], fixed reactants folded in */
    double *start;       /* [solved][CASE_LAYERS] cm-3 at midnight */
} ChemistryCase;

static inline void *case_check(void *made)
{
    if (!made) {
        fputs("chemistry case: out of memory\n", stderr);
        exit(1);
    }
    return made;
}

static inline double *case_array(size_t count)
{
    size_t size = (count * sizeof(double) + 63) / 64 * 64;
    double *made = case_check(aligned_alloc(64, size ? size : 64));
    memset(made, 0, size);
    return made;
}

static inline const char *case_data(const char *name, char *path)
{ /* path: [400] */
    const char *given = getenv("SKYMEND_DATA");
    snprintf(path, 400, "%s/%s", given ? given : "input/data", name);
    return path;
}

static inline int case_start(ChemistryCase *c, Fault *fault)
{
    char path[400];
    Table table;
    Schedule schedule;
    if (table_read(&table, case_data("initial-profiles.csv", path), fault))
        return fault->code;
    const double *altitude = table_values(&table, 0);
    if (schedule_read(&schedule, (const char *const[]){case_data("baseline-schedule.csv", path)}, 1, fault)) {
        table_free(&table);
        return fault->code;
    }
    for (int s = 0; s < c->mechanism->solved; s++) {
        const char *name = mechanism_name(c->mechanism, s);
        int gas = schedule_find(&schedule, name);
        size_t column = 1;
        while (column < table.columns && strcmp(table.name[column], name))
            column++;
        for (int l = 0; l < CASE_LAYERS; l++) {
            double km = c->grid.middle[l] * 1e-5, x = 0.0;
            if (column < table.columns)
                x = table_linear(altitude, table_values(&table, column), table.rows, km);
            else if (gas >= 0)
                x = schedule_abundance(&schedule, gas, 1995.5) * exp(-fmax(0.0, km - 15.0) / 10.0);
            c->start[s * CASE_LAYERS + l] = x * c->air.number_density[l];
        }
    }
    table_free(&table);
    schedule_free(&schedule);
    return 0;
}

static inline int case_light(ChemistryCase *c, Fault *fault)
{
    char bins[400], sun[400];
    const char *data = getenv("SKYMEND_DATA") ? getenv("SKYMEND_DATA") : "input/data";
    const Mechanism *m = c->mechanism;
    int count = m->surface_first - m->photolysis_first;
    double cosine[CASE_SUNS], edge_km[CASE_LAYERS + 1];
    for (int i = 0; i < CASE_SUNS; i++)
        cosine[i] = (double)i / (CASE_SUNS - 1);
    for (int e = 0; e <= CASE_LAYERS; e++)
        edge_km[e] = c->grid.edge[e] * 1e-5;
    Spectra *spectra;
    if (spectra_read(&spectra, m, data, case_data("wavelength-bins.csv", bins),
                     case_data("solar-irradiance.csv", sun), fault))
        return fault->code;
    Photolysis *photolysis;
    int code = photolysis_make(&photolysis, m, spectra, CASE_LAYERS, CASE_LAYERS, edge_km, c->air.temperature,
                               c->air.number_density, c->grid.depth, c->air.column_above_top, cosine,
                               CASE_SUNS, 0.3, fault);
    if (!code) {
        photolysis_rates(photolysis, c->start + mechanism_solved(m, "O3") * CASE_LAYERS,
                         c->start + mechanism_solved(m, "NO2") * CASE_LAYERS,
                         c->start + mechanism_solved(m, "NO") * CASE_LAYERS, 1.0, c->light);
        photolysis_free(photolysis);
        for (int r = 0; r < count; r++) {
            const Reaction *reaction = &m->reaction[m->photolysis_first + r];
            for (int i = 0; reaction->fixed_order && i < CASE_SUNS; i++)
                for (int l = 0; l < CASE_LAYERS; l++)
                    c->light[(i * count + r) * CASE_LAYERS + l] *=
                        reaction->fixed_share * pow(c->air.number_density[l], reaction->fixed_order);
        }
    }
    spectra_free(spectra);
    return code;
}

static inline void case_free(ChemistryCase *c)
{
    kernel_free(c->kernel);
    mechanism_free(c->mechanism);
    grid_free(&c->grid);
    air_free(&c->air);
    free(c->coefficient);
    free(c->light);
    free(c->start);
}

static inline int case_make(ChemistryCase *c, Fault *fault)
{
    char path[400];
    memset(c, 0, sizeof *c);
    if (mechanism_read(&c->mechanism, case_data("mechanism.cfg", path), fault))
        return fault->code;
    const Mechanism *m = c->mechanism;
    if (kernel_make(&c->kernel, m, fault) || grid_make(&c->grid, CASE_LAYERS, 1.0, NULL, 0, fault) ||
        air_standard(&c->air, &c->grid, fault))
        return fault->code;
    c->coefficient = case_array((size_t)m->reactions * CASE_LAYERS);
    c->light = case_array((size_t)CASE_SUNS * (size_t)(m->surface_first - m->photolysis_first) * CASE_LAYERS);
    c->start = case_array((size_t)m->solved * CASE_LAYERS);
    if (case_start(c, fault) || case_light(c, fault))
        return fault->code;
    double area[CASE_LAYERS], radius[CASE_LAYERS], washout[CASE_LAYERS];
    for (int l = 0; l < CASE_LAYERS; l++) {
        double km = c->grid.middle[l] * 1e-5;
        area[l] =
            1e-8 * exp(-fabs(km - 18.0) / 8.0); /* cm2 cm-3: 1 um2 cm-3 at 18 km, about the background */
        radius[l] = 0.17e-4;
        washout[l] = km < 16.0 ? 1e-6 : 0.0;
    }
    rates_thermal(m, CASE_LAYERS, c->air.temperature, c->air.number_density,
                  c->start + mechanism_solved(m, "H2O") * CASE_LAYERS, 0, c->coefficient);
    rates_washout(m, CASE_LAYERS, washout, c->coefficient);
    surface_rates(m, CASE_LAYERS, c->air.temperature, c->air.number_density, area, radius, c->start,
                  c->coefficient);
    return 0;
}

/* ---- the day ---- */

static inline double segment_length(int segment)
{
    return segment == 0 || segment == CASE_SEGMENTS - 1 ? 21600.0 : 1800.0;
}

/* Coefficient of one reaction on one layer at the start of a segment (end = 0) or at its end (end = 1). */
static inline double case_coefficient(const ChemistryCase *c, int reaction, int layer, int segment, int end)
{
    const Mechanism *m = c->mechanism;
    int r = reaction - m->photolysis_first, count = m->surface_first - m->photolysis_first;
    if (r < 0 || r >= count)
        return c->coefficient[reaction * CASE_LAYERS + layer];
    if (segment == 0 || segment == CASE_SEGMENTS - 1)
        return 0.0; /* night, dawn's first light counted as day */
    int knot = segment - 1 + end, sun = knot < CASE_SUNS ? knot : 2 * (CASE_SUNS - 1) - knot;
    return c->light[(sun * count + r) * CASE_LAYERS + layer];
}

/* Carry a pack of layers through the segments [first, last). y [kernel species][PACK]. Returns enum
 * SolverResult. */
static inline int pack_through(const ChemistryCase *c, SolverWork *work, const int layer[PACK],
                               PackProblem *problem, int first, int last, const Tolerance *tolerance,
                               SolverCounts *counts, int *where)
{
    const Mechanism *m = c->mechanism;
    double *k = case_array((size_t)m->reactions * PACK), *slope = case_array((size_t)m->reactions * PACK);
    int result = SOLVER_DONE;
    problem->k = k;
    problem->k_slope = slope;
    problem->slope_first = m->photolysis_first;
    problem->slope_last = m->surface_first;
    for (int segment = first; segment < last && result == SOLVER_DONE; segment++) {
        double length = segment_length(segment);
        for (int r = 0; r < m->reactions; r++)
            for (int l = 0; l < PACK; l++) {
                double start = case_coefficient(c, r, layer[l], segment, 0);
                k[r * PACK + l] = start;
                slope[r * PACK + l] = (case_coefficient(c, r, layer[l], segment, 1) - start) / length;
            }
        int night = segment == 0 || segment == CASE_SEGMENTS - 1;
        problem->k_slope = night ? NULL : slope;
        result = solver_advance(c->kernel, work, problem, length, tolerance, counts, where);
    }
    problem->k = problem->k_slope = NULL;
    free(k);
    free(slope);
    return result;
}

static inline void pack_start(const ChemistryCase *c, const int layer[PACK], double *y)
{
    memset(y, 0, (size_t)c->kernel->species * PACK * sizeof *y);
    for (int s = 0; s < c->mechanism->solved; s++)
        for (int l = 0; l < PACK; l++)
            y[s * PACK + l] = c->start[s * CASE_LAYERS + layer[l]];
}

/* ---- CVODE, one layer: equations and dense Jacobian read from the mechanism, not from the kernel ---- */

/* The equations packed tight, for CVODE is timed too. */
typedef struct {
    int solved, reactions;
    int (*reactant)[3];   /* [reactions], -1 where absent */
    int *first, *changed; /* changes of reaction r: [first[r], first[r + 1]) */
    double *change;
    double *k, *slope; /* [reactions] */
    double start;      /* s: time k is for */
} Oracle;

static inline Oracle oracle_make(const Mechanism *m)
{
    size_t reactions = (size_t)m->reactions;
    Oracle oracle = {m->solved,
                     m->reactions,
                     case_check(malloc(reactions * sizeof *oracle.reactant)),
                     case_check(malloc((reactions + 1) * sizeof(int))),
                     case_check(malloc(reactions * REACTION_CHANGES * sizeof(int))),
                     case_array(reactions * REACTION_CHANGES),
                     case_array(reactions),
                     case_array(reactions),
                     0.0};
    int count = 0;
    for (int r = 0; r < m->reactions; r++) {
        const Reaction *reaction = &m->reaction[r];
        oracle.first[r] = count;
        for (int i = 0; i < 3; i++)
            oracle.reactant[r][i] = i < reaction->reactants ? reaction->reactant[i] : -1;
        for (int i = 0; i < reaction->changes; i++) {
            oracle.changed[count] = reaction->changed[i];
            oracle.change[count++] = reaction->change[i];
        }
    }
    oracle.first[m->reactions] = count;
    return oracle;
}

static inline void oracle_free(Oracle *oracle)
{
    free(oracle->reactant);
    free(oracle->first);
    free(oracle->changed);
    free(oracle->change);
    free(oracle->k);
    free(oracle->slope);
}

static inline int oracle_tendency(realtype t, N_Vector at, N_Vector out, void *data)
{
    const Oracle *oracle = data;
    const double *y = NV_DATA_S(at);
    double *f = NV_DATA_S(out), elapsed = t - oracle->start;
    memset(f, 0, (size_t)oracle->solved * sizeof *f);
    for (int r = 0; r < oracle->reactions; r++) {
        const int *reactant = oracle->reactant[r];
        double rate = oracle->k[r] + elapsed * oracle->slope[r];
        for (int i = 0; i < 3 && reactant[i] >= 0; i++)
            rate *= y[reactant[i]];
        for (int i = oracle->first[r]; i < oracle->first[r + 1]; i++)
            f[oracle->changed[i]] += oracle->change[i] * rate;
    }
    return 0;
}

static inline int oracle_jacobian(realtype t, N_Vector at, N_Vector f, SUNMatrix matrix, void *data,
                                  N_Vector a, N_Vector b, N_Vector c)
{
    (void)f, (void)a, (void)b, (void)c;
    const Oracle *oracle = data;
    const double *y = NV_DATA_S(at);
    double elapsed = t - oracle->start;
    SUNMatZero(matrix);
    for (int r = 0; r < oracle->reactions; r++) {
        const int *reactant = oracle->reactant[r];
        for (int by = 0; by < 3 && reactant[by] >= 0; by++) {
            double rate = oracle->k[r] + elapsed * oracle->slope[r];
            for (int i = 0; i < 3 && reactant[i] >= 0; i++)
                if (i != by)
                    rate *= y[reactant[i]];
            double *column = SUNDenseMatrix_Column(matrix, reactant[by]);
            for (int i = oracle->first[r]; i < oracle->first[r + 1]; i++)
                column[oracle->changed[i]] += oracle->change[i] * rate;
        }
    }
    return 0;
}

static inline long cvode_steps(void *cvode)
{
    long steps = 0;
    CVodeGetNumSteps(cvode, &steps);
    return steps;
}

/* Carry y [solved] of one layer through a day; noon [solved] (may be NULL) receives the state at noon.
 * Returns the steps taken, or a negative number: CVODE's flag. */
static inline long cvode_day(const ChemistryCase *c, int layer, double *y, double *noon, double relative,
                             double absolute)
{
    const Mechanism *m = c->mechanism;
    Oracle oracle = oracle_make(m);
    SUNContext context;
    if (SUNContext_Create(NULL, &context))
        return -1;
    N_Vector state = N_VMake_Serial(m->solved, y, context);
    SUNMatrix matrix = SUNDenseMatrix(m->solved, m->solved, context);
    SUNLinearSolver solver = SUNLinSol_Dense(state, matrix, context);
    void *cvode = CVodeCreate(CV_BDF, context);
    long total = 0;
    int flag = CVodeInit(cvode, oracle_tendency, 0.0, state);
    if (!flag)
        flag = CVodeSStolerances(cvode, relative, absolute);
    if (!flag)
        flag = CVodeSetUserData(cvode, &oracle);
    if (!flag)
        flag = CVodeSetLinearSolver(cvode, solver, matrix);
    if (!flag)
        flag = CVodeSetJacFn(cvode, oracle_jacobian);
    if (!flag)
        flag = CVodeSetMaxNumSteps(cvode, 2000000);
    double now = 0.0;
    int tight = relative < 1e-7;
    for (int segment = 0; !flag && segment < CASE_SEGMENTS; segment++) {
        double length = segment_length(segment), end, reached;
        int night = segment == 0 || segment == CASE_SEGMENTS - 1;
        for (int r = 0; r < m->reactions; r++) {
            oracle.k[r] = case_coefficient(c, r, layer, segment, 0);
            oracle.slope[r] =
                night ? 0.0 : (case_coefficient(c, r, layer, segment, 1) - oracle.k[r]) / length;
        }
        /* Tight: afresh from t = 0 in every segment, for steps of 1e-12 s must be told from 0. Loose: afresh
         * at dawn and dusk, over which it trips, and on through the other kinks; no step reaches over one. */
        if (tight)
            now = 0.0;
        if (segment && (tight || night || segment == 1)) {
            total += cvode_steps(cvode);
            flag = CVodeReInit(cvode, now, state);
        }
        oracle.start = now;
        end = now + length;
        if (!flag)
            flag = CVodeSetStopTime(cvode, end);
        while (!flag && now < end) {
            flag = CVode(cvode, end, state, &reached, CV_NORMAL);
            if (flag == CV_TSTOP_RETURN)
                flag = 0;
            now = reached;
        }
        now = end;
        if (noon && segment == CASE_NOON - 1)
            memcpy(noon, y, (size_t)m->solved * sizeof *noon);
    }
    total += cvode_steps(cvode);
    CVodeFree(&cvode);
    SUNLinSolFree(solver);
    SUNMatDestroy(matrix);
    N_VDestroy(state);
    SUNContext_Free(&context);
    oracle_free(&oracle);
    return flag ? flag : total;
}

#endif
