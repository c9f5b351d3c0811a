/* mechanism_reactions: the thermal, photolysis and surface lists of a mechanism file, and the washouts that
 * the species ask for. See mechanism.h. */
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "mechanism_reading.h"

enum { LABEL = 64 };

/* The word of every rate law, its parameters in the order of Reaction.parameter, and how many are required.
 */
static const struct {
    const char *word;
    int parameters, required;
    const char *key[MECHANISM_PARAMETERS];
} laws[LAW_NONE] = {
    [LAW_ARRHENIUS] = {"arrhenius", 4, 2, {"A", "ER", "n", "Tref"}},
    [LAW_TERMOLECULAR] = {"termolecular", 4, 2, {"A", "ER", "n", "Tref"}},
    [LAW_FALLOFF] = {"falloff", 5, 4, {"k0", "n0", "ki", "ni", "Tref"}},
    [LAW_ACTIVATED] = {"activated", 7, 6, {"A", "ER", "k0", "n0", "ki", "ni", "Tref"}},
    [LAW_EQUILIBRIUM] = {"equilibrium", 2, 2, {"KA", "KB"}},
    [LAW_HO2_HO2] = {"HO2+HO2", 6, 6, {"A1", "ER1", "A2", "ER2", "AW", "ERW"}},
    [LAW_OH_HNO3] = {"OH+HNO3", 6, 6, {"AA", "ERA", "AB", "ERB", "AC", "ERC"}},
    [LAW_SUM2] = {"sum2", 4, 4, {"A1", "ER1", "A2", "ER2"}},
};

static const char *const thermal_keys[] = {"id", "eq", "law", "branch", "f", "g", "source", "basis", "note"};
enum { THERMAL_KEYS = 9, MOST_KEYS = THERMAL_KEYS + MECHANISM_PARAMETERS + 1 };

/* ---- what all kinds share ---- */

static int copy_string(const Reading *reading, const config_setting_t *group, const char *label,
                       const char *key, char **copy)
{
    const char *text = "";
    if (reading_text(reading, group, label, key, NOT_REQUIRED, &text))
        return reading->fault->code;
    *copy = strdup(text);
    return *copy ? 0 : fault_memory(reading->fault, "the mechanism's reactions");
}

static int find_reaction(const Mechanism *mechanism, const char *id)
{
    for (int r = 0; r < mechanism->reactions; r++)
        if (strcmp(mechanism->reaction[r].id, id) == 0)
            return r;
    return -1;
}

/* The first word of source, where one is given, must be a key of the sources list. */
static int check_source(const Reading *reading, const config_setting_t *group, const char *label,
                        const char *source)
{
    char word[40];
    size_t length = strcspn(source, " ");
    if (length == 0)
        return 0;
    snprintf(word, sizeof word, "%.*s", (int)(length < sizeof word ? length : sizeof word - 1), source);
    for (int i = 0; i < reading->sources; i++)
        if (strlen(reading->source[i]) == length && strncmp(reading->source[i], source, length) == 0)
            return 0;
    const char *near = fault_nearest(word, reading->source, (size_t)reading->sources);
    return reading_fault(reading, config_setting_get_member(group, "source"),
                         "%s: source names %s, which is not a key of the sources list; %s%s%s", label, word,
                         near ? "did you mean " : "add it there", near ? near : "", near ? "?" : "");
}

/* id, eq, f, source, basis, note; the label that names the reaction from here on; the equation, balanced. */
static int read_common(const Reading *reading, const config_setting_t *group, const char *kind,
                       Reaction *reaction, char *label, Equation *equation)
{
    const Mechanism *mechanism = reading->mechanism;
    const char *text = NULL;
    reaction->line = (int)config_setting_source_line(group);
    reaction->branch = 1.0;
    reaction->phi = 1.0;
    reaction->fixed_share = 1.0;
    reaction->forward = -1;
    reaction->law = LAW_NONE;
    if (reading_word(reading, group, kind, "id", REQUIRED, reaction->id, sizeof reaction->id))
        return reading->fault->code;
    snprintf(label, LABEL, "reaction %s", reaction->id);
    int other = find_reaction(mechanism, reaction->id);
    if (other >= 0 && &mechanism->reaction[other] != reaction)
        return reading_fault(reading, group, "%s: the id is given twice, first in line %d; rename one", label,
                             mechanism->reaction[other].line);
    if (reading_text(reading, group, label, "eq", REQUIRED, &text) ||
        copy_string(reading, group, label, "eq", &reaction->equation) ||
        copy_string(reading, group, label, "source", &reaction->source) ||
        copy_string(reading, group, label, "basis", &reaction->basis) ||
        copy_string(reading, group, label, "note", &reaction->note) ||
        check_source(reading, group, label, reaction->source) ||
        reading_number(reading, group, label, "f", NOT_REQUIRED, 1.0, 1e6, &reaction->f))
        return reading->fault->code;
    Place place = reading_place(reading, config_setting_get_member(group, "eq"), label);
    if (equation_read(mechanism, text, &place, equation, reading->fault))
        return reading->fault->code;
    return equation_balance(mechanism, equation, &place, reading->fault);
}

static int too_long(const Reading *reading, const config_setting_t *group, const char *label,
                    const char *what, int most)
{
    return reading_fault(reading, config_setting_get_member(group, "eq"),
                         "%s: the equation has more than %d %s; split it into steps", label, most, what);
}

/* Solved reactants one by one, fixed ones as a power of M and the product of their shares. */
static int set_reactants(const Reading *reading, const config_setting_t *group, const char *label,
                         const Equation *equation, Reaction *reaction)
{
    for (int t = 0; t < equation->left.terms; t++) {
        const Species *species = &reading->mechanism->item[equation->left.term[t].species];
        for (int i = 0; i < (int)equation->left.term[t].count; i++) {
            if (reaction->reactants + reaction->fixed_order == 3)
                return too_long(reading, group, label, "reactants", 3);
            if (species->role == ROLE_FIXED) {
                reaction->fixed_order++;
                reaction->fixed_share *= species->share;
            } else {
                reaction->reactant[reaction->reactants++] = species->solved;
            }
        }
    }
    return 0;
}

/* Net change of each solved species, in the order they appear. */
static int set_changes(const Reading *reading, const config_setting_t *group, const char *label,
                       const Equation *equation, Reaction *reaction)
{
    const Side *sides[] = {&equation->left, &equation->right};
    for (int side = 0; side < 2; side++)
        for (int t = 0; t < sides[side]->terms; t++) {
            int species = sides[side]->term[t].species, solved = reading->mechanism->item[species].solved;
            if (solved < 0 || (side == 1 && equation_count(&equation->left, species) > 0.0))
                continue;
            double change =
                equation_count(&equation->right, species) - equation_count(&equation->left, species);
            if (change == 0.0)
                continue;
            if (reaction->changes == REACTION_CHANGES)
                return too_long(reading, group, label, "changing species", REACTION_CHANGES);
            reaction->changed[reaction->changes] = solved;
            reaction->change[reaction->changes++] = change;
        }
    return 0;
}

static int check_light(const Reading *reading, const config_setting_t *group, const char *label,
                       const Equation *equation, int wanted)
{
    if (equation->light == wanted)
        return 0;
    return reading_fault(reading, config_setting_get_member(group, "eq"), "%s: %s", label,
                         wanted ? "a photolysis has hv on the left once; write X + hv -> ..."
                                : "hv stands in photolysis equations only; remove it or move the reaction");
}

/* ---- thermal ---- */

/* Range of a parameter by its name: coefficients cannot be negative, and what is divided by or taken the
 * logarithm of cannot be 0. */
static void parameter_range(const char *key, double *low, double *high)
{
    *low = -1e6;
    *high = 1e6;
    if (strcmp(key, "Tref") == 0) {
        *low = 100.0;
        *high = 1000.0;
    } else if (key[0] == 'A') {
        *low = 0.0;
    } else if (strcmp(key, "k0") == 0 || strcmp(key, "ki") == 0 || strcmp(key, "KA") == 0) {
        *low = DBL_MIN;
    }
}

static int read_parameters(const Reading *reading, const config_setting_t *group, const char *label,
                           Reaction *reaction)
{
    int law = reaction->law, count = THERMAL_KEYS;
    const char *known[MOST_KEYS];
    memcpy(known, thermal_keys, sizeof thermal_keys);
    for (int p = 0; p < laws[law].parameters; p++)
        known[count++] = laws[law].key[p];
    if (law == LAW_EQUILIBRIUM)
        known[count++] = "forward";
    /* a key of another law is no misspelling: say so before looking for the nearest */
    for (int other = 0; other < LAW_NONE; other++)
        for (int p = 0; p <= laws[other].parameters && p < MECHANISM_PARAMETERS; p++) {
            const char *key = p < laws[other].parameters ? laws[other].key[p] : "forward";
            const config_setting_t *stray = config_setting_get_member(group, key);
            int own = 0;
            for (int k = THERMAL_KEYS; k < count; k++)
                own |= strcmp(known[k], key) == 0;
            if (stray && !own)
                return reading_fault(reading, stray,
                                     "%s: law %s does not use %s; remove it or change the law", label,
                                     laws[law].word, key);
        }
    if (reading_keys(reading, group, label, known, (size_t)count))
        return reading->fault->code;
    for (int p = 0; p < laws[law].parameters; p++) {
        const char *key = laws[law].key[p];
        double low, high;
        parameter_range(key, &low, &high);
        reaction->parameter[p] = strcmp(key, "Tref") == 0 ? 298.0 : 0.0;
        if (p < laws[law].required && !config_setting_get_member(group, key))
            return reading_fault(reading, group, "%s: %s is missing; law %s needs it", label, key,
                                 laws[law].word);
        if (reading_number(reading, group, label, key, NOT_REQUIRED, low, high, &reaction->parameter[p]))
            return reading->fault->code;
    }
    return 0;
}

/* Which notation goes with which law. */
static int check_law(const Reading *reading, const config_setting_t *group, const char *label,
                     const Equation *equation, const Reaction *reaction)
{
    const config_setting_t *eq = config_setting_get_member(group, "eq");
    int third = equation_species(reading->mechanism, "M");
    int has_third = third >= 0 && equation_count(&equation->left, third) > 0.0;
    if (has_third != (reaction->law == LAW_TERMOLECULAR))
        return reading_fault(reading, eq, "%s: M as a reactant and law termolecular go together; change one",
                             label);
    int holds_pressure = reaction->law == LAW_FALLOFF || reaction->law == LAW_EQUILIBRIUM;
    if (equation->decorated != holds_pressure)
        return reading_fault(reading, eq,
                             "%s: (+M) and the laws falloff and equilibrium go together; change one", label);
    return 0;
}

static int read_thermal(const Reading *reading, const config_setting_t *group, Reaction *reaction)
{
    char label[LABEL];
    Equation equation;
    const char *words[LAW_NONE];
    for (int law = 0; law < LAW_NONE; law++)
        words[law] = laws[law].word;
    reaction->kind = REACTION_THERMAL;
    if (read_common(reading, group, "thermal reaction", reaction, label, &equation) ||
        reading_choice(reading, group, label, "law", REQUIRED, words, LAW_NONE, &reaction->law) ||
        read_parameters(reading, group, label, reaction) ||
        reading_number(reading, group, label, "branch", NOT_REQUIRED, 0.0, 1.0, &reaction->branch) ||
        reading_number(reading, group, label, "g", NOT_REQUIRED, 0.0, 1e6, &reaction->g) ||
        check_light(reading, group, label, &equation, 0) ||
        check_law(reading, group, label, &equation, reaction) ||
        set_reactants(reading, group, label, &equation, reaction) ||
        set_changes(reading, group, label, &equation, reaction))
        return reading->fault->code;
    return 0;
}

/* The forward reaction may stand anywhere in the list, so this is a second pass. */
static int link_equilibrium(const Reading *reading, const config_setting_t *group, Reaction *reaction)
{
    const Mechanism *mechanism = reading->mechanism;
    char label[LABEL];
    const char *id = NULL;
    snprintf(label, sizeof label, "reaction %s", reaction->id);
    if (reading_text(reading, group, label, "forward", REQUIRED, &id))
        return reading->fault->code;
    const config_setting_t *setting = config_setting_get_member(group, "forward");
    reaction->forward = find_reaction(mechanism, id);
    if (reaction->forward < 0) {
        const char **ids = malloc((size_t)(mechanism->reactions + 1) * sizeof *ids);
        if (!ids)
            return fault_memory(reading->fault, "the mechanism's reactions");
        for (int r = 0; r < mechanism->reactions; r++)
            ids[r] = mechanism->reaction[r].id;
        const char *near = fault_nearest(id, ids, (size_t)mechanism->reactions);
        free(ids);
        return reading_fault(reading, setting, "%s: forward names no reaction \"%.60s\"; %s%s%s", label, id,
                             near ? "did you mean " : "write the id of the reverse reaction",
                             near ? near : "", near ? "?" : "");
    }
    const Reaction *forward = &mechanism->reaction[reaction->forward];
    if (forward->law != LAW_FALLOFF)
        return reading_fault(reading, setting,
                             "%s: forward names %s, whose law is not falloff; name the association", label,
                             id);
    Equation here, there;
    Place place = reading_place(reading, group, label);
    if (equation_read(mechanism, reaction->equation, &place, &here, reading->fault) ||
        equation_read(mechanism, forward->equation, &place, &there, reading->fault))
        return reading->fault->code;
    if (!equation_same(&here.left, &there.right) || !equation_same(&here.right, &there.left))
        return reading_fault(reading, setting, "%s is not the reverse of %s; correct forward or the equation",
                             label, id);
    return 0;
}

/* ---- photolysis ---- */

static int read_spectrum(const Reading *reading, const config_setting_t *group, const char *label,
                         Reaction *reaction)
{
    static const char *const yields[] = {"yield", "yield_minus", "phi"};
    int given = 0;
    for (int y = 0; y < 3; y++)
        given += config_setting_get_member(group, yields[y]) != NULL;
    if (given != 1)
        return reading_fault(reading, group,
                             "%s: %s of yield, yield_minus and phi is given; give exactly one", label,
                             given ? "more than one" : "none");
    reaction->yield_complement = config_setting_get_member(group, "yield_minus") != NULL;
    if (reading_word(reading, group, label, "xs", REQUIRED, reaction->spectrum, sizeof reaction->spectrum) ||
        reading_word(reading, group, label, "yield", NOT_REQUIRED, reaction->yield, sizeof reaction->yield) ||
        reading_word(reading, group, label, "yield_minus", NOT_REQUIRED, reaction->yield,
                     sizeof reaction->yield) ||
        reading_number(reading, group, label, "phi", NOT_REQUIRED, 0.0, 1.0, &reaction->phi))
        return reading->fault->code;
    return 0;
}

/* special: computed in the program, for one species each; xs and yields would be ignored there. */
static int check_special(const Reading *reading, const config_setting_t *group, const char *label,
                         const Equation *equation, const Reaction *reaction)
{
    static const char *const unused[] = {"xs", "yield", "yield_minus", "phi"};
    for (int k = 0; k < 4; k++) {
        const config_setting_t *stray = config_setting_get_member(group, unused[k]);
        if (stray)
            return reading_fault(reading, stray,
                                 "%s: %s is not used where special is given; remove one of them", label,
                                 unused[k]);
    }
    const char *wanted = reaction->special == SPECIAL_NO ? "NO" : "O2";
    const char *name = reading->mechanism->item[equation->left.term[0].species].name;
    if (strcmp(name, wanted) != 0)
        return reading_fault(reading, config_setting_get_member(group, "special"),
                             "%s: this special is for %s, not %s; give xs and a yield instead", label, wanted,
                             name);
    return 0;
}

static int read_photolysis(const Reading *reading, const config_setting_t *group, Reaction *reaction)
{
    static const char *const known[] = {"id",      "eq", "xs",     "yield", "yield_minus", "phi",
                                        "special", "f",  "source", "basis", "note"};
    static const char *const specials[] = {"O2", "O2-O1D", "NO"}; /* by enum PhotolysisSpecial - 1 */
    char label[LABEL];
    Equation equation;
    int special = -1;
    reaction->kind = REACTION_PHOTOLYSIS;
    if (read_common(reading, group, "photolysis", reaction, label, &equation) ||
        reading_keys(reading, group, label, known, sizeof known / sizeof *known) ||
        check_light(reading, group, label, &equation, 1))
        return reading->fault->code;
    if (equation.left.terms != 1 || equation.left.term[0].count != 1.0 || equation.decorated)
        return reading_fault(reading, config_setting_get_member(group, "eq"),
                             "%s: a photolysis has one reactant beside hv; write X + hv -> ...", label);
    if (reading_choice(reading, group, label, "special", NOT_REQUIRED, specials, 3, &special))
        return reading->fault->code;
    reaction->special = special + 1;
    if (reaction->special ? check_special(reading, group, label, &equation, reaction)
                          : read_spectrum(reading, group, label, reaction))
        return reading->fault->code;
    if (set_reactants(reading, group, label, &equation, reaction))
        return reading->fault->code;
    return set_changes(reading, group, label, &equation, reaction);
}

/* ---- surface ---- */

/* The models by enum SurfaceModel: the two reactants they hold for (NULL: any), whether the second sets the
 * rate, whether the probability stands in the file, and what the surface is made of beside water. */
static const struct {
    const char *word, *first, *second;
    int second_order, gamma;
    const char *surface;
} models[] = {
    [SURFACE_CONSTANT] = {"constant", NULL, NULL, 0, 1, NULL},
    [SURFACE_CLONO2_H2O] = {"ClONO2+H2O", "ClONO2", "H2O", 0, 0, NULL},
    [SURFACE_CLONO2_HCL] = {"ClONO2+HCl", "ClONO2", "HCl", 1, 0, NULL},
    [SURFACE_HOCL_HCL] = {"HOCl+HCl", "HOCl", "HCl", 1, 0, NULL},
    [SURFACE_BRONO2_H2O] = {"BrONO2+H2O", "BrONO2", "H2O", 0, 0, NULL},
    [SURFACE_N2O5_H2O] = {"N2O5+H2O", "N2O5", "H2O", 0, 0, NULL},
    [SURFACE_NAT_H2O] = {"NAT+H2O", NULL, "H2O", 0, 1, "HNO3"},
    [SURFACE_NAT_HCL] = {"NAT+HCl", NULL, "HCl", 1, 1, "HNO3"},
};
enum { MODELS = sizeof models / sizeof *models };

static int check_model(const Reading *reading, const config_setting_t *group, const char *label,
                       const Equation *equation, const Reaction *reaction)
{
    const Mechanism *mechanism = reading->mechanism;
    const config_setting_t *eq = config_setting_get_member(group, "eq");
    const config_setting_t *gamma = config_setting_get_member(group, "gamma");
    int model = reaction->surface_model, terms = equation->left.terms;
    const Species *first = &mechanism->item[equation->left.term[0].species];
    if (first->solved < 0)
        return reading_fault(reading, eq, "%s: %s is taken up but not active; write the gas taken up first",
                             label, first->name);
    if (terms > 2 || equation->left.term[0].count != 1.0 ||
        (terms == 2 && equation->left.term[1].count != 1.0))
        return reading_fault(reading, eq, "%s: a surface reaction has one or two reactants, one of each",
                             label);
    if (models[model].gamma && !gamma)
        return reading_fault(reading, group, "%s: gamma is missing; model %s needs it", label,
                             models[model].word);
    if (model == SURFACE_CONSTANT)
        return 0;
    if (gamma && !models[model].gamma)
        return reading_fault(reading, gamma,
                             "%s: model %s does not use gamma; remove it or write model constant", label,
                             models[model].word);
    if (terms != 2 || (models[model].first && strcmp(first->name, models[model].first) != 0) ||
        strcmp(mechanism->item[equation->left.term[1].species].name, models[model].second) != 0)
        return reading_fault(
            reading, eq, "%s: model %s is for %s + %s -> ...; change the model or the equation", label,
            models[model].word, models[model].first ? models[model].first : "a gas", models[model].second);
    /* water sets the droplets' strength */
    const char *needed[] = {models[model].second, "H2O", models[model].surface};
    for (int i = 0; i < 3; i++)
        if (needed[i] && mechanism_solved(mechanism, needed[i]) < 0)
            return reading_fault(reading, group, "%s: model %s needs %s as an active species; add it", label,
                                 models[model].word, needed[i]);
    return 0;
}

static int read_surface(const Reading *reading, const config_setting_t *group, Reaction *reaction)
{
    static const char *const known[] = {"id", "eq", "model", "gamma", "f", "source", "basis", "note"};
    char label[LABEL];
    Equation equation;
    const char *words[MODELS];
    for (int model = 0; model < MODELS; model++)
        words[model] = models[model].word;
    reaction->kind = REACTION_SURFACE;
    if (read_common(reading, group, "surface reaction", reaction, label, &equation) ||
        reading_keys(reading, group, label, known, sizeof known / sizeof *known) ||
        reading_choice(reading, group, label, "model", REQUIRED, words, MODELS, &reaction->surface_model) ||
        reading_number(reading, group, label, "gamma", NOT_REQUIRED, 0.0, 1.0, &reaction->gamma) ||
        check_light(reading, group, label, &equation, 0) ||
        check_model(reading, group, label, &equation, reaction))
        return reading->fault->code;
    if (equation.decorated)
        return reading_fault(reading, config_setting_get_member(group, "eq"),
                             "%s: (+M) has no meaning on a surface; remove it", label);
    reaction->reactant[reaction->reactants++] =
        reading->mechanism->item[equation.left.term[0].species].solved;
    if (models[reaction->surface_model].second_order)
        reaction->reactant[reaction->reactants++] =
            reading->mechanism->item[equation.left.term[1].species].solved;
    return set_changes(reading, group, label, &equation, reaction);
}

/* ---- washout ---- */

static int append_washout(const Reading *reading, const Species *species, Reaction *reaction)
{
    char equation[MECHANISM_NAME + 32];
    reaction->kind = REACTION_WASHOUT;
    reaction->law = LAW_NONE;
    reaction->forward = -1;
    reaction->branch = reaction->phi = reaction->fixed_share = 1.0;
    reaction->reactants = reaction->changes = 1;
    reaction->reactant[0] = reaction->changed[0] = species->solved;
    reaction->change[0] = -1.0;
    snprintf(reaction->id, sizeof reaction->id, "washout-%s", species->name);
    snprintf(equation, sizeof equation, "%s -> (washout)", species->name);
    int other = find_reaction(reading->mechanism, reaction->id);
    if (other >= 0 && &reading->mechanism->reaction[other] != reaction)
        return fault_at(reading->fault, reading->path, reading->mechanism->reaction[other].line,
                        "reaction %s: this id is kept for the washout of %s; rename the reaction",
                        reaction->id, species->name);
    reaction->equation = strdup(equation);
    reaction->source = strdup("");
    reaction->basis = strdup("");
    reaction->note = strdup("");
    if (!reaction->equation || !reaction->source || !reaction->basis || !reaction->note)
        return fault_memory(reading->fault, "the mechanism's washouts");
    return 0;
}

/* ---- all lists ---- */

int reading_reactions(const Reading *reading, const config_setting_t *root)
{
    static const char *const names[] = {"thermal", "photolysis", "surface"};
    int (*const readers[])(const Reading *, const config_setting_t *,
                           Reaction *) = {read_thermal, read_photolysis, read_surface};
    Mechanism *mechanism = reading->mechanism;
    const config_setting_t *list[3];
    int length[3], room = mechanism->species;
    for (int kind = 0; kind < 3; kind++) {
        if (reading_list(reading, root, names[kind], &list[kind], &length[kind]))
            return reading->fault->code;
        room += length[kind];
    }
    mechanism->reaction = calloc((size_t)room, sizeof *mechanism->reaction);
    if (!mechanism->reaction)
        return fault_memory(reading->fault, "the mechanism's reactions");
    int *const first[] = {&mechanism->thermal_first, &mechanism->photolysis_first, &mechanism->surface_first};
    for (int kind = 0; kind < 3; kind++) {
        *first[kind] = mechanism->reactions;
        for (int i = 0; i < length[kind]; i++) {
            /* counted before it is read, so that a half-read reaction is freed with the rest */
            Reaction *reaction = &mechanism->reaction[mechanism->reactions++];
            if (readers[kind](reading, config_setting_get_elem(list[kind], (unsigned)i), reaction))
                return reading->fault->code;
        }
    }
    for (int i = 0; i < length[0]; i++)
        if (mechanism->reaction[i].law == LAW_EQUILIBRIUM &&
            link_equilibrium(reading, config_setting_get_elem(list[0], (unsigned)i), &mechanism->reaction[i]))
            return reading->fault->code;
    mechanism->washout_first = mechanism->reactions;
    for (int s = 0; s < mechanism->species; s++)
        if (mechanism->item[s].washout > 0.0 &&
            append_washout(reading, &mechanism->item[s], &mechanism->reaction[mechanism->reactions++]))
            return reading->fault->code;
    return 0;
}
