/* Tables of aligned columns. */
#ifndef LIMBECK_OUTPUT_GRID_H
#define LIMBECK_OUTPUT_GRID_H

#include <stdbool.h>
#include <stdint.h>

#include "base/buffer.h"
#include "limbeck.h"

typedef enum grid_align {
    GRID_LEFT,
    GRID_NUMBER     /* decimal points under each other; words to the left */
} grid_align;

enum { GRID_COLUMNS = 24 };

typedef struct grid {
    int columns;
    grid_align align[GRID_COLUMNS];
    buffer text;            /* of all cells, each terminated */
    uint32_t *cell;         /* [count] where each begins in it, row after row */
    size_t count, capacity;
    bool has_header;        /* the first row holds the headings of the columns */
    lb_status status;       /* sticks, and is passed on by grid_write */
} grid;

/* align: one letter per column, 'l' or 'n'. */
void grid_init(grid *g, const char *align, bool has_header);
/* Append a cell, row after row. */
void grid_cell(grid *g, const char *format, ...) __attribute__((format(printf, 2, 3)));
/* The end of a text made for a cell: clear it, and hand its failure to the grid. */
void grid_end(grid *g, buffer *text);
void grid_number(grid *g, double value, int digits);
/* Write all rows, every line after `indent` columns, and clear the grid.
 * A column without text is left out.  Where a row is too wide for the page its
 * last cell is wrapped, or set on lines of its own. */
void grid_write(grid *g, const lb_layout *layout, int indent, buffer *out);

#endif
