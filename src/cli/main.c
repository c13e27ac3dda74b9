/* limbeck: the command line over the library.
 *
 * A command is a table row: name, help, options, and a function that gives the
 * exit status.  Everything that the commands know of mechanisms comes through
 * limbeck.h. */
#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <string.h>

#include "cli/command.h"
#include "cli/files.h"
#include "cli/help.h"
#include "cli/session.h"
#include "cli/terminal.h"

static const command *const commands[] = {
    &command_page, &command_check, &command_run, &command_steady, &command_emit, &command_oscillate,
};

enum { COMMAND_COUNT = sizeof commands / sizeof *commands };

const command *const *command_list(size_t *count)
{
    *count = COMMAND_COUNT;
    return commands;
}

const command *command_find(const char *name)
{
    for (size_t i = 0; i < COMMAND_COUNT; i++)
        if (*commands[i]->name && strcmp(commands[i]->name, name) == 0)
            return commands[i];
    return NULL;
}

const char *command_nearest(const char *word)
{
    const char *names[COMMAND_COUNT + 1];
    size_t count = 0;
    for (size_t i = 0; i < COMMAND_COUNT; i++)
        if (*commands[i]->name)
            names[count++] = commands[i]->name;
    names[count++] = "help";
    return lb_nearest(word, names, count);
}

/* `limbeck help TOPIC`, `limbeck TOPIC --help`, `limbeck --help`. */
static int show_help(const options *given)
{
    if (!given->topic)
        return *given->command->name ? help_command(given->command) : help_overview();
    const command *topic = command_find(given->topic);
    if (topic)
        return help_command(topic);
    if (strcmp(given->topic, "FILE") == 0)
        return help_command(&command_page);
    lb_error error = {.code = LB_E_ARG};
    const char *nearest = command_nearest(given->topic);
    snprintf(error.message, sizeof error.message, "there is no command `%.400s`", given->topic);
    if (nearest)
        snprintf(error.remedy, sizeof error.remedy, "did you mean `limbeck help %s`?", nearest);
    return session_report(given, &error, NULL, EXIT_USAGE);
}

int main(int argc, char **argv)
{
    files_guard_streams();
    gsl_set_error_handler_off();
    terminal_catch_signals();
    options given;
    int result;
    if (!options_parse(argc, argv, &given))
        result = session_report(&given, &given.problem, NULL,
                                given.problem.code == LB_E_NOMEM ? EXIT_NOT_COMPLETED : EXIT_USAGE);
    else if (given.version)
        result = help_version();
    else if (given.help)
        result = show_help(&given);
    else
        result = given.command->run(&given);
    options_clear(&given);
    return result;
}
