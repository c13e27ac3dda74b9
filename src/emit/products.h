/* The sums of one function as tables: every item a product of constants, states and
 * shared expressions, in batches whose products fit into a small array. */
#ifndef LIMBECK_EMIT_PRODUCTS_H
#define LIMBECK_EMIT_PRODUCTS_H

#include "emit/sums.h"

enum { PRODUCTS_BATCH = 64 };

/* What a factor is taken from: k[], x[], or c[], the shared expressions. */
typedef enum products_kind { PRODUCTS_K, PRODUCTS_X, PRODUCTS_C, PRODUCTS_KINDS } products_kind;

/* Factors of one kind, by batch; of a kind that every product has, the first ones stand apart. */
typedef struct products_factors {
    int *first;              /* [items] first factor of each product; used when is_dense */
    bool is_dense;           /* every product has one */
    int *index;              /* [count] the other factors: a constant, a state, a node of the graph */
    unsigned char *slot;     /* [count] product within its batch */
    size_t count, capacity, slot_capacity;
    size_t *end;             /* [batches] */
} products_factors;

typedef struct products_term {
    size_t target;
    double weight;
    unsigned char slot;
} products_term;

typedef struct products {
    size_t items, batches;
    products_factors factors[PRODUCTS_KINDS];
    products_term *terms;    /* zeros left out, in network order */
    size_t term_count, term_capacity;
    size_t *term_end;        /* [batches] */
    sums shared;             /* one item for each use of a shared expression: what plan_make needs */
} products;

/* is_defined(context, e): is this node a definition of the file, computed once and not taken
 * apart?  graph grows by the products of coefficients and rates.  LB_OK, LB_E_NOMEM, or
 * LB_E_LIMIT (a table of more than INT_MAX entries); products_clear after all. */
lb_status products_make(const sums *s, expression_graph *graph,
                        bool (*is_defined)(const void *context, expression e), const void *context, products *p);
void products_clear(products *p);

#endif
