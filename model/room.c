/* room: see room.h. */
#define _XOPEN_SOURCE 700
#include "room.h"

#include <errno.h>
#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

int room_reserve(int descriptor, size_t bytes)
{
    struct stat now;
    if (fstat(descriptor, &now))
        return errno;
    int error;
    do
        error = posix_fallocate(descriptor, now.st_size, (off_t)bytes);
    while (error == EINTR); /* Ctrl-C is no lack of room; the run stops at its next step */
    if (ftruncate(descriptor, now.st_size) && !error)
        error = errno;
    return error;
}
