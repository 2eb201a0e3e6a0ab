/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <errno.h>
#include <fcntl.h>
#include <libgen.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

bool newfile_refuse_existing(const char *path, struct fault *fault) {
    return fault_set(fault, FAULT_REFUSED,
        "%s is there already and stays as it is; choose another name or move it away",
        path);
}

static bool refuse(const char *path, int error, struct fault *fault) {
    return fault_set(fault, FAULT_SYSTEM, "%s could not be written (%s) and nothing was left behind; see to the folder "
        "or the disk and try again", path, strerror(error));
}

static bool write_all(int file, const char *bytes, size_t length) {
    while (length) {
        ssize_t written = write(file, bytes, length);
        if (written < 0 && errno != EINTR) {
            return false;
        }
        bytes += written > 0 ? written : 0;
        length -= written > 0 ? (size_t)written : 0;
    }
    return fsync(file) == 0;
}

/* A file with no name until it is whole: a kill at any moment leaves nothing. */
static bool write_nameless(int file, const char *path, const void *bytes, size_t length) {
    char self[64];
    snprintf(self, sizeof self, "/proc/self/fd/%d", file);
    return write_all(file, bytes, length) && linkat(AT_FDCWD, self, AT_FDCWD, path, AT_SYMLINK_FOLLOW) == 0;
}

/* For file systems without nameless files (network shares, memory sticks): a hidden name first, then the right one.
 * RENAME_NOREPLACE where there are no hard links either. */
static bool write_hidden(const char *folder, const char *path, const void *bytes, size_t length) {
    struct text hidden;
    text_init(&hidden);
    text_format(&hidden, "%s/.evenhand-XXXXXX", folder);
    int file = mkostemp(hidden.data, O_CLOEXEC);
    mode_t mask = umask(0);
    umask(mask);
    bool done = file >= 0 && fchmod(file, 0666 & ~mask) == 0 && write_all(file, bytes, length);
    if (done && link(hidden.data, path) != 0) {
        done = errno != EEXIST && renameat2(AT_FDCWD, hidden.data, AT_FDCWD, path, RENAME_NOREPLACE) == 0;
    }
    int error = errno;
    if (file >= 0) {
        close(file);
        unlink(hidden.data);
    }
    text_release(&hidden);
    errno = error;
    return done;
}

static void sync_folder(const char *folder) {
    int file = open(folder, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (file >= 0) {
        fsync(file); /* some file systems cannot: then the name is as safe as they make it */
        close(file);
    }
}

static bool is_without_nameless(int error) {
    return error == EOPNOTSUPP || error == EISDIR || error == EINVAL || error == ENOENT;
}

bool newfile_write(const char *path, const void *bytes, size_t length, struct fault *fault) {
    char *copy = memory_text(path);
    const char *folder = dirname(copy);
    int file = open(folder, O_TMPFILE | O_WRONLY | O_CLOEXEC, 0666);
    bool done = file >= 0 && write_nameless(file, path, bytes, length);
    int error = done ? 0 : errno;
    if (file >= 0) {
        close(file);
    }
    if (!done && is_without_nameless(error)) {
        done = write_hidden(folder, path, bytes, length);
        error = done ? 0 : errno;
    }
    if (done) {
        sync_folder(folder);
    }
    memory_free(copy);
    return done || (error == EEXIST ? newfile_refuse_existing(path, fault) : refuse(path, error, fault));
}
