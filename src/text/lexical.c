/* Tokens where their meaning depends on the place, nesting, and recovery.
 *
 * A statement's end.  A newline ends a statement unless the last token is an
 * operator, `=`, `,`, `(`, `..` or `in`.
 *
 * Recovery.  After a fault of syntax the parser waits for a NEWLINE.  It gets
 * one at once, and reading goes on behind the statement's end.  Two things are
 * done so that a fault in one statement does not hide the next: a line that the
 * faulty statement went on to only because the line above ends in, say, a
 * comma, but that reads like a statement, is read again as one; and skipping
 * stops before such a line.  A line is read at most twice, so all this stays
 * linear. */
#include "text/lexical.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "parser.h"
#include "text/outlook.h"
#include "text/utf8.h"

/* ---- Places ---------------------------------------------------------------- */

void lexical_advance(lexical *l, const char *text, size_t length, span *where)
{
    int characters = 0;
    for (size_t i = 0; i < length; i++)
        characters += ((unsigned char)text[i] & 0xC0) != 0x80;
    *where = (span){l->line, l->column, characters};
    l->token_offset = l->offset;
    l->offset += length;
    l->column += characters;
}

void lexical_retreat(lexical *l, span where, size_t length)
{
    l->offset -= length;
    l->column = where.column;
}

static span behind(span where)
{
    return (span){where.line, where.column + where.length, 1};
}

const char *lexical_rest(const lexical *l)
{
    size_t length = source_length(l->source);
    return source_text(l->source) + (l->offset < length ? l->offset : length);
}

/* Whether the line that starts at an offset reads like a statement of its own,
 * given the last token of the line above. */
static bool is_statement(const lexical *l, size_t offset, int above)
{
    return offset < source_length(l->source)
        && outlook_is_statement(source_text(l->source) + offset, above == COMMA || above == OPEN, l->level > 0);
}

/* An arrow that was read on the line as part of the statement shows that the
 * line belongs to it. */
bool lexical_is_swallowed(const lexical *l)
{
    bool is_arrow = l->current == ARROW || l->current == REVERSIBLE;
    return l->above && l->arrows - l->arrows_above - is_arrow == 0 && is_statement(l, l->where_offset, l->above);
}

/* ---- Tokens ---------------------------------------------------------------- */

static bool goes_on(int kind)
{
    switch (kind) {
    case PLUS: case MINUS: case TIMES: case OVER: case POWER:
    case EQUALS: case COMMA: case OPEN: case DOTS: case IN:
        return true;
    default:
        return false;
    }
}

/* Whether a sign behind this token has one operand: it opens a level of nesting. */
static bool awaits_operand(int kind)
{
    return goes_on(kind) || kind == UNITS || kind == START_VALUE;
}

static void forget_statement(lexical *l)
{
    l->previous = l->current = NEWLINE;
    l->above = 0;
    l->arrows = l->arrows_above = 0;
    l->formula = 0;
    l->level = l->waiting = l->pending[0] = 0;
    l->build.is_mute = false;
}

/* Count nesting; false when it is too deep. */
static bool nest(lexical *l, int kind, span where)
{
    l->is_stray_close = kind == CLOSE && l->level == 0;
    bool is_sign = (kind == MINUS || kind == PLUS) && awaits_operand(l->current);
    if (kind == OPEN) {
        l->level++;
        if (l->level + l->waiting > LEXICAL_NESTING)
            return false;
        l->opened[l->level] = where;
        l->pending[l->level] = 0;
    } else if (kind == CLOSE && l->level > 0) {
        l->waiting -= l->pending[l->level];
        l->level--;
    } else if (kind == POWER || is_sign) {
        l->pending[l->level]++;
        l->waiting++;
    } else if (kind == PLUS || kind == MINUS || kind == TIMES || kind == OVER || kind == COMMA) {
        l->waiting -= l->pending[l->level];
        l->pending[l->level] = 0;
    }
    return l->level + l->waiting <= LEXICAL_NESTING;
}

static int formula_step(const lexical *l, int kind)
{
    switch (kind) {
    case FORMULA: return 1;
    case NAME: case QUOTED: return l->formula == 1 ? 2 : 0;
    case EQUALS: return l->formula == 2 ? 3 : 0;
    default: return 0;
    }
}

int lexical_accept(lexical *l, int kind, span where)
{
    if (!l->build.is_mute && !nest(l, kind, where)) {
        builder_fault(&l->build, where, "give the inner parts names of their own",
                      "parentheses, powers and signs are nested deeper than %d levels", LEXICAL_NESTING);
        kind = BAD;
    }
    l->formula = formula_step(l, kind);
    if (l->current == NEWLINE) {
        l->first = kind;
        l->first_where = where;
        l->statement_line = where.line;
    }
    if (where.line != l->where.line) {
        l->above = where.line > l->statement_line ? l->current : 0;
        l->arrows_above = l->arrows;
    }
    l->arrows += kind == ARROW || kind == REVERSIBLE;
    l->where = where;
    l->where_offset = l->line_offset;
    l->previous = l->current;
    l->current = kind;
    return kind;
}

static int end_statement(lexical *l, span *where)
{
    *where = behind(l->where);
    l->previous = l->current;
    l->current = NEWLINE;
    return NEWLINE;
}

bool lexical_newline(lexical *l, span *where)
{
    l->line++;
    l->column = 1;
    l->line_offset = l->offset;
    if (l->current == NEWLINE)
        return false;
    if (goes_on(l->current)) {
        bool must_part = l->build.is_mute || l->formula == 3;
        if (!must_part || !is_statement(l, l->offset, l->current))
            return false;
    }
    end_statement(l, where);
    return true;
}

/* ---- Words, numbers, brackets ---------------------------------------------- */

/* A keyword is a name after all when the line reads `title = 3` or `title + X ->`. */
static bool is_used_as_name(const lexical *l)
{
    const char *rest = outlook_skip_blanks(lexical_rest(l));
    return (*rest && strchr("=+-<", *rest)) || strncmp(rest, "\xE2\x86", 2) == 0 || strncmp(rest, "\xE2\x87", 2) == 0;
}

int lexical_word(lexical *l, const char *text, bool is_first)
{
    static const struct { const char *word; int kind; } keyword[] = {
        {"title", TITLE}, {"units", UNITS}, {"retained", RETAINED}, {"signed", SIGNED}, {"formula", FORMULA},
    };
    l->is_within = strcmp(text, "within") == 0;
    if (strcmp(text, "in") == 0)
        return IN;
    if (l->current == UNITS && strcmp(text, "none") == 0)
        return NONE;
    for (size_t i = 0; is_first && i < sizeof keyword / sizeof keyword[0]; i++)
        if (strcmp(text, keyword[i].word) == 0)
            return is_used_as_name(l) ? NAME : keyword[i].kind;
    return NAME;
}

bool lexical_misses_comma(const lexical *l)
{
    bool is_behind_side = l->current == NAME || l->current == QUOTED || l->current == NUMBER || l->current == CLOSE;
    return l->arrows > 0 && l->level == 0 && is_behind_side && !l->build.is_mute
        && outlook_is_setting(source_text(l->source) + l->token_offset);
}

int lexical_number(lexical *l, const char *text, size_t length, span where, syntax_number *value)
{
    value->text = builder_text(&l->build, text, length);
    if (!value->text)
        return BAD;
    value->value = strtod(value->text, NULL);
    size_t mantissa = strcspn(value->text, "eE");
    bool is_zero = strcspn(value->text, "123456789") >= mantissa;
    if (!isfinite(value->value) || (value->value == 0 && !is_zero)) {
        bool is_large = value->value != 0;
        builder_fault(&l->build, where,
                      is_large ? "write a number below 1.8e308" : "write 0, or a number above 4.9e-324",
                      "`%.40s` is %s to be held as a double", value->text, is_large ? "too large" : "too small");
        value->value = is_large ? 1 : 0;
    }
    return NUMBER;
}

/* The number with one stretch of its text replaced. */
static int mended_number(lexical *l, const char *text, size_t length, const char *from, size_t count,
                         const char *instead, span where, syntax_number *value)
{
    size_t head = (size_t)(from - text);
    char *mended = builder_alloc(&l->build, length + 2);
    if (!mended)
        return BAD;
    snprintf(mended, length + 2, "%.*s%s%s", (int)head, text, instead, from + count);
    return lexical_number(l, mended, strlen(mended), where, value);
}

int lexical_comma_number(lexical *l, const char *text, size_t length, span where, syntax_number *value)
{
    const char *comma = strchr(text, ',');
    char remedy[160];
    int head = (int)(comma - text);
    if (length < 40 && strspn(comma + 1, "0123456789") == 3)
        snprintf(remedy, sizeof remedy, "write `%.*s.%s` with a point, or `%.*s%s`", head, text, comma + 1, head, text,
                 comma + 1);
    else
        snprintf(remedy, sizeof remedy, "write `%.*s.%.40s` with a point", head < 40 ? head : 40, text, comma + 1);
    builder_fault(&l->build, where, remedy, "a comma inside a number");
    return mended_number(l, text, length, comma, 1, ".", where, value);
}

int lexical_dash_number(lexical *l, const char *text, size_t length, span where, syntax_number *value)
{
    const char *dash = strpbrk(text, "eE") + 1;
    builder_fault(&l->build, where, "write `-`", "`%.3s` is no minus sign", dash);
    return mended_number(l, text, length, dash, 3, "-", where, value);
}

syntax_text lexical_bracket(lexical *l, const char *text, size_t length, span where)
{
    const char *end = memchr(text, ']', length), *start = outlook_skip_blanks(text + 1);
    syntax_text name = {NULL, *start == '"'};
    if (name.is_quoted) {
        /* a quoted name may hold a bracket */
        start++;
        end = memchr(start, '"', length - (size_t)(start - text));
    } else {
        while (end > start && (end[-1] == ' ' || end[-1] == '\t'))
            end--;
    }
    if (start == end)
        builder_fault(&l->build, where, "write the species between the brackets: `[X]`", "no species in the brackets");
    name.text = builder_text(&l->build, start, (size_t)(end - start));
    return name;
}

/* ---- Characters that do not belong ------------------------------------------ */

int lexical_semicolon(lexical *l, span where)
{
    if (l->build.is_mute)
        return 0;
    const char *rest = outlook_skip_blanks(lexical_rest(l));
    bool is_last = !*rest || strchr("\r\n#", *rest);
    bool is_comma = outlook_is_setting(rest);
    builder_fault(&l->build, where, is_last ? "leave it out: the line's end ends a statement"
                  : is_comma ? "write `,`" : "write each statement on its own line",
                  "`;` does not separate anything");
    if (is_comma)
        return COMMA;
    if (is_last || l->current == NEWLINE)
        return 0;
    end_statement(l, &where);
    return NEWLINE;
}

static const char *stranger_remedy(uint32_t code)
{
    switch (code) {
    case '\'': case 0x2018: case 0x2019:
        return "names that are not plain stand in straight double quotes: `\"X'\"`";
    case 0x201C: case 0x201D: case 0xAB: case 0xBB: case 0x201E:
        return "write straight double quotes, `\"`";
    case ']': return "it closes no bracket";
    case '!': case '%': return "a comment starts with `#`";
    case ':': return "write a label as `(R1)`, a definition with `=`";
    case '{': case '}': return "write parentheses";
    case '.': return "write `0.5` for a number, `a .. b` for a range";
    case 0xB0: return "write a temperature in K";
    case 0xD8: case 0xF8: return "write `0` or nothing for an empty side";
    default: break;
    }
    if (code >= 0x2080 && code <= 0x209C)
        return "write plain digits: `H2O`";
    if (code == 0xFEFF || (code >= 0x200B && code <= 0x200F) || code == 0xAD)
        return "delete it: it cannot be seen, and came with pasted text";
    if (code > 0xBF && code < 0x2000)
        return "names have the letters A to Z and Greek ones, digits and `_`; put any other name in double quotes";
    return NULL;
}

int lexical_stranger(lexical *l, const char *text, size_t length, span where)
{
    uint32_t code;
    if (text[0] == LEXICAL_REPLACED || utf8_decode(text, length, &code) == 0)
        return BAD;   /* the byte was reported before scanning (parse.c) */
    const char *remedy = stranger_remedy(code);
    if (code == '.' && l->current == NAME)
        remedy = "a constant of a reaction cannot be used by its label here: define it, `k2 = ...`, and use `k2` in both places";
    builder_fault(&l->build, where, remedy, "unexpected character `%.*s` (U+%04X)", (int)length, text,
                  (unsigned)code);
    return BAD;
}

int lexical_colon(lexical *l, span where)
{
    if (l->current == LABEL && l->first == LABEL) {
        builder_fault(&l->build, where, "leave it out", "a colon behind a label");
        return 0;
    }
    if (l->current == NAME && l->previous == NEWLINE) {
        builder_fault(&l->build, where, "write `=`", "`:` defines nothing");
        return EQUALS;
    }
    return lexical_stranger(l, ":", 1, where);
}

/* ---- The parser's side ----------------------------------------------------- */

/* A line swallowed by the statement above is read again as a statement. */
static void read_again(lexical *l)
{
    l->build.muted = l->where;
    l->line = l->where.line;
    l->column = 1;
    l->offset = l->line_offset = l->where_offset;
    lexer_rewind(l->scanner, l->where_offset);
    forget_statement(l);
}

void lexical_complain(lexical *l, uint64_t expected)
{
    if (l->build.status != LB_OK)
        return;
    complaint_report(l, expected);
    bool is_ended = l->current == NEWLINE;
    if (lexical_is_swallowed(l)) {
        read_again(l);
        l->must_end = !is_ended;
    } else if (!is_ended) {
        l->build.is_mute = true;
    }
}

static int skip(lexical *l, union YYSTYPE *value, span *where)
{
    int kind;
    do
        kind = lexer_token(value, where, l->scanner);
    while (kind != NEWLINE && kind != END);
    return kind;
}

int lexical_next(union YYSTYPE *value, span *where, lexical *l)
{
    int kind = l->start;
    if (l->build.status != LB_OK)
        return END;
    if (kind) {
        l->start = 0;
        *where = (span){1, 1, 0};
        return kind;
    }
    if (l->must_end) {
        l->must_end = false;
        *where = l->where;
        return NEWLINE;
    }
    if (l->was_ended)
        forget_statement(l);
    kind = l->build.is_mute ? skip(l, value, where) : lexer_token(value, where, l->scanner);
    if (kind == END && l->current != NEWLINE) {
        l->is_file_end = true;
        kind = end_statement(l, where);
    }
    l->was_ended = kind == NEWLINE;
    return kind;
}
