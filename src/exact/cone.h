/* Extreme rays of the non-negative part of a subspace. */
#ifndef LIMBECK_EXACT_CONE_H
#define LIMBECK_EXACT_CONE_H

#include <stdbool.h>
#include <stdint.h>

#include "limbeck.h"

/* Integer vectors, row after row. */
typedef struct cone {
    int width;
    size_t count, capacity;
    int64_t *ray;           /* [count*width] */
} cone;

/* Extreme rays, as primitive vectors, of {w >= 0} in the span of `basis` [dimension*width].
 * Every vector of the basis must have a positive entry in a column of its own,
 * own[i], where all others are zero.
 * *is_complete is false when there are too many rays, too much work or an entry leaves 64
 * bits; `out` is then empty.  LB_OK or LB_E_NOMEM.  `out` is the caller's, to cone_clear. */
lb_status cone_find(const int64_t *basis, int dimension, int width, const int *own, cone *out, bool *is_complete);
void cone_clear(cone *c);

/* Divide a vector by the greatest common divisor of its entries. */
void cone_make_primitive(int64_t *vector, int width);

#endif
