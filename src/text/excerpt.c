/* How one fault or warning is shown:
 *
 *     bath.mech:12:9: error: `=>` is no arrow
 *         (R1) A => B, k = 1
 *                ^~
 *         write `->`
 *
 * A line is shown through a window of WINDOW characters around the place.  Tabs
 * become one blank and control characters `?`, bytes that are not UTF-8 the
 * replacement character, so that each takes the room that the caret line
 * reckons with. */
#include "text/excerpt.h"

#include "base/buffer.h"
#include "text/utf8.h"

enum { WINDOW = 96, BEFORE = 48 }; /* characters shown at most, and of them before the place */

static const char INDENT[] = "    ";

static const char *next_character(const char *at, const char *end)
{
    uint32_t code;
    int bytes = utf8_decode(at, (size_t)(end - at), &code);
    return at + (bytes ? bytes : 1);
}

/* The start of the character before `at`; a stray byte is a character. */
static const char *previous_character(const char *start, const char *at, const char *end)
{
    for (int back = 4; back > 1; back--)
        if (at - start >= back && next_character(at - back, end) == at)
            return at - back;
    return at - 1;
}

/* The byte at a column, or the end of the line. */
static const char *find_column(const char *start, const char *end, int line, int column, excerpt_cursor *cursor)
{
    if (cursor->line != line || cursor->column > column)
        *cursor = (excerpt_cursor){line, 1, start};
    while (cursor->column < column && cursor->place < end) {
        cursor->place = next_character(cursor->place, end);
        cursor->column++;
    }
    return cursor->place;
}

/* Append one character as it is shown; returns its width. */
static int show_character(const char *at, const char *end, lb_text *out)
{
    uint32_t code;
    int bytes = utf8_decode(at, (size_t)(end - at), &code);
    if (bytes == 0) {
        buffer_append(out, "\xEF\xBF\xBD");
        return 1;
    }
    if (code == '\t') {
        buffer_char(out, ' ');
        return 1;
    }
    if (code < 0x20 || (code >= 0x7F && code < 0xA0)) {
        buffer_char(out, '?');
        return 1;
    }
    buffer_append_n(out, at, (size_t)bytes);
    return utf8_width(code);
}

/* The source line through its window, and the caret line under it. */
static void show_line(const source *s, const lb_diagnostic *d, bool colour, excerpt_cursor *cursor, lb_text *out)
{
    const char *start;
    size_t length;
    if (!source_line(s, d->line, &start, &length) || length == 0)
        return;
    const char *end = start + length;
    const char *place = find_column(start, end, d->line, d->column, cursor);
    const char *from = place;
    for (int i = 0; i < BEFORE && from > start; i++)
        from = previous_character(start, from, end);
    buffer_append(out, INDENT);
    int before = 0, under = 0, shown = 0;
    if (from > start) {
        buffer_append(out, "...");
        before = 3;
    }
    const char *at = from;
    for (int marked = 0; at < end && shown < WINDOW; shown++) {
        int width = show_character(at, end, out);
        if (at < place)
            before += width;
        else if (marked++ < d->length)
            under += width;
        at = next_character(at, end);
    }
    buffer_append(out, at < end ? "...\n" : "\n");
    buffer_append(out, INDENT);
    buffer_repeat(out, ' ', before);
    buffer_append(out, colour ? "\033[32m^" : "^");
    buffer_repeat(out, '~', under > 1 ? under - 1 : 0);
    buffer_append(out, colour ? "\033[0m\n" : "\n");
}

void excerpt_write(const source *s, const lb_diagnostic *d, bool colour, excerpt_cursor *cursor, lb_text *out)
{
    const char *kind = d->is_fault ? "error" : "warning";
    const char *paint = !colour ? "" : d->is_fault ? "\033[1;31m" : "\033[1;35m";
    buffer_printf(out, "%s%s:%d:%d:%s %s%s:%s %s\n", colour ? "\033[1m" : "", source_name(s), d->line, d->column,
                  colour ? "\033[0m" : "", paint, kind, colour ? "\033[0m" : "", d->message);
    show_line(s, d, colour, cursor, out);
    if (d->remedy[0])
        buffer_printf(out, "%s%s\n", INDENT, d->remedy);
}
