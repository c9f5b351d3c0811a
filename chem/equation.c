/* equation: see equation.h. */
#include "equation.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Standard atomic weights, abridged (IUPAC Commission on Isotopic Abundances and Atomic Weights, 2021; from
 * memory). */
static const struct {
    const char *symbol;
    double weight; /* g mol-1 */
} atomic_weights[] = {
    {"H", 1.008},   {"He", 4.0026}, {"Li", 6.94},   {"C", 12.011},  {"N", 14.007},  {"O", 15.999},
    {"F", 18.998},  {"Ne", 20.180}, {"Na", 22.990}, {"Mg", 24.305}, {"Si", 28.085}, {"P", 30.974},
    {"S", 32.06},   {"Cl", 35.45},  {"Ar", 39.95},  {"K", 39.098},  {"Fe", 55.845}, {"Br", 79.904},
    {"Kr", 83.798}, {"I", 126.90},  {"Xe", 131.29}, {"Hg", 200.59}, {"Rn", 222.0},
};

double equation_atomic_weight(const char *symbol)
{
    for (size_t i = 0; i < sizeof atomic_weights / sizeof *atomic_weights; i++)
        if (strcmp(atomic_weights[i].symbol, symbol) == 0)
            return atomic_weights[i].weight;
    return 0.0;
}

int formula_known_element(const char *symbol)
{
    return equation_atomic_weight(symbol) > 0.0;
}

int formula_read(const Mechanism *mechanism, const char *formula, const Place *place, int *atoms,
                 double *molar_mass, Fault *fault)
{
    memset(atoms, 0, MECHANISM_ELEMENTS * sizeof *atoms);
    *molar_mass = 0.0;
    for (const char *at = formula; *at;) {
        char symbol[3] = {0};
        if (!isupper((unsigned char)*at))
            return fault_at(
                fault, place->file, place->line,
                "%s: cannot read the formula \"%s\" at \"%s\"; write element symbols, each with an "
                "optional count, such as CCl2F2",
                place->label, formula, at);
        symbol[0] = *at++;
        if (islower((unsigned char)*at))
            symbol[1] = *at++;
        long count = 1;
        if (isdigit((unsigned char)*at)) {
            char *end;
            count = strtol(at, &end, 10);
            at = end;
        }
        if (count < 1 || count > 999)
            return fault_at(fault, place->file, place->line,
                            "%s: %s stands in the formula \"%s\" with a count outside 1..999", place->label,
                            symbol, formula);
        int element = mechanism_element(mechanism, symbol);
        if (element < 0)
            return fault_at(
                fault, place->file, place->line,
                "%s: the formula \"%s\" has the element %s, which is not among the elements; add it there "
                "or correct the formula",
                place->label, formula, symbol);
        atoms[element] += (int)count;
        *molar_mass += (double)count * equation_atomic_weight(symbol);
    }
    return 0;
}

/* Take an element and its count off the front of a formula; 0 when none stands there. */
static int take_element(const char **at, char *symbol, int *count)
{
    const char *p = *at;
    if (!isupper((unsigned char)*p))
        return 0;
    memset(symbol, 0, 3);
    symbol[0] = *p++;
    if (islower((unsigned char)*p))
        symbol[1] = *p++;
    for (*count = isdigit((unsigned char)*p) ? 0 : 1; isdigit((unsigned char)*p); p++)
        if ((*count = 10 * *count + (*p - '0')) > 999)
            return 0;
    if (*count > 0)
        *at = p;
    return *count > 0;
}

int formula_atoms(const char *formula, const char *symbol)
{
    char element[3];
    int atoms = 0, count;
    while (take_element(&formula, element, &count))
        atoms += strcmp(element, symbol) == 0 ? count : 0;
    return *formula ? -1 : atoms;
}

double formula_mass(const char *formula)
{
    char element[3];
    double mass = 0.0;
    int count;
    while (take_element(&formula, element, &count)) {
        double weight = equation_atomic_weight(element);
        if (weight == 0.0)
            return 0.0;
        mass += count * weight;
    }
    return *formula ? 0.0 : mass;
}

int equation_species(const Mechanism *mechanism, const char *name)
{
    for (int i = 0; i < mechanism->species; i++)
        if (strcmp(mechanism->item[i].name, name) == 0)
            return i;
    return -1;
}

double equation_count(const Side *side, int species)
{
    for (int t = 0; t < side->terms; t++)
        if (side->term[t].species == species)
            return side->term[t].count;
    return 0.0;
}

int equation_same(const Side *a, const Side *b)
{
    if (a->terms != b->terms)
        return 0;
    for (int t = 0; t < a->terms; t++)
        if (equation_count(b, a->term[t].species) != a->term[t].count)
            return 0;
    return 1;
}

/* ---- parsing ---- */

typedef struct {
    const Mechanism *mechanism;
    const Place *place;
    const char *text; /* the equation as written, for messages */
    Fault *fault;
} Parser;

static int complain(const Parser *parser, const char *what, const char *word, const char *remedy)
{
    return fault_at(parser->fault, parser->place->file, parser->place->line,
                    "%s: %s \"%s\" in \"%.240s\"; %s", parser->place->label, what, word, parser->text,
                    remedy);
}

static int unknown_species(const Parser *parser, const char *name)
{
    const Mechanism *mechanism = parser->mechanism;
    const char **names = malloc((size_t)(mechanism->species + 1) * sizeof *names);
    if (!names)
        return fault_memory(parser->fault, "species names");
    for (int i = 0; i < mechanism->species; i++)
        names[i] = mechanism->item[i].name;
    const char *near = fault_nearest(name, names, (size_t)mechanism->species);
    char remedy[128];
    if (near)
        snprintf(remedy, sizeof remedy, "did you mean %s?", near);
    else
        snprintf(remedy, sizeof remedy, "add it to the list of species");
    free(names);
    return complain(parser, "unknown species", name, remedy);
}

static int add_term(const Parser *parser, Side *side, const char *name, double count)
{
    int species = equation_species(parser->mechanism, name);
    if (species < 0)
        return unknown_species(parser, name);
    for (int t = 0; t < side->terms; t++)
        if (side->term[t].species == species) {
            side->term[t].count += count;
            return 0;
        }
    if (side->terms == EQUATION_TERMS)
        return complain(parser, "too many species from", name, "split the reaction: a side holds at most 16");
    side->term[side->terms++] = (Term){species, count};
    return 0;
}

/* A word that is a number, such as 2 or 0.35. */
static int number_of(const char *word, double *count)
{
    if (!isdigit((unsigned char)*word))
        return 0;
    char *end;
    *count = strtod(word, &end);
    return *end == '\0';
}

/* One side: [count] name { + [count] name }. light is NULL where hv may not stand. text is cut in place. */
static int read_side(const Parser *parser, char *text, Side *side, int *light)
{
    double count = 1.0;
    int has_count = 0, wants_term = 1;
    char *rest = NULL;
    for (char *word = strtok_r(text, " \t\r\n", &rest); word; word = strtok_r(NULL, " \t\r\n", &rest)) {
        if (strcmp(word, "+") == 0) {
            if (wants_term)
                return complain(parser, "nothing stands before", word, "write species on both sides of it");
            wants_term = 1;
        } else if (!wants_term) {
            return complain(parser, "no + before", word, "part the species by \" + \"");
        } else if (!has_count && number_of(word, &count)) {
            if (!(count > 0.0) || !isfinite(count) || count > 99.0)
                return complain(parser, "bad coefficient", word, "write one above 0 and below 100");
            has_count = 1;
        } else {
            if (strcmp(word, "hv") == 0) {
                if (!light || has_count)
                    return complain(parser, "misplaced", word,
                                    "hv stands on the left, without a coefficient");
                (*light)++;
            } else if (add_term(parser, side, word, count))
                return parser->fault->code;
            count = 1.0;
            has_count = 0;
            wants_term = 0;
        }
    }
    if (has_count || (wants_term && (side->terms || (light && *light))))
        return complain(parser, "no species after the last + or coefficient of", text,
                        "complete or remove it");
    return 0;
}

/* Blank out every (+M) of text; their number. */
static int strip_decoration(char *text)
{
    int found = 0;
    for (char *at = text; (at = strstr(at, "(+M)")); found++)
        memset(at, ' ', 4);
    return found;
}

/* Read and blank out what stands in braces. */
static int read_braces(const Parser *parser, char *text, Side *taken)
{
    for (char *open; (open = strchr(text, '{'));) {
        char *close = strchr(open, '}');
        if (!close)
            return complain(parser, "no closing brace after", open, "write }");
        char inside[EQUATION_LENGTH + 1];
        size_t length = (size_t)(close - open - 1);
        memcpy(inside, open + 1, length);
        inside[length] = '\0';
        memset(open, ' ', (size_t)(close - open + 1));
        char *start = inside + strspn(inside, " \t\r\n");
        if (*start == '+')
            start++;
        int before = taken->terms;
        if (read_side(parser, start, taken, NULL))
            return parser->fault->code;
        if (taken->terms == before && start[strspn(start, " ")] == '\0')
            return complain(parser, "nothing in the braces", "{}",
                            "write a fixed species there or remove them");
    }
    return 0;
}

/* What may stand where. */
static int check_roles(const Parser *parser, const Equation *equation)
{
    const Mechanism *mechanism = parser->mechanism;
    for (int t = 0; t < equation->left.terms; t++) {
        const Species *species = &mechanism->item[equation->left.term[t].species];
        double count = equation->left.term[t].count;
        if (species->role == ROLE_INERT)
            return complain(parser, "the inert species reacts:", species->name,
                            "inert species only balance products; give it role = \"active\"");
        if (count != floor(count))
            return complain(parser, "decimal coefficient of the reactant", species->name,
                            "multiply the equation so that reactants have whole coefficients");
    }
    for (int t = 0; t < equation->taken.terms; t++) {
        const Species *species = &mechanism->item[equation->taken.term[t].species];
        if (species->role != ROLE_FIXED || strcmp(species->name, "M") == 0)
            return complain(parser, "not a fixed share of air in braces:", species->name,
                            "only species of role \"fixed\" other than M are taken up there");
    }
    int third = equation_species(mechanism, "M");
    if (third >= 0 && equation_count(&equation->left, third) != equation_count(&equation->right, third))
        return complain(parser, "unequal on the two sides:", "M", "write + M on both sides or on none");
    return 0;
}

int equation_read(const Mechanism *mechanism, const char *text, const Place *place, Equation *equation,
                  Fault *fault)
{
    const Parser parser = {mechanism, place, text, fault};
    char left[EQUATION_LENGTH + 1];
    memset(equation, 0, sizeof *equation);
    if (strlen(text) > EQUATION_LENGTH)
        return fault_at(fault, place->file, place->line,
                        "%s: the equation has %zu characters; at most %d fit", place->label, strlen(text),
                        EQUATION_LENGTH);
    strcpy(left, text);
    char *arrow = strstr(left, "->");
    if (!arrow)
        return complain(&parser, "no arrow", "->", "write reactants -> products");
    *arrow = '\0';
    char *right = arrow + 2;
    if (strstr(right, "->"))
        return complain(&parser, "a second arrow", "->", "write one reaction an entry");
    int marks_left = strip_decoration(left), marks_right = strip_decoration(right);
    if (marks_left > 1 || marks_left != marks_right)
        return complain(&parser, "unequal on the two sides:", "(+M)",
                        "write it once on both sides or on none");
    equation->decorated = marks_left;
    if (read_braces(&parser, left, &equation->taken))
        return fault->code;
    if (strpbrk(left, "}") || strpbrk(right, "{}"))
        return complain(&parser, "misplaced brace", "{}", "what is taken up stands on the left, in { }");
    if (read_side(&parser, left, &equation->left, &equation->light) ||
        read_side(&parser, right, &equation->right, NULL))
        return fault->code;
    if (equation->left.terms == 0)
        return complain(&parser, "no reactant before", "->", "write one");
    if (equation->right.terms == 0)
        return complain(&parser, "no product after", "->", "write one");
    return check_roles(&parser, equation);
}

/* ---- balance ---- */

static double count_atoms(const Mechanism *mechanism, const Side *side, int element)
{
    double atoms = 0.0;
    for (int t = 0; t < side->terms; t++)
        atoms += side->term[t].count * mechanism->item[side->term[t].species].atoms[element];
    return atoms;
}

int equation_balance(const Mechanism *mechanism, const Equation *equation, const Place *place, Fault *fault)
{
    char wrong[60 * MECHANISM_ELEMENTS] = "";
    size_t used = 0;
    for (int e = 0; e < mechanism->elements; e++) {
        double left =
            count_atoms(mechanism, &equation->left, e) + count_atoms(mechanism, &equation->taken, e);
        double right = count_atoms(mechanism, &equation->right, e);
        /* decimal coefficients add up to whole atoms only to round-off */
        if (fabs(left - right) > 1e-9)
            used += (size_t)snprintf(wrong + used, sizeof wrong - used, "%s%s %.6g left, %.6g right",
                                     used ? "; " : "", mechanism->element[e], left, right);
    }
    if (!used)
        return 0;
    return fault_at(fault, place->file, place->line,
                    "%s is not balanced: %s; correct the coefficients, or add an inert product or {+ O2}",
                    place->label, wrong);
}
