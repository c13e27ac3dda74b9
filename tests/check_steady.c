/* Steady states: published and computed values, with mere products held and
 * accumulating; faces, classes, continua; planted states of random networks. */
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "support.h"

Suite *steady_suite(void);

enum { MOST_SPECIES = 9, MOST_STATES = 3 };

enum steady_domain { STEADY_POSITIVE, STEADY_BOUNDARY, STEADY_ALL };

struct steady_case {
    const char *name, *source, *text, *held_products;
    double absolute, relative;
    enum steady_domain domain;
    int count;                          /* states in the domain */
    const char *species[MOST_SPECIES];
    int state_count;                    /* states with values below */
    struct {
        double x[MOST_SPECIES];
        bool has_kind;
        lb_kind kind;
        int eigenvalue_count;
        lb_complex eigenvalue[MOST_SPECIES];
    } state[MOST_STATES];
};

static const struct steady_case cases[] = {
#include "reference/steady_cases.inc"
};
enum { CASES = sizeof cases / sizeof *cases };

/* ---- Asking ------------------------------------------------------------------------ */

struct answer {
    lb_network *network;
    lb_system *system;
    lb_steady *steady;
};

static struct answer ask_with(const char *text, const lb_steady_options *options)
{
    struct answer a = {.network = support_network(text)};
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_system_new(a.network, &a.system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_steady_solve(a.system, options, &a.steady, &err) == LB_OK, "%s", err.message);
    return a;
}

static struct answer ask(const char *text)
{
    return ask_with(text, NULL);
}

static void answer_clear(struct answer *a)
{
    lb_steady_free(a->steady);
    lb_system_free(a->system);
    lb_network_free(a->network);
}

static double value_of(const struct answer *a, const lb_steady_state *state, const char *species)
{
    int i = lb_network_find_state(a->network, species);
    ck_assert_msg(i >= 0, "no species %s", species);
    return state->x[i];
}

/* ---- Reference cases ------------------------------------------------------------------ */

static bool is_in_domain(const lb_steady_state *state, enum steady_domain domain)
{
    return domain == STEADY_ALL || state->is_boundary == (domain == STEADY_BOUNDARY);
}

static bool agrees(const struct steady_case *c, double got, double want)
{
    return fabs(got - want) <= c->absolute + c->relative * fabs(want);
}

/* The state that agrees in every species; NULL: none does. */
static const lb_steady_state *find_state(const struct steady_case *c, const struct answer *a, int which)
{
    for (size_t i = 0; i < a->steady->count; i++) {
        const lb_steady_state *state = &a->steady->state[i];
        bool is_same = is_in_domain(state, c->domain);
        for (int s = 0; s < MOST_SPECIES && c->species[s]; s++)
            is_same = is_same && agrees(c, value_of(a, state, c->species[s]), c->state[which].x[s]);
        if (is_same)
            return state;
    }
    return NULL;
}

static void check_eigenvalues(const struct steady_case *c, const struct answer *a, const lb_steady_state *state,
                              int which)
{
    ck_assert_int_eq(a->steady->rank, c->state[which].eigenvalue_count);
    for (int e = 0; e < c->state[which].eigenvalue_count; e++) {
        lb_complex want = c->state[which].eigenvalue[e];
        double nearest = INFINITY, size = hypot(want.re, want.im);
        for (int g = 0; g < a->steady->rank; g++)
            nearest = fmin(nearest, hypot(state->eigenvalues[g].re - want.re, state->eigenvalues[g].im - want.im));
        ck_assert_msg(nearest <= c->absolute + c->relative * size, "%s: eigenvalue %.17g %+.17g i is off by %g",
                      c->name, want.re, want.im, nearest);
    }
}

static void check_case(const struct steady_case *c, bool is_held)
{
    char text[4000];
    snprintf(text, sizeof text, "%s%s", c->text, is_held ? c->held_products : "");
    struct answer a = ask(text);
    int found = 0;
    for (size_t i = 0; i < a.steady->count; i++)
        found += is_in_domain(&a.steady->state[i], c->domain);
    ck_assert_msg(found == c->count, "%s: %d states, wanted %d", c->name, found, c->count);
    for (int s = 0; s < c->state_count; s++) {
        const lb_steady_state *state = find_state(c, &a, s);
        ck_assert_msg(state != NULL, "%s: state %d is missing", c->name, s);
        if (c->state[s].eigenvalue_count > 0)
            check_eigenvalues(c, &a, state, s);
        if (c->state[s].has_kind)
            ck_assert_msg(state->kind == c->state[s].kind, "%s: state %d is a %s, wanted %s", c->name, s,
                          lb_kind_text(state->kind), lb_kind_text(c->state[s].kind));
        ck_assert(state->routh_hurwitz_agrees);
        ck_assert_msg(state->residual <= 1e-13, "%s: residual %g", c->name, state->residual);
    }
    ck_assert_int_eq(a.steady->continuum, 0);
    answer_clear(&a);
}

START_TEST(test_reference_case_holds_with_products_held)
{
    check_case(&cases[_i], true);
}
END_TEST

START_TEST(test_reference_case_holds_with_products_accumulating)
{
    check_case(&cases[_i], false);
}
END_TEST

START_TEST(test_product_that_accumulates_is_reported)
{
    struct answer a = ask("units none\n[A] = 1\n[B] = 3\n[X]0 = 1\n[Y]0 = 1\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
                          "B + X -> Y + D, k = 1\nX -> E, k = 1\n");
    ck_assert_uint_eq(a.steady->count, 1);
    ck_assert(isnan(value_of(&a, a.steady->state, "D")) && isnan(value_of(&a, a.steady->state, "E")));
    ck_assert(a.steady->accumulating[lb_network_find_state(a.network, "D")]);
    ck_assert(!a.steady->accumulating[lb_network_find_state(a.network, "X")]);
    answer_clear(&a);
}
END_TEST

/* ---- Writing networks ----------------------------------------------------------------- */

struct text {
    char *at;
    size_t room;
};

static void put(struct text *t, const char *format, ...)
{
    va_list list;
    va_start(list, format);
    int length = vsnprintf(t->at, t->room, format, list);
    va_end(list);
    ck_assert(length >= 0 && (size_t)length < t->room);
    t->at += length;
    t->room -= (size_t)length;
}

static double draw(uint64_t network, uint64_t *counter, double low, double high)
{
    return low + (high - low) * sample_uniform(4711, network, (*counter)++);
}

/* ---- Classes and faces ------------------------------------------------------------------- */

/* Substrate is used up; product has the total by the law S + C + P, although it
 * enters no rate.  Henri, Michaelis and Menten's scheme; by hand: E = 1, P = 10. */
START_TEST(test_closed_enzyme_ends_on_the_face_without_substrate)
{
    struct answer a = ask("units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n");
    ck_assert_uint_eq(a.steady->count, 1);
    const lb_steady_state *state = a.steady->state;
    ck_assert(state->is_boundary && state->stable == LB_YES);
    assert_close(value_of(&a, state, "E"), 1.0, 1e-12, 0);
    assert_close(value_of(&a, state, "P"), 10.0, 1e-12, 0);
    ck_assert(value_of(&a, state, "S") == 0 && value_of(&a, state, "C") == 0);
    ck_assert_int_eq(a.steady->rank, 2);
    answer_clear(&a);
}
END_TEST

/* A total of zero puts the whole class on a face. */
START_TEST(test_class_without_enzyme_rests)
{
    struct answer a = ask("units none\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n");
    for (size_t i = 0; i < a.steady->count; i++) {
        ck_assert(value_of(&a, &a.steady->state[i], "E") == 0);
        ck_assert(value_of(&a, &a.steady->state[i], "C") == 0);
    }
    ck_assert_uint_ge(a.steady->count, 1);
    answer_clear(&a);
}
END_TEST

START_TEST(test_totals_are_those_of_the_state_given)
{
    const double x0[] = {0, 3};
    lb_steady_options options = {.x0 = x0};
    struct answer a = ask_with("units none\n[A]0 = 1\nA <-> B, kf = 1, kr = 2\n", &options);
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(value_of(&a, a.steady->state, "A"), 2.0, 1e-13, 0);
    assert_close(value_of(&a, a.steady->state, "B"), 1.0, 1e-13, 0);
    assert_close(a.steady->total[0], 3.0, 1e-15, 0);
    ck_assert_int_eq(a.steady->zero_eigenvalues, 1);
    answer_clear(&a);
}
END_TEST

START_TEST(test_boundary_is_left_out_when_asked)
{
    lb_steady_options options = {.skip_boundary = true};
    struct answer a = ask_with("units none\n[S] = 1\nS + Y -> 2 X, k = 8\n2 X -> X + Y, k = 1\n"
                               "X + Y -> Y + P, k = 1\nX -> P, k = 1.5\n", &options);
    ck_assert_uint_eq(a.steady->count, 2);
    ck_assert(!a.steady->state[0].is_boundary && !a.steady->state[1].is_boundary);
    answer_clear(&a);
}
END_TEST

/* A face inside a face: without the prey there is nothing, without predators the
 * prey reaches its capacity, without the top predator the others coexist. */
START_TEST(test_faces_of_faces_are_searched)
{
    struct answer a = ask("units none\n[X]0 = 1\n[Y]0 = 1\n[Z]0 = 1\nX -> 2 X, k = 1\n2 X -> X, k = 0.1\n"
                          "X + Y -> 2 Y, k = 1\nY ->, k = 1\nY + Z -> 2 Z, k = 1\nZ ->, k = 0.5\n");
    /* by hand: Y = 0.5, X = 10 (1 - Y), Z = X - 1; then without Z, without Y, without X */
    const double want[4][3] = {{5, 0.5, 4}, {10, 0, 0}, {1, 0.9, 0}, {0, 0, 0}};
    ck_assert_uint_eq(a.steady->count, 4);
    for (int i = 0; i < 4; i++) {
        assert_close(value_of(&a, &a.steady->state[i], "X"), want[i][0], 1e-12, 1e-300);
        assert_close(value_of(&a, &a.steady->state[i], "Y"), want[i][1], 1e-12, 1e-300);
        assert_close(value_of(&a, &a.steady->state[i], "Z"), want[i][2], 1e-12, 1e-300);
    }
    answer_clear(&a);
}
END_TEST

START_TEST(test_rate_law_that_vanishes_makes_a_face)
{
    struct answer a = ask("units none\n[S]0 = 1\n[X]0 = 1\n-> S, k = 1\nS ->, k = 1\n"
                          "S -> X, v = 4*[S]*[X]/(1 + [X])\nX ->, k = 1\n");
    /* by hand: S = 1/(1 + 4X/(1+X)), X: 4S/(1+X) = 1, so 5X + 1 = 4, X = 0.6 */
    ck_assert_uint_eq(a.steady->count, 2);
    assert_close(value_of(&a, &a.steady->state[0], "X"), 0.6, 1e-12, 0);
    ck_assert(value_of(&a, &a.steady->state[1], "X") == 0);
    assert_close(value_of(&a, &a.steady->state[1], "S"), 1.0, 1e-13, 0);
    answer_clear(&a);
}
END_TEST

/* Without the inflow nothing positive can last, and no start is wasted on it. */
START_TEST(test_decay_leaves_only_the_empty_state)
{
    struct answer a = ask("units none\n[X]0 = 1\nX -> Y, k = 1\nY -> X, k = 2\nX ->, k = 1\n");
    ck_assert_uint_eq(a.steady->count, 1);
    ck_assert(value_of(&a, a.steady->state, "X") == 0 && value_of(&a, a.steady->state, "Y") == 0);
    ck_assert_int_eq(a.steady->state->kind, LB_STABLE_NODE);
    answer_clear(&a);
}
END_TEST

/* In a tank that is fed with A alone, B can only persist if it is there, C and its
 * descendant D not at all once A does not make them. */
START_TEST(test_tank_loses_what_nothing_feeds)
{
    struct answer a = ask("units none\nresidence = 10\n[A]in = 1\n[B]0 = 1\n[C]0 = 1\nA + 2 B -> 3 B, k = 1\n"
                          "C -> D, k = 2\nD + A -> A + F, k = 1\n");
    /* by hand: A (1 - A) = 1/10 or A = 1, B = 1 - A */
    const double want[3] = {(1 - sqrt(0.6)) / 2, (1 + sqrt(0.6)) / 2, 1};
    ck_assert_uint_eq(a.steady->count, 3);
    for (int w = 0; w < 3; w++) {
        int found = 0;
        for (int i = 0; i < 3; i++) {
            const lb_steady_state *state = &a.steady->state[i];
            found += fabs(value_of(&a, state, "A") - want[w]) < 1e-12 &&
                     fabs(value_of(&a, state, "B") - 1 + want[w]) < 1e-12;
            ck_assert(value_of(&a, state, "C") == 0 && value_of(&a, state, "D") == 0);
        }
        ck_assert_int_eq(found, 1);
    }
    answer_clear(&a);
}
END_TEST

/* Each of the twenty is only lost, so none can last: one face after the other, not
 * one for each of the 2^20 sets of them. */
START_TEST(test_many_lost_species_are_dropped_together)
{
    static char buffer[20000];
    struct text t = {buffer, sizeof buffer};
    put(&t, "units none\n-> A, k = 2\nA ->, k = 1\n");
    for (int i = 0; i < 20; i++)
        put(&t, "[C%d]0 = 1\nC%d -> A, k = 1\n", i, i);
    struct answer a = ask(buffer);
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(value_of(&a, a.steady->state, "A"), 2.0, 1e-13, 0);
    answer_clear(&a);
}
END_TEST

/* The substrate goes round C but only leaves as P: that no rates balance this is
 * seen without a start. */
START_TEST(test_no_start_is_spent_where_rates_cannot_balance)
{
    lb_steady_options options = {.skip_boundary = true};
    struct answer a = ask_with("units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n",
                               &options);
    ck_assert_uint_eq(a.steady->count, 0);
    ck_assert_uint_eq(a.steady->starts, 0);
    answer_clear(&a);
}
END_TEST

/* Four independent copies of Schloegl's second model: 3^4 states, each X 1, 2 or 3. */
START_TEST(test_independent_switches_come_in_all_combinations)
{
    static char buffer[20000];
    struct text t = {buffer, sizeof buffer};
    put(&t, "units none\n");
    for (int i = 0; i < 4; i++)
        put(&t, "[X%d]0 = 1\n2 X%d -> 3 X%d, k = 6\n3 X%d -> 2 X%d, k = 1\nX%d ->, k = 11\n-> X%d, k = 6\n", i, i, i,
            i, i, i, i);
    struct answer a = ask(buffer);
    ck_assert_uint_eq(a.steady->count, 81);
    for (size_t s = 0; s < a.steady->count; s++)
        for (int i = 0; i < 4; i++)
            assert_close(a.steady->state[s].x[i], round(a.steady->state[s].x[i]), 1e-11, 0);
    answer_clear(&a);
}
END_TEST

/* Species that exchange by twos in a tank: their sum is that of the feed, which each
 * balance holds only as a small difference of fast steps.  The larger ones are solved by
 * sparse LU. */
START_TEST(test_large_tank_is_solved)
{
    static const int sizes[] = {40, 160, 300};
    static char buffer[40000];
    int n = sizes[_i];
    struct text t = {buffer, sizeof buffer};
    uint64_t counter = 0;
    put(&t, "units none\nresidence = 100\n[S0]in = 1\n");
    for (int s = 0; s < n; s++)
        put(&t, "2 S%d <-> S%d + S%d, kf = %.17g, kr = %.17g\n", s, (s * 7 + 1) % n, (s + 1) % n,
            pow(10, draw(1, &counter, 0, 4)), pow(10, draw(1, &counter, 0, 4)));
    struct answer a = ask(buffer);
    double sum = 0;
    ck_assert_uint_ge(a.steady->count, 1);
    for (int i = 0; i < a.steady->states; i++)
        sum += a.steady->state[0].x[i];
    assert_close(sum, 1.0, 1e-11, 0);
    ck_assert(a.steady->state[0].residual < 1e-13);
    answer_clear(&a);
}
END_TEST

/* ---- Continua and degenerate states ----------------------------------------------------------- */

/* Kermack and McKendrick's epidemic: without infected, any number of susceptible
 * rests. */
START_TEST(test_continuum_on_a_face_is_one_state)
{
    struct answer a = ask("units none\n[S]0 = 10\n[I]0 = 1\nS + I -> 2 I, k = 1\nI -> R, k = 1\n");
    ck_assert_int_eq(a.steady->continuum, 1);
    ck_assert_uint_eq(a.steady->count, 1);
    ck_assert(value_of(&a, a.steady->state, "I") == 0);
    ck_assert_int_ne(a.steady->state->stable, LB_YES);
    answer_clear(&a);
}
END_TEST

/* The two exchanges balance at every composition. */
START_TEST(test_continuum_inside_is_one_state)
{
    struct answer a = ask("units none\n[X]0 = 1\n[Y]0 = 2\nX + Y -> 2 Y, k = 3\nX + Y -> 2 X, k = 3\n");
    int inside = 0;
    for (size_t i = 0; i < a.steady->count; i++)
        inside += !a.steady->state[i].is_boundary;
    ck_assert_int_eq(a.steady->continuum, 1);
    ck_assert_int_eq(inside, 1);
    ck_assert_int_eq(a.steady->state[0].stable, LB_UNDECIDED);
    answer_clear(&a);
}
END_TEST

/* 2 P <-> D is all that is left in the end: D = K P^2, which ends where both are gone.  One
 * state, in whatever units the same numbers are written. */
START_TEST(test_end_of_a_continuum_is_none_of_its_own)
{
    static const double units[] = {1, 1e3, 1e-3, 6e20, 1e12};
    char text[500];
    double c = units[_i];
    snprintf(text, sizeof text, "units none\n[A]0 = %.17g\nA -> P + Q, k = 1\n2 P <-> D, kf = %.17g, kr = 100\nD + Q -> A, k = %.17g\n"
             "Q ->, k = 0.3\nA ->, k = 0.1\n", 1e-4 * c, 1e6 / c, 1e3 / c);
    struct answer a = ask(text);
    ck_assert_int_eq(a.steady->continuum, 1);
    ck_assert_uint_eq(a.steady->count, 1);
    answer_clear(&a);
}
END_TEST

/* Schloegl's second model at its fold, B = 6 + 2/(3 sqrt 3) (exact): a double root
 * at X = 2 - 1/sqrt 3 is one state, undecided, and no continuum. */
START_TEST(test_fold_is_one_undecided_state)
{
    char text[400];
    snprintf(text, sizeof text, "units none\n[X]0 = 1\n2 X -> 3 X, k = 6\n3 X -> 2 X, k = 1\nX ->, k = 11\n-> X, k = %.17g\n",
             6 + 2 / (3 * sqrt(3)));
    struct answer a = ask(text);
    ck_assert_int_eq(a.steady->continuum, 0);
    ck_assert_uint_eq(a.steady->count, 2);
    assert_close(a.steady->state[1].x[0], 2 - 1 / sqrt(3), 1e-7, 0);
    ck_assert_int_eq(a.steady->state[1].stable, LB_UNDECIDED);
    ck_assert_int_eq(a.steady->state[1].kind, LB_KIND_UNDECIDED);
    ck_assert_int_eq(a.steady->state[0].stable, LB_YES);
    answer_clear(&a);
}
END_TEST

/* k1 A = k3: the positive state has just met X = 0; nothing on the way there
 * counts as a state of its own. */
START_TEST(test_transcritical_point_is_the_boundary_state_alone)
{
    struct answer a = ask("units none\n[X]0 = 1\nX -> 2 X, k = 1\n2 X -> X, k = 1\nX ->, k = 1\n");
    ck_assert_uint_eq(a.steady->count, 1);
    ck_assert(a.steady->state[0].is_boundary);
    ck_assert_int_eq(a.steady->state[0].stable, LB_UNDECIDED);
    answer_clear(&a);
}
END_TEST

/* A constant of zero switches a step off, and with it B + C is conserved too. */
START_TEST(test_rate_constant_of_zero_conserves_more)
{
    struct answer a = ask("units none\n[A]0 = 1\n[B]0 = 2\nA <-> D, kf = 1, kr = 1\nB <-> C, kf = 1, kr = 3\nB -> A, k = 0\n"
                          "A -> B, k = 0\n");
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(value_of(&a, a.steady->state, "A"), 0.5, 1e-12, 0);
    assert_close(value_of(&a, a.steady->state, "B"), 1.5, 1e-12, 0);
    answer_clear(&a);
}
END_TEST

/* ---- Signed variables ---------------------------------------------------------------------------- */

/* Duffing's double well far from any scale that the file names: roots at 0, +-1e4. */
START_TEST(test_signed_roots_far_from_the_start_are_found)
{
    struct answer a = ask("units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = [X] - 1e-8*[X]^3 - 0.1*[Y]\n");
    ck_assert_uint_eq(a.steady->count, 3);
    assert_close(value_of(&a, &a.steady->state[0], "X"), 1e4, 1e-12, 0);
    assert_close(value_of(&a, &a.steady->state[1], "X"), 0.0, 0, 1e-12);
    assert_close(value_of(&a, &a.steady->state[2], "X"), -1e4, 1e-12, 0);
    answer_clear(&a);
}
END_TEST

/* Van der Pol's equations rest at the origin alone.  Along y = -1/(mu x) the terms of
 * dy/dt cancel, and for large x what is left is small against them, but dx/dt = y is
 * no less than all of itself. */
START_TEST(test_stiff_van_der_pol_rests_at_the_origin_alone)
{
    static const double mu[] = {1, 100, 1000, 1e4, 1e6};
    char text[200];
    snprintf(text, sizeof text, "units none\nsigned x, y\nmu = %g\n[x]0 = 1\n-> x, v = [y]\n-> y, v = -[x] + mu*(1 - [x]^2)*[y]\n",
             mu[_i]);
    struct answer a = ask(text);
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(a.steady->state[0].x[0], 0, 0, 1e-12);
    assert_close(a.steady->state[0].x[1], 0, 0, 1e-12);
    answer_clear(&a);
}
END_TEST

/* Rates that die out, underflow, or saturate on the way to infinity. */
START_TEST(test_way_to_infinity_is_no_state)
{
    static const char *const text[] = {
        "units none\nsigned x\n-> x, v = exp(-[x])\n",
        "units none\nX ->, v = exp(-[X])\n",
        "units none\nsigned x\n-> x, v = 1/(1 + [x]^2)\n",
        "units none\nsigned x, y\n-> x, v = 1 - ([x] - [y])\n-> y, v = [x] - [y] + 1\n",
        "units none\nX -> Y, v = [X]/(1 + [X])\n-> X, v = 1 + 1e-3/(1 + [Y])\nY ->, v = [Y]/(1 + [Y])\n",
        "units none\nX -> Y, v = [X]/(1 + [X])\n-> X, v = 1\nY ->, k = 1\n",
    };
    struct answer a = ask(text[_i]);
    ck_assert_uint_eq(a.steady->count, 0);
    ck_assert_int_eq(a.steady->continuum, 0);
    answer_clear(&a);
}
END_TEST

START_TEST(test_large_signed_states_are_found)
{
    struct answer a = ask("units none\nsigned x, y\n-> x, v = [y]\n-> y, v = 1e20 - [x] - [y]\n");
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(a.steady->state[0].x[0], 1e20, 1e-12, 0);
    answer_clear(&a);
    a = ask("units none\nsigned x, y\n-> x, v = 1e12 - [x]\n-> y, v = [x] - [y]^3\n");
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(a.steady->state[0].x[0], 1e12, 1e-12, 0);
    assert_close(a.steady->state[0].x[1], 1e4, 1e-12, 0);
    answer_clear(&a);
}
END_TEST

/* A threefold root at the origin is one state, though Newton's method only creeps there. */
START_TEST(test_signed_degenerate_root_is_one_state)
{
    struct answer a = ask("units none\nsigned x, y\n-> x, v = [y]\n-> y, v = -[x]^3 - [y]\n");
    ck_assert_uint_eq(a.steady->count, 1);
    assert_close(a.steady->state[0].x[0], 0, 0, 1e-6);
    ck_assert_int_eq(a.steady->state[0].stable, LB_UNDECIDED);
    answer_clear(&a);
}
END_TEST

/* ---- Hill laws ------------------------------------------------------------------------------------ */

/* n genes that each make themselves, 3 G^4/(1 + sum G^4), and are lost at rate 1.  With m
 * of them present at g: 3 g^3 = 1 + m g^4, which has two roots for m = 1 and m = 2 and
 * none above (m = 2: g = 1 is one of them); so there are 1 + 2*4 + 2*6 states. */
START_TEST(test_states_on_every_face_are_found)
{
    char text[900];
    int at = snprintf(text, sizeof text, "units none\n");
    for (int i = 0; i < 4; i++)
        at += snprintf(text + at, sizeof text - (size_t)at,
                       "[G%d]0 = %d\n-> G%d, v = 3*[G%d]^4/(1 + [G0]^4 + [G1]^4 + [G2]^4 + [G3]^4)\nG%d ->, k = 1\n", i,
                       i + 1, i, i, i);
    lb_steady_options options = {.seed = (uint64_t)_i};
    struct answer a = ask_with(text, &options);
    ck_assert_uint_eq(a.steady->count, 21);
    answer_clear(&a);
}
END_TEST

/* ---- Random networks with planted states ------------------------------------------------------------ */

/* Two molecules in, two out. */
struct random_step {
    int from[2], to[2];
    double k;
};

/* n species, 2n random steps, a flow in and out of each species. */
struct random_network {
    int n;
    struct random_step step[24];
    double in[12], out[12];
};

static void make_random(uint64_t network, uint64_t *counter, int n, struct random_network *r)
{
    r->n = n;
    for (int s = 0; s < 2 * n; s++) {
        for (int side = 0; side < 2; side++) {
            r->step[s].from[side] = (int)draw(network, counter, 0, n);
            r->step[s].to[side] = (int)draw(network, counter, 0, n);
        }
        r->step[s].k = pow(10, draw(network, counter, -2, 2));
    }
    for (int i = 0; i < n; i++) {
        r->in[i] = pow(10, draw(network, counter, -2, 2));
        r->out[i] = pow(10, draw(network, counter, -2, 2));
    }
}

static void net_rates(const struct random_network *r, const double *x, double *net)
{
    for (int i = 0; i < r->n; i++)
        net[i] = r->in[i] - r->out[i] * x[i];
    for (int s = 0; s < 2 * r->n; s++) {
        const struct random_step *step = &r->step[s];
        double v = step->k * x[step->from[0]] * x[step->from[1]];
        for (int side = 0; side < 2; side++) {
            net[step->from[side]] -= v;
            net[step->to[side]] += v;
        }
    }
}

/* Non-negative a, b, c, d with a - b x + c x^2 - d x^3 = -net at both states: the
 * four directions span the plane, so two neighbours of them hold any target.
 * True when the flows a and b are enough. */
static bool plant(double x, double y, double net_x, double net_y, double out[4])
{
    const double p[4] = {1, -x, x * x, -x * x * x}, q[4] = {1, -y, y * y, -y * y * y};
    memset(out, 0, 4 * sizeof *out);
    for (int a = 0; a < 4; a++)
        for (int b = a + 1; b < 4; b++) {
            double det = p[a] * q[b] - p[b] * q[a];
            double u = (-net_x * q[b] + net_y * p[b]) / det, v = (-net_y * p[a] + net_x * q[a]) / det;
            if (u >= 0 && v >= 0) {
                out[a] = u;
                out[b] = v;
                return b == 1;
            }
        }
    ck_abort_msg("no constants plant %g and %g", x, y);
}

/* Of many candidates for the second state the one for which the fewest species
 * need autocatalysis of their own: each such species is a switch, and switches
 * multiply the states. */
static void choose_states(uint64_t network, uint64_t *counter, const struct random_network *r, double *x, double *y)
{
    double candidate[12], net_x[12], net_y[12], k[4];
    int fewest = r->n + 1;
    for (int i = 0; i < r->n; i++)
        x[i] = pow(10, draw(network, counter, -2, 2));
    net_rates(r, x, net_x);
    for (int try = 0; try < 200; try++) {
        int switches = 0;
        for (int i = 0; i < r->n; i++)
            candidate[i] = pow(10, draw(network, counter, -2, 2));
        net_rates(r, candidate, net_y);
        for (int i = 0; i < r->n; i++)
            switches += !plant(x[i], candidate[i], net_x[i], net_y[i], k);
        if (switches < fewest) {
            fewest = switches;
            memcpy(y, candidate, sizeof candidate);
        }
    }
}

static void write_planted(uint64_t network, int n, double *x, double *y, struct text *t)
{
    uint64_t counter = 0;
    struct random_network r;
    double net_x[12], net_y[12], k[4];
    make_random(network, &counter, n, &r);
    choose_states(network, &counter, &r, x, y);
    net_rates(&r, x, net_x);
    net_rates(&r, y, net_y);
    put(t, "units none\n");
    for (int s = 0; s < 2 * n; s++)
        put(t, "S%d + S%d -> S%d + S%d, k = %.17g\n", r.step[s].from[0], r.step[s].from[1], r.step[s].to[0],
            r.step[s].to[1], r.step[s].k);
    for (int i = 0; i < n; i++) {
        bool is_simple = plant(x[i], y[i], net_x[i], net_y[i], k);
        put(t, "-> S%d, k = %.17g\nS%d ->, k = %.17g\n", i, r.in[i] + k[0], i, r.out[i] + k[1]);
        if (!is_simple)
            put(t, "2 S%d -> 3 S%d, k = %.17g\n3 S%d -> 2 S%d, k = %.17g\n", i, i, k[2], i, i, k[3]);
    }
}

static bool is_found(const struct answer *a, const double *want, int n)
{
    for (size_t s = 0; s < a->steady->count; s++) {
        double worst = 0;
        for (int i = 0; i < n; i++) {
            char name[16];
            snprintf(name, sizeof name, "S%d", i);
            worst = fmax(worst, fabs(value_of(a, &a->steady->state[s], name) / want[i] - 1));
        }
        if (worst < 1e-6)
            return true;
    }
    return false;
}

/* In the short run every planted state of 30 networks; in the long one of 500, where one
 * in a hundred may be missed. */
START_TEST(test_planted_states_are_found)
{
    static char buffer[20000];
    bool is_long = getenv("LB_TEST_LONG") != NULL;
    int networks = is_long ? 500 : 30, missed = 0;
    for (int network = 0; network < networks; network++) {
        int n = 3 + network % 10;
        double x[12], y[12];
        struct text t = {buffer, sizeof buffer};
        write_planted((uint64_t)network, n, x, y, &t);
        lb_steady_options options = {.skip_boundary = true};
        struct answer a = ask_with(buffer, &options);
        for (int which = 0; which < 2; which++)
            if (!is_found(&a, which ? y : x, n)) {
                fprintf(stderr, "network %d of %d species: planted state %d was missed\n", network, n, which);
                missed++;
            }
        answer_clear(&a);
    }
    ck_assert_msg(missed <= (is_long ? 10 : 0), "%d of %d planted states were missed", missed, 2 * networks);
}
END_TEST

/* ---- The contract -------------------------------------------------------------------------------------- */

static const char *const brusselator = "units none\n[A] = 1\n[B] = 3\n[X]0 = 1\n[Y]0 = 1\nA -> X, k = 1\n"
                                       "2 X + Y -> 3 X, k = 1\nB + X -> Y, k = 1\nX ->, k = 1\n";

START_TEST(test_same_seed_gives_the_same_bits)
{
    struct answer a = ask(cases[CASES - 1].text), b = ask(cases[CASES - 1].text);
    ck_assert_uint_eq(a.steady->count, b.steady->count);
    for (size_t i = 0; i < a.steady->count; i++)
        ck_assert(memcmp(a.steady->state[i].x, b.steady->state[i].x, (size_t)a.steady->states * sizeof(double)) == 0);
    answer_clear(&a);
    answer_clear(&b);
}
END_TEST

static bool stop_at_once(void *context)
{
    (void)context;
    return true;
}

START_TEST(test_monitor_stops_the_search)
{
    lb_monitor monitor = {.stop = stop_at_once};
    lb_steady_options options = {.monitor = &monitor};
    struct answer a = ask_with(brusselator, &options);
    ck_assert(a.steady->interrupted);
    ck_assert_uint_eq(a.steady->starts, 0);
    answer_clear(&a);
}
END_TEST

START_TEST(test_negative_start_is_refused)
{
    const double x0[] = {-1, 1};
    lb_steady_options options = {.x0 = x0};
    lb_network *network = support_network(brusselator);
    lb_system *system = NULL;
    lb_steady *steady = NULL;
    lb_error err;
    ck_assert_int_eq(lb_system_new(network, &system, &err), LB_OK);
    ck_assert_int_eq(lb_steady_solve(system, &options, &steady, &err), LB_E_ARG);
    ck_assert_ptr_null(steady);
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

/* A face, a continuum, a tank with a pool. */
static const char *const small[] = {
    "units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E, k = 2\n",
    "units none\n[S]0 = 10\n[I]0 = 1\nS + I -> 2 I, k = 1\nI -> R, k = 1\n",
    "units none\nresidence = 10\n[A]in = 1\nA + B -> 2 B, k = 1\n[B]0 = 1\n",
};
enum { SMALL = sizeof small / sizeof *small };

START_TEST(test_each_failing_allocation_is_survived)
{
    lb_network *network = support_network(small[_i]);
    lb_system *system = NULL;
    lb_error err;
    ck_assert_int_eq(lb_system_new(network, &system, &err), LB_OK);
    lb_steady_options options = {.starts = 2};
    lb_status status = LB_E_NOMEM;
    for (long k = 0; status != LB_OK; k += k < 600 ? 1 : 97) {
        lb_steady *steady = NULL;
        memory_fail_after(k);
        status = lb_steady_solve(system, &options, &steady, &err);
        memory_fail_after(-1);
        ck_assert_msg(status == LB_OK || (status == LB_E_NOMEM && steady == NULL), "allocation %ld: %s", k, err.message);
        lb_steady_free(steady);
    }
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

Suite *steady_suite(void)
{
    Suite *suite = suite_create("steady");
    TCase *reference = tcase_create("reference");
    tcase_set_timeout(reference, 60);
    tcase_add_loop_test(reference, test_reference_case_holds_with_products_held, 0, CASES);
    tcase_add_loop_test(reference, test_reference_case_holds_with_products_accumulating, 0, CASES);
    tcase_add_test(reference, test_product_that_accumulates_is_reported);
    suite_add_tcase(suite, reference);
    TCase *faces = tcase_create("faces");
    tcase_add_test(faces, test_closed_enzyme_ends_on_the_face_without_substrate);
    tcase_add_test(faces, test_class_without_enzyme_rests);
    tcase_add_test(faces, test_totals_are_those_of_the_state_given);
    tcase_add_test(faces, test_boundary_is_left_out_when_asked);
    tcase_add_test(faces, test_faces_of_faces_are_searched);
    tcase_add_test(faces, test_rate_law_that_vanishes_makes_a_face);
    tcase_add_test(faces, test_decay_leaves_only_the_empty_state);
    tcase_add_test(faces, test_tank_loses_what_nothing_feeds);
    tcase_add_test(faces, test_many_lost_species_are_dropped_together);
    tcase_add_test(faces, test_no_start_is_spent_where_rates_cannot_balance);
    tcase_add_test(faces, test_independent_switches_come_in_all_combinations);
    tcase_add_loop_test(faces, test_large_tank_is_solved, 0, 3);
    tcase_set_timeout(faces, 30);
    tcase_add_loop_test(faces, test_states_on_every_face_are_found, 0, 4);
    suite_add_tcase(suite, faces);
    TCase *degenerate = tcase_create("degenerate");
    tcase_add_test(degenerate, test_continuum_on_a_face_is_one_state);
    tcase_add_test(degenerate, test_continuum_inside_is_one_state);
    tcase_add_loop_test(degenerate, test_end_of_a_continuum_is_none_of_its_own, 0, 5);
    tcase_add_test(degenerate, test_fold_is_one_undecided_state);
    tcase_add_test(degenerate, test_transcritical_point_is_the_boundary_state_alone);
    tcase_add_test(degenerate, test_rate_constant_of_zero_conserves_more);
    tcase_add_test(degenerate, test_signed_roots_far_from_the_start_are_found);
    tcase_add_loop_test(degenerate, test_stiff_van_der_pol_rests_at_the_origin_alone, 0, 5);
    tcase_add_loop_test(degenerate, test_way_to_infinity_is_no_state, 0, 6);
    tcase_add_test(degenerate, test_large_signed_states_are_found);
    tcase_add_test(degenerate, test_signed_degenerate_root_is_one_state);
    suite_add_tcase(suite, degenerate);
    TCase *planted = tcase_create("planted");
    tcase_set_timeout(planted, 120);
    tcase_add_test(planted, test_planted_states_are_found);
    suite_add_tcase(suite, planted);
    TCase *contract = tcase_create("contract");
    tcase_set_timeout(contract, 60);
    tcase_add_test(contract, test_same_seed_gives_the_same_bits);
    tcase_add_test(contract, test_monitor_stops_the_search);
    tcase_add_test(contract, test_negative_start_is_refused);
    tcase_add_loop_test(contract, test_each_failing_allocation_is_survived, 0, SMALL);
    suite_add_tcase(suite, contract);
    return suite;
}
