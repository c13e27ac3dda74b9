/* Lines of an emitted function: locals, rates, sums, and the comments beside them.
 *
 * A line goes to the listing of the file, code first, then its comment. */
#include "emit/statement.h"

#include <math.h>

#include "emit/spell.h"

enum { NAME_LIMIT = 60, EQUATION_LIMIT = 100 }; /* bytes of a text in a comment */

/* ---- Comments ------------------------------------------------------------------ */

void statement_comment_name(buffer *out, const char *name)
{
    spell_comment(out, name, NAME_LIMIT);
}

static void comment_state(const function_file *file, buffer *out, int state)
{
    buffer_char(out, '[');
    statement_comment_name(out, file->net->species[file->net->state_species[state]].name);
    buffer_char(out, ']');
}

static void comment_constant(const function_file *file, buffer *out, int constant)
{
    statement_comment_name(out, file->net->constants[constant].name);
}

/* "R1: A -> X", or the name of a flow. */
static void comment_step(const function_file *file, buffer *out, int step)
{
    const network_step *of = &file->net->steps[step];
    statement_comment_name(out, of->name);
    if (of->reaction >= 0) {
        buffer_append(out, ": ");
        buffer equation;
        buffer_init(&equation);
        network_write_equation(file->net, &file->net->reactions[of->reaction], &equation);
        spell_comment(out, buffer_get(&equation), EQUATION_LIMIT);
        if (buffer_status(&equation) != LB_OK)
            out->status = buffer_status(&equation);
        buffer_clear(&equation);
    }
}

static void comment_item(const function *f, buffer *out, const sums_item *item)
{
    if (item->by < 0) {
        comment_step(f->file, out, item->step);
        return;
    }
    statement_comment_name(out, f->file->net->steps[item->step].name);
    buffer_append(out, " by ");
    if (f->sums->kind == SUMS_DFDK)
        comment_constant(f->file, out, item->by);
    else
        comment_state(f->file, out, item->by);
}

static void comment_target(const function *f, buffer *out, size_t target)
{
    const sums_pattern *pattern = &f->file->pattern;
    size_t n = (size_t)f->file->net->states;
    switch (f->sums->kind) {
    case SUMS_RATES:
        comment_step(f->file, out, (int)target);
        return;
    case SUMS_RHS:
        comment_state(f->file, out, (int)target);
        return;
    case SUMS_SPARSE:
        comment_state(f->file, out, pattern->row[target]);
        buffer_append(out, " by ");
        comment_state(f->file, out, pattern->column[target]);
        return;
    case SUMS_JACOBIAN:
    case SUMS_DFDK:
        comment_state(f->file, out, (int)(target % n));
        buffer_append(out, " by ");
        if (f->sums->kind == SUMS_DFDK)
            comment_constant(f->file, out, (int)(target / n));
        else
            comment_state(f->file, out, (int)(target / n));
        return;
    }
}

/* ---- Statements ------------------------------------------------------------------ */

void statement_local(const function *f, expression e)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    if (f->plan->home[e] != PLAN_SHARED)
        buffer_append(file->writer.out, "const double ");
    write_local_name(&file->writer, e);
    buffer_append(file->writer.out, " = ");
    write_operation(&file->writer, e, WRITE_SUM);
    buffer_char(file->writer.out, ';');
    if (file->definition[e] >= 0) {
        int d = file->definition[e], derived = file->net->derived_count;
        listing_comment(&file->listing);
        statement_comment_name(&file->listing.text, d < derived ? file->net->derived[d].name
                                                                : file->net->readings[d - derived].name);
    }
    listing_end(&file->listing);
}

static void write_item_name(const function *f, const sums_item *item)
{
    buffer *out = f->file->writer.out;
    if (item->by < 0)
        buffer_printf(out, "v%d", item->step);
    else
        buffer_printf(out, "dv%d_d%c%d", item->step, f->sums->kind == SUMS_DFDK ? 'k' : 'x', item->by);
}

bool statement_is_named(const function *f, const sums_item *item)
{
    bool is_leaf = f->file->graph.nodes[item->value].kind <= EXPRESSION_STATE;
    return !item->is_inline && !is_leaf && !f->plan->is_local[item->value];
}

void statement_item(const function *f, const sums_item *item)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    buffer_append(file->writer.out, "const double ");
    write_item_name(f, item);
    buffer_append(file->writer.out, " = ");
    write_expression(&file->writer, item->value, WRITE_SUM);
    buffer_char(file->writer.out, ';');
    listing_comment(&file->listing);
    comment_item(f, &file->listing.text, item);
    listing_end(&file->listing);
}

/* A term with its signs and numbers brought together. */
struct folded {
    double number;
    expression coefficient;  /* EXPRESSION_NONE: 1 */
    expression value;        /* EXPRESSION_NONE: 1; of an item with a line of its own that name stands for it */
    const sums_item *named;
};

static void fold_number(const expression_node *nodes, double *number, expression *factor)
{
    if (*factor == EXPRESSION_NONE || nodes[*factor].kind != EXPRESSION_NUMBER ||
        !isfinite(*number * nodes[*factor].value))
        return;
    *number *= nodes[*factor].value;
    *factor = EXPRESSION_NONE;
}

static struct folded fold(const function *f, const sums_term *term)
{
    const expression_node *nodes = f->file->graph.nodes;
    const sums_item *item = &f->sums->items[term->item];
    struct folded t = {term->number, term->coefficient, item->value, NULL};
    fold_number(nodes, &t.number, &t.coefficient);
    if (statement_is_named(f, item)) {
        t.named = item;
        return t;
    }
    if (nodes[t.value].kind == EXPRESSION_NEGATE && !f->plan->is_local[t.value]) {
        t.value = nodes[t.value].left;
        t.number = -t.number;
    }
    fold_number(nodes, &t.number, &t.value);
    return t;
}

/* number * coefficient * item, with its sign joined to what stands before. */
static void write_term(const function *f, const sums_term *term, bool is_first)
{
    writer *w = &f->file->writer;
    struct folded t = fold(f, term);
    bool is_negative = t.number < 0;
    buffer_append(w->out, is_first ? (is_negative ? "-" : "") : is_negative ? " - " : " + ");
    bool is_number = t.coefficient == EXPRESSION_NONE && t.value == EXPRESSION_NONE;
    const char *times = "";
    if (is_number || fabs(t.number) != 1) {
        spell_number(w->out, fabs(t.number));
        times = "*";
    }
    if (t.coefficient != EXPRESSION_NONE) {
        buffer_append(w->out, times);
        write_expression(w, t.coefficient, *times ? WRITE_FACTOR : WRITE_TERM);
        times = "*";
    }
    if (t.value == EXPRESSION_NONE)
        return;
    buffer_append(w->out, times);
    if (t.named)
        write_item_name(f, t.named);
    else
        write_expression(w, t.value, *times ? WRITE_FACTOR : is_first && !is_negative ? WRITE_SUM : WRITE_TERM);
}

void statement_sum(const function *f, const statement_place *places, size_t count, bool is_first)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    const sums_term *only = count == 1 ? &f->sums->terms[places[0].term] : NULL;
    bool is_less = !is_first && only && only->item >= 0 && only->number < 0;
    buffer_printf(file->writer.out, "%s[%zu] %s ", f->out, places[0].target,
                  is_first ? "=" : is_less ? "-=" : "+=");
    if (f->sums->terms[places[0].term].item < 0)
        buffer_append(file->writer.out, "0.0");
    else
        for (size_t i = 0; i < count; i++) {
            sums_term term = f->sums->terms[places[i].term];
            term.number = is_less ? -term.number : term.number;
            write_term(f, &term, i == 0);
        }
    buffer_char(file->writer.out, ';');
    listing_comment(&file->listing);
    comment_target(f, &file->listing.text, places[0].target);
    listing_end(&file->listing);
}
