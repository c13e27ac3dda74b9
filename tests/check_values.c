/* What expressions come to: numbers against C's own arithmetic, dimensions, forms of plain numbers. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "model/network.h"
#include "support.h"

static const double R = 8.31446261815324;   /* J/mol/K, CODATA 2018 */

/* The number of `x = TEXT`, which may be plain or derived. */
static double value_of(const char *units, const char *text)
{
    buffer file;
    buffer_init(&file);
    buffer_printf(&file, "units %s\ntemperature = 350\na = 3\nb = -0.5\nA -> A, k = 0\nx = %s\n", units, text);
    lb_network *net = support_network(buffer_get(&file));
    int constant = lb_network_find_constant(net, "x");
    double value = constant >= 0 ? lb_network_default(net, constant) : NAN;
    for (int i = 0; i < net->derived_count; i++)
        if (strcmp(net->derived[i].name, "x") == 0)
            value = net->derived[i].number;
    lb_network_free(net);
    buffer_clear(&file);
    return value;
}

START_TEST(test_operators_compute_what_c_computes)
{
    static const struct { const char *text; double value; } cases[] = {
        {"1 + 2*3", 7}, {"2*3 - 4/5", 5.2}, {"7 - 2 - 3", 2}, {"8/2/2", 2}, {"2^3^2", 512}, {"-2^2", -4}, {"2^-1", 0.5},
        {"(1 + 2)*3", 9}, {"-(3)", -3}, {"--3", 3}, {"a*b", -1.5}, {"a^b", 0.57735026918962576}, {"-a", -3}, {"-(a + 1)", -4},
        {"a - -b", 2.5}, {"+a", 3}, {"b^2", 0.25}, {"b^0.5", 0}, {"0^0", 1}, {"2*a^2", 18},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++)
        assert_close(value_of("none", cases[i].text), cases[i].value, 1e-15, 0);
}
END_TEST

START_TEST(test_functions_compute_what_c_computes)
{
    assert_close(value_of("none", "exp(a)"), exp(3), 1e-15, 0);
    assert_close(value_of("none", "ln(a)"), log(3), 1e-15, 0);
    assert_close(value_of("none", "log10(a)"), log10(3), 1e-15, 0);
    assert_close(value_of("none", "sqrt(a)"), sqrt(3), 1e-15, 0);
    assert_close(value_of("none", "sqrt(b)"), 0, 0, 0);
    assert_close(value_of("none", "R*T"), R * 350, 1e-15, 0);
    assert_close(value_of("none", "exp(-ln(a)*b)"), sqrt(3), 1e-15, 0);
    assert_close(value_of("none", "eyring(dH = 5e4, dS = 10)"),
                 1.380649e-23 / 6.62607015e-34 * 350 * exp(10 / R) * exp(-5e4 / (R * 350)), 1e-13, 0);
}
END_TEST

START_TEST(test_units_take_part_in_arithmetic)
{
    static const struct { const char *text; double value; } cases[] = {
        {"3 mM", 0.003}, {"(3) mM", 0.003}, {"-(3 mM)", -0.003}, {"-3 mM", -0.003}, {"3*mM", 0.003}, {"3 mM*s^-1", 0.003},
        {"1/min", 1.0 / 60}, {"3 M/min/mM", 50}, {"3 J/(mol K)", 3}, {"2 kJ/mol", 2000}, {"mM", 0.001}, {"mM*2", 0.002},
        {"3 mM + 2 uM", 0.003002}, {"(2 mM)^2", 4e-6}, {"sqrt(4 mM^2)", 0.002}, {"4 M^(-1/2)", 4}, {"4 mM^-0.5", 126.49110640673517},
        {"1 L/mL", 1000}, {"1 m^3/L", 1000}, {"1 m/cm", 100}, {"1 mol/molecule", 6.02214076e23}, {"1 kcal/J", 4184},
        {"ln(3 mM/uM)", 8.0063675676502462}, {"M^(1/2)*M^(1/2)", 1}, {"2 h/s", 7200}, {"R*T/(1 kJ/mol)", 8.31446261815324 * 350 / 1000},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++)
        assert_close(value_of("M s", cases[i].text), cases[i].value, 1e-14, 0);
}
END_TEST

static const network_constant *find_constant(const lb_network *net, const char *name)
{
    int i = lb_network_find_constant(net, name);
    return i < 0 ? NULL : &net->constants[i];
}

START_TEST(test_plain_numbers_are_constants_and_others_are_not)
{
    static const char *const plain[] = {
        "3", "-3", "(3)", "3 M", "-3 M/s", "3 M^-1 s^-1", "1/s", "3*M", "3 cm^3/(molecule s)"};
    static const char *const derived[] = {"2*3", "1 + 0", "M", "a", "2*a", "3 M*a", "10^3", "exp(1)"};
    char text[100];
    for (size_t i = 0; i < sizeof plain / sizeof *plain; i++) {
        snprintf(text, sizeof text, "a = 1\nA -> A, k = 0\nx = %s\n", plain[i]);
        lb_network *net = support_network(text);
        ck_assert_msg(find_constant(net, "x") != NULL, "%s is no constant", plain[i]);
        lb_network_free(net);
    }
    for (size_t i = 0; i < sizeof derived / sizeof *derived; i++) {
        snprintf(text, sizeof text, "a = 1\nA -> A, k = 0\nx = %s\n", derived[i]);
        lb_network *net = support_network(text);
        ck_assert_msg(!find_constant(net, "x") && net->derived_count == 1, "%s is a constant", derived[i]);
        lb_network_free(net);
    }
}
END_TEST

START_TEST(test_feeds_and_held_concentrations_stand_in_expressions)
{
    lb_network *net =
        support_network("residence = 2\n[A]in = 3\n[B] = [A]in/2\nx = [A]in + [C]in + [B]\nA -> C, k = 1\n");
    const network_definition *x = &net->derived[net->derived_count - 1];
    ck_assert_str_eq(x->name, "x");
    assert_close(x->number, 4.5, 1e-15, 0);
    ck_assert_str_eq(x->unit, "M");
    ck_assert_str_eq(net->derived[0].name, "[B]");
    lb_network_free(net);
}
END_TEST

START_TEST(test_initial_concentrations_may_be_derived_or_have_a_range)
{
    lb_network *net =
        support_network("total = 10 mM\n[A]0 = total - 2 mM\n[B]0 = 2 mM in 1 .. 5\nA <-> B, kf = 1, kr = 1\n");
    const network_species *a = &net->species[0], *b = &net->species[1];
    assert_close(a->initial_value, 0.008, 1e-15, 0);
    ck_assert(!a->has_initial_range && b->has_initial_range);
    assert_close(b->initial_low, 0.001, 1e-15, 0);
    assert_close(b->initial_high, 0.005, 1e-15, 0);
    lb_network_free(net);
}
END_TEST

START_TEST(test_ends_of_a_range_take_units_from_their_neighbours)
{
    static const struct { const char *text; double low, high; } cases[] = {
        {"2 mM in 1 .. 5", 0.001, 0.005},           /* the value's */
        {"2 mM in 1 uM .. 5000", 1e-6, 0.005},      /* the other end's */
        {"2 mM in 1000 .. 5000 uM", 0.001, 0.005},
        {"2 mM in 1 uM .. 5 M", 1e-6, 5},
        {"2 in 1 .. 5", 1, 5},                      /* the file's */
        {"2 in 1000 .. 5000 mM", 1, 5},
        {"-2 M within factor 2", -4, -1},
    };
    char text[120];
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        snprintf(text, sizeof text, "x = %s\nA -> A, v = x/s\n", cases[i].text);
        lb_network *net = support_network(text);
        const network_constant *x = find_constant(net, "x");
        assert_close(x->low, cases[i].low, 1e-15, 0);
        assert_close(x->high, cases[i].high, 1e-15, 0);
        ck_assert_str_eq(x->unit, "M");
        lb_network_free(net);
    }
}
END_TEST

/* Two dozen numbers without units in one product: more than a form keeps. */
START_TEST(test_long_products_of_bare_numbers_are_inferred)
{
    enum { COUNT = 24 };
    buffer text;
    buffer_init(&text);
    for (int i = 0; i < COUNT; i++)
        buffer_printf(&text, "c%d = 1\n", i);
    buffer_append(&text, "p = c0");
    for (int i = 1; i < COUNT; i++)
        buffer_printf(&text, "*c%d", i);
    buffer_append(&text, "\nA -> A, k = p\n");
    for (int i = 1; i < COUNT; i++)
        buffer_printf(&text, "y%d = c%d + M\n", i, i);
    lb_network *net = support_network(buffer_get(&text));
    ck_assert_str_eq(find_constant(net, "c0")->unit, "M^-23 s^-1");
    lb_network_free(net);
    buffer_clear(&text);
}
END_TEST

START_TEST(test_rate_constants_may_not_become_negative)
{
    lb_network *net = support_network("k = 1\na = -1\n[X]0 = 1\nX -> Y, k = k\nY -> X, v = a*[Y]\n");
    ck_assert(!find_constant(net, "k")->may_be_negative);
    ck_assert(find_constant(net, "a")->may_be_negative);
    lb_network_free(net);
}
END_TEST

START_TEST(test_signed_species_may_start_below_zero)
{
    lb_network *net = support_network("signed U, W\n[U]0 = -1\n[W] = -2\n-> U, v = -[U]/s + [W]/s\n");
    ck_assert_double_eq(net->species[0].initial_value, -1);
    ck_assert_double_eq(net->species[1].held_value, -2);
    lb_network_free(net);
}
END_TEST

START_TEST(test_files_are_read_and_missing_ones_reported)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    lb_error err;
    ck_assert_int_eq(lb_network_read("/nonexistent/x.mech", NULL, 0, &net, &list, &err), LB_E_IO);
    ck_assert_ptr_nonnull(strstr(err.message, "/nonexistent/x.mech cannot be read"));
    ck_assert(!net && !list);
    ck_assert_int_eq(lb_network_read("/", NULL, 0, &net, &list, &err), LB_E_IO);
    ck_assert(!net && !list);
    char path[] = "/tmp/check_values_XXXXXX";
    int handle = mkstemp(path);
    FILE *out = fdopen(handle, "w");
    fputs("A -> B, k = 2\n", out);
    fclose(out);
    lb_status status = lb_network_read(path, NULL, 0, &net, &list, &err);
    remove(path);
    ck_assert_int_eq(status, LB_OK);
    ck_assert_str_eq(net->file, path);
    ck_assert_str_eq(net->source, "A -> B, k = 2\n");
    lb_network_free(net);
    lb_diagnostics_free(list);
}
END_TEST

Suite *values_suite(void)
{
    Suite *s = suite_create("values");
    TCase *t = tcase_create("values");
    tcase_add_test(t, test_operators_compute_what_c_computes);
    tcase_add_test(t, test_functions_compute_what_c_computes);
    tcase_add_test(t, test_units_take_part_in_arithmetic);
    tcase_add_test(t, test_plain_numbers_are_constants_and_others_are_not);
    tcase_add_test(t, test_feeds_and_held_concentrations_stand_in_expressions);
    tcase_add_test(t, test_initial_concentrations_may_be_derived_or_have_a_range);
    tcase_add_test(t, test_ends_of_a_range_take_units_from_their_neighbours);
    tcase_add_test(t, test_long_products_of_bare_numbers_are_inferred);
    tcase_add_test(t, test_rate_constants_may_not_become_negative);
    tcase_add_test(t, test_signed_species_may_start_below_zero);
    tcase_add_test(t, test_files_are_read_and_missing_ones_reported);
    suite_add_tcase(s, t);
    return s;
}
