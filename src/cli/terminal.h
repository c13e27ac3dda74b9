/* The terminal: its width and colours, progress, and Ctrl-C. */
#ifndef LIMBECK_CLI_TERMINAL_H
#define LIMBECK_CLI_TERMINAL_H

#include <stdbool.h>

#include "limbeck.h"

/* Width and colour of what is written to a descriptor: colour only on a terminal
 * and never under NO_COLOR; the width of COLUMNS or of the terminal, else 80. */
lb_layout terminal_layout(int descriptor);

/* From now on Ctrl-C sets a flag that terminal_interrupted reads; a second one
 * ends the program.  A closed pipe makes writes fail instead of killing. */
void terminal_catch_signals(void);
bool terminal_interrupted(void);

/* Shows how far long work is, on standard error. */
typedef struct terminal_progress {
    bool is_shown;          /* standard error is a terminal, and nobody said --quiet */
    bool has_line;          /* something stands on the line */
    double started, last;   /* seconds of the monotonic clock */
} terminal_progress;

/* A monitor that stops on Ctrl-C and shows progress; borrows `progress`. */
lb_monitor terminal_monitor(terminal_progress *progress, bool quiet);
/* Wipe the line of progress. */
void terminal_done(terminal_progress *progress);

#endif
