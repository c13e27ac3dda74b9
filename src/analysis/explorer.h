/* State of the exploring of one trajectory, shared by cycle.c and ending.c. */
#ifndef LIMBECK_ANALYSIS_EXPLORER_H
#define LIMBECK_ANALYSIS_EXPLORER_H

#include "analysis/cycle.h"
#include "analysis/integrate.h"
#include "analysis/orbit.h"
#include "analysis/rest.h"
#include "analysis/section.h"
#include "analysis/space.h"
#include "analysis/swings.h"
#include "limbeck.h"

typedef struct explorer {
    space s;
    const double *x0;
    const cycle_options *options;
    cycle_report *report;
    double closing_tolerance;
    integrator *it;
    section section;
    swings swings;
    rest rest;
    orbit_turning turning;
    double *block;
    double *before, *after;       /* [n] rates at the ends of the last step */
    double *low, *high;           /* [n] range of the epoch */
    double *reach;                /* [n] largest magnitude so far */
    double *asked;                /* [n] state when rest was last asked for */
    double *scale;                /* [n] scratch */
    size_t *turns;                /* [n] turning points when the epoch began */
    size_t epoch_end, epoch_length, epoch_returns, max_returns, max_steps;
    double repeat;                /* how close the next repeat must be */
    double still_since;           /* time since which it stands still; infinite when it moves */
    int attempts;                 /* at closing, that failed */
    bool is_done;
} explorer;

#endif
