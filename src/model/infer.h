/* Dimensions that are not known yet: linear equations over the rationals.
 *
 * A form is a known dimension times powers of unknown ones.  Every use of a
 * number without a unit gives an equation between two forms. */
#ifndef LIMBECK_MODEL_INFER_H
#define LIMBECK_MODEL_INFER_H

#include <stdbool.h>
#include <stddef.h>

#include "base/memory.h"
#include "model/rational.h"
#include "model/units.h"

typedef struct form_term {
    int unknown;
    rational power;
    struct form_term *next;
} form_term;

typedef struct form {
    dimension known;
    form_term *first, *last;
} form;

typedef struct infer_unknown {
    bool is_solved;             /* dimension = known * product of the terms */
    dimension known;
    struct infer_part { int unknown; rational power; } *part; /* unsolved ones alone */
    size_t parts, capacity;
    struct infer_use *uses;     /* solved unknowns that may contain this one */
    int use_count;
    int line;                   /* of the equation that settled it; 0: none yet */
} infer_unknown;

typedef struct inference {
    arena *memory;
    infer_unknown *unknowns;    size_t count, capacity;
    rational *sum;              size_t sum_capacity;    /* [count] workspace of one equation, zero between */
    int *touched;               size_t touched_count, touched_capacity;
    size_t work;                /* terms looked at so far */
    bool has_no_memory;
} inference;

typedef enum infer_outcome { INFER_FITS, INFER_CONFLICT, INFER_TOO_MUCH, INFER_NOMEM } infer_outcome;

int  infer_init(inference *inf);                    /* 0, or -1 without memory */
void infer_clear(inference *inf);
int  infer_new(inference *inf);                     /* an unknown; -1 without memory */

/* Forms live in the inference's arena.  The operations work in place, and the
 * right operand of infer_multiply is used up.  False: an exponent is out of
 * bounds, or memory is exhausted (infer's flag tells). */
form form_none(void);
form form_known(const dimension *d);
bool form_unknown(inference *inf, int unknown, form *out);
bool form_copy(inference *inf, const form *f, form *out);
bool form_multiply(form *left, form *right, int sign);          /* sign -1: divide */
bool form_power(form *f, rational power);

/* State that two forms are the same dimension; line: where. */
infer_outcome infer_equal(inference *inf, const form *a, const form *b, int line);
/* The dimension of a form as known by now; false when unknowns remain. */
bool infer_resolve(inference *inf, const form *f, dimension *out);

#endif
