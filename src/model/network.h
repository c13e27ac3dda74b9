/* The network: what a mechanism file means.  Immutable once built.
 *
 * Built by model/lower.c from a syntax tree, or by tests through the builder
 * below.  Everything numeric is in stored units (model/units.h).
 *
 *   species    dynamic ones are states 0..n-1 in order of first appearance in
 *              reactions; held ones are folded into rate expressions
 *   constants  0..m-1: whatever has a plain number in the file (named constants,
 *              held and feed concentrations, residence, temperature, numbers
 *              written inside a reaction), file order
 *   steps      one-way reactions 0..r-1 in file order, forward before reverse,
 *              then the flows of a tank (inflow, outflow per dynamic species)
 */
#ifndef LIMBECK_MODEL_NETWORK_H
#define LIMBECK_MODEL_NETWORK_H

#include <stdbool.h>
#include <stdint.h>

#include "limbeck.h"
#include "model/expression.h"
#include "model/units.h"

typedef enum network_role { ROLE_DYNAMIC, ROLE_HELD } network_role;

typedef struct network_species {
    char *name;
    network_role role;
    int state;                  /* row, or -1 when held */
    char *bracket;              /* "[X]": its concentration, as the file writes it */
    bool is_signed, is_retained;
    bool has_initial;           /* the file says so */
    expression initial;         /* of constants alone; dynamic: never EXPRESSION_NONE */
    expression feed;            /* EXPRESSION_NONE when the file says nothing, or there is no tank */
    expression held;            /* EXPRESSION_NONE unless held */
    double initial_value, feed_value, held_value; /* at the file's constants; NAN where it does not apply */
    bool has_initial_range;
    double initial_low, initial_high;
    char *formula;              /* as written, or NULL */
    int line;
    int place[2];               /* builder: where it stands among the terms last added to a side */
} network_species;

typedef enum network_constant_kind {
    CONSTANT_NAMED, CONSTANT_HELD, CONSTANT_FEED, CONSTANT_RESIDENCE, CONSTANT_TEMPERATURE, CONSTANT_INLINE
} network_constant_kind;

typedef struct network_constant {
    char *name;                 /* "k2", "[A]", "[X]in", "residence", "temperature", "R3.kf" */
    char *unit;                 /* of the stored number; "" when it has none */
    double value;
    double low, high;
    network_constant_kind kind;
    int line;
    bool has_range, is_logarithmic;
    bool may_be_negative;       /* not a rate constant, concentration, time or temperature */
} network_constant;

/* A derived constant or a reading: a named expression. */
typedef struct network_definition {
    char *name;                 /* for a derived held concentration "[A]", and so on */
    expression value;
    double number;              /* at the file's constants; NAN for readings */
    char *unit;
    int line;
} network_definition;

/* One entry of a side of a reaction, as written (held species included). */
typedef struct network_term {
    int species;
    expression expression;      /* product coefficients only */
    int64_t num, den;           /* exact coefficient when expression is EXPRESSION_NONE; den > 0 */
} network_term;

/* Entry of the net stoichiometry: product minus reactant. */
typedef struct network_entry {
    int state;
    expression expression;      /* net coefficient of constants, else EXPRESSION_NONE */
    int64_t num, den;           /* exact, when expression is EXPRESSION_NONE */
} network_entry;

typedef enum network_direction { STEP_FORWARD, STEP_REVERSE, STEP_INFLOW, STEP_OUTFLOW } network_direction;

/* One power x_state^order of a power-law rate. */
typedef struct network_order {
    int state;
    double order;
} network_order;

typedef struct network_step {
    char *name;                 /* "R1", its reaction's text; of a reversible reaction "R3.forward", "R3.reverse";
                                 * flows "[X] inflow" */
    network_order *orders;      /* [order_count], by state, no zero orders */
    network_entry *entries;     /* [entry_count] net changes, by state, no zero entries */
    int order_count, entry_count;
    int reaction;               /* -1 for a flow */
    network_direction direction;
    expression factor;          /* of constants alone; power laws only: rate constant times held concentrations */
    expression rate_constant;   /* of a step by network_add_mass_action; else EXPRESSION_NONE */
    expression rate;            /* the whole rate: always there */
    bool is_power_law;          /* v = factor * prod x^order: mass action and recognised power laws, and flows */
    bool is_mass_action;        /* the orders are the reactant coefficients of the dynamic species */
} network_step;

typedef struct network_reaction {
    char *label;
    network_term *reactants, *products;  /* as written, equal species of one side merged */
    int reactant_count, product_count;
    int first_step, step_count;
    int line;
    bool is_reversible;
} network_reaction;

struct lb_network {
    char *file, *title;
    struct arena *texts;            /* labels of reactions, names of constants */
    unit_system units;
    expression_graph graph;
    network_species *species;       int species_count;
    int *state_species;             int states;        /* [states] species of each state */
    network_constant *constants;    int constant_count;
    network_definition *derived;    int derived_count;
    network_definition *readings;   int reading_count;
    network_reaction *reactions;    int reaction_count;
    network_step *steps;            int step_count;     /* flows included */
    int reaction_steps;                                 /* r: without the flows */
    bool is_tank;
    expression residence;           /* EXPRESSION_NONE without a tank */
    bool is_open;                   /* tank, held species, sources or sinks */
    char *source;                   /* text of the file, for witnesses; may be NULL */
    int *definition_of;             /* [graph.count] of a node: its derived constant, or derived_count + its
                                     * reading, or -1; NULL when there are no definitions */
};

/* Name of a leaf as the file writes it, for expression_write (context: the network). */
const char *network_leaf_name(const void *network, expression_kind leaf, int index);

/* Append the text of an expression of the network (expression_write), with the names
 * of derived constants and readings in place of what they stand for; `expand`: the
 * expression itself is written out even when it has a name. */
void network_write(const lb_network *net, expression e, bool expand, buffer *out);

/* Append "2 X + Y -> 3 X", "-> X", "X ->"; and "k2*[X]^2*[Y]", "R3.kf*[B]*[X] - R3.kr*[Y]*[D]". */
void network_write_equation(const lb_network *net, const network_reaction *reaction, buffer *out);
void network_write_rate(const lb_network *net, const network_reaction *reaction, buffer *out);

/* A species' name in a reaction: quoted when it is no plain name. */
void network_write_name(const char *name, buffer *out);

/* The states on which the rate of a step depends, ascending: *states (the caller's, to
 * memory_free), *count.  LB_OK or LB_E_NOMEM. */
lb_status network_rate_states(const lb_network *net, int step, int **states, int *count);

/* Pattern of the Jacobian in compressed columns: entry (i, j) is there when a step that
 * changes state i has a rate that depends on state j.  column_start [n+1], rows ascending
 * in each column; the caller's, to memory_free.  LB_OK, LB_E_NOMEM or LB_E_LIMIT (more
 * than INT_MAX entries); on failure both are NULL. */
lb_status network_pattern(const lb_network *net, int **column_start, int **row);

/* ---- Builder, used by lower.c and by tests ------------------------------- */

/* An empty network; NULL without memory.  Arrays grow by doubling, whenever the count
 * is a power of two, so counts must be changed only by the functions below; without
 * memory the network is still freeable (lb_network_free, which is network.c's).
 *
 * The order is: constants and species (with `held` of the held ones set, and `feed` and
 * is_retained before the tank), then each reaction with its terms and at once its steps,
 * then the tank, then network_finish.  file, title, source and whatever else has no
 * function here is set directly, as memory_text copies; file and title are "" at first. */
lb_network *network_new(void);

/* Each returns the index, or -1 without memory.  Strings are copied. */
int network_add_species(lb_network *net, const char *name, network_role role);
int network_add_constant(lb_network *net, const char *name, network_constant_kind kind, double value);
int network_add_definition(lb_network *net, bool is_reading, const char *name, expression value);
int network_add_reaction(lb_network *net, const char *label, bool is_reversible);
/* Term on a side of a reaction; merged with one of the same species.  A coefficient that
 * is a NUMBER is stored as num/den when a fraction with small terms is that very double. */
int network_add_term(lb_network *net, int reaction, bool is_product, int species,
                     int64_t num, int64_t den, expression coefficient);
/* The steps.  Each returns the index, or -1 without memory.
 * A step with the whole rate given as an expression.  Recognises products of
 * powers (literal orders) as power laws; fills entries from the reaction's terms
 * (signs turned for the reverse). */
int network_add_step(lb_network *net, int reaction, network_direction direction, expression rate);
/* Mass action: rate = k * prod [S]^coefficient over the side that is used up, held species
 * first.  A power law unless a coefficient there is an expression. */
int network_add_mass_action(lb_network *net, int reaction, network_direction direction, expression k);
/* After all reactions: residence makes it a tank and adds the flow steps.  0, or -1. */
int network_set_tank(lb_network *net, expression residence);
/* The unit of a constant or definition becomes this text, which is taken. */
void network_set_unit(char **place, char *text);
/* After all of it: fill default values, is_open.  LB_OK or LB_E_NOMEM. */
lb_status network_finish(lb_network *net);

#endif
