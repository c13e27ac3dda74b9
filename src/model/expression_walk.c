/* Walks over what is below an expression, and evaluation.
 *
 * Operands have smaller numbers than their users, so an evaluation is a loop over
 * ascending numbers.  What is below one root is collected in a small hash set, at a
 * cost that does not depend on the size of the whole graph. */
#include <math.h>
#include <stdint.h>
#include <stdlib.h>

#include "base/memory.h"
#include "model/expression.h"

/* ---- What is below ------------------------------------------------------------ */

static size_t spread(int e)
{
    return (size_t)((uint64_t)e * UINT64_C(0x9e3779b97f4a7c15) >> 32);
}

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
        size_t slot = spread(set->list[i]) & (size - 1);
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
    size_t slot = spread(e) & (set->table_size - 1);
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
        if (node->kind <= EXPRESSION_STATE)
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

size_t expression_place(const int *list, size_t length, expression e)
{
    const int *found = bsearch(&e, list, length, sizeof *list, by_number);
    return (size_t)(found - list);
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
        if (node->kind <= EXPRESSION_STATE)
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
        if (!needed[e] || node->kind <= EXPRESSION_STATE)
            continue;
        needed[node->left] = 1;
        if (node->right >= 0)
            needed[node->right] = 1;
    }
}

/* ---- Evaluation --------------------------------------------------------------- */

static bool is_whole(double n)
{
    return n == floor(n);
}

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

double expression_apply(expression_kind kind, double a, double b)
{
    switch (kind) {
    case EXPRESSION_ADD:       return a + b;
    case EXPRESSION_SUBTRACT:  return a - b;
    case EXPRESSION_MULTIPLY:  return a * b;
    case EXPRESSION_DIVIDE:    return a / b;
    case EXPRESSION_NEGATE:    return -a;
    case EXPRESSION_POWER:     return expression_power(a, b);
    case EXPRESSION_SLOPE:     return expression_slope(a, b);
    case EXPRESSION_POWER_LOG: return expression_power_log(a, b);
    case EXPRESSION_EXP:       return exp(a);
    case EXPRESSION_LN:        return log(a);
    case EXPRESSION_LOG10:     return log10(a);
    default:                   return NAN; /* a leaf has no operands */
    }
}

static double evaluate_node(const expression_node *node, const double *k, const double *x, double left,
                            double right)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:   return node->value;
    case EXPRESSION_CONSTANT: return k[node->left];
    case EXPRESSION_STATE:    return x[node->left];
    default:                  break;
    }
    return expression_apply(node->kind, left, right);
}

void expression_evaluate(const expression_graph *g, int first, int last, const unsigned char *needed,
                         const double *k, const double *x, double *values)
{
    for (int e = first; e <= last; e++) {
        const expression_node *node = &g->nodes[e];
        if (needed && !needed[e])
            continue;
        bool leaf = node->kind <= EXPRESSION_STATE;
        values[e] = evaluate_node(node, k, x, leaf ? 0 : values[node->left],
                                  leaf || node->right < 0 ? 0 : values[node->right]);
    }
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
        bool leaf = node->kind <= EXPRESSION_STATE;
        double left = leaf ? 0 : values[expression_place(list, i, node->left)];
        double right = leaf || node->right < 0 ? 0 : values[expression_place(list, i, node->right)];
        values[i] = evaluate_node(node, k, x, left, right);
    }
    if (values)
        result = values[length - 1];
    memory_free(values);
    memory_free(list);
    return result;
}
