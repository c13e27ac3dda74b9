/* Does the amplitude hold from turn to turn?
 *
 * From a point of an orbit the flow is followed for TURNS returns to the plane across
 * the flow there.  What the return has moved by is told from the integration's own error
 * by doing it again at a looser tolerance: on a closed orbit the first is not larger
 * than the second.  The stiff method, which errs in another way, must come back within
 * what it can resolve. */
#include "analysis/drift.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

enum {
    TURNS_BEFORE = 3,
    TURNS = 24,
    TURNS_STIFF = 6,
    MOST_STEPS = 20,              /* of those that the closing took, per turn */
    STIFF_STEPS = 20              /* times as many with the stiff method */
};

#define TIGHT 1e-13
#define LOOSER 10                 /* times the tolerance */
#define STIFF_TOLERANCE 1e-11
#define ROUNDING 20               /* units in the last place of the largest species, per turn */
#define MARGIN 5                  /* the drift is resolved when this many times the error */
#define COARSE 1e-10              /* amplitudes per turn: an error of that size decides nothing */
#define STIFF_RESOLVES 1e-7       /* amplitudes per turn */

/* One return from x [n] to the plane across the flow there; x and *period move on, or
 * *period is NAN when none comes within a tenth of the period. */
static lb_status turn_once(integrator *it, const double *weight, double level, double *x, double *period,
                           lb_error *err)
{
    double first = 0.9 * *period, last = 1.1 * *period;
    bool found = false;
    integrator_start(it, 0, x);
    lb_status status = integrator_to(it, first, err);
    while (status == LB_OK && !found && integrator_time(it) < last) {
        status = integrator_step(it, last, err);
        if (status == LB_OK)
            status = integrator_crossing(it, weight, level, +1, &found, period, x, err);
    }
    if (!found)
        *period = NAN;
    return status;
}

/* The plane across the flow at x, in amplitudes. */
static double lay_plane(const closed_orbit *c, const double *x, double *weight)
{
    double level = 0;
    lb_rhs(c->s.evaluator, x, weight);
    for (int i = 0; i < c->s.n; i++) {
        weight[i] = c->s.system->core_index[i] >= 0 ? weight[i] / (c->scale[i] * c->scale[i]) : 0;
        level += weight[i] * x[i];
    }
    return level;
}

/* Where x [n] has come after so many returns, into end [n]; NAN when it does not return. */
static lb_status turn(const closed_orbit *c, const double *x, double period, int turns, const orbit_options *options,
                      double *weight, double *end, lb_error *err)
{
    integrator *it = NULL;
    integrator_options how = {.tolerance = options->tolerance, .method = options->method,
                              .max_steps = options->max_steps, .allow_negative = true,
                              .monitor = options->monitor};
    double level = lay_plane(c, x, weight);
    memcpy(end, x, (size_t)c->s.n * sizeof *end);
    lb_status status = integrator_new(c->s.evaluator, &how, &it, err);
    for (int k = 0; k < turns && status == LB_OK && isfinite(period); k++)
        status = turn_once(it, weight, level, end, &period, err);
    if (status != LB_OK || !isfinite(period))
        for (int i = 0; i < c->s.n; i++)
            end[i] = NAN;
    integrator_free(it);
    return closed_is_fatal(status) ? status : LB_OK;
}

static bool all_finite(const double *x, size_t n)
{
    for (size_t i = 0; i < n; i++)
        if (!isfinite(x[i]))
            return false;
    return true;
}

/* Rounding over one turn, in amplitudes. */
static double rounding(const closed_orbit *c)
{
    double worst = 1;
    for (int k = 0; k < c->s.core; k++) {
        int i = c->s.system->core_state[k];
        worst = fmax(worst, fmax(fabs(c->low[i]), fabs(c->high[i])) / c->scale[i]);
    }
    return ROUNDING * DBL_EPSILON * worst;
}

lb_status drift_judge(const closed_orbit *c, const double *x, double period, const lb_monitor *monitor,
                      lb_answer *holds, lb_error *err)
{
    size_t n = (size_t)c->s.n;
    double *block = memory_array(5 * n, sizeof *block);
    *holds = LB_UNDECIDED;
    if (!block)
        return status_no_memory(err);
    double *from = block, *tight = block + n, *loose = block + 2 * n, *other = block + 3 * n, *weight = block + 4 * n;
    bool is_stiff = c->method == LB_METHOD_STIFF;
    int turns = is_stiff ? TURNS_STIFF : TURNS;
    orbit_options options = closed_options(c, is_stiff ? STIFF_TOLERANCE : TIGHT, monitor);
    options.max_steps = MOST_STEPS * (c->steps + 100);

    /* What still falls back to the family is not to be taken for drift. */
    lb_status status = turn(c, x, period, TURNS_BEFORE, &options, weight, from, err);
    if (status == LB_OK)
        status = turn(c, from, period, turns, &options, weight, tight, err);
    options.tolerance *= LOOSER;
    if (status == LB_OK)
        status = turn(c, from, period, turns, &options, weight, loose, err);
    options.tolerance = STIFF_TOLERANCE;
    options.method = LB_METHOD_STIFF;
    options.max_steps *= STIFF_STEPS;
    if (status == LB_OK)
        status = turn(c, from, period, TURNS_STIFF, &options, weight, other, err);

    double drift = space_distance(&c->s, tight, from, c->scale) / turns;
    double error = fmax(space_distance(&c->s, tight, loose, c->scale) / turns, rounding(c));
    double apart = space_distance(&c->s, other, from, c->scale) / TURNS_STIFF;
    bool is_known = all_finite(tight, n) && all_finite(loose, n) && all_finite(other, n) && error < COARSE;
    if (status == LB_OK && is_known && drift > MARGIN * error)
        *holds = LB_NO;
    else if (status == LB_OK && is_known && apart < STIFF_RESOLVES)
        *holds = LB_YES;
    memory_free(block);
    return status;
}
