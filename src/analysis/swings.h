/* The swings of a trajectory on its way to rest. */
#ifndef LIMBECK_ANALYSIS_SWINGS_H
#define LIMBECK_ANALYSIS_SWINGS_H

#include "analysis/integrate.h"
#include "analysis/orbit.h"
#include "analysis/space.h"
#include "limbeck.h"

typedef struct swings_track {
    double *value;                /* maxima and minima in turn, the first one a maximum; owned */
    size_t count, capacity;
    size_t turns;                 /* all turning points, also those no longer kept */
} swings_track;

typedef struct swings {
    const space *s;               /* borrowed */
    swings_track *track;          /* [n] */
} swings;

lb_status swings_init(swings *w, const space *s, lb_error *err);
void swings_clear(swings *w);

/* Take note of where species turned in the last step; before and after [n] are the
 * rates at its ends. */
lb_status swings_watch(swings *w, const orbit_turning *turning, const double *before, const double *after,
                       lb_error *err);

/* Turning points of species `state` so far. */
size_t swings_turns(const swings *w, int state);

typedef struct swings_result {
    int count;                    /* 0: none */
    double decay;                 /* median ratio of successive swings */
    int state;                    /* -1: none */
    bool fades;                   /* there are many, and nearly each is smaller than the one before */
} swings_result;

/* Of the species whose swings are largest relative to reach [n], its largest
 * magnitude: how many stand above noise (more than a thousandth of the largest).  Fewer
 * than three are none.  Where the trajectory was not followed to its end (is_cut), or
 * the swings were too many to keep, the count is what the ratio leads to, if they fade.
 * LB_OK or LB_E_NOMEM. */
lb_status swings_summary(const swings *w, const double *reach, bool is_cut, swings_result *out, lb_error *err);

#endif
