/* Files, whole or not at all. The one idea: the new content is written and synchronised beside the old file and takes its
 * name in one step, so a reader, a full disk or an interrupt never meets half a file. Every return value counts, that of
 * close() too: a full disk may show only there. */
#include "lang/file.h"

#include <errno.h>
#include <fcntl.h>
#include <limits.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "engine/base/engine.h"

static bool refuse(text *why, const char *what, const char *path, const char *reason)
{
    text_addf(why, "cannot %s \"%s\": %s", what, path, reason);
    return false;
}

static bool refuse_errno(text *why, const char *what, const char *path)
{
    return refuse(why, what, path, strerror(errno));
}

bool file_exists(const char *path)
{
    return access(path, F_OK) == 0;
}

char *file_folder(const char *path)
{
    char *folder = base_copy(path);
    char *slash = strrchr(folder, '/');
    if (slash) slash[1] = '\0';
    else folder[0] = '\0';
    return folder;
}

bool file_make_folders(const char *path)
{
    char *way = base_copy(path);
    bool good = true;
    for (char *p = way + 1; good && *p; p++) {
        if (*p != '/') continue;
        *p = '\0';
        good = mkdir(way, 0700) == 0 || errno == EEXIST;
        *p = '/';
    }
    free(way);
    return good;
}

/* ---- reading ---- */

static bool read_all(int fd, text *out)
{
    char piece[65536];
    for (;;) {
        ssize_t got = read(fd, piece, sizeof piece);
        if (got == 0) return true;
        if (got < 0) {
            if (errno == EINTR) continue;
            return false;
        }
        text_add_bytes(out, piece, (size_t)got);
    }
}

bool file_read(const char *path, text *out, text *why)
{
    int fd = open(path, O_RDONLY | O_CLOEXEC);
    if (fd < 0) return refuse_errno(why, "read", path);
    size_t length = out->length;
    bool good = read_all(fd, out);
    if (!good) {
        refuse_errno(why, "read", path);
        text_cut(out, length);
    }
    close(fd);
    return good;
}

/* ---- writing ---- */

static bool write_all(int fd, const char *bytes, size_t length)
{
    while (length > 0) {
        ssize_t put = write(fd, bytes, length);
        if (put < 0) {
            if (errno == EINTR) continue;
            return false;
        }
        bytes += put;
        length -= (size_t)put;
    }
    return true;
}

static bool write_straight(const char *path, const char *bytes, size_t length, text *why)
{
    int fd = open(path, O_WRONLY | O_CLOEXEC);
    if (fd < 0) return refuse_errno(why, "write", path);
    bool good = write_all(fd, bytes, length);
    if (!good) refuse_errno(why, "write", path);
    if (close(fd) != 0 && good) good = refuse_errno(why, "write", path);
    return good;
}

/* The rights the new file shall have: those of the file it replaces, else what the umask leaves of 0666. */
static mode_t mode_for(const struct stat *old)
{
    if (old) return old->st_mode & 0777;
    mode_t mask = umask(0);
    umask(mask);
    return 0666 & ~mask;
}

static bool fill_beside(const char *beside, int fd, mode_t mode, const char *bytes, size_t length)
{
    bool good = fchmod(fd, mode) == 0 && write_all(fd, bytes, length) && fsync(fd) == 0;
    int trouble = errno;
    if (close(fd) != 0 && good) {
        trouble = errno;
        good = false;
    }
    if (!good) unlink(beside);
    errno = trouble;
    return good;
}

/* The name in its folder is on the disk only when the folder is; a file system that cannot do this does not matter. */
static void sync_folder(const char *path)
{
    char *folder = file_folder(path);
    int fd = open(*folder ? folder : ".", O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    free(folder);
    if (fd < 0) return;
    (void)fsync(fd);
    close(fd);
}

bool file_write(const char *path, const char *bytes, size_t length, text *why)
{
    struct stat old;
    bool there = stat(path, &old) == 0;
    if (there && S_ISDIR(old.st_mode)) return refuse(why, "write", path, "it is a directory");
    if (there && !S_ISREG(old.st_mode)) return write_straight(path, bytes, length, why);
    if (there && access(path, W_OK) != 0) return refuse_errno(why, "write", path);
    if (!*path) return refuse(why, "write", path, "the name is empty");

    char *real = there ? realpath(path, NULL) : NULL; /* so that a link stays a link */
    const char *target = real ? real : path;
    text beside;
    text_init(&beside);
    text_addf(&beside, "%s.XXXXXX", target);
    int fd = mkostemp(beside.bytes, O_CLOEXEC);
    bool good = fd >= 0 && fill_beside(beside.bytes, fd, mode_for(there ? &old : NULL), bytes, length);
    if (good && rename(beside.bytes, target) != 0) {
        int trouble = errno;
        unlink(beside.bytes);
        errno = trouble;
        good = false;
    }
    if (!good) refuse_errno(why, "write", path);
    else sync_folder(target);
    text_clear(&beside);
    free(real);
    return good;
}
