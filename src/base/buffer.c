/* Growing text with an upper limit and sticky errors. */
#include "base/buffer.h"

#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include "base/memory.h"

void buffer_init(buffer *b)
{
    *b = (buffer){.status = LB_OK};
}

void buffer_clear(buffer *b)
{
    memory_free(b->data);
    buffer_init(b);
}

/* Room for `extra` more bytes and the terminator. */
static int reserve(buffer *b, size_t extra)
{
    if (b->status != LB_OK)
        return -1;
    if (extra >= BUFFER_LIMIT || b->length > BUFFER_LIMIT - extra - 1) {
        b->status = LB_E_LIMIT;
        return -1;
    }
    size_t needed = b->length + extra + 1;
    if (needed <= b->capacity)
        return 0;
    size_t wanted = b->capacity ? 2 * b->capacity : 256;
    if (wanted < needed)
        wanted = needed;
    char *bigger = memory_resize(b->data, wanted, 1);
    if (!bigger) {
        b->status = LB_E_NOMEM;
        return -1;
    }
    b->data = bigger;
    b->capacity = wanted;
    return 0;
}

void buffer_append_n(buffer *b, const char *text, size_t length)
{
    if (reserve(b, length))
        return;
    if (length)
        memcpy(b->data + b->length, text, length);
    b->length += length;
    b->data[b->length] = '\0';
}

void buffer_append(buffer *b, const char *text)
{
    buffer_append_n(b, text, strlen(text));
}

void buffer_char(buffer *b, char c)
{
    buffer_append_n(b, &c, 1);
}

void buffer_repeat(buffer *b, char c, int count)
{
    for (int i = 0; i < count; i++)
        buffer_char(b, c);
}

void buffer_vprintf(buffer *b, const char *format, va_list list)
{
    va_list again;
    va_copy(again, list);
    int length = vsnprintf(NULL, 0, format, again);
    va_end(again);
    if (length < 0) {
        b->status = b->status == LB_OK ? LB_E_ARG : b->status;
        return;
    }
    if (reserve(b, (size_t)length))
        return;
    vsnprintf(b->data + b->length, (size_t)length + 1, format, list);
    b->length += (size_t)length;
}

void buffer_printf(buffer *b, const char *format, ...)
{
    va_list list;
    va_start(list, format);
    buffer_vprintf(b, format, list);
    va_end(list);
}

const char *buffer_get(const buffer *b)
{
    return b->data ? b->data : "";
}

lb_status buffer_status(const buffer *b)
{
    return b->status;
}

char *buffer_take(buffer *b)
{
    if (b->status != LB_OK) {
        buffer_clear(b);
        return NULL;
    }
    char *text = b->data ? memory_resize(b->data, b->length + 1, 1) : memory_text("");
    if (!text)
        text = b->data;
    buffer_init(b);
    return text;
}

lb_text *lb_text_new(void)
{
    lb_text *text = memory_alloc(sizeof *text);
    if (text)
        buffer_init(text);
    return text;
}

const char *lb_text_get(const lb_text *text, size_t *length)
{
    if (length)
        *length = text->length;
    return buffer_get(text);
}

void lb_text_free(lb_text *text)
{
    if (text)
        buffer_clear(text);
    memory_free(text);
}
