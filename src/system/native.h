/* Engine 2: the emitted C of a network, compiled by the system's compiler and loaded. */
#ifndef LIMBECK_SYSTEM_NATIVE_H
#define LIMBECK_SYSTEM_NATIVE_H

#include "limbeck.h"

typedef void native_function(double t, const double x[], const double k[], double out[]);

typedef struct native {
    void *library;
    native_function *rates, *rhs, *jacobian_sparse, *dfdk;
} native;

/* Load the network's code from the cache, where it is compiled into when it is missing or not
 * whole.  column_start [n+1], row [z]: the pattern that the code must have.
 *
 * Returns LB_E_IO with the reason (no compiler, no cache folder that is safe, a compiler that
 * fails), LB_E_STOPPED, LB_E_NOMEM; then nothing is held. */
lb_status native_load(const lb_network *network, const int *column_start, const int *row,
                      const lb_native_options *options, native **out, lb_error *err);
void native_free(native *engine);

#endif
