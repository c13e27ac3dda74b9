/* The text of a .mech file that runs on a cycle.
 *
 * The user's own text stays as it is, comments included; only numbers change.  The
 * syntax tree of the text says where each constant and each initial value stands.
 * What the text itself says is found by reading it again, so that values which came
 * from settings are written too.  Edits are byte ranges, applied in one sweep. */
#include "analysis/witness.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "base/status.h"
#include "text/source.h"
#include "text/syntax.h"
#include "text/utf8.h"

enum {
    NAME_LIMIT = 1024,            /* bytes of a constant's name that are looked for */
    PLAIN_DEPTH = 16              /* of the tree of a number with its unit */
};

typedef struct edit {
    size_t start, end;            /* bytes of the source that go */
    char text[256];               /* what comes instead */
} edit;

typedef struct writer {
    const lb_network *net;
    const lb_network *plain;      /* the text read without settings; NULL when it cannot be */
    const double *k, *x;
    lb_diagnostics *diagnostics;
    const source *source;
    edit *edits;
    size_t count, capacity;
    bool *is_written;             /* [n] initial values that have a place in the text */
} writer;

/* The shortest of 15 to 17 digits that reads back as the same number. */
static void write_number(double value, char *out, size_t size)
{
    for (int digits = 15; digits <= 17; digits++) {
        snprintf(out, size, "%.*g", digits, value);
        if (strtod(out, NULL) == value)
            return;
    }
}

/* ---- Places in the text ------------------------------------------------------------ */

static size_t offset_of(const writer *w, int line, int column)
{
    const char *start = source_text(w->source);
    size_t length = 0, at = 0;
    uint32_t code;
    source_line(w->source, line, &start, &length);
    for (int c = 1; c < column && at < length; c++) {
        int bytes = utf8_decode(start + at, length - at, &code);
        at += bytes > 0 ? (size_t)bytes : 1;
    }
    return (size_t)(start - source_text(w->source)) + at;
}

/* Last node of an expression in reading order.  Sums lean left, so the way down is
 * short. */
static const syntax_expression *last_node(const syntax_expression *e)
{
    for (;;) {
        if (e->right)
            e = e->right;
        else if (e->left)
            e = e->left;
        else if (e->first) {
            const syntax_argument *a = e->first;
            while (a->next)
                a = a->next;
            e = a->value;
        } else
            return e;
    }
}

static size_t end_of(const writer *w, const syntax_expression *e)
{
    const syntax_expression *last = last_node(e);
    if (last->where.line == e->where.line)
        return offset_of(w, e->where.line, e->where.column + e->where.length);
    size_t end = offset_of(w, last->where.line, last->where.column + last->where.length);
    const char *text = source_text(w->source);
    while (text[end] == ')' || text[end] == ' ')
        end++;
    return end;
}

static size_t end_of_range(const writer *w, const syntax_range *range)
{
    return end_of(w, range->is_factor ? range->low : range->high);
}

static lb_status add_edit(writer *w, size_t start, size_t end, const char *text)
{
    if (memory_grow(&w->edits, &w->capacity, w->count, sizeof *w->edits) != 0)
        return LB_E_NOMEM;
    edit *e = &w->edits[w->count++];
    e->start = start;
    e->end = end;
    snprintf(e->text, sizeof e->text, "%s", text);
    return LB_OK;
}

/* ---- Constants ------------------------------------------------------------------------ */

static bool has_unit(const syntax_expression *e)
{
    return e->kind != SYNTAX_NUMBER && !(e->kind == SYNTAX_NEGATE && e->left->kind == SYNTAX_NUMBER);
}

/* A number with its unit is a small tree without a function in it. */
static bool has_call(const syntax_expression *e)
{
    return e && (e->kind == SYNTAX_CALL || has_call(e->left) || has_call(e->right));
}

static bool may_be_plain(const syntax_expression *e)
{
    return e->depth <= PLAIN_DEPTH && !has_call(e);
}

/* Replace the number `value` of constant i where it differs from the text's.  Its range
 * is written anew, since ends without a unit take the value's; one that does not hold
 * the new value goes. */
static lb_status edit_constant(writer *w, int i, const syntax_expression *value, const syntax_range *range)
{
    if (w->plain && lb_network_default(w->plain, i) == w->k[i])
        return LB_OK;
    const network_constant *c = &w->net->constants[i];
    char number[32], low[32], high[32], text[256];
    bool has_own_unit = has_unit(value) && *c->unit;
    write_number(w->k[i], number, sizeof number);
    int length = snprintf(text, sizeof text, "%s%s%.80s", number, has_own_unit ? " " : "", has_own_unit ? c->unit : "");
    if (range && c->has_range && w->k[i] >= c->low && w->k[i] <= c->high) {
        write_number(c->low, low, sizeof low);
        write_number(c->high, high, sizeof high);
        snprintf(text + length, sizeof text - (size_t)length, " in %s .. %s", low, high);
    }
    return add_edit(w, offset_of(w, value->where.line, value->where.column),
                    range ? end_of_range(w, range) : end_of(w, value), text);
}

/* Named arguments inside an expression: constants called prefix.NAME.  Sums of many
 * terms are deep, so the walk keeps its own stack. */
static lb_status edit_arguments(writer *w, const char *prefix, const syntax_expression *root)
{
    const syntax_expression **stack = NULL;
    size_t count = 0, capacity = 0;
    char name[NAME_LIMIT];
    lb_status status = LB_OK;
    for (const syntax_expression *e = root; e && status == LB_OK; e = count > 0 ? stack[--count] : NULL) {
        if (memory_grow(&stack, &capacity, count, sizeof *stack) != 0 ||
            memory_grow(&stack, &capacity, count + 1, sizeof *stack) != 0) {
            status = LB_E_NOMEM;
            break;
        }
        for (const syntax_argument *a = e->first; a && status == LB_OK; a = a->next) {
            snprintf(name, sizeof name, "%s.%s", prefix, a->name ? a->name : "");
            int i = lb_network_find_constant(w->net, name);
            status = i >= 0 ? edit_constant(w, i, a->value, a->range) : edit_arguments(w, prefix, a->value);
        }
        if (e->left)
            stack[count++] = e->left;
        if (e->right)
            stack[count++] = e->right;
    }
    memory_free(stack);
    return status;
}

/* A value that is a constant called `name`, or has such inside it called prefix.NAME. */
static lb_status edit_value(writer *w, const char *name, const char *prefix, const syntax_expression *value,
                            const syntax_range *range)
{
    int i = may_be_plain(value) ? lb_network_find_constant(w->net, name) : -1;
    return i >= 0 ? edit_constant(w, i, value, range) : edit_arguments(w, prefix, value);
}

/* Numbers inside a reaction: LABEL.k, or LABEL.A of an argument in k or v, or
 * LABEL.kf.A of one elsewhere. */
static lb_status edit_settings(writer *w, const char *label, const syntax_argument *settings)
{
    char name[NAME_LIMIT];
    lb_status status = LB_OK;
    for (const syntax_argument *a = settings; a && status == LB_OK; a = a->next) {
        const char *slot = a->name ? a->name : "k";
        bool is_plain_slot = strcmp(slot, "k") == 0 || strcmp(slot, "v") == 0;
        snprintf(name, sizeof name, "%s.%s", label, slot);
        status = edit_value(w, name, is_plain_slot ? label : name, a->value, a->range);
    }
    return status;
}

/* ---- Initial values --------------------------------------------------------------------- */

static lb_status edit_initial(writer *w, const syntax_statement *s)
{
    int state = lb_network_find_state(w->net, s->text);
    char number[32];
    if (state < 0)
        return LB_OK;
    w->is_written[state] = true;
    write_number(w->x[state], number, sizeof number);
    return add_edit(w, offset_of(w, s->value->where.line, s->value->where.column),
                    s->range ? end_of_range(w, s->range) : end_of(w, s->value), number);
}

static lb_status edit_statement(writer *w, const syntax_statement *s, int *reaction)
{
    char name[NAME_LIMIT];
    switch (s->kind) {
    case SYNTAX_DEFINE_NAME:
        return edit_value(w, s->text, s->text, s->value, s->range);
    case SYNTAX_DEFINE_CONCENTRATION:
        snprintf(name, sizeof name, "[%s]", s->text);
        return edit_value(w, name, name, s->value, s->range);
    case SYNTAX_DEFINE_FEED:
        snprintf(name, sizeof name, "[%s]in", s->text);
        return edit_value(w, name, name, s->value, s->range);
    case SYNTAX_DEFINE_INITIAL:
        return edit_initial(w, s);
    case SYNTAX_REACTION:
        ++*reaction;
        return *reaction <= w->net->reaction_count
                   ? edit_settings(w, w->net->reactions[*reaction - 1].label, s->settings) : LB_OK;
    case SYNTAX_TITLE: case SYNTAX_UNITS: case SYNTAX_RETAINED: case SYNTAX_SIGNED: case SYNTAX_FORMULA:
        return LB_OK;
    }
    return LB_OK;
}

/* ---- The whole text ---------------------------------------------------------------------- */

static int by_start(const void *a, const void *b)
{
    const edit *x = a, *y = b;
    return (x->start > y->start) - (x->start < y->start);
}

static void write_head(const writer *w, const lb_cycle *cycle, bool is_centre, buffer *out)
{
    const char *time_unit = w->net->units.none ? "" : w->net->units.time_text;
    if (is_centre)
        buffer_printf(out, "# A centre: the closed orbit through the initial values below has the period %.10g%s%s,\n"
                      "# and so does, with a period of its own, every orbit near it.\n",
                      cycle->period, *time_unit ? " " : "", time_unit);
    else
        buffer_printf(out, "# An attracting cycle of period %.10g%s%s: the initial values below lie on it.\n",
                      cycle->period, *time_unit ? " " : "", time_unit);
    for (int i = 0; i < w->net->states; i++)
        if (isfinite(cycle->low[i]))
            buffer_printf(out, "#   [%s]  %.8g .. %.8g\n", w->net->species[w->net->state_species[i]].name,
                          cycle->low[i], cycle->high[i]);
    buffer_printf(out, "# Written by limbeck %s.\n\n", LB_VERSION);
}

static void write_body(writer *w, buffer *out)
{
    const char *text = source_text(w->source);
    size_t at = 0, length = source_length(w->source);
    char number[32];
    if (w->count > 1)
        qsort(w->edits, w->count, sizeof *w->edits, by_start);
    for (size_t i = 0; i < w->count; i++) {
        if (w->edits[i].start < at)
            continue;
        buffer_append_n(out, text + at, w->edits[i].start - at);
        buffer_append(out, w->edits[i].text);
        at = w->edits[i].end;
    }
    buffer_append_n(out, text + at, length - at);
    if (length > 0 && text[length - 1] != '\n')
        buffer_char(out, '\n');
    for (int i = 0; i < w->net->states; i++)
        if (!w->is_written[i] && w->x[i] != 0) {
            write_number(w->x[i], number, sizeof number);
            buffer_printf(out, "[%s]0 = %s\n", w->net->species[w->net->state_species[i]].name, number);
        }
}

static lb_status collect_edits(writer *w, const syntax_tree *tree)
{
    int reaction = 0;
    lb_status status = LB_OK;
    for (const syntax_statement *s = tree->first; s && status == LB_OK; s = s->next)
        status = edit_statement(w, s, &reaction);
    return status;
}

static lb_status read_again(writer *w, lb_network **plain, syntax_tree **tree)
{
    source *text = NULL;
    lb_diagnostics *list = NULL;
    const char *own = w->net->source;
    lb_status status = lb_network_parse("witness", own, strlen(own), NULL, 0, plain, &list, NULL);
    lb_diagnostics_free(list);
    if (status == LB_E_NOMEM)
        return status;
    w->plain = *plain;
    status = source_new("witness", own, strlen(own), &text);
    if (status == LB_OK)
        status = diagnostics_new(text, &w->diagnostics);
    if (status == LB_OK) {
        w->source = diagnostics_source(w->diagnostics);
        status = syntax_parse(w->diagnostics, tree);
    }
    return status;
}

lb_status witness_write(const lb_network *net, const double *k, const lb_cycle *cycle, bool is_centre,
                        char **out, lb_error *err)
{
    writer w = {.net = net, .k = k, .x = cycle->x};
    lb_network *plain = NULL;
    syntax_tree *tree = NULL;
    buffer text;
    buffer_init(&text);
    *out = NULL;
    if (!net->source)
        return LB_OK;
    w.is_written = memory_zeroed((size_t)net->states, sizeof *w.is_written);
    lb_status status = w.is_written ? read_again(&w, &plain, &tree) : LB_E_NOMEM;
    if (status == LB_OK)
        status = collect_edits(&w, tree);
    if (status == LB_OK) {
        write_head(&w, cycle, is_centre, &text);
        write_body(&w, &text);
        *out = buffer_take(&text);
        status = *out ? LB_OK : LB_E_NOMEM;
    }
    buffer_clear(&text);
    memory_free(w.edits);
    memory_free(w.is_written);
    syntax_free(tree);
    lb_diagnostics_free(w.diagnostics);
    lb_network_free(plain);
    return status == LB_OK ? LB_OK : status_raise(err, status, NULL, "%s", lb_status_text(status));
}
