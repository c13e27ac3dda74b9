/* Chemical formulas: atoms and charge.
 *
 * A descent over the text:
 *     formula = part { dot count? part } [ '^' charge ] | "e^-"
 *     part    = { ( element | '(' part ')' | '[' part ']' ) count? }
 *     charge  = digits? ( '+' | '-' )
 * with `.` or a middle dot between the parts of a hydrate.  Atoms are counted in
 * one array by element.  Elements: IUPAC's table of 118, and D and T, which
 * balance as elements of their own. */
#include "model/formula.h"

#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#include "base/memory.h"

static const char *const symbols[FORMULA_ELEMENTS] = {
    "H",  "D",  "T",  "He", "Li", "Be", "B",  "C",  "N",  "O",  "F",  "Ne", "Na", "Mg", "Al", "Si", "P",  "S",
    "Cl", "Ar", "K",  "Ca", "Sc", "Ti", "V",  "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As", "Se",
    "Br", "Kr", "Rb", "Sr", "Y",  "Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag", "Cd", "In", "Sn", "Sb", "Te",
    "I",  "Xe", "Cs", "Ba", "La", "Ce", "Pr", "Nd", "Pm", "Sm", "Eu", "Gd", "Tb", "Dy", "Ho", "Er", "Tm", "Yb",
    "Lu", "Hf", "Ta", "W",  "Re", "Os", "Ir", "Pt", "Au", "Hg", "Tl", "Pb", "Bi", "Po", "At", "Rn", "Fr", "Ra",
    "Ac", "Th", "Pa", "U",  "Np", "Pu", "Am", "Cm", "Bk", "Cf", "Es", "Fm", "Md", "No", "Lr", "Rf", "Db", "Sg",
    "Bh", "Hs", "Mt", "Ds", "Rg", "Cn", "Nh", "Fl", "Mc", "Lv", "Ts", "Og"};

enum { DEEPEST_GROUP = 20, COUNT_LIMIT = 1000000, CHARGE_LIMIT = 1000 };

struct reader {
    const char *start, *at;
    formula_fault *fault;
    bool failed;
};

const char *formula_symbol(int element)
{
    return symbols[element];
}

void formula_clear(formula *f)
{
    memory_free(f->atoms);
    *f = (formula){.atoms = NULL};
}

static int characters(const char *from, const char *to)
{
    int count = 0;
    for (; from < to; from++)
        count += (*from & 0xC0) != 0x80;
    return count;
}

/* The first failure stays.  It spans the text from `from` to `to`. */
__attribute__((format(printf, 5, 6)))
static void fail(struct reader *r, const char *from, const char *to, const char *remedy, const char *format, ...)
{
    if (r->failed)
        return;
    r->failed = true;
    r->fault->offset = characters(r->start, from);
    r->fault->length = characters(from, to);
    if (r->fault->length < 1)
        r->fault->length = 1;
    va_list list;
    va_start(list, format);
    vsnprintf(r->fault->message, sizeof r->fault->message, format, list);
    va_end(list);
    snprintf(r->fault->remedy, sizeof r->fault->remedy, "%s", remedy);
}

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

static bool is_capital(char c)
{
    return c >= 'A' && c <= 'Z';
}

static bool is_small(char c)
{
    return c >= 'a' && c <= 'z';
}

/* A whole number if one stands here, else 1. */
static int64_t read_count(struct reader *r)
{
    const char *from = r->at;
    if (!is_digit(*from))
        return 1;
    int64_t count = 0;
    for (; is_digit(*r->at); r->at++)
        count = count > COUNT_LIMIT ? count : 10 * count + (*r->at - '0');
    if (count == 0)
        fail(r, from, r->at, "leave the element out", "a count in a formula is at least 1");
    else if (count > COUNT_LIMIT)
        fail(r, from, r->at, "", "a count in a formula is at most %d", COUNT_LIMIT);
    return count;
}

/* counts += times * more, within the limit. */
static void add_counts(struct reader *r, int64_t *counts, const int64_t *more, int64_t times, const char *from)
{
    for (int i = 0; i < FORMULA_ELEMENTS && !r->failed; i++) {
        if (more[i] > (FORMULA_LIMIT - counts[i]) / times)
            fail(r, from, r->at, "", "the formula has more than %d atoms of %s", FORMULA_LIMIT, symbols[i]);
        else
            counts[i] += times * more[i];
    }
}

static void read_element(struct reader *r, int64_t *counts)
{
    const char *from = r->at++;
    if (is_small(*r->at))
        r->at++;
    int length = (int)(r->at - from), element = 0;
    while (element < FORMULA_ELEMENTS
           && (strncmp(symbols[element], from, (size_t)length) != 0 || symbols[element][length] != '\0'))
        element++;
    if (element == FORMULA_ELEMENTS) {
        fail(r, from, r->at, "", "there is no element `%.*s`", length, from);
        return;
    }
    int64_t one[FORMULA_ELEMENTS] = {0};
    one[element] = 1;
    add_counts(r, counts, one, read_count(r), from);
}

static void read_part(struct reader *r, int64_t *counts, int depth);

static void read_group(struct reader *r, int64_t *counts, int depth)
{
    const char *from = r->at;
    char close = *r->at++ == '(' ? ')' : ']';
    int64_t inner[FORMULA_ELEMENTS] = {0};
    if (depth == DEEPEST_GROUP) {
        fail(r, from, r->at, "", "a formula has at most %d groups inside one another", DEEPEST_GROUP);
        return;
    }
    read_part(r, inner, depth + 1);
    if (*r->at != close) {
        fail(r, from, from + 1, "", "this group is not closed by `%c`", close);
        return;
    }
    r->at++;
    add_counts(r, counts, inner, read_count(r), from);
}

static void read_part(struct reader *r, int64_t *counts, int depth)
{
    const char *from = r->at;
    while (!r->failed) {
        if (is_capital(*r->at))
            read_element(r, counts);
        else if (*r->at == '(' || *r->at == '[')
            read_group(r, counts, depth);
        else
            break;
    }
    if (r->at > from)
        return;
    if (is_small(*r->at))
        fail(r, from, from + 1, "write the symbol with a capital, such as `Br`",
             "an element symbol begins with a capital letter");
    else
        fail(r, from, *from ? from + 1 : from, "write it as in `CuSO4.5H2O` or `BrO3^-`",
             "an element symbol is missing here");
}

static bool skip_dot(struct reader *r)
{
    static const char middle_dot[] = "\xC2\xB7";
    if (*r->at == '.')
        r->at++;
    else if (strncmp(r->at, middle_dot, 2) == 0)
        r->at += 2;
    else
        return false;
    return true;
}

static int read_charge(struct reader *r)
{
    const char *from = r->at++;
    int charge = (int)(is_digit(*r->at) ? read_count(r) : 1);
    if (*r->at != '+' && *r->at != '-') {
        const char *to = r->at;
        while (*to && *to != ' ')
            to++;
        fail(r, from, to, "write it as in `^2+`, `^-`", "a charge is a number and a sign");
    } else if (charge > CHARGE_LIMIT) {
        fail(r, from, r->at, "", "a charge is at most %d", CHARGE_LIMIT);
    }
    return *r->at++ == '-' ? -charge : charge;
}

static void read_formula(struct reader *r, int64_t *counts, int *charge)
{
    if (strcmp(r->at, "e^-") == 0) {
        *charge = -1;
        return;
    }
    read_part(r, counts, 0);
    while (!r->failed && skip_dot(r)) {
        const char *from = r->at;
        int64_t times = read_count(r), part[FORMULA_ELEMENTS] = {0};
        if (!r->failed)
            read_part(r, part, 0);
        if (!r->failed)
            add_counts(r, counts, part, times, from);
    }
    if (!r->failed && *r->at == '^')
        *charge = read_charge(r);
    if (!r->failed && *r->at) {
        int length = 1;
        while ((r->at[length] & 0xC0) == 0x80)
            length++;
        fail(r, r->at, r->at + length, "a charge follows `^`, as in `Ce^4+`; nothing else follows the atoms",
             "`%.*s` has no meaning in a formula", length, r->at);
    }
}

lb_status formula_parse(const char *text, formula *out, formula_fault *fault)
{
    *out = (formula){.atoms = NULL};
    struct reader r = {.start = text, .at = text, .fault = fault};
    int64_t counts[FORMULA_ELEMENTS] = {0};
    read_formula(&r, counts, &out->charge);
    if (r.failed) {
        out->charge = 0;
        return LB_E_ARG;
    }
    int kinds = 0;
    for (int i = 0; i < FORMULA_ELEMENTS; i++)
        kinds += counts[i] > 0;
    out->atoms = memory_array((size_t)kinds, sizeof *out->atoms);
    if (!out->atoms)
        return LB_E_NOMEM;
    for (int i = 0; i < FORMULA_ELEMENTS; i++)
        if (counts[i] > 0)
            out->atoms[out->atom_count++] = (formula_atom){i, counts[i]};
    return LB_OK;
}
