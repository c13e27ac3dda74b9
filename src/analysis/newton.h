/* Newton's method on the steady-state equations: damped, deflated, and with
 * pseudo-transient continuation behind it. */
#ifndef LIMBECK_ANALYSIS_NEWTON_H
#define LIMBECK_ANALYSIS_NEWTON_H

#include <stdbool.h>

#include "analysis/equations.h"
#include "limbeck.h"

typedef struct newton {
    equations *eq;          /* borrowed */
    bool is_square;         /* no laws, or too many unknowns to solve with all the balances */
    int *row;               /* [count] rows of the square form */
    double *F, *trial_F;    /* [rows] */
    double *A;              /* [rows*count] */
    double *work, *right;   /* [(rows+1)*(count+1)], [rows+1] */
    double *step, *trial;   /* [count] */
    int *pivot;             /* [count] */
} newton;

typedef struct newton_report {
    bool converged;
    int iterations;
    double residual;        /* equations_residual at the end */
    double step;            /* max-norm of the last full Newton step: the error of u, for a regular root */
    int rank;               /* numerical rank of the derivatives at a root */
} newton_report;

lb_status newton_init(newton *w, equations *eq, lb_error *err);
void newton_clear(newton *w);

/* From u [count] to a root, in place.  known: `known_count` roots u that are
 * divided out, so that the iteration is driven away from them. */
lb_status newton_solve(newton *w, double *u, double *const *known, int known_count, newton_report *report,
                       lb_error *err);

/* Implicit Euler steps of growing length (pseudo-transient continuation): goes
 * where the reaction goes, when Newton's method stalls.  False when it failed. */
lb_status newton_relax(newton *w, double *u, bool *is_near, lb_error *err);

/* A unit vector of the null space of the derivatives at a root (the direction of
 * a continuum); rank below count. */
lb_status newton_null_direction(newton *w, const double *u, double *direction, lb_error *err);

#endif
