/* Checked allocation and arenas.
 *
 * All memory of the library passes through here, so that a test can make the
 * k-th allocation fail.  An arena is a list of chunks; blocks are handed out
 * from the newest one and never given back singly. */
#include "base/memory.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

/* The countdown belongs to the thread that set it: a test switch, not state
 * of the library. */
static _Thread_local long failure_countdown = -1;

void memory_fail_after(long count)
{
    failure_countdown = count;
}

static int must_fail(void)
{
    if (failure_countdown < 0)
        return 0;
    if (failure_countdown == 0)
        return 1;
    failure_countdown--;
    return 0;
}

void *memory_alloc(size_t size)
{
    return must_fail() ? NULL : malloc(size ? size : 1);
}

void *memory_array(size_t count, size_t size)
{
    if (size && count > SIZE_MAX / size)
        return NULL;
    return memory_alloc(count * size);
}

void *memory_zeroed(size_t count, size_t size)
{
    if (must_fail())
        return NULL;
    return calloc(count ? count : 1, size ? size : 1);
}

void *memory_resize(void *block, size_t count, size_t size)
{
    if (size && count > SIZE_MAX / size)
        return NULL;
    size_t bytes = count * size;
    return must_fail() ? NULL : realloc(block, bytes ? bytes : 1);
}

char *memory_text_n(const char *text, size_t length)
{
    char *copy = memory_alloc(length + 1);
    if (copy) {
        if (length)
            memcpy(copy, text, length);
        copy[length] = '\0';
    }
    return copy;
}

char *memory_text(const char *text)
{
    return memory_text_n(text, strlen(text));
}

void memory_free(void *block)
{
    free(block);
}

int memory_grow(void *array, size_t *capacity, size_t count, size_t size)
{
    if (count < *capacity)
        return 0;
    size_t wanted = *capacity ? 2 * *capacity : 8;
    void *old;
    memcpy(&old, array, sizeof old);
    void *bigger = memory_resize(old, wanted, size);
    if (!bigger)
        return -1;
    memcpy(array, &bigger, sizeof bigger);
    *capacity = wanted;
    return 0;
}

struct chunk {
    struct chunk *next;
    size_t used, size;
    max_align_t data[];
};

struct arena {
    struct chunk *chunks; /* newest first */
};

enum { CHUNK_SIZE = 32 * 1024 };

arena *arena_new(void)
{
    return memory_zeroed(1, sizeof(arena));
}

static struct chunk *add_chunk(arena *a, size_t least)
{
    size_t size = least > CHUNK_SIZE ? least : CHUNK_SIZE;
    if (size > SIZE_MAX - sizeof(struct chunk))
        return NULL;
    struct chunk *fresh = memory_zeroed(1, sizeof(struct chunk) + size);
    if (!fresh)
        return NULL;
    fresh->size = size;
    fresh->next = a->chunks;
    a->chunks = fresh;
    return fresh;
}

void *arena_alloc(arena *a, size_t size)
{
    const size_t align = _Alignof(max_align_t);
    if (size > SIZE_MAX - align)
        return NULL;
    size = (size + align - 1) / align * align;
    struct chunk *top = a->chunks;
    if (!top || top->size - top->used < size)
        top = add_chunk(a, size);
    if (!top)
        return NULL;
    void *block = (char *)top->data + top->used;
    top->used += size;
    return block;
}

char *arena_text_n(arena *a, const char *text, size_t length)
{
    char *copy = arena_alloc(a, length + 1);
    if (copy && length)
        memcpy(copy, text, length);
    return copy;
}

void arena_free(arena *a)
{
    if (!a)
        return;
    while (a->chunks) {
        struct chunk *next = a->chunks->next;
        memory_free(a->chunks);
        a->chunks = next;
    }
    memory_free(a);
}
