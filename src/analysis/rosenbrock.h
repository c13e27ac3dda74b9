/* The stiff method: Rodas5P with the exact Jacobian. */
#ifndef LIMBECK_ANALYSIS_ROSENBROCK_H
#define LIMBECK_ANALYSIS_ROSENBROCK_H

#include "analysis/stepper.h"

#define ROSENBROCK_STAGES 8
#define ROSENBROCK_ERROR_ORDER 5    /* the estimated error falls as h^5 */

typedef struct rosenbrock_table {
    double gamma;
    double a[6][5];                 /* a[i][j], j < i; rows 6 and 7 are row 5 plus ones (see rosenbrock.c) */
    double c[ROSENBROCK_STAGES][ROSENBROCK_STAGES - 1];
    double dense[3][ROSENBROCK_STAGES];
} rosenbrock_table;
extern const rosenbrock_table rosenbrock_rodas5p;

typedef struct rosenbrock rosenbrock;

/* Borrows the evaluator and the columns (NULL: none) for its life.  LB_E_NOMEM. */
lb_status rosenbrock_new(lb_evaluator *evaluator, const stepper_columns *columns, rosenbrock **out, lb_error *err);
void rosenbrock_free(rosenbrock *method);

/* What follows depends on no earlier step. */
void rosenbrock_forget(rosenbrock *method);

/* Evaluate the Jacobian at the start x [n] of the steps that follow; size [n] > 0:
 * magnitudes of the states, for the linear algebra.  LB_OK; LB_E_FINITE when it is not
 * finite, LB_E_NOMEM, LB_E_LIMIT when its factors are too large (without a message). */
lb_status rosenbrock_prepare(rosenbrock *method, const double *x, const double *size);
/* After a prepare: floating-point operations of the factorisation in a step; and
 * whether it is a sparse one. */
double rosenbrock_work(const rosenbrock *method);
bool rosenbrock_is_sparse(const rosenbrock *method);
const double *rosenbrock_jacobian(const rosenbrock *method);   /* [nonzeros] of the last prepare */

/* A step from the x that was prepared. */
stepper_outcome rosenbrock_attempt(rosenbrock *method, stepper_attempt *attempt);

/* State at the fraction theta of the last attempt, from x [n] to x_new [n]. */
void rosenbrock_dense(const rosenbrock *method, double theta, const double *x, const double *x_new, double *out);

#endif
