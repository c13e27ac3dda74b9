/* The steady-state equations around a known state.
 *
 * Balances are scaled by the sum of their terms' magnitudes and of |df/dx| x, laws by
 * the sum of theirs, so that rows are of the order of one and a residual is relative. */
#include "analysis/near.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

static const int64_t *law_row(const near *w, int l)
{
    return w->system->core_laws.law + (size_t)w->law[l] * (size_t)w->system->core_laws.width;
}

/* Coefficient of unknown i in a law. */
static double law_entry(const near *w, int l, int i)
{
    return (double)law_row(w, l)[w->system->core_index[w->state[i]]];
}

static void choose_unknowns(near *w, const double *x)
{
    const lb_network *net = w->system->network;
    for (int i = 0; i < w->system->n; i++)
        w->unknown[i] = -1;
    for (int c = 0; c < w->system->core; c++) {
        int state = w->system->core_state[c];
        bool is_signed = net->species[net->state_species[state]].is_signed;
        if (!is_signed && !(x[state] > 0))
            continue;
        w->unknown[state] = w->count;
        w->state[w->count] = state;
        w->is_signed[w->count] = is_signed;
        w->unit[w->count] = is_signed && x[state] != 0 ? fabs(x[state]) : 1;
        w->count++;
    }
    for (int row = 0; row < w->system->core_laws.basis; row++) {
        w->law[w->law_count] = row;
        bool has_unknown = false;
        for (int i = 0; i < w->count; i++)
            has_unknown = has_unknown || law_entry(w, w->law_count, i) != 0;
        w->law_count += has_unknown;
    }
    w->rows = w->count + w->law_count;
}

static void set_start(near *w)
{
    if (w->fixed_start)
        memcpy(w->start, w->fixed_start, (size_t)w->system->n * sizeof *w->start);
    else
        lb_initial(w->evaluator, w->start);
}

lb_status near_init(near *w, lb_evaluator *evaluator, const double *x, const double *fixed_start, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    size_t n = (size_t)system->n, core = (size_t)system->core;
    *w = (near){.evaluator = evaluator, .system = system, .fixed_start = fixed_start};
    w->state = memory_array(core, sizeof *w->state);
    w->unknown = memory_array(n, sizeof *w->unknown);
    w->is_signed = memory_array(core, sizeof *w->is_signed);
    w->unit = memory_array(core, sizeof *w->unit);
    w->law = memory_array((size_t)system->core_laws.basis + 1, sizeof *w->law);
    w->k = memory_array((size_t)system->m, sizeof *w->k);
    w->start = memory_array(n, sizeof *w->start);
    w->x = memory_zeroed(n, sizeof *w->x);
    w->f = memory_array(n, sizeof *w->f);
    w->size = memory_array(n, sizeof *w->size);
    w->jacobian = memory_array((size_t)system->nonzeros, sizeof *w->jacobian);
    if (!w->state || !w->unknown || !w->is_signed || !w->unit || !w->law || !w->k || !w->start || !w->x || !w->f ||
        !w->size || !w->jacobian) {
        near_clear(w);
        return status_no_memory(err);
    }
    memcpy(w->k, evaluator_constants(evaluator), (size_t)system->m * sizeof *w->k);
    choose_unknowns(w, x);
    set_start(w);
    return LB_OK;
}

void near_clear(near *w)
{
    memory_free(w->state);
    memory_free(w->unknown);
    memory_free(w->is_signed);
    memory_free(w->unit);
    memory_free(w->law);
    memory_free(w->k);
    memory_free(w->start);
    memory_free(w->x);
    memory_free(w->f);
    memory_free(w->size);
    memory_free(w->jacobian);
    *w = (near){0};
}

void near_take(const near *w, const double *x, double *u)
{
    for (int i = 0; i < w->count; i++)
        u[i] = w->is_signed[i] ? x[w->state[i]] / w->unit[i] : log(x[w->state[i]]);
}

void near_place(near *w, const double *u)
{
    for (int i = 0; i < w->count; i++)
        w->x[w->state[i]] = w->is_signed[i] ? u[i] * w->unit[i] : exp(u[i]);
}

lb_status near_bind(near *w, int constant, double value, lb_error *err)
{
    double before = w->k[constant];
    w->k[constant] = value;
    lb_status status = lb_evaluator_bind(w->evaluator, w->k, err);
    if (status != LB_OK) {
        w->k[constant] = before;
        return status;
    }
    set_start(w);
    return LB_OK;
}

/* d x / d u of an unknown. */
static double slope_of(const near *w, int i)
{
    return w->is_signed[i] ? w->unit[i] : w->x[w->state[i]];
}

/* Terms that cancel inside one rate law show in its derivatives. */
static void find_sizes(near *w)
{
    lb_jacobian_sparse(w->evaluator, w->x, w->jacobian);
    for (int j = 0; j < w->count; j++) {
        double reach = fmax(fabs(w->x[w->state[j]]), w->is_signed[j] ? w->unit[j] : 0);
        for (int p = w->system->column_start[w->state[j]]; p < w->system->column_start[w->state[j] + 1]; p++)
            w->size[w->system->row[p]] += fabs(w->jacobian[p]) * reach;
    }
    for (int i = 0; i < w->system->n; i++)
        if (!(w->size[i] > 0))
            w->size[i] = 1;
}

static void law_rows(near *w, double *F, double *A)
{
    for (int l = 0; l < w->law_count; l++) {
        double sum = 0, size = 0;
        for (int c = 0; c < w->system->core; c++) {
            double weight = (double)law_row(w, l)[c];
            int state = w->system->core_state[c];
            sum += weight * (w->x[state] - w->start[state]);
            size += fabs(weight) * (fabs(w->x[state]) + fabs(w->start[state]));
        }
        size = size > 0 ? size : 1;
        F[w->count + l] = sum / size;
        for (int j = 0; A && j < w->count; j++)
            A[w->count + l + (size_t)j * (size_t)w->rows] = law_entry(w, l, j) * slope_of(w, j) / size;
    }
}

bool near_rows(near *w, const double *u, double *F, double *A)
{
    double sum = 0;
    near_place(w, u);
    evaluator_rhs_scaled(w->evaluator, w->x, w->f, w->size);
    find_sizes(w);
    for (int i = 0; i < w->count; i++)
        F[i] = w->f[w->state[i]] / w->size[w->state[i]];
    if (A) {
        memset(A, 0, (size_t)w->rows * (size_t)w->count * sizeof *A);
        for (int j = 0; j < w->count; j++)
            for (int p = w->system->column_start[w->state[j]]; p < w->system->column_start[w->state[j] + 1]; p++) {
                int i = w->unknown[w->system->row[p]];
                if (i >= 0)
                    A[i + (size_t)j * (size_t)w->rows] = w->jacobian[p] * slope_of(w, j) / w->size[w->state[i]];
            }
    }
    law_rows(w, F, A);
    for (int i = 0; i < w->rows; i++)
        sum += F[i] * F[i];
    return isfinite(sum);
}
