/* Integration: order of the methods, accuracy, choice, events, tangents, errors. */
#include "analysis/integrate.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/explicit.h"
#include "analysis/rosenbrock.h"
#include "analysis/stiff_matrix.h"
#include "base/memory.h"
#include "stiff_problems.h"
#include "support.h"

/* A mechanism with everything that a test needs to integrate it. */
typedef struct rig {
    lb_network *network;
    lb_system *system;
    lb_evaluator *evaluator;
    integrator *it;
    int n;
    double start[32];
    lb_error err;
} rig;

static rig rig_new(const char *text, const integrator_options *options)
{
    rig r = {.network = support_network(text)};
    ck_assert_int_eq(lb_system_new(r.network, &r.system, &r.err), LB_OK);
    ck_assert_int_eq(lb_evaluator_new(r.system, &r.evaluator, &r.err), LB_OK);
    lb_status status = integrator_new(r.evaluator, options, &r.it, &r.err);
    ck_assert_msg(status == LB_OK, "%s", r.err.message);
    r.n = lb_network_states(r.network);
    lb_initial(r.evaluator, r.start);
    integrator_start(r.it, 0, r.start);
    return r;
}

static void rig_free(rig *r)
{
    integrator_free(r->it);
    lb_evaluator_free(r->evaluator);
    lb_system_free(r->system);
    lb_network_free(r->network);
}

static void rig_to(rig *r, double t)
{
    lb_status status = integrator_to(r->it, t, &r->err);
    ck_assert_msg(status == LB_OK, "%s", r->err.message);
    ck_assert(integrator_time(r->it) == t);
}

static double value_of(const rig *r, const char *species)
{
    int state = lb_network_find_state(r->network, species);
    ck_assert_msg(state >= 0, "no %s", species);
    return integrator_state(r->it)[state];
}

#define OSCILLATOR "units none\nsigned X, Y\n[X]0 = 1\n-> X, v = [Y]\n-> Y, v = -[X]\n"
#define DECAY "units none\n[X]0 = 1\nX -> P, k = 1\n"
#define BRUSSELATOR                                                                       \
    "units none\n[A] = 1\n[B] = 3\n[X]0 = 1.1\n[Y]0 = 3\nA -> X, k = 1\n"                   \
    "2 X + Y -> 3 X, k = 1\nB + X -> Y + D, k = 1\nX -> E, k = 1\n[D] = 0\n[E] = 0\n"

/* ---- Order conditions -------------------------------------------------------------- */

/* A rooted tree as nested parentheses; all 17 up to order five.
 * Rosenbrock methods with exact Jacobian: E. Hairer and G. Wanner, volume II,
 * section IV.7, theorem 7.4. */
static const char *const trees[] = {
    "()", "(())", "(()())", "((()))", "(()()())", "(()(()))", "((()()))", "(((())))",
    "(()()()())", "(()()(()))", "((())(()))", "(()(()()))", "(()((())))", "((()()()))", "((()(())))", "(((()())))",
    "((((()))))",
};

enum { S = ROSENBROCK_STAGES };

/* Coefficients in the form of the theory: alpha, beta = alpha + Gamma, from those
 * of the transformed stages u = Gamma k. */
static double alpha[S][S], beta[S][S], gamma_matrix[S][S];

static double stage_weight(int i, int j)
{
    const rosenbrock_table *table = &rosenbrock_rodas5p;
    return j >= i ? 0 : i <= 5 ? table->a[i][j] : j < 5 ? table->a[5][j] : 1;
}

static void make_coefficients(void)
{
    const rosenbrock_table *table = &rosenbrock_rodas5p;
    for (int j = 0; j < S; j++)         /* Gamma = (I/gamma - C)^-1 by forward substitution */
        for (int i = 0; i < S; i++) {
            double sum = i == j;
            for (int k = 0; k < i; k++)
                sum += table->c[i][k] * gamma_matrix[k][j];
            gamma_matrix[i][j] = table->gamma * sum;
        }
    for (int i = 0; i < S; i++)
        for (int j = 0; j < S; j++) {
            alpha[i][j] = 0;
            for (int k = 0; k < S; k++)
                alpha[i][j] += stage_weight(i, k) * gamma_matrix[k][j];
            beta[i][j] = alpha[i][j] + gamma_matrix[i][j];
        }
}

/* Reads one tree; phi [S], its order and the product of the orders of all its
 * subtrees (the density). */
static const char *read_tree(const char *text, double phi[S], int *order, double *density)
{
    double product[S], single[S];
    int children = 0;
    *order = 1;
    *density = 1;
    for (int i = 0; i < S; i++)
        product[i] = single[i] = 1;
    for (text++; *text == '('; children++) {
        double child[S], child_density;
        int child_order;
        text = read_tree(text, child, &child_order, &child_density);
        *order += child_order;
        *density *= child_density;
        for (int i = 0; i < S; i++) {
            double with_alpha = 0;
            single[i] = 0;
            for (int j = 0; j < S; j++) {
                with_alpha += alpha[i][j] * child[j];
                single[i] += beta[i][j] * child[j];
            }
            product[i] *= with_alpha;
        }
    }
    *density *= *order;
    memcpy(phi, children == 1 ? single : product, sizeof product);
    return text + 1;
}

/* Largest |sum_i b_i phi_i - theta^order/density| over the trees up to max_order,
 * the b from the weights m of the transformed stages. */
static double order_defect(const double m[S], double theta, int max_order)
{
    double worst = 0;
    for (size_t t = 0; t < sizeof trees / sizeof *trees; t++) {
        double phi[S], density, sum = 0;
        int order;
        read_tree(trees[t], phi, &order, &density);
        if (order > max_order)
            continue;
        for (int j = 0; j < S; j++)
            for (int i = 0; i <= j; i++)
                sum += m[j] * gamma_matrix[j][i] * phi[i];
        worst = fmax(worst, fabs(sum - pow(theta, order) / density));
    }
    return worst;
}

/* The constants are of size 100 and have 16 digits: 1e-13 is what can be asked. */
START_TEST(test_rodas5p_satisfies_its_order_conditions)
{
    double m[S], embedded[S];
    make_coefficients();
    for (int j = 0; j < S; j++) {
        m[j] = j < 5 ? rosenbrock_rodas5p.a[5][j] : 1;
        embedded[j] = j == S - 1 ? 0 : m[j];
    }
    ck_assert(order_defect(m, 1, 5) < 1e-13);
    ck_assert(order_defect(embedded, 1, 4) < 1e-13);
    ck_assert(order_defect(embedded, 1, 5) > 1e-6);
    for (double theta = 0; theta < 1.05; theta += 0.1) {
        double dense[S];
        for (int j = 0; j < S; j++)
            dense[j] = theta * m[j] +
                       theta * (1 - theta) *
                           (rosenbrock_rodas5p.dense[0][j] +
                            theta * (rosenbrock_rodas5p.dense[1][j] + theta * rosenbrock_rodas5p.dense[2][j]));
        ck_assert_msg(order_defect(dense, theta, 4) < 1e-13, "dense output at %g", theta);
    }
}
END_TEST

/* ---- Accuracy ---------------------------------------------------------------------- */

static double worst_relative(const rig *r, const stiff_end *end)
{
    double worst = 0;
    for (; end->species; end++)
        worst = fmax(worst, fabs(value_of(r, end->species) / end->value - 1));
    return worst;
}

/* A tolerance of 1e-8 bounds the error of each step; over a run the end values
 * keep seven digits (the absolute tolerance of ROBER's B, 1e-6 of its peak of
 * 3.6e-5, is 4e-6 of its value at the end, where it follows A).  ROBER's A falls as
 * 1/t, with a rate A/t that is left where terms of 0.04 A cancel: their rounding is
 * 0.04 t of the unit roundoff relative to the rate, whatever the tolerance. */
START_TEST(test_published_end_values_are_reached)
{
    const lb_method methods[] = {LB_METHOD_AUTO, LB_METHOD_STIFF};
    const stiff_problem *problem = &stiff_problems[_i / 2];
    integrator_options options = {.tolerance = 1e-8, .method = methods[_i % 2]};
    rig r = rig_new(problem->text, &options);
    rig_to(&r, problem->until);
    double worst = worst_relative(&r, problem->end), rounding = 0.04 * problem->until * 0.5 * DBL_EPSILON;
    ck_assert_msg(worst < 1e-7 + (strcmp(problem->name, "ROBER") == 0 ? rounding : 0), "%s: %g", problem->name, worst);
    rig_free(&r);
}
END_TEST

START_TEST(test_tight_tolerances_give_more_digits)
{
    integrator_options options = {.tolerance = 1e-11};
    rig r = rig_new(stiff_problems[_i].text, &options);
    rig_to(&r, stiff_problems[_i].until);
    double worst = worst_relative(&r, stiff_problems[_i].end);
    ck_assert_msg(worst < 1e-9, "%s: %g", stiff_problems[_i].name, worst);
    rig_free(&r);
}
END_TEST

/* The trap: at a relative tolerance of 0.1 the Oregonator's pulse is missed
 * without a sign.  It is capped at 1e-2, and what comes out is right to that. */
START_TEST(test_loose_tolerances_are_capped_and_not_wrong)
{
    integrator_options options = {.tolerance = 0.5};
    rig r = rig_new(stiff_problems[_i].text, &options);
    ck_assert(integrator_tolerance(r.it) == 1e-2);
    rig_to(&r, stiff_problems[_i].until);
    double worst = worst_relative(&r, stiff_problems[_i].end);
    ck_assert_msg(worst < 2e-2, "%s: %g", stiff_problems[_i].name, worst);
    rig_free(&r);
}
END_TEST

/* x = exp(-t) to t = 10, both methods: the relative error of the end follows the
 * tolerance down to rounding. */
START_TEST(test_error_follows_the_tolerance_in_decay)
{
    for (int exponent = 3; exponent <= 12; exponent++) {
        integrator_options options = {.tolerance = pow(10, -exponent), .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
        rig r = rig_new(DECAY, &options);
        rig_to(&r, 10);
        double error = fabs(value_of(&r, "X") / exp(-10) - 1);
        ck_assert_msg(error < 10 * options.tolerance + 1e-14, "1e-%d: %g", exponent, error);
        ck_assert_msg(error > 1e-6 * options.tolerance, "1e-%d: %g, far too dear", exponent, error);
        rig_free(&r);
    }
}
END_TEST

/* Sixteen turns of the harmonic oscillator: the error grows with time, at most a
 * tolerance a step. */
START_TEST(test_error_follows_the_tolerance_in_oscillation)
{
    for (int exponent = 3; exponent <= 12; exponent++) {
        integrator_options options = {.tolerance = pow(10, -exponent), .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
        rig r = rig_new(OSCILLATOR, &options);
        rig_to(&r, 100);
        double error = fmax(fabs(value_of(&r, "X") - cos(100)), fabs(value_of(&r, "Y") + sin(100)));
        ck_assert_msg(error < 10 * options.tolerance, "1e-%d: %g", exponent, error);
        rig_free(&r);
    }
}
END_TEST

/* End value: 113-bit Gragg-Bulirsch-Stoer, SciPy's Radau agrees to 1.6e-14. */
START_TEST(test_michaelis_menten_is_on_time)
{
    integrator_options options = {.tolerance = 1e-10, .method = _i ? LB_METHOD_STIFF : LB_METHOD_AUTO};
    rig r = rig_new("units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n", &options);
    rig_to(&r, 5);
    assert_close(value_of(&r, "E"), 0.463390469265385235, 1e-10, 0);
    assert_close(value_of(&r, "S"), 2.71199520183223759, 1e-10, 0);
    assert_close(value_of(&r, "P"), 6.75139526743314765, 1e-10, 0);
    rig_free(&r);
}
END_TEST

/* Nothing but rounding moves a conserved total, with either method. */
START_TEST(test_conserved_totals_stay)
{
    integrator_options options = {.tolerance = 1e-4, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new("units none\n[E]0 = 1\n[S]0 = 10\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n", &options);
    rig_to(&r, 50);
    assert_close(value_of(&r, "E") + value_of(&r, "C"), 1, 1e-13, 0);
    assert_close(value_of(&r, "S") + value_of(&r, "C") + value_of(&r, "P"), 10, 1e-13, 0);
    rig_free(&r);
}
END_TEST

/* From nothing at all: a source that is first constant, x' = 1 - 1e6 x^2,
 * x = 1e-3 tanh(1e3 t), and one that nearly stays so. */
START_TEST(test_an_empty_start_is_accurate)
{
    integrator_options options = {.tolerance = 1e-9, .method = _i ? LB_METHOD_STIFF : LB_METHOD_AUTO};
    rig r = rig_new("units none\n-> X, k = 1\n2 X ->, k = 5e5\n-> Y, k = 1\nY ->, k = 1e-30\n", &options);
    rig_to(&r, 1e-3);
    assert_close(value_of(&r, "X"), 1e-3 * tanh(1), 1e-8, 0);
    rig_to(&r, 100);
    assert_close(value_of(&r, "X"), 1e-3, 1e-8, 0);
    assert_close(value_of(&r, "Y"), 100, 1e-8, 0);
    rig_free(&r);
}
END_TEST

/* Steps of up to 1e5 with rates of up to 1e3: what w J = 0 leaves of W is 1e-8 of
 * it, and totals drifted by 1e-8 while they rested on that. */
START_TEST(test_conserved_totals_stay_however_long_the_steps)
{
    integrator_options options = {.tolerance = 1e-6, .method = LB_METHOD_STIFF};
    rig r = rig_new("units none\n[X1]0 = 0.00164\n[X4]0 = 0.0712\n[X8]0 = 1\nX8 -> X0, k = 5.35\n"
                    "X4 + X0 -> X7, k = 0.000494\n2 X0 + X1 -> 3 X0, k = 3.97\nX2 <-> X3, kf = 0.00873, kr = 4.19\n"
                    "X4 <-> X2, kf = 0.000929, kr = 40.8\nX4 + X1 -> X7 + X5, k = 2.66\nX2 + X3 -> X6, k = 2870\n", &options);
    rig_to(&r, 1e6);
    ck_assert_int_eq(lb_system_laws(r.system), 2);
    for (int law = 0; law < 2; law++) {
        double before = 0, after = 0;
        for (int i = 0; i < r.n; i++) {
            before += (double)lb_system_law(r.system, law)[i] * r.start[i];
            after += (double)lb_system_law(r.system, law)[i] * integrator_state(r.it)[i];
        }
        assert_close(after, before, 1e-13, 0);
    }
    rig_free(&r);
}
END_TEST

/* X4 is zero and nothing makes it; rounding from its neighbours, decades larger,
 * had made it negative and the steps 300 times shorter. */
START_TEST(test_a_species_that_is_zero_stays_zero)
{
    integrator_options options = {.tolerance = 1e-9, .method = LB_METHOD_STIFF};
    rig r = rig_new("units none\n[X1]0 = 0.00114\n[X3]0 = 9.3\n[X6]0 = 1\nX6 -> X0, k = 2.31\nX0 + X4 -> X1, k = 0.0299\n"
                    "X4 + X3 -> X2 + X0, k = 3940\nX1 + X3 -> X5 + X2, k = 0.00135\n-> X5, k = 0.0144\n"
                    "X0 <-> X2, kf = 2.03e5, kr = 0.00704\nX0 ->, k = 0.0312\nX1 ->, k = 0.173\nX2 ->, k = 0.767\n"
                    "X3 ->, k = 0.093\nX4 ->, k = 0.0392\nX5 ->, k = 0.0378\n", &options);
    rig_to(&r, 66);
    ck_assert(value_of(&r, "X4") == 0);
    ck_assert_uint_lt(integrator_steps(r.it), 1000);
    rig_free(&r);
}
END_TEST

START_TEST(test_both_methods_agree_on_the_brusselator)
{
    double end[2][2];
    for (int m = 0; m < 2; m++) {
        integrator_options options = {.tolerance = 1e-10, .method = m ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
        rig r = rig_new(BRUSSELATOR, &options);
        rig_to(&r, 20);
        end[m][0] = value_of(&r, "X");
        end[m][1] = value_of(&r, "Y");
        rig_free(&r);
    }
    assert_close(end[0][0], end[1][0], 1e-8, 0);
    assert_close(end[0][1], end[1][1], 1e-8, 0);
}
END_TEST

/* A chain from nothing: the last species grows as t^9, so no step is short enough
 * to start it with a small relative error.  x_9 = exp(-t) t^9/9! for equal
 * constants. */
START_TEST(test_species_born_from_nothing_do_not_stop_the_run)
{
    integrator_options options = {.tolerance = 1e-10, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new("units none\nk = 1\n[X0]0 = 1\nX0 -> X1, k = k\nX1 -> X2, k = k\nX2 -> X3, k = k\nX3 -> X4, k = k\n"
                    "X4 -> X5, k = k\nX5 -> X6, k = k\nX6 -> X7, k = k\nX7 -> X8, k = k\nX8 -> X9, k = k\nX9 ->, k = k\n",
                    &options);
    rig_to(&r, 0.01);
    assert_close(value_of(&r, "X4"), exp(-0.01) * 1e-8 / 24, 1e-9, 0);
    rig_to(&r, 2);
    assert_close(value_of(&r, "X9"), exp(-2) * 512 / 362880, 1e-9, 0);
    ck_assert_uint_lt(integrator_steps(r.it), 1500);
    rig_free(&r);
}
END_TEST

/* W u = b for b = f, which is a combination of columns of N, whichever species the
 * laws give: (I/(h gamma) - J) u - f relative to its terms. */
START_TEST(test_reduced_systems_solve_the_full_ones)
{
    const double diagonal = 50, favour[4][4] = {{1, 0, 0, 0}, {0, 1, 0, 0}, {0, 0, 1, 0}, {0, 0, 0, 1}};
    rig r = rig_new("units none\n[E]0 = 1\n[S]0 = 10\n[C]0 = 0.3\nE + S <-> C, kf = 1, kr = 0.5\nC -> E + P, k = 2\n", NULL);
    double J[16], values[16], f[4], u[4];
    stiff_matrix matrix;
    lb_rhs(r.evaluator, r.start, f);
    lb_jacobian(r.evaluator, r.start, J);
    lb_jacobian_sparse(r.evaluator, r.start, values);
    ck_assert_int_eq(stiff_matrix_init(&matrix, r.system), LB_OK);
    for (int k = 0; k < 4; k++) {
        ck_assert_int_eq(stiff_matrix_choose(&matrix, favour[k]), LB_OK);
        ck_assert_int_eq(matrix.laws.free, 2);
        ck_assert_int_eq(stiff_matrix_factor(&matrix, diagonal, values), LB_OK);
        memcpy(u, f, sizeof u);
        stiff_matrix_solve(&matrix, 1, u);
        for (int i = 0; i < 4; i++) {
            double left = diagonal * u[i], size = fabs(left);
            for (int j = 0; j < 4; j++) {
                left -= J[i + 4 * j] * u[j];
                size += fabs(J[i + 4 * j] * u[j]);
            }
            assert_close(left, f[i], 0, 1e-14 * size);
        }
    }
    stiff_matrix_clear(&matrix);
    rig_free(&r);
}
END_TEST

/* ---- Choice of method ----------------------------------------------------------------- */

START_TEST(test_the_method_fits_the_problem)
{
    rig r = rig_new(BRUSSELATOR, NULL);
    rig_to(&r, 50);
    ck_assert_ptr_nonnull(strstr(integrator_method(r.it), "explicit Runge-Kutta"));
    ck_assert_ptr_null(strstr(integrator_method(r.it), "Rodas5P"));
    ck_assert_ptr_nonnull(strstr(integrator_reason(r.it), "accuracy"));
    rig_free(&r);

    r = rig_new(ROBER_TEXT, NULL);
    rig_to(&r, 1e4);
    ck_assert_ptr_nonnull(strstr(integrator_method(r.it), "Rodas5P"));
    ck_assert_ptr_nonnull(strstr(integrator_reason(r.it), "damped"));
    ck_assert_uint_lt(integrator_steps(r.it), 1200);
    rig_free(&r);

    /* Fast but growing: nothing that an explicit step could not follow. */
    r = rig_new("units none\n[Y]0 = 1\nX -> 2 X, k = 1000\nY ->, k = 1\n", NULL);
    rig_to(&r, 0.01);
    ck_assert_ptr_null(strstr(integrator_method(r.it), "Rodas5P"));
    rig_free(&r);
}
END_TEST

/* Stiff at first (a fast species that dies out), not stiff later: the damping
 * constant k falls with the catalyst E from 1e4 to nothing. */
START_TEST(test_the_explicit_method_comes_back_when_stiffness_ends)
{
    rig r = rig_new("units none\nsigned U, V\n[E]0 = 1e4\n[F]0 = 1\n[U]0 = 1\nE ->, k = 1\nF -> F + Q, k = 1\n"
                    "Q + E -> E, k = 1\n-> U, v = [V]\n-> V, v = -[U]\nQ ->, k = 1\n", NULL);
    rig_to(&r, 3);
    ck_assert_ptr_nonnull(strstr(integrator_method(r.it), "Rodas5P"));
    rig_to(&r, 20);
    size_t before = integrator_steps(r.it);
    rig_to(&r, 100);
    /* At 1e-8 the oscillation alone takes 2 explicit steps, or 10 stiff ones, a
     * time unit. */
    ck_assert_uint_lt(integrator_steps(r.it) - before, 80 * 4);
    assert_close(value_of(&r, "U"), cos(100), 0, 1e-6);
    rig_free(&r);
}
END_TEST

/* Van der Pol, mu = 1000: relaxation between slow branches and jumps.
 * Period: (3 - 2 ln 2) mu + 3 a mu^(-1/3) + O(ln mu/mu), a = 2.338107 the first zero
 * of the Airy function (A. A. Dorodnitsyn, 1947): 1614.407 less some hundredths. */
static double relaxation_period(lb_method method, double tolerance)
{
    const double weight[2] = {1, 0};
    integrator_options options = {.tolerance = tolerance, .method = method};
    rig r = rig_new("units none\nsigned X, Y\nmu = 1000\n[X]0 = 2\n-> X, v = [Y]\n"
                    "-> Y, v = mu*(1 - [X]^2)*[Y] - [X]\n", &options);
    double passed[2], x[2];
    for (int count = 0; count < 2;) {
        bool found;
        ck_assert_int_eq(integrator_step(r.it, INFINITY, &r.err), LB_OK);
        ck_assert(isfinite(integrator_state(r.it)[0]) && isfinite(integrator_state(r.it)[1]));
        ck_assert_int_eq(integrator_crossing(r.it, weight, 0, 1, &found, &passed[count], x, &r.err), LB_OK);
        count += found;
    }
    rig_free(&r);
    return passed[1] - passed[0];
}

START_TEST(test_relaxation_oscillation_keeps_its_period)
{
    double coarse = relaxation_period(LB_METHOD_AUTO, 1e-5), fine = relaxation_period(LB_METHOD_STIFF, 1e-9);
    assert_close(fine, (3 - 2 * log(2)) * 1000 + 3 * 2.338107410 / 10, 0, 0.2);
    assert_close(coarse, fine, 1e-4, 0);
}
END_TEST

/* ---- Within a step, events --------------------------------------------------------------- */

START_TEST(test_dense_output_follows_the_solution)
{
    integrator_options options = {.tolerance = 1e-9, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new(OSCILLATOR, &options);
    double x[2];
    while (integrator_time(r.it) < 7) {
        ck_assert_int_eq(integrator_step(r.it, INFINITY, &r.err), LB_OK);
        double from = integrator_last_time(r.it), size = integrator_time(r.it) - from;
        for (double theta = 0; theta <= 1; theta += 0.125) {
            double t = theta == 1 ? integrator_time(r.it) : from + theta * size;
            ck_assert_int_eq(integrator_dense(r.it, t, x, &r.err), LB_OK);
            assert_close(x[0], cos(t), 0, 3e-8);
            assert_close(x[1], -sin(t), 0, 3e-8);
            ck_assert_int_eq(integrator_restep(r.it, t, x, &r.err), LB_OK);
            assert_close(x[0], cos(t), 0, 3e-8);
        }
    }
    rig_free(&r);
}
END_TEST

/* cos t falls through zero at pi/2 + 2 k pi, every crossing is found once, and
 * the point is on the section to rounding: of t, and of a stiff step, whose constants
 * are of size 100. */
START_TEST(test_crossings_are_found_once_and_exactly)
{
    const double pi = 3.14159265358979323846, weight[2] = {1, 0};
    integrator_options options = {.tolerance = 1e-11, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new(OSCILLATOR, &options);
    int falling = 0, both = 0;
    while (integrator_time(r.it) < 20 * pi) {
        bool found;
        double t, x[2];
        ck_assert_int_eq(integrator_step(r.it, 20 * pi, &r.err), LB_OK);
        ck_assert_int_eq(integrator_crossing(r.it, weight, 0, -1, &found, &t, x, &r.err), LB_OK);
        if (found) {
            assert_close(t, pi / 2 + 2 * pi * falling, 0, 1e-9);
            assert_close(x[0], 0, 0, 4 * 2.2e-16 * t + (_i ? 100 * 2.2e-16 : 0));
            falling++;
        }
        ck_assert_int_eq(integrator_crossing(r.it, weight, 0, 0, &found, &t, x, &r.err), LB_OK);
        both += found;
    }
    ck_assert_int_eq(falling, 10);
    ck_assert_int_eq(both, 20);
    rig_free(&r);
}
END_TEST

/* The point is the end of a step of its own, on the section to rounding. */
START_TEST(test_a_crossing_is_as_good_as_a_step)
{
    const double weight[2] = {1, 0};
    integrator_options options = {.tolerance = 1e-4, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new(BRUSSELATOR, &options);
    bool found = false;
    double t, x[2], again[2];
    for (int count = 0; count < 5; count += found) {
        ck_assert_int_eq(integrator_step(r.it, INFINITY, &r.err), LB_OK);
        ck_assert_int_eq(integrator_crossing(r.it, weight, 1.5, 1, &found, &t, x, &r.err), LB_OK);
        if (found) {
            ck_assert_int_eq(integrator_restep(r.it, t, again, &r.err), LB_OK);
            ck_assert(x[0] == again[0] && x[1] == again[1]);
            assert_close(x[0], 1.5, 0, 1e-13);
        }
    }
    rig_free(&r);
}
END_TEST

/* A start on the section does not cross it; a touch between the ends of a long
 * step does: level 0.999 is passed twice within 0.09. */
START_TEST(test_short_visits_and_starts_on_the_section)
{
    const double weight[2] = {1, 0};
    integrator_options options = {.tolerance = 1e-4, .method = LB_METHOD_EXPLICIT};
    rig r = rig_new(OSCILLATOR, &options);
    int on_start = 0, visits = 0, longest = 0;
    const double rising[2] = {0, 1};
    bool crosses;
    double when, where[2];
    integrator_start(r.it, 0, rising);
    ck_assert_int_eq(integrator_step(r.it, 1, &r.err), LB_OK);
    ck_assert_int_eq(integrator_crossing(r.it, weight, 0, 0, &crosses, &when, where, &r.err), LB_OK);
    ck_assert(!crosses);
    integrator_start(r.it, 0, r.start);
    for (int k = 0; integrator_time(r.it) < 63; k++) {
        bool found;
        double t, x[2];
        ck_assert_int_eq(integrator_step(r.it, 63, &r.err), LB_OK);
        ck_assert_int_eq(integrator_crossing(r.it, weight, 1, 0, &found, &t, x, &r.err), LB_OK);
        on_start += found && k == 0;
        ck_assert_int_eq(integrator_crossing(r.it, weight, 0.99, 1, &found, &t, x, &r.err), LB_OK);
        visits += found;
        longest += integrator_time(r.it) - integrator_last_time(r.it) > 0.3;
    }
    ck_assert_int_eq(on_start, 0);
    ck_assert_int_gt(longest, 20);      /* the steps are longer than the visits, 0.28 */
    ck_assert_int_eq(visits, 10);
    rig_free(&r);
}
END_TEST

START_TEST(test_landing_on_many_times_does_not_shorten_the_steps)
{
    size_t steps[2];
    for (int often = 0; often < 2; often++) {
        rig r = rig_new(DECAY, NULL);
        rig_to(&r, 5);
        for (int k = 1; often && k <= 10; k++)
            rig_to(&r, 5 + 1e-9 * k);
        rig_to(&r, 10);
        steps[often] = integrator_steps(r.it);
        rig_free(&r);
    }
    ck_assert_uint_ge(steps[1], steps[0] + 9);
    ck_assert_uint_le(steps[1], steps[0] + 12);
}
END_TEST

/* ---- Tangents ------------------------------------------------------------------------- */

/* det P(t) = exp(integral of the trace of J), Liouville; the integral is carried
 * as a species of its own. */
START_TEST(test_determinant_of_tangents_is_the_trace_integral)
{
    integrator_options options = {.tolerance = 1e-10, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT, .tangents = true};
    rig r = rig_new(BRUSSELATOR "signed L\n-> L, v = 2*[X]*[Y] - 4 - [X]^2\n", &options);
    int x = lb_network_find_state(r.network, "X"), y = lb_network_find_state(r.network, "Y");
    rig_to(&r, 7.15691992);
    const double *P = integrator_tangents(r.it);
    double determinant = P[x + x * 3] * P[y + y * 3] - P[x + y * 3] * P[y + x * 3];
    assert_close(determinant, exp(value_of(&r, "L")), 1e-8, 0);
    rig_free(&r);
}
END_TEST

/* With rate laws that are no polynomials, against central differences of the
 * flow: step 1e-5, so an error near 1e-9 of the largest entry. */
START_TEST(test_tangents_are_the_derivative_of_the_flow)
{
    const char *text = "units none\n[S]0 = 1\n[P]0 = 0.5\n-> S, k = 1\nS -> P, v = 3*[S]/(0.2 + [S] + [P]^2)\nP ->, v = [P]^1.5\n";
    integrator_options options = {.tolerance = 1e-11, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT, .tangents = true};
    rig r = rig_new(text, &options);
    rig_to(&r, 4);
    double P[4], largest = 0;
    memcpy(P, integrator_tangents(r.it), sizeof P);
    for (int e = 0; e < 4; e++)
        largest = fmax(largest, fabs(P[e]));
    for (int j = 0; j < 2; j++) {
        double moved[2], end[2][2];
        for (int side = 0; side < 2; side++) {
            memcpy(moved, r.start, sizeof moved);
            moved[j] += side ? 1e-5 : -1e-5;
            integrator_start(r.it, 0, moved);
            rig_to(&r, 4);
            memcpy(end[side], integrator_state(r.it), sizeof end[side]);
        }
        for (int i = 0; i < 2; i++)
            assert_close(P[i + j * 2], (end[1][i] - end[0][i]) / 2e-5, 0, 1e-8 * largest);
    }
    rig_free(&r);
}
END_TEST

/* Forward sensitivities by all constants, or by two of them beside the tangents, against
 * central differences of the flow with a relative step of 1e-5 in the constant: mass action,
 * a rate law that is no polynomial, a coefficient that is a constant, a held concentration, a
 * conservation law.  Errors near 1e-9 of a column's largest entry. */
START_TEST(test_sensitivities_are_derivatives_of_the_flow)
{
    const char *text = "units none\n[E]0 = 1\n[S]0 = 2\n[A] = 0.7\nVmax = 3\nKm = 0.2\nf = 0.6\n"
                       "E + S <-> C, kf = 5, kr = 0.5\nC -> E + (f) P, k = 2\nP -> Q, v = Vmax*[P]/(Km + [P])\nA -> S, k = 0.3\n";
    const lb_method method = _i % 2 ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT;
    const int chosen[2] = {4, 1};
    integrator_options options = {.tolerance = 1e-11, .method = method};
    rig r = rig_new(text, &options);
    int m = lb_network_constants(r.network), count = _i < 2 ? m : 2;
    options.sensitivities = count;
    options.constants = _i < 2 ? NULL : chosen;
    options.tangents = _i >= 2;
    integrator *it = NULL;
    ck_assert_int_eq(integrator_new(r.evaluator, &options, &it, &r.err), LB_OK);
    integrator_start(it, 0, r.start);
    ck_assert_int_eq(integrator_to(it, 3, &r.err), LB_OK);
    const double *derivative = integrator_sensitivities(it);
    ck_assert((integrator_tangents(it) != NULL) == options.tangents);
    double k[16], end[2][8], most = 0;
    ck_assert(m <= 16 && r.n <= 8);
    for (int c = 0; c < count; c++) {
        int constant = _i < 2 ? c : chosen[c];
        double value = lb_network_default(r.network, constant), step = 1e-5 * value, largest = 0;
        for (int side = 0; side < 2 && step > 0; side++) {
            for (int j = 0; j < m; j++)
                k[j] = lb_network_default(r.network, j) + (j == constant ? (side ? step : -step) : 0);
            ck_assert_int_eq(lb_evaluator_bind(r.evaluator, k, NULL), LB_OK);
            integrator_start(r.it, 0, r.start);
            rig_to(&r, 3);
            memcpy(end[side], integrator_state(r.it), (size_t)r.n * sizeof **end);
        }
        for (int i = 0; i < r.n; i++)
            largest = fmax(largest, fabs(derivative[i + c * r.n]));
        for (int i = 0; i < r.n && step > 0; i++)
            assert_close(derivative[i + c * r.n], (end[1][i] - end[0][i]) / (2 * step), 0, 1e-8 * largest + 1e-9 / value);
        most = fmax(most, largest);
    }
    ck_assert(most > 0.01);
    integrator_free(it);
    rig_free(&r);
}
END_TEST

START_TEST(test_constants_that_are_not_there_are_refused)
{
    rig r = rig_new(DECAY, NULL);
    integrator *it;
    const int wrong = 99;
    ck_assert_int_eq(integrator_new(r.evaluator, &(integrator_options){.sensitivities = 99}, &it, &r.err), LB_E_ARG);
    ck_assert_int_eq(integrator_new(r.evaluator, &(integrator_options){.sensitivities = 1, .constants = &wrong}, &it,
                                    &r.err), LB_E_ARG);
    ck_assert_ptr_null(it);
    rig_free(&r);
}
END_TEST

/* At rest the state asks for no accuracy, the tangents do: exp(-t) and exp(-50 t)
 * after t = 1. */
START_TEST(test_tangents_are_right_at_rest)
{
    integrator_options options = {.tolerance = 1e-9, .method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT, .tangents = true};
    rig r = rig_new("units none\n[X]0 = 1\n[Y]0 = 1\n-> X, k = 1\nX ->, k = 1\n-> Y, k = 50\nY ->, k = 50\n", &options);
    rig_to(&r, 1);
    const double *P = integrator_tangents(r.it);
    assert_close(P[0], exp(-1), 1e-7, 0);
    assert_close(P[3], exp(-50), 0, 1e-13);
    ck_assert(P[1] == 0 && P[2] == 0);
    rig_free(&r);
}
END_TEST

/* One step of a fixed, large size: P is the derivative of the step itself, with
 * its error, and not only of the solution.  Central differences of the step: their
 * error is (1e-5)^2 and rounding/1e-5; the differences of J inside the stiff method
 * add some 1e-9, times constants of size 100. */
START_TEST(test_tangents_are_the_exact_derivative_of_a_step)
{
    const char *text = "units none\n[S]0 = 1\n[P]0 = 0.5\n-> S, k = 1\nS -> P, v = 3*[S]/(0.2 + [S] + [P]^2)\n2 P ->, k = 1.5\n";
    rig r = rig_new(text, NULL);
    explicit_method *explicit_steps;
    rosenbrock *stiff_steps;
    const stepper_columns columns = {.tangents = 2};
    ck_assert_int_eq(explicit_new(r.evaluator, &columns, &explicit_steps, NULL), LB_OK);
    ck_assert_int_eq(rosenbrock_new(r.evaluator, &columns, &stiff_steps, NULL), LB_OK);
    const double identity[4] = {1, 0, 0, 1};
    double x[2], f[2], side[3][2], error[2], P[4], unused[4], P_error[4];
    for (int j = 0; j < 2; j++)
        for (int k = 2; k >= 0; k--) {
            memcpy(x, r.start, sizeof x);
            x[j] += k == 2 ? 0 : k == 1 ? 1e-5 : -1e-5;
            lb_rhs(r.evaluator, x, f);
            stepper_attempt attempt = {0.8, x, f, identity, side[k], error, k == 2 ? P : unused, P_error, -1};
            ck_assert_int_eq(rosenbrock_prepare(stiff_steps, x, r.start), LB_OK);
            ck_assert_int_eq(_i ? rosenbrock_attempt(stiff_steps, &attempt) : explicit_attempt(explicit_steps, &attempt),
                             STEPPER_DONE);
            for (int i = 0; i < 2 && k == 0; i++)
                assert_close(P[i + 2 * j], (side[1][i] - side[0][i]) / 2e-5, 0, _i ? 1e-8 : 1e-9);
        }
    rosenbrock_free(stiff_steps);
    explicit_free(explicit_steps);
    rig_free(&r);
}
END_TEST

/* ---- What goes wrong -------------------------------------------------------------------- */

/* A zero-order sink: x = 1 - 2 t is below zero from t = 0.5 on. */
START_TEST(test_a_negative_concentration_is_an_error_with_its_cause)
{
    const lb_method methods[] = {LB_METHOD_AUTO, LB_METHOD_EXPLICIT, LB_METHOD_STIFF};
    integrator_options options = {.method = methods[_i]};
    rig r = rig_new("units none\n[X]0 = 1\n(leak) X -> P, v = 2\n(slow) X -> P, k = 1e-9\n", &options);
    ck_assert_int_eq(integrator_to(r.it, 1, &r.err), LB_E_NEGATIVE);
    ck_assert_ptr_nonnull(strstr(r.err.message, "[X]"));
    ck_assert_ptr_nonnull(strstr(r.err.message, "leak"));
    ck_assert_ptr_nonnull(strstr(r.err.message, "t = 0.5"));
    assert_close(integrator_time(r.it), 0.5, 1e-8, 0);
    ck_assert(value_of(&r, "X") >= -1e-14);
    rig_free(&r);
}
END_TEST

START_TEST(test_times_in_messages_have_their_unit)
{
    rig r = rig_new("units mM min\n[X]0 = 1 mM\nX -> P, v = 2 mM/min\n", NULL);
    ck_assert_int_eq(integrator_to(r.it, 1, &r.err), LB_E_NEGATIVE);
    ck_assert_ptr_nonnull(strstr(r.err.message, "t = 0.5 min"));
    rig_free(&r);
}
END_TEST

START_TEST(test_signed_species_pass_zero)
{
    rig r = rig_new("units none\nsigned X\n[X]0 = 1\nX -> P, v = 2\n", NULL);
    rig_to(&r, 1);
    assert_close(value_of(&r, "X"), -1, 1e-12, 0);
    rig_free(&r);
}
END_TEST

/* x' = -sqrt(x), x = (1 - t/2)^2 until t = 2, and nothing after. */
START_TEST(test_a_species_that_runs_out_in_finite_time_stays_out)
{
    integrator_options options = {.method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new("units none\n[X]0 = 1\nX -> P, v = [X]^0.5\n", &options);
    rig_to(&r, 1.5);
    assert_close(value_of(&r, "X"), 0.0625, 1e-7, 0);
    rig_to(&r, 10);
    assert_close(value_of(&r, "X"), 0, 0, 1e-13);
    rig_free(&r);
}
END_TEST

START_TEST(test_a_start_below_zero_is_refused)
{
    const double below[2] = {-0.1, 0};
    rig r = rig_new(DECAY, NULL);
    integrator_start(r.it, 0, below);
    ck_assert_int_eq(integrator_to(r.it, 1, &r.err), LB_E_NEGATIVE);
    rig_free(&r);
    integrator_options options = {.allow_negative = true};
    r = rig_new(DECAY, &options);
    integrator_start(r.it, 0, below);
    rig_to(&r, 1);
    assert_close(integrator_state(r.it)[0], -0.1 * exp(-1), 1e-7, 0);
    rig_free(&r);
}
END_TEST

/* x' = x^2 from 1 is infinite at t = 1. */
START_TEST(test_unbounded_growth_is_an_error_with_its_time)
{
    integrator_options options = {.method = _i ? LB_METHOD_STIFF : LB_METHOD_EXPLICIT};
    rig r = rig_new("units none\n[X]0 = 1\n2 X -> 3 X, k = 1\n", &options);
    ck_assert_int_eq(integrator_to(r.it, 2, &r.err), LB_E_STEP);
    ck_assert_msg(strstr(r.err.message, "t = 1") || strstr(r.err.message, "t = 0.99999"), "%s", r.err.message);
    ck_assert_ptr_nonnull(strstr(r.err.message, "[X]"));
    rig_free(&r);
}
END_TEST

/* The logarithm's argument is gone at t = ln 2. */
START_TEST(test_a_rate_that_is_not_finite_names_its_species)
{
    const lb_method methods[] = {LB_METHOD_AUTO, LB_METHOD_EXPLICIT, LB_METHOD_STIFF};
    integrator_options options = {.method = methods[_i]};
    rig r = rig_new("units none\nsigned Y\n[X]0 = 1\nX -> P, k = 1\n-> Y, v = ln([X] - 0.5)\n", &options);
    lb_status status = integrator_to(r.it, 1, &r.err);
    ck_assert_int_eq(status, LB_E_FINITE);
    ck_assert_ptr_nonnull(strstr(r.err.message, "[Y]"));
    assert_close(integrator_time(r.it), log(2), 1e-6, 0);
    rig_free(&r);
}
END_TEST

/* Lotka's mechanism without prey: the predator dies out, and steps may grow as
 * they like. */
START_TEST(test_free_steps_at_rest_stay_finite)
{
    integrator_options options = {.method = _i == 0 ? LB_METHOD_AUTO : LB_METHOD_STIFF};
    rig r = rig_new("units none\n[Y]0 = 1\nX -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY -> P, k = 1\n", &options);
    for (int k = 0; k < 3000; k++) {
        ck_assert_int_eq(integrator_step(r.it, INFINITY, &r.err), LB_OK);
        ck_assert(isfinite(integrator_time(r.it)));
    }
    assert_close(value_of(&r, "Y"), 0, 0, 1e-13);
    assert_close(value_of(&r, "P"), 1, 1e-9, 0);
    rig_free(&r);
}
END_TEST

static bool stop_after(void *context)
{
    int *left = context;
    return (*left)-- <= 0;
}

START_TEST(test_an_interrupted_run_keeps_the_last_step)
{
    int left = 3;
    lb_monitor monitor = {.stop = stop_after, .context = &left};
    integrator_options options = {.monitor = &monitor};
    rig r = rig_new(DECAY, &options);
    ck_assert_int_eq(integrator_to(r.it, 10, &r.err), LB_E_STOPPED);
    ck_assert_uint_eq(integrator_steps(r.it), 3);
    assert_close(value_of(&r, "X"), exp(-integrator_time(r.it)), 1e-8, 0);
    rig_free(&r);
}
END_TEST

START_TEST(test_a_limit_of_steps_is_kept)
{
    integrator_options options = {.max_steps = 5};
    rig r = rig_new(DECAY, &options);
    ck_assert_int_eq(integrator_to(r.it, 10, &r.err), LB_E_STEP);
    ck_assert_uint_eq(integrator_steps(r.it), 5);
    rig_free(&r);
}
END_TEST

START_TEST(test_options_outside_their_domain_are_refused)
{
    rig r = rig_new(DECAY, NULL);
    const double tolerances[] = {-1, NAN, INFINITY, 1e-15};
    integrator *it;
    for (int k = 0; k < 4; k++) {
        integrator_options options = {.tolerance = tolerances[k]};
        ck_assert_int_eq(integrator_new(r.evaluator, &options, &it, &r.err), LB_E_ARG);
        ck_assert_ptr_null(it);
    }
    const double absolute[2] = {1e-8, -1};
    integrator_options options = {.absolute = absolute};
    ck_assert_int_eq(integrator_new(r.evaluator, &options, &it, NULL), LB_E_ARG);
    ck_assert_int_eq(integrator_step(r.it, 0, &r.err), LB_E_ARG);
    ck_assert_int_eq(integrator_to(r.it, -1, &r.err), LB_E_ARG);
    rig_free(&r);
}
END_TEST

START_TEST(test_absolute_tolerances_are_per_species)
{
    const double loose[2] = {1e-3, 1e-3}, one[2] = {1e-12, 1e3};
    size_t steps[2];
    for (int k = 0; k < 2; k++) {
        integrator_options options = {.tolerance = 1e-12, .absolute = k ? one : loose, .method = LB_METHOD_EXPLICIT};
        rig r = rig_new(DECAY, &options);
        rig_to(&r, 10);
        steps[k] = integrator_steps(r.it);
        rig_free(&r);
    }
    ck_assert_uint_lt(3 * steps[0], steps[1]);
}
END_TEST

START_TEST(test_a_start_forgets_earlier_runs)
{
    const stiff_problem *problem = &stiff_problems[_i];
    double end[32];
    for (int tenths = 1; tenths < 10; tenths++) {
        rig r = rig_new(problem->text, NULL);
        rig_to(&r, problem->until * pow(0.1, tenths));
        size_t steps = integrator_steps(r.it);
        memcpy(end, integrator_state(r.it), (size_t)r.n * sizeof *end);
        rig_to(&r, problem->until);
        integrator_start(r.it, 0, r.start);
        rig_to(&r, problem->until * pow(0.1, tenths));
        ck_assert_int_eq(memcmp(end, integrator_state(r.it), (size_t)r.n * sizeof *end), 0);
        ck_assert_uint_eq(integrator_steps(r.it), steps);
        rig_free(&r);
    }
}
END_TEST

START_TEST(test_failing_allocations_leave_nothing_behind)
{
    rig r = rig_new(ROBER_TEXT, NULL);
    integrator_options options = {.tangents = true, .sensitivities = 2};
    const double weight[3] = {1, 0, 0};
    int failures = 0;
    for (long k = 0; ; k++) {
        integrator *it = NULL;
        bool found;
        double t, x[3];
        memory_fail_after(k);
        lb_status status = integrator_new(r.evaluator, &options, &it, NULL);
        if (status == LB_OK) {
            integrator_start(it, 0, r.start);
            status = integrator_to(it, 10, NULL);
        }
        if (status == LB_OK)
            status = integrator_crossing(it, weight, integrator_state(it)[0] + 1e-12, 0, &found, &t, x, NULL);
        memory_fail_after(-1);
        integrator_free(it);
        if (status == LB_OK)
            break;
        ck_assert_int_eq(status, LB_E_NOMEM);
        failures++;
    }
    ck_assert_int_gt(failures, 30);
    rig_free(&r);
}
END_TEST

static void add_accuracy(Suite *suite)
{
    TCase *accuracy = tcase_create("accuracy");
    tcase_add_test(accuracy, test_rodas5p_satisfies_its_order_conditions);
    tcase_add_loop_test(accuracy, test_published_end_values_are_reached, 0, 2 * STIFF_PROBLEMS);
    tcase_add_loop_test(accuracy, test_tight_tolerances_give_more_digits, 1, STIFF_PROBLEMS);
    tcase_add_loop_test(accuracy, test_loose_tolerances_are_capped_and_not_wrong, 0, STIFF_PROBLEMS);
    tcase_add_loop_test(accuracy, test_error_follows_the_tolerance_in_decay, 0, 2);
    tcase_add_loop_test(accuracy, test_error_follows_the_tolerance_in_oscillation, 0, 2);
    tcase_add_loop_test(accuracy, test_michaelis_menten_is_on_time, 0, 2);
    tcase_add_loop_test(accuracy, test_conserved_totals_stay, 0, 2);
    tcase_add_loop_test(accuracy, test_an_empty_start_is_accurate, 0, 2);
    tcase_add_test(accuracy, test_conserved_totals_stay_however_long_the_steps);
    tcase_add_test(accuracy, test_a_species_that_is_zero_stays_zero);
    tcase_add_test(accuracy, test_reduced_systems_solve_the_full_ones);
    tcase_add_test(accuracy, test_both_methods_agree_on_the_brusselator);
    tcase_add_loop_test(accuracy, test_species_born_from_nothing_do_not_stop_the_run, 0, 2);
    suite_add_tcase(suite, accuracy);
}

static void add_methods(Suite *suite)
{
    TCase *choice = tcase_create("choice");
    tcase_add_test(choice, test_the_method_fits_the_problem);
    tcase_add_test(choice, test_the_explicit_method_comes_back_when_stiffness_ends);
    tcase_add_test(choice, test_relaxation_oscillation_keeps_its_period);
    suite_add_tcase(suite, choice);
    TCase *within = tcase_create("within");
    tcase_add_loop_test(within, test_dense_output_follows_the_solution, 0, 2);
    tcase_add_loop_test(within, test_crossings_are_found_once_and_exactly, 0, 2);
    tcase_add_loop_test(within, test_a_crossing_is_as_good_as_a_step, 0, 2);
    tcase_add_test(within, test_short_visits_and_starts_on_the_section);
    tcase_add_test(within, test_landing_on_many_times_does_not_shorten_the_steps);
    suite_add_tcase(suite, within);
    TCase *tangents = tcase_create("tangents");
    tcase_add_loop_test(tangents, test_determinant_of_tangents_is_the_trace_integral, 0, 2);
    tcase_add_loop_test(tangents, test_tangents_are_the_derivative_of_the_flow, 0, 2);
    tcase_add_loop_test(tangents, test_tangents_are_the_exact_derivative_of_a_step, 0, 2);
    tcase_add_loop_test(tangents, test_tangents_are_right_at_rest, 0, 2);
    tcase_add_loop_test(tangents, test_sensitivities_are_derivatives_of_the_flow, 0, 4);
    tcase_add_test(tangents, test_constants_that_are_not_there_are_refused);
    suite_add_tcase(suite, tangents);
}

static void add_failures(Suite *suite)
{
    TCase *wrong = tcase_create("wrong");
    tcase_add_loop_test(wrong, test_a_negative_concentration_is_an_error_with_its_cause, 0, 3);
    tcase_add_test(wrong, test_times_in_messages_have_their_unit);
    tcase_add_test(wrong, test_signed_species_pass_zero);
    tcase_add_loop_test(wrong, test_a_species_that_runs_out_in_finite_time_stays_out, 0, 2);
    tcase_add_test(wrong, test_a_start_below_zero_is_refused);
    tcase_add_loop_test(wrong, test_unbounded_growth_is_an_error_with_its_time, 0, 2);
    tcase_add_loop_test(wrong, test_a_rate_that_is_not_finite_names_its_species, 0, 3);
    tcase_add_loop_test(wrong, test_free_steps_at_rest_stay_finite, 0, 2);
    tcase_add_test(wrong, test_an_interrupted_run_keeps_the_last_step);
    tcase_add_test(wrong, test_a_limit_of_steps_is_kept);
    tcase_add_test(wrong, test_options_outside_their_domain_are_refused);
    tcase_add_test(wrong, test_absolute_tolerances_are_per_species);
    tcase_add_loop_test(wrong, test_a_start_forgets_earlier_runs, 0, STIFF_PROBLEMS);
    tcase_add_test(wrong, test_failing_allocations_leave_nothing_behind);
    suite_add_tcase(suite, wrong);
}

Suite *integrate_suite(void)
{
    Suite *suite = suite_create("integrate");
    add_accuracy(suite);
    add_methods(suite);
    add_failures(suite);
    return suite;
}
