/* The equations that a conservation law obeys, step after step.
 *
 * A coefficient that is an expression of constants is a rational combination of
 * parts, found by walking down through sums, signs, and products and quotients
 * with numbers; what is left is a part that is taken as independent of all others
 * (f and 1 - f have the parts 1 and f).  A step then gives one equation for each
 * part.  Where parts depend on each other after all (f*g and g*f), a law may be
 * missed, but none is invented. */
#include "exact/balance.h"

#include <flint/fmpq.h>
#include <math.h>
#include <stdlib.h>

#include "base/memory.h"
#include "model/network_build.h"

/* value * part in the coefficient of one column; part EXPRESSION_NONE: the number one. */
typedef struct share {
    expression part;
    int column;
    fmpq value;
} share;

typedef struct shares {
    share *list;
    size_t count, capacity;
} shares;

/* An expression still to be split, with its factor. */
typedef struct task {
    expression e;
    fmpq factor;
} task;

typedef struct tasks {
    task *stack;
    size_t depth, capacity;
    size_t visited;
    bool failed;
} tasks;

/* Shared parts can make a sum exponentially long: beyond this an expression is a part. */
enum { SPLIT_LIMIT = 10000 };

static void clear_shares(shares *s)
{
    for (size_t i = 0; i < s->count; i++)
        fmpq_clear(&s->list[i].value);
    s->count = 0;
}

/* ---- Splitting a coefficient ----------------------------------------------------- */

static lb_status add_share(shares *into, expression part, int column, const fmpq *value)
{
    if (memory_grow(&into->list, &into->capacity, into->count, sizeof *into->list) != 0)
        return LB_E_NOMEM;
    share *last = &into->list[into->count++];
    last->part = part;
    last->column = column;
    fmpq_init(&last->value);
    fmpq_set(&last->value, value);
    return LB_OK;
}

/* A number exactly: a small fraction that is this double, else the double itself. */
static void set_number(fmpq *out, double value)
{
    int64_t num, den;
    if (fraction_of_double(value, &num, &den)) {
        fmpq_set_si(out, num, (ulong)den);
        return;
    }
    int exponent;
    int64_t mantissa = (int64_t)ldexp(frexp(value, &exponent), 53);
    exponent -= 53;
    fmpq_set_si(out, mantissa, 1);
    if (exponent >= 0)
        fmpq_mul_2exp(out, out, (ulong)exponent);
    else
        fmpq_div_2exp(out, out, (ulong)-exponent);
}

static void push(tasks *t, expression e, const fmpq *factor)
{
    if (memory_grow(&t->stack, &t->capacity, t->depth, sizeof *t->stack) != 0) {
        t->failed = true;
        return;
    }
    task *top = &t->stack[t->depth++];
    top->e = e;
    fmpq_init(&top->factor);
    fmpq_set(&top->factor, factor);
}

/* Pushes `inner` times a number; false when `number` is none. */
static bool push_scaled(tasks *t, const expression_graph *g, expression inner, expression number, bool divide,
                        const fmpq *factor)
{
    double value;
    if (!expression_is_number(g, number, &value) || (divide && value == 0))
        return false;
    fmpq_t scaled;
    fmpq_init(scaled);
    set_number(scaled, value);
    if (divide)
        fmpq_div(scaled, factor, scaled);
    else
        fmpq_mul(scaled, factor, scaled);
    push(t, inner, scaled);
    fmpq_clear(scaled);
    return true;
}

/* Splits the node into tasks; false when it is a part of its own. */
static bool split_node(tasks *t, const expression_graph *g, expression e, const fmpq *factor)
{
    const expression_node *node = &g->nodes[e];
    fmpq_t minus;
    switch (node->kind) {
    case EXPRESSION_ADD:
        push(t, node->left, factor);
        push(t, node->right, factor);
        return true;
    case EXPRESSION_SUBTRACT:
    case EXPRESSION_NEGATE:
        fmpq_init(minus);
        fmpq_neg(minus, factor);
        if (node->kind == EXPRESSION_SUBTRACT)
            push(t, node->left, factor);
        push(t, node->kind == EXPRESSION_SUBTRACT ? node->right : node->left, minus);
        fmpq_clear(minus);
        return true;
    case EXPRESSION_MULTIPLY:
        return push_scaled(t, g, node->left, node->right, false, factor) ||
               push_scaled(t, g, node->right, node->left, false, factor);
    case EXPRESSION_DIVIDE:
        return push_scaled(t, g, node->left, node->right, true, factor);
    default:
        return false;
    }
}

static lb_status add_number(shares *into, int column, const fmpq *factor, double value)
{
    fmpq_t number;
    fmpq_init(number);
    set_number(number, value);
    fmpq_mul(number, number, factor);
    lb_status status = add_share(into, EXPRESSION_NONE, column, number);
    fmpq_clear(number);
    return status;
}

static lb_status split(const expression_graph *g, expression e, int column, shares *into)
{
    tasks t = {0};
    lb_status status = LB_OK;
    fmpq_t one;
    fmpq_init(one);
    fmpq_one(one);
    push(&t, e, one);
    fmpq_clear(one);
    while (t.depth > 0) {
        task top = t.stack[--t.depth];
        double value;
        if (status == LB_OK && !t.failed) {
            if (expression_is_number(g, top.e, &value))
                status = add_number(into, column, &top.factor, value);
            else if (t.visited++ >= SPLIT_LIMIT || !split_node(&t, g, top.e, &top.factor))
                status = add_share(into, top.e, column, &top.factor);
        }
        fmpq_clear(&top.factor);
    }
    memory_free(t.stack);
    return t.failed ? LB_E_NOMEM : status;
}

/* ---- Equations --------------------------------------------------------------------- */

static int by_part_and_column(const void *a, const void *b)
{
    const share *left = a, *right = b;
    if (left->part != right->part)
        return left->part < right->part ? -1 : 1;
    return (left->column > right->column) - (left->column < right->column);
}

/* Adds up shares of one part and column; sorted afterwards. */
static void merge_shares(shares *s)
{
    if (s->count == 0)
        return;
    qsort(s->list, s->count, sizeof *s->list, by_part_and_column);
    size_t last = 0;
    for (size_t i = 1; i < s->count; i++) {
        if (by_part_and_column(&s->list[last], &s->list[i]) == 0) {
            fmpq_add(&s->list[last].value, &s->list[last].value, &s->list[i].value);
            fmpq_clear(&s->list[i].value);
        } else {
            s->list[++last] = s->list[i];
        }
    }
    s->count = last + 1;
}

static lb_status add_entry(balance *b, int column, const fmpq *value, const fmpz *scale)
{
    size_t at = b->start[b->count];
    if (memory_grow(&b->column, &b->column_capacity, at, sizeof *b->column) != 0 ||
        memory_grow(&b->value, &b->value_capacity, at, sizeof *b->value) != 0)
        return LB_E_NOMEM;
    b->column[at] = column;
    fmpz_init(&b->value[at]);
    fmpz_divexact(&b->value[at], scale, fmpq_denref(value));
    fmpz_mul(&b->value[at], &b->value[at], fmpq_numref(value));
    b->start[b->count]++;
    return LB_OK;
}

/* One equation from shares [first, last) of one part, cleared of denominators; start[count]
 * is the end of the one being written. */
static lb_status add_equation(balance *b, const shares *s, size_t first, size_t last)
{
    if (memory_grow(&b->start, &b->start_capacity, b->count + 1, sizeof *b->start) != 0)
        return LB_E_NOMEM;
    b->start[b->count + 1] = b->start[b->count];
    b->count++;
    lb_status status = LB_OK;
    fmpz_t scale;
    fmpz_init(scale);
    fmpz_one(scale);
    for (size_t i = first; i < last; i++)
        fmpz_lcm(scale, scale, fmpq_denref(&s->list[i].value));
    for (size_t i = first; i < last && status == LB_OK; i++)
        if (!fmpq_is_zero(&s->list[i].value))
            status = add_entry(b, s->list[i].column, &s->list[i].value, scale);
    fmpz_clear(scale);
    return status;
}

static lb_status add_step(balance *b, const lb_network *net, const network_step *step, const int *column_of,
                          shares *s)
{
    lb_status status = LB_OK;
    for (int i = 0; i < step->entry_count && status == LB_OK; i++) {
        const network_entry *entry = &step->entries[i];
        int column = column_of[entry->state];
        if (column < 0)
            continue;
        if (entry->expression != EXPRESSION_NONE) {
            status = split(&net->graph, entry->expression, column, s);
            continue;
        }
        fmpq_t value;
        fmpq_init(value);
        fmpq_set_si(value, entry->num, (ulong)entry->den);
        status = add_share(s, EXPRESSION_NONE, column, value);
        fmpq_clear(value);
    }
    merge_shares(s);
    for (size_t first = 0, last; first < s->count && status == LB_OK; first = last) {
        for (last = first + 1; last < s->count && s->list[last].part == s->list[first].part;)
            last++;
        status = add_equation(b, s, first, last);
    }
    clear_shares(s);
    return status;
}

static bool is_reverse_of_used(const lb_network *net, int s, const bool *use)
{
    const network_step *step = &net->steps[s];
    return step->direction == STEP_REVERSE && s > 0 && net->steps[s - 1].reaction == step->reaction &&
           net->steps[s - 1].direction == STEP_FORWARD && (!use || use[s - 1]);
}

lb_status balance_collect(const lb_network *net, const int *column_of, const bool *use, balance *out)
{
    *out = (balance){0};
    if (memory_grow(&out->start, &out->start_capacity, 0, sizeof *out->start) != 0)
        return LB_E_NOMEM;
    out->start[0] = 0;
    shares s = {0};
    lb_status status = LB_OK;
    for (int i = 0; i < net->step_count && status == LB_OK; i++)
        if ((!use || use[i]) && !is_reverse_of_used(net, i, use))
            status = add_step(out, net, &net->steps[i], column_of, &s);
    memory_free(s.list);
    return status;
}

void balance_clear(balance *b)
{
    for (size_t i = 0; b->start && i < b->start[b->count]; i++)
        fmpz_clear(&b->value[i]);
    memory_free(b->start);
    memory_free(b->column);
    memory_free(b->value);
    *b = (balance){0};
}
