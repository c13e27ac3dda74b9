/* What every command does: read the mechanism, report, print, end. */
#ifndef LIMBECK_CLI_SESSION_H
#define LIMBECK_CLI_SESSION_H

#include "cli/command.h"
#include "cli/terminal.h"

typedef struct session {
    const options *given;
    lb_network *network;
    lb_diagnostics *diagnostics;
    lb_system *system;          /* NULL until session_make_system */
    lb_text *text;              /* what goes to standard output */
    lb_monitor monitor;
    terminal_progress progress;
} session;

/* Read the mechanism.  Returns EXIT_ANSWERED, or the exit status after having
 * reported what is wrong.  Either way session_close is due. */
int session_open(session *s, const options *given);
/* The same, with the system made. */
int session_open_system(session *s, const options *given);
void session_close(session *s);

/* Warnings of the mechanism, on standard error, unless --quiet or --json. */
void session_warn(session *s);
/* A sentence on standard error, unless --quiet or --json. */
void session_note(const session *s, const char *format, ...) __attribute__((format(printf, 2, 3)));

/* Report an error (as JSON on standard output with --json), give the exit status. */
int session_fail(const session *s, const lb_error *error);
/* The same with the command line at fault: exit status 2. */
int session_fail_usage(const session *s, const lb_error *error);
/* Standard output could not be written, or a text not be made. */
int session_fail_status(const session *s, lb_status status);

/* Print s->text when its writer returned LB_OK; gives the exit status. */
int session_print(session *s, lb_status status);

/* Does any constant have a range that a search may use? */
bool session_has_range(const session *s);

/* Report without a session, for main. */
int session_report(const options *given, const lb_error *error, const lb_diagnostics *diagnostics, int exit_status);
void session_note_interrupted(const session *s);

/* Open, warn, solve, close: a command whose question is `solve`; the exit status. */
int session_answer(const options *given, int (*solve)(session *s));

#endif
