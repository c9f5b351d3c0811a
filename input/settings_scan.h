/* settings_scan: what libconfig would let pass in silence. */
#ifndef SKYMEND_SETTINGS_SCAN_H
#define SKYMEND_SETTINGS_SCAN_H

#include "fault.h"

/* Look through libconfig text, and the files it includes (which libconfig seeks in folder), before it
 * is parsed. Fault when
 *   - an @include leads outside folder, is no readable text file or nests more than 8 deep;
 *   - a whole number does not fit into 32 bits: libconfig 1.5 would cut its upper bits off unsaid.
 * path names the file in messages. */
int settings_scan(const char *text, const char *path, const char *folder, Fault *fault);

#endif
