/* Low-discrepancy points and counter-based random numbers. */
#include "analysis/sample.h"

#include <math.h>
#include <stdlib.h>

#include "support.h"

/* Known answers of Philox4x32-10 from the authors' test vectors (Salmon et al.
 * 2011, kat_vectors; from memory): counter and key all zero, all one bits. */
START_TEST(test_uniform_is_philox)
{
    double zeros = ((double)((0xe169c58d6627e8d5ull) >> 12) + 0.5) * 0x1p-52;
    double ones = ((double)((0x41c83b0e408f276dull) >> 12) + 0.5) * 0x1p-52;
    ck_assert(sample_uniform(0, 0, 0) == zeros);
    ck_assert(sample_uniform(UINT64_MAX, UINT64_MAX, UINT64_MAX) == ones);
}
END_TEST

START_TEST(test_uniform_depends_on_every_argument)
{
    double base = sample_uniform(1, 2, 3);
    ck_assert(base == sample_uniform(1, 2, 3));
    ck_assert(base != sample_uniform(2, 2, 3));
    ck_assert(base != sample_uniform(1, 3, 3));
    ck_assert(base != sample_uniform(1, 2, 4));
}
END_TEST

/* Mean and variance over 100 000 numbers, five standard errors wide. */
START_TEST(test_moments_are_those_of_the_distribution)
{
    enum { COUNT = 100000 };
    double u = 0, uu = 0, z = 0, zz = 0, zzzz = 0;
    for (int i = 0; i < COUNT; i++) {
        double a = sample_uniform(5, (uint64_t)i, 0), b = sample_normal(5, (uint64_t)i, 1);
        ck_assert(a > 0 && a < 1);
        u += a / COUNT;
        uu += a * a / COUNT;
        z += b / COUNT;
        zz += b * b / COUNT;
        zzzz += b * b * b * b / COUNT;
    }
    assert_close(u, 0.5, 0, 5 * sqrt(1.0 / 12 / COUNT));
    assert_close(uu - u * u, 1.0 / 12, 0, 5 * sqrt(1.0 / 180 / COUNT));
    assert_close(z, 0, 0, 5 * sqrt(1.0 / COUNT));
    assert_close(zz, 1, 0, 5 * sqrt(2.0 / COUNT));
    assert_close(zzzz, 3, 0, 5 * sqrt(96.0 / COUNT));
}
END_TEST

START_TEST(test_point_depends_on_seed_and_index_alone)
{
    double a[7], b[7], c[7], d[7], e[3];
    sample_point(11, 1000000007, 7, a);
    sample_point(11, 5, 7, b);
    sample_point(11, 1000000007, 7, c);
    sample_point(12, 1000000007, 7, d);
    sample_point(11, 1000000007, 3, e);
    for (int j = 0; j < 7; j++) {
        ck_assert(a[j] == c[j]);
        ck_assert(a[j] != b[j]);
        ck_assert(a[j] != d[j]);
    }
    for (int j = 0; j < 3; j++)
        ck_assert(a[j] == e[j]);        /* a coordinate does not know how many follow */
}
END_TEST

/* The first p^2 points of dimension p put exactly one into each of p^2 cells. */
START_TEST(test_each_coordinate_is_stratified)
{
    const int prime[] = {2, 3, 5, 7, 11, 13, 17, 19};
    for (int j = 0; j < 8; j++) {
        int cells = prime[j] * prime[j], seen[361] = {0};
        for (int i = 0; i < cells; i++) {
            double point[8];
            sample_point(3, (uint64_t)i, 8, point);
            ck_assert(point[j] > 0 && point[j] < 1);
            seen[(int)(point[j] * cells)]++;
        }
        for (int c = 0; c < cells; c++)
            ck_assert_int_eq(seen[c], 1);
    }
}
END_TEST

/* Chi-squared per degree of freedom of 8*8 cells, over all pairs of dimensions.
 * Random points give 1 on average and about 1.7 for the worst of 1770 pairs
 * (63 degrees of freedom: 1 + 3.5 sqrt(2/63)); plain Halton points give 40. */
START_TEST(test_pairs_of_sixty_dimensions_have_no_stripes)
{
    enum { COUNT = 1024, DIMENSIONS = 60, CELLS = 8 };
    static double point[COUNT][DIMENSIONS];
    for (int i = 0; i < COUNT; i++)
        sample_point(7, (uint64_t)i, DIMENSIONS, point[i]);
    double mean = 0, expected = (double)COUNT / (CELLS * CELLS);
    for (int a = 0; a < DIMENSIONS; a++)
        for (int b = 0; b < a; b++) {
            int seen[CELLS][CELLS] = {{0}};
            for (int i = 0; i < COUNT; i++)
                seen[(int)(point[i][a] * CELLS)][(int)(point[i][b] * CELLS)]++;
            double chi = 0;
            for (int c = 0; c < CELLS * CELLS; c++)
                chi += pow(seen[c / CELLS][c % CELLS] - expected, 2) / expected / (CELLS * CELLS - 1);
            ck_assert_msg(chi < 2, "dimensions %d and %d: %g", a, b, chi);
            mean += chi / (DIMENSIONS * (DIMENSIONS - 1) / 2);
        }
    ck_assert_msg(mean < 0.8, "mean %g", mean);
}
END_TEST

/* Integral of prod (1 + (x_j - 1/2)/2) = 1 in four dimensions: the error falls
 * much faster than that of random points (which is near 0.3/sqrt(COUNT) = 0.005). */
START_TEST(test_points_integrate_better_than_random_ones)
{
    enum { COUNT = 4096 };
    double sum = 0;
    for (int i = 0; i < COUNT; i++) {
        double point[4], product = 1;
        sample_point(1, (uint64_t)i, 4, point);
        for (int j = 0; j < 4; j++)
            product *= 1 + (point[j] - 0.5) / 2;
        sum += product / COUNT;
    }
    assert_close(sum, 1, 0, 5e-4);
}
END_TEST

Suite *sample_suite(void)
{
    Suite *suite = suite_create("sample");
    TCase *numbers = tcase_create("numbers");
    tcase_add_test(numbers, test_uniform_is_philox);
    tcase_add_test(numbers, test_uniform_depends_on_every_argument);
    tcase_add_test(numbers, test_moments_are_those_of_the_distribution);
    suite_add_tcase(suite, numbers);
    TCase *points = tcase_create("points");
    tcase_add_test(points, test_point_depends_on_seed_and_index_alone);
    tcase_add_test(points, test_each_coordinate_is_stratified);
    tcase_add_test(points, test_pairs_of_sixty_dimensions_have_no_stripes);
    tcase_add_test(points, test_points_integrate_better_than_random_ones);
    suite_add_tcase(suite, points);
    return suite;
}
