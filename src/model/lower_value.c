/* Expressions evaluated: from syntax to the graph, with dimension and number.
 *
 * A machine with two stacks of its own, frames and values, so that neither a
 * sum of 10^5 terms nor 10^5 parentheses use the C stack.  What a leaf means is
 * decided here; how operands combine in lower_combine.c and lower_call.c. */
#include <ctype.h>
#include <math.h>
#include <string.h>

#include "model/lower.h"

struct frame {
    const syntax_expression *node;
    const syntax_argument *next;    /* of a call: the argument to come */
    int stage;                      /* operands evaluated so far */
};

struct machine {
    struct frame *frames;   size_t frame_count, frame_capacity;
    lower_value *values;    size_t value_count, value_capacity;
};

lower_value value_bad(span where)
{
    return (lower_value){.kind = VALUE_BAD, .where = where, .dim = form_none(), .plain = -1};
}

lower_value value_general(span where, expression e, double number, form dim)
{
    return (lower_value){
        .kind = VALUE_GENERAL, .e = e, .number = number, .dim = dim, .plain = -1, .where = where};
}

dimension lower_dimension(int concentration_num, int concentration_den, int time, int energy, int amount,
                          int temperature)
{
    dimension d = dimension_none();
    dimension_concentration_time(concentration_num, concentration_den, time, 1, &d);
    d.num[DIMENSION_ENERGY] = energy;
    d.num[DIMENSION_AMOUNT] += amount * d.den[DIMENSION_AMOUNT];
    d.num[DIMENSION_TEMPERATURE] = temperature;
    return d;
}

static form concentration_form(const lower *l)
{
    dimension d = lower_dimension(1, 1, 0, 0, 0, 0);
    return l->net->units.none ? form_none() : form_known(&d);
}

/* ---- Agreement of dimensions ------------------------------------------------------------ */

static const char *form_text(lower *l, const form *f)
{
    dimension d;
    return infer_resolve(&l->inf, f, &d) ? lower_dimension_text(l, &d) : "another unit";
}

bool lower_agree(lower *l, const form *a, const form *b, int line, const char **a_text, const char **b_text)
{
    if (l->net->units.none || l->dimensions_given_up)
        return true;
    switch (infer_equal(&l->inf, a, b, line)) {
    case INFER_FITS:
        return true;
    case INFER_NOMEM:
        return !lower_no_memory(l);
    case INFER_TOO_MUCH:
        l->dimensions_given_up = true;
        diagnostics_fault(l->list, (span){line, 1, 1}, "write units behind the numbers",
                          "there is too much to infer about the dimensions of numbers without a unit");
        return true;
    case INFER_CONFLICT:
        break;
    }
    *a_text = form_text(l, a);
    *b_text = form_text(l, b);
    return false;
}

static bool has_temperature(lower *l, const form *f)
{
    dimension d;
    return infer_resolve(&l->inf, f, &d) && d.num[DIMENSION_TEMPERATURE] != 0;
}

bool lower_need(lower *l, lower_value *v, const dimension *d, const char *what, const char *remedy)
{
    if (v->kind == VALUE_BAD)
        return false;
    const char *is, *needed;
    form wanted = form_known(d);
    if (lower_agree(l, &v->dim, &wanted, v->where.line, &is, &needed))
        return true;
    if (!remedy && has_temperature(l, &v->dim) && d->num[DIMENSION_TEMPERATURE] == 0)
        remedy = "divide `T` by a temperature with its unit, as in `T/(300 K)`";
    const lower_plain *p = v->plain >= 0 ? &l->plains[v->plain] : NULL;
    if (p && p->unknown >= 0 && p->where.line != v->where.line)
        diagnostics_fault(l->list, v->where, NULL, "`%s` is used as %s here and as %s in line %d", p->name,
                          needed, is, l->inf.unknowns[p->unknown].line);
    else if (dimension_is_none(d))
        diagnostics_fault(l->list, v->where, remedy ? remedy : lower_text(l, "divide by a quantity in %s", is),
                          "%s must be a pure number, but this is in %s", what, is);
    else
        diagnostics_fault(l->list, v->where, remedy, "%s must be in %s, but this is %s%s", what, needed,
                          strcmp(is, "a pure number") == 0 ? "" : "in ", is);
    v->kind = VALUE_BAD;
    return false;
}

/* ---- Leaves ------------------------------------------------------------------------------- */

lower_value value_of_plain(lower *l, int plain, span where)
{
    const lower_plain *p = &l->plains[plain];
    lower_value v = value_bad(where);
    if (p->is_bad)
        return v;
    v.kind = VALUE_GENERAL;
    v.plain = plain;
    v.number = p->stored;
    v.e = p->constant >= 0 ? expression_constant(&l->net->graph, p->constant)
                           : expression_number(&l->net->graph, p->stored);
    if (!form_copy(&l->inf, p->dim, &v.dim) || v.e == EXPRESSION_NONE)
        lower_no_memory(l);
    return v;
}

/* A dimension that fits anywhere: the literal 0 has it. */
static form any_dimension(lower *l)
{
    form f = form_none();
    int unknown = infer_new(&l->inf);
    if (unknown < 0 || !form_unknown(&l->inf, unknown, &f))
        lower_no_memory(l);
    return f;
}

void value_finish(lower *l, lower_value *v)
{
    if (v->kind != VALUE_PLAIN && v->kind != VALUE_UNIT)
        return;
    double raw = v->kind == VALUE_UNIT ? 1 : v->raw;
    v->number = unit_to_stored(&l->net->units, &v->measure, raw);
    v->e = expression_number(&l->net->graph, v->number);
    v->has_state = false;
    if (l->net->units.none)
        v->dim = form_none();
    else if (v->kind == VALUE_PLAIN && !v->has_unit && raw == 0)
        v->dim = any_dimension(l);
    else
        v->dim = form_known(&v->measure.dim);
    v->kind = VALUE_GENERAL;
    v->plain = -1;
    if (v->e == EXPRESSION_NONE)
        lower_no_memory(l);
    if (!isfinite(v->number)) {
        diagnostics_fault(l->list, v->where, NULL, "this number is too large in the units of the file");
        v->kind = VALUE_BAD;
    }
}

static lower_value fault_state(lower *l, const syntax_expression *node, const lower_context *context,
                               const char *name)
{
    diagnostics_fault(l->list, node->where, context->state_remedy,
                      "`%s` changes with time, so it cannot stand in %s", name, context->what);
    return value_bad(node->where);
}

static lower_value value_of_definition(lower *l, const syntax_expression *node, int index,
                                       const lower_context *context)
{
    lower_definition *d = &l->definitions[index];
    d->is_used = true;
    if (!d->is_done || d->value.kind == VALUE_BAD)
        return value_bad(node->where);
    if (d->value.has_state && !context->allows_state)
        return fault_state(l, node, context, d->name);
    if (d->plain >= 0)
        return value_of_plain(l, d->plain, node->where);
    lower_value v = d->value;
    v.where = node->where;
    if (!form_copy(&l->inf, &d->value.dim, &v.dim))
        lower_no_memory(l);
    return v;
}

lower_value value_temperature(lower *l, span where)
{
    if (l->temperature < 0) {
        diagnostics_fault(l->list, where, "write for example `temperature = 298.15 K`",
                          "the file gives no temperature");
        return value_bad(where);
    }
    syntax_expression here = {.kind = SYNTAX_NAME, .where = where};
    lower_context context = {.allows_state = false};
    return value_of_definition(l, &here, l->temperature, &context);
}

static lower_value gas_constant(lower *l, span where)
{
    dimension d = lower_dimension(0, 1, 0, 1, -1, -1);
    const double value = 8.31446261815324;      /* J/mol/K, SI 2019 */
    return value_general(where, expression_number(&l->net->graph, value), value,
                         l->net->units.none ? form_none() : form_known(&d));
}

/* `cm3` for `cm^3`: a unit with digits behind it. */
static const char *unit_with_digits(lower *l, const char *name)
{
    size_t letters = strlen(name);
    while (letters > 0 && isdigit((unsigned char)name[letters - 1]))
        letters--;
    if (letters == 0 || !name[letters])
        return NULL;
    const char *stem = lower_text(l, "%.*s", (int)letters, name);
    return lower_is_unit_name(l, stem) ? lower_text(l, "write `%s^%s`", stem, name + letters) : NULL;
}

static lower_value fault_name(lower *l, const syntax_expression *node)
{
    const char *name = node->text, *remedy = unit_with_digits(l, name);
    if (!remedy && lower_find_species(l, name) >= 0)
        remedy = lower_text(l, "a concentration is written `%s`", lower_bracket(l, name, ""));
    if (!remedy)
        remedy = lower_near(l, &l->definition_names, name, NULL);
    if (strcmp(name, "t") == 0)
        diagnostics_fault(l->list, node->where, NULL, "`t` is reserved for mechanisms that are driven in time");
    else if (lower_is_function(name))
        diagnostics_fault(l->list, node->where, "give it its arguments, in parentheses", "`%s` is a function",
                          name);
    else
        diagnostics_fault(l->list, node->where, remedy, "nothing is called `%s`", name);
    return value_bad(node->where);
}

static lower_value value_of_name(lower *l, const syntax_expression *node, const lower_context *context)
{
    int index = names_find(&l->definition_names, node->text);
    if (index >= 0)
        return value_of_definition(l, node, index, context);
    if (strcmp(node->text, "T") == 0)
        return value_temperature(l, node->where);
    if (strcmp(node->text, "R") == 0)
        return gas_constant(l, node->where);
    lower_value v = {.kind = VALUE_UNIT, .where = node->where, .dim = form_none(), .plain = -1};
    if (lower_unit_factor(l, node, &v.measure))
        return v;
    return fault_name(l, node);
}

static lower_value value_of_concentration(lower *l, const syntax_expression *node, const lower_context *context)
{
    int index = lower_find_species(l, node->text);
    if (index < 0) {
        diagnostics_fault(l->list, node->where, lower_near(l, &l->species_names, node->text, NULL),
                          "there is no species `%s`", node->text);
        return value_bad(node->where);
    }
    lower_species *p = &l->species[index];
    p->is_read = true;
    if (p->held >= 0)
        return value_of_definition(l, node, p->held, context);
    if (!p->in_reaction) {
        diagnostics_fault(l->list, node->where,
                          lower_text(l, "hold it with `%s = ...`", lower_bracket(l, node->text, "")),
                          "`%s` is in no reaction, so its concentration is not known", node->text);
        return value_bad(node->where);
    }
    if (!context->allows_state)
        return fault_state(l, node, context, lower_bracket(l, node->text, ""));
    int state = p->index >= 0 ? l->net->species[p->index].state : 0;
    lower_value v =
        value_general(node->where, expression_state(&l->net->graph, state), NAN, concentration_form(l));
    v.has_state = true;
    return v;
}

static lower_value value_of_feed(lower *l, const syntax_expression *node, const lower_context *context)
{
    int index = lower_find_species(l, node->text);
    const lower_species *p = index >= 0 ? &l->species[index] : NULL;
    if (p && p->feed >= 0)
        return value_of_definition(l, node, p->feed, context);
    const char *remedy = NULL;
    if (!p)
        remedy = lower_near(l, &l->species_names, node->text, NULL);
    else if (l->residence < 0)
        remedy = "write `residence = ...` for a stirred tank";
    else if (p->held < 0 && !p->is_retained && p->in_reaction)
        return value_general(node->where, expression_number(&l->net->graph, 0), 0, concentration_form(l));
    diagnostics_fault(l->list, node->where, remedy, "there is no feed of `%s`", node->text);
    return value_bad(node->where);
}

static lower_value value_of_leaf(lower *l, const syntax_expression *node, const lower_context *context)
{
    switch (node->kind) {
    case SYNTAX_NUMBER:
        return (lower_value){.kind = VALUE_PLAIN, .raw = node->number, .measure = unit_one(), .dim = form_none(),
                             .plain = -1, .where = node->where};
    case SYNTAX_NAME:
        return value_of_name(l, node, context);
    case SYNTAX_CONCENTRATION:
        return value_of_concentration(l, node, context);
    default:
        return value_of_feed(l, node, context);
    }
}

/* ---- The machine ------------------------------------------------------------------------------ */

static void push_value(lower *l, struct machine *m, lower_value v)
{
    if (memory_grow(&m->values, &m->value_capacity, m->value_count, sizeof *m->values))
        lower_no_memory(l);
    else
        m->values[m->value_count++] = v;
}

static void push_frame(lower *l, struct machine *m, const syntax_expression *node)
{
    if (memory_grow(&m->frames, &m->frame_capacity, m->frame_count, sizeof *m->frames))
        lower_no_memory(l);
    else
        m->frames[m->frame_count++] = (struct frame){node, node->kind == SYNTAX_CALL ? node->first : NULL, 0};
}

/* An operand to come; a plain number that is a constant is a value at once. */
static void push_operand(lower *l, struct machine *m, const syntax_expression *node, bool may_be_inline)
{
    int plain = may_be_inline ? lower_find_inline(l, node) : -1;
    if (plain >= 0)
        push_value(l, m, value_of_plain(l, plain, node->where));
    else
        push_frame(l, m, node);
}

/* The node's operands are the top of the values: put its own value in their place. */
static void finish_frame(lower *l, struct machine *m, const lower_context *context)
{
    struct frame f = m->frames[--m->frame_count];
    m->value_count -= (size_t)f.stage;
    lower_value *top = f.stage > 0 ? &m->values[m->value_count] : NULL;
    lower_value v;
    if (f.node->kind == SYNTAX_CALL)
        v = value_call(l, f.node, top, f.stage, context);
    else if (f.node->kind == SYNTAX_NEGATE)
        v = value_negate(l, top[0]);
    else if (f.node->kind == SYNTAX_GROUP)
        v = top[0];
    else if (f.node->kind == SYNTAX_JUXTAPOSED)
        v = value_juxtaposed(l, f.node, top[0]);
    else
        v = value_binary(l, f.node, top[0], top[1]);
    v.where = f.node->where;
    push_value(l, m, v);
}

/* One step of the top frame: its next operand, or its value. */
static void step(lower *l, struct machine *m, const lower_context *context)
{
    struct frame *f = &m->frames[m->frame_count - 1];
    const syntax_expression *node = f->node;
    switch (node->kind) {
    case SYNTAX_NUMBER:
    case SYNTAX_NAME:
    case SYNTAX_CONCENTRATION:
    case SYNTAX_FEED:
        m->frame_count--;
        push_value(l, m, value_of_leaf(l, node, context));
        return;
    case SYNTAX_CALL:
        if (!f->next)
            break;
        f->stage++;
        const syntax_argument *argument = f->next;
        f->next = argument->next;
        push_operand(l, m, argument->value, true);
        return;
    case SYNTAX_NEGATE:
    case SYNTAX_GROUP:
    case SYNTAX_JUXTAPOSED:         /* its right operand is a unit, which value_juxtaposed reads */
        if (f->stage == 1)
            break;
        f->stage = 1;
        push_operand(l, m, node->left, false);
        return;
    default:
        if (f->stage == 2)
            break;
        push_operand(l, m, f->stage++ == 0 ? node->left : node->right, false);
        return;
    }
    finish_frame(l, m, context);
}

lower_value lower_evaluate(lower *l, const syntax_expression *node, const lower_context *context)
{
    struct machine m = {.frames = NULL};
    push_operand(l, &m, node, true);
    while (m.frame_count > 0 && l->status == LB_OK)
        step(l, &m, context);
    lower_value v = l->status == LB_OK ? m.values[0] : value_bad(node->where);
    value_finish(l, &v);
    memory_free(m.frames);
    memory_free(m.values);
    return l->status == LB_OK ? v : value_bad(node->where);
}
