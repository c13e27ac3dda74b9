/* Element and charge balance of reactions whose species all have formulas.
 *
 * Coefficients are exact decimals with at most 15 places, so both sides are
 * summed in whole multiples of 10^-15.  A coefficient that is an expression is
 * taken at the constants of the file, and the sums then compared as doubles.
 * A source or a sink crosses the boundary of the system and is not checked. */
#include <math.h>
#include <string.h>

#include "model/lower.h"

__extension__ typedef __int128 wide;

static const int64_t SCALE = 1000000000000000;

enum { CHARGE = FORMULA_ELEMENTS, QUANTITIES, SHOWN = 4 };

struct tally {
    wide exact[2][QUANTITIES];      /* left, right; in 10^-15 */
    double sum[2][QUANTITIES];
    bool is_exact;
};

/* ---- Formulas ------------------------------------------------------------------------------- */

void lower_formulas(lower *l)
{
    for (size_t i = 0; i < l->species_count && l->status == LB_OK; i++) {
        lower_species *p = &l->species[i];
        formula_fault fault;
        if (!p->formula)
            continue;
        lb_status status = formula_parse(p->formula->formula, &p->atoms, &fault);
        p->has_atoms = status == LB_OK;
        if (status == LB_E_NOMEM)
            lower_no_memory(l);
        if (status != LB_E_ARG)
            continue;
        span where = p->formula->formula_where;
        where.column += fault.offset;
        where.length = fault.length;
        diagnostics_fault(l->list, where, fault.remedy, "%s", fault.message);
    }
}

/* ---- Sums ------------------------------------------------------------------------------------ */

static void add_quantity(struct tally *t, int side, int quantity, int64_t count, const rational *exact,
                         double coefficient)
{
    if (exact)
        t->exact[side][quantity] += (wide)count * exact->num * (SCALE / exact->den);
    t->sum[side][quantity] += (double)count * coefficient;
}

static void add_term(lower *l, struct tally *t, int side, const syntax_term *term)
{
    rational exact = {1, 1};
    double coefficient = 1;
    bool is_expression = term->coefficient && term->coefficient->expression;
    if (is_expression) {
        lower_context context = {.what = "a coefficient"};
        coefficient = lower_evaluate(l, term->coefficient->expression, &context).number;
        t->is_exact = false;
    } else if (term->coefficient) {
        rational_read(term->coefficient->text, &exact);
        coefficient = (double)exact.num / (double)exact.den;
    }
    const rational *known = is_expression ? NULL : &exact;
    const formula *f = &l->species[lower_find_species(l, term->species.text)].atoms;
    for (int i = 0; i < f->atom_count; i++)
        add_quantity(t, side, f->atoms[i].element, f->atoms[i].count, known, coefficient);
    add_quantity(t, side, CHARGE, f->charge, known, coefficient);
}

static bool is_balanced(const struct tally *t, int quantity)
{
    double left = t->sum[0][quantity], right = t->sum[1][quantity];
    if (t->is_exact)
        return t->exact[0][quantity] == t->exact[1][quantity];
    return fabs(left - right) <= 1e-9 * fmax(fabs(left), fabs(right));
}

static void report(lower *l, const lower_reaction *r, const struct tally *t)
{
    const char *list = "";
    int shown = 0;
    for (int i = 0; i < QUANTITIES && shown < SHOWN; i++) {
        if (is_balanced(t, i))
            continue;
        list = lower_text(l, "%s%s%s (%.10g on the left, %.10g on the right)", list, shown > 0 ? ", " : "",
                          i == CHARGE ? "charge" : formula_symbol(i), t->sum[0][i], t->sum[1][i]);
        shown++;
    }
    if (shown > 0)
        diagnostics_fault(l->list, r->statement->arrow_where, NULL, "`%s` is not balanced in %s", r->label, list);
}

static bool have_formulas(const lower *l, const syntax_term *term)
{
    for (; term; term = term->next) {
        int species = lower_find_species(l, term->species.text);
        if (species < 0 || !l->species[species].has_atoms)
            return false;
    }
    return true;
}

void lower_balance(lower *l)
{
    for (size_t i = 0; i < l->reaction_count && l->status == LB_OK; i++) {
        const lower_reaction *r = &l->reactions[i];
        const syntax_statement *s = r->statement;
        if (r->is_bad || !s || !s->left || !s->right || !have_formulas(l, s->left) || !have_formulas(l, s->right))
            continue;
        struct tally t = {.is_exact = true};
        for (const syntax_term *term = s->left; term; term = term->next)
            add_term(l, &t, 0, term);
        for (const syntax_term *term = s->right; term; term = term->next)
            add_term(l, &t, 1, term);
        report(l, r, &t);
    }
}
