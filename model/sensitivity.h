/* sensitivity: what every parameter does to an answer of the settled column.
 *
 * The settled column solves F(x, p) = 0 (unsplit.h). For an answer Q(x, p) one solve of the transposed system
 *     A' m = -dQ/dx,   A = dF/dx   gives   dQ/dp = (dQ/dp at fixed x) + m' dF/dp
 * for all parameters p at once (the adjoint method). The derivative is that of the answer of the column
 * settled anew, the light's answer to ozone included; diurnal factors stay as they are.
 */
#ifndef SKYMEND_SENSITIVITY_H
#define SKYMEND_SENSITIVITY_H

#include "unsplit.h"

enum AnswerKind {
    ANSWER_COLUMN,   /* ozone column, DU */
    ANSWER_OZONE,    /* ozone at altitude_km, mol mol-1, linear between layer middles */
    ANSWER_LIFETIME, /* of species: burden over gross loss by chemistry and washout, years */
    ANSWER_FLUX      /* through the ground that keeps species at its value there, molecules cm-2 s-1 */
};

typedef struct {
    int kind;
    int species;        /* solved number; ANSWER_LIFETIME, ANSWER_FLUX */
    double altitude_km; /* ANSWER_OZONE */
} Answer;

typedef struct {
    Answer answer;
    double value;
    /* d(answer)/d(ln k) of the coefficient of each reaction in each layer; the sum over layers is that of a
     * coefficient wrong by the same factor everywhere. Thermal, photolysis, surface, washout.
     * [reactions][padded], 0 in padding lanes */
    double *reaction;
    double *surface; /* [solved] d(answer)/d(mole fraction kept by the ground); 0 where it keeps none */
    double *flux;    /* [solved] d(answer)/d(flux into the lowest layer, molecules cm-2 s-1), of species whose
                        ground keeps no value; for the others see sensitivity_per_flux */
    double *deposition;  /* [solved] d(answer)/d(ln deposition velocity) */
    double *held;        /* [solved] d(answer)/d(ln of the profile held below the tropopause) */
    double *eddy;        /* [layers + 1] d(answer)/d(ln K) at each edge */
    double *temperature; /* [layers] K, of the settled column */
} Sensitivity;

/* "column", "O3@40", "lifetime:N2O", "flux:CFC-11". FAULT_INPUT names what there is. */
int answer_read(Answer *answer, const char *text, const Model *model, Fault *fault);
/* As answer_read takes it; text [60]. */
void answer_name(const Answer *answer, const Model *model, char *text, size_t size);
/* Unit of the value, and of the derivatives. */
const char *answer_unit(const Answer *answer);
/* At the state x of unsplit's last evaluation. */
double answer_value(const Unsplit *unsplit, const double *x, const Answer *answer);

/* Evaluate and factor at the settled state x [solved][padded], slopes of the light included: once for all
 * answers. */
int sensitivity_prepare(Unsplit *unsplit, const double *x, Fault *fault);
/* After sensitivity_prepare at the same x. Owner: caller. */
int sensitivity_make(Sensitivity **made, const Unsplit *unsplit, const double *x, const Answer *answer,
                     Fault *fault);
void sensitivity_free(Sensitivity *sensitivity);

/* d(answer)/d(flux of species s, molecules cm-2 s-1) were the flux given and not the value at the ground, all
 * other grounds as they are. Where the ground keeps no value this is flux[s]; where it does,
 *     (d answer / d value) / (d flux / d value),
 * the divisor by an adjoint solve of its own: exact where the gas feeds back on its own lifetime, and right
 * for a gas of which there is none yet. FAULT_INPUT when the ground's flux does not depend on the value. */
int sensitivity_per_flux(const Unsplit *unsplit, const double *x, const Sensitivity *sensitivity, int s,
                         double *derivative, Fault *fault);

/* Sum over layers of reaction r; with_uncertainty: each layer times ln f(T), f(T) = f exp|g (1/T - 1/298)| of
 * the mechanism: what the answer moves by when the coefficient is one standard uncertainty high at all
 * altitudes. A fall-off reaction moves the one that is its exact reverse along with itself. 0 without f. */
double sensitivity_reaction(const Sensitivity *sensitivity, const Model *model, int r, int with_uncertainty);

#endif
