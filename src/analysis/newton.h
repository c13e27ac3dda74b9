/* Newton's method on the steady-state equations: damped, deflated, and with
 * pseudo-transient continuation behind it. */
#ifndef LIMBECK_ANALYSIS_NEWTON_H
#define LIMBECK_ANALYSIS_NEWTON_H

#include <stdbool.h>

#include "analysis/equations.h"
#include "limbeck.h"

typedef struct newton {
    equations *eq;          /* borrowed */
    bool is_square;         /* steps use as many rows as unknowns: there are no others, or too many */
    int *relaxed_row;       /* [count] these rows: of all species, or of some and the laws */
    int *row;               /* [count] the same with balances of pools in place of some */
    double *F, *trial_F;    /* [rows] */
    double *A;              /* [rows*count] */
    double *work, *right;   /* [(rows+1)*(count+1)], [rows+1] */
    double *step, *trial;   /* [count] */
    int *pivot;             /* [count] */
    bool is_sparse;         /* square and large: solved by sparse LU, without singular steps */
    int *start, *entry_row; /* [count+1], [entry_capacity] the matrix of a sparse solve in compressed columns */
    double *entry;          /* [entry_capacity] */
    size_t entry_capacity;
} newton;

typedef struct newton_report {
    bool converged;
    int iterations;
    double residual;        /* equations_residual at the end */
    double step;            /* the last full Newton step against u (signed: against 1 + |u|): the error of a regular root */
    int rank;               /* numerical rank of the derivatives at a root */
} newton_report;

lb_status newton_init(newton *w, equations *eq, lb_error *err);
void newton_clear(newton *w);

/* From u [count] to a root, in place.  known: `known_count` roots u that are
 * divided out, so that the iteration is driven away from them. */
lb_status newton_solve(newton *w, double *u, double *const *known, int known_count, newton_report *report,
                       lb_error *err);

/* At most `steps` implicit Euler steps of growing length (pseudo-transient
 * continuation): a part of the way that the reaction goes, which settles what is
 * fast; all of it, to rest, when there are enough.  u is moved in any case. */
lb_status newton_relax(newton *w, double *u, int steps, lb_error *err);

/* A unit vector of the null space of the derivatives at a root (the direction of
 * a continuum); rank below count. */
lb_status newton_null_direction(newton *w, const double *u, double *direction, lb_error *err);

#endif
