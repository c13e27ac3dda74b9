/* Exact derivatives in the expression graph.
 *
 * Forward differentiation over the nodes below the root in ascending order,
 * each node once, so that the work and the new nodes are linear in what is
 * below (Griewank and Walther, Evaluating Derivatives, 2nd ed., SIAM 2008,
 * section 3.1, applied to symbols).  A quotient is differentiated as
 * (u' - (u/v) v')/v, which shares the quotient itself. */
#include <math.h>

#include "base/memory.h"
#include "model/expression.h"

static expression binary(expression_graph *g, expression_kind kind, expression a, expression b)
{
    return expression_binary(g, kind, a, b);
}

static expression product(expression_graph *g, expression a, expression b)
{
    return binary(g, EXPRESSION_MULTIPLY, a, b);
}

static expression minus_one(expression_graph *g, expression n)
{
    return binary(g, EXPRESSION_SUBTRACT, n, expression_number(g, 1));
}

/* Partial derivative of operation(x, n) by x, for the three power operations. */
static expression power_by_base(expression_graph *g, expression_kind kind, expression x, expression n)
{
    switch (kind) {
    case EXPRESSION_POWER:
        return binary(g, EXPRESSION_SLOPE, x, n);
    case EXPRESSION_SLOPE: /* n (n-1) x^(n-2) */
        return product(g, n, binary(g, EXPRESSION_SLOPE, x, minus_one(g, n)));
    default: /* n x^(n-1) ln x + x^(n-1) */
        return binary(g, EXPRESSION_ADD, product(g, n, binary(g, EXPRESSION_POWER_LOG, x, minus_one(g, n))),
                      binary(g, EXPRESSION_POWER, x, minus_one(g, n)));
    }
}

/* And by n. */
static expression power_by_exponent(expression_graph *g, expression_kind kind, expression x, expression n)
{
    switch (kind) {
    case EXPRESSION_POWER:
        return binary(g, EXPRESSION_POWER_LOG, x, n);
    case EXPRESSION_SLOPE: /* x^(n-1) + n x^(n-1) ln x */
        return binary(g, EXPRESSION_ADD, binary(g, EXPRESSION_POWER, x, minus_one(g, n)),
                      product(g, n, binary(g, EXPRESSION_POWER_LOG, x, minus_one(g, n))));
    default: /* x^n (ln x)^2 */
        return product(g, binary(g, EXPRESSION_POWER_LOG, x, n), expression_unary(g, EXPRESSION_LN, x));
    }
}

static bool is_zero(const expression_graph *g, expression e)
{
    double value;
    return expression_is_number(g, e, &value) && value == 0;
}

/* sum of partial * inner over both operands; a partial is built only where it counts. */
static expression power_rule(expression_graph *g, expression_node node, expression dx, expression dn)
{
    expression by_base = is_zero(g, dx) ? dx : product(g, power_by_base(g, node.kind, node.left, node.right), dx);
    if (is_zero(g, dn))
        return by_base;
    expression by_exponent = product(g, power_by_exponent(g, node.kind, node.left, node.right), dn);
    return binary(g, EXPRESSION_ADD, by_base, by_exponent);
}

/* Derivative of the operation e from those of its operands. */
static expression chain_rule(expression_graph *g, expression e, expression da, expression db)
{
    expression_node node = g->nodes[e];
    switch (node.kind) {
    case EXPRESSION_ADD:
    case EXPRESSION_SUBTRACT:
        return binary(g, node.kind, da, db);
    case EXPRESSION_MULTIPLY:
        return binary(g, EXPRESSION_ADD, product(g, da, node.right), product(g, node.left, db));
    case EXPRESSION_DIVIDE:
        return binary(g, EXPRESSION_DIVIDE, binary(g, EXPRESSION_SUBTRACT, da, product(g, e, db)), node.right);
    case EXPRESSION_NEGATE:
        return expression_unary(g, EXPRESSION_NEGATE, da);
    case EXPRESSION_EXP:
        return product(g, e, da);
    case EXPRESSION_LN:
        return binary(g, EXPRESSION_DIVIDE, da, node.left);
    case EXPRESSION_LOG10:
        return binary(g, EXPRESSION_DIVIDE, da, product(g, expression_number(g, log(10)), node.left));
    default:
        return power_rule(g, node, da, db);
    }
}

static expression derivative_of_leaf(expression_graph *g, const expression_node *node, expression_kind leaf,
                                     int index)
{
    return expression_number(g, node->kind == leaf && node->left == index ? 1 : 0);
}

expression expression_derivative(expression_graph *g, expression e, expression_kind leaf, int index)
{
    if (e == EXPRESSION_NONE)
        return EXPRESSION_NONE;
    int *list;
    size_t length;
    if (expression_below(g, e, &list, &length) != LB_OK)
        return EXPRESSION_NONE;
    expression result = EXPRESSION_NONE;
    int *derivative = memory_array(length, sizeof *derivative);
    for (size_t i = 0; derivative && i < length; i++) {
        expression_node node = g->nodes[list[i]];
        if (node.kind <= EXPRESSION_STATE) {
            derivative[i] = derivative_of_leaf(g, &node, leaf, index);
        } else {
            expression da = derivative[expression_place(list, i, node.left)];
            expression db = node.right < 0 ? expression_number(g, 0)
                                           : derivative[expression_place(list, i, node.right)];
            derivative[i] = is_zero(g, da) && is_zero(g, db) ? da : chain_rule(g, list[i], da, db);
        }
        if (derivative[i] == EXPRESSION_NONE)
            break;
        if (i + 1 == length)
            result = derivative[i];
    }
    memory_free(derivative);
    memory_free(list);
    return result;
}
