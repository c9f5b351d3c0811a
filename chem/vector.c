/* vector: see vector.h. */
#include "vector.h"

int vector_set(void)
{
    int use = 0;
#ifdef SKYMEND_X86
    if (__builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma") && __builtin_cpu_supports("bmi2"))
        use = 1;
    if (use && __builtin_cpu_supports("avx512f") && __builtin_cpu_supports("avx512dq") &&
        __builtin_cpu_supports("avx512vl") && __builtin_cpu_supports("avx512bw") &&
        __builtin_cpu_supports("avx512cd"))
        use = 2;
#endif
    return use;
}
