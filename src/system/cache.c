/* The folder of compiled models.
 *
 * What is loaded from it runs with the user's rights, so that nobody else may
 * write there or replace a part of its path: the folder is the user's own with
 * mode 0700, and every folder above it belongs to the user or root and is
 * writable by others only with the sticky bit.  A file that was cut short or
 * changed by accident is found by its seal, the SHA-256 digest at its end. */
#define _XOPEN_SOURCE 700   /* realpath, the sticky bit */
#include "system/cache.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/memory.h"
#include "base/status.h"
#include "system/digest.h"

/* ---- The folder ---------------------------------------------------------------------- */

/* Where the user's caches are, in words of the environment; LB_E_IO when it does not say. */
static lb_status name_folder(const char *given, buffer *path, lb_error *err)
{
    const char *caches = getenv("XDG_CACHE_HOME"), *home = getenv("HOME");
    if (given) {
        buffer_append(path, given);
    } else if (getuid() != geteuid()) {
        return status_raise(err, LB_E_IO, "give the folder itself", "the cache folder is not taken from the environment in a "
                            "program that runs for another user");
    } else if (caches && caches[0] == '/') {
        buffer_append(path, caches);
        buffer_append(path, "/limbeck");
    } else if (home && home[0] == '/') {
        buffer_append(path, home);
        buffer_append(path, "/.cache/limbeck");
    } else {
        return status_raise(err, LB_E_IO, "set HOME or XDG_CACHE_HOME", "there is no folder for compiled models");
    }
    return buffer_status(path) == LB_OK ? LB_OK : status_no_memory(err);
}

/* Make what is missing of a path, the user's alone. */
static void make_folders(char *path)
{
    for (char *slash = strchr(path + 1, '/'); slash; slash = strchr(slash + 1, '/')) {
        *slash = '\0';
        mkdir(path, 0700);
        *slash = '/';
    }
    mkdir(path, 0700);
}

static lb_status check_folder(const char *path, lb_error *err)
{
    struct stat about;
    if (lstat(path, &about) != 0)
        return status_raise(err, LB_E_IO, NULL, "the cache folder %.300s cannot be made: %s", path, strerror(errno));
    if (!S_ISDIR(about.st_mode))
        return status_raise(err, LB_E_IO, "remove it", "the cache folder %.300s is %s", path,
                            S_ISLNK(about.st_mode) ? "a link" : "no folder");
    if (about.st_uid != geteuid())
        return status_raise(err, LB_E_IO, "remove it, or set XDG_CACHE_HOME", "the cache folder %.300s belongs to another user",
                            path);
    if ((about.st_mode & 0777) != 0700)
        return status_raise(err, LB_E_IO, "make it yours alone: chmod 700", "the cache folder %.300s is open to others (mode %o)",
                            path, (unsigned)(about.st_mode & 0777));
    return LB_OK;
}

/* Each folder above a real path. */
static lb_status check_above(const char *path, lb_error *err)
{
    lb_status status = LB_OK;
    char *above = memory_text(path);
    if (!above)
        return status_no_memory(err);
    while (status == LB_OK && strcmp(above, "/") != 0) {
        char *slash = strrchr(above, '/');
        slash[slash == above ? 1 : 0] = '\0';
        struct stat about;
        bool known = stat(above, &about) == 0;
        bool owned = known && (about.st_uid == geteuid() || about.st_uid == 0);
        if (!owned || ((about.st_mode & 022) != 0 && !(about.st_mode & S_ISVTX)))
            status = status_raise(err, LB_E_IO, "use another one: set XDG_CACHE_HOME",
                                  "others can replace the cache folder, since they may change %.300s", above);
    }
    memory_free(above);
    return status;
}

/* The path without links, dots and double slashes; a relative one from here. */
static lb_status resolve(const char *path, char **folder, lb_error *err)
{
    char *real = realpath(path, NULL);
    *folder = real ? memory_text(real) : NULL;
    lb_status status = *folder ? LB_OK : real ? status_no_memory(err) :
        status_raise(err, LB_E_IO, NULL, "the cache folder %.300s cannot be used: %s", path, strerror(errno));
    free(real);
    return status;
}

lb_status cache_open(const char *given, char **folder, lb_error *err)
{
    buffer named;
    *folder = NULL;
    buffer_init(&named);
    lb_status status = name_folder(given, &named, err);
    char *path = status == LB_OK ? buffer_take(&named) : NULL;
    buffer_clear(&named);
    for (size_t length = path ? strlen(path) : 0; length > 1 && path[length - 1] == '/'; length--)
        path[length - 1] = '\0';    /* lstat follows a link with a slash behind it */
    if (path) {
        make_folders(path);
        status = check_folder(path, err);
        if (status == LB_OK)
            status = resolve(path, folder, err);
        if (status == LB_OK)
            status = check_above(*folder, err);
        if (status != LB_OK) {
            memory_free(*folder);
            *folder = NULL;
        }
    }
    memory_free(path);
    return status;
}

/* ---- Files --------------------------------------------------------------------------------- */

bool cache_read(const char *path, buffer *bytes)
{
    struct stat about;
    char block[1 << 14];
    ssize_t count = -1;
    int file = open(path, O_RDONLY | O_NOFOLLOW | O_CLOEXEC | O_NONBLOCK);
    if (file < 0)
        return false;
    bool ours = fstat(file, &about) == 0 && S_ISREG(about.st_mode) && about.st_uid == geteuid() &&
                (about.st_mode & 022) == 0;
    while (ours && ((count = read(file, block, sizeof block)) > 0 || (count < 0 && errno == EINTR)))
        if (count > 0)
            buffer_append_n(bytes, block, (size_t)count);
    close(file);
    return ours && count == 0 && buffer_status(bytes) == LB_OK;
}

static bool write_bytes(int file, const char *bytes, size_t length)
{
    while (length > 0) {
        ssize_t count = write(file, bytes, length);
        if (count < 0 && errno != EINTR)
            return false;
        bytes += count > 0 ? count : 0;
        length -= count > 0 ? (size_t)count : 0;
    }
    return true;
}

bool cache_write(const char *path, const char *bytes, size_t length)
{
    int file = open(path, O_WRONLY | O_CREAT | O_EXCL | O_NOFOLLOW | O_CLOEXEC, 0600);
    if (file < 0)
        return false;
    bool done = write_bytes(file, bytes, length);
    done = close(file) == 0 && done;
    if (!done)
        unlink(path);
    return done;
}

/* ---- Seals ----------------------------------------------------------------------------------- */

static const char seal_mark[] = "\nlimbeck sha256 ";
enum { MARK = sizeof seal_mark - 1, SEAL = MARK + DIGEST_TEXT };

static void seal_of(const char *bytes, size_t length, char text[DIGEST_TEXT + 1])
{
    digest d;
    digest_init(&d);
    digest_add(&d, bytes, length);
    digest_finish(&d, text);
}

void cache_seal(buffer *bytes)
{
    char text[DIGEST_TEXT + 1];
    seal_of(buffer_get(bytes), bytes->length, text);
    buffer_append(bytes, seal_mark);
    buffer_append(bytes, text);
}

bool cache_is_whole(const buffer *bytes)
{
    char text[DIGEST_TEXT + 1];
    if (bytes->length <= SEAL)
        return false;
    size_t length = bytes->length - SEAL;
    const char *seal = bytes->data + length;
    seal_of(bytes->data, length, text);
    return memcmp(seal, seal_mark, MARK) == 0 && memcmp(seal + MARK, text, DIGEST_TEXT) == 0;
}

/* ---- Working folders ---------------------------------------------------------------------------- */

char *cache_begin_work(const char *folder)
{
    buffer path;
    buffer_init(&path);
    buffer_printf(&path, "%s/work-XXXXXX", folder);
    char *work = buffer_take(&path);
    if (work && !mkdtemp(work)) {
        memory_free(work);
        work = NULL;
    }
    return work;
}

void cache_end_work(char *work)
{
    DIR *directory = work ? opendir(work) : NULL;
    for (struct dirent *entry; directory && (entry = readdir(directory));)
        if (strcmp(entry->d_name, ".") != 0 && strcmp(entry->d_name, "..") != 0)
            unlinkat(dirfd(directory), entry->d_name, 0);
    if (directory)
        closedir(directory);
    if (work)
        rmdir(work);
    memory_free(work);
}
