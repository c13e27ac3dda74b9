/* The syntax tree: expressions, arguments, ranges.
 *
 * Depth.  `a + b + c` leans to the left, one level a term, and a sum of a
 * hundred thousand terms is a tree of that depth.  Each expression records its
 * depth so that a later stage can walk it without the C stack, or refuse it.
 * Nesting by parentheses, powers and signs is limited while reading (lexical.c). */
#include "text/builder.h"

#include <stdio.h>

static int depth_of(const syntax_expression *e)
{
    return e ? e->depth : 0;
}

static void set_depth(syntax_expression *e)
{
    int deepest = depth_of(e->left) > depth_of(e->right) ? depth_of(e->left) : depth_of(e->right);
    for (const syntax_argument *a = e->first; a; a = a->next)
        if (depth_of(a->value) > deepest)
            deepest = depth_of(a->value);
    e->depth = deepest + 1;
}

static syntax_expression *node(builder *b, syntax_expression_kind kind, syntax_expression *left,
                               syntax_expression *right, span where)
{
    syntax_expression *e = builder_alloc(b, sizeof *e);
    if (!e)
        return NULL;
    e->kind = kind;
    e->where = where;
    e->operator_where = where;
    e->left = left;
    e->right = right;
    set_depth(e);
    return e;
}

syntax_expression *syntax_number_node(builder *b, syntax_number number, span where)
{
    syntax_expression *e = node(b, SYNTAX_NUMBER, NULL, NULL, where);
    if (e) {
        e->text = number.text;
        e->number = number.value;
    }
    return e;
}

syntax_expression *syntax_leaf(builder *b, syntax_expression_kind kind, const char *text, span where)
{
    syntax_expression *e = node(b, kind, NULL, NULL, where);
    if (e)
        e->text = text;
    return e;
}

syntax_expression *syntax_call(builder *b, const char *function, syntax_arguments arguments, span where)
{
    syntax_expression *e = syntax_leaf(b, SYNTAX_CALL, function, where);
    if (e) {
        e->first = arguments.first;
        set_depth(e);
    }
    return e;
}

syntax_expression *syntax_binary(builder *b, syntax_expression_kind kind, syntax_expression *left,
                                 syntax_expression *right, span operator_where, span where)
{
    syntax_expression *e = left && right ? node(b, kind, left, right, where) : NULL;
    if (e)
        e->operator_where = operator_where;
    return e;
}

syntax_expression *syntax_unary(builder *b, syntax_expression_kind kind, syntax_expression *operand, span where)
{
    return operand ? node(b, kind, operand, NULL, where) : NULL;
}

/* The number at the left end of a product, where it stands directly behind an
 * operator; NULL when there is none. */
static syntax_expression **leading_number(syntax_expression **right, span operator_where)
{
    while ((*right)->kind == SYNTAX_JUXTAPOSED || (*right)->kind == SYNTAX_MULTIPLY
           || (*right)->kind == SYNTAX_DIVIDE)
        right = &(*right)->left;
    return (*right)->kind == SYNTAX_NUMBER && span_touches(operator_where, (*right)->where) ? right : NULL;
}

/* Depths from the top of a product down to its leftmost factor, after that
 * factor became deeper by some levels. */
static void deepen(syntax_expression *top, const syntax_expression *leftmost, int levels)
{
    for (; top != leftmost; top = top->left)
        top->depth += levels;
}

/* `1.0 M-1 s-1`: a minus between a unit and a number, no blank on either side,
 * is a forgotten `^`.  Left is (1.0 M), right (1 s); what was meant is
 * ((1.0 M^-1) s). */
static syntax_expression *repair_exponent(builder *b, syntax_expression *left, syntax_expression *right,
                                          span operator_where)
{
    if (left->kind != SYNTAX_JUXTAPOSED || left->right->kind != SYNTAX_NAME
        || !span_touches(left->right->where, operator_where))
        return NULL;
    syntax_expression *top = right, **number = leading_number(&top, operator_where);
    if (!number)
        return NULL;
    syntax_expression *unit = left->right;
    span where = span_join(unit->where, (*number)->where);
    char remedy[120];
    snprintf(remedy, sizeof remedy, "write `%.40s^-%.40s`", unit->text, (*number)->text);
    builder_fault(b, where, remedy, "`%.40s-%.40s` is a subtraction, not a power of a unit", unit->text,
                  (*number)->text);
    syntax_expression *exponent = syntax_unary(b, SYNTAX_NEGATE, *number, span_join(operator_where, where));
    left->right = syntax_binary(b, SYNTAX_POWER, unit, exponent, operator_where, where);
    if (!left->right)
        return NULL;
    set_depth(left);
    *number = left;
    deepen(top, left, left->depth - 1);
    return top;
}

syntax_expression *syntax_subtract(builder *b, syntax_expression *left, syntax_expression *right,
                                   span operator_where, span where)
{
    if (!left || !right)
        return NULL;
    syntax_expression *repaired = repair_exponent(b, left, right, operator_where);
    return repaired ? repaired : syntax_binary(b, SYNTAX_SUBTRACT, left, right, operator_where, where);
}

/* ---- Ranges and arguments -------------------------------------------------- */

/* A number, signed or not, with a unit or without. */
static bool is_plain(const syntax_expression *e)
{
    while (e->kind == SYNTAX_JUXTAPOSED || e->kind == SYNTAX_DIVIDE || e->kind == SYNTAX_NEGATE)
        e = e->left;
    return e->kind == SYNTAX_NUMBER;
}

static bool check_end(builder *b, const syntax_expression *end)
{
    if (end && !is_plain(end))
        builder_fault(b, end->where, "write a number, with a unit or without", "an end of a range is a plain number");
    return end && is_plain(end);
}

syntax_range *syntax_range_between(builder *b, syntax_expression *low, syntax_expression *high, span where)
{
    bool good = check_end(b, low);
    good = check_end(b, high) && good;
    syntax_range *range = good ? builder_alloc(b, sizeof *range) : NULL;
    b->tree->page->is_plain = false;
    if (range)
        *range = (syntax_range){.where = where, .low = low, .high = high};
    return range;
}

syntax_range *syntax_range_factor(builder *b, syntax_expression *factor, span where)
{
    syntax_range *range = factor ? builder_alloc(b, sizeof *range) : NULL;
    b->tree->page->is_plain = false;
    if (range)
        *range = (syntax_range){.where = where, .is_factor = true, .low = factor};
    return range;
}

syntax_argument *syntax_argument_new(builder *b, const char *name, span name_where, syntax_expression *value,
                                     syntax_range *range)
{
    syntax_argument *argument = value ? builder_alloc(b, sizeof *argument) : NULL;
    if (argument)
        *argument = (syntax_argument){name, name_where, value, range, NULL};
    return argument;
}

syntax_arguments syntax_arguments_add(syntax_arguments list, syntax_argument *argument)
{
    if (!argument)
        return list;
    if (list.last)
        list.last->next = argument;
    else
        list.first = argument;
    list.last = argument;
    return list;
}
