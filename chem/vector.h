/* vector: which vector instructions the processor has, for loops that are compiled once per set. */
#ifndef SKYMEND_VECTOR_H
#define SKYMEND_VECTOR_H

/* 0: those every processor of the family has; 1: x86-64-v3 (AVX2); 2: x86-64-v4 (AVX-512). */
int vector_set(void);

#endif
