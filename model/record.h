/* record: mole fractions and temperature out of a file that skymend project wrote. */
#ifndef SKYMEND_RECORD_H
#define SKYMEND_RECORD_H

#include "column.h"

/* The means over calendar year `year` of the named gases, into their rows of x [solved][padded] (padding
 * repeats the top layer); a name that the mechanism has not is passed over. FAULT_INPUT when the file is
 * none, has other layers than the model, or no record in that year. */
int record_read(const Model *model, const char *path, int year, const char *const *names, int count,
                double *x, Fault *fault);
/* The mean over the year of the temperature less that of the base atmosphere, K, into change [layers]; 0 when
 * the file is of a run whose temperature does not vary. Faults as above. */
int record_read_change(const Model *model, const char *path, int year, double *change, Fault *fault);

#endif
