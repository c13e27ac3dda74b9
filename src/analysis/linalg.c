/* Checked dense linear algebra.
 *
 * LU: our own elimination with partial pivoting (eliminate.c) up to OWN_LIMIT
 * rows, where a library call costs more than the work, LAPACK's dgetrf above;
 * both leave the factors in the same place.  Eigenvalues by dgeev, least
 * squares by dgelsy.  LAPACK is known to this file alone, and what is not
 * finite never passes through it in either direction.
 *
 * Source of the methods: G. H. Golub and C. F. Van Loan, Matrix Computations,
 * 4th ed. (2013), sections 3.4, 5.5, 7.5; E. Anderson et al., LAPACK Users'
 * Guide, 3rd ed. (1999).  The count of unstable roots has its own file,
 * routh.c. */
#include "analysis/linalg.h"

#include <lapacke.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/eliminate.h"
#include "base/memory.h"
#include "base/status.h"

enum { OWN_LIMIT = 128 };

/* 0*a is zero for a finite number and NAN for everything else, so the sum
 * tells in one pass without a branch. */
static bool all_finite(size_t count, const double *a)
{
    double sum = 0;
    for (size_t i = 0; i < count; i++)
        sum += 0.0 * a[i];
    return sum == 0;
}

bool linalg_factor(int n, double *A, int *pivot)
{
    if (!all_finite((size_t)n * n, A))
        return false;
    if (n <= OWN_LIMIT)
        return eliminate(n, A, pivot, 1) && all_finite((size_t)n * n, A);
    return LAPACKE_dgetrf_work(LAPACK_COL_MAJOR, n, n, A, n, pivot) == 0 && all_finite((size_t)n * n, A);
}

static void solve_small(int n, const double *LU, const int *pivot, double *b)
{
    for (int k = 0; k < n; k++) {
        double kept = b[pivot[k] - 1];
        b[pivot[k] - 1] = b[k];
        b[k] = kept;
    }
    for (int k = 0; k < n; k++)
        if (b[k] != 0)
            for (int i = k + 1; i < n; i++)
                b[i] -= LU[i + (size_t)k * n] * b[k];
    for (int k = n - 1; k >= 0; k--) {
        b[k] /= LU[k + (size_t)k * n];
        if (b[k] != 0)
            for (int i = 0; i < k; i++)
                b[i] -= LU[i + (size_t)k * n] * b[k];
    }
}

void linalg_solve(int n, const double *LU, const int *pivot, int columns, double *B)
{
    if (n <= OWN_LIMIT) {
        for (int j = 0; j < columns; j++)
            solve_small(n, LU, pivot, B + (size_t)j * n);
        return;
    }
    LAPACKE_dgetrs_work(LAPACK_COL_MAJOR, 'N', n, columns, LU, n, pivot, B, n);
}

double linalg_norm1(int n, const double *A)
{
    double norm = 0;
    for (int j = 0; j < n; j++) {
        double sum = 0;
        for (int i = 0; i < n; i++)
            sum += fabs(A[i + (size_t)j * n]);
        if (!(sum <= norm))     /* also when the sum is not a number */
            norm = sum;
    }
    return norm;
}

double linalg_rcond(int n, const double *LU, const int *pivot, double norm1)
{
    (void)pivot; /* a permutation does not change the condition */
    if (n == 0)
        return 1;
    if (!isfinite(norm1) || norm1 <= 0 || !all_finite((size_t)n * n, LU))
        return 0;
    double rcond = 0;
    double *work = memory_array(4 * (size_t)n, sizeof *work);
    int *iwork = memory_array((size_t)n, sizeof *iwork);
    if (!work || !iwork ||
        LAPACKE_dgecon_work(LAPACK_COL_MAJOR, '1', n, LU, n, norm1, &rcond, work, iwork) != 0 || !isfinite(rcond))
        rcond = 0;
    memory_free(iwork);
    memory_free(work);
    return rcond;
}

/* ---- Eigenvalues ------------------------------------------------------------ */

/* A real eigenvalue, or a pair: what is sorted as one. */
struct block {
    double re, im;              /* im >= 0 */
    int first, width;           /* place in LAPACK's order; 1 or 2 */
};

static int compare_blocks(const void *left, const void *right)
{
    const struct block *a = left, *b = right;
    if (a->re != b->re)
        return a->re > b->re ? -1 : 1;
    if (a->im != b->im)
        return a->im > b->im ? -1 : 1;
    return a->first - b->first;
}

static int make_blocks(int n, const double *re, const double *im, struct block *blocks)
{
    int count = 0;
    for (int i = 0; i < n; i += blocks[count++].width)
        blocks[count] = (struct block){re[i], fabs(im[i]), i, im[i] != 0 && i + 1 < n ? 2 : 1};
    qsort(blocks, (size_t)count, sizeof *blocks, compare_blocks);
    return count;
}

static void store_sorted(int n, const struct block *blocks, int count, lb_complex *values,
                         const double *unsorted, double *vectors)
{
    int place = 0;
    for (int b = 0; b < count; b++) {
        if (vectors)
            memcpy(vectors + (size_t)place * n, unsorted + (size_t)blocks[b].first * n,
                   (size_t)blocks[b].width * n * sizeof *vectors);
        values[place++] = (lb_complex){blocks[b].re, blocks[b].im};
        if (blocks[b].width == 2)
            values[place++] = (lb_complex){blocks[b].re, -blocks[b].im};
    }
}

lb_status linalg_eigenvalues(int n, double *A, lb_complex *values, double *vectors, lb_error *err)
{
    if (n == 0)
        return LB_OK;
    if (!all_finite((size_t)n * n, A))
        return status_raise(err, LB_E_NUMERIC, NULL, "a matrix for eigenvalues has entries that are not finite");
    lb_status status = LB_OK;
    double wanted = 0, *work = NULL;
    double *parts = memory_array(2 * (size_t)n, sizeof *parts), *re = parts, *im = parts ? parts + n : NULL;
    double *unsorted = vectors ? memory_array((size_t)n * n, sizeof *unsorted) : NULL;
    struct block *blocks = memory_array((size_t)n, sizeof *blocks);
    if (!parts || !blocks || (vectors && !unsorted)) {
        status = status_no_memory(err);
        goto done;
    }
    char job = vectors ? 'V' : 'N';
    LAPACKE_dgeev_work(LAPACK_COL_MAJOR, 'N', job, n, A, n, re, im, NULL, 1, unsorted, n, &wanted, -1);
    work = memory_array((size_t)wanted, sizeof *work);
    if (!work) {
        status = status_no_memory(err);
        goto done;
    }
    int info = LAPACKE_dgeev_work(LAPACK_COL_MAJOR, 'N', job, n, A, n, re, im, NULL, 1, unsorted, n, work, (int)wanted);
    if (info != 0 || !all_finite(2 * (size_t)n, parts) || (vectors && !all_finite((size_t)n * n, unsorted))) {
        status = status_raise(err, LB_E_NUMERIC, NULL, "eigenvalues did not converge (dgeev %d)", info);
        goto done;
    }
    store_sorted(n, blocks, make_blocks(n, re, im, blocks), values, unsorted, vectors);
done:
    memory_free(work);
    memory_free(blocks);
    memory_free(unsorted);
    memory_free(parts);
    return status;
}

/* ---- Least squares ------------------------------------------------------------ */

lb_status linalg_least_squares(int rows, int columns, double *A, double *b, double rcond, int *rank, lb_error *err)
{
    *rank = 0;
    int larger = rows > columns ? rows : columns;
    if (rows == 0 || columns == 0) {
        memset(b, 0, (size_t)larger * sizeof *b);
        return LB_OK;
    }
    if (!all_finite((size_t)rows * columns, A) || !all_finite((size_t)rows, b))
        return status_raise(err, LB_E_NUMERIC, NULL, "a least-squares problem has entries that are not finite");
    for (int i = rows; i < larger; i++)
        b[i] = 0;
    lb_status status = LB_OK;
    double wanted = 0, *work = NULL;
    int *order = memory_zeroed((size_t)columns, sizeof *order); /* zero: every column is free to move */
    if (!order)
        return status_no_memory(err);
    LAPACKE_dgelsy_work(LAPACK_COL_MAJOR, rows, columns, 1, A, rows, b, larger, order, rcond, rank, &wanted, -1);
    work = memory_array((size_t)wanted, sizeof *work);
    if (!work) {
        status = status_no_memory(err);
        goto done;
    }
    int info = LAPACKE_dgelsy_work(LAPACK_COL_MAJOR, rows, columns, 1, A, rows, b, larger, order, rcond, rank, work,
                                   (int)wanted);
    if (info != 0 || !all_finite((size_t)columns, b))
        status = status_raise(err, LB_E_NUMERIC, NULL, "a least-squares problem was not solved (dgelsy %d)", info);
done:
    memory_free(work);
    memory_free(order);
    return status;
}
