/* A user's NAME=VALUE in place of the file's plain numbers.
 *
 * Names are taken as the file writes them.  Initial and feed concentrations that
 * the file leaves at zero may be set too.  Whether a unit fits is known only
 * once all dimensions are, so that comes in a second pass. */
#include <math.h>
#include <string.h>

#include "base/status.h"
#include "model/lower.h"

/* ---- The value -------------------------------------------------------------------------------- */

struct given {
    double number;
    unit measure;
    bool has_unit;
};

static lb_status fault_value(const lb_setting *s, lb_diagnostics *list, lb_error *err)
{
    if (lb_diagnostics_count(list) == 0)
        return status_raise(err, LB_E_ARG, "write a number, with a unit or without",
                            "`%s` is set to `%s`, which is no plain number", s->name, s->value);
    lb_diagnostic first = lb_diagnostics_get(list, 0);
    return status_raise(err, LB_E_ARG, first.remedy, "`%s` cannot be set to `%s`: %s", s->name, s->value,
                        first.message);
}

lb_status lower_read_number(const lower *l, const char *text, double *number, unit *measure, bool *has_unit,
                            lb_diagnostics **list)
{
    syntax_tree *tree = NULL;
    syntax_expression *node = NULL;
    source *s = NULL;
    *list = NULL;
    lb_status status = source_new("value", text, strlen(text), &s);
    if (status == LB_OK)
        status = diagnostics_new(s, list);
    if (status == LB_OK)
        status = syntax_parse_value(*list, &tree, &node);
    if (status == LB_OK && (lb_diagnostics_faults(*list) > 0 || !node
                            || !lower_read_plain(l, node, number, measure, has_unit)))
        status = LB_E_ARG;
    syntax_free(tree);
    return status;
}

static lb_status read_value(lower *l, const lb_setting *s, struct given *out, lb_error *err)
{
    lb_diagnostics *list;
    lb_status status = lower_read_number(l, s->value, &out->number, &out->measure, &out->has_unit, &list);
    if (status == LB_E_ARG)
        fault_value(s, list, err);
    else if (status == LB_E_NOMEM)
        lower_no_memory(l);
    lb_diagnostics_free(list);
    return status;
}

/* ---- The name ----------------------------------------------------------------------------------- */

/* The name as the tables write it: no blanks around it, quotes in brackets only where needed. */
static const char *normalise(lower *l, const char *name)
{
    while (*name == ' ')
        name++;
    size_t length = strlen(name);
    while (length > 0 && name[length - 1] == ' ')
        length--;
    const char *copy = lower_text(l, "%.*s", (int)length, name), *close = strrchr(copy, ']');
    if (copy[0] != '[' || !close)
        return copy;
    const char *from = copy + 1, *to = close;
    if (to - from >= 2 && *from == '"' && to[-1] == '"') {
        from++;
        to--;
    }
    return lower_bracket(l, lower_text(l, "%.*s", (int)(to - from), from), close + 1);
}

/* Names that an expression refers to, for a message: "k2, [A]". */
static const char *references(lower *l, const syntax_expression *node)
{
    enum { SHOWN = 6, DEEPEST = 200 };
    const syntax_expression *stack[DEEPEST];
    const char *list = "", *seen[SHOWN];
    int count = 0, shown = 0;
    stack[count++] = node;
    while (count > 0 && shown < SHOWN) {
        node = stack[--count];
        const char *name = node->kind == SYNTAX_NAME ? node->text : "";
        if (node->kind == SYNTAX_CONCENTRATION || node->kind == SYNTAX_FEED)
            name = lower_bracket(l, node->text, node->kind == SYNTAX_FEED ? "in" : "");
        bool is_known = names_find(&l->definition_names, name) >= 0 || node->kind == SYNTAX_CONCENTRATION;
        for (int i = 0; i < shown; i++)
            is_known = is_known && strcmp(seen[i], name) != 0;
        if (is_known) {
            list = lower_text(l, "%s%s`%s`", list, shown > 0 ? ", " : "", name);
            seen[shown++] = name;
        }
        for (const syntax_argument *a = node->kind == SYNTAX_CALL ? node->first : NULL; a && count < DEEPEST;
             a = a->next)
            stack[count++] = a->value;
        if (node->right && count < DEEPEST)
            stack[count++] = node->right;
        if (node->left && count < DEEPEST)
            stack[count++] = node->left;
    }
    return list;
}

static lb_status fault_derived(lower *l, const char *name, const syntax_expression *value, lb_error *err)
{
    const char *list = value ? references(l, value) : "";
    return status_raise(err, LB_E_ARG, list[0] ? "set those" : NULL,
                        "`%s` cannot be set: the file derives it%s%s", name, list[0] ? " from " : "", list);
}

/* LABEL.SLOT where the slot has no number of its own. */
static lb_status fault_slot(lower *l, const char *name, lb_error *err)
{
    const char *dot = strrchr(name, '.');
    int index = dot ? names_find(&l->label_names, lower_text(l, "%.*s", (int)(dot - name), name)) : -1;
    for (size_t i = 0; dot && index < 0 && i < l->reaction_count; i++)
        if (strncmp(l->reactions[i].label, name, (size_t)(dot - name)) == 0 && !l->reactions[i].label[dot - name])
            index = (int)i;
    if (index < 0)
        return LB_OK;
    const char *kf = NULL, *K = NULL;
    for (const syntax_argument *a = l->reactions[index].statement->settings; a; a = a->next) {
        if (strcmp(a->name, dot + 1) == 0)
            return fault_derived(l, name, a->value, err);
        kf = strcmp(a->name, "kf") == 0 ? a->name : kf;
        K = strcmp(a->name, "K") == 0 ? a->name : K;
    }
    if (kf && K && strcmp(dot + 1, "kr") == 0)
        return status_raise(err, LB_E_ARG, "set those", "`%s` cannot be set: the file derives it from kf and K",
                            name);
    return LB_OK;
}

static lb_status fault_unknown(lower *l, const char *name, lb_error *err)
{
    const char *remedy = NULL;
    if (strcmp(name, "T") == 0)
        remedy = "write `temperature`";
    else if (lower_find_species(l, name) >= 0)
        remedy = lower_text(l, "its initial concentration is `%s`", lower_bracket(l, name, "0"));
    if (!remedy)
        remedy = lower_near(l, &l->plain_names, name, NULL);
    return status_raise(err, LB_E_NAME, remedy, "nothing that can be set is called `%s`", name);
}

/* ---- Initial and feed concentrations that the file leaves at zero ----------------------------------- */

/* The species and the kind of `[X]0` or `[X]in`; -1 when the name is none such. */
static int split_concentration(lower *l, const char *name, lower_definition_kind *kind)
{
    const char *close = strrchr(name, ']');
    if (name[0] != '[' || !close || (strcmp(close, "]0") != 0 && strcmp(close, "]in") != 0))
        return -1;
    *kind = close[1] == '0' ? DEFINE_INITIAL : DEFINE_FEED;
    const char *from = name + 1, *to = close;
    if (*from == '"' && to - from >= 2) {
        from++;
        to--;
    }
    return lower_find_species(l, lower_text(l, "%.*s", (int)(to - from), from));
}

static lb_status add_concentration(lower *l, const char *name, int species, lower_definition_kind kind,
                                   int *plain, lb_error *err)
{
    lower_species *p = &l->species[species];
    if (p->held >= 0)
        return status_raise(err, LB_E_ARG, NULL, "`%s` cannot be set: `%s` is held", name, p->name);
    if (!p->in_reaction)
        return status_raise(err, LB_E_ARG, NULL, "`%s` cannot be set: `%s` is in no reaction", name, p->name);
    if (kind == DEFINE_FEED && l->residence < 0)
        return status_raise(err, LB_E_ARG, NULL, "`%s` cannot be set: the file has no residence time", name);
    if (kind == DEFINE_FEED && p->is_retained)
        return status_raise(err, LB_E_ARG, NULL, "`%s` cannot be set: `%s` is retained", name, p->name);
    *plain = lower_add_plain(l, name, kind == DEFINE_FEED ? CONSTANT_FEED : CONSTANT_NAMED, p->where);
    int definition = *plain < 0 ? -1 : lower_add_definition(l, kind, name, species, NULL);
    if (definition < 0)
        return LB_E_NOMEM;
    l->definitions[definition].plain = *plain;
    l->plains[*plain].is_initial = kind == DEFINE_INITIAL;
    if (!l->net->units.none) {
        dimension d = lower_dimension(1, 1, 0, 0, 0, 0);
        l->plains[*plain].dim = lower_known_form(l, &d);
    }
    if (kind == DEFINE_FEED)
        l->species[species].feed = definition;
    else
        l->species[species].initial = definition;
    return LB_OK;
}

/* ---- Both passes ------------------------------------------------------------------------------------- */

static lb_status find_plain(lower *l, const char *name, int *plain, lb_error *err)
{
    *plain = names_find(&l->plain_names, name);
    if (*plain >= 0)
        return LB_OK;
    int definition = names_find(&l->definition_names, name);
    if (definition >= 0)
        return fault_derived(l, name, l->definitions[definition].statement->value, err);
    lower_definition_kind kind;
    int species = split_concentration(l, name, &kind);
    if (species >= 0)
        return add_concentration(l, name, species, kind, plain, err);
    lb_status status = fault_slot(l, name, err);
    return status == LB_OK ? fault_unknown(l, name, err) : status;
}

lb_status lower_settings(lower *l, lb_error *err)
{
    for (size_t i = 0; i < l->setting_count; i++) {
        struct given given;
        int plain;
        lb_status status = find_plain(l, normalise(l, l->settings[i].name), &plain, err);
        if (status == LB_OK)
            status = read_value(l, &l->settings[i], &given, err);
        if (status != LB_OK || l->status != LB_OK)
            return status;
        lower_plain *p = &l->plains[plain];
        lower_replacement *set = arena_alloc(l->memory, sizeof *set);
        if (!set)
            return status_no_memory(err);
        *set = (lower_replacement){.setting = (int)i, .has_unit = given.has_unit, .unit = given.measure.dim};
        p->set = set;
        p->stored = given.has_unit ? unit_to_stored(&l->net->units, &given.measure, given.number) : given.number;
        if (!isfinite(p->stored))
            return status_raise(err, LB_E_ARG, NULL,
                                "`%s` cannot be set to `%s`: too large in the units of the file", p->name,
                                l->settings[i].value);
    }
    return LB_OK;
}

static lb_status check_dimension(lower *l, const lower_plain *p, const lb_setting *s, lb_error *err)
{
    dimension d, kelvin = lower_dimension(0, 1, 0, 0, 0, 1);
    int num, den;
    if (l->net->units.none || !infer_resolve(&l->inf, p->dim, &d))
        return LB_OK;
    const char *own = lower_dimension_text(l, &d);
    if (p->set->has_unit && !dimension_equal(&d, &p->set->unit))
        return status_raise(err, LB_E_ARG,
                            lower_text(l, "`%s` is %s%s", p->name, dimension_is_none(&d) ? "" : "in ", own),
                            "`%s` cannot be set to `%s`: the unit does not fit", p->name, s->value);
    if (!p->set->has_unit && !dimension_equal(&d, &kelvin)
        && (d.num[DIMENSION_ENERGY] != 0 || d.num[DIMENSION_TEMPERATURE] != 0
            || !dimension_is_concentration_power(&d, &num, &den)))
        return status_raise(
            err, LB_E_ARG,
            lower_text(l, "write a unit, such as `%s`", strcmp(own, "J/mol") == 0 ? "kJ/mol" : own),
            "`%s` cannot be set to `%s`: a number without a unit carries only concentration and time", p->name,
            s->value);
    return LB_OK;
}

static lb_status check_sign(const lower_plain *p, const lb_setting *s, lb_error *err)
{
    bool is_good = p->sign == SIGN_ANY || (p->sign == SIGN_NOT_NEGATIVE ? p->stored >= 0 : p->stored > 0);
    return is_good
               ? LB_OK
               : status_raise(err, LB_E_ARG, NULL, "`%s` cannot be set to `%s`: a%s %s is %s", p->name, s->value,
                              strchr("aeiou", p->sign_why[0]) ? "n" : "", p->sign_why, p->sign == SIGN_POSITIVE ? "positive" : "not negative");
}

lb_status lower_check_settings(lower *l, lb_error *err)
{
    for (size_t i = 0; i < l->plain_count; i++) {
        const lower_plain *p = &l->plains[i];
        if (!p->set)
            continue;
        const lb_setting *s = &l->settings[p->set->setting];
        lb_status status = check_dimension(l, p, s, err);
        if (status == LB_OK)
            status = check_sign(p, s, err);
        if (status != LB_OK)
            return status;
    }
    return LB_OK;
}
