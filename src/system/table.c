/* Tables of the network's structure: entries, slots, rows and Jacobian sums.
 *
 * The right-hand side is a sparse matrix of net coefficients times the vector of
 * rates, the Jacobian the same matrix times the derivatives of the rates; both
 * products are stored as compressed sums, each in network order, so that results
 * do not depend on how the tables were made. */
#include "system/table.h"

#include <limits.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"

void table_free(table *t)
{
    if (!t)
        return;
    void *blocks[] = {t->entry_start, t->entry_state, t->entry_value, t->entry_node, t->slot_start, t->slot_state,
                      t->row_start, t->row_entry, t->row_step, t->term_start, t->term_slot, t->term_entry, t->nonzero_order,
                      t->rates, t->slopes, t->rate_chains.chain, t->rate_chains.link, t->slope_chains.chain,
                      t->slope_chains.link, t->rate_laws, t->slope_laws, t->factors.list, t->laws.list,
                      t->coefficients.list, t->factor_node, t->checks, t->node_of, t->ones};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
    program_clear(&t->constant_program);
    program_clear(&t->rate_program);
    program_clear(&t->slope_program);
    program_clear(&t->law_program);
    program_clear(&t->reading_program);
    expression_graph_clear(&t->graph);
    memory_free(t);
}

static lb_status fill_entries(table *t, const lb_network *net)
{
    size_t entries = 0;
    for (int s = 0; s < t->steps; s++)
        entries += (size_t)net->steps[s].entry_count;
    if (entries > INT_MAX)
        return LB_E_LIMIT;
    t->entry_start = memory_zeroed((size_t)t->steps + 1, sizeof *t->entry_start);
    t->entry_state = memory_array(entries, sizeof *t->entry_state);
    t->entry_value = memory_array(entries, sizeof *t->entry_value);
    t->entry_node = memory_array(entries, sizeof *t->entry_node);
    if (!t->entry_start || !t->entry_state || !t->entry_value || !t->entry_node)
        return LB_E_NOMEM;
    int at = 0;
    for (int s = 0; s < t->steps; s++) {
        const network_step *step = &net->steps[s];
        for (int i = 0; i < step->entry_count; i++, at++) {
            const network_entry *entry = &step->entries[i];
            t->entry_state[at] = entry->state;
            t->entry_value[at] = entry->expression == EXPRESSION_NONE ? (double)entry->num / (double)entry->den : 0;
            t->entry_node[at] = EXPRESSION_NONE;
            if (entry->expression != EXPRESSION_NONE)
                t->entry_node[at] = t->node_of[entry->expression];
        }
        t->entry_start[s + 1] = at;
    }
    return LB_OK;
}

static lb_status fill_slots(table *t, const lb_network *net)
{
    t->slot_start = memory_zeroed((size_t)t->steps + 1, sizeof *t->slot_start);
    if (!t->slot_start)
        return LB_E_NOMEM;
    size_t count = 0, capacity = 0;
    for (int s = 0; s < t->steps; s++) {
        int *states, state_count;
        if (network_rate_states(net, s, &states, &state_count) != LB_OK)
            return LB_E_NOMEM;
        lb_status status = LB_OK;
        for (int j = 0; j < state_count && status == LB_OK; j++) {
            if (count == INT_MAX)
                status = LB_E_LIMIT;
            else if (memory_grow(&t->slot_state, &capacity, count, sizeof *t->slot_state) != 0)
                status = LB_E_NOMEM;
            else
                t->slot_state[count++] = states[j];
        }
        memory_free(states);
        if (status != LB_OK)
            return status;
        t->slot_start[s + 1] = (int)count;
    }
    return LB_OK;
}

/* The entries of each state, by counting sort, which keeps the network's order. */
static lb_status fill_rows(table *t)
{
    int entries = t->entry_start[t->steps];
    lb_status status = LB_E_NOMEM;
    int *next = memory_array((size_t)t->n, sizeof *next);
    t->row_start = memory_zeroed((size_t)t->n + 1, sizeof *t->row_start);
    t->row_entry = memory_array((size_t)entries, sizeof *t->row_entry);
    t->row_step = memory_array((size_t)entries, sizeof *t->row_step);
    if (!next || !t->row_start || !t->row_entry || !t->row_step)
        goto done;
    for (int e = 0; e < entries; e++)
        t->row_start[t->entry_state[e] + 1]++;
    for (int i = 0; i < t->n; i++) {
        t->row_start[i + 1] += t->row_start[i];
        next[i] = t->row_start[i];
    }
    for (int s = 0; s < t->steps; s++) {
        for (int e = t->entry_start[s]; e < t->entry_start[s + 1]; e++) {
            int place = next[t->entry_state[e]]++;
            t->row_entry[place] = e;
            t->row_step[place] = s;
        }
    }
    status = LB_OK;
done:
    memory_free(next);
    return status;
}

static int ascending(const void *a, const void *b)
{
    int left = *(const int *)a, right = *(const int *)b;
    return (left > right) - (left < right);
}

/* Place of entry (i, j) in the pattern. */
static int place_in_pattern(const int *column_start, const int *row, int i, int j)
{
    const int *column = row + column_start[j];
    size_t length = (size_t)(column_start[j + 1] - column_start[j]);
    const int *found = bsearch(&i, column, length, sizeof *column, ascending);
    return (int)(found - row);
}

/* Every pair (slot, entry) of every step is a term, in network order: counted for each nonzero
 * when `next` is NULL, else put in place. */
static void walk_terms(table *t, const int *column_start, const int *row, size_t *next)
{
    for (int s = 0; s < t->steps; s++) {
        for (int d = t->slot_start[s]; d < t->slot_start[s + 1]; d++) {
            for (int e = t->entry_start[s]; e < t->entry_start[s + 1]; e++) {
                int z = place_in_pattern(column_start, row, t->entry_state[e], t->slot_state[d]);
                if (!next) {
                    t->term_start[z + 1]++;
                    continue;
                }
                t->term_slot[next[z]] = d;
                t->term_entry[next[z]++] = e;
            }
        }
    }
}

/* Most sums of a sparse Jacobian are one term: these need no loop of their own. */
static lb_status order_nonzeros(table *t)
{
    t->nonzero_order = memory_array((size_t)t->nonzeros, sizeof *t->nonzero_order);
    if (!t->nonzero_order)
        return LB_E_NOMEM;
    int last = t->nonzeros;
    for (int z = 0; z < t->nonzeros; z++)
        if (t->term_start[z + 1] - t->term_start[z] == 1)
            t->nonzero_order[t->single_terms++] = z;
    for (int z = t->nonzeros - 1; z >= 0; z--)
        if (t->term_start[z + 1] - t->term_start[z] != 1)
            t->nonzero_order[--last] = z;
    return LB_OK;
}

static lb_status fill_terms(table *t, const int *column_start, const int *row)
{
    lb_status status = LB_E_NOMEM;
    size_t *next = memory_array((size_t)t->nonzeros, sizeof *next);
    t->term_start = memory_zeroed((size_t)t->nonzeros + 1, sizeof *t->term_start);
    if (!next || !t->term_start)
        goto done;
    walk_terms(t, column_start, row, NULL);
    for (int z = 0; z < t->nonzeros; z++) {
        t->term_start[z + 1] += t->term_start[z];
        next[z] = t->term_start[z];
    }
    t->terms = t->term_start[t->nonzeros];
    t->term_slot = memory_array(t->terms, sizeof *t->term_slot);
    t->term_entry = memory_array(t->terms, sizeof *t->term_entry);
    if (!t->term_slot || !t->term_entry)
        goto done;
    walk_terms(t, column_start, row, next);
    status = order_nonzeros(t);
done:
    memory_free(next);
    return status;
}

/* Nodes that an evaluation can ask for, copied from the network's graph in ascending order. */
static lb_status import_nodes(table *t, const lb_network *net)
{
    lb_status status = LB_E_NOMEM;
    unsigned char *needed = memory_zeroed(net->graph.count, 1);
    t->node_of = memory_array(net->graph.count, sizeof *t->node_of);
    if (!needed || !t->node_of)
        goto done;
    for (int s = 0; s < net->step_count; s++) {
        const network_step *step = &net->steps[s];
        expression_mark(&net->graph, step->is_power_law ? step->factor : step->rate, needed);
        if (step->rate_constant != EXPRESSION_NONE)
            expression_mark(&net->graph, step->rate_constant, needed);
        for (int i = 0; i < step->entry_count; i++)
            if (step->entries[i].expression != EXPRESSION_NONE)
                expression_mark(&net->graph, step->entries[i].expression, needed);
    }
    for (int i = 0; i < net->species_count; i++) {
        expression values[] = {net->species[i].initial, net->species[i].feed, net->species[i].held};
        for (int j = 0; j < 3; j++)
            if (values[j] != EXPRESSION_NONE)
                expression_mark(&net->graph, values[j], needed);
    }
    for (int i = 0; i < net->reading_count; i++)
        expression_mark(&net->graph, net->readings[i].value, needed);
    if (net->residence != EXPRESSION_NONE)
        expression_mark(&net->graph, net->residence, needed);
    status = LB_OK;
    for (size_t e = 0; e < net->graph.count && status == LB_OK; e++) {
        t->node_of[e] = EXPRESSION_NONE;
        if (needed[e])
            status = expression_import(&t->graph, &net->graph, (int)e, t->node_of);
    }
done:
    memory_free(needed);
    return status;
}

static lb_status fill_ones(table *t)
{
    t->ones = memory_array((size_t)t->steps, sizeof *t->ones);
    for (int s = 0; t->ones && s < t->steps; s++)
        t->ones[s] = 1;
    return t->ones ? LB_OK : LB_E_NOMEM;
}

lb_status table_new(const lb_network *net, const int *column_start, const int *row, table **out)
{
    *out = NULL;
    table *t = memory_zeroed(1, sizeof *t);
    if (!t)
        return LB_E_NOMEM;
    t->n = net->states;
    t->steps = net->step_count;
    t->nonzeros = column_start[t->n];
    expression_graph_init(&t->graph);
    lb_status status = import_nodes(t, net);
    if (status == LB_OK)
        status = fill_entries(t, net);
    if (status == LB_OK)
        status = fill_slots(t, net);
    if (status == LB_OK)
        status = fill_rows(t);
    if (status == LB_OK)
        status = fill_terms(t, column_start, row);
    if (status == LB_OK)
        status = fill_ones(t);
    if (status == LB_OK)
        status = table_fill_products(t, net);
    if (status == LB_OK)
        status = table_fill_laws(t, net);
    if (status == LB_OK)
        status = table_fill_binding(t, net);
    if (status != LB_OK) {
        table_free(t);
        return status;
    }
    *out = t;
    return LB_OK;
}
