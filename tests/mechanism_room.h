/* mechanism_room.h: what the tests of the mechanism file share: reading it, finding a reaction, a changed
 * copy of it. Include after defining _XOPEN_SOURCE 700 (mkdtemp, popen). */
#ifndef SKYMEND_TEST_MECHANISM_ROOM_H
#define SKYMEND_TEST_MECHANISM_ROOM_H

#include "scratch.h"

#include "../chem/equation.h"
#include "../chem/mechanism.h"
#include "../chem/rates.h"
#include "../input/constants.h"
#include "../input/table.h"

static inline void mechanism_path(char *path)
{
    snprintf(path, 300, "%s/mechanism.cfg", data_dir());
}

static inline Mechanism *read_path(const char *path)
{
    Mechanism *mechanism = NULL;
    Fault fault = {0};
    if (mechanism_read(&mechanism, path, &fault))
        fail_msg("%s", fault.text);
    assert_non_null(mechanism);
    return mechanism;
}

static inline Mechanism *read_default(void)
{
    char path[300];
    mechanism_path(path);
    return read_path(path);
}

static inline const Reaction *named(const Mechanism *mechanism, const char *id)
{
    for (int r = 0; r < mechanism->reactions; r++)
        if (strcmp(mechanism->reaction[r].id, id) == 0)
            return &mechanism->reaction[r];
    fail_msg("no reaction %s", id);
    return NULL;
}

static inline int index_of(const Mechanism *mechanism, const char *id)
{
    return (int)(named(mechanism, id) - mechanism->reaction);
}

static inline double change_of(const Mechanism *mechanism, const char *id, const char *name)
{
    const Reaction *reaction = named(mechanism, id);
    int solved = mechanism_solved(mechanism, name);
    assert_true(solved >= 0);
    for (int c = 0; c < reaction->changes; c++)
        if (reaction->changed[c] == solved)
            return reaction->change[c];
    return 0.0;
}

/* The default file with the first old replaced by new; *line is the line where the change starts. */
static inline void write_variant(void **state, const char *old, const char *new, char *path, int *line)
{
    char original[300], *text;
    Fault fault = {0};
    mechanism_path(original);
    if (table_text(original, &text, NULL, &fault))
        fail_msg("%s", fault.text);
    char *at = strstr(text, old);
    if (!at)
        fail_msg("\"%s\" no longer stands in the mechanism: renew the test", old);
    *line = 1;
    for (const char *p = text; p < at; p++)
        *line += *p == '\n';
    snprintf(path, 300, "%s/variant.cfg", (char *)*state);
    FILE *out = fopen(path, "w");
    assert_non_null(out);
    fprintf(out, "%.*s%s%s", (int)(at - text), text, new, at + strlen(old));
    assert_int_equal(fclose(out), 0);
    free(text);
}

#endif
