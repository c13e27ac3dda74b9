/* Number of eigenvalues in the right half-plane without computing them.
 *
 * Balance by powers of two, eliminate to Hessenberg form with pivoting, expand
 * the characteristic polynomial by its three-term-like recurrence over leading
 * minors, and count sign changes in the first column of the Routh array.  Each
 * number carries a bound of its rounding error along (running error analysis),
 * so a leading entry that could have either sign is reported, not guessed.
 *
 * Sources: B. N. Parlett and C. Reinsch, Numer. Math. 13 (1969) 293 (balance);
 * J. H. Wilkinson, The Algebraic Eigenvalue Problem (1965), ch. 6 (elimination,
 * Hessenberg recurrence); E. J. Routh (1877); N. J. Higham, Accuracy and
 * Stability of Numerical Algorithms, 2nd ed. (2002), section 3.3 (running
 * error). */
#include <assert.h>
#include <float.h>
#include <math.h>

#include "analysis/linalg.h"

enum { N = LINALG_ROUTH_LIMIT };

/* A value and a bound of its absolute error. */
typedef struct bounded {
    double value, error;
} bounded;

static const double unit = DBL_EPSILON;

static bounded product(bounded a, bounded b)
{
    double value = a.value * b.value;
    return (bounded){value, fabs(a.value) * b.error + fabs(b.value) * a.error + a.error * b.error + unit * fabs(value)};
}

static bounded difference(bounded a, bounded b)
{
    double value = a.value - b.value;
    return (bounded){value, a.error + b.error + unit * fabs(value)};
}

/* b must be known to be away from zero: |b.value| > b.error. */
static bounded quotient(bounded a, bounded b)
{
    double value = a.value / b.value;
    double error = (a.error + fabs(value) * b.error) / (fabs(b.value) - b.error) + unit * fabs(value);
    return (bounded){value, error};
}

static void scale_by(bounded *a, double power_of_two)
{
    a->value *= power_of_two;
    a->error *= power_of_two;
}

/* Similar matrix D^-1 A D with rows and columns of like size; exact, since the
 * factors are powers of two. */
static void balance(int n, bounded A[N][N])
{
    for (bool changed = true; changed;) {
        changed = false;
        for (int i = 0; i < n; i++) {
            double row = 0, column = 0;
            for (int j = 0; j < n; j++)
                if (j != i) {
                    row += fabs(A[i][j].value);
                    column += fabs(A[j][i].value);
                }
            if (row == 0 || column == 0)
                continue;
            int power = (int)lround(0.5 * (log2(row) - log2(column)));
            double factor = ldexp(1, power);
            if (power == 0 || column * factor + row / factor >= 0.95 * (column + row))
                continue;
            changed = true;
            for (int j = 0; j < n; j++) {
                scale_by(&A[i][j], 1 / factor);
                scale_by(&A[j][i], factor);
            }
        }
    }
}

/* Divide by a power of two near the norm: the signs that are counted stay, and
 * coefficients do not leave the range of a double. */
static bool scale(int n, bounded A[N][N])
{
    double largest = 0;
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++)
            largest = fmax(largest, fabs(A[i][j].value));
    if (largest == 0)
        return false;
    int power = ilogb(largest);
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++)
            scale_by(&A[i][j], ldexp(1, -power));
    return true;
}

static void exchange(int n, bounded A[N][N], int a, int b)
{
    for (int j = 0; j < n; j++) {
        bounded kept = A[a][j];
        A[a][j] = A[b][j];
        A[b][j] = kept;
    }
    for (int j = 0; j < n; j++) {
        bounded kept = A[j][a];
        A[j][a] = A[j][b];
        A[j][b] = kept;
    }
}

/* Column k is cleared below its subdiagonal by row operations; the matching
 * column operations keep the matrix similar. */
static void eliminate(int n, bounded A[N][N])
{
    for (int k = 0; k + 2 < n; k++) {
        int best = k + 1;
        for (int i = k + 2; i < n; i++)
            if (fabs(A[i][k].value) > fabs(A[best][k].value))
                best = i;
        if (A[best][k].value == 0)
            continue;
        if (best != k + 1)
            exchange(n, A, best, k + 1);
        for (int i = k + 2; i < n; i++) {
            if (A[i][k].value == 0)
                continue;
            double m = A[i][k].value / A[k + 1][k].value;
            bounded multiplier = {m, 0};   /* exact: any number makes a similarity */
            for (int j = k; j < n; j++)
                A[i][j] = difference(A[i][j], product(multiplier, A[k + 1][j]));
            A[i][k].value = 0;
            multiplier.value = -m;
            for (int j = 0; j < n; j++)
                A[j][k + 1] = difference(A[j][k + 1], product(multiplier, A[j][i]));
        }
    }
}

/* p[k]: coefficients of det(z I - leading k*k block), falling powers.
 * p_k = (z - h_kk) p_{k-1} - sum_i h_{k-i,k} (prod of subdiagonals) p_{k-i-1}. */
static void characteristic(int n, bounded A[N][N], bounded p[N + 1][N + 1])
{
    p[0][0] = (bounded){1, 0};
    for (int k = 1; k <= n; k++) {
        for (int c = 0; c <= k; c++)
            p[k][c] = c < k ? p[k - 1][c] : (bounded){0, 0};
        bounded chain = {1, 0};
        for (int i = 0; i < k; i++) {
            bounded factor = product(A[k - 1 - i][k - 1], chain);
            for (int c = 0; c <= k - 1 - i; c++)
                p[k][c + 1 + i] = difference(p[k][c + 1 + i], product(factor, p[k - 1 - i][c]));
            if (i + 1 < k)
                chain = product(chain, A[k - 1 - i][k - 2 - i]);
        }
    }
}

/* Sign changes in the first column of the array of the polynomial; -1 when a
 * sign there is not known. */
static int count_changes(int n, const bounded *polynomial)
{
    bounded above[N / 2 + 2] = {{0, 0}}, row[N / 2 + 2] = {{0, 0}};
    for (int c = 0; c <= n; c++)
        *(c % 2 ? &row[c / 2] : &above[c / 2]) = polynomial[c];
    int changes = 0, width = n / 2 + 1;
    for (int k = 1; k <= n; k++) {
        if (!(fabs(row[0].value) > row[0].error))
            return -1;
        changes += (row[0].value < 0) != (above[0].value < 0);
        bounded ratio = quotient(above[0], row[0]);
        for (int c = 0; c < width; c++) {
            bounded next = difference(above[c + 1], product(ratio, row[c + 1]));
            above[c] = row[c];
            row[c] = next;
        }
        above[width] = (bounded){0, 0};
    }
    return changes;
}

int linalg_routh_unstable(int n, const double *A)
{
    assert(n >= 0 && n <= N);
    bounded H[N][N], p[N + 1][N + 1];
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            if (!isfinite(A[i + (size_t)j * n]))
                return -1;
            /* One rounding of each entry: what a Jacobian has at least, and
             * what elimination leaves in the places that it clears. */
            H[i][j] = (bounded){A[i + (size_t)j * n], unit * fabs(A[i + (size_t)j * n])};
        }
    if (n == 0)
        return 0;
    balance(n, H);
    if (!scale(n, H))
        return -1;
    eliminate(n, H);
    characteristic(n, H, p);
    return count_changes(n, p[n]);
}
