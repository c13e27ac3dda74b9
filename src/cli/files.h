/* Writing files so that a reader never sees half of one. */
#ifndef LIMBECK_CLI_FILES_H
#define LIMBECK_CLI_FILES_H

#include <stdbool.h>
#include <stddef.h>

#include "limbeck.h"

/* A file being written beside the one that it will replace. */
typedef struct pending_file {
    char *path;         /* what it will be called */
    char *beside;       /* where the bytes are until files_commit; NULL: written in place */
} pending_file;

/* Write the bytes beside path.  A path that is there and no regular file (a
 * device, a pipe) is written in place.  LB_E_IO, LB_E_NOMEM; nothing is left
 * behind then. */
lb_status files_prepare(const char *path, const char *bytes, size_t length, pending_file *file, lb_error *err);
/* Rename into place; LB_E_IO.  Either way the pending file is cleared. */
lb_status files_commit(pending_file *file, lb_error *err);
/* Remove what files_prepare wrote; takes a zeroed or cleared one. */
void files_abandon(pending_file *file);

/* Both steps for one file. */
lb_status files_write(const char *path, const char *bytes, size_t length, lb_error *err);

/* All bytes to standard output, or to standard error; LB_E_IO. */
lb_status files_print(int descriptor, const char *bytes, size_t length, lb_error *err);

/* Make a folder and those above it that are missing; LB_E_IO. */
lb_status files_make_folder(const char *path, lb_error *err);

/* "folder/name" + suffix; NULL without memory; free() it. */
char *files_join(const char *folder, const char *name, const char *suffix);

/* Have descriptors 0, 1 and 2 refer to something, so that no file that is opened
 * later takes the place of a closed standard stream. */
void files_guard_streams(void);

#endif
