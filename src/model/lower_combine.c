/* How operands combine: value, dimension, and what print leaves open. */
#include <math.h>
#include <string.h>

#include "model/lower.h"

/* ---- A unit behind a number ------------------------------------------------------------------ */

static void fault_product(lower *l, const syntax_expression *node, const char *right)
{
    const syntax_expression *left = node->left;
    bool is_short = (left->kind == SYNTAX_NUMBER || left->kind == SYNTAX_NAME) && left->text
                    && node->right->kind == SYNTAX_NAME;
    diagnostics_fault(l->list, node->where,
                      is_short ? lower_text(l, "write `%s*%s`", left->text, right) : "write `*` between the two",
                      "a product needs `*`");
}

/* `2 k2`, `k s`, `1 cm3`: something else than a number and its unit side by side. */
static void fault_juxtaposed(lower *l, const syntax_expression *node, bool is_number)
{
    const syntax_expression *name = node->right->kind == SYNTAX_POWER ? node->right->left : node->right;
    const char *text = name->text ? name->text : "";
    unit u;
    bool is_unit = unit_find(text, &u);
    bool is_known =
        names_find(&l->definition_names, text) >= 0 || strcmp(text, "T") == 0 || strcmp(text, "R") == 0;
    if (l->net->units.none && is_unit && !is_known)
        diagnostics_fault(l->list, node->right->where, "leave the unit out",
                          "there are no units after `units none`");
    else if (l->net->units.none || is_known || (!is_number && !is_unit))
        fault_product(l, node, text);
    else if (!is_unit)
        diagnostics_fault(l->list, name->where, lower_unit_remedy(l, text), "there is no unit `%s`", text);
    else if (!is_number)
        diagnostics_fault(l->list, node->where,
                          lower_text(l, "multiply by the unit: write `*` before `%s`", text),
                          "a unit follows a plain number");
    else
        diagnostics_fault(l->list, node->right->where, "write it as in `M^-0.5` or `M^(-1/2)`",
                          "the exponent of a unit is a number");
}

lower_value value_juxtaposed(lower *l, const syntax_expression *node, lower_value left)
{
    unit factor;
    bool is_number = left.kind == VALUE_PLAIN || left.kind == VALUE_UNIT;
    if (left.kind == VALUE_BAD)
        return left;
    if (!is_number || !lower_unit_factor(l, node->right, &factor)) {
        fault_juxtaposed(l, node, is_number);
        return value_bad(node->where);
    }
    left.has_unit = true;
    if (unit_multiply(&left.measure, &factor, &left.measure))
        return left;
    diagnostics_fault(l->list, node->where, NULL, "an exponent of this unit is too large");
    return value_bad(node->where);
}

/* ---- What print leaves open --------------------------------------------------------------------- */

static const syntax_expression *leftmost(const syntax_expression *node)
{
    while (node->kind == SYNTAX_JUXTAPOSED)
        node = node->left;
    return node;
}

/* `J/mol K`: does K belong to the divisor?  `a / 2 M/s`: does s? */
static bool fault_open_division(lower *l, const syntax_expression *node, const lower_value *right_value)
{
    const syntax_expression *left = node->left, *right = node->right;
    if (node->kind != SYNTAX_DIVIDE)
        return false;
    const char *remedy = "put the divisor in parentheses, as in `a / (2 M/s)` and `J/(mol K)`";
    if (right->kind == SYNTAX_JUXTAPOSED && leftmost(right)->kind != SYNTAX_NUMBER) {
        if (right->left->kind == SYNTAX_NAME && right->right->kind == SYNTAX_NAME)
            remedy = lower_text(l, "write `/%s/%s` or `/(%s %s)`", right->left->text, right->right->text,
                                right->left->text, right->right->text);
        diagnostics_fault(l->list, right->where, remedy, "it is open how much of this the `/` divides by");
        return true;
    }
    if (left->kind != SYNTAX_DIVIDE || left->right->kind != SYNTAX_JUXTAPOSED || right_value->kind != VALUE_UNIT)
        return false;
    const syntax_expression *quantity = left->right;
    if (quantity->left->kind == SYNTAX_NUMBER && quantity->right->kind == SYNTAX_NAME
        && right->kind == SYNTAX_NAME)
        remedy = lower_text(l, "write `/ (%s %s/%s)`", quantity->left->text, quantity->right->text, right->text);
    diagnostics_fault(l->list, quantity->where, remedy, "it is open how much of this the `/` divides by");
    return true;
}

/* `M^-1/2`: is the exponent -1/2?  Also `x^1/2`, where ^1 has no other sense. */
static bool fault_open_exponent(lower *l, const syntax_expression *node)
{
    const syntax_expression *divisor = node->kind == SYNTAX_DIVIDE ? leftmost(node->right) : node;
    if (divisor->kind != SYNTAX_NUMBER)
        return false;
    const syntax_expression *power = node->left;
    if (power->kind == SYNTAX_JUXTAPOSED || power->kind == SYNTAX_MULTIPLY || power->kind == SYNTAX_DIVIDE)
        power = power->right;
    if (power->kind != SYNTAX_POWER)
        return false;
    const syntax_expression *exponent = power->right;
    bool is_negative = exponent->kind == SYNTAX_NEGATE;
    if (is_negative)
        exponent = exponent->left;
    if (exponent->kind != SYNTAX_NUMBER)
        return false;
    bool is_unit = power->left->kind == SYNTAX_NAME && lower_is_unit_name(l, power->left->text);
    if (!is_unit && exponent->number != 1)
        return false;
    double value = (is_negative ? -1 : 1) * exponent->number / divisor->number;
    const char *sign = is_negative ? "-" : "";
    diagnostics_fault(l->list, power->where,
                      lower_text(l, "write `^(%s%s/%s)` or `^%g`", sign, exponent->text, divisor->text, value),
                      "it is open how much of this is the exponent");
    return true;
}

/* ---- Arithmetic ------------------------------------------------------------------------------------ */

static const struct { expression_kind kind; const char *sign; } operators[] = {
    [SYNTAX_ADD] = {EXPRESSION_ADD, "+"},           [SYNTAX_SUBTRACT] = {EXPRESSION_SUBTRACT, "-"},
    [SYNTAX_MULTIPLY] = {EXPRESSION_MULTIPLY, "*"}, [SYNTAX_DIVIDE] = {EXPRESSION_DIVIDE, "/"},
    [SYNTAX_POWER] = {EXPRESSION_POWER, "^"}};

static double compute(syntax_expression_kind kind, double a, double b)
{
    switch (kind) {
    case SYNTAX_ADD:      return a + b;
    case SYNTAX_SUBTRACT: return a - b;
    case SYNTAX_MULTIPLY: return a * b;
    case SYNTAX_DIVIDE:   return a / b;
    default:              return expression_power(a, b);
    }
}

/* `0.05 M + [S]` for `0.05 + [S]`.  A bare 1 may well be meant, as in `1 - [S]/0.1`. */
static const char *sum_remedy(lower *l, const syntax_expression *node, const char *left, const char *right,
                              bool left_is_bare, bool right_is_bare)
{
    const syntax_expression *bare = left_is_bare ? node->left : right_is_bare ? node->right : NULL;
    const char *wanted = left_is_bare ? right : left;
    if (!bare || bare->kind != SYNTAX_NUMBER || !bare->text || strcmp(wanted, "another unit") == 0)
        return NULL;
    if (bare->number == 1)
        return lower_text(l, "write `%s %s`, or divide the other side by a quantity in %s", bare->text, wanted,
                          wanted);
    return lower_text(l, "write `%s %s`", bare->text, wanted);
}

static bool is_bare(const lower_value *v)
{
    return v->kind == VALUE_PLAIN && !v->has_unit;
}

static lower_value add(lower *l, const syntax_expression *node, lower_value *left, lower_value *right)
{
    bool left_is_bare = is_bare(left), right_is_bare = is_bare(right);
    const char *a, *b;
    value_finish(l, left);
    value_finish(l, right);
    if (left->kind == VALUE_BAD || right->kind == VALUE_BAD)
        return value_bad(node->where);
    if (lower_agree(l, &left->dim, &right->dim, node->operator_where.line, &a, &b))
        return value_general(node->where, EXPRESSION_NONE, 0, left->dim);
    diagnostics_fault(l->list, node->operator_where, sum_remedy(l, node, a, b, left_is_bare, right_is_bare),
                      "`%s` stands between %s and %s", operators[node->kind].sign, a, b);
    return value_bad(node->where);
}

/* Products of a number or unit with a unit stay what they are. */
static bool stays_plain(const syntax_expression *node, lower_value *left, const lower_value *right)
{
    bool is_left = left->kind == VALUE_PLAIN || left->kind == VALUE_UNIT;
    if (!is_left || right->kind != VALUE_UNIT)
        return false;
    left->has_unit = true;
    return node->kind == SYNTAX_MULTIPLY ? unit_multiply(&left->measure, &right->measure, &left->measure)
                                         : unit_divide(&left->measure, &right->measure, &left->measure);
}

static lower_value multiply(lower *l, const syntax_expression *node, lower_value *left, lower_value *right)
{
    value_finish(l, left);
    value_finish(l, right);
    if (left->kind == VALUE_BAD || right->kind == VALUE_BAD)
        return value_bad(node->where);
    lower_value v = value_general(node->where, EXPRESSION_NONE, 0, left->dim);
    if (form_multiply(&v.dim, &right->dim, node->kind == SYNTAX_MULTIPLY ? 1 : -1))
        return v;
    diagnostics_fault(l->list, node->operator_where, NULL, "the dimension of this product is beyond all sense");
    return value_bad(node->where);
}

/* The base's dimension to the power: the exponent's number as the file gives it,
 * so that Hill exponents may be constants; a pure number to any power. */
static lower_value raise(lower *l, const syntax_expression *node, lower_value *left, lower_value *right)
{
    value_finish(l, left);
    value_finish(l, right);
    dimension none = dimension_none();
    if (left->kind == VALUE_BAD || !lower_need(l, right, &none, "an exponent", NULL))
        return value_bad(node->where);
    lower_value v = value_general(node->where, EXPRESSION_NONE, 0, left->dim);
    rational power;
    if (!right->has_state && rational_near(right->number, &power)) {
        if (form_power(&v.dim, power))
            return v;
        diagnostics_fault(l->list, node->operator_where, NULL, "the dimension of this power is beyond all sense");
        return value_bad(node->where);
    }
    v.dim = form_none();
    return lower_need(l, left, &none, "the base of this power", NULL) ? v : value_bad(node->where);
}

lower_value value_binary(lower *l, const syntax_expression *node, lower_value left, lower_value right)
{
    if (fault_open_division(l, node, &right) || fault_open_exponent(l, node))
        return value_bad(node->where);
    bool is_product = node->kind == SYNTAX_MULTIPLY || node->kind == SYNTAX_DIVIDE;
    rational power;
    if (is_product && stays_plain(node, &left, &right))
        return left;
    if (node->kind == SYNTAX_POWER && left.kind == VALUE_UNIT && is_bare(&right)
        && rational_near(right.raw, &power)
        && unit_power(&left.measure, (int)power.num, (int)power.den, &left.measure))
        return left;
    lower_value v;
    if (node->kind == SYNTAX_ADD || node->kind == SYNTAX_SUBTRACT)
        v = add(l, node, &left, &right);
    else
        v = is_product ? multiply(l, node, &left, &right) : raise(l, node, &left, &right);
    if (v.kind == VALUE_BAD)
        return v;
    v.e = expression_binary(&l->net->graph, operators[node->kind].kind, left.e, right.e);
    v.has_state = left.has_state || right.has_state;
    v.number = v.has_state ? NAN : compute(node->kind, left.number, right.number);
    if (v.e == EXPRESSION_NONE)
        lower_no_memory(l);
    return v;
}

lower_value value_negate(lower *l, lower_value operand)
{
    if (operand.kind == VALUE_PLAIN) {
        operand.raw = -operand.raw;
        return operand;
    }
    value_finish(l, &operand);
    if (operand.kind == VALUE_BAD)
        return operand;
    operand.e = expression_unary(&l->net->graph, EXPRESSION_NEGATE, operand.e);
    operand.number = -operand.number;
    operand.plain = -1;
    if (operand.e == EXPRESSION_NONE)
        lower_no_memory(l);
    return operand;
}
