/* Expressions as text in the notation of the mechanism language.
 *
 * An explicit stack holds what is still to be written, literal text and
 * operands alike, so that depth costs heap and not the call stack.  An operand
 * is put in parentheses when the grammar would otherwise group it differently:
 * operators group to the left, so the right operand needs them at equal rank;
 * a power has them on both sides, which reads clearly whatever one's habit. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/expression.h"

void expression_write_number(double value, buffer *out)
{
    char text[40];
    for (int digits = 15; digits <= 17; digits++) {
        snprintf(text, sizeof text, "%.*g", digits, value);
        if (strtod(text, NULL) == value)
            break;
    }
    /* 1e-05 and 1e+20 as people write them: 1e-5, 1e20. */
    char *exponent = strchr(text, 'e');
    if (exponent) {
        char *digits = exponent + 1;
        char *to = digits;
        if (*digits == '-')
            to++;
        digits++;
        while (*digits == '0')
            digits++;
        memmove(to, digits, strlen(digits) + 1);
    }
    buffer_append(out, text);
}

enum { RANK_SUM = 1, RANK_PRODUCT, RANK_SIGN, RANK_POWER, RANK_ATOM };

static int rank_of(const expression_node *node)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:    return node->value < 0 ? RANK_SIGN : RANK_ATOM;
    case EXPRESSION_ADD:
    case EXPRESSION_SUBTRACT:  return RANK_SUM;
    case EXPRESSION_MULTIPLY:
    case EXPRESSION_DIVIDE:
    case EXPRESSION_SLOPE:
    case EXPRESSION_POWER_LOG: return RANK_PRODUCT;
    case EXPRESSION_NEGATE:    return RANK_SIGN;
    case EXPRESSION_POWER:     return RANK_POWER;
    default:                   return RANK_ATOM;
    }
}

typedef struct item {
    const char *text;       /* literal text, or NULL: the node */
    expression node;
} item;

typedef struct writer {
    const expression_graph *g;
    expression_namer *name;
    expression_aliaser *alias; /* may be NULL */
    const void *context;
    item *stack;
    size_t depth, capacity;
    bool failed;
    buffer *out;
} writer;

static void push_text(writer *w, const char *text)
{
    if (memory_grow(&w->stack, &w->capacity, w->depth, sizeof *w->stack) != 0) {
        w->failed = true;
        return;
    }
    w->stack[w->depth++] = (item){.text = text, .node = EXPRESSION_NONE};
}

/* The operand in parentheses when it binds less tightly than `rank`; a name for the whole of
 * it needs none. */
static void push_operand(writer *w, expression e, int rank)
{
    const char *alias = w->alias ? w->alias(w->context, e) : NULL;
    if (alias) {
        push_text(w, alias);
        return;
    }
    bool parentheses = rank_of(&w->g->nodes[e]) < rank;
    if (parentheses)
        push_text(w, ")");
    push_text(w, NULL);
    if (!w->failed)
        w->stack[w->depth - 1].node = e;
    if (parentheses)
        push_text(w, "(");
}

/* Pushed in reverse, since the top of the stack is written first.  A sign never follows + or
 * -, since the builder takes it into them. */
static void push_binary(writer *w, const expression_node *node, int left, const char *sign, int right)
{
    push_operand(w, node->right, right);
    push_text(w, sign);
    push_operand(w, node->left, left);
}

static void push_call(writer *w, const expression_node *node, const char *name)
{
    push_text(w, ")");
    push_operand(w, node->left, 0);
    push_text(w, name);
}

/* n*x^(n - 1) */
static void push_slope(writer *w, const expression_node *node)
{
    push_text(w, " - 1)");
    push_operand(w, node->right, RANK_SUM);
    push_text(w, "^(");
    push_operand(w, node->left, RANK_ATOM);
    push_text(w, "*");
    push_operand(w, node->right, RANK_PRODUCT);
}

/* x^n*ln(x) */
static void push_power_log(writer *w, const expression_node *node)
{
    push_call(w, node, "*ln(");
    push_binary(w, node, RANK_ATOM, "^", RANK_ATOM);
}

static void write_node(writer *w, const expression_node *node)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:    expression_write_number(node->value, w->out); break;
    case EXPRESSION_CONSTANT:
    case EXPRESSION_STATE:     buffer_append(w->out, w->name(w->context, node->kind, node->left)); break;
    case EXPRESSION_ADD:       push_binary(w, node, RANK_SUM, " + ", RANK_PRODUCT); break;
    case EXPRESSION_SUBTRACT:  push_binary(w, node, RANK_SUM, " - ", RANK_PRODUCT); break;
    case EXPRESSION_MULTIPLY:  push_binary(w, node, RANK_PRODUCT, "*", RANK_POWER); break;
    case EXPRESSION_DIVIDE:    push_binary(w, node, RANK_PRODUCT, "/", RANK_POWER); break;
    case EXPRESSION_NEGATE:    push_operand(w, node->left, RANK_PRODUCT); push_text(w, "-"); break;
    case EXPRESSION_POWER:     push_binary(w, node, RANK_ATOM, "^", RANK_ATOM); break;
    case EXPRESSION_SLOPE:     push_slope(w, node); break;
    case EXPRESSION_POWER_LOG: push_power_log(w, node); break;
    case EXPRESSION_EXP:       push_call(w, node, "exp("); break;
    case EXPRESSION_LN:        push_call(w, node, "ln("); break;
    case EXPRESSION_LOG10:     push_call(w, node, "log10("); break;
    case EXPRESSION_SQRT:      push_call(w, node, "sqrt("); break;
    }
}

void expression_write_aliased(const expression_graph *g, expression e, expression_namer *name,
                              expression_aliaser *alias, bool expand, const void *context, buffer *out)
{
    writer w = {.g = g, .name = name, .alias = expand ? NULL : alias, .context = context, .out = out};
    size_t written = 0;
    push_operand(&w, e, 0);
    w.alias = alias;
    while (w.depth > 0 && !w.failed) {
        item top = w.stack[--w.depth];
        if (top.text)
            buffer_append(out, top.text);
        else if (written++ < EXPRESSION_TEXT_NODES)
            write_node(&w, &g->nodes[top.node]);
        else
            buffer_append(out, "...");
    }
    if (w.failed)
        out->status = LB_E_NOMEM;
    memory_free(w.stack);
}

void expression_write(const expression_graph *g, expression e, expression_namer *name, const void *context,
                      buffer *out)
{
    expression_write_aliased(g, e, name, NULL, true, context, out);
}
