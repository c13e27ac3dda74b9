/* The builder of a syntax tree: its arena, its faults, places put together. */
#include "text/builder.h"

#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include "base/memory.h"

void *builder_alloc(builder *b, size_t size)
{
    void *block = b->status == LB_OK ? arena_alloc(b->tree->page->arena, size) : NULL;
    if (!block)
        b->status = LB_E_NOMEM;
    return block;
}

bool builder_turn_page(builder *b)
{
    syntax_page *page = arena_alloc(b->arena, sizeof *page);
    if (!page || !(page->arena = arena_new())) {
        b->status = LB_E_NOMEM;
        return false;
    }
    page->is_plain = true;
    if (b->tree->page)
        b->tree->page->next = page;
    else
        b->tree->pages = page;
    b->tree->page = page;
    return true;
}

/* FNV-1a. */
static size_t hash(const char *text, size_t length)
{
    uint64_t h = 14695981039346656037u;
    for (size_t i = 0; i < length; i++)
        h = (h ^ (unsigned char)text[i]) * 1099511628211u;
    return (size_t)(h ^ h >> 32);
}

/* Slot of the text, or the empty one where it belongs. */
static size_t find_text(const builder *b, const char *text, size_t length)
{
    size_t i = hash(text, length) & (b->text_slots - 1);
    while (b->texts[i] && (strncmp(b->texts[i], text, length) != 0 || b->texts[i][length] != '\0'))
        i = (i + 1) & (b->text_slots - 1);
    return i;
}

static bool grow_texts(builder *b)
{
    size_t slots = b->text_slots ? 2 * b->text_slots : 256, old_slots = b->text_slots;
    const char **old = b->texts, **fresh = memory_zeroed(slots, sizeof *fresh);
    if (!fresh)
        return false;
    b->texts = fresh;
    b->text_slots = slots;
    for (size_t i = 0; i < old_slots; i++)
        if (old[i])
            fresh[find_text(b, old[i], strlen(old[i]))] = old[i];
    memory_free(old);
    return true;
}

/* Most texts of a mechanism are names, and stand in many places. */
const char *builder_text(builder *b, const char *text, size_t length)
{
    if (2 * (b->text_count + 1) > b->text_slots && !grow_texts(b)) {
        b->status = LB_E_NOMEM;
        return NULL;
    }
    size_t slot = find_text(b, text, length);
    if (!b->texts[slot]) {
        char *copy = b->status == LB_OK ? arena_alloc(b->arena, length + 1) : NULL;
        if (!copy) {
            b->status = LB_E_NOMEM;
            return NULL;
        }
        memcpy(copy, text, length);
        b->texts[slot] = copy;
        b->text_count++;
    }
    return b->texts[slot];
}

void builder_clear(builder *b)
{
    memory_free(b->texts);
    b->texts = NULL;
    b->text_count = b->text_slots = 0;
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
