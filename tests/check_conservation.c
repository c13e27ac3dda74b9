/* Conservation laws: textbook mechanisms, brute force, exactness, limits. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "exact/conservation.h"
#include "random_network.h"
#include "support.h"

/* ---- Asking ----------------------------------------------------------------------- */

static lb_status find(const lb_network *net, conservation *laws, lb_error *err)
{
    int *all = memory_array((size_t)net->states, sizeof *all);
    ck_assert_ptr_nonnull(all);
    for (int i = 0; i < net->states; i++)
        all[i] = i;
    lb_status status = conservation_find(net, all, net->states, NULL, laws, err);
    memory_free(all);
    return status;
}

static conservation laws_of(const lb_network *net)
{
    conservation laws;
    lb_error err = {.code = LB_OK};
    ck_assert_msg(find(net, &laws, &err) == LB_OK, "%s", err.message);
    return laws;
}

static const int64_t *law_at(const conservation *laws, int l)
{
    return laws->law + (size_t)l * (size_t)laws->width;
}

/* "E + C; S + C + P" */
static char *laws_text(const lb_network *net, const conservation *laws)
{
    buffer text;
    buffer_init(&text);
    for (int l = 0; l < laws->count; l++) {
        buffer_append(&text, l > 0 ? "; " : "");
        bool is_first = true;
        for (int i = 0; i < laws->width; i++) {
            long long c = law_at(laws, l)[i];
            if (c == 0)
                continue;
            buffer_append(&text, is_first ? (c < 0 ? "-" : "") : c < 0 ? " - " : " + ");
            if (llabs(c) != 1)
                buffer_printf(&text, "%lld ", llabs(c));
            buffer_append(&text, net->species[net->state_species[i]].name);
            is_first = false;
        }
    }
    return buffer_take(&text);
}

static void assert_laws(const char *mechanism, int basis, int semipositive, const char *want)
{
    lb_network *net = support_network(mechanism);
    conservation laws = laws_of(net);
    char *text = laws_text(net, &laws);
    ck_assert_str_eq(text, want);
    ck_assert_int_eq(laws.basis, basis);
    ck_assert_int_eq(laws.semipositive, semipositive);
    ck_assert(laws.is_complete);
    memory_free(text);
    conservation_clear(&laws);
    lb_network_free(net);
}

/* ---- Mechanisms from books ---------------------------------------------------------- */

START_TEST(test_laws_of_an_enzyme)
{
    assert_laws("units none\nE + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n", 2, 2, "E + C; S + C + P");
}
END_TEST

START_TEST(test_laws_of_a_futile_cycle)
{
    assert_laws("units none\nE + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n"
                "F + P <-> D, kf = 1, kr = 1\nD -> F + S, k = 1\n", 3, 3, "E + C; S + C + P + D; F + D");
}
END_TEST

/* Double phosphorylation, distributive (Wang and Sontag, J. Math. Biol. 57 (2008) 29, from
 * memory); the laws are evident. */
START_TEST(test_laws_of_double_phosphorylation)
{
    assert_laws("units none\nS0 + E <-> ES0, kf = 1, kr = 1\nES0 -> S1 + E, k = 1\n"
                "S1 + E <-> ES1, kf = 1, kr = 1\nES1 -> S2 + E, k = 1\n"
                "S2 + F <-> FS2, kf = 1, kr = 1\nFS2 -> S1 + F, k = 1\n"
                "S1 + F <-> FS1, kf = 1, kr = 1\nFS1 -> S0 + F, k = 1\n",
                3, 3, "S0 + ES0 + S1 + ES1 + S2 + FS2 + FS1; E + ES0 + ES1; F + FS2 + FS1");
}
END_TEST

/* Feinberg, Chem. Eng. Sci. 42 (1987) 2229 (from memory). */
START_TEST(test_laws_of_a_deficiency_zero_network)
{
    assert_laws("units none\nA <-> 2 B, kf = 1, kr = 1\nA + C <-> D, kf = 1, kr = 1\n"
                "D -> B + E, k = 1\nB + E -> A + C, k = 1\n", 2, 2, "2 A + B + 2 D + E; C + D + E");
}
END_TEST

START_TEST(test_further_minimal_laws_follow_the_basis)
{
    /* A and B each meet C and D: four minimal laws in three dimensions. */
    assert_laws("units none\nA + B -> C + D, k = 1\n", 3, 3, "A + C; A + D; B + C; B + D");
}
END_TEST

START_TEST(test_signed_laws_complete_the_basis)
{
    assert_laws("units none\nA + B ->, k = 1\n", 1, 0, "A - B");
    assert_laws("units none\nA + B ->, k = 1\nC -> D, k = 1\n", 2, 1, "C + D; A - B");
}
END_TEST

START_TEST(test_fractional_coefficients_are_exact)
{
    assert_laws("units none\n0.5 X -> Y, k = 1\n", 1, 1, "2 X + Y");
    assert_laws("units none\nX -> (1/3) Y + 0.7 Z, k = 1\n", 2, 2, "X + 3 Y; 7 X + 10 Z");
}
END_TEST

START_TEST(test_laws_hold_for_all_values_of_coefficients)
{
    assert_laws("units none\nf = 0.4\nX -> (f) Y + (1 - f) Z, k = 1\n", 1, 1, "X + Y + Z");
    assert_laws("units none\nf = 1\nX -> (f) Y, k = 1\n", 0, 0, "");
    assert_laws("units none\nf = 1\nX -> (f/2 + 1) Y + (1 - f) Z, k = 1\n", 1, 1, "3 X + 2 Y + Z");
    assert_laws("units none\nf = 0.4\ng = 0.2\nX -> (f + g) Y + (3 - 2*f - 2*g) Z, k = 1\n", 1, 1, "3 X + 2 Y + Z");
}
END_TEST

START_TEST(test_a_tank_keeps_laws_of_retained_species_alone)
{
    assert_laws("units none\nresidence = 10\n[S]in = 1\nretained E, C\n"
                "E + S <-> C, kf = 1, kr = 1\nC -> E + P, k = 1\n", 1, 1, "E + C");
}
END_TEST

/* Laws in the head comments of the files, or counts of atoms (N, C and S in POLLU). */
START_TEST(test_laws_of_published_mechanisms)
{
    static const char *const cases[][2] = {
        {"networks/hires.mech", "Y8 + Y7"},
        {"networks/rober.mech", "A + B + C"},
        {"networks/pollu.mech", "NO2 + NO + PAN + HNO3 + NO3 + 2 N2O5; "
                                "HCHO + CO + 2 ALD + MEO2 + 2 C2O3 + CO2 + 2 PAN + CH3O; SO2 + SO4"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        lb_network *net = support_network_file(cases[i][0]);
        conservation laws = laws_of(net);
        char *text = laws_text(net, &laws);
        ck_assert_str_eq(text, cases[i][1]);
        memory_free(text);
        conservation_clear(&laws);
        lb_network_free(net);
    }
}
END_TEST

/* ---- Against brute force ---------------------------------------------------------------- */

enum { FEW = 7 };

/* Reduced row echelon form in long doubles, which is safe for so few small entries; pivot
 * columns are marked, the rank returned. */
static int reduce_rows(long double (*a)[FEW], int rows, int columns, bool *is_pivot)
{
    int rank = 0;
    for (int c = 0; c < columns; c++) {
        int best = rank;
        for (int r = rank; r < rows; r++)
            if (fabsl(a[r][c]) > fabsl(a[best][c]))
                best = r;
        is_pivot[c] = rank < rows && fabsl(a[best][c]) > 1e-12L;
        if (!is_pivot[c])
            continue;
        for (int j = 0; j < columns; j++) {
            long double swap = a[rank][j];
            a[rank][j] = a[best][j];
            a[best][j] = swap;
        }
        long double pivot = a[rank][c];
        for (int j = 0; j < columns; j++)
            a[rank][j] /= pivot;
        for (int r = 0; r < rows; r++) {
            long double factor = r == rank ? 0 : a[r][c];
            for (int j = 0; j < columns; j++)
                a[r][j] -= factor * a[rank][j];
        }
        rank++;
    }
    return rank;
}

/* Laws on the species of `support` alone: their dimension, and when that is one, the law w with
 * 1 at its last free species. */
static int laws_on_support(const lb_network *net, unsigned support, long double *w)
{
    long double (*a)[FEW] = memory_zeroed((size_t)net->step_count, sizeof *a);
    int column[FEW], size = 0;
    for (int i = 0; i < net->states; i++)
        if (support >> i & 1)
            column[size++] = i;
    for (int s = 0; s < net->step_count; s++)
        for (int j = 0; j < size; j++)
            for (int i = 0; i < net->steps[s].entry_count; i++)
                if (net->steps[s].entries[i].state == column[j])
                    a[s][j] = (long double)net->steps[s].entries[i].num / (long double)net->steps[s].entries[i].den;
    bool is_pivot[FEW];
    int nullity = size - reduce_rows(a, net->step_count, size, is_pivot), free_column = 0;
    while (free_column < size && is_pivot[free_column])
        free_column++;
    memset(w, 0, FEW * sizeof *w);
    for (int j = 0, row = 0; nullity == 1 && j < size; j++)
        w[column[j]] = is_pivot[j] ? -a[row++][free_column] : 1;
    memory_free(a);
    return nullity;
}

/* Is w zero outside its support alone, and of one sign? */
static bool is_minimal_non_negative(const long double *w, unsigned support)
{
    for (int i = 0; i < FEW; i++)
        if ((support >> i & 1) && w[i] < 1e-9L)
            return false;
    return true;
}

static bool is_multiple(const int64_t *law, const long double *w, int n)
{
    int first = 0;
    while (w[first] == 0)
        first++;
    for (int i = 0; i < n; i++)
        if (fabsl((long double)law[i] - (long double)law[first] / w[first] * w[i]) > 1e-9L)
            return false;
    return law[first] != 0;
}

static void assert_all_minimal_laws(const lb_network *net)
{
    conservation laws = laws_of(net);
    int wanted = 0, found = 0, non_negative = 0;
    for (unsigned support = 1; support < 1u << net->states; support++) {
        long double w[FEW];
        if (laws_on_support(net, support, w) != 1 || !is_minimal_non_negative(w, support))
            continue;
        wanted++;
        for (int l = 0; l < laws.count; l++)
            found += is_multiple(law_at(&laws, l), w, net->states);
    }
    for (int l = 0; l < laws.count; l++) {
        bool is_signed = false;
        for (int i = 0; i < laws.width; i++)
            is_signed = is_signed || law_at(&laws, l)[i] < 0;
        non_negative += !is_signed;
    }
    ck_assert(laws.is_complete);
    ck_assert_int_eq(found, wanted);
    ck_assert_int_eq(non_negative, wanted);
    long double w[FEW];
    ck_assert_int_eq(laws.basis, laws_on_support(net, (1u << net->states) - 1, w));
    conservation_clear(&laws);
}

/* Two or three reactions that each have most of seven species: cones with many rays, not all of
 * them adjacent. */
static lb_network *crowded_network(unsigned seed)
{
    lb_network *net = network_new();
    expression k = expression_constant(&net->graph, network_add_constant(net, "k", CONSTANT_NAMED, 1));
    for (int i = 0; i < FEW; i++)
        network_add_species(net, (const char[]){(char)('A' + i), '\0'}, ROLE_DYNAMIC);
    for (unsigned r = 0; r < 2 + seed % 2; r++) {
        int reaction = network_add_reaction(net, "R", false);
        for (int i = 0; i < FEW; i++) {
            seed = seed * 1664525u + 1013904223u;
            int coefficient = (int)(seed >> 20) % 5 - 2;
            if (coefficient != 0)
                network_add_term(net, reaction, coefficient > 0, i, abs(coefficient), 1, EXPRESSION_NONE);
        }
        network_add_mass_action(net, reaction, STEP_FORWARD, k);
    }
    ck_assert_int_eq(network_finish(net), LB_OK);
    return net;
}

START_TEST(test_minimal_laws_are_those_of_brute_force)
{
    for (unsigned seed = 1; seed <= 100; seed++) {
        lb_network *net = crowded_network(seed);
        assert_all_minimal_laws(net);
        lb_network_free(net);
    }
    for (uint64_t seed = 1; seed <= 200; seed++) {
        lb_network *net = random_mass_action(seed, 2 + (int)(seed % (FEW - 1)), 1 + (int)(seed / 7 % 5));
        assert_all_minimal_laws(net);
        lb_network_free(net);
    }
}
END_TEST

/* ---- Exactness and limits ------------------------------------------------------------------ */

/* Terms beyond what is lifted from a prime: elimination over the integers decides. */
START_TEST(test_long_decimals_are_exact)
{
    assert_laws("units none\nX -> 0.123456789 Y, k = 1\n", 1, 1, "123456789 X + 1000000000 Y");
    assert_laws("units none\nX -> 0.123456789 Y, k = 1\nY -> 0.987654321 Z, k = 1\n", 1, 1,
                "121932631112635269 X + 987654321000000000 Y + 1000000000000000000 Z");
}
END_TEST

START_TEST(test_laws_beyond_64_bits_are_refused)
{
    lb_network *net = support_network("units none\nX -> 0.123456789 Y, k = 1\nY -> 0.987654321 Z, k = 1\n"
                                      "Z -> 0.111111113 W, k = 1\n");
    conservation laws;
    lb_error err;
    ck_assert_int_eq(find(net, &laws, &err), LB_E_LIMIT);
    ck_assert_int_eq(laws.count, 0);
    ck_assert_ptr_null(laws.law);
    lb_network_free(net);
}
END_TEST

static lb_network *isomerisation_ring(int n)
{
    lb_network *net = network_new();
    char name[32];
    expression k = expression_constant(&net->graph, network_add_constant(net, "k", CONSTANT_NAMED, 1));
    for (int i = 0; i < n; i++) {
        snprintf(name, sizeof name, "X%d", i);
        network_add_species(net, name, ROLE_DYNAMIC);
    }
    for (int i = 0; i < n; i++) {
        int r = network_add_reaction(net, "R", true);
        network_add_term(net, r, false, i, 1, 1, EXPRESSION_NONE);
        network_add_term(net, r, true, (i + 1) % n, 1, 1, EXPRESSION_NONE);
        network_add_mass_action(net, r, STEP_FORWARD, k);
        network_add_mass_action(net, r, STEP_REVERSE, k);
    }
    ck_assert_int_eq(network_finish(net), LB_OK);
    return net;
}

START_TEST(test_a_ring_of_100000_species_has_one_law)
{
    lb_network *net = isomerisation_ring(100000);
    conservation laws = laws_of(net);
    ck_assert_int_eq(laws.count, 1);
    for (int i = 0; i < laws.width; i++)
        ck_assert(laws.law[i] == 1);
    conservation_clear(&laws);
    lb_network_free(net);
}
END_TEST

/* ---- What laws determine ------------------------------------------------------------------ */

/* x_dependent + L x_independent must be constant along every step. */
static void assert_elimination(const lb_network *net)
{
    conservation laws = laws_of(net);
    int n = laws.width, dependent_count = laws.basis, rank = n - dependent_count;
    int *dependent = memory_array((size_t)n, sizeof *dependent);
    int *independent = memory_array((size_t)n, sizeof *independent);
    double *L = memory_array((size_t)dependent_count * (size_t)rank, sizeof *L);
    lb_error err;
    ck_assert_int_eq(conservation_eliminate(&laws, dependent, independent, L, &err), LB_OK);
    double *change = memory_array((size_t)n, sizeof *change);
    for (int s = 0; s < net->step_count; s++) {
        memset(change, 0, (size_t)n * sizeof *change);
        for (int i = 0; i < net->steps[s].entry_count; i++)
            change[net->steps[s].entries[i].state] =
                (double)net->steps[s].entries[i].num / (double)net->steps[s].entries[i].den;
        for (int d = 0; d < dependent_count; d++) {
            double sum = change[dependent[d]];
            for (int i = 0; i < rank; i++)
                sum += L[d + i * dependent_count] * change[independent[i]];
            ck_assert_double_eq_tol(sum, 0, 1e-12);
        }
    }
    memory_free(change);
    memory_free(L);
    memory_free(independent);
    memory_free(dependent);
    conservation_clear(&laws);
}

START_TEST(test_elimination_is_constant_along_every_step)
{
    for (uint64_t seed = 1; seed <= 50; seed++) {
        lb_network *net = random_mass_action(seed, 12, 3 + (int)(seed % 9));
        assert_elimination(net);
        lb_network_free(net);
    }
}
END_TEST

START_TEST(test_isolated_columns_are_those_that_laws_fix)
{
    /* E + C and S + C + P + Q: P and Q are fixed together, not singly; E is. */
    lb_network *net = support_network("units none\nE + S <-> C, kf = 1, kr = 1\n"
                                      "C -> E + P, k = 1\nC -> E + Q, k = 1\n");
    conservation laws = laws_of(net);
    int P = lb_network_find_state(net, "P"), Q = lb_network_find_state(net, "Q");
    int E = lb_network_find_state(net, "E"), C = lb_network_find_state(net, "C");
    int columns[] = {E, P, Q}, count, *column;
    double *weight;
    lb_error err;
    ck_assert_int_eq(conservation_isolate(&laws, columns, 3, &count, &column, &weight, &err), LB_OK);
    ck_assert_int_eq(count, 1);
    ck_assert_int_eq(column[0], E);
    ck_assert(weight[E] == 1 && weight[C] == 1 && weight[P] == 0 && weight[Q] == 0);
    memory_free(column);
    memory_free(weight);
    conservation_clear(&laws);
    lb_network_free(net);
}
END_TEST

/* ---- Memory --------------------------------------------------------------------------------- */

START_TEST(test_every_failed_allocation_is_reported)
{
    lb_network *net = support_network("units none\nf = 0.4\nX -> (f) Y + (1 - f) Z, k = 1\nA + B -> C + D, k = 1\n");
    int all[] = {0, 1, 2, 3, 4, 5, 6};
    lb_status status = LB_E_NOMEM;
    long after = 0;
    for (; status != LB_OK; after++) {
        conservation laws;
        lb_error err;
        memory_fail_after(after);
        status = conservation_find(net, all, net->states, NULL, &laws, &err);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || (status == LB_E_NOMEM && laws.law == NULL));
        conservation_clear(&laws);
    }
    ck_assert_int_gt(after, 30);
    lb_network_free(net);
}
END_TEST

Suite *conservation_suite(void)
{
    Suite *suite = suite_create("conservation");
    TCase *all = tcase_create("conservation");
    tcase_set_timeout(all, 60);
    tcase_add_test(all, test_laws_of_an_enzyme);
    tcase_add_test(all, test_laws_of_a_futile_cycle);
    tcase_add_test(all, test_laws_of_double_phosphorylation);
    tcase_add_test(all, test_laws_of_a_deficiency_zero_network);
    tcase_add_test(all, test_further_minimal_laws_follow_the_basis);
    tcase_add_test(all, test_signed_laws_complete_the_basis);
    tcase_add_test(all, test_fractional_coefficients_are_exact);
    tcase_add_test(all, test_laws_hold_for_all_values_of_coefficients);
    tcase_add_test(all, test_a_tank_keeps_laws_of_retained_species_alone);
    tcase_add_test(all, test_laws_of_published_mechanisms);
    tcase_add_test(all, test_minimal_laws_are_those_of_brute_force);
    tcase_add_test(all, test_long_decimals_are_exact);
    tcase_add_test(all, test_laws_beyond_64_bits_are_refused);
    tcase_add_test(all, test_a_ring_of_100000_species_has_one_law);
    tcase_add_test(all, test_elimination_is_constant_along_every_step);
    tcase_add_test(all, test_isolated_columns_are_those_that_laws_fix);
    tcase_add_test(all, test_every_failed_allocation_is_reported);
    suite_add_tcase(suite, all);
    return suite;
}
