/* General rate laws, derivatives by constants and readings: nodes and programs.
 *
 * Symbolic derivatives are built in the table's own graph, since the network's is
 * immutable; what they share with the laws and with each other is computed once. */
#include <stdlib.h>

#include "base/memory.h"
#include "system/table.h"

static lb_status add_law(table_law *list, size_t *count, int target, expression node)
{
    if (node == EXPRESSION_NONE)
        return LB_E_NOMEM;
    list[(*count)++] = (table_law){target, node};
    return LB_OK;
}

static lb_status add_parameter(table_parameters *into, int of, int constant, expression node)
{
    if (node == EXPRESSION_NONE ||
        memory_grow(&into->list, &into->capacity, into->count, sizeof *into->list) != 0)
        return LB_E_NOMEM;
    into->list[into->count++] = (table_parameter){of, constant, node};
    return LB_OK;
}

/* Derivatives of a node by every constant in it. */
static lb_status add_parameters(expression_graph *g, table_parameters *into, int of, expression node)
{
    int *below;
    size_t length;
    if (!g->nodes[node].has_constant)
        return LB_OK;
    if (expression_below(g, node, &below, &length) != LB_OK)
        return LB_E_NOMEM;
    lb_status status = LB_OK;
    for (size_t i = 0; i < length && status == LB_OK; i++) {
        if (g->nodes[below[i]].kind != EXPRESSION_CONSTANT)
            continue;
        int constant = g->nodes[below[i]].left;
        status = add_parameter(into, of, constant, expression_derivative(g, node, EXPRESSION_CONSTANT, constant));
    }
    memory_free(below);
    return status;
}

/* One general law: its value, its derivative in every slot, those by constants. */
static lb_status add_general(table *t, const network_step *step, int s)
{
    expression rate = t->node_of[step->rate];
    lb_status status = add_law(t->rate_laws, &t->rate_law_count, s, rate);
    for (int d = t->slot_start[s]; d < t->slot_start[s + 1] && status == LB_OK; d++)
        status = add_law(t->slope_laws, &t->slope_law_count, d,
                         expression_derivative(&t->graph, rate, EXPRESSION_STATE, t->slot_state[d]));
    if (status == LB_OK)
        status = add_parameters(&t->graph, &t->laws, s, rate);
    return status;
}

static lb_status add_step(table *t, const network_step *step, int s)
{
    lb_status status = step->is_power_law ? add_parameters(&t->graph, &t->factors, s, t->node_of[step->factor])
                                          : add_general(t, step, s);
    for (int e = t->entry_start[s]; e < t->entry_start[s + 1] && status == LB_OK; e++)
        if (t->entry_node[e] != EXPRESSION_NONE)
            status = add_parameters(&t->graph, &t->coefficients, e, t->entry_node[e]);
    return status;
}

static lb_status compile_laws(const table *t, const table_law *laws, size_t count, program *out)
{
    expression *roots = memory_array(count, sizeof *roots);
    if (!roots)
        return LB_E_NOMEM;
    for (size_t i = 0; i < count; i++)
        roots[i] = laws[i].node;
    lb_status status = program_compile(&t->graph, roots, count, out);
    memory_free(roots);
    return status;
}

static lb_status compile_parameters(table *t)
{
    expression *roots = memory_array(t->laws.count, sizeof *roots);
    if (!roots)
        return LB_E_NOMEM;
    for (size_t i = 0; i < t->laws.count; i++)
        roots[i] = t->laws.list[i].node;
    lb_status status = program_compile(&t->graph, roots, t->laws.count, &t->law_program);
    memory_free(roots);
    return status;
}

static lb_status compile_readings(table *t, const lb_network *net)
{
    expression *roots = memory_array((size_t)net->reading_count, sizeof *roots);
    if (!roots)
        return LB_E_NOMEM;
    for (int i = 0; i < net->reading_count; i++)
        roots[i] = t->node_of[net->readings[i].value];
    lb_status status = program_compile(&t->graph, roots, (size_t)net->reading_count, &t->reading_program);
    memory_free(roots);
    return status;
}

lb_status table_fill_laws(table *t, const lb_network *net)
{
    t->rate_laws = memory_array((size_t)t->steps, sizeof *t->rate_laws);
    t->slope_laws = memory_array((size_t)t->slot_start[t->steps], sizeof *t->slope_laws);
    lb_status status = t->rate_laws && t->slope_laws ? LB_OK : LB_E_NOMEM;
    for (int s = 0; s < t->steps && status == LB_OK; s++)
        status = add_step(t, &net->steps[s], s);
    if (status == LB_OK)
        status = compile_laws(t, t->rate_laws, t->rate_law_count, &t->rate_program);
    if (status == LB_OK)
        status = compile_laws(t, t->slope_laws, t->slope_law_count, &t->slope_program);
    if (status == LB_OK)
        status = compile_parameters(t);
    if (status == LB_OK)
        status = compile_readings(t, net);
    return status;
}
