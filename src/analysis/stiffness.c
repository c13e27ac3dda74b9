/* Magnitude of the dominant eigenvalue by power iteration on the exact Jacobian.
 *
 * The direction is kept from call to call, so along a run a few iterations at a
 * time follow it; coordinates are scaled by the states, in which a mechanism's
 * Jacobian is far less non-normal.  With a complex pair the growth of one
 * iteration swings; the geometric mean of four is taken.
 *
 * Source: G. H. Golub and C. F. Van Loan, Matrix Computations, 4th ed. (2013),
 * section 7.3; the use as a detector: E. Hairer and G. Wanner, Solving Ordinary
 * Differential Equations II (1996), section IV.2. */
#include "analysis/stiffness.h"

#include <math.h>
#include <string.h>

#include "analysis/sample.h"
#include "analysis/stepper.h"
#include "base/memory.h"

enum { ITERATIONS = 4 };       /* the mean below is a fourth root */

void stiffness_clear(stiffness *estimate)
{
    memory_free(estimate->values);
    memory_free(estimate->jitter);
    memory_free(estimate->w);
    memory_free(estimate->v);
    *estimate = (stiffness){0};
}

lb_status stiffness_init(stiffness *estimate, const lb_system *system)
{
    size_t n = (size_t)system->n;
    *estimate = (stiffness){.n = system->n};
    estimate->v = memory_array(n, sizeof *estimate->v);
    estimate->w = memory_array(n, sizeof *estimate->w);
    estimate->jitter = memory_array(n, sizeof *estimate->jitter);
    estimate->values = memory_array((size_t)system->nonzeros, sizeof *estimate->values);
    if (!estimate->v || !estimate->w || !estimate->jitter || !estimate->values) {
        stiffness_clear(estimate);
        return LB_E_NOMEM;
    }
    for (size_t i = 0; i < n; i++)
        estimate->jitter[i] = 1e-3 * (sample_uniform(1, i, 1) - 0.3);
    stiffness_reset(estimate);
    return LB_OK;
}

void stiffness_reset(stiffness *estimate)
{
    /* Any direction that no mechanism is orthogonal to. */
    for (int i = 0; i < estimate->n; i++)
        estimate->v[i] = sample_uniform(1, (uint64_t)i, 0) - 0.3;
}

static double dot(int n, const double *a, const double *b)
{
    double sum = 0;
    for (int i = 0; i < n; i++)
        sum += a[i] * b[i];
    return sum;
}

/* w = D^-1 J D v */
static void apply(stiffness *estimate, const lb_system *system, const double *values, const double *scale)
{
    memset(estimate->w, 0, (size_t)estimate->n * sizeof *estimate->w);
    for (int i = 0; i < estimate->n; i++)
        estimate->v[i] *= scale[i];
    stepper_multiply_add(system, values, 1, 1, estimate->v, estimate->w);
    for (int i = 0; i < estimate->n; i++) {
        estimate->v[i] /= scale[i];
        estimate->w[i] /= scale[i];
    }
}

double stiffness_radius(stiffness *estimate, const lb_system *system, const double *values, const double *scale,
                        bool *is_damped)
{
    double growth = 1, rayleigh = 0;
    /* A little of every direction again: one that was lost exactly, because it
     * was not coupled then, may be the dominant one now. */
    for (int i = 0; i < estimate->n; i++)
        estimate->v[i] += estimate->jitter[i];
    for (int k = 0; k < ITERATIONS; k++) {
        double size = sqrt(dot(estimate->n, estimate->v, estimate->v));
        apply(estimate, system, values, scale);
        double image = sqrt(dot(estimate->n, estimate->w, estimate->w));
        *is_damped = false;
        if (!(image > 0) || !isfinite(image) || !(size > 0))
            return 0;
        growth *= image / size;
        rayleigh += dot(estimate->n, estimate->v, estimate->w) / (size * size) / ITERATIONS;
        for (int i = 0; i < estimate->n; i++)
            estimate->v[i] = estimate->w[i] / image;
    }
    growth = sqrt(sqrt(growth));
    *is_damped = rayleigh < -0.3 * growth;
    return growth;
}
