/* The network: species, constants, definitions, reactions; built piece by piece.
 *
 * Whoever builds a network (lower.c, or a test) adds pieces in the order that
 * network.h gives; steps are in network_step.c, texts in network_text.c.  Every
 * array doubles when its count reaches a power of two, which saves a capacity
 * beside each of the many small ones. */
#include "model/network.h"

#include <limits.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/network_build.h"

/* ---- Life ------------------------------------------------------------------- */

lb_network *network_new(void)
{
    lb_network *net = memory_zeroed(1, sizeof *net);
    if (!net)
        return NULL;
    net->residence = EXPRESSION_NONE;
    expression_graph_init(&net->graph);
    net->file = memory_text("");
    net->title = memory_text("");
    net->texts = arena_new();
    if (!net->file || !net->title || !net->texts) {
        lb_network_free(net);
        return NULL;
    }
    return net;
}

static void free_species(network_species *species)
{
    memory_free(species->name);
    memory_free(species->bracket);
    memory_free(species->formula);
}

static void free_reaction(network_reaction *reaction)
{
    memory_free(reaction->reactants);
    memory_free(reaction->products);
}

/* A step of a one-way reaction is called like its reaction. */
static void free_step(const lb_network *net, network_step *step)
{
    if (step->reaction < 0 || step->name != net->reactions[step->reaction].label)
        memory_free(step->name);
    memory_free(step->orders);
    memory_free(step->entries);
}

/* What has no unit shares one empty text. */
static char no_unit[] = "";

static void free_unit(char *text)
{
    if (text != no_unit)
        memory_free(text);
}

void network_set_unit(char **place, char *text)
{
    free_unit(*place);
    *place = text;
    if (*text == '\0') {
        memory_free(text);
        *place = no_unit;
    }
}

static void free_definitions(network_definition *definitions, int count)
{
    for (int i = 0; i < count; i++) {
        memory_free(definitions[i].name);
        free_unit(definitions[i].unit);
    }
    memory_free(definitions);
}

void lb_network_free(lb_network *net)
{
    if (!net)
        return;
    for (int i = 0; i < net->species_count; i++)
        free_species(&net->species[i]);
    for (int i = 0; i < net->constant_count; i++)
        free_unit(net->constants[i].unit);
    for (int i = 0; i < net->step_count; i++)
        free_step(net, &net->steps[i]);
    for (int i = 0; i < net->reaction_count; i++)
        free_reaction(&net->reactions[i]);
    free_definitions(net->derived, net->derived_count);
    free_definitions(net->readings, net->reading_count);
    memory_free(net->species);
    memory_free(net->state_species);
    memory_free(net->constants);
    memory_free(net->reactions);
    memory_free(net->steps);
    memory_free(net->definition_of);
    memory_free(net->source);
    memory_free(net->title);
    memory_free(net->file);
    expression_graph_clear(&net->graph);
    arena_free(net->texts);
    memory_free(net);
}

void *network_grow(void *array, int count, size_t size)
{
    if (count > 0 && (count & (count - 1)) != 0)
        return array;
    if (count > INT_MAX / 2)
        return NULL;
    return memory_resize(array, count > 0 ? 2 * (size_t)count : 1, size);
}

/* ---- Species, constants, definitions ------------------------------------------- */

static char *bracketed(const char *name)
{
    buffer text;
    buffer_init(&text);
    buffer_char(&text, '[');
    bool needs_quotes = strpbrk(name, "]\" ") != NULL;
    if (needs_quotes)
        buffer_char(&text, '"');
    buffer_append(&text, name);
    if (needs_quotes)
        buffer_char(&text, '"');
    buffer_char(&text, ']');
    return buffer_take(&text);
}

/* Row for a dynamic species.  False without memory. */
static bool add_state(lb_network *net, int species)
{
    int *grown = network_grow(net->state_species, net->states, sizeof *grown);
    if (!grown)
        return false;
    net->state_species = grown;
    grown[net->states] = species;
    net->species[species].state = net->states++;
    return true;
}

int network_add_species(lb_network *net, const char *name, network_role role)
{
    network_species *grown = network_grow(net->species, net->species_count, sizeof *grown);
    if (!grown)
        return -1;
    net->species = grown;
    int index = net->species_count++;
    grown[index] = (network_species){
        .role = role, .state = -1,
        .initial = EXPRESSION_NONE, .feed = EXPRESSION_NONE, .held = EXPRESSION_NONE,
        .initial_value = NAN, .feed_value = NAN, .held_value = NAN,
    };
    grown[index].name = memory_text(name);
    grown[index].bracket = bracketed(name);
    if (!grown[index].name || !grown[index].bracket)
        return -1;
    if (role == ROLE_DYNAMIC && !add_state(net, index))
        return -1;
    return index;
}

int network_add_constant(lb_network *net, const char *name, network_constant_kind kind, double value)
{
    network_constant *grown = network_grow(net->constants, net->constant_count, sizeof *grown);
    if (!grown)
        return -1;
    net->constants = grown;
    int index = net->constant_count++;
    grown[index] = (network_constant){.kind = kind, .value = value, .low = value, .high = value};
    grown[index].name = arena_text_n(net->texts, name, strlen(name));
    grown[index].unit = no_unit;
    return grown[index].name ? index : -1;
}

int network_add_definition(lb_network *net, bool is_reading, const char *name, expression value)
{
    network_definition **list = is_reading ? &net->readings : &net->derived;
    int *count = is_reading ? &net->reading_count : &net->derived_count;
    network_definition *grown = network_grow(*list, *count, sizeof *grown);
    if (!grown || value == EXPRESSION_NONE) {
        *list = grown ? grown : *list;
        return -1;
    }
    *list = grown;
    int index = (*count)++;
    grown[index] = (network_definition){.value = value, .number = NAN};
    grown[index].name = memory_text(name);
    grown[index].unit = no_unit;
    return grown[index].name ? index : -1;
}

/* ---- Reactions and their terms ---------------------------------------------------- */

int network_add_reaction(lb_network *net, const char *label, bool is_reversible)
{
    network_reaction *grown = network_grow(net->reactions, net->reaction_count, sizeof *grown);
    if (!grown)
        return -1;
    net->reactions = grown;
    int index = net->reaction_count++;
    grown[index] = (network_reaction){.is_reversible = is_reversible, .first_step = net->step_count};
    grown[index].label = arena_text_n(net->texts, label, strlen(label));
    return grown[index].label ? index : -1;
}

bool fraction_of_double(double value, int64_t *num, int64_t *den)
{
    /* Convergents of the continued fraction, until one is this double. */
    int64_t p0 = 0, q0 = 1, p1 = 1, q1 = 0;
    double rest = fabs(value);
    for (int i = 0; i < 40 && rest < 1e9; i++) {
        int64_t whole = (int64_t)floor(rest);
        int64_t p2 = whole * p1 + p0, q2 = whole * q1 + q0;
        if (p2 > 1000000000 || q2 > 1000000)
            return false;
        if ((double)p2 / (double)q2 == fabs(value)) {
            *num = value < 0 ? -p2 : p2;
            *den = q2;
            return true;
        }
        if (rest == (double)whole)
            return false;
        rest = 1 / (rest - (double)whole);
        p0 = p1, q0 = q1, p1 = p2, q1 = q2;
    }
    return false;
}

static int64_t gcd(int64_t a, int64_t b)
{
    while (b != 0) {
        int64_t rest = a % b;
        a = b, b = rest;
    }
    return a < 0 ? -a : a;
}

/* num/den += num2/den2 in lowest terms; false, and unchanged, when it leaves 64 bits. */
static bool fraction_add(int64_t *num, int64_t *den, int64_t num2, int64_t den2)
{
    int64_t common = gcd(*den, den2);
    int64_t left, right, top, bottom;
    if (__builtin_mul_overflow(*num, den2 / common, &left) || __builtin_mul_overflow(num2, *den / common, &right) ||
        __builtin_add_overflow(left, right, &top) || __builtin_mul_overflow(*den, den2 / common, &bottom) ||
        top == INT64_MIN)
        return false;
    int64_t content = gcd(top, bottom);
    *num = content > 1 ? top / content : top;
    *den = content > 1 ? bottom / content : bottom;
    return true;
}

expression coefficient_expression(expression_graph *g, int64_t num, int64_t den, expression e)
{
    return e != EXPRESSION_NONE ? e : expression_number(g, (double)num / (double)den);
}

bool coefficient_settle(expression_graph *g, int64_t *num, int64_t *den, expression *e)
{
    double value;
    if (*e != EXPRESSION_NONE && expression_is_number(g, *e, &value) && fraction_of_double(value, num, den))
        *e = EXPRESSION_NONE;
    return *e == EXPRESSION_NONE;
}

bool coefficient_add(expression_graph *g, int64_t *num, int64_t *den, expression *e,
                     int64_t num2, int64_t den2, expression e2)
{
    if (*e == EXPRESSION_NONE && e2 == EXPRESSION_NONE && fraction_add(num, den, num2, den2))
        return true;
    expression left = coefficient_expression(g, *num, *den, *e);
    expression sum = expression_binary(g, EXPRESSION_ADD, left, coefficient_expression(g, num2, den2, e2));
    if (sum == EXPRESSION_NONE)
        return false;
    *e = sum;
    coefficient_settle(g, num, den, e);
    return true;
}

int network_add_term(lb_network *net, int reaction, bool is_product, int species,
                     int64_t num, int64_t den, expression coefficient)
{
    network_reaction *into = &net->reactions[reaction];
    network_term **side = is_product ? &into->products : &into->reactants;
    int *count = is_product ? &into->product_count : &into->reactant_count;
    coefficient_settle(&net->graph, &num, &den, &coefficient);
    int *place = &net->species[species].place[is_product];
    if (*place < *count && (*side)[*place].species == species) {
        network_term *old = &(*side)[*place];
        bool added = coefficient_add(&net->graph, &old->num, &old->den, &old->expression, num, den, coefficient);
        return added ? *place : -1;
    }
    network_term *grown = network_grow(*side, *count, sizeof *grown);
    if (!grown)
        return -1;
    *side = grown;
    grown[*count] = (network_term){.species = species, .num = num, .den = den, .expression = coefficient};
    *place = (*count)++;
    return *place;
}

/* ---- Finishing ------------------------------------------------------------------- */

/* A value of the file, from the values of all nodes. */
static double value_or_nan(const double *values, expression e)
{
    return e == EXPRESSION_NONE ? NAN : values[e];
}

static void fill_values(lb_network *net, const double *values)
{
    for (int i = 0; i < net->species_count; i++) {
        network_species *species = &net->species[i];
        species->initial_value = value_or_nan(values, species->initial);
        species->feed_value = value_or_nan(values, species->feed);
        species->held_value = value_or_nan(values, species->held);
    }
    for (int i = 0; i < net->derived_count; i++)
        net->derived[i].number = values[net->derived[i].value];
}

static lb_status evaluate_defaults(lb_network *net)
{
    lb_status status = LB_E_NOMEM;
    double *k = memory_array((size_t)net->constant_count, sizeof *k);
    double *x = memory_zeroed((size_t)net->states, sizeof *x);
    double *values = memory_array(net->graph.count, sizeof *values);
    if (!k || !x || !values)
        goto done;
    for (int i = 0; i < net->constant_count; i++)
        k[i] = net->constants[i].value;
    expression_evaluate(&net->graph, 0, (int)net->graph.count - 1, NULL, k, x, values);
    fill_values(net, values);
    status = LB_OK;
done:
    memory_free(values);
    memory_free(x);
    memory_free(k);
    return status;
}

static bool has_held(const lb_network *net, const network_term *terms, int count)
{
    for (int i = 0; i < count; i++)
        if (net->species[terms[i].species].role == ROLE_HELD)
            return true;
    return false;
}

static bool is_open(const lb_network *net)
{
    bool open = net->is_tank;
    for (int i = 0; !open && i < net->reaction_count; i++) {
        const network_reaction *reaction = &net->reactions[i];
        open = reaction->reactant_count == 0 || reaction->product_count == 0 ||
               has_held(net, reaction->reactants, reaction->reactant_count) ||
               has_held(net, reaction->products, reaction->product_count);
    }
    return open;
}

/* Which definition a node is the value of; leaves keep their own names. */
static lb_status index_definitions(lb_network *net)
{
    if (net->derived_count + net->reading_count == 0)
        return LB_OK;
    net->definition_of = memory_array(net->graph.count, sizeof *net->definition_of);
    if (!net->definition_of)
        return LB_E_NOMEM;
    for (size_t e = 0; e < net->graph.count; e++)
        net->definition_of[e] = -1;
    for (int i = net->derived_count + net->reading_count - 1; i >= 0; i--) {
        expression e = i < net->derived_count ? net->derived[i].value : net->readings[i - net->derived_count].value;
        if (net->graph.nodes[e].kind > EXPRESSION_STATE)
            net->definition_of[e] = i;
    }
    return LB_OK;
}

lb_status network_finish(lb_network *net)
{
    for (int i = 0; i < net->species_count; i++) {
        network_species *species = &net->species[i];
        if (species->role == ROLE_DYNAMIC && species->initial == EXPRESSION_NONE)
            species->initial = expression_number(&net->graph, 0);
        if (species->role == ROLE_DYNAMIC && species->initial == EXPRESSION_NONE)
            return LB_E_NOMEM;
    }
    net->is_open = is_open(net);
    lb_status status = evaluate_defaults(net);
    if (status == LB_OK)
        status = index_definitions(net);
    expression_graph_seal(&net->graph);
    return status;
}
