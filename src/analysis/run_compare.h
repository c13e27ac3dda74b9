/* Do two runs of one mechanism tell the same? */
#ifndef LIMBECK_ANALYSIS_RUN_COMPARE_H
#define LIMBECK_ANALYSIS_RUN_COMPARE_H

#include <stdbool.h>

#include "limbeck.h"

/* Rows at the same times; `loose` has the looser tolerance r.  True when every value of a
 * species is within 100 r, at most 5 %, of that species' largest value in the tight run. */
bool run_agree(const lb_run *loose, const lb_run *tight);

/* Why a run is tighter than it was asked to be. */
extern const char *const run_failed_text, *const run_differed_text;

#endif
