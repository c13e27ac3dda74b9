/* Ranges of plain numbers: `in LOW .. HIGH`, `within factor F`.
 *
 * An end without a unit takes the other end's, else the value's. */
#include <math.h>

#include "model/lower.h"

struct end {
    double number;
    unit measure;
    bool has_unit;
};

static bool read_end(lower *l, const syntax_expression *node, struct end *out)
{
    if (lower_read_plain(l, node, &out->number, &out->measure, &out->has_unit))
        return true;
    diagnostics_fault(l->list, node->where, NULL, "the ends of a range are plain numbers");
    return false;
}

/* The stored number of an end, its dimension that of the value. */
static bool store_end(lower *l, const lower_plain *p, const syntax_expression *node, const struct end *own,
                      const struct end *other, double *stored)
{
    const unit *measure = own->has_unit ? &own->measure : other->has_unit ? &other->measure : p->measure;
    const char *value_text, *end_text;
    form dim = form_known(&measure->dim);
    if (own->has_unit && !lower_agree(l, p->dim, &dim, node->where.line, &value_text, &end_text)) {
        diagnostics_fault(l->list, node->where, NULL, "this end is in %s and the value in %s", end_text,
                          value_text);
        return false;
    }
    *stored = unit_to_stored(&l->net->units, measure, own->number);
    return true;
}

static bool read_between(lower *l, lower_plain *p)
{
    struct end low, high;
    const syntax_range *r = p->range;
    bool is_good = read_end(l, r->low, &low);
    is_good = read_end(l, r->high, &high) && is_good;
    return is_good && store_end(l, p, r->low, &low, &high, &p->low)
           && store_end(l, p, r->high, &high, &low, &p->high);
}

static bool read_factor(lower *l, lower_plain *p)
{
    double factor = p->range->low->number;
    if (!(factor > 1)) {
        diagnostics_fault(l->list, p->range->low->where, NULL, "the factor of a range is above 1");
        return false;
    }
    if (p->written == 0) {
        diagnostics_fault(l->list, p->range->where, "write `in LOW .. HIGH`", "zero has no range by a factor");
        return false;
    }
    p->low = p->written > 0 ? p->written / factor : p->written * factor;
    p->high = p->written > 0 ? p->written * factor : p->written / factor;
    return true;
}

/* Empty, or without its value?  A value on an end may be off by a rounding of units. */
static bool holds_value(lower *l, const lower_plain *p)
{
    if (!isfinite(p->low) || !isfinite(p->high))
        diagnostics_fault(l->list, p->range->where, NULL,
                          "an end of this range is too large in the units of the file");
    else if (!(p->low < p->high))
        diagnostics_fault(l->list, p->range->where, "write the lower end first", "this range is empty");
    else if (p->written < p->low - 1e-14 * fabs(p->low) || p->written > p->high + 1e-14 * fabs(p->high))
        diagnostics_fault(l->list, p->range->where, NULL, "the range of `%s` does not hold its value", p->name);
    else
        return true;
    return false;
}

void lower_ranges(lower *l)
{
    for (size_t i = 0; i < l->plain_count && l->status == LB_OK; i++) {
        lower_plain *p = &l->plains[i];
        if (p->range && !p->is_bad)
            p->has_range = (p->range->is_factor ? read_factor(l, p) : read_between(l, p)) && holds_value(l, p);
    }
}

static void store(lower *l, const lower_plain *p)
{
    if (p->constant < 0)
        return;
    network_constant *c = &l->net->constants[p->constant];
    c->has_range = true;
    c->low = p->low;
    c->high = p->high;
    c->is_logarithmic = p->low > 0;
}

/* Ranges of initial concentrations belong to the species. */
static void store_initial(lower *l, const lower_definition *d)
{
    const lower_plain *p = d->plain >= 0 && d->kind == DEFINE_INITIAL ? &l->plains[d->plain] : NULL;
    int index = p && p->has_range ? l->species[d->species].index : -1;
    if (index < 0)
        return;
    l->net->species[index].has_initial_range = true;
    l->net->species[index].initial_low = p->low;
    l->net->species[index].initial_high = p->high;
}

void lower_check_ranges(lower *l)
{
    for (size_t i = 0; i < l->plain_count && l->status == LB_OK; i++) {
        const lower_plain *p = &l->plains[i];
        if (!p->has_range)
            continue;
        if (p->sign == SIGN_NOT_NEGATIVE && p->low < 0)
            diagnostics_fault(l->list, p->range->where, NULL,
                              "the %s `%s` cannot be negative, and its range goes below zero", p->sign_why,
                              p->name);
        else if (p->sign == SIGN_POSITIVE && !(p->low > 0))
            diagnostics_fault(l->list, p->range->where, NULL, "the %s `%s` is positive, and its range is not",
                              p->sign_why, p->name);
        else
            store(l, p);
    }
    for (size_t i = 0; i < l->definition_count; i++)
        store_initial(l, &l->definitions[i]);
}
