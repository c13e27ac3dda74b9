/* Where a search for steady states starts: a log box per species from the
 * mechanism's own scales, and low-discrepancy points in it. */
#ifndef LIMBECK_ANALYSIS_STARTS_H
#define LIMBECK_ANALYSIS_STARTS_H

#include "analysis/equations.h"
#include "limbeck.h"

typedef struct starts {
    const equations *eq;    /* borrowed */
    const double *x0;       /* [n] borrowed */
    uint64_t seed;
    double *low, *high;     /* [count] log10 of the natural range of |x| of each unknown */
    double *bound;          /* [count] log10 of the most that the laws allow; INFINITY: no bound */
    double *point;          /* [2*count+1] coordinates of a sample */
} starts;

/* bound_state [n]: the most that conservation laws of the whole network allow of
 * each state in the class, INFINITY where they allow any. */
lb_status starts_init(starts *s, equations *eq, const double *x0, const double *bound_state, uint64_t seed,
                      lb_error *err);
void starts_clear(starts *s);

/* Start i, u [count]: 0 is x0 itself, with the low end of the range where it has
 * a zero; 1 the middle of the box; then samples that get wider in turn, put into
 * the class where the laws have positive coefficients. */
void starts_point(starts *s, uint64_t i, double *u);

/* Start i from known roots, u [count] each: every unknown from one of them at
 * random, put into the class.  Switches that are independent of each other come
 * in all combinations. */
void starts_combine(starts *s, uint64_t i, double *const *known, int known_count, double *u);

/* The most that the laws of the whole network allow of each state, bound [n]. */
void starts_bounds(const lb_system *system, const double *x0, double *bound);

#endif
