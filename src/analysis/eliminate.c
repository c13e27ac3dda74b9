/* Gaussian elimination with a pivot that may prefer the diagonal.
 *
 * Right-looking, in panels of PANEL columns: a panel is eliminated column by column,
 * its row exchanges are applied to the rest, and the rest is updated by the
 * product of the panel below the diagonal and the rows to its right.  That product
 * is nearly all the work of a large matrix; it is taken in tiles of four by four
 * that stay in registers; BLOCK rows of the panel at a time are copied, so that a
 * tile reads them in order.
 * Small matrices are one panel.
 *
 * Source: G. H. Golub and C. F. Van Loan, Matrix Computations, 4th ed. (2013),
 * sections 1.5 and 3.2 (block elimination), 3.4 (pivoting). */
#include "analysis/eliminate.h"

#include <math.h>
#include <stddef.h>
#include <string.h>

enum {
    PANEL = 32,
    SINGLE_PANEL = 48,          /* up to so many rows in one go */
    TILE = 4,
    BLOCK = 64                  /* rows, a multiple of TILE */
};

/* Four numbers side by side, as the compiler's vectors have them. */
typedef double quad __attribute__((vector_size(TILE * sizeof(double))));

static void swap_rows(int n, int first, int last, double *A, int a, int b)
{
    for (int j = first; j < last; j++) {
        double kept = A[a + (size_t)j * n];
        A[a + (size_t)j * n] = A[b + (size_t)j * n];
        A[b + (size_t)j * n] = kept;
    }
}

/* Columns first..last-1 of A, rows from first down, as a matrix of their own;
 * rows are exchanged in these columns alone. */
static bool eliminate_panel(int n, double *A, int first, int last, int *pivot, double threshold)
{
    for (int k = first; k < last; k++) {
        double *column = A + (size_t)k * n;
        int best = k;
        for (int i = k + 1; i < n; i++)
            if (fabs(column[i]) > fabs(column[best]))
                best = i;
        if (fabs(column[k]) >= threshold * fabs(column[best]))
            best = k;
        pivot[k] = best + 1;
        if (column[best] == 0 || !isfinite(column[best]))
            return false;
        if (best != k)
            swap_rows(n, first, last, A, k, best);
        for (int i = k + 1; i < n; i++)
            column[i] /= column[k];
        for (int j = k + 1; j < last; j++) {
            double *right = A + (size_t)j * n, factor = right[k];
            if (factor != 0)
                for (int i = k + 1; i < n; i++)
                    right[i] -= column[i] * factor;
        }
    }
    return true;
}

/* Rows first..last-1 of the columns from last on: solve with the panel's unit
 * lower triangle. */
static void solve_rows(int n, double *A, int first, int last)
{
    for (int j = last; j < n; j++) {
        double *right = A + (size_t)j * n;
        for (int k = first; k < last; k++)
            for (int i = k + 1; i < last; i++)
                right[i] -= A[i + (size_t)k * n] * right[k];
    }
}

/* The panel's rows from..to-1 in strips of TILE rows, each column by column; the last
 * strip is filled up with zeros. */
static void pack_strips(int n, const double *A, int first, int last, int from, int to, double *packed)
{
    for (int i = from; i < to; i += TILE)
        for (int k = first; k < last; k++)
            for (int t = 0; t < TILE; t++)
                *packed++ = i + t < to ? A[i + t + (size_t)k * n] : 0;
}

/* sum[c] = strip (depth columns of TILE rows) times column c of B, four columns of n. */
static void multiply_tile(int depth, const double *strip, const double *B, int n, quad sum[TILE])
{
    const double *b0 = B, *b1 = B + n, *b2 = B + 2 * (size_t)n, *b3 = B + 3 * (size_t)n;
    quad s0 = {0}, s1 = {0}, s2 = {0}, s3 = {0};
    for (int k = 0; k < depth; k++) {
        quad a;
        memcpy(&a, strip + (size_t)k * TILE, sizeof a);
        s0 += a * b0[k];
        s1 += a * b1[k];
        s2 += a * b2[k];
        s3 += a * b3[k];
    }
    sum[0] = s0, sum[1] = s1, sum[2] = s2, sum[3] = s3;
}

static void subtract_tile(const quad sum[TILE], int rows, double *C, int n)
{
    for (int c = 0; c < TILE; c++)
        for (int t = 0; t < rows; t++)
            C[t + (size_t)c * n] -= sum[c][t];
}

/* One column, where fewer than four are left. */
static void update_column(int n, double *A, int first, int last, int j)
{
    double *right = A + (size_t)j * n;
    for (int k = first; k < last; k++)
        for (int i = last; i < n; i++)
            right[i] -= A[i + (size_t)k * n] * right[k];
}

/* Rows and columns from `last` on -= panel * (rows of the panel). */
static void update_rest(int n, double *A, int first, int last)
{
    double packed[BLOCK * PANEL];
    int depth = last - first, whole = last + (n - last) / TILE * TILE;
    for (int from = last; from < n; from += BLOCK) {
        int to = from + BLOCK < n ? from + BLOCK : n;
        pack_strips(n, A, first, last, from, to, packed);
        for (int j = last; j < whole; j += TILE) {
            const double *strip = packed;
            for (int i = from; i < to; i += TILE, strip += (size_t)depth * TILE) {
                quad sum[TILE];
                multiply_tile(depth, strip, A + first + (size_t)j * n, n, sum);
                if (i + TILE <= to)
                    subtract_tile(sum, TILE, A + i + (size_t)j * n, n);
                else
                    subtract_tile(sum, to - i, A + i + (size_t)j * n, n);
            }
        }
    }
    for (int j = whole; j < n; j++)
        update_column(n, A, first, last, j);
}

bool eliminate(int n, double *A, int *pivot, double threshold)
{
    if (n <= SINGLE_PANEL)
        return eliminate_panel(n, A, 0, n, pivot, threshold);
    bool is_regular = true;
    for (int first = 0; first < n && is_regular; first += PANEL) {
        int last = first + PANEL < n ? first + PANEL : n;
        is_regular = eliminate_panel(n, A, first, last, pivot, threshold);
        for (int k = first; is_regular && k < last; k++)
            if (pivot[k] - 1 != k) {
                swap_rows(n, 0, first, A, k, pivot[k] - 1);
                swap_rows(n, last, n, A, k, pivot[k] - 1);
            }
        if (is_regular) {
            solve_rows(n, A, first, last);
            update_rest(n, A, first, last);
        }
    }
    return is_regular;
}

void eliminate_invert(int n, const double *LU, double *inverse)
{
    for (int k = 0; k < n; k++)
        inverse[k] = 1 / LU[k + (size_t)k * n];
}

void eliminate_solve(int n, const double *restrict LU, const int *restrict pivot, const double *restrict inverse,
                     double *restrict b)
{
    for (int k = 0; k < n; k++) {
        int other = pivot[k] - 1;
        if (other != k) {
            double kept = b[other];
            b[other] = b[k];
            b[k] = kept;
        }
    }
    for (int k = 0; k < n; k++) {
        const double *column = LU + (size_t)k * n;
        double value = b[k];
        for (int i = k + 1; i < n; i++)
            b[i] -= column[i] * value;
    }
    for (int k = n - 1; k >= 0; k--) {
        const double *column = LU + (size_t)k * n;
        double value = b[k] *= inverse[k];
        for (int i = 0; i < k; i++)
            b[i] -= column[i] * value;
    }
}
