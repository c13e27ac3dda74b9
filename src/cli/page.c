/* limbeck FILE: the whole answer on one page. */
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "cli/session.h"

static int solve(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_oscillate_options oscillate_options = {.given = true, .seed = s->given->seed, .monitor = &s->monitor};
    lb_oscillate *oscillate = NULL;
    if (lb_oscillate_solve(s->system, &oscillate_options, &oscillate, &error) != LB_OK)
        return session_fail(s, &error);
    lb_layout layout = terminal_layout(STDOUT_FILENO);
    int result = session_print(s, s->given->json ? lb_json_page(s->system, s->diagnostics, oscillate, s->text)
                                                 : lb_text_page(s->system, oscillate, &layout, s->text));
    bool is_interrupted = oscillate->steady && oscillate->steady->interrupted;
    for (size_t i = 0; i < oscillate->count; i++)
        is_interrupted = is_interrupted || oscillate->answer[i].interrupted;
    if (is_interrupted && result == EXIT_ANSWERED) {
        session_note_interrupted(s);
        result = EXIT_INTERRUPTED;
    }
    lb_oscillate_free(oscillate);
    return result;
}

/* A word that is no file, has neither point nor slash and so was perhaps meant as a command. */
static int fail_word(const options *given)
{
    lb_error error = {.code = LB_E_ARG};
    const char *nearest = command_nearest(given->file);
    snprintf(error.message, sizeof error.message, "there is no command and no file `%.400s`", given->file);
    if (nearest)
        snprintf(error.remedy, sizeof error.remedy, "did you mean `limbeck %s FILE`?", nearest);
    else
        snprintf(error.remedy, sizeof error.remedy, "`limbeck --help` lists the commands");
    return session_report(given, &error, NULL, EXIT_USAGE);
}

static int run(const options *given)
{
    if (!strpbrk(given->file, "./") && strcmp(given->file, "-") != 0 && access(given->file, F_OK) && errno == ENOENT)
        return fail_word(given);
    session s;
    int result = session_open_system(&s, given);
    if (result == EXIT_ANSWERED) {
        result = solve(&s);
        session_warn(&s);
    }
    session_close(&s);
    return result;
}

const command command_page = {
    .name = "",
    .usage = "FILE [options]",
    .summary = "the whole answer, one page: what it is, what it does, does it oscillate",
    .about = "One page for the notebook: what the mechanism is, what it conserves and how much\n"
             "of it there is, its steady states, and whether it oscillates with the constants\n"
             "given, with the evidence.\n",
    .examples = "  limbeck bath.mech\n"
                "  limbeck bath.mech --set '[B]=1.7'\n"
                "  limbeck bath.mech --json\n"
                "  limbeck - < bath.mech\n",
    .run = run,
};
