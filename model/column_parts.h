/* column_parts: what the rooms of a model's making share; private to column.c and ground.c. */
#ifndef SKYMEND_COLUMN_PARTS_H
#define SKYMEND_COLUMN_PARTS_H

#include "column.h"

/* Path of a file of the case, as table_locate; found [SETTINGS_PATH]. */
int model_locate(const Settings *settings, const char *what, const char *file, char *found, Fault *fault);
/* Append "what: text" to the list of sources. */
int model_add_source(Model *model, Fault *fault, const char *what, const char *text);

/* ---- ground.c ---- */

/* Read the schedule and its layers. */
int model_read_schedule(Model *model, Fault *fault);
/* What the ground does with each gas, by schedule and case; emissions with it. After everything else of the
 * model that it asks: mechanism, grid, held species. */
int model_set_ground(Model *model, Fault *fault);

#endif
