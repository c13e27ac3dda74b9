/* Linear systems of the stiff method: dense and sparse forms, conservation laws in
 * both, elimination in panels. */
#include "analysis/stiff_matrix.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/eliminate.h"
#include "analysis/integrate.h"
#include "analysis/linalg.h"
#include "base/memory.h"
#include "support.h"

/* A ring of isomers with rate constants over eight decades, on which an enzyme binds: two
 * laws, of the isomers with their complexes and of the enzyme.  2*ring + 1 species. */
static char *ring_text(int ring)
{
    size_t room = (size_t)ring * 160 + 128, used = 0;
    char *text = malloc(room);
    ck_assert_ptr_nonnull(text);
    used += (size_t)snprintf(text, room, "units none\n[S0]0 = 1\n[E]0 = 0.01\n");
    for (int i = 0; i < ring; i++) {
        double k = pow(10, (i * 5) % 9 - 3);
        used += (size_t)snprintf(text + used, room - used,
                                 "S%d <-> S%d, kf = %g, kr = %g\nE + S%d <-> C%d, kf = %g, kr = 1\n", i,
                                 (i + 1) % ring, k, 0.7 * k, i, i, 10 * k);
    }
    return text;
}

typedef struct rig {
    lb_network *network;
    lb_system *system;
    lb_evaluator *evaluator;
    int n;
    double *x, *f, *values;
} rig;

static rig rig_new(int ring)
{
    char *text = ring_text(ring);
    rig r = {.network = support_network(text)};
    free(text);
    ck_assert_int_eq(lb_system_new(r.network, &r.system, NULL), LB_OK);
    ck_assert_int_eq(lb_evaluator_new(r.system, &r.evaluator, NULL), LB_OK);
    r.n = lb_network_states(r.network);
    r.x = malloc((size_t)r.n * sizeof *r.x);
    r.f = malloc((size_t)r.n * sizeof *r.f);
    r.values = malloc((size_t)lb_system_nonzeros(r.system) * sizeof *r.values);
    ck_assert(r.x && r.f && r.values);
    for (int i = 0; i < r.n; i++)
        r.x[i] = 1e-6 * pow(1.3, i % 40);
    lb_rhs(r.evaluator, r.x, r.f);
    lb_jacobian_sparse(r.evaluator, r.x, r.values);
    return r;
}

static void rig_free(rig *r)
{
    free(r->values);
    free(r->f);
    free(r->x);
    lb_evaluator_free(r->evaluator);
    lb_system_free(r->system);
    lb_network_free(r->network);
}

/* (diagonal I - J) u - f, each relative to the sum of its terms; for a species that a law
 * gives, to the largest of all, since the others' roundings add up there. */
static double residual(const rig *r, const stiff_matrix *matrix, double diagonal, const double *u)
{
    const int *start = lb_system_column_start(r->system), *row = lb_system_rows(r->system);
    double *left = calloc((size_t)r->n, sizeof *left), *size = calloc((size_t)r->n, sizeof *size);
    double worst = 0, most = 0;
    ck_assert(left && size);
    for (int j = 0; j < r->n; j++) {
        left[j] += diagonal * u[j] - r->f[j];
        size[j] += fabs(diagonal * u[j]) + fabs(r->f[j]);
        for (int e = start[j]; e < start[j + 1]; e++) {
            left[row[e]] -= r->values[e] * u[j];
            size[row[e]] += fabs(r->values[e] * u[j]);
        }
    }
    for (int i = 0; i < r->n; i++)
        most = fmax(most, size[i]);
    for (int i = 0; i < r->n; i++)
        worst = fmax(worst, fabs(left[i]) / (matrix->laws.place[i] < 0 ? most : size[i]));
    free(size);
    free(left);
    return worst;
}

/* 11 species are solved densely, 201 sparsely.  At steps of 1e6 times the slowest time
 * the full matrix is singular to rounding; the laws in it keep the answer.  Terms span
 * twelve decades, and a pivot may be a hundredth of the largest: 1e-11. */
START_TEST(test_both_forms_solve_the_full_system)
{
    const double diagonals[] = {1e6, 1, 1e-3, 1e-9};
    const bool is_sparse = _i == 1;
    rig r = rig_new(is_sparse ? 100 : 5);
    double *u = malloc((size_t)r.n * sizeof *u);
    ck_assert_ptr_nonnull(u);
    stiff_matrix matrix;
    ck_assert_int_eq(stiff_matrix_init(&matrix, r.system), LB_OK);
    for (int large = 0; large < r.n; large += is_sparse ? 40 : 2) {
        r.x[large] *= 1e6;          /* another species is the largest of its law */
        ck_assert_int_eq(stiff_matrix_choose(&matrix, r.x), LB_OK);
        r.x[large] /= 1e6;
        ck_assert_int_eq(matrix.laws.place[large], -1);
        ck_assert_int_eq(matrix.is_sparse, is_sparse);
        for (int d = 0; d < 4; d++) {
            ck_assert_int_eq(stiff_matrix_factor(&matrix, diagonals[d], r.values), LB_OK);
            memcpy(u, r.f, (size_t)r.n * sizeof *u);
            stiff_matrix_solve(&matrix, 1, u);
            double worst = residual(&r, &matrix, diagonals[d], u);
            ck_assert_msg(worst < 1e-11, "%g at %g", worst, diagonals[d]);
        }
    }
    stiff_matrix_clear(&matrix);
    free(u);
    rig_free(&r);
}
END_TEST

/* Over thousands of steps and up to long ones, a total moves by rounding alone. */
START_TEST(test_totals_stay_in_the_sparse_form)
{
    rig r = rig_new(20);
    integrator *it = NULL;
    lb_error err;
    const integrator_options options = {.tolerance = 1e-4, .method = LB_METHOD_STIFF};
    ck_assert_int_eq(integrator_new(r.evaluator, &options, &it, &err), LB_OK);
    lb_initial(r.evaluator, r.x);
    integrator_start(it, 0, r.x);
    ck_assert_int_eq(integrator_to(it, 1e12, &err), LB_OK);
    ck_assert_str_eq(integrator_method(it), "Rosenbrock 5(4), Rodas5P, with sparse LU");
    double enzyme = 0, isomers = 0;
    for (int i = 0; i < r.n; i++) {
        const char *name = lb_network_state_name(r.network, i);
        enzyme += name[0] != 'S' ? integrator_state(it)[i] : 0;
        isomers += name[0] != 'E' ? integrator_state(it)[i] : 0;
    }
    assert_close(enzyme, 0.01, 1e-13, 0);
    assert_close(isomers, 1, 1e-13, 0);
    integrator_free(it);
    rig_free(&r);
}
END_TEST

START_TEST(test_sparse_failing_allocations_leave_nothing_behind)
{
    rig r = rig_new(20);
    stiff_matrix matrix;
    lb_status status = LB_E_NOMEM;
    int failures = 0;
    for (long k = 0; status != LB_OK; k++, failures++) {
        memory_fail_after(k);
        status = stiff_matrix_init(&matrix, r.system);
        if (status == LB_OK)
            status = stiff_matrix_choose(&matrix, r.x);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        stiff_matrix_clear(&matrix);
    }
    ck_assert_int_gt(failures, 12);
    rig_free(&r);
}
END_TEST

/* A chain of 10 000 species and 30 000 reactions, which is stiff; a dense matrix of it
 * would take 800 MB.  All in all x' = N v keeps the total. */
START_TEST(test_ten_thousand_species_run)
{
    enum { SPECIES = 10000 };
    char *text = malloc(SPECIES * 200), *at = text;
    ck_assert_ptr_nonnull(text);
    at += sprintf(at, "units none\n");
    for (int i = 0; i < SPECIES; i++)
        at += sprintf(at, "[S%d]0 = %d\nS%d <-> S%d, kf = %d, kr = 500\nS%d + S%d -> S%d + S%d, k = 1\n", i, 1 + i % 3, i,
                      (i + 1) % SPECIES, 100 + i % 1000, i, (i + 2) % SPECIES, (i + 1) % SPECIES, (i + 3) % SPECIES);
    lb_network *network = support_network(text);
    lb_system *system = NULL;
    lb_run *run = NULL;
    lb_error err;
    ck_assert_int_eq(lb_network_steps(network), 3 * SPECIES);
    ck_assert_int_eq(lb_system_new(network, &system, &err), LB_OK);
    const lb_run_options options = {.until = 10, .every = 10, .tolerance = 1e-3, .method = LB_METHOD_STIFF};
    lb_status status = lb_run_solve(system, &options, &run, &err);
    ck_assert_msg(status == LB_OK, "%s", err.message);
    double total = 0, start = 0;
    for (int i = 0; i < SPECIES; i++) {
        start += run->x[i];
        total += run->x[SPECIES + i];
    }
    assert_close(total, start, 1e-12, 0);
    lb_run_free(run);
    lb_system_free(system);
    lb_network_free(network);
    free(text);
}
END_TEST

static unsigned random_bits = 1;

static double random_number(void)
{
    random_bits = random_bits * 1664525u + 1013904223u;
    return (random_bits >> 8) / 16777216.0 - 0.5;
}

/* Around the sizes where panels, strips and tiles begin and end; with pivots that
 * prefer the diagonal (which need not be good: it is made so) and partial ones. */
START_TEST(test_elimination_solves_at_every_size)
{
    for (int n = 1; n < 140; n += n < 44 ? 7 : 1) {
        double *A = malloc((size_t)n * (size_t)n * sizeof *A), *x = malloc((size_t)n * sizeof *x);
        double *b = calloc((size_t)n, sizeof *b);
        int *pivot = malloc((size_t)n * sizeof *pivot);
        ck_assert(A && x && b && pivot);
        for (int j = 0; j < n; j++) {
            x[j] = 1 + random_number();
            for (int i = 0; i < n; i++) {
                A[i + (size_t)j * (size_t)n] = random_number() + (_i == 0 && i == j ? n / 8.0 : 0);
                b[i] += A[i + (size_t)j * (size_t)n] * x[j];
            }
        }
        double norm = linalg_norm1(n, A);
        ck_assert(eliminate(n, A, pivot, _i == 0 ? 0.01 : 1));
        bool moved = false;
        for (int i = 0; i < n; i++)
            moved = moved || pivot[i] != i + 1;
        ck_assert(n < 8 || moved == (_i == 1));
        double condition = 1 / linalg_rcond(n, A, pivot, norm);
        linalg_solve(n, A, pivot, 1, b);
        for (int i = 0; i < n; i++)
            assert_close(b[i], x[i], 1e-14 * condition, 0);
        free(pivot);
        free(b);
        free(x);
        free(A);
    }
}
END_TEST

START_TEST(test_elimination_finds_a_singular_matrix)
{
    enum { N = 70 };
    static double A[N * N];
    int pivot[N];
    for (int i = 0; i < N * N; i++)
        A[i] = random_number();
    for (int i = 0; i < N; i++)
        A[i + 60 * N] = 0;
    ck_assert(!eliminate(N, A, pivot, 1));
}
END_TEST

Suite *stiff_matrix_suite(void)
{
    Suite *suite = suite_create("stiff_matrix");
    TCase *forms = tcase_create("forms");
    tcase_set_timeout(forms, 60);
    tcase_add_loop_test(forms, test_both_forms_solve_the_full_system, 0, 2);
    tcase_add_test(forms, test_totals_stay_in_the_sparse_form);
    tcase_add_test(forms, test_sparse_failing_allocations_leave_nothing_behind);
    tcase_add_test(forms, test_ten_thousand_species_run);
    suite_add_tcase(suite, forms);
    TCase *elimination = tcase_create("elimination");
    tcase_add_loop_test(elimination, test_elimination_solves_at_every_size, 0, 2);
    tcase_add_test(elimination, test_elimination_finds_a_singular_matrix);
    suite_add_tcase(suite, elimination);
    return suite;
}
