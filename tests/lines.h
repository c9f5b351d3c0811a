/* lines: what the tests of apportioning share: a coarse case with INVENTED emissions. */
#ifndef SKYMEND_TEST_LINES_H
#define SKYMEND_TEST_LINES_H

#include "run.h"

/* Five lines from 1990 on, one of which gives nothing off, one label for two gases, one gas in two lines. */
static inline void write_lines(void **state, char *path)
{
    char text[20000] = "# source: INVENTED\nyear,gas,kind,amount,unit,line\n";
    size_t used = strlen(text);
    for (int year = 1990; year <= 2010; year++)
        used += (size_t)snprintf(text + used, sizeof text - used,
                                 "%d,CFC-11,emission,%g,kt,foam\n%d,CFC-11,emission,%g,kt,solvent\n"
                                 "%d,CFC-12,emission,%g,kt,foam\n%d,CCl4,emission,0,kt,idle\n",
                                 year, 200 * exp(-(year - 1990) / 3.0), year, year < 1996 ? 0.0 : 20.0, year,
                                 300 * exp(-(year - 1990) / 3.0), year);
    for (int year = 1992; year <= 2010; year++)
        used += (size_t)snprintf(text + used, sizeof text - used, "%d,CH3Br,emission,%g,kt,fumigation\n",
                                 year, year < 1996 ? 160.0 : 120.0);
    write_file(state, "lines.csv", text, path);
}

static inline Settings coarse(void **state, int first_year, int last_year)
{
    Settings settings;
    char path[300];
    settings_default(&settings, data_dir());
    settings.top_km = 60.0;
    settings.spacing_km = 4.0;
    settings.first_year = first_year;
    settings.last_year = last_year;
    write_lines(state, path);
    settings.schedule_layers = 1;
    snprintf(settings.schedule_layer[0], sizeof settings.schedule_layer[0], "%s", path);
    return settings;
}

static inline void same(const char *what, const double *a, const double *b, size_t count)
{
    for (size_t i = 0; i < count; i++)
        if (memcmp(&a[i], &b[i], sizeof(double)))
            fail_msg("%s: number %zu is %.17g and %.17g", what, i, a[i], b[i]);
}

#endif
