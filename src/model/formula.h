/* Chemical formulas: atoms and charge. */
#ifndef LIMBECK_MODEL_FORMULA_H
#define LIMBECK_MODEL_FORMULA_H

#include <stdint.h>

#include "limbeck.h"

typedef struct formula_atom {
    int element;            /* 0..FORMULA_ELEMENTS-1, see formula_symbol */
    int64_t count;          /* 1..FORMULA_LIMIT */
} formula_atom;

/* Each element once, in the order of the table. */
typedef struct formula {
    formula_atom *atoms;    /* [atom_count] */
    int atom_count;
    int charge;             /* in elementary charges */
} formula;

enum { FORMULA_ELEMENTS = 120, FORMULA_LIMIT = 1000000000 };

/* What is wrong and where: offset and length in characters of the text. */
typedef struct formula_fault {
    int offset, length;
    char message[160];
    char remedy[120];       /* "" when not known */
} formula_fault;

/* Read `CuSO4.5H2O`, `Fe(CN)6^3-`, `e^-` (the electron: no atom, charge -1).
 * Returns LB_OK, LB_E_ARG (fault is filled) or LB_E_NOMEM; *out is empty after a
 * failure.  Clear it with formula_clear. */
lb_status formula_parse(const char *text, formula *out, formula_fault *fault);
void formula_clear(formula *f);
const char *formula_symbol(int element);

#endif
