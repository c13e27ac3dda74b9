/* What one loop of an orbit looks like: extrema, closure, phase, hidden repeats. */
#ifndef LIMBECK_ANALYSIS_ORBIT_H
#define LIMBECK_ANALYSIS_ORBIT_H

#include "analysis/integrate.h"
#include "analysis/space.h"
#include "limbeck.h"

typedef struct orbit_options {
    double tolerance;             /* relative, of the integration */
    lb_method method;
    size_t max_steps;             /* 0: no limit; beyond it LB_E_STEP */
    const lb_monitor *monitor;
} orbit_options;

/* Workspace to find where a species turns. */
typedef struct orbit_turning {
    lb_evaluator *evaluator;      /* borrowed */
    integrator *it;               /* borrowed; its last step is searched */
    double *x, *f;                /* [n] each, borrowed scratch */
} orbit_turning;

/* Value of state i where its rate f_i vanishes between ta and tb, both inside the
 * last step; fa and fb are the rates there and differ in sign. */
lb_status orbit_turn(const orbit_turning *turning, int i, double ta, double fa, double tb, double fb,
                     double *value, lb_error *err);

/* Follow the flow from x [n] for one period: extrema of each core species (where
 * dx/dt = 0, on the dense output; NAN for species set aside), the end state [n]
 * and the number of steps.  end and steps may be NULL. */
lb_status orbit_measure(const space *s, const double *x, double period, const orbit_options *options,
                        double *low, double *high, double *end, size_t *steps, lb_error *err);

/* Follow the flow from x [n] for one period and nothing else; LB_E_STEP when that takes
 * more than options->max_steps. */
lb_status orbit_follow(const space *s, const double *x, double period, const orbit_options *options, lb_error *err);

/* Lengths [n] to measure distances on an orbit with: the swing of each species,
 * but at least a hundredth of the largest relative swing times its magnitude, so
 * that a species that hardly moves is not judged by its noise.  1 for species
 * set aside. */
void orbit_scale(const space *s, const double *low, const double *high, double *scale);

/* Move x [n] along the flow, less than one period, to where the speed relative to
 * the scale and the period is nearest to its typical size: shooting from a fast
 * jump or a slow creep is badly conditioned. */
lb_status orbit_phase(const space *s, double *x, double period, const double *scale,
                      const orbit_options *options, lb_error *err);

/* Largest whole number q <= 64 for which the orbit is back after period/q; 1 when
 * the period is the least one. */
lb_status orbit_divisor(const space *s, const double *x, double period, const double *scale,
                        const orbit_options *options, int *divisor, lb_error *err);

#endif
