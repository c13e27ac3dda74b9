/* Folds and Hopf points along a constant, for a person. */
#include "output/describe.h"
#include "output/grid.h"
#include "output/layout.h"
#include "system/system.h"

enum { DIGITS = 6, COLUMNS = 3 };

/* Of the swings that begin at a Hopf point; no row where there is none. */
static void write_periods(grid *g, const lb_along *along, size_t first, size_t last)
{
    const double two_pi = 6.283185307179586477;
    bool has_period = false;
    for (size_t i = first; i <= last; i++)
        has_period = has_period || along->special[i].kind == LB_HOPF;
    if (!has_period)
        return;
    grid_cell(g, "period");
    for (size_t i = first; i <= last; i++)
        if (along->special[i].kind == LB_HOPF)
            grid_number(g, two_pi / along->special[i].omega, DIGITS);
        else
            grid_cell(g, "%s", "");
}

/* Special points first..last as columns beside the names of the species. */
static void write_block(buffer *out, const lb_layout *layout, const lb_network *net, const lb_along *along,
                        size_t first, size_t last)
{
    char align[COLUMNS + 2] = "l";
    for (size_t i = first; i <= last; i++)
        align[i - first + 1] = 'n';
    align[last - first + 2] = '\0';
    grid g;
    grid_init(&g, align, true);
    grid_cell(&g, "%s", "");
    for (size_t i = first; i <= last; i++)
        grid_cell(&g, "%s", along->special[i].kind == LB_HOPF ? "Hopf point" : "fold");
    grid_cell(&g, "%s", lb_network_constant_name(net, along->constant));
    for (size_t i = first; i <= last; i++)
        grid_number(&g, along->special[i].value, 2 * DIGITS);
    write_periods(&g, along, first, last);
    for (int s = 0; s < along->states; s++) {
        if (along->special[first].x[s] != along->special[first].x[s])
            continue;   /* accumulates */
        grid_cell(&g, "[%s]", lb_network_state_name(net, s));
        for (size_t i = first; i <= last; i++)
            grid_number(&g, along->special[i].x[s], DIGITS);
    }
    buffer_char(out, '\n');
    grid_write(&g, layout, 2, out);
}

lb_status lb_text_along(const lb_system *system, const lb_along *along, const lb_layout *layout, lb_text *out)
{
    const lb_network *net = system->network;
    char low[LAYOUT_NUMBER], high[LAYOUT_NUMBER];
    buffer heading;
    buffer_init(&heading);
    buffer_printf(&heading, "Along %s", lb_network_constant_name(net, along->constant));
    layout_heading(out, layout, buffer_get(&heading));
    layout_end(&heading, out);
    layout_number(along->low, DIGITS, low);
    layout_number(along->high, DIGITS, high);
    layout_printf(out, layout, 2, "%s between %s and %s, on %zu branch%s through the states that searches at several values "
                                  "found (%zu points); it can miss one.%s",
                  along->count == 0 ? "No fold and no Hopf point found" : "Folds and Hopf points found", low, high,
                  along->branches, along->branches == 1 ? "" : "es", along->points,
                  along->interrupted ? " It was interrupted, and is not complete." : "");
    for (size_t first = 0; first < along->count; first += COLUMNS)
        write_block(out, layout, net, along, first,
                    first + COLUMNS <= along->count ? first + COLUMNS - 1 : along->count - 1);
    return buffer_status(out);
}
