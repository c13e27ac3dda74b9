/* Conservation laws and rounding.  If w J = 0, then w W = w/(h gamma): as h grows
 * that is lost in the rounding of W, which is then nearly singular, and the
 * totals drift.  But every right-hand side b of the method is a combination of
 * columns of N, so w b = 0 and w u = 0 exactly.  So one species of each law is taken
 * out, u_d = -sum_j w_j u_j (w_d = 1), and
 *     (I/(h gamma) - J_ff + J_fd w) u_f = b_f
 * is solved for the free ones.  Totals then stay to rounding, the system is
 * smaller, and it is well conditioned at any h.
 *
 * That is the dense form.  J_fd w would fill a sparse matrix: there row d is
 * replaced by w/(h gamma), which is w W, with 0 on the right.  Elimination of u_d by
 * that row gives the equation above; the factorisation is free to take another
 * order.  u_d is computed from the law again in the end.
 *
 * The form is sparse where the work of its factorisation is estimated below 1/2.5
 * of the dense one's 2/3 n^3 operations: an operation costs about twice as much there
 * (measured from 30 to 1000 species, from little fill to a quarter of the matrix).
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

#include <limits.h>
#include <string.h>

#include "analysis/eliminate.h"
#include "base/memory.h"

#define DIAGONAL_THRESHOLD 0.01
#define SPARSE_SAVING 2.5
#define SMALLEST_SPARSE 24      /* species; below, a sparse factorisation cannot save so much */

static void clear_sparse(stiff_matrix *matrix)
{
    sparse_free(matrix->lu);
    memory_free(matrix->values);
    memory_free(matrix->multiple);
    memory_free(matrix->origin);
    memory_free(matrix->row);
    memory_free(matrix->start);
    matrix->lu = NULL;
    matrix->values = matrix->multiple = NULL;
    matrix->origin = matrix->row = matrix->start = NULL;
}

void stiff_matrix_clear(stiff_matrix *matrix)
{
    clear_sparse(matrix);
    memory_free(matrix->compact);
    memory_free(matrix->inverse);
    memory_free(matrix->pivot);
    memory_free(matrix->W);
    stiff_laws_clear(&matrix->laws);
    *matrix = (stiff_matrix){0};
}

lb_status stiff_matrix_init(stiff_matrix *matrix, const lb_system *system)
{
    size_t n = (size_t)system->n;
    *matrix = (stiff_matrix){.system = system, .n = system->n};
    matrix->pivot = memory_array(n, sizeof *matrix->pivot);
    matrix->inverse = memory_array(n, sizeof *matrix->inverse);
    matrix->compact = memory_array(n, sizeof *matrix->compact);
    if (stiff_laws_init(&matrix->laws, system) != LB_OK || !matrix->pivot || !matrix->inverse ||
        !matrix->compact) {
        stiff_matrix_clear(matrix);
        return LB_E_NOMEM;
    }
    return LB_OK;
}

void stiff_matrix_forget(stiff_matrix *matrix)
{
    stiff_laws_forget(&matrix->laws);
}

/* ---- The sparse form ------------------------------------------------------------ */

/* Where law entries stand: for each column the rows of the laws, unsorted. */
typedef struct law_columns {
    size_t *start;              /* [n+1] */
    int *law;                   /* [entries] */
    double *weight;
} law_columns;

static void law_columns_clear(law_columns *columns)
{
    memory_free(columns->weight);
    memory_free(columns->law);
    memory_free(columns->start);
}

/* The laws by columns, each with its own species. */
static bool law_columns_make(const stiff_laws *laws, int n, law_columns *columns)
{
    size_t entries = laws->start[laws->count] + (size_t)laws->count;
    columns->start = memory_zeroed((size_t)n + 2, sizeof *columns->start);
    columns->law = memory_array(entries, sizeof *columns->law);
    columns->weight = memory_array(entries, sizeof *columns->weight);
    if (!columns->start || !columns->law || !columns->weight)
        return false;
    size_t *next = columns->start + 1;
    for (int pass = 0; pass < 2; pass++) {
        for (int law = 0; law < laws->count; law++) {
            if (laws->dependent[law] < 0)
                continue;
            for (size_t e = laws->start[law]; e <= laws->start[law + 1]; e++) {
                bool is_own = e == laws->start[law + 1];
                int species = is_own ? laws->dependent[law] : laws->species[e];
                if (pass == 0) {
                    columns->start[species + 2]++;
                } else {
                    columns->law[next[species]] = law;
                    columns->weight[next[species]++] = is_own ? 1 : laws->weight[e];
                }
            }
        }
        for (int i = 0; pass == 0 && i < n; i++)
            columns->start[i + 2] += columns->start[i + 1];
    }
    return true;
}

/* Put an entry into the column that ends at *used, in ascending order of rows. */
static void add_entry(stiff_matrix *matrix, int first, int *used, int row, int origin, double multiple)
{
    int place = (*used)++;
    for (; place > first && matrix->row[place - 1] > row; place--) {
        matrix->row[place] = matrix->row[place - 1];
        matrix->origin[place] = matrix->origin[place - 1];
        matrix->multiple[place] = matrix->multiple[place - 1];
    }
    matrix->row[place] = row;
    matrix->origin[place] = origin;
    matrix->multiple[place] = multiple;
}

static void add_column(stiff_matrix *matrix, const law_columns *columns, int j, int *used)
{
    const lb_system *system = matrix->system;
    int first = *used;
    bool has_diagonal = matrix->laws.place[j] < 0;
    for (int e = system->column_start[j]; e < system->column_start[j + 1]; e++) {
        int i = system->row[e];
        if (matrix->laws.place[i] < 0)
            continue;
        has_diagonal = has_diagonal || i == j;
        add_entry(matrix, first, used, i, e, i == j);
    }
    if (!has_diagonal)
        add_entry(matrix, first, used, j, -1, 1);
    for (size_t e = columns->start[j]; e < columns->start[j + 1]; e++)
        add_entry(matrix, first, used, matrix->laws.dependent[columns->law[e]], -1, columns->weight[e]);
}

/* Pattern of W with the laws in place of their species' rows, and its analysis.
 * LB_OK, LB_E_NOMEM, LB_E_LIMIT (more entries than an int counts). */
static lb_status make_sparse(stiff_matrix *matrix)
{
    clear_sparse(matrix);
    size_t n = (size_t)matrix->n;
    size_t room = (size_t)matrix->system->nonzeros + n + matrix->laws.start[matrix->laws.count];
    if (room > INT_MAX)
        return LB_E_LIMIT;
    law_columns columns = {0};
    lb_status status = LB_E_NOMEM;
    matrix->start = memory_array(n + 1, sizeof *matrix->start);
    matrix->row = memory_array(room, sizeof *matrix->row);
    matrix->origin = memory_array(room, sizeof *matrix->origin);
    matrix->multiple = memory_array(room, sizeof *matrix->multiple);
    matrix->values = memory_array(room, sizeof *matrix->values);
    if (!matrix->start || !matrix->row || !matrix->origin || !matrix->multiple || !matrix->values ||
        !law_columns_make(&matrix->laws, matrix->n, &columns))
        goto done;
    int used = 0;
    for (int j = 0; j < matrix->n; j++) {
        matrix->start[j] = used;
        add_column(matrix, &columns, j, &used);
    }
    matrix->start[n] = used;
    status = sparse_new(matrix->n, matrix->start, matrix->row, &matrix->lu);
done:
    law_columns_clear(&columns);
    return status;
}

static lb_status factor_sparse(stiff_matrix *matrix, double diagonal, const double *values)
{
    for (int e = 0; e < matrix->start[matrix->n]; e++) {
        int origin = matrix->origin[e];
        matrix->values[e] = matrix->multiple[e] * diagonal - (origin >= 0 ? values[origin] : 0);
    }
    return sparse_factor(matrix->lu, matrix->values);
}

static void solve_sparse(const stiff_matrix *matrix, int columns, double *B)
{
    size_t n = (size_t)matrix->n;
    for (int c = 0; c < columns; c++)
        for (int law = 0; law < matrix->laws.count; law++)
            if (matrix->laws.dependent[law] >= 0)
                B[(size_t)matrix->laws.dependent[law] + (size_t)c * n] = 0;
    sparse_solve(matrix->lu, columns, B);
    for (int c = 0; c < columns; c++)
        stiff_laws_complete(&matrix->laws, B + (size_t)c * n);
}

/* ---- The dense form ------------------------------------------------------------- */

/* W's column of free species j -= factor * (column of J). */
static void subtract_column(stiff_matrix *matrix, const double *values, int from, double factor, int j)
{
    const lb_system *system = matrix->system;
    const int *place = matrix->laws.place;
    double *column = matrix->W + (size_t)j * (size_t)matrix->laws.free;
    for (int e = system->column_start[from]; e < system->column_start[from + 1]; e++) {
        int i = place[system->row[e]];
        if (i >= 0)
            column[i] -= factor * values[e];
    }
}

static lb_status factor_dense(stiff_matrix *matrix, double diagonal, const double *values)
{
    const stiff_laws *laws = &matrix->laws;
    size_t free = (size_t)laws->free;
    memset(matrix->W, 0, free * free * sizeof *matrix->W);
    for (int i = 0; i < matrix->n; i++)
        if (laws->place[i] >= 0)
            subtract_column(matrix, values, i, 1, laws->place[i]);
    for (int law = 0; law < laws->count; law++)
        for (size_t e = laws->start[law]; e < laws->start[law + 1]; e++)
            subtract_column(matrix, values, laws->dependent[law], -laws->weight[e], laws->place[laws->species[e]]);
    for (size_t i = 0; i < free; i++)
        matrix->W[i + i * free] += diagonal;
    if (!eliminate(laws->free, matrix->W, matrix->pivot, DIAGONAL_THRESHOLD))
        return LB_E_NUMERIC;
    eliminate_invert(laws->free, matrix->W, matrix->inverse);
    return LB_OK;
}

static void solve_dense(const stiff_matrix *matrix, int columns, double *B)
{
    const stiff_laws *laws = &matrix->laws;
    size_t n = (size_t)matrix->n, free = (size_t)laws->free;
    if (free == n) {
        for (int c = 0; c < columns; c++)
            eliminate_solve(matrix->n, matrix->W, matrix->pivot, matrix->inverse, B + (size_t)c * n);
        return;
    }
    for (int c = 0; c < columns; c++) {
        double *b = B + (size_t)c * n;
        for (size_t i = 0; i < n; i++)
            if (laws->place[i] >= 0)
                matrix->compact[laws->place[i]] = b[i];
        eliminate_solve(laws->free, matrix->W, matrix->pivot, matrix->inverse, matrix->compact);
        for (size_t i = 0; i < n; i++)
            if (laws->place[i] >= 0)
                b[i] = matrix->compact[laws->place[i]];
        stiff_laws_complete(laws, b);
    }
}

/* ---- The choice ----------------------------------------------------------------- */

static double dense_work(const stiff_matrix *matrix)
{
    double free = matrix->laws.free;
    return 2.0 / 3.0 * free * free * free;
}

static lb_status make_room(stiff_matrix *matrix, size_t free)
{
    if (matrix->W && matrix->room >= free * free)
        return LB_OK;
    memory_free(matrix->W);
    matrix->W = memory_array(free * free, sizeof *matrix->W);
    matrix->room = matrix->W ? free * free : 0;
    return matrix->W ? LB_OK : LB_E_NOMEM;
}

static lb_status choose_form(stiff_matrix *matrix)
{
    bool dense_fits = matrix->laws.free <= STIFF_DENSE_LIMIT;
    matrix->is_sparse = false;
    if (matrix->n >= SMALLEST_SPARSE) {
        lb_status status = make_sparse(matrix);
        if (status == LB_E_NOMEM)
            return status;
        bool sparse_fits = status == LB_OK && sparse_entries(matrix->lu) <= STIFF_SPARSE_LIMIT;
        matrix->is_sparse = sparse_fits &&
                            (!dense_fits || SPARSE_SAVING * sparse_work(matrix->lu) < dense_work(matrix));
    }
    if (matrix->is_sparse)
        return LB_OK;
    clear_sparse(matrix);
    if (!dense_fits)
        return LB_E_LIMIT;
    return make_room(matrix, (size_t)matrix->laws.free);
}

lb_status stiff_matrix_choose(stiff_matrix *matrix, const double *size)
{
    bool has_form = matrix->lu || matrix->W;
    return stiff_laws_choose(&matrix->laws, size) || !has_form ? choose_form(matrix) : LB_OK;
}

double stiff_matrix_work(const stiff_matrix *matrix)
{
    return matrix->is_sparse ? sparse_work(matrix->lu) : dense_work(matrix);
}

lb_status stiff_matrix_factor(stiff_matrix *matrix, double diagonal, const double *values)
{
    return matrix->is_sparse ? factor_sparse(matrix, diagonal, values) : factor_dense(matrix, diagonal, values);
}

void stiff_matrix_solve(const stiff_matrix *matrix, int columns, double *B)
{
    if (matrix->is_sparse)
        solve_sparse(matrix, columns, B);
    else
        solve_dense(matrix, columns, B);
}
