/* Does the amplitude of an orbit hold from turn to turn? */
#ifndef LIMBECK_ANALYSIS_DRIFT_H
#define LIMBECK_ANALYSIS_DRIFT_H

#include "analysis/closed.h"

/* Follow the flow from x [n], a point of an orbit with that period beside c (or of c
 * itself), which lends scale and method.  *holds: LB_YES, it stays where it is within the
 * error of the integration; LB_NO, it moves by more than that; LB_UNDECIDED, the error is
 * too large to say, or it does not return.
 * Returns LB_OK, LB_E_NOMEM, LB_E_STOPPED. */
lb_status drift_judge(const closed_orbit *c, const double *x, double period, const lb_monitor *monitor,
                      lb_answer *holds, lb_error *err);

#endif
