/* Newton's method on the steady-state equations.
 *
 * Each step solves the linearised equations: by LU where there are as many
 * balances as unknowns, else by least squares over all balances and laws (they
 * are consistent at a root, so convergence stays quadratic, and no balance with
 * small terms is lost to one with large ones).  A singular step falls back to
 * the least-norm solution.  Steps are cut to STEP_LIMIT in log concentration and
 * halved until the residual falls.
 *
 * Known roots are deflated with m(u) = prod (1/|u - r|^2 + 1); the step of the
 * deflated system is a multiple of Newton's own (P. E. Farrell, A. Birkisson and
 * S. W. Funke, SIAM J. Sci. Comput. 37 (2015) A2026; the scalar form follows
 * from Sherman and Morrison's formula).  Pseudo-transient continuation, its time step
 * grown as long as the unknowns move little: C. T. Kelley and D. E. Keyes, SIAM J.
 * Numer. Anal. 35 (1998) 508.
 *
 * Where the derivatives are singular to rounding, small scaled residuals are no
 * proof of a root: on the way to infinity a balance can be small against terms that
 * it does not have there.  Such a point is a root when each balance is small against
 * its own terms, or when the step without any cut-off of the rank is small too. */
#include "analysis/newton.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "analysis/sparse.h"
#include "base/memory.h"
#include "base/status.h"

enum { MOST_ITERATIONS = 40, MOST_HALVINGS = 6, MOST_POLISHING = 30, ALL_ROWS_LIMIT = 120 };

static const double STEP_LIMIT = 5;             /* e^5: two decades */
static const double RESIDUAL_TOLERANCE = 1e-11; /* a root, before polishing */
static const double STEP_TOLERANCE = 1e-3;      /* and well placed: not on its way to zero or infinity */
static const double RANK_TOLERANCE = 1e-13;     /* fast steps may hide slow ones 13 decades below */
static const double OWN_TOLERANCE = 1e-9;       /* of a balance against its own terms, at a singular root */
static const double FAR = 100;                  /* e^-100 = 4e-44: on the way to zero or infinity */

/* ---- Workspace -------------------------------------------------------------------- */

/* The balances of all species, or of the independent ones and the laws when the
 * equations are those of the whole core. */
static bool choose_rows(newton *w)
{
    const equations *eq = w->eq;
    const lb_system *system = eq->system;
    if (eq->law_count == 0) {
        for (int i = 0; i < eq->count; i++)
            w->relaxed_row[i] = i;
        return true;
    }
    if (eq->count != system->core || system->rank + eq->law_count != system->core)
        return false;
    for (int i = 0; i < system->rank; i++)
        w->relaxed_row[i] = eq->unknown[system->core_state[system->independent[i]]];
    for (int l = 0; l < eq->law_count; l++)
        w->relaxed_row[system->rank + l] = eq->balances + l;
    return true;
}

/* The balance of a pool takes the place of that of one of its species. */
static void place_pools(newton *w)
{
    const equations *eq = w->eq;
    memcpy(w->row, w->relaxed_row, (size_t)eq->count * sizeof *w->row);
    for (int p = 0; p < eq->pool_count; p++) {
        const double *weight = eq->laws->pool + (size_t)eq->pool[p] * (size_t)eq->laws->width;
        int i = 0;
        while (i < eq->count &&
               (w->row[i] >= eq->count || weight[eq->system->core_index[eq->state[w->row[i]]]] == 0))
            i++;
        if (i < eq->count)
            w->row[i] = eq->count + p;
    }
}

lb_status newton_init(newton *w, equations *eq, lb_error *err)
{
    size_t count = (size_t)eq->count, rows = (size_t)eq->rows;
    memset(w, 0, sizeof *w);
    w->eq = eq;
    w->relaxed_row = memory_array(count, sizeof *w->relaxed_row);
    w->row = memory_array(count, sizeof *w->row);
    w->F = memory_array(rows, sizeof *w->F);
    w->trial_F = memory_array(rows, sizeof *w->trial_F);
    w->A = memory_array(rows * count, sizeof *w->A);
    w->work = memory_array((rows + 1) * (count + 1), sizeof *w->work);
    w->right = memory_array(rows + 1, sizeof *w->right);
    w->step = memory_array(count, sizeof *w->step);
    w->trial = memory_array(count, sizeof *w->trial);
    w->pivot = memory_array(count, sizeof *w->pivot);
    if (!w->relaxed_row || !w->row || !w->F || !w->trial_F || !w->A || !w->work || !w->right || !w->step ||
        !w->trial || !w->pivot) {
        newton_clear(w);
        return status_no_memory(err);
    }
    w->is_square = (eq->rows == eq->count || eq->count > ALL_ROWS_LIMIT) && choose_rows(w);
    if (w->is_square)
        place_pools(w);
    w->is_sparse = w->is_square && eq->count > ALL_ROWS_LIMIT;
    w->start = w->is_sparse ? memory_zeroed(count + 1, sizeof *w->start) : NULL;
    if (w->is_sparse && !w->start) {
        newton_clear(w);
        return status_no_memory(err);
    }
    return LB_OK;
}

void newton_clear(newton *w)
{
    memory_free(w->relaxed_row);
    memory_free(w->row);
    memory_free(w->F);
    memory_free(w->trial_F);
    memory_free(w->A);
    memory_free(w->work);
    memory_free(w->right);
    memory_free(w->step);
    memory_free(w->trial);
    memory_free(w->pivot);
    memory_free(w->start);
    memory_free(w->entry_row);
    memory_free(w->entry);
    memset(w, 0, sizeof *w);
}

/* ---- One step ----------------------------------------------------------------------- */

static double norm2(int count, const double *a)
{
    double sum = 0;
    for (int i = 0; i < count; i++)
        sum += a[i] * a[i];
    return sqrt(sum);
}

/* How large a change of an unknown is of the order of the unknown itself. */
static double scale_of(const equations *eq, const double *u, int i)
{
    return eq->is_signed[i] ? 1 + fabs(u[i]) : 1;
}

/* The largest of the last step against the unknowns. */
static double relative_step(const newton *w, const double *u)
{
    double value = 0;
    for (int i = 0; i < w->eq->count; i++)
        value = fmax(value, fabs(w->step[i]) / scale_of(w->eq, u, i));
    return value;
}

/* Solve with the rows of a square form; false when they are near singular. */
static bool solve_square(newton *w, const int *row)
{
    int count = w->eq->count, rows = w->eq->rows;
    for (int j = 0; j < count; j++)
        for (int i = 0; i < count; i++)
            w->work[i + (size_t)j * (size_t)count] = w->A[row[i] + (size_t)j * (size_t)rows];
    for (int i = 0; i < count; i++)
        w->step[i] = -w->F[row[i]];
    double norm = linalg_norm1(count, w->work);
    if (!linalg_factor(count, w->work, w->pivot) || linalg_rcond(count, w->work, w->pivot, norm) < 1e-14)
        return false;
    linalg_solve(count, w->work, w->pivot, 1, w->step);
    return isfinite(norm2(count, w->step));
}

/* The rows of a square form without their zeros.  False: no memory. */
static bool compress(newton *w, const int *row)
{
    int count = w->eq->count;
    size_t entries = 0;
    for (int j = 0; j < count; j++) {
        const double *column = w->A + (size_t)j * (size_t)w->eq->rows;
        for (int i = 0; i < count; i++) {
            if (column[row[i]] == 0)
                continue;
            size_t before = w->entry_capacity;
            if (memory_grow(&w->entry, &w->entry_capacity, entries, sizeof *w->entry) != 0)
                return false;
            if (w->entry_capacity != before) {
                int *rows = memory_resize(w->entry_row, w->entry_capacity, sizeof *rows);
                if (!rows)
                    return false;
                w->entry_row = rows;
            }
            w->entry[entries] = column[row[i]];
            w->entry_row[entries++] = i;
        }
        w->start[j + 1] = (int)entries;
    }
    return true;
}

/* The same as solve_square for a large system; LB_E_NUMERIC when it is singular. */
static lb_status solve_sparse(newton *w, const int *row, lb_error *err)
{
    sparse_lu *lu = NULL;
    if (!compress(w, row))
        return status_no_memory(err);
    for (int i = 0; i < w->eq->count; i++)
        w->step[i] = -w->F[row[i]];
    lb_status status = sparse_new(w->eq->count, w->start, w->entry_row, &lu);
    if (status == LB_OK)
        status = sparse_factor(lu, w->entry);
    if (status == LB_OK) {
        sparse_solve(lu, 1, w->step);
        status = isfinite(norm2(w->eq->count, w->step)) ? LB_OK : LB_E_NUMERIC;
    }
    sparse_free(lu);
    return status == LB_E_NOMEM ? status_no_memory(err) : status;
}

/* step = least-norm solution of A step = -F over all rows, in unknowns scaled to
 * themselves at u.  A row and a column of their own with a one in them make the rank
 * absolute: the rows are sums of terms of size one, and what is left of them below
 * rcond is rounding. */
static lb_status solve_all(newton *w, const double *u, double rcond, int *rank, lb_error *err)
{
    int count = w->eq->count, rows = w->eq->rows;
    memset(w->work, 0, (size_t)(rows + 1) * (size_t)(count + 1) * sizeof *w->work);
    for (int j = 0; j < count; j++)
        for (int i = 0; i < rows; i++)
            w->work[i + (size_t)j * (size_t)(rows + 1)] =
                w->A[i + (size_t)j * (size_t)rows] * scale_of(w->eq, u, j);
    w->work[rows + (size_t)count * (size_t)(rows + 1)] = 1;
    for (int i = 0; i < rows; i++)
        w->right[i] = -w->F[i];
    w->right[rows] = 0;
    lb_status status = linalg_least_squares(rows + 1, count + 1, w->work, w->right, rcond, rank, err);
    for (int j = 0; j < count; j++)
        w->step[j] = w->right[j] * scale_of(w->eq, u, j);
    *rank -= 1;
    return status;
}

/* row NULL: by least squares over all rows. */
static lb_status solve(newton *w, const double *u, const int *row, lb_error *err)
{
    int rank;
    if (w->is_sparse)
        return solve_sparse(w, row, err);
    if (row && solve_square(w, row))
        return LB_OK;
    return solve_all(w, u, 1e-12, &rank, err);
}

/* Norm of the residuals that the step reduces. */
static double residual_norm(const newton *w, const double *F)
{
    double sum = 0;
    if (!w->is_square)
        return norm2(w->eq->rows, F);
    for (int i = 0; i < w->eq->count; i++)
        sum += F[w->row[i]] * F[w->row[i]];
    return sqrt(sum);
}

/* ---- Deflation ------------------------------------------------------------------------- */

static double squared_distance(int count, const double *a, const double *b)
{
    double sum = 0;
    for (int i = 0; i < count; i++)
        sum += (a[i] - b[i]) * (a[i] - b[i]);
    return fmax(sum, 1e-200);
}

static double deflation(const newton *w, const double *u, double *const *known, int known_count)
{
    double m = 1;
    for (int k = 0; k < known_count; k++)
        m *= 1 / squared_distance(w->eq->count, u, known[k]) + 1;
    return m;
}

/* The step of the deflated system is Newton's times 1/(1 - grad(m).step/m). */
static double deflated_factor(const newton *w, const double *u, double *const *known, int known_count)
{
    double slope = 0;
    for (int k = 0; k < known_count; k++) {
        double square = squared_distance(w->eq->count, u, known[k]), along = 0;
        for (int i = 0; i < w->eq->count; i++)
            along += (u[i] - known[k][i]) * w->step[i];
        slope -= 2 * along / (square * (1 + square));
    }
    return fabs(1 - slope) > 1e-8 ? 1 / (1 - slope) : 1e8;
}

static bool is_far(const newton *w, const double *u)
{
    for (int i = 0; i < w->eq->count; i++)
        if (!w->eq->is_signed[i] && fabs(u[i]) > FAR)
            return true;
    return false;
}

/* ---- The iteration ------------------------------------------------------------------------ */

static double reach(const equations *eq, const double *u, int i)
{
    return eq->is_signed[i] ? 3 * (1 + fabs(u[i])) : STEP_LIMIT;
}

/* Cut the step so that no unknown goes further than its reach. */
static void limit_step(newton *w, const double *u)
{
    double factor = 1;
    for (int i = 0; i < w->eq->count; i++)
        if (fabs(w->step[i]) * factor > reach(w->eq, u, i))
            factor = reach(w->eq, u, i) / fabs(w->step[i]);
    for (int i = 0; i < w->eq->count; i++)
        w->step[i] *= factor;
}

/* Halve the step until the (deflated) residual falls; u moves.  False: it never did. */
static bool line_search(newton *w, double *u, double *const *known, int known_count)
{
    const equations *eq = w->eq;
    double before = deflation(w, u, known, known_count) * residual_norm(w, w->F);
    for (double t = 1; t >= ldexp(1, -MOST_HALVINGS); t /= 2) {
        for (int i = 0; i < eq->count; i++)
            w->trial[i] = u[i] + t * w->step[i];
        if (!equations_values(w->eq, w->trial, w->trial_F))
            continue;
        double after = deflation(w, w->trial, known, known_count) * residual_norm(w, w->trial_F);
        if (after < (1 - 1e-4 * t) * before) {
            memcpy(u, w->trial, (size_t)eq->count * sizeof *u);
            return true;
        }
    }
    return false;
}

/* Full steps from a root as long as they get smaller: down to rounding.  Ends
 * with the residual, the last step and the rank at u. */
static lb_status polish(newton *w, double *u, newton_report *report, lb_error *err)
{
    int count = w->eq->count;
    double *best = w->trial;
    memcpy(best, u, (size_t)count * sizeof *u);
    report->step = INFINITY;
    for (int i = 0; i < MOST_POLISHING; i++) {
        if (!equations_matrix(w->eq, u, w->F, w->A))
            break;
        int rank = count;
        lb_status status = w->is_sparse ? solve_sparse(w, w->row, err) : solve_all(w, u, RANK_TOLERANCE, &rank, err);
        if (status != LB_OK)
            return status == LB_E_NUMERIC ? LB_OK : status;
        double step = relative_step(w, u);
        if (!(step < 0.9 * report->step))
            break;
        report->step = step;
        report->rank = rank;
        report->residual = equations_residual(w->eq, w->F);
        memcpy(best, u, (size_t)count * sizeof *u);
        for (int j = 0; j < count; j++)
            u[j] += w->step[j];
    }
    memcpy(u, best, (size_t)count * sizeof *u);
    return LB_OK;
}

/* Is the singular point u, where polishing ended, a root?  Signed unknowns that are
 * zero to rounding of their unit count as zero. */
static lb_status confirm(newton *w, const double *u, bool *is_root, lb_error *err)
{
    int rank;
    equations *eq = w->eq;
    for (int i = 0; i < eq->count; i++)
        w->trial[i] = eq->is_signed[i] && fabs(u[i]) < 1e-14 ? 0 : u[i];
    *is_root = equations_own_error(eq, w->trial) <= OWN_TOLERANCE;
    if (*is_root || !equations_matrix(eq, u, w->F, w->A))
        return LB_OK;
    lb_status status = solve_all(w, u, DBL_MIN, &rank, err);
    if (status != LB_OK)
        return status == LB_E_NUMERIC ? LB_OK : status;
    *is_root = rank == eq->count && relative_step(w, u) <= STEP_TOLERANCE;
    return LB_OK;
}

static lb_status finish(newton *w, double *u, newton_report *report, lb_error *err)
{
    lb_status status = polish(w, u, report, err);
    report->converged = status == LB_OK && report->step <= 10 * STEP_TOLERANCE;
    if (report->converged && report->rank < w->eq->count)
        status = confirm(w, u, &report->converged, err);
    return status;
}

lb_status newton_solve(newton *w, double *u, double *const *known, int known_count, newton_report *report,
                       lb_error *err)
{
    equations *eq = w->eq;
    *report = (newton_report){.residual = INFINITY, .step = INFINITY};
    for (int i = 0; i < MOST_ITERATIONS; i++) {
        report->iterations = i + 1;
        if (!equations_matrix(eq, u, w->F, w->A))
            return LB_OK;
        lb_status status = solve(w, u, w->is_square ? w->row : NULL, err);
        if (status != LB_OK)
            return status == LB_E_NUMERIC ? LB_OK : status;
        report->residual = equations_residual(eq, w->F);
        report->step = relative_step(w, u);
        if (report->residual <= RESIDUAL_TOLERANCE && report->step <= STEP_TOLERANCE)
            return finish(w, u, report, err);
        double factor = deflated_factor(w, u, known, known_count);
        for (int j = 0; j < eq->count; j++)
            w->step[j] *= factor;
        limit_step(w, u);
        if (!line_search(w, u, known, known_count) || is_far(w, u))
            return LB_OK;
    }
    return LB_OK;
}

/* ---- Pseudo-transient continuation ----------------------------------------------------------- */

/* The first time step: none of the relative rates moves its unknown far. */
static double first_inertia(newton *w)
{
    double fastest = 0;
    for (int i = 0; i < w->eq->count; i++) {
        double slope = w->eq->is_signed[i] ? w->eq->unit[i] : w->eq->x[w->eq->state[i]];
        fastest = fmax(fastest, fabs(w->F[i]) * w->eq->size[i] / slope);
    }
    return isfinite(fastest) ? fastest : 0;
}

static double farthest_move(const newton *w, const double *u)
{
    double moved = 0;
    for (int i = 0; i < w->eq->count; i++)
        moved = fmax(moved, fabs(w->step[i]) / scale_of(w->eq, u, i));
    return moved;
}

/* A step that moves an unknown too far is taken again with a shorter time.  With
 * laws least squares is the better way here: a scarce species follows from a law
 * only with a large error in its logarithm. */
static lb_status relax(newton *w, double *u, int steps, lb_error *err)
{
    const int *row = w->is_square ? w->relaxed_row : NULL;
    double inertia = 0;
    for (int i = 0; i < steps; i++) {
        if (!equations_matrix(w->eq, u, w->F, w->A))
            return LB_OK;
        if (i == 0)
            inertia = first_inertia(w);
        if (equations_residual(w->eq, w->F) < 1e-6 || !(inertia > 0))
            return LB_OK;
        equations_add_inertia(w->eq, inertia, w->F, w->A);
        lb_status status = solve(w, u, row, err);
        if (status != LB_OK)
            return status == LB_E_NUMERIC ? LB_OK : status;
        double moved = farthest_move(w, u);
        inertia *= moved > 1 ? 4 : moved < 0.3 ? 0.25 : 0.6;
        for (int j = 0; j < w->eq->count && moved <= 1; j++)
            u[j] += w->step[j];
    }
    return LB_OK;
}

lb_status newton_relax(newton *w, double *u, int steps, lb_error *err)
{
    w->eq->is_plain = true;
    lb_status status = relax(w, u, steps, err);
    w->eq->is_plain = false;
    return status;
}

/* ---- Null directions ---------------------------------------------------------------------------- */

/* What least squares cannot reach of a vector in general position: v minus the
 * least-norm solution of A y = A v. */
lb_status newton_null_direction(newton *w, const double *u, double *direction, lb_error *err)
{
    int rank, count = w->eq->count, rows = w->eq->rows;
    if (!equations_matrix(w->eq, u, w->F, w->A))
        return status_raise(err, LB_E_FINITE, NULL, "the derivatives at a steady state are not finite");
    for (int j = 0; j < count; j++)
        direction[j] = 1 + 0.1 * sin(1 + 2.3 * j);
    for (int i = 0; i < rows; i++) {
        w->F[i] = 0;
        for (int j = 0; j < count; j++)
            w->F[i] -= w->A[i + (size_t)j * (size_t)rows] * direction[j];
    }
    lb_status status = solve_all(w, u, RANK_TOLERANCE, &rank, err);
    if (status != LB_OK)
        return status;
    for (int j = 0; j < count; j++)
        direction[j] -= w->step[j];
    double length = norm2(count, direction);
    for (int j = 0; j < count; j++)
        direction[j] /= length > 0 ? length : 1;
    return LB_OK;
}

