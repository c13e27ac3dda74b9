/* Is a closed orbit what it seems? */
#ifndef LIMBECK_ANALYSIS_CONFIRM_H
#define LIMBECK_ANALYSIS_CONFIRM_H

#include "analysis/closed.h"

/* Relative difference of the period found on a second path: from a state pushed off
 * the orbit, with the stiff method at another tolerance (which is another method,
 * unless the orbit was closed with the stiff one).  An orbit of a family is not pushed:
 * it would be another one.  NAN when that fails. */
lb_status confirm_period(const closed_orbit *c, bool is_family, const lb_monitor *monitor, double *difference,
                         lb_error *err);

/* Closed orbits on both sides of this one, held at a distance of a tenth of its
 * amplitude (less where that is outside), and no amplitude of the three that drifts:
 * it belongs to a family (a centre). */
lb_status confirm_is_family(const closed_orbit *c, const lb_monitor *monitor, bool *is_family, lb_error *err);

#endif
