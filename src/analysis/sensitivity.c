/* Sensitivities of a steady state.
 *
 * The balances and laws F(u, k) = 0 give du/dk = -inverse(F_u) F_k by least squares over
 * all rows.  F_k is exact for balances (the analytic df/dk) and a central difference for
 * totals, which is exact where initial concentrations are linear in the constants.  The
 * leading eigenvalue is followed along (du, dk) in both directions: central differences of
 * two widths, extrapolated.
 *
 * Source: A. Varma, M. Morbidelli and H. Wu, Parametric Sensitivity in Chemical Systems
 * (1999), chapter 2. */
#include "analysis/sensitivity.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "analysis/near.h"
#include "base/memory.h"
#include "base/status.h"

struct workspace {
    near near;
    int n, m, rank;
    double *u, *moved;      /* [count] */
    double *F;              /* [rows] */
    double *A, *work;       /* [rows*count] */
    double *right;          /* [rows] */
    double *D;              /* [n*m] df/dk */
    double *total_low, *total_high; /* [n] initial states at k -+ h */
    double *dx, *dstart, *whole; /* [n] */
    double *J, *reduced;    /* [n*n], [rank*rank] */
    lb_complex *values;     /* [rank] */
};

static void workspace_clear(struct workspace *w)
{
    near_clear(&w->near);
    double *blocks[] = {w->u,         w->moved,      w->F,  w->A,      w->work,  w->right, w->D,
                        w->total_low, w->total_high, w->dx, w->dstart, w->whole, w->J,     w->reduced};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
    memory_free(w->values);
}

static lb_status workspace_init(struct workspace *w, lb_evaluator *evaluator, const lb_steady_state *state,
                                const double *fixed_start, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    *w = (struct workspace){.n = system->n, .m = system->m, .rank = system->rank};
    lb_status status = near_init(&w->near, evaluator, state->x, fixed_start, err);
    if (status != LB_OK)
        return status;
    size_t n = (size_t)w->n, rank = (size_t)w->rank, count = (size_t)w->near.count, rows = (size_t)w->near.rows;
    struct { double **block; size_t size; } blocks[] = {
        {&w->u, count}, {&w->moved, count}, {&w->F, rows}, {&w->A, rows * count}, {&w->work, rows * count},
        {&w->right, rows}, {&w->D, n * (size_t)w->m}, {&w->total_low, n}, {&w->total_high, n}, {&w->dx, n},
        {&w->dstart, n}, {&w->whole, n}, {&w->J, n * n}, {&w->reduced, rank * rank}};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        if (!(*blocks[i].block = memory_array(blocks[i].size, sizeof(double))))
            return status_no_memory(err);
    w->values = memory_array(rank, sizeof *w->values);
    return w->values ? LB_OK : status_no_memory(err);
}

/* ---- The state ------------------------------------------------------------------------ */

/* dstart: how the state whose totals hold moves with ln k.  LB_E_ARG: k cannot move. */
static lb_status find_start_slope(struct workspace *w, int constant)
{
    const double h = 1e-4;
    double k = w->near.k[constant];
    memset(w->dstart, 0, (size_t)w->n * sizeof *w->dstart);
    if (w->near.fixed_start || k == 0)
        return LB_OK;
    lb_status status = near_bind(&w->near, constant, k * (1 - h), NULL);
    if (status != LB_OK)
        return status;
    memcpy(w->total_low, w->near.start, (size_t)w->n * sizeof *w->total_low);
    status = near_bind(&w->near, constant, k * (1 + h), NULL);
    memcpy(w->total_high, w->near.start, (size_t)w->n * sizeof *w->total_high);
    for (int i = 0; i < w->n; i++)
        w->dstart[i] = (w->total_high[i] - w->total_low[i]) / (2 * h);
    lb_status restored = near_bind(&w->near, constant, k, NULL);
    return status != LB_OK ? status : restored;
}

/* right = -F_k k in the scaled rows. */
static void fill_right(struct workspace *w, int constant)
{
    near *a = &w->near;
    for (int i = 0; i < a->count; i++)
        w->right[i] = -w->D[a->state[i] + (size_t)constant * (size_t)w->n] * a->k[constant] / a->size[a->state[i]];
    for (int l = 0; l < a->law_count; l++) {
        const int64_t *law = w->near.system->core_laws.law + (size_t)a->law[l] * (size_t)a->system->core_laws.width;
        double moved = 0, size = 0;
        for (int c = 0; c < a->system->core; c++) {
            int state = a->system->core_state[c];
            moved += (double)law[c] * w->dstart[state];
            size += fabs((double)law[c]) * (fabs(a->x[state]) + fabs(a->start[state]));
        }
        w->right[a->count + l] = moved / (size > 0 ? size : 1);
    }
}

/* dx [n] from du; species set aside follow from the totals. */
static void find_change(struct workspace *w)
{
    const near *a = &w->near;
    memset(w->dx, 0, (size_t)w->n * sizeof *w->dx);
    for (int i = 0; i < a->count; i++)
        w->dx[a->state[i]] = w->right[i] * (a->is_signed[i] ? a->unit[i] : a->x[a->state[i]]);
    memcpy(w->whole, w->dx, (size_t)w->n * sizeof *w->whole);
    system_complete(a->system, w->dstart, w->whole);
}

/* ---- The eigenvalue ---------------------------------------------------------------------- */

/* The eigenvalue nearest to `near_value` with state and constant moved by h along (dx, ln k). */
static bool moved_eigenvalue(struct workspace *w, int constant, double h, lb_complex near_value, lb_complex *value)
{
    near *a = &w->near;
    double k = a->k[constant];
    if (near_bind(a, constant, k * (1 + h), NULL) != LB_OK)
        return false;
    for (int i = 0; i < w->n; i++)
        w->total_low[i] = a->x[i] + h * w->dx[i];
    lb_jacobian(a->evaluator, w->total_low, w->J);
    bool is_bound = near_bind(a, constant, k, NULL) == LB_OK;
    system_reduce(a->system, w->J, w->reduced);
    if (!is_bound || linalg_eigenvalues(w->rank, w->reduced, w->values, NULL, NULL) != LB_OK)
        return false;
    double least = INFINITY;
    for (int i = 0; i < w->rank; i++) {
        double distance = hypot(w->values[i].re - near_value.re, w->values[i].im - near_value.im);
        if (distance < least) {
            least = distance;
            *value = w->values[i];
        }
    }
    return w->rank > 0;
}

static lb_complex eigenvalue_slope(struct workspace *w, int constant, lb_complex value)
{
    const double h = 1e-3;
    lb_complex slope[2], low, high;
    for (int i = 0; i < 2; i++) {
        double width = ldexp(h, -i);
        if (!moved_eigenvalue(w, constant, -width, value, &low) || !moved_eigenvalue(w, constant, width, value, &high))
            return (lb_complex){NAN, NAN};
        slope[i] = (lb_complex){(high.re - low.re) / (2 * width), (high.im - low.im) / (2 * width)};
    }
    return (lb_complex){(4 * slope[1].re - slope[0].re) / 3, (4 * slope[1].im - slope[0].im) / 3};
}

/* ---- All of them ---------------------------------------------------------------------------- */

static void set_unknown(struct workspace *w, lb_steady_state *state, int constant)
{
    for (int i = 0; i < w->n; i++)
        state->sensitivity[i + (size_t)constant * (size_t)w->n] = NAN;
    state->leading_sensitivity[constant] = (lb_complex){NAN, NAN};
}

static lb_status find_one(struct workspace *w, lb_steady_state *state, int constant, lb_error *err)
{
    near *a = &w->near;
    int rank = 0;
    set_unknown(w, state, constant);
    if (find_start_slope(w, constant) != LB_OK || !near_rows(a, w->u, w->F, w->A))
        return LB_OK;
    fill_right(w, constant);
    memcpy(w->work, w->A, (size_t)a->rows * (size_t)a->count * sizeof *w->work);
    lb_status status = linalg_least_squares(a->rows, a->count, w->work, w->right, 1e-13, &rank, err);
    if (status != LB_OK || rank < a->count)
        return status == LB_E_NUMERIC ? LB_OK : status;
    find_change(w);
    for (int i = 0; i < w->n; i++)
        if (state->x[i] != 0)
            state->sensitivity[i + (size_t)constant * (size_t)w->n] = w->whole[i] / state->x[i];
    if (w->rank > 0)
        state->leading_sensitivity[constant] = eigenvalue_slope(w, constant, state->eigenvalues[0]);
    return LB_OK;
}

lb_status sensitivity_find(lb_evaluator *evaluator, lb_steady_state *state, const double *fixed_start, lb_error *err)
{
    struct workspace w;
    lb_status status = workspace_init(&w, evaluator, state, fixed_start, err);
    if (status == LB_OK) {
        state->sensitivity = memory_array((size_t)w.n * (size_t)w.m, sizeof *state->sensitivity);
        state->leading_sensitivity = memory_array((size_t)w.m, sizeof *state->leading_sensitivity);
        if (!state->sensitivity || !state->leading_sensitivity)
            status = status_no_memory(err);
    }
    if (status == LB_OK) {
        near_take(&w.near, state->x, w.u);
        near_place(&w.near, w.u);
        lb_dfdk(evaluator, w.near.x, w.D);
    }
    for (int constant = 0; status == LB_OK && constant < w.m; constant++)
        status = find_one(&w, state, constant, err);
    workspace_clear(&w);
    return status;
}
