/* Integration against CVODE and GSL's methods, at equal error.
 *
 *   bench_stiff FOLDER     (FOLDER is not used)
 *
 * Each code gets the loosest relative tolerance, in steps of 10^(1/4), with which its end
 * state is within 1e-5 of the reference (|error| over |value| + 1e-6 of the species'
 * peak, the worst species), and with that is timed in interleaved repeats; minima
 * count.  All use the same right-hand side and the same analytic Jacobian.  The
 * others' absolute tolerances are the relative one times 1e-3 or 1e-6 of each species' peak,
 * whichever is quicker.  References: published end values, or limbeck at a tight tolerance
 * with CVODE's difference shown. */
#include <cvode/cvode.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <nvector/nvector_serial.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sunlinsol/sunlinsol_dense.h>
#include <sunlinsol/sunlinsol_klu.h>
#include <sunmatrix/sunmatrix_dense.h>
#include <sunmatrix/sunmatrix_sparse.h>
#include <time.h>

#include "../stiff_problems.h"
#include "analysis/integrate.h"

#define WANTED_ERROR 1e-5

typedef struct problem {
    const char *name;
    lb_network *network;
    lb_system *system;
    lb_evaluator *evaluator;
    int n;
    double until;
    double *start, *reference, *peak, *end, *absolute;    /* [n] each */
} problem;

typedef bool solver(problem *p, double tolerance, double below_peak);

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void fail(const char *what)
{
    fprintf(stderr, "bench_stiff: %s\n", what);
    exit(1);
}

/* ---- The codes --------------------------------------------------------------------- */

static bool solve_limbeck(problem *p, double tolerance, double below_peak)
{
    integrator *it = NULL;
    (void)below_peak;
    if (integrator_new(p->evaluator, &(integrator_options){.tolerance = tolerance}, &it, NULL) != LB_OK)
        fail("no memory");
    integrator_start(it, 0, p->start);
    bool done = integrator_to(it, p->until, NULL) == LB_OK;
    memcpy(p->end, integrator_state(it), (size_t)p->n * sizeof *p->end);
    integrator_free(it);
    return done;
}

static void set_absolute(problem *p, double tolerance, double below_peak)
{
    for (int i = 0; i < p->n; i++)
        p->absolute[i] = tolerance * below_peak * p->peak[i] + 1e-200;
}

static int gsl_rhs(double t, const double x[], double f[], void *context)
{
    (void)t;
    lb_rhs(((problem *)context)->evaluator, x, f);
    return GSL_SUCCESS;
}

/* GSL's Jacobians are row-major. */
static int gsl_jacobian(double t, const double x[], double *dfdx, double dfdt[], void *context)
{
    problem *p = context;
    int n = p->n;
    (void)t;
    lb_jacobian(p->evaluator, x, dfdx);
    for (int i = 0; i < n; i++) {
        dfdt[i] = 0;
        for (int j = 0; j < i; j++) {
            double kept = dfdx[i * n + j];
            dfdx[i * n + j] = dfdx[j * n + i];
            dfdx[j * n + i] = kept;
        }
    }
    return GSL_SUCCESS;
}

static bool solve_gsl(problem *p, const gsl_odeiv2_step_type *type, double tolerance, double below_peak)
{
    gsl_odeiv2_system system = {gsl_rhs, gsl_jacobian, (size_t)p->n, p};
    set_absolute(p, 1, below_peak);
    gsl_odeiv2_driver *driver =
        gsl_odeiv2_driver_alloc_scaled_new(&system, type, 1e-9 * p->until, tolerance, tolerance, 1, 0, p->absolute);
    if (!driver)
        fail("no memory");
    double t = 0;
    memcpy(p->end, p->start, (size_t)p->n * sizeof *p->end);
    gsl_odeiv2_driver_set_nmax(driver, 200000);
    bool done = gsl_odeiv2_driver_apply(driver, &t, p->until, p->end) == GSL_SUCCESS;
    gsl_odeiv2_driver_free(driver);
    return done;
}

static bool solve_msbdf(problem *p, double tolerance, double below_peak)
{
    return solve_gsl(p, gsl_odeiv2_step_msbdf, tolerance, below_peak);
}

static bool solve_bsimp(problem *p, double tolerance, double below_peak)
{
    return solve_gsl(p, gsl_odeiv2_step_bsimp, tolerance, below_peak);
}

static bool solve_rk8pd(problem *p, double tolerance, double below_peak)
{
    return solve_gsl(p, gsl_odeiv2_step_rk8pd, tolerance, below_peak);
}

static int cvode_rhs(realtype t, N_Vector x, N_Vector f, void *context)
{
    (void)t;
    lb_rhs(((problem *)context)->evaluator, N_VGetArrayPointer(x), N_VGetArrayPointer(f));
    return 0;
}

static int cvode_jacobian(realtype t, N_Vector x, N_Vector f, SUNMatrix J, void *context, N_Vector a, N_Vector b,
                          N_Vector c)
{
    problem *p = context;
    (void)t, (void)f, (void)a, (void)b, (void)c;
    if (SUNMatGetID(J) == SUNMATRIX_DENSE) {
        lb_jacobian(p->evaluator, N_VGetArrayPointer(x), SUNDenseMatrix_Data(J));
        return 0;
    }
    const int *start = lb_system_column_start(p->system), *row = lb_system_rows(p->system);
    for (int j = 0; j <= p->n; j++)
        SUNSparseMatrix_IndexPointers(J)[j] = start[j];
    for (int e = 0; e < start[p->n]; e++)
        SUNSparseMatrix_IndexValues(J)[e] = row[e];
    lb_jacobian_sparse(p->evaluator, N_VGetArrayPointer(x), SUNSparseMatrix_Data(J));
    return 0;
}

static void silent(int code, const char *module, const char *function, char *message, void *context)
{
    (void)code, (void)module, (void)function, (void)message, (void)context;
}

static bool solve_cvode(problem *p, bool sparse, double tolerance, double below_peak)
{
    SUNContext context;
    SUNContext_Create(NULL, &context);
    set_absolute(p, tolerance, below_peak);
    N_Vector x = N_VMake_Serial(p->n, p->end, context), absolute = N_VMake_Serial(p->n, p->absolute, context);
    SUNMatrix J = sparse ? SUNSparseMatrix(p->n, p->n, lb_system_nonzeros(p->system), CSC_MAT, context)
                         : SUNDenseMatrix(p->n, p->n, context);
    SUNLinearSolver linear = sparse ? SUNLinSol_KLU(x, J, context) : SUNLinSol_Dense(x, J, context);
    if (sparse)
        SUNLinSol_KLUSetOrdering(linear, 0);    /* AMD, as limbeck: less fill here than its default */
    void *cvode = CVodeCreate(CV_BDF, context);
    realtype t = 0;
    memcpy(p->end, p->start, (size_t)p->n * sizeof *p->end);
    bool done = CVodeInit(cvode, cvode_rhs, 0, x) == 0 && CVodeSVtolerances(cvode, tolerance, absolute) == 0 &&
                CVodeSetErrHandlerFn(cvode, silent, NULL) == 0 && CVodeSetUserData(cvode, p) == 0 &&
                CVodeSetLinearSolver(cvode, linear, J) == 0 && CVodeSetJacFn(cvode, cvode_jacobian) == 0 &&
                CVodeSetMaxNumSteps(cvode, 1000000) == 0 && CVodeSetStopTime(cvode, p->until) == 0 &&
                CVode(cvode, p->until, x, &t, CV_NORMAL) >= 0;
    CVodeFree(&cvode);
    SUNLinSolFree(linear);
    SUNMatDestroy(J);
    N_VDestroy(absolute);
    N_VDestroy(x);
    SUNContext_Free(&context);
    return done;
}

static bool solve_cvode_dense(problem *p, double tolerance, double below_peak)
{
    return solve_cvode(p, false, tolerance, below_peak);
}

static bool solve_cvode_klu(problem *p, double tolerance, double below_peak)
{
    return solve_cvode(p, true, tolerance, below_peak);
}

/* ---- Equal error --------------------------------------------------------------------- */

static double error_of(const problem *p)
{
    double worst = 0;
    for (int i = 0; i < p->n; i++) {
        if (!isfinite(p->end[i]))
            return INFINITY;
        worst = fmax(worst, fabs(p->end[i] - p->reference[i]) / (fabs(p->reference[i]) + 1e-6 * p->peak[i]));
    }
    return worst;
}

typedef struct entry {
    const char *name;
    solver *solve;
    double tolerance, below_peak, seconds, error;
} entry;

/* The loosest tolerance that reaches the wanted error, and does so for two more steps to
 * tighter ones (an error may pass through zero by chance); false when there is none. */
static bool match(problem *p, entry *e, double below_peak)
{
    int good = 0;
    for (int k = 0; k <= 40; k++) {
        double tolerance = pow(10, -2 - 0.25 * k);
        good = e->solve(p, tolerance, below_peak) && error_of(p) <= WANTED_ERROR ? good + 1 : 0;
        if (good == 1) {
            e->tolerance = tolerance;
            e->below_peak = below_peak;
            e->error = error_of(p);
        }
        if (good == 3)
            return true;
    }
    return false;
}

static double timed(problem *p, entry *e)
{
    double start = now();
    e->solve(p, e->tolerance, e->below_peak);
    return now() - start;
}

/* First entry: limbeck. */
static void compare(problem *p, entry *entries, int count, double target, int repeats)
{
    for (int e = 0; e < count; e++) {
        entry other = entries[e];
        entries[e].seconds = INFINITY;
        if (match(p, &entries[e], 1e-3))
            entries[e].seconds = timed(p, &entries[e]);
        if (e > 0 && match(p, &other, 1e-6) && (other.seconds = timed(p, &other)) < entries[e].seconds)
            entries[e] = other;
    }
    for (int r = 0; r < repeats; r++)
        for (int e = 0; e < count; e++)
            if (isfinite(entries[e].seconds))
                entries[e].seconds = fmin(entries[e].seconds, timed(p, &entries[e]));
    int best = 1;
    for (int e = 2; e < count; e++)
        if (entries[e].seconds < entries[best].seconds)
            best = e;
    double ratio = entries[0].seconds / entries[best].seconds;
    printf("%-32s limbeck %9.4g ms, %-10s %9.4g ms  ratio %5.2f   target %.2f %s\n", p->name, entries[0].seconds * 1e3,
           entries[best].name, entries[best].seconds * 1e3, ratio, target, ratio <= target ? "met" : "MISSED");
    for (int e = 0; e < count; e++)
        printf("    %-10s tolerance %.1e  error %.1e  %.4g ms\n", entries[e].name, entries[e].tolerance,
               entries[e].error, entries[e].seconds * 1e3);
    fflush(stdout);
}

/* ---- Problems -------------------------------------------------------------------------- */

static problem problem_new(const char *name, const char *text, double until)
{
    problem p = {.name = name, .until = until};
    lb_diagnostics *list = NULL;
    if (lb_network_parse("bench.mech", text, strlen(text), NULL, 0, &p.network, &list, NULL) != LB_OK ||
        lb_system_new(p.network, &p.system, NULL) != LB_OK || lb_evaluator_new(p.system, &p.evaluator, NULL) != LB_OK)
        fail("a mechanism cannot be used");
    lb_diagnostics_free(list);
    p.n = lb_network_states(p.network);
    p.start = calloc(5 * (size_t)p.n, sizeof *p.start);
    if (!p.start)
        fail("no memory");
    p.reference = p.start + p.n, p.peak = p.reference + p.n, p.end = p.peak + p.n, p.absolute = p.end + p.n;
    lb_initial(p.evaluator, p.start);
    return p;
}

static void problem_free(problem *p)
{
    free(p->start);
    lb_evaluator_free(p->evaluator);
    lb_system_free(p->system);
    lb_network_free(p->network);
}

/* Peaks along the run, and the end as the reference. */
static void find_reference(problem *p, double tolerance, lb_method method)
{
    integrator *it = NULL;
    const integrator_options options = {.tolerance = tolerance, .method = method};
    if (integrator_new(p->evaluator, &options, &it, NULL) != LB_OK)
        fail("no memory");
    integrator_start(it, 0, p->start);
    memcpy(p->peak, p->start, (size_t)p->n * sizeof *p->peak);
    while (integrator_time(it) < p->until) {
        if (integrator_step(it, p->until, NULL) != LB_OK)
            fail("no reference");
        for (int i = 0; i < p->n; i++)
            p->peak[i] = fmax(p->peak[i], integrator_state(it)[i]);
    }
    memcpy(p->reference, integrator_state(it), (size_t)p->n * sizeof *p->reference);
    integrator_free(it);
}

static void bench_published(const stiff_problem *published)
{
    problem p = problem_new(published->name, published->text, published->until);
    find_reference(&p, 1e-10, LB_METHOD_STIFF);
    for (const stiff_end *end = published->end; end->species; end++)
        p.reference[lb_network_find_state(p.network, end->species)] = end->value;
    entry entries[] = {{.name = "limbeck", .solve = solve_limbeck}, {.name = "cvode", .solve = solve_cvode_dense},
                       {.name = "msbdf", .solve = solve_msbdf}, {.name = "bsimp", .solve = solve_bsimp}};
    compare(&p, entries, 4, 0.4, 20);
    problem_free(&p);
}

/* Not stiff: against GSL's rk8pd with its own driver. */
static void bench_brusselator(void)
{
    problem p = problem_new("Brusselator to t = 1000",
                            "units none\n[A] = 1\n[B] = 3\n[X]0 = 1.2\n[Y]0 = 3\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
                            "B + X -> Y + D, k = 1\nX -> E, k = 1\n[D] = 0\n[E] = 0\n", 1000);
    find_reference(&p, 1e-13, LB_METHOD_EXPLICIT);
    entry entries[] = {{.name = "limbeck", .solve = solve_limbeck}, {.name = "rk8pd", .solve = solve_rk8pd}};
    compare(&p, entries, 2, 1.1, 10);
    problem_free(&p);
}

static unsigned long long random_state = 12345;

static double random_number(void)
{
    random_state = random_state * 6364136223846793005ULL + 1442695040888963407ULL;
    return (double)(random_state >> 11) / 9007199254740992.0;
}

/* Exchange reactions A + B <-> C + D and A <-> C with rate constants over eight
 * decades; partners are anywhere, or at most `reach` places on.  Three one-way
 * reactions per species. */
static char *exchange_text(int species, int reach)
{
    size_t room = (size_t)species * 200 + 64, used = 0;
    char *text = malloc(room);
    if (!text)
        fail("no memory");
    random_state = 12345;
    used += (size_t)snprintf(text, room, "units none\n");
    for (int a = 0; a < species; a++) {
        int partner[3];
        for (int k = 0; k < 3; k++)
            partner[k] = (a + 1 + (int)(random_number() * (reach > 0 ? reach : species - 1))) % species;
        used += (size_t)snprintf(text + used, room - used, "[S%d]0 = %.3f\n", a, 0.1 + random_number());
        used += (size_t)snprintf(text + used, room - used, "S%d + S%d -> S%d + S%d, k = %.3g\n", a, partner[0], partner[1],
                                 partner[2], pow(10, 4 * random_number() - 2));
        used += (size_t)snprintf(text + used, room - used, "S%d <-> S%d, kf = %.3g, kr = %.3g\n", a, partner[1],
                                 pow(10, 8 * random_number() - 2), pow(10, 8 * random_number() - 2));
    }
    return text;
}

static void bench_random(const char *name, int species, int reach, double target, int repeats)
{
    char *text = exchange_text(species, reach);
    problem p = problem_new(name, text, 10);
    find_reference(&p, species > 500 && reach == 0 ? 1e-8 : 1e-10, LB_METHOD_STIFF);
    double check = species > 500 ? 1e-7 : 1e-9;
    solve_cvode_klu(&p, check, 1e-6);
    printf("    %s: CVODE at %.0e is %.1e from the reference\n", name, check, error_of(&p));
    entry entries[] = {{.name = "limbeck", .solve = solve_limbeck}, {.name = "cvode klu", .solve = solve_cvode_klu},
                       {.name = "cvode", .solve = solve_cvode_dense}, {.name = "msbdf", .solve = solve_msbdf}};
    compare(&p, entries, species <= 100 ? 4 : 2, target, repeats);
    problem_free(&p);
    free(text);
}

int main(void)
{
    gsl_set_error_handler_off();
    bench_brusselator();
    for (int i = 0; i < STIFF_PROBLEMS; i++)
        bench_published(&stiff_problems[i]);
    bench_random("100 species with fill", 100, 0, 0.4, 10);
    bench_random("1000 species with little fill", 1000, 4, 0.5, 5);
    bench_random("1000 species with much fill", 1000, 0, 1, 1);
    return 0;
}
