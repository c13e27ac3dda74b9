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

#endif
