/* Input text with its line map, and the list of faults and warnings about it. */
#ifndef LIMBECK_TEXT_SOURCE_H
#define LIMBECK_TEXT_SOURCE_H

#include <stdarg.h>
#include <stddef.h>

#include "limbeck.h"

/* A place in the text: `length` characters from a column; line and column
 * count from 1, columns in characters (a tab is one). */
typedef struct span {
    int line, column, length;
} span;

typedef struct source source;

/* Copies name and text; a leading byte-order mark is left out.  LB_E_NOMEM,
 * LB_E_LIMIT when the text has 2 GiB or more. */
lb_status source_new(const char *name, const char *text, size_t length, source **out);
void source_free(source *s);
const char *source_name(const source *s);
const char *source_text(const source *s);
size_t source_length(const source *s);
/* One line without its line end; false when there is no such line. */
bool source_line(const source *s, int line, const char **start, size_t *length);

/* The list takes the source (also when it fails) and frees it with itself. */
lb_status diagnostics_new(source *s, lb_diagnostics **out);
const source *diagnostics_source(const lb_diagnostics *list);

/* Add a fault or a warning; remedy may be NULL.  Beyond 100 faults the rest are
 * counted, not kept.  Without memory the list remembers that (diagnostics_status). */
void diagnostics_fault(lb_diagnostics *list, span where, const char *remedy, const char *format, ...)
    __attribute__((format(printf, 4, 5)));
void diagnostics_warn(lb_diagnostics *list, span where, const char *remedy, const char *format, ...)
    __attribute__((format(printf, 4, 5)));
lb_status diagnostics_status(const lb_diagnostics *list);  /* LB_OK or LB_E_NOMEM */
void diagnostics_sort(lb_diagnostics *list);               /* by place; equal ones at one place merged */

#endif
