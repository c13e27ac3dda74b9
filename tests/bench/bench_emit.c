/* Emitted C against hand-written C: ratios of minima of interleaved repeats in one run.
 *
 *   bench_emit FOLDER     FOLDER takes the emitted C and its compiled form
 *
 * Right-hand side and Jacobian of three published models, written out by hand
 * (handwritten.h), and of random networks, whose rival is a loop over packed arrays.
 * Both sides are compiled with the same options, called through pointers, and must
 * agree to rounding.  Then lines against tables by size, with the time that compiling
 * takes: where the choice between them (docs/emitted-code.md) comes from. */
#include <dlfcn.h>
#include <gsl/gsl_errno.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#include "handwritten.h"
#include "limbeck.h"
#include "timing.h"

enum { REPEATS = 25 };

typedef void function(double t, const double *x, const double *k, double *out);

/* ---- Emitted C ---------------------------------------------------------------------- */

struct emitted {
    void *handle;
    function *rhs, *jacobian, *sparse;
    double compile_seconds;
};

static void write_file(const char *path, const lb_text *text)
{
    size_t length;
    const char *bytes = lb_text_get(text, &length);
    FILE *file = fopen(path, "wb");
    if (!file || fwrite(bytes, 1, length, file) != length || fclose(file) != 0)
        fail("cannot write the emitted C");
}

static function *find(void *handle, const char *name)
{
    void *address = handle ? dlsym(handle, name) : NULL;
    function *result;
    if (!address)
        fail("the emitted C does not load");
    memcpy(&result, &address, sizeof result);
    return result;
}

static struct emitted compile(const lb_network *net, const char *folder, size_t lines)
{
    static int number;
    char command[2048], path[512];
    lb_text *header = lb_text_new(), *source = lb_text_new();
    if (lb_emit(net, &(lb_emit_options){.name = "emitted", .lines = lines}, header, source, NULL) != LB_OK)
        fail("emit failed");
    snprintf(path, sizeof path, "%s/emitted.h", folder);
    write_file(path, header);
    snprintf(path, sizeof path, "%s/emitted.c", folder);
    write_file(path, source);
    lb_text_free(header);
    lb_text_free(source);
    snprintf(path, sizeof path, "%s/emitted_%d.so", folder, ++number);
    snprintf(command, sizeof command, "cc -std=c99 -O2 -ffp-contract=off -shared -fPIC -o %s %s/emitted.c -lm", path, folder);
    struct emitted e = {.compile_seconds = now()};
    if (system(command) != 0)
        fail("the emitted C does not compile");
    e.compile_seconds = now() - e.compile_seconds;
    e.handle = dlopen(path, RTLD_NOW | RTLD_LOCAL);
    e.rhs = find(e.handle, "emitted_rhs");
    e.jacobian = find(e.handle, "emitted_jacobian");
    e.sparse = find(e.handle, "emitted_jacobian_sparse");
    return e;
}

/* ---- Two functions against each other --------------------------------------------------- */

static double time_calls(function *f, long calls, const double *x, const double *k, double *out)
{
    double start = now();
    for (long c = 0; c < calls; c++)
        f(0, x, k, out);
    return (now() - start) / (double)calls * 1e9;
}

/* Rounding, in the largest value. */
static void must_agree(const double *a, const double *b, size_t count, const char *what)
{
    double scale = 0;
    for (size_t i = 0; i < count; i++)
        scale = fmax(scale, fabs(b[i]));
    for (size_t i = 0; i < count; i++)
        if (!(fabs(a[i] - b[i]) <= 1e-12 * scale))
            fail(what);
}

/* What both are called with. */
struct point {
    int n, m;
    double *x, *k;
};

static struct point point_new(const lb_network *net)
{
    struct point p = {.n = lb_network_states(net), .m = lb_network_constants(net)};
    p.x = must(malloc((size_t)p.n * sizeof *p.x));
    p.k = must(malloc((size_t)p.m * sizeof *p.k));
    for (int i = 0; i < p.n; i++)
        p.x[i] = 0.1 + 0.01 * (i * 37 % 100);
    for (int i = 0; i < p.m; i++)
        p.k[i] = lb_network_default(net, i);
    return p;
}

static void point_free(struct point *p)
{
    free(p->x);
    free(p->k);
}

/* The better of two, in nanoseconds a call: best[0] of ours, best[1] of theirs. */
static void compare(function *ours, function *theirs, const struct point *p, size_t count, const char *what, double best[2])
{
    double *out[2] = {must(malloc(count * sizeof(double))), must(malloc(count * sizeof(double)))};
    function *f[2] = {ours, theirs};
    for (int i = 0; i < 2; i++)
        f[i](0, p->x, p->k, out[i]);
    must_agree(out[0], out[1], count, what);
    long calls = (long)(2e6 / time_calls(theirs, 10, p->x, p->k, out[1])) + 1;
    best[0] = best[1] = INFINITY;
    for (int repeat = 0; repeat < REPEATS; repeat++)
        for (int i = 0; i < 2; i++)
            best[i] = fmin(best[i], time_calls(f[i], calls, p->x, p->k, out[i]));
    free(out[0]);
    free(out[1]);
}

static void compare_row(function *ours, function *theirs, const struct point *p, size_t count, const char *what, double target)
{
    double best[2];
    compare(ours, theirs, p, count, what, best);
    row(what, best[0], best[1], "ns", target);
}

/* ---- Models written out by hand ----------------------------------------------------------- */

static lb_network *read_network(const char *path)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    if (lb_network_read(path, NULL, 0, &net, &list, NULL) != LB_OK)
        fail("a mechanism cannot be read");
    lb_diagnostics_free(list);
    return net;
}

static void bench_model(const char *file, const char *title, function *rhs, function *jacobian, const char *folder)
{
    char name[80];
    lb_network *net = read_network(file);
    struct emitted e = compile(net, folder, 0);
    struct point p = point_new(net);
    size_t n = (size_t)p.n;
    snprintf(name, sizeof name, "%s, right-hand side: emitted / by hand", title);
    compare_row(e.rhs, rhs, &p, n, name, 1.1);
    snprintf(name, sizeof name, "%s, Jacobian: emitted / by hand", title);
    compare_row(e.jacobian, jacobian, &p, n * n, name, 1.1);
    dlclose(e.handle);
    point_free(&p);
    lb_network_free(net);
}

/* ---- Random networks ------------------------------------------------------------------------ */

static unsigned long long random_number = 12345;

static int random_below(int limit)
{
    random_number = random_number * 6364136223846793005ULL + 1442695040888963407ULL;
    return (int)((random_number >> 33) % (unsigned)limit);
}

static int state_of(const lb_network *net, int species)
{
    char name[32];
    snprintf(name, sizeof name, "S%d", species);
    return lb_network_find_state(net, name);
}

static int place_of(const lb_system *system, int row_number, int column)
{
    const int *start = lb_system_column_start(system), *rows = lb_system_rows(system);
    for (int p = start[column]; p < start[column + 1]; p++)
        if (rows[p] == row_number)
            return p;
    fail("an entry is not in the pattern");
    return -1;
}

static void packed_allocate(int reactions)
{
    network.reactions = reactions;
    network.a = must(malloc((size_t)reactions * 12 * sizeof(int)));
    network.b = network.a + reactions;
    network.c = network.b + reactions;
    network.d = network.c + reactions;
    network.place = network.d + reactions;
    network.w = must(malloc((size_t)reactions * sizeof(double)));
}

/* S1 + S5 -> S7 + 2 S3: reactants differ, so do products and reactants. */
static lb_network *random_network(int species, int reactions)
{
    size_t room = (size_t)reactions * 96 + 64, used = 0;
    char *text = must(malloc(room));
    int *four = must(malloc((size_t)reactions * 4 * sizeof *four));
    packed_allocate(reactions);
    used += (size_t)snprintf(text, room, "units none\n");
    for (int i = 0; i < reactions; i++) {
        int *s = &four[4 * i];
        s[0] = i < species ? i : random_below(species);
        for (int j = 1; j < 4; j++)
            do
                s[j] = random_below(species);
            while (s[j] == s[0] || (j > 1 && s[j] == s[1]) || (j > 2 && s[j] == s[2]));
        network.w[i] = 1 + i % 2;
        used += (size_t)snprintf(text + used, room - used, "S%d + S%d -> S%d + %d S%d, k = 0.%d\n", s[0], s[1], s[2],
                                 1 + i % 2, s[3], 1 + random_below(98));
    }
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    if (lb_network_parse("random.mech", text, used, NULL, 0, &net, &list, NULL) != LB_OK)
        fail("a mechanism does not parse");
    for (int i = 0; i < reactions; i++) {
        network.a[i] = state_of(net, four[4 * i]);
        network.b[i] = state_of(net, four[4 * i + 1]);
        network.c[i] = state_of(net, four[4 * i + 2]);
        network.d[i] = state_of(net, four[4 * i + 3]);
    }
    lb_diagnostics_free(list);
    free(text);
    free(four);
    return net;
}

static void find_places(const lb_network *net)
{
    lb_system *system = NULL;
    if (lb_system_new(net, &system, NULL) != LB_OK)
        fail("no system");
    for (int i = 0; i < network.reactions; i++) {
        int touched[4] = {network.a[i], network.b[i], network.c[i], network.d[i]};
        for (int j = 0; j < 4; j++) {
            network.place[8 * i + j] = place_of(system, touched[j], network.a[i]);
            network.place[8 * i + 4 + j] = place_of(system, touched[j], network.b[i]);
        }
    }
    network.states = lb_network_states(net);
    network.nonzeros = lb_system_nonzeros(system);
    lb_system_free(system);
}

static void network_end(lb_network *net)
{
    free(network.a);
    free(network.w);
    lb_network_free(net);
}

static void bench_packed(int species, size_t lines, const char *form, const char *folder)
{
    char name[80];
    lb_network *net = random_network(species, 3 * species);
    find_places(net);
    struct emitted e = compile(net, folder, lines);
    struct point p = point_new(net);
    snprintf(name, sizeof name, "%d species, right-hand side: emitted %s / by hand", species, form);
    compare_row(e.rhs, packed_rhs, &p, (size_t)p.n, name, 1.1);
    snprintf(name, sizeof name, "%d species, sparse Jacobian: emitted %s / by hand", species, form);
    compare_row(e.sparse, packed_jacobian, &p, (size_t)network.nonzeros, name, 1.1);
    printf("    compiled in %.2f s\n", e.compile_seconds);
    dlclose(e.handle);
    point_free(&p);
    network_end(net);
}

static void bench_forms(int reactions, const char *folder)
{
    char name[80];
    lb_network *net = random_network(reactions / 3, reactions);
    find_places(net);
    struct emitted lines = compile(net, folder, SIZE_MAX), tables = compile(net, folder, 1);
    struct point p = point_new(net);
    snprintf(name, sizeof name, "%d reactions, right-hand side: lines / tables", reactions);
    compare_row(lines.rhs, tables.rhs, &p, (size_t)p.n, name, 0);
    snprintf(name, sizeof name, "%d reactions, sparse Jacobian: lines / tables", reactions);
    compare_row(lines.sparse, tables.sparse, &p, (size_t)network.nonzeros, name, 0);
    snprintf(name, sizeof name, "%d reactions, compiling: lines / tables", reactions);
    row(name, lines.compile_seconds, tables.compile_seconds, "s", 0);
    dlclose(lines.handle);
    dlclose(tables.handle);
    point_free(&p);
    network_end(net);
}

int main(int argc, char **argv)
{
    if (argc != 2)
        fail("usage: bench_emit FOLDER");
    gsl_set_error_handler_off();
    printf("%-58s %10s %10s\n", "", "first", "second");
    bench_model("networks/brusselator.mech", "Brusselator", brusselator_rhs, brusselator_jacobian, argv[1]);
    bench_model("networks/hires.mech", "HIRES", hires_rhs, hires_jacobian, argv[1]);
    bench_model("networks/pollu.mech", "POLLU", pollu_rhs, pollu_jacobian, argv[1]);
    bench_packed(1000, SIZE_MAX, "lines", argv[1]);
    bench_packed(1000, 0, "tables", argv[1]);
    bench_packed(10000, 0, "tables", argv[1]);
    for (int reactions = 30; reactions <= 300; reactions *= 10)
        bench_forms(reactions, argv[1]);
    return 0;
}
