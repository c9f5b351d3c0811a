/* potency: columns beside the settled one. */
#include "potency.h"

#include <math.h>
#include <omp.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* Chord iterations of one settling, and the change of a density at which it ends: while factors are still to
 * change, and in the end. */
static const int CHORDS = 40;
static const double CHANGE_BETWEEN = 1e-4, CHANGE_LAST = 1e-8;

typedef struct {
    Unsplit *unsplit;
    Stepper *stepper;
    Column *column;
    const Watcher *watcher;
    Sensitivity *of_column;
    double ozone, change; /* DU */
    double unsettled;
    double *base;  /* [solved][padded] the settled state */
    double *along; /* [unknowns] dx/d(parameter) of the gas at hand, factors frozen */
    double *step;  /* [unknowns] work */
} Work;

/* ---- which gases ---- */

static int feeds_a_family(const Mechanism *mechanism, int s)
{
    for (int e = 0; e < mechanism->elements; e++) {
        const char *symbol = mechanism->element[e];
        if (strcmp(symbol, "C") && strcmp(symbol, "O") && strcmp(symbol, "F") &&
            mechanism_atoms(mechanism, s, e) > 0)
            return 1;
    }
    return 0;
}

int potency_gases(const Model *model, int *gas)
{
    const Mechanism *mechanism = model->mechanism;
    int count = 0;
    for (int s = 0; s < mechanism->solved; s++) {
        int carried = mechanism->item[mechanism->solved_item[s]].transport != 0;
        if (carried && !model_holds(model, s) && feeds_a_family(mechanism, s) &&
            (budget_is_source(model, s) || !model_makes(model, s)))
            gas[count++] = s;
    }
    return count;
}

/* ---- settling beside ---- */

static size_t field(const Work *work)
{
    return (size_t)work->unsplit->solved * (size_t)work->unsplit->model->grid.padded;
}

static int not_settled(const Work *work, int s, const char *why, Fault *fault)
{
    return fault_set(fault, FAULT_NUMERICS,
                     "the column with a little more or less of %s does not come to rest: %s; check the case, "
                     "or take --adjoint",
                     mechanism_name(work->unsplit->model->mechanism, s), why);
}

/* Settle column->x at the factors of unsplit, by the matrix of the settled column. */
static int chord(Work *work, int s, double enough, Fault *fault)
{
    Unsplit *unsplit = work->unsplit;
    double *x = work->column->x;
    int padded = unsplit->model->grid.padded, solved = unsplit->solved;
    unsplit_keep(unsplit, x);
    for (int i = 0; i < CHORDS; i++) {
        double change = 0.0;
        unsplit_evaluate(unsplit, x, work->step, 0);
        unsplit_solve(unsplit, work->step, 0);
        for (int u = 0; u < unsplit->unknowns; u++) {
            double *at = &x[FIELD(padded, u % solved, u / solved)];
            double scarce = STEADY_SCARCE / unsplit->conditions->air[u / solved];
            double moved = fabs(work->step[u]) / fmax(fabs(*at), scarce);
            if (!(moved <= change))
                change = moved;
            *at -= work->step[u];
        }
        unsplit_keep(unsplit, x);
        if (change <= enough)
            return 0;
        if (!isfinite(change))
            break;
    }
    return not_settled(work, s, "the iteration does not converge", fault);
}

static int stopped(const Work *work, Fault *fault)
{
    if (work->watcher->stop && *work->watcher->stop)
        return fault_set(fault, FAULT_INTERRUPTED, "interrupted; nothing was written");
    return 0;
}

/* Factors and state in turns; *moved: DU that the column moved in the last. */
static int settle_beside(Work *work, int s, double *moved, Fault *fault)
{
    Unsplit *unsplit = work->unsplit;
    double last = column_ozone_du(unsplit->model, work->column->x);
    *moved = 0.0;
    for (int turn = 0; unsplit->has_factors; turn++) {
        if (stopped(work, fault) || stepper_refresh(work->stepper, work->column, 1, fault))
            return fault->code;
        unsplit_take_factors(unsplit, stepper_day(work->stepper));
        if (chord(work, s, CHANGE_BETWEEN, fault))
            return fault->code;
        double now = column_ozone_du(unsplit->model, work->column->x);
        *moved = fabs(now - last);
        last = now;
        if (turn > 0 && *moved <= POTENCY_TURN * fabs(now - work->ozone))
            break;
        if (turn == POTENCY_TURNS)
            return not_settled(work, s, "its diurnal factors still move the column", fault);
    }
    return stopped(work, fault) ? fault->code : chord(work, s, CHANGE_LAST, fault);
}

/* ---- one gas ---- */

/* What chemistry and washout take of s in the whole column, less what they make, and deposition: at rest what
 * comes through the ground, without the cancellation of transport between the two lowest layers. */
static double net_loss(const Work *work, int s)
{
    const Unsplit *unsplit = work->unsplit;
    const Model *model = unsplit->model;
    double loss = unsplit->kept[s] ? 0.0
                                   : unsplit->deposit[s] * model->air.number_density[0] *
                                         work->column->x[FIELD(model->grid.padded, s, 0)];
    for (int r = 0; r < model->mechanism->reactions; r++) {
        const Reaction *reaction = &model->mechanism->reaction[r];
        for (int c = 0; c < reaction->changes; c++)
            for (int l = 0; reaction->changed[c] == s && l < unsplit->layers; l++)
                loss -= reaction->change[c] * unsplit->rate[FIELD(model->grid.padded, r, l)] *
                        unsplit->conditions->depth[l];
    }
    return loss;
}

/* Molecules cm-2 s-1 that the schedule's lines give, at the ground and aloft. */
static double given_off(const Unsplit *unsplit, int s)
{
    double sum = 0.0;
    for (int l = 0; l < unsplit->layers; l++)
        sum += unsplit->given[l * unsplit->solved + s];
    return sum;
}

/* The parameter: value at the ground, or the flux on top of the schedule's where none is kept. */
static void put_parameter(Unsplit *unsplit, int s, double value)
{
    if (unsplit->kept[s])
        unsplit->value[s] = value;
    else
        unsplit_emit(unsplit, s, value);
}

/* Column and flux with the parameter shifted by shift. */
static int look_beside(Work *work, int s, double value, double shift, double *column, double *flux,
                       double *moved, Fault *fault)
{
    Unsplit *unsplit = work->unsplit;
    int padded = unsplit->model->grid.padded, solved = unsplit->solved;
    memcpy(work->column->x, work->base, field(work) * sizeof(double));
    for (int i = 0; i < unsplit->unknowns; i++)
        work->column->x[FIELD(padded, i % solved, i / solved)] += shift * work->along[i];
    put_parameter(unsplit, s, value + shift);
    int code = settle_beside(work, s, moved, fault);
    *column = column_ozone_du(unsplit->model, work->column->x);
    *flux = unsplit->kept[s] ? net_loss(work, s) : value + shift + given_off(unsplit, s);
    put_parameter(unsplit, s, value);
    return code;
}

/* dx/d(parameter) at frozen factors, by the factored matrix of the settled state. */
static void find_direction(Work *work, int s)
{
    const Unsplit *unsplit = work->unsplit;
    memset(work->along, 0, (size_t)unsplit->unknowns * sizeof(double));
    work->along[s] = unsplit->kept[s] ? -1.0 : -1.0 / unsplit->mass[0];
    unsplit_solve(unsplit, work->along, 0);
}

static int make_anew(Work *work, Potency *gas, Fault *fault)
{
    Unsplit *unsplit = work->unsplit;
    int s = gas->species;
    double per_parameter = unsplit->kept[s] ? work->of_column->surface[s] : work->of_column->flux[s];
    double value = unsplit->kept[s] ? unsplit->value[s] : unsplit->emission[s];
    gas->anew = gas->noise = gas->bend = 0.0;
    if (!(fabs(per_parameter) > 0.0))
        return 0; /* nothing that it makes or takes has to do with ozone */
    find_direction(work, s);
    double most = fmax(POTENCY_MOST, 0.5 * gas->abundance) / fabs(work->along[s]);
    double shift = fmin(work->change / fabs(per_parameter), most);
    int central = shift * fabs(work->along[s]) <= 0.5 * gas->abundance;
    double shifts[2] = {shift, central ? -shift : 2.0 * shift}, column[2], flux[2], moved[2];
    for (int i = 0; i < 2; i++) {
        if (look_beside(work, s, value, shifts[i], &column[i], &flux[i], &moved[i], fault))
            return fault->code;
        column[i] -= work->ozone;
        flux[i] -= gas->flux;
        moved[i] = fmax(moved[i], work->unsettled);
    }
    double weight[2] = {flux[1] / (flux[0] * (flux[1] - flux[0])),
                        -flux[0] / (flux[1] * (flux[1] - flux[0]))};
    gas->anew = weight[0] * column[0] + weight[1] * column[1];
    gas->noise = (fabs(weight[0]) * moved[0] + fabs(weight[1]) * moved[1] +
                  fabs(weight[0] + weight[1]) * work->unsettled) /
                 fabs(gas->anew);
    gas->bend = 0.5 * fabs((column[0] / flux[0] - column[1] / flux[1]) / gas->anew);
    if (!isfinite(gas->anew))
        return not_settled(work, s, "its flux through the ground does not answer to its value there", fault);
    return 0;
}

/* ---- all of them ---- */

static void show(const Work *work, double share)
{
    if (!work->watcher->progress)
        return;
    const Progress progress = {.time = work->column->time, .share = share, .column_du = work->ozone};
    work->watcher->progress(work->watcher->context, &progress);
}

/* The settled column to the last that can be had, since differences are taken from it; then its adjoint. */
static int prepare(Work *work, Fault *fault)
{
    Unsplit *unsplit = work->unsplit;
    const Model *model = unsplit->model;
    const Answer column = {.kind = ANSWER_COLUMN};
    SteadyReport steady;
    double *x = work->column->x;
    int code = stopped(work, fault);
    if (!code)
        code = steady_tighten(unsplit, work->stepper, work->column, POTENCY_BASE, &steady, fault);
    double before = column_ozone_du(model, x);
    if (!code)
        code = steady_tighten(unsplit, work->stepper, work->column, POTENCY_BASE, &steady, fault);
    work->ozone = column_ozone_du(model, x);
    work->unsettled = unsplit->has_factors ? fabs(work->ozone - before) : 0.0;
    if (!code)
        code = stopped(work, fault);
    if (!code)
        code = sensitivity_prepare(unsplit, x, fault);
    if (!code)
        code = sensitivity_make(&work->of_column, unsplit, x, &column, fault);
    memcpy(work->base, x, field(work) * sizeof(double));
    return code;
}

/* What the settled column tells of a gas. rate [reactions][padded] as of budget_gas. */
static int describe(const Work *work, const double *rate, Potency *gas, Fault *fault)
{
    const Unsplit *unsplit = work->unsplit;
    const Model *model = unsplit->model;
    int s = gas->species;
    gas->molar_mass = model->mechanism->item[model->mechanism->solved_item[s]].molar_mass;
    gas->abundance = work->base[FIELD(model->grid.padded, s, 0)];
    gas->flux = unsplit->kept[s] ? net_loss(work, s) : unsplit->emission[s] + given_off(unsplit, s);
    budget_gas(model, work->base, rate, s, unsplit->kept[s], &gas->budget);
    gas->lifetime =
        gas->budget.burden > 0.0 ? budget_lifetime(&gas->budget, gas->budget.loss, GAS_LOSSES) : NAN;
    gas->anew = gas->noise = gas->bend = NAN;
    return sensitivity_per_flux(unsplit, work->base, work->of_column, s, &gas->frozen, fault);
}

static void compare(Potencies *potencies)
{
    const Potency *one = &potencies->gas[potencies->reference];
    for (int i = 0; i < potencies->count; i++) {
        Potency *gas = &potencies->gas[i];
        double masses = one->molar_mass / gas->molar_mass;
        gas->odp_frozen = gas->frozen / one->frozen * masses;
        gas->odp = gas->anew / one->anew * masses; /* NAN where it was not asked for */
        gas->odp_noise = fabs(gas->odp) * (i == potencies->reference ? 0.0 : gas->noise + one->noise);
    }
}

static int find_all(Work *work, Potencies *potencies, const double *rate, Fault *fault)
{
    const char *none = "does nothing to the ozone column of this case; name another reference";
    for (int i = 0; i < potencies->count; i++)
        if (describe(work, rate, &potencies->gas[i], fault))
            return fault->code;
    if (!(fabs(potencies->gas[potencies->reference].frozen) > 0.0))
        return fault_set(
            fault, FAULT_INPUT, "%s %s",
            mechanism_name(work->unsplit->model->mechanism, potencies->gas[potencies->reference].species),
            none);
    for (int i = 0; potencies->anew && i < potencies->count; i++) {
        show(work, (double)i / potencies->count);
        if (make_anew(work, &potencies->gas[i], fault))
            return fault->code;
    }
    compare(potencies);
    return 0;
}

/* After shifted columns: state, light and factors of the settled one. */
static int put_back(Work *work, Fault *fault)
{
    memcpy(work->column->x, work->base, field(work) * sizeof(double));
    int code = stepper_refresh(work->stepper, work->column, 1, fault);
    if (!code && work->unsplit->has_factors)
        unsplit_take_factors(work->unsplit, stepper_day(work->stepper));
    return code;
}

static int find_reference(Potencies *potencies, const Model *model, const char *name, Fault *fault)
{
    const char **names = malloc((size_t)potencies->count * sizeof *names + 1);
    if (!names)
        return fault_memory(fault, "names of gases");
    potencies->reference = -1;
    for (int i = 0; i < potencies->count; i++) {
        names[i] = mechanism_name(model->mechanism, potencies->gas[i].species);
        if (!strcmp(names[i], name))
            potencies->reference = i;
    }
    const char *near = fault_nearest(name, names, (size_t)potencies->count);
    free(names);
    if (potencies->reference >= 0)
        return 0;
    return fault_set(fault, FAULT_INPUT,
                     "the reference %s is no gas of %s that comes through the ground and feeds a catalytic "
                     "family; %s%s%s",
                     name, model->mechanism->path, near ? "did you mean " : "name another reference",
                     near ? near : "", near ? "?" : "");
}

static int make_list(Potencies *potencies, const Model *model, const char *reference,
                     const unsigned char *wanted, Fault *fault)
{
    size_t solved = (size_t)model->mechanism->solved;
    int *species = malloc(solved * sizeof(int));
    potencies->gas = calloc(solved, sizeof *potencies->gas);
    if (!species || !potencies->gas) {
        free(species);
        return fault_memory(fault, "depletion potentials");
    }
    int count = potency_gases(model, species);
    for (int i = 0; i < count; i++)
        if (!wanted || wanted[species[i]])
            potencies->gas[potencies->count++].species = species[i];
    free(species);
    return find_reference(potencies, model, reference, fault);
}

int potency_make(Potencies **made, Unsplit *unsplit, Stepper *stepper, Column *column, const PotencyAsk *ask,
                 const Watcher *watcher, Fault *fault)
{
    *made = NULL;
    const Model *model = unsplit->model;
    size_t n = (size_t)unsplit->unknowns, padded = (size_t)model->grid.padded;
    double since = omp_get_wtime();
    Potencies *potencies = calloc(1, sizeof *potencies);
    Work work = {.unsplit = unsplit,
                 .stepper = stepper,
                 .column = column,
                 .watcher = watcher,
                 .change = ask->change > 0.0 ? ask->change : POTENCY_CHANGE};
    work.base = malloc(((size_t)unsplit->solved * padded + 2 * n) * sizeof(double));
    double *rate = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    int code = potencies && work.base && rate ? 0 : fault_memory(fault, "depletion potentials");
    if (!code) {
        work.along = work.base + (size_t)unsplit->solved * padded;
        work.step = work.along + n;
        potencies->anew = !ask->frozen;
        code = make_list(potencies, model, ask->reference ? ask->reference : "CFC-11", ask->wanted, fault);
    }
    if (!code)
        code = prepare(&work, fault);
    if (!code) {
        budget_step_rates(model, stepper, column->x, rate);
        potencies->ozone = work.ozone;
        potencies->unsettled = work.unsettled;
        code = find_all(&work, potencies, rate, fault);
    }
    if (!code && potencies->anew)
        code = put_back(&work, fault);
    sensitivity_free(work.of_column);
    free(work.base);
    free(rate);
    if (code) {
        potency_free(potencies);
        return code;
    }
    potencies->seconds = omp_get_wtime() - since;
    *made = potencies;
    return 0;
}

void potency_free(Potencies *potencies)
{
    if (!potencies)
        return;
    free(potencies->gas);
    free(potencies);
}

double potency_per_gg_year(double per_flux, double molar_mass)
{
    double area = 4.0 * PI * EARTH_RADIUS_KM * EARTH_RADIUS_KM * 1e10; /* cm2 */
    return per_flux * 1e9 / molar_mass * AVOGADRO / area / YEAR_SECONDS;
}
