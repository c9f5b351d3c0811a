/* mechanism_reading: typed values from the groups of a mechanism file. Private to mechanism*.c.
 *
 * A label names the group in messages, e.g. reaction "O+O3". Every function leaves a fault that names file
 * and line, what is wrong and what to do. A key that is not required keeps the value the caller set before.
 */
#ifndef SKYMEND_MECHANISM_READING_H
#define SKYMEND_MECHANISM_READING_H

#include <libconfig.h>

#include "equation.h"
#include "mechanism.h"

enum { NOT_REQUIRED, REQUIRED };

typedef struct {
    Mechanism *mechanism;
    const char *path;
    const char *folder; /* of path: where included files are sought */
    int sources;
    const char **source; /* [sources] keys of the sources list, owned by the configuration */
    char *included;      /* [READING_PATH] room for the path of an included file */
    Fault *fault;
} Reading;

enum { READING_PATH = 1200 };

const char *reading_file(const Reading *reading, const config_setting_t *setting);
Place reading_place(const Reading *reading, const config_setting_t *setting, const char *label);
int reading_fault(const Reading *reading, const config_setting_t *setting, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* The list called name at the top of the file and its length; *list is NULL when it is absent. Every member
 * must be a group. */
int reading_list(const Reading *reading, const config_setting_t *root, const char *name,
                 const config_setting_t **list, int *length);
/* Fault for the first key of group that is not among known[count]. */
int reading_keys(const Reading *reading, const config_setting_t *group, const char *label,
                 const char *const *known, size_t count);
/* Text. *text is owned by the configuration. */
int reading_text(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int required, const char **text);
/* Text of fewer than size characters, at least one, copied. */
int reading_word(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int required, char *word, size_t size);
/* A number in low..high; whole numbers serve. */
int reading_number(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                   int required, double low, double high, double *value);
int reading_flag(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                 int *value);
/* Index of the word among words[count]. */
int reading_choice(const Reading *reading, const config_setting_t *group, const char *label, const char *key,
                   int required, const char *const *words, size_t count, int *value);

/* mechanism_reactions.c: read the reactions of the file and append the washouts. */
int reading_reactions(const Reading *reading, const config_setting_t *root);

#endif
