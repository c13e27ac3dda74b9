/* The page of a text answer: widths, wrapping, numbers, emphasis. */
#ifndef LIMBECK_OUTPUT_LAYOUT_H
#define LIMBECK_OUTPUT_LAYOUT_H

#include "base/buffer.h"
#include "limbeck.h"

/* Columns of the page: the layout's (at least 40), 80 where it says nothing. */
int layout_width(const lb_layout *layout);

/* Columns that text takes on a terminal: one per character, none for a combining mark. */
int layout_columns(const char *text);
int layout_columns_n(const char *text, size_t length);     /* of the first length bytes */

/* A number as a person writes it, with so many significant digits: "0.0012",
 * "3.1e-7", "1e10".  Texts fit in LAYOUT_NUMBER bytes. */
enum { LAYOUT_NUMBER = 40, LAYOUT_COMPLEX = 2 * LAYOUT_NUMBER + 8 };
void layout_number(double value, int digits, char text[LAYOUT_NUMBER]);
/* "-0.15", or "-0.15 ± 0.99 i" for a pair (im > 0), "-0.15 - 0.99 i" for im < 0. */
void layout_complex(lb_complex value, int digits, char text[LAYOUT_COMPLEX]);
/* A number and its unit, which may be "". */
void layout_quantity(buffer *out, double value, int digits, const char *unit);

/* The end of a text made in between: clear it, and hand its failure to out. */
void layout_end(buffer *text, buffer *out);

/* A heading on a line of its own, after an empty line; bold where there is colour. */
void layout_heading(buffer *out, const lb_layout *layout, const char *text);
void layout_strong(buffer *out, const lb_layout *layout, const char *text);

/* Text broken at blanks to the width of the page, every line after so many
 * columns; `hang` more from the second line on.  Ends with a newline. */
void layout_paragraph(buffer *out, const lb_layout *layout, int indent, int hang, const char *text);
void layout_printf(buffer *out, const lb_layout *layout, int indent, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

#endif
