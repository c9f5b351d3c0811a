/* made_schedule: schedules out of text, for their tests. Include after scratch.h. */
#ifndef SKYMEND_TEST_MADE_SCHEDULE_H
#define SKYMEND_TEST_MADE_SCHEDULE_H

#include "../input/schedule.h"
#include "../input/table.h"

#define COLUMN_LINE "year,gas,kind,amount,unit,line\n"
#define CHANGE_LINE "change,year,gas,kind,amount,unit,line\n"
#define HEIGHT_LINE "year,gas,kind,amount,unit,line,from_km,to_km\n"

/* ---- help ---- */

enum { MOST_FILES = 4 };

/* Write texts (NULL ends them) to 0.csv, 1.csv, ... and read them as layers. */
static inline int read_texts(void **state, const char *const *texts, Schedule *schedule, Fault *fault)
{
    char path[MOST_FILES][300];
    const char *paths[MOST_FILES];
    int files = 0;
    for (; files < MOST_FILES && texts[files]; files++) {
        char name[10];
        snprintf(name, sizeof name, "%d.csv", files);
        write_file(state, name, texts[files], path[files]);
        paths[files] = path[files];
    }
    return schedule_read(schedule, paths, files, fault);
}

static inline Schedule made_of(void **state, const char *base, const char *layer, const char *second)
{
    const char *texts[] = {base, layer, second, NULL};
    Schedule schedule;
    Fault fault = {0};
    if (read_texts(state, texts, &schedule, &fault))
        fail_msg("%s", fault.text);
    return schedule;
}

static inline const ScheduleLine *line_of(const Schedule *schedule, const char *gas, const char *label)
{
    int g = schedule_find(schedule, gas);
    for (int l = 0; l < schedule->lines; l++)
        if (schedule->line[l].gas == g && strcmp(schedule->line[l].label, label) == 0)
            return &schedule->line[l];
    fail_msg("no line %s of %s", label, gas);
    return NULL;
}

#endif
