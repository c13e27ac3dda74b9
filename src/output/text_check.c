/* What limbeck understood of a mechanism, for a person: species with their roles,
 * constants with values, units and ranges, reactions with their rates.
 *
 * A rate is that of the reaction as written, v; where the balance of a species
 * has another factor than one (2 X -> Z uses X at 2 v, IUPAC) the factor is
 * shown beside it. */
#include "limbeck.h"
#include "model/network.h"
#include "output/describe.h"
#include "output/grid.h"
#include "output/layout.h"

#include <math.h>

enum { DIGITS = 6 };

static void append_range(buffer *out, bool has_range, double low, double high)
{
    if (!has_range)
        return;
    char from[LAYOUT_NUMBER], to[LAYOUT_NUMBER];
    layout_number(low, DIGITS, from);
    layout_number(high, DIGITS, to);
    buffer_printf(out, "in %s .. %s", from, to);
}

/* "0.1 M", or nothing where the value does not apply. */
static void quantity_cell(grid *g, bool applies, double value, const char *units)
{
    buffer text;
    buffer_init(&text);
    if (applies)
        layout_quantity(&text, value, DIGITS, units);
    grid_cell(g, "%s", buffer_get(&text));
    grid_end(g, &text);
}

static const char *role_text(const network_species *species)
{
    if (species->role == ROLE_HELD)
        return "held";
    if (species->is_retained)
        return species->is_signed ? "dynamic, signed, retained" : "dynamic, retained";
    return species->is_signed ? "dynamic, signed" : "dynamic";
}

static void write_species(const lb_network *net, const lb_layout *layout, buffer *out)
{
    const char *units = describe_concentration_unit(net);
    grid g;
    grid_init(&g, "llnnll", true);
    grid_cell(&g, "name");
    grid_cell(&g, "role");
    grid_cell(&g, "at t = 0");
    grid_cell(&g, "in feed");
    grid_cell(&g, "range");
    grid_cell(&g, "formula");
    for (int i = 0; i < net->species_count; i++) {
        const network_species *species = &net->species[i];
        bool is_held = species->role == ROLE_HELD;
        buffer range;
        buffer_init(&range);
        append_range(&range, species->has_initial_range, species->initial_low, species->initial_high);
        grid_cell(&g, "%s", species->name);
        grid_cell(&g, "%s", role_text(species));
        quantity_cell(&g, true, is_held ? species->held_value : species->initial_value, units);
        quantity_cell(&g, isfinite(species->feed_value), species->feed_value, units);
        grid_cell(&g, "%s", buffer_get(&range));
        grid_cell(&g, "%s", species->formula ? species->formula : "");
        grid_end(&g, &range);
    }
    layout_heading(out, layout, "Species");
    grid_write(&g, layout, 2, out);
}

static void write_constants(const lb_network *net, const lb_layout *layout, buffer *out)
{
    if (net->constant_count == 0)
        return;
    grid g;
    grid_init(&g, "lnll", false);
    for (int i = 0; i < net->constant_count; i++) {
        const network_constant *constant = &net->constants[i];
        buffer range;
        buffer_init(&range);
        append_range(&range, constant->has_range, constant->low, constant->high);
        grid_cell(&g, "%s", constant->name);
        grid_number(&g, constant->value, DIGITS);
        grid_cell(&g, "%s", constant->unit ? constant->unit : "");
        grid_cell(&g, "%s", buffer_get(&range));
        grid_end(&g, &range);
    }
    layout_heading(out, layout, "Constants");
    grid_write(&g, layout, 2, out);
}

/* Derived constants with their numbers, or readings, which have none. */
static void write_definitions(const lb_network *net, const network_definition *list, int count, const char *heading,
                              const lb_layout *layout, buffer *out)
{
    if (count == 0)
        return;
    grid g;
    grid_init(&g, "lnll", false);
    for (int i = 0; i < count; i++) {
        buffer text;
        buffer_init(&text);
        network_write(net, list[i].value, true, &text);
        grid_cell(&g, "%s", list[i].name);
        if (isnan(list[i].number))
            grid_cell(&g, "%s", "");
        else
            grid_number(&g, list[i].number, DIGITS);
        grid_cell(&g, "%s", list[i].unit ? list[i].unit : "");
        grid_cell(&g, "= %s", buffer_get(&text));
        grid_end(&g, &text);
    }
    layout_heading(out, layout, heading);
    grid_write(&g, layout, 2, out);
}

/* "X used at 2 v" for one entry of the balance whose factor is not one. */
static void append_factor(buffer *out, const lb_network *net, const network_entry *entry)
{
    const char *name = net->species[net->state_species[entry->state]].name;
    const char *separator = buffer_get(out)[0] ? ", " : "";
    if (entry->expression != EXPRESSION_NONE) {
        buffer_printf(out, "%s%s made at (", separator, name);
        network_write(net, entry->expression, false, out);
        buffer_append(out, ") v");
        return;
    }
    int64_t size = entry->num < 0 ? -entry->num : entry->num;
    if (size == entry->den)
        return;
    buffer_printf(out, "%s%s %s at %.6g v", separator, name, entry->num < 0 ? "used" : "made",
                  (double)size / (double)entry->den);
}

static void write_reactions(const lb_network *net, const lb_layout *layout, buffer *out)
{
    grid g;
    grid_init(&g, "lll", false);
    for (int i = 0; i < net->reaction_count; i++) {
        const network_reaction *reaction = &net->reactions[i];
        const network_step *step = &net->steps[reaction->first_step];
        buffer equation, rate, factors;
        buffer_init(&equation);
        buffer_init(&rate);
        buffer_init(&factors);
        for (int e = 0; e < step->entry_count; e++)
            append_factor(&factors, net, &step->entries[e]);
        grid_cell(&g, "%s", reaction->label);
        network_write_equation(net, reaction, &equation);
        network_write_rate(net, reaction, &rate);
        grid_cell(&g, "%s", buffer_get(&equation));
        grid_cell(&g, "v = %s%s%s", buffer_get(&rate), buffer_get(&factors)[0] ? "; " : "", buffer_get(&factors));
        grid_end(&g, &equation);
        grid_end(&g, &rate);
        grid_end(&g, &factors);
    }
    layout_heading(out, layout, "Reactions");
    grid_write(&g, layout, 2, out);
}

lb_status lb_text_check(const lb_network *net, const lb_layout *layout, lb_text *out)
{
    describe_opening(out, layout, net);
    write_species(net, layout, out);
    write_constants(net, layout, out);
    write_definitions(net, net->derived, net->derived_count, "Derived", layout, out);
    write_reactions(net, layout, out);
    write_definitions(net, net->readings, net->reading_count, "Readings", layout, out);
    return buffer_status(out);
}
