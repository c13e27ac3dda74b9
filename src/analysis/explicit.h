/* The method for what is not stiff: Prince and Dormand's pair of orders 8 and 7. */
#ifndef LIMBECK_ANALYSIS_EXPLICIT_H
#define LIMBECK_ANALYSIS_EXPLICIT_H

#include "analysis/stepper.h"

typedef struct explicit_method explicit_method;

#define EXPLICIT_ERROR_ORDER 8      /* the estimated error falls as h^8 */
/* |h lambda| up to which real negative eigenvalues are damped (measured by
 * stepping x' = lambda x; complex ones with negative real part: 5.2 to 5.5). */
#define EXPLICIT_STABILITY 5.17

/* Borrows the evaluator and the columns (NULL: none) for its life. */
lb_status explicit_new(lb_evaluator *evaluator, const stepper_columns *columns, explicit_method **out, lb_error *err);
void explicit_free(explicit_method *method);
stepper_outcome explicit_attempt(explicit_method *method, stepper_attempt *attempt);

/* x alone: x_new [n] a step h from x [n], with f = f(x). */
stepper_outcome explicit_advance(explicit_method *method, double h, const double *x, const double *f, double *x_new);

#endif
