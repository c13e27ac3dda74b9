/* Raising and forwarding errors. */
#ifndef LIMBECK_BASE_STATUS_H
#define LIMBECK_BASE_STATUS_H

#include "limbeck.h"

/* Fill err (which may be NULL) and return code, so that a failure is one line:
 *     return status_raise(err, LB_E_ARG, "write a positive number", "%g is no tolerance", tol);
 * remedy may be NULL. */
lb_status status_raise(lb_error *err, lb_status code, const char *remedy, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

lb_status status_no_memory(lb_error *err);

#endif
