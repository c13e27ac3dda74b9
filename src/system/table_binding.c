/* What a binding of constants computes, and what it must come to. */
#include "base/memory.h"
#include "system/table.h"

static lb_status add_check(table *t, expression node, table_bound bound)
{
    if (node == EXPRESSION_NONE)
        return LB_OK;
    if (memory_grow(&t->checks, &t->check_capacity, t->check_count, sizeof *t->checks) != 0)
        return LB_E_NOMEM;
    t->checks[t->check_count++] = (table_check){t->node_of[node], bound};
    return LB_OK;
}

static lb_status check_species(table *t, const network_species *species)
{
    table_bound bound = species->is_signed ? BOUND_FINITE : BOUND_NOT_NEGATIVE;
    const expression values[] = {species->held, species->feed, species->initial};
    lb_status status = LB_OK;
    for (int i = 0; i < 3 && status == LB_OK; i++)
        status = add_check(t, values[i], bound);
    return status;
}

static lb_status check_step(table *t, const network_step *step)
{
    lb_status status = add_check(t, step->rate_constant, BOUND_NOT_NEGATIVE);
    if (status == LB_OK && step->is_power_law && step->factor != step->rate_constant)
        status = add_check(t, step->factor, BOUND_FINITE);
    for (int i = 0; i < step->entry_count && status == LB_OK; i++)
        status = add_check(t, step->entries[i].expression, BOUND_FINITE);
    return status;
}

lb_status table_fill_binding(table *t, const lb_network *net)
{
    t->factor_node = memory_array((size_t)t->steps, sizeof *t->factor_node);
    if (!t->factor_node)
        return LB_E_NOMEM;
    for (int s = 0; s < t->steps; s++)
        t->factor_node[s] = net->steps[s].is_power_law ? t->node_of[net->steps[s].factor] : EXPRESSION_NONE;
    for (int e = 0; e < t->entry_start[t->steps]; e++)
        t->has_varied_coefficient = t->has_varied_coefficient || t->entry_node[e] != EXPRESSION_NONE;
    lb_status status = add_check(t, net->residence, BOUND_POSITIVE);
    for (int i = 0; i < net->species_count && status == LB_OK; i++)
        status = check_species(t, &net->species[i]);
    for (int s = 0; s < t->steps && status == LB_OK; s++)
        status = check_step(t, &net->steps[s]);
    return status == LB_OK ? program_compile_constants(&t->graph, &t->constant_program) : status;
}
