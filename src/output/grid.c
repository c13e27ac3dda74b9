/* Tables of aligned columns, two blanks between them.
 *
 * Numbers are set with their decimal points under each other: each cell is
 * split before the point (or the exponent, or its end) and padded before that.
 * Only the last column may be wrapped, so the others stay readable. */
#include "output/grid.h"

#include <assert.h>
#include <ctype.h>
#include <string.h>

#include "base/memory.h"
#include "output/layout.h"

enum { GAP = 2, LEAST_WRAP = 24 };

/* Measured columns: those before and after the decimal point, and all. */
typedef struct measure {
    int before[GRID_COLUMNS], after[GRID_COLUMNS], width[GRID_COLUMNS];
    int last;               /* last column that has text; -1: none */
} measure;

void grid_init(grid *g, const char *align, bool has_header)
{
    memset(g, 0, sizeof *g);
    g->columns = (int)strlen(align);
    assert(g->columns > 0 && g->columns <= GRID_COLUMNS);
    for (int c = 0; c < g->columns; c++)
        g->align[c] = align[c] == 'n' ? GRID_NUMBER : GRID_LEFT;
    g->has_header = has_header;
    g->status = LB_OK;
}

static void grid_clear(grid *g)
{
    buffer_clear(&g->text);
    memory_free(g->cell);
    g->cell = NULL;
    g->count = g->capacity = 0;
}

static const char *cell_text(const grid *g, size_t i)
{
    return g->text.data + g->cell[i];
}

void grid_cell(grid *g, const char *format, ...)
{
    if (g->status != LB_OK)
        return;
    size_t start = g->text.length;
    va_list list;
    va_start(list, format);
    buffer_vprintf(&g->text, format, list);
    va_end(list);
    buffer_append_n(&g->text, "", 1);   /* the end of the cell */
    g->status = buffer_status(&g->text);
    if (g->status == LB_OK && memory_grow(&g->cell, &g->capacity, g->count, sizeof *g->cell))
        g->status = LB_E_NOMEM;
    if (g->status == LB_OK)
        g->cell[g->count++] = (uint32_t)start;  /* BUFFER_LIMIT is not beyond it */
}

void grid_end(grid *g, buffer *text)
{
    if (buffer_status(text) != LB_OK && g->status == LB_OK)
        g->status = buffer_status(text);
    buffer_clear(text);
}

void grid_number(grid *g, double value, int digits)
{
    char text[LAYOUT_NUMBER];
    layout_number(value, digits, text);
    grid_cell(g, "%s", text);
}

/* Does the cell read as a number, so that it has a decimal point to align? */
static bool is_number(const char *cell)
{
    const char *digit = cell + (*cell == '-');
    return isdigit((unsigned char)*digit);
}

/* Columns before the decimal point. */
static int columns_before(const char *cell)
{
    size_t sign = *cell == '-';
    return (int)(sign + strspn(cell + sign, "0123456789"));
}

static bool is_aligned(const grid *g, size_t i)
{
    bool is_heading = g->has_header && i < (size_t)g->columns;
    return g->align[i % (size_t)g->columns] == GRID_NUMBER && !is_heading && is_number(cell_text(g, i));
}

static void measure_columns(const grid *g, measure *m)
{
    memset(m, 0, sizeof *m);
    m->last = -1;
    for (size_t i = 0; i < g->count; i++) {
        int c = (int)(i % (size_t)g->columns);
        int whole = layout_columns(cell_text(g, i));
        bool is_heading = g->has_header && i < (size_t)g->columns;
        if (whole > 0 && !is_heading && c > m->last)
            m->last = c;
        if (is_aligned(g, i)) {
            int before = columns_before(cell_text(g, i));
            m->before[c] = before > m->before[c] ? before : m->before[c];
            m->after[c] = whole - before > m->after[c] ? whole - before : m->after[c];
        } else {
            m->width[c] = whole > m->width[c] ? whole : m->width[c];
        }
    }
    for (int c = 0; c < g->columns; c++)
        if (m->before[c] + m->after[c] > m->width[c])
            m->width[c] = m->before[c] + m->after[c];
}

/* A column whose cells are all empty, its heading aside, is left out. */
static bool is_empty_column(const grid *g, int column)
{
    size_t first = g->has_header ? (size_t)g->columns : 0;
    for (size_t i = first + (size_t)column; i < g->count; i += (size_t)g->columns)
        if (*cell_text(g, i))
            return false;
    return true;
}

/* One cell padded to its column; nothing follows the last one. */
static void write_cell(const grid *g, const measure *m, size_t i, bool is_last, buffer *line)
{
    int c = (int)(i % (size_t)g->columns);
    int whole = layout_columns(cell_text(g, i));
    int left = is_aligned(g, i) ? m->before[c] - columns_before(cell_text(g, i)) : 0;
    buffer_repeat(line, ' ', left);
    buffer_append(line, cell_text(g, i));
    if (!is_last)
        buffer_repeat(line, ' ', m->width[c] - left - whole + GAP);
}

static void trim(buffer *line)
{
    while (line->length > 0 && line->data[line->length - 1] == ' ')
        line->data[--line->length] = '\0';
}

static int widest_word(const char *text)
{
    int most = 0;
    while (*text) {
        size_t length = strcspn(text, " ");
        int columns = layout_columns_n(text, length);
        most = columns > most ? columns : most;
        text += length + strspn(text + length, " ");
    }
    return most;
}

/* The last cell, wrapped beside the others, or below them where its words need the room. */
static void write_wrapped(const lb_layout *layout, int start, int indent, const char *cell, buffer *line)
{
    buffer text;
    buffer_init(&text);
    int room = layout_width(layout) - start;
    bool beside = room >= LEAST_WRAP && room >= widest_word(cell);
    if (beside) {
        layout_paragraph(&text, layout, start, 0, cell);
        buffer_append(line, buffer_get(&text) + (buffer_status(&text) == LB_OK ? start : 0));
    } else {
        trim(line);
        buffer_char(line, '\n');
        layout_paragraph(&text, layout, indent + 2 * GAP, GAP, cell);
        buffer_append(line, buffer_get(&text));
    }
    layout_end(&text, line);
}

static void write_row(const grid *g, const measure *m, const bool *is_empty, size_t row,
                      const lb_layout *layout, int indent, buffer *out)
{
    buffer line;
    buffer_init(&line);
    buffer_repeat(&line, ' ', indent);
    int start = indent;
    for (int c = 0; c <= m->last; c++) {
        if (is_empty[c])
            continue;
        size_t i = row * (size_t)g->columns + (size_t)c;
        bool is_last = c == m->last;
        bool fits = start + layout_columns(cell_text(g, i)) <= layout_width(layout);
        if (is_last && g->align[c] == GRID_LEFT && !fits)
            write_wrapped(layout, start, indent, cell_text(g, i), &line);
        else
            write_cell(g, m, i, is_last, &line);
        start += m->width[c] + GAP;
    }
    trim(&line);
    if (line.length == 0 || line.data[line.length - 1] != '\n')
        buffer_char(&line, '\n');
    buffer_append_n(out, buffer_get(&line), line.length);
    layout_end(&line, out);
}

void grid_write(grid *g, const lb_layout *layout, int indent, buffer *out)
{
    if (g->status != LB_OK && buffer_status(out) == LB_OK)
        out->status = g->status;
    assert(g->status != LB_OK || g->count % (size_t)g->columns == 0);
    measure m;
    bool is_empty[GRID_COLUMNS];
    measure_columns(g, &m);
    for (int c = 0; c < g->columns; c++)
        is_empty[c] = is_empty_column(g, c);
    for (size_t row = 0; g->status == LB_OK && row < g->count / (size_t)g->columns; row++)
        write_row(g, &m, is_empty, row, layout, indent, out);
    grid_clear(g);
}
