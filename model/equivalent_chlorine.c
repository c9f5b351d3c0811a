/* equivalent_chlorine: see equivalent_chlorine.h. */
#include "equivalent_chlorine.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "age_spectrum.h"

#define PPT 1e-12

/* ---- fractional release ---- */

enum { AGE, QUANTITY, OF, VALUE, COLUMNS };
static const char *const column_names[COLUMNS] = {"mean_age_year", "quantity", "of", "value"};

static int age_index(const ReleaseTable *table, double mean_age)
{
    for (int a = 0; a < table->ages; a++)
        if (fabs(table->mean_age[a] - mean_age) < 1e-9)
            return a;
    return -1;
}

int release_find(const ReleaseTable *table, double mean_age, const char *gas, double *value)
{
    for (int r = 0; r < table->rows; r++)
        if (fabs(table->row[r].mean_age - mean_age) < 1e-9 && !strcmp(table->row[r].gas, gas)) {
            *value = table->row[r].value;
            return 1;
        }
    return 0;
}

static int check_value(const char *path, int line, const char *what, double value, double high, Fault *fault)
{
    if (value >= 0.0 && value <= high)
        return 0;
    return fault_at(fault, path, line, "%s is %g; it must lie between 0 and %g", what, value, high);
}

static int take_alpha(ReleaseTable *table, int age, const char *path, int line, const char *of, double value,
                      Fault *fault)
{
    if (strcmp(of, "Br"))
        return fault_at(fault, path, line, "alpha is of \"%.40s\"; write Br", of);
    if (check_value(path, line, "alpha", value, 1000.0, fault))
        return fault->code;
    if (!isnan(table->alpha[age]))
        return fault_at(fault, path, line, "alpha at %g years is given twice; remove one",
                        table->mean_age[age]);
    table->alpha[age] = value;
    return 0;
}

static int take_release(ReleaseTable *table, int age, const char *path, int line, const char *gas,
                        double value, Fault *fault)
{
    double before;
    Release *row = &table->row[table->rows];
    if (!gas[0] || strlen(gas) >= sizeof row->gas)
        return fault_at(fault, path, line, "\"%.60s\" is no name of a gas; write one of 1 to %zu characters",
                        gas, sizeof row->gas - 1);
    if (check_value(path, line, "the fractional release", value, 1.0, fault))
        return fault->code;
    if (release_find(table, table->mean_age[age], gas, &before))
        return fault_at(fault, path, line, "the release of %s at %g years is given twice; remove one", gas,
                        table->mean_age[age]);
    row->mean_age = table->mean_age[age];
    strcpy(row->gas, gas);
    row->value = value;
    table->rows++;
    return 0;
}

static int take_row(ReleaseTable *table, const char *path, int line, char *const *cell, Fault *fault)
{
    static const char *const quantities[] = {"alpha", "release"};
    double mean_age, value;
    if (csv_number(path, line, column_names[AGE], cell[AGE], &mean_age, fault) ||
        csv_number(path, line, column_names[VALUE], cell[VALUE], &value, fault))
        return fault->code;
    if (!(mean_age >= 0.5 && mean_age < 10.0))
        return fault_at(fault, path, line, "a mean age of %g years; give 0.5 to below 10", mean_age);
    int age = age_index(table, mean_age);
    if (age < 0) {
        if (table->ages == CHLORINE_AGES)
            return fault_at(fault, path, line, "more than %d mean ages; remove some", CHLORINE_AGES);
        age = table->ages++;
        table->mean_age[age] = mean_age;
        table->alpha[age] = NAN;
    }
    if (!strcmp(cell[QUANTITY], quantities[0]))
        return take_alpha(table, age, path, line, cell[OF], value, fault);
    if (!strcmp(cell[QUANTITY], quantities[1]))
        return take_release(table, age, path, line, cell[OF], value, fault);
    return fault_at(fault, path, line, "unknown quantity \"%.40s\"; write alpha or release", cell[QUANTITY]);
}

static int take_rows(ReleaseTable *table, const Csv *csv, const char *path, Fault *fault)
{
    int same = csv->first[1] == COLUMNS;
    for (size_t c = 0; same && c < COLUMNS; c++)
        same = !strcmp(csv->cell[c], column_names[c]);
    if (!same)
        return fault_at(fault, path, csv->line[0],
                        "unexpected columns; mean_age_year,quantity,of,value are wanted, in this order");
    if (csv->rows < 2)
        return fault_at(fault, path, csv->line[0], "no rows follow the column names; add them");
    table->row = malloc(csv->rows * sizeof *table->row);
    if (!table->row)
        return fault_memory(fault, path);
    for (size_t r = 1; r < csv->rows; r++)
        if (take_row(table, path, csv->line[r], csv->cell + csv->first[r], fault))
            return fault->code;
    for (int a = 0; a < table->ages; a++)
        if (isnan(table->alpha[a]))
            return fault_at(fault, path, 0, "no alpha at %g years; add the row %g,alpha,Br,VALUE",
                            table->mean_age[a], table->mean_age[a]);
    return 0;
}

int release_read(ReleaseTable *table, const char *path, Fault *fault)
{
    Csv csv;
    memset(table, 0, sizeof *table);
    if (csv_read(&csv, path, fault))
        return fault->code;
    int code = take_rows(table, &csv, path, fault);
    const Table header = {.header = csv.header};
    if (!table_header(&header, "source", table->source, sizeof table->source))
        snprintf(table->source, sizeof table->source, "%s", path);
    csv_free(&csv);
    if (code)
        release_free(table);
    return code;
}

int release_find_and_read(ReleaseTable *table, const char *data_dir, Fault *fault)
{
    char path[4096];
    memset(table, 0, sizeof *table);
    int code = table_locate("fractional release", RELEASE_FILE, "", data_dir, path, sizeof path, fault);
    return code ? code : release_read(table, path, fault);
}

void release_free(ReleaseTable *table)
{
    if (!table)
        return;
    free(table->row);
    memset(table, 0, sizeof *table);
}

/* ---- series ---- */

int surface_make(SurfaceSeries *series, int count, int gases, Fault *fault)
{
    memset(series, 0, sizeof *series);
    series->count = count;
    series->gases = gases;
    series->time = calloc((size_t)count + 1, sizeof *series->time);
    series->gas = calloc((size_t)gases + 1, sizeof *series->gas);
    series->fraction = calloc((size_t)gases * (size_t)count + 1, sizeof *series->fraction);
    if (series->time && series->gas && series->fraction)
        return 0;
    surface_free(series);
    return fault_memory(fault, "the values at the ground");
}

void surface_free(SurfaceSeries *series)
{
    if (!series)
        return;
    free(series->time);
    free(series->gas);
    free(series->fraction);
    memset(series, 0, sizeof *series);
}

void equivalent_chlorine_free(EquivalentChlorine *chlorine)
{
    if (!chlorine)
        return;
    free(chlorine->time);
    free(chlorine->value);
    free(chlorine->known);
    free(chlorine->counted);
    free(chlorine->left_out);
    memset(chlorine, 0, sizeof *chlorine);
}

static int make_room(EquivalentChlorine *out, const SurfaceSeries *series, Fault *fault)
{
    size_t count = (size_t)series->count, list = (size_t)series->gases * (MECHANISM_NAME + 2) + 1;
    out->count = series->count;
    out->time = malloc((count + 1) * sizeof *out->time);
    out->value = calloc(count + 1, sizeof *out->value);
    out->known = malloc((count + 1) * sizeof *out->known);
    out->counted = calloc(list, 1);
    out->left_out = calloc(list, 1);
    if (out->time && out->value && out->known && out->counted && out->left_out)
        return 0;
    return fault_memory(fault, "equivalent chlorine");
}

static int all_zero(const double *value, int count)
{
    for (int i = 0; i < count; i++)
        if (value[i] != 0.0)
            return 0;
    return 1;
}

/* What a mole fraction of a gas counts, f (n_Cl + alpha n_Br), [gases]; and the lists of names. */
static void weigh_gases(EquivalentChlorine *out, const SurfaceSeries *series, const ReleaseTable *table,
                        double *factor)
{
    for (int g = 0; g < series->gases; g++) {
        const SurfaceGas *gas = &series->gas[g];
        double release = 0.0;
        factor[g] = 0.0;
        if (!gas->chlorine && !gas->bromine)
            continue;
        int has = release_find(table, out->mean_age, gas->name, &release);
        if (!has && all_zero(series->fraction + (size_t)g * (size_t)series->count, series->count))
            continue;
        char *list = has ? out->counted : out->left_out;
        if (list[0])
            strcat(list, ", ");
        strcat(list, gas->name);
        factor[g] = release * (gas->chlorine + out->alpha * gas->bromine);
    }
}

int equivalent_chlorine_compute(EquivalentChlorine *out, const SurfaceSeries *series,
                                const ReleaseTable *table, double mean_age, Fault *fault)
{
    memset(out, 0, sizeof *out);
    int age = age_index(table, mean_age), count = series->count;
    if (age < 0)
        return fault_set(
            fault, FAULT_INPUT,
            "no fractional release at a mean age of %g years in the table (%d mean ages, the first %g)",
            mean_age, table->ages, table->ages ? table->mean_age[0] : NAN);
    const AgeSpectrum spectrum = {mean_age, 0.5 * mean_age};
    out->mean_age = mean_age;
    out->width = spectrum.width;
    out->alpha = table->alpha[age];
    memcpy(out->source, table->source, sizeof out->source);
    double *factor = malloc(((size_t)series->gases + 1) * sizeof *factor);
    double *weight = malloc(((size_t)count + 1) * sizeof *weight);
    if (!factor || !weight)
        fault_memory(fault, "equivalent chlorine");
    else if (!make_room(out, series, fault))
        weigh_gases(out, series, table, factor);
    for (int i = 0; !fault->code && i < count; i++) {
        out->time[i] = series->time[i];
        out->known[i] = age_share(&spectrum, series->time[i] - series->time[0]);
        age_weights(&spectrum, series->time, count, series->time[i], weight);
        for (int g = 0; g < series->gases; g++) {
            const double *fraction = series->fraction + (size_t)g * (size_t)count;
            double mean = 0.0;
            for (int j = 0; j <= i; j++) /* later values have no weight */
                mean += weight[j] * fraction[j];
            out->value[i] += factor[g] * mean / PPT;
        }
    }
    free(factor);
    free(weight);
    if (fault->code)
        equivalent_chlorine_free(out);
    return fault->code;
}

/* ---- return ---- */

void equivalent_chlorine_return(const EquivalentChlorine *chlorine, double benchmark_year,
                                ChlorineReturn *out)
{
    const double *time = chlorine->time, *value = chlorine->value;
    int count = chlorine->count, peak = -1;
    *out = (ChlorineReturn){.benchmark_year = benchmark_year,
                            .benchmark = NAN,
                            .known = NAN,
                            .peak_year = NAN,
                            .peak = NAN,
                            .returns = -1,
                            .return_year = NAN};
    if (count < 1 || benchmark_year < time[0] || benchmark_year > time[count - 1])
        return;
    out->benchmark = table_linear(time, value, (size_t)count, benchmark_year);
    out->known = table_linear(time, chlorine->known, (size_t)count, benchmark_year);
    for (int i = 0; i < count; i++)
        if (time[i] >= benchmark_year && (peak < 0 || value[i] > value[peak]))
            peak = i;
    out->peak_year = time[peak];
    out->peak = value[peak];
    if (!(out->peak > out->benchmark))
        return;
    out->returns = 0;
    for (int i = peak + 1; i < count && !out->returns; i++)
        if (value[i] <= out->benchmark) {
            double share = (value[i - 1] - out->benchmark) / (value[i - 1] - value[i]);
            out->returns = 1;
            out->return_year = time[i - 1] + share * (time[i] - time[i - 1]);
        }
}
