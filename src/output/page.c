/* The one-page answer of `limbeck FILE`: what the mechanism is, what it
 * conserves, where it rests, whether it oscillates. */
#include "limbeck.h"
#include "output/describe.h"
#include "output/layout.h"
#include "output/text_oscillate.h"
#include "output/text_steady.h"
#include "system/system.h"

/* A scope that was not asked, although the file has ranges, is pointed out;
 * where it was, a longer search is. */
static void write_ranges_hint(buffer *out, const lb_layout *layout, const lb_network *net, const lb_oscillate *oscillate)
{
    int ranges = 0;
    for (int i = 0; i < net->constant_count; i++)
        ranges += net->constants[i].has_range;
    bool is_searched = false;
    for (size_t i = 0; i < oscillate->count; i++) {
        const lb_oscillate_answer *answer = &oscillate->answer[i];
        is_searched = is_searched || (answer->scope == LB_SCOPE_RANGES && answer->verdict == LB_NOT_FOUND);
        if (answer->scope == LB_SCOPE_RANGES && answer->verdict != LB_NOT_FOUND)
            return;
    }
    if (ranges == 0)
        return;
    buffer_char(out, '\n');
    if (is_searched) {
        buffer_printf(out, "A longer search of the ranges:\n  limbeck oscillate %s\n", net->file);
        return;
    }
    layout_printf(out, layout, 0, "%d constant%s a range; to search %s:", ranges, ranges == 1 ? " has" : "s have",
                  ranges == 1 ? "it" : "them");
    buffer_printf(out, "  limbeck oscillate %s\n", net->file);
}

lb_status lb_text_page(const lb_system *system, const lb_oscillate *oscillate, const lb_layout *layout, lb_text *out)
{
    const lb_network *net = system->network;
    describe_opening(out, layout, net);
    if (oscillate->steady) {
        describe_conserved(out, layout, system, oscillate->steady->total);
        steady_write(out, layout, system, oscillate->steady, true);
    }
    for (size_t i = 0; i < oscillate->count; i++)
        oscillate_write_answer(out, layout, system, &oscillate->answer[i]);
    write_ranges_hint(out, layout, net, oscillate);
    return buffer_status(out);
}
