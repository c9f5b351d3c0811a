/* kernel: symbolic analysis. Nothing here is in a hot path; clarity before speed. */
#include "kernel.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* A growing list of 32-bit indices with optional weights. */
typedef struct {
    int32_t *index;
    double *weight;
    int count, room;
    int failed;
} List;

static void list_add(List *list, int32_t index, double weight)
{
    if (list->failed)
        return;
    if (list->count == list->room) {
        int room = list->room ? 2 * list->room : 256;
        int32_t *index_grown = realloc(list->index, (size_t)room * sizeof *index_grown);
        if (index_grown)
            list->index = index_grown;
        double *weight_grown = realloc(list->weight, (size_t)room * sizeof *weight_grown);
        if (weight_grown)
            list->weight = weight_grown;
        if (!index_grown || !weight_grown) {
            list->failed = 1;
            return;
        }
        list->room = room;
    }
    list->index[list->count] = index;
    list->weight[list->count++] = weight;
}

void kernel_free(Kernel *kernel)
{
    if (!kernel)
        return;
    free(kernel->order);
    free(kernel->reactant);
    free(kernel->cubic);
    free(kernel->source_first);
    free(kernel->source_reaction);
    free(kernel->source_weight);
    free(kernel->derivative_reaction);
    free(kernel->derivative_by);
    free(kernel->derivative_p);
    free(kernel->derivative_q);
    free(kernel->derivative_multiplicity);
    free(kernel->cubic_derivative);
    free(kernel->order_of);
    free(kernel->row_first);
    free(kernel->column);
    free(kernel->diagonal);
    free(kernel->term_first);
    free(kernel->term_derivative);
    free(kernel->term_weight);
    free(kernel->product_first);
    free(kernel->product_lower);
    free(kernel->product_upper);
    free(kernel->tally_reaction);
    free(kernel);
}

static int copy_reactants(Kernel *kernel, const Mechanism *mechanism, Fault *fault)
{
    kernel->order = malloc((size_t)kernel->reactions * sizeof *kernel->order);
    kernel->reactant = malloc((size_t)kernel->reactions * 3 * sizeof *kernel->reactant);
    kernel->cubic = malloc((size_t)kernel->reactions * sizeof *kernel->cubic);
    if (!kernel->order || !kernel->reactant || !kernel->cubic)
        return fault_memory(fault, "reaction lists");
    for (int r = 0; r < kernel->reactions; r++) {
        const Reaction *reaction = &mechanism->reaction[r];
        kernel->order[r] = reaction->reactants;
        for (int i = 0; i < 3; i++)
            kernel->reactant[3 * r + i] = i < reaction->reactants ? reaction->reactant[i] : kernel->species;
        if (reaction->reactants == 3)
            kernel->cubic[kernel->cubics++] = r;
    }
    return 0;
}

/* Atoms of an element that leave the solved species per event; washout is tallied apart. */
static double atoms_leaving(const Mechanism *mechanism, int r, int element)
{
    const Reaction *reaction = &mechanism->reaction[r];
    double atoms = 0.0;
    if (r >= mechanism->washout_first)
        return 0.0;
    for (int c = 0; c < reaction->changes; c++)
        atoms -= reaction->change[c] * mechanism_atoms(mechanism, reaction->changed[c], element);
    return fabs(atoms) > 1e-9 ? atoms : 0.0; /* fractional products add up to whole atoms but for rounding */
}

/* A counter for each element that leaves or enters: all but O, of which air is an endless store, and F, which
 * nobody follows. In the order of the mechanism's list of elements. */
static void choose_counters(Kernel *kernel, const Mechanism *mechanism)
{
    for (int element = 0; element < mechanism->elements; element++) {
        const char *symbol = mechanism->element[element];
        int leaves = 0;
        if (strcmp(symbol, "O") == 0 || strcmp(symbol, "F") == 0)
            continue;
        for (int r = 0; r < mechanism->reactions; r++)
            leaves |= atoms_leaving(mechanism, r, element) != 0.0;
        if (leaves)
            kernel->counter_element[kernel->counters++] = element;
    }
    kernel->species = mechanism->solved + kernel->counters;
}

/* Sources by row, in reaction order so that sums do not depend on anything but the mechanism. */
static int list_sources(Kernel *kernel, const Mechanism *mechanism, Fault *fault)
{
    List list = {0};
    kernel->source_first = malloc((size_t)(kernel->species + 1) * sizeof *kernel->source_first);
    if (!kernel->source_first)
        return fault_memory(fault, "source lists");
    for (int s = 0; s < kernel->species; s++) {
        kernel->source_first[s] = list.count;
        for (int r = 0; r < kernel->reactions; r++) {
            const Reaction *reaction = &mechanism->reaction[r];
            for (int c = 0; c < reaction->changes; c++)
                if (reaction->changed[c] == s)
                    list_add(&list, r, reaction->change[c]);
            if (s < mechanism->solved)
                continue;
            double leaving = atoms_leaving(mechanism, r, kernel->counter_element[s - mechanism->solved]);
            if (leaving != 0.0)
                list_add(&list, r, leaving);
        }
    }
    kernel->source_first[kernel->species] = list.count;
    kernel->source_reaction = list.index;
    kernel->source_weight = list.weight;
    return list.failed ? fault_memory(fault, "source lists") : 0;
}

/* d(rate of r)/d(y_a) for every distinct reactant a: the product of the remaining reactants, multiplicity
 * times. */
static int list_derivatives(Kernel *kernel, Fault *fault)
{
    size_t room = (size_t)kernel->reactions * 3;
    kernel->derivative_reaction = malloc(room * sizeof(int32_t));
    kernel->derivative_by = malloc(room * sizeof(int32_t));
    kernel->derivative_p = malloc(room * sizeof(int32_t));
    kernel->derivative_q = malloc(room * sizeof(int32_t));
    kernel->derivative_multiplicity = malloc(room * sizeof(int32_t));
    kernel->cubic_derivative = malloc(room * sizeof(int32_t));
    if (!kernel->derivative_reaction || !kernel->derivative_by || !kernel->derivative_p ||
        !kernel->derivative_q || !kernel->derivative_multiplicity || !kernel->cubic_derivative)
        return fault_memory(fault, "derivative lists");
    int count = 0;
    for (int r = 0; r < kernel->reactions; r++) {
        const int32_t *reactant = &kernel->reactant[3 * r];
        for (int i = 0; i < kernel->order[r]; i++) {
            int multiplicity = 0, seen = 0, others = 0;
            int32_t other[2] = {kernel->species, kernel->species};
            for (int j = 0; j < kernel->order[r]; j++) {
                if (reactant[j] == reactant[i]) {
                    multiplicity++;
                    if (j < i)
                        seen = 1;
                }
                if (j != i)
                    other[others++] = reactant[j];
            }
            if (seen)
                continue;
            kernel->derivative_reaction[count] = r;
            kernel->derivative_by[count] = reactant[i];
            kernel->derivative_p[count] = other[0];
            kernel->derivative_q[count] = other[1];
            kernel->derivative_multiplicity[count] = multiplicity;
            if (kernel->order[r] == 3)
                kernel->cubic_derivative[kernel->cubic_derivatives++] = count;
            count++;
        }
    }
    kernel->derivatives = count;
    return 0;
}

/* pattern[i * n + j] = 1 where species i's tendency depends on species j, and on the diagonal. */
static void fill_pattern(unsigned char *pattern, const Kernel *kernel)
{
    int n = kernel->species;
    for (int i = 0; i < n; i++) {
        pattern[i * n + i] = 1;
        for (int e = kernel->source_first[i]; e < kernel->source_first[i + 1]; e++) {
            int r = kernel->source_reaction[e];
            for (int j = 0; j < kernel->order[r]; j++)
                pattern[i * n + kernel->reactant[3 * r + j]] = 1;
        }
    }
}

/* Diagonal pivots by smallest Markowitz count (r - 1)(c - 1), ties by species number; pattern gains the fill.
 */
static void choose_order(unsigned char *pattern, int n, int32_t *order_of, unsigned char *done)
{
    memset(done, 0, (size_t)n);
    for (int step = 0; step < n; step++) {
        int best = -1;
        long best_count = 0;
        for (int i = 0; i < n; i++) {
            if (done[i])
                continue;
            long in_row = 0, in_column = 0;
            for (int j = 0; j < n; j++) {
                if (done[j])
                    continue;
                in_row += pattern[i * n + j];
                in_column += pattern[j * n + i];
            }
            long count = (in_row - 1) * (in_column - 1);
            if (best < 0 || count < best_count) {
                best = i;
                best_count = count;
            }
        }
        order_of[step] = best;
        done[best] = 1;
        for (int i = 0; i < n; i++) {
            if (done[i] || !pattern[i * n + best])
                continue;
            for (int j = 0; j < n; j++)
                if (!done[j] && pattern[best * n + j])
                    pattern[i * n + j] = 1;
        }
    }
}

/* Compressed rows of the filled pattern; entry_at[i * n + j] by position, -1 where empty. */
static int compress_rows(Kernel *kernel, const unsigned char *pattern, int32_t *entry_at, Fault *fault)
{
    int n = kernel->species;
    int entries = 0;
    for (int i = 0; i < n * n; i++)
        entries += pattern[i];
    kernel->entries = entries;
    kernel->row_first = malloc((size_t)(n + 1) * sizeof(int32_t));
    kernel->column = malloc((size_t)entries * sizeof(int32_t));
    kernel->diagonal = malloc((size_t)n * sizeof(int32_t));
    if (!kernel->row_first || !kernel->column || !kernel->diagonal)
        return fault_memory(fault, "sparse rows");
    int e = 0;
    for (int i = 0; i < n; i++) {
        kernel->row_first[i] = e;
        for (int j = 0; j < n; j++) {
            entry_at[i * n + j] = -1;
            if (!pattern[kernel->order_of[i] * n + kernel->order_of[j]])
                continue;
            entry_at[i * n + j] = e;
            if (i == j)
                kernel->diagonal[i] = e;
            kernel->column[e++] = j;
        }
    }
    kernel->row_first[n] = e;
    return 0;
}

static int list_terms(Kernel *kernel, Fault *fault)
{
    List list = {0};
    kernel->term_first = malloc((size_t)(kernel->entries + 1) * sizeof(int32_t));
    if (!kernel->term_first)
        return fault_memory(fault, "Jacobian terms");
    for (int i = 0; i < kernel->species; i++) {
        int row = kernel->order_of[i];
        for (int e = kernel->row_first[i]; e < kernel->row_first[i + 1]; e++) {
            int by = kernel->order_of[kernel->column[e]];
            kernel->term_first[e] = list.count;
            for (int d = 0; d < kernel->derivatives; d++) {
                if (kernel->derivative_by[d] != by)
                    continue;
                for (int c = kernel->source_first[row]; c < kernel->source_first[row + 1]; c++)
                    if (kernel->source_reaction[c] == kernel->derivative_reaction[d])
                        list_add(&list, d, kernel->derivative_multiplicity[d] * kernel->source_weight[c]);
            }
        }
    }
    kernel->term_first[kernel->entries] = list.count;
    kernel->term_derivative = list.index;
    kernel->term_weight = list.weight;
    return list.failed ? fault_memory(fault, "Jacobian terms") : 0;
}

/* The products of the factorisation written out, entry by entry. Elimination in the chosen order gave the
 * pattern all its fill, so that (i, k) and (k, j) being there means that (i, j) is. */
static int list_products(Kernel *kernel, const int32_t *entry_at, Fault *fault)
{
    int n = kernel->species;
    List lower = {0}, upper = {0};
    kernel->product_first = malloc((size_t)(kernel->entries + 1) * sizeof(int32_t));
    if (!kernel->product_first)
        return fault_memory(fault, "elimination lists");
    for (int i = 0; i < n; i++)
        for (int e = kernel->row_first[i]; e < kernel->row_first[i + 1]; e++) {
            int j = kernel->column[e];
            kernel->product_first[e] = lower.count;
            for (int t = kernel->row_first[i]; t < kernel->diagonal[i] && kernel->column[t] < j; t++) {
                int32_t partner = entry_at[kernel->column[t] * n + j];
                if (partner < 0)
                    continue;
                list_add(&lower, t, 0);
                list_add(&upper, partner, 0);
            }
        }
    kernel->product_first[kernel->entries] = lower.count;
    kernel->product_lower = lower.index;
    kernel->product_upper = upper.index;
    free(lower.weight);
    free(upper.weight);
    return lower.failed || upper.failed ? fault_memory(fault, "elimination lists") : 0;
}

static int analyse_matrix(Kernel *kernel, Fault *fault)
{
    int n = kernel->species;
    if (n < 1)
        return fault_set(fault, FAULT_INPUT, "the mechanism has no active species; give it at least one");
    size_t square = (size_t)n * (size_t)n;
    unsigned char *pattern = calloc(square, 1);
    unsigned char *done = malloc((size_t)n);
    int32_t *entry_at = malloc(square * sizeof *entry_at);
    kernel->order_of = malloc((size_t)n * sizeof(int32_t));
    int code;
    if (!pattern || !done || !entry_at || !kernel->order_of)
        code = fault_memory(fault, "sparsity pattern");
    else {
        fill_pattern(pattern, kernel);
        choose_order(pattern, n, kernel->order_of, done);
        code = compress_rows(kernel, pattern, entry_at, fault);
        if (!code)
            code = list_terms(kernel, fault);
        if (!code)
            code = list_products(kernel, entry_at, fault);
    }
    free(pattern);
    free(done);
    free(entry_at);
    return code;
}

static int list_tallies(Kernel *kernel, const Mechanism *mechanism, Fault *fault)
{
    List list = {0};
    for (int r = mechanism->washout_first; r < mechanism->reactions; r++)
        list_add(&list, r, 0);
    kernel->tallies = list.count;
    kernel->tally_reaction = list.index;
    free(list.weight);
    return list.failed ? fault_memory(fault, "tally list") : 0;
}

int kernel_make(Kernel **made, const Mechanism *mechanism, Fault *fault)
{
    *made = NULL;
    Kernel *kernel = calloc(1, sizeof *kernel);
    if (!kernel)
        return fault_memory(fault, "chemistry kernel");
    choose_counters(kernel, mechanism);
    kernel->reactions = mechanism->reactions;
    int code = copy_reactants(kernel, mechanism, fault);
    if (!code)
        code = list_sources(kernel, mechanism, fault);
    if (!code)
        code = list_derivatives(kernel, fault);
    if (!code)
        code = analyse_matrix(kernel, fault);
    if (!code)
        code = list_tallies(kernel, mechanism, fault);
    if (code) {
        kernel_free(kernel);
        return code;
    }
    *made = kernel;
    return 0;
}
