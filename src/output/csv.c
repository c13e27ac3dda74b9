/* Time courses as comma-separated values (RFC 4180, with plain line feeds): a
 * heading with units, then one row per time, each number in the shortest form
 * that gives the same bits when it is read back. */
#include <math.h>
#include <string.h>

#include "base/buffer.h"
#include "limbeck.h"
#include "model/expression.h"
#include "output/describe.h"
#include "output/layout.h"
#include "system/system.h"

/* A field is quoted where it holds a comma, a quote or a line end. */
static void append_field(buffer *out, const char *text)
{
    if (!strpbrk(text, ",\"\r\n")) {
        buffer_append(out, text);
        return;
    }
    buffer_char(out, '"');
    for (const char *c = text; *c; c++) {
        if (*c == '"')
            buffer_char(out, '"');
        buffer_char(out, *c);
    }
    buffer_char(out, '"');
}

/* "name [unit]", the unit left out where there is none. */
static void append_heading(buffer *out, const char *open, const char *name, const char *close, const char *units)
{
    buffer text;
    buffer_init(&text);
    buffer_printf(&text, "%s%s%s", open, name, close);
    if (*units)
        buffer_printf(&text, " [%s]", units);
    append_field(out, buffer_get(&text));
    layout_end(&text, out);
}

/* Values that are not finite are left empty. */
static void append_value(buffer *out, double value)
{
    buffer_char(out, ',');
    if (isfinite(value))
        expression_write_number(value, out);
}

static void append_headings(buffer *out, const lb_network *net)
{
    append_heading(out, "", "t", "", describe_time_unit(net));
    for (int i = 0; i < net->states; i++) {
        buffer_char(out, ',');
        append_heading(out, "[", lb_network_state_name(net, i), "]", describe_concentration_unit(net));
    }
    for (int i = 0; i < net->reading_count; i++) {
        const network_definition *reading = &net->readings[i];
        buffer_char(out, ',');
        append_heading(out, "", reading->name, "", reading->unit ? reading->unit : "");
    }
    buffer_char(out, '\n');
}

lb_status lb_csv_run(const lb_system *system, const lb_run *run, lb_text *out)
{
    append_headings(out, system->network);
    for (size_t row = 0; row < run->rows; row++) {
        expression_write_number(run->t[row], out);
        for (int i = 0; i < run->states; i++)
            append_value(out, run->x[row * (size_t)run->states + (size_t)i]);
        for (int i = 0; i < run->readings; i++)
            append_value(out, run->reading[row * (size_t)run->readings + (size_t)i]);
        buffer_char(out, '\n');
    }
    return buffer_status(out);
}
