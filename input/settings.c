/* settings: reading and checking of the case; contract in settings.h, keys in settings_keys.c. */
#define _XOPEN_SOURCE 700
#include "settings.h"

#include <libconfig.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "settings_keys.h"
#include "settings_scan.h"
#include "table.h"

enum { INCLUDED_PATH = 2 * SETTINGS_PATH };

typedef struct {
    Settings *settings;
    const char *path;                                  /* the case file */
    const config_setting_t *given[SETTINGS_MOST_KEYS]; /* NULL when a key has its default */
    char *included; /* [INCLUDED_PATH] room for the path of an included file */
    Fault *fault;
} Reading;

/* libconfig knows no name for the case itself and an included file by the name it was included by. */
static const char *full_path(const Reading *reading, const char *file)
{
    if (!file)
        return reading->path;
    snprintf(reading->included, INCLUDED_PATH, "%s/%s", reading->settings->case_dir, file);
    return reading->included;
}

static const char *file_of(const Reading *reading, const config_setting_t *setting)
{
    return full_path(reading, config_setting_source_file(setting));
}

static int line_of(const config_setting_t *setting)
{
    return (int)config_setting_source_line(setting);
}

static const char *type_word(const config_setting_t *setting)
{
    switch (config_setting_type(setting)) {
    case CONFIG_TYPE_INT:
    case CONFIG_TYPE_INT64: return "a whole number";
    case CONFIG_TYPE_FLOAT: return "a number with a decimal point";
    case CONFIG_TYPE_STRING: return "text";
    case CONFIG_TYPE_BOOL: return "true or false";
    case CONFIG_TYPE_GROUP: return "a group";
    case CONFIG_TYPE_ARRAY: return "an array";
    case CONFIG_TYPE_LIST: return "a list";
    default: return "nothing";
    }
}

/* ---- single values ---- */

static int wrong_type(const Reading *reading, const config_setting_t *setting, const char *label,
                      const char *wanted)
{
    return fault_at(reading->fault, file_of(reading, setting), line_of(setting), "%s is %s; write %s", label,
                    type_word(setting), wanted);
}

/* A number, whole or not: libconfig itself would refuse 1 for 1.0. */
static int read_number(const Reading *reading, const config_setting_t *setting, const char *label, double low,
                       double high, const char *unit, double *value)
{
    switch (config_setting_type(setting)) {
    case CONFIG_TYPE_INT:
    case CONFIG_TYPE_INT64: *value = (double)config_setting_get_int64(setting); break;
    case CONFIG_TYPE_FLOAT: *value = config_setting_get_float(setting); break;
    default: return wrong_type(reading, setting, label, "a number, without quotes");
    }
    if (!(*value >= low && *value <= high))
        return fault_at(reading->fault, file_of(reading, setting), line_of(setting),
                        "%s is %.10g; it must lie between %g and %g%s%s", label, *value, low, high,
                        *unit ? " " : "", unit);
    return 0;
}

static int read_whole(const Reading *reading, const config_setting_t *setting, const char *label,
                      const SettingKey *key, int *value)
{
    int type = config_setting_type(setting);
    if (type != CONFIG_TYPE_INT && type != CONFIG_TYPE_INT64)
        return wrong_type(reading, setting, label, "a whole number, without quotes");
    double number;
    if (read_number(reading, setting, label, key->low, key->high, key->unit, &number))
        return reading->fault->code;
    *value = (int)number;
    return 0;
}

static int read_text(const Reading *reading, const config_setting_t *setting, const char *label,
                     int may_be_empty, char *text, size_t size)
{
    if (config_setting_type(setting) != CONFIG_TYPE_STRING)
        return wrong_type(reading, setting, label, "text in double quotes");
    const char *given = config_setting_get_string(setting);
    if (strlen(given) >= size)
        return fault_at(reading->fault, file_of(reading, setting), line_of(setting),
                        "%s has %zu characters; at most %zu fit", label, strlen(given), size - 1);
    if (!*given && !may_be_empty)
        return fault_at(reading->fault, file_of(reading, setting), line_of(setting),
                        "%s is empty; write a name, or leave the key out for the default", label);
    strcpy(text, given);
    return 0;
}

static int read_choice(const Reading *reading, const config_setting_t *setting, const char *label,
                       const char *const *choices, int *value)
{
    if (config_setting_type(setting) != CONFIG_TYPE_STRING)
        return wrong_type(reading, setting, label, "one of its words in double quotes");
    const char *word = config_setting_get_string(setting);
    char list[200] = "";
    size_t count = 0, used = 0;
    for (; choices[count]; count++) {
        if (strcmp(word, choices[count]) == 0) {
            *value = (int)count;
            return 0;
        }
        used +=
            (size_t)snprintf(list + used, sizeof list - used, "%s\"%s\"", count ? ", " : "", choices[count]);
    }
    const char *near = fault_nearest(word, choices, count);
    return fault_at(reading->fault, file_of(reading, setting), line_of(setting),
                    "%s is \"%.60s\"; write one of %s%s%s%s", label, word, list,
                    near ? " (did you mean " : "", near ? near : "", near ? "?)" : "");
}

/* ---- lists ---- */

static int is_list(const config_setting_t *setting)
{
    int type = config_setting_type(setting);
    return type == CONFIG_TYPE_LIST || type == CONFIG_TYPE_ARRAY;
}

static int read_edges(const Reading *reading, const config_setting_t *setting, const char *label,
                      const SettingKey *key)
{
    Settings *settings = reading->settings;
    const char *file = file_of(reading, setting);
    if (!is_list(setting))
        return wrong_type(reading, setting, label, "a list of numbers, such as [0.0, 1.0, 2.0]");
    int count = config_setting_length(setting), line = line_of(setting);
    if (count == 0) {
        settings->edges = 0;
        return 0;
    }
    if (count < 5 || count > SETTINGS_MAX_EDGES)
        return fault_at(reading->fault, file, line, "%s lists %d edges; give 5 to %d", label, count,
                        SETTINGS_MAX_EDGES);
    for (int e = 0; e < count; e++) {
        const config_setting_t *element = config_setting_get_elem(setting, (unsigned)e);
        if (read_number(reading, element, label, key->low, key->high, key->unit, &settings->edge_km[e]))
            return reading->fault->code;
        if (e > 0 && !(settings->edge_km[e] > settings->edge_km[e - 1]))
            return fault_at(reading->fault, file, line_of(element), "%s has %g after %g; edges must increase",
                            label, settings->edge_km[e], settings->edge_km[e - 1]);
    }
    if (settings->edge_km[0] != 0)
        return fault_at(reading->fault, file, line, "%s starts at %g; the first edge is the ground, 0", label,
                        settings->edge_km[0]);
    settings->edges = count;
    return 0;
}

static int read_bound(const Reading *reading, const config_setting_t *entry, const char *label,
                      SurfaceBound *bound)
{
    static const char *const names[] = {"species", "kind", "mole_fraction", "velocity_cm_s"};
    const char *file = file_of(reading, entry);
    int line = line_of(entry);
    if (config_setting_type(entry) != CONFIG_TYPE_GROUP)
        return wrong_type(reading, entry, label,
                          "groups, such as {species = \"O3\"; kind = \"deposition\"; "
                          "velocity_cm_s = 0.1;}");
    for (int m = 0; m < config_setting_length(entry); m++) {
        const config_setting_t *member = config_setting_get_elem(entry, (unsigned)m);
        const char *name = config_setting_name(member);
        int known = 0;
        for (int n = 0; n < 4; n++)
            known |= strcmp(name, names[n]) == 0;
        if (!known) {
            const char *near = fault_nearest(name, names, 4);
            return fault_at(reading->fault, file, line_of(member), "%s has no key %.60s; %s%s%s", label, name,
                            near ? "did you mean " : "use species, kind, mole_fraction, velocity_cm_s",
                            near ? near : "", near ? "?" : "");
        }
    }
    const config_setting_t *species = config_setting_get_member(entry, "species");
    const config_setting_t *kind = config_setting_get_member(entry, "kind");
    if (!species || !kind)
        return fault_at(reading->fault, file, line, "an entry of %s has no %s; add it", label,
                        species ? "kind" : "species");
    if (read_text(reading, species, "species", 0, bound->species, sizeof bound->species) ||
        read_choice(reading, kind, "kind", bound_kinds, &bound->kind))
        return reading->fault->code;
    bound->line = config_setting_source_file(entry) ? 0 : line;
    const char *wanted = bound_value_keys[bound->kind], *other = bound_value_keys[!bound->kind];
    const config_setting_t *value = config_setting_get_member(entry, wanted);
    const config_setting_t *stray = config_setting_get_member(entry, other);
    if (stray)
        return fault_at(reading->fault, file, line_of(stray), "%s does not go with kind = \"%s\"; use %s",
                        other, bound_kinds[bound->kind], wanted);
    if (!value)
        return fault_at(reading->fault, file, line, "the entry of %s for %s has no %s; add it", label,
                        bound->species, wanted);
    int fixed = bound->kind == BOUND_FIXED;
    return read_number(reading, value, wanted, 0, fixed ? 1 : BOUND_VELOCITY_MOST,
                       fixed ? "mol mol-1" : "cm s-1", &bound->value);
}

static int read_bounds(const Reading *reading, const config_setting_t *setting, const char *label)
{
    Settings *settings = reading->settings;
    if (!is_list(setting))
        return wrong_type(reading, setting, label, "a list in round brackets, ( {...}, {...} )");
    int count = config_setting_length(setting);
    if (count > SETTINGS_MAX_BOUNDS)
        return fault_at(reading->fault, file_of(reading, setting), line_of(setting),
                        "%s has %d entries; at most %d fit", label, count, SETTINGS_MAX_BOUNDS);
    settings->bounds = 0;
    settings->bounds_given = 1;
    for (int b = 0; b < count; b++) {
        const config_setting_t *entry = config_setting_get_elem(setting, (unsigned)b);
        if (read_bound(reading, entry, label, &settings->bound[b]))
            return reading->fault->code;
        for (int a = 0; a < b; a++)
            if (strcmp(settings->bound[a].species, settings->bound[b].species) == 0)
                return fault_at(reading->fault, file_of(reading, entry), line_of(entry),
                                "%s names %s twice; keep one entry", label, settings->bound[b].species);
        settings->bounds = b + 1;
    }
    return 0;
}

static int read_layers(const Reading *reading, const config_setting_t *setting, const char *label)
{
    Settings *settings = reading->settings;
    const char *file = file_of(reading, setting);
    if (!is_list(setting))
        return wrong_type(reading, setting, label,
                          "a list of file names, such as [\"late.csv\", \"leak.csv\"]");
    int count = config_setting_length(setting);
    if (count > SETTINGS_MAX_LAYERS)
        return fault_at(reading->fault, file, line_of(setting), "%s lists %d files; at most %d fit", label,
                        count, SETTINGS_MAX_LAYERS);
    settings->schedule_layers = 0;
    for (int l = 0; l < count; l++) {
        const config_setting_t *element = config_setting_get_elem(setting, (unsigned)l);
        if (read_text(reading, element, label, 0, settings->schedule_layer[l], SETTINGS_PATH))
            return reading->fault->code;
        for (int a = 0; a < l; a++)
            if (strcmp(settings->schedule_layer[a], settings->schedule_layer[l]) == 0)
                return fault_at(reading->fault, file, line_of(element), "%s names %s twice; keep one", label,
                                settings->schedule_layer[l]);
        settings->schedule_layers = l + 1;
    }
    return 0;
}

/* ---- keys and groups ---- */

static int read_key(Reading *reading, const config_setting_t *setting, const SettingKey *key, size_t index)
{
    char label[100], *member = (char *)reading->settings + key->offset;
    snprintf(label, sizeof label, "%s%s%s", key->group, *key->group ? "." : "", key->name);
    reading->given[index] = setting;
    switch (key->type) {
    case KEY_WHOLE: return read_whole(reading, setting, label, key, (int *)(void *)member);
    case KEY_REAL:
        return read_number(reading, setting, label, key->low, key->high, key->unit, (double *)(void *)member);
    case KEY_TEXT: return read_text(reading, setting, label, key->low < 1, member, key->size);
    case KEY_CHOICE: return read_choice(reading, setting, label, key->choices, (int *)(void *)member);
    case KEY_EDGES: return read_edges(reading, setting, label, key);
    case KEY_LAYERS: return read_layers(reading, setting, label);
    default: return read_bounds(reading, setting, label);
    }
}

/* Names that may stand in group (group names too, at the top level); returns their number. */
static size_t names_in(const char *group, const char **names)
{
    size_t count, used = 0;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++) {
        if (strcmp(keys[k].group, group) == 0)
            names[used++] = keys[k].name;
        else if (!*group && (k == 0 || strcmp(keys[k].group, keys[k - 1].group) != 0))
            names[used++] = keys[k].group;
    }
    return used;
}

static int unknown_key(const Reading *reading, const config_setting_t *setting, const char *group)
{
    const char *name = config_setting_name(setting), *names[SETTINGS_MOST_KEYS];
    const char *file = file_of(reading, setting);
    int line = line_of(setting);
    const char *near = fault_nearest(name, names, names_in(group, names));
    const char *dot = *group ? "." : "";
    if (near)
        return fault_at(reading->fault, file, line, "unknown key %s%s%.60s; did you mean %s%s%s?", group, dot,
                        name, group, dot, near);
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++)
        if (strcmp(keys[k].name, name) == 0)
            return fault_at(reading->fault, file, line, "unknown key %s%s%.60s; %s belongs %s%s", group, dot,
                            name, name, *keys[k].group ? "in the group " : "outside groups", keys[k].group);
    return fault_at(reading->fault, file, line,
                    "unknown key %s%s%.60s; remove it (check prints every key there is)", group, dot, name);
}

static int read_group(Reading *reading, const config_setting_t *group_setting, const char *group)
{
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (int m = 0; m < config_setting_length(group_setting); m++) {
        const config_setting_t *setting = config_setting_get_elem(group_setting, (unsigned)m);
        const char *name = config_setting_name(setting);
        size_t k = 0;
        while (k < count && !(strcmp(keys[k].group, group) == 0 && strcmp(keys[k].name, name) == 0))
            k++;
        int code;
        if (k < count) {
            code = read_key(reading, setting, &keys[k], k);
        } else {
            size_t g = 0; /* at the top level it may be a group */
            while (!*group && g < count && strcmp(keys[g].group, name) != 0)
                g++;
            if (*group || g == count)
                code = unknown_key(reading, setting, group);
            else if (config_setting_type(setting) != CONFIG_TYPE_GROUP)
                code = wrong_type(reading, setting, name, "a group in braces, { ... }");
            else
                code = read_group(reading, setting, keys[g].group);
        }
        if (code)
            return code;
    }
    return 0;
}

/* ---- what no single key can tell ---- */

/* A fault at the place of the first of the named keys that the case gives. */
static int clash(const Reading *reading, const char *group, const char *one, const char *other,
                 const char *text)
{
    size_t count, at = SIZE_MAX;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++) {
        if (strcmp(keys[k].group, group) != 0 || !reading->given[k])
            continue;
        if (strcmp(keys[k].name, one) == 0 || (strcmp(keys[k].name, other) == 0 && at == SIZE_MAX))
            at = k;
    }
    if (at == SIZE_MAX)
        return fault_at(reading->fault, reading->path, 0, "%s", text);
    return fault_at(reading->fault, file_of(reading, reading->given[at]), line_of(reading->given[at]), "%s",
                    text);
}

static int check_file(const Reading *reading, const config_setting_t *setting, const char *key,
                      const char *name)
{
    const Settings *settings = reading->settings;
    char found[2 * SETTINGS_PATH + 2], what[100];
    Fault missing = {0};
    snprintf(what, sizeof what, "files.%s", key);
    if (table_locate(what, name, settings->case_dir, settings->data_dir, found, sizeof found, &missing))
        return fault_at(reading->fault, file_of(reading, setting), line_of(setting), "%s", missing.text);
    return 0;
}

/* Every file the case names can be read; table_locate alone knows no line of the case. */
static int check_files(const Reading *reading)
{
    const Settings *settings = reading->settings;
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++) {
        const config_setting_t *setting = reading->given[k];
        const char *name = (const char *)settings + keys[k].offset;
        if (!setting || strcmp(keys[k].group, "files") != 0)
            continue;
        if (keys[k].type == KEY_LAYERS) {
            for (int l = 0; l < settings->schedule_layers; l++)
                if (check_file(reading, config_setting_get_elem(setting, (unsigned)l), keys[k].name,
                               settings->schedule_layer[l]))
                    return reading->fault->code;
        } else if (*name && check_file(reading, setting, keys[k].name, name)) {
            return reading->fault->code;
        }
    }
    return 0;
}

/* Tables by month go with a season, and with the table that holds the gas at all. */
static int is_given(const Reading *reading, const char *group, const char *name)
{
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++)
        if (!strcmp(keys[k].group, group) && !strcmp(keys[k].name, name))
            return reading->given[k] != NULL;
    return 0;
}

static int check_season(Reading *reading)
{
    Settings *settings = reading->settings;
    const struct {
        const char *name, *file, *base_name, *base;
    } tables[] = {{"air_by_month", settings->month_air_file, NULL, NULL},
                  {"tropospheric_oh_by_month", settings->month_oh_file, "tropospheric_oh",
                   settings->tropospheric_oh_file},
                  {"tropospheric_water_by_month", settings->month_water_file, "tropospheric_water",
                   settings->tropospheric_water_file},
                  {"tropospheric_no2_by_month", settings->month_no2_file, "tropospheric_no2",
                   settings->tropospheric_no2_file}};
    char text[300];
    for (size_t t = 0; t < sizeof tables / sizeof tables[0]; t++) {
        if (!tables[t].file[0])
            continue;
        if (settings->sun != SUN_SEASON) {
            snprintf(text, sizeof text,
                     "files.%s goes with sun.kind = \"season\" alone; set it, or leave the table out",
                     tables[t].name);
            return clash(reading, "files", tables[t].name, "", text);
        }
        if (tables[t].base && !tables[t].base[0]) {
            snprintf(text, sizeof text, "files.%s is given, but files.%s is empty; give both or neither",
                     tables[t].name, tables[t].base_name);
            return clash(reading, "files", tables[t].name, "", text);
        }
    }
    if (settings->sun == SUN_SEASON && settings->start == START_SETTLED) {
        if (is_given(reading, "numerics", "start"))
            return clash(reading, "numerics", "start", "",
                         "with sun.kind = \"season\" the column is never at rest; take numerics.start = "
                         "\"spinup\"");
        settings->start = START_SPINUP; /* as the help of the key says */
    }
    if (settings->sun == SUN_SEASON && settings->moments != MOMENTS_NONE)
        return clash(
            reading, "output", "moments", "",
            "output.moments goes with one day's sunrise, which sun.kind = \"season\" moves from day to "
            "day; take sun.kind = \"latitude\" with a day_of_year, or output.moments = \"none\"");
    double years = settings->spinup_years;
    if (settings->sun == SUN_SEASON && years != floor(years))
        return clash(
            reading, "numerics", "spinup_years", "",
            "numerics.spinup_years must be whole with sun.kind = \"season\", so that the run starts in "
            "January; round it");
    return 0;
}

static int check_together(Reading *reading)
{
    Settings *settings = reading->settings;
    char text[300];
    if (settings->last_year < settings->first_year) {
        snprintf(text, sizeof text, "years.last (%d) comes before years.first (%d); swap or correct them",
                 settings->last_year, settings->first_year);
        return clash(reading, "years", "last", "first", text);
    }
    if (settings->edges > 0) {
        settings->top_km = settings->edge_km[settings->edges - 1];
        if (settings->top_km < 20)
            return clash(reading, "grid", "edges_km", "", "grid.edges_km ends below 20 km; carry it higher");
    } else {
        double layers = settings->top_km / settings->spacing_km;
        if (fabs(layers - round(layers)) > 1e-6 || layers > SETTINGS_MAX_EDGES - 1) {
            snprintf(text, sizeof text,
                     "grid.top_km / grid.spacing_km is %.6g layers; make it a whole number up to %d, "
                     "or list grid.edges_km",
                     layers, SETTINGS_MAX_EDGES - 1);
            return clash(reading, "grid", "spacing_km", "top_km", text);
        }
    }
    if (settings->day == DAY_EXPLICIT && settings->outputs_per_year > 365) {
        snprintf(text, sizeof text,
                 "output.per_year is %d, and some interval would hold none of the whole days of day.mode = "
                 "\"explicit\"; give at most 365",
                 settings->outputs_per_year);
        return clash(reading, "output", "per_year", "", text);
    }
    if (settings->moments != MOMENTS_NONE && settings->day == DAY_MEAN)
        return clash(
            reading, "output", "moments", "",
            "output.moments asks for values by time of day, which day.mode = \"mean\" has not; take day.mode "
            "= \"factors\" or \"explicit\", or output.moments = \"none\"");
    if (settings->temperature == TEMPERATURE_FILE && !settings->temperature_file[0])
        return clash(reading, "temperature", "mode", "",
                     "temperature.mode is \"file\", but files.temperature_change names none; name the table");
    if (settings->temperature != TEMPERATURE_FILE && settings->temperature_file[0])
        return clash(
            reading, "files", "temperature_change", "",
            "files.temperature_change is used with temperature.mode = \"file\" alone; set the mode, or "
            "leave the file out");
    if (settings->uvb_limit_nm != 315 && settings->uvb_limit_nm != 320) {
        snprintf(text, sizeof text,
                 "ultraviolet.uvb_limit_nm is %d; give 315 (ISO 21348, CIE) or 320 (older practice)",
                 settings->uvb_limit_nm);
        return clash(reading, "ultraviolet", "uvb_limit_nm", "", text);
    }
    return check_season(reading) ? reading->fault->code : check_files(reading);
}

/* ---- the whole file ---- */

static int set_paths(Settings *settings, const char *path, Fault *fault)
{
    if (strlen(path) >= SETTINGS_PATH)
        return fault_set(fault, FAULT_INPUT, "%.80s...: the path has more than %d characters; shorten it",
                         path, SETTINGS_PATH - 1);
    strcpy(settings->case_path, path);
    const char *slash = strrchr(path, '/');
    if (!slash)
        strcpy(settings->case_dir, ".");
    else
        snprintf(settings->case_dir, SETTINGS_PATH, "%.*s", slash == path ? 1 : (int)(slash - path), path);
    return 0;
}

static int read_config(Reading *reading, config_t *config, const char *text)
{
    if (config_read_string(config, text) == CONFIG_TRUE)
        return read_group(reading, config_root_setting(config), "") ? reading->fault->code
                                                                    : check_together(reading);
    const char *file = config_error_file(config), *what = config_error_text(config);
    const char *advice = "look there and on the line above for a missing semicolon, quote or bracket";
    if (what && strstr(what, "duplicate"))
        advice = "a key or group may stand only once; remove one";
    else if (what && strstr(what, "mismatched"))
        advice = "write every number of the array with a decimal point, or use round brackets";
    return fault_at(reading->fault, full_path(reading, file), config_error_line(config), "%s; %s",
                    what ? what : "cannot be read", advice);
}

int settings_read(Settings *settings, const char *path, const char *data_dir, Fault *fault)
{
    settings_default(settings, data_dir);
    if (strlen(data_dir) >= SETTINGS_PATH)
        return fault_set(fault, FAULT_INPUT,
                         "%.80s...: the path of the data has more than %d characters; shorten it", data_dir,
                         SETTINGS_PATH - 1);
    char *text;
    if (set_paths(settings, path, fault) || table_text(path, &text, NULL, fault))
        return fault->code;
    char included[INCLUDED_PATH];
    Reading reading = {.settings = settings, .path = path, .included = included, .fault = fault};
    if (!settings_scan(text, path, settings->case_dir, fault)) {
        config_t config;
        config_init(&config);
        config_set_include_dir(&config, settings->case_dir);
        read_config(&reading, &config, text);
        config_destroy(&config);
    }
    free(text);
    return fault->code;
}
