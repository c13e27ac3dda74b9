/* Starts of a search for cycles: pushed off a steady state, or spread around it. */
#ifndef LIMBECK_ANALYSIS_NEARBY_H
#define LIMBECK_ANALYSIS_NEARBY_H

#include "limbeck.h"
#include "system/system.h"

/* Most starts that one steady state gives. */
#define NEARBY_LIMIT 6

/* States [count*n] just off the steady state x [n] along the directions in which it
 * is unstable: both ways along a real one, one way for a complex pair, and none
 * that leaves the orthant.  Where no direction grows but one pair turns (a centre
 * of the linear part), one start a tenth off along it.  x0 [n]: the state that
 * gives the species set aside their values and all their size where x is zero.
 * starts has room for NEARBY_LIMIT*n. */
lb_status nearby_unstable(lb_evaluator *evaluator, const double *x, const double *x0,
                          double *starts, int *count, lb_error *err);

/* Starts that nearby_spread gives before it repeats its scales: NEARBY_SPREAD, and more where
 * a variable is signed. */
#define NEARBY_SPREAD 9
uint64_t nearby_starts(const lb_system *system);

/* A state within one, two or three decades of x [n], in turn (for signed variables ten,
 * hundred or thousand times its size; from point NEARBY_SPREAD on 1e4 to 1e6 times and
 * 1e-1 to 1e-3 times), in its compatibility class: point i of a low-discrepancy sequence, drawn towards x
 * until it is inside the orthant. */
lb_status nearby_spread(lb_evaluator *evaluator, const double *x, const double *x0, uint64_t seed, uint64_t i,
                        double *start, lb_error *err);

#endif
