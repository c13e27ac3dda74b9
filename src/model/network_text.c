/* The network in the notation of the mechanism file: names, equations, rates. */
#include <string.h>

#include "base/memory.h"
#include "model/network.h"
#include "model/network_build.h"

const char *network_leaf_name(const void *context, expression_kind leaf, int index)
{
    const lb_network *net = context;
    if (leaf == EXPRESSION_STATE)
        return net->species[net->state_species[index]].bracket;
    const network_constant *constant = &net->constants[index];
    return constant->kind == CONSTANT_TEMPERATURE ? "T" : constant->name;
}

static const char *definition_name(const void *context, expression e)
{
    const lb_network *net = context;
    int index = net->definition_of ? net->definition_of[e] : -1;
    if (index < 0)
        return NULL;
    return index < net->derived_count ? net->derived[index].name : net->readings[index - net->derived_count].name;
}

void network_write(const lb_network *net, expression e, bool expand, buffer *out)
{
    expression_write_aliased(&net->graph, e, network_leaf_name, definition_name, expand, net, out);
}

/* Letters (ASCII and the Greek block), digits and `_`, no digit first, and not `in`. */
static bool is_plain_name(const char *name)
{
    if (strcmp(name, "in") == 0 || (name[0] >= '0' && name[0] <= '9') || name[0] == '\0')
        return false;
    for (const unsigned char *c = (const unsigned char *)name; *c; c++) {
        bool ascii = (*c >= 'a' && *c <= 'z') || (*c >= 'A' && *c <= 'Z') || (*c >= '0' && *c <= '9') || *c == '_';
        bool greek = (*c == 0xce || *c == 0xcf) && c[1] >= 0x80;
        if (!ascii && !greek)
            return false;
        c += greek;
    }
    return true;
}

void network_write_name(const char *name, buffer *out)
{
    bool plain = is_plain_name(name);
    if (!plain)
        buffer_char(out, '"');
    buffer_append(out, name);
    if (!plain)
        buffer_char(out, '"');
}

/* Digits after the point that num/den has as a decimal, or -1 when a double does not hold it. */
static int decimal_places(int64_t num, int64_t den)
{
    int64_t scale = 1;
    for (int places = 0; places <= 15; places++, scale *= 10)
        if (scale % den == 0)
            return (double)num / (double)den * (double)scale < 1e15 ? places : -1;
    return -1;
}

static void write_term(const lb_network *net, const network_term *term, buffer *out)
{
    if (term->expression != EXPRESSION_NONE) {
        buffer_char(out, '(');
        network_write(net, term->expression, false, out);
        buffer_append(out, ") ");
    } else if (term->num != term->den) {
        int places = decimal_places(term->num, term->den);
        if (places >= 0)
            buffer_printf(out, "%.*f", places, (double)term->num / (double)term->den);
        else
            buffer_printf(out, "(%lld/%lld)", (long long)term->num, (long long)term->den);
        buffer_char(out, ' ');
    }
    network_write_name(net->species[term->species].name, out);
}

static void write_side(const lb_network *net, const network_term *terms, int count, buffer *out)
{
    for (int i = 0; i < count; i++) {
        buffer_append(out, i > 0 ? " + " : "");
        write_term(net, &terms[i], out);
    }
}

void network_write_equation(const lb_network *net, const network_reaction *reaction, buffer *out)
{
    write_side(net, reaction->reactants, reaction->reactant_count, out);
    if (reaction->reactant_count > 0)
        buffer_char(out, ' ');
    buffer_append(out, reaction->is_reversible ? "<->" : "->");
    if (reaction->product_count > 0)
        buffer_char(out, ' ');
    write_side(net, reaction->products, reaction->product_count, out);
}

/* Forward minus reverse. */
void network_write_rate(const lb_network *net, const network_reaction *reaction, buffer *out)
{
    for (int i = 0; i < reaction->step_count; i++) {
        const network_step *step = &net->steps[reaction->first_step + i];
        expression_kind kind = net->graph.nodes[step->rate].kind;
        bool is_sum = kind == EXPRESSION_ADD || kind == EXPRESSION_SUBTRACT || kind == EXPRESSION_NEGATE;
        bool in_parentheses = i > 0 && is_sum && !definition_name(net, step->rate);
        buffer_append(out, i > 0 ? " - " : "");
        buffer_append(out, in_parentheses ? "(" : "");
        network_write(net, step->rate, false, out);
        buffer_append(out, in_parentheses ? ")" : "");
    }
}
