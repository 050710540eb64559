/* SPDX-License-Identifier: GPL-2.0-or-later
 * A library to preload (LD_PRELOAD) into a program under test. It counts the calls by which the
 * program changes files, and makes one of them go wrong. Descriptors 0 to 2 are left alone;
 * calls go to the kernel directly.
 *
 *   FAULT_LOG=path    appends a line a call (number, name, bytes): nothing goes wrong
 *   FAULT_AT=k        the call that goes wrong, counted from 1
 *   FAULT_MODE=before    kills the process (SIGKILL) instead of making the call
 *             =half      kills it after half of a write, or after a call that is no write
 *             =once      lets call k fail with FAULT_ERRNO
 *             =from      lets call k and all that follow fail with FAULT_ERRNO
 *   FAULT_NO_EXCHANGE=1  lets renameat2 fail with EINVAL, as where it is not known
 */
#define _GNU_SOURCE
#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/syscall.h>
#include <sys/types.h>
#include <sys/uio.h>
#include <unistd.h>

static long counted = 0;

static const char* setting(const char* name) {
    const char* value = getenv(name);
    return value == NULL ? "" : value;
}

static void note(const char* name, size_t n_bytes) {
    const char* path = setting("FAULT_LOG");
    if (*path == '\0') return;
    char line[80];
    const int length = snprintf(line, sizeof line, "%ld %s %zu\n", counted, name, n_bytes);
    const long file = syscall(SYS_openat, AT_FDCWD, path, O_WRONLY | O_CREAT | O_APPEND, 0600);
    syscall(SYS_write, file, line, (size_t)length);
    syscall(SYS_close, file);
}

static void end_here(void) {
    syscall(SYS_kill, syscall(SYS_getpid), SIGKILL);
    for (;;) syscall(SYS_pause);
}

enum fate { goes_well, ends_halfway, fails };

/* Counts a call and says what is to become of it; errno is set where it fails. */
static enum fate fate_of(const char* name, size_t n_bytes) {
    const long number = __atomic_add_fetch(&counted, 1, __ATOMIC_SEQ_CST);
    note(name, n_bytes);
    const long chosen = atol(setting("FAULT_AT"));
    const char* mode = setting("FAULT_MODE");
    if (chosen == 0 || number < chosen) return goes_well;
    if (number > chosen && strcmp(mode, "from") != 0) return goes_well;
    if (strcmp(mode, "before") == 0) end_here();
    if (strcmp(mode, "half") == 0) return ends_halfway;
    errno = atoi(setting("FAULT_ERRNO"));
    return fails;
}

/* A call that is no write: fails, or is made, and is the last one where it was chosen. */
#define WHOLE_CALL(name, call)                   \
    do {                                         \
        const enum fate fate = fate_of(name, 0); \
        if (fate == fails) return -1;            \
        const long result = (call);              \
        if (fate == ends_halfway) end_here();    \
        return (int)result;                      \
    } while (0)

ssize_t write(int file, const void* bytes, size_t n_bytes) {
    if (file <= 2) return syscall(SYS_write, file, bytes, n_bytes);
    const enum fate fate = fate_of("write", n_bytes);
    if (fate == fails) return -1;
    if (fate == goes_well) return syscall(SYS_write, file, bytes, n_bytes);
    syscall(SYS_write, file, bytes, n_bytes / 2);
    end_here();
    return -1;
}

ssize_t pwrite(int file, const void* bytes, size_t n_bytes, off_t offset) {
    const enum fate fate = fate_of("pwrite", n_bytes);
    if (fate == fails) return -1;
    if (fate == goes_well) return syscall(SYS_pwrite64, file, bytes, n_bytes, offset);
    syscall(SYS_pwrite64, file, bytes, n_bytes / 2, offset);
    end_here();
    return -1;
}
ssize_t pwrite64(int file, const void* bytes, size_t n_bytes, off64_t offset) {
    return pwrite(file, bytes, n_bytes, offset);
}

/* Piece by piece: a writev may stop between two of them. */
ssize_t writev(int file, const struct iovec* piece, int n_pieces) {
    ssize_t total = 0;
    for (int k = 0; k < n_pieces; ++k) {
        const ssize_t n_written = write(file, piece[k].iov_base, piece[k].iov_len);
        if (n_written < 0) return total > 0 ? total : -1;
        total += n_written;
        if ((size_t)n_written < piece[k].iov_len) break;
    }
    return total;
}

int ftruncate(int file, off_t length) {
    WHOLE_CALL("ftruncate", syscall(SYS_ftruncate, file, length));
}
int ftruncate64(int file, off64_t length) {
    return ftruncate(file, length);
}
int fsync(int file) {
    WHOLE_CALL("fsync", syscall(SYS_fsync, file));
}
int fdatasync(int file) {
    WHOLE_CALL("fdatasync", syscall(SYS_fdatasync, file));
}
int rename(const char* from, const char* to) {
    WHOLE_CALL("rename", syscall(SYS_rename, from, to));
}
int renameat2(int from_folder, const char* from, int to_folder, const char* to, unsigned how) {
    if (*setting("FAULT_NO_EXCHANGE") != '\0') {
        errno = EINVAL;
        return -1;
    }
    WHOLE_CALL("renameat2", syscall(SYS_renameat2, from_folder, from, to_folder, to, how));
}
int link(const char* from, const char* to) {
    WHOLE_CALL("link", syscall(SYS_link, from, to));
}
int unlink(const char* path) {
    WHOLE_CALL("unlink", syscall(SYS_unlink, path));
}
int rmdir(const char* path) {
    WHOLE_CALL("rmdir", syscall(SYS_rmdir, path));
}
int mkdir(const char* path, mode_t mode) {
    WHOLE_CALL("mkdir", syscall(SYS_mkdir, path, mode));
}
static long removed(const char* path) {
    const long result = syscall(SYS_unlink, path);
    return result < 0 && errno == EISDIR ? syscall(SYS_rmdir, path) : result;
}
int remove(const char* path) {
    WHOLE_CALL("remove", removed(path));
}

static int opened(const char* path, int flags, mode_t mode) {
    if ((flags & O_CREAT) == 0) return (int)syscall(SYS_openat, AT_FDCWD, path, flags, mode);
    WHOLE_CALL("open", syscall(SYS_openat, AT_FDCWD, path, flags, mode));
}
int open(const char* path, int flags, ...) {
    va_list more;
    va_start(more, flags);
    const mode_t mode = (flags & O_CREAT) != 0 ? va_arg(more, mode_t) : 0;
    va_end(more);
    return opened(path, flags, mode);
}
int open64(const char* path, int flags, ...) {
    va_list more;
    va_start(more, flags);
    const mode_t mode = (flags & O_CREAT) != 0 ? va_arg(more, mode_t) : 0;
    va_end(more);
    return opened(path, flags, mode);
}

/* Streams of the C++ library open their files here, and write with write and writev. */
FILE* fopen64(const char* path, const char* mode) {
    const int access = strchr(mode, '+') != NULL ? O_RDWR : *mode == 'r' ? O_RDONLY : O_WRONLY;
    const int creation = *mode == 'r'   ? 0
                         : *mode == 'w' ? O_CREAT | O_TRUNC
                                        : O_CREAT | O_APPEND;
    const int file = opened(path, access | creation, 0666);
    return file < 0 ? NULL : fdopen(file, mode);
}
