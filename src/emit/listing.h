/* Lines of C with comments beside them, as paragraphs of a function's body. */
#ifndef LIMBECK_EMIT_LISTING_H
#define LIMBECK_EMIT_LISTING_H

#include "base/buffer.h"

typedef struct listing_line {
    size_t code, code_length, comment, comment_length; /* places in the text */
} listing_line;

/* The paragraph being written: begin a line, append its code to `text`, begin the
 * comment, append that to `text` (spelled by spell_comment), end the line. */
typedef struct listing {
    buffer text;
    listing_line *lines;
    size_t count, capacity;
} listing;

void listing_init(listing *l);
void listing_clear(listing *l);
void listing_begin(listing *l);
void listing_comment(listing *l);
void listing_end(listing *l);
/* Append the paragraph with comments aligned, long statements broken before an
 * operator; the listing is empty then.  Failures stick in `out`. */
void listing_flush(listing *l, buffer *out);

#endif
