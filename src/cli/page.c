/* limbeck FILE: the whole answer on one page. */
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "cli/session.h"

static int print(session *s, const lb_oscillate *oscillate)
{
    lb_layout layout = terminal_layout(STDOUT_FILENO);
    return session_print(s, s->given->json ? lb_json_page(s->system, s->diagnostics, oscillate, s->text)
                                           : lb_text_page(s->system, oscillate, &layout, s->text));
}

/* The verdict could not be reached: show the page without it, then say why.  With
 * --json the object is the error alone. */
static int fail_verdict(session *s, const lb_error *why)
{
    lb_error error;
    lb_steady_options steady_options = {.seed = s->given->seed, .monitor = &s->monitor};
    lb_steady *steady = NULL;
    if (!s->given->json && !terminal_interrupted()
        && lb_steady_solve(s->system, &steady_options, &steady, &error) == LB_OK) {
        lb_oscillate without = {.states = lb_network_states(s->network),
                                .constants = lb_network_constants(s->network), .steady = steady};
        print(s, &without);
        lb_steady_free(steady);
    }
    return session_fail(s, why);
}

static bool is_interrupted(const lb_oscillate *oscillate)
{
    if (oscillate->steady && oscillate->steady->interrupted)
        return true;
    for (size_t i = 0; i < oscillate->count; i++)
        if (oscillate->answer[i].interrupted)
            return true;
    return false;
}

/* Where the constants given do not oscillate and there are ranges, a short search
 * of them.  LB_OK with *ranges NULL: there was nothing to ask. */
static lb_status search_ranges(session *s, const lb_oscillate *given, lb_oscillate **ranges, lb_error *error)
{
    enum { PAGE_SAMPLES = 100 };
    *ranges = NULL;
    if (!session_has_range(s) || is_interrupted(given) || given->count == 0 || given->answer[0].verdict == LB_OSCILLATES)
        return LB_OK;
    lb_oscillate_options options_of_ranges = {.ranges = true, .samples = PAGE_SAMPLES, .seed = s->given->seed,
                                              .monitor = &s->monitor};
    return lb_oscillate_solve(s->system, &options_of_ranges, ranges, error);
}

/* Both answers on one page. */
static int show(session *s, const lb_oscillate *given, const lb_oscillate *ranges)
{
    lb_oscillate_answer answers[2];
    lb_oscillate both = *given;
    if (ranges && ranges->count > 0 && given->count > 0) {
        answers[0] = given->answer[0];
        answers[1] = ranges->answer[0];
        both.answer = answers;
        both.count = 2;
    }
    int result = print(s, &both);
    if (is_interrupted(&both) && result == EXIT_ANSWERED) {
        session_note_interrupted(s);
        result = EXIT_INTERRUPTED;
    }
    return result;
}

static int solve(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_oscillate_options options_given = {.given = true, .seed = s->given->seed, .monitor = &s->monitor};
    lb_oscillate *given = NULL, *ranges = NULL;
    if (lb_oscillate_solve(s->system, &options_given, &given, &error) != LB_OK)
        return fail_verdict(s, &error);
    int result;
    if (search_ranges(s, given, &ranges, &error) == LB_OK) {
        result = show(s, given, ranges);
    } else {
        if (!s->given->json)
            print(s, given);
        result = session_fail(s, &error);
    }
    lb_oscillate_free(ranges);
    lb_oscillate_free(given);
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

static const option_spec own[] = {OPTION_NATIVE_SPEC};

const command command_page = {
    .name = "",
    .usage = "FILE [options]",
    .summary = "the whole answer, one page: what it is, what it does, does it oscillate",
    .about = "One page for the notebook: what the mechanism is, what it conserves and how much\n"
             "of it there is, its steady states, and whether it oscillates, with the evidence:\n"
             "with the constants given, and, if it does not, somewhere in their ranges.\n",
    .examples = "  limbeck bath.mech\n"
                "  limbeck bath.mech --set '[B]=1.7'\n"
                "  limbeck bath.mech --json\n"
                "  limbeck - < bath.mech\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};
