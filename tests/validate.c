/* validate: the baseline against published values, and the size of its numerical errors.
 *
 *     build/tests/validate [--csv FILE] [--no-numerics] [--case CASE.cfg]       (make validate)
 *
 * Every row of tests/published-values.csv and tests/published-more.csv is "in" its published range, "out", or
 * "later" (nothing in the program computes it yet). A row that is out, and a numerical error above its limit,
 * needs a reason in tests/validation-reasons.csv. Exit status: 0; 1 when one is out without a reason; else
 * the fault's code.
 * --case takes another case than the built-in baseline, to find out what a row depends on; it must cover 1964
 * to 2000. Runs from the repository root; SKYMEND_DATA names the data folder (default input/data).
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "../input/table.h"
#include "validate.h"

typedef struct {
    char *text; /* of a row of the table, borrowed from Csv */
    double low, high;
    int state, inside;
    double value;
    char note[ROW_NOTE];
    const char *reason; /* borrowed from Csv, NULL when there is none */
} Verdict;

typedef struct {
    const char *csv, *case_path;
    int numerics;
} Request;

/* A table of published values with what the model makes of each row. */
typedef struct {
    const char *path;
    Csv csv;
    Verdict *verdict; /* [csv.rows] */
} Published;

#define TABLES 2
static const char reasons_path[] = "tests/validation-reasons.csv";

/* ---- the tables ---- */

/* Columns of the published values by position; read_tables checks their names. */
enum { ID, QUANTITY, CONDITIONS, VALUE, LOW, HIGH, UNIT, SOURCE, BASIS, COLUMNS };

static const char *cell(const Csv *csv, size_t row, int column)
{
    return csv->cell[csv->first[row] + (size_t)column];
}

static int read_named(Csv *csv, const char *path, const char *const *names, size_t columns, Fault *fault)
{
    if (csv_read(csv, path, fault))
        return fault->code;
    int same = csv->first[1] - csv->first[0] == columns;
    for (size_t c = 0; same && c < columns; c++)
        same = !strcmp(cell(csv, 0, (int)c), names[c]);
    if (!same) {
        fault_at(fault, path, csv->line[0], "unexpected columns, the first should be %s", names[0]);
        csv_free(csv);
    }
    return fault->code;
}

static const char *find_reason(const Csv *reasons, const char *id)
{
    for (size_t row = 1; row < reasons->rows; row++)
        if (!strcmp(cell(reasons, row, 0), id) && cell(reasons, row, 1)[0])
            return cell(reasons, row, 1);
    return NULL;
}

/* ---- judging ---- */

static int judge(const Published *table, const Csv *reasons, const Evidence *evidence, Fault *fault)
{
    const Csv *published = &table->csv;
    for (size_t row = 1; row < published->rows; row++) {
        Verdict *v = &table->verdict[row];
        const char *id = cell(published, row, ID);
        *v = (Verdict){0};
        if (row_compute(evidence, id, cell(published, row, CONDITIONS), &v->state, &v->value, v->note, fault))
            return fault->code;
        v->reason = find_reason(reasons, id);
        if (v->state == ROW_LATER)
            continue;
        if (csv_number(table->path, published->line[row], "low", cell(published, row, LOW), &v->low, fault) ||
            csv_number(table->path, published->line[row], "high", cell(published, row, HIGH), &v->high,
                       fault))
            return fault->code;
        v->inside = v->value >= v->low && v->value <= v->high; /* not a number is out */
    }
    return 0;
}

static const char *word(const Verdict *v)
{
    return v->state == ROW_LATER ? "later" : v->inside ? "in" : "out";
}

static void value_text(const Verdict *v, char *text, size_t size)
{
    if (v->state == ROW_LATER)
        snprintf(text, size, "-");
    else if (isfinite(v->value))
        snprintf(text, size, "%.5g", v->value);
    else
        snprintf(text, size, "none");
}

/* Counts in, out, later are added to. */
static void print_rows(const Published *table, int count[3])
{
    for (size_t row = 1; row < table->csv.rows; row++) {
        const Verdict *v = &table->verdict[row];
        char value[32], range[64];
        value_text(v, value, sizeof value);
        snprintf(range, sizeof range, "%s..%s", cell(&table->csv, row, LOW), cell(&table->csv, row, HIGH));
        printf("%-19s %12s  %22s  %-8s %-5s  %s\n", cell(&table->csv, row, ID), value, range,
               cell(&table->csv, row, UNIT), word(v), v->note);
        count[v->state == ROW_LATER ? 2 : v->inside ? 0 : 1]++;
    }
}

/* Returns the number of rows out without a reason. */
static int print_reasons(const Published *table)
{
    int unexplained = 0;
    for (size_t row = 1; row < table->csv.rows; row++) {
        const Verdict *v = &table->verdict[row];
        const char *id = cell(&table->csv, row, ID);
        if (v->state == ROW_COMPUTED && !v->inside) {
            printf("out: %s: %s\n", id, v->reason ? v->reason : "NO REASON KNOWN");
            unexplained += !v->reason;
        } else if (v->reason) {
            fprintf(stderr, "%s: %s is not out; its reason may go\n", reasons_path, id);
        }
    }
    return unexplained;
}

/* Returns the number of rows out without a reason. */
static int print_tables(const Published *tables)
{
    int count[3] = {0}, unexplained = 0;
    printf("%-19s %12s  %22s  %-8s %-5s  %s\n", "row", "Skymend", "published", "unit", "", "how");
    for (int t = 0; t < TABLES; t++)
        print_rows(&tables[t], count);
    printf("\n%d in, %d out, %d later\n", count[0], count[1], count[2]);
    for (int t = 0; t < TABLES; t++)
        unexplained += print_reasons(&tables[t]);
    return unexplained;
}

static const char *numeric_word(const NumericRow *row)
{
    return !(row->value <= row->limit) ? "out" : isfinite(row->limit) ? "in" : "-";
}

/* Returns the number of errors above their limits without a reason. */
static int print_numerics(const NumericRow *rows, int count, const Csv *reasons)
{
    int above = 0;
    printf("\nnumerical errors of the defaults\n%-22s %10s %8s %-4s %-5s  %s\n", "check", "found", "limit",
           "unit", "", "what");
    for (int i = 0; i < count; i++) {
        const NumericRow *row = &rows[i];
        char limit[32] = "-";
        if (isfinite(row->limit))
            snprintf(limit, sizeof limit, "%g", row->limit);
        printf("%-22s %10.4g %8s %-4s %-5s  %s%s%s\n", row->id, row->value, limit, row->unit,
               numeric_word(row), row->what, row->note[0] ? ": " : "", row->note);
    }
    for (int i = 0; i < count; i++) {
        const char *reason = find_reason(reasons, rows[i].id);
        if (rows[i].value <= rows[i].limit)
            continue;
        printf("out: %s: %s\n", rows[i].id, reason ? reason : "NO REASON KNOWN");
        above += !reason;
    }
    return above;
}

/* ---- the same as CSV ---- */

static void quoted(FILE *out, const char *text)
{
    fputc('"', out);
    for (; *text; text++) {
        if (*text == '"')
            fputc('"', out);
        fputc(*text, out);
    }
    fputc('"', out);
}

static void write_rows(FILE *out, const Published *table)
{
    const Csv *published = &table->csv;
    for (size_t row = 1; row < published->rows; row++) {
        const Verdict *v = &table->verdict[row];
        fprintf(out, "%s,", cell(published, row, ID));
        if (v->state == ROW_COMPUTED && isfinite(v->value))
            fprintf(out, "%.10g", v->value);
        fprintf(out, ",%s,%s,%s,%s,", cell(published, row, LOW), cell(published, row, HIGH),
                cell(published, row, UNIT), word(v));
        quoted(out, v->note);
        fputc(',', out);
        quoted(out, v->state == ROW_COMPUTED && !v->inside && v->reason ? v->reason : "");
        fputc('\n', out);
    }
}

static int write_csv(const char *path, const Published *tables, const NumericRow *rows, int count,
                     const Csv *reasons, Fault *fault)
{
    FILE *out = fopen(path, "w");
    if (!out)
        return fault_set(fault, FAULT_OUTPUT, "%s: cannot be written", path);
    fprintf(out, "id,value,low,high,unit,verdict,note,reason\n");
    for (int t = 0; t < TABLES; t++)
        write_rows(out, &tables[t]);
    for (int i = 0; i < count; i++) {
        const NumericRow *row = &rows[i];
        fprintf(out, "numerics-%s,%.10g,,", row->id, row->value);
        if (isfinite(row->limit))
            fprintf(out, "%g", row->limit);
        fprintf(out, ",%s,%s,", row->unit, numeric_word(row));
        quoted(out, row->note);
        fputc(',', out);
        const char *reason = row->value <= row->limit ? NULL : find_reason(reasons, row->id);
        quoted(out, reason ? reason : "");
        fputc('\n', out);
    }
    int bad = ferror(out);
    if (fclose(out) || bad)
        return fault_set(fault, FAULT_OUTPUT, "%s: could not be written to its end", path);
    return 0;
}

/* ---- the run ---- */

static int read_tables(Published *tables, Fault *fault)
{
    static const char *const names[] = {"id",   "quantity", "conditions", "value", "low",
                                        "high", "unit",     "source",     "basis"};
    for (int t = 0; t < TABLES; t++) {
        if (read_named(&tables[t].csv, tables[t].path, names, COLUMNS, fault))
            return fault->code;
        tables[t].verdict = calloc(tables[t].csv.rows, sizeof *tables[t].verdict);
        if (!tables[t].verdict)
            return fault_memory(fault, "verdicts");
    }
    return 0;
}

/* Settle the baseline, take its budget, judge every row by run and settled state. */
static int judge_all(const Published *tables, const Csv *reasons, const Run *run, Fault *fault)
{
    const Model *model = run->model;
    size_t padded = (size_t)model->grid.padded;
    Carried rest = {0};
    Perturbed perturbed = {0};
    OxBook *book = NULL;
    Potencies *potencies = NULL;
    EmissionEvidence emissions = {0};
    double *rate = calloc((size_t)model->mechanism->reactions * padded, sizeof(double));
    double *term = calloc((BUDGET_TERMS + 1) * padded, sizeof(double));
    int code = rate && term ? 0 : fault_memory(fault, "rates of reaction");
    if (!code)
        code = ox_book_make(&book, model->mechanism, fault);
    if (!code)
        code = carried_make(&rest, model, run_fields(run, STEADY_YEAR), STEADY_YEAR + 0.5, fault);
    if (!code)
        code = projection_settle(model, rest.stepper, rest.column, fault);
    if (!code)
        code = perturb_all(&perturbed, &model->settings, fault);
    if (!code)
        code = potencies_measure(model, &potencies, fault);
    if (!code)
        code = emissions_measure(&emissions, &model->settings, model, rest.stepper, rest.column->x, fault);
    if (!code) {
        const Evidence evidence = {run,  rest.stepper, rest.column->x, rate,
                                   term, &perturbed,   potencies,      &emissions};
        budget_step_rates(model, rest.stepper, evidence.x, rate);
        budget_odd_oxygen(book, &model->grid, rate, term, term + BUDGET_TERMS * padded);
        for (int t = 0; !code && t < TABLES; t++)
            code = judge(&tables[t], reasons, &evidence, fault);
    }
    carried_free(&rest);
    ox_book_free(book);
    potency_free(potencies);
    emissions_evidence_free(&emissions);
    free(rate);
    free(term);
    return code;
}

static int validate(const Request *request, int *failures, Fault *fault)
{
    static const char *const reason_names[] = {"id", "reason"};
    const char *data = getenv("SKYMEND_DATA");
    Settings *settings = malloc(sizeof *settings);
    Published tables[TABLES] = {{.path = "tests/published-values.csv"}, {.path = "tests/published-more.csv"}};
    Csv reasons = {0};
    Run baseline = {0};
    NumericRow rows[NUMERIC_MOST];
    int count = 0;
    if (!settings)
        return fault_memory(fault, "settings");
    data = data && data[0] ? data : "input/data";
    settings_default(settings, data);
    int code = request->case_path ? settings_read(settings, request->case_path, data, fault) : 0;
    if (!code && (settings->first_year > 1964 || settings->last_year < STEADY_YEAR))
        code = fault_set(fault, FAULT_INPUT, "the case runs from %d to %d; 1964 to %d are needed",
                         settings->first_year, settings->last_year, STEADY_YEAR);
    if (!code)
        code = read_tables(tables, fault);
    if (!code)
        code = read_named(&reasons, reasons_path, reason_names, 2, fault);
    if (!code)
        code = run_years(&baseline, settings, NULL, "baseline", fault);
    if (!code)
        code = judge_all(tables, &reasons, &baseline, fault);
    if (!code) {
        *failures = print_tables(tables);
        fflush(stdout);
    }
    if (!code && request->numerics)
        code = numerics_measure(&baseline, rows, &count, fault);
    if (!code && request->numerics)
        *failures += print_numerics(rows, count, &reasons);
    if (!code && request->csv)
        code = write_csv(request->csv, tables, rows, count, &reasons, fault);
    run_free(&baseline);
    for (int t = 0; t < TABLES; t++) {
        csv_free(&tables[t].csv);
        free(tables[t].verdict);
    }
    csv_free(&reasons);
    free(settings);
    return code;
}

int main(int argc, char **argv)
{
    Request request = {NULL, NULL, 1};
    Fault fault = {0};
    int failures = 0;
    for (int i = 1; i < argc; i++) {
        if (!strcmp(argv[i], "--csv") && i + 1 < argc)
            request.csv = argv[++i];
        else if (!strcmp(argv[i], "--case") && i + 1 < argc)
            request.case_path = argv[++i];
        else if (!strcmp(argv[i], "--no-numerics"))
            request.numerics = 0;
        else {
            fprintf(stderr,
                    "validate: unknown option %s; usage: validate [--csv FILE] [--no-numerics] [--case "
                    "CASE.cfg]\n",
                    argv[i]);
            return FAULT_INPUT;
        }
    }
    int code = validate(&request, &failures, &fault);
    if (code) {
        fprintf(stderr, "validate: %s\n", fault.text);
        return code;
    }
    printf("\n%d failures\n", failures);
    return failures ? 1 : 0;
}
