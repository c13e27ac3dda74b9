/* Shared expression graph: build and simplify.
 *
 * Nodes live in one growing array and are found again through an open-addressing
 * hash table (linear probing, at most half full), so that equal expressions
 * share one node: hash-consing, as in Ershov, On programming of arithmetic
 * operations, Commun. ACM 1 (1958) 3.  An operand exists before its user, which
 * makes the ascending order of numbers an order of evaluation (expression_walk.c). */
#include "model/expression.h"

#include <assert.h>
#include <limits.h>
#include <math.h>
#include <stdint.h>
#include <string.h>

#include "base/memory.h"

/* ---- The graph ------------------------------------------------------------ */

void expression_graph_init(expression_graph *g)
{
    memset(g, 0, sizeof *g);
}

void expression_graph_clear(expression_graph *g)
{
    memory_free(g->nodes);
    memory_free(g->table);
    expression_graph_init(g);
}

void expression_graph_seal(expression_graph *g)
{
    memory_free(g->table);
    g->table = NULL;
    g->table_size = 0;
}

static uint64_t mix(uint64_t h)
{
    h ^= h >> 32;
    h *= UINT64_C(0xd6e8feb86659fd93);
    h ^= h >> 32;
    h *= UINT64_C(0xd6e8feb86659fd93);
    return h ^ h >> 32;
}

static size_t hash_node(const expression_node *node)
{
    uint64_t bits;
    memcpy(&bits, &node->value, sizeof bits);
    uint64_t operands = (uint64_t)(uint32_t)node->left << 32 | (uint32_t)node->right;
    return (size_t)mix(mix(bits + (uint64_t)node->kind) + operands);
}

/* Numbers are compared by their bits: minus zero never gets here. */
static bool is_same(const expression_node *a, const expression_node *b)
{
    return a->kind == b->kind && a->left == b->left && a->right == b->right &&
           memcmp(&a->value, &b->value, sizeof a->value) == 0;
}

static size_t find_slot(const expression_graph *g, const expression_node *node)
{
    size_t mask = g->table_size - 1;
    size_t slot = hash_node(node) & mask;
    while (g->table[slot] >= 0 && !is_same(&g->nodes[g->table[slot]], node))
        slot = (slot + 1) & mask;
    return slot;
}

static bool grow_table(expression_graph *g)
{
    size_t size = g->table_size ? 2 * g->table_size : 64;
    while (size < 2 * (g->count + 1))
        size *= 2;
    int *table = memory_array(size, sizeof *table);
    if (!table)
        return false;
    memory_free(g->table);
    g->table = table;
    g->table_size = size;
    for (size_t i = 0; i < size; i++)
        table[i] = -1;
    for (size_t i = 0; i < g->count; i++)
        table[find_slot(g, &g->nodes[i])] = (int)i;
    return true;
}

/* The number of this node, which is added when it is new. */
static expression intern(expression_graph *g, expression_node node)
{
    if (2 * (g->count + 1) > g->table_size && !grow_table(g))
        return EXPRESSION_NONE;
    size_t slot = find_slot(g, &node);
    if (g->table[slot] >= 0)
        return g->table[slot];
    if (g->count == INT_MAX || memory_grow(&g->nodes, &g->capacity, g->count, sizeof node) != 0)
        return EXPRESSION_NONE;
    g->nodes[g->count] = node;
    g->table[slot] = (int)g->count;
    return (int)g->count++;
}

static expression intern_operation(expression_graph *g, expression_kind kind, int left, int right)
{
    expression_node node = {.kind = kind, .left = left, .right = right};
    node.has_state = g->nodes[left].has_state;
    node.has_constant = g->nodes[left].has_constant;
    if (right >= 0) {
        node.has_state = node.has_state || g->nodes[right].has_state;
        node.has_constant = node.has_constant || g->nodes[right].has_constant;
    }
    return intern(g, node);
}

lb_status expression_import(expression_graph *g, const expression_graph *from, expression e, int *map)
{
    expression_node node = from->nodes[e];
    if (node.kind > EXPRESSION_STATE) {
        node.left = map[node.left];
        node.right = node.right >= 0 ? map[node.right] : -1;
    }
    map[e] = intern(g, node);
    return map[e] == EXPRESSION_NONE ? LB_E_NOMEM : LB_OK;
}

/* ---- Builders --------------------------------------------------------------- */

expression expression_number(expression_graph *g, double value)
{
    /* Minus zero becomes zero, so that there is one zero to recognise. */
    expression_node node = {.kind = EXPRESSION_NUMBER, .left = -1, .right = -1, .value = value == 0 ? 0 : value};
    return intern(g, node);
}

expression expression_constant(expression_graph *g, int index)
{
    expression_node node = {.kind = EXPRESSION_CONSTANT, .left = index, .right = -1, .has_constant = true};
    return intern(g, node);
}

expression expression_state(expression_graph *g, int index)
{
    expression_node node = {.kind = EXPRESSION_STATE, .left = index, .right = -1, .has_state = true};
    return intern(g, node);
}

bool expression_is_number(const expression_graph *g, expression e, double *value)
{
    if (e == EXPRESSION_NONE || g->nodes[e].kind != EXPRESSION_NUMBER)
        return false;
    if (value)
        *value = g->nodes[e].value;
    return true;
}

static bool is_value(const expression_graph *g, expression e, double value)
{
    return g->nodes[e].kind == EXPRESSION_NUMBER && g->nodes[e].value == value;
}

static bool is_negated(const expression_graph *g, expression e)
{
    return g->nodes[e].kind == EXPRESSION_NEGATE;
}

static bool is_negative_number(const expression_graph *g, expression e)
{
    return g->nodes[e].kind == EXPRESSION_NUMBER && g->nodes[e].value < 0;
}

static bool is_whole(double n)
{
    return n == floor(n);
}

static expression build_add(expression_graph *g, expression a, expression b)
{
    if (is_value(g, a, 0))
        return b;
    if (is_value(g, b, 0))
        return a;
    if (is_negated(g, b))
        return expression_binary(g, EXPRESSION_SUBTRACT, a, g->nodes[b].left);
    if (is_negative_number(g, b))
        return expression_binary(g, EXPRESSION_SUBTRACT, a, expression_number(g, -g->nodes[b].value));
    if (is_negated(g, a))
        return expression_binary(g, EXPRESSION_SUBTRACT, b, g->nodes[a].left);
    if (is_negative_number(g, a))
        return expression_binary(g, EXPRESSION_SUBTRACT, b, expression_number(g, -g->nodes[a].value));
    return intern_operation(g, EXPRESSION_ADD, a, b);
}

static expression build_subtract(expression_graph *g, expression a, expression b)
{
    if (is_value(g, b, 0))
        return a;
    if (is_value(g, a, 0))
        return expression_unary(g, EXPRESSION_NEGATE, b);
    if (a == b)
        return expression_number(g, 0);
    if (is_negated(g, b))
        return expression_binary(g, EXPRESSION_ADD, a, g->nodes[b].left);
    if (is_negative_number(g, b))
        return expression_binary(g, EXPRESSION_ADD, a, expression_number(g, -g->nodes[b].value));
    return intern_operation(g, EXPRESSION_SUBTRACT, a, b);
}

/* A product or quotient with the signs of its operands moved out. */
static expression build_signed(expression_graph *g, expression_kind kind, expression a, expression b)
{
    bool turned = false;
    if (is_negated(g, a)) {
        a = g->nodes[a].left;
        turned = !turned;
    }
    if (is_negated(g, b)) {
        b = g->nodes[b].left;
        turned = !turned;
    }
    if (turned || is_value(g, a, 1) || is_value(g, b, 1)) {
        expression e = expression_binary(g, kind, a, b);
        return turned ? expression_unary(g, EXPRESSION_NEGATE, e) : e;
    }
    return intern_operation(g, kind, a, b);
}

static expression build_multiply(expression_graph *g, expression a, expression b)
{
    if (is_value(g, a, 0) || is_value(g, b, 1))
        return a;
    if (is_value(g, b, 0) || is_value(g, a, 1))
        return b;
    if (is_value(g, a, -1))
        return expression_unary(g, EXPRESSION_NEGATE, b);
    if (is_value(g, b, -1))
        return expression_unary(g, EXPRESSION_NEGATE, a);
    return build_signed(g, EXPRESSION_MULTIPLY, a, b);
}

static expression build_divide(expression_graph *g, expression a, expression b)
{
    if (is_value(g, b, 1) || (is_value(g, a, 0) && !is_value(g, b, 0)))
        return a;
    if (is_value(g, b, -1))
        return expression_unary(g, EXPRESSION_NEGATE, a);
    bool turned = is_negated(g, a) != is_negated(g, b);
    expression top = is_negated(g, a) ? g->nodes[a].left : a;
    expression bottom = is_negated(g, b) ? g->nodes[b].left : b;
    expression e = intern_operation(g, EXPRESSION_DIVIDE, top, bottom);
    return turned && e != EXPRESSION_NONE ? expression_unary(g, EXPRESSION_NEGATE, e) : e;
}

static expression build_power(expression_graph *g, expression a, expression b)
{
    if (is_value(g, b, 0))
        return expression_number(g, 1);
    if (is_value(g, b, 1) || is_value(g, a, 1))
        return a;
    return intern_operation(g, EXPRESSION_POWER, a, b);
}

/* n x^(n-1).  For whole n > 0 there is nothing to guard at x <= 0. */
static expression build_slope(expression_graph *g, expression x, expression n)
{
    double order;
    if (expression_is_number(g, n, &order) && is_whole(order) && order >= 0) {
        expression lower = expression_number(g, order - 1);
        expression power = order == 0 ? n : expression_binary(g, EXPRESSION_POWER, x, lower);
        return expression_binary(g, EXPRESSION_MULTIPLY, n, power);
    }
    return intern_operation(g, EXPRESSION_SLOPE, x, n);
}

static expression build_power_log(expression_graph *g, expression x, expression n)
{
    double base;
    if (expression_is_number(g, x, &base) && base > 0) {
        expression power = expression_binary(g, EXPRESSION_POWER, x, n);
        return expression_binary(g, EXPRESSION_MULTIPLY, power, expression_number(g, log(base)));
    }
    return intern_operation(g, EXPRESSION_POWER_LOG, x, n);
}

expression expression_binary(expression_graph *g, expression_kind kind, expression left, expression right)
{
    if (left == EXPRESSION_NONE || right == EXPRESSION_NONE)
        return EXPRESSION_NONE;
    double a, b;
    if (expression_is_number(g, left, &a) && expression_is_number(g, right, &b)) {
        double value = expression_apply(kind, a, b);
        if (isfinite(value))
            return expression_number(g, value);
    }
    switch (kind) {
    case EXPRESSION_ADD:       return build_add(g, left, right);
    case EXPRESSION_SUBTRACT:  return build_subtract(g, left, right);
    case EXPRESSION_MULTIPLY:  return build_multiply(g, left, right);
    case EXPRESSION_DIVIDE:    return build_divide(g, left, right);
    case EXPRESSION_POWER:     return build_power(g, left, right);
    case EXPRESSION_SLOPE:     return build_slope(g, left, right);
    case EXPRESSION_POWER_LOG: return build_power_log(g, left, right);
    default:                   assert(!"a binary operation"); return EXPRESSION_NONE;
    }
}

expression expression_unary(expression_graph *g, expression_kind kind, expression operand)
{
    if (operand == EXPRESSION_NONE)
        return EXPRESSION_NONE;
    if (kind == EXPRESSION_SQRT)
        return expression_binary(g, EXPRESSION_POWER, operand, expression_number(g, 0.5));
    double a;
    if (expression_is_number(g, operand, &a) && isfinite(expression_apply(kind, a, 0)))
        return expression_number(g, expression_apply(kind, a, 0));
    if (kind == EXPRESSION_NEGATE && is_negated(g, operand))
        return g->nodes[operand].left;
    if (kind == EXPRESSION_NEGATE && g->nodes[operand].kind == EXPRESSION_SUBTRACT)
        return expression_binary(g, EXPRESSION_SUBTRACT, g->nodes[operand].right, g->nodes[operand].left);
    return intern_operation(g, kind, operand, -1);
}
