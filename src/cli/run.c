/* limbeck run: the time course as CSV. */
#include <math.h>
#include <stdio.h>
#include <unistd.h>

#include "cli/files.h"
#include "cli/session.h"

/* A time of the command line in the file's unit; it must be positive. */
static lb_status read_time(const session *s, const char *option, const char *text, double *time, lb_error *error)
{
    lb_error reason = {.code = LB_OK};
    lb_status status = lb_network_time(s->network, text, time, &reason);
    if (status == LB_OK && !(*time > 0 && isfinite(*time)))
        status = LB_E_ARG;
    if (status == LB_OK)
        return LB_OK;
    *error = (lb_error){.code = status};
    if (*reason.message)
        snprintf(error->message, sizeof error->message, "%s: %.400s", option, reason.message);
    else
        snprintf(error->message, sizeof error->message, "%s takes a time above zero, and `%.80s` is none", option, text);
    snprintf(error->remedy, sizeof error->remedy, "write it in the file's unit, or with one: %s 3600, %s \"1 h\"", option,
             option);
    return status;
}

static lb_status read_times(const session *s, lb_run_options *run_options, lb_error *error)
{
    lb_status status = read_time(s, "--until", s->given->until, &run_options->until, error);
    if (status == LB_OK && s->given->every)
        status = read_time(s, "--every", s->given->every, &run_options->every, error);
    return status;
}

/* The rows as CSV to the file of -o, or to standard output. */
static int write_csv(session *s, const lb_run *run)
{
    lb_status status = lb_csv_run(s->system, run, s->text);
    if (!s->given->output)
        return session_print(s, status);
    if (status != LB_OK)
        return session_fail_status(s, status);
    size_t length;
    const char *bytes = lb_text_get(s->text, &length);
    lb_error error;
    if (files_write(s->given->output, bytes, length, &error) != LB_OK)
        return session_fail(s, &error);
    session_note(s, "%zu rows to %s", run->rows, s->given->output);
    return EXIT_ANSWERED;
}

/* The object on standard output; with -o the CSV goes to its file as well. */
static int write_json(session *s, const lb_run *run, const lb_error *error)
{
    int result = EXIT_ANSWERED;
    if (s->given->output) {
        result = write_csv(s, run);
        if (result != EXIT_ANSWERED)
            return result;
        lb_text_free(s->text);
        s->text = lb_text_new();
        if (!s->text)
            return session_fail_status(s, LB_E_NOMEM);
    }
    return session_print(s, lb_json_run(s->system, s->diagnostics, run, error, s->text));
}

/* Rows there are, and a failure after them: both are shown. */
static int end_early(session *s, const lb_run *run, const lb_error *error)
{
    if (!run || run->rows == 0)
        return session_fail(s, error);
    int result = s->given->json ? write_json(s, run, error) : write_csv(s, run);
    if (result != EXIT_ANSWERED)
        return result;
    if (s->given->json)
        return EXIT_NOT_COMPLETED;
    session_fail(s, error);
    session_note(s, "the rows until then (%zu) are kept", run->rows);
    if (error->code == LB_E_FINITE || error->code == LB_E_STEP)
        session_note(s, "growth without bound in a model may be a runaway in the vessel; "
                        "scale-up is for those with the licence and the calorimetry for it");
    return EXIT_NOT_COMPLETED;
}

static int solve(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_run_options run_options = {.tolerance = s->given->tolerance, .monitor = &s->monitor};
    if (read_times(s, &run_options, &error) != LB_OK)
        return session_fail_usage(s, &error);
    lb_run *run = NULL;
    lb_status status = lb_run_solve(s->system, &run_options, &run, &error);
    terminal_done(&s->progress);
    int result;
    if (status != LB_OK && status != LB_E_STOPPED) {
        result = end_early(s, run, &error);
    } else if (!run) {
        result = session_fail(s, &error);
    } else {
        bool is_interrupted = status == LB_E_STOPPED || run->interrupted;
        result = s->given->json ? write_json(s, run, NULL) : write_csv(s, run);
        if (is_interrupted && result == EXIT_ANSWERED) {
            session_note(s, "interrupted; the rows until then (%zu) are kept", run->rows);
            result = EXIT_INTERRUPTED;
        }
    }
    lb_run_free(run);
    return result;
}

static int run_command(const options *given)
{
    if (!given->until) {
        lb_error error = {.code = LB_E_ARG,
                          .message = "run needs the time at which to end",
                          .remedy = "write it in the file's unit, or with one: --until 3600, --until \"1 h\""};
        return session_report(given, &error, NULL, EXIT_USAGE);
    }
    return session_answer(given, solve);
}

static const option_spec own[] = {
    {OPTION_UNTIL, "--until", 0, "TIME", "when to end; in the file's unit, or with one: \"1 h\""},
    {OPTION_EVERY, "--every", 0, "TIME", "time between rows (a 200th of the whole)"},
    {OPTION_TOLERANCE, "--tolerance", 0, "X", "relative tolerance of the integration (1e-8)"},
    {OPTION_OUTPUT, "--output", 'o', "FILE", "write the CSV to FILE instead of standard output"},
    OPTION_NATIVE_SPEC,
};

const command command_run = {
    .name = "run",
    .usage = "run FILE --until TIME [options]",
    .summary = "time course from the initial state, as CSV",
    .about = "Integrate from the initial state and write one row per time: every dynamic\n"
             "species, then the readings. Stiffness is detected. A concentration that falls\n"
             "below zero is an error, never clipped; the rows until then are kept.\n",
    .examples = "  limbeck run bath.mech --until 3600 > bath.csv\n"
                "  limbeck run bath.mech --until \"1 h\" --every \"10 s\" -o bath.csv\n"
                "  limbeck run bath.mech --until 60 --set '[X]0=0.2' --json\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run_command,
};
