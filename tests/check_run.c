/* Time courses: the rows, what stands in them, and how they end. */
#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "stiff_problems.h"
#include "support.h"

typedef struct rig {
    lb_network *network;
    lb_system *system;
    lb_run *run;
    lb_error err;
} rig;

static rig rig_new(const char *text)
{
    rig r = {.network = support_network(text)};
    ck_assert_int_eq(lb_system_new(r.network, &r.system, &r.err), LB_OK);
    return r;
}

static void rig_free(rig *r)
{
    lb_run_free(r->run);
    lb_system_free(r->system);
    lb_network_free(r->network);
}

static lb_status solve(rig *r, const lb_run_options *options)
{
    lb_run_free(r->run);
    return lb_run_solve(r->system, options, &r->run, &r->err);
}

#define DECAY "units none\n[X]0 = 1\nX -> P, k = 1\nlogX = ln([X])\nlogP = log10([P])\n"

START_TEST(test_rows_are_even_and_end_at_the_end)
{
    rig r = rig_new(DECAY);
    lb_run_options options = {.until = 3};
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert_uint_eq(r.run->rows, 201);
    for (size_t row = 0; row < r.run->rows; row++) {
        assert_close(r.run->t[row], 0.015 * (double)row, 1e-14, 0);
        assert_close(r.run->x[2 * row], exp(-r.run->t[row]), 1e-7, 0);
    }
    ck_assert(r.run->t[0] == 0 && r.run->t[200] == 3);
    ck_assert(r.run->x[0] == 1 && r.run->x[1] == 0);
    rig_free(&r);
}
END_TEST

START_TEST(test_the_last_row_stands_at_the_end_whatever_the_spacing)
{
    /* 0.3/0.1 is a little below 3 in binary, 1.1/0.1 a little above 11. */
    const double until[] = {1, 1, 1, 0.3, 1.1}, every[] = {0.3, 0.1, 5, 0.1, 0.1};
    const size_t rows[] = {5, 11, 2, 4, 12};
    rig r = rig_new(DECAY);
    for (int k = 0; k < 5; k++) {
        lb_run_options options = {.until = until[k], .every = every[k]};
        ck_assert_int_eq(solve(&r, &options), LB_OK);
        ck_assert_uint_eq(r.run->rows, rows[k]);
        ck_assert(r.run->t[rows[k] - 1] == until[k]);
        for (size_t row = 1; row < rows[k]; row++)
            ck_assert(r.run->t[row] > r.run->t[row - 1]);
    }
    rig_free(&r);
}
END_TEST

START_TEST(test_rows_do_not_shorten_the_steps)
{
    rig r = rig_new(ROBER_TEXT);
    lb_run_options few = {.until = 1e4, .every = 1e4}, many = {.until = 1e4, .every = 0.5};
    ck_assert_int_eq(solve(&r, &few), LB_OK);
    size_t steps = r.run->steps;
    ck_assert_int_eq(solve(&r, &many), LB_OK);
    ck_assert_uint_eq(r.run->steps, steps);
    ck_assert_uint_eq(r.run->rows, 20001);
    for (size_t row = 0; row < r.run->rows; row++)      /* A + B + C */
        assert_close(r.run->x[3 * row] + r.run->x[3 * row + 1] + r.run->x[3 * row + 2], 1, 1e-12, 0);
    rig_free(&r);
}
END_TEST

START_TEST(test_readings_are_evaluated_in_every_row)
{
    rig r = rig_new(DECAY);
    lb_run_options options = {.until = 2, .every = 0.5};
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert_int_eq(r.run->readings, 2);
    for (size_t row = 0; row < r.run->rows; row++)
        assert_close(r.run->reading[2 * row], -r.run->t[row], 1e-7, 1e-12);
    ck_assert(isnan(r.run->reading[1]));        /* log10 of [P] = 0 has no finite value */
    ck_assert(isfinite(r.run->reading[3]));
    rig_free(&r);
}
END_TEST

START_TEST(test_the_result_says_how)
{
    rig r = rig_new(ROBER_TEXT);
    lb_run_options options = {.until = 100, .tolerance = 0.3};
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert(r.run->tolerance == 1e-2);
    ck_assert_ptr_nonnull(strstr(r.run->method, "Rodas5P"));
    options = (lb_run_options){.until = 1, .method = LB_METHOD_EXPLICIT};
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert(r.run->tolerance == 1e-8);
    ck_assert_ptr_nonnull(strstr(r.run->method, "explicit"));
    ck_assert_str_eq(r.run->why, "asked for");
    ck_assert_uint_gt(r.run->steps, 10);
    rig_free(&r);
}
END_TEST

START_TEST(test_rows_before_an_error_are_kept)
{
    rig r = rig_new("units none\n[X]0 = 1\n(leak) X -> P, v = 2\n");
    lb_run_options options = {.until = 1, .every = 0.1};
    ck_assert_int_eq(solve(&r, &options), LB_E_NEGATIVE);
    ck_assert_ptr_nonnull(r.run);
    ck_assert_uint_ge(r.run->rows, 5);
    ck_assert_uint_le(r.run->rows, 6);
    for (size_t row = 0; row < r.run->rows; row++)
        assert_close(r.run->x[2 * row], 1 - 2 * r.run->t[row], 1e-9, 1e-9);
    ck_assert_ptr_nonnull(strstr(r.err.message, "leak"));
    rig_free(&r);
}
END_TEST

typedef struct watch {
    int stops_left;
    double last;
    bool falls;
} watch;

static bool stop_after(void *context)
{
    watch *w = context;
    return w->stops_left-- <= 0;
}

static void note_progress(void *context, const char *what, double done)
{
    watch *w = context;
    w->falls |= done < w->last || done > 1 || strcmp(what, "run") != 0;
    w->last = done;
}

START_TEST(test_an_interrupted_run_is_a_result)
{
    watch w = {.stops_left = 40};
    lb_monitor monitor = {stop_after, note_progress, &w};
    lb_run_options options = {.until = 1e4, .every = 1e-3, .monitor = &monitor};
    rig r = rig_new(ROBER_TEXT);
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert(r.run->interrupted);
    ck_assert_uint_eq(r.run->steps, 40);
    ck_assert_uint_gt(r.run->rows, 1);
    w.stops_left = 1000000;
    ck_assert_int_eq(solve(&r, &(lb_run_options){.until = 1e4, .monitor = &monitor}), LB_OK);
    ck_assert(!r.run->interrupted);
    ck_assert(w.last > 0 && !w.falls);
    rig_free(&r);
}
END_TEST

START_TEST(test_options_outside_their_domain_are_refused)
{
    const lb_run_options wrong[] = {
        {.until = 0}, {.until = -1}, {.until = NAN}, {.until = INFINITY}, {.until = 1, .every = -1},
        {.until = 1, .every = NAN}, {.until = 1, .tolerance = -1}, {.until = 1, .tolerance = 1e-17},
    };
    rig r = rig_new(DECAY);
    for (size_t k = 0; k < sizeof wrong / sizeof *wrong; k++) {
        ck_assert_int_eq(solve(&r, &wrong[k]), LB_E_ARG);
        ck_assert_ptr_null(r.run);
        ck_assert_int_eq(r.err.code, LB_E_ARG);
    }
    ck_assert_int_eq(solve(&r, &(lb_run_options){.until = 1, .every = 1e-12}), LB_E_LIMIT);
    rig_free(&r);
}
END_TEST

/* The Oregonator over many pulses at the loosest tolerance: what comes out is within 5 %
 * of the time course at 1e-10 in every row, and the result says that it was tightened. */
START_TEST(test_a_loose_tolerance_is_found_out)
{
    rig r = rig_new(OREGO_TEXT), tight = rig_new(OREGO_TEXT);
    ck_assert_int_eq(solve(&r, &(lb_run_options){.until = 10000, .tolerance = 1e-2}), LB_OK);
    ck_assert_int_eq(solve(&tight, &(lb_run_options){.until = 10000, .tolerance = 1e-10}), LB_OK);
    ck_assert_ptr_nonnull(r.run->tightened);
    ck_assert(r.run->tolerance < 1e-2);
    for (int i = 0; i < 3; i++) {
        double largest = 0;
        for (size_t row = 0; row < r.run->rows; row++)
            largest = fmax(largest, tight.run->x[3 * row + (size_t)i]);
        for (size_t row = 0; row < r.run->rows; row++)
            assert_close(r.run->x[3 * row + (size_t)i], tight.run->x[3 * row + (size_t)i], 0, 0.06 * largest);
    }
    rig_free(&tight);
    rig_free(&r);
}
END_TEST

/* A decay is right at any tolerance: nothing to tighten, and a tight run is not checked. */
START_TEST(test_a_sound_run_keeps_its_tolerance)
{
    rig r = rig_new(DECAY);
    ck_assert_int_eq(solve(&r, &(lb_run_options){.until = 3, .tolerance = 1e-3}), LB_OK);
    ck_assert(r.run->tolerance == 1e-3 && !r.run->tightened);
    rig_free(&r);
}
END_TEST

START_TEST(test_failing_allocations_leave_nothing_behind)
{
    rig r = rig_new(ROBER_TEXT);
    lb_run_options options = {.until = 10};
    long k = 0;
    for (; ; k++) {
        memory_fail_after(k);
        lb_status status = solve(&r, &options);
        memory_fail_after(-1);
        if (status == LB_OK)
            break;
        ck_assert_int_eq(status, LB_E_NOMEM);
        ck_assert_ptr_null(r.run);
    }
    ck_assert_int_gt(k, 30);
    ck_assert_uint_eq(r.run->rows, 201);
    rig_free(&r);
}
END_TEST

START_TEST(test_equal_runs_are_equal_to_the_bit)
{
    rig r = rig_new(OREGO_TEXT), s = rig_new(OREGO_TEXT);
    lb_run_options options = {.until = 360};
    ck_assert_int_eq(solve(&r, &options), LB_OK);
    ck_assert_int_eq(solve(&s, &options), LB_OK);
    ck_assert_uint_eq(r.run->rows, s.run->rows);
    ck_assert_int_eq(memcmp(r.run->x, s.run->x, r.run->rows * 3 * sizeof *r.run->x), 0);
    rig_free(&r);
    rig_free(&s);
}
END_TEST

Suite *run_suite(void)
{
    Suite *suite = suite_create("run");
    TCase *rows = tcase_create("rows");
    tcase_add_test(rows, test_rows_are_even_and_end_at_the_end);
    tcase_add_test(rows, test_the_last_row_stands_at_the_end_whatever_the_spacing);
    tcase_add_test(rows, test_rows_do_not_shorten_the_steps);
    tcase_add_test(rows, test_readings_are_evaluated_in_every_row);
    tcase_add_test(rows, test_the_result_says_how);
    tcase_add_test(rows, test_equal_runs_are_equal_to_the_bit);
    suite_add_tcase(suite, rows);
    TCase *ends = tcase_create("ends");
    tcase_add_test(ends, test_rows_before_an_error_are_kept);
    tcase_add_test(ends, test_an_interrupted_run_is_a_result);
    tcase_add_test(ends, test_options_outside_their_domain_are_refused);
    tcase_add_test(ends, test_a_loose_tolerance_is_found_out);
    tcase_add_test(ends, test_a_sound_run_keeps_its_tolerance);
    tcase_add_test(ends, test_failing_allocations_leave_nothing_behind);
    suite_add_tcase(suite, ends);
    return suite;
}
