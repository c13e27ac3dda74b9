/* From sums to tables.
 *
 * A rate of mass action, and its derivatives, are products of constants and
 * concentrations; whatever else stands in a product is an expression computed
 * before the loops, as one more factor.  A coefficient that is an expression
 * becomes part of the product, the numbers of a product part of the weights of its
 * terms, and a weight makes a slot of its own of the product's multiple, so that adding
 * a term is one addition.  Products keep the order of the network, and so do the terms of each sum.
 *
 * Products come in batches.  The factors of a batch are flat lists of (slot, index),
 * so that the loops over them do not depend on how many factors a product has. */
#include "emit/products.h"

#include <limits.h>
#include <math.h>
#include <string.h>

#include "base/memory.h"

enum { MOST_FACTORS = 12, MOST_PARTS = 32 };

/* Numbers are moved into the weights while these stay far from overflow. */
static const double LARGEST_NUMBER = 1e100;

/* One product, taken apart. */
struct parts {
    double number;
    int count;
    struct { products_kind kind; int index; } factor[MOST_FACTORS];
};

struct work {
    const expression_graph *graph;
    bool (*is_defined)(const void *context, expression e);
    const void *context;
};

void products_clear(products *p)
{
    for (int kind = 0; kind < PRODUCTS_KINDS; kind++) {
        for (int round = 0; round < p->factors[kind].rounds; round++)
            memory_free(p->factors[kind].round[round]);
        memory_free(p->factors[kind].index);
        memory_free(p->factors[kind].slot);
        memory_free(p->factors[kind].end);
    }
    memory_free(p->terms);
    memory_free(p->term_end);
    memory_free(p->multiples);
    memory_free(p->multiple_end);
    sums_clear(&p->shared);
    memset(p, 0, sizeof *p);
}

/* ---- Taking a product apart -------------------------------------------------- */

static bool add_factor(struct parts *parts, products_kind kind, int index, int times)
{
    if (parts->count + times > MOST_FACTORS)
        return false;
    for (int i = 0; i < times; i++) {
        parts->factor[parts->count].kind = kind;
        parts->factor[parts->count++].index = index;
    }
    return true;
}

static bool is_leaf(const expression_node *node)
{
    return node->kind <= EXPRESSION_STATE;
}

/* x^2, x^3, x^4 of a leaf: how often it is a factor; 0 of anything else. */
static int small_power(const struct work *w, const expression_node *node)
{
    double order;
    bool is_small = node->kind == EXPRESSION_POWER && w->graph->nodes[node->left].kind != EXPRESSION_NUMBER &&
                    is_leaf(&w->graph->nodes[node->left]) && expression_is_number(w->graph, node->right, &order) &&
                    (order == 2 || order == 3 || order == 4);
    return is_small ? (int)order : 0;
}

/* A factor that is no product itself; false when there are too many, or the number is too large. */
static bool add_part(const struct work *w, expression e, struct parts *parts)
{
    const expression_node *node = &w->graph->nodes[e];
    int times = small_power(w, node);
    if (times > 0) {
        node = &w->graph->nodes[node->left];
        e = -1;
    }
    if (node->kind == EXPRESSION_NUMBER) {
        parts->number *= node->value;
        double size = fabs(parts->number);
        return size == 0 || (size <= LARGEST_NUMBER && size >= 1 / LARGEST_NUMBER);
    }
    if (is_leaf(node))
        return add_factor(parts, node->kind == EXPRESSION_CONSTANT ? PRODUCTS_K : PRODUCTS_X, node->left,
                          times > 0 ? times : 1);
    return add_factor(parts, PRODUCTS_C, e, 1);
}

/* Factors from left to right; false when they are too many for the tables. */
static bool take_apart(const struct work *w, expression e, struct parts *parts)
{
    expression stack[MOST_PARTS];
    int depth = 0;
    *parts = (struct parts){.number = 1};
    stack[depth++] = e;
    while (depth > 0) {
        expression top = stack[--depth];
        const expression_node *node = &w->graph->nodes[top];
        bool is_whole = w->is_defined(w->context, top);
        if (!is_whole && node->kind == EXPRESSION_MULTIPLY) {
            if (depth + 2 > MOST_PARTS)
                return false;
            stack[depth++] = node->right;
            stack[depth++] = node->left;
        } else if (!is_whole && node->kind == EXPRESSION_NEGATE) {
            parts->number = -parts->number;
            stack[depth++] = node->left;
        } else if (is_whole && !is_leaf(node)) {
            if (!add_factor(parts, PRODUCTS_C, top, 1))
                return false;
        } else if (!add_part(w, top, parts)) {
            return false;
        }
    }
    return true;
}

/* What cannot be taken apart is one shared expression; a number is none. */
static void find_parts(const struct work *w, expression e, struct parts *parts)
{
    if (take_apart(w, e, parts))
        return;
    const expression_node *node = &w->graph->nodes[e];
    *parts = (struct parts){.number = 1};
    if (node->kind == EXPRESSION_NUMBER)
        parts->number = node->value;
    else
        add_factor(parts, PRODUCTS_C, e, 1);
}

/* ---- Lists --------------------------------------------------------------------- */

static lb_status append_factor(products *p, products_kind kind, unsigned char slot, int index)
{
    products_factors *f = &p->factors[kind];
    if (f->count == INT_MAX)
        return LB_E_LIMIT;
    if (memory_grow(&f->index, &f->capacity, f->count, sizeof *f->index) != 0 ||
        memory_grow(&f->slot, &f->slot_capacity, f->count, 1) != 0)
        return LB_E_NOMEM;
    f->index[f->count] = index;
    f->slot[f->count++] = slot;
    if (kind != PRODUCTS_C)
        return LB_OK;
    sums *shared = &p->shared;
    if (memory_grow(&shared->items, &shared->item_capacity, shared->item_count, sizeof *shared->items) != 0)
        return LB_E_NOMEM;
    shared->items[shared->item_count++] = (sums_item){.value = index, .step = -1, .by = -1};
    return LB_OK;
}

static lb_status append_product(products *p, const struct parts *parts)
{
    unsigned char slot = (unsigned char)(p->items++ % PRODUCTS_BATCH);
    lb_status status = LB_OK;
    for (int i = 0; status == LB_OK && i < parts->count; i++)
        status = append_factor(p, parts->factor[i].kind, slot, parts->factor[i].index);
    return status;
}

/* Slot of a multiple of the last product. */
static lb_status find_multiple(products *p, double weight, unsigned *slot)
{
    size_t batch = (p->items - 1) / PRODUCTS_BATCH, first = batch > 0 ? p->multiple_end[batch - 1] : 0;
    products_multiple wanted = {(unsigned char)((p->items - 1) % PRODUCTS_BATCH), weight};
    size_t at = p->multiple_count;
    while (at > first && p->multiples[at - 1].slot == wanted.slot && p->multiples[at - 1].weight != weight)
        at--;
    bool is_known = at > first && p->multiples[at - 1].slot == wanted.slot;
    if (!is_known) {
        if (memory_grow(&p->multiples, &p->multiple_capacity, p->multiple_count, sizeof wanted) != 0)
            return LB_E_NOMEM;
        p->multiples[p->multiple_count++] = wanted;
        at = p->multiple_count;
    }
    *slot = (unsigned)(2 * PRODUCTS_BATCH + (at - 1 - first));
    return LB_OK;
}

static lb_status append_term(products *p, size_t target, double weight)
{
    unsigned slot = (unsigned)((p->items - 1) % PRODUCTS_BATCH);
    if (weight == -1)
        slot += PRODUCTS_BATCH;
    else if (weight != 1 && find_multiple(p, weight, &slot) != LB_OK)
        return LB_E_NOMEM;
    if (memory_grow(&p->terms, &p->term_capacity, p->term_count, sizeof *p->terms) != 0)
        return LB_E_NOMEM;
    p->has_negatives = p->has_negatives || weight == -1;
    p->slots = slot >= p->slots ? slot + 1 : p->slots;
    p->terms[p->term_count++] = (products_term){target, slot};
    return LB_OK;
}

static void end_batch(products *p)
{
    size_t batch = (p->items - 1) / PRODUCTS_BATCH;
    for (int kind = 0; kind < PRODUCTS_KINDS; kind++)
        p->factors[kind].end[batch] = p->factors[kind].count;
    p->term_end[batch] = p->term_count;
    p->multiple_end[batch] = p->multiple_count;
}

/* Each term at most makes one product. */
static lb_status allocate(products *p, size_t terms)
{
    size_t batches = terms / PRODUCTS_BATCH + 1;
    p->term_end = memory_zeroed(batches, sizeof *p->term_end);
    p->multiple_end = memory_zeroed(batches, sizeof *p->multiple_end);
    bool ok = p->term_end && p->multiple_end;
    for (int kind = 0; kind < PRODUCTS_KINDS; kind++) {
        p->factors[kind].end = memory_zeroed(batches, sizeof(size_t));
        ok = ok && p->factors[kind].end;
    }
    return ok ? LB_OK : LB_E_NOMEM;
}

static lb_status append_all(const sums *s, expression_graph *graph, struct work *w, products *p)
{
    int item = -1;
    expression coefficient = EXPRESSION_NONE;
    struct parts parts = {.number = 1};
    for (size_t i = 0; i < s->term_count; i++) {
        const sums_term *term = &s->terms[i];
        if (term->item < 0)
            continue;
        if (term->item != item || term->coefficient != coefficient) {
            expression value = s->items[term->item].value;
            if (term->coefficient != EXPRESSION_NONE)
                value = expression_binary(graph, EXPRESSION_MULTIPLY, term->coefficient, value);
            if (value == EXPRESSION_NONE)
                return LB_E_NOMEM;
            find_parts(w, value, &parts);
            lb_status status = append_product(p, &parts);
            if (status != LB_OK)
                return status;
            item = term->item;
            coefficient = term->coefficient;
        }
        if (append_term(p, term->target, term->number * parts.number) != LB_OK)
            return LB_E_NOMEM;
        end_batch(p);
    }
    return LB_OK;
}

/* ---- Kinds that every product has ------------------------------------------------- */

/* Does each product have a factor of the kind?  Slots of one batch ascend. */
static bool is_in_each(const products *p, const products_factors *f)
{
    size_t next = 0;   /* product that must come */
    for (size_t b = 0, at = 0; b < p->batches; b++)
        for (; at < f->end[b]; at++) {
            size_t product = b * PRODUCTS_BATCH + f->slot[at];
            if (product > next)
                return false;
            next += product == next;
        }
    return next == p->items;
}

/* Take the first factor of each product out of the list. */
static lb_status take_round(products *p, products_factors *f)
{
    int *round = memory_array(p->items, sizeof *round);
    if (!round)
        return LB_E_NOMEM;
    f->round[f->rounds++] = round;
    size_t kept = 0, next = 0, at = 0;
    for (size_t b = 0; b < p->batches; b++) {
        for (; at < f->end[b]; at++) {
            if (b * PRODUCTS_BATCH + f->slot[at] == next) {
                round[next++] = f->index[at];
            } else {
                f->index[kept] = f->index[at];
                f->slot[kept++] = f->slot[at];
            }
        }
        f->end[b] = kept;
    }
    f->count = kept;
    return LB_OK;
}

static lb_status take_rounds(products *p, products_factors *f)
{
    lb_status status = LB_OK;
    while (status == LB_OK && p->items > 0 && f->rounds < PRODUCTS_ROUNDS && is_in_each(p, f))
        status = take_round(p, f);
    return status;
}

/* ---- Terms ---------------------------------------------------------------------------------- */

static bool is_direct(const products *p)
{
    for (size_t i = 0; i < p->term_count; i++)
        if (p->terms[i].target != i || p->terms[i].slot != i % PRODUCTS_BATCH)
            return false;
    return p->term_count == p->items;
}

static void finish_terms(products *p)
{
    size_t least = p->has_negatives ? 2 * PRODUCTS_BATCH : PRODUCTS_BATCH;
    p->is_direct = is_direct(p);
    p->slots = p->slots > least ? p->slots : least;
}

lb_status products_make(const sums *s, expression_graph *graph,
                        bool (*is_defined)(const void *context, expression e), const void *context, products *p)
{
    struct work w = {graph, is_defined, context};
    memset(p, 0, sizeof *p);
    if (s->term_count > INT_MAX)
        return LB_E_LIMIT;
    lb_status status = allocate(p, s->term_count);
    if (status == LB_OK)
        status = append_all(s, graph, &w, p);
    p->batches = (p->items + PRODUCTS_BATCH - 1) / PRODUCTS_BATCH;
    for (int kind = 0; status == LB_OK && kind < PRODUCTS_KINDS; kind++)
        status = take_rounds(p, &p->factors[kind]);
    finish_terms(p);
    return status;
}
