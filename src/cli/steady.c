/* limbeck steady: all steady states that a search finds, with their stability. */
#include <unistd.h>

#include "cli/session.h"

static int solve(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_steady_options steady_options = {
        .seed = s->given->seed, .sensitivities = s->given->sensitivities, .monitor = &s->monitor};
    lb_steady *steady = NULL;
    if (lb_steady_solve(s->system, &steady_options, &steady, &error) != LB_OK)
        return session_fail(s, &error);
    lb_layout layout = terminal_layout(STDOUT_FILENO);
    int result = session_print(s, s->given->json ? lb_json_steady(s->system, s->diagnostics, steady, s->text)
                                                 : lb_text_steady(s->system, steady, &layout, s->text));
    if (steady->interrupted && result == EXIT_ANSWERED) {
        session_note_interrupted(s);
        result = EXIT_INTERRUPTED;
    }
    lb_steady_free(steady);
    return result;
}

static int run(const options *given)
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

static const option_spec own[] = {
    {OPTION_SENSITIVITIES, "--sensitivities", 0, NULL, "how each state and its leading eigenvalue move with each constant"},
    OPTION_NATIVE_SPEC,
};

const command command_steady = {
    .name = "steady",
    .usage = "steady FILE [options]",
    .summary = "steady states, eigenvalues, stability, relaxation times",
    .about = "Search for every steady state that has the conserved totals of the initial\n"
             "state, and say of each what kind it is and how fast it relaxes. Eigenvalues are\n"
             "those of the reaction space. A search can miss a state; none is claimed missing.\n",
    .examples = "  limbeck steady bath.mech\n"
                "  limbeck steady bath.mech --set '[B]=1.7'\n"
                "  limbeck steady bath.mech --sensitivities\n"
                "  limbeck steady bath.mech --json\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};
