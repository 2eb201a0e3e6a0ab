/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/store/inner.h"
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <sys/sysmacros.h>
#include <unistd.h>

/* The folder is ours alone, so that nobody else can put a link where the lock will be written. */
static bool make_folder(char folder[64], struct fault *fault) {
    snprintf(folder, 64, "/tmp/evenhand-%u", (unsigned)getuid());
    struct stat there;
    if (mkdir(folder, 0700) != 0 && errno != EEXIST) {
        return fault_set(fault, FAULT_SYSTEM,
            "%s, the folder for locks, cannot be made (%s); see to /tmp and try again",
            folder, strerror(errno));
    }
    if (lstat(folder, &there) != 0 || !S_ISDIR(there.st_mode) || there.st_uid != getuid() || there.st_mode & 077) {
        return fault_set(fault, FAULT_SYSTEM, "%s, the folder for locks, is not a folder of this account alone; remove "
            "it and try again", folder);
    }
    return true;
}

static bool refuse_held(const char *path, int file, struct fault *fault) {
    char holder[32];
    ssize_t length = pread(file, holder, sizeof holder - 1, 0);
    holder[length > 0 ? length : 0] = '\0';
    return fault_set(fault, FAULT_REFUSED, "%s is open already in another Evenhand (process %s); use its page, or "
        "close it and try again", path, *holder ? holder : "unknown");
}

/* The system lets go of the lock when the process ends, however it ends. */
int store_lock_take(const char *path, struct fault *fault) {
    char folder[64], name[160], holder[32];
    struct stat there;
    if (stat(path, &there) != 0) {
        fault_set(fault, FAULT_MISSING, "%s cannot be reached (%s); check the name", path, strerror(errno));
        return -1;
    }
    if (!make_folder(folder, fault)) {
        return -1;
    }
    snprintf(name, sizeof name, "%s/%u-%u-%llu.lock", folder, major(there.st_dev), minor(there.st_dev),
        (unsigned long long)there.st_ino);
    int file = open(name, O_RDWR | O_CREAT | O_CLOEXEC | O_NOFOLLOW, 0600);
    if (file < 0) {
        fault_set(fault, FAULT_SYSTEM, "%s, the lock on %s, cannot be made (%s); see to /tmp and try again", name, path,
            strerror(errno));
        return -1;
    }
    if (flock(file, LOCK_EX | LOCK_NB) != 0) {
        refuse_held(path, file, fault);
        close(file);
        return -1;
    }
    int length = snprintf(holder, sizeof holder, "%ld", (long)getpid());
    /* Only a courtesy to the next reader: the lock holds without it. */
    if (ftruncate(file, 0) != 0 || pwrite(file, holder, (size_t)length, 0) != length) {
        ftruncate(file, 0);
    }
    return file;
}

bool store_lock(const char *path, struct fault *fault) {
    return store_lock_take(path, fault) >= 0; /* the descriptor stays open on purpose */
}

void store_unlock(int lock) {
    close(lock);
}
