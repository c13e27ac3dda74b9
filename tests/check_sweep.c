/* Does the error fall with the tolerance?  Each problem from 1e-3 to 1e-12, with the method
 * that the tool chooses.
 *
 * Short: every third decade; with LB_TEST_LONG all.  LB_SWEEP_DATA=FILE appends the
 * errors to FILE, a line each: problem, tolerance, error, steps (docs/methods.md has the
 * plot). */
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/integrate.h"
#include "stiff_problems.h"
#include "support.h"

typedef struct sweep {
    const char *name, *text;
    double until;
    double growth;              /* how much larger than the tolerance the error may be */
    double floor;               /* rounding that no tolerance beats */
} sweep;

/* Without published ends the reference is the stiff method at 1e-13, a method that the
 * tool does not choose for them.  Floors: ROBER's is the rounding of a rate that is left
 * where terms of 0.04 A cancel, 0.04 t units of roundoff; the others' a rounding a
 * step, times what the flow makes of it.  An error of r per step over hundreds
 * of steps, in cycles a phase that drifts: 1e3 to 1e4. */
static const sweep sweeps[] = {
    {"ROBER", ROBER_TEXT, 1e11, 1e3, 0.04 * 1e11 * DBL_EPSILON / 2},
    {"HIRES", HIRES_TEXT, 321.8122, 1e3, 3e-12},
    {"OREGO", OREGO_TEXT, 360, 1e4, 1e-11},
    {"POLLU", POLLU_TEXT, 60, 1e3, 1e-12},
    {"decay", "units none\n[X]0 = 1\nX -> P, k = 1\n", 10, 1e2, 1e-13},
    {"Brusselator",
     "units none\n[A] = 1\n[B] = 3\n[X]0 = 1.2\n[Y]0 = 3\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
     "B + X -> Y + D, k = 1\nX -> E, k = 1\n[D] = 0\n[E] = 0\n", 100, 1e3, 1e-11},
    {"Lotka", "units none\n[X]0 = 2\n[Y]0 = 1\nX -> 2 X, k = 1\nX + Y -> 2 Y, k = 1\nY ->, k = 1\n", 100, 1e4, 1e-11},
    {"enzyme", "units none\n[E]0 = 1e-3\n[S]0 = 1\nE + S <-> C, kf = 1e6, kr = 1e3\nC -> E + P, k = 1e3\n", 0.9, 1e3, 1e-11},
};
enum { SWEEPS = sizeof sweeps / sizeof *sweeps };

typedef struct rig {
    lb_network *network;
    lb_system *system;
    lb_evaluator *evaluator;
    int n;
    double start[32], reference[32], end[32];
} rig;

static size_t integrate(rig *r, double until, double tolerance, lb_method method, double *end)
{
    integrator *it = NULL;
    lb_error err;
    const integrator_options options = {.tolerance = tolerance, .method = method};
    ck_assert_int_eq(integrator_new(r->evaluator, &options, &it, &err), LB_OK);
    integrator_start(it, 0, r->start);
    lb_status status = integrator_to(it, until, &err);
    ck_assert_msg(status == LB_OK, "%s", err.message);
    memcpy(end, integrator_state(it), (size_t)r->n * sizeof *end);
    size_t steps = integrator_steps(it);
    integrator_free(it);
    return steps;
}

static rig rig_new(const sweep *s)
{
    rig r = {.network = support_network(s->text)};
    ck_assert_int_eq(lb_system_new(r.network, &r.system, NULL), LB_OK);
    ck_assert_int_eq(lb_evaluator_new(r.system, &r.evaluator, NULL), LB_OK);
    r.n = lb_network_states(r.network);
    ck_assert_int_le(r.n, 32);
    lb_initial(r.evaluator, r.start);
    for (int p = 0; p < STIFF_PROBLEMS; p++)
        for (const stiff_end *e = stiff_problems[p].end; strcmp(stiff_problems[p].name, s->name) == 0 && e->species; e++)
            r.reference[lb_network_find_state(r.network, e->species)] = e->value;
    if (r.reference[0] == 0)
        integrate(&r, s->until, 1e-13, LB_METHOD_STIFF, r.reference);
    return r;
}

static void rig_free(rig *r)
{
    lb_evaluator_free(r->evaluator);
    lb_system_free(r->system);
    lb_network_free(r->network);
}

static void record(const sweep *s, double tolerance, double error, size_t steps)
{
    const char *path = getenv("LB_SWEEP_DATA");
    FILE *file = path ? fopen(path, "a") : NULL;
    if (!file)
        return;
    fprintf(file, "%s %.0e %.3e %zu\n", s->name, tolerance, error, steps);
    fclose(file);
}

/* Worst species, relative.  Over three decades of the tolerance the error falls by one at
 * least, until it is at the floor. */
START_TEST(test_the_error_falls_with_the_tolerance)
{
    const sweep *s = &sweeps[_i];
    const int stride = getenv("LB_TEST_LONG") ? 1 : 3;
    rig r = rig_new(s);
    double errors[13] = {0};
    for (int decade = 3; decade <= 12; decade += stride) {
        double tolerance = pow(10, -decade), error = 0;
        size_t steps = integrate(&r, s->until, tolerance, LB_METHOD_AUTO, r.end);
        for (int i = 0; i < r.n; i++)
            error = fmax(error, fabs(r.end[i] / r.reference[i] - 1));
        record(s, tolerance, error, steps);
        ck_assert_msg(error <= s->growth * tolerance + s->floor, "%s: %g at %g", s->name, error, tolerance);
        ck_assert_msg(decade < 6 || error <= fmax(0.1 * errors[decade - 3], s->floor), "%s: %g at %g, %g before", s->name,
                      error, tolerance, errors[decade - 3]);
        errors[decade] = error;
    }
    rig_free(&r);
}
END_TEST

Suite *sweep_suite(void)
{
    Suite *suite = suite_create("sweep");
    TCase *tolerances = tcase_create("tolerances");
    tcase_set_timeout(tolerances, 60);
    tcase_add_loop_test(tolerances, test_the_error_falls_with_the_tolerance, 0, SWEEPS);
    suite_add_tcase(suite, tolerances);
    return suite;
}
