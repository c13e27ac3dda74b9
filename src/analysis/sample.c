/* Low-discrepancy points and counter-based random numbers.
 *
 * Points: Halton's sequence (the digits of i in the j-th prime, mirrored at the
 * point) with nested scrambling: each digit d goes through a permutation
 * a/(b d + c) + e modulo the prime (1/0 = 0), drawn anew for every string of
 * digits before it.  That keeps the even spread and removes the stripes that
 * plain Halton points, linear permutations of them and additive recurrences show
 * in pairs of high dimensions.  Below the digits in use the value is uniform.
 *
 * Random numbers: Philox4x32-10 of (seed; i, j), in which nothing is carried
 * from one number to the next.
 *
 * Sources: J. H. Halton, Numer. Math. 2 (1960) 84; A. B. Owen, Randomly permuted
 * (t,m,s)-nets and (t,s)-sequences, in Monte Carlo and Quasi-Monte Carlo Methods
 * in Scientific Computing (1995) (nested scrambling); J. Eichenauer-Herrmann,
 * Int. Stat. Rev. 60 (1992) 167 (inversive permutations have no lattice);
 * J. K. Salmon, M. A. Moraes, R. O. Dror and D. E. Shaw, Parallel random numbers:
 * as easy as 1, 2, 3, SC11 (2011). */
#include "analysis/sample.h"

#include <math.h>

static void philox(uint64_t seed, uint64_t i, uint64_t j, uint64_t out[2])
{
    uint32_t key[2] = {(uint32_t)seed, (uint32_t)(seed >> 32)};
    uint32_t c[4] = {(uint32_t)i, (uint32_t)(i >> 32), (uint32_t)j, (uint32_t)(j >> 32)};
    for (int round = 0; round < 10; round++) {
        uint64_t even = (uint64_t)0xD2511F53u * c[0], odd = (uint64_t)0xCD9E8D57u * c[2];
        uint32_t next0 = (uint32_t)(odd >> 32) ^ c[1] ^ key[0], next2 = (uint32_t)(even >> 32) ^ c[3] ^ key[1];
        c[0] = next0;
        c[1] = (uint32_t)odd;
        c[2] = next2;
        c[3] = (uint32_t)even;
        key[0] += 0x9E3779B9u;
        key[1] += 0xBB67AE85u;
    }
    out[0] = c[0] | (uint64_t)c[1] << 32;
    out[1] = c[2] | (uint64_t)c[3] << 32;
}

/* The middle of one of 2^52 equal cells: never 0 and never 1. */
static double to_open_unit(uint64_t bits)
{
    return ((double)(bits >> 12) + 0.5) * 0x1p-52;
}

double sample_uniform(uint64_t seed, uint64_t i, uint64_t j)
{
    uint64_t bits[2];
    philox(seed, i, j, bits);
    return to_open_unit(bits[0]);
}

/* Box and Muller, Ann. Math. Stat. 29 (1958) 610. */
double sample_normal(uint64_t seed, uint64_t i, uint64_t j)
{
    const double two_pi = 6.283185307179586477;
    uint64_t bits[2];
    philox(seed, i, j, bits);
    return sqrt(-2 * log(to_open_unit(bits[0]))) * cos(two_pi * to_open_unit(bits[1]));
}

static uint64_t next_prime(uint64_t after)
{
    for (uint64_t candidate = after + 1; ; candidate++) {
        uint64_t divisor = 2;
        while (divisor * divisor <= candidate && candidate % divisor != 0)
            divisor++;
        if (divisor * divisor > candidate)
            return candidate;
    }
}

/* 1/a modulo a prime, 0 for 0: a^(prime-2), Fermat. */
static uint64_t inverse_modulo(uint64_t a, uint64_t prime)
{
    uint64_t result = 1;
    for (uint64_t power = prime - 2; power > 0; power /= 2) {
        if (power % 2)
            result = result * a % prime;
        a = a * a % prime;
    }
    return prime == 2 ? a : result;
}

static uint64_t permute(uint64_t digit, uint64_t prime, const uint64_t hash[2])
{
    uint64_t low = hash[0] & 0xFFFFFFFFu, high = hash[0] >> 32;
    uint64_t inner = (digit * (1 + low % (prime - 1)) + high) % prime;
    low = hash[1] & 0xFFFFFFFFu, high = hash[1] >> 32;
    return (inverse_modulo(inner, prime) * (1 + low % (prime - 1)) + high) % prime;
}

/* Digits are taken until i is used up, and at least until cells of 2^-20, so
 * that the leading zeros of small i are scrambled like all other digits.
 * `prefix` names the string of digits read so far: 1 for none, then
 * prefix*base + digit, which is different for different strings. */
static double scrambled_radical_inverse(uint64_t seed, uint64_t i, uint64_t base)
{
    uint64_t prefix = 1, hash[2];
    double value = 0, weight = 1;
    for (; i > 0 || weight > 0x1p-20; i /= base) {
        philox(seed, prefix, base, hash);
        uint64_t digit = i % base;
        weight /= (double)base;
        value += weight * (double)permute(digit, base, hash);
        prefix = prefix * base + digit;
    }
    philox(seed, prefix, base, hash);
    return value + weight * to_open_unit(hash[0]);
}

void sample_point(uint64_t seed, uint64_t i, int dimensions, double *point)
{
    uint64_t prime = 1;
    for (int j = 0; j < dimensions; j++) {
        prime = next_prime(prime);
        double value = scrambled_radical_inverse(seed, i, prime);
        point[j] = value < 1 ? value : 1 - 0x1p-53;   /* a sum that rounds up to one */
    }
}
