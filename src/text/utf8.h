/* UTF-8: decoding, encoding and the width of a character on a terminal. */
#ifndef LIMBECK_TEXT_UTF8_H
#define LIMBECK_TEXT_UTF8_H

#include <stddef.h>
#include <stdint.h>

/* Bytes of the character at text (at most length of them are looked at) and its
 * code point; 0 when the bytes are no character: overlong forms, surrogates and
 * values above U+10FFFF included. */
int utf8_decode(const char *text, size_t length, uint32_t *code);

/* Columns that a terminal gives a character, as far as that is known: 0, 1 or 2. */
int utf8_width(uint32_t code);

/* Characters in length bytes; a byte that belongs to none counts as one. */
size_t utf8_count(const char *text, size_t length);

#endif
