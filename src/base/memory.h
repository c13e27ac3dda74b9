/* Checked allocation: the one door to the heap, and arenas freed at once. */
#ifndef LIMBECK_BASE_MEMORY_H
#define LIMBECK_BASE_MEMORY_H

#include <stddef.h>

/* Heap blocks.  Each returns NULL when memory is exhausted or the size
 * overflows; a size of zero gives a block of one byte, so NULL always means
 * failure.  The caller owns the block and gives it back to memory_free, which
 * takes NULL. */
void *memory_alloc(size_t size);
void *memory_array(size_t count, size_t size);            /* uninitialised */
void *memory_zeroed(size_t count, size_t size);           /* all bytes zero */
void *memory_resize(void *block, size_t count, size_t size); /* block is untouched on failure */
char *memory_text(const char *text);                      /* copy of a C string */
char *memory_text_n(const char *text, size_t length);     /* copy of length bytes, terminated */
void  memory_free(void *block);

/* Make room for one more element in a growing array: *array holds *capacity
 * elements of the given size, count of them in use.  Doubles the capacity when
 * full.  Returns 0, or -1 without memory (the array stays as it was). */
int memory_grow(void *array, size_t *capacity, size_t count, size_t size);

/* For tests: make every allocation of this thread fail after `count` more
 * successful ones; a negative count switches the failures off. */
void memory_fail_after(long count);

/* An arena: many small blocks with one lifetime. */
typedef struct arena arena;
arena *arena_new(void);                                   /* NULL without memory */
void  *arena_alloc(arena *a, size_t size);                /* zeroed, aligned for any type; NULL without memory */
char  *arena_text_n(arena *a, const char *text, size_t length);
void   arena_free(arena *a);                              /* takes NULL */

#endif
