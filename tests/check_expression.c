/* The expression graph: sharing, simplification, values, derivatives, text. */
#include <check.h>
#include <complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/expression.h"
#include "support.h"

static expression_graph g;

static void setup(void)
{
    expression_graph_init(&g);
}

static void teardown(void)
{
    expression_graph_clear(&g);
}

static expression num(double value) { return expression_number(&g, value); }
static expression con(int index) { return expression_constant(&g, index); }
static expression sta(int index) { return expression_state(&g, index); }
static expression add(expression a, expression b) { return expression_binary(&g, EXPRESSION_ADD, a, b); }
static expression sub(expression a, expression b) { return expression_binary(&g, EXPRESSION_SUBTRACT, a, b); }
static expression mul(expression a, expression b) { return expression_binary(&g, EXPRESSION_MULTIPLY, a, b); }
static expression quo(expression a, expression b) { return expression_binary(&g, EXPRESSION_DIVIDE, a, b); }
static expression pwr(expression a, expression b) { return expression_binary(&g, EXPRESSION_POWER, a, b); }
static expression neg(expression a) { return expression_unary(&g, EXPRESSION_NEGATE, a); }
static expression fun(expression_kind kind, expression a) { return expression_unary(&g, kind, a); }

/* ---- Building ------------------------------------------------------------------ */

START_TEST(test_equal_expressions_are_one_node)
{
    expression a = add(mul(con(0), sta(1)), num(2));
    size_t count = g.count;
    ck_assert_int_eq(a, add(mul(con(0), sta(1)), num(2)));
    ck_assert_uint_eq(g.count, count);
    ck_assert_int_ne(con(0), sta(0));
    ck_assert_int_ne(num(1), num(2));
}
END_TEST

START_TEST(test_operands_come_before_their_users)
{
    expression e = sta(0);
    for (int i = 0; i < 1000; i++)
        e = add(mul(e, con(i % 7)), num(i));
    for (size_t i = 0; i < g.count; i++)
        if (g.nodes[i].kind > EXPRESSION_STATE)
            ck_assert(g.nodes[i].left < (int)i && g.nodes[i].right < (int)i);
}
END_TEST

START_TEST(test_numbers_are_folded_only_when_finite)
{
    double value;
    ck_assert(expression_is_number(&g, quo(num(1), num(4)), &value) && value == 0.25);
    ck_assert(expression_is_number(&g, fun(EXPRESSION_EXP, num(0)), &value) && value == 1);
    ck_assert(expression_is_number(&g, pwr(num(2), num(10)), &value) && value == 1024);
    ck_assert(!expression_is_number(&g, quo(num(1), num(0)), NULL));
    ck_assert(!expression_is_number(&g, quo(num(0), num(0)), NULL));
    ck_assert(!expression_is_number(&g, fun(EXPRESSION_LN, num(0)), NULL));
    ck_assert(!expression_is_number(&g, mul(num(1e200), num(1e200)), NULL));
    ck_assert(isinf(expression_value(&g, quo(num(1), num(0)), NULL, NULL)));
}
END_TEST

START_TEST(test_neutral_elements_are_dropped)
{
    expression x = sta(0), zero = num(0), one = num(1);
    expression same[] = {add(x, zero), add(zero, x), sub(x, zero), mul(one, x), mul(x, one), quo(x, one), pwr(x, one),
                         neg(neg(x)), mul(neg(x), num(-1)), sub(zero, neg(x))};
    for (size_t i = 0; i < sizeof same / sizeof *same; i++)
        ck_assert_int_eq(same[i], x);
    ck_assert_int_eq(mul(x, zero), zero);
    ck_assert_int_eq(sub(x, x), zero);
    ck_assert_int_eq(quo(zero, x), zero);
    ck_assert_int_eq(pwr(x, zero), one);
    ck_assert_int_eq(neg(sub(x, con(0))), sub(con(0), x));
    ck_assert_int_eq(add(num(-2), x), sub(x, num(2)));
    ck_assert_int_eq(mul(neg(x), con(0)), neg(mul(x, con(0))));
    ck_assert_int_eq(quo(neg(x), neg(con(0))), quo(x, con(0)));
}
END_TEST

START_TEST(test_sums_and_products_keep_their_order)
{
    expression a = con(0), b = con(1), c = con(2);
    ck_assert_int_ne(add(add(a, b), c), add(a, add(b, c)));
    ck_assert_int_ne(add(a, b), add(b, a));
    ck_assert_int_ne(mul(mul(a, b), c), mul(a, mul(b, c)));
}
END_TEST

START_TEST(test_a_root_is_a_power)
{
    ck_assert_int_eq(fun(EXPRESSION_SQRT, sta(0)), pwr(sta(0), num(0.5)));
}
END_TEST

START_TEST(test_missing_operands_spread)
{
    ck_assert_int_eq(add(EXPRESSION_NONE, num(1)), EXPRESSION_NONE);
    ck_assert_int_eq(mul(num(1), EXPRESSION_NONE), EXPRESSION_NONE);
    ck_assert_int_eq(neg(EXPRESSION_NONE), EXPRESSION_NONE);
    ck_assert_int_eq(expression_derivative(&g, EXPRESSION_NONE, EXPRESSION_STATE, 0), EXPRESSION_NONE);
}
END_TEST

START_TEST(test_dependence_is_known)
{
    expression e = add(mul(con(3), sta(2)), fun(EXPRESSION_EXP, con(1)));
    ck_assert(expression_has_state(&g, e));
    ck_assert(!expression_has_state(&g, fun(EXPRESSION_EXP, con(1))));
    ck_assert(expression_depends(&g, e, EXPRESSION_CONSTANT, 1));
    ck_assert(expression_depends(&g, e, EXPRESSION_CONSTANT, 3));
    ck_assert(!expression_depends(&g, e, EXPRESSION_CONSTANT, 2));
    ck_assert(expression_depends(&g, e, EXPRESSION_STATE, 2));
    ck_assert(!expression_depends(&g, e, EXPRESSION_STATE, 3));
}
END_TEST

/* ---- Values ---------------------------------------------------------------------- */

/* The conventions at the head of expression.h. */
START_TEST(test_powers_keep_their_conventions)
{
    ck_assert(expression_power(0, 0) == 1 && expression_power(-3, 0) == 1);
    ck_assert(expression_power(-2, 3) == -8 && expression_power(-2, 2) == 4 && expression_power(-2, -1) == -0.5);
    ck_assert(expression_power(-2, 0.5) == 0 && expression_power(-2, 2.5) == 0 && expression_power(-2, -0.5) == 0);
    ck_assert(expression_power(0, 0.5) == 0 && expression_power(0, 1.5) == 0);
    ck_assert(isinf(expression_power(0, -1)) && isinf(expression_power(0, -0.5)));
    ck_assert(expression_power(9, 0.5) == 3 && expression_power(3, 2) == 9);
    ck_assert(isnan(expression_power(NAN, 0.5)) && isnan(expression_power(NAN, 2)));
    ck_assert(expression_slope(-2, 3) == 12 && expression_slope(0, 1) == 1 && expression_slope(0, 2) == 0);
    ck_assert(expression_slope(0, 0.5) == 0 && expression_slope(-1, 0.5) == 0 && expression_slope(0, -1) == 0);
    ck_assert(expression_slope(0, 0) == 0 && expression_slope(4, 0.5) == 0.25);
    ck_assert(expression_power_log(0, 2) == 0 && expression_power_log(-1, 2) == 0);
    assert_close(expression_power_log(2, 3), 8 * log(2), 1e-15, 0);
}
END_TEST

START_TEST(test_one_value_and_all_values_agree)
{
    double k[] = {2, 3}, x[] = {5, 7}, values[64];
    expression e = add(mul(con(0), pwr(sta(0), con(1))), quo(sta(1), add(sta(0), num(2))));
    expression_evaluate(&g, 0, (int)g.count - 1, NULL, k, x, values);
    ck_assert(values[e] == 2 * 125.0 + 1);
    ck_assert(expression_value(&g, e, k, x) == values[e]);
}
END_TEST

/* ---- Derivatives ------------------------------------------------------------------ */

static double complex complex_value(const expression_node *node, double complex a, double complex b)
{
    switch (node->kind) {
    case EXPRESSION_NUMBER:    return node->value;
    case EXPRESSION_ADD:       return a + b;
    case EXPRESSION_SUBTRACT:  return a - b;
    case EXPRESSION_MULTIPLY:  return a * b;
    case EXPRESSION_DIVIDE:    return a / b;
    case EXPRESSION_NEGATE:    return -a;
    case EXPRESSION_POWER:     return cexp(b * clog(a));
    case EXPRESSION_SLOPE:     return b * cexp((b - 1) * clog(a));
    case EXPRESSION_POWER_LOG: return cexp(b * clog(a)) * clog(a);
    case EXPRESSION_EXP:       return cexp(a);
    case EXPRESSION_LN:        return clog(a);
    case EXPRESSION_LOG10:     return clog(a) / log(10);
    default:                   ck_abort(); return 0;
    }
}

/* Derivative by a complex step (Squire and Trapp, SIAM Rev. 40 (1998) 110). */
static double complex_step(expression e, const double *k, const double *x, expression_kind leaf, int index)
{
    double complex *values = memory_array(g.count, sizeof *values);
    for (int i = 0; i <= e; i++) {
        const expression_node *node = &g.nodes[i];
        if (node->kind == EXPRESSION_CONSTANT || node->kind == EXPRESSION_STATE) {
            values[i] = node->kind == EXPRESSION_STATE ? x[node->left] : k[node->left];
            if (node->kind == leaf && node->left == index)
                values[i] += 1e-100 * I;
        } else {
            values[i] = complex_value(node, node->left < 0 ? 0 : values[node->left],
                                      node->right < 0 ? 0 : values[node->right]);
        }
    }
    double result = cimag(values[e]) / 1e-100;
    memory_free(values);
    return result;
}

static unsigned random_state_;

static int pick(int count)
{
    random_state_ = random_state_ * 1664525u + 1013904223u;
    return (int)((random_state_ >> 16) % (unsigned)count);
}

/* A positive expression of moderate size, so that every power and logarithm is smooth. */
static expression random_positive(int depth)
{
    if (depth == 0)
        return pick(3) == 0 ? num(0.5 + pick(4)) : pick(2) ? sta(pick(2)) : con(pick(2));
    expression a = random_positive(depth - 1), b = random_positive(depth - 1);
    switch (pick(8)) {
    case 0: return add(a, b);
    case 1: return mul(a, quo(num(1), add(num(1), b)));
    case 2: return quo(a, b);
    case 3: return pwr(a, num(pick(7) * 0.5));
    case 4: return pwr(a, quo(b, add(num(1), b)));
    case 5: return fun(EXPRESSION_EXP, neg(quo(a, add(a, b))));
    case 6: return fun(EXPRESSION_LN, add(num(2), a));
    default: return fun(EXPRESSION_LOG10, add(num(3), sub(add(a, b), quo(b, num(2)))));
    }
}

static void check_all_derivatives(expression e, const double *k, const double *x)
{
    for (int leaf = EXPRESSION_CONSTANT; leaf <= EXPRESSION_STATE; leaf++) {
        for (int index = 0; index < 2; index++) {
            expression d = expression_derivative(&g, e, (expression_kind)leaf, index);
            double want = complex_step(e, k, x, (expression_kind)leaf, index);
            double size = fabs(expression_value(&g, e, k, x));
            assert_close(expression_value(&g, d, k, x), want, 1e-10, 1e-12 * size);
        }
    }
}

START_TEST(test_derivatives_agree_with_complex_steps)
{
    const double k[] = {0.7, 1.9}, x[] = {0.4, 2.3};
    for (unsigned seed = 1; seed <= 300; seed++) {
        random_state_ = seed;
        check_all_derivatives(random_positive(1 + (int)seed % 4), k, x);
    }
}
END_TEST

START_TEST(test_second_derivatives_agree_with_complex_steps)
{
    const double k[] = {0.7, 1.9}, x[] = {0.4, 2.3};
    for (unsigned seed = 1; seed <= 100; seed++) {
        random_state_ = seed;
        expression e = random_positive(1 + (int)seed % 3);
        check_all_derivatives(expression_derivative(&g, e, EXPRESSION_STATE, 0), k, x);
        check_all_derivatives(expression_derivative(&g, e, EXPRESSION_CONSTANT, 1), k, x);
    }
}
END_TEST

START_TEST(test_whole_powers_have_plain_derivatives)
{
    expression x = sta(0);
    ck_assert_int_eq(expression_derivative(&g, pwr(x, num(2)), EXPRESSION_STATE, 0), mul(num(2), x));
    ck_assert_int_eq(expression_derivative(&g, pwr(x, num(3)), EXPRESSION_STATE, 0), mul(num(3), pwr(x, num(2))));
    ck_assert_int_eq(expression_derivative(&g, x, EXPRESSION_STATE, 0), num(1));
    ck_assert_int_eq(expression_derivative(&g, x, EXPRESSION_STATE, 1), num(0));
}
END_TEST

/* x^(2^40) by squaring: 40 nodes that would be 2^40 operations as a tree. */
START_TEST(test_derivative_is_linear_in_shared_nodes)
{
    expression e = sta(0);
    for (int i = 0; i < 40; i++)
        e = mul(e, e);
    size_t before = g.count;
    ck_assert_int_ne(expression_derivative(&g, e, EXPRESSION_STATE, 0), EXPRESSION_NONE);
    ck_assert_uint_le(g.count - before, 4 * 40);
    ck_assert_uint_eq((size_t)expression_depends(&g, e, EXPRESSION_STATE, 0), 1);
}
END_TEST

/* ---- Depth ------------------------------------------------------------------------- */

enum { DEEP = 100000 };

static expression deep_chain(bool to_the_right)
{
    expression e = sta(0);
    for (int i = 0; i < DEEP; i++)
        e = to_the_right ? add(con(0), fun(EXPRESSION_EXP, neg(e))) : sub(mul(e, con(0)), con(1));
    return e;
}

static const char *letter(const void *context, expression_kind leaf, int index)
{
    (void)context;
    static const char *const constants[] = {"k", "m", "n"}, *const states[] = {"[X]", "[Y]"};
    return leaf == EXPRESSION_STATE ? states[index] : constants[index];
}

START_TEST(test_deep_chains_do_not_overflow)
{
    const double k[] = {0.5, 1}, x[] = {1};
    for (int right = 0; right < 2; right++) {
        expression e = deep_chain(right);
        ck_assert(isfinite(expression_value(&g, e, k, x)));
        expression d = expression_derivative(&g, e, EXPRESSION_STATE, 0);
        ck_assert(isfinite(expression_value(&g, d, k, x)));
        unsigned char *needed = memory_zeroed(g.count, 1);
        expression_mark(&g, e, needed);
        ck_assert(needed[sta(0)]);
        memory_free(needed);
        buffer text;
        buffer_init(&text);
        expression_write(&g, e, letter, NULL, &text);
        ck_assert_int_eq(buffer_status(&text), LB_OK);
        buffer_clear(&text);
    }
}
END_TEST

START_TEST(test_mark_finds_exactly_what_is_below)
{
    expression other = mul(con(2), sta(1));
    expression e = sta(0);
    for (int i = 0; i < 500; i++)
        e = add(mul(con(0), num(i)), neg(quo(num(i), e)));
    int *list;
    size_t length, marked = 0;
    ck_assert_int_eq(expression_below(&g, e, &list, &length), LB_OK);
    unsigned char *needed = memory_zeroed(g.count, 1);
    expression_mark(&g, e, needed);
    for (size_t i = 0; i < g.count; i++)
        marked += needed[i];
    ck_assert_uint_eq(marked, length);
    for (size_t i = 0; i < length; i++)
        ck_assert(needed[list[i]]);
    ck_assert(!needed[other]);
    memory_free(needed);
    memory_free(list);
}
END_TEST

/* ---- Text ---------------------------------------------------------------------------- */

static void assert_text(expression e, const char *want)
{
    buffer text;
    buffer_init(&text);
    expression_write(&g, e, letter, NULL, &text);
    ck_assert_str_eq(buffer_get(&text), want);
    buffer_clear(&text);
}

START_TEST(test_text_has_only_the_parentheses_it_needs)
{
    expression k = con(0), m = con(1), n = con(2), x = sta(0), y = sta(1);
    assert_text(mul(mul(k, pwr(x, num(2))), y), "k*[X]^2*[Y]");
    assert_text(add(add(k, m), n), "k + m + n");
    assert_text(add(k, add(m, n)), "k + (m + n)");
    assert_text(sub(k, sub(m, n)), "k - (m - n)");
    assert_text(mul(add(k, m), n), "(k + m)*n");
    assert_text(quo(k, mul(m, n)), "k/(m*n)");
    assert_text(mul(quo(k, m), n), "k/m*n");
    assert_text(mul(k, quo(m, n)), "k*(m/n)");
    assert_text(quo(mul(k, x), add(m, x)), "k*[X]/(m + [X])");
    assert_text(pwr(pwr(k, m), n), "(k^m)^n");
    assert_text(pwr(k, pwr(m, n)), "k^(m^n)");
    assert_text(pwr(num(10), neg(k)), "10^(-k)");
    assert_text(pwr(x, num(-1)), "[X]^(-1)");
    assert_text(neg(mul(k, m)), "-k*m");
    assert_text(neg(add(k, m)), "-(k + m)");
    assert_text(pwr(neg(k), num(2)), "(-k)^2");
    assert_text(mul(num(-2), k), "-2*k");
    assert_text(mul(k, num(-2)), "k*(-2)");
    assert_text(fun(EXPRESSION_EXP, neg(quo(k, m))), "exp(-k/m)");
    assert_text(expression_derivative(&g, pwr(x, num(0.5)), EXPRESSION_STATE, 0), "0.5*[X]^(0.5 - 1)");
    assert_text(expression_derivative(&g, pwr(x, k), EXPRESSION_CONSTANT, 0), "[X]^k*ln([X])");
}
END_TEST

START_TEST(test_numbers_are_short_and_read_back)
{
    assert_text(num(0.1), "0.1");
    assert_text(num(1e-5), "1e-5");
    assert_text(num(1e20), "1e20");
    assert_text(num(6.02214076e23), "6.02214076e23");
    assert_text(num(100000), "100000");
    double values[] = {1.0 / 3, 0.1 + 0.2, 5e-324, 1.7976931348623157e308, 123456789.123456789};
    for (size_t i = 0; i < sizeof values / sizeof *values; i++) {
        buffer text;
        buffer_init(&text);
        expression_write_number(values[i], &text);
        ck_assert(strtod(buffer_get(&text), NULL) == values[i]);
        buffer_clear(&text);
    }
}
END_TEST

START_TEST(test_text_of_shared_parts_is_cut)
{
    expression e = sta(0);
    for (int i = 0; i < 60; i++)
        e = mul(e, e);
    buffer text;
    buffer_init(&text);
    expression_write(&g, e, letter, NULL, &text);
    ck_assert(strstr(buffer_get(&text), "...") != NULL);
    ck_assert_uint_lt(strlen(buffer_get(&text)), 20 * EXPRESSION_TEXT_NODES);
    buffer_clear(&text);
}
END_TEST

/* ---- Memory ----------------------------------------------------------------------------- */

START_TEST(test_every_failed_allocation_is_reported)
{
    bool succeeded = false;
    for (long after = 0; !succeeded; after++) {
        expression_graph_clear(&g);
        memory_fail_after(after);
        expression e = sta(0);
        for (int i = 0; i < 50; i++)
            e = add(mul(e, con(i)), pwr(e, con(0)));
        expression d = expression_derivative(&g, e, EXPRESSION_STATE, 0);
        double value = d == EXPRESSION_NONE ? NAN : expression_value(&g, fun(EXPRESSION_EXP, num(1)), NULL, NULL);
        memory_fail_after(-1);
        succeeded = d != EXPRESSION_NONE && !isnan(value);
        ck_assert_int_lt(after, 10000);
    }
}
END_TEST

Suite *expression_suite(void)
{
    Suite *suite = suite_create("expression");
    TCase *all = tcase_create("expression");
    tcase_set_timeout(all, 60);
    tcase_add_checked_fixture(all, setup, teardown);
    tcase_add_test(all, test_equal_expressions_are_one_node);
    tcase_add_test(all, test_operands_come_before_their_users);
    tcase_add_test(all, test_numbers_are_folded_only_when_finite);
    tcase_add_test(all, test_neutral_elements_are_dropped);
    tcase_add_test(all, test_sums_and_products_keep_their_order);
    tcase_add_test(all, test_a_root_is_a_power);
    tcase_add_test(all, test_missing_operands_spread);
    tcase_add_test(all, test_dependence_is_known);
    tcase_add_test(all, test_powers_keep_their_conventions);
    tcase_add_test(all, test_one_value_and_all_values_agree);
    tcase_add_test(all, test_derivatives_agree_with_complex_steps);
    tcase_add_test(all, test_second_derivatives_agree_with_complex_steps);
    tcase_add_test(all, test_whole_powers_have_plain_derivatives);
    tcase_add_test(all, test_derivative_is_linear_in_shared_nodes);
    tcase_add_test(all, test_deep_chains_do_not_overflow);
    tcase_add_test(all, test_mark_finds_exactly_what_is_below);
    tcase_add_test(all, test_text_has_only_the_parentheses_it_needs);
    tcase_add_test(all, test_numbers_are_short_and_read_back);
    tcase_add_test(all, test_text_of_shared_parts_is_cut);
    tcase_add_test(all, test_every_failed_allocation_is_reported);
    suite_add_tcase(suite, all);
    return suite;
}
