/* answers_emission: emissions in ODP-tonnes as answers; contract in answers.h and answers_emission.h. */
#include "answers_emission.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define TONNES 1e3     /* in a Gg */
#define ROUND_OFF 1e-9 /* of an emission: what all a gas gives and the sum of its lines may differ by */

static const char *const weight_words[WEIGHTS] = {"treaty", "own"};
static const char *const weight_labels[WEIGHTS] = {"emission by the treaty's potentials",
                                                   "emission by Skymend's own potentials"};

const char *odp_word(int weight)
{
    return weight_words[weight];
}

double odp_mass(const OdpWeights *weights, int weight, int share, const GasEmission *gas, int i)
{
    if (isnan(weights_potential(weights, weight, gas->gas)))
        return 0.0;
    if (gas->nitrogen)
        return share == ODP_NITROGEN ? gas->all[i] : 0.0;
    if (!gas->halocarbon || share == ODP_NITROGEN)
        return 0.0;
    if (!weights_natural(weights, gas->gas))
        return share == ODP_COUNTED ? gas->all[i] : 0.0;
    double rest = gas->all[i] - gas->lines[i];
    if (share == ODP_COUNTED)
        return gas->lines[i];
    return fabs(rest) > ROUND_OFF * fabs(gas->all[i]) ? rest : 0.0; /* lines give all of it */
}

/* ---- sums over gases and time ---- */

/* What is asked: a share of the emissions of a file, or of the difference of two. */
typedef struct {
    Answers *answers;
    const FileSeries *file;
    const OdpWeights *weights;
    int weight, share;
    int gas;        /* index; -1: all */
    int controlled; /* 1: only what the treaty controls */
    const char *of; /* "" or "_difference", in the ids */
    double *series; /* [count] work */
    Fault *fault;
} Ask;

static int asked(const Ask *ask, int g)
{
    return (ask->gas < 0 || ask->gas == g) &&
           (!ask->controlled || treaty_standing(&ask->weights->treaty, ask->file->emissions.gas[g].gas,
                                                NULL) == TREATY_CONTROLLED);
}

static double mass(const Ask *ask, int g, int i)
{
    return odp_mass(ask->weights, ask->weight, ask->share, &ask->file->emissions.gas[g], i);
}

static double tonnes_per_gg(const Ask *ask, int g)
{
    return TONNES * weights_potential(ask->weights, ask->weight, ask->file->emissions.gas[g].gas);
}

/* Length of an interval, years; a file of one record without bounds has none. */
static double years_of(const FileSeries *file, int i)
{
    return file->end[i] - file->start[i];
}

/* Over the file: t with odp set, else Gg. */
static double total(const Ask *ask, int odp)
{
    double sum = 0.0;
    for (int g = 0; g < ask->file->emissions.gases; g++)
        for (int i = 0; i < ask->file->count && asked(ask, g); i++) {
            double one = mass(ask, g, i) * years_of(ask->file, i);
            sum += one == 0.0 ? 0.0 : odp ? tonnes_per_gg(ask, g) * one : one;
        }
    return sum;
}

/* What the noise of the potentials makes of it, at worst. year NAN: of the total, else of a calendar year. */
static double noise(const Ask *ask, double year)
{
    double sum = 0.0;
    if (ask->weight == WEIGHT_TREATY)
        return NAN;
    for (int g = 0; g < ask->file->emissions.gases; g++) {
        double amount = 0.0;
        for (int i = 0; i < ask->file->count && asked(ask, g); i++) {
            ask->series[i] = mass(ask, g, i);
            amount += ask->series[i] * years_of(ask->file, i);
        }
        const Series series = {ask->file->count, ask->file->start, ask->file->middle, ask->file->end,
                               ask->series};
        if (asked(ask, g) && !isnan(year))
            amount = series_year_mean(&series, (int)year);
        if (asked(ask, g) && amount != 0.0)
            sum += TONNES * weights_noise(ask->weights, ask->weight, ask->file->emissions.gas[g].gas) *
                   fabs(amount);
    }
    return sum;
}

/* t a year by calendar year, year [years] from first on. */
static void by_year(const Ask *ask, int first, int years, double *year)
{
    const Series series = {ask->file->count, ask->file->start, ask->file->middle, ask->file->end,
                           ask->series};
    memset(ask->series, 0, (size_t)ask->file->count * sizeof *ask->series);
    for (int g = 0; g < ask->file->emissions.gases; g++)
        for (int i = 0; i < ask->file->count && asked(ask, g); i++) {
            double one = mass(ask, g, i);
            ask->series[i] += one == 0.0 ? 0.0 : tonnes_per_gg(ask, g) * one;
        }
    for (int y = 0; y < years; y++)
        year[y] = series_year_mean(&series, first + y);
}

/* ---- entries ---- */

static FileAnswer *entry(const Ask *ask, const char *unit, const char *what, const char *label)
{
    const GasEmission *gas = ask->gas < 0 ? NULL : &ask->file->emissions.gas[ask->gas];
    FileAnswer *answer =
        answers_add(ask->answers, unit, ask->fault, "odp_emission_%s%s%s%s_%s", weight_words[ask->weight],
                    ask->of, gas ? "_" : "", gas ? gas->variable : "", what);
    if (!answer)
        return NULL;
    snprintf(answer->label, sizeof answer->label, "%s%s%s: %s%s", weight_labels[ask->weight], gas ? ", " : "",
             gas ? gas->gas : "", ask->of[0] ? "this file less reference, " : "", label);
    answer->detail = gas != NULL;
    return answer;
}

/* How the numbers come about, the same words for each. */
static void say_method(const Ask *ask, FileAnswer *answer, const char *what)
{
    static const char *const shares[] = {
        ("halocarbons that have a potential, but of gases that nature gives off too only what lines of the "
         "schedule give"),
        "what abundances imply of halocarbons that nature gives off too", "gases with nitrogen, no halogen"};
    snprintf(answer->method, sizeof answer->method,
             "%s of emission times potential, %.2f to %.2f; counted: %s%s; error: %s", what,
             ask->file->start[0], ask->file->end[ask->file->count - 1],
             ask->gas >= 0     ? "this gas"
             : ask->of[0]      ? (ask->share == ODP_NITROGEN ? shares[ODP_NITROGEN]
                                                             : "halocarbons that have a potential, whole")
             : ask->controlled ? "controlled gases of the total"
                               : shares[ask->share],
             ask->gas < 0 && ask->share == ODP_COUNTED && !ask->of[0] && !ask->controlled
                 ? ", the rest is apart (natural_total)"
                 : "",
             ask->weight == WEIGHT_OWN ? "noise of the potentials alone" : "not known");
}

/* Names of the gases for which yes says so, ", " between them, cut with "..." at size. */
static void list_gases(const Ask *ask, int (*yes)(const Ask *, const GasEmission *), char *text, size_t size)
{
    text[0] = '\0';
    for (int g = 0; g < ask->file->emissions.gases; g++) {
        const char *name = ask->file->emissions.gas[g].gas;
        size_t used = strlen(text);
        if (!yes(ask, &ask->file->emissions.gas[g]))
            continue;
        if (used + strlen(name) + 6 > size) {
            snprintf(text + used, size - used, "...");
            return;
        }
        snprintf(text + used, size - used, "%s%s", used ? ", " : "", name);
    }
}

static int in_natural(const Ask *ask, const GasEmission *gas)
{
    return gas->halocarbon && weights_natural(ask->weights, gas->gas) &&
           !isnan(weights_potential(ask->weights, ask->weight, gas->gas));
}

static int without_potential(const Ask *ask, const GasEmission *gas)
{
    return gas->halocarbon && isnan(weights_potential(ask->weights, ask->weight, gas->gas));
}

static int add_total(const Ask *ask, const char *what, const char *label)
{
    char gases[150];
    FileAnswer *answer = entry(ask, "t", what, label);
    if (!answer)
        return ask->fault->code;
    say_method(ask, answer, "sum over time and gases");
    answer->value = total(ask, 1);
    answer->error = noise(ask, NAN);
    list_gases(ask, ask->share == ODP_NATURAL ? in_natural : without_potential, gases, sizeof gases);
    if (ask->gas < 0 && ask->share != ODP_NITROGEN && gases[0])
        snprintf(answer->note, sizeof answer->note, "%s%s",
                 ask->share == ODP_NATURAL      ? ""
                 : ask->weight == WEIGHT_TREATY ? "not controlled, so not counted: "
                                                : "without a potential, so not counted: ",
                 gases);
    return 0;
}

static int add_mass(const Ask *ask)
{
    FileAnswer *answer = entry(ask, "Gg", "mass_total", "mass of what is counted");
    if (!answer)
        return ask->fault->code;
    snprintf(answer->method, sizeof answer->method,
             "sum over time of the emissions that are counted, %.2f to %.2f; error: not known",
             ask->file->start[0], ask->file->end[ask->file->count - 1]);
    answer->value = total(ask, 0);
    return 0;
}

/* Whether some of what is counted keeps an abundance. */
static int implied(const Ask *ask)
{
    const int last = ask->file->count - 1;
    for (int g = 0; g < ask->file->emissions.gases; g++) {
        const GasEmission *gas = &ask->file->emissions.gas[g];
        if (fabs(mass(ask, g, last) - gas->lines[last]) > ROUND_OFF * fabs(gas->all[last]) &&
            mass(ask, g, last) != 0.0)
            return 1;
    }
    return 0;
}

/* The year of the largest, whatever its sign, and the last, of by_year [years]. */
static int add_years(const Ask *ask, int first, int years, const double *year)
{
    int most = -1, last = -1;
    for (int y = 0; y < years; y++) {
        if (isnan(year[y]))
            continue;
        last = y;
        if (most < 0 || fabs(year[y]) > fabs(year[most]))
            most = y;
    }
    const struct {
        const char *unit, *what, *label, *method;
        int at;
    } asked_for[] = {{"t year-1", "largest", "largest year", "largest of the calendar years covered", most},
                     {"year", "largest_year", "year of the largest", "middle of that calendar year", most},
                     {"t year-1", "last", "last calendar year", "last calendar year covered", last}};
    for (int a = 0; a < (ask->gas >= 0 ? 1 : 3); a++) {
        FileAnswer *answer = entry(ask, asked_for[a].unit, asked_for[a].what, asked_for[a].label);
        if (!answer)
            return ask->fault->code;
        say_method(ask, answer, asked_for[a].method);
        if (asked_for[a].at < 0) {
            snprintf(answer->note, sizeof answer->note, "no calendar year is covered");
        } else if (a == 1) {
            answer->value = first + most + 0.5;
        } else {
            answer->value = year[asked_for[a].at];
            answer->error = noise(ask, first + asked_for[a].at);
            snprintf(answer->note, sizeof answer->note, "%d%s", first + asked_for[a].at,
                     a == 2 && implied(ask) ? "; where the schedule of abundances ends they stand still from "
                                              "the middle of its last year on: rather read the year before"
                                            : "");
        }
        if (a == 1 && most >= 0 && year[most] == 0.0) {
            answer->value = NAN;
            snprintf(answer->note, sizeof answer->note, "nothing in any year");
        }
    }
    return 0;
}

/* Gas by gas, all of its emission, natural or not. */
static int add_gases(const Ask *ask, int first, int years, double *year)
{
    for (int g = 0; g < ask->file->emissions.gases; g++) {
        const GasEmission *gas = &ask->file->emissions.gas[g];
        if (isnan(weights_potential(ask->weights, ask->weight, gas->gas)) ||
            !(gas->halocarbon || gas->nitrogen))
            continue;
        GasEmission whole = *gas;
        FileSeries one = *ask->file;
        Ask of = *ask;
        whole.lines = whole.all; /* counted whole */
        one.emissions = (FileEmissions){.gases = 1, .gas = &whole};
        of.file = &one;
        of.gas = 0;
        of.share = gas->nitrogen ? ODP_NITROGEN : ODP_COUNTED;
        by_year(&of, first, years, year);
        if (add_total(&of, "total", "total") || add_years(&of, first, years, year))
            return ask->fault->code;
    }
    return 0;
}

/* ---- lines ---- */

static int add_lines(const Ask *ask)
{
    const FileEmissions *emissions = &ask->file->emissions;
    for (int l = 0; l < emissions->lines; l++) {
        const LineEmission *line = &emissions->line[l];
        const GasEmission *gas = &emissions->gas[line->gas];
        double potential = weights_potential(ask->weights, ask->weight, gas->gas), sum = 0.0;
        if (isnan(potential) || !(gas->halocarbon || gas->nitrogen))
            continue;
        for (int i = 0; i < ask->file->count; i++)
            sum += line->given[i] * years_of(ask->file, i);
        FileAnswer *answer = answers_add(ask->answers, "t", ask->fault, "odp_emission_%s_line_%d_total",
                                         weight_words[ask->weight], l + 1);
        if (!answer)
            return ask->fault->code;
        answer->detail = 1;
        answer->value = TONNES * potential * sum;
        answer->error = TONNES * weights_noise(ask->weights, ask->weight, gas->gas) * fabs(sum);
        snprintf(answer->label, sizeof answer->label, "%s: total of the line \"%.70s\", %.31s",
                 weight_labels[ask->weight], line->label, gas->gas);
        snprintf(answer->method, sizeof answer->method,
                 "sum over time of the line's emission times the potential, at whatever height it is given "
                 "off; error: %s",
                 ask->weight == WEIGHT_OWN ? "noise of the potential alone"
                                           : "none, both are agreed figures");
        if (ask->weight == WEIGHT_TREATY)
            answer->error = 0.0;
    }
    return 0;
}

/* ---- the whole ---- */

/* All of one kind of weight for one file, or for the difference of two; by_year's rows out. */
static int add_weight(Ask *ask, int first, int years, double **rows, double *work)
{
    const int difference = ask->of[0] != '\0';
    for (ask->share = 0; ask->share < ODP_SHARES; ask->share++)
        by_year(ask, first, years, rows[ask->share]);
    ask->share = ODP_COUNTED;
    if (add_total(ask, "total", "total") || add_mass(ask) || add_years(ask, first, years, rows[ODP_COUNTED]))
        return ask->fault->code;
    if (ask->weight == WEIGHT_OWN) {
        ask->controlled = 1;
        add_total(ask, "controlled_total", "total of the gases that the treaty controls");
        ask->controlled = 0;
        ask->share = ODP_NITROGEN;
        if (!ask->fault->code)
            add_total(ask, "nitrogen_total", "total of gases with nitrogen (N2O), apart");
    }
    ask->share = ODP_NATURAL;
    if (!ask->fault->code && !difference)
        add_total(ask, "natural_total", "implied emission of gases that nature gives off too, apart");
    ask->share = ODP_COUNTED;
    if (!ask->fault->code && !add_gases(ask, first, years, work) && !difference)
        add_lines(ask);
    return ask->fault->code;
}

/* Gg of each gas. */
static int add_masses(Answers *answers, const FileSeries *file, Fault *fault)
{
    for (int g = 0; g < file->emissions.gases; g++) {
        const GasEmission *gas = &file->emissions.gas[g];
        double sum = 0.0, lines = 0.0;
        for (int i = 0; i < file->count; i++) {
            sum += gas->all[i] * years_of(file, i);
            lines += gas->lines[i] * years_of(file, i);
        }
        FileAnswer *answer = answers_add(answers, "Gg", fault, "emission_%s_total", gas->variable);
        if (!answer)
            return fault->code;
        answer->detail = 1;
        answer->value = sum;
        snprintf(answer->label, sizeof answer->label, "emission of %s: total", gas->gas);
        snprintf(answer->method, sizeof answer->method,
                 "sum over time of emission_%s, %.2f to %.2f; error: not known", gas->variable,
                 file->start[0], file->end[file->count - 1]);
        if (fabs(sum - lines) > ROUND_OFF * fabs(sum))
            snprintf(answer->note, sizeof answer->note, "implied by its abundance%s",
                     lines != 0.0 ? ", but for what lines of the schedule give" : "");
    }
    return 0;
}

static int make_table(Answers *answers, const FileSeries *file, const OdpWeights *weights, int differences,
                      Fault *fault)
{
    OdpTable *odp = answers->odp = calloc(1, sizeof *odp);
    if (!odp)
        return fault_memory(fault, "emissions by year");
    odp->weights = weights;
    odp->first_year = (int)floor(file->middle[0]);
    odp->years = (int)floor(file->middle[file->count - 1]) - odp->first_year + 1;
    const size_t years = (size_t)odp->years;
    odp->store = calloc(2 * WEIGHTS * ODP_SHARES * years, sizeof *odp->store);
    if (!odp->store)
        return fault_memory(fault, "emissions by year");
    for (size_t w = 0, row = 0; w < WEIGHTS; w++)
        for (int s = 0; s < ODP_SHARES; s++) {
            odp->by_year[w][s] = odp->store + row++ * years;
            if (differences)
                odp->difference[w][s] = odp->store + row++ * years;
        }
    return 0;
}

int answers_emission(Answers *answers, const FileSeries *file, const FileSeries *reference,
                     const OdpWeights *weights, Fault *fault)
{
    FileSeries difference = {0};
    double *store = NULL;
    if (!file->emissions.gases)
        return 0;
    const int both = reference && reference->emissions.gases;
    if (make_table(answers, file, weights, both, fault))
        return fault->code;
    const OdpTable *odp = answers->odp;
    double *series = malloc((size_t)file->count * sizeof *series);
    double *work = malloc((size_t)odp->years * sizeof *work);
    if (!series || !work)
        fault_memory(fault, "sums of emissions");
    if (!fault->code && both)
        odp_subtract(&difference, file, reference, &store, fault);
    for (int d = 0; d < 1 + both && !fault->code; d++)
        for (int w = 0; w < WEIGHTS && !fault->code; w++) {
            Ask ask = {.answers = answers,
                       .file = d ? &difference : file,
                       .weights = weights,
                       .weight = w,
                       .gas = -1,
                       .of = d ? "_difference" : "",
                       .series = series,
                       .fault = fault};
            double *rows[ODP_SHARES];
            for (int s = 0; s < ODP_SHARES; s++)
                rows[s] = d ? odp->difference[w][s] : odp->by_year[w][s];
            add_weight(&ask, odp->first_year, odp->years, rows, work);
        }
    if (!fault->code)
        add_masses(answers, file, fault);
    free(difference.emissions.gas);
    free(store);
    free(series);
    free(work);
    return fault->code;
}

void odp_free(OdpTable *odp)
{
    if (!odp)
        return;
    free(odp->store);
    free(odp);
}
