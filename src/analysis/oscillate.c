/* Does it oscillate?  One answer per scope, with its evidence.
 *
 * given    all steady states, then trajectories from the file's initial state, from
 *          beside every state that is not stable, and from a few places around
 *          them (a cycle may lie beside a stable state).
 * ranges   the same at samples of the box that the file's ranges span (ranges.c).
 *
 * "Oscillates" is said only with an attracting closed orbit in hand that was found
 * on two paths (cycle.c); "centre" with neutral orbits of several amplitudes;
 * everything else is "not found", with a sentence on what was not looked at. */
#include <math.h>
#include <string.h>

#include "analysis/hunt.h"
#include "analysis/nearby.h"
#include "analysis/ranges.h"
#include "analysis/witness.h"
#include "base/buffer.h"
#include "base/memory.h"
#include "base/status.h"
#include "limbeck.h"

enum {
    SPREAD_FEW = 3,               /* starts around the steady states from LARGE states up, and where some trajectory never rests */
    LARGE = 40,
    SPREAD_RETURNS = 500,
    SPREAD_STEPS = 40000
};

const char *lb_scope_text(lb_scope scope)
{
    return scope == LB_SCOPE_GIVEN ? "given" : "ranges";
}

const char *lb_verdict_text(lb_verdict verdict)
{
    switch (verdict) {
    case LB_OSCILLATES: return "oscillates";
    case LB_IS_CENTRE: return "centre";
    case LB_NOT_FOUND: return "not found";
    }
    return "not found";
}

static void answer_init(lb_oscillate_answer *answer, lb_scope scope)
{
    memset(answer, 0, sizeof *answer);
    answer->scope = scope;
    answer->verdict = LB_NOT_FOUND;
    answer->swing_species = -1;
    answer->method = scope == LB_SCOPE_GIVEN
        ? "trajectories from the initial state, from beside each unstable steady state and from places around "
          "them; cycles closed by Newton shooting and found again on a second path"
        : "low-discrepancy samples of the ranges, steady states screened by their eigenvalues, trajectories from "
          "beside the unstable ones; cycles closed by Newton shooting and found again on a second path";
}

static void answer_clear(lb_oscillate_answer *answer)
{
    lb_cycle_free(answer->cycle);
    memory_free(answer->k);
    memory_free(answer->start);
    memory_free(answer->witness);
    memory_free(answer->limits);
}

void lb_oscillate_free(lb_oscillate *oscillate)
{
    if (!oscillate)
        return;
    for (size_t i = 0; i < oscillate->count; i++)
        answer_clear(&oscillate->answer[i]);
    memory_free(oscillate->answer);
    lb_steady_free(oscillate->steady);
    memory_free(oscillate);
}

/* ---- What was not covered ------------------------------------------------------------ */

static void write_coverage(const hunt *h, buffer *text)
{
    const lb_oscillate_answer *answer = h->answer;
    if (answer->scope == LB_SCOPE_GIVEN)
        buffer_printf(text, "%zu start%s followed: a cycle that attracts none of them is missed",
                      answer->integrations, answer->integrations == 1 ? " was" : "s were");
    else
        buffer_printf(text, "%zu set%s of constants %s tried: a cycle between the samples, or beside a steady state "
                      "that is stable, is missed", answer->samples, answer->samples == 1 ? "" : "s",
                      answer->samples == 1 ? "was" : "were");
    if (h->is_cut_short)
        buffer_append(text, "; some trajectory could not be followed to its end");
}

static lb_status write_limits(const hunt *h, lb_error *err)
{
    buffer text;
    buffer_init(&text);
    switch (h->answer->verdict) {
    case LB_OSCILLATES:
        buffer_append(&text, "the search ends at the first attracting cycle: others may exist");
        break;
    case LB_IS_CENTRE:
        buffer_append(&text, "the search ends at the centre: whether a limit cycle lies further out was not looked at");
        break;
    case LB_NOT_FOUND:
        write_coverage(h, &text);
        break;
    }
    buffer_append(&text, ".");
    h->answer->limits = buffer_take(&text);
    return h->answer->limits ? LB_OK : status_no_memory(err);
}

static lb_status finish(const hunt *h, lb_error *err)
{
    lb_oscillate_answer *answer = h->answer;
    lb_status status = LB_OK;
    if (answer->cycle)
        status = witness_write(evaluator_system(h->evaluator)->network, answer->k, answer->cycle,
                               answer->verdict == LB_IS_CENTRE, &answer->witness, err);
    return status == LB_OK ? write_limits(h, err) : status;
}

/* ---- Scope given ------------------------------------------------------------------------ */

/* Around the steady states in turn, or around x0 where there is none. */
static lb_status hunt_spread(hunt *h, const lb_steady *steady, const double *x0, uint64_t seed, lb_error *err)
{
    bool is_cheap = steady->states < LARGE && !h->answer->keeps_moving;
    uint64_t starts = is_cheap ? nearby_starts(evaluator_system(h->evaluator)) : SPREAD_FEW;
    double *x = memory_array((size_t)steady->states, sizeof *x);
    if (!x)
        return status_no_memory(err);
    h->options.max_returns = h->answer->keeps_moving ? h->options.max_returns : SPREAD_RETURNS;
    h->options.max_steps = SPREAD_STEPS;
    lb_status status = LB_OK;
    for (uint64_t i = 0; i < starts && status == LB_OK && h->answer->verdict == LB_NOT_FOUND; i++) {
        const double *around = steady->count ? steady->state[i % steady->count].x : x0;
        status = nearby_spread(h->evaluator, around, x0, seed, i, x, err);
        if (status == LB_OK)
            status = hunt_from(h, x, false, err);
    }
    memory_free(x);
    return status;
}

static lb_status hunt_given(hunt *h, const lb_steady *steady, const double *x0, uint64_t seed, lb_error *err)
{
    h->answer->steady = steady->count;
    for (size_t i = 0; i < steady->count; i++)
        h->answer->unstable += steady->state[i].stable == LB_NO;
    lb_status status = hunt_from(h, x0, true, err);
    if (status == LB_OK && h->answer->verdict == LB_NOT_FOUND)
        status = hunt_near_states(h, steady, x0, err);
    if (status == LB_OK && h->answer->verdict == LB_NOT_FOUND && steady->rank > 1)
        status = hunt_spread(h, steady, x0, seed, err);
    return status;
}

static lb_status answer_given(hunt *h, const lb_oscillate_options *options, lb_steady **steady, lb_error *err)
{
    const lb_system *system = evaluator_system(h->evaluator);
    double *x0 = memory_array((size_t)system->n, sizeof *x0);
    lb_steady_options how = {.seed = options->seed, .monitor = options->monitor};
    lb_status status = x0 ? LB_OK : status_no_memory(err);
    if (status == LB_OK)
        status = lb_evaluator_bind(h->evaluator, NULL, err);
    if (status == LB_OK)
        status = lb_steady_solve(system, &how, steady, err);
    if (status == LB_OK) {
        lb_initial(h->evaluator, x0);
        h->answer->samples = 1;
        status = hunt_given(h, *steady, x0, options->seed, err);
    }
    memory_free(x0);
    return status;
}

/* ---- Both scopes -------------------------------------------------------------------------- */

static double *copy_numbers(const double *from, int count)
{
    double *to = memory_array((size_t)count, sizeof *to);
    if (to)
        memcpy(to, from, (size_t)count * sizeof *to);
    return to;
}

static lb_cycle *copy_cycle(const lb_cycle *from)
{
    lb_cycle *to = memory_alloc(sizeof *to);
    if (!to)
        return NULL;
    *to = *from;
    to->x = copy_numbers(from->x, from->states);
    to->low = copy_numbers(from->low, from->states);
    to->high = copy_numbers(from->high, from->states);
    to->multipliers = memory_array((size_t)from->multiplier_count, sizeof *to->multipliers);
    if (!to->x || !to->low || !to->high || !to->multipliers) {
        lb_cycle_free(to);
        return NULL;
    }
    memcpy(to->multipliers, from->multipliers, (size_t)from->multiplier_count * sizeof *to->multipliers);
    return to;
}

/* The constants given lie within the ranges: their cycle answers for both scopes. */
static lb_status answer_from_given(hunt *h, const lb_oscillate_answer *given, lb_error *err)
{
    lb_oscillate_answer *answer = h->answer;
    const lb_system *system = evaluator_system(h->evaluator);
    answer->verdict = given->verdict;
    answer->samples = 1;
    answer->steady = given->steady;
    answer->unstable = given->unstable;
    answer->integrations = given->integrations;
    answer->cycle = copy_cycle(given->cycle);
    answer->k = copy_numbers(given->k, system->m);
    answer->start = copy_numbers(given->start, system->n);
    return answer->cycle && answer->k && answer->start ? LB_OK : status_no_memory(err);
}

/* Run one scope; an interruption leaves what was found so far. */
static lb_status solve_scope(const lb_system *system, const lb_oscillate_options *options, lb_oscillate *result,
                             lb_scope scope, lb_error *err)
{
    double begin = ranges_clock();
    lb_oscillate_answer *answer = &result->answer[result->count++];
    const lb_oscillate_answer *given = result->count > 1 ? &result->answer[0] : NULL;
    hunt h = {.answer = answer, .options = {.monitor = options->monitor}};
    answer_init(answer, scope);
    lb_status status = lb_evaluator_new(system, &h.evaluator, err);
    if (status == LB_OK && scope == LB_SCOPE_GIVEN)
        status = answer_given(&h, options, &result->steady, err);
    else if (status == LB_OK && given && given->verdict == LB_OSCILLATES)
        status = answer_from_given(&h, given, err);
    else if (status == LB_OK)
        status = ranges_search(&h, options, options->seconds > 0 ? begin + options->seconds : 0, err);
    if (status == LB_E_STOPPED) {
        answer->interrupted = true;
        status = LB_OK;
    }
    if (status == LB_OK)
        status = finish(&h, err);
    lb_evaluator_free(h.evaluator);
    answer->seconds = ranges_clock() - begin;
    return status;
}

lb_status lb_oscillate_solve(const lb_system *system, const lb_oscillate_options *options,
                             lb_oscillate **out, lb_error *err)
{
    static const lb_oscillate_options defaults = {.given = true, .ranges = true};
    if (!options)
        options = &defaults;
    *out = NULL;
    if (!options->given && !options->ranges)
        return status_raise(err, LB_E_ARG, "ask for given, ranges or both", "no scope was asked for");
    lb_status status = system_require_laws(system, err);
    if (status != LB_OK)
        return status;
    lb_oscillate *result = memory_zeroed(1, sizeof *result);
    if (!result)
        return status_no_memory(err);
    result->states = system->n;
    result->constants = system->m;
    result->answer = memory_zeroed(2, sizeof *result->answer);
    status = result->answer ? LB_OK : status_no_memory(err);
    if (status == LB_OK && options->given)
        status = solve_scope(system, options, result, LB_SCOPE_GIVEN, err);
    bool was_stopped = result->count > 0 && result->answer[0].interrupted;
    if (status == LB_OK && options->ranges && !was_stopped && ranges_exist(system->network))
        status = solve_scope(system, options, result, LB_SCOPE_RANGES, err);
    if (status == LB_OK)
        *out = result;
    else
        lb_oscillate_free(result);
    return status;
}
