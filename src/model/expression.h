/* Rate laws and derived values as one shared graph of expressions.
 *
 * Nodes are numbered and hash-consed: equal expressions have equal numbers, a
 * node's operands have smaller numbers than the node.  Building simplifies:
 * numbers are folded where the result is finite, neutral elements and double
 * signs dropped, signs moved out of products, x^1 and x^0 resolved.  Each of
 * these leaves every finite value bit for bit as it was (0*x, 0/x and x - x are
 * 0 also where x is not finite); sums and products keep the order in which they
 * were written.  No function recurses, so an expression may be 10^6 deep.
 *
 * Meaning of the partial operations, here, in the tables and in emitted C alike
 * (docs/language.md, "Powers and roots"):
 *   POWER      x^n = pow(x, n), but 0 where x < 0 and n is not whole; x^0 = 1, 0^0 = 1
 *   SLOPE      n x^(n-1), the derivative of x^n by x, but 0 where that is infinite
 *              or undefined (x <= 0 and n not whole, or x = 0 and n < 1)
 *   POWER_LOG  x^n ln x, the derivative of x^n by n, but 0 where x <= 0
 * A root is x^0.5: the builder turns SQRT into POWER, so that no node is of that
 * kind.  LN and LOG10 of what is not positive are not finite, and
 * that is found where the value is used. */
#ifndef LIMBECK_MODEL_EXPRESSION_H
#define LIMBECK_MODEL_EXPRESSION_H

#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

typedef int expression;                 /* number of a node; EXPRESSION_NONE: none, or no memory */
#define EXPRESSION_NONE (-1)

/* Leaves first: an operation is what comes after EXPRESSION_STATE. */
typedef enum expression_kind {
    EXPRESSION_NUMBER,      /* value */
    EXPRESSION_CONSTANT,    /* index: constant 0..m-1 */
    EXPRESSION_STATE,       /* index: state 0..n-1 */
    EXPRESSION_ADD, EXPRESSION_SUBTRACT, EXPRESSION_MULTIPLY, EXPRESSION_DIVIDE, /* left, right */
    EXPRESSION_NEGATE,      /* left */
    EXPRESSION_POWER,       /* left ^ right */
    EXPRESSION_SLOPE,       /* right * left^(right-1) */
    EXPRESSION_POWER_LOG,   /* left^right * ln(left) */
    EXPRESSION_EXP, EXPRESSION_LN, EXPRESSION_LOG10, EXPRESSION_SQRT /* left */
} expression_kind;

typedef struct expression_node {
    expression_kind kind;
    int left, right;        /* operands, or left = index of a constant or state; -1: none */
    bool has_state, has_constant; /* itself or below */
    double value;           /* of a NUMBER */
} expression_node;

typedef struct expression_graph {
    expression_node *nodes;
    size_t count, capacity;
    int *table;             /* open-addressing hash table of node numbers, -1 empty */
    size_t table_size;
} expression_graph;

void expression_graph_init(expression_graph *g);
void expression_graph_clear(expression_graph *g);
/* Nothing more is to be added: give up the table (it comes back when something is). */
void expression_graph_seal(expression_graph *g);
/* Copy a node of another graph, whose operands are copied already: map [from->count]
 * gives the numbers in g, and gets the new one.  LB_OK or LB_E_NOMEM. */
lb_status expression_import(expression_graph *g, const expression_graph *from, expression e, int *map);

/* Builders.  An operand EXPRESSION_NONE gives EXPRESSION_NONE, so that a chain
 * is checked once at its end; the only cause is lack of memory. */
expression expression_number(expression_graph *g, double value);
expression expression_constant(expression_graph *g, int index);
expression expression_state(expression_graph *g, int index);
expression expression_binary(expression_graph *g, expression_kind kind, expression left, expression right);
expression expression_unary(expression_graph *g, expression_kind kind, expression operand);

bool expression_is_number(const expression_graph *g, expression e, double *value);
/* Does e contain a state, directly or below? */
bool expression_has_state(const expression_graph *g, expression e);
/* Does it contain this leaf?  True without memory. */
bool expression_depends(const expression_graph *g, expression e, expression_kind leaf, int index);

/* Exact derivative of e by one constant or state (leaf: EXPRESSION_CONSTANT or
 * EXPRESSION_STATE); EXPRESSION_NONE without memory.  Linear in the number of
 * nodes below e: results are shared through the graph. */
expression expression_derivative(expression_graph *g, expression e, expression_kind leaf, int index);

/* The nodes below e, itself included, in ascending order: *list (the caller's, to
 * memory_free), *length.  O(length log length).  LB_OK or LB_E_NOMEM. */
lb_status expression_below(const expression_graph *g, expression e, int **list, size_t *length);
/* Where e, which must be in it, stands in such a list. */
size_t expression_place(const int *list, size_t length, expression e);

/* Marks the nodes that a root needs: `needed` [count] zeroed before the first root. */
void expression_mark(const expression_graph *g, expression root, unsigned char *needed);

/* Value of every node numbered first..last (those with needed[i] when needed is
 * not NULL), operands before users.  `values` [count] holds the results. */
void expression_evaluate(const expression_graph *g, int first, int last, const unsigned char *needed,
                         const double *k, const double *x, double *values);
/* Value of one expression; allocates; NAN without memory. */
double expression_value(const expression_graph *g, expression e, const double *k, const double *x);

/* One operation; b counts for binary ones only. */
double expression_apply(expression_kind kind, double a, double b);

/* The partial operations, shared with the tables. */
double expression_power(double x, double n);
double expression_slope(double x, double n);
double expression_power_log(double x, double n);

/* Shortest text among 15, 16 and 17 digits that reads back as the same number. */
void expression_write_number(double value, buffer *out);

/* Text in the notation of the mechanism language, parentheses only where needed
 * to read it back as the same tree.  The derivatives' own operations are written
 * out.  Beyond EXPRESSION_TEXT_NODES operations, which only repeated use of shared
 * parts can reach, the rest is "...".
 * name(context, leaf kind, index) gives the text of a leaf. */
#define EXPRESSION_TEXT_NODES 100000
typedef const char *expression_namer(const void *context, expression_kind leaf, int index);
void expression_write(const expression_graph *g, expression e, expression_namer *name, const void *context,
                      buffer *out);
/* The same with names for whole subexpressions: alias(context, e) gives the name of a
 * node or NULL; it is asked for the root too unless `expand`. */
typedef const char *expression_aliaser(const void *context, expression e);
void expression_write_aliased(const expression_graph *g, expression e, expression_namer *name,
                              expression_aliaser *alias, bool expand, const void *context, buffer *out);

#endif
