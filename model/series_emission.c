/* series_emission: emissions by gas and by line out of a file; contract in series.h. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <netcdf.h>

#include "../chem/equation.h"
#include "series.h"

static const char prefix[] = "emission_";
static const char unit_wanted[] = "Gg year-1";

/* why holds a "%s" for of. */
static int leave_out(FileSeries *series, const char *why, const char *of)
{
    series_free_emissions(&series->emissions);
    snprintf(series->emissions.missing, sizeof series->emissions.missing, why, of);
    return 0;
}

static int check_unit(const FileSeries *series, int file, int variable, const char *name, Fault *fault)
{
    char unit[40];
    series_text(file, variable, "units", unit, sizeof unit);
    if (strcmp(unit, unit_wanted))
        return fault_set(fault, FAULT_INPUT, "%s: %s is in \"%s\"; %s is wanted", series->path, name, unit,
                         unit_wanted);
    return 0;
}

/* A number in every place? */
static int whole(const double *value, size_t count)
{
    for (size_t i = 0; i < count; i++)
        if (!(fabs(value[i]) < 1e30)) /* the fill value is above */
            return 0;
    return 1;
}

/* ---- gases ---- */

/* How many variables hold the emission of a gas. */
static int count_gases(int file, int variables)
{
    char name[NC_MAX_NAME + 1];
    int gases = 0;
    for (int v = 0; v < variables; v++)
        gases += nc_inq_varname(file, v, name) == NC_NOERR && !strncmp(name, prefix, sizeof prefix - 1);
    return gases;
}

/* Name, formula and what it holds; 0 when the file does not tell. */
static int identify(GasEmission *gas, int file, const char *name, char *formula, size_t size)
{
    int variable;
    if (strlen(name) >= sizeof gas->variable || nc_inq_varid(file, name, &variable) != NC_NOERR ||
        !series_text(file, variable, "species", gas->gas, sizeof gas->gas) ||
        !series_text(file, variable, "formula", formula, size) || !(formula_mass(formula) > 0.0))
        return 0;
    strcpy(gas->variable, name);
    int halogens = formula_atoms(formula, "Cl") + formula_atoms(formula, "Br") + formula_atoms(formula, "I");
    gas->halocarbon = halogens > 0 && formula_atoms(formula, "C") > 0;
    gas->nitrogen = halogens == 0 && formula_atoms(formula, "N") > 0;
    return 1;
}

enum { FORMULA = 40, LEFT = 100 };

/* Every gas into its place; formula [gases][FORMULA]. left [LEFT]: the name of one that cannot be used, *why.
 */
static int read_gases(FileSeries *series, int file, int variables, char (*formula)[FORMULA], const char **why,
                      char *left, Fault *fault)
{
    FileEmissions *emissions = &series->emissions;
    for (int v = 0, g = 0; v < variables && g < emissions->gases; v++) {
        char name[NC_MAX_NAME + 1];
        if (nc_inq_varname(file, v, name) != NC_NOERR || strncmp(name, prefix, sizeof prefix - 1))
            continue;
        GasEmission *gas = &emissions->gas[g];
        if (check_unit(series, file, v, name, fault))
            return fault->code;
        snprintf(left, LEFT, "%.*s", LEFT - 1, name);
        *why = NULL;
        if (!identify(gas, file, name + sizeof prefix - 1, formula[g], FORMULA))
            *why = "the file does not say of what gas %s is";
        else if (series_variable(file, name, series->count, gas->all) ||
                 !whole(gas->all, (size_t)series->count))
            *why = "records of the file lack %s";
        if (*why)
            return 0;
        g++;
    }
    return 0;
}

/* ---- lines ---- */

/* Gg of the gas per Gg of what the line counts; 0: no such gas or element. */
static double per_counted(const FileEmissions *emissions, const LineEmission *line, const char *mass_of,
                          char (*formula)[FORMULA])
{
    if (line->gas == emissions->gases)
        return 0.0;
    if (!strcmp(mass_of, emissions->gas[line->gas].gas))
        return 1.0;
    int atoms = formula_atoms(formula[line->gas], mass_of);
    double counted = atoms * equation_atomic_weight(mass_of);
    return counted > 0.0 ? formula_mass(formula[line->gas]) / counted : 0.0;
}

/* values: [count][lines] as in the file. */
static int take_line(FileSeries *series, int l, char *const *word, const double *values,
                     char (*formula)[FORMULA], Fault *fault)
{
    FileEmissions *emissions = &series->emissions;
    LineEmission *line = &emissions->line[l];
    snprintf(line->label, sizeof line->label, "%s", word[0]);
    while (line->gas < emissions->gases && strcmp(emissions->gas[line->gas].gas, word[1]))
        line->gas++;
    double factor = per_counted(emissions, line, word[2], formula);
    if (factor == 0.0)
        return fault_set(fault, FAULT_INPUT,
                         "%s: line %d, \"%.60s\": masses of %.20s of %.31s, whose emission the file does not "
                         "hold or which has none of it",
                         series->path, l + 1, word[0], word[2], word[1]);
    for (int i = 0; i < series->count; i++) {
        line->given[i] = factor * values[(size_t)i * (size_t)emissions->lines + (size_t)l];
        emissions->gas[line->gas].lines[i] += line->given[i];
    }
    return 0;
}

static int read_words(int file, int l, char **word)
{
    static const char *const names[] = {"line_label", "line_gas", "line_mass_of"};
    const size_t at = (size_t)l;
    for (int w = 0; w < 3; w++) {
        int variable;
        nc_type type;
        if (nc_inq_varid(file, names[w], &variable) != NC_NOERR ||
            nc_inq_vartype(file, variable, &type) != NC_NOERR || type != NC_STRING ||
            nc_get_var1_string(file, variable, &at, &word[w]) != NC_NOERR || !word[w])
            return -1;
    }
    return 0;
}

static int read_lines(FileSeries *series, int file, char (*formula)[FORMULA], const char **why, Fault *fault)
{
    FileEmissions *emissions = &series->emissions;
    const size_t size = (size_t)series->count * (size_t)emissions->lines;
    int variable;
    if (!emissions->lines)
        return 0;
    double *values = malloc(size * sizeof *values);
    if (!values)
        return fault_memory(fault, "the lines of a schedule");
    if (nc_inq_varid(file, "line_emission", &variable) != NC_NOERR ||
        series_variable(file, "line_emission", (int)size, values) || !whole(values, size))
        *why = "records of the file lack %s";
    else
        check_unit(series, file, variable, "line_emission", fault);
    for (int l = 0; l < emissions->lines && !fault->code && !*why; l++) {
        char *word[3] = {NULL, NULL, NULL};
        if (read_words(file, l, word))
            *why = "the file does not name the lines of %s";
        else
            take_line(series, l, word, values, formula, fault);
        nc_free_string(3, word);
    }
    free(values);
    return fault->code;
}

/* ---- the whole ---- */

static int make_room(FileSeries *series, char (**formula)[FORMULA], Fault *fault)
{
    FileEmissions *emissions = &series->emissions;
    const size_t count = (size_t)series->count;
    const int gases = emissions->gases, lines = emissions->lines;
    emissions->gas = calloc((size_t)gases, sizeof *emissions->gas);
    emissions->line = calloc((size_t)lines + 1, sizeof *emissions->line);
    emissions->store = calloc((size_t)(2 * gases + lines) * count, sizeof *emissions->store);
    *formula = calloc((size_t)gases, sizeof **formula);
    if (!emissions->gas || !emissions->line || !emissions->store || !*formula)
        return fault_memory(fault, "the emissions of a file");
    for (int g = 0; g < gases; g++) {
        emissions->gas[g].all = emissions->store + 2 * (size_t)g * count;
        emissions->gas[g].lines = emissions->gas[g].all + count;
    }
    for (int l = 0; l < lines; l++)
        emissions->line[l].given = emissions->store + (size_t)(2 * gases + l) * count;
    return 0;
}

int series_read_emissions(FileSeries *series, int file, Fault *fault)
{
    FileEmissions *emissions = &series->emissions;
    char(*formula)[FORMULA] = NULL;
    char left[LEFT] = "line_emission";
    const char *why = NULL;
    int variables = 0, dimension;
    size_t lines = 0;
    nc_inq_nvars(file, &variables);
    emissions->gases = count_gases(file, variables);
    if (!emissions->gases)
        return leave_out(series, "%s", "not in the file");
    if (nc_inq_dimid(file, "line", &dimension) == NC_NOERR)
        nc_inq_dimlen(file, dimension, &lines);
    if (lines > 100000 || (double)lines * series->count > 1e8)
        return leave_out(series, "too many lines of %s", left);
    emissions->lines = (int)lines;
    if (!make_room(series, &formula, fault) &&
        !read_gases(series, file, variables, formula, &why, left, fault) && !why) {
        strcpy(left, "line_emission");
        read_lines(series, file, formula, &why, fault);
    }
    free(formula);
    return fault->code ? fault->code : why ? leave_out(series, why, left) : 0;
}

void series_free_emissions(FileEmissions *emissions)
{
    free(emissions->gas);
    free(emissions->line);
    free(emissions->store);
    memset(emissions, 0, sizeof *emissions);
}
