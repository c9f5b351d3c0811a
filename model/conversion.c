/* conversion: see conversion.h. */
#include "conversion.h"

#include <math.h>
#include <stdlib.h>

#include "emission.h"

enum { PER_YEAR = 2 }; /* mid-year is then the end of an interval */

void conversion_settings(Settings *settings)
{
    settings->outputs_per_year = PER_YEAR;
    settings->moments = MOMENTS_NONE;
}

typedef struct {
    Conversion *conversion;
    const Model *model;
    const Column *column;
    const Watcher *outer;
    int records;
} Collector;

/* Whether the abundance of s is constant through this half of the year only because there is none beyond. */
static int stands_still(const Model *model, int s, int year, int half, int years)
{
    const Schedule *schedule = &model->schedule;
    int g = model->surface_gas[s];
    if (g < 0 || schedule->years[g] < 2)
        return 0;
    int now = model->settings.first_year + year, last = schedule->first_year[g] + schedule->years[g] - 1;
    int emits = schedule->emission_from[g] > 0;
    return half ? now == last && year == years - 1 && !emits : now == schedule->first_year[g];
}

static int collect(void *context, const Record *record, Fault *fault)
{
    (void)fault;
    Collector *collector = context;
    Conversion *to = collector->conversion;
    const Model *model = collector->model;
    int year = collector->records / PER_YEAR, half = collector->records % PER_YEAR;
    for (int s = 0; s < to->solved; s++) {
        size_t at = (size_t)s * (size_t)to->room + (size_t)year;
        double given = emission_kg_year(model, s, record->emission[s]) / PER_YEAR;
        int idle = stands_still(model, s, year, half, to->room),
            busy = stands_still(model, s, year, !half, to->room);
        to->emission[at] += idle ? 0.0 : busy ? 2.0 * given : given;
        if (!half) /* the state is that of mid-year */
            to->abundance[at] = collector->column->x[FIELD(model->grid.padded, s, 0)];
    }
    collector->records++;
    to->years = collector->records / PER_YEAR;
    return 0;
}

static void pass_progress(void *context, const Progress *progress)
{
    const Watcher *outer = ((Collector *)context)->outer;
    if (outer->progress)
        outer->progress(outer->context, progress);
}

int conversion_run(Conversion **made, const Model *model, Stepper *stepper, Column *column,
                   const Watcher *watcher, Fault *fault)
{
    *made = NULL;
    Conversion *conversion = calloc(1, sizeof *conversion);
    if (!conversion)
        return fault_memory(fault, "conversion of the schedule");
    conversion->first_year = model->settings.first_year;
    conversion->room = model->settings.last_year - model->settings.first_year + 1;
    conversion->solved = model->mechanism->solved;
    size_t size = (size_t)conversion->solved * (size_t)conversion->room;
    conversion->emission = calloc(size, sizeof(double));
    conversion->abundance = calloc(size, sizeof(double));
    Collector collector = {conversion, model, column, watcher, 0};
    Watcher inner = {collect, pass_progress, &collector, watcher->stop};
    int code = conversion->emission && conversion->abundance
                   ? projection_run(model, stepper, column, &inner, fault)
                   : fault_memory(fault, "conversion of the schedule");
    if (code) {
        conversion_free(conversion);
        return code;
    }
    *made = conversion;
    return 0;
}

void conversion_free(Conversion *conversion)
{
    if (!conversion)
        return;
    free(conversion->emission);
    free(conversion->abundance);
    free(conversion);
}

static size_t place(const Conversion *conversion, int s, int year)
{
    return (size_t)s * (size_t)conversion->room + (size_t)(year - conversion->first_year);
}

double conversion_emission(const Conversion *conversion, int s, int year)
{
    return conversion->emission[place(conversion, s, year)];
}

double conversion_abundance(const Conversion *conversion, int s, int year)
{
    return conversion->abundance[place(conversion, s, year)];
}

Uptake conversion_uptake(const Conversion *conversion, int s, int from)
{
    Uptake uptake = {0};
    for (int year = from; year < conversion->first_year + conversion->years; year++) {
        double emission = conversion_emission(conversion, s, year);
        if (emission < 0.0 && !uptake.year)
            uptake.year = year;
        *(emission < 0.0 ? &uptake.below : &uptake.above) += fabs(emission);
    }
    return uptake;
}

void conversion_lift(Conversion *conversion, int s, int from)
{
    for (int year = from; year < conversion->first_year + conversion->years; year++)
        conversion->emission[place(conversion, s, year)] =
            fmax(conversion_emission(conversion, s, year), 0.0);
}
