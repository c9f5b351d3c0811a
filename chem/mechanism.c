/* mechanism: the file as a whole, elements, sources and species; reactions in mechanism_reactions.c. */
#include "mechanism.h"

#include <ctype.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/settings_scan.h"
#include "../input/table.h"
#include "equation.h"
#include "mechanism_reading.h"

/* ---- what others ask ---- */

int mechanism_solved(const Mechanism *mechanism, const char *name)
{
    int species = equation_species(mechanism, name);
    return species < 0 ? -1 : mechanism->item[species].solved;
}

int mechanism_element(const Mechanism *mechanism, const char *symbol)
{
    for (int e = 0; e < mechanism->elements; e++)
        if (strcmp(mechanism->element[e], symbol) == 0)
            return e;
    return -1;
}

int mechanism_atoms(const Mechanism *mechanism, int solved, int element)
{
    return mechanism->item[mechanism->solved_item[solved]].atoms[element];
}

const char *mechanism_name(const Mechanism *mechanism, int solved)
{
    return mechanism->item[mechanism->solved_item[solved]].name;
}

void mechanism_free(Mechanism *mechanism)
{
    if (!mechanism)
        return;
    for (int r = 0; r < mechanism->reactions; r++) {
        free(mechanism->reaction[r].equation);
        free(mechanism->reaction[r].source);
        free(mechanism->reaction[r].basis);
        free(mechanism->reaction[r].note);
    }
    free(mechanism->reaction);
    free(mechanism->item);
    free(mechanism->solved_item);
    free(mechanism->path);
    free(mechanism->title);
    free(mechanism->version);
    free(mechanism->citations);
    free(mechanism);
}

/* ---- elements and sources ---- */

static int read_elements(const Reading *reading, const config_setting_t *root)
{
    Mechanism *mechanism = reading->mechanism;
    const config_setting_t *list = config_setting_get_member(root, "elements");
    if (!list)
        return fault_at(
            reading->fault, reading->path, 0,
            "elements is missing; list the chemical elements, such as elements = [ \"H\", \"O\" ];");
    int type = config_setting_type(list), length = config_setting_length(list);
    if (type != CONFIG_TYPE_ARRAY && type != CONFIG_TYPE_LIST)
        return reading_fault(reading, list, "elements is no list; write symbols in [ ]");
    if (length > MECHANISM_ELEMENTS)
        return reading_fault(reading, list, "elements has %d entries; at most %d fit", length,
                             MECHANISM_ELEMENTS);
    for (int e = 0; e < length; e++) {
        const config_setting_t *entry = config_setting_get_elem(list, (unsigned)e);
        const char *symbol = config_setting_get_string(entry);
        if (!symbol)
            return reading_fault(reading, entry, "elements: entry %d is no text; write \"H\"", e + 1);
        if (!formula_known_element(symbol))
            return reading_fault(
                reading, entry,
                "elements: no atomic weight is known for \"%.20s\"; write the symbol of an element", symbol);
        if (mechanism_element(mechanism, symbol) >= 0)
            return reading_fault(reading, entry, "elements: %s is given twice; remove one", symbol);
        strcpy(mechanism->element[mechanism->elements++], symbol);
    }
    return 0;
}

/* Keys for the reactions to name, texts into one string, a line each. */
static int read_sources(Reading *reading, const config_setting_t *root)
{
    static const char *const known[] = {"key", "text"};
    const config_setting_t *list;
    int length;
    if (reading_list(reading, root, "sources", &list, &length))
        return reading->fault->code;
    reading->source = malloc((size_t)(length + 1) * sizeof *reading->source);
    char *citations = calloc(1, 1);
    reading->mechanism->citations = citations;
    if (!reading->source || !citations)
        return fault_memory(reading->fault, "the mechanism's sources");
    for (int i = 0; i < length; i++) {
        const config_setting_t *group = config_setting_get_elem(list, (unsigned)i);
        const char *key = NULL, *text = NULL;
        if (reading_keys(reading, group, "source", known, 2) ||
            reading_text(reading, group, "source", "key", REQUIRED, &key) ||
            reading_text(reading, group, "source", "text", REQUIRED, &text))
            return reading->fault->code;
        if (!*key || strpbrk(key, " \t\n"))
            return reading_fault(reading, group, "source: the key \"%.60s\" must be one word; shorten it",
                                 key);
        for (int j = 0; j < reading->sources; j++)
            if (strcmp(reading->source[j], key) == 0)
                return reading_fault(reading, group, "source: the key %.60s is given twice; remove one", key);
        size_t used = strlen(citations);
        char *longer = realloc(citations, used + strlen(text) + 2);
        if (!longer)
            return fault_memory(reading->fault, "the mechanism's sources");
        reading->mechanism->citations = citations = longer;
        sprintf(citations + used, "%s%s", used ? "\n" : "", text);
        reading->source[reading->sources++] = key;
    }
    return 0;
}

/* ---- species ---- */

/* A name must survive in an equation: a word that no coefficient, sign or brace can be taken for. */
static int check_name(const Reading *reading, const config_setting_t *group, const char *name)
{
    int plain = isalpha((unsigned char)name[0]) && !strpbrk(name, " \t\r\n{}\"") && !strstr(name, "->") &&
                !strstr(name, "(+M)") && strcmp(name, "hv") != 0;
    if (plain)
        return 0;
    return reading_fault(
        reading, group,
        "species: the name \"%s\" cannot stand in an equation; start it with a letter, use no blanks, "
        "braces or arrows, and not hv",
        name);
}

static int check_species_values(const Reading *reading, const config_setting_t *group, const char *label,
                                const Species *species)
{
    static const char *const solved_only[] = {"transport", "washout"};
    int has_share = config_setting_get_member(group, "share") != NULL;
    if (species->role == ROLE_FIXED && !has_share)
        return reading_fault(reading, group,
                             "%s: share is missing; give the mole fraction of air of a fixed species", label);
    if (species->role != ROLE_FIXED && has_share)
        return reading_fault(reading, config_setting_get_member(group, "share"),
                             "%s: share belongs to species of role \"fixed\"; remove it or set the role",
                             label);
    for (size_t k = 0; k < 2 && species->role != ROLE_ACTIVE; k++) {
        const config_setting_t *stray = config_setting_get_member(group, solved_only[k]);
        if (stray)
            return reading_fault(reading, stray, "%s: %s belongs to species of role \"active\"; remove it",
                                 label, solved_only[k]);
    }
    if (strcmp(species->name, "M") == 0 && (species->role != ROLE_FIXED || species->share != 1.0))
        return reading_fault(reading, group, "%s is air itself; give it role = \"fixed\" and share = 1.0",
                             label);
    return 0;
}

static int read_one_species(const Reading *reading, const config_setting_t *group)
{
    static const char *const known[] = {"name", "formula", "role", "share", "transport", "washout", "note"};
    static const char *const roles[] = {"active", "fixed", "inert"}; /* by enum SpeciesRole */
    Mechanism *mechanism = reading->mechanism;
    Species species = {.role = ROLE_ACTIVE, .transport = 1, .solved = -1};
    if (reading_word(reading, group, "species", "name", REQUIRED, species.name, sizeof species.name) ||
        check_name(reading, group, species.name))
        return reading->fault->code;
    char label[MECHANISM_NAME + 12];
    snprintf(label, sizeof label, "species %s", species.name);
    if (equation_species(mechanism, species.name) >= 0)
        return reading_fault(reading, group, "%s is given twice; remove or rename one", label);

    const char *formula = NULL, *note = NULL;
    int third_body = strcmp(species.name, "M") == 0;
    if (reading_keys(reading, group, label, known, sizeof known / sizeof *known) ||
        reading_text(reading, group, label, "formula", REQUIRED, &formula) ||
        reading_choice(reading, group, label, "role", NOT_REQUIRED, roles, 3, &species.role) ||
        reading_number(reading, group, label, "share", NOT_REQUIRED, 0.0, 1.0, &species.share) ||
        reading_number(reading, group, label, "washout", NOT_REQUIRED, 0.0, 1.0, &species.washout) ||
        reading_flag(reading, group, label, "transport", &species.transport) ||
        reading_text(reading, group, label, "note", NOT_REQUIRED, &note) ||
        check_species_values(reading, group, label, &species))
        return reading->fault->code;
    const config_setting_t *formula_setting = config_setting_get_member(group, "formula");
    if (strlen(formula) >= sizeof species.formula)
        return reading_fault(reading, formula_setting, "%s: the formula has %zu characters; at most %zu fit",
                             label, strlen(formula), sizeof species.formula - 1);
    if (third_body != (*formula == '\0'))
        return reading_fault(
            reading, formula_setting,
            "%s: the formula is %s; M alone, which stands for any molecule of air, has the formula \"\"",
            label, third_body ? "not empty" : "empty");
    strcpy(species.formula, formula);
    Place place = reading_place(reading, formula_setting, label);
    if (formula_read(mechanism, formula, &place, species.atoms, &species.molar_mass, reading->fault))
        return reading->fault->code;
    if (species.role != ROLE_ACTIVE)
        species.transport = 0;
    if (species.role == ROLE_ACTIVE) {
        species.solved = mechanism->solved;
        mechanism->solved_item[mechanism->solved++] = mechanism->species;
    }
    mechanism->item[mechanism->species++] = species;
    return 0;
}

static int read_species(const Reading *reading, const config_setting_t *root)
{
    Mechanism *mechanism = reading->mechanism;
    const config_setting_t *list;
    int length;
    if (reading_list(reading, root, "species", &list, &length))
        return reading->fault->code;
    if (length == 0)
        return fault_at(
            reading->fault, reading->path, 0,
            "species is missing or empty; list what the mechanism holds, species = ( { ... }, ... );");
    mechanism->item = calloc((size_t)length, sizeof *mechanism->item);
    mechanism->solved_item = calloc((size_t)length, sizeof *mechanism->solved_item);
    if (!mechanism->item || !mechanism->solved_item)
        return fault_memory(reading->fault, "the mechanism's species");
    for (int i = 0; i < length; i++)
        if (read_one_species(reading, config_setting_get_elem(list, (unsigned)i)))
            return reading->fault->code;
    if (mechanism->solved == 0)
        return reading_fault(reading, list, "no species is active; there is nothing to solve for");
    return 0;
}

/* ---- the file ---- */

static int copy_text(const Reading *reading, const config_setting_t *root, const char *key, char **copy)
{
    const char *text = "";
    if (reading_text(reading, root, "mechanism", key, NOT_REQUIRED, &text))
        return reading->fault->code;
    *copy = strdup(text);
    return *copy ? 0 : fault_memory(reading->fault, "the mechanism's title");
}

static int read_root(Reading *reading, const config_setting_t *root)
{
    static const char *const known[] = {"title",   "version", "elements",   "sources",
                                        "species", "thermal", "photolysis", "surface"};
    if (reading_keys(reading, root, "mechanism", known, sizeof known / sizeof *known) ||
        copy_text(reading, root, "title", &reading->mechanism->title) ||
        copy_text(reading, root, "version", &reading->mechanism->version) || read_elements(reading, root) ||
        read_sources(reading, root) || read_species(reading, root))
        return reading->fault->code;
    return reading_reactions(reading, root);
}

static int parse(Reading *reading, const char *text)
{
    config_t config;
    config_init(&config);
    config_set_include_dir(&config, reading->folder);
    int code;
    if (config_read_string(&config, text) == CONFIG_TRUE) {
        code = read_root(reading, config_root_setting(&config));
    } else {
        const char *file = config_error_file(&config), *what = config_error_text(&config);
        if (file)
            snprintf(reading->included, READING_PATH, "%s/%s", reading->folder, file);
        int twice = what && strstr(what, "duplicate") != NULL;
        code = fault_at(reading->fault, file ? reading->included : reading->path, config_error_line(&config),
                        "%s; %s", what ? what : "not readable as a mechanism",
                        twice ? "a key may stand once in a group"
                              : "look there or just before for a missing ; , or quote");
    }
    config_destroy(&config);
    return code;
}

int mechanism_read(Mechanism **read, const char *path, Fault *fault)
{
    *read = NULL;
    char *text = NULL;
    if (table_text(path, &text, NULL, fault))
        return fault->code;
    const char *slash = strrchr(path, '/');
    char *folder = slash ? strndup(path, slash == path ? 1 : (size_t)(slash - path)) : strdup(".");
    Reading reading = {.path = path, .folder = folder, .fault = fault};
    reading.mechanism = calloc(1, sizeof *reading.mechanism);
    reading.included = malloc(READING_PATH);
    if (reading.mechanism)
        reading.mechanism->path = strdup(path);
    int code = 0;
    if (!folder || !reading.included || !reading.mechanism || !reading.mechanism->path)
        code = fault_memory(fault, "the mechanism");
    if (!code)
        code = settings_scan(text, path, folder, fault);
    if (!code)
        code = parse(&reading, text);
    free(reading.source);
    free(reading.included);
    free(folder);
    free(text);
    if (code) {
        mechanism_free(reading.mechanism);
        return code;
    }
    *read = reading.mechanism;
    return 0;
}
