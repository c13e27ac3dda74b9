/* What the text ahead looks like.
 *
 * A few questions that the lexer asks about characters it has not read yet, to
 * tell a keyword from a name, and after a fault the next statement from more of
 * the faulty one.  They are guesses by a glance, not parsing: each looks at one
 * line at most. */
#include "text/outlook.h"

#include <string.h>

static bool is_word_byte(char c)
{
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_'
        || (unsigned char)c >= 0x80;
}

static size_t word_length(const char *text)
{
    const char *at = text;
    while (is_word_byte(*at))
        at++;
    return (size_t)(at - text);
}

const char *outlook_skip_blanks(const char *text)
{
    return text + strspn(text, " \t");
}

static bool is_equals(const char *at)
{
    at = outlook_skip_blanks(at);
    return at[0] == '=' && at[1] != '>' && at[1] != '=';
}

static bool is_word(const char *word, size_t length, const char *of[], size_t count)
{
    for (size_t i = 0; i < count; i++)
        if (strlen(of[i]) == length && memcmp(word, of[i], length) == 0)
            return true;
    return false;
}

bool outlook_is_setting(const char *text)
{
    static const char *settings[] = {"k", "kf", "kr", "K", "v"};
    size_t length = word_length(text);
    return is_word(text, length, settings, sizeof settings / sizeof settings[0]) && is_equals(text + length);
}

bool outlook_has_arrow(const char *at)
{
    for (bool is_quoted = false; *at && *at != '\n' && *at != '\r'; at++) {
        if (*at == '"')
            is_quoted = !is_quoted;
        if (is_quoted)
            continue;
        if (*at == '#' || *at == ';')
            return false;
        if (at[1] == '>' && (*at == '-' || *at == '='))
            return true;
        if (strncmp(at, "\xE2\x86\x92", 3) == 0 || strncmp(at, "\xE2\x87\x8C", 3) == 0)
            return true;
    }
    return false;
}

/* `[X] =`, `[X]0 =` or `[X]in =`. */
static bool is_bracket_definition(const char *at)
{
    at += strcspn(at, "]\r\n");
    return *at == ']' && is_equals(at + 1 + word_length(at + 1));
}

/* A word that opens a statement, with what it opens behind it. */
static bool is_opening(const char *at, size_t length)
{
    static const char *openings[] = {"title", "units", "retained", "signed", "formula"};
    const char *next = outlook_skip_blanks(at + length);
    return is_word(at, length, openings, sizeof openings / sizeof openings[0]) && next > at + length
        && (is_word_byte(*next) || *next == '"');
}

bool outlook_is_statement(const char *line, bool is_listed, bool is_nested)
{
    const char *at = outlook_skip_blanks(line);
    size_t length = word_length(at);
    if (*at == '[' && is_bracket_definition(at))
        return true;
    if (length > 0 && is_opening(at, length))
        return true;
    if (length > 0 && is_equals(at + length))
        return !(is_listed && (is_nested || outlook_is_setting(at)));
    return outlook_has_arrow(at);
}
