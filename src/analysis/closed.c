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
#define FLAT 1e-8                 /* largest relative swing below which there is only noise */
#define LOOSE_GOAL 1e-5           /* residual of the shooting with that tolerance */
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

bool closed_is_fatal(lb_status status)
{
    return status == LB_E_NOMEM || status == LB_E_STOPPED;
}

orbit_options closed_options(const closed_orbit *c, double tolerance, const lb_monitor *monitor)
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
    status = orbit_follow(&c->s, c->x, c->period, &options, err);
    c->method = status == LB_OK ? LB_METHOD_EXPLICIT : LB_METHOD_STIFF;
    return closed_is_fatal(status) ? status : LB_OK;
}

static lb_status shoot_with(closed_orbit *c, double tolerance, double goal, const lb_monitor *monitor, lb_error *err)
{
    orbit_options options = closed_options(c, tolerance, monitor);
    shooting_clear(&c->shot);
    lb_status status = shooting_close(&c->s, c->x, &c->period, c->scale, NULL, goal, &options, &c->shot, err);
    c->converged = status == LB_OK && c->shot.converged;
    return status;
}

/* Most of the way with a loose tolerance, at a fraction of the cost, then the rest;
 * but an orbit through a given point of a family would slide off it. */
static lb_status shoot(closed_orbit *c, bool keeps_start, const lb_monitor *monitor, lb_error *err)
{
    lb_status status = LB_OK;
    c->converged = true;
    if (!keeps_start)
        status = shoot_with(c, fmax(LOOSE, c->tolerance), LOOSE_GOAL, monitor, err);
    return c->converged ? shoot_with(c, c->tolerance, CLOSED_GOAL, monitor, err) : status;
}

/* Replace the period by the least one. */
static lb_status reduce_period(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    int divisor;
    orbit_options options = closed_options(c, LOOSE, monitor);
    lb_status status = orbit_divisor(&c->s, c->x, c->period, c->scale, &options, &divisor, err);
    if (status != LB_OK || divisor == 1)
        return status;
    c->period /= divisor;
    return shoot(c, true, monitor, err);
}

static double growth_of(const closed_orbit *c)
{
    double growth = 0;
    for (int k = 0; k < c->s.core; k++) {
        int i = c->s.system->core_state[k];
        growth = fmax(growth, (c->high[i] - c->low[i]) / c->scale[i]);
    }
    return growth;
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

/* No unsigned species falls below zero by more than the closure. */
static bool stays_inside(const closed_orbit *c)
{
    const lb_network *net = c->s.system->network;
    for (int k = 0; k < c->s.core; k++) {
        int i = c->s.system->core_state[k];
        if (c->low[i] < -CLOSED_CLOSURE * c->scale[i] && !net->species[net->state_species[i]].is_signed)
            return false;
    }
    return true;
}

/* Extrema and closure of the orbit found; false into converged when it has shrunk to
 * a point, leaves the orthant or does not close. */
static lb_status measure(closed_orbit *c, const lb_monitor *monitor, lb_error *err)
{
    double *end = memory_array((size_t)c->s.n, sizeof *end);
    if (!end)
        return status_no_memory(err);
    orbit_options options = closed_options(c, c->tolerance, monitor);
    lb_status status = orbit_measure(&c->s, c->x, c->period, &options, c->low, c->high, end, &c->steps, err);
    if (status == LB_OK) {
        c->growth = growth_of(c);
        orbit_scale(&c->s, c->low, c->high, c->scale);
        c->closure = space_distance(&c->s, end, c->x, c->scale);
        c->converged = !is_flat(c) && stays_inside(c) && c->closure < CLOSED_CLOSURE;
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

static lb_status close_and_judge(closed_orbit *c, bool keeps_start, const lb_monitor *monitor, lb_error *err)
{
    lb_status status = survey(c, monitor, err);
    if (status == LB_OK) {
        orbit_options options = closed_options(c, c->tolerance, monitor);
        status = orbit_phase(&c->s, c->x, c->period, c->scale, &options, err);
    }
    if (status == LB_OK)
        status = shoot(c, keeps_start, monitor, err);
    if (status == LB_OK && c->converged)
        status = reduce_period(c, monitor, err);
    if (status == LB_OK && c->converged)
        status = measure(c, monitor, err);
    if (status == LB_OK && c->converged)
        status = judge(c, err);
    return status;
}

lb_status closed_find(closed_orbit *c, lb_evaluator *evaluator, const double *x, double period,
                      bool keeps_start, double tolerance, const lb_monitor *monitor, lb_error *err)
{
    lb_status status = prepare(c, evaluator, x, err);
    if (status != LB_OK)
        return status;
    c->period = period;
    c->tolerance = tolerance;
    if (c->s.rank < 2)
        return LB_OK;
    status = close_and_judge(c, keeps_start, monitor, err);
    if (status != LB_OK)
        c->converged = false;
    return closed_is_fatal(status) ? status : LB_OK;
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

/* What was done, in words. */
static const char *method_text(bool is_stiff, bool is_family, bool is_confirmed)
{
    if (is_family && is_confirmed)
        return is_stiff ? "Newton shooting with a stiff Rosenbrock method, from the start and to both sides of its "
                          "orbit, each followed for several turns without a drift; closed again at another tolerance"
                        : "Newton shooting with an explicit Runge-Kutta method, from the start and to both sides of "
                          "its orbit, each followed for many turns without a drift; closed again with a stiff one";
    if (is_family)
        return is_stiff ? "Newton shooting with a stiff Rosenbrock method, from the start and to both sides of its "
                          "orbit, each followed for several turns without a drift"
                        : "Newton shooting with an explicit Runge-Kutta method, from the start and to both sides of "
                          "its orbit, each followed for many turns without a drift";
    if (!is_confirmed)
        return is_stiff ? "Newton shooting with a stiff Rosenbrock method"
                        : "Newton shooting with an explicit Runge-Kutta method";
    return is_stiff ? "Newton shooting with a stiff Rosenbrock method, confirmed at another tolerance"
                    : "Newton shooting with an explicit Runge-Kutta method, confirmed with a stiff one";
}

lb_status closed_record(const closed_orbit *c, bool is_family, double confirmed, lb_cycle **out, lb_error *err)
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
    cycle->method = method_text(c->method == LB_METHOD_STIFF, is_family, isfinite(confirmed));
    lb_status status = fill(c, cycle, err);
    if (status == LB_OK)
        *out = cycle;
    else
        lb_cycle_free(cycle);
    return status;
}
