/* Exact rational numbers of 64 bits, as mechanism files need them. */
#ifndef LIMBECK_MODEL_RATIONAL_H
#define LIMBECK_MODEL_RATIONAL_H

#include <stdbool.h>
#include <stdint.h>

/* num/den in lowest terms, den > 0. */
typedef struct rational {
    int64_t num, den;
} rational;

rational rational_of(int64_t num, int64_t den);                 /* den not 0 */
/* False when numerator or denominator would leave 10^9; *out is then untouched. */
bool rational_add(rational a, rational b, rational *out);
bool rational_multiply(rational a, rational b, rational *out);

typedef enum rational_outcome { RATIONAL_OK, RATIONAL_TOO_LONG, RATIONAL_TOO_LARGE } rational_outcome;
/* The exact value of decimal digits with an optional point ("0.5", "2"):
 * at most 15 significant digits, 15 decimals and 10^6. */
rational_outcome rational_read(const char *text, rational *out);

/* The rational with a denominator of at most 10^6 that a double stands for;
 * false when there is none within a few roundings. */
bool rational_near(double x, rational *out);

#endif
