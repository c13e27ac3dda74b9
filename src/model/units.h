/* Dimensions and units.
 *
 * A dimension is five rational exponents.  Stored numbers belong to the file's
 * coherent system: its unit of time, its unit of concentration, mol, J, K; the
 * unit of length is what makes (mol / length^3) the unit of concentration.  So
 * `units mM min` stores 2 M as 2000, and energies stay J/mol. */
#ifndef LIMBECK_MODEL_UNITS_H
#define LIMBECK_MODEL_UNITS_H

#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

enum {
    DIMENSION_LENGTH, DIMENSION_AMOUNT, DIMENSION_TIME, DIMENSION_ENERGY, DIMENSION_TEMPERATURE,
    DIMENSION_COUNT
};

/* Exponents as num[i]/den[i] in lowest terms, den > 0. */
typedef struct dimension {
    int num[DIMENSION_COUNT];
    int den[DIMENSION_COUNT];
} dimension;

/* A unit as a factor to (dm, mol, s, J, K): scale = up/down, kept apart so that
 * 3 mM becomes 3/1000, correctly rounded. */
typedef struct unit {
    dimension dim;
    double up, down;
} unit;

/* One factor of a unit as written: `cm^-3`. */
typedef struct unit_factor {
    char name[12];
    int num, den;
} unit_factor;

enum { UNIT_FACTORS = 4 };          /* in a unit of concentration */

typedef struct unit_system {
    bool none;                      /* `units none`: the rest does not count */
    unit concentration, time;
    char concentration_text[64];    /* as written: "M", "molecule/cm^3" */
    char time_text[16];
    unit_factor factor[UNIT_FACTORS]; /* of the unit of concentration, in the order written */
    int factor_count;
} unit_system;

/* `units M s`, what a file without a `units` line has. */
void unit_system_init(unit_system *system);

dimension dimension_none(void);
bool dimension_is_none(const dimension *d);
bool dimension_equal(const dimension *a, const dimension *b);
/* amount/length^3 to the power num/den, for some num/den: *num = 0 when it has neither. */
bool dimension_is_concentration_power(const dimension *d, int *num, int *den);
/* The four below return false when an exponent is beyond a million. */
bool dimension_multiply(const dimension *a, const dimension *b, dimension *out);
bool dimension_divide(const dimension *a, const dimension *b, dimension *out);
bool dimension_power(const dimension *a, int num, int den, dimension *out);
bool dimension_concentration_time(int concentration_num, int concentration_den, int time_num, int time_den,
                                  dimension *out);

/* A unit by name (`mM`, `kJ`); false when there is none. */
bool unit_find(const char *name, unit *out);
/* All names, for the nearest one; *count of them. */
const char *const *unit_names(size_t *count);
unit unit_one(void);
/* The three below return false when an exponent is beyond a million. */
bool unit_multiply(const unit *a, const unit *b, unit *out);
bool unit_divide(const unit *a, const unit *b, unit *out);
bool unit_power(const unit *a, int num, int den, unit *out);

/* value [unit] in the stored numbers of the system, to the last bit where the
 * factor between the two is a whole number or the reciprocal of one. */
double unit_to_stored(const unit_system *system, const unit *u, double value);
/* Text of the coherent unit of a dimension, in the notation of the language:
 * "M^-1 s^-1", "M/s", "J/mol", "cm^3/molecule/s"; "" for none. */
void unit_write(const unit_system *system, const dimension *d, buffer *out);

#endif
