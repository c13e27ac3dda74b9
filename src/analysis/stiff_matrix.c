/* Conservation laws and rounding.  If w J = 0, then w W = w/(h gamma): as h grows
 * that is lost in the rounding of W, which is then nearly singular, and the
 * totals drift.  But every right-hand side b of the method is a combination of
 * columns of N, so w b = 0 and w u = 0 exactly.  So one species of each law is taken
 * out, u_d = -sum_j w_j u_j (w_d = 1), and
 *     (I/(h gamma) - J_ff + J_fd w) u_f = b_f
 * is solved for the free ones.  Totals then stay to rounding, the system is
 * smaller, and it is well conditioned at any h.  The largest species of a law is
 * taken out: the increments of the others do not cancel in it.
 *
 * Elimination prefers the diagonal.  In columns of mass-action kinetics it is
 * about the largest entry (what a species loses, others gain), and as long as it is
 * the pivot, a trace species is solved from its own equation, accurate relative
 * to itself, and one that is zero stays zero; the rounding of larger species would
 * swamp it otherwise.
 *
 * Source: I. S. Duff, A. M. Erisman and J. K. Reid, Direct Methods for Sparse
 * Matrices (1986), section 5.3 (threshold pivoting). */
#include "analysis/stiff_matrix.h"

#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "base/memory.h"

void stiff_matrix_clear(stiff_matrix *matrix)
{
    memory_free(matrix->compact);
    memory_free(matrix->pivot);
    memory_free(matrix->W);
    memory_free(matrix->place);
    memory_free(matrix->dependent);
    memory_free(matrix->law);
    *matrix = (stiff_matrix){0};
}

lb_status stiff_matrix_init(stiff_matrix *matrix, const lb_system *system, int columns)
{
    size_t n = (size_t)system->n, laws = (size_t)system->laws.basis;
    *matrix = (stiff_matrix){.system = system, .n = system->n, .laws = system->laws.basis};
    matrix->law = memory_array(laws * n, sizeof *matrix->law);
    matrix->dependent = memory_array(laws, sizeof *matrix->dependent);
    matrix->place = memory_array(n, sizeof *matrix->place);
    matrix->W = memory_array(n * n, sizeof *matrix->W);
    matrix->pivot = memory_array(n, sizeof *matrix->pivot);
    matrix->compact = memory_array(n * (size_t)columns, sizeof *matrix->compact);
    if (!matrix->law || !matrix->dependent || !matrix->place || !matrix->W || !matrix->pivot || !matrix->compact) {
        stiff_matrix_clear(matrix);
        return LB_E_NOMEM;
    }
    return LB_OK;
}

/* Scale one law to 1 at its species, and take that species out of the others. */
static void reduce(stiff_matrix *matrix, int law, int species)
{
    size_t n = (size_t)matrix->n;
    double *own = matrix->law + (size_t)law * n, leading = own[species];
    for (size_t i = 0; i < n; i++)
        own[i] /= leading;
    for (int other = 0; other < matrix->laws; other++) {
        double *row = matrix->law + (size_t)other * n, factor = other == law ? 0 : row[species];
        if (factor == 0)
            continue;
        for (size_t i = 0; i < n; i++)
            row[i] -= factor * own[i];
        row[species] = 0;
    }
}

void stiff_matrix_choose(stiff_matrix *matrix, const double *size)
{
    size_t n = (size_t)matrix->n;
    for (size_t e = 0; e < (size_t)matrix->laws * n; e++)
        matrix->law[e] = (double)matrix->system->laws.law[e];
    for (size_t i = 0; i < n; i++)
        matrix->place[i] = 0;
    for (int law = 0; law < matrix->laws; law++) {
        const double *row = matrix->law + (size_t)law * n;
        int best = -1;
        for (int i = 0; i < matrix->n; i++)
            if (matrix->place[i] == 0 && fabs(row[i]) > 1e-9 &&
                (best < 0 || fabs(row[i]) * size[i] > fabs(row[best]) * size[best]))
                best = i;
        matrix->dependent[law] = best;      /* -1: a law that rounding has lost; its species stay free */
        if (best < 0)
            continue;
        matrix->place[best] = -1;
        reduce(matrix, law, best);
    }
    matrix->free = 0;
    for (size_t i = 0; i < n; i++)
        if (matrix->place[i] == 0)
            matrix->place[i] = matrix->free++;
}

/* W's column of free species j -= factor * (column of J). */
static void subtract_column(stiff_matrix *matrix, const double *values, int from, double factor, int j)
{
    const lb_system *system = matrix->system;
    double *column = matrix->W + (size_t)j * matrix->free;
    for (int e = system->column_start[from]; e < system->column_start[from + 1]; e++) {
        int i = matrix->place[system->row[e]];
        if (i >= 0)
            column[i] -= factor * values[e];
    }
}

bool stiff_matrix_factor(stiff_matrix *matrix, double diagonal, const double *values)
{
    size_t free = (size_t)matrix->free;
    memset(matrix->W, 0, free * free * sizeof *matrix->W);
    for (int i = 0; i < matrix->n; i++)
        if (matrix->place[i] >= 0)
            subtract_column(matrix, values, i, 1, matrix->place[i]);
    for (int law = 0; law < matrix->laws; law++) {
        const double *row = matrix->law + (size_t)law * matrix->n;
        for (int i = 0; matrix->dependent[law] >= 0 && i < matrix->n; i++)
            if (matrix->place[i] >= 0 && row[i] != 0)
                subtract_column(matrix, values, matrix->dependent[law], -row[i], matrix->place[i]);
    }
    for (size_t i = 0; i < free; i++)
        matrix->W[i + i * free] += diagonal;
    return linalg_factor_diagonal(matrix->free, matrix->W, matrix->pivot);
}

void stiff_matrix_solve(const stiff_matrix *matrix, int columns, double *B)
{
    size_t n = (size_t)matrix->n, free = (size_t)matrix->free;
    for (int c = 0; c < columns; c++)
        for (size_t i = 0; i < n; i++)
            if (matrix->place[i] >= 0)
                matrix->compact[(size_t)matrix->place[i] + (size_t)c * free] = B[i + (size_t)c * n];
    linalg_solve(matrix->free, matrix->W, matrix->pivot, columns, matrix->compact);
    for (int c = 0; c < columns; c++) {
        double *b = B + (size_t)c * n;
        for (size_t i = 0; i < n; i++)
            if (matrix->place[i] >= 0)
                b[i] = matrix->compact[(size_t)matrix->place[i] + (size_t)c * free];
        for (int law = 0; law < matrix->laws; law++) {
            int species = matrix->dependent[law];
            if (species < 0)
                continue;
            const double *row = matrix->law + (size_t)law * n;
            double sum = 0;
            for (size_t i = 0; i < n; i++)
                if (matrix->place[i] >= 0)
                    sum += row[i] * b[i];
            b[species] = -sum;
        }
    }
}
