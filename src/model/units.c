/* Dimensions as five rational exponents, units as factors to (dm, mol, s, J, K).
 *
 * A unit keeps its factor as a quotient up/down of two doubles that are whole
 * wherever the definition is, so that 3 mM is 3/1000 and not 3 * 0.001.  The
 * unit of length of a file's coherent system follows from its unit of
 * concentration c: length^3 = mol/c.
 *
 * Values: the SI brochure (9th edition, 2019) for mole and thermochemical calorie. */
#include "model/units.h"

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#define AVOGADRO 6.02214076e23

/* ---- Dimensions ----------------------------------------------------------- */

dimension dimension_none(void)
{
    dimension d;
    for (int i = 0; i < DIMENSION_COUNT; i++) {
        d.num[i] = 0;
        d.den[i] = 1;
    }
    return d;
}

bool dimension_is_none(const dimension *d)
{
    for (int i = 0; i < DIMENSION_COUNT; i++)
        if (d->num[i] != 0)
            return false;
    return true;
}

bool dimension_equal(const dimension *a, const dimension *b)
{
    for (int i = 0; i < DIMENSION_COUNT; i++)
        if (a->num[i] != b->num[i] || a->den[i] != b->den[i])
            return false;
    return true;
}

static int64_t common_divisor(int64_t a, int64_t b)
{
    while (b) {
        int64_t rest = a % b;
        a = b;
        b = rest;
    }
    return a < 0 ? -a : a;
}

/* No honest exponent is beyond a million, and products of such stay in 64 bits. */
enum { EXPONENT_LIMIT = 1000000 };

/* Lowest terms with a positive denominator; false beyond the limit. */
static bool store(int64_t num, int64_t den, int *num_out, int *den_out)
{
    int64_t divisor = common_divisor(num, den);
    if (den < 0)
        divisor = -divisor;
    num /= divisor;
    den /= divisor;
    if (num > EXPONENT_LIMIT || num < -EXPONENT_LIMIT || den > EXPONENT_LIMIT)
        return false;
    *num_out = (int)num;
    *den_out = (int)den;
    return true;
}

/* a + sign*b, exponent by exponent. */
static bool combine(const dimension *a, const dimension *b, int sign, dimension *out)
{
    dimension d;
    for (int i = 0; i < DIMENSION_COUNT; i++) {
        int64_t den = (int64_t)a->den[i] * b->den[i];
        int64_t left = (int64_t)a->num[i] * b->den[i], right = (int64_t)b->num[i] * a->den[i] * sign;
        if (!store(left + right, den, &d.num[i], &d.den[i]))
            return false;
    }
    *out = d;
    return true;
}

bool dimension_multiply(const dimension *a, const dimension *b, dimension *out)
{
    return combine(a, b, 1, out);
}

bool dimension_divide(const dimension *a, const dimension *b, dimension *out)
{
    return combine(a, b, -1, out);
}

bool dimension_power(const dimension *a, int num, int den, dimension *out)
{
    dimension d;
    for (int i = 0; i < DIMENSION_COUNT; i++)
        if (!store((int64_t)a->num[i] * num, (int64_t)a->den[i] * den, &d.num[i], &d.den[i]))
            return false;
    *out = d;
    return true;
}

bool dimension_concentration_time(int concentration_num, int concentration_den, int time_num, int time_den,
                                  dimension *out)
{
    dimension d = dimension_none();
    if (!store(-3 * (int64_t)concentration_num, concentration_den, &d.num[DIMENSION_LENGTH],
               &d.den[DIMENSION_LENGTH])
        || !store(concentration_num, concentration_den, &d.num[DIMENSION_AMOUNT], &d.den[DIMENSION_AMOUNT])
        || !store(time_num, time_den, &d.num[DIMENSION_TIME], &d.den[DIMENSION_TIME]))
        return false;
    *out = d;
    return true;
}

bool dimension_is_concentration_power(const dimension *d, int *num, int *den)
{
    *num = d->num[DIMENSION_AMOUNT];
    *den = d->den[DIMENSION_AMOUNT];
    return (int64_t)d->num[DIMENSION_LENGTH] * *den == -3 * (int64_t)*num * d->den[DIMENSION_LENGTH];
}

/* ---- Units ---------------------------------------------------------------- */

struct named_unit {
    const char *name;
    int exponent[DIMENSION_COUNT];      /* length, amount, time, energy, temperature */
    double up, down;
};

static const struct named_unit table[] = {
    {"M",        {-3, 1, 0, 0, 0}, 1, 1},
    {"mM",       {-3, 1, 0, 0, 0}, 1, 1e3},
    {"uM",       {-3, 1, 0, 0, 0}, 1, 1e6},
    {"nM",       {-3, 1, 0, 0, 0}, 1, 1e9},
    {"pM",       {-3, 1, 0, 0, 0}, 1, 1e12},
    {"mol",      {0, 1, 0, 0, 0}, 1, 1},
    {"L",        {3, 0, 0, 0, 0}, 1, 1},
    {"mL",       {3, 0, 0, 0, 0}, 1, 1e3},
    {"m",        {1, 0, 0, 0, 0}, 10, 1},
    {"dm",       {1, 0, 0, 0, 0}, 1, 1},
    {"cm",       {1, 0, 0, 0, 0}, 1, 10},
    {"molecule", {0, 1, 0, 0, 0}, 1, AVOGADRO},
    {"s",        {0, 0, 1, 0, 0}, 1, 1},
    {"ms",       {0, 0, 1, 0, 0}, 1, 1e3},
    {"min",      {0, 0, 1, 0, 0}, 60, 1},
    {"h",        {0, 0, 1, 0, 0}, 3600, 1},
    {"K",        {0, 0, 0, 0, 1}, 1, 1},
    {"J",        {0, 0, 0, 1, 0}, 1, 1},
    {"kJ",       {0, 0, 0, 1, 0}, 1e3, 1},
    {"cal",      {0, 0, 0, 1, 0}, 4184, 1e3},
    {"kcal",     {0, 0, 0, 1, 0}, 4184, 1},
};

enum { TABLE_COUNT = sizeof table / sizeof *table };

bool unit_find(const char *name, unit *out)
{
    for (int i = 0; i < TABLE_COUNT; i++) {
        if (strcmp(table[i].name, name) != 0)
            continue;
        *out = (unit){dimension_none(), table[i].up, table[i].down};
        for (int j = 0; j < DIMENSION_COUNT; j++)
            out->dim.num[j] = table[i].exponent[j];
        return true;
    }
    return false;
}

const char *const *unit_names(size_t *count)
{
    static const char *const names[] = {"M", "mM", "uM", "nM", "pM", "mol", "L", "mL", "m", "dm", "cm",
                                        "molecule", "s", "ms", "min", "h", "K", "J", "kJ", "cal", "kcal"};
    *count = sizeof names / sizeof *names;
    return names;
}

unit unit_one(void)
{
    return (unit){dimension_none(), 1, 1};
}

bool unit_multiply(const unit *a, const unit *b, unit *out)
{
    unit u = {dimension_none(), a->up * b->up, a->down * b->down};
    if (!dimension_multiply(&a->dim, &b->dim, &u.dim))
        return false;
    *out = u;
    return true;
}

bool unit_divide(const unit *a, const unit *b, unit *out)
{
    unit u = {dimension_none(), a->up * b->down, a->down * b->up};
    if (!dimension_divide(&a->dim, &b->dim, &u.dim))
        return false;
    *out = u;
    return true;
}

/* Both factors stay whole: a negative exponent swaps them. */
bool unit_power(const unit *a, int num, int den, unit *out)
{
    double exponent = fabs((double)num / den);
    double up = pow(a->up, exponent), down = pow(a->down, exponent);
    unit u = {dimension_none(), num < 0 ? down : up, num < 0 ? up : down};
    if (!dimension_power(&a->dim, num, den, &u.dim))
        return false;
    *out = u;
    return true;
}

/* ---- The file's coherent system ------------------------------------------- */

void unit_system_init(unit_system *system)
{
    memset(system, 0, sizeof *system);
    unit_find("M", &system->concentration);
    unit_find("s", &system->time);
    snprintf(system->concentration_text, sizeof system->concentration_text, "M");
    snprintf(system->time_text, sizeof system->time_text, "s");
    system->factor[0] = (unit_factor){"M", 1, 1};
    system->factor_count = 1;
}

/* The coherent unit of a dimension as a factor to (dm, mol, s, J, K): with
 * length^3 = mol/c the exponent a of length leaves c^(-a/3). */
static unit coherent(const unit_system *system, const dimension *d)
{
    double concentration = -(double)d->num[DIMENSION_LENGTH] / (3.0 * d->den[DIMENSION_LENGTH]);
    double time = (double)d->num[DIMENSION_TIME] / d->den[DIMENSION_TIME];
    unit u = unit_one();
    double c_up = pow(system->concentration.up, fabs(concentration));
    double c_down = pow(system->concentration.down, fabs(concentration));
    double t_up = pow(system->time.up, fabs(time)), t_down = pow(system->time.down, fabs(time));
    u.up *= (concentration < 0 ? c_down : c_up) * (time < 0 ? t_down : t_up);
    u.down *= (concentration < 0 ? c_up : c_down) * (time < 0 ? t_up : t_down);
    return u;
}

double unit_to_stored(const unit_system *system, const unit *u, double value)
{
    if (system->none)
        return value;
    unit own = coherent(system, &u->dim);
    double up = u->up * own.down, down = u->down * own.up;
    if (up == down)
        return value;
    if (up > down && fmod(up, down) == 0)
        return value * (up / down);
    if (down > up && fmod(down, up) == 0)
        return value / (down / up);
    return value * up / down;
}

/* ---- Text ------------------------------------------------------------------ */

/* Factors of the text being made; equal names are merged. */
struct factors {
    unit_factor item[UNIT_FACTORS + DIMENSION_COUNT + 1];
    int count;
};

static void add_factor(struct factors *list, const char *name, int64_t num, int64_t den)
{
    int i = 0;
    while (i < list->count && strcmp(list->item[i].name, name) != 0)
        i++;
    unit_factor *f = &list->item[i];
    if (i == list->count) {
        list->count++;
        *f = (unit_factor){"", 0, 1};
        snprintf(f->name, sizeof f->name, "%s", name);
    }
    store(f->num * den + num * f->den, f->den * den, &f->num, &f->den);
}

static void write_power(const unit_factor *f, int sign, buffer *out)
{
    int num = sign * f->num;
    buffer_append(out, f->name);
    if (f->den == 1 && num != 1)
        buffer_printf(out, "^%d", num);
    else if (f->den != 1)
        buffer_printf(out, "^(%d/%d)", num, f->den);
}

/* What has a positive exponent first, then each other one behind a `/`; where
 * all are negative, `M^-1 s^-1`. */
static void write_factors(const struct factors *list, buffer *out)
{
    bool has_positive = false;
    for (int i = 0; i < list->count; i++) {
        if (list->item[i].num <= 0)
            continue;
        if (has_positive)
            buffer_char(out, ' ');
        write_power(&list->item[i], 1, out);
        has_positive = true;
    }
    bool is_first = true;
    for (int i = 0; i < list->count; i++) {
        if (list->item[i].num >= 0)
            continue;
        if (has_positive)
            buffer_char(out, '/');
        else if (!is_first)
            buffer_char(out, ' ');
        write_power(&list->item[i], has_positive ? -1 : 1, out);
        is_first = false;
    }
}

/* Lengths and amounts: powers of the unit of concentration as far as the lengths
 * go, the rest in mol.  A volume alone is in L where concentrations are in M. */
static void add_matter(const unit_system *system, const dimension *d, struct factors *list)
{
    int64_t num = -(int64_t)d->num[DIMENSION_LENGTH], den = 3 * (int64_t)d->den[DIMENSION_LENGTH];
    if (d->num[DIMENSION_AMOUNT] == 0 && strcmp(system->concentration_text, "M") == 0) {
        add_factor(list, "L", -num, den);
        return;
    }
    for (int i = 0; i < system->factor_count; i++)
        add_factor(list, system->factor[i].name, num * system->factor[i].num, den * system->factor[i].den);
    add_factor(list, "mol", (int64_t)d->num[DIMENSION_AMOUNT] * den - num * d->den[DIMENSION_AMOUNT],
               den * d->den[DIMENSION_AMOUNT]);
}

void unit_write(const unit_system *system, const dimension *d, buffer *out)
{
    if (system->none || dimension_is_none(d))
        return;
    struct factors list = {.count = 0};
    add_factor(&list, "J", d->num[DIMENSION_ENERGY], d->den[DIMENSION_ENERGY]);
    add_matter(system, d, &list);
    add_factor(&list, "K", d->num[DIMENSION_TEMPERATURE], d->den[DIMENSION_TEMPERATURE]);
    add_factor(&list, system->time_text, d->num[DIMENSION_TIME], d->den[DIMENSION_TIME]);
    write_factors(&list, out);
}
