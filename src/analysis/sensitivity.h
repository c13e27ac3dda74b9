/* Derivatives of a steady state and of its leading eigenvalue by the constants. */
#ifndef LIMBECK_ANALYSIS_SENSITIVITY_H
#define LIMBECK_ANALYSIS_SENSITIVITY_H

#include "limbeck.h"
#include "system/system.h"

/* Fill state->sensitivity [n*m] and state->leading_sensitivity [m], which are allocated
 * here (whoever owns the state frees them, after a failure too), at the constants that the
 * evaluator is bound to; it is bound the same when this returns.  fixed_start [n]: totals are those of this state
 * whatever the constants; NULL: of the initial state.  NAN where there is no derivative.
 * LB_E_NOMEM. */
lb_status sensitivity_find(lb_evaluator *evaluator, lb_steady_state *state, const double *fixed_start, lb_error *err);

#endif
