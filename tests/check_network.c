/* Building networks: power laws recognised, net changes, texts, tanks, patterns. */
#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/network.h"
#include "support.h"

static lb_network *net;
static expression_graph *g;
static int X, Y, A, Z;                      /* species; A is held */
static expression k, f, x, y;               /* constants and states */

/* X, Y, A (held at [A]), Z; constants k, f, [A]. */
static void setup(void)
{
    net = network_new();
    g = &net->graph;
    k = expression_constant(g, network_add_constant(net, "k", CONSTANT_NAMED, 2));
    f = expression_constant(g, network_add_constant(net, "f", CONSTANT_NAMED, 0.25));
    X = network_add_species(net, "X", ROLE_DYNAMIC);
    Y = network_add_species(net, "Y", ROLE_DYNAMIC);
    A = network_add_species(net, "A", ROLE_HELD);
    Z = network_add_species(net, "Z-", ROLE_DYNAMIC);
    net->species[A].held = expression_constant(g, network_add_constant(net, "[A]", CONSTANT_HELD, 3));
    x = expression_state(g, 0);
    y = expression_state(g, 1);
}

static void teardown(void)
{
    lb_network_free(net);
}

static expression num(double value) { return expression_number(g, value); }
static expression two(expression_kind kind, expression a, expression b) { return expression_binary(g, kind, a, b); }
static expression mul(expression a, expression b) { return two(EXPRESSION_MULTIPLY, a, b); }
static expression pwr(expression a, double n) { return two(EXPRESSION_POWER, a, num(n)); }

static void term(int reaction, bool is_product, int species, int64_t coefficient)
{
    ck_assert_int_ge(network_add_term(net, reaction, is_product, species, coefficient, 1, EXPRESSION_NONE), 0);
}

static const network_step *mass_action(int reaction, expression constant)
{
    int step = network_add_mass_action(net, reaction, STEP_FORWARD, constant);
    ck_assert_int_ge(step, 0);
    return &net->steps[step];
}

/* ---- Recognition ---------------------------------------------------------------- */

static const network_step *step_of(expression rate)
{
    int reaction = network_add_reaction(net, "R", false);
    term(reaction, true, X, 1);
    int step = network_add_step(net, reaction, STEP_FORWARD, rate);
    ck_assert_int_ge(step, 0);
    return &net->steps[step];
}

/* Recognised with these orders of X and Y and this value of the factor. */
static void assert_power_law(expression rate, double order_x, double order_y, double factor)
{
    const double constants[] = {2, 0.25, 3};
    const network_step *step = step_of(rate);
    ck_assert(step->is_power_law);
    double orders[2] = {0, 0};
    for (int i = 0; i < step->order_count; i++) {
        ck_assert(step->orders[i].order != 0);
        orders[step->orders[i].state] = step->orders[i].order;
    }
    ck_assert(orders[0] == order_x && orders[1] == order_y);
    ck_assert(!expression_has_state(g, step->factor));
    assert_close(expression_value(g, step->factor, constants, NULL), factor, 1e-15, 0);
}

static void assert_written(int reaction,
                           void (*write)(const lb_network *, const network_reaction *, buffer *), const char *want)
{
    buffer text;
    buffer_init(&text);
    write(net, &net->reactions[reaction], &text);
    ck_assert_str_eq(buffer_get(&text), want);
    buffer_clear(&text);
}

START_TEST(test_products_of_powers_are_recognised)
{
    assert_power_law(k, 0, 0, 2);
    assert_power_law(mul(k, x), 1, 0, 2);
    assert_power_law(mul(mul(k, pwr(x, 0.5)), y), 0.5, 1, 2);
    assert_power_law(mul(mul(x, k), mul(f, x)), 2, 0, 0.5);
    assert_power_law(two(EXPRESSION_DIVIDE, mul(k, pwr(x, 2)), y), 2, -1, 2);
    assert_power_law(two(EXPRESSION_DIVIDE, x, mul(k, y)), 1, -1, 0.5);
    assert_power_law(two(EXPRESSION_DIVIDE, x, num(4)), 1, 0, 0.25);
    assert_power_law(expression_unary(g, EXPRESSION_NEGATE, mul(k, x)), 1, 0, -2);
    assert_power_law(expression_unary(g, EXPRESSION_SQRT, x), 0.5, 0, 1);
    assert_power_law(pwr(mul(k, mul(x, y)), 3), 3, 3, 8);
    assert_power_law(pwr(two(EXPRESSION_DIVIDE, x, k), -2), -2, 0, 4);
    assert_power_law(pwr(expression_unary(g, EXPRESSION_NEGATE, x), 2), 2, 0, 1);
    assert_power_law(pwr(expression_unary(g, EXPRESSION_NEGATE, x), 3), 3, 0, -1);
    assert_power_law(two(EXPRESSION_DIVIDE, mul(k, x), x), 0, 0, 2);
    assert_power_law(mul(two(EXPRESSION_ADD, k, f), x), 1, 0, 2.25);
    assert_power_law(two(EXPRESSION_POWER, two(EXPRESSION_ADD, k, f), num(2)), 0, 0, 2.25 * 2.25);
}
END_TEST

START_TEST(test_other_laws_stay_general)
{
    expression laws[] = {
        two(EXPRESSION_DIVIDE, mul(k, x), two(EXPRESSION_ADD, f, x)),
        two(EXPRESSION_ADD, x, y),
        two(EXPRESSION_POWER, x, f),        /* the order is a constant that may turn */
        expression_unary(g, EXPRESSION_EXP, x),
        pwr(mul(x, y), 0.5),                /* (-1 * -1)^0.5 is not (-1)^0.5 twice */
        pwr(pwr(x, 2), 0.5),                /* |x|, not x */
        pwr(pwr(x, 0.5), 2),                /* 0 below zero, not x */
    };
    for (size_t i = 0; i < sizeof laws / sizeof *laws; i++) {
        const network_step *step = step_of(laws[i]);
        ck_assert_msg(!step->is_power_law, "law %zu", i);
        ck_assert_int_eq(step->factor, EXPRESSION_NONE);
        ck_assert_int_eq(step->rate, laws[i]);
    }
}
END_TEST

START_TEST(test_shared_products_do_not_explode)
{
    expression e = x;
    for (int i = 0; i < 60; i++)
        e = mul(e, e);
    ck_assert(!step_of(e)->is_power_law);
}
END_TEST

START_TEST(test_rate_law_with_the_orders_of_its_reactants_is_mass_action)
{
    for (int right = 0; right < 2; right++) {
        int reaction = network_add_reaction(net, "R", false);
        term(reaction, false, X, 2);
        term(reaction, false, Y, 1);
        term(reaction, true, Z, 1);
        int step = network_add_step(net, reaction, STEP_FORWARD, mul(mul(k, pwr(x, right ? 2 : 1)), y));
        ck_assert(net->steps[step].is_power_law);
        ck_assert_int_eq(net->steps[step].is_mass_action, right);
    }
}
END_TEST

/* ---- Mass action and net changes ----------------------------------------------------- */

static void assert_entry(const network_step *step, int place, int state, int64_t numerator, int64_t denominator)
{
    ck_assert_int_lt(place, step->entry_count);
    ck_assert_int_eq(step->entries[place].state, state);
    ck_assert_int_eq(step->entries[place].expression, EXPRESSION_NONE);
    ck_assert_int_eq(step->entries[place].num, numerator);
    ck_assert_int_eq(step->entries[place].den, denominator);
}

START_TEST(test_reversible_mass_action)
{
    int reaction = network_add_reaction(net, "R3", true);
    term(reaction, false, X, 2);
    term(reaction, false, A, 1);
    term(reaction, true, Y, 1);
    term(reaction, true, X, 1);
    int forward = network_add_mass_action(net, reaction, STEP_FORWARD, k);
    int reverse = network_add_mass_action(net, reaction, STEP_REVERSE, f);
    ck_assert_int_eq(network_finish(net), LB_OK);
    const network_step *there = &net->steps[forward], *back = &net->steps[reverse];
    ck_assert(there->is_mass_action && there->is_power_law && back->is_mass_action);
    ck_assert_int_eq(there->rate_constant, k);
    ck_assert_str_eq(there->name, "R3.forward");
    ck_assert_str_eq(back->name, "R3.reverse");
    ck_assert_int_eq(there->order_count, 1);
    ck_assert(there->orders[0].state == 0 && there->orders[0].order == 2);
    ck_assert_int_eq(back->order_count, 2);
    ck_assert_int_eq(there->entry_count, 2);
    assert_entry(there, 0, 0, -1, 1);
    assert_entry(there, 1, 1, 1, 1);
    assert_entry(back, 0, 0, 1, 1);
    assert_entry(back, 1, 1, -1, 1);
    assert_written(reaction, network_write_equation, "2 X + A <-> Y + X");
    assert_written(reaction, network_write_rate, "k*[A]*[X]^2 - f*[Y]*[X]");
    ck_assert_int_eq(net->reactions[reaction].step_count, 2);
    ck_assert(net->is_open);
}
END_TEST

START_TEST(test_catalysts_cancel_and_equal_species_merge)
{
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    term(reaction, false, Y, 1);
    term(reaction, false, X, 1);
    term(reaction, true, Y, 1);
    term(reaction, true, Z, 1);
    const network_step *step = mass_action(reaction, k);
    ck_assert_int_eq(network_finish(net), LB_OK);
    assert_written(reaction, network_write_equation, "2 X + Y -> Y + \"Z-\"");
    ck_assert_int_eq(step->entry_count, 2);
    assert_entry(step, 0, 0, -2, 1);
    assert_entry(step, 1, 2, 1, 1);
}
END_TEST

START_TEST(test_coefficients_are_exact_or_expressions)
{
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    network_add_term(net, reaction, true, X, 0, 1, f);
    network_add_term(net, reaction, true, Y, 0, 1, two(EXPRESSION_DIVIDE, num(1), num(3)));
    network_add_term(net, reaction, true, Z, 1, 4, EXPRESSION_NONE);
    network_add_term(net, reaction, true, Z, 1, 6, EXPRESSION_NONE);
    const network_step *step = mass_action(reaction, k);
    ck_assert_int_eq(network_finish(net), LB_OK);
    assert_written(reaction, network_write_equation, "X -> (f) X + (1/3) Y + (5/12) \"Z-\"");
    ck_assert_int_eq(step->entries[0].expression, two(EXPRESSION_SUBTRACT, f, num(1)));
    assert_entry(step, 1, 1, 1, 3);
    assert_entry(step, 2, 2, 5, 12);
}
END_TEST

/* The language has no exponent in a coefficient. */
START_TEST(test_coefficients_are_written_without_exponents)
{
    int reaction = network_add_reaction(net, "R1", false);
    network_add_term(net, reaction, false, X, 1, 1000000, EXPRESSION_NONE);
    network_add_term(net, reaction, true, Y, 25, 2, EXPRESSION_NONE);
    network_add_term(net, reaction, true, Z, 3000000, 1, EXPRESSION_NONE);
    network_add_mass_action(net, reaction, STEP_FORWARD, k);
    ck_assert_int_eq(network_finish(net), LB_OK);
    assert_written(0, network_write_equation, "0.000001 X -> 12.5 Y + 3000000 \"Z-\"");
}
END_TEST

/* Coefficients that leave 64 bits when added become numbers instead of wrong fractions. */
START_TEST(test_coefficients_do_not_overflow)
{
    int reaction = network_add_reaction(net, "R1", false);
    network_add_term(net, reaction, true, X, INT64_MAX / 2, 1000000007, EXPRESSION_NONE);
    network_add_term(net, reaction, true, X, INT64_MAX / 2, 998244353, EXPRESSION_NONE);
    const network_step *step = mass_action(reaction, k);
    double want = (double)(INT64_MAX / 2) / 1000000007 + (double)(INT64_MAX / 2) / 998244353;
    ck_assert_int_ne(step->entries[0].expression, EXPRESSION_NONE);
    assert_close(expression_value(g, step->entries[0].expression, NULL, NULL), want, 1e-15, 0);
}
END_TEST

START_TEST(test_a_rate_constant_of_zero_keeps_the_orders)
{
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    term(reaction, false, Y, 1);
    const network_step *step = mass_action(reaction, num(0));
    ck_assert_int_eq(step->order_count, 2);
    ck_assert(step->is_mass_action);
}
END_TEST

START_TEST(test_sources_and_sinks_open_a_network)
{
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    term(reaction, true, Y, 1);
    network_add_mass_action(net, reaction, STEP_FORWARD, k);
    ck_assert_int_eq(network_finish(net), LB_OK);
    ck_assert(!net->is_open);
    teardown();
    setup();
    reaction = network_add_reaction(net, "R1", false);
    term(reaction, true, Y, 1);
    network_add_mass_action(net, reaction, STEP_FORWARD, k);
    ck_assert_int_eq(network_finish(net), LB_OK);
    ck_assert(net->is_open);
    assert_written(0, network_write_equation, "-> Y");
    assert_written(0, network_write_rate, "k");
}
END_TEST

/* ---- Tank, values, names -------------------------------------------------------------- */

START_TEST(test_a_tank_adds_flows_for_what_is_not_retained)
{
    expression residence = expression_constant(g, network_add_constant(net, "residence", CONSTANT_RESIDENCE, 10));
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    term(reaction, true, Y, 1);
    network_add_mass_action(net, reaction, STEP_FORWARD, k);
    net->species[X].feed = f;
    net->species[Y].feed = num(0);
    net->species[Z].is_retained = true;
    ck_assert_int_eq(network_set_tank(net, residence), 0);
    ck_assert_int_eq(network_finish(net), LB_OK);
    ck_assert_int_eq(net->reaction_steps, 1);
    ck_assert_int_eq(net->step_count, 4);
    ck_assert_str_eq(net->steps[1].name, "[X] inflow");
    ck_assert_str_eq(net->steps[2].name, "[X] outflow");
    ck_assert_str_eq(net->steps[3].name, "[Y] outflow");
    assert_entry(&net->steps[1], 0, 0, 1, 1);
    assert_entry(&net->steps[2], 0, 0, -1, 1);
    ck_assert_int_eq(net->steps[1].order_count, 0);
    ck_assert_int_eq(net->steps[2].order_count, 1);
    ck_assert(net->is_open && net->is_tank);
    ck_assert(net->species[X].feed_value == 0.25);
}
END_TEST

START_TEST(test_values_and_names_of_the_file_are_filled_in)
{
    expression k5 = mul(num(0.1), k);
    network_add_definition(net, false, "k5", k5);
    network_add_definition(net, true, "ratio", two(EXPRESSION_DIVIDE, x, y));
    int T = network_add_constant(net, "temperature", CONSTANT_TEMPERATURE, 298.15);
    net->species[X].initial = two(EXPRESSION_ADD, k, f);
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    network_add_mass_action(net, reaction, STEP_FORWARD, k5);
    reaction = network_add_reaction(net, "R2", false);
    term(reaction, true, Y, 1);
    network_add_step(net, reaction, STEP_FORWARD, expression_unary(g, EXPRESSION_EXP, two(EXPRESSION_DIVIDE, x, y)));
    ck_assert_int_eq(network_finish(net), LB_OK);
    ck_assert(net->species[X].initial_value == 2.25);
    ck_assert(net->species[Y].initial_value == 0);
    ck_assert(isnan(net->species[A].initial_value) && net->species[A].held_value == 3);
    ck_assert(net->derived[0].number == 0.2);
    ck_assert(isnan(net->readings[0].number));
    assert_written(0, network_write_rate, "k5*[X]");
    assert_written(1, network_write_rate, "exp(ratio)");
    ck_assert_str_eq(network_leaf_name(net, EXPRESSION_CONSTANT, T), "T");
    ck_assert_str_eq(network_leaf_name(net, EXPRESSION_STATE, 2), "[Z-]");
    buffer text;
    buffer_init(&text);
    network_write(net, k5, true, &text);
    ck_assert_str_eq(buffer_get(&text), "0.1*k");
    buffer_clear(&text);
}
END_TEST

START_TEST(test_names_are_quoted_when_they_must_be)
{
    static const char *const cases[][2] = {
        {"X", "X"}, {"Br-", "\"Br-\""}, {"in", "\"in\""}, {"2X", "\"2X\""}, {"\xce\xb1_1", "\xce\xb1_1"},
        {"H\xe2\x82\x82O", "\"H\xe2\x82\x82O\""},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        buffer text;
        buffer_init(&text);
        network_write_name(cases[i][0], &text);
        ck_assert_str_eq(buffer_get(&text), cases[i][1]);
        buffer_clear(&text);
    }
}
END_TEST

/* ---- Pattern ---------------------------------------------------------------------------- */

START_TEST(test_pattern_has_what_a_rate_depends_on)
{
    int reaction = network_add_reaction(net, "R1", false);
    term(reaction, false, X, 1);
    term(reaction, true, Z, 1);
    network_add_step(net, reaction, STEP_FORWARD, two(EXPRESSION_DIVIDE, x, two(EXPRESSION_ADD, k, y)));
    ck_assert_int_eq(network_finish(net), LB_OK);
    int *start, *row;
    ck_assert_int_eq(network_pattern(net, &start, &row), LB_OK);
    const int want_start[] = {0, 2, 4, 4}, want_row[] = {0, 2, 0, 2};
    ck_assert_mem_eq(start, want_start, sizeof want_start);
    ck_assert_mem_eq(row, want_row, sizeof want_row);
    memory_free(start);
    memory_free(row);
}
END_TEST

/* ---- Memory -------------------------------------------------------------------------------- */

/* A network with a bit of everything; false when something failed. */
static bool build_all(lb_network *n)
{
    expression_graph *graph = &n->graph;
    int a = network_add_species(n, "A", ROLE_DYNAMIC), b = network_add_species(n, "B", ROLE_DYNAMIC);
    int c = network_add_constant(n, "c", CONSTANT_NAMED, 2);
    if (a < 0 || b < 0 || c < 0)
        return false;
    expression e = expression_constant(graph, c), s = expression_state(graph, 0);
    if (network_add_definition(n, false, "d", expression_binary(graph, EXPRESSION_ADD, e, s)) < 0)
        return false;
    int r = network_add_reaction(n, "R1", true);
    if (r < 0 || network_add_term(n, r, false, a, 2, 1, EXPRESSION_NONE) < 0 ||
        network_add_term(n, r, true, b, 0, 1, e) < 0 || network_add_term(n, r, true, a, 1, 1, EXPRESSION_NONE) < 0 ||
        network_add_mass_action(n, r, STEP_FORWARD, e) < 0 ||
        network_add_step(n, r, STEP_REVERSE, expression_binary(graph, EXPRESSION_MULTIPLY, e, s)) < 0)
        return false;
    n->species[a].feed = e;
    if (e == EXPRESSION_NONE || network_set_tank(n, e) < 0 || network_finish(n) != LB_OK)
        return false;
    int *start, *row;
    if (network_pattern(n, &start, &row) != LB_OK)
        return false;
    memory_free(start);
    memory_free(row);
    return true;
}

START_TEST(test_every_failed_allocation_is_reported)
{
    bool succeeded = false;
    long after = 0;
    for (; !succeeded; after++) {
        memory_fail_after(after);
        lb_network *n = network_new();
        succeeded = n && build_all(n);
        memory_fail_after(-1);
        lb_network_free(n);
    }
    ck_assert_int_gt(after, 40);
}
END_TEST

Suite *network_suite(void)
{
    Suite *suite = suite_create("network");
    TCase *all = tcase_create("network");
    tcase_add_checked_fixture(all, setup, teardown);
    tcase_add_test(all, test_products_of_powers_are_recognised);
    tcase_add_test(all, test_other_laws_stay_general);
    tcase_add_test(all, test_shared_products_do_not_explode);
    tcase_add_test(all, test_rate_law_with_the_orders_of_its_reactants_is_mass_action);
    tcase_add_test(all, test_reversible_mass_action);
    tcase_add_test(all, test_catalysts_cancel_and_equal_species_merge);
    tcase_add_test(all, test_coefficients_are_exact_or_expressions);
    tcase_add_test(all, test_coefficients_are_written_without_exponents);
    tcase_add_test(all, test_coefficients_do_not_overflow);
    tcase_add_test(all, test_a_rate_constant_of_zero_keeps_the_orders);
    tcase_add_test(all, test_sources_and_sinks_open_a_network);
    tcase_add_test(all, test_a_tank_adds_flows_for_what_is_not_retained);
    tcase_add_test(all, test_values_and_names_of_the_file_are_filled_in);
    tcase_add_test(all, test_names_are_quoted_when_they_must_be);
    tcase_add_test(all, test_pattern_has_what_a_rate_depends_on);
    tcase_add_test(all, test_every_failed_allocation_is_reported);
    suite_add_tcase(suite, all);
    return suite;
}
