/* Verdicts: the right word with the right evidence, witnesses that run.
 *
 * Reference periods as in check_cycle.c. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "support.h"

#define BRUSSELATOR(B, more)                                                                      \
    "units none\n[A] = 1\n[B] = " B "\n[X]0 = 1.2\n[Y]0 = 3\n"                                    \
    "A -> X, k = 1\n2 X + Y -> 3 X, k = 1\nB + X -> Y + D, k = 1\nX -> E, k = 1\n" more

typedef struct bench {
    lb_network *net;
    lb_system *sys;
    lb_oscillate *result;
    const lb_oscillate_answer *answer;  /* the last one */
} bench;

static void solve_network(bench *b, const lb_oscillate_options *options)
{
    lb_error err = {.message = ""};
    ck_assert_msg(lb_system_new(b->net, &b->sys, &err) == LB_OK, "%s", err.message);
    lb_status status = lb_oscillate_solve(b->sys, options, &b->result, &err);
    ck_assert_msg(status == LB_OK, "%s", err.message);
    ck_assert_uint_ge(b->result->count, 1);
    b->answer = &b->result->answer[b->result->count - 1];
}

static void solve(bench *b, const char *text, const lb_oscillate_options *options)
{
    memset(b, 0, sizeof *b);
    b->net = support_network(text);
    solve_network(b, options);
}

static void close_bench(bench *b)
{
    lb_oscillate_free(b->result);
    lb_system_free(b->sys);
    lb_network_free(b->net);
}

static const lb_oscillate_options given = {.given = true};
static const lb_oscillate_options ranges = {.ranges = true};

static void assert_verdict(const bench *b, lb_verdict wanted)
{
    ck_assert_str_eq(lb_verdict_text(b->answer->verdict), lb_verdict_text(wanted));
    ck_assert_ptr_nonnull(b->answer->limits);
    ck_assert_ptr_nonnull(b->answer->method);
    bool has_witness = wanted != LB_NOT_FOUND;
    ck_assert((b->answer->cycle != NULL) == has_witness);
    ck_assert((b->answer->k != NULL) == has_witness);
    ck_assert((b->answer->start != NULL) == has_witness);
    ck_assert((b->answer->witness != NULL) == has_witness);
}

/* ---- Words ------------------------------------------------------------------------ */

START_TEST(test_words_are_those_of_the_contract)
{
    ck_assert_str_eq(lb_verdict_text(LB_OSCILLATES), "oscillates");
    ck_assert_str_eq(lb_verdict_text(LB_IS_CENTRE), "centre");
    ck_assert_str_eq(lb_verdict_text(LB_NOT_FOUND), "not found");
    ck_assert_str_eq(lb_scope_text(LB_SCOPE_GIVEN), "given");
    ck_assert_str_eq(lb_scope_text(LB_SCOPE_RANGES), "ranges");
}
END_TEST

START_TEST(test_no_scope_is_refused)
{
    bench b = {.net = support_network(BRUSSELATOR("3", ""))};
    ck_assert_int_eq(lb_system_new(b.net, &b.sys, NULL), LB_OK);
    ck_assert_int_eq(lb_oscillate_solve(b.sys, &(lb_oscillate_options){.given = false}, &b.result, NULL), LB_E_ARG);
    ck_assert_ptr_null(b.result);
    close_bench(&b);
}
END_TEST

/* ---- Given -------------------------------------------------------------------------- */

START_TEST(test_brusselator_oscillates_beyond_its_hopf_point)
{
    bench b;
    solve(&b, BRUSSELATOR("3", ""), &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_close(b.answer->cycle->period, 7.15691992117988, 1e-8, 0);
    ck_assert_int_eq(b.answer->cycle->stable, LB_YES);
    ck_assert_uint_eq(b.answer->unstable, 1);
    ck_assert_ptr_nonnull(b.result->steady);
    ck_assert_uint_eq(b.result->count, 1);
    close_bench(&b);
}
END_TEST

START_TEST(test_brusselator_below_its_hopf_point_only_rings)
{
    bench b;
    solve(&b, BRUSSELATOR("1.7", ""), &given);
    assert_verdict(&b, LB_NOT_FOUND);
    ck_assert_uint_eq(b.answer->unstable, 0);
    ck_assert_int_ge(b.answer->swings, 3);
    ck_assert(b.answer->swing_decay > 0 && b.answer->swing_decay < 1);
    ck_assert(strstr(b.answer->limits, "cannot") == NULL);
    close_bench(&b);
}
END_TEST

/* The start is the unstable steady state itself: the cycle is found from beside it. */
START_TEST(test_start_at_the_unstable_state_is_no_excuse)
{
    bench b;
    solve(&b, "units none\n[X]0 = 1\n[Y]0 = 3\n-> X, k = 1\n2 X + Y -> 3 X, k = 1\nX -> Y, k = 3\nX ->, k = 1\n", &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_close(b.answer->cycle->period, 7.15691992117988, 1e-8, 0);
    close_bench(&b);
}
END_TEST

/* A stable focus inside an unstable cycle inside a stable one: r' = r(-0.1 + r^2 -
 * r^4/4), radii sqrt(2 -+ sqrt(3.6)); the file starts inside both, not far from the
 * unstable one, or far. */
START_TEST(test_hard_excitation_is_found_from_the_spread)
{
    static const char *const starts[] = {"0.1", "0.01", "1e-5", "1e4"};
    char text[400];
    bench b;
    snprintf(text, sizeof text,
             "units none\nsigned X, Y\n[X]0 = %s\n"
             "-> X, v = [X]*(-0.1 + [X]^2 + [Y]^2 - ([X]^2 + [Y]^2)^2/4) - [Y]\n"
             "-> Y, v = [Y]*(-0.1 + [X]^2 + [Y]^2 - ([X]^2 + [Y]^2)^2/4) + [X]\n", starts[_i]);
    solve(&b, text, &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_close(b.answer->cycle->period, 2 * 3.14159265358979324, 1e-8, 0);
    assert_close(b.answer->cycle->high[0], sqrt(2 + sqrt(3.6)), 1e-8, 0);
    close_bench(&b);
}
END_TEST

START_TEST(test_lotka_volterra_is_a_centre)
{
    bench b;
    solve(&b, "units none\n[A] = 1\n[X]0 = 2\n[Y]0 = 1\nA + X -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n", &given);
    assert_verdict(&b, LB_IS_CENTRE);
    assert_close(b.answer->cycle->period, 6.608482671235056, 1e-8, 0);
    close_bench(&b);
}
END_TEST

/* Radii sqrt(1 -+ sqrt(1/2)): the unstable cycle is wide. */
START_TEST(test_harder_excitation_is_found)
{
    bench b;
    solve(&b, "units none\nsigned x, y\n[x]0 = 0.01\n"
          "-> x, v = -0.5*[x] - [y] + 2*[x]*([x]^2 + [y]^2) - [x]*([x]^2 + [y]^2)^2\n"
          "-> y, v = -0.5*[y] + [x] + 2*[y]*([x]^2 + [y]^2) - [y]*([x]^2 + [y]^2)^2\n", &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_close(b.answer->cycle->high[0], sqrt(1 + sqrt(0.5)), 1e-8, 0);
    close_bench(&b);
}
END_TEST

/* Damping too weak to wait for: the swings are reported, and nothing is said to move on,
 * neither from the start nor from any other.  By the real part of the eigenvalues each swing
 * loses a share of 1e-4 pi (linear; Brusselator) or 1e-3 pi (Lotka), more where it is wide. */
START_TEST(test_slow_ringing_is_a_transient)
{
    static const struct { const char *text; double loss; } cases[] = {
        {"units none\nsigned x, y\n[x]0 = 1\n-> x, v = [y]\n-> y, v = -[x] - 1e-4*[y]\n", 1e-4},
        {"units none\n[A] = 1\n[X]0 = 2\n[Y]0 = 1\nA + X -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n"
         "2 X -> X, k = 1e-3\n", 1e-3},
        {BRUSSELATOR("1.9999", ""), 1e-4},
    };
    bench b;
    solve(&b, cases[_i].text, &given);
    assert_verdict(&b, LB_NOT_FOUND);
    ck_assert(!b.answer->keeps_moving);
    ck_assert_int_ge(b.answer->swings, 1000);
    ck_assert(b.answer->swing_decay < 1 - 0.9 * cases[_i].loss * 3.14159265358979 && b.answer->swing_decay > 0.99);
    close_bench(&b);
}
END_TEST

/* An orbit that comes close to the axes: what lies a tenth of its size further out would be
 * below zero, and run away. */
START_TEST(test_wide_centre_is_a_centre)
{
    bench b;
    solve(&b, "units none\n[A] = 1\n[X]0 = 20\n[Y]0 = 1\nA + X -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n", &given);
    assert_verdict(&b, LB_IS_CENTRE);
    close_bench(&b);
}
END_TEST

/* Without prey the start is on an invariant face; the centre is beside it. */
START_TEST(test_centre_is_found_from_a_start_without_prey)
{
    bench b;
    solve(&b, "units none\n[Y]0 = 1\nX -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n", &given);
    assert_verdict(&b, LB_IS_CENTRE);
    close_bench(&b);
}
END_TEST

START_TEST(test_what_has_no_cycle_is_not_found)
{
    static const char *const texts[] = {
        /* Lotka 1910: damped. */
        "units none\n[X]0 = 2\n[Y]0 = 1\n-> X, k = 1\nX + Y -> 2 Y, k = 1\nY ->, k = 1\n",
        /* reversible Michaelis-Menten, closed */
        "units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC <-> E + P, kf = 2, kr = 0.1\n",
        /* Goodwin, n = 8 */
        "units none\n[X]0 = 0.5\n[Z]0 = 1\n-> X, v = 10/(1 + [Z]^8)\nX ->, k = 1\n-> Y, v = [X]\nY ->, k = 1\n"
        "-> Z, v = [Y]\nZ ->, k = 1\n",
        /* Higgins-Selkov, v^2 k1 > k2^3 */
        "units none\n[S]0 = 1\n[P]0 = 1.2\n-> S, k = 1.2\nS + 2 P -> 3 P, k = 1\nP ->, k = 1\n",
        /* bistable: Wilhelm's scheme */
        "units none\n[S] = 1\n[X]0 = 3\n[Y]0 = 1\nS + Y -> 2 X, k = 8\n2 X -> X + Y, k = 1\nX + Y -> Y + P, k = 1\n"
        "X -> P, k = 1.5\n",
        /* one species */
        "units none\n[X]0 = 2\n2 X -> 3 X, k = 6\n3 X -> 2 X, k = 1\nX ->, k = 11\n-> X, k = 6\n",
    };
    bench b;
    solve(&b, texts[_i], &given);
    assert_verdict(&b, LB_NOT_FOUND);
    close_bench(&b);
}
END_TEST

/* Two species turn into each other beside a Brusselator: a conservation law, one
 * dependent species, and the cycle as before. */
START_TEST(test_cycle_in_a_class_with_a_conservation_law)
{
    bench b;
    solve(&b, BRUSSELATOR("3", "E1 + X <-> E2 + X, kf = 0.5, kr = 0.2\n[E1]0 = 3\n"), &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_close(b.answer->cycle->period, 7.15691992117988, 1e-8, 0);
    close_bench(&b);
}
END_TEST

START_TEST(test_chaos_is_not_found_and_says_that_it_moves)
{
    bench b;
    solve(&b, "units none\nsigned X, Y, Z\n[X]0 = 1\n[Y]0 = 1\n[Z]0 = 1\n"
              "-> X, v = 10*([Y] - [X])\n-> Y, v = [X]*(28 - [Z]) - [Y]\n-> Z, v = [X]*[Y] - 8*[Z]/3\n", &given);
    assert_verdict(&b, LB_NOT_FOUND);
    ck_assert(b.answer->keeps_moving && !b.answer->runs_away);
    close_bench(&b);
}
END_TEST

START_TEST(test_growth_without_bound_is_said)
{
    bench b;
    solve(&b, "units none\n[S]0 = 1\n[P]0 = 3\n-> S, k = 1.2\nS + 2 P -> 3 P, k = 1e-3\nP ->, k = 1\n", &given);
    ck_assert(b.answer->runs_away);
    close_bench(&b);
}
END_TEST

/* ---- Ranges --------------------------------------------------------------------------- */

START_TEST(test_cycle_is_found_within_the_ranges)
{
    bench b;
    solve(&b, "units none\n[A] = 1\n[B] = 1.7 in 0.5 .. 5\n[X]0 = 1.2\n[Y]0 = 3\n"
              "A -> X, k = 1\n2 X + Y -> 3 X, k = 1\nB + X -> Y + D, k = 1\nX -> E, k = 1\n", &ranges);
    assert_verdict(&b, LB_OSCILLATES);
    ck_assert_int_eq(b.answer->scope, LB_SCOPE_RANGES);
    int B = lb_network_find_constant(b.net, "[B]");
    ck_assert(b.answer->k[B] > 2 && b.answer->k[B] <= 5);
    ck_assert_uint_ge(b.answer->samples, 2);
    ck_assert_ptr_null(b.result->steady);
    close_bench(&b);
}
END_TEST

START_TEST(test_ranges_without_a_cycle_are_not_found)
{
    bench b;
    solve(&b, BRUSSELATOR("1.7 in 0.5 .. 1.9", ""), &(lb_oscillate_options){.ranges = true, .samples = 50});
    assert_verdict(&b, LB_NOT_FOUND);
    ck_assert_uint_eq(b.answer->samples, 50);
    close_bench(&b);
}
END_TEST

START_TEST(test_same_seed_same_answer)
{
    bench a, b;
    const char *text = BRUSSELATOR("1.7 in 0.5 .. 5", "");
    solve(&a, text, &ranges);
    solve(&b, text, &ranges);
    ck_assert_uint_eq(a.answer->samples, b.answer->samples);
    ck_assert(a.answer->cycle->period == b.answer->cycle->period);
    ck_assert_str_eq(a.answer->witness, b.answer->witness);
    close_bench(&a);
    close_bench(&b);
}
END_TEST

START_TEST(test_ranges_are_left_out_where_there_are_none)
{
    bench b;
    solve(&b, BRUSSELATOR("3", ""), NULL);
    ck_assert_uint_eq(b.result->count, 1);
    ck_assert_int_eq(b.answer->scope, LB_SCOPE_GIVEN);
    close_bench(&b);
}
END_TEST

START_TEST(test_cycle_given_answers_for_the_ranges_too)
{
    bench b;
    solve(&b, BRUSSELATOR("3 in 0.5 .. 5", ""), NULL);
    ck_assert_uint_eq(b.result->count, 2);
    assert_verdict(&b, LB_OSCILLATES);
    ck_assert_int_eq(b.answer->scope, LB_SCOPE_RANGES);
    ck_assert(b.answer->cycle->period == b.result->answer[0].cycle->period);
    close_bench(&b);
}
END_TEST

/* ---- Witnesses --------------------------------------------------------------------------- */

/* Written to 17 digits, so the very numbers. */
static void assert_starts_on_the_cycle(const lb_system *sys, const lb_cycle *cycle)
{
    lb_evaluator *ev = NULL;
    double x[16];
    ck_assert_int_eq(lb_evaluator_new(sys, &ev, NULL), LB_OK);
    lb_initial(ev, x);
    for (int i = 0; i < cycle->states; i++)
        ck_assert_msg(x[i] == cycle->x[i], "%.17g, wanted %.17g", x[i], cycle->x[i]);
    lb_evaluator_free(ev);
}

/* The witness reads back, starts on the cycle and has the same period and range. */
static void assert_witness_runs(const bench *b)
{
    bench again;
    const lb_cycle *cycle = b->answer->cycle;
    solve(&again, b->answer->witness, &given);
    ck_assert_int_eq(again.answer->verdict, b->answer->verdict);
    assert_close(again.answer->cycle->period, cycle->period, 1e-9, 0);
    for (int i = 0; i < cycle->states; i++) {
        int j = lb_network_find_state(again.net, lb_network_state_name(b->net, i));
        if (isnan(cycle->low[i]))
            continue;
        assert_close(again.answer->cycle->low[j], cycle->low[i], 1e-7, 0);
        assert_close(again.answer->cycle->high[j], cycle->high[i], 1e-7, 0);
    }
    assert_starts_on_the_cycle(again.sys, cycle);
    for (int i = 0; i < lb_network_constants(b->net); i++)
        ck_assert_msg(lb_network_default(again.net, i) == b->answer->k[i], "%s: %.17g, wanted %.17g",
                      lb_network_constant_name(b->net, i), lb_network_default(again.net, i), b->answer->k[i]);
    close_bench(&again);
}

START_TEST(test_witness_runs)
{
    static const char *const texts[] = {
        BRUSSELATOR("3", ""),
        BRUSSELATOR("1.7 in 0.5 .. 5", "[D]0 = 2\n"),
        BRUSSELATOR("1.7 within factor 3", ""),
        /* units, an inline constant with a range, a quoted name, no initial value, CR LF */
        "units mM min\r\ntitle \"x\"\r\n[A] = 1 mM\r\n[\"B+\"] = 1700 uM\r\n[\"X*\"]0 = 1.2   in 0 .. 1.3 # start\r\n"
        "(a) A -> \"X*\", k = 1 min^-1\r\n(b) 2 \"X*\" + Y -> 3 \"X*\", k = 1 mM^-2 min^-1\r\n"
        "(c) \"B+\" + \"X*\" -> Y + D, k = 1 mM^-1 min^-1 in 0.5 .. 4\r\n(d) \"X*\" -> E, k = 1 min^-1\r\n",
        /* signed */
        "units none\nsigned X, Y\nmu = 1\n[X]0 = 2\n-> X, v = [Y]\n-> Y, v = mu*(1 - [X]^2)*[Y] - [X]",
        /* a tank, a feed with a range, a derived initial value */
        "units none\nresidence = 164 in 50 .. 300\nhalf = 0.5\n[a]in = 1 in 0.5 .. 2\n[a]0 = 0.4*half\n[b]0 = 0.16\n"
        "a + 2 b -> 3 b, k = 1\nb -> c, k = 0.025\n",
        /* arguments of functions, in a reaction and in a definition */
        "units M s\ntemperature = 310 K in 300 .. 320\n[A] = 1 M\n[B] = 1.7 M in 0.5 .. 5\n[X]0 = 1.2 M\n[Y]0 = 3\n"
        "k1 = 2*eyring(dH = 73 kJ/mol in 70 .. 76, dS = -15 J/(mol K))\n"
        "A -> X, k = k1\n2 X + Y -> 3 X, k = 0.5*arrhenius_ref(k = 2 M^-2 s^-1 within factor 2, Tref = 310 K, Ea = 1 kJ/mol)\n"
        "B + X -> Y + D, k = 1\n[E] = 0 M\nX <-> E, kf = arrhenius(A = 1 s^-1 in 0.5 .. 2, n = 0, Ea = 0 J/mol), kr = 1 s^-1\n",
        /* a centre */
        "units none\n[A] = 1\n[X]0 = 2\n[Y]0 = 1\nA + X -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n",
    };
    bench b;
    solve(&b, texts[_i], NULL);
    assert_witness_runs(&b);
    close_bench(&b);
}
END_TEST

/* Values from settings are in the witness though they are not in the text. */
START_TEST(test_witness_holds_settings)
{
    static const char *const texts[] = {BRUSSELATOR("1.7", ""), BRUSSELATOR("1.7 in 0.5 .. 1.9", "")};
    bench b = {.net = NULL};
    const char *text = texts[_i];
    lb_setting setting = {"[B]", "3"};
    lb_diagnostics *list = NULL;
    lb_error err = {.message = ""};
    lb_status status = lb_network_parse("x.mech", text, strlen(text), &setting, 1, &b.net, &list, &err);
    ck_assert_msg(status == LB_OK, "%s", err.message);
    lb_diagnostics_free(list);
    solve_network(&b, &given);
    assert_verdict(&b, LB_OSCILLATES);
    assert_witness_runs(&b);
    close_bench(&b);
}
END_TEST

/* ---- Interruption and memory ------------------------------------------------------------------ */

static bool stop_soon(void *context)
{
    int *left = context;
    return (*left)-- <= 0;
}

START_TEST(test_interruption_leaves_an_answer)
{
    bench b;
    int left = 200;
    lb_monitor monitor = {.stop = stop_soon, .context = &left};
    solve(&b, BRUSSELATOR("1.7 in 0.5 .. 1.9", ""),
          &(lb_oscillate_options){.given = true, .ranges = true, .monitor = &monitor});
    ck_assert(b.answer->interrupted);
    ck_assert_int_eq(b.answer->verdict, LB_NOT_FOUND);
    close_bench(&b);
}
END_TEST

START_TEST(test_every_failed_allocation_is_reported)
{
    bench b = {.net = support_network(BRUSSELATOR("3 in 1 .. 4", ""))};
    ck_assert_int_eq(lb_system_new(b.net, &b.sys, NULL), LB_OK);
    lb_status status = LB_E_NOMEM;
    for (long k = 0; status != LB_OK; k += 1 + k / 50) {
        memory_fail_after(k);
        status = lb_oscillate_solve(b.sys, NULL, &b.result, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        ck_assert((b.result != NULL) == (status == LB_OK));
    }
    close_bench(&b);
}
END_TEST

Suite *oscillate_suite(void)
{
    Suite *suite = suite_create("oscillate");
    TCase *words = tcase_create("words");
    tcase_add_test(words, test_words_are_those_of_the_contract);
    tcase_add_test(words, test_no_scope_is_refused);
    suite_add_tcase(suite, words);
    TCase *at = tcase_create("given");
    tcase_set_timeout(at, 60);
    tcase_add_test(at, test_brusselator_oscillates_beyond_its_hopf_point);
    tcase_add_test(at, test_brusselator_below_its_hopf_point_only_rings);
    tcase_add_test(at, test_start_at_the_unstable_state_is_no_excuse);
    tcase_add_loop_test(at, test_hard_excitation_is_found_from_the_spread, 0, 4);
    tcase_add_test(at, test_lotka_volterra_is_a_centre);
    tcase_add_test(at, test_wide_centre_is_a_centre);
    tcase_add_test(at, test_harder_excitation_is_found);
    tcase_add_loop_test(at, test_slow_ringing_is_a_transient, 0, 3);
    tcase_add_test(at, test_centre_is_found_from_a_start_without_prey);
    tcase_add_loop_test(at, test_what_has_no_cycle_is_not_found, 0, 6);
    tcase_add_test(at, test_cycle_in_a_class_with_a_conservation_law);
    tcase_add_test(at, test_growth_without_bound_is_said);
    tcase_add_test(at, test_chaos_is_not_found_and_says_that_it_moves);
    suite_add_tcase(suite, at);
    TCase *box = tcase_create("ranges");
    tcase_set_timeout(box, 60);
    tcase_add_test(box, test_cycle_is_found_within_the_ranges);
    tcase_add_test(box, test_ranges_without_a_cycle_are_not_found);
    tcase_add_test(box, test_same_seed_same_answer);
    tcase_add_test(box, test_ranges_are_left_out_where_there_are_none);
    tcase_add_test(box, test_cycle_given_answers_for_the_ranges_too);
    suite_add_tcase(suite, box);
    TCase *witness = tcase_create("witness");
    tcase_set_timeout(witness, 60);
    tcase_add_loop_test(witness, test_witness_runs, 0, 8);
    tcase_add_loop_test(witness, test_witness_holds_settings, 0, 2);
    suite_add_tcase(suite, witness);
    TCase *trouble = tcase_create("interruption and memory");
    tcase_set_timeout(trouble, 120);
    tcase_add_test(trouble, test_interruption_leaves_an_answer);
    tcase_add_test(trouble, test_every_failed_allocation_is_reported);
    suite_add_tcase(suite, trouble);
    return suite;
}
