/* The roots of one set of steady-state equations, as far as a search finds them. */
#ifndef LIMBECK_ANALYSIS_ROOTS_H
#define LIMBECK_ANALYSIS_ROOTS_H

#include "analysis/equations.h"
#include "limbeck.h"

typedef struct roots {
    int count;
    size_t capacity;
    double **u;             /* [count] each [equations count]; owned */
    int continuum;          /* dimension of a continuum that was met; 0: none */
    int continuum_root;     /* its one point among u */
    size_t starts, converged;
    bool interrupted;
} roots;

typedef struct roots_options {
    size_t starts;          /* without a new root that end the search; half as many deflated ones follow */
    bool is_fixed;          /* no more than these, however many roots they find */
    uint64_t seed;
    const double *x0;       /* [n] */
    const double *bound;    /* [n] see starts.h */
    const lb_monitor *monitor;
} roots_options;

/* Deterministic in the seed.  out is filled also when interrupted; clear it in
 * any case. */
lb_status roots_find(equations *eq, const roots_options *options, roots *out, lb_error *err);
void roots_clear(roots *r);

/* Is x [n], which has zeros among the unknowns of eq, the end of a continuum of
 * roots of eq?  Asked of faces within a face that has one.  scale: of the concentrations
 * along it. */
lb_status roots_end_at(equations *eq, const double *x, double scale, bool *is_end, lb_error *err);

#endif
