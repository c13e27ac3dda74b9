/* Eight at once: every lane against the scalar engine, bit for bit, with the kernels of every
 * kind of processor that this one can run. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "random_network.h"
#include "support.h"
#include "system/batch.h"
#include "system/system.h"

/* ---- A batch beside an evaluator ------------------------------------------------------ */

typedef struct subject {
    lb_network *net;
    lb_system *system;
    lb_evaluator *ev;
    lb_batch *batch;
    int n, m, r, z;
    double *k, *x, *out;        /* of all lanes */
    double *lane_k, *lane_x, *lane_out;
} subject;

static double *numbers(int count)
{
    double *block = memory_zeroed((size_t)count, sizeof *block);
    ck_assert_ptr_nonnull(block);
    return block;
}

static int most(int a, int b)
{
    return a > b ? a : b;
}

static subject subject_of(lb_network *net)
{
    subject s = {.net = net, .n = net->states, .m = net->constant_count, .r = net->reaction_steps};
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_system_new(net, &s.system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_evaluator_new(s.system, &s.ev, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_batch_new(s.system, &s.batch, &err) == LB_OK, "%s", err.message);
    s.z = lb_system_nonzeros(s.system);
    int largest = most(most(s.n, s.r), s.z);
    s.k = numbers(s.m * LB_LANES);
    s.x = numbers(s.n * LB_LANES);
    s.out = numbers(largest * LB_LANES);
    s.lane_k = numbers(s.m);
    s.lane_x = numbers(s.n);
    s.lane_out = numbers(largest);
    return s;
}

static void subject_free(subject *s)
{
    double *blocks[] = {s->k, s->x, s->out, s->lane_k, s->lane_x, s->lane_out};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
    lb_batch_free(s->batch);
    lb_evaluator_free(s->ev);
    lb_system_free(s->system);
    lb_network_free(s->net);
}

/* Constants of the file turned by a factor of their own in each lane, states of their own. */
static void fill_lanes(subject *s, uint64_t seed)
{
    for (int l = 0; l < LB_LANES; l++) {
        random_state(seed + (uint64_t)l, s->n, s->lane_x);
        for (int i = 0; i < s->n; i++)
            s->x[i * LB_LANES + l] = s->lane_x[i];
        for (int j = 0; j < s->m; j++)
            s->k[j * LB_LANES + l] = s->net->constants[j].value * (1 + 0.03 * ((l * 7 + j) % 11));
    }
}

static void bind_lane(subject *s, int lane)
{
    for (int j = 0; j < s->m; j++)
        s->lane_k[j] = s->k[j * LB_LANES + lane];
    for (int i = 0; i < s->n; i++)
        s->lane_x[i] = s->x[i * LB_LANES + lane];
    ck_assert_int_eq(lb_evaluator_bind(s->ev, s->lane_k, NULL), LB_OK);
}

typedef void scalar_call(lb_evaluator *ev, const double x[], double out[]);
typedef void batch_call(lb_batch *batch, const double x[], double out[]);

/* The same bits; any NaN is like any other. */
static bool is_same(double a, double b)
{
    return memcmp(&a, &b, sizeof a) == 0 || (isnan(a) && isnan(b));
}

static void assert_lanes_match(subject *s, const char *what, scalar_call *scalar, batch_call *batch, int count)
{
    batch(s->batch, s->x, s->out);
    for (int l = 0; l < LB_LANES; l++) {
        bind_lane(s, l);
        scalar(s->ev, s->lane_x, s->lane_out);
        for (int i = 0; i < count; i++)
            ck_assert_msg(is_same(s->out[i * LB_LANES + l], s->lane_out[i]), "%s %d of lane %d (%s): %.17g, scalar %.17g",
                          what, i, l, s->batch->kernels->target, s->out[i * LB_LANES + l], s->lane_out[i]);
    }
}

static void assert_all_match(subject *s)
{
    const batch_kernels *kernels;
    for (int i = 0; (kernels = batch_kernels_get(i)); i++) {
        s->batch->kernels = kernels;
        ck_assert_int_eq(lb_batch_bind(s->batch, s->k, NULL, NULL), LB_OK);
        assert_lanes_match(s, "rate", lb_rates, lb_batch_rates, s->r);
        assert_lanes_match(s, "dx/dt", lb_rhs, lb_batch_rhs, s->n);
        assert_lanes_match(s, "Jacobian entry", lb_jacobian_sparse, lb_batch_jacobian_sparse, s->z);
    }
    lb_batch_initial(s->batch, s->out);
    for (int l = 0; l < LB_LANES; l++) {
        bind_lane(s, l);
        lb_initial(s->ev, s->lane_out);
        for (int i = 0; i < s->n; i++)
            ck_assert(is_same(s->out[i * LB_LANES + l], s->lane_out[i]));
    }
}

/* ---- Equality ------------------------------------------------------------------------------ */

START_TEST(test_lanes_give_the_scalar_bits_on_random_networks)
{
    int count = getenv("LB_TEST_LONG") ? 500 : 60;
    for (int seed = 0; seed < count; seed++) {
        subject s = subject_of(random_network((uint64_t)seed));
        fill_lanes(&s, (uint64_t)seed * 100);
        assert_all_match(&s);
        subject_free(&s);
    }
}
END_TEST

START_TEST(test_lanes_give_the_scalar_bits_on_mass_action)
{
    subject s = subject_of(random_mass_action(7, 300, 900));
    fill_lanes(&s, 11);
    assert_all_match(&s);
    subject_free(&s);
}
END_TEST

/* Zero, negative, huge and infinite states: what is not finite is so in its own lane alone. */
START_TEST(test_lanes_do_not_mix)
{
    const double odd[LB_LANES] = {0, 1, -1, INFINITY, NAN, 1e300, 1e-320, 2};
    for (uint64_t seed = 0; seed < 12; seed++) {
        subject s = subject_of(random_network(seed));
        fill_lanes(&s, seed);
        for (int l = 0; l < LB_LANES; l++)
            s.x[l] = odd[l];
        assert_all_match(&s);
        subject_free(&s);
    }
}
END_TEST

START_TEST(test_computed_coefficients_differ_by_lane)
{
    subject s = subject_of(support_network("units none\nf = 0.5\n[X]0 = 3\nX -> (2*f) Y + (1 - f) X, k = 2\nY -> 2 X, k = f\n"));
    ck_assert_ptr_nonnull(s.batch->coefficient);
    fill_lanes(&s, 3);
    assert_all_match(&s);
    ck_assert(s.out[0] == 3);
    subject_free(&s);
}
END_TEST

/* ---- Binding --------------------------------------------------------------------------------- */

START_TEST(test_a_refused_lane_keeps_its_constants)
{
    subject s = subject_of(support_network("units none\n[X]0 = 3\nX -> Y, k = a\na = b - 1\nb = 2\n"));
    fill_lanes(&s, 5);
    ck_assert_int_eq(lb_batch_bind(s.batch, s.k, NULL, NULL), LB_OK);
    double before = s.k[2], turned[LB_LANES];
    memcpy(turned, s.k, sizeof turned);
    turned[2] = 0.5, turned[5] = INFINITY, turned[6] = 4;
    unsigned refused = 0;
    lb_error err = {.code = LB_OK};
    ck_assert_int_eq(lb_batch_bind(s.batch, turned, &refused, &err), LB_E_ARG);
    ck_assert_uint_eq(refused, 1u << 2 | 1u << 5);
    ck_assert_str_eq(err.message, "the rate constant of R1 comes out as -0.5");
    turned[2] = before, turned[5] = s.k[5];
    memcpy(s.k, turned, sizeof turned);
    assert_lanes_match(&s, "dx/dt", lb_rhs, lb_batch_rhs, s.n);
    subject_free(&s);
}
END_TEST

START_TEST(test_without_constants_the_file_s_are_bound)
{
    subject s = subject_of(support_network("units none\n[X]0 = 3\nX -> Y, k = 2\n"));
    fill_lanes(&s, 5);
    ck_assert_int_eq(lb_batch_bind(s.batch, s.k, NULL, NULL), LB_OK);
    ck_assert_int_eq(lb_batch_bind(s.batch, NULL, NULL, NULL), LB_OK);
    lb_batch_initial(s.batch, s.x);
    lb_batch_rhs(s.batch, s.x, s.out);
    for (int l = 0; l < LB_LANES; l++)
        ck_assert(s.out[l] == -6);
    subject_free(&s);
}
END_TEST

START_TEST(test_every_failure_of_memory_is_clean)
{
    lb_network *net = random_network(9);
    lb_system *system = NULL;
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    lb_batch *batch = NULL;
    lb_status status = LB_E_NOMEM;
    for (long k = 0; status != LB_OK; k++) {
        memory_fail_after(k);
        status = lb_batch_new(system, &batch, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK ? batch != NULL : status == LB_E_NOMEM && !batch);
    }
    lb_batch_free(batch);
    lb_batch_free(NULL);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

Suite *batch_suite(void)
{
    Suite *suite = suite_create("batch");
    TCase *cases = tcase_create("batch");
    tcase_set_timeout(cases, 60);
    tcase_add_test(cases, test_lanes_give_the_scalar_bits_on_random_networks);
    tcase_add_test(cases, test_lanes_give_the_scalar_bits_on_mass_action);
    tcase_add_test(cases, test_lanes_do_not_mix);
    tcase_add_test(cases, test_computed_coefficients_differ_by_lane);
    tcase_add_test(cases, test_a_refused_lane_keeps_its_constants);
    tcase_add_test(cases, test_without_constants_the_file_s_are_bound);
    tcase_add_test(cases, test_every_failure_of_memory_is_clean);
    suite_add_tcase(suite, cases);
    return suite;
}
