/* Sparse LU by SuiteSparse's KLU: block triangular form, a fill-reducing order
 * (AMD) for each block, left-looking elimination.
 *
 * The order is found once for a pattern.  The first matrix is factored with
 * partial pivoting that prefers the diagonal (threshold 0.01); those that follow
 * take over its pivots, which saves the search, as long as the factors do not
 * grow: where the largest entry of a column of U is more than GROWTH times that of
 * the matrix, pivots are searched again.  Rows are not scaled, since the diagonal
 * preference rests on the columns of a mechanism's Jacobian as they are.
 *
 * KLU takes its memory from the C library, not from base/memory.h.
 *
 * Source: T. A. Davis and E. Palamadai Natarajan, Algorithm 907: KLU, ACM Trans.
 * Math. Softw. 37 (2010) 36. */
#include "analysis/sparse.h"

#include <math.h>
#include <suitesparse/klu.h>

#include "base/memory.h"

#define DIAGONAL_THRESHOLD 0.01
#define GROWTH 1e3

struct sparse_lu {
    int n;
    int *start, *row;           /* borrowed */
    klu_common common;
    klu_symbolic *symbolic;
    klu_numeric *numeric;       /* NULL before the first factorisation */
};

void sparse_free(sparse_lu *lu)
{
    if (!lu)
        return;
    klu_free_numeric(&lu->numeric, &lu->common);
    klu_free_symbolic(&lu->symbolic, &lu->common);
    memory_free(lu);
}

static lb_status outcome(const klu_common *common)
{
    return common->status == KLU_OUT_OF_MEMORY || common->status == KLU_TOO_LARGE ? LB_E_NOMEM : LB_E_NUMERIC;
}

lb_status sparse_new(int n, int *start, int *row, sparse_lu **out)
{
    *out = NULL;
    sparse_lu *lu = memory_zeroed(1, sizeof *lu);
    if (!lu)
        return LB_E_NOMEM;
    *lu = (sparse_lu){.n = n, .start = start, .row = row};
    klu_defaults(&lu->common);
    lu->common.tol = DIAGONAL_THRESHOLD;
    lu->common.scale = 0;
    lu->symbolic = klu_analyze(n, start, row, &lu->common);
    if (!lu->symbolic) {
        lb_status status = outcome(&lu->common);
        sparse_free(lu);
        return status;
    }
    *out = lu;
    return LB_OK;
}

double sparse_work(const sparse_lu *lu)
{
    return lu->symbolic->est_flops;
}

double sparse_entries(const sparse_lu *lu)
{
    return lu->symbolic->lnz + lu->symbolic->unz;
}

/* With the pivots of the factorisation before; false when they do not fit. */
static bool refactor(sparse_lu *lu, double *values)
{
    return lu->numeric && klu_refactor(lu->start, lu->row, values, lu->symbolic, lu->numeric, &lu->common) &&
           lu->common.status == KLU_OK &&
           klu_rgrowth(lu->start, lu->row, values, lu->symbolic, lu->numeric, &lu->common) &&
           lu->common.rgrowth * GROWTH > 1;
}

lb_status sparse_factor(sparse_lu *lu, double *values)
{
    double sum = 0;
    for (int e = 0; e < lu->start[lu->n]; e++)
        sum += 0.0 * values[e];
    if (sum != 0)
        return LB_E_NUMERIC;
    if (refactor(lu, values))
        return LB_OK;
    klu_free_numeric(&lu->numeric, &lu->common);
    lu->numeric = klu_factor(lu->start, lu->row, values, lu->symbolic, &lu->common);
    if (lu->numeric && lu->common.status == KLU_OK)
        return LB_OK;
    lb_status status = outcome(&lu->common);
    klu_free_numeric(&lu->numeric, &lu->common);
    return status;
}

void sparse_solve(const sparse_lu *lu, int columns, double *B)
{
    klu_common common = lu->common;     /* the call writes its status there */
    klu_solve(lu->symbolic, lu->numeric, lu->n, columns, B, &common);
}
