/* Periodic orbits: follow a trajectory until it rests, closes or runs away.
 *
 * The exploring integration is loose and only shows the way.  In epochs of growing
 * length the ranges of all species are taken; the species that turns and swings
 * most, relative to its size, carries a Poincare section, and once a return
 * repeats an older one (up to SECTION_LOOPS loops back) the orbit between them is
 * handed to closed.c.  An attempt that fails, or an orbit that is not attracting,
 * makes the next attempt ask for a closer repeat.  Every few steps ending.c is asked
 * whether the trajectory goes to rest. */
#include "analysis/cycle.h"

#include <math.h>
#include <string.h>

#include "analysis/closed.h"
#include "analysis/confirm.h"
#include "analysis/ending.h"
#include "analysis/explorer.h"
#include "base/memory.h"
#include "base/status.h"

enum {
    DEFAULT_RETURNS = 1000,
    DEFAULT_STEPS = 200000,
    FIRST_EPOCH = 128,            /* steps */
    EPOCH_RETURNS = 6,            /* an epoch with fewer was too short */
    REST_EVERY = 32,              /* steps between questions about rest */
    MOST_ATTEMPTS = 8,            /* at closing */
};

#define DEFAULT_TOLERANCE 1e-11
#define EXPLORE 1e-7              /* tolerance of the exploring integration */
#define FIRST_REPEAT 1e-2         /* amplitudes; the first closing attempt */
#define LEAST_REPEAT 1e-7
#define PERIOD_AGREES 1e-6        /* relative, between the two paths */
#define IN_PLACE 1.5              /* factor by which the amplitudes of a neutral orbit may differ from the loop's */
#define NEUTRAL 1e-5              /* a multiplier nearer to one does not fade */
#define FADED 1e-12
#define MOST_TURNS 200.0          /* to wait for it */
#define FAR_FUTURE 1e100

/* ---- Setting up ---------------------------------------------------------------------- */

static lb_status start_integrator(explorer *e, lb_error *err)
{
    integrator_options how = {.tolerance = EXPLORE, .method = LB_METHOD_AUTO, .monitor = e->options->monitor};
    lb_status status = integrator_new(e->s.evaluator, &how, &e->it, err);
    if (status != LB_OK)
        return status;
    integrator_start(e->it, 0, e->x0);
    e->turning.it = e->it;
    lb_rhs(e->s.evaluator, e->x0, e->after);
    return LB_OK;
}

static void start_epoch(explorer *e, const double *x)
{
    for (int i = 0; i < e->s.n; i++) {
        e->low[i] = e->high[i] = x[i];
        e->turns[i] = swings_turns(&e->swings, i);
    }
    e->epoch_end = e->report->steps + e->epoch_length;
    e->epoch_returns = 0;
}

static lb_status take_memory(explorer *e, lb_error *err)
{
    size_t n = (size_t)e->s.n;
    e->block = memory_zeroed(9 * n, sizeof *e->block);
    e->turns = memory_zeroed(n, sizeof *e->turns);
    if (!e->block || !e->turns)
        return status_no_memory(err);
    e->before = e->block;
    e->after = e->block + n;
    e->low = e->block + 2 * n;
    e->high = e->block + 3 * n;
    e->reach = e->block + 4 * n;
    e->scale = e->block + 5 * n;
    e->asked = e->block + 8 * n;
    e->turning = (orbit_turning){.evaluator = e->s.evaluator, .x = e->block + 6 * n, .f = e->block + 7 * n};
    return LB_OK;
}

static lb_status explorer_init(explorer *e, lb_evaluator *evaluator, const double *x0,
                               const cycle_options *options, cycle_report *report, lb_error *err)
{
    memset(e, 0, sizeof *e);
    e->x0 = x0;
    e->options = options;
    e->report = report;
    e->closing_tolerance = options->tolerance > 0 ? options->tolerance : DEFAULT_TOLERANCE;
    e->max_returns = options->max_returns ? options->max_returns : DEFAULT_RETURNS;
    e->max_steps = options->max_steps ? options->max_steps : DEFAULT_STEPS;
    e->epoch_length = FIRST_EPOCH;
    e->repeat = FIRST_REPEAT;
    e->still_since = INFINITY;
    lb_status status = space_init(&e->s, evaluator, x0, err);
    if (status == LB_OK)
        status = take_memory(e, err);
    if (status == LB_OK)
        status = section_init(&e->section, e->s.n, err);
    if (status == LB_OK)
        status = swings_init(&e->swings, &e->s, err);
    if (status == LB_OK)
        status = rest_init(&e->rest, &e->s, err);
    if (status == LB_OK)
        status = start_integrator(e, err);
    if (status == LB_OK) {
        for (int i = 0; i < e->s.n; i++)
            e->reach[i] = fabs(x0[i]);
        start_epoch(e, x0);
    }
    return status;
}

static void explorer_clear(explorer *e)
{
    integrator_free(e->it);
    section_clear(&e->section);
    swings_clear(&e->swings);
    rest_clear(&e->rest);
    space_clear(&e->s);
    memory_free(e->block);
    memory_free(e->turns);
}

/* ---- Orbits ------------------------------------------------------------------------------- */

/* A point of the orbit as a state to start from: species set aside take what the
 * laws say, else what they have at x0. */
static void complete(const explorer *e, double *x)
{
    system_complete(e->s.system, e->x0, x);
    for (int i = 0; i < e->s.n; i++)
        if (e->s.system->core_index[i] < 0 && !isfinite(x[i]))
            x[i] = e->x0[i];
}

static lb_status report_orbit(explorer *e, const closed_orbit *orbit, double confirmed, cycle_outcome outcome,
                              const char *why, lb_error *err)
{
    lb_status status = closed_record(orbit, outcome == CYCLE_CENTRE, confirmed, &e->report->cycle, err);
    if (status != LB_OK)
        return status;
    complete(e, e->report->cycle->x);
    if (outcome == CYCLE_CENTRE)
        e->report->cycle->stable = LB_NO;
    ending_finish(e, outcome, why);
    return LB_OK;
}

/* ---- Closing ------------------------------------------------------------------------------ */

/* An orbit that was closed where the trajectory is, and not by shrinking away from
 * there: slow damping has closed orbits of no size. */
static bool is_in_place(const closed_orbit *orbit)
{
    return orbit->converged && orbit->growth > 1 / IN_PLACE && orbit->growth < IN_PLACE;
}

/* Turns until what leads to the family, and does not lie on it, has faded. */
static double turns_to_fade(const closed_orbit *orbit)
{
    double slowest = 0;
    for (int i = 0; i < orbit->s.rank - 1; i++) {
        double size = hypot(orbit->multipliers[i].re, orbit->multipliers[i].im);
        if (size < 1 - NEUTRAL)
            slowest = fmax(slowest, size);
    }
    return slowest > 0 ? fmin(ceil(log(FADED) / log(slowest)), MOST_TURNS) : 0;
}

/* Where x0 leads after that time, into x [n]: in the plane x0 itself. */
static lb_status follow_start(explorer *e, const closed_orbit *orbit, double *x, lb_error *err)
{
    size_t n = (size_t)e->s.n;
    double turns = orbit->s.rank > 2 ? fmax(1, turns_to_fade(orbit)) : 0;
    memcpy(x, e->x0, n * sizeof *x);
    if (turns == 0)
        return LB_OK;
    double *range = memory_array(2 * n, sizeof *range);
    if (!range)
        return status_no_memory(err);
    orbit_options options = closed_options(orbit, e->closing_tolerance, e->options->monitor);
    lb_status status = orbit_measure(&e->s, e->x0, turns * orbit->period, &options, range, range + n, x, NULL, err);
    memory_free(range);
    return status;
}

/* A steady state within the range of the orbit that attracts: what turns around it is on
 * its way there, however slowly. */
static lb_status turns_around_rest(explorer *e, const closed_orbit *orbit, bool *does, lb_error *err)
{
    rest *r = &e->rest;
    for (int i = 0; i < e->s.n; i++)
        e->scale[i] = e->s.system->core_index[i] < 0 ? e->s.base[i] : 0.5 * (orbit->low[i] + orbit->high[i]);
    lb_status status = rest_near(r, &e->s, e->scale, e->reach, INFINITY, err);
    *does = status == LB_OK && r->found && r->stable == LB_YES;
    for (int k = 0; k < e->s.core && *does; k++) {
        int i = e->s.system->core_state[k];
        *does = r->x[i] >= orbit->low[i] && r->x[i] <= orbit->high[i];
    }
    return status;
}

/* The orbit through x0 of a family (in more than two dimensions: the one that x0 leads to
 * first).  It must be there, of that size: a motion that has sunk to where its damping is
 * no longer seen is not neutral. */
static lb_status report_centre(explorer *e, double period, const double *x, lb_error *err)
{
    const lb_monitor *monitor = e->options->monitor;
    double difference;
    bool is_centre = false, sinks = false;
    closed_orbit own;
    lb_status status = closed_find(&own, e->s.evaluator, x, period, true, e->closing_tolerance, monitor, err);
    if (status == LB_OK && is_in_place(&own))
        status = confirm_is_family(&own, monitor, &is_centre, err);
    if (status == LB_OK && is_centre)
        status = turns_around_rest(e, &own, &sinks, err);
    if (status == LB_OK && is_centre && !sinks) {
        status = confirm_period(&own, true, monitor, &difference, err);
        if (status == LB_OK)
            status = report_orbit(e, &own, difference, CYCLE_CENTRE,
                                  "closed orbits of several amplitudes: a centre", err);
    }
    closed_clear(&own);
    return status;
}

static lb_status judge_orbit(explorer *e, const closed_orbit *orbit, lb_error *err)
{
    const lb_monitor *monitor = e->options->monitor;
    if (orbit->stable == LB_YES) {
        double difference;
        lb_status status = confirm_period(orbit, false, monitor, &difference, err);
        if (status == LB_OK && difference < PERIOD_AGREES)
            status = report_orbit(e, orbit, difference, CYCLE_CLOSED, "an attracting closed orbit", err);
        return status;
    }
    bool is_family;
    if (!is_in_place(orbit))
        return LB_OK;
    lb_status status = confirm_is_family(orbit, monitor, &is_family, err);
    if (status != LB_OK || !is_family)
        return status;
    double *x = memory_array((size_t)e->s.n, sizeof *x);
    if (!x)
        return status_no_memory(err);
    status = follow_start(e, orbit, x, err);
    if (status == LB_OK)
        status = report_centre(e, orbit->period, x, err);
    memory_free(x);
    return closed_is_fatal(status) ? status : LB_OK;
}

static lb_status try_to_close(explorer *e, int loops, lb_error *err)
{
    const section_return *newest = section_back(&e->section, 0);
    double period = newest->t - section_back(&e->section, (size_t)loops)->t;
    closed_orbit orbit;
    lb_status status = closed_find(&orbit, e->s.evaluator, newest->x, period, false, e->closing_tolerance,
                                   e->options->monitor, err);
    if (status == LB_OK && orbit.converged)
        status = judge_orbit(e, &orbit, err);
    closed_clear(&orbit);
    e->repeat = fmax(0.1 * e->repeat, LEAST_REPEAT);
    e->attempts++;
    return status;
}

static lb_status watch_section(explorer *e, lb_error *err)
{
    bool returned;
    if (!e->section.is_placed)
        return LB_OK;
    lb_status status = section_watch(&e->section, e->it, &returned, err);
    if (status != LB_OK)
        return ending_by_failure(e, status);
    if (!returned)
        return LB_OK;
    e->epoch_returns++;
    e->report->returns++;
    if (e->attempts >= MOST_ATTEMPTS || e->s.n > CLOSED_LIMIT)
        return LB_OK;
    int loops = section_repeats(&e->section, &e->s, e->repeat, e->scale);
    return loops > 0 ? try_to_close(e, loops, err) : LB_OK;
}

/* ---- Epochs --------------------------------------------------------------------------------- */

/* The species that turned at least twice in the epoch and swings most for its size;
 * -1 when none turned. */
static int liveliest(const explorer *e)
{
    int best = -1;
    double most = 0;
    for (int k = 0; k < e->s.core; k++) {
        int i = e->s.system->core_state[k];
        double swing = (e->high[i] - e->low[i]) / fmax(fabs(e->high[i]), fabs(e->low[i]));
        if (swings_turns(&e->swings, i) >= e->turns[i] + 2 && swing > 1.001 * most) {
            most = swing;
            best = i;
        }
    }
    return best;
}

static bool section_still_fits(const explorer *e)
{
    const section *c = &e->section;
    if (!c->is_placed || e->epoch_returns < EPOCH_RETURNS)
        return false;
    double place = (c->level - e->low[c->state]) / (e->high[c->state] - e->low[c->state]);
    return place > 0.25 && place < 0.75;
}

static void end_epoch(explorer *e)
{
    if (!section_still_fits(e)) {
        int state = liveliest(e);
        if (state >= 0)
            section_place(&e->section, state, e->low[state], e->high[state]);
        if (e->epoch_returns < EPOCH_RETURNS)
            e->epoch_length *= 2;
    }
    start_epoch(e, integrator_state(e->it));
}

/* One step and what follows from it. */
static lb_status advance(explorer *e, lb_error *err)
{
    lb_status status = integrator_step(e->it, FAR_FUTURE, err);
    if (status != LB_OK)
        return ending_by_failure(e, status);
    const double *x = integrator_state(e->it);
    double *swap = e->before;
    e->before = e->after;
    e->after = swap;
    lb_rhs(e->s.evaluator, x, e->after);
    e->report->steps++;
    for (int i = 0; i < e->s.n; i++) {
        e->low[i] = fmin(e->low[i], x[i]);
        e->high[i] = fmax(e->high[i], x[i]);
        e->reach[i] = fmax(e->reach[i], fabs(x[i]));
    }
    status = swings_watch(&e->swings, &e->turning, e->before, e->after, err);
    return status == LB_OK ? LB_OK : ending_by_failure(e, status);
}

static lb_status explore(explorer *e, lb_error *err)
{
    lb_status status = ending_at_start(e, err);
    while (status == LB_OK && !e->is_done) {
        status = advance(e, err);
        if (status == LB_OK && !e->is_done)
            status = watch_section(e, err);
        if (status == LB_OK && !e->is_done && e->report->steps % REST_EVERY == 0) {
            ending_by_runaway(e);
            if (!e->is_done)
                status = ending_by_rest(e, err);
        }
        if (status == LB_OK && !e->is_done && e->report->steps >= e->epoch_end)
            end_epoch(e);
        if (status == LB_OK && !e->is_done &&
            (e->report->steps >= e->max_steps || e->report->returns >= e->max_returns ||
             integrator_time(e->it) >= FAR_FUTURE))
            status = ending_by_effort(e, err);
    }
    return status;
}

/* ---- Interface ------------------------------------------------------------------------------- */

lb_status cycle_find(lb_evaluator *evaluator, const double *x0, const cycle_options *options,
                     cycle_report *report, lb_error *err)
{
    static const cycle_options defaults = {.tolerance = 0};
    explorer e;
    memset(report, 0, sizeof *report);
    report->outcome = CYCLE_UNDECIDED;
    report->swing_species = -1;
    report->why = "";
    memset(&e, 0, sizeof e);
    lb_status status = system_require_laws(evaluator_system(evaluator), err);
    if (status == LB_OK)
        status = explorer_init(&e, evaluator, x0, options ? options : &defaults, report, err);
    if (status == LB_OK)
        status = explore(&e, err);
    explorer_clear(&e);
    return status;
}

void cycle_report_clear(cycle_report *report)
{
    lb_cycle_free(report->cycle);
    memory_free(report->rest);
    report->cycle = NULL;
    report->rest = NULL;
}

lb_status cycle_close(lb_evaluator *evaluator, const double *x0, double period, const cycle_options *options,
                      lb_cycle **out, lb_error *err)
{
    const lb_monitor *monitor = options ? options->monitor : NULL;
    double tolerance = options && options->tolerance > 0 ? options->tolerance : DEFAULT_TOLERANCE;
    double confirmed = NAN;
    closed_orbit orbit;
    *out = NULL;
    lb_status status = closed_find(&orbit, evaluator, x0, period, true, tolerance, monitor, err);
    if (status == LB_OK && orbit.converged)
        status = confirm_period(&orbit, orbit.stable == LB_UNDECIDED, monitor, &confirmed, err);
    if (status == LB_OK && orbit.converged)
        status = closed_record(&orbit, false, confirmed, out, err);
    closed_clear(&orbit);
    return status;
}

void lb_cycle_free(lb_cycle *cycle)
{
    if (!cycle)
        return;
    memory_free(cycle->x);
    memory_free(cycle->low);
    memory_free(cycle->high);
    memory_free(cycle->multipliers);
    memory_free(cycle);
}
