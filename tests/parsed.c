/* Mechanism texts as parsed, in a form that a test can compare. */
#include "parsed.h"

#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"

static parsed read_text(const char *text, size_t length, bool is_value)
{
    source *s;
    parsed p = {NULL, NULL, NULL};
    ck_assert_int_eq(source_new("t.mech", text, length, &s), LB_OK);
    ck_assert_int_eq(diagnostics_new(s, &p.list), LB_OK);
    lb_status status = is_value ? syntax_parse_value(p.list, &p.tree, &p.value) : syntax_parse(p.list, &p.tree);
    ck_assert_int_eq(status, LB_OK);
    return p;
}

parsed parsed_new(const char *text, size_t length)
{
    return read_text(text, length, false);
}

parsed parsed_value(const char *text)
{
    return read_text(text, strlen(text), true);
}

void parsed_free(parsed *p)
{
    syntax_free(p->tree);
    lb_diagnostics_free(p->list);
}

static void put_expression(buffer *b, const syntax_expression *e);

static void put_range(buffer *b, const syntax_range *range)
{
    if (!range)
        return;
    buffer_append(b, range->is_factor ? " F " : " R ");
    put_expression(b, range->low);
    if (!range->is_factor) {
        buffer_append(b, "..");
        put_expression(b, range->high);
    }
}

static void put_arguments(buffer *b, const syntax_argument *a)
{
    for (; a; a = a->next) {
        if (a->name)
            buffer_printf(b, "%s=", a->name);
        put_expression(b, a->value);
        put_range(b, a->range);
        if (a->next)
            buffer_append(b, ", ");
    }
}

static void put_wrapped(buffer *b, const char *open, const syntax_expression *e, const char *close)
{
    buffer_append(b, open);
    put_expression(b, e);
    buffer_append(b, close);
}

static void put_expression(buffer *b, const syntax_expression *e)
{
    static const char operators[] = {
        [SYNTAX_JUXTAPOSED] = '_', [SYNTAX_ADD] = '+', [SYNTAX_SUBTRACT] = '-', [SYNTAX_MULTIPLY] = '*',
        [SYNTAX_DIVIDE] = '/', [SYNTAX_POWER] = '^',
    };
    switch (e->kind) {
    case SYNTAX_NUMBER: case SYNTAX_NAME:
        buffer_append(b, e->text);
        break;
    case SYNTAX_CONCENTRATION:
        buffer_printf(b, "[%s]", e->text);
        break;
    case SYNTAX_FEED:
        buffer_printf(b, "[%s]in", e->text);
        break;
    case SYNTAX_CALL:
        buffer_printf(b, "%s(", e->text);
        put_arguments(b, e->first);
        buffer_char(b, ')');
        break;
    case SYNTAX_NEGATE:
        put_wrapped(b, "(-", e->left, ")");
        break;
    case SYNTAX_GROUP:
        put_wrapped(b, "{", e->left, "}");
        break;
    default:
        put_wrapped(b, "(", e->left, "");
        buffer_char(b, operators[e->kind]);
        put_wrapped(b, "", e->right, ")");
    }
}

static void put_side(buffer *b, const syntax_term *t)
{
    for (; t; t = t->next) {
        if (t->coefficient && t->coefficient->expression)
            put_wrapped(b, "", t->coefficient->expression, " ");
        else if (t->coefficient)
            buffer_printf(b, "%.17g ", strtod(t->coefficient->text, NULL));
        buffer_printf(b, t->species.is_quoted ? "\"%s\"%s" : "%s%s", t->species.text, t->next ? " + " : "");
    }
}

static void put_reaction(buffer *b, const syntax_statement *s)
{
    if (s->label)
        buffer_printf(b, "(%s) ", s->label);
    put_side(b, s->left);
    buffer_append(b, s->is_reversible ? " <-> " : " -> ");
    put_side(b, s->right);
    if (s->settings)
        buffer_append(b, ", ");
    put_arguments(b, s->settings);
}

static void put_statement(buffer *b, const syntax_statement *s)
{
    static const char *words[] = {
        [SYNTAX_TITLE] = "title <%s>", [SYNTAX_UNITS] = "units", [SYNTAX_DEFINE_NAME] = "%s =",
        [SYNTAX_DEFINE_CONCENTRATION] = "[%s] =", [SYNTAX_DEFINE_INITIAL] = "[%s]0 =",
        [SYNTAX_DEFINE_FEED] = "[%s]in =", [SYNTAX_RETAINED] = "retained", [SYNTAX_SIGNED] = "signed",
        [SYNTAX_FORMULA] = "formula %s",
    };
    if (s->kind == SYNTAX_REACTION) {
        put_reaction(b, s);
        return;
    }
    for (const char *at = words[s->kind]; *at; at++) {
        if (at[0] == '%' && at[1] == 's')
            buffer_append(b, s->text), at++;
        else
            buffer_char(b, *at);
    }
    for (const syntax_name *name = s->names; name; name = name->next)
        buffer_printf(b, " %s", name->text);
    if (s->value)
        put_wrapped(b, " ", s->value, "");
    if (s->formula)
        buffer_printf(b, " <%s>", s->formula);
    put_range(b, s->range);
}

char *parsed_expression(const syntax_expression *e)
{
    buffer b;
    buffer_init(&b);
    put_expression(&b, e);
    return buffer_take(&b);
}

char *parsed_statements(const syntax_statement *first)
{
    buffer b;
    buffer_init(&b);
    buffer_append(&b, "");
    for (const syntax_statement *s = first; s; s = s->next) {
        put_statement(&b, s);
        if (s->next)
            buffer_char(&b, '\n');
    }
    return buffer_take(&b);
}

char *parsed_faults(const lb_diagnostics *list)
{
    buffer b;
    buffer_init(&b);
    buffer_append(&b, "");
    for (size_t i = 0; i < lb_diagnostics_count(list); i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        buffer_printf(&b, "%s%d:%d+%d %s | %s", i ? "\n" : "", d.line, d.column, d.length, d.message, d.remedy);
    }
    return buffer_take(&b);
}

void assert_statements(const char *text, const char *wanted)
{
    parsed p = parsed_new(text, strlen(text));
    char *faults = parsed_faults(p.list), *got = parsed_statements(p.tree->first);
    ck_assert_msg(faults[0] == '\0', "\"%s\" has faults:\n%s", text, faults);
    ck_assert_msg(strcmp(got, wanted) == 0, "\"%s\" read as\n%s\nwanted\n%s", text, got, wanted);
    free(got);
    free(faults);
    parsed_free(&p);
}

void assert_faults(const char *text, const char *wanted)
{
    parsed p = parsed_new(text, strlen(text));
    char *got = parsed_faults(p.list);
    ck_assert_msg(strcmp(got, wanted) == 0, "\"%s\" has faults\n%s\nwanted\n%s", text, got, wanted);
    free(got);
    parsed_free(&p);
}
