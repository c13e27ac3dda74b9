/* Evaluators: their life, and the binding of constants.
 *
 * A binding computes everything that depends on the constants alone (factors of
 * power laws, coefficients, parts of general laws) in a second array of node
 * values, checks it, and only then takes the place of the old one. */
#include <math.h>

#include "base/memory.h"
#include "base/status.h"
#include "system/evaluator.h"

void lb_evaluator_free(lb_evaluator *ev)
{
    if (!ev)
        return;
    double *blocks[] = {ev->k, ev->k_spare, ev->values, ev->spare, ev->factor, ev->coefficient, ev->row_coefficient,
                        ev->term_coefficient, ev->x, ev->v, ev->unit, ev->slot, ev->sparse};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
    memory_free(ev);
}

static lb_evaluator *allocate(const lb_system *system)
{
    lb_evaluator *ev = memory_zeroed(1, sizeof *ev);
    if (!ev)
        return NULL;
    const table *t = system->table;
    ev->system = system;
    ev->table = t;
    size_t steps = (size_t)t->steps, entries = (size_t)t->entry_start[t->steps];
    struct { double **block; size_t size; } blocks[] = {
        {&ev->k, (size_t)system->m}, {&ev->k_spare, (size_t)system->m}, {&ev->values, t->graph.count}, {&ev->spare, t->graph.count},
        {&ev->factor, steps}, {&ev->coefficient, entries}, {&ev->row_coefficient, entries},
        {&ev->term_coefficient, t->terms}, {&ev->x, (size_t)t->n + 1}, {&ev->v, steps}, {&ev->unit, steps},
        {&ev->slot, (size_t)t->slot_start[t->steps]}, {&ev->sparse, (size_t)t->nonzeros},
    };
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++) {
        *blocks[i].block = memory_zeroed(blocks[i].size, sizeof(double));
        if (!*blocks[i].block) {
            lb_evaluator_free(ev);
            return NULL;
        }
    }
    ev->x[t->n] = 1;
    evaluator_fill_numbers(t, ev->values);
    evaluator_fill_numbers(t, ev->spare);
    return ev;
}

lb_status lb_evaluator_new(const lb_system *system, lb_evaluator **out, lb_error *err)
{
    *out = NULL;
    lb_evaluator *ev = allocate(system);
    if (!ev)
        return status_no_memory(err);
    lb_status status = lb_evaluator_bind(ev, NULL, err);
    if (status != LB_OK) {
        lb_evaluator_free(ev);
        return status;
    }
    *out = ev;
    return LB_OK;
}

lb_status evaluator_copy(const lb_evaluator *evaluator, lb_evaluator **out, lb_error *err)
{
    *out = NULL;
    lb_evaluator *ev = allocate(evaluator->system);
    if (!ev)
        return status_no_memory(err);
    lb_status status = lb_evaluator_bind(ev, evaluator->k, err);
    if (status != LB_OK) {
        lb_evaluator_free(ev);
        return status;
    }
    *out = ev;
    return LB_OK;
}

/* ---- Checks ------------------------------------------------------------------- */

/* What the reaction or flow is called in messages. */
static const char *owner_name(const lb_network *net, const network_step *step)
{
    return step->reaction >= 0 ? net->reactions[step->reaction].label : step->name;
}

static lb_status check_step(const lb_network *net, const table *t, const double *values, int s, lb_error *err)
{
    const network_step *step = &net->steps[s];
    if (step->rate_constant != EXPRESSION_NONE) {
        double k = values[t->node_of[step->rate_constant]];
        if (!isfinite(k) || k < 0)
            return status_raise(err, LB_E_ARG, "a rate constant is a finite number, zero or positive",
                                "the rate constant of %s comes out as %g", owner_name(net, step), k);
    }
    if (step->is_power_law && !isfinite(values[t->node_of[step->factor]]))
        return status_raise(err, LB_E_ARG, NULL, "the factor of the rate of %s comes out as %g",
                            owner_name(net, step), values[t->node_of[step->factor]]);
    for (int e = t->entry_start[s]; e < t->entry_start[s + 1]; e++)
        if (t->entry_node[e] != EXPRESSION_NONE && !isfinite(values[t->entry_node[e]]))
            return status_raise(err, LB_E_ARG, NULL, "a coefficient in %s comes out as %g", owner_name(net, step),
                                values[t->entry_node[e]]);
    return LB_OK;
}

static lb_status check_concentration(const network_species *species, expression e, const table *t,
                                     const double *values, const char *what, lb_error *err)
{
    if (e == EXPRESSION_NONE)
        return LB_OK;
    double value = values[t->node_of[e]];
    if (isfinite(value) && (value >= 0 || species->is_signed))
        return LB_OK;
    return status_raise(err, LB_E_ARG, "a concentration is a finite number, zero or positive",
                        "the %s concentration %s comes out as %g", what, species->bracket, value);
}

static bool is_in_bound(table_bound bound, double value)
{
    return isfinite(value) && (bound == BOUND_FINITE || (bound == BOUND_POSITIVE ? value > 0 : value >= 0));
}

static bool is_within(const table *t, const double *values)
{
    for (size_t i = 0; i < t->check_count; i++)
        if (!is_in_bound(t->checks[i].bound, values[t->checks[i].node]))
            return false;
    return true;
}

/* The list of checks answers quickly; what is wrong is found again with its name. */
lb_status evaluator_check(const lb_network *net, const table *t, const double *values, lb_error *err)
{
    lb_status status = LB_OK;
    if (is_within(t, values))
        return LB_OK;
    if (net->residence != EXPRESSION_NONE) {
        double residence = values[t->node_of[net->residence]];
        if (!isfinite(residence) || residence <= 0)
            return status_raise(err, LB_E_ARG, "a residence time is positive", "the residence time comes out as %g",
                                residence);
    }
    for (int i = 0; i < net->species_count && status == LB_OK; i++) {
        const network_species *species = &net->species[i];
        status = check_concentration(species, species->held, t, values, "held", err);
        if (status == LB_OK)
            status = check_concentration(species, species->feed, t, values, "feed", err);
        if (status == LB_OK)
            status = check_concentration(species, species->initial, t, values, "initial", err);
    }
    for (int s = 0; s < t->steps && status == LB_OK; s++)
        status = check_step(net, t, values, s, err);
    return status;
}

/* ---- Binding -------------------------------------------------------------------- */

static void bind_numbers(lb_evaluator *ev)
{
    const table *t = ev->table;
    for (int s = 0; s < t->steps; s++)
        ev->factor[s] = t->factor_node[s] == EXPRESSION_NONE ? 0 : ev->values[t->factor_node[s]];
    int entries = t->entry_start[t->steps];
    for (int e = 0; e < entries; e++)
        ev->coefficient[e] = t->entry_node[e] == EXPRESSION_NONE ? t->entry_value[e] : ev->values[t->entry_node[e]];
    for (int i = 0; i < entries; i++)
        ev->row_coefficient[i] = ev->coefficient[t->row_entry[i]];
    for (size_t i = 0; i < t->terms; i++)
        ev->term_coefficient[i] = ev->coefficient[t->term_entry[i]];
}

void evaluator_fill_numbers(const table *t, double *values)
{
    for (size_t e = 0; e < t->graph.count; e++)
        if (t->graph.nodes[e].kind == EXPRESSION_NUMBER)
            values[e] = t->graph.nodes[e].value;
}

lb_status lb_evaluator_bind(lb_evaluator *ev, const double *k, lb_error *err)
{
    const table *t = ev->table;
    const lb_network *net = ev->system->network;
    for (int j = 0; j < ev->system->m; j++)
        ev->k_spare[j] = k ? k[j] : net->constants[j].value;
    program_run(&t->constant_program, ev->k_spare, ev->spare);
    lb_status status = evaluator_check(net, t, ev->spare, err);
    if (status != LB_OK)
        return status;
    double *old = ev->values, *old_k = ev->k;
    ev->values = ev->spare;
    ev->spare = old;
    ev->k = ev->k_spare;
    ev->k_spare = old_k;
    bind_numbers(ev);
    return LB_OK;
}
