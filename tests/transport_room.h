/* transport_room.h: what the tests of transport/ share. Include after defining a POSIX source where it is
 * wanted. */
#ifndef SKYMEND_TEST_TRANSPORT_ROOM_H
#define SKYMEND_TEST_TRANSPORT_ROOM_H

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "../input/constants.h"
#include "../transport/air.h"
#include "../transport/diffusion.h"
#include "../transport/grid.h"

#define KM 1e5 /* cm */

static inline void check_near(const char *what, double got, double want, double tolerance)
{
    if (!(fabs(got - want) <= tolerance))
        fail_msg("%s: got %.17g, want %.17g within %.3g", what, got, want, tolerance);
}

#endif
