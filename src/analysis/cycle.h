/* Periodic orbits: from a trajectory to the closed orbit that it approaches.
 *
 * All in the core's reaction space with the totals of the starting state. */
#ifndef LIMBECK_ANALYSIS_CYCLE_H
#define LIMBECK_ANALYSIS_CYCLE_H

#include "limbeck.h"
#include "system/system.h"

typedef enum cycle_outcome {
    CYCLE_CLOSED,           /* an attracting closed orbit, confirmed */
    CYCLE_SETTLED,          /* the trajectory went to rest */
    CYCLE_CENTRE,           /* closed orbits of several amplitudes: neutral */
    CYCLE_UNBOUNDED,
    CYCLE_UNDECIDED         /* neither closed nor settled within the effort */
} cycle_outcome;

typedef struct cycle_report {
    cycle_outcome outcome;
    lb_cycle *cycle;        /* CYCLE_CLOSED and CYCLE_CENTRE (then the orbit through x0 where it closes) */
    int swings;             /* CYCLE_SETTLED: maxima of the species that swings most, before rest */
    double swing_decay;     /* ratio of successive swings */
    int swing_species;      /* state, -1: none */
    double *rest;           /* [n] CYCLE_SETTLED: where; NULL otherwise */
    size_t returns;         /* to the section, all sections together */
    size_t steps;           /* of the exploring integration */
    const char *why;        /* static sentence */
} cycle_report;

typedef struct cycle_options {
    double tolerance;       /* of the closing integration; 0: 1e-11 */
    size_t max_returns;     /* 0: 1000 section returns */
    size_t max_steps;       /* 0: 200000 steps of the exploring integration */
    const lb_monitor *monitor;
} cycle_options;

/* Follow the trajectory from x0 [n] until it rests, closes, or the effort ends.  A
 * closed orbit is refined by shooting, is attracting (all non-trivial multipliers
 * inside the unit circle by more than their error), and is found again on a second
 * path.  options may be NULL.  The report owns cycle and rest; cycle_report_clear
 * frees them, and is to be called after an error too.
 * Returns LB_OK, LB_E_NOMEM, LB_E_STOPPED, LB_E_NUMERIC. */
lb_status cycle_find(lb_evaluator *evaluator, const double *x0, const cycle_options *options,
                     cycle_report *report, lb_error *err);
void cycle_report_clear(cycle_report *report);

/* Close an orbit from a point near it and a guess of its period, attracting or
 * not; *out is NULL with LB_OK when none closes there. */
lb_status cycle_close(lb_evaluator *evaluator, const double *x0, double period, const cycle_options *options,
                      lb_cycle **out, lb_error *err);

#endif
