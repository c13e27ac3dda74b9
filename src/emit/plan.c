/* Layout of one emitted function.
 *
 * A node becomes a local when it is a definition of the file, when it is used
 * more than once and costs more than one operation, when a power repeats it, or when
 * the text of its user would nest or grow beyond what compilers and readers like.
 * Everything else is written where it is used, so the text is linear in the size of
 * the graph.
 *
 * Terms are taken in network order and cut at the boundary of a step before a
 * block gets more than PLAN_STATEMENTS statements (items, sums and the locals
 * that they are first to use).  A local that one block needs lives there; what
 * more blocks need is computed before them into one array.  All walks are loops
 * over node numbers: operands have smaller numbers than their users. */
#include "emit/plan.h"

#include <limits.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"

enum { DEEPEST = 24, LONGEST = 40, DEAR = 20 };

/* Scratch of plan_make. */
struct work {
    const expression_graph *graph;
    const unsigned char *is_defined;
    int *uses;               /* [nodes] places where the node is written */
    unsigned char *is_base;  /* [nodes] of a power that repeats it: (1 + x)*(1 + x) */
    int *first;              /* [nodes] first item that needs the node */
    unsigned char *cost, *depth, *size; /* [nodes] of its text */
    int *item_locals;        /* [items] locals that this item is first to need */
    int *item_block, *target_block; /* block that has the item, the target already */
};

void plan_clear(plan *p)
{
    memory_free(p->is_local);
    memory_free(p->home);
    memory_free(p->number);
    memory_free(p->block_start);
    memory_free(p->local_start);
    memory_free(p->locals);
    memory_free(p->shared);
    memory_free(p->target_id);
    memset(p, 0, sizeof *p);
}

static void work_clear(struct work *w)
{
    memory_free(w->uses);
    memory_free(w->is_base);
    memory_free(w->first);
    memory_free(w->cost);
    memory_free(w->depth);
    memory_free(w->size);
    memory_free(w->item_locals);
    memory_free(w->item_block);
    memory_free(w->target_block);
}

static int *filled(size_t count, int value)
{
    int *array = memory_array(count, sizeof *array);
    for (size_t i = 0; array && i < count; i++)
        array[i] = value;
    return array;
}

static lb_status allocate(plan *p, struct work *w)
{
    size_t items = p->sums->item_count, terms = p->sums->term_count;
    p->is_local = memory_zeroed(p->nodes, 1);
    p->home = filled(p->nodes, PLAN_NOWHERE);
    p->number = memory_zeroed(p->nodes, sizeof(int));
    p->block_start = memory_zeroed(terms + 2, sizeof(size_t));
    p->target_id = memory_zeroed(terms, sizeof(size_t));
    w->uses = memory_zeroed(p->nodes, sizeof(int));
    w->is_base = memory_zeroed(p->nodes, 1);
    w->first = filled(p->nodes, INT_MAX);
    w->cost = memory_zeroed(p->nodes, 1);
    w->depth = memory_zeroed(p->nodes, 1);
    w->size = memory_zeroed(p->nodes, 1);
    w->item_locals = memory_zeroed(items, sizeof(int));
    w->item_block = filled(items, -1);
    w->target_block = filled(terms, -1);
    bool ok = p->is_local && p->home && p->number && p->block_start && p->target_id && w->uses && w->is_base && w->first &&
              w->cost && w->depth && w->size && w->item_locals && w->item_block && w->target_block;
    return ok ? LB_OK : LB_E_NOMEM;
}

/* ---- Which nodes are locals ------------------------------------------------- */

static bool is_leaf(const expression_node *node)
{
    return node->kind <= EXPRESSION_STATE;
}

static void use(struct work *w, expression e, int item)
{
    if (e == EXPRESSION_NONE)
        return;
    if (w->uses[e] < INT_MAX)
        w->uses[e]++;
    if (item < w->first[e])
        w->first[e] = item;
}

/* How often the text of a power repeats its base: x^3 is x*x*x. */
static int repeats(const expression_graph *g, const expression_node *node)
{
    double order;
    bool is_whole = node->kind == EXPRESSION_POWER && expression_is_number(g, node->right, &order) &&
                    order == floor(order) && order != 0 && fabs(order) <= PLAN_POWER_IN_PLACE;
    return is_whole ? (int)fabs(order) : 1;
}

static void count_uses(const plan *p, struct work *w)
{
    const sums *s = p->sums;
    for (size_t i = 0; i < s->item_count; i++)
        use(w, s->items[i].value, (int)i);
    for (size_t i = 0; i < s->term_count; i++)
        use(w, s->terms[i].coefficient, s->terms[i].item);
    for (size_t e = p->nodes; e-- > 0;) {
        const expression_node *node = &w->graph->nodes[e];
        if (w->uses[e] == 0 || is_leaf(node))
            continue;
        use(w, node->left, w->first[e]);
        if (node->right >= 0)
            use(w, node->right, w->first[e]);
        w->is_base[node->left] |= repeats(w->graph, node) > 1;
    }
}

/* Operations of the node alone, roughly in multiplications. */
static int own_cost(const expression_graph *g, const expression_node *node)
{
    double order;
    switch (node->kind) {
    case EXPRESSION_NUMBER: case EXPRESSION_CONSTANT: case EXPRESSION_STATE: case EXPRESSION_NEGATE:
        return 0;
    case EXPRESSION_ADD: case EXPRESSION_SUBTRACT: case EXPRESSION_MULTIPLY:
        return 1;
    case EXPRESSION_DIVIDE:
        return 2;
    case EXPRESSION_POWER:
        if (expression_is_number(g, node->right, &order) && (order == 2 || order == 3))
            return (int)order - 1;
        return DEAR;
    default:
        return DEAR;
    }
}

static unsigned char at_most_255(int value)
{
    return (unsigned char)(value < 255 ? value : 255);
}

static void choose_locals(const plan *p, struct work *w)
{
    for (size_t e = 0; e < p->nodes; e++) {
        const expression_node *node = &w->graph->nodes[e];
        w->size[e] = 1;
        if (w->uses[e] == 0 || is_leaf(node))
            continue;
        int right = node->right >= 0 ? node->right : node->left;
        int depth = 1 + (w->depth[node->left] > w->depth[right] ? w->depth[node->left] : w->depth[right]);
        int size = repeats(w->graph, node) * w->size[node->left] + (node->right >= 0 ? w->size[right] : 0);
        int cost = own_cost(w->graph, node) + w->cost[node->left] + (node->right >= 0 ? w->cost[right] : 0);
        bool is_again = (w->uses[e] > 1 && cost > 1) || (w->is_base[e] && cost > 0);
        bool is_worth_it = is_again || depth > DEEPEST || size > LONGEST;
        if (is_worth_it || w->is_defined[e]) {
            p->is_local[e] = 1;
            w->item_locals[w->first[e]]++;
        } else {
            w->depth[e] = at_most_255(depth);
            w->size[e] = at_most_255(size);
            w->cost[e] = at_most_255(cost);
        }
    }
}

/* ---- Blocks -------------------------------------------------------------------- */

struct keyed {
    size_t target, term;
};

static int by_target(const void *a, const void *b)
{
    const struct keyed *left = a, *right = b;
    return (left->target > right->target) - (left->target < right->target);
}

static lb_status number_targets(plan *p)
{
    const sums *s = p->sums;
    struct keyed *order = memory_array(s->term_count, sizeof *order);
    if (!order)
        return LB_E_NOMEM;
    for (size_t i = 0; i < s->term_count; i++)
        order[i] = (struct keyed){s->terms[i].target, i};
    qsort(order, s->term_count, sizeof *order, by_target);
    for (size_t i = 0; i < s->term_count; i++) {
        if (i > 0 && order[i].target != order[i - 1].target)
            p->distinct++;
        p->target_id[order[i].term] = p->distinct;
    }
    p->distinct += s->term_count > 0;
    memory_free(order);
    return LB_OK;
}

static bool is_statement(const plan *p, const struct work *w, int item)
{
    const sums_item *it = &p->sums->items[item];
    return !it->is_inline && !is_leaf(&w->graph->nodes[it->value]) && !p->is_local[it->value];
}

/* Statements that the term adds to the block, which from then on has its item
 * and its target. */
static int enter(const plan *p, struct work *w, size_t term, int block)
{
    int item = p->sums->terms[term].item, added = 0;
    if (item >= 0 && w->item_block[item] != block) {
        bool is_first = w->item_block[item] < 0;
        w->item_block[item] = block;
        added += is_statement(p, w, item) + (is_first ? w->item_locals[item] : 0);
    }
    int *target = &w->target_block[p->target_id[term]];
    if (*target != block) {
        *target = block;
        added++;
    }
    return added;
}

/* An upper bound of what the terms of one step add to a block that has none of
 * its items; *end is the step's last term plus one. */
static int step_weight(const plan *p, const struct work *w, size_t term, int block, size_t *end)
{
    const sums *s = p->sums;
    int weight = 0, previous = -1;
    int step = s->terms[term].item >= 0 ? s->items[s->terms[term].item].step : -1;
    size_t i = term;
    for (; i < s->term_count && weight <= PLAN_STATEMENTS; i++) {
        int item = s->terms[i].item;
        if ((item >= 0 ? s->items[item].step : -1) != step || (item < 0 && i > term))
            break;
        if (item >= 0 && item != previous)
            weight += is_statement(p, w, item) + w->item_locals[item];
        weight += w->target_block[p->target_id[i]] != block;
        previous = item;
    }
    *end = i;
    return weight;
}

static void cut_blocks(plan *p, struct work *w)
{
    int statements = 0, block = 0;
    size_t boundary = 0;
    for (size_t i = 0; i < p->sums->term_count; i++) {
        bool is_full = statements >= PLAN_STATEMENTS;
        if (i == boundary)
            is_full = step_weight(p, w, i, block, &boundary) + statements > PLAN_STATEMENTS;
        if (is_full && statements > 0) {
            p->block_start[++block] = i;
            statements = 0;
        }
        statements += enter(p, w, i, block);
    }
    p->blocks = block + 1;
    p->block_start[p->blocks] = p->sums->term_count;
}

/* ---- Where locals live ------------------------------------------------------------ */

static void settle(plan *p, expression e, int block)
{
    if (e == EXPRESSION_NONE)
        return;
    p->home[e] = p->home[e] == PLAN_NOWHERE || p->home[e] == block ? block : PLAN_SHARED;
}

static void find_homes(plan *p, const expression_graph *g)
{
    for (int b = 0; b < p->blocks; b++) {
        for (size_t i = p->block_start[b]; i < p->block_start[b + 1]; i++) {
            const sums_term *term = &p->sums->terms[i];
            if (term->item >= 0)
                settle(p, p->sums->items[term->item].value, b);
            settle(p, term->coefficient, b);
        }
    }
    for (size_t e = p->nodes; e-- > 0;) {
        const expression_node *node = &g->nodes[e];
        if (p->home[e] == PLAN_NOWHERE || is_leaf(node))
            continue;
        settle(p, node->left, p->home[e]);
        if (node->right >= 0)
            settle(p, node->right, p->home[e]);
    }
}

/* A rate law so large that its locals alone overfill a block has them computed
 * before, in functions of their own. */
static void move_crowds(plan *p, const int *crowd)
{
    for (size_t e = 0; e < p->nodes; e++)
        if (p->is_local[e] && p->home[e] >= 0 && crowd[p->home[e]] > PLAN_STATEMENTS)
            p->home[e] = PLAN_SHARED;
}

static void count_locals(const plan *p, int *count)
{
    memset(count, 0, ((size_t)p->blocks + 1) * sizeof *count);
    for (size_t e = 0; e < p->nodes; e++)
        if (p->is_local[e] && p->home[e] >= 0)
            count[p->home[e] + 1]++;
}

static lb_status list_locals(plan *p)
{
    size_t locals = 0;
    for (size_t e = 0; e < p->nodes; e++)
        locals += p->is_local[e] && p->home[e] != PLAN_NOWHERE;
    p->local_start = memory_zeroed((size_t)p->blocks + 1, sizeof(int));
    p->locals = memory_array(locals, sizeof(int));
    p->shared = memory_array(locals, sizeof(int));
    if (!p->local_start || !p->locals || !p->shared)
        return LB_E_NOMEM;
    count_locals(p, p->local_start);
    move_crowds(p, p->local_start + 1);
    count_locals(p, p->local_start);
    for (int b = 0; b < p->blocks; b++)
        p->local_start[b + 1] += p->local_start[b];
    return LB_OK;
}

/* Numbers within each block, by a cursor per block. */
static lb_status number_locals(plan *p)
{
    int *next = memory_zeroed((size_t)p->blocks, sizeof *next);
    if (!next)
        return LB_E_NOMEM;
    for (size_t e = 0; e < p->nodes; e++) {
        if (!p->is_local[e] || p->home[e] == PLAN_NOWHERE)
            continue;
        int block = p->home[e];
        if (block == PLAN_SHARED) {
            p->number[e] = p->shared_count;
            p->shared[p->shared_count++] = (int)e;
        } else {
            p->locals[p->local_start[block] + next[block]] = (int)e;
            p->number[e] = ++next[block];
        }
    }
    memory_free(next);
    return LB_OK;
}

/* All locals into the array. */
static void share_locals(plan *p, const int *uses)
{
    for (size_t e = 0; e < p->nodes; e++)
        if (p->is_local[e] && uses[e] > 0)
            p->home[e] = PLAN_SHARED;
}

lb_status plan_make(const expression_graph *graph, const sums *s, const unsigned char *is_defined, bool is_table,
                    plan *p)
{
    struct work w = {.graph = graph, .is_defined = is_defined};
    memset(p, 0, sizeof *p);
    p->sums = s;
    p->nodes = graph->count;
    lb_status status = allocate(p, &w);
    if (status == LB_OK) {
        count_uses(p, &w);
        choose_locals(p, &w);
        status = number_targets(p);
    }
    if (status == LB_OK) {
        cut_blocks(p, &w);
        if (is_table)
            share_locals(p, w.uses);
        else
            find_homes(p, graph);
        status = list_locals(p);
    }
    if (status == LB_OK)
        status = number_locals(p);
    work_clear(&w);
    return status;
}
