/* Text in, tree out: check the bytes, scanner up, parse, scanner down.
 *
 * Numbers are converted in the C locale, whatever the calling program has set:
 * a decimal point is a point. */
#include <locale.h>
#include <string.h>

#include "base/memory.h"
#include "text/lexical.h"
#include "text/utf8.h"

#include "parser.h"
/* flex's header comes last: it defines macros. */
#include "lexer.h"

/* ---- Bytes ------------------------------------------------------------------ */

static bool is_control(uint32_t code)
{
    return (code < 0x20 && code != '\t' && code != '\n' && code != '\r') || (code >= 0x7F && code < 0xA0);
}

static void report_bytes(lexical *l, span where, const char *at, int bytes, uint32_t code)
{
    if (bytes == 0)
        builder_fault(&l->build, where, "save the file as UTF-8", "the byte 0x%02X is not UTF-8", (unsigned char)*at);
    else if (code == 0)
        builder_fault(&l->build, where, "delete it; if there are many, the file is not UTF-8 text", "a NUL byte");
    else
        builder_fault(&l->build, where, "delete it", "a control character (U+%04X)", (unsigned)code);
}

/* Report bytes that are no text, once a line, and replace them for the lexer. */
static void check_bytes(lexical *l, size_t length)
{
    span where = {1, 1, 1};
    int reported = 0;
    for (size_t i = 0; i < length;) {
        uint32_t code = 0;
        int bytes = utf8_decode(l->buffer + i, length - i, &code);
        if (bytes == 0 || is_control(code)) {
            if (reported != where.line)
                report_bytes(l, where, l->buffer + i, bytes, code);
            reported = where.line;
            memset(l->buffer + i, LEXICAL_REPLACED, bytes ? (size_t)bytes : 1);
            where.column += bytes ? bytes - 1 : 0;
        }
        bool is_line_end = code == '\n' || (code == '\r' && l->buffer[i + 1] != '\n');
        i += bytes ? (size_t)bytes : 1;
        where.column++;
        if (is_line_end)
            where = (span){where.line + 1, 1, 1};
    }
}

/* ---- Scanner up, scanner down ------------------------------------------------- */

static void lexical_free(lexical *l)
{
    if (!l)
        return;
    if (l->scanner)
        lexer_lex_destroy(l->scanner);
    builder_clear(&l->build);
    memory_free(l->buffer);
    memory_free(l);
}

/* The lexer over the whole source, with a builder into tree. */
static lexical *lexical_new(lb_diagnostics *diagnostics, syntax_tree *tree, int start)
{
    lexical *l = memory_zeroed(1, sizeof *l);
    if (!l)
        return NULL;
    l->source = diagnostics_source(diagnostics);
    size_t length = source_length(l->source);
    l->build.arena = tree->arena;
    l->build.diagnostics = diagnostics;
    l->build.tree = tree;
    l->buffer_size = length + 3;
    l->buffer = memory_array(l->buffer_size, 1);
    if (!l->buffer || !builder_turn_page(&l->build) || lexer_lex_init_extra(l, &l->scanner) != 0) {
        lexical_free(l);
        return NULL;
    }
    memcpy(l->buffer, source_text(l->source), length);
    memcpy(l->buffer + length, "\n\0", 3);
    l->start = start;
    l->line = l->column = l->statement_line = 1;
    l->where = (span){1, 1, 0};
    l->previous = l->current = start == START_FILE ? NEWLINE : START_VALUE;
    return l;
}

/* Parse from a pseudo-token on; value may be NULL. */
static lb_status parse(lb_diagnostics *diagnostics, int start, syntax_tree **out, syntax_expression **value)
{
    lb_status status = LB_E_NOMEM;
    lexical *l = NULL;
    locale_t numbers = newlocale(LC_ALL_MASK, "C", (locale_t)0), caller = (locale_t)0;
    *out = NULL;
    syntax_tree *tree = memory_zeroed(1, sizeof *tree);
    if (!tree || !numbers || !(tree->arena = arena_new()))
        goto done;
    l = lexical_new(diagnostics, tree, start);
    if (!l)
        goto done;
    check_bytes(l, source_length(l->source));
    lexer__scan_buffer(l->buffer, l->buffer_size, l->scanner);
    if (start == START_FILE)
        lexer_start(l->scanner);
    caller = uselocale(numbers);
    yyparse(l);
    uselocale(caller);
    diagnostics_sort(diagnostics);
    status = l->build.status != LB_OK ? l->build.status : diagnostics_status(diagnostics);
    if (status == LB_OK && value)
        *value = l->build.value;
done:
    if (numbers)
        freelocale(numbers);
    lexical_free(l);
    if (status != LB_OK) {
        syntax_free(tree);
        tree = NULL;
    }
    *out = tree;
    return status;
}

lb_status syntax_parse(lb_diagnostics *diagnostics, syntax_tree **out)
{
    return parse(diagnostics, START_FILE, out, NULL);
}

lb_status syntax_parse_value(lb_diagnostics *diagnostics, syntax_tree **tree, syntax_expression **out)
{
    *out = NULL;
    return parse(diagnostics, START_VALUE, tree, out);
}
