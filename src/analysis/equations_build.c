/* Building the steady-state equations of a face: unknowns, laws, terms, pools, and
 * the form of each balance. */
#include "analysis/equations.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"

static bool law_has_unknown(const equations *eq, int law)
{
    for (int i = 0; i < eq->laws->width; i++)
        if (eq->laws->law[(size_t)law * (size_t)eq->laws->width + (size_t)i] != 0 &&
            eq->unknown[eq->system->core_state[i]] >= 0)
            return true;
    return false;
}

/* The rows of the basis that still have an unknown in them.  A law that has none
 * left needs the total zero; a positive one that has some needs another total. */
static void choose_laws(equations *eq)
{
    for (int row = 0; row < eq->laws->count; row++) {
        bool has_unknown = law_has_unknown(eq, row);
        bool is_zero = fabs(eq->laws->total[row]) <= 1e-14 * eq->laws->size[row];
        if (has_unknown ? eq->laws->is_positive[row] && is_zero : !is_zero)
            eq->is_inconsistent = true;
        if (has_unknown && row < eq->laws->basis)
            eq->law[eq->law_count++] = row;
    }
}

/* Terms of each balance, compressed: count, then fill. */
static bool make_terms(equations *eq)
{
    const lb_network *net = eq->system->network;
    for (int s = 0; s < eq->system->steps; s++)
        for (int e = 0; eq->is_alive[s] && e < net->steps[s].entry_count; e++)
            if (eq->unknown[net->steps[s].entries[e].state] >= 0)
                eq->start[eq->unknown[net->steps[s].entries[e].state] + 1]++;
    for (int i = 0; i < eq->count; i++)
        eq->start[i + 1] += eq->start[i];
    eq->term_capacity = (size_t)eq->start[eq->count];
    eq->term = memory_array(eq->term_capacity, sizeof *eq->term);
    int *next = memory_array((size_t)eq->count, sizeof *next);
    if (!eq->term || !next) {
        memory_free(next);
        return false;
    }
    memcpy(next, eq->start, (size_t)eq->count * sizeof *next);
    for (int s = 0; s < eq->system->steps; s++) {
        const double *coefficient = evaluator_coefficients(eq->evaluator, s);
        for (int e = 0; eq->is_alive[s] && e < net->steps[s].entry_count; e++) {
            int i = eq->unknown[net->steps[s].entries[e].state];
            if (i >= 0)
                eq->term[next[i]++] = (equations_term){s, coefficient[e]};
        }
    }
    memory_free(next);
    return true;
}

/* The sum of the balances of a pool's species, step by step: what the pool's own
 * steps change cancels, being exact in small integers.  Kept when what is left has
 * gains and losses at positive rates.  sum [steps] is zero before and after. */
static lb_status add_pool(equations *eq, int pool, double *sum, lb_error *err)
{
    const double *weight = eq->laws->pool + (size_t)pool * (size_t)eq->laws->width;
    bool is_positive = true, has_gain = false, has_loss = false;
    size_t end = (size_t)eq->start[eq->balances];
    lb_status status = LB_OK;
    for (int i = 0; i < eq->count; i++)
        for (int t = eq->start[i]; t < eq->start[i + 1]; t++)
            sum[eq->term[t].step] += weight[eq->system->core_index[eq->state[i]]] * eq->term[t].coefficient;
    for (int s = 0; s < eq->system->steps; s++) {
        if (fabs(sum[s]) > 1e-9 && status == LB_OK) {
            is_positive = is_positive && eq->is_positive[s] && eq->system->network->steps[s].is_power_law;
            has_gain = has_gain || sum[s] > 0;
            has_loss = has_loss || sum[s] < 0;
            if (memory_grow(&eq->term, &eq->term_capacity, end, sizeof *eq->term) != 0)
                status = status_no_memory(err);
            else
                eq->term[end++] = (equations_term){s, sum[s]};
        }
        sum[s] = 0;
    }
    if (status == LB_OK && is_positive && has_gain && has_loss) {
        eq->is_ratio[eq->balances] = true;
        eq->start[++eq->balances] = (int)end;
        eq->pool[eq->pool_count++] = pool;
    }
    return status;
}

static lb_status add_pools(equations *eq, lb_error *err)
{
    double *sum = memory_zeroed((size_t)eq->system->steps, sizeof *sum);
    lb_status status = sum ? LB_OK : status_no_memory(err);
    eq->balances = eq->count;
    for (int pool = 0; status == LB_OK && pool < eq->laws->pool_count; pool++)
        status = add_pool(eq, pool, sum, err);
    eq->rows = eq->balances + eq->law_count;
    memory_free(sum);
    return status;
}

/* ---- Forms ------------------------------------------------------------------------- */

/* What is known of a value when the unknowns that are not signed are positive. */
enum sign { SIGN_UNKNOWN, SIGN_ZERO, SIGN_NOT_NEGATIVE, SIGN_POSITIVE };

static enum sign sign_of_number(double value)
{
    return value > 0 ? SIGN_POSITIVE : value == 0 ? SIGN_ZERO : SIGN_UNKNOWN;
}

static enum sign sign_of_state(const equations *eq, int state)
{
    if (eq->system->core_index[state] < 0 || equations_is_signed(eq->system, state))
        return SIGN_UNKNOWN;
    return eq->unknown[state] < 0 ? SIGN_ZERO : SIGN_POSITIVE;
}

static enum sign sign_of_power(enum sign base, enum sign exponent, double value)
{
    if (base == SIGN_POSITIVE)
        return SIGN_POSITIVE;
    if (base != SIGN_UNKNOWN)
        return exponent == SIGN_POSITIVE ? base : SIGN_UNKNOWN;
    return value > 0 && fmod(value, 2) == 0 ? SIGN_NOT_NEGATIVE : SIGN_UNKNOWN;
}

static enum sign sign_of_pair(expression_kind kind, enum sign a, enum sign b)
{
    if (kind == EXPRESSION_DIVIDE && b != SIGN_POSITIVE)
        return SIGN_UNKNOWN;
    if (kind == EXPRESSION_SUBTRACT)
        return b == SIGN_ZERO ? a : SIGN_UNKNOWN;
    if (a == SIGN_UNKNOWN || b == SIGN_UNKNOWN)
        return SIGN_UNKNOWN;
    if (kind == EXPRESSION_ADD)
        return a > b ? a : b;
    return a < b ? a : b;
}

/* Signs [nodes] of the graph's nodes, operands before users; values [nodes] those of
 * what has no state in it. */
static void find_signs(const equations *eq, const double *values, enum sign *sign)
{
    const expression_graph *g = &eq->system->network->graph;
    for (size_t i = 0; i < g->count; i++) {
        const expression_node *node = &g->nodes[i];
        if (!node->has_state)
            sign[i] = sign_of_number(values[i]);
        else if (node->kind == EXPRESSION_STATE)
            sign[i] = sign_of_state(eq, node->left);
        else if (node->kind == EXPRESSION_POWER)
            sign[i] = sign_of_power(sign[node->left], sign[node->right],
                                    g->nodes[node->right].has_state ? 0 : values[node->right]);
        else if (node->kind == EXPRESSION_EXP)
            sign[i] = SIGN_POSITIVE;
        else if (node->kind >= EXPRESSION_ADD && node->kind <= EXPRESSION_DIVIDE)
            sign[i] = sign_of_pair(node->kind, sign[node->left], sign[node->right]);
        else
            sign[i] = SIGN_UNKNOWN;
    }
}

static bool is_positive_power_law(const equations *eq, int step)
{
    const network_step *s = &eq->system->network->steps[step];
    for (int o = 0; o < s->order_count; o++)
        if (equations_is_signed(eq->system, s->orders[o].state))
            return false;
    return eq->rate[step] > 0;
}

/* Steps whose rates are positive wherever the unknowns are: power laws, and laws whose
 * expressions say so. */
static lb_status find_positive(equations *eq, lb_error *err)
{
    const lb_network *net = eq->system->network;
    double *values = memory_array(net->graph.count, sizeof *values);
    enum sign *sign = memory_array(net->graph.count, sizeof *sign);
    lb_status status = values && sign ? LB_OK : status_no_memory(err);
    equations_probe(eq->system, 0, eq->x);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    if (status == LB_OK && net->graph.count > 0) {
        expression_evaluate(&net->graph, 0, (int)net->graph.count - 1, NULL, evaluator_constants(eq->evaluator),
                            eq->x, values);
        find_signs(eq, values, sign);
    }
    for (int s = 0; status == LB_OK && s < eq->system->steps; s++) {
        const network_step *step = &net->steps[s];
        eq->is_positive[s] = eq->is_alive[s] && (step->is_power_law ? is_positive_power_law(eq, s)
                                                                    : sign[step->rate] == SIGN_POSITIVE);
    }
    memory_free(sign);
    memory_free(values);
    return status;
}

/* A balance takes the ratio form when every step in it has a positive rate, some of
 * them gains and some losses, and all gains or all losses are power laws: what the
 * others add to the derivatives is then the difference from the Jacobian. */
static void choose_form(equations *eq, int i)
{
    bool is_positive = true, has_gain = false, has_loss = false, is_power = true;
    for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
        bool is_gain = eq->term[t].coefficient > 0;
        is_positive = is_positive && eq->is_positive[eq->term[t].step];
        has_gain = has_gain || is_gain;
        has_loss = has_loss || !is_gain;
        if (!eq->system->network->steps[eq->term[t].step].is_power_law) {
            is_power = false;
            *(is_gain ? &eq->is_general_gain[i] : &eq->is_general_loss[i]) = true;
        }
    }
    eq->is_ratio[i] = is_positive && has_gain && has_loss && !(eq->is_general_gain[i] && eq->is_general_loss[i]);
    if (!(eq->is_ratio[i] && is_power) && eq->start[i] < eq->start[i + 1])
        eq->is_general = true;
}

static lb_status choose_forms(equations *eq, lb_error *err)
{
    lb_status status = find_positive(eq, err);
    for (int i = 0; status == LB_OK && i < eq->count; i++)
        choose_form(eq, i);
    return status;
}

static bool allocate(equations *eq)
{
    size_t n = (size_t)eq->system->n, core = (size_t)eq->system->core, pools = (size_t)eq->laws->pool_count;
    eq->state = memory_array(core, sizeof *eq->state);
    eq->unknown = memory_array(n, sizeof *eq->unknown);
    eq->is_signed = memory_array(core, sizeof *eq->is_signed);
    eq->unit = memory_array(core, sizeof *eq->unit);
    eq->law = memory_array((size_t)eq->laws->count, sizeof *eq->law);
    eq->is_alive = memory_array((size_t)eq->system->steps, sizeof *eq->is_alive);
    eq->is_positive = memory_array((size_t)eq->system->steps, sizeof *eq->is_positive);
    eq->pool = memory_array(pools, sizeof *eq->pool);
    eq->start = memory_zeroed(core + pools + 1, sizeof *eq->start);
    eq->is_ratio = memory_array(core + pools, sizeof *eq->is_ratio);
    eq->is_general_gain = memory_zeroed(core, sizeof *eq->is_general_gain);
    eq->is_general_loss = memory_zeroed(core, sizeof *eq->is_general_loss);
    eq->size = memory_array(core, sizeof *eq->size);
    eq->law_size = memory_array((size_t)eq->laws->count, sizeof *eq->law_size);
    eq->x = memory_array(n, sizeof *eq->x);
    eq->rate = memory_array((size_t)eq->system->steps, sizeof *eq->rate);
    eq->jacobian = memory_array((size_t)eq->system->nonzeros, sizeof *eq->jacobian);
    return eq->state && eq->unknown && eq->is_signed && eq->unit && eq->law && eq->is_alive &&
           eq->is_positive && eq->pool && eq->start && eq->is_ratio && eq->is_general_gain &&
           eq->is_general_loss && eq->size && eq->law_size && eq->x && eq->rate && eq->jacobian;
}

static void choose_unknowns(equations *eq, const double *x0, const bool *is_zero)
{
    for (int i = 0; i < eq->system->n; i++)
        eq->unknown[i] = -1;
    for (int c = 0; c < eq->system->core; c++) {
        int state = eq->system->core_state[c];
        if (is_zero && is_zero[state])
            continue;
        eq->unknown[state] = eq->count;
        eq->state[eq->count] = state;
        eq->is_signed[eq->count] = equations_is_signed(eq->system, state);
        eq->unit[eq->count] = eq->is_signed[eq->count] && x0[state] != 0 ? fabs(x0[state]) : 1;
        eq->count++;
    }
}

lb_status equations_new(lb_evaluator *evaluator, const equations_laws *laws, const double *x0, const bool *is_zero,
                        equations **out, lb_error *err)
{
    *out = NULL;
    equations *eq = memory_zeroed(1, sizeof *eq);
    if (!eq)
        return status_no_memory(err);
    eq->evaluator = evaluator;
    eq->system = evaluator_system(evaluator);
    eq->laws = laws;
    lb_status status = allocate(eq) ? equations_find_alive(evaluator, is_zero, eq->is_alive, err)
                                    : status_no_memory(err);
    if (status == LB_OK) {
        choose_unknowns(eq, x0, is_zero);
        choose_laws(eq);
        status = make_terms(eq) ? LB_OK : status_no_memory(err);
    }
    if (status == LB_OK) {
        status = choose_forms(eq, err);
    }
    if (status == LB_OK)
        status = add_pools(eq, err);
    if (status != LB_OK) {
        equations_free(eq);
        return status;
    }
    for (int i = 0; i < eq->system->n; i++)
        eq->x[i] = eq->system->core_index[i] < 0 ? x0[i] : 0;
    *out = eq;
    return LB_OK;
}

void equations_free(equations *eq)
{
    if (!eq)
        return;
    memory_free(eq->state);
    memory_free(eq->unknown);
    memory_free(eq->is_signed);
    memory_free(eq->unit);
    memory_free(eq->law);
    memory_free(eq->is_alive);
    memory_free(eq->is_positive);
    memory_free(eq->pool);
    memory_free(eq->start);
    memory_free(eq->term);
    memory_free(eq->is_ratio);
    memory_free(eq->is_general_gain);
    memory_free(eq->is_general_loss);
    memory_free(eq->size);
    memory_free(eq->law_size);
    memory_free(eq->x);
    memory_free(eq->rate);
    memory_free(eq->jacobian);
    memory_free(eq);
}
