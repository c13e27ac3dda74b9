/* Emitted C in a temporary folder: written, compiled by the system's compilers, loaded. */
#ifndef LIMBECK_TESTS_EMITTED_H
#define LIMBECK_TESTS_EMITTED_H

#include <stdbool.h>

#include "limbeck.h"

typedef void emitted_function(double t, const double x[], const double k[], double out[]);

/* The functions of one emitted model in a loaded library. */
typedef struct emitted_model {
    emitted_function *rates, *rhs, *jacobian, *jacobian_sparse, *dfdk;
    const int *column_start, *row;
} emitted_model;

typedef struct emitted_folder {
    char path[64];
    void *library;
} emitted_folder;

/* A new folder; the test fails when there is none. */
emitted_folder emitted_begin(void);
/* Unload, and remove the folder with what is in it. */
void emitted_end(emitted_folder *folder);

/* Write NAME.h and NAME.c of the network, or any other text. */
void emitted_write(const emitted_folder *folder, const lb_network *net, const char *name);
void emitted_write_as(const emitted_folder *folder, const lb_network *net, const lb_emit_options *options);
void emitted_write_file(const emitted_folder *folder, const char *file, const char *text);

/* Write NAME_gsl.h, ..., of options->solver. */
void emitted_write_glue(const emitted_folder *folder, const lb_network *net, const lb_emit_options *options);

/* The test fails where a byte outside comments and strings is no printable ASCII, or where
 * INJECT, which names of the test contain, stands there otherwise than in a name d_.... */
void emitted_assert_harmless(const char *text);

/* Run a program in the folder, by its name and NULL-terminated arguments; its exit
 * status, 127 when there is no such program.  *output (when not NULL): what it
 * printed, both streams; the caller frees it. */
int emitted_run(const emitted_folder *folder, const char *const argv[], char **output);

/* Is there such a program?  (Asked for `--version`.) */
bool emitted_has(const char *program);

/* Compile all files of the folder into a library with strict flags and load it; the
 * test fails with the compiler's words.  optimise: "-O0", "-O1", ... */
void emitted_load(emitted_folder *folder, const char *optimise);
emitted_model emitted_find(const emitted_folder *folder, const char *name);

#endif
