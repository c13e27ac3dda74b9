/* Expressions as C.
 *
 * Parentheses stand where the order of evaluation needs them.  Whole powers are
 * products, the small ones in place, the larger ones in a helper by repeated
 * squaring; all other powers go through helpers that fix what x^n means at and
 * below zero (model/expression.h).  plan.c bounds the depth of what is written
 * in one place, so recursion is shallow. */
#include "emit/write.h"

#include <math.h>

#include "emit/spell.h"

static bool is_local(const writer *w, expression e)
{
    return w->plan->is_local[e];
}

void write_local_name(writer *w, expression e)
{
    int number = w->plan->number[e];
    if (w->plan->home[e] == PLAN_SHARED) {
        w->uses_shared = true;
        buffer_printf(w->out, "c[%d]", number);
    } else if (w->definition[e] >= 0) {
        buffer_append(w->out, w->definition_name[w->definition[e]]);
    } else {
        buffer_printf(w->out, "%c%d", expression_has_state(w->graph, e) ? 's' : 'c', number);
    }
}

void write_expression(writer *w, expression e, write_place place)
{
    if (is_local(w, e))
        write_local_name(w, e);
    else
        write_operation(w, e, place);
}

static void write_number(writer *w, double value, write_place place)
{
    bool is_enclosed = signbit(value) && place != WRITE_SUM;
    w->uses_math = w->uses_math || !isfinite(value);
    if (is_enclosed)
        buffer_char(w->out, '(');
    spell_number(w->out, value);
    if (is_enclosed)
        buffer_char(w->out, ')');
}

static void write_call(writer *w, const char *function, expression a, expression b)
{
    buffer_append(w->out, function);
    buffer_char(w->out, '(');
    write_expression(w, a, WRITE_SUM);
    if (b != EXPRESSION_NONE) {
        buffer_append(w->out, ", ");
        write_expression(w, b, WRITE_SUM);
    }
    buffer_char(w->out, ')');
}

/* base^order, order > 0 */
static void write_whole_power(writer *w, expression base, int order)
{
    if (order > PLAN_POWER_IN_PLACE) {
        w->uses_whole_power[order] = true;
        buffer_printf(w->out, "power_%d(", order);
        write_expression(w, base, WRITE_SUM);
        buffer_char(w->out, ')');
        return;
    }
    for (int i = 0; i < order; i++) {
        if (i > 0)
            buffer_char(w->out, '*');
        write_expression(w, base, WRITE_OPERAND);
    }
}

static bool is_whole_power(const writer *w, const expression_node *node, int *order)
{
    double n;
    if (!expression_is_number(w->graph, node->right, &n) || n != floor(n) || fabs(n) > WRITE_HIGHEST_POWER)
        return false;
    *order = (int)n;
    return n != 0;
}

static void write_divisor(writer *w, expression base, int order)
{
    bool is_enclosed = order > 1 && order <= PLAN_POWER_IN_PLACE;
    if (order == 1) {
        write_expression(w, base, WRITE_OPERAND);
        return;
    }
    if (is_enclosed)
        buffer_char(w->out, '(');
    write_whole_power(w, base, order);
    if (is_enclosed)
        buffer_char(w->out, ')');
}

static void write_power(writer *w, const expression_node *node)
{
    int order;
    double n = NAN;
    bool is_number = expression_is_number(w->graph, node->right, &n);
    if (is_whole_power(w, node, &order)) {
        if (order > 0) {
            write_whole_power(w, node->left, order);
        } else {
            buffer_append(w->out, "1.0/");
            write_divisor(w, node->left, -order);
        }
    } else if (is_number && n == 0.5) {
        w->uses_root = w->uses_math = true;
        write_call(w, "real_root", node->left, EXPRESSION_NONE);
    } else if (is_number && n == floor(n)) {
        w->uses_math = true;
        write_call(w, "pow", node->left, node->right);
    } else {
        w->uses_power = w->uses_math = true;
        write_call(w, "real_power", node->left, node->right);
    }
}

/* Whether the text of a node needs parentheses in its place. */
static write_place binding(const writer *w, const expression_node *node)
{
    int order;
    switch (node->kind) {
    case EXPRESSION_ADD: case EXPRESSION_SUBTRACT: case EXPRESSION_NEGATE:
        return WRITE_SUM;
    case EXPRESSION_MULTIPLY: case EXPRESSION_DIVIDE:
        return WRITE_TERM;
    case EXPRESSION_POWER:
        if (is_whole_power(w, node, &order))
            return order < 0 ? WRITE_TERM : order <= PLAN_POWER_IN_PLACE ? WRITE_FACTOR : WRITE_OPERAND;
        return WRITE_OPERAND;
    default:
        return WRITE_OPERAND;
    }
}

/* What a factor divides by, when it is 1/e or a negative power of e: its node, and the
 * order of the power (1: e itself); EXPRESSION_NONE otherwise. */
static expression divisor_of(const writer *w, expression factor, int *order)
{
    const expression_node *node = &w->graph->nodes[factor];
    double top;
    *order = 1;
    if (is_local(w, factor))
        return EXPRESSION_NONE;
    if (node->kind == EXPRESSION_DIVIDE && expression_is_number(w->graph, node->left, &top) && top == 1)
        return node->right;
    if (node->kind != EXPRESSION_POWER || !is_whole_power(w, node, order) || *order > 0)
        return EXPRESSION_NONE;
    *order = -*order;
    return node->left;
}

/* `*right`, or `/base`.  A product on the right goes without parentheses: the
 * grouping changes the rounding alone. */
static void write_factor(writer *w, expression right)
{
    int order;
    expression divisor = divisor_of(w, right, &order);
    buffer_char(w->out, divisor == EXPRESSION_NONE ? '*' : '/');
    if (divisor != EXPRESSION_NONE)
        write_divisor(w, divisor, order);
    else
        write_expression(w, right, w->graph->nodes[right].kind == EXPRESSION_MULTIPLY ? WRITE_TERM : WRITE_FACTOR);
}

/* A number that leads the right operand comes to the front: k*(2*x) is 2*k*x. */
static void write_product(writer *w, const expression_node *node)
{
    const expression_node *right = &w->graph->nodes[node->right];
    double number;
    bool is_led = right->kind == EXPRESSION_MULTIPLY && !is_local(w, node->right) &&
                  expression_is_number(w->graph, right->left, &number) && number > 0;
    if (is_led) {
        write_expression(w, right->left, WRITE_TERM);
        buffer_char(w->out, '*');
    }
    write_expression(w, node->left, WRITE_TERM);
    write_factor(w, is_led ? right->right : node->right);
}

static void write_binary(writer *w, const expression_node *node)
{
    switch (node->kind) {
    case EXPRESSION_ADD:
    case EXPRESSION_SUBTRACT:
        write_expression(w, node->left, WRITE_SUM);
        buffer_append(w->out, node->kind == EXPRESSION_ADD ? " + " : " - ");
        write_expression(w, node->right, WRITE_TERM);
        break;
    case EXPRESSION_MULTIPLY:
        write_product(w, node);
        break;
    default:
        write_expression(w, node->left, WRITE_TERM);
        buffer_char(w->out, '/');
        write_expression(w, node->right, WRITE_OPERAND);
        break;
    }
}

static void write_slope(writer *w, const expression_node *node)
{
    double n;
    w->uses_math = true;
    if (expression_is_number(w->graph, node->right, &n) && n == 0.5) {
        w->uses_root_slope = true;
        write_call(w, "root_slope", node->left, EXPRESSION_NONE);
    } else {
        w->uses_slope = true;
        write_call(w, "real_slope", node->left, node->right);
    }
}

static void write_node(writer *w, const expression_node *node)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:
        break;
    case EXPRESSION_CONSTANT:
        w->uses_k = true;
        buffer_printf(w->out, "k[%d]", node->left);
        break;
    case EXPRESSION_STATE:
        w->uses_x = true;
        buffer_printf(w->out, "x[%d]", node->left);
        break;
    case EXPRESSION_ADD: case EXPRESSION_SUBTRACT: case EXPRESSION_MULTIPLY: case EXPRESSION_DIVIDE:
        write_binary(w, node);
        break;
    case EXPRESSION_NEGATE:
        buffer_char(w->out, '-');
        write_expression(w, node->left, WRITE_TERM);
        break;
    case EXPRESSION_POWER:
        write_power(w, node);
        break;
    case EXPRESSION_SLOPE:
        write_slope(w, node);
        break;
    case EXPRESSION_POWER_LOG:
        w->uses_power_log = w->uses_math = true;
        write_call(w, "real_power_log", node->left, node->right);
        break;
    case EXPRESSION_EXP:
        w->uses_math = true;
        write_call(w, "exp", node->left, EXPRESSION_NONE);
        break;
    case EXPRESSION_LN:
        w->uses_math = true;
        write_call(w, "log", node->left, EXPRESSION_NONE);
        break;
    case EXPRESSION_LOG10:
        w->uses_math = true;
        write_call(w, "log10", node->left, EXPRESSION_NONE);
        break;
    case EXPRESSION_SQRT:
        w->uses_root = w->uses_math = true;
        write_call(w, "real_root", node->left, EXPRESSION_NONE);
        break;
    }
}

void write_operation(writer *w, expression e, write_place place)
{
    const expression_node *node = &w->graph->nodes[e];
    if (node->kind == EXPRESSION_NUMBER) {
        write_number(w, node->value, place);
        return;
    }
    bool is_enclosed = binding(w, node) < place;
    if (is_enclosed)
        buffer_char(w->out, '(');
    write_node(w, node);
    if (is_enclosed)
        buffer_char(w->out, ')');
}

/* ---- Helper functions ---------------------------------------------------------- */

/* x^order by repeated squaring. */
static void write_power_helper(int order, buffer *out)
{
    buffer_printf(out, "/* x^%d */\nstatic double power_%d(double x)\n{\n", order, order);
    for (int square = 2; square <= order; square *= 2) {
        if (square == 2)
            buffer_append(out, "    const double x2 = x*x;\n");
        else
            buffer_printf(out, "    const double x%d = x%d*x%d;\n", square, square / 2, square / 2);
    }
    buffer_append(out, "    return ");
    bool is_first = true;
    for (int square = WRITE_HIGHEST_POWER; square >= 1; square /= 2) {
        if (!(order & square))
            continue;
        if (!is_first)
            buffer_char(out, '*');
        if (square == 1)
            buffer_char(out, 'x');
        else
            buffer_printf(out, "x%d", square);
        is_first = false;
    }
    buffer_append(out, ";\n}\n\n");
}

void write_helpers(const writer *w, buffer *out)
{
    for (int order = 0; order <= WRITE_HIGHEST_POWER; order++)
        if (w->uses_whole_power[order])
            write_power_helper(order, out);
    if (w->uses_root)
        buffer_append(out, "/* The square root of x, 0 below zero. */\n"
                           "static double real_root(double x)\n{\n"
                           "    return x < 0.0 ? 0.0 : sqrt(x);\n}\n\n");
    if (w->uses_root_slope)
        buffer_append(out, "/* The derivative of the square root of x, 0 where it is infinite or undefined. */\n"
                           "static double root_slope(double x)\n{\n"
                           "    return x <= 0.0 ? 0.0 : 0.5/sqrt(x);\n}\n\n");
    if (w->uses_power)
        buffer_append(out, "/* x^n, 0 where x is negative and n not whole. */\n"
                           "static double real_power(double x, double n)\n{\n"
                           "    return x < 0.0 && n != floor(n) ? 0.0 : pow(x, n);\n}\n\n");
    if (w->uses_slope)
        buffer_append(out, "/* n x^(n-1), the derivative of x^n by x; 0 where that is infinite or undefined. */\n"
                           "static double real_slope(double x, double n)\n{\n"
                           "    if ((x <= 0.0 && n != floor(n)) || (x == 0.0 && n < 1.0))\n"
                           "        return 0.0;\n"
                           "    return n*pow(x, n - 1.0);\n}\n\n");
    if (w->uses_power_log)
        buffer_append(out, "/* x^n ln x, the derivative of x^n by n; 0 where x is not positive. */\n"
                           "static double real_power_log(double x, double n)\n{\n"
                           "    return x <= 0.0 ? 0.0 : pow(x, n)*log(x);\n}\n\n");
}
