/* Can all the balances be met with every rate positive? */
#ifndef LIMBECK_ANALYSIS_FLUX_H
#define LIMBECK_ANALYSIS_FLUX_H

#include "analysis/equations.h"

/* *is_possible: the steps of eq have rates v with N v = 0, strictly positive where
 * the sign of a rate is known.  When they have not, there is no root with all
 * unknowns positive, and must_vanish [steps] marks steps whose rates are zero in
 * every steady state of this face and the faces within it.  Stays true where the
 * question is too large or undecided. */
lb_status flux_check(const equations *eq, bool *is_possible, bool *must_vanish, lb_error *err);

#endif
