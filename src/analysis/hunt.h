/* One hunt for cycles at one set of constants, with what it has met. */
#ifndef LIMBECK_ANALYSIS_HUNT_H
#define LIMBECK_ANALYSIS_HUNT_H

#include "analysis/cycle.h"
#include "limbeck.h"
#include "system/system.h"

typedef struct hunt {
    lb_evaluator *evaluator;      /* borrowed, bound */
    lb_oscillate_answer *answer;  /* borrowed; takes the witness and the counts */
    cycle_options options;
    bool is_cut_short;            /* a trajectory could not be followed to an end */
} hunt;

/* Follow the trajectory from x [n].  An attracting cycle makes the verdict
 * LB_OSCILLATES; a centre makes it LB_IS_CENTRE unless it is that already.  With
 * notes_swings the transient swings go into the answer. */
lb_status hunt_from(hunt *h, const double *x, bool notes_swings, lb_error *err);

/* The same from the neighbourhood of each steady state that is not stable, until a
 * cycle or a centre is found; x0 [n] gives the class. */
lb_status hunt_near_states(hunt *h, const lb_steady *steady, const double *x0, lb_error *err);

/* A steady state worth leaving: unstable, or undecided. */
bool hunt_is_unstable(const lb_steady_state *state);

#endif
