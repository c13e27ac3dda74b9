/* Exact rational numbers of 64 bits, as mechanism files need them.
 *
 * Coefficients are read from their decimal digits, so 0.1 is 1/10 and not the
 * double beside it.  Limits keep every product of two of them within 64 bits. */
#include "model/rational.h"

#include <math.h>

enum { DIGITS = 15, LARGEST = 1000000, FACTOR_LIMIT = 1000000000, DENOMINATOR_LIMIT = 1000000 };

rational rational_of(int64_t num, int64_t den)
{
    int64_t a = num < 0 ? -num : num, b = den < 0 ? -den : den;
    while (b) {
        int64_t rest = a % b;
        a = b;
        b = rest;
    }
    if (den < 0)
        a = -a;
    return (rational){num / a, den / a};
}

static bool is_small(rational a)
{
    return a.num <= FACTOR_LIMIT && a.num >= -FACTOR_LIMIT && a.den <= FACTOR_LIMIT;
}

bool rational_add(rational a, rational b, rational *out)
{
    if (!is_small(a) || !is_small(b))
        return false;
    rational sum = rational_of(a.num * b.den + b.num * a.den, a.den * b.den);
    if (!is_small(sum))
        return false;
    *out = sum;
    return true;
}

bool rational_multiply(rational a, rational b, rational *out)
{
    if (!is_small(a) || !is_small(b))
        return false;
    rational product = rational_of(a.num * b.num, a.den * b.den);
    if (!is_small(product))
        return false;
    *out = product;
    return true;
}

rational_outcome rational_read(const char *text, rational *out)
{
    int64_t num = 0, den = 1;
    int digits = 0, decimals = 0, zeros = 0;    /* zeros: trailing decimals that may yet be dropped */
    bool after_point = false;
    for (; *text; text++) {
        if (*text == '.') {
            after_point = true;
            continue;
        }
        if (after_point && *text == '0') {
            zeros++;
            continue;
        }
        for (int append = after_point ? zeros + 1 : 1; append > 0; append--) {
            int digit = append == 1 ? *text - '0' : 0;
            if (num != 0 || digit != 0)
                digits++;
            decimals += after_point;
            if (digits > DIGITS || decimals > DIGITS)
                return after_point ? RATIONAL_TOO_LONG : RATIONAL_TOO_LARGE;
            num = 10 * num + digit;
            den = after_point ? 10 * den : den;
        }
        zeros = 0;
    }
    *out = rational_of(num, den);
    return (double)num / (double)den > LARGEST ? RATIONAL_TOO_LARGE : RATIONAL_OK;
}

/* Continued fraction; the convergents are the best approximations. */
bool rational_near(double x, rational *out)
{
    if (!(fabs(x) <= LARGEST))
        return false;
    double rest = fabs(x);
    int64_t p0 = 0, q0 = 1, p1 = 1, q1 = 0;
    for (int i = 0; i < 40; i++) {
        double whole = floor(rest);
        if (whole > LARGEST)
            return false;
        int64_t p = (int64_t)whole * p1 + p0, q = (int64_t)whole * q1 + q0;
        if (q > DENOMINATOR_LIMIT || p > FACTOR_LIMIT)
            return false;
        if (fabs((double)p / (double)q - fabs(x)) <= 4e-16 * fabs(x)) {
            *out = rational_of(x < 0 ? -p : p, q);
            return true;
        }
        p0 = p1, q0 = q1, p1 = p, q1 = q;
        rest = 1 / (rest - whole);
    }
    return false;
}
