/* The core's reaction space through one state.
 *
 * The core's conservation laws, eliminated exactly by system.c, give
 * x_dependent = offset - L x_independent; all here is that one formula.  Sums
 * run over independent species in ascending order, so that a state and its
 * coordinates always give the same bits. */
#include "analysis/space.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

lb_status space_init(space *s, lb_evaluator *evaluator, const double *x, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    memset(s, 0, sizeof *s);
    s->evaluator = evaluator;
    s->system = system;
    s->n = system->n;
    s->core = system->core;
    s->rank = system->rank;
    int dependent = s->core - s->rank;
    s->offset = memory_zeroed((size_t)dependent, sizeof *s->offset);
    s->base = memory_array((size_t)s->n, sizeof *s->base);
    if (!s->offset || !s->base)
        return status_no_memory(err);
    memcpy(s->base, x, (size_t)s->n * sizeof *x);
    for (int d = 0; d < dependent; d++) {
        s->offset[d] = x[system->core_state[system->dependent[d]]];
        for (int i = 0; i < s->rank; i++)
            s->offset[d] += system->elimination[d + i * dependent] * x[space_state(s, i)];
    }
    return LB_OK;
}

void space_clear(space *s)
{
    memory_free(s->offset);
    memory_free(s->base);
    s->offset = s->base = NULL;
}

int space_state(const space *s, int i)
{
    return s->system->core_state[s->system->independent[i]];
}

void space_place(const space *s, const double *y, double *x)
{
    const lb_system *system = s->system;
    int dependent = s->core - s->rank;
    memcpy(x, s->base, (size_t)s->n * sizeof *x);
    for (int i = 0; i < s->rank; i++)
        x[space_state(s, i)] = y[i];
    for (int d = 0; d < dependent; d++) {
        double value = s->offset[d];
        for (int i = 0; i < s->rank; i++)
            value -= system->elimination[d + i * dependent] * y[i];
        x[system->core_state[system->dependent[d]]] = value;
    }
}

void space_take(const space *s, const double *x, double *y)
{
    for (int i = 0; i < s->rank; i++)
        y[i] = x[space_state(s, i)];
}

void space_lift(const space *s, const double *dy, double *dx)
{
    const lb_system *system = s->system;
    int dependent = s->core - s->rank;
    memset(dx, 0, (size_t)s->n * sizeof *dx);
    for (int i = 0; i < s->rank; i++)
        dx[space_state(s, i)] = dy[i];
    for (int d = 0; d < dependent; d++)
        for (int i = 0; i < s->rank; i++)
            dx[system->core_state[system->dependent[d]]] -= system->elimination[d + i * dependent] * dy[i];
}

double space_distance(const space *s, const double *a, const double *b, const double *scale)
{
    double distance = 0;
    for (int i = 0; i < s->core; i++) {
        int state = s->system->core_state[i];
        distance = fmax(distance, fabs(a[state] - b[state]) / scale[state]);
    }
    return distance;
}

bool space_is_inside(const space *s, const double *x)
{
    const lb_network *net = s->system->network;
    for (int i = 0; i < s->core; i++) {
        int state = s->system->core_state[i];
        if (x[state] < 0 && !net->species[net->state_species[state]].is_signed)
            return false;
    }
    return true;
}
