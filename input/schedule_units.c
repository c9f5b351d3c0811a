/* schedule_units: what an amount is measured in; contract in schedule_reading.h. */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <ctype.h>
#include <string.h>

const char *schedule_skip(const char *p)
{
    return p + strspn(p, " \t");
}

int schedule_word(const char *word, const char *const *words, int count)
{
    int k = 0;
    while (k < count && strcmp(word, words[k]) != 0)
        k++;
    return k;
}

typedef struct {
    const char *name;
    int type;
    double size;
} BaseUnit;

static const BaseUnit base_units[] = {
    {"ppt", UNIT_FRACTION, 1e-12},   {"ppb", UNIT_FRACTION, 1e-9},
    {"ppm", UNIT_FRACTION, 1e-6},    {"mol/mol", UNIT_FRACTION, 1},
    {"mol mol-1", UNIT_FRACTION, 1}, {"kg", UNIT_MASS, 1},
    {"t", UNIT_MASS, 1e3},           {"Mg", UNIT_MASS, 1e3},
    {"kt", UNIT_MASS, 1e6},          {"Gg", UNIT_MASS, 1e6},
    {"Mt", UNIT_MASS, 1e9},          {"Tg", UNIT_MASS, 1e9},
    {"%", UNIT_SHARE, 0.01},         {"1", UNIT_SHARE, 1},
};
enum { BASE_UNITS = sizeof base_units / sizeof base_units[0] };

static const char *const elements[] = {"H", "C", "N", "O", "F", "S", "Cl", "Br", "I"};
static const char *const years[] = {"yr", "year", "a", "yr-1", "year-1", "a-1"};

/* Next word of a unit into word ("/" is a word of its own); its end, or NULL after the last. */
static const char *next_word(const char *p, char word[16])
{
    p = schedule_skip(p);
    size_t n = *p == '/' ? 1 : strcspn(p, " \t/");
    if (n == 0 || n > 15)
        return NULL;
    memcpy(word, p, n);
    word[n] = '\0';
    return p + n;
}

/* What follows the base unit: an element, then per year and per km in any order. 0 when it is understood. */
static int read_unit_tail(const char *p, Unit *unit)
{
    char word[16];
    while (*schedule_skip(p)) {
        if (!(p = next_word(p, word)))
            return 1;
        int element = schedule_word(word, elements, 9),
            per = strcmp(word, "/") == 0 || strcmp(word, "per") == 0;
        if (element < 9) {
            if (unit->type != UNIT_MASS || unit->element[0] || unit->per_year || unit->per_km)
                return 1;
            strcpy(unit->element, word);
            continue;
        }
        if (per && !(p = next_word(p, word)))
            return 1;
        int year = schedule_word(word, years, 6);
        int *which = year < 6 && (year < 3) == per        ? &unit->per_year
                     : !strcmp(word, per ? "km" : "km-1") ? &unit->per_km
                                                          : NULL;
        if (!which || *which)
            return 1;
        *which = 1;
    }
    return 0;
}

int schedule_unit(const char *text, Unit *unit)
{
    *unit = (Unit){0};
    if (strcmp(text, "yr-1") == 0) {
        *unit = (Unit){.type = UNIT_SHARE, .size = 1, .per_year = 1};
        return 0;
    }
    for (int u = 0; u < BASE_UNITS; u++) {
        size_t n = strlen(base_units[u].name);
        if (strncmp(text, base_units[u].name, n) != 0 || isalnum((unsigned char)text[n]))
            continue;
        unit->type = base_units[u].type;
        unit->size = base_units[u].size;
        return unit->type == UNIT_FRACTION ? text[n] != '\0' : read_unit_tail(text + n, unit);
    }
    return 1;
}

/* Units of a kind as a message lists them, and those that a slip is compared with. */
static const struct {
    const char *wanted;
    const char *const near[10];
} kind_units[KINDS] = {
    [ABUNDANCE] = {"an abundance write ppt, ppb, ppm or mol/mol", {"ppt", "ppb", "ppm", "mol/mol"}},
    [EMISSION] =
        {"an emission write kg, t, Mg, kt, Gg, Mt or Tg, with the element where it is the mass of one "
         "(kt N), then /km where it is of each km of height; it is per year",
         {"kg", "t", "Mg", "kt", "Gg", "Mt", "Tg", "kt/yr", "kt/km", "kt N"}},
    [BANK] = {"a bank write kg, t, Mg, kt, Gg, Mt or Tg", {"kg", "t", "Mg", "kt", "Gg", "Mt", "Tg"}},
    [FILLING] = {"a filling write kg, t, Mg, kt, Gg, Mt or Tg; it is per year",
                 {"kg", "t", "Mg", "kt", "Gg", "Mt", "Tg", "kt/yr"}},
    [RELEASE] = {"a release write %/yr or 1/yr, the share of the stock that escapes", {"%/yr", "1/yr"}},
    [DESTRUCTION] = {"a destruction write %/yr, 1/yr, or a mass such as kt/yr",
                     {"%/yr", "1/yr", "kt/yr", "kt"}},
};

int schedule_unit_fits(int kind, const Unit *unit)
{
    switch (kind) {
    case ABUNDANCE: return unit->type == UNIT_FRACTION;
    case EMISSION: return unit->type == UNIT_MASS;
    case BANK: return unit->type == UNIT_MASS && !unit->per_year && !unit->per_km;
    case FILLING: return unit->type == UNIT_MASS && !unit->per_km;
    case RELEASE: return unit->type == UNIT_SHARE && !unit->per_km;
    default: return unit->type != UNIT_FRACTION && !unit->per_km;
    }
}

const char *schedule_unit_advice(int kind)
{
    return kind_units[kind].wanted;
}

const char *schedule_unit_near(int kind, const char *text)
{
    size_t count = 0;
    while (count < 10 && kind_units[kind].near[count])
        count++;
    return fault_nearest(text, kind_units[kind].near, count);
}
