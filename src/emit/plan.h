/* How the sums of one function are laid out as C: which shared expressions become
 * locals, and how the statements are cut into functions ("blocks") that a
 * compiler gets through in linear time. */
#ifndef LIMBECK_EMIT_PLAN_H
#define LIMBECK_EMIT_PLAN_H

#include "emit/sums.h"

enum {
    PLAN_STATEMENTS = 48,    /* in one block */
    PLAN_POWER_IN_PLACE = 4, /* powers up to this one are written as x*x*x*x */
    PLAN_NOWHERE = -1,       /* home of what is not needed */
    PLAN_SHARED = -2         /* home of what several blocks need: an array computed before them */
};

typedef struct plan {
    const sums *sums;
    size_t nodes;            /* of the graph */
    unsigned char *is_local; /* [nodes] computed once and kept under a name */
    int *home;               /* [nodes] block that needs the node */
    int *number;             /* [nodes] of a local: 1, 2, ... in its block; from 0 when shared */
    int blocks;
    size_t *block_start;     /* [blocks+1] into the terms */
    int *local_start;        /* [blocks+1] into locals */
    int *locals;             /* nodes that are locals, by block, operands before users */
    int *shared;             /* [shared_count] nodes, operands before users */
    int shared_count;
    size_t distinct;         /* targets */
    size_t *target_id;       /* [terms] 0..distinct-1 */
} plan;

/* is_defined [nodes]: the node is a definition of the file, which always has its
 * own name.  is_table: the items of s (without terms) are what tables need, each
 * defined, and every local is shared.  LB_OK or LB_E_NOMEM; plan_clear after both. */
lb_status plan_make(const expression_graph *graph, const sums *s, const unsigned char *is_defined, bool is_table,
                    plan *p);
void plan_clear(plan *p);

#endif
