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

enum { TRACK_LIMIT = 1000, FEWEST = 3, MANY = 20 };

#define SWING_NOISE 1e-3          /* of the largest swing */
#define FADING 0.95               /* of the swings are smaller than the one before */
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

/* Ratios of successive prominent swings into ratio, which has room for the track. */
static size_t ratios(const swings_track *track, double largest, double *ratio)
{
    double last = 0;
    size_t count = 0;
    for (size_t j = 0; j < swing_count(track); j++) {
        double size = swing_size(track, j);
        if (size <= SWING_NOISE * largest)
            continue;
        if (last > 0)
            ratio[count++] = size / last;
        last = size;
    }
    return count;
}

/* The median: the first swings of a wide start and the last of a fine end do not sway
 * it. */
static void judge(const swings_track *track, double largest, bool is_cut, double *ratio, swings_result *out)
{
    size_t count = ratios(track, largest, ratio), falling = 0;
    for (size_t j = 0; j < count; j++)
        falling += ratio[j] < 1;
    qsort(ratio, count, sizeof *ratio, ascending);
    out->decay = count % 2 ? ratio[count / 2] : 0.5 * (ratio[count / 2 - 1] + ratio[count / 2]);
    out->fades = count >= MANY && falling >= FADING * (double)count && out->decay < 1;
    if (out->fades && (is_cut || track->count >= TRACK_LIMIT))
        out->count = (int)fmin(1e9, ceil(log(SWING_NOISE) / log(out->decay)));
}

lb_status swings_summary(const swings *w, const double *reach, bool is_cut, swings_result *out, lb_error *err)
{
    double best = SMALLEST_SWING, largest = 0;
    *out = (swings_result){.state = -1};
    for (int k = 0; k < w->s->core; k++) {
        int i = w->s->system->core_state[k], found = prominent(&w->track[i], &largest);
        if (found < FEWEST || !(largest > best * reach[i]))
            continue;
        best = largest / reach[i];
        out->count = found;
        out->state = i;
    }
    if (out->state < 0)
        return LB_OK;
    const swings_track *track = &w->track[out->state];
    double *scratch = memory_array(track->count, sizeof *scratch);
    if (!scratch)
        return status_no_memory(err);
    prominent(track, &largest);
    judge(track, largest, is_cut, scratch, out);
    memory_free(scratch);
    return LB_OK;
}
