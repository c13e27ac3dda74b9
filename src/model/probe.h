/* One rate at sample points with chosen concentrations at zero; for warnings. */
#ifndef LIMBECK_MODEL_PROBE_H
#define LIMBECK_MODEL_PROBE_H

#include "model/network.h"

typedef struct probe {
    const lb_network *net;
    double *k;              /* [constants] the file's */
    double *x;              /* [states] */
    double *values;         /* [graph.count] */
    int *nodes;             /* of the rate at hand, ascending */
    size_t node_count;
    int *states;            /* that it contains, */
    size_t state_count, state_capacity;
    size_t work;            /* nodes visited so far */
} probe;

enum { PROBE_POINTS = 3 };
#define PROBE_LIMIT ((size_t)20000000)  /* nodes: beyond that warnings are not worth the time */

lb_status probe_init(probe *p, const lb_network *net);
void probe_clear(probe *p);
/* Take a rate.  LB_OK or LB_E_NOMEM. */
lb_status probe_take(probe *p, expression rate);
/* Its value at a sample point (0..PROBE_POINTS-1), where the states with is_zero (NULL:
 * none) and the state `zero` (-1: none) are at zero and all others positive. */
double probe_value(probe *p, int point, const unsigned char *is_zero, int zero);

#endif
