/* Eigenvalues in the reaction space, and what the trade calls the point. */
#ifndef LIMBECK_ANALYSIS_STABILITY_H
#define LIMBECK_ANALYSIS_STABILITY_H

#include "limbeck.h"
#include "system/system.h"

/* Fill eigenvalues, modes, real_part_error, stable, kind and
 * routh_hurwitz_agrees of state->x [n] (entries of species set aside may be NAN).
 * Eigenvalues [rank] and modes [rank] are allocated here; whoever owns the state
 * frees them with memory_free, after a failure too.  Cross-check: Routh-Hurwitz
 * up to rank 8.  A real part within its bound of zero is undecided, but a planar
 * pair that is imaginary to rounding with trace zero is a centre of the linear
 * part.  LB_E_NOMEM; LB_E_FINITE and LB_E_NUMERIC when the Jacobian is no good. */
lb_status stability_classify(lb_evaluator *evaluator, lb_steady_state *state, lb_error *err);

#endif
