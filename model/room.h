/* room: whether a file may grow, asked before it is written to. */
#ifndef SKYMEND_ROOM_H
#define SKYMEND_ROOM_H

#include <stddef.h>

/* Reserve bytes at the end of an open file and give them back; 0, or an errno value. Growing and shrinking
 * touches nothing that is there. A full disk, a quota or a size limit is thus met while the file is still
 * consistent. */
int room_reserve(int descriptor, size_t bytes);

#endif
