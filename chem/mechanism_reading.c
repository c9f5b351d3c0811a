/* mechanism_reading: see mechanism_reading.h. */
#include "mechanism_reading.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* libconfig knows no name for the file itself and an included one by the name it was included by. */
const char *reading_file(const Reading *reading, const config_setting_t *setting)
{
    const char *file = config_setting_source_file(setting);
    if (!file)
        return reading->path;
    snprintf(reading->included, READING_PATH, "%s/%s", reading->folder, file);
    return reading->included;
}

static int line_of(const config_setting_t *setting)
{
    return (int)config_setting_source_line(setting);
}

Place reading_place(const Reading *reading, const config_setting_t *setting, const char *label)
{
    return (Place){reading_file(reading, setting), line_of(setting), label};
}

int reading_fault(const Reading *reading, const config_setting_t *setting, const char *format, ...)
{
    char text[900];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);
    return fault_at(reading->fault, reading_file(reading, setting), line_of(setting), "%s", text);
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

static int wrong_type(const Reading *reading, const config_setting_t *setting, const char *label,
                      const char *key, const char *wanted)
{
    return reading_fault(reading, setting, "%s: %s is %s; write %s", label, key, type_word(setting), wanted);
}

int reading_list(const Reading *reading, const config_setting_t *root, const char *name,
                 const config_setting_t **list, int *length)
{
    *list = config_setting_get_member(root, name);
    *length = 0;
    if (!*list)
        return 0;
    int type = config_setting_type(*list);
    if (type != CONFIG_TYPE_LIST && !(type == CONFIG_TYPE_ARRAY && config_setting_length(*list) == 0))
        return reading_fault(reading, *list, "%s is %s; write a list of groups, ( { ... }, { ... } )", name,
                             type_word(*list));
    *length = config_setting_length(*list);
    for (int i = 0; i < *length; i++) {
        const config_setting_t *member = config_setting_get_elem(*list, (unsigned)i);
        if (!config_setting_is_group(member))
            return reading_fault(reading, member, "member %d of %s is %s; write a group, { ... }", i + 1,
                                 name, type_word(member));
    }
    return 0;
}

int reading_keys(const Reading *reading, const config_setting_t *group, const char *label,
                 const char *const *known, size_t count)
{
    int length = config_setting_length(group);
    for (int i = 0; i < length; i++) {
        const config_setting_t *member = config_setting_get_elem(group, (unsigned)i);
        const char *key = config_setting_name(member);
        size_t k = 0;
        while (k < count && strcmp(key, known[k]) != 0)
            k++;
        if (k < count)
            continue;
        const char *near = fault_nearest(key, known, count);
        if (near)
            return reading_fault(reading, member, "%s: unknown key %.60s; did you mean %s?", label, key,
                                 near);
        char list[400] = "";
        size_t used = 0;
        for (k = 0; k < count && used < sizeof list; k++)
            used += (size_t)snprintf(list + used, sizeof list - used, "%s%s", k ? ", " : "", known[k]);
        return reading_fault(reading, member, "%s: unknown key %.60s; remove it or write one of %s", label,
                             key, list);
    }
    return 0;
}

/* The member called key; a fault when it is required and absent. */
static int find(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                int required, const config_setting_t **member)
{
    *member = config_setting_get_member(group, key);
    if (*member || !required)
        return 0;
    return reading_fault(reading, group, "%s: %s is missing; add it", label, key);
}

int reading_text(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int required, const char **text)
{
    const config_setting_t *member;
    if (find(reading, group, label, key, required, &member))
        return reading->fault->code;
    if (!member)
        return 0;
    if (config_setting_type(member) != CONFIG_TYPE_STRING)
        return wrong_type(reading, member, label, key, "text in double quotes");
    *text = config_setting_get_string(member);
    return 0;
}

int reading_word(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int required, char *word, size_t size)
{
    const char *text = NULL;
    if (reading_text(reading, group, label, key, required, &text))
        return reading->fault->code;
    if (!text)
        return 0;
    const config_setting_t *member = config_setting_get_member(group, key);
    if (!*text)
        return reading_fault(reading, member, "%s: %s is empty; write a word", label, key);
    if (strlen(text) >= size)
        return reading_fault(reading, member, "%s: %s has %zu characters; at most %zu fit", label, key,
                             strlen(text), size - 1);
    strcpy(word, text);
    return 0;
}

int reading_number(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                   int required, double low, double high, double *value)
{
    const config_setting_t *member;
    if (find(reading, group, label, key, required, &member))
        return reading->fault->code;
    if (!member)
        return 0;
    double number;
    switch (config_setting_type(member)) { /* libconfig itself would refuse 1 for 1.0 */
    case CONFIG_TYPE_INT:
    case CONFIG_TYPE_INT64: number = (double)config_setting_get_int64(member); break;
    case CONFIG_TYPE_FLOAT: number = config_setting_get_float(member); break;
    default: return wrong_type(reading, member, label, key, "a number, without quotes");
    }
    if (!(number >= low && number <= high))
        return reading_fault(reading, member, "%s: %s is %.10g; it must lie between %g and %g", label, key,
                             number, low, high);
    *value = number;
    return 0;
}

int reading_flag(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int *value)
{
    const config_setting_t *member = config_setting_get_member(group, key);
    if (!member)
        return 0;
    if (config_setting_type(member) != CONFIG_TYPE_BOOL)
        return wrong_type(reading, member, label, key, "true or false, without quotes");
    *value = config_setting_get_bool(member) != 0;
    return 0;
}

int reading_choice(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                   int required, const char *const *words, size_t count, int *value)
{
    const char *word = NULL;
    if (reading_text(reading, group, label, key, required, &word))
        return reading->fault->code;
    if (!word)
        return 0;
    char list[300] = "";
    size_t used = 0;
    for (size_t i = 0; i < count; i++) {
        if (strcmp(word, words[i]) == 0) {
            *value = (int)i;
            return 0;
        }
        if (used < sizeof list)
            used += (size_t)snprintf(list + used, sizeof list - used, "%s\"%s\"", i ? ", " : "", words[i]);
    }
    const char *near = fault_nearest(word, words, count);
    return reading_fault(reading, config_setting_get_member(group, key),
                         "%s: %s is \"%.60s\"; write one of %s%s%s%s", label, key, word, list,
                         near ? " (did you mean " : "", near ? near : "", near ? "?)" : "");
}
