/* budget_text: the tables. */
#include "budget_text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "../input/constants.h"

/* ---- values ---- */

static const double *row_of(const BudgetView *view, const double *field, int row)
{
    return field + FIELD(view->model->grid.padded, row, 0);
}

static double losses(const BudgetView *view, double km)
{
    double sum = 0.0;
    for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++)
        sum += budget_at_km(view->model, row_of(view, view->term, t), km);
    return sum;
}

/* Integral from the tropopause up (aloft) or over the whole grid, cm-2 s-1. */
static double column_of(const BudgetView *view, const double *profile, int aloft)
{
    const Grid *grid = &view->model->grid;
    double sum = 0.0;
    for (int l = 0; l < grid->layers; l++)
        if (!aloft || 1e-5 * grid->middle[l] >= view->model->settings.tropopause_km)
            sum += profile[l] * grid->depth[l];
    return sum;
}

/* Share of a species in its family, % of the atoms. */
static double share_of(const BudgetView *view, int total, int species, double km)
{
    double all = 0.0, own = 0.0;
    for (int s = 0; s < view->model->mechanism->solved; s++) {
        int atoms = budget_member(view->model->mechanism, total, s);
        if (!atoms)
            continue;
        double part = atoms * budget_at_km(view->model, row_of(view, view->x, s), km);
        all += part;
        own += s == species ? part : 0.0;
    }
    return 100.0 * own / all;
}

static double total_of(const BudgetView *view, int total, double km)
{
    double all = 0.0;
    for (int s = 0; s < view->model->mechanism->solved; s++)
        all += budget_member(view->model->mechanism, total, s) *
               budget_at_km(view->model, row_of(view, view->x, s), km);
    return all;
}

/* Members that make up at least half a per cent somewhere at the altitudes shown, in the mechanism's order.
 */
static int notable(const BudgetView *view, int total, int species)
{
    if (!budget_member(view->model->mechanism, total, species))
        return 0;
    for (int i = 0; i < view->altitudes; i++)
        if (share_of(view, total, species, view->km[i]) >= 0.5)
            return 1;
    return 0;
}

/* ---- tables ---- */

static void altitude_head(const BudgetView *view, const char *first, const char *tail, FILE *out)
{
    fprintf(out, "%-14s", first);
    for (int i = 0; i < view->altitudes; i++)
        fprintf(out, " %8.4g", view->km[i]);
    fprintf(out, "%s\n", tail);
}

static void print_terms(const BudgetView *view, FILE *out)
{
    static const char *const title[] = {"production", "loss"};
    altitude_head(view, "altitude, km", "   column", out);
    for (int t = 0; t < BUDGET_TERMS; t++) {
        if (t == 0 || t == BUDGET_LOSS_FIRST)
            fprintf(out, "%s\n", title[t != 0]);
        const double *profile = row_of(view, view->term, t);
        fprintf(out, "  %-12s", budget_term_name(t));
        for (int i = 0; i < view->altitudes; i++)
            fprintf(out, " %8.1e", budget_at_km(view->model, profile, view->km[i]));
        fprintf(out, " %8.2e\n", column_of(view, profile, 1));
    }
    fprintf(out, "%-14s", "net");
    for (int i = 0; i < view->altitudes; i++)
        fprintf(out, " %8.1e", budget_at_km(view->model, view->net, view->km[i]));
    fprintf(out, " %8.1e\n", column_of(view, view->net, 1));
}

static void print_shares(const BudgetView *view, FILE *out)
{
    double column = 0.0;
    for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++)
        column += column_of(view, row_of(view, view->term, t), 1);
    altitude_head(view, "altitude, km", "   column", out);
    for (int t = BUDGET_LOSS_FIRST; t < BUDGET_TERMS; t++) {
        const double *profile = row_of(view, view->term, t);
        fprintf(out, "  %-12s", budget_term_name(t));
        for (int i = 0; i < view->altitudes; i++)
            fprintf(out, " %8.1f",
                    100.0 * budget_at_km(view->model, profile, view->km[i]) / losses(view, view->km[i]));
        fprintf(out, " %8.1f\n", 100.0 * column_of(view, profile, 1) / column);
    }
}

static void print_chains(const BudgetView *view, FILE *out)
{
    altitude_head(view, "altitude, km", "", out);
    for (int t = BUDGET_HOX; t <= BUDGET_BROX; t++) {
        fprintf(out, "  %-12s", budget_term_name(t));
        for (int i = 0; i < view->altitudes; i++) {
            double length = budget_at_km(view->model, row_of(view, view->chain, t), view->km[i]);
            if (isfinite(length))
                fprintf(out, " %8.3g", length);
            else
                fprintf(out, " %8s", "-");
        }
        fputc('\n', out);
    }
}

static void print_partition(const BudgetView *view, int total, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    char head[40];
    snprintf(head, sizeof head, "%s, mol/mol", budget_total_name(total));
    fprintf(out, "%-14s", head);
    for (int i = 0; i < view->altitudes; i++)
        fprintf(out, " %8.2e", total_of(view, total, view->km[i]));
    fputc('\n', out);
    for (int s = 0; s < mechanism->solved; s++) {
        if (!notable(view, total, s))
            continue;
        fprintf(out, "  %-10s %%", mechanism_name(mechanism, s));
        for (int i = 0; i < view->altitudes; i++)
            fprintf(out, " %8.1f", share_of(view, total, s, view->km[i]));
        fputc('\n', out);
    }
}

static void print_lifetime(double years, FILE *out)
{
    if (!isfinite(years) || years >= 1e5)
        fprintf(out, " %10s", isfinite(years) ? "> 1e5" : "-");
    else
        fprintf(out, " %10.4g", years);
}

static void print_lifetimes(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    fprintf(out, "%-14s %10s %10s", "gas", "all", "strato.");
    for (int p = 0; p < GAS_LOSSES; p++)
        fprintf(out, " %10s", budget_loss_name(p));
    fputc('\n', out);
    for (int s = 0; s < mechanism->solved; s++) {
        const GasBudget *gas = &view->gas[s];
        if (!budget_is_source(view->model, s))
            continue;
        fprintf(out, "%-14s", mechanism_name(mechanism, s));
        print_lifetime(budget_lifetime(gas, gas->loss, GAS_LOSSES), out);
        print_lifetime(budget_lifetime(gas, gas->aloft, GAS_LOSSES), out);
        for (int p = 0; p < GAS_LOSSES; p++)
            print_lifetime(budget_lifetime(gas, &gas->loss[p], 1), out);
        fputc('\n', out);
    }
}

static void print_atoms(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    fprintf(out, "%-14s %12s %20s %12s\n", "element", "all", "in gases of C, N2O", "in the rest");
    for (int e = 0; e < mechanism->elements; e++) {
        double all, sources;
        budget_atoms(view->model, view->x, e, &all, &sources);
        fprintf(out, "%-14s %12.5e %20.5e %12.5e\n", mechanism->element[e], all, sources, all - sources);
    }
}

void budget_print(const BudgetView *view, FILE *out)
{
    const Settings *settings = &view->model->settings;
    fprintf(out, "%s\n\nColumn at rest under the conditions of %.2f", settings->title, view->year);
    if (view->explicit_days > 0.0)
        fprintf(out, ", then %g explicit days", view->explicit_days);
    fprintf(out, ": ozone %.2f DU", column_ozone_du(view->model, view->x));
    fprintf(out, ".\nMeans over 24 h. Columns are integrals from the tropopause of the case (%g km) up.\n\n",
            settings->tropopause_km);
    fprintf(out, "Odd oxygen by family, cm-3 s-1; column in cm-2 s-1\n\n");
    print_terms(view, out);
    fprintf(out, "\nShares in the loss of odd oxygen, %%\n\n");
    print_shares(view, out);
    fprintf(out, "\nChain lengths: pairs of odd oxygen destroyed for each radical lost\n\n");
    print_chains(view, out);
    fprintf(out, "\nWhat families are made of\n\n");
    altitude_head(view, "altitude, km", "", out);
    for (int total = 0; total < BUDGET_TOTALS; total++)
        print_partition(view, total, out);
    fprintf(out,
            "\nLifetimes of the source gases, years: burden over all loss, over loss above the tropopause, "
            "and over\neach loss alone. What the chemistry makes anew is not taken off.\n\n");
    print_lifetimes(view, out);
    fprintf(out, "\nAtoms in the active species, cm-2\n\n");
    print_atoms(view, out);
}

/* ---- how it is counted ---- */

enum { WIDTH = 108, INDENT = 16 };

/* A word after what stands on the line, which it starts anew where there is no room. */
static int put_word(FILE *out, int used, const char *word)
{
    if (used + (int)strlen(word) > WIDTH)
        used = fprintf(out, "\n%*s", INDENT, "") - 1;
    return used + fprintf(out, "%s", word);
}

static void print_content(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    int used = fprintf(out, "  %-14s", "odd oxygen");
    const char *sign = "";
    for (int s = 0; s < mechanism->solved; s++) {
        char count[32] = "", word[100];
        if (view->book->content[s] == 0.0)
            continue;
        if (view->book->content[s] != 1.0)
            snprintf(count, sizeof count, "%g ", view->book->content[s]);
        snprintf(word, sizeof word, "%s %s%s", sign, count, mechanism_name(mechanism, s));
        used = put_word(out, used, word);
        sign = " +";
    }
    fputc('\n', out);
}

static void print_family(const BudgetView *view, int term, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    int used = fprintf(out, "  %-14s", budget_term_name(term));
    for (int r = 0; r < mechanism->reactions; r++) {
        char word[100];
        if (view->book->term[r] != term || r == view->book->shared)
            continue;
        snprintf(word, sizeof word, " %s %+g;", mechanism->reaction[r].id, view->book->weight[r]);
        used = put_word(out, used, word);
    }
    fputc('\n', out);
}

void budget_print_book(const BudgetView *view, FILE *out)
{
    const Mechanism *mechanism = view->model->mechanism;
    int shared = view->book->shared;
    fprintf(out, "How it is counted: the change of odd oxygen in one event of each reaction\n\n");
    print_content(view, out);
    for (int t = 0; t < BUDGET_TERMS; t++)
        print_family(view, t, out);
    if (shared >= 0)
        fprintf(out, "  %-14s %s %+g, charged to what becomes of the HO2; what meets NO undoes itself\n",
                "shared", mechanism->reaction[shared].id, view->book->weight[shared]);
}
