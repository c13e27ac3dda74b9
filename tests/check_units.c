/* Dimensions, units, the stored numbers of a file's system, names. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "model/infer.h"
#include "model/names.h"
#include "model/rational.h"
#include "model/units.h"
#include "support.h"

#define AVOGADRO 6.02214076e23      /* SI brochure, 9th edition: exact */

static unit unit_of(const char *name)
{
    unit u;
    ck_assert_msg(unit_find(name, &u), "no unit %s", name);
    return u;
}

static unit power_of(const char *name, int num, int den)
{
    unit u = unit_of(name);
    ck_assert(unit_power(&u, num, den, &u));
    return u;
}

static unit product(unit a, unit b)
{
    ck_assert(unit_multiply(&a, &b, &a));
    return a;
}

/* `units` with one name for the concentration. */
static unit_system system_of(const char *concentration, const char *time)
{
    unit_system s;
    unit_system_init(&s);
    s.concentration = unit_of(concentration);
    s.time = unit_of(time);
    strcpy(s.concentration_text, concentration);
    strcpy(s.factor[0].name, concentration);
    strcpy(s.time_text, time);
    return s;
}

/* `units molecule/cm^3 s` */
static unit_system gas_system(void)
{
    unit_system s = system_of("molecule", "s");
    s.concentration = product(unit_of("molecule"), power_of("cm", -3, 1));
    s.factor[1] = (unit_factor){"cm", -3, 1};
    s.factor_count = 2;
    return s;
}

static void assert_text(const unit_system *s, dimension d, const char *want)
{
    buffer text;
    buffer_init(&text);
    unit_write(s, &d, &text);
    ck_assert_str_eq(buffer_get(&text), want);
    buffer_clear(&text);
}

/* ---- Dimensions --------------------------------------------------------------- */

START_TEST(test_every_name_is_a_unit_and_others_are_not)
{
    size_t count;
    unit u;
    const char *const *names_of_units = unit_names(&count);
    ck_assert_uint_eq(count, 21);
    for (size_t i = 0; i < count; i++)
        ck_assert(unit_find(names_of_units[i], &u));
    ck_assert(!unit_find("g", &u) && !unit_find("mm", &u) && !unit_find("", &u));
}
END_TEST

START_TEST(test_molar_is_mole_per_litre)
{
    unit molar = unit_of("M"), mole = unit_of("mol"), litre = unit_of("L");
    ck_assert(unit_divide(&mole, &litre, &mole));
    ck_assert(dimension_equal(&molar.dim, &mole.dim));
    ck_assert(mole.up == molar.up && mole.down == molar.down);
}
END_TEST

START_TEST(test_exponents_are_kept_in_lowest_terms)
{
    dimension d, twice;
    ck_assert(dimension_concentration_time(3, 6, -2, 4, &d));
    ck_assert_int_eq(d.num[DIMENSION_AMOUNT], 1);
    ck_assert_int_eq(d.den[DIMENSION_AMOUNT], 2);
    ck_assert_int_eq(d.num[DIMENSION_TIME], -1);
    ck_assert(dimension_multiply(&d, &d, &twice));
    ck_assert_int_eq(twice.num[DIMENSION_AMOUNT], 1);
    ck_assert_int_eq(twice.den[DIMENSION_AMOUNT], 1);
    ck_assert_int_eq(twice.num[DIMENSION_LENGTH], -3);
}
END_TEST

START_TEST(test_exponents_beyond_all_sense_are_refused)
{
    dimension d, out;
    ck_assert(dimension_concentration_time(0, 1, 1000, 1, &d));
    ck_assert(!dimension_power(&d, 1000000, 1, &out));
    ck_assert(!dimension_concentration_time(0, 1, 1, 100000000, &d));
}
END_TEST

START_TEST(test_powers_of_concentration_are_told_from_lengths)
{
    dimension d;
    int num, den;
    ck_assert(dimension_concentration_time(-3, 2, 5, 1, &d));
    ck_assert(dimension_is_concentration_power(&d, &num, &den));
    ck_assert(num == -3 && den == 2);
    ck_assert(!dimension_is_concentration_power(&(dimension){{1, 0, 0, 0, 0}, {1, 1, 1, 1, 1}}, &num, &den));
}
END_TEST

/* ---- Stored numbers --------------------------------------------------------------- */

START_TEST(test_decimal_units_are_correctly_rounded)
{
    unit_system molar = system_of("M", "s"), milli = system_of("mM", "min");
    unit mM = unit_of("mM"), M = unit_of("M"), per_second = power_of("s", -1, 1);
    for (int i = 1; i < 1000; i++) {
        ck_assert_double_eq(unit_to_stored(&molar, &mM, i), i / 1000.0);
        ck_assert_double_eq(unit_to_stored(&milli, &M, i), i * 1000.0);
        ck_assert_double_eq(unit_to_stored(&milli, &per_second, i), i * 60.0);
    }
}
END_TEST

/* One rounding, not two: 60 and not 3600/60. */
START_TEST(test_whole_factors_are_applied_at_once)
{
    unit_system minutes = system_of("M", "min"), hours = system_of("M", "h");
    unit h = unit_of("h"), min = unit_of("min");
    for (int i = 1; i < 1000; i++) {
        ck_assert_double_eq(unit_to_stored(&minutes, &h, i / 7.0), i / 7.0 * 60);
        ck_assert_double_eq(unit_to_stored(&hours, &min, i / 7.0), i / 7.0 / 60);
    }
}
END_TEST

START_TEST(test_the_files_own_units_store_the_number_itself)
{
    unit_system gas = gas_system();
    unit own = product(power_of("cm", 3, 1), product(power_of("molecule", -1, 1), power_of("s", -1, 1)));
    ck_assert_double_eq(unit_to_stored(&gas, &own, 1.7e-12), 1.7e-12);
    unit_system half = system_of("uM", "h");
    unit root = product(power_of("uM", -1, 2), power_of("h", -1, 1));
    ck_assert_double_eq(unit_to_stored(&half, &root, 0.3), 0.3);
}
END_TEST

/* 1 cm^3 per molecule and second is N_A/1000 per M and s. */
START_TEST(test_molecules_become_moles)
{
    unit_system molar = system_of("M", "s"), gas = gas_system();
    unit own = product(power_of("cm", 3, 1), product(power_of("molecule", -1, 1), power_of("s", -1, 1)));
    unit molar_rate = product(power_of("M", -1, 1), power_of("s", -1, 1));
    assert_close(unit_to_stored(&molar, &own, 1e-12), 1e-12 * AVOGADRO / 1000, 1e-15, 0);
    assert_close(unit_to_stored(&gas, &molar_rate, 1e9), 1e9 * 1000 / AVOGADRO, 1e-15, 0);
}
END_TEST

START_TEST(test_energies_per_mole_stay_what_they_are)
{
    unit_system systems[] = {system_of("M", "s"), system_of("nM", "h"), gas_system()};
    unit per_mole = power_of("mol", -1, 1);
    for (int i = 0; i < 3; i++) {
        unit kJ = product(unit_of("kJ"), per_mole), kcal = product(unit_of("kcal"), per_mole);
        ck_assert_double_eq(unit_to_stored(&systems[i], &kJ, 80), 80000);
        assert_close(unit_to_stored(&systems[i], &kcal, 10), 41840, 1e-15, 0);
    }
}
END_TEST

START_TEST(test_units_none_leaves_numbers_alone)
{
    unit_system s = system_of("mM", "min");
    s.none = true;
    unit u = unit_of("h");
    ck_assert_double_eq(unit_to_stored(&s, &u, 3), 3);
}
END_TEST

/* ---- Text ---------------------------------------------------------------------------- */

START_TEST(test_units_are_written_in_the_notation_of_the_language)
{
    unit_system s = system_of("mM", "min"), gas = gas_system();
    dimension d;
    ck_assert(dimension_concentration_time(-2, 1, -1, 1, &d));
    assert_text(&s, d, "mM^-2 min^-1");
    ck_assert(dimension_concentration_time(1, 1, -1, 1, &d));
    assert_text(&s, d, "mM/min");
    ck_assert(dimension_concentration_time(-1, 2, -1, 1, &d));
    assert_text(&s, d, "mM^(-1/2) min^-1");
    ck_assert(dimension_concentration_time(-1, 1, -1, 1, &d));
    assert_text(&gas, d, "cm^3/molecule/s");
    ck_assert(dimension_concentration_time(1, 1, 0, 1, &d));
    assert_text(&gas, d, "molecule/cm^3");
    assert_text(&s, dimension_none(), "");
}
END_TEST

START_TEST(test_volumes_are_written_in_litres_where_concentrations_are_molar)
{
    unit_system molar = system_of("M", "s"), milli = system_of("mM", "s");
    dimension d = dimension_none();
    d.num[DIMENSION_LENGTH] = 3;
    assert_text(&molar, d, "L");
    assert_text(&milli, d, "mol/mM");
    d.num[DIMENSION_TIME] = -1;
    assert_text(&molar, d, "L/s");
    d.num[DIMENSION_AMOUNT] = 1;
    d.num[DIMENSION_LENGTH] = 0;
    assert_text(&molar, d, "mol/s");
}
END_TEST

START_TEST(test_energies_are_written_per_mole)
{
    unit_system s = system_of("M", "s");
    dimension d = dimension_none();
    d.num[DIMENSION_ENERGY] = 1;
    d.num[DIMENSION_AMOUNT] = -1;
    assert_text(&s, d, "J/mol");
    d.num[DIMENSION_TEMPERATURE] = -1;
    assert_text(&s, d, "J/mol/K");
}
END_TEST

/* ---- Rationals ------------------------------------------------------------------------- */

START_TEST(test_decimals_are_read_exactly)
{
    rational r;
    ck_assert_int_eq(rational_read("0.5", &r), RATIONAL_OK);
    ck_assert(r.num == 1 && r.den == 2);
    ck_assert_int_eq(rational_read("2", &r), RATIONAL_OK);
    ck_assert(r.num == 2 && r.den == 1);
    ck_assert_int_eq(rational_read("0.100", &r), RATIONAL_OK);
    ck_assert(r.num == 1 && r.den == 10);
    ck_assert_int_eq(rational_read("1.05", &r), RATIONAL_OK);
    ck_assert(r.num == 21 && r.den == 20);
    ck_assert_int_eq(rational_read(".25", &r), RATIONAL_OK);
    ck_assert(r.num == 1 && r.den == 4);
    ck_assert_int_eq(rational_read("0.0", &r), RATIONAL_OK);
    ck_assert(r.num == 0);
}
END_TEST

START_TEST(test_decimals_have_limits)
{
    rational r;
    ck_assert_int_eq(rational_read("1000000", &r), RATIONAL_OK);
    ck_assert_int_eq(rational_read("1000000.5", &r), RATIONAL_TOO_LARGE);
    ck_assert_int_eq(rational_read("99999999999999999999999999", &r), RATIONAL_TOO_LARGE);
    ck_assert_int_eq(rational_read("0.123456789012345", &r), RATIONAL_OK);
    ck_assert_int_eq(rational_read("0.1234567890123456", &r), RATIONAL_TOO_LONG);
    ck_assert_int_eq(rational_read("0.0000000000000001", &r), RATIONAL_TOO_LONG);
    ck_assert_int_eq(rational_read("0.50000000000000000000000000", &r), RATIONAL_OK);
}
END_TEST

START_TEST(test_doubles_are_taken_for_the_rationals_they_stand_for)
{
    rational r;
    ck_assert(rational_near(1.0 / 3, &r) && r.num == 1 && r.den == 3);
    ck_assert(rational_near(-2.5, &r) && r.num == -5 && r.den == 2);
    ck_assert(rational_near(0, &r) && r.num == 0);
    ck_assert(!rational_near(3.141592653589793, &r));
    ck_assert(!rational_near(NAN, &r) && !rational_near(INFINITY, &r) && !rational_near(1e9, &r));
}
END_TEST

/* ---- Inference ---------------------------------------------------------------------------- */

static form unknown_form(inference *inf, int unknown)
{
    form f;
    ck_assert(form_unknown(inf, unknown, &f));
    return f;
}

static form rate_form(int concentration, int time)
{
    dimension d;
    ck_assert(dimension_concentration_time(concentration, 1, time, 1, &d));
    return form_known(&d);
}

static unsigned sample_bits(unsigned *state)
{
    *state = *state * 1664525u + 1013904223u;
    return *state >> 16;
}

static void assert_known(inference *inf, int unknown, int concentration, int time)
{
    dimension d, want;
    form f = unknown_form(inf, unknown);
    ck_assert(infer_resolve(inf, &f, &d));
    ck_assert(dimension_concentration_time(concentration, 1, time, 1, &want));
    ck_assert(dimension_equal(&d, &want));
}

/* a*b = M/s, a/b = s^-1 M  =>  a^2 = M^2 s^-2, b = 1 */
START_TEST(test_two_equations_settle_two_unknowns)
{
    inference inf;
    ck_assert_int_eq(infer_init(&inf), 0);
    int a = infer_new(&inf), b = infer_new(&inf);
    form left = unknown_form(&inf, a), right = unknown_form(&inf, b), rate = rate_form(1, -1);
    ck_assert(form_multiply(&left, &right, 1));
    ck_assert_int_eq(infer_equal(&inf, &left, &rate, 1), INFER_FITS);
    left = unknown_form(&inf, a), right = unknown_form(&inf, b);
    ck_assert(form_multiply(&left, &right, -1));
    ck_assert_int_eq(infer_equal(&inf, &left, &rate, 2), INFER_FITS);
    assert_known(&inf, a, 1, -1);
    assert_known(&inf, b, 0, 0);
    infer_clear(&inf);
}
END_TEST

START_TEST(test_a_contradiction_is_found)
{
    inference inf;
    ck_assert_int_eq(infer_init(&inf), 0);
    int a = infer_new(&inf), b = infer_new(&inf);
    form fa = unknown_form(&inf, a), fb = unknown_form(&inf, b), first = rate_form(0, -1),
         second = rate_form(-1, -1);
    ck_assert_int_eq(infer_equal(&inf, &fa, &fb, 1), INFER_FITS);
    ck_assert_int_eq(infer_equal(&inf, &fb, &first, 2), INFER_FITS);
    ck_assert_int_eq(infer_equal(&inf, &fa, &second, 3), INFER_CONFLICT);
    assert_known(&inf, a, 0, -1);
    infer_clear(&inf);
}
END_TEST

/* Equations that hold for dimensions chosen beforehand: none may conflict, and
 * what comes out determined must be what was chosen. */
START_TEST(test_consistent_equations_never_conflict)
{
    enum { UNKNOWNS = 12, EQUATIONS = 30 };
    inference inf;
    unsigned state = (unsigned)_i + 1;
    int concentration[UNKNOWNS], time[UNKNOWNS], known = 0;
    ck_assert_int_eq(infer_init(&inf), 0);
    for (int i = 0; i < UNKNOWNS; i++) {
        concentration[i] = (int)(sample_bits(&state) % 5) - 2;
        time[i] = (int)(sample_bits(&state) % 3) - 1;
        ck_assert_int_eq(infer_new(&inf), i);
    }
    for (int e = 0; e < EQUATIONS; e++) {
        form left = form_none();
        int c = 0, t = 0;
        for (int j = 0; j < 4; j++) {
            int i = (int)(sample_bits(&state) % UNKNOWNS), power = (int)(sample_bits(&state) % 5) - 2;
            form factor = unknown_form(&inf, i);
            ck_assert(form_power(&factor, (rational){power, 1}) && form_multiply(&left, &factor, 1));
            c += power * concentration[i];
            t += power * time[i];
        }
        form right = rate_form(c, t), wrong = rate_form(c + 1, t);
        ck_assert_int_eq(infer_equal(&inf, &left, &right, e + 1), INFER_FITS);
        ck_assert_int_eq(infer_equal(&inf, &left, &wrong, e + 1), INFER_CONFLICT);
    }
    for (int i = 0; i < UNKNOWNS; i++) {
        dimension d;
        form f = unknown_form(&inf, i);
        if (!infer_resolve(&inf, &f, &d))
            continue;
        known++;
        assert_known(&inf, i, concentration[i], time[i]);
    }
    ck_assert_int_gt(known, UNKNOWNS / 2);
    infer_clear(&inf);
}
END_TEST

/* A chain of equalities settled at its far end, in a time that is not its square. */
START_TEST(test_a_long_chain_of_equalities_is_settled)
{
    enum { LENGTH = 100000 };
    inference inf;
    ck_assert_int_eq(infer_init(&inf), 0);
    int first = infer_new(&inf), previous = first;
    for (int i = 1; i < LENGTH; i++) {
        int next = infer_new(&inf);
        form a = unknown_form(&inf, previous), b = unknown_form(&inf, next);
        ck_assert_int_eq(infer_equal(&inf, &a, &b, i), INFER_FITS);
        previous = next;
    }
    form last = unknown_form(&inf, previous), rate = rate_form(-1, -1);
    ck_assert_int_eq(infer_equal(&inf, &last, &rate, LENGTH), INFER_FITS);
    assert_known(&inf, first, -1, -1);
    infer_clear(&inf);
}
END_TEST

/* ---- Names ----------------------------------------------------------------------------------- */

START_TEST(test_a_table_finds_what_was_entered)
{
    enum { COUNT = 5000 };
    static char name[COUNT][16];
    names table;
    names_init(&table);
    ck_assert_int_eq(names_find(&table, "x"), -1);
    for (int i = 0; i < COUNT; i++) {
        snprintf(name[i], sizeof name[i], "n%d", i);
        ck_assert_int_eq(names_add(&table, name[i], 3 * i), 0);
    }
    for (int i = 0; i < COUNT; i++)
        ck_assert_int_eq(names_find(&table, name[i]), 3 * i);
    ck_assert_int_eq(names_find(&table, "n5000"), -1);
    names_clear(&table);
}
END_TEST

START_TEST(test_the_nearest_name_is_found)
{
    static const char *const known[] = {"check", "run", "steady", "oscillate", "k2", "Vmax"};
    ck_assert_str_eq(lb_nearest("chekc", known, 6), "check");       /* transposition */
    ck_assert_str_eq(lb_nearest("rnu", known, 6), "run");           /* one edit is all that three letters allow */
    ck_assert_str_eq(lb_nearest("stedy", known, 6), "steady");      /* deletion */
    ck_assert_str_eq(lb_nearest("ocsillates", known, 6), "oscillate");
    ck_assert_str_eq(lb_nearest("VMAX", known, 6), "Vmax");         /* case */
    ck_assert_str_eq(lb_nearest("kk2", known, 6), "k2");
    ck_assert_ptr_null(lb_nearest("emit", known, 6));
    ck_assert_ptr_null(lb_nearest("q", known, 6));
    ck_assert_ptr_null(lb_nearest("", known, 6));
}
END_TEST

START_TEST(test_a_name_does_not_suggest_itself)
{
    static const char *const known[] = {"Buffer", "Buffet"};
    ck_assert_str_eq(lb_nearest("Buffer", known, 2), "Buffet");
    ck_assert_ptr_null(lb_nearest("Buffer", known, 1));
}
END_TEST

START_TEST(test_letters_of_two_bytes_count_once)
{
    static const char *const known[] = {"k\xCE\xB1"};               /* k alpha */
    ck_assert_ptr_nonnull(lb_nearest("k\xCE\xB2", known, 1));       /* k beta */
    ck_assert_ptr_null(lb_nearest("\xCE\xB2", known, 1));
}
END_TEST

Suite *units_suite(void)
{
    Suite *s = suite_create("units");
    TCase *t = tcase_create("units");
    tcase_add_test(t, test_every_name_is_a_unit_and_others_are_not);
    tcase_add_test(t, test_molar_is_mole_per_litre);
    tcase_add_test(t, test_exponents_are_kept_in_lowest_terms);
    tcase_add_test(t, test_exponents_beyond_all_sense_are_refused);
    tcase_add_test(t, test_powers_of_concentration_are_told_from_lengths);
    tcase_add_test(t, test_decimal_units_are_correctly_rounded);
    tcase_add_test(t, test_whole_factors_are_applied_at_once);
    tcase_add_test(t, test_the_files_own_units_store_the_number_itself);
    tcase_add_test(t, test_molecules_become_moles);
    tcase_add_test(t, test_energies_per_mole_stay_what_they_are);
    tcase_add_test(t, test_units_none_leaves_numbers_alone);
    tcase_add_test(t, test_units_are_written_in_the_notation_of_the_language);
    tcase_add_test(t, test_volumes_are_written_in_litres_where_concentrations_are_molar);
    tcase_add_test(t, test_energies_are_written_per_mole);
    suite_add_tcase(s, t);
    t = tcase_create("rationals and inference");
    tcase_add_test(t, test_decimals_are_read_exactly);
    tcase_add_test(t, test_decimals_have_limits);
    tcase_add_test(t, test_doubles_are_taken_for_the_rationals_they_stand_for);
    tcase_add_test(t, test_two_equations_settle_two_unknowns);
    tcase_add_test(t, test_a_contradiction_is_found);
    tcase_add_loop_test(t, test_consistent_equations_never_conflict, 0, 50);
    tcase_add_test(t, test_a_long_chain_of_equalities_is_settled);
    suite_add_tcase(s, t);
    t = tcase_create("names");
    tcase_add_test(t, test_a_table_finds_what_was_entered);
    tcase_add_test(t, test_the_nearest_name_is_found);
    tcase_add_test(t, test_a_name_does_not_suggest_itself);
    tcase_add_test(t, test_letters_of_two_bytes_count_once);
    suite_add_tcase(s, t);
    return s;
}
