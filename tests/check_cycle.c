/* Periodic orbits: reference cycles, rest, centres, runaways, and what must not be
 * taken for one another.
 *
 * Reference periods, extrema and multipliers: Newton shooting in 113-bit arithmetic
 * (Gragg-Bulirsch-Stoer, or extrapolated linearly implicit Euler where stiff), the
 * periods cross-checked with section returns of other integrators.  Van der Pol,
 * mu = 1: published as 6.66328685932313018969968.  Models: see networks/. */
#include "analysis/cycle.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/integrate.h"
#include "base/memory.h"
#include "support.h"

#define BRUSSELATOR(B)                                                                            \
    "units none\n[A] = 1\n[B] = " B "\n[X]0 = 1.2\n[Y]0 = 3\n"                                    \
    "A -> X, k = 1\n2 X + Y -> 3 X, k = 1\nB + X -> Y + D, k = 1\nX -> E, k = 1\n"

#define VAN_DER_POL(mu)                                                                           \
    "units none\nsigned X, Y\nmu = " mu "\n[X]0 = 2\n-> X, v = [Y]\n-> Y, v = mu*(1 - [X]^2)*[Y] - [X]\n"

#define ROESSLER(c)                                                                               \
    "units none\nsigned X, Y, Z\na = 0.2\nb = 0.2\nc = " c "\n[X]0 = 1\n[Y]0 = 1\n"               \
    "-> X, v = -[Y] - [Z]\n-> Y, v = [X] + a*[Y]\n-> Z, v = b + [Z]*([X] - c)\n"

#define OREGONATOR                                                                                \
    "units M s\n[A] = 0.06\n[B] = 0.06\n[X]0 = 1e-8\n[Y]0 = 1e-6\n[Z]0 = 1e-6\n"                  \
    "A + Y -> X, k = 1.34\nX + Y -> P, k = 1.6e9\nB + X -> 2 X + Z, k = 8000\n"                   \
    "2 X -> Q, k = 4e7\nZ -> Y, k = 1\n"

#define GOODWIN                                                                                   \
    "units none\n[X]0 = 0.5\n[Y]0 = 0.5\n[Z]0 = 1\n-> X, v = 10/(1 + [Z]^10)\nX ->, k = 1\n"     \
    "-> Y, v = [X]\nY ->, k = 1\n-> Z, v = [Y]\nZ ->, k = 1\n"

#define LOTKA_VOLTERRA                                                                            \
    "units none\n[A] = 1\n[X]0 = 2\n[Y]0 = 1\n"                                                   \
    "A + X -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n"

typedef struct extent {
    const char *species;
    double low, high;
} extent;

typedef struct reference {
    const char *name, *text;
    double period;
    double multiplier[2];         /* the largest; the rest are below 1e-7 */
    double extrema;               /* relative tolerance of the extrema */
    extent extent[6];
} reference;

static const reference references[] = {
    {"Brusselator", BRUSSELATOR("3"), 7.15691992117988, {0.00025163757998897094}, 1e-8,
     {{"X", 0.3705523898982563, 3.7517739112336606}, {"Y", 0.8523255020666852, 4.7221246707372915}}},
    {"Brusselator, products held", BRUSSELATOR("3") "[D] = 0\n[E] = 0\n",
     7.15691992117988, {0.00025163757998897094}, 1e-8,
     {{"X", 0.3705523898982563, 3.7517739112336606}, {"Y", 0.8523255020666852, 4.7221246707372915}}},
    {"Oregonator", OREGONATOR, 48.751292087021525, {0}, 1e-6,
     {{"X", 5.02784219597974e-11, 5.921758940533244e-06},
      {"Y", 9.072364865839547e-10, 0.0005306952898207447},
      {"Z", 2.425530188070672e-08, 0.0007540811304539505}}},
    {"Oregonator, products held", OREGONATOR "[P] = 0\n[Q] = 0\n", 48.751292087021525, {0}, 1e-6,
     {{"X", 5.02784219597974e-11, 5.921758940533244e-06},
      {"Y", 9.072364865839547e-10, 0.0005306952898207447},
      {"Z", 2.425530188070672e-08, 0.0007540811304539505}}},
    {"Oregonator, two variables",
     "units none\neps = 0.04\nq = 8e-4\nf = 1\n[X]0 = 0.1\n[Z]0 = 0.1\n"
     "-> X, v = ([X]*(1 - [X]) - f*[Z]*([X] - q)/([X] + q))/eps\n-> Z, v = [X] - [Z]\n",
     5.759266975961936, {0}, 1e-8,
     {{"X", 0.0008042053320592161, 0.8533188860976583}, {"Z", 0.003996560885607699, 0.3172692879463483}}},
    {"Oregonator, three variables",
     "units none\neps = 9.9e-3\neps2 = 1.98e-5\nq = 7.62e-5\nf = 1\n[X]0 = 0.1\n[Y]0 = 0.1\n[Z]0 = 0.1\n"
     "-> X, v = (q*[Y] - [X]*[Y] + [X]*(1 - [X]))/eps\n-> Y, v = (-q*[Y] - [X]*[Y] + f*[Z])/eps2\n"
     "-> Z, v = [X] - [Z]\n",
     7.736523598898496, {0}, 1e-8,
     {{"X", 7.625687485160123e-05, 0.9523462881031355},
      {"Y", 0.012861611685759876, 1340.6814718618039},
      {"Z", 0.00035626872442739765, 0.27926767389185314}}},
    {"Oregonator, scaled rate laws",
     "units none\ns = 77.27\nq = 8.375e-6\nw = 0.161\n[Y1]0 = 1\n[Y2]0 = 2\n[Y3]0 = 3\n"
     "-> Y1, v = s*([Y2] - [Y1]*[Y2] + [Y1] - q*[Y1]^2)\n-> Y2, v = (-[Y2] - [Y1]*[Y2] + [Y3])/s\n"
     "-> Y3, v = w*([Y1] - [Y3])\n",
     302.8580440275797, {0}, 1e-6,
     {{"Y1", 1.000565702790049, 117845.77840133691},
      {"Y2", 0.003024550384273892, 1768.697867346907},
      {"Y3", 1.0056079761622667, 31263.84402829578}}},
    {"van der Pol, mu = 0.1", VAN_DER_POL("0.1"), 6.287111272288727, {0.5330692592096739}, 1e-8,
     {{"X", -2.000103979872796, 2.000103979872796}, {"Y", -2.011564649732844, 2.011564649732844}}},
    {"van der Pol, mu = 1", VAN_DER_POL("1"), 6.66328685932313, {0.0008596950636038052}, 1e-8,
     {{"X", -2.0086198608748433, 2.0086198608748433}, {"Y", -2.678441479606978, 2.678441479606978}}},
    {"van der Pol, mu = 5", VAN_DER_POL("5"), 11.61223066771957, {0}, 1e-8,
     {{"X", -2.0215080615623213, 2.0215080615623213}, {"Y", -7.637158827386026, 7.637158827386026}}},
    {"van der Pol, mu = 10", VAN_DER_POL("10"), 19.078369566939013, {0}, 1e-8,
     {{"X", -2.0142853609264053, 2.0142853609264053}, {"Y", -14.18014728705647, 14.18014728705647}}},
    {"PER protein",
     "units uM h\nvs = 0.76 uM/h\nvm = 0.65 uM/h\nKm = 0.5 uM\nks = 0.38 h^-1\nvd = 0.95 uM/h\nk1 = 1.9 h^-1\n"
     "k2 = 1.3 h^-1\nKI = 1 uM\nKd = 0.2 uM\nn = 4\nK1 = 2 uM\nK2 = 2 uM\nK3 = 2 uM\nK4 = 2 uM\n"
     "V1 = 3.2 uM/h\nV2 = 1.58 uM/h\nV3 = 5 uM/h\nV4 = 2.5 uM/h\n"
     "[M]0 = 0.1\n[P0]0 = 0.25\n[P1]0 = 0.25\n[P2]0 = 0.25\n[PN]0 = 0.25\n"
     "-> M, v = vs/(1 + ([PN]/KI)^n)\nM ->, v = vm*[M]/(Km + [M])\n-> P0, v = ks*[M]\n"
     "P0 -> P1, v = V1*[P0]/(K1 + [P0])\nP1 -> P0, v = V2*[P1]/(K2 + [P1])\n"
     "P1 -> P2, v = V3*[P1]/(K3 + [P1])\nP2 -> P1, v = V4*[P2]/(K4 + [P2])\n"
     "P2 <-> PN, kf = k1, kr = k2\nP2 ->, v = vd*[P2]/(Kd + [P2])\n",
     23.662784340213577, {0.18847377200631127, 1.2079714513388773e-08}, 1e-8,
     {{"M", 0.5178047603702025, 2.893765099487675},
      {"P0", 0.38384581540558244, 1.8099033122874892},
      {"P1", 0.3042507278655952, 1.039703312941618},
      {"P2", 0.22118486866705994, 0.9761918118922989},
      {"PN", 0.33447317119372, 1.4144441670747963}}},
    {"Goodwin, n = 10", GOODWIN,
     3.6968082427785114, {0.8027014090422553, 1.9007968920353208e-05}, 1e-8,
     {{"X", 0.6555232455221616, 2.067277564274439},
      {"Y", 0.9160526172849055, 1.616335183499414},
      {"Z", 1.0802424205782126, 1.4335287846731661}}},
    {"repressilator",
     "units none\na = 216\na0 = 0.216\nb = 5\nn = 2\n[m1]0 = 1\n[m2]0 = 2\n[m3]0 = 3\n[p1]0 = 1\n[p2]0 = 2\n[p3]0 = 3\n"
     "-> m1, v = a/(1 + [p3]^n) + a0\n-> m2, v = a/(1 + [p1]^n) + a0\n-> m3, v = a/(1 + [p2]^n) + a0\n"
     "m1 ->, k = 1\nm2 ->, k = 1\nm3 ->, k = 1\n-> p1, v = b*[m1]\n-> p2, v = b*[m2]\n-> p3, v = b*[m3]\n"
     "p1 ->, k = b\np2 ->, k = b\np3 ->, k = b\n",
     8.68933083212766, {0.16885609430267476}, 1e-8,
     {{"m1", 1.2146020382099416, 60.64373566643228}, {"m2", 1.2146020382099416, 60.64373566643228},
      {"m3", 1.2146020382099416, 60.64373566643228}, {"p1", 1.2504105534991452, 59.212149326440915},
      {"p2", 1.2504105534991452, 59.212149326440915}, {"p3", 1.2504105534991452, 59.212149326440915}}},
    {"Selkov",
     "units none\na = 0.08\nb = 0.6\n[X]0 = 1\n[Y]0 = 1\n-> Y, k = b\nY -> X, k = a\n2 X + Y -> 3 X, k = 1\nX ->, k = 1\n",
     9.622607779046913, {0.1412726418073738}, 1e-8,
     {{"X", 0.24525423832226026, 1.5175609655825253}, {"Y", 0.38847363537401647, 2.3380251152691955}}},
    {"cubic autocatalysis in a tank",
     "units none\nresidence = 164\n[a]in = 1\n[a]0 = 0.2\n[b]0 = 0.16\na + 2 b -> 3 b, k = 1\nb ->, k = 0.025\n",
     275.24743043709157, {0.9307046607032835}, 1e-8,
     {{"a", 0.12037276247938956, 0.29922369364120954}, {"b", 0.11085802503521162, 0.22628683798804497}}},
    /* The product flows out with the rest: one more multiplier, exp(-period/residence). */
    {"cubic autocatalysis in a tank, with its product",
     "units none\nresidence = 164\n[a]in = 1\n[a]0 = 0.2\n[b]0 = 0.16\na + 2 b -> 3 b, k = 1\nb -> c, k = 0.025\n",
     275.24743043709157, {0.9307046607032835, 0.18668398893}, 1e-8,
     {{"a", 0.12037276247938956, 0.29922369364120954}, {"b", 0.11085802503521162, 0.22628683798804497}}},
    {"Roessler, c = 2.5", ROESSLER("2.5"), 5.748991183278001, {-0.7696936417339536, -5.1743043250339254e-06}, 1e-8,
     {{NULL, 0, 0}}},
    {"Roessler, c = 3.5, two loops", ROESSLER("3.5"), 11.545218287762903, {-0.4187354199499269}, 1e-8,
     {{NULL, 0, 0}}},
};

/* ---- Running one mechanism --------------------------------------------------------- */

typedef struct bench {
    lb_network *net;
    lb_system *sys;
    lb_evaluator *ev;
    double *x;
    cycle_report report;
} bench;

/* System, evaluator and initial state of b->net. */
static void bench_start(bench *b)
{
    lb_error err = {.message = ""};
    ck_assert_msg(lb_system_new(b->net, &b->sys, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_evaluator_new(b->sys, &b->ev, &err) == LB_OK, "%s", err.message);
    b->x = calloc((size_t)lb_network_states(b->net), sizeof *b->x);
    lb_initial(b->ev, b->x);
}

static void bench_open(bench *b, const char *text)
{
    memset(b, 0, sizeof *b);
    b->net = support_network(text);
    bench_start(b);
}

static void bench_find(bench *b, const cycle_options *options)
{
    lb_error err = {.message = ""};
    lb_status status = cycle_find(b->ev, b->x, options, &b->report, &err);
    ck_assert_msg(status == LB_OK, "%s", err.message);
}

static void bench_close(bench *b)
{
    cycle_report_clear(&b->report);
    free(b->x);
    lb_evaluator_free(b->ev);
    lb_system_free(b->sys);
    lb_network_free(b->net);
}

static void assert_outcome(const bench *b, cycle_outcome wanted)
{
    ck_assert_msg(b->report.outcome == wanted, "outcome %d (%s), wanted %d", (int)b->report.outcome,
                  b->report.why, (int)wanted);
}

static void find_in(bench *b, const char *text, cycle_outcome wanted)
{
    bench_open(b, text);
    bench_find(b, NULL);
    assert_outcome(b, wanted);
}

/* ---- Reference cycles ----------------------------------------------------------------- */

static void assert_multipliers(const reference *r, const lb_cycle *cycle)
{
    ck_assert_int_ge(cycle->multiplier_count, 1);
    for (int i = 0; i < cycle->multiplier_count; i++) {
        double wanted = i < 2 ? r->multiplier[i] : 0;
        ck_assert_msg(fabs(cycle->multipliers[i].re - wanted) <= 1e-7 + 1e-5 * fabs(wanted) &&
                          fabs(cycle->multipliers[i].im) <= 1e-7,
                      "%s: multiplier %d is %.12g%+.3gi, wanted %.12g", r->name, i, cycle->multipliers[i].re,
                      cycle->multipliers[i].im, wanted);
    }
    ck_assert_int_eq(cycle->stable, LB_YES);
}

START_TEST(test_reference_cycles_are_closed)
{
    const reference *r = &references[_i];
    bench b;
    find_in(&b, r->text, CYCLE_CLOSED);
    const lb_cycle *cycle = b.report.cycle;
    ck_assert_msg(fabs(cycle->period - r->period) <= 1e-8 * r->period, "%s: period %.15g, wanted %.15g", r->name,
                  cycle->period, r->period);
    assert_multipliers(r, cycle);
    for (int i = 0; i < 6 && r->extent[i].species; i++) {
        int state = lb_network_find_state(b.net, r->extent[i].species);
        ck_assert_int_ge(state, 0);
        assert_close(cycle->low[state], r->extent[i].low, r->extrema, 0);
        assert_close(cycle->high[state], r->extent[i].high, r->extrema, 0);
    }
    ck_assert_msg(cycle->closure < 1e-9, "%s: closure %g", r->name, cycle->closure);
    ck_assert_msg(cycle->confirmed < 1e-7, "%s: confirmed to %g", r->name, cycle->confirmed);
    bench_close(&b);
}
END_TEST

START_TEST(test_brusselator_cycle_is_the_same_from_three_starts)
{
    static const double start[3][2] = {{0.2, 0.3}, {1.01, 3.0}, {6, 1}};
    bench b;
    bench_open(&b, BRUSSELATOR("3"));
    b.x[lb_network_find_state(b.net, "X")] = start[_i][0];
    b.x[lb_network_find_state(b.net, "Y")] = start[_i][1];
    bench_find(&b, NULL);
    assert_outcome(&b, CYCLE_CLOSED);
    assert_close(b.report.cycle->period, 7.15691992117988, 1e-8, 0);
    bench_close(&b);
}
END_TEST

START_TEST(test_products_have_no_extrema)
{
    bench b;
    find_in(&b, BRUSSELATOR("3"), CYCLE_CLOSED);
    ck_assert(isnan(b.report.cycle->low[lb_network_find_state(b.net, "D")]));
    ck_assert(isnan(b.report.cycle->high[lb_network_find_state(b.net, "E")]));
    ck_assert(isfinite(b.report.cycle->x[lb_network_find_state(b.net, "D")]));
    bench_close(&b);
}
END_TEST

/* Liouville: the product of all multipliers is exp of the integral of the trace of the
 * Jacobian over one period.  The trapezoidal rule on a periodic function converges
 * faster than any power. */
static double trace_integral(const bench *b)
{
    enum { POINTS = 2000 };
    const lb_cycle *cycle = b->report.cycle;
    int n = cycle->states;
    double J[16], sum = 0;
    integrator *it = NULL;
    integrator_options how = {.tolerance = 1e-12, .allow_negative = true};
    ck_assert_int_le(n, 4);
    ck_assert_int_eq(integrator_new(b->ev, &how, &it, NULL), LB_OK);
    integrator_start(it, 0, cycle->x);
    for (int k = 0; k < POINTS; k++) {
        lb_jacobian(b->ev, integrator_state(it), J);
        for (int i = 0; i < n; i++)
            sum += isnan(cycle->low[i]) ? 0 : J[i + i * n];
        ck_assert_int_eq(integrator_to(it, (k + 1) * cycle->period / POINTS, NULL), LB_OK);
    }
    integrator_free(it);
    return sum * cycle->period / POINTS;
}

START_TEST(test_multipliers_multiply_to_the_integral_of_the_trace)
{
    static const char *const texts[] = {BRUSSELATOR("3"), VAN_DER_POL("1"), ROESSLER("2.5"), GOODWIN};
    bench b;
    find_in(&b, texts[_i], CYCLE_CLOSED);
    double product = 1;
    for (int i = 0; i < b.report.cycle->multiplier_count; i++)
        product *= b.report.cycle->multipliers[i].re;
    assert_close(product, exp(trace_integral(&b)), 1e-6, 0);
    bench_close(&b);
}
END_TEST

/* Near the Hopf point at B = 2 the multiplier is close to one and the cycle small:
 * slow, but no centre.  Period 2 pi to first order. */
START_TEST(test_slow_attraction_is_no_centre)
{
    bench b;
    find_in(&b, BRUSSELATOR("2.002"), CYCLE_CLOSED);
    ck_assert(b.report.cycle->multipliers[0].re > 0.98 && b.report.cycle->multipliers[0].re < 0.995);
    assert_close(b.report.cycle->period, 6.283185307179586, 2e-3, 0);
    bench_close(&b);
}
END_TEST

START_TEST(test_slower_attraction_is_no_centre)
{
    bench b;
    find_in(&b, BRUSSELATOR("2.0002"), CYCLE_CLOSED);
    /* The multiplier is exp(-2 (B - 2) pi) to first order. */
    assert_close(1 - b.report.cycle->multipliers[0].re, 4e-4 * 3.14159265358979, 0.02, 0);
    bench_close(&b);
}
END_TEST

/* Asymptotic period for large mu: A. A. Dorodnitsyn, Prikl. Mat. Mekh. 11 (1947) 313,
 * with the constants as corrected since (from memory); the next term is of the order
 * mu^(-4/3). */
START_TEST(test_relaxation_oscillations_of_large_ratios)
{
    static const double ratio[] = {30, 100, 1000};
    static const char *const text[] = {VAN_DER_POL("30"), VAN_DER_POL("100"), VAN_DER_POL("1000")};
    double mu = ratio[_i];
    double series = (3 - 2 * log(2)) * mu + 7.014322 / cbrt(mu) - 2 * log(mu) / (3 * mu) - 1.3246 / mu;
    bench b;
    find_in(&b, text[_i], CYCLE_CLOSED);
    assert_close(b.report.cycle->period, series, 0, 0.5 * pow(mu, -4.0 / 3));
    ck_assert(fabs(b.report.cycle->multipliers[0].re) < 1e-8);
    bench_close(&b);
}
END_TEST

/* ---- Rest --------------------------------------------------------------------------------- */

START_TEST(test_stable_focus_is_rest_with_swings)
{
    bench b;
    find_in(&b, BRUSSELATOR("1.7"), CYCLE_SETTLED);
    assert_close(b.report.rest[lb_network_find_state(b.net, "X")], 1, 1e-9, 0);
    assert_close(b.report.rest[lb_network_find_state(b.net, "Y")], 1.7, 1e-9, 0);
    /* Eigenvalues -0.15 +- 0.98869i: each swing is exp(-2 pi 0.15/0.98869) of the last. */
    ck_assert_int_ge(b.report.swings, 3);
    assert_close(b.report.swing_decay, exp(-2 * 3.14159265358979 * 0.15 / 0.9886859966642595), 0.05, 0);
    ck_assert_int_ge(b.report.swing_species, 0);
    bench_close(&b);
}
END_TEST

/* x'' + 0.1 x' + x = 0 about (10, 10): each swing is exp(-0.1 pi/omega) = 0.73 of the last, so 22 of
 * them are above a thousandth of the first. */
START_TEST(test_swings_are_counted_down_to_a_thousandth)
{
    bench b;
    find_in(&b, "units none\n[X]0 = 11\n[Y]0 = 10\n-> X, v = [Y] - 10\n"
            "-> Y, v = -([X] - 10) - 0.1*([Y] - 10)\n", CYCLE_SETTLED);
    ck_assert_int_ge(b.report.swings, 21);
    ck_assert_int_le(b.report.swings, 23);
    assert_close(b.report.swing_decay, exp(-0.1 * 3.14159265358979 / sqrt(1 - 0.0025)), 1e-4, 0);
    bench_close(&b);
}
END_TEST

/* Too many swings to wait for: x'' + 1e-4 x' + x = 0 has ln(1000)/(1e-4 pi) of them above a
 * thousandth of the first. */
START_TEST(test_long_ringing_is_rest_with_many_swings)
{
    bench b;
    find_in(&b, "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X] - 1e-4*[Y]\n", CYCLE_SETTLED);
    assert_close(b.report.swings, log(1000) / (1e-4 * 3.14159265358979), 0.01, 0);
    assert_close(1 - b.report.swing_decay, 1e-4 * 3.14159265358979, 0.01, 0);
    ck_assert(fabs(b.report.rest[0]) < 1e-6);
    bench_close(&b);
}
END_TEST

/* POLLU decays over ten decades of time; fast species follow slow ones, with signs of
 * their rates that are only noise. */
START_TEST(test_noise_is_no_swing)
{
    bench b;
    memset(&b, 0, sizeof b);
    b.net = support_network_file("networks/pollu.mech");
    bench_start(&b);
    bench_find(&b, NULL);
    assert_outcome(&b, CYCLE_SETTLED);
    ck_assert_int_eq(b.report.swings, 0);
    bench_close(&b);
}
END_TEST

START_TEST(test_slow_focus_is_rest)
{
    bench b;
    find_in(&b, BRUSSELATOR("1.99"), CYCLE_SETTLED);
    assert_close(b.report.rest[lb_network_find_state(b.net, "Y")], 1.99, 1e-6, 0);
    ck_assert_int_ge(b.report.swings, 20);
    bench_close(&b);
}
END_TEST

/* Prey alone grow to what they can, a saddle once there are predators; so large a state is
 * held to the tolerance only, and never still. */
START_TEST(test_rest_at_a_saddle_that_attracts_its_face_is_rest)
{
    bench b;
    bench_open(&b, LOTKA_VOLTERRA "2 X -> X, k = 1e-3\n");
    b.x[lb_network_find_state(b.net, "X")] = 2e-5;
    b.x[lb_network_find_state(b.net, "Y")] = 0;
    bench_find(&b, NULL);
    assert_outcome(&b, CYCLE_SETTLED);
    assert_close(b.report.rest[lb_network_find_state(b.net, "X")], 1000, 1e-6, 0);
    bench_close(&b);
}
END_TEST

START_TEST(test_relaxation_to_a_node_has_no_swings)
{
    bench b;
    find_in(&b, "units none\n[A]0 = 1\nA <-> B, kf = 2, kr = 1\nB <-> C, kf = 1e4, kr = 3\n", CYCLE_SETTLED);
    ck_assert_int_eq(b.report.swings, 0);
    ck_assert_int_eq(b.report.swing_species, -1);
    bench_close(&b);
}
END_TEST

/* Robertson's problem rests on the boundary, at a state with a vanishing eigenvalue. */
START_TEST(test_degenerate_rest_is_rest)
{
    bench b;
    find_in(&b, "units none\n[A]0 = 1\nA -> B, k = 0.04\n2 B -> B + C, k = 3e7\nB + C -> A + C, k = 1e4\n",
            CYCLE_SETTLED);
    assert_close(b.report.rest[lb_network_find_state(b.net, "C")], 1, 1e-4, 0);
    bench_close(&b);
}
END_TEST

/* The same where it starts at rest, and Newton's matrix is singular. */
START_TEST(test_degenerate_start_at_rest_is_rest)
{
    bench b;
    find_in(&b, "units none\n[C]0 = 1\nA -> B, k = 0.04\n2 B -> B + C, k = 3e7\nB + C -> A + C, k = 1e4\n",
            CYCLE_SETTLED);
    ck_assert_uint_eq(b.report.steps, 0);
    bench_close(&b);
}
END_TEST

START_TEST(test_transient_oscillation_of_a_closed_mechanism)
{
    bench b;
    find_in(&b, "units none\n[P]0 = 500\nP -> A, k = 2e-3\nA -> B, k = 0.01\nA + 2 B -> 3 B, k = 1\nB -> C, k = 1\n",
            CYCLE_SETTLED);
    ck_assert_int_ge(b.report.swings, 10);
    bench_close(&b);
}
END_TEST

/* ---- Centres, runaways, motion without a period ------------------------------------------- */

START_TEST(test_lotka_volterra_is_a_centre_with_the_period_of_its_start)
{
    bench b;
    find_in(&b, LOTKA_VOLTERRA, CYCLE_CENTRE);
    const lb_cycle *cycle = b.report.cycle;
    int X = lb_network_find_state(b.net, "X"), Y = lb_network_find_state(b.net, "Y");
    /* By quadrature along the level of X + Y - ln X - ln Y. */
    assert_close(cycle->period, 6.608482671235056, 1e-8, 0);
    assert_close(cycle->low[X], 0.4063757399599599, 1e-8, 0);
    assert_close(cycle->high[X], 2, 1e-8, 0);
    assert_close(cycle->low[Y], 0.4063757399599599, 1e-8, 0);
    assert_close(cycle->high[Y], 2, 1e-8, 0);
    assert_close(cycle->multipliers[0].re, 1, 1e-6, 0);
    ck_assert_int_eq(cycle->stable, LB_NO);
    ck_assert(cycle->confirmed > 0 && cycle->confirmed < 1e-7);
    bench_close(&b);
}
END_TEST

START_TEST(test_harmonic_oscillator_is_a_centre)
{
    bench b;
    find_in(&b, "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = 3*[Y]\n-> Y, v = -3*[X]\n", CYCLE_CENTRE);
    assert_close(b.report.cycle->period, 2 * 3.14159265358979324 / 3, 1e-9, 0);
    bench_close(&b);
}
END_TEST

/* Damping that falls with the square of the amplitude has closed orbits, to any
 * tolerance, where the amplitude is small enough; damping by 1e-10 has them nowhere, and
 * by 1e-12 neither (growth, there).  The third follows a species besides, so that the start does
 * not lie in the plane of the motion. */
START_TEST(test_weak_damping_is_no_centre)
{
    static const char *const texts[] = {
        "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X] - 1e-5*[X]^2*[Y]\n",
        "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X] - 1e-10*[Y]\n",
        "units none\nsigned X, Y, W\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X] - 1e-5*[X]^2*[Y]\n"
        "-> W, v = [X]^2 - [W]\n",
        LOTKA_VOLTERRA "2 X -> X, k = 1e-11\n",
        "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X] + 1e-12*[Y]\n",
    };
    bench b;
    find_in(&b, texts[_i], CYCLE_UNDECIDED);
    bench_close(&b);
}
END_TEST

START_TEST(test_method_says_what_was_done)
{
    bench b;
    lb_cycle *cycle = NULL;
    find_in(&b, LOTKA_VOLTERRA, CYCLE_CENTRE);
    ck_assert(strstr(b.report.cycle->method, "without a drift") && strstr(b.report.cycle->method, "closed again"));
    bench_close(&b);
    find_in(&b, BRUSSELATOR("3"), CYCLE_CLOSED);
    ck_assert(strstr(b.report.cycle->method, "confirmed") && !strstr(b.report.cycle->method, "drift"));
    bench_close(&b);
    /* Closed on demand, and confirmed or not: the words go with the number. */
    bench_open(&b, LOTKA_VOLTERRA);
    ck_assert_int_eq(cycle_close(b.ev, b.x, 6.6, NULL, &cycle, NULL), LB_OK);
    ck_assert_ptr_nonnull(cycle);
    ck_assert_int_eq(strstr(cycle->method, "confirmed") != NULL, isfinite(cycle->confirmed) != 0);
    ck_assert(!strstr(cycle->method, "drift"));
    lb_cycle_free(cycle);
    bench_close(&b);
}
END_TEST

/* A follower of a centre: two neutral directions and one that contracts. */
START_TEST(test_centre_with_a_driven_species_is_a_centre)
{
    bench b;
    find_in(&b, LOTKA_VOLTERRA "X -> X + W, k = 1\nW -> Q, k = 2\n[W]0 = 0.5\nW + R -> W + S, k = 1e-3\n"
            "S -> R, k = 1\n[R]0 = 1\n", CYCLE_CENTRE);
    bench_close(&b);
}
END_TEST

START_TEST(test_growth_is_unbounded)
{
    static const char *const texts[] = {
        "units none\n[X]0 = 1\nX -> 2 X, k = 1\n",
        "units none\n[X]0 = 1\n2 X -> 3 X, k = 1\n",
        "units none\n[X]0 = 1\n-> X, k = 1\nX + E -> X + F, k = 1\nF -> E, k = 1\n[E]0 = 1\n",
    };
    bench b;
    find_in(&b, texts[_i], CYCLE_UNBOUNDED);
    bench_close(&b);
}
END_TEST

START_TEST(test_chaos_is_undecided)
{
    static const char *const texts[] = {
        "units none\nsigned X, Y, Z\n[X]0 = 1\n[Y]0 = 1\n[Z]0 = 1\n"
        "-> X, v = 10*([Y] - [X])\n-> Y, v = [X]*(28 - [Z]) - [Y]\n-> Z, v = [X]*[Y] - 8*[Z]/3\n",
        ROESSLER("5.7"),
    };
    bench b;
    bench_open(&b, texts[_i]);
    bench_find(&b, &(cycle_options){.max_returns = 500});
    assert_outcome(&b, CYCLE_UNDECIDED);
    ck_assert_ptr_null(b.report.cycle);
    bench_close(&b);
}
END_TEST

/* Two Brusselators that do not feel each other: a torus, no closed orbit. */
START_TEST(test_torus_is_undecided)
{
    bench b;
    bench_open(&b, "units none\ng = 1.618033988749895\n[X1]0 = 1.2\n[Y1]0 = 3\n[X2]0 = 1.3\n[Y2]0 = 2.4\n"
               "-> X1, k = 1\n2 X1 + Y1 -> 3 X1, k = 1\nX1 -> Y1, k = 3\nX1 ->, k = 1\n"
               "-> X2, k = g\n2 X2 + Y2 -> 3 X2, k = g\nX2 -> Y2, v = g*2.5*[X2]\nX2 ->, k = g\n");
    bench_find(&b, &(cycle_options){.max_returns = 500});
    assert_outcome(&b, CYCLE_UNDECIDED);
    bench_close(&b);
}
END_TEST

/* May and Leonard's three competitors approach a cycle of saddles: every turn takes
 * longer than the last, and nothing closes. */
START_TEST(test_heteroclinic_cycle_is_undecided)
{
    bench b;
    find_in(&b, "units none\n[X]0 = 0.5\n[Y]0 = 0.3\n[Z]0 = 0.2\n"
            "-> X, v = [X]*(1 - [X] - 0.8*[Y] - 1.5*[Z])\n-> Y, v = [Y]*(1 - [Y] - 0.8*[Z] - 1.5*[X])\n"
            "-> Z, v = [Z]*(1 - [Z] - 0.8*[X] - 1.5*[Y])\n", CYCLE_UNDECIDED);
    bench_close(&b);
}
END_TEST

/* A start without prey stays on its face and rests at a saddle. */
START_TEST(test_rest_on_an_invariant_face)
{
    bench b;
    find_in(&b, "units none\n[Y]0 = 1\nX -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n", CYCLE_SETTLED);
    ck_assert(fabs(b.report.rest[lb_network_find_state(b.net, "Y")]) < 1e-6);
    bench_close(&b);
}
END_TEST

/* ---- Closing on demand ----------------------------------------------------------------------- */

START_TEST(test_close_finds_the_least_period)
{
    bench b;
    lb_cycle *cycle = NULL;
    lb_error err = {.message = ""};
    bench_open(&b, VAN_DER_POL("1"));
    ck_assert_msg(cycle_close(b.ev, b.x, 3 * 6.66, NULL, &cycle, &err) == LB_OK, "%s", err.message);
    ck_assert_ptr_nonnull(cycle);
    assert_close(cycle->period, 6.66328685932313, 1e-8, 0);
    lb_cycle_free(cycle);
    bench_close(&b);
}
END_TEST

/* In reversed time van der Pol's cycle repels; its multiplier is the reciprocal. */
START_TEST(test_repelling_cycle_is_closed_but_not_stable)
{
    bench b;
    lb_cycle *cycle = NULL;
    lb_error err = {.message = ""};
    bench_open(&b, "units none\nsigned X, Y\n[X]0 = 2\n-> X, v = -[Y]\n-> Y, v = [X] - 0.1*(1 - [X]^2)*[Y]\n");
    ck_assert_msg(cycle_close(b.ev, b.x, 6.3, NULL, &cycle, &err) == LB_OK, "%s", err.message);
    ck_assert_ptr_nonnull(cycle);
    assert_close(cycle->period, 6.287111272288727, 1e-8, 0);
    assert_close(cycle->multipliers[0].re, 1 / 0.5330692592096739, 1e-6, 0);
    ck_assert_int_eq(cycle->stable, LB_NO);
    lb_cycle_free(cycle);
    bench_find(&b, NULL);
    ck_assert_int_ne(b.report.outcome, CYCLE_CLOSED);
    bench_close(&b);
}
END_TEST

/* A cycle so weak that its multiplier is one within error stands alone all the same. */
START_TEST(test_lone_otherorbit_is_no_centre)
{
    bench b;
    find_in(&b, "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = -[Y] + 5e-9*[X]*(1 - [X]^2 - [Y]^2)\n"
            "-> Y, v = [X] + 5e-9*[Y]*(1 - [X]^2 - [Y]^2)\n", CYCLE_UNDECIDED);
    bench_close(&b);
}
END_TEST

/* Without `signed` the same orbit would need negative concentrations. */
START_TEST(test_orbit_outside_the_orthant_is_none)
{
    bench b;
    lb_cycle *cycle = NULL;
    bench_open(&b, "units none\n[X]0 = 2\n-> X, v = [Y]\n-> Y, v = (1 - [X]^2)*[Y] - [X]\n");
    ck_assert_int_eq(cycle_close(b.ev, b.x, 6.66, NULL, &cycle, NULL), LB_OK);
    ck_assert_ptr_null(cycle);
    bench_find(&b, NULL);
    assert_outcome(&b, CYCLE_UNDECIDED);
    bench_close(&b);
}
END_TEST

START_TEST(test_steady_state_is_no_orbit)
{
    bench b;
    lb_cycle *cycle = NULL;
    bench_open(&b, BRUSSELATOR("3"));
    b.x[lb_network_find_state(b.net, "X")] = 1;
    ck_assert_int_eq(cycle_close(b.ev, b.x, 7, NULL, &cycle, NULL), LB_OK);
    ck_assert_ptr_null(cycle);
    bench_close(&b);
}
END_TEST

START_TEST(test_close_far_from_any_orbit_finds_nothing)
{
    bench b;
    lb_cycle *cycle = NULL;
    bench_open(&b, BRUSSELATOR("1.7"));
    ck_assert_int_eq(cycle_close(b.ev, b.x, 6, NULL, &cycle, NULL), LB_OK);
    ck_assert_ptr_null(cycle);
    bench_close(&b);
}
END_TEST

static bool stop_at_once(void *context)
{
    (void)context;
    return true;
}

START_TEST(test_a_stop_is_heeded)
{
    bench b;
    lb_monitor monitor = {.stop = stop_at_once};
    bench_open(&b, BRUSSELATOR("3"));
    lb_status status = cycle_find(b.ev, b.x, &(cycle_options){.monitor = &monitor}, &b.report, NULL);
    ck_assert_int_eq(status, LB_E_STOPPED);
    bench_close(&b);
}
END_TEST

/* Every one of the Brusselator's; of a centre, which makes many more, ever wider apart. */
START_TEST(test_every_failed_allocation_is_reported)
{
    static const struct { const char *text; long divisor; } cases[] = {
        {BRUSSELATOR("3"), 1000000}, {LOTKA_VOLTERRA "X -> X + W, k = 1\nW -> Q, k = 2\n", 20}};
    bench b;
    bench_open(&b, cases[_i].text);
    lb_status status = LB_E_NOMEM;
    for (long k = 0; status != LB_OK; k += 1 + k / cases[_i].divisor) {
        ck_assert_int_lt(k, 100000);
        memory_fail_after(k);
        status = cycle_find(b.ev, b.x, NULL, &b.report, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        if (status == LB_OK)
            break;
        cycle_report_clear(&b.report);
    }
    bench_close(&b);
}
END_TEST

Suite *cycle_suite(void)
{
    Suite *suite = suite_create("cycle");
    TCase *close = tcase_create("reference");
    tcase_set_timeout(close, 60);
    tcase_add_loop_test(close, test_reference_cycles_are_closed, 0,
                        (int)(sizeof references / sizeof *references));
    tcase_add_loop_test(close, test_brusselator_cycle_is_the_same_from_three_starts, 0, 3);
    tcase_add_test(close, test_products_have_no_extrema);
    tcase_add_loop_test(close, test_multipliers_multiply_to_the_integral_of_the_trace, 0, 4);
    tcase_add_test(close, test_slow_attraction_is_no_centre);
    tcase_add_test(close, test_slower_attraction_is_no_centre);
    tcase_add_loop_test(close, test_relaxation_oscillations_of_large_ratios, 0, 3);
    suite_add_tcase(suite, close);
    TCase *rest = tcase_create("rest");
    tcase_set_timeout(rest, 60);
    tcase_add_test(rest, test_stable_focus_is_rest_with_swings);
    tcase_add_test(rest, test_swings_are_counted_down_to_a_thousandth);
    tcase_add_test(rest, test_long_ringing_is_rest_with_many_swings);
    tcase_add_test(rest, test_noise_is_no_swing);
    tcase_add_test(rest, test_slow_focus_is_rest);
    tcase_add_test(rest, test_relaxation_to_a_node_has_no_swings);
    tcase_add_test(rest, test_rest_at_a_saddle_that_attracts_its_face_is_rest);
    tcase_add_test(rest, test_degenerate_rest_is_rest);
    tcase_add_test(rest, test_degenerate_start_at_rest_is_rest);
    tcase_add_test(rest, test_transient_oscillation_of_a_closed_mechanism);
    suite_add_tcase(suite, rest);
    TCase *other = tcase_create("other motion");
    tcase_set_timeout(other, 60);
    tcase_add_test(other, test_lotka_volterra_is_a_centre_with_the_period_of_its_start);
    tcase_add_test(other, test_harmonic_oscillator_is_a_centre);
    tcase_add_test(other, test_method_says_what_was_done);
    tcase_add_loop_test(other, test_weak_damping_is_no_centre, 0, 5);
    tcase_add_test(other, test_centre_with_a_driven_species_is_a_centre);
    tcase_add_loop_test(other, test_growth_is_unbounded, 0, 3);
    tcase_add_loop_test(other, test_chaos_is_undecided, 0, 2);
    tcase_add_test(other, test_torus_is_undecided);
    tcase_add_test(other, test_heteroclinic_cycle_is_undecided);
    tcase_add_test(other, test_rest_on_an_invariant_face);
    tcase_add_test(other, test_lone_otherorbit_is_no_centre);
    suite_add_tcase(suite, other);
    TCase *demand = tcase_create("on demand");
    tcase_set_timeout(demand, 120);
    tcase_add_test(demand, test_close_finds_the_least_period);
    tcase_add_test(demand, test_repelling_cycle_is_closed_but_not_stable);
    tcase_add_test(demand, test_steady_state_is_no_orbit);
    tcase_add_test(demand, test_orbit_outside_the_orthant_is_none);
    tcase_add_test(demand, test_close_far_from_any_orbit_finds_nothing);
    tcase_add_test(demand, test_a_stop_is_heeded);
    tcase_add_loop_test(demand, test_every_failed_allocation_is_reported, 0, 2);
    suite_add_tcase(suite, demand);
    return suite;
}
