/* One interface to integrate anything, and the control of step and method.
 *
 * A step is tried with one of two one-step methods, explicit.c and rosenbrock.c,
 * weighed by tolerance.c, and accepted or tried again with a shorter step.  The
 * next step comes from a proportional-integral rule.  A step that ends with an
 * unsigned species below minus its absolute tolerance, or anywhere where the
 * right-hand side is not finite, is tried again shorter as well; nothing is ever
 * clipped.  Where even the smallest step does not pass, the reason of the last
 * refusal is the error.
 *
 * Method.  The explicit one costs least while accuracy limits its step.  It is
 * left when |h lambda| of the dominant damped eigenvalue stays near the bound of
 * stability, and taken up again when the stiff method's own steps would be
 * well inside that bound.  All of it depends on the numbers of the run alone.
 *
 * Sources: E. Hairer, S. P. Norsett and G. Wanner, Solving Ordinary Differential
 * Equations I, 2nd ed. (1993), section II.4 (steps); K. Gustafsson, ACM Trans.
 * Math. Softw. 17 (1991) 533 (proportional-integral control); E. Hairer and
 * G. Wanner, volume II (1996), section IV.2 (detection of stiffness). */
#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/integrate_state.h"
#include "base/memory.h"
#include "base/status.h"

#define DEFAULT_TOLERANCE 1e-8
#define LOOSEST_TOLERANCE 1e-2
#define TIGHTEST_TOLERANCE 1e-13
#define LARGE_WORK 1e9               /* operations of a factorisation that are worth a thought */
#define FEW_STEPS 10
#define EXPLICIT_STAGES 13
#define RATE_WORK 4                  /* operations of a right-hand side per entry of the Jacobian */
#define LONGEST_STEP 1e250           /* at rest steps grow without need: not to infinity */

enum {
    STIFF_EVIDENCE = 4,         /* checks near the bound of stability before the explicit method is left */
    CHECK_INTERVAL = 4,         /* accepted explicit steps between two checks, after the first sixteen */
    LEAST_PATIENCE = 6,         /* stiff steps inside the bound before it is taken up again */
    MOST_PATIENCE = 1024,
    MOST_STALLED = 1000         /* accepted steps in a row that do not change t */
};

/* ---- Life ---------------------------------------------------------------------- */

static lb_status check_options(const integrator_options *options, int n, int m, lb_error *err)
{
    double relative = options->tolerance;
    if (relative != 0 && !(relative >= TIGHTEST_TOLERANCE && relative < INFINITY))
        return status_raise(err, LB_E_ARG, "use a relative tolerance from 1e-13 to 1e-2",
                            "%g is no tolerance that double precision can keep", relative);
    for (int i = 0; options->absolute && i < n; i++)
        if (!(options->absolute[i] >= 0 && options->absolute[i] < INFINITY))
            return status_raise(err, LB_E_ARG, NULL, "%g is no absolute tolerance", options->absolute[i]);
    if (options->sensitivities < 0 || (!options->constants && options->sensitivities > m))
        return status_raise(err, LB_E_ARG, NULL, "there are %d constants, not %d", m, options->sensitivities);
    for (int i = 0; options->constants && i < options->sensitivities; i++)
        if (options->constants[i] < 0 || options->constants[i] >= m)
            return status_raise(err, LB_E_ARG, NULL, "there is no constant %d", options->constants[i]);
    return LB_OK;
}

void integrator_free(integrator *it)
{
    if (!it)
        return;
    memory_free(it->tangents_error);
    memory_free(it->tangents_new);
    memory_free(it->tangents);
    memory_free(it->constant);
    double *const vectors[] = {it->x, it->x_last, it->x_new, it->f, it->f_last, it->f_new, it->error, it->scale};
    for (size_t i = 0; i < sizeof vectors / sizeof *vectors; i++)
        memory_free(vectors[i]);
    rosenbrock_free(it->extra_steps);
    rosenbrock_free(it->stiff_steps);
    explicit_free(it->explicit_steps);
    stiffness_clear(&it->estimate);
    tolerance_clear(&it->control);
    memory_free(it);
}

static bool allocate(integrator *it, const integrator_options *options)
{
    size_t n = (size_t)it->n;
    double **const vectors[] = {&it->x,      &it->x_last, &it->x_new, &it->f,
                                &it->f_last, &it->f_new,  &it->error, &it->scale};
    for (size_t i = 0; i < sizeof vectors / sizeof *vectors; i++)
        if (!(*vectors[i] = memory_zeroed(n, sizeof **vectors[i])))
            return false;
    int count = options->sensitivities;
    it->constant = memory_array((size_t)count, sizeof *it->constant);
    if (!it->constant)
        return false;
    for (int c = 0; c < count; c++)
        it->constant[c] = options->constants ? options->constants[c] : c;
    it->columns = (stepper_columns){options->tangents ? it->n : 0, count, it->constant};
    size_t carried = n * (size_t)stepper_column_count(&it->columns);
    if (carried == 0)
        return true;
    it->tangents = memory_zeroed(carried, sizeof *it->tangents);
    it->tangents_new = memory_zeroed(carried, sizeof *it->tangents_new);
    it->tangents_error = memory_zeroed(carried, sizeof *it->tangents_error);
    return it->tangents && it->tangents_new && it->tangents_error;
}

lb_status integrator_new(lb_evaluator *evaluator, const integrator_options *options, integrator **out, lb_error *err)
{
    *out = NULL;
    const integrator_options defaults = {0};
    if (!options)
        options = &defaults;
    const lb_system *system = evaluator_system(evaluator);
    lb_status status = check_options(options, system->n, system->m, err);
    if (status != LB_OK)
        return status;
    integrator *it = memory_zeroed(1, sizeof *it);
    if (!it)
        return status_no_memory(err);
    it->evaluator = evaluator;
    it->system = system;
    it->n = system->n;
    it->method = options->method;
    it->allow_negative = options->allow_negative;
    it->max_steps = options->max_steps;
    it->monitor = options->monitor;
    double relative = options->tolerance == 0 ? DEFAULT_TOLERANCE : fmin(options->tolerance, LOOSEST_TOLERANCE);
    if (tolerance_init(&it->control, system->network, relative, options->absolute) != LB_OK ||
        stiffness_init(&it->estimate, system) != LB_OK || !allocate(it, options))
        status = status_no_memory(err);
    if (status == LB_OK && it->method != LB_METHOD_STIFF)
        status = explicit_new(evaluator, &it->columns, &it->explicit_steps, err);
    if (status == LB_OK && it->method == LB_METHOD_STIFF)
        status = rosenbrock_new(evaluator, &it->columns, &it->stiff_steps, err);
    if (status != LB_OK) {
        integrator_free(it);
        return status;
    }
    *out = it;
    return LB_OK;
}

void integrator_start(integrator *it, double t, const double *x)
{
    size_t n = (size_t)it->n;
    it->t = it->t_last = t;
    it->h = it->h_last = 0;
    memmove(it->x, x, n * sizeof *x);
    memcpy(it->x_last, it->x, n * sizeof *x);
    if (it->tangents) {
        memset(it->tangents, 0, n * (size_t)stepper_column_count(&it->columns) * sizeof *it->tangents);
        for (size_t i = 0; i < (size_t)it->columns.tangents; i++)
            it->tangents[i + i * n] = 1;
    }
    it->is_begun = it->is_stiff = it->last_was_stiff = it->has_stages = it->is_out_of_reach = false;
    it->was_too_dear = false;
    if (it->stiff_steps)
        rosenbrock_forget(it->stiff_steps);
    if (it->extra_steps)
        rosenbrock_forget(it->extra_steps);
    it->steps = it->rejected = it->stiff_count = it->changes = 0;
    it->stalled = 0;
    stiffness_reset(&it->estimate);
}

/* ---- Start ---------------------------------------------------------------------- */

void integrate_set_scale(integrator *it, const double *x)
{
    for (int i = 0; i < it->n; i++)
        it->scale[i] = fabs(x[i]) + it->control.absolute[i] / it->control.relative + DBL_MIN;
}

static double largest(int n, const double *a)
{
    double most = 0;
    for (int i = 0; i < n; i++)
        most = fmax(most, fabs(a[i]));
    return most;
}

/* First step such that an error that begins like f, with f changing at the rate
 * |J f|/|f|, would be a hundredth of what is allowed; J f is in x_new. */
static double first_step(const integrator *it, double t_limit, int order)
{
    double speed = 0, change = 0;
    for (int i = 0; i < it->n; i++) {
        double weight = tolerance_weight(&it->control, i, it->x[i], it->x[i]) + DBL_MIN;
        speed = fmax(speed, fabs(it->f[i]) / weight);
        change = fmax(change, fabs(it->x_new[i]) / weight);
    }
    double span = isfinite(t_limit) ? t_limit - it->t : INFINITY;
    double h = pow(0.01 / speed, 1.0 / order) * pow(speed / change, (order - 1.0) / order);
    if (isfinite(h) && h > 0)
        return fmin(h, span);
    /* A constant rate of change, or rest: any step will do, and too long a one
     * is found out. */
    if (isfinite(span))
        return 0.01 * span;
    double fastest = largest(it->n, it->f);
    return fastest > 0 && it->control.reference > 0 ? it->control.reference / fastest : 1;
}

/* Far from its fastest motions a stiff system moves slowly from the start; one
 * that starts on a fast transient is left to the explicit method. */
static bool looks_stiff(integrator *it)
{
    bool is_damped = false;
    double radius = 0, slow = 0, speed = 0;
    for (int k = 0; k < 3; k++)
        radius = stiffness_radius(&it->estimate, it->system, it->estimate.values, it->scale, &is_damped);
    it->radius = radius;
    for (int i = 0; i < it->n; i++) {
        speed = fmax(speed, fabs(it->f[i]) / it->scale[i]);
        slow = fmax(slow, fabs(it->x_new[i]) / it->scale[i]);
    }
    return is_damped && radius * speed > 100 * slow && radius > 100 * speed;
}

static lb_status use_method(integrator *it, bool stiff, lb_error *err)
{
    if (stiff && !it->stiff_steps) {
        lb_status status = rosenbrock_new(it->evaluator, &it->columns, &it->stiff_steps, err);
        if (status != LB_OK)
            return status;
    }
    it->is_stiff = stiff;
    it->evidence = 0;
    it->since_change = 0;
    it->error_last = 1;
    return LB_OK;
}

/* f, tolerances, method and step at the start. */
static lb_status begin(integrator *it, double t_limit, lb_error *err)
{
    for (int i = 0; i < it->n; i++)
        if (!isfinite(it->x[i]))
            return status_raise(err, LB_E_FINITE, NULL, "the start of [%s] is not finite", integrate_species(it, i));
    int bad = stepper_rhs(it->evaluator, it->x, it->f);
    if (bad >= 0)
        return status_raise(err, LB_E_FINITE, "look at the rate laws of that species",
                            "the rate of change of [%s] is not finite at t = %s", integrate_species(it, bad),
                            integrate_moment(it, it->t).text);
    if (!stepper_jacobian(it->evaluator, it->x, it->estimate.values))
        return status_raise(err, LB_E_FINITE, NULL, "the derivative of a rate is not finite at t = %s",
                            integrate_moment(it, it->t).text);
    memset(it->x_new, 0, (size_t)it->n * sizeof *it->x_new);
    stepper_multiply_add(it->system, it->estimate.values, 1, 1, it->f, it->x_new);
    double fastest = largest(it->n, it->f), change = largest(it->n, it->x_new);
    /* What a start at zero comes to: f times the time in which f changes. */
    double span = isfinite(t_limit) ? t_limit - it->t : INFINITY, time_scale = fmin(fastest / change, span);
    tolerance_start(&it->control, it->x, isfinite(time_scale) ? fastest * time_scale : 0);
    it->culprit = it->allow_negative ? -1 : tolerance_negative(&it->control, it->x, it->x);
    if (it->culprit >= 0)
        return status_raise(err, LB_E_NEGATIVE, NULL, "[%s] starts below zero, at %.6g",
                            integrate_species(it, it->culprit), it->x[it->culprit]);
    integrate_set_scale(it, it->x);
    it->patience = LEAST_PATIENCE;
    bool stiff = it->method == LB_METHOD_STIFF ||
                 (it->method == LB_METHOD_AUTO && looks_stiff(it));
    lb_status status = use_method(it, stiff, err);
    it->h = first_step(it, t_limit, stiff ? ROSENBROCK_ERROR_ORDER : EXPLICIT_ERROR_ORDER);
    it->is_begun = status == LB_OK;
    return status;
}

/* ---- One step -------------------------------------------------------------------- */

/* After an accepted step: does the method in use still fit? */
static lb_status review_method(integrator *it, lb_error *err)
{
    it->since_change++;
    if (it->method != LB_METHOD_AUTO || it->is_out_of_reach)
        return LB_OK;
    bool is_damped;
    if (it->is_stiff) {
        /* The Jacobian of the step's start is there for nothing. */
        integrate_set_scale(it, it->x);
        const double *J = rosenbrock_jacobian(it->stiff_steps);
        double radius = stiffness_radius(&it->estimate, it->system, J, it->scale, &is_damped);
        it->evidence = it->h * radius < 0.4 * EXPLICIT_STABILITY ? it->evidence + 1 : 0;
        if (it->evidence < it->patience)
            return LB_OK;
        it->changes++;
        return use_method(it, false, err);
    }
    if ((it->since_change > 16 && it->since_change % CHECK_INTERVAL != 0) ||
        !stepper_jacobian(it->evaluator, it->x, it->estimate.values))
        return LB_OK;
    integrate_set_scale(it, it->x);
    it->radius = stiffness_radius(&it->estimate, it->system, it->estimate.values, it->scale, &is_damped);
    it->evidence = is_damped && it->h * it->radius > 0.6 * EXPLICIT_STABILITY ? it->evidence + 1 : 0;
    if (it->evidence < STIFF_EVIDENCE)
        return LB_OK;
    /* Back so soon: the change to explicit steps did not pay. */
    if (it->changes > 0 && it->since_change < 64 && it->patience < MOST_PATIENCE)
        it->patience *= 2;
    it->changes++;
    return use_method(it, true, err);
}

/* The error of what is carried; a column is scaled by what it is a derivative by. */
static double columns_norm(const integrator *it)
{
    double norm = 0;
    for (int c = 0; c < stepper_column_count(&it->columns); c++) {
        size_t at = (size_t)c * (size_t)it->n;
        int constant = c - it->columns.tangents;
        double from = constant < 0 ? tolerance_magnitude(&it->control, c)
                                   : fabs(evaluator_constants(it->evaluator)[it->constant[constant]]);
        norm = fmax(norm, tolerance_column_norm(&it->control, from > 0 ? from : 1, it->tangents + at,
                                                it->tangents_new + at, it->tangents_error + at));
    }
    return norm;
}

/* Try a step h; true when it may be accepted.  Otherwise why is in refused and
 * culprit, and *shrink is the factor for the next try. */
static bool attempt_step(integrator *it, double h, double *norm, double *shrink)
{
    stepper_attempt attempt = {h, it->x, it->f, it->tangents, it->x_new, it->error, it->tangents_new,
                               it->tangents_error, -1};
    if (it->is_stiff)
        it->has_stages = false;
    stepper_outcome outcome = it->is_stiff ? rosenbrock_attempt(it->stiff_steps, &attempt)
                                           : explicit_attempt(it->explicit_steps, &attempt);
    *shrink = 0.25;
    it->culprit = attempt.bad_state;
    it->refused = outcome == STEPPER_SINGULAR    ? REFUSED_SINGULAR
                  : outcome == STEPPER_NO_MEMORY ? REFUSED_NO_MEMORY
                                                 : REFUSED_NOT_FINITE;
    if (outcome != STEPPER_DONE)
        return false;

    *norm = tolerance_norm(&it->control, it->x, it->x_new, it->error, &it->worst);
    if (it->tangents)
        *norm = fmax(*norm, columns_norm(it));
    it->refused = REFUSED_ERROR;
    if (!(*norm <= 1)) {
        int order = it->is_stiff ? ROSENBROCK_ERROR_ORDER : EXPLICIT_ERROR_ORDER;
        *shrink = fmax(0.1, 0.9 * pow(*norm, -1.0 / order));
        return false;
    }

    it->refused = REFUSED_NEGATIVE;
    it->culprit = it->allow_negative ? -1 : tolerance_negative(&it->control, it->x, it->x_new);
    if (it->culprit >= 0)
        return false;
    it->refused = REFUSED_NOT_FINITE;
    it->culprit = stepper_rhs(it->evaluator, it->x_new, it->f_new);
    return it->culprit < 0;
}

/* Proportional-integral rule for the next step, from the errors of this one and
 * the one before. */
static double growth(integrator *it, double norm, bool was_refused)
{
    double order = it->is_stiff ? ROSENBROCK_ERROR_ORDER : EXPLICIT_ERROR_ORDER;
    double error = fmax(norm, 1e-10);
    double factor = 0.9 * pow(error, -1.0 / order) * pow(it->error_last, 0.4 / order);
    it->error_last = fmax(error, 1e-4);
    return fmax(0.2, fmin(was_refused ? 1 : 6, factor));
}

static void rotate(double **oldest, double **middle, double **newest)
{
    double *kept = *oldest;
    *oldest = *middle;
    *middle = *newest;
    *newest = kept;
}

static void accept(integrator *it, double h, double t_new)
{
    rotate(&it->x_last, &it->x, &it->x_new);
    rotate(&it->f_last, &it->f, &it->f_new);
    double *kept = it->tangents;
    it->tangents = it->tangents_new;
    it->tangents_new = kept;
    it->stalled = t_new > it->t ? 0 : it->stalled + 1;
    it->t_last = it->t;
    it->t = t_new;
    it->h_last = h;
    it->last_was_stiff = it->has_stages = it->is_stiff;
    it->steps++;
    it->stiff_count += it->is_stiff;
    tolerance_follow(&it->control, it->x);
}

static double smallest_step(const integrator *it)
{
    return fmax(16 * DBL_EPSILON * fabs(it->t), 1e-280);
}

/* Would factors of a large filled matrix, in no more than FEW_STEPS steps, cost more
 * than explicit steps at their bound of stability all the way to the limit? */
static bool is_too_dear(const integrator *it, double t_limit)
{
    double work = rosenbrock_work(it->stiff_steps);
    double explicit_steps = (t_limit - it->t) * it->radius / EXPLICIT_STABILITY;
    return it->since_change == 0 && work > LARGE_WORK &&
           FEW_STEPS * work > explicit_steps * EXPLICIT_STAGES * RATE_WORK * it->system->nonzeros;
}

/* Jacobian and linear algebra for the stiff steps from x.  Where the factors would
 * be too large or too dear the explicit method goes on, if the choice is ours. */
static lb_status prepare_stiff(integrator *it, double t_limit, lb_error *err)
{
    integrate_set_scale(it, it->x);
    lb_status status = rosenbrock_prepare(it->stiff_steps, it->x, it->scale);
    it->is_sparse = status == LB_OK && rosenbrock_is_sparse(it->stiff_steps);
    if (it->method == LB_METHOD_AUTO && (status == LB_E_LIMIT || (status == LB_OK && is_too_dear(it, t_limit)))) {
        it->is_out_of_reach = status == LB_E_LIMIT;
        it->was_too_dear = status == LB_OK;
        return use_method(it, false, err);
    }
    if (status == LB_E_NOMEM)
        return status_no_memory(err);
    if (status == LB_E_LIMIT)
        return status_raise(err, LB_E_LIMIT, "the explicit method has no such limit",
                            "the stiff method's matrix of %d species has too large factors", it->n);
    if (status != LB_OK)
        return status_raise(err, LB_E_FINITE, NULL, "the derivative of a rate is not finite at t = %s",
                            integrate_moment(it, it->t).text);
    return LB_OK;
}

lb_status integrator_step(integrator *it, double t_limit, lb_error *err)
{
    if (!(t_limit > it->t))
        return status_raise(err, LB_E_ARG, NULL, "a step from t = %.6g cannot end at %.6g", it->t, t_limit);
    if (it->monitor && it->monitor->stop && it->monitor->stop(it->monitor->context))
        return status_raise(err, LB_E_STOPPED, NULL, "interrupted at t = %s", integrate_moment(it, it->t).text);
    if (it->max_steps > 0 && it->steps >= it->max_steps)
        return status_raise(err, LB_E_STEP, NULL, "%zu steps were not enough: t = %s was reached", it->max_steps,
                            integrate_moment(it, it->t).text);
    if (!it->is_begun) {
        lb_status status = begin(it, t_limit, err);
        if (status != LB_OK)
            return status;
    }
    lb_status prepared = it->is_stiff ? prepare_stiff(it, t_limit, err) : LB_OK;
    if (prepared != LB_OK)
        return prepared;

    it->refused = REFUSED_ERROR;
    if (it->stalled > MOST_STALLED)
        return integrate_fail(it, err);
    for (bool was_refused = false; ; was_refused = true) {
        /* Land on the limit, and do not leave a sliver before it. */
        double rest = t_limit - it->t, h = it->h, norm = 0, shrink;
        bool is_last = 1.01 * h >= rest;
        if (is_last)
            h = rest;
        else if (2 * h > rest)
            h = 0.5 * rest;
        if (attempt_step(it, h, &norm, &shrink)) {
            double next = h * growth(it, norm, was_refused);
            /* A step that was cut short says little about the next one. */
            it->h = fmin(LONGEST_STEP, h < it->h && !was_refused ? fmax(it->h, next) : next);
            accept(it, h, is_last ? t_limit : it->t + h);
            return review_method(it, err);
        }
        if (it->refused == REFUSED_NO_MEMORY)
            return status_no_memory(err);
        it->rejected++;
        it->h = h * shrink;
        if (it->h < smallest_step(it))
            return integrate_fail(it, err);
    }
}

lb_status integrator_to(integrator *it, double t, lb_error *err)
{
    lb_status status = LB_OK;
    if (t < it->t)
        return status_raise(err, LB_E_ARG, NULL, "t = %.6g is before the time reached, %.6g", t, it->t);
    while (status == LB_OK && it->t < t)
        status = integrator_step(it, t, err);
    return status;
}
