/* Reading the command line. */
#ifndef LIMBECK_CLI_OPTIONS_H
#define LIMBECK_CLI_OPTIONS_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "limbeck.h"

typedef struct command command;

typedef enum option_id {
    OPTION_JSON, OPTION_SET, OPTION_SEED, OPTION_QUIET, OPTION_HELP, OPTION_VERSION,
    OPTION_UNTIL, OPTION_EVERY, OPTION_TOLERANCE, OPTION_OUTPUT, OPTION_NAME, OPTION_FOR,
    OPTION_SCOPE, OPTION_SAMPLES, OPTION_SECONDS, OPTION_NATIVE, OPTION_SENSITIVITIES, OPTION_ALONG
} option_id;

typedef struct option_spec {
    option_id id;
    const char *name;       /* "--until" */
    char letter;            /* 'o' for -o; 0: none */
    const char *value;      /* what follows, for --help; NULL: nothing does */
    const char *help;
} option_spec;

typedef struct options {
    const command *command; /* the page where no command is named */
    const char *file;       /* NULL: none was given */
    const char *topic;      /* of `limbeck help TOPIC`; NULL: none */
    bool json, quiet, help, version;
    lb_setting *settings;   /* [setting_count], names owned */
    size_t setting_count;
    uint64_t seed;
    const char *until, *every;          /* times as written; NULL: not given */
    double tolerance;                   /* 0: not given */
    const char *output, *name;          /* NULL: not given */
    lb_solver solver;                   /* of the emitted glue */
    bool given, ranges;                 /* scopes; both when nothing was said */
    size_t samples;                     /* 0: not given */
    double seconds;                     /* 0: not given */
    bool sensitivities;                 /* of steady states */
    const char *along;                  /* name of a constant; NULL: not given */
    bool native;                        /* compile the model and load it */
    lb_error problem;                   /* what is wrong with the command line */
} options;

/* --native, of the commands that evaluate the system. */
#define OPTION_NATIVE_SPEC \
    {OPTION_NATIVE, "--native", 0, NULL, "compile the model with cc, for long work; without a compiler, tables as ever"}

/* Options that every command takes. */
const option_spec *options_common(size_t *count);

/* Read argv; options may stand before and after the command and FILE, `--`
 * ends them.  False: wrong usage, and o->problem says how.  Either way
 * options_clear is due. */
bool options_parse(int argc, char **argv, options *o);
void options_clear(options *o);

#endif
