/* What one emitted function computes: sums of items times coefficients.
 *
 *   out[target] = sum over terms of number * coefficient * item
 *
 * An item is a rate of a step, or its derivative by a state or a constant.  The
 * rates themselves are items with one term each.  Terms are in network order
 * (step, item, entry), and stay so within each sum. */
#ifndef LIMBECK_EMIT_SUMS_H
#define LIMBECK_EMIT_SUMS_H

#include <stdbool.h>
#include <stddef.h>

#include "model/network.h"

typedef enum sums_kind { SUMS_RATES, SUMS_RHS, SUMS_JACOBIAN, SUMS_SPARSE, SUMS_DFDK } sums_kind;

typedef struct sums_item {
    expression value;
    int step;
    int by;                  /* state or constant of a derivative; -1: the rate itself */
    bool is_inline;          /* written where it is used, not as a local */
} sums_item;

typedef struct sums_term {
    size_t target;           /* index into the function's output */
    int item;                /* -1: the target is zero */
    double number;
    expression coefficient;  /* EXPRESSION_NONE: 1 */
} sums_term;

typedef struct sums {
    sums_kind kind;
    sums_item *items;  size_t item_count, item_capacity;
    sums_term *terms;  size_t term_count, term_capacity;
} sums;

/* Pattern of the Jacobian (network_pattern), with the column of each entry. */
typedef struct sums_pattern {
    int n, nonzeros;
    int *column_start;       /* [n+1] */
    int *row, *column;       /* [nonzeros] */
} sums_pattern;

lb_status sums_pattern_find(const lb_network *net, sums_pattern *pattern);
void sums_pattern_clear(sums_pattern *pattern);

/* Each fills an empty record; graph is a copy of the network's with the same
 * numbers, and grows by the derivatives.  LB_OK or LB_E_NOMEM; sums_clear after both. */
lb_status sums_of_rates(const lb_network *net, expression_graph *graph, sums *s);
lb_status sums_of_rhs(const lb_network *net, expression_graph *graph, sums *s);
lb_status sums_of_jacobian(const lb_network *net, const sums_pattern *pattern, expression_graph *graph, sums *s);
lb_status sums_of_dfdk(const lb_network *net, expression_graph *graph, sums *s);
void sums_clear(sums *s);

#endif
