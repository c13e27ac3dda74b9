/* Definitions evaluated in the order of their references.
 *
 * A definition without dynamic concentrations is a constant, one with them a
 * reading.  Held, initial and feed concentrations, the residence time and the
 * temperature are definitions with a dimension and a sign of their own. */
#include <math.h>
#include <string.h>

#include "model/lower.h"

enum { LONG_FORM = 8 };

void lower_require_sign(lower *l, lower_value *v, lower_sign sign, const char *why, const char *what)
{
    if (v->kind == VALUE_BAD)
        return;
    if (v->plain >= 0) {
        lower_plain *p = &l->plains[v->plain];
        if (sign > p->sign) {
            p->sign = sign;
            p->sign_why = why;
        }
        return;
    }
    if (v->has_state)
        return;
    if (!isfinite(v->number))
        diagnostics_fault(l->list, v->where, NULL, "%s comes out without a finite value", what);
    else if (sign == SIGN_NOT_NEGATIVE && v->number < 0)
        diagnostics_fault(l->list, v->where, NULL, "%s comes out negative: %.6g", what, v->number);
    else if (sign == SIGN_POSITIVE && !(v->number > 0))
        diagnostics_fault(l->list, v->where, NULL, "%s does not come out positive: %.6g", what, v->number);
    else
        return;
    v->kind = VALUE_BAD;
}

/* What the kind of a definition asks of its value. */
struct demand {
    int concentration, time, temperature;
    lower_sign sign;
    const char *why, *what;
};

static const struct demand demands[] = {
    [DEFINE_HELD] = {1, 0, 0, SIGN_NOT_NEGATIVE, "held concentration", "a held concentration"},
    [DEFINE_INITIAL] = {1, 0, 0, SIGN_NOT_NEGATIVE, "initial concentration", "an initial concentration"},
    [DEFINE_FEED] = {1, 0, 0, SIGN_NOT_NEGATIVE, "feed concentration", "a feed concentration"},
    [DEFINE_RESIDENCE] = {0, 1, 0, SIGN_POSITIVE, "residence time", "the residence time"},
    [DEFINE_TEMPERATURE] = {0, 0, 1, SIGN_POSITIVE, "temperature", "the temperature"},
};

static void check_demand(lower *l, lower_definition *d)
{
    const struct demand *demand = &demands[d->kind];
    dimension wanted = lower_dimension(demand->concentration, 1, demand->time, 0, 0, demand->temperature);
    bool is_signed = d->species >= 0 && l->species[d->species].is_signed;
    lower_need(l, &d->value, &wanted, demand->what, NULL);
    lower_require_sign(l, &d->value, is_signed ? SIGN_ANY : demand->sign, demand->why, demand->what);
}

/* A long list of unknown dimensions becomes one, so that uses stay cheap. */
static void shorten(lower *l, lower_value *v)
{
    int terms = 0;
    for (const form_term *t = v->dim.first; t && terms <= LONG_FORM; t = t->next)
        terms++;
    if (v->kind != VALUE_GENERAL || terms <= LONG_FORM)
        return;
    form own;
    const char *a, *b;
    int unknown = infer_new(&l->inf);
    if (unknown < 0 || !form_unknown(&l->inf, unknown, &own)) {
        lower_no_memory(l);
        return;
    }
    lower_agree(l, &own, &v->dim, v->where.line, &a, &b);
    v->dim = own;
}

static const char *state_remedy(const lower_definition *d)
{
    return d->kind == DEFINE_HELD ? "leave it dynamic, or give it a value of constants" : NULL;
}

static void evaluate(lower *l, lower_definition *d)
{
    const syntax_expression *node = d->statement ? d->statement->value : NULL;
    lower_context context = {.allows_state = d->kind == DEFINE_CONSTANT, .state_remedy = state_remedy(d)};
    context.what = d->kind == DEFINE_CONSTANT ? d->name : demands[d->kind].what;
    if (d->plain >= 0)
        d->value = value_of_plain(l, d->plain, l->plains[d->plain].where);
    else if (node && !d->is_rejected && !d->statement->is_broken)
        d->value = lower_evaluate(l, node, &context);
    if (d->kind != DEFINE_CONSTANT)
        check_demand(l, d);
    else
        lower_require_sign(l, &d->value, SIGN_ANY, "", lower_text(l, "`%s`", d->name));
    shorten(l, &d->value);
    d->is_done = true;
}

/* What the species of the network take from a definition. */
static void store_in_species(lower *l, const lower_definition *d)
{
    int index = d->species >= 0 ? l->species[d->species].index : -1;
    if (index < 0)
        return;
    network_species *s = &l->net->species[index];
    if (d->kind == DEFINE_HELD && d->value.kind == VALUE_BAD)
        s->held = expression_number(&l->net->graph, 1); /* so that reactions can be read on; there is a fault */
    if (d->value.kind == VALUE_BAD)
        return;
    if (d->kind == DEFINE_HELD)
        s->held = d->value.e;
    else if (d->kind == DEFINE_FEED && l->residence >= 0)
        s->feed = d->value.e;
    else if (d->kind == DEFINE_INITIAL) {
        s->initial = d->value.e;
        s->has_initial = true;
    }
}

void lower_define(lower *l)
{
    for (size_t i = 0; i < l->order_count && l->status == LB_OK; i++) {
        lower_definition *d = &l->definitions[l->order[i]];
        evaluate(l, d);
        store_in_species(l, d);
    }
}

static void store_definition(lower *l, const lower_definition *d)
{
    int index = network_add_definition(l->net, d->value.has_state, d->name, d->value.e);
    if (index < 0) {
        lower_no_memory(l);
        return;
    }
    network_definition *n = d->value.has_state ? &l->net->readings[index] : &l->net->derived[index];
    n->line = d->statement->where.line;
    dimension dim;
    buffer text;
    buffer_init(&text);
    if (infer_resolve(&l->inf, &d->value.dim, &dim))
        unit_write(&l->net->units, &dim, &text);
    char *words = buffer_take(&text);
    if (words)
        network_set_unit(&n->unit, words);
    else
        lower_no_memory(l);
}

void lower_finish_definitions(lower *l)
{
    for (size_t i = 0; i < l->definition_count && l->status == LB_OK; i++) {
        const lower_definition *d = &l->definitions[i];
        if (d->plain < 0 && d->kind != DEFINE_INITIAL && d->value.kind != VALUE_BAD)
            store_definition(l, d);
    }
}
