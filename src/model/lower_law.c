/* Warning: a rate law that does not vanish with its reactant.
 *
 * Such a law drives the concentration below zero.  What a law uses up are the
 * species that it lowers where it is positive, and those that it raises where it
 * is negative.  It is evaluated with the species at zero and all others positive. */
#include <math.h>

#include "model/lower.h"
#include "model/probe.h"

/* The largest |v| at the sample points: the scale of what counts as zero. */
static double scale_of(probe *p)
{
    double scale = 0;
    for (int point = 0; point < PROBE_POINTS; point++)
        scale = fmax(scale, fabs(probe_value(p, point, NULL, -1)));
    return scale;
}

/* Does the law still move in the given direction with this state at zero? */
static bool goes_on(probe *p, int state, int direction, double scale)
{
    for (int point = 0; point < PROBE_POINTS; point++) {
        double v = probe_value(p, point, NULL, state);
        if (!isfinite(v) || direction * v > 1e-9 * scale)
            return true;
    }
    return false;
}

static span place_of(const lower_reaction *r)
{
    for (const syntax_argument *a = r->statement->settings; a; a = a->next)
        if (a->name && a->name[0] == 'v')
            return a->value->where;
    return r->statement->where;
}

static void check_law(lower *l, const lower_reaction *r, probe *p)
{
    const network_step *step = &l->net->steps[l->net->reactions[r->index].first_step];
    if (probe_take(p, step->rate) != LB_OK) {
        lower_no_memory(l);
        return;
    }
    double scale = scale_of(p);
    for (int i = 0; isfinite(scale) && i < step->entry_count && p->work < PROBE_LIMIT; i++) {
        const network_entry *e = &step->entries[i];
        const network_species *s = &l->net->species[l->net->state_species[e->state]];
        int direction = e->expression == EXPRESSION_NONE && e->num < 0 ? 1 : -1;
        if (s->is_signed || !goes_on(p, e->state, direction, scale))
            continue;
        diagnostics_warn(l->list, place_of(r), "the concentration can then fall below zero",
                         "the rate law of `%s` does not vanish where %s is zero, and it uses up `%s`%s", r->label, s->bracket,
                         s->name, direction < 0 ? " when it is negative" : "");
    }
}

void lower_law_warnings(lower *l)
{
    probe p;
    if (probe_init(&p, l->net) != LB_OK) {
        lower_no_memory(l);
        return;
    }
    for (size_t i = 0; i < l->reaction_count && l->status == LB_OK && p.work < PROBE_LIMIT; i++)
        if (l->reactions[i].has_law)
            check_law(l, &l->reactions[i], &p);
    probe_clear(&p);
}
