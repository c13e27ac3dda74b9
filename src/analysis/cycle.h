/* Periodic orbits: from a trajectory near one to the closed orbit.
 *
 * All in the core's reaction space with the totals of the starting state. */
#ifndef LIMBECK_ANALYSIS_CYCLE_H
#define LIMBECK_ANALYSIS_CYCLE_H

#include "analysis/integrate.h"
#include "limbeck.h"

typedef enum cycle_outcome {
    CYCLE_CLOSED,           /* a closed orbit, confirmed */
    CYCLE_SETTLED,          /* the trajectory went to rest */
    CYCLE_CENTRE,           /* closed orbits of several amplitudes: neutral */
    CYCLE_UNBOUNDED,
    CYCLE_UNDECIDED         /* neither closed nor settled within the effort */
} cycle_outcome;

typedef struct cycle_report {
    cycle_outcome outcome;
    lb_cycle *cycle;        /* CYCLE_CLOSED and CYCLE_CENTRE; the caller frees it */
    int swings;             /* CYCLE_SETTLED: maxima of the species that swings most, before rest */
    double swing_decay;
    int swing_species;
    double *rest;           /* [n] where it settled; NULL otherwise; the caller frees it */
    const char *why;        /* static sentence */
} cycle_report;

typedef struct cycle_options {
    double tolerance;       /* of the integration; 0: 1e-10 */
    size_t max_returns;     /* 0: 2000 section returns */
    const lb_monitor *monitor;
} cycle_options;

/* Follow the trajectory from x0 [n] until it rests, closes, or the effort ends;
 * a closed orbit is refined by shooting (Newton on the return map with the
 * variational equations) and confirmed with another method and tolerance. */
lb_status cycle_find(lb_evaluator *evaluator, const double *x0, const cycle_options *options,
                     cycle_report *report, lb_error *err);
void cycle_report_clear(cycle_report *report);

/* Close an orbit from a point near it and a guess of its period. */
lb_status cycle_close(lb_evaluator *evaluator, const double *x0, double period, const cycle_options *options,
                      lb_cycle **out, lb_error *err);

#endif
