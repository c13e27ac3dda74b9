/* Explicit Runge-Kutta steps by GSL's rk8pd; GSL's steppers are known to this
 * file alone.
 *
 * With tangents or sensitivities the state is augmented by the columns of P and S, with
 * P' = J(x) P, S' = J(x) S + df/dk from exact derivatives, so they are the exact
 * derivatives of the numerical step.
 *
 * Source: P. J. Prince and J. R. Dormand, High order embedded Runge-Kutta
 * formulae, J. Comput. Appl. Math. 7 (1981) 67; GSL reference manual, ordinary
 * differential equations. */
#include "analysis/explicit.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

struct explicit_method {
    lb_evaluator *evaluator;
    int n;
    int bad_state;                      /* of the last evaluation that was not finite; -1: none */
    const stepper_columns *columns;     /* NULL: none */
    size_t carried;                     /* numbers in them, n*c */
    gsl_odeiv2_step *plain, *augmented; /* n, and n + n*c; augmented is NULL without columns */
    double *values;                     /* [nonzeros] Jacobian; with columns only */
    double *forcing;                    /* [n*m]; with sensitivities only */
    double *y, *error;                  /* [n + n*c] */
};

static int plain_function(double t, const double y[], double dydt[], void *parameters)
{
    explicit_method *method = parameters;
    (void)t;
    method->bad_state = stepper_rhs(method->evaluator, y, dydt);
    return method->bad_state < 0 ? GSL_SUCCESS : GSL_EBADFUNC;
}

static int augmented_function(double t, const double y[], double dydt[], void *parameters)
{
    explicit_method *method = parameters;
    size_t n = (size_t)method->n;
    int code = plain_function(t, y, dydt, parameters);
    if (code != GSL_SUCCESS)
        return code;
    if (!stepper_jacobian(method->evaluator, y, method->values))
        return GSL_EBADFUNC;
    memset(dydt + n, 0, method->carried * sizeof *dydt);
    stepper_multiply_add(evaluator_system(method->evaluator), method->values, 1, stepper_column_count(method->columns),
                         y + n, dydt + n);
    stepper_add_forcing(method->evaluator, method->columns, y, 1, method->forcing, dydt + n);
    return GSL_SUCCESS;
}

lb_status explicit_new(lb_evaluator *evaluator, const stepper_columns *columns, explicit_method **out, lb_error *err)
{
    *out = NULL;
    const lb_system *system = evaluator_system(evaluator);
    size_t n = (size_t)system->n, carried = n * (size_t)stepper_column_count(columns), size = n + carried;
    explicit_method *method = memory_zeroed(1, sizeof *method);
    if (!method)
        return status_no_memory(err);
    method->evaluator = evaluator;
    method->n = system->n;
    method->columns = columns;
    method->carried = carried;
    method->bad_state = -1;
    method->y = memory_array(size, sizeof *method->y);
    method->error = memory_array(size, sizeof *method->error);
    method->values = carried ? memory_array((size_t)system->nonzeros, sizeof *method->values) : NULL;
    method->forcing = carried ? memory_array(columns->constants ? n * (size_t)system->m : 0, sizeof *method->forcing) : NULL;
    method->plain = gsl_odeiv2_step_alloc(gsl_odeiv2_step_rk8pd, n);
    method->augmented = carried ? gsl_odeiv2_step_alloc(gsl_odeiv2_step_rk8pd, size) : NULL;
    if (!method->y || !method->error || !method->plain ||
        (carried && (!method->values || !method->forcing || !method->augmented))) {
        explicit_free(method);
        return status_no_memory(err);
    }
    *out = method;
    return LB_OK;
}

void explicit_free(explicit_method *method)
{
    if (!method)
        return;
    if (method->augmented)
        gsl_odeiv2_step_free(method->augmented);
    if (method->plain)
        gsl_odeiv2_step_free(method->plain);
    memory_free(method->forcing);
    memory_free(method->values);
    memory_free(method->error);
    memory_free(method->y);
    memory_free(method);
}

static bool all_finite(size_t count, const double *a)
{
    double sum = 0;             /* 0 times what is not finite is not a number */
    for (size_t i = 0; i < count; i++)
        sum += 0.0 * a[i];
    return sum == 0;
}

stepper_outcome explicit_advance(explicit_method *method, double h, const double *x, const double *f, double *x_new)
{
    size_t n = (size_t)method->n;
    gsl_odeiv2_system system = {plain_function, NULL, n, method};
    memcpy(method->y, x, n * sizeof *x);
    int code = gsl_odeiv2_step_apply(method->plain, 0, h, method->y, method->error, f, NULL, &system);
    if (code != GSL_SUCCESS || !all_finite(n, method->y) || !all_finite(n, method->error))
        return STEPPER_NOT_FINITE;
    memcpy(x_new, method->y, n * sizeof *x);
    return STEPPER_DONE;
}

stepper_outcome explicit_attempt(explicit_method *method, stepper_attempt *attempt)
{
    size_t n = (size_t)method->n;
    stepper_outcome outcome;
    method->bad_state = -1;
    if (!attempt->tangents) {
        outcome = explicit_advance(method, attempt->h, attempt->x, attempt->f, attempt->x_new);
    } else {
        gsl_odeiv2_system system = {augmented_function, NULL, n + method->carried, method};
        memcpy(method->y, attempt->x, n * sizeof *method->y);
        memcpy(method->y + n, attempt->tangents, method->carried * sizeof *method->y);
        int code = gsl_odeiv2_step_apply(method->augmented, 0, attempt->h, method->y, method->error, NULL, NULL,
                                         &system);
        bool is_finite = all_finite(n + method->carried, method->y) && all_finite(n + method->carried, method->error);
        outcome = code == GSL_SUCCESS && is_finite ? STEPPER_DONE : STEPPER_NOT_FINITE;
        memcpy(attempt->x_new, method->y, n * sizeof *method->y);
        memcpy(attempt->tangents_new, method->y + n, method->carried * sizeof *method->y);
        memcpy(attempt->tangents_error, method->error + n, method->carried * sizeof *method->error);
    }
    memcpy(attempt->error, method->error, n * sizeof *method->error);
    attempt->bad_state = method->bad_state;
    return outcome;
}
