/* Stability of steady states: linear systems whose eigenvalues are known, their
 * names, their bounds, their modes. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/stability.h"
#include "base/memory.h"
#include "support.h"

Suite *stability_suite(void);

enum { MOST = 4 };

/* dx/dt = A x, classified at the origin; A row after row. */
struct linear {
    lb_network *network;
    lb_system *system;
    lb_evaluator *evaluator;
    double x[MOST];
    lb_steady_state state;
};

static struct linear classify(int n, const double *A)
{
    struct linear l = {0};
    char text[2000];
    int at = snprintf(text, sizeof text, "units none\nzero = 0\nsigned X0");
    for (int i = 1; i < n; i++)
        at += snprintf(text + at, sizeof text - (size_t)at, ", X%d", i);
    for (int i = 0; i < n; i++) {
        at += snprintf(text + at, sizeof text - (size_t)at, "\n-> X%d, v = zero", i);
        for (int j = 0; j < n; j++)
            at += snprintf(text + at, sizeof text - (size_t)at, " + (zero + (%.17g))*[X%d]", A[i * n + j], j);
    }
    at += snprintf(text + at, sizeof text - (size_t)at, "\n");
    ck_assert(at < (int)sizeof text);
    lb_error err = {.code = LB_OK};
    l.network = support_network(text);
    ck_assert_msg(lb_system_new(l.network, &l.system, &err) == LB_OK, "%s", err.message);
    ck_assert_int_eq(l.system->rank, n);
    ck_assert_int_eq(lb_evaluator_new(l.system, &l.evaluator, &err), LB_OK);
    ck_assert_int_eq(lb_evaluator_bind(l.evaluator, NULL, &err), LB_OK);
    l.state.x = l.x;
    ck_assert_msg(stability_classify(l.evaluator, &l.state, &err) == LB_OK, "%s", err.message);
    return l;
}

static void linear_clear(struct linear *l)
{
    memory_free(l->state.eigenvalues);
    memory_free(l->state.modes);
    lb_evaluator_free(l->evaluator);
    lb_system_free(l->system);
    lb_network_free(l->network);
}

/* ---- Names ------------------------------------------------------------------------- */

static const struct named {
    int n;
    double A[MOST * MOST];
    lb_kind kind;
    lb_answer stable;
} named[] = {
    {1, {-2}, LB_STABLE_NODE, LB_YES},
    {1, {2}, LB_UNSTABLE_NODE, LB_NO},
    {1, {0}, LB_KIND_UNDECIDED, LB_UNDECIDED},
    {2, {-1, 0, 0, -3}, LB_STABLE_NODE, LB_YES},
    {2, {-1, 2, -2, -1}, LB_STABLE_FOCUS, LB_YES},
    {2, {1, 0, 0, 3}, LB_UNSTABLE_NODE, LB_NO},
    {2, {1, 2, -2, 1}, LB_UNSTABLE_FOCUS, LB_NO},
    {2, {1, 0, 0, -1}, LB_SADDLE, LB_NO},
    {2, {0, 3, -3, 0}, LB_CENTRE, LB_UNDECIDED},
    {2, {0, 1, -9, 0}, LB_CENTRE, LB_UNDECIDED},
    {2, {0, 0, 0, -1}, LB_KIND_UNDECIDED, LB_UNDECIDED},
    {2, {0, 0, 0, 1}, LB_KIND_UNDECIDED, LB_NO},
    {3, {1, 2, 0, -2, 1, 0, 0, 0, -1}, LB_SADDLE_FOCUS, LB_NO},
    {3, {-1, 2, 0, -2, -1, 0, 0, 0, 1}, LB_SADDLE_FOCUS, LB_NO},
    {3, {-1, 2, 0, -2, -1, 0, 0, 0, -9}, LB_STABLE_FOCUS, LB_YES},
    {3, {0, 2, 0, -2, 0, 0, 0, 0, -1}, LB_KIND_UNDECIDED, LB_UNDECIDED},
    {3, {0, 2, 0, -2, 0, 0, 0, 0, 1}, LB_KIND_UNDECIDED, LB_NO},
};
enum { NAMED = sizeof named / sizeof *named };

START_TEST(test_kind_follows_the_eigenvalues)
{
    const struct named *c = &named[_i];
    struct linear l = classify(c->n, c->A);
    ck_assert_msg(l.state.kind == c->kind, "case %d is a %s, wanted %s", _i, lb_kind_text(l.state.kind),
                  lb_kind_text(c->kind));
    ck_assert_int_eq(l.state.stable, c->stable);
    ck_assert(l.state.routh_hurwitz_agrees);
    linear_clear(&l);
}
END_TEST

START_TEST(test_every_kind_has_its_own_words)
{
    for (int a = LB_STABLE_NODE; a <= LB_KIND_FIXED; a++)
        for (int b = LB_STABLE_NODE; b < a; b++)
            ck_assert_str_ne(lb_kind_text((lb_kind)a), lb_kind_text((lb_kind)b));
    ck_assert_str_eq(lb_kind_text(LB_SADDLE_FOCUS), "saddle-focus");
}
END_TEST

/* ---- Bounds ------------------------------------------------------------------------- */

/* A double eigenvalue that rounding splits into a pair is no focus: triangular
 * [-1 1; 0 -1], turned by the similarity with [1 0.3; 0.7 1.21] (determinant 1). */
START_TEST(test_split_double_eigenvalue_is_a_node)
{
    const double A[] = {-1.7, 1.0, -0.49, -0.3};
    struct linear l = classify(2, A);
    ck_assert_int_eq(l.state.kind, LB_STABLE_NODE);
    ck_assert(l.state.real_part_error > 1e-10 && l.state.real_part_error < 1e-6);
    linear_clear(&l);
}
END_TEST

/* Real parts 1e-9 beside entries of 1: far above rounding, so decided; beside
 * 1e9 they are within it. */
START_TEST(test_sign_is_decided_down_to_rounding)
{
    const double decided[] = {-1e-9, 1, -1, -1e-9}, undecided[] = {-1e-9, 1e9, -1e9, -1e-9};
    struct linear l = classify(2, decided);
    ck_assert_int_eq(l.state.kind, LB_STABLE_FOCUS);
    linear_clear(&l);
    l = classify(2, undecided);
    ck_assert_int_eq(l.state.stable, LB_UNDECIDED);
    linear_clear(&l);
}
END_TEST

/* Species at 1e-9 and at 1 scale rows and columns, not eigenvalues: -1 +- 2i and
 * their bound stay. */
START_TEST(test_bound_does_not_grow_with_bad_scales)
{
    const double A[] = {-1, 2e-12, -2e12, -1};
    struct linear l = classify(2, A);
    ck_assert_int_eq(l.state.kind, LB_STABLE_FOCUS);
    assert_close(l.state.eigenvalues[0].re, -1.0, 1e-14, 0);
    assert_close(l.state.eigenvalues[0].im, 2.0, 1e-14, 0);
    ck_assert(l.state.real_part_error < 1e-13);
    linear_clear(&l);
}
END_TEST

/* [-1 100 0; 0 -2 100; 0 0 -3] turned by the integer matrix [1 0 0; 1 1 0; 2 3 1],
 * exactly: eigenvalues -1, -2, -3 with conditions of thousands. */
START_TEST(test_bound_covers_the_true_error)
{
    const double A[] = {-101, 100, 0, 1, -202, 100, 101, -697, 297};
    struct linear l = classify(3, A);
    ck_assert_int_eq(l.state.kind, LB_STABLE_NODE);
    assert_close(l.state.eigenvalues[0].re, -1.0, 0, l.state.real_part_error);
    ck_assert(l.state.real_part_error > 1e-12 && l.state.real_part_error < 1e-7);
    linear_clear(&l);
}
END_TEST

/* A slow mode beside a fast one keeps its own bound. */
START_TEST(test_each_mode_has_its_own_bound)
{
    const double A[] = {-1e-6, 0, 0, -1e12};
    struct linear l = classify(2, A);
    ck_assert_int_eq(l.state.kind, LB_STABLE_NODE);
    ck_assert(l.state.modes[0].error < 1e-20 && l.state.modes[1].error > 1e-5);
    linear_clear(&l);
}
END_TEST

/* An exchange 13 decades faster than what flows through it: by hand the slow mode
 * is -0.5e-3 to 1e-12. */
START_TEST(test_slow_mode_under_a_fast_exchange_is_decided)
{
    lb_network *network = support_network("units none\n-> A, k = 1e-3\nA <-> B, kf = 1e10, kr = 1e10\nB ->, k = 1e-3\n");
    lb_system *system = NULL;
    lb_steady *steady = NULL;
    lb_error err;
    ck_assert_int_eq(lb_system_new(network, &system, &err), LB_OK);
    ck_assert_int_eq(lb_steady_solve(system, NULL, &steady, &err), LB_OK);
    ck_assert_uint_eq(steady->count, 1);
    assert_close(steady->state[0].x[0], 1.0, 1e-12, 0);
    assert_close(steady->state[0].x[1], 1.0, 1e-12, 0);
    ck_assert_int_eq(steady->state[0].kind, LB_STABLE_NODE);
    assert_close(steady->state[0].eigenvalues[0].re, -5e-4, 1e-12, steady->state[0].real_part_error);
    lb_steady_free(steady);
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

/* ---- Modes -------------------------------------------------------------------------- */

/* -0.5 +- 3i and -4: slowest first. */
START_TEST(test_modes_are_relaxation_times_and_periods)
{
    const double A[] = {-4, 0, 0, 0, -0.5, 3, 0, -3, -0.5};
    const double pi = 3.14159265358979323846;
    struct linear l = classify(3, A);
    ck_assert_int_eq(l.state.mode_count, 2);
    assert_close(l.state.modes[0].time, 2.0, 1e-14, 0);
    assert_close(l.state.modes[0].period, 2 * pi / 3, 1e-14, 0);
    assert_close(l.state.modes[0].damping, exp(-pi / 3), 1e-14, 0);
    assert_close(l.state.modes[1].time, 0.25, 1e-14, 0);
    ck_assert(l.state.modes[1].period == 0 && l.state.modes[1].damping == 0);
    linear_clear(&l);
}
END_TEST

/* A closed exchange relaxes with kf + kr; the zero of its law is left out. */
START_TEST(test_eigenvalues_are_those_of_the_reaction_space)
{
    lb_network *network = support_network("units none\n[A]0 = 1\nA <-> B, kf = 3, kr = 2\n");
    lb_system *system = NULL;
    lb_steady *steady = NULL;
    lb_error err;
    ck_assert_int_eq(lb_system_new(network, &system, &err), LB_OK);
    ck_assert_int_eq(lb_steady_solve(system, NULL, &steady, &err), LB_OK);
    ck_assert_int_eq(steady->rank, 1);
    ck_assert_uint_eq(steady->count, 1);
    assert_close(steady->state[0].eigenvalues[0].re, -5.0, 1e-14, 0);
    lb_steady_free(steady);
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

Suite *stability_suite(void)
{
    Suite *suite = suite_create("stability");
    TCase *names = tcase_create("names");
    tcase_add_loop_test(names, test_kind_follows_the_eigenvalues, 0, NAMED);
    tcase_add_test(names, test_every_kind_has_its_own_words);
    suite_add_tcase(suite, names);
    TCase *bounds = tcase_create("bounds");
    tcase_add_test(bounds, test_split_double_eigenvalue_is_a_node);
    tcase_add_test(bounds, test_sign_is_decided_down_to_rounding);
    tcase_add_test(bounds, test_bound_does_not_grow_with_bad_scales);
    tcase_add_test(bounds, test_bound_covers_the_true_error);
    tcase_add_test(bounds, test_each_mode_has_its_own_bound);
    tcase_add_test(bounds, test_slow_mode_under_a_fast_exchange_is_decided);
    suite_add_tcase(suite, bounds);
    TCase *modes = tcase_create("modes");
    tcase_add_test(modes, test_modes_are_relaxation_times_and_periods);
    tcase_add_test(modes, test_eigenvalues_are_those_of_the_reaction_space);
    suite_add_tcase(suite, modes);
    return suite;
}
