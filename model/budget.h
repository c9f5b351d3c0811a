/* budget: what makes and destroys ozone, what the gases turn into, and how long they live.
 *
 * Everything here is worked out of mean rates of reaction, cm-3 s-1, and mean mole fractions; nothing is
 * integrated. Shapes are those of column.h: fields are [row][padded].
 *
 * Odd oxygen. Ozone is followed within the family Ox, in which each species counts the O atoms that its light
 * or its next fast step gives back as O or O3 (Crutzen and Schmailzl 1983, Planet. Space Sci. 31, 1009;
 * Brasseur and Solomon 2005, Aeronomy of the Middle Atmosphere, chapter 5):
 *
 *     Ox = O3 + O + O(1D) + NO2 + 2 NO3 + 3 N2O5 + HNO3 + HO2NO2 + ClO + 2 OClO + 2 Cl2O2 + HOCl + 2 ClONO2
 *          + BrO + HOBr + 2 BrONO2
 *
 * The weight of a reaction is the net change of Ox in one event. It is taken from the equation, and for the
 * rate-limiting steps it is the usual one: NO2 + O -2, NO3 + hv -> NO + O2 -2, ClO + O -2, Cl2O2 + hv -> Cl +
 * ClOO -2, BrO + ClO -> Br + ClOO -2, O + O3 -2; O + OH, O + HO2, H + O3, HO2 + O3 -1 each; NO + O3, NO2 + hv
 * and ClO + NO 0. No reaction is named in the program: one that a user adds is counted by the same rules. A
 * new reservoir of odd oxygen is not (its making counts as a loss) until it is listed in budget.c.
 *
 * Families. A reaction that destroys Ox is charged to the first of these its reactants hold: bromine BrOx,
 * chlorine ClOx, nitrogen NOx, hydrogen HOx, none of them Ox. So the cycles that couple two families go to
 * the rarer element: BrO + ClO to BrOx, ClO + HO2 (by HOCl + hv) to ClOx, BrO + HO2 (by HOBr + hv) to BrOx.
 * One reaction serves several families: OH + O3 -> HO2 + O2 (-1). It is charged to what becomes of the HO2:
 * in proportion to the rates at which HO2 is lost, exchange with HO2NO2 left out. What meets NO undoes
 * itself, OH + O3 -> HO2, HO2 + NO -> NO2 + OH, NO2 + hv -> NO + O: with a the rate of OH + O3, b that of HO2
 * + NO and p the larger of all production and loss of HO2, a b / p of it is taken off both sides.
 *
 * Production. By O2 photolysis; and by oxidation of CO, CH4 and H2: peroxy radicals + NO (+1), less what
 * undoes itself. "Other" is all else that gives Ox (HNO3 + OH -> NO3, CO2 and NO photolysis, ...). The books
 * close: oxygen + oxidation + other - the losses is the net source of Ox to round-off.
 *
 * The method is the accounting by rate-limiting steps of Johnston and Podolske (1978, Rev. Geophys. 16,
 * 491), as used by Osterman et al. (1997, Geophys. Res. Lett. 24, 1107) and in WMO (1999), with the shared
 * step apportioned; how far such accounts can be taken: Lee et al. (2002, J. Geophys. Res. 107, 4110).
 * References from memory.
 */
#ifndef SKYMEND_BUDGET_H
#define SKYMEND_BUDGET_H

#include "step.h"

enum BudgetTerm {
    BUDGET_OXYGEN,    /* production by O2 photolysis */
    BUDGET_OXIDATION, /* production by peroxy radicals + NO */
    BUDGET_OTHER,     /* all other production */
    BUDGET_OX,        /* losses, positive, from here on */
    BUDGET_HOX,
    BUDGET_NOX,
    BUDGET_CLOX,
    BUDGET_BROX,
    BUDGET_WASHOUT, /* of reservoirs that hold Ox, below the tropopause; no catalytic family */
    BUDGET_TERMS
};
#define BUDGET_LOSS_FIRST BUDGET_OX

/* "Ox", "HOx", ... of a loss; "O2 photolysis", "oxidation", "other" of a production. */
const char *budget_term_name(int term);

/* How the reactions of a mechanism count. */
typedef struct {
    const Mechanism *mechanism; /* borrowed */
    double *content;            /* [solved] Ox in a species */
    double *weight;             /* [reactions] change of Ox per event */
    int *term;                  /* [reactions] enum BudgetTerm the weight goes to, -1: no weight */
    int shared;                 /* OH + O3 -> HO2, -1 when the mechanism has none */
    int *fate;                  /* [reactions] of HO2: its change per event, exchange with HO2NO2 0 */
    int *fate_term;             /* [reactions] family of a reaction that takes HO2, whatever it does to Ox */
    int *fate_null;             /* [reactions] 1: HO2 + NO */
} OxBook;

/* 1 when a mechanism has what a budget of Ox needs: O3 and the photolysis of O2. Otherwise *missing, where
 * that is not NULL, says what it lacks. */
int ox_book_possible(const Mechanism *mechanism, const char **missing);
/* FAULT_INPUT naming the mechanism's file when it is not possible. Owner: caller. */
int ox_book_make(OxBook **made, const Mechanism *mechanism, Fault *fault);
void ox_book_free(OxBook *book);

/* Rates of reaction, cm-3 s-1, [reactions][padded] out: coefficient times densities, times factor
 * [reactions][padded] where that is not NULL. air [padded] cm-3, x [solved][padded]. */
void budget_rates(const Model *model, const double *air, const double *x, const double *coefficient,
                  const double *factor, double *rate);
/* The mean rates of the stepper's last step: under factors and constant light from the mean mole fractions x,
 * in explicit days the integrals of the day. Layers are layers of mass (conditions.h): the rates given are
 * per cm3 of the base atmosphere, so that times Model.grid.depth they are per cm2 of column. */
void budget_step_rates(const Model *model, const Stepper *stepper, const double *x, double *rate);

/* Terms of the Ox budget, cm-3 s-1: term [BUDGET_TERMS][padded] and net [padded] out, all positive but net
 * and, where HO2 is far from balance or the mole fractions are negative, single terms. */
void budget_odd_oxygen(const OxBook *book, const Grid *grid, const double *rate, double *term, double *net);

/* Chain lengths [BUDGET_TERMS][padded] out: the Ox that a family destroys, in pairs, for each of its radicals
 * that is lost to a reservoir or another family, gross. Radicals: H, OH, HO2; N, NO, NO2, NO3; Cl, ClO, OClO,
 * ClOO, 2 Cl2O2, 2 Cl2, BrCl; Br, BrO, 2 Br2, BrCl. NAN in the rows of terms other than HOx, NOx, ClOx, BrOx,
 * which have none, and where no radical is lost. term as from budget_odd_oxygen. */
void budget_chain_lengths(const OxBook *book, const Grid *grid, const double *rate, const double *term,
                          double *chain);

/* ---- budget_gases.c ---- */

/* Total of a family, in atoms of its element per molecule of air. */
enum BudgetTotal { TOTAL_HOX, TOTAL_NOY, TOTAL_CLY, TOTAL_BRY, BUDGET_TOTALS };
const char *budget_total_name(int total); /* "HOx", "NOy", ... */
/* How much of the total a molecule of a species is: 0 when it is no member. NOy, Cly, Bry: atoms in species
 * without carbon, N2O left out. HOx: 1 for H, OH and HO2. */
int budget_member(const Mechanism *mechanism, int total, int solved);
/* Sum over the members, mole fraction [layers] out. */
void budget_total(const Model *model, const double *x, int total, double *sum);

/* Atoms of an element in the active species, cm-2: all, and those in source gases (with carbon, and N2O). */
void budget_atoms(const Model *model, const double *x, int element, double *all, double *sources);

enum GasLoss {
    LOSS_PHOTOLYSIS,
    LOSS_O1D,
    LOSS_OH,
    LOSS_CL,
    LOSS_OTHER,
    LOSS_WASHOUT,
    LOSS_GROUND,
    GAS_LOSSES
};
const char *budget_loss_name(int loss);

typedef struct {
    double burden;            /* molecules cm-2 in the grid */
    double loss[GAS_LOSSES];  /* molecules cm-2 s-1 by what takes them; LOSS_GROUND: deposition */
    double aloft[GAS_LOSSES]; /* the part above the tropopause of the case */
} GasBudget;

/* Gross losses of a species; kept: the ground keeps it at a value and takes none of it up; what makes it anew
 * is not taken off. */
void budget_gas(const Model *model, const double *x, const double *rate, int solved, int kept,
                GasBudget *gas);
/* Global burden over the sum of loss (gas->loss, gas->aloft, or one part of them, which the caller puts into
 * an array of count), in years of 365.25 days; infinite when nothing is lost. */
double budget_lifetime(const GasBudget *gas, const double *loss, int count);
/* 1 for a gas whose value the ground keeps, or keeps until emissions take over. */
int budget_is_source(const Model *model, int solved);

/* Linear in altitude between layer middles; beyond them the line of the last two goes on. */
double budget_at_km(const Model *model, const double *profile, double km);

/* Least-squares slope of y against x (mole fractions, [layers]) over the layers above the tropopause with low
 * <= x <= high: the relation of two long-lived gases in the lower stratosphere. Returns the number of layers;
 * below 3 the slope is NAN. */
int budget_slope(const Model *model, const double *x, const double *y, double low, double high,
                 double *slope);

#endif
