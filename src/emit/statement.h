/* Lines of an emitted function, appended to the listing of its file. */
#ifndef LIMBECK_EMIT_STATEMENT_H
#define LIMBECK_EMIT_STATEMENT_H

#include "emit/function.h"

/* One public function being written. */
typedef struct function {
    function_file *file;
    sums *sums;
    plan *plan;
    const char *verb;        /* "rates": in the names */
    const char *out;         /* "v": the array that it fills */
    const char *zero_size;   /* zero-filled first, this many; NULL: every element is set */
} function;

/* A term of a block with its target; sorted by target, in network order within. */
typedef struct statement_place {
    size_t target, term;
} statement_place;

/* `const double s1 = ...;`, or `c[0] = ...;` of a shared one. */
void statement_local(const function *f, expression e);
/* `const double v3 = ...;` */
void statement_item(const function *f, const sums_item *item);
/* Is there such a line of an item?  Leaves, and what is a local already, are written
 * where they are used. */
bool statement_is_named(const function *f, const sums_item *item);
/* `dxdt[0] = v0 - 2.0*v1;`: count terms of one target; not the first one of the
 * target adds to it. */
void statement_sum(const function *f, const statement_place *places, size_t count, bool is_first);
/* A name of the file as part of a comment. */
void statement_comment_name(buffer *out, const char *name);

#endif
