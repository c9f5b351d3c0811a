/* answers_store: the answers as variables of the NetCDF file they come from. */
#define _XOPEN_SOURCE 700
#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <string.h>
#include <unistd.h>

#include <netcdf.h>

#include "answers.h"
#include "room.h"

enum { ANSWER_BYTES = 6144, /* what one takes, texts included, with room to spare */ CLOSING_BYTES = 65536 };

static int put_text(int file, int variable, const char *name, const char *text)
{
    return text[0] ? nc_put_att_text(file, variable, name, strlen(text), text) : NC_NOERR;
}

static int define(int file, const Answers *answers, int i, int *variable)
{
    static const double none = NC_FILL_DOUBLE;
    const FileAnswer *answer = &answers->item[i];
    char name[sizeof answer->id + 8];
    snprintf(name, sizeof name, "answer_%s", answer->id);
    int status = nc_def_var(file, name, NC_DOUBLE, 0, NULL, variable);
    if (status == NC_NOERR)
        status = nc_put_att_double(file, *variable, "_FillValue", NC_DOUBLE, 1, &none);
    if (status == NC_NOERR)
        status = put_text(file, *variable, "long_name", answer->label);
    if (status == NC_NOERR)
        status = put_text(file, *variable, "units", answer->unit);
    if (status == NC_NOERR)
        status = put_text(file, *variable, "method", answer->method);
    if (status == NC_NOERR)
        status = put_text(file, *variable, "note", answer->note);
    if (status == NC_NOERR && isfinite(answer->error))
        status = nc_put_att_double(file, *variable, "numerical_error", NC_DOUBLE, 1, &answer->error);
    return status;
}

static int put_all(int file, const Answers *answers)
{
    int variable = 0, status = nc_redef(file);
    if (status == NC_EINDEFINE)
        status = NC_NOERR;
    if (status == NC_NOERR)
        status = put_text(file, NC_GLOBAL, "answers_numerical_error", answers->error_source);
    for (int i = 0; i < answers->count && status == NC_NOERR; i++)
        if (!answers->item[i].detail)
            status = define(file, answers, i, &variable);
    if (status == NC_NOERR)
        status = nc_enddef(file);
    for (int i = 0; i < answers->count && status == NC_NOERR; i++) {
        char name[sizeof answers->item->id + 8];
        const double *value = &answers->item[i].value;
        if (answers->item[i].detail)
            continue;
        snprintf(name, sizeof name, "answer_%s", answers->item[i].id);
        status = nc_inq_varid(file, name, &variable);
        if (status == NC_NOERR && isfinite(*value)) /* what is none keeps the fill value */
            status = nc_put_var_double(file, variable, value);
    }
    return status;
}

int answers_store(const Answers *answers, const char *path, Fault *fault)
{
    int descriptor = open(path, O_RDWR | O_CLOEXEC), file;
    int error = descriptor < 0
                    ? errno
                    : room_reserve(descriptor, (size_t)answers->count * ANSWER_BYTES + CLOSING_BYTES);
    if (descriptor >= 0)
        close(descriptor);
    if (error)
        return fault_set(
            fault, FAULT_OUTPUT,
            "%s: the run is complete, but there is no room for its answers: %s; free some space, and "
            "get them with skymend answers",
            path, strerror(error));
    int status = nc_open(path, NC_WRITE, &file);
    if (status == NC_NOERR) {
        status = put_all(file, answers);
        int closed = nc_close(file);
        status = status == NC_NOERR ? closed : status;
    }
    if (status != NC_NOERR)
        return fault_set(fault, FAULT_OUTPUT,
                         "%s: cannot write the answers: %s; get them with skymend answers", path,
                         nc_strerror(status));
    return 0;
}
