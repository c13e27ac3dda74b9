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

/* Of the species whose swings are largest relative to reach [n], its largest
 * magnitude: how many stand above noise (more than a thousandth of the largest), and
 * the median ratio of successive ones.  At most the first 500 are looked at.  No
 * species with at least three: 0, 0, -1.  LB_OK or LB_E_NOMEM. */
lb_status swings_summary(const swings *w, const double *reach, int *count, double *decay, int *state, lb_error *err);

#endif
