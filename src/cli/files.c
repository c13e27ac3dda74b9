/* Writing files: beside the old one and renamed, so that a full disk, a kill or a
 * reader in between never meets half a file. */
#define _XOPEN_SOURCE 700 /* realpath */
#include "cli/files.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* "PATH: what: reason of errno" */
static lb_status fail(lb_error *err, lb_status code, const char *path, const char *what, int reason)
{
    if (err) {
        memset(err, 0, sizeof *err);
        err->code = code;
        snprintf(err->message, sizeof err->message, "%s %s: %s", path, what,
                 code == LB_E_NOMEM ? lb_status_text(code) : strerror(reason));
    }
    return code;
}

/* Zero, or the errno of the write that failed. */
static int write_all(int descriptor, const char *bytes, size_t length)
{
    while (length > 0) {
        ssize_t written = write(descriptor, bytes, length);
        if (written < 0 && errno == EINTR)
            continue;
        if (written < 0)
            return errno;
        bytes += written;
        length -= (size_t)written;
    }
    return 0;
}

lb_status files_print(int descriptor, const char *bytes, size_t length, lb_error *err)
{
    int reason = write_all(descriptor, bytes, length);
    const char *name = descriptor == STDOUT_FILENO ? "standard output" : "standard error";
    return reason ? fail(err, LB_E_IO, name, "cannot be written", reason) : LB_OK;
}

static mode_t creation_mode(void)
{
    mode_t mask = umask(0);
    umask(mask);
    return 0666 & ~mask;
}

/* Path with links followed, so that a link stays and its file is replaced; a
 * copy of path where there is no such file yet. */
static char *target_of(const char *path)
{
    char *target = realpath(path, NULL);
    return target ? target : strdup(path);
}

static lb_status write_in_place(const char *path, const char *bytes, size_t length, lb_error *err)
{
    int descriptor = open(path, O_WRONLY | O_CLOEXEC);
    if (descriptor < 0)
        return fail(err, LB_E_IO, path, "cannot be opened", errno);
    int reason = write_all(descriptor, bytes, length);
    if (close(descriptor) && !reason)
        reason = errno;
    return reason ? fail(err, LB_E_IO, path, "cannot be written", reason) : LB_OK;
}

static lb_status write_beside(pending_file *file, const char *bytes, size_t length, mode_t mode, lb_error *err)
{
    file->beside = files_join(NULL, file->path, ".XXXXXX");
    if (!file->beside)
        return fail(err, LB_E_NOMEM, file->path, "cannot be written", 0);
    int descriptor = mkstemp(file->beside);
    if (descriptor < 0) {
        int reason = errno;
        free(file->beside);
        file->beside = NULL;
        return fail(err, LB_E_IO, file->path, "cannot be written", reason);
    }
    int reason = write_all(descriptor, bytes, length);
    if (!reason && (fchmod(descriptor, mode) || fsync(descriptor)))
        reason = errno;
    if (close(descriptor) && !reason)
        reason = errno;
    return reason ? fail(err, LB_E_IO, file->path, "cannot be written", reason) : LB_OK;
}

lb_status files_prepare(const char *path, const char *bytes, size_t length, pending_file *file, lb_error *err)
{
    *file = (pending_file){0};
    struct stat info;
    bool exists = stat(path, &info) == 0;
    if (exists && S_ISDIR(info.st_mode))
        return fail(err, LB_E_IO, path, "cannot be written", EISDIR);
    if (exists && !S_ISREG(info.st_mode))
        return write_in_place(path, bytes, length, err);
    file->path = target_of(path);
    if (!file->path)
        return fail(err, LB_E_NOMEM, path, "cannot be written", 0);
    lb_status status = write_beside(file, bytes, length, exists ? info.st_mode & 07777 : creation_mode(), err);
    if (status != LB_OK)
        files_abandon(file);
    return status;
}

lb_status files_commit(pending_file *file, lb_error *err)
{
    if (!file->beside)
        return LB_OK;
    if (rename(file->beside, file->path)) {
        lb_status status = fail(err, LB_E_IO, file->path, "cannot be replaced", errno);
        files_abandon(file);
        return status;
    }
    free(file->beside);
    file->beside = NULL;
    files_abandon(file);
    return LB_OK;
}

void files_abandon(pending_file *file)
{
    if (file->beside)
        unlink(file->beside);
    free(file->beside);
    free(file->path);
    *file = (pending_file){0};
}

lb_status files_write(const char *path, const char *bytes, size_t length, lb_error *err)
{
    pending_file file;
    lb_status status = files_prepare(path, bytes, length, &file, err);
    return status == LB_OK ? files_commit(&file, err) : status;
}

/* One folder of a path; one that is there already is fine. */
static lb_status make_one(const char *path, lb_error *err)
{
    struct stat info;
    if (mkdir(path, 0777) == 0)
        return LB_OK;
    int reason = errno;
    if (stat(path, &info) == 0)
        return S_ISDIR(info.st_mode) ? LB_OK : fail(err, LB_E_IO, path, "is no folder", ENOTDIR);
    return fail(err, LB_E_IO, path, "cannot be made", reason);
}

lb_status files_make_folder(const char *path, lb_error *err)
{
    char *copy = strdup(path);
    if (!copy)
        return fail(err, LB_E_NOMEM, path, "cannot be made", 0);
    lb_status status = LB_OK;
    for (char *slash = strchr(copy + 1, '/'); slash && status == LB_OK; slash = strchr(slash + 1, '/')) {
        *slash = '\0';
        status = make_one(copy, err);
        *slash = '/';
    }
    if (status == LB_OK)
        status = make_one(copy, err);
    free(copy);
    return status;
}

char *files_join(const char *folder, const char *name, const char *suffix)
{
    const char *slash = folder && *folder && folder[strlen(folder) - 1] != '/' ? "/" : "";
    folder = folder ? folder : "";
    size_t size = strlen(folder) + strlen(name) + strlen(suffix) + 2;
    char *path = malloc(size);
    if (path)
        snprintf(path, size, "%s%s%s%s", folder, slash, name, suffix);
    return path;
}

void files_guard_streams(void)
{
    /* Opened the wrong way round on purpose: using a stream that was closed fails. */
    static const int modes[] = {O_WRONLY, O_RDONLY, O_WRONLY};
    for (int descriptor = STDIN_FILENO; descriptor <= STDERR_FILENO; descriptor++)
        if (fcntl(descriptor, F_GETFD) < 0 && open("/dev/null", modes[descriptor]) < 0)
            return;
}
