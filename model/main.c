/* main: the command line. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "commands.h"

#ifndef SKYMEND_VERSION
#define SKYMEND_VERSION "unknown"
#endif

static const struct {
    const char *name;
    int (*run)(int argc, char **argv);
    const char *help;
} verbs[] = {
    {"project", command_project, "run a case through its years; write the file, print the answers"},
    {"settle", command_settle, "find the column at rest under one year's surface values; sensitivities"},
    {"check", command_check, "read everything a case names, print the resolved case, run nothing"},
    {"sunlight", command_sunlight, "print photolysis rates by altitude, or the ultraviolet at the ground, as CSV"},
    {"budget", command_budget, "what makes and destroys ozone, by catalytic family; how long gases live"},
    {"potency", command_potency, "ozone depletion potentials and lifetimes of the gases of a case"},
    {"schedule", command_schedule, "turn abundances into emissions, or emissions into abundances"},
    {"apportion", command_apportion, "ozone lost and months of delay by line of the schedule"},
    {"answers", command_answers, "print the table of answers of a finished or interrupted file"},
};
enum { VERBS = sizeof verbs / sizeof verbs[0] };

static void print_help(FILE *out)
{
    fprintf(out,
            "Skymend projects the recovery of the ozone layer from a schedule of ozone-depleting gases.\n\n"
            "usage: skymend VERB [FILE] [options]\n\n");
    for (int v = 0; v < VERBS; v++)
        fprintf(out, "  %-10s %s\n", verbs[v].name, verbs[v].help);
    fprintf(out, "\n  skymend VERB --help   options of a verb\n"
                 "  skymend --version\n\n"
                 "Exit codes: 0 done, 2 the request or an input is wrong, 3 the numerics failed,\n"
                 "4 the output could not be written, 130 interrupted (what is finished is kept).\n\n"
                 "A single near-global column has no polar winter, no ozone hole, no change of circulation,\n"
                 "and no temperature that answers to ozone. For decisions on health or regulation defer to "
                 "the competent authority.\n");
}

static int dispatch(int argc, char **argv)
{
    if (argc < 2) {
        fprintf(stderr, "skymend: no verb given; see skymend --help\n");
        return FAULT_INPUT;
    }
    if (!strcmp(argv[1], "--help") || !strcmp(argv[1], "-h")) {
        print_help(stdout);
        return 0;
    }
    if (!strcmp(argv[1], "--version")) {
        printf("skymend %s\n", SKYMEND_VERSION);
        return 0;
    }
    const char *names[VERBS];
    for (int v = 0; v < VERBS; v++) {
        if (!strcmp(argv[1], verbs[v].name))
            return verbs[v].run(argc - 1, argv + 1);
        names[v] = verbs[v].name;
    }
    const char *near = fault_nearest(argv[1], names, VERBS);
    if (near)
        fprintf(stderr, "skymend: unknown verb %s; did you mean %s?\n", argv[1], near);
    else
        fprintf(stderr, "skymend: unknown verb %s; see skymend --help\n", argv[1]);
    return FAULT_INPUT;
}

/* Threads that wait for work by turning in circles take the processor from those that have some: on a busy
 * machine a run takes several times as long. And the linear algebra library, whose work here is small, would
 * start threads of its own. Both are told by environment variables that the libraries read as they are
 * loaded, so the program starts itself once more where the user has not set them. If that fails, it goes on
 * as it is: only slower. */
static void start_with_quiet_libraries(char **argv)
{
    static const char *const quiet[][2] = {{"GOMP_SPINCOUNT", "20000"}, {"OPENBLAS_NUM_THREADS", "1"}};
    int missing = 0;
    for (size_t i = 0; i < sizeof quiet / sizeof quiet[0]; i++)
        if (!getenv(quiet[i][0]) && !(i == 0 && getenv("OMP_WAIT_POLICY")))
            missing |= !setenv(quiet[i][0], quiet[i][1], 0);
    if (missing)
        execv("/proc/self/exe", argv);
}

int main(int argc, char **argv)
{
    start_with_quiet_libraries(argv);
    int code = dispatch(argc, argv);
    if ((fflush(stdout) || ferror(stdout)) && !code) { /* a table cut short by a full disk is no success */
        fprintf(stderr,
                "skymend: standard output could not be written; free some space or redirect it elsewhere\n");
        code = FAULT_OUTPUT;
    }
    return code;
}
