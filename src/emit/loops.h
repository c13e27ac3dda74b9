/* Functions of large networks: loops over tables in place of a line for each reaction. */
#ifndef LIMBECK_EMIT_LOOPS_H
#define LIMBECK_EMIT_LOOPS_H

#include "emit/products.h"
#include "emit/statement.h"

/* Append the tables of f->sums as p has them, and the public function that runs over them.
 * f->plan is that of p->shared, with its locals shared.  f->zero_size must be set.
 * LB_OK or LB_E_NOMEM. */
lb_status loops_append(const function *f, const products *p);

#endif
