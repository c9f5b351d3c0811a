/* commands: what the verbs share. */
#define _DEFAULT_SOURCE /* readlink, realpath */
#include "commands.h"

#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { PART_PATH = SETTINGS_PATH + 32 };

static int holds_data(const char *folder)
{
    char path[SETTINGS_PATH + 32];
    snprintf(path, sizeof path, "%s/wavelength-bins.csv", folder);
    return access(path, R_OK) == 0;
}

int find_data(char *folder, size_t size, Fault *fault)
{
    const char *named = getenv("SKYMEND_DATA");
    if (named && named[0]) {
        if (strlen(named) >= size)
            return fault_set(fault, FAULT_INPUT,
                             "SKYMEND_DATA is longer than %zu characters; use a shorter path", size - 1);
        snprintf(folder, size, "%s", named);
        if (holds_data(folder))
            return 0;
        return fault_set(fault, FAULT_INPUT,
                         "SKYMEND_DATA names %s, which holds no data tables; set it to the folder with "
                         "wavelength-bins.csv, "
                         "or unset it",
                         folder);
    }
    char program[SETTINGS_PATH];
    ssize_t length = readlink("/proc/self/exe", program, sizeof program - 1);
    if (length > 0) {
        static const char *const beside[] = {"../share/skymend", "../input/data"};
        program[length] = '\0';
        *strrchr(program, '/') = '\0';
        for (size_t i = 0; i < sizeof beside / sizeof beside[0]; i++) {
            if (snprintf(folder, size, "%s/%s", program, beside[i]) >= (int)size)
                continue;
            if (holds_data(folder))
                return 0;
        }
    }
    return fault_set(fault, FAULT_INPUT,
                     "the data tables are not where the program looks for them; set SKYMEND_DATA to the "
                     "folder that holds wavelength-bins.csv");
}

int load_case(Settings *settings, const char *path, Fault *fault)
{
    char folder[SETTINGS_PATH];
    int code = find_data(folder, sizeof folder, fault);
    if (code)
        return code;
    settings_default(settings, folder);
    return path ? settings_read(settings, path, folder, fault) : 0;
}

int report_fault(const Fault *fault)
{
    fprintf(stderr, "skymend: %s\n", fault->text);
    return fault->code;
}

int option_number(const char *option, const char *text, double low, double high, double *value, Fault *fault)
{
    char *end;
    errno = 0;
    *value = strtod(text, &end);
    if (end == text || *end || errno || !isfinite(*value))
        return fault_set(fault, FAULT_INPUT, "%s: \"%s\" is no number; give one from %g to %g", option, text,
                         low, high);
    if (*value < low || *value > high)
        return fault_set(fault, FAULT_INPUT, "%s: %s is outside %g to %g; give a value within", option, text,
                         low, high);
    return 0;
}

int option_fault(const char *verb, char *const *argv, int optind_before, int found, const char *const *names,
                 Fault *fault)
{
    const char *word = argv[optind_before];
    if (found == ':')
        return fault_set(fault, FAULT_INPUT, "%s: option %s needs a value; see skymend %s --help", verb, word,
                         verb);
    size_t count = 0;
    while (names[count])
        count++;
    const char *near = fault_nearest(word, names, count);
    if (near)
        return fault_set(fault, FAULT_INPUT, "%s: unknown option %s; did you mean %s?", verb, word, near);
    return fault_set(fault, FAULT_INPUT, "%s: unknown option %s; see skymend %s --help", verb, word, verb);
}

int one_operand(const char *verb, int argc, char *const *argv, int first, const char **operand, Fault *fault)
{
    *operand = first < argc ? argv[first] : NULL;
    if (first + 1 < argc)
        return fault_set(fault, FAULT_INPUT, "%s: takes one file, but %s and %s are given; name one", verb,
                         argv[first], argv[first + 1]);
    return 0;
}

/* The folder of a file to be made. */
static int check_folder(const char *path, Fault *fault)
{
    char folder[4096];
    const char *slash = strrchr(path, '/');
    size_t length = slash ? (size_t)(slash - path) + 1 : 0;
    if (length >= sizeof folder)
        return fault_set(fault, FAULT_INPUT, "%.60s...: the name is too long; choose a shorter one", path);
    snprintf(folder, sizeof folder, "%.*s", (int)length, path);
    if (access(length ? folder : ".", W_OK | X_OK) == 0)
        return 0;
    return fault_set(fault, FAULT_OUTPUT,
                     "%s: cannot create the file: %s; choose a place that can be written", path,
                     strerror(errno));
}

int check_outputs(const Output *output, int count, int overwrite, Fault *fault)
{
    for (int i = 0; i < count; i++) {
        const char *path = output[i].path;
        if (!path)
            continue;
        for (int j = 0; j < i; j++)
            if (output[j].path && !strcmp(path, output[j].path))
                return fault_set(fault, FAULT_INPUT, "%s and %s both name %s; give each a file of its own",
                                 output[j].option, output[i].option, path);
        int there = access(path, F_OK) == 0;
        if (there && !overwrite)
            return fault_set(fault, FAULT_INPUT, "%s exists already: choose another name, or add --overwrite",
                             path);
        struct stat now; /* what is there is replaced by a file beside it, but a device is written to */
        if ((!there || (!stat(path, &now) && S_ISREG(now.st_mode))) && check_folder(path, fault))
            return fault->code;
    }
    return 0;
}

int check_inputs(const Output *output, int count, const char *const *input, int inputs, Fault *fault)
{
    struct stat out, in;
    for (int i = 0; i < count; i++) {
        if (!output[i].path || stat(output[i].path, &out) || !S_ISREG(out.st_mode))
            continue;
        for (int j = 0; j < inputs; j++)
            if (input[j] && !stat(input[j], &in) && in.st_dev == out.st_dev && in.st_ino == out.st_ino)
                return fault_set(fault, FAULT_INPUT, "%s names %s, which is read: give another name",
                                 output[i].option, output[i].path);
    }
    return 0;
}

/* Where a text file is written before it takes its place: beside the file that is there, a link followed. ""
 * of what is no file (a device, a pipe), which is written to as it is. */
static int find_part(const char *path, char *part, char *place, Fault *fault)
{
    struct stat there;
    int is_there = !stat(path, &there);
    *part = '\0';
    if (is_there && !S_ISREG(there.st_mode))
        return 0;
    char *real = is_there ? realpath(path, NULL) : NULL;
    int fits = snprintf(place, SETTINGS_PATH, "%s", real ? real : path) < SETTINGS_PATH;
    free(real);
    if (!fits)
        return fault_set(fault, FAULT_OUTPUT, "%.60s...: the path is too long; choose a shorter one", path);
    snprintf(part, PART_PATH, "%s.part-%ld", place, (long)getpid());
    return 0;
}

FILE *open_text(const char *path, int overwrite, Fault *fault)
{
    char part[PART_PATH], place[SETTINGS_PATH];
    if (find_part(path, part, place, fault))
        return NULL;
    FILE *out = NULL;
    if (!overwrite && access(path, F_OK) == 0)
        errno = EEXIST;
    else
        out = fopen(*part ? part : path, "w");
    if (!out)
        fault_set(fault, FAULT_OUTPUT, "%s: cannot create the file: %s; choose a place that can be written",
                  path, strerror(errno));
    return out;
}

int close_text(FILE *out, const char *path, Fault *fault)
{
    char part[PART_PATH], place[SETTINGS_PATH];
    int bad = ferror(out);
    if (fclose(out))
        bad = 1;
    if (find_part(path, part, place, fault))
        return fault->code;
    if (*part && (bad || rename(part, place))) {
        bad = 1;
        unlink(part);
    }
    return bad ? fault_set(fault, FAULT_OUTPUT, "%s: could not be written to its end; free some space", path)
               : 0;
}

int option_whole(const char *option, const char *text, double low, double high, int *value, Fault *fault)
{
    double number;
    if (option_number(option, text, low, high, &number, fault))
        return fault->code;
    *value = (int)number;
    if (*value != number)
        return fault_set(fault, FAULT_INPUT, "%s: %s is no whole number", option, text);
    return 0;
}

void join_command_line(int argc, char *const *argv, char *text, size_t size)
{
    size_t used = (size_t)snprintf(text, size, "skymend");
    for (int i = 0; i < argc && used < size; i++)
        used += (size_t)snprintf(text + used, size - used, " %s", argv[i]);
}

void remark_takeovers(const Model *model)
{
    const Schedule *schedule = &model->schedule;
    for (int g = 0; g < schedule->gases; g++)
        if (schedule_supersedes(schedule, g))
            fprintf(stderr,
                    "skymend: remark: from %d on the lines of emission are all of %s that is given off; its "
                    "abundances from "
                    "then on are put aside. If the lines come on top of what is planned, turn those "
                    "abundances into "
                    "emissions first (skymend schedule --as emission)\n",
                    schedule->emission_from[g], schedule->gas[g]);
}

static volatile sig_atomic_t stop_asked;

static void ask_stop(int signal_number)
{
    (void)signal_number;
    stop_asked = 1;
}

volatile sig_atomic_t *catch_stop(void)
{
    struct sigaction action = {.sa_handler = ask_stop};
    sigemptyset(&action.sa_mask);
    sigaction(SIGINT, &action, NULL);
    sigaction(SIGTERM, &action, NULL);
#ifdef SIGXFSZ
    struct sigaction ignore = {.sa_handler = SIG_IGN};
    sigemptyset(&ignore.sa_mask);
    sigaction(SIGXFSZ, &ignore, NULL);
#endif
    return &stop_asked;
}
