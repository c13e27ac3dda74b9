/* Tables of names, and the nearest known name for a wrong one.
 *
 * The table is open addressing with linear probing over FNV-1a, at most half
 * full.  "Near" is the optimal string alignment distance (insertion, deletion,
 * substitution, transposition of neighbours; Damerau 1964, Comm. ACM 7, 171),
 * with a wrong case at an eighth of an edit; how many edits are allowed grows
 * with the length of the word. */
#include "model/names.h"

#include <stdbool.h>
#include <stdint.h>
#include <string.h>

#include "base/memory.h"
#include "limbeck.h"

/* ---- The table ------------------------------------------------------------ */

void names_init(names *table)
{
    *table = (names){.count = 0};
}

void names_clear(names *table)
{
    memory_free(table->name);
    memory_free(table->value);
    memory_free(table->slot);
    names_init(table);
}

static uint32_t hash(const char *name)
{
    uint64_t h = 14695981039346656037u;
    for (const unsigned char *c = (const unsigned char *)name; *c; c++)
        h = (h ^ *c) * 1099511628211u;
    return (uint32_t)(h ^ (h >> 32));
}

/* Slot of the name, or the empty slot where it belongs. */
static names_slot *find_slot(const names *table, const char *name, uint32_t h)
{
    size_t i = h & (table->slots - 1);
    while (table->slot[i].entry >= 0
           && (table->slot[i].hash != h || strcmp(table->name[table->slot[i].entry], name) != 0))
        i = (i + 1) & (table->slots - 1);
    return &table->slot[i];
}

int names_find(const names *table, const char *name)
{
    if (table->slots == 0)
        return -1;
    int entry = find_slot(table, name, hash(name))->entry;
    return entry < 0 ? -1 : table->value[entry];
}

/* Twice the slots; the entries move by their hashes alone. */
static int make_slots(names *table, size_t slots)
{
    names_slot *fresh = memory_array(slots, sizeof *fresh);
    if (!fresh)
        return -1;
    for (size_t i = 0; i < slots; i++)
        fresh[i] = (names_slot){0, -1};
    for (size_t i = 0; i < table->slots; i++) {
        size_t to = table->slot[i].hash & (slots - 1);
        while (table->slot[i].entry >= 0 && fresh[to].entry >= 0)
            to = (to + 1) & (slots - 1);
        if (table->slot[i].entry >= 0)
            fresh[to] = table->slot[i];
    }
    memory_free(table->slot);
    table->slot = fresh;
    table->slots = slots;
    return 0;
}

int names_add(names *table, const char *name, int value)
{
    if (2 * (table->count + 1) > table->slots && make_slots(table, table->slots ? 2 * table->slots : 32))
        return -1;
    if (memory_grow(&table->name, &table->name_capacity, table->count, sizeof *table->name)
        || memory_grow(&table->value, &table->value_capacity, table->count, sizeof *table->value))
        return -1;
    uint32_t h = hash(name);
    *find_slot(table, name, h) = (names_slot){h, (int)table->count};
    table->name[table->count] = name;
    table->value[table->count++] = value;
    return 0;
}

const char *names_nearest(const names *table, const char *word)
{
    return lb_nearest(word, table->name, table->count);
}

/* ---- Nearness ------------------------------------------------------------- */

enum { LONGEST = 48, EDIT = 8, WRONG_CASE = 1 };

/* Characters of UTF-8 text; -1 when there are more than LONGEST. */
static int characters(const char *text, uint32_t *out)
{
    int count = 0;
    for (const unsigned char *c = (const unsigned char *)text; *c; c++) {
        if ((*c & 0xC0) == 0x80 && count > 0) {
            out[count - 1] = out[count - 1] << 6 | (*c & 0x3F);
        } else {
            if (count == LONGEST)
                return -1;
            out[count++] = *c;
        }
    }
    return count;
}

static uint32_t lower_case(uint32_t c)
{
    return c >= 'A' && c <= 'Z' ? c + ('a' - 'A') : c;
}

static int substitution(uint32_t a, uint32_t b)
{
    if (a == b)
        return 0;
    return lower_case(a) == lower_case(b) ? WRONG_CASE : EDIT;
}

static int least(int a, int b)
{
    return a < b ? a : b;
}

/* Rows of the distance table: this one and the two before it. */
static int distance(const uint32_t *a, int a_count, const uint32_t *b, int b_count)
{
    int rows[3][LONGEST + 1];
    for (int j = 0; j <= b_count; j++)
        rows[0][j] = EDIT * j;
    for (int i = 1; i <= a_count; i++) {
        int *row = rows[i % 3], *above = rows[(i + 2) % 3], *above2 = rows[(i + 1) % 3];
        row[0] = EDIT * i;
        for (int j = 1; j <= b_count; j++) {
            row[j] = least(above[j], row[j - 1]) + EDIT;
            row[j] = least(row[j], above[j - 1] + substitution(a[i - 1], b[j - 1]));
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                row[j] = least(row[j], above2[j - 2] + EDIT);
        }
    }
    return rows[a_count % 3][b_count];
}

/* A name of one letter is near to its other case alone. */
static int allowed(int length)
{
    if (length <= 1)
        return WRONG_CASE;
    if (length <= 4)
        return EDIT;
    return length <= 8 ? 2 * EDIT : 3 * EDIT;
}

const char *lb_nearest(const char *word, const char *const *candidates, size_t count)
{
    uint32_t wanted[LONGEST], other[LONGEST];
    int length = characters(word, wanted);
    if (length < 0)
        return NULL;
    int best = allowed(length) + 1;
    const char *nearest = NULL;
    for (size_t i = 0; i < count; i++) {
        int other_length = characters(candidates[i], other);
        int gap = other_length > length ? other_length - length : length - other_length;
        if (other_length < 0 || EDIT * gap >= best || strcmp(word, candidates[i]) == 0)
            continue;
        int d = distance(wanted, length, other, other_length);
        if (d < best) {
            best = d;
            nearest = candidates[i];
        }
    }
    return nearest;
}
