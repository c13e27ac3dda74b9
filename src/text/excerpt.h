/* How one fault or warning is shown: place, message, source line, caret, remedy. */
#ifndef LIMBECK_TEXT_EXCERPT_H
#define LIMBECK_TEXT_EXCERPT_H

#include "text/source.h"

/* Where the last excerpt was, so that many of one long line, in ascending
 * order, are found without counting its characters from the start each time.
 * Starts as all zeros. */
typedef struct excerpt_cursor {
    int line, column;
    const char *place;      /* byte at that column */
} excerpt_cursor;

void excerpt_write(const source *s, const lb_diagnostic *d, bool colour, excerpt_cursor *cursor, lb_text *out);

#endif
