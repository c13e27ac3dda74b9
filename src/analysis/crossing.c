/* Where a step crosses a linear section g(x) = weight.x - level = 0.
 *
 * The signs of g at the ends of the step bracket a crossing.  A step is long
 * with a method of high order, and may cross twice: the extrema of the cubic
 * through g and its slope at both ends split the step into at most three pieces
 * first.  Within a piece Newton's method on g(x(t)), with the slope weight.f(x), is
 * kept in its bracket by bisection; x(t) is the dense output, then, for the stiff
 * method, a step of its own, so that the point is as good as a step's end.
 *
 * Source: M. Henon, Physica D 5 (1982) 412, for the idea of ending a step on a
 * section; Newton with bisection as usual. */
#include <float.h>
#include <math.h>

#include "analysis/integrate.h"
#include "base/memory.h"
#include "base/status.h"

typedef struct section {
    integrator *it;
    const double *weight;
    double level;
    double *x, *f;              /* [n]: the caller's result; workspace */
    int n;
} section;

static double height(const section *s, const double *x)
{
    double sum = -s->level;
    for (int i = 0; i < s->n; i++)
        sum += s->weight[i] * x[i];
    return sum;
}

static double slope(const section *s, const double *x)
{
    double sum = 0;
    lb_rhs(integrator_evaluator(s->it), x, s->f);
    for (int i = 0; i < s->n; i++)
        sum += s->weight[i] * s->f[i];
    return sum;
}

typedef lb_status (*state_at)(integrator *it, double t, double *x, lb_error *err);

/* Zero of the height between t = a, where it has the sign of at_a, and b; *t is
 * a guess on entry; s->x is the state there. */
static lb_status locate(const section *s, state_at state, double a, double b, double at_a, double *t, lb_error *err)
{
    for (int k = 0; k < 200; k++) {
        lb_status status = state(s->it, *t, s->x, err);
        if (status != LB_OK)
            return status;
        double g = height(s, s->x);
        if (g == 0)
            return LB_OK;
        *((g < 0) == (at_a < 0) ? &a : &b) = *t;
        double next = *t - g / slope(s, s->x);
        if (!(next > a && next < b))
            next = 0.5 * (a + b);
        if (fabs(next - *t) <= 2 * DBL_EPSILON * fabs(*t) || next == a || next == b)
            return LB_OK;
        *t = next;
    }
    return LB_OK;
}

/* Fractions of the step, ascending, where the cubic through height and slope
 * (per step) at both ends has an extremum inside; how many. */
static int extrema(double g0, double g1, double d0, double d1, double fraction[2])
{
    double a = 3 * (2 * g0 - 2 * g1 + d0 + d1), b = 2 * (3 * g1 - 3 * g0 - 2 * d0 - d1), c = d0;
    double discriminant = b * b - 4 * a * c;
    if (!(discriminant > 0))
        return 0;
    double q = -0.5 * (b + copysign(sqrt(discriminant), b));
    double roots[2] = {q / a, c / q};
    if (roots[0] > roots[1]) {
        roots[0] = c / q;
        roots[1] = q / a;
    }
    int count = 0;
    for (int k = 0; k < 2; k++)
        if (roots[k] > 0 && roots[k] < 1)
            fraction[count++] = roots[k];
    return count;
}

static bool is_wanted(double before, double after, int direction)
{
    return (direction >= 0 && before < 0 && after >= 0) || (direction <= 0 && before > 0 && after <= 0);
}

static lb_status find(const section *s, int direction, bool *found, double *t, lb_error *err)
{
    integrator *it = s->it;
    double start = integrator_last_time(it), end = integrator_time(it), step = end - start;
    const double *x0 = integrator_last_state(it), *x1 = integrator_state(it);
    double time[4] = {start}, g[4] = {height(s, x0)}, at_end = height(s, x1), fraction[2];
    int pieces = extrema(g[0], at_end, slope(s, x0) * step, slope(s, x1) * step, fraction) + 1;
    lb_status status = LB_OK;
    for (int k = 1; k < pieces && status == LB_OK; k++) {
        time[k] = start + fraction[k - 1] * step;
        status = integrator_dense(it, time[k], s->x, err);
        g[k] = height(s, s->x);
    }
    time[pieces] = end;
    g[pieces] = at_end;
    for (int k = 0; k < pieces && status == LB_OK; k++) {
        if (!is_wanted(g[k], g[k + 1], direction))
            continue;
        *found = true;
        *t = time[k] + (time[k + 1] - time[k]) * (g[k] / (g[k] - g[k + 1]));
        status = locate(s, integrator_dense, time[k], time[k + 1], g[k], t, err);
        if (status == LB_OK)
            status = locate(s, integrator_restep, time[k], time[k + 1], g[k], t, err);
        break;
    }
    return status;
}

lb_status integrator_crossing(integrator *it, const double *weight, double level, int direction,
                              bool *found, double *t, double *x, lb_error *err)
{
    *found = false;
    int n = evaluator_system(integrator_evaluator(it))->n;
    double *f = memory_array((size_t)n, sizeof *f);
    if (!f)
        return status_no_memory(err);
    section s = {it, weight, level, x, f, n};
    lb_status status = find(&s, direction, found, t, err);
    memory_free(f);
    if (status != LB_OK)
        *found = false;
    return status;
}
