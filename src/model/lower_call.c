/* Functions: exp, ln, log10, sqrt, and the three temperature laws.
 *
 *   arrhenius(A, n, Ea)        A (T/1 K)^n exp(-Ea/(R T)); n is 0 when left out
 *   arrhenius_ref(k, Tref, Ea) k exp(-(Ea/R) (1/T - 1/Tref))
 *   eyring(dH, dS)             (kB T/h) exp(dS/R) exp(-dH/(R T)), times (1 M)^(1-n) as
 *                              the rate constant of a step of order n (standard
 *                              concentration 1 M); s^-1 anywhere else
 *
 * Eyring, J. Chem. Phys. 3 (1935) 107; IUPAC Green Book, 3rd edition, 2.12. */
#include <math.h>
#include <string.h>

#include "model/lower.h"

#define BOLTZMANN_BY_PLANCK 20836619123.327576 /* kB/h in Hz/K: 1.380649e-23/6.62607015e-34, exact in the SI of 2019 */
#define GAS_CONSTANT 8.31446261815324          /* J/mol/K */

enum { MOST_ARGUMENTS = 3 };

struct function {
    const char *name;
    int count, required;
    const char *argument[MOST_ARGUMENTS];
    expression_kind kind;           /* of those without named arguments */
    const char *shape;
};

static const struct function functions[] = {
    {"exp", 1, 1, {NULL}, EXPRESSION_EXP, "exp(x)"},
    {"ln", 1, 1, {NULL}, EXPRESSION_LN, "ln(x)"},
    {"log10", 1, 1, {NULL}, EXPRESSION_LOG10, "log10(x)"},
    {"sqrt", 1, 1, {NULL}, EXPRESSION_SQRT, "sqrt(x)"},
    {"arrhenius", 3, 2, {"A", "Ea", "n"}, EXPRESSION_NUMBER, "arrhenius(A = 1e13 s^-1, n = 0, Ea = 80 kJ/mol)"},
    {"arrhenius_ref", 3, 3, {"k", "Tref", "Ea"}, EXPRESSION_NUMBER, "arrhenius_ref(k = 2 s^-1, Tref = 298.15 K, Ea = 80 kJ/mol)"},
    {"eyring", 2, 2, {"dH", "dS"}, EXPRESSION_NUMBER, "eyring(dH = 80 kJ/mol, dS = -20 J/mol/K)"},
};

enum { FUNCTION_COUNT = sizeof functions / sizeof *functions };

static const struct function *find_function(const char *name)
{
    for (int i = 0; i < FUNCTION_COUNT; i++)
        if (strcmp(functions[i].name, name) == 0)
            return &functions[i];
    return NULL;
}

static void fault_function(lower *l, const syntax_expression *node)
{
    const char *known[FUNCTION_COUNT];
    for (int i = 0; i < FUNCTION_COUNT; i++)
        known[i] = functions[i].name;
    const char *near = lb_nearest(node->text, known, FUNCTION_COUNT);
    const char *remedy = near ? lower_text(l, "did you mean `%s`?", near)
                              : "the functions are exp, ln, log10, sqrt, arrhenius, arrhenius_ref and eyring";
    if (strcmp(node->text, "log") == 0)
        remedy = "write `ln` or `log10`";
    else if (strcmp(node->text, "pow") == 0)
        remedy = "write `x^n`";
    else if (names_find(&l->definition_names, node->text) >= 0)
        remedy = "a product needs `*`";
    diagnostics_fault(l->list, node->where, remedy, "there is no function `%s`", node->text);
}

/* ---- Matching arguments -------------------------------------------------------------------- */

static int find_argument(const struct function *f, const char *name)
{
    for (int i = 0; i < f->count; i++)
        if (strcmp(f->argument[i], name) == 0)
            return i;
    return -1;
}

/* One argument of a function with names: its place, or -1 and a fault. */
static int match_argument(lower *l, const struct function *f, const syntax_argument *a,
                          const lower_value *const *found)
{
    const char *remedy = lower_text(l, "write `%s`", f->shape);
    if (!a->name) {
        diagnostics_fault(l->list, a->value->where, remedy, "the arguments of `%s` have names", f->name);
        return -1;
    }
    int i = find_argument(f, a->name);
    if (i < 0)
        diagnostics_fault(l->list, a->name_where, remedy, "`%s` has no argument `%s`", f->name, a->name);
    else if (found[i])
        diagnostics_fault(l->list, a->name_where, "leave one of the two out",
                          "the argument `%s` stands here twice", a->name);
    return i >= 0 && !found[i] ? i : -1;
}

/* Values in the order of the function's arguments; false after a fault. */
static bool match(lower *l, const struct function *f, const syntax_expression *node, lower_value *values,
                  lower_value *argument[MOST_ARGUMENTS])
{
    bool is_good = true;
    int i = 0;
    const lower_value *found[MOST_ARGUMENTS] = {NULL};
    for (const syntax_argument *a = node->first; a && is_good; a = a->next, i++) {
        int place = match_argument(l, f, a, found);
        if (place >= 0)
            found[place] = argument[place] = &values[i];
        is_good = is_good && place >= 0;
    }
    for (i = 0; i < f->required && is_good; i++) {
        if (found[i])
            continue;
        diagnostics_fault(l->list, node->where, lower_text(l, "write `%s`", f->shape),
                          "`%s` needs the argument `%s`", f->name, f->argument[i]);
        is_good = false;
    }
    return is_good;
}

/* ---- Elementary functions --------------------------------------------------------------------- */

static double compute(expression_kind kind, double x)
{
    switch (kind) {
    case EXPRESSION_EXP:   return exp(x);
    case EXPRESSION_LN:    return log(x);
    case EXPRESSION_LOG10: return log10(x);
    default:               return expression_power(x, 0.5);
    }
}

static lower_value elementary(lower *l, const struct function *f, const syntax_expression *node, lower_value *v,
                              int count)
{
    if (count != 1 || node->first->name) {
        diagnostics_fault(l->list, node->where, lower_text(l, "write `%s`", f->shape),
                          "`%s` takes one argument, without a name", f->name);
        return value_bad(node->where);
    }
    value_finish(l, v);
    dimension none = dimension_none();
    bool is_good = v->kind != VALUE_BAD;
    if (is_good && f->kind == EXPRESSION_SQRT)
        is_good = form_power(&v->dim, (rational){1, 2});
    else if (is_good)
        is_good = lower_need(l, v, &none, lower_text(l, "the argument of `%s`", f->name), NULL);
    if (!is_good)
        return value_bad(node->where);
    v->e = expression_unary(&l->net->graph, f->kind, v->e);
    v->number = v->has_state ? NAN : compute(f->kind, v->number);
    v->plain = -1;
    if (v->e == EXPRESSION_NONE)
        lower_no_memory(l);
    return *v;
}

/* ---- Temperature laws ----------------------------------------------------------------------------- */

/* Pairs of a node and its number at the file's constants. */
struct pair {
    expression e;
    double number;
};

static struct pair pair_of(const lower_value *v)
{
    return (struct pair){v->e, v->number};
}

static struct pair pair_number(lower *l, double number)
{
    return (struct pair){expression_number(&l->net->graph, number), number};
}

static struct pair pair_binary(lower *l, expression_kind kind, struct pair a, struct pair b)
{
    double number = kind == EXPRESSION_MULTIPLY ? a.number * b.number
                    : kind == EXPRESSION_DIVIDE ? a.number / b.number
                    : kind == EXPRESSION_SUBTRACT ? a.number - b.number
                                                  : expression_power(a.number, b.number);
    return (struct pair){expression_binary(&l->net->graph, kind, a.e, b.e), number};
}

/* factor * exp(-energy/(R T)) */
static struct pair boltzmann(lower *l, struct pair factor, struct pair energy, struct pair T)
{
    struct pair RT = pair_binary(l, EXPRESSION_MULTIPLY, pair_number(l, GAS_CONSTANT), T);
    struct pair ratio = pair_binary(l, EXPRESSION_DIVIDE, energy, RT);
    expression exponent = expression_unary(&l->net->graph, EXPRESSION_NEGATE, ratio.e);
    struct pair exponential = {expression_unary(&l->net->graph, EXPRESSION_EXP, exponent), exp(-ratio.number)};
    return pair_binary(l, EXPRESSION_MULTIPLY, factor, exponential);
}

static struct pair arrhenius(lower *l, lower_value **a, struct pair T)
{
    struct pair factor = pair_of(a[0]);
    if (a[2])
        factor = pair_binary(l, EXPRESSION_MULTIPLY, factor, pair_binary(l, EXPRESSION_POWER, T, pair_of(a[2])));
    return boltzmann(l, factor, pair_of(a[1]), T);
}

/* exp(-(Ea/R)(1/T - 1/Tref)): Boltzmann's factor with Ea (1 - T/Tref). */
static struct pair arrhenius_ref(lower *l, lower_value **a, struct pair T)
{
    struct pair ratio = pair_binary(l, EXPRESSION_DIVIDE, T, pair_of(a[1]));
    struct pair rest = pair_binary(l, EXPRESSION_SUBTRACT, pair_number(l, 1), ratio);
    return boltzmann(l, pair_of(a[0]), pair_binary(l, EXPRESSION_MULTIPLY, pair_of(a[2]), rest), T);
}

static struct pair eyring(lower *l, lower_value **a, struct pair T, const lower_context *context)
{
    unit frequency = unit_one(), molar;
    frequency.dim = lower_dimension(0, 1, -1, 0, 0, -1);
    unit_find("M", &molar);
    double order = context->has_order ? (double)context->order.num / (double)context->order.den : 1;
    double standard = pow(unit_to_stored(&l->net->units, &molar, 1), 1 - order);
    double prefactor = unit_to_stored(&l->net->units, &frequency, BOLTZMANN_BY_PLANCK) * standard;
    struct pair factor = pair_binary(l, EXPRESSION_MULTIPLY, pair_number(l, prefactor), T);
    struct pair entropy = pair_binary(l, EXPRESSION_DIVIDE, pair_of(a[1]), pair_number(l, GAS_CONSTANT));
    struct pair exponential = {expression_unary(&l->net->graph, EXPRESSION_EXP, entropy.e), exp(entropy.number)};
    return boltzmann(l, pair_binary(l, EXPRESSION_MULTIPLY, factor, exponential), pair_of(a[0]), T);
}

/* The dimension of eyring's value: s^-1, or what a step of its order needs. */
static form eyring_dimension(lower *l, const lower_context *context, span where)
{
    if (l->net->units.none)
        return form_none();
    rational order = context->has_order ? context->order : (rational){1, 1};
    dimension d;
    if (!dimension_concentration_time((int)(order.den - order.num), (int)order.den, -1, 1, &d)) {
        diagnostics_fault(l->list, where, NULL, "the dimension of this rate constant is beyond all sense");
        d = dimension_none();
    }
    return form_known(&d);
}

static bool need_energy(lower *l, lower_value *v, const char *name, int temperature)
{
    dimension d = lower_dimension(0, 1, 0, 1, -1, temperature);
    return lower_need(l, v, &d, lower_text(l, "`%s`", name), NULL);
}

/* Both arguments are looked at, so that each reports its own fault. */
static bool need_all(lower *l, const struct function *f, lower_value **a)
{
    dimension none = dimension_none(), kelvin = lower_dimension(0, 1, 0, 0, 0, 1);
    bool first, second;
    if (strcmp(f->name, "arrhenius") == 0) {
        first = need_energy(l, a[1], "Ea", 0);
        second = !a[2] || lower_need(l, a[2], &none, "`n`", NULL);
    } else if (strcmp(f->name, "arrhenius_ref") == 0) {
        first = need_energy(l, a[2], "Ea", 0);
        second = lower_need(l, a[1], &kelvin, "`Tref`", NULL);
    } else {
        first = need_energy(l, a[0], "dH", 0);
        second = need_energy(l, a[1], "dS", -1);
    }
    return first && second;
}

static lower_value temperature_law(lower *l, const struct function *f, const syntax_expression *node,
                                   lower_value *values, int count, const lower_context *context)
{
    lower_value *a[MOST_ARGUMENTS] = {NULL}, v = value_bad(node->where);
    bool is_good = true, has_state = false;
    for (int i = 0; i < count; i++) {
        value_finish(l, &values[i]);
        is_good = is_good && values[i].kind != VALUE_BAD;
        has_state = has_state || values[i].has_state;
    }
    lower_value T = value_temperature(l, node->where);
    if (!match(l, f, node, values, a) || !is_good || !need_all(l, f, a) || T.kind == VALUE_BAD)
        return v;
    struct pair result;
    if (strcmp(f->name, "arrhenius") == 0)
        result = arrhenius(l, a, pair_of(&T));
    else if (strcmp(f->name, "arrhenius_ref") == 0)
        result = arrhenius_ref(l, a, pair_of(&T));
    else
        result = eyring(l, a, pair_of(&T), context);
    form dim = strcmp(f->name, "eyring") == 0 ? eyring_dimension(l, context, node->where) : a[0]->dim;
    v = value_general(node->where, result.e, has_state ? NAN : result.number, dim);
    v.has_state = has_state;
    if (v.e == EXPRESSION_NONE)
        lower_no_memory(l);
    return v;
}

lower_value value_call(lower *l, const syntax_expression *node, lower_value *arguments, int count,
                       const lower_context *context)
{
    const struct function *f = find_function(node->text);
    if (!f) {
        fault_function(l, node);
        return value_bad(node->where);
    }
    return f->argument[0] ? temperature_law(l, f, node, arguments, count, context)
                          : elementary(l, f, node, arguments, count);
}
