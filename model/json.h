/* json: the few forms of RFC 8259 that the files of this program need. */
#ifndef SKYMEND_JSON_H
#define SKYMEND_JSON_H

#include <stdio.h>

/* A string, quotes, backslashes and control characters escaped. */
void json_text(FILE *out, const char *text);
/* Nine digits; null for what is not a number. */
void json_number(FILE *out, double value);
/* "key": with a comma before it unless it is the first of its object, on a line of its own. */
void json_key(FILE *out, int depth, int first, const char *key);

#endif
