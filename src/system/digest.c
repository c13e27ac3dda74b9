/* SHA-256, as in FIPS 180-4, Secure Hash Standard (NIST, 2015), section 6.2. */
#include "system/digest.h"

#include <stdio.h>
#include <string.h>

static const uint32_t K[64] = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1, 0x923f82a4, 0xab1c5ed5,
    0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3, 0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174,
    0xe49b69c1, 0xefbe4786, 0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147, 0x06ca6351, 0x14292967,
    0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13, 0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85,
    0xa2bfe8a1, 0xa81a664b, 0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a, 0x5b9cca4f, 0x682e6ff3,
    0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208, 0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2,
};

static uint32_t rotate(uint32_t x, int bits)
{
    return x >> bits | x << (32 - bits);
}

/* The message schedule, section 6.2.2 step 1. */
static void expand(const unsigned char *block, uint32_t w[64])
{
    for (int t = 0; t < 16; t++)
        w[t] = (uint32_t)block[4 * t] << 24 | (uint32_t)block[4 * t + 1] << 16 | (uint32_t)block[4 * t + 2] << 8 |
               block[4 * t + 3];
    for (int t = 16; t < 64; t++) {
        uint32_t small0 = rotate(w[t - 15], 7) ^ rotate(w[t - 15], 18) ^ w[t - 15] >> 3;
        uint32_t small1 = rotate(w[t - 2], 17) ^ rotate(w[t - 2], 19) ^ w[t - 2] >> 10;
        w[t] = small1 + w[t - 7] + small0 + w[t - 16];
    }
}

static void compress(uint32_t state[8], const unsigned char *block)
{
    uint32_t w[64], s[8];
    expand(block, w);
    memcpy(s, state, sizeof s);
    for (int t = 0; t < 64; t++) {
        uint32_t sum1 = rotate(s[4], 6) ^ rotate(s[4], 11) ^ rotate(s[4], 25);
        uint32_t choice = (s[4] & s[5]) ^ (~s[4] & s[6]);
        uint32_t t1 = s[7] + sum1 + choice + K[t] + w[t];
        uint32_t sum0 = rotate(s[0], 2) ^ rotate(s[0], 13) ^ rotate(s[0], 22);
        uint32_t majority = (s[0] & s[1]) ^ (s[0] & s[2]) ^ (s[1] & s[2]);
        memmove(s + 1, s, 7 * sizeof *s);
        s[4] += t1;
        s[0] = t1 + sum0 + majority;
    }
    for (int i = 0; i < 8; i++)
        state[i] += s[i];
}

void digest_init(digest *d)
{
    static const uint32_t start[8] = {0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a,
                                      0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19};
    memcpy(d->state, start, sizeof start);
    d->length = 0;
}

void digest_add(digest *d, const void *bytes, size_t length)
{
    const unsigned char *next = bytes;
    while (length > 0) {
        size_t used = (size_t)(d->length % 64), part = 64 - used < length ? 64 - used : length;
        memcpy(d->block + used, next, part);
        d->length += part;
        next += part;
        length -= part;
        if (d->length % 64 == 0)
            compress(d->state, d->block);
    }
}

void digest_finish(digest *d, char text[DIGEST_TEXT + 1])
{
    static const unsigned char padding[64] = {0x80};
    uint64_t bits = d->length * 8;
    unsigned char length[8];
    for (int i = 0; i < 8; i++)
        length[i] = (unsigned char)(bits >> (56 - 8 * i));
    size_t used = (size_t)(d->length % 64);
    digest_add(d, padding, used < 56 ? 56 - used : 120 - used);
    digest_add(d, length, sizeof length);
    for (int i = 0; i < 8; i++)
        snprintf(text + 8 * i, 9, "%08x", (unsigned)d->state[i]);
}
