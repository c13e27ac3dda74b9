/* Steps: one-way reactions and the flows of a tank.
 *
 * A rate that is one product of powers with literal orders is taken apart into a
 * factor of constants and orders of states, so that the tables never see its
 * expression; everything else keeps the expression.  Net changes are collected
 * from the terms of the reaction, exactly. */
#include <math.h>
#include <stdlib.h>

#include "base/memory.h"
#include "model/network.h"
#include "model/network_build.h"

/* ---- Net changes ---------------------------------------------------------------- */

static int by_state(const void *a, const void *b)
{
    int left = ((const network_entry *)a)->state, right = ((const network_entry *)b)->state;
    return (left > right) - (left < right);
}

/* A term of a dynamic species as an entry, with its sign; false without memory. */
static bool entry_of_term(lb_network *net, const network_term *term, bool is_gain, network_entry *entry)
{
    *entry = (network_entry){.state = net->species[term->species].state, .num = is_gain ? term->num : -term->num,
                             .den = term->den, .expression = term->expression};
    if (term->expression == EXPRESSION_NONE || is_gain)
        return true;
    entry->expression = expression_unary(&net->graph, EXPRESSION_NEGATE, term->expression);
    return entry->expression != EXPRESSION_NONE;
}

/* Appends the dynamic species of a side; returns the new count, or -1 without memory. */
static int collect_side(lb_network *net, const network_term *terms, int term_count, bool is_gain,
                        network_entry *entries, int count)
{
    for (int i = 0; i < term_count; i++) {
        if (net->species[terms[i].species].role != ROLE_DYNAMIC)
            continue;
        if (!entry_of_term(net, &terms[i], is_gain, &entries[count]))
            return -1;
        count++;
    }
    return count;
}

/* Adds up entries of one state and drops what cancels; the new count, or -1. */
static int merge_entries(lb_network *net, network_entry *entries, int count)
{
    int kept = 0;
    for (int i = 0; i < count; i++) {
        network_entry *last = &entries[kept > 0 ? kept - 1 : 0];
        if (kept == 0 || last->state != entries[i].state) {
            entries[kept++] = entries[i];
            continue;
        }
        if (!coefficient_add(&net->graph, &last->num, &last->den, &last->expression,
                             entries[i].num, entries[i].den, entries[i].expression))
            return -1;
    }
    int left = 0;
    for (int i = 0; i < kept; i++)
        if (entries[i].expression != EXPRESSION_NONE || entries[i].num != 0)
            entries[left++] = entries[i];
    return left;
}

static bool fill_entries(lb_network *net, network_step *step)
{
    const network_reaction *reaction = &net->reactions[step->reaction];
    bool forward = step->direction == STEP_FORWARD;
    step->entries = memory_array((size_t)reaction->reactant_count + (size_t)reaction->product_count,
                                 sizeof *step->entries);
    if (!step->entries)
        return false;
    int count = collect_side(net, reaction->products, reaction->product_count, forward, step->entries, 0);
    if (count >= 0)
        count = collect_side(net, reaction->reactants, reaction->reactant_count, !forward, step->entries, count);
    if (count < 0)
        return false;
    if (count > 1)
        qsort(step->entries, (size_t)count, sizeof *step->entries, by_state);
    step->entry_count = merge_entries(net, step->entries, count);
    if (step->entry_count < 0) {
        step->entry_count = 0;
        return false;
    }
    return true;
}

/* ---- Power laws ------------------------------------------------------------------ */

/* A product being taken apart: factor * prod states^orders. */
typedef struct product {
    expression_graph *g;
    expression factor;
    network_order *orders;
    int order_count;
    struct { expression e; double power; } stack[64];
    int depth;
    bool is_power_law, is_out_of_memory;
} product;

enum { STACK_DEPTH = 64, ORDER_LIMIT = 10000 };

static void push(product *p, expression e, double power)
{
    if (p->depth == STACK_DEPTH) {
        p->is_power_law = false;
        return;
    }
    p->stack[p->depth].e = e;
    p->stack[p->depth++].power = power;
}

/* factor *= e^power for what has constants alone. */
static void take_constant(product *p, expression e, double power)
{
    expression_kind kind = power < 0 ? EXPRESSION_DIVIDE : EXPRESSION_MULTIPLY;
    if (fabs(power) != 1)
        e = expression_binary(p->g, EXPRESSION_POWER, e, expression_number(p->g, fabs(power)));
    p->factor = expression_binary(p->g, kind, p->factor, e);
}

static void take_state(product *p, int state, double power)
{
    if (p->order_count == ORDER_LIMIT) {
        p->is_power_law = false;
        return;
    }
    network_order *grown = network_grow(p->orders, p->order_count, sizeof *grown);
    if (!grown) {
        p->is_out_of_memory = true;
        return;
    }
    p->orders = grown;
    grown[p->order_count++] = (network_order){.state = state, .order = power};
}

/* (e^n)^power: may be taken as e^(n*power) when e is a state and power is 1 or -1,
 * or when both exponents are whole and e is a product. */
static void take_power(product *p, const expression_node *node, double power)
{
    double n;
    if (!expression_is_number(p->g, node->right, &n)) {
        p->is_power_law = false;
        return;
    }
    bool is_whole = n == floor(n) && power == floor(power);
    if (is_whole || (p->g->nodes[node->left].kind == EXPRESSION_STATE && fabs(power) == 1))
        push(p, node->left, n * power);
    else
        p->is_power_law = false;
}

static void take_node(product *p, expression e, double power)
{
    expression_node node = p->g->nodes[e];
    if (!node.has_state) {
        take_constant(p, e, power);
        return;
    }
    switch (node.kind) {
    case EXPRESSION_STATE:
        take_state(p, node.left, power);
        break;
    case EXPRESSION_MULTIPLY:
    case EXPRESSION_DIVIDE:
        push(p, node.right, node.kind == EXPRESSION_DIVIDE ? -power : power);
        push(p, node.left, power);
        break;
    case EXPRESSION_NEGATE:
        if (fmod(power, 2) != 0)
            p->factor = expression_unary(p->g, EXPRESSION_NEGATE, p->factor);
        push(p, node.left, power);
        break;
    case EXPRESSION_POWER:
        take_power(p, &node, power);
        break;
    default:
        p->is_power_law = false;
    }
}

static int order_by_state(const void *a, const void *b)
{
    int left = ((const network_order *)a)->state, right = ((const network_order *)b)->state;
    return (left > right) - (left < right);
}

/* By state, equal states added up, zero orders dropped. */
static int merge_orders(network_order *orders, int count)
{
    if (count > 1)
        qsort(orders, (size_t)count, sizeof *orders, order_by_state);
    int kept = 0;
    for (int i = 0; i < count; i++) {
        if (kept > 0 && orders[kept - 1].state == orders[i].state)
            orders[kept - 1].order += orders[i].order;
        else
            orders[kept++] = orders[i];
    }
    int left = 0;
    for (int i = 0; i < kept; i++)
        if (orders[i].order != 0)
            orders[left++] = orders[i];
    return left;
}

/* Fills is_power_law, factor and orders from the rate; false without memory. */
static bool recognise(expression_graph *g, network_step *step)
{
    product p = {.g = g, .factor = expression_number(g, 1), .is_power_law = true};
    push(&p, step->rate, 1);
    while (p.depth > 0 && p.is_power_law && !p.is_out_of_memory) {
        p.depth--;
        take_node(&p, p.stack[p.depth].e, p.stack[p.depth].power);
        p.is_out_of_memory = p.is_out_of_memory || p.factor == EXPRESSION_NONE;
    }
    if (p.is_out_of_memory || !p.is_power_law) {
        memory_free(p.orders);
        return !p.is_out_of_memory;
    }
    step->is_power_law = true;
    step->factor = p.factor;
    step->orders = p.orders;
    step->order_count = merge_orders(p.orders, p.order_count);
    return true;
}

/* ---- Steps ----------------------------------------------------------------------- */

static char *step_name(const network_reaction *reaction, network_direction direction)
{
    if (!reaction->is_reversible)
        return reaction->label;
    buffer text;
    buffer_init(&text);
    buffer_append(&text, reaction->label);
    buffer_append(&text, direction == STEP_FORWARD ? ".forward" : ".reverse");
    return buffer_take(&text);
}

/* An empty step at the end; NULL without memory. */
static network_step *append_step(lb_network *net, int reaction, network_direction direction, char *name)
{
    network_step *grown = network_grow(net->steps, net->step_count, sizeof *grown);
    if (grown)
        net->steps = grown;
    if (!grown || !name) {
        if (reaction < 0 || name != net->reactions[reaction].label)
            memory_free(name);
        return NULL;
    }
    network_step *step = &net->steps[net->step_count++];
    *step = (network_step){.name = name, .reaction = reaction, .direction = direction, .factor = EXPRESSION_NONE,
                           .rate_constant = EXPRESSION_NONE, .rate = EXPRESSION_NONE};
    return step;
}

static network_step *append_reaction_step(lb_network *net, int reaction, network_direction direction)
{
    network_reaction *owner = &net->reactions[reaction];
    network_step *step = append_step(net, reaction, direction, step_name(owner, direction));
    if (!step || !fill_entries(net, step))
        return NULL;
    if (owner->step_count++ == 0)
        owner->first_step = net->step_count - 1;
    net->reaction_steps = net->step_count;
    return step;
}

static const network_term *used_side(const lb_network *net, const network_step *step, int *count)
{
    const network_reaction *reaction = &net->reactions[step->reaction];
    bool forward = step->direction == STEP_FORWARD;
    *count = forward ? reaction->reactant_count : reaction->product_count;
    return forward ? reaction->reactants : reaction->products;
}

/* Are the orders the coefficients of the side that is used up? */
static bool has_mass_action_orders(const lb_network *net, const network_step *step)
{
    int count, found = 0;
    const network_term *terms = used_side(net, step, &count);
    for (int i = 0; i < count; i++) {
        if (net->species[terms[i].species].role != ROLE_DYNAMIC)
            continue;
        network_order key = {.state = net->species[terms[i].species].state};
        const network_order *order = step->order_count == 0 ? NULL :
            bsearch(&key, step->orders, (size_t)step->order_count, sizeof key, order_by_state);
        if (!order || terms[i].expression != EXPRESSION_NONE ||
            order->order != (double)terms[i].num / (double)terms[i].den)
            return false;
        found++;
    }
    return found == step->order_count;
}

int network_add_step(lb_network *net, int reaction, network_direction direction, expression rate)
{
    if (rate == EXPRESSION_NONE)
        return -1;
    network_step *step = append_reaction_step(net, reaction, direction);
    if (!step)
        return -1;
    step->rate = rate;
    if (!recognise(&net->graph, step))
        return -1;
    step->is_mass_action = step->is_power_law && has_mass_action_orders(net, step);
    return net->step_count - 1;
}

/* e * [S]^coefficient */
static expression times_power(lb_network *net, expression e, expression concentration, const network_term *term)
{
    expression order = coefficient_expression(&net->graph, term->num, term->den, term->expression);
    expression power = expression_binary(&net->graph, EXPRESSION_POWER, concentration, order);
    return expression_binary(&net->graph, EXPRESSION_MULTIPLY, e, power);
}

/* Orders straight from the terms, since a rate constant that is the number zero
 * would take them with it.  False without memory. */
static bool fill_mass_action_orders(lb_network *net, network_step *step, const network_term *terms, int count)
{
    step->orders = memory_array((size_t)count, sizeof *step->orders);
    if (!step->orders)
        return false;
    for (int i = 0; i < count; i++) {
        const network_species *species = &net->species[terms[i].species];
        if (species->role == ROLE_DYNAMIC)
            step->orders[step->order_count++] =
                (network_order){.state = species->state, .order = (double)terms[i].num / (double)terms[i].den};
    }
    step->order_count = merge_orders(step->orders, step->order_count);
    return true;
}

int network_add_mass_action(lb_network *net, int reaction, network_direction direction, expression k)
{
    network_step *step = k == EXPRESSION_NONE ? NULL : append_reaction_step(net, reaction, direction);
    if (!step)
        return -1;
    int count;
    const network_term *terms = used_side(net, step, &count);
    step->rate_constant = k;
    step->factor = k;
    step->is_power_law = true;
    for (int i = 0; i < count; i++) {
        const network_species *species = &net->species[terms[i].species];
        if (species->role == ROLE_HELD)
            step->factor = times_power(net, step->factor, species->held, &terms[i]);
        else if (terms[i].expression != EXPRESSION_NONE)
            step->is_power_law = false;
    }
    step->rate = step->factor;
    for (int i = 0; i < count; i++) {
        const network_species *species = &net->species[terms[i].species];
        if (species->role == ROLE_DYNAMIC)
            step->rate = times_power(net, step->rate, expression_state(&net->graph, species->state), &terms[i]);
    }
    if (step->rate == EXPRESSION_NONE)
        return -1;
    step->is_mass_action = step->is_power_law;
    if (!step->is_power_law)
        step->factor = EXPRESSION_NONE;
    else if (!fill_mass_action_orders(net, step, terms, count))
        return -1;
    return net->step_count - 1;
}

/* ---- The flows of a tank ------------------------------------------------------------ */

static char *flow_name(const network_species *species, network_direction direction)
{
    buffer text;
    buffer_init(&text);
    buffer_append(&text, species->bracket);
    buffer_append(&text, direction == STEP_INFLOW ? " inflow" : " outflow");
    return buffer_take(&text);
}

static bool add_flow(lb_network *net, int state, network_direction direction, expression factor)
{
    const network_species *species = &net->species[net->state_species[state]];
    network_step *step = append_step(net, -1, direction, flow_name(species, direction));
    if (!step || factor == EXPRESSION_NONE)
        return false;
    step->is_power_law = step->is_mass_action = true;
    step->factor = step->rate = factor;
    step->entries = memory_array(1, sizeof *step->entries);
    if (!step->entries)
        return false;
    step->entries[step->entry_count++] = (network_entry){
        .state = state, .num = direction == STEP_INFLOW ? 1 : -1, .den = 1, .expression = EXPRESSION_NONE};
    if (direction == STEP_INFLOW)
        return true;
    step->orders = memory_array(1, sizeof *step->orders);
    if (!step->orders)
        return false;
    step->orders[step->order_count++] = (network_order){.state = state, .order = 1};
    expression concentration = expression_state(&net->graph, state);
    step->rate = expression_binary(&net->graph, EXPRESSION_DIVIDE, concentration, net->residence);
    return step->rate != EXPRESSION_NONE;
}

static bool is_fed(const lb_network *net, const network_species *species)
{
    double feed;
    bool is_zero = expression_is_number(&net->graph, species->feed, &feed) && feed == 0;
    return species->feed != EXPRESSION_NONE && !is_zero;
}

int network_set_tank(lb_network *net, expression residence)
{
    if (residence == EXPRESSION_NONE)
        return -1;
    net->is_tank = true;
    net->residence = residence;
    expression_graph *g = &net->graph;
    expression outflow = expression_binary(g, EXPRESSION_DIVIDE, expression_number(g, 1), residence);
    for (int state = 0; state < net->states; state++) {
        const network_species *species = &net->species[net->state_species[state]];
        if (species->is_retained)
            continue;
        expression inflow = expression_binary(g, EXPRESSION_DIVIDE, species->feed, residence);
        if (is_fed(net, species) && !add_flow(net, state, STEP_INFLOW, inflow))
            return -1;
        if (!add_flow(net, state, STEP_OUTFLOW, outflow))
            return -1;
    }
    return 0;
}
