/* A branch of steady states as one constant turns: points by predictor and corrector. */
#ifndef LIMBECK_ANALYSIS_BRANCH_H
#define LIMBECK_ANALYSIS_BRANCH_H

#include <stdbool.h>

#include "analysis/near.h"
#include "limbeck.h"

/* Coordinates z [size]: the unknowns u of near.h, then the constant's own coordinate, its
 * logarithm or, where the range is not logarithmic, its value in tenths of the range. */
typedef struct branch {
    near near;
    int constant;
    bool is_logarithmic;
    double low, high;       /* range of the constant */
    double unit;            /* of the coordinate where it is not logarithmic */
    int size;               /* near.count + 1 */
    double *F, *F_low, *F_high; /* [rows] */
    double *A;              /* [rows*count] */
    double *work;           /* [(rows+1)*size] */
    double *right;          /* [rows+1] */
    double *J, *reduced;    /* [n*n], [rank*rank] */
    lb_complex *values;     /* [rank] eigenvalues of the last branch_unstable */
} branch;

/* Around the state x [n] at the constants that the evaluator is bound to.  The range of the
 * constant must not be empty.  LB_E_NOMEM; clear takes what a failure leaves. */
lb_status branch_init(branch *b, lb_evaluator *evaluator, int constant, const double *x, lb_error *err);
void branch_clear(branch *b);

/* The constant at a coordinate, and back. */
double branch_value(const branch *b, double coordinate);
double branch_coordinate(const branch *b, double value);

/* Newton from `guess` [size] to a point z [size] of the branch on the plane through guess
 * perpendicular to direction [size].  False: it does not converge. */
bool branch_correct(branch *b, const double *guess, const double *direction, double *z);

/* Unit tangent at z, in the sense of `along` [size], which may be the same array. */
bool branch_tangent(branch *b, const double *z, const double *along, double *tangent);

/* How many eigenvalues at z have a positive real part; all are left in b->values.  -1: not
 * to be had. */
int branch_unstable(branch *b, const double *z);

/* The whole state x [n] at z, species set aside included. */
void branch_state(branch *b, const double *z, double *x);

#endif
