/* The syntax tree: species, sides, statements.
 *
 * An action of the grammar is one call of a constructor.  Lists grow at their
 * tails and every node is made once, so a tree takes time and room linear in the
 * text. */
#include "text/builder.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"

/* ---- Species and sides ----------------------------------------------------- */

syntax_names syntax_names_add(builder *b, syntax_names list, const syntax_name *species)
{
    syntax_name *name = species->text ? builder_alloc(b, sizeof *name) : NULL;
    if (!name)
        return list;
    *name = *species;
    if (list.last)
        list.last->next = name;
    else
        list.first = name;
    list.last = name;
    return list;
}

syntax_term *syntax_term_new(builder *b, const syntax_name *species)
{
    syntax_term *term = species->text ? builder_alloc(b, sizeof *term) : NULL;
    if (term)
        term->species = *species;
    return term;
}

static syntax_term *term_with(builder *b, const char *text, syntax_expression *expression, span where,
                              const syntax_name *species)
{
    syntax_term *term = syntax_term_new(b, species);
    syntax_coefficient *coefficient = term ? builder_alloc(b, sizeof *coefficient) : NULL;
    if (!coefficient)
        return NULL;
    *coefficient = (syntax_coefficient){text, expression, where};
    term->coefficient = coefficient;
    return term;
}

syntax_term *syntax_term_count(builder *b, syntax_number coefficient, span where, const syntax_name *species)
{
    if (!species->text || !coefficient.text)
        return NULL;
    const char *exponent = strpbrk(coefficient.text, "eE");
    if (exponent && span_touches(where, species->where)) {
        char remedy[240];
        snprintf(remedy, sizeof remedy, "write it without `e`; a species `%.40s%.40s` needs a blank before it", exponent,
                 species->text);
        builder_fault(b, where, remedy, "a coefficient has no exponent");
    } else if (exponent) {
        builder_fault(b, where, "write it without `e`", "a coefficient has no exponent");
    }
    return term_with(b, coefficient.text, NULL, where, species);
}

syntax_term *syntax_term_expression(builder *b, syntax_expression *coefficient, span where,
                                    const syntax_name *species)
{
    return coefficient ? term_with(b, NULL, coefficient, where, species) : NULL;
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
    const syntax_name species = {.text = builder_text(b, exponent, strlen(exponent)), .where = where};
    return term_with(b, builder_text(b, number.text, (size_t)(exponent - number.text)), NULL, where, &species);
}

/* ---- Statements ------------------------------------------------------------ */

static syntax_statement *statement(builder *b, syntax_statement_kind kind, span where)
{
    syntax_statement *s = builder_alloc(b, sizeof *s);
    if (s) {
        s->kind = kind;
        s->where = where;
        if (kind != SYNTAX_REACTION)
            s->text_where = where;
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
    syntax_statement *s = species->text ? statement(b, SYNTAX_FORMULA, where) : NULL;
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
        if (term->coefficient && term->coefficient->expression)
            builder_fault(b, term->coefficient->where,
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

static bool has_law(const syntax_statement *s)
{
    for (const syntax_argument *a = s->settings; a; a = a->next)
        if (strcmp(a->name, "v") == 0)
            return true;
    return false;
}

enum { PAGE_STATEMENTS = 1000 };

/* The statement is the last of its page so far; a full page is turned. */
static void note_in_page(builder *b, const syntax_statement *s)
{
    syntax_page *page = b->tree->page;
    page->last = s;
    if (s->is_broken || s->kind != SYNTAX_REACTION || has_law(s))
        page->is_plain = false;
    if (++page->statements == PAGE_STATEMENTS)
        builder_turn_page(b);
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
    note_in_page(b, s);
}

void syntax_release(syntax_page *page)
{
    arena_free(page->arena);
    page->arena = NULL;
}

void syntax_free(syntax_tree *tree)
{
    if (!tree)
        return;
    for (syntax_page *page = tree->pages; page; page = page->next)
        syntax_release(page);
    arena_free(tree->arena);
    memory_free(tree);
}
