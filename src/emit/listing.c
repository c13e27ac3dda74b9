/* Layout of statements: four columns in, comments aligned within a paragraph,
 * lines of some 100 columns. */
#include "emit/listing.h"

#include <stdbool.h>
#include <string.h>

#include "base/memory.h"

enum { INDENT = 4, WIDTH = 100, WIDEST_ALIGNED = 56, COMMENT_WIDTH = 120 };

void listing_init(listing *l)
{
    memset(l, 0, sizeof *l);
    buffer_init(&l->text);
}

void listing_clear(listing *l)
{
    buffer_clear(&l->text);
    memory_free(l->lines);
    listing_init(l);
}

void listing_begin(listing *l)
{
    if (memory_grow(&l->lines, &l->capacity, l->count, sizeof *l->lines) != 0) {
        l->text.status = LB_E_NOMEM;
        return;
    }
    l->lines[l->count++] = (listing_line){.code = l->text.length};
}

void listing_comment(listing *l)
{
    if (l->text.status != LB_OK)
        return;
    listing_line *line = &l->lines[l->count - 1];
    line->code_length = l->text.length - line->code;
    line->comment = l->text.length;
}

void listing_end(listing *l)
{
    if (l->text.status != LB_OK)
        return;
    listing_line *line = &l->lines[l->count - 1];
    if (line->code_length == 0)
        line->code_length = l->text.length - line->code;
    else
        line->comment_length = l->text.length - line->comment;
}

/* Characters, not bytes. */
static int width_of(const char *text, size_t length)
{
    int width = 0;
    for (size_t i = 0; i < length; i++)
        width += ((unsigned char)text[i] & 0xc0) != 0x80;
    return width;
}

/* Where a statement may be broken: before an operator with blanks around it. */
static bool is_break(const char *text, size_t at, size_t length)
{
    return at > 0 && at + 2 < length && text[at] == ' ' && (text[at + 1] == '+' || text[at + 1] == '-') &&
           text[at + 2] == ' ';
}

/* The column after the last character. */
static int append_code(buffer *out, const char *text, size_t length)
{
    int column = INDENT;
    size_t done = 0, last = 0;
    buffer_repeat(out, ' ', INDENT);
    for (size_t i = 0; i < length; i++) {
        if (is_break(text, i, length))
            last = i;
        if (column + (int)(i - done) >= WIDTH && last > done) {
            buffer_append_n(out, text + done, last - done);
            buffer_char(out, '\n');
            column = 2 * INDENT;
            buffer_repeat(out, ' ', column);
            done = last + 1;
        }
    }
    buffer_append_n(out, text + done, length - done);
    return column + (int)(length - done);
}

static void flush_line(const listing *l, const listing_line *line, int aligned, buffer *out)
{
    const char *code = l->text.data + line->code, *comment = l->text.data + line->comment;
    int comment_width = width_of(comment, line->comment_length) + 8;
    bool is_beside = INDENT + (int)line->code_length <= WIDTH &&
                     INDENT + (int)line->code_length + comment_width <= COMMENT_WIDTH;
    if (line->comment_length && !is_beside) {
        buffer_append(out, "    /* ");
        buffer_append_n(out, comment, line->comment_length);
        buffer_append(out, " */\n");
    }
    int column = append_code(out, code, line->code_length);
    if (line->comment_length && is_beside) {
        buffer_repeat(out, ' ', column < aligned ? aligned - column : 0);
        buffer_append(out, "  /* ");
        buffer_append_n(out, comment, line->comment_length);
        buffer_append(out, " */");
    }
    buffer_char(out, '\n');
}

void listing_flush(listing *l, buffer *out)
{
    if (l->text.status != LB_OK && out->status == LB_OK)
        out->status = l->text.status;
    int aligned = 0;
    for (size_t i = 0; out->status == LB_OK && i < l->count; i++) {
        int end = INDENT + (int)l->lines[i].code_length;
        if (end <= WIDEST_ALIGNED && end > aligned)
            aligned = end;
    }
    for (size_t i = 0; out->status == LB_OK && i < l->count; i++)
        flush_line(l, &l->lines[i], aligned, out);
    l->count = 0;
    l->text.length = 0;
}
