/* json: strings, numbers, keys. */
#include "json.h"

#include <math.h>

void json_text(FILE *out, const char *text)
{
    fputc('"', out);
    for (; *text; text++) {
        if (*text == '"' || *text == '\\')
            fprintf(out, "\\%c", *text);
        else if ((unsigned char)*text < 0x20)
            fprintf(out, "\\u%04x", (unsigned)*text);
        else
            fputc(*text, out);
    }
    fputc('"', out);
}

void json_number(FILE *out, double value)
{
    if (isfinite(value))
        fprintf(out, "%.9g", value);
    else
        fprintf(out, "null");
}

void json_key(FILE *out, int depth, int first, const char *key)
{
    fprintf(out, "%s\n%*s", first ? "" : ",", 2 * depth, "");
    json_text(out, key);
    fprintf(out, ": ");
}
