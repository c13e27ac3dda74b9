/* The folder of compiled models: who may write there, whole entries, working folders. */
#ifndef LIMBECK_SYSTEM_CACHE_H
#define LIMBECK_SYSTEM_CACHE_H

#include "base/buffer.h"
#include "limbeck.h"

/* The folder's real path: the given one, or (NULL) $XDG_CACHE_HOME/limbeck or ~/.cache/limbeck;
 * made with mode 0700 where it is missing.  The caller's, to memory_free.
 *
 * LB_E_IO, with what to do about it, unless it is a folder (no link) of this user with mode 0700,
 * and nobody but this user and root can replace a folder above it.  LB_E_NOMEM. */
lb_status cache_open(const char *given, char **folder, lb_error *err);

/* Read a file of this user, no link, that nobody else may write; false when it is not that. */
bool cache_read(const char *path, buffer *bytes);

/* Append to a file's bytes what shows that they are whole, and check that. */
void cache_seal(buffer *bytes);
bool cache_is_whole(const buffer *bytes);

/* Write a new file; false, and no file, when it cannot be. */
bool cache_write(const char *path, const char *bytes, size_t length);

/* A working folder within the cache, the caller's to memory_free; NULL when there can be none. */
char *cache_begin_work(const char *folder);
/* Remove it with the files in it. */
void cache_end_work(char *work);

#endif
