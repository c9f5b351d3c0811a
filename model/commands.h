/* commands: the verbs of the program. Each gets its own arguments (argv[0] is the verb) and returns the exit
 * code; they alone print. */
#ifndef SKYMEND_COMMANDS_H
#define SKYMEND_COMMANDS_H

#include <signal.h>
#include <stdio.h>

#include "../input/fault.h"
#include "../input/settings.h"
#include "answers.h"
#include "column.h"

int command_project(int argc, char **argv);
int command_settle(int argc, char **argv);
int command_check(int argc, char **argv);
int command_sunlight(int argc, char **argv);
int command_answers(int argc, char **argv);
int command_budget(int argc, char **argv);
int command_potency(int argc, char **argv);
int command_schedule(int argc, char **argv);
int command_apportion(int argc, char **argv);

/* ---- command_ultraviolet.c: the part of sunlight that asks for the ultraviolet at the ground ---- */

typedef struct {
    const char *case_path, *state_path; /* NULL when not given */
    int year, benchmark;                /* of state_path; benchmark 0: none */
    const double *cosine;               /* of one sun; NULL: that of the case's group ultraviolet */
    int spectrum;                       /* 1: by wavelength, 0: the table of quantities */
} UltravioletRequest;
int sunlight_ultraviolet(const UltravioletRequest *request, Fault *fault);

/* ---- shared by the verbs (commands.c) ---- */

/* Folder of the data: SKYMEND_DATA if set, else share/skymend beside the program's folder, else input/data
 * beside it. */
int find_data(char *folder, size_t size, Fault *fault);
/* The case of path (NULL: built-in baseline). */
int load_case(Settings *settings, const char *path, Fault *fault);
/* Print "skymend: text" on standard error and return the fault's code. */
int report_fault(const Fault *fault);
/* Numbers from the command line; a fault names the option. */
int option_number(const char *option, const char *text, double low, double high, double *value, Fault *fault);
int option_whole(const char *option, const char *text, double low, double high, int *value, Fault *fault);
/* A fault for an option the verb does not know or that lacks its value; names lists the verb's options, NULL
 * at the end. */
int option_fault(const char *verb, char *const *argv, int optind_before, int found, const char *const *names,
                 Fault *fault);
/* At most one operand; FAULT_INPUT otherwise. *operand NULL when there is none. */
int one_operand(const char *verb, int argc, char *const *argv, int first, const char **operand, Fault *fault);
/* "skymend VERB ..." as it was given, cut at size: for the history of a file. */
void join_command_line(int argc, char *const *argv, char *text, size_t size);
/* Say on standard error which gases emissions take over from an abundance that goes on. */
void remark_takeovers(const Model *model);
/* From now on an interrupt or a request to end sets what is returned, and a file at its size limit is a write
 * error, not a death. */
volatile sig_atomic_t *catch_stop(void);

typedef struct {
    const char *option, *path; /* path NULL: not asked for */
} Output;
/* To be asked before long work begins: FAULT_INPUT when two outputs have one name, or one exists and is not
 * to be replaced; FAULT_OUTPUT when its folder cannot be written. */
int check_outputs(const Output *output, int count, int overwrite, Fault *fault);
/* FAULT_INPUT when an output is one of the files that are read; inputs may be NULL or not there. */
int check_inputs(const Output *output, int count, const char *const *input, int inputs, Fault *fault);
/* A text file to write; NULL on a fault. It takes its place in close_text, and only when all of it got there:
 * else what was there stays. */
FILE *open_text(const char *path, int overwrite, Fault *fault);
int close_text(FILE *out, const char *path, Fault *fault);

/* ---- answers (command_answers.c) ---- */

/* The numerical errors measured on the baseline, numerical-error.csv of the data; source: [size] what to say
 * of them. */
int answers_baseline_errors(NumericalErrors *errors, char *source, size_t size, Fault *fault);
/* What emissions are weighed by; potentials NULL: Skymend's own for the baseline. Owner: caller,
 * weights_free.
 */
int answers_weights(OdpWeights *weights, const char *potentials, Fault *fault);
/* The answers of the finished file at path, stored in it, and printed when print is set. */
int answers_of_run(const char *path, const NumericalErrors *errors, const char *source,
                   const OdpWeights *weights, int print, Fault *fault);

#endif
