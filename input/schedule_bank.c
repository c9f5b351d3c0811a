/* schedule_bank: what lies in products and equipment, and what escapes from it; contract in
 * schedule_reading.h.
 *
 * Through a year a share of what the bank holds at its start escapes, a share or a mass of it is taken out
 * and destroyed, and what is filled in is added: held(y + 1) = held(y) + filling - release - destruction, and
 * what a bank row adds at the start of y + 1.
 */
#define _POSIX_C_SOURCE 200809L
#include "schedule_reading.h"

#include <stdlib.h>
#include <string.h>

/* Below this share of what passed through the bank in a year a stock under zero is round-off. */
static const double round_off = 1e-12;

static const char *path_of(const Reading *reading, Place place)
{
    return reading->schedule->path[place.file];
}

/* ---- what goes with what ---- */

int schedule_bank_kinds(const Reading *reading, Fault *fault)
{
    for (int s = 0; s < reading->count; s++) {
        const Series *series = reading->series[s];
        const char *gas = reading->schedule->gas[series->gas];
        if (series->kind == ABUNDANCE || series->kind == BANK)
            continue;
        const Series *bank = schedule_series(reading, series->gas, BANK, series->label);
        if (series->kind == EMISSION && bank)
            return fault_at(
                fault, path_of(reading, series->first), series->first.line,
                "%s, line \"%.60s\", has emissions, but %s:%d makes it a bank, whose emissions are "
                "its releases; give one of the two another label",
                gas, series->label, path_of(reading, bank->first), bank->first.line);
        if (series->kind != EMISSION && !bank)
            return fault_at(
                fault, path_of(reading, series->first), series->first.line,
                "%s, line \"%.60s\", has a %s, but no row of kind bank says what it holds; add one "
                "(0 for an empty bank)",
                gas, series->label, schedule_kinds[series->kind]);
    }
    return 0;
}

/* ---- one bank ---- */

typedef struct {
    const Series *bank, *filling, *release, *destruction; /* the last three may be NULL */
    int first, last;                                      /* years, as indices of cell */
} Bank;

static const Cell *cell_at(const Series *series, int y)
{
    return series && series->cell[y].stands ? &series->cell[y] : NULL;
}

static double value_at(const Series *series, int y)
{
    const Cell *cell = cell_at(series, y);
    return cell ? cell->value : 0;
}

/* The years of a bank: from its first row to the last year that any row speaks of, each with a release. */
static int bank_years(const Reading *reading, Bank *bank, Fault *fault)
{
    const char *gas = reading->schedule->gas[bank->bank->gas], *label = bank->bank->label;
    const Series *parts[] = {bank->filling, bank->release, bank->destruction};
    series_span(bank->bank, &bank->first, &bank->last);
    for (int p = 0; p < 3; p++) {
        int first, last;
        if (!parts[p] || !series_span(parts[p], &first, &last))
            continue;
        Place place = parts[p]->cell[first].made;
        if (first < bank->first)
            return fault_at(fault, path_of(reading, place), place.line,
                            "%s, line \"%.60s\", has a %s in %d, but its bank begins in %d; begin it earlier "
                            "(0 for an empty bank)",
                            gas, label, schedule_kinds[parts[p]->kind], EARLIEST_YEAR + first,
                            EARLIEST_YEAR + bank->first);
        if (last > bank->last)
            bank->last = last;
    }
    for (int y = bank->first; y <= bank->last; y++)
        if (!cell_at(bank->release, y)) {
            Place place = bank->bank->first;
            return fault_at(fault, path_of(reading, place), place.line,
                            "the bank of %s, line \"%.60s\", runs from %d to %d, but has no release in %d; "
                            "add a row of kind release for every year (0 for none)",
                            gas, label, EARLIEST_YEAR + bank->first, EARLIEST_YEAR + bank->last,
                            EARLIEST_YEAR + y);
        }
    return 0;
}

/* Masses of a bank are all of the gas, or all of the same element. */
static int check_elements(const Reading *reading, const Bank *bank, Fault *fault)
{
    const Series *parts[] = {bank->filling, bank->destruction};
    for (int p = 0; p < 2; p++)
        if (parts[p] && !parts[p]->share && strcmp(parts[p]->element, bank->bank->element) != 0)
            return fault_at(fault, path_of(reading, parts[p]->first), parts[p]->first.line,
                            "the %s of line \"%.60s\" is mass of %s, but its bank at %s:%d mass of %s; write "
                            "one of the two",
                            schedule_kinds[parts[p]->kind], bank->bank->label,
                            parts[p]->element[0] ? parts[p]->element : "the gas",
                            path_of(reading, bank->bank->first), bank->bank->first.line,
                            bank->bank->element[0] ? bank->bank->element : "the gas");
    return 0;
}

static int overdrawn(const Reading *reading, const Bank *bank, int y, double held, double filled,
                     double released, double destroyed, Fault *fault)
{
    const Cell *cell = cell_at(bank->destruction, y);
    if (!cell)
        cell = cell_at(bank->release, y);
    const char *unit = bank->bank->element;
    return fault_at(
        fault, path_of(reading, cell->last), cell->last.line,
        "the bank of %s, line \"%.60s\", holds %.6g kt%s%s at the start of %d and %.6g are filled "
        "in, but %.6g are released and %.6g destroyed; take less, or fill in more",
        reading->schedule->gas[bank->bank->gas], bank->bank->label, held * 1e-6, *unit ? " " : "", unit,
        EARLIEST_YEAR + y, filled * 1e-6, released * 1e-6, destroyed * 1e-6);
}

int schedule_bank(const Reading *reading, const Series *series, ScheduleLine *line, Fault *fault)
{
    Bank bank = {.bank = series,
                 .filling = schedule_series(reading, series->gas, FILLING, series->label),
                 .release = schedule_series(reading, series->gas, RELEASE, series->label),
                 .destruction = schedule_series(reading, series->gas, DESTRUCTION, series->label)};
    if (bank_years(reading, &bank, fault) || check_elements(reading, &bank, fault))
        return fault->code;
    line->first_year = EARLIEST_YEAR + bank.first;
    line->years = bank.last - bank.first + 1;
    line->amount = malloc((size_t)line->years * sizeof *line->amount);
    line->stock = malloc(((size_t)line->years + 1) * sizeof *line->stock);
    if (!line->amount || !line->stock)
        return fault_memory(fault, "banks of the schedule");
    double held = 0;
    for (int y = bank.first; y <= bank.last; y++) {
        held += value_at(series, y);
        double filled = value_at(bank.filling, y), released = held * value_at(bank.release, y);
        double destroyed = value_at(bank.destruction, y);
        if (bank.destruction && bank.destruction->share)
            destroyed *= held;
        double left = held + filled - released - destroyed;
        if (left < -round_off * (held + filled))
            return overdrawn(reading, &bank, y, held, filled, released, destroyed, fault);
        line->stock[y - bank.first] = held;
        line->amount[y - bank.first] = released;
        held = left > 0 ? left : 0;
    }
    line->stock[line->years] = held;
    return 0;
}
