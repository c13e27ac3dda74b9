/* The solution inside the last accepted step, and what an integrator can be
 * asked. */
#include <string.h>

#include "analysis/integrate_state.h"
#include "base/status.h"

static lb_status fail_inside(const integrator *it, double t, lb_error *err)
{
    return status_raise(err, LB_E_STEP, NULL, "a step inside an accepted one failed at t = %s", integrate_moment(it, t).text);
}

/* One step from the start of the last one with stages left behind in method. */
static lb_status stiff_substep(integrator *it, rosenbrock *method, double h, double *x_new, lb_error *err)
{
    stepper_attempt attempt = {.h = h, .x = it->x_last, .f = it->f_last, .x_new = x_new, .error = it->error};
    integrate_set_scale(it, it->x_last);
    lb_status status = rosenbrock_prepare(method, it->x_last, it->scale);
    stepper_outcome outcome = status == LB_OK ? rosenbrock_attempt(method, &attempt) : STEPPER_NOT_FINITE;
    if (status == LB_E_NOMEM || outcome == STEPPER_NO_MEMORY)
        return status_no_memory(err);
    return outcome == STEPPER_DONE ? LB_OK : fail_inside(it, it->t_last + h, err);
}

/* The ends of the step are what they are; true when t is one. */
static bool take_end(const integrator *it, double t, double *x)
{
    const double *end = t <= it->t_last ? it->x_last : t >= it->t ? it->x : NULL;
    if (end)
        memcpy(x, end, (size_t)it->n * sizeof *x);
    return end != NULL;
}

lb_status integrator_dense(integrator *it, double t, double *x, lb_error *err)
{
    if (take_end(it, t, x))
        return LB_OK;
    if (!it->last_was_stiff) {
        stepper_outcome outcome = explicit_advance(it->explicit_steps, t - it->t_last, it->x_last, it->f_last, x);
        return outcome == STEPPER_DONE ? LB_OK : fail_inside(it, t, err);
    }
    /* A refused attempt has overwritten the stages: make them again. */
    lb_status status = it->has_stages ? LB_OK : stiff_substep(it, it->stiff_steps, it->h_last, x, err);
    if (status != LB_OK)
        return status;
    it->has_stages = true;
    rosenbrock_dense(it->stiff_steps, (t - it->t_last) / it->h_last, it->x_last, it->x, x);
    return LB_OK;
}

lb_status integrator_restep(integrator *it, double t, double *x, lb_error *err)
{
    if (!it->last_was_stiff || t <= it->t_last || t >= it->t)
        return integrator_dense(it, t, x, err);
    if (!it->extra_steps) {
        lb_status status = rosenbrock_new(it->evaluator, NULL, &it->extra_steps, err);
        if (status != LB_OK)
            return status;
    }
    return stiff_substep(it, it->extra_steps, t - it->t_last, x, err);
}

/* ---- Questions ----------------------------------------------------------------------- */

double integrator_time(const integrator *it)
{
    return it->t;
}

const double *integrator_state(const integrator *it)
{
    return it->x;
}

const double *integrator_tangents(const integrator *it)
{
    return it->columns.tangents > 0 ? it->tangents : NULL;
}

const double *integrator_sensitivities(const integrator *it)
{
    return it->columns.constants > 0 ? it->tangents + (size_t)it->columns.tangents * (size_t)it->n : NULL;
}

double integrator_last_time(const integrator *it)
{
    return it->t_last;
}

const double *integrator_last_state(const integrator *it)
{
    return it->x_last;
}

lb_evaluator *integrator_evaluator(const integrator *it)
{
    return it->evaluator;
}

double integrator_tolerance(const integrator *it)
{
    return it->control.relative;
}

size_t integrator_steps(const integrator *it)
{
    return it->steps;
}

size_t integrator_rejected(const integrator *it)
{
    return it->rejected;
}

const char *integrator_method(const integrator *it)
{
    bool mixed = it->stiff_count < it->steps;
    if (it->stiff_count == 0 && !it->is_stiff)
        return "explicit Runge-Kutta 8(7), Prince and Dormand";
    if (it->is_sparse)
        return mixed ? "Rosenbrock 5(4), Rodas5P, with sparse LU, and explicit Runge-Kutta 8(7) where nothing was stiff"
                     : "Rosenbrock 5(4), Rodas5P, with sparse LU";
    return mixed ? "Rosenbrock 5(4), Rodas5P, and explicit Runge-Kutta 8(7) where nothing was stiff"
                 : "Rosenbrock 5(4), Rodas5P";
}

const char *integrator_reason(const integrator *it)
{
    if (it->method != LB_METHOD_AUTO)
        return "asked for";
    if (it->is_out_of_reach)
        return "stability held the steps back, but the factors of the stiff method's matrix would be too large";
    if (it->was_too_dear && it->stiff_count == 0)
        return "stability held the steps back, but the stiff method's factorisations would cost more than they save";
    if (it->stiff_count == 0 && !it->is_stiff)
        return "accuracy, not stability, limited the steps";
    if (it->stiff_count == it->steps)
        return "from the start the fastest motion was damped much faster than the state moved";
    return "stability held the explicit steps back: the fastest motion was damped much faster than the state moved";
}
