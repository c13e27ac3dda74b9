/* Dimensions and units.
 *
 * A dimension is five rational exponents.  Stored numbers belong to the file's
 * coherent system: its unit of time, its unit of concentration, mol, J, K; the
 * unit of length is what makes (mol / length^3) the unit of concentration.  So
 * `units mM min` stores 2 M as 2000, and energies stay J/mol. */
#ifndef LIMBECK_MODEL_UNITS_H
#define LIMBECK_MODEL_UNITS_H

#include <stdbool.h>

#include "base/buffer.h"

enum { DIMENSION_LENGTH, DIMENSION_AMOUNT, DIMENSION_TIME, DIMENSION_ENERGY, DIMENSION_TEMPERATURE, DIMENSION_COUNT };

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

typedef struct unit_system {
    bool none;                      /* `units none` */
    unit concentration, time;
    char concentration_text[64];    /* as written: "M", "molecule/cm^3" */
    char time_text[16];
} unit_system;

dimension dimension_none(void);
bool dimension_is_none(const dimension *d);
bool dimension_equal(const dimension *a, const dimension *b);
/* The four below return false when an exponent leaves the range of int. */
bool dimension_multiply(const dimension *a, const dimension *b, dimension *out);
bool dimension_divide(const dimension *a, const dimension *b, dimension *out);
bool dimension_power(const dimension *a, int num, int den, dimension *out);
bool dimension_concentration_time(int concentration_num, int concentration_den, int time_num, int time_den, dimension *out);

/* A unit by name (`mM`, `kJ`); false when there is none. */
bool unit_find(const char *name, unit *out);
/* Nearest unit's name, or NULL. */
bool unit_multiply(const unit *a, const unit *b, unit *out);
bool unit_divide(const unit *a, const unit *b, unit *out);
bool unit_power(const unit *a, int num, int den, unit *out);

/* value [unit] in the stored numbers of the system. */
double unit_to_stored(const unit_system *system, const unit *u, double value);
/* Text of the coherent unit of a dimension: "M^-1 s^-1", "J/mol", "" for none. */
void unit_write(const unit_system *system, const dimension *d, buffer *out);

#endif
