/* Help and version, made from the table of commands. */
#include "cli/help.h"

#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "cli/terminal.h"

enum { OPTION_COLUMNS = 24, PLAIN_WIDTH = 80, LEAST_WIDTH = 50 };

/* Columns of the page; very narrow ones would leave no room beside the options. */
static int page_width(void)
{
    int width = terminal_layout(STDOUT_FILENO).width;
    return width <= 0 ? PLAIN_WIDTH : width < LEAST_WIDTH ? LEAST_WIDTH : width;
}

static void print_bold(const char *text)
{
    if (terminal_layout(STDOUT_FILENO).colour)
        printf("\033[1m%s\033[0m\n", text);
    else
        printf("%s\n", text);
}

/* Words from column `indent` on, the first line continued where the cursor is;
 * a line end in the text is a blank. */
static void print_wrapped(const char *text, int indent)
{
    const int width = page_width();
    int used = indent;
    bool is_first = true;
    while (*text) {
        int length = (int)strcspn(text, " \n");
        if (!is_first && used + 1 + length > width) {
            printf("\n%*s", indent, "");
            used = indent;
            is_first = true;
        }
        printf("%s%.*s", is_first ? "" : " ", length, text);
        used += length + !is_first;
        is_first = false;
        text += length;
        text += strspn(text, " \n");
    }
    printf("\n");
}

static void print_option(const option_spec *option)
{
    char head[80];
    snprintf(head, sizeof head, "%s%c%s%s%s%s", option->letter ? "-" : "", option->letter ? option->letter : ' ',
             option->letter ? ", " : "   ", option->name, option->value ? " " : "", option->value ? option->value : "");
    printf("  %-*s", OPTION_COLUMNS, head);
    if (strlen(head) >= OPTION_COLUMNS)
        printf("\n  %*s", OPTION_COLUMNS, "");
    print_wrapped(option->help, OPTION_COLUMNS + 2);
}

static int finish(void)
{
    if (fflush(stdout) == 0 && !ferror(stdout))
        return EXIT_ANSWERED;
    fprintf(stderr, "limbeck: standard output cannot be written\n");
    return EXIT_NOT_COMPLETED;
}

int help_command(const command *c)
{
    size_t count;
    const option_spec *common = options_common(&count);
    printf("limbeck %s\n\n", c->usage);
    print_wrapped(c->about, 0);
    printf("\n");
    print_bold("Options");
    for (size_t i = 0; i < c->own_count; i++)
        print_option(&c->own[i]);
    for (size_t i = 0; i < count; i++)
        print_option(&common[i]);
    printf("\n");
    print_bold("Examples");
    printf("%s", c->examples);
    return finish();
}

int help_overview(void)
{
    size_t count;
    const command *const *list = command_list(&count);
    printf("limbeck: a reaction mechanism goes in as text, its dynamics come out\n\n");
    print_bold("Commands");
    for (size_t i = 0; i < count; i++) {
        printf("  limbeck %-16s", *list[i]->name ? list[i]->name : "FILE");
        print_wrapped(list[i]->summary, 26);
    }
    printf("  limbeck %-16sthe options of a command, with examples\n", "help COMMAND");
    printf("  limbeck %-16sthe version\n\n", "--version");
    print_bold("Options of every command");
    const option_spec *common = options_common(&count);
    for (size_t i = 0; i < count; i++)
        print_option(&common[i]);
    printf("\n");
    print_wrapped("FILE is a mechanism (.mech), or - for standard input. Options may stand before or after it, "
                  "`--until 60` and `--until=60` are the same, and `--` ends them.", 0);
    printf("\n");
    print_bold("Exit status");
    printf("  0  answered\n"
           "  1  the analysis could not be completed; the message says why\n"
           "  2  wrong usage\n"
           "  3  faults in the mechanism\n"
           "  130  interrupted; what was found until then is shown\n\n");
    print_bold("Example");
    printf("  $ cat brusselator.mech\n"
           "  units none\n"
           "  [A] = 1\n"
           "  [B] = 3\n"
           "  [X]0 = 1.2\n"
           "  [Y]0 = 3\n"
           "  A -> X,          k = 1\n"
           "  2 X + Y -> 3 X,  k = 1\n"
           "  B + X -> Y + D,  k = 1\n"
           "  X -> E,          k = 1\n"
           "  $ limbeck brusselator.mech\n");
    return finish();
}

int help_version(void)
{
    printf("limbeck %s\n"
           "Licence: GNU GPL, version 3 or later. The C that `limbeck emit` writes is yours,\n"
           "under any terms. There is no warranty.\n",
           LB_VERSION);
    return finish();
}
