/* Newton's method for a closed orbit.
 *
 * Unknowns are the coordinates y of one point in the reaction space and the
 * period T; equations are phi_T(y) - y = 0 and that the step is orthogonal to the
 * flow, which fixes the phase.  The derivative of phi_T comes from the variational
 * equations, and everything is scaled by the amplitudes of the orbit.
 * Source: R. Seydel, Practical Bifurcation and Stability Analysis, 3rd ed. (2010),
 * ch. 7; deviation: the step is the minimal one of a rank-revealing factorisation,
 * so that families of orbits (centres) do not make it singular.
 *
 * Multipliers: the map has the eigenvalue 1 along the flow.  On an orthonormal
 * basis Q of the plane across the flow, Q'MQ is the derivative of the return map
 * to that plane, and its eigenvalues are the others. */
#include "analysis/shooting.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "base/memory.h"
#include "base/status.h"

enum { MAX_ITERATIONS = 12, PATIENCE = 4, HALVINGS = 3 };

#define RANK_CONDITION 1e-8       /* relative; below it a direction belongs to a family of orbits */
#define LARGEST_STEP 0.5          /* in amplitudes, and of the logarithm of the period */
#define PERIOD_RANGE 3.0          /* a period further than this factor from the guess is another orbit */

/* One trial: a point, its period, and where the flow takes it. */
typedef struct trial {
    double *x, *end;              /* [n] */
    double *map, *flow, *end_flow; /* scaled coordinates */
    double period, residual;
    size_t steps;
} trial;

typedef struct worker {
    const space *s;
    const double *scale;          /* [n] */
    const double *hold;           /* [rank] direction that is barred, or NULL */
    integrator *it;
    double *block;                /* all arrays below */
    trial now, next;
    double *rate;                 /* [n] */
    double *matrix;               /* [(rank+2)*(rank+1)] */
    double *step;                 /* [rank+2] */
    double *y;                    /* [rank] */
} worker;

static double *take(double **pool, size_t count)
{
    double *part = *pool;
    *pool += count;
    return part;
}

static void trial_place(trial *t, double **pool, size_t n, size_t rank)
{
    t->x = take(pool, n);
    t->end = take(pool, n);
    t->map = take(pool, rank * rank);
    t->flow = take(pool, rank);
    t->end_flow = take(pool, rank);
}

static lb_status worker_init(worker *w, const space *s, const double *scale, const orbit_options *options,
                             lb_error *err)
{
    memset(w, 0, sizeof *w);
    w->s = s;
    w->scale = scale;
    size_t n = (size_t)s->n, rank = (size_t)s->rank, m = rank + 1;
    w->block = memory_array(2 * (2 * n + rank * rank + 2 * rank) + n + (m + 1) * m + m + 1 + rank, sizeof(double));
    if (!w->block)
        return status_no_memory(err);
    double *pool = w->block;
    trial_place(&w->now, &pool, n, rank);
    trial_place(&w->next, &pool, n, rank);
    w->rate = take(&pool, n);
    w->matrix = take(&pool, (m + 1) * m);
    w->step = take(&pool, m + 1);
    w->y = take(&pool, rank);
    integrator_options how = {.tolerance = options->tolerance, .method = options->method,
                              .max_steps = options->max_steps, .tangents = true, .allow_negative = true,
                              .monitor = options->monitor};
    return integrator_new(s->evaluator, &how, &w->it, err);
}

static void worker_clear(worker *w)
{
    integrator_free(w->it);
    memory_free(w->block);
}

static void scaled_rates(worker *w, const double *x, double *flow)
{
    lb_rhs(w->s->evaluator, x, w->rate);
    for (int i = 0; i < w->s->rank; i++) {
        int state = space_state(w->s, i);
        flow[i] = w->rate[state] / w->scale[state];
    }
}

/* Integrate the trial over its period.  An integration that fails is a trial that
 * is not good enough, unless memory or the user stopped it. */
static lb_status trial_run(worker *w, trial *t, lb_error *err)
{
    const space *s = w->s;
    t->residual = INFINITY;
    integrator_start(w->it, 0, t->x);
    lb_status status = integrator_to(w->it, t->period, err);
    if (status == LB_E_NOMEM || status == LB_E_STOPPED)
        return status;
    if (status != LB_OK)
        return LB_OK;
    memcpy(t->end, integrator_state(w->it), (size_t)s->n * sizeof *t->end);
    t->residual = space_distance(s, t->end, t->x, w->scale);
    t->steps = integrator_steps(w->it);
    system_reduce(s->system, integrator_tangents(w->it), t->map);
    for (int j = 0; j < s->rank; j++)
        for (int i = 0; i < s->rank; i++)
            t->map[i + j * s->rank] *= w->scale[space_state(s, j)] / w->scale[space_state(s, i)];
    scaled_rates(w, t->x, t->flow);
    scaled_rates(w, t->end, t->end_flow);
    return LB_OK;
}

/* Newton step from `now` into step [rank+1]: changes of the scaled coordinates and
 * of the logarithm of the period. */
static lb_status newton_step(worker *w, lb_error *err)
{
    const space *s = w->s;
    const trial *t = &w->now;
    int rank = s->rank, rows = rank + (w->hold ? 2 : 1), found;
    double length = 0;
    for (int i = 0; i < rank; i++)
        length = hypot(length, t->flow[i]);
    if (!(length > 0))
        return LB_E_NUMERIC;
    for (int j = 0; j < rank; j++) {
        for (int i = 0; i < rank; i++)
            w->matrix[i + j * rows] = t->map[i + j * rank] - (i == j);
        w->matrix[rank + j * rows] = t->flow[j] / length;
        if (w->hold)
            w->matrix[rank + 1 + j * rows] = w->hold[j];
    }
    for (int i = 0; i < rank; i++) {
        int state = space_state(s, i);
        w->matrix[i + rank * rows] = t->end_flow[i] * t->period;
        w->step[i] = (t->x[state] - t->end[state]) / w->scale[state];
    }
    for (int i = rank; i < rows; i++)
        w->matrix[i + rank * rows] = w->step[i] = 0;
    return linalg_least_squares(rows, rank + 1, w->matrix, w->step, RANK_CONDITION, &found, err);
}

/* The trial `next` at a fraction of the step from `now`. */
static void take_step(worker *w, double fraction)
{
    const space *s = w->s;
    space_take(s, w->now.x, w->y);
    for (int i = 0; i < s->rank; i++)
        w->y[i] += fraction * w->step[i] * w->scale[space_state(s, i)];
    space_place(s, w->y, w->next.x);
    w->next.period = w->now.period * exp(fraction * w->step[s->rank]);
}

static double limited_fraction(const worker *w)
{
    double largest = 0;
    for (int i = 0; i <= w->s->rank; i++)
        largest = fmax(largest, fabs(w->step[i]));
    return largest > LARGEST_STEP ? LARGEST_STEP / largest : 1;
}

/* Newton with halved steps where the residual does not fall; ends when it falls
 * no further. */
static lb_status iterate(worker *w, double goal, int *iterations, lb_error *err)
{
    double guess = w->now.period;
    lb_status status = trial_run(w, &w->now, err);
    for (*iterations = 0; status == LB_OK && *iterations < MAX_ITERATIONS; ++*iterations) {
        if (!isfinite(w->now.residual))
            return LB_OK;
        lb_status solved = newton_step(w, err);
        if (solved != LB_OK)
            return solved == LB_E_NOMEM ? solved : LB_OK;
        double fraction = limited_fraction(w);
        for (int half = 0; half < HALVINGS; half++, fraction *= 0.25) {
            take_step(w, fraction);
            status = trial_run(w, &w->next, err);
            if (status != LB_OK || w->next.residual < w->now.residual || w->now.residual < goal)
                break;
        }
        if (status != LB_OK || !(w->next.residual < w->now.residual))
            break;
        bool slow = w->next.residual > 0.3 * w->now.residual &&
                    (w->now.residual < goal || *iterations >= PATIENCE);
        trial swap = w->now;
        w->now = w->next;
        w->next = swap;
        if (slow || w->now.residual < DBL_EPSILON || fabs(log(w->now.period / guess)) > log(PERIOD_RANGE))
            break;
    }
    return status;
}

/* Hand map and flow of the converged trial over. */
static lb_status keep(const worker *w, shooting *out, lb_error *err)
{
    size_t rank = (size_t)w->s->rank;
    out->map = memory_array(rank * rank, sizeof *out->map);
    out->flow = memory_array(rank, sizeof *out->flow);
    if (!out->map || !out->flow)
        return status_no_memory(err);
    memcpy(out->map, w->now.map, rank * rank * sizeof *out->map);
    memcpy(out->flow, w->now.flow, rank * sizeof *out->flow);
    return LB_OK;
}

lb_status shooting_close(const space *s, double *x, double *period, const double *scale, const double *hold,
                         double goal, const orbit_options *options, shooting *out, lb_error *err)
{
    worker w;
    memset(out, 0, sizeof *out);
    lb_status status = worker_init(&w, s, scale, options, err);
    w.hold = hold;
    if (status == LB_OK) {
        memcpy(w.now.x, x, (size_t)s->n * sizeof *x);
        w.now.period = *period;
        status = iterate(&w, goal, &out->iterations, err);
    }
    if (status == LB_OK) {
        out->residual = w.now.residual;
        out->steps = w.now.steps;
        out->converged = w.now.residual <= goal && fabs(log(w.now.period / *period)) <= log(PERIOD_RANGE);
    }
    if (status == LB_OK && out->converged)
        status = keep(&w, out, err);
    if (status == LB_OK && out->converged) {
        memcpy(x, w.now.x, (size_t)s->n * sizeof *x);
        *period = w.now.period;
    }
    worker_clear(&w);
    return status;
}

void shooting_clear(shooting *out)
{
    memory_free(out->map);
    memory_free(out->flow);
    memset(out, 0, sizeof *out);
}

/* ---- The map across the flow ---------------------------------------------------- */

/* Householder vector h [n] that takes the unit vector u to +-e_0: the other columns
 * of I - 2 h h' are an orthonormal basis of the plane across u. */
static void householder(int n, const double *u, double *h)
{
    double length = 0;
    for (int i = 0; i < n; i++)
        length = hypot(length, u[i]);
    memcpy(h, u, (size_t)n * sizeof *h);
    h[0] += u[0] >= 0 ? length : -length;
    length = 0;
    for (int i = 0; i < n; i++)
        length = hypot(length, h[i]);
    for (int i = 0; i < n; i++)
        h[i] /= length;
}

/* A := (I - 2hh') A (I - 2hh') */
static void reflect_both(int n, const double *h, double *A)
{
    for (int j = 0; j < n; j++) {
        double dot = 0;
        for (int i = 0; i < n; i++)
            dot += h[i] * A[i + j * n];
        for (int i = 0; i < n; i++)
            A[i + j * n] -= 2 * dot * h[i];
    }
    for (int i = 0; i < n; i++) {
        double dot = 0;
        for (int j = 0; j < n; j++)
            dot += A[i + j * n] * h[j];
        for (int j = 0; j < n; j++)
            A[i + j * n] -= 2 * dot * h[j];
    }
}

/* Q'MQ into across [(rank-1)^2], h [rank] the reflection that made it. */
static lb_status map_across(const shooting *shot, int rank, double *across, double *h, lb_error *err)
{
    size_t size = (size_t)rank * (size_t)rank;
    double *A = memory_array(size, sizeof *A);
    if (!A)
        return status_no_memory(err);
    memcpy(A, shot->map, size * sizeof *A);
    householder(rank, shot->flow, h);
    reflect_both(rank, h, A);
    for (int j = 1; j < rank; j++)
        for (int i = 1; i < rank; i++)
            across[(i - 1) + (j - 1) * (rank - 1)] = A[i + j * rank];
    memory_free(A);
    return LB_OK;
}

static double trivial_error_of(const shooting *shot, int rank)
{
    double error = 0, length = 0;
    for (int i = 0; i < rank; i++) {
        double moved = 0;
        for (int j = 0; j < rank; j++)
            moved += shot->map[i + j * rank] * shot->flow[j];
        error = hypot(error, moved - shot->flow[i]);
        length = hypot(length, shot->flow[i]);
    }
    return error / length;
}

static void sort_by_size(int count, lb_complex *values)
{
    for (int i = 1; i < count; i++) {
        lb_complex value = values[i];
        double size = hypot(value.re, value.im);
        int j = i;
        for (; j > 0 && hypot(values[j - 1].re, values[j - 1].im) < size * (1 - 1e-14); j--)
            values[j] = values[j - 1];
        values[j] = value;
    }
}

lb_status shooting_multipliers(const shooting *shot, int rank, lb_complex *multipliers,
                               double *trivial_error, lb_error *err)
{
    size_t m = (size_t)rank - 1;
    double *across = memory_array(m * m, sizeof *across), *h = memory_array((size_t)rank, sizeof *h);
    lb_status status = across && h ? LB_OK : status_no_memory(err);
    if (status == LB_OK)
        status = map_across(shot, rank, across, h, err);
    if (status == LB_OK)
        status = linalg_eigenvalues(rank - 1, across, multipliers, NULL, err);
    if (status == LB_OK) {
        sort_by_size(rank - 1, multipliers);
        *trivial_error = trivial_error_of(shot, rank);
    }
    memory_free(across);
    memory_free(h);
    return status;
}

lb_status shooting_neutral(const shooting *shot, int rank, double *direction, lb_error *err)
{
    int m = rank - 1, nearest = 0;
    size_t size = (size_t)m * (size_t)m;
    double *across = memory_array(size, sizeof *across), *vectors = memory_array(size, sizeof *vectors);
    double *h = memory_array((size_t)rank, sizeof *h);
    lb_complex *values = memory_array((size_t)m, sizeof *values);
    lb_status status = across && vectors && h && values ? LB_OK : status_no_memory(err);
    if (status == LB_OK)
        status = map_across(shot, rank, across, h, err);
    if (status == LB_OK)
        status = linalg_eigenvalues(m, across, values, vectors, err);
    if (status == LB_OK) {
        for (int i = 1; i < m; i++)
            if (hypot(values[i].re - 1, values[i].im) < hypot(values[nearest].re - 1, values[nearest].im))
                nearest = i;
        double dot = 0, length = 0;
        direction[0] = 0;
        for (int i = 0; i < m; i++)
            direction[i + 1] = vectors[i + nearest * m];
        for (int i = 0; i < rank; i++) {
            dot += h[i] * direction[i];
            length = hypot(length, direction[i]);
        }
        for (int i = 0; i < rank; i++)
            direction[i] = (direction[i] - 2 * dot * h[i]) / length;
    }
    memory_free(across);
    memory_free(vectors);
    memory_free(h);
    memory_free(values);
    return status;
}
