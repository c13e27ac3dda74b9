/* Widths, wrapping, numbers, emphasis.
 *
 * A line is broken at blanks only, so names, numbers and equations stay whole;
 * a word that is wider than the page stands on a line of its own. */
#include "output/layout.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { DEFAULT_WIDTH = 80, LEAST_WIDTH = 40, PARAGRAPH_WIDTH = 100 };

int layout_width(const lb_layout *layout)
{
    if (!layout || layout->width <= 0)
        return DEFAULT_WIDTH;
    return layout->width < LEAST_WIDTH ? LEAST_WIDTH : layout->width;
}

/* Columns of the first `length` bytes of UTF-8: bytes that continue a character
 * take none, nor do the combining marks U+0300..U+036F (lead bytes CC and CD). */
int layout_columns_n(const char *text, size_t length)
{
    int columns = 0;
    for (size_t i = 0; i < length; i++) {
        unsigned char c = (unsigned char)text[i];
        bool continues = (c & 0xc0) == 0x80;
        unsigned char next = i + 1 < length ? (unsigned char)text[i + 1] : 0;
        bool combines = c == 0xcc || (c == 0xcd && next < 0xb0);
        if (!continues && !combines)
            columns++;
    }
    return columns;
}

int layout_columns(const char *text)
{
    return layout_columns_n(text, strlen(text));
}

void layout_number(double value, int digits, char text[LAYOUT_NUMBER])
{
    if (isnan(value)) {
        snprintf(text, LAYOUT_NUMBER, "undefined");
        return;
    }
    if (isinf(value)) {
        snprintf(text, LAYOUT_NUMBER, value > 0 ? "infinite" : "-infinite");
        return;
    }
    snprintf(text, LAYOUT_NUMBER, "%.*g", digits, value == 0 ? 0.0 : value);
    char *exponent = strchr(text, 'e');
    if (!exponent)
        return;
    /* "e-05" and "e+10" become "e-5" and "e10" */
    const char *from = exponent + 1;
    char *to = exponent + 1;
    if (*from == '-')
        *to++ = '-';
    from++;
    while (*from == '0')
        from++;
    memmove(to, from, strlen(from) + 1);
}

void layout_complex(lb_complex value, int digits, char text[LAYOUT_COMPLEX])
{
    char re[LAYOUT_NUMBER], im[LAYOUT_NUMBER];
    layout_number(value.re, digits, re);
    layout_number(fabs(value.im), digits, im);
    if (value.im == 0)
        snprintf(text, LAYOUT_COMPLEX, "%s", re);
    else
        snprintf(text, LAYOUT_COMPLEX, "%s %s %s i", re, value.im > 0 ? "±" : "-", im);
}

void layout_quantity(buffer *out, double value, int digits, const char *unit)
{
    char number[LAYOUT_NUMBER];
    layout_number(value, digits, number);
    buffer_printf(out, "%s%s%s", number, *unit ? " " : "", unit);
}

void layout_end(buffer *text, buffer *out)
{
    if (buffer_status(text) != LB_OK && buffer_status(out) == LB_OK)
        out->status = buffer_status(text);
    buffer_clear(text);
}

void layout_strong(buffer *out, const lb_layout *layout, const char *text)
{
    if (layout && layout->colour)
        buffer_printf(out, "\033[1m%s\033[0m", text);
    else
        buffer_append(out, text);
}

void layout_heading(buffer *out, const lb_layout *layout, const char *text)
{
    buffer_char(out, '\n');
    layout_strong(out, layout, text);
    buffer_char(out, '\n');
}

void layout_paragraph(buffer *out, const lb_layout *layout, int indent, int hang, const char *text)
{
    int width = layout_width(layout);
    if (width > PARAGRAPH_WIDTH)
        width = PARAGRAPH_WIDTH;
    int used = 0;
    bool first_line = true;
    for (const char *word = text; *word;) {
        word += strspn(word, " \n");
        size_t length = strcspn(word, " \n");
        if (!length)
            break;
        int columns = layout_columns_n(word, length);
        if (used > 0 && used + 1 + columns > width) {
            buffer_char(out, '\n');
            used = 0;
            first_line = false;
        }
        if (used == 0) {
            used = indent + (first_line ? 0 : hang);
            buffer_repeat(out, ' ', used);
        } else {
            buffer_char(out, ' ');
            used++;
        }
        buffer_append_n(out, word, length);
        used += columns;
        word += length;
    }
    buffer_char(out, '\n');
}

void layout_printf(buffer *out, const lb_layout *layout, int indent, const char *format, ...)
{
    buffer text;
    buffer_init(&text);
    va_list list;
    va_start(list, format);
    buffer_vprintf(&text, format, list);
    va_end(list);
    if (buffer_status(&text) == LB_OK)
        layout_paragraph(out, layout, indent, 0, buffer_get(&text));
    layout_end(&text, out);
}
