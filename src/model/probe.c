/* One rate at sample points with chosen concentrations at zero.
 *
 * Only the nodes below the rate are visited.  The sample points are a fixed
 * low-discrepancy sequence over four decades around one (Weyl's, by the golden
 * ratio), so the same file gives the same warnings. */
#include "model/probe.h"

#include <math.h>

#include "base/memory.h"

lb_status probe_init(probe *p, const lb_network *net)
{
    *p = (probe){.net = net};
    p->k = memory_array((size_t)net->constant_count, sizeof *p->k);
    p->x = memory_zeroed((size_t)net->states, sizeof *p->x);
    p->values = memory_array(net->graph.count, sizeof *p->values);
    if (!p->k || !p->x || !p->values) {
        probe_clear(p);
        return LB_E_NOMEM;
    }
    for (int i = 0; i < net->constant_count; i++)
        p->k[i] = net->constants[i].value;
    return LB_OK;
}

void probe_clear(probe *p)
{
    memory_free(p->k);
    memory_free(p->x);
    memory_free(p->values);
    memory_free(p->nodes);
    memory_free(p->states);
    *p = (probe){.net = NULL};
}

lb_status probe_take(probe *p, expression rate)
{
    memory_free(p->nodes);
    p->nodes = NULL;
    p->node_count = p->state_count = 0;
    lb_status status = expression_below(&p->net->graph, rate, &p->nodes, &p->node_count);
    for (size_t i = 0; i < p->node_count; i++) {
        const expression_node *node = &p->net->graph.nodes[p->nodes[i]];
        if (node->kind != EXPRESSION_STATE)
            continue;
        if (memory_grow(&p->states, &p->state_capacity, p->state_count, sizeof *p->states))
            return LB_E_NOMEM;
        p->states[p->state_count++] = node->left;
    }
    p->work += p->node_count;
    return status;
}

static double sample(int point, int state)
{
    const double golden = 0.6180339887498949;
    double u = fmod(golden * (PROBE_POINTS * (double)state + point + 1), 1);
    return pow(10, 4 * u - 2);
}

double probe_value(probe *p, int point, const unsigned char *is_zero, int zero)
{
    for (size_t i = 0; i < p->state_count; i++) {
        int s = p->states[i];
        p->x[s] = s == zero || (is_zero && is_zero[s]) ? 0 : sample(point, s);
    }
    for (size_t i = 0; i < p->node_count; i++)
        expression_evaluate(&p->net->graph, p->nodes[i], p->nodes[i], NULL, p->k, p->x, p->values);
    p->work += p->node_count;
    return p->values[p->nodes[p->node_count - 1]];
}
