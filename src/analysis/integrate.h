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
    double tolerance;           /* relative; 0: 1e-8; capped at 1e-2, above which runs go wrong silently */
    const double *absolute;     /* [n] or NULL: a scale per species that follows the run (analysis/tolerance.h) */
    lb_method method;
    bool tangents;              /* carry the n*n fundamental matrix of the variational equations */
    /* Carry d x(t) / d k at a fixed start for these constants (forward sensitivities, exact
     * right-hand sides), a column each. */
    int sensitivities;          /* how many; all m: constants may be NULL */
    const int *constants;       /* [sensitivities] ascending or not; copied */
    bool allow_negative;        /* analyses that start outside the orthant on purpose */
    size_t max_steps;           /* 0: no limit */
    const lb_monitor *monitor;
} integrator_options;

/* Borrows the evaluator for its life; options may be NULL.  LB_E_ARG (a
 * tolerance that is negative, not finite, or below 1e-13; a constant that is not there), LB_E_NOMEM. */
lb_status integrator_new(lb_evaluator *evaluator, const integrator_options *options, integrator **out, lb_error *err);
void integrator_free(integrator *it);

/* Set time and state; tangents (if carried) become the identity, sensitivities zero.  What follows
 * depends on t, x and the options alone, not on earlier runs. */
void integrator_start(integrator *it, double t, const double *x);

/* One accepted step, not beyond t_limit > t (INFINITY: free).  Returns LB_OK,
 * LB_E_NEGATIVE, LB_E_STEP, LB_E_FINITE, LB_E_STOPPED; LB_E_NOMEM and LB_E_LIMIT
 * at the first stiff step; the state is that of the last accepted step. */
lb_status integrator_step(integrator *it, double t_limit, lb_error *err);
/* Steps until t exactly; nothing when that is the time already. */
lb_status integrator_to(integrator *it, double t, lb_error *err);

double        integrator_time(const integrator *it);
const double *integrator_state(const integrator *it);      /* [n] */
const double *integrator_tangents(const integrator *it);   /* [n*n] d x(t) / d x(start), column-major; NULL when not carried */
const double *integrator_sensitivities(const integrator *it);   /* [n*sensitivities], column-major; NULL when none */
double        integrator_last_time(const integrator *it);  /* where the last step began */
const double *integrator_last_state(const integrator *it);

/* State within the last step, to the order of the tolerance: the stiff method's
 * own interpolation, or an explicit step from the last step's start.  t is
 * taken into [last time, time]. */
lb_status integrator_dense(integrator *it, double t, double *x, lb_error *err);

/* The same by a step of its own from the last step's start, with either method:
 * as good as a step's end, and as expensive. */
lb_status integrator_restep(integrator *it, double t, double *x, lb_error *err);

/* First zero of g(x) - in the last step, in the wanted direction (+1 rising, -1
 * falling, 0 both) - found to rounding of t.  g: linear form weight [n], minus level.
 * found false: no crossing in this step.  x [n] and *t at the crossing.  A step
 * that begins on g = 0 does not cross there, one that ends on it does; so along a
 * run each crossing is found once.  (analysis/crossing.c) */
lb_status integrator_crossing(integrator *it, const double *weight, double level, int direction,
                              bool *found, double *t, double *x, lb_error *err);

const char *integrator_method(const integrator *it);       /* words; static */
const char *integrator_reason(const integrator *it);
lb_evaluator *integrator_evaluator(const integrator *it);  /* borrowed */
double integrator_tolerance(const integrator *it);          /* relative, in force */
size_t integrator_steps(const integrator *it);
size_t integrator_rejected(const integrator *it);

#endif
