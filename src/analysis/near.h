/* The steady-state equations around a known state, as functions of the constants: what
 * derivatives by constants and branches of states are made of.
 *
 * Unknowns u [count] as in equations.h: ln x of an unsigned core species that is present,
 * x/unit of a signed one; absent species stay absent.  Rows: one balance per unknown,
 * then the core's laws, their totals those of the initial state at the bound constants.
 * They are consistent at a root, so least squares over all rows solves them. */
#ifndef LIMBECK_ANALYSIS_NEAR_H
#define LIMBECK_ANALYSIS_NEAR_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

typedef struct near {
    lb_evaluator *evaluator;    /* borrowed; bound by near_bind */
    const lb_system *system;
    const double *fixed_start;  /* [n] borrowed: totals are those of this state; NULL: of the initial state */
    int count;                  /* unknowns */
    int *state;                 /* [count] */
    int *unknown;               /* [n] place in state, or -1 */
    bool *is_signed;            /* [count] */
    double *unit;               /* [count] of a signed unknown; 1 for the others */
    int law_count;
    int *law;                   /* [law_count] rows of core_laws with an unknown in them */
    int rows;                   /* count + law_count */
    double *k;                  /* [m] as bound */
    double *start;              /* [n] whose totals hold */
    double *x;                  /* [n] the state in hand */
    double *f, *size;           /* [n] */
    double *jacobian;           /* [nonzeros] */
} near;

/* Around x [n] at the constants that the evaluator is bound to.  LB_E_NOMEM; clear takes
 * what a failure leaves. */
lb_status near_init(near *w, lb_evaluator *evaluator, const double *x, const double *fixed_start, lb_error *err);
void near_clear(near *w);

/* Unknowns u [count] of x [n], which has the same species present; and x from u. */
void near_take(const near *w, const double *x, double *u);
void near_place(near *w, const double *u);      /* sets w->x */

/* Bind w->k with one constant replaced.  LB_E_ARG: it cannot have that value. */
lb_status near_bind(near *w, int constant, double value, lb_error *err);

/* Rows F [rows] at u and, unless NULL, their derivatives A [rows*count], column-major;
 * balances in sums of their terms' magnitudes.  False when something is not finite. */
bool near_rows(near *w, const double *u, double *F, double *A);

#endif
