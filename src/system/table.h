/* Engine 1: tables of indices that hold the whole network for evaluation.
 *
 * Tables hold structure alone; every number that changes with the constants or
 * the state is in the evaluator, indexed by step, entry, slot or node, so that an
 * evaluator over several sets of constants at once can use the same tables with
 * wider arrays.
 *
 *   step    one-way reaction or flow, network order
 *   entry   net change of one state by one step, step after step
 *   slot    derivative of one step's rate by one state it depends on, step after step
 *   node    node of the table's own graph: general rate laws, their derivatives,
 *           and whatever is computed from the constants */
#ifndef LIMBECK_SYSTEM_TABLE_H
#define LIMBECK_SYSTEM_TABLE_H

#include "model/network.h"
#include "system/program.h"

/* v = factor * x[a]*x[b]*x[c], where x[n] = 1. */
typedef struct table_rate {
    int step, a, b, c;
} table_rate;

/* slot = multiplier * factor * x[a]*x[b] */
typedef struct table_slope {
    int slot, step, a, b;
    double multiplier;
} table_slope;

/* Everything else among power laws: multiplier * factor * product of links. */
typedef enum table_operation { LINK_PLAIN, LINK_POWER, LINK_SLOPE } table_operation;

typedef struct table_link {
    int state;
    table_operation operation;  /* x, x^order, order x^(order-1) */
    double order;
} table_link;

typedef struct table_chain {
    int target, step;           /* target: step, or slot of a derivative */
    double multiplier;
    size_t first, last;         /* links first..last-1 */
} table_chain;

typedef struct table_chains {
    table_chain *chain;
    size_t count, capacity;
    table_link *link;
    size_t link_count, link_capacity;
} table_chains;

/* The value of a node goes to a step or slot. */
typedef struct table_law {
    int target;
    expression node;
} table_law;

/* Derivative by one constant of a power law's factor or of a whole general law (of: step),
 * or of a coefficient (of: entry). */
typedef struct table_parameter {
    int of, constant;
    expression node;
} table_parameter;

typedef struct table_parameters {
    table_parameter *list;
    size_t count, capacity;
} table_parameters;

/* What a value computed from the constants must be. */
typedef enum table_bound { BOUND_FINITE, BOUND_NOT_NEGATIVE, BOUND_POSITIVE } table_bound;

typedef struct table_check {
    expression node;
    table_bound bound;
} table_check;

typedef struct table {
    int n, steps, nonzeros;

    int *entry_start;           /* [steps+1] */
    int *entry_state;           /* [entries] */
    double *entry_value;        /* [entries] exact coefficients; those with a node are bound later */
    expression *entry_node;     /* [entries] or EXPRESSION_NONE */

    int *slot_start;            /* [steps+1] */
    int *slot_state;            /* [slots] */

    int *row_start;             /* [n+1] dx/dt of a state: sum over its entries, network order */
    int *row_entry, *row_step;  /* [entries] */

    size_t *term_start;         /* [nonzeros+1] sums of the Jacobian's entries, network order */
    int *term_slot, *term_entry; /* [terms] */
    size_t terms;
    int *nonzero_order;         /* [nonzeros] those that are one term alone, then the others */
    int single_terms;           /* how many are one term alone */

    table_rate *rates;   size_t rate_count;
    table_slope *slopes; size_t slope_count;
    table_chains rate_chains, slope_chains;
    table_law *rate_laws;  size_t rate_law_count;
    table_law *slope_laws; size_t slope_law_count;
    table_parameters factors, laws, coefficients; /* of df/dk */

    expression *factor_node;    /* [steps] factor of a power law, else EXPRESSION_NONE */
    bool has_varied_coefficient; /* some entry has a node */
    table_check *checks; size_t check_count, check_capacity; /* of a binding */

    expression_graph graph;
    expression *node_of;        /* [network's nodes] their number in the graph, or EXPRESSION_NONE */
    program constant_program;   /* what is of constants alone, but for the numbers */
    program rate_program, slope_program, law_program, reading_program;
    double *ones;               /* [steps] */
} table;

/* Column starts and rows are the pattern of the Jacobian (network_pattern).
 * On failure *out is NULL. */
lb_status table_new(const lb_network *net, const int *column_start, const int *row, table **out);
void table_free(table *t);

/* Parts of table_new. */
lb_status table_fill_products(table *t, const lb_network *net);
lb_status table_fill_laws(table *t, const lb_network *net);
lb_status table_fill_binding(table *t, const lb_network *net);

#endif
