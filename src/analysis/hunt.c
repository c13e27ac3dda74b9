/* One hunt for cycles at one set of constants.
 *
 * The first attracting cycle ends it: one witness is enough for the verdict.  A
 * centre ends it too, since every other start near it lies on an orbit of its own. */
#include "analysis/hunt.h"

#include <string.h>

#include "analysis/nearby.h"
#include "base/memory.h"
#include "base/status.h"

/* Returns for further starts once a trajectory has kept moving without closing. */
enum { RETURNS_WHEN_MOVING = 150 };

/* Hand the report's orbit to the answer. */
static lb_status take_witness(hunt *h, const double *x, cycle_report *report, lb_verdict verdict, lb_error *err)
{
    lb_oscillate_answer *answer = h->answer;
    const lb_system *system = evaluator_system(h->evaluator);
    size_t n = (size_t)system->n, m = (size_t)system->m;
    double *start = memory_array(n, sizeof *start), *k = memory_array(m, sizeof *k);
    if (!start || !k) {
        memory_free(start);
        memory_free(k);
        return status_no_memory(err);
    }
    memcpy(start, x, n * sizeof *x);
    memcpy(k, evaluator_constants(h->evaluator), m * sizeof *k);
    lb_cycle_free(answer->cycle);
    memory_free(answer->start);
    memory_free(answer->k);
    answer->verdict = verdict;
    answer->cycle = report->cycle;
    report->cycle = NULL;
    answer->start = start;
    answer->k = k;
    return LB_OK;
}

static lb_status note(hunt *h, const double *x, bool notes_swings, cycle_report *report, lb_error *err)
{
    lb_oscillate_answer *answer = h->answer;
    switch (report->outcome) {
    case CYCLE_CLOSED:
        return take_witness(h, x, report, LB_OSCILLATES, err);
    case CYCLE_CENTRE:
        return answer->verdict == LB_NOT_FOUND ? take_witness(h, x, report, LB_IS_CENTRE, err) : LB_OK;
    case CYCLE_SETTLED:
        if (notes_swings) {
            answer->swings = report->swings;
            answer->swing_decay = report->swing_decay;
            answer->swing_species = report->swing_species;
        }
        return LB_OK;
    case CYCLE_UNBOUNDED:
        answer->runs_away = true;
        return LB_OK;
    case CYCLE_UNDECIDED:
        if (report->returns >= RETURNS_WHEN_MOVING) {
            answer->keeps_moving = true;
            h->options.max_returns = RETURNS_WHEN_MOVING;
        } else {
            h->is_cut_short = true;
        }
        return LB_OK;
    }
    return LB_OK;
}

lb_status hunt_from(hunt *h, const double *x, bool notes_swings, lb_error *err)
{
    cycle_report report;
    const lb_monitor *monitor = h->options.monitor;
    if (monitor && monitor->progress && h->answer->scope == LB_SCOPE_GIVEN)
        monitor->progress(monitor->context, "following trajectories", -1);
    h->answer->integrations++;
    lb_status status = cycle_find(h->evaluator, x, &h->options, &report, err);
    if (status == LB_OK)
        status = note(h, x, notes_swings, &report, err);
    cycle_report_clear(&report);
    return status;
}

bool hunt_is_unstable(const lb_steady_state *state)
{
    return state->stable == LB_NO || (state->stable == LB_UNDECIDED && state->kind != LB_KIND_FIXED);
}

lb_status hunt_near_states(hunt *h, const lb_steady *steady, const double *x0, lb_error *err)
{
    lb_status status = LB_OK;
    double *starts = memory_array((size_t)steady->states * NEARBY_LIMIT, sizeof *starts);
    if (!starts)
        return status_no_memory(err);
    for (size_t i = 0; i < steady->count && status == LB_OK; i++) {
        int count = 0;
        if (!hunt_is_unstable(&steady->state[i]))
            continue;
        status = nearby_unstable(h->evaluator, steady->state[i].x, x0, starts, &count, err);
        for (int j = 0; j < count && status == LB_OK && h->answer->verdict == LB_NOT_FOUND; j++)
            status = hunt_from(h, starts + j * steady->states, false, err);
    }
    memory_free(starts);
    return status;
}
