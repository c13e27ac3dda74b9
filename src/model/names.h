/* Tables of names, and the nearest known name for a wrong one. */
#ifndef LIMBECK_MODEL_NAMES_H
#define LIMBECK_MODEL_NAMES_H

#include <stddef.h>
#include <stdint.h>

typedef struct names_slot {
    uint32_t hash;          /* most names that differ do so here already */
    int entry;              /* index into the arrays of the table, -1 empty */
} names_slot;

/* Name -> number, open addressing.  Names are borrowed and must outlive the table. */
typedef struct names {
    const char **name;      /* [count] in order of entry */
    int *value;             /* [count] */
    size_t count, name_capacity, value_capacity;
    names_slot *slot;       /* [slots] */
    size_t slots;           /* a power of two */
} names;

void names_init(names *table);
void names_clear(names *table);
int  names_find(const names *table, const char *name);            /* the number, or -1 */
/* Enter a name that is not there yet.  0, or -1 without memory. */
int  names_add(names *table, const char *name, int value);
/* The nearest other name of the table, or NULL when none is near. */
const char *names_nearest(const names *table, const char *word);

#endif
