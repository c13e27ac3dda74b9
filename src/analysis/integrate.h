/* One interface to integrate anything: to a time, step by step, to an event.
 *
 * Methods: GSL's rk8pd (explicit), our own Rodas5P (stiff, exact Jacobian), and
 * the choice between them.  The caller never sees which library steps. */
#ifndef LIMBECK_ANALYSIS_INTEGRATE_H
#define LIMBECK_ANALYSIS_INTEGRATE_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

typedef struct integrator integrator;

typedef struct integrator_options {
    double tolerance;           /* relative; 0: 1e-8; capped at 1e-2 */
    const double *absolute;     /* [n] or NULL: tolerance times a scale per species that follows the run */
    lb_method method;
    bool tangents;              /* carry the n*n fundamental matrix of the variational equations */
    bool allow_negative;        /* analyses that start outside the orthant on purpose */
    size_t max_steps;           /* 0: no limit */
    const lb_monitor *monitor;
} integrator_options;

/* Borrows the evaluator for its life. */
lb_status integrator_new(lb_evaluator *evaluator, const integrator_options *options, integrator **out, lb_error *err);
void integrator_free(integrator *it);

/* Set time and state; tangents (if carried) become the identity. */
void integrator_start(integrator *it, double t, const double *x);

/* One accepted step, not beyond t_limit (INFINITY: free).  Returns LB_OK,
 * LB_E_NEGATIVE, LB_E_STEP, LB_E_FINITE, LB_E_STOPPED; the state is that of the
 * last accepted step. */
lb_status integrator_step(integrator *it, double t_limit, lb_error *err);
/* Steps until t exactly. */
lb_status integrator_to(integrator *it, double t, lb_error *err);

double        integrator_time(const integrator *it);
const double *integrator_state(const integrator *it);      /* [n] */
const double *integrator_tangents(const integrator *it);   /* [n*n] d x(t) / d x(start), column-major; NULL when not carried */
double        integrator_last_time(const integrator *it);  /* where the last step began */
const double *integrator_last_state(const integrator *it);

/* State within the last step, to the order of the tolerance. */
lb_status integrator_dense(integrator *it, double t, double *x, lb_error *err);

/* First zero of g(x) - in the last step, in the wanted direction (+1 rising, -1
 * falling, 0 both) - found to rounding of t.  g: linear form weight [n], minus level.
 * found false: no crossing in this step.  x [n] and *t at the crossing. */
lb_status integrator_crossing(integrator *it, const double *weight, double level, int direction,
                              bool *found, double *t, double *x, lb_error *err);

const char *integrator_method(const integrator *it);       /* words; static */
const char *integrator_reason(const integrator *it);
size_t integrator_steps(const integrator *it);
size_t integrator_rejected(const integrator *it);

#endif
