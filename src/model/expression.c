/* Shared expression graph: build, simplify, evaluate.
 *
 * Nodes live in one growing array and are found again through an open-addressing
 * hash table (linear probing, at most half full), so that equal expressions
 * share one node: hash-consing, as in Ershov, On programming of arithmetic
 * operations, Commun. ACM 1 (1958) 3.  An operand exists before its user, which
 * makes the ascending order of numbers an order of evaluation; every walk is a
 * loop over numbers or over an explicit stack. */
#include "model/expression.h"

#include <assert.h>
#include <limits.h>
#include <math.h>
#include <stdint.h>
#include <stdlib.h>
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

static bool is_leaf(expression_kind kind)
{
    return kind == EXPRESSION_NUMBER || kind == EXPRESSION_CONSTANT || kind == EXPRESSION_STATE;
}

lb_status expression_import(expression_graph *g, const expression_graph *from, expression e, int *map)
{
    expression_node node = from->nodes[e];
    if (!is_leaf(node.kind)) {
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

static double apply_binary(expression_kind kind, double a, double b)
{
    switch (kind) {
    case EXPRESSION_ADD:       return a + b;
    case EXPRESSION_SUBTRACT:  return a - b;
    case EXPRESSION_MULTIPLY:  return a * b;
    case EXPRESSION_DIVIDE:    return a / b;
    case EXPRESSION_POWER:     return expression_power(a, b);
    case EXPRESSION_SLOPE:     return expression_slope(a, b);
    case EXPRESSION_POWER_LOG: return expression_power_log(a, b);
    default:                   return NAN;
    }
}

static double apply_unary(expression_kind kind, double a)
{
    switch (kind) {
    case EXPRESSION_NEGATE: return -a;
    case EXPRESSION_EXP:    return exp(a);
    case EXPRESSION_LN:     return log(a);
    case EXPRESSION_LOG10:  return log10(a);
    default:                return NAN;
    }
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
        double value = apply_binary(kind, a, b);
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
    if (expression_is_number(g, operand, &a) && isfinite(apply_unary(kind, a)))
        return expression_number(g, apply_unary(kind, a));
    if (kind == EXPRESSION_NEGATE && is_negated(g, operand))
        return g->nodes[operand].left;
    if (kind == EXPRESSION_NEGATE && g->nodes[operand].kind == EXPRESSION_SUBTRACT)
        return expression_binary(g, EXPRESSION_SUBTRACT, g->nodes[operand].right, g->nodes[operand].left);
    return intern_operation(g, kind, operand, -1);
}

/* ---- Walks ------------------------------------------------------------------ */

/* A set of node numbers by open addressing, and the list of its members. */
typedef struct node_set {
    int *table;
    size_t table_size;
    int *list;
    size_t count, capacity;
} node_set;

static bool set_grow(node_set *set)
{
    size_t size = set->table_size ? 2 * set->table_size : 32;
    int *table = memory_array(size, sizeof *table);
    if (!table)
        return false;
    for (size_t i = 0; i < size; i++)
        table[i] = -1;
    for (size_t i = 0; i < set->count; i++) {
        size_t slot = mix((uint64_t)set->list[i]) & (size - 1);
        while (table[slot] >= 0)
            slot = (slot + 1) & (size - 1);
        table[slot] = set->list[i];
    }
    memory_free(set->table);
    set->table = table;
    set->table_size = size;
    return true;
}

/* Adds e unless it is there.  False without memory. */
static bool set_add(node_set *set, int e)
{
    if (2 * (set->count + 1) > set->table_size && !set_grow(set))
        return false;
    size_t slot = mix((uint64_t)e) & (set->table_size - 1);
    while (set->table[slot] >= 0) {
        if (set->table[slot] == e)
            return true;
        slot = (slot + 1) & (set->table_size - 1);
    }
    if (memory_grow(&set->list, &set->capacity, set->count, sizeof *set->list) != 0)
        return false;
    set->table[slot] = e;
    set->list[set->count++] = e;
    return true;
}

static int by_number(const void *a, const void *b)
{
    int left = *(const int *)a, right = *(const int *)b;
    return (left > right) - (left < right);
}

lb_status expression_below(const expression_graph *g, expression e, int **list, size_t *length)
{
    node_set set = {0};
    bool ok = set_add(&set, e);
    /* The list is its own queue: what stands in it already is never added again. */
    for (size_t i = 0; ok && i < set.count; i++) {
        const expression_node *node = &g->nodes[set.list[i]];
        if (is_leaf(node->kind))
            continue;
        ok = set_add(&set, node->left) && (node->right < 0 || set_add(&set, node->right));
    }
    memory_free(set.table);
    if (!ok) {
        memory_free(set.list);
        *list = NULL;
        *length = 0;
        return LB_E_NOMEM;
    }
    qsort(set.list, set.count, sizeof *set.list, by_number);
    *list = set.list;
    *length = set.count;
    return LB_OK;
}

bool expression_has_state(const expression_graph *g, expression e)
{
    return g->nodes[e].has_state;
}

bool expression_depends(const expression_graph *g, expression e, expression_kind leaf, int index)
{
    if (leaf == EXPRESSION_STATE ? !g->nodes[e].has_state : !g->nodes[e].has_constant)
        return false;
    int *list;
    size_t length;
    if (expression_below(g, e, &list, &length) != LB_OK)
        return true;
    bool found = false;
    for (size_t i = 0; !found && i < length; i++)
        found = g->nodes[list[i]].kind == leaf && g->nodes[list[i]].left == index;
    memory_free(list);
    return found;
}

/* Depth first over a short stack; when that is full (a deep chain to the right),
 * one pass over all smaller numbers finishes the job. */
void expression_mark(const expression_graph *g, expression root, unsigned char *needed)
{
    enum { DEPTH = 64 };
    int stack[DEPTH], depth = 0;
    bool is_full = false;
    if (needed[root])
        return;
    needed[root] = 1;
    stack[depth++] = root;
    while (depth > 0) {
        const expression_node *node = &g->nodes[stack[--depth]];
        if (is_leaf(node->kind))
            continue;
        int operands[2] = {node->left, node->right};
        for (int i = 0; i < 2; i++) {
            if (operands[i] < 0 || needed[operands[i]])
                continue;
            needed[operands[i]] = 1;
            if (depth < DEPTH)
                stack[depth++] = operands[i];
            else
                is_full = true;
        }
    }
    for (int e = root; is_full && e >= 0; e--) {
        const expression_node *node = &g->nodes[e];
        if (!needed[e] || is_leaf(node->kind))
            continue;
        needed[node->left] = 1;
        if (node->right >= 0)
            needed[node->right] = 1;
    }
}

/* ---- Evaluation --------------------------------------------------------------- */

double expression_power(double x, double n)
{
    if (n == 2)
        return x * x;
    if (n == 0.5)
        return x > 0 ? sqrt(x) : 0 * x;
    if (x < 0 && !is_whole(n))
        return 0;
    return pow(x, n);
}

double expression_slope(double x, double n)
{
    if ((x <= 0 && !is_whole(n)) || (x == 0 && n < 1))
        return 0;
    return n * pow(x, n - 1);
}

double expression_power_log(double x, double n)
{
    return x <= 0 ? 0 : pow(x, n) * log(x);
}

static double evaluate_node(const expression_node *node, const double *k, const double *x, double left, double right)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:   return node->value;
    case EXPRESSION_CONSTANT: return k[node->left];
    case EXPRESSION_STATE:    return x[node->left];
    default:                  break;
    }
    return node->right >= 0 ? apply_binary(node->kind, left, right) : apply_unary(node->kind, left);
}

void expression_evaluate(const expression_graph *g, int first, int last, const unsigned char *needed,
                         const double *k, const double *x, double *values)
{
    for (int e = first; e <= last; e++) {
        const expression_node *node = &g->nodes[e];
        if (needed && !needed[e])
            continue;
        bool leaf = is_leaf(node->kind);
        values[e] = evaluate_node(node, k, x, leaf ? 0 : values[node->left],
                                  leaf || node->right < 0 ? 0 : values[node->right]);
    }
}

static double value_of(const int *list, size_t length, const double *values, int e)
{
    const int *place = bsearch(&e, list, length, sizeof *list, by_number);
    return values[place - list];
}

double expression_value(const expression_graph *g, expression e, const double *k, const double *x)
{
    int *list;
    size_t length;
    if (expression_below(g, e, &list, &length) != LB_OK)
        return NAN;
    double result = NAN;
    double *values = memory_array(length, sizeof *values);
    for (size_t i = 0; values && i < length; i++) {
        const expression_node *node = &g->nodes[list[i]];
        bool leaf = is_leaf(node->kind);
        double left = leaf ? 0 : value_of(list, i, values, node->left);
        double right = leaf || node->right < 0 ? 0 : value_of(list, i, values, node->right);
        values[i] = evaluate_node(node, k, x, left, right);
    }
    if (values)
        result = values[length - 1];
    memory_free(values);
    memory_free(list);
    return result;
}
