/* Lines of an emitted function: locals, rates, sums, and the comments beside them.
 *
 * A line goes to the listing of the file, code first, then its comment. */
#include "emit/statement.h"

#include <string.h>

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
        spell_comment(out, file->net->reactions[of->reaction].equation, EQUATION_LIMIT);
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
        statement_comment_name(&file->listing.text,
                     d < derived ? file->net->derived[d].name : file->net->readings[d - derived].name);
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

/* number * coefficient * item, with its sign joined to what stands before. */
static void write_term(const function *f, const sums_term *term, bool is_first)
{
    writer *w = &f->file->writer;
    const sums_item *item = &f->sums->items[term->item];
    const expression_node *nodes = f->file->graph.nodes;
    double number = term->number;
    expression value = item->value;
    bool is_named = statement_is_named(f, item);
    if (!is_named && nodes[value].kind == EXPRESSION_NEGATE && !f->plan->is_local[value]) {
        value = nodes[value].left;
        number = -number;
    }
    expression coefficient = term->coefficient;
    if (coefficient != EXPRESSION_NONE && nodes[coefficient].kind == EXPRESSION_NUMBER) {
        number *= nodes[coefficient].value;
        coefficient = EXPRESSION_NONE;
    }
    bool is_number = nodes[value].kind == EXPRESSION_NUMBER && coefficient == EXPRESSION_NONE;
    if (is_number)
        number *= nodes[value].value;

    bool is_negative = number < 0;
    double magnitude = is_negative ? -number : number;
    buffer_append(w->out, is_first ? (is_negative ? "-" : "") : is_negative ? " - " : " + ");
    bool has_factor = is_number || magnitude != 1;
    if (has_factor)
        spell_number(w->out, magnitude);
    if (is_number)
        return;
    if (coefficient != EXPRESSION_NONE) {
        if (has_factor)
            buffer_char(w->out, '*');
        write_expression(w, coefficient, has_factor ? WRITE_FACTOR : WRITE_TERM);
        has_factor = true;
    }
    if (has_factor)
        buffer_char(w->out, '*');
    if (is_named)
        write_item_name(f, item);
    else
        write_expression(w, value, has_factor ? WRITE_FACTOR : is_first && !is_negative ? WRITE_SUM : WRITE_TERM);
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
