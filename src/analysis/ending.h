/* How the exploring of a trajectory may end. */
#ifndef LIMBECK_ANALYSIS_ENDING_H
#define LIMBECK_ANALYSIS_ENDING_H

#include "analysis/explorer.h"

/* End with an outcome; why is static. */
void ending_finish(explorer *e, cycle_outcome outcome, const char *why);

/* Each ends the exploring where its question is answered with yes, and returns LB_OK also
 * where it is not; errors are LB_E_NOMEM and LB_E_NUMERIC. */
lb_status ending_at_start(explorer *e, lb_error *err);      /* is x0 a steady state? */
lb_status ending_by_rest(explorer *e, lb_error *err);       /* does it go to rest? */
void ending_by_runaway(explorer *e);                        /* has it grown beyond measure? */

/* The integration failed with this status: a blow-up in finite time or the end of what
 * can be known.  LB_E_NOMEM and LB_E_STOPPED are handed back. */
lb_status ending_by_failure(explorer *e, lb_status status);

/* The effort is spent. */
lb_status ending_by_effort(explorer *e, lb_error *err);

#endif
