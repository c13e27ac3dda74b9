/* limbeck check: what was understood of a mechanism, and what is wrong with it. */
#include <unistd.h>

#include "cli/session.h"

static int run(const options *given)
{
    session s;
    int result = session_open(&s, given);
    if (result == EXIT_ANSWERED) {
        lb_layout layout = terminal_layout(STDOUT_FILENO);
        result = session_print(&s, given->json ? lb_json_check(s.network, s.diagnostics, s.text)
                                               : lb_text_check(s.network, &layout, s.text));
        session_warn(&s);
    }
    session_close(&s);
    return result;
}

const command command_check = {
    .name = "check",
    .usage = "check FILE [options]",
    .summary = "read it, balance it, check the units; every fault with its place",
    .about = "Read the mechanism and show what was understood: species with their roles,\n"
             "constants with values, units and ranges, reactions with their rates. Faults and\n"
             "warnings go to standard error, each with line, column and what to write instead.\n",
    .examples = "  limbeck check bath.mech\n"
                "  limbeck check bath.mech --set k2=0.1 --set '[A]=2'\n"
                "  limbeck check bath.mech --json\n",
    .run = run,
};
