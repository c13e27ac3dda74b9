/* The equations that a conservation law obeys, step after step. */
#ifndef LIMBECK_EXACT_BALANCE_H
#define LIMBECK_EXACT_BALANCE_H

#include <flint/fmpz.h>
#include <stdbool.h>

#include "limbeck.h"
#include "model/network.h"

/* Equations sum of value * w[column] = 0, integers without common divisor. */
typedef struct balance {
    size_t count, start_capacity;
    size_t *start;              /* [count+1] */
    int *column;                /* [start[count]] */
    fmpz *value;
    size_t column_capacity, value_capacity;
} balance;

/* One equation for each step (the reverse of a step in use adds nothing) and each
 * independent part of its coefficients.  column_of [states]: column of a state, or -1:
 * not looked at; use [steps] or NULL.  LB_OK or LB_E_NOMEM; `out` is the caller's, to
 * balance_clear, also after a failure. */
lb_status balance_collect(const lb_network *net, const int *column_of, const bool *use, balance *out);
void balance_clear(balance *b);

#endif
