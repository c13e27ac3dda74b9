/* limbeck oscillate: does it oscillate, with its evidence. */
#include <string.h>
#include <unistd.h>

#include "cli/files.h"
#include "cli/session.h"

/* The first answer with a witness; NULL when there is none. */
static const lb_oscillate_answer *find_witness(const lb_oscillate *oscillate)
{
    for (size_t i = 0; i < oscillate->count; i++)
        if (oscillate->answer[i].witness)
            return &oscillate->answer[i];
    return NULL;
}

/* The witness to the file of -o. */
static lb_status save_witness(const session *s, const lb_oscillate *oscillate, lb_error *error)
{
    const lb_oscillate_answer *answer = find_witness(oscillate);
    if (!s->given->output)
        return LB_OK;
    if (!answer) {
        session_note(s, "no witness was found, so %s was not written", s->given->output);
        return LB_OK;
    }
    lb_status status = files_write(s->given->output, answer->witness, strlen(answer->witness), error);
    if (status == LB_OK)
        session_note(s, "the witness for the scope `%s` to %s", lb_scope_text(answer->scope), s->given->output);
    return status;
}

static bool is_interrupted(const lb_oscillate *oscillate)
{
    for (size_t i = 0; i < oscillate->count; i++)
        if (oscillate->answer[i].interrupted)
            return true;
    return false;
}

static int show(session *s, const lb_oscillate *oscillate)
{
    lb_error error;
    if (save_witness(s, oscillate, &error) != LB_OK)
        return session_fail(s, &error);
    lb_layout layout = terminal_layout(STDOUT_FILENO);
    int result = session_print(s, s->given->json ? lb_json_oscillate(s->system, s->diagnostics, oscillate, s->text)
                                                 : lb_text_oscillate(s->system, oscillate, &layout, s->text));
    if (is_interrupted(oscillate) && result == EXIT_ANSWERED) {
        session_note_interrupted(s);
        result = EXIT_INTERRUPTED;
    }
    return result;
}

static int solve(session *s)
{
    const options *given = s->given;
    lb_error error = {.code = LB_OK};
    if (!given->given && !session_has_range(s)) {
        error = (lb_error){.code = LB_E_ARG,
                           .message = "no constant of this mechanism has a range to search",
                           .remedy = "give a constant one: `k2 = 1 s^-1 in 0.1 .. 10`"};
        return session_fail_usage(s, &error);
    }
    lb_oscillate_options oscillate_options = {
        .given = given->given, .ranges = given->ranges, .samples = given->samples,
        .seconds = given->seconds, .seed = given->seed, .monitor = &s->monitor,
    };
    lb_oscillate *oscillate = NULL;
    if (lb_oscillate_solve(s->system, &oscillate_options, &oscillate, &error) != LB_OK)
        return session_fail(s, &error);
    terminal_done(&s->progress);
    int result = show(s, oscillate);
    lb_oscillate_free(oscillate);
    return result;
}

static int run(const options *given)
{
    return session_answer(given, solve);
}

static const option_spec own[] = {
    {OPTION_SCOPE, "--scope", 0, "SCOPES",
     "given: the constants as they are; ranges: anywhere in their ranges; given,ranges (both that apply)"},
    {OPTION_SAMPLES, "--samples", 0, "N", "how many sets of constants to try in the ranges"},
    {OPTION_SECONDS, "--seconds", 0, "X", "stop the search after so long"},
    {OPTION_OUTPUT, "--output", 'o', "FILE", "write the witness, a mechanism that oscillates, to FILE"},
    OPTION_NATIVE_SPEC,
};

const command command_oscillate = {
    .name = "oscillate",
    .usage = "oscillate FILE [options]",
    .summary = "does it oscillate: verdict with its evidence, and a witness that runs",
    .about = "Say whether the mechanism oscillates, with its constants as given and anywhere in\n"
             "their ranges. \"Oscillates\" comes with a witness: constants and a closed orbit that\n"
             "anyone can run. \"Not found\" says how hard was searched, and excludes nothing.\n",
    .examples = "  limbeck oscillate bath.mech\n"
                "  limbeck oscillate bath.mech --scope ranges --samples 5000 -o witness.mech\n"
                "  limbeck run witness.mech --until 600 > witness.csv\n"
                "  limbeck oscillate bath.mech --json\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};
