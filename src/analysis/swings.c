/* The swings of a trajectory on its way to rest.
 *
 * Each core species keeps the values at its turning points.  A swing is a maximum
 * together with the fall to the next minimum; falls do not depend on where the
 * trajectory will rest, so a drifting mean does not hide or feign swings. */
#include "analysis/swings.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

enum { TRACK_LIMIT = 4000, FEWEST = 3 };

#define SWING_NOISE 1e-3          /* of the largest fall */
#define SMALLEST_SWING 1e-4       /* of the species' magnitude: well above the tolerance of the run */

lb_status swings_init(swings *w, const space *s, lb_error *err)
{
    w->s = s;
    w->track = memory_zeroed((size_t)s->n, sizeof *w->track);
    return w->track ? LB_OK : status_no_memory(err);
}

void swings_clear(swings *w)
{
    for (int i = 0; w->track && i < w->s->n; i++)
        memory_free(w->track[i].value);
    memory_free(w->track);
    w->track = NULL;
}

lb_status swings_watch(swings *w, const orbit_turning *turning, const double *before, const double *after,
                       lb_error *err)
{
    double ta = integrator_last_time(turning->it), tb = integrator_time(turning->it);
    for (int k = 0; k < w->s->core; k++) {
        int i = w->s->system->core_state[k];
        swings_track *track = &w->track[i];
        bool is_maximum = before[i] > 0 && after[i] < 0, is_minimum = before[i] < 0 && after[i] > 0;
        bool wants_maximum = track->count % 2 == 0;
        track->turns += is_maximum || is_minimum;
        if (!(wants_maximum ? is_maximum : is_minimum) || track->count >= TRACK_LIMIT)
            continue;
        if (memory_grow(&track->value, &track->capacity, track->count, sizeof *track->value) != 0)
            return status_no_memory(err);
        lb_status status = orbit_turn(turning, i, ta, before[i], tb, after[i], &track->value[track->count], err);
        if (status != LB_OK)
            return status;
        track->count++;
    }
    return LB_OK;
}

size_t swings_turns(const swings *w, int state)
{
    return w->track[state].turns;
}

/* Falls of one track that stand above noise: their number, the first and the last. */
static int prominent(const swings_track *track, double *largest, double *first, double *last)
{
    int count = 0;
    *largest = 0;
    for (size_t j = 0; j + 1 < track->count; j += 2)
        *largest = fmax(*largest, track->value[j] - track->value[j + 1]);
    for (size_t j = 0; j + 1 < track->count; j += 2) {
        double fall = track->value[j] - track->value[j + 1];
        if (fall <= SWING_NOISE * *largest)
            continue;
        if (count++ == 0)
            *first = fall;
        *last = fall;
    }
    return count;
}

void swings_summary(const swings *w, const double *reach, int *count, double *decay, int *state)
{
    double best = SMALLEST_SWING;
    *count = 0;
    *decay = 0;
    *state = -1;
    for (int k = 0; k < w->s->core; k++) {
        int i = w->s->system->core_state[k];
        double largest, first = 0, last = 0;
        int found = prominent(&w->track[i], &largest, &first, &last);
        if (found < FEWEST || !(largest > best * reach[i]))
            continue;
        best = largest / reach[i];
        *count = found;
        *decay = pow(last / first, 1.0 / (found - 1));
        *state = i;
    }
}
