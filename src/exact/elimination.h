/* Sparse elimination over the integers, or modulo a prime: rank, kernel, solved form. */
#ifndef LIMBECK_EXACT_ELIMINATION_H
#define LIMBECK_EXACT_ELIMINATION_H

#include <flint/fmpq.h>
#include <flint/fmpz.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "limbeck.h"

#define ELIMINATION_WORK 100000000  /* entries touched before an elimination gives up: about a second */
#define ELIMINATION_NEVER (-1)      /* preference of a column that may not be a pivot */

/* A sparse vector of integers or, in solved form, of rationals. */
typedef struct elimination_row {
    int pivot;                      /* its column */
    int count;
    int *column;                    /* [count] of the others, ascending in no order */
    fmpz *value;                    /* [count] */
    fmpz_t pivot_value;             /* positive; 1 when modular */
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
    int64_t work_left;
    bool is_modular;
    fmpz_t prime;
} elimination;

/* Modular: all values are residues of ELIMINATION_PRIME, so that nothing grows; what comes
 * out has to be lifted (elimination_lift) and checked by the caller. */
#define ELIMINATION_PRIME 2147483647u
lb_status elimination_init(elimination *e, int width, const int *preference, bool is_modular);
void elimination_clear(elimination *e);

/* Add one equation, columns distinct.  *is_new (may be NULL): it was independent of those
 * before and has a column that may be a pivot.  LB_OK, LB_E_NOMEM, or LB_E_LIMIT when
 * ELIMINATION_WORK is used up, since random sparse systems fill without mercy. */
lb_status elimination_add(elimination *e, const int *column, const fmpz *value, int count, bool *is_new);

/* Express every pivot column by free columns.  LB_E_LIMIT beyond `limit` entries. */
lb_status elimination_solve(elimination *e, size_t limit);

/* Turn the residues of the solved form into the rationals with terms below the square root
 * of half the prime; false when one has none. */
bool elimination_lift(elimination *e);

#endif
