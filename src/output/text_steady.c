/* Steady states for a person: concentrations, kind, and each eigenvalue as the
 * motion that a chemist would see near the state. */
#include "output/text_steady.h"

#include <math.h>

#include "base/memory.h"
#include "output/describe.h"
#include "output/grid.h"
#include "output/layout.h"
#include "system/system.h"

enum {
    DIGITS = 5,
    LABEL_WIDTH = 16,      /* columns kept for the names beside the states */
    STATE_WIDTH = 21,      /* columns per state, so many that "2: stable focus" fits */
    MODES_SHOWN = 24,
    BRIEF_STATES = 6
};

static void write_search(buffer *out, const lb_layout *layout, const lb_network *net, const lb_steady *steady)
{
    buffer text;
    buffer_init(&text);
    buffer_printf(&text,
                  "%s by a search of the inside (%zu starts, %zu converged) and of the faces where species are absent; %s.",
                  steady->count == 0 ? "None found" : "Found", steady->starts, steady->converged,
                  steady->count == 0 ? "that does not exclude one" : "it can miss one");
    if (steady->interrupted)
        buffer_append(&text, " It was interrupted, and is not complete.");
    else if (!steady->all_faces)
        buffer_append(&text, " There are more faces than were searched.");
    layout_printf(out, layout, 2, "%s", buffer_get(&text));
    layout_end(&text, out);
    if (steady->continuum > 0)
        layout_printf(out, layout, 2, "They are not single points but a continuum, of dimension %d: one point of it is shown%s.",
                      steady->continuum, steady->count == 1 ? "" : ", and the states that lie apart");
    buffer_init(&text);
    describe_states(&text, net, steady->accumulating);
    if (*buffer_get(&text))
        layout_printf(out, layout, 2, "Set aside (no rate depends on it, no conserved total fixes it): %s.",
                      buffer_get(&text));
    layout_end(&text, out);
}

/* The mode that a bystander sees: the fastest growth, else the slowest decay. */
static const lb_mode *leading_mode(const lb_steady_state *state)
{
    const lb_mode *leading = NULL;
    for (int i = 0; i < state->mode_count; i++)
        if (!leading || state->modes[i].eigenvalue.re > leading->eigenvalue.re)
            leading = &state->modes[i];
    return leading;
}

/* A real part that is zero to within its error is called neutral. */
static void rate_cell(grid *g, const lb_mode *mode, const char *time_unit)
{
    if (!mode) {
        grid_cell(g, "%s", "");
        return;
    }
    if (!isfinite(mode->time) || fabs(mode->eigenvalue.re) <= mode->error) {
        grid_cell(g, "neutral");
        return;
    }
    char time[LAYOUT_NUMBER];
    layout_number(mode->time, DIGITS, time);
    grid_cell(g, "%s %s%s%s", mode->eigenvalue.re > 0 ? "grows in" : "relaxes in", time, *time_unit ? " " : "", time_unit);
}

/* The states first..last as columns beside the names of the species. */
static void write_block(buffer *out, const lb_layout *layout, const lb_network *net, const lb_steady *steady,
                        size_t first, size_t last, bool with_rates)
{
    char align[GRID_COLUMNS + 1] = "l";
    for (size_t s = first; s <= last; s++)
        align[s - first + 1] = 'n';
    align[last - first + 2] = '\0';
    grid g;
    grid_init(&g, align, true);
    grid_cell(&g, "%s", describe_concentration_unit(net));
    for (size_t s = first; s <= last; s++)
        grid_cell(&g, "%zu: %s", s + 1, lb_kind_text(steady->state[s].kind));
    for (int i = 0; i < steady->states; i++) {
        if (steady->accumulating[i])
            continue;
        grid_cell(&g, "[%s]", lb_network_state_name(net, i));
        for (size_t s = first; s <= last; s++)
            grid_number(&g, steady->state[s].x[i], DIGITS);
    }
    if (with_rates) {
        grid_cell(&g, "%s", "");
        for (size_t s = first; s <= last; s++)
            rate_cell(&g, leading_mode(&steady->state[s]), describe_time_unit(net));
    }
    buffer_char(out, '\n');
    grid_write(&g, layout, 2, out);
}

void steady_write(buffer *out, const lb_layout *layout, const lb_system *system, const lb_steady *steady, bool is_brief)
{
    const lb_network *net = system->network;
    buffer heading;
    buffer_init(&heading);
    if (steady->continuum > 0)
        buffer_append(&heading, "Steady states: a continuum");
    else
        describe_count(&heading, steady->count, "steady state");
    layout_heading(out, layout, buffer_get(&heading));
    layout_end(&heading, out);
    write_search(out, layout, net, steady);
    int room = (layout_width(layout) - LABEL_WIDTH) / STATE_WIDTH;
    size_t columns = room < 1 ? 1 : room > GRID_COLUMNS - 1 ? GRID_COLUMNS - 1 : (size_t)room;
    size_t shown = is_brief && steady->count > BRIEF_STATES ? BRIEF_STATES : steady->count;
    for (size_t first = 0; first < shown; first += columns) {
        size_t last = first + columns - 1 < shown - 1 ? first + columns - 1 : shown - 1;
        write_block(out, layout, net, steady, first, last, is_brief);
    }
    if (shown < steady->count)
        buffer_printf(out, "\n  and %zu more: limbeck steady %s\n", steady->count - shown, net->file);
}

/* "relaxes in 6.7 s" and, of a pair, "swings every 6.4 s, each swing 0.39 times the last". */
static void mode_cells(grid *g, const lb_mode *mode, const char *time_unit)
{
    char eigenvalue[LAYOUT_COMPLEX], damping[LAYOUT_NUMBER];
    layout_complex(mode->eigenvalue, DIGITS, eigenvalue);
    grid_cell(g, "%s", eigenvalue);
    rate_cell(g, mode, time_unit);
    if (mode->period == 0) {
        grid_cell(g, "%s", "");
        return;
    }
    buffer swing;
    buffer_init(&swing);
    layout_quantity(&swing, mode->period, DIGITS, time_unit);
    layout_number(mode->damping, 3, damping);
    grid_cell(g, "period %s, each swing %s times the last", buffer_get(&swing), damping);
    grid_end(g, &swing);
}

static void write_modes(buffer *out, const lb_layout *layout, const lb_network *net, const lb_steady_state *state)
{
    grid g;
    grid_init(&g, "lll", false);
    int shown = state->mode_count < MODES_SHOWN ? state->mode_count : MODES_SHOWN;
    for (int i = 0; i < shown; i++)
        mode_cells(&g, &state->modes[i], describe_time_unit(net));
    grid_write(&g, layout, 4, out);
    if (shown < state->mode_count)
        layout_printf(out, layout, 4, "and %d faster ones (--json gives them all)", state->mode_count - shown);
}

static const char *stability_text(lb_answer stable)
{
    switch (stable) {
    case LB_YES: return "stable";
    case LB_NO: return "unstable";
    case LB_UNDECIDED: break;
    }
    return "stability undecided: a real part is zero to within its error";
}

static void write_state(buffer *out, const lb_layout *layout, const lb_network *net, const lb_steady_state *state,
                        size_t number)
{
    char residual[LAYOUT_NUMBER];
    layout_number(state->residual, 2, residual);
    layout_printf(out, layout, 2, "%zu: %s, %s%s; balanced to %s of its rates", number, lb_kind_text(state->kind),
                  stability_text(state->stable), state->is_boundary ? ", a species is absent" : "", residual);
    if (!state->routh_hurwitz_agrees)
        layout_paragraph(out, layout, 4, 0,
                         "The Routh-Hurwitz count of growing motions differs from the eigenvalues': do not rely on the "
                         "stability.");
    write_modes(out, layout, net, state);
}

/* ---- Sensitivities -------------------------------------------------------------------- */

enum { STRONGEST = 4 };

/* The largest few of values [m] by magnitude, as "k2 -1.02, k3 0.5"; what is below a
 * hundredth of the largest is left out.  Each is set to zero when it is taken. */
static void strongest_cell(grid *g, const lb_network *net, double *values, int m)
{
    buffer text;
    buffer_init(&text);
    double largest = 0;
    for (int j = 0; j < m; j++)
        largest = isfinite(values[j]) ? fmax(largest, fabs(values[j])) : largest;
    for (int shown = 0; shown < STRONGEST; shown++) {
        int best = -1;
        for (int j = 0; j < m; j++)
            if (fabs(values[j]) > 0.01 * largest && (best < 0 || fabs(values[j]) > fabs(values[best])))
                best = j;
        if (best < 0)
            break;
        char number[LAYOUT_NUMBER];
        layout_number(values[best], 3, number);
        buffer_printf(&text, "%s%s %s", shown > 0 ? ", " : "", lb_network_constant_name(net, best), number);
        values[best] = 0;
    }
    grid_cell(g, "%s", *buffer_get(&text) ? buffer_get(&text) : "none");
    grid_end(g, &text);
}

static lb_status write_sensitivities(buffer *out, const lb_layout *layout, const lb_network *net,
                                     const lb_steady_state *state, size_t number)
{
    int n = lb_network_states(net), m = lb_network_constants(net);
    double *values = memory_array((size_t)m, sizeof *values);
    if (!values)
        return LB_E_NOMEM;
    grid g;
    grid_init(&g, "ll", false);
    for (int i = 0; i < n; i++) {
        if (!(state->x[i] != 0) || isnan(state->x[i]))
            continue;
        for (int j = 0; j < m; j++)
            values[j] = state->sensitivity[i + (size_t)j * (size_t)n];
        grid_cell(&g, "[%s]", lb_network_state_name(net, i));
        strongest_cell(&g, net, values, m);
    }
    for (int j = 0; j < m; j++)
        values[j] = state->leading_sensitivity[j].re;
    grid_cell(&g, "eigenvalue");
    strongest_cell(&g, net, values, m);
    layout_printf(out, layout, 2, "%zu: %s", number, lb_kind_text(state->kind));
    grid_write(&g, layout, 4, out);
    memory_free(values);
    return LB_OK;
}

static lb_status write_all_sensitivities(buffer *out, const lb_layout *layout, const lb_network *net,
                                         const lb_steady *steady)
{
    lb_status status = LB_OK;
    layout_heading(out, layout, "Sensitivities");
    layout_printf(out, layout, 2, "Relative change of each concentration per relative change of a constant, d ln x / d ln k, "
                                  "and the change of the leading eigenvalue's real part, d Re / d ln k: the strongest ones.");
    for (size_t s = 0; status == LB_OK && s < steady->count; s++)
        status = write_sensitivities(out, layout, net, &steady->state[s], s + 1);
    return status;
}

lb_status lb_text_steady(const lb_system *system, const lb_steady *steady, const lb_layout *layout, lb_text *out)
{
    const lb_network *net = system->network;
    describe_opening(out, layout, net);
    describe_conserved(out, layout, system, steady->total);
    steady_write(out, layout, system, steady, false);
    if (steady->count > 0)
        layout_heading(out, layout, "Motion near each state");
    if (steady->count > 0 && steady->zero_eigenvalues > 0)
        layout_printf(out, layout, 2, "Left out: %d eigenvalue%s that the conserved totals make zero.",
                      steady->zero_eigenvalues, steady->zero_eigenvalues == 1 ? "" : "s");
    for (size_t s = 0; s < steady->count; s++)
        write_state(out, layout, net, &steady->state[s], s + 1);
    if (steady->count > 0 && steady->state[0].sensitivity &&
        write_all_sensitivities(out, layout, net, steady) != LB_OK)
        return LB_E_NOMEM;
    return buffer_status(out);
}
