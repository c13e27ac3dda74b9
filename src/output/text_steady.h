/* Steady states as text, shared by `steady` and the page. */
#ifndef LIMBECK_OUTPUT_TEXT_STEADY_H
#define LIMBECK_OUTPUT_TEXT_STEADY_H

#include "base/buffer.h"
#include "limbeck.h"

/* How many, how they were found, and a table of concentrations with a column
 * per state.  is_brief: the first few only, with the slowest relaxation (or the
 * fastest growth) of each below. */
void steady_write(buffer *out, const lb_layout *layout, const lb_system *system, const lb_steady *steady, bool is_brief);

#endif
