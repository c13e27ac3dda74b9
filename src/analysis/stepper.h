/* What the two one-step methods share: the attempt at a step, and checked
 * evaluations. */
#ifndef LIMBECK_ANALYSIS_STEPPER_H
#define LIMBECK_ANALYSIS_STEPPER_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

typedef enum stepper_outcome {
    STEPPER_DONE,
    STEPPER_NOT_FINITE,         /* the right-hand side or the Jacobian was not finite on the way */
    STEPPER_SINGULAR,           /* the stiff method's matrix was singular */
    STEPPER_NO_MEMORY           /* for its factors */
} stepper_outcome;

/* What is carried beside the state: columns of P' = J(x) P, the tangents, and behind them
 * columns of S' = J(x) S + df/dk, the sensitivities by constants. */
typedef struct stepper_columns {
    int tangents;               /* n or 0 */
    int constants;              /* how many */
    const int *constant;        /* [constants] which */
} stepper_columns;

/* One step of x' = f(x), and of the columns that are carried.  n states, c columns;
 * every array is the caller's. */
typedef struct stepper_attempt {
    double h;
    const double *x, *f;        /* in  [n] start, and f(x) */
    const double *tangents;     /* in  [n*c] or NULL */
    double *x_new, *error;      /* out [n] result and estimated error */
    double *tangents_new, *tangents_error;  /* out [n*c] or NULL */
    int bad_state;              /* out STEPPER_NOT_FINITE: a species whose rate of change was not finite; -1: none known */
} stepper_attempt;

/* f(x); the first state whose value is not finite, or -1. */
int stepper_rhs(lb_evaluator *evaluator, const double *x, double *f);

/* Sparse Jacobian at x, values [nonzeros]; false when not finite. */
bool stepper_jacobian(lb_evaluator *evaluator, const double *x, double *values);

/* Y += factor J X, column by column; J by its values [nonzeros], X and Y [n*columns]. */
void stepper_multiply_add(const lb_system *system, const double *values, double factor, int columns, const double *X,
                          double *Y);

int stepper_column_count(const stepper_columns *columns);   /* c; 0 for NULL */
/* Y [n*c] += factor df/dk at x, in the columns of constants; room [n*m]. */
void stepper_add_forcing(lb_evaluator *evaluator, const stepper_columns *columns, const double *x, double factor,
                         double *room, double *Y);

#endif
