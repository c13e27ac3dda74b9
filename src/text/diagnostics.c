/* The list of faults and warnings about a source.
 *
 * A list keeps the first DIAGNOSTICS_KEPT faults and as many warnings; the
 * rest are counted.  Control characters in a message (names come from the
 * user's file) are replaced, so that no message can steer a terminal.  How a
 * list is shown is in excerpt.c. */
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "text/excerpt.h"
#include "text/source.h"
#include "text/utf8.h"

enum { DIAGNOSTICS_KEPT = 100 };

struct entry {
    bool  is_fault;
    span  where;
    char *message, *remedy;  /* owned; remedy may be NULL */
    size_t order;            /* of arrival: ties at one place stay in it */
};

struct lb_diagnostics {
    source       *source;
    struct entry *entry;
    size_t        count, capacity;
    size_t        faults, warnings;   /* all that were added */
    lb_status     status;
};

lb_status diagnostics_new(source *s, lb_diagnostics **out)
{
    *out = memory_zeroed(1, sizeof **out);
    if (!*out) {
        source_free(s);
        return LB_E_NOMEM;
    }
    (*out)->source = s;
    return LB_OK;
}

static void entry_clear(struct entry *e)
{
    memory_free(e->message);
    memory_free(e->remedy);
}

void lb_diagnostics_free(lb_diagnostics *list)
{
    if (!list)
        return;
    for (size_t i = 0; i < list->count; i++)
        entry_clear(&list->entry[i]);
    memory_free(list->entry);
    source_free(list->source);
    memory_free(list);
}

const source *diagnostics_source(const lb_diagnostics *list)
{
    return list->source;
}

lb_status diagnostics_status(const lb_diagnostics *list)
{
    return list->status;
}

/* Control characters and whatever is not UTF-8 (a name cut short) become `?`. */
static void make_printable(char *text)
{
    size_t length = strlen(text);
    for (size_t i = 0; i < length;) {
        uint32_t code;
        int bytes = utf8_decode(text + i, length - i, &code);
        bool is_printable = bytes && code >= 0x20 && (code < 0x7F || code >= 0xA0);
        if (!is_printable)
            memset(text + i, '?', bytes ? (size_t)bytes : 1);
        i += bytes ? (size_t)bytes : 1;
    }
}

/* One entry more, or LB_E_NOMEM with the list as it was. */
static lb_status keep(lb_diagnostics *list, bool is_fault, span where, const char *remedy, const char *format,
                      va_list arguments)
{
    buffer text;
    buffer_init(&text);
    buffer_vprintf(&text, format, arguments);
    struct entry fresh = {is_fault, where, buffer_take(&text), remedy ? memory_text(remedy) : NULL,
                          list->faults + list->warnings};
    buffer_clear(&text);
    if (!fresh.message || (remedy && !fresh.remedy)
        || memory_grow(&list->entry, &list->capacity, list->count, sizeof *list->entry)) {
        entry_clear(&fresh);
        return LB_E_NOMEM;
    }
    make_printable(fresh.message);
    if (fresh.remedy)
        make_printable(fresh.remedy);
    list->entry[list->count++] = fresh;
    return LB_OK;
}

static void add(lb_diagnostics *list, bool is_fault, span where, const char *remedy, const char *format,
                va_list arguments)
{
    size_t *total = is_fault ? &list->faults : &list->warnings;
    if (*total < DIAGNOSTICS_KEPT && keep(list, is_fault, where, remedy, format, arguments) != LB_OK)
        list->status = LB_E_NOMEM;
    ++*total;
}

void diagnostics_fault(lb_diagnostics *list, span where, const char *remedy, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    add(list, true, where, remedy, format, arguments);
    va_end(arguments);
}

void diagnostics_warn(lb_diagnostics *list, span where, const char *remedy, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    add(list, false, where, remedy, format, arguments);
    va_end(arguments);
}

static int compare_places(const void *a, const void *b)
{
    const struct entry *x = a, *y = b;
    if (x->where.line != y->where.line)
        return x->where.line < y->where.line ? -1 : 1;
    if (x->where.column != y->where.column)
        return x->where.column < y->where.column ? -1 : 1;
    if (x->is_fault != y->is_fault)
        return x->is_fault ? -1 : 1;
    return (x->order > y->order) - (x->order < y->order);
}

/* Whether the place of entry i has the same message before it, in the sorted list. */
static bool is_repeat(const lb_diagnostics *list, size_t i, size_t kept)
{
    const struct entry *e = &list->entry[i];
    for (size_t j = kept; j-- > 0;) {
        const struct entry *other = &list->entry[j];
        if (other->where.line != e->where.line || other->where.column != e->where.column)
            return false;
        if (other->is_fault == e->is_fault && strcmp(other->message, e->message) == 0)
            return true;
    }
    return false;
}

void diagnostics_sort(lb_diagnostics *list)
{
    if (list->count == 0)
        return;
    qsort(list->entry, list->count, sizeof *list->entry, compare_places);
    size_t kept = 0;
    for (size_t i = 0; i < list->count; i++) {
        if (is_repeat(list, i, kept)) {
            --*(list->entry[i].is_fault ? &list->faults : &list->warnings);
            entry_clear(&list->entry[i]);
        } else {
            list->entry[kept++] = list->entry[i];
        }
    }
    list->count = kept;
}

size_t lb_diagnostics_count(const lb_diagnostics *list)
{
    return list->count;
}

size_t lb_diagnostics_faults(const lb_diagnostics *list)
{
    return list->faults;
}

lb_diagnostic lb_diagnostics_get(const lb_diagnostics *list, size_t i)
{
    const struct entry *e = &list->entry[i];
    return (lb_diagnostic){e->is_fault, e->where.line, e->where.column, e->where.length, e->message,
                           e->remedy ? e->remedy : ""};
}

/* The closing line of a list that is longer than what is shown. */
static void write_rest(const lb_diagnostics *list, lb_text *out)
{
    size_t kept_faults = 0;
    for (size_t i = 0; i < list->count; i++)
        kept_faults += list->entry[i].is_fault;
    size_t faults = list->faults - kept_faults;
    size_t warnings = list->warnings - (list->count - kept_faults);
    if (faults)
        buffer_printf(out, "%s: %zu more error%s not shown\n", source_name(list->source), faults,
                      faults == 1 ? "" : "s");
    if (warnings)
        buffer_printf(out, "%s: %zu more warning%s not shown\n", source_name(list->source), warnings,
                      warnings == 1 ? "" : "s");
}

lb_status lb_diagnostics_write(const lb_diagnostics *list, bool colour, lb_text *out)
{
    excerpt_cursor cursor = {0};
    for (size_t i = 0; i < list->count; i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        excerpt_write(list->source, &d, colour, &cursor, out);
    }
    write_rest(list, out);
    return buffer_status(out);
}
