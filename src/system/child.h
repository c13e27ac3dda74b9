/* Running another program: no shell, what it prints is kept. */
#ifndef LIMBECK_SYSTEM_CHILD_H
#define LIMBECK_SYSTEM_CHILD_H

#include "base/buffer.h"
#include "limbeck.h"

/* The absolute path of a program: one with a slash in it as it is, another one from the
 * absolute folders of PATH.  The caller's, to memory_free; NULL when there is none or no memory. */
char *child_find(const char *program);

/* Run argv[0] (a path) with the environment of this process and no input; what it prints on
 * both streams is appended to `output`, the first CHILD_OUTPUT bytes.  LB_OK when it ends with
 * status 0; LB_E_IO when it does not or cannot be started; LB_E_STOPPED when the monitor asked
 * (the program is then ended). */
enum { CHILD_OUTPUT = 1 << 16 };
lb_status child_run(char *const argv[], const lb_monitor *monitor, buffer *output);

#endif
