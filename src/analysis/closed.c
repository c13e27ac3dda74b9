/* A closed orbit: closed, measured, judged.
 *
 * Order of work: one loose loop gives the amplitudes that scale everything; the
 * method is the explicit one unless it needs far more steps than the stiff one;
 * the start moves along the loop to a well-conditioned phase; shooting closes it;
 * a repeat within the period is looked for; a last loop without tangents measures
 * extrema and closure. */
#include "analysis/closed.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

#define LOOSE 1e-7                /* tolerance of the loops that only show the way */
#define GOAL 1e-8                 /* residual of the shooting, in amplitudes */
#define CLOSED 1e-9               /* closure of an orbit that is reported, in amplitudes */
#define FLAT 1e-8                 /* largest relative swing below which there is only noise */
#define STIFF_RATIO 12            /* the stiff method does this many times the work of a step */

static lb_status prepare(closed_orbit *c, lb_evaluator *evaluator, const double *x, lb_error *err)
{
    memset(c, 0, sizeof *c);
    lb_status status = space_init(&c->s, evaluator, x, err);
    if (status != LB_OK)
        return status;
    size_t n = (size_t)c->s.n;
    c->x = memory_array(4 * n, sizeof *c->x);
    c->multipliers = memory_array((size_t)c->s.rank, sizeof *c->multipliers);
    if (!c->x || !c->multipliers)
        return status_no_memory(err);
    c->low = c->x + n;
    c->high = c->x + 2 * n;
    c->scale = c->x + 3 * n;
    memcpy(c->x, x, n * sizeof *x);
    return LB_OK;
}

void closed_clear(closed_orbit *c)
{
    space_clear(&c->s);
    memory_free(c->x);
    memory_free(c->multipliers);
    shooting_clear(&c->shot);
    memset(c, 0, sizeof *c);
}

/* A failed integration means only that there is no orbit to be had here. */
static bool is_fatal(lb_status status)
{
    return status == LB_E_NOMEM || status == LB_E_STOPPED;
}

static orbit_options with(const closed_orbit *c, double tolerance, const lb_monitor *monitor)
{
    return (orbit_options){.tolerance = tolerance, .method = c->method, .monitor = monitor};
}

/* The range of the loop from c->x, and which method goes around it for less. */
static lb_status survey(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    size_t steps;
    orbit_options options = {.tolerance = LOOSE, .method = LB_METHOD_STIFF, .monitor = monitor};
    lb_status status = orbit_measure(&c->s, c->x, c->period, &options, c->low, c->high, NULL, &steps, err);
    if (status != LB_OK)
        return status;
    orbit_scale(&c->s, c->low, c->high, c->scale);
    options.method = LB_METHOD_EXPLICIT;
    options.max_steps = STIFF_RATIO * steps;
    status = orbit_measure(&c->s, c->x, c->period, &options, c->low, c->high, NULL, NULL, err);
    c->method = status == LB_OK ? LB_METHOD_EXPLICIT : LB_METHOD_STIFF;
    return is_fatal(status) ? status : LB_OK;
}

static lb_status shoot(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    orbit_options options = with(c, c->tolerance, monitor);
    shooting_clear(&c->shot);
    lb_status status = shooting_close(&c->s, c->x, &c->period, c->scale, NULL, GOAL, &options, &c->shot, err);
    c->converged = status == LB_OK && c->shot.converged;
    return status;
}

/* Replace the period by the least one. */
static lb_status reduce_period(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    int divisor;
    orbit_options options = with(c, LOOSE, monitor);
    lb_status status = orbit_divisor(&c->s, c->x, c->period, c->scale, &options, &divisor, err);
    if (status != LB_OK || divisor == 1)
        return status;
    c->period /= divisor;
    return shoot(c, monitor, err);
}

/* No species moves by more than noise: the orbit has shrunk to a steady state. */
static bool is_flat(const closed_orbit *c)
{
    for (int k = 0; k < c->s.core; k++) {
        int i = c->s.system->core_state[k];
        if (c->high[i] - c->low[i] > FLAT * fmax(fabs(c->high[i]), fabs(c->low[i])))
            return false;
    }
    return true;
}

/* Extrema and closure of the orbit found; false into converged when it has shrunk to
 * a point or does not close. */
static lb_status measure(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    double *end = memory_array((size_t)c->s.n, sizeof *end);
    if (!end)
        return status_no_memory(err);
    orbit_options options = with(c, c->tolerance, monitor);
    lb_status status = orbit_measure(&c->s, c->x, c->period, &options, c->low, c->high, end, &c->steps, err);
    if (status == LB_OK) {
        orbit_scale(&c->s, c->low, c->high, c->scale);
        c->closure = space_distance(&c->s, end, c->x, c->scale);
        c->converged = !is_flat(c) && c->closure < CLOSED;
    }
    memory_free(end);
    return status;
}

static lb_status judge(closed_orbit *c, lb_error *err)
{
    double trivial_error;
    lb_status status = shooting_multipliers(&c->shot, c->s.rank, c->multipliers, &trivial_error, err);
    if (status != LB_OK)
        return status;
    c->multiplier_error = fmax(1e-7, 10 * trivial_error);
    c->stable = LB_YES;
    for (int i = 0; i < c->s.rank - 1; i++) {
        double size = hypot(c->multipliers[i].re, c->multipliers[i].im);
        if (size > 1 + c->multiplier_error)
            c->stable = LB_NO;
        else if (size > 1 - c->multiplier_error && c->stable == LB_YES)
            c->stable = LB_UNDECIDED;
    }
    return LB_OK;
}

static lb_status close_and_judge(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    lb_status status = survey(c, monitor, err);
    if (status == LB_OK) {
        orbit_options options = with(c, c->tolerance, monitor);
        status = orbit_phase(&c->s, c->x, c->period, c->scale, &options, err);
    }
    if (status == LB_OK)
        status = shoot(c, monitor, err);
    if (status == LB_OK && c->converged)
        status = reduce_period(c, monitor, err);
    if (status == LB_OK && c->converged)
        status = measure(c, monitor, err);
    if (status == LB_OK && c->converged)
        status = judge(c, err);
    return status;
}

lb_status closed_find(closed_orbit *c, lb_evaluator *evaluator, const double *x, double period,
                      double tolerance, const lb_monitor *monitor, lb_error *err)
{
    lb_status status = prepare(c, evaluator, x, err);
    if (status != LB_OK)
        return status;
    c->period = period;
    c->tolerance = tolerance;
    if (c->s.rank < 2)
        return LB_OK;
    status = close_and_judge(c, monitor, err);
    if (status != LB_OK)
        c->converged = false;
    return is_fatal(status) ? status : LB_OK;
}

/* ---- A second path ----------------------------------------------------------------- */

#define PUSH 0.02                 /* in amplitudes */
#define FEW_PERIODS 6             /* to wait for a trajectory to fall back, in a small system */
#define OTHER_TOLERANCE 100       /* times the first one */

/* c->x moved by PUSH amplitudes, species in turn up and down, halved until inside. */
static void push(const closed_orbit *c, double *y, double *x)
{
    double size = PUSH;
    do {
        space_take(&c->s, c->x, y);
        for (int i = 0; i < c->s.rank; i++)
            y[i] += (i % 2 ? -size : size) * c->scale[space_state(&c->s, i)];
        space_place(&c->s, y, x);
        size *= 0.5;
    } while (!space_is_inside(&c->s, x) && size > 1e-6);
}

/* How many periods it takes until what is left of the push is below the closure. */
static double periods_to_forget(const closed_orbit *c)
{
    double size = hypot(c->multipliers[0].re, c->multipliers[0].im);
    return size > 0 ? fmax(1, ceil(log(CLOSED / PUSH) / log(size))) : 1;
}

/* Period from the flow alone: after some periods, the time until the trajectory comes
 * back to the plane across the flow where it was; NAN when it does not. */
static lb_status period_by_return(const closed_orbit *c, integrator *it, double periods, double *weight,
                                  double *x, double *period, lb_error *err)
{
    bool found = false;
    double level = 0;
    *period = NAN;
    integrator_start(it, 0, x);
    lb_status status = integrator_to(it, periods * c->period, err);
    if (status != LB_OK)
        return status;
    memcpy(x, integrator_state(it), (size_t)c->s.n * sizeof *x);
    lb_rhs(c->s.evaluator, x, weight);
    for (int i = 0; i < c->s.n; i++) {
        bool is_core = c->s.system->core_index[i] >= 0;
        weight[i] = is_core ? weight[i] / (c->scale[i] * c->scale[i]) : 0;
        level += weight[i] * x[i];
    }
    integrator_start(it, 0, x);
    status = integrator_to(it, 0.9 * c->period, err);
    while (status == LB_OK && !found && integrator_time(it) < 1.1 * c->period) {
        status = integrator_step(it, 1.1 * c->period, err);
        if (status == LB_OK)
            status = integrator_crossing(it, weight, level, +1, &found, period, x, err);
    }
    if (status != LB_OK || !found)
        *period = NAN;
    return status;
}

/* Period by shooting again from x. */
static lb_status period_by_shooting(const closed_orbit *c, double *x, const orbit_options *options,
                                    double *period, lb_error *err)
{
    shooting shot = {.converged = false};
    *period = c->period;
    lb_status status = shooting_close(&c->s, x, period, c->scale, NULL, 100 * GOAL, options, &shot, err);
    if (status != LB_OK || !shot.converged)
        *period = NAN;
    shooting_clear(&shot);
    return status;
}

/* From the pushed state x: an attracting orbit is fallen back to, which needs no
 * tangents and is cheap in large systems; where that takes long, two periods and
 * then shooting; an orbit that does not attract, shooting alone. */
static lb_status second_path(const closed_orbit *c, double *x, double *weight, const orbit_options *options,
                             double *period, lb_error *err)
{
    integrator *it = NULL;
    integrator_options how = {.tolerance = options->tolerance, .method = options->method,
                              .allow_negative = true, .monitor = options->monitor};
    double periods = c->stable == LB_YES ? periods_to_forget(c) : INFINITY;
    lb_status status = integrator_new(c->s.evaluator, &how, &it, err);
    if (status == LB_OK && periods <= fmax(FEW_PERIODS, c->s.rank)) {
        status = period_by_return(c, it, periods, weight, x, period, err);
    } else if (status == LB_OK) {
        integrator_start(it, 0, x);
        status = c->stable == LB_YES ? integrator_to(it, 2 * c->period, err) : LB_OK;
        memcpy(x, integrator_state(it), (size_t)c->s.n * sizeof *x);
        if (status == LB_OK)
            status = period_by_shooting(c, x, options, period, err);
    }
    integrator_free(it);
    if (status != LB_OK)
        *period = NAN;
    return is_fatal(status) ? status : LB_OK;
}

lb_status closed_confirm(const closed_orbit *c, const lb_monitor *monitor, double *difference, lb_error *err)
{
    double *x = memory_array((size_t)(2 * c->s.n + c->s.rank), sizeof *x), period;
    *difference = NAN;
    if (!x)
        return status_no_memory(err);
    orbit_options options = {.tolerance = OTHER_TOLERANCE * c->tolerance, .method = LB_METHOD_STIFF,
                             .monitor = monitor};
    push(c, x + 2 * c->s.n, x);
    lb_status status = second_path(c, x, x + c->s.n, &options, &period, err);
    if (status == LB_OK)
        *difference = fabs(period - c->period) / c->period;
    memory_free(x);
    return status;
}

/* ---- Families ---------------------------------------------------------------------- */

#define FAMILY_STEP 0.1           /* in amplitudes */

/* Is there a closed orbit through the place `step` amplitudes along the neutral
 * direction?  The point is held there while it is closed: an orbit that stands
 * alone then leaves a residual. */
static lb_status closes_beside(const closed_orbit *c, const double *direction, double step,
                               const lb_monitor *monitor, bool *closes, lb_error *err)
{
    double *y = memory_array((size_t)(c->s.rank + c->s.n), sizeof *y), period = c->period;
    shooting shot = {.converged = false};
    *closes = false;
    if (!y)
        return status_no_memory(err);
    double *x = y + c->s.rank;
    space_take(&c->s, c->x, y);
    for (int i = 0; i < c->s.rank; i++)
        y[i] += step * direction[i] * c->scale[space_state(&c->s, i)];
    space_place(&c->s, y, x);
    orbit_options options = with(c, c->tolerance, monitor);
    lb_status status = shooting_close(&c->s, x, &period, c->scale, direction, CLOSED, &options, &shot, err);
    *closes = status == LB_OK && shot.converged;
    shooting_clear(&shot);
    memory_free(y);
    return status;
}

lb_status closed_is_family(const closed_orbit *c, const lb_monitor *monitor, bool *is_family, lb_error *err)
{
    double nearest = INFINITY;
    *is_family = false;
    for (int i = 0; i < c->s.rank - 1; i++)
        nearest = fmin(nearest, hypot(c->multipliers[i].re - 1, c->multipliers[i].im));
    if (!(nearest <= fmax(1e-6, c->multiplier_error)))
        return LB_OK;
    double *direction = memory_array((size_t)c->s.rank, sizeof *direction);
    if (!direction)
        return status_no_memory(err);
    bool closes = false;
    lb_status status = shooting_neutral(&c->shot, c->s.rank, direction, err);
    if (status == LB_OK)
        status = closes_beside(c, direction, FAMILY_STEP, monitor, &closes, err);
    if (status == LB_OK && closes)
        status = closes_beside(c, direction, -FAMILY_STEP, monitor, &closes, err);
    *is_family = status == LB_OK && closes;
    memory_free(direction);
    return status;
}

/* ---- The record ---------------------------------------------------------------------- */

static lb_status fill(const closed_orbit *c, lb_cycle *cycle, lb_error *err)
{
    size_t n = (size_t)c->s.n;
    cycle->states = c->s.n;
    cycle->multiplier_count = c->s.rank - 1;
    cycle->x = memory_array(n, sizeof(double));
    cycle->low = memory_array(n, sizeof(double));
    cycle->high = memory_array(n, sizeof(double));
    cycle->multipliers = memory_array((size_t)cycle->multiplier_count, sizeof(lb_complex));
    if (!cycle->x || !cycle->low || !cycle->high || !cycle->multipliers)
        return status_no_memory(err);
    memcpy(cycle->x, c->x, n * sizeof(double));
    memcpy(cycle->low, c->low, n * sizeof(double));
    memcpy(cycle->high, c->high, n * sizeof(double));
    memcpy(cycle->multipliers, c->multipliers, (size_t)cycle->multiplier_count * sizeof(lb_complex));
    return LB_OK;
}

lb_status closed_record(const closed_orbit *c, double confirmed, lb_cycle **out, lb_error *err)
{
    lb_cycle *cycle = memory_zeroed(1, sizeof *cycle);
    *out = NULL;
    if (!cycle)
        return status_no_memory(err);
    cycle->period = c->period;
    cycle->stable = c->stable;
    cycle->closure = c->closure;
    cycle->confirmed = confirmed;
    cycle->steps = c->steps;
    cycle->method = c->method == LB_METHOD_EXPLICIT
                        ? "Newton shooting with an explicit Runge-Kutta method, confirmed with a stiff one"
                        : "Newton shooting with a stiff Rosenbrock method, confirmed at another tolerance";
    lb_status status = fill(c, cycle, err);
    if (status == LB_OK)
        *out = cycle;
    else
        lb_cycle_free(cycle);
    return status;
}
