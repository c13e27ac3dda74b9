/* Engines against each other: ratios of minima of interleaved repeats in one run.
 *
 *   bench_engine FOLDER     FOLDER takes the emitted C and its compiled form
 *
 * On random mass-action networks: tables with one set and with eight at once (time per
 * set) against the emitted C, compiled by cc -O2 and called once for each set; binding of
 * constants; and how long a large network takes from text to its first right-hand side. */
#include <dlfcn.h>
#include <gsl/gsl_errno.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "limbeck.h"
#include "timing.h"

enum { REPEATS = 25 };

static unsigned long long random_state = 12345;

static int random_below(int limit)
{
    random_state = random_state * 6364136223846793005ULL + 1442695040888963407ULL;
    return (int)((random_state >> 33) % (unsigned)limit);
}

/* ---- Networks --------------------------------------------------------------------- */

/* Text of a mass-action network, two molecules in and two or three out. */
static char *network_text(int species, int reactions)
{
    size_t room = (size_t)reactions * 96 + 64, used = 0;
    char *text = must(malloc(room));
    used += (size_t)snprintf(text, room, "units none\n[S0]0 = 1\n");
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
    if (lb_network_parse("bench.mech", text, strlen(text), NULL, 0, &net, &list, NULL) != LB_OK)
        fail("a mechanism does not parse");
    lb_diagnostics_free(list);
    return net;
}

/* ---- Emitted C ----------------------------------------------------------------------- */

typedef void emitted_function(double t, const double *x, const double *k, double *out);

typedef struct emitted {
    void *handle;
    emitted_function *rhs, *jacobian;
} emitted;

static void write_file(const char *path, const lb_text *text)
{
    size_t length;
    const char *bytes = lb_text_get(text, &length);
    FILE *file = fopen(path, "wb");
    if (!file || fwrite(bytes, 1, length, file) != length || fclose(file) != 0)
        fail("cannot write the emitted C");
}

/* Emit, compile and load. */
static emitted compile(const lb_network *net, const char *folder)
{
    char command[1024], path[512];
    lb_text *header = must(lb_text_new()), *source = must(lb_text_new());
    if (lb_emit(net, &(lb_emit_options){.name = "engine"}, header, source, NULL) != LB_OK)
        fail("emit failed");
    snprintf(path, sizeof path, "%s/engine.h", folder);
    write_file(path, header);
    snprintf(path, sizeof path, "%s/engine.c", folder);
    write_file(path, source);
    lb_text_free(header);
    lb_text_free(source);
    snprintf(command, sizeof command,
             "cc -std=c99 -O2 -ffp-contract=off -shared -fPIC -o %s/engine.so %s/engine.c -lm", folder, folder);
    if (system(command) != 0)
        fail("the emitted C does not compile");
    snprintf(path, sizeof path, "%s/engine.so", folder);
    emitted e = {.handle = dlopen(path, RTLD_NOW | RTLD_LOCAL)};
    void *rhs = e.handle ? dlsym(e.handle, "engine_rhs") : NULL;
    void *jacobian = e.handle ? dlsym(e.handle, "engine_jacobian_sparse") : NULL;
    if (!rhs || !jacobian)
        fail("the emitted C does not load");
    memcpy(&e.rhs, &rhs, sizeof rhs);
    memcpy(&e.jacobian, &jacobian, sizeof jacobian);
    return e;
}

/* ---- Eight at once --------------------------------------------------------------------- */

typedef struct subject {
    lb_network *net;
    lb_system *sys;
    lb_evaluator *ev;
    lb_batch *batch;
    emitted code;
    int n, m, z;
    double *x, *k, *out;            /* lanes side by side */
    double *sets_x, *sets_k;        /* set after set */
} subject;

enum measure { BATCH_RHS, EMITTED_RHS, BATCH_JACOBIAN, EMITTED_JACOBIAN, BATCH_BIND, SCALAR_BIND, MEASURES };

/* One call for eight sets. */
static void call(subject *s, enum measure what)
{
    if (what == BATCH_RHS)
        lb_batch_rhs(s->batch, s->x, s->out);
    else if (what == BATCH_JACOBIAN)
        lb_batch_jacobian_sparse(s->batch, s->x, s->out);
    else if (what == BATCH_BIND && lb_batch_bind(s->batch, s->k, NULL, NULL) != LB_OK)
        fail("constants are refused");
    for (int l = 0; l < LB_LANES; l++) {
        const double *x = s->sets_x + (size_t)l * (size_t)s->n, *k = s->sets_k + (size_t)l * (size_t)s->m;
        if (what == EMITTED_RHS)
            s->code.rhs(0, x, k, s->out);
        else if (what == EMITTED_JACOBIAN)
            s->code.jacobian(0, x, k, s->out);
        else if (what == SCALAR_BIND && lb_evaluator_bind(s->ev, k, NULL) != LB_OK)
            fail("constants are refused");
    }
}

static void fill_sets(subject *s)
{
    for (int l = 0; l < LB_LANES; l++) {
        for (int i = 0; i < s->n; i++)
            s->x[i * LB_LANES + l] = s->sets_x[l * s->n + i] = 0.1 + 0.01 * random_below(100);
        for (int j = 0; j < s->m; j++)
            s->k[j * LB_LANES + l] = s->sets_k[l * s->m + j] = 0.1 + 0.01 * random_below(100);
    }
    if (lb_batch_bind(s->batch, s->k, NULL, NULL) != LB_OK)
        fail("constants are refused");
}

static void bench_batch(int species, const char *folder)
{
    char *text = network_text(species, 3 * species), name[80];
    subject s = {.net = parse(text)};
    if (lb_system_new(s.net, &s.sys, NULL) != LB_OK || lb_evaluator_new(s.sys, &s.ev, NULL) != LB_OK ||
        lb_batch_new(s.sys, &s.batch, NULL) != LB_OK)
        fail("no system");
    s.code = compile(s.net, folder);
    s.n = lb_network_states(s.net), s.m = lb_network_constants(s.net), s.z = lb_system_nonzeros(s.sys);
    size_t n = (size_t)s.n * LB_LANES, m = (size_t)s.m * LB_LANES, z = (size_t)s.z * LB_LANES;
    s.x = must(malloc(2 * (n + m + z) * sizeof *s.x));
    s.sets_x = s.x + n, s.k = s.sets_x + n, s.sets_k = s.k + m, s.out = s.sets_k + m;
    fill_sets(&s);
    long calls = 200000 / species;
    double best[MEASURES];
    for (int what = 0; what < MEASURES; what++)
        best[what] = INFINITY;
    for (int repeat = 0; repeat < REPEATS; repeat++)
        for (int what = 0; what < MEASURES; what++) {
            double start = now();
            for (long c = 0; c < calls; c++)
                call(&s, (enum measure)what);
            best[what] = fmin(best[what], (now() - start) / (double)(calls * LB_LANES) * 1e9);
        }
    snprintf(name, sizeof name, "right-hand side, %d species: eight at once / emitted C", species);
    row(name, best[BATCH_RHS], best[EMITTED_RHS], "ns", species == 20 || species == 1000 ? 0.75 : 0);
    snprintf(name, sizeof name, "sparse Jacobian, %d species: eight at once / emitted C", species);
    row(name, best[BATCH_JACOBIAN], best[EMITTED_JACOBIAN], "ns", 0);
    snprintf(name, sizeof name, "binding constants, %d species: eight at once / one", species);
    row(name, best[BATCH_BIND], best[SCALAR_BIND], "ns", 0);
    free(s.x);
    free(text);
    dlclose(s.code.handle);
    lb_batch_free(s.batch);
    lb_evaluator_free(s.ev);
    lb_system_free(s.sys);
    lb_network_free(s.net);
}

/* ---- From text to the first right-hand side ------------------------------------------------ */

static void bench_load(int species, int reactions)
{
    char *text = network_text(species, reactions), name[80];
    double *x = must(calloc(2 * (size_t)species, sizeof *x)), best = INFINITY;
    for (int repeat = 0; repeat < 3; repeat++) {
        double start = now();
        lb_network *net = parse(text);
        lb_system *sys = NULL;
        lb_evaluator *ev = NULL;
        if (lb_system_new(net, &sys, NULL) != LB_OK || lb_evaluator_new(sys, &ev, NULL) != LB_OK)
            fail("no system");
        lb_initial(ev, x);
        lb_rhs(ev, x, x + species);
        best = fmin(best, now() - start);
        lb_evaluator_free(ev);
        lb_system_free(sys);
        lb_network_free(net);
    }
    snprintf(name, sizeof name, "%d species, %d reactions: text to first call / 1 s", species, reactions);
    row(name, best, 1, "s", 1);
    free(x);
    free(text);
}

int main(int argc, char **argv)
{
    if (argc != 2)
        fail("usage: bench_engine FOLDER");
    gsl_set_error_handler_off();
    printf("%-58s %10s %10s\n", "", "first", "second");
    bench_batch(2, argv[1]);
    bench_batch(20, argv[1]);
    bench_batch(1000, argv[1]);
    bench_load(10000, 30000);
    return 0;
}
