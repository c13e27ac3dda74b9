/* Sensitivities of steady states: closed forms, and differences of states solved anew. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "support.h"

Suite *sensitivity_suite(void);

struct answer {
    lb_network *network;
    lb_system *system;
    lb_steady *steady;
};

static struct answer ask(const char *text, const double *k)
{
    struct answer a = {.network = support_network(text)};
    lb_error err = {.code = LB_OK};
    lb_steady_options options = {.k = k, .sensitivities = true};
    ck_assert_msg(lb_system_new(a.network, &a.system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_steady_solve(a.system, &options, &a.steady, &err) == LB_OK, "%s", err.message);
    return a;
}

static void answer_clear(struct answer *a)
{
    lb_steady_free(a->steady);
    lb_system_free(a->system);
    lb_network_free(a->network);
}

static double slope(const struct answer *a, size_t state, const char *species, const char *constant)
{
    int i = lb_network_find_state(a->network, species), j = lb_network_find_constant(a->network, constant);
    ck_assert_msg(i >= 0 && j >= 0, "no %s or no %s", species, constant);
    return a->steady->state[state].sensitivity[i + (size_t)j * (size_t)a->steady->states];
}

/* Brusselator: X = k1 A/k4, Y = k3 B k4/(k1 k2 A), so the logarithmic slopes are whole. */
START_TEST(test_slopes_of_the_brusselator_are_its_exponents)
{
    struct answer a = ask("units none\n[A] = 1\n[B] = 1.7\nk1 = 1.3\nk2 = 0.9\nk3 = 1.1\nk4 = 0.8\n[X]0 = 1\n[Y]0 = 1\n"
                          "A -> X, k = k1\n2 X + Y -> 3 X, k = k2\nB + X -> Y + D, k = k3\nX -> E, k = k4\n", NULL);
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(slope(&a, 0, "X", "k1"), 1, 1e-10, 0);
    assert_close(slope(&a, 0, "X", "k4"), -1, 1e-10, 0);
    assert_close(slope(&a, 0, "X", "[B]"), 0, 0, 1e-10);
    assert_close(slope(&a, 0, "Y", "k3"), 1, 1e-10, 0);
    assert_close(slope(&a, 0, "Y", "k2"), -1, 1e-10, 0);
    assert_close(slope(&a, 0, "Y", "k4"), 1, 1e-10, 0);
    assert_close(slope(&a, 0, "Y", "[A]"), -1, 1e-10, 0);
    answer_clear(&a);
}
END_TEST

/* A <-> B with the total T: B = T K/(1 + K), eigenvalue -(kf + kr); the mere product P of the
 * closed mechanism below takes what a law leaves. */
START_TEST(test_totals_move_with_the_initial_state)
{
    struct answer a = ask("units none\nT0 = 3\nkf = 2\nkr = 5\n[A]0 = T0\nA <-> B, kf = kf, kr = kr\n", NULL);
    assert_close(slope(&a, 0, "A", "T0"), 1, 1e-10, 0);
    assert_close(slope(&a, 0, "B", "T0"), 1, 1e-10, 0);
    assert_close(slope(&a, 0, "B", "kf"), 5.0 / 7, 1e-10, 0);
    assert_close(slope(&a, 0, "A", "kf"), -2.0 / 7, 1e-10, 0);
    int kf = lb_network_find_constant(a.network, "kf");
    assert_close(a.steady->state[0].leading_sensitivity[kf].re, -2, 1e-9, 0);
    assert_close(a.steady->state[0].leading_sensitivity[kf].im, 0, 0, 1e-12);
    answer_clear(&a);
}
END_TEST

static const char *const texts[] = {
    /* a cycle of a kinase with two substrates' forms */
    "units none\nE0 = 1\n[E]0 = E0\n[S]0 = 10\na = 2\nb = 0.7\nc = 0.3\nd = 0.1\nS + E <-> C, kf = a, kr = b\nC -> E + P, k = c\nP -> S, k = d\n",
    /* a tank with a rate law */
    "units none\nresidence = 3\n[S]in = 2\nV = 1.3\nKm = 0.2\nS -> P, v = V*[S]/(Km + [S])\n",
    /* signed: FitzHugh and Nagumo's equations */
    "units none\nsigned V, W\nI = 0.5\na = 0.7\nb = 0.8\neps = 0.08\n[V]0 = -1\n-> V, v = [V] - [V]^3/3 - [W] + I\n"
    "-> W, v = eps*([V] + a - b*[W])\n",
    /* focus: Selkov */
    "units none\na = 0.08\nb = 0.6\n[X]0 = 1\n[Y]0 = 1\nX ->, k = 1\nY -> X, k = a\n2 X + Y -> 3 X, k = 1\n-> Y, v = b\n",
};
enum { TEXTS = sizeof texts / sizeof *texts };

/* Each state, solved anew at k (1 +- h), moves as the slopes say; so does its leading eigenvalue. */
START_TEST(test_slopes_are_those_of_states_solved_anew)
{
    const double h = 1e-4;
    struct answer a = ask(texts[_i], NULL);
    int m = lb_network_constants(a.network), n = a.steady->states;
    ck_assert_uint_eq(a.steady->count, 1);
    for (int j = 0; j < m; j++) {
        lb_steady *moved[2];
        double *k = memory_array((size_t)m, sizeof *k);
        for (int side = 0; side < 2; side++) {
            for (int l = 0; l < m; l++)
                k[l] = lb_network_default(a.network, l) * (l == j ? 1 + (side ? h : -h) : 1);
            lb_steady_options options = {.k = k};
            ck_assert_int_eq(lb_steady_solve(a.system, &options, &moved[side], NULL), LB_OK);
            ck_assert_uint_eq(moved[side]->count, 1);
        }
        for (int i = 0; i < n; i++) {
            double difference = (moved[1]->state[0].x[i] - moved[0]->state[0].x[i]) / (2 * h) / a.steady->state[0].x[i];
            assert_close(a.steady->state[0].sensitivity[i + (size_t)j * (size_t)n], difference, 2e-7, 1e-8);
        }
        lb_complex low = moved[0]->state[0].eigenvalues[0], high = moved[1]->state[0].eigenvalues[0];
        assert_close(a.steady->state[0].leading_sensitivity[j].re, (high.re - low.re) / (2 * h), 1e-6, 1e-7);
        assert_close(a.steady->state[0].leading_sensitivity[j].im, (high.im - low.im) / (2 * h), 1e-6, 1e-7);
        lb_steady_free(moved[0]);
        lb_steady_free(moved[1]);
        memory_free(k);
    }
    answer_clear(&a);
}
END_TEST

/* At a fold the state moves infinitely fast. */
START_TEST(test_fold_has_no_slopes)
{
    char text[300];
    snprintf(text, sizeof text, "units none\nb = %.17g\n[X]0 = 1\n2 X -> 3 X, k = 6\n3 X -> 2 X, k = 1\nX ->, k = 11\n-> X, k = b\n",
             6 + 2 / (3 * sqrt(3)));
    struct answer a = ask(text, NULL);
    ck_assert_uint_eq(a.steady->count, 2);
    ck_assert(isfinite(slope(&a, 0, "X", "b")));
    ck_assert(!(fabs(slope(&a, 1, "X", "b")) < 1e5));
    answer_clear(&a);
}
END_TEST

START_TEST(test_absent_species_have_no_logarithmic_slope)
{
    struct answer a = ask("units none\n[X]0 = 1\nk = 2\nX -> 2 X, k = k\n2 X -> X, k = 1\nX ->, k = 1\n", NULL);
    ck_assert_uint_eq(a.steady->count, 2);
    assert_close(slope(&a, 0, "X", "k"), 2, 1e-10, 0);
    ck_assert(isnan(slope(&a, 1, "X", "k")));
    int k = lb_network_find_constant(a.network, "k");
    assert_close(a.steady->state[1].leading_sensitivity[k].re, 2, 1e-9, 0);
    answer_clear(&a);
}
END_TEST

START_TEST(test_each_failing_allocation_is_survived)
{
    lb_network *network = support_network(texts[0]);
    lb_system *system = NULL;
    ck_assert_int_eq(lb_system_new(network, &system, NULL), LB_OK);
    lb_status status = LB_E_NOMEM;
    for (long i = 0; status != LB_OK; i++) {
        lb_steady_options options = {.sensitivities = true, .starts = 1};
        lb_steady *steady = NULL;
        memory_fail_after(i);
        status = lb_steady_solve(system, &options, &steady, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        ck_assert((steady != NULL) == (status == LB_OK));
        lb_steady_free(steady);
    }
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

Suite *sensitivity_suite(void)
{
    Suite *suite = suite_create("sensitivity");
    TCase *slopes = tcase_create("slopes");
    tcase_add_test(slopes, test_slopes_of_the_brusselator_are_its_exponents);
    tcase_add_test(slopes, test_totals_move_with_the_initial_state);
    tcase_add_loop_test(slopes, test_slopes_are_those_of_states_solved_anew, 0, TEXTS);
    tcase_add_test(slopes, test_fold_has_no_slopes);
    tcase_add_test(slopes, test_absent_species_have_no_logarithmic_slope);
    tcase_add_test(slopes, test_each_failing_allocation_is_survived);
    suite_add_tcase(suite, slopes);
    return suite;
}
