/* Sparse elimination over the integers: rank, kernel, solved form. */
#ifndef LIMBECK_EXACT_ELIMINATION_H
#define LIMBECK_EXACT_ELIMINATION_H

#include <flint/fmpq.h>
#include <flint/fmpz.h>
#include <stdbool.h>
#include <stddef.h>

#include "limbeck.h"

#define ELIMINATION_NEVER (-1)      /* preference of a column that may not be a pivot */

/* A sparse vector of integers or, in solved form, of rationals. */
typedef struct elimination_row {
    int pivot;                      /* its column */
    int count;
    int *column;                    /* [count] of the others, ascending in no order */
    fmpz *value;                    /* [count] */
    fmpz_t pivot_value;
    int solved_count;
    int *solved_column;             /* free columns */
    fmpq *solved_value;             /* x_pivot = sum of solved_value * x_column */
} elimination_row;

/* Equations sum_j a_j x_j = 0, each reduced by those before it. */
typedef struct elimination {
    int width;
    const int *preference;          /* [width] borrowed: a column with a low one is a pivot sooner */
    elimination_row *row;           /* [rank] in order of entry */
    size_t rank, capacity;
    int *row_of;                    /* [width] row whose pivot the column is, or -1: free */
    fmpz *work;                     /* [width] the equation being reduced */
    bool *is_listed;                /* [width] */
    int *list;                      /* [width] columns in use */
    int *heap;                      /* [width] rows still to reduce by, smallest first */
} elimination;

lb_status elimination_init(elimination *e, int width, const int *preference);
void elimination_clear(elimination *e);

/* Add one equation, columns distinct.  *is_new (may be NULL): it was independent of those
 * before and has a column that may be a pivot.  LB_OK or LB_E_NOMEM. */
lb_status elimination_add(elimination *e, const int *column, const fmpz *value, int count, bool *is_new);

/* Express every pivot column by free columns.  LB_E_LIMIT beyond `limit` entries. */
lb_status elimination_solve(elimination *e, size_t limit);

#endif
