/* Definitions sorted so that each comes after what it refers to.
 *
 * The references of all definitions are gathered once; a depth-first search
 * with a stack of its own (a chain of 10^5 definitions is no deeper than one)
 * gives the order and finds definitions that refer to themselves. */
#include <string.h>

#include "model/lower.h"

struct search {
    int *start;             /* [count+1] references of definition i: reference[start[i]..start[i+1]) */
    int *reference;         size_t references, capacity;
    unsigned char *state;   /* [count] WHITE, GREY, BLACK */
    int *path, *next;       /* stack: definition, and which reference comes next */
};

enum { WHITE, GREY, BLACK, SHOWN = 6 };

/* ---- References of an expression -------------------------------------------------------- */

struct walk {
    const syntax_expression **stack;
    size_t count, capacity;
};

static void push(lower *l, struct walk *w, const syntax_expression *node)
{
    if (!node)
        return;
    if (memory_grow(&w->stack, &w->capacity, w->count, sizeof *w->stack))
        lower_no_memory(l);
    else
        w->stack[w->count++] = node;
}

static int definition_of(const lower *l, const syntax_expression *node)
{
    int species;
    switch (node->kind) {
    case SYNTAX_NAME:
        return strcmp(node->text, "T") == 0 ? l->temperature : names_find(&l->definition_names, node->text);
    case SYNTAX_CONCENTRATION:
        species = lower_find_species(l, node->text);
        return species < 0 ? -1 : l->species[species].held;
    case SYNTAX_FEED:
        species = lower_find_species(l, node->text);
        return species < 0 ? -1 : l->species[species].feed;
    case SYNTAX_CALL:
        return strncmp(node->text, "arrhenius", 9) == 0 || strcmp(node->text, "eyring") == 0 ? l->temperature
                                                                                             : -1;
    default:
        return -1;
    }
}

static void gather(lower *l, struct search *g, struct walk *w, const syntax_expression *root)
{
    push(l, w, root);
    while (w->count > 0 && l->status == LB_OK) {
        const syntax_expression *node = w->stack[--w->count];
        int d = definition_of(l, node);
        if (d >= 0 && memory_grow(&g->reference, &g->capacity, g->references, sizeof *g->reference))
            lower_no_memory(l);
        else if (d >= 0)
            g->reference[g->references++] = d;
        push(l, w, node->right);
        push(l, w, node->left);
        for (const syntax_argument *a = node->kind == SYNTAX_CALL ? node->first : NULL; a; a = a->next)
            push(l, w, a->value);
    }
}

static void gather_all(lower *l, struct search *g)
{
    struct walk w = {.stack = NULL};
    for (size_t i = 0; i < l->definition_count && l->status == LB_OK; i++) {
        g->start[i] = (int)g->references;
        if (l->definitions[i].plain < 0 && l->definitions[i].statement)
            gather(l, g, &w, l->definitions[i].statement->value);
    }
    g->start[l->definition_count] = (int)g->references;
    memory_free(w.stack);
}

/* ---- The search --------------------------------------------------------------------------- */

/* path[from..depth] refers to itself. */
static void fault_cycle(lower *l, const struct search *g, int from, int depth)
{
    const lower_definition *first = &l->definitions[g->path[from]];
    buffer text;
    buffer_init(&text);
    for (int i = from; i <= depth && i < from + SHOWN; i++)
        buffer_printf(&text, "%s -> ", l->definitions[g->path[i]].name);
    if (depth - from >= SHOWN)
        buffer_append(&text, "... -> ");
    buffer_append(&text, first->name);
    if (depth == from)
        diagnostics_fault(l->list, first->statement->text_where, NULL,
                          "the definition of `%s` refers to itself", first->name);
    else
        diagnostics_fault(l->list, first->statement->text_where, NULL,
                          "the definition of `%s` refers to itself: %s", first->name, buffer_get(&text));
    if (buffer_status(&text) != LB_OK)
        lower_no_memory(l);
    buffer_clear(&text);
}

static void visit(lower *l, struct search *g, int root)
{
    int depth = 0;
    g->path[0] = root;
    g->next[0] = g->start[root];
    g->state[root] = GREY;
    while (depth >= 0) {
        int d = g->path[depth];
        if (g->next[depth] == g->start[d + 1]) {
            g->state[d] = BLACK;
            l->order[l->order_count++] = d;
            depth--;
            continue;
        }
        int other = g->reference[g->next[depth]++];
        if (g->state[other] == WHITE) {
            g->state[other] = GREY;
            g->path[++depth] = other;
            g->next[depth] = g->start[other];
        } else if (g->state[other] == GREY && lower_has_room(l)) {
            int from = depth;
            while (g->path[from] != other)
                from--;
            fault_cycle(l, g, from, depth);
        }
    }
}

void lower_order(lower *l)
{
    size_t count = l->definition_count;
    struct search g = {.start = memory_array(count + 1, sizeof(int)), .state = memory_zeroed(count, 1),
                       .path = memory_array(count, sizeof(int)), .next = memory_array(count, sizeof(int))};
    l->order = memory_array(count, sizeof(int));
    if (!g.start || !g.state || !g.path || !g.next || !l->order)
        lower_no_memory(l);
    else
        gather_all(l, &g);
    for (size_t i = 0; i < count && l->status == LB_OK; i++)
        if (g.state[i] == WHITE)
            visit(l, &g, (int)i);
    memory_free(g.start);
    memory_free(g.reference);
    memory_free(g.state);
    memory_free(g.path);
    memory_free(g.next);
}
