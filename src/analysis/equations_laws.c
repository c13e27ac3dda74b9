/* What the search for steady states knows of a network before any equation: which
 * steps are alive, what is conserved in the class, which pools only flows change.
 *
 * A step is dead on a face when its rate is zero at several points in general
 * position there; that covers general rate laws and constants of zero alike.
 * Laws come from exact integers (exact/conservation.h); where constants of zero
 * switch steps off they are found anew, since what is left may conserve more. */
#include "analysis/equations.h"

#include <math.h>
#include <string.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "base/status.h"

bool equations_is_signed(const lb_system *system, int state)
{
    const lb_network *net = system->network;
    return net->species[net->state_species[state]].is_signed;
}

/* ---- Which steps are alive -------------------------------------------------- */

enum { PROBES = 3, MOST_POOLS = 32 };

void equations_probe(const lb_system *system, int probe, double *x)
{
    for (int i = 0; i < system->n; i++)
        x[i] = 0.5 + sample_uniform(0x70726f6265, (uint64_t)probe, (uint64_t)i);
}

lb_status equations_find_alive(lb_evaluator *evaluator, const bool *is_zero, bool *is_alive, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    double *x = memory_array((size_t)system->n, sizeof *x);
    double *v = memory_array((size_t)system->steps, sizeof *v);
    if (!x || !v) {
        memory_free(v);
        memory_free(x);
        return status_no_memory(err);
    }
    memset(is_alive, 0, (size_t)system->steps * sizeof *is_alive);
    for (int probe = 0; probe < PROBES; probe++) {
        equations_probe(system, probe, x);
        for (int i = 0; i < system->n; i++)
            if (is_zero && is_zero[i])
                x[i] = 0;
        evaluator_step_rates(evaluator, x, v);
        for (int s = 0; s < system->steps; s++)
            if (system->core_step[s] && v[s] != 0)
                is_alive[s] = true;
    }
    memory_free(v);
    memory_free(x);
    return LB_OK;
}

/* ---- Conservation laws -------------------------------------------------------- */

static void fill_law(equations_laws *laws, int row, const int64_t *coefficient, const lb_system *system,
                     const double *x0)
{
    laws->is_positive[row] = true;
    for (int i = 0; i < laws->width; i++) {
        double w = (double)coefficient[i], x = x0[system->core_state[i]];
        laws->law[(size_t)row * laws->width + i] = w;
        laws->total[row] += w * x;
        laws->size[row] += fabs(w * x);
        if (w < 0 || (w != 0 && equations_is_signed(system, system->core_state[i])))
            laws->is_positive[row] = false;
    }
}

/* Constants of zero switch steps off, and what they leave may conserve more. */
static lb_status laws_at_constants(lb_evaluator *evaluator, bool *is_alive, conservation *found, bool *is_own,
                                   lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    lb_status status = equations_find_alive(evaluator, NULL, is_alive, err);
    *is_own = false;
    for (int s = 0; status == LB_OK && s < system->steps && !*is_own; s++)
        *is_own = system->core_step[s] && !is_alive[s];
    if (status != LB_OK || !*is_own)
        return status;
    return conservation_find(system->network, system->core_state, system->core, is_alive, found, err);
}

/* Does the step bring in or take out one species, independently of all others? */
static bool is_flow(const network_step *step)
{
    if (!step->is_power_law || step->entry_count != 1 || step->order_count > 1)
        return false;
    return step->order_count == 0 || step->orders[0].state == step->entries[0].state;
}

static bool is_reversible(const lb_network *net, int step)
{
    return net->steps[step].reaction >= 0 && net->reactions[net->steps[step].reaction].is_reversible;
}

/* Non-negative weights on two species or more, and not there yet. */
static void keep_pool(equations_laws *laws, const int64_t *weight)
{
    double *pool = laws->pool + (size_t)laws->pool_count * (size_t)laws->width;
    size_t bytes = (size_t)laws->width * sizeof *pool;
    int support = 0;
    for (int i = 0; i < laws->width; i++) {
        if (weight[i] < 0)
            return;
        support += weight[i] > 0;
        pool[i] = (double)weight[i];
    }
    for (int p = 0; p < laws->pool_count; p++)
        if (memcmp(laws->pool + (size_t)p * (size_t)laws->width, pool, bytes) == 0)
            return;
    if (support >= 2)
        laws->pool_count++;
}

/* What the steps in use conserve.  A network too large for that has no pools. */
static lb_status add_pools(equations_laws *laws, const lb_system *system, const bool *use, lb_error *err)
{
    conservation found = {0};
    lb_status status = conservation_find(system->network, system->core_state, system->core, use, &found, NULL);
    for (int row = 0; status == LB_OK && row < found.count && laws->pool_count < MOST_POOLS; row++)
        keep_pool(laws, found.law + (size_t)row * (size_t)found.width);
    if (status == LB_OK)
        conservation_clear(&found);
    return status == LB_OK || status == LB_E_LIMIT ? LB_OK : status_no_memory(err);
}

/* Two families: what all steps but flows conserve, and what the reversible reactions
 * conserve, which are often fast beside the others. */
static lb_status find_pools(equations_laws *laws, const lb_system *system, const bool *is_alive, lb_error *err)
{
    bool has_flow = false, has_reversible = false;
    bool *use = memory_array((size_t)system->steps, sizeof *use);
    laws->pool = memory_array((size_t)(MOST_POOLS + 1) * (size_t)laws->width, sizeof *laws->pool);
    lb_status status = use && laws->pool ? LB_OK : status_no_memory(err);
    for (int s = 0; status == LB_OK && s < system->steps; s++) {
        use[s] = is_alive[s] && !is_flow(&system->network->steps[s]);
        has_flow = has_flow || (is_alive[s] && !use[s]);
        has_reversible = has_reversible || (use[s] && is_reversible(system->network, s));
    }
    if (status == LB_OK && has_flow)
        status = add_pools(laws, system, use, err);
    for (int s = 0; status == LB_OK && s < system->steps; s++)
        use[s] = use[s] && is_reversible(system->network, s);
    if (status == LB_OK && has_reversible)
        status = add_pools(laws, system, use, err);
    memory_free(use);
    return status;
}

lb_status equations_laws_init(equations_laws *laws, lb_evaluator *evaluator, const double *x0, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    memset(laws, 0, sizeof *laws);
    conservation own = {0};
    bool is_own = false;
    bool *is_alive = memory_array((size_t)system->steps, sizeof *is_alive);
    lb_status status = is_alive ? laws_at_constants(evaluator, is_alive, &own, &is_own, err) : status_no_memory(err);
    if (status != LB_OK)
        goto done;
    const conservation *source = is_own ? &own : &system->core_laws;
    laws->count = source->count;
    laws->width = system->core;
    laws->basis = source->basis;
    laws->law = memory_array((size_t)laws->count * (size_t)laws->width, sizeof *laws->law);
    laws->total = memory_zeroed((size_t)laws->count, sizeof *laws->total);
    laws->size = memory_zeroed((size_t)laws->count, sizeof *laws->size);
    laws->is_positive = memory_array((size_t)laws->count, sizeof *laws->is_positive);
    if (!laws->law || !laws->total || !laws->size || !laws->is_positive) {
        status = status_no_memory(err);
        goto done;
    }
    for (int row = 0; row < laws->count; row++)
        fill_law(laws, row, source->law + (size_t)row * (size_t)source->width, system, x0);
    status = find_pools(laws, system, is_alive, err);
done:
    if (is_own)
        conservation_clear(&own);
    memory_free(is_alive);
    return status;
}

void equations_laws_clear(equations_laws *laws)
{
    memory_free(laws->law);
    memory_free(laws->total);
    memory_free(laws->size);
    memory_free(laws->is_positive);
    memory_free(laws->pool);
    memset(laws, 0, sizeof *laws);
}
