/* The commands, and what each returns to the shell. */
#ifndef LIMBECK_CLI_COMMAND_H
#define LIMBECK_CLI_COMMAND_H

#include <stddef.h>

#include "cli/options.h"

enum {
    EXIT_ANSWERED = 0,
    EXIT_NOT_COMPLETED = 1,
    EXIT_USAGE = 2,
    EXIT_MECHANISM = 3,
    EXIT_INTERRUPTED = 130
};

struct command {
    const char *name;           /* "" for the page, which has no word */
    const char *usage;          /* after "limbeck " */
    const char *summary;        /* one line, for the list of commands */
    const char *about;          /* paragraphs for --help */
    const char *examples;       /* lines for --help */
    const option_spec *own;     /* options besides the common ones */
    size_t own_count;
    int (*run)(const options *given);  /* gives the exit status */
};

extern const command command_page, command_check, command_run, command_steady, command_emit, command_oscillate;

/* All commands; the page is the first. */
const command *const *command_list(size_t *count);
/* By name; NULL when there is none. */
const command *command_find(const char *name);
/* The command that a wrong word may mean; NULL when none is near. */
const char *command_nearest(const char *word);

#endif
