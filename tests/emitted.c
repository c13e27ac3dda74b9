/* Emitted C in a temporary folder.
 *
 * Programs are run without a shell; what a compiler says is kept, so that a test
 * that fails shows it. */
#include "emitted.h"

#include <ctype.h>
#include <dirent.h>
#include <dlfcn.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include "support.h"

enum { PATH = 512, FILE_NAME = 128, MOST_FILES = 1024 };

emitted_folder emitted_begin(void)
{
    emitted_folder folder = {.path = "/tmp/emitted-XXXXXX"};
    ck_assert_msg(mkdtemp(folder.path) != NULL, "no temporary folder");
    return folder;
}

static void join(const emitted_folder *folder, const char *file, char *path)
{
    snprintf(path, PATH, "%s/%s", folder->path, file);
}

void emitted_end(emitted_folder *folder)
{
    if (folder->library)
        dlclose(folder->library);
    DIR *directory = opendir(folder->path);
    for (struct dirent *entry; directory && (entry = readdir(directory));) {
        char path[PATH];
        join(folder, entry->d_name, path);
        if (entry->d_name[0] != '.')
            unlink(path);
    }
    if (directory)
        closedir(directory);
    rmdir(folder->path);
}

void emitted_write_file(const emitted_folder *folder, const char *file, const char *text)
{
    char path[PATH];
    join(folder, file, path);
    FILE *out = fopen(path, "wb");
    ck_assert_msg(out != NULL, "%s cannot be written", path);
    fputs(text, out);
    ck_assert_int_eq(fclose(out), 0);
}

void emitted_write(const emitted_folder *folder, const lb_network *net, const char *name)
{
    emitted_write_as(folder, net, &(lb_emit_options){.name = name});
}

void emitted_write_as(const emitted_folder *folder, const lb_network *net, const lb_emit_options *options)
{
    lb_text *header = lb_text_new(), *source = lb_text_new();
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_emit(net, options, header, source, &err) == LB_OK, "%s", err.message);
    char file[FILE_NAME];
    snprintf(file, sizeof file, "%s.h", options->name);
    emitted_write_file(folder, file, lb_text_get(header, NULL));
    snprintf(file, sizeof file, "%s.c", options->name);
    emitted_write_file(folder, file, lb_text_get(source, NULL));
    lb_text_free(header);
    lb_text_free(source);
}

void emitted_write_glue(const emitted_folder *folder, const lb_network *net, const lb_emit_options *options)
{
    static const char *const endings[] = {".h", ".c", "_main.c"};
    const char *solver = options->solver == LB_SOLVER_GSL ? "gsl" : "cvodes";
    lb_text *text[3] = {lb_text_new(), lb_text_new(), lb_text_new()};
    lb_error err = {.code = LB_OK};
    ck_assert_msg(lb_emit_glue(net, options, text[0], text[1], text[2], &err) == LB_OK, "%s", err.message);
    for (int i = 0; i < 3; i++) {
        char file[FILE_NAME];
        snprintf(file, sizeof file, "%s_%s%s", options->name, solver, endings[i]);
        emitted_write_file(folder, file, lb_text_get(text[i], NULL));
        lb_text_free(text[i]);
    }
}

static char *read_all(const char *path)
{
    FILE *in = fopen(path, "rb");
    size_t length = 0, capacity = 1 << 16;
    char *text = malloc(capacity);
    for (size_t got; in && text && (got = fread(text + length, 1, capacity - length - 1, in)) > 0;) {
        length += got;
        if (length + 1 == capacity)
            text = realloc(text, capacity *= 2);
    }
    if (in)
        fclose(in);
    ck_assert(text != NULL);
    text[length] = '\0';
    return text;
}

int emitted_run(const emitted_folder *folder, const char *const argv[], char **output)
{
    char path[PATH];
    join(folder, ".output", path);
    fflush(NULL);
    pid_t child = fork();
    ck_assert_int_ge(child, 0);
    if (child == 0) {
        int out = open(path, O_WRONLY | O_CREAT | O_TRUNC, 0600);
        if (out < 0 || dup2(out, 1) < 0 || dup2(out, 2) < 0 || chdir(folder->path) != 0)
            _exit(126);
        execvp(argv[0], (char *const *)argv);
        _exit(127);
    }
    int status = 0;
    waitpid(child, &status, 0);
    if (output)
        *output = read_all(path);
    unlink(path);
    return WIFEXITED(status) ? WEXITSTATUS(status) : 126;
}

bool emitted_has(const char *program)
{
    emitted_folder folder = emitted_begin();
    bool found = emitted_run(&folder, (const char *const[]){program, "--version", NULL}, NULL) == 0;
    emitted_end(&folder);
    return found;
}

/* The C files of the folder appended to argv. */
static int add_sources(const emitted_folder *folder, const char **argv, int count)
{
    DIR *directory = opendir(folder->path);
    for (struct dirent *entry; directory && (entry = readdir(directory));) {
        size_t length = strlen(entry->d_name);
        if (length > 2 && strcmp(entry->d_name + length - 2, ".c") == 0 && count < MOST_FILES)
            argv[count++] = strdup(entry->d_name);
    }
    if (directory)
        closedir(directory);
    return count;
}

void emitted_load(emitted_folder *folder, const char *optimise)
{
    const char *argv[MOST_FILES + 2] = {
        "cc", optimise, "-std=c99", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Werror",
        "-ffp-contract=off", "-shared", "-fPIC", "-o", "model.so",
    };
    int fixed = 13, count = add_sources(folder, argv, fixed);
    argv[count] = "-lm";
    char *output = NULL;
    int status = emitted_run(folder, argv, &output);
    for (int i = fixed; i < count; i++)
        free((char *)argv[i]);
    ck_assert_msg(status == 0, "cc failed:\n%s", output);
    free(output);
    char path[PATH];
    join(folder, "model.so", path);
    folder->library = dlopen(path, RTLD_NOW | RTLD_LOCAL);
    ck_assert_msg(folder->library != NULL, "%s", dlerror());
}

static void *symbol(const emitted_folder *folder, const char *name, const char *what)
{
    char text[PATH];
    snprintf(text, sizeof text, "%s_%s", name, what);
    void *address = dlsym(folder->library, text);
    ck_assert_msg(address != NULL, "no %s", text);
    return address;
}

/* ISO C has no cast from an object's pointer to a function's; POSIX has. */
static emitted_function *function(const emitted_folder *folder, const char *name, const char *what)
{
    void *address = symbol(folder, name, what);
    emitted_function *result;
    memcpy(&result, &address, sizeof result);
    return result;
}

emitted_model emitted_find(const emitted_folder *folder, const char *name)
{
    return (emitted_model){
        .rates = function(folder, name, "rates"),
        .rhs = function(folder, name, "rhs"),
        .jacobian = function(folder, name, "jacobian"),
        .jacobian_sparse = function(folder, name, "jacobian_sparse"),
        .dfdk = function(folder, name, "dfdk"),
        .column_start = symbol(folder, name, "column_start"),
        .row = symbol(folder, name, "row"),
    };
}

/* The text without comments and strings, trigraphs and spliced lines resolved first as C
 * does (C99 5.1.1.2). */
static char *strip(const char *text)
{
    char *plain = calloc(strlen(text) + 1, 1), *out = plain;
    for (const char *c = text; *c;) {
        bool is_trigraph = strncmp(c, "\?\?/", 3) == 0;
        const char *after = c + (is_trigraph ? 3 : 1);
        if ((*c == '\\' || is_trigraph) && *after == '\n') {
            c = after + 1;
        } else {
            *out++ = is_trigraph ? '\\' : *c;
            c = after;
        }
    }
    char *write = plain;
    for (const char *c = plain; *c;) {
        if (c[0] == '/' && c[1] == '*') {
            const char *end = strstr(c + 2, "*/");
            ck_assert_msg(end != NULL, "a comment without an end");
            c = end + 2;
        } else if (*c == '"' || *c == '\'') {
            char quote = *c++;
            while (*c && *c != quote)
                c += *c == '\\' && c[1] ? 2 : 1;
            ck_assert_msg(*c == quote, "a string without an end");
            c++;
        } else {
            *write++ = *c++;
        }
    }
    *write = '\0';
    return plain;
}

/* No byte outside comments and strings but printable ASCII, and no INJECT but in d_ names. */
void emitted_assert_harmless(const char *text)
{
    char *code = strip(text);
    for (const char *c = code; *c; c++)
        ck_assert_msg(*c == '\n' || (*c >= ' ' && *c < 0x7f), "byte %#x in the code", (unsigned)(unsigned char)*c);
    for (const char *c = code; (c = strstr(c, "INJECT")) != NULL; c++) {
        const char *first = c;
        while (first > code && (isalnum((unsigned char)first[-1]) || first[-1] == '_'))
            first--;
        ck_assert_msg(first[0] == 'd' && (first[1] == '_' || isdigit((unsigned char)first[1])), "injected: %.60s", first);
    }
    free(code);
}
