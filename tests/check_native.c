/* The native engine: agreement with the tables, the cache and whom it trusts, what happens
 * when there is no native code to be had. */
#include <check.h>
#include <float.h>
#include <math.h>
#include <pthread.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/memory.h"
#include "emitted.h"
#include "random_network.h"
#include "support.h"
#include "system/cache.h"
#include "system/digest.h"
#include "system/evaluator.h"
#include "system/system.h"

static const char brusselator[] = "units none\n[A] = 1\n[B] = 3\n[X]0 = 1.2\n[Y]0 = 3\nA -> X, k = 1\n2 X + Y -> 3 X, k = 1\n"
                                  "B + X -> Y + D, k = 1\nX -> E, k = 1\n";

/* ---- A cache of its own -------------------------------------------------------------------- */

typedef struct fixture {
    emitted_folder folder;
    char cache[128];
} fixture;

static fixture fixture_begin(void)
{
    fixture f = {.folder = emitted_begin()};
    snprintf(f.cache, sizeof f.cache, "%s/cache", f.folder.path);
    return f;
}

static int run_there(const fixture *f, const char *const argv[])
{
    return emitted_run(&f->folder, argv, NULL);
}

static void fixture_end(fixture *f)
{
    run_there(f, (const char *const[]){"rm", "-rf", f->cache, NULL});
    emitted_end(&f->folder);
}

/* What is in the cache: files, and what is left of working folders; *path: one file. */
static int count_entries(const fixture *f, char *path, size_t size)
{
    char *output = NULL;
    int count = 0;
    emitted_run(&f->folder, (const char *const[]){"ls", f->cache, NULL}, &output);
    for (char *line = strtok(output, "\n"); line; line = strtok(NULL, "\n"), count++)
        snprintf(path, size, "%s/%s", f->cache, line);
    free(output);
    return count;
}

static lb_system *system_of(const lb_network *net)
{
    lb_system *system = NULL;
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_system_new(net, &system, &err) == LB_OK, "%s", err.message);
    return system;
}

static lb_status use(lb_system *system, const fixture *f, lb_error *err)
{
    return lb_system_use_native(system, &(lb_native_options){.cache = f->cache}, err);
}

static void assert_native(lb_system *system, const fixture *f)
{
    lb_error err = {.code = LB_OK};
    ck_assert_msg(use(system, f, &err) == LB_OK, "%s", err.message);
    ck_assert_str_eq(lb_system_engine(system), "native");
    ck_assert_str_eq(lb_system_engine_note(system), "");
}

/* The Brusselator at (1.5, 0.7): dx/dt is -2.925 + ... by the code that is loaded. */
static void assert_brusselator(lb_system *system)
{
    lb_evaluator *ev = NULL;
    const double x[4] = {1.5, 0.7, 0, 0};
    double dxdt[4];
    ck_assert_int_eq(lb_evaluator_new(system, &ev, NULL), LB_OK);
    lb_rhs(ev, x, dxdt);
    assert_close(dxdt[0], 1 - 4 * 1.5 + 1.5 * 1.5 * 0.7, 1e-15, 1e-15);
    assert_close(dxdt[1], 3 * 1.5 - 1.5 * 1.5 * 0.7, 1e-15, 0);
    lb_evaluator_free(ev);
}

/* ---- Agreement ------------------------------------------------------------------------------- */

/* Each term takes at most some ten operations in either engine. */
#define ROUNDING (16 * DBL_EPSILON)

typedef struct values {
    double *v, *dxdt, *sparse, *J, *D;
} values;

static double *numbers(size_t count)
{
    double *block = memory_zeroed(count, sizeof *block);
    ck_assert_ptr_nonnull(block);
    return block;
}

static values values_of(lb_evaluator *ev, const double *x)
{
    const lb_system *s = evaluator_system(ev);
    size_t n = (size_t)s->n;
    values out = {numbers((size_t)s->r), numbers(n), numbers((size_t)s->nonzeros), numbers(n * n), numbers(n * (size_t)s->m)};
    lb_rates(ev, x, out.v);
    lb_rhs(ev, x, out.dxdt);
    lb_jacobian_sparse(ev, x, out.sparse);
    lb_jacobian(ev, x, out.J);
    lb_dfdk(ev, x, out.D);
    return out;
}

static void values_free(values *v)
{
    double *blocks[] = {v->v, v->dxdt, v->sparse, v->J, v->D};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
}

/* Sums of the terms' magnitudes, from the tables after a call of lb_dfdk and lb_jacobian. */
static values magnitudes_of(lb_evaluator *ev, const double *x)
{
    const table *t = ev->table;
    size_t n = (size_t)t->n;
    values out = values_of(ev, x);
    for (int s = 0; s < ev->system->r; s++)
        out.v[s] = fabs(out.v[s]);
    lb_jacobian_sparse(ev, x, out.sparse);
    for (int z = 0; z < t->nonzeros; z++) {
        out.sparse[z] = 0;
        for (size_t i = t->term_start[z]; i < t->term_start[z + 1]; i++)
            out.sparse[z] += fabs(ev->term_coefficient[i] * ev->slot[t->term_slot[i]]);
    }
    lb_dfdk(ev, x, out.D);
    memset(out.D, 0, n * (size_t)ev->system->m * sizeof *out.D);
    for (int part = 0; part < 2; part++) {
        const table_parameters *list = part == 0 ? &t->factors : &t->laws;
        for (size_t i = 0; i < list->count; i++) {
            const table_parameter *p = &list->list[i];
            double dv = ev->values[p->node] * (part == 0 ? ev->unit[p->of] : 1);
            for (int e = t->entry_start[p->of]; e < t->entry_start[p->of + 1]; e++)
                out.D[(size_t)t->entry_state[e] + (size_t)p->constant * n] += fabs(ev->coefficient[e] * dv);
        }
    }
    for (size_t i = 0, s = 0; i < t->coefficients.count; i++) {
        const table_parameter *p = &t->coefficients.list[i];
        while (t->entry_start[s + 1] <= p->of)
            s++;
        out.D[(size_t)t->entry_state[p->of] + (size_t)p->constant * n] += fabs(ev->values[p->node] * ev->v[s]);
    }
    evaluator_rhs_scaled(ev, x, out.J, out.dxdt);
    return out;
}

static void compare(const char *what, int network, const double *tables, const double *code, const double *magnitude,
                    size_t count)
{
    for (size_t i = 0; i < count; i++)
        ck_assert_msg(fabs(tables[i] - code[i]) <= ROUNDING * magnitude[i],
                      "network %d, %s %zu: tables %.17g, native %.17g, %g eps of magnitude %g", network, what, i, tables[i],
                      code[i], fabs(tables[i] - code[i]) / magnitude[i] / DBL_EPSILON, magnitude[i]);
}

static void compare_engines(const fixture *f, int network)
{
    lb_network *net = random_network((uint64_t)network);
    lb_system *tables = system_of(net), *compiled = system_of(net);
    lb_evaluator *a = NULL, *b = NULL;
    assert_native(compiled, f);
    ck_assert_int_eq(lb_evaluator_new(tables, &a, NULL), LB_OK);
    ck_assert_int_eq(lb_evaluator_new(compiled, &b, NULL), LB_OK);
    size_t n = (size_t)net->states;
    double *x = numbers(n);
    random_state((uint64_t)network + 7, net->states, x);
    values want = values_of(a, x), got = values_of(b, x), scale = magnitudes_of(a, x);
    compare("rate", network, want.v, got.v, scale.v, (size_t)net->reaction_steps);
    compare("dx/dt", network, want.dxdt, got.dxdt, scale.dxdt, n);
    compare("Jacobian entry", network, want.sparse, got.sparse, scale.sparse, (size_t)tables->nonzeros);
    compare("df/dk", network, want.D, got.D, scale.D, n * (size_t)net->constant_count);
    for (size_t j = 0; j < n; j++)
        for (int z = compiled->column_start[j]; z < compiled->column_start[j + 1]; z++)
            ck_assert(got.J[(size_t)compiled->row[z] + j * n] == got.sparse[z]);
    values_free(&want);
    values_free(&got);
    values_free(&scale);
    memory_free(x);
    lb_evaluator_free(a);
    lb_evaluator_free(b);
    lb_system_free(tables);
    lb_system_free(compiled);
    lb_network_free(net);
}

START_TEST(test_tables_and_native_code_agree_to_rounding)
{
    fixture f = fixture_begin();
    int count = getenv("LB_TEST_LONG") ? 500 : 40;
    for (int network = 0; network < count; network++)
        compare_engines(&f, network);
    fixture_end(&f);
}
END_TEST

START_TEST(test_scaled_residuals_are_there_with_native_code)
{
    fixture f = fixture_begin();
    lb_network *net = support_network(brusselator);
    lb_system *system = system_of(net);
    lb_evaluator *ev = NULL;
    const double x[4] = {1.5, 0.7, 0, 0};
    double dxdt[4], magnitude[4];
    assert_native(system, &f);
    ck_assert_int_eq(lb_evaluator_new(system, &ev, NULL), LB_OK);
    evaluator_rhs_scaled(ev, x, dxdt, magnitude);
    assert_close(magnitude[1], 3 * 1.5 + 1.5 * 1.5 * 0.7, 1e-15, 0);
    lb_evaluator_free(ev);
    lb_system_free(system);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* ---- The cache -------------------------------------------------------------------------------- */

START_TEST(test_one_entry_is_made_and_used_again)
{
    fixture f = fixture_begin();
    char path[512];
    struct stat first, second;
    lb_network *net = support_network(brusselator);
    for (int round = 0; round < 2; round++) {
        lb_system *system = system_of(net);
        assert_native(system, &f);
        assert_brusselator(system);
        lb_system_free(system);
        ck_assert_int_eq(count_entries(&f, path, sizeof path), 1);
        ck_assert_int_eq(stat(path, round == 0 ? &first : &second), 0);
    }
    ck_assert(first.st_ino == second.st_ino);
    ck_assert_int_eq(stat(f.cache, &first), 0);
    ck_assert_int_eq(first.st_mode & 0777, 0700);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* Cut short, changed in one byte, replaced by text or by nothing. */
START_TEST(test_corrupted_entries_are_made_again)
{
    fixture f = fixture_begin();
    char path[512];
    lb_network *net = support_network(brusselator);
    for (int damage = 0; damage < 5; damage++) {
        lb_system *system = system_of(net);
        assert_native(system, &f);
        assert_brusselator(system);
        lb_system_free(system);
        ck_assert_int_eq(count_entries(&f, path, sizeof path), 1);
        FILE *file = fopen(path, damage == 3 ? "wb" : "r+b");
        ck_assert_ptr_nonnull(file);
        if (damage == 0)
            ck_assert_int_eq(ftruncate(fileno(file), 5000), 0);
        if (damage == 1)
            ck_assert(fseek(file, 700, SEEK_SET) == 0 && fputc(0x5a, file) == 0x5a);
        if (damage == 2)
            ck_assert(fseek(file, -1, SEEK_END) == 0 && fputc('!', file) == '!');
        ck_assert_int_eq(fclose(file), 0);
        if (damage == 4)
            ck_assert_int_eq(chmod(path, 0666), 0);
    }
    lb_system *system = system_of(net);
    assert_native(system, &f);
    struct stat about;
    ck_assert_int_eq(stat(path, &about), 0);
    ck_assert_int_eq(about.st_mode & 022, 0);
    lb_system_free(system);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

START_TEST(test_another_text_is_another_entry)
{
    fixture f = fixture_begin();
    char path[512];
    const char *const texts[] = {brusselator, "units none\n[X]0 = 1\nX -> Y, k = 1\n", "units none\n[X]0 = 1\nX -> Y, k = 2\n"};
    for (int i = 0; i < 3; i++) {
        lb_network *net = support_network(texts[i]);
        lb_system *system = system_of(net);
        assert_native(system, &f);
        ck_assert_int_eq(count_entries(&f, path, sizeof path), i + 1);
        lb_system_free(system);
        lb_network_free(net);
    }
    fixture_end(&f);
}
END_TEST

/* Another program under another path: its code must not be taken from the first one's entry. */
START_TEST(test_another_compiler_is_another_entry)
{
    fixture f = fixture_begin();
    char path[512], compiler[256];
    lb_network *net = support_network(brusselator);
    snprintf(compiler, sizeof compiler, "%s/wrapper", f.folder.path);
    emitted_write_file(&f.folder, "wrapper", "#!/bin/sh\nexec cc \"$@\"\n");
    ck_assert_int_eq(chmod(compiler, 0700), 0);
    lb_system *first = system_of(net), *second = system_of(net);
    assert_native(first, &f);
    lb_native_options options = {.cache = f.cache, .compiler = compiler};
    ck_assert_int_eq(lb_system_use_native(second, &options, NULL), LB_OK);
    ck_assert_int_eq(count_entries(&f, path, sizeof path), 2);
    assert_brusselator(first);
    assert_brusselator(second);
    lb_system_free(first);
    lb_system_free(second);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* ---- Threads -------------------------------------------------------------------------------------- */

typedef struct task {
    const fixture *f;
    const lb_network *net;
    lb_status status;
} task;

static void *load_in_a_thread(void *argument)
{
    task *mine = argument;
    lb_system *system = NULL;
    mine->status = lb_system_new(mine->net, &system, NULL);
    if (mine->status == LB_OK)
        mine->status = use(system, mine->f, NULL);
    lb_system_free(system);
    return NULL;
}

START_TEST(test_threads_may_load_the_same_model_at_once)
{
    enum { THREADS = 4 };
    fixture f = fixture_begin();
    char path[512];
    pthread_t thread[THREADS];
    task tasks[THREADS];
    lb_network *net = support_network(brusselator);
    for (int i = 0; i < THREADS; i++) {
        tasks[i] = (task){&f, net, LB_E_ARG};
        ck_assert_int_eq(pthread_create(&thread[i], NULL, load_in_a_thread, &tasks[i]), 0);
    }
    for (int i = 0; i < THREADS; i++) {
        pthread_join(thread[i], NULL);
        ck_assert_int_eq(tasks[i].status, LB_OK);
    }
    ck_assert_int_eq(count_entries(&f, path, sizeof path), 1);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* ---- When there is none ------------------------------------------------------------------------------ */

/* Tables are used, with a reason that has these words in it. */
static void assert_refused(const lb_native_options *options, lb_status want, const char *words)
{
    lb_network *net = support_network(brusselator);
    lb_system *system = system_of(net);
    lb_error err = {.code = LB_OK};
    ck_assert_int_eq(lb_system_use_native(system, options, &err), want);
    ck_assert_msg(strstr(err.message, words) != NULL, "`%s` has no `%s`", err.message, words);
    ck_assert_str_eq(lb_system_engine(system), "tables");
    ck_assert_str_eq(lb_system_engine_note(system), err.message);
    assert_brusselator(system);
    lb_system_free(system);
    lb_network_free(net);
}

static void assert_folder_refused(const fixture *f, const char *words)
{
    assert_refused(&(lb_native_options){.cache = f->cache}, LB_E_IO, words);
}

START_TEST(test_folders_that_others_may_write_are_refused)
{
    const mode_t modes[] = {0770, 0777, 0755, 01777, 0702};
    for (size_t i = 0; i < sizeof modes / sizeof *modes; i++) {
        fixture f = fixture_begin();
        char path[512];
        ck_assert(mkdir(f.cache, 0700) == 0 && chmod(f.cache, modes[i]) == 0);
        assert_folder_refused(&f, "is open to others");
        ck_assert_int_eq(count_entries(&f, path, sizeof path), 0);
        fixture_end(&f);
    }
}
END_TEST

START_TEST(test_links_and_files_are_no_cache_folder)
{
    fixture f = fixture_begin();
    char real[160], slashed[160];
    snprintf(real, sizeof real, "%s/real", f.folder.path);
    snprintf(slashed, sizeof slashed, "%s//", f.cache);
    ck_assert(mkdir(real, 0700) == 0 && symlink(real, f.cache) == 0);
    assert_folder_refused(&f, "is a link");
    assert_refused(&(lb_native_options){.cache = slashed}, LB_E_IO, "is a link");
    ck_assert(unlink(f.cache) == 0 && rmdir(real) == 0);
    emitted_write_file(&f.folder, "cache", "text");
    assert_folder_refused(&f, "is no folder");
    fixture_end(&f);
}
END_TEST

START_TEST(test_folders_below_one_that_others_may_change_are_refused)
{
    fixture f = fixture_begin();
    char below[160];
    snprintf(below, sizeof below, "%s/below", f.cache);
    ck_assert(mkdir(f.cache, 0700) == 0 && chmod(f.cache, 0777) == 0);
    assert_refused(&(lb_native_options){.cache = below}, LB_E_IO, "others can replace the cache folder");
    ck_assert_int_eq(chmod(f.cache, 01777), 0);
    lb_network *net = support_network(brusselator);
    lb_system *system = system_of(net);
    ck_assert_int_eq(lb_system_use_native(system, &(lb_native_options){.cache = below}, NULL), LB_OK);
    lb_system_free(system);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* Only root can make a folder of another user. */
START_TEST(test_folders_of_another_user_are_refused)
{
    fixture f = fixture_begin();
    ck_assert_int_eq(mkdir(f.cache, 0700), 0);
    if (geteuid() == 0 && chown(f.cache, 1, 1) == 0)
        assert_folder_refused(&f, "belongs to another user");
    fixture_end(&f);
}
END_TEST

START_TEST(test_missing_and_failing_compilers_are_said)
{
    fixture f = fixture_begin();
    char compiler[256], path[512];
    assert_refused(&(lb_native_options){.cache = f.cache, .compiler = "no-such-compiler"}, LB_E_IO, "no compiler `no-such-");
    snprintf(compiler, sizeof compiler, "%s/broken", f.folder.path);
    lb_native_options options = {.cache = f.cache, .compiler = compiler};
    emitted_write_file(&f.folder, "broken", "#!/bin/sh\n[ \"$1\" = --version ] && exit 0\necho out of paper; exit 1\n");
    ck_assert_int_eq(chmod(compiler, 0700), 0);
    assert_refused(&options, LB_E_IO, "out of paper");
    ck_assert_int_eq(unlink(compiler), 0);
    emitted_write_file(&f.folder, "broken", "#!/bin/sh\nexit 0\n");
    ck_assert_int_eq(chmod(compiler, 0700), 0);
    assert_refused(&options, LB_E_IO, "cannot be kept");
    ck_assert_int_eq(count_entries(&f, path, sizeof path), 0);
    fixture_end(&f);
}
END_TEST

/* No shell: a folder's name with a command in it is a name. */
START_TEST(test_names_reach_no_shell)
{
    fixture f = fixture_begin();
    snprintf(f.cache, sizeof f.cache, "%s/a b;touch injected;$(touch injected)'\"", f.folder.path);
    lb_network *net = support_network(brusselator);
    lb_system *system = system_of(net);
    assert_native(system, &f);
    assert_brusselator(system);
    ck_assert_int_eq(run_there(&f, (const char *const[]){"test", "!", "-e", "injected", NULL}), 0);
    ck_assert_int_ne(access("injected", F_OK), 0);
    lb_system_free(system);
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

static bool stop_at_once(void *context)
{
    (void)context;
    return true;
}

START_TEST(test_a_compiler_is_stopped_when_asked)
{
    fixture f = fixture_begin();
    char compiler[256];
    snprintf(compiler, sizeof compiler, "%s/slow", f.folder.path);
    emitted_write_file(&f.folder, "slow", "#!/bin/sh\nsleep 60\n");
    ck_assert_int_eq(chmod(compiler, 0700), 0);
    lb_monitor monitor = {.stop = stop_at_once};
    assert_refused(&(lb_native_options){.cache = f.cache, .compiler = compiler, .monitor = &monitor}, LB_E_STOPPED,
                   "interrupted");
    fixture_end(&f);
}
END_TEST

START_TEST(test_the_environment_names_the_folder)
{
    fixture f = fixture_begin();
    char path[512], *folder = NULL;
    ck_assert(setenv("HOME", f.cache, 1) == 0 && setenv("XDG_CACHE_HOME", "relative", 1) == 0);
    ck_assert_int_eq(cache_open(NULL, &folder, NULL), LB_OK);
    snprintf(path, sizeof path, "%s/.cache/limbeck", f.cache);
    ck_assert_str_eq(folder, path);
    memory_free(folder);
    snprintf(path, sizeof path, "%s/caches", f.cache);
    ck_assert_int_eq(setenv("XDG_CACHE_HOME", path, 1), 0);
    ck_assert_int_eq(cache_open(NULL, &folder, NULL), LB_OK);
    ck_assert_msg(strcmp(folder + strlen(path), "/limbeck") == 0, "%s", folder);
    memory_free(folder);
    ck_assert(unsetenv("HOME") == 0 && unsetenv("XDG_CACHE_HOME") == 0);
    ck_assert_int_eq(cache_open(NULL, &folder, NULL), LB_E_IO);
    fixture_end(&f);
}
END_TEST

START_TEST(test_every_failure_of_memory_is_clean)
{
    fixture f = fixture_begin();
    lb_network *net = support_network("units none\n[X]0 = 1\nX -> Y, k = 1\n");
    lb_system *system = system_of(net);
    lb_status status = LB_E_NOMEM;
    assert_native(system, &f);
    lb_system_free(system);
    for (long k = 0; status != LB_OK; k += 1 + k / 64) {
        system = system_of(net);
        memory_fail_after(k);
        status = use(system, &f, NULL);
        memory_fail_after(-1);
        ck_assert(status == LB_OK || strcmp(lb_system_engine(system), "tables") == 0);
        lb_system_free(system);
    }
    lb_network_free(net);
    fixture_end(&f);
}
END_TEST

/* ---- SHA-256 --------------------------------------------------------------------------------------- */

/* The examples of NIST's document for FIPS 180-4, SHA-256, and the empty text. */
START_TEST(test_digests_are_sha256)
{
    static const char *const known[][2] = {
        {"", "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"},
        {"abc", "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"},
        {"abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq",
         "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1"},
    };
    for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
        digest d;
        char text[DIGEST_TEXT + 1];
        digest_init(&d);
        for (const char *c = known[i][0]; *c; c++)
            digest_add(&d, c, 1);
        digest_finish(&d, text);
        ck_assert_str_eq(text, known[i][1]);
    }
}
END_TEST

Suite *native_suite(void)
{
    Suite *suite = suite_create("native");
    TCase *engine = tcase_create("engine"), *cache = tcase_create("cache"), *none = tcase_create("refusals");
    tcase_set_timeout(engine, 120);
    tcase_add_test(engine, test_tables_and_native_code_agree_to_rounding);
    tcase_add_test(engine, test_scaled_residuals_are_there_with_native_code);
    tcase_set_timeout(cache, 60);
    tcase_add_test(cache, test_one_entry_is_made_and_used_again);
    tcase_add_test(cache, test_corrupted_entries_are_made_again);
    tcase_add_test(cache, test_another_text_is_another_entry);
    tcase_add_test(cache, test_another_compiler_is_another_entry);
    tcase_add_test(cache, test_threads_may_load_the_same_model_at_once);
    tcase_add_test(cache, test_the_environment_names_the_folder);
    tcase_add_test(cache, test_digests_are_sha256);
    tcase_set_timeout(none, 60);
    tcase_add_test(none, test_folders_that_others_may_write_are_refused);
    tcase_add_test(none, test_links_and_files_are_no_cache_folder);
    tcase_add_test(none, test_folders_below_one_that_others_may_change_are_refused);
    tcase_add_test(none, test_folders_of_another_user_are_refused);
    tcase_add_test(none, test_missing_and_failing_compilers_are_said);
    tcase_add_test(none, test_names_reach_no_shell);
    tcase_add_test(none, test_a_compiler_is_stopped_when_asked);
    tcase_add_test(none, test_every_failure_of_memory_is_clean);
    suite_add_tcase(suite, engine);
    suite_add_tcase(suite, cache);
    suite_add_tcase(suite, none);
    return suite;
}
