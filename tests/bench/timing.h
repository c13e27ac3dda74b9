/* The clock, the row and the failure that every bench shares. */
#ifndef LIMBECK_TESTS_TIMING_H
#define LIMBECK_TESTS_TIMING_H

#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static inline double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static inline void fail(const char *what)
{
    fprintf(stderr, "bench: %s\n", what);
    exit(1);
}

static inline void *must(void *block)
{
    if (!block)
        fail("no memory");
    return block;
}

static inline void row(const char *what, double ours, double theirs, const char *unit, double target)
{
    printf("%-58s %10.4g %10.4g %-3s ratio %6.2f", what, ours, theirs, unit, ours / theirs);
    if (target > 0)
        printf("   target %.2f %s", target, ours <= target * theirs ? "met" : "MISSED");
    printf("\n");
}

#endif
