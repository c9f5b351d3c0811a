/* column: everything a run is made of.
 *
 * Model is what does not change: settings, grid, air, mechanism, spectra, schedule, operators. It is built
 * once and shared. Column is what changes: mole fractions, rates, factors, and the ledger of what crossed the
 * borders. A Column is a value of its own; many can run side by side on one Model.
 */
#ifndef SKYMEND_COLUMN_H
#define SKYMEND_COLUMN_H

#include <stddef.h>

#include "../chem/kernel.h"
#include "../chem/mechanism.h"
#include "../chem/rosenbrock.h"
#include "../chem/spectra.h"
#include "../input/fault.h"
#include "../input/schedule.h"
#include "../input/settings.h"
#include "../transport/air.h"
#include "../transport/diffusion.h"
#include "../transport/grid.h"

/* The one place that knows the layout of fields over species (or reactions) and layers. */
#define FIELD(padded, row, layer) ((size_t)(row) * (size_t)(padded) + (size_t)(layer))

/* What the ground does with a gas: nothing; keeps the schedule's abundance (model_keeps), until emissions
 * take over, from when on they flow in (emission.h); keeps a value of the case; takes up. */
enum SurfaceKind { SURFACE_CLOSED, SURFACE_SCHEDULE, SURFACE_FIXED, SURFACE_DEPOSITION };

typedef struct Emissions Emissions;   /* what lines of the schedule give off: emission.h */
typedef struct Variation Variation;   /* what changes with time: variation.h */
typedef struct Conditions Conditions; /* what surrounds the chemistry at a moment: conditions.h */

typedef struct {
    Settings settings;
    Grid grid;
    Air air;      /* the base atmosphere: names altitudes and the mass of layers (conditions.h) */
    double *eddy; /* [layers + 1] eddy diffusion coefficient at edges, cm2 s-1 */
    Mechanism *mechanism;
    Kernel *kernel;
    Spectra *spectra;
    Schedule schedule;
    Diffusion *diffusion;
    double *aerosol_area;   /* [padded] cm2 cm-3 */
    double *aerosol_radius; /* [padded] cm */
    double *washout_rate;   /* [padded] s-1 of a fully soluble gas */

    /* ground condition by solved species */
    int *surface_kind;     /* [solved] enum SurfaceKind */
    int *surface_gas;      /* [solved] index in the schedule or -1 */
    double *surface_value; /* [solved] mole fraction (SURFACE_FIXED) or deposition velocity, cm s-1 (that of a
                              SURFACE_SCHEDULE gas acts when emissions drive it) */
    Emissions *emissions;

    /* held species: prescribed below the tropopause */
#define MODEL_HELD_MOST 3 /* H2O, OH, NO2 */
    int held;
    int *held_species;     /* [held] */
    double *held_free;     /* [held][padded] 1 free, 0 held */
    double *held_fraction; /* [held][padded] mole fraction where held, 0 where free */

    Variation *variation;
    Conditions *base; /* conditions of the case's own tables, before anything has changed */

    char *sources; /* citations of every table read, one a line */
} Model;

typedef struct {
    double *x;   /* [solved][padded] mole fraction, mol mol-1 (daily mean under factors, midnight in explicit
                    days) */
    double time; /* decimal years of 365.25 days; 1980.0 = start of 1980 */
    double
        *balance; /* [solved][padded] mole fraction s-1: the part of the transport that the chemistry of a run
                     of means sees, so that the two halves of a step need not undo each other (step.h) */

    /* ledger per solved species, molecules cm-2 since the start of the run */
    double *received;  /* through the ground by transport, incl. what keeping the surface value supplied */
    double *emitted;   /* put in by the schedule's emissions, at the ground and aloft */
    double *exchanged; /* given by the reservoirs that hold prescribed species (negative: taken) */
    double *washed;    /* removed by washout */
    double
        *escaped; /* [counters] atoms cm-2 of kernel->counter_element that left for fixed or inert species */
    double start_atoms[MECHANISM_ELEMENTS]; /* atoms cm-2 in the solved species when the ledger was opened */

    SolverCounts counts;
    long photolysis_refreshes, factor_refreshes, outer_steps;
    long days, unsettled; /* explicit days carried; refreshes whose day did not repeat within DAY_MOST */
} Column;

/* Build the model a case describes: reads every table. Owner: caller. */
int model_make(Model **made, const Settings *settings, Fault *fault);
void model_free(Model *model);
/* 1 when a table of the case prescribes solved species s below the tropopause. */
int model_holds(const Model *model, int solved);
/* 1 when some reaction makes more of solved species s than it takes. */
int model_makes(const Model *model, int solved);
/* 1 when the schedule gives emissions alone of solved species s and reactions make it too, so that it is in
 * the air without them (NO, HCl). CO2 counts as not made: next to nothing takes it out, and left alone it
 * would come to no rest. */
int model_made_anyway(const Model *model, int solved);
/* 1 when at decimal year time the ground keeps solved species s, which no table holds, at a value: its
 * abundance, that of the case, or 0 of a gas yet to be given off that is not made anyway. */
int model_keeps(const Model *model, int solved, double time);
/* Velocity, cm s-1, at which the ground takes solved species s up where it does not keep it; 0: it does not.
 */
double model_deposition(const Model *model, int solved);
/* Whether a run can start with the first year of the case: FAULT_INPUT, naming the row, when emissions have
 * driven a gas since before, whose abundance at the start nobody has said. */
int model_check_start(const Model *model, Fault *fault);
/* The same, and whether every layer of the schedule reaches into the years of the case (schedule_meets). */
int model_check_years(const Model *model, Fault *fault);

/* A column at the initial profiles with the surface values of the run's first year. */
int column_make(Column **made, const Model *model, Fault *fault);
void column_free(Column *column);
/* State, time, ledger and counts of from into to, both of this model. */
void column_copy(Column *to, const Column *from, const Model *model);

/* Empty the ledger and the counters: what happens from now on is accounted for. */
void column_open_ledger(const Model *model, Column *column);

/* Molecules cm-2 of solved species s; DU of ozone (above the ground, the part above the grid's top included
 * for ozone_column). */
double column_burden(const Model *model, const double *x, int solved);
double column_ozone_du(const Model *model, const double *x);
/* Atoms cm-2 of an element in all solved species, and atoms that entered by the ledger (received + emitted +
 * exchanged - washed - escaped). */
double column_atoms(const Model *model, const double *x, int element);
double column_ledger_atoms(const Model *model, const Column *column, int element);
/* (atoms now - atoms when the ledger was opened - ledger) / atoms now: 0 up to round-off, and 0 of no atoms
 * at all. */
double column_closure(const Model *model, const Column *column, int element);

#endif
