/* Pieces that several text answers share: the opening, conserved totals. */
#include "output/describe.h"

#include <string.h>

#include "output/grid.h"
#include "output/layout.h"
#include "system/system.h"

enum { LIST_SHOWN = 8 };

const char *describe_concentration_unit(const lb_network *net)
{
    return net->units.none ? "" : net->units.concentration_text;
}

const char *describe_time_unit(const lb_network *net)
{
    return net->units.none ? "" : net->units.time_text;
}

void describe_count(buffer *out, size_t count, const char *noun)
{
    buffer_printf(out, "%zu %s%s", count, noun, count == 1 ? "" : "s");
}

/* Comma before every entry but the first of a list. */
static void separate(buffer *out, bool *is_first)
{
    if (!*is_first)
        buffer_append(out, ", ");
    *is_first = false;
}

static size_t count_held(const lb_network *net)
{
    size_t held = 0;
    for (int i = 0; i < net->species_count; i++)
        held += net->species[i].role == ROLE_HELD;
    return held;
}

static bool is_boundary_reaction(const network_reaction *reaction)
{
    return reaction->reactant_count == 0 || reaction->product_count == 0;
}

static size_t count_boundary_reactions(const lb_network *net)
{
    size_t count = 0;
    for (int i = 0; i < net->reaction_count; i++)
        count += is_boundary_reaction(&net->reactions[i]);
    return count;
}

/* The first few names of a list that may be long. */
static void append_held(buffer *out, const lb_network *net)
{
    size_t shown = 0;
    bool is_first = true;
    for (int i = 0; i < net->species_count && shown < LIST_SHOWN; i++) {
        if (net->species[i].role != ROLE_HELD)
            continue;
        separate(out, &is_first);
        buffer_printf(out, "[%s]", net->species[i].name);
        shown++;
    }
    if (shown < count_held(net))
        buffer_printf(out, " and %zu more", count_held(net) - shown);
}

static void append_boundary_reactions(buffer *out, const lb_network *net)
{
    size_t shown = 0;
    bool is_first = true;
    for (int i = 0; i < net->reaction_count && shown < LIST_SHOWN; i++) {
        if (!is_boundary_reaction(&net->reactions[i]))
            continue;
        separate(out, &is_first);
        buffer_append(out, net->reactions[i].label);
        shown++;
    }
    if (shown < count_boundary_reactions(net))
        buffer_printf(out, " and %zu more", count_boundary_reactions(net) - shown);
}

/* Open or closed, and what makes it so. */
static void append_boundary(buffer *out, const lb_network *net)
{
    if (!net->is_open) {
        buffer_append(out, "Closed.");
        return;
    }
    buffer_append(out, "Open: ");
    bool is_first = true;
    if (net->is_tank) {
        separate(out, &is_first);
        buffer_append(out, "a stirred tank");
    }
    if (count_held(net)) {
        separate(out, &is_first);
        append_held(out, net);
        buffer_append(out, " held constant");
    }
    if (count_boundary_reactions(net)) {
        separate(out, &is_first);
        buffer_append(out, "sources or sinks (");
        append_boundary_reactions(out, net);
        buffer_append(out, ")");
    }
    buffer_append(out, ".");
}

static void append_counts(buffer *out, const lb_network *net)
{
    buffer_printf(out, " %d dynamic species", net->states);
    if (count_held(net))
        buffer_printf(out, " and %zu held", count_held(net));
    buffer_append(out, ", ");
    describe_count(out, (size_t)net->reaction_count, "reaction");
    if (net->reaction_steps != net->reaction_count)
        buffer_printf(out, " (%d one-way)", net->reaction_steps);
    buffer_append(out, ".");
    if (net->units.none)
        buffer_append(out, " No units.");
    else
        buffer_printf(out, " Concentrations in %s, times in %s.", net->units.concentration_text, net->units.time_text);
}

void describe_opening(buffer *out, const lb_layout *layout, const lb_network *net)
{
    bool has_title = net->title && *net->title;
    const char *file = strcmp(net->file, "-") == 0 ? "standard input" : net->file;
    layout_strong(out, layout, has_title ? net->title : file);
    buffer_char(out, '\n');
    if (has_title)
        buffer_printf(out, "%s\n", file);
    buffer_char(out, '\n');
    buffer text;
    buffer_init(&text);
    append_boundary(&text, net);
    append_counts(&text, net);
    layout_printf(out, layout, 0, "%s", buffer_get(&text));
    layout_end(&text, out);
}

void describe_law(buffer *out, const lb_network *net, const int64_t *law)
{
    bool is_first = true;
    for (int i = 0; i < net->states; i++) {
        int64_t c = law[i];
        if (c == 0)
            continue;
        if (!is_first)
            buffer_append(out, c < 0 ? " - " : " + ");
        else if (c < 0)
            buffer_append(out, "-");
        uint64_t size = c < 0 ? 0 - (uint64_t)c : (uint64_t)c;
        if (size != 1)
            buffer_printf(out, "%llu ", (unsigned long long)size);
        buffer_printf(out, "[%s]", net->species[net->state_species[i]].name);
        is_first = false;
    }
}

void describe_conserved(buffer *out, const lb_layout *layout, const lb_system *system, const double *total)
{
    const lb_network *net = system->network;
    int count = lb_system_laws(system);
    layout_heading(out, layout, "Conserved");
    if (count == 0) {
        layout_paragraph(out, layout, 2, 0, "nothing");
        return;
    }
    grid g;
    grid_init(&g, "nll", false);
    for (int i = 0; i < count; i++) {
        buffer law;
        buffer_init(&law);
        describe_law(&law, net, lb_system_law(system, i));
        grid_number(&g, total[i], 5);
        grid_cell(&g, "%s", describe_concentration_unit(net));
        grid_cell(&g, "= %s", buffer_get(&law));
        grid_end(&g, &law);
    }
    grid_write(&g, layout, 2, out);
}

void describe_states(buffer *out, const lb_network *net, const bool *flag)
{
    bool is_first = true;
    for (int i = 0; i < net->states; i++) {
        if (!flag[i])
            continue;
        separate(out, &is_first);
        buffer_printf(out, "[%s]", net->species[net->state_species[i]].name);
    }
}

/* One M^-1 s^-1 in the file's units of a second-order rate constant, whose text
 * goes to `units`; 0 where the file has no units. */
static double second_order_scale(const lb_network *net, buffer *units)
{
    dimension d;
    if (net->units.none || !dimension_concentration_time(-1, 1, -1, 1, &d))
        return 0;
    unit_write(&net->units, &d, units);
    double concentration = net->units.concentration.up / net->units.concentration.down;
    double time = net->units.time.up / net->units.time.down;
    return concentration * time;
}

void describe_fast_constants(buffer *out, const lb_layout *layout, const lb_network *net, const double *k)
{
    const double diffusion_limit = 1e10;
    buffer units;
    buffer_init(&units);
    double scale = second_order_scale(net, &units);
    for (int i = 0; i < net->constant_count && scale > 0; i++) {
        const network_constant *constant = &net->constants[i];
        if (!constant->unit || strcmp(constant->unit, buffer_get(&units)) != 0 || k[i] <= diffusion_limit * scale)
            continue;
        layout_printf(out, layout, 2, "%s is faster than diffusion allows in water (about 1e10 M^-1 s^-1).", constant->name);
    }
    layout_end(&units, out);
}
