/* validate: what the parts of the validation program share. Private to tests/validate*.c.
 *
 * The program runs the baseline projection, compares what can be compared with tests/published-values.csv and
 * tests/published-more.csv and measures the numerical errors that take too long for make test. Results on
 * standard output, progress on standard error. It judges and explains; it adjusts nothing.
 */
#ifndef SKYMEND_VALIDATE_H
#define SKYMEND_VALIDATE_H

#include <stddef.h>

#include "../model/budget.h"
#include "../model/conversion.h"
#include "../model/potency.h"
#include "../model/projection.h"

/* ---- validate_run.c: a run kept in memory ---- */

typedef struct {
    Model *model; /* owned */
    int first_year, years;
    size_t field;   /* solved * padded */
    double *time;   /* [years] middle of the year */
    double *column; /* [years] ozone column, DU */
    double *x;      /* [years][solved][padded] mean mole fractions of the year */
    long solver_steps, photolysis_refreshes, factor_refreshes;
    double seconds; /* wall */
} Run;

/* Run the years of settings, one record a year, and keep every record. start: [solved][padded] state to begin
 * with, or NULL for the initial profiles. what leads the progress lines. On a fault *run is zeroed. Owner:
 * caller, run_free. */
int run_years(Run *run, const Settings *settings, const double *start, const char *what, Fault *fault);
void run_free(Run *run);
/* Mean mole fractions of a calendar year, [solved][padded]; the year must lie in the run. */
const double *run_fields(const Run *run, int year);
/* Mean ozone column of calendar years first..last, DU. */
double run_column(const Run *run, int first, int last);

/* A column with what carries it. */
typedef struct {
    Column *column;
    Stepper *stepper;
} Carried;

/* At x [solved][padded], or the initial profiles when x is NULL, at decimal year time. The model must outlive
 * it. Owner: caller, carried_free, which accepts a zeroed one. */
int carried_make(Carried *carried, const Model *model, const double *x, double time, Fault *fault);
void carried_free(Carried *carried);

/* ---- validate_settled.c: columns at rest with something changed ---- */

/* Factors. chlorine: of all gases with chlorine and without bromine that the ground keeps; n2o and ch4 at the
 * ground; aerosol: of the surface; eddy: of the eddy diffusion coefficient. */
typedef struct {
    double chlorine, n2o, ch4, aerosol, eddy;
} Change;
#define CHANGE_NOTHING                                                                                       \
    {                                                                                                        \
        1.0, 1.0, 1.0, 1.0, 1.0                                                                              \
    }

typedef struct {
    Model *model;                /* owned, changed */
    double *x;                   /* [solved][padded] daily means, owned */
    double column;               /* ozone, DU */
    double ozone_40, cly_50;     /* mole fractions at 40 and 50 km */
    double life_n2o, life_cfc11; /* years, all loss */
} Settled;

/* The column of settings at rest under the changed surface values of the middle of a year; explicit days as
 * diurnal factors. start [solved][padded] or NULL: where Newton's method begins. Owner: caller, settled_free.
 */
int settled_make(Settled *settled, const Settings *from, const Change *change, int year, const double *start,
                 Fault *fault);
void settled_free(Settled *settled);

/* ---- validate_perturb.c: known perturbations ---- */

#define PERTURBED_STATES 13
typedef struct {
    double column, ozone_40, cly_50; /* as in Settled */
    double chlorine;                 /* as in Change */
} PerturbedState;
typedef struct {
    PerturbedState state[PERTURBED_STATES];
} Perturbed;

/* Settle them all, temperature fixed. */
int perturb_all(Perturbed *perturbed, const Settings *from, Fault *fault);

/* ---- validate_emission.c: emissions ---- */

typedef struct {
    Model *model;        /* of both conversions, coarser than the baseline; owned */
    Conversion *implied; /* emissions by the case's abundances; owned */
    Conversion *led;     /* abundances by tests/cfc11-emissions.csv from 1955 on; owned */
    double feedback_n2o; /* d ln burden / d ln flux of the column at rest */
} EmissionEvidence;

/* Carry the case from 1955 on, both ways; look at N2O beside the column at rest x [solved][padded] of model
 * and stepper. Owner: caller, emissions_evidence_free, also after a fault. */
int emissions_measure(EmissionEvidence *evidence, const Settings *from, const Model *model,
                      const Stepper *stepper, const double *x, Fault *fault);
void emissions_evidence_free(EmissionEvidence *evidence);

/* ---- validate_rows.c: the published values ---- */

typedef struct {
    const Run *run; /* the baseline, all years */
    /* the same column at rest under the surface values of STEADY_YEAR: */
    const Stepper *stepper; /* with its light, coefficients and factors */
    const double *x;        /* [solved][padded] mole fractions, daily means */
    const double *rate;     /* [reactions][padded] rates of reaction, cm-3 s-1 */
    const double *term;     /* [BUDGET_TERMS][padded] its budget of odd oxygen, cm-3 s-1 */
    const Perturbed *perturbed;
    /* and of the column at rest under the same values: */
    const Potencies *potencies; /* factors made anew */
    const EmissionEvidence *emissions;
} Evidence;

#define STEADY_YEAR 2000 /* the conditions of the published lifetimes (SPARC Report 6, 2013) */

enum RowState { ROW_COMPUTED, ROW_LATER };
#define ROW_NOTE 160

/* The model's value of one row. conditions is the row's own text; *state tells whether value and note hold.
 * FAULT_INPUT for an id nothing is known of. note: [ROW_NOTE] how it was taken. */
int row_compute(const Evidence *evidence, const char *id, const char *conditions, int *state, double *value,
                char *note, Fault *fault);

/* validate_perturb.c: the model's value of a row of a perturbation; -1 for any other id. */
int row_perturbed(const Evidence *evidence, const char *id, double *value, char *note);

/* ---- validate_moments.c: ratios near noon ---- */

/* The model's value of a row "noon-A/B-KM"; -1 for any other id. note as in row_compute. */
int row_moments(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault);

/* ---- validate_chlorine.c: equivalent chlorine ---- */

/* The model's value of a row "eesc-1980-mid" or "eesc-1980-polar"; -1 for any other id. note as in
 * row_compute. */
int row_chlorine(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault);

/* ---- validate_potency.c: depletion potentials ---- */

/* Settle the column at STEADY_YEAR and look beside it. Owner: caller. */
int potencies_measure(const Model *model, Potencies **made, Fault *fault);
/* The model's value of a row "odp-GAS"; -1 for any other id. note as in row_compute. */
int row_potency(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault);

/* ---- validate_ultraviolet.c: ultraviolet ---- */

/* The model's value of a row "uv-toa-...", "uv-raf" or "uvi-overhead"; -1 for any other id. note as in
 * row_compute.
 */
int row_ultraviolet(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault);

/* validate_emission.c: the model's value of a row "led-...", "implied-...", "feedback-..." or "air-mass"; -1
 * for any other id. note as in row_compute. */
int row_emission(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault);

/* ---- validate_numerics.c: the size of the numerical errors ---- */

typedef struct {
    const char *id, *what, *unit;
    double value, limit; /* fails when above limit, what the program promises; infinite: reported alone */
    char note[ROW_NOTE];
} NumericRow;

/* validate_unsplit.c: split less unsplit after years from the settled first_year, under the schedule: ozone
 * column, DU, and the largest relative difference of ozone in a layer and its altitude. */
int splitting_error(const Settings *from, int first_year, int years, double *column_du, double *layer,
                    double *altitude_km, Fault *fault);

/* validate_settled.c: what grid and mixing do to the settled column; rows are added. */
int settled_rows(const Settings *settings, NumericRow *rows, int *count, Fault *fault);

#define NUMERIC_MOST 48
/* Measure them all; returns a fault's code. rows [NUMERIC_MOST], count out. */
int numerics_measure(const Run *baseline, NumericRow *rows, int *count, Fault *fault);

#endif
