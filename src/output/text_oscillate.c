/* The verdict on oscillation for a person, with its evidence.
 *
 * Three words are kept apart: "proved" (no proof is built, so it does not
 * occur here), "witnessed" (constants and an orbit that anyone can run) and
 * "searched" (nothing found, in so many tries, which excludes nothing). */
#include "output/text_oscillate.h"

#include <math.h>
#include <stdarg.h>
#include <string.h>

#include "output/describe.h"
#include "output/grid.h"
#include "output/layout.h"
#include "system/system.h"

enum { DIGITS = 6, MULTIPLIERS_SHOWN = 8 };

static const char *scope_heading(lb_scope scope)
{
    return scope == LB_SCOPE_GIVEN ? "Oscillation, with the constants given"
                                   : "Oscillation, with constants anywhere in their ranges";
}

static const char *attraction_text(lb_answer stable)
{
    switch (stable) {
    case LB_YES: return "attracting limit cycle";
    case LB_NO: return "repelling closed orbit";
    case LB_UNDECIDED: break;
    }
    return "closed orbit whose attraction is undecided";
}

static void verdict_line(buffer *out, const lb_layout *layout, const char *word, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

/* The verdict's word, strong, and the sentence behind it as one paragraph. */
static void verdict_line(buffer *out, const lb_layout *layout, const char *word, const char *format, ...)
{
    buffer sentence, lines;
    buffer_init(&sentence);
    buffer_init(&lines);
    buffer_printf(&sentence, "%s ", word);
    va_list list;
    va_start(list, format);
    buffer_vprintf(&sentence, format, list);
    va_end(list);
    layout_paragraph(&lines, layout, 2, 0, buffer_get(&sentence));
    if (buffer_status(&lines) == LB_OK && buffer_status(&sentence) == LB_OK) {
        buffer_append(out, "  ");
        layout_strong(out, layout, word);
        buffer_append(out, buffer_get(&lines) + 2 + strlen(word));
    }
    layout_end(&sentence, out);
    layout_end(&lines, out);
}

static void write_verdict(buffer *out, const lb_layout *layout, const lb_network *net, const lb_oscillate_answer *answer)
{
    const char *word = answer->verdict == LB_OSCILLATES ? "Oscillates"
                     : answer->verdict == LB_IS_CENTRE  ? "Centre"
                                                        : "Not found";
    buffer period;
    buffer_init(&period);
    if (answer->cycle)
        layout_quantity(&period, answer->cycle->period, DIGITS, describe_time_unit(net));
    if (answer->verdict == LB_OSCILLATES && answer->cycle)
        verdict_line(out, layout, word, "(witnessed): %s, period %s.", attraction_text(answer->cycle->stable),
                     buffer_get(&period));
    else if (answer->verdict == LB_IS_CENTRE && answer->cycle)
        verdict_line(out, layout, word, "(witnessed): neutral closed orbits, one beside the other; period of this one %s.",
                     buffer_get(&period));
    else
        verdict_line(out, layout, word, "%s",
                     "(searched): no sustained oscillation was found, which does not prove that there is none.");
    layout_end(&period, out);
}

static void write_amplitudes(buffer *out, const lb_layout *layout, const lb_network *net, const lb_cycle *cycle)
{
    grid g;
    grid_init(&g, "lnn", true);
    grid_cell(&g, "%s", describe_concentration_unit(net));
    grid_cell(&g, "lowest");
    grid_cell(&g, "highest");
    for (int i = 0; i < cycle->states; i++) {
        if (isnan(cycle->low[i]) || isnan(cycle->high[i]))
            continue;
        grid_cell(&g, "[%s]", lb_network_state_name(net, i));
        grid_number(&g, cycle->low[i], DIGITS);
        grid_number(&g, cycle->high[i], DIGITS);
    }
    buffer_char(out, '\n');
    grid_write(&g, layout, 4, out);
    buffer_char(out, '\n');
}

/* Smaller ones are the noise of the integration. */
static bool is_resolved(lb_complex multiplier)
{
    return hypot(multiplier.re, multiplier.im) >= 1e-8;
}

static void write_multipliers(buffer *out, const lb_layout *layout, const lb_cycle *cycle)
{
    if (cycle->multiplier_count == 0)
        return;
    buffer text;
    buffer_init(&text);
    int shown = 0;
    while (shown < cycle->multiplier_count && shown < MULTIPLIERS_SHOWN && is_resolved(cycle->multipliers[shown])) {
        lb_complex multiplier = cycle->multipliers[shown++];
        char one[LAYOUT_COMPLEX];
        layout_complex(multiplier, 4, one);
        if (multiplier.im >= 0)
            buffer_printf(&text, "%s%s", *buffer_get(&text) ? ", " : "", one);
    }
    if (shown < cycle->multiplier_count)
        buffer_printf(&text, "%s%d of less than %s", *buffer_get(&text) ? ", and " : "", cycle->multiplier_count - shown,
                      shown < MULTIPLIERS_SHOWN ? "1e-8" : "that");
    const char *judgement = cycle->stable == LB_YES ? ", all inside the unit circle" : "";
    layout_printf(out, layout, 2, "Floquet multipliers, the one along the orbit left out%s: %s.", judgement,
                  buffer_get(&text));
    layout_end(&text, out);
}

static void write_confirmation(buffer *out, const lb_layout *layout, const lb_cycle *cycle)
{
    char closure[LAYOUT_NUMBER], confirmed[LAYOUT_NUMBER];
    layout_number(cycle->closure, 2, closure);
    layout_number(cycle->confirmed, 2, confirmed);
    if (isnan(cycle->confirmed))
        layout_printf(out, layout, 2, "Closed to %s of its swing; not confirmed on a second path.", closure);
    else
        layout_printf(out, layout, 2, "Closed to %s of its swing; same period on a second path to %s.", closure, confirmed);
    if (cycle->method && *cycle->method)
        layout_printf(out, layout, 2, "Method: %s.", cycle->method);
}

/* The constants that a search may turn: the witness's, the file's, the range. */
static void write_constants(buffer *out, const lb_layout *layout, const lb_network *net, const double *k)
{
    grid g;
    grid_init(&g, "lnlnl", true);
    grid_cell(&g, "constant");
    grid_cell(&g, "witness");
    grid_cell(&g, "unit");
    grid_cell(&g, "in the file");
    grid_cell(&g, "range");
    for (int i = 0; i < net->constant_count; i++) {
        const network_constant *constant = &net->constants[i];
        if (!constant->has_range)
            continue;
        char low[LAYOUT_NUMBER], high[LAYOUT_NUMBER];
        layout_number(constant->low, DIGITS, low);
        layout_number(constant->high, DIGITS, high);
        grid_cell(&g, "%s", constant->name);
        grid_number(&g, k[i], DIGITS);
        grid_cell(&g, "%s", constant->unit ? constant->unit : "");
        grid_number(&g, constant->value, DIGITS);
        grid_cell(&g, "%s .. %s", low, high);
    }
    buffer_char(out, '\n');
    grid_write(&g, layout, 4, out);
}

static void write_transient(buffer *out, const lb_layout *layout, const lb_network *net, const lb_oscillate_answer *answer)
{
    if (answer->swings <= 0 || answer->verdict != LB_NOT_FOUND)
        return;
    const char *species = answer->swing_species >= 0 ? lb_network_state_name(net, answer->swing_species) : NULL;
    buffer text;
    buffer_init(&text);
    buffer_printf(&text, "Transient oscillation: on its way to rest %s%s%s swings %d time%s", species ? "[" : "",
                  species ? species : "the mixture", species ? "]" : "", answer->swings, answer->swings == 1 ? "" : "s");
    if (answer->swing_decay > 0) {
        char decay[LAYOUT_NUMBER];
        layout_number(answer->swing_decay, 3, decay);
        buffer_printf(&text, ", each swing %s times the last", decay);
    }
    layout_printf(out, layout, 2, "%s. It dies out.", buffer_get(&text));
    layout_end(&text, out);
}

/* What was seen that is neither rest nor a cycle; growth that a plant would feel
 * carries the caution of the trade. */
static void write_unsettled(buffer *out, const lb_layout *layout, const lb_oscillate_answer *answer)
{
    if (answer->verdict != LB_NOT_FOUND)
        return;
    if (answer->keeps_moving)
        layout_printf(out, layout, 2, "Seen all the same: a trajectory that keeps moving within bounds and does not close "
                      "(chaos, a torus or a very slow approach).");
    if (answer->runs_away)
        layout_printf(out, layout, 2, "Seen: a trajectory that grows without bound. If heat or gas comes with it this may be "
                      "a runaway; sizing, dosing and venting need calorimetry, local codes and licensed practice.");
}

static void write_effort(buffer *out, const lb_layout *layout, const lb_oscillate_answer *answer)
{
    buffer text;
    buffer_init(&text);
    if (answer->scope == LB_SCOPE_RANGES) {
        buffer_append(&text, "Tried ");
        describe_count(&text, answer->samples, "set");
        buffer_append(&text, " of constants: met ");
    } else {
        buffer_append(&text, "Met ");
    }
    describe_count(&text, answer->steady, "steady state");
    buffer_printf(&text, " (%zu unstable), followed %zu trajector%s.", answer->unstable, answer->integrations,
                  answer->integrations == 1 ? "y" : "ies");
    if (answer->verdict == LB_NOT_FOUND && answer->method && *answer->method)
        buffer_printf(&text, " Method: %s.", answer->method);
    if (answer->interrupted)
        buffer_append(&text, " The search was interrupted, and is not complete.");
    layout_printf(out, layout, 2, "%s", buffer_get(&text));
    layout_end(&text, out);
    if (answer->verdict == LB_NOT_FOUND && answer->limits && *answer->limits)
        layout_printf(out, layout, 2, "Not covered: %s", answer->limits);
}

void oscillate_write_answer(buffer *out, const lb_layout *layout, const lb_system *system,
                            const lb_oscillate_answer *answer)
{
    const lb_network *net = system->network;
    layout_heading(out, layout, scope_heading(answer->scope));
    write_verdict(out, layout, net, answer);
    if (answer->cycle) {
        write_amplitudes(out, layout, net, answer->cycle);
        write_multipliers(out, layout, answer->cycle);
        write_confirmation(out, layout, answer->cycle);
        if (answer->scope == LB_SCOPE_RANGES)
            write_constants(out, layout, net, answer->k);
        describe_fast_constants(out, layout, net, answer->k);
    }
    write_transient(out, layout, net, answer);
    write_unsettled(out, layout, answer);
    write_effort(out, layout, answer);
}

lb_status lb_text_oscillate(const lb_system *system, const lb_oscillate *oscillate, const lb_layout *layout, lb_text *out)
{
    describe_opening(out, layout, system->network);
    for (size_t i = 0; i < oscillate->count; i++)
        oscillate_write_answer(out, layout, system, &oscillate->answer[i]);
    return buffer_status(out);
}
