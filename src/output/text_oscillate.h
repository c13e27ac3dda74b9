/* Verdicts as text, shared by `oscillate` and the page. */
#ifndef LIMBECK_OUTPUT_TEXT_OSCILLATE_H
#define LIMBECK_OUTPUT_TEXT_OSCILLATE_H

#include "base/buffer.h"
#include "limbeck.h"

/* One section: the verdict in one scope with its evidence. */
void oscillate_write_answer(buffer *out, const lb_layout *layout, const lb_system *system,
                            const lb_oscillate_answer *answer);

#endif
