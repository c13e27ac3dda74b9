/* Running another program.
 *
 * posix_spawn with a pipe for what is printed; the end of the pipe is the end of
 * the program.  It gets a process group of its own, so that a compiler's own
 * children end with it when the work is interrupted. */
#define _GNU_SOURCE     /* pipe2: descriptors that no other thread's child inherits */
#include "system/child.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "base/memory.h"

extern char **environ;

/* ---- Finding it --------------------------------------------------------------------- */

static bool is_program(const char *path)
{
    struct stat about;
    return stat(path, &about) == 0 && S_ISREG(about.st_mode) && access(path, X_OK) == 0;
}

char *child_find(const char *program)
{
    if (strchr(program, '/'))
        return program[0] == '/' && is_program(program) ? memory_text(program) : NULL;
    const char *folders = getenv("PATH");
    while (folders && *folders) {
        size_t length = strcspn(folders, ":");
        buffer path;
        buffer_init(&path);
        buffer_append_n(&path, folders, length);
        buffer_char(&path, '/');
        buffer_append(&path, program);
        if (folders[0] == '/' && is_program(buffer_get(&path)))
            return buffer_take(&path);
        buffer_clear(&path);
        folders += length;
        folders += *folders == ':';
    }
    return NULL;
}

/* ---- Running it ------------------------------------------------------------------------ */

/* Start it with its output into the pipe; 0 or an error number. */
static int start(char *const argv[], int write_end, pid_t *child)
{
    posix_spawn_file_actions_t actions;
    posix_spawnattr_t attributes;
    if (posix_spawn_file_actions_init(&actions) != 0)
        return ENOMEM;
    if (posix_spawnattr_init(&attributes) != 0) {
        posix_spawn_file_actions_destroy(&actions);
        return ENOMEM;
    }
    int failed = posix_spawn_file_actions_addopen(&actions, STDIN_FILENO, "/dev/null", O_RDONLY, 0);
    if (!failed)
        failed = posix_spawn_file_actions_adddup2(&actions, write_end, STDOUT_FILENO);
    if (!failed)
        failed = posix_spawn_file_actions_adddup2(&actions, write_end, STDERR_FILENO);
    if (!failed)
        failed = posix_spawnattr_setflags(&attributes, POSIX_SPAWN_SETPGROUP);
    if (!failed)
        failed = posix_spawn(child, argv[0], &actions, &attributes, argv, environ);
    posix_spawnattr_destroy(&attributes);
    posix_spawn_file_actions_destroy(&actions);
    return failed;
}

/* Read until the other end is closed; false when the monitor asked to stop. */
static bool read_output(int read_end, const lb_monitor *monitor, buffer *output)
{
    enum { WAIT_MS = 50 };
    char block[4096];
    for (;;) {
        struct pollfd waiting = {.fd = read_end, .events = POLLIN};
        int ready = poll(&waiting, 1, WAIT_MS);
        if (monitor && monitor->stop && monitor->stop(monitor->context))
            return false;
        if (ready <= 0)
            continue;
        ssize_t count = read(read_end, block, sizeof block);
        if (count == 0 || (count < 0 && errno != EINTR))
            return true;
        if (count > 0 && output->length + (size_t)count <= CHILD_OUTPUT)
            buffer_append_n(output, block, (size_t)count);
    }
}

lb_status child_run(char *const argv[], const lb_monitor *monitor, buffer *output)
{
    int ends[2], ending = 0;
    pid_t child;
    if (pipe2(ends, O_CLOEXEC) != 0)
        return LB_E_IO;
    int failed = start(argv, ends[1], &child);
    close(ends[1]);
    if (failed) {
        close(ends[0]);
        return LB_E_IO;
    }
    bool finished = read_output(ends[0], monitor, output);
    close(ends[0]);
    if (!finished)
        kill(-child, SIGKILL);
    pid_t ended;
    do
        ended = waitpid(child, &ending, 0);
    while (ended < 0 && errno == EINTR);
    if (!finished)
        return LB_E_STOPPED;
    return ended == child && WIFEXITED(ending) && WEXITSTATUS(ending) == 0 ? LB_OK : LB_E_IO;
}
