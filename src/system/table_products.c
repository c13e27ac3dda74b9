/* Power laws as packed products.
 *
 * A rate of up to three unit powers is three indices, with the index of a
 * constant one where there are fewer, and its derivatives are two (the product
 * with one factor taken out, never divided by it).  Higher whole orders are
 * repeated factors up to REPEAT_LIMIT, other orders powers, in chains of links. */
#include <math.h>

#include "base/memory.h"
#include "system/table.h"

enum { REPEAT_LIMIT = 8 };

/* The factors of a power law as repeated states; the count, or -1 when it is not a product
 * of at most `limit` unit powers. */
static int unit_factors(const network_step *step, int limit, int *factors)
{
    int count = 0;
    for (int i = 0; i < step->order_count; i++) {
        double order = step->orders[i].order;
        if (order < 0 || order != floor(order) || order > limit - count)
            return -1;
        for (int j = 0; j < (int)order; j++)
            factors[count++] = step->orders[i].state;
    }
    return count;
}

static void add_packed(table *t, int s, const int *factors, int count)
{
    int one = t->n;
    t->rates[t->rate_count++] = (table_rate){s, count > 0 ? factors[0] : one, count > 1 ? factors[1] : one,
                                             count > 2 ? factors[2] : one};
    for (int d = t->slot_start[s]; d < t->slot_start[s + 1]; d++) {
        int others[2] = {one, one}, other_count = 0, multiplicity = 0;
        for (int i = 0; i < count; i++) {
            if (factors[i] == t->slot_state[d] && multiplicity++ == 0)
                continue;
            others[other_count++] = factors[i];
        }
        t->slopes[t->slope_count++] = (table_slope){d, s, others[0], others[1], multiplicity};
    }
}

static lb_status add_link(table_chains *chains, int state, table_operation operation, double order)
{
    if (memory_grow(&chains->link, &chains->link_capacity, chains->link_count, sizeof *chains->link) != 0)
        return LB_E_NOMEM;
    chains->link[chains->link_count++] = (table_link){state, order == 1 ? LINK_PLAIN : operation, order};
    return LB_OK;
}

/* x^order as links: repeated for small whole orders. */
static lb_status add_power(table_chains *chains, int state, double order)
{
    if (order < 0 || order != floor(order) || order > REPEAT_LIMIT)
        return add_link(chains, state, LINK_POWER, order);
    lb_status status = LB_OK;
    for (int i = 0; i < (int)order && status == LB_OK; i++)
        status = add_link(chains, state, LINK_PLAIN, 1);
    return status;
}

/* One chain for the rate, or for its derivative by the state `by` (-1: the rate). */
static lb_status add_chain(table_chains *chains, const network_step *step, int s, int target, int by)
{
    table_chain chain = {.target = target, .step = s, .multiplier = 1, .first = chains->link_count};
    lb_status status = LB_OK;
    for (int i = 0; i < step->order_count && status == LB_OK; i++) {
        double order = step->orders[i].order;
        int state = step->orders[i].state;
        if (state != by) {
            status = add_power(chains, state, order);
        } else if (order > 0 && order == floor(order)) {
            chain.multiplier = order;
            status = add_power(chains, state, order - 1);
        } else {
            status = add_link(chains, state, LINK_SLOPE, order);
        }
    }
    chain.last = chains->link_count;
    if (status == LB_OK && memory_grow(&chains->chain, &chains->capacity, chains->count, sizeof chain) != 0)
        status = LB_E_NOMEM;
    if (status == LB_OK)
        chains->chain[chains->count++] = chain;
    return status;
}

static lb_status add_chains(table *t, const network_step *step, int s)
{
    lb_status status = add_chain(&t->rate_chains, step, s, s, -1);
    for (int d = t->slot_start[s]; d < t->slot_start[s + 1] && status == LB_OK; d++)
        status = add_chain(&t->slope_chains, step, s, d, t->slot_state[d]);
    return status;
}

lb_status table_fill_products(table *t, const lb_network *net)
{
    t->rates = memory_array((size_t)t->steps, sizeof *t->rates);
    t->slopes = memory_array((size_t)t->slot_start[t->steps], sizeof *t->slopes);
    lb_status status = t->rates && t->slopes ? LB_OK : LB_E_NOMEM;
    for (int s = 0; s < t->steps && status == LB_OK; s++) {
        const network_step *step = &net->steps[s];
        if (!step->is_power_law)
            continue;
        int factors[3];
        int count = unit_factors(step, 3, factors);
        if (count >= 0)
            add_packed(t, s, factors, count);
        else
            status = add_chains(t, step, s);
    }
    return status;
}
