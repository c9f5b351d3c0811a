/* answers_emission_against: the emissions of one file less those of another; contract in answers_emission.h.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "answers_emission.h"

int odp_subtract(FileSeries *difference, const FileSeries *file, const FileSeries *reference, double **store,
                 Fault *fault)
{
    const FileEmissions *own = &file->emissions, *other = &reference->emissions;
    double from = fmax(file->start[0], reference->start[0]);
    double to = fmin(file->end[file->count - 1], reference->end[reference->count - 1]);
    int i = 0, j = 0, count = 0, gases = own->gases;
    while (i < file->count && file->middle[i] < from)
        i++;
    while (j < reference->count && reference->middle[j] < from)
        j++;
    while (i + count < file->count && j + count < reference->count && file->middle[i + count] < to)
        count++;
    *difference = (FileSeries){.path = file->path,
                               .count = count,
                               .start = file->start + i,
                               .middle = file->middle + i,
                               .end = file->end + i};
    if (count == 0)
        return fault_set(fault, FAULT_INPUT, "%s and %s have no interval in common; give files that overlap",
                         file->path, reference->path);
    const int most = own->gases + other->gases;
    GasEmission *gas = calloc((size_t)most, sizeof *gas);
    *store = calloc((size_t)most * (size_t)count, sizeof **store);
    difference->emissions.gas = gas;
    if (!gas || !*store)
        return fault_memory(fault, "the difference of emissions");
    for (int g = 0; g < own->gases; g++)
        gas[g] = own->gas[g];
    for (int o = 0; o < other->gases; o++) {
        int g = 0;
        while (g < gases && strcmp(gas[g].gas, other->gas[o].gas))
            g++;
        if (g == gases)
            gas[gases++] = other->gas[o];
    }
    difference->emissions.gases = gases;
    for (int g = 0; g < gases; g++) {
        double *value = *store + (size_t)g * (size_t)count;
        for (int o = 0; o < other->gases; o++)
            for (int k = 0; k < count && !strcmp(gas[g].gas, other->gas[o].gas); k++)
                value[k] -= other->gas[o].all[j + k];
        for (int k = 0; k < count && g < own->gases; k++)
            value[k] += own->gas[g].all[i + k];
        gas[g].all = gas[g].lines = value;
    }
    return 0;
}
