/* Which states a rate depends on, and the pattern of the Jacobian that follows. */
#include <limits.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/network.h"

static lb_status states_of_power_law(const network_step *step, int **states, int *count)
{
    *states = memory_array((size_t)step->order_count, sizeof **states);
    if (!*states)
        return LB_E_NOMEM;
    for (int i = 0; i < step->order_count; i++)
        (*states)[i] = step->orders[i].state;
    *count = step->order_count;
    return LB_OK;
}

static int ascending(const void *a, const void *b)
{
    int left = *(const int *)a, right = *(const int *)b;
    return (left > right) - (left < right);
}

lb_status network_rate_states(const lb_network *net, int index, int **states, int *count)
{
    const network_step *step = &net->steps[index];
    *states = NULL;
    *count = 0;
    if (step->is_power_law)
        return states_of_power_law(step, states, count);
    int *below;
    size_t length;
    if (expression_below(&net->graph, step->rate, &below, &length) != LB_OK)
        return LB_E_NOMEM;
    /* Each state is one node, and the list has room for all of them. */
    for (size_t i = 0; i < length; i++)
        if (net->graph.nodes[below[i]].kind == EXPRESSION_STATE)
            below[(*count)++] = net->graph.nodes[below[i]].left;
    qsort(below, (size_t)*count, sizeof *below, ascending);
    *states = below;
    return LB_OK;
}

/* Growing list of (column, row) pairs. */
typedef struct pair {
    int column, row;
} pair;

typedef struct pairs {
    pair *list;
    size_t count, capacity;
} pairs;

static int by_column_and_row(const void *a, const void *b)
{
    const pair *left = a, *right = b;
    if (left->column != right->column)
        return left->column < right->column ? -1 : 1;
    return (left->row > right->row) - (left->row < right->row);
}

static lb_status collect_step(const lb_network *net, int index, pairs *into)
{
    int *states, count;
    if (network_rate_states(net, index, &states, &count) != LB_OK)
        return LB_E_NOMEM;
    const network_step *step = &net->steps[index];
    lb_status status = LB_OK;
    for (int j = 0; j < count && status == LB_OK; j++) {
        for (int i = 0; i < step->entry_count && status == LB_OK; i++) {
            if (memory_grow(&into->list, &into->capacity, into->count, sizeof *into->list) != 0)
                status = LB_E_NOMEM;
            else
                into->list[into->count++] = (pair){.column = states[j], .row = step->entries[i].state};
        }
    }
    memory_free(states);
    return status;
}

/* Sorted, each pair once. */
static void sort_pairs(pairs *p)
{
    if (p->count == 0)
        return;
    qsort(p->list, p->count, sizeof *p->list, by_column_and_row);
    size_t kept = 1;
    for (size_t i = 1; i < p->count; i++)
        if (by_column_and_row(&p->list[kept - 1], &p->list[i]) != 0)
            p->list[kept++] = p->list[i];
    p->count = kept;
}

static lb_status compress(const pairs *p, int states, int **column_start, int **row)
{
    if (p->count > INT_MAX)
        return LB_E_LIMIT;
    *column_start = memory_zeroed((size_t)states + 1, sizeof **column_start);
    *row = memory_array(p->count, sizeof **row);
    if (!*column_start || !*row) {
        memory_free(*column_start);
        memory_free(*row);
        *column_start = *row = NULL;
        return LB_E_NOMEM;
    }
    for (size_t i = 0; i < p->count; i++) {
        (*column_start)[p->list[i].column + 1]++;
        (*row)[i] = p->list[i].row;
    }
    for (int j = 0; j < states; j++)
        (*column_start)[j + 1] += (*column_start)[j];
    return LB_OK;
}

lb_status network_pattern(const lb_network *net, int **column_start, int **row)
{
    *column_start = *row = NULL;
    pairs p = {0};
    lb_status status = LB_OK;
    for (int s = 0; s < net->step_count && status == LB_OK; s++)
        status = collect_step(net, s, &p);
    if (status == LB_OK) {
        sort_pairs(&p);
        status = compress(&p, net->states, column_start, row);
    }
    memory_free(p.list);
    return status;
}
