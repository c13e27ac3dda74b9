/* The functions of an emitted file as text: signatures, bodies, calls. */
#ifndef LIMBECK_EMIT_PARTS_H
#define LIMBECK_EMIT_PARTS_H

#include "emit/statement.h"

/* "dxdt", the array that a function fills; "rhs", its part of the names. */
const char *parts_out_name(sums_kind kind);
const char *parts_verb(sums_kind kind);

/* Begin a body in an empty buffer; the writer forgets which arguments were used. */
void parts_begin(const function *f, buffer *body);
/* Append static void VERB_number(x, k, c, out). */
void parts_static(const function *f, int number, const buffer *body);
/* Append VERB_shared_1, ..., which compute what the plan shares; how many they are. */
int parts_shared(const function *f);
/* Into a body: the array c and the calls that fill it, the output set to zero. */
void parts_prologue(const function *f, int shared, buffer *body);
/* Into a body: calls of VERB_1 to VERB_count, in groups where they are many. */
void parts_calls(const function *f, int count, buffer *body);
/* Append the public function. */
void parts_public(const function *f, const buffer *body);

#endif
