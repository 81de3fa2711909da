/*
 * disturbed.c: the program disturbed at one chosen moment; linked with --wrap into `disturbed`.
 *
 *     AMPSTEAD_FAULT=memory:K     request K for memory is refused
 *                    interrupt:K  SIGINT arrives at request K for memory
 *                    file:K       step K of writing a file fails as on a full disk
 *                    half:K       the same, but a write gets half of its bytes out before
 *                    kill:K       SIGKILL arrives at step K of writing a file
 *
 * K counts from 1. When the program ends without having come so far, it says so on standard error.
 */
#include "allocator.h"

#include <errno.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

int __real_mkstemp(char *name);
ssize_t __real_write(int file, const void *bytes, size_t size);
int __real_fchmod(int file, mode_t mode);
int __real_fsync(int file);
int __real_close(int file);
int __real_rename(const char *from, const char *to);
char *__real_realpath(const char *path, char *resolved);
int __wrap_mkstemp(char *name);
ssize_t __wrap_write(int file, const void *bytes, size_t size);
int __wrap_fchmod(int file, mode_t mode);
int __wrap_fsync(int file);
int __wrap_close(int file);
int __wrap_rename(const char *from, const char *to);
char *__wrap_realpath(const char *path, char *resolved);

enum kind { KIND_NONE, KIND_MEMORY, KIND_INTERRUPT, KIND_FILE, KIND_HALF, KIND_KILL };

/* Set before main, read by functions that take no context. */
static struct {
    enum kind kind;
    long at, steps;
} fault;

static void tell(void)
{
    static const char text[] = "fault not reached\n";
    const bool is_memory = fault.kind <= KIND_INTERRUPT;
    if ((is_memory ? allocator_requests() : fault.steps) < fault.at) {
        (void)__real_write(STDERR_FILENO, text, sizeof text - 1);
    }
}

__attribute__((constructor)) static void prepare(void)
{
    static const char *const words[] = {"", "memory:", "interrupt:", "file:", "half:", "kill:"};
    const char *wish = getenv("AMPSTEAD_FAULT");
    for (int k = KIND_MEMORY; wish != NULL && k <= KIND_KILL; k++) {
        if (strncmp(wish, words[k], strlen(words[k])) == 0) {
            fault.kind = (enum kind)k;
            fault.at = atol(wish + strlen(words[k]));
            atexit(tell);
        }
    }
    allocator_install();
    allocator_fail(fault.kind == KIND_MEMORY ? fault.at : 0, false);
    allocator_interrupt(fault.kind == KIND_INTERRUPT ? fault.at : 0);
}

static bool fails(void)
{
    if (fault.kind < KIND_FILE || ++fault.steps != fault.at) {
        return false;
    }
    if (fault.kind == KIND_KILL) {
        (void)raise(SIGKILL);
    }
    errno = ENOSPC;
    return true;
}

int __wrap_mkstemp(char *name)
{
    return fails() ? -1 : __real_mkstemp(name);
}

ssize_t __wrap_write(int file, const void *bytes, size_t size)
{
    if (fails()) {
        return -1;
    }
    /* in halves, so that a fault may come between them */
    const bool halves = fault.kind == KIND_KILL || fault.kind == KIND_HALF;
    return __real_write(file, bytes, halves && size > 1 ? size / 2 : size);
}

int __wrap_fchmod(int file, mode_t mode)
{
    return fails() ? -1 : __real_fchmod(file, mode);
}

int __wrap_fsync(int file)
{
    return fails() ? -1 : __real_fsync(file);
}

/* The descriptor is gone also when close fails. */
int __wrap_close(int file)
{
    const bool fail = fails();
    const int result = __real_close(file);
    if (fail) {
        errno = ENOSPC;
    }
    return fail ? -1 : result;
}

int __wrap_rename(const char *from, const char *to)
{
    return fails() ? -1 : __real_rename(from, to);
}

char *__wrap_realpath(const char *path, char *resolved)
{
    return fails() ? NULL : __real_realpath(path, resolved);
}
