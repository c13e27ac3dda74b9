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

/* The most entries (laws times species) that are looked for. */
#define CONSERVATION_LIMIT (1 << 23)

/* Laws of the rows `state` [width, ascending] of the network, looking only at steps with
 * use[step] (NULL: all).  Left kernel by sparse elimination over FLINT's integers;
 * minimal non-negative vectors (extreme rays of the cone {w >= 0, w N = 0}) by double
 * description (exact/cone.h), with a limit.  The first `basis` rows span the kernel:
 * non-negative ones first (of least support), completed by signed ones only where those
 * do not span it.  Further minimal non-negative laws follow.
 *
 * A coefficient that is an expression is split into a rational combination of parts
 * (f/2 + 1: the parts f and 1), and a law must hold for all values of the parts.
 *
 * LB_OK, LB_E_NOMEM, or LB_E_LIMIT when a law has an entry beyond 64 bits or there are
 * more entries than CONSERVATION_LIMIT; *out is then empty. */
lb_status conservation_find(const lb_network *net, const int *state, int width, const bool *use,
                            conservation *out, lb_error *err);
void conservation_clear(conservation *laws);
lb_status conservation_copy(const conservation *laws, conservation *out); /* LB_OK or LB_E_NOMEM */

/* Fill err for a status that came out of exact arithmetic. */
lb_status conservation_report(lb_error *err, lb_status status);

/* Choose dependent species by exact elimination of the first `basis` rows, and
 * give L: x_dep = const - L x_ind.  dependent [basis], independent [width-basis],
 * elimination [basis*(width-basis)] column-major; caller's arrays. */
lb_status conservation_eliminate(const conservation *laws, int *dependent, int *independent,
                                 double *elimination, lb_error *err);

/* Which of the given columns have a value that the laws fix once all other columns are
 * known: *column [count], with *weight [count*width], row after row: a combination of
 * laws with 1 at that column and 0 at the others of the list.  Both are the caller's, to
 * memory_free; NULL on failure. */
lb_status conservation_isolate(const conservation *laws, const int *columns, int column_count,
                               int *count, int **column, double **weight, lb_error *err);

#endif
