/* Warnings about names: what is written and has no part in anything. */
#include <string.h>

#include "model/lower.h"

/* ---- Species ---------------------------------------------------------------------------------- */

/* A species that no reaction has: a held one may still enter rate laws. */
static void warn_idle_species(lower *l, const lower_species *p)
{
    if (p->in_reaction || (p->held >= 0 && (p->is_read || l->definitions[p->held].is_used)))
        return;
    diagnostics_warn(l->list, p->where, lower_near(l, &l->species_names, p->name, NULL),
                     "`%s` is in no reaction", p->name);
}

void lower_warnings(lower *l)
{
    for (size_t i = 0; i < l->species_count && l->status == LB_OK; i++)
        warn_idle_species(l, &l->species[i]);
    for (size_t i = 0; i < l->definition_count && l->status == LB_OK; i++) {
        const lower_definition *d = &l->definitions[i];
        if (d->statement && !d->is_used && !d->value.has_state
            && (d->kind == DEFINE_CONSTANT || d->kind == DEFINE_TEMPERATURE))
            diagnostics_warn(l->list, d->statement->text_where, NULL, "nothing uses `%s`", d->name);
    }
}
