/* Spelling: texts and numbers of the network as strings, comments, numbers and
 * identifiers of C, so that nothing of a mechanism file reaches the C unescaped. */
#ifndef LIMBECK_EMIT_SPELL_H
#define LIMBECK_EMIT_SPELL_H

#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

/* A C string of the same bytes: `"..."`, or a compound literal where a string
 * would be longer than C99 promises to take (4095 characters). */
void spell_string(buffer *out, const char *text);

/* The text as part of a comment that it cannot end: one line, no `*` before `/`,
 * no trigraph, no control or bidirectional character, no byte that is not UTF-8.
 * At most limit bytes of the text, "..." where more was left out; 0: all of it. */
void spell_comment(buffer *out, const char *text, size_t limit);

/* The shortest decimal number that reads back as value; always a double in C. */
void spell_number(buffer *out, double value);

/* The letters and digits (ASCII) of a name, runs of others as one `_`, none at
 * the ends; may be empty.  At most 40 characters, within C99's 63. */
void spell_identifier(buffer *out, const char *name);

/* May the name be the prefix of all names of an emitted file? */
bool spell_is_prefix(const char *name);

#endif
