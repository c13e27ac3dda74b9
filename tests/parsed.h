/* Mechanism texts as parsed, in a form that a test can compare. */
#ifndef LIMBECK_TESTS_PARSED_H
#define LIMBECK_TESTS_PARSED_H

#include "text/syntax.h"

/* A text read by syntax_parse or syntax_parse_value. */
typedef struct parsed {
    lb_diagnostics    *list;
    syntax_tree       *tree;
    syntax_expression *value;
} parsed;

parsed parsed_new(const char *text, size_t length);       /* a file, named t.mech */
parsed parsed_value(const char *text);
void   parsed_free(parsed *p);

/* Each returns a text that the caller frees with free().
 *
 * An expression with every binary operation in parentheses, juxtaposition as
 * `_`, a group as `{...}`; a statement as it could be written, with ` R low..high`
 * for a range; statements one a line; faults and warnings one a line, as
 * `line:column+length message | remedy`. */
char *parsed_expression(const syntax_expression *e);
char *parsed_statements(const syntax_statement *first);
char *parsed_faults(const lb_diagnostics *list);

/* The statements (or the faults) of a text are exactly these. */
void assert_statements(const char *text, const char *wanted);
void assert_faults(const char *text, const char *wanted);

#endif
