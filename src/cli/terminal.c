/* The terminal: its width and colours, progress, and Ctrl-C.
 *
 * The signal handler does nothing but set a flag; analyses ask for it through
 * the monitor and stop where their results are whole. */
#include "cli/terminal.h"

#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <time.h>
#include <unistd.h>

static volatile sig_atomic_t interrupted;

static void note_interrupt(int number)
{
    (void)number;
    interrupted = 1;
}

void terminal_catch_signals(void)
{
    struct sigaction action;
    memset(&action, 0, sizeof action);
    sigemptyset(&action.sa_mask);
    action.sa_handler = note_interrupt;
    action.sa_flags = (int)SA_RESETHAND;
    sigaction(SIGINT, &action, NULL);
    action.sa_handler = SIG_IGN;
    action.sa_flags = 0;
    sigaction(SIGPIPE, &action, NULL);
}

bool terminal_interrupted(void)
{
    return interrupted != 0;
}

/* A whole number of columns from the environment; 0 where there is none. */
static int columns_from_environment(void)
{
    const char *text = getenv("COLUMNS");
    if (!text)
        return 0;
    char *end;
    long columns = strtol(text, &end, 10);
    return end != text && *end == '\0' && columns > 0 && columns <= 10000 ? (int)columns : 0;
}

lb_layout terminal_layout(int descriptor)
{
    lb_layout layout = {.width = columns_from_environment(), .colour = false};
    if (!isatty(descriptor))
        return layout;
    struct winsize size;
    if (layout.width == 0 && ioctl(descriptor, TIOCGWINSZ, &size) == 0)
        layout.width = size.ws_col;
    const char *no_colour = getenv("NO_COLOR"), *kind = getenv("TERM");
    layout.colour = !(no_colour && *no_colour) && kind && *kind && strcmp(kind, "dumb") != 0;
    return layout;
}

static double now(void)
{
    struct timespec time;
    clock_gettime(CLOCK_MONOTONIC, &time);
    return (double)time.tv_sec + 1e-9 * (double)time.tv_nsec;
}

/* At most ten times a second, and not before half a second of work. */
static void show(void *context, const char *what, double done)
{
    const double patience = 0.5, interval = 0.1;
    terminal_progress *progress = context;
    double time = now();
    if (!progress->is_shown || time - progress->started < patience || time - progress->last < interval)
        return;
    progress->last = time;
    progress->has_line = true;
    if (done >= 0 && done <= 1)
        fprintf(stderr, "\r\033[K%s: %.0f %%", what, 100 * done);
    else
        fprintf(stderr, "\r\033[K%s: %.0f s", what, time - progress->started);
}

/* Asked often, so this is also where work that says nothing shows that it goes on. */
static bool should_stop(void *context)
{
    const double silence = 1;
    terminal_progress *progress = context;
    if (progress->is_shown && now() - progress->last >= silence)
        show(progress, "working", -1);
    return terminal_interrupted();
}

lb_monitor terminal_monitor(terminal_progress *progress, bool quiet)
{
    const char *kind = getenv("TERM");
    *progress = (terminal_progress){
        .is_shown = !quiet && isatty(STDERR_FILENO) && kind && strcmp(kind, "dumb") != 0,
        .started = now(),
    };
    return (lb_monitor){.stop = should_stop, .progress = show, .context = progress};
}

void terminal_done(terminal_progress *progress)
{
    if (progress->has_line)
        fprintf(stderr, "\r\033[K");
    progress->has_line = false;
}
