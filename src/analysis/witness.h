/* The text of a .mech file that runs on a cycle. */
#ifndef LIMBECK_ANALYSIS_WITNESS_H
#define LIMBECK_ANALYSIS_WITNESS_H

#include "limbeck.h"
#include "model/network.h"

/* The network's source text with the constants k [m], initial values on the cycle
 * and a head comment that says what it shows.  A range that does not hold its new
 * value is left out.  *out is NULL with LB_OK when the network has no source text;
 * else the caller frees it with memory_free.  LB_E_NOMEM. */
lb_status witness_write(const lb_network *net, const double *k, const lb_cycle *cycle, bool is_centre,
                        char **out, lb_error *err);

#endif
