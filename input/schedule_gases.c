/* schedule_gases: are the gases of a schedule known? Asked before rules and banks are worked out, which a
 * slip in one row would send looking for values in others. Contract in schedule.h. */
#include "schedule.h"

#include <string.h>

#include "table.h"

static int check_file(const char *path, const char *const *known, int count, const char *where, Fault *fault)
{
    Csv csv;
    if (csv_read(&csv, path, fault))
        return fault->code;
    size_t columns = csv.first[1] - csv.first[0], gas = 0;
    while (gas < columns && strcmp(csv.cell[csv.first[0] + gas], "gas") != 0)
        gas++;
    for (size_t row = 1; gas < columns && row < csv.rows && !fault->code; row++) {
        const char *name = csv.cell[csv.first[row] + gas];
        int k = 0;
        while (k < count && strcmp(known[k], name) != 0)
            k++;
        if (k < count || name[0] == '\0' || !strcmp(name, "*")) /* an empty cell has its own word, later */
            continue;
        const char *near = fault_nearest(name, known, (size_t)count);
        fault_at(fault, path, csv.line[row], "gas %.60s is not an active species of %s%s%s%s", name, where,
                 near ? "; did you mean " : "; correct the name or add the species", near ? near : "",
                 near ? "?" : "");
    }
    csv_free(&csv);
    return fault->code;
}

int schedule_check_gases(const char *const *path, int files, const char *const *known, int count,
                         const char *where, Fault *fault)
{
    for (int f = 0; f < files; f++)
        if (check_file(path[f], known, count, where, fault))
            return fault->code;
    return 0;
}
