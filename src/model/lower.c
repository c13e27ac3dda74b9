/* Lowering: the order of work, and what all its parts share. */
#include "model/lower.h"

#include <stdarg.h>
#include <stdio.h>

#include "base/status.h"

/* ---- Shared --------------------------------------------------------------------------------- */

bool lower_no_memory(lower *l)
{
    l->status = LB_E_NOMEM;
    return false;
}

char *lower_text(lower *l, const char *format, ...)
{
    static char nothing[] = "";
    va_list list;
    va_start(list, format);
    int length = vsnprintf(NULL, 0, format, list);
    va_end(list);
    char *text = length < 0 ? NULL : arena_alloc(l->memory, (size_t)length + 1);
    if (!text) {
        lower_no_memory(l);
        return nothing;
    }
    va_start(list, format);
    vsnprintf(text, (size_t)length + 1, format, list);
    va_end(list);
    return text;
}

/* The list keeps no more than this, and a search over 10^5 names is not free. */
enum { MOST_KEPT = 100 };

bool lower_has_room(const lower *l)
{
    return lb_diagnostics_faults(l->list) < MOST_KEPT;
}

const char *lower_near(lower *l, const names *table, const char *word, const char *otherwise)
{
    const char *near = l->searches++ < MOST_KEPT ? names_nearest(table, word) : NULL;
    return near ? lower_text(l, "did you mean `%s`?", near) : otherwise;
}

/* ---- The order of work ------------------------------------------------------------------------ */

static bool start(lower *l)
{
    l->residence = l->temperature = -1;
    l->none = form_none();
    l->net = network_new();
    l->memory = arena_new();
    return l->net && l->memory && infer_init(&l->inf) == 0;
}

static void finish(lower *l)
{
    for (size_t i = 0; i < l->species_count; i++)
        formula_clear(&l->species[i].atoms);
    names_clear(&l->species_names);
    names_clear(&l->definition_names);
    names_clear(&l->label_names);
    names_clear(&l->plain_names);
    memory_free(l->species);
    memory_free(l->definitions);
    memory_free(l->reactions);
    memory_free(l->plains);
    memory_free(l->inlines);
    memory_free(l->order);
    infer_clear(&l->inf);
    arena_free(l->memory);
    lb_network_free(l->net);
}

static void make_tank(lower *l)
{
    const lower_definition *d = l->residence >= 0 ? &l->definitions[l->residence] : NULL;
    if (d && d->value.kind != VALUE_BAD && network_set_tank(l->net, d->value.e) < 0)
        lower_no_memory(l);
}

/* Everything up to the point where dimensions are known. */
static lb_status read_all(lower *l, lb_error *err)
{
    typedef void part(lower *l);
    static part *const before[] = {lower_units, lower_names, lower_plains};
    static part *const after[] = {lower_order,        lower_add_species,   lower_add_constants,
                                  lower_define,       lower_reactions,     make_tank,
                                  lower_ranges,       lower_finish_plains, lower_finish_definitions,
                                  lower_check_ranges, lower_formulas,      lower_balance};
    for (size_t i = 0; i < sizeof before / sizeof *before && l->status == LB_OK; i++)
        before[i](l);
    lb_status status = l->status == LB_OK ? lower_settings(l, err) : LB_OK;
    names_clear(&l->label_names);   /* large, and not asked again */
    names_clear(&l->plain_names);
    if (lb_diagnostics_faults(l->list) > 0)
        status =
            LB_OK; /* the file's faults come first; what a setting did to a value comes before those it caused */
    for (size_t i = 0; i < sizeof after / sizeof *after && l->status == LB_OK && status == LB_OK; i++)
        after[i](l);
    if (l->status == LB_OK && status == LB_OK)
        status = lower_check_settings(l, err);
    return status;
}

/* A network without faults: its values, its warnings. */
static void complete(lower *l)
{
    l->status = network_finish(l->net);
    if (l->status == LB_OK)
        lower_warnings(l);
    if (l->status == LB_OK)
        lower_law_warnings(l);
    if (l->status == LB_OK)
        lower_start_warnings(l);
}

lb_status lower_tree(syntax_tree *tree, lb_diagnostics *list, const lb_setting *settings,
                     size_t setting_count, lb_network **net, lb_error *err)
{
    lower l = {.tree = tree, .list = list, .settings = settings, .setting_count = setting_count};
    lb_status status = LB_E_NOMEM;
    *net = NULL;
    if (!start(&l))
        goto done;
    status = read_all(&l, err);
    if (l.status == LB_OK && status == LB_OK && lb_diagnostics_faults(list) == 0)
        complete(&l);
    if (l.status == LB_OK)
        l.status = diagnostics_status(list);
    if (l.status != LB_OK)
        status = l.status;
    if (status == LB_OK && lb_diagnostics_faults(list) == 0) {
        *net = l.net;
        l.net = NULL;
    }
done:
    finish(&l);
    return status == LB_E_NOMEM ? status_no_memory(err) : status;
}
