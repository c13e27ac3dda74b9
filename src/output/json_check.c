/* JSON of what was understood: `check`, and the paths that `emit` wrote. */
#include <math.h>

#include "output/json.h"

static const char *constant_kind_text(network_constant_kind kind)
{
    switch (kind) {
    case CONSTANT_NAMED: return "named";
    case CONSTANT_HELD: return "held";
    case CONSTANT_FEED: return "feed";
    case CONSTANT_RESIDENCE: return "residence";
    case CONSTANT_TEMPERATURE: return "temperature";
    case CONSTANT_INLINE: break;
    }
    return "inline";
}

static json_t *units_value(json_writer *w, const unit_system *units)
{
    if (units->none)
        return json_null();
    json_t *object = json_object();
    json_put(w, object, "concentration", json_text(units->concentration_text));
    json_put(w, object, "time", json_text(units->time_text));
    return object;
}

static json_t *species_value(json_writer *w, const network_species *species)
{
    bool is_held = species->role == ROLE_HELD;
    json_t *object = json_object();
    json_put(w, object, "name", json_text(species->name));
    json_put(w, object, "role", json_text(is_held ? "held" : "dynamic"));
    json_put(w, object, "initial", json_number(is_held ? species->held_value : species->initial_value));
    json_put(w, object, "feed", json_number(species->feed_value));
    if (species->has_initial_range) {
        json_put(w, object, "initial_low", json_number(species->initial_low));
        json_put(w, object, "initial_high", json_number(species->initial_high));
    }
    json_put(w, object, "signed", json_boolean(species->is_signed));
    json_put(w, object, "retained", json_boolean(species->is_retained));
    json_put(w, object, "formula", species->formula ? json_text(species->formula) : json_null());
    return object;
}

static json_t *constant_value(json_writer *w, const network_constant *constant)
{
    json_t *object = json_object();
    json_put(w, object, "name", json_text(constant->name));
    json_put(w, object, "value", json_number(constant->value));
    json_put(w, object, "low", json_number(constant->has_range ? constant->low : NAN));
    json_put(w, object, "high", json_number(constant->has_range ? constant->high : NAN));
    json_put(w, object, "unit", json_text(constant->unit ? constant->unit : ""));
    json_put(w, object, "kind", json_text(constant_kind_text(constant->kind)));
    return object;
}

static json_t *definition_value(json_writer *w, const lb_network *net, const network_definition *definition)
{
    buffer text;
    buffer_init(&text);
    network_write(net, definition->value, true, &text);
    json_t *object = json_object();
    json_put(w, object, "name", json_text(definition->name));
    json_put(w, object, "expression", buffer_status(&text) == LB_OK ? json_text(buffer_get(&text)) : NULL);
    json_put(w, object, "value", json_number(definition->number));
    json_put(w, object, "unit", json_text(definition->unit ? definition->unit : ""));
    buffer_clear(&text);
    return object;
}

/* d[species]/dt = sum of coefficient * v over the reactions; an expression as text. */
static json_t *balance_value(json_writer *w, const lb_network *net, const network_reaction *reaction)
{
    const network_step *step = &net->steps[reaction->first_step];
    json_t *object = json_object();
    for (int i = 0; i < step->entry_count; i++) {
        const network_entry *entry = &step->entries[i];
        json_t *coefficient;
        if (entry->expression == EXPRESSION_NONE) {
            coefficient = json_real((double)entry->num / (double)entry->den);
        } else {
            buffer text;
            buffer_init(&text);
            network_write(net, entry->expression, false, &text);
            coefficient = buffer_status(&text) == LB_OK ? json_text(buffer_get(&text)) : NULL;
            buffer_clear(&text);
        }
        json_put(w, object, lb_network_state_name(net, entry->state), coefficient);
    }
    return object;
}

static json_t *written(const lb_network *net, const network_reaction *reaction,
                       void (*write)(const lb_network *, const network_reaction *, buffer *))
{
    buffer text;
    buffer_init(&text);
    write(net, reaction, &text);
    json_t *value = buffer_status(&text) == LB_OK ? json_text(buffer_get(&text)) : NULL;
    buffer_clear(&text);
    return value;
}

static json_t *reaction_value(json_writer *w, const lb_network *net, const network_reaction *reaction)
{
    json_t *object = json_object();
    json_put(w, object, "label", json_text(reaction->label));
    json_put(w, object, "equation", written(net, reaction, network_write_equation));
    json_put(w, object, "rate", written(net, reaction, network_write_rate));
    json_put(w, object, "reversible", json_boolean(reaction->is_reversible));
    json_put(w, object, "balance", balance_value(w, net, reaction));
    return object;
}

void json_put_check(json_writer *w, const lb_network *net)
{
    json_t *species = json_array(), *constants = json_array(), *derived = json_array();
    json_t *reactions = json_array(), *readings = json_array();
    for (int i = 0; i < net->species_count; i++)
        json_add(w, species, species_value(w, &net->species[i]));
    for (int i = 0; i < net->constant_count; i++)
        json_add(w, constants, constant_value(w, &net->constants[i]));
    for (int i = 0; i < net->derived_count; i++)
        json_add(w, derived, definition_value(w, net, &net->derived[i]));
    for (int i = 0; i < net->reaction_count; i++)
        json_add(w, reactions, reaction_value(w, net, &net->reactions[i]));
    for (int i = 0; i < net->reading_count; i++)
        json_add(w, readings, definition_value(w, net, &net->readings[i]));
    json_put(w, w->root, "title", json_text(net->title ? net->title : ""));
    json_put(w, w->root, "units", units_value(w, &net->units));
    json_put(w, w->root, "open", json_boolean(net->is_open));
    json_put(w, w->root, "tank", json_boolean(net->is_tank));
    json_put(w, w->root, "species", species);
    json_put(w, w->root, "constants", constants);
    json_put(w, w->root, "derived", derived);
    json_put(w, w->root, "reactions", reactions);
    json_put(w, w->root, "readings", readings);
}

lb_status lb_json_check(const lb_network *network, const lb_diagnostics *diagnostics, lb_text *out)
{
    json_writer w;
    json_begin(&w, "check", network->file, diagnostics);
    json_put_check(&w, network);
    return json_finish(&w, out);
}

lb_status lb_json_emit(const lb_network *network, const lb_diagnostics *diagnostics, const lb_emit_paths *paths,
                       lb_text *out)
{
    json_writer w;
    json_begin(&w, "emit", network->file, diagnostics);
    json_put(&w, w.root, "header", json_text(paths->header));
    json_put(&w, w.root, "source", json_text(paths->source));
    if (paths->glue_header) {
        json_put(&w, w.root, "glue_header", json_text(paths->glue_header));
        json_put(&w, w.root, "glue_source", json_text(paths->glue_source));
        json_put(&w, w.root, "example", json_text(paths->example));
    }
    return json_finish(&w, out);
}
