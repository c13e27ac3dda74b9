/* Expressions as C, and what the C needs for them: the helper functions of the
 * partial powers, libm, the arguments that a function uses. */
#ifndef LIMBECK_EMIT_WRITE_H
#define LIMBECK_EMIT_WRITE_H

#include "emit/plan.h"

enum { WRITE_HIGHEST_POWER = 64 }; /* whole powers beyond go to pow() */

/* How tightly the place of an expression binds: what is looser gets parentheses. */
typedef enum write_place { WRITE_SUM, WRITE_TERM, WRITE_FACTOR, WRITE_OPERAND } write_place;

typedef struct writer {
    const expression_graph *graph;
    const char *const *definition_name;   /* [definitions] local names */
    const int *definition;                /* [nodes] the definition that a node is, or -1 */
    const plan *plan;                     /* of the function being written */
    buffer *out;                          /* statement being written */
    /* Used by the function being written. */
    bool uses_x, uses_k, uses_shared;
    /* Used by anything so far. */
    bool uses_math, uses_root, uses_root_slope, uses_power, uses_slope, uses_power_log;
    bool uses_whole_power[WRITE_HIGHEST_POWER + 1];
} writer;

/* The expression, or its name where it is a local. */
void write_expression(writer *w, expression e, write_place place);
/* The operation itself, for the definition of a local. */
void write_operation(writer *w, expression e, write_place place);
/* Name of a local: d_NAME of a definition, c1 of constants alone, s1 with states,
 * c[0] where it is shared by several functions. */
void write_local_name(writer *w, expression e);
/* The helper functions that were used. */
void write_helpers(const writer *w, buffer *out);

#endif
