/* oxygen: see oxygen.h. R_M = sum a exp(-b N), R_D = sum c exp(-d N); Lyman-alpha has three terms, a band
 * six. */
#include "oxygen.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define LYMAN_ALPHA_NM 121.567
#define LYMAN_TERMS 3
#define LINE_LOWER_NM 121.0 /* the solar table spreads the line over this nanometre */
#define LINE_UPPER_NM 122.0
#define LINE_WIDEST_NM 3.0     /* beyond this the bin is no longer the line's */
#define EDGE_TOLERANCE_NM 1e-3 /* bin edges are written with four decimals */
#define DARK 40.0              /* optical depth at which a bin counts as dark */

enum { A, B, C, D };

/* ---- reading ---- */

static int take_columns(const Table *table, const char *const *name, size_t count, size_t *index,
                        Fault *fault)
{
    for (size_t c = 0; c < count; c++)
        if (table_column(table, name[c], &index[c], fault))
            return fault->code;
    return 0;
}

static int read_lyman_alpha(Spectra *spectra, const Table *table, Fault *fault)
{
    static const char *const name[4] = {"b", "c", "d", "e"};
    size_t column[4];
    if (take_columns(table, name, 4, column, fault))
        return fault->code;
    if (table->rows != LYMAN_TERMS)
        return fault_at(fault, table->path, 0,
                        "%zu rows, where the parameterisation has %d terms; complete it", table->rows,
                        LYMAN_TERMS);
    for (size_t c = 0; c < 4; c++) {
        if (table_require_range(table, column[c], 0, 1, fault))
            return fault->code;
        for (size_t i = 0; i < LYMAN_TERMS; i++)
            spectra->lyman_coefficient[i][c] = table_values(table, column[c])[i];
    }
    return 0;
}

/* The bin that holds the line must hold all of it, since F in J = F R_D is the flux of the whole line. */
static int find_lyman_alpha(Spectra *spectra, Fault *fault)
{
    spectra->lyman_alpha = -1;
    for (int k = 0; k < spectra->bins; k++) {
        double lower = spectra->lower[k], upper = spectra->upper[k];
        if (upper <= LINE_LOWER_NM || lower >= LINE_UPPER_NM)
            continue;
        if (lower > LINE_LOWER_NM + EDGE_TOLERANCE_NM || upper < LINE_UPPER_NM - EDGE_TOLERANCE_NM ||
            upper - lower > LINE_WIDEST_NM)
            return fault_set(
                fault, FAULT_INPUT,
                "the wavelength bin %g to %g nm cuts the Lyman-alpha line or is too wide for it; use "
                "one bin from 121 to 122 nm",
                lower, upper);
        spectra->lyman_alpha = k;
    }
    return 0;
}

static int match_band(const Spectra *spectra, double lower, double upper)
{
    for (int k = 0; k < spectra->bins; k++)
        if (fabs(spectra->lower[k] - lower) < EDGE_TOLERANCE_NM &&
            fabs(spectra->upper[k] - upper) < EDGE_TOLERANCE_NM)
            return k;
    return -1;
}

static int read_bands(Spectra *spectra, const Table *table, Fault *fault)
{
    static const char *const edge_name[2] = {"lower_nm", "upper_nm"};
    size_t edge[2], term[4][OXYGEN_TERMS];
    if (take_columns(table, edge_name, 2, edge, fault))
        return fault->code;
    for (int c = 0; c < 4; c++)
        for (int i = 0; i < OXYGEN_TERMS; i++) {
            const char name[3] = {"abcd"[c], (char)('1' + i), '\0'};
            if (table_column(table, name, &term[c][i], fault) ||
                table_require_range(table, term[c][i], 0, 1, fault))
                return fault->code;
        }
    spectra->band_coefficient = calloc(table->rows, 4 * OXYGEN_TERMS * sizeof *spectra->band_coefficient);
    if (!spectra->band_coefficient)
        return fault_memory(fault, "Schumann-Runge coefficients");
    double first = spectra->lower[0], last = spectra->upper[spectra->bins - 1];
    spectra->bands_first = -1;
    spectra->bands = 0;
    for (size_t r = 0; r < table->rows; r++) {
        double lower = table_values(table, edge[0])[r], upper = table_values(table, edge[1])[r];
        if (upper < first + EDGE_TOLERANCE_NM || lower > last - EDGE_TOLERANCE_NM)
            continue;
        int bin = match_band(spectra, lower, upper);
        if (bin < 0 || (spectra->bands > 0 && bin != spectra->bands_first + spectra->bands))
            return fault_at(
                fault, table->path, table->line[r],
                "no wavelength bin equals the Schumann-Runge interval %.4f to %.4f nm; bins from 175.4386 "
                "to 204.0816 nm must be its 500 cm-1 intervals",
                lower, upper);
        if (spectra->bands == 0)
            spectra->bands_first = bin;
        double *to = spectra->band_coefficient + (size_t)spectra->bands * 4 * OXYGEN_TERMS;
        for (int c = 0; c < 4; c++)
            for (int i = 0; i < OXYGEN_TERMS; i++)
                to[c * OXYGEN_TERMS + i] = table_values(table, term[c][i])[r];
        spectra->bands++;
    }
    return 0;
}

static int read_nitric_oxide(Spectra *spectra, const Table *table, Fault *fault)
{
    static const char *const name[10] = {
        "lower_nm", "upper_nm", "predissociation_s-1", "emission_s-1", "quench_cm3_s-1",
        "sigma_O2", "weight_1", "sigma_NO_1",          "weight_2",     "sigma_NO_2"};
    size_t column[10];
    if (take_columns(table, name, 10, column, fault))
        return fault->code;
    if (table->rows != NITRIC_OXIDE_INTERVALS * OXYGEN_TERMS)
        return fault_at(fault, table->path, 0,
                        "%zu rows, where the method has %d intervals of %d; complete it", table->rows,
                        NITRIC_OXIDE_INTERVALS, OXYGEN_TERMS);
    spectra->nitric_oxide = calloc(1, sizeof *spectra->nitric_oxide);
    if (!spectra->nitric_oxide)
        return fault_memory(fault, "nitric oxide tables");
    const double *value[10];
    for (size_t c = 0; c < 10; c++) {
        if (table_require_range(table, column[c], 0, 1e12, fault))
            return fault->code;
        value[c] = table_values(table, column[c]);
    }
    for (size_t r = 0; r < table->rows; r++) {
        NitricOxideInterval *to = &spectra->nitric_oxide->interval[r / OXYGEN_TERMS];
        size_t i = r % OXYGEN_TERMS;
        if (i > 0 && (value[0][r] != to->lower || value[1][r] != to->upper))
            return fault_at(fault, table->path, table->line[r],
                            "each interval takes %d rows in turn; sort them", OXYGEN_TERMS);
        to->lower = value[0][r];
        to->upper = value[1][r];
        to->predissociation = value[2][r];
        to->emission = value[3][r];
        to->quench = value[4][r];
        if (!(to->lower < to->upper) || !(to->predissociation > 0))
            return fault_at(fault, table->path, table->line[r],
                            "upper_nm must exceed lower_nm, and predissociation_s-1 exceed 0");
        to->sigma_oxygen[i] = value[5][r];
        to->weight[i][0] = value[6][r];
        to->sigma[i][0] = value[7][r];
        to->weight[i][1] = value[8][r];
        to->sigma[i][1] = value[9][r];
    }
    return 0;
}

static int read_one(Spectra *spectra, const char *data_dir, const char *file,
                    int (*take)(Spectra *, const Table *, Fault *), Fault *fault)
{
    Table table;
    if (spectra_table(&table, spectra, data_dir, file, fault))
        return fault->code;
    take(spectra, &table, fault);
    table_free(&table);
    return fault->code;
}

int oxygen_read(Spectra *spectra, const char *data_dir, Fault *fault)
{
    if (find_lyman_alpha(spectra, fault) ||
        read_one(spectra, data_dir, "o2/lyman-alpha.csv", read_lyman_alpha, fault) ||
        read_one(spectra, data_dir, "o2/schumann-runge.csv", read_bands, fault) ||
        read_one(spectra, data_dir, "o2/nitric-oxide.csv", read_nitric_oxide, fault))
        return fault->code;
    return 0;
}

/* ---- sums of exponentials ---- */

typedef struct {
    int terms;
    double value[4][OXYGEN_TERMS];
} Sums;

int oxygen_parametrised(const Spectra *spectra, int bin)
{
    return (spectra->lyman_alpha >= 0 && bin == spectra->lyman_alpha) ||
           (spectra->bands > 0 && bin >= spectra->bands_first && bin < spectra->bands_first + spectra->bands);
}

static void take_sums(const Spectra *spectra, int bin, Sums *sums)
{
    if (bin == spectra->lyman_alpha) {
        sums->terms = LYMAN_TERMS;
        for (int i = 0; i < LYMAN_TERMS; i++)
            for (int c = 0; c < 4; c++)
                sums->value[c][i] = spectra->lyman_coefficient[i][c];
        return;
    }
    const double *from = spectra->band_coefficient + (size_t)(bin - spectra->bands_first) * 4 * OXYGEN_TERMS;
    sums->terms = OXYGEN_TERMS;
    memcpy(sums->value, from, sizeof sums->value);
}

/* Where the bin is dark the ratios of sums have no meaning (and would be 0 / 0): hold the column there. */
static double held_column(const Sums *sums, double column)
{
    double least = HUGE_VAL;
    for (int i = 0; i < sums->terms; i++)
        if (sums->value[A][i] > 0)
            least = fmin(least, sums->value[B][i]);
    return fmin(fmin(column, OXYGEN_COLUMN_CAP), DARK / least);
}

static double weigh(const Sums *sums, int amplitude, int exponent, double column)
{
    double sum = 0;
    for (int i = 0; i < sums->terms; i++)
        if (sums->value[amplitude][i] > 0) /* an unused term must not meet an infinite column: 0 * inf */
            sum += sums->value[amplitude][i] * exp(-sums->value[exponent][i] * column);
    return sum;
}

double oxygen_transmission(const Spectra *spectra, int bin, double column)
{
    Sums sums;
    take_sums(spectra, bin, &sums);
    return weigh(&sums, A, B, column);
}

double oxygen_cross_section(const Spectra *spectra, int bin, double column)
{
    Sums sums;
    take_sums(spectra, bin, &sums);
    double held = held_column(&sums, column);
    return weigh(&sums, C, D, held) / weigh(&sums, A, B, held);
}

double oxygen_extinction(const Spectra *spectra, int bin, double column)
{
    Sums sums;
    take_sums(spectra, bin, &sums);
    double held = held_column(&sums, column), slope = 0;
    for (int i = 0; i < sums.terms; i++)
        slope += sums.value[A][i] * sums.value[B][i] * exp(-sums.value[B][i] * held);
    return slope / weigh(&sums, A, B, held);
}

/* ---- NO ---- */

double nitric_oxide_efficiency(const NitricOxideInterval *interval, double nitrogen)
{
    double other = interval->emission + interval->quench * nitrogen;
    return interval->predissociation / (interval->predissociation + other);
}

void nitric_oxide_opacity(const NitricOxideInterval *interval, double column, double *passed)
{
    for (int i = 0; i < OXYGEN_TERMS; i++) /* a finite column: zero times infinity is no number */
        passed[i] = exp(-interval->sigma_oxygen[i] * fmin(column, 1e300));
}

double nitric_oxide_cross_section(const NitricOxideInterval *interval, const double *passed, double column)
{
    double sum = 0;
    for (int i = 0; i < OXYGEN_TERMS; i++)
        for (int j = 0; j < 2; j++)
            sum += passed[i] * interval->weight[i][j] * interval->sigma[i][j] *
                   exp(-interval->sigma[i][j] * column);
    return sum;
}

double nitric_oxide_cross_section_slope(const NitricOxideInterval *interval, const double *passed,
                                        double column)
{
    double sum = 0;
    for (int i = 0; i < OXYGEN_TERMS; i++)
        for (int j = 0; j < 2; j++)
            sum -= passed[i] * interval->weight[i][j] * interval->sigma[i][j] * interval->sigma[i][j] *
                   exp(-interval->sigma[i][j] * column);
    return sum;
}
