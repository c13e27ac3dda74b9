/* What every command does: read the mechanism, report, print, end.
 *
 * Faults, warnings and errors go to standard error; with --json they are in the
 * one object on standard output and standard error stays empty. */
#include "cli/session.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "cli/files.h"

int session_report(const options *given, const lb_error *error, const lb_diagnostics *diagnostics, int exit_status)
{
    lb_text *text = lb_text_new();
    if (given->json && text) {
        const char *name = *given->command->name ? given->command->name : "page";
        size_t length;
        if (lb_json_error(name, given->file, error, diagnostics, text) == LB_OK) {
            const char *bytes = lb_text_get(text, &length);
            lb_error unwritten;
            if (files_print(STDOUT_FILENO, bytes, length, &unwritten) != LB_OK)
                fprintf(stderr, "limbeck: %s\n", unwritten.message);
        } else {
            fprintf(stderr, "limbeck: %s\n", error->message);
        }
    } else {
        fprintf(stderr, "limbeck: %s\n", *error->message ? error->message : lb_status_text(error->code));
        if (*error->remedy)
            fprintf(stderr, "         %s\n", error->remedy);
    }
    lb_text_free(text);
    return exit_status;
}

static int exit_status_of(lb_status code)
{
    switch (code) {
    case LB_OK: return EXIT_ANSWERED;
    case LB_E_MECHANISM: return EXIT_MECHANISM;
    case LB_E_STOPPED: return EXIT_INTERRUPTED;
    default: return EXIT_NOT_COMPLETED;
    }
}

int session_fail(const session *s, const lb_error *error)
{
    if (terminal_interrupted()) {
        lb_error stopped = {.code = LB_E_STOPPED, .message = "interrupted, with nothing to show yet"};
        return session_report(s->given, &stopped, s->diagnostics, EXIT_INTERRUPTED);
    }
    return session_report(s->given, error, s->diagnostics, exit_status_of(error->code));
}

int session_fail_usage(const session *s, const lb_error *error)
{
    int status = error->code == LB_E_NOMEM ? EXIT_NOT_COMPLETED : EXIT_USAGE;
    return session_report(s->given, error, s->diagnostics, status);
}

int session_fail_status(const session *s, lb_status status)
{
    lb_error error = {.code = status};
    return session_fail(s, &error);
}

/* Faults and warnings as text on standard error. */
static void show_diagnostics(const session *s)
{
    lb_text *text = lb_text_new();
    size_t length;
    if (text && lb_diagnostics_write(s->diagnostics, terminal_layout(STDERR_FILENO).colour, text) == LB_OK) {
        const char *bytes = lb_text_get(text, &length);
        files_print(STDERR_FILENO, bytes, length, NULL);
    }
    lb_text_free(text);
}

/* The mechanism has faults: show them, or put them into the object. */
static int fail_mechanism(session *s, lb_error *error)
{
    size_t faults = s->diagnostics ? lb_diagnostics_faults(s->diagnostics) : 0;
    error->code = LB_E_MECHANISM;
    snprintf(error->message, sizeof error->message, "%zu fault%s in %s", faults, faults == 1 ? "" : "s", s->given->file);
    error->remedy[0] = '\0';
    if (s->given->json)
        return session_fail(s, error);
    show_diagnostics(s);
    return EXIT_MECHANISM;
}

int session_open(session *s, const options *given)
{
    memset(s, 0, sizeof *s);
    s->given = given;
    s->monitor = terminal_monitor(&s->progress, given->quiet);
    s->text = lb_text_new();
    if (!s->text)
        return session_fail_status(s, LB_E_NOMEM);
    lb_error error = {.code = LB_OK};
    lb_status status = lb_network_read(given->file, given->settings, given->setting_count, &s->network,
                                       &s->diagnostics, &error);
    switch (status) {
    case LB_OK: return EXIT_ANSWERED;
    case LB_E_MECHANISM: return fail_mechanism(s, &error);
    case LB_E_NAME:
    case LB_E_ARG: return session_fail_usage(s, &error);
    default: return session_fail(s, &error);
    }
}

/* The model compiled, if it can be; if not, the tables answer, and a note says why. */
static int use_native(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_native_options native_options = {.monitor = &s->monitor};
    lb_status status = lb_system_use_native(s->system, &native_options, &error);
    terminal_done(&s->progress);
    if (status == LB_E_STOPPED || status == LB_E_NOMEM)
        return session_fail(s, &error);
    if (status != LB_OK) {
        session_note(s, "the model is not compiled, its tables are used: %s", error.message);
        if (*error.remedy)
            session_note(s, "%s", error.remedy);
    }
    return EXIT_ANSWERED;
}

int session_open_system(session *s, const options *given)
{
    int result = session_open(s, given);
    if (result != EXIT_ANSWERED)
        return result;
    lb_error error;
    if (lb_system_new(s->network, &s->system, &error) != LB_OK)
        return session_fail(s, &error);
    return given->native ? use_native(s) : EXIT_ANSWERED;
}

void session_close(session *s)
{
    terminal_done(&s->progress);
    lb_system_free(s->system);
    lb_network_free(s->network);
    lb_diagnostics_free(s->diagnostics);
    lb_text_free(s->text);
}

void session_warn(session *s)
{
    terminal_done(&s->progress);
    if (!s->given->quiet && !s->given->json && s->diagnostics && lb_diagnostics_count(s->diagnostics) > 0)
        show_diagnostics(s);
}

void session_note(const session *s, const char *format, ...)
{
    if (s->given->quiet || s->given->json)
        return;
    va_list list;
    va_start(list, format);
    fprintf(stderr, "limbeck: ");
    vfprintf(stderr, format, list);
    fprintf(stderr, "\n");
    va_end(list);
}

void session_note_interrupted(const session *s)
{
    session_note(s, "interrupted; what was found until then is shown");
}

int session_print(session *s, lb_status status)
{
    terminal_done(&s->progress);
    lb_error error;
    if (status != LB_OK)
        return session_fail_status(s, status);
    size_t length;
    const char *bytes = lb_text_get(s->text, &length);
    if (files_print(STDOUT_FILENO, bytes, length, &error) == LB_OK)
        return EXIT_ANSWERED;
    fprintf(stderr, "limbeck: %s\n", error.message);
    return EXIT_NOT_COMPLETED;
}

bool session_has_range(const session *s)
{
    double low, high;
    bool is_logarithmic;
    for (int i = 0; i < lb_network_constants(s->network); i++)
        if (lb_network_range(s->network, i, &low, &high, &is_logarithmic))
            return true;
    return false;
}

int session_answer(const options *given, int (*solve)(session *s))
{
    session s;
    int result = session_open_system(&s, given);
    if (result == EXIT_ANSWERED) {
        session_warn(&s);
        result = solve(&s);
    }
    session_close(&s);
    return result;
}
