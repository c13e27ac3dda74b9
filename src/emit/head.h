/* Names of models, and how every emitted file begins. */
#ifndef LIMBECK_EMIT_HEAD_H
#define LIMBECK_EMIT_HEAD_H

#include "base/buffer.h"

enum { HEAD_LONGEST_NAME = 100, HEAD_TEXT_LIMIT = 200 };

/* LB_E_ARG when the name can be no prefix of C names. */
lb_status head_check_name(const lb_emit_options *options, lb_error *err);

/* Begin the comment: the file's name, the mechanism's title, whose the file is. */
void head_begin(const lb_network *net, const char *file, buffer *out);

#endif
