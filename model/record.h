/* record: mole fractions out of a file that skymend project wrote. */
#ifndef SKYMEND_RECORD_H
#define SKYMEND_RECORD_H

#include "column.h"

/* The means over calendar year `year` of the named gases, into their rows of x [solved][padded] (padding
 * repeats the top layer); a name that the mechanism has not is passed over. FAULT_INPUT when the file is
 * none, has other layers than the model, or no record in that year. */
int record_read(const Model *model, const char *path, int year, const char *const *names, int count,
                double *x, Fault *fault);

#endif
