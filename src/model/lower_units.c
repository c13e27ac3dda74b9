/* The `units` statement, and units where expressions name them.
 *
 * `units M s`: the last factor is the unit of time, what stands before it the
 * unit of concentration.  The statement comes before all others but the title,
 * since it decides what is a unit at all. */
#include <stdio.h>
#include <string.h>

#include "model/lower.h"

enum { DEEPEST_UNIT = 32 };

bool lower_is_unit_name(const lower *l, const char *name)
{
    unit u;
    return !l->net->units.none && unit_find(name, &u);
}

/* An exponent as written: a number, signed, or a fraction in parentheses. */
static bool read_exponent(const syntax_expression *node, rational *out)
{
    if (node->depth > 8)
        return false;
    rational left, right;
    switch (node->kind) {
    case SYNTAX_NUMBER:
        return rational_near(node->number, out);
    case SYNTAX_NEGATE:
        if (!read_exponent(node->left, out))
            return false;
        out->num = -out->num;
        return true;
    case SYNTAX_GROUP:
        return read_exponent(node->left, out);
    case SYNTAX_DIVIDE:
        return read_exponent(node->left, &left) && read_exponent(node->right, &right) && right.num != 0
               && rational_multiply(left, rational_of(right.den, right.num), out);
    default:
        return false;
    }
}

/* NAME or NAME^number with the name of a unit. */
static bool read_factor(const syntax_expression *node, const char **name, rational *power)
{
    *power = (rational){1, 1};
    if (node->kind == SYNTAX_POWER) {
        if (!read_exponent(node->right, power))
            return false;
        node = node->left;
    }
    unit u;
    *name = node->text;
    return node->kind == SYNTAX_NAME && unit_find(node->text, &u)
           && power->num <= 1000000 && power->num >= -1000000;
}

bool lower_unit_factor(const lower *l, const syntax_expression *node, unit *out)
{
    const char *name;
    rational power;
    if (l->net->units.none || !read_factor(node, &name, &power) || !unit_find(name, out))
        return false;
    return unit_power(out, (int)power.num, (int)power.den, out);
}

/* What others call them. */
static const char *const aliases[][2] = {
    {"sec", "s"},      {"second", "s"}, {"seconds", "s"}, {"msec", "ms"},   {"minute", "min"}, {"minutes", "min"},
    {"hr", "h"},       {"hour", "h"},   {"hours", "h"},   {"l", "L"},       {"ml", "mL"},      {"liter", "L"},
    {"litre", "L"},    {"molar", "M"},  {"mole", "mol"},  {"moles", "mol"}, {"kelvin", "K"},   {"joule", "J"},
    {"molecules", "molecule"}, {"molec", "molecule"},     {"kj", "kJ"},     {"Kcal", "kcal"},
};

const char *lower_unit_remedy(lower *l, const char *name)
{
    size_t count, letters = strlen(name);
    const char *const *known = unit_names(&count);
    unit u;
    while (letters > 0 && name[letters - 1] >= '0' && name[letters - 1] <= '9')
        letters--;
    if (name[letters] && unit_find(lower_text(l, "%.*s", (int)letters, name), &u))
        return lower_text(l, "write `%.*s^%s`", (int)letters, name, name + letters);
    if (strncmp(name, "\xC2\xB5", 2) == 0 || strncmp(name, "\xCE\xBC", 2) == 0)  /* micro sign, Greek mu */
        return lower_text(l, "write `u%s`", name + 2);
    for (size_t i = 0; i < sizeof aliases / sizeof *aliases; i++)
        if (strcmp(aliases[i][0], name) == 0)
            return lower_text(l, "write `%s`", aliases[i][1]);
    const char *near = lb_nearest(name, known, count);
    return near ? lower_text(l, "did you mean `%s`?", near)
                : "the units are M mM uM nM pM, mol molecule, L mL, m dm cm, s ms min h, K, J kJ cal kcal";
}

const char *lower_dimension_text(lower *l, const dimension *d)
{
    if (dimension_is_none(d))
        return "a pure number";
    buffer text;
    buffer_init(&text);
    unit_write(&l->net->units, d, &text);
    const char *copy = lower_text(l, "%s", buffer_get(&text));
    if (buffer_status(&text) != LB_OK)
        lower_no_memory(l);
    buffer_clear(&text);
    return copy;
}

/* ---- The statement ---------------------------------------------------------------- */

/* Factors of the statement in the order of the text. */
struct list {
    struct { unit_factor f; bool is_juxtaposed; } item[UNIT_FACTORS + 1];
    int count;
    const syntax_expression *wrong;     /* the first thing that is no unit */
};

static void flatten(const syntax_expression *node, int sign, bool is_juxtaposed, struct list *out)
{
    const char *name;
    rational power;
    if (out->wrong)
        return;
    if (node->depth <= DEEPEST_UNIT
        && (node->kind == SYNTAX_JUXTAPOSED || node->kind == SYNTAX_DIVIDE || node->kind == SYNTAX_MULTIPLY)) {
        flatten(node->left, sign, is_juxtaposed, out);
        flatten(node->right, node->kind == SYNTAX_DIVIDE ? -sign : sign, node->kind == SYNTAX_JUXTAPOSED, out);
    } else if (read_factor(node, &name, &power) && out->count <= UNIT_FACTORS) {
        unit_factor *f = &out->item[out->count].f;
        snprintf(f->name, sizeof f->name, "%s", name);
        f->num = sign * (int)power.num;
        f->den = (int)power.den;
        out->item[out->count++].is_juxtaposed = is_juxtaposed && node->kind == SYNTAX_NAME;
    } else {
        out->wrong = node;
    }
}

static const char remedy[] =
    "write for example `units M s`, `units mM min`, `units molecule/cm^3 s` or `units none`";

static void fault_wrong(lower *l, const syntax_expression *node)
{
    const syntax_expression *name = node->kind == SYNTAX_POWER ? node->left : node;
    unit u;
    if (name->kind == SYNTAX_NAME && !unit_find(name->text, &u))
        diagnostics_fault(l->list, name->where, lower_unit_remedy(l, name->text), "there is no unit `%s`",
                          name->text);
    else
        diagnostics_fault(l->list, node->where, remedy,
                          "`units` takes a unit of concentration and a unit of time");
}

/* The unit of concentration: all factors but the last. */
static bool set_concentration(unit_system *system, const struct list *factors)
{
    unit all = unit_one();
    for (int i = 0; i + 1 < factors->count; i++) {
        unit one;
        const unit_factor *f = &factors->item[i].f;
        if (!unit_find(f->name, &one) || !unit_power(&one, f->num, f->den, &one)
            || !unit_multiply(&all, &one, &all))
            return false;
        system->factor[i] = *f;
    }
    system->factor_count = factors->count - 1;
    system->concentration = all;
    dimension wanted;
    return dimension_concentration_time(1, 1, 0, 1, &wanted) && dimension_equal(&all.dim, &wanted);
}

static void write_concentration(lower *l, unit_system *system)
{
    buffer text;
    buffer_init(&text);
    unit_write(system, &system->concentration.dim, &text);
    snprintf(system->concentration_text, sizeof system->concentration_text, "%s", buffer_get(&text));
    if (buffer_status(&text) != LB_OK)
        lower_no_memory(l);
    buffer_clear(&text);
}

static void read_units(lower *l, const syntax_statement *s)
{
    unit_system system;
    unit_system_init(&system);
    struct list factors = {.count = 0};
    flatten(s->value, 1, true, &factors);
    if (factors.wrong) {
        fault_wrong(l, factors.wrong);
        return;
    }
    int last = factors.count - 1;
    dimension time;
    bool is_right =
        last >= 1 && factors.item[last].is_juxtaposed && unit_find(factors.item[last].f.name, &system.time)
        && dimension_concentration_time(0, 1, 1, 1, &time) && dimension_equal(&system.time.dim, &time)
        && factors.item[last].f.den == 1 && (factors.item[last].f.num == 1 || factors.item[last].f.num == -1);
    if (!is_right || !set_concentration(&system, &factors)) {
        diagnostics_fault(l->list, s->value->where, remedy,
                          "`units` takes a unit of concentration and then a unit of time");
        return;
    }
    snprintf(system.time_text, sizeof system.time_text, "%s", factors.item[last].f.name);
    write_concentration(l, &system);
    l->net->units = system;
}

void lower_units(lower *l)
{
    const syntax_statement *units = NULL;
    bool comes_first = true;
    unit_system_init(&l->net->units);
    for (const syntax_statement *s = l->tree->first; s; s = s->next) {
        if (s->kind != SYNTAX_UNITS) {
            comes_first = comes_first && s->kind == SYNTAX_TITLE;
            continue;
        }
        if (units) {
            diagnostics_fault(l->list, s->where, "leave one of them out", "`units` stands already in line %d",
                              units->where.line);
            continue;
        }
        units = s;
        if (!comes_first)
            diagnostics_fault(l->list, s->where, "move it up",
                              "`units` comes before all other statements but the title");
        if (s->value)
            read_units(l, s);
        else
            l->net->units.none = true;
    }
}
