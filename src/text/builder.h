/* Building the syntax tree: what the grammar's actions call.
 *
 * Nodes come from the builder's arena.  Without memory a constructor gives NULL
 * and the builder remembers; a constructor that gets a NULL operand gives NULL.
 * Faults that the grammar cannot express (a coefficient with an exponent, `1 s-1`)
 * are reported here, and the node then says what was most likely meant. */
#ifndef LIMBECK_TEXT_BUILDER_H
#define LIMBECK_TEXT_BUILDER_H

#include "text/syntax.h"

typedef struct builder {
    struct arena   *arena;
    lb_diagnostics *diagnostics;
    lb_status       status;      /* LB_OK, or LB_E_NOMEM for good */
    span            muted;       /* faults up to this place were reported when the text was first read */
    bool            is_mute;     /* the rest of a faulty statement is passed over: its faults would not be its own */
    bool            has_bad_side; /* of the reaction being read: a fault was reported for a side */
    syntax_tree    *tree;
    syntax_expression *value;    /* of syntax_parse_value */
    const char    **texts;       /* [text_slots] open-addressing table of the texts there are, NULL empty */
    size_t          text_count, text_slots;
} builder;

/* Lists under construction. */
typedef struct syntax_terms { syntax_term *first, *last; } syntax_terms;
typedef struct syntax_names { syntax_name *first, *last; } syntax_names;
typedef struct syntax_arguments { syntax_argument *first, *last; } syntax_arguments;
typedef struct syntax_number { const char *text; double value; } syntax_number;
typedef struct syntax_text { const char *text; bool is_quoted; } syntax_text;

/* Report a fault, unless its place was reached before (a line that is read again). */
void builder_fault(builder *b, span where, const char *remedy, const char *format, ...)
    __attribute__((format(printf, 4, 5)));
void *builder_alloc(builder *b, size_t size);        /* a node, in the tree's page */
bool builder_turn_page(builder *b);                  /* nodes go to a new page; false without memory */
/* A terminated copy; equal texts are one copy. */
const char *builder_text(builder *b, const char *text, size_t length);
void builder_clear(builder *b);      /* frees the table; the texts are the arena's */

/* From the start of a to the end of b, as far as b is on the same line. */
span span_join(span a, span b);
bool span_touches(span a, span b);   /* b follows a without a blank */

/* ---- syntax_expression.c ---- */

syntax_expression *syntax_number_node(builder *b, syntax_number number, span where);
syntax_expression *syntax_leaf(builder *b, syntax_expression_kind kind, const char *text, span where);
syntax_expression *syntax_call(builder *b, const char *function, syntax_arguments arguments, span where);
syntax_expression *syntax_binary(builder *b, syntax_expression_kind kind, syntax_expression *left,
                                 syntax_expression *right, span operator_where, span where);
syntax_expression *syntax_unary(builder *b, syntax_expression_kind kind, syntax_expression *operand, span where);
syntax_expression *syntax_subtract(builder *b, syntax_expression *left, syntax_expression *right,
                                   span operator_where, span where);

syntax_range *syntax_range_between(builder *b, syntax_expression *low, syntax_expression *high, span where);
syntax_range *syntax_range_factor(builder *b, syntax_expression *factor, span where);

syntax_argument *syntax_argument_new(builder *b, const char *name, span name_where, syntax_expression *value,
                                     syntax_range *range);
syntax_arguments syntax_arguments_add(syntax_arguments list, syntax_argument *argument);

/* ---- syntax.c ---- */

syntax_names syntax_names_add(builder *b, syntax_names list, const syntax_name *name); /* copies the name */

syntax_term *syntax_term_new(builder *b, const syntax_name *species); /* copies the species */
syntax_term *syntax_term_count(builder *b, syntax_number coefficient, span where, const syntax_name *species);
syntax_term *syntax_term_expression(builder *b, syntax_expression *coefficient, span where,
                                    const syntax_name *species);
syntax_terms syntax_terms_add(syntax_terms list, syntax_term *term);
syntax_term *syntax_side_number(builder *b, syntax_number number, span where);

syntax_statement *syntax_title(builder *b, const char *text, span text_where, span where);
syntax_statement *syntax_units(builder *b, syntax_expression *units, span where);
syntax_statement *syntax_define(builder *b, syntax_statement_kind kind, syntax_text name, span text_where,
                                syntax_expression *value, syntax_range *range, span where);
syntax_statement *syntax_define_broken(builder *b, syntax_statement_kind kind, syntax_text name, span where);
syntax_statement *syntax_list(builder *b, syntax_statement_kind kind, syntax_names names, span where);
syntax_statement *syntax_formula(builder *b, const syntax_name *species, const char *formula, span formula_where,
                                 span where);
syntax_statement *syntax_reaction(builder *b, syntax_term *left, bool is_reversible, span arrow_where,
                                  syntax_term *right, syntax_arguments settings, span where);
syntax_statement *syntax_broken(syntax_statement *statement);
syntax_statement *syntax_labelled(syntax_statement *reaction, const char *label, span label_where, span where);
void syntax_append(builder *b, syntax_statement *statement);

#endif
