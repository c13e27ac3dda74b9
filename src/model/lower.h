/* Lowering: from the syntax tree to the network.  Private to lower*.c.
 *
 * The order of work (lower.c):
 *   units       the `units` statement                              lower_units.c
 *   names       species, definitions, reactions, labels            lower_names.c
 *   plain       every plain number becomes a constant              lower_plain.c
 *   settings    a user's NAME=VALUE replaces plain numbers         lower_setting.c
 *   order       definitions sorted, cycles found                   lower_order.c
 *   values      expressions with their dimensions                  lower_value.c, lower_combine.c, lower_call.c
 *   definitions, reactions                                         lower_define.c, lower_reaction.c
 *   ranges, dimensions and units of plain numbers                  lower_range.c, lower_plain.c
 *   balance, warnings                                              lower_balance.c, lower_warning.c, lower_law.c
 *
 * A thing with a fault is marked bad, and what uses it says nothing more: one
 * mistake, one message.  Lack of memory is remembered in lower.status. */
#ifndef LIMBECK_MODEL_LOWER_H
#define LIMBECK_MODEL_LOWER_H

#include "base/memory.h"
#include "model/formula.h"
#include "model/infer.h"
#include "model/names.h"
#include "model/network.h"
#include "text/syntax.h"

/* What a plain number must not be, from where it is used. */
typedef enum lower_sign { SIGN_ANY, SIGN_NOT_NEGATIVE, SIGN_POSITIVE } lower_sign;

/* What a setting put in place of a plain number. */
typedef struct lower_replacement {
    int setting;                    /* its index */
    bool has_unit;
    dimension unit;
} lower_replacement;

/* A plain number of the file: a number, signed or not, with a unit or without. */
typedef struct lower_plain {
    const char *name;               /* "k2", "[A]", "R3.kf" */
    span where;
    network_constant_kind kind;
    double written, stored;         /* in stored units: the file's, and a setting's when there is one */
    const form *dim;                /* shared by plain numbers of one known dimension */
    int unknown;                    /* of a bare number; -1: its dimension is known */
    int constant;                   /* in the network, -1 for initials */
    const char *sign_why;           /* "rate constant", "concentration", ... */
    lower_sign sign;
    bool is_initial;                /* [X]0: no constant of the network */
    bool has_unit, has_range, is_bad;
    const syntax_range *range;
    const unit *measure;            /* with a range: the unit as written, one when there is none */
    double low, high;
    const lower_replacement *set;   /* NULL: no setting */
} lower_plain;

/* What an expression came to. */
typedef enum lower_value_kind {
    VALUE_BAD,                      /* a fault was reported */
    VALUE_PLAIN,                    /* raw number times a unit, nothing else */
    VALUE_UNIT,                     /* a unit alone */
    VALUE_GENERAL                   /* e, number, dim, has_state */
} lower_value_kind;

typedef struct lower_value {
    lower_value_kind kind;
    double raw;                     /* PLAIN */
    unit measure;                   /* PLAIN, UNIT */
    bool has_unit;                  /* PLAIN: a unit is written */
    expression e;
    double number;                  /* at the file's constants; NAN with a state in it */
    form dim;
    bool has_state;
    int plain;                      /* GENERAL: the value is just this plain number; else -1 */
    span where;
} lower_value;

typedef enum lower_definition_kind {
    DEFINE_CONSTANT, DEFINE_HELD, DEFINE_INITIAL, DEFINE_FEED, DEFINE_RESIDENCE, DEFINE_TEMPERATURE
} lower_definition_kind;

typedef struct lower_definition {
    lower_definition_kind kind;
    const char *name;               /* "k2", "[A]", "[X]0", "[X]in", "residence", "temperature" */
    const syntax_statement *statement; /* NULL: made by a setting */
    int species;                    /* index, or -1 */
    int plain;                      /* index, or -1 when derived */
    lower_value value;              /* once evaluated; kind GENERAL or BAD */
    bool is_done, is_used;
    bool is_rejected;               /* its name belongs to the language: there so that uses stay quiet */
} lower_definition;

typedef struct lower_species {
    const char *name;
    span where;                     /* first mention */
    int held, initial, feed;        /* definitions, or -1 */
    bool in_reaction, is_signed, is_retained;
    bool is_read;                   /* an expression contains its concentration */
    bool is_used;                   /* a reaction uses it up, or a mass-action rate contains it */
    const syntax_statement *formula;
    formula atoms;
    bool has_atoms;
    int index;                      /* in the network, or -1 */
} lower_species;

typedef struct lower_reaction {
    const syntax_statement *statement;  /* NULL: in the network, and released */
    const char *label;
    int index;                      /* in the network, or -1 */
    bool is_bad;
    bool has_law;
} lower_reaction;

/* Expression node -> plain number, for numbers inside reactions and arguments. */
typedef struct lower_inline {
    const syntax_expression *node;  /* NULL: empty slot */
    int plain;
} lower_inline;

typedef struct lower {
    syntax_tree *tree;              /* pages of it go while reactions are added */
    lb_diagnostics *list;
    lb_network *net;
    arena *memory;                  /* names made here; lives until the network is done */
    inference inf;
    form none;                      /* the dimension of a pure number */
    lb_status status;               /* LB_OK, LB_E_NOMEM */
    bool dimensions_given_up;
    size_t searches;                /* for near names so far */

    names species_names, definition_names, label_names, plain_names;
    lower_species *species;         size_t species_count, species_capacity;
    lower_definition *definitions;  size_t definition_count, definition_capacity;
    lower_reaction *reactions;      size_t reaction_count, reaction_capacity;
    lower_plain *plains;            size_t plain_count, plain_capacity;
    lower_inline *inlines;          size_t inline_slots, inline_count;
    int *order;                     /* [definition_count] operands before users; those in a cycle left out */
    size_t order_count;
    int residence, temperature;     /* definitions, or -1 */

    const lb_setting *settings;
    size_t setting_count;
} lower;

/* ---- lower.c ----------------------------------------------------------------- */

/* Tree to network; parts of the tree are released on the way.  Faults and warnings go to the list; *net is NULL when there
 * are faults.  LB_E_NAME or LB_E_ARG with err filled when a setting is wrong, and
 * the file has no fault in its syntax and names.  LB_OK also with faults. */
lb_status lower_tree(syntax_tree *tree, lb_diagnostics *list, const lb_setting *settings,
                     size_t setting_count, lb_network **net, lb_error *err);

bool  lower_no_memory(lower *l);                     /* remembers it; returns false */
char *lower_text(lower *l, const char *format, ...)  /* in the arena; "" without memory */
    __attribute__((format(printf, 2, 3)));
bool  lower_has_room(const lower *l);                /* will another fault still be kept? */
/* The nearest name as a remedy "did you mean `k2`?", or otherwise. */
const char *lower_near(lower *l, const names *table, const char *word, const char *otherwise);

/* ---- lower_units.c ----------------------------------------------------------- */

void lower_units(lower *l);
bool lower_is_unit_name(const lower *l, const char *name);
/* NAME or NAME^number with the name of a unit; false, silently, for anything else. */
bool lower_unit_factor(const lower *l, const syntax_expression *node, unit *out);
const char *lower_dimension_text(lower *l, const dimension *d);  /* "M/s"; "a pure number" for none */
/* What to write for a name that is no unit: `cm^3` for `cm3`, `uM` for `µM`, `s` for `sec`, the nearest one. */
const char *lower_unit_remedy(lower *l, const char *name);

/* ---- lower_names.c ----------------------------------------------------------- */

void lower_names(lower *l);
void lower_add_species(lower *l);                    /* to the network, order of first appearance in reactions */
int  lower_find_species(const lower *l, const char *name);
const char *lower_bracket(lower *l, const char *species, const char *suffix);   /* "[X]0" */
int  lower_add_definition(lower *l, lower_definition_kind kind, const char *name, int species,
                          const syntax_statement *statement);   /* -1 without memory */
bool lower_is_function(const char *name);

/* ---- lower_plain.c ------------------------------------------------------------ */

void lower_plains(lower *l);
/* Is the expression a plain number? */
bool lower_read_plain(const lower *l, const syntax_expression *node, double *number, unit *measure,
                      bool *has_unit);
const form *lower_known_form(lower *l, const dimension *d);  /* in the arena */
int  lower_add_plain(lower *l, const char *name, network_constant_kind kind, span where);
int  lower_find_inline(const lower *l, const syntax_expression *node);  /* plain, or -1 */
void lower_add_constants(lower *l);                  /* to the network, file order */
void lower_finish_plains(lower *l);                  /* dimensions and units known: check and store */

/* ---- lower_setting.c ----------------------------------------------------------- */

lb_status lower_settings(lower *l, lb_error *err);
/* A plain number alone, as a user gives it: LB_E_ARG when it is none; the faults are in
 * *list, which is the caller's. */
lb_status lower_read_number(const lower *l, const char *text, double *number, unit *measure, bool *has_unit,
                            lb_diagnostics **list);
/* After inference: does each setting's unit fit, and its sign? */
lb_status lower_check_settings(lower *l, lb_error *err);

/* ---- lower_order.c -------------------------------------------------------------- */

void lower_order(lower *l);

/* ---- lower_value.c, lower_combine.c, lower_call.c --------------------------------- */

/* Where an expression stands: may it contain dynamic concentrations, what is it
 * called in messages, and what order has the step (for eyring). */
typedef struct lower_context {
    bool allows_state;
    const char *what;               /* "k", "[A]", "k5" */
    const char *state_remedy;       /* NULL, or what to write instead of a state */
    bool has_order;                 /* a rate constant of a step of this order */
    rational order;
} lower_context;

/* Evaluate an expression; the result is GENERAL or BAD. */
lower_value lower_evaluate(lower *l, const syntax_expression *node, const lower_context *context);

lower_value value_bad(span where);
lower_value value_general(span where, expression e, double number, form dim);
void        value_finish(lower *l, lower_value *v);              /* PLAIN and UNIT become GENERAL */
lower_value value_of_plain(lower *l, int plain, span where);
/* Combine what the operands of a node came to; operands are used up. */
lower_value value_binary(lower *l, const syntax_expression *node, lower_value left, lower_value right);
lower_value value_juxtaposed(lower *l, const syntax_expression *node, lower_value left);
lower_value value_negate(lower *l, lower_value operand);
lower_value value_call(lower *l, const syntax_expression *node, lower_value *arguments, int count,
                       const lower_context *context);
/* The temperature; BAD (and a fault) when the file gives none. */
lower_value value_temperature(lower *l, span where);
/* State that two dimensions agree.  False on a conflict, with both as texts. */
bool lower_agree(lower *l, const form *a, const form *b, int line, const char **a_text, const char **b_text);
/* State that a finished value has a dimension; a conflict is a fault "WHAT must be in ...".
 * remedy: NULL, or what to write instead. */
bool lower_need(lower *l, lower_value *v, const dimension *d, const char *what, const char *remedy);
dimension lower_dimension(int concentration_num, int concentration_den, int time, int energy, int amount,
                          int temperature);

/* ---- lower_define.c --------------------------------------------------------------- */

void lower_define(lower *l);
/* After inference: derived constants and readings to the network, file order. */
void lower_finish_definitions(lower *l);
/* A value that must not be negative (or must be positive) and is finite.  Of a plain
 * number this is remembered and checked once; otherwise a fault comes from here.
 * why: "rate constant"; what: "k". */
void lower_require_sign(lower *l, lower_value *v, lower_sign sign, const char *why, const char *what);

/* ---- lower_reaction.c --------------------------------------------------------------- */

void lower_reactions(lower *l);

/* ---- lower_range.c -------------------------------------------------------------------- */

void lower_ranges(lower *l);                          /* units and equations, before dimensions are finished */
void lower_check_ranges(lower *l);                    /* signs, after */

/* ---- lower_balance.c, lower_warning.c, lower_law.c, lower_start.c --------------------- */

void lower_formulas(lower *l);
void lower_balance(lower *l);
void lower_warnings(lower *l);
void lower_law_warnings(lower *l);
void lower_start_warnings(lower *l);

#endif
