/* Reactions: terms with exact coefficients, rate constants and rate laws. */
#include <math.h>
#include <string.h>

#include "model/lower.h"

/* The settings of a reaction by name; NULL where it has none. */
struct settings {
    const syntax_argument *k, *kf, *kr, *K, *v;
};

static const syntax_argument **setting_place(struct settings *s, const char *name)
{
    if (strcmp(name, "k") == 0)
        return &s->k;
    if (strcmp(name, "kf") == 0)
        return &s->kf;
    if (strcmp(name, "kr") == 0)
        return &s->kr;
    if (strcmp(name, "K") == 0)
        return &s->K;
    return strcmp(name, "v") == 0 ? &s->v : NULL;
}

/* ---- Which settings are there ------------------------------------------------------------- */

static bool read_settings(lower *l, const syntax_statement *s, struct settings *out)
{
    static const char *const known[] = {"k", "kf", "kr", "K", "v"};
    bool is_good = true;
    *out = (struct settings){NULL, NULL, NULL, NULL, NULL};
    for (const syntax_argument *a = s->settings; a; a = a->next) {
        const syntax_argument **place = setting_place(out, a->name);
        if (!place) {
            const char *near = lb_nearest(a->name, known, sizeof known / sizeof *known);
            diagnostics_fault(l->list, a->name_where,
                              near ? lower_text(l, "did you mean `%s`?", near)
                                   : "a reaction has k, or kf and kr, or kf and K, or v",
                              "a reaction has no setting `%s`", a->name);
        } else if (*place) {
            diagnostics_fault(l->list, a->name_where, "leave one of the two out", "`%s` stands here twice",
                              a->name);
        } else {
            *place = a;
            continue;
        }
        is_good = false;
    }
    return is_good;
}

static bool fault_settings(lower *l, span where, const char *remedy, const char *message)
{
    diagnostics_fault(l->list, where, remedy, "%s", message);
    return false;
}

/* A one-way arrow takes k or v, a double one kf with kr or K. */
static bool check_settings(lower *l, const syntax_statement *s, const struct settings *g)
{
    const syntax_argument *other = g->kf ? g->kf : g->kr ? g->kr : g->K;
    if (!s->is_reversible) {
        if (other)
            return fault_settings(l, other->name_where, "write `k = ...`, or `<->` for a reversible reaction",
                                  "kf, kr and K belong to a reversible reaction, and this arrow goes one way");
        if (g->k && g->v)
            return fault_settings(l, g->v->name_where, "leave one of the two out",
                                  "a reaction has either k or v");
        if (!g->k && !g->v)
            return fault_settings(l, s->arrow_where, "write `, k = ...` behind it, or `, v = ...`",
                                  "this reaction has no rate");
        return true;
    }
    if (g->v)
        return fault_settings(l, g->v->name_where, "write `->`; the rate law may be negative",
                              "a rate law belongs to a one-way arrow");
    if (g->k)
        return fault_settings(l, g->k->name_where, "write `kf = ..., kr = ...` or `kf = ..., K = ...`",
                              "a reversible reaction has two rate constants, and k is one");
    if (g->kf && g->kr && g->K)
        return fault_settings(l, g->K->name_where, "leave one of the three out",
                              "kf, kr and K are not independent: K is kf/kr");
    if (!g->kf)
        return fault_settings(l, s->arrow_where, "write `kf = ..., kr = ...` or `kf = ..., K = ...`",
                              "this reversible reaction has no kf");
    if (!g->kr && !g->K)
        return fault_settings(l, s->arrow_where, "write `kr = ...` or `K = ...` behind kf",
                              "this reversible reaction has neither kr nor K");
    return true;
}

/* ---- Terms --------------------------------------------------------------------------------- */

/* A coefficient in digits, exact; false after a fault. */
static bool read_coefficient(lower *l, const syntax_term *term, rational *out)
{
    *out = (rational){1, 1};
    if (!term->coefficient)
        return true;
    rational_outcome outcome = rational_read(term->coefficient->text, out);
    if (outcome == RATIONAL_TOO_LARGE)
        diagnostics_fault(l->list, term->coefficient->where, NULL, "a coefficient is at most 1000000");
    else if (outcome == RATIONAL_TOO_LONG)
        diagnostics_fault(l->list, term->coefficient->where, NULL, "a coefficient has at most 15 digits");
    else if (out->num == 0)
        diagnostics_fault(l->list, term->coefficient->where, "leave the species out",
                          "the coefficient of `%s` is zero", term->species.text);
    return outcome == RATIONAL_OK && out->num != 0;
}

/* A coefficient in parentheses: a pure number of constants, not negative. */
static bool evaluate_coefficient(lower *l, const syntax_term *term, bool is_product, expression *out)
{
    if (!is_product) {
        diagnostics_fault(l->list, term->coefficient->where, "write a rate law, `v = ...`",
                          "a coefficient on the left is a plain number");
        return false;
    }
    lower_context context = {.what = "a coefficient"};
    lower_value v = lower_evaluate(l, term->coefficient->expression, &context);
    dimension none = dimension_none();
    lower_need(l, &v, &none, "a coefficient", NULL);
    lower_require_sign(l, &v, SIGN_NOT_NEGATIVE, "coefficient", "a coefficient");
    *out = v.e;
    return v.kind != VALUE_BAD;
}

/* One side to the network; *order becomes the sum of its coefficients, with
 * is_known false when that is not a rational of reasonable size. */
struct side {
    rational order;
    bool is_known;
};

static bool add_side(lower *l, lower_reaction *r, const syntax_term *term, bool is_product, struct side *side)
{
    bool is_good = true;
    *side = (struct side){{0, 1}, true};
    for (; term && l->status == LB_OK; term = term->next) {
        rational coefficient = {1, 1};
        expression e = EXPRESSION_NONE;
        bool is_expression = term->coefficient && term->coefficient->expression;
        bool is_fine = is_expression ? evaluate_coefficient(l, term, is_product, &e)
                                        : read_coefficient(l, term, &coefficient);
        int species = lower_find_species(l, term->species.text);
        is_good = is_good && is_fine;
        side->is_known = side->is_known && !is_expression && is_fine
                         && rational_add(side->order, coefficient, &side->order);
        if (is_fine && species >= 0
            && network_add_term(l->net, r->index, is_product, l->species[species].index, coefficient.num,
                                coefficient.den, e) < 0)
            lower_no_memory(l);
    }
    return is_good;
}

/* ---- Rates ----------------------------------------------------------------------------------- */

static const char law_remedy[] = "write the whole rate law, `v = ...`";

/* State that a value has concentration^(to - from)/time, where both are known. */
static void need_order(lower *l, lower_value *v, const struct side *from, const struct side *to, int time,
                       const char *what, const char *remedy)
{
    rational power = {-from->order.num, from->order.den};
    dimension d;
    if (!from->is_known || !to->is_known || !rational_add(power, to->order, &power)
        || power.num > 1000000 || power.num < -1000000 || power.den > 1000000
        || !dimension_concentration_time((int)power.num, (int)power.den, time, 1, &d))
        return;
    lower_need(l, v, &d, what, remedy);
}

/* What a setting is called in messages. */
static const char *what_is(const char *name)
{
    if (strcmp(name, "K") == 0)
        return "the equilibrium constant K";
    if (strcmp(name, "kf") == 0)
        return "the rate constant kf";
    return strcmp(name, "kr") == 0 ? "the rate constant kr" : "the rate constant k";
}

/* Where eyring in a definition, which is of first order, is meant for another one. */
static const char *eyring_remedy(const lower *l, const syntax_expression *node)
{
    int index = node->kind == SYNTAX_NAME ? names_find(&l->definition_names, node->text) : -1;
    const syntax_statement *s = index >= 0 ? l->definitions[index].statement : NULL;
    bool is_eyring = s && s->value && s->value->kind == SYNTAX_CALL && strcmp(s->value->text, "eyring") == 0;
    return is_eyring ? "in a definition eyring(...) is in s^-1: for a second-order step write `eyring(...)/M`"
                     : NULL;
}

/* A rate constant of a step that uses up `side`. */
static lower_value rate_constant(lower *l, const syntax_argument *a, const struct side *side)
{
    const struct side one = {{1, 1}, true};
    const char *what = what_is(a->name);
    lower_context context = {.what = what, .state_remedy = law_remedy, .has_order = side->is_known
                             && side->order.num <= 1000000 && side->order.den <= 1000000, .order = side->order};
    lower_value v = lower_evaluate(l, a->value, &context);
    need_order(l, &v, side, &one, -1, what, eyring_remedy(l, a->value));
    lower_require_sign(l, &v, SIGN_NOT_NEGATIVE, "rate constant", what);
    return v;
}

static void add_mass_action(lower *l, const lower_reaction *r, network_direction direction, expression k)
{
    if (network_add_mass_action(l->net, r->index, direction, k) < 0)
        lower_no_memory(l);
}

/* kr is given, or follows from K. */
static void add_reverse(lower *l, const lower_reaction *r, const struct settings *g, lower_value kf,
                        const struct side *left, const struct side *right)
{
    if (g->kr) {
        lower_value kr = rate_constant(l, g->kr, right);
        if (kr.kind != VALUE_BAD && kf.kind != VALUE_BAD)
            add_mass_action(l, r, STEP_REVERSE, kr.e);
        return;
    }
    const char *what = what_is("K");
    lower_context context = {.what = what, .state_remedy = law_remedy};
    lower_value K = lower_evaluate(l, g->K->value, &context);
    need_order(l, &K, left, right, 0, what, "K is kf/kr; the reverse rate constant is called kr");
    lower_require_sign(l, &K, SIGN_POSITIVE, "equilibrium constant", what);
    if (K.kind == VALUE_BAD || kf.kind == VALUE_BAD)
        return;
    if (K.number > 0 && !isfinite(kf.number / K.number)) {
        diagnostics_fault(l->list, K.where, NULL,
                          "the reverse rate constant kf/K comes out without a finite value");
        return;
    }
    add_mass_action(l, r, STEP_REVERSE, expression_binary(&l->net->graph, EXPRESSION_DIVIDE, kf.e, K.e));
}

static void add_law(lower *l, lower_reaction *r, const syntax_argument *a)
{
    lower_context context = {.allows_state = true, .what = "v"};
    lower_value v = lower_evaluate(l, a->value, &context);
    dimension d = lower_dimension(1, 1, -1, 0, 0, 0);
    lower_need(l, &v, &d, "the rate law v", NULL);
    if (v.kind != VALUE_BAD && !v.has_state && v.plain < 0 && !isfinite(v.number)) {
        diagnostics_fault(l->list, v.where, NULL, "the rate law v comes out without a finite value");
        return;
    }
    r->has_law = v.kind != VALUE_BAD;
    if (r->has_law && network_add_step(l->net, r->index, STEP_FORWARD, v.e) < 0)
        lower_no_memory(l);
}

static void add_rates(lower *l, lower_reaction *r, const struct settings *g, const struct side *left,
                      const struct side *right)
{
    if (g->v) {
        add_law(l, r, g->v);
        return;
    }
    lower_value k = rate_constant(l, g->k ? g->k : g->kf, left);
    if (k.kind != VALUE_BAD)
        add_mass_action(l, r, STEP_FORWARD, k.e);
    if (r->statement->is_reversible)
        add_reverse(l, r, g, k, left, right);
}

static void add_reaction(lower *l, lower_reaction *r)
{
    const syntax_statement *s = r->statement;
    r->index = network_add_reaction(l->net, r->label, s->is_reversible);
    if (r->index < 0) {
        lower_no_memory(l);
        return;
    }
    l->net->reactions[r->index].line = s->where.line;
    struct side left, right;
    struct settings settings;
    bool is_good = add_side(l, r, s->left, false, &left);
    is_good = add_side(l, r, s->right, true, &right) && is_good;
    r->is_bad = r->is_bad || !is_good;
    if (read_settings(l, s, &settings) && check_settings(l, s, &settings) && is_good && l->status == LB_OK)
        add_rates(l, r, &settings, &left, &right);
}

/* ---- All of them ----------------------------------------------------------------------------- */

/* The balance reads a reaction's terms again. */
static bool has_formulas(const lower *l)
{
    for (size_t i = 0; i < l->species_count; i++)
        if (l->species[i].formula)
            return true;
    return false;
}

/* Release the page when reaction i is the last thing in it; gives the page to wait for. */
static syntax_page *release_page(lower *l, syntax_page *page, size_t i)
{
    while (page && !page->is_plain)
        page = page->next;
    if (!page || !page->next || page->last != l->reactions[i].statement)
        return page;
    for (int back = 0; back < page->statements; back++)
        l->reactions[i - (size_t)back].statement = NULL;
    syntax_release(page);
    return page->next;
}

void lower_reactions(lower *l)
{
    syntax_page *page = has_formulas(l) ? NULL : l->tree->pages;
    for (size_t i = 0; i < l->reaction_count && l->status == LB_OK; i++) {
        add_reaction(l, &l->reactions[i]);
        page = release_page(l, page, i);
    }
}
