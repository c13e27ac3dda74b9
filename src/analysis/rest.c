/* Is a trajectory going to rest here?
 *
 * A slow phase of a relaxation oscillation looks like rest to anyone who looks at
 * speeds.  So the question is asked the other way round: Newton's method in the
 * reaction space finds the steady state nearby, if there is one, and its
 * eigenvalues say whether a trajectory can stay.  Where the steady state is not
 * hyperbolic Newton may fail to converge; then only the whole elapsed time counts. */
#include "analysis/rest.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "analysis/stability.h"
#include "base/memory.h"
#include "base/status.h"

enum { NEWTON_ITERATIONS = 25 };

#define NEWTON_CONVERGED 1e-11
#define LARGEST_CHANGE 1e3         /* of a species in one Newton step, relative */
#define REACH_FRACTION 1e-3
#define BALANCED 1e-14             /* of the sum of the terms' magnitudes: rounding */

/* Room for the Jacobian and the reduced one, at the start of the scratch. */
static size_t matrices(const space *s)
{
    size_t n = (size_t)s->n, rank = (size_t)s->rank;
    return s->rank <= REST_LIMIT ? n * n + rank * rank : 0;
}

lb_status rest_init(rest *r, const space *s, lb_error *err)
{
    size_t n = (size_t)s->n, rank = (size_t)s->rank;
    memset(r, 0, sizeof *r);
    r->x = memory_array(n, sizeof *r->x);
    r->work = memory_array(matrices(s) + 2 * n + 2 * rank, sizeof *r->work);
    r->pivot = memory_array(rank, sizeof *r->pivot);
    return r->x && r->work && r->pivot ? LB_OK : status_no_memory(err);
}

void rest_clear(rest *r)
{
    memory_free(r->x);
    memory_free(r->work);
    memory_free(r->pivot);
    r->x = r->work = NULL;
    r->pivot = NULL;
}

/* The reduced Jacobian at x into the scratch; returns where it is. */
static double *reduced_jacobian(rest *r, const space *s, const double *x)
{
    double *J = r->work, *reduced = J + (size_t)s->n * (size_t)s->n;
    lb_jacobian(s->evaluator, x, J);
    system_reduce(s->system, J, reduced);
    return reduced;
}

/* Length of species `state` for distances from rest. */
static double rest_length(const double *x, const double *reach, int state)
{
    return fmax(fmax(fabs(x[state]), REACH_FRACTION * reach[state]), DBL_MIN);
}

/* Newton from r->x, in place; false when it does not converge. */
static bool newton(rest *r, const space *s, const double *reach)
{
    double *f = r->work + matrices(s), *y = f + s->n, *step = y + s->rank;
    for (int k = 0; k < NEWTON_ITERATIONS; k++) {
        lb_rhs(s->evaluator, r->x, f);
        double *reduced = reduced_jacobian(r, s, r->x);
        for (int i = 0; i < s->rank; i++)
            step[i] = -f[space_state(s, i)];
        if (!linalg_factor(s->rank, reduced, r->pivot))
            return false;
        linalg_solve(s->rank, reduced, r->pivot, 1, step);
        space_take(s, r->x, y);
        double largest = 0;
        for (int i = 0; i < s->rank; i++) {
            double change = fabs(step[i]) / rest_length(r->x, reach, space_state(s, i));
            if (!(change <= LARGEST_CHANGE))
                return false;
            largest = fmax(largest, change);
            y[i] += step[i];
        }
        space_place(s, y, r->x);
        if (largest < NEWTON_CONVERGED)
            return true;
    }
    return false;
}

/* A state that cannot be classified stays undecided. */
static lb_status classify(rest *r, const space *s, lb_error *err)
{
    lb_steady_state state = {.x = r->x};
    lb_status status = stability_classify(s->evaluator, &state, err);
    r->stable = status == LB_OK ? state.stable : LB_UNDECIDED;
    memory_free(state.eigenvalues);
    memory_free(state.modes);
    return status == LB_E_NOMEM ? status : LB_OK;
}

lb_status rest_near(rest *r, const space *s, const double *x, const double *reach, double close, lb_error *err)
{
    memcpy(r->x, x, (size_t)s->n * sizeof *x);
    r->stable = LB_UNDECIDED;
    r->distance = INFINITY;
    r->found = s->rank <= REST_LIMIT && newton(r, s, reach);
    if (!r->found)
        return LB_OK;
    r->distance = 0;
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        r->distance = fmax(r->distance, fabs(x[i] - r->x[i]) / rest_length(r->x, reach, i));
    }
    return r->distance < close ? classify(r, s, err) : LB_OK;
}

bool rest_is_balanced(rest *r, const space *s, const double *x)
{
    double *f = r->work + matrices(s), *magnitude = f + s->n;
    evaluator_rhs_scaled(s->evaluator, x, f, magnitude);
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        if (!(fabs(f[i]) <= BALANCED * magnitude[i]))
            return false;
    }
    return true;
}

/* A species that was zero from the start and stays so takes no part: what would
 * grow with it does not count. */
static void stay_on_face(const space *s, const double *x, const double *f, double *J)
{
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        if (x[i] != 0 || f[i] != 0 || s->base[i] != 0)
            continue;
        for (int j = 0; j < s->n; j++)
            J[i + j * s->n] = J[j + i * s->n] = 0;
    }
}

/* Largest real part of the eigenvalues at x. */
static lb_status growth_rate(rest *r, const space *s, const double *x, const double *f, double *rate, lb_error *err)
{
    double *J = r->work, *reduced = J + (size_t)s->n * (size_t)s->n;
    *rate = 0;
    if (s->rank == 0 || s->rank > REST_LIMIT)
        return LB_OK;
    lb_complex *values = memory_array((size_t)s->rank, sizeof *values);
    if (!values)
        return status_no_memory(err);
    lb_jacobian(s->evaluator, x, J);
    stay_on_face(s, x, f, J);
    system_reduce(s->system, J, reduced);
    lb_status status = linalg_eigenvalues(s->rank, reduced, values, NULL, err);
    if (status == LB_OK)
        *rate = values[0].re;
    memory_free(values);
    return status;
}

lb_status rest_holds_on_face(rest *r, const space *s, const double *x, bool *holds, lb_error *err)
{
    double *f = r->work + matrices(s), rate;
    bool is_on_face = false;
    *holds = false;
    lb_rhs(s->evaluator, x, f);
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        is_on_face = is_on_face || (x[i] == 0 && f[i] == 0 && s->base[i] == 0);
    }
    if (!is_on_face)
        return LB_OK;
    lb_status status = growth_rate(r, s, x, f, &rate, err);
    *holds = status == LB_OK && rate <= 0;
    return status;
}

lb_status rest_is_still(rest *r, const space *s, const double *x, const double *reach, double elapsed,
                        double fraction, bool *is_still, double *rate, lb_error *err)
{
    double *f = r->work + matrices(s);
    *is_still = false;
    lb_rhs(s->evaluator, x, f);
    for (int k = 0; k < s->core; k++) {
        int i = s->system->core_state[k];
        if (!(fabs(f[i]) * elapsed <= fraction * reach[i]))
            return LB_OK;
    }
    *is_still = true;
    return growth_rate(r, s, x, f, rate, err);
}
