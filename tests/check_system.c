/* The system: tables against the expression graph and by hand, the core, the
 * reaction space, bindings, memory. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/linalg.h"
#include "base/memory.h"
#include "random_network.h"
#include "support.h"
#include "system/system.h"

/* ---- A system under test ----------------------------------------------------------- */

typedef struct subject {
    lb_network *net;
    lb_system *system;
    lb_evaluator *ev;
    int n, m;
    double *x, *dxdt, *J, *D, *v;
} subject;

static double *numbers(size_t count)
{
    double *block = memory_zeroed(count, sizeof *block);
    ck_assert_ptr_nonnull(block);
    return block;
}

static subject subject_of(lb_network *net)
{
    subject s = {.net = net, .n = net->states, .m = net->constant_count};
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_system_new(net, &s.system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_evaluator_new(s.system, &s.ev, &err) == LB_OK, "%s", err.message);
    size_t n = (size_t)s.n;
    s.x = numbers(n);
    s.dxdt = numbers(n);
    s.J = numbers(n * n);
    s.D = numbers(n * (size_t)s.m);
    s.v = numbers((size_t)net->step_count);
    lb_initial(s.ev, s.x);
    return s;
}

static subject subject_read(const char *text)
{
    return subject_of(support_network(text));
}

static void subject_free(subject *s)
{
    memory_free(s->x);
    memory_free(s->dxdt);
    memory_free(s->J);
    memory_free(s->D);
    memory_free(s->v);
    lb_evaluator_free(s->ev);
    lb_system_free(s->system);
    lb_network_free(s->net);
}

static int state(const subject *s, const char *name)
{
    int i = lb_network_find_state(s->net, name);
    ck_assert_int_ge(i, 0);
    return i;
}

/* ---- By hand ------------------------------------------------------------------------- */

/* The Brusselator: dx/dt = A - (B+1) x + x^2 y, dy/dt = B x - x^2 y. */
START_TEST(test_brusselator_by_hand)
{
    subject s = subject_read("units none\n[A] = 1\n[B] = 3\n[D] = 0\n[E] = 0\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
                             "B + X -> Y + D, k = 1\nX -> E, k = 1\n");
    double x = s.x[0] = 1.5, y = s.x[1] = 0.7;
    lb_rhs(s.ev, s.x, s.dxdt);
    lb_jacobian(s.ev, s.x, s.J);
    assert_close(s.dxdt[0], 1 - 4 * x + x * x * y, 1e-15, 1e-15);
    assert_close(s.dxdt[1], 3 * x - x * x * y, 1e-15, 0);
    const double J[] = {-4 + 2 * x * y, 3 - 2 * x * y, x * x, -x * x};
    for (int i = 0; i < 4; i++)
        assert_close(s.J[i], J[i], 1e-15, 1e-15);
    subject_free(&s);
}
END_TEST

START_TEST(test_two_molecules_are_used_up_at_twice_the_rate)
{
    subject s = subject_read("units none\n[X]0 = 3\n2 X -> Z, k = 0.5\n");
    lb_rhs(s.ev, s.x, s.dxdt);
    ck_assert(s.dxdt[state(&s, "X")] == -9 && s.dxdt[state(&s, "Z")] == 4.5);
    subject_free(&s);
}
END_TEST

START_TEST(test_a_tank_flows_in_and_out)
{
    subject s = subject_read("units none\nresidence = 4\n[S]in = 2\n[S]0 = 1\n[E]0 = 5\nretained E\nE + S -> E + P, k = 0.1\n");
    lb_rhs(s.ev, s.x, s.dxdt);
    assert_close(s.dxdt[state(&s, "S")], 2.0 / 4 - 1.0 / 4 - 0.1 * 5, 1e-15, 0);
    ck_assert(s.dxdt[state(&s, "E")] == 0);
    lb_rates(s.ev, s.x, s.v);
    ck_assert_int_eq(s.system->r, 1);
    assert_close(s.v[0], 0.5, 1e-15, 0);
    lb_dfdk(s.ev, s.x, s.D);
    int residence = lb_network_find_constant(s.net, "residence"), feed = lb_network_find_constant(s.net, "[S]in");
    assert_close(s.D[state(&s, "S") + residence * s.n], -(2.0 - 1.0) / 16, 1e-15, 0);
    assert_close(s.D[state(&s, "S") + feed * s.n], 0.25, 1e-15, 0);
    subject_free(&s);
}
END_TEST

START_TEST(test_derivative_by_a_coefficient)
{
    subject s = subject_read("units none\nf = 0.5\n[X]0 = 3\nX -> (2*f) Y + (1 - f) X, k = 2\n");
    lb_dfdk(s.ev, s.x, s.D);
    int f = lb_network_find_constant(s.net, "f");
    ck_assert(s.D[state(&s, "Y") + f * s.n] == 2 * 2 * 3);
    ck_assert(s.D[state(&s, "X") + f * s.n] == -2 * 3);
    const double *coefficient = evaluator_coefficients(s.ev, 0);
    ck_assert(coefficient[0] == -0.5 && coefficient[1] == 1);
    subject_free(&s);
}
END_TEST

START_TEST(test_readings)
{
    subject s = subject_read("units none\nh = 2\n[X]0 = 3\nX ->, k = 1\ndouble = h*[X]\nsum = double + h\n");
    double values[2];
    lb_readings(s.ev, s.x, values);
    ck_assert(values[0] == 6 && values[1] == 8);
    subject_free(&s);
}
END_TEST

START_TEST(test_magnitude_is_the_sum_of_sizes)
{
    subject s = subject_read("units none\n[X]0 = 3\n-> X, k = 7\nX ->, k = 2\nX -> 2 X, k = 1\n");
    double magnitude;
    evaluator_rhs_scaled(s.ev, s.x, s.dxdt, &magnitude);
    ck_assert(s.dxdt[0] == 7 - 6 + 3 && magnitude == 7 + 6 + 3);
    subject_free(&s);
}
END_TEST

/* ---- Tables against the graph ------------------------------------------------------------ */

enum { ORDERS = 14 };
static const double orders[ORDERS] = {0, 1, 2, 3, 4, 5, 8, 9, 12, 0.5, 1.5, -1, -2.5, 2.75};

/* One step that makes Z at the rate k X^a Y^b W^c. */
static lb_network *power_network(double a, double b, double c)
{
    lb_network *net = network_new();
    expression_graph *g = &net->graph;
    int k = network_add_constant(net, "k", CONSTANT_NAMED, 1.7);
    expression rate = expression_constant(g, k);
    const double order[] = {a, b, c};
    const char *const names[] = {"X", "Y", "W", "Z"};
    for (int i = 0; i < 4; i++)
        network_add_species(net, names[i], ROLE_DYNAMIC);
    for (int i = 0; i < 3; i++) {
        expression power = expression_binary(g, EXPRESSION_POWER, expression_state(g, i), expression_number(g, order[i]));
        rate = expression_binary(g, EXPRESSION_MULTIPLY, rate, power);
    }
    int r = network_add_reaction(net, "R1", false);
    network_add_term(net, r, true, 3, 1, 1, EXPRESSION_NONE);
    network_add_step(net, r, STEP_FORWARD, rate);
    ck_assert_int_eq(network_finish(net), LB_OK);
    ck_assert(net->steps[0].is_power_law);
    return net;
}

/* Equal, both infinite or both not numbers. */
static void assert_same(double got, double want, const char *what, const double *order)
{
    bool same = isfinite(want) ? fabs(got - want) <= 1e-14 * fabs(want) : !isfinite(got);
    ck_assert_msg(same, "%s of X^%g Y^%g W^%g: %.17g, wanted %.17g", what, order[0], order[1], order[2], got, want);
}

static void check_power_law(const double *order, const double *x)
{
    subject s = subject_of(power_network(order[0], order[1], order[2]));
    const double k = 1.7;
    double powers[3];
    for (int i = 0; i < 3; i++)
        powers[i] = expression_power(x[i], order[i]);
    lb_rhs(s.ev, x, s.dxdt);
    lb_jacobian(s.ev, x, s.J);
    lb_dfdk(s.ev, x, s.D);
    assert_same(s.dxdt[3], k * powers[0] * powers[1] * powers[2], "rate", order);
    assert_same(s.D[3], powers[0] * powers[1] * powers[2], "derivative by k", order);
    for (int j = 0; j < 3; j++) {
        double others = powers[(j + 1) % 3] * powers[(j + 2) % 3];
        double want = order[j] == 0 ? 0 : k * expression_slope(x[j], order[j]) * others;
        assert_same(s.J[3 + 4 * j], want, "Jacobian", order);
    }
    subject_free(&s);
}

START_TEST(test_power_laws_of_all_orders)
{
    const double at[][4] = {{0.3, 1.9, 0.8, 0}, {0, 1.9, 0.8, 0}, {-0.4, 1.2, 0, 0}};
    for (int a = 0; a < ORDERS; a++)
        for (int b = a; b < ORDERS; b++)
            for (int c = b; c < ORDERS; c += 2)
                for (int i = 0; i < 3; i++)
                    check_power_law((const double[]){orders[a], orders[b], orders[c]}, at[i]);
}
END_TEST

/* Rates, f and J of random networks against the symbolic derivatives of the rates' expressions. */
static void check_random(uint64_t seed)
{
    subject s = subject_of(random_network(seed));
    random_state(seed, s.n, s.x);
    const double *k = evaluator_constants(s.ev);
    evaluator_step_rates(s.ev, s.x, s.v);
    lb_rhs(s.ev, s.x, s.dxdt);
    lb_jacobian(s.ev, s.x, s.J);
    double *f = numbers((size_t)s.n), *size = numbers((size_t)s.n);
    double *J = numbers((size_t)s.n * (size_t)s.n), *slope = numbers((size_t)s.n * (size_t)s.n);
    for (int step = 0; step < s.net->step_count; step++) {
        const network_step *of = &s.net->steps[step];
        const double *coefficient = evaluator_coefficients(s.ev, step);
        double v = expression_value(&s.net->graph, of->rate, k, s.x);
        assert_close(s.v[step], v, 1e-12, 0);
        for (int e = 0; e < of->entry_count; e++) {
            f[of->entries[e].state] += coefficient[e] * v;
            size[of->entries[e].state] += fabs(coefficient[e] * v);
        }
        for (int j = 0; j < s.n; j++) {
            expression d = expression_derivative(&s.net->graph, of->rate, EXPRESSION_STATE, j);
            double dv = expression_value(&s.net->graph, d, k, s.x);
            for (int e = 0; e < of->entry_count; e++) {
                J[of->entries[e].state + j * s.n] += coefficient[e] * dv;
                slope[of->entries[e].state + j * s.n] += fabs(coefficient[e] * dv);
            }
        }
    }
    for (int i = 0; i < s.n; i++)
        assert_close(s.dxdt[i], f[i], 0, 1e-12 * size[i]);
    for (int i = 0; i < s.n * s.n; i++)
        assert_close(s.J[i], J[i], 0, 1e-12 * slope[i]);
    memory_free(f);
    memory_free(size);
    memory_free(J);
    memory_free(slope);
    subject_free(&s);
}

START_TEST(test_tables_agree_with_the_graph)
{
    for (uint64_t seed = 1; seed <= 40; seed++)
        check_random(seed);
}
END_TEST

START_TEST(test_dense_and_sparse_jacobian_agree)
{
    subject s = subject_of(random_network(5));
    double *values = numbers((size_t)lb_system_nonzeros(s.system));
    random_state(5, s.n, s.x);
    lb_jacobian(s.ev, s.x, s.J);
    lb_jacobian_sparse(s.ev, s.x, values);
    const int *start = lb_system_column_start(s.system), *row = lb_system_rows(s.system);
    for (int j = 0; j < s.n; j++) {
        for (int z = start[j]; z < start[j + 1]; z++) {
            ck_assert(s.J[row[z] + j * s.n] == values[z]);
            s.J[row[z] + j * s.n] = 0;
        }
    }
    for (int i = 0; i < s.n * s.n; i++)
        ck_assert(s.J[i] == 0);
    memory_free(values);
    subject_free(&s);
}
END_TEST

START_TEST(test_f_is_orthogonal_to_every_law)
{
    int laws = 0;
    for (uint64_t seed = 1; seed <= 60; seed++) {
        subject s = subject_of(random_mass_action(seed, 10, 6));
        random_state(seed, s.n, s.x);
        double *size = numbers((size_t)s.n);
        evaluator_rhs_scaled(s.ev, s.x, s.dxdt, size);
        for (int l = 0; l < lb_system_laws(s.system); l++, laws++) {
            const int64_t *law = lb_system_law(s.system, l);
            double sum = 0, scale = 0;
            for (int i = 0; i < s.n; i++) {
                sum += (double)law[i] * s.dxdt[i];
                scale += fabs((double)law[i]) * size[i];
            }
            assert_close(sum, 0, 0, 1e-14 * scale);
        }
        memory_free(size);
        subject_free(&s);
    }
    ck_assert_int_gt(laws, 100);
}
END_TEST

/* ---- The core ------------------------------------------------------------------------------ */

static void assert_core(const char *mechanism, const char *names, int rank)
{
    subject s = subject_read(mechanism);
    char text[200] = "";
    for (int i = 0; i < s.system->core; i++) {
        strcat(text, i > 0 ? " " : "");
        strcat(text, lb_network_state_name(s.net, s.system->core_state[i]));
        ck_assert_int_eq(s.system->core_index[s.system->core_state[i]], i);
    }
    ck_assert_str_eq(text, names);
    ck_assert_int_eq(s.system->rank, rank);
    subject_free(&s);
}

START_TEST(test_core_leaves_out_what_enters_no_rate)
{
    assert_core("units none\nE + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n", "E S C", 2);
    /* A product of a product goes with it. */
    assert_core("units none\nA -> B, k = 1\nB -> C, k = 1\nC -> D, k = 1\n", "A B C", 3);
    /* A step that makes only what is set aside is dropped, and what only it uses goes too. */
    assert_core("units none\n-> X, k = 1\nX ->, k = 1\nM -> M + P, k = 1\n", "X", 1);
    /* A chain of observers falls one after the other. */
    assert_core("units none\n-> X, k = 1\nX ->, k = 1\nL -> L + M, k = 1\nM -> M + P, k = 1\n", "X", 1);
    /* In a tank everything flows out, so everything has a rate. */
    assert_core("units none\nresidence = 1\n[S]in = 1\nS -> P, k = 1\n", "S P", 2);
    /* A catalyst that does not change is a species with a law of its own. */
    assert_core("units none\nE + S -> E + P, k = 1\n", "E S", 1);
    assert_core("units none\nA -> A, k = 1\n", "", 0);
}
END_TEST

/* Eigenvalues of the reduced Jacobian are those of the full one without the zeros of the laws. */
static void assert_reduced_spectrum(const char *path)
{
    subject s = subject_of(support_network_file(path));
    ck_assert_int_eq(s.system->core, s.n);
    int rank = s.system->rank, zeros = 0, place = 0;
    random_state(3, s.n, s.x);
    lb_jacobian(s.ev, s.x, s.J);
    double *reduced = numbers((size_t)rank * (size_t)rank), norm = linalg_norm1(s.n, s.J);
    lb_complex *full = memory_array((size_t)s.n, sizeof *full), *some = memory_array((size_t)rank, sizeof *some);
    lb_error err;
    system_reduce(s.system, s.J, reduced);
    ck_assert_int_eq(linalg_eigenvalues(s.n, s.J, full, NULL, &err), LB_OK);
    ck_assert_int_eq(linalg_eigenvalues(rank, reduced, some, NULL, &err), LB_OK);
    for (int i = 0; i < s.n; i++) {
        bool is_extra = place == rank || hypot(full[i].re - some[place].re, full[i].im - some[place].im) >
                                             1e-7 * hypot(some[place].re, some[place].im) + 1e-12 * norm;
        if (is_extra)
            ck_assert_double_le(hypot(full[i].re, full[i].im), 1e-10 * norm);
        zeros += is_extra;
        place += !is_extra;
    }
    ck_assert_int_eq(place, rank);
    ck_assert_int_eq(zeros, s.n - rank);
    memory_free(reduced);
    memory_free(full);
    memory_free(some);
    subject_free(&s);
}

START_TEST(test_reduced_jacobian_has_the_nonzero_eigenvalues)
{
    assert_reduced_spectrum("networks/hires.mech");
    assert_reduced_spectrum("networks/double-phosphorylation.mech");
}
END_TEST

START_TEST(test_species_set_aside_get_what_laws_fix)
{
    subject s = subject_read("units none\n[E]0 = 1\n[S]0 = 10\n[W]0 = 7\nE + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n"
                             "C -> C + Q, k = 1\nW -> W + E, k = 0\n");
    double *x = numbers((size_t)s.n);
    x[state(&s, "E")] = 0.75;
    x[state(&s, "C")] = 0.25;
    x[state(&s, "S")] = 4;
    x[state(&s, "W")] = 7;
    system_complete(s.system, s.x, x);
    ck_assert(x[state(&s, "P")] == 10 - 4 - 0.25);
    ck_assert(isnan(x[state(&s, "Q")]));
    ck_assert(x[state(&s, "S")] == 4);
    memory_free(x);
    subject_free(&s);
}
END_TEST

START_TEST(test_core_totals)
{
    subject s = subject_read("units none\n[E]0 = 1\n[C]0 = 0.5\n[P]0 = 3\nE + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n");
    double total[1];
    ck_assert_int_eq(s.system->core_laws.count, 1);
    system_core_totals(s.system, s.x, total);
    ck_assert(total[0] == 1.5);
    subject_free(&s);
}
END_TEST

START_TEST(test_a_system_beyond_laws_still_evaluates)
{
    enum { MANY = 8000 };
    lb_network *net = network_new();
    expression k = expression_constant(&net->graph, network_add_constant(net, "k", CONSTANT_NAMED, 2));
    for (int i = 0; i < MANY; i++) {
        char name[32];
        snprintf(name, sizeof name, "X%d", i);
        network_add_species(net, name, ROLE_DYNAMIC);
        net->species[i].initial = expression_number(&net->graph, i);
    }
    for (int i = 0; i < MANY; i += 2) {
        int r = network_add_reaction(net, "R", true);
        network_add_term(net, r, false, i, 1, 1, EXPRESSION_NONE);
        network_add_term(net, r, true, i + 1, 1, 1, EXPRESSION_NONE);
        network_add_mass_action(net, r, STEP_FORWARD, k);
        network_add_mass_action(net, r, STEP_REVERSE, k);
    }
    ck_assert_int_eq(network_finish(net), LB_OK);
    lb_system *system;
    lb_evaluator *ev;
    lb_error err;
    ck_assert_int_eq(lb_system_new(net, &system, &err), LB_OK);
    ck_assert(!system->laws_known);
    ck_assert_int_eq(system->laws.count, 0);
    ck_assert_int_eq(lb_evaluator_new(system, &ev, &err), LB_OK);
    double *x = numbers(MANY), *dxdt = numbers(MANY);
    lb_initial(ev, x);
    lb_rhs(ev, x, dxdt);
    for (int i = 0; i < MANY; i++)
        ck_assert(dxdt[i] == (i % 2 ? -2 : 2));
    memory_free(x);
    memory_free(dxdt);
    lb_evaluator_free(ev);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

/* ---- Bindings ------------------------------------------------------------------------------- */

/* The binding with one constant replaced fails, names the culprit, and leaves the old one. */
static void assert_refused(subject *s, const char *constant, double value, const char *culprit)
{
    double *k = numbers((size_t)s->m);
    memcpy(k, evaluator_constants(s->ev), (size_t)s->m * sizeof *k);
    lb_rhs(s->ev, s->x, s->dxdt);
    double before = s->dxdt[0];
    k[lb_network_find_constant(s->net, constant)] = value;
    lb_error err = {.code = LB_OK};
    ck_assert_int_eq(lb_evaluator_bind(s->ev, k, &err), LB_E_ARG);
    ck_assert_msg(strstr(err.message, culprit) != NULL, "%s", err.message);
    lb_rhs(s->ev, s->x, s->dxdt);
    ck_assert(s->dxdt[0] == before);
    memory_free(k);
}

START_TEST(test_bindings_are_checked)
{
    subject s = subject_read("units none\nresidence = 4\n[S]in = 2\n[A] = 1\n[S]0 = 1\nk1 = 1\nk2 = 2\nc = 1\nf = 1\n"
                             "(R1) A + S -> P, k = k1 - k2/4\n(R2) S -> (f/c) P, k = 1\n(R3) P -> S, v = k1/c*[P]\n");
    assert_refused(&s, "k2", 8, "R1");
    assert_refused(&s, "k1", NAN, "R1");
    assert_refused(&s, "k1", INFINITY, "R1");
    assert_refused(&s, "c", 0, "R2");
    assert_refused(&s, "residence", 0, "residence");
    assert_refused(&s, "[A]", -1, "[A]");
    assert_refused(&s, "[S]in", -1, "[S]");
    subject_free(&s);
}
END_TEST

START_TEST(test_binding_changes_derived_values)
{
    subject s = subject_read("units none\nh = 2\ng = h^2\n[X]0 = h\nX ->, k = g\n");
    double k[2] = {0};
    k[lb_network_find_constant(s.net, "h")] = 3;
    lb_error err;
    ck_assert_int_eq(lb_evaluator_bind(s.ev, k, &err), LB_OK);
    lb_initial(s.ev, s.x);
    lb_rhs(s.ev, s.x, s.dxdt);
    ck_assert(s.x[0] == 3 && s.dxdt[0] == -27);
    ck_assert_int_eq(lb_evaluator_bind(s.ev, NULL, &err), LB_OK);
    lb_rhs(s.ev, s.x, s.dxdt);
    ck_assert(s.dxdt[0] == -12);
    subject_free(&s);
}
END_TEST

START_TEST(test_evaluators_are_independent)
{
    subject s = subject_read("units none\nh = 2\n[X]0 = 1\nX ->, k = h\nX -> Y, v = h*[X]/(1 + [X])\n");
    lb_evaluator *other;
    lb_error err;
    const double k[] = {5};
    ck_assert_int_eq(lb_evaluator_bind(s.ev, k, &err), LB_OK);
    ck_assert_int_eq(evaluator_copy(s.ev, &other, &err), LB_OK);
    ck_assert(evaluator_constants(other)[0] == 5);
    ck_assert_int_eq(lb_evaluator_bind(s.ev, NULL, &err), LB_OK);
    lb_rhs(other, s.x, s.dxdt);
    ck_assert(s.dxdt[0] == -7.5);
    lb_rhs(s.ev, s.x, s.dxdt);
    ck_assert(s.dxdt[0] == -3);
    lb_evaluator_free(other);
    subject_free(&s);
}
END_TEST

/* ---- Memory ----------------------------------------------------------------------------------- */

START_TEST(test_evaluations_allocate_nothing)
{
    subject s = subject_of(random_network(9));
    double *size = numbers((size_t)s.n), *values = numbers((size_t)lb_system_nonzeros(s.system));
    random_state(9, s.n, s.x);
    lb_rhs(s.ev, s.x, s.dxdt);
    double want = s.dxdt[0];
    memory_fail_after(0);
    lb_error err;
    lb_status status = lb_evaluator_bind(s.ev, NULL, &err);
    evaluator_step_rates(s.ev, s.x, s.v);
    lb_jacobian(s.ev, s.x, s.J);
    lb_jacobian_sparse(s.ev, s.x, values);
    lb_dfdk(s.ev, s.x, s.D);
    evaluator_rhs_scaled(s.ev, s.x, s.dxdt, size);
    memory_fail_after(-1);
    ck_assert_int_eq(status, LB_OK);
    ck_assert(s.dxdt[0] == want);
    memory_free(size);
    memory_free(values);
    subject_free(&s);
}
END_TEST

START_TEST(test_every_failed_allocation_is_reported)
{
    lb_network *net = support_network("units none\nf = 0.4\nh = 1\n[E]0 = 1\nE + S <-> C, kf = 1, kr = 1\n"
                                      "C -> (f) P + E, k = h\nS -> P, v = h*[S]^5\nP -> Q, v = h*[P]/(1 + [P])\n");
    lb_status status = LB_E_NOMEM;
    long after = 0;
    for (; status != LB_OK; after++) {
        lb_system *system;
        lb_evaluator *ev = NULL, *copy = NULL;
        lb_error err;
        memory_fail_after(after);
        status = lb_system_new(net, &system, &err);
        if (status == LB_OK)
            status = lb_evaluator_new(system, &ev, &err);
        if (status == LB_OK)
            status = evaluator_copy(ev, &copy, &err);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || (status == LB_E_NOMEM && err.code == LB_E_NOMEM && !copy));
        lb_evaluator_free(copy);
        lb_evaluator_free(ev);
        lb_system_free(system);
    }
    ck_assert_int_gt(after, 100);
    lb_network_free(net);
}
END_TEST

Suite *system_suite(void)
{
    Suite *suite = suite_create("system");
    TCase *all = tcase_create("system");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_brusselator_by_hand);
    tcase_add_test(all, test_two_molecules_are_used_up_at_twice_the_rate);
    tcase_add_test(all, test_a_tank_flows_in_and_out);
    tcase_add_test(all, test_derivative_by_a_coefficient);
    tcase_add_test(all, test_readings);
    tcase_add_test(all, test_magnitude_is_the_sum_of_sizes);
    tcase_add_test(all, test_power_laws_of_all_orders);
    tcase_add_test(all, test_tables_agree_with_the_graph);
    tcase_add_test(all, test_dense_and_sparse_jacobian_agree);
    tcase_add_test(all, test_f_is_orthogonal_to_every_law);
    tcase_add_test(all, test_core_leaves_out_what_enters_no_rate);
    tcase_add_test(all, test_reduced_jacobian_has_the_nonzero_eigenvalues);
    tcase_add_test(all, test_species_set_aside_get_what_laws_fix);
    tcase_add_test(all, test_core_totals);
    tcase_add_test(all, test_a_system_beyond_laws_still_evaluates);
    tcase_add_test(all, test_bindings_are_checked);
    tcase_add_test(all, test_binding_changes_derived_values);
    tcase_add_test(all, test_evaluators_are_independent);
    tcase_add_test(all, test_evaluations_allocate_nothing);
    tcase_add_test(all, test_every_failed_allocation_is_reported);
    suite_add_tcase(suite, all);
    return suite;
}
