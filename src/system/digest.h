/* SHA-256: what a cache entry is named by, and what shows that it is whole. */
#ifndef LIMBECK_SYSTEM_DIGEST_H
#define LIMBECK_SYSTEM_DIGEST_H

#include <stddef.h>
#include <stdint.h>

enum { DIGEST_TEXT = 64 };              /* hexadecimal digits */

typedef struct digest {
    uint32_t state[8];
    uint64_t length;                    /* bytes so far */
    unsigned char block[64];
} digest;

void digest_init(digest *d);
void digest_add(digest *d, const void *bytes, size_t length);
/* The hexadecimal digits, terminated.  The digest is used up. */
void digest_finish(digest *d, char text[DIGEST_TEXT + 1]);

#endif
