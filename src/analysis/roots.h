/* The roots of one set of steady-state equations, as far as a search finds them. */
#ifndef LIMBECK_ANALYSIS_ROOTS_H
#define LIMBECK_ANALYSIS_ROOTS_H

#include "analysis/equations.h"
#include "limbeck.h"

typedef struct roots {
    int count;
    size_t capacity;
    double **u;             /* [count] each [equations count]; owned */
    int continuum;          /* dimension of a continuum that was met, with one of its points among u; 0: none */
    size_t starts, converged;
    bool interrupted;
} roots;

typedef struct roots_options {
    size_t starts;          /* plain ones; half as many deflated ones follow */
    uint64_t seed;
    const double *x0;       /* [n] */
    const double *bound;    /* [n] see starts.h */
    const lb_monitor *monitor;
} roots_options;

/* Deterministic in the seed.  out is filled also when interrupted; clear it in
 * any case. */
lb_status roots_find(equations *eq, const roots_options *options, roots *out, lb_error *err);
void roots_clear(roots *r);

#endif
