/* From the network to the sums that each emitted function computes.
 *
 * Rates of power laws are differentiated as products of powers, order by order,
 * so that k*x^2*y gives 2*k*x*y as a chemist would write it; all others through
 * the expression graph.  Both give exact derivatives and share what they have in
 * common, since the graph holds equal expressions once. */
#include "emit/sums.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"

void sums_clear(sums *s)
{
    memory_free(s->items);
    memory_free(s->terms);
    memset(s, 0, sizeof *s);
}

/* Index of the new item, or -1 without memory. */
static int add_item(sums *s, sums_item item)
{
    if (item.value == EXPRESSION_NONE ||
        memory_grow(&s->items, &s->item_capacity, s->item_count, sizeof item) != 0)
        return -1;
    s->items[s->item_count] = item;
    return (int)s->item_count++;
}

static lb_status add_term(sums *s, sums_term term)
{
    if (memory_grow(&s->terms, &s->term_capacity, s->term_count, sizeof term) != 0)
        return LB_E_NOMEM;
    s->terms[s->term_count++] = term;
    return LB_OK;
}

/* Targets that no term reaches are zero. */
static lb_status add_zeros(sums *s, size_t targets)
{
    unsigned char *reached = memory_zeroed(targets, 1);
    lb_status status = reached ? LB_OK : LB_E_NOMEM;
    size_t count = s->term_count;
    for (size_t i = 0; reached && i < count; i++)
        reached[s->terms[i].target] = 1;
    for (size_t i = 0; status == LB_OK && i < targets; i++)
        if (!reached[i])
            status = add_term(s, (sums_term){.target = i, .item = -1, .coefficient = EXPRESSION_NONE});
    memory_free(reached);
    return status;
}

static double exact_coefficient(const network_entry *entry)
{
    return entry->expression == EXPRESSION_NONE ? (double)entry->num / (double)entry->den : 1;
}

/* ---- Rates and right-hand side --------------------------------------------- */

/* product * x^order */
static expression times_power(expression_graph *g, expression product, network_order power)
{
    expression x = expression_state(g, power.state);
    expression factor = expression_binary(g, EXPRESSION_POWER, x, expression_number(g, power.order));
    return expression_binary(g, EXPRESSION_MULTIPLY, product, factor);
}

static expression times_powers(expression_graph *g, expression product, const network_step *step)
{
    for (int i = 0; i < step->order_count; i++)
        product = times_power(g, product, step->orders[i]);
    return product;
}

/* A power law's orders are what counts, however the file writes them: x*x^(-0.7) is x^0.3. */
static expression rate_of(expression_graph *g, const network_step *step)
{
    return step->is_power_law ? times_powers(g, step->factor, step) : step->rate;
}

lb_status sums_of_rates(const lb_network *net, expression_graph *graph, sums *s)
{
    s->kind = SUMS_RATES;
    for (int i = 0; i < net->reaction_steps; i++) {
        int item = add_item(s, (sums_item){rate_of(graph, &net->steps[i]), i, -1, true});
        sums_term term = {.target = (size_t)i, .item = item, .number = 1, .coefficient = EXPRESSION_NONE};
        if (item < 0 || add_term(s, term) != LB_OK)
            return LB_E_NOMEM;
    }
    return LB_OK;
}

lb_status sums_of_rhs(const lb_network *net, expression_graph *graph, sums *s)
{
    s->kind = SUMS_RHS;
    for (int i = 0; i < net->step_count; i++) {
        const network_step *step = &net->steps[i];
        int item = add_item(s, (sums_item){rate_of(graph, step), i, -1, i >= net->reaction_steps});
        if (item < 0)
            return LB_E_NOMEM;
        for (int e = 0; e < step->entry_count; e++) {
            const network_entry *entry = &step->entries[e];
            sums_term term = {(size_t)entry->state, item, exact_coefficient(entry), entry->expression};
            if (add_term(s, term) != LB_OK)
                return LB_E_NOMEM;
        }
    }
    return add_zeros(s, (size_t)net->states);
}

/* ---- Derivatives of one rate ------------------------------------------------ */

static bool is_whole(double order)
{
    return order >= 1 && order == floor(order);
}

/* Whole orders come down in front: 2*k*x*y rather than k*(2*x)*y. */
static expression rate_by_state(expression_graph *g, const network_step *step, int state)
{
    if (!step->is_power_law)
        return expression_derivative(g, step->rate, EXPRESSION_STATE, state);
    expression product = step->factor;
    for (int i = 0; i < step->order_count; i++) {
        network_order power = step->orders[i];
        if (power.state == state && is_whole(power.order))
            product = expression_binary(g, EXPRESSION_MULTIPLY, expression_number(g, power.order), product);
    }
    for (int i = 0; i < step->order_count; i++) {
        network_order power = step->orders[i];
        if (power.state == state && is_whole(power.order))
            product = times_power(g, product, (network_order){state, power.order - 1});
        else if (power.state == state)
            product = expression_binary(g, EXPRESSION_MULTIPLY, product,
                                        expression_binary(g, EXPRESSION_SLOPE, expression_state(g, state),
                                                          expression_number(g, power.order)));
        else
            product = times_power(g, product, power);
    }
    return product;
}

static expression rate_by_constant(expression_graph *g, const network_step *step, int constant)
{
    if (!step->is_power_law)
        return expression_derivative(g, step->rate, EXPRESSION_CONSTANT, constant);
    return times_powers(g, expression_derivative(g, step->factor, EXPRESSION_CONSTANT, constant), step);
}

/* Derivatives of flows are few operations each and used once. */
static bool is_plain(const lb_network *net, const expression_graph *g, int step, expression value)
{
    return step >= net->reaction_steps || (value != EXPRESSION_NONE && g->nodes[value].kind <= EXPRESSION_STATE);
}

/* ---- Jacobian ----------------------------------------------------------------- */

static size_t find_row(const sums_pattern *pattern, int row, int column)
{
    int low = pattern->column_start[column], high = pattern->column_start[column + 1] - 1;
    while (low < high) {
        int middle = low + (high - low) / 2;
        if (pattern->row[middle] < row)
            low = middle + 1;
        else
            high = middle;
    }
    return (size_t)low;
}

static lb_status add_column_terms(const network_step *step, const sums_pattern *pattern, int item, int state, sums *s)
{
    for (int e = 0; e < step->entry_count; e++) {
        const network_entry *entry = &step->entries[e];
        sums_term term = {find_row(pattern, entry->state, state), item, exact_coefficient(entry), entry->expression};
        if (add_term(s, term) != LB_OK)
            return LB_E_NOMEM;
    }
    return LB_OK;
}

static bool is_zero(const expression_graph *g, expression e)
{
    double value;
    return expression_is_number(g, e, &value) && value == 0;
}

static lb_status add_state_terms(const lb_network *net, const sums_pattern *pattern, expression_graph *graph,
                                 int step, int state, sums *s)
{
    expression value = rate_by_state(graph, &net->steps[step], state);
    if (is_zero(graph, value))
        return LB_OK;
    int item = add_item(s, (sums_item){value, step, state, is_plain(net, graph, step, value)});
    return item < 0 ? LB_E_NOMEM : add_column_terms(&net->steps[step], pattern, item, state, s);
}

lb_status sums_of_jacobian(const lb_network *net, const sums_pattern *pattern, expression_graph *graph, sums *s)
{
    s->kind = SUMS_SPARSE;
    for (int i = 0; i < net->step_count; i++) {
        if (net->steps[i].entry_count == 0)
            continue;
        int *states, count;
        lb_status status = network_rate_states(net, i, &states, &count);
        for (int j = 0; status == LB_OK && j < count; j++)
            status = add_state_terms(net, pattern, graph, i, states[j], s);
        memory_free(states);
        if (status != LB_OK)
            return status;
    }
    return add_zeros(s, (size_t)pattern->nonzeros);
}

/* ---- Derivatives by constants --------------------------------------------------- */

/* d(coefficient)/d(constant) * rate, for the entries whose coefficient contains it. */
static lb_status add_coefficient_terms(const lb_network *net, expression_graph *g, int step, int constant, sums *s)
{
    const network_step *of = &net->steps[step];
    int rate = -1;
    for (int e = 0; e < of->entry_count; e++) {
        const network_entry *entry = &of->entries[e];
        if (entry->expression == EXPRESSION_NONE)
            continue;
        expression slope = expression_derivative(g, entry->expression, EXPRESSION_CONSTANT, constant);
        if (slope == EXPRESSION_NONE)
            return LB_E_NOMEM;
        if (is_zero(g, slope))
            continue;
        expression value = rate_of(g, of);
        if (rate < 0 && (rate = add_item(s, (sums_item){value, step, -1, is_plain(net, g, step, value)})) < 0)
            return LB_E_NOMEM;
        size_t target = (size_t)entry->state + (size_t)constant * (size_t)net->states;
        if (add_term(s, (sums_term){target, rate, 1, slope}) != LB_OK)
            return LB_E_NOMEM;
    }
    return LB_OK;
}

static lb_status add_constant_terms(const lb_network *net, expression_graph *g, int step, int constant, sums *s)
{
    const network_step *of = &net->steps[step];
    expression value = rate_by_constant(g, of, constant);
    if (value == EXPRESSION_NONE)
        return LB_E_NOMEM;
    if (!is_zero(g, value)) {
        int item = add_item(s, (sums_item){value, step, constant, is_plain(net, g, step, value)});
        if (item < 0)
            return LB_E_NOMEM;
        for (int e = 0; e < of->entry_count; e++) {
            const network_entry *entry = &of->entries[e];
            size_t target = (size_t)entry->state + (size_t)constant * (size_t)net->states;
            if (add_term(s, (sums_term){target, item, exact_coefficient(entry), entry->expression}) != LB_OK)
                return LB_E_NOMEM;
        }
    }
    return add_coefficient_terms(net, g, step, constant, s);
}

/* ---- What a step contains --------------------------------------------------------- */

static int ascending(const void *a, const void *b)
{
    int left = *(const int *)a, right = *(const int *)b;
    return (left > right) - (left < right);
}

/* The leaves of one kind in an expression, each once: appended to list. */
static lb_status append_leaves(const expression_graph *g, expression e, expression_kind kind,
                               int **list, size_t *count, size_t *capacity)
{
    int *below;
    size_t length;
    if (expression_below(g, e, &below, &length) != LB_OK)
        return LB_E_NOMEM;
    lb_status status = LB_OK;
    for (size_t i = 0; i < length && status == LB_OK; i++) {
        if (g->nodes[below[i]].kind != kind)
            continue;
        if (memory_grow(list, capacity, *count, sizeof **list) != 0)
            status = LB_E_NOMEM;
        else
            (*list)[(*count)++] = g->nodes[below[i]].left;
    }
    memory_free(below);
    return status;
}

static size_t unique(int *list, size_t count)
{
    size_t kept = 0;
    if (count > 1)
        qsort(list, count, sizeof *list, ascending);
    for (size_t i = 0; i < count; i++)
        if (i == 0 || list[i] != list[i - 1])
            list[kept++] = list[i];
    return kept;
}

lb_status sums_of_dfdk(const lb_network *net, expression_graph *graph, sums *s)
{
    s->kind = SUMS_DFDK;
    int *constants = NULL;
    size_t capacity = 0;
    lb_status status = LB_OK;
    for (int i = 0; status == LB_OK && i < net->step_count; i++) {
        const network_step *step = &net->steps[i];
        if (step->entry_count == 0)
            continue;
        size_t count = 0;
        status = append_leaves(&net->graph, step->rate, EXPRESSION_CONSTANT, &constants, &count, &capacity);
        for (int e = 0; status == LB_OK && e < step->entry_count; e++)
            if (step->entries[e].expression != EXPRESSION_NONE)
                status = append_leaves(&net->graph, step->entries[e].expression, EXPRESSION_CONSTANT,
                                       &constants, &count, &capacity);
        count = unique(constants, count);
        for (size_t c = 0; status == LB_OK && c < count; c++)
            status = add_constant_terms(net, graph, i, constants[c], s);
    }
    memory_free(constants);
    return status;
}

/* ---- Pattern ------------------------------------------------------------------------ */

void sums_pattern_clear(sums_pattern *pattern)
{
    memory_free(pattern->column_start);
    memory_free(pattern->row);
    memory_free(pattern->column);
    memset(pattern, 0, sizeof *pattern);
}

lb_status sums_pattern_find(const lb_network *net, sums_pattern *pattern)
{
    memset(pattern, 0, sizeof *pattern);
    pattern->n = net->states;
    lb_status status = network_pattern(net, &pattern->column_start, &pattern->row);
    if (status != LB_OK)
        return status;
    pattern->nonzeros = pattern->column_start[net->states];
    pattern->column = memory_array((size_t)pattern->nonzeros, sizeof(int));
    if (!pattern->column)
        return LB_E_NOMEM;
    for (int j = 0; j < net->states; j++)
        for (int p = pattern->column_start[j]; p < pattern->column_start[j + 1]; p++)
            pattern->column[p] = j;
    return LB_OK;
}
