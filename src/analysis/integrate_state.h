/* What the files of the integrator share: its state, and how it fails. */
#ifndef LIMBECK_ANALYSIS_INTEGRATE_STATE_H
#define LIMBECK_ANALYSIS_INTEGRATE_STATE_H

#include "analysis/explicit.h"
#include "analysis/integrate.h"
#include "analysis/rosenbrock.h"
#include "analysis/stiffness.h"
#include "analysis/tolerance.h"

/* Why the last attempt was refused. */
typedef enum refusal { REFUSED_ERROR, REFUSED_NEGATIVE, REFUSED_NOT_FINITE, REFUSED_SINGULAR, REFUSED_NO_MEMORY } refusal;

struct integrator {
    lb_evaluator *evaluator;
    const lb_system *system;
    int n;
    lb_method method;
    bool allow_negative;
    size_t max_steps;
    const lb_monitor *monitor;

    tolerance control;
    stiffness estimate;
    explicit_method *explicit_steps;    /* NULL until first used, as the two below */
    rosenbrock *stiff_steps;
    rosenbrock *extra_steps;            /* for a step of its own inside the last one */

    double t, t_last;
    double h, h_last;           /* next step to try; size of the last accepted one */
    double error_last;          /* its error, for the proportional-integral rule */
    bool is_begun;              /* f, h and the method are those of the start */
    double *x, *x_last, *x_new; /* [n] */
    double *f, *f_last, *f_new; /* [n] right-hand sides there */
    double *error, *scale;      /* [n] */
    stepper_columns columns;    /* carried beside the state */
    int *constant;              /* [columns.constants] owned */
    double *tangents, *tangents_new, *tangents_error;   /* [n*c] or NULL */

    bool is_stiff;              /* method in use */
    bool last_was_stiff;
    bool is_out_of_reach;       /* the stiff method's factors are too large: explicit to the end */
    bool was_too_dear;          /* the stiff method was called for, and cost more than it saved */
    bool is_sparse;             /* the stiff method's matrix, at the last step with it */
    double radius;              /* of the Jacobian, as last estimated */
    bool has_stages;            /* the stiff method still holds the stages of the last step */
    int evidence;               /* checks in a row that speak for a change */
    int patience;
    size_t since_change;        /* accepted steps with the method in use */
    size_t steps, rejected, stiff_count, changes;
    int stalled;                /* accepted steps since t last changed */

    refusal refused;
    int culprit;                /* the state it was refused for; -1: none known */
    int worst;                  /* the state with the largest error in the last step */
};

/* Sizes of the states at x [n], all above zero, into it->scale: their values, or
 * the fraction of the peaks below which they do not count. */
void integrate_set_scale(integrator *it, const double *x);

/* The error for a step that was refused at its smallest, or for steps too small
 * for t that go on and on (integrate_errors.c). */
lb_status integrate_fail(integrator *it, lb_error *err);

const char *integrate_species(const integrator *it, int state);

/* A time as messages write it: "0.5 min". */
typedef struct integrate_time {
    char text[48];
} integrate_time;
integrate_time integrate_moment(const integrator *it, double t);

#endif
