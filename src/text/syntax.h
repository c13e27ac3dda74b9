/* The syntax tree of a mechanism file.
 *
 * The parser looks nothing up and decides no meaning: whether a name is a unit,
 * a constant or a function is found in model/lower.c.  Nodes live in an arena
 * and die after lowering; strings are UTF-8, terminated, without quotes. */
#ifndef LIMBECK_TEXT_SYNTAX_H
#define LIMBECK_TEXT_SYNTAX_H

#include <stdbool.h>

#include "text/source.h"

typedef enum syntax_expression_kind {
    SYNTAX_NUMBER,          /* number, text */
    SYNTAX_NAME,            /* text: constant, reading, unit, T, R */
    SYNTAX_CONCENTRATION,   /* text: the species of [X] */
    SYNTAX_FEED,            /* text: the species of [X]in */
    SYNTAX_CALL,            /* text: the function; first: arguments */
    SYNTAX_JUXTAPOSED,      /* left, right: `1.0 M^-1` is (1.0 M^-1); right is a NAME or a POWER of one */
    SYNTAX_ADD, SYNTAX_SUBTRACT, SYNTAX_MULTIPLY, SYNTAX_DIVIDE, SYNTAX_POWER, /* left, right */
    SYNTAX_NEGATE,          /* left */
    SYNTAX_GROUP            /* left: in parentheses, kept since print decides what is ambiguous */
} syntax_expression_kind;

typedef struct syntax_expression syntax_expression;
typedef struct syntax_range syntax_range;

/* Argument of a function (`A = 1e13 s^-1`, or without a name: name is NULL), or
 * setting of a reaction (`kf = ...`). */
typedef struct syntax_argument {
    const char *name;
    span name_where;
    syntax_expression *value;
    syntax_range *range;            /* NULL when none */
    struct syntax_argument *next;
} syntax_argument;

struct syntax_expression {
    syntax_expression_kind kind;
    int depth;                      /* 1 + depth of the deepest child */
    span where;                     /* first line of the expression when it spans several */
    span operator_where;            /* of a binary operator */
    const char *text;
    double number;
    syntax_expression *left, *right;
    syntax_argument *first;
};

struct syntax_range {
    span where;
    bool is_factor;                 /* `within factor F`: low holds F, high is NULL */
    syntax_expression *low, *high;
};

/* A name in a list (`retained A, B`), or a species of a term. */
typedef struct syntax_name {
    const char *text;
    span where;
    bool is_quoted;
    struct syntax_name *next;
} syntax_name;

/* What stands before a species: a plain number, or an expression in parentheses. */
typedef struct syntax_coefficient {
    const char *text;               /* of the number; NULL: an expression */
    syntax_expression *expression;
    span where;
} syntax_coefficient;

typedef struct syntax_term {
    syntax_coefficient *coefficient; /* NULL when none is written */
    syntax_name species;
    struct syntax_term *next;
} syntax_term;

typedef enum syntax_statement_kind {
    SYNTAX_TITLE,                   /* text */
    SYNTAX_UNITS,                   /* value: a JUXTAPOSED chain such as `molecule/cm^3 s`; NULL: `units none` */
    SYNTAX_DEFINE_NAME,             /* text = value, range: constants, readings, temperature, residence */
    SYNTAX_DEFINE_CONCENTRATION,    /* [text] = value: held */
    SYNTAX_DEFINE_INITIAL,          /* [text]0 = value */
    SYNTAX_DEFINE_FEED,             /* [text]in = value */
    SYNTAX_RETAINED,                /* names */
    SYNTAX_SIGNED,                  /* names */
    SYNTAX_FORMULA,                 /* formula text = formula: the raw text behind `=`, trimmed */
    SYNTAX_REACTION
} syntax_statement_kind;

typedef struct syntax_statement {
    syntax_statement_kind kind;
    span where;                         /* of the whole statement's first line */
    union {
        struct {                        /* all but reactions */
            const char *text;
            syntax_expression *value;
            syntax_range *range;
            syntax_name *names;
            const char *formula;
            span text_where;            /* of the title, name or species */
            span formula_where;
        };
        struct {                        /* reactions */
            const char *label;          /* NULL when none is written */
            syntax_term *left, *right;  /* NULL: an empty side */
            syntax_argument *settings;  /* k, kf, kr, K, v, as written */
            span label_where, arrow_where;
        };
    };
    bool is_quoted;                     /* the name was quoted */
    bool is_reversible;                 /* of a reaction */
    bool is_broken;                     /* in the list of broken ones: what could be read before a fault */
    struct syntax_statement *next;
} syntax_statement;

/* The value of `units` is what the expression grammar makes of it: `M s` is
 * JUXTAPOSED(M, s), `molecule/cm^3 s` is DIVIDE(molecule, JUXTAPOSED(cm^3, s)).
 * Lowering takes the last factor as the unit of time, the rest as the unit of
 * concentration. */

/* The nodes of some hundred statements.  One that has reactions alone, without ranges and
 * rate laws, is plain: nothing in it is needed once its reactions are in the network, so that
 * it can go while the rest of a large mechanism is still to come. */
typedef struct syntax_page {
    struct arena *arena;            /* NULL: released */
    const syntax_statement *last;   /* in it */
    int statements;
    bool is_plain;
    struct syntax_page *next;       /* NULL: the last page, which is not released */
} syntax_page;

typedef struct syntax_tree {
    struct arena *arena;            /* texts */
    syntax_page *pages, *page;      /* the first, and the one that nodes come from */
    syntax_statement *first, *last;
    int statement_count;
    /* Definitions and reactions that a fault of syntax cut short, so that what
     * they define or mention is not reported as unknown elsewhere: kind, text or
     * label, sides and the settings that were read; value is NULL. */
    syntax_statement *first_broken, *last_broken;
} syntax_tree;

/* Text to tree.  Faults of syntax go to the list; the tree then holds the
 * statements that could be read.  LB_OK also when there are faults; LB_E_NOMEM. */
lb_status syntax_parse(lb_diagnostics *diagnostics, syntax_tree **out);

/* One expression alone (the value of a setting): its text is the whole source. */
lb_status syntax_parse_value(lb_diagnostics *diagnostics, syntax_tree **tree, syntax_expression **out);
void syntax_release(syntax_page *page);   /* its nodes are gone */
void syntax_free(syntax_tree *tree);

#endif
