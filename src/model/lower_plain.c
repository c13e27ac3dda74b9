/* Plain numbers: whatever has a number of its own in the file.
 *
 * Each becomes a constant of the network in the order of the file (initial
 * concentrations excepted).  One with a unit has that dimension; one without
 * takes the dimension that its uses require, in the file's units. */
#include <math.h>
#include <stdint.h>
#include <string.h>

#include "model/lower.h"

/* ---- Reading one --------------------------------------------------------------------- */

enum { MOST_FACTORS = 64, DEEPEST_UNIT = 16 };

/* A unit alone: a factor, or a product or quotient of such, print's ambiguities left out. */
static bool read_unit(const lower *l, const syntax_expression *node, unit *out)
{
    unit left, right;
    if (node->depth > DEEPEST_UNIT)
        return false;
    switch (node->kind) {
    case SYNTAX_GROUP:
        return read_unit(l, node->left, out);
    case SYNTAX_JUXTAPOSED:
    case SYNTAX_MULTIPLY:
        return read_unit(l, node->left, &left) && read_unit(l, node->right, &right)
               && unit_multiply(&left, &right, out);
    case SYNTAX_DIVIDE:
        return node->right->kind != SYNTAX_JUXTAPOSED && read_unit(l, node->left, &left)
               && read_unit(l, node->right, &right) && unit_divide(&left, &right, out);
    default:
        return lower_unit_factor(l, node, out);
    }
}

bool lower_read_plain(const lower *l, const syntax_expression *node, double *number, unit *measure,
                      bool *has_unit)
{
    double sign = 1;
    *measure = unit_one();
    *has_unit = false;
    for (int i = 0; i < MOST_FACTORS; i++) {
        unit factor;
        switch (node->kind) {
        case SYNTAX_NUMBER:
            *number = sign * node->number;
            return true;
        case SYNTAX_NEGATE:
            sign = -sign;
            break;
        case SYNTAX_GROUP:
            break;
        case SYNTAX_JUXTAPOSED:
        case SYNTAX_MULTIPLY:
            if (!read_unit(l, node->right, &factor) || !unit_multiply(measure, &factor, measure))
                return false;
            *has_unit = true;
            break;
        case SYNTAX_DIVIDE:
            if (node->right->kind == SYNTAX_JUXTAPOSED || !read_unit(l, node->right, &factor)
                || !unit_divide(measure, &factor, measure))
                return false;
            *has_unit = true;
            break;
        default:
            return false;
        }
        node = node->left;
    }
    return false;
}

/* ---- The map from places in expressions to plain numbers -------------------------------- */

static size_t slot_of(const lower *l, const syntax_expression *node)
{
    uint64_t h = (uint64_t)(uintptr_t)node * 0x9E3779B97F4A7C15u;
    size_t i = (size_t)(h >> 20) & (l->inline_slots - 1);
    while (l->inlines[i].node && l->inlines[i].node != node)
        i = (i + 1) & (l->inline_slots - 1);
    return i;
}

int lower_find_inline(const lower *l, const syntax_expression *node)
{
    if (l->inline_slots == 0)
        return -1;
    const lower_inline *found = &l->inlines[slot_of(l, node)];
    return found->node ? found->plain : -1;
}

static bool grow_inlines(lower *l)
{
    size_t old_slots = l->inline_slots, slots = old_slots ? 2 * old_slots : 64;
    lower_inline *old = l->inlines, *fresh = memory_zeroed(slots, sizeof *fresh);
    if (!fresh)
        return lower_no_memory(l);
    l->inlines = fresh;
    l->inline_slots = slots;
    for (size_t i = 0; i < old_slots; i++)
        if (old[i].node)
            fresh[slot_of(l, old[i].node)] = old[i];
    memory_free(old);
    return true;
}

static void enter_inline(lower *l, const syntax_expression *node, int plain)
{
    if (plain < 0 || (2 * (l->inline_count + 1) > l->inline_slots && !grow_inlines(l)))
        return;
    l->inlines[slot_of(l, node)] = (lower_inline){node, plain};
    l->inline_count++;
}

/* ---- Entering them all ---------------------------------------------------------------------- */

/* The name, or with .2, .3, ... when it is taken. */
static const char *unique_name(lower *l, const char *name)
{
    const char *unique = name;
    for (int i = 2; names_find(&l->plain_names, unique) >= 0 && l->status == LB_OK; i++)
        unique = lower_text(l, "%s.%d", name, i);
    return unique;
}

int lower_add_plain(lower *l, const char *name, network_constant_kind kind, span where)
{
    name = unique_name(l, name);
    if (memory_grow(&l->plains, &l->plain_capacity, l->plain_count, sizeof *l->plains)
        || names_add(&l->plain_names, name, (int)l->plain_count)) {
        lower_no_memory(l);
        return -1;
    }
    l->plains[l->plain_count] = (lower_plain){.name = name, .kind = kind, .where = where,
                                              .dim = &l->none, .unknown = -1, .constant = -1};
    return (int)l->plain_count++;
}

const form *lower_known_form(lower *l, const dimension *d)
{
    form *known = arena_alloc(l->memory, sizeof *known);
    if (known)
        *known = form_known(d);
    else
        lower_no_memory(l);
    return known ? known : &l->none;
}

static void set_dimension(lower *l, lower_plain *p, const unit *measure)
{
    if (l->net->units.none)
        return;
    if (p->has_unit) {
        const lower_plain *before = p > l->plains ? p - 1 : NULL;
        bool is_same = before && before->has_unit && dimension_equal(&before->dim->known, &measure->dim);
        p->dim = is_same ? before->dim : lower_known_form(l, &measure->dim);
        return;
    }
    form *unknown = arena_alloc(l->memory, sizeof *unknown);
    p->unknown = infer_new(&l->inf);
    if (p->unknown < 0 || !unknown || !form_unknown(&l->inf, p->unknown, unknown))
        lower_no_memory(l);
    else
        p->dim = unknown;
}

static const unit *keep_unit(lower *l, const unit *measure)
{
    unit *kept = arena_alloc(l->memory, sizeof *kept);
    if (kept)
        *kept = *measure;
    else
        lower_no_memory(l);
    return kept;
}

/* A plain number for this expression, or -1 when it is none. */
static int make_plain(lower *l, const char *name, network_constant_kind kind, const syntax_expression *node,
                      const syntax_range *range)
{
    double number;
    unit measure;
    bool has_unit;
    if (!lower_read_plain(l, node, &number, &measure, &has_unit))
        return -1;
    int index = lower_add_plain(l, name, kind, node->where);
    if (index < 0)
        return -1;
    lower_plain *p = &l->plains[index];
    p->measure = range ? keep_unit(l, &measure) : NULL;
    p->has_unit = has_unit;
    p->range = range;
    p->written = p->stored = unit_to_stored(&l->net->units, &measure, number);
    if (!isfinite(p->stored)) {
        diagnostics_fault(l->list, p->where, NULL, "this number is too large in the units of the file");
        p->is_bad = true;
    }
    set_dimension(l, p, &measure);
    return index;
}

static void fault_range(lower *l, const syntax_range *range)
{
    if (range)
        diagnostics_fault(l->list, range->where, "give the range to the constants in it",
                          "only a plain number has a range");
}

/* Arguments by name inside an expression, in the order of the text: prefix.NAME. */
static void enter_arguments(lower *l, const char *prefix, const syntax_expression *root)
{
    const syntax_expression **stack = NULL;
    size_t count = 0, capacity = 0;
    const syntax_expression *node = root;
    while (node && l->status == LB_OK) {
        const syntax_expression *child[2] = {node->right, node->left};
        for (const syntax_argument *a = node->kind == SYNTAX_CALL ? node->first : NULL; a; a = a->next) {
            int plain = a->name ? make_plain(l, lower_text(l, "%s.%s", prefix, a->name), CONSTANT_INLINE,
                                             a->value, a->range)
                                : -1;
            if (plain >= 0)
                enter_inline(l, a->value, plain);
            else
                fault_range(l, a->range);
            if (plain < 0 && memory_grow(&stack, &capacity, count, sizeof *stack))
                lower_no_memory(l);
            else if (plain < 0)
                stack[count++] = a->value;
        }
        for (int i = 0; i < 2 && l->status == LB_OK; i++) {
            if (child[i] && memory_grow(&stack, &capacity, count, sizeof *stack))
                lower_no_memory(l);
            else if (child[i])
                stack[count++] = child[i];
        }
        node = count > 0 ? stack[--count] : NULL;
    }
    memory_free(stack);
}

static void enter_definition(lower *l, lower_definition *d)
{
    static const network_constant_kind kinds[] = {
        [DEFINE_CONSTANT] = CONSTANT_NAMED,      [DEFINE_HELD] = CONSTANT_HELD,
        [DEFINE_INITIAL] = CONSTANT_NAMED,       [DEFINE_FEED] = CONSTANT_FEED,
        [DEFINE_RESIDENCE] = CONSTANT_RESIDENCE, [DEFINE_TEMPERATURE] = CONSTANT_TEMPERATURE};
    const syntax_statement *s = d->statement;
    if (d->is_rejected)
        return;
    d->plain = make_plain(l, d->name, kinds[d->kind], s->value, s->range);
    if (d->plain >= 0) {
        l->plains[d->plain].is_initial = d->kind == DEFINE_INITIAL;
        return;
    }
    fault_range(l, s->range);
    enter_arguments(l, d->name, s->value);
}

static void enter_settings(lower *l, const lower_reaction *r)
{
    for (const syntax_argument *a = r->statement->settings; a && l->status == LB_OK; a = a->next) {
        const char *slot = a->name ? a->name : "k";
        int plain = make_plain(l, lower_text(l, "%s.%s", r->label, slot), CONSTANT_INLINE, a->value, a->range);
        if (plain >= 0) {
            enter_inline(l, a->value, plain);
            continue;
        }
        fault_range(l, a->range);
        bool is_forward = strcmp(slot, "k") == 0 || strcmp(slot, "v") == 0;
        enter_arguments(l, is_forward ? r->label : lower_text(l, "%s.%s", r->label, slot), a->value);
    }
}

void lower_plains(lower *l)
{
    size_t d = 0, r = 0;
    for (const syntax_statement *s = l->tree->first; s && l->status == LB_OK; s = s->next) {
        if (d < l->definition_count && l->definitions[d].statement == s)
            enter_definition(l, &l->definitions[d++]);
        else if (r < l->reaction_count && l->reactions[r].statement == s)
            enter_settings(l, &l->reactions[r++]);
    }
}

/* ---- To the network ------------------------------------------------------------------------- */

void lower_add_constants(lower *l)
{
    for (size_t i = 0; i < l->plain_count && l->status == LB_OK; i++) {
        lower_plain *p = &l->plains[i];
        if (p->is_initial)
            continue;
        p->constant = network_add_constant(l->net, p->name, p->kind, p->stored);
        if (p->constant < 0)
            lower_no_memory(l);
        else
            l->net->constants[p->constant].line = p->where.line;
    }
}

/* A number without a unit carries concentration and time alone; or it is a temperature. */
static void check_bare(lower *l, lower_plain *p, const dimension *d)
{
    int num, den;
    dimension kelvin = dimension_none();
    kelvin.num[DIMENSION_TEMPERATURE] = 1;
    if (p->has_unit || dimension_equal(d, &kelvin)
        || (d->num[DIMENSION_ENERGY] == 0 && d->num[DIMENSION_TEMPERATURE] == 0
            && dimension_is_concentration_power(d, &num, &den)))
        return;
    const char *text = lower_dimension_text(l, d);
    diagnostics_fault(l->list, p->where, lower_text(l, "write a unit behind the number, such as `%s`",
                                                    strcmp(text, "J/mol") == 0 ? "kJ/mol" : text),
                      "`%s` is a quantity in %s, and a number without a unit carries only concentration and time",
                      p->name, text);
    p->is_bad = true;
}

static void check_sign(lower *l, const lower_plain *p)
{
    if (p->set || p->is_bad)
        return;
    if (p->sign == SIGN_NOT_NEGATIVE && p->stored < 0)
        diagnostics_fault(l->list, p->where, NULL, "the %s `%s` is negative", p->sign_why, p->name);
    else if (p->sign == SIGN_POSITIVE && !(p->stored > 0))
        diagnostics_fault(l->list, p->where, NULL, "the %s `%s` is not positive", p->sign_why, p->name);
}

static void store_unit(lower *l, lower_plain *p, const dimension *d)
{
    buffer text;
    buffer_init(&text);
    unit_write(&l->net->units, d, &text);
    char *copy = buffer_take(&text);
    network_constant *c = &l->net->constants[p->constant];
    if (!copy) {
        lower_no_memory(l);
        return;
    }
    network_set_unit(&c->unit, copy);
    c->may_be_negative = p->sign == SIGN_ANY;
}

void lower_finish_plains(lower *l)
{
    for (size_t i = 0; i < l->plain_count && l->status == LB_OK; i++) {
        lower_plain *p = &l->plains[i];
        dimension d;
        if (infer_resolve(&l->inf, p->dim, &d))
            check_bare(l, p, &d);
        else
            d = dimension_none();
        check_sign(l, p);
        if (p->constant >= 0)
            store_unit(l, p, &d);
    }
}
