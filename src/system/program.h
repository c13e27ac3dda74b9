/* Straight-line programs over the nodes of an expression graph. */
#ifndef LIMBECK_SYSTEM_PROGRAM_H
#define LIMBECK_SYSTEM_PROGRAM_H

#include "model/expression.h"

/* values[out] = operation(values[left], values[right]) */
typedef struct instruction {
    expression_kind kind;
    int out, left, right;
} instruction;

typedef struct program {
    instruction *code;
    size_t count;
} program;

/* The nodes below the roots that contain a state, in order of evaluation; nodes of
 * constants alone are taken as known.  LB_OK or LB_E_NOMEM. */
lb_status program_compile(const expression_graph *g, const expression *roots, size_t count, program *out);
void program_clear(program *p);

/* All nodes of constants alone except the numbers.  LB_OK or LB_E_NOMEM. */
lb_status program_compile_constants(const expression_graph *g, program *out);

/* Run at the state x, or at the constants k for a program of those alone; values [g->count]. */
void program_run(const program *p, const double *leaves, double *values);

#endif
