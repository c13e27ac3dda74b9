/* How the exploring of a trajectory may end: rest, runaway, failure, or the effort.
 *
 * The order matters.  Rest near a stable steady state is asked first, stillness
 * second; growth counts only beyond any sensible concentration, or where the
 * integration fails while something grows; and a trajectory that outlasts the effort
 * may still be seen to ring down. */
#include "analysis/ending.h"

#include <math.h>
#include <string.h>

#include "analysis/closed.h"
#include "base/memory.h"
#include "base/status.h"

#define NEAR_REST 1e-2
#define AT_REST 1e-5
#define STARTS_AT_REST 1e-10
#define STILL 1e-6
#define STAYS 100.0               /* growth times that rounding would need to leave a saddle, and then some */
#define RUNAWAY 1e60
#define RUNAWAY_GROWTH 1e6        /* before the integration fails */

void ending_finish(explorer *e, cycle_outcome outcome, const char *why)
{
    e->report->outcome = outcome;
    e->report->why = why;
    e->is_done = true;
}

static lb_status settle(explorer *e, const double *where, bool is_cut, const char *why, lb_error *err)
{
    cycle_report *report = e->report;
    size_t n = (size_t)e->s.n;
    report->rest = memory_array(n, sizeof *report->rest);
    if (!report->rest)
        return status_no_memory(err);
    memcpy(report->rest, where, n * sizeof *where);
    ending_finish(e, CYCLE_SETTLED, why);
    swings_result seen;
    lb_status status = swings_summary(&e->swings, e->reach, is_cut, &seen, err);
    report->swings = seen.count;
    report->swing_decay = seen.decay;
    report->swing_species = seen.state;
    return status;
}

/* Rest that Newton does not find.  A trajectory may also stand still next to a saddle;
 * when it does so for longer than rounding would let it, large steps have damped
 * what should grow, and nothing more is learned from it. */
static lb_status look_for_stillness(explorer *e, lb_error *err)
{
    const double *x = integrator_state(e->it);
    bool is_still;
    double rate, now = integrator_time(e->it);
    lb_status status = rest_is_still(&e->rest, &e->s, x, e->reach, now, STILL, &is_still, &rate, err);
    if (status != LB_OK || !is_still) {
        e->still_since = INFINITY;
        return status;
    }
    if (rate * now <= 1)
        return settle(e, x, false, "it comes to rest: as much time again would not move it", err);
    if (rate * (now - e->still_since) > STAYS)
        ending_finish(e, CYCLE_UNDECIDED, "it lingers next to a steady state that is not stable");
    e->still_since = fmin(e->still_since, now);
    return LB_OK;
}

/* Near a steady state a trajectory cannot have come far since it was last asked: a
 * cheap question before the dear one. */
static bool has_moved_far(const explorer *e, const double *x)
{
    for (int k = 0; k < e->s.core; k++) {
        int i = e->s.system->core_state[k];
        if (fabs(x[i] - e->asked[i]) > 5 * NEAR_REST * fmax(fabs(x[i]), 1e-3 * e->reach[i]))
            return true;
    }
    return false;
}

lb_status ending_by_rest(explorer *e, lb_error *err)
{
    const double *x = integrator_state(e->it);
    rest *r = &e->rest;
    bool moves = has_moved_far(e, x);
    memcpy(e->asked, x, (size_t)e->s.n * sizeof *x);
    if (moves) {
        e->still_since = INFINITY;
        return LB_OK;
    }
    lb_status status = rest_near(r, &e->s, x, e->reach, NEAR_REST, err);
    if (status != LB_OK)
        return status;
    if (r->found && r->distance < AT_REST && r->stable == LB_YES)
        return settle(e, r->x, false, "it comes to rest at a stable steady state", err);
    if (r->found && r->distance < AT_REST && r->stable == LB_NO) {
        bool holds;
        status = rest_holds_on_face(r, &e->s, x, &holds, err);
        if (status != LB_OK || holds)
            return status == LB_OK ? settle(e, r->x, false, "it comes to rest on a face that it cannot leave", err)
                                   : status;
    }
    return look_for_stillness(e, err);
}

lb_status ending_at_start(explorer *e, lb_error *err)
{
    const char *why = "it starts at a steady state";
    if (rest_is_balanced(&e->rest, &e->s, e->x0))
        return settle(e, e->x0, false, why, err);
    lb_status status = rest_near(&e->rest, &e->s, e->x0, e->reach, NEAR_REST, err);
    if (status == LB_OK && e->rest.found && e->rest.distance < STARTS_AT_REST)
        return settle(e, e->rest.x, false, why, err);
    return status;
}

/* Largest core magnitude now, relative to the largest at the start. */
static double growth(const explorer *e, double *largest)
{
    double start = 0;
    *largest = 0;
    for (int k = 0; k < e->s.core; k++) {
        int i = e->s.system->core_state[k];
        *largest = fmax(*largest, e->reach[i]);
        start = fmax(start, fabs(e->x0[i]));
    }
    return start > 0 ? *largest / start : 0;
}

void ending_by_runaway(explorer *e)
{
    double largest;
    growth(e, &largest);
    if (largest > RUNAWAY)
        ending_finish(e, CYCLE_UNBOUNDED, "it grows without bound");
}

/* The integration could not go on.  A blow-up in finite time is an answer; so is
 * leaving the orthant. */
lb_status ending_by_failure(explorer *e, lb_status status)
{
    double largest;
    if (status == LB_E_STEP || status == LB_E_FINITE || status == LB_E_NUMERIC || status == LB_E_LIMIT) {
        if (growth(e, &largest) > RUNAWAY_GROWTH)
            ending_finish(e, CYCLE_UNBOUNDED, "it grows without bound in finite time");
        else
            ending_finish(e, CYCLE_UNDECIDED, "the integration could not go on");
        return LB_OK;
    }
    if (status == LB_E_NEGATIVE) {
        ending_finish(e, CYCLE_UNDECIDED, "a concentration falls below zero");
        return LB_OK;
    }
    return status;
}

/* Does it ring down, too slowly to wait for?  Its swings fade, and there is a stable
 * steady state in the middle of them. */
static lb_status look_for_ringing(explorer *e, bool *rings, lb_error *err)
{
    swings_result seen;
    lb_status status = swings_summary(&e->swings, e->reach, true, &seen, err);
    *rings = false;
    if (status != LB_OK || !seen.fades)
        return status;
    for (int i = 0; i < e->s.n; i++)
        e->scale[i] = 0.5 * (e->low[i] + e->high[i]);
    status = rest_near(&e->rest, &e->s, e->scale, e->reach, INFINITY, err);
    *rings = status == LB_OK && e->rest.found && e->rest.stable == LB_YES;
    return status;
}

lb_status ending_by_effort(explorer *e, lb_error *err)
{
    bool rings;
    lb_status status = look_for_ringing(e, &rings, err);
    if (status != LB_OK)
        return status;
    if (rings)
        return settle(e, e->rest.x, true, "it rings down to a stable steady state, slowly", err);
    if (e->report->returns <= SECTION_LOOPS)
        ending_finish(e, CYCLE_UNDECIDED, "it neither rests nor recurs within the effort");
    else if (e->s.n > CLOSED_LIMIT)
        ending_finish(e, CYCLE_UNDECIDED, "it recurs, and there are too many species to close an orbit");
    else
        ending_finish(e, CYCLE_UNDECIDED, "it keeps moving and recurs without closing");
    return LB_OK;
}
