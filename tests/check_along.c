/* Folds and Hopf points along one constant: closed forms, and values computed in 40 digits
 * (steady state and vanishing Hurwitz determinant, or discriminant). */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "support.h"

Suite *along_suite(void);

enum { MOST_POINTS = 4, MOST_SPECIES = 6 };

struct expected {
    lb_special_kind kind;
    double value, omega;                /* omega NAN: no reference */
    double x[MOST_SPECIES];             /* of the first species; NAN: no reference from there on */
};

struct along_case {
    const char *source, *text, *constant;
    int count;
    struct expected point[MOST_POINTS];
    double relative;                    /* of values; states have 100 times that */
};

#define GRAY_SCOTT(b0, k2) \
    "units none\ntau = 20 in 1 .. 1000\n[a]0 = 0.3\n[b]0 = 0.7\n-> a, v = 1/tau\na ->, k = 1/tau\n-> b, v = " b0 "/tau\n" \
    "b ->, k = 1/tau\na + 2 b -> 3 b, k = 1\nb ->, k = " k2 "\n"
#define GOODWIN(n) \
    "units none\nk = 3 in 0.1 .. 1000\n[X]0 = 0.5\n[Y]0 = 0.5\n[Z]0 = 1\n-> X, v = k/(1 + [Z]^" n ")\nX ->, k = 1\n" \
    "-> Y, v = [X]\nY ->, k = 1\n-> Z, v = [Y]\nZ ->, k = 1\n"

static const struct along_case cases[] = {
    {"Prigogine and Lefever 1968 (from memory); exact: B = 1 + A^2, omega = A",
     "units none\n[A] = 1\n[B] = 1.5 in 0.1 .. 10\n[X]0 = 1\n[Y]0 = 1\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
     "B + X -> Y + D, k = 1\nX -> E, k = 1\n", "[B]", 1, {{LB_HOPF, 2, 1, {1, 2, NAN}}}, 1e-10},
    {"the same at A = 2",
     "units none\n[A] = 2\n[B] = 1.5 in 0.1 .. 10\n[X]0 = 1\n[Y]0 = 1\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
     "B + X -> Y + D, k = 1\nX -> E, k = 1\n", "[B]", 1, {{LB_HOPF, 5, 2, {NAN}}}, 1e-10},
    {"Tyson and Fife's two-variable Oregonator; computed in 40 digits",
     "units none\neps = 0.04\nq = 8e-4\nf = 1 in 0.1 .. 10\n[X]0 = 0.1\n[Z]0 = 0.1\n"
     "-> X, v = ([X]*(1 - [X]) - f*[Z]*([X] - q)/([X] + q))/eps\n-> Z, v = [X] - [Z]\n", "f", 2,
     {{LB_HOPF, 0.5226119872771534, 3.4672384340590052, {0.4791303056553623, 0.4791303056553623, NAN}},
      {LB_HOPF, 2.3380401795209123, 4.89389511659348, {0.0019916235112992595, 0.0019916235112992595, NAN}}}, 1e-10},
    {"scaled three-variable Oregonator; computed in 40 digits",
     "units none\neps = 0.0099\neps2 = 1.98e-5\nq = 7.62e-5\nf = 1 in 0.1 .. 10\n[X]0 = 0.1\n[Y]0 = 0.1\n[Z]0 = 0.1\n"
     "-> X, v = (q*[Y] - [X]*[Y] + [X]*(1 - [X]))/eps\n-> Y, v = (-q*[Y] - [X]*[Y] + f*[Z])/eps2\n-> Z, v = [X] - [Z]\n", "f", 2,
     {{LB_HOPF, 0.5051832866360055, 7.0647776492520755, {0.49497223336505775, 0.5051055266354739, 0.49497223336505775, NAN}},
      {LB_HOPF, 2.3323633013368696, 3.9799655335860558, {0.00019054506856332442, 1.6660863781341533, 0.00019054506856332442, NAN}}},
     1e-10},
    {"Schloegl's second model: B = 6 -+ 2 sqrt(3)/9 exactly",
     "units none\n[B] = 6 in 4 .. 8\n[X]0 = 0.5\n2 X -> 3 X, k = 6\n3 X -> 2 X, k = 1\nX -> B, k = 11\nB -> X, k = 1\n", "[B]", 2,
     {{LB_FOLD, 5.61509982054025, NAN, {2.5773502691896257, NAN}}, {LB_FOLD, 6.38490017945975, NAN, {1.4226497308103743, NAN}}},
     1e-12},
    {"the same near its cusp, at k3 = 2.9; computed in 40 digits",
     "units none\n[B] = 0.9 in 0.5 .. 1.5\n[X]0 = 0.5\n2 X -> 3 X, k = 3\n3 X -> 2 X, k = 1\nX -> B, k = 2.9\nB -> X, k = 1\n",
     "[B]", 2, {{LB_FOLD, 0.8878283876109964, NAN, {NAN}}, {LB_FOLD, 0.9121716123890037, NAN, {NAN}}}, 1e-12},
    {"Van der Pol: mu = 0, omega = 1",
     "units none\nsigned X, Y\nmu = 1 in -1.3 .. 2\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = mu*(1 - [X]^2)*[Y] - [X]\n", "mu", 1,
     {{LB_HOPF, 0, 1, {0, 0, NAN}}}, 1e-10},
    {"Goodwin 1965, secant condition: k = 5 4^(1/10), omega = sqrt 3", GOODWIN("10"), "k", 1,
     {{LB_HOPF, 5.743491774985175, 1.7320508075688772, {1.148698354997035, 1.148698354997035, 1.148698354997035, NAN}}}, 1e-10},
    {"the same with exponent 8: the limit of the secant condition", GOODWIN("8"), "k", 0, {{0}}, 0},
    {"Higgins and Selkov: v^2 k1 = k2^3, omega = k2",
     "units none\nv = 0.7 in 0.01 .. 100\n[S]0 = 1\n[P]0 = 1.2\n-> S, k = v\nS + 2 P -> 3 P, k = 1\nP ->, k = 1\n", "v", 1,
     {{LB_HOPF, 1, 1, {1, 1, NAN}}}, 1e-10},
    {"Elowitz and Leibler 2000, Box 1 (from memory), without leak; computed in 40 digits",
     "units none\na = 216 in 1 .. 1000\nb = 5\n[m1]0 = 1\n[m2]0 = 2\n[m3]0 = 3\n[p1]0 = 1\n[p2]0 = 2\n[p3]0 = 3\n"
     "-> m1, v = a/(1 + [p3]^2)\nm1 ->, k = 1\n-> p1, v = b*[m1]\np1 ->, k = b\n"
     "-> m2, v = a/(1 + [p1]^2)\nm2 ->, k = 1\n-> p2, v = b*[m2]\np2 ->, k = b\n"
     "-> m3, v = a/(1 + [p2]^2)\nm3 ->, k = 1\n-> p3, v = b*[m3]\np3 ->, k = b\n", "a", 1,
     {{LB_HOPF, 7.393774506123549, 1.0963763171773129, {1.7775240629106945, 1.7775240629106945, NAN}}}, 1e-10},
    {"Selkov 1968, scaled as in Strogatz 1994; computed in 40 digits",
     "units none\na = 0.08\nb = 0.6 in 0.1 .. 2\n[X]0 = 1\n[Y]0 = 1\n-> X, v = -[X] + a*[Y] + [X]^2*[Y]\n"
     "-> Y, v = b - a*[Y] - [X]^2*[Y]\n", "b", 2,
     {{LB_HOPF, 0.34641016151377546, 0.4472135954999579, {0.34641016151377546, 1.7320508075688772, NAN}},
      {LB_HOPF, 0.848528137423857, 0.8944271909999159, {0.848528137423857, 1.0606601717798212, NAN}}}, 1e-10},
    {"Lorenz 1963, both symmetric states: r = s (s + b + 3)/(s - b - 1)",
     "units none\nsigned X, Y, Z\ns = 10\nb = 8/3\nr = 28 in 2 .. 40\n[X]0 = 1\n[Y]0 = 1\n[Z]0 = 1\n-> X, v = s*([Y] - [X])\n"
     "-> Y, v = [X]*(r - [Z]) - [Y]\n-> Z, v = [X]*[Y] - b*[Z]\n", "r", 2,
     {{LB_HOPF, 24.736842105263158, NAN, {NAN}}, {LB_HOPF, 24.736842105263158, NAN, {NAN}}}, 1e-10},
    {"Gray and Scott 1983, isola: folds 64/9 and 64; the neutral saddle at 9.9008 is no Hopf point",
     GRAY_SCOTT("0", "0.046875"), "tau", 3,
     {{LB_FOLD, 64.0 / 9, NAN, {NAN}}, {LB_HOPF, 45.96694481875737, 0.041521029643964834, {0.3169872981077807, 0.21650635094610965, NAN}},
      {LB_FOLD, 64, NAN, {NAN}}}, 1e-10},
    {"the same with other decay, 1/40", GRAY_SCOTT("0", "0.025"), "tau", 3,
     {{LB_FOLD, 5.0806661517033245, NAN, {NAN}}, {LB_HOPF, 163.17690357584064, 0.024237238191230834, {0.19687277094991773, 0.15811388300841897, NAN}},
      {LB_FOLD, 314.9193338482967, NAN, {NAN}}}, 1e-10},
    {"the same without decay: extinction at 4 exactly", GRAY_SCOTT("0", "0"), "tau", 1, {{LB_FOLD, 4, NAN, {NAN}}}, 1e-10},
    {"the same with feed 1/10: ignition and extinction in closed form", GRAY_SCOTT("0.1", "0"), "tau", 2,
     {{LB_FOLD, 2.6582994749248763, NAN, {0.6381966011250105, NAN}}, {LB_FOLD, 2.826298571656641, NAN, {0.8618033988749895, NAN}}}, 1e-10},
    {"Edelstein's network: B + C is conserved; computed in 40 digits",
     "units none\nT0 = 18 in 5 .. 50\n[A]0 = 1\n[B]0 = T0\nA <-> 2 A, kf = 8.5, kr = 1\nA + B <-> C, kf = 1, kr = 0.2\n"
     "C <-> B, kf = 1, kr = 0.1\n", "T0", 2, {{LB_FOLD, 13.83321984324336, NAN, {NAN}}, {LB_FOLD, 24.144486763771, NAN, {NAN}}}, 1e-10},
    {"Wilhelm 2009, smallest bistable scheme: k4 = 2", 
     "units none\nk4 = 1.5 in 0.5 .. 4\n[X]0 = 1\n[Y]0 = 1\nY -> 2 X, k = 8\n2 X -> X + Y, k = 1\nX + Y -> Y, k = 1\nX ->, k = k4\n",
     "k4", 1, {{LB_FOLD, 2, NAN, {NAN}}}, 1e-10},
    {"Lotka's centre has a zero real part everywhere and no Hopf point",
     "units none\nk = 1 in 0.1 .. 10\n[X]0 = 1\n[Y]0 = 2\nX -> 2 X, k = k\nX + Y -> 2 Y, k = 1\nY ->, k = 1\n", "k", 0, {{0}}, 0},
};
enum { CASES = sizeof cases / sizeof *cases };

/* The folds of the feed cases have Hopf points beside them, so these ask for folds alone. */
static const struct along_case folds[] = {
    {"Gray and Scott 1984, feed 1/100, decay 1/20; computed in 40 digits", GRAY_SCOTT("0.01", "0.05"), "tau", 2,
     {{LB_FOLD, 7.008556489493646, NAN, {NAN}}, {LB_FOLD, 57.07309352498337, NAN, {NAN}}}, 1e-10},
    {"mushroom: feed 1/15, decay 1/40; computed in 40 digits", GRAY_SCOTT("(1/15)", "0.025"), "tau", 4,
     {{LB_FOLD, 3.6390489954377894, NAN, {NAN}}, {LB_FOLD, 5.1505539624892105, NAN, {NAN}}, {LB_FOLD, 310.64619682709554, NAN, {NAN}},
      {LB_FOLD, 439.6753113260886, NAN, {NAN}}}, 1e-10},
};
enum { FOLDS = sizeof folds / sizeof *folds };

struct answer {
    lb_network *network;
    lb_system *system;
    lb_along *along;
};

static struct answer ask(const char *text, const char *constant)
{
    struct answer a = {.network = support_network(text)};
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_system_new(a.network, &a.system, &err) == LB_OK, "%s", err.message);
    lb_along_options options = {.constant = lb_network_find_constant(a.network, constant)};
    ck_assert_msg(lb_along_solve(a.system, &options, &a.along, &err) == LB_OK, "%s", err.message);
    return a;
}

static void answer_clear(struct answer *a)
{
    lb_along_free(a->along);
    lb_system_free(a->system);
    lb_network_free(a->network);
}

static void compare(const lb_special *got, const struct expected *want, double relative)
{
    ck_assert_int_eq(got->kind, want->kind);
    assert_close(got->value, want->value, relative, relative);
    if (!isnan(want->omega) && want->kind == LB_HOPF)
        assert_close(got->omega, want->omega, 100 * relative, 0);
    for (int i = 0; i < MOST_SPECIES && !isnan(want->x[i]); i++)
        assert_close(got->x[i], want->x[i], 1e-8, 1e-10);
}

START_TEST(test_special_points_are_located)
{
    const struct along_case *c = &cases[_i];
    struct answer a = ask(c->text, c->constant);
    ck_assert_msg(a.along->count == (size_t)c->count, "%s: %zu points, wanted %d", c->source, a.along->count, c->count);
    for (int i = 0; i < c->count; i++)
        compare(&a.along->special[i], &c->point[i], c->relative);
    answer_clear(&a);
}
END_TEST

START_TEST(test_folds_of_hysteresis_are_located)
{
    const struct along_case *c = &folds[_i];
    struct answer a = ask(c->text, c->constant);
    int found = 0;
    for (size_t i = 0; i < a.along->count; i++)
        if (a.along->special[i].kind == LB_FOLD) {
            ck_assert_int_lt(found, c->count);
            compare(&a.along->special[i], &c->point[found++], c->relative);
        }
    ck_assert_int_eq(found, c->count);
    answer_clear(&a);
}
END_TEST

/* Each special point is a steady state at its value, and a Hopf point's pair is imaginary. */
START_TEST(test_special_points_have_their_eigenvalues)
{
    struct answer a = ask(cases[13].text, "tau");
    for (size_t i = 0; i < a.along->count; i++) {
        const lb_special *point = &a.along->special[i];
        double k[8], J[4], f[2];
        for (int j = 0; j < lb_network_constants(a.network); j++)
            k[j] = lb_network_default(a.network, j);
        k[a.along->constant] = point->value;
        lb_evaluator *evaluator;
        ck_assert_int_eq(lb_evaluator_new(a.system, &evaluator, NULL), LB_OK);
        ck_assert_int_eq(lb_evaluator_bind(evaluator, k, NULL), LB_OK);
        lb_rhs(evaluator, point->x, f);
        lb_jacobian(evaluator, point->x, J);
        assert_close(f[0], 0, 0, 1e-15);
        assert_close(f[1], 0, 0, 1e-15);
        if (point->kind == LB_HOPF) {
            assert_close(J[0] + J[3], 0, 0, 1e-14);
            assert_close(J[0] * J[3] - J[1] * J[2], point->omega * point->omega, 1e-10, 0);
        } else {
            assert_close(J[0] * J[3] - J[1] * J[2], 0, 0, 1e-12);
        }
        lb_evaluator_free(evaluator);
    }
    answer_clear(&a);
}
END_TEST

START_TEST(test_constant_without_range_is_refused)
{
    lb_network *network = support_network("units none\nk = 1\n[X]0 = 1\nX ->, k = k\n");
    lb_system *system = NULL;
    lb_along *along = NULL;
    lb_error err = {.code = LB_OK};
    ck_assert_int_eq(lb_system_new(network, &system, NULL), LB_OK);
    lb_along_options options = {.constant = 0};
    ck_assert_int_eq(lb_along_solve(system, &options, &along, &err), LB_E_ARG);
    ck_assert_ptr_null(along);
    ck_assert(strstr(err.message, "range") != NULL);
    options.constant = 7;
    ck_assert_int_eq(lb_along_solve(system, &options, &along, NULL), LB_E_ARG);
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

static bool stop_later(void *context)
{
    return --*(int *)context < 0;
}

START_TEST(test_monitor_stops_the_search)
{
    lb_network *network = support_network(cases[0].text);
    lb_system *system = NULL;
    lb_along *along = NULL;
    ck_assert_int_eq(lb_system_new(network, &system, NULL), LB_OK);
    int left = 150;
    lb_monitor monitor = {.stop = stop_later, .context = &left};
    lb_along_options options = {.constant = lb_network_find_constant(network, "[B]"), .monitor = &monitor};
    ck_assert_int_eq(lb_along_solve(system, &options, &along, NULL), LB_OK);
    ck_assert(along->interrupted);
    lb_along_free(along);
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

/* Every 97th allocation fails in turn, from three first ones on: most are of the steady states' own. */
START_TEST(test_each_failing_allocation_is_survived)
{
    lb_network *network = support_network("units none\nv = 1 in 0.5 .. 2\n[X]0 = 1\n-> X, k = v\nX ->, k = 1\n");
    lb_system *system = NULL;
    ck_assert_int_eq(lb_system_new(network, &system, NULL), LB_OK);
    lb_status status = LB_E_NOMEM;
    for (long i = _i; status != LB_OK; i += 97) {
        lb_along_options options = {.constant = 0};
        lb_along *along = NULL;
        memory_fail_after(i);
        status = lb_along_solve(system, &options, &along, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        ck_assert((along != NULL) == (status == LB_OK));
        lb_along_free(along);
    }
    lb_system_free(system);
    lb_network_free(network);
}
END_TEST

Suite *along_suite(void)
{
    Suite *suite = suite_create("along");
    TCase *located = tcase_create("located");
    tcase_set_timeout(located, 30);
    tcase_add_loop_test(located, test_special_points_are_located, 0, CASES);
    tcase_add_loop_test(located, test_folds_of_hysteresis_are_located, 0, FOLDS);
    tcase_add_test(located, test_special_points_have_their_eigenvalues);
    suite_add_tcase(suite, located);
    TCase *contract = tcase_create("contract");
    tcase_set_timeout(contract, 30);
    tcase_add_test(contract, test_constant_without_range_is_refused);
    tcase_add_test(contract, test_monitor_stops_the_search);
    tcase_add_loop_test(contract, test_each_failing_allocation_is_survived, 0, 3);
    suite_add_tcase(suite, contract);
    return suite;
}
