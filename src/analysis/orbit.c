/* What one loop of an orbit looks like.
 *
 * Extrema come from the zeros of dx_i/dt on the integrator's dense output: each
 * step is looked at in two halves, a change of sign is narrowed by the Illinois
 * variant of regula falsi (M. Dowell and P. Jarratt, BIT 11 (1971) 168).  Near
 * an extremum the value depends on the square of the error in time, so the value
 * is as good as the dense output itself. */
#include "analysis/orbit.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

enum { TURN_ITERATIONS = 40, DIVISOR_LIMIT = 64 };

#define TURN_WIDTH 1e-9           /* of the bracket: far below what a flat top can show */
#define DIVISOR_CLOSURE 1e-5      /* back this close, in amplitudes, is a repeat */
#define TYPICAL_SPEED 2.0         /* amplitudes per period: a sine has 2 on average */

lb_status orbit_turn(const orbit_turning *turning, int i, double ta, double fa, double tb, double fb,
                     double *value, lb_error *err)
{
    double width = TURN_WIDTH * (tb - ta), t = ta;
    for (int k = 0; k < TURN_ITERATIONS && tb - ta > width; k++) {
        t = tb - fb * (tb - ta) / (fb - fa);
        if (!(t > ta && t < tb))
            t = 0.5 * (ta + tb);
        lb_status status = integrator_dense(turning->it, t, turning->x, err);
        if (status != LB_OK)
            return status;
        lb_rhs(turning->evaluator, turning->x, turning->f);
        double f = turning->f[i];
        if (f == 0)
            break;
        if ((f > 0) == (fa > 0)) {
            ta = t, fa = f, fb *= 0.5;
        } else {
            tb = t, fb = f, fa *= 0.5;
        }
    }
    lb_status status = integrator_restep(turning->it, t, turning->x, err);
    *value = turning->x[i];
    return status;
}

/* ---- One loop ---------------------------------------------------------------- */

/* Everything that one pass around a loop needs. */
typedef struct loop {
    const space *s;
    orbit_turning turning;
    double *work;                 /* [5n]: turning x and f, three rates */
    double *before, *middle, *after; /* [n] rates at both ends of a step and between */
    double *x_middle;             /* [n] */
} loop;

static void loop_clear(loop *l)
{
    integrator_free(l->turning.it);
    memory_free(l->work);
}

static lb_status loop_start(loop *l, const space *s, const double *x, const orbit_options *options, lb_error *err)
{
    memset(l, 0, sizeof *l);
    l->s = s;
    size_t n = (size_t)s->n;
    l->work = memory_array(6 * n, sizeof *l->work);
    if (!l->work)
        return status_no_memory(err);
    l->turning = (orbit_turning){.evaluator = s->evaluator, .x = l->work, .f = l->work + n};
    l->before = l->work + 2 * n;
    l->middle = l->work + 3 * n;
    l->after = l->work + 4 * n;
    l->x_middle = l->work + 5 * n;
    integrator_options how = {.tolerance = options->tolerance, .method = options->method,
                              .max_steps = options->max_steps, .allow_negative = true,
                              .monitor = options->monitor};
    lb_status status = integrator_new(s->evaluator, &how, &l->turning.it, err);
    if (status != LB_OK)
        return status;
    integrator_start(l->turning.it, 0, x);
    lb_rhs(s->evaluator, x, l->after);
    return LB_OK;
}

/* One step, not beyond t; the rates move on. */
static lb_status loop_step(loop *l, double t, lb_error *err)
{
    lb_status status = integrator_step(l->turning.it, t, err);
    if (status != LB_OK)
        return status;
    double *swap = l->before;
    l->before = l->after;
    l->after = swap;
    lb_rhs(l->s->evaluator, integrator_state(l->turning.it), l->after);
    return LB_OK;
}

static void widen(double value, double *low, double *high)
{
    *low = fmin(*low, value);
    *high = fmax(*high, value);
}

/* Extrema of state i within one half of the last step. */
static lb_status widen_by_turn(loop *l, int i, double ta, double fa, double tb, double fb,
                               double *low, double *high, lb_error *err)
{
    if (!((fa < 0 && fb > 0) || (fa > 0 && fb < 0)))
        return LB_OK;
    double value;
    lb_status status = orbit_turn(&l->turning, i, ta, fa, tb, fb, &value, err);
    if (status == LB_OK)
        widen(value, &low[i], &high[i]);
    return status;
}

static lb_status widen_by_step(loop *l, double *low, double *high, lb_error *err)
{
    const lb_system *system = l->s->system;
    integrator *it = l->turning.it;
    double ta = integrator_last_time(it), tb = integrator_time(it), tm = 0.5 * (ta + tb);
    lb_status status = integrator_dense(it, tm, l->x_middle, err);
    if (status == LB_OK)
        lb_rhs(l->s->evaluator, l->x_middle, l->middle);
    for (int k = 0; k < system->core && status == LB_OK; k++) {
        int i = system->core_state[k];
        widen(integrator_state(it)[i], &low[i], &high[i]);
        status = widen_by_turn(l, i, ta, l->before[i], tm, l->middle[i], low, high, err);
        if (status == LB_OK)
            status = widen_by_turn(l, i, tm, l->middle[i], tb, l->after[i], low, high, err);
    }
    return status;
}

lb_status orbit_measure(const space *s, const double *x, double period, const orbit_options *options,
                        double *low, double *high, double *end, size_t *steps, lb_error *err)
{
    for (int i = 0; i < s->n; i++)
        low[i] = high[i] = s->system->core_index[i] < 0 ? NAN : x[i];
    loop l;
    lb_status status = loop_start(&l, s, x, options, err);
    while (status == LB_OK && integrator_time(l.turning.it) < period) {
        status = loop_step(&l, period, err);
        if (status == LB_OK)
            status = widen_by_step(&l, low, high, err);
    }
    if (status == LB_OK && end)
        memcpy(end, integrator_state(l.turning.it), (size_t)s->n * sizeof *end);
    if (status == LB_OK && steps)
        *steps = integrator_steps(l.turning.it);
    loop_clear(&l);
    return status;
}

lb_status orbit_follow(const space *s, const double *x, double period, const orbit_options *options, lb_error *err)
{
    loop l;
    lb_status status = loop_start(&l, s, x, options, err);
    if (status == LB_OK)
        status = integrator_to(l.turning.it, period, err);
    loop_clear(&l);
    return status;
}

void orbit_scale(const space *s, const double *low, const double *high, double *scale)
{
    double relative = 0;
    for (int i = 0; i < s->n; i++) {
        scale[i] = 1;
        double size = fmax(fabs(low[i]), fabs(high[i]));
        if (s->system->core_index[i] >= 0 && size > 0)
            relative = fmax(relative, (high[i] - low[i]) / size);
    }
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        double size = fmax(fabs(low[i]), fabs(high[i]));
        scale[i] = fmax(fmax(high[i] - low[i], 0.01 * relative * size), DBL_MIN);
    }
}

/* Largest rate in amplitudes per period. */
static double speed(const space *s, const double *f, double period, const double *scale)
{
    double largest = 0;
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        largest = fmax(largest, fabs(f[i]) * period / scale[i]);
    }
    return largest;
}

lb_status orbit_phase(const space *s, double *x, double period, const double *scale,
                      const orbit_options *options, lb_error *err)
{
    loop l;
    double best = INFINITY;
    lb_status status = loop_start(&l, s, x, options, err);
    while (status == LB_OK && integrator_time(l.turning.it) < period) {
        double distance = fabs(log(speed(s, l.after, period, scale) / TYPICAL_SPEED));
        if (distance < best) {
            best = distance;
            memcpy(x, integrator_state(l.turning.it), (size_t)s->n * sizeof *x);
        }
        status = loop_step(&l, period, err);
    }
    loop_clear(&l);
    return status;
}

lb_status orbit_divisor(const space *s, const double *x, double period, const double *scale,
                        const orbit_options *options, int *divisor, lb_error *err)
{
    loop l;
    *divisor = 1;
    lb_status status = loop_start(&l, s, x, options, err);
    for (int q = DIVISOR_LIMIT; q > 1 && status == LB_OK; q--) {
        status = integrator_to(l.turning.it, period / q, err);
        if (status == LB_OK && space_distance(s, integrator_state(l.turning.it), x, scale) < DIVISOR_CLOSURE) {
            *divisor = q;
            break;
        }
    }
    loop_clear(&l);
    return status;
}
