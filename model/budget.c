/* budget: odd oxygen by family, chain lengths. */
#include "budget.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

static const struct {
    const char *species;
    double content;
} odd_oxygen[] = {{"O3", 1},     {"O", 1},      {"O(1D)", 1}, {"NO2", 1},   {"NO3", 2},   {"N2O5", 3},
                  {"HNO3", 1},   {"HO2NO2", 1}, {"ClO", 1},   {"OClO", 2},  {"Cl2O2", 2}, {"HOCl", 1},
                  {"ClONO2", 2}, {"BrO", 1},    {"HOBr", 1},  {"BrONO2", 2}};

/* Radicals of the families, for the chain lengths. */
static const struct {
    const char *species;
    int term;
    double count;
} radicals[] = {{"H", BUDGET_HOX, 1},     {"OH", BUDGET_HOX, 1},    {"HO2", BUDGET_HOX, 1},
                {"N", BUDGET_NOX, 1},     {"NO", BUDGET_NOX, 1},    {"NO2", BUDGET_NOX, 1},
                {"NO3", BUDGET_NOX, 1},   {"Cl", BUDGET_CLOX, 1},   {"ClO", BUDGET_CLOX, 1},
                {"OClO", BUDGET_CLOX, 1}, {"ClOO", BUDGET_CLOX, 1}, {"Cl2O2", BUDGET_CLOX, 2},
                {"Cl2", BUDGET_CLOX, 2},  {"BrCl", BUDGET_CLOX, 1}, {"Br", BUDGET_BROX, 1},
                {"BrO", BUDGET_BROX, 1},  {"Br2", BUDGET_BROX, 2},  {"BrCl", BUDGET_BROX, 1}};

const char *budget_term_name(int term)
{
    static const char *const names[BUDGET_TERMS] = {"O2 photolysis", "oxidation", "other", "Ox",     "HOx",
                                                    "NOx",           "ClOx",      "BrOx",  "washout"};
    return names[term];
}

/* ---- how reactions count ---- */

static double change_of(const Reaction *reaction, int species)
{
    double sum = 0.0;
    for (int c = 0; c < reaction->changes; c++)
        if (reaction->changed[c] == species)
            sum += reaction->change[c];
    return sum;
}

static int takes(const Reaction *reaction, int species)
{
    for (int i = 0; i < reaction->reactants; i++)
        if (reaction->reactant[i] == species)
            return 1;
    return 0;
}

static int holds(const Mechanism *mechanism, const Reaction *reaction, const char *symbol)
{
    int element = mechanism_element(mechanism, symbol);
    for (int i = 0; element >= 0 && i < reaction->reactants; i++)
        if (mechanism_atoms(mechanism, reaction->reactant[i], element))
            return 1;
    return 0;
}

static int family(const Mechanism *mechanism, const Reaction *reaction)
{
    return holds(mechanism, reaction, "Br")   ? BUDGET_BROX
           : holds(mechanism, reaction, "Cl") ? BUDGET_CLOX
           : holds(mechanism, reaction, "N")  ? BUDGET_NOX
           : holds(mechanism, reaction, "H")  ? BUDGET_HOX
                                              : BUDGET_OX;
}

static int loss(const Mechanism *mechanism, const Reaction *reaction)
{
    return reaction->kind == REACTION_WASHOUT ? BUDGET_WASHOUT : family(mechanism, reaction);
}

static int production(const Mechanism *mechanism, const Reaction *reaction, int nitric_oxide)
{
    if (reaction->special == SPECIAL_O2 || reaction->special == SPECIAL_O2_O1D)
        return BUDGET_OXYGEN;
    return takes(reaction, nitric_oxide) && holds(mechanism, reaction, "H") ? BUDGET_OXIDATION : BUDGET_OTHER;
}

static void count_reactions(OxBook *book)
{
    const Mechanism *mechanism = book->mechanism;
    int nitric_oxide = mechanism_solved(mechanism, "NO"), ozone = mechanism_solved(mechanism, "O3");
    int hydroxyl = mechanism_solved(mechanism, "OH"), peroxy = mechanism_solved(mechanism, "HO2");
    int reservoir = mechanism_solved(mechanism, "HO2NO2");
    book->shared = -1;
    for (int r = 0; r < mechanism->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        double weight = 0.0;
        for (int c = 0; c < reaction->changes; c++)
            weight += reaction->change[c] * book->content[reaction->changed[c]];
        book->weight[r] = weight;
        book->term[r] = weight < 0.0   ? loss(mechanism, reaction)
                        : weight > 0.0 ? production(mechanism, reaction, nitric_oxide)
                                       : -1;
        if (peroxy < 0 || change_of(reaction, peroxy) == 0.0 ||
            (reservoir >= 0 && change_of(reaction, reservoir) != 0.0))
            continue;
        book->fate[r] = (int)change_of(reaction, peroxy);
        book->fate_term[r] = family(mechanism, reaction);
        book->fate_null[r] = takes(reaction, nitric_oxide);
        if (takes(reaction, hydroxyl) && takes(reaction, ozone) && weight < 0.0)
            book->shared = r;
    }
}

int ox_book_possible(const Mechanism *mechanism, const char **missing)
{
    const char *lacks = "photolysis of O2 (special = \"O2\")";
    for (int r = 0; r < mechanism->reactions; r++)
        if (mechanism->reaction[r].special == SPECIAL_O2)
            lacks = NULL;
    if (mechanism_solved(mechanism, "O3") < 0)
        lacks = "active species O3";
    if (missing)
        *missing = lacks;
    return lacks == NULL;
}

int ox_book_make(OxBook **made, const Mechanism *mechanism, Fault *fault)
{
    *made = NULL;
    const char *missing;
    if (!ox_book_possible(mechanism, &missing))
        return fault_at(fault, mechanism->path ? mechanism->path : "mechanism", 0,
                        "no %s: there is no budget of odd oxygen without; add it", missing);
    OxBook *book = calloc(1, sizeof *book);
    if (!book)
        return fault_memory(fault, "the budget of odd oxygen");
    size_t reactions = (size_t)mechanism->reactions;
    book->mechanism = mechanism;
    book->content = calloc((size_t)mechanism->solved, sizeof(double));
    book->weight = calloc(reactions, sizeof(double));
    book->term = calloc(4 * reactions, sizeof(int));
    if (!book->content || !book->weight || !book->term) {
        ox_book_free(book);
        return fault_memory(fault, "the budget of odd oxygen");
    }
    book->fate = book->term + reactions;
    book->fate_term = book->fate + reactions;
    book->fate_null = book->fate_term + reactions;
    for (size_t i = 0; i < sizeof odd_oxygen / sizeof *odd_oxygen; i++) {
        int s = mechanism_solved(mechanism, odd_oxygen[i].species);
        if (s >= 0)
            book->content[s] = odd_oxygen[i].content;
    }
    count_reactions(book);
    *made = book;
    return 0;
}

void ox_book_free(OxBook *book)
{
    if (!book)
        return;
    free(book->content);
    free(book->weight);
    free(book->term);
    free(book);
}

/* ---- rates ---- */

void budget_rates(const Model *model, const double *air, const double *x, const double *coefficient,
                  const double *factor, double *rate)
{
    const Mechanism *mechanism = model->mechanism;
    int padded = model->grid.padded;
#pragma omp parallel for schedule(static)
    for (int r = 0; r < mechanism->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        size_t row = FIELD(padded, r, 0);
        for (int l = 0; l < padded; l++)
            rate[row + (size_t)l] = coefficient[row + (size_t)l] * (factor ? factor[row + (size_t)l] : 1.0);
        for (int i = 0; i < reaction->reactants; i++) {
            const double *fraction = x + FIELD(padded, reaction->reactant[i], 0);
            for (int l = 0; l < padded; l++)
                rate[row + (size_t)l] *= fraction[l] * air[l];
        }
    }
}

void budget_step_rates(const Model *model, const Stepper *stepper, const double *x, double *rate)
{
    const Day *day = stepper_day(stepper);
    size_t size = (size_t)model->mechanism->reactions * (size_t)model->grid.padded;
    const double *now = stepper_conditions(stepper)->air;
    size_t padded = (size_t)model->grid.padded;
    if (model->settings.day == DAY_EXPLICIT)
        for (size_t i = 0; i < size; i++)
            rate[i] = day->sum_w[i] / DAY_SECONDS;
    else
        budget_rates(model, now, x, stepper_coefficients(stepper),
                     model->settings.day == DAY_FACTORS ? day->factor : NULL, rate);
    for (size_t i = 0; i < size; i++)
        rate[i] *= model->air.number_density[i % padded] / now[i % padded];
}

/* ---- odd oxygen ---- */

/* Gives back the part of OH + O3 in one layer that HO2 + NO undoes, charges the rest to the families. */
static void apportion(const OxBook *book, int padded, int layer, const double *rate, double *term)
{
    double made = 0.0, lost = 0.0, undone = 0.0, taken = 0.0, by[BUDGET_TERMS] = {0};
    for (int r = 0; r < book->mechanism->reactions; r++) {
        double change = book->fate[r] * rate[FIELD(padded, r, layer)];
        if (book->fate[r] > 0) {
            made += change;
        } else if (book->fate[r] < 0) {
            lost -= change;
            if (book->fate_null[r])
                undone -= change;
            else {
                taken -= change;
                by[book->fate_term[r]] -= change;
            }
        }
    }
    double whole = -book->weight[book->shared] * rate[FIELD(padded, book->shared, layer)];
    double most = made > lost ? made : lost, null = most > 0.0 ? whole * undone / most : 0.0;
    term[FIELD(padded, BUDGET_OXIDATION, layer)] -= null;
    if (!(taken > 0.0))
        term[FIELD(padded, BUDGET_HOX, layer)] += whole - null;
    for (int t = BUDGET_LOSS_FIRST; taken > 0.0 && t < BUDGET_TERMS; t++)
        term[FIELD(padded, t, layer)] += (whole - null) * by[t] / taken;
}

void budget_odd_oxygen(const OxBook *book, const Grid *grid, const double *rate, double *term, double *net)
{
    int padded = grid->padded;
    memset(term, 0, BUDGET_TERMS * (size_t)padded * sizeof(double));
    memset(net, 0, (size_t)padded * sizeof(double));
    for (int r = 0; r < book->mechanism->reactions; r++) {
        if (book->term[r] < 0)
            continue;
        double *sum = term + FIELD(padded, book->term[r], 0), weight = book->weight[r];
        const double *events = rate + FIELD(padded, r, 0);
        for (int l = 0; l < padded; l++) {
            net[l] += weight * events[l];
            if (r != book->shared)
                sum[l] += fabs(weight) * events[l];
        }
    }
    for (int l = 0; book->shared >= 0 && l < padded; l++)
        apportion(book, padded, l, rate, term);
}

/* ---- chain lengths ---- */

void budget_chain_lengths(const OxBook *book, const Grid *grid, const double *rate, const double *term,
                          double *chain)
{
    const Mechanism *mechanism = book->mechanism;
    int padded = grid->padded;
    for (int t = 0; t < BUDGET_TERMS; t++) {
        double *lost = chain + FIELD(padded, t, 0);
        memset(lost, 0, (size_t)padded * sizeof(double));
        for (int r = 0; r < mechanism->reactions; r++) {
            double change = 0.0;
            for (size_t i = 0; i < sizeof radicals / sizeof *radicals; i++) {
                int s = mechanism_solved(mechanism, radicals[i].species);
                if (s >= 0 && radicals[i].term == t)
                    change += radicals[i].count * change_of(&mechanism->reaction[r], s);
            }
            for (int l = 0; change < 0.0 && l < padded; l++)
                lost[l] -= change * rate[FIELD(padded, r, l)];
        }
        for (int l = 0; l < padded; l++)
            lost[l] = lost[l] > 0.0 ? 0.5 * term[FIELD(padded, t, l)] / lost[l] : NAN;
    }
}
