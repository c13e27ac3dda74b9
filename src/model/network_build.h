/* What the files that build a network share among themselves. */
#ifndef LIMBECK_MODEL_NETWORK_BUILD_H
#define LIMBECK_MODEL_NETWORK_BUILD_H

#include "model/network.h"

/* Room for one more element after `count`: the array, moved perhaps, or NULL without
 * memory (the old one then stays valid). */
void *network_grow(void *array, int count, size_t size);

/* The fraction with terms below 10^9 and 10^6 that is this very double, if there is one. */
bool fraction_of_double(double value, int64_t *num, int64_t *den);

/* A coefficient is num/den when e is EXPRESSION_NONE, else e. */
expression coefficient_expression(expression_graph *g, int64_t num, int64_t den, expression e);
/* Turns a NUMBER into num/den where that is exact; true when the coefficient is a fraction now. */
bool coefficient_settle(expression_graph *g, int64_t *num, int64_t *den, expression *e);
/* Adds a second one; false without memory. */
bool coefficient_add(expression_graph *g, int64_t *num, int64_t *den, expression *e,
                     int64_t num2, int64_t den2, expression e2);

#endif
