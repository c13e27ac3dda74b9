/* A system with its constants bound, and the workspace of one thread. */
#ifndef LIMBECK_SYSTEM_EVALUATOR_H
#define LIMBECK_SYSTEM_EVALUATOR_H

#include "system/system.h"
#include "system/table.h"

struct lb_evaluator {
    const lb_system *system;
    const table *table;
    /* bound with the constants */
    double *k;                  /* [m] */
    double *k_spare;            /* [m] */
    double *values;             /* [nodes] those of constants alone; the others are workspace */
    double *spare;              /* [nodes] where a new binding is tried */
    double *factor;             /* [steps] of power laws */
    double *coefficient;        /* [entries] step after step */
    double *row_coefficient;    /* [entries] state after state */
    double *term_coefficient;   /* [terms] of the Jacobian's sums */
    /* workspace */
    double *x;                  /* [n+1] the state and a one */
    double *v;                  /* [steps] */
    double *unit;               /* [steps] power laws with a factor of one */
    double *slot;               /* [slots] */
    double *sparse;             /* [nonzeros] */
};

/* Put the numbers of the graph, which no binding changes, into values [nodes]. */
void evaluator_fill_numbers(const table *t, double *values);

/* LB_OK, or LB_E_ARG that names the first of values [nodes] that is out of bounds. */
lb_status evaluator_check(const lb_network *net, const table *t, const double *values, lb_error *err);

#endif
