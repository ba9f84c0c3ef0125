#include "base/file.h"

#include "base/grow.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static enum wa_status read_all(int descriptor, const char *path, size_t limit, char **bytes,
                               size_t *size, struct wa_error *error)
{
    char *buffer = NULL;
    size_t capacity = 0;
    size_t length = 0;
    for (;;) {
        if (!wa_grow(&buffer, &capacity, length + 65537, 1)) {
            free(buffer);
            return wa_fail_memory(error);
        }
        ssize_t got = read(descriptor, buffer + length, capacity - length - 1);
        if (got < 0 && errno == EINTR) {
            continue;
        }
        if (got < 0) {
            int reason = errno;
            free(buffer);
            return wa_fail(error, WA_ERROR_FILE, path, 0, "The file cannot be read: %s.",
                           strerror(reason));
        }
        if (got == 0) {
            break;
        }
        length += (size_t)got;
        if (length > limit) {
            free(buffer);
            return wa_fail(error, WA_ERROR_INPUT, path, 0,
                           "The file is larger than %zu MB, which no file of this kind is; check "
                           "that the right file was given.",
                           limit >> 20);
        }
    }
    buffer[length] = '\0';
    *bytes = buffer;
    *size = length;
    return WA_OK;
}

enum wa_status wa_file_read(const char *path, size_t limit, char **bytes, size_t *size,
                            struct wa_error *error)
{
    if (strcmp(path, "-") == 0) {
        return read_all(STDIN_FILENO, "standard input", limit, bytes, size, error);
    }
    int descriptor = open(path, O_RDONLY | O_CLOEXEC);
    struct stat about;
    if (descriptor < 0 || fstat(descriptor, &about) != 0) {
        int reason = errno;
        if (descriptor >= 0) {
            close(descriptor);
        }
        return wa_fail(error, WA_ERROR_FILE, path, 0, "The file cannot be opened: %s.",
                       strerror(reason));
    }
    enum wa_status status;
    if (S_ISDIR(about.st_mode)) {
        status = wa_fail(error, WA_ERROR_INPUT, path, 0, "This is a folder; name a file in it.");
    } else if (S_ISREG(about.st_mode) && about.st_size > 0 && (size_t)about.st_size > limit) {
        status = wa_fail(error, WA_ERROR_INPUT, path, 0,
                         "The file is larger than %zu MB, which no file of this kind is; check "
                         "that the right file was given.",
                         limit >> 20);
    } else {
        status = read_all(descriptor, path, limit, bytes, size, error);
    }
    close(descriptor);
    return status;
}

static int write_all(int descriptor, const char *bytes, size_t size)
{
    while (size > 0) {
        ssize_t written = write(descriptor, bytes, size);
        if (written < 0 && errno == EINTR) {
            continue;
        }
        if (written < 0) {
            return -1;
        }
        bytes += written;
        size -= (size_t)written;
    }
    return 0;
}

static enum wa_status fail_write(struct wa_error *error, const char *path, int reason)
{
    return wa_fail(error, WA_ERROR_FILE, path, 0, "The file cannot be written: %s.",
                   strerror(reason));
}

static enum wa_status write_directly(const char *path, const char *bytes, size_t size,
                                     struct wa_error *error)
{
    int descriptor = open(path, O_WRONLY | O_CLOEXEC);
    if (descriptor < 0) {
        return fail_write(error, path, errno);
    }
    int failed = write_all(descriptor, bytes, size) != 0 ? errno : 0;
    if (close(descriptor) != 0 && failed == 0) {
        failed = errno;
    }
    return failed != 0 ? fail_write(error, path, failed) : WA_OK;
}

/* The rename itself reaches the disk only with its folder. */
static void sync_folder_of(const char *path)
{
    char folder[4096];
    snprintf(folder, sizeof folder, "%s", path);
    char *slash = strrchr(folder, '/');
    if (slash == NULL) {
        snprintf(folder, sizeof folder, ".");
    } else {
        slash[slash == folder ? 1 : 0] = '\0';
    }
    int descriptor = open(folder, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (descriptor >= 0) {
        (void)fsync(descriptor);
        close(descriptor);
    }
}

enum wa_status wa_file_write(const char *path, const char *bytes, size_t size,
                             struct wa_error *error)
{
    struct stat about;
    bool exists = stat(path, &about) == 0;
    if (exists && !S_ISREG(about.st_mode)) {
        return write_directly(path, bytes, size, error);
    }
    char beside[4096];
    int length = snprintf(beside, sizeof beside, "%s.XXXXXX", path);
    if (length < 0 || (size_t)length >= sizeof beside) {
        return fail_write(error, path, ENAMETOOLONG);
    }
    int descriptor = mkstemp(beside);
    if (descriptor < 0) {
        return fail_write(error, path, errno);
    }
    mode_t mask = umask(0);
    umask(mask);
    int failed = fchmod(descriptor, exists ? about.st_mode & 0777 : 0666 & ~mask) != 0 ||
                         write_all(descriptor, bytes, size) != 0 || fsync(descriptor) != 0
                     ? errno
                     : 0;
    if (close(descriptor) != 0 && failed == 0) {
        failed = errno;
    }
    if (failed == 0 && rename(beside, path) != 0) {
        failed = errno;
    }
    if (failed != 0) {
        unlink(beside);
        return fail_write(error, path, failed);
    }
    sync_folder_of(path);
    return WA_OK;
}
