/* Texts and numbers as C spells them.
 *
 * Strings keep printable ASCII and write every other byte as three octal digits,
 * which no following digit can lengthen; `?` is escaped for the trigraphs.
 * Comments keep letters of any script and replace whatever could end the
 * comment, splice a line or turn the direction of writing by its code point in
 * angle brackets (N. Boucher and R. Anderson, "Trojan Source", 2021, for the
 * last).  Numbers take as many digits as reading them back needs. */
#include "emit/spell.h"

#include <ctype.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { LONGEST_STRING = 4000, LONGEST_IDENTIFIER = 40 };

static bool is_plain(unsigned char c)
{
    return c >= 0x20 && c < 0x7f;
}

static void spell_bytes(buffer *out, const char *text)
{
    buffer_append(out, "(const char[]){");
    for (; *text; text++)
        buffer_printf(out, "'\\%03o', ", (unsigned)(unsigned char)*text);
    buffer_append(out, "'\\0'}");
}

void spell_string(buffer *out, const char *text)
{
    if (strlen(text) > LONGEST_STRING) {
        spell_bytes(out, text);
        return;
    }
    buffer_char(out, '"');
    for (; *text; text++) {
        unsigned char c = (unsigned char)*text;
        if (c == '"' || c == '\\' || c == '?')
            buffer_char(out, '\\');
        if (is_plain(c))
            buffer_char(out, (char)c);
        else
            buffer_printf(out, "\\%03o", (unsigned)c);
    }
    buffer_char(out, '"');
}

/* Length of the UTF-8 sequence at text and its code point; 0 when it is none
 * (RFC 3629: no overlong forms, no surrogates, nothing above U+10FFFF). */
static int decode(const unsigned char *text, uint32_t *point)
{
    static const uint32_t least[5] = {0, 0, 0x80, 0x800, 0x10000};
    int length = text[0] < 0x80 ? 1 : text[0] >= 0xf0 ? 4 : text[0] >= 0xe0 ? 3 : text[0] >= 0xc0 ? 2 : 0;
    if (length <= 1) {
        *point = text[0];
        return length;
    }
    uint32_t value = text[0] & (0x7fu >> length);
    for (int i = 1; i < length; i++) {
        if ((text[i] & 0xc0) != 0x80)
            return 0;
        value = value << 6 | (text[i] & 0x3fu);
    }
    *point = value;
    bool is_valid = value >= least[length] && value <= 0x10ffff && (value < 0xd800 || value > 0xdfff);
    return is_valid ? length : 0;
}

/* Code points that show as themselves and do nothing else. */
static bool is_harmless(uint32_t point)
{
    static const struct { uint32_t first, last; } hidden[] = {
        {0x7f, 0xa0}, {0xad, 0xad}, {0x61c, 0x61c}, {0x180e, 0x180e}, {0x2000, 0x200f}, {0x2028, 0x202f},
        {0x205f, 0x206f}, {0x3000, 0x3000}, {0xe000, 0xf8ff}, {0xfe00, 0xfe0f}, {0xfeff, 0xfeff},
        {0xfff0, 0xffff}, {0x1fffe, 0x1ffff}, {0xe0000, 0x10ffff},
    };
    if (point < 0x20 || point == '\\')
        return false;
    for (size_t i = 0; i < sizeof hidden / sizeof *hidden; i++)
        if (point >= hidden[i].first && point <= hidden[i].last)
            return false;
    return true;
}

void spell_comment(buffer *out, const char *text, size_t limit)
{
    const unsigned char *at = (const unsigned char *)text;
    uint32_t previous = 0;
    while (*at) {
        if (limit && (size_t)(at - (const unsigned char *)text) >= limit) {
            buffer_append(out, "...");
            return;
        }
        uint32_t point = 0;
        int length = decode(at, &point);
        if (length == 0) {
            buffer_printf(out, "<0x%02X>", (unsigned)*at);
            length = 1;
            point = 0;
        } else if (!is_harmless(point)) {
            buffer_printf(out, "<U+%04X>", (unsigned)point);
        } else {
            bool would_join = (previous == '*' && point == '/') || (previous == '/' && point == '*') ||
                              (previous == '?' && point == '?');
            if (would_join)
                buffer_char(out, ' ');
            buffer_append_n(out, (const char *)at, (size_t)length);
        }
        previous = point;
        at += length;
    }
}

/* A caller's locale may write the point in its own way. */
static void restore_point(char *text)
{
    for (char *c = text; *c; c++)
        if (!isdigit((unsigned char)*c) && !strchr("+-e", *c))
            *c = '.';
}

/* "1.5e+09" becomes "1.5e9", "2.000e-05" "2e-5". */
static void shorten_exponent(char *text)
{
    char *e = strchr(text, 'e'), *end = e;
    int exponent = atoi(e + 1);
    if (memchr(text, '.', (size_t)(e - text)))
        while (end[-1] == '0')
            end--;
    if (end[-1] == '.')
        end--;
    snprintf(end, 8, "e%d", exponent);
}

void spell_number(buffer *out, double value)
{
    if (!isfinite(value)) {
        buffer_append(out, isnan(value) ? "NAN" : value < 0 ? "-INFINITY" : "INFINITY");
        return;
    }
    char text[40];
    int digits = 15;
    while (snprintf(text, sizeof text, "%.*g", digits, value) > 0 && digits < 17 && strtod(text, NULL) != value)
        digits++;
    bool is_large = fabs(value) >= 1e6 && !strchr(text, 'e');
    char scientific[40];
    snprintf(scientific, sizeof scientific, "%.*e", digits - 1, value);
    restore_point(text);
    restore_point(scientific);
    shorten_exponent(scientific);
    if (strchr(text, 'e') || (is_large && strlen(scientific) < strlen(text)))
        buffer_append(out, scientific);
    else
        buffer_printf(out, strchr(text, '.') ? "%s" : "%s.0", text);
}

static bool is_letter_or_digit(char c)
{
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9');
}

void spell_identifier(buffer *out, const char *name)
{
    bool has_gap = false;
    int length = 0;
    for (; *name && length < LONGEST_IDENTIFIER; name++) {
        if (!is_letter_or_digit(*name)) {
            has_gap = true;
            continue;
        }
        if (has_gap && length > 0) {
            buffer_char(out, '_');
            length++;
        }
        buffer_char(out, *name);
        length++;
        has_gap = false;
    }
}

static bool is_word_of_c(const char *name)
{
    static const char *const words[] = {
        "auto", "break", "case", "char", "const", "continue", "default", "do", "double", "else", "enum", "extern",
        "float", "for", "goto", "if", "inline", "int", "long", "register", "restrict", "return", "short", "signed",
        "sizeof", "static", "struct", "switch", "typedef", "union", "unsigned", "void", "volatile", "while",
    };
    for (size_t i = 0; i < sizeof words / sizeof *words; i++)
        if (strcmp(name, words[i]) == 0)
            return true;
    return false;
}

bool spell_is_prefix(const char *name)
{
    /* Names that begin with an underscore belong to the C implementation. */
    if (!is_letter_or_digit(name[0]) || isdigit((unsigned char)name[0]))
        return false;
    for (const char *c = name; *c; c++)
        if (!is_letter_or_digit(*c) && *c != '_')
            return false;
    return !is_word_of_c(name);
}
