/* settings_keys: the one table of case-file keys. Private to settings*.c and the tests. */
#ifndef SKYMEND_SETTINGS_KEYS_H
#define SKYMEND_SETTINGS_KEYS_H

#include <stddef.h>

#include "settings.h"

enum KeyType {
    KEY_WHOLE,  /* int, low..high */
    KEY_REAL,   /* double, low..high; a whole number serves */
    KEY_TEXT,   /* char[size] */
    KEY_CHOICE, /* int, the index of the word in choices */
    KEY_EDGES,  /* list of numbers into edge_km, their count into edges; each in low..high */
    KEY_BOUNDS, /* list of groups into bound, their count into bounds */
    KEY_LAYERS  /* list of file names into schedule_layer, their count into schedule_layers */
};

typedef struct {
    const char *group; /* "" for a key outside any group */
    const char *name;
    int type;                   /* enum KeyType */
    size_t offset;              /* of the member in Settings (unused for KEY_EDGES, KEY_BOUNDS, KEY_LAYERS) */
    size_t size;                /* of the array, KEY_TEXT */
    double standard;            /* default of KEY_WHOLE, KEY_REAL, KEY_CHOICE */
    const char *text;           /* default of KEY_TEXT */
    double low, high;           /* accepted range, both ends included; KEY_TEXT: low 1 = may not be empty */
    const char *unit;           /* "" when it has none */
    const char *const *choices; /* NULL-terminated, KEY_CHOICE */
    const char *help;
} SettingKey;

enum { SETTINGS_MOST_KEYS = 64 };

/* A built-in surface boundary and where its value comes from. */
typedef struct {
    const char *species;
    int kind; /* enum BoundKind */
    double value;
    const char *note;
} StandardBound;

/* What a surface bound may hold. */
#define BOUND_VELOCITY_MOST 10.0 /* cm s-1: turbulence carries nothing faster to the ground */

/* The table, ordered by group; count receives its length. Static, never freed. */
const SettingKey *settings_keys(size_t *count);
const StandardBound *settings_standard_bounds(size_t *count);
/* "fixed" | "deposition", NULL-terminated, by enum BoundKind; and the key of the value of each. */
extern const char *const bound_kinds[];
extern const char *const bound_value_keys[];

#endif
