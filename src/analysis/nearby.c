/* Starts of a search for cycles.
 *
 * A trajectory that leaves an unstable steady state along its unstable manifold
 * goes to an attractor next to it, in the plane always to the innermost cycle; the
 * first stretch of that manifold is the eigenvector.  Cycles that lie beside a
 * stable state (hard excitation) are reached from further away, hence the spread. */
#include "analysis/nearby.h"

#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "analysis/sample.h"
#include "analysis/space.h"
#include "base/memory.h"
#include "base/status.h"

enum { SPREAD_SCALES = 3, WIDE_SCALES = 6 };

/* Decades that starts lie within, in turn; those of the second row are for signed variables
 * only, whose size at a steady state says little about where a cycle may be. */
static const int spread_decades[SPREAD_SCALES] = {1, 2, 3};
static const int wide_decades[WIDE_SCALES] = {4, -1, 5, -2, 6, -3};

#define PUSH 0.01                 /* relative to the species' size, along an unstable direction */
#define PUSH_NEUTRAL 0.1
#define SMALL_FRACTION 1e-3       /* of the largest species: size of one that is zero */
#define SIGNED_FRACTION 0.1       /* the same for a signed one, whose zero means nothing */
#define ON_THE_AXIS 1e-8          /* real part relative to imaginary part */

typedef struct pusher {
    space s;
    const double *x;              /* [n] steady state, finite in all species */
    double *size;                 /* [n] */
    double *direction, *change;   /* [rank], [n] */
    double *block;
} pusher;

/* x without gaps, and the size of each species. */
static lb_status pusher_init(pusher *p, lb_evaluator *evaluator, const double *x, const double *x0, lb_error *err)
{
    memset(p, 0, sizeof *p);
    int n = evaluator_system(evaluator)->n, rank = evaluator_system(evaluator)->rank;
    p->block = memory_zeroed((size_t)(3 * n + rank), sizeof *p->block);
    if (!p->block)
        return status_no_memory(err);
    double *whole = p->block, largest = 0, largest_start = 0;
    p->size = p->block + n;
    p->change = p->block + 2 * n;
    p->direction = p->block + 3 * n;
    for (int i = 0; i < n; i++) {
        whole[i] = isfinite(x[i]) ? x[i] : x0[i];
        largest = fmax(largest, fabs(whole[i]));
        largest_start = fmax(largest_start, fabs(x0[i]));
    }
    if (!(largest > 0))
        largest = largest_start > 0 ? largest_start : 1;
    const lb_network *net = evaluator_system(evaluator)->network;
    for (int i = 0; i < n; i++) {
        bool is_signed = net->species[net->state_species[i]].is_signed;
        p->size[i] = fmax(fabs(whole[i]), (is_signed ? SIGNED_FRACTION : SMALL_FRACTION) * largest);
        if (is_signed)
            p->size[i] = fmax(p->size[i], fabs(x0[i]));
    }
    p->x = whole;
    return space_init(&p->s, evaluator, whole, err);
}

static void pusher_clear(pusher *p)
{
    space_clear(&p->s);
    memory_free(p->block);
}

/* start = x + the step along the direction that changes some species by `fraction` of
 * its size and none by more; false when that is outside. */
static bool push(pusher *p, double fraction, double *start)
{
    double largest = 0;
    space_lift(&p->s, p->direction, p->change);
    for (int i = 0; i < p->s.n; i++)
        largest = fmax(largest, fabs(p->change[i]) / p->size[i]);
    if (!(largest > 0))
        return false;
    for (int i = 0; i < p->s.n; i++)
        start[i] = p->x[i] + fraction / largest * p->change[i];
    return space_is_inside(&p->s, start);
}

static void push_both_ways(pusher *p, bool is_real, double fraction, double *starts, int *count)
{
    for (int sign = 1; sign >= (is_real ? -1 : 1); sign -= 2)
        if (*count < NEARBY_LIMIT && push(p, sign * fraction, starts + *count * p->s.n))
            ++*count;
}

lb_status nearby_unstable(lb_evaluator *evaluator, const double *x, const double *x0,
                          double *starts, int *count, lb_error *err)
{
    pusher p;
    double *J = NULL;
    lb_complex *values = NULL;
    *count = 0;
    lb_status status = pusher_init(&p, evaluator, x, x0, err);
    if (status != LB_OK || p.s.rank == 0)
        goto done;
    size_t n = (size_t)p.s.n, rank = (size_t)p.s.rank;
    J = memory_array(n * n + 2 * rank * rank, sizeof *J);
    values = memory_array(rank, sizeof *values);
    if (!J || !values) {
        status = status_no_memory(err);
        goto done;
    }
    double *reduced = J + n * n, *vectors = reduced + rank * rank;
    lb_jacobian(evaluator, p.x, J);
    system_reduce(p.s.system, J, reduced);
    status = linalg_eigenvalues(p.s.rank, reduced, values, vectors, err);
    for (size_t j = 0; j < rank && status == LB_OK; j++) {
        bool is_real = values[j].im == 0;
        bool is_neutral = !is_real && fabs(values[j].re) <= ON_THE_AXIS * fabs(values[j].im);
        if (values[j].im < 0 || !(values[j].re > 0 || is_neutral))
            continue;
        memcpy(p.direction, vectors + j * rank, rank * sizeof *vectors);
        push_both_ways(&p, is_real, is_neutral ? PUSH_NEUTRAL : PUSH, starts, count);
    }
done:
    memory_free(J);
    memory_free(values);
    pusher_clear(&p);
    return status;
}

uint64_t nearby_starts(const lb_system *system)
{
    const lb_network *net = system->network;
    for (int k = 0; k < system->core; k++)
        if (net->species[net->state_species[system->core_state[k]]].is_signed)
            return NEARBY_SPREAD + WIDE_SCALES;
    return NEARBY_SPREAD;
}

lb_status nearby_spread(lb_evaluator *evaluator, const double *x, const double *x0, uint64_t seed, uint64_t i,
                        double *start, lb_error *err)
{
    pusher p;
    lb_status status = pusher_init(&p, evaluator, x, x0, err);
    if (status == LB_OK) {
        const lb_network *net = p.s.system->network;
        int decades = i < NEARBY_SPREAD ? spread_decades[i % SPREAD_SCALES]
                                        : wide_decades[(i - NEARBY_SPREAD) % WIDE_SCALES];
        sample_point(seed, i, p.s.rank, p.direction);
        for (int j = 0; j < p.s.rank; j++) {
            int state = space_state(&p.s, j);
            double u = 2 * p.direction[j] - 1;
            bool is_signed = net->species[net->state_species[state]].is_signed;
            p.direction[j] = is_signed ? u * pow(10, decades) * p.size[state]
                                       : p.size[state] * pow(10, u * (i < NEARBY_SPREAD ? decades : 1)) - p.x[state];
        }
        space_lift(&p.s, p.direction, p.change);
        double fraction = 1;
        do {
            for (int j = 0; j < p.s.n; j++)
                start[j] = p.x[j] + fraction * p.change[j];
            fraction *= 0.5;
        } while (!space_is_inside(&p.s, start) && fraction > 1e-3);
        if (!space_is_inside(&p.s, start))
            memcpy(start, p.x, (size_t)p.s.n * sizeof *start);
    }
    pusher_clear(&p);
    return status;
}
