/* Random networks through the builder.
 *
 * Numbers come from SplitMix64 (Steele, Lea and Flood, OOPSLA 2014), so a seed
 * means the same network on every machine. */
#include "random_network.h"

#include <math.h>
#include <stdbool.h>
#include <stdio.h>

typedef struct maker {
    lb_network *net;
    expression_graph *g;
    uint64_t state;
    int dynamic, held;               /* species 0..dynamic-1, then the held ones */
    expression temperature, energy, fraction, exponent, whole_exponent, saturation, inhibition;
    expression derived[2];
    expression reading;
    int constants;
    bool failed;
} maker;

static uint64_t next(uint64_t *state)
{
    uint64_t z = (*state += UINT64_C(0x9e3779b97f4a7c15));
    z = (z ^ z >> 30) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ z >> 27) * UINT64_C(0x94d049bb133111eb);
    return z ^ z >> 31;
}

static double uniform(uint64_t *state)
{
    return (double)(next(state) >> 11) * 0x1p-53;
}

static int below(maker *mk, int count)
{
    return (int)(next(&mk->state) % (uint64_t)count);
}

static double logarithmic(uint64_t *state, double low, double high)
{
    return low * pow(high / low, uniform(state));
}

static void note(maker *mk, int result)
{
    mk->failed = mk->failed || result < 0;
}

/* ---- Pieces of expressions ---------------------------------------------------- */

static expression number(maker *mk, double value)
{
    return expression_number(mk->g, value);
}

static expression two(maker *mk, expression_kind kind, expression a, expression b)
{
    return expression_binary(mk->g, kind, a, b);
}

static expression times(maker *mk, expression a, expression b)
{
    return two(mk, EXPRESSION_MULTIPLY, a, b);
}

static expression named(maker *mk, const char *name, network_constant_kind kind, double value)
{
    int index = network_add_constant(mk->net, name, kind, value);
    note(mk, index);
    return index < 0 ? EXPRESSION_NONE : expression_constant(mk->g, index);
}

static expression fresh_constant(maker *mk)
{
    char name[32];
    snprintf(name, sizeof name, "k%d", mk->constants++);
    return named(mk, name, CONSTANT_NAMED, logarithmic(&mk->state, 0.1, 10));
}

/* A rate constant: mostly one of its own, sometimes a derived one. */
static expression rate_constant(maker *mk)
{
    return below(mk, 6) == 0 ? mk->derived[below(mk, 2)] : fresh_constant(mk);
}

static expression concentration(maker *mk, int species)
{
    const network_species *of = &mk->net->species[species];
    return of->role == ROLE_HELD ? of->held : expression_state(mk->g, of->state);
}

/* ---- Rate laws -------------------------------------------------------------------- */

static expression saturating(maker *mk, expression top, expression s)
{
    return two(mk, EXPRESSION_DIVIDE, times(mk, top, s), two(mk, EXPRESSION_ADD, mk->saturation, s));
}

static expression hill(maker *mk, expression top, expression s)
{
    expression h = below(mk, 2) ? mk->exponent : mk->whole_exponent;
    expression power = two(mk, EXPRESSION_POWER, s, h);
    expression bottom = two(mk, EXPRESSION_ADD, two(mk, EXPRESSION_POWER, mk->saturation, h), power);
    return two(mk, EXPRESSION_DIVIDE, times(mk, top, power), bottom);
}

static expression inhibited(maker *mk, expression top, expression s, expression i)
{
    expression grip = two(mk, EXPRESSION_ADD, number(mk, 1), two(mk, EXPRESSION_DIVIDE, i, mk->inhibition));
    expression tenth = two(mk, EXPRESSION_POWER, grip, number(mk, 1 + below(mk, 9)));
    return two(mk, EXPRESSION_DIVIDE, saturating(mk, top, s), tenth);
}

static expression activated(maker *mk, expression top, expression s)
{
    expression rt = times(mk, number(mk, 8.31446261815324), mk->temperature);
    expression exponent = expression_unary(mk->g, EXPRESSION_NEGATE, two(mk, EXPRESSION_DIVIDE, mk->energy, rt));
    return times(mk, times(mk, top, expression_unary(mk->g, EXPRESSION_EXP, exponent)), s);
}

static expression logarithm(maker *mk, expression top, expression s)
{
    expression ratio = two(mk, EXPRESSION_ADD, number(mk, 1), two(mk, EXPRESSION_DIVIDE, s, mk->saturation));
    expression_kind kind = below(mk, 2) ? EXPRESSION_LN : EXPRESSION_LOG10;
    return times(mk, top, expression_unary(mk->g, kind, ratio));
}

static expression rooted(maker *mk, expression top, expression s, expression other)
{
    expression sum = two(mk, EXPRESSION_ADD, s, times(mk, number(mk, 2), other));
    return two(mk, EXPRESSION_SUBTRACT, times(mk, top, expression_unary(mk->g, EXPRESSION_SQRT, sum)),
               times(mk, times(mk, top, mk->reading), number(mk, 0.25)));
}

static expression rate_law(maker *mk)
{
    expression top = rate_constant(mk), s = concentration(mk, below(mk, mk->dynamic));
    expression other = concentration(mk, below(mk, mk->dynamic + mk->held));
    switch (below(mk, 7)) {
    case 0: return saturating(mk, top, s);
    case 1: return hill(mk, top, s);
    case 2: return inhibited(mk, top, s, other);
    case 3: return activated(mk, top, s);
    case 4: return logarithm(mk, top, s);
    case 5: return rooted(mk, top, s, other);
    default: return times(mk, top, two(mk, EXPRESSION_SUBTRACT, s, other));
    }
}

static expression power_law(maker *mk)
{
    static const double orders[] = {0.5, 1.3, -0.7, 2, -1, 1, 0.25, 7};
    expression rate = rate_constant(mk);
    for (int i = 1 + below(mk, 3); i > 0; i--) {
        expression s = concentration(mk, below(mk, mk->dynamic + mk->held));
        rate = times(mk, rate, two(mk, EXPRESSION_POWER, s, number(mk, orders[below(mk, 8)])));
    }
    return rate;
}

/* ---- Reactions ---------------------------------------------------------------------- */

static void add_term(maker *mk, int reaction, bool is_product)
{
    static const int64_t coefficient[][2] = {{1, 1}, {1, 1}, {1, 1}, {2, 1}, {3, 1}, {1, 2}};
    int which = below(mk, 6), species = below(mk, mk->dynamic + mk->held);
    note(mk, network_add_term(mk->net, reaction, is_product, species, coefficient[which][0],
                              coefficient[which][1], EXPRESSION_NONE));
}

static void add_sides(maker *mk, int reaction)
{
    int reactants = below(mk, 3), products = below(mk, 4) + (reactants == 0);
    for (int i = 0; i < reactants; i++)
        add_term(mk, reaction, false);
    for (int i = 0; i < products; i++)
        add_term(mk, reaction, true);
}

static void add_reaction(maker *mk, int index)
{
    char label[32];
    snprintf(label, sizeof label, "R%d", index + 1);
    int kind = below(mk, 8);
    bool is_reversible = kind == 0;
    int reaction = network_add_reaction(mk->net, label, is_reversible);
    note(mk, reaction);
    if (reaction < 0)
        return;
    add_sides(mk, reaction);
    if (!is_reversible && below(mk, 8) == 0) {
        expression coefficient = below(mk, 2) ? two(mk, EXPRESSION_DIVIDE, mk->fraction, number(mk, 2))
                                              : times(mk, mk->fraction, mk->fraction);
        note(mk, network_add_term(mk->net, reaction, true, below(mk, mk->dynamic), 1, 1, coefficient));
    }
    if (kind >= 6)
        note(mk, network_add_step(mk->net, reaction, STEP_FORWARD, rate_law(mk)));
    else if (kind == 5)
        note(mk, network_add_step(mk->net, reaction, STEP_FORWARD, power_law(mk)));
    else
        note(mk, network_add_mass_action(mk->net, reaction, STEP_FORWARD, rate_constant(mk)));
    if (is_reversible)
        note(mk, network_add_mass_action(mk->net, reaction, STEP_REVERSE, rate_constant(mk)));
}

/* ---- Networks ------------------------------------------------------------------------ */

static void add_species(maker *mk)
{
    char name[32];
    for (int i = 0; i < mk->dynamic; i++) {
        snprintf(name, sizeof name, "S%d", i);
        note(mk, network_add_species(mk->net, name, ROLE_DYNAMIC));
    }
    for (int i = 0; i < mk->held; i++) {
        snprintf(name, sizeof name, "H%d", i);
        int species = network_add_species(mk->net, name, ROLE_HELD);
        note(mk, species);
        snprintf(name, sizeof name, "[H%d]", i);
        if (species >= 0)
            mk->net->species[species].held = named(mk, name, CONSTANT_HELD, logarithmic(&mk->state, 0.2, 5));
    }
}

static void add_constants(maker *mk)
{
    mk->temperature = named(mk, "temperature", CONSTANT_TEMPERATURE, 250 + 100 * uniform(&mk->state));
    mk->energy = named(mk, "Ea", CONSTANT_NAMED, 2000 + 6000 * uniform(&mk->state));
    mk->fraction = named(mk, "f", CONSTANT_NAMED, 0.5 + uniform(&mk->state));
    mk->exponent = named(mk, "h", CONSTANT_NAMED, 1.5 + 2 * uniform(&mk->state));
    mk->whole_exponent = named(mk, "hw", CONSTANT_NAMED, 2 + below(mk, 3));
    mk->saturation = named(mk, "Km", CONSTANT_NAMED, logarithmic(&mk->state, 0.3, 3));
    mk->inhibition = named(mk, "Ki", CONSTANT_NAMED, logarithmic(&mk->state, 0.3, 3));
    expression half = times(mk, number(mk, 0.5), fresh_constant(mk));
    mk->derived[0] = times(mk, half, mk->held ? mk->net->species[mk->dynamic].held : mk->fraction);
    expression root = expression_unary(mk->g, EXPRESSION_SQRT, two(mk, EXPRESSION_ADD, mk->derived[0], mk->saturation));
    mk->derived[1] = two(mk, EXPRESSION_DIVIDE, root, fresh_constant(mk));
    note(mk, network_add_definition(mk->net, false, "kd0", mk->derived[0]));
    note(mk, network_add_definition(mk->net, false, "kd1", mk->derived[1]));
    expression s0 = concentration(mk, 0), s1 = concentration(mk, 1);
    mk->reading = two(mk, EXPRESSION_DIVIDE, s0, two(mk, EXPRESSION_ADD, s0, s1));
    note(mk, network_add_definition(mk->net, true, "share", mk->reading));
}

static void add_tank(maker *mk)
{
    for (int i = 0; i < mk->dynamic; i++) {
        network_species *species = &mk->net->species[i];
        int kind = below(mk, 6);
        species->is_retained = kind == 0;
        if (kind == 1) {
            char name[32];
            snprintf(name, sizeof name, "[S%d]in", i);
            species->feed = named(mk, name, CONSTANT_FEED, logarithmic(&mk->state, 0.1, 2));
        } else if (kind == 2) {
            species->feed = times(mk, number(mk, 0.125), mk->saturation);
        }
    }
    expression residence = named(mk, "residence", CONSTANT_RESIDENCE, logarithmic(&mk->state, 0.5, 20));
    note(mk, network_set_tank(mk->net, residence));
}

static lb_network *finished(maker *mk)
{
    if (!mk->failed && network_finish(mk->net) == LB_OK)
        return mk->net;
    lb_network_free(mk->net);
    return NULL;
}

static bool begin(maker *mk, uint64_t seed)
{
    *mk = (maker){.net = network_new(), .state = seed * UINT64_C(0x5851f42d4c957f2d) + 1};
    if (mk->net)
        mk->g = &mk->net->graph;
    return mk->net != NULL;
}

lb_network *random_network(uint64_t seed)
{
    maker mk;
    if (!begin(&mk, seed))
        return NULL;
    /* Small networks are as frequent as large ones. */
    mk.dynamic = (int)logarithmic(&mk.state, 2, 61);
    mk.held = below(&mk, 4);
    add_species(&mk);
    add_constants(&mk);
    int reactions = 1 + mk.dynamic + below(&mk, mk.dynamic);
    for (int i = 0; !mk.failed && i < reactions; i++)
        add_reaction(&mk, i);
    if (!mk.failed && seed % 3 == 0)
        add_tank(&mk);
    return finished(&mk);
}

static void add_pair(maker *mk, int reaction, bool is_product, int count)
{
    for (int i = 0; i < count; i++)
        note(mk, network_add_term(mk->net, reaction, is_product, below(mk, mk->dynamic), 1, 1, EXPRESSION_NONE));
}

lb_network *random_mass_action(uint64_t seed, int species, int reactions)
{
    maker mk;
    if (!begin(&mk, seed))
        return NULL;
    mk.dynamic = species;
    add_species(&mk);
    for (int i = 0; !mk.failed && i < reactions; i++) {
        char label[32];
        snprintf(label, sizeof label, "R%d", i + 1);
        int reaction = network_add_reaction(mk.net, label, false);
        note(&mk, reaction);
        if (reaction < 0)
            break;
        add_pair(&mk, reaction, false, 1 + below(&mk, 2));
        add_pair(&mk, reaction, true, 1 + below(&mk, 2));
        note(&mk, network_add_mass_action(mk.net, reaction, STEP_FORWARD, fresh_constant(&mk)));
    }
    return finished(&mk);
}

void random_state(uint64_t seed, int n, double *x)
{
    uint64_t state = seed ^ UINT64_C(0x2545f4914f6cdd1d);
    for (int i = 0; i < n; i++)
        x[i] = logarithmic(&state, 0.05, 5);
}
