/* Fuzz target: any bytes as a mechanism file and as a value.
 *
 * With libFuzzer: clang -fsanitize=fuzzer,address,undefined.  Without (AFL++,
 * or to run one file again): compile with -DFUZZ_MAIN; the program reads the
 * file that it is given, or standard input.
 *
 * Besides the sanitizers' checks: every fault has a place in the text and a
 * message, whatever has no fault has no broken statement, and each node is
 * deeper than its children. */
#include <assert.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "text/syntax.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

/* The tree leans to the left, where it may be deep: no recursion there. */
static void check_expression(const syntax_expression *e)
{
    for (; e; e = e->left) {
        assert(e->depth >= 1 && e->where.line >= 1 && e->where.column >= 1);
        assert(!e->left || e->depth > e->left->depth);
        assert(!e->right || e->depth > e->right->depth);
        check_expression(e->right);
        for (const syntax_argument *a = e->first; a; a = a->next) {
            assert(a->value && e->depth > a->value->depth);
            check_expression(a->value);
        }
    }
}

static void check_reaction(const syntax_statement *s)
{
    for (const syntax_argument *a = s->settings; a; a = a->next) {
        assert(a->name && a->value);
        check_expression(a->value);
    }
    for (const syntax_term *t = s->left; t; t = t->next)
        assert(t->species.text);
    for (const syntax_term *t = s->right; t; t = t->next) {
        assert(t->species.text);
        check_expression(t->coefficient ? t->coefficient->expression : NULL);
    }
}

static void check_statement(const syntax_statement *s)
{
    if (s->kind == SYNTAX_REACTION)
        check_reaction(s);
    else
        check_expression(s->value);
}

static void check_tree(const syntax_tree *tree, size_t faults)
{
    int count = 0;
    for (const syntax_statement *s = tree->first; s; s = s->next, count++)
        check_statement(s);
    for (const syntax_statement *s = tree->first_broken; s; s = s->next)
        check_statement(s);
    assert(count == tree->statement_count);
    assert(faults || !tree->first_broken);
}

static void check_faults(const lb_diagnostics *list)
{
    for (size_t i = 0; i < lb_diagnostics_count(list); i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        const char *line;
        size_t length;
        assert(d.message[0] && d.column >= 1);
        assert(source_line(diagnostics_source(list), d.line, &line, &length));
        assert((size_t)d.column <= length + 1);
    }
    buffer text;
    buffer_init(&text);
    assert(lb_diagnostics_write(list, lb_diagnostics_count(list) % 2 == 1, &text) == LB_OK);
    buffer_clear(&text);
}

static void parse(const uint8_t *data, size_t size, bool is_value)
{
    source *s;
    lb_diagnostics *list;
    syntax_tree *tree;
    syntax_expression *value = NULL;
    if (source_new("fuzz.mech", (const char *)data, size, &s) != LB_OK || diagnostics_new(s, &list) != LB_OK)
        abort();
    lb_status status = is_value ? syntax_parse_value(list, &tree, &value) : syntax_parse(list, &tree);
    assert(status == LB_OK);
    check_tree(tree, lb_diagnostics_faults(list));
    assert(!is_value || value || lb_diagnostics_faults(list));
    check_expression(value);
    check_faults(list);
    syntax_free(tree);
    lb_diagnostics_free(list);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    parse(data, size, false);
    parse(data, size, true);
    return 0;
}

#ifdef FUZZ_MAIN
int main(int count, char **arguments)
{
    FILE *in = count > 1 ? fopen(arguments[1], "rb") : stdin;
    static uint8_t data[1 << 24];
    if (!in)
        return 1;
    LLVMFuzzerTestOneInput(data, fread(data, 1, sizeof data, in));
    return 0;
}
#endif
