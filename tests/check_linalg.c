/* Dense solves, eigenvalues and the count of unstable roots. */
#include "analysis/linalg.h"
#include "analysis/eliminate.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "support.h"

static void fill_random(int n, uint64_t seed, double decades, double *A)
{
    for (int i = 0; i < n * n; i++)
        A[i] = sample_normal(seed, (uint64_t)i, 0) * pow(10, decades * (sample_uniform(seed, (uint64_t)i, 1) - 0.5));
}

/* max |A x - b| over the sum of the terms' magnitudes. */
static double residual(int n, const double *A, const double *x, const double *b)
{
    double worst = 0;
    for (int i = 0; i < n; i++) {
        double sum = -b[i], magnitude = fabs(b[i]);
        for (int j = 0; j < n; j++) {
            sum += A[i + j * n] * x[j];
            magnitude += fabs(A[i + j * n] * x[j]);
        }
        worst = fmax(worst, fabs(sum) / magnitude);
    }
    return worst;
}

static void check_solve(int n, uint64_t seed)
{
    double *A = malloc(sizeof *A * (size_t)n * (size_t)n), *LU = malloc(sizeof *LU * (size_t)n * (size_t)n);
    double *b = malloc(sizeof *b * 2 * (size_t)n), *x = malloc(sizeof *x * 2 * (size_t)n);
    int *pivot = malloc(sizeof *pivot * (size_t)n);
    fill_random(n, seed, 2, A);
    for (int i = 0; i < 2 * n; i++)
        b[i] = sample_normal(seed, (uint64_t)i, 2);
    memcpy(LU, A, sizeof *A * (size_t)n * (size_t)n);
    memcpy(x, b, sizeof *b * 2 * (size_t)n);
    ck_assert(linalg_factor(n, LU, pivot));
    linalg_solve(n, LU, pivot, 2, x);
    /* Gaussian elimination with partial pivoting has a backward error of a few
     * n units of rounding, growth included. */
    ck_assert(residual(n, A, x, b) < 100 * n * 2.2e-16);
    ck_assert(residual(n, A, x + n, b + n) < 100 * n * 2.2e-16);
    free(pivot);
    free(x);
    free(b);
    free(LU);
    free(A);
}

START_TEST(test_solution_satisfies_the_equations)
{
    const int sizes[] = {1, 2, 3, 8, 31, 128, 129, 200};   /* both sides of the change to LAPACK */
    for (int s = 0; s < 8; s++)
        check_solve(sizes[s], (uint64_t)s);
}
END_TEST

/* Without pivoting the small entry swamps the second equation: x = (1, 1) - 1e-20. */
START_TEST(test_small_pivots_are_avoided)
{
    double A[4] = {1e-20, 1, 1, 1}, b[2] = {1, 2};
    int pivot[2];
    ck_assert(linalg_factor(2, A, pivot));
    linalg_solve(2, A, pivot, 1, b);
    assert_close(b[0], 1, 1e-15, 0);
    assert_close(b[1], 1, 1e-15, 0);
}
END_TEST

/* The diagonal is kept down to a hundredth of the column's largest entry, and a
 * smaller one is not. */
START_TEST(test_the_diagonal_is_preferred_while_it_is_safe)
{
    double kept[4] = {1, 50, 1, 1}, changed[4] = {1, 1e4, 1, 1}, b[2] = {2, 51}, c[2] = {2, 10001};
    int pivot[2];
    ck_assert(eliminate(2, kept, pivot, 0.01));
    ck_assert(kept[0] == 1 && kept[1] == 50);
    linalg_solve(2, kept, pivot, 1, b);
    assert_close(b[0], 1, 1e-14, 0);
    assert_close(b[1], 1, 1e-14, 0);
    ck_assert(eliminate(2, changed, pivot, 0.01));
    ck_assert(changed[0] == 1e4);
    linalg_solve(2, changed, pivot, 1, c);
    assert_close(c[0], 1, 1e-14, 0);
    assert_close(c[1], 1, 1e-14, 0);
    double large[200 * 200] = {0}, x[200];
    int order[200];
    for (int i = 0; i < 200; i++) {
        large[i + 200 * i] = 1e-6;
        large[i + 200 * (199 - i)] += 1;
        x[i] = 1 + 1e-6;
    }
    ck_assert(eliminate(200, large, order, 0.01));
    linalg_solve(200, large, order, 1, x);      /* beyond the change to LAPACK's solve */
    for (int i = 0; i < 200; i++)
        assert_close(x[i], 1, 1e-13, 0);
}
END_TEST

START_TEST(test_singular_and_not_finite_matrices_are_refused)
{
    int pivot[3];
    double singular[9] = {1, 2, 3, 2, 4, 6, 1, 0, 1}, zero[1] = {0};
    double broken[9] = {1, 0, 0, 0, 1, 0, 0, NAN, 1}, large[4] = {1, 0, INFINITY, 1};
    ck_assert(!linalg_factor(3, singular, pivot));
    ck_assert(!linalg_factor(1, zero, pivot));
    ck_assert(!linalg_factor(3, broken, pivot));
    ck_assert(!linalg_factor(2, large, pivot));
}
END_TEST

START_TEST(test_condition_of_a_diagonal_matrix_is_the_ratio)
{
    double A[9] = {1e6, 0, 0, 0, 10, 0, 0, 0, 1e-3};
    int pivot[3];
    double norm = linalg_norm1(3, A);
    ck_assert(norm == 1e6);
    ck_assert(linalg_factor(3, A, pivot));
    assert_close(linalg_rcond(3, A, pivot, norm), 1e-9, 1e-12, 0);
}
END_TEST

/* Companion matrix of (z-1)(z+2)(z^2+2z+5)(z^2+2z+17): two pairs with the same
 * real part are kept as pairs. */
START_TEST(test_eigenvalues_are_sorted_with_pairs_adjacent)
{
    double A[36] = {0};
    const double block[2] = {2, 4};
    for (int b = 0; b < 2; b++) {
        int at = 2 * b;
        A[at + at * 6] = A[at + 1 + (at + 1) * 6] = -1;
        A[at + 1 + at * 6] = block[b];
        A[at + (at + 1) * 6] = -block[b];
    }
    A[4 + 4 * 6] = -2;
    A[5 + 5 * 6] = 1;
    A[5 + 4 * 6] = 0.3;
    lb_complex values[6];
    const lb_complex want[6] = {{1, 0}, {-1, 4}, {-1, -4}, {-1, 2}, {-1, -2}, {-2, 0}};
    ck_assert_int_eq(linalg_eigenvalues(6, A, values, NULL, NULL), LB_OK);
    for (int i = 0; i < 6; i++) {
        assert_close(values[i].re, want[i].re, 1e-14, 0);
        assert_close(values[i].im, want[i].im, 1e-14, 0);
    }
}
END_TEST

START_TEST(test_eigenvectors_follow_their_eigenvalues)
{
    enum { SIZE = 9 };
    double A[SIZE * SIZE], copy[SIZE * SIZE], vectors[SIZE * SIZE];
    lb_complex values[SIZE];
    fill_random(SIZE, 42, 1, A);
    memcpy(copy, A, sizeof A);
    ck_assert_int_eq(linalg_eigenvalues(SIZE, copy, values, vectors, NULL), LB_OK);
    for (int k = 0; k < SIZE; k++) {
        bool is_pair = values[k].im > 0;
        const double *re = vectors + k * SIZE, *im = is_pair ? re + SIZE : NULL;
        for (int i = 0; i < SIZE; i++) {
            double left = 0;    /* real part of A v - lambda v */
            for (int j = 0; j < SIZE; j++)
                left += A[i + j * SIZE] * re[j];
            double right = values[k].re * re[i] - (is_pair ? values[k].im * im[i] : 0);
            assert_close(left, right, 0, 1e-13);
        }
        k += is_pair;
    }
}
END_TEST

START_TEST(test_not_finite_matrices_have_no_eigenvalues)
{
    double A[4] = {1, NAN, 0, 1};
    lb_complex values[2];
    lb_error err;
    ck_assert_int_eq(linalg_eigenvalues(2, A, values, NULL, &err), LB_E_NUMERIC);
    ck_assert_int_eq(err.code, LB_E_NUMERIC);
}
END_TEST

/* x + y = 2 twice: rank one, and the shortest solution is (1, 1). */
START_TEST(test_least_squares_gives_the_shortest_solution)
{
    double A[4] = {1, 1, 1, 1}, b[2] = {2, 2};
    int rank;
    ck_assert_int_eq(linalg_least_squares(2, 2, A, b, 1e-12, &rank, NULL), LB_OK);
    ck_assert_int_eq(rank, 1);
    assert_close(b[0], 1, 1e-14, 0);
    assert_close(b[1], 1, 1e-14, 0);
}
END_TEST

/* The straight line through (0,1), (1,2), (2,2): 7/6 + t/2. */
START_TEST(test_least_squares_fits_a_line)
{
    double A[6] = {1, 1, 1, 0, 1, 2}, b[3] = {1, 2, 2}, wide[2] = {3, 4}, c[2] = {5, 0};
    int rank;
    ck_assert_int_eq(linalg_least_squares(3, 2, A, b, 1e-12, &rank, NULL), LB_OK);
    assert_close(b[0], 7.0 / 6, 1e-14, 0);
    assert_close(b[1], 0.5, 1e-14, 0);
    ck_assert_int_eq(linalg_least_squares(1, 2, wide, c, 1e-12, &rank, NULL), LB_OK);
    assert_close(c[0], 0.6, 1e-14, 0);
    assert_close(c[1], 0.8, 1e-14, 0);
}
END_TEST

/* Random matrices of every size, entries over up to twelve decades: whatever
 * the array decides is what the eigenvalues say, and it decides nearly always. */
START_TEST(test_routh_count_agrees_with_eigenvalues)
{
    int undecided = 0, total = 0;
    for (uint64_t seed = 0; seed < 3000; seed++) {
        int n = 1 + (int)(seed % LINALG_ROUTH_LIMIT);
        double A[LINALG_ROUTH_LIMIT * LINALG_ROUTH_LIMIT];
        lb_complex values[LINALG_ROUTH_LIMIT];
        fill_random(n, seed, (double)(seed % 4) * 4, A);
        int got = linalg_routh_unstable(n, A), want = 0;
        double norm = linalg_norm1(n, A), nearest = INFINITY;
        ck_assert_int_eq(linalg_eigenvalues(n, A, values, NULL, NULL), LB_OK);
        for (int i = 0; i < n; i++) {
            want += values[i].re > 0;
            nearest = fmin(nearest, fabs(values[i].re));
        }
        if (nearest < 1e-14 * norm)
            continue;   /* dgeev does not know the sign either */
        total++;
        undecided += got < 0;
        ck_assert_msg(got < 0 || got == want, "seed %d: %d, wanted %d", (int)seed, got, want);
    }
    ck_assert_msg(undecided * 100 < total * 5, "%d of %d", undecided, total);
}
END_TEST

START_TEST(test_routh_does_not_guess_on_the_axis)
{
    const double centre[4] = {0, 1, -1, 0}, zero[4] = {-1, 0, 0, 0};
    const double nearly[9] = {-1, 0, 0, 0, 1e-17, 1, 0, -1, 1e-17};
    ck_assert_int_eq(linalg_routh_unstable(2, centre), -1);
    ck_assert_int_eq(linalg_routh_unstable(2, zero), -1);
    ck_assert_int_eq(linalg_routh_unstable(3, nearly), -1);
    ck_assert_int_eq(linalg_routh_unstable(0, centre), 0);
    const double broken[1] = {NAN};
    ck_assert_int_eq(linalg_routh_unstable(1, broken), -1);
}
END_TEST

START_TEST(test_failing_allocations_are_reported)
{
    lb_complex values[3];
    double vectors[9];
    for (long k = 0; k < 4; k++) {
        double A[9] = {1, 2, 3, 4, 5, 6, 7, 8, 10};
        memory_fail_after(k);
        lb_status status = linalg_eigenvalues(3, A, values, vectors, NULL);
        memory_fail_after(-1);
        ck_assert_int_eq(status, LB_E_NOMEM);
    }
    for (long k = 0; k < 2; k++) {
        double A[4] = {1, 2, 3, 4}, b[2] = {1, 1};
        int rank;
        memory_fail_after(k);
        lb_status status = linalg_least_squares(2, 2, A, b, 1e-12, &rank, NULL);
        memory_fail_after(-1);
        ck_assert_int_eq(status, LB_E_NOMEM);
    }
}
END_TEST

Suite *linalg_suite(void)
{
    Suite *suite = suite_create("linalg");
    TCase *solve = tcase_create("solve");
    tcase_add_test(solve, test_solution_satisfies_the_equations);
    tcase_add_test(solve, test_small_pivots_are_avoided);
    tcase_add_test(solve, test_the_diagonal_is_preferred_while_it_is_safe);
    tcase_add_test(solve, test_singular_and_not_finite_matrices_are_refused);
    tcase_add_test(solve, test_condition_of_a_diagonal_matrix_is_the_ratio);
    tcase_add_test(solve, test_least_squares_gives_the_shortest_solution);
    tcase_add_test(solve, test_least_squares_fits_a_line);
    tcase_add_test(solve, test_failing_allocations_are_reported);
    suite_add_tcase(suite, solve);
    TCase *spectrum = tcase_create("spectrum");
    tcase_add_test(spectrum, test_eigenvalues_are_sorted_with_pairs_adjacent);
    tcase_add_test(spectrum, test_eigenvectors_follow_their_eigenvalues);
    tcase_add_test(spectrum, test_not_finite_matrices_have_no_eigenvalues);
    tcase_add_test(spectrum, test_routh_count_agrees_with_eigenvalues);
    tcase_add_test(spectrum, test_routh_does_not_guess_on_the_axis);
    suite_add_tcase(suite, spectrum);
    return suite;
}
