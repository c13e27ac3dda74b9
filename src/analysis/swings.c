/* The swings of a trajectory on its way to rest.
 *
 * Each core species keeps the values at its turning points.  A swing is a maximum
 * with the fall and the rise that follow it; these do not depend on where the
 * trajectory will rest, so a drifting mean does not hide or feign swings. */
#include "analysis/swings.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

enum { TRACK_LIMIT = 1000, FEWEST = 3 };

#define SWING_NOISE 1e-3          /* of the largest swing */
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

/* Swing j of a track: the fall after maximum j or the rise after that, whichever is
 * less.  A change of sign that is only noise on a slope has next to none. */
static double swing_size(const swings_track *track, size_t j)
{
    const double *v = track->value + 2 * j;
    return fmin(v[0] - v[1], v[2] - v[1]);
}

static size_t swing_count(const swings_track *track)
{
    return track->count > 2 ? (track->count - 1) / 2 : 0;
}

/* Swings of one track that stand above noise: their number and the largest. */
static int prominent(const swings_track *track, double *largest)
{
    int count = 0;
    *largest = 0;
    for (size_t j = 0; j < swing_count(track); j++)
        *largest = fmax(*largest, swing_size(track, j));
    for (size_t j = 0; j < swing_count(track); j++)
        count += swing_size(track, j) > SWING_NOISE * *largest;
    return count;
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Median ratio of successive prominent swings: the first swings of a wide start and
 * the last of a fine end do not sway it.  scratch has room for the track. */
static double median_ratio(const swings_track *track, double largest, double *scratch)
{
    double last = 0;
    size_t count = 0;
    for (size_t j = 0; j < swing_count(track); j++) {
        double size = swing_size(track, j);
        if (size <= SWING_NOISE * largest)
            continue;
        if (last > 0)
            scratch[count++] = size / last;
        last = size;
    }
    qsort(scratch, count, sizeof *scratch, ascending);
    return count % 2 ? scratch[count / 2] : 0.5 * (scratch[count / 2 - 1] + scratch[count / 2]);
}

lb_status swings_summary(const swings *w, const double *reach, int *count, double *decay, int *state, lb_error *err)
{
    double best = SMALLEST_SWING, largest = 0;
    *count = 0;
    *decay = 0;
    *state = -1;
    for (int k = 0; k < w->s->core; k++) {
        int i = w->s->system->core_state[k], found = prominent(&w->track[i], &largest);
        if (found < FEWEST || !(largest > best * reach[i]))
            continue;
        best = largest / reach[i];
        *count = found;
        *state = i;
    }
    if (*state < 0)
        return LB_OK;
    const swings_track *track = &w->track[*state];
    double *scratch = memory_array(track->count, sizeof *scratch);
    if (!scratch)
        return status_no_memory(err);
    prominent(track, &largest);
    *decay = median_ratio(track, largest, scratch);
    memory_free(scratch);
    return LB_OK;
}
