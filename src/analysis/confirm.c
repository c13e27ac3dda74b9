/* Is a closed orbit what it seems?
 *
 * A second path to the period: another tolerance, another method unless the orbit is
 * stiff, and a start pushed off the orbit.  And the question whether it stands alone:
 * where a multiplier is one within its error, closed orbits are sought on both sides
 * of it, at a distance that is held, and all three must hold their amplitude from turn
 * to turn (drift.c). */
#include "analysis/confirm.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/drift.h"
#include "base/memory.h"
#include "base/status.h"

enum { MOST_STEPS = 20 };         /* of those that the closing took: an orbit beside it does not take many more */

#define PUSH 0.02                 /* in amplitudes */
#define WRONG_PERIOD 1e-3         /* relative */
#define FEW_PERIODS 6             /* to wait for a trajectory to fall back, in a small system */
#define OTHER_TOLERANCE 100       /* times the first one */
#define FAMILY_STEP 0.1           /* in amplitudes */
#define LEAST_FAMILY_STEP 1e-4
#define FAMILY_TOLERANCE 1e-12
#define FAMILY_CLOSURE 1e-11      /* in amplitudes */

/* ---- A second path ------------------------------------------------------------------ */

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
    return size > 0 ? fmax(1, ceil(log(CLOSED_CLOSURE / PUSH) / log(size))) : 1;
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

/* Period by shooting again from x, and from a wrong period: shooting that begins at the
 * answer would return it. */
static lb_status period_by_shooting(const closed_orbit *c, double *x, const double *hold,
                                    const orbit_options *options, double *period, lb_error *err)
{
    shooting shot = {.converged = false};
    *period = c->period * (1 + WRONG_PERIOD);
    lb_status status = shooting_close(&c->s, x, period, c->scale, hold, 100 * CLOSED_GOAL, options, &shot, err);
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
            status = period_by_shooting(c, x, NULL, options, period, err);
    }
    integrator_free(it);
    if (status != LB_OK)
        *period = NAN;
    return closed_is_fatal(status) ? status : LB_OK;
}

/* An orbit of a family, from where it is, with the point held. */
static lb_status second_path_in_family(const closed_orbit *c, double *x, double *direction,
                                       const orbit_options *options, double *period, lb_error *err)
{
    memcpy(x, c->x, (size_t)c->s.n * sizeof *x);
    lb_status status = shooting_neutral(&c->shot, c->s.rank, direction, err);
    if (status == LB_OK)
        status = period_by_shooting(c, x, direction, options, period, err);
    if (status != LB_OK)
        *period = NAN;
    return closed_is_fatal(status) ? status : LB_OK;
}

lb_status confirm_period(const closed_orbit *c, bool is_family, const lb_monitor *monitor, double *difference,
                         lb_error *err)
{
    double *x = memory_array((size_t)(2 * c->s.n + c->s.rank), sizeof *x), period;
    *difference = NAN;
    if (!x)
        return status_no_memory(err);
    double *weight = x + c->s.n, *y = weight + c->s.n;
    orbit_options options = {.tolerance = OTHER_TOLERANCE * c->tolerance, .method = LB_METHOD_STIFF,
                             .monitor = monitor};
    if (!is_family)
        push(c, y, x);
    lb_status status = is_family ? second_path_in_family(c, x, y, &options, &period, err)
                                 : second_path(c, x, weight, &options, &period, err);
    if (status == LB_OK)
        *difference = fabs(period - c->period) / c->period;
    memory_free(x);
    return status;
}

/* ---- Families ---------------------------------------------------------------------- */

/* How well it must close: as well as the tolerance allows, and rounding where the
 * amplitude is small. */
static double family_closure(const closed_orbit *c)
{
    double worst = 0;
    for (int k = 0; k < c->s.core; k++) {
        int i = c->s.system->core_state[k];
        worst = fmax(worst, fmax(fabs(c->low[i]), fabs(c->high[i])) / c->scale[i]);
    }
    return fmax(FAMILY_CLOSURE, 1000 * DBL_EPSILON * worst);
}

/* x [n], y [rank]: the place `step` amplitudes along the neutral direction, or half as far and
 * so on until it is inside. */
static void step_aside(const closed_orbit *c, const double *direction, double step, double *y, double *x)
{
    do {
        space_take(&c->s, c->x, y);
        for (int i = 0; i < c->s.rank; i++)
            y[i] += step * direction[i] * c->scale[space_state(&c->s, i)];
        space_place(&c->s, y, x);
        step *= 0.5;
    } while (!space_is_inside(&c->s, x) && fabs(step) > LEAST_FAMILY_STEP);
}

/* Is there a closed orbit through the place `step` amplitudes along the neutral
 * direction, and does it hold its amplitude?  The point is held there while it is
 * closed: an orbit that stands alone then leaves a residual. */
static lb_status closes_beside(const closed_orbit *c, const double *direction, double step,
                               const lb_monitor *monitor, bool *closes, lb_error *err)
{
    double *y = memory_array((size_t)(c->s.rank + c->s.n), sizeof *y), period = c->period;
    shooting shot = {.converged = false};
    lb_answer holds = LB_UNDECIDED;
    *closes = false;
    if (!y)
        return status_no_memory(err);
    double *x = y + c->s.rank;
    step_aside(c, direction, step, y, x);
    orbit_options options = closed_options(c, FAMILY_TOLERANCE, monitor);
    options.max_steps = MOST_STEPS * (c->steps + 100);
    lb_status status = shooting_close(&c->s, x, &period, c->scale, direction, family_closure(c), &options, &shot, err);
    if (status == LB_OK && shot.converged)
        status = drift_judge(c, x, period, monitor, &holds, err);
    *closes = status == LB_OK && holds == LB_YES;
    shooting_clear(&shot);
    memory_free(y);
    return status;
}

lb_status confirm_is_family(const closed_orbit *c, const lb_monitor *monitor, bool *is_family, lb_error *err)
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
    lb_answer holds = LB_UNDECIDED;
    lb_status status = shooting_neutral(&c->shot, c->s.rank, direction, err);
    if (status == LB_OK)
        status = drift_judge(c, c->x, c->period, monitor, &holds, err);
    if (status == LB_OK && holds == LB_YES)
        status = closes_beside(c, direction, FAMILY_STEP, monitor, &closes, err);
    if (status == LB_OK && closes)
        status = closes_beside(c, direction, -FAMILY_STEP, monitor, &closes, err);
    *is_family = status == LB_OK && closes;
    memory_free(direction);
    return status;
}
