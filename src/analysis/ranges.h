/* The search for a cycle within the ranges of the file. */
#ifndef LIMBECK_ANALYSIS_RANGES_H
#define LIMBECK_ANALYSIS_RANGES_H

#include "analysis/hunt.h"
#include "limbeck.h"

/* True when some constant or initial concentration has a range. */
bool ranges_exist(const lb_network *net);

/* Fill the answer of the scope: samples of the box in a fixed order, the first that
 * has an attracting cycle wins.  Sample 0 is the file's own constants.  No new sample
 * is begun once ranges_clock has passed the deadline (0: none). */
lb_status ranges_search(hunt *h, const lb_oscillate_options *options, double deadline, lb_error *err);

/* Monotonic seconds. */
double ranges_clock(void);

#endif
