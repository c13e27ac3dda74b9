/* Engine 2: the emitted C of a network, compiled and loaded.
 *
 * An entry of the cache is one shared library, named by the SHA-256 digest of all
 * that it depends on: the emitted text, the compiler's path and what it says of
 * itself, the flags.  It is made in a working folder and renamed into place, so
 * that others see it whole or not at all; one that is not whole is made again.
 * Names within it carry the digest, so that no two models share a symbol. */
#include "system/native.h"

#include <dlfcn.h>
#include <stdio.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"
#include "model/network.h"
#include "system/cache.h"
#include "system/child.h"
#include "system/digest.h"

/* No contraction, so that compilers agree with the tables. */
static const char *const flags[] = {"-std=c99", "-O2", "-ffp-contract=off", "-fPIC", "-shared"};
enum { FLAGS = sizeof flags / sizeof *flags, NAME = 48 };

typedef struct maker {
    const lb_network *network;
    const int *column_start, *row;
    const lb_monitor *monitor;
    char *compiler, *folder, *work;
    char name[NAME];                /* "limbeck_" and the start of the digest */
    buffer header, source;
} maker;

void native_free(native *engine)
{
    if (!engine)
        return;
    if (engine->library)
        dlclose(engine->library);
    memory_free(engine);
}

/* "FOLDER/NAME.suffix"; NULL without memory. */
static char *file_in(const maker *mk, const char *folder, const char *suffix)
{
    buffer path;
    buffer_init(&path);
    buffer_printf(&path, "%s/%s.%s", folder, mk->name, suffix);
    return buffer_take(&path);
}

/* ---- The name ------------------------------------------------------------------------- */

static lb_status emit_text(maker *mk, const char *name, lb_error *err)
{
    buffer_clear(&mk->header);
    buffer_clear(&mk->source);
    return lb_emit(mk->network, &(lb_emit_options){.name = name}, &mk->header, &mk->source, err);
}

/* What the compiler says of itself. */
static lb_status ask_version(const maker *mk, buffer *version, lb_error *err)
{
    char ask[] = "--version";
    char *argv[] = {mk->compiler, ask, NULL};
    lb_status status = child_run(argv, mk->monitor, version);
    if (status == LB_E_STOPPED)
        return status_raise(err, status, NULL, "%s", lb_status_text(status));
    return status == LB_OK ? LB_OK : status_raise(err, LB_E_IO, NULL, "the compiler %.300s cannot be run", mk->compiler);
}

/* The length goes before each text, so that no two lists are the same bytes. */
static void add_text(digest *d, const char *text, size_t length)
{
    uint64_t count = length;
    digest_add(d, &count, sizeof count);
    digest_add(d, text, length);
}

/* mk->name, and the text emitted under that name. */
static lb_status name_entry(maker *mk, lb_error *err)
{
    digest d;
    char text[DIGEST_TEXT + 1];
    buffer version;
    buffer_init(&version);
    lb_status status = ask_version(mk, &version, err);
    if (status == LB_OK)
        status = emit_text(mk, "model", err);
    if (status == LB_OK) {
        digest_init(&d);
        add_text(&d, buffer_get(&mk->header), mk->header.length);
        add_text(&d, buffer_get(&mk->source), mk->source.length);
        add_text(&d, mk->compiler, strlen(mk->compiler));
        add_text(&d, buffer_get(&version), version.length);
        for (int i = 0; i < FLAGS; i++)
            add_text(&d, flags[i], strlen(flags[i]));
        digest_finish(&d, text);
        snprintf(mk->name, sizeof mk->name, "limbeck_%.32s", text);
        status = emit_text(mk, mk->name, err);
    }
    buffer_clear(&version);
    return status;
}

/* ---- Making an entry ------------------------------------------------------------------------ */

/* The compiler's first words, for a message of one line. */
static lb_status report_compiler(const maker *mk, const buffer *said, lb_error *err)
{
    const char *words = buffer_get(said);
    int length = (int)strcspn(words, "\n");
    return status_raise(err, LB_E_IO, NULL, "%.100s does not compile the emitted C: %.*s", mk->compiler,
                        length < 300 ? length : 300, words);
}

static lb_status compile(const maker *mk, char *source, char *library, lb_error *err)
{
    char output[] = "-o", mathematics[] = "-lm", *argv[FLAGS + 6];
    int count = 0;
    argv[count++] = mk->compiler;
    for (int i = 0; i < FLAGS; i++)
        argv[count++] = (char *)flags[i];
    argv[count++] = output;
    argv[count++] = library;
    argv[count++] = source;
    argv[count++] = mathematics;
    argv[count] = NULL;
    buffer said;
    buffer_init(&said);
    lb_status status = child_run(argv, mk->monitor, &said);
    if (status == LB_E_STOPPED)
        status_raise(err, status, NULL, "%s", lb_status_text(status));
    else if (status != LB_OK)
        status = report_compiler(mk, &said, err);
    buffer_clear(&said);
    return status;
}

/* Seal what the compiler made, under another name, and move it to where it is looked for. */
static lb_status install(const char *library, const char *sealed, const char *entry, lb_error *err)
{
    buffer bytes;
    buffer_init(&bytes);
    bool done = cache_read(library, &bytes);
    if (done) {
        cache_seal(&bytes);
        done = buffer_status(&bytes) == LB_OK && cache_write(sealed, buffer_get(&bytes), bytes.length) &&
               rename(sealed, entry) == 0;
    }
    buffer_clear(&bytes);
    return done ? LB_OK : status_raise(err, LB_E_IO, NULL, "the compiled model cannot be kept as %.300s", entry);
}

static lb_status make_entry(maker *mk, const char *entry, lb_error *err)
{
    mk->work = cache_begin_work(mk->folder);
    if (!mk->work)
        return status_raise(err, LB_E_IO, NULL, "nothing can be written to the cache folder %.300s", mk->folder);
    lb_status status = LB_E_NOMEM;
    char *header = file_in(mk, mk->work, "h"), *source = file_in(mk, mk->work, "c");
    char *library = file_in(mk, mk->work, "so"), *sealed = file_in(mk, mk->work, "sealed");
    if (!header || !source || !library || !sealed)
        goto done;
    if (cache_write(header, buffer_get(&mk->header), mk->header.length) &&
        cache_write(source, buffer_get(&mk->source), mk->source.length))
        status = compile(mk, source, library, err);
    else
        status = status_raise(err, LB_E_IO, NULL, "the emitted C cannot be written to %.300s", mk->work);
    if (status == LB_OK)
        status = install(library, sealed, entry, err);
done:
    memory_free(header);
    memory_free(source);
    memory_free(library);
    memory_free(sealed);
    cache_end_work(mk->work);
    mk->work = NULL;
    return status == LB_E_NOMEM ? status_no_memory(err) : status;
}

static bool is_whole(const char *entry)
{
    buffer bytes;
    buffer_init(&bytes);
    bool whole = cache_read(entry, &bytes) && cache_is_whole(&bytes);
    buffer_clear(&bytes);
    return whole;
}

/* ---- Loading one -------------------------------------------------------------------------------- */

static void *symbol(const maker *mk, void *library, const char *what)
{
    char name[NAME + 32];
    snprintf(name, sizeof name, "%s_%s", mk->name, what);
    return dlsym(library, name);
}

/* ISO C has no cast from an object's pointer to a function's; POSIX has. */
static bool find_function(const maker *mk, void *library, const char *what, native_function **out)
{
    void *address = symbol(mk, library, what);
    memcpy(out, &address, sizeof *out);
    return address != NULL;
}

static bool has_pattern(const maker *mk, void *library)
{
    const int *column_start = symbol(mk, library, "column_start"), *row = symbol(mk, library, "row");
    size_t n = (size_t)mk->network->states, z = (size_t)mk->column_start[n];
    return column_start && row && memcmp(column_start, mk->column_start, (n + 1) * sizeof *row) == 0 &&
           memcmp(row, mk->row, z * sizeof *row) == 0;
}

static lb_status load_entry(const maker *mk, const char *entry, native **out, lb_error *err)
{
    native *engine = memory_zeroed(1, sizeof *engine);
    if (!engine)
        return status_no_memory(err);
    engine->library = dlopen(entry, RTLD_NOW | RTLD_LOCAL);
    if (!engine->library) {
        const char *why = dlerror();
        native_free(engine);
        return status_raise(err, LB_E_IO, NULL, "the compiled model cannot be loaded: %.300s", why ? why : entry);
    }
    if (!find_function(mk, engine->library, "rates", &engine->rates) ||
        !find_function(mk, engine->library, "rhs", &engine->rhs) ||
        !find_function(mk, engine->library, "jacobian_sparse", &engine->jacobian_sparse) ||
        !find_function(mk, engine->library, "dfdk", &engine->dfdk) || !has_pattern(mk, engine->library)) {
        native_free(engine);
        return status_raise(err, LB_E_IO, NULL, "the compiled model in %.300s is not this one", entry);
    }
    *out = engine;
    return LB_OK;
}

static lb_status find_compiler(maker *mk, const char *given, lb_error *err)
{
    const char *name = given ? given : "cc";
    mk->compiler = child_find(name);
    return mk->compiler ? LB_OK : status_raise(err, LB_E_IO, NULL, "there is no compiler `%.200s`", name);
}

lb_status native_load(const lb_network *network, const int *column_start, const int *row,
                      const lb_native_options *options, native **out, lb_error *err)
{
    static const lb_native_options defaults = {0};
    const lb_native_options *how = options ? options : &defaults;
    maker mk = {.network = network, .column_start = column_start, .row = row, .monitor = how->monitor};
    char *entry = NULL;
    *out = NULL;
    buffer_init(&mk.header);
    buffer_init(&mk.source);
    lb_status status = cache_open(how->cache, &mk.folder, err);
    if (status == LB_OK)
        status = find_compiler(&mk, how->compiler, err);
    if (status == LB_OK)
        status = name_entry(&mk, err);
    if (status == LB_OK && !(entry = file_in(&mk, mk.folder, "so")))
        status = status_no_memory(err);
    if (status == LB_OK && !is_whole(entry))
        status = make_entry(&mk, entry, err);
    if (status == LB_OK)
        status = load_entry(&mk, entry, out, err);
    memory_free(entry);
    memory_free(mk.folder);
    memory_free(mk.compiler);
    buffer_clear(&mk.header);
    buffer_clear(&mk.source);
    return status;
}
