/* What the text ahead looks like.  Each text is terminated. */
#ifndef LIMBECK_TEXT_OUTLOOK_H
#define LIMBECK_TEXT_OUTLOOK_H

#include <stdbool.h>

const char *outlook_skip_blanks(const char *text);

/* A setting of a reaction starts the text: `k =`, `kf =`, `kr =`, `K =` or `v =`. */
bool outlook_is_setting(const char *text);

/* An arrow comes before the line's end, a comment or a `;`. */
bool outlook_has_arrow(const char *text);

/* The line reads like a statement of its own.  is_listed: the line above ends in
 * `,` or `(`, so that `k = ...` may be one more setting; is_nested: inside
 * parentheses, so that `A = ...` may be one more argument. */
bool outlook_is_statement(const char *line, bool is_listed, bool is_nested);

#endif
