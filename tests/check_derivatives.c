/* Jacobians and derivatives by constants, of the tables and of the emitted C, against
 * complex-step differentiation of the rates (Squire and Trapp, SIAM Rev. 40 (1998) 110),
 * on random networks.
 *
 * The reference evaluates the network's rate expressions in complex numbers, with its
 * own arithmetic, and knows nothing of the derivatives that limbeck builds.  Beside each
 * value it carries the sum of the magnitudes of the terms that make it, and of those
 * that make its derivative: rounding errors are measured against these. */
#include <complex.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "emitted.h"
#include "model/network.h"
#include "random_network.h"
#include "support.h"

enum { NETWORKS = 200, BATCH = 50 };

static const double STEP = 1e-100, TOLERANCE = 1e-12;

/* A value and its derivative (imag/STEP); magnitudes of the terms of both. */
typedef struct traced {
    double complex z;
    double size, slope;
} traced;

/* ---- Complex arithmetic of the rate laws --------------------------------------------- */

static traced trace_product(traced a, traced b)
{
    return (traced){a.z * b.z, a.size * b.size, a.slope * b.size + a.size * b.slope};
}

static traced trace_quotient(traced a, traced b)
{
    double bottom = cabs(b.z);
    return (traced){a.z / b.z, a.size / bottom, a.slope / bottom + a.size * b.slope / (bottom * bottom)};
}

static double complex complex_power(double complex x, double complex n)
{
    double whole = creal(n);
    if (cimag(n) != 0 || whole != floor(whole) || fabs(whole) > 100)
        return creal(x) <= 0 ? 0 : cexp(n * clog(x));
    double complex result = 1;
    for (int i = 0; i < (int)fabs(whole); i++)
        result *= x;
    return whole < 0 ? 1 / result : result;
}

static traced trace_power(traced x, traced n)
{
    double complex z = complex_power(x.z, n.z);
    double value = cabs(z), base = cabs(x.z), order = creal(n.z);
    double by_exponent = n.slope > 0 && base > 0 ? value * fabs(log(base)) * n.slope : 0;
    double by_base = base > 0 ? fabs(order) * value / base * x.slope : 0;
    return (traced){z, value, by_base + by_exponent};
}

static traced trace_logarithm(traced a, double scale)
{
    double argument = cabs(a.z);
    double complex z = clog(a.z) / scale;
    return (traced){z, cabs(z) + a.size / argument, a.slope / argument / scale};
}

static traced trace_node(const expression_node *node, traced a, traced b)
{
    double complex z;
    switch (node->kind) {
    case EXPRESSION_NUMBER:   return (traced){node->value, fabs(node->value), 0};
    case EXPRESSION_ADD:      return (traced){a.z + b.z, a.size + b.size, a.slope + b.slope};
    case EXPRESSION_SUBTRACT: return (traced){a.z - b.z, a.size + b.size, a.slope + b.slope};
    case EXPRESSION_MULTIPLY: return trace_product(a, b);
    case EXPRESSION_DIVIDE:   return trace_quotient(a, b);
    case EXPRESSION_NEGATE:   return (traced){-a.z, a.size, a.slope};
    case EXPRESSION_POWER:    return trace_power(a, b);
    case EXPRESSION_EXP:      z = cexp(a.z); return (traced){z, cabs(z) * (1 + a.size), cabs(z) * (1 + a.size) * a.slope};
    case EXPRESSION_LN:       return trace_logarithm(a, 1);
    case EXPRESSION_LOG10:    return trace_logarithm(a, log(10));
    default:                  ck_abort_msg("a rate law has no node of kind %d", (int)node->kind);
    }
    return a;
}

/* All nodes at (x, k), with a step in one of them: leaf kind and index. */
static void trace_graph(const lb_network *net, const double *x, const double *k, expression_kind leaf, int index,
                        traced *values)
{
    for (size_t e = 0; e < net->graph.count; e++) {
        const expression_node *node = &net->graph.nodes[e];
        if (node->kind == EXPRESSION_STATE || node->kind == EXPRESSION_CONSTANT) {
            double value = node->kind == EXPRESSION_STATE ? x[node->left] : k[node->left];
            bool is_turned = node->kind == leaf && node->left == index;
            values[e] = (traced){value + (is_turned ? STEP * I : 0), fabs(value), is_turned};
        } else if (node->kind == EXPRESSION_NUMBER) {
            values[e] = trace_node(node, (traced){0, 0, 0}, (traced){0, 0, 0});
        } else {
            values[e] = trace_node(node, values[node->left], values[node->right >= 0 ? node->right : node->left]);
        }
    }
}

static traced trace_coefficient(const network_entry *entry, const traced *values)
{
    if (entry->expression != EXPRESSION_NONE)
        return values[entry->expression];
    double value = (double)entry->num / (double)entry->den;
    return (traced){value, fabs(value), 0};
}

/* dx/dt and its derivative in the turned direction, [n]. */
static void trace_rhs(const lb_network *net, const traced *values, traced *dxdt)
{
    memset(dxdt, 0, (size_t)net->states * sizeof *dxdt);
    for (int s = 0; s < net->step_count; s++) {
        const network_step *step = &net->steps[s];
        for (int e = 0; e < step->entry_count; e++) {
            traced term = trace_product(trace_coefficient(&step->entries[e], values), values[step->rate]);
            traced *sum = &dxdt[step->entries[e].state];
            *sum = (traced){sum->z + term.z, sum->size + term.size, sum->slope + term.slope};
        }
    }
}

/* ---- One network --------------------------------------------------------------------- */

/* What one engine says at a point. */
typedef struct answers {
    double *v, *dxdt, *J, *sparse, *D;
} answers;

typedef struct bench {
    lb_network *net;
    lb_system *system;
    lb_evaluator *evaluator;
    int n, m, r, z;
    const int *column_start, *row;
    double *x, *k;
    answers table, emitted;
} bench;

static answers answers_new(const bench *b)
{
    size_t n = (size_t)b->n, m = (size_t)b->m;
    return (answers){calloc((size_t)b->r + 1, sizeof(double)), calloc(n, sizeof(double)),
                     calloc(n * n, sizeof(double)), calloc((size_t)b->z + 1, sizeof(double)),
                     calloc(n * m + 1, sizeof(double))};
}

static void answers_free(answers *a)
{
    free(a->v);
    free(a->dxdt);
    free(a->J);
    free(a->sparse);
    free(a->D);
}

static bench bench_new(lb_network *net)
{
    bench b = {.net = net};
    lb_error err = {.code = LB_OK};
    ck_assert(net != NULL);
    ck_assert_msg(lb_system_new(net, &b.system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_evaluator_new(b.system, &b.evaluator, &err) == LB_OK, "%s", err.message);
    b.n = lb_network_states(net);
    b.m = lb_network_constants(net);
    b.r = lb_network_steps(net);
    b.z = lb_system_nonzeros(b.system);
    b.column_start = lb_system_column_start(b.system);
    b.row = lb_system_rows(b.system);
    b.x = calloc((size_t)b.n, sizeof(double));
    b.k = calloc((size_t)b.m + 1, sizeof(double));
    for (int i = 0; i < b.m; i++)
        b.k[i] = lb_network_default(net, i);
    ck_assert_msg(lb_evaluator_bind(b.evaluator, b.k, &err) == LB_OK, "%s", err.message);
    b.table = answers_new(&b);
    b.emitted = answers_new(&b);
    return b;
}

static void bench_free(bench *b)
{
    answers_free(&b->table);
    answers_free(&b->emitted);
    free(b->x);
    free(b->k);
    lb_evaluator_free(b->evaluator);
    lb_system_free(b->system);
    lb_network_free(b->net);
}

static void ask_both(bench *b, const emitted_model *model)
{
    lb_rates(b->evaluator, b->x, b->table.v);
    lb_rhs(b->evaluator, b->x, b->table.dxdt);
    lb_jacobian(b->evaluator, b->x, b->table.J);
    lb_jacobian_sparse(b->evaluator, b->x, b->table.sparse);
    lb_dfdk(b->evaluator, b->x, b->table.D);
    model->rates(0, b->x, b->k, b->emitted.v);
    model->rhs(0, b->x, b->k, b->emitted.dxdt);
    model->jacobian(0, b->x, b->k, b->emitted.J);
    model->jacobian_sparse(0, b->x, b->k, b->emitted.sparse);
    model->dfdk(0, b->x, b->k, b->emitted.D);
}

static void compare(const char *what, int network, int i, int j, double got, double want, double magnitude)
{
    ck_assert_msg(fabs(got - want) <= TOLERANCE * magnitude,
                  "network %d, %s (%d, %d): %.17g, by complex step %.17g, magnitude %g", network, what, i, j, got,
                  want, magnitude);
}

static void check_pattern(const bench *b, const emitted_model *model)
{
    ck_assert_mem_eq(model->column_start, b->column_start, ((size_t)b->n + 1) * sizeof(int));
    if (b->z > 0)
        ck_assert_mem_eq(model->row, b->row, (size_t)b->z * sizeof(int));
}

static void check_values(const bench *b, int network, const traced *values, const traced *dxdt)
{
    for (int s = 0; s < b->r; s++) {
        traced rate = values[b->net->steps[s].rate];
        compare("rate of the table", network, s, 0, b->table.v[s], creal(rate.z), rate.size);
        compare("emitted rate", network, s, 0, b->emitted.v[s], creal(rate.z), rate.size);
    }
    for (int i = 0; i < b->n; i++) {
        compare("dx/dt of the table", network, i, 0, b->table.dxdt[i], creal(dxdt[i].z), dxdt[i].size);
        compare("emitted dx/dt", network, i, 0, b->emitted.dxdt[i], creal(dxdt[i].z), dxdt[i].size);
    }
}

/* Column j of both Jacobians and of both sparse ones. */
static void check_column(const bench *b, int network, int j, const traced *dxdt)
{
    int p = b->column_start[j];
    for (int i = 0; i < b->n; i++) {
        double want = cimag(dxdt[i].z) / STEP, magnitude = dxdt[i].slope;
        size_t place = (size_t)i + (size_t)j * (size_t)b->n;
        compare("Jacobian of the table", network, i, j, b->table.J[place], want, magnitude);
        compare("emitted Jacobian", network, i, j, b->emitted.J[place], want, magnitude);
        bool is_entry = p < b->column_start[j + 1] && b->row[p] == i;
        if (is_entry) {
            compare("sparse Jacobian of the table", network, i, j, b->table.sparse[p], want, magnitude);
            compare("emitted sparse Jacobian", network, i, j, b->emitted.sparse[p], want, magnitude);
            p++;
        } else {
            compare("entry outside the pattern", network, i, j, 0, want, 0);
        }
    }
    ck_assert_int_eq(p, b->column_start[j + 1]);
}

static void check_constant(const bench *b, int network, int c, const traced *dxdt)
{
    for (int i = 0; i < b->n; i++) {
        size_t place = (size_t)i + (size_t)c * (size_t)b->n;
        double want = cimag(dxdt[i].z) / STEP;
        compare("df/dk of the table", network, i, c, b->table.D[place], want, dxdt[i].slope);
        compare("emitted df/dk", network, i, c, b->emitted.D[place], want, dxdt[i].slope);
    }
}

static void check_network(bench *b, const emitted_model *model, int network)
{
    traced *values = calloc(b->net->graph.count, sizeof *values), *dxdt = calloc((size_t)b->n, sizeof *dxdt);
    random_state((uint64_t)network, b->n, b->x);
    ask_both(b, model);
    check_pattern(b, model);
    for (int j = 0; j < b->n; j++) {
        trace_graph(b->net, b->x, b->k, EXPRESSION_STATE, j, values);
        trace_rhs(b->net, values, dxdt);
        check_column(b, network, j, dxdt);
    }
    check_values(b, network, values, dxdt);
    for (int c = 0; c < b->m; c++) {
        trace_graph(b->net, b->x, b->k, EXPRESSION_CONSTANT, c, values);
        trace_rhs(b->net, values, dxdt);
        check_constant(b, network, c, dxdt);
    }
    free(values);
    free(dxdt);
}

/* Both give a number or both give none, and numbers agree to rounding. */
static void compare_engines(const char *what, int network, const double *table, const double *emitted, size_t count)
{
    double scale = 0;
    for (size_t i = 0; i < count; i++)
        if (isfinite(table[i]) && fabs(table[i]) > scale)
            scale = fabs(table[i]);
    for (size_t i = 0; i < count; i++) {
        bool agree = isfinite(table[i]) ? fabs(table[i] - emitted[i]) <= TOLERANCE * scale : !isfinite(emitted[i]);
        ck_assert_msg(agree, "network %d, %s %zu: table %.17g, emitted %.17g", network, what, i, table[i], emitted[i]);
    }
}

static void check_outside(bench *b, const emitted_model *model, int network)
{
    random_state((uint64_t)network + 1000, b->n, b->x);
    for (int i = 0; i < b->n; i++)
        b->x[i] *= (i + network) % 3 == 0 ? 0 : (i + network) % 3 == 1 ? -0.01 : 1;
    ask_both(b, model);
    size_t n = (size_t)b->n;
    compare_engines("rate", network, b->table.v, b->emitted.v, (size_t)b->r);
    compare_engines("dx/dt", network, b->table.dxdt, b->emitted.dxdt, n);
    compare_engines("Jacobian", network, b->table.J, b->emitted.J, n * n);
    compare_engines("sparse Jacobian", network, b->table.sparse, b->emitted.sparse, (size_t)b->z);
    compare_engines("df/dk", network, b->table.D, b->emitted.D, n * (size_t)b->m);
}

/* ---- Tests ------------------------------------------------------------------------------- */

/* lines: 1 has every function run over tables. */
static void load_batch(emitted_folder *folder, int first, size_t lines)
{
    for (int i = first; i < first + BATCH; i++) {
        char name[32];
        snprintf(name, sizeof name, "m%d", i);
        lb_network *net = random_network((uint64_t)i);
        ck_assert(net != NULL);
        emitted_write_as(folder, net, &(lb_emit_options){.name = name, .lines = lines});
        lb_network_free(net);
    }
    emitted_load(folder, "-O0");
}

static void compare_batch(int first, size_t lines)
{
    emitted_folder folder = emitted_begin();
    load_batch(&folder, first, lines);
    for (int i = first; i < first + BATCH; i++) {
        char name[32];
        snprintf(name, sizeof name, "m%d", i);
        emitted_model model = emitted_find(&folder, name);
        bench b = bench_new(random_network((uint64_t)i));
        check_network(&b, &model, i);
        check_outside(&b, &model, i);
        bench_free(&b);
    }
    emitted_end(&folder);
}

START_TEST(test_tables_and_emitted_c_agree_with_complex_steps)
{
    compare_batch(_i * BATCH, 0);
}
END_TEST

START_TEST(test_emitted_loops_agree_with_complex_steps)
{
    compare_batch(_i * BATCH, 1);
}
END_TEST

/* More steps than one function holds, at every level of grouping. */
START_TEST(test_large_emitted_networks_agree_with_tables)
{
    emitted_folder folder = emitted_begin();
    lb_network *net = random_mass_action(7, 700, 1500);
    emitted_write_as(&folder, net, &(lb_emit_options){.name = "large", .lines = _i ? 0 : 1000000});
    emitted_load(&folder, "-O0");
    emitted_model model = emitted_find(&folder, "large");
    bench b = bench_new(net);
    random_state(7, b.n, b.x);
    ask_both(&b, &model);
    check_pattern(&b, &model);
    compare_engines("rate", 7, b.table.v, b.emitted.v, (size_t)b.r);
    compare_engines("dx/dt", 7, b.table.dxdt, b.emitted.dxdt, (size_t)b.n);
    compare_engines("Jacobian", 7, b.table.J, b.emitted.J, (size_t)b.n * (size_t)b.n);
    compare_engines("sparse Jacobian", 7, b.table.sparse, b.emitted.sparse, (size_t)b.z);
    compare_engines("df/dk", 7, b.table.D, b.emitted.D, (size_t)b.n * (size_t)b.m);
    bench_free(&b);
    emitted_end(&folder);
}
END_TEST

/* The generator must make what the claims are about. */
START_TEST(test_random_networks_have_every_kind_of_rate)
{
    int power_laws = 0, mass_actions = 0, laws = 0, tanks = 0, expressions = 0, halves = 0;
    for (uint64_t seed = 0; seed < NETWORKS; seed++) {
        lb_network *net = random_network(seed);
        ck_assert(net != NULL);
        tanks += net->is_tank;
        for (int s = 0; s < net->reaction_steps; s++) {
            const network_step *step = &net->steps[s];
            mass_actions += step->is_mass_action;
            power_laws += step->is_power_law && !step->is_mass_action;
            laws += !step->is_power_law;
            for (int e = 0; e < step->entry_count; e++) {
                expressions += step->entries[e].expression != EXPRESSION_NONE;
                halves += step->entries[e].den == 2;
            }
        }
        lb_network_free(net);
    }
    ck_assert_int_gt(mass_actions, 1000);
    ck_assert_int_gt(power_laws, 200);
    ck_assert_int_gt(laws, 500);
    ck_assert_int_gt(tanks, 50);
    ck_assert_int_gt(expressions, 200);
    ck_assert_int_gt(halves, 200);
}
END_TEST

Suite *derivatives_suite(void)
{
    Suite *suite = suite_create("derivatives");
    TCase *tcase = tcase_create("complex step");
    tcase_set_timeout(tcase, 300);
    tcase_add_test(tcase, test_random_networks_have_every_kind_of_rate);
    tcase_add_loop_test(tcase, test_tables_and_emitted_c_agree_with_complex_steps, 0, NETWORKS / BATCH);
    tcase_add_loop_test(tcase, test_emitted_loops_agree_with_complex_steps, 0, NETWORKS / BATCH);
    tcase_add_loop_test(tcase, test_large_emitted_networks_agree_with_tables, 0, 2);
    suite_add_tcase(suite, tcase);
    return suite;
}
