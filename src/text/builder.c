/* The builder of a syntax tree: its arena, its faults, places put together. */
#include "text/builder.h"

#include <stdio.h>
#include <string.h>

#include "base/memory.h"

void *builder_alloc(builder *b, size_t size)
{
    void *block = b->status == LB_OK ? arena_alloc(b->arena, size) : NULL;
    if (!block)
        b->status = LB_E_NOMEM;
    return block;
}

const char *builder_text(builder *b, const char *text, size_t length)
{
    char *copy = builder_alloc(b, length + 1);
    if (copy && length)
        memcpy(copy, text, length);
    return copy;
}

static bool is_after(span place, span mark)
{
    return place.line > mark.line || (place.line == mark.line && place.column > mark.column);
}

void builder_fault(builder *b, span where, const char *remedy, const char *format, ...)
{
    if (b->is_mute || !is_after(where, b->muted))
        return;
    char message[512];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(message, sizeof message, format, arguments);
    va_end(arguments);
    diagnostics_fault(b->diagnostics, where, remedy, "%s", message);
}

span span_join(span a, span b)
{
    if (b.line == a.line && b.column + b.length > a.column + a.length)
        a.length = b.column + b.length - a.column;
    return a;
}

bool span_touches(span a, span b)
{
    return a.line == b.line && a.column + a.length == b.column;
}
