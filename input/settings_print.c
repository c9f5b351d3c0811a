/* settings_print: the defaults, and the resolved case as text; contract in settings.h. */
#define _POSIX_C_SOURCE 200809L
#include <stdlib.h>
#include <string.h>

#include "settings.h"
#include "settings_keys.h"

static void copy_text(char *to, size_t size, const char *from)
{
    snprintf(to, size, "%s", from ? from : "");
}

void settings_default(Settings *settings, const char *data_dir)
{
    memset(settings, 0, sizeof *settings);
    copy_text(settings->data_dir, sizeof settings->data_dir, data_dir);
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    for (size_t k = 0; k < count; k++) {
        void *member = (char *)settings + keys[k].offset;
        if (keys[k].type == KEY_WHOLE || keys[k].type == KEY_CHOICE)
            *(int *)member = (int)keys[k].standard;
        else if (keys[k].type == KEY_REAL)
            *(double *)member = keys[k].standard;
        else if (keys[k].type == KEY_TEXT)
            copy_text(member, keys[k].size, keys[k].text);
    }
    const StandardBound *bounds = settings_standard_bounds(&count);
    for (size_t b = 0; b < count; b++) {
        SurfaceBound *bound = &settings->bound[b];
        copy_text(bound->species, sizeof bound->species, bounds[b].species);
        bound->kind = bounds[b].kind;
        bound->value = bounds[b].value;
    }
    settings->bounds = (int)count;
}

/* ---- printing ---- */

/* The shortest decimal text that reads back as the same double, with the point or exponent by which
 * libconfig knows it from a whole number. */
static void print_real(double value, FILE *out)
{
    char text[40];
    for (int digits = 6; digits <= 17; digits++) { /* 6: 80.0 and not 8e+01 */
        snprintf(text, sizeof text, "%.*g", digits, value);
        if (strtod(text, NULL) == value)
            break;
    }
    fputs(text, out);
    if (!strpbrk(text, ".e"))
        fputs(".0", out);
}

static void print_quoted(const char *text, FILE *out)
{
    fputc('"', out);
    for (; *text; text++) {
        unsigned char c = (unsigned char)*text;
        if (c == '"' || c == '\\')
            fprintf(out, "\\%c", c);
        else if (c < 0x20)
            fprintf(out, "\\x%02x", c);
        else
            fputc(c, out);
    }
    fputc('"', out);
}

/* The note of a bound that stands unchanged from the built-in list, else NULL. */
static const char *note_of(const SurfaceBound *bound)
{
    size_t count;
    const StandardBound *standard = settings_standard_bounds(&count);
    for (size_t b = 0; b < count; b++)
        if (strcmp(standard[b].species, bound->species) == 0 && standard[b].kind == bound->kind &&
            standard[b].value == bound->value)
            return standard[b].note;
    return NULL;
}

static void print_bounds(const Settings *settings, int help, FILE *out)
{
    fputs("(", out);
    for (int b = 0; b < settings->bounds; b++) {
        const SurfaceBound *bound = &settings->bound[b];
        const char *note = help ? note_of(bound) : NULL;
        fputs("\n", out);
        if (note)
            fprintf(out, "        # %s\n", note);
        fputs("        { species = ", out);
        print_quoted(bound->species, out);
        fprintf(out, "; kind = \"%s\"; %s = ", bound_kinds[bound->kind], bound_value_keys[bound->kind]);
        print_real(bound->value, out);
        fprintf(out, "; }%s", b + 1 < settings->bounds ? "," : "");
    }
    fputs(settings->bounds ? "\n    )" : " )", out);
}

static void print_edges(const Settings *settings, FILE *out)
{
    fputs("[", out);
    for (int e = 0; e < settings->edges; e++) {
        fputs(e == 0 ? " " : e % 10 ? ", " : ",\n        ", out);
        print_real(settings->edge_km[e], out);
    }
    fputs(" ]", out);
}

static void print_layers(const Settings *settings, FILE *out)
{
    fputs("[", out);
    for (int l = 0; l < settings->schedule_layers; l++) {
        fputs(l == 0 ? " " : ", ", out);
        print_quoted(settings->schedule_layer[l], out);
    }
    fputs(" ]", out);
}

static void print_help(const SettingKey *key, const char *indent, FILE *out)
{
    fprintf(out, "%s# %s", indent, key->help);
    if (key->type == KEY_WHOLE || key->type == KEY_REAL || key->type == KEY_EDGES)
        fprintf(out, " [%g to %g%s%s]", key->low, key->high, *key->unit ? " " : "", key->unit);
    if (key->type == KEY_CHOICE)
        for (size_t c = 0; key->choices[c]; c++)
            fprintf(out, "%s\"%s\"%s", c ? " | " : " [", key->choices[c], key->choices[c + 1] ? "" : "]");
    fputs("\n", out);
}

static void print_key(const Settings *settings, const SettingKey *key, int help, FILE *out)
{
    const char *indent = *key->group ? "    " : "";
    const void *member = (const char *)settings + key->offset;
    if (help)
        print_help(key, indent, out);
    fprintf(out, "%s%s = ", indent, key->name);
    switch (key->type) {
    case KEY_WHOLE: fprintf(out, "%d", *(const int *)member); break;
    case KEY_REAL: print_real(*(const double *)member, out); break;
    case KEY_TEXT: print_quoted(member, out); break;
    case KEY_CHOICE: print_quoted(key->choices[*(const int *)member], out); break;
    case KEY_EDGES: print_edges(settings, out); break;
    case KEY_LAYERS: print_layers(settings, out); break;
    default: print_bounds(settings, help, out); break;
    }
    fputs(";\n", out);
}

void settings_print(const Settings *settings, int help, FILE *out)
{
    size_t count;
    const SettingKey *keys = settings_keys(&count);
    const char *group = "";
    for (size_t k = 0; k < count; k++) {
        if (strcmp(group, keys[k].group) != 0) {
            if (*group)
                fputs("};\n", out);
            group = keys[k].group;
            fprintf(out, "%s%s = {\n", help ? "\n" : "", group);
        }
        print_key(settings, &keys[k], help, out);
    }
    if (*group)
        fputs("};\n", out);
}

char *settings_text(const Settings *settings)
{
    char *text = NULL;
    size_t size;
    FILE *stream = open_memstream(&text, &size);
    if (!stream)
        return NULL;
    settings_print(settings, 0, stream);
    int failed = ferror(stream);
    if (fclose(stream) != 0 || failed) {
        free(text);
        return NULL;
    }
    return text;
}
