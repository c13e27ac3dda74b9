/* limbeck steady: all steady states that a search finds, with their stability. */
#include <stdio.h>
#include <unistd.h>

#include "cli/session.h"

/* The constant of --along; -1 when there is none of that name, or it has no range. */
static int find_along(const session *s, lb_error *error)
{
    double low, high;
    bool is_logarithmic;
    int constant = lb_network_find_constant(s->network, s->given->along);
    *error = (lb_error){.code = constant < 0 ? LB_E_NAME : LB_E_ARG};
    if (constant < 0) {
        snprintf(error->message, sizeof error->message, "--along: there is no constant `%.80s`", s->given->along);
        snprintf(error->remedy, sizeof error->remedy, "`limbeck check` lists the constants");
        return -1;
    }
    if (!lb_network_range(s->network, constant, &low, &high, &is_logarithmic)) {
        snprintf(error->message, sizeof error->message, "--along: `%.80s` has no range in the file", s->given->along);
        snprintf(error->remedy, sizeof error->remedy, "give it one where it has its value: `in LOW .. HIGH`");
        return -1;
    }
    return constant;
}

static lb_status print(session *s, const lb_steady *steady, const lb_along *along)
{
    lb_layout layout = terminal_layout(STDOUT_FILENO);
    if (s->given->json)
        return lb_json_steady(s->system, s->diagnostics, steady, along, s->text);
    lb_status status = lb_text_steady(s->system, steady, &layout, s->text);
    return status == LB_OK && along ? lb_text_along(s->system, along, &layout, s->text) : status;
}

/* Steady states at the constants given, and special points along one where that is asked. */
static int solve(session *s)
{
    lb_error error = {.code = LB_OK};
    lb_steady_options steady_options = {
        .seed = s->given->seed, .sensitivities = s->given->sensitivities, .monitor = &s->monitor};
    lb_along_options along_options = {.seed = s->given->seed, .monitor = &s->monitor};
    lb_steady *steady = NULL;
    lb_along *along = NULL;
    int result;
    if (s->given->along && (along_options.constant = find_along(s, &error)) < 0)
        return session_fail_usage(s, &error);
    lb_status status = lb_steady_solve(s->system, &steady_options, &steady, &error);
    if (status == LB_OK && s->given->along)
        status = lb_along_solve(s->system, &along_options, &along, &error);
    if (status != LB_OK) {
        result = session_fail(s, &error);
    } else {
        result = session_print(s, print(s, steady, along));
        if ((steady->interrupted || (along && along->interrupted)) && result == EXIT_ANSWERED) {
            session_note_interrupted(s);
            result = EXIT_INTERRUPTED;
        }
    }
    lb_along_free(along);
    lb_steady_free(steady);
    return result;
}

static int run(const options *given)
{
    return session_answer(given, solve);
}

static const option_spec own[] = {
    {OPTION_ALONG, "--along", 0, "NAME", "folds and Hopf points in the range of a constant"},
    {OPTION_SENSITIVITIES, "--sensitivities", 0, NULL, "how each state and its leading eigenvalue move with each constant"},
    OPTION_NATIVE_SPEC,
};

const command command_steady = {
    .name = "steady",
    .usage = "steady FILE [options]",
    .summary = "steady states, eigenvalues, stability, relaxation times",
    .about = "Search for every steady state that has the conserved totals of the initial\n"
             "state, and say of each what kind it is and how fast it relaxes. Eigenvalues are\n"
             "those of the reaction space. A search can miss a state; none is claimed missing.\n"
             "With --along NAME the states are also followed through the range of a constant,\n"
             "and the folds and Hopf points on the way are located.\n",
    .examples = "  limbeck steady bath.mech\n"
                "  limbeck steady bath.mech --set '[B]=1.7'\n"
                "  limbeck steady bath.mech --along k3\n"
                "  limbeck steady bath.mech --sensitivities\n"
                "  limbeck steady bath.mech --json\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};
