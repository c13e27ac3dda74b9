/* The syntax tree: constructors in an arena.
 *
 * An action of the grammar is one call from here.  Lists grow at their tails
 * and every node is made once, so a tree takes time and room linear in the text.
 *
 * Depth.  `a + b + c` leans to the left, one level a term, and a sum of a
 * hundred thousand terms is a tree of that depth.  Each expression records its
 * depth so that a later stage can walk it without the C stack, or refuse it.
 * Nesting by parentheses, powers and signs is limited while reading (lexical.c). */
#include "text/builder.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"

/* ---- The builder ---------------------------------------------------------- */

void *builder_alloc(builder *b, size_t size)
{
    void *block = b->status == LB_OK ? arena_alloc(b->arena, size) : NULL;
    if (!block)
        b->status = LB_E_NOMEM;
    return block;
}

const char *builder_text(builder *b, const char *text, size_t length)
{
    char *copy = builder_alloc(b, length + 1);
    if (copy && length)
        memcpy(copy, text, length);
    return copy;
}

static bool is_after(span place, span mark)
{
    return place.line > mark.line || (place.line == mark.line && place.column > mark.column);
}

void builder_fault(builder *b, span where, const char *remedy, const char *format, ...)
{
    if (b->is_mute || !is_after(where, b->muted))
        return;
    char message[512];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(message, sizeof message, format, arguments);
    va_end(arguments);
    diagnostics_fault(b->diagnostics, where, remedy, "%s", message);
}

span span_join(span a, span b)
{
    if (b.line == a.line && b.column + b.length > a.column + a.length)
        a.length = b.column + b.length - a.column;
    return a;
}

/* ---- Expressions ---------------------------------------------------------- */

static int depth_of(const syntax_expression *e)
{
    return e ? e->depth : 0;
}

static void set_depth(syntax_expression *e)
{
    int deepest = depth_of(e->left) > depth_of(e->right) ? depth_of(e->left) : depth_of(e->right);
    for (const syntax_argument *a = e->first; a; a = a->next)
        if (depth_of(a->value) > deepest)
            deepest = depth_of(a->value);
    e->depth = deepest + 1;
}

static syntax_expression *node(builder *b, syntax_expression_kind kind, syntax_expression *left,
                               syntax_expression *right, span where)
{
    syntax_expression *e = builder_alloc(b, sizeof *e);
    if (!e)
        return NULL;
    e->kind = kind;
    e->where = where;
    e->operator_where = where;
    e->left = left;
    e->right = right;
    set_depth(e);
    return e;
}

syntax_expression *syntax_number_node(builder *b, syntax_number number, span where)
{
    syntax_expression *e = node(b, SYNTAX_NUMBER, NULL, NULL, where);
    if (e) {
        e->text = number.text;
        e->number = number.value;
    }
    return e;
}

syntax_expression *syntax_leaf(builder *b, syntax_expression_kind kind, const char *text, span where)
{
    syntax_expression *e = node(b, kind, NULL, NULL, where);
    if (e)
        e->text = text;
    return e;
}

syntax_expression *syntax_call(builder *b, const char *function, syntax_arguments arguments, span where)
{
    syntax_expression *e = syntax_leaf(b, SYNTAX_CALL, function, where);
    if (e) {
        e->first = arguments.first;
        set_depth(e);
    }
    return e;
}

syntax_expression *syntax_binary(builder *b, syntax_expression_kind kind, syntax_expression *left,
                                 syntax_expression *right, span operator_where, span where)
{
    syntax_expression *e = left && right ? node(b, kind, left, right, where) : NULL;
    if (e)
        e->operator_where = operator_where;
    return e;
}

syntax_expression *syntax_unary(builder *b, syntax_expression_kind kind, syntax_expression *operand, span where)
{
    return operand ? node(b, kind, operand, NULL, where) : NULL;
}

static bool is_adjacent(span a, span b)
{
    return a.line == b.line && a.column + a.length == b.column;
}

/* The number at the left end of a product, where it stands directly behind an
 * operator; NULL when there is none. */
static syntax_expression **leading_number(syntax_expression **right, span operator_where)
{
    while ((*right)->kind == SYNTAX_JUXTAPOSED || (*right)->kind == SYNTAX_MULTIPLY
           || (*right)->kind == SYNTAX_DIVIDE)
        right = &(*right)->left;
    return (*right)->kind == SYNTAX_NUMBER && is_adjacent(operator_where, (*right)->where) ? right : NULL;
}

/* Depths from the top of a product down to its leftmost factor, after that
 * factor became deeper by some levels. */
static void deepen(syntax_expression *top, const syntax_expression *leftmost, int levels)
{
    for (; top != leftmost; top = top->left)
        top->depth += levels;
}

/* `1.0 M-1 s-1`: a minus between a unit and a number, no blank on either side,
 * is a forgotten `^`.  Left is (1.0 M), right (1 s); what was meant is
 * ((1.0 M^-1) s). */
static syntax_expression *repair_exponent(builder *b, syntax_expression *left, syntax_expression *right,
                                          span operator_where)
{
    if (left->kind != SYNTAX_JUXTAPOSED || left->right->kind != SYNTAX_NAME
        || !is_adjacent(left->right->where, operator_where))
        return NULL;
    syntax_expression *top = right, **number = leading_number(&top, operator_where);
    if (!number)
        return NULL;
    syntax_expression *unit = left->right;
    span where = span_join(unit->where, (*number)->where);
    char remedy[120];
    snprintf(remedy, sizeof remedy, "write `%.40s^-%.40s`", unit->text, (*number)->text);
    builder_fault(b, where, remedy, "`%.40s-%.40s` is a subtraction, not a power of a unit", unit->text,
                  (*number)->text);
    syntax_expression *exponent = syntax_unary(b, SYNTAX_NEGATE, *number, span_join(operator_where, where));
    left->right = syntax_binary(b, SYNTAX_POWER, unit, exponent, operator_where, where);
    if (!left->right)
        return NULL;
    set_depth(left);
    *number = left;
    deepen(top, left, left->depth - 1);
    return top;
}

syntax_expression *syntax_subtract(builder *b, syntax_expression *left, syntax_expression *right,
                                   span operator_where, span where)
{
    if (!left || !right)
        return NULL;
    syntax_expression *repaired = repair_exponent(b, left, right, operator_where);
    return repaired ? repaired : syntax_binary(b, SYNTAX_SUBTRACT, left, right, operator_where, where);
}

/* ---- Ranges and arguments -------------------------------------------------- */

/* A number, signed or not, with a unit or without. */
static bool is_plain(const syntax_expression *e)
{
    while (e->kind == SYNTAX_JUXTAPOSED || e->kind == SYNTAX_DIVIDE || e->kind == SYNTAX_NEGATE)
        e = e->left;
    return e->kind == SYNTAX_NUMBER;
}

static bool check_end(builder *b, const syntax_expression *end)
{
    if (end && !is_plain(end))
        builder_fault(b, end->where, "write a number, with a unit or without", "an end of a range is a plain number");
    return end && is_plain(end);
}

syntax_range *syntax_range_between(builder *b, syntax_expression *low, syntax_expression *high, span where)
{
    bool good = check_end(b, low);
    good = check_end(b, high) && good;
    syntax_range *range = good ? builder_alloc(b, sizeof *range) : NULL;
    if (range)
        *range = (syntax_range){.where = where, .low = low, .high = high};
    return range;
}

syntax_range *syntax_range_factor(builder *b, syntax_expression *factor, span where)
{
    syntax_range *range = factor ? builder_alloc(b, sizeof *range) : NULL;
    if (range)
        *range = (syntax_range){.where = where, .is_factor = true, .low = factor};
    return range;
}

syntax_argument *syntax_argument_new(builder *b, const char *name, span name_where, syntax_expression *value,
                                     syntax_range *range)
{
    syntax_argument *argument = value ? builder_alloc(b, sizeof *argument) : NULL;
    if (argument)
        *argument = (syntax_argument){name, name_where, value, range, NULL};
    return argument;
}

syntax_arguments syntax_arguments_add(syntax_arguments list, syntax_argument *argument)
{
    if (!argument)
        return list;
    if (list.last)
        list.last->next = argument;
    else
        list.first = argument;
    list.last = argument;
    return list;
}

/* ---- Species and sides ----------------------------------------------------- */

syntax_name *syntax_name_new(builder *b, const char *text, bool is_quoted, span where)
{
    syntax_name *name = builder_alloc(b, sizeof *name);
    if (name)
        *name = (syntax_name){text, is_quoted, where, NULL};
    return name;
}

syntax_names syntax_names_add(syntax_names list, syntax_name *name)
{
    if (!name)
        return list;
    if (list.last)
        list.last->next = name;
    else
        list.first = name;
    list.last = name;
    return list;
}

syntax_term *syntax_term_new(builder *b, const syntax_name *species)
{
    syntax_term *term = species ? builder_alloc(b, sizeof *term) : NULL;
    if (!term)
        return NULL;
    term->number = 1;
    term->coefficient_where = species->where;
    term->species = *species;
    return term;
}

syntax_term *syntax_term_count(builder *b, syntax_number coefficient, span where, const syntax_name *species)
{
    syntax_term *term = syntax_term_new(b, species);
    if (!term || !coefficient.text)
        return NULL;
    const char *exponent = strpbrk(coefficient.text, "eE");
    if (exponent && is_adjacent(where, species->where)) {
        char remedy[240];
        snprintf(remedy, sizeof remedy, "write it without `e`; a species `%.40s%.40s` needs a blank before it", exponent,
                 species->text);
        builder_fault(b, where, remedy, "a coefficient has no exponent");
    } else if (exponent) {
        builder_fault(b, where, "write it without `e`", "a coefficient has no exponent");
    }
    term->coefficient = coefficient.text;
    term->number = coefficient.value;
    term->coefficient_where = where;
    return term;
}

syntax_term *syntax_term_expression(builder *b, syntax_expression *coefficient, span where,
                                    const syntax_name *species)
{
    syntax_term *term = coefficient ? syntax_term_new(b, species) : NULL;
    if (term) {
        term->expression = coefficient;
        term->coefficient_where = where;
    }
    return term;
}

syntax_terms syntax_terms_add(syntax_terms list, syntax_term *term)
{
    if (!term)
        return list;
    if (list.last)
        list.last->next = term;
    else
        list.first = term;
    list.last = term;
    return list;
}

/* A side that is a number alone is empty if it is 0.  `2E1` reads as twenty;
 * two of a species E1 are meant. */
syntax_term *syntax_side_number(builder *b, syntax_number number, span where)
{
    if (!number.text || strcmp(number.text, "0") == 0)
        return NULL;
    const char *exponent = strpbrk(number.text, "eE");
    if (!exponent || exponent[1] == '-' || exponent[1] == '+') {
        builder_fault(b, where, "write `2 X`, or `0` alone for an empty side", "`%.60s` is a number without a species",
                      number.text);
        b->has_bad_side = true;
        return NULL;
    }
    char remedy[160];
    snprintf(remedy, sizeof remedy, "for a species called `%.40s` write `%.*s %.40s`", exponent,
             (int)(exponent - number.text < 40 ? exponent - number.text : 40), number.text, exponent);
    builder_fault(b, where, remedy, "`%.60s` is a number without a species", number.text);
    syntax_term *term = syntax_term_new(b, syntax_name_new(b, exponent, false, where));
    if (term) {
        term->coefficient = builder_text(b, number.text, (size_t)(exponent - number.text));
        term->number = term->coefficient ? strtod(term->coefficient, NULL) : 1;
    }
    return term;
}

/* ---- Statements ------------------------------------------------------------ */

static syntax_statement *statement(builder *b, syntax_statement_kind kind, span where)
{
    syntax_statement *s = builder_alloc(b, sizeof *s);
    if (s) {
        s->kind = kind;
        s->where = s->text_where = where;
    }
    return s;
}

syntax_statement *syntax_title(builder *b, const char *text, span text_where, span where)
{
    syntax_statement *s = statement(b, SYNTAX_TITLE, where);
    if (s) {
        s->text = text;
        s->text_where = text_where;
        s->is_quoted = true;
    }
    return s;
}

syntax_statement *syntax_units(builder *b, syntax_expression *units, span where)
{
    syntax_statement *s = statement(b, SYNTAX_UNITS, where);
    if (s)
        s->value = units;
    return s;
}

syntax_statement *syntax_define(builder *b, syntax_statement_kind kind, syntax_text name, span text_where,
                                syntax_expression *value, syntax_range *range, span where)
{
    syntax_statement *s = value && name.text ? statement(b, kind, where) : NULL;
    if (s) {
        s->text = name.text;
        s->is_quoted = name.is_quoted;
        s->text_where = text_where;
        s->value = value;
        s->range = range;
        s->is_broken = name.text[0] == '\0';  /* `[]`, reported by the lexer */
    }
    return s;
}

syntax_statement *syntax_list(builder *b, syntax_statement_kind kind, syntax_names names, span where)
{
    syntax_statement *s = statement(b, kind, where);
    if (s)
        s->names = names.first;
    return s;
}

syntax_statement *syntax_formula(builder *b, const syntax_name *species, const char *formula, span formula_where,
                                 span where)
{
    syntax_statement *s = species ? statement(b, SYNTAX_FORMULA, where) : NULL;
    if (s) {
        s->text = species->text;
        s->is_quoted = species->is_quoted;
        s->text_where = species->where;
        s->formula = formula;
        s->formula_where = formula_where;
    }
    return s;
}

static void check_left(builder *b, const syntax_term *term)
{
    for (; term; term = term->next)
        if (term->expression)
            builder_fault(b, term->coefficient_where,
                          "write a number; a label in front has letters, digits and . _ + - ' * only",
                          "a coefficient on the left is a plain number");
}

syntax_statement *syntax_reaction(builder *b, syntax_term *left, bool is_reversible, span arrow_where,
                                  syntax_term *right, syntax_arguments settings, span where)
{
    syntax_statement *s = statement(b, SYNTAX_REACTION, where);
    if (!s)
        return NULL;
    check_left(b, left);
    s->is_reversible = is_reversible;
    s->arrow_where = arrow_where;
    s->left = left;
    s->right = right;
    s->settings = settings.first;
    return s;
}

syntax_statement *syntax_labelled(syntax_statement *reaction, const char *label, span label_where, span where)
{
    if (reaction) {
        reaction->label = label;
        reaction->label_where = label_where;
        reaction->where = where;
    }
    return reaction;
}

syntax_statement *syntax_broken(syntax_statement *s)
{
    if (s)
        s->is_broken = true;
    return s;
}

syntax_statement *syntax_define_broken(builder *b, syntax_statement_kind kind, syntax_text name, span where)
{
    syntax_statement *s = syntax_broken(statement(b, kind, where));
    if (s) {
        s->text = name.text;
        s->is_quoted = name.is_quoted;
    }
    return s;
}

static void append(syntax_statement **first, syntax_statement **last, syntax_statement *s)
{
    if (*last)
        (*last)->next = s;
    else
        *first = s;
    *last = s;
}

void syntax_append(builder *b, syntax_statement *s)
{
    bool has_bad_side = b->has_bad_side;
    b->has_bad_side = false;
    if (!s)
        return;
    bool is_empty = s->kind == SYNTAX_REACTION && !s->left && !s->right;
    if (is_empty && !has_bad_side && !s->is_broken)
        builder_fault(b, s->arrow_where, "write a species on one side at least", "both sides are empty");
    if (s->is_broken || has_bad_side || is_empty) {
        s->is_broken = true;
        append(&b->tree->first_broken, &b->tree->last_broken, s);
    } else {
        append(&b->tree->first, &b->tree->last, s);
        b->tree->statement_count++;
    }
}

void syntax_free(syntax_tree *tree)
{
    if (!tree)
        return;
    arena_free(tree->arena);
    memory_free(tree);
}
