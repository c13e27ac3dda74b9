/* Ratios between things timed in one run: minima of interleaved repeats.
 *
 *   bench FOLDER     FOLDER takes the emitted C and its compiled form
 *
 * Right-hand side and Jacobian: the table engine against the emitted straight-line
 * C, compiled by cc -O2, on random mass-action networks.  Integration: `run`'s
 * integrator against a bare loop of GSL's rk8pd at the same tolerance. */
#include <dlfcn.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "limbeck.h"
#include "timing.h"

enum { REPEATS = 15 };

static unsigned long long random_state = 12345;

static int random_below(int limit)
{
    random_state = random_state * 6364136223846793005ULL + 1442695040888963407ULL;
    return (int)((random_state >> 33) % (unsigned)limit);
}

/* Text of a mass-action network: about three reactions per species, up to two
 * molecules on a side. */
static char *network_text(int species, int reactions)
{
    size_t room = (size_t)reactions * 96 + 64, used = 0;
    char *text = malloc(room);
    if (!text)
        fail("no memory");
    used += (size_t)snprintf(text, room, "units none\n");
    for (int i = 0; i < reactions; i++) {
        int a = i < species ? i : random_below(species), b = random_below(species);
        int c = random_below(species), d = random_below(species);
        used += (size_t)snprintf(text + used, room - used, i % 2 ? "S%d + S%d -> S%d + S%d, k = 0.%d\n"
                                 : "S%d + S%d -> S%d + 2 S%d, k = 0.%d\n", a, b, c, d, 1 + random_below(99));
    }
    return text;
}

static lb_network *parse(const char *text)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    lb_error err;
    if (lb_network_parse("bench.mech", text, strlen(text), NULL, 0, &net, &list, &err) != LB_OK)
        fail("a mechanism does not parse");
    lb_diagnostics_free(list);
    return net;
}

typedef void emitted_function(double t, const double *x, const double *k, double *out);

struct emitted {
    void *handle;
    emitted_function *rhs, *jacobian;
};

static void write_file(const char *path, const lb_text *text)
{
    size_t length;
    const char *bytes = lb_text_get(text, &length);
    FILE *file = fopen(path, "wb");
    if (!file || fwrite(bytes, 1, length, file) != length || fclose(file) != 0)
        fail("cannot write the emitted C");
}

/* Emit, compile and load.  (dlsym gives a void pointer; the copy through memcpy
 * is what POSIX asks for.) */
static struct emitted compile(const lb_network *net, const char *folder)
{
    char command[1024], path[512];
    lb_text *header = lb_text_new(), *source = lb_text_new();
    if (lb_emit(net, &(lb_emit_options){.name = "bench"}, header, source, NULL) != LB_OK)
        fail("emit failed");
    snprintf(path, sizeof path, "%s/bench.h", folder);
    write_file(path, header);
    snprintf(path, sizeof path, "%s/bench.c", folder);
    write_file(path, source);
    lb_text_free(header);
    lb_text_free(source);
    snprintf(command, sizeof command, "cc -std=c99 -O2 -ffp-contract=off -shared -fPIC -o %s/bench.so %s/bench.c -lm",
             folder, folder);
    if (system(command) != 0)
        fail("the emitted C does not compile");
    snprintf(path, sizeof path, "%s/bench.so", folder);
    struct emitted e = {.handle = dlopen(path, RTLD_NOW | RTLD_LOCAL)};
    void *rhs = e.handle ? dlsym(e.handle, "bench_rhs") : NULL;
    void *jacobian = e.handle ? dlsym(e.handle, "bench_jacobian_sparse") : NULL;
    if (!rhs || !jacobian)
        fail("the emitted C does not load");
    memcpy(&e.rhs, &rhs, sizeof rhs);
    memcpy(&e.jacobian, &jacobian, sizeof jacobian);
    return e;
}

static void bench_tables(int species, const char *folder, double target)
{
    char *text = network_text(species, 3 * species), name[80];
    lb_network *net = parse(text);
    lb_system *sys = NULL;
    lb_evaluator *ev = NULL;
    if (lb_system_new(net, &sys, NULL) != LB_OK || lb_evaluator_new(sys, &ev, NULL) != LB_OK)
        fail("no system");
    struct emitted e = compile(net, folder);
    int n = lb_network_states(net), m = lb_network_constants(net), z = lb_system_nonzeros(sys);
    double *x = malloc((size_t)(n + m + n + z) * sizeof *x), *k = x + n, *f = k + m, *J = f + n;
    if (!x)
        fail("no memory");
    for (int i = 0; i < n; i++)
        x[i] = 0.1 + 0.01 * random_below(100);
    for (int i = 0; i < m; i++)
        k[i] = lb_network_default(net, i);
    long calls = 2000000 / species;
    double best[4] = {INFINITY, INFINITY, INFINITY, INFINITY};
    for (int repeat = 0; repeat < REPEATS; repeat++)
        for (int what = 0; what < 4; what++) {
            double start = now();
            for (long c = 0; c < calls; c++) {
                if (what == 0) lb_rhs(ev, x, f);
                else if (what == 1) e.rhs(0, x, k, f);
                else if (what == 2) lb_jacobian_sparse(ev, x, J);
                else e.jacobian(0, x, k, J);
            }
            double each = (now() - start) / (double)calls * 1e9;
            if (each < best[what])
                best[what] = each;
        }
    snprintf(name, sizeof name, "right-hand side, %d species: tables / emitted C", species);
    row(name, best[0], best[1], "ns", target);
    snprintf(name, sizeof name, "sparse Jacobian, %d species: tables / emitted C", species);
    row(name, best[2], best[3], "ns", 0);
    dlclose(e.handle);
    free(x);
    free(text);
    lb_evaluator_free(ev);
    lb_system_free(sys);
    lb_network_free(net);
}

static int brusselator(double t, const double x[], double f[], void *context)
{
    (void)t, (void)context;
    double r = x[0] * x[0] * x[1];
    f[0] = 1 + r - 3 * x[0] - x[0];
    f[1] = 3 * x[0] - r;
    return GSL_SUCCESS;
}

static double bare_rk8pd(double until, double tolerance, double *x)
{
    gsl_odeiv2_system system = {brusselator, NULL, 2, NULL};
    gsl_odeiv2_driver *driver = gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rk8pd, 1e-3, tolerance, tolerance);
    if (!driver)
        fail("no memory");
    double t = 0, start = now();
    x[0] = 1.2, x[1] = 3;
    if (gsl_odeiv2_driver_apply(driver, &t, until, x) != GSL_SUCCESS)
        fail("rk8pd failed");
    double seconds = now() - start;
    gsl_odeiv2_driver_free(driver);
    return seconds;
}

static void bench_integration(void)
{
    lb_network *net = parse("units none\n[A] = 1\n[B] = 3\n[X]0 = 1.2\n[Y]0 = 3\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
                            "B + X -> Y + D, k = 1\nX -> E, k = 1\n[D] = 0\n[E] = 0\n");
    lb_system *sys = NULL;
    if (lb_system_new(net, &sys, NULL) != LB_OK)
        fail("no system");
    double ours = INFINITY, bare = INFINITY, x[2] = {0, 0}, end = 0;
    const double until = 1000, tolerance = 1e-8;
    for (int repeat = 0; repeat < REPEATS; repeat++) {
        lb_run *run = NULL;
        double start = now();
        if (lb_run_solve(sys, &(lb_run_options){.until = until, .every = until, .tolerance = tolerance}, &run, NULL) != LB_OK)
            fail("run failed");
        ours = fmin(ours, now() - start);
        end = run->x[(run->rows - 1) * (size_t)run->states];
        lb_run_free(run);
        bare = fmin(bare, bare_rk8pd(until, tolerance, x));
    }
    row("Brusselator to t = 1000: run / bare rk8pd", ours * 1e3, bare * 1e3, "ms", 1.1);
    printf("    end value of X: run %.12g, bare rk8pd %.12g\n", end, x[0]);
    lb_system_free(sys);
    lb_network_free(net);
}

int main(int argc, char **argv)
{
    if (argc != 2)
        fail("usage: bench FOLDER");
    gsl_set_error_handler_off();
    printf("%-52s %10s %10s\n", "", "first", "second");
    bench_tables(2, argv[1], 0);
    bench_tables(20, argv[1], 5);
    bench_tables(1000, argv[1], 3);
    bench_integration();
    return 0;
}
