/* Pieces that several text answers share. */
#ifndef LIMBECK_OUTPUT_DESCRIBE_H
#define LIMBECK_OUTPUT_DESCRIBE_H

#include "base/buffer.h"
#include "limbeck.h"
#include "model/network.h"

/* Units as written in the file; "" after `units none`. */
const char *describe_concentration_unit(const lb_network *net);
const char *describe_time_unit(const lb_network *net);

/* "3 steady states": the count and the noun, with an s where it is not one. */
void describe_count(buffer *out, size_t count, const char *noun);

/* Title (or the file's name), the file, and a paragraph that says what the
 * mechanism is: open or closed and why, how many species and reactions, units. */
void describe_opening(buffer *out, const lb_layout *layout, const lb_network *net);

/* "[E] + 2 [ES]" */
void describe_law(buffer *out, const lb_network *net, const int64_t *law);

/* The section on conserved totals; total [lb_system_laws(system)]. */
void describe_conserved(buffer *out, const lb_layout *layout, const lb_system *system, const double *total);

/* Names in brackets, separated by commas: of the states with flag[state]. */
void describe_states(buffer *out, const lb_network *net, const bool *flag);

/* A note on each second-order constant of k [m] that is above what diffusion
 * allows in water, about 1e10 M^-1 s^-1. */
void describe_fast_constants(buffer *out, const lb_layout *layout, const lb_network *net, const double *k);

#endif
