/* The sums of one function as tables: every item a product of constants, states and
 * shared expressions, in batches whose products fit into a small array. */
#ifndef LIMBECK_EMIT_PRODUCTS_H
#define LIMBECK_EMIT_PRODUCTS_H

#include "emit/sums.h"

enum { PRODUCTS_BATCH = 64, PRODUCTS_ROUNDS = 3 };

/* What a factor is taken from: k[], x[], or c[], the shared expressions. */
typedef enum products_kind { PRODUCTS_K, PRODUCTS_X, PRODUCTS_C, PRODUCTS_KINDS } products_kind;

/* Factors of one kind.  As long as every product has another one, these stand apart, in rounds. */
typedef struct products_factors {
    int *round[PRODUCTS_ROUNDS]; /* [items] one factor of each product */
    int rounds;
    int *index;              /* [count] the other factors, by batch: a constant, a state, a node of the graph */
    unsigned char *slot;     /* [count] product within its batch */
    size_t count, capacity, slot_capacity;
    size_t *end;             /* [batches] */
} products_factors;

/* A term adds the value in a slot.  A batch has its products in slots 0..63, their negatives in
 * 64..127, and from 128 on multiples of them. */
typedef struct products_term {
    size_t target;
    unsigned slot;
} products_term;

typedef struct products_multiple {
    unsigned char slot;
    double weight;
} products_multiple;

typedef struct products {
    size_t items, batches;
    products_factors factors[PRODUCTS_KINDS];
    bool is_direct;          /* product number i is output number i, and there are no other terms */
    products_term *terms;    /* zeros left out, in network order */
    size_t term_count, term_capacity;
    size_t *term_end;        /* [batches] */
    bool has_negatives;
    products_multiple *multiples;
    size_t multiple_count, multiple_capacity;
    size_t *multiple_end;    /* [batches] */
    size_t slots;            /* of any batch */
    sums shared;             /* one item for each use of a shared expression: what plan_make needs */
} products;

/* is_defined(context, e): is this node a definition of the file, computed once and not taken
 * apart?  graph grows by the products of coefficients and rates.  LB_OK, LB_E_NOMEM, or
 * LB_E_LIMIT (a table of more than INT_MAX entries); products_clear after all. */
lb_status products_make(const sums *s, expression_graph *graph,
                        bool (*is_defined)(const void *context, expression e), const void *context, products *p);
void products_clear(products *p);

#endif
