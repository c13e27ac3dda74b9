/* Growing text with an upper limit, used by emit and output.
 *
 * The public name of a buffer is lb_text (limbeck.h).  Errors stick: once an
 * append fails, later ones do nothing, and the writer asks once at the end
 * with buffer_status. */
#ifndef LIMBECK_BASE_BUFFER_H
#define LIMBECK_BASE_BUFFER_H

#include <stdarg.h>
#include <stddef.h>

#include "limbeck.h"

typedef struct lb_text buffer;

struct lb_text {
    char     *data;      /* always terminated once something was appended */
    size_t    length;
    size_t    capacity;
    lb_status status;    /* LB_OK, LB_E_NOMEM, or LB_E_LIMIT beyond BUFFER_LIMIT */
};

#define BUFFER_LIMIT ((size_t)4 << 30) /* 4 GiB: no honest output is longer */

void        buffer_init(buffer *b);
void        buffer_clear(buffer *b);                       /* frees the text; b may be used again */
void        buffer_append(buffer *b, const char *text);
void        buffer_append_n(buffer *b, const char *text, size_t length);
void        buffer_char(buffer *b, char c);
void        buffer_repeat(buffer *b, char c, int count);
void        buffer_printf(buffer *b, const char *format, ...) __attribute__((format(printf, 2, 3)));
void        buffer_vprintf(buffer *b, const char *format, va_list list);
const char *buffer_get(const buffer *b);                   /* "" when empty */
lb_status   buffer_status(const buffer *b);
char       *buffer_take(buffer *b);                        /* hands the text over, without the room to grow; NULL after a failure */

#endif
