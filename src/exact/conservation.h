/* Conservation laws in exact integers. */
#ifndef LIMBECK_EXACT_CONSERVATION_H
#define LIMBECK_EXACT_CONSERVATION_H

#include <stdint.h>

#include "limbeck.h"
#include "model/network.h"

/* Rows w with w N = 0 for all values of the coefficient expressions. */
typedef struct conservation {
    int count;              /* rows below */
    int width;              /* species per row */
    int64_t *law;           /* [count*width], row after row, content 1 */
    int basis;              /* the first `basis` rows are linearly independent: dimension of the left kernel */
    int semipositive;       /* the first `semipositive` rows are non-negative */
    bool is_complete;       /* every minimal non-negative law is there (they may explode: then a basis) */
} conservation;

/* Laws of the rows `state` [width] of the network, looking only at steps with
 * use[step] (NULL: all).  Left kernel by FLINT; minimal non-negative vectors
 * (extreme rays of the cone {w >= 0, w N = 0}) by Farkas' elimination in exact
 * integers with a limit.  The first `basis` rows span the kernel: non-negative
 * ones first, completed by signed ones only where those do not span it. Further
 * minimal non-negative laws follow.  LB_E_LIMIT when an entry leaves 64 bits. */
lb_status conservation_find(const lb_network *net, const int *state, int width, const bool *use,
                            conservation *out, lb_error *err);
void conservation_clear(conservation *laws);

/* Choose dependent species by exact elimination of the first `basis` rows, and
 * give L: x_dep = const - L x_ind.  dependent [basis], independent [width-basis],
 * elimination [basis*(width-basis)] column-major; caller's arrays. */
lb_status conservation_eliminate(const conservation *laws, int *dependent, int *independent,
                                 double *elimination, lb_error *err);

#endif
