/* scratch: what the tests of input/ share: a folder of their own, files in it, checks of faults.
 * Include after defining _XOPEN_SOURCE 700 (mkdtemp). */
#ifndef SKYMEND_TEST_SCRATCH_H
#define SKYMEND_TEST_SCRATCH_H

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>

#include "../input/fault.h"

static inline const char *data_dir(void)
{
    const char *given = getenv("SKYMEND_DATA");
    return given ? given : "input/data";
}

static inline int make_folder(void **state)
{
    char *folder = strdup("/tmp/skymend-test-XXXXXX");
    *state = folder;
    return folder && mkdtemp(folder) ? 0 : -1;
}

static inline int remove_folder(void **state)
{
    char command[100];
    snprintf(command, sizeof command, "rm -rf '%s'", (char *)*state);
    int failed = system(command);
    free(*state);
    return failed;
}

/* Write bytes to name in the test's folder; path: [300]. */
static inline void write_bytes(void **state, const char *name, const char *bytes, size_t size, char *path)
{
    snprintf(path, 300, "%s/%s", (char *)*state, name);
    FILE *out = fopen(path, "wb");
    assert_non_null(out);
    assert_int_equal(fwrite(bytes, 1, size, out), size);
    assert_int_equal(fclose(out), 0);
}

static inline void write_file(void **state, const char *name, const char *text, char *path)
{
    write_bytes(state, name, text, strlen(text), path);
}

/* The fault is about the input, is one line, and holds every given piece (a NULL ends them). */
static inline void check_fault(const Fault *fault, ...)
{
    assert_int_equal(fault->code, FAULT_INPUT);
    assert_null(strchr(fault->text, '\n'));
    va_list pieces;
    va_start(pieces, fault);
    for (const char *piece; (piece = va_arg(pieces, const char *));)
        if (!strstr(fault->text, piece))
            fail_msg("no \"%s\" in: %s", piece, fault->text);
    va_end(pieces);
}

static inline void check_near(double got, double want, double relative)
{
    if (!(fabs(got - want) <= relative * fabs(want)))
        fail_msg("got %.17g, want %.17g", got, want);
}

#define WITH_FOLDER(test) cmocka_unit_test_setup_teardown(test, make_folder, remove_folder)

#endif
